"""Distribution on the displaced frame, the axial forces taken as known: stiffness and carry-over are those under them.

The joints are held, released one at a time in turn, there and back, each passing on what it carries over; the sways are
let go by their holding forces. As long as the frame is stable under these axial forces its stiffness is positive
definite, and then releasing one joint at a time is sure to settle (L. Seidel 1874), which releasing all at once
is not: near the buckling of held joints a carry-over passes on more than it takes. What a round leaves over is finished by
conjugate gradients, each step one more round (M. Hestenes and E. Stiefel 1952).
"""

from __future__ import annotations

from dataclasses import dataclass, fields
from functools import cached_property
from typing import Any

import numpy as np
from scipy import sparse
from scipy.linalg import LinAlgError, cholesky
from scipy.sparse.linalg import splu

from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import HELD, Floats
from crosscheck.opinions.moment_distribution.distribution import conjugate
from crosscheck.opinions.moment_distribution.holding import Held
from crosscheck.opinions.moment_distribution.pieces import Pieces, summed
from crosscheck.opinions.moment_distribution.stretches import Bowed

SETTLED = 4e-15
"""Unbalanced share of the largest force or moment at which joints and sways count as balanced."""
STUCK = 1e-11
"""Unbalanced share at which a pass that no longer helps is the last."""
LEAVE = 1e-9
"""Share of what is unbalanced that one pass may leave; the next pass takes it up."""
MOST_PASSES = 16
DENSE = 400
"""Up to so many rotations and sways a full table is quicker than a sparse one."""


@dataclass(frozen=True)
class Acting:
    """One case: `couple` (j,) on joints, `force` (2j,) on joints along their own axes, with the sum of its loads at
    each member's `to` end; across, along: (m,) those sums, along local +y and +x."""

    couple: Floats
    force: Floats
    across: Floats
    along: Floats


@dataclass(slots=True)
class Position:
    """Where the frame has come to: rotation (j,), move (2j,) along own axes; and, summed up from the corrections,
    axial (m,) force of the elastic members at the `from` end, push (2j,) and twist (j,) of support springs."""

    rotation: Floats
    move: Floats
    axial: Floats
    push: Floats
    twist: Floats

    def scaled(self, part: float) -> Position:
        """A copy, all times `part`."""
        return Position(*(part * getattr(self, field.name) for field in fields(self)))


@dataclass(frozen=True, slots=True)
class Round:
    """One pass: steps of the corrections, and the unbalanced moment and holding force before it."""

    steps: int
    moment: float
    force: float


def acting(held: Held, loads: LoadTable, pieces: Pieces) -> Acting:
    """What acts on the joints, and the sums of the members' loads."""
    t = held.members.table
    along, across = pieces.along[pieces.last], pieces.shear[pieces.last]
    force = loads.joint[:, :2].copy()
    to, joints = t.ends[:, 1], len(force)
    force[:, 0] += summed(to, along * t.cos - across * t.sin, joints)
    force[:, 1] += summed(to, along * t.sin + across * t.cos, joints)
    return Acting(loads.joint[:, 2], held.sways.own_axes(force[:, :, None])[:, 0], across, along)


@dataclass(frozen=True)
class Freedom:
    """What can move, whatever the axial forces: r rotations of the turning joints, and q sways behind them."""

    held: Held

    @property
    def rotations(self) -> int:
        return len(self.held.turning)

    @cached_property
    def spread(self) -> Any:
        """(3m, r + q) sparse: clockwise rotations of every member's two joints and chord per rotation and sway."""
        held, s = self.held, self.held.sways
        members, joints = held.ends.shape[0], len(held.frame.joints)
        rows = 3 * np.repeat(np.arange(members), 2) + np.tile([0, 1], members)
        turned = sparse.csr_array((np.ones(2 * members), (rows, held.ends.ravel())), shape=(3 * members, joints))
        to_chord = (np.ones(members), (3 * np.arange(members) + 2, np.arange(members)))
        chord = sparse.csr_array(to_chord, shape=(3 * members, members)) @ (s.turn[:, s.free] @ s.shape)
        return sparse.csr_array(sparse.hstack([turned[:, held.turning], chord]))

    @cached_property
    def constant(self) -> Any:
        """(r + q, r + q) sparse: what rotation and translation springs and the members' lengths resist."""
        held, s = self.held, self.held.sways
        stretch = s.stretch[:, s.free] @ s.shape
        axial, ground = sparse.diags_array(held.members.axial), sparse.diags_array(s.ground[s.free])
        sways = stretch.T @ axial @ stretch + s.shape.T @ ground @ s.shape
        joints = sparse.diags_array(held.rotation_spring[held.turning])
        return sparse.csr_array(sparse.block_diag([joints, sways]))

    @cached_property
    def start(self) -> Floats:
        """(r + q,) the members' own stiffness without axial force and what is constant, one unknown at a time."""
        k = self.held.members.joint
        whole = np.zeros((len(k), 3, 3))
        whole[:, :2, :2], whole[:, :2, 2], whole[:, 2, :2] = k, -k.sum(axis=2), -k.sum(axis=1)
        whole[:, 2, 2] = k.sum(axis=(1, 2))
        return np.asarray(self.assembled(whole).diagonal())

    def assembled(self, stiffness: Floats) -> Any:
        """(r + q, r + q) sparse: moments and holding forces per rotation and sway, from the members' (m, 3, 3)."""
        m = len(stiffness)
        blocks = sparse.bsr_array((stiffness, np.arange(m), np.arange(m + 1)), shape=(3 * m, 3 * m))
        return sparse.csr_array(self.spread.T @ (blocks @ self.spread) + self.constant)


@dataclass(frozen=True)
class Displaced:
    """A frame under axial forces taken as known; moments and holding forces stand in the order of `freedom`."""

    freedom: Freedom
    bowed: Bowed

    @property
    def held(self) -> Held:
        return self.freedom.held

    @cached_property
    def whole(self) -> Any:
        """(r + q, r + q) sparse: moments on the joints and holding forces per rotation and per unit sway."""
        return self.freedom.assembled(self.bowed.stiffness)

    @cached_property
    def joints(self) -> Any:
        """(r, r) sparse: moments that hold the turning joints per rotation."""
        r = self.freedom.rotations
        return sparse.csr_array(self.whole[:r, :r])

    @cached_property
    def stable(self) -> bool:
        """No member buckled between held ends, and no joint or sway that gives way when let go after others."""
        if self.bowed.buckled.any():
            return False
        own = self.whole.diagonal()
        return bool(np.all(own > 0)) and (not len(own) or _positive(self.whole, own))

    @cached_property
    def turns(self) -> Any:
        """Factorised lower triangle of `joints`: the joints released one at a time, in their order."""
        return _in_order(self.joints)

    def release(self, moment: Floats) -> Floats:
        """(r, 1) rotations when the joints are released one at a time there and back, starting at these moments."""
        if not moment.size:
            return moment
        forth = self.turns.solve(moment)
        return np.asarray(self.turns.solve(self.own[:, None] * forth, trans="T"))

    @cached_property
    def own(self) -> Floats:
        """(r,) sum of the stiffnesses that meet at each turning joint."""
        return np.asarray(self.joints.diagonal())

    @cached_property
    def holding(self) -> Any:
        """Factorised holding forces per unit sway, every rotation held."""
        r = self.freedom.rotations
        sways = sparse.csc_array(self.whole[r:, r:])
        return splu(sways, permc_spec="MMD_AT_PLUS_A", options={"SymmetricMode": True})

    def correct(self, moment: Floats, force: Floats, leave: float) -> tuple[Floats, Floats, int]:
        """Rotations (r,) and sways (q,) that take what is unbalanced but for the share `leave`, and the steps."""
        r = len(moment)
        left = np.concatenate([moment, force])[:, None]
        arm = float(self.held.members.table.length.mean())
        most = np.abs(moment).max(initial=0.0) + arm * np.abs(force).max(initial=0.0)
        goal = leave * np.repeat([most, most / arm], [r, len(force)])[:, None]
        hold = self.holding.solve if len(force) else np.asarray
        found, steps = conjugate(
            lambda x: np.asarray(self.whole @ x),
            lambda x: np.vstack([self.release(x[:r]), hold(x[r:])]),
            left, goal, 4 * len(left) + 100,
        )  # fmt: skip
        return found[:r, 0], found[r:, 0], steps

    def movements(self, position: Position) -> Floats:
        """(m, 3) clockwise rotations of the members' joints and chords."""
        turned = position.rotation[self.held.ends]
        return np.column_stack([turned, self.held.sways.turn @ position.move])

    def moments(self, position: Position) -> Floats:
        """(m, 3) clockwise moments on the ends at the joints, and length * shear at the `from` end."""
        b = self.bowed
        return np.asarray(np.einsum("mij,mj->mi", b.stiffness, self.movements(position)) + b.fixed)

    def joint_moments(self, case: Acting, position: Position, ends: Floats) -> Floats:
        """(j,) clockwise moments left over on the joints, supports that hold apart."""
        return np.asarray(case.couple + position.twist - self.held.gather @ ends[:, :2].ravel())

    def joint_forces(self, case: Acting, position: Position, ends: Floats) -> Floats:
        """(2j,) forces left over on the joints along their own axes, supports that hold apart."""
        s = self.held.sways
        return np.asarray(case.force + position.push - s.turn.T @ ends[:, 2] - s.stretch.T @ position.axial)

    def settle(self, case: Acting, position: Position) -> tuple[list[Round], float]:
        """Correct `position`, pass after pass; the passes, and the share left unbalanced."""
        trace: list[Round] = []
        s, share = self.held.sways, np.inf
        while True:
            ends = self.moments(position)
            moment = self.joint_moments(case, position, ends)[self.held.turning]
            force = s.shape.T @ self.joint_forces(case, position, ends)[s.free]
            size_moment, size_force = self._sizes(case, position, ends)
            before = share
            share = max(_share(moment, size_moment), _share(force, size_force))
            done = share <= SETTLED or (len(trace) > 1 and share > 0.25 * before and share < STUCK)
            if done or len(trace) == MOST_PASSES or share > 1e6 * min(before, 1.0):
                return trace, share
            leave = float(np.clip(0.1 * SETTLED / share, LEAVE, 0.01))
            turned, swayed, steps = self.correct(moment, force, leave)
            trace.append(Round(steps, _largest(moment), _largest(force)))
            self._apply(position, turned, swayed)

    def _sizes(self, case: Acting, position: Position, ends: Floats) -> tuple[float, float]:
        """What moments and forces at the joints are sums of."""
        length = self.held.members.table.length
        force = _largest(ends[:, 2] / length) + sum(map(_largest, (case.force, position.push, position.axial)))
        moment = _largest(ends[:, :2]) + _largest(case.couple) + _largest(position.twist)
        return moment + force * _largest(length), force

    def _apply(self, position: Position, turned: Floats, swayed: Floats) -> None:
        held, s = self.held, self.held.sways
        rotation, move = np.zeros_like(position.rotation), np.zeros_like(position.move)
        rotation[held.turning] = turned
        move[s.free] = s.shape @ swayed
        position.rotation += rotation
        position.move += move
        position.axial += held.members.axial * (s.stretch @ move)
        position.push -= s.ground * move
        position.twist -= held.rotation_spring * rotation

    def tensions(self, case: Acting, position: Position) -> tuple[Floats, Floats]:
        """(m,) axial forces at the `from` ends in this position, those of rigid members from the balance of the joints; and
        (t,) forces of the ties from it."""
        s, found = self.held.sways, position.axial.copy()
        if not len(s.basic):
            return found, np.zeros(s.together.shape[0])
        force = self.joint_forces(case, position, self.moments(position))[s.free]
        rigid, tie = s.tensions(force[:, None])
        found[s.rigid] = rigid[:, 0]
        return found, tie[:, 0]

    def axial(self, case: Acting, position: Position) -> Floats:
        """(m,) axial forces at the `from` ends in this position."""
        return self.tensions(case, position)[0]

    def own_reactions(self, case: Acting, position: Position) -> Floats:
        """(2j,) forces on the frame along the supports' own axes: what held ones add to balance their joint, and the
        springs' own."""
        axial, tie = self.tensions(case, position)
        whole = Position(position.rotation, position.move, axial, position.push, position.twist)
        left = self.joint_forces(case, whole, self.moments(position)) - self.held.sways.together.T @ tie
        support = self.held.frame.support_table.stiffness[:, :2].ravel()
        return np.where(support == HELD, -left, position.push)

    def reactions(self, case: Acting, position: Position) -> Floats:
        """(j, 3) on the frame, global axes."""
        left = self.joint_moments(case, position, self.moments(position))
        support = self.held.frame.support_table.stiffness[:, 2]
        moment = np.where(support == HELD, -left, position.twist)
        forces = self.held.sways.global_axes(self.own_reactions(case, position)[:, None])[:, :, 0]
        return np.column_stack([forces, moment])


def _in_order(matrix: Any) -> Any:
    """The lower triangle of a sparse matrix made ready to solve row after row."""
    lower = sparse.csc_array(sparse.tril(matrix))
    return splu(lower, permc_spec="NATURAL", diag_pivot_thresh=0.0, options={"SymmetricMode": True})


def _positive(matrix: Any, own: Floats) -> bool:
    """Whether a symmetric matrix of positive diagonal `own` is positive definite: whether every joint and sway, let go
    after the others before it, still resists."""
    scale = 1 / np.sqrt(own)
    if len(own) <= DENSE:
        try:
            cholesky(scale[:, None] * matrix.toarray() * scale, check_finite=False)
        except LinAlgError:
            return False
        return True
    scaled = sparse.csc_array(sparse.diags_array(scale) @ matrix @ sparse.diags_array(scale))
    factor = splu(scaled, permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0, options={"SymmetricMode": True})
    return bool(np.array_equal(factor.perm_r, factor.perm_c) and np.all(factor.U.diagonal() > 0))


def _largest(values: Floats) -> float:
    return float(np.abs(values).max(initial=0.0))


def _share(left: Floats, size: float) -> float:
    return _largest(left) / size if size > 0 else 0.0
