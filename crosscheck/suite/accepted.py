"""Accepted differences: what the office has looked at and lives with, written down beside the frame.

FRAME.accepted.toml holds any number of entries:

    [[accepted]]
    claim = "other-program"        # NAME of FRAME.NAME.claim.txt; "" or left out for FRAME.claim.txt
    case = "dead"
    quantity = "moment"
    member = "rafter"              # and/or joint = "B"
    difference = "1.8"             # largest size of the difference that is accepted, in the frame's units
    why = "their rafter has a haunch that ours has not"
    initials = "KW"
    until = 2027-06-30             # after this day it is red again
    program = "their version 4.2"  # which version of the other analysis was looked at (for people)
"""

from __future__ import annotations

import datetime
import tomllib
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from crosscheck.compare.differences import Difference
from crosscheck.problems import Problem, UnusableInput, nearest

NEEDED = ("case", "quantity", "difference", "why", "initials", "until")
KNOWN = (*NEEDED, "claim", "member", "joint", "program")


@dataclass(frozen=True, slots=True)
class Accepted:
    """One accepted difference; `size` in the frame's units."""

    claim: str
    case: str
    quantity: str
    member: str | None
    joint: str | None
    size: float
    why: str
    initials: str
    until: datetime.date
    program: str = ""

    def covers(self, claim: str, d: Difference, today: datetime.date) -> bool:
        """Whether the difference is the one accepted, no larger than accepted, and the date has not passed."""
        p = d.place
        same = (self.claim, self.case, self.quantity) == (claim, p.case, p.quantity)
        there = (self.member is None or self.member == p.member) and (self.joint is None or self.joint == p.joint)
        return same and there and d.difference <= self.size and today <= self.until


def read_accepted(path: Path) -> tuple[Accepted, ...]:
    """The accepted differences of a file; none where it does not exist. Raises UnusableInput with every problem."""
    if not path.exists():
        return ()
    try:
        data = tomllib.loads(path.read_text(encoding="utf-8-sig"))
    except (OSError, ValueError) as error:
        raise UnusableInput([Problem(str(path), None, "", f"cannot be read ({error})", "mend or remove it")]) from None
    entries = data.get("accepted", [])
    problems = [p for k, entry in enumerate(entries) for p in _problems(path, k, entry)]
    strange = [key for key in data if key != "accepted"]
    problems += [Problem(str(path), None, key, "is not known here", nearest(key, ["accepted"])) for key in strange]
    if problems:
        raise UnusableInput(problems)
    return tuple(_entry(e) for e in entries)


def _problems(path: Path, k: int, entry: Any) -> Iterable[Problem]:
    where = f"accepted[{k}]"
    if not isinstance(entry, dict):
        yield Problem(str(path), None, where, "is not a table", "write it under [[accepted]]")
        return
    for key in NEEDED:
        if key not in entry:
            yield Problem(str(path), None, where, f"has no {key}", f"accepted differences need {', '.join(NEEDED)}")
    for key in entry:
        if key not in KNOWN:
            yield Problem(str(path), None, f"{where}.{key}", "is not known here", nearest(key, KNOWN))
    if "member" not in entry and "joint" not in entry:
        yield Problem(str(path), None, where, "names no place", "give member, joint or both")
    if "until" in entry and type(entry["until"]) is not datetime.date:
        yield Problem(str(path), None, f"{where}.until", "is not a date", "write it as 2027-06-30")
    if "difference" in entry and not _positive(entry["difference"]):
        yield Problem(str(path), None, f"{where}.difference", "is not a positive number", "in the frame's units")


def _positive(value: Any) -> bool:
    try:
        return not isinstance(value, bool) and 0.0 < float(value) < float("inf")
    except (TypeError, ValueError):
        return False


def _entry(e: dict[str, Any]) -> Accepted:
    return Accepted(
        str(e.get("claim", "")), str(e["case"]), str(e["quantity"]), e.get("member"), e.get("joint"),
        float(e["difference"]), str(e["why"]), str(e["initials"]), e["until"], str(e.get("program", "")),
    )  # fmt: skip
