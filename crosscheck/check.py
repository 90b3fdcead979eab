"""One check, from the frame (and a claim) to findings: what every command and report stands on.

Nothing here prints. The opinions are asked one by one and imported only then; one that fails inside abstains aloud,
because a checker must never lose the others' answers to it.
"""

from __future__ import annotations

import importlib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from crosscheck.answer import Answer, CaseAnswer, Silent, WorkTable, joined, without_adrift
from crosscheck.compare.claim import CaseClaim, ClaimComparison
from crosscheck.compare.claimed import ClosedClaim
from crosscheck.compare.differences import Verdict, worst
from crosscheck.compare.opinions import CaseJudgement, Comparison, opinions_verdict
from crosscheck.compare.tolerance import Tolerance, claim_tolerance
from crosscheck.frame.kinematics import Study, study
from crosscheck.frame.model import Frame
from crosscheck.problems import Problem, UnusableInput, nearest

if TYPE_CHECKING:
    from crosscheck.audit.bound import ForceBound
    from crosscheck.audit.compatibility import CompatibilityFindings
    from crosscheck.audit.statics import StaticCheck
    from crosscheck.claims.reading import Reading
    from crosscheck.compare.printouts import Moved
    from crosscheck.review.finding import Finding
    from crosscheck.suspects import Suspect

OPINIONS = {
    "slope-deflection": "crosscheck.opinions.slope_deflection",
    "moment-distribution": "crosscheck.opinions.moment_distribution",
    "library": "crosscheck.opinions.library",
}


@dataclass(frozen=True, slots=True)
class Opinions:
    """What the opinions say of a frame, and how they compare. `names`: the cases and combinations asked for."""

    frame: Frame
    study: Study
    names: tuple[str, ...]
    answers: Mapping[str, Answer]
    silent: Mapping[str, Silent]
    judgements: Mapping[str, CaseJudgement]

    @property
    def envelopes(self) -> tuple[str, ...]:
        """Envelopes of the frame all of whose cases and combinations were asked for."""
        return tuple(e.name for e in self.frame.envelopes.values() if set(e.names) <= set(self.names))

    @property
    def verdict(self) -> Verdict:
        return opinions_verdict(list(self.judgements.values()))

    @property
    def warnings(self) -> tuple[str, ...]:
        """What can be questioned about the frame but used, and whether it lies at the limits of precision."""
        from crosscheck.review.spread import warnings

        return (*self.frame.warnings, *warnings(self.frame))


AUDITED = 1000
"""Most members for which compatibility is judged; statics is judged always."""


@dataclass(frozen=True, slots=True)
class CaseAudit:
    """The audit of the claim on one case. compatibility is None for a frame beyond AUDITED members; bound is None where
    the claim is the solution, and a sentence where no bound can be given."""

    case: str
    statics: tuple[StaticCheck, ...]
    compatibility: CompatibilityFindings | None = None
    bound: ForceBound | str | None = None


@dataclass(frozen=True, slots=True)
class Verification:
    """A claim judged against the opinions.

    grounds: why the verdict is what it is, one sentence each. undecided: the choices that would settle it.
    no_suspects: why none is named, where the claim disagrees. facts: how the other model's own input, where the paste
    holds it, differs from the frame; each with its kind (geometry, stiffness, support or load) and place.
    supposed: what a suspect says, where frame and claim are judged as it supposes and not as stated.
    """

    opinions: Opinions
    closed: ClosedClaim
    tolerance: Tolerance
    cases: tuple[CaseClaim, ...]
    audits: tuple[CaseAudit, ...]
    suspects: tuple[Suspect, ...]
    verdict: Verdict
    grounds: tuple[str, ...] = ()
    undecided: tuple[str, ...] = field(default=())
    no_suspects: str = ""
    facts: tuple[Finding, ...] = ()
    supposed: str = ""


def ask(frame: Frame, names: Sequence[str] | None = None, any_size: bool = False) -> Opinions:
    """All opinions on the frame's load cases and combinations (or `names`).

    any_size: whether the library is asked however large the frame is; it takes its time then.

    Raises UnusableInput (MechanismFound among them) where nobody could answer.
    """
    wanted = frame.names if names is None else tuple(names)
    asked = [(plain, study(plain), group) for plain, group in situations(frame, wanted)]
    answers: dict[str, Answer] = {}
    silent: dict[str, Silent] = {}
    for name in OPINIONS:
        said = joined([(group, _ask_one(name, plain, found, group, any_size)) for plain, found, group in asked])
        if isinstance(said, Silent):
            silent[name] = said
        else:
            answers[name] = said
    comparison = Comparison(frame, answers)
    judgements = {name: comparison.judge(name) for name in wanted}
    return Opinions(frame, asked[0][1], wanted, answers, silent, judgements)


def situations(frame: Frame, names: Sequence[str]) -> list[tuple[Frame, tuple[str, ...]]]:
    """The frame in each state of stiffness and order of theory that some of these cases and combinations have, with
    those names; at least one."""
    groups: dict[int, tuple[Frame, list[str]]] = {}
    for name in names:
        plain = frame.under(name)
        groups.setdefault(id(plain), (plain, []))[1].append(name)
    return [(plain, tuple(group)) for plain, group in groups.values()] or [(frame, ())]


def _ask_one(name: str, frame: Frame, found: Study, wanted: tuple[str, ...], any_size: bool) -> Answer | Silent:
    more = {"size_limit": None} if any_size and name == "library" else {}
    try:
        said: Answer | Silent = importlib.import_module(OPINIONS[name]).opine(frame, found, wanted, **more)
        return _settled_displacements(frame, said) if frame.one_way and isinstance(said, Answer) else said
    except UnusableInput:
        raise
    except Exception as error:  # noqa: BLE001 - whatever it is, it silences this opinion alone and is said
        return Silent(name, f"failed inside ({type(error).__name__}: {error}); please report this")


def _settled_displacements(frame: Frame, said: Answer) -> Answer:
    """The answer without the displacements that one-way parts at rest leave open."""
    from crosscheck.frame.drift import adrift
    from crosscheck.frame.loads import load_table

    found = {name: adrift(frame, load_table(frame, name), case) for name, case in said.cases.items()}
    return without_adrift(said, frame.member_table.ends, found)


def chosen_names(frame: Frame, case: str | None) -> tuple[str, ...] | None:
    """The names to answer for: all, or those that the one asked for means. Raises UnusableInput for an unknown one."""
    if case is None:
        return None
    meant = frame.meant(case)
    if not meant:
        known = (*frame.names, *frame.envelopes)
        advice = nearest(case, known) or f"known: {', '.join(known) or 'none'}"
        raise UnusableInput([Problem(frame.file, None, "--case", f'no load case or combination "{case}"', advice)])
    return meant


def verify(
    frame: Frame, reading: Reading, case: str | None = None, relative: float | None = None,
    opinions: Opinions | None = None, suspects: bool = True, every_case: bool = True, any_size: bool = False,
) -> Verification:  # fmt: skip
    """Judge a reading of a claim. `relative`: the claim's relative tolerance as a fraction, else the frame's.

    opinions: where they are at hand already. suspects: whether to look for what would explain a difference.
    every_case: whether the opinions are asked for cases that the claim does not speak of, too. any_size: as for `ask`.
    """
    from crosscheck.compare.closing import close

    chosen_names(frame, case)
    if opinions is None:
        needed = chosen_names(frame, case) if every_case else cases_needed(frame, reading, case)
        opinions = ask(frame, needed, any_size)
    tolerance = claim_tolerance(frame.analysis.tolerance if relative is None else relative)
    closed = close(reading, frame, opinions.answers, case, tolerance)
    cases = ClaimComparison(frame, opinions.answers, opinions.judgements, tolerance).judge(closed)
    audits = _audits(frame, opinions, closed)
    verdict, grounds = _verdict(opinions, closed, cases, audits)
    found: tuple[Suspect, ...] = ()
    why = ""
    if suspects and verdict == "disagree":
        # Another case pasted by mistake is among the suspects, so all cases are needed now.
        whole = opinions if opinions.names == frame.names else ask(frame)
        found, why = _suspects(whole, reading, case, closed, cases, tolerance)
    return Verification(
        opinions, closed, tolerance, tuple(cases), audits, found, verdict, tuple(grounds), closed.undecided, why,
        printed_input(frame, reading),
    )


def printed_input(frame: Frame, reading: Reading) -> tuple[Finding, ...]:
    """How the other model's own input, as the paste holds it, differs from the frame: facts, said before any suspect."""
    if not reading.echo:
        return ()
    from crosscheck.review.echo import compared
    from crosscheck.review.finding import Subject

    return tuple(f for f in compared(Subject(frame), reading.echo) if f.grade == "serious")


def cases_needed(frame: Frame, reading: Reading, case: str | None) -> tuple[str, ...] | None:
    """The cases that a reading names, where it names one for every value; None (all) where some must be found by fit."""
    if case is not None:
        return chosen_names(frame, case)
    named = {entry.case for entry in reading.entries}
    if not named or None in named:
        return None
    meant = {n for name in named for n in frame.meant(str(name))}
    return tuple(name for name in frame.names if name in meant)


@dataclass(frozen=True, slots=True)
class TwoPrintouts:
    """Two printouts of one frame: each beside the opinions, and what moved between them."""

    first: Verification
    second: Verification
    moved: Moved


def compare_printouts(
    frame: Frame, first: Reading, second: Reading, case: str | None = None, relative: float | None = None
) -> TwoPrintouts:
    """What moved between two printouts; nobody asks here what would explain a difference from the opinions."""
    from crosscheck.compare.printouts import between

    opinions = ask(frame)
    one = verify(frame, first, case, relative, opinions=opinions, suspects=False)
    other = verify(frame, second, case, relative, opinions=opinions, suspects=False)
    return TwoPrintouts(one, other, between(frame, one.closed, other.closed))


def _suspects(
    opinions: Opinions, reading: Reading, case: str | None, closed: ClosedClaim, cases: list[CaseClaim],
    tolerance: Tolerance,
) -> tuple[tuple[Suspect, ...], str]:  # fmt: skip
    """What would explain the difference, or why nothing is named. A search that fails inside says so: the verdict, which
    does not hang on it, must not be lost to it."""
    try:
        from crosscheck.suspects.pasted import read_again

        found, why = _searched(opinions, closed, cases, tolerance)
        found = read_again(found, opinions, reading, case, cases, tolerance)
        return found, "" if found else why
    except Exception as error:  # noqa: BLE001 - as for an opinion that fails inside
        return (), f"the search for suspects failed inside ({type(error).__name__}: {error}); please report this"


def _searched(
    opinions: Opinions, closed: ClosedClaim, cases: list[CaseClaim], tolerance: Tolerance
) -> tuple[tuple[Suspect, ...], str]:
    from crosscheck.suspects import Suspect, search
    from crosscheck.suspects.enveloped import as_governing, envelope_suspects, ranked_together

    if closed.reversed_load:
        says = "the load acts the other way: member forces, reactions and displacements are all reversed"
        return (Suspect("load", (), says, 1.0),), ""
    own = envelope_suspects(opinions, closed, cases)
    as_cases, judged, over = as_governing(opinions.frame, closed, cases)
    explained = any(s.fits for s in own)
    found = search(opinions.frame, opinions, as_cases, judged, tolerance, over=over, explained=explained)
    suspects = ranked_together(own, found.suspects) if own else found.suspects
    return suspects, "" if suspects else found.why


def as_suspected(result: Verification, number: int) -> Verification:
    """The same claim judged against the frame (or the claim) changed as suspect `number` (from 1) says.

    Raises UnusableInput for a number that no suspect has, or where the changed frame cannot stand.
    """
    if not 1 <= number <= len(result.suspects):
        known = f"give 1 to {len(result.suspects)}" if result.suspects else "this claim has no suspects"
        raise UnusableInput([Problem("", None, "--suspect", f"there is no suspect {number}", known)])
    suspect = result.suspects[number - 1]
    frame, closed = suspect.change.apply(result.opinions.frame, result.closed)
    # The claim may now speak of a case that nobody was asked for: the one whose results it has.
    meant = (n for name in closed.cases for n in frame.meant(name))
    opinions = ask(frame, tuple(dict.fromkeys((*result.opinions.names, *meant))))
    cases = ClaimComparison(frame, opinions.answers, opinions.judgements, result.tolerance).judge(closed)
    audits = _audits(frame, opinions, closed)
    verdict, grounds = _verdict(opinions, closed, cases, audits)
    return Verification(
        opinions, closed, result.tolerance, tuple(cases), audits, (), verdict, tuple(grounds), supposed=suspect.says
    )


def _verdict(
    opinions: Opinions, closed: ClosedClaim, cases: list[CaseClaim], audits: tuple[CaseAudit, ...]
) -> tuple[Verdict, list[str]]:
    """CONTRACT: how verify judges. The opinions must agree before a claim can."""
    grounds: list[str] = []
    verdicts: list[Verdict] = [c.verdict for c in cases]
    audited = {audit.case: audit for audit in audits}
    for name in dict.fromkeys(n for case in closed.cases for n in opinions.frame.meant(case)):
        judged, audit = opinions.judgements[name], audited.get(name)
        if judged.verdict == "disagree":
            return "undecided", [f"the opinions disagree with each other on {name}"]
        if judged.verdict == "undecided" and not _alone_but_proven(cases, name, audit):
            verdicts.append("undecided")
            grounds.append(f"fewer than two opinions speak for {name}")
        elif judged.verdict == "undecided":
            grounds.append(
                f"one opinion alone speaks for {name}; the claim matches it and satisfies statics and compatibility to "
                "its printed precision, therefore it is the solution of this model"
            )
    if closed.reversed_load:
        verdicts.append("disagree")
        grounds.append("member forces, reactions and displacements are all reversed: the load acts the other way")
    if closed.undecided:
        verdicts.append("undecided")
        grounds += closed.undecided
    if closed.foreign:
        verdicts.append("undecided")
        grounds.append(
            "it has results for members or joints that the frame lacks; a reading file says which of the frame's they are"
        )
    if not sum(c.compared for c in cases):
        verdicts.append("undecided")
        grounds.append("no value could be compared" + ("" if closed.values else "; is it a claim of this frame?"))
    return worst(verdicts), grounds


def _alone_but_proven(cases: list[CaseClaim], name: str, audit: CaseAudit | None) -> bool:
    agrees = any(c.case == name and c.verdict == "agree" for c in cases)
    return agrees and audit is not None and audit.compatibility is not None and audit.compatibility.solution


def _audits(frame: Frame, opinions: Opinions, closed: ClosedClaim) -> tuple[CaseAudit, ...]:
    """Of every single case of the claim: an envelope is no state of balance."""
    return tuple(_audit(frame, opinions, closed, name) for name in closed.cases if name not in frame.several)


def _audit(frame: Frame, opinions: Opinions, closed: ClosedClaim, name: str) -> CaseAudit:
    from crosscheck.audit.bound import hypercircle
    from crosscheck.audit.compatibility import compatibility
    from crosscheck.audit.statics import balance

    frame = frame.under(name)
    values, half = claimed_arrays(frame, closed, name)
    done = balance(frame, name, values, half)
    if len(frame.members) > AUDITED or not np.isfinite(values.ends).any():
        return CaseAudit(name, done.checks)
    findings = compatibility(frame, name, values, half, opinions.study.undetermined, done)
    bound = None if findings.solution or not findings.complete else hypercircle(frame, findings, values)
    return CaseAudit(name, done.checks, findings, bound)


def claimed_arrays(frame: Frame, closed: ClosedClaim, name: str) -> tuple[CaseAnswer, CaseAnswer]:
    """The claim's end actions, displacements and reactions of one case as arrays (NaN where it says nothing), and half
    a unit of each value's last printed digit."""
    from crosscheck.compare.claim import END_COLUMN, JOINT_COLUMN, REACTION_COLUMN

    values = _blank(frame)
    half = _blank(frame)
    for v in closed.values:
        if v.case != name:
            continue
        if v.kind == "end":
            end = 0 if frame.members[str(v.member)].joint_from == v.joint else 1
            index: tuple[int, ...] = (frame.member_index[str(v.member)], end, END_COLUMN[v.quantity])
            tables = values.ends, half.ends
        elif v.kind == "reaction":
            index = (frame.joint_index[str(v.joint)], REACTION_COLUMN[v.quantity])
            tables = values.reactions, half.reactions
        elif v.kind == "displacement":
            index = (frame.joint_index[str(v.joint)], JOINT_COLUMN[v.quantity])
            tables = values.joints, half.joints
        else:
            continue
        tables[0][index], tables[1][index] = v.value, v.half_digit
    return values, half


def _blank(frame: Frame) -> CaseAnswer:
    m, j = len(frame.members), len(frame.joints)
    return CaseAnswer(np.full((m, 2, 3), np.nan), np.full((j, 3), np.nan), np.full((j, 3), np.nan))


def read(path: str | Path, variant: str = "") -> Frame:
    """Read a frame file, or one frame of the family in it. Raises UnusableInput with every problem found."""
    from crosscheck.frame.reader import read_frame

    return read_frame(path, variant)




def workings(opinions: Opinions) -> list[tuple[str, list[WorkTable]]]:
    """The working of our own two opinions for every case asked for, each under a heading."""
    out = []
    for opinion in ("slope-deflection", "moment-distribution"):
        module = importlib.import_module(OPINIONS[opinion])
        for name in opinions.names:
            if opinion in opinions.answers and name in opinions.answers[opinion].cases:
                tables = module.working(opinions.frame.under(name), opinions.study, name)
                out.append((f"Working of {opinion}, {name}", tables))
    return out


QUICK = 300
"""Most members for which critical load factors are worked out unasked."""
FAR = 100.0
"""Critical load factors above this are as good as none."""


def critical_factors(
    frame: Frame, names: Sequence[str] | None = None, enough: float | None = None
) -> dict[str, float]:
    """Critical load factor of each case and combination (or of `names`) by stability functions, to three digits;
    infinite above FAR. Empty for a frame of more than QUICK members, and where there is no case.

    enough: where given, factors above it that are not the least are infinite too, which is quick for many cases.
    """
    if len(frame.members) > QUICK or not frame.names:
        return {}
    module = importlib.import_module(OPINIONS["slope-deflection"])
    found: dict[str, float] = {}
    for plain, group in situations(frame, frame.names if names is None else names):
        found |= module.critical_factors(plain, group, FAR, enough)
    return found
