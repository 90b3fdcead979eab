"""The check log beside a frame: every check with a record, one line each, oldest first.

A check that was tuned until it agreed can be seen in it: settings and checksums stand in every entry, and a frame that
changed after a claim was first seen gets no record without a reason. Lines are JSON, so that any program reads them.
"""

from __future__ import annotations

import dataclasses
import json
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path
from typing import Any

from crosscheck.files import alone, replace_text
from crosscheck.frame.model import Frame
from crosscheck.problems import Problem, UnusableInput

ENDING = ".log.jsonl"


@dataclass(frozen=True, slots=True)
class Entry:
    """One check. when: ISO time. variant: frame of a family. content: checksum of all that makes the frame, tables
    beside it included. settings: idealisation and tolerance. compared, of: coverage. reason: why the frame changed."""

    when: str
    version: str
    variant: str
    frame_sha256: str
    content: str
    claim: str
    claim_sha256: str
    settings: str
    verdict: str
    compared: int
    of: int
    reason: str = ""


def log_path(frame: Frame) -> Path:
    """FRAME.log.jsonl beside FRAME.toml."""
    path = Path(frame.file)
    return path.with_name(path.name.removesuffix(".toml") + ENDING)


def read_log(path: Path) -> tuple[Entry, ...]:
    """Every entry, oldest first; none where there is no log yet. Raises UnusableInput for a line that is none."""
    try:
        lines = path.read_text(encoding="utf-8").splitlines()
    except FileNotFoundError:
        return ()
    except (OSError, ValueError) as error:
        raise UnusableInput([Problem(str(path), None, "", f"cannot be read ({error})", "restore it")]) from None
    return tuple(_entry(path, number, line) for number, line in enumerate(lines, 1) if line.strip())


def _entry(path: Path, number: int, line: str) -> Entry:
    try:
        data = json.loads(line)
        values: dict[str, Any] = {f.name: _typed(f.type, data[f.name]) for f in dataclasses.fields(Entry)}
        return Entry(**values)
    except (ValueError, KeyError, TypeError):
        says, advice = "is no entry of a check log", "restore the line, or move the log away and say why in the record"
        raise UnusableInput([Problem(str(path), number, "", says, advice)]) from None


def _typed(kind: object, value: object) -> str | int:
    wanted = int if kind == "int" else str
    if not isinstance(value, wanted) or isinstance(value, bool):
        raise TypeError
    return value


def changed(history: Sequence[Entry], frame: Frame) -> Entry | None:
    """The last check of this frame against a claim, where the frame has changed since."""
    own = [e for e in history if e.claim and e.variant == frame.variant]
    return own[-1] if own and own[-1].content != frame.content else None


def reworked(history: Sequence[Entry]) -> int:
    """How often the frame of the last entry was changed after a claim was first seen, each frame of a family apart."""
    own = [e for e in history if e.claim and e.variant == history[-1].variant]
    return sum(before.content != after.content for before, after in pairwise(own))


def ask_for_reason(history: Sequence[Entry], frame: Frame, reason: str) -> None:
    """Raises UnusableInput where the frame has changed since a claim was seen and nobody says why."""
    before = changed(history, frame)
    if before is not None and not reason.strip():
        says = f"the frame has changed since it was checked against {before.claim} on {before.when[:10]}"
        raise UnusableInput([Problem(frame.file, None, "--reason", says, 'say why: --reason "section of A-B corrected"')])


def append(path: Path, entry: Entry) -> tuple[Entry, ...]:
    """Add one entry, whole or not at all; returns every entry, this one last."""
    with alone(path):
        before = read_log(path)
        text = "".join(json.dumps(dataclasses.asdict(e), ensure_ascii=False) + "\n" for e in (*before, entry))
        replace_text(path, text)
    return (*before, entry)
