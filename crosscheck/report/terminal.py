"""The terminal report: verdict first, then how it was compared, the worst differences, and what was not compared.

Readable at 80 columns, in a pipe and without colour: every mark is a word. Renders findings and computes nothing but
their layout.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from io import StringIO
from typing import IO, Any

import numpy as np
from rich.console import Console, ConsoleOptions, Group, RenderableType, RenderResult
from rich.measure import Measurement
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from crosscheck.answer import MOMENT, Answer, WorkTable
from crosscheck.check import CaseAudit, Opinions, Verification
from crosscheck.compare.differences import Difference, Verdict
from crosscheck.compare.envelopes import NOBODY, Extremes, envelope
from crosscheck.compare.opinions import CaseJudgement, with_turning_points
from crosscheck.compare.tolerance import CLAIM, OWN, Scales
from crosscheck.frame.model import Frame
from crosscheck.frame.stations import stations
from crosscheck.problems import UnusableInput
from crosscheck.report import words

MOST_DIFFERENCES = 15
MOST_MISFITS = 8
MOST_ROWS = 60
VERDICT_STYLE: dict[Verdict, str] = {"agree": "bold", "disagree": "bold reverse", "undecided": "bold underline"}


def console(file: IO[str] | None = None) -> Console:
    """A console that neither guesses at numbers to colour nor breaks words in a pipe."""
    return Console(file=file, highlight=False, emoji=False, markup=False)


def show(report: RenderableType, file: IO[str] | None = None) -> None:
    """Print a report; where it goes to a file or a pipe, without the blanks that pad a terminal's lines."""
    out = console(file)
    if out.is_terminal:
        out.print(report)
        return
    with out.capture() as captured:
        out.print(report)
    out.file.write("".join(f"{line.rstrip()}\n" for line in captured.get().splitlines()))


def plain_text(report: RenderableType, width: int) -> str:
    """A report as text without colours, `width` characters a line."""
    out = Console(file=StringIO(), highlight=False, emoji=False, markup=False, width=width, color_system=None)
    with out.capture() as captured:
        out.print(report)
    return "".join(f"{line.rstrip()}\n" for line in captured.get().splitlines())


def headline(report: RenderableType) -> RenderableType:
    """The first line of a report: its verdict."""
    return report.renderables[0] if isinstance(report, Group) else report


# --- small parts


def heading(text: str) -> Text:
    return Text(f"\n{text}", style="bold")


UNBROKEN = 16
"""Names up to this long are never broken over lines; numbers never are, however long."""


@dataclass(frozen=True, slots=True)
class _Fitting:
    """A plain table; names stand whole, two blanks apart, where there is room. Where there is not, blanks and names of
    several words give way: what stood beyond the edge would be cut off unseen."""

    columns: Sequence[tuple[str, str]]
    rows: Sequence[Sequence[str]]

    def __rich_console__(self, console: Console, options: ConsoleOptions) -> RenderResult:
        made = self._made(2, whole=True)
        for blanks, whole in ((1, True), (2, False), (1, False)):
            if Measurement.get(console, options.update(max_width=10_000), made).minimum <= options.max_width:
                break
            made = self._made(blanks, whole)
        yield made

    def _made(self, blanks: int, whole: bool) -> Table:
        made = Table(box=None, pad_edge=False, padding=(0, blanks, 0, 0), header_style="underline", show_edge=False)
        for k, (head, side) in enumerate(self.columns):
            texts = [*head.splitlines(), *(row[k] for row in self.rows)]
            longest = max((len(text) for text in texts), default=0)
            if side == "right":
                made.add_column(head, justify="right", no_wrap=True, min_width=longest)
            else:
                word = longest if whole else max((len(w) for text in texts for w in text.split()), default=0)
                narrow = word if not whole and longest <= UNBROKEN else None  # long texts find a width of their own
                made.add_column(head, overflow="fold", min_width=min(word, UNBROKEN), max_width=narrow)
        for row in self.rows:
            made.add_row(*[Text(cell) for cell in row])
        return made


def table(columns: Sequence[tuple[str, str]], rows: Iterable[Sequence[str]]) -> RenderableType:
    """A plain table; columns as (head, "left" or "right"). Right-hand columns are numbers, which are never broken."""
    return Padding(_Fitting(columns, list(rows)), (0, 0, 0, 2), expand=False)


def facts(rows: Iterable[tuple[str, str]]) -> RenderableType:
    table = Table(box=None, show_header=False, pad_edge=False, padding=(0, 2, 0, 0))
    table.add_column(no_wrap=True)
    table.add_column(overflow="fold")
    before = None
    for name, text in rows:
        table.add_row(Text("" if name == before else name, style="dim"), Text(text))
        before = name
    return Padding(table, (0, 0, 0, 2), expand=False)


def _notes(lines: Iterable[str]) -> RenderableType:
    return Padding(Group(*[Text(line) for line in lines]), (0, 0, 0, 2), expand=False)


def _verdict_line(verdict: Verdict, sentence: str) -> Text:
    return Text.assemble((f" {verdict.upper()} ", VERDICT_STYLE[verdict]), "  ", sentence)


def cautions() -> RenderableType:
    return Group(heading("Cautions"), _notes(words.CAUTIONS))


def _warnings(opinions: Opinions) -> list[RenderableType]:
    return [Text(f"Note: {w}", style="bold") for w in opinions.warnings]


# --- opinions


def opinions_report(
    result: Opinions, working: Sequence[tuple[str, Sequence[WorkTable]]] = (), critical: str = "",
    effects: Sequence[RenderableType] = (),
) -> RenderableType:  # fmt: skip
    """What `crosscheck opinions` prints. critical: a line on the critical load factor; effects: of the idealisation."""
    parts: list[RenderableType] = [_verdict_line(result.verdict, opinions_sentence(result)), *_warnings(result)]
    parts += [Text(line) for line in (*undetermined_lines(result), critical) if line]
    parts += effects
    parts += [heading("How it was compared"), facts(opinions_facts(result))]
    for judged in result.judgements.values():
        parts += _opinion_differences(result.frame, judged)
    for name in result.names:
        parts += _results(result, name)
    for name in result.envelopes:
        parts += _envelope(result, name)
    for title, tables in working:
        parts.append(heading(title))
        parts += [_work_table(t) for t in tables]
    parts.append(cautions())
    return Group(*parts)


def opinions_sentence(result: Opinions) -> str:
    judged = list(result.judgements.values())
    count = sum(j.compared for j in judged)
    cases = words.counted(len(judged), "case")
    if result.verdict == "agree":
        return f"{_spoke(result)} agree in {words.counted(count, 'value')} of {cases}."
    if result.verdict == "undecided":
        few = [j.case for j in judged if len(j.spoke) < 2]
        return f"Fewer than two opinions speak for {words.some(few)}." if few else "Nothing could be compared."
    bad = [j for j in judged if j.differences]
    dissenters = {j.dissenter for j in bad}
    lone = dissenters.pop() if len(dissenters) == 1 else None
    who = f" {lone} stands alone against the others." if lone else ""
    many = words.counted(sum(len(j.differences) for j in bad), "value")
    return f"The opinions differ in {many} of {words.some([j.case for j in bad])}.{who}"


def _spoke(result: Opinions) -> str:
    names = list(result.answers)
    return f"{', '.join(names[:-1])} and {names[-1]}" if len(names) > 1 else "".join(names)


def undetermined_lines(result: Opinions) -> list[str]:
    """What the idealisation leaves undetermined, beside the verdict."""
    frame, none = result.frame, result.study.undetermined
    members, joints = list(frame.members), list(frame.joints)
    lines = []
    if none.axial.any():
        which = words.some([members[k] for k in np.flatnonzero(none.axial)])
        lines.append(f"Undetermined (axially rigid): axial force of {which}")
    loose = [joints[k] for k in np.flatnonzero(none.joints.any(axis=1))]
    if loose:
        lines.append(f"Undetermined (nothing resists it): rotation or movement of joint {words.some(loose)}")
    drifting: dict[str, dict[str, None]] = {}
    for answer in result.answers.values():
        for case, open_ones in answer.adrift.items():
            which = words.some([joints[k] for k in np.flatnonzero(open_ones.any(axis=1))])
            drifting.setdefault(which, {})[case] = None
    for which, cases in drifting.items():
        why = "one-way parts are at rest and let it move"
        lines.append(f"Undetermined in {words.some(list(cases))} ({why}): movement of {which}")
    pulls = [joints[k] for k in np.flatnonzero(none.reactions.any(axis=1))]
    if pulls:
        lines.append(f"Undetermined (axially rigid): reactions at {words.some(pulls)}")
    return lines


def frame_facts(frame: Frame) -> list[tuple[str, str]]:
    return [
        ("frame", f"{frame.title or '(no title)'}  [{frame.file or 'text'}, sha256 {frame.sha256[:12]}]"),
        ("size", f"{words.counted(len(frame.joints), 'joint')}, {words.counted(len(frame.members), 'member')}, "
                 f"{words.counted(len(frame.supports), 'support')}; {frame.units.force}, {frame.units.length}"),
        ("idealisation", words.idealisation(frame)),
        *((what, said) for what, said in words.by_combination(frame)),
        *(("included", f"{one.file}, sha256 {one.sha256[:12]}") for one in frame.includes),
    ]  # fmt: skip


def opinions_facts(result: Opinions) -> list[tuple[str, str]]:
    rows = frame_facts(result.frame)
    rows.append(("cases", words.some(result.names, 8)))
    rows += _opinion_rows(result)
    own = f"{OWN.relative:g} of the larger value, or {OWN.floor:g} of the case's largest of its kind"
    rows.append(("allowed", f"{own}; ten times that where the library is one of the two"))
    return rows


def _opinion_rows(result: Opinions) -> list[tuple[str, str]]:
    rows = []
    for name, answer in result.answers.items():
        left = "".join(f"; abstains on {case}: {why}" for case, why in answer.silent.items())
        rows.append((name, "given" + left))
    rows += [(name, f"abstains: {said.why}") for name, said in result.silent.items()]
    return rows


def _opinion_differences(frame: Frame, judged: CaseJudgement) -> list[RenderableType]:
    if not judged.differences:
        return []
    names = list(judged.spoke)
    rows = [
        (words.place(d.place), d.place.quantity, *[words.said(d, n) for n in names],
         words.short(d.difference), words.short(d.allowed))
        for d in judged.differences[:MOST_DIFFERENCES]
    ]  # fmt: skip
    columns = [("place", "left"), ("quantity", "left"), *[(n.replace("-", "-\n"), "right") for n in names],
               ("differ by", "right"), ("allowed", "right")]  # fmt: skip
    title = f"Differences in {judged.case}: {len(judged.differences):,} of {judged.compared:,} values, worst first"
    return [heading(title), table(columns, rows), *more(len(judged.differences), MOST_DIFFERENCES)]


def more(count: int, shown: int) -> list[RenderableType]:
    return [_notes([f"... and {count - shown:,} more; --json gives all of them"])] if count > shown else []


# --- results


def _results(result: Opinions, name: str) -> list[RenderableType]:
    """The agreed results of a case, or the first opinion's where they do not agree."""
    given = [a for a in result.answers.values() if name in a.cases]
    if not given:
        return []
    answer = given[0]
    agreed = result.judgements[name].verdict == "agree"
    whose = "as agreed" if agreed else f"by {answer.opinion} alone" if len(given) == 1 else f"by {answer.opinion}"
    parts: list[RenderableType] = [heading(f"{name}: results {whose}")]
    parts += [_end_table(result, answer, name), *more(2 * len(result.frame.members), MOST_ROWS)]
    parts += [Text(""), _along_table(result, answer, name), *more(len(result.frame.members), MOST_ROWS)]
    parts += [Text(""), _joint_table(result, answer, name), *more(len(result.frame.joints), MOST_ROWS)]
    parts += [Text(""), _reaction_table(result, answer, name)]
    return parts


def _envelope(result: Opinions, name: str) -> list[RenderableType]:
    """Extremes of the first opinion that speaks for the envelope, with what governs each."""
    frame = result.frame
    given = [e for a in result.answers.values() if (e := envelope(frame, a, name))]
    if not given:
        return []
    found = given[0]
    scales = [result.judgements[n].scales for n in found.names]
    parts: list[RenderableType] = [heading(f"Envelope {name}, of {words.counted(len(found.names), 'case')}")]
    numbered = [f"{k + 1} {one}" for k, one in enumerate(found.names)]
    parts.append(Text("Governing, by number: " + "; ".join(numbered)))
    if found.lacking:
        parts.append(Text(f"Not among them, because nobody speaks for it: {words.some(list(found.lacking))}", style="bold"))
    members = list(frame.members.values())[: MOST_ROWS // 2]
    places = [(m.name, joint) for m in members for joint in (m.joint_from, m.joint_to)]
    columns = [("member", "left"), ("at", "left")]
    for c, quantity in enumerate(("axial", "shear", "moment")):
        cells = [_extreme_cells(found.ends, (k // 2, k % 2, c), scales, words.ENDS) for k in range(len(places))]
        rows = [(*place, *row) for place, row in zip(places, cells, strict=True)]
        parts += [Text(""), table([*columns, *_extreme_heads(frame, quantity)], rows)]
    parts += more(2 * len(frame.members), MOST_ROWS)
    supports = list(frame.supports)[:MOST_ROWS]
    for c, quantity in enumerate(("fx", "fy", "moment")):
        rows = [(j, *_extreme_cells(found.reactions, (frame.joint_index[j], c), scales, words.REACTIONS)) for j in supports]
        parts += [Text(""), table([("support", "left"), *_extreme_heads(frame, quantity)], rows)]
    return parts


def _extreme_heads(frame: Frame, quantity: str) -> list[tuple[str, str]]:
    unit = words.unit_of(frame, quantity)
    return [(f"{quantity}, {unit}\ngreatest", "right"), ("by", "right"), ("least", "right"), ("by", "right")]


def _extreme_cells(e: Extremes, at: tuple[int, ...], scales: Sequence[Scales], quantities: Sequence[str]) -> list[str]:
    greatest, least = (words.quiet(v, scales, quantities) for v in (e.greatest, e.least))
    scale = max(_largest(greatest[..., at[-1]]), _largest(least[..., at[-1]]))
    both = (greatest[at], e.greatest_by[at]), (least[at], e.least_by[at])
    return [c for v, by in both for c in (words.number(float(v), scale), str(int(by) + 1) if by != NOBODY else "")]


def _heads(frame: Frame, quantities: Iterable[str]) -> list[tuple[str, str]]:
    return [(f"{q}, {words.unit_of(frame, q)}", "right") for q in quantities]


def _largest(values: Any) -> float:
    finite = [abs(float(v)) for v in values.ravel() if v == v]
    return max(finite, default=0.0)


def _end_table(result: Opinions, answer: Answer, name: str) -> RenderableType:
    frame = result.frame
    ends = words.quiet(answer.cases[name].ends, [result.judgements[name].scales], words.ENDS)
    scale = [_largest(ends[:, :, k]) for k in range(3)]
    rows = []
    for m, member in enumerate(list(frame.members.values())[: MOST_ROWS // 2]):
        for end, joint in ((0, member.joint_from), (1, member.joint_to)):
            moment = float(ends[m, end, 2])
            numbers = [words.number(float(ends[m, end, k]), scale[k]) for k in range(3)]
            rows.append((member.name, joint, *numbers, words.end_face(frame, member.name, joint, moment, scale[2])))
    columns = [("member", "left"), ("at", "left"), *_heads(frame, ("axial", "shear", "moment")), ("tension", "left")]
    return table(columns, rows)


def _along_table(result: Opinions, answer: Answer, name: str) -> RenderableType:
    frame = result.frame
    member, x, side = with_turning_points(answer, name, stations(frame))
    values = answer.spans.along(name, member, x, side)
    values = words.quiet(values, [result.judgements[name].scales], (*words.ENDS, "across"))
    scale = _largest(values[:, MOMENT]), _largest(values[:, 3])
    rows = []
    for m, title in enumerate(list(frame.members)[:MOST_ROWS]):
        own = (member == m).nonzero()[0]
        moments, across = values[own, MOMENT], values[own, 3]
        high, low = own[moments.argmax()], own[moments.argmin()]
        bend = own[abs(across).argmax()] if (across == across).any() else own[0]
        rows.append((
            title, *_at(moments.max(), x[high], scale[0]), words.tension_face(frame, title, moments.max(), scale[0]),
            *_at(moments.min(), x[low], scale[0]), words.tension_face(frame, title, moments.min(), scale[0]),
            *_at(values[bend, 3], x[bend], scale[1]),
        ))  # fmt: skip
    columns = [("member", "left"), ("greatest\nmoment", "right"), ("at x", "right"), ("tension", "left"),
               ("least", "right"), ("at x", "right"), ("tension", "left"),
               ("across", "right"), ("at x", "right")]  # fmt: skip
    return table(columns, rows)


def _at(value: float, x: float, scale: float) -> tuple[str, str]:
    return words.number(float(value), scale), f"{x:.4g}"


def _joint_table(result: Opinions, answer: Answer, name: str) -> RenderableType:
    frame = result.frame
    moves = words.quiet(answer.cases[name].joints, [result.judgements[name].scales], words.JOINTS)
    scale = [_largest(moves[:, c]) for c in range(3)]
    rows = [
        (joint, *[words.number(float(moves[k, c]), scale[c]) for c in range(3)])
        for k, joint in enumerate(list(frame.joints)[:MOST_ROWS])
    ]
    return table([("joint", "left"), *_heads(frame, ("dx", "dy", "rotation"))], rows)


def _reaction_table(result: Opinions, answer: Answer, name: str) -> RenderableType:
    frame = result.frame
    pulls = words.quiet(answer.cases[name].reactions, [result.judgements[name].scales], words.REACTIONS)
    force, moment = _largest(pulls[:, :2]), _largest(pulls[:, 2])
    rows = []
    for joint in list(frame.supports)[:MOST_ROWS]:
        r = pulls[frame.joint_index[joint]]
        rows.append((joint, *[words.number(float(r[c]), force) for c in (0, 1)], words.number(float(r[2]), moment)))
    return table([("support", "left"), *_heads(frame, ("fx", "fy", "moment"))], rows)


def _work_table(work: WorkTable) -> RenderableType:
    scale = [max((abs(r[k]) for r in work.rows if isinstance(r[k], float)), default=0.0)  # type: ignore[arg-type]
             for k in range(len(work.columns))]  # fmt: skip
    rows = [tuple(_work_cell(c, scale[k]) for k, c in enumerate(row)) for row in work.rows]
    numeric = [any(isinstance(row[k], float) for row in work.rows) for k in range(len(work.columns))]
    columns = [(head, "right" if right else "left") for head, right in zip(work.columns, numeric, strict=True)]
    return Group(heading(work.heading), table(columns, rows), _notes(work.remarks))


def _work_cell(cell: str | float | None, scale: float) -> str:
    """Numbers of a column may differ in kind, so each keeps its own digits; only rounding noise is dropped."""
    if isinstance(cell, float):
        return "0" if abs(cell) <= words.NOISE * scale else words.number(cell)
    return "" if cell is None else str(cell)


# --- verify


def verify_report(
    result: Verification, critical: str = "", effects: Sequence[RenderableType] = ()
) -> RenderableType:
    """What `crosscheck verify` prints; critical and effects as in opinions_report."""
    opinions = result.opinions
    sentence = claim_sentence(result)
    if result.supposed:  # in the first line, which --quiet prints alone
        sentence = f"Supposing that {result.supposed}, which is not what was stated: {sentence[0].lower()}{sentence[1:]}"
    parts: list[RenderableType] = [_verdict_line(result.verdict, sentence)]
    parts += [Text(f"  {line}") for line in beside(result)]
    parts += _warnings(opinions)
    parts += [Text(line) for line in (*undetermined_lines(opinions), critical) if line]
    if result.facts:
        parts += [heading("Printed input that differs from the frame"), _notes(fact.says for fact in result.facts)]
    parts += _suspect_lines(result)
    parts += [heading("How it was compared"), facts(claim_facts(result))]
    for judged in opinions.judgements.values():
        if judged.case in result.closed.cases:
            parts += _opinion_differences(opinions.frame, judged)
    for case in result.cases:
        parts += _claim_differences(opinions.frame, case.case, case.differences, case.compared)
    parts += effects
    parts += _not_compared(result)
    for audit in result.audits:
        parts += _audit_lines(opinions.frame, audit)
    parts.append(cautions())
    return Group(*parts)


def claim_sentence(result: Verification) -> str:
    compared, of = sum(c.compared for c in result.cases), sum(c.of for c in result.cases)
    differ = sum(len(c.differences) for c in result.cases)
    which = words.some(result.closed.cases) or "no case"
    if result.verdict == "agree":
        return f"The claim agrees in the {words.counted(compared, 'value')} it gives, of {of:,} ({which})."
    if result.verdict == "disagree" and differ:
        given = words.counted(compared, "value")
        return f"The claim differs in {differ:,} of the {given} it gives, of {of:,} ({which})."
    if result.verdict == "disagree":
        return f"The claim is not the answer to this frame ({which})."
    return f"The claim cannot be judged surely ({words.counted(compared, 'value')} compared, of {of:,})."


def beside(result: Verification) -> list[str]:
    lines = list(result.grounds)
    unsafe = sum(d.unsafe for c in result.cases for d in c.differences)
    differ = sum(len(c.differences) for c in result.cases)
    if unsafe:
        which = "The claim is" if unsafe == 1 and differ == 1 else f"In {unsafe:,} of them the claim is"
        lines.append(f"{which} smaller than the opinions: the unsafe side more often.")
    by_floor = sum(c.by_floor for c in result.cases)
    if by_floor:
        few = words.counted(by_floor, "value agrees", "values agree")
        lines.append(f"{few} only because small beside the largest.")
    return lines


def _suspect_lines(result: Verification) -> list[RenderableType]:
    if not result.suspects:
        return [Text(f"Suspects: {result.no_suspects}.")] if result.no_suspects else []
    rows = [
        (str(k + 1), s.kind, s.says, f"{100 * s.explains:.4g}%")
        for k, s in enumerate(result.suspects)
    ]
    columns = [("", "right"), ("kind", "left"), ("what would explain it", "left"), ("explains", "right")]
    parts = [heading("Suspects: hypotheses, best first"), table(columns, rows)]
    ties = [f"{k + 1} ties with: {tie}" for k, s in enumerate(result.suspects[:1]) for tie in s.tied_with]
    return [*parts, _notes([*ties, "--suspect N compares the claim with the frame or claim so changed"])]


def claim_facts(result: Verification) -> list[tuple[str, str]]:
    c, rows = result.closed, frame_facts(result.opinions.frame)
    rows.insert(1, ("claim", f"{c.file or 'text'}, {words.counted(c.rows, 'row')}, sha256 {c.sha256[:12]}"))
    rows.append(("cases" if len(c.cases) > 1 else "case", words.some(c.cases) or "none"))
    rows.append(("allowed", allowed_words(result)))
    rows += [("units", f"{quantity}: {taken}") for quantity, taken in _grouped(c.units)]
    rows += [("signs", f"{quantity}: {taken}; {_fit_words(c.fits.get(quantity))}") for quantity, taken in c.signs.items()]
    rows += [("reading", note) for note in c.notes]
    return rows + _opinion_rows(result.opinions)


def _grouped(taken: dict[str, str]) -> list[tuple[str, str]]:
    """Quantities that were taken alike, on one line."""
    groups: dict[str, list[str]] = {}
    for quantity, text in taken.items():
        groups.setdefault(text, []).append(quantity)
    return [(", ".join(quantities), text) for text, quantities in groups.items()]


def _fit_words(fits: tuple[int, int] | None) -> str:
    """How surely a sign is known: by the values that are large enough to tell it."""
    right, telling = fits or (0, 0)
    return f"{right:,} of {telling:,} fit" if telling else "no value is large enough to tell"


def allowed_words(result: Verification) -> str:
    t = result.tolerance
    text = (
        f"{100 * t.relative:g}% of the larger value, or {100 * t.floor:g}% of the member's or joint's largest, or the "
        "printed rounding"
    )
    return text if t.relative == CLAIM.relative else f"{text}  (NOT the usual {100 * CLAIM.relative:g}%)"


def _claim_differences(
    frame: Frame, case: str, differences: Sequence[Difference], compared: int
) -> list[RenderableType]:
    if not differences:
        return []
    rows = []
    for d in differences[:MOST_DIFFERENCES]:
        claim, ours = d.values.get("claim"), words.opinions_value(d)
        side = "low" if d.unsafe else "high"
        rows.append((
            words.place(d.place), d.place.quantity,
            with_face(frame, d, claim, ours), with_face(frame, d, ours, claim),
            words.short(d.difference), words.short(d.allowed), d.note or side, str(d.line or ""),
        ))  # fmt: skip
    columns = [("place", "left"), ("quantity", "left"), ("claim", "right"), ("opinions", "right"),
               ("differ\nby", "right"), ("allowed", "right"), ("claim\nis", "left"), ("line", "right")]  # fmt: skip
    title = f"Differences in {case}: {len(differences):,} of {compared:,} values, unsafe side first, then worst first"
    return [heading(title), table(columns, rows), *more(len(differences), MOST_DIFFERENCES)]


def with_face(frame: Frame, d: Difference, value: float | None, beside: float | None) -> str:
    face = words.face_of(frame, d.place, value)
    return words.number(value, beside) + (f" {face}" if face else "")


def _not_compared(result: Verification) -> list[RenderableType]:
    lines = not_compared_lines(result)
    return [heading("Not compared"), _notes(lines)] if lines else []


def not_compared_lines(result: Verification) -> list[str]:
    """What the verdict does not rest on, one sentence each."""
    closed = result.closed
    lines = []
    reasons = Counter(why for c in result.cases for _, why in c.not_compared)
    lines += [f"{words.counted(n, 'value')}: {why}" for why, n in reasons.items()]
    lines += [f"line {line}: {text.strip()[:60]!r}: {why}" for line, text, why in closed.not_understood[:10]]
    if len(closed.not_understood) > 10:
        lines.append(f"... and {len(closed.not_understood) - 10:,} more rows not understood")
    lines += [f"line {line}: {text.strip()[:60]!r}: {why}" for line, text, why in closed.foreign[:10]]
    compared, of = sum(c.compared for c in result.cases), sum(c.of for c in result.cases)
    if of > compared:
        lines.append(f"{of - compared:,} of the frame's {of:,} values are not in the claim or were not judged")
    others = [n for n in result.opinions.frame.names if n not in closed.cases]
    if others:
        lines.append(f"cases the claim does not speak of: {words.some(others)}")
    return lines


def _audit_lines(frame: Frame, audit: CaseAudit) -> list[RenderableType]:
    return [*_statics_lines(frame, audit), *_compatibility_lines(frame, audit)]


def _statics_lines(frame: Frame, audit: CaseAudit) -> list[RenderableType]:
    judged = [s for s in audit.statics if s.ok is not None]
    failing = [s for s in judged if not s.ok]
    left = len(audit.statics) - len(judged)
    unjudged = f"; {left:,} could not be judged from what the claim gives" if left else ""
    title = f"Statics of the claim, {audit.case}"
    count = words.counted(len(judged), "balance")
    if not judged:
        return [heading(title), _notes([f"nothing could be judged{unjudged}"])]
    if not failing:
        return [heading(title), _notes([f"all {count} hold to the printed rounding{unjudged}"])]
    failing.sort(key=lambda s: -abs(s.residual) / (s.allowed or 1.0))
    rows = [
        (s.check, s.where or "whole frame", s.component, words.short(s.residual), words.short(s.allowed),
         words.unit_of(frame, "moment" if s.component == "moment" else "fx"))
        for s in failing[:MOST_DIFFERENCES]
    ]  # fmt: skip
    columns = [("balance", "left"), ("where", "left"), ("of", "left"), ("left over", "right"), ("allowed", "right"),
               ("", "left")]  # fmt: skip
    parts = [heading(title), _notes([f"{len(failing):,} of {count} fail{unjudged}"]), table(columns, rows)]
    return [*parts, *more(len(failing), MOST_DIFFERENCES)]


def _compatibility_lines(frame: Frame, audit: CaseAudit) -> list[RenderableType]:
    found = audit.compatibility
    if found is None:
        return []
    lines = [found.says, *(f"not judged: {line}" for line in found.not_judged)]
    failing = [c for c in found.checks if not c.ok]
    parts: list[RenderableType] = [heading(f"Compatibility of the claim, {audit.case}"), _notes(lines)]
    if failing:
        failing.sort(key=lambda c: -abs(c.rotation - c.expected) / (c.allowed or 1.0))
        rows = [
            (c.kind, c.member or c.where, (c.where if c.member else c.direction), words.short(c.rotation),
             words.short(c.rotation - c.expected), words.short(c.allowed), deformation_unit(frame, c))
            for c in failing[:MOST_MISFITS]
        ]  # fmt: skip
        columns = [("what", "left"), ("of", "left"), ("at", "left"), ("by the claim", "right"),
                   ("misfit", "right"), ("allowed", "right"), ("", "left")]  # fmt: skip
        parts += [table(columns, rows), *more(len(failing), MOST_MISFITS)]
    if audit.bound is not None:
        parts.append(_notes([bound_words(frame, audit.bound)]))
    return parts


def deformation_unit(frame: Frame, c: Any) -> str:
    turns = c.kind == "end rotation" or c.direction == "rotation"
    return words.unit_of(frame, "rotation" if turns else "dx")


def bound_words(frame: Frame, bound: Any) -> str:
    if isinstance(bound, str):
        return bound
    m, end = np.unravel_index(int(np.nanargmax(bound.moment)), bound.moment.shape)
    member = list(frame.members.values())[m]
    joint = member.joint_from if end == 0 else member.joint_to
    most = f"{words.short(float(bound.moment[m, end]))} {words.unit_of(frame, 'moment')}"
    share = f"{100 * bound.energy / bound.size:.2g}% of the claim's own size" if bound.size else "all of it"
    return (
        "Rigorous bound (hypercircle, Prager and Synge 1947): in the energy norm the claimed forces lie within "
        f"{share} of this model's true ones; no end moment is off by more than {most} ({member.name} at {joint})."
    )


# --- problems


def problems_report(error: UnusableInput) -> RenderableType:
    """One message a problem."""
    count = words.counted(len(error.problems), "problem")
    return Group(Text(f"Unusable input: {count}", style="bold"), *[Text(f"  {p}") for p in error.problems])


