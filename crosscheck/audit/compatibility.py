"""Compatibility: do the claimed moments and axial forces bend and stretch the members so that they still fit together?

Slope-deflection turned round: forces give each member's end rotations from its chord and its elongation, and these
must belong to one set of joint displacements that the supports allow. A misfit says that the results came from other
stiffnesses, supports or connections than the frame's. By the uniqueness of linear elasticity (G. Kirchhoff 1859)
results that are complete, balance and fit ARE the solution of this frame, whatever any solver says.

Rounding is carried through as an interval: `allowed` is the most that half a unit of the last digit of every given
value, each in its worst direction, can do to the quantity (beyond fit.DENSE_ROWS conditions, a bound on that by norms).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from crosscheck.answer import CaseAnswer, Undetermined
from crosscheck.audit.equilibrium import JOINT, MEMBER
from crosscheck.audit.fit import Fit, fit
from crosscheck.audit.statics import TOGETHER_CHECK, Balance, balance
from crosscheck.frame.model import Bools, Floats, Frame

UNTESTED = 1e-6
"""A condition whose own misfit would show less than this share of a change in it is no test of it."""
ROTATION, ELONGATION, SUPPORT = "end rotation", "elongation", "support"


@dataclass(frozen=True, slots=True)
class CompatibilityCheck:
    """One member end, one member's length or one sprung support: what the claim makes it do, and what fits best.

    kind: "end rotation" (radians, clockwise, at joint `where` of `member`), "elongation" (length, of `member`;
      `where` is empty) or "support" (movement or rotation along axis `direction` of the sprung support `where`).
    rotation: what the claimed values give (named as the contract's key); expected: what fits everything else best.
    allowed: the most that rounding can part the two. ok: whether they are within it.
    """

    case: str
    kind: str
    where: str
    member: str
    rotation: float
    expected: float
    allowed: float
    ok: bool
    direction: str = ""


@dataclass(frozen=True, eq=False)
class CompatibilityFindings:
    """What compatibility says of one case.

    dimension: independent conditions tested; indeterminacy: how many there are in all (degree of static indeterminacy,
      without the axial forces that the idealisation leaves undetermined). misfit: the root of the squared misfit in
      units of rounding. holds: None where nothing could be tested. not_judged: what could not be, one sentence each.
    complete: statics gives every value that the idealisation determines. solution: the claim is the frame's solution.
    """

    case: str
    checks: tuple[CompatibilityCheck, ...]
    dimension: int
    indeterminacy: int
    misfit: float
    holds: bool | None
    complete: bool
    solution: bool
    says: str
    not_judged: tuple[str, ...]
    balance: Balance
    fit: Fit | None


def compatibility(
    frame: Frame,
    name: str,
    values: CaseAnswer,
    half: CaseAnswer | None = None,
    undetermined: Undetermined | None = None,
    statics: Balance | None = None,
) -> CompatibilityFindings:
    """Judge a case. values, half: as for statics(); statics: its Balance, where it is at hand already.

    undetermined: what the idealisation leaves open (Study.undetermined): missing values there are no want.
    """
    done = balance(frame, name, values, half) if statics is None else statics
    if frame.analysis.order == 2:
        why = "compatibility is judged in first order only"
        return CompatibilityFindings(name, (), 0, 0, 0.0, None, False, False, why, (why,), done, None)
    system = fit(frame, done)
    checks = _checks(system, name)
    dimension = system.dimension
    whole = indeterminacy(frame) if system.reduced else dimension
    lacking = _lacking(frame, done, undetermined)
    not_judged = [*lacking, *_unjudged(done)]
    if dimension < whole:
        not_judged.append(f"{whole - dimension} of {whole} conditions of compatibility")
    holds = all(c.ok for c in checks) if dimension or whole == 0 else None
    complete = not lacking and dimension == whole and not _unbalanced_unknown(frame, done)
    solution = complete and holds is True and done.holds
    says = _conclusion(done, holds, solution, dimension, whole)
    return CompatibilityFindings(
        name, tuple(checks), dimension, whole, float(np.sqrt(system.squared)), holds, complete, solution, says,
        tuple(not_judged), done, system,
    )  # fmt: skip


def indeterminacy(frame: Frame) -> int:
    """Degree of static indeterminacy that deformations can test: none of it needs a claim."""
    shape = (len(frame.members), len(frame.joints))
    nil = CaseAnswer(np.zeros((shape[0], 2, 3)), np.zeros((shape[1], 3)), np.zeros((shape[1], 3)))
    name = next(iter(frame.names))
    return fit(frame, balance(frame, name, nil)).dimension


def _lacking(frame: Frame, done: Balance, undetermined: Undetermined | None) -> list[str]:
    """Values that the claim and statics leave out and the idealisation does not excuse, by quantity."""
    m, j = len(frame.members), len(frame.joints)
    missing = done.completed.missing
    ends, reactions = missing[: 6 * m].reshape(m, 2, 3).copy(), missing[6 * m :].reshape(j, 3).copy()
    if undetermined is not None:
        ends[undetermined.axial, :, 0] = False
        reactions[undetermined.reactions] = False
    counts = {"axial force": ends[..., 0], "shear": ends[..., 1], "end moment": ends[..., 2], "reaction": reactions}
    said = []
    for quantity, lack in counts.items():
        if lack.any():
            said.append(f"{int(lack.sum())} values of {quantity} are neither given nor follow from statics")
    return said


def _unjudged(done: Balance) -> list[str]:
    """Balances that could not be judged because they were needed, counted."""
    count = sum(c.check in (JOINT, MEMBER) for c in done.unjudged)
    return [f"{count} balances went into completing the claim"] if count else []


def _unbalanced_unknown(frame: Frame, done: Balance) -> bool:
    """Whether missing values stand in balances that no check of several joints together could cover."""
    covered = any(c.check == TOGETHER_CHECK for c in done.checks)
    return bool(done.completed.missing.any()) and not covered and frame.analysis.axial == "elastic"


def _conclusion(done: Balance, holds: bool | None, solution: bool, dimension: int, whole: int) -> str:
    if solution:
        return "this claim satisfies statics and compatibility, therefore it is the solution"
    if holds is None:
        return "compatibility could not be tested by what the claim gives"
    tested = f"{dimension} of {whole} independent conditions"
    if not holds:
        return f"the claimed deformations do not fit together ({tested} tested)"
    if not done.holds:
        return f"the claimed deformations fit together ({tested} tested), but statics is not satisfied"
    return f"the claimed deformations fit together ({tested} tested), but not everything could be judged"


def _checks(system: Fit, name: str) -> list[CompatibilityCheck]:
    """One check a condition. A single condition of a member with a hinge is told as the rotation of its other end."""
    frame = system.frame
    members, joints = list(frame.members), list(frame.joints)
    m = len(members)
    turns = _joint_values(system)
    raw = system.geometry.matrix @ system.displacements
    residual, allowed = system.residual, system.allowed
    checks: list[CompatibilityCheck] = []
    for k, place, share in zip(*_main_entries(system), strict=True):
        gap, most = float(residual[k]) / share, float(allowed[k]) / abs(share)
        if place >= 3 * m:
            joint, axis = divmod(place - 3 * m, 3)
            expected = float(turns[joint, axis])
            kind, where, member, direction = SUPPORT, joints[joint], "", ("x", "y", "rotation")[axis]
        elif place % 3 == 2:
            expected = float(raw[place])
            kind, where, member, direction = ELONGATION, "", members[place // 3], ""
        else:
            index = int(frame.member_table.ends[place // 3, place % 3])
            expected = float(turns[index, 2])
            kind, where, member, direction = ROTATION, joints[index], members[place // 3], ""
        checks.append(
            CompatibilityCheck(name, kind, where, member, expected + gap, expected, most, abs(gap) <= most, direction)
        )
    return checks


def _main_entries(system: Fit) -> tuple[list[int], list[int], list[float]]:
    """Rows that test something, the raw deformation that each is mostly made of, and its entry there."""
    keep = system.keep
    row = np.repeat(np.arange(keep.shape[0]), np.diff(keep.indptr))
    order = np.lexsort((np.abs(keep.data), row))
    last = order[np.searchsorted(row[order], np.arange(keep.shape[0]), side="right") - 1]
    tested = np.flatnonzero(~system.rigid & (system.shares > UNTESTED))
    return tested.tolist(), keep.indices[last[tested]].tolist(), keep.data[last[tested]].tolist()


def _joint_values(system: Fit) -> Floats:
    """(j, 3) best-fitting displacements along the supports' own axes."""
    return system.displacements.reshape(-1, 3)


def tested_joints(system: Fit) -> Bools:
    """(j, 3) displacements, in the supports' own axes, that the claim's deformations settle or the supports hold."""
    found = system.geometry.held.copy()
    found[system.columns] = True
    return found.reshape(-1, 3)

