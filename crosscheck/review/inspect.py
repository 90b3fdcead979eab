"""All checks of a frame, the gravest findings first."""

from __future__ import annotations

import importlib

from crosscheck.frame.kinematics import mechanisms, study
from crosscheck.frame.model import Frame
from crosscheck.problems import UnusableInput
from crosscheck.review import behaviour, connection, loading, stiffness
from crosscheck.review.finding import RANK, Check, Finding, Limits, Subject

CHECKS: tuple[Check, ...] = (
    connection.mechanisms, connection.loose_joints, connection.near_joints, connection.touching, connection.crossing,
    connection.doubled, connection.idle_supports, connection.off_line, connection.symmetry,
    stiffness.moduli, stiffness.sections, stiffness.weak_axis, stiffness.shear_areas, stiffness.members,
    stiffness.springs, stiffness.conditioning, stiffness.fixed_feet,
    loading.empty_cases, loading.totals, loading.expected, loading.odd_directions, loading.unloaded_span,
    loading.unused_cases, loading.twice, loading.opposing_winds, loading.uplift_combination,
    behaviour.sway, behaviour.deflection, behaviour.uplift, behaviour.thrust, behaviour.locked_temperature,
    behaviour.second_order, behaviour.undetermined, behaviour.said_by_the_reader,
)  # fmt: skip
QUICK = 300
"""Most members for which critical load factors are worked out unasked."""
OPINION = "crosscheck.opinions.slope_deflection"


def subject_of(frame: Frame, limits: Limits | None = None) -> Subject:
    """The frame with its mechanisms or, where it has none, its first-order answer and critical load factors."""
    limits = limits or Limits()
    motions = tuple(mechanisms(frame))
    if motions:
        return Subject(frame, motions, limits=limits)
    try:
        found = study(frame)
    except UnusableInput:
        return Subject(frame, limits=limits)
    opinion = importlib.import_module(OPINION)
    answer = opinion.opine(frame, found) if frame.cases else None
    critical = opinion.critical_factors(frame) if len(frame.members) <= QUICK and frame.cases else {}
    return Subject(frame, (), found, answer, critical, limits)


def inspect(subject: Subject) -> list[Finding]:
    """Every finding, gravest first, in the order of the checks."""
    found = [
        Finding(f.grade, f.where, f.says, check.__name__) for check in CHECKS for f in check(subject)
    ]
    return sorted(found, key=lambda f: RANK[f.grade])
