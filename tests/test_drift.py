"""A braced bay whose rods only pull: under weight both rods are slack, and nobody can say where the bay stands.

Worked by hand: statics of a pin-jointed bay and the shortening P L / EA of its columns.
"""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest

from crosscheck.check import Opinions, ask
from crosscheck.frame.reader import read_frame_text

BAY = """
units = "kN m"
[materials.steel]
E = "200 GPa"
[sections]
post = { I = "2000 cm^4", A = "40 cm^2" }
rod = { I = "1 cm^4", A = "4 cm^2" }
[joints]
A = [0, 0]
B = [0, 4]
C = [3, 4]
D = [3, 0]
[members]
"A-B" = { section = "post", material = "steel" }
"B-C" = { section = "post", material = "steel", hinge = "both" }
"D-C" = { section = "post", material = "steel" }
r1 = { from = "A", to = "C", section = "rod", material = "steel", hinge = "both", only = "tension" }
r2 = { from = "D", to = "B", section = "rod", material = "steel", hinge = "both", only = "tension" }
[supports]
A = "pinned"
D = "pinned"
[loads.weight]
apply = [{ member = "B-C", uniform = 20, direction = "down" }]
[loads.wind]
apply = [{ joint = "B", force = 9, direction = "right" }]
[loads.both]
apply = [{ member = "B-C", uniform = 20, direction = "down" }, { joint = "B", force = 9, direction = "right" }]
[loads.none]
apply = []
"""
OWN = ("slope-deflection", "moment-distribution")


@cache
def bay() -> Opinions:
    return ask(read_frame_text(BAY))


def test_the_opinions_agree_in_every_case() -> None:
    assert {name: judged.verdict for name, judged in bay().judgements.items()} == dict.fromkeys(bay().names, "agree")


@pytest.mark.parametrize("opinion", OWN)
def test_under_weight_the_sway_is_null_and_the_forces_are_not(opinion: str) -> None:
    case = bay().answers[opinion].cases["weight"]
    assert case.ends[0, 0, 0] == pytest.approx(-30) and np.abs(case.ends[3:]).max() < 1e-9
    assert case.joints[[1, 2], 1] == pytest.approx(-30 * 4 / (200e6 * 40e-4))
    assert np.isnan(case.joints[[1, 2], 0]).all() and np.isnan(case.joints[:, 2]).all()
    across = bay().answers[opinion].spans.along("weight", np.array([0, 1]), np.array([2.0, 1.5]), np.array([1, 1]))
    assert np.isnan(across[:, 3]).all() and np.isfinite(across[:, :3]).all()


@pytest.mark.parametrize("opinion", OWN)
def test_wind_draws_one_rod_and_everything_is_determined(opinion: str) -> None:
    """The rod from A to C takes 9 x 5/3 = 15 kN; it alone must hold the bay, which it pulls down at C by 15 x 4/5."""
    case = bay().answers[opinion].cases["wind"]
    assert case.ends[3, 0, 0] == pytest.approx(15) and case.ends[4, 0, 0] == 0.0
    assert case.ends[2, 0, 0] == pytest.approx(-12) and np.isfinite(case.joints).all()
    # Rod 15 x 5 / 80,000 longer, post 12 x 4 / 800,000 shorter: C moves (e + (4/5) s) 5/3 to the right.
    assert case.joints[2, 0] == pytest.approx((15 * 5 / 80e3 + 0.8 * 12 * 4 / 800e3) * 5 / 3)
    assert np.isfinite(bay().answers[opinion].cases["both"].joints).all()


@pytest.mark.parametrize("opinion", OWN)
def test_without_load_nothing_moves(opinion: str) -> None:
    """Both rods are just tight: the bay can go neither way without drawing one."""
    assert not bay().answers[opinion].cases["none"].joints.any()


def test_the_report_names_case_and_joints(capsys: pytest.CaptureFixture[str]) -> None:
    from crosscheck.report.terminal import undetermined_lines

    lines = undetermined_lines(bay())
    assert lines == ["Undetermined in weight (one-way parts are at rest and let it move): movement of A, B, C, D"]


def test_a_prop_that_pushes_may_be_anywhere_below_a_beam_that_lifts_off() -> None:
    """A bar on two one-way props with nothing on it but a pull along: it may lift off, and its heights are null; pressed
    down, they are zero."""
    text = """
units = "kN m"
[materials.steel]
E = "200 GPa"
[sections]
s = { I = "2000 cm^4", A = "40 cm^2" }
[joints]
A = [0, 0]
B = [4, 0]
[members]
"A-B" = { section = "s", material = "steel" }
[supports]
A = { x = "held", y = "push" }
B = { y = "push" }
[loads.along]
apply = [{ joint = "B", force = 5, direction = "right" }]
[loads.down]
apply = [{ member = "A-B", uniform = 2, direction = "down" }]
"""
    opinions = ask(read_frame_text(text))
    assert opinions.verdict == "agree"
    for opinion in OWN:
        cases = opinions.answers[opinion].cases
        assert np.isnan(cases["along"].joints[:, 1:]).all() and np.isfinite(cases["along"].joints[:, 0]).all()
        assert np.isfinite(cases["down"].joints).all() and cases["down"].reactions[:, 1] == pytest.approx([4, 4])
