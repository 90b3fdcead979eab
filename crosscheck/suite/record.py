"""Values on record: today's agreed values of a frame, in a file beside it that shows its changes line by line."""

from __future__ import annotations

import datetime
import json
import tomllib
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from functools import partial
from importlib.metadata import version
from pathlib import Path
from typing import Any

import numpy as np

from crosscheck import __version__
from crosscheck.answer import CaseAnswer
from crosscheck.check import Opinions, ask, read
from crosscheck.compare.differences import Difference, Place, worst_first
from crosscheck.compare.opinions import END_QUANTITIES, JOINT_QUANTITIES, REACTION_QUANTITIES, closeness
from crosscheck.compare.tolerance import RECORD, Scales, allowed
from crosscheck.files import alone, replace_text
from crosscheck.frame.model import Floats, Frame
from crosscheck.problems import Problem, UnusableInput
from crosscheck.suite.beside import Standard
from crosscheck.suite.spread import spread

FORMAT = "crosscheck record/1"
DIGITS = 10
"""Significant digits on record: far finer than the tolerance, and coarse enough that machines do not differ in them."""
NOISE = 1e-11
"""Of the case's scale of its kind: rounding, put on record as zero."""
UNDETERMINED = "undetermined"
QUANTITIES = {"ends": END_QUANTITIES, "joints": JOINT_QUANTITIES, "reactions": REACTION_QUANTITIES}

Rows = Mapping[str, tuple[float | None, ...]]


class Refused(Exception):
    """Values may not go on record; the reason, in one sentence (exit status 1)."""


@dataclass(frozen=True, slots=True)
class Entry:
    """One state of the record. facts: reason, date, versions and the like, as written; values: case, table, rows."""

    facts: Mapping[str, Any]
    values: Mapping[str, Mapping[str, Rows]]


@dataclass(frozen=True, slots=True)
class Record:
    """A record file: the values that hold now, and those that held before, latest first."""

    now: Entry
    before: tuple[Entry, ...] = field(default=())


# --- writing


def put_on_record(standard: Standard, result: Opinions, reason: str, today: datetime.date | None = None) -> Path:
    """Put the agreed values of a frame on record with the reason; earlier values move into its history.

    Raises Refused where the opinions do not agree, and UnusableInput where the record cannot be read or written.
    """
    if not reason.strip():
        raise UnusableInput([Problem("", None, "--reason", "is empty", "say why these values go on record")])
    if result.verdict != "agree":
        raise Refused(f"{standard.label}: the opinions do not agree ({result.verdict}), so nothing goes on record")
    target = standard.record
    with alone(target):
        old = read_record(target) if target.exists() else None
        beside = [c.name for c in standard.claims()]
        entry = _entry(result, reason, today or datetime.date.today(), beside)
        history = () if old is None else (old.now, *old.before)
        name = f"{standard.path.name} [{standard.variant}]" if standard.variant else standard.path.name
        replace_text(target, as_text(name, Record(entry, history)))
    return target


def _entry(result: Opinions, reason: str, today: datetime.date, claims: list[str]) -> Entry:
    frame = result.frame
    a = frame.analysis
    facts: dict[str, Any] = {
        "reason": reason.strip(),
        "date": today,
        "crosscheck": __version__,
        "libraries": {name: version(name) for name in ("numpy", "scipy", "anastruct")},
        "frame_sha256": frame.content,
        "units": f"{frame.units.force} {frame.units.length}",
        "idealisation": {"axial": a.axial, "shear": a.shear, "order": a.order},
        "claims": claims,
        "opinions": list(result.answers),
        "agree_to": float(f"{max(closeness(result.answers, j) for j in result.judgements.values()):.1e}"),
    }
    if frame.includes:
        facts["includes"] = {one.file: one.sha256 for one in frame.includes}
    return Entry(facts, {name: _agreed_tables(result, name) for name in result.names})


def _agreed_tables(result: Opinions, name: str) -> dict[str, Rows]:
    agreed = next(a.cases[name] for a in result.answers.values() if name in a.cases)
    return _tables(result.frame, agreed, result.judgements[name].scales)


def _tables(frame: Frame, case: CaseAnswer, scales: Scales) -> dict[str, Rows]:
    tables = zip((case.ends, case.joints, case.reactions), QUANTITIES.values(), strict=True)
    case = CaseAnswer(*(_quiet(values, [scales.of(q) for q in quantities]) for values, quantities in tables))
    ends = {
        f"{m.name} at {joint}": _row(case.ends[k, end])
        for k, m in enumerate(frame.members.values())
        for end, joint in ((0, m.joint_from), (1, m.joint_to))
    }
    joints = {name: _row(case.joints[k]) for k, name in enumerate(frame.joints)}
    reactions = {name: _row(case.reactions[frame.joint_index[name]]) for name in frame.supports}
    return {"ends": ends, "joints": joints, "reactions": reactions}


def _quiet(values: Floats, scales: Sequence[float]) -> Floats:
    """Rounding noise as plain zero, by the case's scale of each column: it would differ from machine to machine."""
    return np.where(np.abs(values) <= NOISE * np.asarray(scales), 0.0, values)


def _row(values: Any) -> tuple[float | None, ...]:
    return tuple(float(v) + 0.0 if np.isfinite(v) else None for v in values)


def as_text(frame_name: str, record: Record) -> str:
    """The record as TOML, one row of values a line."""
    lines = [
        f"# Values on record for {frame_name}, written by `crosscheck record`.",
        "# Rows: axial, shear, moment at member ends; dx, dy, rotation of joints; fx, fy, moment at supports.",
        f"format = {_text(FORMAT)}",
        "",
    ]
    lines += _entry_lines(record.now, "now", "[now]")
    for entry in record.before:
        lines += _entry_lines(entry, "before", "[[before]]")
    return "\n".join(lines)


def _entry_lines(entry: Entry, name: str, head: str) -> list[str]:
    lines = [head, *(f"{key} = {_value(v)}" for key, v in entry.facts.items()), ""]
    for case, tables in entry.values.items():
        for table, rows in tables.items():
            lines.append(f"[{name}.values.{_text(case)}.{table}]")
            lines += [f"{_text(key)} = [{', '.join(_number(v) for v in row)}]" for key, row in rows.items()]
            lines.append("")
    return lines


def _value(value: Any) -> str:
    if isinstance(value, str):
        return _text(value)
    if isinstance(value, datetime.date):
        return value.isoformat()
    if isinstance(value, Mapping):
        return "{ " + ", ".join(f"{k} = {_value(v)}" for k, v in value.items()) + " }"
    if isinstance(value, list):
        return "[" + ", ".join(_value(v) for v in value) + "]"
    return repr(value)


def _text(text: str) -> str:
    """A TOML basic string; JSON's escapes are a subset of TOML's."""
    return json.dumps(text, ensure_ascii=False).replace("\x7f", "\\u007F")


def _number(value: float | None) -> str:
    if value is None:
        return _text(UNDETERMINED)
    text = f"{value:.{DIGITS}g}"
    return text if any(c in text for c in ".en") else text + ".0"


@dataclass(frozen=True, slots=True)
class Recorded:
    """What came of putting one frame on record. status: 0 recorded, 1 refused, 2 unusable. says: why, a line each."""

    standard: Standard
    status: int
    says: tuple[str, ...] = ()


def record_all(
    frames: Sequence[Standard], reason: str, progress: Callable[[Recorded], None], workers: int | None = None
) -> list[Recorded]:
    """Put every frame on record with one reason, on all cores; in the order of the frames."""
    outcomes = {}
    for outcome in spread(partial(_record_one, reason=reason), frames, _died, workers):
        outcomes[outcome.standard] = outcome
        progress(outcome)
    return [outcomes[standard] for standard in frames]


def _record_one(standard: Standard, reason: str) -> Recorded:
    try:
        put_on_record(standard, ask(read(standard.path, standard.variant)), reason)
    except Refused as refusal:
        return Recorded(standard, 1, (str(refusal),))
    except UnusableInput as error:
        return Recorded(standard, 2, tuple(map(str, error.problems)))
    except Exception as error:  # noqa: BLE001 - one frame's crash must not cost the others
        return Recorded(standard, 2, (f"{standard.label}: {type(error).__name__}: {error}; please report this",))
    return Recorded(standard, 0)


def _died(standard: Standard) -> Recorded:
    return Recorded(standard, 2, (f"{standard.label}: the process that checked it died",))


# --- reading


def read_record(path: Path) -> Record:
    """Read a record file. Raises UnusableInput where it is not one."""
    try:
        data = tomllib.loads(path.read_text(encoding="utf-8-sig"))
        if data.get("format") != FORMAT:
            raise ValueError(f'format is not "{FORMAT}"')
        return Record(_read_entry(data["now"]), tuple(_read_entry(e) for e in data.get("before", [])))
    except (OSError, ValueError, KeyError, TypeError, AttributeError) as error:
        says = f"is not a record that can be read ({error})"
        advice = "restore it from version control, or put the frame on record again"
        raise UnusableInput([Problem(str(path), None, "", says, advice)]) from None


def _read_entry(data: Mapping[str, Any]) -> Entry:
    facts = {k: v for k, v in data.items() if k != "values"}
    values = {
        case: {table: {key: _read_row(row) for key, row in rows.items()} for table, rows in tables.items()}
        for case, tables in data["values"].items()
    }
    for needed in ("reason", "date", "frame_sha256"):
        facts[needed]
    return Entry(facts, values)


def _read_row(row: list[Any]) -> tuple[float | None, ...]:
    return tuple(None if v == UNDETERMINED else float(v) for v in row)


# --- comparing


def compare_tables(
    case: str, ours: Mapping[str, Rows], theirs: Mapping[str, Rows], scales: Scales, names: tuple[str, str]
) -> tuple[list[Difference], int]:
    """Differences of two sets of tables of one case by the tolerance for records, and how many values were compared."""
    found: list[Difference] = []
    compared = 0
    for table, quantities in QUANTITIES.items():
        mine, other = ours.get(table, {}), theirs.get(table, {})
        for key in [*mine, *(k for k in other if k not in mine)]:
            for k, quantity in enumerate(quantities):
                a = mine[key][k] if key in mine else None
                b = other[key][k] if key in other else None
                if a is None and b is None:
                    continue
                compared += 1
                found += _moved(_place(case, table, key, quantity), a, b, scales.of(quantity), names)
    return worst_first(found), compared


def _moved(
    place: Place, a: float | None, b: float | None, scale: float, names: tuple[str, str]
) -> list[Difference]:
    values = {names[0]: a, names[1]: b}
    if a is None or b is None:
        return [Difference(place, values, float("inf"), 0.0, note="only one of the two gives a value")]
    may = float(allowed(a, b, RECORD, scale))
    apart = abs(a - b)
    return [] if apart <= may else [Difference(place, values, apart, may)]


def _place(case: str, table: str, key: str, quantity: str) -> Place:
    if table == "ends":
        member, _, joint = key.rpartition(" at ")
        return Place(case, "member_ends", quantity, member=member, joint=joint)
    return Place(case, "joints" if table == "joints" else "reactions", quantity, joint=key)


def table_scales(*sides: Mapping[str, Rows]) -> Scales:
    """Scales of a case from values alone, for two records whose frames are not solved again."""

    def largest(table: str, columns: tuple[int, ...]) -> float:
        rows = [row for side in sides for row in side.get(table, {}).values()]
        return max((abs(row[c] or 0.0) for row in rows for c in columns), default=0.0)

    forces = max(largest("ends", (0, 1)), largest("reactions", (0, 1)))
    moments = max(largest("ends", (2,)), largest("reactions", (2,)))
    return Scales(forces, moments, largest("joints", (0, 1)), largest("joints", (2,)))


def against_record(result: Opinions, record: Record) -> tuple[list[Difference], int]:
    """What moved since the values went on record, and how many values were compared."""
    found: list[Difference] = []
    compared = 0
    for name in [*result.names, *(n for n in record.now.values if n not in result.names)]:
        if name in result.judgements:
            ours, scales = _agreed_tables(result, name), result.judgements[name].scales
        else:
            ours, scales = {}, Scales(1.0, 1.0, 1.0, 1.0)
        differences, count = compare_tables(name, ours, record.now.values.get(name, {}), scales, ("now", "on record"))
        found += differences
        compared += count
    return worst_first(found), compared
