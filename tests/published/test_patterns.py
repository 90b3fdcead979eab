"""Load patterns on continuous beams of equal spans against published values, arrangement by arrangement and as envelopes.

Sources: four spans, 1 and 3 loaded: piping-designer.com, frame design formulas, sheet 2408 (the figures of AISC Manual
Table 3-22c; two decimal-point misprints there read as meant); two spans, one loaded: AISC Manual Table 3-23 (from
memory); the middle one of three spans: the three-moment equation, mathalino.com problem 822 after Singer and Pytel,
with alpha = beta = 1; all spans loaded: T. G. Hicks, Civil Engineering Formulas, 2nd ed., Table 2.1, p. 50.
"""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest

from crosscheck.answer import MOMENT
from crosscheck.check import Opinions, ask
from crosscheck.compare.envelopes import EnvelopeAnswer, envelope, envelope_spans
from crosscheck.frame.reader import read_frame_text

OWN = ("slope-deflection", "moment-distribution")


@cache
def beam(spans: int) -> Opinions:
    """Equal spans of 1 with a load of 1 in every arrangement; A, B, C ... from the left."""
    joints = "ABCDEF"[: spans + 1]
    members = [f"{a}-{b}" for a, b in zip(joints, joints[1:], strict=False)]
    text = "\n".join([
        'units = "kN m"', "[materials.m]", "E = 1", "[sections.s]", "I = 1", "[joints]",
        *(f"{name} = [{k}, 0]" for k, name in enumerate(joints)), "[members]",
        *(f'"{m}" = {{ section = "s", material = "m" }}' for m in members), "[supports]", 'A = "pinned"',
        *(f'{name} = "roller"' for name in joints[1:]), "[loads.live]",
        f'apply = [{{ members = {members}, uniform = 1, direction = "down" }}]'.replace("'", '"'),
        "[patterns.live]", f"spans = {[[m] for m in members]}".replace("'", '"'),
        "[combinations]", "worst = { live = 1.0 }", "[envelopes]", 'all = ["worst*"]', "[analysis]", 'axial = "rigid"', "",
    ])  # fmt: skip
    found = ask(read_frame_text(text))
    assert found.verdict == "agree"
    return found


def hogging(spans: int, opinion: str, case: str) -> list[float]:
    """Moment over each inner support, tension on top positive, in wL2."""
    ends = beam(spans).answers[opinion].cases[case].ends
    return [float(ends[k, 0, MOMENT]) * -1 for k in range(1, spans)]


@pytest.mark.parametrize("opinion", OWN)
def test_four_spans_the_first_and_the_third_loaded(opinion: str) -> None:
    moments = np.array(hogging(4, opinion, "live (odd spans)"))
    assert np.abs(np.abs(moments) - [0.0536, 0.0357, 0.0536]).max() <= 0.5e-4
    case = beam(4).answers[opinion].cases["live (odd spans)"]
    assert np.abs(case.reactions[:, 1] - [0.446, 0.572, 0.464, 0.572, -0.054]).max() <= 1e-3
    spans = envelope_spans(beam(4).frame, beam(4).answers[opinion], ["live (odd spans)"])
    peaks = [float(spans.values.greatest[spans.at.of(m), MOMENT].max()) for m in (0, 2)]
    assert np.abs(np.array(peaks) - [0.0996, 0.0805]).max() <= 0.5e-4


@pytest.mark.parametrize("opinion", OWN)
def test_two_spans_one_loaded(opinion: str) -> None:
    case = beam(2).answers[opinion].cases["live (odd spans)"]
    assert case.reactions[:, 1] == pytest.approx([7 / 16, 5 / 8, -1 / 16], abs=1e-12)
    assert abs(hogging(2, opinion, "live (odd spans)")[0]) == pytest.approx(1 / 16, abs=1e-12)


@pytest.mark.parametrize("opinion", OWN)
def test_three_spans_the_middle_one_loaded(opinion: str) -> None:
    """M = (w L2/4) 3 / (4 x 2 x 2 - 1) = 1/20 over both inner supports."""
    assert np.abs(hogging(3, opinion, "live (even spans)")) == pytest.approx([0.05, 0.05], abs=1e-12)


ALL_LOADED = {2: [1 / 8], 3: [1 / 10, 1 / 10], 4: [3 / 28, 2 / 28, 3 / 28], 5: [4 / 38, 3 / 38, 3 / 38, 4 / 38]}
"""Hicks, Table 2.1: support moments in wL2."""


@pytest.mark.parametrize("opinion", OWN)
@pytest.mark.parametrize("spans", ALL_LOADED)
def test_all_spans_loaded_is_the_case_as_stated(opinion: str, spans: int) -> None:
    assert np.abs(hogging(spans, opinion, "live")) == pytest.approx(ALL_LOADED[spans], abs=1e-12)


@pytest.mark.parametrize("opinion", OWN)
def test_the_envelope_takes_each_extreme_from_the_arrangement_that_governs(opinion: str) -> None:
    """Three equal spans: the end span's moment is greatest with the odd spans loaded, the middle span's with the even
    ones, a support's with the two spans beside it (unit influence coefficients of the three-moment equation: 1/20 from
    the middle, 4/60 from the near and -1/60 from the far span, so 7/60 over B with spans 1 and 2 loaded)."""
    found = envelope(beam(3).frame, beam(3).answers[opinion], "all")
    assert isinstance(found, EnvelopeAnswer)
    over_b = abs(float(found.ends.greatest[0, 1, MOMENT]))
    by = found.names[int(found.ends.greatest_by[0, 1, MOMENT])]
    assert over_b == pytest.approx(7 / 60, abs=1e-12) and by == "worst (live spans 1+2)"
    spans = envelope_spans(beam(3).frame, beam(3).answers[opinion], found.names)
    for member, who in ((0, "worst (live odd spans)"), (1, "worst (live even spans)"), (2, "worst (live odd spans)")):
        own = spans.at.of(member)
        k = int(spans.values.greatest[own, MOMENT].argmax())
        assert found.names[int(spans.values.greatest_by[own, MOMENT][k])] == who
    # End span, odd spans loaded: R = 1/2 - 1/20 = 0.45 and M = R2/2 = 0.10125 (0.101 in the usual tables).
    assert float(spans.values.greatest[spans.at.of(0), MOMENT].max()) == pytest.approx(0.10125, abs=1e-12)
