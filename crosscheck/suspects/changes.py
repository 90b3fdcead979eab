"""Changes that turn the frame, or the claim, into what the other analysis may have had: small functions on data."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from typing import Any

from crosscheck.compare.claimed import ClaimedValue, ClosedClaim
from crosscheck.frame.model import (
    FREE,
    HELD,
    Frame,
    Load,
    Member,
    PointCouple,
    PointForce,
    Spread,
    Support,
)


@dataclass(frozen=True, slots=True)
class Change:
    """What to do to the frame or to the claim; None leaves it alone.

    loads_only: the structure stays, so its factorised matrix serves.
    """

    frame: Callable[[Frame], Frame] | None = None
    claim: Callable[[ClosedClaim], ClosedClaim] | None = None
    loads_only: bool = False

    def apply(self, frame: Frame, closed: ClosedClaim) -> tuple[Frame, ClosedClaim]:
        """The frame and the claim so changed: what `verify --suspect N` compares."""
        return (
            frame if self.frame is None else self.frame(frame),
            closed if self.claim is None else self.claim(closed),
        )

    def then(self, other: Change) -> Change:
        """Both changes, this one first."""
        return Change(
            _chained(self.frame, other.frame), _chained(self.claim, other.claim), self.loads_only and other.loads_only
        )


def _chained(first: Callable[[Any], Any] | None, second: Callable[[Any], Any] | None) -> Callable[[Any], Any] | None:
    if first is None or second is None:
        return first or second
    return lambda thing: second(first(thing))


KEPT = ("member_table", "variation", "support_table", "joint_index", "member_index", "xy", "names")


def with_loads(frame: Frame, case: str, loads: tuple[Load, ...]) -> Frame:
    """The frame with other loads in one case."""
    changed = replace(frame, cases={**frame.cases, case: replace(frame.cases[case], loads=loads)})
    for name in KEPT:
        if name in frame.__dict__:
            changed.__dict__[name] = frame.__dict__[name]
    return changed


def with_load(frame: Frame, case: str, index: Mapping[int, tuple[Load, ...]]) -> Frame:
    """The frame with the loads at some places of a case's list replaced by others (or none)."""
    loads: list[Load] = []
    for k, load in enumerate(frame.cases[case].loads):
        loads += index.get(k, (load,))
    return with_loads(frame, case, tuple(loads))


def with_factors(frame: Frame, name: str, factors: Mapping[str, float]) -> Frame:
    """The frame with a combination's factors replaced; a load case becomes the sum of its loads so factored."""
    if name in frame.combinations:
        combination = replace(frame.combinations[name], factors=dict(factors))
        return replace(frame, combinations={**frame.combinations, name: combination})
    loads = tuple(scaled(load, f) for case, f in factors.items() for load in frame.cases[case].loads)
    return with_loads(frame, name, loads)


AMOUNTS = ("force", "couple", "x", "y", "rotation", "first", "last", "mean", "difference", "too_long", "factor")


def altered(load: Load, **fields: Any) -> Load:
    """The load with some fields replaced, whatever kind it is."""
    anything: Any = load
    changed: Load = replace(anything, **fields)
    return changed


def scaled(load: Load, factor: float) -> Load:
    """The load times a factor."""
    return altered(load, **{a: factor * getattr(load, a) for a in AMOUNTS if hasattr(load, a)})


def with_support(frame: Frame, joint: str, support: Support | None) -> Frame:
    """The frame with another support at a joint, or none."""
    supports = {name: s for name, s in frame.supports.items() if name != joint}
    if support is not None:
        supports = {name: (support if name == joint else s) for name, s in frame.supports.items()}
        supports.setdefault(joint, support)
    return replace(frame, supports=supports)


def with_member(frame: Frame, name: str, **fields: Any) -> Frame:
    """The frame with some fields of a member replaced; given a section, it is no longer stepped or tapered."""
    if "section" in fields:
        fields = {"pieces": (), **fields}
    return replace(frame, members={**frame.members, name: replace(frame.members[name], **fields)})


def with_member_factors(frame: Frame, name: str, bending: float, stretching: float) -> Frame:
    """The frame with one member's EI and EA times factors, by sections of its own, which keep what the frame's states of
    stiffness do to those that they stand for."""
    member = frame.members[name]
    own = {s: f"{s} of {name}" for s in sections_of(member)}
    sections = {new: _factored(frame, s, bending, stretching, new) for s, new in own.items()}
    pieces = tuple(replace(p, first=own[p.first], last=own[p.last]) for p in member.pieces)
    states = {n: replace(s, sections=_as_before(s.sections, own)) for n, s in frame.states.items()}
    changed = with_member(frame, name, section=own[member.section], pieces=pieces)
    return replace(changed, sections={**frame.sections, **sections}, states=states)


def _as_before(factors: Mapping[str, Mapping[str, float]], own: Mapping[str, str]) -> dict[str, Mapping[str, float]]:
    return {**factors, **{new: factors[old] for old, new in own.items() if old in factors}}


def sections_of(member: Member) -> tuple[str, ...]:
    """Every section that a member has somewhere, the one it is named by first."""
    return tuple(dict.fromkeys((member.section, *(s for p in member.pieces for s in (p.first, p.last)))))


def in_state(frame: Frame, section: str) -> tuple[float, float | None]:
    """I and A of a section in the state of stiffness that the frame's tables are of."""
    s = frame.sections[section]
    factors = frame.states[frame.state].sections.get(section, {}) if frame.state else {}
    return s.I * factors.get("I", 1.0), None if s.A is None else s.A * factors.get("A", 1.0)


def with_section_factors(frame: Frame, name: str, bending: float, stretching: float) -> Frame:
    """The frame with a section's I and A times factors."""
    return replace(frame, sections={**frame.sections, name: _factored(frame, name, bending, stretching, name)})


def _factored(frame: Frame, name: str, bending: float, stretching: float, as_name: str) -> Any:
    s = frame.sections[name]
    return replace(s, name=as_name, I=bending * s.I, A=None if s.A is None else stretching * s.A)


def with_material_factor(frame: Frame, name: str, factor: float) -> Frame:
    """The frame with a material's E and G times a factor."""
    m = frame.materials[name]
    changed = replace(m, E=factor * m.E, G=None if m.G is None else factor * m.G)
    return replace(frame, materials={**frame.materials, name: changed})


def without_member(frame: Frame, name: str) -> Frame:
    """The frame without a member and its loads."""
    members = {n: m for n, m in frame.members.items() if n != name}
    cases = {
        n: replace(c, loads=tuple(q for q in c.loads if getattr(q, "member", None) != name)) for n, c in frame.cases.items()
    }
    return replace(frame, members=members, cases=cases)


def with_joint(frame: Frame, name: str, x: float, y: float) -> Frame:
    """The frame with a joint elsewhere; loads keep their share of the members that change length."""
    joints = {**frame.joints, name: replace(frame.joints[name], x=x, y=y)}
    return stretched_loads(frame, replace(frame, joints=joints))


def with_ends(frame: Frame, name: str, joint_from: str, joint_to: str) -> Frame:
    """The frame with a member joined elsewhere."""
    return stretched_loads(frame, with_member(frame, name, joint_from=joint_from, joint_to=joint_to))


def stretched_loads(old: Frame, new: Frame) -> Frame:
    """Loads on members whose length differs between two frames, moved to the same share of the length."""
    ratio = {
        n: _length(new, n) / _length(old, n)
        for n in new.members
        if not math.isclose(_length(new, n), _length(old, n), rel_tol=1e-12)
    }
    if not ratio:
        return new
    cases = {
        n: replace(c, loads=tuple(_moved(q, ratio.get(getattr(q, "member", ""), 1.0)) for q in c.loads))
        for n, c in new.cases.items()
    }
    return replace(new, cases=cases)


def _moved(load: Load, ratio: float) -> Load:
    if isinstance(load, Spread):
        return replace(load, start=load.start * ratio, end=load.end * ratio)
    if isinstance(load, (PointForce, PointCouple)):
        return replace(load, at=load.at * ratio)
    return load


def _length(frame: Frame, member: str) -> float:
    m = frame.members[member]
    i, j = frame.joints[m.joint_from], frame.joints[m.joint_to]
    return math.hypot(j.x - i.x, j.y - i.y)


def with_analysis(frame: Frame, **fields: Any) -> Frame:
    """The frame idealised otherwise; fields: axial, shear."""
    return replace(frame, analysis=replace(frame.analysis, **fields))


def usable(frame: Frame) -> bool:
    """Whether every number the idealisation needs is there and every member has a length left to bend."""
    t = frame.member_table
    if not ((t.clear > 0).all() and (t.length > 0).all()):
        return False
    if not ((t.A > 0) | t.rigid).all():
        return False
    return frame.analysis.shear == "rigid" or bool(((t.shear_area > 0) & (t.G > 0)).all())


def with_values(closed: ClosedClaim, new: Mapping[ClaimedValue, float]) -> ClosedClaim:
    """The claim with some of its values replaced."""
    values = tuple(replace(v, value=new[v]) if v in new else v for v in closed.values)
    return replace(closed, values=values)


def of_case(closed: ClosedClaim, case: str, other: str) -> ClosedClaim:
    """The claim's values of one case taken for those of another."""
    values = tuple(replace(v, case=other) if v.case == case else v for v in closed.values)
    return replace(closed, values=values, cases=tuple(other if c == case else c for c in closed.cases))


def kind_of(s: Support) -> str:
    """A support in words."""
    holds = s.x == HELD, s.y == HELD, s.rotation == HELD
    loose = all(k in (FREE, HELD) for k in (s.x, s.y, s.rotation))
    return _KINDS.get(holds, "sprung") if loose else "sprung"


_KINDS = {
    (True, True, True): "fixed", (True, True, False): "pinned", (False, True, False): "a roller (holding y)",
    (True, False, False): "a roller (holding x)", (False, True, True): "guided (free to move along x)",
    (True, False, True): "guided (free to move along y)", (False, False, True): "held against turning only",
    (False, False, False): "free",
}  # fmt: skip
