"""What a suspect is, and what it is while it is still being weighed."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

from crosscheck.answer import Answer
from crosscheck.frame.model import Floats, Frame
from crosscheck.suspects.changes import Change


@dataclass(frozen=True, slots=True)
class Suspect:
    """One mistake (or a pair) that would explain the difference: a hypothesis.

    kind, where: as the README lists them. says: what the other analysis may have had. explains: share of the squared,
    tolerance-scaled difference that the change removes. tied_with: what explains it as well, each with the further
    result that would tell the two apart. change: applies it (`verify --suspect N`). fits: to the printed precision.
    """

    kind: str
    where: tuple[str, ...]
    says: str
    explains: float
    tied_with: tuple[str, ...] = ()
    change: Change = field(default_factory=Change)
    fits: bool = False


@dataclass(frozen=True, slots=True, eq=False)
class Option:
    """A change being weighed.

    cost: how unusual the mistake is: 0 for the commonest, 1 for one e times rarer. delta: (n,) what it adds to the
    model's values at the linear places, where foretold; None where the frame must be solved again. claimed, half: (n,)
    the claim's values and half digits where the change is to the claim. fitted: numbers chosen to fit.
    answer: the results so explained, where no frame has them. again: what `at` of a number gives the option for that
    number, and the number it has, where another kind of solution must fit it anew.
    """

    kind: str
    where: tuple[str, ...]
    says: str
    change: Change
    cost: float
    delta: Floats | None = None
    claimed: Floats | None = None
    half: Floats | None = None
    fitted: int = 0
    answer: Answer | None = None
    again: tuple[Callable[[float], Option], float] | None = None


@dataclass(frozen=True, slots=True)
class Family:
    """Options with one number to be fitted. at(p): the option; starts: where to begin; logarithmic: p is a factor.

    joints, members: indices of the place it is confined to; None where it reaches further.
    """

    at: Callable[[float], Option]
    starts: tuple[float, ...]
    logarithmic: bool = True
    joints: tuple[int, ...] | None = None
    members: tuple[int, ...] | None = None


Placed = tuple[Option, tuple[int, ...], tuple[int, ...]]
"""An option with the joints and members (indices) that it is confined to."""


def named(frame: Frame, kind: str, name: str) -> str:
    """A name as `where` says it: with its kind in front where the bare name would be two things."""
    tables = (frame.joints, frame.members, frame.sections, frame.materials)
    return f"{kind} {name}" if sum(name in t for t in tables) > 1 else name
