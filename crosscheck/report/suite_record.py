"""The record of a whole set of frames: an overview with small pictures, and a page for each frame that it leads to."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

from crosscheck import check
from crosscheck.compare.differences import Difference
from crosscheck.frame.model import Frame
from crosscheck.problems import UnusableInput
from crosscheck.report import words
from crosscheck.report.about import Circumstances
from crosscheck.report.closing import verbatim
from crosscheck.report.content import Block, Facts, Gallery, Grid, Record, Says, Section
from crosscheck.report.pictures import frame_picture, small_picture
from crosscheck.report.record import moment
from crosscheck.suite.regress import FrameOutcome, SuiteOutcome


def suite_records(
    outcome: SuiteOutcome, around: Circumstances, folder: str, ending: str = ".html"
) -> tuple[Record, Mapping[str, Record]]:
    """The overview, and by their addresses below `folder` the records it leads to."""
    frames = [_frame(f) for f in outcome.frames]
    addresses = [f"{folder}/{k:03d}-{_plain(f.label)}{ending}" for k, f in enumerate(outcome.frames, 1)]
    together = zip(addresses, outcome.frames, frames, strict=True)
    pages = {address: _frame_record(f, frame, around) for address, f, frame in together}
    links = {f.label: address for f, address in zip(outcome.frames, addresses, strict=True)}
    rows = tuple((f.label, f.state, f"{f.compared:,}", f.says) for f in outcome.frames)
    columns = (("frame", "left"), ("state", "left"), ("values", "right"), ("why", "left"))
    drawn = tuple(small_picture(frame, f.label) for f, frame in zip(outcome.frames, frames, strict=True)
                  if frame is not None and frame.members)  # fmt: skip
    held = outcome.exit_status == 0
    counts = ", ".join(f"{n:,} {state}" for state, n in outcome.counts.items())
    sections = (
        Section("Frames", (Grid(counts, columns, rows),)),
        Section("At a glance", (Gallery(drawn),) if drawn else ()),
        Section("How it was run", (Facts((("looked in", ", ".join(outcome.looked_in)), ("command", around.command))),)),
        Section("Cautions", (Says(words.CAUTIONS),)),
    )
    still = () if held else tuple(f"{f.label}: {f.state}" for f in outcome.frames if f.state != "held")
    overview = Record("Standard frames", words.counted(len(rows), "frame"), "held" if held else "not held", f"{counts}.",
                      still, tuple(s for s in sections if s.blocks), moment(around.when), links)  # fmt: skip
    return overview, pages


def _frame(f: FrameOutcome) -> Frame | None:
    try:
        return check.read(f.standard.path, f.standard.variant)
    except UnusableInput:
        return None


def _plain(label: str) -> str:
    """A name that every system's files may have."""
    return "".join(c if c.isascii() and (c.isalnum() or c in "-_") else "-" for c in label)[-60:]


def _frame_record(f: FrameOutcome, frame: Frame | None, around: Circumstances) -> Record:
    numbered = list(enumerate(f.differences, 1))
    blocks: list[Section] = [Section("How it was run", (Facts((("frame", f.standard.path.as_posix()),
                                                                ("command", around.command))),))]  # fmt: skip
    if frame is not None and frame.members:
        blocks.append(Section("The frame", (frame_picture(frame, [(k, d.place) for k, d in numbered]),)))
    claims = tuple((c.file, "held" if c.held else "not held", c.verdict, c.says) for c in f.claims)
    columns = (("claim", "left"), ("", "left"), ("verdict", "left"), ("why", "left"))
    blocks += [Section("Claims", (Grid("", columns, claims),))] if claims else []
    blocks += [Section("Differences", (_differences(numbered),))] if numbered else []
    accepted = tuple((words.place(d.place), d.place.quantity, words.short(d.difference), words.short(e.size),
                      e.until.isoformat(), e.initials, e.why) for d, e in f.accepted)  # fmt: skip
    heads = (("place", "left"), ("quantity", "left"), ("differ by", "right"), ("accepted", "right"), ("until", "left"),
             ("by", "left"), ("why", "left"))  # fmt: skip
    blocks += [Section("Accepted differences", (Grid("", heads, accepted),))] if accepted else []
    blocks.append(Section("Cautions", (Says(words.CAUTIONS),)))
    if frame is not None:
        whole = verbatim(frame, None)
        blocks.append(replace(whole, title="Frame, verbatim"))
    still = () if f.state == "held" else (f.says or f.state,)
    title = (frame.title if frame is not None else "") or f.label
    return Record("Standard frame", title, f.state, f.says, still, tuple(blocks), moment(around.when))


def _differences(numbered: list[tuple[int, Difference]]) -> Block:
    rows = tuple(
        (str(k), d.place.case, words.place(d.place), d.place.quantity,
         words.both_say(d), words.short(d.difference),
         words.short(d.allowed), "")
        for k, d in numbered
    )  # fmt: skip
    columns = (("no.", "right"), ("case", "left"), ("place", "left"), ("quantity", "left"), ("values", "left"),
               ("differ by", "right"), ("allowed", "right"), ("disposition, initials", "left"))  # fmt: skip
    return Grid("Worst first.", columns, rows, (7,))
