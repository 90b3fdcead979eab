"""Balance on the displaced frame: which axial forces, put into the equations, come out of them again.

Newton's method with the exact tangent. What comes out changes with the axial forces N put in because they soften or
stiffen the members: with K the stiffness under N, B the elongations, D the members' stiffness against them, and G the
forces on the unknowns that a unit more of each axial force brings on the displaced frame,

    dN_out = -D B K^-1 G dN,        (I + D B K^-1 G)^-1 = I - D B (K + G D B)^-1 G,

so that one sparse factorisation of the tangent K + G D B, not symmetric, gives the next N (M. A. Woodbury, 1950, for the
inverse). Where first-order axial forces are not close, the balance is followed from no load on by steps along its own
arc, on which load and axial forces are unknowns together (E. Riks, "An incremental approach to the solution of snapping
and buckling problems", Int. J. Solids Structures 15 (1979), 529-551; M. A. Crisfield 1981; from memory). Where the load
on that path is largest the tangent is singular and the frame gives way: no balance is reached beyond.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
import scipy.sparse as sp

from crosscheck.frame.model import Floats, Ints
from crosscheck.opinions.slope_deflection.division import softening
from crosscheck.opinions.slope_deflection.second_order import CaseInSecondOrder, Equations, PastCritical, State

SETTLED = 1e-12
"""Largest change of an axial force, as a share of the largest force, at which the iteration ends."""
ROUNDED = 1e-9
"""Share at which it ends too where a further round no longer halves it."""
FOLLOWED = 1e-8
"""Share that is enough on the way along the path."""
NEAR = 0.5
"""Largest step of an axial force, as a share of the largest force, for which the path need not be followed."""
SHRINKING = 0.25
"""Largest ratio of one step to the one before it there."""
ROUNDS = 12
ROUNDS_ON_PATH = 6
LONGEST, FIRST, SHORTEST = 0.4, 0.2, 1e-7
"""Steps along the path: share of the load, or of the largest first-order axial force."""
ASTRAY = 3.0
"""So many steps from where it set out a search is given up."""
PEAK = 1e-7
"""Share of the load to which the end of the path is found."""
PEAK_ROUNDS = 30


def balance(case: CaseInSecondOrder) -> State:
    """The state in balance under the whole load. Raises PastCritical where there is none."""
    first = case.undisplaced().solve().axial
    pulls = case.pulls(first)
    if case.buckled(1.0, pulls):
        factor = case.critical_factor(pulls)
        # Rigid members stand in the pivots as stiff ones and may have buckled the frame a trace early.
        if factor <= 1.0:
            raise PastCritical(f"past its critical load: the critical load factor is {factor:.4g}")
    found = _at_once(case, first)
    return found if found is not None else _Path(case, first).followed()


@dataclass(frozen=True)
class Trial:
    """What the equations give at a share of the load for axial forces (m,) put in (without their fixed-end part)."""

    share: float
    axial: Floats
    equations: Equations
    state: State

    @property
    def gap(self) -> Floats:
        """(m,) what comes out less what was put in."""
        return np.asarray(self.state.axial - self.axial)

    @property
    def off(self) -> float:
        """The largest of it, as a share of the largest force."""
        return _largest(self.gap) / self.size

    @cached_property
    def size(self) -> float:
        """The largest axial or shear force: axial forces that are rounding are measured by it."""
        d, p = self.equations.division, self.equations.pieces
        moved = np.concatenate([self.state.nodes[d.left], self.state.nodes[d.left + 1]], axis=1)
        shear = np.einsum("pij,pj->pi", p.stiffness[:, ::2], moved) + p.fixed[:, ::2]
        return max(_largest(self.state.axial), _largest(shear), 1e-300)

    @cached_property
    def stable(self) -> bool:
        """No critical load lies below these axial forces, and more load would still find a balance."""
        return self.equations.negative_pivots == 0 and self._tangent[2] > 0

    @property
    def regular(self) -> bool:
        """Whether the tangent can be solved with."""
        return self._tangent[0] is not None

    def ahead(self, change: Floats) -> Floats:
        """(m,) what axial forces must change by in order that what comes out changes by `change` less than they do."""
        free, scale = self.equations.free, self._tangent[1]
        step = np.zeros(self._soft.shape[0])
        forces = (self._soft @ change)[free]
        step[free] = scale * self._tangent[0].solve(scale * forces)
        return np.asarray(change - self.equations.case.stretch_stiffness * (self.equations.stretch @ step))

    @cached_property
    def by_load(self) -> Floats:
        """(m,) change of what comes out per share of the load, the axial forces put in unchanged at the faces; the loads
        along the members grow with the rest."""
        e, share = self.equations, self.share
        along = e.correct(self._soft_along)
        return np.asarray(self.state.axial / share - e.case.stretch_stiffness * (e.stretch @ along))

    @cached_property
    def _soft(self) -> Any:
        """(n, m) sparse: forces on the unknowns per unit more of each member's axial force."""
        d, members = self.equations.division, len(self.axial)
        rows = softening(d, self.equations.pieces, self.state.nodes, np.ones_like(d.axial[:, :1]))
        return self._on_unknowns(rows, self.equations.frame.member_table.zone, members)

    @cached_property
    def _soft_along(self) -> Floats:
        """(n,) the same per share of the load from what the loads along the members add to their axial forces."""
        e, d = self.equations, self.equations.division
        own = d.axial.copy()
        own[:, 0] -= self.axial[d.member]
        rows = softening(d, e.pieces, self.state.nodes, own / self.share)
        zones = (e.zone_pulls - self.axial[:, None] * e.frame.member_table.zone) / self.share
        return np.asarray(self._on_unknowns(rows, zones, len(self.axial)).sum(axis=1)).ravel()

    def _on_unknowns(self, rows: Floats, zones: Floats, members: int) -> Any:
        """(n, m) sparse from (p, 4) forces on the pieces' ends and (m, 2) pulls times length of turned rigid zones."""
        e, d = self.equations, self.equations.division
        at = 2 * d.left[:, None] + np.arange(4)
        column = np.broadcast_to(d.piece_member[:, None], at.shape)
        on_nodes = sp.csr_matrix((rows.ravel(), (at.ravel(), column.ravel())), shape=(2 * len(d.node_x), members))
        ends = e.frame.member_table.ends
        turned = zones * self.state.rotations[ends]
        column = np.broadcast_to(np.arange(members)[:, None], ends.shape)
        on_joints = ((3 * ends + 2).ravel(), column.ravel())
        return e.nodes.T @ on_nodes + sp.csr_matrix((turned.ravel(), on_joints), shape=(e.nodes.shape[1], members))

    @cached_property
    def _tangent(self) -> tuple[Any, Floats, int]:
        """The factorised tangent, its scale, and the sign of its determinant; 0 where it is singular."""
        from scipy.sparse.linalg import splu

        e = self.equations
        own, free = e.reduced
        change = self._soft @ sp.diags(e.case.stretch_stiffness) @ e.stretch
        matrix = own + change.tocsc()[free][:, free]
        scale = 1.0 / np.sqrt(np.abs(own.diagonal()).clip(1e-300))
        try:
            factor = splu((sp.diags(scale) @ matrix @ sp.diags(scale)).tocsc())
        except RuntimeError:
            return None, scale, 0
        negative = int(np.sum(factor.U.diagonal() < 0.0)) + _odd(factor.perm_r) + _odd(factor.perm_c)
        return factor, scale, -1 if negative % 2 else 1


def _trial(case: CaseInSecondOrder, share: float, axial: Floats) -> Trial | None:
    """None where the stiffness is exactly singular or nothing finite comes out."""
    part = case if share == 1.0 else case.share(share)
    equations = part.equations(part.pulls(axial))
    try:
        state = equations.solve()
    except RuntimeError:
        return None
    trial = Trial(share, axial, equations, state)
    return trial if np.isfinite(trial.off) else None


def _at_once(case: CaseInSecondOrder, first: Floats) -> State | None:
    """The balance under the whole load where first-order axial forces are close to it; None where they are not, or what is
    found is not stable."""
    axial, before = first, np.inf
    for _ in range(ROUNDS):
        trial = _trial(case, 1.0, axial)
        if trial is None or trial.equations.negative_pivots:
            return None
        if trial.off <= SETTLED or trial.off <= ROUNDED and trial.off > before / 2:
            return trial.state if trial.stable else None
        if not trial.stable or trial.off > before * SHRINKING or trial.off > NEAR:
            return None
        step = trial.ahead(trial.gap)
        if _largest(step) > NEAR * trial.size:
            return None
        axial, before = axial + step, trial.off
    return None


@dataclass(frozen=True)
class _Point:
    """A point of the path and its direction (m + 1,), axial forces as shares of the largest in first order, then load."""

    at: Floats
    direction: Floats
    trial: Trial | None

    @property
    def share(self) -> float:
        return float(self.at[-1])

    @property
    def rising(self) -> bool:
        return bool(self.direction[-1] > 0.0) and (self.trial is None or self.trial.stable)


class _Path:
    """The balances of one case from no load on."""

    def __init__(self, case: CaseInSecondOrder, first: Floats) -> None:
        self.case, self.first = case, first
        # Loads along a member may be all the axial force that it has in first order, and what its stretch adds be rounding.
        self.size = max(_largest(first), _largest(case.pulls(first)), 1e-300)

    def followed(self) -> State:
        """The state at the end of the path that starts from no load. Raises PastCritical where it ends before."""
        start = np.append(self.first / self.size, 1.0)
        here, step = _Point(np.zeros(len(start)), start / np.linalg.norm(start), None), FIRST
        while step > SHORTEST:
            rounds, there = self._next(here, min(step, LONGEST / _largest(here.direction)))
            if there is None:
                step /= 2
                continue
            peak = there if there.rising or there.share >= 1.0 else self._peak(here, there)
            if peak is not None and peak.share >= 1.0:
                found = self._whole(here, peak)
                if found is not None:
                    return found
                step /= 2
            elif peak is None:
                step /= 2
            elif peak is not there:
                raise PastCritical(_NO_BALANCE.format(peak.share))
            else:
                here, step = there, step * (1.5 if rounds <= 3 else 1.0)
        raise PastCritical(_NO_BALANCE.format(here.share))

    def _next(self, here: _Point, step: float) -> tuple[int, _Point | None]:
        """The point of the path on the plane square to its direction, `step` ahead, and the rounds that it took; None
        where none is found or the stiffness has lost its sign on the way."""
        at = here.at + step * here.direction
        for rounds in range(1, ROUNDS_ON_PATH + 1):
            if not (at[-1] > 0.0 and _largest(at - here.at) < ASTRAY * step):
                return rounds, None
            trial = _trial(self.case, float(at[-1]), at[:-1] * self.size)
            if trial is None or not trial.regular:
                return rounds, None
            rate = trial.ahead(trial.by_load) / self.size
            if _largest(trial.gap) <= FOLLOWED * self.size:
                direction = np.append(rate, 1.0)
                direction *= np.sign(direction @ here.direction) / np.linalg.norm(direction)
                return rounds, _Point(at, direction, trial) if trial.equations.negative_pivots == 0 else None
            closer = trial.ahead(trial.gap) / self.size
            square = here.direction
            load = -(square[:-1] @ closer) / (square[:-1] @ rate + square[-1])
            at = at + np.append(closer + load * rate, load)
        return ROUNDS_ON_PATH, None

    def _peak(self, low: _Point, high: _Point) -> _Point | None:
        """The point between two where the load is largest: where the direction has no share of load."""
        here, a, b = low, 0.0, float((high.at - low.at) @ low.direction)
        rise, fall, best = low.direction[-1], high.direction[-1], low
        for _ in range(PEAK_ROUNDS):
            step = (a * fall - b * rise) / (fall - rise) if fall < 0.0 < rise else (a + b) / 2
            step = min(max(step, a + 0.05 * (b - a)), b - 0.05 * (b - a))
            middle = self._next(here, step)[1]
            if middle is None:
                return None
            if middle.share > best.share:
                best = middle
            if middle.rising:
                a, rise = step, middle.direction[-1]
            else:
                b, fall = step, middle.direction[-1]
            if (b - a) * max(rise, -fall) < PEAK:
                break
        return best

    def _whole(self, low: _Point, high: _Point) -> State | None:
        """The balance under the whole load, which lies between two points of the path; None where none is found there."""
        part = (1.0 - low.share) / (high.share - low.share)
        axial, before = (low.at + part * (high.at - low.at))[:-1] * self.size, np.inf
        for _ in range(ROUNDS):
            trial = _trial(self.case, 1.0, axial)
            if trial is None or not trial.regular or trial.equations.negative_pivots:
                return None
            if trial.off <= SETTLED or trial.off <= ROUNDED and trial.off > before / 2:
                return trial.state if trial.stable else None
            axial, before = axial + trial.ahead(trial.gap), trial.off
        return None


_NO_BALANCE = (
    "past its critical load: the axial forces change as the frame gives way, and no stable balance is left beyond "
    "{:.4g} of the load"
)


def _odd(order: Ints) -> int:
    """Whether a permutation is odd: its length less the number of its cycles."""
    seen, cycles = np.zeros(len(order), dtype=bool), 0
    to = order.tolist()
    for start in range(len(to)):
        if seen[start]:
            continue
        cycles += 1
        at = start
        while not seen[at]:
            seen[at] = True
            at = to[at]
    return (len(to) - cycles) % 2


def _largest(values: Floats) -> float:
    return float(np.abs(values).max(initial=0.0))
