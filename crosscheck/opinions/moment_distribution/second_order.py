"""The answer in second order: distribution on the displaced frame, repeated until the axial forces settle.

Each repetition takes the axial forces as known, distributes on the frame that they soften or stiffen, and finds the
axial forces that the displaced frame has. Where these go is foreseen from how the last few repetitions answered
(D. G. Anderson 1965). The first repetition takes those of first order. Where they change much from there the load is
brought on gradually instead (gradual.py), so that the answer is the balance that growing load leads to.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import partial

import numpy as np

from crosscheck.answer import Answer, CaseAnswer, Silent
from crosscheck.frame.kinematics import Study
from crosscheck.frame.loads import load_table
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
from crosscheck.opinions.moment_distribution.gradual import Answered, gradually
from crosscheck.opinions.moment_distribution.one_way import settled_process
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
MEMORY = 8
"""Repetitions that the next axial forces are foreseen from."""
APART = 0.1
"""Change of the axial forces from first order, as a share of them, up to which what settles is sure to be the balance that
growing load leads to."""
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


def opine_displaced(
    frame: Frame, study: Study, names: Sequence[str] | None, settle: Callable[[str], Settled] | None = None
) -> Answer | Silent:
    """Answer in second order for these load cases and combinations (None: all); see opinion.opine. `settle` settles a case
    where it is not to be settled on the frame as it is."""
    chosen = frame.names if names is None else tuple(names)
    try:
        settle = settle or _on_the_frame(frame, chosen)
    except (RuntimeError, np.linalg.LinAlgError):
        return Silent(NAME, "the frame's sways have no stiffness that holds them, so no holding forces exist")
    cases: dict[str, CaseAnswer] = {}
    bent: dict[str, Bent] = {}
    silent: dict[str, str] = {}
    for name in chosen:
        try:
            settled = settle(name)
        except NotSettled as why:
            silent[name] = str(why)
            continue
        cases[name] = _case_answer(settled, study)
        bent[name] = _bent(settled)
    return Answer(NAME, cases, study.undetermined, BentSpans(frame, bent, study.undetermined.axial), silent)


def _on_the_frame(frame: Frame, names: tuple[str, ...]) -> Callable[[str], Settled]:
    """What settles each of these cases."""
    first = distribute(frame, names)
    freedom = Freedom(first.held)
    return lambda name: settle_case(first, freedom, names.index(name))


def critical_load_factor(frame: Frame, name: str) -> float:
    """By how much the first-order axial forces of a case must grow, all in proportion, for the frame to lose its
    stability; infinite where it never does. One-way members and supports are as first order has them; NaN where it finds
    no settled state of them."""
    first = settled_process(frame, name)
    if isinstance(first, str):
        return np.nan
    return critical_factor(growing(Freedom(first.held), load_table(frame, name), first.state.axial[:, 0]))


def settle_case(first: Process, freedom: Freedom, column: int) -> Settled:
    """Repeat the distribution of one case until its axial forces settle; where they do not for the whole load at once, or
    change much, bring it on gradually.

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
        return _near(_repeat(whole, axial), axial)
    except NotSettled:
        return _gradually(whole)


@dataclass(frozen=True)
class Start:
    """A case under its first-order axial forces, in its first-order position."""

    grown: Growing
    position: Position


def _near(settled: Settled, first: Floats) -> Settled:
    """What settled, if its axial forces are not far from those of first order; else it may be another balance than the
    one that growing load leads to. Raises NotSettled."""
    rounding = NEARLY * max(_largest(settled.case.force), _largest(settled.position.push))
    if _largest(settled.axial - first) > APART * _largest(first) + rounding:
        raise NotSettled(NO_BALANCE)
    return settled


def _gradually(whole: Start) -> Settled:
    """The balance that growing load leads to. Raises NotSettled, saying beyond what share of it there is none."""
    size = _largest(whole.grown.axial) or 1.0
    most = gradually(partial(_answered, whole, size), whole.grown.axial / size)
    if not most.whole:
        raise NotSettled(GIVES_WAY.format(most.balance[-1]))
    return _repeat(whole, most.balance[:-1] * size)


def _answered(whole: Start, size: float, place: int, value: float) -> Answered:
    """What a frame answers: axial forces as shares of `size` and, last, the share of the load, of which `value` is kept at
    one place. The frame under axial forces taken as known answers in proportion to the load."""
    frame_at, position = _Frames(whole.grown), whole.position.scaled(1.0)
    case = acting(whole.grown.freedom.held, whole.grown.loads, whole.grown.pieces)

    def answered(taken: Floats) -> Floats | None:
        if not taken[-1] > 0.0:
            return None
        displaced = frame_at(taken[:-1] * size, float(taken[-1]))
        if not displaced.stable or displaced.settle(case, position)[1] > GIVEN_UP:
            return None
        by_load = np.append(displaced.axial(case, position) / size, 1.0)
        share = value / by_load[place] if by_load[place] else 0.0
        return share * by_load if share > 0.0 else None

    return answered


GIVES_WAY = (
    "past its critical load: as the frame gives way its axial forces change, and no stable balance was found beyond {:.4g} "
    "of the load"
)


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

    def __call__(self, axial: Floats, share: float = 1.0) -> Displaced:
        """Under axial forces (m,) at the `from` ends, which change along the members by `share` of the loads there."""
        m = self.grown.freedom.held.members
        parts, sheared = parts_needed(m, self.grown.pieces, axial / share, share)
        if self.division is None or np.any(parts * REACH > np.maximum(self.parts, 1) * AGAIN):
            self.parts = parts
            self.division = divide(m, self.grown.loads, parts)
        displaced = Displaced(self.grown.freedom, bow(m, self.division, Axial(axial, share)))
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
    reactions = settled.displaced.reactions(case, settled.position)
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
