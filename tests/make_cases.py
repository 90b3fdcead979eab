"""Writes the claims in cases/, right ones and wrong ones: `python -m tests.make_cases`.

A right claim holds the frame's own results; a wrong one those of the frame with one mistake in it, really made in the
frame file and really solved (or one slip of the pen in the printout). Each is printed in a layout of its own.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, field
from math import isnan, log10
from pathlib import Path

import numpy as np

from crosscheck.answer import AXIAL, MOMENT, SHEAR, Answer
from crosscheck.check import ask
from crosscheck.compare.opinions import extremes
from crosscheck.frame.model import Frame
from crosscheck.frame.reader import read_frame_text
from crosscheck.frame.stations import stations
from crosscheck.frame.units import convert, parse_unit

CASES = Path(__file__).parents[1] / "cases"

Row = list[str]
END_COLUMNS = {"N": AXIAL, "V": SHEAR, "M": MOMENT}


@dataclass
class Table:
    """One printed table: lines above it, heads, and rows of text."""

    above: list[str]
    heads: Row
    rows: list[Row]


@dataclass(frozen=True)
class Printing:
    """How results are printed: units by quantity, digits of the largest value, and signs (-1 reverses a quantity)."""

    force: str = "kN"
    moment: str = "kNm"
    move: str = "mm"
    turn: str = "mrad"
    digits: int = 4
    axial: int = 1
    shear: int = 1
    bending: int = 1
    pull: int = 1

    def column(self, values: Iterable[float], unit: str, frame: Frame, sign: int = 1) -> Row:
        """Values of the frame's units in `unit`, all with the decimals that give the largest one its digits."""
        out = [sign * v * _factor(unit, frame) for v in values]
        largest = max((abs(v) for v in out if not isnan(v)), default=1.0)
        decimals = max(0, self.digits - 1 - int(np.floor(log10(largest)))) if largest > 1e-9 else 2
        return ["" if isnan(v) else f"{v:.{decimals}f}".replace("-0." + "0" * decimals, "0." + "0" * decimals)
                for v in out]  # fmt: skip


def _factor(unit: str, frame: Frame) -> float:
    """Size of the frame's own unit of the same dimension in `unit`."""
    u = parse_unit(unit)
    d = u.dimension
    own = parse_unit(frame.units.force), parse_unit(frame.units.length)
    size = float(own[0].factor) ** d.force * float(own[1].factor) ** d.length
    return convert(1.0, u, u) * size / float(u.factor)


@dataclass(frozen=True)
class Results:
    """The results to be printed."""

    frame: Frame
    answer: Answer
    printing: Printing

    @classmethod
    def of(cls, text: str, printing: Printing) -> Results:
        frame = read_frame_text(text, folder=CASES)
        opinions = ask(frame)
        assert opinions.verdict == "agree"
        return cls(frame, opinions.answers["slope-deflection"], printing)

    def ends(self, case: str, wanted: str = "NVM") -> list[tuple[str, str, Row]]:
        """(member, joint, values) by member end."""
        p = self.printing
        units = {"N": p.force, "V": p.force, "M": p.moment}
        signs = {"N": p.axial, "V": p.shear, "M": p.bending}
        values = self.answer.cases[case].ends
        columns = [p.column(values[:, :, END_COLUMNS[q]].ravel(), units[q], self.frame, signs[q]) for q in wanted]
        places = [(m.name, j) for m in self.frame.members.values() for j in (m.joint_from, m.joint_to)]
        return [(m, j, [c[k] for c in columns]) for k, (m, j) in enumerate(places)]

    def reactions(self, case: str) -> list[tuple[str, Row]]:
        p, joints = self.printing, list(self.frame.supports)
        values = self.answer.cases[case].reactions[[self.frame.joint_index[j] for j in joints]]
        units = p.force, p.force, p.moment
        columns = [p.column(values[:, k], units[k], self.frame, p.pull) for k in range(3)]
        return [(j, [c[k] for c in columns]) for k, j in enumerate(joints)]

    def moves(self, case: str) -> list[tuple[str, Row]]:
        p = self.printing
        values = self.answer.cases[case].joints
        units = p.move, p.move, p.turn
        columns = [p.column(values[:, k], units[k], self.frame) for k in range(3)]
        return [(j, [c[k] for c in columns]) for k, j in enumerate(self.frame.joints)]

    def along(self, case: str) -> list[tuple[str, str, Row]]:
        """(member, distance, N V M) at the tenths of each member."""
        p, length = self.printing, self.frame.member_table.length
        members = np.repeat(np.arange(len(length)), 11)
        x = np.tile(np.arange(11) / 10, len(length)) * length[members]
        side = np.where(np.tile(np.arange(11), len(length)) < 10, 1, -1)
        values = self.answer.spans.along(case, members, x, side)
        units = p.force, p.force, p.moment
        columns = [p.column(values[:, k], units[k], self.frame) for k in range(3)]
        names = list(self.frame.members)
        at = [f"{v:.3f}" for v in x]
        return [(names[m], at[k], [c[k] for c in columns]) for k, m in enumerate(members.tolist())]

    def envelope_ends(self, name: str) -> list[tuple[str, str, list[Row], list[Row]]]:
        """(member, joint, greatest and least N V M, and for each of the two and of the three what governs)."""
        p, names = self.printing, self.frame.meant(name)
        stack = np.stack([self.answer.cases[n].ends for n in names])
        units, signs = (p.force, p.force, p.moment), (p.axial, p.shear, p.bending)
        printed = stack * np.array(signs)
        by = printed.argmax(axis=0), printed.argmin(axis=0)
        most = [np.take_along_axis(printed, w[None], 0)[0].reshape(-1, 3) for w in by]
        columns = [[p.column(values[:, q], units[q], self.frame) for q in range(3)] for values in most]
        places = [(m.name, j) for m in self.frame.members.values() for j in (m.joint_from, m.joint_to)]
        flat = [w.reshape(-1, 3) for w in by]
        return [
            (m, j, [[c[k] for c in columns[b]] for b in (0, 1)], [[names[flat[b][k, q]] for q in range(3)] for b in (0, 1)])
            for k, (m, j) in enumerate(places)
        ]

    def envelope_along(self, name: str) -> list[tuple[str, str, list[str]]]:
        """(member, distance, greatest M, what governs it, least M, what governs it) at the tenths of each member."""
        p, length, names = self.printing, self.frame.member_table.length, self.frame.meant(name)
        members = np.repeat(np.arange(len(length)), 11)
        x = np.tile(np.arange(11) / 10, len(length)) * length[members]
        side = np.where(np.tile(np.arange(11), len(length)) < 10, 1, -1)
        stack = np.stack([self.answer.spans.along(n, members, x, side)[:, MOMENT] for n in names])
        most = [p.column(values, p.moment, self.frame) for values in (stack.max(axis=0), stack.min(axis=0))]
        by = stack.argmax(axis=0), stack.argmin(axis=0)
        keys = list(self.frame.members)
        return [
            (keys[m], f"{x[k]:.3f}", [most[0][k], names[by[0][k]], most[1][k], names[by[1][k]]])
            for k, m in enumerate(members.tolist())
        ]

    def extremes(self, case: str) -> list[tuple[str, Row]]:
        """(member, greatest and least V, greatest and least M)."""
        p = self.printing
        found = extremes(self.answer, case, stations(self.frame))
        columns = [p.column(found[:, end, q], unit, self.frame)
                   for q, unit in ((SHEAR, p.force), (MOMENT, p.moment)) for end in (1, 0)]  # fmt: skip
        return [(m, [c[k] for c in columns]) for k, m in enumerate(self.frame.members)]


# --- layouts: results to tables


Layout = Callable[[Results, Sequence[str]], list[Table]]


def member_ends(r: Results, cases: Sequence[str]) -> list[Table]:
    """A table a case, one row a member end."""
    p = r.printing
    heads = ["Member", "Joint", f"Axial ({p.force})", f"Shear ({p.force})", f"Moment ({p.moment})"]
    return [Table([f"Load case: {c}"], heads, [[m, j, *v] for m, j, v in r.ends(c)]) for c in cases]


def moments_only(r: Results, cases: Sequence[str]) -> list[Table]:
    """One table for all cases: the end moments, with a column for the case."""
    rows = [[c, m, j, *v] for c in cases for m, j, v in r.ends(c, "M")]
    return [Table([], ["Case", "Member", "Joint", f"M [{r.printing.moment}]"], rows)]


def axial_and_moment(r: Results, cases: Sequence[str]) -> list[Table]:
    """One table for all cases: axial force and moment of each end."""
    p = r.printing
    rows = [[c, m, j, *v] for c in cases for m, j, v in r.ends(c, "NM")]
    return [Table([], ["Case", "Member", "Joint", f"N [{p.force}]", f"M [{p.moment}]"], rows)]


def both_ends_in_a_row(r: Results, cases: Sequence[str]) -> list[Table]:
    """A table a case, one row a member: the values of its start, then those of its end."""
    p = r.printing
    units = {"N": p.force, "V": p.force, "M": p.moment}
    heads = ["Member", *(f"{q} {end} ({units[q]})" for end in ("start", "end") for q in "NVM")]
    tables = []
    for c in cases:
        ends = r.ends(c)
        rows = [[a[0], *a[2], *b[2]] for a, b in zip(ends[::2], ends[1::2], strict=True)]
        tables.append(Table([f"Case {c}"], heads, rows))
    return tables


def reactions(r: Results, cases: Sequence[str]) -> list[Table]:
    """One table for all cases."""
    p = r.printing
    rows = [[c, j, *v] for c in cases for j, v in r.reactions(c)]
    return [Table(["Reactions"], ["Case", "Support", f"Fx [{p.force}]", f"Fy [{p.force}]", f"M [{p.moment}]"], rows)]


def displacements(r: Results, cases: Sequence[str]) -> list[Table]:
    """One table for all cases."""
    p = r.printing
    heads = ["Case", "Joint", f"dx [{p.move}]", f"dy [{p.move}]", f"rotation [{p.turn}]"]
    return [Table(["Displacements"], heads, [[c, j, *v] for c in cases for j, v in r.moves(c)])]


def stations_along(r: Results, cases: Sequence[str]) -> list[Table]:
    """A table a case: values at the tenths of each member."""
    p = r.printing
    heads = ["Member", f"x [{r.frame.units.length}]", f"N [{p.force}]", f"V [{p.force}]", f"M [{p.moment}]"]
    return [Table([f"Load case: {c}"], heads, [[m, x, *v] for m, x, v in r.along(c)]) for c in cases]


def extremes_only(r: Results, cases: Sequence[str]) -> list[Table]:
    """A table a case: greatest and least shear and moment of each member."""
    p = r.printing
    heads = ["Member", *(f"{w} {q} ({u})" for q, u in (("V", p.force), ("M", p.moment)) for w in ("max", "min"))]
    return [Table([f"Load case: {c}"], heads, [[m, *v] for m, v in r.extremes(c)]) for c in cases]


def envelope_ends(r: Results, cases: Sequence[str]) -> list[Table]:
    """A table an envelope: two rows a member end, the greatest and the least moment and shear, each with what governs."""
    p = r.printing
    heads = ["Member", "Joint", "Max/min", f"M ({p.moment})", "Combination", f"V ({p.force})", "Combination"]
    return [
        Table([f"Envelope {c}"], heads,
              [[m, j, which, values[b][2], by[b][2], values[b][1], by[b][1]]
               for m, j, values, by in r.envelope_ends(c) for b, which in enumerate(("max", "min"))])
        for c in cases
    ]  # fmt: skip


def envelope_along(r: Results, cases: Sequence[str]) -> list[Table]:
    """A table an envelope: greatest and least moments at the tenths of each member, each with what governs it."""
    p = r.printing
    extremes = [head for which in ("max", "min") for head in (f"M {which} [{p.moment}]", "governing")]
    heads = ["Member", f"x [{r.frame.units.length}]", *extremes]
    return [Table([f"Envelope: {c}"], heads, [[m, x, *v] for m, x, v in r.envelope_along(c)]) for c in cases]


def together(*layouts: Layout) -> Layout:
    """Several tables one after another."""
    return lambda r, cases: [table for layout in layouts for table in layout(r, cases)]


# --- writing: tables to text


def aligned(table: Table) -> list[str]:
    widths = [max(len(row[k]) for row in [table.heads, *table.rows]) for k in range(len(table.heads))]
    numbers = [any(c.isdigit() for c in table.rows[0][k]) and "." in table.rows[0][k] for k in range(len(widths))]

    def line(row: Row) -> str:
        cells = (c.rjust(w) if n else c.ljust(w) for c, w, n in zip(row, widths, numbers, strict=True))
        return "   ".join(cells).rstrip()

    return [line(table.heads), *(line(row) for row in table.rows)]


def separated(mark: str) -> Callable[[Table], list[str]]:
    return lambda table: [mark.join(row) for row in [table.heads, *table.rows]]


def decimal_commas(table: Table) -> list[str]:
    return [";".join(c.replace(".", ",") for c in row) for row in [table.heads, *table.rows]]


def bars(table: Table) -> list[str]:
    rule = ["---"] * len(table.heads)
    return ["| " + " | ".join(row) + " |" for row in [table.heads, rule, *table.rows]]


# --- the claims


@dataclass(frozen=True)
class Claim:
    """One claim file. cases: those printed, in their order.

    expect: as in the first line of a wrong one. change: (old, new) texts of the frame file that make the mistake.
    slip: what the pen does to the tables.
    """

    file: str
    shows: str
    layout: Layout
    cases: tuple[str, ...]
    write: Callable[[Table], list[str]] = aligned
    printing: Printing = field(default_factory=Printing)
    expect: str = ""
    change: tuple[tuple[str, str], ...] = ()
    slip: Callable[[list[Table]], None] | None = None

    @property
    def frame(self) -> str:
        return self.file.split(".")[0]

    def text(self) -> str:
        toml = (CASES / f"{self.frame}.toml").read_text(encoding="utf-8")
        for old, new in self.change:
            assert toml.count(old) == 1, (self.file, old)
            toml = toml.replace(old, new)
        tables = self.layout(Results.of(toml, self.printing), self.cases)
        if self.slip:
            self.slip(tables)
        lines = [f"# expect: {self.expect}"] if self.expect else []
        lines.append(f"# {self.shows}")
        for table in tables:
            lines += ["", *table.above, *self.write(table)]
        return "\n".join(lines) + "\n"


def renamed(old: str, new: str) -> Callable[[list[Table]], None]:
    """The results of one case printed below the name of another."""

    def slip(tables: list[Table]) -> None:
        for table in tables:
            table.above = [line.replace(old, new) for line in table.above]
            table.rows = [[new if c == old else c for c in row] for row in table.rows]

    return slip


def digits_swapped(member: str, joint: str) -> Callable[[list[Table]], None]:
    """The first two digits of a member's end moment change places."""

    def slip(tables: list[Table]) -> None:
        row = next(row for row in tables[0].rows if member in row and joint in row)
        digits = [k for k, c in enumerate(row[-1]) if c.isdigit()][:2]
        text = list(row[-1])
        text[digits[0]], text[digits[1]] = text[digits[1]], text[digits[0]]
        assert "".join(text) != row[-1]
        row[-1] = "".join(text)

    return slip


def signs_turned(member: str) -> Callable[[list[Table]], None]:
    """All of one member's values with the other sign."""

    def slip(tables: list[Table]) -> None:
        for row in (row for table in tables for row in table.rows if row[0] == member):
            row[2:] = [c[1:] if c.startswith("-") else f"-{c}" for c in row[2:]]

    return slip


def in_centimetres(tables: list[Table]) -> None:
    """Moments that were worked out in kN cm stand below a head that says kNm."""
    for row in (row for table in tables for row in table.rows):
        row[-1] = f"{float(row[-1]) * 100:.1f}"


KIP = Printing(force="kip", moment="kip ft", move="in", turn="mrad", digits=4)
FULL = together(member_ends, reactions, displacements)
TAB, COMMA = separated("\t"), separated(",")

CLAIMS = (
    Claim("hall.claim.txt", "Right: two combinations in full, three kinds of table in one paste, aligned by blanks.",
          FULL, ("strength", "sway_right")),
    Claim("hall.reactions.claim.csv", "Right: nothing but reactions, of every case and combination.", reactions,
          ("dead", "imposed", "snow", "wind", "strength", "sway_right", "sway_left"), COMMA),
    Claim("hall.foot.claim.txt", "Wrong: the foot B0 was analysed as pinned; the printout is complete.",
          together(member_ends, reactions), ("sway_right",), expect="disagree, support B0",
          change=(('feet = "fixed"\n', 'feet = "fixed"\n\n[supports]\nB0 = "pinned"\n'),)),
    Claim("hall.factor.claim.csv", "Wrong: the combination was made up without its snow; the snow by itself is right.",
          reactions, ("snow", "strength"), COMMA, expect="disagree, load case",
          change=(("imposed = 1.5, snow = 0.75", "imposed = 1.5"),)),
    Claim("carpark.claim.tsv", "Right: a long printout of 336 rows with tabs, and the reactions after it.",
          together(member_ends, reactions), ("sway",), TAB, Printing(digits=5)),
    Claim("carpark.weight.claim.tsv", "Wrong: the self weight was taken twice.", together(member_ends, reactions),
          ("gravity",), TAB, expect="disagree, load dead[0]", change=(("self_weight = 1.0", "self_weight = 2.0"),)),
    Claim("canopy.claim.csv", "Right: displacements only, in mm and mrad where the frame is in m.", displacements,
          ("dead", "snow", "drift", "wind", "winter", "storm"), COMMA),
    Claim("canopy.wind.claim.txt", "Wrong: on the roof the wind presses where it should lift.",
          together(member_ends, reactions), ("wind",), expect="disagree, load wind[0]",
          change=(("uniform = 3.6", "uniform = -3.6"),)),
    Claim("shed.claim.md", "Right: both ends of a member in one row, between vertical bars.", both_ends_in_a_row,
          ("winter", "storm"), bars),
    Claim("shed.snow.claim.md", "Wrong: the snow was spread over the length of the rafters, not over its projection.",
          both_ends_in_a_row, ("snow",), bars, expect="disagree, load snow[0]",
          change=((', direction = "down", per = "projection"', ', direction = "down"'),)),
    Claim("shed.eaves.claim.txt", "Wrong: the left eaves were taken to be rigid; only the displacements tell which.",
          together(member_ends, displacements), ("winter",),
          expect="disagree, end release rafter_left", change=((', spring_from = "16000 kN m/rad"', ""),)),
    Claim("gantry.claim.txt", "Right: in kN and m where the frame is in N and mm, and with other signs, which the "
          "printout does not state.", together(member_ends, reactions), ("working", "summer"),
          printing=Printing(axial=-1, bending=-1)),
    Claim("gantry.sun.claim.txt", "Wrong: the sun on the beam was left out, the warm air was not.",
          together(member_ends, reactions), ("summer",), expect="disagree, load warm[1]",
          change=(('  { member = "B-C", difference = -18 },\n', ""),)),
    Claim("trestle.claim.tsv", "Right: values at the tenths of every member.", stations_along,
          ("service", "winter"), TAB),
    Claim("trestle.hinge.claim.txt", "Wrong: the hinge of the cap was forgotten.", member_ends, ("service",),
          expect="disagree, end release member cap", change=((', hinge = "to" }', " }"),)),
    Claim("trestle.level.claim.txt", "Wrong: the uphill foot was set 0.6 m too low.", member_ends,
          ("dead", "car", "creep", "wind"), expect="disagree, geometry B",
          change=(("B = [4.8, 1.9]", "B = [4.8, 1.3]"),)),
    Claim("stair.claim.csv", "Right: semicolons between the cells and commas in the numbers.",
          together(member_ends, reactions), ("full", "full_packed"), decimal_commas),
    Claim("stair.digits.claim.csv", "Wrong: two digits of one end moment changed places in the typing.", member_ends,
          ("full",), COMMA, expect="disagree, transcription landing", slip=digits_swapped("landing", "B")),
    Claim("footbridge.claim.txt", "Right: extremes of each span, and reactions, in kip and ft.",
          together(extremes_only, reactions), ("dead", "crowd", "queue", "opening_day"), printing=KIP),
    Claim("footbridge.pier.claim.txt", "Wrong: the settlement of pier C was left out.",
          together(member_ends, reactions), ("long_term",), printing=KIP, expect="disagree, load settled[0]",
          change=(('{ down = "0.75 in" }', '{ down = "0 in" }'),)),
    Claim("footbridge.case.claim.csv", "Wrong: the results of the queue were pasted for those of the crowd.",
          member_ends, ("queue",), COMMA, KIP, expect="disagree, load case", slip=renamed("queue", "crowd")),
    Claim("culvert.claim.tsv", "Right: member ends at the joints of a frame with rigid zones.", member_ends,
          ("earth", "lorry", "full"), TAB),
    Claim("culvert.wall.claim.tsv", "Wrong: the walls' I slipped by a decimal place.", member_ends, ("full",), TAB,
          expect="disagree, stiffness wall", change=(('I = "1.333e-3 m^4"', 'I = "1.333e-4 m^4"'),)),
    Claim("anchorage.claim.csv", "Right: everything, with five digits.", FULL, ("pull",), COMMA, Printing(digits=5)),
    Claim("anchorage.shear.claim.csv", "Wrong for this frame: shear deformation was neglected.", FULL, ("pull",), COMMA,
          expect="disagree, idealisation", change=(('[analysis]\nshear = "elastic"', '[analysis]\nshear = "rigid"'),)),
    Claim("kiosk.claim.txt", "Right, and only part of the whole: end moments with three digits.", moments_only,
          ("roof", "wind", "both"), printing=Printing(digits=3)),
    Claim("kiosk.units.claim.csv", "Wrong: the moments are in kN cm, whatever their head says.", member_ends, ("both",),
          COMMA, Printing(axial=1), expect="disagree, units", slip=in_centimetres),
    Claim("bridge.claim.csv", "Right: axial forces and moments of one combination.", axial_and_moment, ("full",),
          COMMA),
    Claim("bridge.chords.claim.csv", "Wrong for this frame: the members were taken to keep their length.",
          together(axial_and_moment, displacements), ("full",), COMMA, expect="disagree, idealisation",
          change=(('[analysis]\naxial = "elastic"', '[analysis]\naxial = "rigid"'),)),
    Claim("bridge.post.claim.csv", "Wrong: a post was left out of the model.",
          together(axial_and_moment, displacements), ("full",), COMMA, expect="disagree, geometry L3-U3",
          change=(('"L3-U3" = { section = "post", material = "steel" }\n', ""),)),
    Claim("counterweight.claim.txt", "Right: reactions in kN and kNm where the frame is in kN and mm; displacements.",
          together(reactions, displacements), ("working", "as_built")),
    Claim("counterweight.sign.claim.txt", "Wrong: one member's results have the other sign, as when it was drawn from "
          "its far end.", member_ends, ("working",), expect="disagree, signs C-D", slip=signs_turned("C-D")),
    Claim("wall.claim.md", "Right: with vertical bars, each case below its own title.",
          together(member_ends, reactions), ("closed", "overhaul"), bars),
    Claim("wall.water.claim.md", "Wrong: the water was taken to stand over the whole height of the wall.",
          together(member_ends, reactions), ("water",), bars, expect="disagree, load water[0]",
          change=((', direction = "right", end = 2.0', ', direction = "right"'),)),
    Claim("depot.claim.tsv", "Right: an envelope by member ends, each value with the combination that governs it.",
          envelope_ends, ("uls",), TAB),
    Claim("depot.patterns.claim.tsv", "Wrong: the imposed load was on all spans only, its arrangements left out.",
          envelope_ends, ("uls",), TAB, expect="disagree, load imposed",
          change=(('["all", "alternate", "adjacent"]', '["all"]'),)),
    Claim("causeway.claim.txt", "Right: an envelope along the spans, aligned by blanks, with what governs.",
          envelope_along, ("uls",)),
    Claim("causeway.adjacent.claim.txt", "Wrong: no two spans side by side were loaded alone.",
          envelope_along, ("uls",), expect="disagree, load crowd",
          change=(('[patterns.crowd]', '[patterns.crowd]\narrangements = ["all", "alternate"]'),)),
    Claim("depot.cracked.claim.txt", "Wrong: the gross sections were used where the frame says cracked ones.", together(
          member_ends, reactions), ("windy (wind_left)",), expect="disagree, stiffness",
          change=(("concrete_beam = { I = 0.35 }\nconcrete_column = { I = 0.7 }",
                   "concrete_beam = { I = 1.0 }\nconcrete_column = { I = 1.0 }"),)),
    Claim("workshop.claim.txt", "Right: second order by combination, haunches, bases softer in the ultimate state.",
          together(both_ends_in_a_row, reactions), ("winter", "in_use")),
    Claim("workshop.haunch.claim.txt", "Wrong: the haunches were left out.", together(member_ends, reactions), ("in_use",),
          expect="disagree, stiffness", change=(
              ('[["haunch", "rafter"], "18%"], ["rafter", "100%"]', '["rafter", "100%"]'),
              ('["rafter", "82%"], [["rafter", "haunch"], "100%"]', '["rafter", "100%"]'))),
    Claim("workshop.bases.claim.txt", "Wrong: the stiffness of the bases in use was taken for the ultimate state.",
          together(member_ends, reactions, displacements), ("storm",), expect="disagree, support",
          change=(("A = { rotation = 0.4 }\nE = { rotation = 0.4 }", "A = { rotation = 1.0 }\nE = { rotation = 1.0 }"),)),
    Claim("rack.claim.csv", "Right: rods that pull only, a leaning line that is tied, second order.",
          together(member_ends, reactions), ("working", "storm"), COMMA),
    Claim("rack.lean.claim.txt", "Wrong: the lean of the posts was left out.", together(member_ends, reactions),
          ("working",), expect="disagree, load", change=(
              ("working = { dead = 1.35, full = 1.5, anchor = 1.35, lean = 0.005, order = 2 }",
               "working = { dead = 1.35, full = 1.5, anchor = 1.35, order = 2 }"),)),
    Claim("rack.prop.claim.txt", "Wrong: the loose prop was taken to hold the beam down too.",
          together(member_ends, reactions), ("empty",), expect="disagree, support P",
          change=(('P = { y = "push" }', 'P = { y = "held" }'),)),
    Claim("causeway.springs.claim.txt", "Wrong: the piers' stiffness for passing loads was taken for lasting ones.",
          together(member_ends, reactions, displacements), ("lasting",), expect="disagree, support",
          change=(("B = { y = 0.5 }\nC = { y = 0.5 }\nD = { y = 0.5 }\n", ""),)),
)  # fmt: skip


def main() -> None:
    """Write every claim."""
    for claim in CLAIMS:
        (CASES / claim.file).write_text(claim.text(), encoding="utf-8", newline="\n")


if __name__ == "__main__":
    main()
