"""Values along the members in closed form: sums of powers of the distance past each load (Macaulay 1919)."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cached_property

import numpy as np

from crosscheck.answer import CaseAnswer, Undetermined
from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import Floats, Frame, Ints
from crosscheck.frame.stations import Stations, stations
from crosscheck.opinions.slope_deflection.members import thermal_curvature
from crosscheck.opinions.slope_deflection.parting import LoadRuns
from crosscheck.opinions.slope_deflection.varying import Bent

HALVINGS = 50
AT_ONCE = 16_384
"""Pieces between stations in which level places are looked for at once."""
SIXTHS = (1.0 - np.cos(np.pi * np.arange(6) / 5)) / 2
"""Places of a piece from which a polynomial of degree five is known best (Chebyshev's, ends included)."""
PARTS = np.linspace(1e-4, 1.0 - 1e-4, 9)
"""Between these the slope is looked at for a change of sign. At the very ends it may be zero, and its sign rounding."""
TO_POWERS = np.linalg.inv(np.vander(SIXTHS, increasing=True))
"""From the values there to the coefficients of powers."""


class ClosedFormSpans:
    """Values along members from their end actions and joint displacements (the Spans protocol of answer.py)."""

    sampled = False

    def __init__(
        self, frame: Frame, tables: Mapping[str, LoadTable], cases: Mapping[str, CaseAnswer], undetermined: Undetermined
    ) -> None:
        self.frame, self.tables, self.cases, self.undetermined = frame, tables, cases, undetermined

    def along(self, name: str, member: Ints, x: Floats, side: Ints) -> Floats:
        """(n, 4) axial, shear, moment, across; see answer.Spans."""
        axial, shear, moment = self._forces(name, member, x, side)
        return np.stack([axial, shear, moment, self._across(name, member, x)], axis=1)

    def turning_points(self, name: str) -> tuple[Ints, Floats]:
        """Where shear passes zero, where it turns, and where the deflection turns, piece by piece between stations."""
        left, right = self._pieces
        member, a, b = self._stations.member[left], self._stations.x[left], self._stations.x[right]
        found = self._shear_places(name, member, a, b)
        varying = self.frame.member_table.varying
        plain = np.flatnonzero(~varying[member])
        # Part by part of a large frame: all at once would be most of the memory that a check needs.
        for first in range(0, len(plain), AT_ONCE):
            part = plain[first : first + AT_ONCE]
            found.append(self._level_places(name, member[part], a[part], b[part]))
        if varying.any():
            found.append(self._varying(name).level(self._lean(name)))
        return np.concatenate([m for m, _ in found]), np.concatenate([x for _, x in found])

    @cached_property
    def _stations(self) -> Stations:
        return stations(self.frame, list(self.tables.values()))

    @cached_property
    def _pieces(self) -> tuple[Ints, Ints]:
        """Indices of neighbouring stations of one member that stand apart: loads are linear between them."""
        s = self._stations
        apart = (s.member[1:] == s.member[:-1]) & (s.x[1:] > s.x[:-1])
        left = np.flatnonzero(apart)
        return left, left + 1

    def _forces(self, name: str, member: Ints, x: Floats, side: Ints) -> tuple[Floats, Floats, Floats]:
        """Axial, shear and moment by statics from the `from` end, at the joint."""
        ends = self.cases[name].ends[member, 0]
        axial, shear, moment = self._runs[name].sums(member, x, side)
        return ends[:, 0] + axial, ends[:, 1] + shear, ends[:, 2] + ends[:, 1] * x + moment

    @cached_property
    def _runs(self) -> dict[str, LoadRuns]:
        return {name: LoadRuns(self.frame, table) for name, table in self.tables.items()}

    # --- deflection ---

    def _across(self, name: str, member: Ints, x: Floats) -> Floats:
        """Displacement along local y: straight on the rigid zones, bent between the faces."""
        t = self.frame.member_table
        near, far, turn_near, turn_far = self._joint_moves(name)
        face_1, face_2 = t.zone[member, 0], (t.length - t.zone[:, 1])[member]
        inside = np.clip(x, face_1, face_2)
        bent = self._bend(name, member, inside)
        w1 = near[member] - np.nan_to_num(turn_near[member]) * face_1
        flexible = w1 + bent + self._lean(name)[member] * (inside - face_1)
        zone_1 = near[member] - np.nan_to_num(turn_near[member]) * x
        zone_2 = far[member] + np.nan_to_num(turn_far[member]) * (t.length[member] - x)
        return np.where(x < face_1, zone_1, np.where(x > face_2, zone_2, flexible))

    def _lean(self, name: str) -> Floats:
        """(m,) slope at the `from` face, that of the chord included: whatever makes the deflection at the `to` face come
        out right."""
        if name not in self._leans:
            t = self.frame.member_table
            near, far, turn_near, turn_far = self._joint_moves(name)
            whole = self._bend(name, np.arange(len(t.length)), t.length - t.zone[:, 1])
            w1 = near - np.nan_to_num(turn_near) * t.zone[:, 0]
            w2 = far + np.nan_to_num(turn_far) * t.zone[:, 1]
            self._leans[name] = (w2 - w1 - whole) / t.clear
        return self._leans[name]

    @cached_property
    def _leans(self) -> dict[str, Floats]:
        return {}

    def _joint_moves(self, name: str) -> tuple[Floats, Floats, Floats, Floats]:
        """Displacement along local y and rotation of each member's two joints, all (m,)."""
        t, moves = self.frame.member_table, self.cases[name].joints
        i, j = moves[t.ends[:, 0]], moves[t.ends[:, 1]]
        return i[:, 1] * t.cos - i[:, 0] * t.sin, j[:, 1] * t.cos - j[:, 0] * t.sin, i[:, 2], j[:, 2]

    def _bend(self, name: str, member: Ints, x: Floats) -> Floats:
        """Deflection at x from bending, temperature and shear alone, both value and section rotation zero at the `from`
        face: double integral of M/EI and of the free curvature, less the integral of shear over G As."""
        t, table = self.frame.member_table, self.tables[name]
        d = x - t.zone[member, 0]
        shear_1, moment_1 = self._face_actions(name)
        area, pull = self._runs[name].bends(member, x)
        area += moment_1[member] * d**2 / 2 + shear_1[member] * d**3 / 6
        pull += shear_1[member] * d
        curve = thermal_curvature(self.frame, table)[member] * d**2 / 2
        shear = pull / (t.G * t.shear_area)[member] if self.frame.analysis.shear == "elastic" else 0.0
        bend = np.asarray(area / (t.E * t.I)[member] + curve - shear)
        own = np.flatnonzero(t.varying[member])
        if len(own):
            bend[own] = self._varying(name).at(member[own], x[own])
        return bend

    def _varying(self, name: str) -> Bent:
        """What the stepped and tapered members do between their faces."""
        if name not in self._bents:
            self._bents[name] = Bent(self.frame, self.tables[name], *self._face_actions(name))
        return self._bents[name]

    @cached_property
    def _bents(self) -> dict[str, Bent]:
        return {}

    def _face_actions(self, name: str) -> tuple[Floats, Floats]:
        """Shear and moment just inside the `from` zone, before any load at the face itself, (m,) each."""
        t = self.frame.member_table
        every = np.arange(len(t.length))
        _, shear, moment = self._forces(name, every, t.zone[:, 0], np.full(len(every), -1))
        return shear, moment

    # --- turning points ---

    def _shear_places(self, name: str, member: Ints, a: Floats, b: Floats) -> list[tuple[Ints, Floats]]:
        """Shear is a parabola between stations: its zeros and its vertex, where they lie within the piece."""
        after, before, either = np.ones(len(a), dtype=np.int64), np.full(len(a), -1), np.ones(len(a), dtype=np.int64)
        v0 = self._forces(name, member, a, after)[1]
        v1 = self._forces(name, member, (a + b) / 2, either)[1]
        v2 = self._forces(name, member, b, before)[1]
        square, linear = 2 * (v0 - 2 * v1 + v2), 4 * v1 - 3 * v0 - v2
        with np.errstate(divide="ignore", invalid="ignore"):
            root = np.sqrt(linear**2 - 4 * square * v0)
            q = -(linear + np.copysign(root, linear)) / 2
            shares = [q / square, v0 / q, -linear / (2 * square)]
        found = []
        for share in shares:
            inside = np.isfinite(share) & (share > 0) & (share < 1)
            found.append((member[inside], (a + share * (b - a))[inside]))
        return found

    def _level_places(self, name: str, member: Ints, a: Floats, b: Floats) -> tuple[Ints, Floats]:
        """Where the member's slope changes sign within a piece, by halving.

        Loads are linear between stations, so the deflection there is a polynomial of degree five: six values give it.
        """
        places = a[:, None] + (b - a)[:, None] * SIXTHS
        across = self._across(name, np.repeat(member, len(SIXTHS)), places.ravel()).reshape(places.shape)
        # Less the first value: a member that moves as a whole must not cost digits of how it bends.
        slope = ((across - across[:, :1]) @ TO_POWERS.T)[:, 1:] * np.arange(1.0, len(SIXTHS))
        falls = np.signbit(slope @ np.vander(PARTS, slope.shape[1], increasing=True).T)
        piece, part = np.nonzero(falls[:, 1:] != falls[:, :-1])
        slope, falling, low, high = slope[piece], falls[piece, part], PARTS[part], PARTS[part + 1]
        for _ in range(HALVINGS if len(piece) else 0):
            middle = (low + high) / 2
            same = np.signbit(_horner(slope, middle)) == falling
            low, high = np.where(same, middle, low), np.where(same, high, middle)
        return member[piece], a[piece] + (b - a)[piece] * (low + high) / 2


def _horner(coefficients: Floats, at: Floats) -> Floats:
    """(n,) values of n polynomials, coefficients (n, k) from the constant up, each at its own place."""
    value = np.zeros(len(at))
    for column in coefficients.T[::-1]:
        value = value * at + column
    return value
