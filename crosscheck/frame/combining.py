"""What is made of load cases: patterns and their arrangements, combinations, either-or cases, envelopes.

A pattern makes further cases, "imposed (odd spans)", and each combination that uses its case makes further
combinations, "ultimate (imposed odd spans)". A combination that names cases which exclude each other becomes one
combination for each of them, "ultimate (wind_left)". Everybody else sees plain cases and combinations.
"""

from __future__ import annotations

import fnmatch
import itertools
from collections.abc import Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Literal

from crosscheck.frame.fields import A_NUMBER, Checker, Table, shown
from crosscheck.frame.locate import Path
from crosscheck.frame.model import Combination, Envelope, LoadCase, Pattern
from crosscheck.frame.needs import order_fault

ARRANGEMENTS = ("all", "alternate", "adjacent")
EXTRA_KEYS = ("stiffness", "order", "lean")
MOST = 1000
"""Most cases and combinations of one frame, arrangements among them."""


@dataclass(frozen=True, slots=True)
class Arrangement:
    """Some spans of a pattern's case loaded, "odd spans" ("" for the case as stated); the case that is so loaded."""

    label: str
    case: str
    of: str


@dataclass(frozen=True, slots=True)
class Combined:
    """cases: as stated, and every arrangement of them. parted: combinations that name cases which exclude each other,
    with those cases."""

    cases: dict[str, LoadCase]
    combinations: dict[str, Combination]
    patterns: dict[str, Pattern]
    exclusive: tuple[tuple[str, ...], ...]
    parted: dict[str, tuple[str, ...]]
    envelopes: dict[str, Envelope]


def combined(
    check: Checker, data: Table, cases: Mapping[str, LoadCase], members: Collection[str] | None,
    groups: Mapping[str, list[str]], states: Collection[str],
) -> Combined:  # fmt: skip
    """Everything that the file makes of its load cases. members: names that spans may use, None where unknown."""
    patterns = _patterns(check, data.get("patterns", {}), cases, members, groups)
    every, arranged = dict(cases), dict[str, list[Arrangement]]()
    for pattern in patterns.values():
        further = _arranged_cases(pattern, cases[pattern.case])
        arranged[pattern.case] = [Arrangement(label, case.name, pattern.case) for label, case in further.items()]
        for case in further.values():
            if case.name in every:
                says = f"its arrangement {shown(case.name)} has the name of a load case"
                check.note(("patterns", pattern.case), says, "call that load case something else")
            every[case.name] = case
    exclusive = _exclusive(check, data, cases)
    stated = _Combinations(check, cases, states).read(data.get("combinations", {}))
    combinations: dict[str, Combination] = {}
    parted: dict[str, tuple[str, ...]] = {}
    for one in stated:
        both = tuple(case for group in exclusive if len(g := _in(group, one)) > 1 for case in g)
        if both:
            parted[one.name] = both
        room = MOST - len(every) - len(combinations)
        made = list(itertools.islice(_alternatives(one, exclusive, arranged, patterns), max(room, 0) + 1))
        if len(made) > room:
            says = f"patterns and cases that exclude each other make more than {MOST} cases and combinations"
            check.note(("combinations", one.name), says, "arrange fewer spans, or choose among fewer cases, at once")
            break
        for further_one in made:
            if further_one.name in combinations or (further_one.stated and further_one.name in every):
                says = f"becomes {shown(further_one.name)}, and something else has that name"
                check.note(("combinations", one.name), says, "give the other a name of its own")
            combinations[further_one.name] = further_one
    envelopes = _envelopes(check, data.get("envelopes", {}), every, combinations)
    return Combined(every, combinations, patterns, exclusive, parted, envelopes)


# --- patterns


def _patterns(
    check: Checker, value: object, cases: Collection[str], members: Collection[str] | None,
    groups: Mapping[str, list[str]],
) -> dict[str, Pattern]:  # fmt: skip
    table = check.table(value, ("patterns",), '[patterns.imposed] with spans = [["b1"], ["b2"]]')
    found = {}
    for name, entry in ({} if table is None else table).items():
        path: Path = ("patterns", name)
        if not check.name(name, cases, "load case", path):
            continue
        inner = check.table(entry, path, '{ spans = [["b1"], ["b2"]] }')
        if inner is not None:
            check.only(inner, ("spans", "arrangements"), path, "a pattern")
            spans = _spans(check, inner.get("spans"), (*path, "spans"), members, groups)
            words = _arrangements(check, inner.get("arrangements", list(ARRANGEMENTS)), (*path, "arrangements"))
            found[name] = Pattern(name, spans, words)
    return found


def _spans(
    check: Checker, value: object, path: Path, members: Collection[str] | None, groups: Mapping[str, list[str]]
) -> tuple[tuple[str, ...], ...]:
    if not isinstance(value, list) or not value:
        check.note(path, "spans is missing" if value is None else f"{shown(value)} is not a list of spans",
                   'give spans = [["b1"], ["b2"], ["b3"]], the members of each span')  # fmt: skip
        return ()
    spans: list[tuple[str, ...]] = []
    for k, entry in enumerate(value):
        names = entry if isinstance(entry, list) else [entry]
        one: list[str] = []
        for n, name in enumerate(names):
            if isinstance(name, str) and name in groups and name not in (members or ()):
                one += groups[name]
            else:
                one.append(check.name(name, members, "member", (*path, k, n) if names is entry else (*path, k)))
        spans.append(tuple(one))
    named = [name for span in spans for name in span if name]
    if len(set(named)) < len(named):
        twice = next(name for k, name in enumerate(named) if name in named[:k])
        check.note(path, f"member {shown(twice)} is in two spans", "name each member once")
    return tuple(spans)


def _arrangements(check: Checker, value: object, path: Path) -> tuple[str, ...]:
    if not isinstance(value, list) or not value:
        check.note(path, f"{shown(value)} is not a list of arrangements", 'give arrangements = ["all", "alternate"], say')
        return ()
    words = [check.word(word, ARRANGEMENTS, (*path, k)) for k, word in enumerate(value)]
    return tuple(word for word in words if word)


def arrangements(pattern: Pattern) -> dict[str, frozenset[int]]:
    """Loaded spans (from 0) by label, each set once; "all" is the case as stated and is not among them."""
    count = len(pattern.spans)
    found: dict[str, frozenset[int]] = {}
    if "alternate" in pattern.arrangements:
        found |= {"odd spans": frozenset(range(0, count, 2)), "even spans": frozenset(range(1, count, 2))}
    if "adjacent" in pattern.arrangements:
        found |= {f"spans {k}+{k + 1}": frozenset((k - 1, k)) for k in range(1, count)}
    whole = frozenset(range(count))
    seen = {whole, frozenset[int]()} if "all" in pattern.arrangements else {frozenset[int]()}
    kept = {}
    for label, spans in found.items():
        if spans not in seen:
            seen.add(spans)
            kept["all spans" if spans == whole else label] = spans
    return kept


def _arranged_cases(pattern: Pattern, case: LoadCase) -> dict[str, LoadCase]:
    """By label, the case with its loads on unloaded spans left out; what acts on no span stays."""
    cases = {}
    for label, loaded in arrangements(pattern).items():
        without = {name for k, span in enumerate(pattern.spans) if k not in loaded for name in span}
        loads = tuple(load for load in case.loads if getattr(load, "member", None) not in without)
        cases[label] = LoadCase(f"{case.name} ({label})", loads, arranged=case.name)
    return cases


# --- combinations


class _Combinations:
    """Reads [combinations] as stated."""

    def __init__(self, check: Checker, cases: Mapping[str, LoadCase], states: Collection[str]) -> None:
        self.check, self.cases, self.states = check, cases, states
        self.names: Collection[str] = ()

    def read(self, value: object) -> list[Combination]:
        table = self.check.table(value, ("combinations",), "[combinations]")
        self.names = () if table is None else table
        return [] if table is None else [self._combination(name, entry) for name, entry in table.items()]

    def _combination(self, name: str, value: object) -> Combination:
        path: Path = ("combinations", name)
        self.check.usable_name(name, path, "combination")
        if name in self.cases:
            self.check.note(path, "a load case has this name too", "give the combination a name of its own")
        table = self.check.table(value, path, "{ dead = 1.35 }")
        if table is None:
            return Combination(name, {})
        stated = {key: factor for key, factor in table.items() if key in self.cases}
        if not table.keys() - {*EXTRA_KEYS}:
            self.check.note(path, "combines nothing", "give factors by load case, such as { dead = 1.35 }")
        self._not_cases(table.keys() - stated.keys() - {*EXTRA_KEYS}, path)
        factors = {key: self.check.number(v, A_NUMBER, (*path, key)) for key, v in stated.items()}
        return Combination(name, factors, self._state(table, path), self._order(table, path), self._lean(table, path))

    def _not_cases(self, others: Collection[str], path: Path) -> None:
        """Notes every key of a combination that means nothing there."""
        for key in sorted(others):
            if key in self.names:
                self.check.note((*path, key), "is a combination, not a load case", "combine load cases only")
            else:
                near = self.check.near(key, [*self.cases, *EXTRA_KEYS])
                self.check.note((*path, key), f"there is no load case {shown(key)}", near)

    def _state(self, table: Table, path: Path) -> str:
        if "stiffness" not in table:
            return ""
        return self.check.name(table["stiffness"], self.states, "state of stiffness", (*path, "stiffness"))

    def _order(self, table: Table, path: Path) -> Literal[1, 2] | None:
        if "order" not in table:
            return None
        fault = order_fault(table["order"])
        if fault:
            self.check.note((*path, "order"), fault, "give order = 1 or order = 2")
        return 2 if table["order"] == 2 else 1

    def _lean(self, table: Table, path: Path) -> float:
        return self.check.share(table["lean"], (*path, "lean")) if "lean" in table else 0.0


def _in(group: Sequence[str], combination: Combination) -> list[str]:
    """Cases of an either-or group that the combination uses."""
    return [case for case in group if combination.factors.get(case)]


def _alternatives(
    one: Combination, exclusive: Sequence[Sequence[str]], arranged: Mapping[str, list[Arrangement]],
    patterns: Mapping[str, Pattern],
) -> Iterator[Combination]:  # fmt: skip
    """The combinations that a stated one stands for: one for each choice among cases that exclude each other, and for
    each arrangement of its patterns; itself where nothing is to choose."""
    groups = [used for group in exclusive if len(used := _in(group, one)) > 1]
    for picks in itertools.product(*groups):
        chosen = tuple(dict.fromkeys(picks))
        if any(len({*group} & {*chosen}) > 1 for group in groups):
            continue  # a case of two groups: what one of them leaves out another may not bring back
        without = {case for group in groups for case in group} - {*chosen}
        factors = {case: factor for case, factor in one.factors.items() if case not in without}
        loaded = [_choices(case, further, patterns) for case, further in arranged.items() if factors.get(case)]
        for picked in itertools.product(*loaded):
            label = ", ".join([*chosen, *(f"{a.of} {a.label}" for a in picked if a.label)])
            swapped = {a.of: a.case for a in picked}
            kept = {swapped.get(case, case): factor for case, factor in factors.items()}
            yield replace(one, name=f"{one.name} ({label})", factors=kept, stated=one.name) if label else one


def _choices(case: str, further: list[Arrangement], patterns: Mapping[str, Pattern]) -> list[Arrangement]:
    """The arrangements of a case that are to be combined, the case as stated among them where "all" is asked for."""
    return [Arrangement("", case, case), *further] if "all" in patterns[case].arrangements else further


def _exclusive(check: Checker, data: Table, cases: Collection[str]) -> tuple[tuple[str, ...], ...]:
    """Groups of cases of which never two act together, stated at the top of the file or in [loads]."""
    loads = data.get("loads")
    inner = loads.get("exclusive") if isinstance(loads, dict) else None
    groups: list[tuple[str, ...]] = []
    for path, value in ((("exclusive",), data.get("exclusive")), (("loads", "exclusive"), inner)):
        if value is None or (path[0] == "loads" and isinstance(value, dict)):
            continue
        if not isinstance(value, list) or not all(isinstance(group, list) for group in value):
            check.note(path, f"{shown(value)} is not a list of groups", 'give [["wind_left", "wind_right"]], say')
            continue
        for k, group in enumerate(value):
            names = [check.name(name, cases, "load case", (*path, k, n)) for n, name in enumerate(group)]
            if len(set(names)) < 2 and all(names):
                check.note((*path, k), "a group needs two load cases at least", "name those that exclude each other")
            groups.append(tuple(name for name in names if name))
    return tuple(groups)


# --- envelopes


def _envelopes(
    check: Checker, value: object, cases: Mapping[str, LoadCase], combinations: Mapping[str, Combination]
) -> dict[str, Envelope]:
    table = check.table(value, ("envelopes",), '[envelopes] with uls = ["ultimate*"]')
    found = {}
    for name, entry in ({} if table is None else table).items():
        path: Path = ("envelopes", name)
        check.usable_name(name, path, "envelope")
        if name in cases or name in combinations:
            check.note(path, "a load case or combination has this name too", "give the envelope a name of its own")
        patterns = entry if isinstance(entry, list) else [entry]
        names: dict[str, None] = {}
        for k, text in enumerate(patterns):
            names |= dict.fromkeys(_matching(check, text, (*path, k), cases, combinations))
        if not patterns:
            check.note(path, "the envelope is of nothing", 'give names or parts of names, such as ["ultimate*"]')
        found[name] = Envelope(name, tuple(names))
    return found


def _matching(
    check: Checker, text: object, path: Path, cases: Mapping[str, LoadCase], combinations: Mapping[str, Combination]
) -> list[str]:
    """Cases and combinations whose name, or the name they were stated by, fits; * stands for anything."""
    if not isinstance(text, str):
        check.note(path, f"{shown(text)} is not a name", 'give names or parts of names, such as "ultimate*"')
        return []
    by_name = {name: case.arranged or name for name, case in cases.items()}
    by_name |= {name: combination.stated or name for name, combination in combinations.items()}
    found = [n for n, stated in by_name.items() if fnmatch.fnmatchcase(n, text) or fnmatch.fnmatchcase(stated, text)]
    literal = [n for n, stated in by_name.items() if text in (n, stated)]
    if not found and not literal:
        near = check.near(text, list(dict.fromkeys(by_name.values())))
        check.note(path, f"no load case or combination is called {shown(text)}", near)
    return found or literal
