"""The loads of a case or combination as plain arrays in member and joint axes: geometry, no mechanics.

Shared by every opinion and the audit, and listed as shared in the README. It turns directions into local components,
spreads projected loads over the member's length and adds self weight; it moves no load and integrates none.
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
    Load,
    Misfit,
    PointCouple,
    PointForce,
    SelfWeight,
    Settlement,
    Spread,
    Temperature,
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


class _Collector:
    """Gathers one table's rows; plain lists, because appending to arrays is quadratic."""

    def __init__(self, frame: Frame) -> None:
        self.frame = frame
        self.table = frame.member_table
        self.cos, self.sin = self.table.cos.tolist(), self.table.sin.tolist()
        self.joint = np.zeros((len(frame.joints), 3))
        self.settlement = np.zeros((len(frame.joints), 3))
        self.points: list[tuple[int, float, float, float, float]] = []
        self.lines: list[tuple[int, float, float, float, float, float, float]] = []
        self.strains = np.zeros((3, len(frame.members)))
        self.self_weight = 0.0

    def add(self, load: Load, factor: float) -> None:
        match load:
            case JointForce():
                dx, dy = direction_cosines(load.direction)
                self.joint[self.frame.joint_index[load.joint], :2] += (
                    factor * load.force * dx, factor * load.force * dy,
                )  # fmt: skip
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
                self.self_weight += factor * load.factor

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
        if self.self_weight:
            w = self.self_weight * t.weight * t.A
            m = np.arange(len(w), dtype=float)
            lines = np.concatenate([
                lines,
                np.column_stack([m, np.zeros_like(m), t.length, -w * t.sin, -w * t.sin, -w * t.cos, -w * t.cos]),
            ])  # fmt: skip
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
        for load in frame.cases[case].loads:
            collector.add(load, factor)
    return collector.done()
