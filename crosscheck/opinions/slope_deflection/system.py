"""Joint moment equations and translation equations, solved together.

Unknowns are dx, dy and rotation of each joint along its support's axes. B takes them to the deformations of each
member: the rotation of each end against the chord and the elongation. Equilibrium of the joints is the transpose of the
same B (virtual work), so one matrix serves any geometry, square or not.

Axially rigid members keep the same sparse matrix: an elongation stiffness `penalty` takes the place of EA/l, and the
axial force is corrected by penalty times what elongation remains until none does (method of multipliers, Hestenes 1969
and Powell 1969). Moments and axial forces are accumulated from corrections, and the residual is formed from them and
not from the matrix, so that joints balance to rounding. Ties are kept by the same means: how far their joints move apart
along them is one more deformation that may not occur.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.sparse as sp

from crosscheck.answer import CaseAnswer, Undetermined
from crosscheck.frame.loads import LoadTable, direction_cosines
from crosscheck.frame.model import FREE, HELD, Floats, Frame
from crosscheck.opinions.slope_deflection.members import Coefficients, FixedEnds, coefficients, end_actions, fixed_ends

PENALTY = 1e6
"""Elongation stiffness of an axially rigid member in units of the frame's largest 12 EI/l^3."""
FIRM = 1e4
"""The least it is in units of the largest EA/l of elastic members: each round of correction wins so much."""
ROUNDS = 40
"""Most rounds of correction; three to five are usual."""
FEWEST = 4
"""After so many rounds, corrections that no longer halve are rounding noise and end the rounds too."""
TRACE = 1e-6
"""Share of the largest 12 EI/l^3 times the largest displacement that counts as an action where there is none larger."""
FEW = 16
"""Cases up to which values are looked through case by case."""
UNMOVED = 1e-9
"""Displacements below this share of the largest force over the largest stiffness are none."""
STILL = 1e-15
"""Corrections below this share of the displacements end the rounds."""

Sparse = Any


class System:
    """The equations of one frame, factorised once for all its cases."""

    def __init__(self, frame: Frame) -> None:
        self.frame = frame
        self.coefficients: Coefficients = coefficients(frame)
        self.rigid = np.isnan(self.coefficients.axial)
        self.deformation: Sparse = deformations(frame)
        stiffness = frame.support_table.stiffness.ravel()
        self.held = stiffness == HELD
        self.spring = np.where(self.held, 0.0, stiffness)
        self.stiffest = stiffest(frame)
        self.penalty = penalty(frame, self.coefficients.axial)
        self.member_stiffness = self._member_stiffness()
        self.ties = tie_rows(frame)
        # With the ties, where there are any: every deformation that counts, and its stiffness.
        self._every: Sparse = self.deformation
        self._stiffness: Sparse = self.member_stiffness
        if frame.ties:
            self._every = sp.vstack([self.deformation, self.ties]).tocsr()
            tied = self.penalty * sp.identity(self.ties.shape[0])
            self._stiffness = sp.block_diag([self.member_stiffness, tied]).tocsr()
        matrix = (self._every.T @ self._stiffness @ self._every + sp.diags(self.spring)).tocsc()
        # A rotation that nothing resists, or a joint that nothing joins, has no equation.
        self.diagonal: Floats = matrix.diagonal()
        self.free = np.flatnonzero(~self.held & (self.diagonal != 0.0))
        self.matrix = matrix[self.free][:, self.free]
        self._factor: Any = None

    def _member_stiffness(self) -> Sparse:
        """(3m, 3m) moments at the faces and axial force of every member from its three deformations."""
        k = self.coefficients.stiffness
        axial = np.where(self.rigid, self.penalty, self.coefficients.axial)
        m = 3 * np.arange(len(axial))
        rows = np.concatenate([m, m, m + 1, m + 1, m + 2])
        cols = np.concatenate([m, m + 1, m, m + 1, m + 2])
        data = np.concatenate([k[:, 0, 0], k[:, 0, 1], k[:, 1, 0], k[:, 1, 1], axial])
        return sp.csr_matrix((data, (rows, cols)), shape=(3 * len(m), 3 * len(m)))

    def correct(self, residual: Floats) -> Floats:
        """Displacements of the free unknowns (n, cases) that take up the residual forces (n, cases)."""
        if len(self.free) == 0:
            return residual
        if self._factor is None:
            from scipy.sparse.linalg import splu

            options = {"SymmetricMode": True}
            self._factor = splu(self.matrix, permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0, options=options)
        return np.asarray(self._factor.solve(residual))

    def solve(self, tables: list[LoadTable]) -> Solution:
        """Displacements and member forces of every load table."""
        frame, count = self.frame, len(tables)
        fixed = [fixed_ends(frame, table, self.coefficients.stiffness) for table in tables]
        members, joints = len(frame.members), len(frame.joints)
        moved = np.stack([table.settlement.ravel() for table in tables], axis=1).reshape(-1, count)
        shift = np.where(self.held[:, None], moved, 0.0)
        stretch = np.stack([f.stretch for f in fixed], axis=1).reshape(members, count)
        start = np.zeros((members, 3, count))
        for c, f in enumerate(fixed):
            start[:, :2, c] = f.moments
            start[:, 2, c] = np.where(self.rigid, 0.0, -self.coefficients.axial * f.stretch)
        outer = np.stack([self._joint_loads(t, f) for t, f in zip(tables, fixed, strict=True)], axis=1)
        outer = outer.reshape(3 * joints, count) + self.spring[:, None] * moved
        forces = start.reshape(3 * members, count) + self.member_stiffness @ (self.deformation @ shift)
        forces, shift, unsettled, ties = self._settled(forces, shift, outer, stretch)
        return Solution(self, tables, fixed, forces.reshape(members, 3, count), shift, unsettled, ties)

    def _settle(self, forces: Floats, shift: Floats, outer: Floats, stretch: Floats) -> tuple[Floats, Floats, Floats]:
        """The same as `_settled` where nobody asks for the forces of ties."""
        return self._settled(forces, shift, outer, stretch)[:3]

    def _settled(
        self, forces: Floats, shift: Floats, outer: Floats, stretch: Floats
    ) -> tuple[Floats, Floats, Floats, Floats]:
        """Correct displacements and member forces (3m, cases) until the joints balance, rigid members keep their lengths
        and tied joints move together.

        The third result is what the last round still changed, (cases,): in displacements as a share of the largest, or
        in axial forces of rigid members as a share of the largest action, whichever is more. The fourth is the forces of
        the ties.
        """
        members, tied = len(forces), self.ties.shape[0]
        rigid_rows = np.concatenate([3 * np.flatnonzero(self.rigid) + 2, members + np.arange(tied)])
        penalty, every = self.penalty, self._every
        # The first axial force of a rigid member is penalty times the elongation that the held displacements ask for.
        forces = np.concatenate([forces, penalty * (self.ties @ shift)])
        asked = np.concatenate([stretch[self.rigid], np.zeros((tied, shift.shape[1]))])
        forces[rigid_rows] -= penalty * asked
        longer = (every @ shift)[rigid_rows] - asked
        last = np.inf
        # Corrections are judged by the largest displacement so far: the final ones may be nothing but rounding noise. Where
        # loads go straight into supports every displacement is.
        loads = _largest(outer.reshape(-1, 3, outer.shape[1])[:, :2].reshape(-1, outer.shape[1]))
        least = UNMOVED * np.maximum(loads, self._largest_elastic(forces)) / self._stiffest_way
        reach = np.maximum(_largest(shift), least)
        for done in range(1, ROUNDS + 1):
            residual = outer - every.T @ forces - self.spring[:, None] * shift
            step = np.zeros_like(shift)
            step[self.free] = self.correct(residual[self.free])
            shift = shift + step
            bent = every @ step
            forces = forces + self._stiffness @ bent
            reach = np.maximum(reach, _largest(shift))
            shares = _shares(step, reach)
            size = float(shares.max(initial=0.0))
            if size <= STILL or (done >= FEWEST and size >= last / 2):
                break
            last = size
            # Elongations are summed from the corrections: from the displacements they would be rounding, times penalty.
            longer = longer + bent[rigid_rows]
            forces[rigid_rows] += penalty * longer
        # What the next round would add to the axial forces of rigid members.
        pulled = penalty * np.abs(longer + bent[rigid_rows])
        unsettled = np.maximum(shares, _shares(pulled, np.maximum(self._action_size(forces[:members], reach), loads)))
        return forces[:members], shift, unsettled, forces[members:]

    def _largest_elastic(self, forces: Floats) -> Floats:
        """(cases,) the largest moment over length, or axial force of an elastic member."""
        by_member = np.abs(forces[: 3 * len(self.rigid)]).reshape(-1, 3, forces.shape[1])
        by_member[:, :2] /= self.frame.member_table.clear[:, None, None]
        by_member[self.rigid, 2] = 0.0
        return _largest(by_member.reshape(-1, forces.shape[1]))

    @property
    def _stiffest_way(self) -> float:
        """The largest stiffness of any joint against moving."""
        return float(self.diagonal.reshape(-1, 3)[:, :2].max(initial=0.0)) or 1.0

    def _action_size(self, forces: Floats, reach: Floats) -> Floats:
        """(cases,) the largest axial force, or moment over length, of any member; no less than a trace of what moving by
        `reach` would take, because a determinate frame that settles has no actions but rounding noise."""
        by_member = np.abs(forces).reshape(-1, 3, forces.shape[1])
        by_member[:, :2] /= self.frame.member_table.clear[:, None, None]
        trace = TRACE * self.stiffest * reach
        return np.asarray(np.maximum(_largest(by_member.reshape(-1, forces.shape[1])), trace))

    def _joint_loads(self, table: LoadTable, fixed: FixedEnds) -> Floats:
        """(3j,) forces on the joints along their support axes: those applied, and those that the members' loads bring
        when the moments at the faces are zero and rigid zones pass on what acts on them."""
        nothing = np.zeros((len(self.frame.members), 2))
        ends = end_actions(self.frame, nothing, fixed.axial, fixed)
        return np.asarray(support_axes(self.frame) @ (table.joint.ravel() - gathered(self.frame, ends).ravel()))


@dataclass(frozen=True, slots=True)
class Solution:
    """forces: (m, 3, cases) moments at the faces and axial force without the fixed-end part of along loads;
    shift: (3j, cases) displacements along the support axes; unsettled: (cases,) share that the last round still changed;
    ties: (t, cases) forces of the ties' further joints, that hold them back along the tie."""

    system: System
    tables: list[LoadTable]
    fixed: list[FixedEnds]
    forces: Floats
    shift: Floats
    unsettled: Floats
    ties: Floats

    def case_answer(self, k: int, undetermined: Undetermined) -> CaseAnswer:
        """The k-th case as everybody sees it, undetermined values as NaN."""
        frame, fixed = self.system.frame, self.fixed[k]
        ends = end_actions(frame, self.forces[:, :2, k], self.forces[:, 2, k] + fixed.axial, fixed)
        axes = support_axes(frame)
        pull = axes @ (gathered(frame, ends) - self.tables[k].joint).ravel()
        pull = (pull + self.system.ties.T @ self.ties[:, k]).reshape(-1, 3)
        pull[frame.support_table.stiffness == FREE] = 0.0
        reactions = (axes.T @ pull.ravel()).reshape(-1, 3)
        joints = (axes.T @ self.shift[:, k]).reshape(-1, 3)
        ends[undetermined.axial, :, 0] = np.nan
        joints[undetermined.joints] = np.nan
        reactions[undetermined.reactions] = np.nan
        return CaseAnswer(ends, joints, reactions)


def _largest(values: Floats) -> Floats:
    """(cases,) the largest size in each column of (n, cases)."""
    if values.shape[1] > FEW:
        return np.asarray(np.abs(values).max(axis=0, initial=0.0))
    # Of few columns one by one: numpy is several times slower along short rows.
    return np.array([np.abs(column).max(initial=0.0) for column in values.T])


def _shares(step: Floats, reach: Floats) -> Floats:
    """(cases,) largest correction (n, cases) of each case as a share of that case's reach (cases,)."""
    size = _largest(step)
    return np.asarray(size / np.where(reach > 0.0, reach, 1.0))


def stiffest(frame: Frame) -> float:
    """The largest 12 EI/l^3 of any member: the measure of the frame's stiffness across."""
    t = frame.member_table
    return float((12 * t.E * t.I / t.clear**3).max())


def penalty(frame: Frame, axial: Floats) -> float:
    """Stiffness in place of EA/l of members that are axially rigid, and of ties. axial: (m,) EA/l, NaN where rigid."""
    return max(PENALTY * stiffest(frame), FIRM * float(np.nanmax(axial, initial=0.0)))


def tie_rows(frame: Frame) -> Sparse:
    """(t, 3j): from joint displacements along the support axes to how much further than its tie's first joint each
    further joint moves along the tie."""
    rows: list[tuple[int, int, float]] = []
    count = 0
    for tie in frame.ties.values():
        c, s = direction_cosines(tie.direction)
        first, *others = (3 * frame.joint_index[joint] for joint in tie.joints)
        for other in others:
            rows += [(count, first, -c), (count, first + 1, -s), (count, other, c), (count, other + 1, s)]
            count += 1
    row, column, data = np.array(rows, dtype=float).reshape(-1, 3).T
    shape = (count, 3 * len(frame.joints))
    matrix = sp.csr_matrix((data, (row.astype(np.int64), column.astype(np.int64))), shape=shape)
    return (matrix @ support_axes(frame).T).tocsr()


def deformations(frame: Frame) -> Sparse:
    """(3m, 3j): from joint displacements along the support axes to each member's end rotations against its chord
    (clockwise) and its elongation. A rigid zone carries its face sideways as its joint turns."""
    t = frame.member_table
    count = len(t.length)
    c, s, z1, z2 = t.cos / t.clear, t.sin / t.clear, t.zone[:, 0] / t.clear, t.zone[:, 1] / t.clear
    one, nil = np.ones(count), np.zeros(count)
    turn = np.stack([s, -c, z1, -s, c, z2], axis=1)
    block = np.empty((count, 3, 6))
    block[:, 0] = turn + np.stack([nil, nil, one, nil, nil, nil], axis=1)
    block[:, 1] = turn + np.stack([nil, nil, nil, nil, nil, one], axis=1)
    block[:, 2] = np.stack([-t.cos, -t.sin, nil, t.cos, t.sin, nil], axis=1)
    columns = (3 * t.ends[:, :, None] + np.arange(3)).reshape(count, 1, 6)
    rows = np.arange(3 * count).reshape(count, 3, 1)
    rows, columns = np.broadcast_arrays(rows, columns)
    matrix = sp.csr_matrix((block.ravel(), (rows.ravel(), columns.ravel())), shape=(3 * count, 3 * len(frame.joints)))
    return (matrix @ support_axes(frame).T).tocsr()


def support_axes(frame: Frame) -> Sparse:
    """(3j, 3j) orthogonal: components along each joint's support axes from global ones."""
    s = frame.support_table
    k = 3 * np.arange(len(frame.joints))
    rows = np.concatenate([k, k, k + 1, k + 1, k + 2])
    cols = np.concatenate([k, k + 1, k, k + 1, k + 2])
    data = np.concatenate([s.cos, s.sin, -s.sin, s.cos, np.ones(len(k))])
    return sp.csr_matrix((data, (rows, cols)), shape=(3 * len(k), 3 * len(k)))


def gathered(frame: Frame, ends: Floats) -> Floats:
    """(j, 3) sums over each joint of what acts on the member ends there: fx, fy, clockwise moment, global axes."""
    t = frame.member_table
    sign = np.array([-1.0, 1.0])  # tension pulls the `from` end along local -x
    along, across = ends[:, :, 0] * sign, ends[:, :, 1]
    c, s = t.cos[:, None], t.sin[:, None]
    rows = np.stack([along * c - across * s, along * s + across * c, ends[:, :, 2]], axis=2)
    total = np.zeros((len(frame.joints), 3))
    np.add.at(total, t.ends, rows)
    return total
