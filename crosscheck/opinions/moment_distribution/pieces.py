"""The loads of one case cut into pieces along each member, with the running sums of statics at the start of each.

A piece runs from one place of change to the next: joint, face of a rigid zone, point load, start or end of a spread
load. Within it the intensity is linear, so the sums below are polynomials of the distance s from its start:

    along(s)  = along  + p s + p' s^2/2                    sum of loads along local x
    shear(s)  = shear  + w s + w' s^2/2                    sum of loads along local +y
    moment(s) = moment + shear s + w s^2/2 + w' s^3/6      their sagging moment, with the couples

taken from the `from` end as if that end were free; `with_end_actions` adds what acts there. Plain statics.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import Floats, Ints, MemberTable

_UNIT_NODES, _UNIT_WEIGHTS = np.polynomial.legendre.leggauss(3)
NODES, WEIGHTS = (_UNIT_NODES + 1) / 2, _UNIT_WEIGHTS / 2
"""Gauss's three points and weights on (0, 1): exact to the fifth degree, and a cubic moment times a linear one is
quartic."""


@dataclass(frozen=True, slots=True)
class Pieces:
    """Flat arrays (p,), sorted by member and place; member k has `first[k]:first[k + 1]`.

    Each member begins and ends with an empty piece, so that the values just before a load at x = 0 and just after one
    at the far end, which are the end actions, have a place too. intensity_along, intensity_across: (p, 2) value at
    the start and rate of change along the member. inner: on the flexible part, and not empty. face: (m, 2) the last
    piece before the flexible part and the first one behind it. couple: clockwise couples at the start of each.
    """

    member: Ints
    start: Floats
    size: Floats
    inner: np.ndarray
    first: Ints
    face: Ints
    intensity_along: Floats
    intensity_across: Floats
    along: Floats
    shear: Floats
    moment: Floats
    couple: Floats

    def along_at(self, piece: Ints, s: Floats) -> Floats:
        """Sum of loads along local x at distance s from the start of each piece; `piece` and s broadcast together."""
        p = self.intensity_along[piece]
        return np.asarray(self.along[piece] + s * (p[..., 0] + s * p[..., 1] / 2))

    def shear_at(self, piece: Ints, s: Floats) -> Floats:
        w = self.intensity_across[piece]
        return np.asarray(self.shear[piece] + s * (w[..., 0] + s * w[..., 1] / 2))

    def moment_at(self, piece: Ints, s: Floats) -> Floats:
        w = self.intensity_across[piece]
        return np.asarray(self.moment[piece] + s * (self.shear[piece] + s * (w[..., 0] / 2 + s * w[..., 1] / 6)))

    @property
    def last(self) -> Ints:
        """(m,) the empty piece that ends each member: its sums are the totals."""
        return self.first[1:] - 1

    def with_end_actions(self, axial: Floats, shear: Floats, moment: Floats) -> Pieces:
        """The real values: `along` becomes minus the axial force, shear and moment are those within the span.

        All (m,), at the `from` end: axial tension positive, shear along local +y, moment clockwise, acting on the
        member. A clockwise couple at the left end of a beam drawn left to right makes it sag: moment there = +end
        moment.
        """
        m = self.member
        return replace(
            self,
            along=self.along - axial[m],
            shear=self.shear + shear[m],
            moment=self.moment + moment[m] + shear[m] * self.start,
        )


def cut(table: MemberTable, loads: LoadTable, further: tuple[Ints, Floats] | None = None) -> Pieces:
    """Cut every member at every place of change of this case, and at `further` ones (members and distances), and run
    the sums along."""
    count = len(table.length)
    every = np.arange(count)
    more, more_x = further or (np.zeros(0, dtype=np.int64), np.zeros(0))
    owner = np.concatenate([np.tile(every, 4), loads.point_member, loads.line_member, loads.line_member, more])
    marks = (np.zeros(count), table.zone[:, 0], table.length - table.zone[:, 1], table.length)
    x = np.concatenate([*marks, loads.point_at, loads.line_start, loads.line_end, more_x])
    place, break_member, break_x = _distinct(owner, x)
    # Break i of member k starts piece i + k + 1: each member before it, and this one, has one piece more than breaks.
    starting = place + owner + 1
    lead = np.searchsorted(break_member, every)
    member = np.insert(break_member, lead, every)
    start = np.insert(break_x, lead, 0.0)
    first = np.append(lead + every, len(member))
    end = np.append(start[1:], 0.0)
    end[first[1:] - 1] = table.length
    size = end - start
    p, q = len(loads.point_member), len(loads.line_member)
    at_mark, at_point = starting[: 4 * count].reshape(4, count), starting[4 * count : 4 * count + p]
    line_from, line_to = starting[4 * count + p :][:q], starting[4 * count + p + q :][:q]
    face = np.column_stack([at_mark[1] - 1, at_mark[2]])
    inner = (size > 0) & (np.arange(len(member)) > face[member, 0]) & (np.arange(len(member)) < face[member, 1])
    along, across = _intensities(loads, line_from, line_to, start, end)
    pieces = Pieces(member, start, size, inner, first, face, along, across, *np.zeros((4, len(member))))
    return _run(pieces, loads, at_point)


def summed(place: Ints, values: Floats, count: int) -> Floats:
    """(count,) sums of the values that belong to each place; floats even where there is none."""
    return np.bincount(place, values, count).astype(np.float64)


def _distinct(owner: Ints, x: Floats) -> tuple[Ints, Ints, Floats]:
    """Index of each (owner, x) among the distinct ones, and these sorted by owner and x."""
    order = np.lexsort((x, owner))
    o, s = owner[order], x[order]
    fresh = np.ones(len(o), dtype=bool)
    fresh[1:] = (o[1:] != o[:-1]) | (s[1:] != s[:-1])
    place = np.empty(len(o), dtype=np.int64)
    place[order] = np.cumsum(fresh) - 1
    return place, o[fresh], s[fresh]


def _intensities(
    loads: LoadTable, line_from: Ints, line_to: Ints, start: Floats, end: Floats
) -> tuple[Floats, Floats]:
    """(p, 2) intensity at the start of each piece and its rate, along and across, from all spread loads over it."""
    covered = line_to - line_from
    line = np.repeat(np.arange(len(covered)), covered)
    piece = np.arange(len(line)) - np.repeat(np.cumsum(covered) - covered, covered) + line_from[line]
    reach = (loads.line_end - loads.line_start)[line]
    share = (start[piece] - loads.line_start[line]) / reach
    found = []
    for ends in (loads.line_along, loads.line_across):
        rate = (ends[line, 1] - ends[line, 0]) / reach
        # The two-sided form gives each end's own value exactly.
        value = ends[line, 0] * (1 - share) + ends[line, 1] * share
        found.append(np.column_stack([summed(piece, v, len(start)) for v in (value, rate)]))
    return found[0], found[1]


def _run(pieces: Pieces, loads: LoadTable, at_point: Ints) -> Pieces:
    """Run the sums from each member's `from` end, all members in step; point loads come in at the start of a
    piece."""
    count = len(pieces.member)
    jumps = [
        summed(at_point, v, count) for v in (loads.point_along, loads.point_across, loads.point_couple)
    ]
    along, shear, moment = jumps
    pieces = replace(pieces, along=along, shear=shear, moment=moment, couple=moment.copy())
    number = np.diff(pieces.first)
    for step in range(1, int(number.max(initial=0))):
        here = pieces.first[:-1][number > step] + step
        before = here - 1
        size = pieces.size[before]
        along[here] += pieces.along_at(before, size)
        moment[here] += pieces.moment_at(before, size)
        shear[here] += pieces.shear_at(before, size)
    return pieces
