"""The frame file: TOML text to a checked `Frame` in its own units (README, Frame files).

Everything wrong is collected and raised together as UnusableInput, each fault with its line where that can be known.
What can be questioned but used is kept as a warning; what is merely implausible is left to `inspect`.
"""

from __future__ import annotations

import difflib
import hashlib
import json
import math
import re
import tomllib
from collections.abc import Collection, Mapping
from dataclasses import replace
from pathlib import Path as FilePath
from typing import Literal

from crosscheck.frame.apply import LoadReader, Places
from crosscheck.frame.arithmetic import Value
from crosscheck.frame.combining import combined
from crosscheck.frame.family import of_variant, read_family
from crosscheck.frame.fields import (
    A_DENSITY,
    A_LENGTH,
    A_NUMBER,
    A_PERCENTAGE,
    A_STRESS,
    AN_AREA,
    AN_EXPANSION,
    AN_INERTIA,
    FEW,
    UNUSABLE,
    Checker,
    Table,
    shown,
)
from crosscheck.frame.grid import Grid, read_grid
from crosscheck.frame.include import included_names, nameable, with_includes
from crosscheck.frame.locate import Lines, Path
from crosscheck.frame.model import (
    Analysis,
    Frame,
    Included,
    Joint,
    LoadCase,
    Material,
    Member,
    Section,
    Support,
    Tie,
    Units,
)
from crosscheck.frame.needs import AXIAL, SHEAR, default_axial, order_fault, unmet
from crosscheck.frame.parts import (
    MATERIAL_KEYS,
    MEMBER_KEYS,
    SECTION_KEYS,
    Known,
    Traits,
    read_support,
    read_ties,
    read_traits,
)
from crosscheck.frame.pieces import longest, read_pieces
from crosscheck.frame.states import Things, read_states
from crosscheck.frame.tables import inside, sheet_names, with_tables
from crosscheck.frame.units import Scale, UnitError, frame_units
from crosscheck.problems import Problem, UnusableInput

FILE_KEYS = (
    "title", "units", "materials", "sections", "joints", "members", "supports", "ties", "grid", "loads", "patterns",
    "exclusive", "stiffness", "combinations", "envelopes", "analysis", "include", "tables", "family",
)  # fmt: skip
NO_UNITS = Units("kN", "m", 1e3, 1.0)
"""Taken where a file states none that can be read, which is a fault."""
ANALYSIS_KEYS = ("axial", "shear", "order", "tolerance")
NEEDED = {
    "materials": '[materials.steel] with E = "210 GPa"', "sections": '[sections.post] with I = "8360 cm^4"',
    "joints": "[joints] with A = [0, 0]", "members": '[members] with "A-B" = { section = "post", material = "steel" }',
}  # fmt: skip

MOST_BYTES = 100_000_000
"""A frame of a million members is smaller."""


def read_frame(path: str | FilePath, variant: str = "") -> Frame:
    """The frame in a file, or the one named `variant` of the family in it. Raises UnusableInput with every problem."""
    name = str(path)
    try:
        data = _bytes(FilePath(path))
    except (OSError, ValueError) as error:
        raise UnusableInput([_cannot_open(FilePath(path), name, error)]) from None
    return _read(_decoded(data, name), name, hashlib.sha256(data).hexdigest(), FilePath(path).parent, variant)


def read_frame_text(text: str, file: str = "", folder: FilePath | None = None, variant: str = "") -> Frame:
    """The frame in a text; `file` is its name in messages, `folder` where its tables lie (None: it can have none)."""
    return _read(text, file, hashlib.sha256(text.encode("utf-8", "surrogatepass")).hexdigest(), folder, variant)


def variants(path: FilePath) -> tuple[str, ...]:
    """Names of the frames that a family file makes; none where it is no family or cannot be read."""
    try:
        text = _decoded(_bytes(path), str(path))
        data = _parsed(text, str(path)) if "family" in text else {}
        if "family" not in data:
            return ()
        check = Checker(Scale(NO_UNITS), str(path), Lines(text))
        return tuple(read_family(check, data["family"], path.parent))
    except (OSError, ValueError, UnusableInput):
        return ()


def sources(path: FilePath) -> list[FilePath]:
    """The frame file and the tables and files that it draws on, as far as they can be known."""
    try:
        text = _decoded(_bytes(path), str(path))
        data = _parsed(text, str(path)) if any(key in text for key in ("tables", "rows", "include")) else {}
    except (OSError, ValueError, UnusableInput):
        data = {}
    sheets = [path.parent / name for name in sheet_names(data) if inside(path.parent, name)]
    return [path, *sheets, *(path.parent / name for name in included_names(data) if nameable(name))]


def _bytes(path: FilePath) -> bytes:
    with path.open("rb") as stream:
        data = stream.read(MOST_BYTES + 1)
    if len(data) > MOST_BYTES:
        raise ValueError(f"larger than {MOST_BYTES // 10**6} MB")
    return data


def _cannot_open(path: FilePath, name: str, error: OSError | ValueError) -> Problem:
    if isinstance(error, FileNotFoundError):
        return Problem(name, None, "", "there is no such file", _neighbour(path))
    if isinstance(error, IsADirectoryError) or path.is_dir():
        return Problem(name, None, "", "this is a folder, not a frame file", "name a frame file, ending in .toml")
    reason = error.strerror if isinstance(error, OSError) and error.strerror else str(error)
    return Problem(name, None, "", f"the file cannot be read ({reason})")


def _neighbour(path: FilePath) -> str:
    """A file of nearly that name beside it, as a remedy."""
    try:
        names = [p.name for p in sorted(path.parent.glob("*.toml"))[:1000]]
    except (OSError, ValueError):
        return ""
    close = difflib.get_close_matches(path.name, names, n=1)
    return f'did you mean "{path.parent / close[0]}"?' if close else ""


def _decoded(data: bytes, name: str) -> str:
    """UTF-8 text, with or without a byte-order mark."""
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        utf16 = data[:2] in (b"\xff\xfe", b"\xfe\xff")
        says = "the file is in UTF-16" if utf16 else f"byte {data[error.start]:#04x} is not UTF-8"
        raise UnusableInput([Problem(name, line, "", says, "save the file as UTF-8")]) from None


def _read(text: str, file: str, sha256: str, folder: FilePath | None, variant: str) -> Frame:
    text = text.removeprefix("\ufeff")
    return _FrameReader(_parsed(text, file), text, file, sha256).made_up(folder, variant).frame()


def _parsed(text: str, file: str) -> Table:
    if not text.strip():
        raise UnusableInput([Problem(file, None, "", "the file is empty", "`crosscheck draft` writes a first one")])
    try:
        return tomllib.loads(text)
    except RecursionError:
        raise UnusableInput([Problem(file, None, "", "lists or tables nested too deeply")]) from None
    except ValueError as error:
        raise UnusableInput([_not_toml(str(error), text, file)]) from None


_TOML_HINTS = {
    "Cannot overwrite a value": "a key may stand only once in its table",
    "Cannot declare": "a table may be opened only once",
    "Unclosed array": "close the list with ]",
    "Expected '=' after a key": "a line is key = value, or [table]",
    "Invalid value": 'put text in quotes, such as "fixed"',
    "Unbalanced": "an inline table { ... } stands on one line",
    "Invalid initial character for a key part": "an inline table { ... } stands on one line, without a last comma",
    "Unescaped '\\' in a string": "write \\\\ for a backslash, or use single quotes",
    "Illegal character": "close the quotes on the same line",
    "Unterminated string": "close the quotes",
}


def _not_toml(message: str, text: str, file: str) -> Problem:
    """tomllib's message with its line; a hint where the usual cause is known."""
    place = re.search(r"\s*\(at line (\d+), column (\d+)\)$", message)
    line = int(place.group(1)) if place else text.rstrip().count("\n") + 1 if "end of document" in message else None
    says = re.sub(r"\s*\(at .*\)$", "", message)
    hint = next((hint for start, hint in _TOML_HINTS.items() if says.startswith(start)), "")
    return Problem(file, line, "", f"not TOML: {says}", hint)


def _checksum(text: str, sums: list[str]) -> str:
    """SHA-256 of a text with plain line ends, and of the tables that belong to it."""
    plain = text.replace("\r\n", "\n")
    whole = "\n".join([plain, *sums]) if sums else plain
    return hashlib.sha256(whole.encode("utf-8", "surrogatepass")).hexdigest()


class _FrameReader:
    """Reads the tables of one file in turn; each method takes what the earlier ones gave."""

    def __init__(self, data: Table, text: str, file: str, sha256: str) -> None:
        self.data, self.text, self.file, self.sha256 = data, text, file, sha256
        self.content = self.variant = ""
        self.includes: tuple[Included, ...] = ()
        self.lines = Lines(text)
        units, fault = self._units()
        self.units = units
        self.check = Checker(Scale(units), file, self.lines)
        if fault:
            self.check.note(*fault)

    def _units(self) -> tuple[Units, tuple[Path, str, str] | None]:
        """The frame's units; kN m, with the fault, where they cannot be read."""
        value = self.data.get("units")
        fallback, such_as = NO_UNITS, 'give units = "kN m", or another force and length'
        if value is None:
            return fallback, ((), "units is missing: it says what bare numbers mean", such_as)
        try:
            if not isinstance(value, str):
                raise UnitError(f"{shown(value)} is not a text")
            return frame_units(value), None
        except UnitError as error:
            return fallback, (("units",), str(error), such_as)

    def made_up(self, folder: FilePath | None, variant: str) -> _FrameReader:
        """The same, tables beside it and the parameters of the chosen variant put in. Raises UnusableInput."""
        sums: list[str] = []
        if "tables" in self.data:
            self.data, sums = with_tables(self.check, self.data, folder)
        if "include" in self.data:
            self.data, self.includes = with_includes(self.check, self.data, folder)
            sums = [*sums, *(one.sha256 for one in self.includes)]
        self.content = _checksum(self.text, sums)
        if "family" in self.data:
            self._choose(read_family(self.check, self.data["family"], folder), variant)
        elif variant:
            self.check.note((), f"there is no [family] with a variant {shown(variant)}", "leave --variant out")
        if sums or self.variant or "tables" in self.data or "family" in self.data:
            self._must_be_sound()
        return self

    def _choose(self, family: Mapping[str, Mapping[str, Value]], variant: str) -> None:
        """Takes one frame of the family."""
        if family and variant in family:
            self.variant = variant
            self.data = of_variant(self.check, self.data, variant, family)
            sums = [one.sha256 for one in self.includes]
            self.content = _checksum(json.dumps(self.data, sort_keys=True, default=str), sums)
        elif family:
            says = f"there is no variant {shown(variant)}" if variant else f"the file makes {len(family)} frames"
            few = ", ".join(list(family)[:FEW]) + (", ..." if len(family) > FEW else "")
            near = self.check.near(variant, family) if variant else ""
            self.check.note(("family",), says, near or f"choose one with --variant: {few}")

    def _must_be_sound(self) -> None:
        """What is made up wrongly would make every later message misleading."""
        if not self.check.sound:
            raise UnusableInput(self.check.problems())

    def frame(self) -> Frame:
        """Everything read and checked. Raises UnusableInput."""
        check = self.check
        check.only(self.data, FILE_KEYS, (), "a frame file")
        self._tables_there()
        materials = {name: self._material(name, value) for name, value in self._entries("materials")}
        sections = {name: self._section(name, value) for name, value in self._entries("sections")}
        known = Known(self._known("sections", sections), self._known("materials", materials))
        grid = read_grid(check, self.data["grid"], known) if "grid" in self.data else Grid()
        joints = self._joints(grid)
        members = self._members(grid, joints, known)
        supports = self._supports(grid, joints)
        places = self._places(grid, joints, members, supports)
        stated = self._cases(places)
        states = read_states(check, self.data.get("stiffness", {}), self._things(members, known, supports, grid))
        valid = members if places.members_known else None
        made = combined(check, self.data, stated, valid, grid.member_groups, states)
        frame = Frame(
            title=self._title(), units=self.units, materials=materials, sections=sections, joints=joints,
            members=members, supports=supports, cases=made.cases, combinations=made.combinations,
            analysis=Analysis(), states=states, patterns=made.patterns, exclusive=made.exclusive,
            envelopes=made.envelopes, ties=self._ties(places), includes=self.includes, parted=made.parted,
            file=self.file, sha256=self.sha256, content=self.content, variant=self.variant,
            lines=self.lines,
        )  # fmt: skip
        return self._settled(frame, places)

    def _settled(self, frame: Frame, places: Places) -> Frame:
        """The frame with its idealisation, when nothing is wrong with it."""
        default, warning = default_axial(frame)
        stated = self._analysis(default)
        frame = replace(frame, analysis=stated)
        for fault in unmet(frame):
            self.check.note(*fault)
        if not self.check.sound:
            raise UnusableInput(self.check.problems())
        warnings = [] if stated.axial_stated or not warning else [warning]
        return replace(frame, warnings=(*warnings, *_questions(frame, places.loose)))

    # The file's tables -------------------------------------------------------------------------------------------

    def _tables_there(self) -> None:
        """Notes each table that a frame cannot do without; a grid stands for joints and members."""
        for key, such_as in NEEDED.items():
            if self.data.get(key) or (key in ("joints", "members") and "grid" in self.data):
                continue
            if key not in self.data:
                self.check.note((), f"the table [{key}] is missing", f"give {such_as}")
            elif self.data[key] == {}:
                self.check.note((key,), f"the table [{key}] is empty", f"give {such_as}")

    def _known(self, key: str, names: Collection[str]) -> Collection[str] | None:
        """Names of a table that members may use; None where the table itself is missing or unusable."""
        return names if isinstance(self.data.get(key), dict) and names else None

    def _entries(self, key: str) -> list[tuple[str, object]]:
        """The entries of one of the file's tables."""
        table = self.check.table(self.data.get(key, {}), (key,), NEEDED.get(key, f"[{key}]"))
        return [] if table is None else list(table.items())

    def _title(self) -> str:
        title = self.data.get("title", "")
        if isinstance(title, str):
            return title
        self.check.note(("title",), f"{shown(title)} is not a text", "put the title in quotes")
        return ""

    def _material(self, name: str, value: object) -> Material:
        path: Path = ("materials", name)
        check = self.check
        check.usable_name(name, path, "material")
        table = check.table(value, path, NEEDED["materials"])
        if table is None:
            return Material(name, UNUSABLE, UNUSABLE, UNUSABLE, UNUSABLE)
        check.only(table, MATERIAL_KEYS, path, "a material")
        modulus = check.wanted(table, "E", A_STRESS, path)
        shear_modulus = self._shear_modulus(table, modulus, path)
        alpha = check.get(table, "alpha", AN_EXPANSION, path)
        weight = check.get(table, "density", A_DENSITY, path)
        if weight is not None and weight < 0:
            check.note((*path, "density"), f"{shown(table['density'])} is below zero", f"give {A_DENSITY.name}")
        return Material(name, modulus, shear_modulus, alpha, weight)

    def _shear_modulus(self, table: Table, modulus: float, path: Path) -> float | None:
        """G as stated, or E / (2 (1 + nu)) of an isotropic material."""
        stated = self.check.positive(table, "G", A_STRESS, path)
        nu = self.check.get(table, "nu", A_NUMBER, path)
        if nu is None:
            return stated
        if stated is not None:
            self.check.note((*path, "nu"), "G and nu both stated", "give one of the two")
        elif nu <= -1 or nu > 0.5:
            self.check.note((*path, "nu"), f"{shown(table['nu'])} is not between -1 and 0.5", "give nu = 0.3, say")
        else:
            return modulus / (2 * (1 + nu))
        return UNUSABLE

    def _section(self, name: str, value: object) -> Section:
        path: Path = ("sections", name)
        check = self.check
        check.usable_name(name, path, "section")
        table = check.table(value, path, NEEDED["sections"])
        if table is None:
            return Section(name, UNUSABLE, UNUSABLE, UNUSABLE, UNUSABLE)
        check.only(table, SECTION_KEYS, path, "a section")
        return Section(
            name,
            check.wanted(table, "I", AN_INERTIA, path),
            check.positive(table, "A", AN_AREA, path),
            check.positive(table, "shear_area", AN_AREA, path),
            check.positive(table, "depth", A_LENGTH, path),
        )

    # Joints, members, supports -----------------------------------------------------------------------------------

    def _joints(self, grid: Grid) -> dict[str, Joint]:
        joints = {name: Joint(name, x, y) for name, (x, y) in grid.joints.items()}
        for name, value in self._entries("joints"):
            path: Path = ("joints", name)
            self.check.usable_name(name, path, "joint")
            if isinstance(value, list) and len(value) == 2:
                x, y = (self.check.number(v, A_LENGTH, path) for v in value)
            else:
                self.check.note(path, f"{shown(value)} is not a place", "give [x, y]")
                x = y = UNUSABLE
            joints[name] = Joint(name, x, y)
        return joints

    def _members(self, grid: Grid, joints: Mapping[str, Joint], known: Known) -> dict[str, Member]:
        members = {name: traits.member(name, *ends) for name, (*ends, traits) in grid.members.items()}
        valid = joints if joints and grid.whole else None
        for name, value in self._entries("members"):
            members[name] = self._member(name, value, grid, valid, known)
        for member in members.values():
            self._check_length(member, joints)
        return members

    def _member(
        self, name: str, value: object, grid: Grid, joints: Mapping[str, Joint] | None, known: Known
    ) -> Member:
        path: Path = ("members", name)
        self.check.usable_name(name, path, "member")
        table = self.check.table(value, path, '{ section = "post", material = "steel" }')
        if table is None:
            return Traits().member(name, "", "")
        self.check.only(table, MEMBER_KEYS, path, "a member")
        traits = read_traits(self.check, table, path, known)
        start, end, base = grid.members.get(name, ("", "", Traits()))
        if name not in grid.members or "from" in table or "to" in table:
            start, end = self._ends(name, table, path, joints)
        traits = traits.over(base)
        member = traits.member(name, start, end)
        if "profile" in table or "taper" in table:
            pieces = read_pieces(self.check, table, path, known, _length(member, joints or {}))
            member = replace(member, pieces=pieces, section=longest(pieces) if pieces else "")
        elif traits.section is None:
            self.check.note(path, "section is missing", "give section, the name of one in [sections]")
        if traits.material is None:
            self.check.note(path, "material is missing", "give material, the name of one in [materials]")
        return member

    def _ends(self, name: str, table: Table, path: Path, joints: Mapping[str, Joint] | None) -> tuple[str, str]:
        """The joints of a member, stated or from its key; ("", "") with the fault noted where they are not clear."""
        if "from" not in table and "to" not in table:
            return self._split(name, path, joints)
        ends = []
        for key in ("from", "to"):
            if key in table:
                ends.append(self.check.name(table[key], joints, "joint", (*path, key)))
            else:
                self.check.note(path, f"{key} is missing", "give from and to, the names of two joints")
                ends.append("")
        if ends[0] and ends[0] == ends[1]:
            self.check.note(path, f"joins joint {shown(ends[0])} to itself", "give two joints")
        return ends[0], ends[1]

    def _split(self, name: str, path: Path, joints: Mapping[str, Joint] | None) -> tuple[str, str]:
        """A key "A-B" as two joints; of several dashes, the one that parts two joints of the frame."""
        halves = [(name[:k].strip(), name[k + 1 :].strip()) for k, c in enumerate(name) if c == "-"]
        if joints is None and halves:
            return "", ""
        fits = [pair for pair in halves if joints and pair[0] in joints and pair[1] in joints and pair[0] != pair[1]]
        if len(fits) == 1:
            return fits[0]
        self._unsplit(name, halves, fits, path, joints or {})
        return "", ""

    def _unsplit(
        self, name: str, halves: list[tuple[str, str]], fits: list[tuple[str, str]], path: Path, joints: Collection[str]
    ) -> None:
        if not halves:
            self.check.note(path, "from and to are missing", 'give from and to, or a key such as "A-B"')
        elif fits:
            readings = " or ".join(f"{shown(a)} to {shown(b)}" for a, b in fits)
            self.check.note(path, f"may mean {readings}", "give from and to")
        elif len(halves) > 1:
            self.check.note(path, "no dash of the key parts two joints of the frame", "give from and to")
        elif halves[0][0] == halves[0][1]:
            self.check.note(path, f"joins joint {shown(halves[0][0])} to itself", "give two joints")
        else:
            for joint in halves[0]:
                if joint not in joints:
                    self.check.note(path, f"there is no joint {shown(joint)}", self.check.near(joint, joints))

    def _check_length(self, member: Member, joints: Mapping[str, Joint]) -> None:
        """Joints apart, and rigid zones that leave something between them."""
        length = _length(member, joints)
        zones = member.rigid_from + member.rigid_to
        stated = self.data.get("members")
        own = isinstance(stated, dict) and member.name in stated
        path: Path = ("members", member.name) if own else ("grid",)
        what = f"member {shown(member.name)}"
        if length == 0:
            says = f"{what} joins {shown(member.joint_from)} and {shown(member.joint_to)}, which are at one place"
            self.check.note(path, says, "a member needs a length: move a joint, or leave the member out")
        elif zones and zones >= length:
            says = f"rigid zones of {zones:.6g} together leave nothing of {what}, {length:.6g} long"
            self.check.note(path, says, "give rigid zones that are shorter than the member")

    def _supports(self, grid: Grid, joints: Mapping[str, Joint]) -> dict[str, Support]:
        supports = dict(grid.supports)
        valid = joints if joints and grid.whole else None
        for name, value in self._entries("supports"):
            path: Path = ("supports", name)
            joint = self.check.name(name, valid, "joint", path)
            support = read_support(self.check, value, path, name)
            if joint or valid is None:
                supports[name] = support
        return supports

    def _places(
        self, grid: Grid, joints: dict[str, Joint], members: dict[str, Member], supports: dict[str, Support]
    ) -> Places:
        joined = {joint for m in members.values() for joint in (m.joint_from, m.joint_to)}
        # A member whose ends are not known may be what joins a joint: then nothing is called loose.
        loose = frozenset() if "" in joined else frozenset(joints) - joined
        return Places(
            joints=joints, members=members, supports=supports,
            # No length is no place for a load: the member is at fault already.
            lengths={m.name: _length(m, joints) or UNUSABLE for m in members.values()},
            joint_groups=grid.joint_groups, member_groups=grid.member_groups, loose=loose,
            joints_known=bool(joints) and grid.whole, members_known=bool(members) and grid.whole,
        )  # fmt: skip

    # Loads, combinations, analysis -------------------------------------------------------------------------------

    def _cases(self, places: Places) -> dict[str, LoadCase]:
        table = self.check.table(self.data.get("loads", {}), ("loads",), "[loads.dead] with apply = [ ... ]")
        if table is None:
            return {}
        loads = LoadReader(self.check, places)
        # A list called exclusive is the groups of cases that exclude each other, no case.
        return {
            name: loads.case(name, value)
            for name, value in table.items()
            if name != "exclusive" or isinstance(value, dict)
        }

    def _things(
        self, members: Mapping[str, Member], known: Known, supports: Mapping[str, Support], grid: Grid
    ) -> Things:
        """What the names of a state of stiffness may mean."""
        valid = members if members and grid.whole else None
        return Things(valid, known.sections, known.materials, supports, grid.member_groups)

    def _ties(self, places: Places) -> dict[str, Tie]:
        joints = places.joints if places.joints_known else None
        return read_ties(self.check, self.data.get("ties", {}), joints, places.joint_groups, places.loose)

    def _analysis(self, default: Literal["elastic", "rigid"]) -> Analysis:
        table = self.check.table(self.data.get("analysis", {}), ("analysis",), '[analysis] with axial = "elastic"')
        if table is None:
            return Analysis(axial=default)
        path: Path = ("analysis",)
        self.check.only(table, ANALYSIS_KEYS, path, "[analysis]")
        axial = self.check.word(table["axial"], AXIAL, (*path, "axial")) if "axial" in table else default
        shear = self.check.word(table["shear"], SHEAR, (*path, "shear")) if "shear" in table else "rigid"
        return Analysis(
            axial="rigid" if axial == "rigid" else "elastic" if axial else default,
            axial_stated="axial" in table,
            shear="elastic" if shear == "elastic" else "rigid",
            order=self._order(table, path),
            tolerance=self._tolerance(table, path),
        )

    def _order(self, table: Table, path: Path) -> Literal[1, 2]:
        order = table.get("order", 1)
        fault = order_fault(order)
        if fault:
            self.check.note((*path, "order"), fault, "give order = 1")
        return 2 if order == 2 else 1

    def _tolerance(self, table: Table, path: Path) -> float:
        """A percentage as a fraction: "1%", "1 %" and the bare number 1 all mean one per cent."""
        value = table.get("tolerance", 1)
        path = (*path, "tolerance")
        if isinstance(value, str):
            share = self.check.percentage(value, path)
        else:
            share = self.check.number(value, A_PERCENTAGE, path) / 100
        if share <= 0 or share >= 1:
            self.check.note(path, f"{shown(value)} is not between 0 and 100 per cent", 'give tolerance = "1%", say')
        return share


def _length(member: Member, joints: Mapping[str, Joint]) -> float:
    """Joint to joint; NaN where a joint is not known."""
    a, b = joints.get(member.joint_from), joints.get(member.joint_to)
    return math.hypot(b.x - a.x, b.y - a.y) if a and b and a is not b else UNUSABLE


def _questions(frame: Frame, loose: Collection[str]) -> list[str]:
    """What is accepted, but should be known to whoever reads the results."""
    found = [f'no member joins joint "{joint}"' for joint in frame.joints if joint in loose]
    if not any(support.x or support.y or support.rotation for support in frame.supports.values()):
        found.append("the frame has no support")
    if not frame.cases:
        found.append("the frame has no load case: there is nothing to compare")
    return found + [f'load case "{case.name}" has no load' for case in frame.cases.values() if not case.loads]
