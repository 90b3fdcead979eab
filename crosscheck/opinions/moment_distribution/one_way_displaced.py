"""Second order of frames with one-way members and supports: their settled state on the displaced frame.

The search of one_way.py, from the settled state of first order on. A state in which a case is past its critical load has no
balance; there first order says which parts work the wrong way (a thin brace in compression buckles before it can be seen
to be slack).
"""

from __future__ import annotations

import numpy as np

from crosscheck.frame.model import Frame
from crosscheck.opinions.moment_distribution.displaced import Freedom
from crosscheck.opinions.moment_distribution.one_way import (
    STIFF,
    FirstOrder,
    Judged,
    Out,
    force_size,
    movement_size,
    search,
    what_is_wrong,
)
from crosscheck.opinions.moment_distribution.process import GIVEN_UP, Process, distribute
from crosscheck.opinions.moment_distribution.second_order import NotSettled, Settled, settle_case

FEW = 4
"""Up to so many parts are tried in every way: states on the displaced frame are dear."""


class SecondOrder:
    """Finds the settled states of a frame's cases in second order."""

    def __init__(self, frame: Frame) -> None:
        self.first = FirstOrder(frame)
        self.freedom: dict[Out, Freedom] = {}

    def settled(self, name: str) -> Settled:
        """The case in its settled state. Raises NotSettled where there is none."""
        parts = self.first.parts
        flat = self.first.settled(name)
        if flat.found is None or not flat.settled:
            raise NotSettled(parts.unsettled(flat.wrong))
        start = parts.out_of(flat.found.held.frame)
        why: dict[Out, str] = {}
        judged = search(parts, lambda out: self._judge(out, name, why), start, FEW)
        if judged.found is not None and judged.settled:
            return judged.found
        raise NotSettled(why.get(start) or parts.unsettled(judged.wrong))

    def _judge(self, out: Out, name: str, why: dict[Out, str]) -> Judged[Settled]:
        held, loose = self.first.at(out)
        if loose is not None:
            return Judged(self.first.put_back(out, held, loose, name), None)
        process = distribute(held.frame, (name,), held)
        if process.left[0] > GIVEN_UP:
            return Judged(tuple(sorted(out)), None)
        if out not in self.freedom:
            self.freedom[out] = Freedom(held)
        try:
            settled = settle_case(process, self.freedom[out], 0)
        except NotSettled as reason:
            why[out] = str(reason)
            return Judged(self.first.wrong(out, process), None)
        return Judged(self._wrong(out, process, settled), settled)

    def _wrong(self, out: Out, process: Process, settled: Settled) -> tuple[int, ...]:
        """As in first order, by the forces and movements of the displaced frame."""
        parts, held, end = self.first.parts, process.held, process.ends[0]
        reaction = settled.displaced.own_reactions(settled.case, settled.position)
        stretched = settled.axial + held.members.held * end.by_loads
        force = parts.sense * np.concatenate([stretched[parts.member], reaction[parts.place]])
        move = settled.position.move
        sizes = (
            max(force_size(process), float(np.abs(settled.axial).max(initial=0.0))), movement_size(process.given, move)
        )  # fmt: skip
        stiff = np.concatenate([held.members.held[parts.member], np.full(len(parts.place), STIFF)])
        return what_is_wrong(out, force, self.first.closing(held, process.given, move, end.free), sizes, stiff)
