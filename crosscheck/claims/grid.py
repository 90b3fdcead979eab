"""Fourth stage: a table's lines to columns, each with its head and one cell a row.

Blank-separated lines are the hard ones: names may hold blanks, cells may be empty, heads may be of several words. Where the
rows stand in line, position decides; else the count of words.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable
from dataclasses import dataclass, field

from crosscheck.claims.names import Names, without_prefix
from crosscheck.claims.numbers import is_blank
from crosscheck.claims.scan import RawTable, is_number
from crosscheck.claims.split import Cell, Separator, join_units, separator_of, split, wide_cells
from crosscheck.claims.words import RESULT_NOUNS, Head, head_of, is_header_word, unit_of

Row = list[str]


@dataclass(slots=True)
class Grid:
    """heads: one a column. rows: cells, as many as heads. lines: line numbers. odd: (line, text, why) of unusable rows."""

    heads: list[Head]
    rows: list[Row] = field(default_factory=list)
    lines: list[int] = field(default_factory=list)
    kept: list[int] = field(default_factory=list)
    """Index of each row among the raw table's rows."""
    odd: list[tuple[int, str, str]] = field(default_factory=list)


def grid_of(table: RawTable, names: Names, columns: tuple[str, ...] = ()) -> Grid:
    """The table's columns. `columns` are heads stated by the user, used where they are as many as the columns."""
    if not table.rows:
        return Grid([])
    separator = Counter(separator_of(text) for _, text in table.rows).most_common(1)[0][0]
    if separator == "blank":
        rows = [join_names(join_units(split(text, separator)), names) for _, text in table.rows]
        return _by_blanks(table, rows, columns)
    rows = [split(text, separator) for _, text in table.rows]
    return _by_marks(table, rows, separator, columns)


# -- tabs, bars, semicolons, commas


def _by_marks(table: RawTable, rows: list[list[Cell]], separator: Separator, columns: tuple[str, ...]) -> Grid:
    head_rows = [[c.text for c in split(text, separator)] for _, text in table.heads]
    width = max([len(h) for h in head_rows] or [Counter(len(r) for r in rows).most_common(1)[0][0]])
    texts = _stack([h + [""] * (width - len(h)) for h in head_rows], width)
    grid = Grid([])
    for k, (cells, (line, text)) in enumerate(zip(rows, table.rows, strict=True)):
        row = [c.text for c in cells]
        while len(row) > width and is_blank(row[-1]):
            row.pop()
        if len(row) > width:
            grid.odd.append((line, text, f"{len(row)} cells under {width} heads"))
            continue
        grid.rows.append(row + [""] * (width - len(row)))
        grid.lines.append(line)
        grid.kept.append(k)
    grid.heads = _stated(columns, width) or [head_of(t) for t in texts]
    return grid


def _stated(columns: tuple[str, ...], width: int) -> list[Head] | None:
    return [head_of(c) for c in columns] if columns and len(columns) == width else None


def _stack(head_rows: list[Row], width: int) -> Row:
    """Head lines above each other to one text a column; a group head counts for the empty cells right of it."""
    texts = [""] * width
    for depth, row in enumerate(head_rows):
        below = head_rows[depth + 1 :]
        group = ""
        for k in range(width):
            cell = row[k]
            group = cell or group
            spread = not cell and below and any(r[k] for r in below) and not _all_units(below[0])
            texts[k] = _put_together(texts[k], group if spread else cell)
    return texts


def _all_units(row: Row) -> bool:
    return all(unit_of(c.strip("[](){}")) or not c.strip("[](){} -") for c in row)


def _put_together(above: str, below: str) -> str:
    bare = below.strip("[](){}")
    if above and bare and unit_of(bare) and not is_header_word(below):
        return f"{above} [{bare}]"
    return f"{above} {below}".strip()


# -- blanks


def join_names(cells: list[Cell], names: Names) -> list[Cell]:
    """Puts names of several words together: "Member 3", "B - A", "roof beam"."""
    out: list[Cell] = []
    k = 0
    while k < len(cells):
        size = _name_size(cells, k, names)
        part = cells[k : k + size]
        out.append(Cell(part[0].start, part[-1].end, " ".join(c.text for c in part)))
        k += size
    return out


def _name_size(cells: list[Cell], k: int, names: Names) -> int:
    """How many cells from k make one name."""
    for size in (4, 3, 2):
        part = cells[k : k + size]
        if len(part) < size or is_number(part[-1].text) and is_number(part[0].text):
            continue
        text = " ".join(c.text for c in part)
        gap = max(b.start - a.end for a, b in zip(part, part[1:], strict=False))
        if _is_one_name(text, part, names) and gap < 4:
            return size
    return 1


def _is_one_name(text: str, part: list[Cell], names: Names) -> bool:
    if text in names.frame.members or text in names.frame.xy or text in names.frame.cases:
        return True
    if len(part) == 2:
        bare = {without_prefix(text, kind) for kind in ("member", "joint", "case")}
        return part[1].text in bare or (part[1].text.lstrip("#:.") in bare)
    middle = [c.text for c in part[1:-1]]
    dashed = any(m in ("-", "\u2013", "\u2212", "\u2014", "to", "->", "\u2192", "/") for m in middle)
    return dashed and names.member(text) is not None


def _by_blanks(table: RawTable, rows: list[list[Cell]], columns: tuple[str, ...]) -> Grid:
    counts = Counter(len(r) for r in rows)
    width = max(counts, key=lambda n: (counts[n] if n > 1 else 0, n))
    wider = [n for n in counts if n > width and counts[n] >= 0.2 * len(rows)]
    width = max([width, *wider])
    full = [r for r in rows if len(r) == width]
    spans = [(min(r[j].start for r in full), max(r[j].end for r in full)) for j in range(width)]
    aligned = all(a[1] <= b[0] for a, b in zip(spans, spans[1:], strict=False))
    grid = Grid([])
    for k, (cells, (line, text)) in enumerate(zip(rows, table.rows, strict=True)):
        row = _placed(cells, spans, aligned)
        if row is None:
            grid.odd.append((line, text, f"{len(cells)} cells in a table of {width} columns"))
            continue
        grid.rows.append(row)
        grid.lines.append(line)
        grid.kept.append(k)
    grid.heads = _stated(columns, width) or _blank_heads(table, spans, aligned)
    return grid


def _placed(cells: list[Cell], spans: list[tuple[int, int]], aligned: bool) -> Row | None:
    """The row's cells under their columns; missing ones are empty."""
    width = len(spans)
    if len(cells) == width:
        return [c.text for c in cells]
    if len(cells) > width or not cells:
        return None
    if aligned:
        where = [_nearest(c, spans) for c in cells]
        if len(set(where)) == len(where):
            row = [""] * width
            for j, cell in zip(where, cells, strict=True):
                row[j] = cell.text
            return row
    return [""] * (width - len(cells)) + [c.text for c in cells]


def _nearest(cell: Cell, spans: list[tuple[int, int]]) -> int:
    """The column that the cell overlaps most, else the one it is nearest to."""

    def distance(j: int) -> float:
        start, end = spans[j]
        return max(start - cell.end, cell.start - end) - 0.001 * min(cell.end, end)

    return min(range(len(spans)), key=distance)


def _blank_heads(table: RawTable, spans: list[tuple[int, int]], aligned: bool) -> list[Head]:
    """Heads of the columns: by wide gaps, by words, by position; the first way that understands the most."""
    width = len(spans)
    if not table.heads:
        return [Head("")] * width
    best: list[Head] = []
    for way in (_by_wide, _by_words, _by_single_words, _by_words_with_ends, _by_place):
        stacked = [""] * width
        for depth, (_, text) in enumerate(table.heads):
            units = wide_or_single(text)
            row = _under(units, spans, aligned) if depth and _all_units([c.text for c in units]) else way(text, spans, aligned, depth < len(table.heads) - 1)
            if row is None:
                break
            stacked = [_put_together(a, b) for a, b in zip(stacked, row, strict=True)]
        else:
            heads = [head_of(t) for t in stacked]
            if _understood(heads) > _understood(best):
                best = heads
    return best or [Head("")] * width


def wide_or_single(text: str) -> list[Cell]:
    """Cells of a line of units."""
    wide = wide_cells(text)
    return wide if all(unit_of(c.text.strip("[](){}")) for c in wide) else split(text, "blank")


def _under(cells: list[Cell], spans: list[tuple[int, int]], aligned: bool) -> Row | None:
    """A line of units under the heads: by place, or the last columns where the rows do not stand in line."""
    if len(cells) > len(spans):
        return None
    return _placed(cells, spans, aligned)


def _understood(heads: list[Head]) -> float:
    return sum(bool(h.noun) + 0.1 * bool(h.unit or h.end is not None) for h in heads)


def _by_wide(text: str, spans: list[tuple[int, int]], aligned: bool, group: bool) -> Row | None:
    cells = wide_cells(text)
    if len(cells) == len(spans):
        return [c.text for c in cells]
    return _under_groups(cells, spans) if group and aligned else _fewer(cells, spans, aligned)


def _by_words(text: str, spans: list[tuple[int, int]], aligned: bool, group: bool) -> Row | None:
    return _by_count(_phrases(split(text, "blank"), _belongs), spans, aligned, group)


def _by_single_words(text: str, spans: list[tuple[int, int]], aligned: bool, group: bool) -> Row | None:
    return _by_count(_phrases(split(text, "blank"), _is_units_of), spans, aligned, group)


def _by_words_with_ends(text: str, spans: list[tuple[int, int]], aligned: bool, group: bool) -> Row | None:
    return _by_count(_phrases(split(text, "blank"), _belongs_or_end), spans, aligned, group)


def _by_count(words: list[Cell], spans: list[tuple[int, int]], aligned: bool, group: bool) -> Row | None:
    if len(words) == len(spans):
        return [c.text for c in words]
    return None if group else _fewer(words, spans, aligned)


def _fewer(cells: list[Cell], spans: list[tuple[int, int]], aligned: bool) -> Row | None:
    """One head fewer than columns: a printed index stands unnamed on the left (or position tells which lacks a head)."""
    if aligned and 0 < len(cells) < len(spans):
        return _placed(cells, spans, aligned)
    return [""] + [c.text for c in cells] if len(cells) == len(spans) - 1 else None


def _by_place(text: str, spans: list[tuple[int, int]], aligned: bool, group: bool) -> Row | None:
    if not aligned:
        return None
    if group:
        return _under_groups(wide_cells(text), spans)
    row = [""] * len(spans)
    for cell in split(text, "blank"):
        j = _nearest(cell, spans)
        row[j] = f"{row[j]} {cell.text}".strip()
    return row


def _under_groups(cells: list[Cell], spans: list[tuple[int, int]]) -> Row | None:
    """A head line whose cells stand over several columns: each column takes the group whose middle is nearest, or the last
    one that begins at or before it where groups begin in line with their first column."""
    if not cells:
        return None
    begins = all(any(abs(c.start - s) <= 2 for s, _ in spans) for c in cells)
    row = []
    for start, end in spans:
        if begins:
            over = [c for c in cells if c.start <= start + 2]
            row.append(over[-1].text if over else "")
        else:
            middle = (start + end) / 2
            row.append(min(cells, key=lambda c: abs((c.start + c.end) / 2 - middle)).text)
    return row


def _phrases(words: list[Cell], belongs: Callable[[str, str], bool]) -> list[Cell]:
    """Head words that belong together: a unit to what stands before it, "load" to "case", "axial" to "force"."""
    out: list[Cell] = []
    for word in words:
        last = out[-1] if out else None
        if last and belongs(last.text, word.text):
            out[-1] = Cell(last.start, word.end, f"{last.text} {word.text}")
        else:
            out.append(word)
    return out


_PAIRS = {
    "load": {"case", "combination", "comb", "comb.", "combo", "no.", "no"}, "axial": {"force", "load"},
    "shear": {"force"}, "bending": {"moment"}, "end": {"moment", "node", "joint", "shear"}, "start": {"node", "joint"},
    "normal": {"force"}, "member": {"no", "no.", "end", "name", "id"}, "joint": {"no", "no.", "name", "i", "j", "id"},
    "node": {"no", "no.", "name", "i", "j", "id"}, "max": {"m", "n", "v", "moment", "shear", "axial"},
    "min": {"m", "n", "v", "moment", "shear", "axial"}, "force": {"x", "y", "z"}, "moment": {"x", "y", "z"},
    "from": {"node", "joint"}, "to": {"node", "joint"}, "beam": {"no", "no."}, "element": {"no", "no.", "id"},
    "rotation": {"x", "y", "z"}, "support": {"node", "joint", "reaction"}, "output": {"case"},
}  # fmt: skip


def _belongs(before: str, word: str) -> bool:
    return _is_units_of(before, word) or word.lower() in _PAIRS.get(before.lower().split()[-1], set())


_END_WORDS = frozenset({"i", "j", "1", "2", "start", "end", "a", "b", "from", "to", "left", "right"})


def _belongs_or_end(before: str, word: str) -> bool:
    """Also the end of the member to its result ("N i (kN)")."""
    head = head_of(before)
    return _belongs(before, word) or (word.lower() in _END_WORDS and head.noun in RESULT_NOUNS and head.end is None)


def _is_units_of(before: str, word: str) -> bool:
    bare = word.strip("[](){},")
    if word[:1] in "[({" and (unit_of(bare) or bare in ("i", "j", "x", "y", "z")):
        return True
    return "[" in before and "]" not in before or "(" in before and ")" not in before
