"""Values in words, as an e-mail or --value gives them: "B1-C1 max 412 kNm, roof sway 18 mm".

Each part with a number is read for what it is of (a member, a joint, or the whole frame), which quantity, and whether
it is a
largest value. A value without a stated direction is a size: it is compared without its sign.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, replace

from crosscheck.claims.names import MemberHit, Names
from crosscheck.claims.numbers import Number, parse_number
from crosscheck.claims.reading import Entry
from crosscheck.claims.words import Size, unit_of
from crosscheck.frame.units import ANGLE, FORCE, LENGTH, MOMENT, Dimension

_PART = re.compile(r"\s*(?:[;\n]|,(?!\d)|\band\b|(?<=[a-z])\.\s)\s*", re.IGNORECASE)
_VALUE = re.compile(
    r"(?<![\w.,])(?P<number>[+\-\u2212]?\d+(?:[.,]\d+)*(?:[eE][+-]?\d+)?)\s*"
    r"(?P<unit>[A-Za-z\u00b5%\u00b0\u2030]+(?:[ .*\u00b7-]?(?:mm|cm|m|ft|in)\b)?)?"
)
_WORDS = {
    "axial": r"axial|normal|thrust|tie force|compression|tension|\bN(?:_?max|_?min)?\b|\bNEd\b",
    "shear": r"shear|\bV(?:_?max|_?min)?\b|\bVEd\b",
    "moment": r"moment|bending|hogging|sagging|\bM(?:_?max|_?min)?\b|\bMEd\b|\bBM\b",
    "rotation": r"rotation|slope|turns?\b",
    "dx": r"sway|drift|horizontal (?:displacement|movement|deflection)|lateral|sideways|\bdx\b|\bux\b",
    "dy": r"vertical (?:displacement|movement|deflection)|settle\w*|\bdy\b|\buy\b|drops?\b",
    "across": r"deflection|deflects?\b|\bsag\b|displacement",
    "fx": r"horizontal|\b(?:Rx|Fx|H)\b", "fy": r"vertical|uplift|\b(?:Ry|Fy|R)\b|reaction|bearing",
}  # fmt: skip
_MOST = re.compile(r"\bmax(?:imum|\.)?\b|max\b|\bpeak\b|\blargest\b|\bgreatest\b|\bup to\b|\bmin(?:imum)?\b", re.IGNORECASE)
_SENSE = {"up": ("fy", 1), "upward": ("fy", 1), "upwards": ("fy", 1), "down": ("fy", -1), "downward": ("fy", -1),
          "downwards": ("fy", -1), "right": ("fx", 1), "left": ("fx", -1)}  # fmt: skip
_BEARING = re.compile(r"reaction|\b[RF]y\b", re.IGNORECASE)
_MOVES = {"fx": "dx", "fy": "dy"}
_BY_DIMENSION: dict[Dimension, tuple[str, ...]] = {
    FORCE: ("axial", "shear", "fx", "fy"), MOMENT: ("moment",), LENGTH: ("dx", "dy", "across"), ANGLE: ("rotation",),
}  # fmt: skip


@dataclass(frozen=True, slots=True)
class _Told:
    """One value and what its words say."""

    number: Number
    unit: Size | None
    words: str


_END_SYMBOL = re.compile(
    r"(?<![A-Za-z0-9])(?P<letter>[MVNQ])(?:_|\s?\(|\s)?\{?"
    r"(?P<first>[A-Za-z0-9']{1,6}?)[-,]?(?P<last>[A-Za-z0-9']{1,6})[)}]?"
    r"\s*(?:[=:]|\s)\s*(?P<number>[+\-\u2212]?\d+(?:[.,]\d+)?(?:[eE][+-]?\d+)?-?)\s*"
    r"(?P<unit>[A-Za-z]+(?:[ .*\u00b7-]?m+\b)?)?"
)
_LETTERS_OF = {"M": "moment", "V": "shear", "Q": "shear", "N": "axial"}


def _end_symbols(text: str, names: Names) -> Iterator[tuple[str, str, str, Number, Size | None]]:
    """End actions in the notation of hand methods: "M_AB = -12.4", the action on member AB at A. (quantity, member,
    joint, ...)"""
    for m in _END_SYMBOL.finditer(text):
        joined = m.group("first") + m.group("last")
        if joined.isdigit() and "_" not in m.group():
            continue  # "N12" is rather a joint's name
        for k in range(1, len(joined)):
            first, last = names.joint(joined[:k]), names.joint(joined[k:])
            hit = names.between(first, last) if first and last else None
            number = parse_number(m.group("number"), "," in m.group("number"))
            if hit and first and number:
                yield _LETTERS_OF[m.group("letter")], hit.name, first, number, _unit(m.group("unit"))
                break


def _is_one_moment(told: _Told, names: Names) -> bool:
    """One moment of one member, and no other number: "A-B at A  12.4 kNm"."""
    alone = not _VALUE.search(told.words)
    return alone and told.unit is not None and told.unit.dimension == MOMENT and _places(told.words, names)[0] is not None


def looks_told(text: str, names: Names) -> bool:
    """Is the line a sentence with values in it, rather than a row of a table?"""
    if not any(c.isdigit() for c in text):
        return False
    if any(True for _ in _end_symbols(text, names)):
        return True
    told = list(_told(text))
    if len(told) == 1 and _is_one_moment(told[0], names):
        return True
    return bool(told) and all(t.unit and t.unit.dimension in _BY_DIMENSION for t in told) and any(
        _MOST.search(t.words) or any(re.search(p, t.words, re.IGNORECASE) for q, p in _WORDS.items() if q != "fy")
        or _BEARING.search(t.words)
        for t in told
    )  # fmt: skip


def _told(text: str) -> Iterator[_Told]:
    for part in _PART.split(text):
        found = [m for m in _VALUE.finditer(part) if m.group("unit") and _unit(m.group("unit"))]
        found = found or list(_VALUE.finditer(part))[-1:]
        if not found:
            continue
        m = found[-1]
        number = parse_number(m.group("number"), "," in m.group("number") and "." not in m.group("number"))
        if number is not None:
            rest = part[: m.start()] + " " + part[m.end() :] if _unit(m.group("unit")) else part[: m.start()]
            yield _Told(number, _unit(m.group("unit")), rest)


def _unit(text: str | None) -> Size | None:
    return (unit_of(text) or unit_of(text.split()[0])) if text else None


def entries_told(text: str, line: int, table: int, names: Names) -> tuple[list[Entry], list[str]]:
    """The values of a sentence, and of each part that was not understood why."""
    out: list[Entry] = []
    odd: list[str] = []
    for quantity, member, joint, number, unit in _end_symbols(text, names):
        end = names.frame.members[member].index(joint)
        out.append(Entry(table, line, "end", quantity, number, unit, member=member, joint=joint, end=end))
    if out:
        return out, odd
    for told in _told(text):
        entry, why = _entry(told, line, table, names, out[-1] if out else None)
        if entry:
            out.append(entry)
        else:
            odd.append(why)
    return out, odd


def _entry(told: _Told, line: int, table: int, names: Names, before: Entry | None) -> tuple[Entry | None, str]:
    """What one value is. Without a name of its own it is of the member or joint before it, or of the whole frame."""
    member, joint, case = _places(told.words, names)
    if member is None and joint is None and before is not None and before.line == line:
        joint = before.joint if before.kind != "end" else None  # "Rx at A 7 kN, Ry 28 kN"
    quantity = _quantity(told, member, joint)
    if quantity is None:
        return None, f'it is not said which quantity {told.number.printed} is ("{told.words.strip()[:60]}")'
    if case is None and before is not None:
        case = before.case
    sense, turned = _sense(told, quantity)
    number = replace(told.number, value=turned * told.number.value)
    blank = Entry(table, line, "extreme", sense, number, told.unit, case=case, extreme="size", sense="size")
    if sense in ("fx", "fy") and joint is None:
        return None, f"it is not said which support the {told.number.printed} are for"
    if turned_by_word(told) and joint is not None and sense in ("fx", "fy", "dx", "dy"):
        if sense in ("fx", "fy"):
            return replace(blank, kind="reaction", joint=joint, extreme=None, sense="said"), ""
        return replace(blank, kind="displacement", joint=joint, extreme=None, sense="said"), ""
    if sense in ("axial", "shear", "moment", "across"):
        if member is not None and joint is not None and not _MOST.search(told.words):
            end = names.frame.members[member.name].index(joint) if joint in names.frame.members[member.name] else None
            if end is None:
                return None, f"{joint} is not an end of member {member.name}"
            return replace(blank, kind="end", member=member.name, end=end, joint=joint, extreme=None), ""
        if member is None and joint is not None and sense == "moment":
            return _moment_at(joint, blank, names)
        whole = member.name if member else before.member if before is not None and joint is None else None
        return replace(blank, member=whole, extreme="size"), ""
    return replace(blank, joint=joint), ""


def _moment_at(joint: str, blank: Entry, names: Names) -> tuple[Entry | None, str]:
    """The moment at a joint: of the only member there, or of either of two where no moment can react; else a reaction."""
    ends = [(name, pair.index(joint)) for name, pair in names.frame.members.items() if joint in pair]
    held = joint in names.frame.turning
    if len(ends) == 1 or len(ends) == 2 and not held:
        return replace(blank, kind="end", member=ends[0][0], end=ends[0][1], joint=joint, extreme=None), ""
    if held:
        return replace(blank, joint=joint), ""
    return None, f"it is not said which member's moment at {joint} the {blank.number.printed} are"


def turned_by_word(told: _Told) -> bool:
    """Does a word (up, down, left, right) give the direction?"""
    return any(re.search(rf"\b{w}\b", told.words, re.IGNORECASE) for w in _SENSE)


def _sense(told: _Told, quantity: str) -> tuple[str, int]:
    for word, (axis, sign) in _SENSE.items():
        if re.search(rf"\b{word}\b", told.words, re.IGNORECASE):
            if quantity in ("fx", "fy"):
                return axis, sign
            if quantity in ("dx", "dy"):
                return _MOVES[axis], sign
    return quantity, 1


def _places(words: str, names: Names) -> tuple[MemberHit | None, str | None, str | None]:
    """The member, joint and case that the words name, each if exactly one is named."""
    tokens = re.findall(r"[^\s,;:=()]+", words)
    members: dict[str, MemberHit] = {}
    joints: dict[str, str] = {}
    cases: set[str] = set()
    for size in (3, 2, 1):
        for k in range(len(tokens) - size + 1):
            text = " ".join(tokens[k : k + size])
            if size == 1 and _is_common(text):
                continue
            if (hit := names.member(text)) and not members:
                members[hit.name] = hit
            elif joint := names.joint(text):
                joints[joint] = joint
            elif case := names.case(text):
                cases.add(case)
    member = next(iter(members.values())) if len(members) == 1 else None
    if member and len(joints) > 1:
        joints = {}
    return member, next(iter(joints)) if len(joints) == 1 else None, cases.pop() if len(cases) == 1 else None


def _is_common(token: str) -> bool:
    """Words of a sentence that are no names though they may look like one ("a", "M", "V", "in")."""
    return token.lower() in {"a", "in", "at", "is", "of", "to", "the", "max", "min", "and", "for", "on", "i", "up",
    "under"} and (
        not token.isupper() or len(token) > 1
    ) or token in ("M", "V", "N", "R", "H")  # fmt: skip


def _quantity(told: _Told, member: MemberHit | None, joint: str | None) -> str | None:
    """The quantity that the words name among those that the unit allows; the unit alone where only one fits."""
    allowed = _BY_DIMENSION.get(told.unit.dimension, ()) if told.unit else tuple(_WORDS)
    named = [
        q for q in _WORDS if q in allowed and re.search(_WORDS[q], told.words, re.IGNORECASE if q not in _LETTERS else 0)
    ]
    named = named or [q for q in _WORDS if q in allowed and re.search(_WORDS[q], told.words, re.IGNORECASE)]
    if "across" in named and len(named) > 1:
        named.remove("across")
    if named == ["across"] and member is None:
        return "dy"
    if named:
        return named[0]
    if told.unit and told.unit.dimension == FORCE and joint is not None and member is None and turned_by_word(told):
        return "fy"
    if told.unit and told.unit.dimension == LENGTH and turned_by_word(told):
        return "dy"
    return allowed[0] if len(allowed) == 1 else None


_LETTERS = frozenset({"axial", "shear", "moment", "fx", "fy"})
"""Quantities whose letters count only as capitals while anything else tells."""
