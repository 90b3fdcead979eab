"""The exact solution of a small plane frame in rational numbers: no rounding anywhere, however ill-conditioned.

Every float of the frame is taken for the rational number that it is. Lengths must be rational (members along the axes or
with 3-4-5 sides), and so must the cosines of every angle. It shares nothing with the opinions, and not the elimination
with tests/truth.py either; the member is the same differential equation integrated once more, in fractions:

    EA u' = N,   EI phi' = M,   w' = phi - V / (G As),   N' = -p,   V' = q,   M' = V

in local axes, rotations counter-clockwise, V the sum of the across forces from the `from` end. Unknown are the joints'
displacements, three end forces and two kinks a member, and the reactions; rigid stands for a flexibility of nought. What
elimination leaves open is undetermined. Source: elementary beam theory; linear algebra over a field.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field
from fractions import Fraction
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from crosscheck.answer import CaseAnswer, Undetermined
from crosscheck.frame.model import (
    FREE,
    HELD,
    Frame,
    JointCouple,
    JointForce,
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
Row = dict[int, Fraction]
ONE = -1
"""Column of the known part of an expression."""
NOUGHT, UNIT = Fraction(0), Fraction(1)
LOCAL = ("u", "w", "phi", "N", "V", "M")


class NotRational(ValueError):
    """A length or a cosine that is no rational number."""


def exact_root(square: Fraction) -> Fraction:
    """The square root of a rational square. Raises NotRational."""
    above, below = math.isqrt(square.numerator), math.isqrt(square.denominator)
    if above**2 != square.numerator or below**2 != square.denominator:
        raise NotRational(f"the root of {square} is not rational")
    return Fraction(above, below)


def exact_direction(degrees: float) -> tuple[Fraction, Fraction]:
    """Cosine and sine of an angle that stands for a rational point of the unit circle. Raises NotRational."""
    cos, sin = math.cos(math.radians(degrees)), math.sin(math.radians(degrees))
    c, s = Fraction(cos).limit_denominator(1000), Fraction(sin).limit_denominator(1000)
    near = abs(float(c) - cos) < 1e-15 and abs(float(s) - sin) < 1e-15
    if c * c + s * s != 1 or not near:
        raise NotRational(f"{degrees} degrees has no rational cosine and sine")
    return c, s


def added(*terms: tuple[Fraction, Row]) -> Row:
    """The sum of factor times row."""
    total: Row = {}
    for factor, row in terms:
        if factor:
            for column, value in row.items():
                total[column] = total.get(column, NOUGHT) + factor * value
    return {column: value for column, value in total.items() if value}


@dataclass
class Line:
    """A load on x0 to x1 of a member: intensity p along and q across at x0, and their slopes."""

    x0: Fraction
    x1: Fraction
    p: tuple[Fraction, Fraction]
    q: tuple[Fraction, Fraction]


@dataclass
class OnMember:
    """One case's loads on one member. points: distance, along, across, couple (counter-clockwise is negative)."""

    points: list[tuple[Fraction, Fraction, Fraction, Fraction]] = field(default_factory=list)
    lines: list[Line] = field(default_factory=list)
    stretch: Fraction = NOUGHT
    bend: Fraction = NOUGHT
    misfit: Fraction = NOUGHT


class Exact:
    """The solution of every case and combination of `frame`, first order."""

    def __init__(self, frame: Frame) -> None:
        assert frame.analysis.order == 1
        self.frame = frame
        self.members = list(frame.members.values())
        self.joints = list(frame.joints)
        self.axes = dict.fromkeys(self.joints, (UNIT, NOUGHT))
        self.axes |= {s.joint: exact_direction(s.angle) for s in frame.supports.values()}
        self.held = [
            (s.joint, axis, stiffness)
            for s in frame.supports.values()
            for axis, stiffness in enumerate((s.x, s.y, s.rotation))
            if stiffness != FREE
        ]
        self.first_member = 3 * len(self.joints)
        self.first_reaction = self.first_member + 5 * len(self.members)
        self.size = self.first_reaction + len(self.held)
        self.loads: dict[str, list[OnMember]] = {}
        self.solutions = {name: self._solve(name) for name in frame.names}
        self.cases = {name: self._answer(name) for name in frame.names}

    # --- geometry and loads

    def run(self, m: Member) -> tuple[Fraction, Fraction, Fraction]:
        """Cosine, sine and length of a member."""
        a, b = self.frame.joints[m.joint_from], self.frame.joints[m.joint_to]
        dx, dy = Fraction(b.x) - Fraction(a.x), Fraction(b.y) - Fraction(a.y)
        length = exact_root(dx * dx + dy * dy)
        return dx / length, dy / length, length

    def _local(self, m: Member, direction: float | str) -> tuple[Fraction, Fraction]:
        if direction == "along":
            return UNIT, NOUGHT
        if direction == "across":
            return NOUGHT, UNIT
        (c, s), (cos, sin, _) = exact_direction(float(direction)), self.run(m)
        return c * cos + s * sin, s * cos - c * sin

    def _gather(self, name: str) -> tuple[list[OnMember], list[list[Fraction]], dict[tuple[str, int], Fraction]]:
        """Loads on members, on joints (fx, fy, counter-clockwise couple), and settlements by joint and axis."""
        frame = self.frame
        on = [OnMember() for _ in self.members]
        joint = [[NOUGHT] * 3 for _ in self.joints]
        settled: dict[tuple[str, int], Fraction] = {}
        factors = {name: 1.0} if name in frame.cases else frame.combinations[name].factors
        for case, factor in factors.items():
            for load in frame.cases[case].loads:
                self._add(load, Fraction(factor), on, joint, settled)
        return on, joint, settled

    def _add(
        self, load: Load, f: Fraction, on: list[OnMember], joint: list[list[Fraction]],
        settled: dict[tuple[str, int], Fraction],
    ) -> None:  # fmt: skip
        match load:
            case JointForce():
                for axis, part in enumerate(exact_direction(load.direction)):
                    joint[self.frame.joint_index[load.joint]][axis] += f * Fraction(load.force) * part
            case JointCouple():
                joint[self.frame.joint_index[load.joint]][2] -= f * Fraction(load.couple)
            case Settlement():
                for axis, value in enumerate((load.x, load.y, -load.rotation)):
                    settled[load.joint, axis] = settled.get((load.joint, axis), NOUGHT) + f * Fraction(value)
            case SelfWeight():
                for m, to in zip(self.members, on, strict=True):
                    area, weight = self.frame.sections[m.section].A, self.frame.materials[m.material].weight
                    assert area is not None and weight is not None
                    cos, sin, length = self.run(m)
                    w = f * Fraction(load.factor) * Fraction(area) * Fraction(weight)
                    to.lines.append(Line(NOUGHT, length, (-w * sin, NOUGHT), (-w * cos, NOUGHT)))
            case _:
                self._add_to_member(load, f, on[self.frame.member_index[load.member]])

    def _add_to_member(self, load: Load, f: Fraction, to: OnMember) -> None:
        m = self.frame.members[load.member]  # type: ignore[union-attr]
        material, section = self.frame.materials[m.material], self.frame.sections[m.section]
        match load:
            case PointForce():
                along, across = (f * Fraction(load.force) * part for part in self._local(m, load.direction))
                to.points.append((Fraction(load.at), along, across, NOUGHT))
            case PointCouple():
                to.points.append((Fraction(load.at), NOUGHT, NOUGHT, f * Fraction(load.couple)))
            case Spread():
                along, across = self._local(m, load.direction)
                w = f * abs(across) if load.projection else f
                x0, x1, first, last = (Fraction(v) for v in (load.start, load.end, load.first, load.last))
                slope = (last - first) / (x1 - x0)
                to.lines.append(
                    Line(x0, x1, (w * first * along, w * slope * along), (w * first * across, w * slope * across))
                )
            case Temperature():
                alpha = Fraction(material.alpha or 0.0)
                to.stretch += f * alpha * Fraction(load.mean)
                if load.difference:
                    to.bend += f * alpha * Fraction(load.difference) / Fraction(section.depth or 0.0)
            case Misfit():
                to.misfit += f * Fraction(load.too_long)

    # --- one member: six rows of its state, linear in the unknowns

    def _start(self, k: int) -> list[Row]:
        m = self.members[k]
        cos, sin, _ = self.run(m)
        j, own = 3 * self.frame.joint_index[m.joint_from], self.first_member + 5 * k
        u, w = added((cos, {j: UNIT}), (sin, {j + 1: UNIT})), added((-sin, {j: UNIT}), (cos, {j + 1: UNIT}))
        return [u, w, {j + 2: UNIT}, {own: UNIT}, {own + 1: UNIT}, {own + 2: UNIT}]

    def _flexibility(self, m: Member) -> tuple[Fraction, Fraction, Fraction]:
        s, t, a = self.frame.sections[m.section], self.frame.materials[m.material], self.frame.analysis
        axial = 1 / (Fraction(t.E) * Fraction(s.A or 0.0)) if a.axial == "elastic" else NOUGHT
        shear = 1 / (Fraction(t.G or 0.0) * Fraction(s.shear_area or 0.0)) if a.shear == "elastic" else NOUGHT
        return axial, 1 / (Fraction(t.E) * Fraction(s.I)), shear

    def _carry(self, k: int, on: OnMember, upto: Fraction, after: bool) -> tuple[list[Row], dict[str, Row]]:
        """The state at `upto` (point loads there included if `after`), and the moments at the two connections."""
        m, own = self.members[k], self.first_member + 5 * k
        length = self.run(m)[2]
        faces = Fraction(m.rigid_from), length - Fraction(m.rigid_to)
        cuts = {NOUGHT, length, *faces, upto, *(p[0] for p in on.points)}
        cuts |= {x for line in on.lines for x in (line.x0, line.x1)}
        state, moments = self._start(k), {}
        ordered = sorted(cuts)
        for x, following in zip(ordered, [*ordered[1:], length], strict=True):
            here = x < upto or (x == upto and after)
            if x == faces[0]:
                moments["from"] = state[5]
                state[2] = added((UNIT, state[2]), (UNIT, {own + 3: UNIT}))
                state[0] = added((UNIT, state[0]), (on.misfit, {ONE: UNIT}))
            for at, along, across, couple in on.points if here else ():
                if at == x:
                    for row, value in ((3, -along), (4, across), (5, couple)):
                        state[row] = added((UNIT, state[row]), (value, {ONE: UNIT}))
            if x == faces[1] and (here or x == length):
                moments["to"] = state[5]
                state[2] = added((UNIT, state[2]), (UNIT, {own + 4: UNIT}))
            if x >= upto:
                break
            bends = faces[0] <= x < faces[1]
            state = self._advance(state, m, on, x, following - x, bends)
        return state, moments

    def _advance(self, s: list[Row], m: Member, on: OnMember, x: Fraction, h: Fraction, bends: bool) -> list[Row]:
        (p, dp), (q, dq) = _intensity(on, x, x + h)
        ea, ei, ga = self._flexibility(m) if bends else (NOUGHT,) * 3
        stretch, bend = (on.stretch, on.bend) if bends else (NOUGHT, NOUGHT)
        one = {ONE: UNIT}
        u, w, phi, n, v, moment = s
        return [
            added((UNIT, u), (ea * h, n), (stretch * h - ea * (p * h**2 / 2 + dp * h**3 / 6), one)),
            added(
                (UNIT, w), (h, phi), (ei * h**2 / 2, moment), (ei * h**3 / 6 - ga * h, v),
                (ei * (q * h**4 / 24 + dq * h**5 / 120) + bend * h**2 / 2 - ga * (q * h**2 / 2 + dq * h**3 / 6), one),
            ),
            added(
                (UNIT, phi), (ei * h, moment), (ei * h**2 / 2, v),
                (ei * (q * h**3 / 6 + dq * h**4 / 24) + bend * h, one),
            ),
            added((UNIT, n), (-(p * h + dp * h**2 / 2), one)),
            added((UNIT, v), (q * h + dq * h**2 / 2, one)),
            added((UNIT, moment), (h, v), (q * h**2 / 2 + dq * h**3 / 6, one)),
        ]  # fmt: skip

    # --- equations: rows that must come to nought

    def _rows(self, name: str) -> list[Row]:
        on, joint, settled = self._gather(name)
        self.loads[name] = on
        balance: list[Row] = [{ONE: f} if f else {} for forces in joint for f in forces]
        rows: list[Row] = []
        for k in range(len(self.members)):
            rows += self._member_rows(k, on[k], balance)
        for k, (name_, axis, stiffness) in enumerate(self.held):
            column, j = self.first_reaction + k, 3 * self.frame.joint_index[name_]
            along = self._axis(name_, axis)
            for place, part in enumerate(along):
                balance[j + place] = added((UNIT, balance[j + place]), (part, {column: UNIT}))
            moved = {j + place: part for place, part in enumerate(along) if part}
            off = added((UNIT, moved), (-settled.get((name_, axis), NOUGHT), {ONE: UNIT}))
            rows.append(off if stiffness == HELD else added((Fraction(stiffness), off), (UNIT, {column: UNIT})))
        return balance + rows

    def _axis(self, joint: str, axis: int) -> tuple[Fraction, Fraction, Fraction]:
        c, s = self.axes[joint]
        return ((c, s, NOUGHT), (-s, c, NOUGHT), (NOUGHT, NOUGHT, UNIT))[axis]

    def _member_rows(self, k: int, on: OnMember, balance: list[Row]) -> list[Row]:
        m, own = self.members[k], self.first_member + 5 * k
        cos, sin, length = self.run(m)
        start, (end, moments) = self._start(k), self._carry(k, on, length, after=True)
        j1, j2 = (3 * self.frame.joint_index[name] for name in (m.joint_from, m.joint_to))
        # What the member does to its joints: N pulls them together; V and M are what acts on it at the `from` end.
        for j, sign, (n, v, moment) in ((j1, UNIT, start[3:]), (j2, -UNIT, end[3:])):
            balance[j] = added((UNIT, balance[j]), (sign * cos, n), (sign * sin, v))
            balance[j + 1] = added((UNIT, balance[j + 1]), (sign * sin, n), (-sign * cos, v))
            balance[j + 2] = added((UNIT, balance[j + 2]), (sign, moment))
        there = [
            added((cos, {j2: UNIT}), (sin, {j2 + 1: UNIT})), added((-sin, {j2: UNIT}), (cos, {j2 + 1: UNIT})),
            {j2 + 2: UNIT},
        ]  # fmt: skip
        rows = [added((UNIT, mine), (-UNIT, its)) for mine, its in zip(end[:3], there, strict=True)]
        for name, turn, kink in (("from", m.turn_from, own + 3), ("to", m.turn_to, own + 4)):
            if turn == HELD:
                rows.append({kink: UNIT})
            else:
                rows.append(added((-Fraction(turn), {kink: UNIT}), (UNIT, moments[name])))
        return rows

    def _solve(self, name: str) -> list[Row]:
        return reduced(self._rows(name), self.size)

    # --- results

    def value(self, name: str, row: Row) -> Fraction | None:
        """An expression's value; None where it is undetermined."""
        total = added(*((value, self.solutions[name][c] if c != ONE else {ONE: UNIT}) for c, value in row.items()))
        return total.get(ONE, NOUGHT) if set(total) <= {ONE} else None

    def _answer(self, name: str) -> CaseAnswer:
        ends, joints = np.zeros((len(self.members), 2, 3)), np.zeros((len(self.joints), 3))
        for k, m in enumerate(self.members):
            start, end = self._start(k), self._carry(k, self.loads[name][k], self.run(m)[2], after=True)[0]
            for side, (state, sign) in enumerate(((start, 1.0), (end, -1.0))):
                n, v, moment = (_float(self.value(name, state[row])) for row in (3, 4, 5))
                ends[k, side] = n, sign * v, sign * moment
        for k in range(len(self.joints)):
            joints[k] = [_float(self.value(name, {3 * k + axis: UNIT})) for axis in range(3)]
        joints[:, 2] *= -1.0
        return CaseAnswer(ends, joints, self._reactions(name))

    def _reactions(self, name: str) -> Array:
        rows: dict[tuple[str, int], Row] = {}
        for k, (joint, axis, _) in enumerate(self.held):
            for place, part in enumerate(self._axis(joint, axis)):
                row = rows.get((joint, place), {})
                rows[joint, place] = added((UNIT, row), (part, {self.first_reaction + k: UNIT}))
        reactions = np.zeros((len(self.joints), 3))
        for (joint, place), row in rows.items():
            reactions[self.frame.joint_index[joint], place] = _float(self.value(name, row)) * (-1.0 if place == 2 else 1.0)
        return reactions

    @cached_property
    def undetermined(self) -> Undetermined:
        answer = self.cases[self.frame.names[0]]
        return Undetermined(np.isnan(answer.ends[:, 0, 0]), np.isnan(answer.joints), np.isnan(answer.reactions))

    def along(self, name: str, member: Iterable[int], x: Iterable[float], side: Iterable[int]) -> Array:
        """(n, 4) axial, shear, moment, across, as answer.Spans.along gives them."""
        out = []
        for k, at, s in zip(member, x, side, strict=True):
            state = self._carry(int(k), self.loads[name][int(k)], Fraction(float(at)), after=s > 0)[0]
            out.append([_float(self.value(name, state[row])) for row in (3, 4, 5, 1)])
        return np.array(out).reshape(-1, 4)


def _float(value: Fraction | None) -> float:
    return math.nan if value is None else float(value)


def _intensity(on: OnMember, x0: Fraction, x1: Fraction) -> tuple[Sequence[Fraction], Sequence[Fraction]]:
    p, q = [NOUGHT, NOUGHT], [NOUGHT, NOUGHT]
    for line in on.lines:
        if line.x0 <= x0 and x1 <= line.x1:
            for total, (first, slope) in ((p, line.p), (q, line.q)):
                total[0] += first + slope * (x0 - line.x0)
                total[1] += slope
    return p, q


class CannotFollow(Exception):
    """The equations contradict each other."""


def reduced(rows: list[Row], size: int) -> list[Row]:
    """Every unknown as an expression of the known (ONE) and of the unknowns that the rows leave open.

    Gauss and Jordan, the shortest row first; exact, so that any pivot but nought will do. Raises CannotFollow.
    """
    waiting = [dict(row) for row in rows if row]
    done: dict[int, Row] = {}
    while waiting:
        waiting.sort(key=len, reverse=True)
        row = waiting.pop()
        columns = [c for c in row if c != ONE]
        if not columns:
            raise CannotFollow("a load that nothing resists, or an imposed length that cannot be followed")
        counts = {c: sum(c in other for other in waiting) for c in columns}
        pivot = min(columns, key=counts.__getitem__)
        factor = -1 / row[pivot]
        expression = {c: factor * value for c, value in row.items() if c != pivot}
        for group in (waiting, list(done.values())):
            for other in group:
                if pivot in other:
                    put = other.pop(pivot)
                    for c, value in expression.items():
                        total = other.get(c, NOUGHT) + put * value
                        if total:
                            other[c] = total
                        else:
                            other.pop(c, None)
        done[pivot] = expression
        waiting = [other for other in waiting if other]
    return [done.get(c, {c: UNIT}) for c in range(size)]
