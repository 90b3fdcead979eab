"""The critical load factor: how far the first-order axial forces can grow in proportion before the distribution fails.

Under growing axial forces a joint let go resists less and less. The frame is stable as long as no member has buckled
between held ends and every joint and sway, let go one after another, still resists; the factor is where that ends. Up
to there the stiffness falls ever faster with the factor (it is what a linear one leaves when the members' insides are let
go), so that stable factors lie all below unstable ones and the smallest eigenvalue crosses zero once.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.linalg import eigvalsh
from scipy.optimize import brentq

from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import Floats
from crosscheck.opinions.moment_distribution.displaced import DENSE, Displaced, Freedom
from crosscheck.opinions.moment_distribution.members import cut_up
from crosscheck.opinions.moment_distribution.pieces import Pieces
from crosscheck.opinions.moment_distribution.stretches import Axial, bow, divide, parts_needed

CLOSE = 1e-10
"""Relative width to which the factor is found."""
NEVER = 1e5
"""A frame stable at so many times its axial forces is given no factor."""
NOTHING = 1e-12
"""Compression below this share of the case's largest axial force is rounding."""


@dataclass(frozen=True)
class Growing:
    """A case whose first-order axial forces (m,) at the `from` ends grow, the loads along the members with them."""

    freedom: Freedom
    loads: LoadTable
    pieces: Pieces
    axial: Floats

    def at(self, factor: float) -> Displaced | None:
        """The frame under `factor` times its axial forces; None where a member shears off."""
        m = self.freedom.held.members
        parts, sheared = parts_needed(m, self.pieces, self.axial, factor)
        if sheared:
            return None
        division = divide(m, self.loads, parts)
        return Displaced(self.freedom, bow(m, division, Axial(factor * self.axial, factor)))

    def stable(self, factor: float) -> bool:
        displaced = self.at(factor)
        return displaced is not None and displaced.stable

    @property
    def compressed(self) -> bool:
        """Whether any member is in compression anywhere, rounding apart."""
        pieces = self.pieces
        every = np.arange(len(pieces.member))
        ends = pieces.size[:, None] * np.array([0.0, 0.5, 1.0])
        force = self.axial[pieces.member, None] - pieces.along_at(every[:, None], ends)
        return bool(force.size and force.min() < -NOTHING * np.abs(force).max())


def growing(freedom: Freedom, loads: LoadTable, axial: Floats) -> Growing:
    return Growing(freedom, loads, cut_up(freedom.held.members, loads), axial)


def critical_factor(case: Growing) -> float:
    """The critical load factor; infinite where there is none up to NEVER."""
    if not case.compressed:
        return np.inf
    low, high = _bracket(case)
    if high == np.inf:
        return np.inf
    while high - low > CLOSE * high:
        if high - low < 0.3 * high and _smooth(case, low, high):
            return float(brentq(lambda factor: _least(case, factor), low, high, xtol=CLOSE * low, rtol=CLOSE))
        middle = (low + high) / 2
        low, high = (middle, high) if case.stable(middle) else (low, middle)
    return (low + high) / 2


def _bracket(case: Growing) -> tuple[float, float]:
    """A stable factor and an unstable one, at most twice apart; the latter infinite where none is found."""
    factor = 1.0
    if case.stable(factor):
        while case.stable(2 * factor):
            factor *= 2
            if factor > NEVER:
                return factor, np.inf
        return factor, 2 * factor
    while not case.stable(factor / 2):
        factor /= 2
        if factor < 1e-12:
            return 0.0, factor
    return factor / 2, factor


def _smooth(case: Growing, low: float, high: float) -> bool:
    """Whether the smallest eigenvalue runs from `low` to `high` without a member buckling between held ends."""
    at = case.at(high)
    if at is None or at.bowed.buckled.any() or not 0 < at.whole.shape[0] <= DENSE:
        return False
    return _least(case, low) > 0 > _least(case, high)


def _least(case: Growing, factor: float) -> float:
    """The smallest eigenvalue of the distribution's stiffness, the joints' and sways' own stiffness without axial force
    counting as 1."""
    at, scale = case.at(factor), 1 / np.sqrt(case.freedom.start)
    assert at is not None
    return float(eigvalsh(scale[:, None] * at.whole.toarray() * scale, subset_by_index=[0, 0])[0])
