"""The load brought on gradually: the balances of a case from no load on, one after another.

As a frame gives way its axial forces change, and the load that goes with them may have a greatest value. Steps of load
find no way round it; so each step is one of whatever changes fastest there, the load or the axial force of a member,
and the rest is found that goes with it (W. C. Rheinboldt and J. V. Burkardt, "A locally parameterized continuation
process", ACM Trans. Math. Software 9 (1983), 215-235; from memory). The greatest load is where a parabola through three
such balances has its vertex, taken afresh until it stays.

A balance is a vector: the members' axial forces as shares of the largest in first order, then the share of the load.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from crosscheck.frame.model import Floats

LOAD = -1
"""Place of the share of the load."""
FIRST, LONGEST, SHORTEST = 0.125, 0.25, 1e-7
"""Steps of what changes fastest."""
STEPS = 300
CLOSE = 1e-7
"""Share of the load to which the greatest is found."""
TRIES = 20
"""Balances taken for the vertex."""
ROUNDS = 8
FEW = 4
"""Rounds up to which steps may grow."""
ENOUGH = 1e-9
"""Change at which values count as unchanged."""
WIDE = 0.3
"""Share of a step by which a balance may lie apart from where the step leads."""
CLOSE_BY = 0.01
"""So near it may lie in any case: the way may bend sharply."""
BESIDE = 1e-6
"""Share of a step by which a balance between two may lie outside."""
BACK = 0.02
"""Share of a step by which a look back tells whether the load was growing."""
SMALL = 1e-6
"""Change by which it is tried out how answers change."""
LEAVE = 1e-3
"""Share of a change that a correction may leave."""
DIRECTIONS = 60

Answered = Callable[[Floats], Floats | None]
"""The balance that comes of the axial forces and the share of a vector; None where the frame is not stable under them."""
Prescribed = Callable[[int, float], Answered]
"""The same if the value of one of its places is kept."""


@dataclass(frozen=True)
class Greatest:
    """A balance with as much of the load as there can be, and whether it is the whole."""

    balance: Floats
    whole: bool


def gradually(prescribed: Prescribed, first: Floats) -> Greatest:
    """The balance under the whole load that growing load leads to; or that with the greatest load before it falls or a
    member buckles.

    first: (m,) first-order axial forces as shares of the largest.
    """
    before, here, grows = np.zeros(len(first) + 1), np.zeros(len(first) + 1), True
    way, step = np.append(first, 1.0), FIRST
    for _ in range(STEPS):
        place = LOAD if abs(way[LOAD]) >= _largest(way) else int(np.argmax(np.abs(way)))
        onward = way * (step / abs(way[place]))
        answer = unchanged(prescribed(place, (here + onward)[place]), here + onward, max(WIDE * step, CLOSE_BY))
        if answer is None:
            step, grows = step / 2, False
            if step < SHORTEST:
                break
            continue
        ahead, rounds = answer
        falls = ahead[-1] < min(here[-1], 1.0)
        top = _vertex(prescribed, place, [before, here, ahead]) if falls else ahead
        if top[-1] >= 1.0:
            # The greatest load may lie behind the last balance already: then that one is beyond it.
            passed = falls and (top - here)[place] * (here - before)[place] < 0.0
            whole = _whole(prescribed, place, before if passed else here, top, falls)
            if whole is not None:
                return Greatest(whole, True)
            step, grows = step / 2, False
            continue
        if falls:
            return Greatest(top, False)
        step = min(LONGEST, 1.5 * step) if grows and rounds <= FEW else step
        before, here, grows = here, ahead, True
        way = here - before
    return Greatest(here, False)


def _whole(prescribed: Prescribed, place: int, here: Floats, top: Floats, falls: bool) -> Floats | None:
    """The balance under the whole load between two with less and more; None where none is found there. Towards the greatest
    load (`falls`) the load grows as a parabola does."""
    part = (1.0 - here[LOAD]) / (top[LOAD] - here[LOAD])
    part = 1.0 - float(np.sqrt(1.0 - part)) if falls else part
    answer = unchanged(prescribed(LOAD, 1.0), here + part * (top - here))
    if answer is None:
        return None
    whole = answer[0]
    reached = (whole - here)[place] / (top - here)[place]
    return whole if -BESIDE <= reached <= 1.0 + BESIDE and _rises(prescribed, here, whole) else None


def _rises(prescribed: Prescribed, here: Floats, whole: Floats) -> bool:
    """Whether the load still grows on the way to a balance under the whole of it: a step may have gone past the greatest
    load, and what lies beyond that is not what growing load leads to."""
    way = whole - here
    place = int(np.argmax(np.abs(way[:LOAD])))
    back = whole - BACK * way
    answer = unchanged(prescribed(place, float(back[place])), back)
    return answer is not None and answer[0][LOAD] < 1.0


def _vertex(prescribed: Prescribed, place: int, three: list[Floats]) -> Floats:
    """The balance with the greatest load between the outer two of three, of which the middle one has most."""
    for _ in range(TRIES):
        x, share = np.array([b[place] for b in three]), np.array([b[-1] for b in three])
        slope = np.diff(share) / np.diff(x)
        bend = (slope[1] - slope[0]) / (x[2] - x[0])
        at = (x[0] + x[1]) / 2 - slope[0] / (2 * bend)
        if -bend * (at - x[1]) ** 2 < CLOSE and np.abs(share[1] - share[[0, 2]]).min() < 1e4 * CLOSE:
            break
        wide = 0 if abs(x[1] - x[0]) > abs(x[2] - x[1]) else 2
        if abs(at - x[1]) < 0.02 * abs(x[wide] - x[1]):
            at = x[1] + 0.1 * (x[wide] - x[1])
        side = 0 if (at - x[1]) * (x[0] - x[1]) > 0 else 2
        guess = three[1] + (at - x[1]) / (x[side] - x[1]) * (three[side] - three[1])
        answer = unchanged(prescribed(place, float(at)), guess, abs(x[2] - x[0]))
        if answer is None:
            break
        found = answer[0]
        if found[-1] > three[1][-1]:
            three = [three[0], found, three[1]] if side == 0 else [three[1], found, three[2]]
        else:
            three = [found, *three[1:]] if side == 0 else [*three[:2], found]
    return three[1]


def unchanged(answered: Answered, taken: Floats, near: float = np.inf) -> tuple[Floats, int] | None:
    """A vector that comes out as it was put in, and the rounds that it took; None where it is not soon found, or not as
    `near` to the first one. By Newton's method: how the answer changes is tried out with small changes, one direction
    after another until enough is known (D. A. Knoll and D. E. Keyes, "Jacobian-free Newton-Krylov methods", J. Comput.
    Phys. 193 (2004), 357-397; from memory)."""
    start, before = taken, np.inf
    for rounds in range(1, ROUNDS + 1):
        answer = answered(taken)
        if answer is None:
            return None
        change = answer - taken
        off = _largest(change)
        if off <= ENOUGH:
            return answer, rounds
        if off > before:
            return None
        step = _step(answered, taken, change)
        if step is None or _largest(taken + step - start) > near:
            return None
        taken, before = taken + step, off
    return None


def _step(answered: Answered, taken: Floats, change: Floats) -> Floats | None:
    """The correction after which, as far as small changes tell, nothing changes any more: the least change left over among
    the directions that the changes themselves lead to (Y. Saad and M. H. Schultz 1986)."""
    size = float(np.linalg.norm(change))
    directions, made = [change / size], []
    while True:
        tried = answered(taken + SMALL * directions[-1])
        if tried is None:
            return None
        made.append(directions[-1] - (tried - taken - change) / SMALL)
        known, own = np.stack(made, axis=1), np.stack(directions, axis=1)
        part = np.linalg.lstsq(known, change, rcond=None)[0]
        enough = np.linalg.norm(change - known @ part) <= LEAVE * size or len(made) >= min(len(change), DIRECTIONS)
        fresh = made[-1] - own @ (own.T @ made[-1])
        fresh -= own @ (own.T @ fresh)
        length = float(np.linalg.norm(fresh))
        if enough or length < 1e-12:
            return np.asarray(own @ part)
        directions.append(fresh / length)


def _largest(values: Floats) -> float:
    return float(np.abs(values).max(initial=0.0))
