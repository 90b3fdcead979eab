"""The idealisation's effect side by side, and the critical load factor beside a verdict."""

from __future__ import annotations

import pytest

from crosscheck import check
from crosscheck.check import critical_factors
from crosscheck.frame.reader import read_frame_text
from crosscheck.idealisations import key_values, variants
from crosscheck.report.effects import USUAL, critical_line
from tests.calls import CASES
from tests.slips import sound

CANTILEVER = """
units = "kN m"
[materials.steel]
E = "200 GPa"
nu = 0.25
[sections.bar]
I = "10000 cm^4"
A = "100 cm^2"
shear_area = "40 cm^2"
[joints]
A = [0, 0]
B = [0, 4]
[members]
"A-B" = { section = "bar", material = "steel" }
[supports]
A = "fixed"
[loads.push]
apply = [{ joint = "B", force = 100, direction = "right" }]
[loads.weight]
apply = [{ joint = "B", force = 1000, direction = "down" }]
"""


def test_shear_column_is_the_closed_form() -> None:
    """Tip of a cantilever: PL3/3EI, and PL/GA more with shear deformation."""
    frame = read_frame_text(CANTILEVER)
    found = variants(frame)
    assert [v.title for v in found] == ["as stated", "axial rigid", "shear elastic", "order 2"]
    tip = next(k for k in key_values(frame, found) if k.case == "push" and k.quantity == "dx")
    bending, shearing = 100 * 4**3 / (3 * 20000), 100 * 4 / (80e6 * 40e-4)
    assert tip.values[0] == pytest.approx(bending, rel=1e-9)
    assert tip.values[2] == pytest.approx(bending + shearing, rel=1e-9)
    assert tip.most[2] == pytest.approx(shearing / bending, rel=1e-9)


def test_what_cannot_be_asked_says_why() -> None:
    frame = read_frame_text(CANTILEVER.replace('shear_area = "40 cm^2"\n', ""))
    shear = variants(frame)[2]
    assert not shear.cases
    assert "shear_area" in shear.why_not


def test_critical_factor_of_a_cantilever() -> None:
    """Euler: pi2 EI / 4L2 = 3084 kN on 1000 kN, to three digits; nothing is compressed under a push."""
    frame = read_frame_text(CANTILEVER)
    found = critical_factors(frame)
    assert found["weight"] == pytest.approx(3.0843, rel=1e-3)
    assert found["push"] == float("inf")
    line = critical_line(frame, found)
    assert line.startswith("Critical load factor: weight 3.08: below 10")


def test_far_from_critical_is_said_without_a_number() -> None:
    assert critical_line(sound("continuous"), {"dead": float("inf")}) == "Critical load factor: 100 or more in every case."


@pytest.mark.parametrize("name", ["depot", "hall", "rack", "workshop", "canopy"])
def test_the_line_says_the_same_where_factors_that_it_does_not_tell_are_not_found(name: str) -> None:
    frame = check.read(CASES / f"{name}.toml")
    assert critical_line(frame, critical_factors(frame, None, USUAL)) == critical_line(frame, critical_factors(frame))
