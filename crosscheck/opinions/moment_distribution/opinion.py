"""The answer of moment distribution to a frame."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from crosscheck.answer import Answer, Silent
from crosscheck.frame.kinematics import Study
from crosscheck.frame.model import Frame
from crosscheck.opinions.moment_distribution.members import members
from crosscheck.opinions.moment_distribution.one_way import FirstOrder
from crosscheck.opinions.moment_distribution.one_way_displaced import SecondOrder
from crosscheck.opinions.moment_distribution.process import GIVEN_UP, NAME, case_answer, distribute
from crosscheck.opinions.moment_distribution.second_order import opine_displaced
from crosscheck.opinions.moment_distribution.spans import MemberSpans


def opine(frame: Frame, study: Study, names: Sequence[str] | None = None) -> Answer | Silent:
    """Answer for these load cases and combinations (None: all).

    Raises UnusableInput where an axially rigid frame cannot follow an imposed length or settlement.
    """
    if frame.analysis.order == 2:
        return opine_displaced(frame, study, names, SecondOrder(frame).settled if frame.one_way else None)
    chosen = frame.names if names is None else tuple(names)
    if frame.one_way:
        return _opine_one_way(frame, study, chosen)
    try:
        process = distribute(frame, chosen)
    except (RuntimeError, np.linalg.LinAlgError):
        return Silent(NAME, "the frame's sways have no stiffness that holds them, so no holding forces exist")
    cases, silent = {}, {}
    for column, name in enumerate(chosen):
        if process.left[column] > GIVEN_UP:
            silent[name] = (
                f"the distribution did not settle: {process.left[column]:.1e} of the largest is left unbalanced"
            )
        else:
            cases[name] = case_answer(process, column, study.undetermined)
    return Answer(NAME, cases, study.undetermined, MemberSpans(process.held.members, frame, cases), silent)


def _opine_one_way(frame: Frame, study: Study, names: tuple[str, ...]) -> Answer | Silent:
    """Each case by itself, in its own settled state of the one-way members and supports."""
    states = FirstOrder(frame)
    cases, silent = {}, {}
    for name in names:
        try:
            judged = states.settled(name)
        except (RuntimeError, np.linalg.LinAlgError):
            return Silent(NAME, "the frame's sways have no stiffness that holds them, so no holding forces exist")
        if judged.settled and judged.found is not None:
            cases[name] = case_answer(judged.found, 0, study.undetermined)
        else:
            silent[name] = states.parts.unsettled(judged.wrong)
    return Answer(NAME, cases, study.undetermined, MemberSpans(members(frame), frame, cases), silent)
