"""Where along each member values are asked for: the same places for every opinion, so that they can be compared.

Stations stand at the tenths of each member, at the faces of its rigid zones, at the ends of every spread load and, once
on either side, at every point load of any case. They are geometry: the extremes belong to each opinion.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from crosscheck.frame.loads import SNAP, LoadTable, leans, load_table
from crosscheck.frame.model import Floats, Frame, Ints

TENTHS = np.arange(11) / 10.0


@dataclass(frozen=True, slots=True)
class Stations:
    """Flat arrays (n,): member index, distance x from its `from` joint, and side of a jump.

    side: -1 just before x, +1 just after. Sorted by member, then x, then side. `start[m]:start[m + 1]` is member m.
    """

    member: Ints
    x: Floats
    side: Ints
    start: Ints

    def of(self, member: int) -> slice:
        return slice(int(self.start[member]), int(self.start[member + 1]))


def stations(frame: Frame, tables: list[LoadTable] | None = None) -> Stations:
    """The stations of every member, from the loads of all cases (or of the given tables)."""
    return _of_all_cases(frame) if tables is None else _of(frame, tables)


@lru_cache(maxsize=8)  # a report asks for them once a case
def _of_all_cases(frame: Frame) -> Stations:
    # A combination with a lean of its own has loads that none of its cases has.
    return _of(frame, [load_table(frame, name) for name in frame.names if name in frame.cases or leans(frame, name)])


def _of(frame: Frame, tables: list[LoadTable]) -> Stations:
    t = frame.member_table
    count = len(t.length)
    every = np.arange(count)
    member = [np.repeat(every, 11), np.repeat(every, 2)]
    x = [(t.length[:, None] * TENTHS).ravel(), np.column_stack([t.zone[:, 0], t.length - t.zone[:, 1]]).ravel()]
    jump = [np.zeros(13 * count, dtype=bool)]
    for table in tables:
        member += [table.line_member, table.line_member, table.point_member]
        x += [table.line_start, table.line_end, table.point_at]
        jump += [np.zeros(2 * len(table.line_member), dtype=bool), np.ones(len(table.point_member), dtype=bool)]
    return _sorted(np.concatenate(member), np.concatenate(x), np.concatenate(jump), t.length)


def _sorted(member: Ints, x: Floats, jump: np.ndarray, length: Floats) -> Stations:
    """Sort, drop what stands at one place, and double what a jump parts. A place is a jump if any of its rows is."""
    order = np.lexsort((x, member))
    member, x, jump = member[order], x[order], jump[order]
    fresh = np.ones(len(x), dtype=bool)
    fresh[1:] = (member[1:] != member[:-1]) | (np.diff(x) > SNAP * length[member[1:]])
    place = np.cumsum(fresh) - 1
    jumps = np.zeros(int(fresh.sum()), dtype=bool)
    np.logical_or.at(jumps, place, jump)
    member, x = member[fresh], x[fresh]
    repeat = np.where(jumps, 2, 1)
    side = np.ones(int(repeat.sum()), dtype=np.int64)
    first = np.cumsum(repeat) - repeat
    side[first[jumps]] = -1
    member, x = np.repeat(member, repeat), np.repeat(x, repeat)
    # A value at the far end is the one just before it: nothing lies beyond.
    side[np.isclose(x, length[member], rtol=SNAP, atol=0) & ~np.repeat(jumps, repeat)] = -1
    start = np.searchsorted(member, np.arange(len(length) + 1))
    return Stations(member, x, side, start.astype(np.int64))
