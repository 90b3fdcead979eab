"""Other ways to take what is printed, tried where the plain one does not fit: commas before thousands, end forces in global
axes, reactions along the axes of turned supports, end values at the face of rigid zones. Each is one way for the whole
claim, and it is said when one is taken.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from math import copysign, cos, radians, sin

import numpy as np

from crosscheck.claims.numbers import Number, parse_number
from crosscheck.claims.reading import Entry
from crosscheck.compare.fit_conventions import member_runs
from crosscheck.frame.model import Frame

Variant = tuple[list[Entry], str]
"""Entries and what is said of them ("" for the plain way)."""


def variants(entries: list[Entry], frame: Frame, face: bool) -> Iterator[Variant]:
    """The plain way first. face: the paste states that its end values stand at the face."""
    yield from _other_ways(entries, frame, face)
    if any(e.comma_open for e in entries):
        for tried, said in _other_ways([_as_thousands(e) for e in entries], frame, face):
            yield tried, "; ".join(t for t in ("commas are taken to stand before thousands, by fit", said) if t)


def _other_ways(entries: list[Entry], frame: Frame, face: bool) -> Iterator[Variant]:
    """What does not depend on what commas stand for."""
    plain = at_face(entries, frame) if face else entries
    yield plain, "end values stand at the face of rigid zones, as stated" if face else ""
    if any(e.axes == "open" and e.kind == "end" for e in entries):
        turned = in_member_axes(plain, frame)
        if turned is not None:
            yield turned, "end forces Fx, Fy are in global axes, by fit"
    if any(open_moment(e) for e in entries):
        of_members = moments_of_members(plain, frame)
        if of_members is not None:
            yield of_members, "moments at joints are those of the members there, by fit"
    if any(e.kind == "reaction" and _tilt(e, frame) for e in entries):
        tilted = in_global_axes(entries, frame)
        if tilted is not None:
            yield tilted, "reactions at turned supports are along the support's own axes, by fit"
    if not face and any(e.kind == "end" and _zone(e, frame) for e in entries):
        yield at_face(entries, frame), "end values stand at the face of rigid zones, by fit"


def _as_thousands(e: Entry) -> Entry:
    number = parse_number(e.number.printed, decimal_comma=False)
    if not e.comma_open or number is None:
        return e
    # "down" and "hogging" have turned the sign of a value in words; it stays turned.
    return replace(e, number=replace(number, value=copysign(number.value, e.number.value)))


def _end(e: Entry) -> int | None:
    """The frame's end of an end value; where only the paste's is known, members run as in the frame."""
    return e.end if e.end is not None else e.place


def _zone(e: Entry, frame: Frame) -> float:
    """Length of the rigid zone at the end of the member that the value is for."""
    if e.member is None or e.cut is not None or (end := _end(e)) is None:
        return 0.0
    member = frame.members[e.member]
    return member.rigid_from if end == 0 else member.rigid_to


def at_face(entries: list[Entry], frame: Frame) -> list[Entry]:
    """End values taken at the face of the rigid zone there."""
    out = []
    for e in entries:
        zone = _zone(e, frame) if e.kind == "end" else 0.0
        if zone:
            end = _end(e)
            length = float(frame.member_table.length[frame.member_index[str(e.member)]])
            e = replace(e, end=end, place=end if e.place is None else e.place, cut=zone if end == 0 else length - zone)
        out.append(e)
    return out


def in_member_axes(entries: list[Entry], frame: Frame) -> list[Entry] | None:
    """End forces along global x and y turned into the member's axes: axial (tension positive) and shear (along local y).

    None where a row gives one of the two alone.
    """
    pairs: dict[tuple[int, str | None, int | None], dict[str, Entry]] = {}
    for e in entries:
        if e.axes == "open" and e.kind == "end":
            pairs.setdefault((e.line, e.member, _end(e)), {})[e.quantity] = e
    if any(set(p) != {"axial", "shear"} or end is None for (_, _, end), p in pairs.items()):
        return None
    if any(e.extreme for p in pairs.values() for e in p.values()):
        return None  # the greatest of two components need not come from one case
    out = [e for e in entries if not (e.axes == "open" and e.kind == "end")]
    for (_, member, end), pair in pairs.items():
        assert end is not None
        m = frame.member_index[str(member)]
        angle = float(np.arctan2(frame.member_table.sin[m], frame.member_table.cos[m]))
        out += _turned(pair["axial"], pair["shear"], angle, end)
    return out


def open_moment(e: Entry) -> bool:
    """A moment at a joint that may be a reaction or that of a member there."""
    return e.kind == "reaction" and e.quantity == "moment" and e.axes == "open"


def moments_of_members(entries: list[Entry], frame: Frame) -> list[Entry] | None:
    """Moments at joints taken as bending moments in the one or two members there, run to the right or upward; None where
    more of them meet."""
    at: dict[str, list[tuple[str, int]]] = {}
    for m in frame.members.values():
        for end, joint in enumerate((m.joint_from, m.joint_to)):
            at.setdefault(joint, []).append((m.name, end))
    out = []
    for e in entries:
        if open_moment(e):
            members = at.get(str(e.joint), [])
            if not 1 <= len(members) <= 2:
                return None
            name, end = members[0]
            run = int(member_runs(frame, "rightward")[frame.member_index[name]])
            share = float(end if run > 0 else 1 - end)
            e = replace(e, kind="span", member=name, run=run, at=share, at_share=True, axes="")
        out.append(e)
    return out


def _tilt(e: Entry, frame: Frame) -> float:
    """Angle of the support that a reaction force stands at, in radians; 0 where it is not turned."""
    support = frame.supports.get(e.joint or "")
    return radians(support.angle) if support and e.quantity in ("fx", "fy") else 0.0


def in_global_axes(entries: list[Entry], frame: Frame) -> list[Entry] | None:
    """Reactions given along the axes of turned supports, in global axes; None where a row gives one of the two alone."""
    pairs: dict[tuple[int, str | None], dict[str, Entry]] = {}
    for e in entries:
        if e.kind == "reaction" and _tilt(e, frame):
            pairs.setdefault((e.line, e.joint), {})[e.quantity] = e
    if any(set(p) != {"fx", "fy"} or any(e.extreme for e in p.values()) for p in pairs.values()):
        return None
    out = [e for e in entries if not (e.kind == "reaction" and _tilt(e, frame))]
    for pair in pairs.values():
        a, b, angle = pair["fx"].number, pair["fy"].number, _tilt(pair["fx"], frame)
        c, s = cos(angle), sin(angle)
        printed = f"{a.printed}, {b.printed}"
        x = Number(c * a.value - s * b.value, abs(c) * a.half + abs(s) * b.half, printed)
        y = Number(s * a.value + c * b.value, abs(s) * a.half + abs(c) * b.half, printed)
        out += [replace(pair["fx"], number=x), replace(pair["fy"], number=y)]
    return out


def _turned(along_x: Entry, along_y: Entry, angle: float, end: int) -> list[Entry]:
    """Both components with their rounding carried through; printed as the pair."""
    x, y = along_x.number, along_y.number
    c, s = cos(angle), sin(angle)
    printed = f"{x.printed}, {y.printed}"
    half = [abs(c) * x.half + abs(s) * y.half, abs(s) * x.half + abs(c) * y.half]
    outward = -1.0 if end == 0 else 1.0  # tension pulls a member's start back and its end forward
    axial = Number(outward * (c * x.value + s * y.value), half[0], printed)
    shear = Number(-s * x.value + c * y.value, half[1], printed)
    place = {"end": end, "place": end, "run": 1}
    return [
        replace(along_x, number=axial, quantity="axial", axes="", **place),  # type: ignore[arg-type]
        replace(along_y, number=shear, quantity="shear", axes="", **place),  # type: ignore[arg-type]
    ]
