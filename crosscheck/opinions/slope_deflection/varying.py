"""Stepped and tapered members: flexibilities as power series between the places where anything changes.

On a stretch of a tapered piece the depth is d = d0 (1 + r xi), xi running from 0 to 1, and every property a power of it, so
that its inverse is the binomial series (1 + r xi)^-p. Stretches are cut short enough that TERMS of it leave nothing (|r| is
at most 1/4). Moments are polynomials there, hence M/EI, its integral and its second integral are series too, integrated
term by term: the end rotations of the simple beam, by virtual work

    phi_i = integral of (M/EI + free curvature) m_i + integral of V/(G As) v_i,

m_i, v_i: moment and shear of a unit clockwise moment at end i; and the deflection along it. Lengths are those of the
flexible part, between the faces of the rigid zones, wherever these cut the pieces.

Published: virtual work after J. C. Maxwell (1864) and O. Mohr (1874); Newton's binomial series (from memory).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import Floats, Frame, Ints
from crosscheck.opinions.slope_deflection.parting import LoadRuns

TERMS = 34
"""Terms of the series of a property."""
DEEPER, STIFFER = np.log(1.25), 1.0
"""Most that the logarithm of the depth, and of any property, may change by on a stretch."""
PLACES = np.arange(4) / 3
"""Places on a stretch from which the polynomials of loads are known."""
TO_CUBIC = np.linalg.inv(np.vander(PLACES, increasing=True))
TO_PARABOLA = np.linalg.pinv(np.vander(PLACES, 3, increasing=True))
INSET = 1e-9
"""How far from its ends a stretch is first looked at: where the slope is zero at an end, its sign is rounding."""
LOOKS = np.concatenate([[INSET], np.arange(1, 4) / 4, [1.0 - INSET]])
HALVINGS = 50


@dataclass(frozen=True, slots=True)
class Stretches:
    """Parts of the flexible parts of the stepped and tapered members, sorted by member and along it, (s,) rows.

    start, end: distances from the `from` joint, exactly those of the cuts: start plus length may miss a load there by
    rounding. rank: number along its member. bend, shear, pull: (s, TERMS) coefficients in
    powers of xi of 1/EI, 1/(G As) and 1/(EA); curve: the same of alpha/depth. NaN where a property is not stated.
    """

    member: Ints
    start: Floats
    end: Floats
    length: Floats
    rank: Ints
    bend: Floats
    shear: Floats
    pull: Floats
    curve: Floats


def stretches(frame: Frame, table: LoadTable | None = None) -> Stretches:
    """Cut at the faces, where pieces meet, where a property has changed enough, and where the loads of a case change."""
    member, x = _cuts(frame, table)
    inner = np.flatnonzero((member[1:] == member[:-1]) & (x[1:] > x[:-1]))
    member, start, end = member[inner], x[inner], x[inner + 1]
    length = end - start
    rank = np.arange(len(member)) - np.searchsorted(member, member)
    return Stretches(member, start, end, length, rank, *property_series(frame, member, start, length))


def property_series(frame: Frame, member: Ints, start: Floats, length: Floats) -> tuple[Floats, Floats, Floats, Floats]:
    """(s, TERMS) coefficients of 1/EI, 1/(G As), 1/(EA) and alpha/depth on parts of varying members that no cut divides."""
    t, v = frame.member_table, frame.variation
    row = np.searchsorted(_key(frame, v.member, v.start), _key(frame, member, start + length / 2), side="right") - 1
    run = (v.depth[row, 1] - v.depth[row, 0]) / (v.end - v.start)[row]
    # Sections without a stated depth do not taper.
    run = np.where(np.isfinite(run), run, 0.0)
    first = np.where(np.isfinite(v.depth[row, 0]), v.depth[row, 0], 1.0)
    here = first + run * (start - v.start[row])
    growth, ratio = run * length / here, here / first
    bend, shear, pull = (
        _binomial(-p, growth) / (modulus * value * ratio**p)[:, None]
        for p, modulus, value in (
            (v.power[row, 0], t.E[member], v.I[row, 0]),
            (v.power[row, 2], t.G[member], v.shear_area[row, 0]),
            (v.power[row, 1], t.E[member], v.A[row, 0]),
        )
    )
    curve = t.alpha[member, None] * _binomial(np.full(len(row), -1.0), growth) / (v.depth[row, 0] * ratio)[:, None]
    return bend, shear, pull, curve


def softest(frame: Frame) -> tuple[Floats, Floats]:
    """(m,) the largest 1/EI and 1/(G As) on the flexible part of each varying member; 0 of others."""
    s = stretches(frame)
    found = np.zeros((2, len(frame.members)))
    for row, series in zip(found, (s.bend, s.shear), strict=True):
        with np.errstate(invalid="ignore"):  # a property that no section states
            np.maximum.at(row, s.member, np.maximum(series[:, 0], series.sum(axis=1)))
    return found[0], found[1]


def property_cuts(frame: Frame) -> tuple[Ints, Floats]:
    """Members and distances, within the faces, of where pieces meet and where a property has changed enough."""
    t, v = frame.member_table, frame.variation
    piece, x = _piece_cuts(frame)
    member = v.member[piece]
    inside = (x > t.zone[member, 0]) & (x < (t.length - t.zone[:, 1])[member])
    return member[inside], x[inside]


def _cuts(frame: Frame, table: LoadTable | None) -> tuple[Ints, Floats]:
    """Members and distances of all cuts on the flexible parts, sorted."""
    t = frame.member_table
    own = np.flatnonzero(t.varying)
    member, x = property_cuts(frame)
    members, places = [own, own, member], [t.zone[own, 0], (t.length - t.zone[:, 1])[own], x]
    if table is not None:
        marks = np.concatenate([table.point_member, table.line_member, table.line_member])
        on = t.varying[marks]
        members.append(marks[on])
        places.append(np.concatenate([table.point_at, table.line_start, table.line_end])[on])
    member, x = np.concatenate(members), np.concatenate(places)
    inside = (x >= t.zone[member, 0]) & (x <= (t.length - t.zone[:, 1])[member])
    member, x = member[inside], x[inside]
    order = np.lexsort((x, member))
    return member[order], x[order]


def _piece_cuts(frame: Frame) -> tuple[Ints, Floats]:
    """Piece and distance of where each piece begins, and within it where its depth has changed by equal ratios."""
    v = frame.variation
    depths = np.where(np.isfinite(v.depth), v.depth, 1.0)
    deeper = np.log(depths[:, 1] / depths[:, 0])
    stiffer = np.abs(v.power * deeper[:, None]).max(axis=1)
    parts = np.ceil(np.maximum(np.abs(deeper) / DEEPER, stiffer / STIFFER)).clip(1).astype(np.int64)
    piece = np.repeat(np.arange(len(parts)), parts)
    number = np.arange(len(piece)) - np.repeat(np.cumsum(parts) - parts, parts)
    share = number / parts[piece]
    # Of a straight depth that ends at e**g times its start: where it is e**(g share) times its start.
    grown = np.expm1(deeper)[piece]
    share = np.where(grown == 0.0, share, np.expm1(deeper[piece] * share) / np.where(grown == 0.0, 1.0, grown))
    return piece, v.start[piece] + share * (v.end - v.start)[piece]


def _binomial(power: Floats, growth: Floats) -> Floats:
    """(s, TERMS) coefficients of (1 + growth xi)**power."""
    out = np.ones((len(growth), TERMS))
    for k in range(1, TERMS):
        out[:, k] = out[:, k - 1] * (power - (k - 1)) / k * growth
    return out


def _key(frame: Frame, member: Ints, x: Floats) -> Floats:
    """A number that sorts places by member and then by distance."""
    return np.asarray(member + 0.5 * x / frame.member_table.length[member])


# --- polynomials, (s, terms) coefficients from the constant up ----------------------------------------


def _times(series: Floats, by: Floats) -> Floats:
    out = np.zeros((len(series), series.shape[1] + by.shape[1] - 1))
    for k, column in enumerate(by.T):
        out[:, k : k + series.shape[1]] += series * column[:, None]
    return out


def _plus(one: Floats, other: Floats) -> Floats:
    """The sum of two polynomials of different degree."""
    long, short = (one, other) if one.shape[1] >= other.shape[1] else (other, one)
    out = long.copy()
    out[:, : short.shape[1]] += short
    return out


def _integral(series: Floats, length: Floats) -> Floats:
    """From the start of each stretch, over distance; zero there."""
    out = np.zeros((len(series), series.shape[1] + 1))
    out[:, 1:] = series / np.arange(1.0, series.shape[1] + 1) * length[:, None]
    return out


def _total(series: Floats, length: Floats) -> Floats:
    """(s,) over the whole of each stretch."""
    return np.asarray(series @ (1.0 / np.arange(1.0, series.shape[1] + 1)) * length)


def _at(series: Floats, xi: Floats) -> Floats:
    """(n,) or (n, looks) values of n polynomials, each at its own place or places."""
    value = np.zeros(np.shape(xi))
    for column in series.T[::-1]:
        value = value * xi + (column if np.ndim(xi) == 1 else column[:, None])
    return value


# --- coefficients and fixed ends --------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Flexibility:
    """Of the stepped and tapered members `member` (v,) as simple beams: end rotations per end moment (v,) `near`,
    `cross`, `far` (clockwise both), and elongation per axial force `pull`, NaN where no area is stated."""

    member: Ints
    near: Floats
    cross: Floats
    far: Floats
    pull: Floats


def flexibility(frame: Frame) -> Flexibility:
    """By virtual work: integrals of (1 - d/l)^2/EI, -(1 - d/l)(d/l)/EI, (d/l)^2/EI, each with 1/(l^2 G As), and of 1/EA."""
    t, s = frame.member_table, stretches(frame)
    toward, away = _levers(frame, s)
    clear = t.clear[s.member]
    parts = [_total(_times(_times(s.bend, one), other), s.length)
             for one, other in ((toward, toward), (toward, -away), (away, away))]  # fmt: skip
    if frame.analysis.shear == "elastic":
        parts = [part + _total(s.shear, s.length) / clear**2 for part in parts]
    own = np.flatnonzero(t.varying)
    sums = _by_member(frame, s, np.column_stack([*parts, _total(s.pull, s.length)]))[own]
    return Flexibility(own, *sums.T)


def _levers(frame: Frame, s: Stretches) -> tuple[Floats, Floats]:
    """(s, 2) each: 1 - d/l and d/l, d being the distance from the `from` face."""
    t = frame.member_table
    clear = t.clear[s.member]
    away = np.column_stack([(s.start - t.zone[s.member, 0]) / clear, s.length / clear])
    return np.column_stack([1.0 - away[:, 0], -away[:, 1]]), away


def _by_member(frame: Frame, s: Stretches, rows: Floats) -> Floats:
    out = np.zeros((len(frame.member_table.length), rows.shape[1]))
    np.add.at(out, s.member, rows)
    return out


@dataclass(frozen=True, slots=True)
class LoadSeries:
    """What the loads of a case on the flexible part make of a cantilever held at the `to` face, by stretch: (s, 3) axial
    force, (s, 3) shear, (s, 4) sagging moment, before any action at the `from` face; (s, TERMS) free curvature."""

    stretches: Stretches
    axial: Floats
    shear: Floats
    moment: Floats
    curve: Floats


def load_series(frame: Frame, table: LoadTable) -> LoadSeries:
    """Polynomials of the loads on every stretch, from what they add up to at a few places."""
    s, t = stretches(frame, table), frame.member_table
    runs = LoadRuns(frame, table)
    places = s.start[:, None] + s.length[:, None] * PLACES
    places[:, -1] = s.end
    side = np.broadcast_to(np.where(PLACES == 1.0, -1, 1), places.shape)
    member = np.repeat(s.member, len(PLACES))
    sums = runs.sums(member, places.ravel(), side.ravel())
    axial, shear, moment = (v.reshape(places.shape) for v in sums)
    near = t.zone[s.member, 0]
    zone = [v[:, None] for v in runs.sums(s.member, near, np.full(len(near), -1))]
    d = places - near[:, None]
    difference = np.where(table.difference != 0.0, table.difference, 0.0)[s.member, None]
    return LoadSeries(
        s,
        (axial - zone[0]) @ TO_PARABOLA.T,
        (shear - zone[1]) @ TO_PARABOLA.T,
        (moment - zone[2] - zone[1] * d) @ TO_CUBIC.T,
        np.where(difference != 0.0, difference * s.curve, 0.0),
    )


def simple_beam(frame: Frame, table: LoadTable, turning: Floats) -> tuple[Floats, Floats]:
    """Clockwise end rotations (m, 2) of the loaded simple beams, and (m,) the axial force at the `from` face with both
    faces held against moving along; nil for members that do not vary.

    turning: (m,) clockwise moment of the loads about the `to` face.
    """
    t, load = frame.member_table, load_series(frame, table)
    s = load.stretches
    toward, away = _levers(frame, s)
    clear = t.clear[s.member]
    reaction = -turning[s.member, None] / clear[:, None]
    moment = _plus(load.moment, reaction * clear[:, None] * away)
    bent = _plus(_times(s.bend, moment), load.curve)
    turns = [_total(_times(bent, lever), s.length) for lever in (toward, -away)]
    if frame.analysis.shear == "elastic":
        slid = _total(_times(s.shear, _plus(load.shear, reaction)), s.length) / clear
        turns = [turn - slid for turn in turns]
    # Without a stated area the member is axially rigid, and how the held force is shared out means nothing.
    soft = np.where(np.isfinite(s.pull), s.pull, np.arange(TERMS) == 0)
    lengths = np.column_stack([_total(_times(soft, load.axial), s.length), _total(soft, s.length)])
    sums = _by_member(frame, s, np.column_stack([*turns, lengths]))
    held = -sums[:, 2] / np.where(t.varying, sums[:, 3], 1.0)
    return sums[:, :2], held


# --- values along -----------------------------------------------------------------------------------


class Bent:
    """Deflection along the stepped and tapered members of one case, both it and the section's rotation zero at the `from`
    face. shear, moment: (m,) at that face, before any load."""

    def __init__(self, frame: Frame, table: LoadTable, shear: Floats, moment: Floats) -> None:
        self.frame = frame
        load = load_series(frame, table)
        s = self.stretches = load.stretches
        d = np.column_stack([s.start - frame.member_table.zone[s.member, 0], s.length])
        whole = _plus(load.moment, shear[s.member, None] * d)
        whole[:, 0] += moment[s.member]
        turn = _integral(_plus(_times(s.bend, whole), load.curve), s.length)
        slid = np.zeros((len(s.member), 1))
        if frame.analysis.shear == "elastic":
            slid = _times(s.shear, _plus(load.shear, shear[s.member, None]))
        turn, across = self._run_on(turn, slid)
        self.slope: Floats = _plus(turn, -slid)
        self.across: Floats = across

    def _run_on(self, turn: Floats, slid: Floats) -> tuple[Floats, Floats]:
        """Every stretch begun where the one before it ends."""
        s = self.stretches
        turn = turn.copy()
        begin = np.zeros(len(s.member))
        for rank in range(1, int(s.rank.max(initial=-1)) + 1):
            now = np.flatnonzero(s.rank == rank)
            turn[now, 0] = turn[now - 1].sum(axis=1)
        across = _integral(_plus(turn, -slid), s.length)
        rise = across.sum(axis=1)
        for rank in range(1, int(s.rank.max(initial=-1)) + 1):
            now = np.flatnonzero(s.rank == rank)
            begin[now] = begin[now - 1] + rise[now - 1]
        across[:, 0] = begin
        return turn, across

    @cached_property
    def _keys(self) -> Floats:
        return _key(self.frame, self.stretches.member, self.stretches.start)

    def at(self, member: Ints, x: Floats) -> Floats:
        """(n,) deflection at distances x from the `from` joints, on the flexible parts."""
        s = self.stretches
        row = np.searchsorted(self._keys, _key(self.frame, member, x), side="right") - 1
        row = np.clip(row, np.searchsorted(s.member, member), np.searchsorted(s.member, member, side="right") - 1)
        return _at(self.across[row], np.clip((x - s.start[row]) / s.length[row], 0.0, 1.0))

    def level(self, chord: Floats) -> tuple[Ints, Floats]:
        """Member and distance of every place where the slope changes sign. chord: (m,) what is to be added to it."""
        s = self.stretches
        slope = self.slope.copy()
        slope[:, 0] += chord[s.member]
        falls = np.signbit(_at(slope, np.broadcast_to(LOOKS, (len(slope), len(LOOKS)))))
        row, look = np.nonzero(falls[:, 1:] != falls[:, :-1])
        chosen, falling, low, high = slope[row], falls[row, look], LOOKS[look], LOOKS[look + 1]
        for _ in range(HALVINGS if len(row) else 0):
            middle = (low + high) / 2
            same = np.signbit(_at(chosen, middle)) == falling
            low, high = np.where(same, middle, low), np.where(same, high, middle)
        joint = np.flatnonzero((s.member[1:] == s.member[:-1]) & (falls[1:, 0] != falls[:-1, -1])) + 1
        member = np.concatenate([s.member[row], s.member[joint]])
        return member, np.concatenate([s.start[row] + s.length[row] * (low + high) / 2, s.start[joint]])
