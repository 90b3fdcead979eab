"""Statics: does a set of results balance, at every joint, member, hinge and free support, each storey and the whole?

A residual says what is out of balance: other loads, other geometry, a moment where the frame has a hinge, a reaction
where it has no support, or a slip in the pasting. Newton's laws on the undisplaced frame; in second order the forces
balance still, but couples do so only on the displaced frame, so those checks are left unjudged.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import sparse

from crosscheck.answer import CaseAnswer
from crosscheck.audit.completion import BY_RULE, RANK, TOGETHER, Completed, Entries, complete
from crosscheck.audit.equilibrium import (
    FREE_SUPPORT,
    HINGE,
    JOINT,
    MEMBER,
    Equations,
    Sparse,
    end_index,
    equations,
    pieces,
    reaction_index,
    resultants,
    value_vector,
)
from crosscheck.audit.one_way import Part, parts
from crosscheck.frame.kinematics import tied
from crosscheck.frame.loads import LoadTable, load_table
from crosscheck.frame.model import FREE, Bools, Floats, Frame, Ints

ROUND_OFF = 1e-9
"""Of the case's largest force or moment: what arithmetic alone may leave over."""
STOREY, WHOLE, TOGETHER_CHECK = "storey balance", "whole frame", "joints together"
ONE_WAY = "one-way part"
UPRIGHT = 0.8
"""A member whose run is at least this share vertical counts as a column (within 37 degrees of plumb)."""
SECOND_ORDER = "couples balance on the displaced frame only (order = 2)"


@dataclass(frozen=True, slots=True)
class StaticCheck:
    """One balance. residual: the unbalanced force or clockwise couple, in the frame's units and global axes ("along",
    "across": the member's own; free support: the support's own); NaN where it could not be judged.

    check: "joint balance", "member balance", "end release", "free support", "storey balance", "whole frame",
      "joints together" or "one-way part" (a member or support that works one way only; residual is then its force, of
      stretch or along the support's own axis, and ok whether that may be).
    where: joint or member name (empty for the whole frame; levels for a storey); joint: of an end
      release, its joint. component: "fx", "fy", "moment", "along" or "across".
    allowed: rounding of the values times their arms, plus round-off. ok: None where not judged, and `why`.
    used: True where completed values enter.
    """

    case: str
    check: str
    where: str
    residual: float
    allowed: float
    ok: bool | None
    component: str = ""
    joint: str = ""
    why: str = ""
    used: bool = False


@dataclass(frozen=True, slots=True)
class Scales:
    """The case's largest force and moment (largest of loads and values); `length` is the longest member."""

    force: float
    moment: float
    length: float


@dataclass(frozen=True, slots=True)
class Balance:
    """Statics of one case, with what compatibility and the bound need of it again.

    checks: every balance. completed: all values that statics gives. scales: of the case. one_way: the one-way parts.
    """

    case: str
    checks: tuple[StaticCheck, ...]
    completed: Completed
    scales: Scales
    one_way: tuple[Part, ...] = ()

    @property
    def holds(self) -> bool:
        """Every check that could be judged holds, and at least one could be."""
        judged = [c.ok for c in self.checks if c.ok is not None]
        return bool(judged) and all(judged)

    @property
    def fails(self) -> bool:
        """Some check that could be judged does not hold."""
        return any(c.ok is False for c in self.checks)

    @property
    def unjudged(self) -> tuple[StaticCheck, ...]:
        return tuple(c for c in self.checks if c.ok is None)


def statics(
    frame: Frame, name: str, values: CaseAnswer, half: CaseAnswer | None = None
) -> list[StaticCheck]:
    """Every balance of a case, worst kinds not sorted: members, hinges, free supports, joints, storeys, whole frame.

    values: NaN where nothing is said. half: rounding of each value, same shapes (None: exact).
    """
    return list(balance(frame, name, values, half).checks)


def balance(frame: Frame, name: str, values: CaseAnswer, half: CaseAnswer | None = None) -> Balance:
    """Statics of a case with its completed values."""
    loads = load_table(frame, name)
    system = equations(frame, name, loads)
    given = value_vector(values, system.ties)
    rounding = np.zeros_like(given) if half is None else np.nan_to_num(value_vector(half, system.ties))
    scales = _scales(frame, loads, given, system.value_couples)
    completed = complete(system, given, rounding, scales.length)
    judge = _Judge(frame, name, system, completed, scales)
    one_way = parts(frame, loads, completed, ROUND_OFF * scales.force) if frame.one_way else []
    checks = [*judge.rows(), *judge.joints_together(), *_cuts(frame, loads, judge), *_one_way(name, one_way)]
    return Balance(name, tuple(checks), completed, scales, tuple(one_way))


def _one_way(case: str, found: list[Part]) -> list[StaticCheck]:
    """Whether parts that work one way are claimed to work that way; one whose force is not known is not judged."""
    component = {"": "along", "x": "fx", "y": "fy"}
    return [
        StaticCheck(case, ONE_WAY, p.where, p.force, p.allowed, None if np.isnan(p.force) else not p.wrong,
                    component[p.axis], "", "its force is not known" if np.isnan(p.force) else "")
        for p in found
    ]  # fmt: skip


def _scales(frame: Frame, loads: LoadTable, values: Floats, couples: Bools) -> Scales:
    """Largest force and moment among loads and values; a moment scale no less than force times the longest member."""
    length = float(frame.member_table.length.max(initial=0.0)) or 1.0
    size = np.abs(np.nan_to_num(values))
    member = np.abs(resultants(pieces(loads), len(frame.members)))
    force = max(
        size[~couples].max(initial=0.0), np.abs(loads.joint[:, :2]).max(initial=0.0), member[:, :2].max(initial=0.0)
    )
    moment = max(
        size[couples].max(initial=0.0), np.abs(loads.joint[:, 2]).max(initial=0.0),
        np.abs(loads.point_couple).max(initial=0.0), force * length,
    )  # fmt: skip
    return Scales(float(force), float(moment), length)


class _Judge:
    """Turns rows over the values into checks, with the rounding of every value carried through."""

    def __init__(self, frame: Frame, case: str, system: Equations, done: Completed, scales: Scales) -> None:
        self.frame, self.case, self.system, self.done, self.scales = frame, case, system, done, scales
        self.joints, self.members = list(frame.joints), list(frame.members)
        self.filled = np.nan_to_num(done.value)

    def measure(self, rows: Sparse, constant: Floats, couples: Bools) -> tuple[Floats, Floats, Bools, Bools]:
        """Residual, allowed, "could be judged" and "completed values enter" of every row."""
        residual = rows @ self.filled + constant
        carried = abs(rows @ self.done.combination) @ self.done.half
        floor = ROUND_OFF * np.where(couples, self.scales.moment, self.scales.force)
        pattern = abs(rows)
        judged = (pattern @ self.done.missing.astype(float)) == 0
        used = (pattern @ self.done.completed.astype(float)) > 0
        return residual, carried + floor, judged, used

    def rows(self) -> list[StaticCheck]:
        """One check an equation; a block that was used for completing keeps only what is left over.

        Nothing is said of a direction without support where nobody claims a reaction.
        """
        s = self.system
        matrix, constant, lost = self._without_used(s.matrix, s.constant)
        residual, allowed, judged, used = self.measure(matrix, constant, s.couples)
        judged &= ~lost
        by_rule = np.array([kind in (HINGE, FREE_SUPPORT) for kind in s.kind])
        spoken = abs(s.matrix) @ (self.done.by != BY_RULE).astype(float) > 0
        unsupported = (self.frame.support_table.stiffness == FREE).all(axis=1)
        idle = np.array([kind == FREE_SUPPORT for kind in s.kind])
        idle[idle] = unsupported[s.place[idle]]
        shown = (~by_rule | spoken) & ~(idle & (residual == 0)) & ~(lost & self._for_ties_alone())
        # What still holds the force of a tie after that balances the tied joints together, not this one alone.
        together = abs(matrix) @ s.tie_values.astype(float) > RANK
        return [
            self._check(k, float(residual[k]), float(allowed[k]), bool(judged[k]), bool(used[k]), bool(together[k]))
            for k in np.flatnonzero(shown).tolist()
        ]

    def _for_ties_alone(self) -> Bools:
        """(e,) rows of blocks that gave the forces of ties, which nobody claims, and nothing else: no want of the claim."""
        s = self.system
        gave = self.done.by >= 0
        blocks = np.unique(self.done.by[gave & s.tie_values])
        other = np.unique(np.concatenate([
            self.done.by[gave & ~s.tie_values], s.block[(abs(s.matrix) @ self.done.missing.astype(float)) > 0],
        ]))  # fmt: skip
        return np.isin(s.block, np.setdiff1d(blocks, other))

    def _without_used(self, matrix: Sparse, constant: Floats) -> tuple[Sparse, Floats, Bools]:
        """The equations less what completing has used up, and which rows say nothing any more.

        Within a block, the columns of values that it gave, or that are still missing, are projected out: what
        remains holds no trace of them. A row whose own share of that remainder is nil is no check.
        """
        lost = np.zeros(len(constant), dtype=bool)
        touched = self._used_blocks()
        if not len(touched):
            return matrix, constant, lost
        scale = np.where(self.system.couples, 1 / self.scales.length, 1.0)
        taken, rows = self._used_up(touched, scale)
        there = (rows[:, :, None] >= 0) & (rows[:, None, :] >= 0)
        row = np.broadcast_to(rows[:, :, None], there.shape)[there]
        column = np.broadcast_to(rows[:, None, :], there.shape)[there]
        entry = taken[there] * scale[column] / scale[row]
        own = np.diagonal(taken, axis1=1, axis2=2)
        lost[rows[rows >= 0]] = 1 - own[rows >= 0] < 1e-6
        project: Sparse = sparse.eye_array(len(constant)) - sparse.coo_array(
            (entry, (row, column)), shape=(len(constant), len(constant))
        )
        project = project.tocsr()
        return (project @ matrix).tocsr(), project @ constant, lost

    def _used_blocks(self) -> Ints:
        """Blocks that gave a value or still miss one."""
        s = self.system
        missing_rows = (abs(s.matrix) @ self.done.missing.astype(float)) > 0
        return np.unique(np.concatenate([s.block[missing_rows], self.done.by[self.done.by >= 0]]))

    def _used_up(self, blocks: Ints, scale: Floats) -> tuple[Floats, Ints]:
        """(b, r, r) projectors of each block's rows on what its used values can account for, and those rows (b, r).

        Rows that no used value enters are left alone, and do not appear.
        """
        s = self.system
        columns = sparse.diags_array(np.where(s.value_couples, self.scales.length, 1.0))
        scaled: Sparse = sparse.diags_array(scale) @ s.matrix @ columns
        entries = Entries.of(scaled, s.block)
        used = self.done.missing[entries.column] | (self.done.by[entries.column] == entries.block)
        stack = entries.only(used & np.isin(entries.block, blocks)).stack()
        taken = stack.dense @ np.linalg.pinv(stack.dense, rcond=RANK)
        taken[np.abs(taken) < 1e-12] = 0.0
        return taken, stack.rows

    def _check(
        self, k: int, residual: float, allowed: float, judged: bool, used: bool, together: bool
    ) -> StaticCheck:
        s = self.system
        kind, place = s.kind[k], int(s.place[k])
        if together and judged:
            rows = s.matrix[:, s.tie_values & (abs(s.matrix[[k]]).sum(axis=0) > 0)].tocoo().coords[0]
            names = ", ".join(self.joints[p] for p in np.unique(s.place[rows]).tolist())
            return self.check(TOGETHER_CHECK, names, s.component[k], residual, allowed, judged, used)
        where = self.members[place] if kind in (MEMBER, HINGE) else self.joints[place]
        joint = self.joints[int(self.frame.member_table.ends[place, s.end[k]])] if kind == HINGE else ""
        return self.check(kind, where, s.component[k], residual, allowed, judged, used, joint)

    def check(
        self, kind: str, where: str, component: str, residual: float, allowed: float, judged: bool, used: bool,
        joint: str = "", why: str = "needed to complete the claim, or lacking values",
    ) -> StaticCheck:  # fmt: skip
        """A check, left unjudged where it must be."""
        if self.frame.analysis.order == 2 and component == "moment" and kind in (MEMBER, HINGE, WHOLE):
            judged, why = False, SECOND_ORDER
        if not judged:
            return StaticCheck(self.case, kind, where, float("nan"), allowed, None, component, joint, why, used)
        ok = abs(residual) <= allowed
        return StaticCheck(self.case, kind, where, residual, allowed, ok, component, joint, "", used)

    def joints_together(self) -> list[StaticCheck]:
        """Where values stay missing at several joints at once, what their equations say whatever the missing ones are.

        The unbalance is the Euclidean norm of what the missing values cannot account for, couples as forces at
        the longest member; rounding enters by the norm of what it may put in, which is rigorous.
        """
        missing = np.flatnonzero(self.done.missing)
        if not len(missing):
            return []
        s = self.system
        rows = np.unique(s.matrix[:, missing].tocoo().coords[0])
        inside = np.unique(s.matrix[rows].indices)
        columns = inside[self.done.missing[inside] | (self.done.completed & (self.done.by != BY_RULE))[inside]]
        if len(columns) > TOGETHER:
            return [self.check(TOGETHER_CHECK, "", "force", 0.0, 0.0, False, True, why="too many values are missing")]
        scale = np.where(s.couples[rows], 1 / self.scales.length, 1.0)
        orthogonal, weights = self._range(rows, columns, scale)
        residual, allowed, _, used = self.measure(s.matrix[rows], s.constant[rows], s.couples[rows])
        left = scale * residual - orthogonal @ (orthogonal.T @ (scale * residual))
        if len(rows) - weights < 1:
            return []
        names = sorted({self.joints[p] for p, k in zip(s.place[rows], rows, strict=True) if s.kind[k] == JOINT})
        return [
            self.check(
                TOGETHER_CHECK, ", ".join(names), "force", float(np.linalg.norm(left)),
                float(np.linalg.norm(scale * allowed)), True, bool(used.any()),
            )
        ]  # fmt: skip

    def _range(self, rows: Ints, columns: Ints, scale: Floats) -> tuple[Floats, int]:
        """Orthonormal basis of what the values of `columns` can account for, and its rank."""
        couples = self.system.value_couples[columns]
        dense = scale[:, None] * self.system.matrix[rows][:, columns].toarray()
        dense = dense * np.where(couples, self.scales.length, 1.0)
        left, size, _ = np.linalg.svd(dense, full_matrices=False)
        rank = int((size > RANK * max(size.max(initial=0.0), 1e-300)).sum())
        return left[:, :rank], rank


def _cuts(frame: Frame, loads: LoadTable, judge: _Judge) -> list[StaticCheck]:
    """Storeys from the ground up, then the whole frame."""
    labels: list[tuple[str, str, str]] = []
    rows: list[Sparse] = []
    constants: list[float] = []
    for where, above in storeys(frame):
        row, constant = _part_above(frame, loads, above)
        labels.append((STOREY, where, "fx"))
        rows.append(row)
        constants.append(constant)
    whole, total = _whole(frame, loads)
    labels += [(WHOLE, "", component) for component in ("fx", "fy", "moment")]
    matrix = sparse.vstack([*rows, whole]).tocsr()
    couples = np.array([component == "moment" for _, _, component in labels])
    residual, allowed, judged, used = judge.measure(matrix, np.concatenate([constants, total]), couples)
    # A completed reaction comes out of the very equations that add up to the whole frame: no independent check.
    member = (judge.done.by >= 0) & (judge.done.by < len(frame.members))
    by_joint = judge.done.completed & ~member & (judge.done.by != BY_RULE)
    judged &= (abs(matrix) @ by_joint.astype(float)) == 0
    return [
        judge.check(kind, where, component, float(residual[k]), float(allowed[k]), bool(judged[k]), bool(used[k]))
        for k, (kind, where, component) in enumerate(labels)
    ]


def storeys(frame: Frame) -> list[tuple[str, Bools]]:
    """Every level between two heights of joints at which only columns (at least two) and braces are cut.

    Each comes as its levels in words and the (j,) joints above it. A gap between levels is a storey where at least
    two members cut by it stand upright and the part above is held by no more than members and supports.
    """
    t = frame.member_table
    y = frame.xy[:, 1]
    levels = np.unique(y)
    if len(levels) < 2:
        return []
    # Heights that differ by less than a thousandth of the frame are one level.
    fresh = np.concatenate([[True], np.diff(levels) > 1e-3 * (levels[-1] - levels[0])])
    low = levels[fresh]
    high = np.concatenate([levels[np.flatnonzero(fresh)[1:] - 1], levels[-1:]])
    foot, head = np.minimum(y[t.ends[:, 0]], y[t.ends[:, 1]]), np.maximum(y[t.ends[:, 0]], y[t.ends[:, 1]])
    upright = np.abs(t.sin) >= UPRIGHT
    found = []
    for top_below, bottom_above in zip(high[:-1], low[1:], strict=True):
        cut = (foot <= top_below) & (head >= bottom_above)
        if (cut & upright).sum() >= 2:
            found.append((f"y = {top_below:.6g} to {bottom_above:.6g}", y >= bottom_above))
    return found


def _part_above(frame: Frame, loads: LoadTable, above: Bools) -> tuple[Sparse, float]:
    """Horizontal balance of everything above a cut through the heads of the columns: row over the values, constant."""
    t = frame.member_table
    m = len(t.length)
    upper = above[t.ends]
    load = resultants(pieces(loads), m)
    inside = upper.all(axis=1)
    across_cut = upper[:, 0] != upper[:, 1]
    constant = loads.joint[above, 0].sum() + (load[:, 0] * t.cos - load[:, 1] * t.sin)[inside].sum()
    cut = np.flatnonzero(across_cut)
    end = np.where(upper[cut, 1], 1, 0)
    pull = np.where(end == 1, 1.0, -1.0)
    columns = np.concatenate([
        end_index(cut, end, 0), end_index(cut, end, 1), reaction_index(m, np.flatnonzero(above), 0),
    ])  # fmt: skip
    entries = np.concatenate([-pull * t.cos[cut], t.sin[cut], np.ones(int(above.sum()))])
    row = sparse.coo_array(
        (entries, (np.zeros(len(columns), dtype=int), columns)), shape=(1, 6 * m + 3 * len(above))
    )
    ties = tied(frame)[:, 3 * np.flatnonzero(above)].sum(axis=1)
    return sparse.hstack([row, _cleared(np.asarray(ties).reshape(1, -1))]).tocsr(), float(constant)


def _cleared(entries: Floats) -> Sparse:
    """Without what rounding alone leaves."""
    return sparse.csr_array(np.where(np.abs(entries) > RANK, entries, 0.0))


def _whole(frame: Frame, loads: LoadTable) -> tuple[Sparse, Floats]:
    """fx, fy and clockwise moment about the middle of the joints, of all reactions and all loads."""
    t = frame.member_table
    m, j = len(t.length), len(frame.joints)
    arm = frame.xy - frame.xy.mean(axis=0)
    every = np.arange(j)
    entries = [
        (np.zeros(j), reaction_index(m, every, 0), np.ones(j)),
        (np.ones(j), reaction_index(m, every, 1), np.ones(j)),
        (np.full(j, 2), reaction_index(m, every, 0), arm[:, 1]),
        (np.full(j, 2), reaction_index(m, every, 1), -arm[:, 0]),
        (np.full(j, 2), reaction_index(m, every, 2), np.ones(j)),
    ]
    row, column, entry = (np.concatenate([e[k] for e in entries]) for k in range(3))
    matrix = sparse.coo_array((entry, (row.astype(int), column)), shape=(3, 6 * m + 3 * j)).tocsr()
    # A tie's forces add up to nothing; where its joints do not lie along it they make a couple.
    pull = tied(frame).toarray().reshape(-1, j, 3)
    turn = (pull[..., 0] @ arm[:, 1] - pull[..., 1] @ arm[:, 0]) / float(t.length.max())
    ties = np.zeros((3, len(pull)))
    ties[2] = np.where(np.abs(turn) > RANK, turn * float(t.length.max()), 0.0)
    matrix = sparse.hstack([matrix, sparse.csr_array(ties)]).tocsr()
    load = resultants(pieces(loads), m)
    fx, fy = load[:, 0] * t.cos - load[:, 1] * t.sin, load[:, 0] * t.sin + load[:, 1] * t.cos
    start = arm[t.ends[:, 0]]
    moment = load[:, 2] + fx * start[:, 1] - fy * start[:, 0]
    joint = loads.joint
    turning = joint[:, 2] + joint[:, 0] * arm[:, 1] - joint[:, 1] * arm[:, 0]
    constant = np.array([fx.sum() + joint[:, 0].sum(), fy.sum() + joint[:, 1].sum(), moment.sum() + turning.sum()])
    return matrix, constant


CHECKS = (MEMBER, HINGE, FREE_SUPPORT, JOINT, STOREY, WHOLE, TOGETHER_CHECK, ONE_WAY)
"""Every kind of check, in the order they come."""
