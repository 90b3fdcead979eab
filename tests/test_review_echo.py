"""The other model's printed input beside the frame."""

from __future__ import annotations

from pathlib import Path

import pytest

from crosscheck.claims.reading import FrameNames
from crosscheck.cli import main
from crosscheck.review.echo import compared
from crosscheck.review.finding import Finding
from crosscheck.review.inspect import subject_of
from crosscheck.review.printed_input import echo_of
from tests.slips import SOUND, sound

ECHO = """\
Joint coordinates
Joint   X [m]   Y [m]
A       0.000   0.000
B       0.000   4.500
C      10.000   4.500
D      10.000   0.000

Members
Member  Start  End
A-B     A      B
B-C     B      C
D-C     C      D

Section properties
Section,I (cm4),A (cm2)
column,25170,149
girder,33740,84.5

Materials
Material   E [GPa]
steel      210

Supports
Joint  X  Y  R
A      1  1  1
D      1  1  1

Load totals
Load case   Fx (kN)  Fy (kN)
dead        0.0      -56.8
snow        0.0      -42.0
wind        16.2     0.0
"""


def found(text: str) -> list[Finding]:
    frame = sound("portal")
    return list(compared(subject_of(frame, stability=False), echo_of(text, FrameNames.of(frame))))


def test_the_same_input_is_said_to_be() -> None:
    told = found(ECHO)
    assert [f.grade for f in told] == ["note"]
    assert told[0].says.startswith("24 of 24 items")


@pytest.mark.parametrize(
    ("old", "new", "where", "says"),
    [
        ("D      10.000   0.000", "D      10.100   0.000", "D", "joint x of D = 10.1 m, the frame 10"),
        ("girder,33740,84.5", "girder,3374,84.5", "girder", "0.1 times it"),
        ("column,25170,149", "column,25170,14.9", "column", "A of column"),
        ("steel      210", "steel      205", "steel", "E of steel"),
        ("D      1  1  1", "D      1  1  0", "D", "held in x, y, the frame held in x, y, rotation"),
        ("snow        0.0      -42.0", "snow        0.0      -24.0", "snow", "total y of snow"),
        ("B-C     B      C", "B-C     B      D", "B-C", "from B to D, the frame from B to C"),
        ("D-C     C      D\n", "", "D-C", "no member D-C"),
    ],
)
def test_difference_is_stated_as_fact(old: str, new: str, where: str, says: str) -> None:
    assert ECHO.count(old) == 1
    serious = [f for f in found(ECHO.replace(old, new)) if f.grade == "serious"]
    assert len(serious) == 1
    assert serious[0].where == (where,)
    assert says in serious[0].says


def test_units_not_stated_are_fitted() -> None:
    """Coordinates in millimetres under heads without a unit."""
    text = ECHO.replace("Joint   X [m]   Y [m]", "Joint   X   Y").replace("4.500", "4500").replace("10.000", "10000")
    assert [f.grade for f in found(text)] == ["note"]


def test_totals_with_down_positive_are_a_convention() -> None:
    text = ECHO.replace("-56.8", "56.8").replace("-42.0", "42.0")
    told = found(text)
    assert [f.grade for f in told] == ["note"]
    assert "other sign" in told[0].says


def test_a_joint_the_frame_lacks_is_said() -> None:
    told = found(ECHO.replace("D      10.000   0.000", "D      10.000   0.000\nZ9     5.000   2.000"))
    assert [(f.grade, f.where) for f in told if f.grade != "note"] == [("check", ("Z9",))]


def test_results_in_the_same_paste_are_no_input() -> None:
    results = """
Joint displacements
Joint  UX       UY       RZ
A      0        0        0
B      0.0121   -0.0001  0.0013

Support,Fx,Fy,M
A,-1.2,30.4,0.0
"""
    assert found(ECHO + results) == found(ECHO)


def test_command(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    frame, echo = tmp_path / "portal.toml", tmp_path / "input.txt"
    frame.write_text(SOUND["portal"], encoding="utf-8")
    echo.write_text(ECHO, encoding="utf-8")
    assert main(["inspect", str(frame), "--echo", str(echo)]) == 0
    assert "24 of 24 items" in capsys.readouterr().out
    echo.write_text(ECHO.replace("4.500", "4.050"), encoding="utf-8")
    assert main(["inspect", str(frame), "--echo", str(echo), "--explain", "--approximate"]) == 1
    assert "joint y of B = 4.05 m" in capsys.readouterr().out
    echo.write_text("nothing to see here\n", encoding="utf-8")
    assert main(["inspect", str(frame), "--echo", str(echo)]) == 2
    assert "holds no input" in capsys.readouterr().err
