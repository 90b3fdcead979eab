"""The record as PDF: matplotlib's own pages, A4, set line by line; every drawing has a page of its own."""

from __future__ import annotations

import io
import textwrap
import warnings
from collections.abc import Iterator, Sequence
from typing import Any

import matplotlib
from matplotlib.backends.backend_pdf import PdfPages
from matplotlib.figure import Figure
from matplotlib.lines import Line2D

from crosscheck.report import words
from crosscheck.report.pictures import Picture
from crosscheck.report.record import Block, Facts, Gallery, Grid, Record, Says, Verbatim

PAGE = (8.27, 11.69)
"""A4 in inches; what stands on it fits Letter too when printed to its height."""
LEFT, RIGHT, TOP, BOTTOM = 0.75, 7.55, 10.7, 0.95
LEADING = 1.32
LETTER = 0.55
"""Mean width of a letter in heights, on the wide side: nothing may run into its neighbour."""
SERIF, MONO = "DejaVu Serif", "DejaVu Sans Mono"


def paper(record: Record) -> bytes:
    """The record as the bytes of a PDF file."""
    setter = _Setter(record)
    setter.head()
    for number, section in enumerate(record.sections, 1):
        setter.heading(f"{number}   {section.title}")
        for block in section.blocks:
            setter.block(block)
    return setter.bound()


class _Setter:
    """Sets lines down a page and begins the next one where there is no room."""

    def __init__(self, record: Record) -> None:
        self.record = record
        self.pages: list[Figure] = []
        self.y = 0.0

    @property
    def page(self) -> Figure:
        return self.pages[-1]

    def _fresh(self, figure: Figure | None = None) -> None:
        self.pages.append(figure or Figure(figsize=PAGE))
        self.y = TOP

    def _room(self, inches: float) -> bool:
        """Whether a new page had to be begun."""
        if self.pages and self.y - inches >= BOTTOM:
            return False
        self._fresh()
        return True

    def _put(self, x: float, says: str, size: float, across: str = "left", **style: Any) -> None:
        if says:
            style.setdefault("family", SERIF)
            self.page.text(x / PAGE[0], self.y / PAGE[1], says, fontsize=size, ha=across, va="baseline", parse_math=False,
                           **style)  # fmt: skip

    def _rule(self, width: float, up: float = 0.0, ink: str = "#111111") -> None:
        y = (self.y + up) / PAGE[1]
        self.page.add_artist(Line2D([LEFT / PAGE[0], RIGHT / PAGE[0]], [y, y], linewidth=width, color=ink))

    def lines(self, says: str, size: float = 9.0, x: float = LEFT, **style: Any) -> None:
        """A paragraph."""
        for line in wrapped(says, RIGHT - x, size):
            self._room(_step(size))
            self.y -= _step(size)
            self._put(x, line, size, **style)

    def head(self) -> None:
        r = self.record
        self._fresh()
        self.lines(r.title.upper(), 8.0, color="#565656")
        self.lines(r.subject, 15.0, weight="bold")
        self.y -= 0.15
        self._rule(1.5)
        self.lines(r.verdict.upper(), 20.0, weight="bold")
        self.lines(r.sentence, 10.0)
        if r.open:
            self.y -= 0.1
            self.lines("NOT FOR ACCEPTANCE while this stands open:", 10.0, weight="bold")
            for reason in r.open:
                self.lines(f"–  {reason}", 9.0)

    def heading(self, says: str) -> None:
        self._room(0.9)
        self.y -= 0.28
        self._rule(1.2)
        self.lines(says, 12.0, weight="bold")
        self.y -= 0.06

    def block(self, block: Block) -> None:
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
                for picture in block.pictures:
                    self.lines(picture.caption)
            case Verbatim():
                self._verbatim(block)

    def _fact(self, label: str, text: str) -> None:
        for k, line in enumerate(wrapped(text, RIGHT - LEFT - 1.7, 8.5)):
            self._room(_step(8.5))
            self.y -= _step(8.5)
            self._put(LEFT, words.visible(label, 24) if k == 0 else "", 8.5, color="#565656")
            self._put(LEFT + 1.7, line, 8.5)

    def _verbatim(self, block: Verbatim) -> None:
        self.y -= 0.1
        self.lines(block.title, 9.0, weight="bold")
        for number, text in enumerate(block.lines, 1):
            for k, line in enumerate(wrapped(text, RIGHT - LEFT - 0.4, 6.5, 0.61, verbatim=True)):
                self._room(_step(6.5))
                self.y -= _step(6.5)
                self._put(LEFT + 0.25, str(number) if k == 0 else "", 6.0, "right", color="#565656")
                self._put(LEFT + 0.4, line, 6.5, family=MONO)

    def _picture(self, picture: Picture) -> None:
        """The drawing's own figure becomes the page."""
        figure = picture.figure
        wide, tall = figure.get_size_inches()
        share = min((RIGHT - LEFT) / wide, (TOP - BOTTOM - 1.0) / tall)
        figure.set_size_inches(*PAGE)
        wide, tall = wide * share, tall * share
        figure.axes[0].set_position((LEFT / PAGE[0], (TOP - tall) / PAGE[1], wide / PAGE[0], tall / PAGE[1]))
        self._fresh(figure)
        self.y = TOP - tall - 0.1
        self.lines(picture.caption, 9.0, style="italic")
        self.y = BOTTOM  # what follows begins a page

    # --- tables

    def _grid(self, grid: Grid) -> None:
        size, widths = _fitted(grid)
        edges = [LEFT]
        for w in widths:
            edges.append(edges[-1] + w)
        heads = [wrapped(head, w, size) for (head, _), w in zip(grid.columns, widths, strict=True)]
        self._room(1.0)
        self.y -= 0.08
        if grid.caption:
            self.lines(grid.caption, 8.5, style="italic")
        self._row(grid, edges, heads, size, weight="bold")
        for row in grid.rows:
            cells = [wrapped(cell, w, size) for cell, w in zip(row, widths, strict=True)]
            tall = max(len(c) for c in cells) * _step(size) + 0.05 + (0.25 if len(grid.blank) > 2 else 0.0)
            if self._room(tall):
                self._row(grid, edges, heads, size, weight="bold")
            self._row(grid, edges, cells, size, extra=0.25 if len(grid.blank) > 2 else 0.0)
        self.y -= 0.1

    def _row(
        self, grid: Grid, edges: Sequence[float], cells: Sequence[Sequence[str]], size: float, extra: float = 0.0,
        **style: Any,
    ) -> None:  # fmt: skip
        top = self.y
        for (_, side), cell, left, right in zip(grid.columns, cells, edges[:-1], edges[1:], strict=True):
            self.y = top
            for line in cell:
                self.y -= _step(size)
                self._put(right - 0.08 if side == "right" else left, line, size, side, **style)
        self.y = top - max(len(c) for c in cells) * _step(size) - 0.05 - extra
        self._rule(0.8 if style else 0.3, ink="#111111" if style else "#999999")

    # --- the whole

    def bound(self) -> bytes:
        """Every page with its foot, in one file."""
        out = io.BytesIO()
        with matplotlib.rc_context({"pdf.fonttype": 42, "pdf.compression": 6}), warnings.catch_warnings():
            warnings.filterwarnings("ignore", message="Glyph")
            with PdfPages(out, metadata={"Title": f"{self.record.title}: {words.visible(self.record.subject, 80)}",
                                         "CreationDate": None}) as pdf:  # fmt: skip
                for number, page in enumerate(self.pages, 1):
                    self._foot(page, number)
                    pdf.savefig(page)
        return out.getvalue()

    def _foot(self, page: Figure, number: int) -> None:
        y = 0.55 / PAGE[1]
        style: dict[str, Any] = {"fontsize": 7, "family": SERIF, "va": "baseline", "parse_math": False}
        page.text(LEFT / PAGE[0], y, f"crosscheck record {self.record.checksum[:32]}", ha="left", **style)
        page.text(RIGHT / PAGE[0], y, f"page {number} of {len(self.pages)}", ha="right", **style)
        if self.record.open:
            page.text(0.5, 0.5, "NOT FOR ACCEPTANCE", fontsize=46, rotation=52, ha="center", va="center", color="#f0f0f0",
                      weight="bold", zorder=-10)  # fmt: skip


def _step(size: float) -> float:
    return LEADING * size / 72


def wrapped(text: str, width: float, size: float, letter: float = LETTER, verbatim: bool = False) -> list[str]:
    """Lines of a text of `size` points that fit `width` inches; one empty line for none. verbatim: blanks are kept."""
    most = max(int(width * 72 / (size * letter)), 2)
    lines: list[str] = []
    for part in words.visible(text).expandtabs(4).split("\n"):
        lines += textwrap.wrap(part, most, drop_whitespace=not verbatim, replace_whitespace=False) or [""]
    return lines


def _fitted(grid: Grid) -> tuple[float, list[float]]:
    """Letter size and column widths in inches that fill the page: columns as wide as their words where there is room."""
    whole = RIGHT - LEFT
    for size in (8.0, 7.0, 6.0):
        wants = [max(_lengths(grid, k)) * size * LETTER / 72 + 0.12 for k in range(len(grid.columns))]
        wants = [max(w, 1.1) if k in grid.blank else w for k, w in enumerate(wants)]
        if sum(wants) <= whole:
            spare = whole - sum(wants)
            return size, [w + spare / len(wants) for w in wants]
    numbers = [side == "right" for _, side in grid.columns]
    fixed = sum(w for w, n in zip(wants, numbers, strict=True) if n)
    loose = sum(min(w, 2.5) for w, n in zip(wants, numbers, strict=True) if not n)
    share = max(whole - fixed, 0.3 * whole) / (loose or 1.0)
    widths = [w if n else min(w, 2.5) * share for w, n in zip(wants, numbers, strict=True)]
    return 6.0, [w * whole / sum(widths) for w in widths]


def _lengths(grid: Grid, column: int) -> Iterator[int]:
    """Of a column's cells; a head may stand in lines."""
    yield max((len(word) for word in grid.columns[column][0].split()), default=1)
    yield from (len(words.visible(row[column])) for row in grid.rows)
