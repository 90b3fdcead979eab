"""The answer in second order: distribution on the displaced frame, repeated until the axial forces settle.

Each repetition takes the axial forces as known, distributes on the frame that they soften or stiffen, and finds the
axial forces that the displaced frame has. Where these go is foreseen from how the last few repetitions answered
(D. G. Anderson 1965). The first repetition takes those of first order.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from crosscheck.answer import Answer, CaseAnswer, Silent
from crosscheck.frame.kinematics import Study
from crosscheck.frame.loads import LoadTable, load_table
from crosscheck.frame.model import Floats, Frame
from crosscheck.opinions.moment_distribution.bent_spans import Bent, BentSpans, bend
from crosscheck.opinions.moment_distribution.critical import Growing, critical_factor, growing
from crosscheck.opinions.moment_distribution.displaced import (
    Acting,
    Displaced,
    Freedom,
    Position,
    Round,
    acting,
)
from crosscheck.opinions.moment_distribution.process import GIVEN_UP, NAME, Process, distribute
from crosscheck.opinions.moment_distribution.stretches import AGAIN, REACH, Axial, Division, bow, divide, parts_needed

SETTLED = 1e-12
"""Change of axial force, as a share of the case's largest force, at which the repetitions end."""
NEARLY = 1e-9
"""Share at which they may end where they no longer help."""
MOST = 40
"""Repetitions."""
VAIN = 8
"""So many repetitions that bring the change no lower are given up."""
FIRST_STEP, LEAST_STEP = 0.25, 1 / 64
"""Shares of the load that are brought on at once."""
GROWING = (
    "joint", "settlement", "point_along", "point_across", "point_couple", "line_along", "line_across", "mean",
    "difference", "misfit",
)  # fmt: skip
"""Fields of a LoadTable that grow with the load."""
MEMORY = 8
"""Repetitions that the next axial forces are foreseen from."""
HALVINGS = 30
"""How often a step may be halved that leads to where the frame is not stable."""


@dataclass(frozen=True)
class Repetition:
    """Axial forces' change as a share of the largest force, and the passes of the distribution."""

    change: float
    rounds: list[Round]


@dataclass(frozen=True)
class Settled:
    """One case in balance on the displaced frame."""

    displaced: Displaced
    case: Acting
    position: Position
    axial: Floats
    trace: list[Repetition]


class NotSettled(Exception):
    """The case has no answer; the message says why."""


def opine_displaced(frame: Frame, study: Study, names: Sequence[str] | None) -> Answer | Silent:
    """Answer in second order for these load cases and combinations (None: all); see opinion.opine."""
    chosen = frame.names if names is None else tuple(names)
    try:
        first = distribute(frame, chosen)
    except (RuntimeError, np.linalg.LinAlgError):
        return Silent(NAME, "the frame's sways have no stiffness that holds them, so no holding forces exist")
    freedom = Freedom(first.held)
    cases: dict[str, CaseAnswer] = {}
    bent: dict[str, Bent] = {}
    silent: dict[str, str] = {}
    for column, name in enumerate(chosen):
        try:
            settled = settle_case(first, freedom, column)
        except NotSettled as why:
            silent[name] = str(why)
            continue
        cases[name] = _case_answer(settled, study)
        bent[name] = _bent(settled)
    return Answer(NAME, cases, study.undetermined, BentSpans(frame, bent, study.undetermined.axial), silent)


def critical_load_factor(frame: Frame, name: str) -> float:
    """By how much the first-order axial forces of a case must grow, all in proportion, for the frame to lose its
    stability; infinite where it never does."""
    first = distribute(frame, (name,))
    return critical_factor(growing(Freedom(first.held), load_table(frame, name), first.state.axial[:, 0]))


def settle_case(first: Process, freedom: Freedom, column: int) -> Settled:
    """Repeat the distribution of one case until its axial forces settle; where they do not for the whole load at once,
    bring it on by steps.

    Raises NotSettled past the critical load, and where nothing settles.
    """
    name, frame = first.names[column], first.held.frame
    if first.left[column] > GIVEN_UP:
        raise NotSettled(f"the first-order distribution did not settle: {first.left[column]:.1e} is left unbalanced")
    loads, axial = load_table(frame, name), first.state.axial[:, column].copy()
    grown = growing(freedom, loads, axial)
    if not grown.stable(1.0):
        raise NotSettled(f"past its critical load: the critical load factor is {critical_factor(grown):.4g}")
    position = Position(*(
        part[:, column]
        for part in (first.state.rotation, first.state.move, first.state.axial, first.state.push, first.state.twist)
    )).scaled(1.0)  # fmt: skip
    position.axial[first.held.members.rigid] = 0.0
    whole = Start(grown, position)
    try:
        return _repeat(whole, axial)
    except NotSettled:
        return _by_steps(whole)


@dataclass(frozen=True)
class Start:
    """A case under its first-order axial forces, in its first-order position."""

    grown: Growing
    position: Position

    def share(self, part: float) -> Start:
        """The same for a part of the load."""
        g = self.grown
        return Start(growing(g.freedom, part_of(g.loads, part), part * g.axial), self.position.scaled(part))


def part_of(loads: LoadTable, part: float) -> LoadTable:
    """The same loads, all times `part`."""
    return replace(loads, **{name: part * getattr(loads, name) for name in GROWING})


def _by_steps(whole: Start) -> Settled:
    """Bring the load on by steps, each starting from axial forces that the last two point to."""
    reached, step = 0.0, FIRST_STEP
    before, here = (0.0, 0.0 * whole.grown.axial), (0.0, 0.0 * whole.grown.axial)
    while True:
        part = min(1.0, reached + step)
        guess = part * whole.grown.axial
        if reached:
            guess = here[1] + (here[1] - before[1]) * ((part - here[0]) / (here[0] - before[0]))
        try:
            settled = _repeat(whole.share(part) if part < 1.0 else whole, guess)
        except NotSettled:
            step /= 2
            if step < LEAST_STEP:
                raise NotSettled(
                    "past its critical load: as the frame gives way its axial forces change, and no stable balance "
                    f"was found beyond {reached:.2g} of the load"
                ) from None
            continue
        if part == 1.0:
            return settled
        before, here, reached, step = here, (part, settled.axial), part, 1.5 * step


class Ahead:
    """Foresees where repetitions lead from the last few: the mixture of them that leaves the least change."""

    def __init__(self) -> None:
        self.taken: list[Floats] = []
        self.found: list[Floats] = []

    def next(self, taken: Floats, found: Floats) -> Floats:
        self.taken, self.found = [*self.taken[-MEMORY:], taken], [*self.found[-MEMORY:], found]
        change = np.array([f - t for t, f in zip(self.taken, self.found, strict=True)]).T
        if change.shape[1] == 1:
            return found
        steps = np.diff(change, axis=1)
        share = np.linalg.lstsq(steps, change[:, -1], rcond=1e-12)[0]
        return np.asarray(found - np.diff(np.array(self.found).T, axis=1) @ share)


def _repeat(start: Start, axial: Floats) -> Settled:
    """Repeat from these axial forces (m,) on. Raises NotSettled."""
    frame_at, position = _Frames(start.grown), start.position.scaled(1.0)
    case = acting(start.grown.freedom.held, start.grown.loads, start.grown.pieces)
    ahead, trace = Ahead(), []
    best, since = np.inf, 0
    displaced = frame_at(axial)
    if not displaced.stable:
        raise NotSettled(NO_BALANCE)
    for _ in range(MOST):
        rounds, left = displaced.settle(case, position)
        if left > GIVEN_UP:
            raise NotSettled(f"the distribution did not settle: {left:.1e} of the largest is left unbalanced")
        found = displaced.axial(case, position)
        size = max(_largest(found), _largest(case.force), _largest(position.push)) or 1.0
        change = _largest(found - axial) / size
        trace.append(Repetition(change, rounds))
        since = 0 if change < 0.5 * best else since + 1
        best = min(best, change)
        if change <= SETTLED or (change <= NEARLY and since > 3):
            return Settled(displaced, case, position, found, trace)
        if since > VAIN:
            break
        wanted = ahead.next(axial, found)
        for _ in range(HALVINGS):
            displaced = frame_at(wanted)
            if displaced.stable:
                break
            wanted = (wanted + axial) / 2
        else:
            raise NotSettled(NO_BALANCE)
        axial = wanted
    raise NotSettled(NO_BALANCE)


NO_BALANCE = "no stable balance was found on the displaced frame"


class _Frames:
    """The frame under changing axial forces, cut afresh only when they have grown."""

    def __init__(self, grown: Growing) -> None:
        self.grown = grown
        self.division: Division | None = None
        self.parts = np.zeros(0, dtype=np.int64)

    def __call__(self, axial: Floats) -> Displaced:
        m = self.grown.freedom.held.members
        parts, sheared = parts_needed(m, self.grown.pieces, axial)
        if self.division is None or np.any(parts * REACH > np.maximum(self.parts, 1) * AGAIN):
            self.parts = parts
            self.division = divide(m, self.grown.loads, parts)
        displaced = Displaced(self.grown.freedom, bow(m, self.division, Axial(axial)))
        if sheared:
            displaced.bowed.buckled[:] += 1
        return displaced


def _case_answer(settled: Settled, study: Study) -> CaseAnswer:
    held, case, undetermined = settled.displaced.held, settled.case, study.undetermined
    length = held.members.table.length
    moments = settled.displaced.moments(settled.position)
    ends = np.empty((len(length), 2, 3))
    ends[:, 0, 0] = settled.axial
    ends[:, 1, 0] = settled.axial - case.along
    ends[:, 0, 1] = moments[:, 2] / length
    ends[:, 1, 1] = -ends[:, 0, 1] - case.across
    ends[:, :, 2] = moments[:, :2]
    ends[undetermined.axial, :, 0] = np.nan
    move = held.sways.global_axes(settled.position.move[:, None])[:, :, 0]
    joints = np.column_stack([move, settled.position.rotation])
    joints[undetermined.joints] = np.nan
    reactions = settled.displaced.reactions(case, settled.position, settled.axial)
    reactions[undetermined.reactions] = np.nan
    return CaseAnswer(ends, joints, reactions)


def _bent(settled: Settled) -> Bent:
    held, t = settled.displaced.held, settled.displaced.held.members.table
    move = held.sways.global_axes(settled.position.move[:, None])[:, :, 0][t.ends]
    offset = move[:, :, 1] * t.cos[:, None] - move[:, :, 0] * t.sin[:, None]
    ends = settled.displaced.moments(settled.position)
    ends[:, 2] /= t.length
    return bend(held.members, settled.displaced.bowed, settled.displaced.movements(settled.position), offset, ends)


def _largest(values: Floats) -> float:
    return float(np.abs(values).max(initial=0.0))
