"""The reading file: what a paste leaves unsaid, stated once in TOML and kept beside the frame or for the whole office.

units = "kN m"                                  # or [units] moment = "kN mm", displacement = "mm"
columns = ["member", "joint", "N", "V", "M"]    # heads, in order, of the tables that have as many columns
face = true                                     # values stand at the face of rigid zones
[signs]                                         # moment, axial, shear, reactions, dx, dy, rotation
moment = "anticlockwise"                        # or clockwise, sagging, hogging
axial = "compression"                           # what is positive
reactions = "on the support"
[members]                                       # the paste's name = the frame's
"12" = "B-C"
rafter = ["4", "5", "6"]                        # a member of the frame = the elements it was divided into, in order
[joints]
"101" = "A"
[cases]
"LC1" = "dead"
"""

from __future__ import annotations

import tomllib
from collections.abc import Callable, Iterable, Mapping
from dataclasses import replace
from pathlib import Path
from typing import Any

from crosscheck.claims.decode import decode
from crosscheck.claims.reading import FrameNames, ReadingOptions
from crosscheck.claims.stated import parsed_units
from crosscheck.claims.words import is_header_word
from crosscheck.problems import Problem, UnusableInput, nearest

SIGNS = {
    "moment": ("clockwise", "anticlockwise", "sagging", "hogging"),
    "axial": ("tension", "compression", "action"),
    "shear": ("action", "reversed action", "internal", "reversed internal"),
    "reactions": ("on the frame", "on the support"),
    "fx": ("right", "left"), "fy": ("up", "down"), "dx": ("right", "left"), "dy": ("up", "down"),
    "rotation": ("clockwise", "anticlockwise"), "reaction moment": ("clockwise", "anticlockwise"),
    "members": ("as the frame", "reversed", "rightward", "leftward", "downward"),
}  # fmt: skip
"""Quantities whose signs may be stated, and in which words."""
KEYS = ("units", "columns", "face", "signs", "members", "joints", "cases")


def checked(options: ReadingOptions, names: FrameNames) -> ReadingOptions:
    """The options with the reading file's statements behind them. Raises UnusableInput with everything wrong in either."""
    problems: list[Problem] = []
    stated = _from_file(Path(options.file), names, problems) if options.file else {}
    merged = replace(
        options,
        units=options.units or stated.get("units"),
        columns=options.columns or tuple(stated.get("columns", ())),
        signs={**stated.get("signs", {}), **options.signs},
        members={**stated.get("members", {}), **options.members},
        parts={**stated.get("parts", {}), **options.parts},
        joints={**stated.get("joints", {}), **options.joints},
        cases={**stated.get("cases", {}), **options.cases},
        face=options.face if options.face is not None else stated.get("face"),
    )
    problems += _wrong_options(merged)
    if problems:
        raise UnusableInput(problems)
    return merged


def _wrong_options(options: ReadingOptions) -> Iterable[Problem]:
    for part in parsed_units(options.units)[2]:
        known = "kN m, or by quantity: moment kN mm, displacement mm"
        yield Problem("", None, "units", f'"{part}" is neither a unit nor a quantity with its unit', known)
    for head in options.columns:
        if not is_header_word(head) and head.strip("- ") not in ("", "ignore"):
            yield Problem("", None, "columns", f'"{head}" is no column of results', "member, joint, end, x, N, V, M, ...")
    for quantity, word in options.signs.items():
        if quantity not in SIGNS:
            yield Problem("", None, f"signs.{quantity}", "no such quantity", nearest(quantity, SIGNS) or ", ".join(SIGNS))
        elif word not in SIGNS[quantity]:
            yield Problem("", None, f"signs.{quantity}", f'"{word}" is no convention of it', ", ".join(SIGNS[quantity]))


def _from_file(path: Path, names: FrameNames, problems: list[Problem]) -> dict[str, Any]:
    file = str(path)
    try:
        data = tomllib.loads(decode(path.read_bytes(), file).replace("\r\n", "\n"))
    except OSError as error:
        problems.append(Problem(file, None, "", f"the reading file cannot be opened ({error.strerror})"))
        return {}
    except tomllib.TOMLDecodeError as error:
        problems.append(Problem(file, None, "", f"the reading file is not TOML: {error}"))
        return {}
    out: dict[str, Any] = {}
    for key, value in data.items():
        if key not in KEYS:
            problems.append(
                Problem(file, None, key, "no such key in a reading file", nearest(key, KEYS) or ", ".join(KEYS))
            )
        else:
            out.update(_entry(key, value, file, names, problems))
    return out


def _entry(key: str, value: Any, file: str, names: FrameNames, problems: list[Problem]) -> dict[str, Any]:
    wrong: Callable[[str, str], None] = lambda says, instead: problems.append(Problem(file, None, key, says, instead))  # noqa: E731
    if key == "units":
        if isinstance(value, str) or _is_table_of_text(value):
            return {"units": value}
        wrong("units are text or a table of text", 'units = "kN m"')
    elif key == "columns":
        if isinstance(value, list) and all(isinstance(v, str) for v in value):
            return {"columns": value}
        wrong("columns are a list of heads", 'columns = ["member", "joint", "N", "V", "M"]')
    elif key == "face":
        if isinstance(value, bool):
            return {"face": value}
        wrong("face is true or false", "face = true")
    elif key == "signs":
        if _is_table_of_text(value):
            return {"signs": value}
        wrong("signs are a table of text", '[signs] moment = "anticlockwise"')
    elif isinstance(value, dict):
        return _names(key, value, file, names, problems)
    else:
        wrong("names are a table", f'[{key}] "their name" = "our name"')
    return {}


def _is_table_of_text(value: Any) -> bool:
    return isinstance(value, dict) and all(isinstance(v, str) for v in value.values())


def _names(
    key: str, table: Mapping[str, Any], file: str, names: FrameNames, problems: list[Problem]
) -> dict[str, dict[str, Any]]:
    """A map of names; for members also the other way round: a member of the frame to the elements it was divided into."""
    valid: Iterable[str] = {"members": names.members, "joints": names.xy, "cases": (*names.cases, *names.envelopes)}[key]
    one: dict[str, Any] = {}
    parts: dict[str, Any] = {}
    for theirs, ours in table.items():
        listed = isinstance(ours, list) and key == "members" and bool(ours) and all(isinstance(v, str) for v in ours)
        name = theirs if listed else ours
        if not isinstance(name, str):
            problems.append(Problem(file, None, f"{key}.{theirs}", "a name is text", '"their name" = "our name"'))
        elif name not in valid:
            advice = nearest(name, valid)
            problems.append(Problem(file, None, f"{key}.{theirs}", f'the frame has no {key[:-1]} "{name}"', advice))
        elif listed:
            parts[theirs] = tuple(ours)
        else:
            one[theirs] = ours
    return {key: one, "parts": parts} if parts else {key: one}
