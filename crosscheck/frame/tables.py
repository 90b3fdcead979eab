"""The `[tables]` table: joints, members, loads and the rest taken from CSV files beside the frame file.

    [tables]
    joints = "joints.csv"            # or a list of files
    members = "members.csv"
    loads = "loads.csv"

A row becomes the entry that could have been written in the frame file, and is read and checked as that; so a table has no
rules of its own but these. The first row holds heads, each the name of a key with the unit of its cells in brackets:
`x (mm)`. A cell may carry a unit of its own; an empty one leaves its key out. Cells are parted by commas, by tabs, or by
semicolons (then a comma in a number is its decimal point). Blank rows and rows that begin with # are passed over.

| table | heads |
| --- | --- |
| `joints` | `name`, `x`, `y` |
| `members` | `name` (left out or empty: the joints' names, "A-B"), `from`, `to`, `section`, `material`, `hinge` ... |
| `supports` | `joint`, and `support` (fixed, pinned, roller) or `x`, `y`, `rotation`, `angle` |
| `sections`, `materials` | `name` and their keys |
| `loads` | `case` and the keys of an entry; `varying.start`, `varying.end`, `settlement.down` stand for a list or a table |

Files lie in the frame's folder or below it; what the frame file states itself is added to, and a name stands once only.
"""

from __future__ import annotations

import csv
import hashlib
import re
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path as FilePath
from pathlib import PurePosixPath, PureWindowsPath

from crosscheck.frame.apply import ENTRY_KEYS
from crosscheck.frame.fields import Checker, Table, shown
from crosscheck.frame.locate import Path
from crosscheck.frame.parts import MATERIAL_KEYS, MEMBER_KEYS, SECTION_KEYS, SUPPORT_KEYS
from crosscheck.frame.units import UnitError, parse_unit

MOST_BYTES = 100_000_000
COLUMNS: dict[str, tuple[frozenset[str], tuple[str, ...]]] = {
    "materials": (frozenset({"name", *MATERIAL_KEYS}), ("name", "E")),
    "sections": (frozenset({"name", *SECTION_KEYS}), ("name", "I")),
    "joints": (frozenset({"name", "x", "y"}), ("name", "x", "y")),
    "members": (frozenset({"name", *MEMBER_KEYS}), ("from", "to")),
    "supports": (frozenset({"joint", "support", *SUPPORT_KEYS}), ("joint",)),
    "loads": (frozenset({"case", *ENTRY_KEYS}), ("case",)),
}
"""Heads that a table may have, and those it must."""

_WORDS = frozenset({
    "name", "from", "to", "joint", "joints", "member", "members", "section", "material", "case", "hinge", "per", "support",
})  # fmt: skip
"""Heads whose cells are names and words, even where they look like numbers."""
_HEAD = re.compile(r"\s*([^()\[\]]+?)\s*(?:[(\[]\s*([^()\[\]]*(?:\([^()]*\)[^()\[\]]*)?)\s*[)\]])?\s*\Z")
_NUMBER = re.compile(r"[+\-−]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?\Z")
_COMMA = re.compile(r"(?<=[0-9]),(?=[0-9])")


class Template(str):
    """A cell with placeholders of a family, to be filled in later; a plain number then takes the column's unit."""

    unit: str

    @classmethod
    def of(cls, text: str, unit: str) -> Template:
        one = cls(text)
        one.unit = unit
        return one


@dataclass(frozen=True, slots=True)
class Row:
    """One row of a CSV file: its 1-based line, and its cells by head."""

    line: int
    cells: dict[str, object]


@dataclass(frozen=True, slots=True)
class Sheet:
    """A CSV file as read. name: as messages show it. sha256: of its text with plain line ends."""

    name: str
    rows: tuple[Row, ...]
    sha256: str


@dataclass(frozen=True, slots=True)
class Head:
    """A column: its key and the unit of its cells, "" where it has none."""

    key: str
    unit: str


def sheet_names(data: Table) -> list[str]:
    """The CSV files that a frame file's text names, right or wrong ones."""
    tables, family = data.get("tables"), data.get("family")
    named: list[object] = []
    for value in tables.values() if isinstance(tables, dict) else ():
        named += value if isinstance(value, list) else [value]
    if isinstance(family, dict):
        named.append(family.get("rows"))
    return [name for name in named if isinstance(name, str)]


def with_tables(check: Checker, data: Table, folder: FilePath | None) -> tuple[Table, list[str]]:
    """The data with every row of its tables as an entry, and the tables' checksums. Faults are noted."""
    named = check.table(data["tables"], ("tables",), '[tables] with joints = "joints.csv"')
    if named is None:
        return data, []
    check.only(named, COLUMNS, ("tables",), "[tables]")
    merged = {key: value for key, value in data.items() if key != "tables"}
    sums = []
    for key in COLUMNS:
        for path, name in _files(check, named.get(key, []), ("tables", key)):
            sheet = read_sheet(check, name, folder, path, *COLUMNS[key])
            if sheet is not None:
                merged[key] = _joined(check, key, merged.get(key, {}), sheet)
                sums.append(sheet.sha256)
    return merged, sums


def _files(check: Checker, value: object, path: Path) -> Iterator[tuple[Path, str]]:
    several = value if isinstance(value, list) else [value]
    for k, name in enumerate(several):
        place = (*path, k) if isinstance(value, list) else path
        if isinstance(name, str):
            yield place, name
        else:
            check.note(place, f"{shown(name)} is not the name of a file", 'give "joints.csv", say')


# --- rows to entries


def _joined(check: Checker, key: str, stated: object, sheet: Sheet) -> object:
    """One of the file's tables with a sheet's rows added; as it stands where it is no table (a fault noted later)."""
    if not isinstance(stated, dict):
        return stated
    if key == "loads":
        return _with_loads(check, stated, sheet)
    entries = dict(stated)
    for row in sheet.rows:
        name = _name(key, row)
        path = (key, name)
        place = (sheet.name, row.line)
        if name in entries:
            first = check.lines.beside.get(path)
            where = f"{first[0]}:{first[1]}" if first else "the frame file"
            check.note_at(place, path, f"{shown(name)} stands in {where} already", "a name stands once only")
            continue
        check.lines.beside[path] = place
        entries[name] = _entry(key, row.cells)
    return entries


def _name(key: str, row: Row) -> str:
    own = row.cells.get("joint" if key == "supports" else "name", "")
    return str(own or (f"{row.cells.get('from', '')}-{row.cells.get('to', '')}" if key == "members" else ""))


def _entry(key: str, cells: Mapping[str, object]) -> object:
    if key == "joints":
        return [cells.get("x", ""), cells.get("y", "")]
    if key == "supports":
        own = {k: v for k, v in cells.items() if k not in ("joint", "support")}
        word = cells.get("support")
        # Both at once is a fault, which the reader of supports finds.
        return own if word is None else {**own, "support": word} if own else word
    return {k: v for k, v in cells.items() if k != "name"}


def _with_loads(check: Checker, stated: Table, sheet: Sheet) -> Table:
    """Load cases with a sheet's rows appended to their entries."""
    cases = dict(stated)
    lists: dict[str, list[object]] = {}
    for row in sheet.rows:
        name = str(row.cells.get("case", ""))
        if name not in lists:
            case = cases.get(name, {})
            entries = case.get("apply", []) if isinstance(case, dict) else None
            if not isinstance(entries, list):
                continue
            lists[name] = list(entries)
            cases[name] = {**(case if isinstance(case, dict) else {}), "apply": lists[name]}
            check.lines.beside.setdefault(("loads", name), (sheet.name, row.line))
        check.lines.beside[("loads", name, "apply", len(lists[name]))] = (sheet.name, row.line)
        lists[name].append({k: v for k, v in row.cells.items() if k != "case"})
    return cases


# --- the file


def read_sheet(
    check: Checker, name: str, folder: FilePath | None, path: Path, known: Iterable[str] | None, needed: Iterable[str]
) -> Sheet | None:
    """A CSV file of the frame's folder; None, with the fault noted, where it cannot be used.

    known: heads it may have, None for any. needed: heads it must have.
    """
    text = _text(check, name, folder, path)
    if text is None:
        return None
    file = (FilePath(check.file).parent / name).as_posix()
    rows = _split(check, text, file, path)
    if not rows:
        check.note_at((file, 1), path, "the table is empty", "give a row of heads, and rows below it")
        return None
    (line, cells), *below = rows
    heads = _heads(check, cells, (file, line), path, None if known is None else frozenset(known), tuple(needed))
    if heads is None:
        return None
    comma = _delimiter(text) == ";"
    body = tuple(_row(check, heads, number, row, (file, number), path, comma) for number, row in below)
    return Sheet(file, tuple(r for r in body if r is not None), hashlib.sha256(text.encode()).hexdigest())


def _text(check: Checker, name: str, folder: FilePath | None, path: Path) -> str | None:
    """The file's text with plain line ends; None with a fault noted."""
    if folder is None:
        check.note(path, "a frame that is no file has no folder for tables", "save the frame file, beside its tables")
        return None
    if not inside(folder, name):
        advice = 'give a file in the frame\'s folder or below it, such as "tables/joints.csv"'
        check.note(path, f"{shown(name)} is not in the frame's folder", advice)
        return None
    try:
        with (folder / name).open("rb") as stream:
            data = stream.read(MOST_BYTES + 1)
        if len(data) > MOST_BYTES:
            raise ValueError(f"larger than {MOST_BYTES // 10**6} MB")
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError:
        check.note(path, f"{shown(name)} is not UTF-8", "save it as UTF-8 (CSV UTF-8 in a spreadsheet program)")
        return None
    except (OSError, ValueError) as error:
        reason = (error.strerror if isinstance(error, OSError) else None) or str(error)
        check.note(path, f"{shown(name)} cannot be read ({reason})", "give the name of a CSV file beside the frame file")
        return None
    return text.replace("\r\n", "\n").replace("\r", "\n")


def inside(folder: FilePath, name: str) -> bool:
    """Whether a name means a file in the folder or below it, on every system and with links followed."""
    if not name.strip() or "\\" in name or PurePosixPath(name).is_absolute() or PureWindowsPath(name).drive:
        return False
    if ".." in PurePosixPath(name).parts or "\0" in name:
        return False
    try:
        return (folder / name).resolve().is_relative_to(folder.resolve())
    except (OSError, RuntimeError):
        return False


def _delimiter(text: str) -> str:
    """What parts the cells of the row of heads."""
    head = next((line for line in text.split("\n") if line.strip() and not line.lstrip().startswith("#")), "")
    return next((mark for mark in ("\t", ";") if mark in head), ",")


def _split(check: Checker, text: str, file: str, path: Path) -> list[tuple[int, list[str]]]:
    """Rows with the line each begins on, without blank ones and remarks."""
    rows: list[tuple[int, list[str]]] = []
    reader = csv.reader(text.split("\n"), delimiter=_delimiter(text), strict=True, skipinitialspace=True)
    line = 1
    try:
        for cells in reader:
            if any(c.strip() for c in cells) and not cells[0].lstrip().startswith("#"):
                rows.append((line, cells))
            line = reader.line_num + 1
    except csv.Error as error:
        check.note_at((file, line), path, f"not a CSV row ({error})", "close the quotes")
    return rows


def _heads(
    check: Checker, cells: list[str], place: tuple[str, int], path: Path, known: frozenset[str] | None,
    needed: tuple[str, ...],
) -> list[Head] | None:  # fmt: skip
    """The columns; None with faults noted where one is not understood: every row would be at fault with it."""
    found = [_head(check, text, place, path) for text in cells]
    heads = [head for head in found if head is not None]
    sound = len(heads) == len(found)
    keys = [head.key for head in heads if head.key]
    for key in dict.fromkeys(keys):
        if known is not None and key.split(".")[0] not in known:
            advice = check.near(key, known) or f"known are {', '.join(sorted(known))}"
            check.note_at(place, path, f"there is no use for a column {shown(key)}", advice)
            sound = False
        elif keys.count(key) > 1:
            check.note_at(place, path, f"two columns {shown(key)}", "give each once")
            sound = False
    for key in needed:
        if key not in keys and sound:
            check.note_at(place, path, f"the column {shown(key)} is missing", f"give a head {key}")
            sound = False
    return heads if sound else None


def _head(check: Checker, text: str, place: tuple[str, int], path: Path) -> Head | None:
    if not text.strip():
        return Head("", "")
    match = _HEAD.match(text)
    if match:
        key, unit = match.group(1), (match.group(2) or "").strip()
        try:
            if unit and unit != "%":
                parse_unit(unit)
            return Head(key, unit)
        except UnitError:
            pass
    check.note_at(place, path, f"the head {shown(text)} is not understood", "write a key and its unit, such as x (mm)")
    return None


def _row(
    check: Checker, heads: list[Head], line: int, cells: list[str], place: tuple[str, int], path: Path, comma: bool
) -> Row | None:
    if len(cells) > len(heads) and any(c.strip() for c in cells[len(heads) :]):
        check.note_at(place, path, f"{len(cells)} cells below {len(heads)} heads", "give one cell a head")
        return None
    out: dict[str, object] = {}
    for head, text in zip(heads, cells, strict=False):
        if not text.strip():
            continue
        if not head.key:
            check.note_at(place, path, f"{shown(text.strip())} stands below no head", "name the column")
            return None
        _put(out, head.key, _cell(head, text.strip(), comma))
    return Row(line, out)


def _cell(head: Head, text: str, comma: bool) -> object:
    """A cell as the frame file would have it: a number, a number with its unit, or a text."""
    if head.key in _WORDS:
        return text.split("|") if head.key in ("members", "joints") and "|" in text else text
    if comma:
        text = _COMMA.sub(".", text)
    if _NUMBER.match(text):
        return f"{text}{head.unit}" if head.unit == "%" else f"{text} {head.unit}" if head.unit else _float(text)
    return Template.of(text, head.unit) if "{" in text and head.unit else text


def _float(text: str) -> float:
    return float(text.replace("−", "-"))


def _put(out: dict[str, object], key: str, value: object) -> None:
    """Under its key; "varying.start" and "varying.end" make a list, "settlement.down" a table."""
    outer, dot, inner = key.partition(".")
    if not dot:
        out[key] = value
    elif outer == "varying" and inner in ("start", "end"):
        pair = out.setdefault(outer, ["", ""])
        if isinstance(pair, list):
            pair[inner == "end"] = value
    else:
        table = out.setdefault(outer, {})
        if isinstance(table, dict):
            table[inner] = value
