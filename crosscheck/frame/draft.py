"""Frame files to start from: commented, sound, and read by the reader as they stand.

The figures in them are there to be replaced; they are round numbers of a usual size in metric or customary units.
"""

from __future__ import annotations

import json
import re
from collections.abc import Sequence
from dataclasses import dataclass, replace

from crosscheck.frame.reader import read_frame_text
from crosscheck.frame.units import LENGTH, UnitError, convert, frame_units, parse_unit
from crosscheck.problems import Problem, UnusableInput

FEET = ("fixed", "pinned")
REMARKS = 38
"""Column of the remarks in a draft."""


@dataclass(frozen=True, slots=True)
class _Figures:
    """Figures of one system of units; lengths are plain numbers of `length`, the rest carry their units."""

    length: str
    eaves: float
    ridge: float
    span: float
    E: str
    density: str
    post: tuple[str, str, str]
    girder: tuple[str, str, str]
    dead: str
    imposed: str
    wind: str
    sway: str


_METRIC = _Figures(
    "m", 4.2, 5.0, 6.5, "210 GPa", "7850 kg/m^3",
    ("8360 cm^4", "53.8 cm^2", "300 mm"), ("23130 cm^4", "84.5 cm^2", "400 mm"),
    "8.5 kN/m", "12 kN/m", "6 kN", "1.4 kN/m",
)  # fmt: skip
_CUSTOMARY = _Figures(
    "ft", 14, 16.5, 21, "29000 ksi", "490 lb/ft^3",
    ("340 in^4", "10.3 in^2", "14 in"), ("510 in^4", "11.8 in^2", "18 in"),
    "0.6 kip/ft", "0.8 kip/ft", "1.5 kip", "0.1 kip/ft",
)  # fmt: skip

_HEAD = """\
title = {title}
units = {units}
# Bare numbers are in these units. Any number may be a text with a unit of its own instead, such as "2.5 m" or "12 kN".

[materials.steel]
E = "{f.E}"
nu = 0.3  # for shear = "elastic" below; or give G
alpha = "12e-6 /K"  # for temperatures
density = "{f.density}"  # for self weight; always with its unit

[sections.post]
I = "{f.post[0]}"
A = "{f.post[1]}"  # for axial = "elastic" and for self weight
depth = "{f.post[2]}"  # for a temperature difference

[sections.girder]
I = "{f.girder[0]}"
A = "{f.girder[1]}"
depth = "{f.girder[2]}"
"""

_BLANK = """
[joints]  # x to the right, y up
A = [0, 0]
B = [0, {eaves}]
C = [{span}, {ridge}]
D = [{span}, 0]

[members]  # a key "A-B" names its own joints; any other key gives from and to
"A-B" = {{ section = "post", material = "steel" }}
rafter = {{ from = "B", to = "C", section = "girder", material = "steel" }}
"D-C" = {{ section = "post", material = "steel" }}
# Also: hinge = "from", "to" or "both"; spring_from, spring_to (moment per radian); rigid_from, rigid_to (lengths).

[supports]  # "fixed", "pinned", "roller" (holds y), or a table:
A = "fixed"  # {{ x = "held", y = "held", rotation = "4500 kN m/rad", angle = 0 }}
D = "pinned"

[loads.dead]
apply = [
  {{ self_weight = 1.0 }},
  {{ member = "rafter", uniform = "{f.dead}", direction = "down" }},
]

[loads.imposed]
apply = [{{ member = "rafter", uniform = "{f.imposed}", direction = "down", per = "projection" }}]

[loads.wind]
apply = [
  {{ joint = "B", force = "{f.wind}", direction = "right" }},
  {{ member = "A-B", uniform = "{f.sway}", direction = "right" }},
]
# On members also: force or couple with at = "2.5 m" or "40%"; varying = [from, to]; temperature; difference; misfit.
# On joints also: couple (clockwise); settlement = {{ down = "10 mm" }}. Directions also: an angle; across, along.
"""

_GRID = """
[grid]  # gridlines A, B, C ..., levels 0, 1, 2 ...: joints "A0", "B2", members "A0-A1", "A1-B1"
bays = {bays}
storeys = {storeys}
columns = [{{ section = "post", material = "steel" }}]  # more entries for some: {{ storeys = 2, section = "..." }}
beams = [{{ section = "girder", material = "steel"{hinge} }}]  # likewise, by bays = 1 or levels = [1, 2]
feet = "{feet}"
# omit = ["B1-C1"]  # members that are not there; a joint takes its members along
# Tables [joints], [members] and [supports] add to the grid and override it, name by name.

[loads.dead]
apply = [
  {{ self_weight = 1.0 }},
  {{ members = "beams", uniform = "{f.dead}", direction = "down" }},
]

[loads.imposed]
apply = [{{ members = "beams", uniform = "{f.imposed}", direction = "down" }}]

[loads.wind]
apply = [{{ members = "columns line A", uniform = "{f.sway}", direction = "right" }}]
"""

_TAIL = """
[combinations]
gravity = { dead = 1.35, imposed = 1.5 }
sway = { dead = 1.35, wind = 1.5 }

[analysis]  # how members deform; these are the defaults for sections that have A
axial = "elastic"  # or "rigid": members keep their length
shear = "rigid"  # or "elastic": sections then need shear_area
tolerance = "1%"  # for results to be verified
"""


def draft_blank(units: str = "kN m", title: str = "A frame to start from") -> str:
    """A small portal with every table of the grammar, to be overwritten. Raises UnusableInput for unknown units."""
    figures = _figures(units)
    lengths = {key: _length(getattr(figures, key), figures, units) for key in ("eaves", "ridge", "span")}
    return _checked(_head(units, title, figures) + _BLANK.format(f=figures, **lengths) + _TAIL)


def draft_grid(
    bays: Sequence[str],
    storeys: Sequence[str],
    units: str = "kN m",
    feet: str = "fixed",
    hinged_beams: bool = False,
    title: str = "A regular frame to start from",
) -> str:
    """A regular grid: `bays` from the left and `storeys` from the ground up, each "6", "6 m" or "3 x 6 m".

    Raises UnusableInput for what cannot be read; its problems name the option.
    """
    figures = _figures(units)
    if feet not in FEET:
        raise UnusableInput([Problem("", None, "feet", f'"{feet}" is not known', f"give {' or '.join(FEET)}")])
    if feet == "pinned" and hinged_beams:
        says = "columns on pinned feet with hinged beams can sway"
        raise UnusableInput([Problem("", None, "feet", says, "give fixed feet, or beams that are not hinged")])
    grid = _GRID.format(
        f=figures,
        bays=_spaces(bays),
        storeys=_spaces(storeys),
        feet=feet,
        hinge=', hinge = "both"' if hinged_beams else "",
    )
    return _checked(_head(units, title, figures) + grid + _TAIL)


def _figures(units: str) -> _Figures:
    try:
        length = frame_units(units).length
    except UnitError as error:
        raise UnusableInput([Problem("", None, "units", str(error), 'give "kN m", "N mm", "kip ft", say')]) from None
    return _CUSTOMARY if length in ("in", "ft", "yd") else _METRIC


def _length(value: float, figures: _Figures, units: str) -> str:
    """A length of the figures in the frame's own unit, as a bare number."""
    target = parse_unit(frame_units(units).length)
    assert target.dimension == LENGTH
    return f"{convert(value, parse_unit(figures.length), target):g}"


def _head(units: str, title: str, figures: _Figures) -> str:
    return _HEAD.format(title=_quoted(title), units=_quoted(units), f=figures)


def _quoted(text: str) -> str:
    """Text as TOML writes it."""
    return json.dumps(text, ensure_ascii=False).replace("\x7f", "\\u007f")


def _spaces(values: Sequence[str]) -> str:
    """Bays or storeys as a TOML list: bare numbers as they are, all else in quotes."""
    texts = [value.strip() for value in values]
    return "[" + ", ".join(t if re.fullmatch(r"[1-9][0-9]*(\.[0-9]+)?", t) else _quoted(t) for t in texts) + "]"


def _checked(text: str) -> str:
    """The text, if it reads; its problems without lines, since nobody has seen the text yet."""
    text = _aligned(text)
    try:
        read_frame_text(text)
    except UnusableInput as error:
        raise UnusableInput(replace(p, line=None, key=p.key.removeprefix("grid.")) for p in error.problems) from None
    return text


def _aligned(text: str) -> str:
    """Remarks behind values, where there is room, begin in one column."""
    return re.sub(r"^(?!title )(\S.*?) {2}# ", lambda m: f"{m[1]:<{REMARKS - 2}}  # ", text, flags=re.MULTILINE)
