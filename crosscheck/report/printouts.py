"""Reports on two printouts of one frame: terminal and JSON over the same findings."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from rich.console import Group, RenderableType
from rich.text import Text

from crosscheck.check import TwoPrintouts, Verification
from crosscheck.compare.differences import Difference, Place
from crosscheck.compare.printouts import FIRST, SECOND
from crosscheck.frame.model import Frame
from crosscheck.report import words
from crosscheck.report.document import FORMAT, difference_part, frame_part, idealisation_part
from crosscheck.report.terminal import MOST_DIFFERENCES, VERDICT_STYLE, cautions, facts, heading, more, table

MOST_PLACES = 6


def printouts_report(result: TwoPrintouts) -> RenderableType:
    """What `crosscheck verify FRAME CLAIM --against OTHER` prints."""
    moved, frame = result.moved, result.first.opinions.frame
    parts: list[RenderableType] = [Text(printouts_sentence(result), style=VERDICT_STYLE[moved.verdict])]
    parts += [Text(f"  {why}") for why in moved.undecided]
    parts += [heading("How they were compared"), facts(printouts_facts(result))]
    for case in dict.fromkeys(d.place.case for d in moved.differences):
        parts += _case(frame, case, [d for d in moved.differences if d.place.case == case])
    for name, places in ((FIRST, moved.only_first), (SECOND, moved.only_second)):
        if places:
            parts += [heading(f"In {_file(result, name)} alone: {words.counted(len(places), 'value')}"),
                      Text(f"  {_some(places)}")]  # fmt: skip
    parts.append(cautions())
    return Group(*parts)


def printouts_sentence(result: TwoPrintouts) -> str:
    moved = result.moved
    count = words.counted(moved.compared, "value")
    if moved.verdict == "disagree":
        return f"MOVED: {len(moved.differences):,} of the {count} that both printouts give"
    if moved.verdict == "agree":
        return f"NOTHING MOVED in the {count} that both printouts give"
    return "UNDECIDED: the two printouts cannot be compared surely enough"


def printouts_facts(result: TwoPrintouts) -> list[tuple[str, str]]:
    rows = [(name, f"{_file(result, name)}; {_beside(v)}") for name, v in _sides(result)]
    return [*rows, ("allowed", "half a unit of the last printed digit of the one, and of the other; no percentage")]


def _sides(result: TwoPrintouts) -> list[tuple[str, Verification]]:
    return [(FIRST, result.first), (SECOND, result.second)]


def _file(result: TwoPrintouts, name: str) -> str:
    return (result.first if name == FIRST else result.second).closed.file or "standard input"


def _beside(v: Verification) -> str:
    against = {"agree": "agrees with the opinions", "disagree": "disagrees with the opinions",
               "undecided": "undecided beside the opinions"}  # fmt: skip
    return f"{', '.join(v.closed.cases) or 'no case'}; {words.counted(len(v.closed.values), 'value')}; {against[v.verdict]}"


def _case(frame: Frame, case: str, differences: Sequence[Difference]) -> list[RenderableType]:
    rows = [
        (words.place(d.place), f"{d.place.quantity} ({words.unit_of(frame, d.place.quantity)})",
         words.number(d.values[FIRST]), words.number(d.values[SECOND]), words.short(d.difference), words.short(d.allowed))
        for d in differences[:MOST_DIFFERENCES]
    ]  # fmt: skip
    columns = [("place", "left"), ("quantity", "left"), (FIRST, "right"), (SECOND, "right"), ("moved by", "right"),
               ("allowed", "right")]  # fmt: skip
    return [heading(f"Moved in {case}: {len(differences):,}"), table(columns, rows),
            *more(len(differences), MOST_DIFFERENCES)]  # fmt: skip


def _some(places: Sequence[Place]) -> str:
    named = [f"{p.quantity} of {words.place(p)} in {p.case}" for p in places[:MOST_PLACES]]
    left = len(places) - len(named)
    return "; ".join(named) + (f"; and {left:,} more" if left else "")


def printouts_document(result: TwoPrintouts) -> dict[str, Any]:
    """The document of `crosscheck verify FRAME CLAIM --against OTHER`."""
    moved, frame = result.moved, result.first.opinions.frame
    return {
        "format": FORMAT,
        "frame": frame_part(frame),
        "idealisation": idealisation_part(frame),
        "disagreements": [difference_part(d) for d in moved.differences],
        FIRST: _printout_part(result.first, moved.only_first),
        SECOND: _printout_part(result.second, moved.only_second),
        "compared": moved.compared,
        "undecided": list(moved.undecided),
        "verdict": moved.verdict,
    }


def _printout_part(v: Verification, only: Sequence[Place]) -> dict[str, Any]:
    c = v.closed
    return {
        "file": c.file,
        "sha256": c.sha256,
        "rows": c.rows,
        "case": c.cases[0] if len(c.cases) == 1 else list(c.cases),
        "units": dict(c.units),
        "signs": dict(c.signs),
        "not_understood": [{"line": line, "text": text, "why": why} for line, text, why in c.not_understood],
        "beside_opinions": v.verdict,
        "alone": [{"case": p.case, "quantity": p.quantity, "member": p.member, "joint": p.joint, "at": p.at} for p in only],
    }
