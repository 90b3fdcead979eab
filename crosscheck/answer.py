"""What anybody says about a frame: end actions, reactions, displacements and values along the members.

An opinion returns an `Answer`, or `Silent` with its reason. Arrays follow the frame's member and joint order and its
units and signs (README, Axes and signs). NaN stands for what the idealisation leaves undetermined or what this opinion
cannot give, and for nothing else: `Answer.undetermined` says which values may be NaN.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Protocol

import numpy as np

from crosscheck.frame.model import Bools, Floats, Ints

AXIAL, SHEAR, MOMENT, ACROSS = range(4)
"""Columns of values along a member; the first three are also the columns of end actions."""


@dataclass(frozen=True, slots=True)
class CaseAnswer:
    """One load case or combination.

    ends: (m, 2, 3) axial (tension positive), shear (along local +y, acting on the member) and moment (clockwise,
      acting on the member) at the `from` and `to` end, at the joint.
    joints: (j, 3) dx, dy (global), rotation (clockwise, radians).
    reactions: (j, 3) fx, fy, moment (clockwise) on the frame, global axes; zero where there is no support.
    """

    ends: Floats
    joints: Floats
    reactions: Floats


@dataclass(frozen=True, slots=True)
class Undetermined:
    """What the idealisation leaves undetermined, whatever the load: True where it does.

    axial: (m,); joints: (j, 3); reactions: (j, 3) in global axes.
    """

    axial: Bools
    joints: Bools
    reactions: Bools


class Spans(Protocol):
    """Values along the members, worked out when asked for.

    sampled: True where the values are exact at the stations only, so that no extreme between them may be claimed.
    """

    @property
    def sampled(self) -> bool: ...

    def along(self, name: str, member: Ints, x: Floats, side: Ints) -> Floats:
        """(n, 4) axial, shear, moment, across (README, Axes and signs) at distance x of each member, just before
        (side -1) or just after (+1) it; NaN where undetermined or not given."""
        ...

    def turning_points(self, name: str) -> tuple[Ints, Floats]:
        """Member index and distance of every inner place where moment, shear or across may have an extreme."""
        ...


@dataclass(frozen=True, slots=True)
class Answer:
    """A given opinion. `cases` by load case and combination name; `silent`: cases it could not speak for, and why.

    adrift: by case, (j, 3) displacements that one-way parts at rest leave open in that case: NaN there.
    """

    opinion: str
    cases: Mapping[str, CaseAnswer]
    undetermined: Undetermined
    spans: Spans
    silent: Mapping[str, str] = field(default_factory=dict)
    notes: tuple[str, ...] = ()
    adrift: Mapping[str, Bools] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Silent:
    """An opinion that abstains, and why, in one sentence."""

    opinion: str
    why: str


@dataclass(frozen=True, slots=True)
class _SpansByName:
    """Spans of several answers, each asked for the cases that are its own."""

    by_name: Mapping[str, Spans]

    @property
    def sampled(self) -> bool:
        return any(spans.sampled for spans in self.by_name.values())

    def along(self, name: str, member: Ints, x: Floats, side: Ints) -> Floats:
        return self.by_name[name].along(name, member, x, side)

    def turning_points(self, name: str) -> tuple[Ints, Floats]:
        return self.by_name[name].turning_points(name)


@dataclass(frozen=True, slots=True)
class _SpansAdrift:
    """Spans of an answer, without the displacements of members one of whose ends is adrift."""

    spans: Spans
    members: Mapping[str, Bools]

    @property
    def sampled(self) -> bool:
        return self.spans.sampled

    def along(self, name: str, member: Ints, x: Floats, side: Ints) -> Floats:
        values = self.spans.along(name, member, x, side)
        if name in self.members:
            values = np.where(self.members[name][member][:, None] & (np.arange(4) == ACROSS), np.nan, values)
        return values

    def turning_points(self, name: str) -> tuple[Ints, Floats]:
        return self.spans.turning_points(name)


def without_adrift(answer: Answer, ends: Ints, adrift: Mapping[str, Bools]) -> Answer:
    """The answer with null for displacements that are adrift (by case, (j, 3)). ends: (m, 2) joints of the members."""
    adrift = {name: open_ones for name, open_ones in adrift.items() if open_ones.any()}
    if not adrift:
        return answer
    cases = dict(answer.cases)
    for name, open_ones in adrift.items():
        cases[name] = replace(cases[name], joints=np.where(open_ones, np.nan, cases[name].joints))
    members = {name: np.asarray(open_ones[ends].any(axis=(1, 2))) for name, open_ones in adrift.items()}
    return replace(answer, cases=cases, spans=_SpansAdrift(answer.spans, members), adrift=adrift)


def joined(parts: Sequence[tuple[tuple[str, ...], Answer | Silent]]) -> Answer | Silent:
    """One answer from those to the same frame in several situations, each for its own names; an opinion that abstains
    in one of them is silent on its names, and Silent where it abstains in all."""
    given = [said for _, said in parts if isinstance(said, Answer)]
    if len(parts) == 1 or not given:
        return parts[0][1]
    silent: dict[str, str] = {}
    for names, said in parts:
        silent |= dict.fromkeys(names, said.why) if isinstance(said, Silent) else said.silent
    return Answer(
        given[0].opinion,
        {name: case for said in given for name, case in said.cases.items()},
        given[0].undetermined,
        _SpansByName({name: said.spans for said in given for name in said.cases}),
        silent,
        tuple(dict.fromkeys(note for said in given for note in said.notes)),
        {name: open_ones for said in given for name, open_ones in said.adrift.items()},
    )


@dataclass(frozen=True, slots=True)
class WorkTable:
    """A table of working to follow by hand: a heading, column heads, rows of text or numbers, remarks."""

    heading: str
    columns: tuple[str, ...]
    rows: tuple[tuple[str | float | None, ...], ...]
    remarks: tuple[str, ...] = ()


def blank_case(members: int, joints: int) -> CaseAnswer:
    """A case answer of zeros to fill in."""
    return CaseAnswer(np.zeros((members, 2, 3)), np.zeros((joints, 3)), np.zeros((joints, 3)))
