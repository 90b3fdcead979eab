"""The frame divided for the library, and its loads laid on the divisions: places, forces and moments of force only.

The library takes forces and couples at nodes and line loads over a whole member, and no others, so members are divided
where their loads ask for it. Very short divisions would cost digits (rounding grows with (L/d)^3), so places keep a
least distance, and a load that falls between is *restated*: four forces at neighbouring places of the member with the
same sum and the same first, second and third moments. The end actions that a load calls forth in a straight prismatic
member are cubic polynomials in the load's position (by Betti's law, Il Nuovo Cimento 7-8 (1872), 5-21, they are
deflected shapes of the unloaded member), so nothing outside those four places can tell the difference, whatever the
ends' connections. Values between the four are hidden. So is a couple inside a hinge restated, which no node could take.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from crosscheck.frame.loads import SNAP, LoadTable
from crosscheck.frame.model import HELD, Bools, Floats, Frame, Ints

GAP = 0.02
"""Least distance of neighbouring places as a share of the member's length."""
WINDOW = 4
"""Forces that restate a load."""
GAUSS = ((-(0.6**0.5), 5 / 9), (0.0, 8 / 9), (0.6**0.5, 5 / 9))
"""Three-point rule on [-1, 1] (place, weight), exact to degree 5: a linear load times a cubic shape has degree 4."""


@dataclass(frozen=True, slots=True)
class Mesh:
    """Places along the members, flat: place p stands at x[p] of member[p] and is node[p].

    Places `first[m]:first[m + 1]` are member m's, ends included. Nodes 0.. are the frame's joints, then inner places.
    A piece is named by the place where it starts: p, for every p that is not the last of its member.
    """

    member: Ints
    x: Floats
    node: Ints
    first: Ints
    nodes: int

    def of(self, m: int) -> slice:
        return slice(int(self.first[m]), int(self.first[m + 1]))

    @property
    def pieces(self) -> Ints:
        return np.flatnonzero(self.member[:-1] == self.member[1:])


@dataclass(frozen=True, slots=True)
class Laid:
    """Loads on a mesh, along a member's local x, along its local y, and clockwise.

    force: (places, 3) at places. line: (places, 2, 2) over the piece that starts there, at its [start, end], [along,
    across]. joint: (j, 3) on joints, global fx, fy, couple. clear: (places, 2) False where a restated load hides the
    forces just before or after the place; clear_across: (places,) the same for displacement.
    """

    force: Floats
    line: Floats
    joint: Floats
    clear: Bools
    clear_across: Bools


def divide(frame: Frame, table: LoadTable, stations: tuple[Ints, Floats] | None = None) -> Mesh:
    """Places at the table's loads and, given `stations` (member indices, distances), there too where room is left."""
    t = frame.member_table
    rows = [_places(frame, table, m, stations) for m in range(len(t.length))]
    first = np.concatenate([[0], np.cumsum([len(row) for row in rows])]).astype(np.int64)
    member = np.repeat(np.arange(len(rows)), np.diff(first))
    node = np.empty(first[-1], dtype=np.int64)
    ends = np.zeros(first[-1], dtype=bool)
    ends[first[:-1]] = ends[first[1:] - 1] = True
    node[first[:-1]], node[first[1:] - 1] = t.ends[:, 0], t.ends[:, 1]
    joints = len(frame.joints)
    node[~ends] = joints + np.arange(int((~ends).sum()))
    return Mesh(member, np.concatenate(rows), node, first, joints + int((~ends).sum()))


def _places(frame: Frame, table: LoadTable, m: int, stations: tuple[Ints, Floats] | None) -> Floats:
    """Sorted places of one member: ends, loads, then stations, each kept unless too near to one kept already."""
    length = float(frame.member_table.length[m])
    point, line = table.point_member == m, table.line_member == m
    wanted = [table.point_at[point], table.line_start[line], table.line_end[line]]
    loads = np.concatenate(wanted)
    if stations is not None:
        wanted.append(stations[1][stations[0] == m])
    kept = [0.0, length]
    for x in np.concatenate(wanted).tolist():
        if min(abs(x - k) for k in kept) >= GAP * length:
            kept.append(x)
    restates = any(min(abs(x - k) for k in kept) > SNAP * length for x in loads.tolist())
    if restates or _couple_inside_connection(frame, table, m):
        while len(kept) < WINDOW:
            kept.append(_middle_of_widest(kept))
    return np.sort(np.array(kept))


def _couple_inside_connection(frame: Frame, table: LoadTable, m: int) -> bool:
    t = frame.member_table
    at = table.point_at[(table.point_member == m) & (table.point_couple != 0.0)]
    softened = np.array([0.0, t.length[m]])[t.turn[m] != HELD]
    return bool(np.isin(at, softened).any())


def _middle_of_widest(kept: list[float]) -> float:
    x = np.sort(np.array(kept))
    k = int(np.argmax(np.diff(x)))
    return float(0.5 * (x[k] + x[k + 1]))


def lay(frame: Frame, mesh: Mesh, table: LoadTable) -> Laid:
    """The table's forces, couples and line loads on the mesh."""
    layer = _Layer(frame, mesh, table.joint)
    for k in range(len(table.point_member)):
        load = np.array([table.point_along[k], table.point_across[k], table.point_couple[k]])
        layer.point(int(table.point_member[k]), float(table.point_at[k]), load)
    for k in range(len(table.line_member)):
        ends = np.column_stack([table.line_along[k], table.line_across[k]])
        layer.line(int(table.line_member[k]), float(table.line_start[k]), float(table.line_end[k]), ends)
    return layer.laid


class _Layer:
    """Lays loads one by one: whole where they fit a place or a piece, restated where they do not."""

    def __init__(self, frame: Frame, mesh: Mesh, joint: Floats) -> None:
        count = len(mesh.x)
        self.mesh, self.length, self.turn = mesh, frame.member_table.length, frame.member_table.turn
        self.laid = Laid(
            force=np.zeros((count, 3)), line=np.zeros((count, 2, 2)), joint=joint.copy(),
            clear=np.ones((count, 2), dtype=bool), clear_across=np.ones(count, dtype=bool),
        )  # fmt: skip

    def point(self, m: int, at: float, load: Floats) -> None:
        """load: (3,) along, across, clockwise couple."""
        place = self._fitting(m, at)
        if place is None or (load[2] != 0.0 and self._inside_connection(m, place)):
            self._restate(m, at, load)
        else:
            self.laid.force[place] += load

    def line(self, m: int, start: float, end: float, load: Floats) -> None:
        """load: (2, 2) intensity at [start, end], [along, across]."""
        if end <= start:
            return
        start, end = self._snapped(m, start), self._snapped(m, end)
        x = self.mesh.x[self.mesh.of(m)]
        for k in range(len(x) - 1):
            a, b = max(start, x[k]), min(end, x[k + 1])
            if b <= a:
                continue
            share = np.array([[end - a, a - start], [end - b, b - start]]) / (end - start)
            if a == x[k] and b == x[k + 1]:
                self.laid.line[self.mesh.first[m] + k] += share @ load
            else:
                self._restate_line(m, a, b, share @ load)

    def _restate_line(self, m: int, a: float, b: float, load: Floats) -> None:
        for s, weight in GAUSS:
            here = 0.5 * (load[0] + load[1]) + 0.5 * s * (load[1] - load[0])
            force = 0.5 * (b - a) * weight * here
            self._restate(m, 0.5 * (a + b) + 0.5 * s * (b - a), np.array([*force, 0.0]))

    def _restate(self, m: int, at: float, load: Floats) -> None:
        """Four forces with the load's moments up to the third. A couple is the limit of a pair of forces across, so
        the rate of change of their shares gives it, reversed because clockwise."""
        own = self.mesh.of(m)
        x = self.mesh.x[own]
        k = int(np.clip(np.searchsorted(x, at) - WINDOW // 2, 0, len(x) - WINDOW))
        share, slope = _same_moments(x[k : k + WINDOW], at)
        four = slice(own.start + k, own.start + k + WINDOW)
        self.laid.force[four, 0] += share * load[0]
        self.laid.force[four, 1] += share * load[1] - slope * load[2]
        self.laid.clear.reshape(-1)[2 * four.start + 1 : 2 * four.stop - 1] = False
        self.laid.clear_across[four.start + 1 : four.stop - 1] = False

    def _fitting(self, m: int, at: float) -> int | None:
        own = self.mesh.of(m)
        k = own.start + int(np.argmin(np.abs(self.mesh.x[own] - at)))
        return k if abs(self.mesh.x[k] - at) <= SNAP * self.length[m] else None

    def _snapped(self, m: int, at: float) -> float:
        place = self._fitting(m, at)
        return at if place is None else float(self.mesh.x[place])

    def _inside_connection(self, m: int, place: int) -> bool:
        own = self.mesh.of(m)
        at_end = (place == own.start, place == own.stop - 1)
        return any(here and turn != HELD for here, turn in zip(at_end, self.turn[m].tolist(), strict=True))


def _same_moments(x: Floats, at: float) -> tuple[Floats, Floats]:
    """Forces at the places x with the sum and moments of a unit force at `at`, and their rates of change with it."""
    span = x[-1] - x[0]
    powers = np.arange(len(x))
    s = (at - x[0]) / span
    moments = ((x - x[0]) / span) ** powers[:, None]
    rate = powers * s ** np.maximum(powers - 1, 0) / span
    both = np.linalg.solve(moments, np.column_stack([s**powers, rate]))
    return both[:, 0], both[:, 1]
