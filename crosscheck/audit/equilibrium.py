"""The equations of equilibrium of every joint, member, hinge and free support direction, as one sparse table.

The unknowns of statics are laid out as one vector of `values`: the end actions of every member (axial, shear, moment
at the `from` end, then at the `to` end), then the reactions of every joint (fx, fy, moment), and then the forces in the
ties, which nobody claims: one for each further joint of a tie, acting on it along the tie and the other way on the tie's
first joint (the transpose of kinematics.tied). An equation is a row `matrix @ values + constant = 0`; what is left over
when claimed values are put in is an unbalanced force or couple.
Newton's laws for a rigid body (Principia, 1687) on the undisplaced frame; no stiffness enters.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy import sparse

from crosscheck.answer import CaseAnswer
from crosscheck.frame.kinematics import tied
from crosscheck.frame.loads import LoadTable, load_table
from crosscheck.frame.model import FREE, Bools, Floats, Frame, Ints

Sparse = Any
"""A scipy sparse array in row form (its stubs are not precise enough to be worth a stricter name)."""

AXIAL, SHEAR, MOMENT = range(3)
MEMBER, JOINT, HINGE, FREE_SUPPORT = "member balance", "joint balance", "end release", "free support"


@dataclass(frozen=True, slots=True)
class Equations:
    """matrix: (e, v) rows over the values; constant: (e,) what the loads put in.

    kind, component: what each row balances; component is "fx", "fy" (forces) or "moment", and "along", "across" for
    a member's own axes. place: (e,) member index for member and hinge rows, else joint index. end: (e,) of a hinge row.
    block: (e,) rows of one member, or of one joint, share a block: they are completed and judged together.
    members, joints, ties: counts (ties: of values).
    """

    matrix: Sparse
    constant: Floats
    kind: tuple[str, ...]
    component: tuple[str, ...]
    place: Ints
    end: Ints
    block: Ints
    members: int
    joints: int
    ties: int

    @property
    def value_couples(self) -> Bools:
        """(v,) True where a value is a moment."""
        return couple_values(self.members, self.joints, self.ties)

    @property
    def tie_values(self) -> Bools:
        """(v,) True where a value is the force in a tie."""
        own = 6 * self.members + 3 * self.joints
        return np.arange(own + self.ties) >= own

    @property
    def couples(self) -> Bools:
        """(e,) True where a row balances couples rather than forces."""
        return np.array([c == "moment" for c in self.component], dtype=bool)


def end_index(member: Ints | int, end: Ints | int, quantity: int) -> Ints:
    """Place of an end action in the vector of values."""
    return np.asarray(6 * np.asarray(member) + 3 * np.asarray(end) + quantity, dtype=np.int64)


def reaction_index(members: int, joint: Ints | int, component: int) -> Ints:
    """Place of a reaction component in the vector of values."""
    return np.asarray(6 * members + 3 * np.asarray(joint) + component, dtype=np.int64)


def value_vector(values: CaseAnswer, ties: int) -> Floats:
    """(6 m + 3 j + ties,) end actions, reactions and (nobody's word) ties in one row; NaN where nothing is said."""
    return np.concatenate([values.ends.ravel(), values.reactions.ravel(), np.full(ties, np.nan)])


def couple_values(members: int, joints: int, ties: int) -> Bools:
    """(6 m + 3 j + ties,) True where a value is a moment."""
    return np.concatenate([np.tile([False, False, True], 2 * members + joints), np.zeros(ties, dtype=bool)])


@dataclass(frozen=True, slots=True)
class Pieces:
    """A load table as point loads and linear stretches: the same few columns for every use of statics.

    point: (p, 5) at, along, across, couple and member; line: (q, 7) start, end, along (2), across (2) and member.
    """

    point: Floats
    line: Floats


def pieces(loads: LoadTable) -> Pieces:
    """The member loads of a table as columns."""
    point = np.column_stack([
        loads.point_at, loads.point_along, loads.point_across, loads.point_couple, loads.point_member,
    ])  # fmt: skip
    line = np.column_stack([
        loads.line_start, loads.line_end, loads.line_along, loads.line_across, loads.line_member,
    ])  # fmt: skip
    return Pieces(point, line)


def resultants(part: Pieces, count: int) -> Floats:
    """(m, 3) of every member's loads: force along, force across, and clockwise moment about the `from` joint."""
    total = np.zeros((count, 3))
    at, along, across, couple, member = part.point.T
    np.add.at(total, member.astype(int), np.column_stack([along, across, couple - across * at]))
    start, end, along0, along1, across0, across1, member = part.line.T
    width = end - start
    # A linear stretch is two triangles, with their centroids at the thirds.
    moment = width / 2 * (across0 * (start + width / 3) + across1 * (end - width / 3))
    forces = np.column_stack([width * (along0 + along1) / 2, width * (across0 + across1) / 2, -moment])
    np.add.at(total, member.astype(int), forces)
    return total


def zone_moment(part: Pieces, length: Floats, zone: Floats, at_end: int) -> Floats:
    """(m,) sagging moment that the loads on the rigid zone at one end alone put on its inner face.

    The face lies at zone from the `from` end (at_end 0) or at length - zone (at_end 1). Loads at the face itself
    act inside the connection, so they do not count (loads.LoadTable).
    """
    total = np.zeros(len(length))
    face = zone if at_end == 0 else length - zone
    side = 1.0 if at_end == 0 else -1.0
    at, _, across, couple, member = part.point.T
    member = member.astype(int)
    outside = side * (face[member] - at) > 0
    lever = np.abs(face[member] - at)
    np.add.at(total, member[outside], (across * lever + side * couple)[outside])
    start, end, _, _, across0, across1, member = part.line.T
    member = member.astype(int)
    limit = face[member]
    first, last = (start, np.minimum(end, limit)) if at_end == 0 else (np.maximum(start, limit), end)
    wide = last > first
    slope = np.divide(across1 - across0, end - start, out=np.zeros_like(end), where=end > start)
    w0, w1 = across0 + slope * (first - start), across0 + slope * (last - start)
    width = last - first
    lever0, lever1 = np.abs(limit - (first + width / 3)), np.abs(limit - (last - width / 3))
    np.add.at(total, member[wide], (width / 2 * (w0 * lever0 + w1 * lever1))[wide])
    return total


class _Rows:
    """Collects equations as triplets."""

    def __init__(self) -> None:
        self.row: list[Ints] = []
        self.column: list[Ints] = []
        self.entry: list[Floats] = []
        self.constant: list[Floats] = []
        self.kind: list[str] = []
        self.component: list[str] = []
        self.place: list[Ints] = []
        self.end: list[Ints] = []
        self.block: list[Ints] = []
        self.count = 0

    def add(
        self, kind: str, component: str, place: Ints, block: Ints, constant: Floats, terms: list[tuple[Ints, Floats]],
        end: int = 0,
    ) -> None:  # fmt: skip
        """One row for each entry of `place`; each term is a column index and its entry for every row."""
        rows = self.count + np.arange(len(place))
        for column, entry in terms:
            self.row.append(rows)
            self.column.append(np.broadcast_to(column, rows.shape))
            self.entry.append(np.broadcast_to(entry, rows.shape))
        self.constant.append(np.broadcast_to(constant, rows.shape))
        self.kind += [kind] * len(place)
        self.component += [component] * len(place)
        self.place.append(place)
        self.block.append(block)
        self.end.append(np.full(len(place), end, dtype=np.int64))
        self.count += len(place)


def equations(frame: Frame, name: str, loads: LoadTable | None = None) -> Equations:
    """Every equation of equilibrium of a case or combination."""
    loads = load_table(frame, name) if loads is None else loads
    m, j = len(frame.members), len(frame.joints)
    part = pieces(loads)
    rows = _Rows()
    _member_rows(rows, frame, part)
    _hinge_rows(rows, frame, part)
    _free_support_rows(rows, frame)
    matrix = sparse.coo_array(
        (np.concatenate(rows.entry), (np.concatenate(rows.row), np.concatenate(rows.column))),
        shape=(rows.count, 6 * m + 3 * j),
    ).tocsr()
    matrix.eliminate_zeros()
    joint_matrix, joint_constant = _joint_rows(frame, loads)
    pull = tied(frame).T.tocsr()
    pull.eliminate_zeros()
    ties = pull.shape[1]
    whole = sparse.block_array([[matrix, sparse.csr_array((rows.count, ties))], [joint_matrix, pull]]).tocsr()
    every = np.arange(j)
    return Equations(
        matrix=whole,
        constant=np.concatenate([*rows.constant, joint_constant]),
        kind=(*rows.kind, *[JOINT] * (3 * j)),
        component=(*rows.component, *["fx", "fy", "moment"] * j),
        place=np.concatenate([*rows.place, np.repeat(every, 3)]),
        end=np.concatenate([*rows.end, np.zeros(3 * j, dtype=np.int64)]),
        block=np.concatenate([*rows.block, m + np.repeat(every, 3)]),
        members=m,
        joints=j,
        ties=ties,
    )


def _member_rows(rows: _Rows, frame: Frame, part: Pieces) -> None:
    """Along, across and about the `from` joint, for every member joint to joint."""
    t = frame.member_table
    every = np.arange(len(t.length))
    load = resultants(part, len(every))
    one = np.ones(len(every))
    at = [[end_index(every, e, q) for q in range(3)] for e in range(2)]
    rows.add(MEMBER, "along", every, every, load[:, 0], [(at[0][AXIAL], -one), (at[1][AXIAL], one)])
    rows.add(MEMBER, "across", every, every, load[:, 1], [(at[0][SHEAR], one), (at[1][SHEAR], one)])
    turning = [(at[0][MOMENT], one), (at[1][MOMENT], one), (at[1][SHEAR], -t.length)]
    rows.add(MEMBER, "moment", every, every, load[:, 2], turning)


def _hinge_rows(rows: _Rows, frame: Frame, part: Pieces) -> None:
    """No moment at a hinge: the moment at the joint is that of the shear and the loads over the rigid zone."""
    t = frame.member_table
    for end, sign in ((0, 1.0), (1, -1.0)):
        hinged = np.flatnonzero(t.turn[:, end] == FREE)
        zone = t.zone[:, end]
        moment = zone_moment(part, t.length, zone, end)
        terms = [
            (end_index(hinged, end, MOMENT), np.full(len(hinged), sign)),
            (end_index(hinged, end, SHEAR), zone[hinged]),
        ]
        rows.add(HINGE, "moment", hinged, hinged, moment[hinged], terms, end=end)


def _free_support_rows(rows: _Rows, frame: Frame) -> None:
    """No reaction in a direction that is not supported, along the support's own axes."""
    s = frame.support_table
    m = len(frame.members)
    for axis, component in enumerate(("fx", "fy", "moment")):
        free = np.flatnonzero(s.stiffness[:, axis] == FREE)
        cos, sin = s.cos[free], s.sin[free]
        share = ((cos, sin), (-sin, cos))[axis] if axis < 2 else (np.ones(len(free)),)
        columns = (0, 1) if axis < 2 else (2,)
        terms = [(reaction_index(m, free, c), part) for c, part in zip(columns, share, strict=True)]
        rows.add(FREE_SUPPORT, component, free, m + free, np.zeros(len(free)), terms)


def _joint_rows(frame: Frame, loads: LoadTable) -> tuple[Sparse, Floats]:
    """(3 j) rows fx, fy, moment at each joint: loads and reactions on it, less the end actions on its members."""
    t = frame.member_table
    m, j = len(t.length), len(frame.joints)
    every = np.arange(m)
    triplets: list[tuple[Ints, Ints, Floats]] = []
    for end, pull in ((0, -1.0), (1, 1.0)):
        at = 3 * t.ends[:, end]
        axial, shear, moment = (end_index(every, end, q) for q in range(3))
        # Internal tension acts on the member along -x at `from` and along +x at `to`.
        triplets += [
            (at, axial, -pull * t.cos), (at, shear, t.sin),
            (at + 1, axial, -pull * t.sin), (at + 1, shear, -t.cos),
            (at + 2, moment, -np.ones(m)),
        ]  # fmt: skip
    triplets.append((np.arange(3 * j), 6 * m + np.arange(3 * j), np.ones(3 * j)))
    row, column, entry = (np.concatenate([x[k] for x in triplets]) for k in range(3))
    matrix = sparse.coo_array((entry, (row, column)), shape=(3 * j, 6 * m + 3 * j)).tocsr()
    return matrix, loads.joint.ravel()
