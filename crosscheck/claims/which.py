"""Cells and heads that say which extreme a value is: "max", "Min M", "min Fy"."""

from __future__ import annotations

from functools import lru_cache
from typing import NamedTuple

from crosscheck.claims.names import plain
from crosscheck.claims.words import RESULT_NOUNS, head_of

WHICH_WORDS = {
    "max": "max", "maximum": "max", "largest": "max", "greatest": "max", "highest": "max", "+": "max", "max+": "max",
    "min": "min", "minimum": "min", "smallest": "min", "least": "min", "lowest": "min", "min-": "min",
    "abs": "size", "absmax": "size", "maxabs": "size", "absolute": "size", "peak": "size", "extreme": "size",
}  # fmt: skip
_QUANTITY = {"N": "axial", "V": "shear", "M": "moment", "T": "rotation", "w": "across"}
LONGEST = 24


class Which(NamedTuple):
    """which: max, min or size. noun, axis: of the quantity that the cell names ("" where it names none)."""

    which: str
    noun: str = ""
    axis: str = ""

    def is_of(self, quantity: str) -> bool:
        """Is the quantity the one that the cell names, or does it name none?"""
        if not self.noun:
            return True
        by_axis = {"x": "axial", "y": "shear", "z": "shear"}.get(self.axis) if self.noun == "F" else None
        if quantity in (_QUANTITY.get(self.noun), by_axis):
            return True
        of = {"f": "FRV", "d": "D"}.get(quantity[:1], "")
        return bool(self.axis) and quantity[1:] == self.axis and self.noun in of


@lru_cache(maxsize=4096)
def which_of(text: str) -> Which | None:
    """What a cell says, or None where it names no extreme."""
    if found := WHICH_WORDS.get(plain(text)) or WHICH_WORDS.get(text.strip()):
        return Which(found)
    if len(text) > LONGEST or not text[:1].isalpha():
        return None
    head = head_of(text)
    return Which(head.which, head.noun, head.axis) if head.which and head.noun in RESULT_NOUNS else None
