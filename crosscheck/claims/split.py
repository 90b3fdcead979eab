"""Second stage: a line to cells, by tabs, bars, semicolons, commas or blanks, whichever the line shows."""

from __future__ import annotations

import csv
import re
from typing import Literal, NamedTuple

from crosscheck.claims.numbers import parse_number
from crosscheck.claims.words import unit_of

Separator = Literal["tab", "bar", "semicolon", "comma", "blank"]
_MARK = {"tab": "\t", "bar": "|", "semicolon": ";", "comma": ","}
_BAR = str.maketrans({"\u2502": "|", "\u2503": "|", "\u2551": "|", "\u00a6": "|"})
_BLANK = re.compile(r"[^\s]+")
_DIGIT = re.compile(r"\d")
_WIDE = re.compile(r"\S+(?:[ \u00a0]\S+)*")
_WORD = re.compile(r"\([^()\s]*,\s[^()\s]*\)|[^\s\u00a0]+(?:\u00a0[^\s\u00a0]+)*")
"""A word, or a pair of numbers in brackets."""
_RULE = re.compile(r"[\s\-=_+*~.,;|:#\u2500-\u257f\u2014\u2013<>]*")
_GROUPED = re.compile(r"(?<=  )[+-]?[1-9]\d{0,2}(?: \d{3})+(?=[.,]\d)")


class Cell(NamedTuple):
    """A cell's text and where it stands: characters for blanks, else the cell's own number as start and end."""

    start: int
    end: int
    text: str


def is_rule(line: str) -> bool:
    """A line drawn under a head, or an empty one."""
    return _RULE.fullmatch(line) is not None


def separator_of(line: str) -> Separator:
    """What parts the cells of this line."""
    if "\t" in line.strip():
        return "tab"
    if "|" in line.translate(_BAR).strip().strip("|") or line.strip().startswith("|"):
        return "bar" if not _crowded(line) else "blank"
    if ";" in line:
        return "semicolon"
    return "comma" if "," in line and _comma_parts(line) else "blank"


def _crowded(line: str) -> bool:
    """Bars round groups of blank-separated numbers are ornament."""
    parts = line.translate(_BAR).split("|")
    tokens = [part.split() for part in parts]
    return any(len(ts) > 1 and sum(parse_number(t) is not None for t in ts) == len(ts) for ts in tokens)


def _comma_parts(line: str) -> bool:
    """Do commas part the cells, rather than stand in numbers or in a sentence?"""
    if '"' in line:
        return True
    commas = line.count(",")
    inside = len(re.findall(r"\d,\d", line))
    tokens = line.split()
    if commas == inside and (len(tokens) > 1 or commas == 1):
        return any("," in t and not _is_number(t) for t in tokens)
    gaps = len(re.findall(r"\S {2,}\S", line))
    spaced = len(re.findall(r"\S {2,}(?=\S)", re.sub(r", +", ",", line)))
    return not (gaps and spaced > commas)


def _is_number(text: str) -> bool:
    return parse_number(text) is not None or parse_number(text, decimal_comma=True) is not None


def split(line: str, separator: Separator, grouped: bool = True) -> list[Cell]:
    """Cells of the line. Blanks: one cell a word, names and units still to be put together; `grouped`: a blank may part
    thousands."""
    if separator == "blank":
        line = line.translate(_BAR).replace("|", " ")
        if grouped and "  " in line.strip():  # only where wider gaps part the cells can one blank part thousands
            line = _GROUPED.sub(lambda m: m.group().replace(" ", "\u00a0"), line)
        return [Cell(*m.span(), m.group()) for m in _WORD.finditer(line)]
    if separator == "bar":
        body = line.translate(_BAR).strip()
        framed = body.startswith("|") and body.endswith("|") and len(body) > 1
        parts = (body[1:-1] if framed else line.translate(_BAR)).split("|")
    elif '"' in line:
        parts = next(csv.reader([line], delimiter=_MARK[separator], skipinitialspace=True), [])
    else:
        parts = line.rstrip("\r\n").split(_MARK[separator])
    return [Cell(k, k, _bare(part.strip())) for k, part in enumerate(parts)]


def _bare(text: str) -> str:
    """Without quotes and marks of emphasis; asterisks alone stand for a number that was too wide, and stay."""
    bare = text.strip("\"'`*")
    return bare if bare or "**" not in text else text


def wide_cells(line: str) -> list[Cell]:
    """Cells parted by two blanks or more: heads of several words stay whole."""
    return [Cell(m.start(), m.end(), m.group()) for m in _WIDE.finditer(line.translate(_BAR).replace("|", " "))]


PULLS = frozenset(["(C)", "(T)"])
"""Compression or tension, behind an axial force."""


def join_units(cells: list[Cell]) -> list[Cell]:
    """Puts a unit that stands after its number ("12.3 kN", "4.5 kN m") into the number's cell."""
    out: list[Cell] = []
    for cell in cells:
        last = out[-1] if out else None
        if last and _DIGIT.search(last.text) and cell.start - last.end <= 1 and _takes_unit(last.text, cell.text):
            out[-1] = Cell(last.start, cell.end, f"{last.text} {cell.text}")
        else:
            out.append(cell)
    return out


def _takes_unit(number: str, unit: str) -> bool:
    if unit.upper() in PULLS:
        return parse_number(number) is not None or parse_number(number, decimal_comma=True) is not None
    if unit[:1].isdigit() or not (unit[0].isalpha() or unit[0] in "%\u00b0"):
        return False
    read = parse_number(number) or parse_number(number, decimal_comma=True)
    return read is not None and unit_of(f"{read.tail} {unit}".strip()) is not None
