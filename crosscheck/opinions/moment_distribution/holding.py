"""Sway by holding the joints: distribute, find the holding forces, let the joints sway until no force holds them.

With the joints held against sway the unbalanced moments are distributed; the forces that this takes at the sways are
the holding forces. Few sways: each is imposed once by one unit, its moments distributed, and the sways that take
away the holding forces follow from as many equations. Many: all sways and all joints are let go together, round by
round, by conjugate gradients on the holding forces and the unbalanced moments; in each round every joint is released
as in distribution, and the sways are corrected as if no joint turned (one sparse factorisation). Either way the
process is repeated on what the final moments and forces leave unbalanced, until joints and sways balance nearly to
rounding.

Moments and forces are summed up from their corrections and never worked out afresh from the movements, as in the
hand method: rounding in large movements (stiff members, settlements) then costs no balance.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from scipy import sparse
from scipy.linalg import cho_factor, cho_solve
from scipy.sparse.linalg import splu

from crosscheck.frame.model import HELD, Bools, Floats, Frame, Ints
from crosscheck.opinions.moment_distribution.distribution import Distribution, conjugate
from crosscheck.opinions.moment_distribution.members import Members, members
from crosscheck.opinions.moment_distribution.sways import Sways, sways

FEW = 12
"""Up to so many sways are imposed one by one."""
LEAVE = 1e-9
"""Share of the holding forces that one pass may leave; the next pass takes it up."""
SETTLED = 2e-15
"""Unbalanced share of the largest force or moment at which joints and sways count as balanced."""
STUCK = 1e-12
"""Unbalanced share at which a pass that no longer helps is the last."""
MOST_PASSES = 12


@dataclass(frozen=True, slots=True)
class Given:
    """What acts, (.., n) for n cases: `couple` (j, n) on joints; `force` (2j, n) on the joints along their own axes,
    with what the members' loads bring there; `fixed` (m, 2, n) fixed-end moments; `pull` (m, n) axial force of the
    elastic members with joints held; `length` (m, n) imposed elongation of the rigid ones; `ground` (3j, n)
    settlement along own x, y and rotation.
    """

    couple: Floats
    force: Floats
    fixed: Floats
    pull: Floats
    length: Floats
    ground: Floats


@dataclass(slots=True)
class State:
    """The frame as corrected so far, (.., n): rotations (j, n), moves (2j, n) along own axes, end moments (m, 2, n)
    on the members, axial force (m, n) at the `from` end, support springs' forces (2j, n) and moments (j, n) on the
    frame, and forces of the ties (t, n), positive where they draw the first joint on."""

    rotation: Floats
    move: Floats
    moment: Floats
    axial: Floats
    push: Floats
    twist: Floats
    tie: Floats


@dataclass(frozen=True, slots=True)
class Pass:
    """One pass of the process: rounds of the largest distribution, corrections of the sways, and what was unbalanced
    before it."""

    rounds: int
    corrections: int
    moment: float
    force: float


@dataclass(frozen=True)
class Held:
    """A frame made ready for distribution, whatever its loads."""

    frame: Frame
    members: Members
    sways: Sways

    @cached_property
    def ends(self) -> Ints:
        return self.members.table.ends

    @cached_property
    def gather(self) -> Any:
        """(j, 2m) sparse: sums the end moments at each joint."""
        flat = self.ends.ravel()
        where = (flat, np.arange(len(flat)))
        return sparse.csr_array((np.ones(len(flat)), where), shape=(len(self.frame.joints), len(flat)))

    @cached_property
    def rotation_spring(self) -> Floats:
        """(j,) stiffness of the support springs against rotation; zero where held or free."""
        k = self.frame.support_table.stiffness[:, 2]
        return np.where(k == HELD, 0.0, k)

    @cached_property
    def joint_stiffness(self) -> Floats:
        """(j,) sum of all rotational stiffnesses at each joint, a support spring's among them."""
        own = np.einsum("mii->mi", self.members.joint).ravel()
        return np.asarray(self.gather @ own) + self.rotation_spring

    @cached_property
    def turning(self) -> Ints:
        """Joints that can be released: not held against rotation, and something there resists it."""
        held = self.frame.support_table.stiffness[:, 2] == HELD
        return np.flatnonzero(~held & (self.joint_stiffness > 0))

    @cached_property
    def distribution(self) -> Distribution:
        a, b = self.ends.T
        k = self.members.joint[:, 0, 1]
        count = len(self.frame.joints)
        where = (np.concatenate([a, b]), np.concatenate([b, a]))
        carried = sparse.csr_array((np.concatenate([k, k]), where), shape=(count, count))
        carried = carried[self.turning][:, self.turning]
        return Distribution(self.joint_stiffness[self.turning], sparse.csr_array(carried))

    @cached_property
    def sway_moment(self) -> Any:
        """(r, q) sparse: moment that holds each turning joint per unit sway."""
        rows = -self.members.joint.sum(axis=2).ravel()
        by_member = sparse.csr_array(
            (rows, (self.ends.ravel(), np.repeat(np.arange(len(self.ends)), 2))),
            shape=(len(self.frame.joints), len(self.ends)),
        )
        return sparse.csr_array(by_member[self.turning] @ self.sways.turn[:, self.sways.free] @ self.sways.shape)

    @cached_property
    def sway_stiffness(self) -> Any:
        """(q, q) sparse: holding forces per unit sway with every rotation held."""
        s = self.sways
        turn, stretch = s.turn[:, s.free] @ s.shape, s.stretch[:, s.free] @ s.shape
        sideways = sparse.diags_array(self.members.joint.sum(axis=(1, 2)))
        axial = sparse.diags_array(self.members.axial)
        ground = sparse.diags_array(s.ground[s.free])
        return sparse.csc_array(
            turn.T @ sideways @ turn + stretch.T @ axial @ stretch + s.shape.T @ ground @ s.shape
        )

    @cached_property
    def rough(self) -> Any:
        """Factorised `sway_stiffness`."""
        return splu(self.sway_stiffness, permc_spec="MMD_AT_PLUS_A", options={"SymmetricMode": True})

    @cached_property
    def released(self) -> Any:
        """(r + q, r + q) sparse: moments on the joints and holding forces per rotation and per unit sway."""
        d = self.distribution
        own = sparse.diags_array(d.stiffness) + d.carried
        return sparse.csr_array(
            sparse.block_array([[own, self.sway_moment], [self.sway_moment.T, self.sway_stiffness]])
        )

    @cached_property
    def unit_sways(self) -> tuple[Floats, Any]:
        """(r, q) rotations to which the joints settle under each unit sway, and the factorised (q, q) holding
        forces."""
        moment = self.sway_moment.toarray()
        turned = -self.distribution.distribute(moment, 1e-13)[0]
        turned -= self.distribution.distribute(moment + self.distribution.resisting(turned), 1e-3)[0]
        holding = self.sway_stiffness.toarray() + moment.T @ turned
        return turned, cho_factor((holding + holding.T) / 2)


def hold(frame: Frame) -> Held:
    """Make the frame ready."""
    m = members(frame)
    return Held(frame, m, sways(frame, m.rigid))


def settle(held: Held, given: Given) -> tuple[State, list[Pass], Floats]:
    """Hold, distribute and let sway, pass after pass; the state, the passes, and (n,) the share left unbalanced.

    That share is of the forces now there, or of a billionth of those at the start where they have all but gone.
    """
    state = start(held, given)
    trace: list[Pass] = []
    busy = np.arange(given.couple.shape[1])
    share, left = np.full(len(busy), np.inf), np.zeros(len(busy))
    first = unbalanced(held, given, state, busy)[2:]
    for number in range(MOST_PASSES + 1):
        moment, force, *sizes = unbalanced(held, given, state, busy)
        before = share[busy]
        share[busy] = np.maximum(_share(moment, sizes[0]), _share(force, sizes[1]))
        floor = [np.maximum(now, 1e-9 * once[busy]) for now, once in zip(sizes, first, strict=True)]
        left[busy] = np.maximum(_share(moment, floor[0]), _share(force, floor[1]))
        # Forces that fell to nothing against those at the start are rounding, and are not chased for ever.
        gone = (sizes[0] <= 1e-30 * first[0][busy]) & (sizes[1] <= 1e-30 * first[1][busy])
        done = (share[busy] <= SETTLED) | gone
        done |= (number > 2) & (share[busy] > 0.25 * before) & (share[busy] < STUCK)
        busy, moment, force = busy[~done], moment[:, ~done], force[:, ~done]
        if not len(busy) or number == MOST_PASSES:
            break
        leave = np.clip(0.1 * SETTLED / share[busy], LEAVE, 0.01)
        turned, swayed, rounds, corrections = correct(held, moment, force, leave)
        trace.append(Pass(rounds, corrections, _largest(moment), _largest(force)))
        _apply(held, state, busy, turned, swayed)
    return state, trace, left


def start(held: Held, given: Given) -> State:
    """All joints held where the ground and the rigid members' imposed lengths put them."""
    s, m = held.sways, held.members
    joints, cases = given.couple.shape
    support = held.frame.support_table.stiffness
    ground = given.ground.reshape(joints, 3, cases)
    rotation = np.where(support[:, 2:] == HELD, ground[:, 2], 0.0)
    move = np.zeros((2 * joints, cases))
    move[s.held] = ground[:, :2].reshape(-1, cases)[s.held]
    if len(s.basic):
        move[s.free[s.tied]] = s.tie((imposed(s, given) - s.bars @ move)[s.basic])
    state = State(
        rotation=np.zeros_like(rotation), move=np.zeros_like(move), moment=given.fixed.copy(),
        axial=given.pull.copy(), push=s.ground[:, None] * ground[:, :2].reshape(-1, cases),
        twist=held.rotation_spring[:, None] * ground[:, 2], tie=np.zeros((s.together.shape[0], cases)),
    )  # fmt: skip
    add(held, state, np.arange(cases), rotation, move)
    state.axial[m.rigid] = 0.0
    return state


def imposed(s: Sways, given: Given) -> Floats:
    """(b, n) elongations imposed on the bars; ties have none."""
    length = given.length[s.rigid]
    return np.concatenate([length, np.zeros((s.together.shape[0], length.shape[1]))])


def misfits(held: Held, given: Given, state: State) -> Bools:
    """(b, n) redundant bars whose imposed elongation the others do not let them follow."""
    s = held.sways
    gap = np.abs(imposed(s, given) - s.bars @ state.move)
    gap[s.basic] = 0.0
    size = np.abs(given.length).max(axis=0, initial=0.0) + np.abs(given.ground).max(axis=0, initial=0.0)
    size = size + 1e-6 * np.abs(state.move).max(axis=0, initial=0.0)
    return np.asarray(gap > 1e-9 * size + 1e-300)


def add(held: Held, state: State, cases: Ints, rotation: Floats, move: Floats) -> None:
    """Turn joints (j, n) and move them (2j, n) further in these cases, the members' ends resisting."""
    s, m = held.sways, held.members
    chord = s.turn @ move
    state.rotation[:, cases] += rotation
    state.move[:, cases] += move
    state.moment[:, :, cases] += m.joint @ (rotation[held.ends] - chord[:, None])
    state.axial[:, cases] += m.axial[:, None] * (s.stretch @ move)
    state.push[:, cases] -= s.ground[:, None] * move
    state.twist[:, cases] -= held.rotation_spring[:, None] * rotation


def _apply(held: Held, state: State, cases: Ints, turned: Floats, swayed: Floats) -> None:
    rotation = np.zeros((state.rotation.shape[0], len(cases)))
    rotation[held.turning] = turned
    move = np.zeros((state.move.shape[0], len(cases)))
    move[held.sways.free] = held.sways.shape @ swayed
    add(held, state, cases, rotation, move)


def joint_moments(held: Held, given: Given, state: State, cases: Ints) -> Floats:
    """(j, n) clockwise moments left over on the joints, supports that hold apart."""
    return np.asarray(
        given.couple[:, cases] + state.twist[:, cases] - held.gather @ _flat(state.moment[:, :, cases])
    )


def joint_forces(held: Held, given: Given, state: State, cases: Ints) -> Floats:
    """(2j, n) forces left over on the joints along their own axes, supports that hold apart."""
    s = held.sways
    return np.asarray(
        given.force[:, cases] + state.push[:, cases]
        + s.turn.T @ state.moment[:, :, cases].sum(axis=1) - s.stretch.T @ state.axial[:, cases]
        - s.together.T @ state.tie[:, cases]
    )  # fmt: skip


def unbalanced(held: Held, given: Given, state: State, cases: Ints) -> tuple[Floats, Floats, Floats, Floats]:
    """(r, n) unbalanced moments, (q, n) holding forces at the sways, and the size (n,) of what they are sums of."""
    s = held.sways
    moment = joint_moments(held, given, state, cases)[held.turning]
    force = s.shape.T @ joint_forces(held, given, state, cases)[s.free]
    length = held.members.table.length
    ends = np.abs(state.moment[:, :, cases])
    parts = (given.force, state.push, state.axial)
    shear = (ends.sum(axis=1) / length[:, None]).max(axis=0, initial=0.0)
    size_force = shear + sum(np.abs(part[:, cases]).max(axis=0, initial=0.0) for part in parts)
    outside = sum(np.abs(part[:, cases]).max(axis=0, initial=0.0) for part in (given.couple, state.twist))
    size_moment = ends.max(axis=(0, 1), initial=0.0) + outside
    # A moment is the small sum of forces on long arms as much as of moments: where there is none, that is rounding.
    return moment, np.asarray(force), size_moment + size_force * length.max(initial=0.0), np.asarray(size_force)


def correct(held: Held, moment: Floats, force: Floats, leave: Floats) -> tuple[Floats, Floats, int, int]:
    """Rotations (r, n) and sways (q, n) that take the unbalanced moments and forces, but for the share `leave` (n,)
    of them; rounds of distribution and sway corrections taken."""
    turned, rounds = held.distribution.distribute(moment, leave)
    if not force.size:
        return turned, np.zeros_like(force), rounds, 0
    holding = force - held.sway_moment.T @ turned
    if len(force) <= FEW:
        unit, factor = held.unit_sways
        swayed = cho_solve(factor, holding)
        return turned + unit @ swayed, swayed, rounds, len(force)
    joints = len(moment)
    left = np.vstack([moment - held.distribution.resisting(turned), holding])
    goal = np.repeat(leave * _together(held, left[:joints], holding), [joints, len(force)], axis=0)
    more, corrections = conjugate(
        lambda x: np.asarray(held.released @ x),
        lambda x: np.vstack([x[:joints] / held.distribution.stiffness[:, None], held.rough.solve(x[joints:])]),
        left, goal, 4 * len(left) + 100,
    )  # fmt: skip
    return turned + more[:joints], more[joints:], rounds, corrections


def _together(held: Held, moment: Floats, force: Floats) -> Floats:
    """(2, n) size of unbalanced moments and of holding forces, each counting for the other over a mean length."""
    arm = float(held.members.table.length.mean())
    size = np.abs(moment).max(axis=0, initial=0.0) + arm * np.abs(force).max(axis=0, initial=0.0)
    return np.stack([size, size / arm])


def _flat(moment: Floats) -> Floats:
    return moment.reshape(-1, moment.shape[2])


def _largest(values: Floats) -> float:
    return float(np.abs(values).max(initial=0.0))


def _share(left: Floats, size: Floats) -> Floats:
    most = np.abs(left).max(axis=0, initial=0.0)
    share: Floats = np.divide(most, size, out=np.zeros_like(most), where=size > 0)
    return share
