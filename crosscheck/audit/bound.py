"""How far the claimed forces can be from this frame's own: the hypercircle bound.

W. Prager and J. L. Synge, Approximations in elasticity based on the concept of function space, Quarterly of Applied
Mathematics 5 (1947), 241-269. For forces s that satisfy statics and any compatible deformations B u,

    |s - true|^2 + |D B u - true|^2 = |s - D B u|^2        in |s|^2 = s'F s (twice the strain energy),

with F the flexibility of the members and of the support springs and D its inverse, so |s - true| is at most the misfit
|F s + d0 - B u| measured with D. Claimed forces are first moved to the nearest s that balances exactly. The bound on
the claim is the length of that move plus the misfit of s (one-way parts: _past_rest). With the claimed displacements for
u no solver is used;
with the nearest u the bound is attained, but finding it is a displacement solution. Axially rigid members hold no
energy.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import sparse

from crosscheck.answer import CaseAnswer
from crosscheck.audit.compatibility import CompatibilityFindings
from crosscheck.audit.completion import Entries
from crosscheck.audit.equilibrium import JOINT, Sparse, equations, pieces, resultants
from crosscheck.audit.fit import Fit, abs_springs, fit
from crosscheck.audit.flexibility import STRETCH
from crosscheck.audit.slack import gaps, slack_axial
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import FREE, Floats, Frame

SAFE = 1 + 1e-9
ROUND_OFF = 1e-10
"""Of the claim's own size: what arithmetic may take from a computed bound."""


@dataclass(frozen=True, slots=True)
class ForceBound:
    """Bounds on the distance of the claim from this frame's true forces.

    energy: bound on the root of s'F s of the difference s; size: the same measure of the claim itself (for a share).
    moved: how far the claim was moved to balance exactly; misfit: of the moved forces, with the nearest compatible
      displacements; energy = moved + misfit. solver_free: moved + misfit with the claimed displacements; None where
      they are not all given, or the frame has rigid members, ties (rounded displacements would stretch them) or one-way
      parts.
    moment: (m, 2) bound on the error of each end moment; axial: (m,) of the axial force at `from`, NaN if rigid.
    """

    case: str
    energy: float
    size: float
    moved: float
    misfit: float
    solver_free: float | None
    moment: Floats
    axial: Floats


def hypercircle(frame: Frame, findings: CompatibilityFindings, values: CaseAnswer | None = None) -> ForceBound | str:
    """The bound for one case, or why there is none. values: the claim, for its displacements."""
    done = findings.balance
    if findings.fit is None:
        return findings.says
    # The frame as the claim has it: without the one-way parts that do not work.
    frame = findings.fit.frame
    if not done.holds:
        return f"no bound: statics {'fails beyond rounding' if done.fails else 'could not be tested by what is claimed'}"
    if _incomplete(frame, findings):
        return "no bound: the claim does not give every end moment and axial force"
    system = fit(frame, done, energy=True)
    claimed = system.forces.copy()
    balanced = _nearest_balanced(frame, findings.case, system, claimed)
    raw = system.raw_flexibility
    metric = abs_springs(raw, 3 * len(frame.members))
    off = claimed - balanced
    moved = _root(off @ (metric @ off))
    deformation = system.d + system.keep @ (raw @ (balanced - claimed))
    spread, movement = system.solve(deformation)
    misfit = _root(deformation @ spread)
    if frame.one_way:
        past = _past_rest(system, findings, balanced, movement)
        if past is None:
            return "no bound: a one-way part works the wrong way, or a support that has let go would have to work"
        misfit = float(np.hypot(misfit, past))
    size = _root(claimed @ (metric @ claimed))
    slack = ROUND_OFF * size
    reach = _reach(system, len(frame.members))
    error = np.abs(off[: 3 * len(frame.members)]).reshape(-1, 3) * SAFE + (misfit * SAFE + slack) * reach
    error += ROUND_OFF * np.array([done.scales.moment, done.scales.moment, done.scales.force])
    axial = np.where(frame.member_table.rigid, np.nan, error[:, 2])
    free = None if values is None else _solver_free(frame, system, deformation, values)
    return ForceBound(
        case=findings.case, energy=(moved + misfit) * SAFE + slack, size=size, moved=moved, misfit=misfit,
        solver_free=None if free is None else (moved + free) * SAFE + slack, moment=error[:, :2], axial=axial,
    )  # fmt: skip


def _root(square: float) -> float:
    return float(np.sqrt(max(float(square), 0.0)))


def _incomplete(frame: Frame, findings: CompatibilityFindings) -> bool:
    """Whether a force that holds energy is missing."""
    assert findings.fit is not None
    return findings.dimension < findings.indeterminacy or bool(np.isnan(findings.fit.d).any())


def _nearest_balanced(frame: Frame, case: str, system: Fit, claimed: Floats) -> Floats:
    """(3 m + 3 j,) forces that satisfy statics exactly and are nearest to the claim in energy.

    Forces are reduced as deformations are (fit.keep), about a set that has no moment at the hinges. Held reactions
    take what they must; axial forces of rigid members too. Signs of support springs are those of their displacement.
    """
    g = system.geometry
    m = len(frame.members)
    springs = np.arange(len(claimed)) >= 3 * m
    sign = np.where(springs, -1.0, 1.0)
    base: Sparse = g.matrix[:, system.columns]
    start = _at_hinges(system, m)
    outside = _joint_loads(frame, case)[system.columns] - base.T @ start
    metric = abs_springs(system.raw_flexibility, 3 * m)
    target = system.keep @ (metric @ (sign * claimed - start))
    inner = system.solve(target)[0] + system.carry(outside)
    return np.asarray(sign * (system.keep.T @ inner + start))


def _at_hinges(system: Fit, m: int) -> Floats:
    """(q,) smallest end moments with no moment at any hinge, for the loads on the members, and axial forces of members
    that are slack."""
    soft = system.flexibility
    hinged = system.frame.member_table.turn == FREE
    start = np.zeros(system.keep.shape[1])
    start[2 : 3 * m : 3] = slack_axial(soft, system.frame)
    for k in np.flatnonzero(hinged.any(axis=1)).tolist():
        rows = soft.connection[k, hinged[k], :2]
        start[3 * k : 3 * k + 2] = np.linalg.lstsq(rows, -soft.connection_load[k, hinged[k]], rcond=None)[0]
    return start


def _joint_loads(frame: Frame, case: str) -> Floats:
    """(3 j,) loads on the joints and from the members as simple beams, along the supports' own axes, rotation last.

    The members' part is what their end actions would be with no end moments and no axial force at `from`.
    """
    loads = load_table(frame, case)
    system = equations(frame, case, loads)
    m, j = len(frame.members), len(frame.joints)
    load = resultants(pieces(loads), m)
    ends = np.zeros((m, 2, 3))
    ends[:, 1, 1] = load[:, 2] / frame.member_table.length
    ends[:, 0, 1] = -ends[:, 1, 1] - load[:, 1]
    ends[:, 1, 0] = -load[:, 0]
    rows = np.flatnonzero(np.array([kind == JOINT for kind in system.kind]))
    values = np.concatenate([ends.ravel(), np.zeros(3 * j + system.ties)])
    total = system.matrix[rows] @ values + system.constant[rows]
    s = frame.support_table
    turned = total.reshape(-1, 3).copy()
    fx, fy = turned[:, 0].copy(), turned[:, 1].copy()
    turned[:, 0], turned[:, 1] = s.cos * fx + s.sin * fy, -s.sin * fx + s.cos * fy
    return np.asarray(turned.ravel())


def _reach(system: Fit, m: int) -> Floats:
    """(m, 3) largest end moments and axial force that one unit of energy can put into a member by itself."""
    owner = system.keep.indices[system.keep.indptr[:-1]] // 3
    # Every row of a member, or of a joint's springs, is coupled with the others of its own only.
    blocks = Entries.of(system.weight, owner).stack()
    inverse = np.linalg.pinv(blocks.dense)
    rows, columns = blocks.rows[:, :, None], blocks.columns[:, None, :]
    there = (rows >= 0) & (columns >= 0)
    stiff: Sparse = sparse.coo_array(
        (inverse[there], (np.broadcast_to(rows, there.shape)[there], np.broadcast_to(columns, there.shape)[there])),
        shape=system.weight.shape,
    ).tocsr()
    spread = system.keep.T.tocsr()
    square = np.asarray((spread @ stiff).multiply(spread).sum(axis=1)).ravel()
    # Slack members hold energy too, if they work in truth.
    slack = np.flatnonzero(system.frame.member_table.slack)
    square[3 * slack + 2] = 1 / system.flexibility.matrix[STRETCH, slack, 2, 2]
    return np.asarray(np.sqrt(np.maximum(square[: 3 * m], 0.0)).reshape(m, 3))


def _past_rest(system: Fit, findings: CompatibilityFindings, balanced: Floats, movement: Floats) -> float | None:
    """Misfit of one-way parts: root of the energy of lengths past those at rest in members taken as slack; None where
    there is no bound for the sake of a force of the wrong sense, or of a support.

    With forces s of the right sense, and deformations F s + gap that fit but for a misfit r, gaps on the slack side
    where s is nil, (s - true)'(gap - true gap) is not negative, and |s - true|^2 <= |s - true| |r| follows.
    """
    parts = findings.balance.one_way
    index, held = system.frame.member_index, system.flexibility.held_axial
    tiny = ROUND_OFF * findings.balance.scales.force
    for part in parts:
        k = index.get(part.where, -1) if not part.axis else -1
        force = float(balanced[3 * k + 2] - held[k]) if k >= 0 else part.force
        if part.sense * force < -(tiny if k >= 0 else part.allowed):
            return None
    place = system.settlement.copy()
    place[system.columns] = movement
    total = 0.0
    for gap in gaps(system, findings.case, place):
        if gap.axis and gap.reach > gap.allowed:
            return None
        if not gap.axis and gap.reach > 0:
            total += gap.reach**2 / float(system.flexibility.matrix[STRETCH, index[gap.where], 2, 2])
    return _root(total)


def _solver_free(frame: Frame, system: Fit, deformation: Floats, values: CaseAnswer) -> float | None:
    """Misfit of the balanced forces with the claimed displacements, supports where the frame holds them."""
    if frame.member_table.rigid.any() or frame.ties or frame.one_way:
        return None
    s = frame.support_table
    dx, dy, turn = values.joints.T
    own = np.column_stack([s.cos * dx + s.sin * dy, -s.sin * dx + s.cos * dy, turn]).ravel()
    u = own[system.columns]
    if np.isnan(u).any():
        return None
    gap = deformation - system.base @ u
    return _root(gap @ np.linalg.solve(system.weight.toarray(), gap)) if system.small else None
