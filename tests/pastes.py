"""A generator of pastes: right results of thirty frames, printed in the ways that people's analyses print them.

Every paste is drawn from a seed: layout, separator, number writing, units, signs, names, heads, noise, encoding, cases and
what is special (tables of the other model's input beside the results, members divided into elements with other numbers, end
forces in global axes, end values at the face of rigid zones) are each drawn on their own. The sign
formulas stand here a second time on purpose: nothing of crosscheck.claims or
crosscheck.compare makes a paste. Run `python -m tests.pastes 2000` for the figures by layout.
"""

from __future__ import annotations

import sys
from collections import Counter
from collections.abc import Callable
from dataclasses import dataclass, field, replace
from random import Random
from typing import Any

import numpy as np

from crosscheck.claims.decode import decode
from crosscheck.claims.read import read_claim_text
from crosscheck.claims.reading import ReadingOptions
from crosscheck.compare.claimed import ClosedClaim
from crosscheck.compare.closing import close
from crosscheck.compare.differences import worst
from crosscheck.compare.tolerance import CLAIM
from crosscheck.problems import UnusableInput
from crosscheck.review.echo import compared
from crosscheck.review.finding import Subject
from tests.pastes_frames import FRAMES, ZONED, known

# --- what a paste looks like

SPECIAL = ("", "", "", "", "echo", "divided", "global", "face")
LAYOUTS = ("ends", "both", "stations", "block", "extremes")
SEPARATORS = ("tab", "aligned", "single blanks", "comma", "semicolon", "bar")
WRITINGS = ("fixed", "exponent", "thousands", "unicode minus", "trailing minus", "brackets", "decimal comma", "units stuck")
UNITS = {  # force, arm of moments, displacement, rotation: words and sizes in N, m, rad
    "kN m": ("kN", 1e3, "m", 1.0, "mm", 1e-3, "rad", 1.0),
    "N mm": ("N", 1.0, "mm", 1e-3, "mm", 1e-3, "rad", 1.0),
    "N m": ("N", 1.0, "m", 1.0, "m", 1.0, "rad", 1.0),
    "kip ft": ("kip", 4448.2216152605, "ft", 0.3048, "in", 0.0254, "rad", 1.0),
    "lbf in": ("lbf", 4.4482216152605, "in", 0.0254, "in", 0.0254, "deg", np.pi / 180),
    "kN cm": ("kN", 1e3, "cm", 0.01, "cm", 0.01, "mrad", 1e-3),
}  # fmt: skip
HEADS = {
    "member": ("Member", "Memb.", "Beam", "Element", "MEMBER NO.", "Bar", "Mbr", "Elem"),
    "joint": ("Joint", "Node", "Jt", "NODE", "Joint no.", "Point"),
    "end": ("End", "Joint", "Node", "At", "END"),
    "axial": ("N", "Axial", "Axial force", "Fx", "AXIAL", "P", "Axial N", "Nx"),
    "shear": ("V", "Shear", "Shear force", "Fy", "SHEAR", "Vy", "Q", "Shear V"),
    "moment": ("M", "Moment", "Bending moment", "Mz", "MOMENT", "BM", "M3", "Mom."),
    "x": ("x", "Station", "Dist.", "Distance", "X", "Position", "Location"),
    "fx": ("Fx", "Rx", "H", "FX", "Horizontal", "Force-X", "X force", "Reaction x"),
    "fy": ("Fy", "Ry", "V", "FY", "Vertical", "Force-Y", "Y force", "Reaction y"),
    "rm": ("M", "Mz", "Moment", "MZ", "Moment", "Moment-Z", "Z moment", "Moment"),
    "dx": ("dx", "ux", "Dx", "X-disp", "Horizontal", "x-displacement", "u", "UX"),
    "dy": ("dy", "uy", "Dy", "Y-disp", "Vertical", "y-displacement", "v", "UY"),
    "rot": ("rotation", "rz", "Rot", "Z-rot", "Rotation", "θ", "phi", "RZ"),
    "case": ("Case", "Load case", "LC", "Loading", "Combination"),
}  # fmt: skip


@dataclass
class Spec:
    """What was drawn for one paste."""

    seed: int
    frame: int
    layout: str
    separator: str
    writing: str
    heads: str  # "bracket units", "unit line", "units stated", "no units"
    units: str
    cases: str  # "heading", "column", "option", "several headings", "several column"
    encoding: str
    noise: bool
    names: str
    spatial: bool
    tables: tuple[str, ...]
    signs: dict[str, Any]
    vocabulary: dict[str, int] = field(default_factory=dict)
    digits: int = 5
    special: str = ""


@dataclass(frozen=True)
class Element:
    """What the paste prints as one member: the part of a member of the frame from `start` to `end` (distances from its
    `from` joint; end < start where it runs back), and the paste's names of it and of its joints."""

    label: str
    member: str
    start: float
    end: float
    joints: tuple[str, str]

    @property
    def runs(self) -> int:
        return 1 if self.end > self.start else -1


@dataclass
class Paste:
    spec: Spec
    data: bytes
    options: ReadingOptions
    case: str | None
    values: int
    planted: str = ""
    fixed: bool = True


def draw(seed: int) -> Spec:
    r = Random(f"paste {seed}")
    frame = seed % FRAMES
    separator = r.choice(SEPARATORS)
    writings = [w for w in WRITINGS if (w != "decimal comma" or separator not in ("comma",))
                and (w != "thousands" or separator != "comma")]  # fmt: skip
    writing = "decimal comma" if separator == "semicolon" and r.random() < 0.7 else r.choice(writings)
    layout = r.choice(LAYOUTS)
    tables = tuple(t for t in ("reactions", "displacements") if r.random() < 0.6)
    heads = r.choice(("bracket units", "bracket units", "unit line", "units stated", "no units"))
    vocabulary = {key: r.randrange(len(words)) for key, words in HEADS.items()}
    same = r.randrange(8)
    for key in ("axial", "shear", "moment"):
        vocabulary[key] = same
    same = r.randrange(8)
    for key in ("fx", "fy", "rm"):
        vocabulary[key] = same
    same = r.randrange(8)
    for key in ("dx", "dy", "rot"):
        vocabulary[key] = same
    names = r.choice(("same", "same", "lower", "prefixed", "pair"))
    special = Random(f"special {seed}").choice(SPECIAL)
    if special == "face" and frame not in ZONED or special in ("global", "face") and layout in ("stations", "extremes"):
        special = ""
    if special == "divided":
        layout = "ends" if layout == "extremes" else layout
        names = "same" if names in ("pair", "lower") else names
    return Spec(
        seed, frame, layout, separator, writing, heads, r.choice(list(UNITS)),
        r.choice(("heading", "column", "option", "several headings", "several column")),
        r.choice(("utf-8", "utf-8-sig", "utf-16", "latin-1", "crlf")), r.random() < 0.6,
        names, r.random() < 0.15, tables,
        {
            "axial": r.choice((1, 1, -1)), "axial form": r.choice(("internal", "internal", "action")),
            "shear": r.choice((1, -1)), "shear form": r.choice(("internal", "action")),
            "moment": r.choice((1, -1)), "moment form": r.choice(("internal", "action")),
            "support": r.choice((1, 1, -1)), "turn": r.choice((1, -1)), "down": r.choice((1, 1, 1, -1)),
        }, vocabulary, r.choice((4, 5, 6)), special,
    )  # fmt: skip


# --- numbers


def number(value: float, decimals: int, writing: str, unit: str = "") -> str:
    """One number as `writing` has it; NaN as a dash."""
    if not np.isfinite(value):
        return "-"
    if writing == "exponent":
        return f"{value + 0.0:.{max(3, min(decimals + 2, 7))}E}"
    value = round(value, decimals) + 0.0
    text = f"{abs(value):,.{decimals}f}" if writing == "thousands" else f"{abs(value):.{decimals}f}"
    negative = value < 0
    if writing == "decimal comma":
        text = text.replace(".", ",")
    if writing == "units stuck" and unit:
        text += unit
    if not negative:
        return text
    if writing == "trailing minus":
        return text + "-"
    if writing == "brackets":
        return f"({text})"
    return ("\u2212" if writing == "unicode minus" else "-") + text


def decimals_for(values: np.ndarray, digits: int) -> int:
    """Decimals that give the largest of the values `digits` significant digits."""
    size = float(np.nanmax(np.abs(values), initial=0.0))
    return 3 if size == 0 else int(np.clip(digits - 1 - np.floor(np.log10(size)), 0, 9))


# --- making one


class Maker:
    def __init__(self, spec: Spec, plant: str = "") -> None:
        self.spec, self.plant = spec, plant
        self.known = known(spec.frame)
        self.frame, self.r = self.known.frame, Random(f"make {spec.seed}")
        self.answer = self.known.answers["slope-deflection"]
        f, self.F, a, arm, d, self.D, t, self.T = UNITS[spec.units]
        self.unit_words = {"force": f, "moment": (f + a if len(f) <= 2 else f"{f} {a}"), "length": d, "angle": t, "arm": a}
        self.scale = {"force": self.F, "moment": self.F * arm, "length": self.D, "angle": self.T, "arm": arm}
        inches = a in ("ft", "in")
        self.unit_words |= {"I": "in4" if inches else "cm4", "A": "in2" if inches else "cm2"}
        self.small = 0.0254 if inches else 0.01
        self.values = 0
        self.planted = ""
        self.planting = -1
        self.telling: Counter[tuple[str, int]] = Counter()

    def tell(self, case: str, quantity: str, values: Any, place: int = 0) -> None:
        """Counts values large enough to tell a sign or a unit by; values between surely and surely not count as
        doubtful."""
        scale = self.known.judgements[case].scales.of(quantity.split()[-1])
        sizes = np.abs(np.atleast_1d(np.asarray(values, dtype=float))) / scale
        self.telling[quantity, place] += int((sizes > 0.012).sum())
        self.telling[quantity + " doubtful", place] += int(((sizes > 0.0004) & (sizes <= 0.012)).sum())

    @property
    def fixed(self) -> bool:
        """Do at least three values fix every choice, quantity by quantity and end by end (or none needs to be)?"""
        return all(n >= 3 or n == 0 and not self.telling[q + " doubtful", place]
                   for (q, place), n in self.telling.items() if not q.endswith("doubtful"))  # fmt: skip

    def word(self, key: str) -> str:
        return HEADS[key][self.spec.vocabulary[key] % len(HEADS[key])]

    def in_units(self, values: Any, kind: str) -> np.ndarray:
        """Values of the frame's units in the paste's."""
        u = self.frame.units
        si = {"force": u.newton, "moment": u.newton * u.metre, "length": u.metre, "angle": 1.0, "arm": u.metre}[kind]
        return np.asarray(values, dtype=float) * si / self.scale[kind]

    # -- names

    def member(self, name: str) -> str:
        m = self.frame.members[name]
        return {
            "same": name, "lower": name.lower(), "prefixed": f"Member {name}",
            "pair": f"{m.joint_to} - {m.joint_from}" if self._backwards(name) else f"{m.joint_from} - {m.joint_to}",
        }[self.spec.names]  # fmt: skip

    def _backwards(self, name: str) -> bool:
        """Pairs of joints may be printed the other way round: the member then runs that way."""
        return self.spec.names == "pair" and Random(f"{self.spec.seed} {name}").random() < 0.4

    def joint(self, name: str) -> str:
        if self.spec.special == "divided":
            return self._numbered(101 + self.frame.joint_index[name])
        return {"same": name, "lower": name.lower(), "prefixed": f"Node {name}", "pair": name}[self.spec.names]

    def _numbered(self, number: int) -> str:
        return f"Node {number}" if self.spec.names == "prefixed" else str(number)

    def elements(self) -> list[Element]:
        """What the paste prints as its members."""
        if self.spec.special == "divided":
            return [e for e, _ in self._divided()]
        out = []
        for m, member in enumerate(self.frame.members.values()):
            length = float(self.frame.member_table.length[m])
            at, joints = [0.0, length], (self.joint(member.joint_from), self.joint(member.joint_to))
            if self.spec.special == "face":
                at = [member.rigid_from, length - member.rigid_to]
            if self._backwards(member.name):
                at, joints = at[::-1], joints[::-1]
            out.append(Element(self.member(member.name), member.name, at[0], at[1], joints))
        return out

    def _divided(self) -> list[tuple[Element, tuple[tuple[str, float], ...]]]:
        """Elements, each with the joints that only divide its member (name and share of the length)."""
        r, out, inner = Random(f"divided {self.spec.seed}"), [], 200
        for m, member in enumerate(self.frame.members.values()):
            length = float(self.frame.member_table.length[m])
            shares = sorted(r.choice((0.25, 0.4, 0.5, 0.7)) + 0.01 * k for k in range(r.choice((0, 0, 1, 2))))
            names = [self._numbered(inner + k) for k in range(len(shares))]
            inner += len(shares)
            places = list(zip([0.0, *shares, 1.0], [self.joint(member.joint_from), *names, self.joint(member.joint_to)],
                              strict=True))  # fmt: skip
            for k, ((a, first), (b, last)) in enumerate(zip(places, places[1:], strict=False)):
                label = str(len(out) + 1)
                e = Element(f"Element {label}" if self.spec.names == "prefixed" else label, member.name, a * length,
                            b * length, (first, last))  # fmt: skip
                if r.random() < 0.2:
                    e = Element(e.label, e.member, e.end, e.start, (last, first))
                out.append((e, tuple(zip(names, shares, strict=True)) if k == 0 else ()))
        return out

    # -- member values in the paste's conventions: place 0 is the paste's start

    def _on_faces(self, case: str, e: Element) -> np.ndarray:
        """(2, 3) tension, shear along the frame's local y and clockwise moment on the element's start and end."""
        m = self.frame.member_index[e.member]
        if self.spec.special not in ("divided", "face"):
            return self.answer.cases[case].ends[m, :: e.runs].copy()
        out = []
        for x, side in ((e.start, e.runs), (e.end, -e.runs)):
            n, v, mm = self.answer.spans.along(case, np.array([m]), np.array([x]), np.array([side]))[0, :3]
            out.append([n, side * v, side * mm])
        return np.array(out)

    def end_values(self, case: str, e: Element) -> np.ndarray:
        """(2, 3) at the paste's start and end: axial, shear, moment as printed, in the paste's units."""
        s, ends = self.spec.signs, self._on_faces(case, e)
        for q, quantity in enumerate(("axial", "shear", "moment")):
            for place in (0, 1):
                self.tell(case, quantity, ends[place, q], place)
        tension, shear, moment = ends[:, 0], e.runs * ends[:, 1], ends[:, 2]
        out = np.column_stack([
            s["axial"] * (tension if s["axial form"] == "internal" else tension * [-1, 1]),
            s["shear"] * (shear if s["shear form"] == "action" else shear * [1, -1]),
            s["moment"] * (moment if s["moment form"] == "action" else moment * [1, -1]),
        ])  # fmt: skip
        if self.spec.special == "global":
            m = self.frame.member_index[e.member]
            cos, sin = self.frame.member_table.cos[m], self.frame.member_table.sin[m]
            along = tension * [-e.runs, e.runs]
            out[:, 0] = s["shear"] * (along * cos - ends[:, 1] * sin)
            out[:, 1] = s["shear"] * (along * sin + ends[:, 1] * cos)
            out[:, 2] = s["moment"] * moment
        out[:, :2] = self.in_units(out[:, :2], "force")
        out[:, 2] = self.in_units(out[:, 2], "moment")
        return out

    def stations(self, case: str, e: Element) -> tuple[np.ndarray, np.ndarray]:
        """(5,) distances and (5, 3) N, V, M along the paste's member."""
        s = self.spec.signs
        m = self.frame.member_index[e.member]
        x = np.array([0, 0.2, 0.5, 0.75, 1.0]) * abs(e.end - e.start)
        side = np.where(x == 0, 1, -1) * e.runs
        values = self.answer.spans.along(case, np.full(5, m), e.start + e.runs * x, side)[:, :3].copy()
        for q, quantity in enumerate(("axial", "shear", "moment")):
            self.tell(case, quantity, values[:, q])
        values *= [s["axial"], s["shear"], s["moment"] * e.runs]
        values[:, :2] = self.in_units(values[:, :2], "force")
        values[:, 2] = self.in_units(values[:, 2], "moment")
        return self.in_units(x, "arm"), values

    def extremes(self, case: str, name: str) -> np.ndarray:
        """(2, 3) largest and smallest N, V, M along the member, densely sampled and at its ends."""
        s = self.spec.signs
        m = self.frame.member_index[name]
        length = float(self.frame.member_table.length[m])
        turning, places = self.answer.spans.turning_points(case)
        x = np.concatenate([np.linspace(0, length, 201), places[turning == m], [0.35 * length, 0.6 * length]])
        values = np.concatenate([
            self.answer.spans.along(case, np.full(len(x), m), x, np.full(len(x), side))[:, :3] for side in (-1, 1)
        ])  # fmt: skip
        values = values * [s["axial"], s["shear"], s["moment"] * (-1 if self._backwards(name) else 1)]
        out = np.array([values.max(axis=0), values.min(axis=0)])
        for q, quantity in enumerate(("axial", "shear", "moment")):
            self.tell(case, quantity, out[:, q])
        out[:, :2] = self.in_units(out[:, :2], "force")
        out[:, 2] = self.in_units(out[:, 2], "moment")
        return out

    # -- tables: head cells with their unit kind, and rows of cells

    def member_table(self, case: str) -> tuple[list[tuple[str, str]], list[list[Any]]]:
        layout = self.spec.layout
        forces = [(self.word("axial"), "force"), (self.word("shear"), "force"), (self.word("moment"), "moment")]
        if self.spec.special == "global":
            forces = [(h, u) for h, (_, u) in zip(("Fx", "Fy", "Mz"), forces, strict=True)]
        forces, keep = self._spatial(forces)
        rows: list[list[Any]] = []
        for e in self.elements():
            if layout in ("ends", "block"):
                v = self.end_values(case, e)
                rows += [[e.label if layout == "ends" or k == 0 else "", j, *keep(v[k])] for k, j in enumerate(e.joints)]
            elif layout == "both":
                v = self.end_values(case, e)
                rows.append([e.label, *keep(v[0]), *keep(v[1])])
            elif layout == "stations":
                x, v = self.stations(case, e)
                rows += [[e.label, ("at", x[k]), *keep(v[k])] for k in range(len(x))]
            else:
                v = self.extremes(case, e.member)
                rows.append([e.label, *[value for q in range(3) for value in (v[0, q], v[1, q])]])
        heads = {
            "ends": [(self.word("member"), ""), (self.word("end"), ""), *forces],
            "block": [(self.word("member"), ""), (self.word("end"), ""), *forces],
            "both": [(self.word("member"), ""), *[(f"{h} {e}", u) for e in self._end_words() for h, u in forces]],
            "stations": [(self.word("member"), ""), (self.word("x"), "arm"), *forces],
            "extremes": [(self.word("member"), ""), *[(f"{w} {h}", u) for h, u in forces[:3] for w in ("max", "min")]],
        }[layout]  # fmt: skip
        return heads, rows

    def _end_words(self) -> tuple[str, str]:
        return (("i", "j"), ("start", "end"), ("1", "2"))[self.spec.seed % 3]

    def _spatial(self, forces: list[tuple[str, str]]) -> tuple[list[tuple[str, str]], Callable[[Any], list[Any]]]:
        """Spatial results: the columns out of the plane are zero."""
        if not self.spec.spatial or self.spec.layout == "extremes":
            return forces, list
        heads = [("Fx", "force"), ("Fy", "force"), ("Fz", "force"), ("Mx", "moment"), ("My", "moment"), ("Mz", "moment")]
        return heads, lambda v: [v[0], v[1], ("zero", 0.0), ("zero", 0.0), ("zero", 0.0), v[2]]

    def reaction_table(self, case: str) -> tuple[list[tuple[str, str]], list[list[Any]]]:
        s = self.spec.signs
        heads = [
            (self.word("joint"), ""),
            (self.word("fx"), "force"),
            (self.word("fy"), "force"),
            (self.word("rm"), "moment"),
        ]
        rows = []
        for name in self.frame.supports:
            fx, fy, m = self.answer.cases[case].reactions[self.frame.joint_index[name]]
            for quantity, value in (("fx", fx), ("fy", fy), ("reaction moment", m)):
                self.tell(case, quantity, value)
            forces = self.in_units([s["support"] * fx, s["support"] * s["down"] * fy], "force")
            moment = self.in_units(s["support"] * s["turn"] * m, "moment")
            rows.append([self.joint(name), *forces, float(moment)])
        return heads, rows

    def displacement_table(self, case: str) -> tuple[list[tuple[str, str]], list[list[Any]]]:
        s = self.spec.signs
        heads = [
            (self.word("joint"), ""),
            (self.word("dx"), "length"),
            (self.word("dy"), "length"),
            (self.word("rot"), "angle"),
        ]
        rows = []
        for name in self.frame.joints:
            dx, dy, t = self.answer.cases[case].joints[self.frame.joint_index[name]]
            for quantity, value in (("dx", dx), ("dy", dy), ("rotation", t)):
                self.tell(case, quantity, value)
            moves = self.in_units([dx, s["down"] * dy], "length")
            rows.append([self.joint(name), *moves, float(self.in_units(s["turn"] * t, "angle"))])
        return heads, rows

    # -- the other model's own input: cells marked "echo" are no results

    def echo_tables(self) -> list[str]:
        joints = {self.joint(j.name): (j.x, j.y) for j in self.frame.joints.values()}
        if self.spec.special == "divided":
            for e, inner in self._divided():
                m = self.frame.members[e.member]
                a, b = (np.array([self.frame.joints[j].x, self.frame.joints[j].y]) for j in (m.joint_from, m.joint_to))
                joints |= {name: tuple(a + share * (b - a)) for name, share in inner}
        places = self.in_units(list(joints.values()), "arm")
        rows: list[list[Any]] = [[n, ("echo", x), ("echo", y)] for n, (x, y) in zip(joints, places, strict=True)]
        out = self.table("Joint coordinates", [(self.word("joint"), ""), ("X", "arm"), ("Y", "arm")], rows)
        ends = (("Start node", "End node"), ("Node i", "Node j"), ("From", "To"))[self.spec.seed % 3]
        heads = [(self.word("member"), ""), *[(h, "") for h in ends]]
        out += self.table("Members", heads, [[e.label, *e.joints] for e in self.elements()])
        if self.spec.special == "divided":
            return out
        metre = self.frame.units.metre
        held = ("fixed", "free") if self.spec.seed % 2 else ("1", "0")
        rows = [[self.joint(j), *[held[0 if v else 1] for v in (s.x, s.y, s.rotation)]] for j, s in
                self.frame.supports.items()]  # fmt: skip
        heads = [(self.word("joint"), ""), *[(h, "") for h in ("X", "Y", "Rotation")]]
        out += self.table("Supports", heads, rows)
        rows = [[x.name, ("echo", x.I * (metre / self.small) ** 4), ("echo", x.A * (metre / self.small) ** 2)]
                for x in self.frame.sections.values()]  # fmt: skip
        out += self.table("Sections", [("Section", ""), ("I", "I"), ("A", "A")], rows)
        rows = []
        for case in self.frame.cases:
            total = -self.in_units(self.answer.cases[case].reactions[:, :2].sum(axis=0), "force")
            rows.append([case, *[("echo", v) for v in total]])
        return out + self.table("Load totals", [("Case", ""), ("Fx", "force"), ("Fy", "force")], rows)

    # -- text

    def text(self, cases: list[str]) -> str:
        s = self.spec
        out: list[str] = []
        if s.noise:
            out += [f"Analysis of frame {s.frame}", "Printed 2024-05-17 10:32   page 1", ""]
        if s.heads == "units stated":
            w = self.unit_words
            out += [f"Forces in {w['force']}, moments in {w['moment']}, displacements in {w['length']}, "
                    f"rotations in {w['angle']}, "
                    f"distances in {w['arm']}", ""]  # fmt: skip
        if s.special == "face" and s.seed % 2:
            out += ["Forces at the face of supports", ""]
        if s.special in ("echo", "divided"):
            out += self.echo_tables()
        makers = {"member": self.member_table, "reactions": self.reaction_table, "displacements": self.displacement_table}
        titles = {
            "member": {"ends": "Member end forces", "both": "Member end forces", "block": "Member end forces",
                       "stations": "Forces along members", "extremes": "Largest and smallest member forces"}[s.layout],
            "reactions": "Support reactions", "displacements": "Joint displacements",
        }  # fmt: skip
        for table in ("member", *s.tables):
            if s.cases.endswith("column"):
                parts = [(case, makers[table](case)) for case in cases]
                heads = [(self.word("case"), ""), *parts[0][1][0]]
                rows = [[case, *row] for case, (_, body) in parts for row in body]
                out += self.table(titles[table], heads, rows)
            else:
                for case in cases:
                    if s.cases != "option":
                        out += [(f"Load case: {case}", f"LC {case}", f"Results for {case}")[s.seed % 3], ""]
                    out += self.table(titles[table], *makers[table](case))
        if s.noise:
            out += ["", "End of results"]
        return "\n".join(out) + "\n"

    def table(self, title: str, heads: list[tuple[str, str]], rows: list[list[Any]]) -> list[str]:
        s = self.spec
        out = [title] if s.noise or s.seed % 2 or title.startswith("Joint") else []
        cells = self._cells(heads, rows)
        head_lines = self._head_lines(heads)
        lines = self._lay(head_lines, cells)
        head_count = len(head_lines)
        if s.separator == "bar":
            lines.insert(head_count, "|" + "|".join("---" for _ in heads) + "|")
            head_count += 1
        elif s.separator in ("aligned", "single blanks") and s.noise:
            lines.insert(head_count, "-" * 60)
            head_count += 1
        if s.noise and len(lines) > 14 and s.separator != "bar":
            middle = lines[:head_count]
            lines[12:12] = ["", "page 2", *middle]
        if s.noise and title.startswith("Support"):
            lines.append(self._lay_total(heads, rows))
        return [*out, *lines, ""]

    def _lay_total(self, heads: list[tuple[str, str]], rows: list[list[Any]]) -> str:
        return {"tab": "\t", "comma": ",", "semicolon": ";", "bar": "|"}.get(self.spec.separator, "  ").join(
            ["Total", *["1.00" for _ in heads[1:]]]
        )

    def _cells(self, heads: list[tuple[str, str]], rows: list[list[Any]]) -> list[list[str]]:
        s = self.spec
        kinds = [k for _, k in heads]
        decimals, largest = {}, {}
        for j, kind in enumerate(kinds):
            if kind:
                same = [i for i, k in enumerate(kinds) if k == kind]
                column = np.array([_plain(row[i]) for row in rows for i in same], dtype=float)
                decimals[j] = decimals_for(column, s.digits)
                largest[j] = float(np.nanmax(np.abs(column), initial=0.0))
        out = []
        for row in rows:
            line = []
            for j, cell in enumerate(row):
                if not kinds[j]:
                    line.append(str(cell))
                    continue
                value = _plain(cell)
                if not isinstance(cell, tuple) and np.isfinite(value):
                    value = self._maybe_plant(value, largest[j])
                    self.values += 1
                unit = self.unit_words[kinds[j]] if " " not in self.unit_words[kinds[j]] else ""
                at_exponent = "fixed" if isinstance(cell, tuple) and s.writing == "exponent" else s.writing
                places = decimals[j] if not (isinstance(cell, tuple) and cell[0] != "zero") else decimals[j] + 2
                line.append(number(value, places, at_exponent, unit if s.heads != "units stated" else ""))
            out.append(line)
        return out

    def _maybe_plant(self, value: float, largest: float) -> float:
        """The one error of this paste: another sign, a digit dropped, or a size far beyond tolerance."""
        if not self.plant or self.values != self.planting:
            return value
        wrong = {"sign": -value, "tenth": value / 10, "more": value * 1.3, "ten": value * 10}[self.plant]
        self.planted = f"{value:.6g} -> {wrong:.6g}"
        return wrong

    def _head_lines(self, heads: list[tuple[str, str]]) -> list[list[str]]:
        w = self.unit_words
        if self.spec.heads == "bracket units":
            left, right = (("[", "]"), ("(", ")"))[self.spec.seed % 2]
            return [[f"{h} {left}{w[u]}{right}" if u else h for h, u in heads]]
        if self.spec.heads == "unit line":
            return [[h for h, _ in heads], [(f"[{w[u]}]" if u else "") for _, u in heads]]
        return [[h for h, _ in heads]]

    def _lay(self, heads: list[list[str]], cells: list[list[str]]) -> list[str]:
        lines = [*heads, *cells]
        separator = self.spec.separator
        if separator == "aligned":
            widths = [max(len(line[j]) for line in lines) + 2 for j in range(len(lines[0]))]
            return ["".join(c.ljust(w) if j == 0 else c.rjust(w) for j, (c, w) in enumerate(zip(line, widths,
            strict=True))).rstrip()
                    for line in lines]  # fmt: skip
        if separator == "single blanks":
            return [" ".join(c for c in line if c) for line in lines]
        if separator == "bar":
            return ["| " + " | ".join(line) + " |" for line in lines]
        mark = {"tab": "\t", "comma": ",", "semicolon": ";"}[separator]
        return [mark.join(line) for line in lines]


def _plain(cell: Any) -> float:
    return float(cell[1]) if isinstance(cell, tuple) else float(cell)


def make(seed: int, plant: str = "") -> Paste:
    """The paste of a seed, right in every value, or with one planted error."""
    spec = draw(seed)
    maker = Maker(spec, plant)
    every = list(maker.frame.names)
    cases = every if spec.cases.startswith("several") else [every[seed % len(every)]]
    if plant:
        count = Maker(spec)
        count.text(cases)
        maker.planting = _worth(spec, cases, count.values)
    text = maker.text(cases)
    encoding = {"crlf": "utf-8"}.get(spec.encoding, spec.encoding)
    if spec.encoding == "crlf":
        text = text.replace("\n", "\r\n")
    try:
        data = text.encode(encoding)
    except UnicodeEncodeError:
        data = text.encode("utf-8")
    case = cases[0] if spec.cases == "option" else None
    return Paste(spec, data, ReadingOptions(), case, maker.values, maker.planted, maker.fixed)


def _worth(spec: Spec, cases: list[str], count: int) -> int:
    """A value large enough that an error in it lies beyond tolerance: the one drawn, or the next that is."""

    class Sizes(Maker):
        def _maybe_plant(self, value: float, largest: float) -> float:
            shares.append(abs(value) / largest if largest else 0.0)
            return value

    shares: list[float] = []
    Sizes(spec).text(cases)
    start = Random(f"plant {spec.seed}").randrange(count)
    order = [(start + k) % count for k in range(count)]
    return next(k for k in order if shares[k] >= 0.3)


@dataclass(frozen=True)
class Outcome:
    verdict: str
    compared: int
    closed: Any
    comparisons: Any
    facts: tuple[str, ...] = ()


def judge(paste: Paste) -> Outcome:
    """The verdict on the paste, as `verify` gives it where the opinions agree."""
    k = known(paste.spec.frame)
    try:
        reading = read_claim_text(decode(paste.data), k.names, paste.options)
    except UnusableInput as refused:
        return Outcome("refused", 0, replace(EMPTY, undecided=(str(refused),)), ())
    closed = close(reading, k.frame, k.answers, paste.case, CLAIM)
    cases = k.comparison.judge(closed)
    facts = [f for f in compared(Subject(k.frame), reading.echo) if f.grade == "serious"] if reading.echo else []
    verdicts = [c.verdict for c in cases]
    if closed.undecided or closed.foreign or not cases:
        verdicts.append("undecided")
    if closed.reversed_load:
        verdicts.append("disagree")
    return Outcome(worst(verdicts), sum(c.compared for c in cases), closed, cases, tuple(map(str, facts)))


def is_right(paste: Paste, outcome: Outcome) -> bool:
    """Every printed value read, compared and found to agree, and every table of input that of the frame."""
    return not outcome.facts and outcome.verdict == "agree" and outcome.compared + _coarse(outcome) == paste.values


def _coarse(outcome: Outcome) -> int:
    return sum(1 for c in outcome.comparisons for _, why in c.not_compared)


EMPTY = ClosedClaim("", "", 0, (), ())
PLANTS = ("sign", "tenth", "more", "ten")


@dataclass
class Tally:
    """Counts of many pastes: right and drawn by property (of those that three values fix), verdicts of all."""

    right: Counter[str] = field(default_factory=Counter)
    drawn: Counter[str] = field(default_factory=Counter)
    verdicts: Counter[str] = field(default_factory=Counter)
    planted: Counter[str] = field(default_factory=Counter)
    failures: list[str] = field(default_factory=list)

    def add(self, seed: int, plant: bool) -> None:
        paste = make(seed)
        outcome = judge(paste)
        ok = is_right(paste, outcome)
        s = paste.spec
        told = "fixed" if paste.fixed else "not fixed by three values"
        self.verdicts[f"{told}: {'right' if ok else outcome.verdict + ' (not right)'}"] += 1
        if paste.fixed:
            for key in (f"layout {s.layout}", f"separator {s.separator}", f"writing {s.writing}", f"heads {s.heads}",
                        f"cases {s.cases}", f"names {s.names}", f"units {s.units}", f"encoding {s.encoding}",
                        f"noise {s.noise}", f"spatial {s.spatial}", f"special {s.special or 'none'}"):  # fmt: skip
                self.drawn[key] += 1
                self.right[key] += ok
        if not ok and (paste.fixed or outcome.verdict != "undecided"):
            self.failures.append(
                f"{seed} {outcome.verdict} {outcome.compared}/{paste.values} {s.layout}, {s.separator}, {s.writing}, "
                f"{s.heads}, "
                f"{s.cases}, {s.names}, {s.special}: {outcome.closed.undecided[:2]} {outcome.closed.not_understood[:1]} "
                f"{outcome.facts[:2]}"
            )
        if plant and ok:
            kind = PLANTS[seed % len(PLANTS)]
            wrong = make(seed, kind)
            found = judge(wrong).verdict
            self.planted[found] += 1
            if found == "agree":
                self.failures.append(
                    f"{seed} planted {kind} {wrong.planted} absorbed: {s.layout}, {s.separator}, {s.cases}"
                )


def main() -> None:
    count = int(sys.argv[1]) if len(sys.argv) > 1 else 300
    first = int(sys.argv[2]) if len(sys.argv) > 2 else 0
    tally = Tally()
    for seed in range(first, first + count):
        tally.add(seed, plant=True)
    print("\n".join(tally.failures))
    for key in sorted(tally.drawn):
        print(f"{key:<28} {tally.right[key]:>5} of {tally.drawn[key]:>5}")
    print(dict(tally.verdicts), "planted:", dict(tally.planted), sep="\n")


if __name__ == "__main__":
    main()
