"""Release and carry over: the joints' unbalanced moments distributed until nothing is left over.

All joints are released at once: each takes its unbalanced moment by turning through (moment / sum of the stiffnesses
that meet there), and the carry-over moments that this sends to the far ends are the next round's unbalanced moments
(Cross 1932). The rounds always settle, because the matrix and its twin with the carry-over reversed are both positive
definite; where factors near 1 make them slow (long rigid zones, great shear), what is left over is finished by
conjugate gradients, in which each round is one more distribution and a share of the one before (Hestenes and Stiefel
1952).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np

from crosscheck.frame.model import Floats

UNRESISTED = 1e-12
"""Resistance, as a share of the rough one, below which a correction is not made."""
PLAIN_ROUNDS = 24
"""Rounds of plain distribution before conjugate ones take over; halving each time, they leave 6e-8."""
LOOK = 4
"""Plain rounds between two looks at what is left over: looking costs as much as a round."""


@dataclass(frozen=True)
class Distribution:
    """(r,) joints that can turn: `stiffness` is the sum at each, `carried` (r, r) sparse the moment that arrives at a
    joint's far ends per rotation."""

    stiffness: Floats
    carried: Any

    def resisting(self, turned: Floats) -> Floats:
        """(r, n) moments that hold the joints at these rotations, no joint moving."""
        return np.asarray(self.stiffness[:, None] * turned + self.carried @ turned)

    def distribute(self, unbalanced: Floats, leave: Floats | float) -> tuple[Floats, int]:
        """Rotations (r, n) that take the unbalanced moments (r, n), and the rounds; at most the share `leave` of the
        largest is left."""
        turned = np.zeros_like(unbalanced)
        if not unbalanced.size:
            return turned, 0
        left, goal = unbalanced, leave * np.abs(unbalanced).max(axis=0)
        for taken in range(0, PLAIN_ROUNDS, LOOK):
            if np.all(np.abs(left).max(axis=0) <= goal):
                return turned, taken
            for _ in range(LOOK):
                step = left / self.stiffness[:, None]
                turned += step
                left = -(self.carried @ step)
        rest, further = conjugate(
            self.resisting, lambda r: r / self.stiffness[:, None], left, goal, 4 * len(left) + 100
        )
        return turned + rest, PLAIN_ROUNDS + further


def conjugate(
    apply: Callable[[Floats], Floats],
    release: Callable[[Floats], Floats],
    left: Floats,
    goal: Floats,
    most: int,
) -> tuple[Floats, int]:
    """Conjugate corrections x with apply(x) = left, column by column, and how many; `release` is the rough inverse.

    left, x: (k, n); goal: largest leftover allowed, (n,) or (k, n). Stops at `most`: the caller looks at what is
    left.
    """
    x = np.zeros_like(left)
    rough = release(left)
    way = rough
    power = (left * rough).sum(axis=0)
    for taken in range(most):
        busy = (np.abs(left) > goal).any(axis=0) & (power > 0)
        if not busy.any():
            return x, taken
        against = apply(way)
        work = (way * against).sum(axis=0)
        # A way that nothing resists but rounding is left alone; the largest leftover there is rounding too.
        share = np.divide(power, work, out=np.zeros_like(power), where=busy & (work > UNRESISTED * power))
        x = x + share * way
        left = left - share * against
        rough = release(left)
        fresh = (left * rough).sum(axis=0)
        way = rough + np.divide(fresh, power, out=np.zeros_like(power), where=power > 0) * way
        power = fresh
    return x, most
