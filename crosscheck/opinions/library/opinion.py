"""The library's opinion: qualification, then each case it can speak for, and values along members when asked for."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import ClassVar

import numpy as np

from crosscheck.answer import Answer, CaseAnswer, Silent
from crosscheck.frame.kinematics import Study
from crosscheck.frame.loads import LoadTable, load_table
from crosscheck.frame.model import Floats, Frame, Ints
from crosscheck.frame.stations import stations
from crosscheck.opinions.library import qualification
from crosscheck.opinions.library.model import Unfit
from crosscheck.opinions.library.results import Solved, along, case_answer, solve_case
from crosscheck.opinions.library.scope import case_reason, frame_reason

NAME = "library"
SIZE_LIMIT = 400
"""Members for which it is still asked: its matrix is dense and its time goes with the cube of the joints."""
SPAN_LIMIT = 60
"""Members up to which all of them are also divided at their stations, for values along them."""


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
    return f"{count} members are more than the {limit} it is asked for" if limit is not None and count > limit else ""


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
    return Answer(NAME, cases, study.undetermined, _Spans(frame, tables, solved), silent, _notes(frame))


def _notes(frame: Frame) -> tuple[str, ...]:
    if frame.analysis.axial == "elastic":
        return ()
    return ("axially rigid members are the limit of elastic ones, taken from three solutions",)


@dataclass(frozen=True, slots=True)
class _Spans:
    """Values at the places where members are divided; small frames are solved once more, divided at every station."""

    sampled: ClassVar[bool] = True
    frame: Frame
    tables: dict[str, LoadTable]
    ends_only: dict[str, Solved]
    divided: dict[str, Solved] = field(default_factory=dict)

    def along(self, name: str, member: Ints, x: Floats, side: Ints) -> Floats:
        return along(self.frame, self._solved(name), member, x, side)

    def turning_points(self, name: str) -> tuple[Ints, Floats]:
        """None: it is asked at stations alone."""
        return np.empty(0, dtype=np.int64), np.empty(0)

    def _solved(self, name: str) -> Solved:
        if len(self.frame.members) > SPAN_LIMIT:
            return self.ends_only[name]
        if name not in self.divided:
            self.divided[name] = self._divide(name)
        return self.divided[name]

    def _divide(self, name: str) -> Solved:
        places = stations(self.frame)
        try:
            return solve_case(self.frame, self.tables[name], (places.member, places.x))
        except Unfit:
            return self.ends_only[name]
