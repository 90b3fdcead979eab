"""Whether one-way parts that do not work are on their slack side, by displacements that fit the claim (one_way.py)."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from crosscheck.audit.fit import Fit
from crosscheck.audit.flexibility import IMPOSED, STRETCH, Flexibility
from crosscheck.audit.one_way import SENSES, one_way_directions
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import Floats, Frame

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
            reach = SENSES[frame.members[name].only] * (row @ displacements - soft.load[IMPOSED, k, 2])
            found.append(Gap(name, "", float(reach), *_interval(system, row, own)))
    for support, axis, word in one_way_directions(frame):
        if (support.joint, axis) in frame.out_supports:
            j, a = frame.joint_index[support.joint], "xy".index(axis)
            row = g.matrix[[3 * m + 3 * j + a]].toarray()[0]
            reach = -SENSES[word] * (row @ displacements - settlement[j, a])
            found.append(Gap(support.joint, axis, float(reach), *_interval(system, row, 0.0)))
    return found


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
