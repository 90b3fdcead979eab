"""`inspect` on the checking week's grammar: each slip found at its place and in its grade, and silence without it."""

from __future__ import annotations

from pathlib import Path

import pytest

from crosscheck import check
from crosscheck.frame.reader import read_frame_text
from crosscheck.review.finding import Finding
from crosscheck.review.inspect import inspect, subject_of

CASES = Path(__file__).parents[1] / "cases"
FLOOR = """
units = "kN m"
[materials.concrete]
E = "32 GPa"
density = "2500 kg/m^3"
[sections]
beam = { I = "0.0052 m^4", A = "0.24 m^2", depth = "0.6 m" }
haunch = { I = "0.0118 m^4", A = "0.32 m^2", depth = "0.8 m" }
column = { I = "0.0021 m^4", A = "0.16 m^2", depth = "0.4 m" }
rod = { I = "10 cm^4", A = "6 cm^2" }
[joints]
A = [0, 0]
B = [0, 4]
C = [7, 4]
D = [7, 0]
E = [14, 4]
F = [14, 0]
[members]
"A-B" = { section = "column", material = "concrete" }
"D-C" = { section = "column", material = "concrete" }
"F-E" = { section = "column", material = "concrete" }
"B-C" = { material = "concrete", profile = [["beam", "85%"], ["haunch", "100%"]] }
"C-E" = { material = "concrete", profile = [["haunch", "15%"], ["beam", "100%"]] }
rod = { from = "A", to = "C", section = "rod", material = "concrete", hinge = "both", only = "tension" }
[supports]
A = { x = "held", y = "held", rotation = "60 MN m/rad" }
D = { x = "held", y = "held", rotation = "60 MN m/rad" }
F = { x = "held", y = "held", rotation = "60 MN m/rad" }
[ties]
floor = { joints = ["B", "E"], direction = "x" }
[loads.dead]
apply = [{ self_weight = 1.0 }, { members = ["B-C", "C-E"], uniform = 20, direction = "down" }]
[loads.imposed]
apply = [{ members = ["B-C", "C-E"], uniform = 15, direction = "down" }]
[loads.wind]
apply = [{ joint = "B", force = 40, direction = "right" }]
[patterns.imposed]
spans = [["B-C"], ["C-E"]]
[stiffness.cracked]
beam = { I = 0.35 }
A = { rotation = 0.5 }
[combinations]
ultimate = { dead = 1.35, imposed = 1.5, stiffness = "cracked", lean = 0.004 }
windy = { dead = 1.35, wind = 1.5, stiffness = "cracked", lean = 0.004 }
light = { dead = 1.0, wind = 1.5, stiffness = "cracked", lean = 0.004 }
in_use = { dead = 1.0, imposed = 1.0 }
"""
MINE = (
    "excluding_cases", "uneven_states", "uneven_leans", "uneven_orders", "unused_states", "state_factors", "lean_sizes",
    "idle_patterns", "ties", "idle_one_way", "haunches", "included_files",
)  # fmt: skip


def found(text: str) -> list[Finding]:
    return [f for f in inspect(subject_of(read_frame_text(text), stability=False)) if f.check in MINE]


def test_a_sound_frame_draws_nothing() -> None:
    assert found(FLOOR) == []


SLIPS: dict[str, tuple[str, str, str, str, str]] = {
    # what slipped: (text, in place of, check, grade, a place)
    "state forgotten in one": ('stiffness = "cracked", lean = 0.004 }\nlight', "lean = 0.004 }\nlight", "uneven_states",
                               "check", "windy"),
    "lean forgotten in one": (', lean = 0.004 }\nlight', " }\nlight", "uneven_leans", "note", "windy"),
    "order of one": ("lean = 0.004 }\nlight", "lean = 0.004, order = 2 }\nlight", "uneven_orders", "note", "ultimate"),
    "state unused": ("[combinations]", "[stiffness.lasting]\nconcrete = { E = 0.4 }\n[combinations]", "unused_states",
                     "check", "lasting"),
    "factor ten times too large": ("beam = { I = 0.35 }", "beam = { I = 3.5 }", "state_factors", "check", "beam"),
    "factor ten times too small": ("beam = { I = 0.35 }", "beam = { I = 0.035 }", "state_factors", "check", "beam"),
    "springs stiffer": ("A = { rotation = 0.5 }", "A = { rotation = 2.0 }", "state_factors", "note", "A"),
    "percent sign lost": ("lean = 0.004 }\nwindy", "lean = 0.4 }\nwindy", "lean_sizes", "check", "ultimate"),
    "lean of next to nothing": ("lean = 0.004 }\nwindy", "lean = 0.0004 }\nwindy", "lean_sizes", "note", "ultimate"),
    "lean of a case": ('apply = [{ joint = "B", force', 'apply = [{ lean = 0.05 }, { joint = "B", force', "lean_sizes",
                       "check", "wind[0]"),
    "pattern of one span": ('spans = [["B-C"], ["C-E"]]', 'spans = [["B-C", "C-E"]]', "idle_patterns", "check", "imposed"),
    "joint of another level tied": ('["B", "E"]', '["B", "E", "F"]', "ties", "check", "F"),
    "supports hold what a tie ties": ('["B", "E"]', '["A", "D"]', "ties", "check", "A"),
    "haunch upside down": ('[["beam", "85%"], ["haunch", "100%"]]', '[["haunch", "85%"], ["beam", "100%"]]', "haunches",
                           "check", "B-C"),
}  # fmt: skip


@pytest.mark.parametrize("name", SLIPS)
def test_slip_of_the_week_is_found(name: str) -> None:
    text, slip, kind, grade, place = SLIPS[name]
    assert FLOOR.count(text) == 1
    mine = [f for f in found(FLOOR.replace(text, slip)) if f.check == kind]
    assert any(f.grade == grade and place in f.where for f in mine), mine


def told(text: str, kind: str) -> list[Finding]:
    return [f for f in found(text) if f.check == kind]


def test_a_state_of_a_section_that_no_member_has() -> None:
    text = FLOOR.replace("beam = { I = 0.35 }", "beam = { I = 0.35 }\nspare = { I = 0.5 }")
    assert told(text.replace('rod = { I = "10', 'spare = { I = "1 m^4" }\nrod = { I = "10'), "unused_states")[0].where == (
        "cracked", "spare",
    )  # fmt: skip


def test_a_pattern_that_no_combination_uses() -> None:
    text = FLOOR.replace(", imposed = 1.5", "").replace(", imposed = 1.0", "")
    assert "no combination uses an arrangement" in told(text, "idle_patterns")[0].says
    arrangement = told(FLOOR.replace('{ members = ["B-C", "C-E"], uniform = 15,', '{ member = "B-C", uniform = 15,'),
                       "idle_patterns")  # fmt: skip
    assert arrangement[0].where == ("imposed", "imposed (even spans)")


def test_cases_that_exclude_each_other() -> None:
    text = FLOOR.replace("[patterns", '[loads.gale]\napply = [{ joint = "E", force = 40, direction = "left" }]\n[patterns')
    text = 'exclusive = [["wind", "gale"]]\n' + text
    assert not told(text, "excluding_cases")
    said = told(text.replace("wind = 1.5, stiff", "wind = 1.5, gale = 1.5, stiff", 1), "excluding_cases")
    assert said[0].where == ("windy", "wind", "gale") and "windy (wind), windy (gale)" in said[0].says


DEAD = '{ self_weight = 1.0 }, { members = ["B-C", "C-E"], uniform = 20, direction = "down" }'
IMPOSED = '{ members = ["B-C", "C-E"], uniform = 15, direction = "down" }'
TOGETHER = FLOOR.replace('spans = [["B-C"], ["C-E"]]', 'spans = [["B-C"], ["C-E"]]\narrangements = ["all"]')


def test_a_rod_slack_in_every_case() -> None:
    """A push to the right shortens the diagonal from the right foot; one from the left foot works."""
    level = '{ joint = "B", force = 1, direction = "right" }'
    pushed = TOGETHER.replace(DEAD, level).replace(IMPOSED, level)
    assert not told(pushed, "idle_one_way")
    mirrored = pushed.replace('from = "A", to = "C"', 'from = "D", to = "B"')
    assert [f.where for f in told(mirrored, "idle_one_way")] == [("rod",)]
    tightened = mirrored.replace('[{ joint = "B"', '[{ member = "rod", misfit = "-5 mm" }, { joint = "B"')
    assert not told(tightened, "idle_one_way")


def test_a_support_that_lets_go_in_every_case() -> None:
    """A prop at midspan that can only pull down: the floor's load takes it off in every case. One that pushes works."""
    halves = '"B-G" = { section = "beam", material = "concrete" }\n"G-C" = { section = "beam", material = "concrete" }'
    text = TOGETHER.replace('"B-C" = { material = "concrete", profile = [["beam", "85%"], ["haunch", "100%"]] }', halves)
    text = text.replace("E = [14, 4]", "E = [14, 4]\nG = [3.5, 4]").replace("[supports]", '[supports]\nG = { y = "ONLY" }')
    text = text.replace('["B-C"', '["B-G", "G-C"')
    text = text.replace('"B", force = 40, direction = "right" }', '"G", force = 4, direction = "down" }')
    assert [f.where for f in told(text.replace("ONLY", "pull"), "idle_one_way") if f.where != ("rod",)] == [("G",)]
    assert ("G",) not in [f.where for f in told(text.replace("ONLY", "push"), "idle_one_way")]


def test_ties_that_hold_what_is_held() -> None:
    chained = FLOOR.replace('"B-C" = { material = "concrete", profile = [["beam", "85%"], ["haunch", "100%"]] }',
                            '"B-C" = { material = "concrete", section = "beam", axial = "rigid" }')  # fmt: skip
    text = chained.replace('joints = ["B", "E"]', 'joints = ["B", "C"]')
    assert "together already" in told(text, "ties")[0].says
    assert not told(chained, "ties")
    far = told(FLOOR.replace("E = [14, 4]", "E = [44, 4]").replace("F = [14, 0]", "F = [44, 0]"), "ties")
    assert [(f.grade, f.where[0]) for f in far] == [("note", "floor")]


def test_included_files_are_named_with_their_checksum() -> None:
    frame = check.read(CASES / "depot.toml")
    said = [f for f in inspect(subject_of(frame, stability=False)) if f.check == "included_files"]
    assert len(said) == 1 and frame.includes[0].sha256[:12] in said[0].says


@pytest.mark.parametrize("case", ("depot", "workshop", "causeway"))
def test_arrangements_are_not_summed_apart(case: str) -> None:
    found_here = inspect(subject_of(check.read(CASES / f"{case}.toml"), stability=False))
    assert not [f for f in found_here if f.check == "totals" and "(" in f.where[0]]
    assert not [f for f in found_here if f.check == "uplift_combination" and "spans" in f.says]


def test_the_storey_formula_takes_each_combinations_own_stiffness() -> None:
    """E times 0.33 for lasting loads: the storey formula's factor falls with it, as the exact one does."""
    subject = subject_of(check.read(CASES / "depot.toml"))
    for name in ("lasting", "ultimate"):
        assert 0.95 <= subject.storeys[name] / subject.critical[name] <= 1.22


def test_first_order_is_questioned_only_where_it_is_used() -> None:
    heavy = FLOOR.replace("uniform = 20", "uniform = 1500")
    for order, there in ((1, True), (2, False)):
        text = heavy.replace('lean = 0.004 }\nlight', f"lean = 0.004, order = {order} }}\nlight")
        low = [f for f in inspect(subject_of(read_frame_text(text))) if f.check == "second_order" and f.grade == "check"]
        assert any("windy" in f.where for f in low) is there, [f.says for f in low]

