"""Sections and materials: stiffness of several members changed together, by one factor or for another section's."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from functools import partial

import numpy as np

from crosscheck.frame.model import Floats, Frame, Ints, SelfWeight
from crosscheck.suspects.changes import (
    Change,
    in_state,
    sections_of,
    with_material_factor,
    with_member,
    with_section_factors,
)
from crosscheck.suspects.members import COMMON, SPAN_OF_FACTORS
from crosscheck.suspects.screen import Screen
from crosscheck.suspects.suspect import Family, Option, named

SECTION, MATERIAL, FITTED, SWAPPED = 0.5, 0.6, 1.1, 0.6
MOST_TOGETHER = 60
"""Members changed together without solving again; for more a new solution is quicker."""
COARSE = 15
"""Factors looked at first."""
STARTS = (0.8, 0.4, 2.0, 0.12, 7.0)


@dataclass(frozen=True, slots=True)
class Group:
    """Members that share a section or a material, and what of it changes: "EI", "EA", "EI and EA" or "E"."""

    table: str
    name: str
    what: str
    members: Ints

    def factors(self, p: float) -> tuple[float, float]:
        """On EI and EA."""
        return (1.0 if self.what == "EA" else p), (1.0 if self.what == "EI" else p)


def groups(frame: Frame) -> Iterator[Group]:
    """Every section and material in use, with what of it may be wrong."""
    members = list(frame.members.values())
    elastic = frame.analysis.axial == "elastic"
    for name in frame.sections:
        of = np.array([k for k, m in enumerate(members) if name in sections_of(m)], dtype=np.int64)
        if len(of):
            for what in ("EI", "EA", "EI and EA") if elastic else ("EI",):
                yield Group("section", name, what, of)
    for name in frame.materials:
        of = np.array([k for k, m in enumerate(members) if m.material == name], dtype=np.int64)
        if len(of):
            yield Group("material", name, "E", of)


def _foretold(frame: Frame, group: Group) -> bool:
    """Whether the factorised matrix serves: few members, and no shear stiffness or weight that changes along."""
    if group.table == "section" and frame.member_table.varying[group.members].any():
        return False  # only some of its length changes
    if len(group.members) > MOST_TOGETHER or (group.table == "material" and frame.analysis.shear == "elastic"):
        return False
    heavy = any(isinstance(q, SelfWeight) for c in frame.cases.values() for q in c.loads)
    return group.what in ("EI", "E") or not heavy


def group_options(screen: Screen) -> Iterator[Option]:
    """Common factors and other sections for each group."""
    frame = screen.frame
    for group in groups(frame):
        if not _foretold(frame, group):
            continue
        cost = SECTION if group.what == "EI" else MATERIAL
        for factor in COMMON:
            yield _option(screen, group, factor, cost)
    yield from _swapped(screen)


def group_fits(screen: Screen) -> Iterator[Option]:
    """For each group the factor that fits best."""
    for group in groups(screen.frame):
        if _foretold(screen.frame, group):
            found = _fit(screen, group)
            if found is not None:
                yield found


def large_families(frame: Frame) -> Iterator[Family]:
    """The groups whose factor must be fitted by solving again."""
    for group in groups(frame):
        if not _foretold(frame, group):
            yield Family(partial(_at, frame, group), STARTS)


def _at(frame: Frame, group: Group, p: float) -> Option:
    return _plain(frame, group, p, FITTED, None, 1)


def _plain(frame: Frame, group: Group, p: float, cost: float, delta: Floats | None, fitted: int) -> Option:
    label = named(frame, group.table, group.name)
    if group.table == "material":
        change = Change(partial(with_material_factor, name=group.name, factor=p))
    else:
        bending, stretching = group.factors(p)
        change = Change(partial(with_section_factors, name=group.name, bending=bending, stretching=stretching))
    says = f"{group.table} {group.name} had {p:.4g} times its {group.what}"
    return Option("stiffness", (label,), says, change, cost, delta, fitted=fitted)


def _delta(screen: Screen, members: Ints, bending: Floats, stretching: Floats) -> Floats:
    """(n,) change of the values when members change together."""
    out = np.zeros(len(screen.residual))
    columns = (3 * members[:, None] + np.arange(3)).ravel()
    for name, part in zip(screen.seen.names, screen.parts, strict=True):
        actions = screen.base.joint_actions(name, members, bending, stretching)
        out[part] = screen.effects.member[np.ix_(part, columns)] @ actions.ravel()
    return out


def _group_delta(screen: Screen, group: Group, p: float) -> Floats:
    one = np.ones(len(group.members))
    bending, stretching = group.factors(p)
    return _delta(screen, group.members, bending * one, stretching * one)


def _option(screen: Screen, group: Group, p: float, cost: float, fitted: int = 0) -> Option:
    return _plain(screen.frame, group, p, cost, _group_delta(screen, group, p), fitted)


def _fit(screen: Screen, group: Group) -> Option | None:
    """The factor that fits best; None where it leaves half of the misfit over."""

    def delta(p: float) -> Floats:
        return _group_delta(screen, group, p)

    grid = np.geomspace(*SPAN_OF_FACTORS, COARSE)
    left = screen.left(np.column_stack([delta(float(g)) for g in grid]))
    p = screen.fitted(delta, float(grid[int(np.argmin(np.where(np.isfinite(left), left, np.inf)))]))
    if screen.left(delta(p)[:, None])[0] > 0.5 * screen.total:
        return None
    return replace(_option(screen, group, p, FITTED, 1), again=(partial(_at, screen.frame, group), p))


def _swapped(screen: Screen) -> Iterator[Option]:
    """Members of one section given another, or of one material another."""
    frame = screen.frame
    for group in groups(frame):
        if group.what not in ("EI", "E"):
            continue
        table = frame.sections if group.table == "section" else frame.materials
        for other in table:
            if other != group.name:
                change = Change(partial(_given, table=group.table, name=group.name, other=other))
                says = f"members of {group.table} {group.name} were given {other}"
                where = (named(frame, group.table, group.name),)
                yield Option("stiffness", where, says, change, SWAPPED, _swap_delta(screen, group, other))


def _swap_delta(screen: Screen, group: Group, other: str) -> Floats | None:
    """Foretold where stiffness alone changes; depth, weight and shear need another solution."""
    frame = screen.frame
    plain = frame.analysis.shear == "rigid" and len(group.members) <= MOST_TOGETHER
    plain = plain and not frame.member_table.varying[group.members].any()
    acts = any(not hasattr(q, "force") and not hasattr(q, "first") for c in frame.cases.values() for q in c.loads)
    if not plain or acts:
        return None
    one = np.ones(len(group.members))
    if group.table == "material":
        ratio = frame.materials[other].E / frame.materials[group.name].E
        return _delta(screen, group.members, ratio * one, ratio * one)
    (new, area), (old, before) = in_state(frame, other), in_state(frame, group.name)
    stretching = area / before if area and before else 1.0
    return _delta(screen, group.members, new / old * one, stretching * one)


def _given(frame: Frame, table: str, name: str, other: str) -> Frame:
    for member in list(frame.members.values()):
        if member.pieces and table == "section":
            pieces = tuple(
                replace(p, first=_for(p.first, name, other), last=_for(p.last, name, other)) for p in member.pieces
            )
            frame = with_member(frame, member.name, section=_for(member.section, name, other), pieces=pieces)
        elif getattr(member, table) == name:
            frame = with_member(frame, member.name, **{table: other})
    return frame


def _for(section: str, name: str, other: str) -> str:
    return other if section == name else section
