"""Members and supports that work one way only: which of them work under a case.

Every such part has a force f >= 0 and a gap s >= 0 of which one is zero. A gap is a movement imposed on the whole frame: a
slack tension member is one that was made shorter, a support that has let go is one that has moved away. With all parts in
place the forces are therefore linear in the gaps,

    f = f_0 + A s,    f >= 0,  s >= 0,  f s = 0,

A being what a unit of each gap does to each force: symmetric and never negative as a quadratic form. This linear
complementarity problem is solved by complementary pivoting (C. E. Lemke, "Bimatrix equilibrium points and mathematical
programming", Management Science 11 (1965), 681-689), which for such A either finds a solution or proves that there is none
(R. W. Cottle, J.-S. Pang and R. E. Stone, The Linear Complementarity Problem, 1992; both from memory). What is found is
then solved with the parts taken out, and judged by its own forces and movements; where rounding has misjudged one, states
are tried one after another from there.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import cached_property
from typing import TypeVar

import numpy as np

from crosscheck.frame.loads import LoadTable, load_table
from crosscheck.frame.model import HELD, Bools, Floats, Frame
from crosscheck.opinions.slope_deflection.members import end_actions
from crosscheck.opinions.slope_deflection.system import Solution, System, gathered, support_axes

NOISE = 1e-9
"""Share of the scale within which a force or a gap counts as zero; a part with neither stays in."""
NOTHING = 1e-11
"""Influence of a gap on a force below this share of the frame's largest stiffness is rounding."""
FREE_PIVOT = 1e-13
"""A pivot below this share of its own diagonal entry is a movement without resistance."""
FURTHER, ENOUGH = 20, 300
"""States tried for every part, and once as many more; but no more than so many in all."""
MOST = 8
"""Parts named where no state was found."""
NONE_FOUND = "no settled state of the one-way members and supports was found"

Found = TypeVar("Found")


@dataclass(frozen=True, slots=True)
class Part:
    """A one-way member or support direction. joint: index, -1 for a member; axis: 0 or 1 of a support; sense: +1 where it
    works in tension, or pushes along + of its axis; -1 otherwise."""

    name: str
    member: int
    joint: int
    axis: int
    sense: float

    @property
    def says(self) -> str:
        return self.name if self.member >= 0 else f"support {self.name} in {'xy'[self.axis]}"


def parts(frame: Frame) -> tuple[Part, ...]:
    """Every one-way part, members first."""
    found = [
        Part(name, frame.member_index[name], -1, 0, 1.0 if member.only == "tension" else -1.0)
        for name, member in frame.members.items()
        if member.only
    ]
    for support in frame.supports.values():
        for axis, only, stiffness in ((0, support.x_only, support.x), (1, support.y_only, support.y)):
            if only and stiffness == HELD:
                joint = frame.joint_index[support.joint]
                found.append(Part(support.joint, -1, joint, axis, 1.0 if only == "push" else -1.0))
    return tuple(found)


def without(frame: Frame, every: tuple[Part, ...], out: Bools) -> Frame:
    """The frame with some parts taken out."""
    gone = [part for part, is_out in zip(every, out, strict=True) if is_out]
    return replace(
        frame,
        out_members=frozenset(part.name for part in gone if part.member >= 0),
        out_supports=frozenset((part.name, "xy"[part.axis]) for part in gone if part.member < 0),
    )


@dataclass(frozen=True, slots=True)
class Settled:
    """A case with the right parts out: the frame and equations without them, and the solution, its only case."""

    frame: Frame
    system: System
    solution: Solution
    out: Bools


class OneWay:
    """The one-way parts of a frame, and the states that its cases settle in."""

    def __init__(self, frame: Frame) -> None:
        self.frame, self.parts = frame, parts(frame)
        self.whole = System(frame)
        self._systems: dict[bytes, System | None] = {}

    @property
    def none_found(self) -> str:
        """What is said of a case that settles in no state."""
        names = [part.says for part in self.parts]
        return f"{NONE_FOUND}: {', '.join(names[:MOST])}" + (f" and {len(names) - MOST} more" if len(names) > MOST else "")

    def settled(self, name: str) -> Settled | None:
        """The state that case `name` settles in; None where none was found."""
        table = load_table(self.frame, name)
        return search(self.first(table), lambda out: self._judged(table, out))

    def _judged(self, table: LoadTable, out: Bools) -> tuple[Settled, Bools] | None:
        system = self.system(out)
        if system is None:
            return None
        found = Settled(system.frame, system, system.solve([table]), out)
        if not found.solution.unsettled[0] <= NOISE:
            return None
        return found, wrong(*self._measured(found.solution), out)

    # --- the first guess: complementary pivoting

    def first(self, table: LoadTable) -> Bools:
        """Which parts the linear complementarity problem takes out; none where it has no solution."""
        none = np.zeros(len(self.parts), dtype=bool)
        still = self.whole.solve([table])
        forces, _, scale, size = self._measured(still)
        forces = np.where(np.abs(forces) <= NOISE * scale, 0.0, forces)
        gaps = complementary(self.influence, forces)
        if gaps is None:
            return none
        return np.asarray(gaps > NOISE * max(size, float(gaps.max(initial=0.0))))

    @cached_property
    def influence(self) -> Floats:
        """(parts, parts): force of each per unit gap of each, all parts in place."""
        blank = load_table_of_nothing(self.frame)
        tables = [_imposed(blank, part) for part in self.parts]
        if not tables:
            return np.zeros((0, 0))
        solution = self.whole.solve(tables)
        columns = [self._forces(solution, k) for k in range(len(tables))]
        matrix = np.stack(columns, axis=1)
        matrix = (matrix + matrix.T) / 2
        return np.where(np.abs(matrix) <= NOTHING * self._stiffest, 0.0, matrix)

    @property
    def _stiffest(self) -> float:
        return max(self.whole.stiffest, float(np.nanmax(self.whole.coefficients.axial, initial=0.0)))

    # --- what a solution says of the parts

    def _forces(self, solution: Solution, k: int) -> Floats:
        return self.working(solution.forces[:, 2, k], reactions(solution, k))

    def _measured(self, solution: Solution) -> tuple[Floats, Floats, float, float]:
        """Forces and gaps of the parts and the scales of both, of a solution's only case."""
        t, table, shift = self.frame.member_table, solution.tables[0], solution.shift[:, 0]
        longer = (solution.system.deformation @ shift)[2::3] - solution.fixed[0].stretch
        actions = np.abs(solution.forces[:, :, 0])
        actions[:, :2] /= t.clear[:, None]
        others = np.abs(solution.fixed[0].between[:, :2]), np.abs(table.joint[:, :2])
        scale = float(max(values.max() for values in (actions, *others)))
        return self._forces(solution, 0), self.gaps(longer, shift, table), scale, reach(shift, table)

    def working(self, axial: Floats, pull: Floats) -> Floats:
        """(parts,) force of each in the sense in which it works, from axial forces of stretch (m,) and from what holds
        each joint along its support's axes (j, 3)."""
        return np.array([
            part.sense * (axial[part.member] if part.member >= 0 else pull[part.joint, part.axis]) for part in self.parts
        ])  # fmt: skip

    def gaps(self, longer: Floats, shift: Floats, table: LoadTable) -> Floats:
        """(parts,) gap of each, from the members' elongations beyond what temperature and misfit would give them (m,) and
        displacements along the supports' axes (3j,)."""
        moved = (shift - table.settlement.ravel()).reshape(-1, 3)
        return np.array([
            part.sense * (-longer[part.member] if part.member >= 0 else moved[part.joint, part.axis])
            for part in self.parts
        ])  # fmt: skip

    def _parted(self, system: System) -> bool:
        """Whether what is out leaves a joint without anything that resists it in a direction."""
        lost = system.diagonal <= FREE_PIVOT * self.whole.diagonal
        return bool(np.any(lost & ~system.held & (self.whole.diagonal != 0.0)))

    def system(self, out: Bools) -> System | None:
        """The equations without the parts `out`, factorised once; None where the frame could then move freely."""
        key = out.tobytes()
        if key not in self._systems:
            system = System(without(self.frame, self.parts, out)) if out.any() else self.whole
            self._systems[key] = system if stands(system) and not self._parted(system) else None
        return self._systems[key]


def wrong(forces: Floats, gaps: Floats, scale: float, size: float, out: Bools) -> Bools:
    """(parts,): parts in place that would have to work the wrong way, and parts out that would work. scale, size: what
    forces and gaps are small against."""
    return np.asarray(np.where(out, gaps < -NOISE * size, forces < -NOISE * scale))


def reach(shift: Floats, table: LoadTable) -> float:
    """The largest movement of any joint, settlements included."""
    moved = np.abs(np.stack([shift, table.settlement.ravel()])).reshape(2, -1, 3)
    return float(moved[:, :, :2].max())


def search(
    first: Bools, judged: Callable[[Bools], tuple[Found, Bools] | None], most: int | None = None
) -> Found | None:
    """The first settled state from a guess on: all parts that are wrong are changed at once and, where that leads back to
    a state known already, one alone, the first of them first (K. G. Murty 1974, least index). Of a state that cannot stand,
    one of the parts taken out is put back.

    judged: of the parts out, what it finds and which parts are wrong; None where the frame cannot stand so. most: how
    many states are tried, by default FURTHER for every part, up to ENOUGH.
    """
    known: set[bytes] = set()
    out: Bools | None = first
    for _ in range(most or min(ENOUGH, FURTHER * (1 + len(first)))):
        if out is None:
            return None
        known.add(out.tobytes())
        found = judged(out)
        if found is not None and not found[1].any():
            return found[0]
        out = _next(out, found[1], known, True) if found is not None else _next(out, out, known, False)
    return None


def _next(out: Bools, changes: Bools, known: set[bytes], together: bool) -> Bools | None:
    """A state not tried yet: with all changes where `together`, or with one of them, or with any one change."""
    single = np.eye(len(out), dtype=bool)
    order = [*([changes] if together else []), *single[changes], *single[~changes]]
    return next((out ^ change for change in order if (out ^ change).tobytes() not in known), None)


def stands(system: System) -> bool:
    """Whether no movement is without resistance: no pivot vanishes."""
    if not len(system.free):
        return True
    try:
        system.correct(np.zeros((len(system.free), 1)))
    except RuntimeError:
        return False
    factor = system._factor
    pivots = np.abs(factor.U.diagonal())[factor.perm_c]
    return bool(np.all(pivots > FREE_PIVOT * np.abs(system.matrix.diagonal())))


def reactions(solution: Solution, k: int) -> Floats:
    """(j, 3) what holds each joint along its support's axes in the k-th case; rounding where nothing does."""
    frame, fixed = solution.system.frame, solution.fixed[k]
    ends = end_actions(frame, solution.forces[:, :2, k], solution.forces[:, 2, k] + fixed.axial, fixed)
    pull = support_axes(frame) @ (gathered(frame, ends) - solution.tables[k].joint).ravel()
    return np.asarray((pull + solution.system.ties.T @ solution.ties[:, k]).reshape(-1, 3))


def load_table_of_nothing(frame: Frame) -> LoadTable:
    """A table without any load."""
    members, joints = len(frame.members), len(frame.joints)
    none, no_ints, pair = np.zeros(0), np.zeros(0, dtype=np.int64), np.zeros((0, 2))
    return LoadTable(
        np.zeros((joints, 3)), np.zeros((joints, 3)), no_ints, none, none, none, none, no_ints, none, none, pair, pair,
        np.zeros(members), np.zeros(members), np.zeros(members),
    )  # fmt: skip


def _imposed(blank: LoadTable, part: Part) -> LoadTable:
    """A unit gap as an imposed movement: a member so much shorter (or longer) than stated, a support so far away."""
    if part.member >= 0:
        misfit = blank.misfit.copy()
        misfit[part.member] = -part.sense
        return replace(blank, misfit=misfit)
    settlement = blank.settlement.copy()
    settlement[part.joint, part.axis] = part.sense
    return replace(blank, settlement=settlement)


def complementary(matrix: Floats, start: Floats) -> Floats | None:
    """z >= 0 with start + matrix z >= 0 and one of both zero everywhere; None where there is no such z.

    Lemke's pivoting: an artificial variable is brought in to make all positive, then complements follow one another until
    it leaves again. Variables 0..n-1 are the forces, n..2n-1 the gaps, 2n the artificial one.
    """
    n = len(start)
    if (start >= 0.0).all():
        return np.zeros(n)
    unit = 1.0 / np.sqrt(np.where(matrix.diagonal() > 0.0, matrix.diagonal(), 1.0))
    scaled = matrix * unit[:, None] * unit
    right = start * unit
    right = right / np.abs(right).max()
    table = np.hstack([np.eye(n), -scaled, -np.ones((n, 1)), right[:, None]])
    basis = np.arange(n)
    entering, row = 2 * n, int(np.argmin(right))
    for _ in range(50 * (n + 1)):
        leaving = int(basis[row])
        _pivot(table, row, entering)
        basis[row] = entering
        if leaving == 2 * n:
            gaps = np.zeros(2 * n + 1)
            gaps[basis] = table[:, -1]
            return np.asarray(gaps[n : 2 * n] * unit * np.abs(start * unit).max())
        entering = leaving + n if leaving < n else leaving - n
        column = table[:, entering]
        can = column > 1e-11
        if not can.any():
            return None
        ratio = np.where(can, table[:, -1] / np.where(can, column, 1.0), np.inf)
        least = np.flatnonzero(ratio <= ratio.min() + 1e-13)
        # The artificial variable leaves as soon as it can; otherwise the surest pivot goes.
        artificial = least[basis[least] == 2 * n]
        row = int(artificial[0]) if len(artificial) else int(least[np.argmax(column[least])])
    return None


def _pivot(table: Floats, row: int, column: int) -> None:
    table[row] /= table[row, column]
    factors = table[:, column].copy()
    factors[row] = 0.0
    table -= factors[:, None] * table[row]
