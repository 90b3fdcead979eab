"""One frame prepared for many questions: factor once, then answer for other loads or for a change in one place.

A change confined to one member shows outside it only as three self-balanced end actions (two moments and an axial force);
a change of one support only as forces or movements of its three directions; a change of load as forces on the joints of
its member. So every such change is a product of two small things: what a unit action does to the results asked for
(`Effects`, from the matrix factorised once), and how large the action is (a system of three equations). This is the
Woodbury identity (M. A. Woodbury 1950) in the terms of frames: no change of this kind needs another factorisation.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Any

import numpy as np
import scipy.sparse as sp

from crosscheck.answer import Answer, CaseAnswer, Undetermined
from crosscheck.frame.loads import LoadTable, direction_cosines, load_table
from crosscheck.frame.model import (
    FREE,
    HELD,
    Bools,
    Floats,
    Frame,
    Ints,
    JointCouple,
    JointForce,
    Load,
    LoadCase,
    MemberTable,
    Settlement,
    Variation,
)
from crosscheck.opinions.slope_deflection.members import coefficients, end_actions, fixed_ends, simple_beam_rotations
from crosscheck.opinions.slope_deflection.spans import ClosedFormSpans
from crosscheck.opinions.slope_deflection.system import Solution, System, gathered, support_axes

END, SPAN, REACTION, DISPLACEMENT = range(4)
"""Kinds of place."""
SINGULAR_PIVOT = 1e-13
"""A pivot below this share of its own diagonal entry is a movement without resistance."""
SINGULAR_CHANGE = 1e-9
"""A change that leaves less than this share of the stiffness makes a mechanism."""
FOLLOWS = 1e-6
"""Share of an imposed movement that axially rigid members may fail to follow by rounding alone."""
SWAYS, SETTLED, RUNAWAY = 300, 1e-11, 1e3
"""Most rounds for the effect of sway, the share of the largest pull by which the last may differ, and how many times the
first a pull may become: more would be within a thousandth of the critical load."""
STIFFER = 1e9
"""Stiffness factor that stands for a rigid one when load rotations are parted into what bends and what does not."""


@dataclass(frozen=True, slots=True)
class Places:
    """Where results are asked for, (n,) each: kind, column (axial, shear, moment; or x, y, rotation), member and its end
    or distance x and side of a jump, or joint; -1 where it means nothing."""

    kind: Ints
    column: Ints
    member: Ints
    end: Ints
    joint: Ints
    x: Floats
    side: Ints

    def part(self, rows: Ints) -> Places:
        """Some of the places."""
        return Places(*(getattr(self, f)[rows] for f in Places.__dataclass_fields__))


@dataclass(frozen=True, eq=False)
class Effects:
    """What unit actions do to the results at the places, n of them.

    force: (n, 3 j) of a unit force or couple on a joint along its support's axes, in directions that are not held; of a
      unit movement of the support in those that are. reaction: the same when the force comes from a support, so that it
      counts as a reaction. member: (n, 3 m) of a self-balanced moment at the `from` face, at the `to` face, tension.
    """

    force: Floats
    reaction: Floats
    member: Floats

    def part(self, rows: Ints) -> Effects:
        """The effects on some of the places."""
        return Effects(self.force[rows], self.reaction[rows], self.member[rows])


class ForceSpans(ClosedFormSpans):
    """Values along members whose turning points are those of shear and moment alone."""

    def turning_points(self, name: str) -> tuple[Ints, Floats]:
        left, right = self._pieces
        s = self._stations
        found = self._shear_places(name, s.member[left], s.x[left], s.x[right])
        return np.concatenate([m for m, _ in found]), np.concatenate([x for _, x in found])


class SwaySpans(ForceSpans):
    """Values along members whose chords alone are displaced: moments as of the chord, shear along the undisplaced axis.

    less: by case (m,) what the axial force takes off the shear of a turned chord.
    """

    def __init__(self, frame: Frame, tables: dict[str, LoadTable], cases: dict[str, CaseAnswer], none: Undetermined,
                 less: dict[str, Floats]) -> None:  # fmt: skip
        super().__init__(frame, tables, cases, none)
        self.less = less

    def along(self, name: str, member: Ints, x: Floats, side: Ints) -> Floats:
        """(n, 4) as of every opinion's spans."""
        values = np.array(super().along(name, member, x, side))
        values[:, 1] -= self.less[name][member]
        return values


class Prepared:
    """A frame with its matrix factorised. Raises ArithmeticError when asked of a frame that can move freely."""

    def __init__(self, frame: Frame) -> None:
        self.frame = frame
        self.system = System(frame)
        self.free = self.system.free
        self.B = self.system.deformation.tocsr()
        self.Bf = self.B[:, self.free].tocsc()
        self.Bf_rows = self.Bf.tocsr()
        self.D = self.system.member_stiffness
        self._states: dict[str, Solution] = {}
        self._turns: dict[str, tuple[Floats, Floats]] = {}
        self._shared_by: dict[tuple[int, ...], Floats] = {}
        self._check()

    def _check(self) -> None:
        """No pivot may vanish: the matrix of a mechanism is singular, whatever the load."""
        if not len(self.free):
            return
        try:
            self.system.correct(np.zeros((len(self.free), 1)))
        except RuntimeError as error:
            raise ArithmeticError("the frame can move freely") from error
        factor: Any = self.system._factor
        pivots = np.abs(factor.U.diagonal())[factor.perm_c]
        if not np.all(pivots > SINGULAR_PIVOT * np.abs(self.system.matrix.diagonal())):
            raise ArithmeticError("the frame can move freely")

    # --- answers ---

    def answer(self, names: Sequence[str], loaded: Frame | None = None, deflections: bool = False) -> Answer:
        """Results of cases and combinations, with the loads of `loaded` (the same structure) where given.

        deflections: whether largest deflections along members will be asked for; finding them is slow.
        """
        source = self.frame if loaded is None else loaded
        tables = [load_table(source, name) for name in names]
        solution = self.system.solve(tables)
        none = self._all_determined
        cases = {name: solution.case_answer(k, none) for k, name in enumerate(names)}
        spans = ClosedFormSpans if deflections else ForceSpans
        return Answer("slope-deflection", cases, none, spans(source, dict(zip(names, tables, strict=True)), cases, none))

    def sway_answer(self, names: Sequence[str]) -> Answer | None:
        """Results with the second-order effect of sway alone: axial forces act on chords that turn, not on members that
        bend. None where that does not settle: near or past the load at which the frame sways away.

        A chord of length L whose ends have moved apart by d across it needs N d / L more shear. It is put on the joints
        as loads, found again from the displacements until these stand (E. Rosenblueth 1965; S. E. Wood, D. Beaulieu and
        P. F. Adams 1976; from memory), and taken off the members' shears in the end.
        """
        tables = [load_table(self.frame, name) for name in names]
        pull = np.zeros((len(self.frame.members), len(names)))
        reach, first = 0.0, np.inf
        for _ in range(SWAYS):
            solution = self.system.solve([self._pulled(t, p) for t, p in zip(tables, pull.T, strict=True)])
            new = self._chord_pulls(solution)
            reach = max(reach, float(np.abs(new).max(initial=0.0)))
            still = float(np.abs(new - pull).max(initial=0.0)) <= SETTLED * reach
            pull = new
            if still:
                return self._swayed(names, tables, solution, pull)
            first = min(first, reach or np.inf)
            if reach > RUNAWAY * first:
                return None
        return None

    def _chord_pulls(self, solution: Solution) -> Floats:
        """(m, cases) mean axial force of the two ends times the turn of the chord, counter-clockwise."""
        t = self.frame.member_table
        moved = (self._axes.T @ solution.shift).reshape(-1, 3, solution.shift.shape[1])
        apart = moved[t.ends[:, 1]] - moved[t.ends[:, 0]]
        across = -t.sin[:, None] * apart[:, 0] + t.cos[:, None] * apart[:, 1]
        cases = [solution.case_answer(k, self._all_determined) for k in range(solution.shift.shape[1])]
        axial = np.stack([c.ends[:, :, 0].mean(axis=1) for c in cases], axis=1)
        return np.asarray(axial * across / t.length[:, None])

    def _pulled(self, table: LoadTable, pull: Floats) -> LoadTable:
        """The loads with what turned chords do to the joints; pull: (m,)."""
        t = self.frame.member_table
        joint = table.joint.copy()
        across = np.column_stack([-t.sin, t.cos]) * pull[:, None]
        np.add.at(joint[:, :2], t.ends[:, 0], across)
        np.add.at(joint[:, :2], t.ends[:, 1], -across)
        return replace(table, joint=joint)

    def _swayed(self, names: Sequence[str], tables: list[LoadTable], solution: Solution, pull: Floats) -> Answer:
        none = self._all_determined
        chord = {name: solution.case_answer(k, none) for k, name in enumerate(names)}
        less = {name: pull[:, k] for k, name in enumerate(names)}
        shear = np.array([-1.0, 1.0])
        cases = {}
        for name, c in chord.items():
            ends = c.ends.copy()
            ends[:, :, 1] += less[name][:, None] * shear
            cases[name] = replace(c, ends=ends)
        spans = SwaySpans(self.frame, dict(zip(names, tables, strict=True)), chord, none, less)
        return Answer("slope-deflection", cases, none, spans)

    @cached_property
    def _all_determined(self) -> Undetermined:
        m, j = len(self.frame.members), len(self.frame.joints)
        return Undetermined(np.zeros(m, dtype=bool), np.zeros((j, 3), dtype=bool), np.zeros((j, 3), dtype=bool))

    def _state(self, name: str) -> Solution:
        if name not in self._states:
            self._states[name] = self.system.solve([load_table(self.frame, name)])
        return self._states[name]

    def _pull(self, name: str) -> Floats:
        """(j, 3) what the supports supply at each joint, global axes; nothing but rounding where there is none."""
        state = self._state(name)
        fixed = state.fixed[0]
        ends = end_actions(self.frame, state.forces[:, :2, 0], state.forces[:, 2, 0] + fixed.axial, fixed)
        pull = gathered(self.frame, ends) - state.tables[0].joint
        ties = self._axes.T @ (self.system.ties.T @ state.ties[:, 0])
        return np.asarray(pull + np.asarray(ties).reshape(-1, 3))

    # --- effects ---

    @cached_property
    def _axes(self) -> Any:
        return support_axes(self.frame).tocsr()

    @cached_property
    def _ends(self) -> Any:
        """(6 m, 3 m): end actions at the joints from the moments at the faces and the axial force."""
        t = self.frame.member_table
        m = np.arange(len(t.length))
        up, z1, z2 = 1 / t.clear, t.zone[:, 0] / t.clear, t.zone[:, 1] / t.clear
        one = np.ones(len(m))
        parts = [
            (0, 2, one), (3, 2, one), (1, 0, -up), (1, 1, -up), (4, 0, up), (4, 1, up),
            (2, 0, one + z1), (2, 1, z1), (5, 1, one + z2), (5, 0, z2),
        ]  # fmt: skip
        rows = np.concatenate([6 * m + r for r, _, _ in parts])
        columns = np.concatenate([3 * m + c for _, c, _ in parts])
        data = np.concatenate([d for _, _, d in parts])
        return sp.csr_matrix((data, (rows, columns)), shape=(6 * len(m), 3 * len(m)))

    @property
    def _restrained(self) -> Bools:
        return np.asarray(self.frame.support_table.stiffness.ravel() != FREE)

    @cached_property
    def _unit(self) -> tuple[Floats, Floats]:
        """(3 j, 3 j) displacements and (3 m, 3 j) member forces of a unit force in each direction that is free, and of a
        unit movement of each that is held; corrected in rounds, so that axially rigid members keep their lengths."""
        size, system = 3 * len(self.frame.joints), self.system
        outer, shift = np.zeros((size, size)), np.zeros((size, size))
        outer[self.free, self.free] = 1.0
        held = np.flatnonzero(system.held)
        shift[held, held] = 1.0
        forces = np.asarray(self.D @ (self.B @ shift))
        forces, shift, _ = system._settle(forces, shift, outer, np.zeros((len(self.frame.members), size)))
        return shift, forces

    def effects(self, places: Places) -> Effects:
        """Unit effects at the places (for values along a member: axial, shear and moment only)."""
        from_forces, from_moves = self._readers(places)
        shift, forces = self._unit
        force = np.asarray(from_forces @ forces + from_moves @ shift)
        member = from_forces.toarray() - (self.Bf @ force[:, self.free].T).T
        reaction = force.copy()
        rows = np.flatnonzero(places.kind == REACTION)
        turned = self._axes.T.tocsr()[3 * places.joint[rows] + places.column[rows]]
        reaction[rows] += (turned @ sp.diags((~self._restrained).astype(float))).toarray()
        return Effects(force, reaction, np.asarray(member))

    def stretch_effects(self, places: Places) -> Floats:
        """(n, m) effect on the places of a unit elongation imposed on each axially rigid member; nil for elastic ones,
        where a pair of forces on its joints does the same."""
        m, size = len(self.frame.members), 3 * len(self.frame.joints)
        if not self.system.rigid.any():
            return np.zeros((len(places.kind), m))
        nil, unit = np.zeros((size, m)), np.diag(self.system.rigid.astype(float))
        forces, shift, _ = self.system._settle(np.zeros((3 * m, m)), nil.copy(), nil, unit)
        from_forces, from_moves = self._readers(places)
        return np.asarray(from_forces @ forces + from_moves @ shift)

    def _readers(self, p: Places) -> tuple[Any, Any]:
        """(n, 3 m) and (n, 3 j): the places' values from member forces and from displacements in the supports' axes."""
        m, j, n = len(self.frame.members), len(self.frame.joints), len(p.kind)
        row = np.arange(n)
        near = np.where(p.end == 1, 1, 0)
        on = np.flatnonzero((p.kind == END) | (p.kind == SPAN))
        column = 6 * p.member[on] + 3 * near[on] + p.column[on]
        lever = np.flatnonzero((p.kind == SPAN) & (p.column == 2))
        picks = sp.csr_matrix(
            (np.concatenate([np.ones(len(on)), p.x[lever]]),
             (np.concatenate([on, lever]), np.concatenate([column, 6 * p.member[lever] + 1]))), shape=(n, 6 * m),
        )  # fmt: skip
        forces = picks @ self._ends
        pull = np.flatnonzero(p.kind == REACTION)
        choose = sp.csr_matrix((np.ones(len(pull)), (pull, 3 * p.joint[pull] + p.column[pull])), shape=(n, 3 * j))
        forces = forces + choose @ self._axes.T @ sp.diags(self._restrained.astype(float)) @ self.B.T
        go = row[p.kind == DISPLACEMENT]
        moves = sp.csr_matrix((np.ones(len(go)), (go, 3 * p.joint[go] + p.column[go])), shape=(n, 3 * j)) @ self._axes.T
        return forces.tocsr(), moves.tocsr()

    # --- how large the actions are ---

    @cached_property
    def _own(self) -> Floats:
        """(m, 3, 3) deformation of each member under its own self-balanced actions, the rest of the frame included."""
        m = len(self.frame.members)
        moved = np.asarray(self.Bf @ self._unit[0][np.ix_(self.free, self.free)])
        out = np.zeros((m, 3, 3))
        for k in range(m):
            rows = slice(3 * k, 3 * k + 3)
            out[k] = (self.Bf_rows[rows] @ moved[rows].T).T
        return out

    @cached_property
    def _blocks(self) -> Floats:
        """(m, 3, 3) stiffness of each member."""
        c = self.system.coefficients
        out = np.zeros((len(c.axial), 3, 3))
        out[:, :2, :2] = c.stiffness
        out[:, 2, 2] = self.D.diagonal()[2::3]
        return out

    def _load_rotations(self, name: str) -> tuple[Floats, Floats]:
        """(m, 2) end rotations of the loaded simple beams: the part that bending stiffness divides, and the rest."""
        if name not in self._turns:
            table = load_table(self.frame, name)
            stiff = replace(self.frame)
            t = self.frame.member_table
            stiff.__dict__["member_table"] = replace(t, I=t.I * STIFFER)
            if t.varying.any():
                stiff.__dict__["variation"] = replace(self.frame.variation, I=self.frame.variation.I * STIFFER)
            rest = simple_beam_rotations(stiff, table)
            self._turns[name] = simple_beam_rotations(self.frame, table) - rest, rest
        return self._turns[name]

    def member_actions(self, name: str, member: Ints, bending: Floats, stretching: Floats, turn: Floats) -> Floats:
        """(n, 3) actions that stand for one member's change, n changes each on its own: EI and EA times `bending` and
        `stretching` (n,), end connections `turn` (n, 2). NaN where the change makes a mechanism."""
        blocks, right = self._changed_members(name, member, bending, stretching, turn)
        matrix = np.eye(3) + (blocks - self._blocks[member]) @ self._own[member]
        return _solved(matrix, right)

    def joint_actions(self, name: str, member: Ints, bending: Floats, stretching: Floats) -> Floats:
        """(n, 3) actions that stand for n members changed together. NaN where the change makes a mechanism."""
        turn = self.frame.member_table.turn[member]
        blocks, right = self._changed_members(name, member, bending, stretching, turn)
        n = len(member)
        less = blocks - self._blocks[member]
        shared = self._shared(tuple(member.tolist())).reshape(n, 3, 3 * n)
        matrix = np.eye(3 * n) + np.einsum("nij,njk->nik", less, shared).reshape(3 * n, 3 * n)
        try:
            return np.asarray(np.linalg.solve(matrix, right.ravel()).reshape(n, 3))
        except np.linalg.LinAlgError:
            return np.full((n, 3), np.nan)

    def _shared(self, member: tuple[int, ...]) -> Floats:
        """(3 n, 3 n) deformations of some members under their own and each other's self-balanced actions."""
        if member not in self._shared_by:
            rows = self.Bf_rows[(3 * np.array(member)[:, None] + np.arange(3)).ravel()]
            moved = self._unit[0][np.ix_(self.free, self.free)]
            self._shared_by[member] = np.asarray(rows @ (rows @ moved).T)
        return self._shared_by[member]

    def _changed_members(
        self, name: str, member: Ints, bending: Floats, stretching: Floats, turn: Floats
    ) -> tuple[Floats, Floats]:
        """(n, 3, 3) new stiffness of members, and (n, 3) their forces at the old deformations less the old forces."""
        t = self.frame.member_table
        bench = replace(self.frame)
        fields = {f: getattr(t, f)[member] for f in MemberTable.__dataclass_fields__}
        fields |= {"I": fields["I"] * bending, "A": fields["A"] * stretching, "turn": turn}
        bench.__dict__["member_table"] = MemberTable(**fields)
        if fields["varying"].any():
            bench.__dict__["variation"] = _each_varied(self.frame.variation, member, bending, stretching)
        new = coefficients(bench)
        blocks = np.zeros((len(member), 3, 3))
        blocks[:, :2, :2] = new.stiffness
        rigid = self.system.rigid[member]
        blocks[:, 2, 2] = np.where(rigid, self._blocks[member, 2, 2], new.axial)
        state = self._state(name)
        bends, rest = self._load_rotations(name)
        free = np.zeros((len(member), 3))
        free[:, :2] = bends[member] / bending[:, None] + rest[member]
        free[:, 2] = state.fixed[0].stretch[member]
        deformed = (self.B @ state.shift[:, 0]).reshape(-1, 3)[member]
        right = np.einsum("nij,nj->ni", blocks, deformed - free) - state.forces[member, :, 0]
        right[rigid, 2] = 0.0
        return blocks, right

    @cached_property
    def _support_response(self) -> tuple[Floats, Floats]:
        """(j, 3, 3) response of each joint's three directions to actions there, and (j, 3) its scale: displacement to
        force where not held, reaction to movement where held."""
        j, held = len(self.frame.joints), self.system.held
        shift, forces = self._unit
        whole = np.where(held[:, None], self.B.T @ forces, shift).reshape(j, 3, j, 3)
        out = whole[np.arange(j), :, np.arange(j)]
        own = (self.B.T @ self.D @ self.B).diagonal().reshape(-1, 3)
        scale = np.where(held.reshape(-1, 3), own, np.einsum("jii->ji", out))
        return out, np.where(scale > 0, scale, 1.0)

    @cached_property
    def support_stiffness(self) -> Floats:
        """(j, 3) how stiffly the frame resists a movement in each direction of each joint's support axes; at least tiny."""
        response, scale = self._support_response
        own = np.abs(np.einsum("jii->ji", response))
        stiff = np.where(self.system.held.reshape(-1, 3), own, 1 / np.where(own > 0, own, np.inf))
        return np.asarray(np.where(stiff > 0, stiff, scale))

    @cached_property
    def _stuck(self) -> Bools:
        """(3 j,) held directions along which axially rigid members let nothing move: their release changes nothing."""
        rigid = 3 * np.flatnonzero(self.system.rigid) + 2
        longer = np.abs(self.B[rigid] @ self._unit[0])
        length = float(self.frame.member_table.length.max(initial=1.0))
        unit = np.tile([1.0, 1.0, length], len(self.frame.joints))
        return np.asarray(self.system.held & (longer.max(axis=0, initial=0.0) > FOLLOWS * unit))

    def support_actions(self, name: str, joint: Ints, stiffness: Floats) -> Floats:
        """(n, 3) actions along a joint's support axes that stand for its support having `stiffness` (n, 3) instead.
        NaN where that makes a mechanism."""
        response, scale = (a[joint] for a in self._support_response)
        s = self.frame.support_table
        held = self.system.held.reshape(-1, 3)[joint]
        old = np.where(held, 0.0, s.stiffness[joint])
        state = self._state(name)
        moved = state.shift[:, 0].reshape(-1, 3)[joint]
        settled = state.tables[0].settlement[joint]
        pull = (self._axes @ self._pull(name).ravel()).reshape(-1, 3)[joint]
        matrix, right = np.zeros((len(joint), 3, 3)), np.zeros((len(joint), 3))
        stays = held & (stiffness == HELD) | (~held & (stiffness == old))
        stuck = self._stuck.reshape(-1, 3)[joint] & ~stays
        # Two such directions together may let the joint move between them: not to be told from each alone.
        astray = stuck.sum(axis=1) > 1
        stays |= stuck
        finite = np.where(np.isinf(stiffness), 0.0, stiffness)
        unit = np.eye(3)
        for i in range(3):
            loosened, stopped = held[:, i] & ~stays[:, i], ~held[:, i] & np.isinf(stiffness[:, i])
            changed = ~held[:, i] & ~stays[:, i] & ~stopped
            k, up = finite[:, i], finite[:, i] - old[:, i]
            size = scale[:, i]
            matrix[:, i] = np.where(stays[:, i, None], unit[i], 0.0)
            matrix[:, i] += np.where(loosened[:, None], (response[:, i] + k[:, None] * unit[i]) / (size + k)[:, None], 0.0)
            right[:, i] += np.where(loosened, -pull[:, i] / (size + k), 0.0)
            matrix[:, i] += np.where(stopped[:, None], response[:, i] / size[:, None], 0.0)
            right[:, i] += np.where(stopped, (settled[:, i] - moved[:, i]) / size, 0.0)
            matrix[:, i] += np.where(changed[:, None], unit[i] + up[:, None] * response[:, i], 0.0)
            right[:, i] += np.where(changed, -up * (moved[:, i] - settled[:, i]), 0.0)
        actions = _solved(matrix, right)
        actions[astray] = np.nan
        return actions

    # --- loads ---

    def load_effects(self, loads: Sequence[Load], places: Places, effects: Effects) -> Floats:
        """(n, k) effect of each of k loads (not self weight) on the places."""
        count = len(loads)
        out = np.zeros((len(places.kind), count))
        if not count:
            return out
        onto = np.zeros((3 * len(self.frame.joints), count))
        moved = np.zeros_like(onto)
        self._on_joints(loads, onto, moved)
        on = [k for k, load in enumerate(loads) if hasattr(load, "member")]
        if on:
            self._on_members([loads[k] for k in on], np.array(on), places, onto, out)
        free = ~self.system.held[:, None]
        out += _by_few(effects.force, np.where(free, onto, moved))
        if moved.any():
            out += _by_few(effects.reaction, np.where(free, self.system.spring[:, None] * moved, 0.0))
        rows = np.flatnonzero(places.kind == REACTION)
        turned = self._axes.T.tocsr()[3 * places.joint[rows] + places.column[rows]]
        # A force that goes straight into a held direction; one beside it in a free direction reacts nowhere here.
        out[rows] -= turned @ (onto * self._restrained[:, None])
        return out

    def _on_joints(self, loads: Sequence[Load], onto: Floats, moved: Floats) -> None:
        """Forces on joints and settlements, column by column, along the supports' axes."""
        directly = np.zeros_like(onto)
        for k, load in enumerate(loads):
            if not isinstance(load, (JointForce, JointCouple, Settlement)):
                continue
            at = 3 * self.frame.joint_index[load.joint]
            if isinstance(load, Settlement):
                moved[at : at + 3, k] = load.x, load.y, load.rotation
            elif isinstance(load, JointForce):
                directly[at : at + 2, k] = load.force * np.array(direction_cosines(load.direction))
            else:
                directly[at + 2, k] = load.couple
        onto += self._axes @ directly

    def _on_members(self, loads: Sequence[Load], place: Ints, places: Places, onto: Floats, out: Floats) -> None:
        members = list(self.frame.members.values())
        of = np.array([self.frame.member_index[load.member] for load in loads])  # type: ignore[union-attr]
        copies = {str(k): replace(members[m], name=str(k)) for k, m in enumerate(of.tolist())}
        bench = replace(self.frame, members=copies, combinations={})
        whole = self.frame.member_table
        bench.__dict__["member_table"] = MemberTable(**{f: getattr(whole, f)[of] for f in MemberTable.__dataclass_fields__})
        if whole.varying[of].any():
            bench.__dict__["variation"] = _each_varied(self.frame.variation, of, np.ones(len(of)), np.ones(len(of)))
        each_load: list[Any] = list(loads)
        case = tuple(replace(load, member=str(k)) for k, load in enumerate(each_load))
        table = _one_case(bench, case)
        fixed = fixed_ends(bench, table, self.system.coefficients.stiffness[of])
        rigid = self.system.rigid[of]
        pulled = np.where(rigid, 0.0, -self.system.coefficients.axial[of] * fixed.stretch)
        longer = np.flatnonzero(rigid & (fixed.stretch != 0.0))
        if len(longer):  # no pair of forces does what a rigid member's elongation does
            out[:, place[longer]] += self.stretch_effects(places)[:, of[longer]] * fixed.stretch[longer]
        ends = end_actions(bench, fixed.moments, pulled + fixed.axial, fixed)
        on_joints = _gathered_each(bench, ends)
        t = bench.member_table
        each = np.zeros((len(of), len(self.frame.joints), 3))
        copy = np.arange(len(of))
        np.add.at(each, (copy, t.ends[:, 0]), on_joints[:, 0])
        np.add.at(each, (copy, t.ends[:, 1]), on_joints[:, 1])
        onto[:, place] -= self._axes @ each.reshape(len(of), -1).T
        self._on_own_member(of, place, places, bench, table, ends, out)

    def _on_own_member(
        self, of: Ints, place: Ints, places: Places, bench: Frame, table: LoadTable, ends: Floats, out: Floats
    ) -> None:
        rows = np.flatnonzero((places.kind == END) | (places.kind == SPAN))
        order = np.argsort(of, kind="stable")
        first = np.searchsorted(of[order], places.member[rows])
        last = np.searchsorted(of[order], places.member[rows], side="right")
        count = last - first
        row = np.repeat(rows, count)
        offset = np.arange(int(count.sum())) - np.repeat(np.cumsum(count) - count, count)
        copy = order[np.repeat(first, count) + offset]
        if not len(row):
            return
        at_end = places.kind[row] == END
        column = places.column[row]
        value = ends[copy, np.where(places.end[row] == 1, 1, 0), column]
        inner = ~at_end
        if inner.any():
            nil = np.zeros((len(bench.joints), 3))
            spans = ClosedFormSpans(bench, {"": table}, {"": CaseAnswer(ends, nil, nil)}, self._all_determined)
            along = spans.along("", copy[inner], places.x[row[inner]], places.side[row[inner]])
            value[inner] = along[np.arange(int(inner.sum())), column[inner]]
        out[row, place[copy]] += value


def _each_varied(v: Variation, member: Ints, bending: Floats, stretching: Floats) -> Variation:
    """The pieces of each of some members (n,), as those of members 0 to n - 1, with I and A times factors (n,)."""
    first, last = np.searchsorted(v.member, member), np.searchsorted(v.member, member, side="right")
    count = last - first
    own = np.repeat(np.arange(len(member)), count)
    row = np.arange(len(own)) + np.repeat(first - (np.cumsum(count) - count), count)
    fields = {f: getattr(v, f)[row] for f in Variation.__dataclass_fields__}
    fields |= {"member": own, "I": fields["I"] * bending[own, None], "A": fields["A"] * stretching[own, None]}
    return Variation(**fields)


def working_frame(frame: Frame, name: str) -> Frame:
    """The frame without the one-way members and supports that are out under a case or combination in first order; all of
    them stay in where no settled state is found."""
    if not frame.one_way:
        return frame
    from crosscheck.opinions.slope_deflection.one_way import OneWay

    settled = OneWay(frame).settled(name)
    return frame if settled is None else settled.frame


def prepared(frame: Frame) -> Prepared:
    """The frame with its matrix factorised. Raises ArithmeticError where it can move freely."""
    return Prepared(frame)


def _by_few(effects: Floats, loads: Floats) -> Floats:
    """effects (n, d) times loads (d, k) of which each column has few entries: a load touches two joints."""
    return np.asarray((sp.csr_matrix(loads.T) @ effects.T).T)


def _gathered_each(frame: Frame, ends: Floats) -> Floats:
    """(m, 2, 3) what acts on each end of each member, in global axes."""
    t = frame.member_table
    sign = np.array([-1.0, 1.0])
    along, across = ends[:, :, 0] * sign, ends[:, :, 1]
    c, s = t.cos[:, None], t.sin[:, None]
    return np.stack([along * c - across * s, along * s + across * c, ends[:, :, 2]], axis=2)


def _one_case(frame: Frame, loads: tuple[Load, ...]) -> LoadTable:
    changed = replace(frame, cases={"": LoadCase("", loads)}, combinations={})
    for name in ("member_table", "variation", "joint_index", "member_index", "support_table", "xy"):
        if name in frame.__dict__:
            changed.__dict__[name] = frame.__dict__[name]
    return load_table(changed, "")


def _solved(matrix: Floats, right: Floats) -> Floats:
    """Solutions of (n, 3, 3) systems; NaN where singular."""
    good = np.abs(np.linalg.det(matrix)) > SINGULAR_CHANGE
    out = np.full(right.shape, np.nan)
    out[good] = np.linalg.solve(matrix[good], right[good][:, :, None])[:, :, 0]
    return out
