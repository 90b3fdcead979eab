"""Do load cases come together in combinations that make sense?"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from crosscheck.frame.model import Combination, Floats, Frame
from crosscheck.review.finding import Finding, Subject, listed


def unused_cases(subject: Subject) -> Iterator[Finding]:
    """Is there a case that no combination uses?

    Why: it does not reach the design.
    Look at: the combinations; a case for service alone may be meant so.
    Example: snow was added after the combinations were written.
    Source: common practice.
    """
    if not subject.frame.combinations:
        return
    used = {case for c in subject.frame.combinations.values() for case, factor in c.factors.items() if factor}
    used |= {subject.frame.cases[case].arranged for case in used}
    left = [name for name, case in subject.frame.cases.items() if name not in used and not case.arranged]
    if left:
        yield Finding("check", tuple(left), f"no combination uses load case{'s' if len(left) > 1 else ''} {listed(left)}")


def twice(subject: Subject) -> Iterator[Finding]:
    """Does a combination hold the same loads twice under two names, or a case with factor zero?

    Why: the first counts loads twice, the second not at all.
    Look at: the combination, and both cases.
    Example: dead = 1.35, "dead load" = 1.35, one copied from the other.
    Source: common practice.
    """
    prints = {name: _fingerprint(subject, name) for name in subject.frame.cases}
    same: dict[tuple[str, str], list[str]] = {}
    for combination in subject.frame.combinations.values():
        names = [n for n, f in combination.factors.items() if f]
        for name in set(combination.factors) - set(names):
            yield Finding("check", (combination.name, name), f"combination {combination.name} has {name} with factor zero")
        for k, a in enumerate(names):
            for b in names[k + 1 :]:
                if prints[a].any() and prints[a].shape == prints[b].shape and np.allclose(prints[a], prints[b], rtol=1e-9):
                    same.setdefault((a, b), []).append(combination.name)
    for (a, b), combinations in same.items():
        says = f"combination {listed(combinations)} adds {a} and {b}, which hold the same loads: counted twice?"
        yield Finding("check", (*combinations, a, b), says)


def _fingerprint(subject: Subject, case: str) -> Floats:
    t = subject.tables[case]
    parts = [t.joint, t.settlement, t.point_member, t.point_at, t.point_along, t.point_across, t.point_couple,
             t.line_member, t.line_start, t.line_end, t.line_along, t.line_across, t.mean, t.difference,
             t.misfit]  # fmt: skip
    return np.concatenate([np.asarray(p, dtype=float).ravel() for p in parts])


def opposing_winds(subject: Subject) -> Iterator[Finding]:
    """Does a combination add two cases that push opposite ways?

    Why: winds from left and right do not blow together; added, they take each other away.
    Look at: the combination; earth pressure against a jack, say, may be meant.
    Example: dead = 1.35, wind_left = 1.5, wind_right = 1.5.
    Source: common practice (pushes within a factor of three of each other).
    """
    total = {name: subject.total(name) for name in subject.frame.cases}
    found: dict[tuple[str, str], list[str]] = {}
    for combination in subject.frame.combinations.values():
        names = [n for n, f in combination.factors.items() if f and abs(total[n][0]) > abs(total[n][1])]
        for k, a in enumerate(names):
            for b in names[k + 1 :]:
                push = combination.factors[a] * total[a][0], combination.factors[b] * total[b][0]
                if push[0] * push[1] < 0 and min(map(abs, push)) > 0.3 * max(map(abs, push)):
                    found.setdefault((a, b), []).append(combination.name)
    for (a, b), combinations in found.items():
        says = f"combination {listed(combinations)} adds {a} and {b}, which push opposite ways"
        yield Finding("check", (*combinations, a, b), says)


def uplift_combination(subject: Subject) -> Iterator[Finding]:
    """Is there a combination of the least vertical load with what lifts or overturns?

    Why: uplift and sliding are decided there, and it is the combination most often left out.
    Look at: the combinations; factors up to 1.0 on what weighs, together with the case named.
    Example: 1.35 dead + 1.5 wind, and no 1.0 dead + 1.5 wind.
    Source: common practice; a note where the case only pushes sideways.
    """
    frame = subject.frame
    if not frame.combinations:
        return
    total = {name: subject.total(name) for name, case in frame.cases.items() if not case.arranged}
    used = [_as_stated(frame, c) for c in frame.combinations.values()]
    weight = [n for n, t in total.items() if t[1] < 0 and abs(t[1]) > abs(t[0])]
    missing: dict[str, list[str]] = {"check": [], "note": []}
    for name, t in total.items():
        if not t[:2].any() or not weight or not (t[1] > 1e-9 * abs(t[0]) or abs(t[0]) > abs(t[1])):
            continue
        least = any(factors.get(name) and all(factors.get(w, 0.0) <= 1.0 for w in weight) for factors in used)
        if not least:
            missing["check" if t[1] > 0.05 * np.abs(t[:2]).max() else "note"].append(name)
    for grade, names in missing.items():
        if names:
            least_load = f"the least vertical load (factors up to 1.0 on {listed(weight)})"
            says = f"no combination has {listed(names)} with {least_load}"
            yield Finding("check" if grade == "check" else "note", tuple(names), says)


def _as_stated(frame: Frame, combination: Combination) -> dict[str, float]:
    """Its factors, those of arrangements as those of the case that they are arrangements of."""
    return {frame.cases[case].arranged or case: factor for case, factor in combination.factors.items()}


def light_factors(subject: Subject) -> Iterator[Finding]:
    """Is a factor of a combination out of the range that factors have?

    Why: a decimal point has probably slipped.
    Look at: that combination.
    Example: dead = 13.5.
    Source: common practice (0 to 2; a negative factor reverses the case).
    """
    for combination in subject.frame.combinations.values():
        for name, factor in combination.factors.items():
            if factor > 2.0:
                says = f"combination {combination.name} has {name} with factor {factor:g}; usual are 0 to 2"
                yield Finding("check", (combination.name, name), says)
