"""What the claim says, what the model says at the same places, and how far apart they are in two measures.

`allowed` is the comparison's tolerance; `explains` is counted in it. `noise` is the printed rounding, which tells one
suspect from another: a change that leaves no value further off than its half digit fits to the printed precision.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from crosscheck.answer import Answer
from crosscheck.compare.claim import END_COLUMN, JOINT_COLUMN, REACTION_COLUMN, ZERO
from crosscheck.compare.claimed import ClaimedValue
from crosscheck.compare.opinions import extremes
from crosscheck.compare.tolerance import LEAST_SHARE, Scales, Tolerance, allowed
from crosscheck.frame.model import Bools, Floats, Frame, Ints
from crosscheck.frame.stations import Stations, stations
from crosscheck.opinions.slope_deflection.prepared import DISPLACEMENT, END, REACTION, SPAN, Places

EXTREME = 4
KINDS = {"end": END, "span": SPAN, "reaction": REACTION, "displacement": DISPLACEMENT, "extreme": EXTREME}
WORKING = 0.01
"""Share of the tolerance below which differences are no evidence even where more digits are printed."""
ARITHMETIC = 1e-4
"""Share of the tolerance that arithmetic alone may leave over in a value printed to many digits."""
SPARE = 1.05
"""Of half a digit, before a value counts as not met: programs round halves either way."""


@dataclass(frozen=True, eq=False)
class Observation:
    """The compared values (n,) of a claim.

    value: claimed; said: the model's; half: half a printed digit; allowed: the tolerance. case: index into `names`.
    linear: answers to unit actions give the value (all but extremes and displacements along a member).
    """

    frame: Frame
    names: tuple[str, ...]
    values: tuple[ClaimedValue, ...]
    case: Ints
    places: Places
    extreme: Ints
    value: Floats
    said: Floats
    half: Floats
    allowed: Floats
    at: Stations

    @property
    def linear(self) -> Bools:
        p = self.places
        return np.asarray((p.kind != EXTREME) & ~((p.kind == SPAN) & (p.column == 3)))

    @property
    def noise(self) -> Floats:
        """(n,) the measure that suspects are fitted in."""
        return np.maximum(self.half, WORKING * self.allowed)

    @property
    def meets(self) -> Floats:
        """(n,) how far off a value may be and still be met to its printed precision."""
        return np.asarray(SPARE * self.half + ARITHMETIC * self.allowed)

    @property
    def residual(self) -> Floats:
        return self.value - self.said

    @cached_property
    def off(self) -> Bools:
        """(n,) which values are further off than allowed."""
        return np.asarray(np.abs(self.residual) > self.allowed)

    def read(self, answer: Answer, names: tuple[str, ...] | None = None, rows: Ints | None = None) -> Floats:
        """(n,) the values of another answer at the same places; `names` stand for the claim's cases, in their order.

        rows: the only ones wanted; the rest is NaN.
        """
        out = np.full(len(self.value), np.nan)
        wanted = np.arange(len(self.value)) if rows is None else rows
        for k, name in enumerate(self.names if names is None else names):
            mine = wanted[self.case[wanted] == k]
            if name in answer.cases and len(mine):
                out[mine] = _read(self, answer, name, mine)
        return out

    def part(self, rows: Ints) -> Places:
        """The places of some rows."""
        return self.places.part(rows)


def observe(
    frame: Frame, answer: Answer, names: tuple[str, ...], values: Iterable[ClaimedValue], tolerance: Tolerance,
    scales: Mapping[str, Scales],
) -> Observation:  # fmt: skip
    """The values that can be compared, with the model's `answer` at their places. scales: of the comparison, by case."""
    kept = [v for v in values if v.case in names and v.case in answer.cases]
    column = [_column(v) for v in kept]
    ends = [_end(frame, v) for v in kept]
    places = Places(
        kind=np.array([KINDS[v.kind] for v in kept], dtype=np.int64),
        column=np.array(column, dtype=np.int64),
        member=np.array([frame.member_index.get(str(v.member), -1) for v in kept], dtype=np.int64),
        end=np.array(ends, dtype=np.int64),
        joint=np.array([frame.joint_index.get(str(v.joint), -1) for v in kept], dtype=np.int64),
        x=np.array([v.at if v.kind == "span" and v.at is not None else 0.0 for v in kept], dtype=float),
        side=np.full(len(kept), 1, dtype=np.int64),
    )
    case = np.array([names.index(v.case) for v in kept], dtype=np.int64)
    extreme = np.array([{"max": 1, "min": -1, "size": 2}.get(v.extreme or "", 0) for v in kept], dtype=np.int64)
    value = np.array([v.value for v in kept], dtype=float)
    value = np.where(extreme == 2, np.abs(value), value)
    half = np.array([v.half_digit for v in kept], dtype=float)
    nil = np.zeros(len(kept))
    seen = Observation(frame, names, tuple(kept), case, places, extreme, value, nil, half, nil, stations(frame))
    _choose_sides(seen, answer)
    said = seen.read(answer)
    tolerated = _allowed(seen, answer, said, tolerance, scales)
    good = np.flatnonzero(np.isfinite(said) & np.isfinite(value) & (tolerated > 0))
    return Observation(
        frame, names, tuple(kept[k] for k in good), case[good], seen.part(good), extreme[good], value[good], said[good],
        half[good], tolerated[good], seen.at,
    )  # fmt: skip


def _column(v: ClaimedValue) -> int:
    if v.kind == "reaction" or (v.kind == "extreme" and v.quantity in ("fx", "fy")):
        return REACTION_COLUMN[v.quantity]
    if v.quantity in JOINT_COLUMN:
        return JOINT_COLUMN[v.quantity]
    return END_COLUMN[v.quantity]


def _end(frame: Frame, v: ClaimedValue) -> int:
    if v.kind != "end" or v.member not in frame.members:
        return -1
    return 0 if frame.members[v.member].joint_from == v.joint else 1


def _choose_sides(seen: Observation, answer: Answer) -> None:
    """At a jump the claim means the side that it is nearer to."""
    p = seen.places
    for k, name in enumerate(seen.names):
        rows = np.flatnonzero((p.kind == SPAN) & (seen.case == k))
        if name not in answer.cases or not len(rows):
            continue
        before, after = (_along(answer, name, p, rows, side) for side in (-1, 1))
        nearer = np.abs(before - seen.value[rows]) < np.abs(after - seen.value[rows])
        last = p.x[rows] >= seen.frame.member_table.length[p.member[rows]] * (1 - 1e-9)
        p.side[rows[nearer | last]] = -1


def _along(answer: Answer, name: str, p: Places, rows: Ints, side: int) -> Floats:
    values = answer.spans.along(name, p.member[rows], p.x[rows], np.full(len(rows), side, dtype=np.int64))
    return np.asarray(values[np.arange(len(rows)), p.column[rows]])


def _read(seen: Observation, answer: Answer, name: str, rows: Ints) -> Floats:
    p, c = seen.places, answer.cases[name]
    out = np.full(len(rows), np.nan)
    kind = p.kind[rows]
    at = rows[kind == END]
    out[kind == END] = c.ends[p.member[at], p.end[at], p.column[at]]
    at = rows[kind == REACTION]
    out[kind == REACTION] = c.reactions[p.joint[at], p.column[at]]
    at = rows[kind == DISPLACEMENT]
    out[kind == DISPLACEMENT] = c.joints[p.joint[at], p.column[at]]
    at = rows[kind == SPAN]
    if len(at):
        values = answer.spans.along(name, p.member[at], p.x[at], p.side[at])
        out[kind == SPAN] = values[np.arange(len(at)), p.column[at]]
    at = rows[kind == EXTREME]
    if len(at):
        most = extremes(answer, name, seen.at)
        out[kind == EXTREME] = [_extreme(seen, c.joints, c.reactions, most, int(k)) for k in at]
    return out


def _extreme(seen: Observation, joints: Floats, reactions: Floats, most: Floats, k: int) -> float:
    p, v = seen.places, seen.values[k]
    if v.quantity in JOINT_COLUMN or v.quantity in ("fx", "fy"):
        table = joints if v.quantity in JOINT_COLUMN else reactions
        values = table[:, p.column[k]] if v.joint is None else table[[p.joint[k]], p.column[k]]
    else:
        values = (most[:, :, p.column[k]] if v.member is None else most[p.member[k], :, p.column[k]]).ravel()
    values = values[np.isfinite(values)]
    if not len(values):
        return float("nan")
    if seen.extreme[k] == 2:
        return float(np.abs(values).max())
    return float(values.max() if seen.extreme[k] > 0 else values.min())


def _allowed(seen: Observation, answer: Answer, said: Floats, tolerance: Tolerance, scales: Mapping[str, Scales]) -> Floats:
    """(n,) the comparison's allowed difference: its scales, with each member's largest values taken at its stations."""
    out = np.zeros(len(said))
    quantity = np.array([v.quantity for v in seen.values])
    bare = np.array([v.kind == "reaction" and v.joint not in seen.frame.supports for v in seen.values], dtype=bool)
    for k, name in enumerate(seen.names):
        rows = np.flatnonzero(seen.case == k)
        if name not in answer.cases or not len(rows):
            continue
        case = np.array([scales[name].of(q) for q in quantity[rows]])
        scale = np.maximum(_own(seen, answer, name, rows), LEAST_SHARE * case)
        may = allowed(said[rows], seen.value[rows], tolerance, scale, seen.half[rows])
        out[rows] = np.where(bare[rows], np.maximum(seen.half[rows], ZERO * case), may)
    return out


def _own(seen: Observation, answer: Answer, name: str, rows: Ints) -> Floats:
    """(n,) the largest value of its quantity that each value's own member or joint has."""
    c, at, p = answer.cases[name], seen.at, seen.places
    along = np.abs(np.nan_to_num(answer.spans.along(name, at.member, at.x, at.side)))
    most = np.maximum.reduceat(along, at.start[:-1]) if len(at.member) else np.zeros((0, 4))
    most[:, :3] = np.maximum(most[:, :3], np.abs(np.nan_to_num(c.ends)).max(axis=1, initial=0.0))
    kind, column = p.kind[rows], p.column[rows]
    named = np.array([seen.values[k].quantity for k in rows])
    out = np.zeros(len(rows))
    moves = np.isin(named, list(JOINT_COLUMN)) | (kind == DISPLACEMENT)
    on = (p.member[rows] >= 0) & (kind != REACTION) & ~moves
    out[on] = most[p.member[rows[on]], column[on]]
    for table, mine in ((c.joints, moves), (c.reactions, ~moves & ~on)):
        size = np.abs(np.nan_to_num(table))
        largest = np.column_stack([size[:, :2].max(axis=1)] * 2 + [size[:, 2]])
        mine = mine & (p.joint[rows] >= 0)
        out[mine] = largest[p.joint[rows[mine]], column[mine]]
    return out
