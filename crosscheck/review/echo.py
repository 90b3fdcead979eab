"""The other model's own printed input beside the frame: a difference is a fact, stated before any results exist."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import replace
from pathlib import Path

from crosscheck.claims.names import plain
from crosscheck.claims.reading import EchoFact, FrameNames
from crosscheck.frame.model import FREE, HELD, Frame, Section
from crosscheck.review.finding import Finding, Subject, listed
from crosscheck.review.printed_input import read_echo

SAME = 2e-3
"""Share by which two numbers may differ and be the same input, beyond their rounding: tables of sections differ."""
POWERS = {
    "joint x": (0, 1), "joint y": (0, 1), "I": (0, 4), "A": (0, 2), "E": (1, -2), "total x": (1, 0), "total y": (1, 0),
}  # fmt: skip
"""Powers of force and length."""
KINDS = {
    "joint x": "geometry", "joint y": "geometry", "member ends": "geometry", "support": "support", "I": "stiffness",
    "A": "stiffness", "E": "stiffness", "total x": "load", "total y": "load",
}  # fmt: skip
"""The kind of suspect that a difference in each would be."""
FORCES = {"N": 1.0, "kN": 1e3, "MN": 1e6, "kgf": 9.80665, "lbf": 4.4482216152605, "kip": 4448.2216152605}
"""Newtons: units tried for load totals that state none."""
LENGTHS = {"m": 1.0, "cm": 0.01, "mm": 0.001, "ft": 0.3048, "in": 0.0254}
"""Metres: units tried for coordinates and properties that state none."""


def echoed(subject: Subject, path: str | Path) -> list[Finding]:
    """The file's facts beside the frame. Raises UnusableInput where it cannot be opened or holds none."""
    facts, unread = read_echo(path, FrameNames.of(subject.frame))
    findings = list(compared(subject, facts))
    if unread:
        rows = f"{len(unread)} rows of numbers" if len(unread) > 1 else "a row of numbers"
        why = f"not recognised as input (first in line {unread[0]})"
        says = f"{rows} of the other model's printed input not compared: {why}"
        findings.append(Finding("note", (), says, "echo"))
    return findings


def compared(subject: Subject, facts: Sequence[EchoFact]) -> Iterator[Finding]:
    """What differs, one finding a thing, and one note that counts what agrees.

    Serious: one of the two models is not what somebody thinks, and results cannot be compared before it is known which.
    """
    other_sign = _reversed(subject, facts)
    if other_sign:
        facts = [replace(f, value=-f.value) if f.what == "total y" and not isinstance(f.value, str) else f for f in facts]
    agreed = 0
    strange: dict[str, list[str]] = {}
    sizes = {what: _size_unstated(subject, facts, what) for what in POWERS}
    for fact in facts:
        ours = _ours(subject, fact)
        if ours is None:
            strange.setdefault(fact.what.split(" ")[0], []).append(fact.where)
            continue
        says = _difference(subject.frame, fact, ours, sizes.get(fact.what, 1.0))
        if says:
            yield Finding("serious", (fact.where,), f"the other model has {says}", "echo", KINDS[fact.what])
        else:
            agreed += 1
    for what, names in strange.items():
        unknown = list(dict.fromkeys(names))
        says = f"the other model prints {what} of {listed(unknown)}, which the frame lacks"
        yield Finding("check", tuple(unknown), says, "echo")
    yield from _missing(subject.frame, facts)
    turned = "; its load totals are taken with the other sign" if other_sign else ""
    says = f"{agreed:,} of {len(facts):,} items of the other model's printed input are those of the frame{turned}"
    yield Finding("note", (), says, "echo")


def _reversed(subject: Subject, facts: Sequence[EchoFact]) -> bool:
    """Do all vertical totals act the other way, as where down is positive or reactions are summed?"""
    pairs = [(f.value, _ours(subject, f)) for f in facts if f.what == "total y"]
    signs = [a * b for a, b in pairs if isinstance(a, float) and isinstance(b, float) and a * b != 0]
    return bool(signs) and max(signs) < 0


def _ours(subject: Subject, fact: EchoFact) -> float | str | None:
    """The frame's value for a fact, None where the frame has no such thing."""
    frame = subject.frame
    if fact.what in ("joint x", "joint y"):
        joint = frame.joints.get(fact.where)
        return None if joint is None else joint.x if fact.what == "joint x" else joint.y
    if fact.what == "member ends":
        member = frame.members.get(fact.where)
        return None if member is None else f"{member.joint_from} to {member.joint_to}"
    if fact.what == "support":
        support = frame.supports.get(fact.where)
        return None if support is None else "".join(_flag(v) for v in (support.x, support.y, support.rotation))
    if fact.what in ("total x", "total y"):
        return float(subject.total(fact.where)[0 if fact.what == "total x" else 1]) if fact.where in frame.cases else None
    if fact.what == "E":
        named = {plain(m.name): m.E for m in frame.materials.values()}
        used = {plain(m.section): frame.materials[m.material].E for m in frame.members.values()}
        return named.get(plain(fact.where), used.get(plain(fact.where), _of_member(frame, fact)))
    section = _section(frame, fact.where)
    return None if section is None else section.I if fact.what == "I" else section.A


def _section(frame: Frame, label: str) -> Section | None:
    """A section by its own name or by a member that has it."""
    found = next((s for s in frame.sections.values() if plain(s.name) == plain(label)), None)
    if found is None and label in frame.members:
        return frame.sections[frame.members[label].section]
    return found


def _of_member(frame: Frame, fact: EchoFact) -> float | None:
    return frame.materials[frame.members[fact.where].material].E if fact.where in frame.members else None


def _flag(stiffness: float) -> str:
    return "1" if stiffness == HELD else "0" if stiffness == FREE else "s"


def _scale(frame: Frame, fact: EchoFact, size: float) -> float:
    """The frame's own units in one unit of the fact's number; size: of the unit that it does not state, in N and m."""
    force_power, length_power = POWERS[fact.what]
    own = frame.units.newton**force_power * frame.units.metre**length_power
    return float(fact.unit.factor if fact.unit is not None else size) / own


def _size_unstated(subject: Subject, facts: Sequence[EchoFact], what: str) -> float:
    """Size in N and m of the unit of facts that state none: of the usual ones that in which most are the frame's."""
    mine = [(f, _ours(subject, f)) for f in facts if f.what == what and f.unit is None]
    frame = subject.frame
    force_power, length_power = POWERS[what]
    forces = [frame.units.newton, *(FORCES.values() if (force_power, length_power) == (1, 0) else ())]
    lengths = [frame.units.metre, *(LENGTHS.values() if length_power else ())]

    def fits(size: float) -> int:
        return sum(isinstance(o, float) and not _difference(frame, f, o, size) for f, o in mine)

    return max((float(f**force_power * m**length_power) for f in forces for m in lengths), key=fits)


def _difference(frame: Frame, fact: EchoFact, ours: float | str, size: float) -> str:
    """The difference in words, "" for none."""
    if isinstance(fact.value, str) or isinstance(ours, str):
        return _other_words(fact, str(ours))
    scale = _scale(frame, fact, size)
    theirs, half = fact.value * scale, fact.half * scale
    if math.isclose(theirs, ours, rel_tol=SAME, abs_tol=max(half * (1 + 1e-9), 1e-12)):
        return ""
    times = f", {theirs / ours:.4g} times it" if ours else ""
    theirs_in_words = f"{fact.what} of {fact.where} = {theirs:.6g} {_unit(frame, fact)}"
    return f"{theirs_in_words}, the frame {ours:.6g}{times} (line {fact.line})"


def _other_words(fact: EchoFact, ours: str) -> str:
    theirs = str(fact.value)
    if fact.what == "member ends":
        same = sorted(theirs.split(" to ")) == sorted(ours.split(" to "))
        return "" if same else f"{fact.where} from {theirs}, the frame from {ours} (line {fact.line})"
    # A spring counts as held or free in tables that know no more.
    if all(a == b or b == "s" for a, b in zip(theirs, ours, strict=True)):
        return ""
    return f"{fact.where} {_held(theirs)}, the frame {_held(ours)} (line {fact.line})"


def _held(flags: str) -> str:
    names = [n for n, f in zip(("x", "y", "rotation"), flags, strict=True) if f == "1"]
    return f"held in {', '.join(names)}" if names else "free"


def _unit(frame: Frame, fact: EchoFact) -> str:
    force, length = POWERS[fact.what]
    parts = [frame.units.force] * (force == 1) + [f"{frame.units.length}{length if length != 1 else ''}"] * (length != 0)
    return " ".join(parts)


def _missing(frame: Frame, facts: Sequence[EchoFact]) -> Iterator[Finding]:
    """Supports, joints and members that the other model's tables leave out; members at a joint
    that it leaves out are no news."""
    gone: set[str] = set()
    for what, names in (("joint x", frame.joints), ("member ends", frame.members), ("support", frame.supports)):
        told = {f.where for f in facts if f.what == what}
        left = [n for n in names if n not in told] if told else []
        if what == "joint x":
            gone = set(left)
        if what == "member ends":
            left = [n for n in left if not gone & {frame.members[n].joint_from, frame.members[n].joint_to}]
        if left:
            word = {"joint x": "joint", "member ends": "member", "support": "support"}[what]
            says = f"the other model's input has no {word} {listed(left)}"
            yield Finding("serious", tuple(left), says, "echo", KINDS[what])
