"""The loads of a case parted where a member needs it, and what they add up to along it.

Loads are divided at the faces of the rigid zones; sums of powers of the distance past each load (Macaulay 1919) give what
acts up to any place.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import Floats, Frame, Ints


@dataclass(frozen=True, slots=True)
class SplitLoads:
    """A case's loads divided at the faces of the rigid zones, as flat rows.

    place: 0 on the `from` zone, 1 on the flexible part, 2 on the `to` zone. at, start, end: from the `from` joint.
    Lines: intensity `mean` at the middle and `slope` per length, each (rows, 2) for along and across.
    """

    point_member: Ints
    point_place: Ints
    point_at: Floats
    point_force: Floats
    point_couple: Floats
    line_member: Ints
    line_place: Ints
    line_start: Floats
    line_end: Floats
    line_mean: Floats
    line_slope: Floats


def split_loads(frame: Frame, table: LoadTable) -> SplitLoads:
    """Divide the loads of a case at the faces of the rigid zones."""
    t = frame.member_table
    m, at = table.point_member, table.point_at
    place = np.where(at < t.zone[m, 0], 0, np.where(at > t.length[m] - t.zone[m, 1], 2, 1))
    q = table.line_member
    faces = np.column_stack([np.zeros(len(q)), t.zone[q, 0], t.length[q] - t.zone[q, 1], t.length[q]])
    rows = [_clip_lines(table, faces[:, k], faces[:, k + 1], k) for k in range(3)]
    member, part, start, end, mean, slope = (np.concatenate(column) for column in zip(*rows, strict=True))
    return SplitLoads(
        m, place, at, np.column_stack([table.point_along, table.point_across]), table.point_couple,
        member, part, start, end, mean, slope,
    )  # fmt: skip


def _clip_lines(
    table: LoadTable, lower: Floats, upper: Floats, place: int
) -> tuple[Ints, Ints, Floats, Floats, Floats, Floats]:
    start, end = np.maximum(table.line_start, lower), np.minimum(table.line_end, upper)
    keep = end > start
    run = (table.line_end - table.line_start)[keep, None]
    first = np.stack([table.line_along[keep, 0], table.line_across[keep, 0]], axis=1)
    last = np.stack([table.line_along[keep, 1], table.line_across[keep, 1]], axis=1)
    slope = (last - first) / run
    middle = 0.5 * (start + end)[keep, None] - table.line_start[keep, None]
    member = table.line_member[keep]
    return member, np.full(len(member), place), start[keep], end[keep], first + slope * middle, slope


def load_moments(mean: Floats, slope: Floats, middle: Floats, half: Floats) -> tuple[Floats, Floats, Floats, Floats]:
    """Integrals of w, w x, w x^2 and w x^3 over a linear load of middle intensity `mean` and gradient `slope` on
    middle - half to middle + half. Centred, so that a narrow load loses no digits."""
    h2 = half * half
    zeroth = 2 * half * mean
    first = 2 * half * (mean * middle + slope * h2 / 3)
    second = 2 * half * (mean * (middle**2 + h2 / 3) + 2 * slope * middle * h2 / 3)
    third = 2 * half * (mean * (middle**3 + middle * h2) + slope * (middle**2 * h2 + h2 * h2 / 5))
    return zeroth, first, second, third


class LoadRuns:
    """What the loads of one case add up to from each member's `from` joint to a place: power sums past each load."""

    def __init__(self, frame: Frame, table: LoadTable) -> None:
        self.frame, self.table = frame, table
        self._split: SplitLoads = split_loads(frame, table)

    def sums(self, member: Ints, x: Floats, side: Ints) -> tuple[Floats, Floats, Floats]:
        """(n,) each: minus the along forces, the across forces, and the sagging moment about the place of across forces
        and couples, of all loads before x (or at x where side is +1)."""
        table = self.table
        axial, shear, moment = np.zeros(len(x)), np.zeros(len(x)), np.zeros(len(x))
        point, load = _pairs(member, table.point_member)
        past = x[point] - table.point_at[load]
        acts = (past > 0) | ((past == 0) & (side[point] > 0))
        point, load, past = point[acts], load[acts], past[acts]
        np.add.at(axial, point, -table.point_along[load])
        np.add.at(shear, point, table.point_across[load])
        np.add.at(moment, point, table.point_across[load] * past + table.point_couple[load])
        point, zeroth_along, zeroth, first, _ = self._line_effects(member, x)
        np.add.at(axial, point, -zeroth_along)
        np.add.at(shear, point, zeroth)
        np.add.at(moment, point, first)
        return axial, shear, moment

    def bends(self, member: Ints, x: Floats) -> tuple[Floats, Floats]:
        """(n,) each, of loads on the flexible part before x: the double integral of their moment, and the integral of
        their across force."""
        table = self.table
        area, pull = np.zeros(len(x)), np.zeros(len(x))
        point, load = _pairs(member, table.point_member)
        past = x[point] - table.point_at[load]
        acts = (past > 0) & (self._split.point_place[load] == 1)
        point, load, past = point[acts], load[acts], past[acts]
        force, couple = table.point_across[load], table.point_couple[load]
        np.add.at(area, point, force * past**3 / 6 + couple * past**2 / 2)
        np.add.at(pull, point, force * past)
        point, _, _, first, third = self._line_effects(member, x, flexible=True)
        np.add.at(area, point, third / 6)
        np.add.at(pull, point, first)
        return area, pull

    def _line_effects(
        self, member: Ints, x: Floats, flexible: bool = False
    ) -> tuple[Ints, Floats, Floats, Floats, Floats]:
        """For pairs of a place and a line load begun before it: the place, the along force, and the integrals of
        w, w d and w d^3 over the part before it, d being the distance back from the place."""
        t = self._split
        rows = np.flatnonzero(t.line_place == 1) if flexible else np.arange(len(t.line_member))
        point, pick = _pairs(member, t.line_member[rows])
        load = rows[pick]
        begun = x[point] > t.line_start[load]
        point, load = point[begun], load[begun]
        start, end = t.line_start[load], np.minimum(t.line_end[load], x[point])
        back, half = x[point] - (start + end) / 2, (end - start) / 2
        # Middle intensity of the part before the place; distance runs backwards, hence the turned gradient.
        shifted = (start + end) / 2 - (t.line_start[load] + t.line_end[load]) / 2
        mean = t.line_mean[load] + t.line_slope[load] * shifted[:, None]
        along = 2 * half * mean[:, 0]
        zeroth, first, _, third = load_moments(mean[:, 1], -t.line_slope[load, 1], back, half)
        return point, along, zeroth, first, third


def _pairs(member: Ints, load_member: Ints) -> tuple[Ints, Ints]:
    """Every pair of a place and a load on the same member, as indices into both."""
    order = np.argsort(load_member, kind="stable")
    ordered = load_member[order]
    first, last = np.searchsorted(ordered, member), np.searchsorted(ordered, member, side="right")
    count = last - first
    place = np.repeat(np.arange(len(member)), count)
    offset = np.arange(int(count.sum())) - np.repeat(np.cumsum(count) - count, count)
    return place, order[np.repeat(first, count) + offset]
