"""How every record ends: what opinions share, the model's review, the log, cautions, sign-off, the texts themselves."""

from __future__ import annotations

import hashlib
from collections import Counter
from collections.abc import Sequence
from itertools import combinations
from pathlib import Path

from crosscheck.check import OPINIONS, Opinions
from crosscheck.claims.reading import Reading
from crosscheck.compare.differences import Difference
from crosscheck.frame.model import Frame
from crosscheck.log import Entry
from crosscheck.report import words
from crosscheck.report.about import Circumstances
from crosscheck.report.content import Grid, Says, Section, Verbatim
from crosscheck.review.finding import Finding

SHARED = {
    ("slope-deflection", "moment-distribution"):
        "the frame file and its reader; directions and places of loads, the weight of a tapered piece laid out as 16 "
        "straight loads among them (right to 8e-8 of its effects); what patterns, either-or cases, states of stiffness and "
        "leans make of it; the list of what is a mechanism, tied or undetermined, and which displacements slack parts "
        "leave open; numpy, scipy's sparse factorisation",
    ("slope-deflection", "library"):
        "the frame file and its reader; directions and places of loads; the list of what is undetermined; numpy",
    ("moment-distribution", "library"):
        "the frame file and its reader; directions and places of loads; the list of what is undetermined; numpy",
}  # fmt: skip
"""What each pair of opinions still shares (README, What the opinions share)."""
MARK = "\u25a1"  # an empty box, to be ticked by hand


def closing_sections(
    opinions: Opinions, around: Circumstances, numbered: Sequence[tuple[int, Difference]]
) -> list[Section]:
    """Independence, the model's review, the log, cautions, sign-off and the texts themselves."""
    spoke = [n for n in OPINIONS if n in opinions.answers]
    pairs = tuple((f"{a}, {b}", SHARED[a, b]) for a, b in combinations(spoke, 2))
    caption = "Opinions that share an error agree in it. What each pair shares:"
    shares = Grid(caption, (("pair", "left"), ("shares", "left")), pairs)
    return [
        Section("Independence", (shares,) if pairs else (Says(("One opinion alone spoke.",)),)),
        review_section(around.findings),
        log_section(around.history),
        Section("Cautions", (Says((*words.CAUTIONS, "A suspect is a hypothesis; several mistakes may look like one.")),)),
        sign_off(len(numbered), around.findings),
        verbatim(opinions.frame, around.reading),
    ]


def review_section(findings: Sequence[Finding]) -> Section:
    """What `inspect` says of the model, each finding with room for what becomes of it."""
    rows = tuple((str(k), f.grade, words.some(f.where) or "frame", f.says, "") for k, f in enumerate(findings, 1))
    columns = (("no.", "right"), ("grade", "left"), ("where", "left"), ("finding", "left"),
               ("disposition, initials", "left"))  # fmt: skip
    counts = Counter(f.grade for f in findings)
    caption = ", ".join(f"{counts[g]:,} {g}" for g in ("serious", "check", "note"))
    return Section("Review of the model", (Grid(f"Before any results: {caption}.", columns, rows, (4,)),) if rows else ())


def log_section(history: Sequence[Entry]) -> Section:
    """Every earlier check of this frame, so that one tuned until it agreed can be seen."""
    rows = tuple(
        (e.when[:16].replace("T", " "), Path(e.claim).name or "-", e.claim_sha256[:12], e.frame_sha256[:12], e.settings,
         e.verdict, e.reason or "-")
        for e in history
    )  # fmt: skip
    columns = (("when", "left"), ("claim", "left"), ("claim sha256", "left"), ("frame sha256", "left"),
               ("settings", "left"), ("verdict", "left"), ("reason for a change", "left"))  # fmt: skip
    caption = f"{words.counted(len(rows), 'check')} with a record, this one last."
    return Section("Log of checks", (Grid(caption, columns, rows),) if rows else ())


def sign_off(differences: int, findings: Sequence[Finding]) -> Section:
    """Room for the checker, the reviewer and what they decide."""
    open_ = differences + sum(f.grade != "note" for f in findings)
    people = Grid("", (("", "left"), ("name", "left"), ("signature", "left"), ("date", "left"), ("remarks", "left")),
                  tuple((who, "", "", "", "") for who in ("Checker", "Reviewer")), (1, 2, 3, 4))  # fmt: skip
    choices = tuple(f"{MARK} {text}" for text in (
        "accepted as it stands", "accepted with the dispositions noted", "returned: claim to be corrected",
        "returned: frame file to be corrected",
    ))  # fmt: skip
    what = words.counted(open_, "difference or finding", "differences and findings")
    says = f"{what} to be disposed of and initialled above."
    return Section("Sign-off", (people, Says(choices), Says((says,) if open_ else ())))


def verbatim(frame: Frame, reading: Reading | None) -> Section:
    """The frame file, the tables beside it and the claim, as they were read."""
    blocks = [Verbatim(f"Frame: {frame.file or 'text'}", _file_lines(Path(frame.file), frame.sha256))] if frame.file else []
    if frame.file:
        from crosscheck.frame.reader import sources

        blocks += [_file_beside(path) for path in sources(Path(frame.file))[1:]]
    if reading is not None:
        title = f"Claim: {reading.file or 'text'}"
        blocks.append(Verbatim(title, tuple(t.text.rstrip("\r\n") for t in reading.trace)))
    return Section("Frame and claim, verbatim", tuple(blocks))


def _file_beside(path: Path) -> Verbatim:
    """A table or an office file that the frame was read with, under its checksum."""
    try:
        checksum = hashlib.sha256(path.read_bytes()).hexdigest()
    except OSError:
        checksum = "unknown"
    return Verbatim(f"Beside it: {path.name}, sha256 {checksum}", _file_lines(path))


def _file_lines(path: Path, sha256: str = "") -> tuple[str, ...]:
    try:
        data = path.read_bytes()
    except OSError as error:
        return (f"(cannot be read any more: {error.strerror})",)
    changed = sha256 and hashlib.sha256(data).hexdigest() != sha256
    note = ["(the file has changed since it was read)"] if changed else []
    return (*note, *data.decode("utf-8-sig", "replace").splitlines())
