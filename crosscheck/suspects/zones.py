"""Rigid end zones that one analysis counted and the other did not, or counted at another length."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import replace
from functools import partial

import numpy as np

from crosscheck.frame.model import FREE, Bools, Floats, Frame
from crosscheck.suspects.changes import Change, usable, with_member
from crosscheck.suspects.suspect import Family, Option, named

LEFT_OUT, ONE_LEFT_OUT, COUNTED, ONE_COUNTED, ONE_FITTED = 0.4, 0.7, 0.5, 0.9, 1.1
SKEW = 0.26
"""Sine of the angle (15 degrees) at which members must meet for the width of one to stiffen the other."""
STARTS = (0.03, 0.1)
"""Shares of the shortest member that fitted lengths begin from."""
LONGEST = 0.3
"""Share of a member that a zone at one of its ends may be."""


def zone_options(frame: Frame) -> Iterator[Option]:
    """Zones of the frame left out, of all members or of one; zones by the members' depths where the frame has none."""
    zoned = [m for m in frame.members.values() if m.rigid_from or m.rigid_to]
    if not zoned:
        yield from _by_depth(frame)
        return
    where = tuple(named(frame, "member", m.name) for m in zoned) if len(zoned) == 1 else ()
    yield Option("idealisation", where, "rigid end zones were left out", Change(_no_zones), LEFT_OUT)
    for m in zoned:
        if len(zoned) > 1:
            change = Change(partial(with_member, name=m.name, rigid_from=0.0, rigid_to=0.0))
            label = named(frame, "member", m.name)
            yield Option("idealisation", (label,), f"the rigid end zones of {label} were left out", change, ONE_LEFT_OUT)


def _no_zones(frame: Frame) -> Frame:
    return with_zones(frame, np.zeros((len(frame.members), 2)))


def with_zones(frame: Frame, zones: Floats) -> Frame:
    """The frame with zones (m, 2) at the members' ends."""
    pairs = zip(frame.members.values(), zones.tolist(), strict=True)
    return replace(frame, members={m.name: replace(m, rigid_from=a, rigid_to=b) for m, (a, b) in pairs})


# --- where a zone may have been counted ---


def crossed(frame: Frame) -> Floats:
    """(m, 2) half the depth of the deepest member that meets a member's stiff end at an angle: 0 where none does, NaN
    where one does and has no depth."""
    t = frame.member_table
    out = np.zeros((len(t.length), 2))
    at: dict[int, list[int]] = {}
    for m, ends in enumerate(t.ends.tolist()):
        for joint in ends:
            at.setdefault(joint, []).append(m)
    for m, ends in enumerate(t.ends.tolist()):
        for end, joint in enumerate(ends):
            across = [n for n in at[joint] if abs(t.cos[m] * t.sin[n] - t.sin[m] * t.cos[n]) > SKEW]
            if across and t.turn[m, end] != FREE:
                out[m, end] = t.depth[across].max() / 2
    return out


def _by_depth(frame: Frame) -> Iterator[Option]:
    """The whole or half of the joint taken as rigid, as the depths of the members that meet there make it."""
    zones = crossed(frame)
    if np.isnan(zones).any() or not zones.any():
        return
    for share, words in ((1.0, ""), (0.5, "half of ")):
        for mine, of in _groups(frame):
            new = np.where(mine[:, None], share * zones, 0.0)
            if usable(with_zones(frame, new)):
                says = f"rigid end zones were counted, {words}the depth of what {of} meet"
                yield Option("idealisation", (), says, Change(partial(with_zones, zones=new)), COUNTED)


def _groups(frame: Frame) -> Iterator[tuple[Bools, str]]:
    """Members whose ends are taken together, in words: all, those that lie, those that stand."""
    lies = np.abs(frame.member_table.cos) >= np.sqrt(0.5)
    yield np.ones(len(lies), dtype=bool), "all members"
    if lies.any() and not lies.all():
        yield lies, "beams"
        yield ~lies, "columns"


# --- lengths that are fitted ---


def zone_families(frame: Frame) -> Iterator[Family]:
    """One length at all members' ends, or at those of one member; where the frame has zones, these by one factor."""
    t = frame.member_table
    if t.zone.any():
        yield Family(partial(_factored, frame), (0.5, 2.0))
        return
    meets = crossed(frame) != 0.0
    shortest = float(t.length.min(initial=np.inf))
    for mine, of in _groups(frame):
        at = meets & mine[:, None]
        if at.any():
            yield Family(_clipped(partial(_counted, frame, at, f"at the ends of {of}"), LONGEST * shortest),
                         tuple(s * shortest for s in STARTS))  # fmt: skip
    for m, name in enumerate(frame.members):
        yield from _of_one(frame, m, named(frame, "member", name))


def _of_one(frame: Frame, m: int, label: str) -> Iterator[Family]:
    t = frame.member_table
    length = float(t.length[m])
    names = list(frame.joints)
    ends = [(0,), (1,), (0, 1)]
    for chosen in ends:
        at = np.zeros((len(t.length), 2), dtype=bool)
        at[m, list(chosen)] = True
        words = "at both ends of" if len(chosen) == 2 else f"at {names[int(t.ends[m, chosen[0]])]} of"
        make = partial(_counted, frame, at, f"{words} {label}", where=(label,))
        yield Family(_clipped(make, LONGEST * length), tuple(s * length for s in STARTS), True, (), (m,))


def _clipped(make: Callable[[float], Option], most: float) -> Callable[[float], Option]:
    return lambda p: make(min(p, most))


def _counted(frame: Frame, at: Bools, words: str, p: float, where: tuple[str, ...] = ()) -> Option:
    change = Change(partial(with_zones, zones=np.where(at, p, 0.0)))
    says = f"rigid end zones of {p:.4g} were counted {words}"
    return Option("idealisation", where, says, change, ONE_FITTED if where else COUNTED, fitted=1)


def _factored(frame: Frame, p: float) -> Option:
    change = Change(partial(with_zones, zones=p * frame.member_table.zone))
    return Option("idealisation", (), f"rigid end zones were {p:.4g} times as long", change, ONE_COUNTED, fitted=1)
