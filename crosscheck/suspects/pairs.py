"""Two mistakes at once: which of many single ones are likely together, and what both are called."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np

from crosscheck.frame.model import Floats
from crosscheck.suspects.suspect import Option

PAIR = 2.5
"""What a second mistake costs."""
MOST_ALONE = 700
"""Single mistakes of which pairs are made: the likeliest."""
LOOKED_AT = 2000
FEWEST_OFF = 4
"""Values further off than allowed, for pairs to be made of effects: of so many pairs some would meet three by chance."""

Effect = tuple[Option, Floats]
"""A mistake and what it alone adds to the model's values."""


def paired(one: Option, two: Option) -> Option:
    """Both mistakes, the second in the frame that has the first."""
    return Option(
        one.kind, tuple(dict.fromkeys((*one.where, *two.where))), f"{one.says}, and {two.says}",
        one.change.then(two.change), PAIR + one.cost + two.cost, fitted=one.fitted + two.fitted,
    )  # fmt: skip


def same_place(one: Option, two: Option) -> bool:
    """Whether two mistakes are of one kind at one place, so that together they are a third of that kind."""
    return (one.kind, one.where) == (two.kind, two.where)


def adding_up(effects: Sequence[Effect], residual: Floats, allowed: Floats) -> Iterator[tuple[Option, Option]]:
    """Pairs by what would be left over of the residual if effects simply added up, in tolerances, least first; pairs at
    one place left out. All arrays (n,)."""
    some = effects[:MOST_ALONE]
    if len(some) < 2 or (np.abs(residual) > allowed).sum() < FEWEST_OFF:
        return
    d, r = np.array([delta for _, delta in some]) / allowed, residual / allowed
    alone = (d**2).sum(axis=1) - 2 * d @ r
    left = alone[:, None] + alone[None, :] + 2 * d @ d.T
    a, b = np.triu_indices(len(d), 1)
    for k in np.argsort(left[a, b], kind="stable")[:LOOKED_AT].tolist():
        one, two = some[a[k]][0], some[b[k]][0]
        if not same_place(one, two):
            yield one, two
