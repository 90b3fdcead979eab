"""The frame as plain arrays: sections and materials of the members looked up, a state of stiffness put in.

Data only: what a property does to a member's stiffness is each opinion's own business.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, NamedTuple

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from crosscheck.frame.model import Frame, Member

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]
Factors = Mapping[str, Mapping[str, float]]
"""Of a state of stiffness: by name, and then by property."""

PROPERTIES = ("I", "A", "shear_area")
"""Properties of a section that a state may factor, in the order of `Variation.power`."""


@dataclass(frozen=True, slots=True)
class MemberTable:
    """Members as columns in the frame's member order; NaN where a property is not stated.

    ends: (m, 2) joint indices. turn and zone: (m, 2) end connection stiffness and rigid zone length, `from` end first.
    length: joint to joint; clear: between the zones. cos, sin: direction of local x in global axes.
    Stiffness columns (E, G, I, A, shear_area, turn) hold the factors of the frame's state of stiffness.
    varying: stepped or tapered members: `Frame.variation` holds their true sections, and I, A, shear_area and depth here
    are only means over the length, for judging sizes.
    rigid: axially rigid, by the idealisation or the member's own word. slack: one-way members that are taken out: no
    axial force from their stretch. own_weight: weight per length as stated (mean over the length where varying).
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
    varying: Bools
    rigid: Bools
    slack: Bools
    own_weight: Floats


@dataclass(frozen=True, slots=True)
class Variation:
    """The pieces of all stepped and tapered members as rows (p,), by member and then along it, from joint to joint.

    start, end: distances from the `from` joint. I, A, shear_area, depth: (p, 2) at the start and the end of the piece;
    in between, depth is straight and a property v is v_start (depth/depth_start)**power with the power that fits its
    end. NaN where not stated. `power` columns: I, A, shear_area; 0 where the piece is prismatic.
    weight: (p, 2) weight per length at its ends, by the area as stated in every state, and so with weight_power (p,) of
    its own.
    """

    member: Ints
    start: Floats
    end: Floats
    I: Floats  # noqa: E741
    A: Floats
    shear_area: Floats
    depth: Floats
    weight: Floats
    power: Floats
    weight_power: Floats

    def at(self, rows: Ints, x: Floats) -> tuple[Floats, Floats, Floats, Floats]:
        """I, A, shear_area and depth at distances x (n,) or (n, k) in the pieces `rows` (n,)."""
        across = (len(rows),) + (1,) * (np.ndim(x) - 1)
        start, end = self.start[rows].reshape(across), self.end[rows].reshape(across)
        first, last = self.depth[rows, 0].reshape(across), self.depth[rows, 1].reshape(across)
        depth = first + (last - first) * (x - start) / (end - start)
        ratio = np.where((self.power[rows] != 0.0).any(axis=1).reshape(across), depth / first, 1.0)
        found = [
            v[rows, 0].reshape(across) * ratio ** self.power[rows, k].reshape(across)
            for k, v in enumerate((self.I, self.A, self.shear_area))
        ]
        return found[0], found[1], found[2], depth


@dataclass(frozen=True, slots=True)
class SupportTable:
    """Supports as columns by joint (every joint; FREE where it has none).

    stiffness: (j, 3) along the support's own x, y and rotation: HELD, FREE or a stiffness. cos, sin: (j,) its angle.
    """

    stiffness: Floats
    cos: Floats
    sin: Floats


class _Row(NamedTuple):
    """A section as numbers: effective properties, depth, and the stated area for weight."""

    I: float  # noqa: E741
    A: float
    shear_area: float
    depth: float
    stated_area: float


def member_table(frame: Frame) -> MemberTable:
    """Members as columns, in the frame's order and in its state of stiffness."""
    members = list(frame.members.values())
    index = frame.joint_index
    state = frame.states.get(frame.state)
    ends = np.array([(index[m.joint_from], index[m.joint_to]) for m in members], dtype=np.int64).reshape(-1, 2)
    run = frame.xy[ends[:, 1]] - frame.xy[ends[:, 0]]
    length = np.hypot(run[:, 0], run[:, 1])
    zone = np.array([(m.rigid_from, m.rigid_to) for m in members], dtype=float).reshape(-1, 2)
    sections = _sections(frame, state.sections if state else {})
    materials = _materials(frame, state.materials if state else {})
    t = np.array([materials[m.material] for m in members], dtype=float).reshape(-1, 4)
    s = np.array([sections[m.section] for m in members], dtype=float).reshape(-1, 5)
    turn = np.array([(m.turn_from, m.turn_to) for m in members], dtype=float).reshape(-1, 2)
    varying = np.array([bool(m.pieces) for m in members], dtype=bool)
    if state:
        _own_factors(frame, state.members, s, t, turn)
    if varying.any():
        _means(frame.variation, length, s, varying, t[:, 3])
    rigid = np.array([m.axial == "rigid" for m in members], dtype=bool) | (frame.analysis.axial == "rigid")
    return MemberTable(
        ends=ends,
        length=length,
        clear=length - zone.sum(axis=1),
        cos=run[:, 0] / length,
        sin=run[:, 1] / length,
        turn=turn,
        zone=zone,
        E=t[:, 0], G=t[:, 1], alpha=t[:, 2], weight=t[:, 3],
        I=s[:, 0], A=s[:, 1], shear_area=s[:, 2], depth=s[:, 3],
        varying=varying,
        rigid=rigid,
        slack=np.array([name in frame.out_members for name in frame.members], dtype=bool),
        own_weight=t[:, 3] * s[:, 4],
    )  # fmt: skip


def _sections(frame: Frame, factors: Factors) -> dict[str, _Row]:
    """Every section with the state's factors on it, NaN where a property is not stated."""
    rows = {}
    for section in frame.sections.values():
        f = factors.get(section.name, {})
        I, A, shear_area = (_times(getattr(section, key), f.get(key)) for key in PROPERTIES)  # noqa: E741
        rows[section.name] = _Row(I, A, shear_area, _times(section.depth, None), _times(section.A, None))
    return rows


def _materials(frame: Frame, factors: Factors) -> dict[str, tuple[float, float, float, float]]:
    """E, G, alpha and weight of every material with the state's factors on it."""
    rows = {}
    for m in frame.materials.values():
        f = factors.get(m.name, {})
        rows[m.name] = (
            _times(m.E, f.get("E")), _times(m.G, _shear_factor(f)), _times(m.alpha, None), _times(m.weight, None),
        )  # fmt: skip
    return rows


def _shear_factor(factors: Mapping[str, float]) -> float | None:
    """A softer E is a softer G, unless G has a word of its own."""
    return factors.get("G", factors.get("E"))


def _times(value: float | None, factor: float | None) -> float:
    """Times the factor, if any; NaN where there is no value."""
    return np.nan if value is None else value if factor is None else value * factor


def _own_factors(frame: Frame, factors: Factors, s: Floats, t: Floats, turn: Floats) -> None:
    """Put the factors of single members in place of those of their section or material."""
    for name, own in factors.items():
        if name not in frame.members:  # a frame tried without that member
            continue
        k, member = frame.member_index[name], frame.members[name]
        section, material = frame.sections[member.section], frame.materials[member.material]
        for column, key in enumerate(PROPERTIES):
            if key in own:
                s[k, column] = _times(getattr(section, key), own[key])
        if "E" in own:
            t[k, 0] = material.E * own["E"]
        if "E" in own or "G" in own:
            t[k, 1] = _times(material.G, _shear_factor(own))
        turn[k] *= own.get("spring_from", 1.0), own.get("spring_to", 1.0)


# --- stepped and tapered members


def variation(frame: Frame) -> Variation:
    """The pieces of every stepped or tapered member, in the frame's state of stiffness."""
    state = frame.states.get(frame.state)
    sections = _sections(frame, state.sections if state else {})
    weights = {m.name: _times(m.weight, None) for m in frame.materials.values()}
    index, xy = frame.joint_index, frame.xy
    factors = state.members if state else {}
    rows: list[tuple[float, ...]] = []
    for k, member in enumerate(frame.members.values()):
        if member.pieces:
            run = xy[index[member.joint_to]] - xy[index[member.joint_from]]
            length = float(np.hypot(*run))
            own = factors.get(member.name, {})
            rows += _piece_rows(frame, own, sections, weights[member.material], k, member, length)
    table = np.array(rows, dtype=float).reshape(-1, 13)
    pairs = [table[:, k : k + 2] for k in range(3, 13, 2)]
    depth = pairs[3]
    return Variation(
        member=table[:, 0].astype(np.int64), start=table[:, 1], end=table[:, 2],
        I=pairs[0], A=pairs[1], shear_area=pairs[2], depth=depth, weight=pairs[4],
        power=np.column_stack([_power(pair, depth) for pair in pairs[:3]]), weight_power=_power(pairs[4], depth),
    )  # fmt: skip


def _piece_rows(
    frame: Frame, own: Mapping[str, float], sections: Mapping[str, _Row], weight: float, k: int, member: Member,
    length: float,
) -> list[tuple[float, ...]]:  # fmt: skip
    rows, start = [], 0.0
    for piece in member.pieces:
        values = []
        for name in (piece.first, piece.last):
            stated, row = frame.sections[name], sections[name]
            effective = [_times(getattr(stated, key), own[key]) if key in own else getattr(row, key) for key in PROPERTIES]
            values.append([*effective, row.depth, weight * row.stated_area])
        ends = [v for pair in zip(*values, strict=True) for v in pair]
        end = length if piece.until == 1.0 else piece.until * length
        rows.append((float(k), start, end, *ends))
        start = end
    return rows


def _power(pair: Floats, depth: Floats) -> Floats:
    """(p,) power of depth that takes a property from its value at the start of each piece to that at its end."""
    changes = (depth[:, 0] != depth[:, 1]) & (pair[:, 0] != pair[:, 1]) & np.isfinite(pair + depth).all(axis=1)
    ratio = np.where(changes, pair[:, 1] / np.where(changes, pair[:, 0], 1.0), 1.0)
    base = np.where(changes, depth[:, 1] / np.where(changes, depth[:, 0], 1.0), np.e)
    return np.log(ratio) / np.log(base)


def _means(v: Variation, length: Floats, s: Floats, varying: Bools, weight: Floats) -> None:
    """Put means over the length into the columns of the varying members (I, A, shear_area, depth, stated area)."""
    share = (v.end - v.start) / length[v.member]
    s[varying] = 0.0
    for column, pair in enumerate((v.I, v.A, v.shear_area, v.depth)):
        np.add.at(s[:, column], v.member, share * pair.mean(axis=1))
    heavy = np.isfinite(weight) & (weight != 0.0)
    area = np.where(heavy[v.member], v.weight.mean(axis=1) / np.where(heavy, weight, 1.0)[v.member], np.nan)
    np.add.at(s[:, 4], v.member, share * area)
