"""A generator of pastes that are envelopes: greatest and least results over several combinations, as people print them.

Frames of the week with envelopes (drawn ones, the depot and the causeway); every paste is drawn from a seed: what it
holds, pairs of rows or columns, governing combinations or none, separator, number writing, units, signs, how the envelope
is named. What is printed is worked out here from each case by itself, in the paste's own signs, and only then made an
envelope; nothing of crosscheck.claims or crosscheck.compare makes a paste. `python -m tests.paste_envelopes 300` gives
the figures by layout.
"""

from __future__ import annotations

import sys
from collections import Counter
from dataclasses import dataclass, field
from functools import cache
from random import Random

import numpy as np

from crosscheck.answer import Answer
from crosscheck.check import ask
from crosscheck.claims.read import read_claim_text
from crosscheck.claims.reading import FrameNames
from crosscheck.compare.claim import ClaimComparison
from crosscheck.compare.closing import close
from crosscheck.compare.differences import worst
from crosscheck.compare.tolerance import CLAIM
from crosscheck.frame.model import Frame
from crosscheck.frame.reader import read_frame, read_frame_text
from crosscheck.problems import UnusableInput
from tests.make_cases import CASES
from tests.pastes import UNITS, number
from tests.week_frames import week_text

LAYOUTS = ("ends", "ends by quantity", "along", "members", "going along", "supports", "movements")
SHAPES = ("rows", "columns")
SEPARATORS = ("tab", "aligned", "comma", "semicolon", "bar")
WRITINGS = ("fixed", "fixed", "exponent", "unicode minus", "decimal comma")
NAMED = ("heading", "heading behind", "option", "fit", "column")
GOVERNING = ("none", "named", "named", "unknown")
DRAWN = (4, 12, 18, 20, 31, 35, 37, 40, 42, 51, 53, 57, 58)
"""Seeds of drawn frames of which those with an envelope of several combinations are used."""
PLANTS = ("sign", "tenth", "more", "ten", "governing")
SHARE = 0.3
"""Share of its column's largest value that a value must have to be made wrong."""


@dataclass(frozen=True)
class Known:
    frame: Frame
    answers: dict[str, Answer]
    comparison: ClaimComparison

    @property
    def answer(self) -> Answer:
        return self.answers["slope-deflection"]


@cache
def known(key: str) -> Known | None:
    """A frame with its opinions; None where not all its combinations have an answer (past a critical load, say)."""
    frame = read_frame_text(week_text(int(key))) if key.isdigit() else read_frame(CASES / f"{key}.toml")
    if not frame.envelopes or min(len(e.names) for e in frame.envelopes.values()) < 2:
        return None
    result = ask(frame)
    answers = {n: a for n, a in result.answers.items() if n != "library"}
    if len(answers) < 2 or any(n not in a.cases for a in answers.values() for n in frame.names):
        return None
    mine = {"slope-deflection": answers["slope-deflection"]}
    return Known(frame, answers, ClaimComparison(frame, mine, result.judgements, CLAIM))


@cache
def frames() -> tuple[str, ...]:
    return ("depot", "causeway", *(str(s) for s in DRAWN if known(str(s))))


@dataclass(frozen=True)
class Spec:
    seed: int
    key: str
    envelope: str
    layout: str
    shape: str
    separator: str
    writing: str
    units: str
    heads: str
    named: str
    governing: str
    once: bool
    signs: dict[str, int]
    digits: int

    def __str__(self) -> str:
        return ", ".join(str(getattr(self, n)) for n in ("key", "layout", "shape", "separator", "writing", "units", "heads",
                                                         "named", "governing", "once"))  # fmt: skip


def draw(seed: int) -> Spec:
    r = Random(f"envelope paste {seed}")
    key = frames()[seed % len(frames())]
    k = known(key)
    assert k
    envelope = r.choice(list(k.frame.envelopes))
    separator = r.choice(SEPARATORS)
    writing = "decimal comma" if separator == "semicolon" and r.random() < 0.7 else r.choice(WRITINGS)
    if writing == "decimal comma" and separator == "comma":
        writing = "fixed"
    layout = r.choice(LAYOUTS)
    governing = "none" if layout in ("members", "movements") and r.random() < 0.5 else r.choice(GOVERNING)
    named = r.choice(NAMED)
    if len(k.frame.envelopes) > 1 and named == "fit":
        named = "heading"  # what both envelopes fit must be undecided
    if layout == "members" and named == "fit":
        named = "option"  # extremes along members may fit single cases as well
    if layout == "going along":
        governing = "named"
    shape = "rows" if layout == "going along" else r.choice(SHAPES)
    return Spec(
        seed, key, envelope, layout, shape, separator, writing, r.choice(("kN m", "N mm", "N m", "kN cm", "kip ft")),
        r.choice(("brackets", "brackets", "unit line", "stated")), named, governing,
        r.random() < 0.4 and separator != "aligned" and shape == "rows",
        {q: r.choice((1, 1, -1)) for q in ("axial", "shear", "moment", "support", "down")}
        | {"internal": r.choice((0, 1))}, r.choice((4, 5, 6)),
    )  # fmt: skip


@dataclass
class Column:
    """One quantity: (cases, places) as printed in the paste's units and signs."""

    head: str
    kind: str
    values: np.ndarray
    scale: np.ndarray
    case_scale: float


Printed = tuple[list[str], list[list[object]], list[str]]
"""Heads, rows and the kind of each column."""


@dataclass
class Paste:
    spec: Spec
    text: str
    values: int
    case: str | None
    fixed: bool
    planted: str = ""


class Maker:
    """The paste of a spec; plant: what to make wrong once."""

    def __init__(self, spec: Spec, plant: str = "") -> None:
        self.spec, self.plant, self.planted = spec, plant, ""
        found = known(spec.key)
        assert found
        self.known, self.frame = found, found.frame
        self.r = Random(f"make {spec.seed}")
        self.names = self.frame.envelopes[spec.envelope].names
        f, F, a, arm, d, D, t, T = UNITS[spec.units]
        u = self.frame.units
        self.words = {"force": f, "moment": f"{f}{a}" if len(f) <= 2 else f"{f} {a}", "length": d, "angle": t, "arm": a}
        self.size = {"force": u.newton / F, "moment": u.newton * u.metre / F / arm, "length": u.metre / D, "angle": 1 / T,
                     "arm": u.metre / arm}  # fmt: skip
        self.values = 0
        self.fixed = not (spec.named == "fit" and self.fits_others())
        self.largest: dict[str, float] = {}

    def fits_others(self) -> bool:
        """Has another name of several cases the same extremes? What does not say which is meant must then be undecided."""
        others = [n for n in self.frame.several if n != self.spec.envelope]
        return any(np.allclose(self._bounds(n), self._bounds(self.spec.envelope), rtol=0.0, atol=0.004) for n in others)

    def _bounds(self, name: str) -> np.ndarray:
        """Greatest and least member-end actions over the cases that a name stands for, beside the largest of their kind."""
        ends = np.stack([self.known.answer.cases[n].ends for n in self.frame.meant(name)])
        ends = ends / np.maximum(np.abs(ends).max(axis=(0, 1, 2)), 1e-300)
        return np.stack([ends.max(axis=0), ends.min(axis=0)])

    # -- what is printed, case by case

    def places(self) -> tuple[list[list[str]], list[str], list[Column]]:
        """Cells that name each place, their heads, and the columns."""
        layout = self.spec.layout
        if layout in ("ends", "ends by quantity", "going along"):
            return self._ends()
        if layout in ("along", "members"):
            return self._along() if layout == "along" else self._members()
        return self._joints(layout == "supports")

    def _ends(self) -> tuple[list[list[str]], list[str], list[Column]]:
        s = self.spec.signs
        raw = np.stack([self.known.answer.cases[n].ends for n in self.names])
        turn = np.array([1.0, -1.0])[None, :] if s["internal"] else np.ones((1, 2))
        cells = [[m.name, j] for m in self.frame.members.values() for j in (m.joint_from, m.joint_to)]
        columns = [
            self._column("N", "force", s["axial"] * raw[:, :, :, 0]),
            self._column("V", "force", s["shear"] * turn * raw[:, :, :, 1]),
            self._column("M", "moment", s["moment"] * turn * raw[:, :, :, 2]),
        ]
        if self.spec.layout == "ends by quantity":
            columns = [columns[self.r.choice((1, 2, 2))]]
        return cells, ["Member", "Joint"], columns

    def _along(self) -> tuple[list[list[str]], list[str], list[Column]]:
        s, shares = self.spec.signs, np.array([0, 0.25, 0.5, 0.75, 1.0])
        length = self.frame.member_table.length
        m = np.repeat(np.arange(len(length)), 5)
        x = np.tile(shares, len(length)) * length[m]
        side = np.tile(np.where(shares < 1, 1, -1), len(length))
        raw = np.stack([self.known.answer.spans.along(n, m, x, side) for n in self.names])
        members = list(self.frame.members)
        writing = "decimal comma" if self.spec.writing == "decimal comma" else "fixed"
        at = [number(v * self.size["arm"], 5, writing) for v in x.tolist()]
        cells = [[members[k], at[n]] for n, k in enumerate(m.tolist())]
        columns = [
            self._column("V", "force", s["shear"] * raw[:, :, 1]), self._column("M", "moment", s["moment"] * raw[:, :, 2]),
        ]  # fmt: skip
        return cells, ["Member", f"x [{self.words['arm']}]"], columns

    def _members(self) -> tuple[list[list[str]], list[str], list[Column]]:
        """Extremes along whole members: each case's two, of which the greater or the less counts."""
        s, out = self.spec.signs, []
        for q, sign in ((0, "axial"), (1, "shear"), (2, "moment")):
            rows = [[self._extremes(n, m)[:, q] * s[sign] for m in range(len(self.frame.members))] for n in self.names]
            out.append(self._column("NVM"[q], "moment" if q == 2 else "force", np.array(rows)))
        return [[name] for name in self.frame.members], ["Member"], out

    @cache  # noqa: B019 - a Maker lives as long as its paste
    def _extremes(self, name: str, m: int) -> np.ndarray:
        """(2, 3) greatest and least N, V, M of a case along a member, by many stations and the turning points."""
        length = float(self.frame.member_table.length[m])
        turning, places = self.known.answer.spans.turning_points(name)
        at = self.known_stations(m)
        x = np.concatenate([np.linspace(0, length, 101), places[turning == m], at])
        values = [self.known.answer.spans.along(name, np.full(len(x), m), x, np.full(len(x), side))[:, :3]
                  for side in (-1, 1)]  # fmt: skip
        both = np.concatenate(values)
        return np.array([both.max(axis=0), both.min(axis=0)])

    def known_stations(self, m: int) -> np.ndarray:
        """Places of loads along a member."""
        name = list(self.frame.members)[m]
        loads = (load for case in self.frame.cases.values() for load in case.loads if getattr(load, "member", None) == name)
        found = [getattr(load, key, None) for load in loads for key in ("at", "start", "end")]
        return np.array([x for x in found if isinstance(x, float)], dtype=float)

    def _joints(self, reactions: bool) -> tuple[list[list[str]], list[str], list[Column]]:
        s = self.spec.signs
        if reactions:
            joints = list(self.frame.supports)
            index = [self.frame.joint_index[j] for j in joints]
            raw = np.stack([self.known.answer.cases[n].reactions[index] for n in self.names])
            columns = [self._column(h, "force", s["support"] * raw[:, :, k]) for k, h in ((0, "Fx"), (1, "Fy"))]
            return [[j] for j in joints], ["Support"], columns
        raw = np.stack([self.known.answer.cases[n].joints for n in self.names])
        columns = [self._column("dx", "length", raw[:, :, 0]), self._column("dy", "length", s["down"] * raw[:, :, 1])]
        return [[j] for j in self.frame.joints], ["Joint"], columns

    def _column(self, head: str, kind: str, raw: np.ndarray) -> Column:
        values = raw * self.size[kind]
        if self.spec.layout == "members":
            flat = values  # (cases, members, 2)
            shown = np.concatenate([flat.max(axis=2), flat.min(axis=2)])
        else:
            flat = values.reshape(len(self.names), -1)
            shown = flat
        largest = float(np.nanmax(np.abs(shown), initial=0.0))
        self.largest[kind] = max(self.largest.get(kind, 0.0), largest)
        quantity = {"force": "shear", "moment": "moment", "length": "dx"}[kind]
        # What is small beside the case's own scale is not judged: tolerance has a floor.
        case_scale = self.size[kind] * max(self.known.comparison.judgements[n].scales.of(quantity) for n in self.names)
        size = np.abs(np.nan_to_num(shown)).max(axis=0) > max(0.03 * largest, 0.004 * case_scale)
        ends = (size[::2], size[1::2]) if self.spec.layout in ("ends", "ends by quantity", "going along") else (size,)
        self.fixed &= all(int(end.sum()) >= 3 for end in ends)
        return Column(head, kind, flat, np.full(flat.shape[1], max(largest, 0.1 * case_scale)), case_scale)

    # -- the envelope

    def bound(self, column: Column, place: int, which: int) -> tuple[float, str]:
        """The greatest (0) or least (1) of the cases at a place, and which case has it; NaN where none has one."""
        values = column.values[:, place]
        if values.ndim == 2:
            values = values.max(axis=1) if which == 0 else values.min(axis=1)
        if not np.isfinite(values).any():
            return float("nan"), ""
        k = int(np.nanargmax(values) if which == 0 else np.nanargmin(values))
        return float(values[k]), self.names[k]

    def paste(self) -> Paste:
        cells, place_heads, columns = self.places()
        spec = self.spec
        if spec.layout == "going along":
            heads, rows, kinds = self._going_along(cells, columns, place_heads)
        elif spec.shape == "rows":
            heads, rows, kinds = self._rows(cells, columns, place_heads)
        else:
            heads, rows, kinds = self._columns(cells, columns, place_heads)
        if spec.named == "column":
            heads, kinds = ["Envelope", *heads], ["", *kinds]
            rows = [[spec.envelope, *row] for row in rows]
        text = self._text(heads, rows, kinds)
        return Paste(spec, text, self.values, spec.envelope if spec.named == "option" else None, self.fixed, self.planted)

    def _rows(self, cells: list[list[str]], columns: list[Column], heads: list[str]) -> Printed:
        rows: list[list[object]] = []
        for p, where in enumerate(cells):
            for which, word in enumerate(("max", "min")):
                row: list[object] = [*(where if not self.spec.once or which == 0 else [""] * len(where)), word]
                for c in columns:
                    value, governs = self.bound(c, p, which)
                    row.append((value, c))
                    row += self._governing(governs, c, p, which)
                rows.append(row)
        named = ["Combination"] if self.spec.governing != "none" else []
        out_heads, kinds = [*heads, "Max/min"], [""] * (len(heads) + 1)
        for c in columns:
            out_heads += [c.head, *named]
            kinds += [c.kind, *[""] * len(named)]
        return out_heads, rows, kinds

    def _columns(self, cells: list[list[str]], columns: list[Column], heads: list[str]) -> Printed:
        named = ["LC"] if self.spec.governing != "none" else []
        out_heads, kinds = list(heads), [""] * len(heads)
        for c in columns:
            for word in ("max", "min"):
                out_heads += [f"{c.head} {word}" if self.spec.seed % 2 else f"{word} {c.head}", *named]
                kinds += [c.kind, *[""] * len(named)]
        rows: list[list[object]] = []
        for p, where in enumerate(cells):
            row: list[object] = list(where)
            for c in columns:
                for which in (0, 1):
                    value, governs = self.bound(c, p, which)
                    row += [(value, c), *self._governing(governs, c, p, which)]
            rows.append(row)
        return out_heads, rows, kinds

    def _going_along(self, cells: list[list[str]], columns: list[Column], heads: list[str]) -> Printed:
        """Rows "max M": the extreme of one quantity, and the others in the same combination."""
        rows: list[list[object]] = []
        for p, where in enumerate(cells):
            for c in columns[1:]:
                for which, word in enumerate(("max", "min")):
                    value, governs = self.bound(c, p, which)
                    k = self.names.index(governs) if governs else 0
                    others: list[object] = [(value if o is c else float(o.values[k, p]), o) for o in columns]
                    rows.append([*where, f"{word} {c.head}", *others, *self._governing(governs, c, p, which)])
        return ([*heads, "Extreme", *(c.head for c in columns), "Governing"], rows,
                [*[""] * (len(heads) + 1), *(c.kind for c in columns), ""])  # fmt: skip

    def _governing(self, governs: str, column: Column, place: int, which: int) -> list[str]:
        if self.spec.governing == "none":
            return []
        if self.spec.governing == "unknown":
            return [f"K{self.names.index(governs) + 101}" if governs else "-"]
        if self.plant == "governing" and not self.planted:
            value = self.bound(column, place, which)[0]
            others = [n for k, n in enumerate(self.names)
                      if abs(self._alone(column, k, place, which) - value) > 0.2 * column.scale[place]]  # fmt: skip
            if others and governs and (self.spec.layout != "going along"):
                self.planted = f"governing {governs} -> {others[0]}"
                return [others[0]]
        return [governs or "-"]

    def _alone(self, column: Column, k: int, place: int, which: int) -> float:
        value = column.values[k, place]
        if np.ndim(value):
            return float(value.max() if which == 0 else value.min())
        return float(value)

    # -- text

    def _text(self, heads: list[str], rows: list[list[object]], kinds: list[str]) -> str:
        spec, words = self.spec, self.words
        lines = []
        if spec.heads == "stated":
            lines.append(f"Forces in {words['force']}, moments in {words['moment']}, displacements in {words['length']}")
        if spec.named.startswith("heading"):
            lines += [f"Envelope {spec.envelope}" if spec.named == "heading" else f"Envelope: {spec.envelope}", ""]
        if spec.layout in ("supports", "movements"):
            lines.append("Reactions" if spec.layout == "supports" else "Displacements")
        head_lines = [list(heads)]
        if spec.heads == "brackets":
            head_lines = [[f"{h} [{words[k]}]" if k else h for h, k in zip(heads, kinds, strict=True)]]
        elif spec.heads == "unit line":
            head_lines.append([f"[{words[k]}]" if k else "" for k in kinds])
        decimals = self._decimals(rows)
        start = Random(f"plant {spec.seed}").random()
        worth = [(n, j) for n, row in enumerate(rows) for j, c in enumerate(row) if self._worth(c)]
        chosen = worth[int(start * len(worth))] if worth and self.plant not in ("", "governing") else None
        body = [[self._cell(c, decimals, (n, j) == chosen) for j, c in enumerate(row)] for n, row in enumerate(rows)]
        return "\n".join([*lines, *self._lay([*head_lines, *body], len(head_lines))]) + "\n"

    def _worth(self, cell: object) -> bool:
        if not isinstance(cell, tuple) or not np.isfinite(cell[0]):
            return False
        return abs(cell[0]) >= max(SHARE * self.largest[cell[1].kind], 0.02 * cell[1].case_scale) > 0

    def _decimals(self, rows: list[list[object]]) -> dict[str, int]:
        largest: dict[str, float] = {}
        for cell in (c for row in rows for c in row if isinstance(c, tuple) and np.isfinite(c[0])):
            largest[cell[1].kind] = max(largest.get(cell[1].kind, 0.0), abs(cell[0]))
        return {k: int(np.clip(self.spec.digits - 1 - np.floor(np.log10(v)), 0, 9)) if v else 3 for k, v in largest.items()}

    def _cell(self, cell: object, decimals: dict[str, int], wrong: bool) -> str:
        if not isinstance(cell, tuple):
            text = str(cell)
            return f'"{text}"' if self.spec.separator == "comma" and "," in text else text
        value, column = cell
        if not np.isfinite(value):
            return "-"
        self.values += 1
        if wrong:
            made = {"sign": -value, "tenth": value / 10, "more": value * 1.3, "ten": value * 10}[self.plant]
            self.planted = f"{value:.6g} -> {made:.6g}"
            value = made
        return number(value, decimals[column.kind], self.spec.writing)

    def _lay(self, lines: list[list[str]], heads: int) -> list[str]:
        separator = self.spec.separator
        if separator == "aligned":
            widths = [max(len(line[j]) for line in lines) + 2 for j in range(len(lines[0]))]
            return ["  ".join(c.ljust(w) for c, w in zip(line, widths, strict=True)).rstrip() for line in lines]
        if separator == "bar":
            out = ["| " + " | ".join(line) + " |" for line in lines]
            return [*out[:heads], "|" + "---|" * len(lines[0]), *out[heads:]]
        mark = {"tab": "\t", "comma": ",", "semicolon": ";"}[separator]
        return [mark.join(line) for line in lines]


def make(seed: int, plant: str = "") -> Paste:
    return Maker(draw(seed), plant).paste()


@dataclass(frozen=True)
class Outcome:
    verdict: str
    compared: int
    cases: tuple[str, ...]
    why: tuple[str, ...]
    differences: int = 0


def judge(paste: Paste) -> Outcome:
    """The verdict as `verify` gives it where the opinions agree."""
    k = known(paste.spec.key)
    assert k
    try:
        reading = read_claim_text(paste.text, FrameNames.of(k.frame))
    except UnusableInput as refused:
        return Outcome("refused", 0, (), (str(refused),))
    closed = close(reading, k.frame, k.answers, paste.case, CLAIM)
    cases = k.comparison.judge(closed)
    verdicts = [c.verdict for c in cases]
    if closed.undecided or closed.foreign or not cases:
        verdicts.append("undecided")
    if closed.reversed_load:
        verdicts.append("disagree")
    left = sum(len(c.not_compared) for c in cases)
    why = (*closed.undecided[:2], *(w for _, _, w in closed.not_understood[:1]), *closed.notes[:2])
    return Outcome(worst(verdicts), sum(c.compared for c in cases) + left, closed.cases, why,
                   sum(len(c.differences) for c in cases))  # fmt: skip


def is_right(paste: Paste, outcome: Outcome) -> bool:
    """Every printed value read and found to agree, as values of this envelope."""
    return outcome.verdict == "agree" and outcome.compared == paste.values and paste.spec.envelope in outcome.cases


@dataclass
class Tally:
    right: Counter[str] = field(default_factory=Counter)
    drawn: Counter[str] = field(default_factory=Counter)
    verdicts: Counter[str] = field(default_factory=Counter)
    planted: Counter[str] = field(default_factory=Counter)
    failures: list[str] = field(default_factory=list)

    def add(self, seed: int) -> None:
        paste = make(seed)
        outcome = judge(paste)
        ok = is_right(paste, outcome)
        told = "fixed" if paste.fixed else "not fixed by three values"
        self.verdicts[f"{told}: {'right' if ok else f'{outcome.verdict} (not right)'}"] += 1
        if paste.fixed:
            for name in ("layout", "shape", "separator", "writing", "units", "heads", "named", "governing", "key"):
                self.drawn[f"{name} {getattr(paste.spec, name)}"] += 1
                self.right[f"{name} {getattr(paste.spec, name)}"] += ok
        if not ok and (paste.fixed or outcome.verdict != "undecided"):
            said = f"{outcome.verdict} {outcome.compared}/{paste.values} ({outcome.differences})"
            self.failures.append(f"{seed} {said} {paste.spec}: {outcome.why}")
        kind = PLANTS[seed % len(PLANTS)]
        wrong = make(seed, kind)
        if ok and wrong.planted:
            found = judge(wrong).verdict
            self.planted[found] += 1
            if found == "agree":
                self.failures.append(f"{seed} planted {kind} {wrong.planted} absorbed: {paste.spec}")


def main() -> None:
    count = int(sys.argv[1]) if len(sys.argv) > 1 else 300
    first = int(sys.argv[2]) if len(sys.argv) > 2 else 0
    tally = Tally()
    for seed in range(first, first + count):
        tally.add(seed)
    print("\n".join(tally.failures))
    for key in sorted(tally.drawn):
        print(f"{key:<28} {tally.right[key]:>5} of {tally.drawn[key]:>5}")
    print(dict(tally.verdicts), "planted:", dict(tally.planted), sep="\n")


if __name__ == "__main__":
    main()
