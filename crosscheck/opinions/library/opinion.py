"""The library's opinion: qualification, then each case it can speak for, and values along members when asked for."""

from __future__ import annotations

from collections.abc import Sequence

from crosscheck.answer import Answer, CaseAnswer, Silent
from crosscheck.frame.kinematics import Study
from crosscheck.frame.loads import LoadTable, load_table
from crosscheck.frame.model import Frame
from crosscheck.opinions.library import qualification
from crosscheck.opinions.library.model import Unfit
from crosscheck.opinions.library.results import Solved, case_answer, solve_case
from crosscheck.opinions.library.scope import case_reason, frame_reason
from crosscheck.opinions.library.spans import LibrarySpans

NAME = "library"
SIZE_LIMIT = 200
"""Members for which it is still asked: its matrix is dense and its time goes with the cube of the joints."""


def opine(
    frame: Frame, study: Study, names: Sequence[str] | None = None, size_limit: int | None = SIZE_LIMIT
) -> Answer | Silent:
    """What anastruct says of the frame, or why it abstains. names: None for every load case and combination.

    size_limit: most members it is asked for; None asks whatever the size.
    """
    names = frame.names if names is None else names
    tables = {name: load_table(frame, name) for name in names}
    why = frame_reason(frame, study.undetermined) or _size_reason(frame, size_limit)
    why = why or qualification.failure(frame, tables.values())
    if why:
        return Silent(NAME, why)
    return _speak(frame, study, tables)


def _size_reason(frame: Frame, limit: int | None) -> str:
    count = len(frame.members)
    if limit is None or count <= limit:
        return ""
    return f"{count} members are more than the {limit} it is asked for unless --ask-library says so"


def _speak(frame: Frame, study: Study, tables: dict[str, LoadTable]) -> Answer | Silent:
    silent = {name: why for name, table in tables.items() if (why := case_reason(table))}
    cases: dict[str, CaseAnswer] = {}
    solved: dict[str, Solved] = {}
    for name, table in tables.items():
        if name in silent:
            continue
        try:
            solved[name] = solve_case(frame, table)
            cases[name] = case_answer(frame, table, solved[name], study.undetermined)
        except Unfit as unfit:
            silent[name] = str(unfit)
    if not cases:
        return Silent(NAME, "; ".join(dict.fromkeys(silent.values())) or "there is no load case")
    return Answer(NAME, cases, study.undetermined, LibrarySpans(frame, tables, solved), silent, _notes(frame))


def _notes(frame: Frame) -> tuple[str, ...]:
    if frame.analysis.axial == "elastic":
        return ()
    return ("axially rigid members are the limit of elastic ones, taken from three solutions",)
