"""The `[stiffness]` tables: factors on stiffness that a combination may call for by name.

    [stiffness.cracked]
    beam = { I = 0.35 }                 # a section, a material, a member or a support
    "member b1" = { I = 0.5 }           # where a bare name would be two things
"""

from __future__ import annotations

from collections.abc import Collection, Mapping
from dataclasses import dataclass

from crosscheck.frame.fields import A_NUMBER, UNUSABLE, Checker, shown
from crosscheck.frame.locate import Path
from crosscheck.frame.model import FREE, HELD, StiffnessState, Support

KEYS: dict[str, tuple[str, ...]] = {
    "member": ("I", "A", "shear_area", "E", "G", "spring_from", "spring_to"),
    "section": ("I", "A", "shear_area"),
    "material": ("E", "G"),
    "support": ("x", "y", "rotation"),
}
"""What may be factored, by what the name means."""
ANY_KEY = frozenset(key for keys in KEYS.values() for key in keys)


@dataclass(frozen=True, slots=True)
class Things:
    """What a name of a state may mean; groups: a grid's names for several members. None: the table is missing."""

    members: Collection[str] | None
    sections: Collection[str] | None
    materials: Collection[str] | None
    supports: Mapping[str, Support]
    groups: Mapping[str, list[str]]

    def kinds(self, name: str) -> list[str]:
        """Every kind of thing that has this name."""
        found = {
            "member": name in (self.members or ()) or name in self.groups, "section": name in (self.sections or ()),
            "material": name in (self.materials or ()), "support": name in self.supports,
        }  # fmt: skip
        return [kind for kind, there in found.items() if there]

    def names(self) -> list[str]:
        return [*(self.members or ()), *(self.sections or ()), *(self.materials or ()), *self.supports, *self.groups]


def read_states(check: Checker, value: object, things: Things) -> dict[str, StiffnessState]:
    """Every state of the file's [stiffness] table."""
    table = check.table(value, ("stiffness",), "[stiffness.cracked] with beam = { I = 0.35 }")
    return {} if table is None else {name: _state(check, name, entry, things) for name, entry in table.items()}


def _state(check: Checker, name: str, value: object, things: Things) -> StiffnessState:
    path: Path = ("stiffness", name)
    check.usable_name(name, path, "state of stiffness")
    table = check.table(value, path, "{ beam = { I = 0.35 } }")
    found: dict[str, dict[str, dict[str, float]]] = {kind: {} for kind in KEYS}
    for key, entry in ({} if table is None else table).items():
        place = (*path, key)
        factors = check.table(entry, place, "{ I = 0.35 }")
        if factors is None:
            continue
        kind, thing = _meant(check, key, frozenset(factors), things, place)
        if not kind:
            continue
        check.only(factors, KEYS[kind], place, f"the factors of a {kind}")
        numbers = {k: _factor(check, v, (*place, k)) for k, v in factors.items() if k in KEYS[kind]}
        if kind == "support":
            _sprung(check, things.supports[thing], numbers, place)
        for one in things.groups.get(thing, [thing]) if kind == "member" else [thing]:
            found[kind][one] = {**found[kind].get(one, {}), **numbers}
    return StiffnessState(name, found["member"], found["section"], found["material"], found["support"])


def _meant(
    check: Checker, key: str, factors: Collection[str], things: Things, path: Path
) -> tuple[str, str]:
    """The kind of thing and its name; ("", "") with a fault noted where that is not clear."""
    word, _, rest = key.partition(" ")
    if word in KEYS and rest and word in things.kinds(rest):
        return word, rest
    kinds = things.kinds(key)
    able = [kind for kind in kinds if all(k in KEYS[kind] or k not in ANY_KEY for k in factors)]
    if len(able) == 1:
        return able[0], key
    if len(able) > 1:
        named = " or ".join(f'"{kind} {key}"' for kind in able)
        check.note(path, f"{shown(key)} may be a {' or a '.join(able)}", f"write {named}")
    elif kinds:
        listed = "; ".join(f"a {kind} has {', '.join(KEYS[kind])}" for kind in kinds)
        check.note(path, f"factors that a {kinds[0]} does not have", listed)
    elif things.members is not None and things.sections is not None and things.materials is not None:
        says = f"there is no member, section, material or support {shown(key)}"
        check.note(path, says, check.near(key, things.names()))
    return "", ""


def _factor(check: Checker, value: object, path: Path) -> float:
    found = check.number(value, A_NUMBER, path)
    if found <= 0:
        check.note(path, f"{shown(value)} is not above zero", "give a factor such as 0.35")
    return found if found > 0 else UNUSABLE


def _sprung(check: Checker, support: Support, numbers: Mapping[str, float], path: Path) -> None:
    for key in numbers:
        if getattr(support, key) in (HELD, FREE):
            what = "held" if getattr(support, key) == HELD else "free"
            says = f"{key} of the support at {shown(support.joint)} is {what}, and no factor changes that"
            check.note((*path, key), says, "factor springs only")
