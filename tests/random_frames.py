"""Random frame files that together use every row of the grammar, the same for the same seed.

Each feature is drawn on its own with the probability in FEATURES; a frame that has it uses it in some members, supports
or loads. What is drawn is never taken back for any other reason than these two, which the tests' own solver decides:
a frame that can move without resistance is drawn again (with the same features), and a load that nothing resists (a
couple on an all-hinged joint) or that an axially rigid frame cannot follow is drawn for another place or left out.

Numbers are made in kN and m and written in the frame's own units or with a unit of their own.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from functools import lru_cache
from random import Random

from crosscheck.frame.model import HELD, Frame, Member, PointCouple, PointForce, Spread, Temperature
from crosscheck.frame.reader import read_frame_text
from tests.truth import SURE, Truth

FEATURES = {
    # idealisation
    "axial rigid": 0.5,
    "axial by default": 0.3,
    "shear elastic": 0.2,
    # members
    "hinges": 0.3,
    "semi-rigid ends": 0.25,
    "rigid zones": 0.2,
    "members reversed": 0.5,
    "members named": 0.4,
    # supports
    "support tables": 0.5,
    "support springs": 0.25,
    "turned supports": 0.35,
    "support above": 0.15,
    "loose joint": 0.06,
    # loads
    "joint force": 0.5,
    "joint couple": 0.3,
    "settlement": 0.15,
    "point force": 0.5,
    "point couple": 0.3,
    "couple at an end": 0.25,
    "uniform": 0.7,
    "varying": 0.4,
    "partial": 0.4,
    "projected": 0.25,
    "across": 0.3,
    "along": 0.25,
    "at an angle": 0.3,
    "on a zone or end": 0.45,
    "mean temperature": 0.08,
    "temperature difference": 0.08,
    "misfit": 0.08,
    "self weight": 0.25,
    "several at once": 0.3,
    # cases
    "several cases": 0.5,
    "combinations": 0.5,
    "negative factors": 0.5,
    "expected": 0.1,
    # writing
    "unit strings": 0.5,
    "percent distances": 0.4,
    "quoted names": 0.2,
}
"""Probability that a frame has a feature, each drawn independently of the others."""

UNITS = {
    "kN m": (1.0, 1.0),
    "N mm": (1e-3, 1e-3),
    "N m": (1e-3, 1.0),
    "kip ft": (4.4482216152605, 0.3048),
    "kip in": (4.4482216152605, 0.0254),
    "lbf in": (4.4482216152605e-3, 0.0254),
}
"""Frame units with equal chance: kN in one force, m in one length."""

KIP, IN, FT = 4.4482216152605, 0.0254, 0.3048
WRITINGS: dict[str, dict[str, float]] = {
    "length": {"m": 1.0, "mm": 1e-3, "cm": 1e-2, "ft": FT, "in": IN},
    "area": {"cm^2": 1e-4, "mm2": 1e-6, "in^2": IN**2, "m²": 1.0},
    "inertia": {"cm^4": 1e-8, "mm4": 1e-12, "in^4": IN**4},
    "stress": {"GPa": 1e6, "MPa": 1e3, "N/mm^2": 1e3, "ksi": KIP / IN**2, "kN/m^2": 1.0},
    "force": {"kN": 1.0, "N": 1e-3, "kip": KIP, "lbf": KIP * 1e-3},
    "moment": {"kN m": 1.0, "kNm": 1.0, "N mm": 1e-6, "kip ft": KIP * FT},
    "line": {"kN/m": 1.0, "N/mm": 1.0, "kip/ft": KIP / FT, "lbf/ft": KIP * 1e-3 / FT},
    "spring": {"kN/m": 1.0, "kN/mm": 1e3, "kip/in": KIP / IN},
    "turn spring": {"kN m/rad": 1.0, "kNm/rad": 1.0, "kip ft/rad": KIP * FT},
    "rotation": {"rad": 1.0, "mrad": 1e-3, "deg": math.pi / 180.0},
}
"""Writings of a quantity with their size in kN and m."""
POWERS = {
    "length": (0, 1), "area": (0, 2), "inertia": (0, 4), "stress": (1, -2), "force": (1, 0), "moment": (1, 1),
    "line": (1, -1), "spring": (1, -1), "turn spring": (1, 1), "rotation": (0, 0),
}  # fmt: skip
"""Powers of force and length of a bare number."""

Place = tuple[float, float]


@dataclass
class Geometry:
    """joints: coordinates in m; members: index pairs, with True for one hinged at both ends by its kind; feet: joints
    on supports; beam: feet take one pin and rollers."""

    joints: list[Place]
    members: list[tuple[int, int, bool]]
    feet: list[int]
    beam: bool = False


@dataclass
class Sketch:
    """A frame being drawn: its features, random numbers, and lines of the file."""

    random: Random
    features: frozenset[str]
    units: str
    geometry: Geometry
    lines: list[str] = field(default_factory=list)
    hinged: set[tuple[int, str]] = field(default_factory=set)
    zones: dict[int, tuple[float, float]] = field(default_factory=dict)
    restrained: dict[int, tuple[bool, bool, bool, bool]] = field(default_factory=dict)
    keys: list[str] = field(default_factory=list)
    names: list[str] = field(default_factory=list)
    bending: float = 1.0

    def has(self, feature: str) -> bool:
        return feature in self.features

    def length(self, m: int) -> float:
        i, j, _ = self.geometry.members[m]
        return math.dist(self.geometry.joints[i], self.geometry.joints[j])

    def write(self, value: float, kind: str) -> str:
        """A value in kN and m as the file says it."""
        if self.has("unit strings") and self.random.random() < 0.5:
            unit, size = self.random.choice(list(WRITINGS[kind].items()))
            return f'"{value / size!r} {unit}"'
        force, length = UNITS[self.units]
        p, q = POWERS[kind]
        return repr(value / (force**p * length**q))

    def distance(self, x: float, m: int) -> str:
        if self.has("percent distances") and self.random.random() < 0.6:
            return f'"{round(100.0 * x / self.length(m), 3)}%"'
        return self.write(x, "length")


# --- geometry --------------------------------------------------------------------------------------


def _grid(r: Random) -> Geometry:
    """Bays and storeys, square or skewed, the beams of one bay sometimes missing at one level."""
    bays, storeys = r.randint(1, 3), r.randint(1, 3)
    xs = [0.0]
    for _ in range(bays):
        xs.append(xs[-1] + r.uniform(3.0, 9.0))
    ys = [0.0]
    for _ in range(storeys):
        ys.append(ys[-1] + r.uniform(2.8, 5.0))
    lean, slope = (r.uniform(-0.15, 0.15), r.uniform(-0.1, 0.1)) if r.random() < 0.4 else (0.0, 0.0)
    jitter = r.uniform(0.1, 0.5) if r.random() < 0.3 else 0.0
    joints = [
        (x + lean * y + r.uniform(-jitter, jitter), y + slope * x + r.uniform(-jitter, jitter)) for y in ys for x in xs
    ]
    wide = bays + 1
    columns = [(k, k + wide, False) for k in range(wide * storeys)]
    beams = [(k, k + 1, False) for k in range(wide, wide * (storeys + 1)) if (k + 1) % wide]
    return Geometry(joints, columns + beams, list(range(wide)))


def _portal(r: Random) -> Geometry:
    """One bay with legs of unequal length and slope, sometimes with a brace or a bracket."""
    span, left, right = r.uniform(4.0, 12.0), r.uniform(3.0, 6.0), r.uniform(3.0, 6.0)
    joints = [(0.0, 0.0), (r.uniform(-0.8, 0.8), left), (span + r.uniform(-0.8, 0.8), right), (span, r.uniform(-1, 1))]
    members = [(0, 1, False), (1, 2, False), (2, 3, False)]
    if r.random() < 0.3:
        members.append((0, 2, True))
    if r.random() < 0.3:
        joints.append((joints[2][0] + r.uniform(1.0, 2.5), joints[2][1] + r.uniform(-0.3, 0.3)))
        members.append((2, 4, False))
    return Geometry(joints, members, [0, 3])


def _gable(r: Random) -> Geometry:
    """A pitched portal, sometimes of two bays."""
    joints, members, feet = [(0.0, 0.0), (0.0, r.uniform(3.5, 6.0))], [(0, 1, False)], [0]
    for _ in range(r.randint(1, 2)):
        x, eaves, span = joints[-1][0], len(joints) - 1, r.uniform(8.0, 20.0)
        height = joints[1][1]
        joints += [(x + span / 2.0, height + r.uniform(1.0, 3.0)), (x + span, 0.0), (x + span, height)]
        members += [(eaves, eaves + 1, False), (eaves + 1, eaves + 3, False), (eaves + 2, eaves + 3, False)]
        feet.append(eaves + 2)
    return Geometry(joints, members, feet)


def _beam(r: Random) -> Geometry:
    """Two to five spans, level or falling, sometimes with an overhang."""
    slope, x = (r.uniform(-0.2, 0.2) if r.random() < 0.3 else 0.0), [0.0]
    for _ in range(r.randint(2, 5)):
        x.append(x[-1] + r.uniform(2.5, 9.0))
    joints = [(a, slope * a) for a in x]
    feet = list(range(len(x) - 1)) if r.random() < 0.25 else list(range(len(x)))
    return Geometry(joints, [(k, k + 1, False) for k in range(len(x) - 1)], feet, beam=True)


def _truss(r: Random) -> Geometry:
    """Panels on two supports; the webs are hinged at both ends, the chords run through or not."""
    panels, panel, height = r.randint(2, 4), r.uniform(2.0, 4.0), r.uniform(1.5, 3.5)
    low = [(k * panel, 0.0) for k in range(panels + 1)]
    high = [((k + 0.5) * panel, height + r.uniform(-0.2, 0.2)) for k in range(panels)]
    pinned, top = r.random() < 0.4, panels + 1
    members = [(k, k + 1, pinned) for k in range(panels)] + [(top + k, top + k + 1, pinned) for k in range(panels - 1)]
    members += [(k, top + k, True) for k in range(panels)] + [(top + k, k + 1, True) for k in range(panels)]
    return Geometry(low + high, members, [0, panels], beam=True)


def _triangles(r: Random) -> Geometry:
    """Triangles set one on another's side at random; some sides hinged."""
    joints: list[Place] = [(0.0, 0.0), (r.uniform(3.0, 5.0), r.uniform(-0.5, 0.5))]
    sides, members = [(0, 1)], [(0, 1, False)]
    for _ in range(r.randint(2, 6)):
        i, j = sides.pop(r.randrange(len(sides)))
        (xi, yi), (xj, yj) = joints[i], joints[j]
        share, rise = r.uniform(0.35, 0.65), r.uniform(0.6, 1.0)
        apex = (xi + share * (xj - xi) - rise * (yj - yi), yi + share * (yj - yi) + rise * (xj - xi))
        joints.append(apex)
        k = len(joints) - 1
        sides += [(i, k), (k, j)]
        members += [(i, k, r.random() < 0.3), (k, j, r.random() < 0.3)]
    return Geometry(joints, members, [0, 1])


def _trestle(r: Random) -> Geometry:
    """Raking legs under a deck, with a rail between them."""
    height, half = r.uniform(4.0, 8.0), r.uniform(1.5, 3.0)
    joints = [(-half, 0.0), (half, 0.0), (-half / 2.0, height / 2.0), (half / 2.0, height / 2.0)]
    joints += [(-half / 3.0, height), (half / 3.0, height), (half / 3.0 + r.uniform(1.0, 3.0), height)]
    members = [(0, 2, False), (1, 3, False), (2, 3, r.random() < 0.5), (2, 4, False), (3, 5, False), (4, 5, False)]
    members += [(5, 6, False)]
    return Geometry(joints, members, [0, 1])


GEOMETRIES: tuple[Callable[[Random], Geometry], ...] = (_grid, _portal, _gable, _beam, _truss, _triangles, _trestle)
"""Drawn with equal chance."""


# --- the file without its loads ---------------------------------------------------------------------


def _log_uniform(r: Random, low: float, high: float) -> float:
    return math.exp(r.uniform(math.log(low), math.log(high)))


def _head(s: Sketch, seed: int) -> None:
    r = s.random
    s.lines += [f'title = "random frame {seed}"', f'units = "{s.units}"', "", "[analysis]"]
    if not s.has("axial by default"):
        s.lines.append(f'axial = "{"rigid" if s.has("axial rigid") else "elastic"}"')
    if s.has("shear elastic") or r.random() < 0.3:
        s.lines.append(f'shear = "{"elastic" if s.has("shear elastic") else "rigid"}"')
    if r.random() < 0.2:
        s.lines.append("order = 1")
    if r.random() < 0.2:
        s.lines.append(r.choice(['tolerance = "2%"', 'tolerance = "0.5%"']))


def _materials(s: Sketch, count: int) -> list[float]:
    """Material tables; returns E."""
    r, moduli = s.random, []
    for k in range(count):
        E = r.uniform(25e6, 215e6)
        moduli.append(E)
        s.lines += ["", f"[materials.mat{k}]", f"E = {s.write(E, 'stress')}"]
        if r.random() < 0.5:
            s.lines.append(f"nu = {r.uniform(0.15, 0.35)!r}")
        else:
            s.lines.append(f"G = {s.write(E / r.uniform(2.3, 2.7), 'stress')}")
        alpha = r.uniform(9e-6, 13e-6)
        with_unit = s.has("unit strings") and r.random() < 0.5
        s.lines.append(f'alpha = "{alpha!r} /K"' if with_unit else f"alpha = {alpha!r}")
        s.lines.append(
            f'density = "{r.uniform(2000.0, 8000.0)!r} kg/m^3"' if r.random() < 0.5
            else f'density = "{r.uniform(20.0, 80.0)!r} kN/m^3"'
        )  # fmt: skip
    return moduli


def _sections(s: Sketch, used: list[tuple[int, int]], count: int, moduli: list[float]) -> None:
    """Section tables. used: section and material by member. EA L2 / EI is log-uniform from 1e2 to 1e6 for the longest
    member of a section, and 12 EI / (G As L2) from 1e-3 to 1 for the shortest."""
    r, needs_area = s.random, not s.has("axial rigid") or s.has("self weight")
    inertia = [_log_uniform(r, 5e-5, 2e-3) for _ in range(count)]
    for k in range(count):
        lengths = [s.length(m) for m, (section, _) in enumerate(used) if section == k] or [5.0]
        s.lines += ["", f"[sections.sec{k}]", f"I = {s.write(inertia[k], 'inertia')}"]
        if needs_area or (not s.has("axial by default") and r.random() < 0.5):
            area = _log_uniform(r, 1e2, 1e6) * inertia[k] / max(lengths) ** 2
            s.lines.append(f"A = {s.write(area, 'area')}")
        if s.has("shear elastic") or r.random() < 0.3:
            shear_area = 12.0 * 2.5 * inertia[k] / (_log_uniform(r, 1e-3, 1.0) * min(lengths) ** 2)
            s.lines.append(f"shear_area = {s.write(shear_area, 'area')}")
        s.lines.append(f"depth = {s.write(r.uniform(0.2, 0.9), 'length')}")
    bending = [moduli[material] * inertia[section] for section, material in used]
    s.bending = math.exp(sum(map(math.log, bending)) / len(bending))


def _joint_names(s: Sketch) -> None:
    """Letters, numbers, or gridline and level; quoted where they need it."""
    count, scheme = len(s.geometry.joints), s.random.randrange(3)
    s.names = [str(k + 1) if scheme == 2 else f"J{k + 1}" for k in range(count)]
    if scheme == 0 and count <= 24:
        s.names = list("ABCDEFGHJKLMNPQRSTUVWXYZ"[:count])
    if s.has("quoted names"):
        s.names = [f"{name} {'east' if k % 2 else 'west'}" for k, name in enumerate(s.names)]
    s.lines += ["", "[joints]"]
    for name, (x, y) in zip(s.names, s.geometry.joints, strict=True):
        key = f'"{name}"' if s.has("quoted names") else name
        s.lines.append(f"{key} = [{s.write(x, 'length')}, {s.write(y, 'length')}]")
    if s.has("loose joint"):
        s.lines.append("alone = [-3, 2]")


def _members(s: Sketch, used: list[tuple[int, int]]) -> None:
    s.lines += ["", "[members]"]
    for m, (i, j, both) in enumerate(s.geometry.members):
        if s.has("members reversed") and s.random.random() < 0.4:
            i, j = j, i
            s.geometry.members[m] = (i, j, both)
        section, material = used[m]
        named = s.has("members named") or s.has("quoted names")
        s.keys.append(f"m{m}" if named else f"{s.names[i]}-{s.names[j]}")
        parts = [f'section = "sec{section}"', f'material = "mat{material}"', *_ends(s, m, both)]
        if named or s.random.random() < 0.2:
            parts[:0] = [f'from = "{s.names[i]}"', f'to = "{s.names[j]}"']
        s.lines.append(f'"{s.keys[m]}" = {{ {", ".join(parts)} }}')


def _ends(s: Sketch, m: int, both: bool) -> list[str]:
    """Hinges, springs and zones of one member."""
    r, parts = s.random, []
    hinge = "both" if both else ""
    if not both and s.has("hinges") and r.random() < 0.25:
        hinge = r.choice(["from", "to", "from", "to", "both"])
    if hinge:
        parts.append(f'hinge = "{hinge}"')
    for end in ("from", "to"):
        if hinge in (end, "both"):
            s.hinged.add((m, end))
        elif s.has("semi-rigid ends") and r.random() < 0.35:
            stiffness = s.bending / s.length(m) * _log_uniform(r, 0.1, 30.0)
            parts.append(f"spring_{end} = {s.write(stiffness, 'turn spring')}")
    zone = [r.uniform(0.02, 0.12) * s.length(m) if s.has("rigid zones") and r.random() < 0.4 else 0.0 for _ in "ab"]
    for end, z in zip(("from", "to"), zone, strict=True):
        if z:
            parts.append(f"rigid_{end} = {s.write(z, 'length')}")
    s.zones[m] = (zone[0], zone[1])
    return parts


WORDS = {"fixed": (True, True, True), "pinned": (True, True, False), "roller": (False, True, False)}


def _supports(s: Sketch) -> None:
    r, g = s.random, s.geometry
    s.lines += ["", "[supports]"]
    feet = list(g.feet)
    if s.has("support above"):
        feet.append(r.choice([k for k in range(len(g.joints)) if k not in g.feet] or feet))
    for n, k in enumerate(dict.fromkeys(feet)):
        weights = [5, 5, 0] if g.beam and n == 0 else [1, 1, 8] if g.beam else [6, 5, 1]
        if k not in g.feet:
            weights = [1, 1, 4]
        word = r.choices(list(WORDS), weights)[0]
        key = f'"{s.names[k]}"' if s.has("quoted names") else s.names[k]
        if s.has("support tables") and r.random() < 0.6:
            s.lines.append(f"{key} = {_support_table(s, k, WORDS[word])}")
        else:
            s.restrained[k] = (*WORDS[word], False)
            s.lines.append(f'{key} = "{word}"')


def _support_table(s: Sketch, k: int, held: tuple[bool, bool, bool]) -> str:
    """A support as a table: held, free or springing in its own axes, perhaps turned."""
    r, parts, restrained = s.random, [], []
    for axis, is_held in zip(("x", "y", "rotation"), held, strict=True):
        spring = s.has("support springs") and r.random() < 0.5
        if spring:
            length = 5.0
            size = s.bending / length * _log_uniform(r, 0.1, 30.0) if axis == "rotation" else (
                s.bending / length**3 * _log_uniform(r, 1.0, 1e4)
            )
            parts.append(f"{axis} = {s.write(size, 'turn spring' if axis == 'rotation' else 'spring')}")
        elif is_held or r.random() < 0.3:
            parts.append(f'{axis} = "{"held" if is_held else "free"}"')
        restrained.append(spring or is_held)
    turned = s.has("turned supports") and r.random() < 0.6
    if turned:
        angle = r.choice([r.uniform(-90.0, 90.0), r.uniform(-30.0, 30.0), 90.0, 30.0])
        parts.append(f'angle = "{angle!r} deg"' if s.has("unit strings") and r.random() < 0.3 else f"angle = {angle!r}")
    if not any(restrained):
        parts, restrained = ['y = "held"', *(p for p in parts if p.startswith("angle"))], [False, True, False]
    s.restrained[k] = (restrained[0], restrained[1], restrained[2], turned)
    return "{ " + ", ".join(parts) + " }"


# --- loads ------------------------------------------------------------------------------------------


def _force(s: Sketch) -> float:
    return s.random.uniform(2.0, 60.0) * s.random.choice([1, 1, 1, -1])


def _direction(s: Sketch, on_member: bool) -> str:
    """A direction; angles, across and along only in frames that have them."""
    choices = ['"down"', '"down"', '"right"', '"left"', '"up"']
    if s.has("at an angle"):
        choices += [repr(s.random.uniform(-180.0, 180.0))] * 3
        choices.append(f'"{s.random.uniform(-180.0, 180.0)!r} deg"' if s.has("unit strings") else "30")
    if on_member and s.has("across"):
        choices += ['"across"'] * 3
    if on_member and s.has("along"):
        choices += ['"along"'] * 3
    return s.random.choice(choices)


def _on_members(s: Sketch) -> tuple[str, int]:
    """`member = ...` or `members = [...]`, and one of them (for distances)."""
    m = s.random.randrange(len(s.keys))
    zoned = [k for k, zones in s.zones.items() if any(zones)]
    if zoned and s.has("on a zone or end"):
        m = s.random.choice(zoned)
    if s.has("several at once") and s.random.random() < 0.4 and len(s.keys) > 1:
        others = s.random.sample([k for k in range(len(s.keys)) if k != m], k=min(2, len(s.keys) - 1))
        shortest = min([m, *others], key=s.length)
        listed = ", ".join(f'"{s.keys[k]}"' for k in [m, *others])
        return f"members = [{listed}]", shortest
    return f'member = "{s.keys[m]}"', m


def _on_joints(s: Sketch) -> str:
    joined = sorted({k for i, j, _ in s.geometry.members for k in (i, j)})
    if s.has("several at once") and s.random.random() < 0.4:
        return "joints = [" + ", ".join(f'"{s.names[k]}"' for k in s.random.sample(joined, k=2)) + "]"
    return f'joint = "{s.names[s.random.choice(joined)]}"'


def _place(s: Sketch, m: int) -> str:
    """A distance along the member; sometimes at its end or on its rigid zone."""
    length, (z0, z1) = s.length(m), s.zones[m]
    if s.has("on a zone or end") and s.random.random() < 0.5:
        marks = [0.0, length]
        marks += [z0, z0 / 2.0] * 2 if z0 else []
        marks += [length - z1, length - z1 / 2.0] * 2 if z1 else []
        x = s.random.choice(marks)
        return repr(x / UNITS[s.units][1]) if x != length else '"100%"'
    return s.distance(s.random.uniform(0.05, 0.95) * length, m)


def _stretch(s: Sketch, m: int) -> str:
    """`, start = , end = ` of a partial load, one of them left out at times."""
    if not s.has("partial") or s.random.random() < 0.3:
        return ""
    length = s.length(m)
    start, end = sorted([s.random.uniform(0.0, 0.9) * length, s.random.uniform(0.1, 1.0) * length])
    if end - start < 0.05 * length:
        start, end = 0.2 * length, 0.7 * length
    # Both in one writing: a share and a length mean different places on members of different lengths.
    shares = s.has("percent distances") and s.random.random() < 0.6
    written = [f'"{round(100.0 * x / length, 3)}%"' if shares else s.write(x, "length") for x in (start, end)]
    texts = [f", start = {written[0]}", f", end = {written[1]}"]
    if s.random.random() < 0.3:
        texts.pop(s.random.randrange(2))
    return "".join(texts)


def _spread(s: Sketch, what: str) -> str:
    on, m = _on_members(s)
    direction = _direction(s, on_member=True)
    stretch = _stretch(s, m)
    per = ""
    if s.has("projected") and direction not in ('"across"', '"along"') and s.random.random() < 0.6:
        per = ', per = "projection"'
    elif s.random.random() < 0.1:
        per = ', per = "length"'
    return f"{on}, {what}, direction = {direction}{stretch}{per}"


def _line(s: Sketch) -> str:
    return s.write(s.random.uniform(1.0, 30.0) * s.random.choice([1, 1, 1, -1]), "line")


def _point_force(s: Sketch) -> str:
    on, m = _on_members(s)
    return f"{on}, force = {s.write(_force(s), 'force')}, direction = {_direction(s, True)}, at = {_place(s, m)}"


def _point_couple(s: Sketch) -> str:
    on, m = _on_members(s)
    return f"{on}, couple = {s.write(_force(s), 'moment')}, at = {_place(s, m)}"


def _end_couple(s: Sketch) -> str:
    """A couple at a member's end, at a hinged one where there is any."""
    m, end = s.random.choice(sorted(s.hinged) or [(s.random.randrange(len(s.keys)), "to")])
    z0, z1 = s.zones[m]
    at = repr(z0 / UNITS[s.units][1]) if end == "from" else '"100%"'
    if end == "to" and z1:
        at = repr((s.length(m) - z1) / UNITS[s.units][1])
    return f'member = "{s.keys[m]}", couple = {s.write(_force(s), "moment")}, at = {at}'


def _settlement(s: Sketch) -> str:
    k = s.random.choice(sorted(s.restrained))
    x, y, rotation, turned = s.restrained[k]
    if y and not turned and s.random.random() < 0.4:
        return f'joint = "{s.names[k]}", settlement = {{ down = {s.write(s.random.uniform(-0.02, 0.03), "length")} }}'
    parts = [
        f"{axis} = {s.write(s.random.uniform(-0.02, 0.02), 'length')}"
        for axis, restrained in (("x", x), ("y", y)) if restrained
    ]  # fmt: skip
    if rotation:
        parts.append(f"rotation = {s.write(s.random.uniform(-0.005, 0.005), 'rotation')}")
    chosen = s.random.sample(parts, k=s.random.randint(1, len(parts)))
    return f'joint = "{s.names[k]}", settlement = {{ {", ".join(chosen)} }}'


def _temperature(s: Sketch, key: str) -> str:
    on, _ = _on_members(s)
    value = s.random.uniform(-40.0, 40.0)
    written = f'"{value!r} K"' if s.has("unit strings") and s.random.random() < 0.5 else repr(value)
    return f"{on}, {key} = {written}"


def _misfit(s: Sketch) -> str:
    return f"{_on_members(s)[0]}, misfit = {s.write(s.random.uniform(-0.01, 0.01), 'length')}"


LOADS: dict[str, Callable[[Sketch], str]] = {
    "joint force": lambda s: (
        f"{_on_joints(s)}, force = {s.write(_force(s), 'force')}, direction = {_direction(s, False)}"
    ),
    "joint couple": lambda s: f"{_on_joints(s)}, couple = {s.write(_force(s), 'moment')}",
    "settlement": _settlement,
    "point force": _point_force,
    "point couple": _point_couple,
    "couple at an end": _end_couple,
    "uniform": lambda s: _spread(s, f"uniform = {_line(s)}"),
    "varying": lambda s: _spread(s, f"varying = [{_line(s)}, {_line(s)}]"),
    "mean temperature": lambda s: _temperature(s, "temperature"),
    "temperature difference": lambda s: _temperature(s, "difference"),
    "misfit": _misfit,
    "self weight": lambda s: f"self_weight = {s.random.choice([1.0, 1.35, -1.0, 0.9])}",
}
TRIES = 6
"""Places drawn for one load before it is left out because the frame cannot carry or follow it anywhere."""

Slots = dict[str, list[list[str]]]
"""By load case, the loads wanted, each as candidates of which the first that the frame can carry is taken."""


def _wanted(s: Sketch) -> Slots:
    r = s.random
    slots: Slots = {f"case{k}": [] for k in range(r.randint(2, 3) if s.has("several cases") else 1)}
    for kind, make in LOADS.items():
        if s.has(kind):
            for _ in range(r.randint(1, 2)):
                slots[r.choice(list(slots))].append([make(s) for _ in range(TRIES)])
    for wanted in slots.values():
        if not wanted and r.random() < 0.9:
            wanted.append([LOADS["uniform"](s)])
    return slots


def _case_lines(s: Sketch, cases: dict[str, list[str]]) -> Iterator[str]:
    for name, entries in cases.items():
        yield f"\n[loads.{name}]\napply = ["
        yield from (f"  {{ {entry} }}," for entry in entries)
        yield "]"
        if s.has("expected"):
            yield 'expected = { down = "100 kN" }'


def _combinations(s: Sketch, cases: list[str]) -> list[str]:
    if not s.has("combinations"):
        return []
    r, lines = s.random, ["", "[combinations]"]
    for k in range(r.randint(1, 2)):
        chosen = r.sample(cases, k=r.randint(1, len(cases)))
        factors = {name: r.choice([1.0, 1.35, 1.5, 0.9, round(r.uniform(0.3, 1.6), 3)]) for name in chosen}
        if s.has("negative factors"):
            factors[chosen[-1]] *= -1.0
        lines.append(f"combo{k} = {{ " + ", ".join(f"{name} = {value!r}" for name, value in factors.items()) + " }")
    return lines


# --- the whole ---------------------------------------------------------------------------------------


def _draw(seed: int, attempt: int) -> Sketch:
    """A frame without loads. Features and units do not depend on the attempt."""
    first = Random(f"features {seed}")
    features = frozenset(name for name, chance in FEATURES.items() if first.random() < chance)
    units = first.choice(list(UNITS))
    make = first.choice(GEOMETRIES)
    r = Random(f"frame {seed} attempt {attempt}")
    s = Sketch(r, features, units, make(r))
    sections, materials = r.randint(1, 3), r.randint(1, 2)
    used = [(r.randrange(sections), r.randrange(materials)) for _ in s.geometry.members]
    _head(s, seed)
    moduli = _materials(s, materials)
    _sections(s, used, sections, moduli)
    _joint_names(s)
    _members(s, used)
    _supports(s)
    return s


@lru_cache(maxsize=4096)
def random_frame_text(seed: int) -> str:
    """The frame file of a seed."""
    attempt = 0
    while True:
        s = _draw(seed, attempt)
        bare = read_frame_text("\n".join(s.lines) + "\n")
        solver = Truth(bare, names=(), judge=False)
        if not solver.mechanism and solver.gap[0] > SURE:
            return _with_loads(s)
        attempt += 1


def _with_loads(s: Sketch) -> str:
    slots = _wanted(s)
    everything = {name: [entry for slot in wanted for entry in slot] for name, wanted in slots.items()}
    base = "\n".join(s.lines) + "\n"
    frame = read_frame_text(base + "\n".join(_case_lines(s, everything)) + "\n")
    solver = Truth(frame, names=())
    kept: dict[str, list[str]] = {}
    for name, wanted in slots.items():
        refused = {load.entry for load in frame.cases[name].loads if not solver.can_follow(load)}
        kept[name], entry = [], 0
        for slot in wanted:
            possible = [text for n, text in enumerate(slot) if entry + n not in refused]
            kept[name] += possible[:1]
            entry += len(slot)
    return base + "\n".join([*_case_lines(s, kept), *_combinations(s, list(kept))]) + "\n"


@lru_cache(maxsize=64)
def random_frame(seed: int) -> Frame:
    """The frame of a seed, read from its file."""
    return read_frame_text(random_frame_text(seed), f"random {seed}")


# --- what a frame uses -------------------------------------------------------------------------------

TEXT_MARKS = {
    "percent distances": '%"', "loads on several members": "members = [", "loads on several joints": "joints = [",
    "projection": 'per = "projection"', "per length stated": 'per = "length"', "across": '"across"',
    "along": '"along"', "trapezoidal": "varying", "uniform": "uniform", "expected": "expected",
    "members named": "from =", "settlement down": "down =", "density by mass": "kg/m^3",
    "density by weight": "kN/m^3", "nu": "nu =", "G": "G =", "tolerance": "tolerance",
}  # fmt: skip


def features_of(frame: Frame, text: str) -> set[str]:
    """Every row of the grammar that a frame uses, by name."""
    found = {name for name, mark in TEXT_MARKS.items() if mark in text}
    found |= {f"units {frame.units.force} {frame.units.length}"}
    found |= {f"axial {frame.analysis.axial}", f"shear {frame.analysis.shear}"}
    found |= {"axial by default"} if not frame.analysis.axial_stated else set()
    found |= {"combinations"} if frame.combinations else set()
    found |= {"several cases"} if len(frame.cases) > 1 else set()
    found |= {"case without load"} if any(not case.loads for case in frame.cases.values()) else set()
    found |= {"loose joint"} if "alone" in frame.joints else set()
    if any(f < 0 for c in frame.combinations.values() for f in c.factors.values()):
        found.add("negative factors")
    if any(f'{unit}"' in text.split("[joints]")[1] for kind in WRITINGS.values() for unit in kind):
        found.add("unit strings")
    return found | _member_features(frame) | _support_features(frame) | _load_features(frame)


def _member_features(frame: Frame) -> set[str]:
    found = set()
    for m in frame.members.values():
        turns = (m.turn_from, m.turn_to)
        found |= {f"hinge {end}" for end, k in zip(("from", "to"), turns, strict=True) if k == 0.0}
        found |= {"hinge both"} if turns == (0.0, 0.0) else set()
        found |= {f"spring_{end}" for end, k in zip(("from", "to"), turns, strict=True) if 0.0 < k < HELD}
        zones = (("from", m.rigid_from), ("to", m.rigid_to))
        found |= {f"rigid_{end}" for end, z in zones if z > 0.0}
        if any(k == 0.0 and z > 0.0 for k, (_, z) in zip(turns, zones, strict=True)):
            found.add("zone and hinge at one end")
        a, b = frame.joints[m.joint_from], frame.joints[m.joint_to]
        if min(abs(a.x - b.x), abs(a.y - b.y)) > 1e-9 * math.hypot(a.x - b.x, a.y - b.y):
            found.add("inclined members")
    return found


def _support_features(frame: Frame) -> set[str]:
    found = set()
    for support in frame.supports.values():
        axes = (("x", support.x), ("y", support.y), ("rotation", support.rotation))
        found |= {f"support spring {axis}" for axis, k in axes if 0.0 < k < HELD}
        found.add("support " + "".join(axis[0] for axis, k in axes if k == HELD) + " held")
        found |= {"turned support"} if support.angle else set()
        if support.angle and any(0.0 < k < HELD for _, k in axes):
            found.add("turned support with spring")
    return found


def _load_features(frame: Frame) -> set[str]:
    found = set()
    for load in (load for case in frame.cases.values() for load in case.loads):
        kind = type(load).__name__
        found.add(kind)
        direction = getattr(load, "direction", None)
        if isinstance(direction, float) and direction % 90:
            found.add(f"{kind} at an angle")
        if isinstance(load, Temperature):
            found |= {"mean temperature"} if load.mean else set()
            found |= {"temperature difference"} if load.difference else set()
        if isinstance(load, (PointForce, PointCouple)):
            found |= _place_features(frame, frame.members[load.member], load.at, kind)
        if isinstance(load, Spread):
            whole = load.start <= 0.0 and load.end >= _length(frame, frame.members[load.member]) * (1 - 1e-9)
            found |= set() if whole else {"partial"}
    return found


def _length(frame: Frame, member: Member) -> float:
    i, j = frame.joints[member.joint_from], frame.joints[member.joint_to]
    return math.hypot(i.x - j.x, i.y - j.y)


def _place_features(frame: Frame, member: Member, at: float, kind: str) -> set[str]:
    length = _length(frame, member)
    near, faces = 1e-9 * length, (member.rigid_from, length - member.rigid_to)
    found = {f"{kind} on a zone"} if at < faces[0] - near or at > faces[1] + near else set()
    hinged = (member.turn_from == 0.0, member.turn_to == 0.0)
    if any(hinge and abs(at - face) < near for hinge, face in zip(hinged, faces, strict=True)):
        found.add(f"{kind} at a hinged end")
    return found
