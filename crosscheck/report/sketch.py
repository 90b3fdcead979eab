"""Drawings of a frame by matplotlib, in ink alone: members, supports, hinges, loads, names and dimensions.

Nothing here relies on colour: what must stand apart differs in line, in shape or by a number in a ring. Sizes of signs
are in `unit`, about the height of two letters in the frame's own length, so that a drawing looks alike at any scale.
"""

from __future__ import annotations

import io
import math
import re
import warnings
from collections import Counter
from collections.abc import Callable, Iterable, Sequence
from typing import Any

import matplotlib
import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.patches import Circle, Patch, PathPatch, Polygon
from matplotlib.path import Path

from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import FREE, HELD, Floats, Frame, Support
from crosscheck.report import words

WIDTH = 7.1
"""Inches: the text width of A4 and Letter with their usual margins. Drawings are printed at their size, never reduced,
so that their figures can be read."""
HALF = 3.45
"""Inches: two drawings side by side."""
UNIT = WIDTH / 34
"""Inches of a unit."""
MOST, TALLEST = 3.9, 8.4
"""Heights of a drawing in inches, about: two of MOST go on a page of A4 or Letter; a tall frame, or a high one of many
members, has a page."""
SMALL = 0.8
"""Share of its size below which a drawing's lines are drawn thinner, too."""
LETTER, MARGIN = 0.58, 0.35
"""Width of a letter in heights, and units left free around a drawing."""
INK, GREY = "#111111", "#595959"
RING = 1.2
"""Units across a ringed number."""
NAMED = 60
"""Most members whose names stand in a drawing; beyond that only marked places are named."""
DIMENSIONED = 12
"""Most distances in one chain of dimensions."""


class Sketch:
    """A drawing of one frame, kept as a list of strokes until it is known on what page it goes.

    room: units expected left and right, and above and below together, of what stands around the frame; the drawing
    reaches as far as its strokes do. Places are in the frame's lengths.
    """

    def __init__(self, frame: Frame, room: tuple[float, float] = (7.0, 4.6)) -> None:
        self.frame, self.xy, self.table = frame, frame.xy, frame.member_table
        self.low, self.high = self.xy.min(axis=0), self.xy.max(axis=0)
        size = np.maximum(self.high - self.low, 1e-9 * max(float(np.ptp(self.xy)), 1.0))
        self.small = len(frame.members) <= NAMED
        most = TALLEST if size[1] > (2.5 if self.small else 1.0) * size[0] else MOST
        self.unit = max(size[0] / (WIDTH / UNIT - room[0]), size[1] / (most / UNIT - room[1]), 1e-12)
        self.feet = self.low.copy()
        self._tips: list[Floats] = []
        self._boxes: list[Floats] = []
        self._strokes: list[Callable[[Axes], object]] = []

    # --- extent

    def _reach(self, points: Any) -> None:
        """The drawing extends to these places."""
        points = np.asarray(points, dtype=float).reshape(-1, 2)
        self.low = np.minimum(self.low, points.min(axis=0))
        self.high = np.maximum(self.high, points.max(axis=0))

    @property
    def window(self) -> tuple[Floats, Floats]:
        """Lower left and upper right corner of the drawing, a page's width apart at least, or half of it."""
        low, high = self.low - MARGIN * self.unit, self.high + MARGIN * self.unit
        spare = np.array([max(self.wide / UNIT * self.unit - (high - low)[0], 0.0), 0.0])
        return low - spare / 2, high + spare / 2

    @property
    def wide(self) -> float:
        """Inches: of the page, or of half of it where that is enough."""
        need = ((self.high - self.low)[0] / self.unit + 2 * MARGIN) * UNIT
        return HALF if need <= HALF else WIDTH

    @property
    def tall(self) -> float:
        """Inches."""
        low, high = self.window
        return float(self.wide * (high - low)[1] / (high - low)[0])

    def crossed(self, at: Any, says: str, size: float, turn: float = 0.0) -> bool:
        """Whether a text would stand upon another text or a ring."""
        box = self._box(at, says, size, turn)
        return any(bool((box[0] < b[1]).all() and (b[0] < box[1]).all()) for b in self._boxes)

    def _box(self, at: Any, says: str, size: float, turn: float = 0.0, across: str = "center") -> Floats:
        """Lower left and upper right corner of a text, or of a ring of `size` points across where it says nothing."""
        inch = self.unit / UNIT
        half = np.array([len(says) * LETTER if says else 1.0, 1.0]) * size / 72 * inch / 2
        c, s = abs(math.cos(math.radians(turn))), abs(math.sin(math.radians(turn)))
        half = np.array([c * half[0] + s * half[1], s * half[0] + c * half[1]])
        shift = {"left": half[0], "right": -half[0]}.get(across, 0.0)
        at = np.asarray(at, dtype=float) + np.array([shift, 0.0])
        return np.stack([at - half, at + half])

    # --- paper

    def figure(self) -> Figure:
        """The drawing on a figure of its own size."""
        figure = Figure(figsize=(self.wide, self.tall))
        self.on(figure, (0.0, 0.0, 1.0, 1.0))
        return figure

    def on(self, figure: Figure, place: tuple[float, float, float, float]) -> None:
        """The drawing on part of a figure: left, bottom, width and height in shares of it."""
        axes = figure.add_axes(place)
        axes.set_axis_off()
        axes.set_aspect("equal")
        low, high = self.window
        axes.set_xlim(low[0], high[0])
        axes.set_ylim(low[1], high[1])
        for stroke in self._strokes:
            stroke(axes)
        share = place[2] * figure.get_size_inches()[0] / self.wide
        if share < SMALL:  # lines that kept their width would run into each other
            for patch in axes.findobj(Patch):
                patch.set_linewidth(share * patch.get_linewidth())

    def _patch(self, kind: Callable[..., Any], *where: Any, **style: Any) -> None:
        # As artists and not as patches, whose limits matplotlib would work out one by one.
        self._strokes.append(lambda axes: axes.add_artist(kind(*where, clip_on=False, **style)))

    # --- ink

    def lines(self, paths: Iterable[Any], width: float = 0.8, style: Any = "solid", ink: str = INK) -> None:
        # One path for them all: a picture of 400 members stays small.
        drawn = [Path(np.asarray(p, dtype=float)) for p in paths]
        if drawn:
            self._reach(np.concatenate([p.vertices for p in drawn]))
            self._ink(Path.make_compound_path(*drawn), "none", ink, width, style)

    def heads(self, ink: str = INK) -> None:
        """The arrow heads gathered so far."""
        if self._tips:
            self._ink(Path.make_compound_path(*(Path(tip, closed=True) for tip in self._tips)), ink, ink, 0.2)
            self._tips.clear()

    def _ink(self, path: Path, fill: str, ink: str, width: float, style: Any = "solid", zorder: int = 1) -> None:
        self._patch(PathPatch, path, facecolor=fill, edgecolor=ink, linewidth=width, linestyle=style, zorder=zorder,
                    capstyle="butt", joinstyle="round")  # fmt: skip

    def area(self, corners: Any, fill: str = "none", ink: str = INK, width: float = 0.6) -> None:
        self._reach(corners)
        self._patch(Polygon, np.asarray(corners), closed=True, facecolor=fill, edgecolor=ink, linewidth=width)

    def ring(self, at: Any, radius: float, fill: str = "white", width: float = 0.8) -> None:
        self._reach([np.asarray(at) - radius * self.unit, np.asarray(at) + radius * self.unit])
        self._patch(Circle, (float(at[0]), float(at[1])), radius * self.unit, facecolor=fill, edgecolor=INK,
                    linewidth=width, zorder=3)  # fmt: skip

    def squares(self, places: Sequence[Any], half: float = 0.22) -> None:
        """Hollow squares about places."""
        corners = half * self.unit * np.array([(-1, -1), (1, -1), (1, 1), (-1, 1), (-1, -1)])
        paths = [Path(np.asarray(at, dtype=float) + corners, closed=True) for at in places]
        if paths:
            self._reach(np.concatenate([p.vertices for p in paths]))
            self._ink(Path.make_compound_path(*paths), "white", INK, 0.8, zorder=3)

    def text(self, at: Any, says: str, size: float = 7.5, turn: float = 0.0, across: str = "center",
             up: str = "center", ink: str = INK, weight: str = "normal", slant: str = "normal") -> None:  # fmt: skip
        x, y, shown = float(at[0]), float(at[1]), words.visible(says, 28)
        self._boxes.append(self._box(at, shown, size, turn, across))
        self._reach(self._boxes[-1])
        self._strokes.append(lambda axes: axes.text(
            x, y, shown, fontsize=size, rotation=turn, ha=across, va=up, color=ink, parse_math=False,
            fontweight=weight, fontstyle=slant, rotation_mode="anchor", zorder=4))  # fmt: skip

    def number(self, at: Any, count: int) -> None:
        """A ringed number that stands in a table too."""
        self.ring(at, RING / 2, width=1.1)
        self.text(at, str(count), 7.0, up="center_baseline", weight="bold")
        self._boxes[-1] = self._box(at, "", RING * UNIT * 72)

    # --- the frame

    def along(self, m: int, x: Floats | float, offset: Floats | float = 0.0) -> Floats:
        """(n, 2) places at distances x along member m, moved `offset` along local y."""
        t = self.table
        start = self.xy[t.ends[m, 0]]
        x, offset = np.broadcast_arrays(np.asarray(x, dtype=float), np.asarray(offset, dtype=float))
        return np.stack([start[0] + x * t.cos[m] - offset * t.sin[m], start[1] + x * t.sin[m] + offset * t.cos[m]],
                        axis=-1)  # fmt: skip

    def members(self, width: float = 1.6, ink: str = INK) -> None:
        self.lines(self.xy[self.table.ends], width, ink=ink)
        zones = [self.along(m, np.array([0.0, z[0]])) for m, z in enumerate(self.table.zone) if z[0] > 0]
        zones += [self.along(m, np.array([self.table.length[m] - z[1], self.table.length[m]]))
                  for m, z in enumerate(self.table.zone) if z[1] > 0]  # fmt: skip
        if zones:
            self.lines(zones, 2.6 * width, ink=ink)
        self.lines([outline for m in range(len(self.table.length)) for outline in self._pieces(m)], 0.6, ink=ink)

    def _pieces(self, m: int) -> list[Floats]:
        """Outlines of the pieces of a stepped or tapered member, their depths to one scale along it."""
        member = list(self.frame.members.values())[m]
        ends = [(_depth(self.frame, p.first), _depth(self.frame, p.last)) for p in member.pieces]
        scale = 0.42 * self.unit / max((d for pair in ends for d in pair), default=1.0)
        outlines: list[Floats] = []
        start = 0.0
        for piece, (first, last) in zip(member.pieces, ends, strict=True):
            x = float(self.table.length[m]) * np.array([start, piece.until, piece.until, start, start])
            outlines.append(self.along(m, x, scale * np.array([first, last, -last, -first, first])))
            start = piece.until
        return outlines

    def one_way(self) -> None:
        """Arrow heads in the middle of members that only pull (apart) or only push (together), and words at supports."""
        for m, member in enumerate(self.frame.members.values()):
            if member.only:
                way = np.array([self.table.cos[m], self.table.sin[m]])
                apart = 1.0 if member.only == "tension" else -1.0
                for side in (1.0, -1.0):
                    tip = self.along(m, 0.5 * self.table.length[m] + side * (0.75 if apart > 0 else 0.3) * self.unit)
                    self._head(tip, side * apart * way, 0.45)
        self.heads()
        for s in self.frame.supports.values():
            k = self.frame.joint_index[s.joint]
            for axis, only in (("x", s.x_only), ("y", s.y_only)):
                if only:
                    below = self.unit * np.array([0.0, -2.1])
                    self.text(self.xy[k] + below, f"{axis}: {only} only", 6.5, slant="italic")

    def ties(self) -> None:
        """Joints that move together: a dotted line through them, and along which direction."""
        for tie in self.frame.ties.values():
            at = self.xy[[self.frame.joint_index[j] for j in tie.joints]]
            self.lines([at], 1.5, (0, (0.6, 1.6)))
            turn = math.radians(tie.direction)
            way = np.array([math.cos(turn), math.sin(turn)])
            aside = self.unit * np.array([way[1], -way[0]])
            mark = 0.75 * at[0] + 0.25 * at[1] + 0.5 * aside
            self.lines([[mark - 0.8 * self.unit * way, mark + 0.8 * self.unit * way]], 0.8)
            for side in (1.0, -1.0):
                self._head(mark + 0.95 * side * self.unit * way, side * way, 0.35)
            self.heads()
            self.text(mark + 0.55 * aside, f"tie {tie.name}", 6.5, slant="italic")

    def connections(self) -> None:
        """Hinges as open rings near their joint, semi-rigid ends as rings with a bar through them."""
        t = self.table
        for m, end in np.argwhere(np.isfinite(t.turn)).tolist():
            away = t.zone[m, end] + min(0.45 * self.unit, 0.2 * t.clear[m])
            at = self.along(m, away if end == 0 else t.length[m] - away)
            self.ring(at, 0.2)
            if t.turn[m, end] != FREE:
                across = 0.36 * self.unit * np.array([-t.sin[m], t.cos[m]])
                self.lines([[at - across, at + across]], 1.0)

    def supports(self) -> None:
        for support in self.frame.supports.values():
            self._support(support)

    def _support(self, s: Support) -> None:
        k = self.frame.joint_index[s.joint]
        turn = math.radians(s.angle)
        own = np.array([[math.cos(turn), math.sin(turn)], [-math.sin(turn), math.cos(turn)]])
        away = self._outward(k)
        held = s.x, s.y, s.rotation
        if held[2] == HELD and HELD in held[:2]:
            out = self._snapped(away)
            self._wall(self.xy[k], out, 1.1)
        elif held[0] == HELD and held[1] == HELD:
            self._foot(self.xy[k], -own[1] if away @ -own[1] > -0.5 else own[1], rolls=False)
        else:
            for axis in (0, 1):
                out = -own[axis] if away @ -own[axis] > -0.5 else own[axis]
                if held[axis] == HELD:
                    self._foot(self.xy[k], out, rolls=True)
                elif held[axis] != FREE:
                    self._coil(self.xy[k], out)
        if held[2] not in (HELD, FREE):
            self._spiral(self.xy[k])

    def _outward(self, k: int) -> Floats:
        """A unit vector away from the members at a joint; down where they leave no side free."""
        ends = self.table.ends
        others = np.concatenate([self.xy[ends[ends[:, 0] == k, 1]], self.xy[ends[ends[:, 1] == k, 0]]])
        if not len(others):
            return np.array([0.0, -1.0])
        run = others - self.xy[k]
        mean = (run / np.linalg.norm(run, axis=1)[:, None]).mean(axis=0)
        size = float(np.linalg.norm(mean))
        return -mean / size if size > 0.2 else np.array([0.0, -1.0])

    @staticmethod
    def _snapped(v: Floats) -> Floats:
        return np.array([0.0, math.copysign(1.0, v[1])]) if abs(v[1]) >= 0.6 else np.array([math.copysign(1.0, v[0]), 0.0])

    def _wall(self, at: Floats, out: Floats, half: float) -> None:
        side = np.array([-out[1], out[0]])
        u = self.unit
        self.lines([[at - half * u * side, at + half * u * side]], 1.4)
        corners = np.stack([at - half * u * side, at + half * u * side + 0.42 * u * out])
        self._boxes.append(np.stack([corners.min(axis=0), corners.max(axis=0)]))
        ticks = [at + u * (f * side) for f in np.linspace(-half + 0.2, half, 6)]
        self.lines([[p, p + u * (0.42 * out - 0.3 * side)] for p in ticks], 0.6)

    def _foot(self, at: Floats, out: Floats, rolls: bool) -> None:
        side, u = np.array([-out[1], out[0]]), self.unit
        base = at + 0.95 * u * out
        corners = np.stack([at, base - 0.6 * u * side, base + 0.6 * u * side])
        self.area(corners, "white", width=1.0)
        self._boxes.append(np.stack([corners.min(axis=0), corners.max(axis=0)]))
        self._wall(base + (0.28 * u * out if rolls else 0.0), out, 0.9)

    def _coil(self, at: Floats, out: Floats) -> None:
        """A spring that pushes and pulls along `out`, and what it stands on."""
        side, u = np.array([-out[1], out[0]]), self.unit
        turns = [(0.25 + 0.12 * k, (0.28, -0.28)[k % 2]) for k in range(6)]
        path = [at, at + 0.2 * u * out, *(at + u * (a * out + b * side) for a, b in turns), at + 0.95 * u * out,
                at + 1.1 * u * out]  # fmt: skip
        self.lines([path], 0.9)
        self._wall(at + 1.1 * u * out, out, 0.7)

    def _spiral(self, at: Floats) -> None:
        """A spring that resists turning."""
        turn = np.linspace(-0.5 * math.pi, 3.0 * math.pi, 60)
        grow = self.unit * np.linspace(0.2, 0.62, 60)
        self.lines([at + np.column_stack([grow * np.cos(turn), grow * np.sin(turn)])], 0.8)

    def names(self, marked: Sequence[str] = ()) -> None:
        """Joints upright beside them, members in italics along them; only what is marked in a large frame."""
        for k, joint in enumerate(self.frame.joints):
            if self.small or joint in marked:
                self.text(self._clear(k, joint), joint, 7.5, weight="bold")
        for m, name in enumerate(self.frame.members):
            if self.small or name in marked:
                self.beside(m, 0.5, name)

    def _clear(self, k: int, says: str) -> Floats:
        """Where a joint's name stands: in the widest gap between its members, else where it is on nothing else."""
        out = self._free_side(k)
        turns = [math.radians(t) for t in (0, 25, -25, 50, -50, 90, -90, 130, -130, 180)]
        ways = [np.array([[math.cos(t), -math.sin(t)], [math.sin(t), math.cos(t)]]) @ out for t in turns]
        spots = [self.xy[k] + far * self.unit * way for far in (0.95, 1.4) for way in ways]
        return next((s for s in spots if not self.crossed(s, says, 9.0)), spots[0])

    def beside(self, m: int, share: float, says: str, side: float = 1.0, size: float = 6.8) -> None:
        """Words along a member, upright for the reader, on its left (or right) hand."""
        t = self.table
        turn = math.degrees(math.atan2(t.sin[m], t.cos[m]))
        deep = bool(list(self.frame.members.values())[m].pieces)
        at = self.along(m, share * t.length[m], side * (0.85 if deep else 0.5) * self.unit)
        readable = turn - 180 if turn > 90.001 else turn + 180 if turn <= -90.001 else turn
        self.text(at, says, size, readable, ink=GREY, slant="italic")

    def _free_side(self, k: int) -> Floats:
        """The widest gap between the members at a joint, so that its name crosses none."""
        ends = self.table.ends
        others = np.concatenate([self.xy[ends[ends[:, 0] == k, 1]], self.xy[ends[ends[:, 1] == k, 0]]]) - self.xy[k]
        if not len(others):
            return np.array([0.7, 0.7])
        angles = np.sort(np.arctan2(others[:, 1], others[:, 0]))
        if list(self.frame.joints)[k] in self.frame.supports:
            out = self._snapped(self._outward(k))
            angles = np.sort(np.append(angles, math.atan2(out[1], out[0])))
        gaps = np.diff(np.append(angles, angles[0] + 2 * math.pi))
        best = int(np.argmax(np.round(gaps, 6)))
        middle = angles[best] + gaps[best] / 2
        return np.array([math.cos(middle), math.sin(middle)])

    def dimensions(self) -> None:
        """Chains of distances below and to the left, with slashes for ticks."""
        for axis in (0, 1):
            marks = _distinct(self.xy[:, axis], 0.4 * self.unit)
            if 2 <= len(marks) <= DIMENSIONED + 1:
                self._chain(marks, axis)

    def _chain(self, marks: Floats, axis: int) -> None:
        u = self.unit
        level = self.feet[1 - axis] - 2.9 * u

        def place(v: float, off: float = 0.0) -> Floats:
            return np.array([v, level + off]) if axis == 0 else np.array([level + off, v])

        slash = 0.3 * u * np.array([1.0, 1.0])
        self.lines([[place(marks[0] - 0.4 * u), place(marks[-1] + 0.4 * u)]], 0.5, ink=GREY)
        self.lines([[place(v) - slash, place(v) + slash] for v in marks], 0.9)
        for a, b in zip(marks[:-1], marks[1:], strict=True):
            off = 0.5 * u if axis == 0 else -0.5 * u
            if b - a > 0.9 * u:  # no room for its figure; the frame file has it
                self.text(place((a + b) / 2, off), f"{b - a:.4g}", 6.8, 90.0 * axis)

    # --- loads

    def loads(self, table: LoadTable) -> None:
        """Every load of a case: arrows for forces, bands for spread loads, arcs for couples, words for the rest."""
        self._bands(table)
        self._arrows(table)
        self._imposed(table)
        self.heads()

    def _bands(self, loads: LoadTable) -> None:
        """Spread loads as bands on the side they come from, those on one member upon one another."""
        size = np.hypot(loads.line_along, loads.line_across)
        most = float(size.max(initial=0.0))
        strokes: list[Floats] = []
        height: dict[int, float] = {}
        count: Counter[int] = Counter()
        for q in np.flatnonzero(size.max(axis=1, initial=0.0) > 1e-9 * most).tolist():
            m = int(loads.line_member[q])
            strokes += self._band(loads, q, size[q], most, height, count[m])
            count[m] += 1
        self.lines(strokes, 0.45, ink=GREY)

    def _band(
        self, loads: LoadTable, q: int, size: Floats, most: float, height: dict[int, float], before: int
    ) -> list[Floats]:
        """Strokes of one band; `height` by member is what stands there already, and grows."""
        t, u = self.table, self.unit
        m, k = int(loads.line_member[q]), int(size.argmax())
        cos, sin = float(t.cos[m]), float(t.sin[m])
        along, across = loads.line_along[q, k] / size[k], loads.line_across[q, k] / size[k]
        way = np.array([along * cos - across * sin, along * sin + across * cos])
        x = np.linspace(loads.line_start[q], loads.line_end[q], 7 if self.small else 3)
        tall = u * (0.25 + 0.75 * np.interp(x, x[[0, -1]], size) / most)
        base = height.get(m, 0.0)
        height[m] = base + float(tall.max()) + 0.15 * u
        if abs(across) < 0.04:  # along the member: dashes beside it
            foot = self.along(m, x, -(base + 0.35 * u))
            strokes = [np.array([p - 0.4 * u * way, p + 0.1 * u * way]) for p in foot]
        else:
            foot = self.along(m, x) - (base + 0.12 * u) * way
            top = foot - tall[:, None] * way
            strokes = [np.array([*foot, *top[::-1], foot[0]]), *(np.array(pair) for pair in zip(top, foot, strict=True))]
            for p in foot:
                self._head(p, way, 0.2)
        if self.small:
            # Bands upon one another are told apart by figures that do not stand in one line.
            ends = [words.number(float(v)) for v in size]
            says = ends[0] if ends[0] == ends[1] else f"{ends[0]} to {ends[1]}"
            spots = [self.along(m, float(x[k])) - (height[m] + 0.35 * u) * way for k in (3, 1, 5, 2, 4)]
            spots = [*spots[before % 5 :], *spots[: before % 5]]
            self.text(next((at for at in spots if not self.crossed(at, says, 6.5)), spots[0]), says, 6.5)
        return strokes

    def _arrows(self, loads: LoadTable) -> None:
        t = self.table
        forces = [(self.xy[k], row[:2], row[2]) for k, row in enumerate(loads.joint) if np.any(row)]
        for p, m in enumerate(loads.point_member.tolist()):
            a, b = loads.point_along[p], loads.point_across[p]
            force = np.array([a * t.cos[m] - b * t.sin[m], a * t.sin[m] + b * t.cos[m]])
            forces.append((self.along(m, float(loads.point_at[p])), force, loads.point_couple[p]))
        for at, force, couple in forces:
            size = float(np.hypot(*force))
            if size > 0:
                way = force / size
                tail = at - 2.0 * self.unit * way
                self.lines([[tail, at]], 1.2)
                self._head(at, way, 0.45)
                says, side = words.number(size), np.array([-way[1], way[0]])
                spots = [tail - self.unit * (a * way - b * side) for a, b in ((0.45, 0), (1.1, 0), (0, 1.5), (0, -1.5))]
                self.text(next((s for s in spots if not self.crossed(s, says, 7.0)), spots[0]), says, 7.0)
            if couple:
                self._arc(at, float(couple))

    def _head(self, tip: Floats, way: Floats, size: float) -> None:
        side = np.array([-way[1], way[0]])
        back = tip - size * self.unit * way
        half = 0.35 * size * self.unit * side
        self._tips.append(np.array([tip, back + half, back - half, tip]))

    def _arc(self, at: Floats, couple: float) -> None:
        """Three quarters of a turn, clockwise where positive."""
        turn = np.radians(np.linspace(225, -45, 25))
        if couple < 0:
            turn = math.pi - turn
        path = at + 0.8 * self.unit * np.column_stack([np.cos(turn), np.sin(turn)])
        self.lines([path], 1.0)
        way = (path[-1] - path[-2]) / np.linalg.norm(path[-1] - path[-2])
        self._head(path[-1] + 0.15 * self.unit * way, way, 0.4)
        self.text(at + self.unit * np.array([1.2, 1.0]), f"{words.number(abs(couple))}", 7.0)

    def _imposed(self, loads: LoadTable) -> None:
        for k, row in enumerate(loads.settlement):
            if np.any(row):
                parts = [f"{n} {words.number(float(v))}" for n, v in zip(("x", "y", "turn"), row, strict=True) if v]
                self.text(self.xy[k] + self.unit * np.array([0.0, -2.0]), f"moved {', '.join(parts)}", 6.5)
        for m in range(len(self.table.length)):
            said = [f"{sign}{words.number(float(v[m]))}{unit}" for sign, v, unit in (
                ("T ", loads.mean, "°"), ("ΔT ", loads.difference, "°"), ("long ", loads.misfit, "")) if v[m]]  # fmt: skip
            if said:
                self.beside(m, 0.5, ", ".join(said), side=-1.0)


def _depth(frame: Frame, name: str) -> float:
    """How deep a section is drawn: its depth, or what grows with it where none is stated."""
    section = frame.sections[name]
    return section.depth if section.depth is not None else float(np.cbrt(section.I))


def _distinct(values: Floats, near: float) -> Floats:
    values = np.sort(values)
    return np.asarray(values[np.concatenate([[True], np.diff(values) > near])])


_IDENTITY = re.compile(r' id="(?:figure|axes|patch|text|line2d|LineCollection|matplotlib\.axis|xtick|ytick)_\d+"')
_NEEDLESS = (
    re.compile(r"<defs>\s*<style[^>]*>.*?</style>\s*</defs>", re.DOTALL),  # it would speak for the whole page
    re.compile(r"<!--.*?-->", re.DOTALL),
    re.compile(r" font-family: [^;\"]*;"),  # the page's own letters
    re.compile(r"</?g>"),
    re.compile(r"^\s+", re.MULTILINE),
)
_UNSAID = ("Date", "Creator", "Format", "Type")
_PATH = re.compile(r' d="([^"]*)"')
_NUMBER = re.compile(r"(\d+\.\d)\d+")


def svg(figure: Figure, title: str, salt: str) -> str:
    """The figure as an SVG element to stand in a page: text as text, the same ids for the same picture."""
    out = io.StringIO()
    with matplotlib.rc_context({"svg.fonttype": "none", "svg.hashsalt": salt}), warnings.catch_warnings():
        # Letters that matplotlib's own font lacks are measured roughly; the reader's browser draws them.
        warnings.filterwarnings("ignore", message="Glyph")
        figure.savefig(out, format="svg", transparent=True, metadata=dict.fromkeys(_UNSAID))
    text = out.getvalue()
    text = _IDENTITY.sub("", text[text.index("<svg") :])
    for needless in _NEEDLESS:
        text = needless.sub("", text)
    # A tenth of a point is less than any line's width.
    text = _PATH.sub(lambda m: f' d="{_NUMBER.sub(chr(92) + "1", " ".join(m[1].split()))}"', text)
    from markupsafe import escape

    head = f'<svg role="img" aria-label="{escape(words.visible(title))}"'
    return re.sub(r'^<svg[^>]*?( viewBox="[^"]*")[^>]*>', lambda m: f"{head}{m.group(1)}>", text, count=1)
