"""`include = ["office-sections.toml"]`: sections and materials from files that an office keeps for many frames.

An included file holds [sections] and [materials] and may state its own `units`, which bare numbers in it then have. What it
says is read and checked as if it stood in the frame file; a name stands once only. The file is named from the frame
file's folder, and may lie above it; a name from the root of a disk or of another machine is refused.
"""

from __future__ import annotations

import hashlib
import tomllib
from pathlib import Path as FilePath
from pathlib import PurePosixPath, PureWindowsPath

from crosscheck.frame.fields import Checker, Table, shown
from crosscheck.frame.locate import Lines, Path
from crosscheck.frame.model import Included, Units
from crosscheck.frame.units import UnitError, frame_units

MOST_BYTES = 10_000_000
KEYS = ("title", "units", "sections", "materials")
UNIT_OF = {
    "E": "{f}/{l}^2", "G": "{f}/{l}^2", "I": "{l}^4", "A": "{l}^2", "shear_area": "{l}^2", "depth": "{l}",
}  # fmt: skip
"""What a bare number of an included file means, in that file's force f and length l."""


def included_names(data: Table) -> list[str]:
    """The files that a frame file's text includes, right or wrong ones."""
    value = data.get("include")
    return [name for name in (value if isinstance(value, list) else [value]) if isinstance(name, str)]


def nameable(name: str) -> bool:
    """Whether a name may be of an included file: relative, in TOML, the same on every system."""
    path = PurePosixPath(name)
    plain = bool(name.strip()) and not set(name) & {"\\", "\0"} and not PureWindowsPath(name).drive
    return plain and not path.is_absolute() and path.suffix == ".toml"


def with_includes(check: Checker, data: Table, folder: FilePath | None) -> tuple[Table, tuple[Included, ...]]:
    """The data with the sections and materials of its included files, and those files. Faults are noted."""
    value = data["include"]
    merged = {key: entry for key, entry in data.items() if key != "include"}
    if not isinstance(value, list):
        check.note(("include",), f"{shown(value)} is not a list of files", 'give include = ["office-sections.toml"]')
        return merged, ()
    found = []
    for k, name in enumerate(value):
        text = _text(check, name, folder, ("include", k))
        if text is not None:
            file = (FilePath(check.file).parent / str(name)).as_posix()
            _join(check, merged, _parsed(check, text, file), Lines(text), file)
            found.append(Included(str(name), hashlib.sha256(text.encode()).hexdigest()))
    return merged, tuple(found)


def _text(check: Checker, name: object, folder: FilePath | None, path: Path) -> str | None:
    """The file's text with plain line ends; None with a fault noted."""
    if not isinstance(name, str) or not nameable(name):
        check.note(path, f"{shown(name)} is not the name of a file to include",
                   'name a .toml file from the frame\'s folder, such as "office-sections.toml"')  # fmt: skip
        return None
    if folder is None:
        check.note(path, "a frame that is no file has no folder to include from", "save the frame file")
        return None
    try:
        with (folder / name).open("rb") as stream:
            data = stream.read(MOST_BYTES + 1)
        if len(data) > MOST_BYTES:
            raise ValueError(f"larger than {MOST_BYTES // 10**6} MB")
        return data.decode("utf-8-sig").replace("\r\n", "\n")
    except UnicodeDecodeError:
        check.note(path, f"{shown(name)} is not UTF-8", "save it as UTF-8")
    except (OSError, ValueError) as error:
        reason = (error.strerror if isinstance(error, OSError) else None) or str(error)
        check.note(path, f"{shown(name)} cannot be read ({reason})", "name a file of sections or materials")
    return None


def _parsed(check: Checker, text: str, file: str) -> Table:
    try:
        return tomllib.loads(text)
    except RecursionError:
        check.note_at((file, None), ("include",), "lists or tables nested too deeply", "")
    except ValueError as error:
        check.note_at((file, None), ("include",), f"not TOML: {error}", "")
    return {}


def _join(check: Checker, merged: dict[str, object], data: Table, lines: Lines, file: str) -> None:
    """Add an included file's sections and materials; its lines become known for messages."""
    units = _units(check, data, lines, file)
    for key in data:
        if key not in KEYS:
            place = file, lines.by_path.get((key,))
            check.note_at(place, (key,), "an included file holds sections and materials only", "leave this out")
    for key in ("sections", "materials"):
        theirs, ours = data.get(key, {}), merged.get(key, {})
        if not isinstance(theirs, dict) or not isinstance(ours, dict):
            if theirs and not isinstance(theirs, dict):
                check.note_at((file, lines.by_path.get((key,))), (key,), f"{shown(theirs)} is not a table", "")
            continue
        new = {n: v for n, v in theirs.items() if not _twice(check, key, n, ours, lines, file)}
        for path, line in lines.by_path.items():
            if path[0] == key and len(path) > 1 and path[1] not in ours:
                check.lines.beside.setdefault(path, (file, line))
        merged[key] = {**ours, **{n: _with_units(check, key, n, v, units) for n, v in new.items()}}


def _twice(check: Checker, key: str, name: str, ours: Table, lines: Lines, file: str) -> bool:
    if name not in ours:
        return False
    place = file, lines.by_path.get((key, name))
    first = check.lines.beside.get((key, name))
    where = f"{first[0]}:{first[1]}" if first else "the frame file"
    check.note_at(place, (key, name), f"{shown(name)} stands in {where} already", "a name stands once only")
    return True


def _units(check: Checker, data: Table, lines: Lines, file: str) -> Units | None:
    """The included file's own units; None where it states none, and bare numbers would mean nothing."""
    value = data.get("units")
    if value is None:
        return None
    try:
        if isinstance(value, str):
            return frame_units(value)
        raise UnitError(f"{shown(value)} is not a text")
    except UnitError as error:
        place = file, lines.by_path.get(("units",))
        check.note_at(place, ("units",), str(error), 'give units = "N mm", or another force and length')
        return None


def _with_units(check: Checker, kind: str, name: str, entry: object, units: Units | None) -> object:
    """An entry with the file's unit at each of its bare numbers; those that have none at all are noted."""
    if not isinstance(entry, dict):
        return entry
    if units is not None:
        return {key: _with_unit(key, value, units) for key, value in entry.items()}
    for key, value in entry.items():
        if isinstance(value, int | float) and not isinstance(value, bool) and key in UNIT_OF:
            beside = check.lines.beside
            place = beside.get((kind, name, key)) or beside.get((kind, name)) or (check.file, None)
            check.note_at(place, (kind, name, key), f"{shown(value)} has no unit, and the file states no units",
                          'give its unit, or units = "N mm" at the top of the file')  # fmt: skip
    return entry


def _with_unit(key: str, value: object, units: Units) -> object:
    """A bare number with the file's own unit; anything else as it stands."""
    if key not in UNIT_OF or isinstance(value, bool) or not isinstance(value, int | float):
        return value
    return f"{value!r} {UNIT_OF[key].format(f=units.force, l=units.length)}"
