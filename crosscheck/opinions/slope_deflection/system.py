"""Joint moment equations and translation equations, solved together.

Unknowns are dx, dy and rotation of each joint along its support's axes. B takes them to the deformations of each
member: the rotation of each end against the chord and the elongation. Equilibrium of the joints is the transpose of the
same B (virtual work), so one matrix serves any geometry, square or not.

Axially rigid members keep the same sparse matrix: an elongation stiffness `penalty` takes the place of EA/l, and the
axial force is corrected by penalty times what elongation remains until none does (method of multipliers, Hestenes 1969
and Powell 1969). Moments and axial forces are accumulated from corrections, and the residual is formed from them and
not from the matrix, so that joints balance to rounding.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.sparse as sp

from crosscheck.answer import CaseAnswer, Undetermined
from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import FREE, HELD, Floats, Frame
from crosscheck.opinions.slope_deflection.members import Coefficients, FixedEnds, coefficients, end_actions, fixed_ends

PENALTY = 1e6
"""Elongation stiffness of an axially rigid member in units of the frame's largest 12 EI/l^3."""
ROUNDS = 40
"""Most rounds of correction; three to five are usual."""
FEWEST = 4
"""After so many rounds, corrections that no longer halve are rounding noise and end the rounds too."""
TRACE = 1e-6
"""Share of the largest 12 EI/l^3 times the largest displacement that counts as an action where there is none larger."""
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
        t = frame.member_table
        self.stiffest = float((12 * t.E * t.I / t.clear**3).max())
        self.member_stiffness = self._member_stiffness()
        matrix = (self.deformation.T @ self.member_stiffness @ self.deformation + sp.diags(self.spring)).tocsc()
        # A rotation that nothing resists, or a joint that nothing joins, has no equation.
        self.free = np.flatnonzero(~self.held & (matrix.diagonal() != 0.0))
        self.matrix = matrix[self.free][:, self.free]
        self._factor: Any = None

    def _member_stiffness(self) -> Sparse:
        """(3m, 3m) moments at the faces and axial force of every member from its three deformations."""
        k = self.coefficients.stiffness
        axial = np.where(self.rigid, PENALTY * self.stiffest, self.coefficients.axial)
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
        forces, shift, unsettled = self._settle(forces, shift, outer, stretch)
        return Solution(self, tables, fixed, forces.reshape(members, 3, count), shift, unsettled)

    def _settle(self, forces: Floats, shift: Floats, outer: Floats, stretch: Floats) -> tuple[Floats, Floats, Floats]:
        """Correct displacements and member forces until the joints balance and rigid members keep their lengths.

        The third result is what the last round still changed, (cases,): in displacements as a share of the largest, or
        in axial forces of rigid members as a share of the largest action, whichever is more.
        """
        rigid_rows = 3 * np.flatnonzero(self.rigid) + 2
        penalty = self.member_stiffness.diagonal()[rigid_rows][:, None]
        # The first axial force of a rigid member is penalty times the elongation that the held displacements ask for.
        forces[rigid_rows] -= penalty * stretch[self.rigid]
        longer = (self.deformation @ shift)[rigid_rows] - stretch[self.rigid]
        last = np.inf
        # Corrections are judged by the largest displacement so far: the final ones may be nothing but rounding noise.
        reach = np.abs(shift).max(axis=0, initial=0.0)
        for done in range(1, ROUNDS + 1):
            residual = outer - self.deformation.T @ forces - self.spring[:, None] * shift
            step = np.zeros_like(shift)
            step[self.free] = self.correct(residual[self.free])
            shift = shift + step
            bent = self.deformation @ step
            forces = forces + self.member_stiffness @ bent
            reach = np.maximum(reach, np.abs(shift).max(axis=0, initial=0.0))
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
        return forces, shift, np.maximum(shares, _shares(pulled, self._action_size(forces, reach)))

    def _action_size(self, forces: Floats, reach: Floats) -> Floats:
        """(cases,) the largest axial force, or moment over length, of any member; no less than a trace of what moving by
        `reach` would take, because a determinate frame that settles has no actions but rounding noise."""
        by_member = np.abs(forces).reshape(-1, 3, forces.shape[1])
        by_member[:, :2] /= self.frame.member_table.clear[:, None, None]
        trace = TRACE * self.stiffest * reach
        return np.asarray(np.maximum(by_member.max(axis=(0, 1), initial=0.0), trace))

    def _joint_loads(self, table: LoadTable, fixed: FixedEnds) -> Floats:
        """(3j,) forces on the joints along their support axes: those applied, and those that the members' loads bring
        when the moments at the faces are zero and rigid zones pass on what acts on them."""
        nothing = np.zeros((len(self.frame.members), 2))
        ends = end_actions(self.frame, nothing, fixed.axial, fixed)
        return np.asarray(support_axes(self.frame) @ (table.joint.ravel() - gathered(self.frame, ends).ravel()))


@dataclass(frozen=True, slots=True)
class Solution:
    """forces: (m, 3, cases) moments at the faces and axial force without the fixed-end part of along loads;
    shift: (3j, cases) displacements along the support axes; unsettled: (cases,) share that the last round still changed."""

    system: System
    tables: list[LoadTable]
    fixed: list[FixedEnds]
    forces: Floats
    shift: Floats
    unsettled: Floats

    def case_answer(self, k: int, undetermined: Undetermined) -> CaseAnswer:
        """The k-th case as everybody sees it, undetermined values as NaN."""
        frame, fixed = self.system.frame, self.fixed[k]
        ends = end_actions(frame, self.forces[:, :2, k], self.forces[:, 2, k] + fixed.axial, fixed)
        axes = support_axes(frame)
        pull = (axes @ (gathered(frame, ends) - self.tables[k].joint).ravel()).reshape(-1, 3)
        pull[frame.support_table.stiffness == FREE] = 0.0
        reactions = (axes.T @ pull.ravel()).reshape(-1, 3)
        joints = (axes.T @ self.shift[:, k]).reshape(-1, 3)
        ends[undetermined.axial, :, 0] = np.nan
        joints[undetermined.joints] = np.nan
        reactions[undetermined.reactions] = np.nan
        return CaseAnswer(ends, joints, reactions)


def _shares(step: Floats, reach: Floats) -> Floats:
    """(cases,) largest correction (n, cases) of each case as a share of that case's reach (cases,)."""
    size = np.abs(step).max(axis=0, initial=0.0)
    return np.asarray(size / np.where(reach > 0.0, reach, 1.0))


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
