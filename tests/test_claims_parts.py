"""Claims that print the other model's own input: names by coordinates, members divided into elements, facts."""

from __future__ import annotations

import numpy as np
import pytest

from crosscheck.check import printed_input
from crosscheck.claims import FrameNames
from tests.claim_frame import Known, bent

NUMBERS = {"A": "11", "B": "12", "C": "13", "D": "14", "E": "15", "F": "16"}
CUTS = {"rafter": (0.3, 0.7)}


def elements(k: Known) -> list[tuple[str, str, float, float, str, str]]:
    """(label, member, start, end, start joint, end joint) of every element; the rafter is three of them, the second run
    backwards."""
    out, label = [], 100
    lengths = k.frame.member_table.length
    for n, m in enumerate(k.frame.members.values()):
        cuts = [0.0, *CUTS.get(m.name, ()), 1.0]
        joints = [NUMBERS[m.joint_from], *[str(90 + c) for c in range(1, len(cuts) - 1)], NUMBERS[m.joint_to]]
        for c, (a, b) in enumerate(zip(cuts, cuts[1:], strict=False)):
            label += 1
            piece = (str(label), m.name, a * lengths[n], b * lengths[n], joints[c], joints[c + 1])
            out.append((piece[0], piece[1], piece[3], piece[2], piece[5], piece[4]) if c == 1 else piece)
    return out


def coordinates(k: Known, scale: float = 1.0, unit: str = "") -> str:
    rows = [f"Node\tX{unit}\tY{unit}"]
    rows += [f"{NUMBERS[j.name]}\t{j.x * scale:.4f}\t{j.y * scale:.4f}" for j in k.frame.joints.values()]
    for name, cuts in CUTS.items():
        m = k.frame.members[name]
        p, q = k.frame.joints[m.joint_from], k.frame.joints[m.joint_to]
        rows += [f"{91 + c}\t{(p.x + s * (q.x - p.x)) * scale:.4f}\t{(p.y + s * (q.y - p.y)) * scale:.4f}"
                 for c, s in enumerate(cuts)]  # fmt: skip
    return "Joint coordinates\n" + "\n".join(rows) + "\n\n"


def connectivity(k: Known) -> str:
    return "Elements\nElement\tStart node\tEnd node\n" + "".join(f"{e[0]}\t{e[4]}\t{e[5]}\n" for e in elements(k)) + "\n"


def element_ends(k: Known, case: str, moment: float = 1.0, wrong: str = "") -> str:
    """End actions of every element in its own axes, anticlockwise where moment is -1."""
    rows = ["Element\tNode\tN [kN]\tV [kN]\tM [kNm]"]
    for label, member, start, end, first, last in elements(k):
        m = k.frame.member_index[member]
        r = 1 if end > start else -1
        for place, (x, joint) in enumerate(((start, first), (end, last))):
            side = (1 if place == 0 else -1) * r
            n, v, mm, _ = k.answer.spans.along(case, np.array([m]), np.array([x]), np.array([side]))[0]
            low = 1 if side > 0 else -1  # on the face towards larger x, actions are the values along the member
            v, mm = r * low * v, low * mm
            mm *= 1.3 if label == wrong and place == 0 else 1.0
            rows.append(f"{label}\t{joint}\t{n:.4f}\t{v:.4f}\t{moment * mm:.4f}")
    return f"Load case: {case}\nElement forces\n" + "\n".join(rows) + "\n"


@pytest.mark.parametrize(("scale", "unit"), [(1.0, " [m]"), (1000.0, " [mm]"), (1000.0, ""), (1 / 0.3048, "")])
def test_other_numbering_and_divided_members_by_coordinates(scale: float, unit: str) -> None:
    k = bent()
    text = coordinates(k, scale, unit) + connectivity(k) + element_ends(k, "dead", moment=-1)
    verdict, closed, cases = k.judge(text)
    assert verdict == "agree", (closed.undecided, closed.foreign, closed.not_understood[:2])
    assert cases[0].compared == 2 * 3 * 7
    assert sum(v.kind == "span" for v in closed.values) == 4 * 3, "values where the rafter is divided stand within it"
    assert any("parts of rafter" in note for note in closed.notes)


def test_an_error_inside_a_divided_member_is_found() -> None:
    k = bent()
    verdict, _, cases = k.judge(coordinates(k) + connectivity(k) + element_ends(k, "dead", wrong="103"))
    assert verdict == "disagree"
    assert [(d.place.member, d.place.quantity) for d in cases[0].differences] == [("rafter", "moment")]


def test_a_chain_of_joints_tells_the_ends_alone() -> None:
    k = bent()
    names = {v: n for n, v in NUMBERS.items()}
    text = connectivity(k) + element_ends(k, "dead")
    for number, name in names.items():
        text = text.replace(f"\t{number}\t", f"\t{name}\t").replace(f"\t{number}\n", f"\t{name}\n")
    verdict, closed, cases = k.judge(text)
    assert verdict == "agree", (closed.undecided, closed.foreign, closed.not_understood[:2])
    assert cases[0].compared == 30
    assert any("inside rafter" in note for note in closed.notes)


def test_the_reading_file_puts_elements_together() -> None:
    k = bent()
    rows = ["Element\tEnd\tM [kNm]"]
    for label, member, start, end, _, _ in elements(k):
        if label != "103":
            m = k.frame.member_index[member]
            for word, x, side in (("i", start, 1), ("j", end, -1)):
                mm = k.answer.spans.along("dead", np.array([m]), np.array([x]), np.array([side]))[0, 2]
                rows.append(f"{label}\t{word}\t{side * mm:.4f}")
        else:
            rows += [f"{label}\ti\t1.0", f"{label}\tj\t2.0"]
    whole = {"101": "A-B", "105": "D-C", "106": "C-E", "107": "E-F"}
    verdict, closed, _ = k.judge(
        "Load case: dead\n" + "\n".join(rows), members=whole, parts={"rafter": ("102", "103", "104")}
    )
    assert verdict == "agree", (closed.undecided, closed.foreign)
    assert len(closed.values) == 10


def test_names_that_agree_are_not_renamed_by_one_moved_joint() -> None:
    """A joint of the same name at another place is a difference of geometry, not another name."""
    k = bent()
    rows = [f"{j.name}\t{j.x:.3f}\t{j.y + (0.4 if j.name == 'C' else 0):.3f}" for j in k.frame.joints.values()]
    reading = k.read("Joint\tX [m]\tY [m]\n" + "\n".join(rows) + "\n\nLoad case: dead\n" + k.ends("dead"))
    assert len(reading.entries) == 30
    assert not reading.foreign
    assert {(f.what, f.where): f.value for f in reading.echo}["joint y", "C"] == pytest.approx(5.4)
    assert FrameNames.of(k.frame).xy["C"] == (6, 5)


def test_the_other_models_input_becomes_facts_in_the_frames_names() -> None:
    k = bent()
    text = coordinates(k) + connectivity(k)
    text += "Supports\nNode\tX\tY\tRotation\n11\tfixed\tfixed\tfixed\n14\tfixed\tfixed\tfree\n\n"
    text += "Sections\nSection\tI [cm4]\tA [cm2]\tE [GPa]\npost\t8360\t53.8\t210\n\n"
    text += "Load totals\nCase\tFx [kN]\tFy [kN]\ndead\t9.0\t-103.4\nwind\t34.0\t0.0\n\n"
    reading = k.read(text + element_ends(k, "dead"))
    facts = {(f.what, f.where): f.value for f in reading.echo}
    assert facts["joint y", "C"] == 5.0
    assert facts["member ends", "A-B"] == "A to B"
    assert facts["support", "A"] == "111"
    assert facts["support", "D"] == "110"
    assert facts["I", "post"] == 8360
    assert facts["total y", "dead"] == -103.4
    assert ("member ends", "102") not in facts, "parts of a member are no members of another frame"
    assert not reading.undecided
    assert len(reading.entries) == 42


def test_a_difference_of_the_printed_input_has_its_kind_and_place() -> None:
    k = bent()
    text = coordinates(k).replace("\t5.0000", "\t5.4000", 1)
    text += "Supports\nNode\tX\tY\tRotation\n11\tfixed\tfixed\tfree\n14\tfixed\tfixed\tfixed\n16\tfixed\tfixed\tfixed\n\n"
    text += "Sections\nSection\tI [cm4]\tA [cm2]\npost\t9250\t53.8\n\n"
    text += "Load totals\nCase\tFx [kN]\tFy [kN]\ndead\t9.0\t-113.4\n\n"
    found = printed_input(k.frame, k.read(text + connectivity(k) + element_ends(k, "dead")))
    told = {(fact.kind, fact.where) for fact in found}
    assert told == {("support", ("A",)), ("stiffness", ("post",)), ("load", ("dead",)), ("geometry", ("C",))}
    assert str(found[0]).startswith("the other model has")
