"""End forces in global axes and end values at the face of rigid zones: found by fit for a whole claim, never for one
value."""

from __future__ import annotations

from functools import lru_cache

import numpy as np
import pytest

from tests.claim_frame import BENT, Known, bent


def global_ends(k: Known, case: str = "dead", sign: float = 1.0, wrong: str = "") -> str:
    """Forces on members along global x and y, and anticlockwise moments."""
    t = k.frame.member_table
    rows = ["Member\tNode\tFx [kN]\tFy [kN]\tMz [kNm]"]
    for m, member in enumerate(k.frame.members.values()):
        for e, joint in enumerate((member.joint_from, member.joint_to)):
            n, v, mm = k.answer.cases[case].ends[m, e]
            along = n if e else -n
            x, y = along * t.cos[m] - v * t.sin[m], along * t.sin[m] + v * t.cos[m]
            x *= 1.2 if wrong == f"{member.name} {joint}" else 1.0
            rows.append(f"{member.name}\t{joint}\t{sign * x:.4f}\t{sign * y:.4f}\t{-sign * mm:.4f}")
    return f"Load case: {case}\n" + "\n".join(rows) + "\n"


@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_global_axes(sign: float) -> None:
    k = bent()
    verdict, closed, cases = k.judge(global_ends(k, sign=sign))
    assert verdict == "agree", closed
    assert cases[0].compared == 30
    assert any("global axes" in note for note in closed.notes)


def test_one_wrong_force_in_global_axes_is_found_at_its_place() -> None:
    k = bent()
    verdict, closed, cases = k.judge(global_ends(k, wrong="A-B A"))
    assert verdict == "disagree"
    assert any("global axes" in note for note in closed.notes)
    assert {(d.place.member, d.place.joint) for d in cases[0].differences} == {("A-B", "A")}


@lru_cache(maxsize=1)
def zoned() -> Known:
    text = BENT.replace(
        'rafter = { from = "B", to = "C",', 'rafter = { from = "B", to = "C", rigid_from = 0.3, rigid_to = 0.25,'
    )
    return Known(text.replace('"C-E" = {', '"C-E" = { rigid_from = 0.25, rigid_to = 0.3,'))


def face_ends(k: Known, case: str = "dead", factor: float = 1.0) -> str:
    """End moments at the faces of the rigid zones, anticlockwise."""
    rows = ["Member\tNode\tM [kNm]"]
    for m, member in enumerate(k.frame.members.values()):
        length = k.frame.member_table.length[m]
        for e, joint in enumerate((member.joint_from, member.joint_to)):
            x = member.rigid_from if e == 0 else length - member.rigid_to
            value = k.answer.spans.along(case, np.array([m]), np.array([x]), np.array([1 if e == 0 else -1]))[0, 2]
            value *= factor if (member.name, e) == ("rafter", 0) else 1.0
            rows.append(f"{member.name}\t{joint}\t{-(value if e == 0 else -value):.4f}")
    return f"Load case: {case}\n" + "\n".join(rows) + "\n"


def test_values_at_the_face_are_recognised_and_compared_there() -> None:
    k = zoned()
    verdict, closed, cases = k.judge(face_ends(k))
    assert verdict == "agree", closed
    assert cases[0].compared == 10
    assert any("face of rigid zones, by fit" in note for note in closed.notes)
    assert sum(v.kind == "span" for v in closed.values) == 4


def test_values_stated_to_be_at_the_face() -> None:
    k = zoned()
    verdict, closed, _ = k.judge("Moments at the face of columns\n" + face_ends(k))
    assert verdict == "agree", closed
    assert any("as stated" in note for note in closed.notes)
    assert k.judge(face_ends(k), face=False)[0] == "agree"
    assert k.judge("Moments at the face of columns\n" + k.ends("dead"), case="dead")[0] == "disagree"


def test_one_value_at_the_face_among_others_at_the_joint_is_a_finding() -> None:
    k = zoned()
    rows = k.ends("dead").splitlines()
    rows[3] = rows[3].rsplit("\t", 1)[0] + "\t" + f"{-float(face_ends(k).splitlines()[4].split()[-1]):.3f}"
    verdict, closed, cases = k.judge("Load case: dead\n" + "\n".join(rows))
    assert verdict == "disagree"
    assert [(d.place.member, d.place.joint, d.place.quantity) for d in cases[0].differences] == [("rafter", "B", "moment")]
    assert not any("face" in note for note in closed.notes)


def test_an_error_at_the_face_is_found() -> None:
    k = zoned()
    verdict, _, cases = k.judge(face_ends(k, factor=1.3))
    assert verdict == "disagree"
    assert len(cases[0].differences) == 1


def test_reactions_along_a_turned_supports_own_axes() -> None:
    """A support at 30 degrees: its reaction along its own axes has no part along the free one."""
    turned = '{ x = "held", y = "held", rotation = "held", angle = 30 }'
    k = Known(BENT.replace('D = "fixed"', f"D = {turned}").replace('F = "fixed"', f"F = {turned}"))
    rows = ["Joint\tFx [kN]\tFy [kN]"]
    c, s = np.cos(np.pi / 6), np.sin(np.pi / 6)
    for joint in k.frame.supports:
        fx, fy, _ = k.answer.cases["dead"].reactions[k.frame.joint_index[joint]]
        own = (fx, fy) if joint == "A" else (c * fx + s * fy, c * fy - s * fx)
        rows.append(f"{joint}\t{own[0]:.4f}\t{own[1]:.4f}")
    verdict, closed, cases = k.judge("Load case: dead\n" + "\n".join(rows))
    assert verdict == "agree", closed
    assert any("support's own axes" in note for note in closed.notes)
    assert cases[0].compared == 6
    wrong = "\n".join(rows).replace(rows[3].split("\t")[2], "99.0000")
    assert k.judge(f"Load case: dead\n{wrong}")[0] == "disagree"


# --- moments at joints: reactions, or those of the members there


@lru_cache(maxsize=1)
def beam() -> Known:
    return Known(SPANS)


SPANS = """
title = "Four spans and a cantilever"
units = "kN m"
[materials.s]
E = "205 GPa"
[sections.b]
I = "21000 cm^4"
A = "76 cm^2"
[joints]
A = [0, 0]
B = [6, 0]
C = [11.5, 0]
D = [17, 0]
E = [23.4, 0]
F = [25, 0]
[members]
"A-B" = { section = "b", material = "s" }
"B-C" = { section = "b", material = "s" }
"D-C" = { section = "b", material = "s" }
"D-E" = { section = "b", material = "s" }
"E-F" = { section = "b", material = "s" }
[supports]
A = "fixed"
B = "roller"
C = "roller"
D = "roller"
E = "roller"
[loads.floor]
apply = [
  { members = ["A-B", "B-C", "D-C", "D-E"], uniform = 14, direction = "down" },
  { joint = "F", force = 16, direction = "down" },
]
"""


def over_supports(joints: str, sign: float = 1.0, wrong: str = "", by: float = -1.0, head: str = "Support\tM [kNm]") -> str:
    """Bending moments over the supports, sagging positive."""
    k = beam()
    x = {"A": ("A-B", 0.0, 1), "B": ("A-B", 6.0, -1), "C": ("B-C", 5.5, -1), "D": ("D-E", 0.0, 1), "E": ("D-E", 6.4, -1)}
    rows = [head]
    for joint in joints:
        member, at, side = x[joint]
        where = np.array([k.frame.member_index[member]]), np.array([at]), np.array([side])
        value = sign * k.answer.spans.along("floor", *where)[0, 2] * (by if joint == wrong else 1.0)
        rows.append(f"{joint}\t{value:.3f}")
    return "\n".join(rows) + "\n"


@pytest.mark.parametrize(("sign", "said"), [(1.0, "sagging"), (-1.0, "hogging")])
def test_moments_over_supports_are_those_of_the_members(sign: float, said: str) -> None:
    verdict, closed, cases = beam().judge(over_supports("ABCDE", sign))
    assert verdict == "agree", closed
    assert cases[0].compared == 5
    assert said in closed.signs["moment"]
    assert any("moments at joints are those of the members" in note for note in closed.notes)


@pytest.mark.parametrize(
    "text", [over_supports("BC"), over_supports("ABCDE", wrong="C"), over_supports("ABCDE", wrong="D", by=1.2)]
)
def test_moments_at_joints_that_fit_too_few_or_not_all_are_undecided(text: str) -> None:
    verdict, closed, _ = beam().judge(text)
    assert verdict == "undecided"
    assert "name the member" in closed.undecided[0]


def test_moments_under_the_word_reactions_are_reactions() -> None:
    assert beam().judge("Reactions\n" + over_supports("ABCDE"))[0] == "disagree"
    k = bent()
    rows = [f"{j}\t{k.answer.cases['dead'].reactions[k.frame.joint_index[j], 2]:.3f}" for j in "ADF"]
    text = "Load case: dead\nJoint\tM [kNm]\n" + "\n".join(rows)
    assert k.judge(text)[0] == "agree"
    assert k.judge(text.replace(rows[2], f"F\t{1.2 * float(rows[2][2:]):.3f}"))[0] == "undecided"
    assert k.judge("Reactions\n" + text.replace(rows[2], f"F\t{1.2 * float(rows[2][2:]):.3f}"))[0] == "disagree"


def test_a_moment_at_a_joint_in_words() -> None:
    k = beam()
    value = abs(float(over_supports("C").split()[-1]))
    assert k.judge(f"the moment at C is {value:.2f} kNm")[0] == "agree"
    assert k.judge(f"the moment at C is {1.2 * value:.2f} kNm")[0] == "disagree"
    verdict, closed, _ = bent().judge("dead: the moment at C is 20 kNm")  # three members meet there
    assert verdict == "undecided"
    assert "which member's moment at C" in closed.undecided[0]


def test_one_support_reaction_in_words_is_held_to_that_joint() -> None:
    """The joint's own reaction is the scale, not what the joint moves by."""
    k = bent()
    fx, fy, _ = k.answer.cases["dead"].reactions[k.frame.joint_index["D"]]
    assert k.judge(f"dead: Rx at D {abs(fx):.2f} kN, Ry {abs(fy):.2f} kN")[0] == "agree"
    assert k.judge(f"dead: Rx at D {1.4 * abs(fx):.2f} kN")[0] == "disagree"
    assert k.judge(f"dead: Ry at D {0.95 * abs(fy):.2f} kN")[0] == "disagree"


# --- stations at a point load


def test_a_station_printed_at_a_point_load_may_be_of_either_side() -> None:
    """At a third of 6.4 m the printed 2.133 lies beside the load; shear before it and after it are both right."""
    load = "  { member = \"D-E\", force = 40, at = 2.13333333, direction = \"down\" },\n"
    k = Known(SPANS.replace("  { joint = \"F\"", load + "  { joint = \"F\""))
    m = k.frame.member_index["D-E"]
    for side in (-1, 1):
        rows = ["Member\tx [m]\tV [kN]"]
        for x, s in ((0.0, 1), (2.13333333, side), (4.0, 1), (6.4, -1)):
            v = k.answer.spans.along("floor", np.array([m]), np.array([x]), np.array([s]))[0, 1]
            rows.append(f"D-E\t{x:.3f}\t{v:.3f}")
        assert k.judge("\n".join(rows))[0] == "agree"
    middle = rows[2].split("\t")
    assert k.judge("\n".join([*rows[:2], f"D-E\t2.133\t{float(middle[2]) + 20:.3f}", *rows[3:]]))[0] == "disagree"
