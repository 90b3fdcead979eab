"""Reports on a whole set of frames: terminal, JSON and JUnit XML over the same outcome."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any
from xml.etree import ElementTree

from rich.console import Group, RenderableType
from rich.text import Text

from crosscheck.report import words
from crosscheck.report.document import FORMAT, difference_part
from crosscheck.report.terminal import MOST_DIFFERENCES, cautions, heading, more, table

if TYPE_CHECKING:
    from collections.abc import Sequence

    from crosscheck.suite.record import Recorded
    from crosscheck.suite.regress import FrameOutcome, SuiteOutcome


def suite_report(outcome: SuiteOutcome) -> RenderableType:
    """What `crosscheck regress` prints: the count of each state first, then every frame that did not hold."""
    if not outcome.frames:
        return Text(f"No frame file found in {', '.join(outcome.looked_in) or 'what was named'}.", style="bold")
    counts = ", ".join(f"{n:,} {state}" for state, n in outcome.counts.items())
    parts: list[RenderableType] = [Text(f"{words.counted(len(outcome.frames), 'frame')}: {counts}", style="bold")]
    rows = [(f.label, f.state, f.says) for f in outcome.frames if f.state != "held"]
    if rows:
        parts += [heading("Not held"), table([("frame", "left"), ("state", "left"), ("why", "left")], rows)]
    for frame in outcome.frames:
        if frame.state != "held" and frame.differences:
            parts.append(frame_report(frame))
    lived_with = [(f.label, d, e) for f in outcome.frames for d, e in f.accepted]
    if lived_with:
        parts += [heading("Accepted differences"), table(_ACCEPTED, [_accepted_row(*row) for row in lived_with])]
    parts.append(cautions())
    return Group(*parts)


_ACCEPTED = [("frame", "left"), ("place", "left"), ("quantity", "left"), ("differ by", "right"),
             ("accepted", "right"), ("until", "left"), ("by", "left"), ("why", "left")]  # fmt: skip


def _accepted_row(file: str, d: Any, e: Any) -> tuple[str, ...]:
    return (file, words.place(d.place), d.place.quantity, words.short(d.difference), words.short(e.size),
            e.until.isoformat(), e.initials, e.why)  # fmt: skip


def frame_report(frame: FrameOutcome) -> RenderableType:
    """One frame that did not hold: why, and the worst of its differences."""
    parts: list[RenderableType] = [heading(f"{frame.label}: {frame.state}"), Text(f"  {frame.says}")]
    rows = [
        (d.place.case, words.place(d.place), d.place.quantity,
         words.both_say(d), words.short(d.difference), words.short(d.allowed))
        for d in frame.differences[:MOST_DIFFERENCES]
    ]  # fmt: skip
    if rows:
        columns = [("case", "left"), ("place", "left"), ("quantity", "left"), ("values", "left"),
                   ("differ by", "right"), ("allowed", "right")]  # fmt: skip
        parts += [table(columns, rows), *more(len(frame.differences), MOST_DIFFERENCES)]
    return Group(*parts)


def suite_document(outcome: SuiteOutcome) -> dict[str, Any]:
    """The document of `crosscheck regress`."""
    return {
        "format": FORMAT,
        "frames": [
            {
                "file": f.standard.path.as_posix(),
                "variant": f.standard.variant or None,
                "verdict": f.state,
                "says": f.says,
                "disagreements": [difference_part(d) for d in f.differences],
                "claims": [{"file": c.file, "held": c.held, "verdict": c.verdict, "says": c.says} for c in f.claims],
                "accepted": [
                    {**difference_part(d), "why": e.why, "initials": e.initials, "until": e.until.isoformat()}
                    for d, e in f.accepted
                ],
            }
            for f in outcome.frames
        ],
        "counts": outcome.counts,
        "verdict": "held" if outcome.exit_status == 0 else "not held",
    }


def record_document(outcomes: Sequence[Recorded]) -> dict[str, Any]:
    """The document of `crosscheck record`."""
    return {
        "format": FORMAT,
        "frames": [
            {
                "file": o.standard.path.as_posix(),
                "variant": o.standard.variant or None,
                "recorded": None if o.status else o.standard.record.as_posix(),
                "why": "; ".join(o.says) or None,
            }
            for o in outcomes
        ],
    }


def junit(outcome: SuiteOutcome) -> str:
    """The outcome as JUnit XML, one test case a frame."""
    failed = [f for f in outcome.frames if f.state != "held"]
    crashed = [f for f in failed if f.state in ("crashed", "unreadable")]
    suite = ElementTree.Element(
        "testsuite", name="crosscheck", tests=str(len(outcome.frames)), errors=str(len(crashed)),
        failures=str(len(failed) - len(crashed)), skipped="0",
    )  # fmt: skip
    for f in outcome.frames:
        case = ElementTree.SubElement(suite, "testcase", classname="crosscheck", name=f.label)
        if f.state != "held":
            kind = "error" if f in crashed else "failure"
            ElementTree.SubElement(case, kind, type=f.state, message=_clean(f.says)).text = _clean(_plain(f))
    ElementTree.indent(suite)
    return '<?xml version="1.0" encoding="utf-8"?>\n' + ElementTree.tostring(suite, encoding="unicode") + "\n"


def _plain(frame: FrameOutcome) -> str:
    lines = [frame.says]
    for d in frame.differences[:MOST_DIFFERENCES]:
        lines.append(f"{d.place.case}: {words.place(d.place)}, {d.place.quantity}: {words.both_say(d)}; "
                     f"differ by {words.short(d.difference)}, allowed {words.short(d.allowed)}")  # fmt: skip
    return "\n".join(lines)


def _clean(text: str) -> str:
    """Without the control characters that XML cannot hold."""
    return "".join(c if c in "\n\t" or ord(c) >= 32 else "\N{REPLACEMENT CHARACTER}" for c in text)
