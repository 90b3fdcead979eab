"""Envelopes: the extremes of several cases and combinations at each place, with the one that governs there.

An envelope is no state of balance: its values at different places, and different quantities at one place, come from
different combinations. Nothing here adds or balances them.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from crosscheck.answer import Answer
from crosscheck.compare.opinions import with_turning_points
from crosscheck.frame.model import Floats, Frame, Ints
from crosscheck.frame.stations import Stations, stations

NOBODY = -1
"""Index of the governing case where no case has a value."""


@dataclass(frozen=True, slots=True)
class Extremes:
    """Greatest and least values of one table, any shape, NaN where no case has one; *_by: index of the case that
    governs in the envelope's names, the first of equals, NOBODY where there is none."""

    greatest: Floats
    greatest_by: Ints
    least: Floats
    least_by: Ints


@dataclass(frozen=True, slots=True)
class EnvelopeAnswer:
    """One opinion's envelope over `names`; ends (m, 2, 3), joints and reactions (j, 3) as in a CaseAnswer.

    lacking: names of the envelope for which the opinion does not speak: the extremes are then of the others only.
    """

    name: str
    names: tuple[str, ...]
    lacking: tuple[str, ...]
    ends: Extremes
    joints: Extremes
    reactions: Extremes


@dataclass(frozen=True, slots=True)
class EnvelopeSpans:
    """Extremes (n, 4) of axial, shear, moment, across at the stations `at` and every case's own turning points."""

    at: Stations
    values: Extremes


def extremes_of(stack: Floats) -> Extremes:
    """Extremes over the first axis (cases) of a stack of tables, NaN left out."""
    known = np.isfinite(stack)
    none = ~known.any(axis=0)
    high = np.where(known, stack, -np.inf).argmax(axis=0)
    low = np.where(known, stack, np.inf).argmin(axis=0)
    greatest = np.take_along_axis(stack, high[None], axis=0)[0]
    least = np.take_along_axis(stack, low[None], axis=0)[0]
    return Extremes(
        np.where(none, np.nan, greatest), np.where(none, NOBODY, high), np.where(none, np.nan, least),
        np.where(none, NOBODY, low),
    )  # fmt: skip


def envelope(frame: Frame, answer: Answer, name: str) -> EnvelopeAnswer | None:
    """The opinion's envelope of that name (an envelope's, or a combination's that became several); None where it speaks
    for none of its cases."""
    wanted = frame.meant(name)
    spoken = tuple(n for n in wanted if n in answer.cases)
    if not spoken:
        return None
    cases = [answer.cases[n] for n in spoken]
    return EnvelopeAnswer(
        name, spoken, tuple(n for n in wanted if n not in answer.cases),
        extremes_of(np.stack([c.ends for c in cases])),
        extremes_of(np.stack([c.joints for c in cases])),
        extremes_of(np.stack([c.reactions for c in cases])),
    )  # fmt: skip


def envelope_spans(frame: Frame, answer: Answer, names: Sequence[str]) -> EnvelopeSpans:
    """Extremes along the members over `names`, for all of which the opinion speaks.

    At each place the greatest over the cases; every case's own turning points are among the places, so that the
    extreme of a member along its length is among them too.
    """
    at = stations(frame)
    member, x, side = at.member, at.x, at.side
    for name in names if not answer.spans.sampled else ():
        more_member, more_x, more_side = with_turning_points(answer, name, at)
        member, x = np.concatenate([member, more_member]), np.concatenate([x, more_x])
        side = np.concatenate([side, more_side])
    rows = np.unique(np.column_stack([member.astype(float), x, side.astype(float)]), axis=0)
    member, x, side = rows[:, 0].astype(np.int64), rows[:, 1], rows[:, 2].astype(np.int64)
    start = np.searchsorted(member, np.arange(len(frame.members) + 1)).astype(np.int64)
    values = np.stack([answer.spans.along(name, member, x, side) for name in names])
    return EnvelopeSpans(Stations(member, x, side, start), extremes_of(values))
