"""Sound frame files: what the reader makes of every row of the grammar, of units, of grids and of drafts."""

from __future__ import annotations

import doctest
import hashlib
import math
import tomllib
from fractions import Fraction
from pathlib import Path

import pytest
from hypothesis import HealthCheck, assume, given, settings

from crosscheck.frame import units as units_module
from crosscheck.frame.draft import draft_blank, draft_grid
from crosscheck.frame.loads import load_table
from crosscheck.frame.locate import Lines
from crosscheck.frame.locate import Path as Keys
from crosscheck.frame.model import (
    FREE,
    HELD,
    JointCouple,
    JointForce,
    Member,
    Misfit,
    PointCouple,
    PointForce,
    SelfWeight,
    Settlement,
    Spread,
    Support,
    Temperature,
)
from crosscheck.frame.needs import with_analysis
from crosscheck.frame.reader import read_frame, read_frame_text
from crosscheck.frame.units import (
    Dimension,
    Scale,
    UnitError,
    convert,
    dimension_name,
    frame_units,
    parse_unit,
    quantity,
    unit_name,
)
from tests.test_bad_frames import GOOD, GRID, mutated

HEAD = """\
units = "kN m"
[materials.steel]
E = "210 GPa"
[sections.post]
I = "8360 cm^4"
A = "53.8 cm^2"
depth = "300 mm"
"""
BEAM = HEAD.replace('E = "210 GPa"', 'E = "210 GPa"\nalpha = 12e-6\ndensity = "77 kN/m^3"') + """\
[joints]
A = [0, 0]
B = [3, 4]
C = [6, 4]
[members]
"A-B" = { section = "post", material = "steel" }
"B-C" = { section = "post", material = "steel" }
[supports]
A = "fixed"
C = { y = "held", x = "2 kN/mm", angle = "60 deg" }
"""


def loads_of(*entries: str) -> list[object]:
    """The loads that entries of `apply` make on BEAM."""
    frame = read_frame_text(BEAM + "[loads.L]\napply = [\n" + ",\n".join(entries) + "\n]\n")
    return list(frame.cases["L"].loads)


# Units ------------------------------------------------------------------------------------------------------


def test_the_examples_in_the_units_module_hold() -> None:
    failed, tried = doctest.testmod(units_module)
    assert tried >= 5 and failed == 0


LBF, IN = Fraction("4.4482216152605"), Fraction("0.0254")


@pytest.mark.parametrize(
    ("same", "dimension", "size"),
    [
        ("kN m|kNm|kN-m|kN·m|kN*m|kN.m|KNM|KN-M|m kN|kN × m", Dimension(1, 1), 1000),
        ("N/mm^2|N/mm2|N/mm²|N mm^-2|MPa|MN/m^2|N/(mm^2)|MPA", Dimension(1, -2), 10**6),
        ("kip/ft|klf|kips/ft|k/ft|kip per ft|kip/foot", Dimension(1, -1), 1000 * LBF / (12 * IN)),
        ("kip ft|k-ft|kip-ft|kipft|ft kip|KIP-FT", Dimension(1, 1), 1000 * LBF * 12 * IN),
        ("cm4|cm^4|cm⁴|cm**4", Dimension(0, 4), Fraction(1, 10**8)),
        ("kN m/rad|kNm/rad|kN m rad^-1|(kN m)/rad|N m/mrad", Dimension(1, 1, 0, -1), 1000),
        ("/K|1/K|per K|/°C|1/degC|K^-1|/deg C", Dimension(temperature=-1), 1),
        ("psi|lbf/in^2|lb/in2", Dimension(1, -2), LBF / IN**2),
        ("kNm2|kN m^2|kN·m²", Dimension(1, 2), 1000),
        ("kg/m^3|kg/m3|g/dm^3", Dimension(mass=1, length=-3), 1),
    ],
)
def test_a_unit_has_many_writings(same: str, dimension: Dimension, size: Fraction | int) -> None:
    for text in same.split("|"):
        unit = parse_unit(text)
        assert (unit.dimension, unit.factor) == (dimension, Fraction(size)), text


@pytest.mark.parametrize(
    ("text", "value", "target", "expected"),
    [  # NIST SP 811 (2008), appendix B.8 and B.9, to its printed digits
        ("1 kip", 1, "N", 4448.222), ("1 lbf/ft", 1, "N/m", 14.59390), ("1 ksi", 1, "MPa", 6.894757),
        ("1 lbf ft", 1, "N m", 1.355818), ("1 lbf in", 1, "N m", 0.1129848), ("1 in^4", 1, "mm^4", 416231.4),
        ("1 kgf", 1, "N", 9.80665), ("1 ft^2", 1, "m^2", 0.09290304), ("1 deg", 1, "mrad", 17.45329),
        ("1 psf", 1, "Pa", 47.88026), ("1 kgf/cm^2", 1, "kPa", 98.0665), ("1 yd", 1, "m", 0.9144),
    ],
)  # fmt: skip
def test_factors_are_those_of_the_standard(text: str, value: float, target: str, expected: float) -> None:
    read = quantity(text)
    assert read.unit is not None and read.value == value
    assert convert(read.value, read.unit, parse_unit(target)) == pytest.approx(expected, rel=1.0e-6)


@pytest.mark.parametrize("text", ["mN", "mPa", "tonf", "kNx", "", "/", "kN//m", "m^", "kN 3", "((", "m" * 61, "kN/"])
def test_what_is_not_a_unit_is_refused(text: str) -> None:
    with pytest.raises(UnitError):
        parse_unit(text)


def test_conversion_is_rounded_once() -> None:
    scale = Scale(frame_units("kN m"))
    for number in ("53.8", "8360", "0.1", "12345.678", "1.1e-3"):
        for text, power in (("cm^4", -8), ("mm", -3), ("cm^2", -4)):
            assert scale.to_frame(float(number), parse_unit(text)) == float(Fraction(number) * Fraction(10) ** power)


def test_names_of_units_and_dimensions() -> None:
    units = frame_units("kip, in")
    assert (units.force, units.length, units.newton, units.metre) == ("kip", "in", 4448.2216152605, 0.0254)
    assert [unit_name(units, d) for d in (Dimension(1, 1), Dimension(1, -2), Dimension(1, 1, 0, -1), Dimension())] == [
        "kip in", "kip/in^2", "kip in/rad", ""
    ]  # fmt: skip
    assert unit_name(units, Dimension(temperature=-1)) == "1/K"
    assert dimension_name(Dimension(1, 1)) == "a moment"


# Materials, sections, members, supports ---------------------------------------------------------------------


def test_values_come_in_the_frames_own_units() -> None:
    text = GOOD.replace('units = "kN m"', 'units = "N mm"').replace("12e-6", '"12e-6 /K"')
    frame = read_frame_text(text.replace("20 cm", "0.2 cm"))
    steel, post = frame.materials["steel"], frame.sections["post"]
    assert (steel.E, steel.alpha) == (210e3, 12e-6)
    assert pytest.approx(210e3 / 2.6, rel=1e-15) == steel.G
    assert steel.weight == pytest.approx(7850 * 9.80665e-9, rel=1e-15)
    assert (post.I, post.A, post.shear_area, post.depth) == (8360e4, 5380, 2500, 300)
    assert frame.members["D-C"].rigid_to == 2
    assert frame.supports["D"].rotation == 4.5e9
    assert frame.members["tie"].turn_from == 40e9


def test_a_density_may_be_a_mass_or_a_weight() -> None:
    texts = ("7850 kg/m^3", "7.85 t/m3", "76.9822025 kN/m^3", "7.85 g/cm^3")
    for text in texts:
        frame = read_frame_text(GOOD.replace("7850 kg/m^3", text))
        assert frame.materials["steel"].weight == pytest.approx(76.9822025, rel=1e-15)
    customary = read_frame_text(GOOD.replace("7850 kg/m^3", "490 lb/ft^3")).materials["steel"].weight
    assert customary == pytest.approx(490 * 4.4482216152605e-3 / 0.3048**3, rel=1e-14)


def test_members_and_their_ends() -> None:
    members = read_frame_text(GOOD).members
    assert members["rafter"] == Member("rafter", "B", "C", "post", "steel", HELD, FREE)
    assert members["D-C"] == Member("D-C", "D", "C", "post", "steel", HELD, HELD, 0.3, 0.2)
    assert members["tie"] == Member("tie", "C", "1", "post", "steel", 40000.0, HELD)
    assert (members["N-1-1"].joint_from, members["N-1-1"].joint_to) == ("N-1", "1")
    both = read_frame_text(GOOD.replace('hinge = "to"', 'hinge = "both"')).members["rafter"]
    assert (both.turn_from, both.turn_to) == (FREE, FREE)


def test_a_key_that_gives_from_and_to_is_only_a_name() -> None:
    text = GOOD.replace("rafter = { from", '"D-A" = { from').replace('"rafter"', '"D-A"')
    member = read_frame_text(text).members["D-A"]
    assert (member.joint_from, member.joint_to) == ("B", "C")


def test_supports_by_word_and_by_table() -> None:
    supports = read_frame_text(GOOD).supports
    assert supports["A"] == Support("A", HELD, HELD, HELD)
    assert supports["D"] == Support("D", HELD, HELD, 4500.0, 30.0)
    assert supports["N-1"] == Support("N-1", FREE, HELD, FREE)
    assert read_frame_text(BEAM).supports["C"] == Support("C", 2000.0, HELD, FREE, 60.0)
    pinned = read_frame_text(BEAM.replace('A = "fixed"', 'A = "pinned"')).supports["A"]
    assert pinned == Support("A", HELD, HELD, FREE)


# Loads ------------------------------------------------------------------------------------------------------


def test_loads_on_joints() -> None:
    assert loads_of(
        '{ joint = "B", force = 12, direction = "left" }',
        '{ joints = ["B", "C"], force = "3000 N", direction = "30 deg" }',
        '{ joint = "B", couple = "-2 kN m" }',
        '{ joint = "A", settlement = { down = "5 mm", rotation = "2 mrad" } }',
    ) == [
        JointForce(0, "B", 12, 180.0),
        JointForce(1, "B", 3, 30.0),
        JointForce(1, "C", 3, 30.0),
        JointCouple(2, "B", -2),
        Settlement(3, "A", 0.0, -0.005, 0.002),
    ]


def test_loads_on_members() -> None:
    assert loads_of(
        '{ member = "A-B", force = 4, at = "40%", direction = "across" }',
        '{ member = "A-B", couple = 4, at = "50 cm" }',
        '{ members = ["A-B", "B-C"], uniform = 8.5, direction = "down" }',
        '{ member = "A-B", varying = [1, "2 N/mm"], start = 1, end = "80%", direction = -45, per = "projection" }',
        '{ member = "B-C", temperature = "20 K", difference = "9 F" }',
        '{ member = "B-C", difference = 5 }',
        '{ member = "B-C", misfit = "-2 mm" }',
        "{ self_weight = 1.35 }",
    ) == [
        PointForce(0, "A-B", 4, "across", 2.0),
        PointCouple(1, "A-B", 4, 0.5),
        Spread(2, "A-B", 8.5, 8.5, 270.0, 0.0, 5.0),
        Spread(2, "B-C", 8.5, 8.5, 270.0, 0.0, 3.0),
        Spread(3, "A-B", 1, 2, -45, 1.0, 4.0, True),
        Temperature(4, "B-C", 20.0, 5.0),
        Temperature(5, "B-C", 0.0, 5.0),
        Misfit(6, "B-C", -0.002),
        SelfWeight(7, 1.35),
    ]


def test_a_place_that_misses_the_end_by_rounding_is_the_end() -> None:
    (load,) = loads_of('{ member = "B-C", couple = 1, at = 3.000000000001 }')
    assert isinstance(load, PointCouple) and load.at == 3.0


def test_a_settlement_in_a_global_direction_is_turned_into_the_supports_axes() -> None:
    (load,) = loads_of('{ joint = "C", settlement = { down = "10 mm", left = "4 mm" } }')
    c, s = math.cos(math.pi / 3), math.sin(math.pi / 3)
    assert isinstance(load, Settlement)
    assert (load.x, load.y) == pytest.approx((-0.004 * c - 0.01 * s, 0.004 * s - 0.01 * c), rel=1e-14)


def test_rounding_does_not_settle_a_free_direction() -> None:
    text = BEAM.replace('x = "2 kN/mm", angle = "60 deg"', "angle = 90") + (
        '[loads.L]\napply = [{ joint = "C", settlement = { left = "10 mm" } }]\n')  # fmt: skip
    (load,) = read_frame_text(text).cases["L"].loads
    assert load == Settlement(0, "C", 0.0, 0.01)
    text = text.replace("angle = 90", "angle = 30")
    slanted = text.replace('left = "10 mm"', "left = 5e-3, up = 8.660254037844386e-3")
    (load,) = read_frame_text(slanted).cases["L"].loads
    assert isinstance(load, Settlement) and load.x == 0.0 and load.y == pytest.approx(0.01, rel=1e-12)


def test_cases_combinations_and_analysis() -> None:
    frame = read_frame_text(GOOD)
    assert frame.names == ("dead", "heat", "strength")
    assert frame.cases["dead"].expected == {"down": 80.0}
    assert frame.combinations["strength"].factors == {"dead": 1.35, "heat": 0.9}
    assert (frame.analysis.axial, frame.analysis.axial_stated, frame.analysis.shear) == ("elastic", True, "elastic")
    assert load_table(frame, "strength").joint[1].tolist() == [1.35 * 12, 0, 0]


@pytest.mark.parametrize("text", ['"2%"', '"2 %"', "2", '"2"', "2.0"])
def test_a_tolerance_is_in_per_cent(text: str) -> None:
    assert read_frame_text(GOOD.replace('tolerance = "1%"', f"tolerance = {text}")).analysis.tolerance == 0.02


def test_load_cases_may_be_written_as_lists_of_tables() -> None:
    text = BEAM + '[[loads.L.apply]]\njoint = "B"\nforce = 1\ndirection = 0\n[[loads.L.apply]]\nself_weight = 1\n'
    frame = read_frame_text(text)
    assert frame.cases["L"].loads == (JointForce(0, "B", 1, 0), SelfWeight(1, 1))
    assert frame.lines["loads.L.apply[1].self_weight"] == text.count("\n")


# Defaults and warnings --------------------------------------------------------------------------------------


def test_axial_is_elastic_by_default_where_every_section_used_has_an_area() -> None:
    idle = BEAM.replace("[joints]", "[sections.idle]\nI = 1\n[joints]")
    assert (read_frame_text(idle).analysis.axial, read_frame_text(idle).analysis.axial_stated) == ("elastic", False)
    rigid = read_frame_text(BEAM.replace('A = "53.8 cm^2"\n', ""))
    assert (rigid.analysis.axial, rigid.analysis.axial_stated) == ("rigid", False)
    assert 'AXIALLY RIGID because section "post" has no A' in rigid.warnings[0]
    stated = read_frame_text(BEAM.replace('A = "53.8 cm^2"\n', "") + '[analysis]\naxial = "rigid"\n')
    assert not any("AXIALLY" in warning for warning in stated.warnings)


def test_what_is_questionable_is_a_warning() -> None:
    text = BEAM.replace("C = [6, 4]", "C = [6, 4]\nE = [9, 9]") + "[loads.idle]\n"
    assert read_frame_text(text).warnings == ('no member joins joint "E"', 'load case "idle" has no load')
    assert "the frame has no load case: there is nothing to compare" in read_frame_text(BEAM).warnings
    floating = BEAM[: BEAM.index("[supports]")]
    assert "the frame has no support" in read_frame_text(floating).warnings


def test_another_idealisation_keeps_the_frame_and_says_what_was_asked() -> None:
    frame = read_frame_text(BEAM)
    changed = with_analysis(frame, axial="rigid", tolerance=0.05)
    assert (changed.analysis.axial, changed.analysis.axial_stated, changed.analysis.tolerance) == ("rigid", True, 0.05)
    assert changed.members == frame.members and frame.analysis.axial == "elastic"


# The file as it lies on the disk ----------------------------------------------------------------------------


def test_a_mark_at_the_start_and_other_line_ends_change_nothing_but_the_checksum(tmp_path: Path) -> None:
    path = tmp_path / "bent.toml"
    plain = read_frame_text(GOOD)
    for data in (GOOD.encode(), b"\xef\xbb\xbf" + GOOD.encode(), GOOD.replace("\n", "\r\n").encode()):
        path.write_bytes(data)
        frame = read_frame(path)
        assert (frame.members, frame.cases, frame.title) == (plain.members, plain.cases, plain.title)
        assert (frame.file, frame.sha256) == (str(path), hashlib.sha256(data).hexdigest())
        assert dict(frame.lines) == dict(plain.lines)


def test_lines_are_known_by_dotted_key() -> None:
    lines = read_frame_text(GOOD).lines
    at = GOOD.split("\n")
    assert at[lines["members.rafter.section"] - 1].startswith("rafter")
    assert "self_weight" in at[lines["loads.dead.apply[2]"] - 1]
    assert "varying" in at[lines["loads.heat.apply[2].direction"] - 1]
    assert lines.get("loads.heat.apply[9]") is None


ODD = '''\
a.b.c = 1 # [x] = { y
"quoted key"."with \\"dot\\u002e" = """
[not a table]
k = 'v' """ # after
'sin.gle' = \'\'\'
x = [1,
\'\'\'
[t . "u v" ]
list = [ # one
  [1, 2], { k = "]}", m.n = [ { z = 1 } ] },
  'three', 1979-05-27T07:32:00Z, 1.5e-3,

]
[[many]]
x = 1
[many.inner]
y = "\\\\"
[[many]]
[[many.deep]]
z = {}
[[many.deep]]
'''


def paths(value: object, path: Keys = ()) -> set[Keys]:
    """Every path of parsed TOML."""
    below = value.items() if isinstance(value, dict) else enumerate(value) if isinstance(value, list) else ()
    return {path for _ in [0] if path}.union(*(paths(item, (*path, key)) for key, item in below))


def test_every_key_of_an_odd_file_has_its_line() -> None:
    lines = Lines(ODD)
    assert set(lines.by_path) == paths(tomllib.loads(ODD))
    assert lines.by_path["t", "u v", "list", 1, "m", "n", 0, "z"] == 10
    assert lines.by_path["t", "u v", "list", 4] == 11
    assert lines.by_path["many", 0, "inner", "y"] == 17
    assert lines.by_path["many", 1, "deep", 1] == 21
    assert lines.by_path["sin.gle",] == 5


@settings(max_examples=300, deadline=None, suppress_health_check=[HealthCheck.too_slow, HealthCheck.filter_too_much])
@given(mutated())
def test_every_key_of_any_file_that_parses_has_a_line(text: str) -> None:
    try:
        data = tomllib.loads(text)
    except ValueError:
        assume(False)
    assert set(Lines(text).by_path) == paths(data)


# Grids and drafts -------------------------------------------------------------------------------------------


def test_a_grid_becomes_joints_members_and_supports() -> None:
    frame = read_frame_text(GRID)
    assert [j for j in frame.joints if j.startswith("D")] == ["D0", "D1"]
    assert (frame.joints["C2"].x, frame.joints["C2"].y) == (12.0, 8.1)
    assert (frame.joints["D1"].x, frame.joints["D1"].y) == (19.5, 4.5)
    assert frame.members["B1-B2"] == Member("B1-B2", "B1", "B2", "post", "steel")
    assert frame.members["A1-A2"].turn_to == FREE and frame.members["A0-A1"].turn_to == HELD
    assert len(frame.members) == 4 + 3 + 3 + 2
    assert list(frame.supports) == ["A0", "B0", "C0", "D0"]
    assert [load.member for load in frame.cases["dead"].loads if isinstance(load, Spread)] == ["A2-B2", "B2-C2"]


def test_a_grid_is_the_same_as_its_joints_and_members_written_out() -> None:
    frame = read_frame_text(GRID)
    out = GRID[: GRID.index("[grid]")] + "[joints]\n"
    out += "".join(f"{j.name} = [{j.x!r}, {j.y!r}]\n" for j in frame.joints.values()) + "[members]\n"
    for m in frame.members.values():
        hinge = ', hinge = "to"' if m.turn_to == FREE else ""
        out += f'"{m.name}" = {{ section = "post", material = "steel"{hinge} }}\n'
    out += "[supports]\n" + "".join(f'{name} = "fixed"\n' for name in frame.supports)
    written = read_frame_text(out)
    assert (written.joints, written.members, written.supports) == (frame.joints, frame.members, frame.supports)


def test_tables_add_to_a_grid_and_override_it() -> None:
    text = GRID.replace("[loads.dead]", """\
[joints]
A0 = [0, -1.5]
E1 = [22, 4.5]
[members]
"A1-B1" = { spring_from = "10 kN m/mrad", rigid_to = 0.2 }
"A1-A2" = { spring_to = 7 }
"D1-E1" = { section = "post", material = "steel" }
"B0-B1" = { from = "B1", to = "B0" }
[supports]
B0 = "pinned"
[loads.dead]""")
    frame = read_frame_text(text)
    assert (frame.joints["A0"].y, frame.joints["E1"].x) == (-1.5, 22)
    assert frame.members["A1-B1"] == Member("A1-B1", "A1", "B1", "post", "steel", 10000.0, HELD, 0.0, 0.2)
    assert frame.members["A1-A2"].turn_to == 7
    assert frame.members["B0-B1"].joint_from == "B1"
    assert (frame.supports["B0"].rotation, frame.supports["A0"].rotation) == (FREE, HELD)


def test_zones_of_a_grid_and_its_names() -> None:
    text = GRID.replace('beams = { section = "post", material = "steel" }', """\
beams = [
  { section = "post", material = "steel" },
  { levels = [1, 2], bays = 2, hinge = "both" },
  { levels = 0, bays = 3, section = "post", material = "steel", hinge = "from" },
]
lines = ["1", "2", "3a", "west"]
origin = ["1 m", 2]""").replace('omit = ["D2"]', 'omit = ["2.1-3a1"]').replace('lines = ["A", "D"]', 'lines = "west"')
    frame = read_frame_text(text)
    assert list(frame.joints)[:4] == ["1.0", "1.1", "1.2", "2.0"]
    assert (frame.joints["1.0"].x, frame.joints["1.0"].y, frame.joints["west1"].y) == (1, 2, 6.5)
    assert "2.1-3a1" not in frame.members and frame.members["2.2-3a2"].turn_from == FREE
    assert frame.members["3a0-west0"].turn_from == FREE and "1.0-2.0" not in frame.members
    assert frame.members["west1-west2"].turn_to == FREE and frame.members["1.1-1.2"].turn_to == HELD


def test_groups_of_a_grid_are_what_is_left_of_it() -> None:
    def on(key: str, value: str) -> list[str]:
        load = "force = 1, direction = 0" + (', at = "50%"' if key == "members" else "")
        text = GRID[: GRID.index("[loads.dead]")] + f"[loads.L]\napply = [{{ {key} = {value}, {load} }}]\n"
        return [getattr(load, key[:-1]) for load in read_frame_text(text).cases["L"].loads]

    assert on("members", '"columns storey 2"') == ["A1-A2", "B1-B2", "C1-C2"]
    assert on("members", '"columns line D"') == ["D0-D1"]
    assert on("members", '"beams bay 3"') == ["C1-D1"]
    assert on("members", '["beams level 2", "A0-A1"]') == ["A2-B2", "B2-C2", "A0-A1"]
    assert len(on("members", '"columns"')) == 7 and len(on("members", '"beams"')) == 5
    assert on("joints", '"level 2"') == ["A2", "B2", "C2"]
    assert on("joints", '"line D"') == ["D0", "D1"]
    assert on("joints", '"feet"') == ["A0", "B0", "C0", "D0"]


@pytest.mark.parametrize("units", ["kN m", "N mm", "kN cm", "kip ft", "kip in", "lbf in", "kgf m", "MN m"])
def test_drafts_read_at_once_in_any_units(units: str) -> None:
    blank = read_frame_text(draft_blank(units))
    grid = read_frame_text(draft_grid(["2 x 20 ft"], ["12 ft", "3 m"], units))
    assert blank.warnings == grid.warnings == ()
    assert 2 < blank.joints["C"].y * blank.units.metre < 6
    assert len(grid.members) == 3 * 2 + 2 * 2


def test_a_draft_says_what_was_asked_for() -> None:
    text = draft_grid(["6", "3 x 6 m"], ["4.5"], hinged_beams=True, title='Say "hall"  # 3')
    frame = read_frame_text(text)
    assert frame.title == 'Say "hall"  # 3'
    assert 'bays = [6, "3 x 6 m"]' in text
    assert frame.supports["E0"].rotation == HELD and frame.members["A1-B1"].turn_from == FREE
    assert read_frame_text(draft_grid(["6"], ["4"], feet="pinned")).supports["A0"].rotation == FREE
