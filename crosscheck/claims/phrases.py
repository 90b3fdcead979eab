"""Taking a sentence apart: symbols of hand methods and lists to plain words, and each number with the words about it.

Nothing here says what a value is of; crosscheck.claims.sentences does.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass

from crosscheck.claims.names import Names
from crosscheck.claims.numbers import Number, parse_number
from crosscheck.claims.words import Size, unit_of
from crosscheck.frame.units import LENGTH, MOMENT, Dimension

_PART = re.compile(r"\s*(?:[;\n]|,(?!\d)|\band\b|(?<=[a-z])\.\s)\s*", re.IGNORECASE)
_VALUE = re.compile(
    r"(?<![\w.,])(?P<number>[+\-\u2212]?\d+(?:[.,]\d+)*(?:[eE][+-]?\d+)?)\s*"
    r"(?P<unit>[A-Za-z\u00b5%\u00b0\u2030]+(?:[ .*\u00b7-]?(?:mm|cm|m|ft|in)\b)?)?"
)
_LOAD = re.compile(r"(?<![\w.,])[+\-\u2212]?\d+(?:[.,]\d+)*\s*[A-Za-z]+\s*/\s*[A-Za-z]\w*")
"""A load of so much a length ("12 kN/m"), which is no result."""
_LIMIT = re.compile(
    r"(?:[(\[]\s*)?(?:\b(?:limit(?:s|ed|ing)?\b(?!\s+state)|allowables?\b|allowed\b|permissible\b|permitted\b|capacity\b"
    r"|resistance\b|utili[sz]ation\b|criteri(?:on|a)\b)|<=?|\u2264)[^;,()\[\]]*[)\]]?", re.IGNORECASE)  # fmt: skip
"""What may be or can be borne ("limit L/300 = 20 mm", "< 25 mm"), which is no result."""
_NUMBER = r"[+\-\u2212]?\d+(?:[.,]\d+)?(?:[eE][+-]?\d+)?"
_NAME = r"[A-Za-z0-9']{1,6}"
_AT_JOINT = re.compile(rf"(?<![A-Za-z0-9_])(?P<letter>[MVHR])(?:_?\{{?|\s?\()(?P<joint>{_NAME})[)}}]?(?=\s*[=:])")
_ALONG_AXIS = re.compile(
    rf"(?<![A-Za-z0-9_])R?_?(?P<joint>{_NAME}?)_?\{{?(?P<axis>[xyhvHV])\}}?"
    rf"(?=\s*[=:]\s*{_NUMBER}\s*(?:[kM]|da)?(?:N|gf|lbf?|ips?|tf)\b)"
)
"""A reaction by its joint and axis; "Dx = 9 mm" is a displacement."""
_AT_JOINT_WORDS = {"M": "moment at", "V": "V at", "H": "Rx at", "R": "reaction at"}
_AXIS_WORDS = {"x": "Rx at", "h": "Rx at", "y": "Ry at", "v": "Ry at"}
_LIST = re.compile(
    rf"\s*(?P<label>[A-Za-z][^:\d()\[\]]*)[(\[](?P<unit>[^)\]\d]+)[)\]]\s*:"
    rf"(?P<items>(?:\s*(?:at\s+)?{_NAME}\s*[=:]?\s*{_NUMBER}\s*(?:[,;]|$|\band\b))+)\s*\.?\s*", re.IGNORECASE)  # fmt: skip
_ITEM = re.compile(rf"(?:at\s+)?(?P<name>{_NAME})\s*[=:]?\s*(?P<number>{_NUMBER})(?=\s*(?:[,;]|$|and\b))")
_PAIR_OF_JOINTS = re.compile(rf"(?<![\w-])(?P<first>{_NAME})\s+and\s+(?:at\s+)?(?P<last>{_NAME})(?![\w-])")
_STATION = re.compile(
    r"(?:\b(?:at|x\s*=)|@)\s*(?:x\s*=\s*)?(?P<number>\d+(?:[.,]\d+)?)\s*(?P<unit>mm|cm|m|ft|in|%)(?![\w/])"
    rf"(?:\s+(?:along|from|of)\s+(?:(?:the|joint|node|support|end|span|its|length)\s+)*(?P<origin>{_NAME})?)?",
    re.IGNORECASE,
)
_MIDSPAN = re.compile(
    r"\b(?:at\s+)?mid[\s-]?span\b|\b(?:at|in)\s+(?:the\s+)?(?:mid(?:dle|-?point)?|cent(?:re|er))\b|\bmid[\s-]?point\b", re.I
)


@dataclass(frozen=True, slots=True)
class Station:
    """A place along a member: `at` in `unit` (a share of the length where the unit is %), from the joint `origin` where
    that is said."""

    at: Number
    unit: Size
    origin: str | None = None


@dataclass(frozen=True, slots=True)
class Told:
    """One value and what its words say."""

    number: Number
    unit: Size | None
    words: str
    station: Station | None = None


def told(text: str) -> Iterator[Told]:
    """Every number with a result's unit; in a part without one the last number."""
    for part in _PART.split(_LOAD.sub(" ", _LIMIT.sub(" ", text))):
        station, part = _station(part)
        found = [m for m in _VALUE.finditer(part) if m.group("unit") and size_of(m.group("unit"))]
        found = found or list(_VALUE.finditer(part))[-1:]
        for m, words in zip(found, _words_of(part, found), strict=True):
            number = _number(m.group("number"))
            if number is not None:
                yield Told(number, size_of(m.group("unit")), words, station)


def _words_of(part: str, found: list[re.Match[str]]) -> Iterator[str]:
    """The words about each value: those before it, and for the last of them also those behind; where the part begins with a
    value, those behind each."""
    ends = [m.end() if size_of(m.group("unit")) else m.end("number") for m in found]
    behind = len(found) > 1 and not re.search(r"[A-Za-z]", part[: found[0].start()])
    for k, m in enumerate(found):
        after = found[k + 1].start() if k + 1 < len(found) else len(part)
        if behind:
            yield part[ends[k] : after]
        else:
            before = part[ends[k - 1] if k else 0 : m.start()]
            unread = "" if size_of(m.group("unit")) else part[m.end() :]
            yield before + " " + (part[ends[k] : after] if k + 1 == len(found) and not unread else "")


def size_of(text: str | None) -> Size | None:
    """The unit of a value in words."""
    return (unit_of(text) or unit_of(text.split()[0])) if text else None


def _number(text: str) -> Number | None:
    return parse_number(text, "," in text and "." not in text)


def _station(part: str) -> tuple[Station | None, str]:
    """The place along a member that the part names, and the part without it."""
    for m in _STATION.finditer(part):
        unit, number = unit_of(m.group("unit")), _number(m.group("number"))
        if unit and number and _VALUE.search(part[: m.start()] + " " + part[m.end() :]):
            return Station(number, unit, m.group("origin")), part[: m.start()] + " " + part[m.end() :]
    half, percent = parse_number("50"), unit_of("%")
    if (middle := _MIDSPAN.search(part)) and half and percent:
        return Station(half, percent), part[: middle.start()] + " " + part[middle.end() :]
    return None, part


# -- shorthand to words


def spelled_out(text: str, names: Names) -> str:
    """The sentence with lists and symbols of one joint in words: "M_A = -50" is "moment at A = -50", "Ay = 3 kN" a vertical
    reaction, "Reactions (kN): A 38.3, B 177.9" one reaction each. Pairs of joints ("A and D") are kept together."""
    text = _listed(text, names)

    def at_joint(m: re.Match[str]) -> str:
        return _spelled(m, _AT_JOINT_WORDS[m.group("letter")], names)

    def along_axis(m: re.Match[str]) -> str:
        return _spelled(m, _AXIS_WORDS[m.group("axis").lower()], names)

    text = _ALONG_AXIS.sub(along_axis, _AT_JOINT.sub(at_joint, text))
    return _PAIR_OF_JOINTS.sub(lambda m: _kept_together(m, names), text)


def _spelled(m: re.Match[str], words: str, names: Names) -> str:
    """In words where the letters are no name of the frame and what is left of them is a joint's."""
    whole = m.group().strip()
    known = names.joint(whole) or names.member(whole)
    joint = names.joint(m.group("joint"))
    return m.group() if known or joint is None else f"{words} {joint} "


def _listed(text: str, names: Names) -> str:
    m = _LIST.fullmatch(text)
    unit = unit_of(m.group("unit").strip()) if m else None
    if m is None or unit is None:
        return text
    items = list(_ITEM.finditer(m.group("items")))
    if not items or not all(names.joint(i.group("name")) or names.member(i.group("name")) for i in items):
        return text
    label = m.group("label").strip()
    return ", ".join(f"{label} at {i.group('name')} {i.group('number')} {unit.text}" for i in items)


def _kept_together(m: re.Match[str], names: Names) -> str:
    """ "A and D" without the word that parts values; "at B and C max" of a member C is left as it is."""
    if m.group("last") not in ("a", "i") and names.joint(m.group("first")) and names.joint(m.group("last")):
        return f"{m.group('first')} & {m.group('last')}"
    return m.group()


_END_SYMBOL = re.compile(
    r"(?<![A-Za-z0-9])(?P<letter>[MVNQ])(?:_|\s?\(|\s)?\{?"
    r"(?P<first>[A-Za-z0-9']{1,6}?)[-,]?(?P<last>[A-Za-z0-9']{1,6})[)}]?"
    r"\s*(?:[=:]|\s)\s*(?P<number>[+\-\u2212]?\d+(?:[.,]\d+)?(?:[eE][+-]?\d+)?-?)\s*"
    r"(?P<unit>[A-Za-z]+(?:[ .*\u00b7-]?m+\b)?)?"
)
_LETTERS_OF = {"M": "moment", "V": "shear", "Q": "shear", "N": "axial"}


@dataclass(frozen=True, slots=True)
class EndSymbol:
    """An end action in the notation of hand methods: "M_AB = -12.4", the moment on member AB at A, at [start, stop) of its
    text."""

    quantity: str
    member: str
    joint: str
    number: Number
    unit: Size | None
    start: int
    stop: int


def end_symbols(text: str, names: Names) -> Iterator[EndSymbol]:
    """Every end action that the text gives as a letter with two joints."""
    for m in _END_SYMBOL.finditer(text):
        joined = m.group("first") + m.group("last")
        if joined.isdigit() and "_" not in m.group():
            continue  # "N12" is rather a joint's name
        for k in range(1, len(joined)):
            first, last = names.joint(joined[:k]), names.joint(joined[k:])
            hit = names.between(first, last) if first and last else None
            number = parse_number(m.group("number"), "," in m.group("number"))
            if hit and first and number:
                unit = size_of(m.group("unit"))
                stop = m.end() if unit else m.end("number")
                yield EndSymbol(_LETTERS_OF[m.group("letter")], hit.name, first, number, unit, m.start(), stop)
                break


def is_moment(told: Told) -> bool:
    """Has the value a moment's unit?"""
    return _has(told, MOMENT)


def is_length(told: Told) -> bool:
    """Has the value a length's unit?"""
    return _has(told, LENGTH)


def _has(told: Told, dimension: Dimension) -> bool:
    return told.unit is not None and told.unit.dimension == dimension
