"""The record of two printouts of one frame: what moved between the two, for whoever takes a new program version on."""

from __future__ import annotations

from collections.abc import Sequence

from crosscheck.check import TwoPrintouts
from crosscheck.claims.reading import Reading
from crosscheck.compare.differences import Difference, Place
from crosscheck.compare.printouts import FIRST, SECOND
from crosscheck.frame.model import Frame
from crosscheck.report import terminal, words
from crosscheck.report.about import Circumstances
from crosscheck.report.closing import sign_off, verbatim
from crosscheck.report.content import Grid, Record, Says, Section, Verbatim
from crosscheck.report.printouts import printouts_facts, printouts_sentence
from crosscheck.report.record import checked, drawn, file_record


def printouts_record(result: TwoPrintouts, readings: tuple[Reading, Reading], around: Circumstances) -> Record:
    """The record of `crosscheck verify FRAME CLAIM --against OTHER`."""
    moved, frame = result.moved, result.first.opinions.frame
    numbered = list(enumerate(moved.differences, 1))
    facts = [*terminal.frame_facts(frame), *printouts_facts(result)]
    sections = [
        checked(frame, facts, around, result.first.opinions.warnings),
        drawn(frame, [(k, d.place) for k, d in numbered]),
        Section("What moved", (_moved(frame, numbered),) if numbered else (Says(("Nothing.",)),)),
        _alone(result, moved.only_first, moved.only_second),
        Section("Cautions", (Says(words.CAUTIONS),)),
        sign_off(len(numbered), ()),
        _both(frame, readings),
    ]
    still = [] if moved.verdict == "agree" else [f"the verdict is {_word(moved.verdict)}", *moved.undecided]
    gist = [("First", _first(frame, d)) for _, d in numbered[:1]]
    gist += [(f"The {name}", _beside(v.verdict)) for name, v in ((FIRST, result.first), (SECOND, result.second))]
    return file_record("Record of two printouts", frame, _word(moved.verdict), f"{printouts_sentence(result)}.",
                       tuple(still), sections, around, tuple(gist))  # fmt: skip


def _word(verdict: str) -> str:
    return {"agree": "nothing moved", "disagree": "moved"}.get(verdict, verdict)


def _beside(verdict: str) -> str:
    return {"agree": "agrees with the opinions", "disagree": "disagrees with the opinions"}.get(
        verdict, "cannot be judged surely by the opinions"
    )


def _first(frame: Frame, d: Difference) -> str:
    one, other = words.number(d.values[FIRST]), words.number(d.values[SECOND])
    unit = words.unit_of(frame, d.place.quantity)
    return f"{words.place(d.place)}, {d.place.quantity} in {d.place.case}: {one} and then {other} {unit}"


def _moved(frame: Frame, numbered: Sequence[tuple[int, Difference]]) -> Grid:
    rows = tuple(
        (str(k), d.place.case, words.place(d.place), f"{d.place.quantity}, {words.unit_of(frame, d.place.quantity)}",
         words.number(d.values[FIRST]), words.number(d.values[SECOND]), words.short(d.difference), words.short(d.allowed),
         "")
        for k, d in numbered
    )  # fmt: skip
    columns = (
        ("no.", "right"), ("case", "left"), ("place", "left"), ("quantity", "left"), (FIRST, "right"), (SECOND, "right"),
        ("moved by", "right"), ("allowed", "right"), ("disposition, initials", "left"),
    )  # fmt: skip
    return Grid("Furthest beyond the printed rounding first; in the frame's units and signs.", columns, rows, (8,))


def _alone(result: TwoPrintouts, first: Sequence[Place], second: Sequence[Place]) -> Section:
    named = ((result.first.closed.file or "the claim", first), (result.second.closed.file or "the other", second))
    lines = [f"In {file} alone: {words.counted(len(places), 'value')}, the first of them {places[0].quantity} of "
             f"{words.place(places[0])} in {places[0].case}." for file, places in named if places]  # fmt: skip
    return Section("Not compared", (Says(tuple(lines) or ("Nothing was left out.",)),))


def _both(frame: Frame, readings: tuple[Reading, Reading]) -> Section:
    whole = verbatim(frame, readings[0])
    other = Verbatim(f"Against: {readings[1].file or 'text'}", tuple(t.text.rstrip("\r\n") for t in readings[1].trace))
    return Section("Frame and printouts, verbatim", (*whole.blocks, other))
