"""Sound frames, and the slips that modelling makes of them: what `inspect` has to find, where, and in which grade.

SOUND holds ten frames in our own grammar with no slip known. A slip is a small function from a sound frame to the frame
with the slip and the place that a finding must name; None where the frame has nothing to slip on.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace

from crosscheck.frame.loads import load_table
from crosscheck.frame.model import (
    FREE,
    HELD,
    Combination,
    Frame,
    Joint,
    JointForce,
    Load,
    LoadCase,
    Member,
    PointForce,
    Section,
    Spread,
    Support,
    Temperature,
)
from crosscheck.frame.reader import read_frame_text
from crosscheck.review.finding import Grade, Subject, load_total
from crosscheck.review.loading import runs
from crosscheck.review.symmetry import mirror_of

STEEL = """
[materials.steel]
E = "210 GPa"
nu = 0.3
alpha = 12e-6
density = "7850 kg/m^3"
"""
CONCRETE = """
[materials.concrete]
E = "32 GPa"
nu = 0.2
alpha = 10e-6
density = "2500 kg/m^3"
"""

SOUND = {
    "portal": """
title = "Workshop portal"
units = "kN m"
""" + STEEL + """
[sections]
column = { I = "25170 cm^4", A = "149 cm^2", depth = "300 mm", shear_area = "37 cm^2" }
girder = { I = "33740 cm^4", A = "84.5 cm^2", depth = "400 mm", shear_area = "43 cm^2" }
[joints]
A = [0, 0]
B = [0, 4.5]
C = [10, 4.5]
D = [10, 0]
[members]
"A-B" = { section = "column", material = "steel" }
"B-C" = { section = "girder", material = "steel" }
"D-C" = { section = "column", material = "steel" }
[supports]
A = "fixed"
D = "fixed"
[loads.dead]
apply = [{ member = "B-C", uniform = 4.0, direction = "down" }, { self_weight = 1.0 }]
[loads.snow]
apply = [{ member = "B-C", uniform = 4.2, direction = "down" }]
expected = { down = "42 kN" }
[loads.wind]
apply = [{ member = "A-B", uniform = 2.4, direction = "right" }, { member = "D-C", uniform = 1.2, direction = "right" }]
[combinations]
gravity = { dead = 1.35, snow = 1.5 }
storm = { dead = 1.35, snow = 0.75, wind = 1.5 }
light = { dead = 1.0, wind = 1.5 }
""",
    "gable": """
title = "Store, pitched portal with pinned feet"
units = "kN m"
""" + STEEL + """
[sections]
leg = { I = "48200 cm^4", A = "116 cm^2", depth = "450 mm" }
rafter = { I = "33740 cm^4", A = "84.5 cm^2", depth = "400 mm" }
[joints]
A = [0, 0]
B = [0, 4]
C = [8, 5.6]
D = [16, 4]
E = [16, 0]
[members]
"A-B" = { section = "leg", material = "steel" }
"B-C" = { section = "rafter", material = "steel" }
"C-D" = { section = "rafter", material = "steel" }
"D-E" = { section = "leg", material = "steel" }
[supports]
A = "pinned"
E = "pinned"
[loads.dead]
apply = [{ members = ["B-C", "C-D"], uniform = 2.5, direction = "down" }, { self_weight = 1.0 }]
[loads.snow]
apply = [{ members = ["B-C", "C-D"], uniform = 3.0, direction = "down", per = "projection" }]
[loads.wind]
apply = [
  { member = "A-B", uniform = 2.0, direction = "right" },
  { member = "D-E", uniform = 1.0, direction = "right" },
  { member = "B-C", uniform = 1.4, direction = "across" },
  { member = "C-D", uniform = 1.0, direction = "across" },
]
[combinations]
gravity = { dead = 1.35, snow = 1.5 }
lift = { dead = 1.0, wind = 1.5 }
""",
    "offices": """
title = "Offices, two bays and two storeys"
units = "kN m"
""" + CONCRETE + """
[sections]
column = { I = "0.00213 m^4", A = "0.16 m^2", depth = "400 mm" }
beam = { I = "0.0054 m^4", A = "0.18 m^2", depth = "600 mm" }
[grid]
bays = [6, 6]
storeys = [4, 3.5]
columns = { section = "column", material = "concrete" }
beams = { section = "beam", material = "concrete" }
feet = "fixed"
[loads.dead]
apply = [{ members = ["beams"], uniform = 22.0, direction = "down" }]
[loads.imposed]
apply = [{ members = ["beams"], uniform = 12.0, direction = "down" }]
[loads.wind]
apply = [{ joint = "A1", force = 24.0, direction = "right" }, { joint = "A2", force = 13.0, direction = "right" }]
[combinations]
gravity = { dead = 1.35, imposed = 1.5 }
sway = { dead = 1.35, imposed = 1.05, wind = 1.5 }
least = { dead = 1.0, wind = 1.5 }
""",
    "block": """
title = "Dwellings, three bays and five storeys"
units = "kN m"
""" + CONCRETE + """
[sections]
column = { I = "0.0052 m^4", A = "0.25 m^2", depth = "500 mm" }
beam = { I = "0.0054 m^4", A = "0.18 m^2", depth = "600 mm" }
[grid]
bays = [5.4, 5.4, 5.4]
storeys = [3.6, 3, 3, 3, 3]
columns = { section = "column", material = "concrete" }
beams = { section = "beam", material = "concrete" }
feet = { x = "held", y = "held", rotation = "150 MN m/rad" }
[loads.dead]
apply = [{ members = ["beams"], uniform = 24.0, direction = "down" }, { self_weight = 1.0 }]
[loads.imposed]
apply = [{ members = ["beams"], uniform = 8.0, direction = "down" }]
[loads.wind]
apply = [
  { joint = "A1", force = 18.0, direction = "right" },
  { joint = "A2", force = 17.0, direction = "right" },
  { joint = "A3", force = 18.0, direction = "right" },
  { joint = "A4", force = 19.0, direction = "right" },
  { joint = "A5", force = 10.0, direction = "right" },
]
[combinations]
gravity = { dead = 1.35, imposed = 1.5 }
sway = { dead = 1.35, imposed = 1.05, wind = 1.5 }
least = { dead = 1.0, wind = 1.5 }
""",
    "continuous": """
title = "Floor beam over four spans"
units = "kN m"
""" + STEEL + """
[sections]
beam = { I = "23130 cm^4", A = "72.7 cm^2", depth = "360 mm" }
[joints]
A = [0, 0]
B = [7, 0]
C = [14, 0]
D = [21, 0]
E = [28, 0]
[members]
"A-B" = { section = "beam", material = "steel" }
"B-C" = { section = "beam", material = "steel" }
"C-D" = { section = "beam", material = "steel" }
"D-E" = { section = "beam", material = "steel" }
[supports]
A = "pinned"
B = "roller"
C = "roller"
D = "roller"
E = "roller"
[loads.dead]
apply = [{ members = ["A-B", "B-C", "C-D", "D-E"], uniform = 9.0, direction = "down" }]
[loads.imposed]
apply = [{ members = ["A-B", "B-C", "C-D", "D-E"], uniform = 11.0, direction = "down" }]
[combinations]
ultimate = { dead = 1.35, imposed = 1.5 }
""",
    "truss": """
title = "Roof truss"
units = "kN m"
""" + STEEL + """
[sections]
chord = { I = "541 cm^4", A = "53.8 cm^2" }
web = { I = "318 cm^4", A = "31.4 cm^2" }
[joints]
L0 = [0, 0]
L1 = [3, 0]
L2 = [6, 0]
L3 = [9, 0]
L4 = [12, 0]
U1 = [3, 2]
U2 = [6, 2]
U3 = [9, 2]
[members]
"L0-L1" = { section = "chord", material = "steel" }
"L1-L2" = { section = "chord", material = "steel" }
"L2-L3" = { section = "chord", material = "steel" }
"L3-L4" = { section = "chord", material = "steel" }
"U1-U2" = { section = "chord", material = "steel" }
"U2-U3" = { section = "chord", material = "steel" }
"L0-U1" = { section = "chord", material = "steel", hinge = "both" }
"U3-L4" = { section = "chord", material = "steel", hinge = "both" }
"L1-U1" = { section = "web", material = "steel", hinge = "both" }
"L2-U2" = { section = "web", material = "steel", hinge = "both" }
"L3-U3" = { section = "web", material = "steel", hinge = "both" }
"U1-L2" = { section = "web", material = "steel", hinge = "both" }
"L2-U3" = { section = "web", material = "steel", hinge = "both" }
[supports]
L0 = "pinned"
L4 = "roller"
[loads.dead]
apply = [{ joints = ["L1", "L2", "L3"], force = 18.0, direction = "down" }]
[loads.snow]
apply = [{ joints = ["U1", "U2", "U3"], force = 24.0, direction = "down" }]
[combinations]
ultimate = { dead = 1.35, snow = 1.5 }
""",
    "braced": """
title = "Plant room, braced bay with hinged beams"
units = "kN m"
""" + STEEL + """
[sections]
post = { I = "14920 cm^4", A = "118 cm^2", depth = "260 mm" }
beam = { I = "16270 cm^4", A = "62.6 cm^2", depth = "330 mm" }
brace = { I = "318 cm^4", A = "17 cm^2" }
[joints]
A0 = [0, 0]
A1 = [0, 4]
A2 = [0, 7.5]
B0 = [6, 0]
B1 = [6, 4]
B2 = [6, 7.5]
C0 = [12, 0]
C1 = [12, 4]
C2 = [12, 7.5]
[members]
"A0-A1" = { section = "post", material = "steel" }
"A1-A2" = { section = "post", material = "steel" }
"B0-B1" = { section = "post", material = "steel" }
"B1-B2" = { section = "post", material = "steel" }
"C0-C1" = { section = "post", material = "steel" }
"C1-C2" = { section = "post", material = "steel" }
"A1-B1" = { section = "beam", material = "steel", hinge = "both" }
"B1-C1" = { section = "beam", material = "steel", hinge = "both" }
"A2-B2" = { section = "beam", material = "steel", hinge = "both" }
"B2-C2" = { section = "beam", material = "steel", hinge = "both" }
"A0-B1" = { section = "brace", material = "steel", hinge = "both" }
"A1-B2" = { section = "brace", material = "steel", hinge = "both" }
[supports]
A0 = "pinned"
B0 = "pinned"
C0 = "pinned"
[loads.dead]
apply = [{ members = ["A1-B1", "B1-C1", "A2-B2", "B2-C2"], uniform = 9.0, direction = "down" }]
[loads.plant]
apply = [{ members = ["A1-B1", "B1-C1"], uniform = 10.0, direction = "down" }]
[loads.wind]
apply = [{ joint = "A1", force = 12.0, direction = "right" }, { joint = "A2", force = 7.0, direction = "right" }]
[combinations]
gravity = { dead = 1.35, plant = 1.5 }
sway = { dead = 1.35, plant = 1.05, wind = 1.5 }
least = { dead = 1.0, wind = 1.5 }
""",
    "timber": """
title = "Timber hall in feet and kips"
units = "kip ft"
[materials.glulam]
E = "1800 ksi"
density = "30 lb/ft^3"
[sections]
post = { I = "1150 in^4", A = "96 in^2", depth = "12 in" }
beam = { I = "5590 in^4", A = "161 in^2", depth = "20.4 in" }
[joints]
A = [0, 0]
B = [0, 13]
C = [22, 13]
D = [44, 13]
E = [44, 0]
F = [22, 0]
[members]
"A-B" = { section = "post", material = "glulam" }
"F-C" = { section = "post", material = "glulam" }
"E-D" = { section = "post", material = "glulam" }
"B-C" = { section = "beam", material = "glulam" }
"C-D" = { section = "beam", material = "glulam" }
[supports]
A = "fixed"
F = "fixed"
E = "fixed"
[loads.dead]
apply = [{ members = ["B-C", "C-D"], uniform = 0.35, direction = "down" }, { self_weight = 1.0 }]
[loads.snow]
apply = [{ members = ["B-C", "C-D"], uniform = 0.5, direction = "down" }]
[loads.wind]
apply = [{ joint = "B", force = 1.2, direction = "right" }]
[combinations]
gravity = { dead = 1.2, snow = 1.6 }
sway = { dead = 1.2, snow = 0.5, wind = 1.0 }
least = { dead = 0.9, wind = 1.0 }
""",
    "gantry": """
title = "Crane gantry in newtons and millimetres"
units = "N mm"
""" + STEEL + """
[sections]
leg = { I = "86970 cm^4", A = "198 cm^2", depth = "450 mm", shear_area = "66 cm^2" }
bridge = { I = "92080 cm^4", A = "156 cm^2", depth = "600 mm", shear_area = "80 cm^2" }
[joints]
A = [0, 0]
B = [0, 6000]
C = [3000, 6000]
D = [6000, 6000]
E = [9000, 6000]
F = [9000, 0]
[members]
"A-B" = { section = "leg", material = "steel" }
"B-C" = { section = "bridge", material = "steel" }
"C-D" = { section = "bridge", material = "steel" }
"D-E" = { section = "bridge", material = "steel" }
"F-E" = { section = "leg", material = "steel" }
[supports]
A = { x = "held", y = "held", rotation = "40 MN m/rad" }
F = { x = "held", y = "held", rotation = "40 MN m/rad" }
[loads.dead]
apply = [{ members = ["B-C", "C-D", "D-E"], uniform = 3.5, direction = "down" }, { self_weight = 1.0 }]
[loads.crane]
apply = [{ joint = "C", force = 90000, direction = "down" }, { joint = "D", force = 90000, direction = "down" }]
[loads.surge]
apply = [{ joint = "C", force = 6000, direction = "right" }]
[loads.summer]
apply = [{ members = ["B-C", "C-D", "D-E"], temperature = 25 }]
[analysis]
shear = "elastic"
[combinations]
lifting = { dead = 1.35, crane = 1.5, surge = 1.5 }
idle = { dead = 1.0, surge = 1.0, summer = 0.6 }
""",
    "viaduct": """
title = "Pipe viaduct on three piers"
units = "kN m"
""" + CONCRETE + """
[sections]
deck = { I = "0.0427 m^4", A = "0.64 m^2", depth = "0.8 m" }
pier = { I = "0.0067 m^4", A = "0.32 m^2", depth = "0.5 m" }
[joints]
a = [0, 8]
b = [12, 8]
c = [24, 8]
d = [36, 8]
e = [48, 8]
p = [12, 0]
q = [24, 0]
r = [36, 0]
[members]
deck1 = { from = "a", to = "b", section = "deck", material = "concrete" }
deck2 = { from = "b", to = "c", section = "deck", material = "concrete" }
deck3 = { from = "c", to = "d", section = "deck", material = "concrete" }
deck4 = { from = "d", to = "e", section = "deck", material = "concrete" }
pier1 = { from = "p", to = "b", section = "pier", material = "concrete" }
pier2 = { from = "q", to = "c", section = "pier", material = "concrete" }
pier3 = { from = "r", to = "d", section = "pier", material = "concrete" }
[supports]
a = "roller"
e = "roller"
p = "fixed"
q = "fixed"
r = "fixed"
[loads.dead]
apply = [{ members = ["deck1", "deck2", "deck3", "deck4"], uniform = 6.0, direction = "down" }, { self_weight = 1.0 }]
[loads.pipes]
apply = [{ members = ["deck1", "deck2", "deck3", "deck4"], uniform = 14.0, direction = "down" }]
[loads.winter]
apply = [{ members = ["deck1", "deck2", "deck3", "deck4"], temperature = -20 }]
[combinations]
full = { dead = 1.35, pipes = 1.35, winter = 0.6 }
least = { dead = 1.0, winter = 1.0 }
""",
}  # fmt: skip


def sound(name: str) -> Frame:
    """A sound frame by name."""
    return read_frame_text(SOUND[name], f"{name}.toml")


@dataclass(frozen=True, slots=True)
class Slipped:
    """A frame with a slip, and the place that the finding must name ("" where it names none)."""

    frame: Frame
    where: str


@dataclass(frozen=True, slots=True)
class Slip:
    """A kind of slip. check, grade: what must find it. make: the slip on a frame, None where it does not apply."""

    kind: str
    check: str
    grade: Grade
    make: Callable[[Frame], Slipped | None]


SLIPS: list[Slip] = []
Make = Callable[[Frame], Slipped | None]


def slip(check: str, grade: Grade = "check") -> Callable[[Make], Make]:
    """Adds a function to the corpus; its name with blanks is the kind."""

    def add(make: Make) -> Make:
        SLIPS.append(Slip(make.__name__.replace("_", " "), check, grade, make))
        return make

    return add


# --- small parts


def with_member(frame: Frame, name: str, **changes: object) -> Frame:
    return replace(frame, members={**frame.members, name: replace(frame.members[name], **changes)})  # type: ignore[arg-type]


def with_section(frame: Frame, name: str, **changes: object) -> Frame:
    return replace(frame, sections={**frame.sections, name: replace(frame.sections[name], **changes)})  # type: ignore[arg-type]


def with_support(frame: Frame, name: str, **changes: object) -> Frame:
    return replace(frame, supports={**frame.supports, name: replace(frame.supports[name], **changes)})  # type: ignore[arg-type]


def with_joint(frame: Frame, name: str, x: float, y: float) -> Frame:
    return replace(frame, joints={**frame.joints, name: Joint(name, x, y)})


def without_joint(frame: Frame, name: str) -> Frame:
    return replace(frame, joints={n: j for n, j in frame.joints.items() if n != name})


def with_loads(frame: Frame, case: str, loads: tuple[Load, ...]) -> Frame:
    return replace(frame, cases={**frame.cases, case: replace(frame.cases[case], loads=loads)})


def with_combination(frame: Frame, name: str, factors: dict[str, float]) -> Frame:
    return replace(frame, combinations={**frame.combinations, name: Combination(name, factors)})


def beams(frame: Frame) -> list[Member]:
    t = frame.member_table
    return [m for k, m in enumerate(frame.members.values()) if abs(t.sin[k]) < 0.35]


def posts(frame: Frame) -> list[Member]:
    t = frame.member_table
    return [m for k, m in enumerate(frame.members.values()) if abs(t.sin[k]) > 0.99]


def at_joint(frame: Frame, joint: str) -> list[Member]:
    return [m for m in frame.members.values() if joint in (m.joint_from, m.joint_to)]


def column_feet(frame: Frame) -> list[str]:
    """Supported joints on which plumb members stand and nothing else ends."""
    standing = {m.name for m in posts(frame)}
    return [n for n in frame.supports if at_joint(frame, n) and all(m.name in standing for m in at_joint(frame, n))]


def metre(frame: Frame) -> float:
    return 1.0 / frame.units.metre


def spreads(frame: Frame, case: str, on: Callable[[str], bool] = lambda _: True) -> list[Spread]:
    return [load for load in frame.cases[case].loads if isinstance(load, Spread) and on(load.member)]


def swapped(frame: Frame, case: str, old: Load, new: Load | None) -> Frame:
    """One load of a case in another's place, or gone."""
    loads = [load if load is not old else new for load in frame.cases[case].loads]
    return with_loads(frame, case, tuple(load for load in loads if load is not None))


# --- standing up and connection


@slip("mechanisms", "serious")
def every_foot_on_rollers(frame: Frame) -> Slipped | None:
    for name in frame.supports:
        frame = with_support(frame, name, x=FREE, rotation=FREE)
    return Slipped(frame, next(iter(frame.supports)))


@slip("mechanisms", "serious")
def one_hinge_too_many(frame: Frame) -> Slipped | None:
    """Pinned feet, and the beam of a single bay hinged at both ends."""
    if len(column_feet(frame)) != 2 or len(posts(frame)) != 2 or len(beams(frame)) != 1:
        return None
    for name in frame.supports:
        frame = with_support(frame, name, rotation=FREE)
    beam = beams(frame)[0]
    return Slipped(with_member(frame, beam.name, turn_from=FREE, turn_to=FREE), beam.joint_from)


@slip("mechanisms", "serious")
def bracing_left_out(frame: Frame) -> Slipped | None:
    if not any(m.section == "brace" for m in frame.members.values()):
        return None
    members = {n: m for n, m in frame.members.items() if m.section != "brace"}
    return Slipped(replace(frame, members=members), "A2")


@slip("mechanisms", "serious")
def feet_without_supports(frame: Frame) -> Slipped | None:
    return Slipped(replace(frame, supports={}), next(iter(frame.joints)))


@slip("loose_joints")
def a_joint_left_over(frame: Frame) -> Slipped | None:
    return Slipped(with_joint(frame, "spare", frame.xy[:, 0].max() + 3 * metre(frame), 0.0), "spare")


@slip("near_joints")
def a_member_that_ends_beside_the_joint(frame: Frame) -> Slipped | None:
    """The last beam ends at a joint of its own, 8 mm from the one it should end at."""
    ends = [m for m in beams(frame) if len(at_joint(frame, m.joint_to)) > 1 and m.joint_to not in frame.supports]
    if not ends:
        return None
    beam = ends[-1]
    joint = frame.joints[beam.joint_to]
    frame = with_joint(frame, "stray", joint.x - 0.008 * metre(frame), joint.y)
    return Slipped(with_member(frame, beam.name, joint_to="stray"), "stray")


@slip("touching", "serious")
def a_beam_drawn_in_one_over_a_column(frame: Frame) -> Slipped | None:
    """Two beams in a line become one that passes over the joint between them."""
    for one in beams(frame):
        for two in beams(frame):
            if one.joint_to == two.joint_from and len(at_joint(frame, one.joint_to)) > 2:
                members = {n: m for n, m in frame.members.items() if n != two.name}
                members[one.name] = replace(one, joint_to=two.joint_to)
                changed = replace(frame, members=members)
                for case in changed.cases.values():
                    kept = tuple(load for load in case.loads if getattr(load, "member", "") != two.name)
                    changed = with_loads(changed, case.name, kept)
                straight = abs(frame.joints[one.joint_from].y - frame.joints[two.joint_to].y) < 1e-9
                return Slipped(changed, one.joint_to) if straight else None
    return None


@slip("crossing")
def a_member_across_another(frame: Frame) -> Slipped | None:
    """A stiff diagonal across a bay that has one already, or across a column."""
    for post in posts(frame):
        low, high = sorted((post.joint_from, post.joint_to), key=lambda n: frame.joints[n].y)
        left = [n for n, j in frame.joints.items() if j.x < frame.joints[low].x and abs(j.y - frame.joints[low].y) < 1e-9]
        right = [n for n, j in frame.joints.items() if j.x > frame.joints[low].x and abs(j.y - frame.joints[high].y) < 1e-9]
        if left and right:
            new = replace(post, name="odd", joint_from=left[-1], joint_to=right[0], turn_from=HELD, turn_to=HELD)
            return Slipped(replace(frame, members={**frame.members, "odd": new}), "odd")
    return None


@slip("doubled")
def a_member_entered_twice(frame: Frame) -> Slipped | None:
    last = list(frame.members.values())[-1]
    again = replace(last, name="again", joint_from=last.joint_to, joint_to=last.joint_from)
    return Slipped(replace(frame, members={**frame.members, "again": again}), "again")


@slip("idle_supports")
def a_support_free_in_every_direction(frame: Frame) -> Slipped | None:
    name = next((n for n in frame.joints if n not in frame.supports), None)
    if name is None:
        return None
    return Slipped(replace(frame, supports={**frame.supports, name: Support(name, FREE, FREE, FREE)}), name)


@slip("idle_supports")
def a_support_beside_the_column(frame: Frame) -> Slipped | None:
    """It stands at a joint of its own, to which nothing leads."""
    frame = with_joint(frame, "pad", frame.xy[:, 0].max() + 2 * metre(frame), 0.0)
    return Slipped(replace(frame, supports={**frame.supports, "pad": Support("pad", HELD, HELD, HELD)}), "pad")


@slip("off_line")
def a_joint_a_hands_breadth_off_its_level(frame: Frame) -> Slipped | None:
    return _off(frame, 0.06)


@slip("off_line")
def a_joint_eight_millimetres_off_its_level(frame: Frame) -> Slipped | None:
    return _off(frame, 0.008)


def _off(frame: Frame, by: float) -> Slipped | None:
    y = [j.y for j in frame.joints.values()]
    for name, joint in list(frame.joints.items())[::-1]:
        if y.count(joint.y) >= 4:
            return Slipped(with_joint(frame, name, joint.x, joint.y + by * metre(frame)), name)
    return None


# --- symmetry


@slip("mirrored_sections")
def one_member_with_its_neighbours_section(frame: Frame) -> Slipped | None:
    names = list(frame.sections)
    mirror = [m for m in beams(frame) + posts(frame) if _has_twin(frame, m)]
    if len(mirror) < 4 or len(names) < 2:
        return None
    assert mirror_of(Subject(frame)) is not None
    odd = mirror[-1]
    other = next(n for n in names if n != odd.section)
    return Slipped(with_member(frame, odd.name, section=other), odd.name)


def _has_twin(frame: Frame, member: Member) -> bool:
    middle = (frame.xy[:, 0].min() + frame.xy[:, 0].max()) / 2
    a, b = frame.joints[member.joint_from], frame.joints[member.joint_to]
    return bool(abs((a.x + b.x) / 2 - middle) > 1e-6 * metre(frame))


@slip("mirrored_supports")
def one_foot_pinned_by_mistake(frame: Frame) -> Slipped | None:
    feet = [n for n in column_feet(frame) if frame.supports[n].rotation == HELD]
    if len(feet) < 2:
        return None
    last = max(feet, key=lambda n: frame.joints[n].x)
    return Slipped(with_support(frame, last, rotation=FREE), last)


@slip("mirrored_supports")
def one_foot_forgotten(frame: Frame) -> Slipped | None:
    feet = column_feet(frame)
    if len(feet) < 2 or any(frame.supports[n].rotation == FREE for n in feet):
        return None
    last = max(feet, key=lambda n: frame.joints[n].x)
    return Slipped(replace(frame, supports={n: s for n, s in frame.supports.items() if n != last}), last)


@slip("mirrored_loads")
def a_load_a_little_more_on_one_side(frame: Frame) -> Slipped | None:
    for case in frame.cases:
        loads = [s for s in spreads(frame, case) if _has_twin(frame, frame.members[s.member])]
        if len(loads) >= 2 and loads[0].first == loads[-1].first and loads[0].member in {m.name for m in beams(frame)}:
            last = loads[-1]
            new = replace(last, first=1.06 * last.first, last=1.06 * last.last)
            return Slipped(swapped(frame, case, last, new), last.member)
    return None


# --- materials and sections


@slip("moduli", "serious")
def modulus_in_mega_for_giga(frame: Frame) -> Slipped | None:
    name, material = next(iter(frame.materials.items()))
    return Slipped(replace(frame, materials={**frame.materials, name: replace(material, E=material.E / 1000)}), name)


@slip("moduli")
def modulus_of_another_material(frame: Frame) -> Slipped | None:
    name, material = next(iter(frame.materials.items()))
    factor = 1 / 3 if name == "steel" else 10 if name == "glulam" else 6.5
    return Slipped(replace(frame, materials={**frame.materials, name: replace(material, E=material.E * factor)}), name)


@slip("weights")
def density_ten_times_too_high(frame: Frame) -> Slipped | None:
    name, material = next(iter(frame.materials.items()))
    if material.weight is None or name == "glulam":
        return None
    heavy = replace(material, weight=10 * material.weight)
    return Slipped(replace(frame, materials={**frame.materials, name: heavy}), name)


@slip("weights")
def alpha_with_a_slipped_exponent(frame: Frame) -> Slipped | None:
    name, material = next(iter(frame.materials.items()))
    if material.alpha is None:
        return None
    return Slipped(replace(frame, materials={**frame.materials, name: replace(material, alpha=10 * material.alpha)}), name)


def _last_section(frame: Frame, depth: bool) -> Section | None:
    found = [s for s in frame.sections.values() if (s.depth is not None) == depth]
    return found[-1] if found else None


@slip("sections", "serious")
def inertia_too_large_by_ten_thousand(frame: Frame) -> Slipped | None:
    s = _last_section(frame, depth=True)
    return Slipped(with_section(frame, s.name, I=1e4 * s.I), s.name) if s else None


@slip("sections")
def inertia_too_small_by_ten_thousand(frame: Frame) -> Slipped | None:
    s = _last_section(frame, depth=True)
    return Slipped(with_section(frame, s.name, I=1e-4 * s.I), s.name) if s else None


@slip("sections")
def area_too_large_by_a_hundred(frame: Frame) -> Slipped | None:
    s = _last_section(frame, depth=True)
    return Slipped(with_section(frame, s.name, A=100 * (s.A or 0.0)), s.name) if s else None


@slip("sections", "serious")
def area_too_small_by_a_hundred(frame: Frame) -> Slipped | None:
    s = _last_section(frame, depth=True)
    return Slipped(with_section(frame, s.name, A=(s.A or 0.0) / 100), s.name) if s else None


@slip("sections", "serious")
def depth_in_centimetres_for_millimetres(frame: Frame) -> Slipped | None:
    s = _last_section(frame, depth=True)
    return Slipped(with_section(frame, s.name, depth=(s.depth or 0.0) / 10), s.name) if s else None


@slip("sections")
def inertia_slipped_where_no_depth_is_given(frame: Frame) -> Slipped | None:
    s = list(frame.sections.values())[0]
    return Slipped(with_section(frame, s.name, I=1e4 * s.I, depth=None), s.name)


@slip("slenderness")
def inertia_alone_and_slipped(frame: Frame) -> Slipped | None:
    """No area and no depth: only the members' length can tell."""
    sections = {n: Section(n, s.I) for n, s in frame.sections.items()}
    cases = {n: LoadCase(n, tuple(load for load in c.loads if isinstance(load, (Spread, PointForce, JointForce))))
             for n, c in frame.cases.items()}  # fmt: skip
    analysis = replace(frame.analysis, axial="rigid", shear="rigid")
    frame = replace(frame, sections=sections, cases=cases, combinations={}, analysis=analysis)
    first = next(iter(sections.values()))
    return Slipped(with_section(frame, first.name, I=first.I * 1e8), first.name)


@slip("weak_axis")
def weak_axis_for_strong(frame: Frame) -> Slipped | None:
    s = _last_section(frame, depth=True)
    if s is None or s.depth is None or s.A is None:
        return None
    return Slipped(with_section(frame, s.name, I=s.A * (0.15 * s.depth) ** 2), s.name)


@slip("weak_axis")
def weak_axis_told_by_a_section_of_the_same_area(frame: Frame) -> Slipped | None:
    s = list(frame.sections.values())[0]
    frame = with_section(frame, s.name, depth=None)
    turned = Section("turned", s.I / 12, s.A, s.shear_area)
    frame = replace(frame, sections={**frame.sections, "turned": turned})
    own = [m for m in frame.members.values() if m.section == s.name]
    return Slipped(with_member(frame, own[-1].name, section="turned"), "turned")


@slip("shear_areas", "serious")
def area_and_shear_area_swapped(frame: Frame) -> Slipped | None:
    for s in frame.sections.values():
        if s.shear_area is not None:
            return Slipped(with_section(frame, s.name, A=s.shear_area, shear_area=s.A), s.name)
    return None


# --- stiffness


@slip("short_members")
def two_joints_for_one(frame: Frame) -> Slipped | None:
    """A member of 20 mm between the end of a beam and the joint it should end at."""
    beam = beams(frame)[-1]
    end = frame.joints[beam.joint_to]
    frame = with_joint(frame, "twin", end.x - 0.02 * metre(frame), end.y)
    frame = with_member(frame, beam.name, joint_to="twin")
    stub = replace(beam, name="stub", joint_from="twin", turn_from=HELD, turn_to=HELD)
    return Slipped(replace(frame, members={**frame.members, "stub": stub}), "stub")


def _lone_section(frame: Frame, factor: float) -> Slipped | None:
    bent = [m for m in beams(frame) if m.turn_from != FREE or m.turn_to != FREE]
    if len(frame.members) < 4 or not bent:
        return None
    beam, s = bent[-1], frame.sections[bent[-1].section]
    frame = replace(frame, sections={**frame.sections, "lone": Section("lone", s.I * factor, s.A, s.shear_area)})
    return Slipped(with_member(frame, beam.name, section="lone"), beam.name)


@slip("members")
def one_member_too_stiff_by_ten_thousand(frame: Frame) -> Slipped | None:
    return _lone_section(frame, 1e4)


@slip("members")
def one_member_too_soft_by_ten_thousand(frame: Frame) -> Slipped | None:
    return _lone_section(frame, 1e-4)


@slip("springs")
def foot_spring_in_newtons_for_kilonewtons(frame: Frame) -> Slipped | None:
    feet = column_feet(frame)
    held = [n for n in feet if frame.supports[n].rotation != FREE]
    if len(held) < 2:
        return None
    t, k = frame.member_table, frame.member_index[at_joint(frame, held[0])[0].name]
    usual = float(t.E[k] * t.I[k] / t.length[k])
    return Slipped(with_support(frame, held[0], rotation=usual / 1000), held[0])


@slip("springs")
def joint_spring_a_million_times_too_stiff(frame: Frame) -> Slipped | None:
    beam = beams(frame)[0]
    t, k = frame.member_table, frame.member_index[beam.name]
    return Slipped(with_member(frame, beam.name, turn_from=float(1e6 * t.E[k] * t.I[k] / t.length[k])), beam.name)


@slip("conditioning")
def a_stub_of_two_millimetres(frame: Frame) -> Slipped | None:
    slipped = two_joints_for_one(frame)
    if slipped is None:
        return None
    beam = slipped.frame.members["stub"]
    end = frame.joints[beam.joint_to]
    return Slipped(with_joint(slipped.frame, "twin", end.x - 0.002 * metre(frame), end.y), "stub")


@slip("fixed_feet", "note")
def feet_fixed_without_a_word(frame: Frame) -> Slipped | None:
    feet = [n for n in column_feet(frame) if frame.supports[n].rotation != HELD]
    if not feet:
        return None
    for name in feet:
        frame = with_support(frame, name, rotation=HELD)
    return Slipped(frame, feet[0])


# --- loads


@slip("empty_cases")
def a_case_that_lost_its_loads(frame: Frame) -> Slipped | None:
    name = list(frame.cases)[-1]
    return Slipped(with_loads(frame, name, ()), name)


@slip("expected", "serious")
def a_load_that_does_not_add_up_to_the_take_down(frame: Frame) -> Slipped | None:
    for name, case in frame.cases.items():
        loads = spreads(frame, name)
        if loads and case.loads and all(isinstance(load, Spread) for load in case.loads):
            down = -float(load_total(frame, load_table(frame, name))[1])
            if down > 0:
                changed = swapped(frame, name, loads[-1], None)
                stated = replace(changed.cases[name], expected={"down": down})
                return Slipped(replace(changed, cases={**changed.cases, name: stated}), name)
    return None


@slip("upward_case")
def a_whole_case_with_the_wrong_sign(frame: Frame) -> Slipped | None:
    def turned(load: Load) -> Load:
        if isinstance(load, Spread):
            return replace(load, first=-load.first, last=-load.last)
        return replace(load, force=-load.force) if isinstance(load, (JointForce, PointForce)) else load

    loads = tuple(load for load in frame.cases["dead"].loads if isinstance(load, (Spread, JointForce, PointForce)))
    return Slipped(with_loads(frame, "dead", tuple(turned(load) for load in loads)), "dead")


@slip("odd_directions")
def one_load_upward_among_others(frame: Frame) -> Slipped | None:
    for case in frame.cases:
        loads = spreads(frame, case, lambda n: n in {m.name for m in beams(frame)})
        if len(loads) >= 4 and len({s.direction for s in loads}) == 1:
            odd = loads[1]
            return Slipped(swapped(frame, case, odd, replace(odd, first=-odd.first, last=-odd.last)), odd.member)
    return None


@slip("odd_directions")
def one_load_sideways_among_others(frame: Frame) -> Slipped | None:
    for case in frame.cases:
        loads = spreads(frame, case, lambda n: n in {m.name for m in beams(frame)})
        if len(loads) >= 4 and {s.direction for s in loads} == {270.0}:
            return Slipped(swapped(frame, case, loads[2], replace(loads[2], direction=0.0)), loads[2].member)
    return None


@slip("odd_sizes")
def one_load_a_thousand_times_too_large(frame: Frame) -> Slipped | None:
    for case in frame.cases:
        loads = spreads(frame, case, lambda n: n in {m.name for m in beams(frame)})
        if len(loads) >= 3:
            odd = loads[0]
            return Slipped(swapped(frame, case, odd, replace(odd, first=1e3 * odd.first, last=1e3 * odd.last)), odd.member)
    return None


@slip("odd_sizes")
def one_force_without_its_decimal_point(frame: Frame) -> Slipped | None:
    for name, case in frame.cases.items():
        forces = [load for load in case.loads if isinstance(load, JointForce)]
        if len(forces) >= 3:
            odd = forces[-1]
            return Slipped(swapped(frame, name, odd, replace(odd, force=odd.force / 100)), odd.joint)
    return None


@slip("doubled_loads")
def a_load_entered_twice(frame: Frame) -> Slipped | None:
    for name in frame.cases:
        if loads := spreads(frame, name):
            entry = max(getattr(load, "entry", 0) for load in frame.cases[name].loads) + 1
            again = replace(loads[-1], entry=entry)
            return Slipped(with_loads(frame, name, (*frame.cases[name].loads, again)), loads[-1].member)
    return None


@slip("unloaded_span")
def one_span_of_a_run_left_bare(frame: Frame) -> Slipped | None:
    names = list(frame.members)
    for run in runs(Subject(frame)):
        loads = spreads(frame, "dead", lambda n, run=run: n in {names[k] for k in run})  # type: ignore[misc]
        if len(run) >= 3 and len(loads) == len(run):
            return Slipped(swapped(frame, "dead", loads[1], None), loads[1].member)
    return None


# --- combinations


@slip("unused_cases")
def a_case_in_no_combination(frame: Frame) -> Slipped | None:
    last = list(frame.cases)[-1]
    combinations = {
        n: Combination(n, {case: f for case, f in c.factors.items() if case != last})
        for n, c in frame.combinations.items()
    }
    return Slipped(replace(frame, combinations=combinations), last)


@slip("twice")
def a_case_twice_under_two_names(frame: Frame) -> Slipped | None:
    again = replace(frame.cases["dead"], name="dead load")
    frame = replace(frame, cases={**frame.cases, "dead load": again})
    name, c = next(iter(frame.combinations.items()))
    return Slipped(with_combination(frame, name, {**c.factors, "dead load": 1.35}), "dead load")


@slip("twice")
def a_case_with_factor_zero(frame: Frame) -> Slipped | None:
    name, c = next(iter(frame.combinations.items()))
    last = list(c.factors)[-1]
    return Slipped(with_combination(frame, name, {**c.factors, last: 0.0}), last)


@slip("opposing_winds")
def winds_from_both_sides_added(frame: Frame) -> Slipped | None:
    if "wind" not in frame.cases:
        return None

    def other_way(load: Load) -> Load:
        if isinstance(load, JointForce):
            return replace(load, force=-load.force)
        assert isinstance(load, Spread)
        return replace(load, first=-load.first, last=-load.last) if load.direction == 0.0 else load

    wind = LoadCase("wind_left", tuple(other_way(load) for load in frame.cases["wind"].loads))
    frame = replace(frame, cases={**frame.cases, "wind_left": wind})
    factors = {"dead": 1.35, "wind": 1.5, "wind_left": 1.5}
    sideways = all(getattr(load, "direction", 0.0) == 0.0 for load in wind.loads)
    return Slipped(with_combination(frame, "storm both", factors), "storm both") if sideways else None


@slip("uplift_combination")
def no_combination_of_least_load_with_uplift(frame: Frame) -> Slipped | None:
    if frame.combinations.get("lift") is None:
        return None
    return Slipped(with_combination(frame, "lift", {"dead": 1.35, "wind": 1.5}), "wind")


@slip("uplift_combination", "note")
def no_combination_of_least_load_with_sway(frame: Frame) -> Slipped | None:
    if "least" not in frame.combinations or "wind" not in frame.cases:
        return None
    return Slipped(with_combination(frame, "least", {"dead": 1.35, "wind": 1.5}), "wind")


@slip("light_factors")
def a_factor_without_its_decimal_point(frame: Frame) -> Slipped | None:
    name, c = next(iter(frame.combinations.items()))
    first = next(iter(c.factors))
    return Slipped(with_combination(frame, name, {**c.factors, first: 10 * c.factors[first]}), name)


# --- behaviour


@slip("sway")
def columns_far_too_soft(frame: Frame) -> Slipped | None:
    """Feet pinned and columns of a thirtieth of their I, where a case pushes sideways."""
    if "wind" not in frame.cases or any(m.section == "brace" for m in frame.members.values()):
        return None
    column = posts(frame)[0]
    s = frame.sections[column.section]
    frame = with_section(frame, s.name, I=s.I / 30, A=(s.A or 0.0) / 8, depth=None)
    for name in column_feet(frame):
        frame = with_support(frame, name, rotation=FREE)
    return Slipped(frame, max(column.joint_from, column.joint_to, key=lambda n: frame.joints[n].y))


@slip("deflection")
def a_beam_far_too_shallow(frame: Frame) -> Slipped | None:
    """Fixed at both ends it would still deflect by a hundredth of its span under dead load."""
    on = {m.name for m in beams(frame)}
    loads = spreads(frame, "dead", on.__contains__)
    if not loads:
        return None
    k = frame.member_index[loads[0].member]
    t, member = frame.member_table, frame.members[loads[0].member]
    inertia = float(100 * abs(loads[0].first) * t.length[k] ** 3 / (384 * t.E[k]))
    frame = replace(frame, analysis=replace(frame.analysis, shear="rigid"))
    return Slipped(with_section(frame, member.section, I=inertia, depth=None), member.name)


@slip("uplift")
def nothing_to_hold_a_foot_down(frame: Frame) -> Slipped | None:
    """Suction over the first column of twice the dead load."""
    feet = column_feet(frame)
    if not feet:
        return None
    column = at_joint(frame, feet[0])[0]
    top = column.joint_to if column.joint_from == feet[0] else column.joint_from
    down = -float(load_total(frame, load_table(frame, "dead"))[1])
    suction = LoadCase("suction", (JointForce(0, top, 2 * down, 90.0),))
    frame = replace(frame, cases={**frame.cases, "suction": suction})
    return Slipped(with_combination(frame, "least suction", {"dead": 1.0, "suction": 1.5}), feet[0])


@slip("thrust", "note")
def feet_that_thrust_and_nothing_ties_them(frame: Frame) -> Slipped | None:
    feet = column_feet(frame)
    if len(feet) != 2 or all(frame.supports[n].rotation == FREE for n in feet):
        return None
    for name in feet:
        frame = with_support(frame, name, rotation=FREE)
    return Slipped(frame, feet[0])


@slip("locked_temperature")
def temperature_between_held_supports(frame: Frame) -> Slipped | None:
    run = beams(frame)
    if any(frame.joints[j].y != 0 for m in run for j in (m.joint_from, m.joint_to)) or len(posts(frame)):
        return None
    for name in frame.supports:
        frame = with_support(frame, name, x=HELD)
    warm = LoadCase("summer", tuple(Temperature(0, m.name, mean=20.0) for m in run))
    return Slipped(replace(frame, cases={**frame.cases, "summer": warm}), run[0].name)


@slip("second_order")
def loads_close_to_the_critical(frame: Frame) -> Slipped | None:
    return _towards_critical(frame, 3.0)


@slip("second_order", "serious")
def loads_past_the_critical(frame: Frame) -> Slipped | None:
    return _towards_critical(frame, 0.8)


def _towards_critical(frame: Frame, factor: float) -> Slipped | None:
    """The first combination scaled until its critical load factor is `factor`."""
    from crosscheck.check import critical_factors

    name, c = next(iter(frame.combinations.items()))
    have = critical_factors(frame, [name])[name]
    if not 0 < have < 1e3:
        return None
    return Slipped(with_combination(frame, name, {n: f * have / factor for n, f in c.factors.items()}), name)


def every_slip() -> Iterator[tuple[str, Slip, Slipped]]:
    """Every slip on every sound frame that it applies to."""
    for name in SOUND:
        for kind in SLIPS:
            made = kind.make(sound(name))
            if made is not None:
                yield name, kind, made
