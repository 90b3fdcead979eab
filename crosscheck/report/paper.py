"""The record as PDF: matplotlib's own pages, A4, set line by line, drawings at their size among the words.

A page of a record has some two hundred short texts. Each as a text of matplotlib's own would cost ten times the check
of a large frame, most of it for measuring what here is measured already, so a page is one artist that writes them all.
"""

from __future__ import annotations

import io
import textwrap
import warnings
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field, replace
from functools import cache
from typing import Any

import matplotlib
from matplotlib.artist import Artist
from matplotlib.backends.backend_pdf import PdfPages
from matplotlib.collections import LineCollection
from matplotlib.colors import to_rgb
from matplotlib.figure import Figure
from matplotlib.font_manager import FontProperties, findfont, get_font
from matplotlib.ft2font import LoadFlags

from crosscheck.report import words
from crosscheck.report.content import Block, Facts, Gallery, Grid, Record, Says, Verbatim
from crosscheck.report.pictures import Picture
from crosscheck.report.sketch import HALF, Sketch

PAGE = (8.27, 11.69)
"""A4 in inches; what stands on it fits Letter too when printed to its height."""
LEFT, RIGHT, TOP, BOTTOM = 0.75, 7.55, 10.95, 0.95
MIDDLE = RIGHT - 3.32
"""Where the second of two narrow drawings begins."""
LEADING = 1.32
POINTS = 72.0
INK, SOFT, HAIR, WATER = "#111111", "#565656", "#999999", "#efefef"
ACROSS = 3
"""Small drawings in a row."""
GAP, SPARE = 0.14, 0.35
"""Inches between columns, and at most that much wider where there is room: what is far apart is not read together."""


@dataclass(frozen=True, slots=True)
class Face:
    """A letter: family, weight and slant."""

    family: str = "DejaVu Serif"
    weight: str = "normal"
    slant: str = "normal"

    def of(self, size: float) -> FontProperties:
        return _properties(self, size)

    def width(self, text: str, size: float) -> float:
        """Inches that a line takes."""
        advance = _advances(self)
        return sum(map(advance, text)) * size / POINTS


PLAIN, BOLD, ITALIC = Face(), Face(weight="bold"), Face(slant="italic")
MONO, HEAVY = Face("DejaVu Sans Mono"), Face("DejaVu Sans Mono", "bold")
COURIER = {MONO: Face("Courier", "medium"), HEAVY: Face("Courier", "bold")}
"""As wide as the letters they stand for."""
TYPED, LONG = 7.0, 150
"""Size of letters of one width in a table, and the most rows of one in other letters."""


@cache
def _properties(face: Face, size: float) -> FontProperties:
    style: Any = face.slant
    return FontProperties(family=face.family, weight=face.weight, style=style, size=size)


@cache
def _advances(face: Face) -> Callable[[str], float]:
    """A letter's width in heights, each looked up once."""
    font = get_font(findfont(face.of(10.0)))

    @cache
    def advance(letter: str) -> float:
        font.set_size(100.0, 72)
        return float(font.load_char(ord(letter), flags=LoadFlags.NO_HINTING).linearHoriAdvance) / 65536 / 100

    return advance


def paper(record: Record) -> bytes:
    """The record as the bytes of a PDF file."""
    with warnings.catch_warnings():
        warnings.filterwarnings("ignore", message="Glyph")
        setter = _Setter(record)
        setter.head()
        for number, section in enumerate(record.sections, 1):
            setter.heading(f"{number}   {section.title}", section.blocks[0] if section.blocks else None)
            for block in section.blocks:
                setter.block(block)
        return setter.bound()


@dataclass(frozen=True, slots=True)
class _Text:
    """One line: its left end and baseline in inches."""

    x: float
    y: float
    says: str
    size: float
    face: Face
    ink: str
    leads: str = ""


@dataclass(slots=True)
class _Page:
    texts: list[_Text] = field(default_factory=list)
    rules: list[tuple[float, float, float, float, float, str]] = field(default_factory=list)
    drawings: list[tuple[Sketch, tuple[float, float, float, float]]] = field(default_factory=list)

    def figure(self) -> Figure:
        figure = Figure(figsize=PAGE)
        figure.add_artist(_Lines(self.texts))
        if self.rules:
            ends = [[(x / PAGE[0], y / PAGE[1]), (u / PAGE[0], v / PAGE[1])] for x, y, u, v, _, _ in self.rules]
            figure.add_artist(LineCollection(ends, linewidths=[r[4] for r in self.rules], transform=figure.transFigure,
                                             colors=[r[5] for r in self.rules]))  # fmt: skip
        for sketch, (x, y, wide, tall) in self.drawings:
            sketch.on(figure, (x / PAGE[0], y / PAGE[1], wide / PAGE[0], tall / PAGE[1]))
        return figure


class _Lines(Artist):
    """Every line of text of a page."""

    def __init__(self, texts: Sequence[_Text]) -> None:
        super().__init__()
        self.texts = texts

    def draw(self, renderer: Any) -> None:
        typed = [t for t in self.texts if _is_typed(t)]
        self._write(renderer, [t for t in self.texts if not _is_typed(t)])
        # Letters that every PDF reader has need no layout of glyph after glyph: a twentieth of the time, and this is
        # most of what stands in a record.
        with matplotlib.rc_context({"pdf.use14corefonts": True}):
            self._write(renderer, [replace(t, face=COURIER[t.face]) for t in typed])

    @staticmethod
    def _write(renderer: Any, texts: Sequence[_Text]) -> None:
        for ink in dict.fromkeys(t.ink for t in texts):
            gc = renderer.new_gc()
            gc.set_foreground(to_rgb(ink))
            for t in texts:
                if t.ink == ink:
                    gc.set_url(t.leads or None)
                    renderer.draw_text(gc, t.x * POINTS, t.y * POINTS, t.says, t.face.of(t.size), 0.0)
            gc.restore()


def _is_typed(t: _Text) -> bool:
    """Whether a text can stand in the letters of one width that every reader of PDF has."""
    try:
        return t.face in COURIER and bool(t.says.encode("cp1252"))
    except UnicodeEncodeError:
        return False


class _Setter:
    """Sets lines down a page and begins the next one where there is no room."""

    def __init__(self, record: Record) -> None:
        self.record = record
        self.pages: list[_Page] = []
        self.y = 0.0
        self.left: tuple[int, float, float] | None = None
        """Page, top and foot of a narrow drawing that has room for another at its right."""

    @property
    def page(self) -> _Page:
        return self.pages[-1]

    def _fresh(self) -> None:
        self.pages.append(_Page())
        self.y = TOP

    def _room(self, inches: float) -> bool:
        """Whether a new page had to be begun."""
        if self.pages and self.y - inches >= BOTTOM:
            return False
        self._fresh()
        return True

    def _put(
        self, x: float, says: str, size: float, face: Face = PLAIN, ink: str = INK, right: bool = False, leads: str = ""
    ) -> None:
        if says:
            left = x - face.width(says, size) if right else x
            self.page.texts.append(_Text(left, self.y, says, size, face, ink, leads))

    def _rule(self, width: float, ink: str = INK, left: float = LEFT, right: float = RIGHT) -> None:
        self.page.rules.append((left, self.y, right, self.y, width, ink))

    def lines(self, says: str, size: float = 9.0, x: float = LEFT, face: Face = PLAIN, ink: str = INK) -> None:
        """A paragraph."""
        for line in wrapped(says, RIGHT - x, size, face):
            self._room(_step(size))
            self.y -= _step(size)
            self._put(x, line, size, face, ink)

    def head(self) -> None:
        r = self.record
        self._fresh()
        self.lines(r.title.upper(), 8.0, ink=SOFT)
        filed = "; ".join(f"{label} {text}" for label, text in r.filed)
        self._put(RIGHT, words.visible(f"{filed}; {r.when}" if filed else r.when, 90), 8.0, right=True)
        self.lines(r.subject, 15.0, face=BOLD)
        self.y -= 0.15
        self._rule(1.5)
        self.y -= 0.06
        self.lines(r.verdict.upper(), 20.0, face=BOLD)
        self.lines(r.sentence, 10.0)
        if r.gist:
            self.y -= 0.06
            self.block(Facts(r.gist))
        if r.open:
            self.y -= 0.1
            self.lines("NOT FOR ACCEPTANCE while this stands open:", 10.0, face=BOLD)
            for reason in r.open:
                self.lines(f"–  {reason}", 9.0)

    def heading(self, says: str, before: Block | None) -> None:
        """A section's title, on the page on which what it stands `before` begins."""
        self.left = None
        self._room(0.6 + (self._height(before) if isinstance(before, Picture) else 1.0))
        self.y -= 0.28
        self._rule(1.2)
        self.y -= 0.04
        self.lines(says, 12.0, face=BOLD)
        self.y -= 0.08

    def block(self, block: Block) -> None:
        if not isinstance(block, Picture):
            self.left = None
        match block:
            case Facts():
                before = ""
                for label, text in block.rows:
                    self._fact("" if label == before else label, text)
                    before = label
            case Says():
                for line in block.lines:
                    self.lines(line)
            case Grid():
                self._grid(block)
            case Picture():
                self._picture(block)
            case Gallery():
                self._gallery(block)
            case Verbatim():
                self._verbatim(block)

    def _fact(self, label: str, text: str) -> None:
        for k, line in enumerate(wrapped(text, RIGHT - LEFT - 1.9, 8.5)):
            self._room(_step(8.5))
            self.y -= _step(8.5)
            self._put(LEFT, words.visible(label, 28) if k == 0 else "", 8.5, ink=SOFT)
            self._put(LEFT + 1.9, line, 8.5)

    def _verbatim(self, block: Verbatim) -> None:
        self._room(0.7)
        self.y -= 0.1
        self.lines(block.title, 9.0, face=BOLD)
        for number, text in enumerate(block.lines, 1):
            for k, line in enumerate(verbatim_lines(text, RIGHT - LEFT - 0.4, 6.5)):
                self._room(_step(6.5))
                self.y -= _step(6.5)
                # The number belongs to the line: one text for both.
                self._put(LEFT, f"{number if k == 0 else '':>5}  {line}", 6.5, MONO)

    # --- drawings

    def _picture(self, picture: Picture) -> None:
        """A drawing at its size with its caption below, both on one page; narrow ones two by two."""
        before, self.left = self.left, None
        if picture.sketch.wide > HALF:
            self._room(self._height(picture))
            self._drawn(picture, LEFT)
        elif before is not None and before[0] == len(self.pages) and before[1] - self._height(picture) >= BOTTOM:
            self.y = before[1]
            self._drawn(picture, MIDDLE)
            self.y = min(self.y, before[2])
        else:
            self._room(self._height(picture))
            top = self.y
            self._drawn(picture, LEFT)
            self.left = len(self.pages), top, self.y

    def _drawn(self, picture: Picture, x: float) -> None:
        sketch, wide, tall = picture.sketch, *_size(picture.sketch)
        self._draw(sketch, x, wide, tall)
        for line in wrapped(picture.caption, wide, 8.5, ITALIC):
            self.y -= _step(8.5)
            self._put(x, line, 8.5, ITALIC)
        self.y -= 0.16

    @staticmethod
    def _height(picture: Picture) -> float:
        """Inches that a drawing takes with its caption."""
        wide, tall = _size(picture.sketch)
        return tall + len(wrapped(picture.caption, wide, 8.5, ITALIC)) * _step(8.5) + 0.1

    def _draw(self, sketch: Sketch, x: float, wide: float, tall: float) -> None:
        self.y -= tall
        self.page.drawings.append((sketch, (x, self.y, wide, tall)))

    def _gallery(self, gallery: Gallery) -> None:
        """Small drawings in rows, feet in one line."""
        step = (RIGHT - LEFT) / ACROSS
        for k in range(0, len(gallery.pictures), ACROSS):
            self._room(1.75)
            top = self.y
            for column, picture in enumerate(gallery.pictures[k : k + ACROSS]):
                sketch = picture.sketch
                share = min((step - 0.3) / sketch.wide, 1.3 / sketch.tall)
                self.y = top - 1.35 + sketch.tall * share
                self._draw(sketch, LEFT + column * step, sketch.wide * share, sketch.tall * share)
                self._caption(picture.caption, LEFT + column * step, step - 0.3)
            self.y = top - 1.75

    def _caption(self, says: str, x: float, width: float) -> None:
        self._rule(0.4, HAIR, x, x + width)
        for line in wrapped(says, width, 7.5)[:2]:
            self.y -= _step(7.5)
            self._put(x, line, 7.5, leads=self.record.link(says))

    # --- tables

    def _grid(self, grid: Grid) -> None:
        lines = _typed(grid) if len(grid.rows) > LONG and not grid.blank else []
        if lines:
            self._long(grid.caption, lines[0], lines[1:])
            return
        size, widths = _fitted(grid)
        edges = [LEFT]
        for w in widths:
            edges.append(edges[-1] + w)
        heads = [wrapped(head, w - GAP, size, BOLD) for (head, _), w in zip(grid.columns, widths, strict=True)]
        extra = 0.25 if len(grid.blank) > 2 else 0.0
        self._room(1.0 + extra * len(grid.rows))
        self.y -= 0.08
        if grid.caption:
            self.lines(grid.caption, 8.5, face=ITALIC)
            self.y -= 0.05
        self._row(grid, edges, heads, size, BOLD)
        before = ""
        for row in grid.rows:
            cells = [wrapped(cell, w - GAP, size) for cell, w in zip(row, widths, strict=True)]
            if self._room(max(len(c) for c in cells) * _step(size) + 0.05 + extra):
                self._row(grid, edges, heads, size, BOLD)
                before = ""
            if row[0] == before:  # what a row is of is said once on a page
                cells[0] = [""]
            before = row[0]
            self._row(grid, edges, cells, size, PLAIN, extra, self.record.link(row[0]))
        self.y -= 0.1

    def _long(self, caption: str, head: str, rows: Sequence[str]) -> None:
        """A table of very many rows in letters of one width, a rule below every fourth: one text a row."""
        self._room(1.0)
        self.y -= 0.08
        self.lines(caption, 8.5, face=ITALIC)
        self._line(head, HEAVY)
        for k, row in enumerate(rows, 1):
            if self._room(_step(TYPED)):
                self._line(head, HEAVY)
            self._line(row, MONO, k % 4 == 0)
        self.y -= 0.1

    def _line(self, says: str, face: Face, ruled: bool = True) -> None:
        self.y -= _step(TYPED)
        self._put(LEFT, says, TYPED, face)
        if ruled:
            self.y -= 0.04
            self._rule(0.8 if face is HEAVY else 0.3, INK if face is HEAVY else HAIR)

    def _row(
        self, grid: Grid, edges: Sequence[float], cells: Sequence[Sequence[str]], size: float, face: Face,
        extra: float = 0.0, leads: str = "",
    ) -> None:  # fmt: skip
        """leads: where its first cell leads to."""
        top = self.y
        for (_, side), cell, left, right in zip(grid.columns, cells, edges[:-1], edges[1:], strict=True):
            self.y = top
            for line in cell:
                self.y -= _step(size)
                address = leads if left == edges[0] else ""
                self._put(right - GAP if side == "right" else left, line, size, face, right=side == "right", leads=address)
        self.y = top - max(len(c) for c in cells) * _step(size) - 0.05 - extra
        self._rule(0.8 if face is BOLD else 0.3, INK if face is BOLD else HAIR, right=edges[-1])
        if face is PLAIN:
            for k in grid.blank:  # room to write in is bounded, so that it is seen to be meant
                self.page.rules.append((edges[k] - 0.05, top, edges[k] - 0.05, self.y, 0.3, HAIR))

    # --- the whole

    def bound(self) -> bytes:
        """Every page with its foot, in one file."""
        out = io.BytesIO()
        with matplotlib.rc_context({"pdf.fonttype": 42, "pdf.compression": 6}):
            title = f"{self.record.title}: {words.visible(self.record.subject, 80)}"
            with PdfPages(out, metadata={"Title": title, "CreationDate": None}) as pdf:
                for number, page in enumerate(self.pages, 1):
                    self._foot(page, number)
                    figure = page.figure()
                    if self.record.open:
                        figure.text(0.5, 0.5, "NOT FOR ACCEPTANCE", fontsize=46, rotation=52, ha="center", va="center",
                                    color=WATER, weight="bold", zorder=-10)  # fmt: skip
                    pdf.savefig(figure)
        return out.getvalue()

    def _foot(self, page: _Page, number: int) -> None:
        y, says = 0.55, f"page {number} of {len(self.pages)}"
        page.texts.append(_Text(LEFT, y, f"crosscheck record {self.record.checksum[:32]}", 7.0, PLAIN, INK))
        page.texts.append(_Text(RIGHT - PLAIN.width(says, 7.0), y, says, 7.0, PLAIN, INK))


def _size(sketch: Sketch) -> tuple[float, float]:
    """Width and height in inches of a drawing on these pages."""
    share = min(1.0, (RIGHT - LEFT) / sketch.wide)
    return sketch.wide * share, sketch.tall * share


def _step(size: float) -> float:
    return LEADING * size / POINTS


def wrapped(text: str, width: float, size: float, face: Face = PLAIN) -> list[str]:
    """Lines of a text of `size` points, none wider than `width` inches; one empty line for none. Words break only where
    one alone is too wide."""
    lines: list[str] = []
    for part in words.visible(text).expandtabs(4).split("\n"):
        if face.width(part, size) <= width:
            lines.append(part)
        else:
            lines += _broken(part, width, size, face)
    return lines


def _broken(text: str, width: float, size: float, face: Face) -> Iterator[str]:
    line = ""
    for word in text.split(" "):  # and not at the blanks that keep a unit together
        longer = f"{line} {word}" if line else word
        if face.width(longer, size) <= width:
            line = longer
            continue
        if line:
            yield line
        line = word
        while len(line) > 1 and face.width(line, size) > width:
            fits = max(1, next((k for k in range(1, len(line)) if face.width(line[: k + 1], size) > width), len(line)))
            yield line[:fits]
            line = line[fits:]
    yield line


def verbatim_lines(text: str, width: float, size: float) -> list[str]:
    """Lines of a text in letters of one width, its blanks kept."""
    most = max(int(width / MONO.width("m", size)), 2)
    parts = words.visible(text).expandtabs(4).split("\n")
    return [line for part in parts
            for line in textwrap.wrap(part, most, drop_whitespace=False, replace_whitespace=False) or [""]]  # fmt: skip


def _typed(grid: Grid) -> list[str]:
    """A table's head and rows as lines of letters of one width; none where they are too wide for the page."""
    cells = [[words.visible(c) for c in row] for row in ([head for head, _ in grid.columns], *grid.rows)]
    wide = [max(map(len, column)) for column in zip(*cells, strict=True)]
    inches = (sum(wide) + 3 * (len(wide) - 1)) * MONO.width("m", TYPED)
    if inches > RIGHT - LEFT or any("\n" in cell for row in cells for cell in row):
        return []
    right = [side == "right" for _, side in grid.columns]
    return ["   ".join(c.rjust(w) if r else c.ljust(w) for c, w, r in zip(row, wide, right, strict=True)) for row in cells]


def _fitted(grid: Grid) -> tuple[float, list[float]]:
    """Letter size and column widths in inches that fill the page: columns as wide as their words where there is room."""
    whole = RIGHT - LEFT
    for size in (8.0, 7.0, 6.0):
        wants = [_widest(grid, k, size) + GAP for k in range(len(grid.columns))]
        wants = [max(w, 1.1) if k in grid.blank else w for k, w in enumerate(wants)]
        if sum(wants) <= whole:
            spare = (whole - sum(wants)) / len(wants)
            return size, [w + (spare if grid.blank else min(spare, SPARE)) for w in wants]
    numbers = [side == "right" for _, side in grid.columns]
    fixed = sum(w for w, n in zip(wants, numbers, strict=True) if n)
    loose = sum(min(w, 2.5) for w, n in zip(wants, numbers, strict=True) if not n)
    share = max(whole - fixed, 0.3 * whole) / (loose or 1.0)
    widths = [w if n else min(w, 2.5) * share for w, n in zip(wants, numbers, strict=True)]
    return 6.0, [w * whole / sum(widths) for w in widths]


def _widest(grid: Grid, column: int, size: float) -> float:
    """Inches of a column's widest cell; a head may stand in lines."""
    head = max((BOLD.width(word, size) for word in grid.columns[column][0].split(" ")), default=0.1)
    return max(head, *(PLAIN.width(words.visible(row[column]), size) for row in grid.rows), 0.1)
