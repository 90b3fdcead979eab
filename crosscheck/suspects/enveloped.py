"""Mistakes that belong to envelopes: combinations or arrangements left out, values of several combinations mixed.

No frame is solved for these: an envelope without some of its combinations is made of what the opinions have said already.
For every other mistake an envelope's value stands for the combination that governs it.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import partial
from typing import TYPE_CHECKING

import numpy as np

from crosscheck.compare.claim import CaseClaim, Enveloped
from crosscheck.compare.claimed import ClosedClaim
from crosscheck.compare.differences import Difference
from crosscheck.frame.model import Frame
from crosscheck.suspects.changes import Change
from crosscheck.suspects.suspect import Suspect

if TYPE_CHECKING:
    from crosscheck.check import Opinions

ENOUGH = 0.9
"""Share of the difference that a combination left out must explain."""
MOST = 5


@dataclass(frozen=True, slots=True)
class _Left:
    """Combinations left out of an envelope, in words."""

    kind: str
    where: tuple[str, ...]
    says: str
    names: frozenset[str]


def as_governing(
    frame: Frame, closed: ClosedClaim, claims: Sequence[CaseClaim]
) -> tuple[ClosedClaim, list[CaseClaim], dict[int, tuple[str, ...]]]:
    """The claim with each value of an envelope as one of the combination that governs it, the judgements likewise, and of
    which cases and combinations each such value is the extreme, by its id."""
    governs = {id(e.value): e.governing for c in claims for e in c.enveloped}
    if not governs:
        return closed, list(claims), {}
    moved = {id(v): replace(v, case=governs.get(id(v), v.case), beside="") for v in closed.values}
    values = tuple(v for v in moved.values() if v.case not in frame.several)
    cases = tuple(n for n in frame.names if any(v.case == n for v in values))
    left = [(moved.get(id(v), v), why) for c in claims for v, why in c.not_compared]
    judged = [
        CaseClaim(n, "disagree", (), sum(v.case == n for v in values), 0, 0, tuple(x for x in left if x[0].case == n))
        for n in cases
    ]
    over = {id(moved[id(v)]): frame.meant(v.case) for v in closed.values if id(v) in governs}
    return replace(closed, cases=cases, values=values), judged, over


def envelope_suspects(opinions: Opinions, closed: ClosedClaim, claims: Sequence[CaseClaim]) -> list[Suspect]:
    """What explains the differences of envelopes by itself, best first."""
    frame = opinions.frame
    enveloped = [e for c in claims for e in c.enveloped]
    if not enveloped:
        return []
    others = sum(d.place.case not in frame.several for c in claims for d in c.differences)
    found = [] if others else list(_left_out(frame, enveloped))
    found += _mixed(frame, opinions, closed, claims)
    return sorted(found, key=lambda s: (not s.fits, -s.explains))[:MOST]


def ranked_together(own: Sequence[Suspect], others: Sequence[Suspect]) -> tuple[Suspect, ...]:
    """Suspects of the envelope and those of its frame, those that fit first, with what ties across the two."""

    def tied(mine: Sequence[Suspect], theirs: Sequence[Suspect]) -> list[Suspect]:
        words = tuple(f"{s.says}; results of single combinations would tell" for s in theirs if s.fits)
        return [replace(s, tied_with=(*s.tied_with, *words)) if s.fits else s for s in mine]

    return tuple(sorted([*tied(own, others), *tied(others, own)], key=lambda s: not s.fits))


# --- left out of the envelope


def _left_out(frame: Frame, enveloped: Sequence[Enveloped]) -> Iterator[Suspect]:
    before = _misfit(enveloped, frozenset())
    if all(e.apart(frozenset()) <= e.allowed for e in enveloped):
        return
    for left in _candidates(frame, enveloped):
        after = _misfit(enveloped, left.names)
        explains = 1.0 - after / before
        within = all(e.apart(left.names) <= e.allowed for e in enveloped)
        if within or explains >= ENOUGH:
            change = Change(partial(_without, names=left.names))
            yield Suspect(left.kind, left.where, left.says, float(np.clip(explains, 0.0, 1.0)), (), change, within)


def _misfit(enveloped: Sequence[Enveloped], without: frozenset[str]) -> float:
    """Sum of squared differences, scaled by what is allowed."""
    return float(sum((e.apart(without) / e.allowed) ** 2 for e in enveloped if e.allowed > 0))


def _candidates(frame: Frame, enveloped: Sequence[Enveloped]) -> Iterator[_Left]:
    for name in dict.fromkeys(e.value.case for e in enveloped):
        meant = [n for n in frame.meant(name) if n in frame.combinations]
        for stated, loaded in _patterns(frame, meant).items():
            says = f"{stated} was on all spans only: its arrangements were left out of {name}"
            yield _Left("load", (stated,), says, frozenset(n for some in loaded.values() for n in some))
            for kind, some in _kinds(stated, loaded).items():
                yield _Left("load", (stated,), f"{kind} arrangements of {stated} were left out of {name}", frozenset(some))
            for case, some in loaded.items() if len(loaded) > 1 else ():
                yield _Left("load", (stated,), f"{case} was left out of {name}", frozenset(some))
        groups: dict[str, list[str]] = {}
        for n in meant:
            groups.setdefault(frame.combinations[n].stated or n, []).append(n)
            yield _Left("load case", (), f"{n} was left out of {name}", frozenset([n]))
        for group, some in groups.items():
            if len(some) > 1:
                yield _Left("load case", (), f"{group} was left out of {name}", frozenset(some))


def _patterns(frame: Frame, names: Iterable[str]) -> dict[str, dict[str, list[str]]]:
    """By the pattern's case and by arrangement: the combinations of `names` that have it."""
    out: dict[str, dict[str, list[str]]] = {}
    for n in names:
        for case in frame.combinations[n].factors:
            if frame.cases[case].arranged:
                out.setdefault(frame.cases[case].arranged, {}).setdefault(case, []).append(n)
    return out


def _kinds(stated: str, loaded: Mapping[str, list[str]]) -> dict[str, list[str]]:
    """The combinations with arrangements of one sort, where there are both: alternate spans loaded, or two side by side."""
    out: dict[str, list[str]] = {}
    for case, some in loaded.items():
        kind = "adjacent" if case[len(stated) + 2 :].startswith("spans ") else "alternate"
        out.setdefault(kind, []).extend(some)
    return out if len(out) > 1 else {}


def _without(frame: Frame, names: frozenset[str]) -> Frame:
    """The frame with these left out of every envelope that would keep something."""
    kept = {e.name: tuple(n for n in e.names if n not in names) for e in frame.envelopes.values()}
    new = {k: replace(e, names=kept[k]) if kept[k] else e for k, e in frame.envelopes.items()}
    return replace(frame, envelopes=new)


# --- values of several combinations mixed


def _mixed(
    frame: Frame, opinions: Opinions, closed: ClosedClaim, claims: Sequence[CaseClaim]
) -> Iterator[Suspect]:
    """Values printed beside an extreme as of its combination, which are those of other combinations of the envelope."""
    beside: dict[tuple[int, str, str], str] = {(v.line, v.case, v.quantity): v.beside for v in closed.values if v.beside}
    wrong = [(d, name) for c in claims for d in c.differences
             if (name := beside.get((d.line or 0, d.place.case, d.place.quantity)))]  # fmt: skip
    if not wrong:
        return
    all_wrong = [d for c in claims for d in c.differences]
    before = sum(d.times_allowed**2 for d in all_wrong)
    explained = [d for d, name in wrong if _of_another(opinions, frame, d, name)]
    share = sum(d.times_allowed**2 for d in explained) / before if before else 0.0
    members = tuple(dict.fromkeys(str(d.place.member) for d in explained if d.place.member))
    if share >= ENOUGH:
        quantities = " and ".join(dict.fromkeys(d.place.quantity for d in explained))
        says = f"{quantities} beside the extremes of the envelope are of other combinations than these"
        yield Suspect("load case", members, says, share, (), Change(), len(explained) == len(all_wrong))


def _of_another(opinions: Opinions, frame: Frame, d: Difference, name: str) -> bool:
    """Has another combination of the envelope the claim's value at this place?"""
    claim = d.values.get("claim")
    if claim is None or d.place.member is None:
        return False
    for answer in opinions.answers.values():
        for n in frame.meant(name):
            if n == d.place.case or n not in answer.cases:
                continue
            if any(abs(x - claim) <= d.allowed for x in _there(frame, opinions, n, d)):
                return True
        return False
    return False


def _there(frame: Frame, opinions: Opinions, name: str, d: Difference) -> list[float]:
    """What the first opinion says at the place, in another case; both sides along a member."""
    answer = next(a for a in opinions.answers.values() if name in a.cases)
    m, column = frame.member_index[str(d.place.member)], ("axial", "shear", "moment", "across").index(d.place.quantity)
    if d.place.of == "member_ends":
        end = 0 if frame.members[str(d.place.member)].joint_from == d.place.joint else 1
        return [float(answer.cases[name].ends[m, end, column])]
    if d.place.of != "spans" or d.place.at is None:
        return []
    at = np.full(2, float(d.place.at))
    found = answer.spans.along(name, np.full(2, m), at, np.array([-1, 1]))[:, column]
    return [float(x) for x in found]


