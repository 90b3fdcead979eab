"""Tables of working in second order: the distribution under the axial forces that it settled on."""

from __future__ import annotations

import numpy as np

from crosscheck.answer import WorkTable
from crosscheck.frame.model import Floats, Frame
from crosscheck.opinions.moment_distribution.displaced import Freedom
from crosscheck.opinions.moment_distribution.holding import Held
from crosscheck.opinions.moment_distribution.one_way_displaced import SecondOrder
from crosscheck.opinions.moment_distribution.process import distribute
from crosscheck.opinions.moment_distribution.second_order import NotSettled, Settled, settle_case

Row = tuple[str | float | None, ...]
NOTHING = 1e-12
"""Share of the largest moment below which a table says zero."""


def displaced_working(frame: Frame, name: str) -> list[WorkTable]:
    """The last distribution of one case, and how it was come to; why there is none where there is none."""
    try:
        settled = _settled(frame, name)
    except NotSettled as why:
        return [WorkTable("Second order", (), (), (str(why),))]
    return [*taken_out(settled.displaced.held.frame), _repetitions(settled), _factors(settled), _moments(settled)]


def _settled(frame: Frame, name: str) -> Settled:
    if frame.one_way:
        return SecondOrder(frame).settled(name)
    first = distribute(frame, (name,))
    return settle_case(first, Freedom(first.held), 0)


def by_joint(held: Held) -> list[tuple[str, str, int, int]]:
    """Joint, member, its index and end, joint by joint."""
    members, joints = list(held.frame.members), list(held.frame.joints)
    flat = held.ends.ravel()
    order = np.argsort(flat, kind="stable")
    return [(joints[flat[k]], members[k // 2], int(k // 2), int(k % 2)) for k in order]


def taken_out(frame: Frame) -> list[WorkTable]:
    """Which one-way members and supports do not work in this state of the frame; nothing where it has none."""
    if not frame.one_way:
        return []
    rows: list[Row] = [(name, "slack") for name in frame.members if name in frame.out_members]
    rows += [(f"support {joint}", f"free along its {axis}") for joint, axis in sorted(frame.out_supports)]
    remark = () if rows else ("all of them work",)
    return [WorkTable("One-way members and supports that do not work here", ("part", "is"), tuple(rows), remark)]


def _repetitions(settled: Settled) -> WorkTable:
    rows = tuple(
        (float(number), float(len(r.rounds)), float(sum(p.steps for p in r.rounds)), r.change)
        for number, r in enumerate(settled.trace, 1)
    )
    return WorkTable(
        "Axial forces taken as known, and what the displaced frame makes of them",
        ("repetition", "passes", "steps", "change"),
        rows,
        ("the first takes the axial forces of first order; change: of axial force, as a share of the largest force",
         "step: every joint released one at a time, there and back, and the sways by their holding forces"),
    )  # fmt: skip


def _factors(settled: Settled) -> WorkTable:
    """Stiffness of every member end under its axial force, its share at the joint, and what it carries over."""
    held, k = settled.displaced.held, settled.displaced.bowed.stiffness
    whole = np.zeros(len(held.frame.joints))
    np.add.at(whole, held.ends, np.einsum("mii->mi", k)[:, :2])
    whole += held.rotation_spring
    turning = np.isin(np.arange(len(whole)), held.turning)
    rows: list[Row] = []
    for joint, member, m, end in by_joint(held):
        own, j = float(k[m, end, end]), held.ends[m, end]
        share = own / float(whole[j]) if turning[j] else 0.0
        rows.append((joint, member, float(settled.axial[m]), own, share, float(k[m, 0, 1]) / own if own else None))
    return WorkTable(
        "Distribution and carry-over factors under the axial forces",
        ("joint", "member", "axial force", "stiffness", "share", "carry-over"),
        tuple(rows),
        ("axial force at the `from` end, tension positive; it varies along a member with the loads along it",
         "stiffness: moment at the joint per radian of its rotation, far joint held; below zero where the axial force "
         "turns the end further by itself"),
    )  # fmt: skip


def _moments(settled: Settled) -> WorkTable:
    """End moments: of the loads with all held, of the joints' rotations, of the chords', and their sum."""
    bowed, moved = settled.displaced.bowed, settled.displaced.movements(settled.position)
    parts = [
        bowed.fixed[:, :2],
        np.einsum("mij,mj->mi", bowed.stiffness[:, :2, :2], moved[:, :2]),
        bowed.stiffness[:, :2, 2] * moved[:, 2:],
    ]
    columns = [*parts, sum(parts)]
    least = NOTHING * max(float(np.abs(c).max(initial=0.0)) for c in columns)
    shown: list[Floats] = [np.where(np.abs(c) > least, c, 0.0) for c in columns]
    rows: list[Row] = [
        (joint, member, *(float(c[m, end]) for c in shown))
        for joint, member, m, end in by_joint(settled.displaced.held)
    ]
    return WorkTable(
        "End moments", ("joint", "member", "fixed", "rotations", "sways", "final"), tuple(rows),
        ("clockwise on the member; fixed: loads and temperature difference under the axial forces, all joints held",),
    )  # fmt: skip
