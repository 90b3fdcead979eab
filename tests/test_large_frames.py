"""Large frames: what geometry leaves undetermined, more than one opinion on them, and one factorisation for all cases."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
import scipy.sparse.linalg as linalg

from crosscheck.check import Verification, ask, read, verify
from crosscheck.claims import FrameNames, read_claim_text
from crosscheck.frame.draft import draft_grid
from crosscheck.frame.kinematics import AxialRedundancy, study
from crosscheck.frame.model import (
    HELD,
    Analysis,
    Frame,
    Joint,
    JointForce,
    LoadCase,
    Material,
    Member,
    Section,
    Support,
    Units,
)
from crosscheck.opinions import slope_deflection
from tests.benchmarks.frames import regular
from tests.sheds import claim_text


def braced_tower(panels: int, crossed: int | None = None) -> Frame:
    """Two columns 3 m apart with a beam and one diagonal a panel, 3 m high; both diagonals in panel `crossed`; pushed at
    the top. Axially rigid; a truss but for its stiff joints."""
    joints = {f"{s}{k}": Joint(f"{s}{k}", x, 3.0 * k) for k in range(panels + 1) for s, x in (("L", 0.0), ("R", 3.0))}
    pairs = []
    for k in range(panels):
        pairs += [(f"L{k}", f"L{k + 1}"), (f"R{k}", f"R{k + 1}"), (f"L{k + 1}", f"R{k + 1}"), (f"L{k}", f"R{k + 1}")]
        if k == crossed:
            pairs.append((f"R{k}", f"L{k + 1}"))
    top = f"L{panels}"
    return Frame(
        title="braced tower", units=Units("kN", "m", 1000.0, 1.0), materials={"steel": Material("steel", 210e6)},
        sections={"bar": Section("bar", 1e-4, 1e-2)}, joints=joints,
        members={f"{a}-{b}": Member(f"{a}-{b}", a, b, "bar", "steel") for a, b in pairs},
        supports={s: Support(s, HELD, HELD, HELD) for s in ("L0", "R0")},
        cases={"push": LoadCase("push", (JointForce(0, top, 1.0, 0.0),))}, analysis=Analysis(axial="rigid"),
    )  # fmt: skip


@pytest.mark.parametrize("panels", [5, 40, 130, 400])
def test_braced_towers_of_any_height_are_determinate(panels: int) -> None:
    """Maxwell's count (Phil. Mag. 27, 1864): bars = 2 joints - supports' directions, so no axial force is undetermined;
    a second diagonal in one panel makes one self-stress, in that panel's six bars."""
    frame = braced_tower(panels)
    assert len(frame.members) == 2 * (len(frame.joints) - 2)
    assert not AxialRedundancy(frame).members().any()
    crossed = braced_tower(panels, crossed=panels // 2)
    undetermined = [m for m, yes in zip(crossed.members, AxialRedundancy(crossed).members(), strict=True) if yes]
    low, high = panels // 2, panels // 2 + 1
    panel = {f"L{low}-L{high}", f"R{low}-R{high}", f"L{high}-R{high}", f"L{low}-R{high}", f"R{low}-L{high}",
             f"L{low}-R{low}"}  # fmt: skip
    assert set(undetermined) == panel


def test_tall_braced_tower_by_two_opinions() -> None:
    """The force in the lowest column by moments about the other's foot (statics): those of the push and of the ends."""
    frame = braced_tower(130)
    said = ask(frame)
    assert said.verdict == "agree"
    assert {"slope-deflection", "moment-distribution"} <= set(said.judgements["push"].spoke)
    ends = said.answers["slope-deflection"].cases["push"].ends
    feet = [frame.member_index[m] for m in ("L0-L1", "R0-R1", "L0-R1")]
    assert np.isfinite(ends[feet]).all()
    by_statics = -(1.0 * 3.0 * 130 - ends[feet, 0, 2].sum()) / 3.0
    assert ends[frame.member_index["R0-R1"], 0, 0] == pytest.approx(by_statics, rel=1e-9)


def test_twenty_cases_are_one_factorisation(monkeypatch: pytest.MonkeyPatch) -> None:
    made = []
    plain = linalg.splu
    monkeypatch.setattr(linalg, "splu", lambda *a, **k: made.append(1) or plain(*a, **k))
    frame = regular(36, cases=20)
    answer = slope_deflection.opine(frame, study(frame))
    assert len(answer.cases) == 20 and len(made) == 1
    # Each case is the one of a frame that has it alone.
    alone = replace(frame, cases={"case 7": frame.cases["case 7"]})
    one = slope_deflection.opine(alone, study(alone)).cases["case 7"].ends
    assert np.allclose(answer.cases["case 7"].ends, one, rtol=1e-12, atol=1e-12 * np.abs(one).max())


def test_a_frame_of_2050_members_has_two_opinions() -> None:
    said = ask(regular(2050))
    assert said.verdict == "agree"
    assert said.judgements["case 0"].spoke == ("slope-deflection", "moment-distribution")
    assert "members are more than" in said.silent["library"].why


def test_the_library_speaks_of_large_frames_when_asked() -> None:
    said = ask(regular(420), any_size=True)
    assert said.judgements["case 0"].spoke == ("slope-deflection", "moment-distribution", "library")
    assert said.verdict == "agree"


def test_suspects_of_a_large_frame(tmp_path: Path) -> None:
    """558 members: a section wrong throughout is found; a single place is not looked for, and that is said."""
    path = tmp_path / "large.toml"
    text = draft_grid(("15 x 6",), ("18 x 3.5",))
    soft, elsewhere = tmp_path / "soft.toml", tmp_path / "elsewhere.toml"
    pushed = text.replace("[loads.imposed]", '[loads.push]\napply = [{ joint = "A9", force = 900, direction = "right" }]\n'
                         "\n[loads.imposed]")  # fmt: skip
    path.write_text(pushed, encoding="utf-8")
    soft.write_text(pushed.replace("23130 cm^4", "11565 cm^4"), encoding="utf-8")
    elsewhere.write_text(pushed.replace('joint = "A9"', 'joint = "C7"'), encoding="utf-8")
    frame = read(path)
    assert len(frame.members) == 558
    whole = _verified(frame, claim_text(soft))
    assert whole.suspects[0].where == ("girder",) and "0.5 times its EI" in whole.suspects[0].says
    place = _verified(frame, claim_text(elsewhere, case="push"))
    assert place.verdict == "disagree"
    assert not place.suspects and "single members, joints and loads are not tried" in place.no_suspects


def _verified(frame: Frame, claim: str) -> Verification:
    return verify(frame, read_claim_text(claim, FrameNames.of(frame)))
