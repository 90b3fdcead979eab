"""Parts that work one way only: which of them a claim has at work, and whether it may.

A one-way member at work has a force of its own stretch in its one sense; at rest it has none, and is as long as its ends
leave it, on the slack side. A one-way support pushes (or pulls), or has let go and moved away. Forces that balance, go
with deformations that fit, and obey both rules are the frame's own and no others are: of two such sets of forces the
difference does work that can be neither negative nor positive (A. Signorini's problem, G. Fichera 1964, from memory).
So the claim's own forces say what is at work, and the frame without the rest is judged like any other.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from crosscheck.audit.completion import Completed
from crosscheck.audit.equilibrium import end_index, reaction_index
from crosscheck.audit.flexibility import flexibility
from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import Frame, Support

SENSES = {"tension": 1.0, "compression": -1.0, "push": 1.0, "pull": -1.0}


@dataclass(frozen=True, slots=True)
class Part:
    """One one-way member (axis "") or direction of a support.

    force: of the member's own stretch (tension positive), or of the reaction along the support's own axis, as claimed; NaN
    where it is not known. allowed: what rounding can make of nothing. sense: the sign that the force may have.
    """

    where: str
    axis: str
    word: str
    force: float
    allowed: float

    @property
    def sense(self) -> float:
        return SENSES[self.word]

    @property
    def wrong(self) -> bool:
        """Works the other way, beyond rounding."""
        return self.sense * self.force < -self.allowed

    @property
    def out(self) -> bool:
        """Does not work, or not so that it shows."""
        return abs(self.force) <= self.allowed

    @property
    def says(self) -> str:
        """Of a part that works the wrong way."""
        if self.axis:
            other = "pull" if self.word == "push" else "push"
            return f"the support at {self.where} can only {self.word} and is claimed to {other}"
        other = "compression" if self.word == "tension" else "tension"
        return f"{self.where} works in {self.word} only and is claimed in {other}"


def parts(frame: Frame, loads: LoadTable, done: Completed, floor: float) -> list[Part]:
    """Every one-way part with its claimed force; floor: round-off of a force."""
    found = []
    if any(member.only for member in frame.members.values()):
        held = flexibility(frame, loads).held_axial
        for k, member in enumerate(frame.members.values()):
            if member.only:
                at = int(end_index(k, 0, 0))
                force = float(done.value[at] - held[k])
                found.append(Part(member.name, "", member.only, force, float(done.half_width[at]) + floor))
    m, s = len(frame.members), frame.support_table
    for support, axis, word in one_way_directions(frame):
        j = frame.joint_index[support.joint]
        share = np.array([s.cos[j], s.sin[j]] if axis == "x" else [-s.sin[j], s.cos[j]])
        at_both = np.array([int(reaction_index(m, j, c)) for c in (0, 1)])
        used = share != 0
        force = float(share[used] @ done.value[at_both[used]])
        found.append(Part(support.joint, axis, word, force, float(np.abs(share) @ done.half_width[at_both]) + floor))
    return found


def one_way_directions(frame: Frame) -> Iterator[tuple[Support, str, str]]:
    """Support, axis and word of every direction that works one way."""
    for support in frame.supports.values():
        for axis, word in (("x", support.x_only), ("y", support.y_only)):
            if word:
                yield support, axis, word


def at_work(frame: Frame, found: Sequence[Part]) -> Frame:
    """The frame without the parts that do not work by the claim; the frame itself where all do."""
    out = [part for part in found if part.out]
    if not out:
        return frame
    return replace(
        frame,
        out_members=frozenset(part.where for part in out if not part.axis),
        out_supports=frozenset((part.where, part.axis) for part in out if part.axis),
    )
