"""Seeded mistakes: a frame, what another analysis may have had in place of it, and its results as printed.

The other analysis is solved by moment distribution, so that suspects (which stand on slope-deflection) meet results they
did not make. Mistakes are drawn here from their own small functions, not from the ones that suspects are made with.
"""

from __future__ import annotations

import math
import time
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass, replace
from random import Random
from typing import Any

import numpy as np

from crosscheck import check
from crosscheck.answer import Answer, CaseAnswer, Silent
from crosscheck.compare.claim import CaseClaim, ClaimComparison
from crosscheck.compare.claimed import ClaimedValue, ClosedClaim
from crosscheck.compare.differences import worst
from crosscheck.compare.opinions import Comparison
from crosscheck.compare.tolerance import CLAIM, LEAST_SHARE
from crosscheck.frame.kinematics import study
from crosscheck.frame.model import (
    FREE,
    HELD,
    Frame,
    JointCouple,
    JointForce,
    Load,
    LoadCase,
    Member,
    Misfit,
    PointCouple,
    PointForce,
    SelfWeight,
    Settlement,
    Spread,
    Support,
    Temperature,
)
from crosscheck.opinions import moment_distribution, slope_deflection
from crosscheck.problems import UnusableInput
from crosscheck.suspects import Suspect, search
from tests.random_frames import random_frame

END_NAMES, JOINT_NAMES, PULL_NAMES = ("axial", "shear", "moment"), ("dx", "dy", "rotation"), ("fx", "fy", "moment")
EFFECT = 0.03
"""Least change of an end moment, as a share of the peak, for a mistake to count."""
FAINT = LEAST_SHARE * CLAIM.floor
"""Share of the case's scale of moments (force times the longest member among them: DESIGN.md section 6) below which no two
moments are ever called different. Where all moments of a case are that faint (a truss whose joints happen to be rigid, or
rounding noise about nil), 3% of their peak is below it: such mistakes are counted by `faint`, and not among the corpus."""
NEAR_CRITICAL = 5.0
"""Critical load factor that the loads of some frames are brought to, so that effects of second order are seen."""


@dataclass(frozen=True)
class Mistake:
    """kind: as the contract names it. sort: finer, for the table. where: what a suspect should name ('' for nowhere).

    frame: what the other analysis had; None where the mistake is in the paste. paste: changes the printed values.
    name: case of the other frame whose results stand under the claimed case's name. adjust: what was done to its
    results before they were printed.
    """

    kind: str
    sort: str
    where: tuple[str, ...]
    frame: Frame | None = None
    paste: Callable[[list[ClaimedValue]], list[ClaimedValue]] | None = None
    name: str | None = None
    adjust: Callable[[Frame, Answer, str], CaseAnswer | None] | None = None


# --- printing --------------------------------------------------------------------------------------


def printed(value: float, digits: int, peak: float, fixed: bool) -> tuple[float, float, str]:
    """(value, half digit, text) with so many significant digits, of its own or (fixed) of the column's peak."""
    if abs(value) < 1e-9 * peak:
        value = 0.0
    size = peak if fixed or value == 0.0 else abs(value)
    decimals = digits - 1 - math.floor(math.log10(size)) if size > 0 else digits
    text = f"{round(value, decimals):.{max(decimals, 0)}f}"
    return float(text), 0.5 * 10.0**-decimals, text


def claim_values(
    frame: Frame, answer: Answer, name: str, under: str, digits: int, fixed: bool, only: str = "all"
) -> list[ClaimedValue]:
    """The results of case `name` as a claim on case `under`. only: "all", "moments" or "reactions"."""
    return case_values(frame, answer.cases[name], under, digits, fixed, only)


def case_values(frame: Frame, c: CaseAnswer, under: str, digits: int, fixed: bool, only: str = "all") -> list[ClaimedValue]:
    """One case's results as a claim."""
    out: list[ClaimedValue] = []
    line = 0

    def add(
        kind: str, names: tuple[str, ...], values: np.ndarray, peaks: np.ndarray, member: str | None, joint: str
    ) -> None:
        nonlocal line
        line += 1
        for q, v, peak in zip(names, values.tolist(), peaks.tolist(), strict=True):
            if not math.isfinite(v) or (only == "moments" and (q != "moment" or kind != "end")):
                continue
            if only == "reactions" and kind != "reaction":
                continue
            value, half, text = printed(v, digits, peak, fixed)
            out.append(ClaimedValue(under, kind, q, member, joint, None, value, half, line, text))  # type: ignore[arg-type]

    peaks = np.nanmax(np.abs(np.nan_to_num(c.ends)), axis=(0, 1))
    for m, member in enumerate(frame.members.values()):
        for e, joint in enumerate((member.joint_from, member.joint_to)):
            add("end", END_NAMES, c.ends[m, e], peaks, member.name, joint)
    peaks = np.abs(np.nan_to_num(c.reactions)).max(axis=0)
    for joint in frame.supports:
        add("reaction", PULL_NAMES, c.reactions[frame.joint_index[joint]], peaks, None, joint)
    peaks = np.abs(np.nan_to_num(c.joints)).max(axis=0)
    for j, joint in enumerate(frame.joints):
        add("displacement", JOINT_NAMES, c.joints[j], peaks, None, joint)
    return out


def solved(frame: Frame, names: tuple[str, ...] | None = None, by: object = moment_distribution) -> Answer | None:
    """The frame's results, or None where it cannot be solved."""
    try:
        found = study(frame)
        answer = by.opine(frame, found, names)  # type: ignore[attr-defined]
    except (UnusableInput, ArithmeticError, np.linalg.LinAlgError):
        return None
    return None if isinstance(answer, Silent) else answer


def opinions_on(frame: Frame, names: tuple[str, ...] | None = None) -> check.Opinions:
    """Opinions with slope-deflection alone: all that suspects need."""
    found = study(frame)
    wanted = frame.names if names is None else names
    answer = slope_deflection.opine(frame, found, wanted)
    assert isinstance(answer, Answer)
    answers = {"slope-deflection": answer}
    comparison = Comparison(frame, answers)
    return check.Opinions(frame, found, wanted, answers, {}, {n: comparison.judge(n) for n in wanted})


def closed_claim(values: list[ClaimedValue]) -> ClosedClaim:
    return ClosedClaim("", "", len({v.line for v in values}), tuple(dict.fromkeys(v.case for v in values)), tuple(values))


class _Comparison(ClaimComparison):
    """Keeps what the opinions say: finding extremes for each claim anew is slow."""

    kept: dict[tuple[int, str], tuple[Answer, Any]] = {}

    def _known(self, answer: Answer, case: str) -> Any:
        key = (id(answer), case)
        if key not in self.kept or self.kept[key][0] is not answer:
            self.kept[key] = (answer, super()._known(answer, case))
        return self.kept[key][1]


def judged(frame: Frame, opinions: check.Opinions, closed: ClosedClaim) -> list[CaseClaim]:
    return _Comparison(frame, opinions.answers, opinions.judgements, CLAIM).judge(closed)


# --- mistakes of the frame ---------------------------------------------------------------------------


def mistakes(frame: Frame, case: str, r: Random) -> list[Mistake]:
    """Every mistake that can be drawn for a frame and case, in random order."""
    out: list[Mistake] = []
    for source in (
        _supports, _ends, _stiffness, _loads, _positions, _cases, _geometry, _idealisation, _units_of_springs, _pastes,
    ):  # fmt: skip
        out += list(source(frame, case, r))
    r.shuffle(out)
    return out


def _put(frame: Frame, table: str, name: str, thing: object) -> Frame:
    return replace(frame, **{table: {**getattr(frame, table), name: thing}})


def _supports(frame: Frame, case: str, r: Random) -> Iterator[Mistake]:
    for joint, s in frame.supports.items():
        for kind in ((HELD, HELD, HELD), (HELD, HELD, FREE), (FREE, HELD, FREE), (HELD, FREE, FREE)):
            if kind != (s.x, s.y, s.rotation):
                x, y, t = kind
                yield Mistake(
                    "support", "another kind", (joint,), _put(frame, "supports", joint, replace(s, x=x, y=y, rotation=t))
                )
        gone = {n: q for n, q in frame.supports.items() if n != joint}
        yield Mistake("support", "missing", (joint,), replace(frame, supports=gone))
        for axis in ("x", "y", "rotation"):
            if getattr(s, axis) == HELD:
                m = frame.member_table
                scale = float(np.median(m.E * m.I / m.length ** (1 if axis == "rotation" else 3)))
                k = scale * math.exp(r.uniform(-2, 4))
                yield Mistake("support", "sprung", (joint,), _put(frame, "supports", joint, replace(s, **{axis: k})))
        if s.angle:
            yield Mistake("support", "not turned", (joint,), _put(frame, "supports", joint, replace(s, angle=0.0)))
    bare = [n for n in frame.joints if n not in frame.supports and (frame.member_table.ends == frame.joint_index[n]).any()]
    for joint in bare[:3]:
        yield Mistake("support", "extra", (joint,), _put(frame, "supports", joint, Support(joint, FREE, HELD, FREE)))


def _units_of_springs(frame: Frame, case: str, r: Random) -> Iterator[Mistake]:
    for joint, s in frame.supports.items():
        for axis in ("x", "y", "rotation"):
            k = getattr(s, axis)
            if 0 < k < HELD:
                f = r.choice([1e3, 1e-3])
                yield Mistake(
                    "support", "spring by a unit", (joint,), _put(frame, "supports", joint, replace(s, **{axis: k * f}))
                )


def _ends(frame: Frame, case: str, r: Random) -> Iterator[Mistake]:
    for name, m in frame.members.items():
        for field in ("turn_from", "turn_to"):
            now = getattr(m, field)
            if now != FREE:
                yield Mistake(
                    "end release", "hinge added", (name,), _put(frame, "members", name, replace(m, **{field: FREE}))
                )
            if now != HELD:
                yield Mistake(
                    "end release",
                    "hinge or spring left out",
                    (name,),
                    _put(frame, "members", name, replace(m, **{field: HELD})),
                )
            if now == HELD and r.random() < 0.3:
                t, k = frame.member_table, frame.member_index[name]
                spring = float(t.E[k] * t.I[k] / t.length[k]) * math.exp(r.uniform(-1, 2))
                yield Mistake(
                    "end release", "semi-rigid", (name,), _put(frame, "members", name, replace(m, **{field: spring}))
                )
            if 0 < now < HELD:
                spring = now * r.choice([1e3, 1e-3])
                yield Mistake(
                    "end release", "spring by a unit", (name,), _put(frame, "members", name, replace(m, **{field: spring}))
                )


def _stiffness(frame: Frame, case: str, r: Random) -> Iterator[Mistake]:
    elastic = frame.analysis.axial == "elastic"
    factor = lambda: r.choice([0.5, 0.35, 0.7, 2.0, 10.0, 0.1, round(math.exp(r.uniform(-2, 2)), 3)])  # noqa: E731
    for name, m in frame.members.items():
        s = frame.sections[m.section]
        f = factor()
        own = replace(s, name="own", I=s.I * f)
        yield Mistake(
            "stiffness",
            "EI of a member",
            (name,),
            _put(_put(frame, "sections", "own", own), "members", name, replace(m, section="own")),
        )
        if elastic and s.A:
            own = replace(s, name="own", A=s.A * factor())
            yield Mistake(
                "stiffness",
                "EA of a member",
                (name,),
                _put(_put(frame, "sections", "own", own), "members", name, replace(m, section="own")),
            )
        for other in frame.sections:
            if other != m.section:
                yield Mistake(
                    "stiffness", "another section", (name,), _put(frame, "members", name, replace(m, section=other))
                )
    for name in {m.section for m in frame.members.values()}:
        s = frame.sections[name]
        yield Mistake("stiffness", "EI of a section", (name,), _put(frame, "sections", name, replace(s, I=s.I * factor())))
    for name in {m.material for m in frame.members.values()}:
        t = frame.materials[name]
        f = factor()
        yield Mistake(
            "stiffness",
            "E of a material",
            (name,),
            _put(frame, "materials", name, replace(t, E=t.E * f, G=None if t.G is None else t.G * f)),
        )


# --- loads -----------------------------------------------------------------------------------------

AMOUNTS = ("force", "couple", "x", "y", "rotation", "first", "last", "mean", "difference", "too_long", "factor")


def times(load: Load, f: float) -> Load:
    return replace(load, **{a: f * getattr(load, a) for a in AMOUNTS if hasattr(load, a)})


def _with(frame: Frame, case: str, loads: list[Load]) -> Frame:
    return _put(frame, "cases", case, replace(frame.cases[case], loads=tuple(loads)))


def _cases_of(frame: Frame, case: str) -> list[str]:
    return [case] if case in frame.cases else list(frame.combinations[case].factors)


def _loads(frame: Frame, claimed: str, r: Random) -> Iterator[Mistake]:
    for case in _cases_of(frame, claimed):
        loads = list(frame.cases[case].loads)
        for entry in dict.fromkeys(q.entry for q in loads):
            mine = [q for q in loads if q.entry == entry]
            where = (f"{case}[{entry}]",)
            word = {
                SelfWeight: "self weight ",
                Settlement: "settlement ",
                Temperature: "temperature ",
                Misfit: "misfit ",
            }.get(type(mine[0]), "")
            yield Mistake("load", f"{word}left out", where, _with(frame, case, [q for q in loads if q.entry != entry]))
            yield Mistake("load", f"{word}in twice", where, _with(frame, case, loads + mine))
            yield Mistake(
                "load",
                f"{word}reversed",
                where,
                _with(frame, case, [times(q, -1) if q.entry == entry else q for q in loads]),
            )
            if len(mine) > 1:
                yield Mistake(
                    "load", "one of a run left out", where, _with(frame, case, [q for q in loads if q is not mine[0]])
                )
            for load in loads:
                if load is mine[0] and isinstance(load, (PointForce, Spread, JointForce)):
                    yield from _directions(frame, case, loads, entry, load, where, r)


def _directions(frame, case, loads, entry, load, where, r):  # type: ignore[no-untyped-def]
    options = [0.0, 270.0, 90.0] + ([] if isinstance(load, JointForce) else ["across"])
    new = r.choice([d for d in options if d != load.direction])
    sort = "local for global" if "across" in (new, load.direction) else "another direction"
    yield Mistake(
        "load", sort, where, _with(frame, case, [replace(q, direction=new) if q.entry == entry else q for q in loads])
    )
    if isinstance(load, Spread) and not isinstance(load.direction, str):
        flipped = [replace(q, projection=not q.projection) if q.entry == entry else q for q in loads]
        yield Mistake("load", "length for projection", where, _with(frame, case, flipped))


def _positions(frame: Frame, claimed: str, r: Random) -> Iterator[Mistake]:
    for case in _cases_of(frame, claimed):
        loads = list(frame.cases[case].loads)
        for k, load in enumerate(loads):
            where = (f"{case}[{load.entry}]",)

            def swapped(new: Load, k: int = k, case: str = case, loads: list[Load] = loads) -> Frame:
                return _with(frame, case, [*loads[:k], new, *loads[k + 1 :]])

            if isinstance(load, (PointForce, PointCouple, Spread)):
                length = float(frame.member_table.length[frame.member_index[load.member]])
                if isinstance(load, Spread):
                    new = replace(
                        load, first=load.last, last=load.first, start=max(length - load.end, 0.0), end=length - load.start
                    )
                    if load.start > 0.01 * length or load.end < 0.99 * length:
                        yield Mistake("load", "whole for part", where, swapped(replace(load, start=0.0, end=length)))
                else:
                    new = replace(load, at=length - load.at)
                yield Mistake("load", "from the other end", where, swapped(new))
                others = [n for n in frame.members if n != load.member]
                if others:
                    n = r.choice(others)
                    far = float(frame.member_table.length[frame.member_index[n]])
                    if isinstance(load, Spread):
                        whole = load.start <= 1e-9 and load.end >= length * (1 - 1e-9)
                        end = far if whole else min(load.end, far)
                        if load.start < end * 0.5:
                            yield Mistake("load", "on another member", where, swapped(replace(load, member=n, end=end)))
                    elif load.at <= far:
                        yield Mistake("load", "on another member", where, swapped(replace(load, member=n)))
            if isinstance(load, (JointForce, JointCouple)):
                n = r.choice([j for j in frame.joints if j != load.joint])
                yield Mistake("load", "on another joint", where, swapped(replace(load, joint=n)))


def _cases(frame: Frame, case: str, r: Random) -> Iterator[Mistake]:
    for other in frame.names:
        if other != case:
            yield Mistake("load case", "another case pasted", (), frame, name=other)
    if case in frame.combinations:
        combination = frame.combinations[case]
        for name, f in combination.factors.items():
            if f != 1.0:
                for g, sort in ((1.0, "factor left out"), (f * f, "factored twice")):
                    new = replace(combination, factors={**combination.factors, name: g})
                    yield Mistake("load case", sort, (), _put(frame, "combinations", case, new))
        if len(combination.factors) > 1:
            new = replace(combination, factors={n: f * f for n, f in combination.factors.items()})
            yield Mistake("load case", "all factored again", (), _put(frame, "combinations", case, new))


# --- geometry and idealisation -----------------------------------------------------------------------


def _relength(old: Frame, new: Frame) -> Frame:
    a, b = old.member_table.length, new.member_table.length
    ratio = {n: float(b[k] / a[k]) for k, n in enumerate(old.members)}

    def moved(q: Load) -> Load:
        f = ratio.get(getattr(q, "member", ""), 1.0)
        if isinstance(q, Spread):
            return replace(q, start=q.start * f, end=q.end * f)
        return replace(q, at=q.at * f) if isinstance(q, (PointForce, PointCouple)) else q

    return replace(new, cases={n: replace(c, loads=tuple(map(moved, c.loads))) for n, c in new.cases.items()})


def _geometry(frame: Frame, case: str, r: Random) -> Iterator[Mistake]:
    t = frame.member_table
    for name, j in frame.joints.items():
        around = (t.ends == frame.joint_index[name]).any(axis=1)
        if not around.any():
            continue
        by = r.choice([-1, 1]) * r.uniform(0.05, 0.25) * float(t.length[around].min())
        new = replace(j, x=j.x + by) if r.random() < 0.5 else replace(j, y=j.y + by)
        yield Mistake("geometry", "joint elsewhere", (name,), _relength(frame, _put(frame, "joints", name, new)))
    for name, m in frame.members.items():
        cases = {
            n: replace(c, loads=tuple(q for q in c.loads if getattr(q, "member", "") != name))
            for n, c in frame.cases.items()
        }
        gone = replace(frame, members={n: q for n, q in frame.members.items() if n != name}, cases=cases)
        yield Mistake("geometry", "member missing", (name,), gone)
        away = np.hypot(*(frame.xy - frame.xy[frame.joint_index[m.joint_to]]).T)
        near = [list(frame.joints)[k] for k in np.argsort(away)[1:4]]
        near = [n for n in near if n not in (m.joint_from, m.joint_to)]
        if near:
            new_m = replace(m, joint_to=r.choice(near))
            yield Mistake("geometry", "joined elsewhere", (name,), _relength(frame, _put(frame, "members", name, new_m)))


def _idealisation(frame: Frame, case: str, r: Random) -> Iterator[Mistake]:
    a = frame.analysis
    t = frame.member_table
    if a.axial == "elastic" or not np.isnan(t.A).any():
        new = replace(a, axial="rigid" if a.axial == "elastic" else "elastic")
        yield Mistake("idealisation", "axial", (), replace(frame, analysis=new))
    if a.shear == "elastic" or not (np.isnan(t.G).any() or np.isnan(t.shear_area).any()):
        new = replace(a, shear="rigid" if a.shear == "elastic" else "elastic")
        yield Mistake("idealisation", "shear", (), replace(frame, analysis=new))
    if t.zone.any():
        bare = {n: replace(m, rigid_from=0.0, rigid_to=0.0) for n, m in frame.members.items()}
        yield Mistake("idealisation", "end zones", (), replace(frame, members=bare))
        yield Mistake("idealisation", "face values", (), frame, adjust=_at_faces)
    else:
        yield Mistake("idealisation", "extra end zones", (), replace(frame, members=_with_zones(frame, r)))
    new = replace(a, order=3 - a.order)
    yield Mistake("idealisation", "order", (), replace(frame, analysis=new))
    yield Mistake("idealisation", "sway alone", (), frame, adjust=_sway_alone)
    supported = np.array([n in frame.supports for n in frame.joints])
    for j in np.flatnonzero(supported):
        on = (t.ends == j).any(axis=1)
        if on.sum() >= 2 and supported[t.ends[on]].all():
            share = r.choice([0.1, 0.15, 0.2, 0.3])
            where = (list(frame.joints)[j],)
            yield Mistake(
                "idealisation", "redistributed", where, frame, adjust=lambda f, a, n, j=j, s=share: _less(f, a, n, j, s)
            )


def _with_zones(frame: Frame, r: Random) -> dict[str, Member]:
    """One length of rigid zone at every stiff end that meets another member at an angle."""
    t = frame.member_table
    by = r.uniform(0.04, 0.12) * float(t.length.min())
    out = {}
    for m, member in enumerate(frame.members.values()):
        skew = np.abs(t.cos[m] * t.sin - t.sin[m] * t.cos) > 0.3
        meets = [bool((skew & (t.ends == j).any(axis=1)).any()) for j in t.ends[m]]
        near, far = (by if met and stiff else 0.0 for met, stiff in zip(meets, t.turn[m] != FREE, strict=True))
        out[member.name] = replace(member, rigid_from=near, rigid_to=far)
    return out


def _sway_alone(frame: Frame, answer: Answer, name: str) -> CaseAnswer | None:
    """Second-order effect of sway alone, by first-order solutions with pairs of forces in place of it. None where they
    do not settle, or nothing sways."""
    if frame.analysis.order == 2:
        frame = replace(frame, analysis=replace(frame.analysis, order=1))
        answer = solved(frame, (name,)) or answer
    t, c = frame.member_table, answer.cases[name]
    pull = np.zeros(len(t.length))
    for _ in range(60):
        apart = c.joints[t.ends[:, 1]] - c.joints[t.ends[:, 0]]
        new = c.ends[:, :, 0].mean(axis=1) * (t.cos * apart[:, 1] - t.sin * apart[:, 0]) / t.length
        if not np.isfinite(new).all():
            return None
        if np.abs(new - pull).max() <= 1e-8 * np.abs(new).max():
            ends = c.ends.copy()
            ends[:, 0, 1] -= pull
            ends[:, 1, 1] += pull
            return replace(c, ends=ends)
        pull = new
        again = solved(_pushed(frame, name, pull), (name,))
        if again is None:
            return None
        c = again.cases[name]
    return None


def _pushed(frame: Frame, name: str, pull: np.ndarray) -> Frame:
    """The frame with forces across each member's two ends added to a case, or to a combination by a case of its own."""
    forces: list[Load] = []
    for m, (member, p) in enumerate(zip(frame.members.values(), pull.tolist(), strict=True)):
        across = math.degrees(math.atan2(frame.member_table.sin[m], frame.member_table.cos[m])) + 90.0
        forces += [JointForce(99, member.joint_from, p, across), JointForce(99, member.joint_to, -p, across)]
    if name in frame.cases:
        return _with(frame, name, [*frame.cases[name].loads, *forces])
    combination = frame.combinations[name]
    frame = _put(frame, "cases", "pulls", LoadCase("pulls", tuple(forces)))
    return _put(frame, "combinations", name, replace(combination, factors={**combination.factors, "pulls": 1.0}))


def _at_faces(frame: Frame, answer: Answer, name: str) -> CaseAnswer:
    t, ends = frame.member_table, answer.cases[name].ends.copy()
    m = np.arange(len(frame.members))
    for end, x, side, sign in ((0, t.zone[:, 0], -1, 1.0), (1, t.length - t.zone[:, 1], 1, -1.0)):
        there = answer.spans.along(name, m, x, np.full(len(m), side))
        zoned = t.zone[:, end] > 0
        ends[zoned, end, 2] = sign * there[zoned, 2]
    return replace(answer.cases[name], ends=ends)


def _less(frame: Frame, answer: Answer, name: str, j: int, share: float) -> CaseAnswer:
    """Moments at joint j less by a share; shears and reactions by statics."""
    t, c = frame.member_table, answer.cases[name]
    ends, reactions = c.ends.copy(), c.reactions.copy()
    for m, end in np.argwhere(t.ends == j):
        gone = share * c.ends[m, end, 2]
        ends[m, end, 2] -= gone
        reactions[j, 2] -= gone if frame.support_table.stiffness[j, 2] != FREE else 0.0
        up = gone / t.length[m]
        ends[m, 0, 1] += up
        ends[m, 1, 1] -= up
        for e, force in ((0, up), (1, -up)):
            reactions[t.ends[m, e], :2] += force * np.array([-t.sin[m], t.cos[m]])
    return replace(c, ends=ends, reactions=reactions)


# --- mistakes of the paste ---------------------------------------------------------------------------


def _pastes(frame: Frame, case: str, r: Random) -> Iterator[Mistake]:
    """Mistakes of the paste: what they do is decided when the values are there."""
    seed = r.random()
    members = list(frame.members)
    for kind, sort, do in (
        ("units", "units of a column", _unit), ("units", "units everywhere", _unit_everywhere),
        ("transcription", "rows swapped", _swap),
        ("transcription", "digits transposed", _transpose),
        ("transcription", "decimal slip", _slip), ("signs", "sign of one value", _one_sign),
    ):  # fmt: skip
        yield Mistake(kind, sort, (), paste=lambda v, do=do: do(v, Random(seed)))
    for name in r.sample(members, min(2, len(members))):
        yield Mistake("signs", "signs of a member", (name,), paste=lambda v, name=name: _member_signs(v, name))
    yield Mistake("load", "all reversed", (), paste=lambda v: [replace(q, value=-q.value) for q in v])


def _changed(values: list[ClaimedValue], k: int, value: float, half: float | None = None) -> list[ClaimedValue]:
    out = list(values)
    if k < 0:
        return out
    out[k] = replace(out[k], value=value, half_digit=out[k].half_digit if half is None else half)
    return out


def _unit(values: list[ClaimedValue], r: Random) -> list[ClaimedValue]:
    quantity, f = r.choice(
        [("moment", 1e3), ("moment", 1e-3), ("shear", 1e3), ("axial", 1e-3), ("rotation", 180 / math.pi)]
    )
    return [replace(v, value=v.value * f, half_digit=v.half_digit * f) if v.quantity == quantity else v for v in values]


def _unit_everywhere(values: list[ClaimedValue], r: Random) -> list[ClaimedValue]:
    """One unit of force and one of length taken for others throughout."""
    force, length = r.choice([(1e3, 1e3), (1e-3, 1e-3), (1e3, 1.0), (4.4482216152605, 0.3048), (1 / 4.4482216152605, 12.0)])
    factor = {"moment": force * length, "dx": length, "dy": length, "rotation": 1.0}
    return [
        replace(v, value=v.value * f, half_digit=v.half_digit * f) for v in values for f in [factor.get(v.quantity, force)]
    ]


def _swap(values: list[ClaimedValue], r: Random) -> list[ClaimedValue]:
    lines = sorted({v.line for v in values if v.kind == "end"})
    if len(lines) < 2:
        return values
    a, b = r.sample(lines, 2)
    of = {n: {v.quantity: v for v in values if v.line == n} for n in (a, b)}
    if of[a].keys() != of[b].keys():
        return values
    out = []
    for v in values:
        other = of[b] if v.line == a else of[a] if v.line == b else None
        w = other[v.quantity] if other is not None else v
        out.append(replace(v, value=w.value, half_digit=w.half_digit))
    return out


def _large(values: list[ClaimedValue], r: Random) -> int:
    """Index of one of the larger end moments; -1 where there is none."""
    peak = max((abs(v.value) for v in values if v.kind == "end" and v.quantity == "moment"), default=0.0)
    large = [k for k, v in enumerate(values) if v.kind == "end" and v.quantity == "moment" and abs(v.value) > 0.2 * peak]
    return r.choice(large) if large else -1


def _transpose(values: list[ClaimedValue], r: Random) -> list[ClaimedValue]:
    k = _large(values, r)
    if k < 0:
        return values
    v = values[k]
    unit = 2 * v.half_digit
    digits = str(round(abs(v.value) / unit))
    n = r.randrange(max(len(digits) - 2, 1))
    new = digits[:n] + digits[n + 1 : n + 2] + digits[n] + digits[n + 2 :]
    return _changed(values, k, math.copysign(int(new) * unit, v.value))


def _slip(values: list[ClaimedValue], r: Random) -> list[ClaimedValue]:
    k = _large(values, r)
    f = r.choice([0.1, 10.0])
    return _changed(values, k, values[k].value * f, values[k].half_digit * f)


def _one_sign(values: list[ClaimedValue], r: Random) -> list[ClaimedValue]:
    k = _large(values, r)
    return _changed(values, k, -values[k].value)


def _member_signs(values: list[ClaimedValue], name: str) -> list[ClaimedValue]:
    return [replace(v, value=-v.value) if v.member == name and v.quantity in ("moment", "shear") else v for v in values]


# --- running it --------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Record:
    """One mistake tried. rank: of the first right suspect, 0 for none. first: the first three suspects, in words."""

    seed: int
    kind: str
    sort: str
    where: tuple[str, ...]
    verdict: str
    rank: int
    count: int
    first: tuple[str, ...]
    explains: float
    seconds: float


def drawn(seed: int, per: int, digits: int | None = 4, only: str = "all", choose: Callable[[Mistake], bool] | None = None
          ) -> Iterator[tuple[Frame, str, Mistake, check.Opinions, list[ClaimedValue]]]:  # fmt: skip
    """The claims of one random frame, `per` of them, every sort of mistake once before any comes twice.

    digits: None for full precision. only: as claim_values.
    """
    r = Random(seed)
    found = corpus_frame(seed, r)
    if found is None:
        return
    frame, case, opinions = found
    base = opinions.answers["slope-deflection"].cases[case]
    peak = float(np.abs(np.nan_to_num(base.ends[:, :, 2])).max(initial=0.0))
    order = sorted(enumerate(mistakes(frame, case, r)), key=lambda km: km[0])
    seen: dict[str, int] = {}
    ranked = []
    for _, m in order:
        seen[m.sort] = seen.get(m.sort, 0) + 1
        ranked.append((seen[m.sort], len(ranked), m))
    taken = 0
    for _, _, mistake in sorted(ranked, key=lambda x: x[:2]):
        if taken == per:
            return
        if choose is not None and not choose(mistake):
            continue
        values = claimed(frame, mistake, case, digits, seed % 2 == 0, only)
        least = max(EFFECT * peak, FAINT * opinions.judgements[case].scales.moments)
        if values and peak and _effect(frame, base, values) >= least:
            taken += 1
            yield frame, case, mistake, opinions, values


def corpus_frame(seed: int, r: Random) -> tuple[Frame, str, check.Opinions] | None:
    """A random frame, one of its cases and slope-deflection's opinion on it; None where a seed gives none.

    Of every ten, the loads of two are brought near the critical, and one of these is of second order.
    """
    try:
        frame = random_frame(seed)
    except (ArithmeticError, RuntimeWarning, AssertionError):
        return None
    case = r.choice(frame.names)
    try:
        if seed % 10 in (2, 7):
            frame = _near_critical(frame, case, 2 if seed % 10 == 7 else 1)
        return frame, case, opinions_on(frame, (case,))
    except (UnusableInput, AssertionError):
        return None


def _near_critical(frame: Frame, case: str, order: int) -> Frame:
    """The frame with all loads scaled so that the case's critical load factor is NEAR_CRITICAL; as it is where none is."""
    factor = slope_deflection.critical_factors(frame, (case,), 1e6).get(case, math.inf)
    if not math.isfinite(factor):
        return frame
    f = factor / NEAR_CRITICAL
    cases = {n: replace(c, loads=tuple(times(q, f) for q in c.loads)) for n, c in frame.cases.items()}
    return replace(frame, cases=cases, analysis=replace(frame.analysis, order=order))


def claimed(frame: Frame, mistake: Mistake, case: str, digits: int | None, fixed: bool, only: str) -> list[ClaimedValue]:
    """What the other analysis printed; nothing where it could not be made."""
    other = frame if mistake.frame is None else mistake.frame
    name = mistake.name or case
    answer = solved(other, (name,))
    if answer is None or name not in answer.cases:
        return []
    result = answer.cases[name] if mistake.adjust is None else mistake.adjust(other, answer, name)
    if result is None:
        return []
    values = case_values(other, result, case, 12 if digits is None else digits, fixed and digits is not None, only)
    return values if mistake.paste is None else mistake.paste(values)


def _effect(frame: Frame, base: CaseAnswer, values: list[ClaimedValue]) -> float:
    """The largest change of an end moment."""
    off = [0.0]
    for v in values:
        if v.kind == "end" and v.quantity == "moment" and v.member in frame.members:
            end = 0 if frame.members[v.member].joint_from == v.joint else 1
            off.append(abs(v.value - base.ends[frame.member_index[v.member], end, 2]))
    return max(off)


def tried(
    frame: Frame, case: str, mistake: Mistake, opinions: check.Opinions, values: list[ClaimedValue], seed: int
) -> Record:
    """Judge the claim and look for suspects."""
    closed = closed_claim(values)
    claims = judged(frame, opinions, closed)
    start = time.process_time()
    found = search(frame, opinions, closed, claims, CLAIM) if any(c.verdict == "disagree" for c in claims) else None
    spent = time.process_time() - start
    suspects = found.suspects if found else ()
    rank = next((k + 1 for k, s in enumerate(suspects) if right(frame, case, mistake, s, closed)), 0)
    says = tuple(f"{s.kind} {s.where}: {s.says}" for s in suspects[:3])
    verdict = worst([c.verdict for c in claims])
    return Record(seed, mistake.kind, mistake.sort, mistake.where, verdict, rank, len(suspects), says,
                  suspects[0].explains if suspects else 0.0, spent)  # fmt: skip


def right(frame: Frame, case: str, mistake: Mistake, suspect: Suspect, closed: ClosedClaim) -> bool:
    """The true mistake (kind, and a place of it), or one whose results, by moment distribution, the claim cannot tell."""
    if suspect.kind == mistake.kind and (not mistake.where or set(mistake.where) & set(suspect.where)):
        return True
    changed, claim = suspect.change.apply(frame, closed)
    name = claim.cases[0]
    answer = solved(changed, (name,))
    if answer is None:
        return False
    table = {
        (v.kind, v.quantity, v.member, v.joint): v.value for v in case_values(changed, answer.cases[name], name, 15, False)
    }
    at_faces = any(v.kind == "span" for v in claim.values)
    if at_faces:
        return False
    for v in claim.values:
        there = table.get((v.kind, v.quantity, v.member, v.joint))
        if there is not None and abs(there - v.value) > 1.06 * v.half_digit + 1e-6 * abs(v.value):
            return False
    return True


def run(seeds: Iterable[int], per: int, digits: int | None = 4, only: str = "all") -> Iterator[Record]:
    for seed in seeds:
        for frame, case, mistake, opinions, values in drawn(seed, per, digits, only):
            yield tried(frame, case, mistake, opinions, values, seed)


# --- two mistakes at once


def drawn_pairs(
    seed: int, per: int
) -> Iterator[tuple[Frame, str, tuple[Mistake, Mistake], check.Opinions, list[ClaimedValue]]]:
    """Claims of one random frame with two mistakes of the frame, at 4 digits; each of the two changes what the other alone
    makes by more than 3% of the peak end moment."""
    r = Random(f"pairs {seed}")
    found = corpus_frame(seed, r)
    if found is None:
        return
    frame, case, opinions = found
    base = opinions.answers["slope-deflection"].cases[case]
    peak = float(np.abs(np.nan_to_num(base.ends[:, :, 2])).max(initial=0.0))
    least = max(EFFECT * peak, FAINT * opinions.judgements[case].scales.moments)
    for _ in range(6 * per):
        if per == 0 or not peak:
            return
        one = _any_sort(_of_the_frame(frame, case, r), r)
        two = None if one is None or one.frame is None else _any_sort(_of_the_frame(one.frame, case, r), r)
        if one is None or two is None or two.frame is None:
            continue
        alike = [m for k in range(20) for m in _of_the_frame(frame, case, Random(k))
                 if (m.sort, m.where) == (two.sort, two.where)][:1]  # fmt: skip
        values, *alone = (claimed(frame, m, case, 4, seed % 2 == 0, "all") for m in (two, one, *alike))
        answers = [solved(m.frame or frame, (case,)) for m in (one, *alike)]
        against = [base, *(a.cases[case] for a in answers if a is not None and case in a.cases)]
        if alike and values and all(alone) and all(_effect(frame, c, values) >= least for c in against):
            per -= 1
            yield frame, case, (one, two), opinions, values


def _of_the_frame(frame: Frame, case: str, r: Random) -> list[Mistake]:
    """Mistakes of the frame alone, all its members kept."""
    every = mistakes(frame, case, r)
    return [m for m in every if m.frame is not None and not (m.paste or m.name or m.adjust) and m.sort != "member missing"]


def _any_sort(some: list[Mistake], r: Random) -> Mistake | None:
    """One of the mistakes, every sort as likely."""
    if not some:
        return None
    sort = r.choice(sorted({m.sort for m in some}))
    return r.choice([m for m in some if m.sort == sort])


def tried_pair(
    frame: Frame, case: str, pair: tuple[Mistake, Mistake], opinions: check.Opinions, values: list[ClaimedValue], seed: int
) -> Record:
    """As tried(), of two mistakes. Right is a suspect of two that names a kind and places of both, or whose results the
    claim cannot tell from its own."""
    closed = closed_claim(values)
    claims = judged(frame, opinions, closed)
    start = time.process_time()
    found = search(frame, opinions, closed, claims, CLAIM) if any(c.verdict == "disagree" for c in claims) else None
    spent = time.process_time() - start
    suspects = found.suspects if found else ()
    nobody = Mistake("", "", ("",))
    rank = next((k + 1 for k, s in enumerate(suspects) if both_named(pair, s) or right(frame, case, nobody, s, closed)), 0)
    order = "second order" if frame.analysis.order == 2 else "first order"
    where = tuple(w for m in pair for w in m.where)
    says = tuple(f"{s.kind} {s.where}: {s.says}" for s in suspects[:3])
    return Record(seed, order, f"{pair[0].sort} + {pair[1].sort}", where, worst([c.verdict for c in claims]), rank,
                  len(suspects), says, suspects[0].explains if suspects else 0.0, spent)  # fmt: skip


def both_named(pair: tuple[Mistake, Mistake], suspect: Suspect) -> bool:
    """Whether a suspect is of two mistakes, of a kind of theirs, and names a place of each that has one."""
    places = all(not m.where or set(m.where) & set(suspect.where) for m in pair)
    return ", and " in suspect.says and suspect.kind in {m.kind for m in pair} and places


def run_pairs(seeds: Iterable[int], per: int) -> Iterator[Record]:
    for seed in seeds:
        for frame, case, pair, opinions, values in drawn_pairs(seed, per):
            yield tried_pair(frame, case, pair, opinions, values, seed)


def table(records: list[Record]) -> str:
    """Per kind and sort: how many, called disagree, right first, right among the first three, none named."""
    rows: dict[tuple[str, str], list[Record]] = {}
    for record in records:
        rows.setdefault((record.kind, record.sort), []).append(record)
    lines = [f"{'kind':15}{'sort':28}{'tried':>6}{'disagree':>9}{'first':>6}{'three':>6}{'none':>6}"]
    for (kind, sort), mine in [*sorted(rows.items()), (("all", ""), records)]:
        judged_ = [x for x in mine if x.verdict == "disagree"]
        first, three = sum(x.rank == 1 for x in judged_), sum(0 < x.rank <= 3 for x in judged_)
        none = sum(x.count == 0 for x in judged_)
        lines.append(f"{kind:15}{sort:28}{len(mine):6}{len(judged_):9}{first:6}{three:6}{none:6}")
    return "\n".join(lines)


if __name__ == "__main__":
    import sys

    first, last, each = map(int, sys.argv[1:4])
    what = sys.argv[4] if len(sys.argv) > 4 else "all"
    done: list[Record] = []
    try:
        for got in run_pairs(range(first, last), each) if what == "pairs" else run(range(first, last), each, only=what):
            done.append(got)
            if got.rank != 1:
                print(got, flush=True)
    finally:
        print(table([replace(x, sort="pairs") for x in done] if what == "pairs" else done))
    print(f"{len({x.seed for x in done})} frames, {sum(x.seconds for x in done) / max(len(done), 1):.3f} s each")
