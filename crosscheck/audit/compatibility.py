"""Compatibility: do the claimed moments and axial forces bend and stretch the members so that they still fit together?

Slope-deflection turned round: forces give each member's end rotations from its chord and its elongation, and these
must belong to one set of joint displacements that the supports allow. A misfit says that the results came from other
stiffnesses, supports or connections than the frame's. By the uniqueness of linear elasticity (G. Kirchhoff 1859)
results that are complete, balance and fit ARE the solution of this frame, whatever any solver says. One-way parts: by
the claim's own forces they work or do not (one_way.py), and those that do not must be on their slack side.

Rounding is carried through as an interval: `allowed` is the most that half a unit of the last digit of every given
value, each in its worst direction, can do to the quantity (beyond fit.DENSE_ROWS conditions, a bound on that by norms).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from crosscheck.answer import CaseAnswer, Undetermined
from crosscheck.audit.equilibrium import JOINT, MEMBER, couple_values
from crosscheck.audit.fit import Fit, fit
from crosscheck.audit.one_way import at_work
from crosscheck.audit.slack import best_gaps, gaps
from crosscheck.audit.statics import ROUND_OFF, TOGETHER_CHECK, Balance, balance
from crosscheck.frame.model import FREE, Bools, Floats, Frame, Ints

COARSE = 0.05
"""Of the largest value of its kind: a rounding beyond this proves nothing (as for single values, CONTRACT.md)."""
UNTESTED = 1e-6
"""A condition whose own misfit would show less than this share of a change in it is no test of it."""
ROTATION, ELONGATION, SUPPORT, TIE = "end rotation", "elongation", "support", "tie"
SLACK, LET_GO = "slack length", "support let go"
AXES = ("x", "y", "rotation")


@dataclass(frozen=True, slots=True)
class CompatibilityCheck:
    """One member end, one member's length or one sprung support: what the claim makes it do, and what fits best.

    kind: "end rotation" (radians, clockwise, at joint `where` of `member`), "elongation" (length, of `member`;
      `where` is empty), "support" (movement or rotation along axis `direction` of the sprung support `where`) or "tie"
      (how much further than the tie's first joint its joint `where` moves along it). Of one-way parts that do not work
      by the claim, "slack length" (of `member`) and "support let go" (of `where`): how far past where they would work.
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
    displaced: where displacements are claimed too, whether each member's claimed forces go with its joints' claimed
      displacements (`expected` is then what those give), and whether supports stay where the frame holds them; a mistake
      of stiffness shows here at its very member. They do not enter `holds`.
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
    displaced: tuple[CompatibilityCheck, ...] = ()


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
        says = "; ".join([*_wrong_ways(done), why])
        return CompatibilityFindings(name, (), 0, 0, 0.0, None, False, False, says, (why,), done, None)
    frame, done = _at_work(frame, name, values, half, done)
    system = fit(frame, done)
    slack, open_ = _slack(system, name)
    checks = [*_fitted(system, name), *slack]
    dimension = system.dimension
    whole = indeterminacy(frame) if system.reduced else dimension
    lacking = [*_lacking(frame, done, undetermined), *_coarse(frame, done), *open_]
    not_judged = [*lacking, *_unjudged(done)]
    if dimension < whole:
        not_judged.append(f"{whole - dimension} of {whole} conditions of compatibility")
    holds = all(c.ok for c in checks) if dimension or whole == 0 else None
    complete = not lacking and dimension == whole and not _unbalanced_unknown(done)
    solution = complete and holds is True and done.holds
    says = _conclusion(done, holds, solution, dimension, whole)
    return CompatibilityFindings(
        name, tuple(checks), dimension, whole, float(np.sqrt(system.squared)), holds, complete, solution, says,
        tuple(not_judged), done, system, tuple(_displaced(system, name, values, half)),
    )  # fmt: skip


def _at_work(
    frame: Frame, name: str, values: CaseAnswer, half: CaseAnswer | None, done: Balance
) -> tuple[Frame, Balance]:
    """The frame without the one-way parts that do not work by the claim, and its statics."""
    state = at_work(frame, done.one_way)
    return (frame, done) if state is frame else (state, balance(state, name, values, half))


def _slack(system: Fit, name: str) -> tuple[list[CompatibilityCheck], list[str]]:
    """Whether the one-way parts that do not work are where they need not, and a word on those that nobody can tell."""
    checks, open_ = [], []
    found = gaps(system, name, system.displacements)
    if any(gap.reach > gap.allowed and not gap.determined for gap in found):
        found = best_gaps(system, found)
    for gap in found:
        ok = gap.reach <= gap.allowed
        if not ok and not gap.determined:
            open_.append(f"whether {gap.where} is slack")
            continue
        where, member = (gap.where, "") if gap.axis else ("", gap.where)
        kind = LET_GO if gap.axis else SLACK
        checks.append(CompatibilityCheck(name, kind, where, member, gap.reach, 0.0, gap.allowed, ok, gap.axis))
    return checks, open_


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
    ends, reactions = missing[: 6 * m].reshape(m, 2, 3).copy(), missing[6 * m : _own(frame)].reshape(j, 3).copy()
    if undetermined is not None:
        ends[undetermined.axial, :, 0] = False
        reactions[undetermined.reactions] = False
    counts = {"axial force": ends[..., 0], "shear": ends[..., 1], "end moment": ends[..., 2], "reaction": reactions}
    said = []
    for quantity, lack in counts.items():
        if lack.any():
            said.append(f"{int(lack.sum())} values of {quantity} are neither given nor follow from statics")
    return said


def _own(frame: Frame) -> int:
    """How many values are the members' and supports'; those after them are forces in ties."""
    return 6 * len(frame.members) + 3 * len(frame.joints)


def _unjudged(done: Balance) -> list[str]:
    """Balances that could not be judged because they were needed, counted."""
    count = sum(c.check in (JOINT, MEMBER) for c in done.unjudged)
    return [f"{count} balances, needed to complete the claim or resting on undetermined values"] if count else []


def _unbalanced_unknown(done: Balance) -> bool:
    """Whether missing values stand in balances of several joints together that were too many to judge."""
    return any(c.check == TOGETHER_CHECK and c.ok is None for c in done.checks)


def _coarse(frame: Frame, done: Balance) -> list[str]:
    """Forces or moments whose rounding is so large that passing proves nothing, by kind."""
    couples = couple_values(len(frame.members), len(frame.joints), len(done.completed.value) - _own(frame))
    value, half = np.abs(np.nan_to_num(done.completed.value)), done.completed.half_width
    said = []
    asked = ~_nil_by_rule(frame, len(value))
    for kind, which in (("moments", couples & asked), ("forces", ~couples & asked)):
        if half[which].max(initial=0.0) > COARSE * value[which].max(initial=0.0):
            said.append(f"{kind} are printed too coarsely to prove anything")
    return said


def _nil_by_rule(frame: Frame, count: int) -> Bools:
    """(count,) values that are nil whatever the load: moments at hinges, reactions where nothing is supported. However
    coarsely they are printed, nothing hangs on them."""
    t, s = frame.member_table, frame.support_table
    ends = np.zeros((len(t.length), 2, 3), dtype=bool)
    ends[..., 2] = (t.turn == FREE) & (t.zone == 0)
    free = s.stiffness == FREE
    free[:, :2] = free[:, :2].all(axis=1, keepdims=True)
    nil = np.zeros(count, dtype=bool)
    nil[: _own(frame)] = np.concatenate([ends.ravel(), free.ravel()])
    return nil


def _wrong_ways(done: Balance) -> list[str]:
    """A sentence on every one-way part that is claimed to work the other way."""
    return [part.says for part in done.one_way if part.wrong]


def _conclusion(done: Balance, holds: bool | None, solution: bool, dimension: int, whole: int) -> str:
    if solution:
        return "this claim satisfies statics and compatibility, therefore it is the solution"
    if wrong := _wrong_ways(done):
        return "; ".join(wrong)
    if holds is None:
        return "compatibility could not be tested by what the claim gives"
    tested = f"{dimension} of {whole} independent conditions"
    if not holds:
        return f"the claimed deformations do not fit together ({tested} tested)"
    if not done.holds:
        but = "statics is not satisfied" if done.fails else "statics could not be tested by what the claim gives"
        return f"the claimed deformations fit together ({tested} tested), but {but}"
    return f"the claimed deformations fit together ({tested} tested), but not everything could be judged"


def _fitted(system: Fit, name: str) -> list[CompatibilityCheck]:
    """Every condition that is a test, against the displacements that fit best."""
    rows = np.flatnonzero(~system.rigid & (system.shares > UNTESTED))
    return _tell(system, name, rows, system.residual, system.allowed, system.displacements)


def _displaced(system: Fit, name: str, values: CaseAnswer, half: CaseAnswer | None) -> list[CompatibilityCheck]:
    """Every condition against the claimed displacements, and every held support; those with gaps in them left out."""
    u = _own_axes(system, values.joints).ravel()
    if np.isnan(u).all():
        return []
    rounding = np.zeros_like(u) if half is None else np.nan_to_num(_own_axes(system, half.joints, spread=True).ravel())
    scale = np.abs(np.nan_to_num(u)).max()
    rounding += ROUND_OFF * scale
    known = ~np.isnan(u)
    u = np.where(known | ~system.geometry.held, u, system.settlement)
    full = (system.keep @ system.geometry.matrix).tocsr()
    full.eliminate_zeros()
    whole = (abs(full) @ np.isnan(u).astype(float)) == 0
    gap = system.d - full @ (np.nan_to_num(u) - system.settlement)
    allowed = abs(full) @ rounding + abs(system.source) @ system.half
    checks = _tell(system, name, np.flatnonzero(whole), gap, allowed, np.nan_to_num(u))
    joints = list(system.frame.joints)
    for place in np.flatnonzero(system.geometry.held & known).tolist():
        expected, most = float(system.settlement[place]), float(rounding[place])
        ok = abs(float(u[place]) - expected) <= most
        where, axis = joints[place // 3], AXES[place % 3]
        checks.append(CompatibilityCheck(name, SUPPORT, where, "", float(u[place]), expected, most, ok, axis))
    return checks


def _own_axes(system: Fit, joints: Floats, spread: bool = False) -> Floats:
    """(j, 3) displacements along the supports' own axes; of roundings (`spread`) the largest."""
    s = system.frame.support_table
    x, y, turn = joints.T
    sin, back = (np.abs(s.sin), np.abs(s.sin)) if spread else (s.sin, -s.sin)
    cos = np.abs(s.cos) if spread else s.cos
    # A direction that the axis has no share of may be missing.
    along = np.where(cos == 0, 0.0, cos * x) + np.where(sin == 0, 0.0, sin * y)
    across = np.where(back == 0, 0.0, back * x) + np.where(cos == 0, 0.0, cos * y)
    return np.column_stack([along, across, turn])


def _tell(
    system: Fit, name: str, rows: Ints, gap: Floats, allowed: Floats, displacements: Floats
) -> list[CompatibilityCheck]:
    """Checks in words: a single condition of a member with a hinge is told as the rotation of its other end.

    rows: which conditions; gap, allowed: (n,) of all of them; displacements: (3 j,) in the supports' own axes.
    """
    frame = system.frame
    members, joints = list(frame.members), list(frame.joints)
    m = len(members)
    further = [frame.joint_index[joint] for tie in frame.ties.values() for joint in tie.joints[1:]]
    turns = displacements.reshape(-1, 3)
    raw = system.geometry.matrix @ displacements
    checks: list[CompatibilityCheck] = []
    for k, place, share in zip(rows.tolist(), *_main_entries(system, rows), strict=True):
        where, member, direction = "", members[place // 3] if place < 3 * m else "", ""
        if place >= 3 * (m + len(joints)):
            kind, where, expected = TIE, joints[further[place - 3 * (m + len(joints))]], float(raw[place])
        elif place >= 3 * m:
            joint, axis = divmod(place - 3 * m, 3)
            kind, where, direction, expected = SUPPORT, joints[joint], AXES[axis], float(turns[joint, axis])
        elif place % 3 == 2:
            kind, expected = ELONGATION, float(raw[place])
        else:
            index = int(frame.member_table.ends[place // 3, place % 3])
            kind, where, expected = ROTATION, joints[index], float(turns[index, 2])
        off, most = float(gap[k]) / share, float(allowed[k]) / abs(share)
        checks.append(
            CompatibilityCheck(name, kind, where, member, expected + off, expected, most, abs(off) <= most, direction)
        )
    return checks


def _main_entries(system: Fit, rows: Ints) -> tuple[list[int], list[float]]:
    """The raw deformation that each of the rows is mostly made of, and its entry there."""
    keep = system.keep
    row = np.repeat(np.arange(keep.shape[0]), np.diff(keep.indptr))
    order = np.lexsort((np.abs(keep.data), row))
    last = order[np.searchsorted(row[order], np.arange(keep.shape[0]), side="right") - 1]
    return keep.indices[last[rows]].tolist(), keep.data[last[rows]].tolist()
