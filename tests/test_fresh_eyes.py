"""What an engineer with a deadline stumbled over, who knew the README alone: each check failed before it was mended.

Expected values are closed forms (Kleinlogel's portal with fixed feet; the three-moment equation for a beam of two spans),
which the comments give; from memory.
"""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest

from crosscheck import check
from crosscheck.claims import FrameNames, read_claim_text
from tests.calls import CASES, Call, call, put
from tests.transforms import printed

PORTAL = """
title = "Portal with fixed feet"
units = "kN m"
materials.s = { E = "210 GPa" }
sections.c = { I = "10000 cm^4" }
joints = { A = [0, 0], B = [0, 4], C = [8, 4], D = [8, 0] }
members."A-B" = { section = "c", material = "s" }
members."B-C" = { section = "c", material = "s" }
members."C-D" = { section = "c", material = "s" }
supports = { A = "fixed", D = "fixed" }
analysis = { axial = "rigid" }
loads.wind.apply = [{ joint = "B", force = 40, direction = "right" }]
loads.dead.apply = [{ member = "B-C", uniform = 12, direction = "down" }]
"""
"""k = h / L = 1/2. Dead: M_B = w L^2 / (6 (k + 2)) = 51.2, M_A = 25.6, mid span 96 - 51.2 = 44.8. Wind: M_A = P h / 2
(3 k + 1) / (6 k + 1) = 50, M_B = 80 - 50 = 30, V = 60 / 8 = 7.5, H = 20."""

BEAM = """
title = "Beam of two spans"
units = "N mm"
materials.s = { E = 200000 }
sections.b = { I = 80e6, A = 5000 }
joints = { A = [0, 0], B = [6000, 0], C = [14000, 0] }
members.AB = { from = "A", to = "B", section = "b", material = "s" }
members.BC = { from = "C", to = "B", section = "b", material = "s" }
supports = { A = "pinned", B = "roller", C = "roller" }
loads.q.apply = [{ members = ["AB", "BC"], uniform = 20, direction = "down" }]
"""
"""M_B = -w (a^3 + b^3) / (8 (a + b)) = -130 kNm; R_A = 60 - 130/6 = 38.33, R_C = 80 - 130/8 = 63.75, R_B = 177.92 kN; in
the spans R^2 / (2 w) = 36.74 and 101.6 kNm. BC runs from right to left on purpose: sagging is tension below in it, too."""


def told(tmp_path: Path, frame: str, case: str, *lines: str) -> Call:
    """What verify says of values in words."""
    claim = put(tmp_path, "\n".join(lines) + "\n", "claim.txt")
    return call("verify", put(tmp_path, frame), claim, "--case", case)


RIGHT = [
    (PORTAL, "wind", 3, "Hi, for the wind case I get M_A = -50.0 kNm, M_B = 30 kNm, and the sway is 8.9 mm to the right."),
    (PORTAL, "dead", 3, "B-C max sagging 44.8 kNm, B-C hogging 51.2 kNm at B, B-C midspan moment 44.8 kNm"),
    (PORTAL, "dead", 2, "moment in B-C at 2 m from C 20.8 kNm sagging, moment in B-C 20.8 kNm at 25%"),
    (PORTAL, "wind", 4, "Reactions: A H = 20 kN, V = 7.5 kN\nReactions: D H = 20 kN, V = 7.5 kN"),
    (PORTAL, "wind", 3, "M_AB = -50 kNm, M_BA = -30 kNm, sway 8.89 mm"),
    (PORTAL, "wind", 3, "moments are 50 kNm at both A and D, sway 8.9 mm"),
    (PORTAL, "wind", 1, "Dx = 8.89 mm"),
    (PORTAL, "dead", 2, "B-C has a hogging moment of 51.2 kNm at B and a sagging moment of 44.8 kNm in the middle."),
    (PORTAL, "wind", 2, "Dx = 20 kN, D_y = 7.5 kN"),
    (PORTAL, "wind", 1, "B moves 8.89 mm to the right"),
    (PORTAL, "wind", 2, "axial force in A-B 7.5 kN tension, in C-D 7.5 kN compression"),
    (PORTAL, "dead", 1, "With 12 kN/m the largest moment is 51.2 kNm"),
    (PORTAL, "dead", 2, "moment at B 51.2 kNm shear in B-C 48 kN"),
    (PORTAL, "dead", 2, "Beam B-C: M- = 51.2 kNm at C, M+ = 44.8 kNm at x = 4.00 m"),
    (PORTAL, "dead", 1, "Base thrust H_A = 19.2 kN"),
    (BEAM, "q", 4, "Moment over B: 130 kNm hogging. Max sagging moment in span AB 36.7 kNm, in span BC 101.6 kNm.\n"
                   "Max deflection span BC 34.8 mm"),
    (BEAM, "q", 3, "Support reactions (kN): A 38.3, B 177.9, C 63.8"),
    (BEAM, "q", 3, "RA = 38.3 kN, RB = 177.9 kN and R_C = 63.75 kN"),
    (BEAM, "q", 3, "Ay = 38.3 kN, By = 177.9 kN, C_y = 63.75 kN"),
    (BEAM, "q", 2, "Vertical reaction at B is 177.9 kN and at A 38.3 kN"),
    (BEAM, "q", 3, "Reaction at B 177,917 N, at A 38,333 N, moment AB at B 129,998,000.0 N mm"),
]  # fmt: skip


@pytest.mark.parametrize(("frame", "case", "count", "text"), RIGHT, ids=[r[3][:40] for r in RIGHT])
def test_right_values_in_words_agree(tmp_path: Path, frame: str, case: str, count: int, text: str) -> None:
    said = told(tmp_path, frame, case, text)
    assert said.status == 0 and f"the {count} value" in " ".join(said.out.split()), said.out


WRONG = [
    (PORTAL, "dead", "B-C max sagging 51.2 kNm"),
    (PORTAL, "dead", "moment in B-C at 2 m from C 20.8 kNm hogging"),
    (PORTAL, "dead", "moment B-C at C 51.2 kNm sagging"),
    (PORTAL, "wind", "axial force in A-B 7.5 kN compression"),
    (PORTAL, "wind", "B moves 8.89 mm to the left"),
    (PORTAL, "dead", "Beam B-C: M+ = 51.2 kNm"),
    (PORTAL, "wind", "moments are 50 kNm at both A and B"),
    (BEAM, "q", "max sagging moment in BC 130 kNm"),
    (BEAM, "q", "RA = 38.3 kN, RB = 187.9 kN"),
]


@pytest.mark.parametrize(("frame", "case", "text"), WRONG, ids=[w[2][:40] for w in WRONG])
def test_wrong_values_in_words_disagree(tmp_path: Path, frame: str, case: str, text: str) -> None:
    assert told(tmp_path, frame, case, text).status == 1


PLACELESS = ["knee moment 30 kNm", "M top 30 kNm", "base moments are 40 kNm", "horizontal thrust 35 kN", "moment 30 kNm"]


@pytest.mark.parametrize("text", PLACELESS)
def test_a_result_of_no_place_keeps_a_claim_from_agreeing(tmp_path: Path, text: str) -> None:
    """A knee is no joint of the frame, and its moment not the frame's largest; nor is it passed over, as no row of a table
    is. A number that is no result is."""
    said = told(tmp_path, PORTAL, "wind", "A-B at A 50 kNm", text)
    assert said.status == 3 and "it is not said which" in said.out
    assert told(tmp_path, PORTAL, "wind", "A-B at A 50 kNm", "with 40 kN at the eaves").status == 0


def test_words_with_a_value_that_nothing_reads_are_said(tmp_path: Path) -> None:
    """They were taken for a heading, and nothing said so."""
    said = told(tmp_path, PORTAL, "wind", "A-B at A 50 kNm", "", "Support reactions (kN): left 20.0, right 20.0")
    assert "a value in words that is not understood" in " ".join(said.out.split()), said.out


def test_the_size_of_the_other_sign_is_said(tmp_path: Path) -> None:
    said = told(tmp_path, PORTAL, "dead", "B-C max 44.8 kNm")
    assert said.status == 1 and 'say "sagging" or "hogging"' in " ".join(said.out.split())


BRACED = """
units = "kN mm"
materials.s = { E = 210 }
sections = { c = { I = 25e6, A = 4300 }, b = { I = 60e6, A = 4500 }, r = { I = 7854, A = 314 } }
joints = { A = [0, 0], B = [0, 4000], C = [6000, 4000], D = [6000, 0] }
members."A-B" = { section = "c", material = "s" }
members."D-C" = { section = "c", material = "s" }
members."B-C" = { section = "b", material = "s", hinge = "both" }
members.rod = { from = "A", to = "C", section = "r", material = "s", hinge = "both" }
supports = { A = "pinned", D = "pinned" }
loads.all.apply = [{ member = "B-C", uniform = 0.03, direction = "down" }, { joint = "B", force = 45, direction = "right" }]
envelopes.most = ["all"]
"""


@pytest.mark.parametrize("case", ["all", "most"])
def test_noise_is_printed_as_zero_where_only_the_spans_have_moments(tmp_path: Path, case: str) -> None:
    """No member end has a moment here (every part is pinned or hangs straight), so the largest of the column is rounding
    noise: it is no scale to print by."""
    said = call("opinions", put(tmp_path, BRACED), "--case", case, "--report", tmp_path / "record.html")
    page = (tmp_path / "record.html").read_text(encoding="utf-8")
    noise = re.compile(r"\d\.\d+e-\d\d")
    assert said.status == 0 and not noise.search(said.out.split("agreed")[-1]) and not noise.search(page)


TAPERED = """
units = "kN m"
materials.s = { E = "210 GPa" }
sections.deep = { I = "90000 cm^4", A = "140 cm^2", depth = "900 mm" }
sections.light = { I = "23000 cm^4", A = "84 cm^2", depth = "450 mm" }
joints = { A = [0, 0], B = [0, 7], C = [12.5, 9], D = [25, 7], E = [25, 0] }
members.AB = { from = "A", to = "B", material = "s", taper = ["light", "deep"] }
members.BC = { from = "B", to = "C", material = "s", profile = [[["deep", "light"], "20%"], ["light", "100%"]] }
members.CD = { from = "C", to = "D", material = "s", profile = [["light", "80%"], [["light", "deep"], "100%"]] }
members.DE = { from = "D", to = "E", material = "s", taper = ["deep", "light"] }
supports = { A = "pinned", E = "pinned" }
loads.g.apply = [{ members = ["BC", "CD"], uniform = 9, direction = "down" }]
"""


def test_tapers_that_mirror_each_other_are_symmetrical(tmp_path: Path) -> None:
    """They were told apart by the section of the longest piece, which of two equal ones is the first: an artefact."""
    assert "symmetrical" not in call("inspect", put(tmp_path, TAPERED)).out
    for right, wrong in (('taper = ["deep", "light"]', 'taper = ["light", "deep"]'), ('"80%"', '"70%"')):
        slip = TAPERED.replace(right, wrong)
        assert "symmetrical, but" in call("inspect", put(tmp_path, slip)).out


def test_a_claim_of_another_frame_is_told_by_its_names(tmp_path: Path) -> None:
    """It was said that heads did not match the columns, because names that nobody knows tell no columns."""
    said = call("verify", CASES / "canopy.toml", CASES / "hall.foot.claim.txt")
    reasons = " ".join(said.out.split("Critical")[0].split())
    assert said.status == 3 and "heads do not match" not in reasons
    assert reasons.index('none of the names it prints ("A0-A1", ') < reasons.index("load case")


def numbered(tmp_path: Path) -> Path:
    """The portal with names of members that say nothing of their joints."""
    text = PORTAL.replace('member = "B-C"', 'member = "beam"')
    for key, name in (("A-B", "left"), ("B-C", "beam"), ("C-D", "right")):
        text = text.replace(f'members."{key}" = {{', f'members.{name} = {{ from = "{key[0]}", to = "{key[2]}",')
    return put(tmp_path, text)


ELEMENTS = """Elem Node    N      V       M
11   A     -48.0  -19.2    25.6
     B     -48.0   19.2    51.2
12   B     -19.2   48.0   -51.2
     C     -19.2   48.0    51.2
13   C     -48.0   19.2   -51.2
     D     -48.0  -19.2   -25.6
"""


def test_members_of_other_numbers_are_told_by_their_joints(tmp_path: Path) -> None:
    """Both joints of each were printed, and every row was refused as of a member that the frame lacks."""
    frame = numbered(tmp_path)
    said = call("verify", frame, put(tmp_path, ELEMENTS, "c.txt"), "--case", "dead")
    assert said.status == 0 and "told by their joints: 11 is left, 12 is beam, 13 is right" in " ".join(said.out.split())
    named = ELEMENTS.replace("11 ", "X1").replace("12 ", "X2").replace("13 ", "X3")
    assert call("verify", frame, put(tmp_path, named, "c.txt"), "--case", "dead").status == 3  # names, not numbers
    wrong = call("verify", frame, put(tmp_path, ELEMENTS.replace("25.6\n", "26.5\n", 1), "c.txt"), "--case", "dead")
    assert wrong.status == 1
    half = "\n".join(row for row in ELEMENTS.splitlines() if "12 " not in row)  # now member 11 has three joints
    assert call("verify", frame, put(tmp_path, half, "c.txt"), "--case", "dead").status == 3


def test_what_a_suspect_supposes_stands_in_the_document() -> None:
    """A script that reads `verdict` alone would take "agree" for the stated frame's."""
    of = CASES / "hall.toml", CASES / "hall.foot.claim.txt"
    supposing = call("verify", *of, "--suspect", "1", "--json", "-").document
    assert supposing["supposed"] == "B0 was analysed as pinned" and supposing["verdict"] == "agree"
    assert "supposed" not in call("verify", *of, "--json", "-").document


def test_noise_beside_a_claim_is_zero() -> None:
    from crosscheck.compare.differences import Difference, Place
    from crosscheck.report import words

    place = Place("dead", "member_ends", "axial", "A-B", "A", None)
    said = words.both_say(Difference(place, {"slope-deflection": 5.9e-31, "claim": 2.0}, 2.0, 0.1, True))
    assert said.startswith("slope-deflection 0; claim 2")


TRUSS = """
units = "kN m"
materials.s = { E = "210 GPa" }
sections.b = { I = "500 cm^4", A = "40 cm^2" }
joints = { A = [0, 0], B = [4, 0], C = [2, 1.5] }
members.left = { from = "A", to = "C", section = "b", material = "s", hinge = "both" }
members.right = { from = "C", to = "B", section = "b", material = "s", hinge = "both" }
members.tie = { from = "A", to = "B", section = "b", material = "s", hinge = "both" }
supports = { A = "pinned", B = "roller" }
loads.P.apply = [{ joint = "C", force = 60, direction = "down" }]
"""
"""Joint C by statics: 60 / 2 / 0.6 = 50 kN compression in the inclined bars, 50 * 0.8 = 40 kN tension in the tie."""
BARS = ["Bar,Force (kN)\nleft,-50.0\nright,-50.0\ntie,40.0\n",
        "Member\tAxial (kN)\nleft\t50.0 C\nright\t50.0 C\ntie\t40.0 T\n",
        "Member;N (kN);T/C\nleft;50,0;C\nright;50,0;C\ntie;40,0;T\n",
        "Member   Axial (kN)\nleft     50.0 (C)\nright    50.0 (C)\ntie      40.0 (T)\n"]  # fmt: skip


@pytest.mark.parametrize("text", BARS)
def test_a_table_of_bar_forces_is_read(tmp_path: Path, text: str) -> None:
    """One axial force a member names no end, and none of them was compared; T and C were tonnes and no number."""
    frame = put(tmp_path, TRUSS)
    said = call("verify", frame, put(tmp_path, text, "c.txt"))
    assert said.status == 0 and "the 3 values" in " ".join(said.out.split()), said.out
    for right, wrong in (("tie", "left"), ("40.0 T", "40.0 C"), ("40,0;T", "40,0;C"), ("(T)", "(C)"), ("40.0", "44.0")):
        if right in text and (right != "tie" or "T" not in text):
            slip = text.replace(right, wrong, 1)
            assert call("verify", frame, put(tmp_path, slip, "c.txt")).status != 0, slip


MOMENTS = ["Member  Joint  M (kNm)", "A-B  A  25.6", "A-B  B  51.2", "C-D  C  -51.2", "C-D  D  -25.6"]


@pytest.mark.parametrize("line", [1, 2, 3, 4])
def test_a_row_whose_only_value_is_mistyped_is_not_lost(tmp_path: Path, line: int) -> None:
    """"C-D  D  -25.6O" was taken for the head of a further table, and the claim agreed without it."""
    rows = [row + "O" if k == line else row for k, row in enumerate(MOMENTS)]
    said = call("verify", put(tmp_path, PORTAL), put(tmp_path, "\n".join(rows), "c.txt"), "--case", "dead")
    assert said.status == 3 and f"line {line + 1}:" in said.out


def test_statics_that_could_not_be_tested_is_not_said_to_fail(tmp_path: Path) -> None:
    said = call("verify", put(tmp_path, PORTAL), put(tmp_path, "\n".join(MOMENTS[:4]), "c.txt"), "--case", "dead")
    words = " ".join(said.out.split())
    assert "nothing could be judged" in words and "statics could not be tested by what the claim gives" in words
    assert "statics is not satisfied" not in words and "statics fails" not in words


def test_an_unknown_key_of_the_record_is_said_to_be_one(tmp_path: Path) -> None:
    """It was taken for the name of a file that is not there."""
    said = call("opinions", put(tmp_path, PORTAL), "--report", tmp_path / "r.html", "--about", "jobb=Quay 4")
    assert said.status == 2 and "jobb" in said.err and 'did you mean "job"' in said.err


def test_a_member_that_was_only_inferred_is_not_carried_on(tmp_path: Path) -> None:
    """The moment at B is of either member there; "35 kNm" behind it was then of the first of them."""
    said = told(tmp_path, PORTAL, "wind", "moment at B 30 kNm, max 50 kNm")
    assert said.status == 0 and "the 2 values" in " ".join(said.out.split())
    assert "it is not said which" in told(tmp_path, PORTAL, "wind", "moment at B 30 kNm, 35 kNm").out


@pytest.mark.parametrize("text", ["B-C at B 30 kNm, max moment 50 kNm", "shear in B-C at B 7.5 kN and max moment 50 kNm"])
def test_the_largest_after_a_members_end_may_be_the_frames(tmp_path: Path, text: str) -> None:
    """The frame's largest is 50, B-C's 30: which is meant, nobody can tell."""
    said = told(tmp_path, PORTAL, "wind", text)
    assert said.status == 3 and "the most of B-C or of the whole frame" in " ".join(said.out.split())
    of_it = told(tmp_path, PORTAL, "wind", "B-C max moment 30 kNm, max shear 7.5 kN")
    assert of_it.status == 0 and "the 2 values" in " ".join(of_it.out.split())
    assert told(tmp_path, PORTAL, "wind", "H_A = 20 kN, max moment 50 kNm").status == 0


INPUT = """NODES
Node  X(m)  Y(m)
A 0 0
B 0 4
C 8 4
D 8 0
SECTION  Ix(cm4)
c 11000
SUPPORTS
Node DX DY RZ
A 1 1 1
D 1 1 0
LOAD TOTALS
Case Fx Fy (kN)
dead 0 -96
wind 44 0
"""


def test_printed_input_in_tables_below_each_other_is_all_compared(tmp_path: Path) -> None:
    """Heads parted by single blanks, and marks under DX, DY, RZ, were no heads: the rows were read as I of the loads."""
    said = call("inspect", put(tmp_path, PORTAL), "--echo", put(tmp_path, INPUT, "input.txt"))
    words = " ".join(said.out.split())
    assert said.status == 1 and "3 serious" in words
    assert "I of c = 0.00011" in words and "total x of wind = 44" in words and "D held in x, y, the frame" in words
    assert "prints I of" not in words and "not recognised as input" not in words


def test_rows_of_printed_input_that_nobody_reads_are_counted(tmp_path: Path) -> None:
    text = INPUT + "SPRINGS\nNode Kx Ky\nA 120 130\nD 120 130\n"
    said = call("inspect", put(tmp_path, PORTAL), "--echo", put(tmp_path, text, "input.txt"))
    assert "2 rows of numbers of the other model's printed input not compared" in " ".join(said.out.split())


def test_hand_methods_beside_noise_print_zero(tmp_path: Path) -> None:
    """A pinned foot has no moment; 9.861e-32 stood beside the portal method's 0."""
    frame = PORTAL.replace('A = "fixed", D = "fixed"', 'A = "pinned", D = "pinned"')
    said = call("inspect", put(tmp_path, frame), "--approximate")
    table = said.out.split("Approximate")[1].split("Cautions")[0]
    assert "portal" in table and "e-" not in table


def test_an_axial_force_that_varies_needs_its_place(tmp_path: Path) -> None:
    """40 kN hang along the tie: its ends have 40 and 80 kN, and neither is the force of the whole bar."""
    load = '{ joint = "C", force = 60, direction = "down" }'
    along = '{ member = "tie", uniform = 10, direction = "right" }'
    frame = put(tmp_path, TRUSS.replace(load, f"{load}, {along}"))
    said = call("verify", frame, put(tmp_path, BARS[1].replace("40.0 T", "80.0 T"), "c.txt"))
    words = " ".join(said.out.split())
    assert said.status == 3 and "not said where along tie the axial force is" in words and "(2 values compared" in words


def test_a_value_in_words_below_a_table_is_read(tmp_path: Path) -> None:
    """It has about as many words as the row above it has cells, and was left out as a heading."""
    table = "Support  H (kN)  V (kN)  M (kNm)\nA  -20.0  -7.5  -50.0\nD  -20.0  7.5  -50.0\n"
    said = told(tmp_path, PORTAL, "wind", table + "Sway at eaves = 8.9 mm.")
    assert said.status == 0 and "the 7 values" in " ".join(said.out.split())
    assert told(tmp_path, PORTAL, "wind", table + "Sway at eaves = 9.8 mm.").status == 1


LIMITS = [
    "Deflection limit L/300 = 20 mm, ok.", "Allowable horizontal deflection h/150 = 30 mm", "Total load 145 kN",
    "Max utilisation 0.87 (column).", "Self weight 12.5 kN included.", "Analysis time 0.4 s",
    "Wind pressure 0.9 kN/m2 on the long side.",
]  # fmt: skip
AROUND = ["{} (limit 500 kNm)", "{} < 500 kNm", "{}, capacity 500 kNm", "ultimate limit state: {}"]


@pytest.mark.parametrize("sentence", LIMITS)
@pytest.mark.parametrize("where", ["before", "after"])
def test_what_is_no_result_is_not_taken_for_one(sentence: str, where: str) -> None:
    """What may be borne, what is applied, what the analysis took: said beside a right table of results."""
    frame = check.read(CASES / "shed.toml")
    name = frame.names[0]
    table = printed(frame, {name: check.ask(frame).answers["slope-deflection"].cases[name]})
    text = f"{sentence}\n\n{table}" if where == "before" else f"{table}\n{sentence}\n"
    found = check.verify(frame, read_claim_text(text, FrameNames.of(frame)), suspects=False, every_case=False)
    assert found.verdict == "agree"


@pytest.mark.parametrize(("factor", "verdict"), [(1.0, "agree"), (1.2, "disagree")])
@pytest.mark.parametrize("around", AROUND)
def test_a_result_beside_its_limit_is_compared(around: str, factor: float, verdict: str) -> None:
    frame = check.read(CASES / "shed.toml")
    name = frame.names[0]
    ends = np.abs(check.ask(frame).answers["slope-deflection"].cases[name].ends[:, :, 2])
    member = list(frame.members)[int(np.argmax(ends.max(axis=1)))]
    text = around.format(f"{member} end moment max {factor * ends.max():.2f} kNm")
    found = check.verify(frame, read_claim_text(text, FrameNames.of(frame)), case=name, suspects=False)
    assert found.verdict == verdict
