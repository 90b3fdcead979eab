"""The opinions against exact rational solutions: what rounding costs on ordinary frames (issue: exactness, 1e-12).

Source: tests/exact.py, elementary beam theory solved in fractions; one textbook value holds that solver itself.
"""

from __future__ import annotations

from fractions import Fraction
from functools import cache

import numpy as np
import pytest

from crosscheck.answer import Answer, Silent
from crosscheck.frame.kinematics import study
from crosscheck.frame.model import Floats, Frame
from crosscheck.frame.stations import stations
from crosscheck.opinions import library, moment_distribution, slope_deflection
from tests.agreement import apart
from tests.exact import CannotFollow, Exact, NotRational, exact_direction, exact_root, reduced
from tests.exact_frames import exact_frames
from tests.truth import Truth

OURS = 1e-12
"""Share of scale, of each quantity's own largest value in the case, and of each case."""
LIBRARY_ELASTIC, LIBRARY_RIGID = 1e-12, 1e-9
"""The library has no axially rigid members: ours are told to it as very stiff ones, in steps, and that costs digits."""
NOISE = 1e-3
"""A quantity whose largest value is below this share of its kind's scale is held to the scale alone."""
FRAMES = exact_frames()


@cache
def solved(title: str) -> Exact:
    return Exact(FRAMES[title])


def own_share(frame: Frame, answer: Answer, exact: Exact) -> float:
    """Largest difference as a share of the largest exact value of the same column in the same case.

    Columns that are nought, or as good as nought beside the others of their table, are left to `apart`.
    """
    worst, at = 0.0, stations(frame)
    for name in frame.names:
        one, other = answer.cases[name], exact.cases[name]
        along = answer.spans.along(name, at.member, at.x, at.side), exact.along(name, at.member, at.x, at.side)
        for left, right in ((one.ends, other.ends), (one.joints, other.joints), (one.reactions, other.reactions), along):
            worst = max(worst, _column_share(left.reshape(-1, left.shape[-1]), right.reshape(-1, right.shape[-1])))
    return worst


def _column_share(left: Floats, right: Floats) -> float:
    size = np.nanmax(np.where(np.isnan(right), 0.0, np.abs(right)), axis=0)
    off = np.nanmax(np.where(np.isnan(right), 0.0, np.abs(left - right)), axis=0)
    keep = size > NOISE * size.max()
    return float((off[keep] / size[keep]).max(initial=0.0))


def test_there_are_enough_frames() -> None:
    rigid = sum(frame.analysis.axial == "rigid" for frame in FRAMES.values())
    assert len(FRAMES) >= 40 and rigid >= 18


@pytest.mark.parametrize("title", FRAMES)
def test_opinions_are_exact(title: str) -> None:
    """Both of ours to 1e-12, by scale and by each quantity's own largest value; what is undetermined is the same."""
    frame, exact = FRAMES[title], solved(title)
    studied = study(frame)
    for opinion in (slope_deflection, moment_distribution):
        answer = opinion.opine(frame, studied)
        assert isinstance(answer, Answer) and not answer.silent
        share, where = apart(frame, answer, exact)
        assert share <= OURS, where
        assert own_share(frame, answer, exact) <= OURS


@pytest.mark.parametrize("title", FRAMES)
def test_the_library_is_exact_where_it_speaks(title: str) -> None:
    frame, exact = FRAMES[title], solved(title)
    answer = library.opine(frame, study(frame))
    if isinstance(answer, Silent):
        assert any(word in frame_text(frame) for word in ("zone", "temperature", "misfit", "settlement", "shear"))
        return
    share, where = apart(frame, exact, answer, partial=True)
    assert share <= (LIBRARY_ELASTIC if frame.analysis.axial == "elastic" else LIBRARY_RIGID), where


def frame_text(frame: Frame) -> str:
    """The features for which the library may be silent, in words."""
    loads = {type(load).__name__.lower() for case in frame.cases.values() for load in case.loads}
    zones = any(m.rigid_from or m.rigid_to for m in frame.members.values())
    return " ".join([*loads, "zone" * zones, "shear" * (frame.analysis.shear == "elastic")])


@pytest.mark.parametrize("title", ["leaning frame, axially rigid", "truss of triangles, axially elastic"])
def test_the_two_solvers_of_the_tests_agree(title: str) -> None:
    share, where = apart(FRAMES[title], Truth(FRAMES[title]), solved(title))
    assert share <= 1e-9, where


def test_the_exact_solver_against_a_closed_form() -> None:
    """Cantilever on a slope of 3 in 4 under q down: M = q L (L cos) / 2 + couple, clockwise minus that. Common practice."""
    exact = solved("cantilever, axially elastic")
    q, length, cos, couple = 7, 5, Fraction(4, 5), 11
    moment = Fraction(q) * length * length * cos / 2 + couple
    assert exact.cases["q"].ends[0, 0, 2] == float(-moment)
    assert exact.cases["q"].reactions[0].tolist() == [0.0, 35.0, float(-moment)]


def test_what_is_not_rational_is_refused() -> None:
    with pytest.raises(NotRational):
        exact_root(Fraction(2))
    with pytest.raises(NotRational):
        exact_direction(45.0)
    with pytest.raises(CannotFollow):
        reduced([{0: Fraction(1)}, {0: Fraction(1), -1: Fraction(1)}], 1)


def test_the_measure_can_fail() -> None:
    """One part in 1e10 in any one value is seen by both measures."""
    title = "portal, axially elastic"
    frame, exact = FRAMES[title], solved(title)
    answer = slope_deflection.opine(frame, study(frame))
    assert isinstance(answer, Answer)
    answer.cases["q"].joints[1, 0] *= 1 + 1e-10
    assert apart(frame, answer, exact)[0] > OURS
    assert own_share(frame, answer, exact) > OURS
