"""Claims that are envelopes: what of a claim speaks of an envelope, and which values cannot be judged as one.

A name that stands for several cases (an envelope, or a combination that became several) has no values of its own, only
greatest and least ones. What a paste prints as "max" or "min" of one place is of such a name and of no single case.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

from crosscheck.answer import Answer
from crosscheck.claims.reading import Entry
from crosscheck.frame.model import Frame


def bounded(e: Entry) -> bool:
    """Is it printed as the greatest or least value of one place, which one case alone does not have?"""
    return e.kind != "extreme" and e.extreme in ("max", "min", "size")


def name_of(e: Entry) -> str | None:
    """The case or envelope that the entry is judged as a part of; None where the paste does not name it."""
    return e.beside if e.along else e.case


def as_of(e: Entry, name: str) -> Entry:
    """The entry as one of `name`."""
    return replace(e, beside=name) if e.along else replace(e, case=name)


def parted_name(entries: list[Entry], frame: Frame) -> str | None:
    """The combination that became several (no envelope) of which plain values are said to be: they are of one of these."""
    mine = [e for e in entries if e.case in frame.several and e.case not in frame.envelopes]
    names = {e.case for e in mine}
    plain = all(e.kind != "extreme" and e.extreme is None and not e.sense for e in mine)
    return names.pop() if len(names) == 1 and plain else None


def prepared(entries: list[Entry], frame: Frame) -> tuple[list[Entry], list[str]]:
    """The entries that can be judged, each with its case, and reasons why others cannot.

    A value with a direction in words ("40 kN up") is the greatest in that direction.
    """
    out, loose = [], 0
    for e in entries:
        if e.case in frame.several and e.kind != "extreme" and e.extreme is None and e.sense != "size":
            if e.sense != "said":
                loose += 1
                continue
            e = replace(e, extreme="max" if e.number.value >= 0 else "min")
        out.append(e)
    if not loose:
        return out, []
    name = next(e.case for e in entries if e.case in frame.several)
    values = f"{loose} values are" if loose > 1 else "a value is"
    return out, [f"{values} not said to be the greatest or the least of {name}; write max or min beside or above them"]


def silent_part(frame: Frame, answers: Mapping[str, Answer], name: str) -> str | None:
    """A case of `name` for which no opinion speaks, or None."""
    return next((n for n in frame.meant(name) if not any(n in a.cases for a in answers.values())), None)


def candidates(entries: list[Entry], frame: Frame, answers: Mapping[str, Answer]) -> tuple[list[str], list[str]]:
    """(single cases, envelopes) that values without a case may be of: only envelopes where some are printed as max or min
    of one place."""
    singles = [n for n in frame.names if silent_part(frame, answers, n) is None]
    several = [n for n in frame.several if silent_part(frame, answers, n) is None]
    loose = [e for e in entries if name_of(e) is None]
    if any(bounded(e) or e.along for e in loose):
        return [], several
    extremes = all(e.kind == "extreme" or e.sense for e in loose)
    return singles, several if extremes else []


def unaudited(cases: tuple[str, ...], frame: Frame) -> list[str]:
    """What is said of the envelopes among the claim's cases."""
    return [
        f"{n} is of {len(frame.meant(n))} cases, and no state of balance: its statics and compatibility are not judged"
        for n in cases if n in frame.several
    ]  # fmt: skip
