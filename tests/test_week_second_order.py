"""Random frames of the checking week in second order: stepped and tapered members, ties, single rigid members, one-way
parts, states of stiffness and leans, each case loaded to between 0.1 and 0.7 of its critical load factor.

Both of our own opinions agree to 1e-8 of scale, or both say that the case finds no balance. Where nothing buckles the
load stands as it is.
"""

from __future__ import annotations

import math
import os
from collections import Counter
from dataclasses import replace
from random import Random

import pytest

from crosscheck.answer import Answer
from crosscheck.check import ask
from crosscheck.frame.model import Combination, Frame
from crosscheck.opinions.slope_deflection import critical_factors
from crosscheck.problems import UnusableInput
from tests.agreement import apart
from tests.week_frames import week_features, week_frame

FRAMES, BLOCK = 200, 20
AGREES = 1e-8
OWN = ("slope-deflection", "moment-distribution")
MOST = 3
"""Cases of one frame: patterns make many that are much alike."""
DEFAULT = (0, 60, 120)
"""First seeds of the blocks that run where CROSSCHECK_WEEK is not "full"."""
FEWEST = 0.7
"""Share of the cases that must find a balance."""


def loaded(seed: int) -> Frame | None:
    """The frame of a seed with one combination a case, in second order, loaded to a share of its critical load; None
    where an axially rigid frame leaves axial forces open that second order needs."""
    r, frame = Random(f"second order {seed}"), week_frame(seed)
    some = [name for name, case in frame.cases.items() if case.loads]
    cases = r.sample(some, min(len(some), MOST))
    state = next(iter(frame.states), "")
    try:
        critical = critical_factors(frame, cases)
    except UnusableInput:
        return None
    combinations = {}
    for case in cases:
        factor = 1.0 if math.isinf(critical[case]) else r.uniform(0.1, 0.7) * critical[case]
        own = state if state and r.random() < 0.5 else ""
        lean = r.choice([0.0, 0.0, 0.005])
        name = f"second {case}"
        # A softer state has a lower critical load: it is loaded to no more than a third of the stated frame's share.
        combinations[name] = Combination(name, {case: factor / 3 if own else factor}, own, 2, lean)
    return replace(frame, combinations=combinations, envelopes={})


@pytest.mark.parametrize("first", range(0, FRAMES, BLOCK) if os.environ.get("CROSSCHECK_WEEK") == "full" else DEFAULT)
def test_both_opinions_agree_in_second_order(first: int) -> None:
    count: Counter[str] = Counter()
    for seed in range(first, first + BLOCK):
        frame = loaded(seed)
        if frame is None:
            count["open"] += 1
            continue
        names = tuple(frame.combinations)
        try:
            opinions = ask(frame, names)
        except UnusableInput:
            count["open"] += 1
            continue
        given = {name: opinions.answers.get(name) for name in OWN}
        told = {name: a.silent if isinstance(a, Answer) else dict.fromkeys(names, "") for name, a in given.items()}
        assert told[OWN[0]].keys() == told[OWN[1]].keys(), (seed, told, sorted(week_features(frame)))
        count["silent"] += len(told[OWN[0]])
        both = [a for a in given.values() if isinstance(a, Answer)]
        if len(both) == 2 and both[0].cases:
            spoken = replace(frame, combinations={n: c for n, c in frame.combinations.items() if n in both[0].cases})
            count["spoken"] += len(spoken.combinations)
            worst, where = apart(replace(spoken, cases=frame.cases), _only(both[0], spoken), _only(both[1], spoken), True)
            assert worst <= AGREES, (seed, worst, where, sorted(week_features(frame)))
    assert count["spoken"] >= FEWEST * (count["spoken"] + count["silent"]), count


def _only(answer: Answer, frame: Frame) -> Answer:
    return replace(answer, cases={name: answer.cases[name] for name in frame.combinations})
