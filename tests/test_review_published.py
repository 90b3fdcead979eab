"""Published values of what the review stands on: hand methods, the storey formula, review identities.

tests/published/review/review.toml holds one table a case, with its source and status (tests/published/test_published.py
says what those mean); a check is held to half a unit of its printed digits (`decimals`), to `tolerance`, or to 1e-9.
"""

from __future__ import annotations

import tomllib
from collections.abc import Callable
from dataclasses import replace
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from crosscheck.check import critical_factors
from crosscheck.frame.kinematics import study
from crosscheck.frame.model import Frame, JointForce, LoadCase
from crosscheck.frame.reader import read_frame_text
from crosscheck.opinions import slope_deflection
from crosscheck.review.approximate import approximations, cantilever, cantilever_axial, grid_of, level_forces, portal
from crosscheck.review.finding import Limits, Subject
from crosscheck.review.inspect import subject_of
from crosscheck.review.storeys import storey_factors

CASES = tomllib.loads((Path(__file__).parent / "published" / "review" / "review.toml").read_text(encoding="utf-8"))["case"]
CHECKS = [pytest.param(c, k, id=f"{c['id']}-{n}") for c in CASES for n, k in enumerate(c["check"])]
HEAD = """
units = "kN m"
[materials.m]
E = 1
[analysis]
axial = "rigid"
"""


def regular(bays: list[float], storeys: list[float], forces: list[float], beam: float = 1.0, feet: str = "fixed") -> Frame:
    """A grid with I = 1 in columns and `beam` in beams, forces on the left joints from the bottom to the top."""
    loads = ", ".join(f'{{ joint = "A{k}", force = {f}, direction = "right" }}' for k, f in enumerate(forces, 1) if f)
    return read_frame_text(f"""{HEAD}
[sections]
c = {{ I = 1 }}
b = {{ I = {beam} }}
[grid]
bays = {bays}
storeys = {storeys}
columns = {{ section = "c", material = "m" }}
beams = {{ section = "b", material = "m" }}
feet = "{feet}"
[loads.push]
apply = [{loads}]
[loads.weight]
apply = [{{ joints = ["A{len(storeys)}", "{'ABCD'[len(bays)]}{len(storeys)}"], force = 1, direction = "down" }}]
""")


@cache
def subject(key: str) -> Subject:
    frames = {
        "D01": lambda: regular([5.0], [3.0, 3.0, 4.0, 3.0, 4.0, 3.0], [13.0, 14.0, 16.0, 17.0, 15.0, 8.0]),
        "D02": lambda: regular([5.0, 7.5], [5.0, 3.5], [80.0, 40.0]),
        "fixed": lambda: regular([8.0], [5.0], [1.0], beam=1.7),
        "pinned": lambda: regular([8.0], [5.0], [1.0], beam=1.7, feet="pinned"),
        "stiff": lambda: regular([8.0], [5.0], [1.0], beam=1e9 * 8 / 5),
        "soft": lambda: regular([8.0], [5.0], [1.0], beam=1e-9 * 8 / 5),
    }
    return subject_of(frames[key](), stability=False)


def methods(key: str) -> tuple[Any, Any, Any, Any]:
    """Portal and cantilever moments, the cantilever method's axial forces, and the level forces."""
    s = subject(key)
    grid = grid_of(s.frame)
    assert grid is not None
    forces = level_forces(s, grid, "push")
    areas = np.ones((len(grid.storeys), len(grid.x)))
    return portal(grid, forces), cantilever(grid, forces, areas), cantilever_axial(grid, forces, areas), forces


def portal_single_bay(quantity: str) -> float:
    """D01: quantities are called by storey or level, 1 at the bottom."""
    (top, foot, beams), _, _, _ = methods("D01")
    level = int(quantity.replace(" (not approximate)", "").split()[-1]) - 1
    if quantity.startswith("exact shear"):
        s = subject("D01")
        return abs(float(s.solved["push"].ends[s.frame.member_index[f"A{level}-A{level + 1}"], 0, 1]))
    if quantity.startswith("column moment"):
        assert top[level] == pytest.approx(foot[level], rel=1e-12)
        return float(top[level, 0])
    if quantity.startswith("beam moment"):
        return float(beams[level, 0])
    if quantity.startswith("column axial"):
        return float(2 * beams[level:, 0].sum() / 5.0)
    raise KeyError(quantity)


def portal_two_bays(quantity: str) -> float:
    (top, foot, beams), _, _, forces = methods("D02")
    shear = np.cumsum(forces[::-1])[::-1]
    return float({
        "S1 exterior top": shear[1] / 4, "S2 exterior bottom": shear[0] / 4,
        "M top exterior col": top[1, 0], "M top interior col": top[1, 1],
        "M bottom exterior col": foot[0, 0], "M bottom interior col": foot[0, 1],
        "roof beam moment": beams[1, 0], "floor beam moment": beams[0, 1],
        "beam shear roof 5 m": beams[1, 0] / 2.5, "beam shear roof 7.5 m": beams[1, 1] / 3.75,
        "beam shear floor 5 m": beams[0, 0] / 2.5, "beam shear floor 7.5 m": beams[0, 1] / 3.75,
    }[quantity])  # fmt: skip


def cantilever_two_bays(quantity: str) -> float:
    _, (top, foot, beams), axial, forces = methods("D02")
    x = np.array([0.0, 5.0, 12.5])
    return float({
        "roof-storey axial A (tension+)": axial[1, 0], "sum of column axials top": axial[1].sum(),
        "overturning check top (kN m)": -(axial[1] * x).sum(), "overturning check bottom": -(axial[0] * x).sum(),
        "roof beam AB moment (cantilever method)": beams[1, 0], "roof beam BC moment": beams[1, 1],
    }[quantity])  # fmt: skip


def inflection_height(quantity: str, storeys: int) -> float:
    """Muto's y0 of the exact frame: height of the column's point of inflection over its storey's height."""
    _, storey, k = quantity.split(", ")
    frame = regular([1.0], [1.0] * storeys, [1.0] * storeys, beam=float(k.removeprefix("K=")))
    ends = slope_deflection.opine(frame, study(frame)).cases["push"].ends  # type: ignore[union-attr]
    level = int(storey.removeprefix("storey "))
    foot, top = ends[frame.member_index[f"A{level - 1}-A{level}"], :, 2]
    return float(foot / (foot + top))


def simple_and_exact(key: str) -> tuple[float, float]:
    """The storey formula and the exact critical load factor of the portal of E08."""
    frame = subject(key).frame
    exact = slope_deflection.critical_factors(frame, ["weight"])["weight"]
    solved = subject(key).solved
    return storey_factors(frame, study(frame), {"weight": solved["weight"]})["weight"], exact


def lone_column(guided: bool) -> float:
    frame = read_frame_text(f"""{HEAD}
[sections.c]
I = 1
[joints]
A = [0, 0]
B = [0, 5]
[members]
"A-B" = {{ section = "c", material = "m" }}
[supports]
A = "fixed"
{'B = { rotation = "held" }' if guided else ""}
[loads.weight]
apply = [{{ joint = "B", force = 1, direction = "down" }}]
""")
    said = slope_deflection.opine(frame, study(frame))
    rough = storey_factors(frame, study(frame), said.cases)["weight"]  # type: ignore[union-attr]
    return rough / slope_deflection.critical_factors(frame)["weight"]


def storey_formula(quantity: str) -> float:
    if quantity.startswith("exact"):
        return simple_and_exact("fixed" if "fixed" in quantity else "pinned")[1]
    if quantity.startswith("simple"):
        simple, exact = simple_and_exact("fixed" if "fixed" in quantity else "pinned")
        return simple / exact
    return lone_column("guided" in quantity)


I01 = f"""{HEAD}
[sections]
c = {{ I = 1 }}
b = {{ I = 1.7 }}
[joints]
A = [0, 0]
B = [0, 5]
C = [8, 5]
D = [8, 0]
[members]
AB = {{ from = "A", to = "B", section = "c", material = "m" }}
BC = {{ from = "B", to = "C", section = "b", material = "m" }}
CD = {{ from = "C", to = "D", section = "c", material = "m" }}
[supports]
A = "fixed"
D = "fixed"
[loads.all]
apply = [
  {{ joint = "B", force = 6, direction = "right" }},
  {{ member = "BC", uniform = 2.5, direction = "down" }},
  {{ member = "AB", uniform = 1.1, direction = "right" }},
]
"""


def identities(quantity: str) -> float:
    frame = read_frame_text(I01)
    found = subject_of(frame, stability=False)
    pulls, ends = found.solved["all"].reactions, found.solved["all"].ends
    free = next(f for f in approximations(found).free if f.member == "BC")
    return float({
        "Rx(A)+Rx(D)": pulls[:, 0].sum(), "Ry sum": pulls[:, 1].sum(),
        "w L^2/8 identity: M_mid + (M_B+M_C)/2 on the beam": free.computed_sagging + free.computed_hogging,
        "joint B equilibrium": ends[0, 1, 2] + ends[1, 0, 2],
    }[quantity])  # fmt: skip


def inflection_of_a_beam(quantity: str) -> float:
    """Where the moment of a uniformly loaded beam is zero, from its computed end moments."""
    far = "fixed" if quantity.startswith("fixed-fixed") else "pinned"
    frame = read_frame_text(f"""{HEAD}
[sections.b]
I = 1
[joints]
A = [0, 0]
B = [1, 0]
[members]
"A-B" = {{ section = "b", material = "m" }}
[supports]
A = "fixed"
B = "{far}"
[loads.all]
apply = [{{ member = "A-B", uniform = 1, direction = "down" }}]
""")
    shear, moment = subject_of(frame, stability=False).solved["all"].ends[0, 0, 1:]
    return float(min(np.roots([-0.5, shear, moment]).real))


def ratios(quantity: str) -> float:
    """Movements in mm at which a ratio set as the limit is reached."""
    ratio, size = quantity.split(" at ")
    limits = Limits(sway=float(ratio.split("/")[1])) if ratio[0] == "H" else Limits(deflection=float(ratio.split("/")[1]))
    limit = limits.sway if ratio[0] == "H" else limits.deflection
    return 1000 * float(size.split()[0]) / limit


def sway_limits(quantity: str) -> float:
    if quantity.startswith("reciprocity"):
        frame = subject("fixed").frame
        names = list(frame.joints)
        cases = {n: LoadCase(n, (JointForce(0, n, 1.0, 0.0),)) for n in ("A1", "B1")}
        both = replace(frame, cases=cases, combinations={})
        said = slope_deflection.opine(both, study(both)).cases  # type: ignore[union-attr]
        return float(said["A1"].joints[names.index("B1"), 0] - said["B1"].joints[names.index("A1"), 0])
    key = "stiff" if "e+09" in quantity else "soft"
    moves = subject(key).solved["push"].joints[:, 0]
    return float(5.0**3 / moves.max())


OURS: dict[str, Callable[[str], float]] = {
    "D01": portal_single_bay, "D02": portal_two_bays, "D03": cantilever_two_bays,
    "D05": lambda q: inflection_height(f"y0, {q.split(', ', 1)[1]}", 1),
    "D06": lambda q: inflection_height(f"y0, {q.split(', ', 1)[1]}", 2),
    "E08": storey_formula, "I01": identities, "I02": inflection_of_a_beam, "I03": ratios, "I04": sway_limits,
}  # fmt: skip


@pytest.mark.parametrize(("case", "check"), CHECKS)
def test_published_value(case: dict[str, Any], check: dict[str, Any]) -> None:
    value = OURS[case["id"]](check["quantity"])
    half = 0.5 * 10.0 ** -check["decimals"] if "decimals" in check else 0.0
    room = check.get("tolerance", half + 1e-9 * max(1.0, abs(check["value"])))
    assert value == pytest.approx(check["value"], rel=0.0, abs=room * (1 + 1e-9))


def test_no_value_is_lost() -> None:
    assert {c["id"]: len(c["check"]) for c in CASES} == COUNTS
    assert all(c["source"]["author"] and c["status"] for c in CASES)


COUNTS = {"D01": 21, "D02": 12, "D03": 6, "D05": 6, "D06": 14, "E08": 6, "I01": 4, "I02": 2, "I03": 3, "I04": 3}


def test_storey_formula_is_never_more_than_12_over_pi_squared_high() -> None:
    """On unbraced regular frames the formula lies between the exact factor and 12/pi2 of it."""
    for beam, feet in ((0.1, "fixed"), (1.0, "fixed"), (30.0, "fixed"), (0.3, "pinned"), (5.0, "pinned")):
        frame = regular([6.0], [4.0], [1.0], beam=beam, feet=feet)
        solved = subject_of(frame, stability=False).solved
        rough = storey_factors(frame, study(frame), {"weight": solved["weight"]})["weight"]
        exact = slope_deflection.critical_factors(frame, ["weight"])["weight"]
        assert 1.0 <= rough / exact <= 12 / np.pi**2 + 1e-9


def test_rough_factors_are_the_exact_ones_to_three_digits() -> None:
    frame = regular([6.0], [4.0], [1.0])
    exact = slope_deflection.critical_factors(frame, ["weight"])["weight"]
    assert exact < 100.0
    assert critical_factors(frame, ["weight"])["weight"] == pytest.approx(exact, rel=5e-4)
