"""Two printouts of one frame against each other: what moved between last year's program version and this year's.

Both are closed against the opinions first, so that units, signs and names mean the same; from there on the opinions have no
part in it. A value has moved when the two lie further apart than their last printed digits can explain:

    allowed = half digit of the one + half digit of the other

both carried through the change of units. There is no percentage in it: a version that changes the fourth digit moved.
"""

from __future__ import annotations

from dataclasses import dataclass

from crosscheck.compare.claimed import ClaimedValue, ClosedClaim
from crosscheck.compare.differences import Difference, Place, Verdict, worst_first
from crosscheck.frame.model import Frame

FIRST, SECOND = "claim", "against"
ROUNDING = 1e-12
"""Of the larger value: what a change of units costs, beside the printed digits."""
SAME_PLACE = 6
"""Decimals of a share of the member's length to which two distances are one place."""
TABLES = {"end": "member_ends", "span": "spans", "reaction": "reactions", "displacement": "joints", "extreme": "extremes"}

Key = tuple[object, ...]


@dataclass(frozen=True, slots=True)
class Moved:
    """What lies between two printouts.

    differences: values that moved, by "claim" and "against", furthest beyond rounding first.
    compared: how many values both give.
    only_first, only_second: places where one of them alone gives a value. undecided: why they cannot be judged.
    """

    differences: tuple[Difference, ...]
    compared: int
    only_first: tuple[Place, ...]
    only_second: tuple[Place, ...]
    undecided: tuple[str, ...] = ()

    @property
    def verdict(self) -> Verdict:
        """disagree where anything moved, agree where nothing did of what could be compared."""
        return "disagree" if self.differences else "undecided" if self.undecided else "agree"


def between(frame: Frame, first: ClosedClaim, second: ClosedClaim) -> Moved:
    """Everything that both give, compared; and what one of them alone gives."""
    here, there = _by_place(frame, first), _by_place(frame, second)
    both = [key for key in here if key in there]
    differences = [d for key in both if (d := _difference(here[key], there[key])) is not None]
    undecided = [f"{name}: {why}" for name, c in ((FIRST, first), (SECOND, second)) for why in c.undecided]
    if not both:
        undecided.append("no value stands in both printouts")
    return Moved(
        tuple(worst_first(differences)), len(both),
        tuple(_place(v) for key, v in here.items() if key not in there),
        tuple(_place(v) for key, v in there.items() if key not in here),
        tuple(undecided),
    )  # fmt: skip


def _by_place(frame: Frame, closed: ClosedClaim) -> dict[Key, ClaimedValue]:
    """Values by what they are of; of one printed several times the finest, which the others can only repeat."""
    out: dict[Key, ClaimedValue] = {}
    for v in closed.values:
        key = (v.case, v.kind, v.quantity, v.member, v.joint, _share(frame, v), v.extreme)
        if key not in out or v.half_digit < out[key].half_digit:
            out[key] = v
    return out


def _share(frame: Frame, v: ClaimedValue) -> float | None:
    if v.at is None or v.member is None:
        return None
    return round(v.at / float(frame.member_table.length[frame.member_index[v.member]]), SAME_PLACE)


def _difference(a: ClaimedValue, b: ClaimedValue) -> Difference | None:
    one, other = (abs(v.value) if v.extreme == "size" else v.value for v in (a, b))
    apart = abs(one - other)
    allowed = a.half_digit + b.half_digit + ROUNDING * max(abs(one), abs(other))
    # Anything but a number is a finding.
    if apart <= allowed:
        return None
    return Difference(_place(a), {FIRST: a.value, SECOND: b.value}, apart, allowed, line=a.line)


def _place(v: ClaimedValue) -> Place:
    return Place(v.case, TABLES[v.kind], v.quantity, v.member, v.joint, v.at)  # type: ignore[arg-type]
