"""Names in a paste and names in the frame: case, blanks, prefixes and separators are forgiven, doubt is not.

A forgiven name counts only where exactly one name of the frame answers to it.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass

from crosscheck.claims.reading import FrameNames

_PREFIXES = {
    "member": r"members?|memb?r?|mbr|beams?|bars?|elements?|elem|ele?|elt|rods?|columns?|col|no|nr",
    "joint": r"joints?|jo?i?n?t|nodes?|nod|nd|points?|pt|supports?|supp?|at|no|nr",
    "case": r"load\s*cases?|load\s*combinations?|cases?|combinations?|combos?|comb?|lc|load|loading|results? for|no|nr",
}
MOST_KEPT = 20_000
"""Writings whose names are kept in mind: noise must not fill the memory."""
_BETWEEN_DIGITS = re.compile(r"(?<=\d)[^\w.]+(?=\d)")
_SEPARATING = re.compile(r"[^\w.+'~]|_")
_LEADING_ZEROS = re.compile(r"(?<![0-9.])0+(?=[0-9])")
_NUMBERED = re.compile(r"\d{1,9}\.\d{0,12}(?:e[+-]?0?\d)?", re.IGNORECASE | re.ASCII)
_PREFIX = {kind: re.compile(rf"(?:{words})\b[\s.:#_-]*(?=\S)", re.IGNORECASE) for kind, words in _PREFIXES.items()}
_DASH = re.compile(r"[\u2010-\u2015\u2212]")
_PAIR = re.compile(r"\s*(?:-+>?|\u2192|/|\bto\b|:|\.\.|,|~|_)\s*|\s+")


def plain(text: str) -> str:
    """Letters and digits of a name in one case; zeros before a number dropped ("M03" is "m3")."""
    if text.isalpha():
        return text.casefold()
    tidy = _BETWEEN_DIGITS.sub("~", _DASH.sub("-", text).casefold())  # "1-2" is not "12"
    return _LEADING_ZEROS.sub("", _SEPARATING.sub("", tidy))


def without_prefix(text: str, kind: str) -> str:
    """The name without a word such as "member" or "node no." before it."""
    tidy = " ".join(text.split())
    while found := _PREFIX[kind].match(tidy):
        tidy = tidy[found.end() :]
    return tidy.strip(" .:#")


def _core(name: str) -> str:
    """A name's number where letters of at most a short prefix stand before it: "m3", "M-3", "Beam 3" give "3"."""
    found = re.fullmatch(r"[a-z]*0*(\d+)", plain(name))
    return found.group(1) if found else ""


def _last(text: str) -> str:
    """The last letter or digit: two writings of one name share it, which spares most of a long text a closer look."""
    for c in reversed(text):
        if c.isalnum():
            return c.casefold()[-1]
    return ""


class _Book:
    """Names of one kind under their forgiven writings."""

    def __init__(self, names: Iterable[str], kind: str, given: Mapping[str, str]) -> None:
        self.kind = kind
        self.names = frozenset(names)
        self.given = {plain(k): v for k, v in given.items()} | dict(given)
        self.longest = 40 + 2 * max(map(len, (*self.names, *given)), default=0)
        self._found: dict[tuple[str, bool], str | None] = {}
        self.lasts = {_last(name) for name in (*self.names, *given)}
        self.levels: list[dict[str, list[str]]] = [{}, {}]
        for name in self.names:
            for level, key in enumerate((plain(name), _core(name))):
                if key:
                    self.levels[level].setdefault(key, []).append(name)

    def give(self, given: Mapping[str, str]) -> None:
        """Further writings that stand for names."""
        self.given |= {plain(k): v for k, v in given.items()} | dict(given)
        self.lasts |= {_last(name) for name in given}
        self._found.clear()

    def find(self, text: str, number_alone: bool = True) -> str | None:
        """The one name that `text` may mean, or None. `number_alone`: "3" may mean "m3"."""
        if len(text) > self.longest or _last(text) not in self.lasts and not text[:1].isdigit():
            return None
        key = (text, number_alone)
        if key not in self._found:
            if len(self._found) > MOST_KEPT:
                self._found.clear()
            self._found[key] = self._find(text, number_alone)
        return self._found[key]

    def _find(self, text: str, number_alone: bool) -> str | None:
        text = text.strip().strip("\"'`*")
        for writing in (text, plain(text)):
            if writing in self.given:
                return self.given[writing]
        if text in self.names:
            return text
        for writing in dict.fromkeys((text, without_prefix(text, self.kind))):
            if found := self._only(0, plain(writing)):
                return found
        if _NUMBERED.fullmatch(text) and float(text).is_integer() and (found := self._only(0, str(int(float(text))))):
            return found  # an array of decimals prints joint 2 as "2.0" or "2.0000e+00"
        if not number_alone:
            return None
        bare = without_prefix(text, self.kind)
        # "m3" may be the frame's "3", and "3" its "m3", but never "c3" its "b3".
        return self._only(1, _core(bare)) if self._same_letters(bare) else None

    def _only(self, level: int, key: str) -> str | None:
        found = self.levels[level].get(key, [])
        return found[0] if key and len(found) == 1 else None

    def _same_letters(self, text: str) -> bool:
        found = self._only(1, _core(text))
        if not found:
            return False
        letters = [re.sub(r"\d.*", "", plain(t)) for t in (text, found)]
        usual = {"member": "m mem e el b s", "joint": "j n k p", "case": "lc c l"}[self.kind].split()
        return all(not word or word in usual for word in letters)


@dataclass(frozen=True, slots=True)
class MemberHit:
    """A member of the frame, and how the paste's runs: +1 as the frame's, -1 the other way, 0 not said.

    part: for a part of a member that the paste prints as a member of its own, the distances of its start and end from the
      frame's `from` joint (NaN where it is not said where inside the member that is); else None.
    ends: the paste's names of a part's joints, start first, where the paste gives them.
    """

    name: str
    run: int
    part: tuple[float, float] | None = None
    ends: tuple[str, str] | None = None


class Names:
    """Finds the frame's names for a paste's."""

    def __init__(
        self,
        frame: FrameNames,
        members: Mapping[str, str] | None = None,
        joints: Mapping[str, str] | None = None,
        cases: Mapping[str, str] | None = None,
    ) -> None:
        self.frame = frame
        self._members = _Book(frame.members, "member", members or {})
        self._joints = _Book(frame.xy, "joint", joints or {})
        self._cases = _Book((*frame.cases, *frame.envelopes), "case", cases or {})
        self._between: dict[tuple[str, str], list[str]] = {}
        for name, ends in frame.members.items():
            self._between.setdefault(ends, []).append(name)
        self._known: dict[str, MemberHit | None] = {}
        self._lasts = self._members.lasts | self._joints.lasts
        self._learned: dict[str, MemberHit] = {}
        self._inner: frozenset[str] = frozenset()
        self._other_numbers = False

    def learn(self, joints: Mapping[str, str], members: Mapping[str, MemberHit], inner: Iterable[str]) -> None:
        """Takes over what the paste's own coordinates and member ends say of its names; it goes before likeness."""
        self._joints.give(joints)
        # Where joints have other numbers and nothing is said of members, a member's number means nothing either.
        self._other_numbers |= bool(joints) and not members
        self._learned |= {plain(without_prefix(label, "member")): hit for label, hit in members.items()}
        self._lasts |= self._joints.lasts | {_last(label) for label in members}
        self._inner |= {plain(without_prefix(label, "joint")) for label in inner}
        self._known.clear()

    def is_inner(self, text: str) -> bool:
        """Is it a joint of the paste that only divides a member of the frame?"""
        return plain(without_prefix(text, "joint")) in self._inner

    def joint(self, text: str) -> str | None:
        return self._joints.find(text)

    def case(self, text: str) -> str | None:
        return self._cases.find(text)

    def between(self, first: str, last: str) -> MemberHit | None:
        """The one member that joins two joints of the frame."""
        for ends, run in (((first, last), 1), ((last, first), -1)):
            found = self._between.get(ends, [])
            if len(found) == 1:
                return MemberHit(found[0], run)
        return None

    def member(self, text: str) -> MemberHit | None:
        if len(text) > self._members.longest or _last(text) not in self._lasts and not text[:1].isdigit():
            return None
        if text not in self._known:
            if len(self._known) > MOST_KEPT:
                self._known.clear()
            self._known[text] = self._find_member(text)
        return self._known[text]

    def _find_member(self, text: str) -> MemberHit | None:
        if self._learned and (known := self._learned.get(plain(without_prefix(text, "member")))):
            return known
        given = plain(text) in self._members.given or text in self._members.given
        if self._other_numbers and not given and _core(without_prefix(text, "member")):
            return None
        if text.strip() in self.frame.members or given:
            name = self._members.find(text)
            return MemberHit(name, self._run(name, text)) if name else None
        # The two joints of "B - A" say which way the paste's member runs; but a name as it stands goes first.
        if name := self._members.find(text, number_alone=False):
            return MemberHit(name, self._run(name, text))
        if hit := self._pair(text):
            return hit
        name = self._members.find(text)
        return MemberHit(name, 0) if name else None

    def _run(self, name: str, text: str) -> int:
        hit = self._pair(text)
        return hit.run if hit and hit.name == name else 0

    def _pair(self, text: str) -> MemberHit | None:
        bare = _DASH.sub("-", without_prefix(text, "member")).strip("()[] ")
        hits = set()
        for found in _PAIR.finditer(bare):
            first, last = self.joint(bare[: found.start()]), self.joint(bare[found.end() :])
            if first and last and (hit := self.between(first, last)):
                hits.add(hit)
        if not hits and bare.isalnum():
            for k in range(1, len(bare)):
                first, last = self._joints_exactly(bare[:k]), self._joints_exactly(bare[k:])
                if first and last and (hit := self.between(first, last)):
                    hits.add(hit)
        return hits.pop() if len(hits) == 1 else None

    def _joints_exactly(self, text: str) -> str | None:
        return self._joints._only(0, plain(text))
