"""`inspect` on sound frames and on the slips made of them: found, at the right place, in the right grade."""

from __future__ import annotations

from collections import Counter
from pathlib import Path

import pytest

from crosscheck import check
from crosscheck.review.inspect import CHECKS, explanations, inspect, subject_of
from crosscheck.suite.beside import frames_below
from tests.slips import SLIPS, SOUND, Slip, Slipped, every_slip, sound

CASES = list(frames_below([Path("cases")]))
CORPUS = list(every_slip())


@pytest.mark.parametrize(("name", "kind", "made"), CORPUS, ids=[f"{n}-{k.kind.replace(' ', '_')}" for n, k, _ in CORPUS])
def test_slip_is_found(name: str, kind: Slip, made: Slipped) -> None:
    found = inspect(subject_of(made.frame, stability=kind.check == "second_order"))
    mine = [f for f in found if f.check == kind.check]
    assert any(f.grade == kind.grade and made.where in f.where for f in mine), (made.where, mine or found)


def test_corpus_is_whole() -> None:
    """At least 40 kinds on ten frames, and every kind made of at least one; every check that can be tripped is."""
    assert len(SOUND) == 10
    assert len(SLIPS) >= 40
    times = Counter(kind.kind for _, kind, _ in CORPUS)
    assert {kind.kind for kind in SLIPS} == set(times)
    assert {kind.check for kind in SLIPS} <= {c.__name__ for c in CHECKS}


@pytest.mark.parametrize("name", SOUND)
def test_sound_frame_draws_nothing_serious(name: str) -> None:
    found = inspect(subject_of(sound(name)))
    assert [f for f in found if f.grade == "serious"] == []
    assert len([f for f in found if f.grade == "check"]) <= 1


@pytest.mark.parametrize("path", CASES, ids=[p.stem for p in CASES])
def test_demonstration_frame_draws_nothing_serious(path: Path) -> None:
    found = inspect(subject_of(check.read(path)))
    assert [f for f in found if f.grade == "serious"] == []
    assert len([f for f in found if f.grade == "check"]) <= 3


def test_every_check_explains_itself() -> None:
    for name, told in explanations().items():
        assert told.asks.endswith("?"), name
        assert [label for label, _ in told.parts] == ["Why", "Look at", "Example", "Source"], name
        assert all(text for _, text in told.parts), name
