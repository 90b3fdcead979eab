"""The unit of distances along members that a paste does not state: the one in which most members end where they should."""

from __future__ import annotations

from dataclasses import replace

from crosscheck.claims.reading import Entry
from crosscheck.claims.words import Size
from crosscheck.compare.fit_units import length_choices
from crosscheck.frame.model import Frame
from crosscheck.frame.units import LENGTH

CLOSE = 0.01
"""Share of a member's length within which the last station counts as standing at its end."""


def with_stations(entries: list[Entry], frame: Frame) -> list[Entry]:
    """The entries with a unit (or a share of the length) for every distance, one for each table."""
    out = list(entries)
    tables: dict[int, list[int]] = {}
    for k, e in enumerate(entries):
        if e.kind == "span" and e.at_unit is None and not e.at_share:
            tables.setdefault(e.table, []).append(k)
    for where in tables.values():
        unit = _unit_of([entries[k] for k in where], frame)
        for k in where:
            e = entries[k]
            out[k] = replace(e, at_unit=unit) if unit else replace(e, at_share=True)
    return out


def _unit_of(entries: list[Entry], frame: Frame) -> Size | None:
    """The unit, or None where the distances are shares of the length."""
    last: dict[str, float] = {}
    for e in entries:
        last[str(e.member)] = max(last.get(str(e.member), 0.0), float(e.at or 0.0))
    lengths = frame.member_table.length
    real = {m: float(lengths[frame.member_index[m]]) for m in last}
    for e in entries:
        if e.reach is not None:  # a part of a member: its stations end where it does
            real[str(e.member)] = min(real[str(e.member)], e.reach)
    choices = length_choices(frame.units)
    scores = [_score(last, real, c.factor) for c in choices]
    share = _score(last, dict.fromkeys(last, 1.0), 1.0)
    best = max(range(len(choices)), key=lambda k: (scores[k], -k))
    if share > scores[best]:
        return None
    return Size(choices[best].text, LENGTH, choices[best].factor * frame.units.metre)


def _score(last: dict[str, float], real: dict[str, float], factor: float) -> float:
    """Members whose last station stands at their end; one that lies beyond the end counts against the unit."""
    ratios = [x * factor / real[m] for m, x in last.items()]
    ending = sum(abs(r - 1.0) <= CLOSE for r in ratios)
    return ending - len(ratios) * any(r > 1.0 + CLOSE for r in ratios)
