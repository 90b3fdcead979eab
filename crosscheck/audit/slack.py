"""Whether one-way parts that do not work are on their slack side, by displacements that fit the claim (one_way.py)."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from scipy import linalg, optimize

from crosscheck.audit.fit import Fit
from crosscheck.audit.flexibility import IMPOSED, STRETCH, Flexibility
from crosscheck.audit.one_way import SENSES, one_way_directions
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import Floats, Frame

MOST_FREE = 600
"""Up to so many displacements, free movements are found densely."""
MOST_MOVED = 1e6
"""Of a free movement, in the largest gaps: far beyond need."""
OPEN = 1e-6
"""Share of a movement that the fit may leave unsaid by rounding alone."""


@dataclass(frozen=True, slots=True)
class Gap:
    """How far a part that does not work is from working: past its length at rest, or past its support, in the sense that
    would make it work (so that it may not be positive), with the most that rounding can add to it.

    determined: whether the claim settles it; otherwise it is what some displacements that fit make it.
    """

    where: str
    axis: str
    reach: float
    allowed: float
    determined: bool
    row: Floats
    """(3 j,) reach by displacements, but for a constant."""


def gaps(system: Fit, case: str, displacements: Floats) -> list[Gap]:
    """Of every part that is out in the fit's frame, by (3 j,) displacements in the supports' own axes."""
    frame, g = system.frame, system.geometry
    m = len(frame.members)
    soft, settlement = system.flexibility, load_table(frame, case).settlement
    found = []
    for name in frame.members:
        if name in frame.out_members:
            k = frame.member_index[name]
            row = g.matrix[[3 * k + 2]].toarray()[0]
            own = float(soft.matrix[STRETCH, k, 2, 2] * system.rounding[3 * k + 2])
            row = SENSES[frame.members[name].only] * row
            reach = row @ displacements - SENSES[frame.members[name].only] * soft.load[IMPOSED, k, 2]
            found.append(Gap(name, "", float(reach), *_interval(system, row, own), row))
    for support, axis, word in one_way_directions(frame):
        if (support.joint, axis) in frame.out_supports:
            j, a = frame.joint_index[support.joint], "xy".index(axis)
            row = -SENSES[word] * g.matrix[[3 * m + 3 * j + a]].toarray()[0]
            reach = row @ displacements + SENSES[word] * settlement[j, a]
            found.append(Gap(support.joint, axis, float(reach), *_interval(system, row, 0.0), row))
    return found


def best_gaps(system: Fit, found: list[Gap]) -> list[Gap]:
    """The same with those free movements added that let the worst of them reach least, where the claim leaves any open.

    The forces then are the frame's own although the displacements are not settled: one set of them is enough.
    """
    free = np.flatnonzero(~system.geometry.held)
    if len(free) > MOST_FREE:
        return found
    loose = linalg.null_space((system.keep @ system.geometry.matrix[:, free]).toarray(), rcond=1e-9)
    if not loose.shape[1]:
        return found
    change = np.array([gap.row[free] for gap in found]) @ loose
    reach, allowed = (np.array([getattr(gap, key) for gap in found]) for key in ("reach", "allowed"))
    # Least z with reach + change @ y - z <= allowed, all measured by the largest of them; z no less than -1.
    size = float(max(np.abs(reach).max(), allowed.max())) or 1.0
    table = np.column_stack([change, -np.ones(len(found))])
    cost = np.append(np.zeros(loose.shape[1]), 1.0)
    limits = [(-MOST_MOVED, MOST_MOVED)] * loose.shape[1] + [(-1.0, None)]
    best = optimize.linprog(
        cost, A_ub=table, b_ub=(allowed - reach) / size, bounds=limits, options={"primal_feasibility_tolerance": 1e-10}
    )
    if best.x is None:
        return found
    # Where even that leaves one past its rest, no set of displacements does without.
    reached = reach + size * change @ best.x[:-1]
    return [replace(gap, reach=float(r), determined=True) for gap, r in zip(found, reached, strict=True)]


def _interval(system: Fit, row: Floats, own: float) -> tuple[float, bool]:
    """How far rounding can move row @ displacements, plus `own`, and whether the fit settles that movement."""
    weights = system.carry(row[system.columns])
    allowed = float(np.abs(system.source.T @ weights) @ system.half) + own
    free = np.flatnonzero(~system.geometry.held)
    left = row[free] - (system.keep @ system.geometry.matrix[:, free]).T @ weights
    return allowed, bool(np.abs(left).max(initial=0.0) <= OPEN * np.abs(row).max())


def slack_axial(soft: Flexibility, frame: Frame) -> Floats:
    """(m,) axial force at `from` of members that are out, by the loads along them; nil for the others."""
    return np.asarray(np.where(frame.member_table.slack, soft.held_axial, 0.0))
