"""The parts of a frame file that stand in more than one place: what a member is like, and how a joint is supported."""

from __future__ import annotations

import math
from collections.abc import Collection, Mapping
from dataclasses import dataclass, fields, replace
from typing import Literal

from crosscheck.frame.fields import (
    A_LENGTH,
    A_SPRING,
    A_TURN_SPRING,
    DEGREES,
    UNUSABLE,
    Checker,
    Kind,
    Table,
    shown,
)
from crosscheck.frame.locate import Path
from crosscheck.frame.model import FREE, HELD, Member, Support, Tie

SUPPORT_WORDS: dict[str, tuple[float, float, float]] = {
    "fixed": (HELD, HELD, HELD), "pinned": (HELD, HELD, FREE), "roller": (FREE, HELD, FREE),
}  # fmt: skip
MATERIAL_KEYS = ("E", "G", "nu", "alpha", "density")
SECTION_KEYS = ("I", "A", "shear_area", "depth")
SUPPORT_KEYS = ("x", "y", "rotation", "angle")
TRAIT_KEYS = frozenset(
    {"section", "material", "hinge", "spring_from", "spring_to", "rigid_from", "rigid_to", "axial", "only"}
)
ENDS = ("from", "to")
MEMBER_KEYS = TRAIT_KEYS | {*ENDS, "profile", "taper"}
ONLY: tuple[Literal["tension", "compression"], ...] = ("tension", "compression")
ONE_WAY: tuple[Literal["push", "pull"], ...] = ("push", "pull")


@dataclass(frozen=True, slots=True)
class Traits:
    """What a member is like apart from its joints; None where not stated. Meanings as in `Member`."""

    section: str | None = None
    material: str | None = None
    turn_from: float | None = None
    turn_to: float | None = None
    rigid_from: float | None = None
    rigid_to: float | None = None
    axial: Literal["rigid"] | None = None
    only: Literal["tension", "compression"] | None = None

    def over(self, base: Traits) -> Traits:
        """These, and the base's where nothing is stated here."""
        own = {f.name: value for f in fields(self) if (value := getattr(self, f.name)) is not None}
        return replace(base, **own)

    def member(self, name: str, joint_from: str, joint_to: str) -> Member:
        return Member(
            name,
            joint_from,
            joint_to,
            self.section or "",
            self.material or "",
            HELD if self.turn_from is None else self.turn_from,
            HELD if self.turn_to is None else self.turn_to,
            self.rigid_from or 0.0,
            self.rigid_to or 0.0,
            axial=self.axial or "",
            only=self.only or "",
        )


@dataclass(frozen=True, slots=True)
class Known:
    """Names that members may refer to; None where the whole table is missing, which is one fault already."""

    sections: Collection[str] | None
    materials: Collection[str] | None


def read_traits(check: Checker, table: Table, path: Path, known: Known) -> Traits:
    """The traits stated in a member's table (or a grid's); keys of other meaning are left alone."""
    turn = _turns(check, table, path)
    return Traits(
        _named(check, table, "section", known.sections, path),
        _named(check, table, "material", known.materials, path),
        turn[0],
        turn[1],
        _zone(check, table, "rigid_from", path),
        _zone(check, table, "rigid_to", path),
        _axial(check, table, path),
        next((word for word in ONLY if word == _word(check, table, "only", ONLY, path)), None),
    )


def _word(check: Checker, table: Table, key: str, words: tuple[str, ...], path: Path) -> str:
    return check.word(table[key], words, (*path, key)) if key in table else ""


def _axial(check: Checker, table: Table, path: Path) -> Literal["rigid"] | None:
    """A member's own word can make it rigid; elastic is what the whole frame is otherwise."""
    if table.get("axial") == "elastic":
        says = "one member alone cannot be made elastic"
        check.note((*path, "axial"), says, 'set axial = "elastic" in [analysis] and "rigid" at the members that are')
        return None
    return "rigid" if _word(check, table, "axial", ("rigid",), path) else None


def _named(check: Checker, table: Table, key: str, valid: Collection[str] | None, path: Path) -> str | None:
    return check.name(table[key], valid, key, (*path, key)) if key in table else None


def _turns(check: Checker, table: Table, path: Path) -> list[float | None]:
    """End connections from `hinge`, `spring_from` and `spring_to`."""
    hinge = table.get("hinge")
    if hinge is not None:
        hinge = check.word(hinge, (*ENDS, "both"), (*path, "hinge"))
    turns: list[float | None] = []
    for end in ENDS:
        key = f"spring_{end}"
        stated = key in table
        hinged = hinge in (end, "both")
        if stated and hinged:
            check.note((*path, key), f'a spring and a hinge both at the "{end}" end', "give one of the two")
        turns.append(_spring(check, table, key, path, end) if stated else FREE if hinged else None)
    return turns


def _spring(check: Checker, table: Table, key: str, path: Path, end: str) -> float:
    found = check.number(table[key], A_TURN_SPRING, (*path, key))
    if found == 0:
        check.note((*path, key), "a spring of zero is a hinge", f'give hinge = "{end}"')
    elif found < 0:
        check.note((*path, key), f"{shown(table[key])} is not above zero", f"give {A_TURN_SPRING.name} above zero")
    return found if found > 0 else UNUSABLE


def _zone(check: Checker, table: Table, key: str, path: Path) -> float | None:
    found = check.get(table, key, A_LENGTH, path)
    if found is not None and found < 0:
        check.note((*path, key), f"{shown(table[key])} is below zero", "give the length of the rigid zone")
        return UNUSABLE
    return found


def read_support(check: Checker, value: object, path: Path, joint: str) -> Support:
    """A support from its word or its table; stiffnesses along its own axes."""
    if isinstance(value, str):
        word = check.word(value, SUPPORT_WORDS, path)
        return Support(joint, *SUPPORT_WORDS.get(word, (UNUSABLE, UNUSABLE, UNUSABLE)))
    table = check.table(value, path, '"fixed", "pinned", "roller" or { x = "held", y = "held" }')
    if table is None:
        return Support(joint, UNUSABLE, UNUSABLE, UNUSABLE)
    check.only(table, SUPPORT_KEYS, path, "a support")
    x_only, y_only = _one_way(table, "x"), _one_way(table, "y")
    return Support(
        joint,
        HELD if x_only else _restraint(check, table, "x", A_SPRING, path),
        HELD if y_only else _restraint(check, table, "y", A_SPRING, path),
        _restraint(check, table, "rotation", A_TURN_SPRING, path),
        check.get(table, "angle", DEGREES, path) or 0.0,
        x_only,
        y_only,
    )


def _one_way(table: Table, key: str) -> Literal["", "push", "pull"]:
    return next((word for word in ONE_WAY if table.get(key) == word), "")


def read_ties(
    check: Checker, value: object, joints: Collection[str] | None, groups: Mapping[str, list[str]],
    loose: Collection[str],
) -> dict[str, Tie]:  # fmt: skip
    """The file's [ties]: joints that move together. joints: None where unknown; loose: those that no member joins."""
    table = check.table(value, ("ties",), '[ties] with roof = { joints = ["B", "C"], direction = "x" }')
    ties = {}
    for name, entry in ({} if table is None else table).items():
        path: Path = ("ties", name)
        check.usable_name(name, path, "tie")
        inner = check.table(entry, path, '{ joints = ["B", "C"], direction = "x" }')
        if inner is not None:
            check.only(inner, ("joints", "direction"), path, "a tie")
            ties[name] = Tie(name, _tied(check, inner, path, joints, groups, loose), _tie_direction(check, inner, path))
    return ties


def _tied(
    check: Checker, table: Table, path: Path, joints: Collection[str] | None, groups: Mapping[str, list[str]],
    loose: Collection[str],
) -> tuple[str, ...]:  # fmt: skip
    value = table.get("joints")
    place = (*path, "joints")
    if isinstance(value, str) and value in groups:
        value = groups[value]
    if not isinstance(value, list) or len(value) < 2:
        check.note(place, "a tie needs a list of two joints at least", 'give joints = ["B", "C"]')
        return ()
    names = [check.name(name, joints, "joint", (*place, k)) for k, name in enumerate(value)]
    for name in dict.fromkeys(names):
        if name and names.count(name) > 1:
            check.note(place, f"joint {shown(name)} is named twice", "name each once")
        if name in loose:
            check.note(place, f"no member joins joint {shown(name)}", "tie joints that members join")
    return tuple(names)


def _tie_direction(check: Checker, table: Table, path: Path) -> float:
    """Degrees from x: "x", "y" or an angle."""
    value, place = table.get("direction"), (*path, "direction")
    if value in ("x", "y"):
        return 0.0 if value == "x" else 90.0
    if value is None:
        check.note(place, "direction is missing", 'give direction = "x", "y" or an angle')
        return UNUSABLE
    if isinstance(value, str) and not any(c.isdigit() for c in value):
        check.note(place, f"{shown(value)} is no direction of a tie", 'give "x", "y" or an angle')
        return UNUSABLE
    return check.number(value, DEGREES, place)


def _restraint(check: Checker, table: Table, key: str, kind: Kind, path: Path) -> float:
    """One direction of a support: "held", "free" (also where absent) or a stiffness above zero."""
    value = table.get(key, "free")
    place = (*path, key)
    if value in ("held", "free"):
        return HELD if value == "held" else FREE
    if value in ONE_WAY:
        check.note(place, "a support works one way along x or y only", 'give "held", "free" or a stiffness')
        return UNUSABLE
    if isinstance(value, str) and not any(c.isdigit() for c in value):
        near = check.near(value, ("held", "free", *ONE_WAY))
        choices = f'give "held", "free" or {kind.name}, such as "{kind.example}"'
        check.note(place, f'{shown(value)} is neither "held" nor "free" nor a stiffness', near or choices)
        return UNUSABLE
    found = check.number(value, kind, place)
    if found <= 0:
        check.note(place, f"{shown(value)} is not a stiffness above zero", 'give "free" where nothing restrains')
    return found if found > 0 else UNUSABLE


def holds(stiffness: float) -> bool:
    """Whether a support direction holds or springs; an unusable one counts, its fault is noted already."""
    return math.isnan(stiffness) or stiffness != FREE
