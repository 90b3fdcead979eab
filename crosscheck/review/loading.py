"""Do the loads of each case add up, and act where and how loads of their kind act?"""

from __future__ import annotations

import re
from collections.abc import Iterator

import numpy as np

from crosscheck.frame.loads import local_components
from crosscheck.frame.model import JointForce, PointForce, SelfWeight, Spread
from crosscheck.review.finding import Finding, Subject, listed

EXPECTED = 0.01
"""Share by which a case's total may differ from what the take-down says."""
ODD = 30.0
"""Times the largest of its kind, or a share of the smallest: a load as far out has probably slipped by a unit."""
GRAVITY = re.compile(r"dead|self|weight|perman|live|imposed|snow|floor|roof|cladding|finish|screed", re.IGNORECASE)
"""Words in names of cases that act downward."""
OnMember = Spread | PointForce


def empty_cases(subject: Subject) -> Iterator[Finding]:
    """Does a case hold no load?

    Why: its results are zero and so is what combinations make of it.
    Look at: whether its loads were lost on the way.
    Example: [loads.snow] with an empty list.
    Source: common practice.
    """
    for name, case in subject.frame.cases.items():
        if not case.loads:
            yield Finding("check", (name,), f"load case {name} holds no load")
    if not subject.frame.cases:
        yield Finding("check", (), "the frame has no load case")


def totals(subject: Subject) -> Iterator[Finding]:
    """What does each case add up to, and where does its resultant act?

    Why: the quickest check against the take-down: a lost or doubled load shows in the sum, a misplaced one in the line.
    Look at: the sum of the take-down, and the middle of the loaded width.
    Example: 240 kN down through x = 6.0 m.
    Source: statics.
    """
    f, length = subject.frame.units.force, subject.frame.units.length
    for name, case in subject.frame.cases.items():
        if case.arranged:  # part of what its case adds up to
            continue
        fx, fy, moment = (float(v) for v in subject.total(name))
        size = max(abs(fx), abs(fy))
        if size == 0:
            continue
        words = [f"{_number(abs(fx))} {f} to the {'right' if fx > 0 else 'left'}"] if abs(fx) > 1e-9 * size else []
        words += [f"{_number(abs(fy))} {f} {'up' if fy > 0 else 'down'}"] if abs(fy) > 1e-9 * size else []
        if abs(fy) >= abs(fx):
            line = f"through x = {_number(-moment / fy)} {length} at y = 0"
        else:
            line = f"through y = {_number(moment / fx)} {length} at x = 0"
        yield Finding("note", (name,), f"{name} adds up to {' and '.join(words)}, {line}")


def _number(value: float) -> str:
    """Four digits without an exponent where the size is ordinary."""
    return f"{value:.4g}" if abs(value) < 1e4 or abs(value) >= 1e9 else f"{value:.0f}"


def expected(subject: Subject) -> Iterator[Finding]:
    """Does each case add up to what the take-down says (`expected`)?

    Why: if not, a load is missing, doubled, or in another unit.
    Look at: the loads of that case, beside the take-down.
    Example: expected = { down = "80 kN" } and a sum of 72.4 kN.
    Source: common practice (1%).
    """
    unit = {"right": (0, 1), "left": (0, -1), "up": (1, 1), "down": (1, -1)}
    for name, case in subject.frame.cases.items():
        total = subject.total(name)
        for word, value in case.expected.items():
            axis, sign = unit[word]
            have = sign * float(total[axis])
            if abs(have - value) > EXPECTED * max(abs(value), abs(have)):
                says = f"{name} adds up to {have:.4g} {subject.frame.units.force} {word}; {value:.4g} is expected"
                yield Finding("serious", (name,), says)


def upward_case(subject: Subject) -> Iterator[Finding]:
    """Does a case of weight or of imposed load act upward as a whole?

    Why: a sign has slipped; the results are reversed.
    Look at: direction and sign of its loads: a positive number acts in the named direction.
    Example: uniform = -8.5 with direction = "down".
    Source: common practice (told by the case's name).
    """
    for name in subject.frame.cases:
        fx, fy = subject.total(name)[:2]
        if GRAVITY.search(name) and fy > 1e-9 * max(abs(fx), abs(fy)) and fy > abs(fx):
            says = f"{name} acts upward as a whole ({fy:.4g} {subject.frame.units.force}): a sign?"
            yield Finding("check", (name,), says)


def odd_directions(subject: Subject) -> Iterator[Finding]:
    """Does one load act upward or sideways alone among many of its kind?

    Why: a sign or a direction has probably slipped.
    Look at: that entry.
    Example: four beams loaded down, the fifth "right".
    Source: common practice (three others that act alike, on members that stand or lie alike).
    """
    for name, alike in _kinds(subject):
        sense = [_sense(subject, load) for load in alike]
        for load, own in zip(alike, sense, strict=True):
            others = [s for s in sense if s != own]
            if len(others) >= 3 and len(set(others)) == 1 and sense.count(own) == 1:
                entry, place = f"{name}[{load.entry}]", _place(load)
                says = f"{entry} on {place} acts {own}, alone among {len(others)} of its kind that act {others[0]}: a sign?"
                yield Finding("check", (entry, place), says)


def odd_sizes(subject: Subject) -> Iterator[Finding]:
    """Is one load many times larger or smaller than every other of its kind?

    Why: a unit or a decimal point has probably slipped.
    Look at: that entry.
    Example: uniform = 8500 among others of 8.5.
    Source: common practice (30 times, two others of its kind).
    """
    for name, alike in _kinds(subject):
        size = np.array([_size(load) for load in alike])
        for k, load in enumerate(alike):
            rest = np.delete(size, k)
            rest = rest[rest > 0]
            if len(rest) < 2 or size[k] <= 0 or (size > 0).sum() < 3:
                continue
            if size[k] > ODD * rest.max() or size[k] < rest.min() / ODD:
                entry, place = f"{name}[{load.entry}]", _place(load)
                usual = f"{size[k]:.4g} where others of its kind have {rest.min():.4g} to {rest.max():.4g}"
                yield Finding("check", (entry, place), f"{entry} on {place} is {usual}: a slip of units?")


def _kinds(subject: Subject) -> Iterator[tuple[str, list[OnMember | JointForce]]]:
    """Loads of each case that are of one kind: spread or point loads on members that stand or lie, forces on joints."""
    columns = set(subject.columns)
    for name, case in subject.frame.cases.items():
        for kind in (Spread, PointForce):
            for standing in (True, False):
                on_members = [load for load in case.loads if isinstance(load, kind)]
                yield name, [load for load in on_members if (load.member in columns) == standing]
        yield name, [load for load in case.loads if isinstance(load, JointForce)]


def _place(load: OnMember | JointForce) -> str:
    return load.joint if isinstance(load, JointForce) else load.member


def _size(load: OnMember | JointForce) -> float:
    return max(abs(load.first), abs(load.last)) if isinstance(load, Spread) else abs(load.force)


def _sense(subject: Subject, load: OnMember | JointForce) -> str:
    cos, sin = 1.0, 0.0
    if not isinstance(load, JointForce):
        t, m = subject.frame.member_table, subject.frame.member_index[load.member]
        cos, sin = float(t.cos[m]), float(t.sin[m])
    along, across = local_components(load.direction, cos, sin)
    size = load.first + load.last if isinstance(load, Spread) else load.force
    x, y = (along * cos - across * sin) * size, (along * sin + across * cos) * size
    if abs(y) >= abs(x):
        return "up" if y > 0 else "down"
    return "to the right" if x > 0 else "to the left"


def doubled_loads(subject: Subject) -> Iterator[Finding]:
    """Is one and the same load entered twice in a case?

    Why: it then counts twice.
    Look at: both entries.
    Example: the same uniform load in dead[0] and, through a list of members, in dead[3].
    Source: common practice.
    """
    for name, case in subject.frame.cases.items():
        seen: dict[object, int] = {}
        told: dict[tuple[int, int], list[str]] = {}
        for load in case.loads:
            if isinstance(load, SelfWeight):
                key: object = "self weight"
            else:
                key = (type(load), *(getattr(load, f) for f in load.__dataclass_fields__ if f != "entry"))
            if key in seen and seen[key] != load.entry:
                place = getattr(load, "member", getattr(load, "joint", "the frame"))
                told.setdefault((seen[key], load.entry), []).append(place)
            seen.setdefault(key, load.entry)
        for (one, two), places in told.items():
            says = f"{name}[{one}] and {name}[{two}] are the same load on {listed(places)}: entered twice?"
            yield Finding("check", (f"{name}[{one}]", f"{name}[{two}]", *places), says)


def unloaded_span(subject: Subject) -> Iterator[Finding]:
    """Is one span of a run left unloaded while the others carry load?

    Why: in a case of weight it is a slip; patterns of imposed load have cases of their own.
    Look at: the span named; a case that loads it and leaves out others of the run shows that a pattern is meant, and
      then this is a note.
    Example: four bays of a floor loaded, the third not.
    Source: common practice.
    """
    names = list(subject.frame.members)
    # An arrangement of a stated pattern leaves spans bare on purpose.
    loaded = {name: _loaded(subject, name) for name, case in subject.frame.cases.items() if not case.arranged}
    long = [run for run in runs(subject) if len(run) >= 3]
    for name, here in loaded.items():
        for run in long:
            bare = [m for m in run if m not in here]
            if len(bare) != 1:
                continue
            pattern = any(bare[0] in other and not set(run) <= other for case, other in loaded.items() if case != name)
            says = f"in {name} the span {names[bare[0]]} carries no load while the other {len(run) - 1} of its run do"
            yield Finding("note" if pattern else "check", (names[bare[0]], name), says)


def _loaded(subject: Subject, case: str) -> set[int]:
    """Members that carry loads of their own in a case; self weight, which all have, is left out."""
    on = (load for load in subject.frame.cases[case].loads if isinstance(load, (Spread, PointForce)))
    return {subject.frame.member_index[load.member] for load in on}


def runs(subject: Subject) -> list[list[int]]:
    """Runs of level members that follow one another in a line."""
    t = subject.frame.member_table
    level = [k for k in range(len(subject.frame.members)) if abs(t.sin[k]) < 0.35]
    at: dict[int, list[int]] = {}
    for k in level:
        for end in t.ends[k]:
            at.setdefault(int(end), []).append(k)
    seen: set[int] = set()
    out = []
    for k in level:
        run, waiting = [], [k]
        while waiting:
            m = waiting.pop()
            if m in seen:
                continue
            seen.add(m)
            run.append(m)
            for end in t.ends[m]:
                waiting += [o for o in at[int(end)] if abs(t.sin[o] * t.cos[m] - t.cos[o] * t.sin[m]) < 1e-6]
        if run:
            out.append(sorted(run))
    return out
