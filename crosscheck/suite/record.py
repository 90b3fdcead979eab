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
from crosscheck.compare.opinions import END_QUANTITIES, JOINT_QUANTITIES, REACTION_QUANTITIES, closeness
from crosscheck.compare.tolerance import Scales
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
    """One state of the record. facts: reason, date, versions and the like, as written; values: case, table, rows.

    envelopes: by name the cases and combinations that each is over. Their extremes follow from the values of these.
    """

    facts: Mapping[str, Any]
    values: Mapping[str, Mapping[str, Rows]]
    envelopes: Mapping[str, tuple[str, ...]] = field(default_factory=dict)


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
    values = {name: agreed_tables(result, name) for name in result.names}
    return Entry(facts, values, {name: frame.envelopes[name].names for name in result.envelopes})


def agreed_tables(result: Opinions, name: str) -> dict[str, Rows]:
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
    if entry.envelopes:
        lines += [f"[{name}.envelopes]", *(f"{_text(key)} = {_value(list(of))}" for key, of in entry.envelopes.items()), ""]
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
        return "{ " + ", ".join(f"{_key(k)} = {_value(v)}" for k, v in value.items()) + " }"
    if isinstance(value, list):
        return "[" + ", ".join(_value(v) for v in value) + "]"
    return repr(value)


def _key(key: str) -> str:
    """A bare key where TOML has it bare and as one: a file's name has dots and slashes."""
    return key if key and all(c.isascii() and (c.isalnum() or c in "-_") for c in key) else _text(key)


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
    facts = {k: v for k, v in data.items() if k not in ("values", "envelopes")}
    envelopes = {name: tuple(map(str, of)) for name, of in data.get("envelopes", {}).items()}
    values = {
        case: {table: {key: _read_row(row) for key, row in rows.items()} for table, rows in tables.items()}
        for case, tables in data["values"].items()
    }
    for needed in ("reason", "date", "frame_sha256"):
        facts[needed]
    return Entry(facts, values, envelopes)


def _read_row(row: list[Any]) -> tuple[float | None, ...]:
    return tuple(None if v == UNDETERMINED else float(v) for v in row)
