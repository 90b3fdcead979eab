"""The audit of what the checking week added: stepped and tapered members, ties, one-way parts, members that alone are
rigid, states of stiffness. Against closed forms worked out here, and against results of the opinions, which it never reads.
"""

from __future__ import annotations

from dataclasses import replace
from functools import lru_cache

import numpy as np
import pytest

from crosscheck import check
from crosscheck.answer import CaseAnswer
from crosscheck.audit.bound import ForceBound, hypercircle
from crosscheck.audit.compatibility import CompatibilityFindings, compatibility
from crosscheck.audit.flexibility import BENDING, IMPOSED, SHEAR_STRAIN, STRETCH, Flexibility, flexibility
from crosscheck.audit.signatures import DEEP, LIGHT, REVERSED, Signature, signatures
from crosscheck.audit.statics import balance
from crosscheck.frame.kinematics import study
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import Frame
from crosscheck.frame.reader import read_frame_text
from tests.audit_truth import rounded
from tests.test_audit import distance
from tests.week_frames import week_features, week_frame

E, ALPHA = 2.1e8, 1.2e-5
SEEDS = (0, 1, 2, 3, 7, 8, 10, 13, 16, 19, 23, 26, 34, 45, 69)


@lru_cache(maxsize=64)
def answered(frame: Frame, name: str) -> CaseAnswer:
    """The results of slope-deflection, or of moment distribution where it abstains."""
    said = check.ask(frame, [name]).answers
    cases = [said[k].cases[name] for k in ("slope-deflection", "moment-distribution") if k in said and name in said[k].cases]
    assert cases, name
    return cases[0]


def judged(frame: Frame, name: str, claim: CaseAnswer, digits: int | None = None) -> CompatibilityFindings:
    plain = frame.under(name)
    values, half = rounded(claim, digits) if digits else (claim, None)
    return compatibility(plain, name, values, half, study(plain).undetermined)


# --- flexibilities by closed forms

BEAM = """
units = "kN m"
[materials]
m = {{ E = 2.1e8, G = 8e7, alpha = 1.2e-5 }}
[sections]
small = {{ I = 1e-4, A = 4e-3, shear_area = 2e-3, depth = 0.2 }}
deep = {{ I = {I}, A = {A}, shear_area = {A}, depth = 0.4 }}
[joints]
A = [0, 0]
B = [6, 0]
[members]
b = {{ from = "A", to = "B", material = "m", {member} }}
[supports]
A = "fixed"
B = "fixed"
[loads]
p = {{ apply = [{load}] }}
[analysis]
axial = "elastic"
shear = "elastic"
"""


def beam(member: str, load: str = "", I: float = 4e-4, A: float = 8e-3) -> Flexibility:  # noqa: E741
    frame = read_frame_text(BEAM.format(member=member, load=load, I=I, A=A))
    return flexibility(frame, load_table(frame, "p"))


def test_a_stepped_member_is_the_sum_of_its_pieces() -> None:
    """Moment-area (C. E. Greene 1873): the integrals of (1 - x/L)^2, (1 - x/L) x/L and (x/L)^2 over both pieces."""
    found = beam('profile = [["deep", "25%"], ["small", "100%"]]')
    L, a = 6.0, 0.25
    soft, stiff = L / (E * 1e-4), L / (E * 4e-4)
    mine = np.array([
        [stiff * (1 - (1 - a) ** 3) / 3 + soft * (1 - a) ** 3 / 3, 0.0],
        [0.0, stiff * a**3 / 3 + soft * (1 - a**3) / 3],
    ])  # fmt: skip
    mine[0, 1] = mine[1, 0] = -(stiff * (a**2 / 2 - a**3 / 3) + soft * (1 / 6 - a**2 / 2 + a**3 / 3))
    np.testing.assert_allclose(found.matrix[BENDING, 0, :2, :2], mine, rtol=1e-13)
    np.testing.assert_allclose(found.matrix[STRETCH, 0, 2, 2], L * (a / 8e-3 + (1 - a) / 4e-3) / E, rtol=1e-13)
    slide = (a / 8e-3 + (1 - a) / 2e-3) / (8e7 * L)
    np.testing.assert_allclose(found.matrix[SHEAR_STRAIN, 0, :2, :2], slide, rtol=1e-13)


def test_a_taper_of_square_power_in_closed_form() -> None:
    """I = I1 t^2 with t = 1 + x/L: the integral of ((1 - x/L)^2, -(1 - x/L) x/L, (x/L)^2)/t^2, by parts of t - 2 and 1."""
    found = beam('taper = ["small", "deep"]')
    unit = 6.0 / (E * 1e-4)
    log = np.log(2.0)
    # (2 - t)^2/t^2 = 4/t^2 - 4/t + 1;  (2 - t)(t - 1)/t^2 = -2/t^2 + 3/t - 1;  (t - 1)^2/t^2 = 1/t^2 - 2/t + 1, t from 1 to 2.
    ff, ft, tt = 2 - 4 * log + 1, -1 + 3 * log - 1, 0.5 - 2 * log + 1
    np.testing.assert_allclose(found.matrix[BENDING, 0, :2, :2], unit * np.array([[ff, -ft], [-ft, tt]]), rtol=1e-12)
    # A grows with the depth: L ln 2 / (E A1).
    np.testing.assert_allclose(found.matrix[STRETCH, 0, 2, 2], 6.0 * log / (E * 4e-3), rtol=1e-12)


def test_a_load_on_a_taper_in_closed_form() -> None:
    """Couple of 1 at mid-length of a taper with I = I1 t^2: sagging moment -x/L before it, 1 - x/L after it."""
    found = beam('taper = ["small", "deep"]', '{ member = "b", couple = 1, at = "50%" }')
    unit = 6.0 / (E * 1e-4)

    def whole(a: float, b: float, c: float, low: float, high: float) -> float:
        """Of a/t^2 + b/t + c."""
        return a * (1 / low - 1 / high) + b * np.log(high / low) + c * (high - low)

    # -(t - 1) before, 2 - t after, times 2 - t of the unit moment at `from`, over t^2.
    first = -whole(-2, 3, -1, 1, 1.5) + whole(4, -4, 1, 1.5, 2)
    second = whole(1, -2, 1, 1, 1.5) - whole(-2, 3, -1, 1.5, 2)
    np.testing.assert_allclose(found.load[BENDING, 0, :2], unit * np.array([first, second]), rtol=1e-12)


def test_a_force_along_a_taper_stretches_what_lies_before_it() -> None:
    """100 towards `to` at a third of the length, nothing held at `from`: the rest is compressed by it."""
    found = beam('taper = ["small", "deep"]', '{ member = "b", force = 100, direction = "along", at = 2 }')
    np.testing.assert_allclose(found.load[STRETCH, 0, 2], -100 * 6 * np.log(2 / (4 / 3)) / (E * 4e-3), rtol=1e-12)
    # Held at both ends, the lengths share it as their stiffness: N = 100 ln(1.5)/ln 2 in front.
    np.testing.assert_allclose(found.held_axial, 100 * np.log(1.5) / np.log(2), rtol=1e-12)


def test_a_temperature_difference_bends_a_taper_by_its_depth() -> None:
    """Curvature alpha D / h(x) with h = h1 t: the integrals of (2 - t)/t and -(t - 1)/t."""
    found = beam('taper = ["small", "deep"]', '{ member = "b", difference = 10 }')
    unit, log = ALPHA * 10 / 0.2 * 6.0, np.log(2)
    np.testing.assert_allclose(found.load[IMPOSED, 0, :2], unit * np.array([2 * log - 1, log - 1]), rtol=1e-12)


def test_only_the_part_between_rigid_zones_bends() -> None:
    """A zone over the whole of the deep piece and more: as a prismatic member with that zone."""
    zones = "rigid_from = 2.0, rigid_to = 0.5"
    stepped = beam(f'profile = [["deep", "25%"], ["small", "100%"]], {zones}', '{ member = "b", uniform = 3, direction = "down" }')
    plain = beam(f'section = "small", {zones}', '{ member = "b", uniform = 3, direction = "down" }')
    np.testing.assert_allclose(stepped.total, plain.total, rtol=1e-12)
    np.testing.assert_allclose(stepped.total_load, plain.total_load, rtol=1e-12, atol=1e-18)


def test_a_deep_taper_of_uneven_power_keeps_its_digits() -> None:
    """Four halvings of accuracy are worth nothing unless the steep end is right: I = I1 t^p, p = log 43.7 / log 2."""
    ratio = 43.7
    found = beam('taper = ["small", "deep"]', I=1e-4 * ratio)
    p = np.log(ratio) / np.log(2)

    def power(n: float) -> float:
        """Integral of t^n from 1 to 2."""
        return (2 ** (n + 1) - 1) / (n + 1)

    mine = 4 * power(-p) - 4 * power(1 - p) + power(2 - p)
    np.testing.assert_allclose(found.matrix[BENDING, 0, 0, 0], 6.0 / (E * 1e-4) * mine, rtol=1e-11)


# --- right claims


@pytest.mark.parametrize("seed", SEEDS)
def test_right_results_are_the_solution(seed: int) -> None:
    frame = week_frame(seed)
    if frame.analysis.order == 2:
        pytest.skip("first order only")
    seen = 0
    for name in frame.names[:6]:
        claim = answered(frame, name)
        if not np.abs(claim.ends[..., 2]).max() > 1e-9:
            continue  # nothing acts, and rounding noise would be printed
        for digits in (4, 6, 12):
            found = judged(frame, name, claim, digits)
            assert found.solution, (name, digits, found.says, found.not_judged)
            seen += 1
    assert seen


def test_those_frames_have_every_feature() -> None:
    features = [week_features(week_frame(seed)) for seed in SEEDS if week_frame(seed).analysis.order == 1]
    for feature in ("stepped", "tapered", "state of stiffness", "lean", "tie", "one member rigid", "one-way member",
                    "one-way support"):  # fmt: skip
        assert sum(feature in f for f in features) >= 2, feature


@pytest.mark.parametrize("file", ["causeway", "rack", "workshop", "depot"])
def test_right_results_of_the_week_s_cases(file: str) -> None:
    frame = check.read(f"cases/{file}.toml")
    seen = 0
    for name in frame.names[:4]:
        if frame.under(name).analysis.order == 1:
            for digits in (4, 6):
                found = judged(frame, name, answered(frame, name), digits)
                assert found.solution, (name, digits, found.says, found.not_judged)
                seen += 1
    assert seen
