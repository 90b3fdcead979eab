"""How far apart the stiffnesses of a frame lie: a cheap bound on what solving it costs in digits.

Measured against exact rational solutions (tests/test_exact_limits.py; README, Limits of precision).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from crosscheck.frame.model import FREE, Floats, Frame

ELASTIC_LIMIT, RIGID_LIMIT = 10.0, 8.0
"""Powers of ten between stiffest and softest beyond which a check says so: axially elastic, and axially rigid."""


@dataclass(frozen=True, slots=True)
class Spread:
    """stiff, soft: names of the members (or supports) with the extremes; digits: powers of ten between them."""

    stiff: str
    soft: str
    digits: float


def member_spread(frame: Frame) -> Spread | None:
    """The extremes among members: 12 EI/l^3 where a member can bend by its ends, EA/l where axially elastic."""
    values = _members(frame)
    return _extremes([*frame.members, *frame.members], values)


def warnings(frame: Frame) -> tuple[str, ...]:
    """What a check must say of a frame at the limits of its precision.

    Soft support springs count as well; stiff ones cost nothing, as measured, and the likes of 1e12 are written for held.
    """
    s = frame.support_table.stiffness[:, :2].ravel()
    members = _members(frame)
    stiffest = float(np.nan_to_num(members).max(initial=0.0))
    springs = np.where((s == FREE) | (s >= stiffest), np.nan, s)
    names = [*frame.members, *frame.members, *(joint for joint in frame.joints for _ in range(2))]
    found = _extremes(names, np.concatenate([members, springs]))
    limit = ELASTIC_LIMIT if frame.analysis.axial == "elastic" else RIGID_LIMIT
    if found is None or found.digits <= limit:
        return ()
    return (
        f"stiffnesses from {found.soft} to {found.stiff} differ by 10^{found.digits:.0f}, beyond the 10^{limit:.0f} up to "
        "which digits are vouched for: see README, Limits of precision",
    )


def _members(frame: Frame) -> Floats:
    """(2 m,) bending and then stretching stiffness, force per length; NaN where a member has none."""
    t = frame.member_table
    bars = (t.turn == FREE).all(axis=1)
    bend = np.where(bars, np.nan, 12 * t.E * t.I / t.clear**3)
    stretch = t.E * t.A / t.clear if frame.analysis.axial == "elastic" else np.full(len(bend), np.nan)
    return np.concatenate([bend, stretch])


def _extremes(names: list[str], values: Floats) -> Spread | None:
    if not np.isfinite(values).any():
        return None
    high, low = int(np.nanargmax(values)), int(np.nanargmin(values))
    return Spread(names[high], names[low], float(np.log10(values[high]) - np.log10(values[low])))
