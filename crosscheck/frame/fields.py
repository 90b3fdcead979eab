"""Values of a frame file, one at a time: checked, turned into the frame's units, and every fault noted with its place.

A value that is there but cannot be used is noted once and becomes NaN (or the empty text), which passes every later
check silently: one fault makes one message. `None` stands for a key that is absent.
"""

from __future__ import annotations

import math
from collections.abc import Collection, Mapping
from dataclasses import dataclass
from typing import TypeVar

from crosscheck.frame.locate import Lines, Path, dotted
from crosscheck.frame.units import (
    ANGLE,
    FORCE,
    LENGTH,
    LINE_LOAD,
    MOMENT,
    PLAIN,
    STRESS,
    Dimension,
    Quantity,
    Scale,
    UnitError,
    dimension_name,
    quantity,
)
from crosscheck.problems import Problem, nearest

Table = Mapping[str, object]
Named = TypeVar("Named")

UNUSABLE = math.nan
"""Stated, but unusable, and already noted."""

LARGEST = 1e50
"""Beyond this (and below its inverse, but for zero) a number is no dimension or load in any unit."""

FEW = 8
"""Valid names that a message lists."""

MOST_SUGGESTIONS = 20
"""Names for which the nearest valid one is looked up in one file: each costs a walk over all the valid names."""

@dataclass(frozen=True, slots=True)
class Kind:
    """What a number must be. bare: what a number without a unit means ("" where it must have one).

    degrees: the value is kept in degrees, not radians.
    """

    name: str
    dimensions: tuple[Dimension, ...]
    example: str
    bare: str = "frame"
    degrees: bool = False


A_LENGTH = Kind("a length", (LENGTH,), "2.5 m")
AN_AREA = Kind("an area", (Dimension(length=2),), "53.8 cm^2")
AN_INERTIA = Kind("a second moment of area (length^4)", (Dimension(length=4),), "8360 cm^4")
A_STRESS = Kind("a stress", (STRESS,), "210 GPa")
A_FORCE = Kind("a force", (FORCE,), "12 kN")
A_COUPLE = Kind("a moment", (MOMENT,), "25 kN m")
A_LINE_LOAD = Kind("a force per length", (LINE_LOAD,), "8.5 kN/m")
A_SPRING = Kind("a stiffness (force per length)", (LINE_LOAD,), "12 kN/mm")
A_TURN_SPRING = Kind(
    "a rotational stiffness (moment per radian)", (Dimension(1, 1, 0, -1, 0), MOMENT), "4500 kN m/rad"
)
AN_EXPANSION = Kind("an expansion per degree", (Dimension(temperature=-1),), "12e-6 /K")
A_TEMPERATURE = Kind("a temperature", (Dimension(temperature=1),), "20 K")
A_DENSITY = Kind(
    "a mass or weight per volume with its unit",
    (Dimension(mass=1, length=-3), Dimension(force=1, length=-3)), "7850 kg/m^3", bare="",
)  # fmt: skip
A_ROTATION = Kind("a rotation", (ANGLE,), "2 mrad", bare="radians")
DEGREES = Kind("an angle in degrees", (ANGLE,), "30 deg", bare="degrees", degrees=True)
A_NUMBER = Kind("a plain number", (PLAIN,), "1.35", bare="plain")
A_PERCENTAGE = Kind("a percentage", (PLAIN,), "40%", bare="per cent")


class Checker:
    """Reads values and keeps the faults of one file; `problems()` gives them with their lines, in the file's order."""

    def __init__(self, scale: Scale, file: str, lines: Lines) -> None:
        self.scale = scale
        self.file = file
        self.lines = lines
        self._faults: list[tuple[Path, str, str]] = []
        self._elsewhere: list[Problem] = []
        self._suggestions = 0

    def note(self, path: Path, says: str, instead: str = "") -> None:
        """Keep a fault: where it is, what is wrong, what would be right."""
        self._faults.append((path, says, instead))

    def note_at(self, place: tuple[str, int | None], path: Path, says: str, instead: str = "") -> None:
        """Keep a fault of a file beside the frame file."""
        self._elsewhere.append(Problem(*place, dotted(path), says, instead))

    @property
    def sound(self) -> bool:
        return not self._faults and not self._elsewhere

    def problems(self) -> list[Problem]:
        """Every fault as a Problem, by line; what has no line of its own comes first."""
        placed = [(*self.lines.nearest(path), path, words) for path, *words in self._faults]
        found = [Problem(file or self.file, line, dotted(path), *words) for file, line, path, words in placed]
        return sorted(dict.fromkeys(found + self._elsewhere), key=lambda p: (p.file != self.file, p.file, p.line or 0))

    def near(self, name: str, valid: Collection[str]) -> str:
        """The nearest valid name as a remedy; only for the first few of a file and for names of a usual length."""
        self._suggestions += 1
        if self._suggestions > MOST_SUGGESTIONS or len(name) > 60:
            return ""
        same = [one for one in valid if one.casefold() == name.casefold()]
        return nearest(same[0] if same else name, valid)

    # Numbers -----------------------------------------------------------------------------------------------------

    def number(self, value: object, kind: Kind, path: Path) -> float:
        """`value` in the frame's units, or UNUSABLE with a fault noted."""
        try:
            found = self._convert(value, kind)
        except UnitError as error:
            self.note(path, str(error), f'give {kind.name}, such as "{kind.example}"')
            return UNUSABLE
        if math.isfinite(found) and (found == 0 or 1 / LARGEST < abs(found) < LARGEST):
            return found
        self.note(path, f"{shown(value)} is not a number that can be worked with", f"give {kind.name}")
        return UNUSABLE

    def _convert(self, value: object, kind: Kind) -> float:
        if isinstance(value, str):
            read = quantity(value)
        elif isinstance(value, int | float) and not isinstance(value, bool):
            read = Quantity(_as_float(value), None)
        else:
            raise UnitError(f"{shown(value)} is not a number")
        if read.unit is None:
            if not kind.bare:
                raise UnitError(f"{shown(value)} has no unit")
            return read.value
        if read.unit.dimension not in kind.dimensions:
            raise UnitError(f"{shown(value)} is {dimension_name(read.unit.dimension)}, not {kind.name}")
        return _in_degrees(read) if kind.degrees else self.scale.to_frame(read.value, read.unit)

    def get(self, table: Table, key: str, kind: Kind, path: Path) -> float | None:
        """The number under `key`, or None where it is absent."""
        value = table.get(key)
        return None if value is None else self.number(value, kind, (*path, key))

    def positive(self, table: Table, key: str, kind: Kind, path: Path) -> float | None:
        """As `get`, and above zero."""
        found = self.get(table, key, kind, path)
        if found is not None and found <= 0:
            self.note((*path, key), f"{shown(table[key])} is not above zero", f"give {kind.name} above zero")
            return UNUSABLE
        return found

    def wanted(self, table: Table, key: str, kind: Kind, path: Path) -> float:
        """As `positive`, for a key that must be there."""
        found = self.positive(table, key, kind, path)
        if found is None:
            self.note(path, f"{key} is missing", f'give {key}, {kind.name}, such as {key} = "{kind.example}"')
            return UNUSABLE
        return found

    def percentage(self, text: str, path: Path) -> float:
        """"40%", or "40", as 0.4."""
        bare = text.rstrip().removesuffix("%")
        return self.number(bare, A_PERCENTAGE, path) / 100

    def share(self, value: object, path: Path) -> float:
        """A share as a plain number, or as a percentage: 0.005 or "0.5%"."""
        if isinstance(value, str) and value.rstrip().endswith("%"):
            return self.percentage(value, path)
        return self.number(value, A_NUMBER, path)

    # Words, tables and keys --------------------------------------------------------------------------------------

    def word(self, value: object, words: Collection[str], path: Path) -> str:
        """`value`, which must be one of `words`; "" with a fault noted otherwise."""
        if isinstance(value, str) and value in words:
            return value
        near = self.near(value, words) if isinstance(value, str) else ""
        listed = ", ".join(f'"{word}"' for word in words)
        self.note(path, f"{shown(value)} is none of {listed}", near)
        return ""

    def name(self, value: object, valid: Collection[str] | None, what: str, path: Path) -> str:
        """`value`, which must name one of `valid`; "" with a fault noted otherwise.

        `valid` is None where the names could not be read at all, which is a fault of its own: every name passes as "".
        """
        if isinstance(value, str):
            if valid is None:
                return ""
            if value in valid:
                return value
            few = f"there are {', '.join(map(shown, valid))}" if 0 < len(valid) <= FEW else ""
            self.note(path, f"there is no {what} {shown(value)}", self.near(value, valid) or few)
        else:
            self.note(path, f"{shown(value)} is not the name of a {what}", f"give the name of a {what} in quotes")
        return ""

    def table(self, value: object, path: Path, such_as: str) -> Table | None:
        """`value` as a table, or None with a fault noted."""
        if isinstance(value, dict):
            return value
        self.note(path, f"{shown(value)} is not a table", f"write {such_as}, say")
        return None

    def only(self, table: Table, keys: Collection[str], path: Path, what: str) -> None:
        """Note every key of `table` that is not among `keys`."""
        for key in table:
            if key not in keys:
                listed = "known are " + ", ".join(sorted(keys))
                self.note((*path, key), f"unknown key in {what}", self.near(key, keys) or listed)

    def usable_name(self, name: str, path: Path, what: str) -> None:
        """Note a name that nobody could write or read."""
        if not name.strip() or not name.isprintable() or name != name.strip():
            self.note(path, f"{shown(name)} is no name for a {what}", "use printed characters, no blanks around")


def _as_float(value: int | float) -> float:
    try:
        return float(value)
    except OverflowError:
        return math.inf


def _in_degrees(read: Quantity) -> float:
    """An angle in degrees; a writing in degrees stays exactly what it is."""
    assert read.unit is not None
    degree = quantity("1 deg").unit
    assert degree is not None
    ratio = read.unit.factor / degree.factor
    return read.value * float(ratio)


def shown(value: object) -> str:
    """A value of the file as a message shows it: as TOML writes it, and shortened."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        text = value if len(value) <= 60 else value[:57] + "..."
        return '"' + "".join(c if c.isprintable() else "?" for c in text) + '"'
    if isinstance(value, float):
        return repr(value)
    if isinstance(value, int):
        return str(value) if abs(value) < 10**20 else "a number of more than 20 digits"
    if isinstance(value, dict):
        return "a table"
    if isinstance(value, list):
        return "a list"
    return str(value)
