"""Tests that mutants of the comparison asked for: units carried over, places along members, signs, shares and counts."""

from __future__ import annotations

from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest

from crosscheck.claims.numbers import Number
from crosscheck.claims.reading import Entry
from crosscheck.claims.words import Size
from crosscheck.compare import closing
from crosscheck.compare.claim import ClaimComparison
from crosscheck.compare.envelopes import extremes_of
from crosscheck.compare.fit import _Trial
from crosscheck.compare.fit_conventions import Convention, _expected_in, _over_cases, distance
from crosscheck.compare.fit_signs import _opposite
from crosscheck.compare.fit_stations import _score
from crosscheck.compare.fit_units import UnitChoice
from crosscheck.compare.fit_variants import _turned
from crosscheck.compare.opinions import Comparison, extremes
from crosscheck.compare.tolerance import Tolerance, allowed, full_restraint
from crosscheck.frame.loads import load_table
from crosscheck.frame.reader import read_frame_text
from crosscheck.frame.stations import stations
from crosscheck.frame.units import LENGTH

PORTAL = """
units = "kN m"
materials.m = { E = 200e6, alpha = 1e-5 }
sections.s = { I = 1e-4, A = 5e-3 }
joints = { A = [0, 0], B = [0, 4], C = [6, 4], D = [6, 0] }
[members]
"A-B" = { section = "s", material = "m" }
"B-C" = { section = "s", material = "m" }
"C-D" = { section = "s", material = "m" }
[supports]
A = "fixed"
D = "fixed"
[analysis]
axial = "elastic"
[loads.q]
apply = [{ joint = "B", force = 1, direction = "right" }]
"""
OPEN = np.array([np.nan])
MILLI = UnitChoice("N", 1e-3, False)


def batch_of(**given: Any) -> Any:
    """One value, of nothing in particular but what is given."""
    plain: dict[str, Any] = {
        "kind": "end", "quantity": "moment", "value": np.array([1500.0]), "half": np.array([0.5]), "factor": OPEN,
        "unsigned": np.array([False]), "entry": np.array([0]), "case": np.array([0]), "member": np.array([1]),
        "joint": np.array([-1]), "end": np.array([-1]), "place": np.array([-1]), "run": np.array([1]),
        "cut": OPEN, "origin": OPEN, "at": np.array([2.0]), "at_half": np.array([0.0]), "at_share": np.array([False]),
    }  # fmt: skip
    return SimpleNamespace(**(plain | given))


# --- units


def test_half_a_digit_is_carried_through_the_unit_that_fits() -> None:
    """1500 N within a half of one: 1.5 kN within 0.0005."""
    seen: list[Any] = []
    trial: Any = SimpleNamespace(
        batch=batch_of(), _known={}, conventions=[1], expected=[2], governing=[None],
        _choice=lambda unit, c, e, g, value, half: seen.append((value.tolist(), half.tolist())),
    )  # fmt: skip
    _Trial.choices(trial, MILLI)
    assert seen == [([pytest.approx(1.5)], [pytest.approx(0.0005)])]


def test_half_a_digit_of_a_closed_value_is_in_the_frame_s_unit() -> None:
    """The same of what a closed claim holds."""
    choice = SimpleNamespace(unit=MILLI, side=np.ones(1), convention=Convention("action", 1, "frame", ""))
    entry = Entry(1, 7, "end", "moment", Number(1500.0, 0.5, "1500"), member="B-C", end=0)
    batch = batch_of(end=np.array([0]))
    frame = read_frame_text(PORTAL)
    (found,) = closing._Closer._values(
        SimpleNamespace(frame=frame), SimpleNamespace(batch=batch), [entry], ("q",),  # type: ignore[arg-type]
        SimpleNamespace(shown=lambda f: choice),  # type: ignore[arg-type]
    )  # fmt: skip
    assert (found.value, found.half_digit, found.joint) == (pytest.approx(1.5), pytest.approx(0.0005), "B")


def test_a_distance_is_given_in_the_frame_s_length() -> None:
    """2 m are 2000 of a frame in millimetres."""
    entry = Entry(1, 1, "span", "moment", Number(1.0, 0.5, "1"), at=2.0, at_unit=Size("m", LENGTH, 1.0))
    frame: Any = SimpleNamespace(units=SimpleNamespace(metre=0.001))
    assert closing._at(entry, entry.at, frame) == pytest.approx(2000.0)


def test_how_well_a_unit_of_distances_fits() -> None:
    """Members whose last station stands at their end, less one for each member where one lies beyond."""
    one, two = ("A-B", None, None, 1), ("B-C", None, None, 1)
    assert _score({one: 4000.0, two: 3000.0}, {one: 4.0, two: 6.0}, 1e-3) == 1
    assert _score({one: 4.0, two: 4.5}, {one: 4.0, two: 3.0}, 1.0) == 1 - 2
    assert _score({one: 4.0, two: 3.0}, {one: 4.0, two: 3.0}, 1.0) == 2


# --- places and signs


def test_a_distance_along_a_part_that_runs_back() -> None:
    """2 m back from 5 m of a member of 6 m; 2 m on from 1 m."""
    frame = read_frame_text(PORTAL)
    assert distance(batch_of(origin=np.array([5.0])), frame, np.array([-1])).tolist() == [3.0]
    assert distance(batch_of(origin=np.array([1.0])), frame, np.array([1])).tolist() == [3.0]


def test_what_a_moment_along_a_member_that_runs_back_reads() -> None:
    """Sagging where the member runs on, its negative where it runs back or hogging is positive; 20 before, 25 after."""
    frame = read_frame_text(PORTAL)
    at = {-1: np.array([[1.0, 2.0, 20.0, 4.0]]), 1: np.array([[1.0, 2.0, 25.0, 4.0]])}
    reference: Any = SimpleNamespace(frame=frame, along=lambda member, x, side: at[side])
    for run, sign, turn in ((1, 1, 1), (-1, 1, -1), (1, -1, -1), (-1, -1, 1)):
        batch = batch_of(kind="span", run=np.array([run]))
        found = _expected_in(batch, reference, Convention("internal", sign, "frame", ""))
        assert found.tolist() == [[20.0 * turn, 25.0 * turn]]


def test_what_one_case_says_is_said_of_all() -> None:
    only = np.array([[3.0], [-4.0]])
    assert _over_cases(np.array([1, -1]), [only]).tolist() == only.tolist()


def test_end_forces_along_the_paste_s_x_against_tension() -> None:
    """Tension pulls the start back and the end on; moments inside a member sag as the start turns clockwise."""
    frame = read_frame_text(PORTAL)
    ends = {"member": np.array([1, 1]), "end": np.array([0, 1]), "run": np.array([1, 1]), "value": np.ones(2),
            "cut": np.full(2, np.nan), "place": np.array([0, 1])}  # fmt: skip
    for quantity, form, signs in (
        ("axial", "action", [-1, 1]),
        ("moment", "internal", [1, -1]),
        ("axial", "internal", [1, 1]),
    ):
        choice: Any = SimpleNamespace(convention=Convention(form, 1, "frame", ""))
        found, joints, _ = closing._to_frame(batch_of(quantity=quantity, **ends), choice, frame)
        assert found.tolist() == signs and joints == ["B", "C"]


def test_the_opposite_of_a_choice_differs_in_its_sign_alone() -> None:
    choices = [SimpleNamespace(convention=Convention(form, sign, "frame", ""))
               for form in ("action", "internal") for sign in (1, -1)]  # fmt: skip
    for k, other in ((0, 1), (1, 0), (2, 3), (3, 2)):
        fitted: Any = SimpleNamespace(choices=choices, taken=choices[k])
        assert _opposite(fitted) is choices[other]


def test_end_forces_in_global_axes_turned_into_a_member_s() -> None:
    """A member whose x runs along (0.8, 0.6) and y along (-0.6, 0.8), pushed at its start by 10 to the right, 5 up."""
    fx = Entry(1, 1, "end", "axial", Number(10.0, 0.05, "10.0"))
    fy = Entry(1, 1, "end", "shear", Number(5.0, 0.5, "5"))
    axial, shear = (e.number for e in _turned(fx, fy, float(np.arctan2(0.6, 0.8)), 0))
    assert axial.value == pytest.approx(-(0.8 * 10 + 0.6 * 5))
    assert shear.value == pytest.approx(-0.6 * 10 + 0.8 * 5)
    assert (axial.half, shear.half) == (pytest.approx(0.8 * 0.05 + 0.6 * 0.5), pytest.approx(0.6 * 0.05 + 0.8 * 0.5))


# --- sizes, shares and counts


def test_what_is_allowed_is_a_share_of_the_larger_or_of_the_scale() -> None:
    tolerance = Tolerance(0.01, 0.005)
    assert allowed(-200.0, 100.0, tolerance, 50.0) == pytest.approx(2.0)
    assert allowed(0.0, 0.1, tolerance, 50.0) == pytest.approx(0.25)


def test_warmth_and_a_support_that_moves_strain_together() -> None:
    """EA times both strains: 1e6 kN, 1e-5 30 of warmth, and 0.002 m of settlement on 4 m."""
    frame = read_frame_text("""
units = "kN m"
materials.m = { E = 200e6, alpha = 1e-5 }
sections.s = { I = 1e-4, A = 5e-3 }
joints = { A = [0, 0], B = [4, 0] }
members."A-B" = { section = "s", material = "m" }
supports = { A = "fixed", B = "fixed" }
analysis.axial = "elastic"
[loads.q]
apply = [{ member = "A-B", temperature = 30 }, { joint = "B", settlement = { right = 0.002 } }]
""")
    assert full_restraint(frame, load_table(frame, "q")).forces == pytest.approx(1e6 * (3e-4 + 0.002 / 4), rel=1e-12)


def test_greatest_and_least_over_cases() -> None:
    """Of three cases; a value that one does not give is left out, and of none given there is none."""
    nan = np.nan
    found = extremes_of(np.array([[1.0, nan, nan], [3.0, 2.0, nan], [-2.0, 5.0, nan]]))
    np.testing.assert_array_equal(found.greatest, [3.0, 5.0, nan])
    np.testing.assert_array_equal(found.least, [-2.0, 2.0, nan])
    assert (found.greatest_by.tolist(), found.least_by.tolist()) == ([1, 2, -1], [2, 1, -1])


def test_extremes_are_given_member_by_member() -> None:
    """Each member's least and greatest of what its opinion gives along it: here the number of the member."""
    frame = read_frame_text(PORTAL)
    none = np.zeros(0)
    spans = SimpleNamespace(
        sampled=False, turning_points=lambda name: (none.astype(int), none),
        along=lambda name, member, x, side: np.repeat(member[:, None].astype(float), 4, axis=1),
    )  # fmt: skip
    found = extremes(SimpleNamespace(spans=spans), "q", stations(frame))  # type: ignore[arg-type]
    assert found.shape == (3, 2, 4)
    assert found[:, 0, 0].tolist() == found[:, 1, 3].tolist() == [0.0, 1.0, 2.0]


def test_an_extreme_s_place_is_its_member() -> None:
    frame = read_frame_text(PORTAL)
    sheet: Any = SimpleNamespace(of="extremes", quantity=("axial", "shear", "moment", "across"))
    found = Comparison(frame, {})._place("q", sheet, (2, 0, 2))
    assert (found.of, found.member, found.quantity) == ("extremes", "C-D", "moment")


def test_how_many_values_are_left_out_of_a_claim_on_another_case() -> None:
    """Two of q asked for, one of no case among them; three of w left."""
    entries = tuple(
        Entry(1, k, "end", "moment", Number(1.0, 0.5, "1"), case=c) for k, c in enumerate(["q", None, "w", "w", "w"])
    )
    kept, notes = closing._of_case(SimpleNamespace(entries=entries), "q")  # type: ignore[arg-type]
    assert [e.case for e in kept] == ["q", None] and notes == ["3 values of other cases are left out"]


@pytest.mark.parametrize(
    ("turned", "of", "odd"), [(3, 5, True), (2, 8, False), (2, 7, True), (1, 3, False), (4, 16, False)]
)
def test_signs_are_at_odds_where_more_than_a_quarter_of_members_have_the_other(turned: int, of: int, odd: bool) -> None:
    bad = np.arange(of) < turned
    taken = SimpleNamespace(bad=bad, telling=np.ones(of, bool), sizes_bad=np.zeros(of, bool))
    fitted: Any = SimpleNamespace(batch=batch_of(member=np.arange(of)), taken=taken)
    assert bool(closing._signs_at_odds(fitted)) is odd


def test_values_that_are_undetermined_are_not_counted() -> None:
    """18 end actions less the two axial forces of a member, 12 displacements less one, 6 reactions less two."""
    frame = read_frame_text(PORTAL)
    axial, joints, reactions = np.zeros(3, bool), np.zeros((4, 3), bool), np.zeros((4, 3), bool)
    axial[1] = joints[2, 1] = reactions[0, 0] = reactions[3, 0] = True
    none = SimpleNamespace(axial=axial, joints=joints, reactions=reactions)
    compared = ClaimComparison(frame, {"o": SimpleNamespace(undetermined=none)}, {}, Tolerance(0.01, 0.005))  # type: ignore[dict-item]
    assert compared._whole("q") == (18 - 2) + (12 - 1) + (6 - 2)


@pytest.mark.parametrize(("plain", "other", "taken"), [(6, 1, "other"), (3, 1, "plain"), (8, 4, "plain"), (4, 1, "other")])
def test_another_way_is_taken_where_it_explains_three_values_and_most(
    monkeypatch: pytest.MonkeyPatch, plain: int, other: int, taken: str
) -> None:
    """Two ways to take a claim, neither without values that do not fit; the case stands for what is closed."""
    bad = {"plain": plain, "other": other}
    monkeypatch.setattr(closing, "variants", lambda entries, frame, face: [([w], "") for w in bad])
    monkeypatch.setattr(closing, "_close_case", lambda closer, tried, notes, case: SimpleNamespace(cases=(tried[0],)))
    monkeypatch.setattr(closing, "_Closer", lambda *given: SimpleNamespace(bad=bad, sure=lambda closed: False))
    reading: Any = SimpleNamespace(entries=(), face=False)
    found = closing.close(reading, None, {"o": None}, None, Tolerance(0.01, 0.005))  # type: ignore[arg-type, dict-item]
    assert found.cases == (taken,)
