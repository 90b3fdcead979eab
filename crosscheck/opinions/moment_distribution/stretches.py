"""A member under axial force: moment-area by Gauss's rule, with the moment of the axial force among the moments.

Equilibrium on the displaced axis, small rotations: with y the displacement along local y and N the axial force, tension
positive, both along the undisplaced member,

    moment' = shear + N y'        turn' = moment / EI + curvature by temperature
    y'      = turn - (shear + N y') / (G shear_area)                      (Engesser's shear strain)

(S. Timoshenko and J. Gere, "Theory of Elastic Stability", 1961, chapters 1 and 2; F. Engesser 1891.) The flexible part
is cut at every place where a load changes, and further into *stretches*, short against the length over which the axial
force bends the axis. On each piece the slope y' at Gauss's points is what its own integrals make it: as many linear
equations as points, whatever way N and EI vary along. A stretch passes start values on from piece to piece; stretches are
joined to members by letting the places between them go one after another. Where such a place gives way of its own
accord the member buckles between its held ends (W. H. Wittrick and F. W. Williams 1971: the count of these).

Inside here turns are counter-clockwise along local y; at the ends of stretches and members they are clockwise, and a
*drop* is how far the `to` end lies further to -y than the `from` end: drop = chord rotation * length.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import FREE, HELD, Floats, Ints
from crosscheck.opinions.moment_distribution.members import Members, cut_up, thermal_curvature
from crosscheck.opinions.moment_distribution.pieces import NODES as FEW_NODES
from crosscheck.opinions.moment_distribution.pieces import WEIGHTS as FEW_WEIGHTS
from crosscheck.opinions.moment_distribution.pieces import Pieces

COUNT = 12
"""Gauss's points on a piece."""
REACH = 1.0
"""A stretch is at most this long when it is cut, in units of sqrt(EI / N): its neglected terms are then below 1e-15."""
AGAIN = 1.5
"""Stretches are cut afresh when they have become this long."""
MOST = 4000
"""Stretches in one member."""

_X, _W = np.polynomial.legendre.leggauss(COUNT)
NODES, WEIGHTS = (_X + 1) / 2, _W / 2
_TO_TERMS = (2 * np.arange(COUNT) + 1)[:, None] * np.polynomial.legendre.legvander(_X, COUNT - 1).T * WEIGHTS
"""(COUNT, COUNT) terms in Legendre's polynomials of the curve through values at the points."""


def through(u: Floats) -> Floats:
    """(.., COUNT) weights on the values at the points that give their curve at u in (0, 1)."""
    return np.asarray(np.polynomial.legendre.legvander(2 * np.asarray(u) - 1, COUNT - 1) @ _TO_TERMS)


def gathered(u: Floats) -> Floats:
    """(.., COUNT) weights that give the integral of the curve from 0 to u."""
    p = np.polynomial.legendre.legvander(2 * np.asarray(u) - 1, COUNT)
    below = np.concatenate([-np.ones_like(p[..., :1]), p[..., : COUNT - 1]], axis=-1)
    return np.asarray((p[..., 1:] - below) / (2 * (2 * np.arange(COUNT) + 1)) @ _TO_TERMS)


RUN = gathered(NODES)
TWICE = RUN @ RUN


@dataclass(frozen=True)
class Division:
    """One case's members cut up. inner: (b,) the pieces of flexible parts; stretch: (b,) the stretch each is in, all
    members counted through; rank: (b,) its place there. first: (m + 1,) the first stretch of each member. length: (m,)
    of its stretches. curvature: (m,) by temperature."""

    pieces: Pieces
    inner: Ints
    stretch: Ints
    rank: Ints
    first: Ints
    length: Floats
    curvature: Floats


def divide(m: Members, loads: LoadTable, parts: Ints) -> Division:
    """Cut the flexible part of each member into `parts` (m,) stretches of one length."""
    t = m.table
    first = np.append(0, np.cumsum(parts)).astype(np.int64)
    member = np.repeat(np.arange(len(parts)), parts - 1)
    number = np.arange(len(member)) - np.repeat(np.cumsum(parts - 1) - (parts - 1), parts - 1) + 1
    pieces = cut_up(m, loads, (member, t.zone[member, 0] + t.clear[member] * (number / parts[member])))
    inner = np.flatnonzero(pieces.inner)
    k = pieces.member[inner]
    share = (pieces.start[inner] + pieces.size[inner] / 2 - t.zone[k, 0]) / t.clear[k]
    stretch = first[k] + np.clip((share * parts[k]).astype(np.int64), 0, parts[k] - 1)
    rank = np.arange(len(inner)) - np.searchsorted(stretch, stretch)
    return Division(pieces, inner, stretch, rank, first, t.clear / parts, thermal_curvature(t, loads))


def parts_needed(m: Members, pieces: Pieces, axial: Floats, scale: float = 1.0) -> tuple[Ints, bool]:
    """(m,) stretches for these axial forces (m,) at the `from` ends, with the loads along the members, all times
    `scale`; and whether some member shears off: compression of G shear_area or more."""
    t = m.table
    real = np.flatnonzero(pieces.inner)
    k = pieces.member[real]
    ends = pieces.size[real, None] * np.array([0.0, 0.5, 1.0])
    force = scale * (axial[k, None] - pieces.along_at(real[:, None], ends))
    here = m.flexibility(pieces, real, ends)
    stiff = 1 + force * here.slide
    if np.any(stiff <= 0):
        return np.ones(len(t.length), dtype=np.int64), True
    bent = np.zeros(len(t.length))
    np.maximum.at(bent, k, np.max(np.abs(force) / stiff * here.bend, axis=1))
    return np.clip(np.ceil(np.sqrt(bent) * t.clear / REACH), 1, MOST).astype(np.int64), False


@dataclass(frozen=True)
class Axial:
    """Axial forces at work: `start` (m,) at the `from` ends, and the share `scale` of the loads along the members that
    is taken with them (1 but for critical loads)."""

    start: Floats
    scale: float = 1.0

    def at(self, pieces: Pieces, piece: Ints, s: Floats) -> Floats:
        """Axial force at distance s from the start of each piece; `piece` and s broadcast together."""
        return np.asarray(self.start[pieces.member[piece]] - self.scale * pieces.along_at(piece, s))


@dataclass(frozen=True)
class Joined:
    """One stretch more joined on: the members (k,) that have it, which it is (k,), and (k, 2, 4) the turn at the place
    between and the drop up to it, per turn at either end, drop and 1."""

    member: Ints
    stretch: Ints
    inside: Floats


@dataclass(frozen=True)
class Gripped:
    """An end connection let go: `soft` (m,) where there is one, and (m, 4) the turn behind it per turn at the
    `from` end (or of its joint), at the `to` end (or of its joint), drop and 1."""

    soft: np.ndarray
    behind: Floats


@dataclass(frozen=True)
class Bowed:
    """All members under their axial forces.

    stiffness: (m, 3, 3) clockwise moments on the ends at the joints and the moment against the chord's turning, per
    clockwise rotation of the joints and of the chord; the last is length * shear at the `from` end. fixed: (m, 3) the
    same from the loads with all held. buckled: (m,) how many times each is buckled with its ends held.
    The rest is what `bend` in bent_spans.py goes back along: slope (b, COUNT, 4) at Gauss's points and passage
    (b, 3, 4) of turn, moment and rise over each piece per turn, moment, shear and 1 at its start (the shear at the
    member's `from` end); entry (s, 2, 4) moment and shear at the start of each stretch per its own turns, drop and 1.
    """

    division: Division
    axial: Axial
    stiffness: Floats
    fixed: Floats
    buckled: Ints
    slope: Floats
    passage: Floats
    entry: Floats
    joined: tuple[Joined, ...]
    gripped: tuple[Gripped, Gripped]


def bow(m: Members, division: Division, axial: Axial) -> Bowed:
    """Stiffness and fixed-end moments under these axial forces."""
    slope, passage = _passages(m, division, axial)
    entry, k, f = _stretches(division, passage)
    k, f, joined, buckled = _chained(division, k, f)
    k, f, gripped, loose = _gripped(m.table.turn, k, f)
    k, f = _at_joints(m, division, axial, k, f)
    return Bowed(division, axial, k, f, buckled + loose, slope, passage, entry, joined, gripped)


def _passages(m: Members, d: Division, axial: Axial) -> tuple[Floats, Floats]:
    """Slopes at Gauss's points of each piece, and what passes over it; see Bowed."""
    slope, passage = np.empty((len(d.inner), COUNT, 4)), np.empty((len(d.inner), 3, 4))
    some, member = m.varying, d.pieces.member[d.inner]
    changing = np.zeros(len(member), dtype=bool) if some is None else some.where[member]
    for which, turning in ((~changing, _constant), (changing, _changing)):
        if which.any():
            slope[which], passage[which] = _passages_of(m, d, axial, d.inner[which], turning)
    return slope, passage


@dataclass(frozen=True, slots=True)
class Turning:
    """How pieces (n,) turn, at Gauss's points of each (n, COUNT) and over the whole: `gained`, `end_gained` per gain of
    moment at the points, integrated twice; by a moment and by a shear of 1; by temperature."""

    gained: Floats
    by_moment: Floats
    by_shear: Floats
    by_heat: Floats
    end_gained: Floats
    end_by_moment: Floats
    end_by_heat: Floats
    slide: Floats


def _constant(m: Members, d: Division, p: Ints) -> Turning:
    """Pieces of prismatic members."""
    k, h = d.pieces.member[p], d.pieces.size[p]
    bend = (m.bend[k] * h * h)[:, None]
    heat = d.curvature[k] * h
    return Turning(
        bend[:, :, None] * TWICE, bend * NODES / h[:, None], bend * NODES**2 / 2, heat[:, None] * NODES,
        bend * (WEIGHTS * (1 - NODES)), m.bend[k] * h, heat, m.slide[k][:, None],
    )  # fmt: skip


def _changing(m: Members, d: Division, p: Ints) -> Turning:
    """Pieces of stepped and tapered members: 1/EI at every point counts for itself."""
    k, h = d.pieces.member[p], d.pieces.size[p, None]
    s = h * NODES
    here = m.flexibility(d.pieces, p, s)
    heat = d.curvature[k, None] * here.curl
    return Turning(
        (h * h)[:, :, None] * (RUN @ (here.bend[:, :, None] * RUN)), h * (here.bend @ RUN.T), h * ((here.bend * s) @ RUN.T),
        h * (heat @ RUN.T), h * h * ((WEIGHTS * here.bend) @ RUN), h[:, 0] * (here.bend @ WEIGHTS),
        h[:, 0] * (heat @ WEIGHTS), here.slide,
    )  # fmt: skip


def _passages_of(
    m: Members, d: Division, axial: Axial, p: Ints, turning: Callable[[Members, Division, Ints], Turning]
) -> tuple[Floats, Floats]:
    pieces, h = d.pieces, d.pieces.size[p]
    s = h[:, None] * NODES
    pull, sums = axial.at(pieces, p[:, None], s), pieces.shear_at(p[:, None], s)
    t = turning(m, d, p)
    left = np.eye(COUNT) * (1 + pull * t.slide)[:, :, None] - t.gained * pull[:, None, :]
    right = np.stack([
        np.ones_like(s),
        t.by_moment,
        t.by_shear - t.slide,
        np.einsum("pnc,pc->pn", t.gained, sums) - t.slide * sums + t.by_heat,
    ], axis=2)  # fmt: skip
    slope = np.linalg.solve(left, right)
    # What the moment gains at each point: shear at the `from` end, the loads' and the axial force's part.
    gain = pull[:, :, None] * slope
    gain[:, :, 2] += 1.0
    gain[:, :, 3] += sums
    passage = np.empty((len(p), 3, 4))
    passage[:, 0] = np.einsum("pn,pnc->pc", t.end_gained, gain)
    passage[:, 0, 0] += 1.0
    passage[:, 0, 1] += t.end_by_moment
    passage[:, 0, 3] += t.end_by_heat
    passage[:, 1] = h[:, None] * np.einsum("n,pnc->pc", WEIGHTS, gain)
    passage[:, 1, 1] += 1.0
    passage[:, 2] = h[:, None] * np.einsum("n,pnc->pc", WEIGHTS, slope)
    return np.asarray(slope), passage


def start_values(count: int) -> Floats:
    """(count, 5, 4) turn, moment, shear, 1 and rise at the start of a stretch per the first four of them."""
    values = np.zeros((count, 5, 4))
    values[:, :4] = np.eye(4)
    return values


def passed(values: Floats, passage: Floats, couple: Floats) -> Floats:
    """(n, 5, 4) values behind a piece from those before it, a couple (n,) acting at its start."""
    values = values.copy()
    values[:, 1] += couple[:, None] * values[:, 3]
    over = passage @ values[:, :4]
    return np.concatenate([over[:, :2], values[:, 2:4], values[:, 4:] + over[:, 2:]], axis=1)


def _stretches(d: Division, passage: Floats) -> tuple[Floats, Floats, Floats]:
    """Entry (s, 2, 4), stiffness (s, 3, 3) and fixed moments (s, 3) of each stretch held at both ends."""
    values = start_values(int(d.first[-1]))
    couple = d.pieces.couple[d.inner]
    for step in range(int(d.rank.max(initial=-1)) + 1):
        at = np.flatnonzero(d.rank == step)
        values[d.stretch[at]] = passed(values[d.stretch[at]], passage[at], couple[at])
    # A couple at the far face acts within the connection there: the last stretch takes it.
    values[d.first[1:] - 1, 1, 3] += d.pieces.couple[d.pieces.face[:, 1]]
    # Turn and rise at the far end are given, moment and shear at the start follow.
    a, b, c, e = values[:, 0, 1], values[:, 0, 2], values[:, 4, 1], values[:, 4, 2]
    back = np.stack([np.stack([e, -b], axis=1), np.stack([-c, a], axis=1)], axis=1) / (a * e - b * c)[:, None, None]
    known = np.zeros((len(a), 2, 4))
    known[:, 0, 0], known[:, 0, 1], known[:, 0, 3] = values[:, 0, 0], -1.0, -values[:, 0, 3]
    known[:, 1, 0], known[:, 1, 2], known[:, 1, 3] = values[:, 4, 0], -1.0, -values[:, 4, 3]
    entry = back @ known
    start = np.zeros((len(a), 4, 4))
    start[:, 0, 0], start[:, 1:3], start[:, 3, 3] = -1.0, entry, 1.0
    forces = np.stack([entry[:, 0], -(values[:, None, 1] @ start)[:, 0], entry[:, 1]], axis=1)
    k = forces[:, :, :3]
    return entry, (k + np.swapaxes(k, 1, 2)) / 2, forces[:, :, 3].copy()


_NEAR, _FAR = np.zeros((3, 5)), np.zeros((3, 5))
_NEAR[[0, 1, 2], [0, 3, 4]] = 1.0
_FAR[[0, 1, 2], [3, 1, 2]] = 1.0
_FAR[2, 4] = -1.0
"""Turns and drop of the two that are joined, per turns at both ends, drop, turn between, drop up to there."""


def _chained(d: Division, k: Floats, f: Floats) -> tuple[Floats, Floats, tuple[Joined, ...], Ints]:
    """Flexible parts (m, 3, 3) and (m, 3) from their stretches, joined one after another."""
    whole, fixed = k[d.first[:-1]], f[d.first[:-1]]
    number, joined = np.diff(d.first), []
    buckled = np.zeros(len(number), dtype=np.int64)
    for step in range(1, int(number.max(initial=0))):
        at = np.flatnonzero(number > step)
        following = d.first[at] + step
        h = _NEAR.T @ whole[at] @ _NEAR + _FAR.T @ k[following] @ _FAR
        load = fixed[at] @ _NEAR + f[following] @ _FAR
        own = h[:, 3:, 3:]
        inverse, negative = _inverse(own)
        inside = -inverse @ np.concatenate([h[:, 3:, :3], load[:, 3:, None]], axis=2)
        buckled[at] += negative
        whole[at] = h[:, :3, :3] + h[:, :3, 3:] @ inside[:, :, :3]
        fixed[at] = load[:, :3] + (h[:, :3, 3:] @ inside[:, :, 3:])[:, :, 0]
        joined.append(Joined(at, following, inside))
    return (whole + np.swapaxes(whole, 1, 2)) / 2, fixed, tuple(joined), buckled


def _inverse(own: Floats) -> tuple[Floats, Ints]:
    """Inverse (n, 2, 2), and how many of its eigenvalues are negative."""
    a, b, c = own[:, 0, 0], own[:, 1, 1], own[:, 0, 1]
    determinant = _off_zero(a * b - c * c)
    inverse = np.stack([np.stack([b, -c], axis=1), np.stack([-c, a], axis=1)], axis=1) / determinant[:, None, None]
    negative = np.where(determinant < 0, 1, np.where(a + b < 0, 2, 0))
    return inverse, negative


def _off_zero(pivot: Floats) -> Floats:
    return np.where(pivot == 0.0, 1e-300, pivot)


def _gripped(turn: Floats, k: Floats, f: Floats) -> tuple[Floats, Floats, tuple[Gripped, Gripped], Ints]:
    """Hinges and springs (m, 2) between flexible part and zone: each end let go in its connection's grip."""
    loose = np.zeros(len(k), dtype=np.int64)
    found = []
    for end in (0, 1):
        soft = turn[:, end] != HELD
        grip = np.where(soft, turn[:, end], FREE)
        pivot = np.where(soft, _off_zero(k[:, end, end] + grip), 1.0)
        loose += soft & (pivot < 0)
        behind = -np.concatenate([k[:, end], f[:, end, None]], axis=1) / pivot[:, None]
        behind[:, end] = grip / pivot
        released = k - k[:, :, end, None] * k[:, end, None, :] / pivot[:, None, None]
        fixed = f - k[:, :, end] * (f[:, end] / pivot)[:, None]
        row = k[:, end] * (grip / pivot)[:, None]
        released[:, end], released[:, :, end] = row, row
        fixed[:, end] = f[:, end] * grip / pivot
        k, f = np.where(soft[:, None, None], released, k), np.where(soft[:, None], fixed, f)
        found.append(Gripped(soft, behind))
    return k, f, (found[0], found[1]), loose


def _at_joints(m: Members, d: Division, axial: Axial, k: Floats, f: Floats) -> tuple[Floats, Floats]:
    """Rigid zones turn with their joints, their axial force with its offset; and the drop becomes the chord's turn."""
    t, pieces = m.table, d.pieces
    whole = np.zeros((len(k), 3, 3))
    whole[:, [0, 1], [0, 1]] = 1.0
    whole[:, 2, :2] = -t.zone
    whole[:, 2, 2] = t.length
    k = np.swapaxes(whole, 1, 2) @ k @ whole
    f = (f[:, None] @ whole)[:, 0]
    real = np.flatnonzero((pieces.size > 0) & ~pieces.inner)
    pull = (axial.at(pieces, real[:, None], pieces.size[real, None] * FEW_NODES) @ FEW_WEIGHTS) * pieces.size[real]
    owner = pieces.member[real]
    end = (real > pieces.face[owner, 0]).astype(np.int64)
    np.add.at(k, (owner, end, end), pull)
    before, behind = pieces.face[:, 0], pieces.face[:, 1]
    f[:, 0] -= pieces.moment_at(before, pieces.size[before])
    f[:, 1] -= pieces.moment[pieces.last] - pieces.moment[behind]
    return k, f
