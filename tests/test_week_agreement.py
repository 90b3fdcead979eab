"""200 random frames that together use every row of the checking week's grammar: both of our own opinions speak for every
case and combination and agree to 1e-9 of scale."""

from __future__ import annotations

from collections import Counter

import pytest

from crosscheck.check import ask
from tests.agreement import apart
from tests.week_frames import week_features, week_frame

FRAMES, BLOCK = 200, 20
AGREES = 1e-9
FEWEST = 10
"""Frames that must use each feature, of the 200."""
OWN = ("slope-deflection", "moment-distribution")


@pytest.mark.parametrize("first", range(0, FRAMES, BLOCK))
def test_both_opinions_speak_and_agree(first: int) -> None:
    for seed in range(first, first + BLOCK):
        frame = week_frame(seed)
        opinions = ask(frame)
        assert not {name: silent.why for name, silent in opinions.silent.items() if name in OWN}, seed
        one, other = (opinions.answers[name] for name in OWN)
        assert not one.silent and not other.silent, (seed, one.silent, other.silent)
        worst, where = apart(frame, one, other)
        assert worst <= AGREES, (seed, worst, where)
        assert all(judged.verdict == "agree" for judged in opinions.judgements.values()), seed


def test_the_frames_use_every_row_of_the_grammar() -> None:
    used = Counter(feature for seed in range(FRAMES) for feature in week_features(week_frame(seed)))
    rows = {
        "stepped", "tapered", "state of stiffness", "lean", "lean in a case", "pattern", "either-or", "envelope", "tie",
        "one member rigid", "one-way member", "one-way support",
    }  # fmt: skip
    assert rows == set(used) and min(used.values()) >= FEWEST, used
