"""What a claim says once read, before any comparison: values with their printed digits, names, places, and open choices.

A reading knows the frame's names and geometry, and no opinion. What it leaves open (signs, units that the paste does not
state, the way members run, the case) is closed in crosscheck.compare.closing.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Literal

from crosscheck.claims.numbers import Number
from crosscheck.claims.words import Size
from crosscheck.frame.model import FREE, Frame

Kind = Literal["end", "span", "reaction", "displacement", "extreme"]
"""What a value is (crosscheck.compare.claimed holds what becomes of it)."""


@dataclass(frozen=True, slots=True)
class FrameNames:
    """The names a paste may use, with what is needed to recognise them by place.

    members: name to its from and to joint. xy: joint coordinates. force, length: N and m in the frame's units.
    envelopes: names that stand for several cases or combinations: envelopes, and combinations that became several.
    """

    members: Mapping[str, tuple[str, str]]
    xy: Mapping[str, tuple[float, float]]
    cases: tuple[str, ...]
    supports: frozenset[str] = frozenset()
    turning: frozenset[str] = frozenset()
    """Joints whose support holds or springs the rotation, so that a moment can react there."""
    force: float = 1000.0
    length: float = 1.0
    envelopes: tuple[str, ...] = ()

    @classmethod
    def of(cls, frame: Frame) -> FrameNames:
        return cls(
            members={m.name: (m.joint_from, m.joint_to) for m in frame.members.values()},
            xy={j.name: (j.x, j.y) for j in frame.joints.values()},
            cases=frame.names,
            supports=frozenset(frame.supports),
            turning=frozenset(s.joint for s in frame.supports.values() if s.rotation != FREE),
            force=frame.units.newton,
            length=frame.units.metre,
            envelopes=frame.several,
        )


@dataclass(frozen=True, slots=True)
class ReadingOptions:
    """What the user states beside the paste.

    units: "kN m" for the whole paste, or quantity to unit ({"moment": "kN mm", "displacement": "mm"}).
    columns: heads to use in place of (or in want of) the paste's own, in order: ("member", "joint", "N", "V", "M").
    signs: quantity to convention in words ({"moment": "anticlockwise", "axial": "compression"}).
    members, joints, cases: the paste's name to the frame's. parts: a member of the frame to the elements
      that the paste divides it into, in order. file: a reading file (TOML) that states all these.
    values: further values in words ("B1-C1 max 412 kNm"). sheet: of a spreadsheet. face: values stand at the face.
    """

    units: str | Mapping[str, str] | None = None
    columns: tuple[str, ...] = ()
    signs: Mapping[str, str] = field(default_factory=dict)
    members: Mapping[str, str] = field(default_factory=dict)
    joints: Mapping[str, str] = field(default_factory=dict)
    cases: Mapping[str, str] = field(default_factory=dict)
    parts: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    file: str | Path | None = None
    values: tuple[str, ...] = ()
    sheet: str | None = None
    face: bool | None = None


@dataclass(frozen=True, slots=True)
class Entry:
    """One value read.

    table: number of its table, 1 for the first. kind, quantity: as in ClaimedValue; for forces whose axes the table
      leaves open (member columns Fx, Fy) axial and shear are meant, and `axes` says "open"; so it does for moments at
      joints that may be reactions or moments of the members there.
    member, joint: names in the frame. end: the frame's end (0 from, 1 to) of an end value; place: the paste's (0 its
      start, 1 its end); run: +1 where the paste's member runs as the frame's, -1 where it runs the other way, 0 where
      the paste does not say. Either of end and place may be None while run is 0.
    at: distance from the paste's start, in `at_unit` (a share of the length where `at_share`).
    case: name in the frame, or None where the paste names none. unit: as stated, or None.
    extreme: for kind "extreme": "max", "min" or "size" along the member; for the others the same of the values that
      several cases have at that place, "" or None where it is not one of an envelope's.
    governs: the case or combination that the paste says it comes from. along: the value is one of case `case` that goes
      with an extreme of another quantity, of the envelope `beside` (None where the paste does not name it).
    """

    table: int
    line: int
    kind: Kind
    quantity: str
    number: Number
    unit: Size | None = None
    member: str | None = None
    joint: str | None = None
    end: int | None = None
    place: int | None = None
    run: int = 0
    at: float | None = None
    at_unit: Size | None = None
    at_share: bool = False
    at_half: float = 0.0
    """Half a unit of the last digit of `at`, as `at` is given."""
    case: str | None = None
    extreme: str | None = None
    axes: str = ""
    cut: float | None = None
    """For an end value of a part of a member that ends inside it: the distance from the frame's `from` joint."""
    origin: float | None = None
    """For a value along a part of a member: the distance of the part's start from the frame's `from` joint."""
    reach: float | None = None
    """The part's length."""
    sense: str = ""
    """From words: "size" where no direction is said, "said" where one is (the sign is then no open choice)."""
    governs: str = ""
    along: bool = False
    beside: str | None = None
    whole: bool = False
    """An axial force of a whole member: the paste names no place along it."""
    comma_open: bool = False
    """The number's comma may stand before decimals (as read) or thousands."""


@dataclass(frozen=True, slots=True)
class LineTrace:
    """What one line was taken for: blank, rule, heading, head, row, total, echo, note, not understood."""

    line: int
    text: str
    taken_for: str
    why: str = ""


@dataclass(frozen=True, slots=True)
class TableRead:
    """A table as understood: its kind ("end", ..., "echo ..."), column heads and what each was taken for, and how
    many rows."""

    number: int
    heading: str
    kind: str
    columns: tuple[tuple[str, str], ...]
    rows: int
    first_line: int
    case: str | None = None


@dataclass(frozen=True, slots=True)
class EchoFact:
    """One item of the other model's own input: what ("joint x", "member ends", "I", ...), of what, and its value."""

    line: int
    what: str
    where: str
    value: float | str
    half: float = 0.0
    unit: Size | None = None
    kind: str = ""


@dataclass(frozen=True, slots=True)
class Reading:
    """A claim as read. `rows` counts rows of results. `signs`: quantity to stated convention. `undecided`: choices in the
    reading itself that could not be made, each with what would settle it. `expect`: the first line's
    "# expect:". `face`: end values are stated to stand at the face of rigid zones."""

    file: str
    sha256: str
    entries: tuple[Entry, ...]
    tables: tuple[TableRead, ...]
    trace: tuple[LineTrace, ...]
    rows: int
    not_understood: tuple[tuple[int, str, str], ...] = ()
    foreign: tuple[tuple[int, str, str], ...] = ()
    signs: Mapping[str, str] = field(default_factory=dict)
    notes: tuple[str, ...] = ()
    undecided: tuple[str, ...] = ()
    echo: tuple[EchoFact, ...] = ()
    unknown_cases: tuple[str, ...] = ()
    expect: str = ""
    face: bool = False
