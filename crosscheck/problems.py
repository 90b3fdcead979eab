"""Problems with what the user gave, as objects: one a problem, each with its place and its remedy.

Every reader collects `Problem`s and raises them together as one `UnusableInput`, so that a user sees all that is wrong
at once. The command line prints them and exits 2; nothing else may reach a user as a traceback.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Problem:
    """One thing wrong with the input.

    file: the file's name as the user gave it ("" where there is none).
    line: 1-based line number, or None where it cannot be known.
    key: dotted path of the entry, for example "members.rafter.section" ("" where no key belongs to it).
    says: what is wrong, one sentence without a full stop.
    instead: what would be right ("" where nothing can be offered).
    """

    file: str
    line: int | None
    key: str
    says: str
    instead: str = ""

    def __str__(self) -> str:
        place = self.file + (f":{self.line}" if self.line is not None else "")
        subject = f"{self.key}: " if self.key else ""
        remedy = f"; {self.instead}" if self.instead else ""
        return f"{place}: {subject}{self.says}{remedy}" if place else f"{subject}{self.says}{remedy}"


class UnusableInput(Exception):
    """The input cannot be used (exit status 2); `problems` holds every reason found."""

    def __init__(self, problems: Iterable[Problem]) -> None:
        self.problems: tuple[Problem, ...] = tuple(problems)
        super().__init__("\n".join(str(p) for p in self.problems))


class MechanismFound(UnusableInput):
    """The frame can move without resistance; `inspect` reports this as a finding instead of refusing."""


def nearest(name: str, valid: Iterable[str]) -> str:
    """The valid name most like `name`, as a remedy ('did you mean "rafter"?'), or "" where none is near."""
    close = difflib.get_close_matches(name, list(valid), n=1, cutoff=0.6)
    return f'did you mean "{close[0]}"?' if close else ""
