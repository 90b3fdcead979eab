"""Approximate values by hand methods, beside the computed ones: portal, cantilever and free-moment method.

They are no opinion: rough, and known to be. A computed value several times off them wants a reason.
Published: A. Smith's portal method and A. C. Wilson's cantilever method as in any book on frames (from memory); the
free moment and points of inflection at a tenth of the span are common practice.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from crosscheck.frame.model import FREE, Floats, Frame
from crosscheck.review.finding import Subject, global_loads
from crosscheck.review.storeys import Storey, storeys_of

INFLECTION = 0.1
"""Of the span: where a framed beam under gravity load is taken to have its points of inflection."""


@dataclass(frozen=True, slots=True)
class Sidesway:
    """Sizes of end moments by the portal and the cantilever method, and the computed one; member, and joint at its end."""

    case: str
    member: str
    joint: str
    portal: float
    cantilever: float
    computed: float


@dataclass(frozen=True, slots=True)
class FreeMoment:
    """A loaded beam: its free moment at the place where it is greatest; sagging there and mean hogging of the ends, as
    approximated and as computed."""

    case: str
    member: str
    free: float
    sagging: float
    hogging: float
    computed_sagging: float
    computed_hogging: float


@dataclass(frozen=True, slots=True)
class Approximation:
    """What the hand methods give, and why one of them gives nothing."""

    sidesway: tuple[Sidesway, ...]
    free: tuple[FreeMoment, ...]
    notes: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Grid:
    """A regular frame: storeys with the same gridlines, and beams[level, bay] between neighbouring columns, all there.

    x: gridlines. pinned: (lines,) True where a column's foot turns freely.
    """

    storeys: tuple[Storey, ...]
    x: Floats
    beams: tuple[tuple[int, ...], ...]
    pinned: tuple[bool, ...]


def approximations(subject: Subject) -> Approximation:
    """All that the hand methods can say of the frame's load cases."""
    grid = grid_of(subject.frame)
    notes = [] if grid else ["portal and cantilever method: the frame is no unbraced regular grid with stiff joints"]
    sidesway = [row for case in sideways_cases(subject) for row in _sidesway(subject, grid, case)] if grid else []
    if grid and not sidesway:
        notes.append("portal and cantilever method: no load case acts sideways")
    free = [row for case in subject.frame.cases for row in _free_moments(subject, case)]
    return Approximation(tuple(sidesway), tuple(free), tuple(notes))


# --- portal and cantilever method


def grid_of(frame: Frame) -> Grid | None:
    """The frame as a regular grid, None where it is none: bracing, missing beams, hinged beams or columns, other lines."""
    storeys = storeys_of(frame)
    t = frame.member_table
    if not storeys or any(set(s.crossing) != set(s.columns) or len(s.columns) < 2 for s in storeys):
        return None
    x = frame.xy[list(storeys[0].joints), 0]
    between = {frozenset(map(int, ends)): k for k, ends in enumerate(t.ends)}
    beams = []
    for storey in storeys:
        level = [between.get(frozenset(pair)) for pair in zip(storey.joints, storey.joints[1:], strict=False)]
        if len(storey.columns) != len(x) or not np.allclose(frame.xy[list(storey.joints), 0], x, rtol=1e-6, atol=1e-9):
            return None
        own = [*(k for k in level if k is not None), *storey.columns]
        if None in level or (t.turn[own] == FREE).any():
            return None
        beams.append(tuple(k for k in level if k is not None))
    names = list(frame.joints)
    feet = [frame.supports[names[j]] for j in storeys[0].feet]
    return Grid(storeys, x, tuple(beams), tuple(s.rotation == FREE for s in feet))


def sideways_cases(subject: Subject) -> list[str]:
    """Load cases that push sideways and hardly down."""
    total = {name: np.abs(subject.total(name)[:2]) for name in subject.frame.cases}
    return [name for name, (fx, fy) in total.items() if name in subject.solved and fx > 0 and fy <= 0.1 * fx]


def level_forces(subject: Subject, grid: Grid, case: str) -> Floats:
    """(levels,) horizontal force at each level above the feet; forces between levels go to the two by the lever rule."""
    loads = global_loads(subject.frame, subject.tables[case])
    levels = np.array([grid.storeys[0].bottom, *(s.top for s in grid.storeys)])
    at = np.clip(loads.y, levels[0], levels[-1])
    k = np.clip(np.searchsorted(levels, at, side="right") - 1, 0, len(levels) - 2)
    share = (at - levels[k]) / (levels[k + 1] - levels[k])
    out = np.zeros(len(levels))
    np.add.at(out, k, loads.fx * (1 - share))
    np.add.at(out, k + 1, loads.fx * share)
    return out[1:]


def inflection(grid: Grid, storey: int) -> Floats:
    """(lines,) height of the columns' points of inflection over the storey's bottom: half way, at a pinned foot there."""
    half = np.full(len(grid.x), grid.storeys[storey].height / 2)
    return np.where(grid.pinned, 0.0, half) if storey == 0 else half


def portal(grid: Grid, forces: Floats) -> tuple[Floats, Floats, Floats]:
    """End moments by the portal method: column tops and feet (storeys, lines), beam ends (levels, bays), sizes with sign.

    The shear of a storey goes to its columns, to an inner one twice what an outer one takes; points of inflection at mid
    height (at a pinned foot) and mid span.
    """
    shear = np.cumsum(forces[::-1])[::-1]
    weight = np.full(len(grid.x), 2.0)
    weight[[0, -1]] = 1.0
    columns = shear[:, None] * weight / weight.sum()
    foot = np.array([columns[s] * inflection(grid, s) for s in range(len(shear))])
    top = np.array([columns[s] * (grid.storeys[s].height - inflection(grid, s)) for s in range(len(shear))])
    joint = top + np.vstack([foot[1:], np.zeros(len(grid.x))])
    beams = np.zeros((len(shear), len(grid.x) - 1))
    left = np.zeros(len(shear))
    for bay in range(beams.shape[1]):
        beams[:, bay] = left = joint[:, bay] - left
    return top, foot, beams


def cantilever_axial(grid: Grid, forces: Floats, areas: Floats) -> Floats:
    """(storeys, lines) axial forces of columns, tension positive, in proportion to their distance from the centroid."""
    centre = (areas * grid.x).sum(axis=1) / areas.sum(axis=1)
    arm = grid.x - centre[:, None]
    tops = np.array([s.top for s in grid.storeys])
    out = np.zeros(areas.shape)
    for s, storey in enumerate(grid.storeys):
        cut = storey.bottom + float(inflection(grid, s).mean())
        moment = float((forces[s:] * (tops[s:] - cut)).sum())
        out[s] = -moment * areas[s] * arm[s] / float((areas[s] * arm[s] ** 2).sum())
    return out


def cantilever(grid: Grid, forces: Floats, areas: Floats) -> tuple[Floats, Floats, Floats]:
    """End moments by the cantilever method, as portal() gives them: beam shears from the columns' axial forces, points of
    inflection at mid height (at a pinned foot) and mid span."""
    axial = cantilever_axial(grid, forces, areas)
    added = axial - np.vstack([axial[1:], np.zeros(len(grid.x))])
    beams = np.cumsum(added, axis=1)[:, :-1] * np.diff(grid.x) / 2
    joint = np.pad(beams, ((0, 0), (0, 1))) + np.pad(beams, ((0, 0), (1, 0)))
    top, foot = np.zeros(axial.shape), np.zeros(axial.shape)
    below = np.zeros(len(grid.x))
    for s in range(len(forces) - 1, -1, -1):
        top[s] = joint[s] - below
        low = inflection(grid, s)
        foot[s] = below = top[s] * low / (grid.storeys[s].height - low)
    return top, foot, beams


def _sidesway(subject: Subject, grid: Grid, case: str) -> Iterator[Sidesway]:
    frame, ends = subject.frame, subject.solved[case].ends
    t, forces = frame.member_table, level_forces(subject, grid, case)
    areas = np.array([t.A[list(s.columns)] for s in grid.storeys])
    areas = np.where(np.isfinite(areas).all(), areas, 1.0)
    rough, lean = portal(grid, forces), cantilever(grid, forces, areas)

    def row(k: int, joint: int, a: float, b: float) -> Sidesway:
        computed = abs(float(ends[k, int(t.ends[k, 1] == joint), 2]))
        return Sidesway(case, list(frame.members)[k], list(frame.joints)[joint], abs(a), abs(b), computed)

    for s, storey in enumerate(grid.storeys):
        for line, k in enumerate(storey.columns):
            yield row(k, storey.feet[line], rough[1][s, line], lean[1][s, line])
            yield row(k, storey.joints[line], rough[0][s, line], lean[0][s, line])
        for bay, k in enumerate(grid.beams[s]):
            yield row(k, storey.joints[bay], rough[2][s, bay], lean[2][s, bay])
            yield row(k, storey.joints[bay + 1], rough[2][s, bay], lean[2][s, bay])


# --- free moments


def free_moment(subject: Subject, case: str, member: int, x: Floats) -> Floats:
    """Moment at distances x of a member on two simple supports under its own loads of a case, sagging positive."""
    table, length = subject.tables[case], float(subject.frame.member_table.length[member])
    own = table.point_member == member
    at, force = table.point_at[own], table.point_across[own]
    for k in np.flatnonzero(table.line_member == member):
        # Two Gauss points a slice are exact for the linear load times the linear influence line within it.
        cuts = np.unique(np.clip(np.concatenate([x, [table.line_start[k], table.line_end[k]]]),
                                 table.line_start[k], table.line_end[k]))  # fmt: skip
        half = np.diff(cuts) / 2
        places = np.concatenate([cuts[:-1] + half * (1 + g) for g in (-(3**-0.5), 3**-0.5)])
        share = (places - table.line_start[k]) / (table.line_end[k] - table.line_start[k])
        size = table.line_across[k, 0] * (1 - share) + table.line_across[k, 1] * share
        at, force = np.concatenate([at, places]), np.concatenate([force, size * np.concatenate([half, half])])
    below = np.minimum.outer(x, at) * (length - np.maximum.outer(x, at)) / length
    return np.asarray(-(below * force).sum(axis=1))


def _free_moments(subject: Subject, case: str) -> Iterator[FreeMoment]:
    """Loaded beams whose ends both meet something: hogging is the free moment at the points of inflection."""
    frame, t = subject.frame, subject.frame.member_table
    if case not in subject.solved or subject.answer is None:
        return
    for k, name in enumerate(frame.members):
        if abs(t.sin[k]) >= 0.8 or t.zone[k].any():
            continue
        x = t.length[k] * np.linspace(0.0, 1.0, 41)
        moment = free_moment(subject, case, k, x) * (1.0 if t.cos[k] > 0 else -1.0)
        peak = int(np.argmax(np.abs(moment)))
        if not abs(moment[peak]) > 0:
            continue
        ends, share = subject.solved[case].ends[k, :, 2], float(x[peak] / t.length[k])
        fixed = t.turn[k] != FREE
        low, high = (float(np.interp(at * t.length[k], x, moment)) for at in (INFLECTION, 1 - INFLECTION))
        line = np.where(fixed[0], low, 0.0) * (1 - share) + np.where(fixed[1], high, 0.0) * share
        side = 1.0 if t.cos[k] > 0 else -1.0
        computed = side * float(ends[0] * (1 - share) - ends[1] * share)
        yield FreeMoment(
            case, name, float(moment[peak]), float(moment[peak] - line), float(line),
            float(moment[peak] + computed), -computed,
        )  # fmt: skip
