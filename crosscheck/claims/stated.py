"""What the paste, the reading file or the user states for the whole of it: units and signs.

Only words that name a quantity and a sense count as a statement of signs ("compression positive"); the heading
"bending moments" does not.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, field

from crosscheck.claims.reading import ReadingOptions
from crosscheck.claims.scan import Scan
from crosscheck.claims.words import Size, unit_of
from crosscheck.frame.units import ANGLE, FORCE, LENGTH, MOMENT, Dimension

QUANTITY_WORDS = {
    "force": ("axial", "shear", "fx", "fy"), "forces": ("axial", "shear", "fx", "fy"), "axial": ("axial",),
    "shear": ("shear",), "reactions": ("fx", "fy"), "reaction": ("fx", "fy"), "moment": ("moment",),
    "moments": ("moment",), "displacement": ("dx", "dy", "across"), "displacements": ("dx", "dy", "across"),
    "deflection": ("dx", "dy", "across"), "deflections": ("dx", "dy", "across"), "translations": ("dx", "dy", "across"),
    "rotation": ("rotation",), "rotations": ("rotation",), "length": ("station",), "lengths": ("station",),
    "distance": ("station",), "distances": ("station",), "station": ("station",), "fx": ("fx",), "fy": ("fy",),
    "dx": ("dx",), "dy": ("dy",), "across": ("across",),
}  # fmt: skip
_SENSES = (
    (r"(?:anti|counter)[ -]?clockwise\s*(?:is\s*|=\s*)?(?:taken\s*)?(?:as\s*)?(?:\+|positive)|\bccw\s*(?:\+|positive)",
     "moment", "anticlockwise"),
    (r"(?<!anti)(?<!anti-)(?<!counter)(?<!counter-)(?<!counter )\bclockwise\s*(?:is\s*|=\s*)?(?:\+|positive)"
     r"|\bcw\s*(?:\+|positive)",
     "moment", "clockwise"),
    (r"sagging\s*(?:moments?\s*)?(?:is\s*|are\s*|=\s*)?(?:\+|positive)|hogging\s*(?:is\s*|=\s*)?(?:-|negative)",
    "moment", "sagging"),
    (r"hogging\s*(?:moments?\s*)?(?:is\s*|are\s*|=\s*)?(?:\+|positive)|sagging\s*(?:is\s*|=\s*)?(?:-|negative)",
    "moment", "hogging"),
    (r"compression\s*(?:is\s*|=\s*)?(?:\+|positive)|tension\s*(?:is\s*|=\s*)?(?:-|negative)", "axial", "compression"),
    (r"tension\s*(?:is\s*|=\s*)?(?:\+|positive)|compression\s*(?:is\s*|=\s*)?(?:-|negative)", "axial", "tension"),
    (r"reactions?\b.{0,20}\bon the (?:supports?|foundations?|ground)|forces on (?:supports?|foundations?)",
    "reactions", "on the support"),
    (r"reactions?\b.{0,20}\bon the (?:frame|structure)", "reactions", "on the frame"),
    (r"\bdown(?:wards?)?\s*(?:is\s*|=\s*)?(?:\+|positive)", "vertical", "down"),
)  # fmt: skip


@dataclass(slots=True)
class Stated:
    """units: quantity to unit. system: dimension to unit, for quantities without their own. signs: what is stated."""

    units: dict[str, Size] = field(default_factory=dict)
    system: dict[Dimension, Size] = field(default_factory=dict)
    signs: dict[str, str] = field(default_factory=dict)

    def unit(self, quantity: str) -> Size | None:
        if quantity in self.units:
            return self.units[quantity]
        force, length = self.system.get(FORCE), self.system.get(LENGTH)
        if quantity in ("axial", "shear", "fx", "fy"):
            return force
        if quantity == "moment":
            return self.system.get(MOMENT) or (_times(force, length) if force and length else None)
        return self.system.get(ANGLE) if quantity == "rotation" else length


def _times(force: Size, length: Size) -> Size:
    return Size(f"{force.text} {length.text}", MOMENT, force.factor * length.factor)


def stated_in(scan: Scan) -> Stated:
    """Units and signs that headings and remarks state."""
    out = Stated()
    for _, text in [*scan.headings, *scan.remarks]:
        short = text[:500]
        if not _STATING.search(short):
            continue
        for pattern, quantity, sense in _SENSES:
            if re.search(pattern, short, re.IGNORECASE):
                out.signs.setdefault(quantity, sense)
        _units_in(short, out)
    return out


_STATING = re.compile(
    r"positive|negative|[+=\-\[(]|\bunits?\b|reaction|support|foundation|"
    r"forces?|moments?|shear|axial|displacements?|deflections?|translations?|rotations?|lengths?|distances?|station|"
    r"\b(?:fx|fy|dx|dy|across)\b",
    re.IGNORECASE,
)
"""Without any of these words a line states neither units nor signs."""
_FACE = re.compile(
    r"\b(?:at|to) (?:the )?faces?\b|\bface of (?:the )?(?:supports?|columns?|joints?|walls?)\b", re.IGNORECASE
)


def states_face(scan: Scan) -> bool:
    """Do headings or remarks say that end values stand at the face of supports or columns?"""
    return any(_FACE.search(text[:500]) for _, text in [*scan.headings, *scan.remarks])


def _units_in(text: str, out: Stated) -> None:
    """ "Units: kN, m", "forces in kN, moments in kNm", "[kN, kNm]"."""
    for word, unit_text in re.findall(
        r"([A-Za-z]+)\s*(?:\bin\b|:|=|,)?\s*[\[(]?\s*([A-Za-z]+(?:[ .*\u00b7-]?[a-z]+)?)\b", text
    ):
        unit = unit_of(unit_text) or unit_of(unit_text.split()[0])
        if word.lower() in QUANTITY_WORDS and unit and unit.dimension != Dimension():
            for quantity in QUANTITY_WORDS[word.lower()]:
                out.units.setdefault(quantity, unit)
    found = re.search(r"\bunits?\b[\s:=]*(.+)", text, re.IGNORECASE) or re.search(r"^[^\w]*[\[(]([^\])]*)[\])]\s*$", text)
    if found:
        for unit in units_of(found.group(1)):
            out.system.setdefault(unit.dimension, unit)


def units_of(text: str) -> list[Size]:
    """Every unit in a list such as "kN, m" or "kN m mm"; "kN m" alone is a force and a length."""
    parts = [p for p in re.split(r"[,;/&\s]+|\band\b", text.strip(" .[]()")) if p]
    return [u for p in parts if (u := unit_of(p))]


def parsed_units(
    units: str | Mapping[str, str] | None,
) -> tuple[dict[str, Size], dict[Dimension, Size], list[str]]:
    """(by quantity, by dimension, parts not understood) of units stated by the user: "kN m", "moment kN mm,
    displacement mm"."""
    by_quantity: dict[str, Size] = {}
    system: dict[Dimension, Size] = {}
    odd: list[str] = []
    if isinstance(units, Mapping):
        units = ", ".join(f"{word} {text}" for word, text in units.items())
    for part in (units or "").split(","):
        word, _, rest = part.strip().partition(" ")
        quantities = QUANTITY_WORDS.get(word.lower().rstrip(":="), ())
        unit = unit_of(rest.removeprefix("=").removeprefix("in ").strip()) if quantities else None
        bare = [] if quantities else units_of(part)
        if unit:
            by_quantity |= dict.fromkeys(quantities, unit)
        elif bare and len(bare) == len(part.split()):
            system |= {u.dimension: u for u in bare}
        elif not quantities and (whole := unit_of(part)):
            system[whole.dimension] = whole
        elif part.strip():
            odd.append(part.strip())
    return by_quantity, system, odd


def with_options(stated: Stated, options: ReadingOptions) -> Stated:
    """What the user states goes before what the paste states in words (not before units in heads)."""
    by_quantity, system, _ = parsed_units(options.units)
    stated.units.update(by_quantity)
    stated.system.update(system)
    stated.signs.update(options.signs)
    return stated
