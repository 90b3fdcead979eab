"""Pictures of a check: the frame, its loads, and each case's results with the claim laid over the opinions.

Opinions are a solid line over light hatching, the claim hollow squares and a broken line, differences ringed numbers:
none of it needs colour. Moments stand on the tension side.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from crosscheck.answer import ACROSS, AXIAL, MOMENT, SHEAR, Answer
from crosscheck.compare.claimed import ClaimedValue
from crosscheck.compare.differences import Place
from crosscheck.compare.opinions import with_turning_points
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import FREE, HELD, Floats, Frame, Ints
from crosscheck.frame.stations import stations
from crosscheck.report import words
from crosscheck.report.sketch import GREY, HALF, NAMED, RING, UNIT, Sketch

COLUMN = {"moment": MOMENT, "shear": SHEAR, "axial": AXIAL}
TALL = 2.6
"""Units that the largest value of a diagram is drawn."""
BEYOND = 2.5
"""Of the opinions' largest value: further than that no claimed one is drawn, lest the opinions shrink to nothing."""
NUMBERED = 40
"""Most ringed numbers in one drawing."""


@dataclass(frozen=True, slots=True)
class Picture:
    """A drawing with its caption; `says` is for those who cannot see it."""

    sketch: Sketch
    caption: str
    says: str

    @property
    def narrow(self) -> bool:
        """Whether two stand side by side."""
        return self.sketch.wide <= HALF


def frame_picture(frame: Frame, marked: Sequence[tuple[int, Place]] = (), names: Sequence[str] = ()) -> Picture:
    """The frame with supports, hinges, dimensions and names; `marked`: (number, place) to ring."""
    sketch = Sketch(frame, (6.4, 5.6))
    sketch.dimensions()
    sketch.members()
    sketch.connections()
    sketch.supports()
    sketch.one_way()
    sketch.ties()
    sketch.names(names)
    rest = _ring(sketch, marked)
    caption = f"Distances in {frame.units.length}. {_legend(frame)}".rstrip()
    if marked:
        caption += " Ringed: the places in question, each by its first number in the table."
    if rest:
        caption += f" {words.counted(rest, 'further place')} not ringed."
    return Picture(sketch, caption, f"Drawing of the frame {frame.title}")


def _legend(frame: Frame) -> str:
    """What the signs of this frame stand for, and no others."""
    t, members = frame.member_table, frame.members.values()
    ends = t.turn[np.isfinite(t.turn)]
    signs = {
        "open ring: hinge": bool((ends == FREE).any()),
        "barred ring: semi-rigid end": bool((ends != FREE).any()),
        "thick: rigid zone": bool((t.zone > 0).any()),
        "zigzag: spring": any(v not in (FREE, HELD) for s in frame.supports.values() for v in (s.x, s.y)),
        "spiral: spring against turning": any(s.rotation not in (FREE, HELD) for s in frame.supports.values()),
        "outlined: stepped or tapered, depths to a scale of the member's own": any(m.pieces for m in members),
        "arrow heads apart: works in tension only": any(m.only == "tension" for m in members),
        "arrow heads together: works in compression only": any(m.only == "compression" for m in members),
        "dotted with a double arrow: joints tied along it": bool(frame.ties),
    }
    shown = "; ".join(sign for sign, there in signs.items() if there)
    rigid = [m.name for m in members if m.axial == "rigid"]
    text = f"{shown[:1].upper()}{shown[1:]}." if shown else ""
    return f"{text} Keep their length: {words.some(rigid)}." if rigid else text


def small_picture(frame: Frame, caption: str) -> Picture:
    """The frame without words, to be known by its outline."""
    sketch = Sketch(frame, (2.0, 2.6))
    sketch.members(3.0)
    sketch.supports()
    return Picture(sketch, caption, f"Outline of the frame {frame.title}")


def loads_picture(frame: Frame, name: str) -> Picture:
    """The loads of a case or combination, factors applied."""
    sketch = Sketch(frame, (6.0, 4.6))
    sketch.members()
    sketch.connections()
    sketch.supports()
    sketch.loads(load_table(frame, name))
    force, length = frame.units.force, frame.units.length
    caption = f"Loads of {name}, factors applied: {force}, {force}/{length} along members, couples {force} {length}."
    if not sketch.small:
        caption += f" Figures of spread loads are left out (more than {NAMED} members)."
    return Picture(sketch, caption, f"Loads of {name}")


class CasePictures:
    """The pictures of one case. values: the claim's values of the case, empty where there is no claim."""

    def __init__(
        self, frame: Frame, answer: Answer, name: str, values: Sequence[ClaimedValue] = (),
        marked: Sequence[tuple[int, Place]] = (),
    ) -> None:  # fmt: skip
        self.frame, self.answer, self.name, self.values, self.marked = frame, answer, name, values, marked
        self.member, self.x, side = with_turning_points(answer, name, stations(frame))
        self.along = answer.spans.along(name, self.member, self.x, side)
        self.start: Ints = np.searchsorted(self.member, np.arange(len(frame.members) + 1))

    def all(self) -> list[Picture]:
        """Moment, shear, axial and deflected shape."""
        return [*(self.diagram(q) for q in COLUMN), self.deflected()]

    def diagram(self, quantity: str) -> Picture:
        """One quantity along the members."""
        frame, sketch = self.frame, Sketch(self.frame)
        column = COLUMN[quantity]
        value = self.along[:, column]
        peak = float(np.abs(value[np.isfinite(value)]).max(initial=0.0))
        claimed = self._claimed_ends(quantity)
        most = BEYOND * peak if peak else max((abs(v) for v in claimed.values()), default=0.0)
        beyond = any(abs(v) > most for v in claimed.values())
        claimed = {place: min(max(v, -most), most) for place, v in claimed.items()}
        peak = max([peak, *(abs(v) for v in claimed.values())])
        # Moment on the tension side: a sagging one stretches the local -y face.
        scale = (-1.0 if quantity == "moment" else 1.0) * TALL * sketch.unit / (peak or 1.0)
        sketch.members(1.2)
        self._opinions(sketch, value, scale, peak)
        drawn = self._claim(sketch, quantity, value, claimed, scale)
        sketch.supports()
        places = [(k, p) for k, p in self.marked if p.quantity == quantity and p.member]
        rest = _ring(sketch, places)
        says = f"{quantity} of {self.name} on the frame {frame.title}"
        far = f" Claimed values beyond {BEYOND:g} times the largest of the opinions are drawn there." if beyond else ""
        return Picture(sketch, self._caption(quantity, drawn, rest) + far, says)

    def _opinions(self, sketch: Sketch, value: Floats, scale: float, peak: float) -> None:
        outlines, ribs = [], []
        small = sketch.small
        for m in range(len(self.frame.members)):
            part = slice(int(self.start[m]), int(self.start[m + 1]))
            v = value[part]
            if not np.isfinite(v).all():
                at = sketch.along(m, 0.5 * self.frame.member_table.length[m])
                if small:
                    sketch.text(at, "?", 8.0)
                continue
            if np.abs(v).max(initial=0.0) <= 1e-6 * peak:
                continue
            foot, top = sketch.along(m, self.x[part]), sketch.along(m, self.x[part], scale * v)
            outlines.append(np.concatenate([foot[:1], top, foot[-1:]]))
            if small:
                ribs += [np.array(pair) for pair in zip(foot[1:-1], top[1:-1], strict=True)]
                self._figures(sketch, m, self.x[part], v, scale, peak)
        sketch.lines(ribs, 0.35, ink="#9a9a9a")
        sketch.lines(outlines, 1.0)

    def _figures(self, sketch: Sketch, m: int, x: Floats, v: Floats, scale: float, peak: float) -> None:
        """The ends' values, and the largest between them where it stands out; none upon another."""
        chosen = {0: 1.0, len(v) - 1: -1.0}
        inner = int(np.argmax(np.abs(v)))
        if abs(v[inner]) > 1.15 * max(abs(v[0]), abs(v[-1])):
            chosen[inner] = 0.0
        elif abs(v[0] - v[-1]) <= 1e-3 * peak:
            chosen = {len(v) // 2: 0.0}
        length = float(self.frame.member_table.length[m])
        for k, inward in chosen.items():
            if abs(v[k]) <= 0.01 * peak:
                continue
            says = words.number(float(v[k]), peak)
            lift = np.sign(scale * v[k]) * 0.45 * sketch.unit
            for shift in (0.06, 0.12, 0.18, 0.0):
                at = sketch.along(m, float(x[k] + inward * shift * length), float(scale * v[k] + lift))
                if not sketch.crossed(at, says, 6.4):
                    sketch.text(at, says, 6.4)
                    break

    def _claimed_ends(self, quantity: str) -> dict[tuple[int, int], float]:
        """Claimed end values by member and end, in the sense of a diagram."""
        out = {}
        for v in self.values:
            if v.kind == "end" and v.quantity == quantity:
                m = self.frame.member_index[str(v.member)]
                end = 0 if self.frame.members[str(v.member)].joint_from == v.joint else 1
                # End actions act on the member; along it both moment and shear are counted from the `from` end.
                out[m, end] = v.value if end == 0 or quantity == "axial" else -v.value
        return out

    def _claim(
        self, sketch: Sketch, quantity: str, value: Floats, ends: Mapping[tuple[int, int], float], scale: float
    ) -> bool:
        lines = []
        length = self.frame.member_table.length
        squares = [sketch.along(m, 0.0 if end == 0 else float(length[m]), scale * v) for (m, end), v in ends.items()]
        for (m, end), v in ends.items():
            if end == 0 and (m, 1) in ends:
                part = slice(int(self.start[m]), int(self.start[m + 1]))
                own, x = value[part], self.x[part]
                # By statics: with the same loads within the member, curves with other ends differ by a straight line.
                other = own + (v - own[0]) + (x / length[m]) * ((ends[m, 1] - own[-1]) - (v - own[0]))
                if np.isfinite(other).all():
                    lines.append(sketch.along(m, x, scale * other))
        for value_at in self.values:
            if value_at.kind == "span" and value_at.quantity == quantity and value_at.at is not None:
                m = self.frame.member_index[str(value_at.member)]
                squares.append(sketch.along(m, value_at.at, scale * value_at.value))
        sketch.lines(lines, 1.1, (0, (4, 2)))
        sketch.squares(squares)
        return bool(squares)

    def _caption(self, quantity: str, claim: bool, rest: int) -> str:
        unit = words.unit_of(self.frame, quantity)
        side = {"moment": "on the tension side", "shear": "positive on the member's left hand, from end to end",
                "axial": "tension on the member's left hand, compression on its right"}[quantity]  # fmt: skip
        text = f"{quantity.capitalize()} of {self.name}, {unit}, {side}. Solid line: {self.answer.opinion}."
        if claim:
            text += " Squares: the claim; broken line: between them with this frame's own loads."
        elif self.values:
            text += " The claim gives none."
        if len(self.frame.members) > NAMED:
            text += f" Values stand in the tables (more than {NAMED} members)."
        return text + (f" {words.counted(rest, 'further place')} not ringed." if rest else "")

    def deflected(self) -> Picture:
        """The displaced frame, its displacements drawn many times their size."""
        sketch = Sketch(self.frame, (6.0, 3.4))
        moves = self.answer.cases[self.name].joints[:, :2]
        across = self.along[:, ACROSS]
        most = float(np.abs(np.nan_to_num(np.concatenate([moves.ravel(), across]))).max(initial=0.0))
        times = 1.8 * sketch.unit / most if most > 0 else 1.0
        sketch.lines(sketch.xy[sketch.table.ends], 0.7, (0, (1, 2)), GREY)
        sketch.supports()
        sketch.lines([self._shape(sketch, m, moves, across, times) for m in range(len(self.frame.members))], 1.4)
        claimed: dict[str, Floats] = {}
        for v in self.values:
            if v.kind == "displacement" and v.quantity in ("dx", "dy"):
                claimed.setdefault(str(v.joint), np.full(2, np.nan))[int(v.quantity == "dy")] = v.value
        at = [(self.frame.joint_index[joint], move) for joint, move in claimed.items()]
        sketch.squares([sketch.xy[k] + times * np.where(np.isfinite(v), v, np.nan_to_num(moves[k])) for k, v in at])
        rest = _ring(sketch, [(k, p) for k, p in self.marked if p.of == "joints"])
        text = f"Deflected shape of {self.name}, displacements {times:,.3g} times their size, by {self.answer.opinion}."
        if self.values:
            text += " Squares: joints where the claim puts them." if claimed else " The claim gives no displacements."
        return Picture(sketch, text + (f" {words.counted(rest, 'further place')} not ringed." if rest else ""),
                       f"Deflected shape of {self.name}")  # fmt: skip

    def _shape(self, sketch: Sketch, m: int, moves: Floats, across: Floats, times: float) -> Floats:
        """(n, 2) of a member: across as the opinion gives it, along it in proportion between its ends."""
        t = self.frame.member_table
        part = slice(int(self.start[m]), int(self.start[m + 1]))
        x, own = self.x[part], across[part]
        ends = np.nan_to_num(moves[t.ends[m]])
        along = ends @ np.array([t.cos[m], t.sin[m]])
        side = ends @ np.array([-t.sin[m], t.cos[m]])
        straight = side[0] + (side[1] - side[0]) * x / t.length[m]
        own = np.where(np.isfinite(own), own, straight)
        # A case whose stations were left out by the opinion is drawn straight between its joints.
        return sketch.along(m, x + times * (along[0] + (along[1] - along[0]) * x / t.length[m]), times * own)


def _ring(sketch: Sketch, marked: Sequence[tuple[int, Place]]) -> int:
    """Ring the places of numbered differences, one ring a place; returns how many found no room."""
    done: set[tuple[str | None, str | None, float | None, bool]] = set()
    left = 0
    for number, p in marked:
        place = p.member, p.joint, p.at, p.of == "reactions"
        if place in done or not (p.member or p.joint):
            continue  # the place has its ring
        done.add(place)
        at = next((a for a in _beside(sketch, p) if not sketch.crossed(a, "", 1.15 * RING * UNIT * 72)), None)
        if at is None or len(done) - left > NUMBERED:
            left += 1
            continue
        sketch.number(at, number)
    return left


def _beside(sketch: Sketch, p: Place) -> Iterator[Floats]:
    """Where the ring of a place may stand, the best first."""
    frame, unit = sketch.frame, sketch.unit
    if not p.member:
        k = frame.joint_index[str(p.joint)]
        aside = ((-1.3, 0.9), (1.3, 0.9), (-1.3, -0.9), (0.0, 1.6)) if p.of == "joints" else (
            (1.7, -1.5), (-1.7, -1.5), (2.4, -0.6), (-2.4, -0.6))  # fmt: skip
        yield from (sketch.xy[k] + unit * np.array(a) for a in aside)
        return
    m = frame.member_index[p.member]
    length = float(frame.member_table.length[m])
    for share in (1.6, 2.2, 2.9, 3.6):
        inset = min(share * unit, 0.45 * length)
        x = p.at if p.at is not None else length / 2
        if p.joint:
            x = inset if frame.members[p.member].joint_from == p.joint else length - inset
        yield from (sketch.along(m, x, side * 0.95 * unit) for side in (-1.0, 1.0))
