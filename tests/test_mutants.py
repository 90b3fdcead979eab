"""Tests that mutants asked for: each was let through by every other test (python -m tests.mutation).

Named after what they hold; checked against the exact solutions of tests/exact.py or against definitions said at each.
"""

from __future__ import annotations

import re
from dataclasses import replace
from types import ModuleType, SimpleNamespace

import numpy as np
import pytest
from scipy import sparse
from scipy.sparse.linalg import splu

from crosscheck import check
from crosscheck.answer import ACROSS, MOMENT, CaseAnswer, WorkTable
from crosscheck.audit import bound, fit, one_way
from crosscheck.audit.bound import ForceBound, hypercircle
from crosscheck.audit.compatibility import _own_axes, compatibility
from crosscheck.audit.equilibrium import FREE_SUPPORT, JOINT, Pieces, equations, reaction_index, zone_moment
from crosscheck.audit.signatures import DEEP, LIGHT, REVERSED, signatures
from crosscheck.audit.slack import gaps
from crosscheck.audit.statics import TOGETHER_CHECK, storeys
from crosscheck.audit.varying import CHANGE, _depth_marks
from crosscheck.claims import FrameNames, read_claim_text
from crosscheck.compare.fit import UnitChoice, _extreme_scale, _one_system
from crosscheck.compare.fit_conventions import conventions, member_runs
from crosscheck.compare.fit_stations import at_jumps
from crosscheck.compare.fit_variants import in_global_axes
from crosscheck.compare.opinions import Comparison
from crosscheck.compare.tolerance import full_restraint
from crosscheck.frame.kinematics import study
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import FREE, HELD, Frame
from crosscheck.frame.reader import read_frame_text
from crosscheck.opinions import moment_distribution, slope_deflection
from crosscheck.opinions.library import results
from crosscheck.opinions.library.mesh import _places
from crosscheck.opinions.library.model import Vectors
from crosscheck.opinions.library.qualification import _has_turned_roller
from crosscheck.opinions.library.results import _rigid_limit, along, solve_case
from crosscheck.opinions.moment_distribution import critical, gradual
from crosscheck.opinions.moment_distribution import one_way as distribution_one_way
from crosscheck.opinions.moment_distribution.members import cut_up, members
from crosscheck.opinions.moment_distribution.stretches import parts_needed
from crosscheck.opinions.moment_distribution.sways import _refined
from crosscheck.opinions.moment_distribution.varying import Varying
from crosscheck.opinions.slope_deflection import balance, displaced_one_way
from crosscheck.opinions.slope_deflection.balance import _trial
from crosscheck.opinions.slope_deflection.displaced_one_way import DisplacedOneWay
from crosscheck.opinions.slope_deflection.one_way import complementary, wrong
from crosscheck.opinions.slope_deflection.prepared import END, SPAN, Places, _each_varied, prepared
from crosscheck.opinions.slope_deflection.second_order import CaseInSecondOrder
from crosscheck.opinions.slope_deflection.varying import Bent
from tests.exact import Exact
from tests.exact_frames import exact_frames

FRAMES = exact_frames()
TERM = re.compile(r"(?:^|([+-]) )(-?[\d.e+-]+)(?: ([δθψ][^ ]*))?(?= [+-] | = |$)")
DIGITS = 2e-4
"""The equations are printed to five digits; sums of a few terms lose some."""
FOLLOWED = [
    "portal, axially elastic", "portal with a hinge, axially elastic", "semi-rigid portal, axially elastic",
    "portal with turned supports, axially elastic", "leaning frame, axially elastic", "gable, axially elastic",
    "warm portal, axially elastic", "portal with rigid zones, axially elastic", "turned spring, axially elastic",
]  # fmt: skip


def worked(frame: Frame, name: str) -> dict[str, WorkTable]:
    return {t.heading: t for t in slope_deflection.working(frame, study(frame), name)}


def value(text: str, of: dict[str, float]) -> tuple[float, float]:
    """A printed sum with its unknowns put in, and the size of its largest term."""
    terms = [float(text.split(" = ")[-1])] if " = " in text else []
    total = 0.0
    for sign, number, unknown in TERM.findall(text.split(" = ")[0]):
        term = float(number) * (of[unknown] if unknown else 1.0) * (-1.0 if sign == "-" else 1.0)
        total += term
        terms.append(term)
    return total, max(map(abs, terms), default=0.0)


def followed(frame: Frame, table: WorkTable) -> dict[str, float]:
    """Every unknown by its printed name: the displacements solved, nought where held, and the chords' rotations."""
    of = {f"{kind}({joint})": 0.0 for joint in frame.joints for kind in ("θ", "δx", "δy", "δx'", "δy'")}
    of |= {str(row[0]): float(row[1]) for row in table.rows}  # type: ignore[arg-type]
    return of


def chords(frame: Frame, joints: np.ndarray) -> dict[str, float]:
    """psi of the README's remark: -(across at the `to` face - across at the `from` face) / l."""
    t = frame.member_table
    out = {}
    for k, m in enumerate(frame.members):
        (i, j), c, s = t.ends[k], t.cos[k], t.sin[k]
        across = [-s * joints[e, 0] + c * joints[e, 1] for e in (i, j)]
        # A clockwise rotation lowers what lies ahead of the joint along the member.
        across = [across[0] - joints[i, 2] * t.zone[k, 0], across[1] + joints[j, 2] * t.zone[k, 1]]
        out[f"ψ({m})"] = -(across[1] - across[0]) / t.clear[k]
    return out


@pytest.mark.parametrize("title", FOLLOWED)
def test_the_working_of_slope_deflection_can_be_followed_by_hand(title: str) -> None:
    """Every printed equation holds with the printed displacements, and gives the exact moments at the faces."""
    frame = FRAMES[title]
    exact = Exact(frame)
    for name in frame.names:
        tables = worked(frame, name)
        of = followed(frame, tables["Displacements"]) | chords(frame, exact.cases[name].joints)
        for equation, text in tables["Joint and translation equations"].rows:
            left, size = value(str(text), of)
            assert left == pytest.approx(float(str(text).split(" = ")[1]), abs=DIGITS * size), (equation, text)
        ends = exact.cases[name].ends
        moments = iter(tables["Slope-deflection equations"].rows)
        for k, m in enumerate(frame.members.values()):
            for end in (0, 1):
                head, text = next(moments)
                got, size = value(str(text), of)
                zone, length = (m.rigid_from, m.rigid_to)[end], frame.member_table.length[k]
                inside = exact.along(name, [k], [length - zone if end else zone], [1 - 2 * end])[0, 2]
                expected = (-inside if end else inside) if zone else ends[k, end, 2]
                assert head == f"M {m.name} at {(m.joint_from, m.joint_to)[end]}"
                assert got == pytest.approx(expected, abs=DIGITS * size), text
        places = [(m.name, joint) for m in frame.members.values() for joint in (m.joint_from, m.joint_to)]
        assert [row[:2] for row in tables["End actions"].rows] == places
        for row, got_ends in zip(tables["End actions"].rows, ends.reshape(-1, 3), strict=True):
            assert np.allclose([float(v) for v in row[2:]], got_ends, rtol=1e-9, atol=1e-9 * np.abs(ends).max())  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("title", "member", "factors"),
    [("portal, axially elastic", "B-C", (4, 2, 4)), ("portal with a hinge, axially elastic", "B-C", (3, 0, 0))],
)
def test_stiffness_factors_in_the_working(title: str, member: str, factors: tuple[float, ...]) -> None:
    """4, 2 and 4 of EI/l for a plain member, 3 at the stiff end of one hinged at the other: common practice."""
    frame = FRAMES[title]
    rows = worked(frame, frame.names[0])["Members: stiffness and fixed-end moments"].rows
    row = next(r for r in rows if r[0] == member)
    assert row[1] == pytest.approx(210e6 * 2.31e-4 / 6.0)
    assert row[2:5] == pytest.approx(factors, abs=1e-12)


def test_fixed_end_moments_in_the_working() -> None:
    """w L^2 / 12 and its opposite under w down, clockwise on the member positive: common practice."""
    frame = FRAMES["portal, axially elastic"]
    rows = worked(frame, "q")["Members: stiffness and fixed-end moments"].rows
    assert next(r for r in rows if r[0] == "B-C")[5:] == pytest.approx((-36.0, 36.0))
    assert next(r for r in rows if r[0] == "A-B")[5:] == pytest.approx((0.0, 0.0))
    assert Exact(frame).cases["q"].ends[1, 0, MOMENT] != pytest.approx(-36.0)


def test_how_stiffly_a_frame_resists_at_a_free_end() -> None:
    """EA/L along a cantilever, 3 EI/L^3 across it and EI/L against a couple at its tip: common practice."""
    beam = read_frame_text("""
units = "kN m"
materials.m = { E = 200e6 }
sections.s = { I = 1e-4, A = 5e-3 }
joints = { A = [0, 0], B = [4, 0] }
members."A-B" = { section = "s", material = "m" }
supports.A = "fixed"
[loads.q]
apply = [{ joint = "B", force = 1, direction = "down" }]
""")
    found = prepared(beam).support_stiffness[1]
    assert found == pytest.approx((200e6 * 5e-3 / 4, 3 * 2e4 / 64, 2e4 / 4), rel=1e-9)


ZONED = """
units = "kN m"
materials.m = { E = 200e6 }
sections.s = { I = 1e-4, A = 5e-3 }
joints = { A = [0, 0], B = [0, 4], C = [6, 4], D = [6, 0] }
[members]
"A-B" = { section = "s", material = "m", rigid_to = 0.3 }
"B-C" = { section = "s", material = "m", rigid_from = 0.5, rigid_to = 0.25 }
"C-D" = { section = "s", material = "m", rigid_from = 0.4 }
[supports]
A = "fixed"
D = "fixed"
[analysis]
axial = "elastic"
[loads.q]
apply = [{ joint = "B", force = 1, direction = "right" }]
"""


def test_what_a_unit_force_does_at_the_ends_of_members_with_rigid_zones() -> None:
    """Effects, of which suspects are made, against the exact end actions under that force as a load."""
    frame = read_frame_text(ZONED)
    member, end, column = (a.ravel() for a in np.meshgrid(range(3), range(2), range(3), indexing="ij"))
    none = np.full(18, -1)
    places = Places(np.full(18, END), column, member, end, none, np.zeros(18), none)
    joint = list(frame.joints).index("B")
    got = prepared(frame).effects(places).force[:, 3 * joint]
    assert np.allclose(got.reshape(3, 2, 3), Exact(frame).cases["q"].ends, rtol=1e-9, atol=1e-10)


@pytest.mark.parametrize(("start", "expected"), [((-5, -6), (4 / 3, 7 / 3)), ((-5, 6), (2.5, 0)), ((1, 2), (0, 0))])
def test_forces_and_gaps_of_one_way_parts_by_pivoting(start: tuple[float, float], expected: tuple[float, float]) -> None:
    """z >= 0 and w = q + M z >= 0, one of each pair nought, M = (2 1, 1 2): both equations solved; one; none (by hand)."""
    matrix = np.array([[2.0, 1.0], [1.0, 2.0]])
    found = complementary(matrix, np.array(start, dtype=float))
    assert found is not None and found == pytest.approx(expected, abs=1e-12)


TALL = """
units = "kN mm"
materials.m = { E = 200 }
sections.s = { I = 1e14, A = 1e8 }
joints = { A = [0, 0], B = [0, 3e6], C = [4e6, 3e6], D = [4e6, 0], E = [0, 6e6], F = [4e6, 6e6] }
[members]
"A-B" = { section = "s", material = "m" }
"B-C" = { section = "s", material = "m" }
"D-C" = { section = "s", material = "m" }
"B-E" = { section = "s", material = "m" }
"E-F" = { section = "s", material = "m" }
"C-F" = { section = "s", material = "m" }
[supports]
A = "fixed"
D = "pinned"
[analysis]
axial = "elastic"
[loads.q]
apply = [{ joint = "E", force = 7, direction = "right" }, { joint = "B", force = 5, direction = "right" }]
"""


def test_distribution_goes_on_until_sways_are_balanced_however_long_the_lengths_are_in_figures() -> None:
    """A frame of kilometres in millimetres: unbalanced forces are measured by forces, not by moments (a million times)."""
    frame = read_frame_text(TALL)
    said = moment_distribution.opine(frame, study(frame))
    expected = Exact(frame).cases["q"].ends
    size = np.abs(expected).max(axis=(0, 1))
    assert (np.abs(said.cases["q"].ends - expected).max(axis=(0, 1)) <= 1e-11 * size).all()  # type: ignore[union-attr]


def test_the_deflection_of_a_taper_whose_chord_turns_is_greatest_where_distribution_says() -> None:
    """One end settles, so that the chord and not only the axis slopes: no place of a fine row lies lower, and the slope
    there, by a difference of two places beside it, is nought against that of the chord."""
    frame = read_frame_text("""
units = "kN m"
materials.m = { E = 200e6 }
sections = { small = { I = 1e-4, A = 5e-3, depth = 0.2 }, large = { I = 8e-4, A = 1e-2, depth = 0.4 } }
joints = { A = [0, 0], B = [6, 0] }
members."A-B" = { taper = ["small", "large"], material = "m" }
supports = { A = "pinned", B = "roller" }
[loads.q]
apply = [{ member = "A-B", uniform = 10, direction = "down" }, { joint = "B", settlement = { down = 0.004 } }]
""")
    spans = moment_distribution.opine(frame, study(frame)).spans  # type: ignore[union-attr]

    def across(x: np.ndarray) -> np.ndarray:
        return np.asarray(spans.along("q", np.zeros(len(x), dtype=np.int64), x, np.ones(len(x), dtype=np.int64))[:, ACROSS])

    places = spans.turning_points("q")[1]
    lowest = places[np.argmin(across(places))]
    assert across(np.array([lowest]))[0] <= across(np.linspace(0.0, 5.999, 600)).min() < -0.004
    beside = across(lowest + np.array([-1e-3, 1e-3]))
    assert abs(beside[1] - beside[0]) / 2e-3 < 1e-3 * 0.004 / 6


@pytest.mark.parametrize("length", [2.0, 5000.0])
def test_the_error_of_the_rigid_limit_counts_couples_per_length(length: float) -> None:
    """A force 1 that stays, a couple of 0, 0, k at c, 2c, 4c: the limit 8k/3 lies 2k/3 off that of one term (by hand)."""
    couple = 1e-3
    nodes = np.zeros((1, 3))
    made = [Vectors(np.array([[[1.0, 0.0, m], [0.0] * 3]]), nodes, nodes) for m in (0.0, 0.0, couple)]
    limit, error = _rigid_limit(made, length, 1e-3)
    assert limit.pieces[0, 0] == pytest.approx((1.0, 0.0, 8 * couple / 3), rel=1e-12)
    assert error == pytest.approx(2 * couple / 3 / length, rel=1e-9)


def test_displacements_of_an_axially_rigid_frame_are_measured_by_its_members(monkeypatch: pytest.MonkeyPatch) -> None:
    """L^3 / EI of the middle one of three members of 4, 6 and 4 m: displacements far below it times the force are none."""
    frame = read_frame_text(ZONED.replace('axial = "elastic"', 'axial = "rigid"'))
    asked = []

    def heard(at: list[Vectors], length: float, supple: float) -> tuple[Vectors, float]:
        asked.append((length, supple))
        return _rigid_limit(at, length, supple)

    monkeypatch.setattr(results, "_rigid_limit", heard)
    solve_case(frame, load_table(frame, "q"))
    assert asked[0] == pytest.approx((6.0, 64 / 2e4), rel=1e-12)


@pytest.mark.parametrize("off", [-1e-11, 0.0, 1e-11])
def test_a_place_is_found_by_a_distance_just_before_or_after_it(off: float) -> None:
    """The library's values at a load in a member asked for with a trace of rounding: the same as at the load itself."""
    load = '{ joint = "B", force = 1, direction = "right" }, { member = "B-C", force = 5, at = 2, direction = "down" }'
    plain = re.sub(r", rigid_\w+ = [\d.]+", "", ZONED)
    frame = read_frame_text(plain.replace('{ joint = "B", force = 1, direction = "right" }', load))
    solved = solve_case(frame, load_table(frame, "q"))
    found = along(frame, solved, np.array([1]), np.array([2.0 + off]), np.array([1]))[0, 2]
    assert found == pytest.approx(Exact(frame).along("q", [1], [2.0], [1])[0, 2], rel=1e-9)
    last = along(frame, solved, np.array([2]), np.array([4.0 + off]), np.array([-1]))[0, 2]  # the very last place of all
    assert last == pytest.approx(Exact(frame).along("q", [2], [4.0], [-1])[0, 2], rel=1e-9)


def test_places_that_lie_close_together_are_not_parted_by_the_library() -> None:
    """Two loads 1 cm apart on 6 m, a third beyond: the member is divided at the first and at the third."""
    loads = "".join(f'{{ member = "B-C", force = 1, at = {at}, direction = "down" }}, ' for at in (1, 1.01, 4))
    frame = read_frame_text(ZONED.replace("apply = [", f"apply = [{loads}"))
    found = _places(frame, load_table(frame, "q"), 1, None).tolist()
    assert {0.0, 1.0, 4.0, 6.0} <= set(found) and 1.01 not in found


@pytest.mark.parametrize(("supple", "force"), [(5.0, 7.0), (1e3, 2.0), (1e-2, 300.0)])
def test_displacements_that_are_nought_are_measured_by_the_largest_force(supple: float, force: float) -> None:
    """0, 0, e at c, 2c, 4c: 2e/3 off that of one term, against a ten-thousandth of what the force would move."""
    e = 1e-6 * supple * force
    pieces = np.array([[[force, 0.0, 0.0], [0.0] * 3]])
    made = [Vectors(pieces, np.array([[x, 0.0, 0.0]]), np.zeros((1, 3))) for x in (0.0, 0.0, e)]
    assert _rigid_limit(made, 2.0, supple)[1] == pytest.approx(2 * e / 3 / (1e-4 * supple * force), rel=1e-9)


@pytest.mark.parametrize(("cos", "sin", "turned"), [(1.0, 0.0, False), (0.0, 1.0, False), (0.8, 0.6, True)])
def test_a_roller_turned_by_a_right_angle_is_not_a_turned_one_to_the_library(cos: float, sin: float, turned: bool) -> None:
    table = SimpleNamespace(cos=np.array([cos]), sin=np.array([sin]), stiffness=np.array([[FREE, HELD, FREE]]))
    assert _has_turned_roller(SimpleNamespace(support_table=table)) is turned  # type: ignore[arg-type]


WHOLE = """
units = "kN m"
materials.m = { E = 200e6 }
sections.s = { I = 1e-4, A = 5e-3 }
joints = { A = [0, 0], M = [1, 0], B = [4, 0] }
members."A-B" = { section = "s", material = "m" }
supports.A = "fixed"
analysis.order = 2
[loads.q]
apply = [{ joint = "B", force = 3, direction = "down" }]
[loads.w]
apply = [{ member = "A-B", force = 5, at = 1, direction = "down" }]
"""
DIVIDED = WHOLE.replace(
    'members."A-B" =', 'members."A-M" = { section = "s", material = "m" }\nmembers."M-B" ='
).replace('member = "A-B"', 'member = "M-B"')  # fmt: skip


@pytest.mark.parametrize("text", [WHOLE.replace("M = [1, 0], ", ""), DIVIDED], ids=["whole", "divided"])
def test_the_size_by_which_axial_forces_that_are_rounding_are_measured(text: str) -> None:
    """A cantilever pushed across at its tip has no axial force: the shear, which is the load, is what it is measured by."""
    frame = read_frame_text(text)
    for name, shear in (("q", 3.0), ("w", 5.0)):
        trial = _trial(CaseInSecondOrder(frame, load_table(frame, name)), 1.0, np.zeros(len(frame.members)))
        assert trial is not None and trial.size == pytest.approx(shear, rel=1e-9)


def test_pivoting_ends_where_the_artificial_variable_can_leave_with_another() -> None:
    """Three parts without effect on each other, one of them without stiffness: only the third works, by 1/5 (by hand)."""
    found = complementary(np.diag([0.0, 4.0, 5.0]), np.array([0.0, 2.0, -1.0]))
    assert found is not None and found == pytest.approx([0.0, 0.0, 0.2])


@pytest.mark.parametrize("noise", [1e-13, -1e-13])
def test_a_one_way_part_at_rest_is_right_in_place_and_out(noise: float) -> None:
    """By definition: a part works the wrong way where its force is against it, a part that is out where its gap closes."""
    out = np.array([False, False, True, True])
    found = wrong(np.array([noise * 7, -1.0, 0.0, 0.0]), np.array([0.0, 0.0, noise * 0.3, -0.1]), 7.0, 0.3, out)
    assert found.tolist() == [False, True, False, True]


@pytest.mark.parametrize(("step", "rounds"), [(0.1, 2), (0.4, 4)])
def test_a_search_off_the_path_is_given_up(step: float, rounds: int, monkeypatch: pytest.MonkeyPatch) -> None:
    """Each round strays by half the first-order force: more than three steps from where it set out is too far."""
    stray = SimpleNamespace(
        regular=True, by_load=np.zeros(1), gap=np.ones(1), ahead=lambda change: 0.5 * change,
    )  # fmt: skip
    monkeypatch.setattr(balance, "_trial", lambda *_: stray)
    path = object.__new__(balance._Path)
    path.case, path.size = None, 1.0  # type: ignore[assignment]
    assert path._next(balance._Point(np.zeros(2), np.array([0.0, 1.0]), None), step) == (rounds, None)


@pytest.mark.parametrize(("shrinks", "found"), [(0.5, False), (0.1, True)])
def test_first_order_axial_forces_are_started_from_only_where_rounds_close_in(
    shrinks: float, found: bool, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Rounds that only halve what is off may be on their way to another balance: the path is followed then."""
    off = [0.4]

    def trial(*_: object) -> SimpleNamespace:
        off.append(off[-1] * shrinks)
        now = off[-1] if off[-1] > 1e-2 else 0.0
        none = SimpleNamespace(negative_pivots=0)
        return SimpleNamespace(
            equations=none, off=now, stable=True, state="state", gap=np.zeros(1), ahead=lambda change: change, size=1.0
        )

    monkeypatch.setattr(balance, "_trial", trial)
    assert (balance._at_once(None, np.zeros(1)) == "state") is found  # type: ignore[arg-type, comparison-overlap]


@pytest.mark.parametrize(("falls", "part"), [(False, 0.8), (True, 1.0 - np.sqrt(0.2))])
def test_the_whole_load_is_looked_for_where_a_line_or_a_parabola_has_it(falls: bool, part: float) -> None:
    """From 0.6 of the load to 1.1: four fifths of the way by a line, less by a parabola that is level at its end."""
    tried: list[np.ndarray] = []

    def prescribed(place: int, value: float) -> gradual.Answered:
        def answered(balance_taken: np.ndarray) -> np.ndarray:
            tried.append(balance_taken)
            return np.where(np.arange(3) == place, value, balance_taken)

        return answered

    here, top = np.array([0.3, -0.2, 0.6]), np.array([0.8, 0.4, 1.1])
    gradual._whole(prescribed, 0, here, top, falls)
    assert tried[0] == pytest.approx(here + part * (top - here), rel=1e-12)


def test_a_vertex_is_looked_for_between_the_balances_beside_it() -> None:
    """What goes with the value asked for is guessed from the two known balances that it lies between, by a line."""
    def balance_at(value: float) -> np.ndarray:
        return np.array([value, 0.5 * value**2, 0.9 - 0.4 * (value - 2.0) ** 2 - 0.2 * (value - 2.0) ** 3])

    known = {x: balance_at(x) for x in (1.0, 1.9, 3.4)}
    guessed: list[tuple[float, float]] = []

    def prescribed(place: int, value: float) -> gradual.Answered:
        def answered(taken: np.ndarray) -> np.ndarray:
            if value not in known:
                at = sorted(known)
                guessed.append((float(taken[1]), float(np.interp(value, at, [known[x][1] for x in at]))))
                known[value] = balance_at(value)
            return balance_at(value)

        return answered

    gradual._vertex(prescribed, 0, list(known.values()))
    assert len(guessed) > 3
    assert [g for g, _ in guessed] == pytest.approx([line for _, line in guessed], rel=1e-9)


@pytest.mark.parametrize("outer", [(1.0, 1.9, 3.4), (0.5, 2.4, 2.6), (1.5, 1.6, 2.6), (2.4, 2.3, 1.2)])
def test_the_greatest_load_is_found_by_few_balances(outer: tuple[float, float, float]) -> None:
    """Of a cubic whose greatest value is 0.9 at 2 by definition: to a few ten-millionths, by at most eight balances."""
    asked: list[float] = []

    def balance_at(value: float) -> np.ndarray:
        return np.array([value, 0.9 - 0.4 * (value - 2.0) ** 2 - 0.2 * (value - 2.0) ** 3])

    def prescribed(place: int, value: float) -> gradual.Answered:
        asked.append(value)
        return lambda _: balance_at(value)

    found = gradual._vertex(prescribed, 0, [balance_at(x) for x in outer])
    assert found[-1] == pytest.approx(0.9, abs=3e-7) and len(asked) <= 8
    assert all(min(outer) < value < max(outer) for value in asked)


TURNED = """
units = "kN m"
materials.m = { E = 200e6 }
sections = { s = { I = 1e-4, A = 5e-3, depth = 0.3 }, t = { I = 1e-4, A = 5e-3, depth = 0.3 } }
joints = { A = [0, 0], B = [6, 0] }
members."A-B" = { section = "s", material = "m" }
supports = { A = "fixed", B = { y = "held" } }
analysis.order = 1
[loads.q]
apply = [
  { joint = "B", force = 300, direction = "left" }, { member = "A-B", uniform = 20, direction = "along" },
  { member = "A-B", varying = [-9, 15], direction = "across" },
]
"""


@pytest.mark.parametrize("opinion", [slope_deflection, moment_distribution], ids=["slope-deflection", "distribution"])
@pytest.mark.parametrize("order", [1, 2])
@pytest.mark.parametrize("last", [15, 14])
def test_shear_is_greatest_where_the_load_changes_sign(last: int, order: int, opinion: ModuleType) -> None:
    """At 6 * 9 / 24 m, though the range from 1.8 to 2.4 m is looked at just there, and at 6 * 9 / 23 m; with loads along
    the member besides."""
    frame = read_frame_text(TURNED.replace("order = 1", f"order = {order}").replace("15]", f"{last}]"))
    spans = opinion.opine(frame, study(frame)).spans
    assert np.abs(spans.turning_points("q")[1] - 54 / (9 + last)).min() < 1e-9


@pytest.mark.parametrize("opinion", [slope_deflection, moment_distribution], ids=["slope-deflection", "distribution"])
@pytest.mark.parametrize("order", [1, 2])
@pytest.mark.parametrize("section", ['section = "s"', 'taper = ["s", "t"]'])
def test_a_simple_span_is_lowest_in_the_middle(section: str, order: int, opinion: ModuleType) -> None:
    """Where its slope is looked at too; with a joint's rigid zone the middle is none of the tenths of the length."""
    text = TURNED.replace('section = "s"', f"rigid_from = 0.31, {section}").replace('"fixed"', '"pinned"')
    text = text[: text.index("apply")] + 'apply = [{ member = "A-B", uniform = 9, direction = "down", start = 0.31 }]\n'
    frame = read_frame_text(text.replace("order = 1", f"order = {order}"))
    spans = opinion.opine(frame, study(frame)).spans
    x = np.linspace(0.0, 6.0, 4001)
    none = np.zeros(len(x), dtype=np.int64)
    lowest = x[np.argmin(spans.along("q", none, x, np.where(x < 6.0, 1, -1))[:, ACROSS])]
    assert np.abs(spans.turning_points("q")[1] - lowest).min() < 2e-3


def test_moments_along_members_under_a_unit_force_are_read_as_they_are_told() -> None:
    """Effects at places along members, of which suspects are made, against the moments along them under that load."""
    frame = read_frame_text(ZONED)
    member, x = np.array([0, 1, 1, 2]), np.array([1.3, 0.7, 4.0, 2.2])
    none = np.full(4, -1)
    places = Places(np.full(4, SPAN), np.full(4, 2), member, none, none, x, np.ones(4, dtype=np.int64))
    got = prepared(frame).effects(places).force[:, 3 * list(frame.joints).index("B")]
    said = slope_deflection.opine(frame, study(frame))
    along = said.spans.along("q", member, x, np.ones(4, dtype=np.int64))[:, MOMENT]  # type: ignore[union-attr]
    assert got == pytest.approx(along, rel=1e-9)


def test_pieces_of_some_members_with_their_properties_by_factors() -> None:
    text = TURNED.replace("B = [6, 0] }", "B = [6, 0], C = [9, 0] }").replace('section = "s"', 'taper = ["s", "t"]')
    text = text.replace("[loads.q]", 'members."B-C" = { taper = ["t", "s"], material = "m" }\n[loads.q]', 1)
    text = text.replace("analysis.order = 1\n", "", 1)
    thicker = "t = { I = 7e-4, A = 9e-3, depth = 0.6"
    v = read_frame_text(text.replace("t = { I = 1e-4, A = 5e-3, depth = 0.3", thicker)).variation
    found = _each_varied(v, np.array([1, 0, 1]), np.array([2.0, 1.0, 3.0]), np.array([5.0, 1.0, 0.5]))
    assert found.member.tolist() == [0, 1, 2]
    again = v.I[[1, 0, 1]], v.A[[1, 0, 1]], v.depth[[1, 0, 1]]
    assert found.I / again[0] == pytest.approx(np.array([[2.0, 2.0], [1.0, 1.0], [3.0, 3.0]]))
    assert found.A / again[1] == pytest.approx(np.array([[5.0, 5.0], [1.0, 1.0], [0.5, 0.5]]))
    assert (found.depth == again[2]).all()


@pytest.mark.parametrize("opinion", [slope_deflection, moment_distribution], ids=["slope-deflection", "distribution"])
def test_what_shear_adds_to_the_deflection_behind_a_point_load(opinion: ModuleType) -> None:
    """Of a simple span: F a (L - x) / (L G As) where the load stands at a before x; by difference to rigid in shear."""
    text = TURNED.replace('"fixed"', '"pinned"').replace("E = 200e6", "E = 200e6, G = 80e6")
    text = text.replace("depth = 0.3", "depth = 0.3, shear_area = 2e-3")
    text = text[: text.index("apply")] + 'apply = [{ member = "A-B", force = 50, at = 1.5, direction = "down" }]\n'
    across = []
    for shear in ("elastic", "rigid"):
        frame = read_frame_text(text.replace("analysis.order = 1", f'analysis.shear = "{shear}"'))
        x = np.array([2.0, 3.7, 5.5])
        none = np.zeros(3, dtype=np.int64)
        across.append(opinion.opine(frame, study(frame)).spans.along("q", none, x, none + 1)[:, ACROSS])
    assert across[1] - across[0] == pytest.approx(50 * 1.5 * (6 - x) / (6 * 80e6 * 2e-3), rel=1e-9)


def test_a_slope_that_changes_sign_from_one_stretch_to_the_next_is_level_there() -> None:
    """Two members: slopes -1, -1, 1 and -1, 1 on their stretches, plus chords that change neither; and one that does."""
    stretches = SimpleNamespace(
        member=np.array([0, 0, 0, 1, 1]), start=np.array([0.0, 1.0, 3.0, 0.0, 2.5]), length=np.array([1.0, 2, 1, 2.5, 2])
    )
    slope = np.zeros((5, 4))
    slope[:, 0] = -1, -1, 1, -1, 1
    bent = SimpleNamespace(stretches=stretches, slope=slope)
    member, x = Bent.level(bent, np.array([0.5, -0.5]))  # type: ignore[arg-type]
    assert (member.tolist(), x.tolist()) == ([0, 1], [3.0, 2.5])
    assert Bent.level(bent, np.array([1.5, 0.0]))[0].tolist() == [1]  # type: ignore[arg-type]


@pytest.mark.parametrize("opinion", [slope_deflection, moment_distribution], ids=["slope-deflection", "distribution"])
@pytest.mark.parametrize("section", ['section = "s"', 'taper = ["s", "t"]'])
def test_second_order_without_axial_forces_is_first_order(section: str, opinion: ModuleType) -> None:
    """By definition; of a propped member that is soft in shear and warmer on one side, ends and deflection."""
    text = TURNED.replace("E = 200e6", "E = 200e6, G = 80e6, alpha = 1e-5").replace('section = "s"', section)
    text = text.replace("s = { I = 1e-4, A = 5e-3, depth = 0.3", "s = { I = 1e-4, A = 5e-3, depth = 0.3, shear_area = 2e-4")
    text = text.replace("t = { I = 1e-4, A = 5e-3, depth = 0.3", "t = { I = 8e-4, A = 9e-3, depth = 0.6, shear_area = 3e-4")
    loads = '{ member = "A-B", varying = [-9, 15], direction = "across" }, { member = "A-B", difference = 40 }'
    text = text[: text.index("apply")] + f"apply = [{loads}]\n"
    x = np.array([0.7, 2.0, 3.7, 5.5])
    none = np.zeros(4, dtype=np.int64)
    found = []
    for order in (1, 2):
        frame = read_frame_text(text.replace("analysis.order = 1", f'analysis = {{ order = {order}, shear = "elastic" }}'))
        said = opinion.opine(frame, study(frame))
        across = said.spans.along("q", none, x, none + 1)[:, ACROSS]
        found.append(np.concatenate([said.cases["q"].ends[..., 1:].ravel(), across]))
    assert found[1] == pytest.approx(found[0], rel=1e-8)


def test_the_peak_of_the_path_is_looked_for_between_two_points_of_it() -> None:
    """Load 0.9 - (s - 0.3)^2 over the arc s: from 0.1 to 0.7 along a direction that has all of the arc."""
    path, steps = object.__new__(balance._Path), []

    def point(s: float) -> balance._Point:
        return balance._Point(np.array([s, 0.9 - (s - 0.3) ** 2]), np.array([1.0, -2 * (s - 0.3)]), None)

    def ahead(here: balance._Point, step: float) -> tuple[int, balance._Point]:
        steps.append(step)
        return 1, point(float(here.at[0]) + step)

    path._next = ahead  # type: ignore[method-assign, assignment]
    low = balance._Point(np.array([0.1, 0.86]), np.array([1.0, 0.0]), None)
    found = path._peak(low, point(0.7))
    assert found is not None and found.share == pytest.approx(0.9, abs=1e-6)
    assert steps[0] == pytest.approx(0.3) and all(0.0 < step < 0.6 for step in steps)  # at first half way


def test_the_critical_load_of_rigid_members_is_that_of_no_softness(monkeypatch: pytest.MonkeyPatch) -> None:
    """A factor that is too small by as much as the members standing in for rigid ones are soft: none is left of it."""
    case = object.__new__(CaseInSecondOrder)
    case.rigid, case.firm, case.stretch_stiffness = np.array([True]), 1e6, np.array([1e6])  # type: ignore[misc]
    monkeypatch.setattr(CaseInSecondOrder, "_compressed", lambda *_: True)
    monkeypatch.setattr(CaseInSecondOrder, "_least_factor", lambda self, *_: 3.0 * (1 - 1e3 / self.firm))
    assert case.critical_factor(np.array([-1.0])) == pytest.approx(3.0, rel=1e-12)


@pytest.mark.parametrize(("share", "zone"), [(10, 5.4), (40, 3.6), (30, 4.2), (70, 1.8)])
def test_a_piece_that_ends_at_a_face_leaves_no_sliver(share: int, zone: float) -> None:
    """Distances that differ by rounding alone: 10% of 6 m and 6 - 5.4 m, and others."""
    text = STEPPED.replace('"40%"', f'"{share}%"').replace('"100%"]]', f'"100%"]], rigid_to = {zone}')
    frame = read_frame_text(text)
    size = cut_up(members(frame), load_table(frame, "q")).size
    assert ((size == 0.0) | (size > 1e-6)).all() and (size > 1e-6).sum() == 2


def test_why_no_state_of_one_way_parts_is_in_balance_is_told_of_the_first_tried(monkeypatch: pytest.MonkeyPatch) -> None:
    """The first is what the case asks for; the others are guesses after it."""
    def judged(self: object, table: object, out: object, past: list[object]) -> None:
        past.extend(["first", "second"])

    monkeypatch.setattr(DisplacedOneWay, "_judged", judged)
    monkeypatch.setattr(displaced_one_way, "search", lambda first, judge, most: judge(first))
    monkeypatch.setattr(displaced_one_way, "_why", lambda case: f"why the {case}")
    frame = read_frame_text(SLACK)
    one_way = SimpleNamespace(frame=frame, first=lambda table: np.zeros(1, dtype=bool), none_found="none")
    assert DisplacedOneWay(one_way).settled("q") == "why the first"  # type: ignore[arg-type]


def test_what_is_out_of_a_state_is_told_by_number() -> None:
    """Members before supports: a rod and two supports that can only push, of which the last joint's is out."""
    text = SLACK.replace('A = "fixed"', 'A = { x = "held", y = "push", rotation = "held" }')
    text = text.replace('D = "fixed"', 'D = { x = "held", y = "push", rotation = "held" }')
    parts = distribution_one_way.one_way_parts(read_frame_text(text))
    for out in (frozenset({2}), frozenset({0, 1}), frozenset({1}), frozenset({0, 2})):
        assert parts.out_of(parts.state(out)) == out
    assert parts.state(frozenset({2})).out_supports == {("D", "y")}


@pytest.mark.parametrize(("push", "off"), [(15900.0, False), (16100.0, True)])
def test_a_member_shears_off_under_its_shear_stiffness(push: float, off: bool) -> None:
    """G shear_area of the weaker piece: 80e6 times 2e-4."""
    frame = read_frame_text(STEPPED[: STEPPED.index("apply")] + "apply = []\n")
    m = members(frame)
    assert parts_needed(m, cut_up(m, load_table(frame, "q")), np.array([-push]))[1] is off


def test_of_what_is_wrong_the_worst_is_changed_first() -> None:
    """Parts 1 and 0 are wrong, in this order, in a frame that does not stand: the first of them changed, all is right."""
    asked: list[frozenset[int]] = []

    def tried(out: frozenset[int]) -> distribution_one_way.Judged[str]:
        asked.append(out)
        return distribution_one_way.Judged((), "found") if out == {1} else distribution_one_way.Judged((1, 0), None)

    found = distribution_one_way._worst_first(frozenset(), tried, {})
    assert found is not None and found.found == "found" and asked == [frozenset(), frozenset({1})]


@pytest.mark.parametrize("direction", [0, 90, 40])
def test_a_tie_to_a_joint_on_a_turned_roller(direction: str) -> None:
    """Both opinions, and the joints' displacements along the tie are the same."""
    text = ZONED.replace('D = "fixed"', 'D = { y = "held", rotation = "held", angle = 25 }').replace(
        "[supports]", f'[ties]\nt = {{ joints = ["B", "D"], direction = {direction} }}\n[supports]'
    )
    frame = read_frame_text(text)
    one, other = (o.opine(frame, study(frame)).cases["q"] for o in (slope_deflection, moment_distribution))
    assert other.ends == pytest.approx(one.ends, rel=1e-9, abs=1e-9)
    assert other.joints == pytest.approx(one.joints, rel=1e-9, abs=1e-12)
    along = one.joints[:, :2] @ [np.cos(np.radians(direction)), np.sin(np.radians(direction))]
    assert along[1] == pytest.approx(along[3], rel=1e-8) and abs(along[1]) > 1e-9


def test_marks_that_miss_a_place_by_rounding_are_that_place() -> None:
    """Of two members of 4 m: the one at 1 m has a place, those at 2.5 m and on the other member have none beside them."""
    some = SimpleNamespace(
        length=np.array([4.0, 4.0]), mark_member=np.array([0, 0, 1]), mark_x=np.array([1.0 + 1e-14, 2.5, 1.0])
    )
    member, x = Varying.marks_beside(some, np.array([0, 0, 1, 1]), np.array([1.0, 3.0, 0.0, 4.0]))  # type: ignore[arg-type]
    assert (member.tolist(), x.tolist()) == ([0, 1], [2.5, 1.0])


@pytest.mark.parametrize("critical_at", [0.3, 0.9, 1.0, 1.7, 2.5, 2.9, 5.1])
def test_a_critical_load_is_bracketed(critical_at: float) -> None:
    low, high = critical._bracket(SimpleNamespace(stable=lambda factor: factor < critical_at))  # type: ignore[arg-type]
    assert low < critical_at <= high <= 2 * low


def test_a_solution_is_improved_by_what_it_leaves_over() -> None:
    """With factors of a matrix a ten-thousandth too large, the error of one ten-thousandth becomes its square."""
    matrix = sparse.csc_array(np.array([[4.0, 1.0], [1.0, 3.0]]))
    factor = splu(sparse.csc_matrix(1.0001 * matrix.toarray()))
    right = np.array([1.0, -2.0])
    found = _refined(factor, matrix, right, "N")
    assert found == pytest.approx(np.linalg.solve(matrix.toarray(), right), rel=1e-7)


STEPPED = TURNED.replace("E = 200e6", "E = 200e6, G = 80e6").replace(
    'section = "s"', 'profile = [["s", "40%"], ["t", "100%"]]'
).replace("s = { I = 1e-4, A = 5e-3, depth = 0.3", "s = { I = 1e-4, A = 5e-3, depth = 0.3, shear_area = 3e-4").replace(
    "t = { I = 1e-4, A = 5e-3, depth = 0.3", "t = { I = 1e-4, A = 5e-3, depth = 0.3, shear_area = 2e-4"
).replace("analysis.order = 1", 'analysis.shear = "elastic"')  # fmt: skip


@pytest.mark.parametrize("opinion", [slope_deflection, moment_distribution], ids=["slope-deflection", "distribution"])
def test_the_axis_has_a_kink_where_shear_strain_jumps(opinion: ModuleType) -> None:
    """At a step of the shear area by a half, 2.4 m along: a place where the deflection may be greatest."""
    frame = read_frame_text(STEPPED)
    slope = []
    spans = opinion.opine(frame, study(frame)).spans
    x = np.array([2.4 - 2e-4, 2.4 - 1e-4, 2.4 + 1e-4, 2.4 + 2e-4])
    none = np.zeros(4, dtype=np.int64)
    across = spans.along("q", none, x, none + 1)[:, ACROSS]
    slope = np.diff(across)[[0, 2]] / 1e-4
    shear = float(spans.along("q", none[:1], np.array([2.4]), none[:1] + 1)[0, 1])
    assert slope[1] - slope[0] == pytest.approx(-shear * (1 / 2e-4 - 1 / 3e-4) / 80e6, rel=1e-2)
    if opinion is moment_distribution:  # slope-deflection takes the place up only where the slope changes sign there
        assert np.abs(spans.turning_points("q")[1] - 2.4).min() < 1e-9


# --- the audit


def test_a_taper_is_cut_in_equal_ratios_of_its_depth() -> None:
    """From 0.2 to 1.0 over 3 m, beginning 1 m along the member: four cuts, for 1.5^3 < 5 < 1.5^4 (by hand)."""
    variation = SimpleNamespace(depth=np.array([[0.2, 1.0]]), start=np.array([1.0]), end=np.array([4.0]))
    marks = _depth_marks(SimpleNamespace(variation=variation), 0, 1.0, 4.0)  # type: ignore[arg-type]
    depth = 0.2 + 0.8 * (np.concatenate([[1.0], marks, [4.0]]) - 1.0) / 3.0
    assert len(marks) == 3 and depth[1:] / depth[:-1] == pytest.approx([5**0.25] * 4) and CHANGE >= 5**0.25


def test_heights_that_hardly_differ_are_one_level() -> None:
    """A column 5 mm lower than two others of 10 m, less than a thousandth of the frame's height: no storey between."""
    text = ZONED.replace("B = [0, 4], C = [6, 4]", "B = [0, 10.005], C = [6, 10.005], E = [12, 10], F = [12, 0]")
    for member in ("C-E", "E-F"):
        text = text.replace("[supports]", f'"{member}" = {{ section = "s", material = "m" }}\n[supports]')
    frame = read_frame_text(text.replace("[supports]", '[supports]\nF = "fixed"'))
    found = [(where, above.tolist()) for where, above in storeys(frame)]
    assert found == [("y = 0 to 10", [False, True, True, True, False, False])]


@pytest.mark.parametrize(("at_end", "expected"), [(0, -2 * 0.2 - 7), (1, -3 * 0.15 + 9)])
def test_what_loads_on_a_rigid_zone_put_on_its_face(at_end: int, expected: float) -> None:
    """Force times its distance from the face, and couples as they are: what stands beyond the face does not count."""
    point = np.array([
        [0.3, 0, -2, 0, 0], [0.4, 0, 0, -7, 0], [3, 0, -5, 4, 0], [5.9, 0, -3, 0, 0], [5.95, 0, 0, -9, 0],
    ])  # fmt: skip
    found = zone_moment(Pieces(point, np.zeros((0, 7))), np.array([6.0]), np.array([(0.5, 0.25)[at_end]]), at_end)
    assert found == pytest.approx([expected], rel=1e-12)


def test_what_a_claim_lacks_is_told_by_quantity() -> None:
    """Axial forces alone of a portal fixed at both feet: three redundants leave shears, moments and reactions open."""
    frame = read_frame_text(ZONED)
    ends = Exact(frame).cases["q"].ends
    axial = np.where(np.arange(3) == 0, ends, np.nan)
    none = np.full((4, 3), np.nan)
    said = compatibility(frame, "q", CaseAnswer(axial, none, none)).not_judged
    lacking = [s.split(" of ")[1].split(" are ")[0] for s in said if "neither given" in s]
    shear = np.where(np.arange(3) == 1, np.nan, ends)
    assert "end moment" in lacking and "axial force" not in lacking
    assert not any("neither" in s for s in compatibility(frame, "q", CaseAnswer(shear, none, none)).not_judged)


@pytest.mark.parametrize("force", [1.0, 1e-9])
def test_the_bound_on_right_results_is_rounding_however_small_the_load(force: float) -> None:
    frame = read_frame_text(ZONED.replace("force = 1,", f"force = {force},"))
    exact = Exact(frame).cases["q"]
    values = CaseAnswer(exact.ends, exact.joints, exact.reactions)
    bound = hypercircle(frame, compatibility(frame, "q", values), values)
    assert isinstance(bound, ForceBound) and bound.energy < 1e-9 * bound.size


def test_a_spring_that_gives_too_much_in_the_claimed_displacements_is_named() -> None:
    """Results of a spring a third as stiff: told by joint and direction, with what the stated one would give, a third."""
    springy = ZONED.replace('D = "fixed"', 'D = { x = "held", y = 3000, rotation = "held" }')
    softer = Exact(read_frame_text(springy.replace("3000", "1000"))).cases["q"]
    claim = CaseAnswer(softer.ends, softer.joints, softer.reactions)
    wrong = [c for c in compatibility(read_frame_text(springy), "q", claim).displaced if not c.ok]
    assert [(c.kind, c.where, c.direction) for c in wrong] == [("support", "D", "y")]
    assert wrong[0].rotation == pytest.approx(softer.joints[3, 1] / 3, rel=1e-9)


@pytest.mark.parametrize(("spread", "sign"), [(False, -1), (True, 1)])
def test_displacements_along_a_support_turned_by_thirty_degrees(spread: bool, sign: int) -> None:
    """(3, -2) or roundings (3, 2) along axes turned counter-clockwise; of roundings, the most that they may add up to."""
    table, cos = SimpleNamespace(cos=np.array([np.sqrt(0.75)]), sin=np.array([0.5])), np.sqrt(0.75)
    system = SimpleNamespace(frame=SimpleNamespace(support_table=table))
    got = _own_axes(system, np.array([[3.0, 2.0 * sign, 5.0]]), spread)  # type: ignore[arg-type]
    assert got[0] == pytest.approx([3 * cos + sign, sign * (1.5 + 2 * cos), 5], rel=1e-12)


@pytest.mark.parametrize(("axis", "expected"), [("x", 3 * np.sqrt(0.75) - 1), ("y", -1.5 - 2 * np.sqrt(0.75))])
def test_the_force_of_a_one_way_direction_of_a_turned_support(axis: str, expected: float) -> None:
    """Reactions (3, -2) along axes turned counter-clockwise by thirty degrees."""
    frame = read_frame_text(f"""
units = "kN m"
materials.m = {{ E = 200e6 }}
sections.s = {{ I = 1e-4, A = 5e-3 }}
joints = {{ A = [0, 0], B = [6, 0] }}
members."A-B" = {{ section = "s", material = "m" }}
supports = {{ A = "fixed", B = {{ x = "held", y = "held", {axis} = "push", angle = 30 }} }}
[loads.q]
apply = []
[analysis]
axial = "elastic"
""".replace(f'{axis} = "held", ', ""))
    value = np.zeros(12)
    value[[int(reaction_index(1, 1, c)) for c in (0, 1)]] = 3.0, -2.0
    done = SimpleNamespace(value=value, half_width=np.zeros(12))
    (part,) = one_way.parts(frame, load_table(frame, "q"), done, 0.0)  # type: ignore[arg-type]
    assert (part.axis, part.force) == (axis, pytest.approx(expected, rel=1e-12))


def test_the_bound_on_rounding_of_large_frames_is_never_less_than_the_interval_of_small_ones(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    """By Cauchy's inequality: the norm of the roundings times that of what carries them."""
    frame = read_frame_text(ZONED)
    exact = Exact(frame).cases["q"]
    values = CaseAnswer(exact.ends, exact.joints, exact.reactions)
    half = CaseAnswer(*(np.full(v.shape, 5e-4) for v in (values.ends, values.joints, values.reactions)))
    interval = compatibility(frame, "q", values, half).fit.allowed  # type: ignore[union-attr]
    monkeypatch.setattr(fit, "DENSE_ROWS", 0)
    bound = compatibility(frame, "q", values, half).fit.allowed  # type: ignore[union-attr]
    assert (interval > 0).any() and (bound >= 0.999 * interval).all()


def test_the_rounding_of_a_slack_rod_s_own_force_lets_its_length_be_off() -> None:
    """By L/EA times so much: 5 m of 4 cm2 of steel (the diagonal of 3 m by 4 m)."""
    frame = read_frame_text(SLACK)
    said = slope_deflection.opine(frame, study(frame)).cases["q"]  # type: ignore[union-attr]
    system = compatibility(frame, "q", said).fit
    assert system is not None and system.frame.out_members == {"down"}
    k, shift = frame.member_index["down"], np.zeros(12)
    more = system.rounding.copy()
    more[3 * k + 2] += 7.0
    (one,), (other,) = (gaps(s, "q", shift) for s in (system, replace(system, rounding=more)))
    assert other.allowed - one.allowed == pytest.approx(7.0 * 5 / (200e6 * 4e-4), rel=1e-6)
    shift[3 * frame.joint_index["B"]] = 0.01  # to the right, three fifths of it along the rod
    assert abs(gaps(system, "q", shift)[0].reach - one.reach) == pytest.approx(0.006, rel=1e-9)


def test_the_bound_on_each_value_is_as_wide_as_it_is_made_safe(monkeypatch: pytest.MonkeyPatch) -> None:
    """All that a bound is made of, but for rounding, is multiplied by what makes it safe: twice that, twice the bound."""
    frame = read_frame_text(ZONED)
    other = Exact(read_frame_text(ZONED.replace("D = \"fixed\"", "D = \"pinned\"")))
    wrong = CaseAnswer(other.cases["q"].ends, other.cases["q"].joints, other.cases["q"].reactions)
    found = []
    for safe in (1.0, 2.0):
        monkeypatch.setattr(bound, "SAFE", safe)
        of = hypercircle(frame, compatibility(frame, "q", wrong), wrong)
        assert isinstance(of, ForceBound)
        found.append(of.moment)
    assert (found[0] > 1e-3).all() and found[1] == pytest.approx(2 * found[0], rel=1e-6)


def test_conditions_of_members_and_joints_are_kept_apart() -> None:
    """Each member and each joint is a block of its own: what one block completes, another may be judged by."""
    frame = read_frame_text(ZONED)
    found = equations(frame, "q")
    at_joint = np.isin(found.kind, [JOINT, FREE_SUPPORT])
    owner = np.where(at_joint, len(frame.members) + found.place, found.place)
    assert (found.block == owner).all() and len(set(found.block.tolist())) == len(frame.members) + len(frame.joints)


@pytest.mark.parametrize("member", ["A-B", "B-C", "C-D"])
def test_a_length_that_does_not_fit_is_found_by_member(member: str) -> None:
    """Results of a frame with one member 2 mm too long, against the frame without: the whole misfit, and its size."""
    too_long = ZONED.replace("apply = [{", f'apply = [{{ member = "{member}", misfit = 0.002 }}, {{')
    other = Exact(read_frame_text(too_long)).cases["q"]
    found = compatibility(read_frame_text(ZONED), "q", CaseAnswer(other.ends, other.joints, other.reactions))
    (own,) = [s for s in signatures(found).entries if (s.kind, s.where) == ("length", member)]
    assert own.share == pytest.approx(1.0, abs=1e-9) and abs(own.size) == pytest.approx(0.002, rel=1e-6)


@pytest.mark.parametrize("ends", ['taper = ["s", "t"]', 'taper = ["t", "s"]'])
@pytest.mark.parametrize("word", [REVERSED, LIGHT, DEEP])
def test_a_taper_taken_as_another_is_found_by_its_whole_misfit(word: str, ends: str) -> None:
    """Results of the frame with the thick end at the other joint, or with the thin or the thick section all along."""
    text = ZONED.replace("sections.s =", "sections.t = { I = 9e-4, A = 9e-3, depth = 0.6 }\nsections.s =")
    text = text.replace("A = 5e-3 }", "A = 5e-3, depth = 0.3 }", 1)
    turned = 'taper = ["t", "s"]' if ends == 'taper = ["s", "t"]' else 'taper = ["s", "t"]'
    taken = {REVERSED: turned, LIGHT: 'section = "s"', DEEP: 'section = "t"'}[word]
    frame, other = (read_frame_text(text.replace('"B-C" = { section = "s"', f'"B-C" = {{ {t}')) for t in (ends, taken))
    said = slope_deflection.opine(other, study(other)).cases["q"]  # type: ignore[union-attr]
    best = signatures(compatibility(frame, "q", said)).entries
    (own,) = [s for s in best if (s.kind, s.where, s.direction) == ("profile", "B-C", word)]
    assert own.share == pytest.approx(1.0, abs=1e-6) and own.size == pytest.approx(1.0, rel=1e-4)


def test_a_support_that_gives_the_one_way_that_a_rigid_member_leaves_is_sized() -> None:
    """A strut at forty-five degrees, rigid along itself: its pinned end can only give across, here by 5000 kN/m."""
    text = """
units = "kN m"
materials.m = { E = 200e6 }
sections.s = { I = 1e-4, A = 5e-3 }
joints = { A = [0, 0], J = [3, 3] }
members."A-J" = { section = "s", material = "m" }
supports = { A = "fixed", J = "pinned" }
[analysis]
axial = "rigid"
[loads.q]
apply = [{ member = "A-J", force = 10, at = 2, direction = "across" }]
"""
    frame = read_frame_text(text)
    other = read_frame_text(text.replace('J = "pinned"', 'J = { x = "held", y = 5000, angle = 45 }'))
    said = slope_deflection.opine(other, study(other)).cases["q"]  # type: ignore[union-attr]
    found = signatures(compatibility(frame, "q", said, None, study(frame).undetermined)).entries
    (own,) = [s for s in found if (s.kind, s.where, s.direction) == ("support", "J", "x and y")]
    assert own.share == pytest.approx(1.0, abs=1e-9) and own.fitted == pytest.approx(5000, rel=1e-6)


SLACK = """
units = "kN m"
materials.m = { E = 200e6 }
sections = { post = { I = 1e-4, A = 5e-3 }, rod = { I = 1e-9, A = 4e-4 } }
joints = { A = [0, 0], B = [0, 4], C = [3, 4], D = [3, 0] }
[members]
"A-B" = { section = "post", material = "m" }
"B-C" = { section = "post", material = "m" }
down = { from = "D", to = "B", section = "rod", material = "m", hinge = "both", only = "tension" }
"D-C" = { section = "post", material = "m" }
[supports]
A = "fixed"
D = "fixed"
[loads.q]
apply = [{ joint = "B", force = 30, direction = "right" }]
[analysis]
axial = "elastic"
"""

BOX = """
units = "kN m"
materials.m = { E = 200e6 }
sections.s = { I = 1e-4, A = 5e-3 }
joints = { A = [0, 0], B = [0, 4], C = [6, 4], D = [6, 0] }
[members]
"A-B" = { section = "s", material = "m" }
"B-C" = { section = "s", material = "m" }
"C-D" = { section = "s", material = "m" }
"D-A" = { section = "s", material = "m" }
[supports]
A = "pinned"
D = { y = "held" }
[loads.q]
apply = [{ joint = "B", force = 7, direction = "right" }]
"""


@pytest.mark.parametrize("more", [0.0, 1.0])
def test_joints_of_a_ring_without_moments_are_balanced_together(more: float) -> None:
    """All eight end moments missing: four joints and four members leave one condition, that shear times length adds up to
    nought. A shear 1 kN too large over 4 m is 4 kNm, or 4 / sqrt(8) by the norm, on the longest of 6 m (by hand)."""
    frame = read_frame_text(BOX)
    exact = Exact(frame).cases["q"]
    ends = exact.ends.copy()
    ends[..., MOMENT], ends[0, :, 1] = np.nan, ends[0, :, 1] + more
    found = compatibility(frame, "q", CaseAnswer(ends, exact.joints, exact.reactions)).balance
    (check,) = [c for c in found.checks if c.check == TOGETHER_CHECK]
    assert check.ok is (more == 0.0) and check.where == "A, B, C, D"
    assert abs(check.residual) == pytest.approx(4 * more / np.sqrt(8) / 6, rel=1e-9, abs=1e-9)


def test_the_effect_of_sway_is_the_same_however_large_its_figures() -> None:
    """A column that carries 100 kN and is pushed aside by 10: in newtons the moments are a thousand times the figures, and
    a millionth if all is a millionth."""
    text = """
units = "kN m"
materials.m = { E = 200e6 }
sections.s = { I = 1e-4, A = 5e-3 }
joints = { A = [0, 0], B = [0, 4] }
members."A-B" = { section = "s", material = "m" }
supports.A = "fixed"
[loads.q]
apply = [{ joint = "B", force = 10, direction = "right" }, { joint = "B", force = 100, direction = "down" }]
"""
    newtons = text.replace("kN m", "N m").replace("200e6", "200e9").replace("= 10,", "= 10e3,").replace("= 100,", "= 1e5,")
    faint = text.replace("200e6", "200").replace("= 10,", "= 1e-5,").replace("= 100,", "= 1e-4,")
    moments = []
    for one in (text, newtons, faint):
        answer = prepared(read_frame_text(one)).sway_answer(["q"])
        assert answer is not None
        moments.append(answer.cases["q"].ends[0, 0, MOMENT])
    # P d / L more shear on d = H L^3 / (3 EI) (1 - P L^2 / (3 EI))^-1: M = H L / (1 - P L^2 / (3 EI)) (by hand).
    assert abs(moments[0]) == pytest.approx(40 / (1 - 100 * 16 / (3 * 2e4)), rel=1e-9)
    assert moments[1:] == pytest.approx([1000 * moments[0], 1e-6 * moments[0]], rel=1e-9)


# --- the comparison

HELD_FAST = """
units = "kN m"
materials.m = { E = 200e6, alpha = 1e-5 }
sections.s = { I = 1e-4, A = 5e-3, depth = 0.3 }
joints = { A = [0, 0], B = [4, 0] }
members."A-B" = { section = "s", material = "m" }
supports = { A = "fixed", B = "fixed" }
analysis.axial = "elastic"
[loads.q]
"""


def test_moments_of_full_restraint_add_up_sinking_and_turning() -> None:
    """6 EI / L^2 times the sinking and 4 EI / L times the turn of one end (slope-deflection): EI = 2e4 kN m2, 4 m."""
    frame = read_frame_text(HELD_FAST + 'apply = [{ joint = "B", settlement = { down = 0.01, rotation = 0.002 } }]\n')
    found = full_restraint(frame, load_table(frame, "q"))
    assert found.moments == pytest.approx(2e4 * (6 * 0.01 / 16 + 4 * 0.002 / 4), rel=1e-12)
    assert found.displacements == pytest.approx(0.01 + 0.002 * 4, rel=1e-12)  # the turn carried over the longest member


def test_displacements_of_full_restraint_count_the_curvature_of_temperature() -> None:
    """alpha dT / depth over the longest member squared: 1e-5 30 / 0.3 on 4 m."""
    frame = read_frame_text(HELD_FAST + 'apply = [{ member = "A-B", difference = 30 }]\n')
    found = full_restraint(frame, load_table(frame, "q"))
    assert found.displacements == pytest.approx(1e-3 * 16, rel=1e-12)
    assert found.moments == pytest.approx(2e4 * 1e-3, rel=1e-12)


def test_forces_of_full_restraint_are_those_of_the_strain() -> None:
    """EA (misfit + movement) / L of a member that may shorten: 1e6 kN (0.002 + 0.001) / 4."""
    loads = '{ member = "A-B", misfit = 0.002 }, { joint = "B", settlement = { down = 0.001 } }'
    frame = read_frame_text(HELD_FAST + f"apply = [{loads}]\n")
    assert full_restraint(frame, load_table(frame, "q")).forces == pytest.approx(1e6 * 0.003 / 4, rel=1e-12)


@pytest.mark.parametrize(("rule", "runs"), [
    ("frame", [1, 1, 1, 1, 1, 1]), ("reversed", [-1] * 6), ("rightward", [1, -1, 1, -1, 1, -1]),
    ("leftward", [-1, 1, -1, 1, -1, 1]), ("downward", [1, -1, -1, 1, 1, -1]),
])  # fmt: skip
def test_which_way_members_run_by_a_rule(rule: str, runs: list[int]) -> None:
    """Right, left, up, down, to the upper right, to the lower left: upright ones run up, or down where the rule says so."""
    ways = np.array([[1, 0], [-1, 0], [0, 1], [0, -1], [0.6, 0.8], [-0.8, -0.6]])
    table = SimpleNamespace(cos=ways[:, 0], sin=ways[:, 1])
    found = member_runs(SimpleNamespace(member_table=table), rule)  # type: ignore[arg-type]
    assert found.tolist() == runs


def test_a_place_near_a_point_load_is_meant_at_it() -> None:
    """Loads at 1, 2 and 5 m of two members of 6 m; places are printed to a centimetre."""
    places = [("B-C", 1, "down"), ("B-C", 2, "down"), ("B-C", 5, "down"), ("C-D", 3, "right")]
    loads = [f'{{ member = "{m}", force = 1, at = {at}, direction = "{way}" }}, ' for m, at, way in places]
    frame = read_frame_text(ZONED.replace("apply = [", "apply = [" + "".join(loads)))
    x = np.array([0.996, 1.004, 2.004, 1.996, 4.997, 5.004, 1.02, 3.003, 2.997, 1.003])
    member = np.array([1, 1, 1, 1, 1, 1, 1, 2, 2, 0])
    found = at_jumps(frame, member, x, np.full(len(x), 0.005))
    assert found.tolist() == [1, 1, 2, 2, 5, 5, 1.02, 3, 3, 1.003]


@pytest.mark.parametrize(("kind", "quantity", "words"), [
    ("reaction", "fy", "on the frame, up"), ("displacement", "dx", "right"), ("end", "axial", "tension"),
])  # fmt: skip
def test_a_direction_that_is_said_in_words_is_told_as_such(kind: str, quantity: str, words: str) -> None:
    """Positive is what the words say: up, right, tension."""
    (only,) = conventions(SimpleNamespace(kind=kind, quantity=quantity, said=True))  # type: ignore[arg-type]
    assert words in only.words and only.sign == 1


@pytest.mark.parametrize(("table", "row", "place"), [
    ("joints", (2, 1), ("joints", "dy", "C", "")), ("reactions", (3, 0), ("reactions", "fx", "D", "")),
    ("ends", (1, 1, 2), ("member_ends", "moment", "C", "B-C")), ("ends", (2, 0, 0), ("member_ends", "axial", "C", "C-D")),
])  # fmt: skip
def test_where_opinions_differ_is_told_by_name(table: str, row: tuple[int, ...], place: tuple[str, str, str, str]) -> None:
    frame = read_frame_text(ZONED)
    one = slope_deflection.opine(frame, study(frame))
    other = moment_distribution.opine(frame, study(frame))
    values = getattr(other.cases["q"], table).copy()  # type: ignore[union-attr]
    values[row] += 0.3 * np.nanmax(np.abs(values))
    changed = replace(other, cases={"q": replace(other.cases["q"], **{table: values})})  # type: ignore[union-attr, type-var]
    found = Comparison(frame, {"slope-deflection": one, "moment-distribution": changed}).judge("q")  # type: ignore[dict-item]
    assert [(d.place.of, d.place.quantity, d.place.joint, d.place.member or "") for d in found.differences] == [place]


def test_of_how_many_values_a_claim_is_judged() -> None:
    """Three members' six end actions, four joints' three displacements, two supports' three reactions; six are claimed."""
    frame = read_frame_text(ZONED)
    said = slope_deflection.opine(frame, study(frame)).cases["q"]  # type: ignore[union-attr]
    rows = [f"B-C\t{joint}\t" + "\t".join(f"{v:.6g}" for v in said.ends[1, e]) for e, joint in enumerate("BC")]
    text = "\n".join(["Load case: q", "Member\tJoint\tN [kN]\tV [kN]\tM [kNm]", *rows])
    (case,) = check.verify(frame, read_claim_text(text, FrameNames.of(frame)), suspects=False).cases
    assert (case.compared, case.of, case.verdict) == (6, 3 * 6 + 4 * 3 + 2 * 3, "agree")


def test_reactions_along_a_turned_support_s_axes_in_global_ones() -> None:
    """3.0 and 2.0 along axes turned by thirty degrees, each within a half of its last digit: what may be lost adds up."""
    frame = read_frame_text(ZONED.replace('D = "fixed"', 'D = { x = "held", y = "held", rotation = "held", angle = 30 }'))
    reading = read_claim_text("Load case: q\nJoint\tFx [kN]\tFy [kN]\nD\t3.0\t2.0\n", FrameNames.of(frame))
    found = {e.quantity: e.number for e in in_global_axes(list(reading.entries), frame) or ()}
    cos, sin = np.sqrt(0.75), 0.5
    assert (found["fx"].value, found["fy"].value) == pytest.approx((3 * cos - 2 * sin, 3 * sin + 2 * cos))
    assert (found["fx"].half, found["fy"].half) == pytest.approx((0.05 * (cos + sin), 0.05 * (cos + sin)))


def test_of_units_that_fit_alike_the_frame_s_own_are_taken() -> None:
    own_force, own_arm = UnitChoice("kN", 1.0, True), UnitChoice("m", 1.0, True)
    force, arm = UnitChoice("N", 1e-3, False), UnitChoice("mm", 1e-3, False)
    trial = SimpleNamespace(batch=SimpleNamespace(quantity="moment"), best=lambda unit: SimpleNamespace(misses=0))
    (found,) = _one_system([trial], [force, own_force], [arm, own_arm]).values()  # type: ignore[list-item]
    assert found is not None and (found.text, found.own) == ("kN m", True)


def test_a_way_of_reading_that_two_values_tell_is_asked_for() -> None:
    """Of one member: axial forces and shears are alike at the joints and at the faces of its zones, both moments not."""
    frame = read_frame_text(ZONED)
    said = slope_deflection.opine(frame, study(frame))
    ends = said.cases["q"].ends[1].copy()  # type: ignore[union-attr]
    x, side = np.array([0.0, 0.5, 5.75, 6.0]), np.array([1, 1, -1, -1])
    at = said.spans.along("q", np.ones(4, dtype=np.int64), x, side)[:, MOMENT]  # type: ignore[union-attr]
    ends[0, 2], ends[1, 2] = at[1] * np.sign(ends[0, 2] / at[0]), at[2] * np.sign(ends[1, 2] / at[3])
    rows = [f"B-C\t{joint}\t" + "\t".join(f"{v:.6g}" for v in ends[e]) for e, joint in enumerate("BC")]
    text = "\n".join(["Load case: q", "Member\tJoint\tN [kN]\tV [kN]\tM [kNm]", *rows])
    found = check.verify(frame, read_claim_text(text, FrameNames.of(frame)), suspects=False)
    assert found.verdict == "undecided"
    assert any("but only 2 values tell that" in reason for reason in found.undecided), (found.verdict, found.undecided)


def test_an_extreme_of_the_frame_is_measured_by_a_tenth_of_the_case_at_least() -> None:
    """Extremes of 1 and -0.5 where the case's moments are of the size of 50; and of 20, which is more than a tenth."""
    batch = SimpleNamespace(quantity="moment", member=np.array([-1, -1]), joint=np.array([-1, -1]))
    reference = SimpleNamespace(
        extremes_of=lambda quantity, member, joint: np.array([[1.0, -0.5], [20.0, -3.0]]),
        scales=SimpleNamespace(of=lambda quantity: 50.0),
    )
    found = _extreme_scale(batch, np.array([True, True]), reference)  # type: ignore[arg-type]
    assert found.tolist() == [5.0, 20.0]
