"""Malformed frame files: each fault is found once, at its line, and the words say what is wrong and what would be right."""

# ruff: noqa: E501 - one row a fault reads better than four lines

from __future__ import annotations

import re
from dataclasses import dataclass
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from crosscheck.frame.draft import draft_blank, draft_grid
from crosscheck.frame.model import Frame
from crosscheck.frame.needs import with_analysis
from crosscheck.frame.reader import read_frame, read_frame_text
from crosscheck.problems import Problem, UnusableInput

GOOD = """\
title = "Ticket hall, line 3"
units = "kN m"

[materials.steel]
E = "210 GPa"
nu = 0.3
alpha = 12e-6
density = "7850 kg/m^3"

[sections.post]
I = "8360 cm^4"
A = "53.8 cm^2"
shear_area = "25 cm^2"
depth = "300 mm"

[joints]
A = [0, 0]
B = [0, 4.2]
C = [6.5, 5.0]
D = [6.5, 0]
N-1 = [9, 0]
1 = [9, 5]

[members]
"A-B" = { section = "post", material = "steel" }
rafter = { from = "B", to = "C", section = "post", material = "steel", hinge = "to" }
"D-C" = { section = "post", material = "steel", rigid_from = 0.3, rigid_to = "20 cm" }
tie = { from = "C", to = "1", section = "post", material = "steel", spring_from = "40 kN m/mrad" }
"N-1-1" = { section = "post", material = "steel" }
"B-D" = { section = "post", material = "steel" }

[supports]
A = "fixed"
D = { x = "held", y = "held", rotation = "4500 kN m/rad", angle = 30 }
N-1 = "roller"

[loads.dead]
apply = [
  { member = "rafter", uniform = 8.5, direction = "down", start = "10%", end = 5 },
  { joint = "B", force = 12.0, direction = "right" },
  { self_weight = 1.0 },
]
expected = { down = "80 kN" }

[loads.heat]
apply = [
  { members = ["A-B", "rafter"], temperature = 20, difference = "5 K" },
  { joint = "D", settlement = { x = "2 mm", rotation = "0.1 deg" } },
  { member = "D-C", varying = [1, "2 kN/m"], direction = "across" },
  { member = "rafter", couple = 3, at = "40%" },
  { member = "rafter", misfit = "2 mm" },
]

[combinations]
strength = { dead = 1.35, heat = 0.9 }

[analysis]
axial = "elastic"
shear = "elastic"
order = 1
tolerance = "1%"
"""


@dataclass(frozen=True)
class Bad:
    """`old` of GOOD becomes `new`; then one problem with `words` stands at the line of `at` (by default, of `new`)."""

    old: str
    new: str
    words: str
    key: str
    at: str = ""


def bad(old: str, new: str, words: str, key: str, at: str = "") -> Bad:
    return Bad(old, new, words, key, at or new)


RAFTER_LOAD = '{ member = "rafter", uniform = 8.5, direction = "down", start = "10%", end = 5 }'
FORCE = '{ joint = "B", force = 12.0, direction = "right" }'
SETTLE = "settlement = { x = \"2 mm\", rotation = \"0.1 deg\" }"

CASES = [
    # the file and its tables
    bad('title = "Ticket hall, line 3"', "title = 7", "7 is not a text", "title"),
    bad('units = "kN m"', 'units = "kN"', "does not name one unit of force and one of length", "units"),
    bad('units = "kN m"', 'units = "kN kip"', "does not name one unit of force and one of length", "units"),
    bad('units = "kN m"', 'units = "kN metres"', '"metres" is not a unit', "units"),
    bad('units = "kN m"', "units = 3", "3 is not a text", "units"),
    bad('units = "kN m"', 'unit = "kN m"\nunits = "kN m"', 'did you mean "units"', "unit", "unit ="),
    bad("[analysis]", "[analisys]", 'did you mean "analysis"', "analisys"),
    bad("[combinations]", "[ties]\nroof = 1\n[combinations]", "1 is not a table", "ties.roof", "roof ="),
    bad(
        '[combinations]', '[ties]\nroof = { joints = ["B"], direction = "x" }\n[combinations]', 'a list of two joints', 'ties.roof.joints', 'roof =',
    ),
    bad(
        '[combinations]', '[ties]\nroof = { joints = ["B", "B"], direction = "x" }\n[combinations]', 'named twice', 'ties.roof.joints', 'roof =',
    ),
    bad(
        '[combinations]', '[ties]\nroof = { joints = ["B", "X"], direction = "x" }\n[combinations]', 'no joint "X"', 'ties.roof.joints[1]', 'roof =',
    ),
    bad(
        '[combinations]', '[ties]\nroof = { joints = ["B", "C"] }\n[combinations]', 'direction is missing', 'ties.roof.direction', 'roof =',
    ),
    bad(
        '[combinations]', '[ties]\nroof = { joints = ["B", "C"], direction = "z" }\n[combinations]', 'no direction of a tie', 'ties.roof.direction', 'roof =',
    ),
    bad(
        '[combinations]', '[patterns.deed]\nspans = [["tie"]]\n[combinations]', 'no load case "deed"', 'patterns.deed', '[patterns',
    ),
    bad("[combinations]", "[patterns.dead]\n[combinations]", "spans is missing", "patterns.dead.spans", "[patterns"),
    bad(
        '[combinations]', '[patterns.dead]\nspans = [["tie"], ["ty"]]\n[combinations]', 'no member "ty"', 'patterns.dead.spans[1][0]', 'spans =',
    ),
    bad(
        '[combinations]', '[patterns.dead]\nspans = [["tie"], ["tie"]]\n[combinations]', 'in two spans', 'patterns.dead.spans', 'spans =',
    ),
    bad(
        '[combinations]', '[patterns.dead]\nspans = [["tie"]]\narrangements = ["every"]\n[combinations]', 'none of "all"', 'patterns.dead.arrangements[0]', 'arrangements =',
    ),
    bad(
        '[combinations]', '[envelopes]\nuls = ["strenght"]\n[combinations]', 'did you mean "strength"', 'envelopes.uls[0]', 'uls =',
    ),
    bad("[combinations]", "[envelopes]\nuls = []\n[combinations]", "of nothing", "envelopes.uls", "uls ="),
    bad(
        '[combinations]', '[envelopes]\ndead = ["strength"]\n[combinations]', 'has this name too', 'envelopes.dead', 'dead =',
    ),
    bad(
        '[combinations]', '[stiffness.cracked]\npots = { I = 0.5 }\n[combinations]', 'no member, section, material or support "pots"', 'stiffness.cracked.pots', 'pots =',
    ),
    bad(
        "[combinations]", "[stiffness.cracked]\npost = { I = 0 }\n[combinations]", "not above zero", "stiffness.cracked.post.I", "post = { I = 0",
    ),
    bad(
        "[combinations]", "[stiffness.cracked]\npost = { J = 0.5 }\n[combinations]", "unknown key in the factors of a section", "stiffness.cracked.post.J", "post = { J",
    ),
    bad(
        "[combinations]", "[stiffness.cracked]\nsteel = { I = 0.5 }\n[combinations]", "factors that a material does not have", "stiffness.cracked.steel", "steel = { I",
    ),
    bad(
        "[combinations]", "[stiffness.cracked]\nD = { x = 0.5 }\n[combinations]", "no factor changes that", "stiffness.cracked.D.x", "D = { x = 0.5",
    ),
    bad("[materials.steel]", "[include]\n[materials.steel]", "is not a list of files", "include", "[include]"),
    bad(
        '[loads.dead]', '[loads]\nexclusive = [["dead"]]\n[loads.dead]', 'two load cases at least', 'loads.exclusive[0]', 'exclusive',
    ),
    bad(
        '[loads.dead]', '[loads]\nexclusive = [["dead", "hot"]]\n[loads.dead]', 'no load case "hot"', 'loads.exclusive[0][1]', 'exclusive',
    ),
    # materials and sections
    bad('E = "210 GPa"', 'E = "210 GP"', '"GP" in "GP" is not a unit'.replace(' in "GP"', ""), "materials.steel.E"),
    bad('E = "210 GPa"', 'E = "210 kN"', "is a force, not a stress", "materials.steel.E"),
    bad('E = "210 GPa"', "E = 0", "0 is not above zero", "materials.steel.E"),
    bad('E = "210 GPa"', "E = true", "true is not a number", "materials.steel.E"),
    bad('E = "210 GPa"', "E = inf", "is not a number that can be worked with", "materials.steel.E"),
    bad('E = "210 GPa"', "E = nan", "is not a number that can be worked with", "materials.steel.E"),
    bad('E = "210 GPa"', "E = 1979-05-27", "is not a number", "materials.steel.E"),
    bad('E = "210 GPa"', f"E = {10**400}", "is not a number that can be worked with", "materials.steel.E"),
    bad('E = "210 GPa"', 'e = "210 GPa"\nE = 1', 'did you mean "E"', "materials.steel.e", 'e = "210'),
    bad('E = "210 GPa"\n', "", "E is missing; give E, a stress", "materials.steel", "[materials.steel]"),
    bad("nu = 0.3", "nu = 0.7", "not between -1 and 0.5", "materials.steel.nu"),
    bad("nu = 0.3", "nu = 0.3\nG = 80e6", "give one of the two", "materials.steel.nu"),
    bad("nu = 0.3", "", "has neither G nor nu", "materials.steel", "[materials.steel]"),
    bad("alpha = 12e-6", 'alpha = "12e-6 m"', "is a length, not an expansion", "materials.steel.alpha"),
    bad("alpha = 12e-6", "", "has no alpha", "loads.heat.apply[0]", "{ members ="),
    bad('density = "7850 kg/m^3"', "density = 77", "77 has no unit", "materials.steel.density"),
    bad('density = "7850 kg/m^3"', 'density = "7850"', "has no unit", "materials.steel.density"),
    bad('density = "7850 kg/m^3"', 'density = "7850 kg"', "is a mass, not a mass or weight per volume", "materials.steel.density"),
    bad('density = "7850 kg/m^3"', 'density = "-1 kg/m^3"', "below zero", "materials.steel.density"),
    bad('density = "7850 kg/m^3"\n', "", "has no density, which self weight needs", "materials.steel", "[materials.steel]"),
    bad('I = "8360 cm^4"', 'I = "8360 cm^2"', r"is an area, not a second moment of area .* such as .8360 cm\^4", "sections.post.I"),
    bad('I = "8360 cm^4"', "I = -1", "-1 is not above zero", "sections.post.I"),
    bad('I = "8360 cm^4"', 'I = "8,36 cm^4"', "write a decimal point", "sections.post.I"),
    bad('I = "8360 cm^4"', 'I = "8 360 cm^4"', "not one number with its unit", "sections.post.I"),
    bad('I = "8360 cm^4"', 'I = "big"', "does not begin with a number", "sections.post.I"),
    bad('I = "8360 cm^4"\n', "", "I is missing", "sections.post", "[sections.post]"),
    bad('A = "53.8 cm^2"\n', 'area = 1\nA = 1\n', "unknown key in a section", "sections.post.area"),
    bad('A = "53.8 cm^2"', "A = 0", "not above zero", "sections.post.A"),
    bad('shear_area = "25 cm^2"', "shear_area = []", "a list is not a number", "sections.post.shear_area"),
    bad('shear_area = "25 cm^2"\n', "", 'has no shear_area, which shear = "elastic" needs', "sections.post", "[sections.post]"),
    bad('depth = "300 mm"', "", "has no depth", "loads.heat.apply[0]", "{ members ="),
    bad("[joints]", "[sections]\nlight = 4\n[joints]", "4 is not a table", "sections.light", "light = 4"),
    # joints
    bad("B = [0, 4.2]", "B = [0]", "a list is not a place; give [x, y]".replace("[", r"\["), "joints.B"),
    bad("B = [0, 4.2]", 'B = "here"', "is not a place", "joints.B"),
    bad("B = [0, 4.2]", 'B = [0, "4.2 kN"]', "is a force, not a length", "joints.B"),
    bad("B = [0, 4.2]", "B = [0, false]", "false is not a number", "joints.B"),
    bad("B = [0, 4.2]", "B = [0, 1e60]", "cannot|can be worked with", "joints.B"),
    bad("B = [0, 4.2]", 'B = [0, 4.2]\n" E" = [1, 1]', "is no name for a joint", 'joints." E"', '" E"'),
    # members
    bad('"B-D" = {', '"B-X" = {', 'there is no joint "X"', "members.B-X"),
    bad('"A-B" = { section = "post"', '"A-B" = { section = "pots"', 'no section "pots"; did you mean "post"', "members.A-B.section"),
    bad('"A-B" = { section = "post", material = "steel" }', '"A-B" = { section = "post" }', "material is missing", "members.A-B"),
    bad('"A-B" = { section = "post"', '"A-B" = { section = 3', "is not the name of a section", "members.A-B.section"),
    bad('"A-B" = { section = "post", material = "steel" }', '"A-B" = "post"', "is not a table", "members.A-B"),
    bad('"B-D" = {', '"B-B" = {', "to itself", "members.B-B"),
    bad('"B-D" = {', '"B-D-A-C" = {', "no dash of the key parts two joints", "members.B-D-A-C"),
    bad('"B-D" = {', 'BD = {', "from and to are missing", "members.BD"),
    bad('from = "B", to = "C"', 'from = "B", to = "K"', 'no joint "K"', "members.rafter.to"),
    bad('from = "B", to = "C"', 'from = "B"', "to is missing", "members.rafter"),
    bad('from = "B", to = "C"', 'from = "C", to = "C"', 'joins joint "C" to itself', "members.rafter"),
    bad('hinge = "to"', 'hinge = "end"', 'none of "from", "to", "both"', "members.rafter.hinge"),
    bad('hinge = "to"', 'hinge = "to", spring_to = 40', "a spring and a hinge both", "members.rafter.spring_to"),
    bad('hinge = "to"', "spring_to = 0", 'a spring of zero is a hinge; give hinge = "to"', "members.rafter.spring_to"),
    bad('hinge = "to"', "spring_to = -4", "not above zero", "members.rafter.spring_to"),
    bad('hinge = "to"', 'spring_to = "40 kN/m"', "is a force per length, not a rotational stiffness", "members.rafter.spring_to"),
    bad('hinge = "to"', 'hinges = "to"', 'did you mean "hinge"', "members.rafter.hinges"),
    bad('hinge = "to"', 'profile = [["post", "100%"]]', 'section and profile both stated', 'members.rafter.profile'),
    bad(
        'section = "post", material = "steel", hinge = "to"', 'material = "steel", profile = [["post", "90%"]]', 'ends at 90%', 'members.rafter.profile', 'profile =',
    ),
    bad(
        'section = "post", material = "steel", hinge = "to"', 'material = "steel", profile = [["post", "50%"], ["post", "40%"]]', 'not beyond the one before', 'members.rafter.profile[1]', 'profile =',
    ),
    bad(
        'section = "post", material = "steel", hinge = "to"', 'material = "steel", profile = [["post", "120%"]]', 'does not lie on the member', 'members.rafter.profile[0][1]', 'profile =',
    ),
    bad(
        'section = "post", material = "steel", hinge = "to"', 'material = "steel", profile = [["pots", "100%"]]', 'no section "pots"', 'members.rafter.profile[0][0]', 'profile =',
    ),
    bad(
        'section = "post", material = "steel", hinge = "to"', 'material = "steel", profile = ["post"]', 'is not a piece', 'members.rafter.profile[0]', 'profile =',
    ),
    bad(
        'section = "post", material = "steel", hinge = "to"', 'material = "steel", taper = "post"', 'is not two sections', 'members.rafter.taper', 'taper =',
    ),
    bad('hinge = "to"', 'axial = "elastic"', 'one member alone cannot be made elastic', 'members.rafter.axial'),
    bad('hinge = "to"', 'axial = "stiff"', 'none of "rigid"', 'members.rafter.axial'),
    bad('hinge = "to"', 'axial = "rigid", only = "tension"', 'an axially rigid member cannot', 'members.rafter'),
    bad('hinge = "to"', 'only = "pulling"', 'none of "tension", "compression"', 'members.rafter.only'),
    bad("rigid_from = 0.3", "rigid_from = 4.9", r'leave nothing of member "D-C", 5 long', "members.D-C"),
    bad("rigid_from = 0.3", "rigid_from = -0.3", "below zero", "members.D-C.rigid_from"),
    bad("C = [6.5, 5.0]", "C = [0, 4.2]", "which are at one place", "members.rafter", "rafter ="),
    # supports
    bad('A = "fixed"', 'A = "fixd"', 'did you mean "fixed"', "supports.A"),
    bad('A = "fixed"', "A = 1", "1 is not a table", "supports.A"),
    bad('A = "fixed"', 'A = "fixed"\nH = "fixed"', 'no joint "H"', "supports.H", 'H = "fixed"'),
    bad('x = "held", y', 'x = "hold", y', 'did you mean "held"', "supports.D.x"),
    bad('x = "held", y', "x = 0, y", 'not a stiffness above zero; give "free"', "supports.D.x"),
    bad('rotation = "4500 kN m/rad"', 'rotation = "push"', 'along x or y only', 'supports.D.rotation'),
    bad('x = "held", y', 'x = "5 kN m", y', "is a moment, not a stiffness", "supports.D.x"),
    bad('x = "held", y', 'u = 3, x = "held", y', "unknown key in a support", "supports.D.u"),
    bad("angle = 30", 'angle = "3 m"', "is a length, not an angle", "supports.D.angle"),
    # loads
    bad("[loads.dead]", "[loads.order]\n[loads.dead]", "its own meaning in a combination", "loads.order", "[loads.order]"),
    bad(FORCE, '{ joint = "B" }', "the entry holds no load; give one of force, couple, settlement", "loads.dead.apply[1]"),
    bad(FORCE, "{ force = 12.0 }", "does not say what it acts on", "loads.dead.apply[1]"),
    bad(FORCE, '{ joint = "B", member = "A-B", force = 1 }', "joint and member in one entry", "loads.dead.apply[1]"),
    bad(FORCE, '{ joint = "B", force = 1, couple = 2, direction = 0 }', "force and couple in one entry", "loads.dead.apply[1]"),
    bad(FORCE, '{ joint = "B", force = 12.0 }', "direction is missing", "loads.dead.apply[1]"),
    bad(FORCE, '{ joint = "B", uniform = 12.0, direction = 0 }', "uniform does not act on a joint", "loads.dead.apply[1]"),
    bad(FORCE, '{ joint = "B", forse = 12.0, direction = 0 }', 'did you mean "force"', "loads.dead.apply[1]"),
    bad(FORCE, '{ joint = "B", force = 1, direction = "rihgt" }', 'did you mean "right"', "loads.dead.apply[1].direction"),
    bad(FORCE, '{ joint = "B", force = 1, direction = "across" }', "goes with members", "loads.dead.apply[1].direction"),
    bad(FORCE, '{ joint = "B", force = 1, direction = "3 m" }', "is a length", "loads.dead.apply[1].direction"),
    bad(FORCE, '{ joint = "B", force = "1 kN m", direction = 0 }', "is a moment, not a force", "loads.dead.apply[1].force"),
    bad(FORCE, '{ joint = "K", force = 1, direction = 0 }', 'no joint "K"', "loads.dead.apply[1].joint"),
    bad(FORCE, '{ joints = ["B", "K"], force = 1, direction = 0 }', 'no joint "K"', "loads.dead.apply[1].joints[1]"),
    bad(FORCE, '{ joints = ["B", "B"], force = 1, direction = 0 }', "named twice", "loads.dead.apply[1].joints"),
    bad(FORCE, '{ joints = [], force = 1, direction = 0 }', "an empty list", "loads.dead.apply[1].joints"),
    bad(FORCE, '{ joints = "beams", force = 1, direction = 0 }', "not a list", "loads.dead.apply[1].joints"),
    bad(FORCE, '{ joint = "B", couple = 1, at = 2 }', "unknown key in a couple on a joint", "loads.dead.apply[1].at"),
    bad(FORCE, "7", "7 is not a table", "loads.dead.apply[1]", "  7,"),
    bad(FORCE, '{ lean = "big" }', "does not begin with a number", "loads.dead.apply[1].lean"),
    bad(FORCE, '{ self_weight = "1 kN" }', "is a force, not a plain number", "loads.dead.apply[1].self_weight"),
    bad(FORCE, '{ self_weight = 1, direction = "down" }', "unknown key in self weight", "loads.dead.apply[1].direction"),
    bad('apply = [\n  { member = "rafter", uniform', 'applied = [\n  { member = "rafter", uniform', 'did you mean "apply"', "loads.dead.applied", "applied"),
    bad("direction = \"down\", start", "direction = \"down\", per = \"span\", start", 'none of "length", "projection"', "loads.dead.apply[0].per"),
    bad('direction = "down", start', 'direction = "along", per = "projection", start', "has no projection", "loads.dead.apply[0].per"),
    bad('start = "10%"', 'start = "140%"', 'does not lie on member "rafter"', "loads.dead.apply[0].start"),
    bad('start = "10%"', "start = -1", "does not lie on member", "loads.dead.apply[0].start"),
    bad('start = "10%"', "start = 5", "start does not lie before end", "loads.dead.apply[0]"),
    bad("end = 5", 'end = "5 kN"', "is a force, not a length", "loads.dead.apply[0].end"),
    bad('temperature = 20, difference = "5 K"', 'temperature = "20 m"', "is a length, not a temperature", "loads.heat.apply[0].temperature"),
    bad(SETTLE, "settlement = { }", "the settlement is empty", "loads.heat.apply[1].settlement"),
    bad(SETTLE, 'settlement = { x = 0.1, down = 1 }', "x and down in one settlement", "loads.heat.apply[1].settlement"),
    bad(SETTLE, 'settlement = { z = 0.1 }', "unknown key in a settlement", "loads.heat.apply[1].settlement.z"),
    bad(SETTLE, 'settlement = "1 mm"', "is not a table", "loads.heat.apply[1].settlement"),
    bad('{ joint = "D", settle', '{ joint = "B", settle', 'joint "B" has no support', "loads.heat.apply[1].settlement"),
    bad('{ joint = "D", ' + SETTLE, '{ joint = "N-1", settlement = { right = 0.1 }', 'nothing holds x at the support of joint "N-1"', "loads.heat.apply[1].settlement"),
    bad('varying = [1, "2 kN/m"]', "varying = [1]", "not two intensities", "loads.heat.apply[2].varying"),
    bad('varying = [1, "2 kN/m"]', 'varying = [1, "2 kN"]', "is a force, not a force per length", "loads.heat.apply[2].varying[1]"),
    bad('couple = 3, at = "40%"', "couple = 3", "at is missing", "loads.heat.apply[3]"),
    bad('couple = 3, at = "40%"', 'couple = 3, at = "x%"', "does not begin with a number", "loads.heat.apply[3].at"),
    bad('misfit = "2 mm"', 'misfit = "2 mrad"', "is an angle, not a length", "loads.heat.apply[4].misfit"),
    bad('expected = { down = "80 kN" }', 'expected = { donw = "80 kN" }', 'did you mean "down"', "loads.dead.expected.donw"),
    bad('expected = { down = "80 kN" }', 'expected = { down = "80 m" }', "is a length, not a force", "loads.dead.expected.down"),
    # combinations and analysis
    bad("strength = { dead = 1.35", "strength = { daed = 1.35", 'did you mean "dead"', "combinations.strength.daed"),
    bad("strength = {", "dead = {", "a load case has this name too", "combinations.dead", "dead = { dead"),
    bad("dead = 1.35, heat = 0.9", "", "combines nothing", "combinations.strength", "strength = {"),
    bad("dead = 1.35, heat", 'dead = "1.35 kN", heat', "is a force, not a plain number", "combinations.strength.dead", "strength ="),
    bad("dead = 1.35, heat", "order = 3, dead = 1, heat", "order is 1 or 2", "combinations.strength.order"),
    bad(
        'dead = 1.35, heat', 'stiffness = "soft", dead = 1, heat', 'no state of stiffness "soft"', 'combinations.strength.stiffness',
    ),
    bad('dead = 1.35, heat', 'lean = "x", dead = 1, heat', 'does not begin with a number', 'combinations.strength.lean'),
    bad("strength = {", "plain = { strength = 2 }\nstrength = {", "is a combination, not a load case", "combinations.plain.strength"),
    bad('axial = "elastic"', 'axial = "stiff"', 'none of "elastic", "rigid"', "analysis.axial"),
    bad('A = "53.8 cm^2"\n', 'A = "53.8 cm"\n', "is a length, not an area", "sections.post.A"),
    bad('shear = "elastic"', 'sheer = "elastic"', 'did you mean "shear"', "analysis.sheer"),
    bad("order = 1", "order = 3", "order is 1 or 2", "analysis.order"),
    bad("order = 1", "order = true", "order is 1 or 2", "analysis.order"),
    bad('tolerance = "1%"', "tolerance = 0", "not between 0 and 100 per cent", "analysis.tolerance"),
    bad('tolerance = "1%"', 'tolerance = "1 m"', "is a length, not a percentage", "analysis.tolerance"),
    # not TOML
    bad('axial = "elastic"', 'axial = elastic', "not TOML.*put text in quotes", ""),
    bad('axial = "elastic"', 'axial = "elastic"\naxial = "rigid"', "not TOML.*only once", "", 'axial = "rigid"'),
    bad("[analysis]", "[analysis", "not TOML", ""),
    bad("[combinations]", "[joints]\n[combinations]", "not TOML.*opened only once", "", "[joints]\n[comb"),
]  # fmt: skip


def problems_of(text: str) -> tuple[Problem, ...]:
    with pytest.raises(UnusableInput) as caught:
        read_frame_text(text, "hall.toml")
    return caught.value.problems


@pytest.mark.parametrize("case", CASES, ids=lambda case: f"{case.key or 'toml'}: {case.new[:40]!r}")
def test_each_fault_is_one_message_at_its_line(case: Bad) -> None:
    assert case.old in GOOD
    text = GOOD.replace(case.old, case.new, 1)
    (problem,) = problems_of(text)
    assert problem.line == text[: text.index(case.at)].count("\n") + 1 + case.at.startswith("\n")
    assert problem.key == case.key
    assert re.search(case.words, f"{problem.says}; {problem.instead}"), problem
    assert problem.file == "hall.toml"


def test_there_are_enough_of_them_and_the_good_one_is_good() -> None:
    assert len(CASES) >= 70
    assert read_frame_text(GOOD).warnings == ()


WHOLE = {
    "": "the file is empty",
    "   \n\n": "the file is empty",
    'title = "only"': "units is missing",
    'units = "kN m"': r"\[joints\] is missing",
    "[" * 3000: "nested too deeply|not TOML",
    "a = " + "[" * 3000: "nested too deeply|not TOML",
    "a = " + "9" * 5000: "not TOML",
    "joints = 3\nunits = 'kN m'": "3 is not a table",
}


@pytest.mark.parametrize("text", WHOLE, ids=lambda text: repr(text[:20]))
def test_files_that_are_wrong_as_a_whole(text: str) -> None:
    assert re.search(WHOLE[text], "\n".join(map(str, problems_of(text))))


def test_many_faults_come_together_in_the_order_of_the_file() -> None:
    text = GOOD
    keys = ["materials.steel.E", "joints.B", "members.rafter.hinge", "supports.A"]
    for key in reversed(keys):
        case = next(case for case in CASES if case.key == key)
        text = text.replace(case.old, case.new, 1)
    problems = problems_of(text)
    assert [p.key for p in problems] == keys
    assert sorted(p.line or 0 for p in problems) == [p.line for p in problems]


def test_a_faulty_joint_is_not_complained_of_again_by_what_uses_it() -> None:
    (problem,) = problems_of(GOOD.replace("C = [6.5, 5.0]", "C = [6.5, 'five']"))
    assert problem.key == "joints.C"


def test_a_missing_table_is_not_complained_of_again_by_what_uses_it() -> None:
    start, end = GOOD.index("[joints]"), GOOD.index("[members]")
    (problem,) = problems_of(GOOD[:start] + GOOD[end:])
    assert "the table [joints] is missing" in problem.says
    start, end = GOOD.index("[sections.post]"), GOOD.index("[joints]")
    (problem,) = problems_of(GOOD[:start] + GOOD[end:])
    assert "the table [sections] is missing" in problem.says


def test_a_load_on_a_joint_that_no_member_joins_would_vanish() -> None:
    text = GOOD.replace("A = [0, 0]", "A = [0, 0]\nZ = [0, 9]").replace(FORCE, FORCE.replace('"B"', '"Z"'))
    (problem,) = problems_of(text)
    assert 'no member joins joint "Z"' in problem.says and problem.key == "loads.dead.apply[1]"


def test_ambiguous_dashes_are_refused_with_both_meanings() -> None:
    text = GOOD.replace("A = [0, 0]", '"N" = [1, 1]\n"1-1" = [2, 2]\nA = [0, 0]')
    (problem,) = problems_of(text)
    assert problem.says == 'may mean "N" to "1-1" or "N-1" to "1"'


def test_thousands_of_unknown_names_do_not_take_long() -> None:
    joints = "".join(f"J{k} = [{k}, 0]\n" for k in range(3000))
    members = "".join(f'"J{k}-X{k}" = {{ section = "post", material = "steel" }}\n' for k in range(3000))
    text = GOOD.replace("[joints]\n", "[joints]\n" + joints).replace("[members]\n", "[members]\n" + members)
    assert len(problems_of(text)) == 3000


# Files ------------------------------------------------------------------------------------------------------------


def one_problem(path: Path) -> Problem:
    with pytest.raises(UnusableInput) as caught:
        read_frame(path)
    (problem,) = caught.value.problems
    assert problem.file == str(path)
    return problem


def test_files_that_cannot_be_opened_or_decoded(tmp_path: Path) -> None:
    (tmp_path / "bent.toml").write_text(GOOD, encoding="utf-8")
    assert "there is no such file" in one_problem(tmp_path / "other.toml").says
    assert 'bent.toml"?' in one_problem(tmp_path / "bnet.toml").instead
    assert "this is a folder" in one_problem(tmp_path).says
    assert one_problem(tmp_path / "nul\0").says
    latin = tmp_path / "latin.toml"
    latin.write_bytes(GOOD.replace("Ticket hall", "Ticket\nhäll").encode("latin-1"))
    assert (one_problem(latin).line, one_problem(latin).says) == (2, "byte 0xe4 is not UTF-8")
    wide = tmp_path / "wide.toml"
    wide.write_bytes(GOOD.encode("utf-16"))
    assert "UTF-16" in one_problem(wide).says


# The grid ---------------------------------------------------------------------------------------------------------

GRID = """\
units = "kN m"
[materials.steel]
E = "210 GPa"
[sections]
post = { I = "8360 cm^4", A = "53.8 cm^2" }
[grid]
bays = ["2 x 6 m", 7.5]
storeys = [4.5, 3.6]
columns = [{ section = "post", material = "steel" }, { storeys = 2, lines = ["A", "D"], hinge = "to" }]
beams = { section = "post", material = "steel" }
feet = "fixed"
omit = ["D2"]
[loads.dead]
apply = [{ members = "beams level 2", uniform = 3, direction = "down" }]
"""
GRID_CASES = [
    bad('bays = ["2 x 6 m", 7.5]', "bays = []", "bays is missing", "grid.bays"),
    bad('bays = ["2 x 6 m", 7.5]', 'bays = ["2 x 6 kN", 7.5]', "is a force, not a length", "grid.bays[0]"),
    bad('bays = ["2 x 6 m", 7.5]', 'bays = ["0 x 6 m", 7.5, 1, 1]', "not above zero", "grid.bays[0]"),
    bad('bays = ["2 x 6 m", 7.5]', "bays = [1, -2, 2]", "-2 is not above zero", "grid.bays[1]"),
    bad('bays = ["2 x 6 m", 7.5]', 'bays = ["900000000 x 6 m"]', "more than 250000 joints", "grid", "[grid]"),
    bad("storeys = [4.5, 3.6]\n", "", "storeys is missing", "grid", "[grid]"),
    bad("storeys = [4.5, 3.6]", "storys = [4.5, 3.6]\nstoreys = [1, 1]", 'did you mean "storeys"', "grid.storys"),
    bad("storeys = 2, lines", "storeys = 3, lines", "none of the grid's storeys; there are 1, 2", "grid.columns[1].storeys"),
    bad('lines = ["A", "D"]', 'lines = "E"', "none of the grid's lines; there are A, B, C, D", "grid.columns[1].lines"),
    bad("storeys = 2, lines", "bays = 2, lines", "unknown key in the columns of a grid", "grid.columns[1].bays"),
    bad('beams = { section = "post", ', "beams = { ", "section is missing for some of the beams", "grid.beams"),
    bad('beams = { section = "post"', 'beams = { section = "pots"', 'did you mean "post"', "grid.beams.section"),
    bad("[loads.dead]", '[members]\n"A0-A1" = { rigid_to = 9 }\n[loads.dead]', 'nothing of member "A0-A1"', "members.A0-A1", '"A0-A1"'),
    bad('columns = [{ section', 'columns = [{ storeys = 1, lines = "B", rigid_to = 5, section = "post", material = "steel" }, { section', 'of member "B0-B1", 4.5', "grid", "[grid]"),
    bad('feet = "fixed"', 'feet = "fixt"', 'did you mean "fixed"', "grid.feet"),
    bad('omit = ["D2"]', 'omit = ["D3"]', 'no member or joint of the grid "D3"', "grid.omit[0]"),
    bad('omit = ["D2"]', 'omit = "D2"', "is not a list of names", "grid.omit"),
    bad('feet = "fixed"', 'feet = "fixed"\nlines = ["P", "Q"]', "2 names for 4 gridlines", "grid.lines", "lines = [\"P"),
    bad('feet = "fixed"', 'feet = "fixed"\norigin = 3', "is not a place", "grid.origin", "origin"),
    bad('members = "beams level 2"', 'members = "beams level 7"', "or a group of the grid such as", "loads.dead.apply[0].members"),
    bad("[loads.dead]", '[members]\n"A1-B1" = { spring_from = 0 }\n[loads.dead]', "is a hinge", "members.A1-B1.spring_from", '"A1-B1"'),
]  # fmt: skip


@pytest.mark.parametrize("case", GRID_CASES, ids=lambda case: f"{case.key}: {case.new[:40]!r}")
def test_each_fault_of_a_grid_is_one_message_at_its_line(case: Bad) -> None:
    assert case.old in GRID
    text = GRID.replace(case.old, case.new, 1)
    (problem,) = problems_of(text)
    assert problem.key == case.key
    assert problem.line == text[: text.index(case.at)].count("\n") + 1
    assert re.search(case.words, f"{problem.says}; {problem.instead}"), problem


# Another idealisation, drafts --------------------------------------------------------------------------------------


def test_another_idealisation_is_checked_like_a_stated_one() -> None:
    frame = read_frame_text(GOOD.replace('A = "53.8 cm^2"\n', "").replace('axial = "elastic"\n', "").replace(
        "  { self_weight = 1.0 },\n", ""))  # fmt: skip
    with pytest.raises(UnusableInput, match="has no A, which axial"):
        with_analysis(frame, axial="elastic")
    with pytest.raises(UnusableInput, match="order is 1 or 2"):
        with_analysis(frame, order=3)
    assert with_analysis(frame, order=2).analysis.order == 2
    with pytest.raises(UnusableInput, match='"stiff" is not "rigid" or "elastic"'):
        with_analysis(frame, shear="stiff")
    assert any("AXIALLY RIGID" in warning for warning in frame.warnings)
    assert with_analysis(frame, axial="rigid").warnings == ()


def test_bad_options_of_a_draft_are_named() -> None:
    for make, key in (
        (lambda: draft_blank("kN"), "units"),
        (lambda: draft_grid(["6"], ["x"]), "storeys[0]"),
        (lambda: draft_grid(["6"], ["3"], feet="glued"), "feet"),
        (lambda: draft_grid([], ["3"]), "bays"),
        (lambda: draft_grid(["6"], ["3"], feet="pinned", hinged_beams=True), "feet"),
    ):
        with pytest.raises(UnusableInput) as caught:
            make()
        (problem,) = caught.value.problems
        assert (problem.key, problem.line) == (key, None)


# Anything at all ---------------------------------------------------------------------------------------------------

PIECES = [
    "true", "nan", "-inf", '""', '"-"', "[]", "{}", "[[]]", "1e400", "0", "-1", '"1e999 m"', '"40%"', "2020-01-01", '"A-B"',
    '"0 x 6 m"', '"999999999 x 1"', "'''x'''", "\n", "\r\n", '"\\u0000"', "[x]", "[[loads.dead.apply]]", "=", ",", "#",
]  # fmt: skip


@st.composite
def mutated(draw: st.DrawFn) -> str:
    """GOOD or GRID with a few values, keys or lines exchanged, repeated, removed or replaced by odd pieces."""
    text = draw(st.sampled_from([GOOD, GRID]))
    for _ in range(draw(st.integers(1, 4))):
        words = list(re.finditer(r'"[^"\n]*"|[A-Za-z0-9_.+-]+|[^\s]', text))
        if not words:
            return text
        word, other = draw(st.sampled_from(words)), draw(st.sampled_from(words))
        piece = draw(st.one_of(st.just(other.group()), st.sampled_from(PIECES), st.text(max_size=4), st.just("")))
        text = text[: word.start()] + piece + text[word.end() :]
    return text


@settings(max_examples=400, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(mutated())
def test_whatever_the_file_holds_nothing_but_a_frame_or_its_problems_comes_out(text: str) -> None:
    try:
        frame = read_frame_text(text, "f")
    except UnusableInput as error:
        assert error.problems and all(p.says and "nan" not in p.says.replace('"nan"', "") or "nan is not" in p.says
                                      for p in error.problems)  # fmt: skip
        return
    assert isinstance(frame, Frame)
    table = frame.member_table
    assert (table.length > 0).all() and (table.clear > 0).all() and (table.E > 0).all() and (table.I > 0).all()
