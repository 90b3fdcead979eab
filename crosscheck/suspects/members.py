"""Members softer or stiffer than stated: end releases missing or extra, semi-rigid ends, EI and EA by a factor."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from functools import partial

import numpy as np

from crosscheck.frame.model import FREE, HELD, Floats, Frame, SelfWeight, Temperature
from crosscheck.suspects.changes import Change, in_state, with_member, with_member_factors
from crosscheck.suspects.screen import Screen
from crosscheck.suspects.suspect import Family, Option, Placed, named

COMMON = (0.5, 0.7, 0.35, 0.25, 0.1, 2.0, 10.0, 0.01, 100.0, 1e-4)
"""Factors that mistakes of stiffness often have: cracked sections, halves, decimal slips, units."""
RELEASE, UNRELEASE, SPRING, STIFFNESS, FITTED = 0.4, 0.4, 0.9, 0.7, 1.3
OTHER_SECTION = 0.6


@dataclass(frozen=True, slots=True)
class _Trial:
    """One member's change: EI and EA factors and end connections, how it reads, and how rare it is."""

    member: int
    bending: float
    stretching: float
    turn: tuple[float, float]
    kind: str
    says: str
    cost: float
    section: str = ""
    family: str = ""


def member_options(screen: Screen) -> Iterator[Option]:
    """The best fixed member changes, by what they leave over."""
    frame = screen.frame
    fixed = [t for m in range(len(frame.members)) for t in _fixed(frame, m)]
    left, actions = _weigh(screen, fixed)
    for k in np.argsort(left)[:80].tolist():
        if np.isfinite(left[k]):
            yield _option(screen, fixed[k], [a[k] for a in actions])


def _weigh(screen: Screen, trials: list[_Trial]) -> tuple[Floats, list[Floats]]:
    member = np.array([t.member for t in trials], dtype=np.int64)
    bending, stretching = np.array([t.bending for t in trials]), np.array([t.stretching for t in trials])
    turn = np.array([t.turn for t in trials], dtype=float).reshape(-1, 2)
    actions = [screen.base.member_actions(n, member, bending, stretching, turn) for n in screen.seen.names]
    return screen.left_by(screen.member_grams, member, actions), actions


def _option(screen: Screen, t: _Trial, actions: list[Floats], fitted: int = 0) -> Option:
    return _plain(screen.frame, t, screen.delta_of(screen.effects.member, t.member, actions), fitted)


def _plain(frame: Frame, t: _Trial, delta: Floats | None, fitted: int) -> Option:
    name = list(frame.members)[t.member]
    where = (named(frame, "member", name),)
    return Option(t.kind, where, t.says, Change(_change(t, name)), t.cost, delta, fitted=fitted)


def _change(t: _Trial, name: str) -> Callable[[Frame], Frame]:
    if t.section:
        return partial(with_member, name=name, section=t.section)
    if t.kind == "stiffness":
        return partial(with_member_factors, name=name, bending=t.bending, stretching=t.stretching)
    return partial(with_member, name=name, turn_from=t.turn[0], turn_to=t.turn[1])


def _fixed(frame: Frame, m: int) -> Iterator[_Trial]:
    name = list(frame.members)[m]
    member = frame.members[name]
    own = (member.turn_from, member.turn_to)
    label, ends = named(frame, "member", name), (member.joint_from, member.joint_to)
    for end in (0, 1):
        other = own[1 - end]
        for value, says, cost in _connections(own[end]):
            turn = (value, other) if end == 0 else (other, value)
            yield _Trial(m, 1.0, 1.0, turn, "end release", f"{label} {says} at {ends[end]}", cost)
    if FREE not in own:
        yield _Trial(m, 1.0, 1.0, (FREE, FREE), "end release", f"{label} was hinged at both ends", RELEASE + 0.2)
    if own == (FREE, FREE):
        yield _Trial(m, 1.0, 1.0, (HELD, HELD), "end release", f"{label} had no hinges", UNRELEASE)
    elastic = frame.analysis.axial == "elastic"
    for factor in COMMON:
        yield _Trial(m, factor, 1.0, own, "stiffness", f"{label} had {factor:g} times its EI", STIFFNESS)
        if elastic:
            yield _Trial(m, 1.0, factor, own, "stiffness", f"{label} had {factor:g} times its EA", STIFFNESS + 0.2)
            yield _Trial(m, factor, factor, own, "stiffness", f"{label} had {factor:g} times its EI and EA", STIFFNESS)
    s = frame.sections[member.section]
    if member.pieces:
        return
    bends, stretches = in_state(frame, member.section)
    for q in frame.sections.values():
        new, area = in_state(frame, q.name)
        stretch = area / stretches if area and stretches else 1.0
        if q.name != s.name:
            yield _Trial(
                m, new / bends, stretch, own, "stiffness", f"{label} was given section {q.name}", OTHER_SECTION, q.name
            )


def _connections(now: float) -> Iterator[tuple[float, str, float]]:
    """Other end connections in words, with how rare they are as a mistake."""
    if now == HELD:
        yield FREE, "was hinged", RELEASE
    elif now == FREE:
        yield HELD, "had no hinge", UNRELEASE
    else:
        yield HELD, "was rigidly joined", 0.2
        yield FREE, "was hinged", 0.3
        for factor in (1e3, 1e-3, 10.0, 0.1, 1e6, 1e-6):
            yield now * factor, f"had a connection {factor:g} times as stiff (a slip of unit?)", 0.5


# --- fitted ---

SPAN_OF_FACTORS = (0.02, 50.0)
GRID, KEPT = 25, 8


def member_fits(screen: Screen) -> Iterator[Option]:
    """EI, EA, both, and the stiffness of either end connection, each fitted for the members that promise most."""
    frame = screen.frame
    least = screen.least(screen.member_grams)
    found: list[tuple[float, Option]] = []
    for m in np.argsort(least)[:KEPT].tolist():
        if least[m] > max(4.0 * len(screen.residual), 0.1 * screen.total):
            break
        for family in ("EI", "EA", "EI and EA", "from", "to"):
            if "EA" in family and frame.analysis.axial == "rigid":
                continue
            got = _fit(screen, m, family)
            if got is not None:
                found.append(got)
    for _, option in sorted(found, key=lambda f: f[0]):
        yield option


def _fit(screen: Screen, m: int, family: str) -> tuple[float, Option] | None:
    """What is left over, and the member change with the factor that fits best; None where it fits badly."""

    def trial(p: float) -> _Trial:
        return _member_trial(screen.frame, m, family, p)

    def delta(p: float) -> Floats:
        return screen.delta_of(screen.effects.member, m, [a[0] for a in _weigh(screen, [trial(p)])[1]])

    grid = np.geomspace(*SPAN_OF_FACTORS, GRID)
    left, _ = _weigh(screen, [trial(float(g)) for g in grid])
    if not np.isfinite(left).any():
        return None
    p = screen.fitted(delta, float(grid[int(np.argmin(left))]))
    left, actions = _weigh(screen, [trial(p)])
    option = _option(screen, trial(p), [a[0] for a in actions], 1)
    again = (partial(_solved_again, screen.frame, m, family), p)
    return (float(left[0]), replace(option, again=again)) if left[0] <= 0.5 * screen.total else None


def _solved_again(frame: Frame, m: int, family: str, p: float) -> Option:
    """The same change with another number, not foretold."""
    return _plain(frame, _member_trial(frame, m, family, p), None, 1)


def _member_trial(frame: Frame, m: int, family: str, p: float) -> _Trial:
    name = list(frame.members)[m]
    member = frame.members[name]
    own = (member.turn_from, member.turn_to)
    label = named(frame, "member", name)
    if family in ("from", "to"):
        t = frame.member_table
        k = p * float(t.E[m] * t.I[m] / t.clear[m])
        turn = (k, own[1]) if family == "from" else (own[0], k)
        joint = member.joint_from if family == "from" else member.joint_to
        says = f"{label} was joined at {joint} by a spring of {k:.4g} per radian"
        return _Trial(m, 1.0, 1.0, turn, "end release", says, SPRING)
    bending, stretching = (p if "EI" in family else 1.0), (p if "EA" in family else 1.0)
    cost = FITTED if family == "EI" else FITTED + 0.2
    return _Trial(m, bending, stretching, own, "stiffness", f"{label} had {p:.4g} times its {family}", cost)


def heavy_families(frame: Frame) -> Iterator[Family]:
    """A member's area by a factor where self weight follows it: fitted by solving again."""
    heavy = any(isinstance(q, SelfWeight) for c in frame.cases.values() for q in c.loads)
    if not heavy or frame.analysis.axial == "rigid":
        return
    for m in range(len(frame.members)):
        for what in ("EA", "EI and EA"):
            yield Family(partial(_heavy, frame, m, what), (0.8, 0.4, 2.0, 0.12, 7.0), members=(m,))


def _heavy(frame: Frame, m: int, what: str, p: float) -> Option:
    trial = _member_trial(frame, m, what, p)
    name = list(frame.members)[m]
    where = (named(frame, "member", name),)
    return Option("stiffness", where, f"{trial.says} (and weight)", Change(_change(trial, name)), FITTED, fitted=1)


def section_options(frame: Frame) -> Iterator[Placed]:
    """A member given another section where weight, depth or shear area change along: to be solved again."""
    thermal = any(isinstance(q, (SelfWeight, Temperature)) for c in frame.cases.values() for q in c.loads)
    if not thermal and frame.analysis.shear == "rigid":
        return
    for m, member in enumerate(frame.members.values()):
        label = named(frame, "member", member.name)
        for other in frame.sections if not member.pieces else ():
            if other != member.section:
                change = Change(partial(with_member, name=member.name, section=other))
                says = f"{label} was given section {other}"
                yield Option("stiffness", (label,), says, change, OTHER_SECTION), (), (m,)


def every_member_option(frame: Frame) -> Iterator[Change]:
    """Each fixed member change that is weighed, for those who would try them one by one."""
    names = list(frame.members)
    for m in range(len(names)):
        for trial in _fixed(frame, m):
            yield Change(_change(trial, names[m]))
