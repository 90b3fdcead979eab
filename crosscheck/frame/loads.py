"""The loads of a case or combination as plain arrays in member and joint axes: geometry, no mechanics.

Shared by every opinion and the audit, and listed as shared in the README. It turns directions into local components,
spreads projected loads over the member's length, adds self weight and what leans with the downward load; it moves no
load and integrates none, but for the weight of a tapered piece, which it lays out as short straight loads.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from crosscheck.frame.model import (
    Direction,
    Floats,
    Frame,
    Ints,
    JointCouple,
    JointForce,
    Lean,
    Load,
    LoadCase,
    Misfit,
    PointCouple,
    PointForce,
    SelfWeight,
    Settlement,
    Spread,
    Temperature,
    Variation,
)

SNAP = 1e-9
"""Share of a member's length within which a distance counts as being at its end or at the face of a rigid zone."""


@dataclass(frozen=True, slots=True)
class LoadTable:
    """All loads of one case or combination, factors applied.

    joint: (j, 3) fx, fy, clockwise couple on joints, global axes.
    settlement: (j, 3) imposed support movement along the support's own axes x, y and clockwise rotation.
    point_*: (p,) loads at a point: member index, distance, components along local x and y, clockwise couple. One in
      the closed range from rigid_from to length - rigid_to acts on the flexible part, inside any hinge; one outside
      acts on the rigid zone.
    line_*: (q,) linearly varying loads: member index, start and end distance; line_along, line_across: (q, 2)
      components of intensity per length of member at start and end, along local x and y. They may lie on rigid zones.
    mean, difference, misfit: (m,) temperatures (degrees C) and lengths made too long.
    """

    joint: Floats
    settlement: Floats
    point_member: Ints
    point_at: Floats
    point_along: Floats
    point_across: Floats
    point_couple: Floats
    line_member: Ints
    line_start: Floats
    line_end: Floats
    line_along: Floats
    line_across: Floats
    mean: Floats
    difference: Floats
    misfit: Floats


@lru_cache(maxsize=256)
def direction_cosines(direction: Direction) -> tuple[float, float]:
    """Global unit vector of an angle in degrees; whole quarter turns are exact."""
    assert not isinstance(direction, str)
    quarter = direction / 90.0
    if quarter == round(quarter):
        return ((1.0, 0.0), (0.0, 1.0), (-1.0, 0.0), (0.0, -1.0))[round(quarter) % 4]
    angle = math.radians(direction)
    return math.cos(angle), math.sin(angle)


def local_components(direction: Direction, cos: float, sin: float) -> tuple[float, float]:
    """Components along local x and local y of a unit load on a member of direction (cos, sin)."""
    if direction == "along":
        return 1.0, 0.0
    if direction == "across":
        return 0.0, 1.0
    dx, dy = direction_cosines(direction)
    return dx * cos + dy * sin, dy * cos - dx * sin


def case_factors(frame: Frame, name: str) -> dict[str, float]:
    """Load case name to factor for a case or a combination."""
    return {name: 1.0} if name in frame.cases else frame.combinations[name].factors


def leans(frame: Frame, name: str) -> bool:
    """Whether the combination has a lean of its own: it is then more than the sum of its cases."""
    return name in frame.combinations and frame.combinations[name].lean != 0.0


class _Collector:
    """Gathers one table's rows; plain lists, because appending to arrays is quadratic."""

    def __init__(self, frame: Frame) -> None:
        self.frame = frame
        self.table = frame.member_table
        self.cos, self.sin = self.table.cos.tolist(), self.table.sin.tolist()
        self.joint = np.zeros((len(frame.joints), 3))
        self.settlement = np.zeros((len(frame.joints), 3))
        self.joint_loads: list[tuple[int, float]] = []
        self.points: list[tuple[int, float, float, float, float]] = []
        self.lines: list[tuple[int, float, float, float, float, float, float]] = []
        self.strains = np.zeros((3, len(frame.members)))
        self.weights: list[float] = []
        self.sideways_weight = 0.0

    def add_case(self, case: LoadCase, factor: float) -> None:
        """Every load of the case, factored, and what leans with them by the case's own word."""
        here = self._mark()
        for load in case.loads:
            self.add(load, factor)
        share = sum(load.share for load in case.loads if isinstance(load, Lean))
        if share:
            self.lean(share, here, 1.0 if factor >= 0.0 else -1.0)

    def _mark(self) -> tuple[int, int, int, int]:
        return len(self.joint_loads), len(self.points), len(self.lines), len(self.weights)

    def lean(self, share: float, since: tuple[int, int, int, int] = (0, 0, 0, 0), sense: float = 1.0) -> None:
        """Add `share` of every downward load since the mark, sideways where it acts. With `sense` -1 the loads stand
        turned round by a negative factor, and so does what leans with them."""
        joints, points, lines, weights = since
        for joint, up in self.joint_loads[joints:]:
            self.joint[joint, 0] += share * sense * max(0.0, -sense * up)
        for m, at, along, across, _ in self.points[points:]:
            up = along * self.sin[m] + across * self.cos[m]
            side = share * sense * max(0.0, -sense * up)
            if side:
                self.points.append((m, at, side * self.cos[m], -side * self.sin[m], 0.0))
        for row in self.lines[lines:]:
            self._lean_line(share * sense, sense, row)
        self.sideways_weight += share * sense * sum(max(0.0, sense * w) for w in self.weights[weights:])

    def _lean_line(
        self, share: float, sense: float, row: tuple[int, float, float, float, float, float, float]
    ) -> None:
        """The part of a line load that acts down, sideways; a load that changes its sense is parted there."""
        m, start, end, along_1, along_2, across_1, across_2 = row
        c, s = self.cos[m], self.sin[m]
        down_1, down_2 = -sense * (along_1 * s + across_1 * c), -sense * (along_2 * s + across_2 * c)
        if max(down_1, down_2) <= 0.0:
            return
        if min(down_1, down_2) < 0.0:
            nil = start + (end - start) * down_1 / (down_1 - down_2)
            start, end = (start, nil) if down_1 > 0.0 else (nil, end)
        a, b = share * max(0.0, down_1), share * max(0.0, down_2)
        self.lines.append((m, start, end, a * c, b * c, -a * s, -b * s))

    def add(self, load: Load, factor: float) -> None:
        match load:
            case JointForce():
                dx, dy = direction_cosines(load.direction)
                k = self.frame.joint_index[load.joint]
                self.joint[k, :2] += factor * load.force * dx, factor * load.force * dy
                self.joint_loads.append((k, factor * load.force * dy))
            case JointCouple():
                self.joint[self.frame.joint_index[load.joint], 2] += factor * load.couple
            case Settlement():
                self.settlement[self.frame.joint_index[load.joint]] += (
                    factor * load.x, factor * load.y, factor * load.rotation,
                )  # fmt: skip
            case PointForce():
                m = self.frame.member_index[load.member]
                along, across = local_components(load.direction, self.cos[m], self.sin[m])
                self.points.append((m, load.at, factor * load.force * along, factor * load.force * across, 0.0))
            case PointCouple():
                self.points.append((self.frame.member_index[load.member], load.at, 0.0, 0.0, factor * load.couple))
            case Spread():
                self._spread(load, factor)
            case Temperature():
                m = self.frame.member_index[load.member]
                self.strains[0, m] += factor * load.mean
                self.strains[1, m] += factor * load.difference
            case Misfit():
                self.strains[2, self.frame.member_index[load.member]] += factor * load.too_long
            case SelfWeight():
                self.weights.append(factor * load.factor)
            case Lean():
                pass  # of the whole case: `add_case`

    def _spread(self, load: Spread, factor: float) -> None:
        m = self.frame.member_index[load.member]
        along, across = local_components(load.direction, self.cos[m], self.sin[m])
        if load.projection:
            # The projection square to the load's direction is the length times the sine of the angle between them.
            factor *= abs(across)
        a, b = factor * load.first, factor * load.last
        self.lines.append((m, load.start, load.end, a * along, b * along, a * across, b * across))

    def done(self) -> LoadTable:
        t = self.table
        points = np.array(self.points, dtype=float).reshape(-1, 5)
        lines = np.array(self.lines, dtype=float).reshape(-1, 7)
        if sum(self.weights) or self.sideways_weight:
            lines = np.concatenate([lines, self._weight_lines(sum(self.weights), self.sideways_weight)])
        member, line_member = points[:, 0].astype(np.int64), lines[:, 0].astype(np.int64)
        return LoadTable(
            joint=self.joint,
            settlement=self.settlement,
            point_member=member,
            point_at=snap(t.length[member], t.zone[member], points[:, 1]),
            point_along=points[:, 2],
            point_across=points[:, 3],
            point_couple=points[:, 4],
            line_member=line_member,
            line_start=snap(t.length[line_member], t.zone[line_member], lines[:, 1]),
            line_end=snap(t.length[line_member], t.zone[line_member], lines[:, 2]),
            line_along=lines[:, 3:5],
            line_across=lines[:, 5:7],
            mean=self.strains[0],
            difference=self.strains[1],
            misfit=self.strains[2],
        )


    def _weight_lines(self, down: float, right: float) -> Floats:
        """(q, 7) rows of self weight: `down` times it down and `right` times it to the right."""
        t, v = self.table, self.frame.variation
        plain = np.flatnonzero(~t.varying)
        w = t.own_weight[plain]
        rows = [(plain, np.zeros(len(plain)), t.length[plain], w, w)]
        if len(v.member):
            rows.append(piece_weights(v))
        member, start, end, first, last = (np.concatenate(column) for column in zip(*rows, strict=True))
        c, s = t.cos[member], t.sin[member]
        along, across = right * c - down * s, -right * s - down * c
        return np.column_stack([member, start, end, first * along, last * along, first * across, last * across])


WEIGHT_PARTS = 16
"""Straight loads that stand for the weight of one tapered piece: right to 4e-8 of its effects at joints, 1e-7 between."""
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(8)


def piece_weights(v: Variation) -> tuple[Ints, Floats, Floats, Floats, Floats]:
    """Weight per length of stepped and tapered members as straight loads: member, start, end, and intensity at both.

    A prismatic piece makes one. A tapered one makes WEIGHT_PARTS, each of the total and first moment of its true weight.
    """
    parts = np.where(v.weight_power == 0.0, 1, WEIGHT_PARTS)
    row = np.repeat(np.arange(len(parts)), parts)
    number = np.arange(len(row)) - np.repeat(np.cumsum(parts) - parts, parts)
    size = ((v.end - v.start) / parts)[row]
    start = v.start[row] + number * size
    nodes = start[:, None] + size[:, None] * (_NODES + 1) / 2
    depth = v.depth[row, :1] + np.diff(v.depth, axis=1)[row] * (nodes - v.start[row, None]) / (v.end - v.start)[row, None]
    power = v.weight_power[row, None]
    weight = v.weight[row, :1] * np.where(power != 0.0, depth / v.depth[row, :1], 1.0) ** power
    mean = weight @ _WEIGHTS / 2
    rise = 3 * (weight * _NODES) @ _WEIGHTS / 2
    end = np.where(number == parts[row] - 1, v.end[row], start + size)
    return v.member[row], start, end, mean - rise, mean + rise


def snap(length: Floats, zone: Floats, at: Floats) -> Floats:
    """Distances moved onto a member's end or zone face where they miss it by rounding alone. All (n,), zone (n, 2)."""
    at = at.copy()
    for mark in (zone[:, 0], length - zone[:, 1], np.zeros_like(length), length):
        near = np.abs(at - mark) <= SNAP * length
        at[near] = mark[near]
    return at


def load_table(frame: Frame, name: str) -> LoadTable:
    """Every load of the case or combination `name`, factored, as arrays."""
    collector = _Collector(frame)
    for case, factor in case_factors(frame, name).items():
        collector.add_case(frame.cases[case], factor)
    if leans(frame, name):
        collector.lean(frame.combinations[name].lean)
    return collector.done()
