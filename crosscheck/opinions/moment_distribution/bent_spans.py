"""Values along members under axial force: where each piece starts, found back along the stretches, and Gauss's curve of
the slope over it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from crosscheck.frame.model import Floats, Frame, Ints
from crosscheck.opinions.moment_distribution.members import Members
from crosscheck.opinions.moment_distribution.pieces import NODES as FEW_NODES
from crosscheck.opinions.moment_distribution.pieces import WEIGHTS as FEW_WEIGHTS
from crosscheck.opinions.moment_distribution.pieces import Pieces
from crosscheck.opinions.moment_distribution.spans import piece_at
from crosscheck.opinions.moment_distribution.stretches import COUNT, NODES, Bowed, gathered, through

LOOKS = np.linspace(0.0, 1.0, 25)
"""Where a piece is looked at for changes of sign; the axis bends little over a piece."""
HALVINGS = 50


@dataclass(frozen=True, slots=True)
class Bent:
    """One case along the members, by piece (p,): turn (counter-clockwise), moment and rise along local y at its start,
    shear of the member at its `from` end; slope (p, COUNT) at Gauss's points."""

    bowed: Bowed
    shear: Floats
    turn: Floats
    moment: Floats
    rise: Floats
    slope: Floats

    @property
    def pieces(self) -> Pieces:
        return self.bowed.division.pieces

    def values(self, piece: Ints, s: Floats) -> Floats:
        """(n, 4) axial, shear, moment, across at distance s from the start of each piece."""
        pieces, h = self.pieces, self.pieces.size[piece]
        u = np.divide(s, h, out=np.zeros_like(s), where=h > 0)
        weights = h[:, None] * gathered(u)
        pull = self.bowed.axial.at(pieces, piece[:, None], h[:, None] * NODES)
        member = pieces.member[piece]
        by_loads = pieces.moment_at(piece, s) - pieces.moment[piece]
        return np.column_stack([
            self.bowed.axial.at(pieces, piece, s),
            self.shear[member] + pieces.shear_at(piece, s),
            self.moment[piece] + self.shear[member] * s + by_loads + (weights * pull * self.slope[piece]).sum(axis=1),
            self.rise[piece] + (weights * self.slope[piece]).sum(axis=1),
        ])  # fmt: skip

    def rates(self, piece: Ints, u: Floats) -> Floats:
        """(3, n, k) of moment, shear and across, at shares u (n, k) of each piece."""
        pieces = self.pieces
        s = pieces.size[piece, None] * u
        slope = np.einsum("nkc,nc->nk", through(u), self.slope[piece])
        shear = self.shear[pieces.member[piece], None] + pieces.shear_at(piece[:, None], s)
        w = pieces.intensity_across[piece]
        pull = self.bowed.axial.at(pieces, piece[:, None], s)
        return np.stack([shear + pull * slope, w[:, :1] + s * w[:, 1:], slope])


@dataclass(frozen=True)
class BentSpans:
    """Spans of the protocol in answer.py."""

    sampled: ClassVar[bool] = False
    frame: Frame
    cases: Mapping[str, Bent]
    axial_open: np.ndarray

    def along(self, name: str, member: Ints, x: Floats, side: Ints) -> Floats:
        """(n, 4) axial, shear, moment, across at x of each member, before (side -1) or after (+1) a jump there."""
        bent = self.cases[name]
        member, x = np.asarray(member), np.asarray(x, dtype=float)
        piece = piece_at(bent.pieces, member, x, np.asarray(side))
        s = np.clip(x - bent.pieces.start[piece], 0.0, bent.pieces.size[piece])
        values = bent.values(piece, s)
        values[self.axial_open[member], 0] = np.nan
        return values

    def turning_points(self, name: str) -> tuple[Ints, Floats]:
        """Member and distance of every inner place where the rate of moment, shear or across is zero."""
        bent = self.cases[name]
        pieces = bent.pieces
        real = np.flatnonzero(pieces.size > 0)
        at = bent.rates(real, np.broadcast_to(LOOKS, (len(real), len(LOOKS))))
        rising = at >= 0.0  # so that a rate that is nought just where it is looked at is found too
        which, row, column = np.nonzero(rising[:, :, :-1] != rising[:, :, 1:])
        low, high = LOOKS[column], LOOKS[column + 1]
        rose = rising[which, row, column]
        for _ in range(HALVINGS if len(row) else 0):
            middle = (low + high) / 2
            here = bent.rates(real[row], middle[:, None])[which, np.arange(len(row)), 0]
            same = (here >= 0.0) == rose
            low, high = np.where(same, middle, low), np.where(same, high, middle)
        piece = real[row]
        member, x = pieces.member[piece], pieces.start[piece] + pieces.size[piece] * (low + high) / 2
        kinked = _kinks(pieces, real, at[2])
        member, x = np.concatenate([member, pieces.member[kinked]]), np.concatenate([x, pieces.start[kinked]])
        order = np.lexsort((x, member))
        return member[order], x[order]


def _kinks(pieces: Pieces, real: Ints, slope: Floats) -> Ints:
    """Pieces at whose start the slope (n, k) along the `real` ones jumps from one sign to the other: shear strain at a
    step."""
    turned = (slope[:-1, -1] * slope[1:, 0] < 0) & (pieces.member[real[1:]] == pieces.member[real[:-1]])
    return np.asarray(real[1:][turned])


def bend(m: Members, bowed: Bowed, movements: Floats, offset: Floats, ends: Floats) -> Bent:
    """The case's values along the members.

    movements: (m, 3) clockwise rotations of the joints and the chord; offset: (m, 2) displacement of the joints along
    local y; ends: (m, 3) clockwise moments on the ends and the shear at the `from` end.
    """
    t, pieces = m.table, bowed.division.pieces
    count = len(pieces.member)
    bent = Bent(bowed, ends[:, 2], np.zeros(count), np.zeros(count), np.zeros(count), np.zeros((count, COUNT)))
    # Clockwise: the zone beyond the `from` joint goes down, the one before the `to` joint up.
    _flexible_parts(bent, movements, offset + movements[:, :2] * t.zone * [-1.0, 1.0])
    number = np.arange(count)
    for end, which in enumerate((number <= pieces.face[pieces.member, 0], number >= pieces.face[pieces.member, 1])):
        _zone(bent, np.flatnonzero(which), end, movements[:, end], offset[:, end], ends[:, end])
    return bent


def _zone(bent: Bent, piece: Ints, end: int, rotation: Floats, offset: Floats, moment: Floats) -> None:
    """The pieces of the rigid zones at one end: straight, and turned with their joint. All (m,) but `piece`."""
    pieces = bent.pieces
    k = pieces.member[piece]
    first = pieces.last if end else pieces.first[:-1]
    away = pieces.start[piece] - pieces.start[first][k]
    turn = -rotation[k]
    bent.turn[piece] = turn
    bent.slope[piece] = turn[:, None]
    bent.rise[piece] = offset[k] + turn * away
    every = np.arange(len(pieces.member))
    pull = pieces.size * (bent.bowed.axial.at(pieces, every[:, None], pieces.size[:, None] * FEW_NODES) @ FEW_WEIGHTS)
    run = np.cumsum(pull) - pull
    by_axial = turn * (run[piece] - run[first][k])
    by_loads = pieces.moment[piece] - pieces.moment[first][k] * end
    start = (-moment if end else moment)[k]
    bent.moment[piece] = start + bent.shear[k] * away + by_loads + by_axial


def _flexible_parts(bent: Bent, movements: Floats, face: Floats) -> None:
    """Turns at the faces behind their connections, then stretch by stretch, then piece by piece."""
    bowed, d = bent.bowed, bent.bowed.division
    pieces, count = d.pieces, len(d.length)
    ends = np.column_stack([movements[:, :2], face[:, 0] - face[:, 1], np.ones(count)])
    for end in (1, 0):
        soft, behind = bowed.gripped[end].soft, bowed.gripped[end].behind
        ends[soft, end] = (behind[soft] * ends[soft]).sum(axis=1)
    stretches = np.zeros((int(d.first[-1]), 4))
    stretches[:, 3] = 1.0
    for joined in reversed(bowed.joined):
        at = joined.member
        last = joined.stretch
        inside = np.einsum("nij,nj->ni", joined.inside, ends[at])
        stretches[last, 0], stretches[last, 1] = inside[:, 0], ends[at, 1]
        stretches[last, 2] = ends[at, 2] - inside[:, 1]
        ends[at, 1], ends[at, 2] = inside[:, 0], inside[:, 1]
    stretches[d.first[:-1]] = ends
    start = np.einsum("sij,sj->si", bowed.entry, stretches)
    owner = np.repeat(np.arange(count), np.diff(d.first))
    dropped = np.cumsum(stretches[:, 2]) - stretches[:, 2]
    dropped -= dropped[d.first[:-1]][owner]
    values = np.column_stack([-stretches[:, 0], start, np.ones(len(start))])
    rise = face[owner, 0] - dropped
    for step in range(int(d.rank.max(initial=-1)) + 1):
        at = np.flatnonzero(d.rank == step)
        s, p = d.stretch[at], d.inner[at]
        values[s, 1] += pieces.couple[p]
        bent.turn[p], bent.moment[p], bent.rise[p] = values[s, 0], values[s, 1], rise[s]
        bent.slope[p] = np.einsum("pnc,pc->pn", bowed.slope[at], values[s])
        over = np.einsum("pic,pc->pi", bowed.passage[at], values[s])
        values[s, 0], values[s, 1] = over[:, 0], over[:, 1]
        rise[s] += over[:, 2]
