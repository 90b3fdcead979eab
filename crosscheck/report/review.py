"""What `inspect` reports: findings, gravest first, in the terminal and as JSON."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import asdict
from typing import Any

from rich.console import Group, RenderableType
from rich.text import Text

from crosscheck.report import words
from crosscheck.report.document import FORMAT, frame_part, plain
from crosscheck.report.terminal import MOST_ROWS, cautions, heading, more, table
from crosscheck.review.approximate import Approximation
from crosscheck.review.finding import Finding, Subject
from crosscheck.review.inspect import Explanation, explanations

ASKS = {
    "serious": "Serious: the model cannot be right, or will not stand",
    "check": "Check: usual in slips, possible on purpose",
    "note": "Note: for the reviewer to know",
}


def review_report(
    subject: Subject, findings: list[Finding], explain: bool = False, rough: Approximation | None = None
) -> RenderableType:
    """What `crosscheck inspect` prints. explain: with what each check asks and why. rough: hand methods' values."""
    count = {grade: sum(f.grade == grade for f in findings) for grade in ASKS}
    head = ", ".join(f"{n:,} {grade}" for grade, n in count.items())
    title = subject.frame.title or subject.frame.file
    parts: list[RenderableType] = [Text(f"{head}: {title}", style="bold")]
    for grade, asks in ASKS.items():
        rows = [(words.some(f.where) or "frame", f.says) for f in findings if f.grade == grade]
        if rows:
            parts += [heading(asks), table([("where", "left"), ("finding", "left")], rows)]
    if explain:
        parts += _explained(findings)
    if rough is not None:
        parts += _approximated(rough)
    if not explain:
        parts.append(Text("\n  --explain says of each finding why it matters and what to look at"))
    parts.append(cautions())
    return Group(*parts)


def _explained(findings: Sequence[Finding]) -> list[RenderableType]:
    """What the checks that found something ask, in their own words."""
    told = explanations()
    names = dict.fromkeys(f.check for f in findings if f.check in told)
    parts: list[RenderableType] = [heading("What these findings ask")]
    return parts + [_explanation(told[name]) for name in names]


def _explanation(told: Explanation) -> RenderableType:
    lines = [Text(f"  {told.asks}", style="bold")]
    return Group(*lines, *[Text(f"    {label}: {text}") for label, text in told.parts])


def _approximated(rough: Approximation) -> list[RenderableType]:
    parts: list[RenderableType] = [heading("Approximate values beside the computed ones: rough; far off wants a reason")]
    if rough.sidesway:
        largest = {c: max(s.computed for s in rough.sidesway if s.case == c) for c in {s.case for s in rough.sidesway}}
        columns = [("case", "left"), ("member", "left"), ("at", "left"), ("portal method", "right"),
                   ("cantilever method", "right"), ("computed", "right")]  # fmt: skip
        rows = [
            (s.case, s.member, s.joint, *_sizes((s.portal, s.cantilever, s.computed), largest.get(s.case, 0.0)))
            for s in rough.sidesway[:MOST_ROWS]
        ]
        parts += [Text("  sizes of end moments"), table(columns, rows), *more(len(rough.sidesway), MOST_ROWS)]
    if rough.free:
        columns = [("case", "left"), ("beam", "left"), ("free moment", "right"), ("sagging about", "right"),
                   ("computed", "right"), ("hogging about", "right"), ("computed", "right")]  # fmt: skip
        rows = [
            (f.case, f.member, *(words.number(v, f.free) for v in (
                f.free, f.sagging, f.computed_sagging, f.hogging, f.computed_hogging)))
            for f in rough.free[:MOST_ROWS]
        ]  # fmt: skip
        parts += [Text("  where the free moment is greatest; hogging: what the ends take of it"), table(columns, rows)]
        parts += more(len(rough.free), MOST_ROWS)
    return parts + [Text(f"  {note}") for note in rough.notes]


def _sizes(values: Sequence[float], largest: float) -> list[str]:
    """Values beside each other, with the digits of the computed one; rounding noise of the case is zero."""
    return [words.number(0.0 if abs(v) <= words.NOISE * largest else v, values[-1]) for v in values]


def review_document(subject: Subject, findings: list[Finding], rough: Approximation | None = None) -> dict[str, Any]:
    """The document of `crosscheck inspect`."""
    totals = {name: subject.total(name) for name in subject.frame.cases}
    document: dict[str, Any] = {
        "format": FORMAT,
        "frame": frame_part(subject.frame),
        "findings": [
            {"grade": f.grade, "where": list(f.where), "says": f.says, "check": f.check} for f in findings
        ],
        "load_totals": {name: {"fx": plain(float(t[0])), "fy": plain(float(t[1]))} for name, t in totals.items()},
    }
    if rough is not None:
        rows = {"sidesway": [asdict(s) for s in rough.sidesway], "free_moments": [asdict(f) for f in rough.free]}
        document["approximate"] = {key: [_clean(row) for row in part] for key, part in rows.items()}
    return document


def _clean(row: dict[str, Any]) -> dict[str, Any]:
    return {key: plain(value) if isinstance(value, float) else value for key, value in row.items()}
