"""Fourth stage: a table's lines to columns, each with its head and one cell a row.

Blank-separated lines are the hard ones: names may hold blanks, cells may be empty, heads may be of several words. Where the
rows stand in line, position decides; else the count of words.
"""

from __future__ import annotations

import re
from collections import Counter
from dataclasses import dataclass, field
from itertools import combinations

from crosscheck.claims.names import Names, without_prefix
from crosscheck.claims.numbers import is_blank
from crosscheck.claims.scan import RawTable, is_number
from crosscheck.claims.split import Cell, Separator, join_units, separator_of, split, wide_cells
from crosscheck.claims.which import which_of
from crosscheck.claims.words import Head, head_of, is_header_word, unit_of

Row = list[str]
MOST_COLUMNS = 40
MOST_NAME_WORDS = 9


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
        return _by_blanks(table, _blank_rows(table, names), columns)
    rows = [split(text, separator) for _, text in table.rows]
    return _by_marks(table, rows, separator, columns)


def _blank_rows(table: RawTable, names: Names) -> list[list[Cell]]:
    """Cells of rows parted by blanks. A blank parts thousands only where rows are not of one length without: "1 125.620"
    may be a name and its value."""

    def rows(grouped: bool) -> list[list[Cell]]:
        return [join_names(join_units(split(text, "blank", grouped)), names) for _, text in table.rows]

    plain = rows(grouped=False)
    return plain if len({len(r) for r in plain}) == 1 else rows(grouped=True)


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


_DASHES = ("-", "\u2013", "\u2212", "\u2014", "to", "->", "\u2192", "/")


def _name_size(cells: list[Cell], k: int, names: Names) -> int:
    """How many cells from k make one name."""
    for size in range(min(MOST_NAME_WORDS, len(cells) - k), 4, -1):
        text = " ".join(c.text for c in cells[k : k + size])
        if text in names.frame.cases or text in names.frame.envelopes:  # "ultimate (wind, imposed odd spans)"
            return size
    for size in (4, 3, 2):
        part = cells[k : k + size]
        dashed = size == 3 and part[1:2] and part[1].text in _DASHES
        if len(part) < size or is_number(part[-1].text) and is_number(part[0].text) and not dashed:
            continue
        text = " ".join(c.text for c in part)
        gap = max(b.start - a.end for a, b in zip(part, part[1:], strict=False))
        if _is_one_name(text, part, names) and gap < 4:
            return size
    return 1


def _is_one_name(text: str, part: list[Cell], names: Names) -> bool:
    known = (names.frame.members, names.frame.xy, names.frame.cases, names.frame.envelopes)
    if any(text in some for some in known):
        return True
    if len(part) == 2 and (which := which_of(text)) and which.noun:
        return True  # "max M"
    if len(part) == 2:
        bare = {without_prefix(text, kind) for kind in ("member", "joint", "case")}
        return part[1].text in bare or (part[1].text.lstrip("#:.") in bare)
    dashed = any(c.text in _DASHES for c in part[1:-1])
    return dashed and names.member(text) is not None


def _by_blanks(table: RawTable, rows: list[list[Cell]], columns: tuple[str, ...]) -> Grid:
    counts = Counter(len(r) for r in rows)
    width = max(counts, key=lambda n: (counts[n] if n > 1 else 0, n))
    wider = [n for n in counts if n > width and counts[n] >= 0.2 * len(rows)]
    width = max([width, *wider])
    full = [r for r in rows if len(r) == width]
    spans = [(min(r[j].start for r in full), max(r[j].end for r in full)) for j in range(width)]
    # Rows parted by one blank each may seem to stand in line by chance.
    wide = any(b.start - a.end > 1 for r in full for a, b in zip(r, r[1:], strict=False))
    aligned = wide and all(a[1] <= b[0] for a, b in zip(spans, spans[1:], strict=False))
    seen = [{r[j].text for r in full if not is_number(r[j].text)} for j in range(width)]
    grid = Grid([])
    for k, (cells, (line, text)) in enumerate(zip(rows, table.rows, strict=True)):
        row = _placed(cells, spans, aligned) if aligned or len(cells) == width else _by_kind(cells, seen)
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


def _by_kind(cells: list[Cell], seen: list[set[str]]) -> Row | None:
    """A row that lacks cells and does not stand in line: they are missing where the others then look as in full rows.

    seen: the words found in each column of the full rows (none in columns of numbers).
    """
    lacking = len(seen) - len(cells)
    if not 0 < lacking <= 2 or not cells or len(seen) > MOST_COLUMNS:
        return None

    def likeness(row: Row) -> float:
        return sum(
            0.0 if not text else 2.0 if text in words else 0.5 if bool(words) != is_number(text) else -1.0
            for text, words in zip(row, seen, strict=True)
        )

    texts = [c.text for c in cells]
    rows: list[Row] = []
    for gaps in combinations(range(len(seen)), lacking):
        rest = iter(texts)
        rows.append(["" if j in gaps else next(rest) for j in range(len(seen))])
    return max(rows, key=likeness)


def _nearest(cell: Cell, spans: list[tuple[int, int]]) -> int:
    """The column that the cell overlaps most, else the one it is nearest to."""

    def distance(j: int) -> float:
        start, end = spans[j]
        return max(start - cell.end, cell.start - end) - 0.001 * min(cell.end, end)

    return min(range(len(spans)), key=distance)


def _blank_heads(table: RawTable, spans: list[tuple[int, int]], aligned: bool) -> list[Head]:
    """Heads of the columns: by wide gaps, by words, by position; the first way that understands the most."""
    width = len(spans)
    best: list[Head] = [Head("")] * width
    for way in (_by_wide, _by_words, _by_place):
        stacked: Row = [""] * width
        for depth, (_, text) in enumerate(table.heads):
            group = depth + 1 < len(table.heads) and not _is_units_line(table.heads[depth + 1][1])
            units = depth > 0 and _is_units_line(text)
            row = _units_under(stacked, text, spans, aligned) if units else way(text, spans, aligned, group)
            if row is None:
                stacked = []
                break
            stacked = [_put_together(a, b) for a, b in zip(stacked, row, strict=True)]
        heads = [head_of(t) for t in stacked]
        if heads and _understood(heads) >= width:
            return heads
        if _understood(heads) > _understood(best):
            best = heads
    return best


def _is_units_line(text: str) -> bool:
    return _all_units([c.text for c in _units_of(text)])


def _units_under(heads: Row, text: str, spans: list[tuple[int, int]], aligned: bool) -> Row | None:
    """A line of units under its heads: in order where it has one for every head that takes one, else by place."""
    units = _units_of(text)
    takers = [k for k, h in enumerate(heads) if head_of(h).noun not in (*_NAMING - {"station"}, "")]
    if len(units) != len(takers):
        return _placed(units, spans, aligned)
    row = [""] * len(heads)
    for k, unit in zip(takers, units, strict=True):
        row[k] = unit.text
    return row


def _units_of(text: str) -> list[Cell]:
    """The cells of a line of units, in brackets or not."""
    return [Cell(m.start(), m.end(), m.group()) for m in re.finditer(r"\[[^\]]*\]|\([^)]*\)|\S+", text)]


def _understood(heads: list[Head]) -> float:
    return sum(_worth(h) for h in heads)


def _by_wide(text: str, spans: list[tuple[int, int]], aligned: bool, group: bool) -> Row | None:
    cells = wide_cells(text)
    if len(cells) == len(spans):
        return [c.text for c in cells]
    if group:
        return _under_groups(cells, spans) if aligned and len(cells) > 1 else None
    return _placed(cells, spans, aligned) if aligned and 1 < len(cells) < len(spans) else None


def _by_words(text: str, spans: list[tuple[int, int]], aligned: bool, group: bool) -> Row | None:
    """The words as they group best into one head a column; or into one fewer, where a printed index has no head."""
    words = tuple(text.split())
    if group or len(words) > 2 * MOST_COLUMNS or len(spans) > MOST_COLUMNS:
        return None
    whole, fewer = _grouped(words, len(spans)), _grouped(words, len(spans) - 1)
    if fewer and (not whole or fewer[0] > whole[0] + 0.5):
        return ["", *fewer[1]]
    return list(whole[1]) if whole else None


def _by_place(text: str, spans: list[tuple[int, int]], aligned: bool, group: bool) -> Row | None:
    if not aligned:
        return None
    if group:
        cells = wide_cells(text)
        return _under_groups(cells, spans) if len(cells) > 1 else None
    row = [""] * len(spans)
    for cell in split(text, "blank"):
        j = _nearest(cell, spans)
        row[j] = f"{row[j]} {cell.text}".strip()
    return row


def _under_groups(cells: list[Cell], spans: list[tuple[int, int]]) -> Row | None:
    """A head line whose cells stand over several columns: each column takes the group whose middle is nearest, or the last
    one that begins at or before it where groups begin in line with their first column."""
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


# -- words to heads

MOST_WORDS = 5
"""Words that one head may have."""
_NAMING = frozenset({"member", "joint", "end", "case", "station", "which"})
_GENERIC = frozenset({"force", "forces", "reaction", "displacement", "disp", "disp.", "load", "bending"})
_GIVING = frozenset({"N", "V", "M", "D", "T", "w"})


def _grouped(words: tuple[str, ...], width: int) -> tuple[float, tuple[str, ...]] | None:
    """The words in order as `width` heads that together say the most; None where they cannot be."""
    if width < 1 or not width <= len(words) <= MOST_WORDS * width:
        return None
    best: list[dict[int, tuple[float, tuple[str, ...]]]] = [{} for _ in range(len(words) + 1)]
    best[0][0] = (0.0, ())
    for k in range(1, len(words) + 1):
        for size in range(1, min(MOST_WORDS, k) + 1):
            text = " ".join(words[k - size : k])
            worth = _group_worth(words[k - size : k], text)
            for count, (value, heads) in best[k - size].items():
                if count < width and (count + 1 not in best[k] or best[k][count + 1][0] < value + worth - 1e-9):
                    best[k][count + 1] = (value + worth, (*heads, text))
    return best[-1].get(width)


def _worth(head: Head) -> float:
    """How much a head says."""
    if head.noun:
        return 1.0 + 0.1 * bool(head.unit) + 0.05 * bool(head.which or head.end is not None)
    return 0.3 if head.which or head.end is not None else 0.0


def _group_worth(words: tuple[str, ...], text: str) -> float:
    """A head that holds two columns' words is worth less, and so is a unit alone."""
    if len(words) == 1 and unit_of(text.strip("[](){}")) and text[:1] in "[({":
        return -0.5
    head = head_of(text)
    # "end" behind a result is the end of the member, not a column of ends.
    nouns = [head_of(w).noun for w in words if not unit_of(w.strip("[](){}"))]
    if len(nouns) > 1 and words[-1].lower() == "end" and nouns[-2] in _GIVING | {"F"}:
        nouns.pop()
    naming, giving = ({n for n in nouns if n in kind} for kind in (_NAMING, _GIVING))
    crowd = (
        max(0, len(naming) - 1)
        + max(0, len(giving) - 1)
        + bool(naming - {"end", "joint"} and (giving or set(nouns) & {"F", "R", "x"}))
    )
    axes = len({a for w in words if (a := head_of(w).axis) and head_of(w).noun == "x"})
    given = bool({"joint", "end"} & naming and (giving or {"F", "R", "x"} & set(nouns)))
    lost = bool(head.which and head.noun in _NAMING)
    bare = len(words) == 1 and (head.noun == "x" and head.axis != "x" or text.lower() in _GENERIC)
    inside = any(w[-1:] in "])" and unit_of(w.strip("[](){}")) for w in words[:-1]) or bool(
        "x" in nouns and giving & {"N", "V"}
    )
    again = len(nouns) > len(set(nouns)) and bool(set(nouns) & {"F", "R", "D"}) or bool(nouns[:1] == ["F"] and giving)
    return (
        _worth(head)
        - 0.6 * crowd
        - 0.6 * max(0, axes - 1)
        - 0.3 * given
        - 0.5 * lost
        - 0.3 * bare
        - 0.4 * again
        - 0.6 * inside
    )
