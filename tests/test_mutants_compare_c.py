"""Tests that mutants of the comparison asked for: hand values and definitions, said at each."""

from __future__ import annotations

from types import SimpleNamespace

import numpy as np
import pytest

from crosscheck.answer import CaseAnswer
from crosscheck.claims.numbers import Number
from crosscheck.claims.reading import Entry
from crosscheck.compare import fit, fit_conventions
from crosscheck.compare.claim import ClaimComparison, Enveloped
from crosscheck.compare.claimed import ClaimedValue, ClosedClaim
from crosscheck.compare.differences import Difference
from crosscheck.compare.envelopes import NOBODY, extremes_of
from crosscheck.compare.fit_values import Reference
from crosscheck.compare.fit_variants import in_global_axes, in_member_axes
from crosscheck.compare.opinions import Comparison, _others_agree, extremes
from crosscheck.compare.tolerance import CLAIM, case_scales, full_restraint, member_load_totals
from crosscheck.frame.kinematics import study
from crosscheck.frame.loads import load_table
from crosscheck.frame.reader import read_frame_text
from crosscheck.frame.stations import stations
from crosscheck.opinions import slope_deflection
from tests.test_claims_variants import face_ends, zoned

BEAM = """
units = "kN m"
materials.m = { E = 200e6 }
sections.s = { I = 1e-4, A = 5e-3 }
joints = { A = [0, 0], B = [8, 0] }
members."A-B" = { section = "s", material = "m" }
supports = { A = "fixed", B = "fixed" }
[loads.q]
apply = [{ member = "A-B", force = 12, at = 4, direction = "down" }]
"""
"""By hand: P L / 8 = 12 kNm at both ends and at mid-span, shears of 6 kN."""


@pytest.mark.parametrize(("extreme", "value", "governing", "all_apart", "apart"), [
    ("max", 6.0, "b", 1.0, 4.0), ("min", -8.0, "c", 1.0, 10.0), ("size", 8.0, "c", 1.0, 1.0),
])  # fmt: skip
def test_which_case_governs_and_how_far_the_claim_is(
    extreme: str, value: float, governing: str, all_apart: float, apart: float
) -> None:
    """2, 7 and -9 in three cases: without the second and, for the least, without the third, what is left is the extreme."""
    claimed = ClaimedValue("e", "reaction", "fx", None, "A", None, value, 0.0, 1, extreme=extreme)  # type: ignore[arg-type]
    found = Enveloped(claimed, {"a": 2.0, "b": 7.0, "c": -9.0}, 0.1)
    assert (found.governing, found.apart(frozenset())) == (governing, all_apart)
    assert found.apart(frozenset({"c"} if extreme == "min" else {"b"})) == apart


def test_greatest_and_least_of_several_cases_place_by_place() -> None:
    nan = np.nan
    found = extremes_of(np.array([[1.0, 5.0, nan, nan], [3.0, nan, nan, -2.0], [2.0, 4.0, nan, -1.0]]))
    assert found.greatest == pytest.approx([3, 5, nan, -1], nan_ok=True)
    assert found.least == pytest.approx([1, 4, nan, -2], nan_ok=True)
    assert found.greatest_by.tolist() == [1, 0, NOBODY, 2] and found.least_by.tolist() == [0, 2, NOBODY, 1]


def _values(places: list[tuple[str, str, float, float]]) -> ClosedClaim:
    """Values of member A-B at 4 m, or of its end A: kind, quantity, value, half digit."""
    values = [
        ClaimedValue("q", kind, quantity, "A-B", *(("A", None) if kind == "end" else (None, 4.0)), v, half, 1)  # type: ignore
        for kind, quantity, v, half in places
    ]
    return ClosedClaim("", "", len(values), ("q",), tuple(values))


def _judged(frame_text: str, closed: ClosedClaim):  # type: ignore[no-untyped-def]  # noqa: ANN202
    frame = read_frame_text(frame_text)
    answers = {"slope-deflection": slope_deflection.opine(frame, study(frame))}
    judged = {n: Comparison(frame, answers).judge(n) for n in frame.names}  # type: ignore[arg-type]
    return ClaimComparison(frame, answers, judged, CLAIM).judge(closed)  # type: ignore[arg-type]


@pytest.mark.parametrize(("value", "verdict"), [(6.0, "agree"), (-6.0, "agree"), (0.0, "disagree"), (3.0, "disagree")])
def test_at_a_point_load_the_shear_of_either_side_agrees(value: float, verdict: str) -> None:
    """Just before and just after the load it is 6 kN, one way and the other."""
    (case,) = _judged(BEAM, _values([("span", "shear", value, 0.005)]))
    assert case.verdict == verdict


@pytest.mark.parametrize(("factor", "half", "left"), [(1.0, 0.05, 0), (1.0, 0.5, 0), (1.0, 1.0, 1), (1e-3, 1e-3, 1)])
def test_what_is_printed_too_coarsely_by_its_share_of_the_scale(factor: float, half: float, left: int) -> None:
    """Moments of 12 kNm: half a digit of 0.6, a twentieth, is the most that can be judged; in smaller figures likewise."""
    text = BEAM.replace("force = 12", f"force = {12 * factor}").replace("E = 200e6", f"E = {200e6 * factor}")
    frame = read_frame_text(text)
    said = slope_deflection.opine(frame, study(frame)).cases["q"].ends[0, 0, 2]  # type: ignore[union-attr]
    assert abs(said) == pytest.approx(12 * factor)
    (case,) = _judged(text, _values([("end", "moment", said, half)]))
    assert (case.compared, len(case.not_compared)) == (1 - left, left)


def test_of_how_many_values_an_envelope_is_judged() -> None:
    """One member's six end actions, two joints' three displacements and three reactions; twice for an envelope."""
    more = 'apply = [{ member = "A-B", force = 3, at = 4, direction = "down" }]'
    text = f'{BEAM}[loads.r]\n{more}\n[envelopes]\ne = ["q", "r"]\n'
    one = ClaimedValue("q", "end", "moment", "A-B", "A", None, 12.0, 0.005, 1)
    both = ClaimedValue("e", "end", "moment", "A-B", "A", None, 12.0, 0.005, 1, extreme="size")
    of = [c.of for c in _judged(text, ClosedClaim("", "", 2, ("q", "e"), (one, both)))]
    assert of == [6 + 6 + 6, 2 * (6 + 6 + 6)]


def test_what_full_restraint_and_traces_of_it_cause() -> None:
    """Settlement of 16 mm of one end of 8 m, EI = 2e4: 6 EI / L^2 times it is 30 kNm. A ten thousandth counts as scale
    beside answers of nought; of the moment too, by L^2 / EI."""
    text = BEAM.split("[loads.q]")[0] + '[loads.q]\napply = [{ joint = "B", settlement = { down = 0.016 } }]\n'
    frame = read_frame_text(text)
    table = load_table(frame, "q")
    assert full_restraint(frame, table).moments == pytest.approx(30, rel=1e-12)
    nought = CaseAnswer(np.zeros((1, 2, 3)), np.zeros((2, 3)), np.zeros((2, 3)))
    assert case_scales(frame, table, [nought]).displacements == pytest.approx(1e-4 * 0.016, rel=1e-9)
    ends = np.zeros((1, 2, 3))
    ends[0, 0, 2] = 500.0  # 1e-4 500 64 / 2e4
    found = case_scales(frame, table, [CaseAnswer(ends, np.zeros((2, 3)), np.zeros((2, 3)))])
    assert found.displacements == pytest.approx(1.6e-4, rel=1e-9)


def test_the_forces_on_each_member_add_up() -> None:
    """3 kN at a point and 2 to 4 kN/m from 1 m to 5 m: 3 + 3 x 4."""
    text = BEAM.replace("force = 12, at = 4, ", "force = 3, at = 4, ").replace(
        '"down" }]', '"down" }, { member = "A-B", varying = [2, 4], start = 1, end = 5, direction = "down" }]'
    )
    frame = read_frame_text(text)
    assert member_load_totals(frame, load_table(frame, "q")) == pytest.approx([15.0])


@pytest.mark.parametrize(("values", "difference", "may", "agree"), [
    ((1.0, 1.5, 9.0), 8.0, 0.0, True), ((1.0, 2.0, 9.0), 8.0, 0.0, False), ((1.0, 2.0, 9.0), 8.0, 1.1, True),
    ((-5.0, 5.0, 9.0), 8.0, 0.5, False), ((1.0, 1.5, 1.1), 0.5, 0.0, False), ((100.0, 100.0, 90.0), 10.0, 0.1, True),
])  # fmt: skip
def test_the_others_agree_within_a_tenth_of_the_difference_or_what_is_allowed(
    values: tuple[float, float, float], difference: float, may: float, agree: bool
) -> None:
    said = dict(zip(("one", "other", "odd"), values, strict=True))
    place = SimpleNamespace()
    assert _others_agree(Difference(place, said, difference, may), "odd") is agree  # type: ignore[arg-type]


def test_extremes_have_a_row_for_every_member() -> None:
    """Also of an opinion whose values along members are samples, and all not given."""
    frame = read_frame_text(BEAM)
    sampled = SimpleNamespace(spans=SimpleNamespace(sampled=True))
    at = stations(frame)
    found = extremes(sampled, "q", at)  # type: ignore[arg-type]
    assert found.shape == (1, 2, 4) and np.isnan(found).all()
    assert extremes(slope_deflection.opine(frame, study(frame)), "q", at).shape == (1, 2, 4)  # type: ignore[arg-type]


def test_distances_a_thousandth_of_the_length_beyond_a_member_are_at_its_end() -> None:
    """Of 8 m: 8 mm."""
    seen = []

    def along(case: str, member: np.ndarray, x: np.ndarray, side: np.ndarray) -> np.ndarray:
        seen.append(x)
        return np.ones((len(x), 4))

    stub = SimpleNamespace(
        frame=read_frame_text(BEAM), case="q", answer=SimpleNamespace(spans=SimpleNamespace(along=along))
    )
    x = np.array([-0.0079, -0.0081, 4.0, 8.0079, 8.0081, np.nan])
    found = Reference.along(stub, np.zeros(6, dtype=np.int64), x, 1)  # type: ignore[arg-type]
    assert np.isnan(found[:, 0]).tolist() == [False, True, False, False, True, True]
    assert seen[0][[0, 2, 3]].tolist() == [0.0, 4.0, 8.0]


def test_the_scale_of_a_joint_and_of_an_extreme_is_at_least_a_tenth_of_the_case_s() -> None:
    """Forces of 50 in the case: joints with 20, 4 and none."""
    reactions = np.array([[12.0, -20.0, 7.0], [4.0, 0.0, 0.0], [np.nan, 0.0, 0.0]])
    scales = SimpleNamespace(of=lambda quantity: 50.0)
    stub = SimpleNamespace(result=SimpleNamespace(reactions=reactions), scales=scales)
    assert Reference.joint_scale(stub, "fx", "reaction").tolist() == [20.0, 5.0, 5.0]  # type: ignore[arg-type]
    for most, scale in ((2.0, 5.0), (30.0, 30.0), (np.nan, 5.0)):
        every = np.array([-1])
        batch = SimpleNamespace(quantity="shear", member=every, joint=every)
        whole = SimpleNamespace(scales=scales, extremes_of=lambda q, m, j, most=most: np.array([[-most, 1.0]]))
        assert fit._extreme_scale(batch, np.array([True]), whole).tolist() == [scale]  # type: ignore[arg-type]


@pytest.mark.parametrize(("run", "place", "end"), [(1, 0, 0), (1, 1, 1), (-1, 0, 1), (-1, 1, 0)])
def test_the_end_meant_where_the_paste_s_member_runs_back(run: int, place: int, end: int) -> None:
    """The paste's start is the frame's end, and the other way round."""
    one = {"run": run, "member": 0, "place": place, "end": -1}
    batch = SimpleNamespace(**{name: np.array([value]) for name, value in one.items()})
    found = fit_conventions.placed(batch, read_frame_text(BEAM), "frame")  # type: ignore[arg-type]
    assert [int(f[0]) for f in found] == [end, place, run]


def test_a_place_given_as_a_share_of_the_length() -> None:
    """A quarter of 8 m, from either end; beside it 3 m as such."""
    batch = SimpleNamespace(
        member=np.zeros(3, dtype=np.int64), at=np.array([0.25, 0.25, 3.0]), at_share=np.array([True, True, False]),
        at_half=np.zeros(3), origin=np.full(3, np.nan),
    )  # fmt: skip
    found = fit_conventions.distance(batch, read_frame_text(BEAM), np.array([1, -1, 1]))  # type: ignore[arg-type]
    assert found.tolist() == [2.0, 6.0, 3.0]


@pytest.mark.parametrize(("end", "axial"), [(0, -4.4), (1, 4.4)])
def test_end_forces_along_global_axes_in_the_member_s(end: int, axial: float) -> None:
    """A member at 3 : 4 under (2, 4): 2 x 0.6 + 4 x 0.8 along it, 4 x 0.6 - 2 x 0.8 across; half digits of 0.5 and 0.05
    add up by the same shares."""
    frame = read_frame_text(BEAM.replace("[8, 0]", "[6, 8]"))
    x, y = (
        Entry(1, 1, "end", quantity, Number(value, half, ""), member="A-B", end=end, axes="open")
        for quantity, value, half in (("axial", 2.0, 0.5), ("shear", 4.0, 0.05))
    )
    found = {e.quantity: e.number for e in in_member_axes([x, y], frame) or ()}
    assert (found["axial"].value, found["shear"].value) == pytest.approx((axial, 0.8))
    assert (found["axial"].half, found["shear"].half) == pytest.approx((0.3 + 0.04, 0.4 + 0.03))


def test_half_digits_of_reactions_at_a_turned_support() -> None:
    """By cosine and sine of thirty degrees, each of its own component: halves of 0.5 and 0.05."""
    support = '{ x = "held", y = "held", rotation = "held", angle = 30 }'
    frame = read_frame_text(BEAM.replace('B = "fixed"', f"B = {support}"))
    x, y = (
        Entry(1, 1, "reaction", quantity, Number(value, half, ""), joint="B")
        for quantity, value, half in (("fx", 3.0, 0.5), ("fy", 2.0, 0.05))
    )
    found = {e.quantity: e.number for e in in_global_axes([x, y], frame) or ()}
    cos, sin = np.sqrt(0.75), 0.5
    assert found["fx"].half == pytest.approx(cos * 0.5 + sin * 0.05)
    assert found["fy"].half == pytest.approx(sin * 0.5 + cos * 0.05)


@pytest.mark.parametrize(("kept", "words"), [("B", "only 1 value tells that"), ("BC", "only 2 values tell that")])
def test_another_way_that_too_few_values_speak_for_is_named_as_undecided(kept: str, words: str) -> None:
    """Moments at the faces of one member's rigid zones, and at the joints elsewhere."""
    lines = face_ends(zoned()).splitlines()
    rows = [row for row in lines if not row.startswith(("C-E", *(f"rafter\t{j}" for j in "BC" if j not in kept)))]
    _, closed, _ = zoned().judge("\n".join(rows) + "\n")
    assert closed.cases == ("dead",)
    assert any("face of rigid zones" in reason and words in reason for reason in closed.undecided), closed.undecided
