"""The `[family]` table: many frames from one file, each with its own name, and its own values on record.

    [family]
    span = "6 to 12 m by 2"          # a range, or a list: [6, 8, 10, 12], ["6 m", "8 m"], ["deep", "light"]
    pitch = [10, 15]                 # every span with every pitch: eight frames
    eaves = "4.2 m"
    ridge = "{eaves + span / 2 * tan(pitch)}"   # what follows from those above it
    name = "span {span} pitch {pitch}"   # of each frame; left out: span-6m-pitch-10

    [joints]
    B = [0, "{eaves}"]
    C = ["{span / 2}", "{ridge}"]

A placeholder in braces stands anywhere in a text of the file (or a cell of its tables) and holds a parameter or plain
arithmetic on parameters (crosscheck/frame/arithmetic.py); a text that is one placeholder becomes its number. Units are
carried along: "{span / 2}" of "6 m" is "3 m". Braces that are meant as such are doubled.

`rows = "sizes.csv"` takes parameters from a CSV file beside the frame file, one row a frame, its heads naming parameters
with their units, "span (m)"; a column `name` names the frames.
"""

from __future__ import annotations

import itertools
import keyword
import re
from collections.abc import Iterator, Mapping
from pathlib import Path as FilePath

from crosscheck.frame.arithmetic import FUNCTIONS, Amount, ArithmeticFault, Value, evaluate
from crosscheck.frame.fields import Checker, Table, shown
from crosscheck.frame.locate import Path
from crosscheck.frame.tables import Template, read_sheet
from crosscheck.frame.units import UnitError, quantity

MOST = 10_000
"""Frames that one file may make."""
RESERVED = ("claim", "record", "accepted", "reading")
"""Names that mean something else in the names of files beside a frame."""

PATH: Path = ("family",)
_NUM = r"[+\-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?"
_RANGE = re.compile(rf"\s*({_NUM})\s*(.*?)\s+to\s+({_NUM})\s*(.*?)\s+by\s+({_NUM})\s*(.*?)\s*\Z", re.DOTALL)
_PLACEHOLDER = re.compile(r"\{\{|\}\}|\{([^{}]*)\}|[{}]")

Parameters = Mapping[str, Value]


def read_family(check: Checker, value: object, folder: FilePath | None) -> dict[str, Parameters]:
    """Parameters of every frame of the family by the frame's name; empty, with faults noted, where there is none."""
    table = check.table(value, PATH, '[family] with span = "6 to 12 m by 2"')
    if table is None:
        return {}
    lists, derived = _stated(check, table)
    rows = _rows(check, table["rows"], folder) if "rows" in table else [{}]
    if not check.sound:
        return {}
    count = len(rows)
    for values in lists.values():
        count *= len(values)
    if count > MOST or not count:
        check.note(PATH, f"makes {count:,} frames", f"make from 1 to {MOST:,}")
        return {}
    varied = [*dict.fromkeys(k for row in rows for k in row if k != "name"),
              *(k for k, v in lists.items() if len(v) > 1)]  # fmt: skip
    if not varied:
        check.note(PATH, "holds no parameter that varies", 'give span = "6 to 12 m by 2", say')
        return {}
    return _named(check, table.get("name"), varied, list(_combined(check, rows, lists, derived)))


def _stated(check: Checker, table: Table) -> tuple[dict[str, list[Value]], dict[str, str]]:
    """Parameters with their values, and those that follow from others."""
    lists: dict[str, list[Value]] = {}
    derived: dict[str, str] = {}
    for key, value in table.items():
        path = (*PATH, key)
        if key in ("name", "rows"):
            continue
        _usable(check, key, path)
        if isinstance(value, str) and "{" in value:
            derived[key] = value
        else:
            lists[key] = _values(check, value, path)
    return lists, derived


def _usable(check: Checker, key: str, path: Path) -> None:
    if not key.isidentifier() or keyword.iskeyword(key) or key in FUNCTIONS:
        check.note(path, f"{shown(key)} is no name for a parameter", "use letters, digits and _, beginning with a letter")


def _values(check: Checker, value: object, path: Path) -> list[Value]:
    if isinstance(value, str) and (match := _RANGE.match(value)):
        return list(_range(check, match, value, path))
    if isinstance(value, list):
        return [_single(check, v, (*path, k)) for k, v in enumerate(value)]
    return [_single(check, value, path)]


def _single(check: Checker, value: object, path: Path) -> Value:
    if isinstance(value, int | float) and not isinstance(value, bool) and abs(value) < 1e50:
        return Amount(float(value))
    if isinstance(value, str) and value.strip() and value.isprintable():
        return _amount(value)
    check.note(path, f"{shown(value)} is no value for a parameter", 'give a number, "6 m" or a name')
    return ""


def _amount(text: str) -> Value:
    """A number with its unit where the text is one, else the text."""
    try:
        read = quantity(text)
    except UnitError:
        return text.strip()
    return Amount(read.value, read.unit.text if read.unit else "")


def _range(check: Checker, match: re.Match[str], text: str, path: Path) -> Iterator[Value]:
    """From the first number to the last, both ends included where a step meets them."""
    first, last, step = (float(match.group(k)) for k in (1, 3, 5))
    units = sorted({u for k in (2, 4, 6) if (u := match.group(k).strip())})
    if len(units) > 1:
        check.note(path, f"{shown(text)} mixes {' and '.join(units)}", "state one unit, once")
        return
    if step <= 0 or abs(last - first) / step > MOST:
        check.note(path, f"{shown(text)} has no sensible step", 'give "6 to 12 m by 2", say')
        return
    unit = units[0] if units else ""
    if not isinstance(_amount(f"1 {unit}"), Amount):
        check.note(path, f"{shown(unit)} is not a unit", 'give "6 to 12 m by 2", say')
        return
    way = 1.0 if last >= first else -1.0
    for k in range(int(abs(last - first) / step + 1e-9) + 1):
        # Twelve digits: 0.1 to 0.5 by 0.1 must not name a frame 0.30000000000000004.
        yield Amount(float(f"{first + way * k * step:.12g}"), unit)


def _rows(check: Checker, value: object, folder: FilePath | None) -> list[dict[str, Value]]:
    path = (*PATH, "rows")
    if not isinstance(value, str):
        check.note(path, f"{shown(value)} is not the name of a file", 'give rows = "sizes.csv"')
        return []
    sheet = read_sheet(check, value, folder, path, None, ())
    rows: list[dict[str, Value]] = []
    for row in sheet.rows if sheet else ():
        for key in row.cells:
            if key != "name" and not rows:
                _usable(check, key, path)
        rows.append({k: _single(check, v, path) for k, v in row.cells.items()})
        if rows[0].keys() != rows[-1].keys():
            check.note_at((sheet.name if sheet else "", row.line), path, "a cell is empty", "give every parameter")
    return rows


def _combined(
    check: Checker, rows: list[dict[str, Value]], lists: Mapping[str, list[Value]], derived: Mapping[str, str]
) -> Iterator[dict[str, Value]]:
    """Every row with every combination of the lists' values, and what follows from them."""
    for row in rows:
        for values in itertools.product(*lists.values()):
            found: dict[str, Value] = {**row, **dict(zip(lists, values, strict=True))}
            for key, text in derived.items():
                filled = _filled(check, text, found, (*PATH, key))
                found[key] = Amount(float(filled)) if isinstance(filled, int | float) else _amount(filled)
            if not check.sound:
                return
            yield found


def _named(
    check: Checker, template: object, varied: list[str], combinations: list[dict[str, Value]]
) -> dict[str, Parameters]:
    """Each combination under its name."""
    path = (*PATH, "name")
    if template is not None and (not isinstance(template, str) or not template.strip()):
        check.note(path, f"{shown(template)} is no name", 'give name = "span {span}", say')
        return {}
    text = template or "-".join(f"{key}-{{{key}}}" for key in varied)
    out: dict[str, Parameters] = {}
    taken: dict[str, str] = {}
    for found in combinations:
        own = found.pop("name", None)
        name = _as_file_name(str(own) if own is not None else str(_filled(check, text, found, path)))
        # Case is nothing to many file systems, so it may not be all that tells two records apart.
        if not name.strip(".") or name.casefold() in taken or name in RESERVED:
            says = f"{shown(name)} names more than one frame" if name.casefold() in taken else f"{shown(name)} is no name"
            check.note(path, says, "let the name hold every parameter that varies")
            return {}
        taken[name.casefold()] = name
        out[name] = found
    return out if check.sound else {}


def _as_file_name(text: str) -> str:
    """Without blanks between a number and its unit, and with nothing that a file system somewhere refuses."""
    text = re.sub(r"(?<=[0-9]) (?=[A-Za-z°μ])", "", text.strip())
    return re.sub(r"[^\w.+-]+", "-", text.replace("/", "_"))[:100].strip("-")


# --- filling in


def of_variant(check: Checker, data: Table, name: str, family: Mapping[str, Parameters]) -> Table:
    """The frame file's data with the parameters of one frame of the family filled in."""
    rest = {key: value for key, value in data.items() if key != "family"}
    parameters = family[name]
    filled = {key: _fill(check, value, parameters, (key,)) for key, value in rest.items()}
    title = rest.get("title", "")
    if isinstance(title, str) and filled.get("title", "") == title:
        filled["title"] = f"{title} ({name})" if title else name
    return filled


def _fill(check: Checker, value: object, parameters: Parameters, path: Path) -> object:
    if isinstance(value, str):
        found = _filled(check, value, parameters, path) if "{" in value or "}" in value else value
        return f"{found} {value.unit}" if isinstance(value, Template) and not isinstance(found, str) else found
    if isinstance(value, dict):
        return {key: _fill(check, v, parameters, (*path, key)) for key, v in value.items()}
    if isinstance(value, list):
        return [_fill(check, v, parameters, (*path, k)) for k, v in enumerate(value)]
    return value


def _filled(check: Checker, text: str, parameters: Parameters, path: Path) -> str | int | float:
    """A text with its placeholders filled in; a number where it is one placeholder without a unit."""
    try:
        whole = _PLACEHOLDER.fullmatch(text.strip())
        if whole and whole.group(1) is not None:
            found = evaluate(whole.group(1), parameters)
            return _plain(found.value) if isinstance(found, Amount) and not found.unit else str(found)
        return _PLACEHOLDER.sub(lambda m: _piece(m, parameters), text)
    except ArithmeticFault as fault:
        check.note(path, f"{shown(text)}: {fault}", "write {span} or {span / 2}, of parameters in [family]")
        return text


def _piece(match: re.Match[str], parameters: Parameters) -> str:
    if match.group() in ("{{", "}}"):
        return match.group()[0]
    if match.group(1) is None:
        raise ArithmeticFault("a single brace")
    return str(evaluate(match.group(1), parameters))


def _plain(value: float) -> int | float:
    """Whole numbers as such, for keys that want one."""
    return int(value) if value.is_integer() and abs(value) < 1e15 else value
