"""The other model's own input in a paste: joint coordinates, member ends, section properties, supports, load totals.

Kept apart from results. Coordinates and member ends also say which of the paste's names are which of the frame's, and how a
member was divided into several elements.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field, replace

import numpy as np

from crosscheck.claims.grid import Grid
from crosscheck.claims.meaning import Meaning, column
from crosscheck.claims.names import MemberHit, Names, plain
from crosscheck.claims.numbers import commas_are_decimal, is_blank, parse_number
from crosscheck.claims.reading import EchoFact, FrameNames
from crosscheck.claims.words import Head, Size
from crosscheck.frame.units import FORCE, Dimension, UnitError, parse_unit

CLOSE = 1e-3
"""Share of the frame's size within which two joints stand at one place: coordinates are printed to a few digits."""
_METRES = (1.0, 1e-3, 0.01, 0.3048, 0.0254)
_POWERS = {"A": 2, "I": 4, "x": 1, "y": 1, "z": 1, "length": 1}


@dataclass(frozen=True, slots=True)
class Piece:
    """Part of a member of the frame that the paste prints as a member of its own.

    start, end: distances from the frame's `from` joint of the piece's own start and end (end < start where it runs back);
    NaN where it is not said where inside the member that end lies.
    """

    member: str
    start: float
    end: float


@dataclass(slots=True)
class Echo:
    """Facts, and what they say of names: joints (the paste's to the frame's), members, pieces; inner: dividing joints."""

    facts: list[EchoFact] = field(default_factory=list)
    joints: dict[str, str] = field(default_factory=dict)
    members: dict[str, MemberHit] = field(default_factory=dict)
    pieces: dict[str, Piece] = field(default_factory=dict)
    inner: set[str] = field(default_factory=set)
    notes: list[str] = field(default_factory=list)


def echo_facts(kind: str, grid: Grid, meaning: Meaning) -> Iterator[EchoFact]:
    """The facts that a table of input states, one a cell."""
    named = next((k for k, r in enumerate(meaning.roles) if r.name in ("joint", "member", "case")), 0)
    comma = bool(commas_are_decimal(column(grid, k) for k in range(len(grid.heads)) if k != named))
    ends = [k for k, r in enumerate(meaning.roles) if r.name in ("start joint", "end joint")]
    for row, line in zip(grid.rows, grid.lines, strict=True):
        where = row[named].strip()
        if is_blank(where):
            continue
        if kind == "echo members" and len(ends) == 2:
            yield EchoFact(line, "member ends", where, f"{row[ends[0]].strip()}\t{row[ends[1]].strip()}", kind=kind)
        for k, head in enumerate(grid.heads):
            if k != named and k not in ends and (what := _what(kind, head)) and not is_blank(row[k]):
                yield _fact(kind, line, what, where, row[k], head, comma)


def _fact(kind: str, line: int, what: str, where: str, cell: str, head: Head, comma: bool) -> EchoFact:
    number = parse_number(cell, comma)
    if kind == "echo supports" or number is None:
        return EchoFact(line, what, where, cell.strip(), kind=kind)
    return EchoFact(line, what, where, number.value, number.half, _unit(head.text, what), kind)


def _what(kind: str, head: Head) -> str:
    """What a column of input holds: x, y, z, E, I, A, length, or a support's direction."""
    if kind == "echo joints":
        return head.axis if head.noun == "x" else ""
    if kind == "echo totals":
        return {"x": "x", "y": "y", "z": "y"}.get(head.axis, "") if head.noun in ("F", "x", "R") else ""
    if kind == "echo supports":
        if head.noun in ("T", "M"):
            return "rotation"
        return head.axis or ("support" if head.noun in ("support", "joint") else "")
    return head.noun if head.noun in ("E", "I", "A", "length", "section", "angle") else ""


def _unit(text: str, what: str) -> Size | None:
    """The unit in a head's brackets or at its end: powers of length and stresses too, which results never have."""
    found = re.search(r"[\[(]([^\])]+)[\])]", text) or re.search(r"[\s,]([A-Za-z]+\^?[24]?(?:/[a-z]+\^?2)?)$", text)
    if not found:
        return None
    try:
        unit = parse_unit(found.group(1))
    except UnitError:
        return None
    wanted = Dimension(force=1, length=-2) if what == "E" else Dimension(length=_POWERS.get(what, 1))
    if unit.dimension == FORCE:  # totals of loads
        wanted = FORCE
    return Size(unit.text, unit.dimension, float(unit.factor)) if unit.dimension == wanted else None


# -- facts in the frame's names

_HELD = frozenset({"1", "yes", "y", "true", "fixed", "fix", "held", "x", "rigid", "r", "restrained"})
_FREE = frozenset({"0", "no", "n", "false", "free", "-", "f", "released"})
_SUPPORTS = {"fix": "111", "encastr": "111", "clamp": "111", "built": "111", "pin": "110", "hing": "110", "roll": "010"}


def in_our_names(echo: Echo, names: Names) -> list[EchoFact]:
    """The facts as reviews compare them: "joint x", "joint y", "member ends" ("A to B"), "support" (held directions x, y,
    rotation as "110"), "I", "A", "E", "total x", "total y"; of the frame's names where the paste's are known."""
    out: list[EchoFact] = []
    marks: dict[str, dict[str, EchoFact]] = {}
    flat = not any(f.what == "y" and isinstance(f.value, float) and f.value for f in echo.facts)
    upright = {"x": "joint x", "z" if flat and any(f.what == "z" for f in echo.facts) else "y": "joint y"}
    for f in echo.facts:
        joint = _ours(echo, names, f.where) or f.where
        if f.kind == "echo joints":
            if f.what in upright and f.where not in echo.inner:
                out.append(replace(f, what=upright[f.what], where=joint))
        elif f.kind == "echo supports":
            marks.setdefault(joint, {})[f.what] = f
        elif f.kind == "echo totals":
            if f.what in ("x", "y"):
                out.append(replace(f, what=f"total {f.what}", where=names.case(f.where) or f.where))
        elif f.what == "member ends":
            if f.where not in echo.pieces:
                first, last = (_ours(echo, names, n) or n for n in _pair(f))
                out.append(replace(f, where=_member(echo, names, f.where), value=f"{first} to {last}"))
            elif whole := _whole(echo, names, f):
                out.append(whole)
        elif f.what in ("I", "A", "E"):
            out.append(replace(f, where=_member(echo, names, f.where)))
    return out + [fact for joint, cells in marks.items() if (fact := _support(joint, cells))]


def _whole(echo: Echo, names: Names, fact: EchoFact) -> EchoFact | None:
    """The ends of a divided member, told once: by its first piece, where its pieces reach both of its ends."""
    member = echo.pieces[fact.where].member
    pieces = [(label, p) for label, p in echo.pieces.items() if p.member == member]
    reached = {s for _, p in pieces for s in (p.start, p.end)}
    length = _length(names.frame, member)
    if fact.where != pieces[0][0] or 0.0 not in reached or not any(abs(s - length) <= CLOSE * length for s in reached):
        return None
    return replace(fact, where=member, value=" to ".join(names.frame.members[member]))


def _member(echo: Echo, names: Names, label: str) -> str:
    hit = echo.members.get(label) or names.member(label)
    return hit.name if hit else label


def _support(joint: str, cells: Mapping[str, EchoFact]) -> EchoFact | None:
    """Held directions of a support from a word or from three marks; None where they are not understood."""
    fact = next(iter(cells.values()))
    if word := cells.get("support"):
        flags = next((v for k, v in _SUPPORTS.items() if str(word.value).lower().startswith(k)), "")
    else:
        up = "y" if "y" in cells else "z"
        said = [str(cells[k].value).lower() if k in cells else "" for k in ("x", up, "rotation")]
        flags = "".join("1" if m in _HELD else "0" if m in _FREE else "?" for m in said)
    return replace(fact, what="support", where=joint, value=flags) if flags and "?" not in flags else None


# -- names by place


def learn(echo: Echo, names: Names) -> None:
    """Fills in what coordinates and member ends say of names."""
    places = echo_places(echo.facts, names.frame)
    if places:
        _joints_by_place(echo, places, names)
    ends = {f.where: _pair(f) for f in echo.facts if f.what == "member ends"}
    if ends:
        _members_by_ends(echo, ends, places, names)


def _pair(fact: EchoFact) -> tuple[str, str]:
    first, _, last = str(fact.value).partition("\t")
    return first, last


def echo_places(facts: list[EchoFact], frame: FrameNames) -> dict[str, tuple[float, float]]:
    """Coordinates of the paste's joints in the frame's unit of length; z stands for y where y never varies."""
    table: dict[str, dict[str, float]] = {}
    stated = False
    for f in facts:
        if f.what in ("x", "y", "z") and isinstance(f.value, float):
            stated = stated or f.unit is not None
            table.setdefault(f.where, {})[f.what] = f.value * (f.unit.factor / frame.length if f.unit else 1.0)
    flat = not any(abs(row.get("y", 0.0)) > 0 for row in table.values())
    up = "z" if flat and any("z" in row for row in table.values()) else "y"
    out = {name: (row.get("x", 0.0), row.get(up, 0.0)) for name, row in table.items()}
    return out if stated or not out else _scaled(out, frame)


def _scaled(places: dict[str, tuple[float, float]], frame: FrameNames) -> dict[str, tuple[float, float]]:
    """Coordinates without a unit, in the one under which most joints of the frame are found; the frame's own first."""

    def in_metres(metre: float) -> dict[str, tuple[float, float]]:
        factor = metre / frame.length
        return {n: (x * factor, y * factor) for n, (x, y) in places.items()}

    return in_metres(max((frame.length, *_METRES), key=lambda metre: len(_matched(in_metres(metre), frame))))


def _matched(places: Mapping[str, tuple[float, float]], frame: FrameNames) -> dict[str, str]:
    """The paste's joints that stand where a joint of the frame stands; none where two stand at one."""
    ours = list(frame.xy)
    xy = np.array([frame.xy[n] for n in ours], dtype=float).reshape(-1, 2)
    near = CLOSE * float(np.ptp(xy, axis=0).max()) if len(xy) else 0.0
    out: dict[str, str] = {}
    for name, (x, y) in places.items():
        close = np.flatnonzero(np.hypot(xy[:, 0] - x, xy[:, 1] - y) <= near)
        if len(close) == 1:
            out[name] = ours[int(close[0])]
    return out if len(set(out.values())) == len(out) else {}


def _joints_by_place(echo: Echo, places: Mapping[str, tuple[float, float]], names: Names) -> None:
    """Names by coordinates, unless the paste's joints have the frame's names: those are trusted, and another place of
    one of them is then a difference of geometry."""
    matched = _matched(places, names.frame)
    named = {n: joint for n in places if (joint := names.joint(n))}
    same = sum(named.get(n) == joint for n, joint in matched.items())
    if len(matched) < 0.8 * len(names.frame.xy) or same > 0.5 * len(matched):
        echo.inner |= {n for n in places if n not in named and len(matched) and n not in matched}
        return
    echo.joints |= matched
    echo.inner |= {n for n in places if n not in matched}
    echo.notes.append(f"{len(matched)} joints are matched by their coordinates")


def _members_by_ends(
    echo: Echo, ends: Mapping[str, tuple[str, str]], places: Mapping[str, tuple[float, float]], names: Names
) -> None:
    """Members by the joints that they join; those that join dividing joints are parts of one of the frame's."""
    for label, pair in ends.items():
        a, b = (_ours(echo, names, n) for n in pair)
        if a and b and (hit := names.between(a, b)):
            echo.members[label] = hit
        elif pair[0] in places and pair[1] in places and (piece := _piece(places[pair[0]], places[pair[1]], names.frame)):
            echo.pieces[label] = piece
            echo.inner |= {n for n, joint in zip(pair, (a, b), strict=True) if joint is None}
    _by_chain(echo, ends, names)
    if echo.pieces:
        whole = sorted({p.member for p in echo.pieces.values()})
        echo.notes.append(f"{len(echo.pieces)} elements are put together as parts of {', '.join(whole)}")


def _ours(echo: Echo, names: Names, joint: str) -> str | None:
    """The frame's joint for one of the paste's, None for one that divides a member."""
    if joint in echo.joints:
        return echo.joints[joint]
    return None if joint in echo.inner else names.joint(joint)


def _piece(a: tuple[float, float], b: tuple[float, float], frame: FrameNames) -> Piece | None:
    """The part between two points of the one member of the frame on whose line both lie."""
    found = []
    for name, (j, k) in frame.members.items():
        (px, py), (qx, qy) = frame.xy[j], frame.xy[k]
        length = float(np.hypot(qx - px, qy - py))
        cos, sin = (qx - px) / length, (qy - py) / length
        at = [(x - px) * cos + (y - py) * sin for x, y in (a, b)]
        off = [abs((y - py) * cos - (x - px) * sin) for x, y in (a, b)]
        near = CLOSE * length
        if max(off) <= near and all(-near <= s <= length + near for s in at):
            ends = [0.0 if abs(s) <= near else length if abs(s - length) <= near else s for s in at]
            found.append(Piece(name, ends[0], ends[1]))
    return found[0] if len(found) == 1 else None


def _by_chain(echo: Echo, ends: Mapping[str, tuple[str, str]], names: Names) -> None:
    """Elements that run through joints unknown to the frame from one of its joints to another are parts of the member
    between: where they meet inside it is not said, so that only its two ends are known."""
    left = {label: pair for label, pair in ends.items() if label not in echo.members and label not in echo.pieces}
    at: dict[str, list[str]] = {}
    for label, pair in left.items():
        for joint in pair:
            at.setdefault(joint, []).append(label)
    for label, pair in left.items():
        for start in pair:
            if _ours(echo, names, start) and label not in echo.pieces:
                _follow(echo, label, start, left, at, names)


def _follow(
    echo: Echo, first: str, start: str, ends: Mapping[str, tuple[str, str]], at: Mapping[str, list[str]], names: Names
) -> None:
    """Follows a chain of elements from a joint of the frame to the next one."""
    chain, joint = [(first, start)], _other(ends[first], start)
    while not _ours(echo, names, joint):
        following = [e for e in at[joint] if e != chain[-1][0]]
        if len(at[joint]) != 2 or len(following) != 1 or len(chain) > len(ends):
            return
        chain.append((following[0], joint))
        joint = _other(ends[following[0]], joint)
    a, b = _ours(echo, names, start), _ours(echo, names, joint)
    hit = names.between(a, b) if a and b and len(chain) > 1 else None
    if hit is None:
        return
    length = _length(names.frame, hit.name)
    for k, (label, enters) in enumerate(chain):
        near = (0.0 if hit.run > 0 else length) if k == 0 else float("nan")
        far = (length if hit.run > 0 else 0.0) if k == len(chain) - 1 else float("nan")
        forward = ends[label][0] == enters
        echo.pieces[label] = Piece(hit.name, near, far) if forward else Piece(hit.name, far, near)
        echo.inner |= {n for n in ends[label] if not _ours(echo, names, n)}


def _other(pair: tuple[str, str], joint: str) -> str:
    return pair[1] if pair[0] == joint else pair[0]


def _length(frame: FrameNames, member: str) -> float:
    (x0, y0), (x1, y1) = (frame.xy[j] for j in frame.members[member])
    return float(np.hypot(x1 - x0, y1 - y0))


def pieces_stated(parts: Mapping[str, tuple[str, ...]], names: Names) -> dict[str, Piece]:
    """Pieces of the reading file's lists of elements: only the first and the last one's outer ends are known."""
    out = {}
    for member, elements in parts.items():
        length = _length(names.frame, member)
        for k, element in enumerate(elements):
            start = 0.0 if k == 0 else float("nan")
            end = length if k == len(elements) - 1 else float("nan")
            out[plain(element)] = Piece(member, start, end)
    return out
