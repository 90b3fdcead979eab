"""Loads of a member as brackets: its sagging moment, shear and axial force as a simple beam.

Every one of them is a sum of brackets c <x - a>^n (W. H. Macaulay, Messenger of Mathematics 48 (1919), 129-130).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from crosscheck.audit.equilibrium import pieces, resultants
from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import Floats, Ints


@dataclass(frozen=True, slots=True)
class Brackets:
    """(n,) each: member, power 0 to 3, start of the bracket, coefficient. Before its start a bracket is nil."""

    member: Ints
    power: Ints
    start: Floats
    factor: Floats

    @staticmethod
    def of(*rows: tuple[Ints, int, Floats, Floats]) -> Brackets:
        """From groups of equal power."""
        return Brackets(
            np.concatenate([r[0] for r in rows]),
            np.concatenate([np.full(len(r[0]), r[1]) for r in rows]),
            np.concatenate([r[2] for r in rows]),
            np.concatenate([r[3] for r in rows]),
        )

    def integral(self, low: Floats, high: Floats, constant: Floats, slope: Floats) -> Floats:
        """(m,) integral from low to high of the brackets times (constant + slope x); all (m,)."""
        m, n = self.member, self.power
        t0 = np.maximum(low[m] - self.start, 0.0)
        t1 = np.maximum(high[m] - self.start, 0.0)
        first = (t1 ** (n + 1) - t0 ** (n + 1)) / (n + 1)
        second = (t1 ** (n + 2) - t0 ** (n + 2)) / (n + 2)
        part = self.factor * (constant[m] * first + slope[m] * (self.start * first + second))
        total = np.zeros(len(low))
        np.add.at(total, m, part)
        return total

    def value(self, x: Floats, after: bool) -> Floats:
        """(m,) the sum at x of each member, just before x, or just after it where `after`."""
        t = x[self.member] - self.start
        on = t >= 0 if after else t > 0
        total = np.zeros(len(x))
        np.add.at(total, self.member, np.where(on, self.factor * np.maximum(t, 0.0) ** self.power, 0.0))
        return total


def _line_brackets(line: Floats, column: int, power: int) -> list[tuple[Ints, int, Floats, Floats]]:
    """A stretch from w0 to w1, integrated `power` times: it begins at its start and is taken off again at its end."""
    member = line[:, 6].astype(np.int64)
    start, end, w0, w1 = line[:, 0], line[:, 1], line[:, column], line[:, column + 1]
    slope = np.divide(w1 - w0, end - start, out=np.zeros_like(w0), where=end > start)
    over = float(np.prod(np.arange(1, power + 1)))
    return [
        (member, power, start, w0 / over), (member, power + 1, start, slope / (over * (power + 1))),
        (member, power, end, -w1 / over), (member, power + 1, end, -slope / (over * (power + 1))),
    ]  # fmt: skip


def simple_beam(loads: LoadTable, length: Floats) -> tuple[Brackets, Brackets, Brackets]:
    """Sagging moment and shear of each member on two simple supports, and its axial force with none at `from`."""
    part = pieces(loads)
    point, line = part.point, part.line
    every = np.arange(len(length))
    zero = np.zeros(len(length))
    member = point[:, 4].astype(np.int64)
    at, along, across, couple = point[:, 0], point[:, 1], point[:, 2], point[:, 3]
    total = resultants(part, len(length))
    # The shear at `from` is what makes the moment at `to` nil: V L + (moment of the loads about `to`) = 0.
    first = -(total[:, 1] + total[:, 2] / length)
    moment = Brackets.of(
        (every, 1, zero, first), (member, 1, at, across), (member, 0, at, couple), *_line_brackets(line, 4, 2)
    )
    shear = Brackets.of((every, 0, zero, first), (member, 0, at, across), *_line_brackets(line, 4, 1))
    axial = Brackets.of((member, 0, at, -along), *((m, n, a, -c) for m, n, a, c in _line_brackets(line, 2, 1)))
    return moment, shear, axial
