"""Numbers as people print them: decimal commas, thousands, exponents, minus signs of every kind, units stuck on.

Half a unit of the last printed digit is kept with every number, because a rounding of the printout is never a disagreement.
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterable
from dataclasses import dataclass
from functools import lru_cache
from typing import Literal

_DASHES = str.maketrans(dict.fromkeys("−‐‑‒–—﹣－", "-") | {"\uff0b": "+"})
_SPACES = "\u00a0\u2007\u2009\u200a\u202f"
_GROUP = re.compile(rf"(?<=\d)[ '\u2019{_SPACES}](?=\d\d\d(?!\d))")
_PLAIN = r"\d+(?:[.,]\d*)*|[.,]\d+"
_NUMBER = re.compile(
    rf"([+-]?)\s?({_PLAIN})(?:[eEdD]([+-]?\d{{1,3}})|\s?[x\u00d7*\u00b7]\s?10\^?([+-]?\d{{1,2}}))?(-?)", re.ASCII
)
_BLANKS = frozenset({"", "-", "--", "---", "n/a", "na", "nan", "none", "null", ".", "\u2014", "\u2013"})


@dataclass(frozen=True, slots=True)
class Number:
    """A printed number: its value, half a unit of its last digit, and the text stuck to it that may be a unit."""

    value: float
    half: float
    printed: str
    tail: str = ""


def is_blank(text: str) -> bool:
    """Is the cell empty, or a dash or word that stands for nothing?"""
    return text.strip().lower() in _BLANKS


@lru_cache(maxsize=4096)  # each cell is asked for several times: is it a row, what are its columns, what is its value
def parse_number(text: str, decimal_comma: bool = False) -> Number | None:
    """The number that `text` begins with, or None where it is none; what follows it is left in `tail`."""
    printed = text.strip()
    body = _GROUP.sub("", printed.translate(_DASHES))
    negative = False
    if body[:1] == "(" and body[-1:] == ")":
        body, negative = body[1:-1].strip(), True
    found = _NUMBER.match(body)
    if not found:
        return None
    sign, digits, power, power_of_ten, trailing = found.groups()
    plain = _one_point(digits, decimal_comma)
    tail = body[found.end() :].strip().rstrip("*")
    if plain is None or (sign and trailing) or (tail and tail[0].isdigit()):
        return None
    exponent = int(power or power_of_ten or 0)
    try:
        value = float(f"{plain}e{exponent}")
    except ValueError:
        return None
    decimals = len(plain.partition(".")[2])
    # "0.0000e+00" is zero itself: with an exponent of its own, no other number is rounded to it.
    exact = value == 0 and power is not None
    half = 0.0 if exact else 0.5 * 10.0 ** (exponent - decimals) if abs(exponent - decimals) < 300 else 0.0
    if not math.isfinite(value) or not math.isfinite(half):
        return None
    if negative or sign == "-" or trailing:
        value = -value
    return Number(value, half, printed, tail)


def _one_point(digits: str, decimal_comma: bool) -> str | None:
    """The digits with one decimal point and no thousands marks, or None where the marks make no number."""
    point, group = (",", ".") if decimal_comma else (".", ",")
    whole, _, part = digits.partition(point)
    if point in part or group in part:
        return None
    groups = whole.split(group)
    if len(groups) > 1 and (not 1 <= len(groups[0]) <= 3 or any(len(g) != 3 for g in groups[1:])):
        return None
    return "".join(groups) + ("." + part if part else "")


CommaUse = Literal["none", "decimals", "thousands", "unsure"]


def comma_use(texts: Iterable[str]) -> CommaUse:
    """What commas stand for in one column of numbers."""
    unsure = whole = False
    for text in texts:
        body = _GROUP.sub("", text)
        commas, points = body.count(","), body.count(".")
        if not commas:
            if points == 1 and not re.search(r"\d\.\d{3}(?!\d)", body):
                return "thousands"
            whole = whole or (not points and any(c in "123456789" for c in body))
            continue
        if points:
            return "decimals" if body.rfind(",") > body.rfind(".") else "thousands"
        if commas > 1:
            return "thousands"
        if not re.fullmatch(r"\D*[1-9]\d{0,2},\d{3}(?!\d)\D*", body):
            return "decimals"
        unsure = True
    if not unsure:
        return "none"
    # A column's decimals have one number of places: whole numbers beside "12,345" say that its comma parts thousands.
    return "thousands" if whole else "unsure"


def commas_are_decimal(columns: Iterable[Iterable[str]]) -> bool | None:
    """Does a comma stand before the decimals, told from all columns of a table; None where nothing tells."""
    uses = {comma_use(column) for column in columns}
    if "decimals" in uses:
        return True
    return None if "unsure" in uses and "thousands" not in uses else False
