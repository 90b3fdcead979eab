"""Displacements that one-way parts at rest leave open, in one case: geometry alone, from an answer's own movements.

A braced bay with rods that only pull: under weight its columns shorten, both rods go slack, and the bay may stand
anywhere between the places where one of them draws tight. The forces are the same there, the displacements nobody's to
say: they become null, as what an idealisation leaves undetermined does, but in this case alone.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from crosscheck.answer import CaseAnswer
from crosscheck.frame.kinematics import elongations, mechanisms, support_axes
from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import Bools, Floats, Frame

NOISE = 1e-9
"""Share of the case's largest movement, or force, within which a part counts as just tight, or without force."""


def adrift(frame: Frame, table: LoadTable, case: CaseAnswer) -> Bools:
    """(j, 3): displacements (global dx, dy, rotation) that may change in this case while no one-way part at rest is
    drawn tight, and no force with them."""
    still = np.zeros((len(frame.joints), 3), dtype=bool)
    if not frame.one_way or not np.isfinite(case.joints[:, :2]).any():
        return still
    rest = [*_members_at_rest(frame, table, case), *_supports_at_rest(frame, table, case)]
    if not rest:
        return still
    out_members = frozenset(name for kind, name, _, _ in rest if kind == "member")
    out_supports = frozenset((name, kind) for kind, name, _, _ in rest if kind != "member")
    moves = mechanisms(replace(frame, out_members=out_members, out_supports=out_supports))
    for motion in moves:
        if _may_move(motion.joints.ravel(), rest):
            size = np.abs(motion.joints).max(axis=0, keepdims=True)
            still |= np.abs(motion.joints) > 1e-6 * np.where(size > 0.0, size, 1.0)
    return still


def _may_move(motion: Floats, rest: list[tuple[str, str, Floats, bool]]) -> bool:
    """Whether the movement, one way or the other, draws no part tight that is tight already."""
    rates = np.array([float(row @ motion) for _, _, row, tight in rest if tight])
    free = 1e-9 * float(np.abs(motion).max())
    return bool((rates <= free).all() or (rates >= -free).all())


def _members_at_rest(
    frame: Frame, table: LoadTable, case: CaseAnswer
) -> Iterator[tuple[str, str, Floats, bool]]:
    """("member", name, row that gives how fast a movement draws it into work, whether it is just tight)."""
    t = frame.member_table
    rows = elongations(frame)
    moved = np.nan_to_num(case.joints)
    heat = np.where(table.mean != 0.0, table.mean * t.alpha * t.clear, 0.0)
    longer = rows @ moved.ravel() - heat - table.misfit
    reach = max(float(np.abs(moved[:, :2]).max()), float(np.abs(heat + table.misfit).max(initial=0.0)))
    for k, member in enumerate(frame.members.values()):
        if member.only:
            sense = 1.0 if member.only == "tension" else -1.0
            if sense * longer[k] <= NOISE * reach:
                tight = sense * longer[k] >= -NOISE * reach
                yield "member", member.name, sense * rows[k].toarray().ravel(), tight


def _supports_at_rest(
    frame: Frame, table: LoadTable, case: CaseAnswer
) -> Iterator[tuple[str, str, Floats, bool]]:
    """(axis, joint, row, whether it just touches), for each one-way direction that gives no force."""
    axes = support_axes(frame)
    along = (axes @ np.nan_to_num(case.joints).ravel()).reshape(-1, 3) - table.settlement
    pull = (axes @ np.nan_to_num(case.reactions).ravel()).reshape(-1, 3)
    reach = float(np.abs(along[:, :2]).max())
    force = max(float(np.abs(pull[:, :2]).max()), float(np.nanmax(np.abs(case.ends[:, :, :2]), initial=0.0)))
    for support in frame.supports.values():
        k = frame.joint_index[support.joint]
        for axis, only in enumerate((support.x_only, support.y_only)):
            if only and abs(pull[k, axis]) <= NOISE * force:
                sense = -1.0 if only == "push" else 1.0  # moving against a support that pushes brings it to work
                tight = sense * along[k, axis] >= -NOISE * reach
                yield "xy"[axis], support.joint, sense * axes[3 * k + axis].toarray().ravel(), tight
