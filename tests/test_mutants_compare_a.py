"""Tests that mutants of crosscheck/compare asked for: each was let through by every other test (python -m tests.mutation).

Named after what they hold; checked by hand values or definitions said at each.
"""

from __future__ import annotations

from types import SimpleNamespace

import numpy as np
import pytest

from crosscheck import check
from crosscheck.claims import FrameNames, read_claim_text
from crosscheck.compare import closing
from crosscheck.compare.claim import ClaimComparison, Enveloped
from crosscheck.compare.envelopes import envelope_spans
from crosscheck.compare.fit import _moment_unit, _Trial
from crosscheck.compare.fit_conventions import Convention, conventions, distance
from crosscheck.compare.fit_signs import _explained, senses
from crosscheck.compare.fit_stations import _score, _unit_of, at_jumps
from crosscheck.compare.fit_units import UnitChoice
from crosscheck.compare.fit_variants import in_global_axes, moments_of_members
from crosscheck.compare.printouts import _difference
from crosscheck.compare.tolerance import CLAIM, case_scales
from crosscheck.frame.kinematics import study
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import Frame
from crosscheck.frame.reader import read_frame_text
from crosscheck.opinions import slope_deflection

PORTAL = """
units = "kN m"
materials.m = { E = 200e6 }
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
apply = [{ joint = "B", force = 100, direction = "right" }]
"""
LOADS = "".join(
    f'{{ member = "{m}", force = 1, at = {at}, direction = "{way}" }}, '
    for m, at, way in [("B-C", 1, "down"), ("B-C", 2, "down"), ("B-C", 5, "down"), ("C-D", 3, "right")]
)
LOADED = PORTAL.replace("apply = [", "apply = [" + LOADS)


def test_a_place_between_two_point_loads_is_meant_at_the_nearer() -> None:
    """Loads at 1, 2 and 5 m of a member of 6 m; 1.3 is nearer to 1 and 1.7 to 2, both within 0.8 of either."""
    frame = read_frame_text(LOADED)
    found = at_jumps(frame, np.array([1, 1]), np.array([1.3, 1.7]), np.array([0.8, 0.8]))
    assert found.tolist() == [1, 2]


def test_places_beside_point_loads_from_either_side() -> None:
    """Without printed rounding, 1e-4 of the length (6e-4 and 4e-4 m) is what coordinates may be off."""
    frame = read_frame_text(LOADED)
    x = np.array([1.0005, 0.9995, 2.0005, 1.9995, 4.9995, 5.0005, 2.9997, 3.0003, 1.0007, 3.0005])
    found = at_jumps(frame, np.array([1, 1, 1, 1, 1, 1, 2, 2, 1, 2]), x, np.zeros(len(x)))
    assert found.tolist() == [1, 1, 2, 2, 5, 5, 3, 3, 1.0007, 3.0005]


def test_the_unit_of_distances_is_that_in_which_members_end() -> None:
    """The last stations, 6 and 4, stand at the ends of members of 6 and 4 m."""
    frame = read_frame_text(PORTAL)
    entries = [
        SimpleNamespace(member=m, origin=None, reach=None, run=1, at=at)
        for m, at in [("B-C", 0.0), ("B-C", 6.0), ("C-D", 2.0), ("C-D", 4.0)]
    ]
    found = _unit_of(entries, frame)  # type: ignore[arg-type]
    assert found is not None and found.text == "m" and found.factor == 1.0


@pytest.mark.parametrize(("last", "score"), [((6.0, 4.0), 2), ((6.0, 3.0), 1), ((6.0, 5.0), -1), ((7.0, 5.0), -2)])
def test_how_well_a_unit_of_distances_fits(last: tuple[float, float], score: int) -> None:
    """Members of 6 and 4 that end where they should, less both where any station lies beyond its member's end."""
    parts = [(name, None, None, 1) for name in "ab"]
    assert _score(dict(zip(parts, last, strict=True)), dict(zip(parts, (6.0, 4.0), strict=True)), 1.0) == score


def test_printouts_may_differ_by_a_change_of_units() -> None:
    """1e-12 of the larger value: 1e-6 of a million."""

    def said(value: float) -> SimpleNamespace:
        return SimpleNamespace(
            case="q", kind="end", quantity="moment", member="B-C", joint="B", at=None, value=value, half_digit=0.0,
            extreme=None, line=1,
        )  # fmt: skip

    assert _difference(said(1e6), said(1e6 + 5e-7)) is None  # type: ignore[arg-type]
    found = _difference(said(1e6), said(1e6 + 3e-6))  # type: ignore[arg-type]
    assert found is not None and found.allowed == pytest.approx(1e-6, rel=1e-9)


def test_a_value_is_too_coarse_beside_its_scale() -> None:
    """Half of the last digit, 2, is less than a twentieth of 100 but more than a twentieth of 20."""
    plain = Convention("", 1, "frame", "")
    trial = SimpleNamespace(
        batch=SimpleNamespace(unsigned=np.zeros(2, dtype=bool)), unsupported=np.zeros(2, dtype=bool),
        scale=np.array([100.0, 20.0]), tolerance=CLAIM,
    )  # fmt: skip
    value, said = np.array([90.0, 19.0]), np.array([[50.0], [9.0]])
    found = _Trial._choice(trial, None, plain, said, None, value, np.full(2, 2.0))  # type: ignore[arg-type]
    assert found.bad.tolist() == [True, False]


def test_the_unit_of_moments_is_force_times_arm() -> None:
    found = _moment_unit(UnitChoice("N", 1e-3, False), UnitChoice("mm", 1e-3, False))
    assert found.factor == pytest.approx(1e-6)
    assert (found.text, found.own) == ("N mm", False)


def test_how_far_a_size_is_from_that_of_an_envelope() -> None:
    """The largest of 3 and -5 in size is 5: 4.5 and -4.5 are a half from it; without that case, 1.5 from 3."""
    for value in (4.5, -4.5):
        claimed = SimpleNamespace(value=value, extreme="size")
        found = Enveloped(claimed, {"a": 3.0, "b": -5.0}, 0.1)  # type: ignore[arg-type]
        assert found.apart(frozenset()) == 0.5
        assert found.apart(frozenset({"b"})) == 1.5


def test_how_many_values_a_case_has() -> None:
    """Three members' six end actions, four joints' three displacements, three supports' three reactions."""
    frame = read_frame_text(PORTAL.replace('D = "fixed"', 'D = "fixed"\nC = "fixed"'))
    answers = {"slope-deflection": slope_deflection.opine(frame, study(frame))}
    assert ClaimComparison(frame, answers, {}, CLAIM)._whole("q") == 18 + 12 + 9  # type: ignore[arg-type]


def _sagging(frame: Frame, share: float) -> str:
    """A claim of bending moments at both ends of every member, `share` of ours: an end moment reversed at each start."""
    ends = slope_deflection.opine(frame, study(frame)).cases["q"].ends  # type: ignore[union-attr]
    rows = [
        f"{m}\t{joint}\t{share * (-1 if e == 0 else 1) * ends[k, e, 2]:.8g}"
        for k, m in enumerate(("A-B", "B-C", "C-D")) for e, joint in enumerate(m.split("-"))
    ]  # fmt: skip
    return "\n".join(["Load case: q", "Member\tJoint\tM [kNm]", *rows])


@pytest.mark.parametrize("share", [1.0, 1.004])
def test_values_within_the_relative_tolerance_do_not_agree_by_the_floor(share: float) -> None:
    """Off by 0.4 %, less than the 1 % of each value that is allowed whatever its size."""
    frame = read_frame_text(LOADED)
    reading = read_claim_text(_sagging(frame, share), FrameNames.of(frame))
    (case,) = check.verify(frame, reading, suspects=False).cases
    assert (case.verdict, case.compared, case.by_floor) == ("agree", 6, 0)


def test_a_claim_of_a_single_value_is_read() -> None:
    """One reaction fixes no sign, so it is not judged, and nothing breaks."""
    frame = read_frame_text(PORTAL)
    reading = read_claim_text("Load case: q\nJoint\tFx [kN]\nA\t-50.0\n", FrameNames.of(frame))
    (case,) = check.verify(frame, reading, suspects=False).cases
    assert (case.verdict, case.compared) == ("undecided", 0)


@pytest.mark.parametrize(("bad", "taken"), [((8, 3), 1), ((8, 4), 0), ((5, 3), 0), ((6, 2), 1)])
def test_another_way_must_explain_most_of_what_does_not_fit(
    monkeypatch: pytest.MonkeyPatch, bad: tuple[int, int], taken: int
) -> None:
    """At least three values and more than half of them: 8 to 3 are, 8 to 4 (half) and 5 to 3 (two) are not."""
    ways = [SimpleNamespace(cases=(str(k),), name=k) for k in range(2)]
    closer = SimpleNamespace(sure=lambda closed: False, bad={str(k): n for k, n in enumerate(bad)})
    monkeypatch.setattr(closing, "_Closer", lambda *_: closer)
    monkeypatch.setattr(closing, "_of_case", lambda *_: ([], []))
    monkeypatch.setattr(closing, "variants", lambda *_: [(0, ""), (1, "turned, by fit")])
    monkeypatch.setattr(closing, "_close_case", lambda _, tried, *__: ways[tried])
    found = closing.close(SimpleNamespace(face=None), None, {"one": None}, None, CLAIM)  # type: ignore[arg-type, dict-item]
    assert found is ways[taken]  # type: ignore[comparison-overlap]


@pytest.mark.parametrize(("apart", "varies"), [(0.04, False), (0.06, True), (0.0, False)])
def test_an_axial_force_varies_by_more_than_half_the_tolerance(apart: float, varies: bool) -> None:
    """A half of one per cent of a scale of 10 is 0.05."""
    closer = SimpleNamespace(frame=SimpleNamespace(member_index={"a": 0}), tolerance=CLAIM)
    extremes = np.zeros((1, 2, 3))
    extremes[0, :, 0] = [-3.0, -3.0 + apart]
    part = SimpleNamespace(extremes=extremes, member_scale=lambda quantity: np.array([10.0]))
    assert closing._Closer._varies(closer, "a", part) is varies  # type: ignore[arg-type]


def test_stations_of_an_envelope_are_marked_member_by_member() -> None:
    """One mark at the start of each of the members and one at the end of all."""
    frame = read_frame_text(LOADED)
    answer = slope_deflection.opine(frame, study(frame))
    at = envelope_spans(frame, answer, ["q"]).at  # type: ignore[arg-type]
    assert len(at.start) == len(frame.members) + 1
    assert (at.start[0], at.start[-1]) == (0, len(at.member))
    assert all((at.member[at.of(m)] == m).all() for m in range(3))


def test_a_sign_that_is_stated_for_a_reaction_is_known_as_such() -> None:
    batch = SimpleNamespace(kind="reaction", quantity="fx", said=False)
    taken = SimpleNamespace(convention=Convention("", 1, "frame", ""))
    fitted = SimpleNamespace(batch=batch, choices=(), taken=taken)
    found = senses([fitted], {"reactions": "on the frame"})  # type: ignore[list-item]
    assert found.stated_ids == {id(fitted)}
    assert not senses([fitted], {}).stated_ids  # type: ignore[list-item]


def test_nothing_is_turned_where_nothing_asks_for_it() -> None:
    """The fewest turns that explain no sign are none, at no cost."""
    assert _explained([], {}) == (frozenset(), (0, 0))


@pytest.mark.parametrize(("joint", "at"), [("A", 0.0), ("B", 1.0)])
def test_moments_at_the_ends_of_a_member_that_runs_to_the_left(joint: str, at: float) -> None:
    """Run to the right, the member from B at 4 m to A at nought begins at A and ends at B."""
    frame = read_frame_text("""
units = "kN m"
materials.m = { E = 200e6 }
sections.s = { I = 1e-4, A = 5e-3 }
joints = { A = [0, 0], B = [4, 0] }
members."B-A" = { section = "s", material = "m" }
supports = { A = "fixed", B = "fixed" }
[loads.q]
apply = [{ member = "B-A", force = 1, at = 1, direction = "down" }]
""")
    reading = read_claim_text(f"Load case: q\nJoint\tM [kNm]\n{joint}\t3.0\n", FrameNames.of(frame))
    (entry,) = (e for e in reading.entries)
    assert (entry.kind, entry.axes) == ("reaction", "open")
    (found,) = moments_of_members([entry], frame) or [entry]
    assert (found.kind, found.member, found.run, found.at, found.at_share) == ("span", "B-A", -1, at, True)


def test_distances_of_members_that_run_the_other_way() -> None:
    """1.5 m from the far end of 6 m is 4.5 m from the near one; a quarter of it, too."""
    frame = read_frame_text(PORTAL)
    batch = SimpleNamespace(
        member=np.array([1, 1, 1]), at=np.array([1.5, 1.5, 0.25]), at_half=np.zeros(3),
        at_share=np.array([False, False, True]), origin=np.full(3, np.nan),
    )  # fmt: skip
    found = distance(batch, frame, np.array([1, -1, -1]))  # type: ignore[arg-type]
    assert found.tolist() == [1.5, 4.5, 4.5]


def test_a_said_direction_has_the_only_form_there_is() -> None:
    (only,) = conventions(SimpleNamespace(kind="reaction", quantity="fx", said=True))  # type: ignore[arg-type]
    assert (only.form, only.sign, only.rule) == ("", 1, "frame")


def test_reactions_along_turned_axes_are_turned_back() -> None:
    """3 along and 2 across axes turned by thirty degrees."""
    frame = read_frame_text(PORTAL.replace('D = "fixed"', 'D = { x = "held", y = "held", rotation = "held", angle = 30 }'))
    reading = read_claim_text("Load case: q\nJoint\tFx [kN]\tFy [kN]\nD\t3.0\t2.0\n", FrameNames.of(frame))
    found = {e.quantity: e.number.value for e in in_global_axes(list(reading.entries), frame) or ()}
    assert found == {"fx": pytest.approx(3 * np.sqrt(0.75) - 1), "fy": pytest.approx(1.5 + 2 * np.sqrt(0.75))}


def test_the_scale_of_moments_counts_those_of_reactions() -> None:
    """Nothing else is as large: 500 kN m beside a load of 1 kN on members of 6 m at most."""
    frame = read_frame_text(PORTAL.replace("force = 100", "force = 1"))
    answer = SimpleNamespace(
        ends=np.zeros((3, 2, 3)), joints=np.zeros((4, 3)), reactions=np.array([[2.0, 3.0, -500.0]] + [[0.0] * 3] * 3)
    )
    found = case_scales(frame, load_table(frame, "q"), [answer])  # type: ignore[list-item]
    assert found.moments == 500
