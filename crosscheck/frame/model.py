"""The frame as stated: frozen dataclasses in the frame's own units, and plain arrays of the same data.

Axes and signs are those of the README: global x right and y up; a member's local x runs from its `from` joint to its
`to` joint, local y is 90 degrees counter-clockwise from that; rotations and couples are clockwise positive.
Every number is in the frame's units of force and length (and degrees Celsius for temperatures).
Nothing here knows stiffness: opinions make their own products of these numbers.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from functools import cached_property
from typing import Literal

import numpy as np

from crosscheck.frame.properties import Bools as Bools
from crosscheck.frame.properties import Floats as Floats
from crosscheck.frame.properties import Ints as Ints
from crosscheck.frame.properties import MemberTable as MemberTable
from crosscheck.frame.properties import SupportTable as SupportTable
from crosscheck.frame.properties import Variation as Variation
from crosscheck.frame.properties import member_table, variation

HELD = math.inf
"""A support direction that cannot move, or an end connection that cannot turn."""
FREE = 0.0
"""A support direction without restraint, or an end connection that turns freely (a hinge)."""

Direction = float | Literal["across", "along"]
"""Of a load: degrees counter-clockwise from global x, or "across" (local +y), or "along" (local +x)."""


@dataclass(frozen=True, slots=True)
class Units:
    """Names of the force and length unit, and their size: `newton` N in one force unit, `metre` m in one length."""

    force: str
    length: str
    newton: float
    metre: float


@dataclass(frozen=True, slots=True)
class Material:
    """E and G: force/length2; alpha: per degree C; weight: force/length3. None where not stated."""

    name: str
    E: float
    G: float | None = None
    alpha: float | None = None
    weight: float | None = None


@dataclass(frozen=True, slots=True)
class Section:
    """I: length4; A and shear_area: length2; depth: length. None where not stated."""

    name: str
    I: float  # noqa: E741 - the trade's name
    A: float | None = None
    shear_area: float | None = None
    depth: float | None = None


@dataclass(frozen=True, slots=True)
class Joint:
    name: str
    x: float
    y: float


@dataclass(frozen=True, slots=True)
class Piece:
    """A part of a stepped or tapered member, up to the share `until` of its length from joint to joint.

    Its depth goes straight from that of section `first` to that of `last`, and I, A and shear area follow the power of
    the depth that fits both; a plain step has the same section twice.
    """

    first: str
    last: str
    until: float


@dataclass(frozen=True, slots=True)
class Member:
    """A straight member between two joints.

    turn_from, turn_to: rotational stiffness of the end connection (moment per radian): HELD for a rigid end, FREE for
    a hinge, otherwise a spring. rigid_from, rigid_to: lengths of the rigid end zones. From the joint inward come the
    rigid zone, then the connection, then the flexible part.
    pieces: of a stepped or tapered member, from joint to joint; `section` is then that of its longest piece.
    axial: "rigid" where this member keeps its length whatever the frame's idealisation. only: the one sense in which a
    one-way member works; working the other way it carries no axial force of its own stretch.
    """

    name: str
    joint_from: str
    joint_to: str
    section: str
    material: str
    turn_from: float = HELD
    turn_to: float = HELD
    rigid_from: float = 0.0
    rigid_to: float = 0.0
    pieces: tuple[Piece, ...] = ()
    axial: Literal["", "rigid"] = ""
    only: Literal["", "tension", "compression"] = ""


@dataclass(frozen=True, slots=True)
class Support:
    """HELD, FREE or a stiffness along each of the support's own axes; `angle` (degrees) turns them.

    x_only, y_only: "push" where that direction is HELD but can only push the frame along + of its axis (up, for y), and
    lets go otherwise; "pull" where it can only pull it along - of the axis.
    """

    joint: str
    x: float
    y: float
    rotation: float
    angle: float = 0.0
    x_only: Literal["", "push", "pull"] = ""
    y_only: Literal["", "push", "pull"] = ""


@dataclass(frozen=True, slots=True)
class Tie:
    """Joints that move together along `direction` (degrees counter-clockwise from x); it resists nothing else."""

    name: str
    joints: tuple[str, ...]
    direction: float


@dataclass(frozen=True, slots=True)
class JointForce:
    """`force` on a joint, acting in `direction` (degrees counter-clockwise from x)."""

    entry: int
    joint: str
    force: float
    direction: float


@dataclass(frozen=True, slots=True)
class JointCouple:
    """A couple on a joint, clockwise positive."""

    entry: int
    joint: str
    couple: float


@dataclass(frozen=True, slots=True)
class Settlement:
    """Imposed movement of a support along the support's own (turned) axes; rotation clockwise, radians."""

    entry: int
    joint: str
    x: float = 0.0
    y: float = 0.0
    rotation: float = 0.0


@dataclass(frozen=True, slots=True)
class PointForce:
    """`force` on a member at distance `at` from its `from` joint."""

    entry: int
    member: str
    force: float
    direction: Direction
    at: float


@dataclass(frozen=True, slots=True)
class PointCouple:
    """A clockwise couple on a member at distance `at`; it acts on the member inside any hinge there."""

    entry: int
    member: str
    couple: float
    at: float


@dataclass(frozen=True, slots=True)
class Spread:
    """A load spread linearly from intensity `first` at `start` to `last` at `end` (distances along the member).

    Intensity is force per length of member or, with `projection`, per length of the member's projection square to
    the load's direction.
    """

    entry: int
    member: str
    first: float
    last: float
    direction: Direction
    start: float
    end: float
    projection: bool = False


@dataclass(frozen=True, slots=True)
class Temperature:
    """Mean rise and difference (local -y face minus local +y face) of a member's temperature, degrees C."""

    entry: int
    member: str
    mean: float = 0.0
    difference: float = 0.0


@dataclass(frozen=True, slots=True)
class Misfit:
    """A member made too long by `too_long`."""

    entry: int
    member: str
    too_long: float


@dataclass(frozen=True, slots=True)
class SelfWeight:
    """Weight of every member, times `factor`, acting down along the whole joint-to-joint length."""

    entry: int
    factor: float


@dataclass(frozen=True, slots=True)
class Lean:
    """`share` of all downward load of the same case, sideways (right positive) where that load acts."""

    entry: int
    share: float


Load = (
    JointForce | JointCouple | Settlement | PointForce | PointCouple | Spread | Temperature | Misfit | SelfWeight | Lean
)
"""`entry` is the index in the case's `apply` list: dead[0] is entry 0 of case dead. One entry may make several."""


@dataclass(frozen=True, slots=True)
class LoadCase:
    """expected: what the take-down says the case adds up to, by direction word ("down": force).

    arranged: name of the case of which this is an arrangement of a load pattern; "" for a case as stated.
    """

    name: str
    loads: tuple[Load, ...]
    expected: dict[str, float] = field(default_factory=dict)
    arranged: str = ""


@dataclass(frozen=True, slots=True)
class Combination:
    """factors: load case name to factor. stiffness: name of its state of stiffness, "" for the frame as stated.

    order: its own order of theory, None for the analysis' own. lean: share of its downward load that acts sideways.
    stated: name of the combination of the file of which this is one of several, for arrangements and either-or cases.
    """

    name: str
    factors: dict[str, float]
    stiffness: str = ""
    order: Literal[1, 2] | None = None
    lean: float = 0.0
    stated: str = ""


@dataclass(frozen=True, slots=True)
class StiffnessState:
    """Factors on stiffness by name of member, section, material or support, and then by property.

    members: I, A, shear_area, E, G, spring_from, spring_to; sections: I, A, shear_area; materials: E, G; supports: x, y,
    rotation. A member's own factor replaces that of its section or material. A factor on E alone is on G too. Self
    weight and temperature keep the stated sections.
    """

    name: str
    members: Mapping[str, Mapping[str, float]] = field(default_factory=dict)
    sections: Mapping[str, Mapping[str, float]] = field(default_factory=dict)
    materials: Mapping[str, Mapping[str, float]] = field(default_factory=dict)
    supports: Mapping[str, Mapping[str, float]] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Pattern:
    """How a load case may lie on its spans (each some members): arrangements "all", "alternate", "adjacent"."""

    case: str
    spans: tuple[tuple[str, ...], ...]
    arrangements: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Envelope:
    """Extremes over these cases and combinations, arrangements and alternatives included."""

    name: str
    names: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Included:
    """A file of sections and materials that the frame file names, as named there, and its checksum."""

    file: str
    sha256: str


@dataclass(frozen=True, slots=True)
class Analysis:
    """The idealisation. `axial_stated` is False where `axial` came from the default (README, Idealisation).

    tolerance: relative tolerance for claims as a fraction (0.01 is 1%).
    """

    axial: Literal["elastic", "rigid"] = "elastic"
    axial_stated: bool = False
    shear: Literal["rigid", "elastic"] = "rigid"
    order: Literal[1, 2] = 1
    tolerance: float = 0.01


@dataclass(frozen=True, eq=False)
class Frame:
    """A whole frame file. Dicts keep the file's order; array indices everywhere follow that order."""

    title: str
    units: Units
    materials: dict[str, Material]
    sections: dict[str, Section]
    joints: dict[str, Joint]
    members: dict[str, Member]
    supports: dict[str, Support]
    cases: dict[str, LoadCase]
    combinations: dict[str, Combination] = field(default_factory=dict)
    analysis: Analysis = field(default_factory=Analysis)
    states: Mapping[str, StiffnessState] = field(default_factory=dict)
    patterns: Mapping[str, Pattern] = field(default_factory=dict)
    exclusive: tuple[tuple[str, ...], ...] = ()
    envelopes: Mapping[str, Envelope] = field(default_factory=dict)
    ties: Mapping[str, Tie] = field(default_factory=dict)
    includes: tuple[Included, ...] = ()
    parted: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    """Combinations as stated that name cases which exclude each other, and those cases: each is parted into several."""
    state: str = ""
    """The state of stiffness that the tables are of; "" for the frame as stated."""
    out_members: frozenset[str] = frozenset()
    out_supports: frozenset[tuple[str, str]] = frozenset()
    """One-way members, and one-way support directions (joint, "x" or "y"), that are taken out in the tables."""
    file: str = ""
    sha256: str = ""
    content: str = ""
    """Checksum of all that makes the frame, tables beside it included, blind to line ends: what a record is of."""
    variant: str = ""
    """Which frame of its file's family it is; "" where the file is no family."""
    warnings: tuple[str, ...] = ()
    lines: Mapping[str, int] = field(default_factory=dict)
    """Line of the file for dotted keys ("loads.dead.apply[0]"), as far as known; for messages only."""

    @cached_property
    def names(self) -> tuple[str, ...]:
        """Every load case and then every combination: what results are given for."""
        return (*self.cases, *self.combinations)

    def meant(self, name: str) -> tuple[str, ...]:
        """The cases and combinations that a name stands for: itself, all that a stated combination became, or those of
        an envelope; none where there is no such name."""
        if name in self.cases or name in self.combinations:
            return (name,)
        if name in self.envelopes:
            return self.envelopes[name].names
        return tuple(one.name for one in self.combinations.values() if one.stated == name)

    @cached_property
    def several(self) -> tuple[str, ...]:
        """Names that stand for several cases or combinations: envelopes, and combinations that became several."""
        known = {*self.cases, *self.combinations, *self.envelopes}
        stated = dict.fromkeys(c.stated for c in self.combinations.values() if c.stated and c.stated not in known)
        return (*self.envelopes, *stated)

    @cached_property
    def joint_index(self) -> dict[str, int]:
        return {name: k for k, name in enumerate(self.joints)}

    @cached_property
    def member_index(self) -> dict[str, int]:
        return {name: k for k, name in enumerate(self.members)}

    @cached_property
    def xy(self) -> Floats:
        """(j, 2) joint coordinates."""
        return np.array([(j.x, j.y) for j in self.joints.values()], dtype=float).reshape(-1, 2)

    def under(self, name: str) -> Frame:
        """The frame as a case or combination has it: its state of stiffness, its order of theory. The loads are those
        of `name` still; what differs from this frame is the same for all names of one state and order."""
        combination = self.combinations.get(name)
        if combination is None:
            return self if not self.state else self._in_state("", self.analysis.order)
        return self._in_state(combination.stiffness, combination.order or self.analysis.order)

    def _in_state(self, state: str, order: Literal[1, 2]) -> Frame:
        if (state, order) == (self.state, self.analysis.order):
            return self
        known = self._situations
        if (state, order) not in known:
            known[state, order] = replace(self, state=state, analysis=replace(self.analysis, order=order))
        return known[state, order]

    @cached_property
    def _situations(self) -> dict[tuple[str, int], Frame]:
        return {}

    @cached_property
    def one_way(self) -> bool:
        """Whether any member or support works one way only."""
        return any(m.only for m in self.members.values()) or any(s.x_only or s.y_only for s in self.supports.values())

    @cached_property
    def member_table(self) -> MemberTable:
        return member_table(self)

    @cached_property
    def variation(self) -> Variation:
        """True sections of the stepped and tapered members."""
        return variation(self)

    @cached_property
    def support_table(self) -> SupportTable:
        stiffness = np.zeros((len(self.joints), 3))
        angle = np.zeros(len(self.joints))
        for support in self.supports.values():
            k = self.joint_index[support.joint]
            stiffness[k] = self._support_stiffness(support)
            angle[k] = support.angle
        cos, sin = np.cos(np.radians(angle)), np.sin(np.radians(angle))
        # Quarter turns are exact: a support at 90 degrees must not leak 1e-17 of a held direction into a free one.
        quarter = np.isclose(angle % 90, 0, rtol=0, atol=1e-12) | np.isclose(angle % 90, 90, rtol=0, atol=1e-12)
        cos, sin = np.where(quarter, np.round(cos), cos), np.where(quarter, np.round(sin), sin)
        return SupportTable(stiffness=stiffness, cos=cos, sin=sin)

    def _support_stiffness(self, support: Support) -> tuple[float, float, float]:
        """With the factors of the state, and without what is taken out."""
        factors = self.states[self.state].supports.get(support.joint, {}) if self.state else {}
        x = FREE if (support.joint, "x") in self.out_supports else support.x
        y = FREE if (support.joint, "y") in self.out_supports else support.y
        return x * factors.get("x", 1.0), y * factors.get("y", 1.0), support.rotation * factors.get("rotation", 1.0)
