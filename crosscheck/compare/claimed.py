"""A claim after its open choices are closed: values in the frame's own units, signs and names."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal

Kind = Literal["end", "span", "reaction", "displacement", "extreme"]
Quantity = Literal["axial", "shear", "moment", "across", "fx", "fy", "dx", "dy", "rotation"]


@dataclass(frozen=True, slots=True)
class ClaimedValue:
    """One claimed value, in the frame's units and sign convention.

    kind: "end" (end action: axial, shear, moment at `joint` of `member`), "span" (value at distance `at` of `member`),
      "reaction" (fx, fy, moment at `joint`), "displacement" (dx, dy, rotation at `joint`), "extreme" (largest or
      smallest value along `member`, or of all members or joints where `member` and `joint` are None).
    value, half_digit: the value and half a unit of its last printed digit, carried through the unit change.
    extreme: for kind "extreme" which one: "max", "min" or "size" (largest magnitude); for the other kinds the same of an
      envelope's values at that place, None where it is a value of one case.
    governs: the case or combination that the claim says an envelope's value comes from, "" where it says none.
    beside: the envelope whose extreme of another quantity this value of `case` is said to go with, "" for any other.
    line: line of the claim it stands on; printed: the text as printed.
    """

    case: str
    kind: Kind
    quantity: Quantity
    member: str | None
    joint: str | None
    at: float | None
    value: float
    half_digit: float
    line: int
    printed: str = ""
    extreme: Literal["max", "min", "size"] | None = None
    governs: str = ""
    beside: str = ""


@dataclass(frozen=True, slots=True)
class ClosedClaim:
    """What the claim says once understood, and how it was understood.

    cases: the case or combination names it speaks of. units, signs: what was taken, by quantity, in words.
    fits: by the keys of signs, how many of the telling values (large enough to tell a sign by) fit, and of how many.
    notes: choices in the reading and what followed from them, one sentence each.
    not_understood: (line, text, why) of every row not used.
    foreign: rows for members or joints that the frame lacks; they prevent "agree".
    undecided: reasons why it cannot be judged, each with the choice that would settle it; empty when it can.
    reversed_load: member forces, reactions and displacements are all reversed together.
    """

    file: str
    sha256: str
    rows: int
    cases: tuple[str, ...]
    values: tuple[ClaimedValue, ...]
    units: dict[str, str] = field(default_factory=dict)
    signs: dict[str, str] = field(default_factory=dict)
    fits: dict[str, tuple[int, int]] = field(default_factory=dict)
    notes: tuple[str, ...] = ()
    not_understood: tuple[tuple[int, str, str], ...] = ()
    foreign: tuple[tuple[int, str, str], ...] = ()
    undecided: tuple[str, ...] = ()
    reversed_load: bool = False
