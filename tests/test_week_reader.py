"""The checking week's grammar as the reader takes it: what each row of the contract's table becomes."""

from __future__ import annotations

import hashlib
import math
from pathlib import Path

import numpy as np
import pytest

from crosscheck import check
from crosscheck.frame.kinematics import study, tied
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import Frame, Piece
from crosscheck.frame.reader import read_frame, read_frame_text, sources
from crosscheck.problems import UnusableInput

HEAD = """\
title = "Stores over the quay road"
units = "kN m"
{top}
[materials.concrete]
E = "30 GPa"
nu = 0.2
density = "25 kN/m^3"
[sections]
deep = {{ I = 0.009, A = 0.24, depth = 0.8 }}
light = {{ I = 0.0011, A = 0.12, depth = 0.4 }}
[joints]
A = [0, 0]
B = [0, 4]
C = [6, 4]
D = [12, 4]
E = [18, 4]
F = [18, 0]
[members]
"A-B" = {{ section = "light", material = "concrete" }}
b1 = {{ from = "B", to = "C", material = "concrete", {b1} }}
b2 = {{ from = "C", to = "D", section = "light", material = "concrete" }}
b3 = {{ from = "D", to = "E", section = "light", material = "concrete" }}
"F-E" = {{ section = "light", material = "concrete" }}
{members}
[supports]
A = "fixed"
C = {{ y = "held" }}
D = {{ y = "2000 kN/m" }}
F = "fixed"
{rest}
[loads.dead]
apply = [{{ self_weight = 1.0 }}]
[loads.imposed]
apply = [
  {{ members = ["b1", "b2", "b3"], uniform = 5, direction = "down" }},
  {{ joint = "B", force = 7, direction = "down" }},
]
[loads.wind_left]
apply = [{{ joint = "B", force = 5, direction = "right" }}]
[loads.wind_right]
apply = [{{ joint = "E", force = 5, direction = "left" }}]
"""
PLAIN = 'section = "light"'


def frame(rest: str = "", b1: str = PLAIN, top: str = "", members: str = "", tail: str = "") -> Frame:
    return read_frame_text(HEAD.format(top=top, b1=b1, members=members, rest=rest) + tail)


def test_a_stepped_member_has_its_pieces_in_order() -> None:
    made = frame(b1='profile = [["deep", "15%"], ["light", 5.1], ["deep", "100%"]]')
    assert made.members["b1"].pieces == (
        Piece("deep", "deep", 0.15), Piece("light", "light", 0.85), Piece("deep", "deep", 1.0),
    )  # fmt: skip
    v = made.variation
    assert v.start.tolist() == pytest.approx([0, 0.9, 5.1]) and v.end.tolist() == pytest.approx([0.9, 5.1, 6])
    assert v.I[:, 0].tolist() == [0.009, 0.0011, 0.009] and not v.power.any()
    assert made.member_table.varying.tolist() == [False, True, False, False, False]


def test_a_taper_follows_the_power_of_depth_that_fits_both_ends() -> None:
    v = frame(b1='taper = ["deep", "light"]').variation
    power = math.log(0.009 / 0.0011) / math.log(2)
    I, A, _, depth = v.at(np.zeros(3, dtype=np.int64), np.array([0.0, 3.0, 6.0]))  # noqa: E741
    assert depth.tolist() == pytest.approx([0.8, 0.6, 0.4])
    assert I.tolist() == pytest.approx([0.009, 0.0011 * 1.5**power, 0.0011], rel=1e-13)
    assert A.tolist() == pytest.approx([0.24, 0.18, 0.12])  # area and depth both halve: power one


def test_a_piece_of_a_profile_may_taper() -> None:
    made = frame(b1='profile = [[["deep", "light"], "25%"], ["light", "100%"]]')
    assert made.members["b1"].pieces[0] == Piece("deep", "light", 0.25)
    assert made.members["b1"].section == "light"  # that of the longest piece


def test_the_weight_of_a_taper_has_its_total_and_its_centre() -> None:
    """w = 25 A, A = 0.24 to 0.12 straight over 6 m: total 27 kN, first moment 6 x 6 (2 x 3 + 6)/6 = 72 kN m."""
    made = frame(b1='taper = ["deep", "light"]')
    table = load_table(made, "dead")
    on = table.line_member == made.member_index["b1"]
    start, end = table.line_start[on], table.line_end[on]
    first, last = -table.line_across[on].T
    size = end - start
    assert ((first + last) / 2 * size).sum() == pytest.approx(27, rel=1e-12)
    moment = (size * (first * (2 * start + end) + last * (start + 2 * end)) / 6).sum()
    assert moment == pytest.approx(72, rel=1e-12)


def test_a_state_of_stiffness_factors_what_it_names_and_only_in_its_combinations() -> None:
    made = frame('[stiffness.cracked]\nlight = { I = 0.35 }\nb2 = { I = 0.5 }\nconcrete = { E = 0.6 }\n'
                 "D = { y = 0.25 }\n[combinations]\nultimate = { dead = 1.35, stiffness = 'cracked' }\n"
                 "service = { dead = 1 }", b1='profile = [["deep", "50%"], ["light", "100%"]]')  # fmt: skip
    cracked = made.under("ultimate")
    t, plain = cracked.member_table, made.member_table
    assert t.I[[0, 2]].tolist() == pytest.approx([0.35 * 0.0011, 0.5 * 0.0011])  # a member's own word comes first
    assert cracked.variation.I[:, 0].tolist() == pytest.approx([0.009, 0.35 * 0.0011])
    assert t.E.tolist() == pytest.approx(0.6 * plain.E) and t.G.tolist() == pytest.approx(0.6 * plain.G)
    assert cracked.support_table.stiffness[3, 1] == 500.0
    assert made.under("service") is made and made.under("dead") is made and made.under("ultimate") is cracked
    # Cracking sheds no weight.
    assert np.array_equal(load_table(cracked, "dead").line_across, load_table(made, "dead").line_across)


def test_a_lean_is_a_share_of_what_acts_down_where_it_acts() -> None:
    made = frame("[combinations]\nleaning = { imposed = 2.0, wind_left = 1, lean = 0.005 }", tail=(
        '[loads.slow]\napply = [{ lean = "1%" }, { member = "A-B", force = 10, at = 1, direction = "down" },'
        ' { member = "b2", varying = [-3, 3], direction = "down" }]\n'))  # fmt: skip
    table = load_table(made, "leaning")
    assert table.joint[1, :2].tolist() == pytest.approx([5 + 0.005 * 14, -14])
    along = table.line_along[:, 0][table.line_member == 1]
    assert along.tolist() == pytest.approx([0.0, 0.005 * 10])  # the load itself, and its lean along the level beam
    slow = load_table(made, "slow")
    # On the upright member the lean acts across, to the right: local -y of a member that goes up.
    assert slow.point_across.tolist() == pytest.approx([0.0, -0.1])
    # Of a load that is part up, only the part that acts down leans, from the middle on.
    assert (slow.line_start[-1], slow.line_end[-1]) == (3.0, 6.0)
    assert slow.line_along[-1].tolist() == pytest.approx([0.0, 0.03])


def test_patterns_make_arrangements_and_combinations_of_them() -> None:
    made = frame('[patterns.imposed]\nspans = [["b1"], ["b2"], ["b3"]]\n'
                 'arrangements = ["all", "alternate", "adjacent"]\n'
                 "[combinations]\nultimate = { dead = 1.35, imposed = 1.5 }")  # fmt: skip
    further = ["odd spans", "even spans", "spans 1+2", "spans 2+3"]
    assert list(made.cases)[4:] == [f"imposed ({label})" for label in further]
    assert list(made.combinations) == ["ultimate", *(f"ultimate (imposed {label})" for label in further)]
    odd = load_table(made, "ultimate (imposed odd spans)")
    loaded = {list(made.members)[m] for m in odd.line_member[np.abs(odd.line_across[:, 0] + 7.5) < 1e-12]}
    assert loaded == {"b1", "b3"}
    assert odd.joint[1, 1] == pytest.approx(-10.5)  # what acts on no span stays


def test_without_all_the_combination_as_stated_is_not_among_them() -> None:
    made = frame('[patterns.imposed]\nspans = [["b1"], ["b2"]]\narrangements = ["alternate", "adjacent"]\n'
                 "[combinations]\nultimate = { imposed = 1.5 }")  # fmt: skip
    # Two spans loaded are all of them, and the only adjacent ones.
    assert list(made.combinations) == [f"ultimate (imposed {w} spans)" for w in ("odd", "even", "all")]
    assert made.meant("ultimate") == tuple(made.combinations)


def test_cases_that_exclude_each_other_are_never_combined() -> None:
    both = "[combinations]\nwindy = { dead = 1, wind_left = 0.9, wind_right = 0.9 }\n[envelopes]\nall = ['windy*']"
    made = frame(both, top='exclusive = [["wind_left", "wind_right"]]')
    assert {name: set(c.factors) for name, c in made.combinations.items()} == {
        "windy (wind_left)": {"dead", "wind_left"}, "windy (wind_right)": {"dead", "wind_right"},
    }  # fmt: skip
    assert made.parted == {"windy": ("wind_left", "wind_right")}
    assert made.envelopes["all"].names == tuple(made.combinations)
    assert check.chosen_names(made, "windy") == tuple(made.combinations) == check.chosen_names(made, "all")


def test_ties_are_rows_of_what_cannot_happen() -> None:
    made = frame('[ties]\nroof = { joints = ["B", "C", "E"], direction = "x" }\n'
                 'skew = { joints = ["C", "D"], direction = 30 }')  # fmt: skip
    rows = tied(made).toarray()
    assert rows.shape == (3, 18)
    assert rows[0, [3, 6]].tolist() == [-1.0, 1.0] and rows[1, [3, 12]].tolist() == [-1.0, 1.0]
    assert rows[2, [6, 7, 9, 10]].tolist() == pytest.approx([-(3**0.5) / 2, -0.5, 3**0.5 / 2, 0.5])


def test_a_rigid_beam_between_tied_joints_has_no_determined_axial_force() -> None:
    made = frame('[ties]\nroof = { joints = ["B", "C"], direction = "x" }', b1=PLAIN + ', axial = "rigid"')
    assert made.member_table.rigid.tolist() == [False, True, False, False, False]
    assert study(made).undetermined.axial.tolist() == [False, True, False, False, False]


def test_one_way_members_and_supports() -> None:
    made = frame(members='rod = { from = "A", to = "C", section = "light", material = "concrete", hinge = "both", '
                 'only = "tension" }').members["rod"]  # fmt: skip
    assert made.only == "tension"
    text = HEAD.format(top="", b1=PLAIN, members="", rest="").replace('C = { y = "held" }', 'C = { y = "push" }')
    support = read_frame_text(text).supports["C"]
    assert (support.y, support.y_only, support.x_only) == (math.inf, "push", "")


OFFICE = 'units = "N mm"\n[sections]\npost = { I = 4.2e8, A = "90 cm^2", depth = 600 }\n[materials.steel]\nE = 210e3\n'


def with_office(folder: Path, name: str = "office.toml", b1: str = 'section = "post"') -> Path:
    path = folder / "frame.toml"
    path.write_text(HEAD.format(top=f'include = ["{name}"]', b1=b1, members="", rest=""), encoding="utf-8")
    return path


def test_an_included_file_has_its_own_units(tmp_path: Path) -> None:
    (tmp_path / "office.toml").write_text(OFFICE, encoding="utf-8")
    path = with_office(tmp_path)
    made = read_frame(path)
    post = made.sections["post"]
    assert (post.I, post.A, post.depth) == pytest.approx((4.2e-4, 0.009, 0.6))
    assert pytest.approx(210e6) == made.materials["steel"].E
    assert made.includes[0].file == "office.toml"
    assert made.includes[0].sha256 == hashlib.sha256(OFFICE.encode()).hexdigest()
    assert sources(path) == [path, tmp_path / "office.toml"]
    before = made.content
    (tmp_path / "office.toml").write_text(OFFICE.replace("4.2e8", "4.3e8"), encoding="utf-8")
    assert read_frame(path).content != before  # what a record is of


@pytest.mark.parametrize(("text", "words"), [
    (OFFICE.replace('units = "N mm"\n', ""), "office.toml:2: sections.post.I: 420000000.0 has no unit"),
    (OFFICE + "[sections.light]\nI = 1", "office.toml:6: sections.light: \"light\" stands in the frame file already"),
    (OFFICE + "[joints]\nA = [0, 0]", "sections and materials only"),
    (OFFICE.replace("I = 4.2e8", 'I = "4.2 mm"'), "office.toml:3"),
    ("units =", "not TOML"),
])  # fmt: skip
def test_an_included_file_is_checked_like_the_frame(tmp_path: Path, text: str, words: str) -> None:
    (tmp_path / "office.toml").write_text(text, encoding="utf-8")
    path = with_office(tmp_path)
    with pytest.raises(UnusableInput) as caught:
        read_frame(path)
    assert words in "\n".join(map(str, caught.value.problems)), caught.value.problems


NO_NAMES = ["/etc/passwd", "/etc/office.toml", "C:office.toml", "..\\\\office.toml", "office.txt", ""]


@pytest.mark.parametrize("name", NO_NAMES)
def test_an_include_names_a_toml_file_from_the_frames_folder(tmp_path: Path, name: str) -> None:
    path = with_office(tmp_path, name, PLAIN)
    with pytest.raises(UnusableInput) as caught:
        read_frame(path)
    assert "is not the name of a file to include" in str(caught.value.problems[0])


@pytest.mark.parametrize(("b1", "rest", "words"), [
    ('taper = ["deep", "flat"]', "[sections.flat]\nI = 0.001\nA = 0.1\n", "has no depth, which a taper needs"),
    ('taper = ["deep", "wide"]', "[sections.wide]\nI = 0.001\nA = 0.1\ndepth = 0.8\n", "are equally deep"),
    (PLAIN + ', only = "tension"', '[analysis]\naxial = "rigid"\n', "works in tension only"),
])  # fmt: skip
def test_what_cannot_be_is_said_in_one_line(b1: str, rest: str, words: str) -> None:
    text = HEAD.format(top="", b1=b1, members="", rest=rest if "analysis" in rest else "")
    if "sections" in rest:
        text = text.replace("[joints]", rest + "[joints]")
    with pytest.raises(UnusableInput) as caught:
        read_frame_text(text)
    assert [words in str(problem) for problem in caught.value.problems] == [True]


def test_a_case_of_two_either_or_groups_is_not_brought_back_by_the_other() -> None:
    made = frame("[combinations]\nw = { dead = 1, wind_left = 1, wind_right = 1, imposed = 1 }",
                 top='exclusive = [["wind_left", "wind_right"], ["wind_left", "imposed"]]')  # fmt: skip
    assert [set(c.factors) for c in made.combinations.values()] == [
        {"dead", "wind_left"}, {"dead", "wind_right", "imposed"},
    ]  # fmt: skip


EITHER = 'exclusive = [["wind_left", "wind_right"]]'


@pytest.mark.parametrize(("rest", "top", "words"), [
    ('[patterns.imposed]\nspans = [["b1"], ["b2"], ["b3"]]\n[loads."imposed (odd spans)"]\napply = []\n', "",
     'its arrangement "imposed (odd spans)" has the name of a load case'),
    ('[combinations]\nw = { wind_left = 1, wind_right = 1 }\n"w (wind_left)" = { dead = 1 }\n', EITHER,
     'becomes "w (wind_left)", and something else has that name'),
    ('[combinations]\n"w (wind_left)" = { dead = 1 }\nw = { wind_left = 1, wind_right = 1 }\n', EITHER,
     'becomes "w (wind_left)", and something else has that name'),
])  # fmt: skip
def test_nothing_stated_is_lost_to_a_name_that_is_made(rest: str, top: str, words: str) -> None:
    with pytest.raises(UnusableInput) as caught:
        frame(rest, top=top)
    assert [words in str(problem) for problem in caught.value.problems] == [True]


def test_choices_without_end_are_refused_at_once() -> None:
    """2 to the power of 30 combinations would be made."""
    cases = [f"c{k}" for k in range(60)]
    groups = ", ".join(f'["{a}", "{b}"]' for a, b in zip(cases[::2], cases[1::2], strict=True))
    factors = ", ".join(f"{case} = 1" for case in cases)
    with pytest.raises(UnusableInput) as caught:
        frame(f"[combinations]\nw = {{ {factors} }}\n", top=f"exclusive = [{groups}]",
              tail="".join(f"[loads.{case}]\napply = []\n" for case in cases))  # fmt: skip
    assert "make more than 1000 cases and combinations" in str(caught.value.problems[0])
