"""A finding, and the subject that checks look at."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, field
from functools import cached_property
from typing import Literal

import numpy as np

from crosscheck.answer import Answer
from crosscheck.frame.kinematics import Motion, Study
from crosscheck.frame.loads import LoadTable, load_table
from crosscheck.frame.model import Floats, Frame

Grade = Literal["serious", "check", "note"]
RANK: dict[Grade, int] = {"serious": 0, "check": 1, "note": 2}


@dataclass(frozen=True, slots=True)
class Limits:
    """Usual ratios, common practice and no code's rule; settable on the command line.

    sway: height over horizontal movement; deflection: span over deflection; critical: critical load factor below which
    first order is usually no longer taken (10, common for elastic analysis).
    """

    sway: float = 300.0
    deflection: float = 250.0
    critical: float = 10.0


@dataclass(frozen=True, slots=True)
class Finding:
    """grade: serious, check or note. where: joints, members, sections, materials, load entries or case names.

    says: what was found, why it matters and what to look at. check: the name of the check, for tests and explanations.
    """

    grade: Grade
    where: tuple[str, ...]
    says: str
    check: str = ""


@dataclass(frozen=True, eq=False)
class Subject:
    """A frame under review. motions: its mechanisms; study and answer are None where it has any, or cannot be solved.

    critical: critical load factor of each case, empty where not worked out.
    """

    frame: Frame
    motions: tuple[Motion, ...] = ()
    study: Study | None = None
    answer: Answer | None = None
    critical: Mapping[str, float] = field(default_factory=dict)
    limits: Limits = field(default_factory=Limits)

    @cached_property
    def tables(self) -> dict[str, LoadTable]:
        """Load tables of the load cases."""
        return {name: load_table(self.frame, name) for name in self.frame.cases}

    @cached_property
    def members_at(self) -> dict[str, list[str]]:
        """Members by joint."""
        at: dict[str, list[str]] = {joint: [] for joint in self.frame.joints}
        for m in self.frame.members.values():
            at[m.joint_from].append(m.name)
            at[m.joint_to].append(m.name)
        return at

    @cached_property
    def extent(self) -> float:
        """Largest dimension of the frame."""
        return float(np.ptp(self.frame.xy, axis=0).max(initial=0.0))

    @cached_property
    def metre(self) -> float:
        """One metre in the frame's length unit."""
        return 1.0 / self.frame.units.metre

    @cached_property
    def newton(self) -> float:
        """One newton in the frame's force unit."""
        return 1.0 / self.frame.units.newton

    @cached_property
    def columns(self) -> list[str]:
        """Members within 37 degrees of plumb."""
        t = self.frame.member_table
        return [name for k, name in enumerate(self.frame.members) if abs(t.sin[k]) >= 0.8]

    def total(self, case: str) -> Floats:
        """fx, fy and clockwise moment about the origin of a load case's forces and couples."""
        return load_total(self.frame, self.tables[case])


Check = Callable[[Subject], Iterator[Finding]]


def load_total(frame: Frame, table: LoadTable) -> Floats:
    """(3,) fx, fy and clockwise moment about the origin of all forces and couples of a load table."""
    t, xy = frame.member_table, frame.xy
    fx, fy = table.joint[:, 0], table.joint[:, 1]
    total = np.array([fx.sum(), fy.sum(), (fx * xy[:, 1] - fy * xy[:, 0]).sum() + table.joint[:, 2].sum()])
    rows = [(table.point_member, table.point_at, table.point_along, table.point_across)]
    span = table.line_end - table.line_start
    for along, across in ((table.line_along, table.line_across),):
        # A trapezoid as two triangles, each acting at its own third point.
        for end, share in ((0, 1 / 3), (1, 2 / 3)):
            at = table.line_start + share * span
            rows.append((table.line_member, at, along[:, end] * span / 2, across[:, end] * span / 2))
    for member, at, along, across in rows:
        c, s = t.cos[member], t.sin[member]
        start = xy[t.ends[member, 0]]
        x, y = start[:, 0] + at * c, start[:, 1] + at * s
        gx, gy = along * c - across * s, along * s + across * c
        total += [gx.sum(), gy.sum(), (gx * y - gy * x).sum()]
    total[2] += table.point_couple.sum()
    return total


def listed(names: list[str] | tuple[str, ...], most: int = 5) -> str:
    """Names in a sentence."""
    names = list(names)
    return ", ".join(names) if len(names) <= most else f"{', '.join(names[:most])} and {len(names) - most} more"
