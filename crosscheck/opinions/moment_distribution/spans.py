"""Values along the members: statics on the pieces, displacements by integrating curvature and shear strain over
them."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import ClassVar

import numpy as np

from crosscheck.answer import AXIAL, MOMENT, SHEAR, CaseAnswer
from crosscheck.frame.loads import SNAP, load_table
from crosscheck.frame.model import Floats, Frame, Ints
from crosscheck.opinions.moment_distribution.members import Members, cut_up, thermal_curvature
from crosscheck.opinions.moment_distribution.pieces import Pieces
from crosscheck.opinions.moment_distribution.varying import by_rule

HALVINGS = 60
"""Halvings of an interval that holds one root: past the last digit."""
LOOKS = np.linspace(0.0, 1.0, 9)
"""Where a length of a stepped or tapered member is looked at for changes of the slope's sign; it bends little there."""


@dataclass(frozen=True, slots=True)
class Bent:
    """One case along the members: real values on the pieces, and the shape of the flexible parts.

    curvature: (m,) by temperature. slope, rise: (p,) at the start of each inner piece, slope and displacement along
    local y of the axis but for shear strain, measured from the line that `base` and `tilt` (m,) give: displacement of
    the axis at the `from` face, and the slope there. face: (m, 2) displacement of the faces. turn: (m, 2) clockwise
    rotation of the joints, and end: (m, 2) their displacement.
    """

    pieces: Pieces
    curvature: Floats
    slope: Floats
    rise: Floats
    base: Floats
    tilt: Floats
    turn: Floats
    end: Floats


@dataclass(frozen=True)
class MemberSpans:
    """Spans of the protocol in answer.py; each case is bent when first asked for."""

    sampled: ClassVar[bool] = False
    members: Members
    frame: Frame
    cases: Mapping[str, CaseAnswer]
    _bent: dict[str, Bent] = field(default_factory=dict)

    def along(self, name: str, member: Ints, x: Floats, side: Ints) -> Floats:
        """(n, 4) axial, shear, moment, across at x of each member, before (side -1) or after (+1) a jump there."""
        bent = self._of(name)
        pieces = bent.pieces
        member, x = np.asarray(member), np.asarray(x, dtype=float)
        piece = piece_at(pieces, member, x, np.asarray(side))
        s = np.clip(x - pieces.start[piece], 0.0, pieces.size[piece])
        return np.column_stack([
            -pieces.along_at(piece, s),
            pieces.shear_at(piece, s),
            pieces.moment_at(piece, s),
            _across(self.members, bent, piece, s),
        ])  # fmt: skip

    def turning_points(self, name: str) -> tuple[Ints, Floats]:
        """Member and distance of every inner place where shear, intensity across, or the slope of the axis is
        zero."""
        bent = self._of(name)
        pieces = bent.pieces
        found = []
        real = np.flatnonzero(pieces.size > 0)
        w, rate = pieces.intensity_across[real].T
        found.append(_roots(real, np.column_stack([pieces.shear[real], w, rate / 2]), pieces.size))
        found.append(_roots(real, np.column_stack([w, rate]), pieces.size))
        some = self.members.varying
        plain = pieces.inner if some is None else pieces.inner & ~some.where[pieces.member]
        bending = np.flatnonzero(plain)
        found.append(_roots(bending, _slope_terms(self.members, bent, bending), pieces.size))
        if some is not None:
            found += _level_places(self.members, bent, np.flatnonzero(pieces.inner & some.where[pieces.member]))
        piece = np.concatenate([f[0] for f in found])
        x = pieces.start[piece] + np.concatenate([f[1] for f in found])
        member = pieces.member[piece]
        order = np.lexsort((x, member))
        return member[order], x[order]

    def _of(self, name: str) -> Bent:
        if name not in self._bent:
            self._bent[name] = _bend(self.members, self.frame, name, self.cases[name])
        return self._bent[name]


def _bend(m: Members, frame: Frame, name: str, case: CaseAnswer) -> Bent:
    """Integrate the case's curvature and shear strain along the flexible parts and hang the shape between the
    faces."""
    t, loads = m.table, load_table(frame, name)
    ends = case.ends
    pieces = cut_up(m, loads).with_end_actions(ends[:, 0, AXIAL], ends[:, 0, SHEAR], ends[:, 0, MOMENT])
    curvature = thermal_curvature(t, loads)
    moved = case.joints[t.ends]
    end = moved[:, :, 1] * t.cos[:, None] - moved[:, :, 0] * t.sin[:, None]
    turn = np.where(t.zone > 0, moved[:, :, 2], 0.0)
    # Clockwise: the zone beyond the `from` joint goes down, the one before the `to` joint up.
    face = end + turn * t.zone * [-1.0, 1.0]
    count = len(pieces.member)
    slope, rise = np.zeros(count), np.zeros(count)
    bent = Bent(pieces, curvature, slope, rise, face[:, 0], np.zeros(len(t.length)), turn, end)
    number = np.diff(pieces.first)
    for step in range(1, int(number.max(initial=0))):
        here = pieces.first[:-1][number > step] + step
        before = here - 1
        gained = pieces.inner[before]
        here, before = here[gained], before[gained]
        dslope, drise = _gain(m, bent, before, pieces.size[before])
        slope[here] = slope[before] + dslope
        rise[here] = rise[before] + drise
    bent.tilt[:] = (face[:, 1] - face[:, 0] - rise[pieces.face[:, 1]]) / t.clear
    return bent


def _gain(m: Members, bent: Bent, piece: Ints, s: Floats) -> tuple[Floats, Floats]:
    """(n,) gain of slope and displacement over the first s of inner pieces, whose slope at the start is in `bent`.

    Positive shear pushes the right-hand side of a cut down: shear strain is -shear / (G shear_area).
    """
    turned, lifted = np.empty(len(piece)), np.empty(len(piece))
    for which, nodes, weights in by_rule(m.varying, bent.pieces.member[piece]):
        p, reach = piece[which], s[which]
        k = bent.pieces.member[p]
        x = reach[:, None] * nodes
        here = m.flexibility(bent.pieces, p, x)
        moment, shear = bent.pieces.moment_at(p[:, None], x), bent.pieces.shear_at(p[:, None], x)
        curvature = moment * here.bend + bent.curvature[k, None] * here.curl
        weight = reach[:, None] * weights
        turned[which] = (curvature * weight).sum(axis=1)
        lifted[which] = ((curvature * (reach[:, None] - x) - shear * here.slide) * weight).sum(axis=1)
    return turned, bent.slope[piece] * s + lifted


def _slope(m: Members, bent: Bent, piece: Ints, s: Floats) -> Floats:
    """(n,) slope of the axis at distance s from the start of inner pieces, shear strain included."""
    shear = bent.pieces.shear_at(piece, s)
    by_shear = shear * m.flexibility(bent.pieces, piece, s[:, None]).slide[:, 0]
    return np.asarray(bent.tilt[bent.pieces.member[piece]] + bent.slope[piece] + _gain(m, bent, piece, s)[0] - by_shear)


def _level_places(m: Members, bent: Bent, piece: Ints) -> list[tuple[Ints, Floats]]:
    """Pieces of stepped and tapered members, and distances from their start, where the axis is level; and the
    starts of those where shear strain jumps."""
    size = bent.pieces.size[piece]
    at = np.stack([_slope(m, bent, piece, size * look) for look in LOOKS], axis=1)
    rising = at >= 0.0  # so that a slope that is nought just where it is looked at is found too
    row, column = np.nonzero(rising[:, :-1] != rising[:, 1:])
    low, high, rose = LOOKS[column], LOOKS[column + 1], rising[row, column]
    for _ in range(HALVINGS if len(row) else 0):
        middle = (low + high) / 2
        same = (_slope(m, bent, piece[row], size[row] * middle) >= 0.0) == rose
        low, high = np.where(same, middle, low), np.where(same, high, middle)
    after = piece[bent.pieces.inner[piece - 1]]
    before = m.flexibility(bent.pieces, after - 1, bent.pieces.size[after - 1, None]).slide[:, 0]
    jump = np.abs(m.flexibility(bent.pieces, after, np.zeros((len(after), 1))).slide[:, 0] - before) > 1e-9 * before
    return [(piece[row], size[row] * (low + high) / 2), (after[jump], np.zeros(int(jump.sum())))]


def _across(m: Members, bent: Bent, piece: Ints, s: Floats) -> Floats:
    """(n,) displacement along local y at distance s from the start of each piece."""
    pieces, t = bent.pieces, m.table
    k = pieces.member[piece]
    x = pieces.start[piece] + s
    bending = bent.base[k] + bent.tilt[k] * (x - t.zone[k, 0]) + bent.rise[piece] + _gain(m, bent, piece, s)[1]
    near = bent.end[k, 0] - bent.turn[k, 0] * x
    far = bent.end[k, 1] + bent.turn[k, 1] * (t.length[k] - x)
    return np.asarray(np.where(piece <= pieces.face[k, 0], near, np.where(piece >= pieces.face[k, 1], far, bending)))


def _slope_terms(m: Members, bent: Bent, piece: Ints) -> Floats:
    """(n, 5) coefficients, constant first, of the slope of the axis along inner pieces."""
    pieces = bent.pieces
    k = pieces.member[piece]
    w, rate = pieces.intensity_across[piece].T
    moment, shear, bend, slide = pieces.moment[piece], pieces.shear[piece], m.bend[k], m.slide[k]
    return np.column_stack([
        bent.tilt[k] + bent.slope[piece] - shear * slide,
        moment * bend + bent.curvature[k] - w * slide,
        (shear * bend - rate * slide) / 2,
        w * bend / 6,
        rate * bend / 24,
    ])  # fmt: skip


def piece_at(pieces: Pieces, member: Ints, x: Floats, side: Ints) -> Ints:
    """(n,) the piece that ends at or holds x (side -1), or begins at or holds it (side +1).

    Places are found to the rounding of x / length, the same that places loads on marks (frame/loads.py).
    """
    length = np.zeros(len(pieces.first) - 1)
    length[:] = pieces.start[pieces.last]
    key = pieces.member + 0.5 * pieces.start / length[pieces.member]
    near = SNAP / 2
    at = member + 0.5 * x / length[member]
    before = np.searchsorted(key, at - near, side="left") - 1
    after = np.searchsorted(key, at + near, side="right") - 1
    piece = np.where(side < 0, before, after)
    return np.asarray(np.clip(piece, pieces.first[member], pieces.last[member]), dtype=np.int64)


def _roots(piece: Ints, terms: Floats, size: Floats) -> tuple[Ints, Floats]:
    """Pieces, and distances from their start, where the polynomials (n, degree + 1), constant first, pass through
    zero inside."""
    h = size[piece]
    scaled = terms * h[:, None] ** np.arange(terms.shape[1])
    at = _unit_roots(scaled)
    row, column = np.nonzero((at > 1e-9) & (at < 1 - 1e-9))
    return piece[row], at[row, column] * h[row]


def _unit_roots(terms: Floats) -> Floats:
    """(n, degree) roots in (0, 1), NaN where fewer: between the roots of its derivative a polynomial has at most
    one."""
    degree = terms.shape[1] - 1
    if degree == 0:
        return np.empty((len(terms), 0))
    turns = _unit_roots(terms[:, 1:] * np.arange(1, degree + 1))
    turns = np.sort(np.where(np.isnan(turns), 1.0, turns), axis=1)
    low = np.column_stack([np.zeros(len(terms)), turns])
    high = np.column_stack([turns, np.ones(len(terms))])
    start = _value(terms, low)
    holds = (start * _value(terms, high) < 0) & (high > low)
    for _ in range(HALVINGS):
        middle = (low + high) / 2
        same = _value(terms, middle) * start > 0
        low, high = np.where(same, middle, low), np.where(same, high, middle)
    return np.where(holds, (low + high) / 2, np.nan)


def _value(terms: Floats, x: Floats) -> Floats:
    """Polynomials (n, d), constant first, at x (n, k)."""
    value = np.zeros_like(x)
    for c in terms.T[::-1]:
        value = value * x + c[:, None]
    return value
