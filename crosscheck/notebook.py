"""The package from a notebook or a script: a frame, its opinions, a claim judged, and everything as pandas tables.

Thin: each function hands on what the commands stand on (`check.py`). All of it is at hand as `crosscheck.read`,
`crosscheck.ask` and so on. Axes, signs and units are the README's: values in the frame's own force and length
(`frame.units`), rotations in radians, what is undetermined is NaN. Whatever cannot be used raises UnusableInput with one
message a problem.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal, get_args

import numpy as np

from crosscheck import check
from crosscheck.check import Opinions, Verification
from crosscheck.claims import FrameNames, ReadingOptions, read_claim, read_claim_text
from crosscheck.compare.differences import Difference
from crosscheck.compare.opinions import (
    END_QUANTITIES,
    JOINT_QUANTITIES,
    REACTION_QUANTITIES,
    SPAN_QUANTITIES,
    with_turning_points,
)
from crosscheck.frame.model import Frame
from crosscheck.frame.reader import read_frame, read_frame_text
from crosscheck.frame.stations import stations
from crosscheck.problems import Problem, UnusableInput
from crosscheck.review.finding import Finding

if TYPE_CHECKING:
    import pandas as pd

Contents = Literal["member_ends", "joints", "reactions", "spans", "disagreements", "statics", "compatibility", "suspects"]
"""What `table` can set out; named as in the JSON document."""


def read(frame: str | Path, variant: str = "", folder: str | Path | None = None) -> Frame:
    """A frame from a file, or from the text of one.

    frame: a path; a str of several lines is the text itself. variant: which frame of a [family]. folder: where the tables
    and included files of a text lie (of a file: beside it). Raises UnusableInput with every problem found.
    """
    if isinstance(frame, str) and "\n" in frame:
        return read_frame_text(frame, folder=None if folder is None else Path(folder), variant=variant)
    return read_frame(frame, variant)


def ask(frame: Frame, case: str | None = None, ask_library: bool = False) -> Opinions:
    """What three methods make of a frame, and how they compare (`crosscheck opinions`).

    case: one load case, combination or envelope; all where None. ask_library: however large the frame is. The result's
    `verdict` is "agree", "disagree" or "undecided"; `answers` by opinion hold arrays (answer.py), `silent` says who
    abstains and why. Raises UnusableInput for an unknown case and for a frame that cannot stand.
    """
    return check.ask(frame, check.chosen_names(frame, case), ask_library)


def verify(
    frame: Frame, claim: str | Path | None, case: str | None = None, *, tolerance: float | None = None,
    units: str | None = None, columns: Sequence[str] = (), reading: str | Path | None = None,
    values: Sequence[str] = (), sheet: str | None = None, suspects: bool = True,
) -> Verification:  # fmt: skip
    """Pasted results judged against the opinions (`crosscheck verify`).

    claim: a file; a str of several lines is the pasted text itself; None where `values` say all, each in words
    ("B1-C1 max 412 kNm"). case: what the claim is of, where it does not say. tolerance: in percent, the frame's where None.
    units, columns, reading, sheet: as the options of the same name. suspects: whether to look for what would explain a
    difference. The result's `verdict` is "agree", "disagree" or "undecided"; `grounds` and `undecided` say why.
    Raises UnusableInput for a claim that cannot be opened or holds no results.
    """
    if tolerance is not None and not 0 < tolerance < 100:
        raise UnusableInput([Problem("", None, "tolerance", f"{tolerance} is no percentage", "a number like 1 or 2.5")])
    options = ReadingOptions(units=units, columns=tuple(columns), file=reading, values=tuple(values), sheet=sheet)
    names = FrameNames.of(frame)
    pasted = isinstance(claim, str) and "\n" in claim
    understood = read_claim_text(str(claim), names, options) if pasted else read_claim(claim, names, options)
    return check.verify(frame, understood, case, None if tolerance is None else tolerance / 100, suspects=suspects)


def inspect(frame: Frame) -> list[Finding]:
    """What a reviewer would ask about the model, the gravest first (`crosscheck inspect`): `grade` is "serious", "check"
    or "note", `where` the places, `says` the question. `pandas.DataFrame(inspect(frame))` sets them out."""
    from crosscheck.review.inspect import inspect, subject_of

    return list(inspect(subject_of(frame)))


def record(frame: str | Path, reason: str, variant: str = "") -> Path:
    """Put today's agreed values of the frame in this file on record (`crosscheck record`); returns the record's path.

    Raises crosscheck.suite.record.Refused where the opinions do not agree, UnusableInput for a frame or record that
    cannot be read and for a reason that says nothing.
    """
    from crosscheck.suite.beside import Standard
    from crosscheck.suite.record import put_on_record

    return put_on_record(Standard(Path(frame), variant), ask(read_frame(frame, variant)), reason)


def printed(result: Opinions | Verification, width: int = 100) -> str:
    """The report that the commands print, as text of `width` characters a line (80 or more)."""
    from crosscheck.report.effects import USUAL, critical_line
    from crosscheck.report.terminal import opinions_report, plain_text, verify_report

    opinions = _opinions(result)
    critical = critical_line(opinions.frame, check.critical_factors(opinions.frame, opinions.names, USUAL))
    if isinstance(result, Verification):
        return plain_text(verify_report(result, critical), width)
    return plain_text(opinions_report(result, (), critical), width)


def table(result: Opinions | Verification, of: Contents) -> pd.DataFrame:
    """One part of a result as a table, a row a place; named and signed as in the JSON document.

    member_ends: case, member, joint, opinion: axial (tension positive), shear (along local +y), moment (clockwise), on the
      member. joints: dx, dy, rotation (clockwise). reactions: fx, fy, moment (clockwise), on the frame, at supports.
      spans: case, member, opinion: x, axial, shear, moment (sagging), across (along local +y), at stations and extremes.
      These four are indexed by place, and `.unstack("opinion")` lays the opinions side by side.
    disagreements: among the opinions; of a Verification between claim and opinions. A column for each opinion and the
      claim, then difference, allowed, unsafe (the claim is smaller), line (of the claim) and note.
    statics, compatibility: the audit of a claim; `ok` is None where it could not be judged. suspects: best first.
    Raises UnusableInput for an unknown name, and for what only a Verification has.
    """
    import pandas as pd

    if of not in get_args(Contents):
        known = ", ".join(get_args(Contents))
        raise UnusableInput([Problem("", None, "table", f'there is no part "{of}"', f"one of {known}")])
    if of == "disagreements":
        return _disagreements(result)
    if of in ("member_ends", "joints", "reactions", "spans"):
        places, quantities = _HEADS[of]
        rows = _ROWS[of](_opinions(result))
        return pd.DataFrame(rows, columns=[*places, *quantities]).set_index(list(places))
    if not isinstance(result, Verification):
        says = f'"{of}" is of a claim, and this result has none'
        raise UnusableInput([Problem("", None, "table", says, "give what verify returned")])
    heads, fields = zip(*_CLAIM_HEADS[of].items(), strict=True)
    return pd.DataFrame([[getattr(one, name) for name in fields] for one in _of_claim(result, of)], columns=list(heads))


# --- rows


def _opinions(result: Opinions | Verification) -> Opinions:
    return result.opinions if isinstance(result, Verification) else result


def _given(result: Opinions) -> Iterator[tuple[str, str]]:
    """(case, opinion) wherever the opinion speaks for the case."""
    for case in result.names:
        yield from ((case, opinion) for opinion, answer in result.answers.items() if case in answer.cases)


def _end_rows(result: Opinions) -> Iterator[tuple[Any, ...]]:
    for case, opinion in _given(result):
        ends = result.answers[opinion].cases[case].ends
        for k, member in enumerate(result.frame.members.values()):
            yield case, member.name, member.joint_from, opinion, *ends[k, 0]
            yield case, member.name, member.joint_to, opinion, *ends[k, 1]


def _joint_rows(result: Opinions) -> Iterator[tuple[Any, ...]]:
    for case, opinion in _given(result):
        moved = result.answers[opinion].cases[case].joints
        yield from ((case, joint, opinion, *moved[k]) for k, joint in enumerate(result.frame.joints))


def _reaction_rows(result: Opinions) -> Iterator[tuple[Any, ...]]:
    for case, opinion in _given(result):
        forces = result.answers[opinion].cases[case].reactions
        yield from ((case, name, opinion, *forces[result.frame.joint_index[name]]) for name in result.frame.supports)


def _span_rows(result: Opinions) -> Iterator[tuple[Any, ...]]:
    names, at = list(result.frame.members), stations(result.frame)
    for case, opinion in _given(result):
        answer = result.answers[opinion]
        member, x, side = with_turning_points(answer, case, at)
        values = answer.spans.along(case, member, x, side)
        yield from ((case, names[m], opinion, d, *row) for m, d, row in zip(member, x, values, strict=True))


_HEADS: dict[str, tuple[tuple[str, ...], tuple[str, ...]]] = {
    "member_ends": (("case", "member", "joint", "opinion"), END_QUANTITIES),
    "joints": (("case", "joint", "opinion"), JOINT_QUANTITIES),
    "reactions": (("case", "joint", "opinion"), REACTION_QUANTITIES),
    "spans": (("case", "member", "opinion"), ("x", *SPAN_QUANTITIES)),
}
_ROWS = {"member_ends": _end_rows, "joints": _joint_rows, "reactions": _reaction_rows, "spans": _span_rows}
_CASE, _JUDGED = {"case": "case"}, {"allowed": "allowed", "ok": "ok"}
_CLAIM_HEADS: dict[str, dict[str, str]] = {
    "statics": {**_CASE, "check": "check", "where": "where", "component": "component", "residual": "residual", **_JUDGED},
    "compatibility": {
        **_CASE, "check": "kind", "where": "where", "member": "member", "rotation": "rotation", "expected": "expected",
        **_JUDGED,
    },
    "suspects": {"kind": "kind", "where": "where", "says": "says", "explains": "explains", "tied_with": "tied_with"},
}  # fmt: skip
"""Heads of a claim's tables, by the JSON document's keys, and the fields they come from."""


def _of_claim(result: Verification, of: str) -> Iterable[Any]:
    if of == "suspects":
        return result.suspects
    if of == "statics":
        return (one for audit in result.audits for one in audit.statics)
    return (one for audit in result.audits if audit.compatibility is not None for one in audit.compatibility.checks)


def _disagreements(result: Opinions | Verification) -> pd.DataFrame:
    import pandas as pd

    found: list[Difference] = []
    voices: tuple[str, ...] = tuple(_opinions(result).answers)
    if isinstance(result, Verification):
        found, voices = [d for c in result.cases for d in c.differences], ("claim", *voices)
    else:
        found = [d for judged in result.judgements.values() for d in judged.differences]
    rows = [_difference_row(d, voices) for d in found]
    heads = ["case", "of", "quantity", "member", "joint", "at", *voices, "difference", "allowed", "unsafe", "line", "note"]
    return pd.DataFrame(rows, columns=heads)


def _difference_row(d: Difference, voices: Iterable[str]) -> list[Any]:
    p = d.place
    said = [np.nan if d.values.get(voice) is None else d.values[voice] for voice in voices]
    return [p.case, p.of, p.quantity, p.member, p.joint, p.at, *said, d.difference, d.allowed, d.unsafe, d.line, d.note]
