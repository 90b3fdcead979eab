"""Member deformations from member forces: the unit-load theorem on loads written as brackets.

Every member load is a sum of brackets c <x - a>^n (W. H. Macaulay, Messenger of Mathematics 48 (1919), 129-130), in the
sagging moment of the member as a simple beam, in its shear and in its axial force. A deformation is the integral of the
strain times the force of a unit load (J. C. Maxwell 1864, O. Mohr 1874), and a bracket times a linear unit-load
moment integrates in closed form. This is the audit's own road: no stiffness, no fixed-end action. Stepped and tapered
members have the same integrals with their true sections under them (varying.py).

Deformations of a member are (end rotation from its chord at `from`, the same at `to`, elongation), clockwise positive,
between its joints; the forces that go with them are (moment at `from`, moment at `to`, axial force at `from`).
A hinge belongs to the geometry, not here; a semi-rigid connection and rigid zones are part of the member.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from crosscheck.audit.brackets import Brackets, simple_beam
from crosscheck.audit.varying import ByPiece, by_piece
from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import FREE, HELD, Floats, Frame

BENDING, SHEAR_STRAIN, STRETCH, CONNECTION, IMPOSED = range(5)
"""Where a deformation comes from: bending, shear, axial force, semi-rigid connections, temperature and misfit."""


@dataclass(frozen=True, slots=True)
class Flexibility:
    """What turns forces into deformations, by source.

    matrix: (5, m, 3, 3) by source (IMPOSED is nil); load: (5, m, 3) deformations of the loads on the simple beam with
    no axial force at its `from` end. Total deformation = sum over sources of matrix @ forces + load.
    connection: (m, 2, 3) forces to sagging moment in the end connections, connection_load: (m, 2) its constant part.
    by_piece: what each piece of the stepped and tapered members has in it.
    """

    matrix: Floats
    load: Floats
    connection: Floats
    connection_load: Floats
    by_piece: ByPiece

    @property
    def total(self) -> Floats:
        """(m, 3, 3)."""
        return np.asarray(self.matrix.sum(axis=0))

    @property
    def total_load(self) -> Floats:
        """(m, 3)."""
        return np.asarray(self.load.sum(axis=0))

    @property
    def held_axial(self) -> Floats:
        """(m,) axial force at `from` with which the loads along a member do not change its length; nil if it is rigid."""
        soft = self.matrix[STRETCH, :, 2, 2]
        return np.asarray(np.divide(-self.load[STRETCH, :, 2], soft, out=np.zeros(len(soft)), where=soft > 0))


def flexibility(frame: Frame, loads: LoadTable) -> Flexibility:
    """Flexibilities and load deformations of every member under one case's loads."""
    t = frame.member_table
    m = len(t.length)
    low, high = t.zone[:, 0], t.length - t.zone[:, 1]
    moment, shear, axial = simple_beam(loads, t.length)
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
    pieces = by_piece(frame, loads, moment, shear, axial)
    _put_pieces(frame, pieces, matrix, load)
    load[IMPOSED, :, 2] = _warmth(frame, loads) * (high - low) + loads.misfit
    connection, connection_load = _connections(frame, moment)
    soft = np.where((t.turn != FREE) & (t.turn != HELD), 1 / np.where(t.turn == FREE, 1.0, t.turn), 0.0)
    matrix[CONNECTION] = np.einsum("me,mea,meb->mab", soft, connection, connection)
    load[CONNECTION] = np.einsum("me,mea,me->ma", soft, connection, connection_load)
    return Flexibility(matrix, load, connection, connection_load, pieces)


def _put_pieces(frame: Frame, pieces: ByPiece, matrix: Floats, load: Floats) -> None:
    """Put the sums over the pieces in place of what means over the length have given."""
    varying, member = frame.member_table.varying, frame.variation.member
    sources = slice(BENDING, STRETCH + 1)
    matrix[sources, varying], load[sources, varying], load[IMPOSED, varying] = 0.0, 0.0, 0.0
    np.add.at(matrix[sources].swapaxes(0, 1), member, pieces.matrix)
    np.add.at(load[sources].swapaxes(0, 1), member, pieces.load)
    np.add.at(load[IMPOSED], member, pieces.imposed)


def _softness(frame: Frame) -> tuple[Floats, Floats, Floats]:
    """(m,) 1/EI, 1/(G shear_area) and 1/EA; nil where the idealisation, or its own word, makes the member rigid."""
    t = frame.member_table
    none = np.zeros(len(t.length))
    slide = 1 / (t.G * t.shear_area) if frame.analysis.shear == "elastic" else none
    pull = np.where(t.rigid, 0.0, 1 / (t.E * np.where(t.rigid, 1.0, t.A)))
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


def _connections(frame: Frame, moment: Brackets) -> tuple[Floats, Floats]:
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
