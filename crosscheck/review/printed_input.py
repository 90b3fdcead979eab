"""The other model's own input, as it printed it: coordinates, member ends, sections, materials, supports, load totals.

Tables of input are plainer than tables of results: a line of heads, then rows with as many cells. The cells become
the same facts that a paste of results keeps apart from its results.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from pathlib import Path

from crosscheck.claims.decode import lines_of, read_source, refuse
from crosscheck.claims.names import Names
from crosscheck.claims.numbers import Number, commas_are_decimal, parse_number
from crosscheck.claims.reading import EchoFact, FrameNames
from crosscheck.claims.split import separator_of, split, wide_cells
from crosscheck.claims.words import Size
from crosscheck.frame.units import UnitError, parse_unit

ROLES = {
    "joint": r"joints?|nodes?|points?|supports?|(joint|node|support) (no|nr|name|id|label)",
    "member": r"members?|elements?|beams?|bars?|elem|(member|element|beam|bar) (no|nr|name|id|label)",
    "start": r"start|from|i|(start|from|first|i) ?(joint|node|end)|(joint|node) ?(i|1|a|start|from)|end ?(i|1|a)",
    "last": r"end|to|j|(end|to|last|second|j) ?(joint|node|end)|(joint|node) ?(j|2|b|end|to)|end ?(j|2|b)",
    "x": r"x|x ?coord(inate)?", "y": r"y|y ?coord(inate)?", "z": r"z|z ?coord(inate)?",
    "dx": r"[dut]x", "dy": r"[dut]y", "dz": r"[dut]z",
    "turn": r"r|rot|rotation|rz|ry|mz|rotz",
    "type": r"type|condition|fixity|restraint|kind|support type",
    "section": r"sections?|profile|property|section (name|no|id)", "material": r"materials?|material (name|no|id)",
    "I": r"i|iy|iz|ix|ixx|iyy|izz|inertia|second moment( of area)?|moment of inertia",
    "A": r"a|ax|area|cross.?section(al)? area", "E": r"e|e.?mod(ulus)?|modulus|young'?s( modulus)?|elastic modulus",
    "case": r"case|load ?case|lc|loading|load case (name|no|id)",
    "fx": r"(sum |total |σ ?|∑ ?)?(fx|rx|h|horizontal)", "fy": r"(sum |total |σ ?|∑ ?)?(fy|ry|v|vertical)",
    "fz": r"(sum |total |σ ?|∑ ?)?(fz|rz)",
}  # fmt: skip
"""Words of heads, whole cells, brackets and case left out. The first that fits counts, but "I" beside "A" or "E"."""
_ROLES = {role: re.compile(words) for role, words in ROLES.items()}
_HELD = frozenset({"1", "yes", "y", "true", "fixed", "held", "x", "rigid", "r", "restrained", "fix"})
_FREE = frozenset({"0", "no", "n", "false", "free", "-", "f", "released"})
_WORDS = {"fixed": "111", "encastre": "111", "clamped": "111", "built-in": "111", "pin": "110", "hinge": "110",
          "roller": "010", "sliding": "010"}  # fmt: skip
_BRACKET = re.compile(r"[\[(]([^\])]*)[\])]")
_BEFORE_BRACKET = re.compile(r"\s+(?=[\[(])")
_LETTER = re.compile(r"[^\W\d_]")
Cells = dict[str, str]


def read_echo(path_or_dash: str | Path, frame_names: FrameNames) -> tuple[tuple[EchoFact, ...], tuple[int, ...]]:
    """Facts in the file, or "-" for standard input, and the lines of numbers that hold none. Raises UnusableInput where it
    cannot be opened or holds no fact."""
    file, _, text = read_source(path_or_dash)
    found = echo_of(text, frame_names)
    if not found:
        advice = "tables such as Joint, X, Y; Member, Start, End; Section, I, A; Support, Type; Load case, Fx, Fy"
        refuse(file or "echo", "holds no input of a model that is recognised", advice)
    told = {fact.line for fact in found}
    unread = (k for k, line in enumerate(lines_of(text), 1) if k not in told and _numbers(line) >= 2)
    return found, tuple(unread)


def _numbers(line: str) -> int:
    return sum(parse_number(cell) is not None for cell in _cells(line))


def echo_of(text: str, frame_names: FrameNames) -> tuple[EchoFact, ...]:
    """Every fact of a text, in its order."""
    names = Names(frame_names, {}, {}, {})
    lines = lines_of(text)
    comma = bool(commas_are_decimal([[cell for line in lines for cell in _cells(line)]]))
    heads: list[str] = []
    tables: list[list[list[EchoFact]]] = []
    for number, line in enumerate(lines, 1):
        if _roles(fresh := _head_cells(line)):
            heads = fresh
            tables.append([])
            continue
        row = _fitted(line, len(heads))
        if heads and row:
            tables[-1].append(list(_facts(number, heads, _roles(heads), row, names, comma)))
        elif _LETTER.search(_BRACKET.sub(" ", line)) and not any(c.isdigit() for c in line):
            heads = []  # a title, or heads that nobody knows: what follows is not of the table above
    # Supports are told row by row or not at all: a table of displacements has zeros in some of its rows only.
    return tuple(f for rows in tables for facts in rows for f in facts if f.what != "support" or all(rows))


def _cells(line: str) -> list[str]:
    return [c.text.strip() for c in split(line, separator_of(line)) if c.text.strip()]


def _head_cells(line: str) -> list[str]:
    """Cells of a line of heads. Where blanks part them, two or more do, because a unit may stand behind one; single ones
    where that leaves one cell, with units in brackets put to their heads."""
    if separator_of(line) != "blank":
        return _cells(line)
    wide = [c.text.strip() for c in wide_cells(line) if c.text.strip()]
    return wide if len(wide) > 1 else _cells(_BEFORE_BRACKET.sub("", line))


def _fitted(line: str, width: int) -> list[str]:
    """The line's cells where they are as many as the heads, else none."""
    return next((cells for cells in (_cells(line), _head_cells(line)) if len(cells) == width), [])


def _roles(heads: Sequence[str]) -> list[str]:
    """A role for each head; none where fewer than two, or not more than half, are known."""
    tidy = [" ".join(_BRACKET.sub(" ", h).replace("_", " ").lower().split()) for h in heads]
    found = [next((role for role, words in _ROLES.items() if words.fullmatch(t)), "") for t in tidy]
    if {"A", "E", "section"} & set(found):
        found = ["I" if t == "i" else role for t, role in zip(tidy, found, strict=True)]
    known = [role for role in found if role]
    return found if len(known) >= 2 and 2 * len(known) > len(found) else []


def _facts(
    line: int, heads: Sequence[str], roles: Sequence[str], row: Sequence[str], names: Names, comma: bool
) -> Iterator[EchoFact]:
    """The facts of one row: what a table is follows from its roles."""
    cell: Cells = {role: text for role, text in zip(roles, row, strict=True) if role}
    unit = {role: unit_in(head) for role, head in zip(roles, heads, strict=True) if role}
    values = {role: parse_number(text, comma) for role, text in cell.items()}
    if {"start", "last"} <= set(cell):
        yield from _ends(line, cell, names)
    elif "case" in cell:
        yield from _totals(line, cell, values, unit, names)
    elif {"I", "A", "E"} & set(cell):
        label = cell.get("section") or cell.get("material") or cell.get("member") or row[0]
        hit = names.member(label) if "section" not in cell and "material" not in cell else None
        for what in ("I", "A", "E"):
            if (number := values.get(what)) is not None:
                yield EchoFact(line, what, hit.name if hit else label, number.value, number.half, unit[what])
    elif "joint" in cell and ({"turn", "type"} & set(cell)):
        yield from _support(line, cell, names)
    elif "joint" in cell and "x" in cell:
        yield from _coordinates(line, cell, values, unit, names)


def _coordinates(
    line: int, cell: Cells, values: dict[str, Number | None], unit: dict[str, Size | None], names: Names
) -> Iterator[EchoFact]:
    where = names.joint(cell["joint"]) or cell["joint"]
    for role, what in (("x", "joint x"), ("y" if "y" in cell else "z", "joint y")):
        if (number := values.get(role)) is not None:
            yield EchoFact(line, what, where, number.value, number.half, unit[role])


def _ends(line: int, cell: Cells, names: Names) -> Iterator[EchoFact]:
    first, last = (names.joint(cell[k]) or cell[k] for k in ("start", "last"))
    label = cell.get("member", f"{first}-{last}")
    hit = names.member(label)
    yield EchoFact(line, "member ends", hit.name if hit else label, f"{first} to {last}")


def _support(line: int, cell: Cells, names: Names) -> Iterator[EchoFact]:
    where = names.joint(cell["joint"]) or cell["joint"]
    if "type" in cell:
        word = next((w for w in _WORDS if cell["type"].lower().startswith(w)), None)
        flags = _WORDS[word] if word else ""
    else:
        up = "y" if {"y", "dy"} & set(cell) else "z"
        marks = [cell.get(k, cell.get(f"d{k}", "")).lower() for k in ("x", up)] + [cell.get("turn", "").lower()]
        flags = "".join("1" if m in _HELD else "0" if m in _FREE else "?" for m in marks)
    if flags and "?" not in flags:
        yield EchoFact(line, "support", where, flags)


def _totals(
    line: int, cell: Cells, values: dict[str, Number | None], unit: dict[str, Size | None], names: Names
) -> Iterator[EchoFact]:
    where = names.case(cell["case"]) or cell["case"]
    for role, what in (("fx", "total x"), ("fy" if "fy" in cell else "fz", "total y")):
        if (number := values.get(role)) is not None:
            yield EchoFact(line, what, where, number.value, number.half, unit[role])


def unit_in(head: str) -> Size | None:
    """The unit in the brackets of a head, "I (cm4)"; powers may stand without a sign."""
    found = _BRACKET.search(head)
    text = found.group(1).strip() if found else ""
    for form in (text, re.sub(r"([a-zA-Z])(\d)", r"\1^\2", text)) if text else ():
        try:
            unit = parse_unit(form)
        except UnitError:
            continue
        return Size(text, unit.dimension, float(unit.factor))
    return None
