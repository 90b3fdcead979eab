"""What stands right below a record's verdict, for whoever reads no further: the first difference, what would explain
it, and whatever makes the verdict worth less than it looks. Rows of a label and a sentence; nothing is computed.
"""

from __future__ import annotations

from collections.abc import Sequence

from crosscheck.check import Opinions, Verification
from crosscheck.compare.differences import Difference
from crosscheck.compare.tolerance import CLAIM
from crosscheck.frame.model import Frame
from crosscheck.log import Entry, reworked
from crosscheck.report import terminal, words
from crosscheck.review.finding import Finding

Rows = list[tuple[str, str]]


def verify_gist(
    result: Verification, numbered: Sequence[tuple[int, Difference]], history: Sequence[Entry],
    findings: Sequence[Finding],
) -> tuple[tuple[str, str], ...]:  # fmt: skip
    """Of a check of a claim."""
    frame = result.opinions.frame
    rows: Rows = [("First difference", _difference(frame, d)) for _, d in numbered[:1]]
    rows += _said(result.facts)
    rows += [("First suspect", f"{s.kind}: {s.says}; it explains {100 * s.explains:.4g}%")
             for s in result.suspects[:1]]  # fmt: skip
    if result.suspects and result.suspects[0].tied_with:
        rows.append(("or as well", words.some(result.suspects[0].tied_with)))
    rows += [("Balance of the claim", says) for says in _statics(result)]
    if result.tolerance.relative != CLAIM.relative:
        asked, usual = 100 * result.tolerance.relative, 100 * CLAIM.relative
        rows.append(("Tolerance", f"{asked:g}%, NOT the usual {usual:g}%"))
    silent = [n for n in frame.names if n not in result.closed.cases]
    rows += [("Not spoken of", f"{words.some(silent)}: this record says nothing of them")] if silent else []
    rows += _worked(history)
    return tuple(rows + _model(findings) + _abstained(result.opinions))


def opinions_gist(
    result: Opinions, numbered: Sequence[tuple[int, Difference]], findings: Sequence[Finding]
) -> tuple[tuple[str, str], ...]:
    """Of opinions without a claim."""
    rows: Rows = []
    for _, d in numbered[:1]:
        values = ", ".join(f"{name} {words.said(d, name)}" for name in d.values)
        unit = words.unit_of(result.frame, d.place.quantity)
        rows.append(("First difference", f"{words.place(d.place)}, {d.place.quantity} in {d.place.case}: {values} {unit}"))
    asked = [n for n in result.frame.names if n not in result.names]
    rows += [("Not asked for", f"{words.some(asked)}: this record says nothing of them")] if asked else []
    return tuple(rows + _model(findings) + _abstained(result))


def _difference(frame: Frame, d: Difference) -> str:
    claim, ours = d.values.get("claim"), words.opinions_value(d)
    unit = words.unit_of(frame, d.place.quantity)
    both = terminal.with_face(frame, d, claim, ours), terminal.with_face(frame, d, ours, claim)
    text = (
        f"{words.place(d.place)}, {d.place.quantity} in {d.place.case}: claim {both[0]}, opinions {both[1]} {unit}; "
        f"{words.short(d.difference)} apart where {words.short(d.allowed)} is allowed"
    )
    return text + ("; the claim is low, the unsafe side more often" if d.unsafe else "")


def _said(facts: Sequence[object]) -> Rows:
    if not facts:
        return []
    more = f" (and {words.counted(len(facts) - 1, 'more fact')})" if len(facts) > 1 else ""
    return [("Printed input differs", f"{facts[0]}{more}")]


def _statics(result: Verification) -> list[str]:
    judged = [s for a in result.audits for s in a.statics if s.ok is not None]
    failing = sum(not s.ok for s in judged)
    if not judged:
        return []
    count = words.counted(len(judged), "balance")
    return [f"{failing:,} of {count} fail" if failing else f"all {count} that can be judged hold"]


def _worked(history: Sequence[Entry]) -> Rows:
    """A check that was tuned until it agreed can be seen here and in the log."""
    if len(history) < 2:
        return []
    changes = reworked(history)
    checks = f"{len(history):,} checks with a record so far"
    if not changes:
        return [("History", f"{checks}; the frame is unchanged since the first")]
    times = words.counted(changes, "time")
    return [("History", f"{checks}; the frame was changed {times} after a claim was seen (Log of checks)")]


def _model(findings: Sequence[Finding]) -> Rows:
    serious, asked = (sum(f.grade == grade for f in findings) for grade in ("serious", "check"))
    if not serious and not asked:
        return []
    first = next(f for f in findings if f.grade in ("serious", "check"))
    counts = [words.counted(serious, "serious finding")] if serious else []
    counts += [f"{words.counted(asked, 'thing')} to check"] if asked else []
    return [("Model", f"{', '.join(counts)}; first: {words.some(first.where) or 'frame'}: {first.says}")]


def _abstained(result: Opinions) -> Rows:
    return [("Abstained", f"{name}: {silent.why}") for name, silent in result.silent.items()]
