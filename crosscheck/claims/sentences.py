"""Values in words, as an e-mail or --value gives them: "B1-C1 max 412 kNm, roof sway 18 mm".

Each number with a unit is read for what it is of (a member, a joint, or the whole frame), which quantity, and whether it is
a largest value. A value without a stated direction is a size: it is compared without its sign. A moment, shear or axial
force whose place is not said counts as the frame's largest only where it says so (max, peak, up to).
"""

from __future__ import annotations

import re
from dataclasses import dataclass, replace
from math import copysign, hypot

from crosscheck.claims.names import MemberHit, Names
from crosscheck.claims.numbers import Number, comma_use, parse_number
from crosscheck.claims.phrases import Told, end_symbols, is_length, is_moment, spelled_out, told
from crosscheck.claims.reading import Entry
from crosscheck.frame.units import ANGLE, FORCE, LENGTH, MOMENT, Dimension

_WORDS = {
    "axial": r"axial|normal|(?<!horizontal )thrust|tie force|compression|tension|\bN(?:_?max|_?min)?\b|\bNEd\b",
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
_SORT = re.compile("|".join([*_WORDS.values(), _MOST.pattern]), re.IGNORECASE)
_BEARING = re.compile(r"reaction|\b[RF]y\b", re.IGNORECASE)
_REACTS = re.compile(r"reaction|\b(?:H|R[xy]?|F[xy])\b")
"""Where these stand on the line, V at a support is what it bears."""
_NOT_FROM_MEMBER = re.compile(
    r"\b(?:knees?|eaves?|ridges?|apex|base|bases|foot|feet|tops?|bottoms?|haunch(?:es)?|corners?|crown|valley|supports?|"
    r"columns?|rafters?|beams?|purlins?|braces?|bracing|roof|floor|gridlines?)\b", re.IGNORECASE)  # fmt: skip
"""A place of a building, which names no member or joint of the frame."""
_MOVES = {"fx": "dx", "fy": "dy"}
_BY_DIMENSION: dict[Dimension, tuple[str, ...]] = {
    FORCE: ("axial", "shear", "fx", "fy"), MOMENT: ("moment",), LENGTH: ("dx", "dy", "across"), ANGLE: ("rotation",),
}  # fmt: skip
_ALONG = ("axial", "shear", "moment", "across")
_UNIT_FIRST = re.compile(r"[(\[]([^)\]\d]{1,8})[)\]]\s*:[^\d]*([+-]?\d+(?:[.,]\d+)?)")
"""The unit of a list in front of it: "Reactions (kN): A 38.3"."""
_OPEN_COMMA = re.compile(r"\D*[1-9]\d{0,2},\d{3}(?!\d)\D*")
_SAGS, _HOGS = re.compile(r"(?i:\bsagging\b)|\bM\+"), re.compile(r"(?i:\bhogging\b)|\bM[-\u2212](?!\w)")
_UPRIGHT = 0.2
"""Below this cosine a member counts as upright: sagging and hogging say nothing of it."""


def looks_told(text: str, names: Names) -> bool:
    """Is the line a sentence with values in it, rather than a row of a table?"""
    if not any(c.isdigit() for c in text):
        return False
    text = spelled_out(text, names)
    if any(True for _ in end_symbols(text, names)):
        return True
    said = list(told(text))
    if len(said) == 1 and _is_one_moment(said[0], names):
        return True
    return bool(said) and all(t.unit and t.unit.dimension in _BY_DIMENSION for t in said) and any(
        _MOST.search(t.words) or any(re.search(p, t.words, re.IGNORECASE) for q, p in _WORDS.items() if q != "fy")
        or _BEARING.search(t.words) or is_length(t) and turned_by_word(t) and re.search("mov", t.words, re.IGNORECASE)
        for t in said
    )  # fmt: skip


def speaks_of_results(text: str) -> bool:
    """Does a line that was taken for a heading or a remark name a quantity and a value with its unit?"""
    text = _UNIT_FIRST.sub(r"\2 \1", text)
    return any(t.unit and t.unit.dimension in _BY_DIMENSION and _quantities(t) for t in told(text[:500]))


def _quantities(said: Told) -> list[str]:
    """Words of the value that name a quantity which its unit allows; letters count as capitals only."""
    allowed = _BY_DIMENSION.get(said.unit.dimension, ()) if said.unit else ()
    found = (m.group() for q in allowed for m in re.finditer(_WORDS[q], said.words, re.IGNORECASE))
    return [word for word in found if len(word) > 2 or word.isupper()]


def _is_one_moment(said: Told, names: Names) -> bool:
    """One moment of one member, and no other number: "A-B at A  12.4 kNm"."""
    alone = not re.search(r"(?<![\w.,])[+\-\u2212]?\d+(?:[.,]\d+)*(?![\w-])", said.words)
    return alone and is_moment(said) and _places(said.words, names).member is not None


@dataclass(frozen=True, slots=True)
class Unread:
    """Why a value in words is not compared. result: its words name a quantity, so that it is surely meant as a result."""

    why: str
    result: bool


def entries_told(text: str, line: int, table: int, names: Names) -> tuple[list[Entry], list[Unread]]:
    """The values of a sentence, and of each part that was not understood why."""
    out: list[Entry] = []
    odd: list[Unread] = []
    text = spelled_out(text, names)
    rest = text
    for s in end_symbols(text, names):
        end = names.frame.members[s.member].index(s.joint)
        out.append(Entry(table, line, "end", s.quantity, s.number, s.unit, member=s.member, joint=s.joint, end=end))
        rest = rest[: s.start] + " " * (s.stop - s.start) + rest[s.stop :]
    only_units = bool(out)  # what stands between symbols is a value only with a unit of its own
    before: Entry | None = None
    last: Told | None = None
    member: str | None = None
    for bare in told(rest):
        if only_units and bare.unit is None:
            continue
        said = last = _with_manner(bare, last, names)
        member = _member_named(said, member, names)
        found, why = _Sentence(rest, line, table, names, before, member).entries(said)
        out += found
        odd += [Unread(why, bool(_quantities(said)))] if why else []
        before = found[-1] if found else before
    return _with_commas(out), odd


def _member_named(said: Told, before: str | None, names: Names) -> str | None:
    """The member that is spoken of: the last one named, until a joint elsewhere is."""
    places = _places(said.words, names)
    if places.member is not None:
        return places.member.name
    return before if before and all(j in names.frame.members[before] for j in places.joints) else None


def _with_manner(said: Told, last: Told | None, names: Names) -> Told:
    """A value whose words name a place and no quantity is of the same sort as the one before it: "Max sagging moment in AB
    36.7 kNm, in BC 101.6 kNm"."""
    alike = last is not None and last.unit is not None and said.unit is not None
    if last is None or not alike or last.unit.dimension != said.unit.dimension or _sorts(said.words):  # type: ignore[union-attr]
        return said
    places = _places(said.words, names)
    if places.member is None and not places.joints:
        return said
    most = places.member is not None and not places.joints
    sorts = [word for word in _sorts(last.words) if most or not _MOST.match(word)]
    return replace(said, words=f"{said.words} {' '.join(sorts)}")


def _sorts(words: str) -> list[str]:
    """The words that say what sort of value is meant; letters count as capitals only."""
    return [m.group() for m in _SORT.finditer(words) if len(m.group()) > 1 or m.group().isupper()]


def _with_commas(entries: list[Entry]) -> list[Entry]:
    """Commas before decimals or thousands, as far as the sentence's numbers tell; open where they do not."""
    use = comma_use(e.number.printed for e in entries)
    if use == "unsure":
        return [replace(e, comma_open=bool(_OPEN_COMMA.fullmatch(e.number.printed))) for e in entries]
    if use == "thousands":
        return [replace(e, number=_as_thousands(e.number)) for e in entries]
    return entries


def _as_thousands(number: Number) -> Number:
    read = parse_number(number.printed)
    if read is None:
        return number
    return replace(read, value=copysign(read.value, number.value))


@dataclass(frozen=True, slots=True)
class _Places:
    """What the words name: a member, joints, a case; several joints only where they are listed ("A & D")."""

    member: MemberHit | None
    joints: tuple[str, ...]
    case: str | None


@dataclass(frozen=True, slots=True)
class _Sentence:
    """One sentence, and the value before the one that is read.

    Without a name of its own, a value is of the joint before it, or of the member that was named last (spoken_of)."""

    text: str
    line: int
    table: int
    names: Names
    before: Entry | None
    spoken_of: str | None

    def entries(self, said: Told) -> tuple[list[Entry], str]:
        """What one value is: one entry, or one a joint of those listed; or why it is not understood."""
        places = _places(said.words, self.names)
        if len(places.joints) < 2:
            entry, why = self._entry(said, places.member, next(iter(places.joints), None), places.case)
            return ([entry] if entry else []), why
        read = [self._entry(said, places.member, joint, places.case) for joint in places.joints]
        whys = [why for _, why in read if why]
        return ([] if whys else [entry for entry, _ in read if entry]), (whys[0] if whys else "")

    def _entry(
        self, said: Told, member: MemberHit | None, joint: str | None, case: str | None
    ) -> tuple[Entry | None, str]:
        before = self.before
        unnamed = member is None and joint is None
        elsewhere = _NOT_FROM_MEMBER.search(said.words) if unnamed else None
        most = bool(_MOST.search(said.words))
        if unnamed and before is not None and not elsewhere and not most:
            joint = before.joint if before.kind != "end" else None  # "Rx at A 7 kN, Ry 28 kN"
        quantity = self._quantity(said, member, joint)
        if quantity is None:
            return None, f'it is not said which quantity {said.number.printed} is ("{said.words.strip()[:60]}")'
        if case is None and before is not None:
            case = before.case
        sense, turned = _sense(said, quantity)
        number = replace(said.number, value=turned * said.number.value)
        blank = Entry(self.table, self.line, "extreme", sense, number, said.unit, case=case, extreme="size", sense="size")
        if sense in ("fx", "fy") and joint is None:
            return None, f"it is not said which support the {said.number.printed} are for"
        if turned_by_word(said) and joint is not None and sense in ("fx", "fy", "dx", "dy"):
            kind = "reaction" if sense in ("fx", "fy") else "displacement"
            return replace(blank, kind=kind, joint=joint, extreme=None, sense="said"), ""  # type: ignore[arg-type]
        if sense not in _ALONG:
            return replace(blank, joint=joint), ""
        if member is None and self.spoken_of and not elsewhere:
            alike = before is None or before.kind != "extreme" or before.quantity == sense
            if unnamed and most and alike:  # "B-C max 412 kNm, max shear 35 kN" is of B-C, but "..., max 500 kNm"?
                whose = f"of {self.spoken_of} or of the whole frame"
                return None, f"it is not said whether the {said.number.printed} are the most {whose}"
            member = MemberHit(self.spoken_of, 0)  # "B-C at B 51.2 kNm, at C 48.0": the second is of the same member
        return self._along(said, sense, member, joint, blank)

    def _along(
        self, said: Told, sense: str, member: MemberHit | None, joint: str | None, blank: Entry
    ) -> tuple[Entry | None, str]:
        """A value along a member: at a station or an end, its largest, or the largest of the frame."""
        names, most = self.names, bool(_MOST.search(said.words))
        if member is None:
            if joint is not None and sense == "moment":
                return _moment_at(joint, blank, names)
            if joint is not None or sense != "across" and (not most or _NOT_FROM_MEMBER.search(said.words)):
                return None, f"it is not said which member or joint the {said.number.printed} are of"
            if sense == "moment" and _bends(said):
                return None, f"it is not said of which member the {said.number.printed} are the most"
            return (_directed(blank, _pulls(said)) if sense == "axial" else blank), ""
        bent = _bent(_bends(said), member.name, names) if sense == "moment" else _pulls(said) if sense == "axial" else 0
        blank = _directed(replace(blank, member=member.name), bent)
        if said.station is not None and not most:
            return self._at_station(said, blank)
        if joint is None or most:
            return blank, ""
        if joint not in names.frame.members[member.name]:
            return None, f"{joint} is not an end of member {member.name}"
        end = names.frame.members[member.name].index(joint)
        if bent and end == 1 and sense == "moment":
            # clockwise on the end
            blank = replace(blank, number=replace(blank.number, value=-blank.number.value))
        return replace(blank, kind="end", end=end, joint=joint, extreme=None), ""

    def _at_station(self, said: Told, blank: Entry) -> tuple[Entry | None, str]:
        """At a distance from the member's `from` joint, or from the one that is named."""
        assert said.station is not None and blank.member is not None
        station, pair = said.station, self.names.frame.members[blank.member]
        at, half, size, share = station.at.value, station.at.half, station.unit, station.unit.text == "%"
        if share:
            at, half = at / 100, half / 100
        origin = self.names.joint(station.origin) if station.origin else None
        if origin is not None and origin not in pair:
            return None, f"{origin} is not an end of member {blank.member}"
        if origin == pair[1]:
            (ax, ay), (bx, by) = (self.names.frame.xy[j] for j in pair)
            whole = 1.0 if share else hypot(bx - ax, by - ay) * self.names.frame.length / size.factor
            at = whole - at
        unit = None if share else size
        return replace(blank, kind="span", at=at, at_half=half, at_unit=unit, at_share=share, run=1, extreme=None), ""

    def _quantity(self, said: Told, member: MemberHit | None, joint: str | None) -> str | None:
        """The quantity that the words name among those that the unit allows; the unit alone where only one fits."""
        quantity = _named(said, member, joint)
        if quantity == "shear" and member is None and joint in self.names.frame.supports and _V_ALONE.search(said.words):
            # V at a support is the shear there, or what the support bears, as the rest of the line has it
            return "fy" if _REACTS.search(self.text) and not re.search("shear", said.words, re.IGNORECASE) else quantity
        return quantity


_V_ALONE = re.compile(r"\bV\b")


def _moment_at(joint: str, blank: Entry, names: Names) -> tuple[Entry | None, str]:
    """The moment at a joint: of the only member there, or of either of two where no moment can react; else a reaction."""
    ends = [(name, pair.index(joint)) for name, pair in names.frame.members.items() if joint in pair]
    held = joint in names.frame.turning
    if len(ends) == 1 or len(ends) == 2 and not held:
        return replace(blank, kind="end", member=ends[0][0], end=ends[0][1], joint=joint, extreme=None), ""
    if held:
        return replace(blank, joint=joint), ""
    return None, f"it is not said which member's moment at {joint} the {blank.number.printed} are"


def _bends(said: Told) -> int:
    """+1 where the words say sagging (M+), -1 hogging (M-), 0 where neither or both."""
    return int(bool(_SAGS.search(said.words))) - int(bool(_HOGS.search(said.words)))


def _directed(blank: Entry, sign: int) -> Entry:
    """The greatest or least value with the sign that words give it; as it is where they give none."""
    if not sign:
        return blank
    number = replace(blank.number, value=sign * abs(blank.number.value))
    return replace(blank, number=number, extreme="max" if sign > 0 else "min", sense="said")


def _pulls(said: Told) -> int:
    """+1 where the words say tension, -1 compression, 0 where neither or both."""
    pulls, presses = (bool(re.search(rf"\b{w}", said.words, re.IGNORECASE)) for w in ("tensi", "compressi"))
    return int(pulls) - int(presses)


def _bent(bends: int, member: str, names: Names) -> int:
    """The sign that sagging or hogging has along a member, 0 for an upright one.

    Sagging is tension below, which is local -y where the member runs to the right."""
    (ax, ay), (bx, by) = (names.frame.xy[j] for j in names.frame.members[member])
    length = hypot(bx - ax, by - ay)
    if not length or abs(bx - ax) < _UPRIGHT * length:
        return 0
    return bends if bx > ax else -bends


def turned_by_word(said: Told) -> bool:
    """Does a word (up, down, left, right) give the direction?"""
    return any(re.search(rf"\b{w}\b", said.words, re.IGNORECASE) for w in _SENSE)


def _sense(said: Told, quantity: str) -> tuple[str, int]:
    for word, (axis, sign) in _SENSE.items():
        if re.search(rf"\b{word}\b", said.words, re.IGNORECASE):
            if quantity in ("fx", "fy"):
                return axis, sign
            if quantity in ("dx", "dy"):
                return _MOVES[axis], sign
    return quantity, 1


def _places(words: str, names: Names) -> _Places:
    """The member, joints and case that the words name; a member or case only where exactly one is named, and a joint beside
    others only where they are listed."""
    tokens = re.findall(r"[^\s,;:=()]+", words)
    members: dict[str, MemberHit] = {}
    joints: dict[str, str] = {}
    cases: set[str] = set()
    for size in (3, 2, 1):
        for k in range(len(tokens) - size + 1):
            text = " ".join(tokens[k : k + size])
            if "&" in text or size == 1 and _is_common(text):
                continue
            if (hit := names.member(text)) and not members:
                members[hit.name] = hit
            elif joint := names.joint(text):
                joints[joint] = joint
            elif case := names.case(text):
                cases.add(case)
    member = next(iter(members.values())) if len(members) == 1 else None
    listed = "&" in tokens and len(joints) == tokens.count("&") + 1
    if len(joints) > 1 and (member or not listed):
        joints = {}
    return _Places(member, tuple(joints), cases.pop() if len(cases) == 1 else None)


def _is_common(token: str) -> bool:
    """Words of a sentence that are no names though they may look like one ("a", "M", "V", "in")."""
    return token.lower() in {"a", "in", "at", "is", "of", "to", "the", "max", "min", "and", "for", "on", "i", "up",
    "under"} and (
        not token.isupper() or len(token) > 1
    ) or token in ("M", "V", "N", "R", "H")  # fmt: skip


def _named(said: Told, member: MemberHit | None, joint: str | None) -> str | None:
    allowed = _BY_DIMENSION.get(said.unit.dimension, ()) if said.unit else tuple(_WORDS)
    named = [
        q for q in _WORDS if q in allowed and re.search(_WORDS[q], said.words, re.IGNORECASE if q not in _LETTERS else 0)
    ]
    named = named or [q for q in _WORDS if q in allowed and re.search(_WORDS[q], said.words, re.IGNORECASE)]
    if "axial" in named and {"fx", "fy"} & {*named} and member is None and joint is not None:
        named.remove("axial")  # the thrust of a support
    if "across" in named and len(named) > 1:
        named.remove("across")
    if named == ["across"] and member is None:
        return "dy"
    if named:
        return named[0]
    if said.unit and said.unit.dimension == FORCE and joint is not None and member is None and turned_by_word(said):
        return "fy"
    if is_length(said) and turned_by_word(said):
        return "dy"
    return allowed[0] if len(allowed) == 1 else None


_LETTERS = frozenset({"axial", "shear", "moment", "fx", "fy"})
"""Quantities whose letters count only as capitals while anything else tells."""
