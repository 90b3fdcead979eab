"""Values along members on the displaced frame: power series on the flexible parts, statics of the turned rigid zones."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from crosscheck.answer import CaseAnswer
from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import Bools, Floats, Frame, Ints
from crosscheck.frame.stations import Stations, stations
from crosscheck.opinions.slope_deflection.division import TERMS
from crosscheck.opinions.slope_deflection.parting import LoadRuns
from crosscheck.opinions.slope_deflection.second_order import State, integral_of_pull

HALVINGS = 50
DIVISIONS = 4
"""Parts of the stretch between two stations that are looked at for a change of sign."""


@dataclass(frozen=True, slots=True)
class _Curves:
    """Of one case: coefficients (s, TERMS) in xi of displacement across, its slope and the moment on every stretch."""

    state: State
    runs: LoadRuns
    across: Floats
    slope: Floats
    moment: Floats


class DisplacedSpans:
    """The Spans protocol of answer.py in second order."""

    sampled = False

    def __init__(
        self, frame: Frame, tables: Mapping[str, LoadTable], cases: Mapping[str, CaseAnswer], states: Mapping[str, State]
    ) -> None:
        self.frame, self.tables, self.cases, self.states = frame, tables, cases, states

    def along(self, name: str, member: Ints, x: Floats, side: Ints) -> Floats:
        """(n, 4) axial, shear, moment, across; see answer.Spans. Axial and shear along the undisplaced axis."""
        ends = self.cases[name].ends[member, 0]
        axial, shear, moment = self._curves[name].runs.sums(member, x, side)
        still = ends[:, 2] + ends[:, 1] * x + moment
        bent, across = self._bent(name, member, x, side, still)
        return np.stack([ends[:, 0] + axial, ends[:, 1] + shear, bent, across], axis=1)

    def turning_points(self, name: str) -> tuple[Ints, Floats]:
        """Where the moment's gradient, the load across or the slope changes sign between stations."""
        member, a, b = self._stretches
        found = [_zeros(fn, member, a, b) for fn in (self._gradient(name), self._load(name), self._slope(name))]
        return np.concatenate([m for m, _ in found]), np.concatenate([x for _, x in found])

    @cached_property
    def _stations(self) -> Stations:
        return stations(self.frame, list(self.tables.values()))

    @cached_property
    def _stretches(self) -> tuple[Ints, Floats, Floats]:
        s = self._stations
        left = np.flatnonzero((s.member[1:] == s.member[:-1]) & (s.x[1:] > s.x[:-1]))
        member, a, b = s.member[left], s.x[left], s.x[left + 1]
        share = np.arange(DIVISIONS) / DIVISIONS
        starts = a[:, None] + (b - a)[:, None] * share
        ends = np.column_stack([starts[:, 1:], b])
        return np.repeat(member, DIVISIONS), starts.ravel(), ends.ravel()

    @cached_property
    def _curves(self) -> dict[str, _Curves]:
        return {name: self._curve(name, state) for name, state in self.states.items()}

    def _curve(self, name: str, state: State) -> _Curves:
        d, p = state.division, state.pieces
        y = np.concatenate([state.nodes[d.left], state.nodes[d.left + 1]], axis=1)
        forces = np.einsum("pij,pj->pi", p.stiffness, y) + p.fixed
        length, one = d.piece_length, np.ones(len(d.left))
        start = np.stack(
            [y[:, 0] / length, -y[:, 1], forces[:, 1] * length / p.bend, forces[:, 0] * length**2 / p.bend, one], axis=1
        )
        own = np.einsum("sij,sj->si", p.lead, start[d.piece])
        own = np.concatenate([own, np.ones((len(own), 1))], axis=1)
        series = np.einsum("skqc,sc->qsk", p.series, own)
        return _Curves(
            state, LoadRuns(self.frame, self.tables[name]), series[0] * d.length[:, None], series[3],
            series[2] * (p.bend[d.piece] / d.length)[:, None],
        )  # fmt: skip

    # --- single quantities

    def _piece(self, name: str, member: Ints, x: Floats, side: Ints) -> tuple[Ints, Floats]:
        """The stretch that holds each place (the one before a break for side -1), and xi on it; clipped to the faces."""
        d = self.states[name].division
        # Stretches are sorted by member and start: count those of the member that begin before the place.
        order = np.lexsort((np.concatenate([np.zeros(len(d.start)), np.where(side > 0, 1, -1)]),
                            np.concatenate([d.start, x]), np.concatenate([d.member, member])))  # fmt: skip
        begun = np.cumsum(order < len(d.start))
        piece = np.empty(len(x), dtype=np.int64)
        places = order >= len(d.start)
        piece[order[places] - len(d.start)] = begun[places] - 1
        low = np.searchsorted(d.member, member)
        high = np.searchsorted(d.member, member, side="right") - 1
        piece = np.clip(piece, low, high)
        return piece, np.clip((x - d.start[piece]) / d.length[piece], 0.0, 1.0)

    def _bent(self, name: str, member: Ints, x: Floats, side: Ints, still: Floats) -> tuple[Floats, Floats]:
        """Moment and displacement across."""
        c = self._curves[name]
        piece, xi = self._piece(name, member, x, side)
        moment, across = _polynomial(c.moment, piece, xi), _polynomial(c.across, piece, xi)
        for end, inside in self._in_zone(member, x, side):
            if inside.any():
                moment[inside], across[inside] = self._zone(name, end, member[inside], x[inside], still[inside])
        return moment, across

    def _in_zone(self, member: Ints, x: Floats, side: Ints) -> list[tuple[int, Bools]]:
        """Places before the `from` face and beyond the `to` face, the faces' outer sides included."""
        t = self.frame.member_table
        near, far = t.zone[member, 0], (t.length - t.zone[:, 1])[member]
        return [(0, (x < near) | ((x == near) & (side < 0))), (1, (x > far) | ((x == far) & (side > 0)))]

    def _zone(self, name: str, end: int, member: Ints, x: Floats, still: Floats) -> tuple[Floats, Floats]:
        """A rigid zone is straight and turns with its joint: the axial force adds slope times its integral."""
        t, state, case = self.frame.member_table, self.states[name], self.cases[name]
        joint = t.ends[member, end]
        turn = state.rotations[joint]
        moves = np.nan_to_num(case.joints[joint])
        base = moves[:, 1] * t.cos[member] - moves[:, 0] * t.sin[member]
        pull = self._pull_integral(name, end, member, x)
        if end == 0:
            return still - turn * pull, base - turn * x
        whole = self._whole(name)[member]
        return still + whole + turn * pull, base + turn * (t.length[member] - x)

    def _whole(self, name: str) -> Floats:
        """(m,) what the displaced axial force adds to the moment over the whole member."""
        t, case = self.frame.member_table, self.cases[name]
        every = np.arange(len(t.length))
        loads = self._curves[name].runs.sums(every, t.length, np.ones(len(every), dtype=np.int64))[2]
        return np.asarray(-case.ends[:, 1, 2] - (case.ends[:, 0, 2] + case.ends[:, 0, 1] * t.length + loads))

    def _pull_integral(self, name: str, end: int, member: Ints, x: Floats) -> Floats:
        """Integral of the axial force from the joint to each place, a round for each place of the same member."""
        t, c = self.frame.member_table, self._curves[name]
        pulls = self._pulls(name)
        out = np.zeros(len(x))
        waiting = np.arange(len(x))
        while len(waiting):
            _, first = np.unique(member[waiting], return_index=True)
            now = waiting[first]
            low = np.zeros(len(t.length)) if end == 0 else t.length.copy()
            high = low.copy()
            (high if end == 0 else low)[member[now]] = x[now]
            out[now] = integral_of_pull(c.runs, pulls, np.arange(len(t.length)), low, high)[member[now]]
            waiting = np.delete(waiting, first)
        return out

    def _pulls(self, name: str) -> Floats:
        return np.nan_to_num(self.cases[name].ends[:, 0, 0])

    def _gradient(self, name: str) -> Callable[[Ints, Floats, Ints], Floats]:
        c, slope = self._curves[name], self._slope(name)

        def gradient(member: Ints, x: Floats, side: Ints) -> Floats:
            axial, shear, _ = c.runs.sums(member, x, side)
            pull = self._pulls(name)[member] + axial
            return np.asarray(self.cases[name].ends[member, 0, 1] + shear + pull * slope(member, x, side))

        return gradient

    def _slope(self, name: str) -> Callable[[Ints, Floats, Ints], Floats]:
        c = self._curves[name]

        def slope(member: Ints, x: Floats, side: Ints) -> Floats:
            piece, xi = self._piece(name, member, x, side)
            values = _polynomial(c.slope, piece, xi)
            turn = c.state.rotations[self.frame.member_table.ends[member]]
            for end, inside in self._in_zone(member, x, side):
                values = np.where(inside, -turn[:, end], values)
            return values

        return slope

    def _load(self, name: str) -> Callable[[Ints, Floats, Ints], Floats]:
        """Load across: the gradient of shear, from two short steps (exact, for it is linear between stations)."""
        c = self._curves[name]

        def load(member: Ints, x: Floats, side: Ints) -> Floats:
            step = 1e-3 * self.frame.member_table.length[member] * np.where(side > 0, 1.0, -1.0)
            places = ((0.0, side), (0.5, -side), (1.0, -side))
            here, near, far = (c.runs.sums(member, x + k * step, way)[1] for k, way in places)
            return np.asarray((4 * (near - here) - (far - here)) / step)

        return load


def _polynomial(coefficients: Floats, piece: Ints, xi: Floats) -> Floats:
    """Horner's rule on the chosen piece of every place."""
    value = np.zeros(len(xi))
    for k in range(TERMS - 1, -1, -1):
        value = value * xi + coefficients[piece, k]
    return value


def _zeros(
    fn: Callable[[Ints, Floats, Ints], Floats], member: Ints, a: Floats, b: Floats
) -> tuple[Ints, Floats]:
    """Places where fn changes sign within stretches, by halving, or from one stretch to the next."""
    after, before = np.ones(len(a), dtype=np.int64), np.full(len(a), -1)
    low, high = fn(member, a, after), fn(member, b, before)
    change = np.signbit(low) != np.signbit(high)
    # Just before and just after a place that two stretches share, rounding may have either sign.
    between = (member[1:] == member[:-1]) & (np.signbit(high[:-1]) != np.signbit(low[1:]))
    shared = member[1:][between], a[1:][between]
    member, a, b, low = member[change], a[change], b[change], low[change]
    after = after[: len(a)]
    for _ in range(HALVINGS if len(a) else 0):
        middle = (a + b) / 2
        same = np.signbit(fn(member, middle, after)) == np.signbit(low)
        a, b = np.where(same, middle, a), np.where(same, b, middle)
    return np.concatenate([member, shared[0]]), np.concatenate([(a + b) / 2, shared[1]])
