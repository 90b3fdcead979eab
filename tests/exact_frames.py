"""Small frames whose lengths and cosines are rational, for the exact solver: every feature of first order.

Each is written once and taken axially elastic and axially rigid, except where an axially rigid frame could not follow its
loads. Sloping members have sides of 3, 4 and 5, or 5, 12 and 13, or 8, 15 and 17.
"""

from __future__ import annotations

import math

from crosscheck.frame.model import Frame
from crosscheck.frame.reader import read_frame_text

HEAD = """
title = "{title}"
units = "kN m"
[materials.steel]
E = 210e6
nu = 0.3
alpha = 12e-6
density = "78.5 kN/m^3"
[materials.timber]
E = 11e6
G = 0.69e6
alpha = 5e-6
density = "4.2 kN/m^3"
[sections.post]
I = 8.36e-5
A = 5.38e-3
shear_area = 2.5e-3
depth = 0.3
[sections.beam]
I = 2.31e-4
A = 8.45e-3
shear_area = 4.0e-3
depth = 0.4
[analysis]
axial = "{axial}"
shear = "{shear}"
"""
A345 = repr(math.degrees(math.atan2(3, 4)))
A43 = repr(math.degrees(math.atan2(4, 3)))

PORTAL = """
[joints]
A = [0, 0]
B = [0, 4]
C = [6, 4]
D = [6, 0]
[members]
"A-B" = { section = "post", material = "steel" }
"B-C" = { section = "beam", material = "steel" }
"D-C" = { section = "post", material = "steel" }
"""
GABLE = """
[joints]
A = [0, 0]
B = [0, 4]
C = [4, 7]
D = [8, 4]
E = [8, 0]
[members]
"A-B" = { section = "post", material = "steel" }
"B-C" = { section = "beam", material = "steel" }
"C-D" = { section = "beam", material = "steel" }
"E-D" = { section = "post", material = "steel" }
"""
TWO_STOREYS = """
[joints]
A = [0, 0]
B = [5, 0]
C = [0, 3.5]
D = [5, 3.5]
E = [0, 6.5]
F = [5, 6.5]
[members]
"A-C" = { section = "post", material = "steel" }
"B-D" = { section = "post", material = "steel" }
"C-D" = { section = "beam", material = "steel" }
"C-E" = { section = "post", material = "steel" }
"D-F" = { section = "post", material = "steel" }
"E-F" = { section = "beam", material = "steel" }
"""
FEET = '[supports]\nA = "fixed"\nD = "fixed"\n'

FRAMES: dict[str, tuple[str, str]] = {
    "cantilever": ("both", """
[joints]
A = [0, 0]
B = [4, 3]
[members]
"A-B" = { section = "beam", material = "steel" }
[supports]
A = "fixed"
[loads.q]
apply = [{ member = "A-B", uniform = 7, direction = "down" }, { joint = "B", couple = 11 }]
"""),
    "propped beam": ("both", """
[joints]
A = [0, 0]
B = [7, 0]
[members]
"A-B" = { section = "beam", material = "steel" }
[supports]
A = "fixed"
B = "roller"
[loads.q]
apply = [{ member = "A-B", force = 30, at = 2.5, direction = "down" }, { member = "A-B", couple = 9, at = 4 }]
"""),
    "three spans with settlement": ("both", """
[joints]
A = [0, 0]
B = [4, 0]
C = [9.5, 0]
D = [12, 0]
[members]
"A-B" = { section = "beam", material = "steel" }
"B-C" = { section = "post", material = "steel" }
"C-D" = { section = "beam", material = "timber" }
[supports]
A = "pinned"
B = "roller"
C = "roller"
D = { x = "free", y = "held", rotation = 4500 }
[loads.q]
apply = [{ member = "B-C", varying = [3, 12], direction = "down", start = 1, end = 4.5 }]
[loads.s]
apply = [{ joint = "C", settlement = { down = 0.012 } }]
[combinations]
both = { q = 1.35, s = -0.5 }
"""),
    "portal": ("both", PORTAL + FEET + """
[loads.q]
apply = [{ member = "B-C", uniform = 12, direction = "down" }, { joint = "B", force = 15, direction = "right" }]
"""),
    "portal on pins": ("both", PORTAL + '[supports]\nA = "pinned"\nD = "pinned"\n' + """
[loads.q]
apply = [{ member = "A-B", varying = [4, 1], direction = "right" }, { self_weight = 1 }]
"""),
    "portal with a hinge": ("both", PORTAL.replace(
        '"beam", material = "steel" }', '"beam", material = "steel", hinge = "to" }')
                            + FEET + """
[loads.q]
apply = [{ member = "B-C", couple = 20, at = 6 }, { member = "D-C", force = 8, at = 1, direction = "left" }]
"""),
    "semi-rigid portal": ("both", PORTAL.replace(
        '"beam", material = "steel" }', '"beam", material = "steel", spring_from = 9000, spring_to = 2500 }')
                          + FEET + """
[loads.q]
apply = [{ member = "B-C", uniform = 12, direction = "down", start = 1.5, end = 5 }]
"""),
    "portal with rigid zones": ("both", PORTAL.replace(
        '"beam", material = "steel" }', '"beam", material = "steel", rigid_from = 0.5, rigid_to = 0.25 }')
                                + FEET + """
[loads.q]
apply = [
  { member = "B-C", uniform = 12, direction = "down" },
  { member = "B-C", force = 5, at = 0.25, direction = "down" },
]
"""),
    "zone and hinge at one end": ("both", PORTAL.replace(
        '"beam", material = "steel" }', '"beam", material = "steel", rigid_from = 0.5, hinge = "from" }')
                                  + FEET + """
[loads.q]
apply = [{ member = "B-C", uniform = 12, direction = "down" }, { member = "B-C", couple = 3, at = 0.5 }]
"""),
    "portal on springs": ("both", PORTAL + """
[supports]
A = { x = "held", y = 20000, rotation = 4500 }
D = { x = 8000, y = "held", rotation = "free" }
[loads.q]
apply = [{ member = "B-C", uniform = 12, direction = "down" }, { joint = "D", settlement = { x = 0.004 } }]
"""),
    "portal with turned supports": ("both", PORTAL + f"""
[supports]
A = "fixed"
D = {{ x = "free", y = "held", rotation = "free", angle = {A345} }}
[loads.q]
apply = [{{ member = "B-C", uniform = 12, direction = "down" }}, {{ joint = "C", force = 9, direction = {A43} }}]
"""),
    "turned spring": ("both", PORTAL + f"""
[supports]
A = "pinned"
D = {{ x = 3000, y = "held", rotation = 700, angle = {A345} }}
[loads.q]
apply = [{{ joint = "C", force = 9, direction = -{A345} }}, {{ joint = "D", settlement = {{ x = 0.01 }} }}]
"""),
    "warm portal": ("elastic", PORTAL + FEET + """
[loads.t]
apply = [{ member = "B-C", temperature = 30, difference = 12 }, { member = "A-B", misfit = 0.006 }]
"""),
    "portal warmer inside": ("both", PORTAL + FEET + """
[loads.t]
apply = [{ members = ["B-C", "D-C"], difference = 15 }]
"""),
    "gable": ("both", GABLE + '[supports]\nA = "pinned"\nE = "fixed"\n' + """
[loads.snow]
apply = [{ members = ["B-C", "C-D"], uniform = 4, direction = "down", per = "projection" }]
[loads.wind]
apply = [{ member = "B-C", uniform = 2, direction = "across" }, { member = "A-B", uniform = 3, direction = "right" }]
[combinations]
both = { snow = 1.5, wind = 0.9 }
"""),
    "gable with a tie": ("elastic", GABLE + '"B-D" = { section = "post", material = "timber", hinge = "both" }\n'
                         + '[supports]\nA = "pinned"\nE = "pinned"\n' + """
[loads.q]
apply = [
  { member = "C-D", force = 25, at = "40%", direction = "down" },
  { member = "B-D", uniform = 1, direction = "down" },
]
"""),
    "gable, loads along and across": ("both", GABLE + '[supports]\nA = "fixed"\nE = "fixed"\n' + """
[loads.q]
apply = [
  { member = "B-C", uniform = 5, direction = "along", start = 1, end = 4 },
  { member = "C-D", varying = [-3, 6], direction = "across" },
]
"""),
    "two storeys": ("both", TWO_STOREYS + '[supports]\nA = "fixed"\nB = "fixed"\n' + """
[loads.q]
apply = [{ members = ["C-D", "E-F"], uniform = 10, direction = "down" }, { self_weight = 1.0 }]
[loads.w]
apply = [{ joint = "C", force = 12, direction = "right" }, { joint = "E", force = 6, direction = "right" }]
"""),
    "braced two storeys": ("both", TWO_STOREYS.replace("[0, 3.5]", "[0, 3.75]").replace("[5, 3.5]", "[5, 3.75]")
                           + '"A-D" = { section = "post", material = "steel", hinge = "both" }\n'
                           + '[supports]\nA = "fixed"\nB = "pinned"\n' + """
[loads.w]
apply = [{ joint = "C", force = 12, direction = "right" }, { joint = "E", force = 6, direction = "right" }]
"""),
    "shear-flexible portal": ("both shear", PORTAL + FEET + """
[loads.q]
apply = [{ member = "B-C", uniform = 12, direction = "down" }, { member = "B-C", couple = 7, at = 1.5 }]
"""),
    "shear-flexible zones and springs": ("both shear", PORTAL.replace(
        '"beam", material = "steel" }', '"beam", material = "timber", rigid_from = 0.5, spring_to = 3000 }')
                                         + FEET + """
[loads.q]
apply = [{ member = "B-C", varying = [12, 2], direction = "down" }, { joint = "D", settlement = { rotation = 0.01 } }]
"""),
    "leaning frame": ("both", """
[joints]
A = [0, 0]
B = [3, 4]
C = [11, 10]
D = [16, -2]
[members]
"A-B" = { section = "post", material = "steel" }
"C-B" = { section = "beam", material = "steel" }
"C-D" = { section = "post", material = "timber", spring_from = 800 }
[supports]
A = "fixed"
D = "pinned"
[loads.q]
apply = [
  { member = "C-B", uniform = 4, direction = "down", per = "projection" },
  { member = "C-D", force = 6, at = 6.5, direction = "left" },
  { joint = "B", couple = -8 },
]
"""),
    "truss of triangles": ("elastic", """
[joints]
A = [0, 0]
B = [8, 0]
C = [16, 0]
D = [8, 6]
[members]
"A-B" = { section = "post", material = "steel", hinge = "both" }
"B-C" = { section = "post", material = "steel", hinge = "both" }
"A-D" = { section = "beam", material = "steel", hinge = "both" }
"B-D" = { section = "post", material = "steel", hinge = "both" }
"C-D" = { section = "beam", material = "steel", hinge = "both" }
[supports]
A = "pinned"
C = "pinned"
[loads.q]
apply = [
  { joint = "B", force = 40, direction = "down" },
  { member = "A-D", temperature = 20 },
  { member = "B-D", misfit = 0.002 },
]
"""),
    "king post": ("both", """
[joints]
A = [0, 0]
B = [7.5, 0]
C = [15, 0]
D = [7.5, -4]
[members]
"A-B" = { section = "beam", material = "steel" }
"B-C" = { section = "beam", material = "steel" }
"B-D" = { section = "post", material = "steel", hinge = "both" }
"A-D" = { section = "post", material = "steel", hinge = "both" }
"D-C" = { section = "post", material = "steel", hinge = "both" }
[supports]
A = "pinned"
C = "roller"
[loads.q]
apply = [
  { members = ["A-B", "B-C"], uniform = 6, direction = "down" },
  { member = "B-C", force = 10, at = 3, direction = "down" },
]
"""),
}  # fmt: skip
"""Name to (idealisations, the rest of the file)."""


def _made(title: str, axial: str, shear: str, rest: str) -> Frame:
    return read_frame_text(HEAD.format(title=title, axial=axial, shear=shear) + rest, f"{title}.toml")


def exact_frames() -> dict[str, Frame]:
    """Every frame in every idealisation that it is for."""
    made = {}
    for title, (kinds, rest) in FRAMES.items():
        shear = "elastic" if "shear" in kinds else "rigid"
        for axial in ("elastic", "rigid") if kinds.startswith("both") else (kinds,):
            made[f"{title}, axially {axial}"] = _made(title, axial, shear, rest)
    return made
