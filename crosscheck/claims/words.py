"""What a column head says: trade words and symbols, and their usual abbreviations.

A head is taken apart into a noun (what stands in the column), an axis, the end of the member, whether it is an extreme, and
a unit. Which of N, R or F a table means is left to the table: "rx" is a reaction in one and a rotation in another.
"""

from __future__ import annotations

import re
import unicodedata
from dataclasses import dataclass, replace
from fractions import Fraction
from functools import lru_cache

from crosscheck.frame.units import ANGLE, FORCE, GRAVITY, LENGTH, LONGEST, MOMENT, Dimension, UnitError, parse_unit

RESULT_NOUNS = frozenset(["N", "V", "M", "F", "R", "D", "T", "w"])
"""Nouns of results: axial, shear, moment, force, reaction, displacement, turning (rotation), deflection across."""


@dataclass(frozen=True, slots=True)
class Size:
    """A unit of a claim: its writing, its dimension (force, length, moment, angle or plain) and its size in N, m, rad."""

    text: str
    dimension: Dimension
    factor: float


@dataclass(frozen=True, slots=True)
class Head:
    """A column head taken apart.

    noun: one of RESULT_NOUNS, or member, joint, end, case, station, which (a column that says max or min), x (a bare
    axis), or an echo noun (E, I, A, length, section, support, angle); "" where nothing is known.
    axis: x, y, z or "". end: 0 for the start of a member, 1 for its end. which: "max", "min", "size" or "".
    """

    text: str
    noun: str = ""
    axis: str = ""
    end: int | None = None
    which: str = ""
    unit: Size | None = None
    share: bool = False
    """The station is a share of the length (x/L, %)."""


_NOUN_WORDS = {
    "T": "rotation rotations rot rotn rotan theta phi slope twist turn",
    "M": "moment moments bending bm mom moms couple couples mt",
    "V": "shear shears sf shr",
    "N": "axial normal thrust ax axl",
    "w": "deflection deflections defl sag",
    "D": "displacement displacements disp displ displs translation translations trans movement movements sway drift",
    "R": "reaction reactions react reac rct rxn rxns",
    "case": "case cases lc loadcase combination combinations combo comb combn loading lcase loadcomb loadcombination ldc "
    "governing governs decisive determining",
    "which": "extreme extremes envelope env type kind maxmin",
    "station": "station stations sta stn dist distance loc location pos position abscissa offset",
    "I": "inertia ixx iyy izz",
    "E": "modulus youngs emod",
    "A": "area",
    "length": "length len",
    "section": "section sect profile",
    "support": "restraint restraints fixity",
    "angle": "angle",
    "F": "force forces frc",
    "joint": "joint joints jt jnt jnts node nodes nd nod point pt pnt support supports supp sup knot vertex",
    "member": "member members mbr memb mem beam beams bar bars element elements elem elems ele elt el rod rods",
    "end": "end ends side",
}
_NOUNS = {word: noun for noun, words in _NOUN_WORDS.items() for word in words.split()}
_RANK = {noun: k for k, noun in enumerate(_NOUN_WORDS)}
_AXES = {
    "x": "x", "y": "y", "z": "z", "horizontal": "x", "horiz": "x", "hor": "x", "hz": "x", "vertical": "y", "vert": "y",
    "vrt": "y", "vt": "y",
}  # fmt: skip
_FIRST = frozenset(["i", "start", "from", "begin", "beginning", "first", "left", "bottom", "near", "l", "lh"])
_LAST = frozenset(["j", "to", "last", "right", "top", "far", "second", "rh"])
_WHICH = {
    "max": "max", "maximum": "max", "largest": "max", "peak": "max", "maxi": "max", "greatest": "max", "highest": "max",
    "min": "min", "minimum": "min", "least": "min", "smallest": "min", "lowest": "min",
    "abs": "size", "absolute": "size", "magnitude": "size",
}  # fmt: skip
_GREEK = {"θ": "theta", "φ": "phi", "ϕ": "phi", "δ": "d", "∆": "d", "ξ": "x", "ϑ": "theta", "ω": "phi", "Δ": "d"}
_SYMBOL_NOUNS = {
    "n": "N", "v": "V", "q": "V", "m": "M", "f": "F", "p": "F", "r": "R", "d": "D", "u": "D", "t": "M", "rot": "T",
    "theta": "T", "phi": "T", "th": "T", "w": "w", "disp": "D", "trans": "D", "del": "D", "delta": "D", "s": "V",
    "rx": "R", "rxn": "R", "reac": "R", "h": "F", "sf": "V", "bm": "M",
}  # fmt: skip
_SYMBOL = re.compile(
    r"(rot|theta|phi|th|rxn|reac|disp|trans|delta|del|bm|sf|[nvqmfprdutwhs])([xyz]?)(\d{0,2})(max|min|abs|start|end|from|to|ij|ji|ab|ba|[ijab]?)"
)
_CAMEL = re.compile(r"(?<=[a-z]{2})(?=[A-Z])")
"""Words written together: "RxnFX", "AxialForce"."""
_NUMBERED_AXIS = {"1": "x", "2": "y", "3": "z", "11": "x", "22": "y", "33": "z"}
_BRACKETS = re.compile(r"[\[({<]([^\[\](){}<>]*)[\])}>]")
_STRAY = re.compile(r"(?:^|[\s,;:/]|\bin\s)([^\s,;:]{1,12})\s*$")
_FIT = frozenset({FORCE, LENGTH, MOMENT, ANGLE, Dimension(mass=1), Dimension(mass=1, length=1)})
_SCALED = re.compile(r"^(?:x|\*|\u00d7)?\s*(?:1e|10\^?|10\*\*)([+-]?\d+)\s*[*\u00b7\s]?\s*(.+)$")
_MAY_BE_UNIT = re.compile(r"(?!.*[A-Za-z]{9})[\w%\u00b0\u00b5\u00d7(/*^-][^,;:!?]*$")
_NOT_UNITS = frozenset(["i", "j", "a", "b", "g", "x", "y", "z", "e", "f", "n", "m", "k", "c", "t", "h", "in"])
"""Bare letters that a head means as symbols, not as units."""


@lru_cache(maxsize=16384)
def unit_of(text: str) -> Size | None:
    """The unit written in `text` if it can belong to a result, else None. Masses count as their weight."""
    text = text.strip().strip(".")
    if not text or len(text) > LONGEST or not _MAY_BE_UNIT.match(text):
        return None
    if text == "%":
        return Size("%", Dimension(), 0.01)
    power = Fraction(1)
    if scaled := _SCALED.match(text):
        if abs(int(scaled.group(1))) > 12:
            return None
        power, bare = Fraction(10) ** int(scaled.group(1)), scaled.group(2)
    else:
        bare = text
    try:
        unit = parse_unit(_tonnes(bare))
    except UnitError:
        return None
    if unit.dimension not in _FIT:
        return None
    d = unit.dimension
    factor = unit.factor * power * GRAVITY**d.mass
    return Size(text, Dimension(force=d.force + d.mass, length=d.length, angle=d.angle), float(factor))


def _tonnes(text: str) -> str:
    return re.sub(r"\bton(?:ne)?s?(?:f|\b)", "tf", text)


@lru_cache(maxsize=8192)
def head_of(text: str) -> Head:
    """A column head taken apart; noun "" where nothing in it is known."""
    text = " ".join(text.split())
    if len(text) > 80:
        return Head(text)
    if property_head := _property(text):
        return Head(text, property_head)
    bare, unit = _without_unit(text)
    bare = _CAMEL.sub(" ", bare)
    tidy = unicodedata.normalize("NFKC", "".join(_GREEK.get(c, c) for c in bare)).lower()
    share = bool(re.search(r"\bx\s*/\s*l\b|%|\brel(ative)?\b|\bratio\b|\bfraction\b|\bxi\b", tidy))
    if re.fullmatch(r"x\s*/\s*l(ength)?", tidy.strip()):
        return Head(text, "station", share=True)
    if re.fullmatch(r"l\s*/\s*c", tidy.strip()):
        return Head(text, "case")
    if tidy.strip() == "at":
        return Head(text, "end")
    if unit and unit.text == "%":
        share, unit = True, None
    head = _from_tokens(text, re.findall(r"[a-z]+\d*(?:max|min)?|\d+|[+-]", tidy))
    return replace(head, unit=unit, share=share and head.noun in ("station", "x"))


_PROPERTY = re.compile(r"([IAE])[xyz]{0,2}\s*[\[(](.{1,12})[\])]")
_PROPERTY_DIMENSION = {"I": Dimension(length=4), "A": Dimension(length=2), "E": Dimension(force=1, length=-2)}


def _property(text: str) -> str:
    """I, A or E where the head's unit shows that it is a second moment of area, an area or a modulus."""
    found = _PROPERTY.fullmatch(text)
    if not found:
        return ""
    try:
        dimension = parse_unit(found.group(2)).dimension
    except UnitError:
        return ""
    return found.group(1) if dimension == _PROPERTY_DIMENSION[found.group(1)] else ""


def _without_unit(text: str) -> tuple[str, Size | None]:
    """The head without its unit, in brackets or at its end ("Moment, kNm")."""
    for found in _BRACKETS.finditer(text):
        inner = found.group(1)
        if unit := unit_of(inner):
            return text[: found.start()] + " " + text[found.end() :], unit
    stray = _STRAY.search(text)
    if stray and stray.start() > 0 and stray.group(1).lower() not in _NOT_UNITS:
        unit = unit_of(stray.group(1))
        if unit:
            return re.sub(r"[\s,;:/]+(in)?$", "", text[: stray.start()]), unit
    return text, None


def _from_tokens(text: str, tokens: list[str]) -> Head:
    noun, axis, end, which = "", "", None, ""
    for token in tokens:
        candidate = _NOUNS.get(token, "")
        if candidate == "end" and tokens.index(token) == 0 and any(t in ("node", "joint", "jt") for t in tokens[1:]):
            end, candidate = 1, ""  # "end joint" beside "start joint"
        if candidate == "end" and noun in RESULT_NOUNS:
            end, candidate = 1, ""  # "axial force end" beside "axial force start"
        if candidate:
            if not noun or _RANK.get(candidate, 99) < _RANK.get(noun, 99):
                noun = candidate
        elif token in _AXES and not axis:
            axis = _AXES[token]
        elif token in _WHICH:
            which = which or _WHICH[token]
        elif token in _FIRST:
            end = 0
        elif token in _LAST:
            end = 1
        elif token == "load" and not noun:
            noun = "case"
        elif token == "id" and not noun:
            noun = "id"
        elif token in (
            "no",
            "number",
            "name",
            "label",
            "nr",
            "force",
            "value",
            "at",
            "of",
            "the",
            "and",
            "global",
            "local",
        ):
            continue
        else:
            symbol = _from_symbol(text, token)
            if symbol.noun and (not noun or noun in ("end", "F", "R", "joint", "support")):
                noun, axis = (noun if noun == "R" and symbol.noun == "F" else symbol.noun), symbol.axis or axis
                end, which = (symbol.end if symbol.end is not None else end), which or symbol.which
            elif token in ("ab", "ij", "ba", "ji") and noun in RESULT_NOUNS:
                end = 0 if token in ("ab", "ij") else 1
            elif token in ("1", "a"):
                end = 0 if noun else end
            elif token in ("2", "b"):
                end = 1 if noun else end
    if not noun and axis:
        noun = "x"
    return Head(text, noun, axis, end, which)


def _from_symbol(text: str, token: str) -> Head:
    """A symbol such as n, fx, mz, m3, vmax, mi, m1, mij; a 1 or 2 may be an end or an axis: the table decides."""
    if token in ("e", "a", "i", "l"):
        return (
            Head(text, {"e": "E", "a": "A", "i": "I", "l": "length"}[token]) if text.strip()[:1].isupper() else Head(text)
        )
    found = _SYMBOL.fullmatch(token)
    if not found:
        return Head(text)
    letter, axis, number, tail = found.groups()
    noun = _SYMBOL_NOUNS[letter]
    if letter == "h":
        axis = axis or "x"
    end = {
        "i": 0,
        "start": 0,
        "from": 0,
        "a": 0,
        "ij": 0,
        "ab": 0,
        "ba": 1,
        "j": 1,
        "end": 1,
        "to": 1,
        "b": 1,
        "ji": 1,
    }.get(tail)
    which = {"max": "max", "min": "min", "abs": "size"}.get(tail, "")
    if number in _NUMBERED_AXIS and not axis:
        axis = number  # kept as a number until the table is known
    return Head(text, noun, axis, end, which)


NUMBERED_AXIS = _NUMBERED_AXIS


@lru_cache(maxsize=16384)
def is_header_word(text: str) -> bool:
    """Does the cell say what stands below it?"""
    head = head_of(text)
    return bool(head.noun or head.which or head.end is not None)
