"""The opinions against each other: every value that two of them give, pair by pair."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import cached_property
from itertools import combinations

import numpy as np

from crosscheck.answer import ACROSS, AXIAL, Answer, CaseAnswer
from crosscheck.compare.differences import Difference, Place, Verdict, worst, worst_first
from crosscheck.compare.tolerance import LIBRARY, OWN, Scales, Tolerance, allowed, case_scales
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import Bools, Floats, Frame, Ints
from crosscheck.frame.stations import Stations, stations

END_QUANTITIES = ("axial", "shear", "moment")
SPAN_QUANTITIES = ("axial", "shear", "moment", "across")
JOINT_QUANTITIES = ("dx", "dy", "rotation")
REACTION_QUANTITIES = ("fx", "fy", "moment")


@dataclass(frozen=True, slots=True)
class CaseJudgement:
    """The opinions on one case: which spoke, their verdict, every difference, and how many values were compared."""

    case: str
    spoke: tuple[str, ...]
    verdict: Verdict
    differences: tuple[Difference, ...]
    compared: int
    scales: Scales

    @property
    def dissenter(self) -> str | None:
        """The one opinion that all others differ from while they agree among themselves."""
        return lone_dissenter(self.spoke, self.differences)


@dataclass(frozen=True, eq=False)
class _Sheet:
    """All values of one kind of one case, opinion by opinion, flattened to the same length."""

    of: str
    quantity: tuple[str, ...]
    scale: Floats
    values: Mapping[str, Floats]
    undetermined: Bools
    optional: bool = False  # values an opinion may leave out (NaN) without that being a finding


class Comparison:
    """Compares the answers to a frame. `answers` by opinion name; silent opinions are left out."""

    def __init__(self, frame: Frame, answers: Mapping[str, Answer]) -> None:
        self.frame, self.answers = frame, answers

    @cached_property
    def stations(self) -> Stations:
        return stations(self.frame)

    def judge(self, name: str) -> CaseJudgement:
        """Compare all pairs that spoke for the case or combination `name`."""
        answers = {o: a for o, a in self.answers.items() if name in a.cases}
        s = self.stations
        spans = {o: a.spans.along(name, s.member, s.x, s.side) for o, a in answers.items()}
        cases = [a.cases[name] for a in answers.values()]
        across = [values[:, ACROSS] for values in spans.values()]
        scales = case_scales(self.frame, load_table(self.frame, name), cases, across)
        found: list[Difference] = []
        compared = 0
        for sheet in self._sheets(name, answers, spans, scales):
            differences, count = self._compare(name, sheet)
            found += differences
            compared += count
        verdict: Verdict = "undecided" if len(answers) < 2 or compared == 0 else "disagree" if found else "agree"
        return CaseJudgement(name, tuple(answers), verdict, tuple(worst_first(found)), compared, scales)

    def _sheets(
        self, name: str, answers: Mapping[str, Answer], spans: Mapping[str, Floats], scales: Scales
    ) -> Iterator[_Sheet]:
        if not answers:
            return
        none = next(iter(answers.values())).undetermined
        axial = np.zeros((len(self.frame.members), 2, 3), dtype=bool)
        axial[:, :, 0] = none.axial[:, None]
        cases: dict[str, CaseAnswer] = {o: a.cases[name] for o, a in answers.items()}
        yield _sheet("member_ends", END_QUANTITIES, scales, {o: c.ends for o, c in cases.items()}, axial)
        # What one-way parts at rest leave open in this case, by everybody who speaks.
        adrift = [a.adrift.get(name, np.zeros_like(none.joints)) for a in answers.values()]
        open_ones = none.joints | np.logical_and.reduce(adrift)
        yield _sheet("joints", JOINT_QUANTITIES, scales, {o: c.joints for o, c in cases.items()}, open_ones)
        pulls = {o: c.reactions for o, c in cases.items()}
        yield _sheet("reactions", REACTION_QUANTITIES, scales, pulls, none.reactions)
        s = self.stations
        hidden = np.zeros((len(s.x), 4), dtype=bool)
        hidden[:, AXIAL] = none.axial[s.member]
        yield _sheet("spans", SPAN_QUANTITIES, scales, spans, hidden, optional=True)
        peaks = {o: extremes(a, name, s) for o, a in answers.items()}
        hidden = np.zeros((len(self.frame.members), 2, 4), dtype=bool)
        hidden[:, :, AXIAL] = none.axial[:, None]
        yield _sheet("extremes", SPAN_QUANTITIES, scales, peaks, hidden, optional=True)

    def _compare(self, name: str, sheet: _Sheet) -> tuple[list[Difference], int]:
        worst_ratio = np.zeros(sheet.undetermined.shape)
        difference, permitted = np.zeros_like(worst_ratio), np.zeros_like(worst_ratio)
        missing = np.zeros_like(sheet.undetermined)
        compared = np.zeros_like(sheet.undetermined)
        for one, other in combinations(sheet.values, 2):
            a, b = sheet.values[one], sheet.values[other]
            apart, may, lacking = _pair(a, b, _tolerance(one, other), sheet)
            ratio = apart / np.where(may > 0, may, 1.0)
            ratio = np.where((may == 0) & (apart > 0), np.inf, ratio)
            further = ratio > worst_ratio
            worst_ratio = np.where(further, ratio, worst_ratio)
            difference, permitted = np.where(further, apart, difference), np.where(further, may, permitted)
            missing |= lacking
            compared |= np.isfinite(a) & np.isfinite(b)
        bad = np.argwhere((worst_ratio > 1.0) | missing)
        found = [
            self._difference(name, sheet, tuple(index), difference, permitted, bool(missing[tuple(index)]))
            for index in bad.tolist()
        ]
        return found, int(compared.sum())

    def _difference(
        self, name: str, sheet: _Sheet, index: tuple[int, ...], difference: Floats, permitted: Floats, missing: bool
    ) -> Difference:
        values = {o: _plain(v[index]) for o, v in sheet.values.items()}
        note = "one gives no value, or not a number, where another gives one" if missing else ""
        place = self._place(name, sheet, index)
        apart = float("inf") if missing else float(difference[index])
        return Difference(place, values, apart, float(permitted[index]), note=note)

    def _place(self, name: str, sheet: _Sheet, index: tuple[int, ...]) -> Place:
        members, joints = list(self.frame.members), list(self.frame.joints)
        quantity = sheet.quantity[index[-1]]
        if sheet.of == "member_ends":
            member = self.frame.members[members[index[0]]]
            joint = member.joint_from if index[1] == 0 else member.joint_to
            return Place(name, "member_ends", quantity, member=member.name, joint=joint)
        if sheet.of == "spans":
            m = int(self.stations.member[index[0]])
            return Place(name, "spans", quantity, member=members[m], at=float(self.stations.x[index[0]]))
        if sheet.of == "extremes":
            return Place(name, "extremes", quantity, member=members[index[0]])
        if sheet.of == "joints":
            return Place(name, "joints", quantity, joint=joints[index[0]])
        return Place(name, "reactions", quantity, joint=joints[index[0]])


def _sheet(
    of: str, quantity: tuple[str, ...], scales: Scales, values: Mapping[str, Floats], undetermined: Bools,
    optional: bool = False,
) -> _Sheet:  # fmt: skip
    return _Sheet(of, quantity, np.array([scales.of(q) for q in quantity]), values, undetermined, optional)


def _pair(a: Floats, b: Floats, tolerance: Tolerance, sheet: _Sheet) -> tuple[Floats, Floats, Bools]:
    """Difference, allowed difference, and where exactly one (or a value that should be there) is missing."""
    known = np.isfinite(a) & np.isfinite(b)
    apart = np.where(known, np.abs(np.where(known, a, 0.0) - np.where(known, b, 0.0)), 0.0)
    may = allowed(np.where(known, a, 0.0), np.where(known, b, 0.0), tolerance, sheet.scale)
    infinite = np.isinf(a) | np.isinf(b)
    lacking = infinite | (np.isfinite(a) != np.isfinite(b)) | (~known & ~sheet.undetermined)
    return apart, may, infinite if sheet.optional else lacking


def _tolerance(one: str, other: str) -> Tolerance:
    return LIBRARY if "library" in (one, other) else OWN


def _plain(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None


def extremes(answer: Answer, name: str, at: Stations) -> Floats:
    """(m, 2, 4) least and greatest value along each member of axial, shear, moment, across; NaN where not given."""
    if answer.spans.sampled:
        return np.full((len(at.start) - 1, 2, 4), np.nan)
    member, x, side = with_turning_points(answer, name, at)
    values = answer.spans.along(name, member, x, side)
    start = np.searchsorted(member, np.arange(len(at.start) - 1))
    return np.stack([np.minimum.reduceat(values, start), np.maximum.reduceat(values, start)], axis=1)


def with_turning_points(answer: Answer, name: str, at: Stations) -> tuple[Ints, Floats, Ints]:
    """Stations and the opinion's own turning points together, sorted by member, distance and side."""
    extra_member, extra_x = answer.spans.turning_points(name)
    member, x = np.concatenate([at.member, extra_member]), np.concatenate([at.x, extra_x])
    side = np.concatenate([at.side, np.ones(len(extra_x), dtype=np.int64)])
    order = np.lexsort((side, x, member))
    return member[order], x[order], side[order]


def lone_dissenter(spoke: tuple[str, ...], differences: tuple[Difference, ...]) -> str | None:
    """The one opinion without which the others agree, wherever a third voice can tell; None where none stands out.

    Two opinions that differ where the third gives no value (the library between its own joints) tell nothing. One that
    gives no value where the others agree on one, or the only value where they give none, does stand out. The others
    agree when they lie within what is allowed, or within a tenth of the difference: the library is allowed more than
    our own two.
    """
    if len(spoke) < 3:
        return None
    odd = [[name for name in spoke if _others_agree(d, name)] for d in differences]
    telling = [set(names) for names in odd if names]
    suspects = set.intersection(*telling) if telling else set()
    torn = any(not names and None not in d.values.values() for names, d in zip(odd, differences, strict=True))
    return suspects.pop() if len(suspects) == 1 and not torn else None


def _others_agree(difference: Difference, name: str) -> bool:
    """Whether all but `name` give the same there, or all of them nothing while it gives a value."""
    rest = [v for o, v in difference.values.items() if o != name]
    known = [v for v in rest if v is not None]
    if len(known) < len(rest):
        return len(known) == 0 and len(rest) > 1
    share = 0.1 * difference.difference if np.isfinite(difference.difference) else 0.0
    return len(rest) > 1 and max(known) - min(known) <= max(difference.allowed, share)


def opinions_verdict(judgements: list[CaseJudgement]) -> Verdict:
    """The worst case's verdict."""
    return worst([j.verdict for j in judgements])




def closeness(answers: Mapping[str, Answer], judged: CaseJudgement) -> float:
    """Largest difference between any two opinions in end actions, displacements and reactions of a case, as a share of
    the scale of its kind."""
    cases = [answers[o].cases[judged.case] for o in judged.spoke]
    largest = 0.0
    for quantities, of in ((END_QUANTITIES, "ends"), (JOINT_QUANTITIES, "joints"), (REACTION_QUANTITIES, "reactions")):
        scale = np.array([judged.scales.of(q) for q in quantities])
        for one, other in combinations([getattr(c, of) for c in cases], 2):
            apart = np.abs(one - other) / np.where(scale > 0, scale, 1.0)
            largest = max(largest, float(apart[np.isfinite(apart)].max(initial=0.0)))
    return largest
