"""The tests' own solution (tests/truth.py) of frames of the checking week: every name in its own state of stiffness, and
with the one-way members and supports that work in it.

Which one-way parts work is found at one go, with no trial of states: every one is taken out, the frame is asked what a
unit of each part's force would do, and the forces f >= 0 with gaps g = g0 + G f >= 0 and f g = 0 are those that make
f G f / 2 + g0 f least among f >= 0 (a linear complementarity problem and its quadratic programme: R. W. Cottle, J.-S.
Pang, R. E. Stone, "The Linear Complementarity Problem", 1992, section 1.2): scipy.optimize.nnls. So the frame must stand
with all of its one-way parts out.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass, replace
from typing import TypeVar

import numpy as np
from scipy.optimize import nnls

from crosscheck.answer import CaseAnswer, Undetermined
from crosscheck.frame.model import Frame
from tests.truth import Array, Loads, Truth, _nothing, _support_axes

SETTLED = 1e-9
"""Share of the largest force, or gap, within which a part may seem to work the wrong way."""
Key = TypeVar("Key")
Outs = tuple[frozenset[str], frozenset[tuple[str, str]]]
NONE_OUT: Outs = (frozenset(), frozenset())


class Unsettled(Exception):
    """The one-way parts' own problem has not been solved well enough to judge by."""


@dataclass(frozen=True)
class OneWay:
    """A one-way part: a member's index, or a support's joint and axis; `sense` of force times which it is positive."""

    member: int
    joint: str
    axis: int
    sense: float


class WeekTruth:
    """Truth for every case and combination of a frame, or for `names`; what tests.agreement.apart needs of an answer."""

    def __init__(self, frame: Frame, names: Iterable[str] | None = None) -> None:
        self.frame = frame
        self.names = tuple(frame.names if names is None else names)
        self.outs: dict[str, Outs] = {}
        for _, group in _grouped((n, frame.under(n).state) for n in self.names):
            self.outs |= settled(frame.under(group[0]), group) if frame.one_way else dict.fromkeys(group, NONE_OUT)
        self.by_name: dict[str, Truth] = {}
        states = ((n, (frame.under(n).state, *self.outs[n])) for n in self.names)
        for (_, members, supports), group in _grouped(states):
            worked = replace(frame, out_members=members, out_supports=supports).under(group[0])
            self.by_name |= dict.fromkeys(group, Truth(worked, group))
        self.cases: dict[str, CaseAnswer] = {n: self.by_name[n].cases[n] for n in self.names}

    @property
    def undetermined(self) -> Undetermined:
        return self.by_name[self.names[0]].undetermined

    @property
    def blur(self) -> float:
        """How near to singular the worst of the matrices is: the smaller the less there is to be judged by it."""
        return min(truth.gap[0] for truth in self.by_name.values())

    def along(self, name: str, member: Iterable[int], x: Iterable[float], side: Iterable[int]) -> Array:
        return self.by_name[name].along(name, member, x, side)


def _grouped(pairs: Iterable[tuple[str, Key]]) -> Iterator[tuple[Key, tuple[str, ...]]]:
    groups: dict[Key, list[str]] = {}
    for name, key in pairs:
        groups.setdefault(key, []).append(name)
    return ((key, tuple(names)) for key, names in groups.items())


def settled(frame: Frame, names: tuple[str, ...]) -> dict[str, Outs]:
    """By name, the members and support directions that are out. frame: in the state of stiffness of all these names."""
    parts = _parts(frame)
    every = _out(frame, parts, np.zeros(len(parts), dtype=bool))
    loose = Truth(replace(frame, out_members=every[0], out_supports=every[1]), names)
    still = _nothing(frame)
    # Under a unit of its own force a part's gap also closes by what it stretches itself.
    rates = np.column_stack([_gaps(loose, parts, loose._solve(_unit_force(loose, p)), still) for p in parts])
    rates += np.diag([loose.axial_flexibility(p.member) if p.member >= 0 else 0.0 for p in parts])
    return {n: _out(frame, parts, _working(rates, _gaps(loose, parts, loose.solution[n], loose._loads[n]))) for n in names}


def _parts(frame: Frame) -> list[OneWay]:
    parts = [OneWay(k, "", 0, 1.0 if m.only == "tension" else -1.0)
             for k, m in enumerate(frame.members.values()) if m.only]  # fmt: skip
    for s in frame.supports.values():
        parts += [OneWay(-1, s.joint, axis, 1.0 if only == "push" else -1.0)
                  for axis, only in enumerate((s.x_only, s.y_only)) if only]  # fmt: skip
    return parts


def _out(frame: Frame, parts: list[OneWay], works: Array) -> Outs:
    names = list(frame.members)
    idle = [p for p, at_work in zip(parts, works, strict=True) if not at_work]
    return (
        frozenset(names[p.member] for p in idle if p.member >= 0),
        frozenset((p.joint, "xy"[p.axis]) for p in idle if p.member < 0),
    )


def _unit_force(loose: Truth, part: OneWay) -> Loads:
    """Loads that are a unit of the part's force in its working sense."""
    loads = _nothing(loose.frame)
    if part.member >= 0:
        loads.pull[part.member] = part.sense
    else:
        at = loose.frame.joint_index[part.joint]
        loads.joint[at] = part.sense * _support_axes(loose.frame, part.joint)[part.axis]
    return loads


def _gaps(loose: Truth, parts: list[OneWay], x: Array, loads: Loads) -> Array:
    """(parts,) how far each part is from having to work: its slack, or the distance from its bearing."""
    return np.array([_gap(loose, part, x, loads) for part in parts])


def _gap(loose: Truth, part: OneWay, x: Array, loads: Loads) -> float:
    if part.member < 0:
        at = loose.place[part.joint]
        moved = _support_axes(loose.frame, part.joint)[part.axis] @ x[at : at + 3]
        return float(part.sense * (moved - loads.settlement[at // 3, part.axis]))
    m = loose.members[part.member]
    cos, sin, _ = loose.run(m)
    i, j = loose.place[m.joint_from], loose.place[m.joint_to]
    longer = np.array([cos, sin]) @ (x[j : j + 2] - x[i : i + 2])
    return float(-part.sense * (longer - loose.free_elongation(part.member, loads)))


def _working(rates: Array, gaps: Array) -> Array:
    """(parts,) True where a part works. rates: gaps under a unit of each part's force; gaps: with all of them out."""
    size = 1.0 / np.sqrt(np.diag(rates))
    rates, gaps = rates * size * size[:, None], gaps * size
    low = np.linalg.cholesky((rates + rates.T) / 2)
    force, _ = nnls(low.T, -np.linalg.solve(low, gaps))
    left = gaps + rates @ force
    wrong = max(float(-left.min()), float(np.abs(left[force > 0.0]).max(initial=0.0)))
    if wrong > SETTLED * max(float(np.abs(gaps).max()), 1e-300):
        raise Unsettled(f"a gap is wrong by {wrong:.1e} of {np.abs(gaps).max():.1e}")
    return np.asarray(force > 0.0)
