"""First order: every case a column of one process, and what it says of each."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from crosscheck.answer import CaseAnswer, Undetermined
from crosscheck.frame.loads import LoadTable, load_table
from crosscheck.frame.model import HELD, Floats, Frame
from crosscheck.opinions.moment_distribution.holding import (
    Given,
    Held,
    Pass,
    State,
    hold,
    joint_forces,
    joint_moments,
    misfits,
    settle,
)
from crosscheck.opinions.moment_distribution.members import FixedEnds, cut_up, fixed_ends
from crosscheck.opinions.moment_distribution.pieces import summed
from crosscheck.problems import Problem, UnusableInput

NAME = "moment-distribution"
GIVEN_UP = 1e-9
"""Unbalanced share of the largest force or moment beyond which a case gets no answer."""


@dataclass(frozen=True)
class Process:
    """Everything worked out for some cases, before it is put into words; columns follow `names`."""

    held: Held
    names: tuple[str, ...]
    ends: tuple[FixedEnds, ...]
    given: Given
    state: State
    trace: list[Pass]
    left: Floats


def distribute(frame: Frame, names: tuple[str, ...], held: Held | None = None) -> Process:
    """Run the whole process for these cases at once; `held`: the frame made ready, where it is so already."""
    held = held or hold(frame)
    given, ends = given_of(held, names)
    state, trace, left = settle(held, given)
    _refuse_misfits(held, given, state, names)
    _balance_rigid_members(held, given, state)
    return Process(held, names, ends, given, state, trace, left)


def given_of(held: Held, names: Sequence[str]) -> tuple[Given, tuple[FixedEnds, ...]]:
    """The cases as columns, and the fixed ends of each."""
    tables = [load_table(held.frame, name) for name in names]
    ends = tuple(fixed_ends(held.members, table, cut_up(held.members, table)) for table in tables)
    return _given(held, tables, ends), ends


def _given(held: Held, tables: Sequence[LoadTable], ends: Sequence[FixedEnds]) -> Given:
    """The cases as columns. What the simple beams and the loads along a member bring to its joints acts on the
    joints."""
    m, t = held.members, held.members.table
    joints = len(held.frame.joints)
    force = np.zeros((joints, 2, len(ends)))
    for column, (table, end) in enumerate(zip(tables, ends, strict=True)):
        force[:, :, column] = table.joint[:, :2]
        # Along-loads all go to the `to` end: the axial force counted on is the one at the `from` end.
        brought = np.column_stack([np.zeros_like(end.along), end.along])
        x = brought * t.cos[:, None] + end.shear * t.sin[:, None]
        y = brought * t.sin[:, None] - end.shear * t.cos[:, None]
        for axis, part in enumerate((x, y)):
            force[:, axis, column] += summed(t.ends.ravel(), part.ravel(), joints)
    lengthening = _columns([e.lengthening for e in ends], len(t.length))
    # A slack member's own loads are carried as if both its ends were held.
    slack = m.held - m.axial
    return Given(
        couple=_columns([table.joint[:, 2] for table in tables], joints),
        force=held.sways.own_axes(force),
        fixed=np.stack([e.moment for e in ends], axis=-1) if ends else np.zeros((len(t.length), 2, 0)),
        pull=-m.axial[:, None] * lengthening - slack[:, None] * _columns([e.by_loads for e in ends], len(t.length)),
        length=np.where(m.rigid[:, None], lengthening, 0.0),
        ground=_columns([table.settlement.ravel() for table in tables], 3 * joints),
    )


def _columns(rows: Sequence[Floats], size: int) -> Floats:
    return np.array(rows, dtype=float).reshape(len(rows), size).T.copy()


def _refuse_misfits(held: Held, given: Given, state: State, names: Sequence[str]) -> None:
    """Raise UnusableInput for imposed lengths that the axially rigid frame cannot follow, members named."""
    off = misfits(held, given, state)
    s, members = held.sways, list(held.frame.members)
    ties = [f"tie {tie.name}" for tie in held.frame.ties.values() for _ in tie.joints[1:]]
    bars = [*(members[k] for k in s.rigid), *ties]
    problems = [
        Problem(
            held.frame.file, held.frame.lines.get(f"loads.{name}"), f"loads.{name}",
            "what keeps its length cannot follow what is imposed on it: "
            + ", ".join(dict.fromkeys(bars[k] for k in np.flatnonzero(off[:, column]))),
            'axial = "elastic" would let the members give way',
        )
        for column, name in enumerate(names)
        if off[:, column].any()
    ]  # fmt: skip
    if problems:
        raise UnusableInput(problems)


def _balance_rigid_members(held: Held, given: Given, state: State) -> None:
    """Forces of rigid members and ties from the balance of the joints; redundant ones are left at zero.

    Those that statics determines are the same whatever is put for the redundant ones.
    """
    s = held.sways
    if len(s.basic):
        every = np.arange(given.couple.shape[1])
        state.axial[s.rigid], state.tie = s.tensions(joint_forces(held, given, state, every)[s.free])


def case_answer(process: Process, column: int, undetermined: Undetermined) -> CaseAnswer:
    held, state, end = process.held, process.state, process.ends[column]
    length = held.members.table.length
    ends = np.empty((len(length), 2, 3))
    ends[:, 0, 0] = state.axial[:, column]
    ends[:, 1, 0] = state.axial[:, column] - end.along
    ends[:, :, 2] = state.moment[:, :, column]
    by_moments = ends[:, :, 2].sum(axis=1) / length
    ends[:, 0, 1] = end.shear[:, 0] - by_moments
    ends[:, 1, 1] = end.shear[:, 1] + by_moments
    ends[undetermined.axial, :, 0] = np.nan
    joints = np.column_stack([
        held.sways.global_axes(state.move[:, [column]])[:, :, 0],
        state.rotation[:, column],
    ])  # fmt: skip
    joints[undetermined.joints] = np.nan
    reactions = _reactions(process, column)
    reactions[undetermined.reactions] = np.nan
    return CaseAnswer(ends, joints, reactions)


def own_reactions(process: Process, column: int) -> Floats:
    """(2j,) forces on the frame along the supports' own axes: what held supports must add to balance their joint, and
    the springs' own forces."""
    held, given, state = process.held, process.given, process.state
    support = held.frame.support_table.stiffness[:, :2].ravel()
    # joint_forces counts the spring's push as acting; at a held direction there is none.
    return np.where(
        support == HELD, -joint_forces(held, given, state, np.array([column]))[:, 0], state.push[:, column]
    )


def _reactions(process: Process, column: int) -> Floats:
    """(j, 3) on the frame, global axes."""
    held, given, state = process.held, process.given, process.state
    support = held.frame.support_table.stiffness[:, 2]
    moments = joint_moments(held, given, state, np.array([column]))[:, 0]
    moment = np.where(support == HELD, -moments, state.twist[:, column])
    forces = held.sways.global_axes(own_reactions(process, column)[:, None])[:, :, 0]
    return np.column_stack([forces, moment])
