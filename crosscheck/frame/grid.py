"""The `[grid]` table: a regular frame in a few lines, which becomes ordinary joints, members and supports.

    [grid]
    bays = ["2 x 6 m", 7.5]          # from left to right; "2 x 6 m" is two of 6 m
    storeys = [4.5, "2 x 3.6 m"]     # from the ground up
    columns = [
      { section = "stanchion", material = "steel" },
      { storeys = 3, section = "post" },               # a later entry adds to and overrides earlier ones
    ]
    beams = { section = "girder", material = "steel", hinge = "both" }
    feet = "fixed"

Gridlines are named A, B, C ... from the left (or as `lines` says) and levels 0, 1, 2 ... from the ground up. A joint is
named by both, "B2" (with a dot between, "7.2", where the gridline's name ends in a digit). Columns run upward and beams
to the right, each named by its joints: "B1-B2", "A2-B2".

| key | is |
| --- | --- |
| `bays`, `storeys` | a list of lengths, or one text such as "3 x 6 m"; needed |
| `columns` | a table of member keys, or a list of them; each may say where it counts by `lines` and `storeys` |
| `beams` | likewise, by `bays` and `levels` (1 is above the first storey; level 0 only where it is named) |
| `feet` | a support as in [supports], for every joint of level 0; left out: none |
| `lines` | names of the gridlines, one more than there are bays |
| `omit` | names of members that are not there; a joint takes its members along |
| `origin` | [x, y] of the first gridline at level 0; default [0, 0] |

A place that no entry of `columns` or `beams` covers has no member. Tables [joints], [members] and [supports] add to the
grid, and override it under a name of its own: a joint is moved, a member keeps what its table does not state.

Loads may name groups of a grid in `members` and `joints`: "columns", "columns storey 2", "columns line A", "beams",
"beams level 2", "beams bay 1"; "level 2", "line A", "feet".
"""

from __future__ import annotations

import itertools
import re
import string
from collections import defaultdict
from collections.abc import Collection, Iterator, Sequence
from dataclasses import dataclass, field, replace

from crosscheck.frame.fields import A_LENGTH, UNUSABLE, Checker, Table, shown
from crosscheck.frame.locate import Path
from crosscheck.frame.model import Support
from crosscheck.frame.parts import TRAIT_KEYS, Known, Traits, read_support, read_traits

GRID_KEYS = frozenset({"bays", "storeys", "columns", "beams", "feet", "lines", "omit", "origin"})
MOST_JOINTS = 250_000
"""More than any plane frame has, and still read in seconds: a slip in "30 x 6" must not fill the memory."""

_REPEAT = re.compile(r"\s*([0-9]{1,9})\s*[x×*]\s*(\S.*)", re.DOTALL)
PATH: Path = ("grid",)


@dataclass(slots=True)
class Grid:
    """What a grid expands to. members: name to joints and traits; groups: name to member or joint names.

    whole: False where its joints could not be laid out.
    """

    whole: bool = True
    joints: dict[str, tuple[float, float]] = field(default_factory=dict)
    members: dict[str, tuple[str, str, Traits]] = field(default_factory=dict)
    supports: dict[str, Support] = field(default_factory=dict)
    member_groups: dict[str, list[str]] = field(default_factory=dict)
    joint_groups: dict[str, list[str]] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class _Rule:
    """Traits for the members at some gridlines (or bays) and some storeys (or levels)."""

    across: frozenset[int]
    up: frozenset[int]
    traits: Traits


def read_grid(check: Checker, value: object, known: Known) -> Grid:
    """The grid table expanded; empty, with its faults noted, where it cannot be."""
    table = check.table(value, PATH, '[grid] with bays = ["3 x 6 m"] and storeys = [4.5, 3.6]')
    if table is None:
        return Grid(whole=False)
    check.only(table, GRID_KEYS, PATH, "the grid")
    bays, storeys = _spacing(check, table, "bays"), _spacing(check, table, "storeys")
    if not bays or not storeys:
        return Grid(whole=False)
    if (len(bays) + 1) * (len(storeys) + 1) > MOST_JOINTS:
        check.note(PATH, f"a grid of more than {MOST_JOINTS} joints", "check the repeat counts of bays and storeys")
        return Grid(whole=False)
    lines = _line_names(check, table, len(bays) + 1)
    return _Expansion(check, table, bays, storeys, lines, known).grid


class _Expansion:
    """Builds one grid; joints and members are indexed by gridline (or bay) and level (or storey)."""

    def __init__(
        self, check: Checker, table: Table, bays: list[float], storeys: list[float], lines: list[str], known: Known
    ) -> None:
        self.check, self.table, self.lines, self.known = check, table, lines, known
        self.levels = len(storeys)
        self.grid = Grid()
        self.name = [[_joint_name(line, level) for level in range(self.levels + 1)] for line in lines]
        self._joints(bays, storeys)
        self._columns()
        self._beams(len(bays))
        self._omit()
        self._feet()
        self._groups()

    def _joints(self, bays: list[float], storeys: list[float]) -> None:
        x0, y0 = _origin(self.check, self.table)
        xs = list(itertools.accumulate(bays, initial=x0))
        ys = list(itertools.accumulate(storeys, initial=y0))
        for names, x in zip(self.name, xs, strict=True):
            self.grid.joints.update(zip(names, ((x, y) for y in ys), strict=True))

    def _columns(self) -> None:
        where: dict[str, dict[object, int]] = {
            "lines": {line: k for k, line in enumerate(self.lines)},
            "storeys": _numbers(1, self.levels),
        }
        for line, storey, traits in self._covered("columns", where):
            self._member(self.name[line][storey - 1], self.name[line][storey], traits)

    def _beams(self, bays: int) -> None:
        where = {"bays": _numbers(1, bays), "levels": _numbers(0, self.levels)}
        for bay, level, traits in self._covered("beams", where):
            self._member(self.name[bay - 1][level], self.name[bay][level], traits)

    def _member(self, low: str, high: str, traits: Traits) -> None:
        self.grid.members[f"{low}-{high}"] = (low, high, traits)

    def _covered(self, key: str, where: dict[str, dict[object, int]]) -> Iterator[tuple[int, int, Traits]]:
        """Place and traits of each member of one sort, place by place; later rules over earlier ones."""
        cells: dict[tuple[int, int], Traits] = {}
        for rule in self._rules(key, where):
            for cell in itertools.product(rule.across, rule.up):
                cells[cell] = rule.traits.over(cells.get(cell, Traits()))
        for missing in ("section", "material"):
            if any(getattr(traits, missing) is None for traits in cells.values()):
                self.check.note((*PATH, key), f"{missing} is missing for some of the {key}", f"give a {missing}")
        for (across, up), traits in sorted(cells.items(), key=lambda item: item[0]):
            yield across, up, traits

    def _rules(self, key: str, where: dict[str, dict[object, int]]) -> Iterator[_Rule]:
        value = self.table.get(key, [])
        listed = isinstance(value, list)
        for k, entry in enumerate(value if isinstance(value, list) else [value]):
            path: Path = (*PATH, key, k) if listed else (*PATH, key)
            table = self.check.table(entry, path, '{ section = "post", material = "steel" }')
            if table is None:
                continue
            self.check.only(table, TRAIT_KEYS | where.keys(), path, f"the {key} of a grid")
            across, up = (self._chosen(table, axis, places, path) for axis, places in where.items())
            yield _Rule(across, up, read_traits(self.check, table, path, self.known))

    def _chosen(self, table: Table, axis: str, places: dict[object, int], path: Path) -> frozenset[int]:
        """Places named by one name or number or a list of them; all where none is named (but never level 0)."""
        if axis not in table:
            return frozenset(place for key, place in places.items() if not (axis == "levels" and key == 0))
        value = table[axis]
        chosen = []
        for one in value if isinstance(value, list) else [value]:
            if isinstance(one, str | int) and not isinstance(one, bool) and one in places:
                chosen.append(places[one])
            else:
                known = ", ".join(map(str, itertools.islice(places, 12))) + (", ..." if len(places) > 12 else "")
                self.check.note((*path, axis), f"{shown(one)} is none of the grid's {axis}", f"there are {known}")
        return frozenset(chosen)

    def _omit(self) -> None:
        names = self.table.get("omit", [])
        if not isinstance(names, list):
            self.check.note((*PATH, "omit"), f"{shown(names)} is not a list of names", 'such as ["B1-C1"]')
            return
        there = self.grid.members.keys() | self.grid.joints.keys()
        gone = {self.check.name(name, there, "member or joint of the grid", (*PATH, "omit", k))
                for k, name in enumerate(names)}  # fmt: skip
        self.grid.joints = {name: at for name, at in self.grid.joints.items() if name not in gone}
        self.grid.members = {
            name: row for name, row in self.grid.members.items() if gone.isdisjoint((name, row[0], row[1]))
        }

    def _feet(self) -> None:
        if "feet" not in self.table:
            return
        pattern = read_support(self.check, self.table["feet"], (*PATH, "feet"), "")
        for names in self.name:
            if names[0] in self.grid.joints:
                self.grid.supports[names[0]] = replace(pattern, joint=names[0])

    def _groups(self) -> None:
        """Groups by gridline, bay, storey and level, of what is left after `omit`."""
        joints: dict[str, list[str]] = defaultdict(list)
        members: dict[str, list[str]] = defaultdict(list)
        for k, (line, names) in enumerate(zip(self.lines, self.name, strict=True)):
            for level, name in enumerate(names):
                for group in (f"level {level}", f"line {line}", *(["feet"] if level == 0 else [])):
                    joints[group].append(name)
                if level:
                    for group in ("columns", f"columns storey {level}", f"columns line {line}"):
                        members[group].append(f"{names[level - 1]}-{name}")
                if k:
                    for group in ("beams", f"beams level {level}", f"beams bay {k}"):
                        members[group].append(f"{self.name[k - 1][level]}-{name}")
        self.grid.joint_groups = _present(joints, self.grid.joints)
        self.grid.member_groups = _present(members, self.grid.members)


def _present(groups: dict[str, list[str]], there: Collection[str]) -> dict[str, list[str]]:
    kept = {group: [name for name in names if name in there] for group, names in groups.items()}
    return {group: names for group, names in kept.items() if names}


def _numbers(first: int, last: int) -> dict[object, int]:
    return {k: k for k in range(first, last + 1)}


def _joint_name(line: str, level: int) -> str:
    return f"{line}.{level}" if line[-1:].isdigit() else f"{line}{level}"


def _spacing(check: Checker, table: Table, key: str) -> list[float]:
    """Lengths from left to right or from the ground up; empty, with a fault noted, where there are none."""
    value = table.get(key)
    if value is None or value == []:
        check.note((*PATH, key) if value == [] else PATH, f"{key} is missing", f'give {key} = ["3 x 6 m", 7.5]')
        return []
    if not isinstance(value, list):
        return _spaces(check, value, (*PATH, key))
    found: list[float] = []
    for k, one in enumerate(value):
        found += _spaces(check, one, (*PATH, key, k))
        if len(found) > MOST_JOINTS:
            break
    return found


def _spaces(check: Checker, value: object, path: Path) -> list[float]:
    """One entry: a length, or a repeated one such as "3 x 6 m"."""
    repeat = _REPEAT.fullmatch(value) if isinstance(value, str) else None
    count = min(int(repeat.group(1)), MOST_JOINTS) if repeat else 1
    length = check.number(repeat.group(2) if repeat else value, A_LENGTH, path)
    if length <= 0 or count == 0:
        check.note(path, f"{shown(value)} is not above zero", 'give a length, or "3 x 6 m" for three of 6 m')
        length = UNUSABLE
    return [length] * count


def _line_names(check: Checker, table: Table, count: int) -> list[str]:
    """Names of the gridlines, stated or A, B ... Z, AA, AB ..."""
    stated = table.get("lines")
    default = list(itertools.islice(_letters(), count))
    if stated is None:
        return default
    path = (*PATH, "lines")
    if not isinstance(stated, list) or not all(isinstance(name, str) for name in stated):
        check.note(path, f"{shown(stated)} is not a list of names", f"such as {_listed(default)}")
    elif len(stated) != count or len(set(stated)) != count:
        says = f"{len(stated)} names for {count} gridlines" if len(stated) != count else "a gridline is named twice"
        check.note(path, says, f"such as {_listed(default)}")
    else:
        for k, name in enumerate(stated):
            check.usable_name(name, (*path, k), "gridline")
        return stated
    return default


def _letters() -> Iterator[str]:
    for size in itertools.count(1):
        for letters in itertools.product(string.ascii_uppercase, repeat=size):
            yield "".join(letters)


def _listed(names: Sequence[str]) -> str:
    return "[" + ", ".join(f'"{name}"' for name in names[:6]) + (", ...]" if len(names) > 6 else "]")


def _origin(check: Checker, table: Table) -> tuple[float, float]:
    value = table.get("origin", [0, 0])
    if isinstance(value, list) and len(value) == 2:
        x, y = (check.number(v, A_LENGTH, (*PATH, "origin")) for v in value)
        return x, y
    check.note((*PATH, "origin"), f"{shown(value)} is not a place", "give [x, y]")
    return UNUSABLE, UNUSABLE
