"""Parts of the review on frames small enough to know the answer by hand."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from crosscheck.cli import main
from crosscheck.frame.loads import load_table
from crosscheck.frame.reader import read_frame_text
from crosscheck.review.approximate import approximations, free_moment
from crosscheck.review.finding import Finding, Limits, load_total
from crosscheck.review.inspect import inspect, subject_of
from crosscheck.review.storeys import storey_factors, storeys_of
from tests.slips import SOUND, sound, with_combination, with_member

CANTILEVER = """
units = "kN m"
[materials.steel]
E = "210 GPa"
alpha = 12e-6
[sections.beam]
I = "8360 cm^4"
A = "53.8 cm^2"
[joints]
A = [0, 0]
B = [3, 0]
[members]
"A-B" = { section = "beam", material = "steel" }
[supports]
A = "fixed"
[loads.dead]
apply = [{ joint = "B", force = FORCE, direction = "down" }]
"""


def said(text: str, check: str, **limits: float) -> list[Finding]:
    found = inspect(subject_of(read_frame_text(text), Limits(**limits), stability=False))
    return [f for f in found if f.check == check]


def test_free_end_counts_as_half_a_span() -> None:
    """PL3/3EI against 2L/250: 46.8 kN reach it."""
    limit = 6.0 / 250 * 3 * 210e6 * 8360e-8 / 27
    assert not said(CANTILEVER.replace("FORCE", f"{0.999 * limit}"), "deflection")
    assert said(CANTILEVER.replace("FORCE", f"{1.001 * limit}"), "deflection")[0].where[0] == "A-B"


def test_limits_are_settable() -> None:
    text = CANTILEVER.replace("FORCE", "10")
    assert not said(text, "deflection")
    assert "1/2000 is a usual limit" in said(text, "deflection", deflection=2000.0)[0].says


def test_run_of_two_members_is_one_span() -> None:
    """A simple beam of two members deflects by 5wL4/384EI over the whole span, and by less over each half."""
    second = '"C-B" = { section = "beam", material = "steel" }\n[supports]\nA = "pinned"\nC = "roller"'
    text = CANTILEVER.replace("B = [3, 0]", "B = [3, 0]\nC = [6, 0]").replace('[supports]\nA = "fixed"', second)
    w = 384 * 210e6 * 8360e-8 * (6.0 / 250) / (5 * 6.0**4)
    head = text.split("[loads.dead]")[0]
    loads = "[loads.dead]\napply = [{{ members = ['A-B', 'C-B'], uniform = {}, direction = 'down' }}]\n"
    assert not said(head + loads.format(0.999 * w), "deflection")
    assert set(said(head + loads.format(1.001 * w), "deflection")[0].where) == {"A-B", "C-B", "dead"}


def test_load_that_nothing_can_answer_is_serious() -> None:
    """A heated axially rigid beam between held supports: no answer exists, and inspect says why instead of refusing."""
    text = CANTILEVER.split("[supports]")[0] + """
[supports]
A = "pinned"
B = "pinned"
[loads.summer]
apply = [{ member = "A-B", temperature = 20 }]
[analysis]
axial = "rigid"
"""
    found = said(text, "unusable")
    assert [f.grade for f in found] == ["serious"]
    assert 'axial = "elastic"' in found[0].says


def test_repeated_lines_are_one() -> None:
    """Ten combinations past the usual limit make one finding with the worst named first."""
    frame = sound("portal")
    for k in range(10):
        frame = with_combination(frame, f"c{k}", {"dead": 100.0 + k})
    found = [f for f in inspect(subject_of(frame)) if f.check == "second_order"]
    assert len(found) == 1
    assert found[0].where[0] == "c9"
    assert "and in 9 more cases" in found[0].says


def test_free_moments_of_known_loads() -> None:
    """wL2/8, PL/4 and the triangle's wL2/(9 sqrt 3)."""
    frame = read_frame_text(CANTILEVER.replace("FORCE", "1") + """
[loads.even]
apply = [{ member = "A-B", uniform = 8, direction = "down" }]
[loads.point]
apply = [{ member = "A-B", force = 12, at = 1.5, direction = "down" }]
[loads.triangle]
apply = [{ member = "A-B", varying = [0, 10], direction = "down" }]
""")
    subject = subject_of(frame, stability=False)
    x = np.array([1.5, 3 / np.sqrt(3)])
    assert free_moment(subject, "even", 0, x)[0] == pytest.approx(9.0, rel=1e-12)
    assert free_moment(subject, "point", 0, x)[0] == pytest.approx(9.0, rel=1e-12)
    assert free_moment(subject, "triangle", 0, x)[1] == pytest.approx(90 / (9 * np.sqrt(3)), rel=1e-12)


def test_inflection_at_a_tenth_of_the_span() -> None:
    """0.08 wL2 sagging and 0.045 wL2 hogging of a framed beam; all of wL2/8 where its ends are hinged."""
    frame = sound("portal")
    rough = next(f for f in approximations(subject_of(frame, stability=False)).free if f.case == "snow")
    assert rough.sagging == pytest.approx(0.08 * 420, rel=1e-9)
    assert rough.hogging == pytest.approx(0.045 * 420, rel=1e-9)
    hinged = with_member(sound("offices"), "A2-B2", turn_from=0.0, turn_to=0.0)
    rough = next(f for f in approximations(subject_of(hinged, stability=False)).free if f.member == "A2-B2")
    assert rough.sagging == pytest.approx(rough.free, rel=1e-12)
    assert rough.hogging == pytest.approx(0.0, abs=1e-12)
    assert rough.computed_hogging == pytest.approx(0.0, abs=1e-9)


def test_computed_sagging_is_that_of_the_spans() -> None:
    subject = subject_of(sound("offices"), stability=False)
    assert subject.answer is not None
    for row in approximations(subject).free:
        k = subject.frame.member_index[row.member]
        at = np.array([3.0])
        along = subject.answer.spans.along(row.case, np.array([k]), at, np.array([1]))[0, 2]
        assert row.computed_sagging == pytest.approx(along, rel=1e-9)


def test_hand_methods_keep_the_equilibrium_of_every_storey() -> None:
    """Column moments add up to the storey shear times its height by either method (computed ones stand as sizes only)."""
    found = approximations(subject_of(sound("block"), stability=False)).sidesway
    shears = {1: 82.0, 2: 64.0, 3: 47.0, 4: 29.0, 5: 10.0}
    for storey, shear in shears.items():
        rows = [s for s in found if s.member.endswith(f"{storey}") and s.member[1] == str(storey - 1)]
        assert len(rows) == 8
        height = 3.6 if storey == 1 else 3.0
        for method in ("portal", "cantilever"):
            assert sum(getattr(s, method) for s in rows) == pytest.approx(shear * height, rel=1e-9)


def test_load_total_acts_where_the_resultant_does() -> None:
    frame = sound("gantry")
    fx, fy, moment = load_total(frame, load_table(frame, "crane"))
    assert (fx, fy) == (pytest.approx(0.0, abs=1e-6), pytest.approx(-180000.0))
    assert -moment / fy == pytest.approx(4500.0)


def test_storeys_and_what_has_none() -> None:
    assert [s.height for s in storeys_of(sound("block"))] == pytest.approx([3.6, 3, 3, 3, 3])
    assert storeys_of(sound("continuous")) == ()
    assert storeys_of(sound("truss")) == ()
    braced = subject_of(sound("braced"), stability=False)
    assert braced.study is not None
    assert storey_factors(braced.frame, braced.study, braced.solved) == {}


def test_document_and_exit_status(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = tmp_path / "portal.toml"
    path.write_text(SOUND["portal"], encoding="utf-8")
    assert main(["inspect", str(path), "--json", "-", "--approximate"]) == 0
    told = json.loads(capsys.readouterr().out)
    assert set(told) == {"format", "frame", "findings", "load_totals", "approximate"}
    assert told["load_totals"]["snow"] == {"fx": pytest.approx(0.0, abs=1e-12), "fy": pytest.approx(-42.0)}
    assert len(told["approximate"]["sidesway"]) == 6
    path.write_text(SOUND["portal"].replace('= "fixed"', '= "roller"'), encoding="utf-8")
    assert main(["inspect", str(path)]) == 1
    assert "moves right" in capsys.readouterr().out


def test_second_order_frames_are_reviewed_too() -> None:
    """A case past its critical load has no answer in second order; the others are reviewed."""
    frame = sound("portal")
    frame = with_combination(frame, "far", {"dead": 1e5})
    frame = replace(frame, analysis=replace(frame.analysis, order=2))
    found = [f for f in inspect(subject_of(frame)) if f.check == "second_order"]
    assert [(f.grade, f.where) for f in found] == [("serious", ("far",))]
