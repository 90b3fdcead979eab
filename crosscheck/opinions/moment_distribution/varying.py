"""Stepped and tapered members: flexibilities that change along, for Gauss's rule on short lengths of them.

A taper is cut until no property changes by more than a quarter of depth or to the double in stiffness over one length:
1/EI is then so smooth that a few of Gauss's points integrate it to the last digits, and a curve through COUNT points
(stretches.py) follows it as well.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from crosscheck.frame.loads import SNAP
from crosscheck.frame.model import Bools, Floats, Frame, Ints, Variation
from crosscheck.opinions.moment_distribution.pieces import NODES, WEIGHTS, Pieces

_X, _W = np.polynomial.legendre.leggauss(8)
FINE_NODES, FINE_WEIGHTS = (_X + 1) / 2, _W / 2
"""Gauss's points and weights on (0, 1) for a length of a stepped or tapered member."""
DEPTH_RATIO, STIFFNESS_RATIO = 1.25, 2.0
"""Most that depth, and that a stiffness, may change over one length."""


class Flexibility(NamedTuple):
    """At places of a member: 1/EI, 1/(G shear_area), 1/EA, and the thermal curvature as a share of the table's."""

    bend: Floats
    slide: Floats
    stretch: Floats
    curl: Floats


@dataclass(frozen=True, slots=True)
class Varying:
    """The stepped and tapered members of a frame.

    where: (m,) which they are. mark_member, mark_x: (n,) places where they are cut, their ends not among them. sheared:
    shear deformation counts. rigid: (m,) axially rigid.
    """

    rows: Variation
    where: Bools
    length: Floats
    E: Floats
    G: Floats
    depth: Floats
    sheared: bool
    rigid: Bools
    mark_member: Ints
    mark_x: Floats

    def at(self, member: Ints, middle: Floats, x: Floats) -> Flexibility:
        """Flexibility at distances x (n, g) from the `from` joints of members (n,), on lengths whose middles (n,) are
        given: at a step either side has its own."""
        rows = self.rows
        key = rows.member + 0.5 * rows.end / self.length[rows.member]
        row = np.searchsorted(key, member + 0.5 * middle / self.length[member])
        I, A, shear_area, depth = rows.at(row, x)  # noqa: E741 - the trade's name
        E = self.E[member, None]
        slide = 1 / (self.G[member, None] * shear_area) if self.sheared else np.zeros_like(x)
        rigid = self.rigid[member, None]
        stretch = np.where(rigid, 0.0, 1 / np.where(rigid, 1.0, E * A))
        curl = self.depth[member, None] / depth
        return Flexibility(1 / (E * I), slide, stretch, np.where(np.isfinite(curl), curl, 1.0))

    def lengths(self, zone: Floats) -> tuple[Ints, Floats, Floats]:
        """Member, start and size of all lengths that flexible parts are cut into; zone: (m, 2) rigid zones."""
        some = np.flatnonzero(self.where)
        far = self.length - zone[:, 1]
        owner = np.concatenate([self.mark_member, some, some])
        x = np.concatenate([self.mark_x, zone[some, 0], far[some]])
        x = np.clip(x, zone[owner, 0], far[owner])
        order = np.lexsort((x, owner))
        owner, x = owner[order], x[order]
        real = (owner[1:] == owner[:-1]) & (x[1:] > x[:-1])
        return owner[:-1][real], x[:-1][real], np.diff(x)[real]

    def marks_beside(self, other: Ints, other_x: Floats) -> tuple[Ints, Floats]:
        """The marks, moved onto a place of the same member (other, other_x) that they miss by rounding alone."""
        places = np.sort(other + 0.5 * other_x / self.length[other])
        key = self.mark_member + 0.5 * self.mark_x / self.length[self.mark_member]
        right = np.clip(np.searchsorted(places, key), 1, len(places) - 1)
        nearest = np.where(key - places[right - 1] < places[right] - key, right - 1, right)
        apart = np.abs(places[nearest] - key) > SNAP / 2
        return self.mark_member[apart], self.mark_x[apart]


def varying(frame: Frame, rigid: Bools) -> Varying | None:
    """The frame's stepped and tapered members; None where it has none."""
    t = frame.member_table
    if not t.varying.any():
        return None
    member, x = _marks(frame.variation, t.length)
    return Varying(
        frame.variation, t.varying, t.length, t.E, t.G, t.depth, frame.analysis.shear == "elastic", rigid, member, x
    )


def _marks(rows: Variation, length: Floats) -> tuple[Ints, Floats]:
    """Member and distance of every place where a row ends or is cut, ends of members apart."""
    member, x = [], []
    parts = _parts(rows)
    for row, count in enumerate(parts.tolist()):
        first, last = rows.depth[row]
        share = np.arange(1, count + 1) / count
        if count > 1 and first != last:
            share[:-1] = (first * (last / first) ** share[:-1] - first) / (last - first)
        at = rows.start[row] + (rows.end[row] - rows.start[row]) * share
        at[-1] = rows.end[row]
        member.append(np.full(count, rows.member[row]))
        x.append(at)
    owner, place = np.concatenate(member), np.concatenate(x)
    inside = place < length[owner]
    return owner[inside], place[inside]


def _parts(rows: Variation) -> Ints:
    """(p,) lengths that each row is cut into."""
    needed = [np.ones(len(rows.member))]
    needed.append(np.abs(np.log(rows.depth[:, 1] / rows.depth[:, 0])) / np.log(DEPTH_RATIO))
    for pair in (rows.I, rows.A, rows.shear_area):
        needed.append(np.abs(np.log(pair[:, 1] / pair[:, 0])) / np.log(STIFFNESS_RATIO))
    most = np.nan_to_num(np.array(needed)).max(axis=0)
    tapered = (rows.power != 0.0).any(axis=1) | (np.nan_to_num(np.diff(rows.depth)[:, 0]) != 0.0)
    return np.where(tapered, np.ceil(most - 1e-9), 1).astype(np.int64)


def by_rule(some: Varying | None, member: Ints) -> Iterator[tuple[Ints | slice, Floats, Floats]]:
    """Which of the members (n,) take which of Gauss's points and weights: the prismatic ones few, the others more."""
    if some is None:
        yield slice(None), NODES, WEIGHTS
        return
    where = some.where[member]
    if not where.all():
        yield np.flatnonzero(~where), NODES, WEIGHTS
    if where.any():
        yield np.flatnonzero(where), FINE_NODES, FINE_WEIGHTS


def middles(pieces: Pieces, piece: Ints) -> Floats:
    """(n,) distance of the middle of each piece from the `from` joint."""
    return np.asarray(pieces.start[piece] + pieces.size[piece] / 2)
