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

from collections.abc import Sequence

from crosscheck.answer import Answer, Silent, WorkTable
from crosscheck.frame.kinematics import Study
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import Frame
from crosscheck.opinions.slope_deflection.spans import ClosedFormSpans
from crosscheck.opinions.slope_deflection.system import System

NAME = "slope-deflection"


def opine(frame: Frame, study: Study, names: Sequence[str] | None = None) -> Answer | Silent:
    """Every load case and combination (or those of `names`) by slope-deflection, first order."""
    names = frame.names if names is None else tuple(names)
    tables = [load_table(frame, name) for name in names]
    solution = System(frame).solve(tables)
    cases = {name: solution.case_answer(k, study.undetermined) for k, name in enumerate(names)}
    spans = ClosedFormSpans(frame, dict(zip(names, tables, strict=True)), cases, study.undetermined)
    return Answer(NAME, cases, study.undetermined, spans)


def working(frame: Frame, study: Study, name: str) -> list[WorkTable]:
    """The slope-deflection equations of one case with their numbers, for a reader who follows by hand."""
    from crosscheck.opinions.slope_deflection.working import equations

    return equations(frame, study, name)
