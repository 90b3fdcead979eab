"""The slope-deflection opinion.

The end moments of a member follow from the rotations of its ends against its chord,

    M_ij = s (a_i phi_i + b phi_j) + FEM_ij,    phi_i = theta_i - psi,    s = EI / clear length,

with a = 4 and b = 2 for a plain prismatic member, generalised once for shear flexibility, hinged and semi-rigid ends
and rigid end zones (members.py). Joint moment equations and one translation equation for each free direction are
solved together (system.py); values along the members follow in closed form (spans.py).

Published: G. A. Maney, "Secondary stresses and other problems in rigid frames: a new method of solution", University of
Minnesota Studies in Engineering 1 (1915); textbook accounts of the slope-deflection method (from memory).
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import TYPE_CHECKING

from crosscheck.answer import Answer, Silent, WorkTable
from crosscheck.frame.kinematics import Study
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import Frame
from crosscheck.opinions.slope_deflection.spans import ClosedFormSpans
from crosscheck.opinions.slope_deflection.system import System

if TYPE_CHECKING:
    from crosscheck.opinions.slope_deflection.second_order import CaseInSecondOrder, State

NAME = "slope-deflection"
GIVEN_UP = 1e-9
"""Share of the largest that the last round may still change; a case beyond it gets no answer."""
TOO_FAR_APART = "the equations cannot be solved in 16 digits: stiffnesses lie too far apart"
THREE_DIGITS = 5e-4
"""Relative width to which a critical load factor is found where three digits will do."""


def opine(frame: Frame, study: Study, names: Sequence[str] | None = None) -> Answer | Silent:
    """Every load case and combination (or those of `names`) by slope-deflection, in the frame's order."""
    names = frame.names if names is None else tuple(names)
    if frame.analysis.order == 2:
        return _second_order(frame, study, names)
    if frame.one_way:
        return _one_way(frame, study, names)
    tables = [load_table(frame, name) for name in names]
    try:
        solution = System(frame).solve(tables)
    except RuntimeError:  # SuperLU: exactly singular, though the geometry is no mechanism
        return Silent(NAME, TOO_FAR_APART)
    silent = {
        name: f"the equations did not settle: the last round still changed {left:.1e} of the largest"
        for name, left in zip(names, solution.unsettled.tolist(), strict=True)
        if not left <= GIVEN_UP
    }
    cases = {name: solution.case_answer(k, study.undetermined) for k, name in enumerate(names) if name not in silent}
    given = {name: table for name, table in zip(names, tables, strict=True) if name in cases}
    return Answer(NAME, cases, study.undetermined, ClosedFormSpans(frame, given, cases, study.undetermined), silent)


def _one_way(frame: Frame, study: Study, names: tuple[str, ...]) -> Answer | Silent:
    """Case by case, each with the parts that work under it: nothing may be superposed."""
    from crosscheck.opinions.slope_deflection.one_way import OneWay

    cases, tables, silent = {}, {}, {}
    try:
        one_way = OneWay(frame)
        for name in names:
            settled = one_way.settled(name)
            if settled is None:
                silent[name] = one_way.none_found
                continue
            cases[name] = settled.solution.case_answer(0, study.undetermined)
            tables[name] = settled.solution.tables[0]
    except RuntimeError:
        return Silent(NAME, TOO_FAR_APART)
    return Answer(NAME, cases, study.undetermined, ClosedFormSpans(frame, tables, cases, study.undetermined), silent)


def _second_order(frame: Frame, study: Study, names: tuple[str, ...]) -> Answer:
    """Case by case, because the stiffness knows the axial forces; a case past its critical load is named, not given."""
    from crosscheck.opinions.slope_deflection.displaced_spans import DisplacedSpans

    tables, cases, states, silent = {}, {}, {}, {}
    for name, found in _balanced(frame, names):
        if isinstance(found, str):
            silent[name] = found
            continue
        case, states[name] = found
        tables[name] = case.table
        cases[name] = case.case_answer(states[name], study.undetermined)
    return Answer(NAME, cases, study.undetermined, DisplacedSpans(frame, tables, cases, states), silent)


def _balanced(frame: Frame, names: tuple[str, ...]) -> Iterator[tuple[str, tuple[CaseInSecondOrder, State] | str]]:
    """Every case with its balance on the displaced frame, or why it has none."""
    from crosscheck.opinions.slope_deflection.balance import balance
    from crosscheck.opinions.slope_deflection.displaced_one_way import DisplacedOneWay
    from crosscheck.opinions.slope_deflection.one_way import OneWay
    from crosscheck.opinions.slope_deflection.second_order import CaseInSecondOrder, PastCritical

    one_way = DisplacedOneWay(OneWay(frame)) if frame.one_way else None
    for name in names:
        if one_way is not None:
            yield name, one_way.settled(name)
            continue
        case = CaseInSecondOrder(frame, load_table(frame, name))
        try:
            yield name, (case, balance(case))
        except PastCritical as past:
            yield name, str(past)


def critical_factors(
    frame: Frame, names: Sequence[str] | None = None, beyond: float | None = None, enough: float | None = None
) -> dict[str, float]:
    """Critical load factor of each case and combination: the least factor on its first-order axial forces at which the
    frame or a member in it buckles; inf where nothing is compressed enough.

    beyond: where given, factors above it are inf as well and those below are found to three digits, which is quick.
    enough: where given, so are those above it and above the least of the cases before.
    A frame with one-way parts has those of the state that each case settles in; a case that settles in none is left out.
    """
    from crosscheck.opinions.slope_deflection.one_way import OneWay
    from crosscheck.opinions.slope_deflection.second_order import BEYOND, EXACT, CaseInSecondOrder

    names = frame.names if names is None else tuple(names)
    one_way = OneWay(frame) if frame.one_way else None
    factors: dict[str, float] = {}
    for name in names:
        settled = one_way.settled(name) if one_way else None
        if one_way and settled is None:
            continue
        case = CaseInSecondOrder(settled.frame if settled else frame, load_table(frame, name))
        close, most = (EXACT, BEYOND) if beyond is None else (THREE_DIGITS, beyond)
        if enough is not None:
            most = min(most, max(enough, min(factors.values(), default=most)))
        factors[name] = case.critical_factor(case.first_order(), close, most)
    return factors


def working(frame: Frame, study: Study, name: str) -> list[WorkTable]:
    """The slope-deflection equations of one case with their numbers, for a reader who follows by hand."""
    from crosscheck.opinions.slope_deflection.equations import equations

    return equations(frame, study, name)
