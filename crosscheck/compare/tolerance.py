"""How far two values may lie apart: one symmetric measure, used by every comparison, printed beside every difference.

    allowed = max(relative * size, floor * scale, half digit)

size is the larger of the two magnitudes; scale keeps values that are zero but for rounding noise from being compared by
their noise; half digit is half a unit of the claim's last printed digit. Scales come from the opinions, never from a
claim.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from crosscheck.answer import AXIAL, MOMENT, SHEAR, CaseAnswer
from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import Floats, Frame

COARSE = 0.05
"""A claimed value whose half digit exceeds this share of its scale is printed too coarsely to judge."""
TRACE = 1e-4
"""Share of what full restraint would cause that counts as scale even where no such value occurs: a determinate frame
that warms has forces of rounding noise alone, and an axially rigid one loaded along its members no displacement."""
LEAST_SHARE = 0.1
"""The scale for a claim is the member's own largest value, but no less than this share of the case's scale."""


@dataclass(frozen=True, slots=True)
class Tolerance:
    """relative: share of the larger magnitude; floor: share of the scale. Both dimensionless."""

    relative: float
    floor: float


OWN = Tolerance(1e-6, 1e-8)
"""Between our own opinions."""
LIBRARY = Tolerance(1e-5, 1e-7)
"""Between the library and either of ours."""
RECORD = Tolerance(1e-6, 1e-8)
"""Against values on record."""
CLAIM = Tolerance(0.01, 0.005)
"""Against a claim, unless the frame file or --tolerance says otherwise."""


def claim_tolerance(relative: float) -> Tolerance:
    """The claim's tolerance for another relative part (0.02 is 2%); its floor follows in the default's ratio."""
    return Tolerance(relative, relative * CLAIM.floor / CLAIM.relative)


def allowed(
    one: Floats | float, other: Floats | float, tolerance: Tolerance, scale: Floats | float, half: Floats | float = 0.0
) -> Floats:
    """The difference allowed between values of the same unit; arrays broadcast."""
    size = np.maximum(np.abs(one), np.abs(other))
    return np.maximum(np.maximum(tolerance.relative * size, tolerance.floor * np.asarray(scale)), half)


@dataclass(frozen=True, slots=True)
class Scales:
    """A case's largest values by kind, in the frame's units; rotations in radians."""

    forces: float
    moments: float
    displacements: float
    rotations: float

    def of(self, quantity: str) -> float:
        """The scale of a quantity by its contract name."""
        kind = KIND[quantity]
        return float(getattr(self, kind))


KIND = {
    "axial": "forces", "shear": "forces", "fx": "forces", "fy": "forces",
    "moment": "moments",
    "dx": "displacements", "dy": "displacements", "across": "displacements",
    "rotation": "rotations",
}  # fmt: skip


def case_scales(
    frame: Frame, table: LoadTable, answers: Iterable[CaseAnswer], across: Iterable[Floats] = ()
) -> Scales:
    """Scales of one case from its loads and the opinions' answers to it; undetermined (NaN) values are left out.

    across: displacements along the members, of any shape; they count too, for a frame whose joints all stay still.
    """
    answers = list(answers)
    longest = float(frame.member_table.length.max(initial=0.0))
    restraint = full_restraint(frame, table)
    ends = [a.ends for a in answers]
    forces = _largest(
        *[e[:, :, (AXIAL, SHEAR)] for e in ends], *[a.reactions[:, :2] for a in answers],
        np.hypot(table.joint[:, 0], table.joint[:, 1]), member_load_totals(frame, table),
        np.array([TRACE * restraint.forces]),
    )  # fmt: skip
    moments = _largest(
        *[e[:, :, MOMENT] for e in ends], *[a.reactions[:, 2] for a in answers],
        table.joint[:, 2], table.point_couple, np.array([forces * longest, TRACE * restraint.moments]),
    )  # fmt: skip
    forces = max(forces, TRACE * moments / longest if longest else 0.0)
    turns = _largest(*[a.joints[:, 2] for a in answers])
    displacements = _largest(*[a.joints[:, :2] for a in answers], np.array([turns * longest]), *across)
    displacements = max(displacements, TRACE * restraint.displacements, TRACE * moments * _span_flexibility(frame))
    rotations = max(turns, displacements / longest if longest else 0.0)
    return Scales(forces, moments, displacements, rotations)


def full_restraint(frame: Frame, table: LoadTable) -> Scales:
    """The size of what temperature, misfit and settlement impose, and of what they would cause in members held fast:
    EA times the strain or movement / L (axially elastic), EI times the curvature, 6 EI / L^2 and 4 EI / L times the
    movement."""
    t = frame.member_table
    stiffness = t.E * t.I
    bend = np.where(table.difference != 0.0, np.abs(table.difference) * t.alpha / t.depth, 0.0)
    longer = np.where(table.mean != 0.0, np.abs(table.mean) * t.alpha * t.length, 0.0) + np.abs(table.misfit)
    moved = max(_largest(longer), _largest(table.settlement[:, :2]))
    turned = _largest(table.settlement[:, 2])
    strain = (longer + _largest(table.settlement[:, :2])) / t.length
    axial = np.where((strain > 0.0) & ~t.rigid, t.E * t.A * strain, 0.0)
    moments = _largest(stiffness * (bend + 6.0 * moved / t.length**2 + 4.0 * turned / t.length))
    longest = float(t.length.max(initial=0.0))
    displacements = moved + turned * longest + _largest(bend) * longest**2
    forces = max(_largest(axial), moments / longest if longest else 0.0)
    return Scales(forces, moments, displacements, turned)


def _span_flexibility(frame: Frame) -> float:
    """Displacement that a unit moment causes in a usual member: L^2 / EI."""
    t = frame.member_table
    return float(np.median(t.length**2 / (t.E * t.I))) if len(t.length) else 0.0


def _largest(*values: Floats) -> float:
    """Largest finite magnitude among arrays of any shape, 0 where there is none."""
    sizes = [np.abs(v[np.isfinite(v)]).max(initial=0.0) for v in values]
    return float(max(sizes, default=0.0))


def member_load_totals(frame: Frame, table: LoadTable) -> Floats:
    """(m,) sum of the magnitudes of the forces on each member."""
    totals = np.zeros(len(frame.members))
    np.add.at(totals, table.point_member, np.hypot(table.point_along, table.point_across))
    mean = np.hypot(table.line_along, table.line_across).mean(axis=1)
    np.add.at(totals, table.line_member, mean * (table.line_end - table.line_start))
    return totals
