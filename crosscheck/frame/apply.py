"""The `[loads]` tables: load cases and their entries, turned into load objects in the frame's units."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass

from crosscheck.frame.fields import (
    A_COUPLE,
    A_FORCE,
    A_LENGTH,
    A_LINE_LOAD,
    A_NUMBER,
    A_ROTATION,
    A_TEMPERATURE,
    DEGREES,
    UNUSABLE,
    Checker,
    Kind,
    Table,
    shown,
)
from crosscheck.frame.loads import SNAP, direction_cosines
from crosscheck.frame.locate import Path
from crosscheck.frame.model import (
    Direction,
    Joint,
    JointCouple,
    JointForce,
    Lean,
    Load,
    LoadCase,
    Member,
    Misfit,
    PointCouple,
    PointForce,
    SelfWeight,
    Settlement,
    Spread,
    Support,
    Temperature,
)
from crosscheck.frame.parts import holds

COMPASS: dict[str, float] = {"right": 0.0, "up": 90.0, "left": 180.0, "down": 270.0}
"""Global direction words, in degrees counter-clockwise from x."""

TINY_SHARE = 1e-12
"""A settlement's component under this share of the whole is rounding from turning it into the support's axes."""

CASE_KEYS = ("apply", "expected")
RESERVED = ("stiffness", "order", "lean")
"""Names that mean something else in a combination."""


@dataclass(frozen=True, slots=True)
class Distance:
    """A place along a member: a share of its length, or a length from its `from` joint."""

    share: float
    length: float

    def on(self, member_length: float) -> float:
        return self.share * member_length + self.length


@dataclass(frozen=True, slots=True)
class Places:
    """What loads may act on. lengths: by member, NaN where unknown. groups: a grid's names for several.

    joints_known, members_known: False where a missing table makes every name unknown, which is one fault already.
    """

    joints: Mapping[str, Joint]
    members: Mapping[str, Member]
    supports: Mapping[str, Support]
    lengths: Mapping[str, float]
    joint_groups: Mapping[str, list[str]]
    member_groups: Mapping[str, list[str]]
    loose: frozenset[str]
    joints_known: bool = True
    members_known: bool = True


class LoadReader:
    """Reads load cases; every entry is one of the actions in `_ACTIONS`."""

    def __init__(self, check: Checker, places: Places) -> None:
        self.check = check
        self.places = places

    def case(self, name: str, value: object) -> LoadCase:
        """One load case from its table."""
        path: Path = ("loads", name)
        self.check.usable_name(name, path, "load case")
        if name in RESERVED:
            self.check.note(path, f'"{name}" has its own meaning in a combination', "call the load case something else")
        table = self.check.table(value, path, f"[loads.{name}] with apply = [ ... ]")
        if table is None:
            return LoadCase(name, ())
        self.check.only(table, CASE_KEYS, path, "a load case")
        entries = table.get("apply", [])
        if not isinstance(entries, list):
            self.check.note((*path, "apply"), f"{shown(entries)} is not a list", "give apply = [ { ... }, { ... } ]")
            entries = []
        loads = [load for k, entry in enumerate(entries) for load in self.entry(entry, k, (*path, "apply", k))]
        return LoadCase(name, tuple(loads), self._expected(table.get("expected", {}), (*path, "expected")))

    def _expected(self, value: object, path: Path) -> dict[str, float]:
        table = self.check.table(value, path, '{ down = "80 kN" }')
        if table is None:
            return {}
        self.check.only(table, COMPASS, path, "expected")
        return {key: self.check.number(table[key], A_FORCE, (*path, key)) for key in table if key in COMPASS}

    def entry(self, value: object, index: int, path: Path) -> list[Load]:
        """The loads of one entry of `apply`: one a joint or member it names."""
        table = self.check.table(value, path, '{ joint = "B", force = 12, direction = "right" }')
        if table is None:
            return []
        on = self._target(table, path)
        action = self._action(table, on, path)
        if action is None:
            return []
        self.check.only(table, {*_TARGETS.get(on, ()), *action.does, *action.needs, *action.takes}, path,
                        action.what)  # fmt: skip
        for key in action.needs:
            if key not in table:
                self.check.note(path, f"{key} is missing for {action.what}", action.advice.get(key, f"give {key}"))
        names = self._names(table, on, path)
        return action.read(_Entry(self.check, self.places, table, index, path), names)

    def _target(self, table: Table, path: Path) -> str:
        """"joint", "member" or "frame"; "" with a fault noted where it is not clear."""
        found = [key for key in _ON if key in table]
        if len(found) == 1:
            return _ON[found[0]]
        if not found:
            self.check.note(path, "the entry does not say what it acts on", "give joint, member or self_weight")
        else:
            self.check.note(path, f"{' and '.join(found)} in one entry", "make one entry of each")
        return ""

    def _action(self, table: Table, on: str, path: Path) -> _Action | None:
        """What the entry does; None with a fault noted where it does nothing or two things."""
        if not on:
            return None
        found = [action for action in _ACTIONS[on] if any(key in table for key in action.does)]
        if len(found) == 1:
            return found[0]
        if found:
            both = " and ".join(action.does[0] for action in found)
            self.check.note(path, f"{both} in one entry", "make one entry of each")
            return None
        words = [key for action in _ACTIONS[on] for key in action.does]
        elsewhere = [key for other in _ACTIONS.values() for a in other for key in a.does if key in table]
        near = next((self.check.near(key, words) for key in table if key not in ENTRY_KEYS), "")
        what = f"{elsewhere[0]} does not act on a {on}" if elsewhere else "the entry holds no load"
        self.check.note(path, what, near or f"give one of {', '.join(words)}")
        return None

    def _names(self, table: Table, on: str, path: Path) -> list[str]:
        """Joints or members of the entry; a grid's groups opened; those unknown are noted and left out."""
        if on == "frame":
            return []
        valid: Mapping[str, object] = self.places.joints if on == "joint" else self.places.members
        known = self.places.joints_known if on == "joint" else self.places.members_known
        if on in table:
            names = [self.check.name(table[on], valid if known else None, on, (*path, on))]
        else:
            names = self._several(table[f"{on}s"], on, valid if known else None, (*path, f"{on}s"))
        return [name for name in names if name]

    def _several(self, value: object, on: str, valid: Mapping[str, object] | None, path: Path) -> list[str]:
        groups = self.places.joint_groups if on == "joint" else self.places.member_groups
        if isinstance(value, str) and value in groups:
            return groups[value]
        if isinstance(value, str) and valid is None:
            return []
        if not isinstance(value, list) or not value:
            what = "an empty list" if value == [] else f"{shown(value)}, not a list"
            self.check.note(path, f"{on}s is {what}", f'give {on}s = ["A", "B"]' + _of_groups(groups))
            return []
        names: list[str] = []
        for k, name in enumerate(value):
            is_group = isinstance(name, str) and name in groups and (valid is None or name not in valid)
            names += groups[name] if is_group else [self.check.name(name, valid, on, (*path, k))]
        if valid is not None and len(set(names)) < len(names) and "" not in names:
            twice = next(name for k, name in enumerate(names) if name in names[:k])
            self.check.note(path, f"{on} {shown(twice)} is named twice", "name each once")
        return names


@dataclass(frozen=True, slots=True)
class _Entry:
    """One entry of `apply`, with the reading of its values."""

    check: Checker
    places: Places
    table: Table
    index: int
    path: Path

    def number(self, key: str, kind: Kind) -> float:
        """The number under `key`; UNUSABLE where absent (noted already) or bad."""
        found = self.check.get(self.table, key, kind, self.path)
        return UNUSABLE if found is None else found

    def direction(self, on_member: bool) -> Direction:
        value = self.table.get("direction", 0.0)
        path = (*self.path, "direction")
        if isinstance(value, str) and not any(c.isdigit() for c in value):
            return self._direction_word(value, on_member, path)
        return self.check.number(value, DEGREES, path)

    def _direction_word(self, value: str, on_member: bool, path: Path) -> Direction:
        if value in ("across", "along"):
            if on_member:
                return "across" if value == "across" else "along"
            self.check.note(path, f'"{value}" goes with members', f"give {', '.join(COMPASS)} or an angle")
            return UNUSABLE
        words = (*COMPASS, "across", "along") if on_member else tuple(COMPASS)
        if value not in COMPASS:
            near = self.check.near(value, words)
            self.check.note(path, f"{shown(value)} is no direction", near or f"give {', '.join(words)} or an angle")
        return COMPASS.get(value, UNUSABLE)

    def angle(self) -> float:
        direction = self.direction(on_member=False)
        assert not isinstance(direction, str)
        return direction

    def distance(self, key: str, default: Distance) -> Distance:
        """`at`, `start` or `end`: a length, or "40%" of the member's length."""
        value = self.table.get(key)
        if value is None:
            return default
        path = (*self.path, key)
        if isinstance(value, str) and value.rstrip().endswith("%"):
            return Distance(self.check.percentage(value, path), 0.0)
        return Distance(0.0, self.check.number(value, A_LENGTH, path))

    def within(self, key: str, distance: Distance, member: str) -> float:
        """The distance on this member, which must lie between its joints; what misses them by rounding is moved."""
        length = self.places.lengths[member]
        at = distance.on(length)
        if at < -SNAP * length or at > length * (1 + SNAP):
            value = shown(self.table.get(key))
            says = f'{key} = {value} does not lie on member {shown(member)}, whose length is {length:.6g}'
            self.check.note((*self.path, key), says, f"give a distance from 0 to {length:.6g}, or a percentage")
            return UNUSABLE
        return min(max(at, 0.0), length) if at == at else at


@dataclass(frozen=True, slots=True)
class _Action:
    """A kind of load: the keys that make it, those it needs beside, those it may take, and how it is read."""

    does: tuple[str, ...]
    needs: tuple[str, ...]
    takes: tuple[str, ...]
    what: str
    read: Callable[[_Entry, list[str]], list[Load]]
    advice: Mapping[str, str]


def _joint_force(e: _Entry, joints: list[str]) -> list[Load]:
    force, direction = e.number("force", A_FORCE), e.angle()
    return [JointForce(e.index, joint, force, direction) for joint in _carried(e, joints)]


def _joint_couple(e: _Entry, joints: list[str]) -> list[Load]:
    couple = e.number("couple", A_COUPLE)
    return [JointCouple(e.index, joint, couple) for joint in _carried(e, joints)]


def _carried(e: _Entry, joints: list[str]) -> list[str]:
    """Notes each joint that no member joins: a load there would vanish."""
    for joint in joints:
        if joint in e.places.loose:
            e.check.note(e.path, f"no member joins joint {shown(joint)}", "load a joint that a member joins")
    return joints


def _settlement(e: _Entry, joints: list[str]) -> list[Load]:
    path = (*e.path, "settlement")
    table = e.check.table(e.table["settlement"], path, '{ down = "10 mm" } or { y = "-10 mm" }')
    if table is None:
        return []
    e.check.only(table, ("x", "y", "rotation", *COMPASS), path, "a settlement")
    own = {key: e.check.get(table, key, A_LENGTH, path) for key in ("x", "y") if key in table}
    towards = {key: e.check.get(table, key, A_LENGTH, path) for key in COMPASS if key in table}
    rotation = e.check.get(table, "rotation", A_ROTATION, path) or 0.0
    if own and towards:
        e.check.note(path, f"{' and '.join([*own, *towards])} in one settlement",
                     "give x and y along the support's own axes, or down, up, left, right")  # fmt: skip
        return []
    if not table:
        e.check.note(path, "the settlement is empty", 'give { down = "10 mm" }, say')
    loads: list[Load] = []
    for joint in joints:
        if joint not in e.places.supports:
            e.check.note(path, f"joint {shown(joint)} has no support", "settle a joint that [supports] names")
            continue
        support = e.places.supports[joint]
        x, y = _turned(towards, support.angle) if towards else (own.get("x") or 0.0, own.get("y") or 0.0)
        _settles(e, support, {"x": x, "y": y, "rotation": rotation}, path)
        loads.append(Settlement(e.index, joint, x, y, rotation))
    return loads


def _turned(towards: Mapping[str, float | None], angle: float) -> tuple[float, float]:
    """Global movements along the support's turned axes, without what only rounding leaves of them."""
    cosines = {key: direction_cosines(COMPASS[key]) for key in towards}
    gx = sum((size or 0.0) * cosines[key][0] for key, size in towards.items())
    gy = sum((size or 0.0) * cosines[key][1] for key, size in towards.items())
    if not math.isfinite(angle):
        return UNUSABLE, UNUSABLE
    c, s = direction_cosines(angle)
    least = TINY_SHARE * math.hypot(gx, gy)
    x, y = gx * c + gy * s, gy * c - gx * s
    return (0.0 if abs(x) < least else x), (0.0 if abs(y) < least else y)


def _settles(e: _Entry, support: Support, moved: Mapping[str, float], path: Path) -> None:
    """Notes every direction that is to move although nothing there holds or springs."""
    for axis, size in moved.items():
        if size != 0 and not holds(getattr(support, axis)):
            turned = f" (turned by {support.angle:g} degrees)" if support.angle and axis != "rotation" else ""
            says = f"nothing holds {axis} at the support of joint {shown(support.joint)}{turned}"
            e.check.note(path, says, "settle only what the support holds or springs")


def _point_force(e: _Entry, members: list[str]) -> list[Load]:
    force, direction = e.number("force", A_FORCE), e.direction(on_member=True)
    at = e.distance("at", Distance(0.0, UNUSABLE))
    return [PointForce(e.index, m, force, direction, e.within("at", at, m)) for m in members]


def _point_couple(e: _Entry, members: list[str]) -> list[Load]:
    couple, at = e.number("couple", A_COUPLE), e.distance("at", Distance(0.0, UNUSABLE))
    return [PointCouple(e.index, m, couple, e.within("at", at, m)) for m in members]


def _uniform(e: _Entry, members: list[str]) -> list[Load]:
    w = e.number("uniform", A_LINE_LOAD)
    return _spread(e, members, w, w)


def _varying(e: _Entry, members: list[str]) -> list[Load]:
    value, path = e.table["varying"], (*e.path, "varying")
    if isinstance(value, list) and len(value) == 2:
        first, last = (e.check.number(w, A_LINE_LOAD, (*path, k)) for k, w in enumerate(value))
    else:
        e.check.note(path, f"{shown(value)} is not two intensities", "give [w at start, w at end]")
        first = last = UNUSABLE
    return _spread(e, members, first, last)


def _spread(e: _Entry, members: list[str], first: float, last: float) -> list[Load]:
    direction = e.direction(on_member=True)
    per = e.check.word(e.table.get("per", "length"), ("length", "projection"), (*e.path, "per"))
    projection = per == "projection"
    if projection and isinstance(direction, str):
        says = f'a load "{direction}" the member has no projection'
        e.check.note((*e.path, "per"), says, 'give per = "length", or a direction such as "down"')
    start, end = e.distance("start", Distance(0.0, 0.0)), e.distance("end", Distance(1.0, 0.0))
    loads: list[Load] = []
    for m in members:
        a, b = e.within("start", start, m), e.within("end", end, m)
        if b - a <= SNAP * e.places.lengths[m]:
            e.check.note(e.path, f"start does not lie before end on member {shown(m)}", "give start less than end")
        loads.append(Spread(e.index, m, first, last, direction, a, b, projection))
    return loads


def _temperature(e: _Entry, members: list[str]) -> list[Load]:
    mean = e.check.get(e.table, "temperature", A_TEMPERATURE, e.path) or 0.0
    difference = e.check.get(e.table, "difference", A_TEMPERATURE, e.path) or 0.0
    return [Temperature(e.index, m, mean, difference) for m in members]


def _misfit(e: _Entry, members: list[str]) -> list[Load]:
    too_long = e.number("misfit", A_LENGTH)
    return [Misfit(e.index, m, too_long) for m in members]


def _self_weight(e: _Entry, _: list[str]) -> list[Load]:
    return [SelfWeight(e.index, e.number("self_weight", A_NUMBER))]


def _lean(e: _Entry, _: list[str]) -> list[Load]:
    return [Lean(e.index, e.check.share(e.table["lean"], (*e.path, "lean")))]


_ADVICE = {
    "direction": 'give direction = "down", say',
    "at": 'give at, the distance from the member\'s first joint, such as "2.5 m" or "40%"',
}
_PART = ("start", "end", "per")
_ACTIONS: dict[str, tuple[_Action, ...]] = {
    "joint": (
        _Action(("force",), ("direction",), (), "a force on a joint", _joint_force, _ADVICE),
        _Action(("couple",), (), (), "a couple on a joint", _joint_couple, _ADVICE),
        _Action(("settlement",), (), (), "a settlement", _settlement, _ADVICE),
    ),
    "member": (
        _Action(("force",), ("at", "direction"), (), "a force on a member", _point_force, _ADVICE),
        _Action(("couple",), ("at",), (), "a couple on a member", _point_couple, _ADVICE),
        _Action(("uniform",), ("direction",), _PART, "a uniform load", _uniform, _ADVICE),
        _Action(("varying",), ("direction",), _PART, "a varying load", _varying, _ADVICE),
        _Action(("temperature", "difference"), (), (), "a temperature", _temperature, _ADVICE),
        _Action(("misfit",), (), (), "a misfit", _misfit, _ADVICE),
    ),
    "frame": (
        _Action(("self_weight",), (), (), "self weight", _self_weight, _ADVICE),
        _Action(("lean",), (), (), "a lean", _lean, _ADVICE),
    ),
}  # fmt: skip
_TARGETS = {"joint": ("joint", "joints"), "member": ("member", "members")}
_ON = {"joint": "joint", "joints": "joint", "member": "member", "members": "member", "self_weight": "frame",
       "lean": "frame"}  # fmt: skip
ENTRY_KEYS = {*_ON, *(k for a in _ACTIONS.values() for x in a for k in (*x.does, *x.needs, *x.takes))}


def _of_groups(groups: Iterable[str]) -> str:
    some: Sequence[str] = list(groups)[:4]
    return f", or a group of the grid such as {', '.join(shown(name) for name in some)}" if some else ""
