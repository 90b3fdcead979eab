"""Both of our own opinions are right about frames of the checking week: by the tests' own solver (tests/truth.py and
tests/truth_week.py: no stiffness, no fixed-end actions, no load table, no trial of states), and, for stepped and tapered
members, by their division into many prismatic members; in second order by many elements (tests/many_elements.py).

A default run looks at every fifth of the 200 random frames; all of them with CROSSCHECK_WEEK=full in the environment.
"""

from __future__ import annotations

import os
from collections.abc import Mapping
from dataclasses import replace

import numpy as np
import pytest

from crosscheck.answer import Answer
from crosscheck.check import ask
from crosscheck.frame.kinematics import study
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import Frame, SelfWeight
from crosscheck.frame.reader import read_frame_text
from crosscheck.opinions import moment_distribution, slope_deflection
from tests.agreement import apart
from tests.test_second_order import LOADED, falls, largest_error
from tests.test_week_second_order import loaded
from tests.truth import SURE
from tests.truth_week import WeekTruth
from tests.week_frames import week_frame

FRAMES, EVERY = 200, 5
FULL = os.environ.get("CROSSCHECK_WEEK") == "full"
SEEDS = range(FRAMES) if FULL else range(3, FRAMES, EVERY)
RIGHT = 1e-9
RIGHT_WITH_WEIGHT = 1e-7
"""With self weight on tapers. The load table lays the weight of a taper out as 16 straight loads a piece, each of its
part's true total and first moment (crosscheck/frame/loads.py), where the tests' own solver integrates it: that leaves up
to 4e-8 at joints and 8e-8 in the shear between, of both opinions alike. The same frames are held to RIGHT without it."""
OWN = ("slope-deflection", "moment-distribution")


@pytest.mark.parametrize("seed", SEEDS)
def test_both_opinions_are_right(seed: int) -> None:
    frame = week_frame(seed)
    if weighs_in_tapers(frame):
        hold(frame, RIGHT_WITH_WEIGHT)
        frame = without_weight(frame)
    hold(frame, RIGHT)


def hold(frame: Frame, right: float) -> None:
    truth, opinions = WeekTruth(frame), ask(frame)
    assert truth.blur > SURE
    for name in OWN:
        answer = opinions.answers[name]
        assert not answer.silent and not answer.adrift
        worst, where = apart(frame, answer, truth)
        assert worst <= right, (name, worst, where)


def weighs_in_tapers(frame: Frame) -> bool:
    weight = any(isinstance(load, SelfWeight) for case in frame.cases.values() for load in case.loads)
    return weight and any(p.first != p.last for m in frame.members.values() for p in m.pieces)


def without_weight(frame: Frame) -> Frame:
    cases = {name: replace(case, loads=tuple(load for load in case.loads if not isinstance(load, SelfWeight)))
             for name, case in frame.cases.items()}  # fmt: skip
    return replace(frame, cases=cases)


def test_the_sample_is_of_everything() -> None:
    """What is judged differently from plain frames is in the sample: states, leans, ties, one-way parts out and in."""
    used = {"state": 0, "lean": 0, "tie": 0, "rigid": 0, "varying": 0, "out": 0, "in": 0}
    for seed in range(3, FRAMES, EVERY):
        frame = week_frame(seed)
        used["state"] += bool(frame.states)
        used["lean"] += any(c.lean for c in frame.combinations.values())
        used["tie"] += bool(frame.ties)
        used["rigid"] += any(m.axial for m in frame.members.values())
        used["varying"] += any(m.pieces for m in frame.members.values())
        if frame.one_way:
            parts = sum(bool(m.only) for m in frame.members.values())
            parts += sum(bool(s.x_only) + bool(s.y_only) for s in frame.supports.values())
            out = [len(members) + len(supports) for members, supports in WeekTruth(frame).outs.values()]
            used["out"] += max(out) > 0
            used["in"] += min(out) < parts
    assert min(used.values()) >= 4, used


def test_the_comparison_sees_each_feature() -> None:
    """A state a millionth softer, a lean a ten-thousandth more, a tie that is not there: each is seen where it does
    anything (a tie may hold joints that would not part, a softer member may have nothing to carry)."""
    seen = {feature: [0, 0] for feature in ("state", "lean", "tie")}
    for seed in range(0, 40, 3):
        frame = week_frame(seed)
        true = WeekTruth(frame)
        for feature, other in changed(frame).items():
            seen[feature][apart(frame, WeekTruth(other), true)[0] > RIGHT] += 1
    assert all(yes >= 3 and yes >= 2 * no for no, yes in seen.values()), seen


def changed(frame: Frame) -> dict[str, Frame]:
    other: dict[str, Frame] = {}
    if any(c.stiffness for c in frame.combinations.values()):
        softer = {n: replace(s, members={m: {k: v * (1 - 1e-6) for k, v in f.items()} for m, f in s.members.items()})
                  for n, s in frame.states.items()}  # fmt: skip
        other["state"] = replace(frame, states=softer)
    if any(c.lean for c in frame.combinations.values()):
        more = {n: replace(c, lean=c.lean * (1 + 1e-4)) for n, c in frame.combinations.items()}
        other["lean"] = replace(frame, combinations=more)
    if frame.ties:
        other["tie"] = replace(frame, ties={})
    return other


# --- weight of a taper in a state ----------------------------------------------------------------------


def test_a_taper_weighs_the_same_in_every_state() -> None:
    """Closed form: the area goes with a power p of a depth that goes straight from d to r d, so that the weight is
    g A L (r^(p+1) - 1) / ((p + 1)(r - 1)). A state that factors the area at one end only changes none of it."""
    frame = read_frame_text(PORTAL.format(members=WHOLE, loads="{ self_weight = 1.0 }") + STATE)
    length, r, p = 5.0, 2.0, np.log(0.024 / 0.016) / np.log(2.0)
    true = 77.0 * 0.016 * length * (r ** (p + 1) - 1) / ((p + 1) * (r - 1))
    found = {name: load_table(frame.under(name), name) for name in ("works", "soft")}
    for table in found.values():
        on = table.line_member == frame.member_index["A-B"]
        total = (table.line_along[on].mean(axis=1) * (table.line_end - table.line_start)[on]).sum()
        assert -total == pytest.approx(true, rel=1e-13)
    assert np.array_equal(found["works"].line_across, found["soft"].line_across)


# --- division into prismatic members --------------------------------------------------------------------


PORTAL = """\
units = "kN m"
[materials.steel]
E = "200 GPa"
nu = 0.3
alpha = 1.2e-5
density = "77 kN/m^3"
[sections]
light = {{ I = 4e-4, A = 0.016, shear_area = 0.007, depth = 0.5 }}
deep = {{ I = 2e-3, A = 0.024, shear_area = 0.014, depth = 1.0 }}
{members}
[supports]
A = {{ x = "held", y = "held", rotation = 9000 }}
D = "fixed"
[analysis]
shear = "elastic"
[loads.works]
apply = [{loads}]
"""
WHOLE = """\
[joints]
A = [0, 0]
B = [0, 5]
C = [9, 7]
D = [9, 0]
[members]
"A-B" = { material = "steel", taper = ["light", "deep"] }
"B-C" = { material = "steel", profile = [[["deep", "light"], "40%"], ["light", "80%"], ["deep", "100%"]] }
DC = { from = "D", to = "C", material = "steel", section = "light", rigid_to = 0.2 }
"""
STATE = """\
[stiffness.soft]
"section light" = { A = 0.8 }
[combinations]
soft = { works = 1.0, stiffness = "soft" }
"""
ENDS: Mapping[str, tuple[tuple[float, float], tuple[float, float]]] = {
    "AB": ((0.0, 0.0), (0.0, 5.0)), "BC": ((0.0, 5.0), (9.0, 7.0)), "DC": ((9.0, 0.0), (9.0, 7.0)),
}  # fmt: skip
ON = {
    "AB": '{{ members = {AB}, uniform = 6, direction = "right" }}, {{ members = {AB}, temperature = 20, difference = 15 }}',
    "BC": '{{ members = {BC}, uniform = 9, direction = "down" }}, {{ members = {BC}, difference = -10 }}',
}
"""Loads over whole members; a lone force stands at 60% of BC, where every division has a joint."""


def section(member: str, x: float) -> tuple[float, float, float, float]:
    """I, A, shear area and depth at the share x of AB or BC: by the power of the depth that fits both ends."""
    light, deep = np.array([4e-4, 0.016, 0.007]), np.array([2e-3, 0.024, 0.014])
    rise = x if member == "AB" else max(0.0, 1.0 - x / 0.4) if x < 0.8 else 1.0
    depth = 0.5 + 0.5 * rise
    I, A, shear_area = light * (depth / 0.5) ** (np.log(deep / light) / np.log(2.0))  # noqa: E741
    return float(I), float(A), float(shear_area), depth


def divided(parts: int) -> Frame:
    """The portal with AB and BC as `parts` prismatic members each, of the section at their middle."""
    sections, joints, members = [], ["A = [0, 0]", "B = [0, 5]", "C = [9, 7]", "D = [9, 0]"], []
    names: dict[str, list[str]] = {"AB": [], "BC": []}
    for member, own in names.items():
        (x0, y0), (x1, y1) = ENDS[member]
        at = [member[0], *(f"{member}{n}" for n in range(1, parts)), member[1]]
        for n in range(parts):
            if n:
                joints.append(f"{at[n]} = [{x0 + (x1 - x0) * n / parts!r}, {y0 + (y1 - y0) * n / parts!r}]")
            I, A, shear_area, depth = section(member, (n + 0.5) / parts)  # noqa: E741
            own.append(f"{member} part {n}")
            sections.append(f'"{own[-1]}" = {{ I = {I!r}, A = {A!r}, shear_area = {shear_area!r}, depth = {depth!r} }}')
            members.append(f'"{own[-1]}" = {{ from = "{at[n]}", to = "{at[n + 1]}", section = "{own[-1]}", '
                           f'material = "steel" }}')  # fmt: skip
    members.append('DC = { from = "D", to = "C", section = "light", material = "steel", rigid_to = 0.2 }')
    lone = f'{{ joint = "BC{parts * 3 // 5}", force = 40, direction = "down" }}'
    text = "\n".join([*sections, "[joints]", *joints, "[members]", *members])
    return portal(text, {k: "[" + ", ".join(f'"{n}"' for n in own) + "]" for k, own in names.items()}, lone)


def portal(members: str, names: Mapping[str, str], lone: str) -> Frame:
    loads = ["{ self_weight = 1.0 }", *(on.format(**names) for on in ON.values()), lone]
    return read_frame_text(PORTAL.format(members=members, loads=", ".join(loads)))


def values(answer: Answer, frame: Frame, parts: int) -> np.ndarray[tuple[int], np.dtype[np.float64]]:
    """Movements of the four joints, reactions and end actions as a row, each kind in shares of its largest; parts: of AB
    and BC each (1: whole members)."""
    case = answer.cases["works"]
    joints = case.joints[:4] if parts == 1 else case.joints[[frame.joint_index[j] for j in "ABCD"]]
    at = [(m, e) for m in (0, parts) for e in ((m, 0), (m + parts - 1, 1))]
    ends = np.array([case.ends[e] for _, e in at] + [case.ends[-1, 0], case.ends[-1, 1]])
    reactions = case.reactions[[frame.joint_index[j] for j in "AD"]]
    kinds = [joints[:, :2], joints[:, 2:], reactions[:, :2], reactions[:, 2:], ends[:, :2], ends[:, 2:]]
    return np.concatenate([(kind / np.abs(kind).max()).ravel() for kind in kinds])


@pytest.mark.parametrize("opinion", [slope_deflection, moment_distribution])
def test_members_that_vary_are_what_many_prismatic_members_come_to(opinion: object) -> None:
    """The error of prismatic members falls with the square of their number: a quarter for twice as many, and what it falls
    towards (Richardson 1911) is the answer for the tapered and stepped members themselves."""
    lone = '{ member = "B-C", force = 40, at = "60%", direction = "down" }'
    whole = portal(WHOLE, {"AB": '["A-B"]', "BC": '["B-C"]'}, lone)
    frames = {1: whole, **{parts: divided(parts) for parts in (50, 100, 200)}}
    found = {}
    for parts, frame in frames.items():
        answer = opinion.opine(frame, study(frame))  # type: ignore[attr-defined]
        assert isinstance(answer, Answer)
        found[parts] = values(answer, frame, parts)
    errors = [np.abs(found[parts] - found[1]).max() for parts in (50, 100, 200)]
    assert 1e-6 < errors[2] < 1e-4
    assert errors[0] / errors[1] == pytest.approx(4.0, abs=0.02) and errors[1] / errors[2] == pytest.approx(4.0, abs=0.01)
    assert np.abs((4 * found[200] - found[100]) / 3 - found[1]).max() < 1e-8


# --- second order ----------------------------------------------------------------------------------------

SECOND = (3, 8, 9, 21, 22, 24, 33, 34, 40, 52, 53, 58, 63, 68)
"""Frames without one-way parts: with tapers, steps, ties, single rigid members, states of stiffness and leans."""


@pytest.mark.parametrize("seed", SECOND)
def test_many_elements_converge_to_the_answer_in_second_order(seed: int) -> None:
    """The error of 4 and of 12 elements between any two loads against both opinions: by the power of their length with
    which that of many elements falls (tests/many_elements.py)."""
    found = loaded(seed)
    assert found is not None and not found.one_way
    first = next(iter(found.combinations.values()))
    frame = replace(found, combinations={LOADED: replace(first, name=LOADED)}).under(LOADED)
    answers = ask(frame, (LOADED,)).answers
    for name in OWN:
        coarse, fine = (largest_error(frame, answers[name], parts) for parts in (4, 12))
        assert coarse < 0.1 and falls(frame, coarse, fine), (name, coarse, fine)
