"""Second order: equilibrium on the displaced frame, one case at a time.

The same joint equations, with every member divided into pieces whose slope-deflection coefficients know the axial force
(division.py). Division points have an equation of moments and one of forces across, as joints have. Here axial forces are
taken as known; balance.py finds those that come out as they were put in. The critical load factor scales the first-order
axial forces in proportion; the pivots of the whole matrix count how many critical loads lie below a factor (Wittrick and
Williams 1971).
"""

from __future__ import annotations

import copy
from dataclasses import dataclass, fields, replace
from functools import cached_property
from typing import Any

import numpy as np
import scipy.sparse as sp

from crosscheck.answer import CaseAnswer, Undetermined
from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import FREE, HELD, Floats, Frame, Ints
from crosscheck.opinions.slope_deflection.division import Division, Pieces, divide, pieces
from crosscheck.opinions.slope_deflection.members import FixedEnds, coefficients, fixed_ends
from crosscheck.opinions.slope_deflection.parting import LoadRuns
from crosscheck.opinions.slope_deflection.system import gathered, penalty, support_axes, tie_rows

EXACT = 1e-11
"""Relative width to which a critical load factor is found unless a rougher one will do."""
SOFTER = 10.0
"""How many times softer the rigid members of the second try are."""
BEYOND = 1e7
"""Critical load factors above this are reported as none."""

Sparse = Any


class PastCritical(Exception):
    """The case has no stable equilibrium; the message says so."""


@dataclass(frozen=True, slots=True)
class State:
    """A solved state: pieces and their displacements, (k, 2) local-y displacement and clockwise rotation of every node,
    member axial forces (m,) at the face without the fixed-end part, joint displacements (3j,) along support axes, forces of
    the ties (t,)."""

    division: Division
    pieces: Pieces
    nodes: Floats
    axial: Floats
    shift: Floats
    rotations: Floats
    ties: Floats


class CaseInSecondOrder:
    """One load case of a frame."""

    def __init__(self, frame: Frame, table: LoadTable) -> None:
        self.frame, self.table = frame, table
        k = coefficients(frame)
        self.rigid = np.isnan(k.axial)
        self.firm = penalty(frame, k.axial)
        self.stretch_stiffness = np.where(self.rigid, self.firm, k.axial)
        self.ties = tie_rows(frame)
        self.fixed: FixedEnds = fixed_ends(frame, table, k.stiffness)
        self.axes = support_axes(frame)
        self.runs = LoadRuns(frame, table)

    # --- the equations of one set of axial forces

    def equations(self, pulls: Floats) -> Equations:
        return Equations(self, pulls)

    def pulls(self, axial: Floats) -> Floats:
        """(m,) axial force at the `from` joint, from that at the face without its fixed-end part."""
        return np.asarray(axial + self.fixed.axial + self.fixed.zones[:, 0, 0])

    def first_order(self) -> Floats:
        """(m,) axial forces at the `from` joints on the undisplaced frame, along loads included."""
        return self.pulls(self.undisplaced().solve().axial)

    def undisplaced(self) -> Equations:
        """The equations without any effect of axial forces, those of along loads included."""
        return self.equations(np.zeros(len(self.frame.members))).scaled(0.0)

    def share(self, part: float) -> CaseInSecondOrder:
        """The same case under a part of its loads, imposed movements and temperatures."""
        return CaseInSecondOrder(self.frame, _share(self.table, part))

    # --- critical load

    def critical_factor(self, pulls: Floats, close: float = EXACT, beyond: float = BEYOND) -> float:
        """Smallest factor on the first-order axial forces at which the frame, or a member in it, buckles; inf for none.

        `pulls` are the axial forces at the `from` joints; along loads scale with them. close: relative width to which it
        is found. beyond: the largest factor looked for; inf above it.
        """
        if not self._compressed(pulls) or beyond < BEYOND and not self.buckled(beyond, pulls):
            return float("inf")
        stiff = self._least_factor(pulls, close, beyond)
        if close > EXACT or not (self.rigid.any() or self.frame.ties):
            return stiff
        # A rigid member stands in the pivots as a stiff one, which lowers the factor by as much as it is soft: the limit
        # of no softness follows from two (Richardson).
        softer = copy.copy(self)
        softer.firm = self.firm / SOFTER
        softer.stretch_stiffness = np.where(self.rigid, softer.firm, self.stretch_stiffness)
        return stiff + (stiff - softer._least_factor(pulls, close, beyond)) / (SOFTER - 1.0)

    def _least_factor(self, pulls: Floats, close: float, beyond: float) -> float:
        """The same for the stiffness that the members have here."""
        low, high = 0.0, 1.0
        while not self.buckled(high, pulls):
            low, high = high, high * 2.0
            if high > beyond:
                return float("inf")
        while high - low > close * high:
            middle = (low + high) / 2
            low, high = (low, middle) if self.buckled(middle, pulls) else (middle, high)
        return (low + high) / 2

    def _compressed(self, pulls: Floats) -> bool:
        t = self.frame.member_table
        every = np.arange(len(pulls))
        largest = np.abs(pulls).max(initial=0.0)
        ends = [pulls + self.runs.sums(every, t.length * share, np.ones(len(every), dtype=np.int64))[0]
                for share in (0.0, 0.25, 0.5, 0.75, 1.0)]  # fmt: skip
        return bool(np.min(ends) < -1e-12 * largest)

    def buckled(self, factor: float, pulls: Floats) -> bool:
        """Whether the frame or a member in it buckles below `factor` times these axial forces at the `from` joints."""
        return self.equations(pulls).scaled(factor).negative_pivots > 0

    # --- results

    def case_answer(self, state: State, undetermined: Undetermined) -> CaseAnswer:
        """End actions at the joints on the displaced frame, displacements and reactions."""
        frame = self.frame
        ends, pull = self.end_actions(state), self.held(state)
        pull[frame.support_table.stiffness == FREE] = 0.0
        reactions = (self.axes.T @ pull.ravel()).reshape(-1, 3)
        joints = (self.axes.T @ state.shift).reshape(-1, 3)
        ends[undetermined.axial, :, 0] = np.nan
        joints[undetermined.joints] = np.nan
        reactions[undetermined.reactions] = np.nan
        return CaseAnswer(ends, joints, reactions)

    def held(self, state: State) -> Floats:
        """(j, 3) what holds each joint along its support's axes; rounding where nothing does."""
        pull = self.axes @ (gathered(self.frame, self.end_actions(state)) - self.table.joint).ravel()
        return np.asarray((pull + self.ties.T @ state.ties).reshape(-1, 3))

    def end_actions(self, state: State) -> Floats:
        """(m, 2, 3): the pieces at the faces, less loads there, then the statics of the displaced rigid zones."""
        t, d, fixed = self.frame.member_table, state.division, self.fixed
        y = np.concatenate([state.nodes[d.left], state.nodes[d.left + 1]], axis=1)
        forces = np.einsum("pij,pj->pi", state.pieces.stiffness, y) + state.pieces.fixed
        # A member's first piece starts at its first node; pieces lie one fewer than nodes.
        every = np.arange(len(t.length))
        near, far = forces[d.first - every], forces[d.last - every - 1]
        shear_1, moment_1 = near[:, 0] - d.force[d.first], near[:, 1] - d.couple[d.first]
        shear_2, moment_2 = far[:, 2] - d.force[d.last], far[:, 3] - d.couple[d.last]
        zone_1, zone_2 = fixed.zones[:, 0], fixed.zones[:, 1]
        turn = state.rotations[t.ends]
        pulls = self.pulls(state.axial)
        ends = np.empty((len(t.length), 2, 3))
        ends[:, 0, 0] = pulls
        ends[:, 1, 0] = pulls - zone_1[:, 0] - fixed.between[:, 0] - zone_2[:, 0]
        ends[:, 0, 1] = shear_1 - zone_1[:, 1]
        ends[:, 1, 1] = shear_2 - zone_2[:, 1]
        zone_pull = zone_pulls(self.frame, self.runs, pulls)
        ends[:, 0, 2] = moment_1 - shear_1 * t.zone[:, 0] - zone_1[:, 2] + turn[:, 0] * zone_pull[:, 0]
        ends[:, 1, 2] = moment_2 + shear_2 * t.zone[:, 1] - zone_2[:, 2] + turn[:, 1] * zone_pull[:, 1]
        return ends


class Equations:
    """Joint and division-point equations for given axial forces, at the `from` joint, and a factor on all of them."""

    def __init__(self, case: CaseInSecondOrder, pulls: Floats, factor: float = 1.0) -> None:
        self.case, self.frame = case, case.frame
        self._pulls, self._factor = pulls, factor
        table = case.table if factor == 1.0 else _scaled_along(case.table, factor)
        self.division = divide(self.frame, table, factor * pulls)
        self.pieces = pieces(self.frame, table, self.division)
        self.runs = case.runs if factor == 1.0 else LoadRuns(self.frame, table)

    def scaled(self, factor: float) -> Equations:
        """The same with every axial force times `factor`; loads along the members scale with them."""
        return Equations(self.case, self._pulls, factor)

    @cached_property
    def nodes(self) -> Sparse:
        """(2k, n): local-y displacement and clockwise rotation of every node from the unknowns."""
        return node_matrix(self.frame, self.division)

    @cached_property
    def stretch(self) -> Sparse:
        """(m, n): elongation of every member."""
        t, joints = self.frame.member_table, len(self.frame.joints)
        m = np.arange(len(t.length))
        rows = np.tile(m, 4)
        cols = np.concatenate([3 * t.ends[:, 0], 3 * t.ends[:, 0] + 1, 3 * t.ends[:, 1], 3 * t.ends[:, 1] + 1])
        data = np.concatenate([-t.cos, -t.sin, t.cos, t.sin])
        matrix = sp.csr_matrix((data, (rows, cols)), shape=(len(m), 3 * joints)) @ self.case.axes.T
        extra = self.nodes.shape[1] - 3 * joints
        return sp.hstack([matrix, sp.csr_matrix((len(m), extra))]).tocsr()

    @cached_property
    def ties(self) -> Sparse:
        """(t, n): how far tied joints are apart along their tie; its force keeps its direction."""
        rows = self.case.ties
        return sp.hstack([rows, sp.csr_matrix((rows.shape[0], self.nodes.shape[1] - rows.shape[1]))]).tocsr()

    @cached_property
    def bending(self) -> Sparse:
        """(n, n): pieces, connections, rigid zones under axial force and support springs."""
        d, k = self.division, self.pieces.stiffness
        columns = (2 * d.left[:, None] + np.arange(4)).reshape(-1, 1, 4)
        rows, cols = np.broadcast_arrays(columns.transpose(0, 2, 1), columns)
        size = 2 * len(d.node_x)
        block = sp.csr_matrix((k.ravel(), (rows.ravel(), cols.ravel())), shape=(size, size))
        springs = connection_matrix(self.frame, d)
        turn = self.frame.member_table.turn
        stiffness = turn[np.isfinite(turn) & (turn > 0)]
        own = np.zeros(self.nodes.shape[1])
        supports = self.frame.support_table.stiffness.ravel()
        own[: len(supports)] = np.where(np.isinf(supports), 0.0, supports)
        np.add.at(own, 3 * self.frame.member_table.ends + 2, self.zone_pulls)
        return self.nodes.T @ block @ self.nodes + springs.T @ sp.diags(stiffness) @ springs + sp.diags(own)

    @cached_property
    def zone_pulls(self) -> Floats:
        """(m, 2) integral of the axial force over each rigid zone."""
        return zone_pulls(self.frame, self.runs, self._factor * self._pulls)

    @cached_property
    def held(self) -> np.ndarray:
        supports = self.frame.support_table.stiffness.ravel() == HELD
        return np.concatenate([supports, np.zeros(self.nodes.shape[1] - len(supports), dtype=bool)])

    @cached_property
    def reduced(self) -> tuple[Sparse, Ints]:
        matrix = self.bending + self.stretch.T @ sp.diags(self.case.stretch_stiffness) @ self.stretch
        if self.frame.ties:
            matrix = matrix + self.case.firm * (self.ties.T @ self.ties)
        used = np.asarray(abs(matrix).sum(axis=0)).ravel() != 0.0
        free = np.flatnonzero(~self.held & used)
        return matrix.tocsc()[free][:, free], free

    @cached_property
    def _factorised(self) -> Any:
        from scipy.sparse.linalg import splu

        matrix, _ = self.reduced
        # Symmetric scaling keeps the signs of the pivots and makes translations and rotations alike.
        scale = 1.0 / np.sqrt(np.abs(matrix.diagonal()).clip(1e-300))
        scaled = (sp.diags(scale) @ matrix @ sp.diags(scale)).tocsc()
        options = {"SymmetricMode": True}
        return splu(scaled, permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0, options=options), scale

    @cached_property
    def negative_pivots(self) -> int:
        """How many critical loads lie below these axial forces (pieces are too short to buckle on their own)."""
        if len(self.reduced[1]) == 0:
            return 0
        try:
            factor, _ = self._factorised
        except RuntimeError:  # exactly singular: on the critical load
            return 1
        return int(np.sum(factor.U.diagonal() < 0.0))

    @property
    def free(self) -> Ints:
        """Unknowns that can move and are resisted."""
        return self.reduced[1]

    def correct(self, residual: Floats) -> Floats:
        """(n,) displacements that take up forces (n,) on the unknowns."""
        step = np.zeros_like(residual)
        if len(self.free):
            factor, scale = self._factorised
            step[self.free] = scale * factor.solve(scale * residual[self.free])
        return step

    def solve(self) -> State:
        """Displacements and axial forces; axially rigid members keep their lengths by corrected multipliers."""
        case, d = self.case, self.division
        shift = np.zeros(self.nodes.shape[1])
        settled = np.where(self.held[: case.table.settlement.size], case.table.settlement.ravel(), 0.0)
        shift[: len(settled)] = settled
        outer = self._loads()
        axial = case.stretch_stiffness * (self.stretch @ shift - case.fixed.stretch)
        stiff, stretch = case.stretch_stiffness, case.fixed.stretch
        tied = case.firm * (self.ties @ shift)
        last = np.inf
        for _ in range(20):
            residual = outer - self.bending @ shift - self.stretch.T @ axial - self.ties.T @ tied
            step = self.correct(residual)
            shift = shift + step
            axial = axial + stiff * (self.stretch @ step)
            tied = tied + case.firm * (self.ties @ step)
            size = np.abs(step).max(initial=0.0) / max(np.abs(shift).max(initial=0.0), 1e-300)
            if size <= 1e-15 or (size >= last / 2 and size <= 1e-11):
                break
            last = size
            left_over = self.stretch @ shift - stretch
            axial = np.where(case.rigid, axial + stiff * left_over, axial)
            tied = tied + case.firm * (self.ties @ shift)
        joints = 3 * len(self.frame.joints)
        nodes = (self.nodes @ shift).reshape(-1, 2)
        return State(d, self.pieces, nodes, axial, shift[:joints], shift[2:joints:3], tied)

    def _loads(self) -> Floats:
        """(n,) generalised forces: joint loads, what zones and along loads bring to the joints, loads on nodes, and the
        fixed-end forces of the pieces; support springs whose ground moves."""
        case, d, frame = self.case, self.division, self.frame
        fixed = case.fixed
        ends = np.zeros((len(frame.members), 2, 3))
        ends[:, 0, 0] = fixed.axial + fixed.zones[:, 0, 0]
        ends[:, 1, 0] = fixed.axial - fixed.between[:, 0] - fixed.zones[:, 1, 0]
        ends[:, 0, 1:], ends[:, 1, 1:] = -fixed.zones[:, 0, 1:], -fixed.zones[:, 1, 1:]
        out = np.zeros(self.nodes.shape[1])
        supports = frame.support_table.stiffness.ravel()
        spring = np.where(np.isinf(supports), 0.0, supports)
        out[: len(spring)] = case.axes @ (case.table.joint - gathered(frame, ends)).ravel()
        out[: len(spring)] += spring * case.table.settlement.ravel()
        on_nodes = np.stack([d.force, d.couple], axis=1).ravel()
        np.subtract.at(on_nodes, 2 * d.left[:, None] + np.arange(4), self.pieces.fixed)
        return np.asarray(out + self.nodes.T @ on_nodes)


def _share(table: LoadTable, share: float) -> LoadTable:
    """A share of all loads, imposed movements and temperatures."""
    kept = ("point_member", "point_at", "line_member", "line_start", "line_end")
    return replace(table, **{f.name: getattr(table, f.name) * share for f in fields(table) if f.name not in kept})


def _scaled_along(table: LoadTable, factor: float) -> LoadTable:
    """The table with its loads along members times `factor`: axial forces scale in proportion everywhere."""
    return replace(table, point_along=table.point_along * factor, line_along=table.line_along * factor)


def zone_pulls(frame: Frame, runs: LoadRuns, pulls: Floats) -> Floats:
    """(m, 2): integral of the axial force over each rigid zone, by Simpson's rule between loads (exact for parabolas)."""
    t = frame.member_table
    out = np.zeros((len(t.length), 2))
    every = np.arange(len(t.length))
    for end, low, high in ((0, np.zeros(len(every)), t.zone[:, 0]), (1, t.length - t.zone[:, 1], t.length)):
        out[:, end] = integral_of_pull(runs, pulls, every, low, high) if (high > low).any() else 0.0
    return out


def integral_of_pull(runs: LoadRuns, pulls: Floats, member: Ints, low: Floats, high: Floats) -> Floats:
    """Integral of the axial force from low to high of each member, stretch by stretch between the loads in it."""
    table = runs.table
    marks_member = np.concatenate([member, member, table.point_member, table.line_member, table.line_member])
    marks = np.concatenate([low, high, table.point_at, table.line_start, table.line_end])
    marks = np.clip(marks, low[marks_member], high[marks_member])
    order = np.lexsort((marks, marks_member))
    m, x = marks_member[order], marks[order]
    same = (m[1:] == m[:-1]) & (x[1:] > x[:-1])
    m, a, b = m[:-1][same], x[:-1][same], x[1:][same]
    after, before = np.ones(len(m), dtype=np.int64), np.full(len(m), -1)
    n = [pulls[m] + runs.sums(m, at, side)[0] for at, side in ((a, after), ((a + b) / 2, after), (b, before))]
    total = np.zeros(len(member))
    np.add.at(total, m, (n[0] + 4 * n[1] + n[2]) * (b - a) / 6)
    return total


def node_matrix(frame: Frame, d: Division) -> Sparse:
    """(2k, n) displacement across and rotation of every node from the unknowns: joint displacements along support axes,
    then two unknowns for every inner node and one for every face whose connection is not rigid."""
    t, joints = frame.member_table, len(frame.joints)
    every = np.arange(len(t.length))
    rows, cols, data = [], [], []
    for end, face, sign in ((0, d.first, -1.0), (1, d.last, 1.0)):
        base = 3 * t.ends[:, end]
        rows += [2 * face] * 3
        cols += [base, base + 1, base + 2]
        data += [-t.sin, t.cos, sign * t.zone[:, end]]
        rigid = np.isinf(t.turn[:, end])
        rows.append(2 * face[rigid] + 1)
        cols.append(base[rigid] + 2)
        data.append(np.ones(int(rigid.sum())))
    on_joints = sp.csr_matrix(
        (np.concatenate(data), (np.concatenate(rows), np.concatenate(cols))), shape=(2 * len(d.node_x), 3 * joints)
    )
    inner = np.ones(len(d.node_x), dtype=bool)
    inner[d.first[every]] = inner[d.last[every]] = False
    own = np.concatenate([*(2 * np.flatnonzero(inner)[:, None] + np.arange(2)).reshape(-1, 1).T, *_loose_faces(frame, d)])
    extra = sp.csr_matrix((np.ones(len(own)), (own, np.arange(len(own)))), shape=(2 * len(d.node_x), len(own)))
    return sp.hstack([on_joints @ support_axes(frame).T, extra]).tocsr()


def _loose_faces(frame: Frame, d: Division) -> tuple[Ints, Ints]:
    """Rotation rows of `from` and `to` faces that are not rigidly connected."""
    turn = frame.member_table.turn
    return (2 * d.first[np.isfinite(turn[:, 0])] + 1, 2 * d.last[np.isfinite(turn[:, 1])] + 1)


def connection_matrix(frame: Frame, d: Division) -> Sparse:
    """(springs, n): rotation of the joint less that of the face, for every sprung connection, in order of member and
    end."""
    t = frame.member_table
    nodes = node_matrix(frame, d)
    sprung = np.isfinite(t.turn) & (t.turn > 0)
    member, end = np.nonzero(sprung)
    face = np.where(end == 0, d.first[member], d.last[member])
    count = len(member)
    joint = sp.csr_matrix((np.ones(count), (np.arange(count), 3 * t.ends[member, end] + 2)), shape=(count, nodes.shape[1]))
    return joint - nodes[2 * face + 1]
