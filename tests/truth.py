"""An independent solution of a frame, for finding out who is right: slow, dense, and alike for every feature.

It shares nothing with the opinions but the dataclasses of frame/model.py: no stiffness, no fixed-end action and no load
table. The unknowns are the joints' displacements, each member's internal forces at its `from` joint, the kink in each
end connection, and the reactions. A member's state is carried from joint to joint by integrating its differential
equations exactly between loads (they are polynomials there). Then:

    three equations a joint     forces balance
    three equations a member    the state that arrives is the displacement of the `to` joint
    one equation a connection   kink = moment / stiffness, or moment = 0, or kink = 0
    one equation a restraint    displacement = settlement, or reaction = -stiffness * (displacement - settlement)
    one equation a tied joint   it moves as the tie's first joint does; its unknown is the tie's force

Flexibilities and not stiffnesses appear, so axially rigid (or shear-rigid) members are a zero and no limit. What the
equations leave undetermined is the null space of their matrix; what they cannot follow is its left null space.

A stepped or tapered member is integrated by Gauss's points over each of its pieces, self weight that varies with it
likewise. The frame is taken in its state of stiffness and with its one-way parts that are out left out: which those are,
and which state belongs to a name, is the business of tests/truth_week.py.

Inside: rotations are counter-clockwise (phi), axial u along and w across the member. Signs of results are the README's.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from numpy.polynomial import Polynomial
from numpy.typing import NDArray

from crosscheck.answer import CaseAnswer, Undetermined
from crosscheck.frame.model import (
    FREE,
    HELD,
    Frame,
    JointCouple,
    JointForce,
    Lean,
    Load,
    Member,
    Misfit,
    PointCouple,
    PointForce,
    SelfWeight,
    Settlement,
    Spread,
    Temperature,
)

Array = NDArray[np.float64]
U, W, PHI, N, V, M, KINK_FROM, KINK_TO, ONE = range(9)
"""Rows of a member's state (the first six), and the columns on which it depends linearly (all nine)."""
NEAR = 1e-9
"""Share of the length within which a place counts as an end or a face (as frame/loads.py says)."""
ZERO = 1e-11
"""Singular values below this share of the largest are zero; between it and SURE the frame is not to be judged."""
SURE = 1e-9
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(32)
SHARE, WEIGHT = (_NODES + 1.0) / 2.0, _WEIGHTS / 2.0
"""Gauss's points and weights on 0 to 1: exact to 1e-16 for a depth that grows threefold, 1e-12 for twentyfold."""


class Mechanism(Exception):
    """The frame can move without resistance."""


class CannotFollow(Exception):
    """A load that nothing resists, or an imposed change of length that the frame cannot follow."""


@dataclass(frozen=True)
class Piece:
    """A stretch of member whose state is smooth. p along, q across: load intensity at x0 and its slope.

    part: which piece of a stepped or tapered member it belongs to; -1 in a prismatic one.
    """

    x0: float
    x1: float
    flexible: bool
    p: tuple[float, float]
    q: tuple[float, float]
    part: int = -1


@dataclass(frozen=True)
class Stiff:
    """Elastic properties of a section of a member in a state of stiffness; NaN where not stated."""

    E: float
    G: float
    I: float  # noqa: E741
    A: float
    shear_area: float


@dataclass(frozen=True)
class Loads:
    """Loads of one case on joints, supports and members, factors applied; (m,) lists hold tuples a member.

    weight: self weight of stepped and tapered members, times it down and to the right. pull: (m,) forces that slack
    members are given.
    """

    joint: Array
    settlement: Array
    points: list[list[tuple[float, float, float, float]]]
    lines: list[list[tuple[float, float, float, float, float, float]]]
    strain: Array
    weight: Array
    pull: Array


class Truth:
    """The solution of `frame` in every case and combination, or Mechanism or CannotFollow."""

    def __init__(self, frame: Frame, names: Sequence[str] | None = None, judge: bool = True) -> None:
        """names: the cases to solve (None: all). judge: raise Mechanism where the frame is one."""
        self.frame = frame
        self.members = list(frame.members.values())
        self.joints = list(frame.joints)
        self.place = {name: 3 * k for k, name in enumerate(self.joints)}
        self.columns = _numbering(frame)
        self.ties = [(t.joints[0], joint, t.direction) for t in frame.ties.values() for joint in t.joints[1:]]
        self.size = 3 * len(self.joints) + 5 * len(self.members) + len(self.ties) + len(self.columns)
        self._scale()
        self._loads = {name: self._gather(name) for name in (frame.names if names is None else names)}
        self.matrix = self._matrix()
        self._factor()
        if judge and self.mechanism:
            raise Mechanism(f"moves: {', '.join(self.mechanism)}")
        self.solution = {name: self._solve(loads) for name, loads in self._loads.items()}
        self.cases = {name: self._answer(name) for name in self.solution}

    # -- scales, so that every unknown and every equation is of order one ---------------------------------------------
    def _scale(self) -> None:
        lengths, stiff = [], []
        for m in self.members:
            lengths.append(self.run(m)[2])
            stiff.append(self.frame.materials[m.material].E * self.frame.sections[m.section].I)
        self.unit_length = float(np.exp(np.mean(np.log(lengths))))
        self.unit_moment = float(np.exp(np.mean(np.log(stiff)))) / self.unit_length
        self.unit_force = self.unit_moment / self.unit_length

    def run(self, m: Member) -> tuple[float, float, float]:
        """Direction cosines and length of a member."""
        a, b = self.frame.joints[m.joint_from], self.frame.joints[m.joint_to]
        length = math.hypot(b.x - a.x, b.y - a.y)
        return (b.x - a.x) / length, (b.y - a.y) / length, length

    # -- loads --------------------------------------------------------------------------------------------------------
    def _gather(self, name: str) -> Loads:
        frame = self.frame
        factors = {name: 1.0} if name in frame.cases else frame.combinations[name].factors
        lean = 0.0 if name in frame.cases else frame.combinations[name].lean
        loads = _nothing(frame)
        for case, factor in factors.items():
            own = sum(load.share for load in frame.cases[case].loads if isinstance(load, Lean))
            for load in frame.cases[case].loads:
                self._add(loads, load, factor)
                # What leans in the case is the case's own and goes with its factor; what leans in the combination is a
                # share of what acts down in it.
                for share, times in ((own * factor, 1.0), (lean, factor)):
                    if share:
                        self._lean(loads, load, times, share)
        return loads

    def _lean(self, to: Loads, load: Load, factor: float, share: float) -> None:
        """Add `share` of the part of factor * load that acts down, to the right where it acts."""
        match load:
            case JointForce() | PointForce():
                down = -factor * load.force * self._up(load)
                if down > 0.0:
                    self._add(to, replace(load, force=down, direction=0.0), share)
            case Spread():
                w = -factor * self._up(load)
                if load.projection:
                    w *= abs(self._local(self.frame.member_index[load.member], load.direction)[1])
                self._lean_spread(to, load, w * load.first, w * load.last, share)
            case SelfWeight():
                self._add_weight(to, 0.0, share * max(0.0, factor * load.factor))

    def _up(self, load: JointForce | PointForce | Spread) -> float:
        """The global upward component of a unit of the load."""
        if isinstance(load.direction, str):
            assert not isinstance(load, JointForce)
            cos, sin, _ = self.run(self.frame.members[load.member])
            return sin if load.direction == "along" else cos
        return _unit(load.direction)[1]

    def _lean_spread(self, to: Loads, load: Spread, first: float, last: float, share: float) -> None:
        """first, last: intensity down per length of member; where it changes its sense only the part down leans."""
        start, end = load.start, load.end
        if first < 0.0 < last:
            start, first = start + (end - start) * first / (first - last), 0.0
        elif last < 0.0 < first:
            end, last = start + (end - start) * first / (first - last), 0.0
        if first + last > 0.0:
            sideways = replace(load, first=first, last=last, direction=0.0, start=start, end=end, projection=False)
            self._add(to, sideways, share)

    def _add(self, to: Loads, load: Load, factor: float) -> None:
        frame = self.frame
        match load:
            case JointForce():
                c, s = _unit(load.direction)
                to.joint[frame.joint_index[load.joint]] += factor * load.force * np.array([c, s, 0.0])
            case JointCouple():
                to.joint[frame.joint_index[load.joint], 2] -= factor * load.couple
            case Settlement():
                movement = np.array([load.x, load.y, -load.rotation])
                to.settlement[frame.joint_index[load.joint]] += factor * movement
            case PointForce():
                m = frame.member_index[load.member]
                along, across = self._local(m, load.direction)
                to.points[m].append((load.at, factor * load.force * along, factor * load.force * across, 0.0))
            case PointCouple():
                to.points[frame.member_index[load.member]].append((load.at, 0.0, 0.0, factor * load.couple))
            case Spread():
                m = frame.member_index[load.member]
                along, across = self._local(m, load.direction)
                w = factor * abs(across) if load.projection else factor
                first, last = w * load.first, w * load.last
                to.lines[m].append(
                    (load.start, load.end, first * along, last * along, first * across, last * across)
                )
            case Temperature():
                to.strain[frame.member_index[load.member], :2] += factor * load.mean, factor * load.difference
            case Misfit():
                to.strain[frame.member_index[load.member], 2] += factor * load.too_long
            case SelfWeight():
                self._add_weight(to, factor * load.factor, 0.0)

    def _add_weight(self, to: Loads, down: float, right: float) -> None:
        """Times self weight down, and to the right; of the stated sections in every state."""
        to.weight[:] += down, right
        for k, m in enumerate(self.members):
            if m.pieces:
                continue
            cos, sin, length = self.run(m)
            area, density = self.frame.sections[m.section].A, self.frame.materials[m.material].weight
            assert area is not None and density is not None
            along, across = area * density * (right * cos - down * sin), area * density * (-right * sin - down * cos)
            to.lines[k].append((0.0, length, along, along, across, across))

    def _local(self, m: int, direction: float | str) -> tuple[float, float]:
        if direction == "along":
            return 1.0, 0.0
        if direction == "across":
            return 0.0, 1.0
        cos, sin, _ = self.run(self.members[m])
        c, s = _unit(float(direction))
        return c * cos + s * sin, s * cos - c * sin

    # -- one member ---------------------------------------------------------------------------------------------------
    def _flexibility(self, m: Member) -> tuple[float, float, float]:
        """Per length of a prismatic member: axial, bending, shear."""
        stiff = _effective(self.frame, m, m.section)
        axial = shear = 0.0
        if not self._keeps_length(m):
            axial = 1.0 / (stiff.E * stiff.A)
        if self.frame.analysis.shear == "elastic":
            shear = 1.0 / (stiff.G * stiff.shear_area)
        return axial, 1.0 / (stiff.E * stiff.I), shear

    def _keeps_length(self, m: Member) -> bool:
        return self.frame.analysis.axial == "rigid" or m.axial == "rigid"

    def _varying_flexibility(self, m: Member, part: int, x: Array) -> tuple[Array, Array, Array, Array]:
        """Per length at distances x in a piece of a stepped or tapered member: axial, bending, shear; and the depth."""
        piece, share = m.pieces[part], self._share(m, part, x)
        first, last = _effective(self.frame, m, piece.first), _effective(self.frame, m, piece.last)
        depths = tuple(self.frame.sections[name].depth for name in (piece.first, piece.last))
        axial = shear = np.zeros_like(x)
        if not self._keeps_length(m):
            axial = 1.0 / (first.E * _by_depth(first.A, last.A, depths, share))
        if self.frame.analysis.shear == "elastic":
            shear = 1.0 / (first.G * _by_depth(first.shear_area, last.shear_area, depths, share))
        bending = 1.0 / (first.E * _by_depth(first.I, last.I, depths, share))
        d0, d1 = (depth or math.nan for depth in depths)
        return axial, bending, shear, d0 + (d1 - d0) * share

    def _varying_weight(self, m: Member, part: int, x: Array) -> Array:
        """Weight per length as stated at distances x in a piece of a stepped or tapered member."""
        first, last = (self.frame.sections[name] for name in (m.pieces[part].first, m.pieces[part].last))
        density = self.frame.materials[m.material].weight
        assert first.A is not None and last.A is not None and density is not None
        return density * _by_depth(first.A, last.A, (first.depth, last.depth), self._share(m, part, x))

    def _share(self, m: Member, part: int, x: Array) -> Array:
        """How far into the piece, from 0 to 1."""
        before = m.pieces[part - 1].until if part else 0.0
        return (x / self.run(m)[2] - before) / (m.pieces[part].until - before)

    def _pieces(self, k: int, loads: Loads, upto: float, after: bool) -> list[Piece | tuple[float, ...] | str]:
        """What happens between the `from` joint and `upto`, in order: pieces, point loads, "from" and "to" connections.

        after: point loads at `upto` itself are included.
        """
        m = self.members[k]
        length = self.run(m)[2]
        faces = (m.rigid_from, length - m.rigid_to)
        marks = sorted({0.0, length, *faces})
        inner = [piece.until * length for piece in m.pieces[:-1]]

        def snap(x: float) -> float:
            return next((mark for mark in marks if abs(x - mark) <= NEAR * length), x)

        points = [(snap(x), *rest) for x, *rest in loads.points[k]]
        lines = [(snap(a), snap(b), *rest) for a, b, *rest in loads.lines[k]]
        upto = snap(upto)
        cuts = sorted({*marks, *map(snap, inner), *(p[0] for p in points), *(x for line in lines for x in line[:2]), upto})
        happens: list[Piece | tuple[float, ...] | str] = []
        for x0, x1 in zip(cuts, [*cuts[1:], math.inf], strict=True):
            # Outside the flexible part a point load acts on the zone; at a face it acts inside the connection.
            if x0 == faces[0]:
                happens.append("from")
            if x0 < upto or (x0 == upto and after):
                happens += [p for p in points if p[0] == x0]
            if x0 == faces[1] and (x0 < upto or after or x0 == length):
                happens.append("to")
            if x0 >= upto:
                return happens
            p, q = _intensity(lines, x0, x1)
            part = sum(x <= (x0 + x1) / 2 for x in inner) if m.pieces else -1
            happens.append(Piece(x0, x1, faces[0] <= x0 < faces[1], p, q, part))
        return happens

    def _arrive(self, k: int, loads: Loads | None, upto: float, after: bool) -> tuple[Array, dict[str, Array]]:
        """(6, 9) state at `upto`, linear in (u, w, phi at from; N, V, M at from; kinks; 1), and the moment rows (9,) at
        the two connections."""
        m = self.members[k]
        material, section = self.frame.materials[m.material], self.frame.sections[m.section]
        loads = loads or _nothing(self.frame)
        mean, difference, misfit = loads.strain[k]
        stretch = mean * (material.alpha or 0.0)
        bend = difference * (material.alpha or 0.0) / (section.depth or 1.0) if difference else 0.0
        flexibility = (0.0, 0.0, 0.0) if m.pieces else self._flexibility(m)
        state = np.eye(6, 9)
        at_connection: dict[str, Array] = {}
        for event in self._pieces(k, loads, upto, after):
            if isinstance(event, Piece) and event.part >= 0:
                state = self._advance_varying(state, event, k, loads)
            elif isinstance(event, Piece):
                f, strain = (flexibility, (stretch, bend)) if event.flexible else ((0.0, 0.0, 0.0), (0.0, 0.0))
                state = _advance(state, event, f, strain)
            elif isinstance(event, str):
                at_connection[event] = state[M].copy()
                state[PHI, KINK_FROM if event == "from" else KINK_TO] += 1.0
                if event == "from":
                    state[U, ONE] += misfit
            else:
                _, along, across, couple = event
                state[N, ONE] -= along
                state[V, ONE] += across
                state[M, ONE] += couple
        return state, at_connection

    def _advance_varying(self, state: Array, piece: Piece, k: int, loads: Loads) -> Array:
        """The state at the far end of a stretch of a stepped or tapered member."""
        m, h = self.members[k], piece.x1 - piece.x0
        s = h * SHARE
        one = np.zeros(9)
        one[ONE] = 1.0
        P, Q, R = self._load_before(m, piece, loads, np.append(s, h))
        n = state[N] - P[:, None] * one
        v = state[V] + Q[:, None] * one
        moment = state[M] + np.append(s, h)[:, None] * state[V] + R[:, None] * one
        new = state.copy()
        new[N], new[V], new[M] = n[-1], v[-1], moment[-1]
        new[W] = state[W] + h * state[PHI]
        if not piece.flexible:
            return new
        axial, bending, shear, depth = self._varying_flexibility(m, piece.part, piece.x0 + s)
        mean, difference, _ = loads.strain[k] * (self.frame.materials[m.material].alpha or 0.0)
        bend = difference / depth if difference else np.zeros_like(s)
        curvature = bending[:, None] * moment[:-1] + bend[:, None] * one
        new[U] = state[U] + h * (WEIGHT * axial) @ n[:-1] + mean * h * one
        new[PHI] = state[PHI] + h * WEIGHT @ curvature
        new[W] += h * (WEIGHT * (h - s)) @ curvature - h * (WEIGHT * shear) @ v[:-1]
        return new

    def _load_before(self, m: Member, piece: Piece, loads: Loads, s: Array) -> tuple[Array, Array, Array]:
        """Load along and across from the start of the stretch to s (n,), and the moment of the latter about s."""
        (p, dp), (q, dq) = piece.p, piece.q
        P, Q, R = p * s + dp * s**2 / 2, q * s + dq * s**2 / 2, q * s**2 / 2 + dq * s**3 / 6
        if loads.weight.any():
            cos, sin, _ = self.run(m)
            down, right = loads.weight
            t = s[:, None] * SHARE
            w = self._varying_weight(m, piece.part, piece.x0 + t)
            total, about = s * (w @ WEIGHT), s * ((w * (s[:, None] - t)) @ WEIGHT)
            along, across = right * cos - down * sin, -right * sin - down * cos
            P, Q, R = P + along * total, Q + across * total, R + across * about
        return P, Q, R

    # -- the equations ------------------------------------------------------------------------------------------------
    def _scales(self) -> tuple[Array, Array]:
        """Size of every unknown and of every equation."""
        length, force, moment = self.unit_length, self.unit_force, self.unit_moment
        joints = np.tile([length, length, 1.0], len(self.joints))
        members = np.tile([force, force, moment, 1.0, 1.0], len(self.members))
        reactions = np.array([moment if axis == 2 else force for _, axis in self.columns])
        unknowns = np.concatenate([joints, members, reactions])
        balance = np.tile([force, force, moment], len(self.joints))
        fit = np.concatenate([[length, length, 1.0, *self._connection_scale(m)] for m in self.members])
        held = np.array([self._restraint_scale(joint, axis) for joint, axis in self.columns])
        count = len(self.columns)
        ties = np.ones(len(self.ties))
        unknowns = np.concatenate([unknowns[: len(unknowns) - count], force * ties, unknowns[len(unknowns) - count :]])
        return unknowns, np.concatenate([balance, fit, length * ties, held])

    def _connection_scale(self, m: Member) -> list[float]:
        return [self.unit_moment if k == FREE else 1.0 for k in _turns(self.frame, m)]

    def _restraint_scale(self, joint: str, axis: int) -> float:
        size = 1.0 if axis == 2 else self.unit_length
        stiffness = _restraints(self.frame, joint)[axis]
        return size if stiffness == HELD else max(stiffness * size, self.unit_moment / size)

    def _matrix(self) -> Array:
        matrix, _ = self._equations(_nothing(self.frame))
        return matrix

    def _equations(self, loads: Loads) -> tuple[Array, Array]:
        """Matrix and right-hand side, unscaled. Rows: joints' balance, members' fit and connections, restraints."""
        a, b = np.zeros((self.size, self.size)), np.zeros(self.size)
        b[: 3 * len(self.joints)] -= loads.joint.ravel()
        for k in range(len(self.members)):
            self._member_rows(k, loads, a, b)
        for k, (first, other, direction) in enumerate(self.ties):
            own, toward = self.size - len(self.columns) - len(self.ties) + k, np.array(_unit(direction))
            for joint, sign in ((first, -1.0), (other, 1.0)):
                a[self.place[joint] : self.place[joint] + 2, own] += sign * toward
                a[own, self.place[joint] : self.place[joint] + 2] += sign * toward
        for k, (joint, axis) in enumerate(self.columns):
            self._restraint_row(k, joint, axis, loads, a, b)
        return a, b

    def _member_rows(self, k: int, loads: Loads, a: Array, b: Array) -> None:
        m = self.members[k]
        cos, sin, length = self.run(m)
        turn = np.array([[cos, sin, 0.0], [-sin, cos, 0.0], [0.0, 0.0, 1.0]])
        j0, j1, own = self.place[m.joint_from], self.place[m.joint_to], 3 * len(self.joints) + 5 * k
        state, moments = self._arrive(k, loads, length, after=True)
        # Forces on the member, counter-clockwise: (-N, V, -M) at `from`, (N, -V, M) at `to`; joints feel the opposite.
        at_from = np.diag([-1.0, 1.0, -1.0])
        a[j0 : j0 + 3, own : own + 3] -= turn.T @ at_from
        a[j1 : j1 + 3, own : own + 5] += turn.T @ at_from @ state[[N, V, M], N:ONE]
        b[j1 : j1 + 3] -= turn.T @ at_from @ state[[N, V, M], ONE]
        a[own : own + 3, j0 : j0 + 3] = state[:3, :3] @ turn
        a[own : own + 3, j1 : j1 + 3] -= turn
        a[own : own + 3, own : own + 5] = state[:3, N:ONE]
        b[own : own + 3] = -state[:3, ONE]
        if m.name in self.frame.out_members:
            # No force of its own stretch: loads along it go to its ends as if these were held, and it takes no part.
            a[own, j0 : j0 + 3] = a[own, j1 : j1 + 3] = 0.0
            b[own] += self.free_elongation(k, loads) + state[U, N] * loads.pull[k]
        turn_from, turn_to = _turns(self.frame, m)
        for row, end, stiffness in ((own + 3, "from", turn_from), (own + 4, "to", turn_to)):
            kink = own + 3 + (end == "to")
            if stiffness == HELD:
                a[row, kink] = 1.0
                continue
            moment = moments[end] if stiffness == FREE else -moments[end] / stiffness
            a[row, own : own + 3] += moment[N : M + 1]
            a[row, kink] += 0.0 if stiffness == FREE else 1.0
            b[row] = -moment[ONE]

    def free_elongation(self, k: int, loads: Loads) -> float:
        """What temperature and misfit alone would lengthen a member by."""
        m = self.members[k]
        mean, _, misfit = loads.strain[k]
        clear = self.run(m)[2] - m.rigid_from - m.rigid_to
        return float(mean * (self.frame.materials[m.material].alpha or 0.0) * clear + misfit)

    def axial_flexibility(self, k: int) -> float:
        """Elongation of a member under a unit of axial force."""
        return float(self._arrive(k, None, self.run(self.members[k])[2], after=True)[0][U, N])

    def _restraint_row(self, k: int, joint: str, axis: int, loads: Loads, a: Array, b: Array) -> None:
        direction = _support_axes(self.frame, joint)[axis]
        j, column = self.place[joint], self.size - len(self.columns) + k
        settlement = loads.settlement[j // 3, axis]
        stiffness = _restraints(self.frame, joint)[axis]
        a[j : j + 3, column] = direction
        if stiffness == HELD:
            a[column, j : j + 3], b[column] = direction, settlement
        else:
            a[column, j : j + 3], a[column, column], b[column] = stiffness * direction, 1.0, stiffness * settlement

    # -- solving ------------------------------------------------------------------------------------------------------
    def _factor(self) -> None:
        self.unknown_scale, self.row_scale = self._scales()
        scaled = self.matrix * self.unknown_scale / self.row_scale[:, None]
        # Rounds of balancing: the largest entry of every row and column is one (a loose joint's are all zero).
        for _ in range(4):
            rows = _largest_or_one(scaled, axis=1)
            self.row_scale *= rows
            scaled /= rows[:, None]
            columns = _largest_or_one(scaled, axis=0)
            self.unknown_scale /= columns
            scaled /= columns
        self.scaled = scaled
        left, values, right = np.linalg.svd(scaled)
        rank = int(np.sum(values > ZERO * values[0]))
        self.gap = (float(values[rank - 1] / values[0]), float(values[rank] / values[0]) if rank < self.size else 0.0)
        self.left_null, self.right_null = left[:, rank:], right[rank:].T
        self._inverse = (right[:rank].T / values[:rank]) @ left[:, :rank].T

    @cached_property
    def mechanism(self) -> list[str]:
        """Joints that can move, or turn something, without resistance (a joint that nothing joins apart)."""
        loose = np.abs(self.right_null[: 3 * len(self.joints)]).reshape(len(self.joints), 3, -1) > 1e-7
        moves = loose.any(axis=2)
        # A joint's own rotation moves nothing where every end is hinged at the joint itself, without a zone.
        joined, gripped = set(), set()
        for m in self.members:
            turn_from, turn_to = _turns(self.frame, m)
            ends = ((m.joint_from, turn_from, m.rigid_from), (m.joint_to, turn_to, m.rigid_to))
            joined |= {joint for joint, _, _ in ends}
            gripped |= {joint for joint, turn, zone in ends if turn != FREE or zone > 0.0}
        return [
            name
            for k, name in enumerate(self.joints)
            if (name in joined and moves[k, :2].any()) or (name in gripped and moves[k, 2])
        ]

    @cached_property
    def undetermined(self) -> Undetermined:
        """True where the equations leave a value open."""
        count, free = len(self.joints), np.abs(self.right_null).max(axis=1, initial=0.0) > 1e-7
        # A sum of turned reactions may be determined in one global direction, so the null vectors are turned too.
        start = self.size - len(self.columns)
        null = self.right_null[start:] * self.unknown_scale[start:, None] / self.unit_force
        vectors = np.zeros((count, 3, self.right_null.shape[1]))
        for k, (joint, axis) in enumerate(self.columns):
            vectors[self.place[joint] // 3] += np.outer(_support_axes(self.frame, joint)[axis], null[k])
        open_reactions = np.abs(vectors).max(axis=2, initial=0.0) > 1e-7
        axial = free[3 * count : 3 * count + 5 * len(self.members) : 5]
        return Undetermined(axial, free[: 3 * count].reshape(count, 3), open_reactions)

    def follows(self, loads: Loads) -> bool:
        """Whether the equations can be satisfied under these loads."""
        if self.left_null.shape[1] == 0:
            return True
        rhs = self._equations(loads)[1] / self.row_scale
        # Judged against the largest part of each equation's right-hand side, not against the sum, which may cancel.
        return bool(np.abs(self.left_null.T @ rhs).max() <= 1e-9 * max(float(np.abs(rhs).max()), 1e-300))

    def can_follow(self, load: Load) -> bool:
        """Whether the frame can carry or follow this single load."""
        one = _nothing(self.frame)
        self._add(one, load, 1.0)
        return self.follows(one)

    def _solve(self, loads: Loads) -> Array:
        if not self.follows(loads):
            raise CannotFollow("a load that nothing resists, or a change of length that cannot be followed")
        matrix, rhs = self._equations(loads)
        wide = (matrix * self.unknown_scale / self.row_scale[:, None]).astype(np.longdouble)
        target = (rhs / self.row_scale).astype(np.longdouble)
        x = np.zeros(self.size, dtype=np.longdouble)
        for _ in range(4):
            x += self._inverse @ (target - wide @ x).astype(np.float64)
        result: Array = np.asarray(x * self.unknown_scale, dtype=np.float64)
        return result

    # -- results ------------------------------------------------------------------------------------------------------
    def _answer(self, name: str) -> CaseAnswer:
        x, count = self.solution[name], len(self.joints)
        open_ = self.undetermined
        joints = x[: 3 * count].reshape(count, 3) * [1.0, 1.0, -1.0]
        reactions = np.zeros((count, 3))
        for k, (joint, axis) in enumerate(self.columns):
            value = x[self.size - len(self.columns) + k]
            reactions[self.place[joint] // 3] += value * _support_axes(self.frame, joint)[axis] * [1.0, 1.0, -1.0]
        ends = np.zeros((len(self.members), 2, 3))
        for k, m in enumerate(self.members):
            at = self._state(name, k, self.run(m)[2], after=True)
            first = x[3 * count + 5 * k : 3 * count + 5 * k + 3]
            ends[k] = [[first[0], first[1], first[2]], [at[N], -at[V], -at[M]]]
        ends[open_.axial, :, 0] = np.nan
        return CaseAnswer(ends, np.where(open_.joints, np.nan, joints), np.where(open_.reactions, np.nan, reactions))

    def _state(self, name: str, k: int, x: float, after: bool) -> Array:
        m, solution = self.members[k], self.solution[name]
        cos, sin, _ = self.run(m)
        turn = np.array([[cos, sin, 0.0], [-sin, cos, 0.0], [0.0, 0.0, 1.0]])
        start = turn @ solution[self.place[m.joint_from] : self.place[m.joint_from] + 3]
        own = solution[3 * len(self.joints) + 5 * k : 3 * len(self.joints) + 5 * k + 5]
        result: Array = self._arrive(k, self._loads[name], x, after)[0] @ np.concatenate([start, own, [1.0]])
        return result

    def along(self, name: str, member: Iterable[int], x: Iterable[float], side: Iterable[int]) -> Array:
        """(n, 4) axial, shear, moment, across, as answer.Spans.along gives them."""
        member = list(member)
        places = zip(member, x, side, strict=True)
        states = [self._state(name, int(k), float(at), after=s > 0) for k, at, s in places]
        values = np.array(states).reshape(-1, 6)[:, [N, V, M, W]]
        values[self.undetermined.axial[member], 0] = np.nan
        # Across stays determined where the `from` joint's rotation is open: rotation and kink are open together only.
        return values


    def turning_places(self, name: str, member: int) -> list[float]:
        """Ends, places of loads and faces, and every place where moment, shear or across may have an extreme."""
        length = self.run(self.members[member])[2]
        pieces = [p for p in self._pieces(member, self._loads[name], length, True) if isinstance(p, Piece)]
        places = [0.0, length, *(p.x0 for p in pieces)]
        for piece in pieces:
            half, middle = (piece.x1 - piece.x0) / 2.0, (piece.x0 + piece.x1) / 2.0
            nodes = np.cos(np.pi * (np.arange(7) + 0.5) / 7.0)
            values = self.along(name, [member] * 7, (middle + half * nodes).tolist(), [1] * 7)
            for column in (1, 2, 3):
                slope = Polynomial.fit(nodes, values[:, column], 6, domain=[-1, 1]).deriv()
                roots = [float(r.real) for r in slope.roots() if abs(r.imag) < 1e-6 and abs(r.real) <= 1]
                places += [middle + half * r for r in roots]
        return places


def _largest_or_one(matrix: Array, axis: int) -> Array:
    largest: Array = np.abs(matrix).max(axis=axis)
    return np.where(largest > 0.0, largest, 1.0)


def _numbering(frame: Frame) -> list[tuple[str, int]]:
    """Joint and axis of every restraint that is not free."""
    return [(s.joint, axis) for s in frame.supports.values() for axis in range(3) if _restraints(frame, s.joint)[axis]]


def _restraints(frame: Frame, joint: str) -> tuple[float, float, float]:
    """Along the support's own x and y, and against rotation: in the frame's state, without what is out."""
    support = next(s for s in frame.supports.values() if s.joint == joint)
    factor = _words(frame, "supports", joint)
    x = FREE if (joint, "x") in frame.out_supports else support.x * factor.get("x", 1.0)
    y = FREE if (joint, "y") in frame.out_supports else support.y * factor.get("y", 1.0)
    return x, y, support.rotation * factor.get("rotation", 1.0)


def _words(frame: Frame, kind: str, name: str) -> Mapping[str, float]:
    """Factors that the frame's state of stiffness has for this thing."""
    found: Mapping[str, float] = getattr(frame.states[frame.state], kind).get(name, {}) if frame.state else {}
    return found


def _turns(frame: Frame, m: Member) -> tuple[float, float]:
    """Stiffness of the end connections in the frame's state."""
    factor = _words(frame, "members", m.name)
    return m.turn_from * factor.get("spring_from", 1.0), m.turn_to * factor.get("spring_to", 1.0)


def _effective(frame: Frame, m: Member, section: str) -> Stiff:
    """A section of a member in the frame's state: the member's own factor replaces that of its section or material, and
    one on E alone is on G too."""
    own, by_section, by_material = (
        _words(frame, kind, name)
        for kind, name in (("members", m.name), ("sections", section), ("materials", m.material))
    )

    def value(stated: float | None, key: str, other: Mapping[str, float]) -> float:
        return math.nan if stated is None else stated * own.get(key, other.get(key, 1.0))

    stated, material = frame.sections[section], frame.materials[m.material]
    on_G = own if own.keys() & {"E", "G"} else by_material
    return Stiff(
        E=value(material.E, "E", by_material),
        G=math.nan if material.G is None else material.G * on_G.get("G", on_G.get("E", 1.0)),
        I=value(stated.I, "I", by_section),
        A=value(stated.A, "A", by_section),
        shear_area=value(stated.shear_area, "shear_area", by_section),
    )


def _by_depth(first: float, last: float, depths: tuple[float | None, ...], share: Array) -> Array:
    """A property in between, by the power of the depth (which goes straight) that fits both ends."""
    if first == last:
        return np.full_like(share, first)
    d0, d1 = depths
    assert d0 is not None and d1 is not None
    depth = d0 + (d1 - d0) * share
    result: Array = first * np.exp(math.log(last / first) * np.log(depth / d0) / math.log(d1 / d0))
    return result


def _support_axes(frame: Frame, joint: str) -> Array:
    """(3, 3) rows: the support's own x, y and counter-clockwise rotation in global dx, dy, phi."""
    c, s = _unit(next(s for s in frame.supports.values() if s.joint == joint).angle)
    return np.array([[c, s, 0.0], [-s, c, 0.0], [0.0, 0.0, 1.0]])


def _unit(degrees: float) -> tuple[float, float]:
    if degrees % 90 == 0:
        return ((1.0, 0.0), (0.0, 1.0), (-1.0, 0.0), (0.0, -1.0))[int(degrees // 90) % 4]
    return math.cos(math.radians(degrees)), math.sin(math.radians(degrees))


def _nothing(frame: Frame) -> Loads:
    members, joints = len(frame.members), len(frame.joints)
    return Loads(
        np.zeros((joints, 3)),
        np.zeros((joints, 3)),
        [[] for _ in range(members)],
        [[] for _ in range(members)],
        np.zeros((members, 3)),
        np.zeros(2),
        np.zeros(members),
    )


def _intensity(
    lines: list[tuple[float, ...]], x0: float, x1: float
) -> tuple[tuple[float, float], tuple[float, float]]:
    """Along and across: intensity at x0 and its slope, of all line loads over [x0, x1]."""
    total = np.zeros((2, 2))
    for start, end, p0, p1, q0, q1 in lines:
        if start <= x0 and x1 <= end and end > start:
            for row, (first, last) in enumerate(((p0, p1), (q0, q1))):
                slope = (last - first) / (end - start)
                total[row] += first + slope * (x0 - start), slope
    return (float(total[0, 0]), float(total[0, 1])), (float(total[1, 0]), float(total[1, 1]))


def _advance(state: Array, piece: Piece, flexibility: tuple[float, float, float], strain: tuple[float, float]) -> Array:
    """The state at the piece's far end. flexibility: axial, bending, shear; strain: stretch and curvature."""
    h, (axial, bending, shear), (stretch, bend) = piece.x1 - piece.x0, flexibility, strain
    (p, dp), (q, dq) = piece.p, piece.q
    new = state.copy()
    one = np.zeros(9)
    one[ONE] = 1.0
    n, v, m = state[N], state[V], state[M]
    new[N] = n - (p * h + dp * h**2 / 2) * one
    new[V] = v + (q * h + dq * h**2 / 2) * one
    new[M] = m + v * h + (q * h**2 / 2 + dq * h**3 / 6) * one
    new[U] = state[U] + axial * (n * h - (p * h**2 / 2 + dp * h**3 / 6) * one) + stretch * h * one
    new[PHI] = (
        state[PHI]
        + bending * (m * h + v * h**2 / 2 + (q * h**3 / 6 + dq * h**4 / 24) * one)
        + bend * h * one
    )
    # Slope of the axis = rotation of the section - shear strain, the shear being the sum of forces before the section.
    new[W] = (
        state[W]
        + state[PHI] * h
        + bending * (m * h**2 / 2 + v * h**3 / 6 + (q * h**4 / 24 + dq * h**5 / 120) * one)
        + bend * h**2 / 2 * one
        - shear * (v * h + (q * h**2 / 2 + dq * h**3 / 6) * one)
    )
    return new
