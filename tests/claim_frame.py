"""One small frame for tests of claims, its answers, and a shortcut from text to verdict."""

from __future__ import annotations

from functools import lru_cache
from typing import Any

from crosscheck.answer import Answer
from crosscheck.claims import FrameNames, Reading, ReadingOptions, read_claim_text
from crosscheck.compare.claim import CaseClaim, ClaimComparison
from crosscheck.compare.claimed import ClosedClaim
from crosscheck.compare.closing import close
from crosscheck.compare.differences import worst
from crosscheck.compare.opinions import CaseJudgement, Comparison
from crosscheck.compare.tolerance import CLAIM
from crosscheck.frame.kinematics import study
from crosscheck.frame.model import Frame
from crosscheck.frame.reader import read_frame_text
from crosscheck.opinions import moment_distribution, slope_deflection

BENT = """
title = "Two-bay bent"
units = "kN m"
[materials.steel]
E = "210 GPa"
[sections.post]
I = "8360 cm^4"
A = "53.8 cm^2"
[joints]
A = [0, 0]
B = [0, 4]
C = [6, 5]
D = [6, 0]
E = [12, 4]
F = [12, 0]
[members]
"A-B" = { section = "post", material = "steel" }
rafter = { from = "B", to = "C", section = "post", material = "steel" }
"D-C" = { section = "post", material = "steel" }
"C-E" = { section = "post", material = "steel" }
"E-F" = { section = "post", material = "steel" }
[supports]
A = "fixed"
D = "fixed"
F = "fixed"
[loads.dead]
apply = [
  { members = ["rafter", "C-E"], uniform = 8.5, direction = "down" },
  { joint = "B", force = 9, direction = "right" },
]
[loads.wind]
apply = [{ joint = "B", force = 22, direction = "right" }, { member = "E-F", uniform = 3, direction = "left" }]
"""


class Known:
    """A frame with answers and judgements."""

    def __init__(self, text: str) -> None:
        self.frame: Frame = read_frame_text(text, "test.toml")
        found = study(self.frame)
        said = {"slope-deflection": slope_deflection.opine(self.frame, found),
                "moment-distribution": moment_distribution.opine(self.frame, found)}  # fmt: skip
        self.answers: dict[str, Answer] = {n: a for n, a in said.items() if isinstance(a, Answer)}
        comparison = Comparison(self.frame, self.answers)
        self.judgements: dict[str, CaseJudgement] = {n: comparison.judge(n) for n in self.frame.names}

    @property
    def answer(self) -> Answer:
        return self.answers["slope-deflection"]

    def read(self, text: str, **options: Any) -> Reading:
        return read_claim_text(text, FrameNames.of(self.frame), ReadingOptions(**options))

    def close(self, text: str, case: str | None = None, **options: Any) -> ClosedClaim:
        return close(self.read(text, **options), self.frame, self.answers, case, CLAIM)

    def judge(self, text: str, case: str | None = None, **options: Any) -> tuple[str, ClosedClaim, list[CaseClaim]]:
        """Verdict as `verify` gives it while the opinions agree."""
        closed = self.close(text, case, **options)
        cases = ClaimComparison(self.frame, self.answers, self.judgements, CLAIM).judge(closed)
        verdicts = [c.verdict for c in cases]
        if closed.undecided or closed.foreign or not sum(c.compared for c in cases):
            verdicts.append("undecided")
        if closed.reversed_load:
            verdicts.append("disagree")
        return worst(verdicts), closed, cases

    # -- right tables, in the README's conventions unless `sign` turns them

    def ends(self, case: str, digits: int = 3, moment: float = 1, axial: float = 1, shear: float = 1, sep: str = "\t",
             heads: str = "Member,End,N [kN],V [kN],M [kNm]") -> str:  # fmt: skip
        rows = [heads.replace(",", sep)]
        for k, m in enumerate(self.frame.members.values()):
            for e, j in enumerate((m.joint_from, m.joint_to)):
                n, v, mm = self.answer.cases[case].ends[k, e] * (axial, shear, moment)
                rows.append(sep.join([m.name, j, *(f"{x:.{digits}f}" for x in (n, v, mm))]))
        return "\n".join(rows) + "\n"

    def reactions(self, case: str, sign: float = 1, turn: float = 1, sep: str = "\t") -> str:
        rows = [sep.join(["Joint", "Fx [kN]", "Fy [kN]", "Mz [kNm]"])]
        for j in self.frame.supports:
            fx, fy, m = self.answer.cases[case].reactions[self.frame.joint_index[j]]
            rows.append(sep.join([j, f"{sign * fx:.3f}", f"{sign * fy:.3f}", f"{sign * turn * m:.3f}"]))
        return "\n".join(rows) + "\n"

    def displacements(self, case: str, sign: float = 1, turn: float = 1, sep: str = "\t") -> str:
        rows = [sep.join(["Joint", "dx [mm]", "dy [mm]", "rotation [mrad]"])]
        for k, j in enumerate(self.frame.joints):
            dx, dy, t = self.answer.cases[case].joints[k] * 1e3
            rows.append(sep.join([j, f"{sign * dx:.4f}", f"{sign * dy:.4f}", f"{sign * turn * t:.4f}"]))
        return "\n".join(rows) + "\n"


@lru_cache(maxsize=1)
def bent() -> Known:
    """The two-bay bent with cases dead and wind."""
    return Known(BENT)
