"""What `inspect` reports: findings, gravest first, in the terminal and as JSON."""

from __future__ import annotations

from typing import Any

from rich.console import Group, RenderableType
from rich.text import Text

from crosscheck.report import words
from crosscheck.report.document import FORMAT, frame_part, plain
from crosscheck.report.terminal import cautions, heading, table
from crosscheck.review.finding import Finding, Subject

ASKS = {
    "serious": "Serious: the model cannot be right, or will not stand",
    "check": "Check: usual in slips, possible on purpose",
    "note": "Note: for the reviewer to know",
}


def review_report(subject: Subject, findings: list[Finding]) -> RenderableType:
    """What `crosscheck inspect` prints."""
    count = {grade: sum(f.grade == grade for f in findings) for grade in ASKS}
    head = ", ".join(f"{n:,} {grade}" for grade, n in count.items())
    title = subject.frame.title or subject.frame.file
    parts: list[RenderableType] = [Text(f"{head}: {title}", style="bold")]
    for grade, asks in ASKS.items():
        rows = [(words.some(f.where) or "frame", f.says) for f in findings if f.grade == grade]
        if rows:
            parts += [heading(asks), table([("where", "left"), ("finding", "left")], rows)]
    parts.append(cautions())
    return Group(*parts)


def review_document(subject: Subject, findings: list[Finding]) -> dict[str, Any]:
    """The document of `crosscheck inspect`."""
    totals = {name: subject.total(name) for name in subject.frame.cases}
    return {
        "format": FORMAT,
        "frame": frame_part(subject.frame),
        "findings": [
            {"grade": f.grade, "where": list(f.where), "says": f.says, "check": f.check} for f in findings
        ],
        "load_totals": {name: {"fx": plain(float(t[0])), "fy": plain(float(t[1]))} for name, t in totals.items()},
    }
