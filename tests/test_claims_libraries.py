"""Results as general-purpose libraries print them, pasted as they are: pandas tables of anastruct's results, arrays, and
printouts of three other libraries kept in tests/printouts (print_again.py there says how they were made and by which
versions)."""

from __future__ import annotations

import re
import warnings
from functools import lru_cache
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from tests.claim_frame import Known

JOINTS = {"A": (0, 0), "B": (0, 4), "C": (6, 5), "D": (6, 0), "E": (12, 4), "F": (12, 0)}


@lru_cache(maxsize=1)
def numbered() -> Known:
    """The two-bay bent with the numbers that the library gives its nodes and elements."""
    number = {joint: str(n) for n, joint in enumerate(JOINTS, 1)}
    joints = "\n".join(f"{number[j]} = [{x}, {y}]" for j, (x, y) in JOINTS.items())
    members = "\n".join(
        f'{n} = {{ from = "{number[a]}", to = "{number[b]}", section = "post", material = "steel" }}'
        for n, (a, b) in enumerate(("AB", "BC", "DC", "CE", "EF"), 1)
    )
    return Known(f"""
title = "Two-bay bent, numbered"
units = "kN m"
[materials.steel]
E = "210 GPa"
[sections.post]
I = "8360 cm^4"
A = "53.8 cm^2"
[joints]
{joints}
[members]
{members}
[supports]
1 = "fixed"
4 = "fixed"
6 = "fixed"
[loads.dead]
apply = [{{ members = ["2", "4"], uniform = 8.5, direction = "down" }}, {{ joint = "2", force = 9, direction = "right" }}]
""")


@lru_cache(maxsize=1)
def solved() -> object:
    from anastruct import SystemElements

    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        ss = SystemElements(EA=2.1e8 * 53.8e-4, EI=2.1e8 * 8360e-8, mesh=200)
        for a, b in ("AB", "BC", "DC", "CE", "EF"):
            ss.add_element(location=[JOINTS[a], JOINTS[b]])
        for joint in "ADF":
            ss.add_support_fixed(ss.find_node_id(vertex=list(JOINTS[joint])))
        ss.q_load(q=-8.5, element_id=[2, 4], direction="y")
        ss.point_load(ss.find_node_id(vertex=list(JOINTS["B"])), Fx=9)
        ss.solve()
    return ss


def printed(rows: object, whole: bool) -> str:
    table = pd.DataFrame(rows)
    with pd.option_context("display.width", 400, "display.max_columns", 40):
        return table.to_string() if whole else str(table)


@pytest.mark.parametrize("whole", [True, False])
def test_node_displacements(whole: bool) -> None:
    text = printed(solved().get_node_displacements(), whole)  # type: ignore[attr-defined]
    verdict, closed, cases = numbered().judge(text)
    assert verdict == "agree", (closed.undecided, closed.not_understood)
    assert cases[0].compared == 18
    assert "clockwise" in closed.signs["rotation"]


@pytest.mark.parametrize("whole", [True, False])
def test_reactions_beside_displacements(whole: bool) -> None:
    """Both reversed in the library's table of nodes, which is a convention while no member forces are."""
    text = printed(solved().get_node_results_system(), whole)  # type: ignore[attr-defined]
    verdict, closed, cases = numbered().judge(text)
    assert verdict == "agree", (closed.undecided, closed.not_understood, closed.foreign)
    assert cases[0].compared == 36
    assert (closed.signs["dx"], closed.signs["dy"]) == ("left", "down")
    assert not closed.reversed_load


def test_extremes_of_elements() -> None:
    rows = [{k: v for k, v in row.items() if k != "alpha"} for row in solved().get_element_results()]  # type: ignore[attr-defined]
    verdict, closed, cases = numbered().judge(printed(rows, True))
    assert verdict == "agree", (closed.undecided, closed.not_understood, [c.differences[:2] for c in cases])
    assert cases[0].compared == 5 * 6
    assert "hogging" in closed.signs["moment"]


def test_one_wrong_value_in_a_library_table_is_found() -> None:
    rows = [dict(row) for row in solved().get_node_displacements()]  # type: ignore[attr-defined]
    rows[2]["ux"] *= 1.1
    verdict, _, cases = numbered().judge(printed(rows, True))
    assert verdict == "disagree"
    assert [(d.place.joint, d.place.quantity) for d in cases[0].differences] == [("3", "dx")]


def test_a_numpy_matrix_with_columns_stated() -> None:
    """Ends as a bare array: an index column nowhere, the columns stated."""
    k = numbered()
    ends = k.answer.cases["dead"].ends
    table = [[m + 1, (k.frame.member_table.ends[m, e] + 1), *ends[m, e]] for m in range(5) for e in (0, 1)]
    with np.printoptions(suppress=True, precision=4, linewidth=200):
        text = str(np.array(table)).replace("[", " ").replace("]", " ")
    verdict, closed, cases = k.judge(text, columns=("member", "joint", "N", "V", "M"), units="kN m")
    assert verdict == "agree", (closed.undecided, closed.not_understood)
    assert cases[0].compared == 30


# --- printouts of other libraries, as they are

PRINTOUTS = Path(__file__).parent / "printouts"
VALUES = {  # values compared in each: (bent, beam, storeys)
    "calfem nodes.txt": (27, 33, 36), "calfem elements.txt": (75, 75, 150),
    "pynite nodes.txt": (36, 31, 54), "pynite end forces.txt": (30, 30, 60), "pynite extremes.txt": (30, 30, 60),
    "pynite stations.csv": (75, 75, 150),
}  # fmt: skip
FRAMES = ("bent", "beam", "storeys")
CASES = [(frame, kind, counts[k]) for kind, counts in VALUES.items() for k, frame in enumerate(FRAMES)]


@lru_cache(maxsize=3)
def kept(frame: str) -> Known:
    return Known((PRINTOUTS / f"{frame}.toml").read_text(encoding="utf-8"))


@pytest.mark.parametrize(("frame", "kind", "values"), CASES)
def test_printouts_of_other_libraries(frame: str, kind: str, values: int) -> None:
    text = (PRINTOUTS / f"{frame}.{kind}").read_text(encoding="utf-8")
    verdict, closed, cases = kept(frame).judge(text)
    assert verdict == "agree", (closed.undecided, closed.not_understood, closed.foreign)
    assert cases[0].compared == values
    assert not closed.not_understood


@pytest.mark.parametrize(("frame", "kind", "values"), CASES)
def test_one_spoiled_value_of_a_printout_is_not_agreed_to(frame: str, kind: str, values: int) -> None:
    """The largest of the last three values on the last line that has one that counts."""
    text = (PRINTOUTS / f"{frame}.{kind}").read_text(encoding="utf-8")
    values_of = {t: re.findall(r"-?\d+\.\d+(?:e[+-]\d+)?", t)[-3:] for t in text.splitlines()}
    line = next(t for t in reversed(values_of) if any(abs(float(v)) > 0.1 for v in values_of[t]))
    printed = max(values_of[line], key=lambda t: abs(float(t)))
    wrong = f"{float(printed) * 1.4:.6g}".rjust(len(printed))
    assert kept(frame).judge(text.replace(line, line.replace(printed, wrong)))[0] != "agree"
