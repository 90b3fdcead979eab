"""Distances along members: the unit that a paste does not state is the one in which most members end where they should, and
a distance that its printed digits cannot tell from a point load stands at it."""

from __future__ import annotations

from dataclasses import replace
from functools import lru_cache

import numpy as np

from crosscheck.claims.reading import Entry
from crosscheck.claims.words import Size
from crosscheck.compare.fit_units import length_choices
from crosscheck.frame.model import Floats, Frame, Ints
from crosscheck.frame.stations import stations
from crosscheck.frame.units import LENGTH

_Part = tuple[str, float | None, float | None, int]
"""A member, and of a part of it where it begins, how far it reaches and which way it runs."""
CLOSE = 0.01
"""Share of a member's length within which the last station counts as standing at its end."""


ROUNDED = 1e-4
"""Share of a member's length by which places are off because coordinates are printed to a few digits."""


@lru_cache(maxsize=8)
def _jumps(frame: Frame) -> tuple[Ints, Floats, Floats]:
    """Point loads and couples along members: member, distance, and both as one number that sorts them."""
    s = stations(frame)
    twice = np.flatnonzero((s.member[1:] == s.member[:-1]) & (s.x[1:] == s.x[:-1]))
    member, x = s.member[twice], s.x[twice]
    return member, x, _in_order(frame, member, x)


def _in_order(frame: Frame, member: Ints, x: Floats) -> Floats:
    """(n,) numbers that grow by member and, within it, by distance."""
    order: Floats = member + 0.9 * np.clip(np.nan_to_num(x) / frame.member_table.length[member], 0.0, 1.0)
    return order


def at_jumps(frame: Frame, member: Ints, x: Floats, half: Floats) -> Floats:
    """(n,) distances, those that may be meant at a point load put there: results are looked up on both its sides."""
    jump_member, jump_x, order = _jumps(frame)
    out = x.copy()
    if not len(order):
        return out
    near = half + ROUNDED * frame.member_table.length[member]
    after = np.searchsorted(order, _in_order(frame, member, x))
    for index in (np.clip(after - 1, 0, len(order) - 1), np.clip(after, 0, len(order) - 1)):
        apart = np.where(jump_member[index] == member, np.abs(jump_x[index] - x), np.inf)
        better = apart <= np.minimum(near, np.where(out == x, np.inf, np.abs(out - x)))
        out = np.where(better, jump_x[index], out)
    return out


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
    last: dict[_Part, float] = {}
    real: dict[_Part, float] = {}
    lengths = frame.member_table.length
    for e in entries:
        part = str(e.member), e.origin, e.reach, e.run  # a part of a member: its stations end where it does
        last[part] = max(last.get(part, 0.0), float(e.at or 0.0))
        real[part] = float(lengths[frame.member_index[part[0]]]) if e.reach is None else e.reach
    choices = length_choices(frame.units)
    scores = [_score(last, real, c.factor) for c in choices]
    share = _score(last, dict.fromkeys(last, 1.0), 1.0)
    best = max(range(len(choices)), key=lambda k: (scores[k], -k))
    if share > scores[best]:
        return None
    return Size(choices[best].text, LENGTH, choices[best].factor * frame.units.metre)


def _score(last: dict[_Part, float], real: dict[_Part, float], factor: float) -> float:
    """Members whose last station stands at their end; one that lies beyond the end counts against the unit."""
    ratios = [x * factor / real[m] for m, x in last.items()]
    ending = sum(abs(r - 1.0) <= CLOSE for r in ratios)
    return ending - len(ratios) * any(r > 1.0 + CLOSE for r in ratios)
