"""Seeded mistakes of the checking week: states, leans, arrangements, ties, haunches, one-way parts, order by combination.

As tests/corpus.py: the other analysis is solved by moment distribution, each case in its own state and order, and mistakes
are drawn from small functions that the suspects do not know. Frames are the demonstrations of the week in cases/ and random
ones (tests/week_frames.py). `python -m tests.corpus_week FIRST LAST PER` prints the table for some seeds; seeds 0 to 3 are
the demonstrations. With a further word `envelopes`, claims that are envelopes; with `common`, mistakes of any frame;
with `right`, right claims.
"""

from __future__ import annotations

import math
import sys
import time
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import replace
from functools import lru_cache
from pathlib import Path
from random import Random
from typing import Any

import numpy as np

from crosscheck import check
from crosscheck.answer import Answer, CaseAnswer, Silent, joined
from crosscheck.compare.claimed import ClaimedValue, ClosedClaim
from crosscheck.compare.differences import worst
from crosscheck.compare.opinions import Comparison
from crosscheck.frame.kinematics import study
from crosscheck.frame.model import FREE, HELD, Combination, Frame, Lean, Piece, Section, StiffnessState
from crosscheck.opinions import moment_distribution, slope_deflection
from crosscheck.problems import UnusableInput
from crosscheck.suspects import Suspect, search
from tests.corpus import CLAIM, EFFECT, FAINT, Mistake, Record, both_named, case_values, closed_claim, judged, table
from tests.week_frames import week_frame

CASES = Path(__file__).parents[1] / "cases"
DEMONSTRATIONS = ("depot", "workshop", "rack", "causeway")
SCARCE = ("lean left out", "order of a combination", "service springs")
"""Sorts of mistakes that few frames can have, or show: drawn before the others."""


# --- solving


def solved(frame: Frame, names: tuple[str, ...], by: Any = moment_distribution) -> Answer | None:
    """Results of each name in its own situation; None where there are none."""
    parts: list[tuple[tuple[str, ...], Answer | Silent]] = []
    try:
        for plain, group in check.situations(frame, names):
            parts.append((group, by.opine(plain, study(plain), group)))
    except (UnusableInput, ArithmeticError, np.linalg.LinAlgError, RuntimeError):
        return None
    found = joined(parts)
    return found if isinstance(found, Answer) and all(n in found.cases for n in names) else None


@lru_cache(maxsize=8)
def opinions_on(frame: Frame) -> check.Opinions | None:
    """Opinions with slope-deflection alone, of all names that it speaks for."""
    try:
        parts = [(g, slope_deflection.opine(p, study(p), g)) for p, g in check.situations(frame, frame.names)]
    except UnusableInput:
        return None
    answer = joined(parts)
    if not isinstance(answer, Answer):
        return None
    answers = {"slope-deflection": answer}
    comparison = Comparison(frame, answers)
    return check.Opinions(frame, study(frame), frame.names, answers, {}, {n: comparison.judge(n) for n in frame.names})


@lru_cache(maxsize=8)
def the_frame(seed: int) -> Frame:
    """Demonstrations as they are; random frames so that leans, springs of a state and orders of combinations show.

    Of every five random frames two have a combination of second order near its critical load, two lean enough to be seen
    (all that lean already by ten times as much), and two have springs that are others in one combination.
    """
    if seed < len(DEMONSTRATIONS):
        return check.read(CASES / f"{DEMONSTRATIONS[seed]}.toml")
    frame, kind = week_frame(seed), seed % 5
    if kind in (2, 4):
        frame = _sprung(frame, Random(f"sprung {seed}"))
    if kind in (1, 4):
        frame = _leaning(frame)
    return _near_critical(frame, 4.0 if kind == 0 else 2.5) if kind in (0, 3) and not frame.one_way else frame


def _last(frame: Frame) -> Combination:
    """The last combination, or one of all cases where there is none."""
    every = list(frame.combinations.values())
    return every[-1] if every else Combination("all", dict.fromkeys(frame.cases, 1.0))


def _leaning(frame: Frame) -> Frame:
    if not any(c.lean for c in frame.combinations.values()):
        last = _last(frame)
        return replace(frame, combinations={**frame.combinations, last.name: replace(last, lean=0.05)})
    return replace(frame, combinations={n: replace(c, lean=10 * c.lean) for n, c in frame.combinations.items()})


def _sprung(frame: Frame, r: Random) -> Frame:
    """One or two supports on springs of about a member's own stiffness, with factors on them in the state of the last
    combination; the frame as it is where it has no support to spring, or cannot be used so."""
    t = frame.member_table
    supports, factors = dict(frame.supports), {}
    for joint in r.sample(list(supports), min(2, len(supports))):
        s, on = supports[joint], np.flatnonzero((t.ends == frame.joint_index[joint]).any(axis=1))
        axes = [a for a in ("y", "rotation") if getattr(s, a) == HELD and not (s.x_only or s.y_only)]
        if axes and len(on):
            axis, m = r.choice(axes), int(on[0])
            turn = 4.0 * t.E[m] * t.I[m] / t.length[m]
            size = float(turn if axis == "rotation" else 12.0 * turn / t.length[m] ** 2)
            supports[joint] = replace(s, **{axis: size * r.uniform(0.3, 3.0)})
            factors[joint] = {axis: r.choice([0.3, 0.5, 2.0])}
    if not factors:
        return frame
    last = _last(frame)
    state = frame.states.get(last.stiffness, StiffnessState("springs"))
    states = {**frame.states, state.name: replace(state, supports={**state.supports, **factors})}
    combinations = {**frame.combinations, last.name: replace(last, stiffness=state.name)}
    changed = replace(frame, supports=supports, states=states, combinations=combinations)
    try:
        for name in changed.names:
            study(changed.under(name))
    except UnusableInput:
        return frame
    return changed


def _near_critical(frame: Frame, below: float) -> Frame:
    """The last combination in second order, its loads scaled to so many times less than the critical where there is one."""
    c, name = _last(frame), _last(frame).name
    frame = replace(frame, combinations={**frame.combinations, name: c})
    try:
        plain = frame.under(name)
        factor = slope_deflection.critical_factors(plain, (name,), 1e6).get(name, math.inf)
        scaled = {case: f * factor / below for case, f in c.factors.items()} if math.isfinite(factor) else c.factors
        changed = replace(frame, combinations={**frame.combinations, name: replace(c, factors=scaled, order=2)})
        study(changed.under(name))
    except UnusableInput:
        return frame
    return changed


# --- mistakes


def _with(frame: Frame, combination: Combination, **fields: Any) -> Frame:
    """Whoever had one combination wrong had all that it was stated with."""
    mine = {
        n: replace(c, **fields) if (c.stated or n) == (combination.stated or combination.name) else c
        for n, c in frame.combinations.items()
    }
    return replace(frame, combinations=mine)


def _member(frame: Frame, name: str, **fields: Any) -> Frame:
    return replace(frame, members={**frame.members, name: replace(frame.members[name], **fields)})


def mistakes(frame: Frame, name: str, r: Random) -> Iterator[Mistake]:
    """All mistakes that the results of one case or combination may show."""
    if name in frame.combinations:
        yield from _of_combination(frame, frame.combinations[name])
    yield from _of_spans(frame, name)
    yield from _of_members(frame)
    yield from _of_parts(frame)
    for case in frame.combinations[name].factors if name in frame.combinations else (name,):
        loads = frame.cases[case].loads
        for load in loads:
            if isinstance(load, Lean):
                kept = tuple(q for q in loads if q is not load)
                other = replace(frame, cases={**frame.cases, case: replace(frame.cases[case], loads=kept)})
                yield Mistake("load", "lean of a case left out", (f"{case}[{load.entry}]",), other)


def _names(state: Any) -> tuple[str, ...]:
    names = dict.fromkeys(n for t in ("sections", "members", "materials", "supports") for n in getattr(state, t))
    return tuple(dict.fromkeys([*names, *(f"{w} {n}" for n in names for w in ("section", "member", "material", "joint"))]))


def _of_combination(frame: Frame, c: Combination) -> Iterator[Mistake]:
    if c.stiffness:
        state = frame.states[c.stiffness]
        only = bool(state.supports) and not (state.sections or state.members or state.materials)
        kind, sort = ("support", "service springs") if only else ("stiffness", "gross for state")
        yield Mistake(kind, sort, _names(state), _with(frame, c, stiffness=""))
        if state.supports and not only:
            stiff = replace(state, supports={})
            where = (*state.supports, *(f"joint {j}" for j in state.supports))
            yield Mistake("support", "service springs", where, replace(frame, states={**frame.states, state.name: stiff}))
    for other in frame.states.values():
        if other.name != c.stiffness:
            sort = "another state" if c.stiffness else "state for gross"
            yield Mistake("stiffness", sort, _names(other), _with(frame, c, stiffness=other.name))
    if c.lean:
        where = (c.stated or c.name,)
        yield Mistake("load", "lean left out", where, _with(frame, c, lean=0.0))
        yield Mistake("load", "lean to the other side", where, _with(frame, c, lean=-c.lean))
    if any(o.order for o in frame.combinations.values()):
        order = c.order or frame.analysis.order
        yield Mistake("idealisation", "order of a combination", (), _with(frame, c, order=3 - order))


def _of_spans(frame: Frame, name: str) -> Iterator[Mistake]:
    factors = frame.combinations[name].factors if name in frame.combinations else {name: 1.0}
    for case, factor in factors.items():
        stated = frame.cases[case].arranged or case
        others = [c.name for c in frame.cases.values() if stated in (c.name, c.arranged) and c.name != case]
        for other in others if len(others) else ():
            sort = "all spans loaded" if other == stated else "another arrangement"
            if name in frame.combinations:
                new = {k: f for k, f in factors.items() if k != case} | {other: factor}
                combination = replace(frame.combinations[name], factors=new)
                changed = replace(frame, combinations={**frame.combinations, name: combination})
            else:
                loads = replace(frame.cases[case], loads=frame.cases[other].loads)
                changed = replace(frame, cases={**frame.cases, case: loads})
            yield Mistake("load", sort, (stated,), changed)


def _of_members(frame: Frame) -> Iterator[Mistake]:
    """Haunches and tapers left out or turned, rigid members that stretch and the reverse."""
    varying = [m for m in frame.members.values() if m.pieces]
    for m in varying:
        for section in dict.fromkeys((m.section, m.pieces[0].first, m.pieces[-1].last)):
            sort = "haunch or taper left out"
            yield Mistake("stiffness", sort, _called(m.name), _member(frame, m.name, pieces=(), section=section))
        ends = [0.0, *(p.until for p in m.pieces)]
        turned = tuple(
            Piece(p.last, p.first, 1 - ends[k] if k else 1.0) for k, p in reversed(list(enumerate(m.pieces)))
        )
        if turned != m.pieces:
            yield Mistake("stiffness", "end for end", _called(m.name), _member(frame, m.name, pieces=turned))
    if len(varying) > 1:
        plain = {m.name: replace(m, pieces=()) for m in varying}
        where = tuple(w for m in varying for w in _called(m.name))
        yield Mistake("stiffness", "all haunches left out", where, replace(frame, members={**frame.members, **plain}))
    if frame.analysis.axial == "elastic" and any(m.axial for m in frame.members.values()):
        for m in frame.members.values():
            if not m.only:
                sort = "rigid member that stretched" if m.axial else "member taken as rigid"
                new = _member(frame, m.name, axial="" if m.axial else "rigid")
                yield Mistake("idealisation", sort, _called(m.name), new)


def _called(member: str) -> tuple[str, ...]:
    return member, f"member {member}"


def _of_parts(frame: Frame) -> Iterator[Mistake]:
    """Ties left out, one-way parts that worked both ways."""
    for tie in frame.ties.values():
        ties = {n: t for n, t in frame.ties.items() if n != tie.name}
        where = (*tie.joints, *(f"joint {j}" for j in tie.joints))
        yield Mistake("geometry", "tie left out", where, replace(frame, ties=ties))
    for m in frame.members.values():
        if m.only:
            yield Mistake("stiffness", "one-way member two-way", _called(m.name), _member(frame, m.name, only=""))
    for joint, s in frame.supports.items():
        if s.x_only or s.y_only:
            supports = {**frame.supports, joint: replace(s, x_only="", y_only="")}
            where = (joint, f"joint {joint}")
            yield Mistake("support", "one-way support two-way", where, replace(frame, supports=supports))


def common(frame: Frame, name: str, r: Random) -> Iterator[Mistake]:
    """Mistakes that any frame may have, on these frames: supports, hinges, one member's section, a load left out."""
    for joint, s in frame.supports.items():
        if s.rotation == HELD:
            supports = {**frame.supports, joint: replace(s, rotation=FREE)}
            yield Mistake("support", "base pinned", (joint, f"joint {joint}"), replace(frame, supports=supports))
    for m in r.sample(list(frame.members.values()), min(4, len(frame.members))):
        if m.turn_from == HELD:
            yield Mistake("end release", "hinge", _called(m.name), _member(frame, m.name, turn_from=FREE))
        own: dict[str, Section] = {}
        for s in dict.fromkeys((m.section, *(p.first for p in m.pieces), *(p.last for p in m.pieces))):
            own[f"{s} half"] = replace(frame.sections[s], name=f"{s} half", I=0.5 * frame.sections[s].I)
        half = _member(frame, m.name, section=f"{m.section} half", pieces=tuple(
            replace(p, first=f"{p.first} half", last=f"{p.last} half") for p in m.pieces))  # fmt: skip
        states = {n: replace(t, sections=_halved(t.sections)) for n, t in frame.states.items()}
        where = _called(m.name)
        yield Mistake("stiffness", "half of I", where, replace(half, sections={**frame.sections, **own}, states=states))
    for case in frame.combinations[name].factors if name in frame.combinations else (name,):
        loads = frame.cases[case].loads
        entries = sorted({q.entry for q in loads if not isinstance(q, Lean)})
        if len(entries) > 1:
            entry = r.choice(entries)
            kept = replace(frame.cases[case], loads=tuple(q for q in loads if q.entry != entry))
            yield Mistake("load", "load left out", (f"{case}[{entry}]",), replace(frame, cases={**frame.cases, case: kept}))


def _halved(factors: Mapping[str, Mapping[str, float]]) -> dict[str, Mapping[str, float]]:
    return {**factors, **{f"{s} half": f for s, f in factors.items()}}


# --- claims, and what is made of them


def drawn(seed: int, per: int, sorts: Any = mistakes) -> Iterator[tuple[Frame, str, Mistake, list[ClaimedValue]]]:
    """The claims of one frame at 4 digits, every sort of mistake once before any comes twice, the scarce ones twice and
    first; effect over 3% of peak."""
    r, frame = Random(seed), the_frame(seed)
    opinions = opinions_on(frame)
    if opinions is None:
        return
    answer = opinions.answers["slope-deflection"]
    pool = []
    for name in dict.fromkeys([*_telling(frame, r), *r.sample(frame.names, min(len(frame.names), 6))]):
        if name in answer.cases:
            pool += [(name, m) for m in sorts(frame, name, r)]
    r.shuffle(pool)
    seen: dict[str, int] = {}
    ranked = []
    for k, (name, mistake) in enumerate(pool):
        seen[mistake.sort] = seen.get(mistake.sort, 0) + 1
        scarce = mistake.sort in SCARCE
        ranked.append((seen[mistake.sort] - scarce, not scarce, k, name, mistake))
    taken = 0
    for *_, name, mistake in sorted(ranked, key=lambda x: x[:3]):
        if taken == per:
            return
        assert mistake.frame is not None
        other = solved(mistake.frame, (name,))
        if other is None:
            continue
        least = max(EFFECT * _peak(answer.cases[name]), FAINT * opinions.judgements[name].scales.moments)
        off = np.abs(np.nan_to_num(other.cases[name].ends[:, :, 2] - answer.cases[name].ends[:, :, 2])).max()
        if off >= least > 0:
            taken += 1
            yield frame, name, mistake, case_values(mistake.frame, other.cases[name], name, 4, seed % 2 == 0)


def _telling(frame: Frame, r: Random) -> Iterator[str]:
    """Some of the combinations that lean, have an order, or have springs of their own."""

    def springs(c: Combination) -> bool:
        return bool(c.stiffness and frame.states[c.stiffness].supports)

    every = frame.combinations.values()
    for some in ([c for c in every if c.lean], [c for c in every if c.order], list(filter(springs, every))):
        yield from (c.name for c in r.sample(some, min(len(some), 3)))


def _peak(case: CaseAnswer) -> float:
    return float(np.abs(np.nan_to_num(case.ends[:, :, 2])).max(initial=0.0))


def tried(frame: Frame, name: str, mistake: Mistake, values: list[ClaimedValue], seed: int) -> Record:
    """Judge the claim and look for suspects."""
    opinions, closed = opinions_on(frame), closed_claim(values)
    assert opinions is not None
    claims = judged(frame, opinions, closed)
    start = time.process_time()
    found = search(frame, opinions, closed, claims, CLAIM) if any(c.verdict == "disagree" for c in claims) else None
    spent = time.process_time() - start
    suspects = found.suspects if found else ()
    rank = next((k + 1 for k, s in enumerate(suspects) if right(frame, name, mistake, s, closed)), 0)
    says = tuple(f"{s.kind} {s.where}: {s.says}" for s in suspects[:3])
    return Record(seed, mistake.kind, mistake.sort, mistake.where, worst([c.verdict for c in claims]), rank, len(suspects),
                  says, suspects[0].explains if suspects else 0.0, spent)  # fmt: skip


def right(frame: Frame, name: str, mistake: Mistake, suspect: Suspect, closed: ClosedClaim) -> bool:
    """The true mistake (kind, and a place of it), or one whose results, by moment distribution, the claim cannot tell."""
    return named_by(mistake, suspect) or indistinct(frame, suspect, closed)


def indistinct(frame: Frame, suspect: Suspect, closed: ClosedClaim) -> bool:
    """Whether the claim cannot tell the results of what a suspect says, by moment distribution, from its own."""
    changed, claim = suspect.change.apply(frame, closed)
    answer = solved(changed, claim.cases)
    if answer is None:
        return False
    told = {
        (v.case, v.kind, v.quantity, v.member, v.joint): v.value
        for n in claim.cases for v in case_values(changed, answer.cases[n], n, 15, False)
    }  # fmt: skip
    if any(v.kind == "span" for v in claim.values):
        return False
    return all(
        math.isclose(there, v.value, rel_tol=1e-6, abs_tol=1.06 * v.half_digit)
        for v in claim.values
        if (there := told.get((v.case, v.kind, v.quantity, v.member, v.joint))) is not None
    )


# --- two mistakes at once


def drawn_pairs(seed: int, per: int) -> Iterator[tuple[Frame, str, tuple[Mistake, Mistake], list[ClaimedValue]]]:
    """Claims with a mistake of the week and a second, of the week or of any frame, at 4 digits; each of the two changes
    what the other alone makes by more than 3% of the peak end moment."""
    r, frame = Random(f"pairs {seed}"), the_frame(seed)
    opinions = opinions_on(frame)
    if opinions is None:
        return
    answer = opinions.answers["slope-deflection"]
    names = dict.fromkeys([*_telling(frame, r), *r.sample(frame.names, min(len(frame.names), 6))])
    chosen = r.sample([n for n in names if n in answer.cases], min(per, len([n for n in names if n in answer.cases])))
    for name in chosen * -(-per // max(len(chosen), 1)):
        if per > 0 and (found := _pair(frame, name, r, answer.cases[name], opinions)):
            per -= 1
            yield frame, name, found[0], case_values(found[1], found[2], name, 4, seed % 2 == 0)


def _pair(
    frame: Frame, name: str, r: Random, right: CaseAnswer, opinions: check.Opinions
) -> tuple[tuple[Mistake, Mistake], Frame, CaseAnswer] | None:
    """Two mistakes, the frame with both and its results; None where some draws gave no two that show."""
    least = max(EFFECT * _peak(right), FAINT * opinions.judgements[name].scales.moments)
    for _ in range(8):
        sorts: dict[str, list[Mistake]] = {}
        for m in mistakes(frame, name, r):
            sorts.setdefault(m.sort, []).append(m)
        if not sorts:
            return None
        one = r.choice(sorts[r.choice(sorted(sorts))])
        assert one.frame is not None
        seconds: dict[str, list[Mistake]] = {}
        for m in (*mistakes(one.frame, name, r), *common(one.frame, name, r)):
            if m.sort != one.sort:
                seconds.setdefault(m.sort, []).append(m)
        two = r.choice(seconds[r.choice(sorted(seconds))])
        assert two.frame is not None
        found = [solved(f, (name,)) for f in (two.frame, one.frame, *_like(frame, name, two))]
        if len(found) < 3 or found[0] is None:
            continue
        both, *parts = (f.cases[name] for f in found if f is not None)
        if all(_off(both, other) >= least > 0 for other in (right, *parts)):
            return (one, two), two.frame, both
    return None


def _like(frame: Frame, name: str, mistake: Mistake) -> list[Frame]:
    """The frame as stated with the like of a mistake drawn for another one; none where it has no such mistake."""
    for k in range(40):
        for m in (*mistakes(frame, name, Random(k)), *common(frame, name, Random(k))):
            if (m.sort, m.where) == (mistake.sort, mistake.where) and m.frame is not None:
                return [m.frame]
    return []


def _off(one: CaseAnswer, two: CaseAnswer) -> float:
    """The largest difference of an end moment."""
    return float(np.abs(np.nan_to_num(one.ends[:, :, 2] - two.ends[:, :, 2])).max(initial=0.0))


def tried_pair(
    frame: Frame, name: str, pair: tuple[Mistake, Mistake], values: list[ClaimedValue], seed: int
) -> Record:
    """As tried(), of two mistakes. Right is a suspect of two that names kind and places of both, or whose results the
    claim cannot tell from its own."""
    opinions, closed = opinions_on(frame), closed_claim(values)
    assert opinions is not None
    claims = judged(frame, opinions, closed)
    start = time.process_time()
    found = search(frame, opinions, closed, claims, CLAIM) if any(c.verdict == "disagree" for c in claims) else None
    spent = time.process_time() - start
    suspects = found.suspects if found else ()
    rank = next((k + 1 for k, s in enumerate(suspects) if both_named(pair, s) or indistinct(frame, s, closed)), 0)
    says = tuple(f"{s.kind} {s.where}: {s.says}" for s in suspects[:3])
    kind = "week and week" if pair[1].sort in WEEK_SORTS else "week and common"
    where = tuple(dict.fromkeys(w for m in pair for w in m.where))
    return Record(seed, kind, f"{pair[0].sort} + {pair[1].sort}", where, worst([c.verdict for c in claims]), rank,
                  len(suspects), says, suspects[0].explains if suspects else 0.0, spent)  # fmt: skip


WEEK_SORTS = (
    "service springs", "gross for state", "another state", "state for gross", "lean left out", "lean to the other side",
    "order of a combination", "all spans loaded", "another arrangement", "haunch or taper left out", "end for end",
    "all haunches left out", "rigid member that stretched", "member taken as rigid", "tie left out",
    "one-way member two-way", "lean of a case left out", "one-way support two-way",
)  # fmt: skip


def run_pairs(seeds: Iterable[int], per: int) -> Iterator[Record]:
    for seed in seeds:
        for frame, name, pair, values in drawn_pairs(seed, per):
            yield tried_pair(frame, name, pair, values, seed)


def run(seeds: Iterable[int], per: int, sorts: Any = mistakes) -> Iterator[Record]:
    for seed in seeds:
        for frame, name, mistake, values in drawn(seed, per, sorts):
            yield tried(frame, name, mistake, values, seed)


# --- claims that are envelopes


def envelope_values(frame: Frame, answer: Answer, name: str, digits: int = 4) -> list[ClaimedValue]:
    """Greatest and least end actions and reactions of an envelope as a claim."""
    parts = [case_values(frame, answer.cases[n], name, digits, True) for n in frame.envelopes[name].names]
    out = []
    for same in zip(*parts, strict=True):
        for which, pick in (("max", max), ("min", min)):
            best = pick(same, key=lambda v: v.value)
            if best.kind != "displacement":
                out.append(replace(best, extreme=which))  # type: ignore[arg-type]
    return out


def enveloped(seed: int, per: int) -> Iterator[tuple[Frame, str, Mistake, list[ClaimedValue]]]:
    """Envelopes of a frame with a mistake, every sort once before any twice; effect over 3% of the envelope's peak."""
    r, frame = Random(seed), the_frame(seed)
    opinions = opinions_on(frame)
    if opinions is None or not frame.envelopes:
        return
    answer = opinions.answers["slope-deflection"]
    name = r.choice(list(frame.envelopes))
    names = frame.envelopes[name].names
    if not all(n in answer.cases for n in names):
        return
    pool = {m.sort: m for n in r.sample(names, min(len(names), 4)) for m in mistakes(frame, n, r)
            if m.sort not in ("another arrangement", "all spans loaded")}  # fmt: skip
    right_stack = np.stack([answer.cases[n].ends[:, :, 2] for n in names])
    faint = FAINT * max(opinions.judgements[n].scales.moments for n in names)
    least = max(EFFECT * float(np.nanmax(np.abs(right_stack))), faint)
    for mistake in [m for _, m in sorted(pool.items())][:per]:
        assert mistake.frame is not None
        other = solved(mistake.frame, names)
        if other is None:
            continue
        stack = np.stack([other.cases[n].ends[:, :, 2] for n in names])
        off = max(np.nanmax(np.abs(f(stack, axis=0) - f(right_stack, axis=0))) for f in (np.max, np.min))
        if off >= least > 0:
            yield frame, name, mistake, envelope_values(mistake.frame, other, name)


def tried_envelope(frame: Frame, mistake: Mistake, values: list[ClaimedValue], seed: int) -> Record:
    """Judge an envelope's claim and look for suspects, as `verify` does."""
    opinions, closed = opinions_on(frame), closed_claim(values)
    assert opinions is not None
    claims = judged(frame, opinions, closed)
    start = time.process_time()
    wrong = any(c.verdict == "disagree" for c in claims)
    suspects = check._searched(opinions, closed, claims, CLAIM)[0] if wrong else ()
    spent = time.process_time() - start
    rank = next((k + 1 for k, s in enumerate(suspects) if named_by(mistake, s) or _as_said(frame, s, closed)), 0)
    says = tuple(f"{s.kind} {s.where}: {s.says}" for s in suspects[:3])
    return Record(seed, mistake.kind, mistake.sort, mistake.where, worst([c.verdict for c in claims]), rank, len(suspects),
                  says, suspects[0].explains if suspects else 0.0, spent)  # fmt: skip


def _as_said(frame: Frame, suspect: Suspect, closed: ClosedClaim) -> bool:
    """Whether the claim cannot tell the envelope of the frame so changed, by moment distribution, from its own."""
    changed, claim = suspect.change.apply(frame, closed)
    (name,) = claim.cases
    answer = solved(changed, changed.envelopes[name].names)
    if answer is None:
        return False
    pairs = zip(envelope_values(changed, answer, name, 15), claim.values, strict=True)
    return all(math.isclose(there.value, v.value, rel_tol=1e-6, abs_tol=1.06 * v.half_digit) for there, v in pairs)


def named_by(mistake: Mistake, suspect: Suspect) -> bool:
    """Whether a suspect names the kind and the place of a mistake."""
    return suspect.kind == mistake.kind and (not mistake.where or bool(set(mistake.where) & set(suspect.where)))


def run_enveloped(seeds: Iterable[int], per: int) -> Iterator[Record]:
    for seed in seeds:
        for frame, _, mistake, values in enveloped(seed, per):
            yield tried_envelope(frame, mistake, values, seed)


def right_claims(seed: int, per: int) -> Iterator[tuple[str, int, str, int]]:
    """(case, digits, verdict, suspects) of a frame's own results by moment distribution, printed to 3 to 6 digits."""
    frame, r = the_frame(seed), Random(f"right {seed}")
    opinions = opinions_on(frame)
    if opinions is None:
        return
    said = opinions.answers["slope-deflection"].cases
    for name in r.sample([n for n in frame.names if n in said], min(per, len(said))):
        answer, digits = solved(frame, (name,)), r.randint(3, 6)
        if answer is not None:
            closed = closed_claim(case_values(frame, answer.cases[name], name, digits, seed % 2 == 0))
            claims = judged(frame, opinions, closed)
            found = search(frame, opinions, closed, claims, CLAIM)
            yield name, digits, worst([c.verdict for c in claims]), len(found.suspects)


def main(arguments: list[str]) -> None:
    first, last, per = map(int, arguments[:3])
    seeds = range(first, last)
    if "right" in arguments:
        every = [(seed, *found) for seed in seeds for found in right_claims(seed, per)]
        wrong = [f for f in every if f[3] == "disagree" or f[4]]
        print(f"{len(every)} right claims; disagree or with a suspect: {wrong or 'none'}")
        return
    sorts = common if "common" in arguments else mistakes
    records = []
    several = run_enveloped if "envelopes" in arguments else run_pairs if "pairs" in arguments else None
    for record in several(seeds, per) if several else run(seeds, per, sorts):
        records.append(record)
        if record.rank != 1:
            says = f"{record.verdict} {record.rank} {record.first}"
            print(record.seed, record.sort, record.where, says, f"{record.seconds:.1f} s", flush=True)
    print(table([replace(r, sort="") for r in records] if "pairs" in arguments else records))
    spent = sorted(r.seconds for r in records)
    print(f"seconds of processor a claim: median {spent[len(spent) // 2]:.2f}, worst {spent[-1]:.2f}")


if __name__ == "__main__":
    main(sys.argv[1:])
