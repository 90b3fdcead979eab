"""The check record: what a reviewer reads, signs off against and files, as plain content before it is a page.

Its parts stand in the order a reviewer asks for them. The HTML page and the PDF are set from the same content; nothing
here computes.
"""

from __future__ import annotations

import datetime
from collections.abc import Iterable, Iterator, Sequence

import numpy as np

from crosscheck import __version__
from crosscheck.answer import Answer
from crosscheck.check import OPINIONS, CaseAudit, Opinions, Verification
from crosscheck.compare.differences import Difference, Place
from crosscheck.frame.model import Frame
from crosscheck.report import terminal, words
from crosscheck.report.about import ABOUT, FILED, Circumstances
from crosscheck.report.closing import closing_sections, review_section, sign_off, verbatim
from crosscheck.report.content import Block, Facts, Grid, Record, Says, Section
from crosscheck.report.enveloped import envelope_sections
from crosscheck.report.gist import opinions_gist, verify_gist
from crosscheck.report.pictures import CasePictures, frame_picture, loads_picture
from crosscheck.review.finding import Finding, Subject

MOST_ROWS = 6000
"""Rows of result tables in one record; the JSON document has them all."""
MOST_MISFITS = 40
"""Rows of one table of the audit: one slip is felt in many places."""
MOST_PICTURED, MOST_DRAWN = 6, 1200
"""Cases with pictures in one record, and members drawn in them all."""


def verify_record(result: Verification, around: Circumstances) -> Record:
    """The record of `crosscheck verify`."""
    opinions = result.opinions
    frame = opinions.frame
    names = [n for n in result.closed.cases if n in opinions.names]
    numbered = _numbered(d for c in result.cases for d in c.differences)
    sections = [
        checked(frame, terminal.claim_facts(result), around, opinions.warnings),
        _drawing(frame, numbered),
        _printed_input(result),
        _suspects(result),
        _claim_differences(result, numbered),
        _own_section(_own_differences(opinions)),
        Section("Audit of the claim", _audits(frame, result.audits) or _of_envelopes(result)),
        *(_case(opinions, name, result, numbered) for name in names[: _pictured(frame)]),
        *_tables(opinions, names),
        *envelope_sections(opinions, [n for n in result.closed.cases if n in frame.several]),
        Section("Not compared", (Says(tuple(terminal.not_compared_lines(result)) or ("Nothing was left out.",)),)),
        *closing_sections(opinions, around, numbered),
    ]
    sentence = " ".join([terminal.claim_sentence(result), *map(_sentence, terminal.beside(result))])
    questions = [*result.undecided, *opinions.warnings]
    still = _open(result.verdict, around, questions, result.facts)
    gist = verify_gist(result, numbered, around.history, around.findings)
    if around.supposed:
        still = ("it supposes a mistake that nobody has confirmed", *still)
        gist = (("Supposed", f"{around.supposed}; all below is of the frame and claim so changed"), *gist)
    title = "Check record, as a suspect supposes" if around.supposed else "Check record"
    return file_record(title, frame, result.verdict, sentence, still, sections, around, gist)


def opinions_record(result: Opinions, around: Circumstances) -> Record:
    """The record of `crosscheck opinions`."""
    frame = result.frame
    numbered = _own_differences(result)
    sections = [
        checked(frame, terminal.opinions_facts(result), around, result.warnings),
        _drawing(frame, numbered),
        _own_section(numbered),
        *(_case(result, name, None, numbered) for name in result.names[: _pictured(frame)]),
        *_tables(result, list(result.names)),
        *envelope_sections(result, result.envelopes),
        Section("Not compared", (Says(tuple(terminal.undetermined_lines(result)) or ("Nothing was left out.",)),)),
        *closing_sections(result, around, numbered),
    ]
    return file_record(
        "Record of opinions", frame, result.verdict, terminal.opinions_sentence(result),
        _open(result.verdict, around, result.warnings), sections, around,
        opinions_gist(result, numbered, around.findings),
    )  # fmt: skip


def inspect_record(subject: Subject, findings: Sequence[Finding], around: Circumstances) -> Record:
    """The record of `crosscheck inspect`."""
    frame = subject.frame
    totals = tuple(
        (name, *(words.number(float(v), float(np.abs(subject.total(name)[:2]).max())) for v in subject.total(name)[:2]))
        for name in frame.cases
    )
    pictured = list(frame.cases)[: _pictured(frame)] if frame.members else []
    sections = [
        checked(frame, terminal.frame_facts(frame), around, frame.warnings),
        drawn(frame, [(k, p) for k, f in enumerate(findings, 1) for p in _places(frame, f)]),
        review_section(findings),
        Section("Loads", (Grid("What each load case adds up to.", (("case", "left"), *_heads(frame, ("fx", "fy"))), totals),
                          *(loads_picture(frame, name) for name in pictured))),
        Section("Cautions", (Says(words.CAUTIONS),)),
        sign_off(0, findings),
        verbatim(frame, None),
    ]  # fmt: skip
    serious = sum(f.grade == "serious" for f in findings)
    verdict = words.counted(serious, "serious finding") if serious else "nothing serious"
    asked = sum(f.grade == "check" for f in findings)
    notes = len(findings) - serious - asked
    sentence = f"{words.counted(asked, 'finding')} to be looked at, {words.counted(notes, 'note')}."
    still = (words.counted(serious, "serious finding"),) if serious else ()
    return file_record("Review of the model", frame, verdict, sentence, still, sections, around)


def _places(frame: Frame, finding: Finding) -> Iterator[Place]:
    """The joints and members that a finding names; notes stand in the table alone."""
    if finding.grade == "note":
        return
    for name in finding.where:
        kind, _, rest = name.partition(" ")
        if kind != "member" and (name in frame.joints or rest in frame.joints):
            yield Place("", "joints", "", joint=name if name in frame.joints else rest)
        elif name in frame.members or rest in frame.members:
            yield Place("", "spans", "", member=name if name in frame.members else rest)


def file_record(
    title: str, frame: Frame, verdict: str, sentence: str, still: tuple[str, ...], sections: Iterable[Section],
    around: Circumstances, gist: tuple[tuple[str, str], ...] = (),
) -> Record:  # fmt: skip
    kept = tuple(s for s in sections if s.blocks)
    filed = tuple((ABOUT[key], around.about[key]) for key in FILED if around.about.get(key))
    return Record(title, frame.title or frame.file, verdict, sentence, still, kept, moment(around.when), gist=gist,
                  filed=filed)  # fmt: skip


def moment(when: datetime.datetime) -> str:
    return f"{when:%Y-%m-%d %H:%M} UTC"


def _sentence(text: str) -> str:
    return f"{text[:1].upper()}{text[1:]}{'' if text.endswith('.') else '.'}"


def _open(
    verdict: str, around: Circumstances, questions: Sequence[str], facts: Sequence[Finding] = ()
) -> tuple[str, ...]:
    """Why the record is not for acceptance: a verdict other than agree, a serious finding, printed input that differs, a
    question left open."""
    reasons = [] if verdict == "agree" else [f"the verdict is {verdict}"]
    reasons += [f"{words.counted(len(facts), 'fact')} of the printed input against the frame"] if facts else []
    serious = sum(f.grade == "serious" for f in around.findings)
    reasons += [words.counted(serious, "serious finding in the model", "serious findings in the model")] if serious else []
    return (*reasons, *(questions if verdict != "agree" else ()))


def _pictured(frame: Frame) -> int:
    """How many cases have pictures: fewer for a large frame."""
    return max(1, min(MOST_PICTURED, MOST_DRAWN // max(len(frame.members), 1)))


def _numbered(differences: Iterable[Difference]) -> list[tuple[int, Difference]]:
    return list(enumerate(differences, 1))


def _own_differences(result: Opinions) -> list[tuple[int, Difference]]:
    return _numbered(d for j in result.judgements.values() for d in j.differences)


# --- sections


def checked(
    frame: Frame, facts: Sequence[tuple[str, str]], around: Circumstances, warnings: Sequence[str]
) -> Section:
    """What was checked, against what, by which methods and to which tolerance."""
    rows = [(label, around.about[key]) for key, label in ABOUT.items() if around.about.get(key)]
    rows += [*facts, ("frame sha256", frame.sha256)]
    if around.reading is not None:
        rows.append(("claim sha256", around.reading.sha256))
    versions = f"crosscheck {__version__}, numpy {np.__version__}, {_version('scipy')}, {_version('anastruct')}"
    rows += [("versions", versions), ("date", moment(around.when))]
    rows += [("command", around.command)] if around.command else []
    blocks: list[Block] = [Facts(tuple((f"{label[:1].upper()}{label[1:]}", text) for label, text in rows))]
    notes = [f"Note: {w}" for w in warnings]
    return Section("What was checked", (*blocks, *([Says(tuple(notes))] if notes else [])))


def _version(package: str) -> str:
    from importlib.metadata import version

    return f"{package} {version(package)}"


def _drawing(frame: Frame, numbered: Sequence[tuple[int, Difference]]) -> Section:
    return drawn(frame, [(k, d.place) for k, d in numbered])


def drawn(frame: Frame, places: Sequence[tuple[int, Place]]) -> Section:
    named = [n for _, p in places for n in (p.member, p.joint) if n]
    return Section("The frame", (frame_picture(frame, places, named),) if frame.members else ())


def _printed_input(result: Verification) -> Section:
    """Facts come before inference: what the other model was given, where the paste prints it."""
    rows = tuple((f.kind or "-", words.some(f.where) or "-", f.says) for f in result.facts)
    columns = (("kind", "left"), ("where", "left"), ("what the paste prints", "left"))
    title = "Printed input that differs from the frame"
    return Section(title, (Grid("Facts, not hypotheses.", columns, rows),) if rows else ())


def _suspects(result: Verification) -> Section:
    if not result.suspects:
        return Section("Suspects", (Says((_sentence(result.no_suspects),)),) if result.no_suspects else ())
    rows = [
        (str(k), s.kind, words.some(s.where) or "-", s.says, f"{100 * s.explains:.4g}%", "yes" if s.fits else "no")
        for k, s in enumerate(result.suspects, 1)
    ]
    columns = (("no.", "right"), ("kind", "left"), ("where", "left"), ("what would explain it", "left"),
               ("explains", "right"), ("to the printed rounding", "left"))  # fmt: skip
    caption = "Single mistakes that would explain the difference, best first. Each is a hypothesis, not a finding."
    ties = [f"Suspect {k} ties with: {tie}" for k, s in enumerate(result.suspects[:1], 1) for tie in s.tied_with]
    return Section("Suspects", (Grid(caption, columns, tuple(rows)), *([Says(tuple(ties))] if ties else [])))


def _claim_differences(result: Verification, numbered: Sequence[tuple[int, Difference]]) -> Section:
    """Where there are none, in how many values: none of none is no comfort."""
    title = "Differences between the claim and the opinions"
    if numbered:
        return Section(title, (_claim_grid(result.opinions.frame, numbered),))
    compared = sum(c.compared for c in result.cases)
    says = f"None in the {words.counted(compared, 'value')} compared." if compared else "Nothing could be compared."
    return Section(title, (Says((says,)),))


def _own_section(numbered: Sequence[tuple[int, Difference]]) -> Section:
    return Section("Differences between the opinions", (_own_grid(numbered),) if numbered else ())


def _claim_grid(frame: Frame, numbered: Sequence[tuple[int, Difference]]) -> Grid:
    rows = []
    for k, d in numbered:
        claim, ours = d.values.get("claim"), words.opinions_value(d)
        side = "low" if d.unsafe else "high"
        quantity = f"{d.place.quantity}, {_together(words.unit_of(frame, d.place.quantity))}"
        rows.append((
            str(k), d.place.case, words.place(d.place), quantity,
            terminal.with_face(frame, d, claim, ours), terminal.with_face(frame, d, ours, claim),
            words.short(d.difference), words.short(d.allowed), d.note or side, str(d.line or ""), "",
        ))  # fmt: skip
    columns = (("no.", "right"), ("case", "left"), ("place", "left"), ("quantity", "left"), ("claim", "right"),
               ("opinions", "right"), ("differ by", "right"), ("allowed", "right"), ("claim is", "left"),
               ("line", "right"), ("disposition, initials", "left"))  # fmt: skip
    caption = "Unsafe side first, then worst first; in the frame's units and signs. Line: of the claim."
    return Grid(caption, columns, tuple(rows), (10,))


def _own_grid(numbered: Sequence[tuple[int, Difference]]) -> Grid:
    names = [n for n in OPINIONS if any(n in d.values for _, d in numbered)]
    rows = tuple(
        (str(k), d.place.case, words.place(d.place), d.place.quantity, *(words.said(d, n) for n in names),
         words.short(d.difference), words.short(d.allowed), "")
        for k, d in numbered
    )  # fmt: skip
    columns = (("no.", "right"), ("case", "left"), ("place", "left"), ("quantity", "left"), *((n, "right") for n in names),
               ("differ by", "right"), ("allowed", "right"), ("disposition, initials", "left"))  # fmt: skip
    return Grid("Worst first.", columns, rows, (len(columns) - 1,))


def _audits(frame: Frame, audits: Sequence[CaseAudit]) -> tuple[Block, ...]:
    """Every case of which something could be judged, and in one sentence those of which nothing could."""
    silent = [a.case for a in audits if a.compatibility is None and all(s.ok is None for s in a.statics)]
    says = f"The claim does not give enough to judge statics or compatibility of {words.some(silent)}."
    blocks = [b for audit in audits if audit.case not in silent for b in _audit(frame, audit)]
    return (*blocks, *([Says((says,))] if silent else []))


def _of_envelopes(result: Verification) -> tuple[Block, ...]:
    several = [n for n in result.closed.cases if n in result.opinions.frame.several]
    says = f"None of {words.some(several)}: an envelope is no state of balance."
    return (Says((says,)),) if several else ()


def _audit(frame: Frame, audit: CaseAudit) -> list[Block]:
    """Statics and compatibility of one case: what held in a sentence, what failed in a table."""
    judged = [s for s in audit.statics if s.ok is not None]
    failing = sorted((s for s in judged if not s.ok), key=lambda s: -abs(s.residual) / (s.allowed or 1.0))
    held = f"{len(judged) - len(failing):,} of {words.counted(len(judged), 'balance')} hold to the printed rounding"
    left = len(audit.statics) - len(judged)
    lines = [f"Statics, {audit.case}: {held}" + (f"; {left:,} could not be judged" if left else "") + "."]
    blocks: list[Block] = [Says(tuple(lines))]
    if failing:
        rows = tuple(
            (s.check, s.where or "whole frame", s.component, words.short(s.residual), words.short(s.allowed),
             words.unit_of(frame, "moment" if s.component == "moment" else "fx"))
            for s in failing[:MOST_MISFITS]
        )  # fmt: skip
        columns = (("balance", "left"), ("where", "left"), ("of", "left"), ("left over", "right"), ("allowed", "right"),
                   ("unit", "left"))  # fmt: skip
        blocks.append(Grid(f"Balances of {audit.case} that fail, worst first{_first(len(failing))}.", columns, rows))
    return blocks + _compatibility(frame, audit)


def _first(count: int) -> str:
    return f", the first {MOST_MISFITS} of {count:,}" if count > MOST_MISFITS else ""


def _compatibility(frame: Frame, audit: CaseAudit) -> list[Block]:
    found = audit.compatibility
    if found is None:
        return [Says((f"Compatibility, {audit.case}: not judged.",))]
    lines = [f"Compatibility, {audit.case}: {found.says}", *(f"Not judged: {line}" for line in found.not_judged)]
    lines += [terminal.bound_words(frame, audit.bound)] if audit.bound is not None else []
    blocks: list[Block] = [Says(tuple(map(_sentence, lines)))]
    failing = [c for c in found.checks if not c.ok]
    failing.sort(key=lambda c: -abs(c.rotation - c.expected) / (c.allowed or 1.0))
    if failing:
        rows = tuple(
            (c.kind, c.member or c.where, c.where if c.member else c.direction, words.short(c.rotation),
             words.short(c.rotation - c.expected), words.short(c.allowed), terminal.deformation_unit(frame, c))
            for c in failing[:MOST_MISFITS]
        )  # fmt: skip
        columns = (("what", "left"), ("of", "left"), ("at", "left"), ("by the claim", "right"), ("misfit", "right"),
                   ("allowed", "right"), ("unit", "left"))  # fmt: skip
        caption = f"Deformations of {audit.case} that do not fit together, worst first{_first(len(failing))}."
        blocks.append(Grid(caption, columns, rows))
    return blocks


def _case(
    opinions: Opinions, name: str, result: Verification | None, numbered: Sequence[tuple[int, Difference]]
) -> Section:
    """Pictures of one case."""
    answer = _speaker(opinions, name)
    if answer is None:
        return Section(f"Pictures: {name}", (Says((f"No opinion speaks for {name}.",)),))
    values = [v for v in result.closed.values if v.case == name] if result else []
    marked = [(k, d.place) for k, d in numbered if d.place.case == name]
    drawn = CasePictures(opinions.frame, answer, name, values, marked).all()
    return Section(f"Pictures: {name}", (loads_picture(opinions.frame, name), *drawn))


def _speaker(opinions: Opinions, name: str) -> Answer | None:
    return next((a for a in opinions.answers.values() if name in a.cases), None)


def _tables(opinions: Opinions, names: Sequence[str]) -> list[Section]:
    """Results by case, as many as there is room for."""
    frame = opinions.frame
    each = 2 * len(frame.members) + len(frame.joints) + len(frame.supports)
    room = max(1, MOST_ROWS // max(each, 1))
    sections = [Section(f"Results: {n}", tuple(_results(opinions, n))) for n in names[:room]]
    pictured = _pictured(frame)
    left = [f"Pictures of {words.some(names[pictured:])} are left out."] if len(names) > pictured else []
    left += [f"Results of {words.some(names[room:])} are left out; --json gives them."] if len(names) > room else []
    return [*sections, *([Section("Left out of this record", (Says(tuple(left)),))] if left else [])]


def _results(opinions: Opinions, name: str) -> list[Block]:
    answer = _speaker(opinions, name)
    if answer is None:
        return []
    frame, case = opinions.frame, answer.cases[name]
    scales = [opinions.judgements[name].scales]
    at_ends, moves, pulls = (words.quiet(values, scales, of) for values, of in (
        (case.ends, words.ENDS), (case.joints, words.JOINTS), (case.reactions, words.REACTIONS)))  # fmt: skip
    whose = "as agreed" if opinions.judgements[name].verdict == "agree" else f"by {answer.opinion}"
    scale = [_largest(at_ends[:, :, k]) for k in range(3)]
    ends = tuple(
        (m.name, joint, *(words.number(float(at_ends[k, end, c]), scale[c]) for c in range(3)),
         words.end_face(frame, m.name, joint, float(at_ends[k, end, 2]), scale[2]))
        for k, m in enumerate(frame.members.values())
        for end, joint in ((0, m.joint_from), (1, m.joint_to))
    )  # fmt: skip
    move = [_largest(moves[:, c]) for c in range(3)]
    pull = [_largest(pulls[:, :2])] * 2 + [_largest(pulls[:, 2])]
    joints = tuple((j, *_numbers(moves[k], move)) for k, j in enumerate(frame.joints))
    supports = tuple((j, *_numbers(pulls[frame.joint_index[j]], pull)) for j in frame.supports)
    return [
        Grid(f"End actions {whose}: axial tension positive, shear along local y, moment clockwise.",
             (("member", "left"), ("at", "left"), *_heads(frame, ("axial", "shear", "moment")), ("tension", "left")), ends),
        Grid("Displacements.", (("joint", "left"), *_heads(frame, ("dx", "dy", "rotation"))), joints),
        Grid("Reactions on the frame.", (("support", "left"), *_heads(frame, ("fx", "fy", "moment"))), supports),
    ]  # fmt: skip


def _numbers(row: np.ndarray, scale: Sequence[float]) -> list[str]:
    return [words.number(float(v), s) for v, s in zip(row, scale, strict=True)]


def _heads(frame: Frame, quantities: Iterable[str]) -> list[tuple[str, str]]:
    return [(f"{q}, {_together(words.unit_of(frame, q))}", "right") for q in quantities]


def _together(unit: str) -> str:
    """A unit that no line's end parts."""
    return unit.replace(" ", "\u00a0")


def _largest(values: np.ndarray) -> float:
    finite = np.abs(values[np.isfinite(values)])
    return float(finite.max(initial=0.0))
