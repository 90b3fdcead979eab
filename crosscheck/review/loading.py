"""Do the loads add up, act where and how loads of their kind act, and come together in combinations that make sense?"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from crosscheck.frame.model import PointForce, Spread
from crosscheck.review.finding import Finding, Subject, listed

EXPECTED = 0.01
"""Share by which a case's total may differ from what the take-down says."""


def empty_cases(subject: Subject) -> Iterator[Finding]:
    """Does a case hold no load?"""
    for name, case in subject.frame.cases.items():
        if not case.loads:
            yield Finding("check", (name,), f"load case {name} holds no load")
    if not subject.frame.cases:
        yield Finding("check", (), "the frame has no load case")


def totals(subject: Subject) -> Iterator[Finding]:
    """What does each case add up to, and where does its resultant act? Compare it with the take-down."""
    f, length = subject.frame.units.force, subject.frame.units.length
    for name in subject.frame.cases:
        fx, fy, moment = subject.total(name)
        size = max(abs(fx), abs(fy))
        if size == 0:
            continue
        words = [f"{abs(fx):.4g} {f} to the {'right' if fx > 0 else 'left'}"] if abs(fx) > 1e-9 * size else []
        words += [f"{abs(fy):.4g} {f} {'up' if fy > 0 else 'down'}"] if abs(fy) > 1e-9 * size else []
        if abs(fy) >= abs(fx):
            line = f"through x = {-moment / fy:.4g} {length} at y = 0"
        else:
            line = f"through y = {moment / fx:.4g} {length} at x = 0"
        yield Finding("note", (name,), f"case {name} adds up to {' and '.join(words)}, {line}")


def expected(subject: Subject) -> Iterator[Finding]:
    """Does each case add up to what the take-down says (`expected`)? If not, a load is missing, doubled or too many."""
    unit = {"right": (0, 1), "left": (0, -1), "up": (1, 1), "down": (1, -1)}
    for name, case in subject.frame.cases.items():
        total = subject.total(name)
        for word, value in case.expected.items():
            axis, sign = unit[word]
            have = sign * float(total[axis])
            if abs(have - value) > EXPECTED * max(abs(value), abs(have)):
                says = f"case {name} adds up to {have:.4g} {subject.frame.units.force} {word}; {value:.4g} is expected"
                yield Finding("serious", (name,), says)


def odd_directions(subject: Subject) -> Iterator[Finding]:
    """Does one load act upward or sideways alone among many of its kind? A sign or a direction may have slipped."""
    for name, case in subject.frame.cases.items():
        for kind in (Spread, PointForce):
            loads = [load for load in case.loads if isinstance(load, kind)]
            sense = [_sense(subject, load) for load in loads]
            for load, own in zip(loads, sense, strict=True):
                others = [s for s in sense if s != own]
                if len(others) >= 3 and len(set(others)) == 1 and sense.count(own) == 1:
                    says = (
                        f"load {name}[{load.entry}] on {load.member} acts {own}, alone among {len(others)} that act "
                        f"{others[0]}: a sign or direction?"
                    )
                    yield Finding("check", (f"{name}[{load.entry}]",), says)


def _sense(subject: Subject, load: Spread | PointForce) -> str:
    from crosscheck.frame.loads import local_components

    t, m = subject.frame.member_table, subject.frame.member_index[load.member]
    cos, sin = float(t.cos[m]), float(t.sin[m])
    along, across = local_components(load.direction, cos, sin)
    size = load.force if isinstance(load, PointForce) else load.first + load.last
    x, y = (along * cos - across * sin) * size, (along * sin + across * cos) * size
    if abs(y) >= abs(x):
        return "up" if y > 0 else "down"
    return "to the right" if x > 0 else "to the left"


def unloaded_span(subject: Subject) -> Iterator[Finding]:
    """Is one span of a run left unloaded while its neighbours carry the same load? Pattern loading has cases of its own;
    in a case of dead load it is a slip."""
    for name, table in subject.tables.items():
        loaded = set(table.line_member.tolist())
        for run in runs(subject):
            have = [m for m in run if m in loaded]
            if len(run) >= 3 and len(have) == len(run) - 1 and len(have) >= 2:
                bare = next(m for m in run if m not in loaded)
                member = list(subject.frame.members)[bare]
                says = f"in case {name} the span {member} carries no load while the other {len(have)} of its run do"
                yield Finding("check", (member,), says)


def runs(subject: Subject) -> list[list[int]]:
    """Runs of level members that follow one another in a line."""
    frame, t = subject.frame, subject.frame.member_table
    level = [k for k in range(len(frame.members)) if abs(t.sin[k]) < 0.35]
    start: dict[int, list[int]] = {}
    for k in level:
        for end in t.ends[k]:
            start.setdefault(int(end), []).append(k)
    seen: set[int] = set()
    out = []
    for k in level:
        if k in seen:
            continue
        run, waiting = [], [k]
        while waiting:
            m = waiting.pop()
            if m in seen:
                continue
            seen.add(m)
            run.append(m)
            for end in t.ends[m]:
                turn = {o: abs(t.sin[o] * t.cos[m] - t.cos[o] * t.sin[m]) for o in start[int(end)]}
                waiting += [o for o, sine in turn.items() if o not in seen and sine < 1e-6]
        out.append(sorted(run))
    return out


def unused_cases(subject: Subject) -> Iterator[Finding]:
    """Is there a case that no combination uses? Then it does not reach the design."""
    if not subject.frame.combinations:
        return
    used = {case for c in subject.frame.combinations.values() for case, factor in c.factors.items() if factor}
    for name in subject.frame.cases:
        if name not in used:
            yield Finding("check", (name,), f"no combination uses load case {name}")


def twice(subject: Subject) -> Iterator[Finding]:
    """Does a combination hold the same loads twice, under two names, or a case with factor zero?"""
    totals = {name: _fingerprint(subject, name) for name in subject.frame.cases}
    for combination in subject.frame.combinations.values():
        names = list(combination.factors)
        for name in names:
            if combination.factors[name] == 0:
                says = f"combination {combination.name} has {name} with factor zero"
                yield Finding("check", (combination.name, name), says)
        for k, a in enumerate(names):
            for b in names[k + 1 :]:
                if totals[a].any() and totals[a].shape == totals[b].shape and np.allclose(totals[a], totals[b], rtol=1e-9):
                    says = f"combination {combination.name} adds {a} and {b}, which hold the same loads: counted twice?"
                    yield Finding("check", (combination.name, a, b), says)


def _fingerprint(subject: Subject, case: str) -> np.ndarray:
    t = subject.tables[case]
    parts = [t.joint.ravel(), t.point_member, t.point_at, t.point_along, t.point_across, t.point_couple, t.line_member,
             t.line_start, t.line_end, t.line_along.ravel(), t.line_across.ravel(), t.mean, t.difference]  # fmt: skip
    return np.concatenate([np.asarray(p, dtype=float).ravel() for p in parts])


def opposing_winds(subject: Subject) -> Iterator[Finding]:
    """Does a combination add two cases that push opposite ways? Winds from left and right do not blow together."""
    side = {name: float(subject.total(name)[0]) for name in subject.frame.cases}
    up = {name: float(subject.total(name)[1]) for name in subject.frame.cases}
    for combination in subject.frame.combinations.values():
        names = [n for n, f in combination.factors.items() if f and abs(side[n]) > abs(up[n])]
        for k, a in enumerate(names):
            for b in names[k + 1 :]:
                push = combination.factors[a] * side[a], combination.factors[b] * side[b]
                if push[0] * push[1] < 0 and min(map(abs, push)) > 0.3 * max(map(abs, push)):
                    says = f"combination {combination.name} adds {a} and {b}, which push opposite ways"
                    yield Finding("check", (combination.name, a, b), says)


def uplift_combination(subject: Subject) -> Iterator[Finding]:
    """Is there a combination with the least vertical load together with what lifts or overturns? Uplift and sliding are
    decided there, and it is the one most often left out."""
    frame = subject.frame
    if not frame.combinations:
        return
    total = {name: subject.total(name) for name in frame.cases}
    weight = [n for n, t in total.items() if t[1] < 0 and abs(t[1]) > abs(t[0])]
    lifting = [n for n, t in total.items() if t[1] > 0 or abs(t[0]) > abs(t[1])]
    for name in lifting:
        if not total[name][:2].any():
            continue
        least = [
            c for c in frame.combinations.values()
            if c.factors.get(name) and all(c.factors.get(w, 0.0) <= 1.0 for w in weight)
        ]  # fmt: skip
        if weight and not least:
            says = f"no combination has {name} with the least vertical load (factors up to 1.0 on {listed(weight)})"
            yield Finding("check", (name,), says)
