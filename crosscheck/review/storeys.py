"""Storeys: where columns stand on one another between levels; and what the storey formula makes of them.

The storey formula is this package's own rough second opinion on the critical load factor; the exact one is worked out
elsewhere, by stability functions.
"""

from __future__ import annotations

import importlib
from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np

from crosscheck.answer import Answer, CaseAnswer
from crosscheck.frame.kinematics import Study
from crosscheck.frame.model import Analysis, Floats, Frame, JointForce, LoadCase

PLUMB = 0.995
"""Sine of a member's slope from which it counts as a column of a storey (within 6 degrees of plumb)."""
LEAN = 1.0 / 200.0
"""Horizontal share of the vertical load that sways the frame for the storey formula; it cancels out of the result."""
OPINION = "crosscheck.opinions.slope_deflection"


@dataclass(frozen=True, slots=True)
class Storey:
    """bottom, top: levels. columns: member indices from the left. crossing: members that pass mid-height, columns too.

    joints: indices of the columns' upper joints; feet: of the lower ones, column by column.
    """

    bottom: float
    top: float
    columns: tuple[int, ...]
    crossing: tuple[int, ...]
    joints: tuple[int, ...]
    feet: tuple[int, ...]

    @property
    def height(self) -> float:
        return self.top - self.bottom


def storeys_of(frame: Frame) -> tuple[Storey, ...]:
    """Storeys from the ground up; empty where the frame has none: no plumb columns, columns that pass a level, or lowest
    columns without support (the posts of a truss)."""
    t, y = frame.member_table, frame.xy[:, 1]
    columns = np.flatnonzero(np.abs(t.sin) >= PLUMB)
    if not len(columns):
        return ()
    low, high = y[t.ends].min(axis=1), y[t.ends].max(axis=1)
    grain = 1e-6 * float(np.ptp(y))
    levels = _distinct(np.concatenate([low[columns], high[columns]]), grain)
    out = []
    for bottom, top in zip(levels, levels[1:], strict=False):
        middle = (bottom + top) / 2
        crossing = np.flatnonzero((low < middle) & (high > middle))
        own = [k for k in columns if low[k] < middle < high[k]]
        if not own or any(abs(low[k] - bottom) > grain or abs(high[k] - top) > grain for k in own):
            return ()  # a column that passes a level
        own.sort(key=lambda k: float(frame.xy[t.ends[k, 0], 0]))
        upper = [int(t.ends[k, int(np.argmax(y[t.ends[k]]))]) for k in own]
        lower = [int(t.ends[k, int(np.argmin(y[t.ends[k]]))]) for k in own]
        columns_left_to_right, passing = tuple(map(int, own)), tuple(map(int, crossing))
        out.append(Storey(float(bottom), float(top), columns_left_to_right, passing, tuple(upper), tuple(lower)))
    names = list(frame.joints)
    return tuple(out) if all(names[j] in frame.supports for j in out[0].feet) else ()


def _distinct(values: Floats, grain: float) -> list[float]:
    found: list[float] = []
    for value in np.sort(values):
        if not found or value - found[-1] > grain:
            found.append(float(value))
    return found


def carried(frame: Frame, storey: Storey, case: CaseAnswer) -> float:
    """Vertical load that a storey carries at its bottom: the upward forces on the lower ends of what passes through it."""
    t, y = frame.member_table, frame.xy[:, 1]
    total = 0.0
    for k in storey.crossing:
        end = int(np.argmin(y[t.ends[k]]))
        axial, shear = case.ends[k, end, 0], case.ends[k, end, 1]
        total += (axial if end else -axial) * t.sin[k] + shear * t.cos[k]
    return float(total)


def storey_factors(frame: Frame, study: Study, solved: Mapping[str, CaseAnswer]) -> dict[str, float]:
    """Critical load factor of each case by the storey formula, the least over the storeys; cases that compress none are
    left out.

    alpha_cr = (H / V)(h / delta): H and V horizontal and vertical load at the storey's bottom, h its height, delta the
    sway over it under H. H is a fixed share of V at every level, which leaves delta proportional. Up to 12/pi2 - 1 =
    21.6% on the unsafe side, because columns bend between their ends as well.
    Source: EN 1993-1-1:2005, 5.2.1(4)B, expression (5.2).
    """
    storeys = storeys_of(frame)
    if any(set(s.crossing) != set(s.columns) for s in storeys):
        return {}  # bracing holds the storeys: what buckles first is then no sway, of which the formula speaks
    weights = {name: [carried(frame, s, case) for s in storeys] for name, case in solved.items()}
    weights = {name: v for name, v in weights.items() if storeys and max(v) > 0 and np.isfinite(v).all()}
    if not weights:
        return {}
    leaning = replace(
        frame, cases={name: _leaning(frame, storeys, name, v) for name, v in weights.items()}, combinations={},
        analysis=replace(frame.analysis, order=1),
    )  # fmt: skip
    answer = importlib.import_module(OPINION).opine(leaning, study)
    if not isinstance(answer, Answer):
        return {}
    out = {}
    for name, vertical in weights.items():
        sway = [_drift(answer.cases[name], s) for s in storeys]
        # Rounding alone sways what is braced by rigid members: such a storey has no critical load by this formula.
        floor = 1e-9 * max(s.height for s in storeys)
        found = [LEAN * s.height / d for s, v, d in zip(storeys, vertical, sway, strict=True) if v > 0 and d > floor * LEAN]
        if found:
            out[name] = min(found)
    return out


def _leaning(frame: Frame, storeys: tuple[Storey, ...], name: str, weights: list[float]) -> LoadCase:
    """The case with LEAN times the load that each level adds, to the right, shared by the level's column tops."""
    names = list(frame.joints)
    loads = []
    for storey, own, above in zip(storeys, weights, [*weights[1:], 0.0], strict=True):
        share = LEAN * (own - above) / len(storey.joints)
        loads += [JointForce(0, names[j], share, 0.0) for j in storey.joints]
    return LoadCase(name, tuple(loads))


def _drift(case: CaseAnswer, storey: Storey) -> float:
    """Mean sway of a storey's column tops over their feet."""
    moves = case.joints[:, 0]
    return float(np.mean(moves[list(storey.joints)] - moves[list(storey.feet)]))


def first_order(frame: Frame) -> Frame:
    """The frame analysed to first order."""
    return frame if frame.analysis.order == 1 else replace(frame, analysis=_first(frame.analysis))


def _first(analysis: Analysis) -> Analysis:
    return replace(analysis, order=1)
