"""One-way members and supports in second order: first the state that the undisplaced frame settles in, and from there
whatever the displaced frame itself finds wrong. A state past its critical load, or one that could move freely
undisplaced, is no state."""

from __future__ import annotations

import numpy as np

from crosscheck.frame.loads import LoadTable, load_table
from crosscheck.frame.model import Bools, Floats
from crosscheck.opinions.slope_deflection.balance import balance
from crosscheck.opinions.slope_deflection.one_way import OneWay, reach, search, wrong
from crosscheck.opinions.slope_deflection.second_order import CaseInSecondOrder, PastCritical, State

MOST = 24
"""States tried: each may be a balance of its own."""

Balanced = tuple[CaseInSecondOrder, State]


class DisplacedOneWay:
    """The one-way parts of a frame in second order."""

    def __init__(self, one_way: OneWay) -> None:
        self.one_way = one_way

    def settled(self, name: str) -> Balanced | str:
        """The case without what is out, and its balance; or why there is none."""
        table = load_table(self.one_way.frame, name)
        past: list[CaseInSecondOrder] = []
        found = search(self.one_way.first(table), lambda out: self._judged(table, out, past), MOST)
        if found is not None:
            return found
        return _why(past[0]) if past else self.one_way.none_found

    def _judged(self, table: LoadTable, out: Bools, past: list[CaseInSecondOrder]) -> tuple[Balanced, Bools] | None:
        system = self.one_way.system(out)
        if system is None:
            return None
        case = CaseInSecondOrder(system.frame, table)
        state = None if case.buckled(1.0, case.first_order()) else _balanced(case)
        if state is None:
            past.append(case)
            return None
        longer = np.asarray(system.deformation @ state.shift)[2::3] - case.fixed.stretch
        forces = self.one_way.working(state.axial, case.held(state))
        gaps = self.one_way.gaps(longer, state.shift, table)
        return (case, state), wrong(forces, gaps, _scale(case, state), reach(state.shift, table), out)


def _balanced(case: CaseInSecondOrder) -> State | None:
    try:
        return balance(case)
    except PastCritical:
        return None


def _why(case: CaseInSecondOrder) -> str:
    try:
        balance(case)
    except PastCritical as error:
        return str(error)
    return "past its critical load"


def _scale(case: CaseInSecondOrder, state: State) -> float:
    """The largest axial force, shear or load on a joint."""
    actions: list[Floats] = [state.axial, case.end_actions(state)[:, :, :2], case.table.joint[:, :2]]
    return max(float(np.abs(values).max()) for values in actions)
