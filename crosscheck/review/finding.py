"""A finding, and the subject that checks look at."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, field
from functools import cached_property
from typing import Literal

import numpy as np

from crosscheck.answer import Answer, CaseAnswer
from crosscheck.frame.kinematics import Motion, Study
from crosscheck.frame.loads import LoadTable, load_table
from crosscheck.frame.model import Floats, Frame, Ints
from crosscheck.problems import Problem

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

    says: what was found and what to look at. check: name of the check, whose docstring says why it matters.
    kind: what a difference of the other model's printed input is of: geometry, stiffness, support or load; "" elsewhere.
    """

    grade: Grade
    where: tuple[str, ...]
    says: str
    check: str = ""
    kind: str = ""

    def __str__(self) -> str:
        return self.says


@dataclass(frozen=True, eq=False)
class Subject:
    """A frame under review. motions: its mechanisms; study and answer are None where it has any, or cannot be solved.

    refused: why it cannot be solved, where it is no mechanism. critical: exact critical load factor of each case, empty
    where not worked out. storeys: the storey formula's estimate of it, for frames with storeys.
    """

    frame: Frame
    motions: tuple[Motion, ...] = ()
    study: Study | None = None
    answer: Answer | None = None
    critical: Mapping[str, float] = field(default_factory=dict)
    storeys: Mapping[str, float] = field(default_factory=dict)
    limits: Limits = field(default_factory=Limits)
    refused: tuple[Problem, ...] = ()

    @cached_property
    def solved(self) -> Mapping[str, CaseAnswer]:
        """Answers by case and combination; empty where there are none."""
        return self.answer.cases if self.answer is not None else {}

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
        return float(np.ptp(self.frame.xy, axis=0).max(initial=0.0)) if self.frame.joints else 0.0

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
        return self._totals[case]

    @cached_property
    def _totals(self) -> dict[str, Floats]:
        return {name: load_total(self.frame, table) for name, table in self.tables.items()}


Check = Callable[[Subject], Iterator[Finding]]


@dataclass(frozen=True, slots=True)
class GlobalLoads:
    """Forces as resultants in global axes, flat (n,): member index (-1 on a joint), place, components."""

    member: Ints
    x: Floats
    y: Floats
    fx: Floats
    fy: Floats


def global_loads(frame: Frame, table: LoadTable) -> GlobalLoads:
    """Every force of a load table. A trapezoid counts as two triangles, each acting at its own third point."""
    t, xy = frame.member_table, frame.xy
    span = table.line_end - table.line_start
    member, at, along, across = [table.point_member], [table.point_at], [table.point_along], [table.point_across]
    for end, share in ((0, 1 / 3), (1, 2 / 3)):
        member.append(table.line_member)
        at.append(table.line_start + share * span)
        along.append(table.line_along[:, end] * span / 2)
        across.append(table.line_across[:, end] * span / 2)
    m, s, a, b = (np.concatenate(parts) for parts in (member, at, along, across))
    cos, sin, start = t.cos[m], t.sin[m], xy[t.ends[m, 0]].reshape(-1, 2)
    on_joints = np.full(len(xy), -1, dtype=np.int64)
    return GlobalLoads(
        member=np.concatenate([on_joints, m]),
        x=np.concatenate([xy[:, 0], start[:, 0] + s * cos]),
        y=np.concatenate([xy[:, 1], start[:, 1] + s * sin]),
        fx=np.concatenate([table.joint[:, 0], a * cos - b * sin]),
        fy=np.concatenate([table.joint[:, 1], a * sin + b * cos]),
    )


def load_total(frame: Frame, table: LoadTable) -> Floats:
    """(3,) fx, fy and clockwise moment about the origin of all forces and couples of a load table."""
    loads = global_loads(frame, table)
    couples = table.joint[:, 2].sum() + table.point_couple.sum()
    return np.array([loads.fx.sum(), loads.fy.sum(), (loads.fx * loads.y - loads.fy * loads.x).sum() + couples])


def listed(names: list[str] | tuple[str, ...], most: int = 5) -> str:
    """Names in a sentence."""
    names = list(names)
    return ", ".join(names) if len(names) <= most else f"{', '.join(names[:most])} and {len(names) - most} more"


def and_more(count: int, of: str = "case") -> str:
    """What follows the worst of several: " (and in 3 more cases)"."""
    return f" (and in {count:,} more {of}{'s' if count > 1 else ''})" if count > 0 else ""
