"""Is the frame symmetrical but for a little?"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from crosscheck.frame.model import FREE, HELD, Floats, Member, Support
from crosscheck.review.finding import Finding, Subject, global_loads

FEW = 0.2
"""Share of the pairs that may differ for the frame to count as one that just misses its symmetry."""
SLIGHT = 0.12
"""Share by which two loads may differ and still look as if they were meant to be the same."""


@dataclass(frozen=True, slots=True)
class Mirror:
    """Pairs of joints and members that mirror each other about the plumb middle line x = middle."""

    middle: float
    joints: tuple[tuple[str, str], ...]
    members: tuple[tuple[str, str], ...]


def mirrored_sections(subject: Subject) -> Iterator[Finding]:
    """Do mirrored members differ in section, material or hinges, where nearly all pairs match?

    Why: a symmetrical frame with one odd pair is more often a slip than a design.
    Look at: both members.
    Example: columns A and C are HE 300, and D, that mirrors A, is HE 260.
    Source: common practice.
    """
    mirror = mirror_of(subject)
    if mirror is None or not mirror.members:
        return
    odd = [pair for pair in mirror.members if _traits(subject, pair[0]) != _traits(subject, pair[1], turned=True)]
    if not 0 < len(odd) <= max(1.0, FEW * len(mirror.members)):
        return
    for a, b in odd:
        says = f"the frame is symmetrical, but {a} and {b} differ in {_difference(subject, a, b)}"
        yield Finding("check" if len(mirror.members) > 1 else "note", (a, b), says)


def _traits(subject: Subject, name: str, turned: bool = False) -> tuple[object, ...]:
    """Section, material and end connections, left end first."""
    m = subject.frame.members[name]
    t, k = subject.frame.member_table, subject.frame.member_index[name]
    backward = (t.cos[k] < -1e-9 or (abs(t.cos[k]) <= 1e-9 and t.sin[k] < 0)) != (turned and abs(t.cos[k]) > 1e-9)
    ends = (m.turn_to, m.turn_from) if backward else (m.turn_from, m.turn_to)
    return _makeup(m, backward), m.material, *ends


def _makeup(m: Member, backward: bool) -> object:
    """The section, or the pieces of a stepped or tapered member: first section, last section, share of the length; from its
    right or upper end where backward."""
    if not m.pieces:
        return m.section
    starts = (0.0, *(piece.until for piece in m.pieces))
    pieces = [(p.first, p.last, round(p.until - start, 9)) for p, start in zip(m.pieces, starts, strict=False)]
    return tuple((last, first, share) for first, last, share in reversed(pieces)) if backward else tuple(pieces)


def _difference(subject: Subject, a: str, b: str) -> str:
    one, two = _traits(subject, a), _traits(subject, b, turned=True)
    if one[0] != two[0]:
        plain = isinstance(one[0], str) and isinstance(two[0], str)
        return f"section ({one[0]}, {two[0]})" if plain else "the sections along them"
    return f"material ({one[1]}, {two[1]})" if one[1] != two[1] else "their end connections"


def mirrored_supports(subject: Subject) -> Iterator[Finding]:
    """Do mirrored supports differ?

    Why: a foot fixed on one side and pinned on the other moves the moments to one side.
    Look at: both supports; a pin and a roller under a beam are usual, a pinned and a fixed column foot are not.
    Example: D was meant to be fixed like A, and was typed "pinned".
    Source: common practice.
    """
    mirror = mirror_of(subject)
    if mirror is None:
        return
    for a, b in mirror.joints:
        one, two = subject.frame.supports.get(a), subject.frame.supports.get(b)
        if one is None and two is None:
            continue
        if one is None or two is None:
            bare, held = (a, b) if one is None else (b, a)
            says = f"the frame is symmetrical, but {bare} has no support while {held}, which mirrors it, has"
            if _feet(subject, a, b):
                yield Finding("check", (a, b), says)
        elif (one.y, one.rotation) != (two.y, two.rotation):
            odd = _feet(subject, a, b) and _grip(one) != _grip(two)
            says = f"the frame is symmetrical, but the supports at {a} and {b} differ"
            yield Finding("check" if odd else "note", (a, b), says)


def _feet(subject: Subject, *joints: str) -> bool:
    """Do columns stand on all these joints, and end there?"""
    frame, columns = subject.frame, set(subject.columns)
    for joint in joints:
        standing = columns & set(subject.members_at[joint])
        ends = [frame.members[n] for n in standing]
        if not standing or any(frame.joints[j].y < frame.joints[joint].y for m in ends for j in (m.joint_from, m.joint_to)):
            return False
    return True


def _grip(support: Support) -> str:
    return "held" if support.rotation == HELD else "free" if support.rotation == FREE else "spring"


def mirrored_loads(subject: Subject) -> Iterator[Finding]:
    """Do the loads of a case just miss the frame's symmetry?

    Why: loads that are nearly the same on both sides were probably meant to be the same.
    Look at: the loads on the members named.
    Example: 12.5 kN/m on the left rafter and 12.05 kN/m on the right one.
    Source: common practice (12%; or one pair among many).
    """
    mirror = mirror_of(subject)
    if mirror is None:
        return
    pairs = [(subject.frame.member_index[a], subject.frame.member_index[b]) for a, b in mirror.members]
    for case in subject.frame.cases:
        carried = _carried(subject, case, mirror.middle)
        gap = {p: _gap(carried[p[0]], carried[p[1]]) for p in pairs if carried[[*p], 0].any()}
        odd = [p for p, g in gap.items() if g > 1e-6]
        few = 0 < len(odd) <= FEW * len(gap)
        for p in odd:
            if few or gap[p] <= SLIGHT and len(odd) <= max(1.0, len(gap) / 2):
                a, b = (list(subject.frame.members)[k] for k in p)
                says = f"the frame is symmetrical, but in {case} the loads on {a} and {b} differ by {100 * gap[p]:.2g}%"
                yield Finding("check", (a, b), says)


def _carried(subject: Subject, case: str, middle: float) -> Floats:
    """(m, 2): downward load on each member and its lever about the middle line, sizes only."""
    loads = global_loads(subject.frame, subject.tables[case])
    on = loads.member >= 0
    out = np.zeros((len(subject.frame.members), 2))
    np.add.at(out, loads.member[on], np.column_stack([loads.fy[on], loads.fy[on] * (loads.x[on] - middle)]))
    return np.abs(out)


def _gap(a: Floats, b: Floats) -> float:
    """Largest relative difference of two members' loads and levers."""
    top = np.maximum(a, b)
    return float(np.max(np.divide(np.abs(a - b), top, out=np.zeros(2), where=top > 1e-9 * max(top.max(), 1e-300))))


def mirror_of(subject: Subject) -> Mirror | None:
    """The frame's own mirror image, None where joints and members are not symmetrical. Diagonals hinged at both ends are
    left out: bracing stands in one bay of many frames."""
    frame = subject.frame
    if not frame.joints:
        return None
    grain = max(1e-6 * subject.extent, 1e-12)
    middle = float(frame.xy[:, 0].min() + frame.xy[:, 0].max()) / 2
    place = {(round(x / grain), round(y / grain)): n for n, (x, y) in zip(frame.joints, frame.xy.tolist(), strict=True)}
    twin = {}
    around = [(dx, dy) for dx in (0, -1, 1) for dy in (0, -1, 1)]
    for name, (x, y) in zip(frame.joints, frame.xy.tolist(), strict=True):
        i, j = round((2 * middle - x) / grain), round(y / grain)
        other = next((place[i + dx, j + dy] for dx, dy in around if (i + dx, j + dy) in place), None)
        if other is None:
            return None
        twin[name] = other
    ends = {frozenset((m.joint_from, m.joint_to)): m.name for m in frame.members.values()}
    order = {name: k for k, name in enumerate(frame.members)}
    members = []
    t = frame.member_table
    bracing = (t.turn == FREE).all(axis=1) & (np.abs(t.sin) > 0.05) & (np.abs(t.cos) > 0.05)
    for m in (m for m, out in zip(frame.members.values(), bracing, strict=True) if not out):
        other = ends.get(frozenset((twin[m.joint_from], twin[m.joint_to])))
        if other is None:
            return None
        if order[m.name] < order[other]:
            members.append((m.name, other))
    rank = frame.joint_index
    return Mirror(middle, tuple((a, b) for a, b in twin.items() if rank[a] < rank[b]), tuple(members))
