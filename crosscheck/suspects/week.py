"""Mistakes that belong to states of stiffness, leans, patterns, ties, stepped members and parts that work one way only.

None of these is a change of one place in a frame of one stiffness, so nothing here is foretold: each is tried by solving
again, and there are few of each sort. Whoever had one combination wrong may have had all of its kind wrong: where the
claim speaks of several, both are tried.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Iterable, Iterator, Mapping
from dataclasses import replace
from functools import partial
from typing import Any

from crosscheck.frame.loads import case_factors
from crosscheck.frame.model import Combination, Frame, Lean, Load, Member, Piece, StiffnessState, Tie
from crosscheck.suspects.changes import Change, sections_of, with_loads, with_member, with_support
from crosscheck.suspects.suspect import Family, Option, named

STATE_OUT, STATE_IN, STATE_OTHER, STATE_PART = 0.0, 0.3, 0.3, 0.3
ORDER, LEAN_OUT, LEAN_OTHER, LEAN_ENTRY = 0.1, 0.1, 0.2, 0.1
ALL_SPANS, OTHER_SPANS, EXCLUDED = 0.0, 0.1, 0.1
PRISMATIC, REVERSED, ALL_PRISMATIC = 0.1, 0.3, 0.1
TIE_OUT, TWO_WAY, ALL_TWO_WAY, RIGID_OUT, RIGID_IN, ALL_RIGID_OUT = 0.1, 0.1, 0.2, 0.1, 0.5, 0.2
ONE_OF_SEVERAL = 0.2
"""What it costs that only one of several had the mistake."""
FACTOR = 0.5
MOST_MEMBERS = 60
"""Members of a frame each of which is tried as axially rigid."""


def has_week(frame: Frame) -> bool:
    """Whether results of the frame are more than those of one stiffness, in one order, of loads that add up."""
    own = any(c.stiffness or c.order or c.lean for c in frame.combinations.values())
    leans = any(isinstance(load, Lean) for c in frame.cases.values() for load in c.loads)
    members = any(m.pieces or m.axial for m in frame.members.values())
    return own or leans or members or frame.one_way or bool(frame.ties or frame.patterns or frame.exclusive)


def week_options(frame: Frame, names: Collection[str], alone: bool = True) -> Iterator[Option]:
    """Every single mistake of the week's grammar. names: the claim's cases and combinations; alone: whether arrangements
    are tried in each of them by itself, too."""
    claimed = [frame.combinations[n] for n in names if n in frame.combinations]
    yield from _states(frame, claimed)
    yield from _orders(frame, claimed)
    yield from _leans(frame, claimed)
    yield from _entries_that_lean(frame, {case for n in names for case in case_factors(frame, n)})
    yield from _arrangements(frame, names, alone)
    yield from _excluded(frame, claimed)
    yield from _prismatic(frame)
    yield from _ties(frame)
    yield from _one_way(frame)
    yield from _rigid(frame)


def week_families(frame: Frame, names: Collection[str]) -> Iterator[Family]:
    """Factors of the claimed states, and leans of the claimed combinations, that had another number, to be fitted."""
    claimed = [frame.combinations[n] for n in names if n in frame.combinations]
    for name in dict.fromkeys(c.stiffness for c in claimed if c.stiffness):
        for kind, table in TABLES:
            for thing, factors in getattr(frame.states[name], table).items():
                for key in ("I", "E") if kind != "support" else tuple(factors):
                    if key in factors:
                        at = partial(_other_factor, frame, name, kind, table, thing, key)
                        yield Family(at, (0.7 * factors[key], 1.4 * factors[key]))
    for lean, stated in _together(claimed, lambda c: c.lean).items():
        if lean:
            yield Family(partial(_other_lean, frame, tuple(stated), lean), (0.5 * lean, 2.0 * lean), False)


def _other_factor(frame: Frame, state: str, kind: str, table: str, thing: str, key: str, p: float) -> Option:
    old = getattr(frame.states[state], table)[thing][key]
    says = f"state {state} had {p:.4g} on {key} of {thing} in place of {old:g}"
    change = Change(partial(_with_factor, state=state, table=table, thing=thing, key=key, factor=p))
    of = "support" if kind == "support" else "stiffness"
    return Option(of, (_label(frame, kind, thing),), says, change, FACTOR, fitted=1)


def _with_factor(frame: Frame, state: str, table: str, thing: str, key: str, factor: float) -> Frame:
    of: Any = frame.states[state]
    things = getattr(of, table)
    new = replace(of, **{table: {**things, thing: {**things[thing], key: factor}}})
    return replace(frame, states={**frame.states, state: new})


def _other_lean(frame: Frame, of: tuple[str, ...], lean: float, p: float) -> Option:
    says = f"the lean was {p:.4g} in place of {lean:g} in {', '.join(of)}"
    return replace(_changed("load", of, says, of, {"lean": p}, FACTOR), fitted=1)


# --- what combinations say of themselves


def _with_combinations(frame: Frame, of: Collection[str], fields: Mapping[str, Any]) -> Frame:
    """The frame with some fields of combinations replaced, by name or by the name that they were stated by."""
    new = {n: replace(c, **fields) if _stated(c) in of or n in of else c for n, c in frame.combinations.items()}
    return replace(frame, combinations=new)


def _stated(combination: Combination) -> str:
    return combination.stated or combination.name


def _together(claimed: Iterable[Combination], key: Callable[[Combination], Any]) -> dict[Any, list[str]]:
    """Stated names of the claimed combinations by what they have in common."""
    found: dict[Any, list[str]] = {}
    for combination in claimed:
        names = found.setdefault(key(combination), [])
        if _stated(combination) not in names:
            names.append(_stated(combination))
    return found


def _groups(names: list[str]) -> Iterator[tuple[tuple[str, ...], str, float]]:
    """All of these combinations, and where they are several each alone: names, words, cost."""
    yield tuple(names), f" in {', '.join(names[:4])}{' and others' if len(names) > 4 else ''}", 0.0
    for name in names if len(names) > 1 else ():
        yield (name,), f" in {name} alone", ONE_OF_SEVERAL


def _states(frame: Frame, claimed: list[Combination]) -> Iterator[Option]:
    """The state left out, another in its place, one where none is stated, and parts of it left out."""
    for state, names in _together(claimed, lambda c: c.stiffness).items():
        for of, words, cost in _groups(names):
            if state:
                kind, where = _touched(frame, frame.states[state])
                says = f"stiffness as stated was used in place of state {state}{words}"
                yield _changed(kind, where, says, of, {"stiffness": ""}, cost + STATE_OUT)
            for other in frame.states:
                if other != state:
                    kind, where = _touched(frame, frame.states[other], frame.states.get(state))
                    instead = f"state {state}" if state else "stiffness as stated"
                    says = f"state {other} was used in place of {instead}{words}"
                    yield _changed(kind, where, says, of, {"stiffness": other}, cost + (STATE_OTHER if state else STATE_IN))
        if state:
            yield from _parts(frame, frame.states[state])


def _changed(
    kind: str, where: tuple[str, ...], says: str, of: tuple[str, ...], fields: Mapping[str, Any], cost: float
) -> Option:
    return Option(kind, where, says, Change(partial(_with_combinations, of=of, fields=fields)), cost)


TABLES = (("section", "sections"), ("member", "members"), ("material", "materials"), ("support", "supports"))


def _touched(frame: Frame, *states: StiffnessState | None) -> tuple[str, tuple[str, ...]]:
    """The kind of mistake that a state forgotten is, and what the states name: supports alone make it one of supports."""
    found = [(kind, name) for s in states if s for kind, table in TABLES for name in getattr(s, table)]
    where = dict.fromkeys(_label(frame, kind, name) for kind, name in found)
    return "support" if {kind for kind, _ in found} <= {"support"} else "stiffness", tuple(where)


def _label(frame: Frame, kind: str, name: str) -> str:
    return named(frame, "joint" if kind == "support" else kind, name)


def _parts(frame: Frame, state: StiffnessState) -> Iterator[Option]:
    """Each thing that a state of several names left as stated; all springs together where it has other things too."""
    things = [(kind, table, name) for kind, table in TABLES for name in getattr(state, table)]
    if len(things) < 2:
        return
    for kind, table, name in things:
        label = _label(frame, kind, name)
        says = f"{kind} {name} had no factor in state {state.name}"
        change = Change(partial(_without_part, state=state.name, table=table, names=(name,)))
        yield Option("support" if kind == "support" else "stiffness", (label,), says, change, STATE_PART)
    for kind, table in TABLES:
        names = tuple(getattr(state, table))
        if 1 < len(names) < len(things):
            where = tuple(_label(frame, kind, n) for n in names)
            says = f"no {kind} had its factor in state {state.name}"
            change = Change(partial(_without_part, state=state.name, table=table, names=names))
            yield Option("support" if kind == "support" else "stiffness", where, says, change, STATE_PART)


def _without_part(frame: Frame, state: str, table: str, names: tuple[str, ...]) -> Frame:
    of: Any = frame.states[state]
    less = {name: factors for name, factors in getattr(of, table).items() if name not in names}
    return replace(frame, states={**frame.states, state: replace(of, **{table: less})})


def _orders(frame: Frame, claimed: list[Combination]) -> Iterator[Option]:
    """First order for second and the other way round, where the combination has a word of its own or others differ."""
    by_order = _together(claimed, lambda c: c.order or frame.analysis.order)
    mixed = any(c.order for c in frame.combinations.values())
    for order, names in by_order.items():
        for of, words, cost in _groups(names) if mixed else ():
            says = f"the analysis was of {'first' if order == 2 else 'second'} order{words}"
            yield _changed("idealisation", (), says, of, {"order": 3 - order}, cost + ORDER)


def _leans(frame: Frame, claimed: list[Combination]) -> Iterator[Option]:
    for lean, names in _together(claimed, lambda c: c.lean).items():
        for of, words, cost in _groups(names) if lean else ():
            says = f"the lean was left out{words}"
            yield _changed("load", of, says, of, {"lean": 0.0}, cost + LEAN_OUT)
            says = f"the lean was to the other side{words}"
            yield _changed("load", of, says, of, {"lean": -lean}, cost + LEAN_OTHER)
    for lean in {c.lean for c in frame.combinations.values() if c.lean}:
        names = [_stated(c) for c in claimed if not c.lean]
        for of, words, cost in _groups(list(dict.fromkeys(names))) if names else ():
            yield _changed("load", of, f"a lean of {lean:g} was counted{words}", of, {"lean": lean}, cost + 0.6)


def _entries_that_lean(frame: Frame, cases: Collection[str]) -> Iterator[Option]:
    """A case's own lean left out or to the other side."""
    for case in cases:
        loads = frame.cases[case].loads
        for load in loads:
            if isinstance(load, Lean):
                where = (f"{case}[{load.entry}]",)
                without = Change(partial(_lean_of, case=case, entry=load.entry, factor=0.0))
                yield Option("load", where, f"the lean of {case} was left out", without, LEAN_ENTRY)
                other = Change(partial(_lean_of, case=case, entry=load.entry, factor=-1.0))
                yield Option("load", where, f"the lean of {case} was to the other side", other, LEAN_OTHER)


def _lean_of(frame: Frame, case: str, entry: int, factor: float) -> Frame:
    def leaning(load: Load) -> Load:
        return replace(load, share=factor * load.share) if isinstance(load, Lean) and load.entry == entry else load

    return with_loads(frame, case, tuple(map(leaning, frame.cases[case].loads)))


# --- arrangements, and cases that exclude each other


def _of_pattern(frame: Frame, case: str) -> list[str]:
    """A pattern's case as stated and all its arrangements, by any one of them; none where it has no pattern."""
    stated = frame.cases[case].arranged or case
    further = [c.name for c in frame.cases.values() if c.arranged == stated]
    return [stated, *further] if further else []


def _spans(frame: Frame, case: str) -> str:
    """What of a pattern a case has loaded, in words."""
    stated = frame.cases[case].arranged
    return case[len(stated) + 2 : -1] if stated else "all spans"


def _arrangements(frame: Frame, names: Collection[str], alone: bool) -> Iterator[Option]:
    """All spans loaded in place of an arrangement, or another arrangement: in every claimed combination that has it, and
    in each."""
    used: dict[str, list[str]] = {}
    for name in names:
        for case in case_factors(frame, name):
            if _of_pattern(frame, case):
                used.setdefault(case, []).append(name)
    for case, where in used.items():
        stated, *_ = every = _of_pattern(frame, case)
        for other in every:
            if other == case:
                continue
            cost = ALL_SPANS if other == stated else OTHER_SPANS
            says = f"{stated} was on {_spans(frame, other)} in place of {_spans(frame, case)}"
            change = partial(_arranged, names=tuple(where), case=case, other=other)
            yield Option("load", (stated,), says, Change(change), cost)
            for name in where if alone and len(where) > 1 else ():
                there = partial(_arranged, names=(name,), case=case, other=other)
                yield Option("load", (stated,), f"{says} in {name} alone", Change(there), cost + ONE_OF_SEVERAL)
    yield from _every_span(frame, used)


def _every_span(frame: Frame, used: Mapping[str, list[str]]) -> Iterator[Option]:
    """Patterns left out altogether, where the claim has several arrangements."""
    by_stated: dict[str, list[str]] = {}
    for case in used:
        if frame.cases[case].arranged:
            by_stated.setdefault(frame.cases[case].arranged, []).append(case)
    for stated, cases in by_stated.items():
        if len(cases) > 1:
            pairs = tuple((case, tuple(used[case])) for case in cases)
            change = Change(partial(_all_spans, stated=stated, pairs=pairs))
            yield Option("load", (stated,), f"{stated} was on all spans throughout", change, ALL_SPANS)


def _all_spans(frame: Frame, stated: str, pairs: tuple[tuple[str, tuple[str, ...]], ...]) -> Frame:
    for case, names in pairs:
        frame = _arranged(frame, names, case, stated)
    return frame


def _arranged(frame: Frame, names: tuple[str, ...], case: str, other: str) -> Frame:
    """The frame with one arrangement in place of another in some combinations (or in the case itself)."""
    for name in names:
        if name in frame.cases:
            frame = with_loads(frame, name, frame.cases[other].loads)
            continue
        combination = frame.combinations[name]
        factors: dict[str, float] = {}
        for c, f in combination.factors.items():
            key = other if c == case else c
            factors[key] = factors.get(key, 0.0) + f
        frame = replace(frame, combinations={**frame.combinations, name: replace(combination, factors=factors)})
    return frame


def _excluded(frame: Frame, claimed: list[Combination]) -> Iterator[Option]:
    """One of the cases that exclude each other in place of another, or besides it."""
    for combination in claimed:
        for group in frame.exclusive:
            mine = [c for c in combination.factors if c in group or frame.cases[c].arranged in group]
            for case in mine:
                for other in group:
                    if other in mine or other == frame.cases[case].arranged:
                        continue
                    says = f"{other} was in place of {case} in {combination.name}"
                    swap = partial(_arranged, names=(combination.name,), case=case, other=other)
                    yield Option("load case", (), says, Change(swap), EXCLUDED + 0.2)
                    factors = {**combination.factors, other: combination.factors[case]}
                    both = partial(_with_combinations, of=(combination.name,), fields={"factors": factors})
                    says = f"{other} was in {combination.name} besides {case}, which it excludes"
                    yield Option("load case", (), says, Change(both), EXCLUDED)


# --- members


def _prismatic(frame: Frame) -> Iterator[Option]:
    """Haunches and tapers left out, of one member, of all of one make, or of all; a member end for end."""
    varying = [m for m in frame.members.values() if m.pieces]
    for member in varying:
        label = named(frame, "member", member.name)
        for section in sections_of(member):
            says = f"{label} had section {section} throughout"
            change = Change(partial(with_member, name=member.name, section=section))
            yield Option("stiffness", (label,), says, change, PRISMATIC if section == member.section else PRISMATIC + 0.1)
        turned = _turned(member.pieces)
        if turned != member.pieces:
            change = Change(partial(with_member, name=member.name, pieces=turned))
            yield Option("stiffness", (label,), f"{label} was turned end for end", change, REVERSED)
        if any(p.first != p.last for p in member.pieces):
            yield from _unhaunched(member, label)
    yield from _all_prismatic(frame, varying)


def _turned(pieces: tuple[Piece, ...]) -> tuple[Piece, ...]:
    """The pieces from the other end."""
    starts = (0.0, *(p.until for p in pieces[:-1]))
    return tuple(
        Piece(p.last, p.first, 1.0 if start == 0.0 else 1.0 - start)
        for p, start in zip(reversed(pieces), reversed(starts), strict=True)
    )


def _unhaunched(member: Member, label: str) -> Iterator[Option]:
    """Tapered pieces as steps of their deeper or lighter end."""
    firsts = tuple(replace(p, last=p.first) for p in member.pieces)
    lasts = tuple(replace(p, first=p.last) for p in member.pieces)
    for word, pieces in (("first", firsts), ("second", lasts)):
        if len({p.first for p in pieces}) > 1:
            change = Change(partial(with_member, name=member.name, pieces=pieces))
            says = f"tapered pieces of {label} had the {word} of their sections throughout"
            yield Option("stiffness", (label,), says, change, REVERSED + 0.3)


def _all_prismatic(frame: Frame, varying: list[Member]) -> Iterator[Option]:
    """One section throughout every stepped or tapered member that has it."""
    sections = dict.fromkeys(s for m in varying for s in sections_of(m))
    for section in sections:
        of = tuple(m.name for m in varying if section in sections_of(m))
        if len(of) > 1:
            where = tuple(named(frame, "member", n) for n in of)
            usual = all(frame.members[n].section == section for n in of)
            says = f"stepped and tapered members had section {section} throughout"
            change = Change(partial(_throughout, members=of, section=section))
            yield Option("stiffness", where, says, change, ALL_PRISMATIC if usual else ALL_PRISMATIC + 0.1)
    usual_of = tuple((m.name, m.section) for m in varying)
    if len({section for _, section in usual_of}) > 1:
        where = tuple(named(frame, "member", n) for n, _ in usual_of)
        says = "stepped and tapered members had the section of their longest piece throughout"
        yield Option("stiffness", where, says, Change(partial(_each_throughout, usual=usual_of)), ALL_PRISMATIC)


def _throughout(frame: Frame, members: tuple[str, ...], section: str) -> Frame:
    return _each_throughout(frame, tuple((name, section) for name in members))


def _each_throughout(frame: Frame, usual: tuple[tuple[str, str], ...]) -> Frame:
    for name, section in usual:
        frame = with_member(frame, name, section=section)
    return frame


def _ties(frame: Frame) -> Iterator[Option]:
    for name, tie in frame.ties.items():
        where = tuple(named(frame, "joint", j) for j in tie.joints)
        says = f"the tie {name} was left out"
        yield Option("geometry", where, says, Change(partial(_with_ties, name=name, tie=None)), TIE_OUT)
        for joint in tie.joints if len(tie.joints) > 2 else ():
            less = replace(tie, joints=tuple(j for j in tie.joints if j != joint))
            says = f"joint {joint} was not in the tie {name}"
            yield Option("geometry", where, says, Change(partial(_with_ties, name=name, tie=less)), TIE_OUT + 0.3)
        across = replace(tie, direction=tie.direction + 90.0)
        says = f"the tie {name} acted across its direction"
        yield Option("geometry", where, says, Change(partial(_with_ties, name=name, tie=across)), TIE_OUT + 0.6)


def _with_ties(frame: Frame, name: str, tie: Tie | None) -> Frame:
    ties = {n: t for n, t in frame.ties.items() if n != name}
    return replace(frame, ties=ties if tie is None else {**ties, name: tie})


def _one_way(frame: Frame) -> Iterator[Option]:
    """One-way parts that worked both ways, or the other way."""
    rods = [m for m in frame.members.values() if m.only]
    for m in rods:
        label = named(frame, "member", m.name)
        change = Change(partial(with_member, name=m.name, only=""))
        bad = "compression" if m.only == "tension" else "tension"
        yield Option("stiffness", (label,), f"{label} worked in {bad} too", change, TWO_WAY)
        other = Change(partial(with_member, name=m.name, only=bad))
        yield Option("stiffness", (label,), f"{label} worked in {bad} only", other, TWO_WAY + 0.5)
    if len(rods) > 1:
        where = tuple(named(frame, "member", m.name) for m in rods)
        says = "all members that work one way only worked both ways"
        yield Option("stiffness", where, says, Change(_both_ways), ALL_TWO_WAY)
    for joint, s in frame.supports.items():
        for axis in ("x", "y"):
            if getattr(s, f"{axis}_only"):
                label = named(frame, "joint", joint)
                new = replace(s, x_only="") if axis == "x" else replace(s, y_only="")
                says = f"the support at {label} held both ways along {axis}"
                yield Option("support", (label,), says, Change(partial(with_support, joint=joint, support=new)), TWO_WAY)


def _both_ways(frame: Frame) -> Frame:
    members = {n: replace(m, only="") if m.only else m for n, m in frame.members.items()}
    return replace(frame, members=members)


def _rigid(frame: Frame) -> Iterator[Option]:
    """A member that keeps its length taken as elastic, and the reverse."""
    if frame.analysis.axial == "rigid":
        return
    rigid = [m.name for m in frame.members.values() if m.axial]
    for name in rigid:
        label = named(frame, "member", name)
        change = Change(partial(with_member, name=name, axial=""))
        yield Option("idealisation", (label,), f"{label} could stretch", change, RIGID_OUT)
    if len(rigid) > 1:
        where = tuple(named(frame, "member", n) for n in rigid)
        says = "all axially rigid members could stretch"
        yield Option("idealisation", where, says, Change(partial(_stretching, members=tuple(rigid))), ALL_RIGID_OUT)
    if rigid and len(frame.members) <= MOST_MEMBERS:
        for m in frame.members.values():
            if not m.axial and not m.only:
                label = named(frame, "member", m.name)
                change = Change(partial(with_member, name=m.name, axial="rigid"))
                yield Option("idealisation", (label,), f"{label} was axially rigid", change, RIGID_IN)


def _stretching(frame: Frame, members: tuple[str, ...]) -> Frame:
    for name in members:
        frame = with_member(frame, name, axial="")
    return frame
