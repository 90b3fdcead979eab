"""Member deformations from member forces: the unit-load theorem on loads written as brackets.

Every member load is a sum of brackets c <x - a>^n (W. H. Macaulay, Messenger of Mathematics 48 (1919), 129-130), in the
sagging moment of the member as a simple beam, in its shear and in its axial force. A deformation is the integral of the
strain times the force of a unit load (J. C. Maxwell 1864, O. Mohr 1874), and a bracket times a linear unit-load
moment integrates in closed form. This is the audit's own road: no stiffness, no fixed-end action, no quadrature.

Deformations of a member are (end rotation from its chord at `from`, the same at `to`, elongation), clockwise positive,
between its joints; the forces that go with them are (moment at `from`, moment at `to`, axial force at `from`).
A hinge belongs to the geometry, not here; a semi-rigid connection and rigid zones are part of the member.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from crosscheck.audit.equilibrium import pieces, resultants
from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import FREE, HELD, Floats, Frame, Ints

BENDING, SHEAR_STRAIN, STRETCH, CONNECTION, IMPOSED = range(5)
"""Where a deformation comes from: bending, shear, axial force, semi-rigid connections, temperature and misfit."""


@dataclass(frozen=True, slots=True)
class Flexibility:
    """What turns forces into deformations, by source.

    matrix: (5, m, 3, 3) by source (IMPOSED is nil); load: (5, m, 3) deformations of the loads on the simple beam with
    no axial force at its `from` end. Total deformation = sum over sources of matrix @ forces + load.
    connection: (m, 2, 3) forces to sagging moment in the end connections, connection_load: (m, 2) its constant part.
    """

    matrix: Floats
    load: Floats
    connection: Floats
    connection_load: Floats

    @property
    def total(self) -> Floats:
        """(m, 3, 3)."""
        return np.asarray(self.matrix.sum(axis=0))

    @property
    def total_load(self) -> Floats:
        """(m, 3)."""
        return np.asarray(self.load.sum(axis=0))


@dataclass(frozen=True, slots=True)
class _Brackets:
    """(n,) each: member, power 0 to 3, start of the bracket, coefficient. Before its start a bracket is nil."""

    member: Ints
    power: Ints
    start: Floats
    factor: Floats

    @staticmethod
    def of(*rows: tuple[Ints, int, Floats, Floats]) -> _Brackets:
        """From groups of equal power."""
        return _Brackets(
            np.concatenate([r[0] for r in rows]),
            np.concatenate([np.full(len(r[0]), r[1]) for r in rows]),
            np.concatenate([r[2] for r in rows]),
            np.concatenate([r[3] for r in rows]),
        )

    def integral(self, low: Floats, high: Floats, constant: Floats, slope: Floats) -> Floats:
        """(m,) integral from low to high of the brackets times (constant + slope x); all (m,)."""
        m, n = self.member, self.power
        t0 = np.maximum(low[m] - self.start, 0.0)
        t1 = np.maximum(high[m] - self.start, 0.0)
        first = (t1 ** (n + 1) - t0 ** (n + 1)) / (n + 1)
        second = (t1 ** (n + 2) - t0 ** (n + 2)) / (n + 2)
        part = self.factor * (constant[m] * first + slope[m] * (self.start * first + second))
        total = np.zeros(len(low))
        np.add.at(total, m, part)
        return total

    def value(self, x: Floats, after: bool) -> Floats:
        """(m,) the sum at x of each member, just before x, or just after it where `after`."""
        t = x[self.member] - self.start
        on = t >= 0 if after else t > 0
        total = np.zeros(len(x))
        np.add.at(total, self.member, np.where(on, self.factor * np.maximum(t, 0.0) ** self.power, 0.0))
        return total


def _line_brackets(line: Floats, column: int, power: int) -> list[tuple[Ints, int, Floats, Floats]]:
    """A stretch from w0 to w1, integrated `power` times: it begins at its start and is taken off again at its end."""
    member = line[:, 6].astype(np.int64)
    start, end, w0, w1 = line[:, 0], line[:, 1], line[:, column], line[:, column + 1]
    slope = np.divide(w1 - w0, end - start, out=np.zeros_like(w0), where=end > start)
    over = float(np.prod(np.arange(1, power + 1)))
    return [
        (member, power, start, w0 / over), (member, power + 1, start, slope / (over * (power + 1))),
        (member, power, end, -w1 / over), (member, power + 1, end, -slope / (over * (power + 1))),
    ]  # fmt: skip


def _simple_beam(loads: LoadTable, length: Floats) -> tuple[_Brackets, _Brackets, _Brackets]:
    """Sagging moment and shear of each member on two simple supports, and its axial force with none at `from`."""
    part = pieces(loads)
    point, line = part.point, part.line
    every = np.arange(len(length))
    zero = np.zeros(len(length))
    member = point[:, 4].astype(np.int64)
    at, along, across, couple = point[:, 0], point[:, 1], point[:, 2], point[:, 3]
    total = resultants(part, len(length))
    # The shear at `from` is what makes the moment at `to` nil: V L + (moment of the loads about `to`) = 0.
    first = -(total[:, 1] + total[:, 2] / length)
    moment = _Brackets.of(
        (every, 1, zero, first), (member, 1, at, across), (member, 0, at, couple), *_line_brackets(line, 4, 2)
    )
    shear = _Brackets.of((every, 0, zero, first), (member, 0, at, across), *_line_brackets(line, 4, 1))
    axial = _Brackets.of((member, 0, at, -along), *((m, n, a, -c) for m, n, a, c in _line_brackets(line, 2, 1)))
    return moment, shear, axial


def flexibility(frame: Frame, loads: LoadTable) -> Flexibility:
    """Flexibilities and load deformations of every member under one case's loads."""
    t = frame.member_table
    m = len(t.length)
    low, high = t.zone[:, 0], t.length - t.zone[:, 1]
    moment, shear, axial = _simple_beam(loads, t.length)
    bend, slide, pull = _softness(frame)
    one, none = np.ones(m), np.zeros(m)
    # A unit clockwise moment at `from` gives 1 - x/L, one at `to` gives -x/L (sagging); both shears are -1/L.
    unit = ((one, -1 / t.length), (none, -1 / t.length))
    matrix, load = np.zeros((5, m, 3, 3)), np.zeros((5, m, 3))
    for a, (ca, sa) in enumerate(unit):
        load[BENDING, :, a] = bend * moment.integral(low, high, ca, sa)
        load[SHEAR_STRAIN, :, a] = slide * shear.integral(low, high, sa, none)
        load[IMPOSED, :, a] = _curvature(frame, loads) * _linear(low, high, ca, sa)
        for b, (cb, sb) in enumerate(unit):
            matrix[BENDING, :, a, b] = bend * _product(low, high, (ca, sa), (cb, sb))
            matrix[SHEAR_STRAIN, :, a, b] = slide * sa * sb * (high - low)
    matrix[STRETCH, :, 2, 2] = pull * (high - low)
    load[STRETCH, :, 2] = pull * axial.integral(low, high, one, none)
    load[IMPOSED, :, 2] = _warmth(frame, loads) * (high - low) + loads.misfit
    connection, connection_load = _connections(frame, moment)
    soft = np.where((t.turn != FREE) & (t.turn != HELD), 1 / np.where(t.turn == FREE, 1.0, t.turn), 0.0)
    matrix[CONNECTION] = np.einsum("me,mea,meb->mab", soft, connection, connection)
    load[CONNECTION] = np.einsum("me,mea,me->ma", soft, connection, connection_load)
    return Flexibility(matrix, load, connection, connection_load)


def _softness(frame: Frame) -> tuple[Floats, Floats, Floats]:
    """(m,) 1/EI, 1/(G shear_area) and 1/EA; nil where the idealisation makes the member rigid."""
    t = frame.member_table
    none = np.zeros(len(t.length))
    slide = 1 / (t.G * t.shear_area) if frame.analysis.shear == "elastic" else none
    pull = 1 / (t.E * t.A) if frame.analysis.axial == "elastic" else none
    return 1 / (t.E * t.I), slide, pull


def _curvature(frame: Frame, loads: LoadTable) -> Floats:
    """(m,) sagging curvature of the temperature difference: the warmer -y face grows longer."""
    t = frame.member_table
    return np.where(loads.difference != 0, t.alpha * loads.difference / t.depth, 0.0)


def _warmth(frame: Frame, loads: LoadTable) -> Floats:
    """(m,) strain of the mean temperature."""
    return np.where(loads.mean != 0, frame.member_table.alpha * loads.mean, 0.0)


def _linear(low: Floats, high: Floats, constant: Floats, slope: Floats) -> Floats:
    """(m,) integral of constant + slope x."""
    return constant * (high - low) + slope * (high**2 - low**2) / 2


def _product(low: Floats, high: Floats, a: tuple[Floats, Floats], b: tuple[Floats, Floats]) -> Floats:
    """(m,) integral of (a0 + a1 x)(b0 + b1 x), by Simpson's rule, which is exact for it."""
    middle = (low + high) / 2
    ends = sum((a[0] + a[1] * x) * (b[0] + b[1] * x) * w for x, w in ((low, 1), (middle, 4), (high, 1)))
    return np.asarray((high - low) / 6 * ends)


def _connections(frame: Frame, moment: _Brackets) -> tuple[Floats, Floats]:
    """(m, 2, 3) and (m, 2): sagging moment in the end connections as forces @ row + constant.

    Loads at the face of the zone act inside the connection (loads.LoadTable): the moment is taken just outside it.
    """
    t = frame.member_table
    rows = np.zeros((len(t.length), 2, 3))
    constant = np.zeros((len(t.length), 2))
    for end, face in enumerate((t.zone[:, 0], t.length - t.zone[:, 1])):
        rows[:, end, 0] = 1 - face / t.length
        rows[:, end, 1] = -face / t.length
        constant[:, end] = moment.value(face, after=end == 1)
    return rows, constant
