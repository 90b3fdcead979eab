"""Second order: the opinions against each other, against many short elements, and against what is known exactly."""

from __future__ import annotations

import math
import re
from collections.abc import Iterator
from dataclasses import replace

import numpy as np
import pytest
from scipy.special import jv

from crosscheck.answer import ACROSS, MOMENT, Answer, Silent
from crosscheck.frame.kinematics import study
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import Combination, Frame
from crosscheck.frame.needs import with_analysis
from crosscheck.frame.reader import read_frame_text
from crosscheck.frame.stations import stations
from crosscheck.opinions import library, moment_distribution, slope_deflection
from crosscheck.opinions.moment_distribution.members import members
from crosscheck.opinions.moment_distribution.pieces import cut
from crosscheck.opinions.moment_distribution.second_order import critical_load_factor
from crosscheck.opinions.moment_distribution.stretches import Axial, bow, divide, parts_needed
from crosscheck.problems import UnusableInput
from tests.agreement import apart
from tests.gives_way import Bearing
from tests.many_elements import ManyElements
from tests.random_frames import random_frame

OWN = 1e-8
BLOCKS, BLOCK, APART = 12, 25, 60
"""300 frames that have a balance: 25 from every 60 seeds on."""
LOADED = "loaded"
PAST = "past its critical load"
BEYOND = re.compile(rf"{PAST}: .* beyond ([\d.]+) of the load$")


def second(frame: Frame) -> Frame | None:
    """The frame in second order, axially elastic where a rigid one leaves open what it needs; None where it cannot be."""
    for axial in (None, "elastic"):
        try:
            changed = with_analysis(frame, axial=axial, order=2)
            study(changed)
            return changed
        except UnusableInput:
            continue
    return None


def loaded(seed: int) -> tuple[Frame, float] | None:
    """A random frame whose only combination brings it to a share, 0.1 to 0.9, of a critical load, and that share."""
    frame = second(random_frame(seed))
    if frame is None:
        return None
    share = 0.1 + 0.8 * ((seed * 0.6180339887498949) % 1.0)
    for name in frame.names:
        factor = share * critical_load_factor(frame, name)
        if math.isfinite(factor):
            parts = frame.combinations[name].factors if name in frame.combinations else {name: 1.0}
            times = Combination(LOADED, {case: factor * f for case, f in parts.items()})
            return replace(frame, combinations={LOADED: times}), share
    return None


def loaded_frames(first: int) -> Iterator[tuple[int, Frame, float]]:
    for seed in range(first, first + APART):
        found = loaded(seed)
        if found is not None:
            yield (seed, *found)


def distributed(frame: Frame) -> Answer:
    given = moment_distribution.opine(frame, study(frame), [LOADED])
    assert isinstance(given, Answer)
    return given


# --- against each other ------------------------------------------------------------------------------


@pytest.mark.parametrize("block", range(BLOCKS))
def test_opinions_agree_up_to_near_the_critical_load(block: int) -> None:
    """In ends, joints, reactions and stations. Where the axial forces change so much as the frame gives way that it has
    no stable balance left, both say so and beyond what share of the load; many elements, followed from no load on, come to
    the same balance, or to the same share and no further."""
    wrong, agreed = [], 0
    for seed, frame, share in loaded_frames(APART * block):
        studied = study(frame)
        answers = [o.opine(frame, studied, [LOADED]) for o in (slope_deflection, moment_distribution)]
        found = difficulty(frame, *answers)
        if found:
            wrong.append((seed, share, found))
        agreed += not any(a.silent for a in answers if isinstance(a, Answer))
        if agreed == BLOCK:
            break
    assert wrong == []
    assert agreed == BLOCK


def difficulty(frame: Frame, one: Answer | Silent, other: Answer | Silent) -> str:
    """What is wrong between the opinions, or between them and many elements; empty where nothing is."""
    assert isinstance(one, Answer) and isinstance(other, Answer)
    said = [a.silent.get(LOADED, "") for a in (one, other)]
    if any(said):
        shares = [BEYOND.match(s) for s in said]
        if not (shares[0] and shares[1]):
            return " | ".join(said)
        a, b = (float(s[1]) for s in shares if s)
        if abs(a - b) > 2e-4 * max(a, b):
            return f"given way at {a} | {b}"
        errors = [abs(Bearing(frame, LOADED, parts).borne()[0] - a) / a for parts in (4, 8)]
        return "" if errors[0] < 0.05 and (errors[1] < 2e-4 or errors[1] < errors[0] / 3) else f"{a}, elements {errors}"
    difference, where = apart(frame, one, other, partial=True)
    if difference > OWN:
        return f"{difference:.1e} {where}"
    borne, axial = Bearing(frame, LOADED, 4).borne()
    given = one.cases[LOADED].ends[:, 0, 0]
    force = max(np.nanmax(np.abs(one.cases[LOADED].ends[..., :2])), 1e-300)
    off = float(np.nanmax(np.abs(axial - given), initial=0.0)) / force
    return "" if borne == 1.0 and off < 0.02 else f"elements bear {borne:.4g}, axial forces off by {off:.1e}"


def times(frame: Frame, factor: float) -> Frame:
    """The frame under so many times its load."""
    parts = frame.combinations[LOADED].factors
    return replace(frame, combinations={LOADED: Combination(LOADED, {case: factor * f for case, f in parts.items()})})


def both(frame: Frame) -> tuple[list[Answer], list[str]]:
    """The answers of both opinions, and why they are silent."""
    answers = [o.opine(frame, study(frame), [LOADED]) for o in (slope_deflection, moment_distribution)]
    given = [a for a in answers if isinstance(a, Answer)]
    return given, [a.silent.get(LOADED, "") for a in given]


@pytest.mark.parametrize("seed", [0, 1, 5, 7, 9, 13, 15, 18, 28, 33])
def test_no_answer_beyond_the_critical_load(seed: int) -> None:
    """At 1.001 of the critical load there is none; at 0.999 the opinions agree as far as a stiffness a thousand times
    smaller lets them, or both say beyond what share the frame gives way."""
    found = loaded(seed)
    assert found is not None
    frame, share = found
    _, said = both(times(frame, 1.001 / share))
    assert said == [f"{PAST}: the critical load factor is 0.999"] * 2
    near = times(frame, 0.999 / share)
    answers, said = both(near)
    if any(said):
        shares = [BEYOND.match(s) for s in said]
        assert all(shares), said
        one, other = (float(s[1]) for s in shares if s)
        assert one == pytest.approx(other, rel=2e-4) and 0.0 < one <= 1.0
    else:
        assert apart(near, *answers, partial=True)[0] < 1e-6


@pytest.mark.parametrize("seed", [4, 22, 132, 144, 145, 199, 495])
def test_no_answer_beyond_the_load_at_which_a_frame_gives_way(seed: int) -> None:
    """These frames have a critical load factor well above 1 and no balance under their load: axial forces change as they
    give way, until the load falls or (144, 495) a member buckles. Just below that load both answer, just above neither."""
    found = loaded(seed)
    assert found is not None
    frame, _ = found
    share = BEYOND.match(both(frame)[1][0])
    assert share is not None and critical_load_factor(frame, LOADED) > 1.1
    most = float(share[1])
    below, above = times(frame, 0.999 * most), times(frame, 1.001 * most)
    answers, said = both(below)
    assert said == ["", ""]
    assert apart(below, *answers, partial=True)[0] < 1e-6
    shares = [BEYOND.match(s) for s in both(above)[1]]
    assert [float(s[1]) for s in shares if s] == pytest.approx([1 / 1.001] * 2, rel=2e-4)


# --- against many elements ---------------------------------------------------------------------------

CHECKED = (0, 5, 9, 14, 15, 16, 17, 23, 25, 30, 32, 33, 35)


def falls(frame: Frame, coarse: float, fine: float) -> bool:
    """Whether the error falls as it should from 4 to 12 elements: with the fourth power of their length (81 times), or
    the second with shear strain (9 times); less where loads cut the elements unevenly. Nothing can fall where the
    members hardly bend between their joints and both are exact but for rounding."""
    return max(coarse, fine) < 1e-8 or fine < coarse / (5 if frame.analysis.shear == "elastic" else 12)


def largest_error(frame: Frame, answer: Answer, parts: int) -> float:
    """Of many elements under the opinion's axial forces: axial forces, end actions and displacements, in shares of the
    largest of each."""
    case, check = answer.cases[LOADED], ManyElements(frame, LOADED, parts)
    axial = np.nan_to_num(case.ends[:, 0, 0])
    moved, found = check.solve(axial)
    known = np.isfinite(case.ends[:, 0, 0])
    check.results(moved, axial)
    pairs = [(axial[known], found[known])]
    pairs += [(case.ends[..., k], check.ends[..., k]) for k in (1, 2)]
    pairs += [(case.joints[:, :2], check.joints[:, :2]), (case.joints[:, 2], check.joints[:, 2])]
    force = max(np.nanmax(np.abs(check.ends[:, :, :2])), np.abs(check.right[: 3 * len(frame.joints)]).max())
    size = [force, force, np.abs(check.ends[..., 2]).max(), np.abs(check.joints[:, :2]).max()]
    size.append(max(np.abs(check.joints[:, 2]).max(), size[3] / frame.member_table.length.max()))
    errors = [np.nanmax(np.abs(a - b), initial=0.0) / s for (a, b), s in zip(pairs, size, strict=True) if s]
    return float(max(errors))


@pytest.mark.parametrize("seed", CHECKED)
def test_many_elements_converge_to_the_answer(seed: int) -> None:
    found = loaded(seed)
    assert found is not None
    frame, _ = found
    answer = distributed(frame)
    coarse, fine = (largest_error(frame, answer, parts) for parts in (4, 12))
    assert coarse < 0.1
    assert falls(frame, coarse, fine)


@pytest.mark.parametrize("seed", CHECKED)
def test_many_elements_converge_to_the_critical_load_factor(seed: int) -> None:
    """From above: the cubic is stiffer than the member."""
    found = loaded(seed)
    assert found is not None
    frame, share = found
    exact = critical_load_factor(frame, LOADED)
    assert exact == pytest.approx(1 / share, rel=1e-9)
    coarse, fine = (ManyElements(frame, LOADED, parts).critical / exact - 1 for parts in (4, 12))
    assert fine > 0.0 and falls(frame, coarse, fine)


# --- members -----------------------------------------------------------------------------------------

BEAM = """
title = "member"
units = "kN m"
[analysis]
axial = "{axial}"
shear = "{shear}"
order = 2
[materials.m]
E = 1
G = 1
[sections.s]
I = 1
A = 1000
shear_area = 40
[joints]
A = [0, 0]
B = [1, 0]
[members]
AB = {{ from = "A", to = "B", section = "s", material = "m"{ends} }}
[supports]
A = "fixed"
B = {{ x = "free", y = "held", rotation = "held" }}
[loads.dead]
apply = [{loads}]
"""


def beam(loads: str, axial: str = "rigid", shear: str = "rigid", ends: str = "") -> Frame:
    return read_frame_text(BEAM.format(loads=loads, axial=axial, shear=shear, ends=ends))


def stiffness(axial: float, shear: str = "rigid", loads: str = "", ends: str = "") -> tuple[np.ndarray, int]:
    """(3, 3) and the count of buckled modes of one member."""
    frame = beam(loads or '{ joint = "B", force = 1, direction = "right" }', shear=shear, ends=ends)
    m, table = members(frame), load_table(frame, "dead")
    parts, _ = parts_needed(m, cut(m.table, table), np.array([axial]))
    bowed = bow(m, divide(m, table, parts), Axial(np.array([axial])))
    return bowed.stiffness[0], int(bowed.buckled[0])


@pytest.mark.parametrize("axial", [-35.0, -12.3, -1.0, -1e-9, 0.0, 1e-9, 1.0, 40.0, 900.0])
def test_stability_functions(axial: float) -> None:
    """The closed forms of Livesley and Chandler for one member without load along it."""
    z = np.sqrt(complex(-axial))
    if abs(axial) < 1e-6:
        near, far = 4.0, 2.0
    else:
        below = 2 * (1 - np.cos(z)) - z * np.sin(z)
        near, far = ((z * (np.sin(z) - z * np.cos(z)) / below).real, (z * (z - np.sin(z)) / below).real)
    both = near + far
    exact = [[near, far, -both], [far, near, -both], [-both, -both, 2 * both + axial]]
    found, buckled = stiffness(axial)
    assert found == pytest.approx(np.array(exact), rel=1e-10, abs=1e-9 * max(1.0, near))
    assert buckled == 0


@pytest.mark.parametrize(("pressure", "count"), [(39.0, 0), (40.0, 1), (80.0, 1), (81.0, 2), (158.0, 3)])
def test_a_member_buckled_between_held_ends_is_counted(pressure: float, count: int) -> None:
    """Roots of sin(z/2) (z/2 cos(z/2) - sin(z/2)): 4 pi^2 = 39.478, 80.763, 16 pi^2 = 157.91."""
    assert stiffness(-pressure)[1] == count


def test_shear_by_engesser() -> None:
    """A pinned member's critical load is P / (1 + P / G A) of the Euler load P (Engesser 1891)."""
    frame = read_frame_text(
        BEAM.format(loads='{ joint = "B", force = 1, direction = "left" }', axial="rigid", shear="elastic", ends="")
        .replace('A = "fixed"', 'A = "pinned"').replace('rotation = "held"', 'rotation = "free"')
    )  # fmt: skip
    assert critical_load_factor(frame, "dead") == pytest.approx(math.pi**2 / (1 + math.pi**2 / 40), rel=1e-9)


def test_a_mast_under_its_own_weight() -> None:
    """q L^3 / EI = 9/4 j^2, j the first zero of the Bessel function of order -1/3 (A. G. Greenhill 1881)."""
    mast = BEAM.format(loads='{ member = "AB", uniform = 1, direction = "down" }', axial="rigid", shear="rigid", ends="")
    mast = mast.replace("B = [1, 0]", "B = [0, 1]").replace('B = { x = "free", y = "held", rotation = "held" }', "")
    j = 1.866350858873895
    assert abs(jv(-1 / 3, j)) < 1e-12
    frame = read_frame_text(mast)
    assert critical_load_factor(frame, "dead") == pytest.approx(9 / 4 * j * j, rel=1e-9)
    given = moment_distribution.opine(frame, study(frame))
    assert isinstance(given, Answer) and "dead" in given.cases


LOADS_ALONG = """{ member = "AB", uniform = 6, direction = "left" },
{ member = "AB", force = 3, at = 0.3, direction = 215 },
{ member = "AB", varying = [2, 9], direction = 250, start = 0.2, end = 0.9 },
{ member = "AB", couple = 0.7, at = 0.61 }, { joint = "B", force = 4, direction = "left" }"""


@pytest.mark.parametrize(
    ("near", "far"),
    [
        ("", ""), ("", ', hinge = "to"'), (", spring_from = 3", ", rigid_to = 0.1"),
        (', rigid_from = 0.15, hinge = "from"', ""),
    ],
)
def test_a_joint_within_a_member_changes_nothing(near: str, far: str) -> None:
    """The axial force varies along the member, and the same member in two gives the same ends and the same curve."""
    whole = beam(LOADS_ALONG.replace("\n", " "), ends=near + far, shear="elastic")
    given = moment_distribution.opine(whole, study(whole))
    other = slope_deflection.opine(whole, study(whole))
    assert isinstance(given, Answer) and isinstance(other, Answer)
    assert apart(whole, given, other)[0] < 1e-10
    text = BEAM.format(loads="@", axial="rigid", shear="elastic", ends="")
    text = text.replace("B = [1, 0]", "B = [1, 0]\nC = [0.45, 0]")
    line = text[text.index("AB = {") : text.index("[supports]")]
    two = f'AC = {{ from = "A", to = "C", section = "s", material = "m"{near} }}\n'
    two += f'CB = {{ from = "C", to = "B", section = "s", material = "m"{far} }}\n'
    split = """{ members = ["AC", "CB"], uniform = 6, direction = "left" },
      { member = "AC", force = 3, at = 0.3, direction = 215 }, { member = "CB", couple = 0.7, at = 0.16 },
      { member = "AC", varying = [2, 4.5], direction = 250, start = 0.2, end = 0.45 },
      { member = "CB", varying = [4.5, 9], direction = 250, start = 0, end = 0.45 },
      { joint = "B", force = 4, direction = "left" }"""
    halves = read_frame_text(text.replace(line, two).replace("@", split))
    parts = moment_distribution.opine(halves, study(halves))
    assert isinstance(parts, Answer)
    one, both = given.cases["dead"].ends, parts.cases["dead"].ends
    assert both[0, 0] == pytest.approx(one[0, 0], rel=1e-10, abs=1e-10)
    assert both[1, 1] == pytest.approx(one[0, 1], rel=1e-10, abs=1e-10)
    middle = given.spans.along("dead", np.array([0]), np.array([0.45]), np.array([1]))[0]
    assert both[1, 0, MOMENT] == pytest.approx(middle[MOMENT], rel=1e-9, abs=1e-10)
    assert parts.cases["dead"].joints[2, 1] == pytest.approx(middle[ACROSS], rel=1e-9, abs=1e-12)


def test_turning_points_are_where_the_values_turn() -> None:
    found = loaded(14)
    assert found is not None
    frame, _ = found
    given = distributed(frame)
    member, x = given.spans.turning_points(LOADED)
    at = stations(frame)
    values = given.spans.along(LOADED, at.member, at.x, at.side)
    turns = given.spans.along(LOADED, member, x, np.ones(len(x), dtype=np.int64))
    step = 1e-4 * frame.member_table.length[member]
    beside = [given.spans.along(LOADED, member, x + s * step, np.ones(len(x), dtype=np.int64)) for s in (-1, 1)]
    size = np.nanmax(np.abs(values), axis=0)
    # One of shear, moment and across is level there: it changes by the square of the step.
    level = [np.minimum(*(np.abs(b - turns)[:, k] for b in beside)) < 1e-6 * size[k] for k in (1, 2, 3)]
    assert len(x) > 3 and np.all(level[0] | level[1] | level[2])


# --- the frame as a whole ----------------------------------------------------------------------------


def test_small_loads_give_first_order() -> None:
    frame = random_frame(5)
    small = replace(frame, combinations={LOADED: Combination(LOADED, dict.fromkeys(frame.cases, 1e-6))})
    one = moment_distribution.opine(small, study(small), [LOADED])
    two = distributed(with_analysis(small, order=2))
    assert isinstance(one, Answer)
    assert 0.0 < apart(small, one, two, partial=True)[0] < 1e-5


PORTAL = """
title = "portal"
units = "kN m"
[analysis]
axial = "{axial}"
order = 2
[materials.m]
E = 1
[sections.s]
I = 1
A = 1e4
[joints]
A = [0, 0]
B = [0, 1]
C = [1, 1]
D = [1, 0]
[members]
A-B = {{ section = "s", material = "m" }}
B-C = {{ section = "s", material = "m" }}
D-C = {{ section = "s", material = "m" }}
{further}
[supports]
A = "{foot}"
D = "{foot}"
[loads.light]
apply = [{{ joints = ["B", "C"], force = 1, direction = "down" }}, {{ joint = "B", force = 0.1, direction = "right" }}]
[loads.heavy]
apply = [{{ joints = ["B", "C"], force = 10, direction = "down" }}]
"""


def portal(axial: str = "rigid", foot: str = "fixed", further: str = "") -> Frame:
    return read_frame_text(PORTAL.format(axial=axial, foot=foot, further=further))


@pytest.mark.parametrize("opinion", [moment_distribution, slope_deflection])
def test_past_the_critical_load_there_is_no_result_and_the_others_are_given(opinion: object) -> None:
    frame = portal()
    given = opinion.opine(frame, study(frame))  # type: ignore[attr-defined]
    assert list(given.cases) == ["light"]
    assert given.silent == {"heavy": "past its critical load: the critical load factor is 0.7379"}


def test_an_axial_force_that_second_order_needs_and_a_rigid_frame_leaves_open_is_refused() -> None:
    """A brace from joint to joint that turns with the sway, or bends under a load of its own; not one that stays
    straight between joints held still."""
    tie = '"A-D" = { section = "s", material = "m", hinge = "both" }'
    assert study(portal(further=tie)).undetermined.axial.tolist() == [False, False, False, True]
    held = 'braces = { from = "B", to = "D", section = "s", material = "m", hinge = "both" }\n"A-C" = ' + tie[8:]
    with pytest.raises(UnusableInput, match=r'axial force of A-B, B-C.* undetermined; use axial = "elastic"'):
        study(portal(further=held))
    assert not study(portal("elastic", further=held)).undetermined.axial.any()


def test_the_tie_between_still_joints_changes_nothing() -> None:
    tie = '"A-D" = { section = "s", material = "m", hinge = "both" }'
    tied, plain = portal(further=tie), portal()
    for opinion in (moment_distribution, slope_deflection):
        one, other = opinion.opine(tied, study(tied)), opinion.opine(plain, study(plain))
        assert isinstance(one, Answer) and isinstance(other, Answer)
        assert one.cases["light"].ends[:3] == pytest.approx(other.cases["light"].ends, rel=1e-10, abs=1e-11)
        assert np.isnan(one.cases["light"].ends[3, :, 0]).all()


def test_the_library_abstains() -> None:
    frame = portal("elastic")
    given = library.opine(frame, study(frame))
    assert isinstance(given, Silent) and "second-order" in given.why


def test_an_unloaded_case_is_all_zero() -> None:
    frame = portal()
    idle = replace(frame, combinations={LOADED: Combination(LOADED, {"light": 0.0})})
    case = distributed(idle).cases[LOADED]
    assert not case.ends.any() and not case.joints.any() and not case.reactions.any()


def test_working_adds_up() -> None:
    """Shares at a joint make 1, end moments are the sum of their parts and those of the answer; a case past its critical
    load says so."""
    frame = portal("elastic", foot="pinned")
    repeated, factors, moments = moment_distribution.working(frame, study(frame), "light")
    assert repeated.rows[-1][3] <= 1e-12  # type: ignore[operator]
    shares = [row[4] for row in factors.rows if row[0] == "B"]
    assert sum(shares) == pytest.approx(1.0)  # type: ignore[arg-type]
    given = moment_distribution.opine(frame, study(frame))
    assert isinstance(given, Answer)
    for joint, member, *parts, final in moments.rows:
        m = frame.member_index[str(member)]
        end = list(frame.joints)[frame.member_table.ends[m, 1]] == joint
        assert final == pytest.approx(sum(parts), abs=1e-12)  # type: ignore[arg-type]
        assert final == pytest.approx(given.cases["light"].ends[m, int(end), MOMENT], abs=1e-12)
    (told,) = moment_distribution.working(frame, study(frame), "heavy")
    assert told.remarks[0].startswith(PAST)
