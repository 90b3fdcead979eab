"""All checks of a frame, the gravest findings first."""

from __future__ import annotations

import importlib
import inspect as python
from dataclasses import dataclass

from crosscheck.answer import Answer, Silent, joined
from crosscheck.check import critical_factors, situations
from crosscheck.frame.kinematics import mechanisms, study
from crosscheck.frame.model import Frame
from crosscheck.problems import UnusableInput
from crosscheck.review import behaviour, combinations, connection, loading, properties, stability, stiffness, symmetry, week
from crosscheck.review.finding import RANK, Check, Finding, Limits, Subject
from crosscheck.review.storeys import OPINION, storey_factors

CHECKS: tuple[Check, ...] = (
    connection.mechanisms, connection.unusable, connection.loose_joints, connection.near_joints, connection.touching,
    connection.crossing, connection.doubled, connection.idle_supports, connection.off_line,
    symmetry.mirrored_sections, symmetry.mirrored_supports, symmetry.mirrored_loads,
    properties.moduli, properties.weights, properties.sections, properties.slenderness, properties.weak_axis,
    properties.shear_areas,
    stiffness.short_members, stiffness.members, stiffness.springs, stiffness.conditioning, stiffness.fixed_feet,
    loading.empty_cases, loading.totals, loading.expected, loading.upward_case, loading.odd_directions, loading.odd_sizes,
    loading.doubled_loads, loading.unloaded_span,
    combinations.unused_cases, combinations.twice, combinations.opposing_winds, combinations.uplift_combination,
    combinations.light_factors,
    week.excluding_cases, week.uneven_states, week.uneven_leans, week.uneven_orders, week.unused_states, week.state_factors,
    week.lean_sizes, week.idle_patterns, week.ties, week.idle_one_way, week.haunches, week.included_files,
    behaviour.sway, behaviour.deflection, behaviour.uplift, behaviour.thrust, behaviour.locked_temperature,
    stability.second_order, stability.critical_factors, behaviour.undetermined, behaviour.said_by_the_reader,
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class Explanation:
    """What a check asks, from its docstring: the question, then (label, text) of why, look at, example and source."""

    check: str
    asks: str
    parts: tuple[tuple[str, str], ...]


def explained(check: Check) -> Explanation:
    """The docstring of a check taken apart."""
    asks, *lines = (python.getdoc(check) or "").splitlines()
    parts: list[tuple[str, str]] = []
    for line in lines:
        label, colon, text = line.partition(":")
        if colon and label in ("Why", "Look at", "Example", "Source"):
            parts.append((label, text.strip()))
        elif parts and line.strip():
            parts[-1] = (parts[-1][0], f"{parts[-1][1]} {line.strip()}")
    return Explanation(check.__name__, asks, tuple(parts))


def explanations() -> dict[str, Explanation]:
    """Every check by name, in the order they are made."""
    return {check.__name__: explained(check) for check in CHECKS}


def subject_of(frame: Frame, limits: Limits | None = None, stability: bool = True) -> Subject:
    """The frame with its mechanisms or, where it has none, its answer and (`stability`) critical load factors."""
    limits = limits or Limits()
    motions = tuple(mechanisms(frame)) if frame.members else ()
    if motions:
        return Subject(frame, motions, limits=limits)
    try:
        found = study(frame)
        answer = _answer(frame) if frame.cases else None
    except UnusableInput as error:
        return Subject(frame, limits=limits, refused=error.problems)
    if not isinstance(answer, Answer):
        return Subject(frame, (), found, limits=limits)
    critical = critical_factors(frame) if stability else {}
    rough = _storeys(frame, answer) if stability else {}
    return Subject(frame, (), found, answer, critical, rough, limits)


def _answer(frame: Frame) -> Answer | Silent:
    """Every case and combination in its own state of stiffness and order. Raises UnusableInput."""
    opine = importlib.import_module(OPINION).opine
    return joined([(names, opine(plain, study(plain), names)) for plain, names in situations(frame, frame.names)])


def _storeys(frame: Frame, answer: Answer) -> dict[str, float]:
    """The storey formula's factor of each case and combination, in its own state of stiffness."""
    found: dict[str, float] = {}
    for plain, names in situations(frame, frame.names):
        cases = {name: answer.cases[name] for name in names if name in answer.cases}
        found |= storey_factors(plain, study(plain), cases)
    return found


def inspect(subject: Subject) -> list[Finding]:
    """Every finding, gravest first, in the order of the checks."""
    return graded([Finding(f.grade, f.where, f.says, check.__name__) for check in CHECKS for f in check(subject)])


def graded(findings: list[Finding]) -> list[Finding]:
    """Gravest first, else in the order given."""
    return sorted(findings, key=lambda f: RANK[f.grade])
