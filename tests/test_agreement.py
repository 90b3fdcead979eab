"""500 random frames that together use every row of the grammar: the opinions agree, and each speaks where it must."""

from __future__ import annotations

from collections import Counter

import numpy as np
import pytest

from crosscheck.answer import Answer
from crosscheck.compare.opinions import Comparison
from tests.agreement import apart, hear, must_speak
from tests.random_frames import FEATURES, features_of, random_frame, random_frame_text
from tests.truth import Truth

SEEDS = 500
BLOCK = 25
OWN = 1e-9
LIBRARY = 1e-5
EVERY = 10
"""Every so many frames are also held to the tests' own solver, which is slow."""

ROWS = {
    "axial elastic", "axial rigid", "axial by default", "shear elastic", "shear rigid", "inclined members",
    "hinge from", "hinge to", "hinge both", "spring_from", "spring_to", "rigid_from", "rigid_to",
    "zone and hinge at one end", "support xyr held", "support xy held", "support y held", "support spring x",
    "support spring y", "support spring rotation", "turned support", "turned support with spring", "JointForce",
    "JointForce at an angle", "JointCouple", "Settlement", "settlement down", "PointForce", "PointForce at an angle",
    "PointForce on a zone", "PointForce at a hinged end", "PointCouple", "PointCouple on a zone",
    "PointCouple at a hinged end", "Spread", "Spread at an angle", "uniform", "trapezoidal", "partial", "projection",
    "per length stated", "across", "along", "mean temperature", "temperature difference", "Misfit", "SelfWeight",
    "several cases", "combinations", "negative factors", "expected", "loads on several members",
    "loads on several joints", "percent distances", "unit strings", "members named", "density by mass",
    "density by weight", "nu", "G", "tolerance", "units kN m", "units N mm", "units N m", "units kip ft",
    "units kip in", "units lbf in", "loose joint", "case without load",
}  # fmt: skip
"""What the 500 frames must use between them, by features_of's names."""


@pytest.mark.parametrize("first", range(0, SEEDS, BLOCK))
def test_opinions_agree(first: int) -> None:
    """Both our own opinions speak for every frame and agree to 1e-9 of scale; the library to 1e-5 where it speaks."""
    wrong = []
    for seed in range(first, first + BLOCK):
        heard = hear(seed)
        one, other = heard.slope_deflection, heard.moment_distribution
        if not isinstance(one, Answer) or not isinstance(other, Answer):
            wrong.append((seed, f"silent: {one if not isinstance(one, Answer) else other}"))
            continue
        share, where = apart(heard.frame, one, other)
        if share > OWN:
            wrong.append((seed, f"{share:.1e} {where}"))
        if isinstance(heard.library, Answer):
            share, where = apart(heard.frame, one, heard.library, partial=True)
            if share > LIBRARY:
                wrong.append((seed, f"library {share:.1e} {where}"))
            if must_speak(heard) and heard.library.silent:
                wrong.append((seed, f"the library is silent: {dict(heard.library.silent)}"))
        elif must_speak(heard):
            wrong.append((seed, f"the library is silent: {heard.library.why}"))
    assert wrong == []


@pytest.mark.parametrize("first", range(0, SEEDS, 5 * BLOCK))
def test_opinions_are_right(first: int) -> None:
    """Every tenth frame against the tests' own solver, which shares no mechanics with either; and what `opinions`
    itself concludes of it, extremes included, is that they agree."""
    wrong = []
    for seed in range(first, first + 5 * BLOCK, EVERY):
        heard, truth = hear(seed), Truth(random_frame(seed))
        for answer in (heard.slope_deflection, heard.moment_distribution):
            assert isinstance(answer, Answer)
            share, where = apart(heard.frame, answer, truth)
            if share > OWN:
                wrong.append((seed, answer.opinion, f"{share:.1e} {where}"))
        comparison = Comparison(heard.frame, heard.speaking)
        judged = [comparison.judge(name) for name in heard.frame.names]
        wrong += [(seed, j.case, str(j.differences[:1])) for j in judged if j.verdict != "agree"]
    assert wrong == []


def test_the_frames_use_every_row_of_the_grammar() -> None:
    """Each feature is there in several frames, and absent from several: they are drawn independently."""
    seen = Counter[str]()
    for seed in range(SEEDS):
        seen.update(features_of(random_frame(seed), random_frame_text(seed)))
    assert {row: seen[row] for row in ROWS if not 3 <= seen[row] <= SEEDS - 3} == {}
    assert all(0.0 < chance < 1.0 for chance in FEATURES.values())


def test_the_measure_can_fail() -> None:
    """A billionth of scale too much in any one value is seen, and so is a value that one of two leaves out."""
    frame = random_frame(3)
    one, other = Truth(frame), Truth(frame)
    assert apart(frame, one, other) == (0.0, "")
    for changed in (other.cases[frame.names[0]].ends, other.cases[frame.names[0]].joints):
        kept = changed.copy()
        changed[-1, ..., -1] += 1e-6 * max(1e-30, float(np.nanmax(np.abs(changed[..., -1]))))
        assert apart(frame, one, other)[0] > OWN
        changed[...] = kept
        changed[-1, ..., -1] = np.nan
        assert apart(frame, one, other)[0] == np.inf
        changed[...] = kept
