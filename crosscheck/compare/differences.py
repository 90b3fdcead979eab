"""A difference as an object, before it is text."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

Verdict = Literal["agree", "disagree", "undecided"]
RANK: dict[Verdict, int] = {"agree": 0, "undecided": 1, "disagree": 2}


def worst(verdicts: list[Verdict]) -> Verdict:
    """The worst of several verdicts: disagree, then undecided, then agree; nothing judged is undecided."""
    return max(verdicts, key=RANK.__getitem__, default="undecided")


@dataclass(frozen=True, slots=True)
class Place:
    """What a value is of: a quantity of a case at a member's end, along a member, or at a joint.

    at: distance along the member for values within a span, else None. of: which table it stands in.
    extreme: "max" or "min" where it is the greatest or least of an envelope there, else "".
    """

    case: str
    of: Literal["member_ends", "spans", "joints", "reactions", "extremes"]
    quantity: str
    member: str | None = None
    joint: str | None = None
    at: float | None = None
    extreme: str = ""


@dataclass(frozen=True, slots=True)
class Difference:
    """One disagreement.

    values: by opinion name, and "claim" where there is one; None where undetermined. difference and allowed are of the
    pair that lies furthest apart for what it may. unsafe: the claim is smaller in size than the opinions.
    note: why it counts when no number says so (one opinion's null against another's number, NaN).
    """

    place: Place
    values: Mapping[str, float | None]
    difference: float
    allowed: float
    unsafe: bool = False
    note: str = ""
    line: int | None = None

    @property
    def times_allowed(self) -> float:
        """How many times the allowed difference it is; infinite for findings without a number."""
        return self.difference / self.allowed if self.allowed > 0 else float("inf")


def worst_first(differences: list[Difference]) -> list[Difference]:
    """Unsafe side first, then by how far beyond what is allowed."""
    return sorted(differences, key=lambda d: (not d.unsafe, -d.times_allowed))
