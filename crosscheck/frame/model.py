"""The frame as stated: frozen dataclasses in the frame's own units, and plain arrays of the same data.

Axes and signs are those of the README: global x right and y up; a member's local x runs from its `from` joint to its
`to` joint, local y is 90 degrees counter-clockwise from that; rotations and couples are clockwise positive.
Every number is in the frame's units of force and length (and degrees Celsius for temperatures).
Nothing here knows stiffness: opinions make their own products of these numbers.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from typing import Literal

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]

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
class Member:
    """A straight member between two joints.

    turn_from, turn_to: rotational stiffness of the end connection (moment per radian): HELD for a rigid end, FREE for
    a hinge, otherwise a spring. rigid_from, rigid_to: lengths of the rigid end zones. From the joint inward come the
    rigid zone, then the connection, then the flexible part.
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


@dataclass(frozen=True, slots=True)
class Support:
    """HELD, FREE or a stiffness along each of the support's own axes; `angle` (degrees) turns them."""

    joint: str
    x: float
    y: float
    rotation: float
    angle: float = 0.0


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


Load = (
    JointForce | JointCouple | Settlement | PointForce | PointCouple | Spread | Temperature | Misfit | SelfWeight
)
"""`entry` is the index in the case's `apply` list: dead[0] is entry 0 of case dead. One entry may make several."""


@dataclass(frozen=True, slots=True)
class LoadCase:
    """expected: what the take-down says the case adds up to, by direction word ("down": force)."""

    name: str
    loads: tuple[Load, ...]
    expected: dict[str, float] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Combination:
    """factors: load case name to factor."""

    name: str
    factors: dict[str, float]


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


@dataclass(frozen=True, slots=True)
class MemberTable:
    """Members as columns in the frame's member order; NaN where a property is not stated.

    ends: (m, 2) joint indices. turn and zone: (m, 2) end connection stiffness and rigid zone length, `from` end first.
    length: joint to joint; clear: between the zones. cos, sin: direction of local x in global axes.
    """

    ends: Ints
    length: Floats
    clear: Floats
    cos: Floats
    sin: Floats
    turn: Floats
    zone: Floats
    E: Floats
    G: Floats
    I: Floats  # noqa: E741
    A: Floats
    shear_area: Floats
    depth: Floats
    alpha: Floats
    weight: Floats


@dataclass(frozen=True, slots=True)
class SupportTable:
    """Supports as columns by joint (every joint; FREE where it has none).

    stiffness: (j, 3) along the support's own x, y and rotation: HELD, FREE or a stiffness. cos, sin: (j,) its angle.
    """

    stiffness: Floats
    cos: Floats
    sin: Floats


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

    @cached_property
    def member_table(self) -> MemberTable:
        members = list(self.members.values())
        index = self.joint_index
        ends = np.array([(index[m.joint_from], index[m.joint_to]) for m in members], dtype=np.int64).reshape(-1, 2)
        run = self.xy[ends[:, 1]] - self.xy[ends[:, 0]]
        length = np.hypot(run[:, 0], run[:, 1])
        zone = np.array([(m.rigid_from, m.rigid_to) for m in members], dtype=float).reshape(-1, 2)
        section_rows = {s.name: (s.I, s.A, s.shear_area, s.depth) for s in self.sections.values()}
        material_rows = {t.name: (t.E, t.G, t.alpha, t.weight) for t in self.materials.values()}
        s = np.array([section_rows[m.section] for m in members], dtype=float).reshape(-1, 4)
        t = np.array([material_rows[m.material] for m in members], dtype=float).reshape(-1, 4)
        return MemberTable(
            ends=ends,
            length=length,
            clear=length - zone.sum(axis=1),
            cos=run[:, 0] / length,
            sin=run[:, 1] / length,
            turn=np.array([(m.turn_from, m.turn_to) for m in members], dtype=float).reshape(-1, 2),
            zone=zone,
            E=t[:, 0], G=t[:, 1], alpha=t[:, 2], weight=t[:, 3],
            I=s[:, 0], A=s[:, 1], shear_area=s[:, 2], depth=s[:, 3],
        )  # fmt: skip

    @cached_property
    def support_table(self) -> SupportTable:
        stiffness = np.zeros((len(self.joints), 3))
        angle = np.zeros(len(self.joints))
        for support in self.supports.values():
            k = self.joint_index[support.joint]
            stiffness[k] = support.x, support.y, support.rotation
            angle[k] = support.angle
        cos, sin = np.cos(np.radians(angle)), np.sin(np.radians(angle))
        # Quarter turns are exact: a support at 90 degrees must not leak 1e-17 of a held direction into a free one.
        quarter = np.isclose(angle % 90, 0, rtol=0, atol=1e-12) | np.isclose(angle % 90, 90, rtol=0, atol=1e-12)
        cos, sin = np.where(quarter, np.round(cos), cos), np.where(quarter, np.round(sin), sin)
        return SupportTable(stiffness=stiffness, cos=cos, sin=sin)
