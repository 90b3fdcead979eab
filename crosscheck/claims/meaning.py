"""What a table's columns mean: its kind, and the role of each column, from heads, cells and the heading above.

A symbol alone says little ("Rz" is a force in one table and a rotation in another), so the kind is settled first.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, replace

from crosscheck.claims.grid import Grid
from crosscheck.claims.names import Names, plain
from crosscheck.claims.numbers import is_blank, parse_number
from crosscheck.claims.scan import RawTable, is_number
from crosscheck.claims.which import which_of
from crosscheck.claims.words import NUMBERED_AXIS, RESULT_NOUNS, Head, Size
from crosscheck.frame.units import ANGLE, FORCE, LENGTH, MOMENT

START_WORDS = frozenset({"i", "start", "from", "1", "left", "near", "a", "first", "begin", "end1", "endi", "bottom", "0"})
LAST_WORDS = frozenset({"j", "end", "to", "2", "right", "far", "b", "second", "last", "end2", "endj", "top"})
MOST_HEADS = 200


@dataclass(frozen=True, slots=True)
class Role:
    """What a column is for: "" (not used), member, joint, start joint, end joint, end, case, station, which, value, or
    governs (the governing combination of the value in column `of`; of the whole row where that is negative)."""

    name: str = ""
    quantity: str = ""
    end: int | None = None
    which: str = ""
    unit: Size | None = None
    share: bool = False
    axes: str = ""
    of: int = -1
    kind: str = ""
    """Where it differs from the table's: displacements beside the reactions of the same joints."""


@dataclass(frozen=True, slots=True)
class Meaning:
    """kind: end, ends (both in a row), span, reaction, displacement, extreme, echo ..., or "" with the reason why not."""

    kind: str
    roles: tuple[Role, ...]
    why: str = ""


def meaning_of(grid: Grid, table: RawTable, names: Names) -> Meaning:
    """Kind and roles of the columns of one table."""
    if len(grid.heads) > MOST_HEADS:
        return Meaning("", tuple(Role() for _ in grid.heads), "it has too many columns")
    if table.heads and grid.heads and not any(h.text for h in grid.heads):
        return Meaning("", tuple(Role() for _ in grid.heads), "the heads do not match the columns below them")
    heads = _turning_told(_numbered(_filled(grid, table, names)))
    roles = _named_roles(heads, grid, names)
    kind, why = ("echo supports", "") if _restrains(grid, roles, table.heading, names) else _kind(heads, roles, table)
    if not kind:
        return Meaning("", tuple(roles), why)
    if kind.startswith("echo"):
        return Meaning(kind, tuple(roles))
    roles, why = _values(kind, heads, roles, grid)
    if not any(r.name == "value" for r in roles):
        return Meaning("", tuple(roles), why or "no column of results was recognised")
    if kind == "reaction":
        roles = _open_moments(roles, grid, table)
    if kind == "end" and not any(r.name in ("joint", "end") for r in roles):
        kind = "ends" if any(r.name == "value" and r.end is not None for r in roles) else "end"
    return Meaning(kind, tuple(roles), why)


# -- heads that say nothing, from the cells below them


def column(grid: Grid, k: int) -> list[str]:
    return [row[k] for row in grid.rows if not is_blank(row[k])]


def _filled(grid: Grid, table: RawTable, names: Names) -> list[Head]:
    """Heads with those that say nothing told from their cells."""
    heads = list(grid.heads)
    results = {h.noun for h in heads}
    member_wanted = not any(h.noun == "member" for h in heads) and not any(table.blocks)
    for k, head in enumerate(heads):
        if head.which and not head.noun and _share(column(grid, k), which_of) >= 0.6:
            heads[k] = replace(head, noun="which", which="")  # "Max/Min" above "max", "min"
        elif head.which and not head.noun and head.unit and head.unit.dimension == MOMENT:
            heads[k] = replace(head, noun="M")  # "max [kNm]"
        if head.noun not in ("", "id") or head.which:
            continue
        cells = column(grid, k)
        named_beside = len(heads) > 2 and any(h.noun in ("member", "joint", "id") for h in heads)
        if head.noun == "" and head.end is None and k == 0 and named_beside and _is_index(cells):
            continue
        noun = _noun_of_cells(cells, names, member_wanted and bool(results & {"N", "V", "w"}))
        if head.noun == "id" and not noun:
            noun = "member" if results & {"N", "V", "w"} or re.search("element|member", table.heading, re.I) else "joint"
        if noun == "member":
            member_wanted = False
        heads[k] = replace(head, noun=noun)
    return heads


def _is_index(cells: list[str]) -> bool:
    return cells == [str(k) for k in range(len(cells))]


def _noun_of_cells(cells: list[str], names: Names, member_first: bool) -> str:
    """What most cells name: members, joints, ends, cases, which extreme; "" where they do not."""
    if not cells:
        return ""
    shares = {
        "member": _share(cells, lambda t: names.member(t) is not None),
        "joint": _share(cells, lambda t: names.joint(t) is not None),
        "end": _share(cells, lambda t: plain(t) in START_WORDS | LAST_WORDS) if not _share(cells, is_number) else 0.0,
        "which": _share(cells, which_of),
        "case": _share(cells, lambda t: names.case(t) is not None),
    }
    order = ["member", "joint", "which", "case", "end"] if member_first else ["joint", "member", "which", "case", "end"]
    best = max(order, key=lambda noun: shares[noun])
    return best if shares[best] >= 0.6 else ""


def _share(cells: list[str], test: object) -> float:
    assert callable(test)
    some = cells[:200]
    return sum(bool(test(c)) for c in some) / len(some) if some else 0.0


def _numbered(heads: list[Head]) -> list[Head]:
    """A number behind a symbol is an axis where 3 occurs ("M3", "V2"), else an end ("M1", "M2")."""
    axes = {h.axis for h in heads if h.axis in NUMBERED_AXIS}
    if not axes:
        return heads
    if axes <= {"1", "2"} and "1" in axes:
        return [replace(h, axis="", end=int(h.axis) - 1) if h.axis in ("1", "2") else h for h in heads]
    return [replace(h, axis=NUMBERED_AXIS.get(h.axis, h.axis)) for h in heads]


# -- columns that name places


def _named_roles(heads: list[Head], grid: Grid, names: Names) -> list[Role]:
    roles = [Role() for _ in heads]
    joints = [k for k, h in enumerate(heads) if h.noun == "joint"]
    bare_ends = [k for k, h in enumerate(heads) if h.noun == "" and h.end is not None and not h.which]
    for k in bare_ends:
        cells = column(grid, k)
        if _share(cells, lambda t: names.joint(t) is not None) >= 0.6 or _connects(heads):
            joints.append(k)
    pair = len(joints) == 2
    for position, k in enumerate(sorted(joints)):
        end = heads[k].end if heads[k].end is not None else (position if pair else None)
        roles[k] = Role("joint" if end is None or not pair else ("start joint", "end joint")[end])
    for k, head in enumerate(heads):
        if head.noun in ("case", "which", "end") and not roles[k].name:
            roles[k] = Role(head.noun)
        if head.noun == "member":
            roles[k] = Role("end" if any(r.name == "member" for r in roles) else "member")
        if head.noun == "station" and not any(r.name == "station" for r in roles):
            roles[k] = Role("station", unit=head.unit, share=head.share)
    return [_which_or_case(r, column(grid, k), names) for k, r in enumerate(roles)]


def _connects(heads: list[Head]) -> bool:
    """ "Member, From, To" and no results: the joints that members join, whatever they are called."""
    ends = sorted(h.end for h in heads if h.noun == "" and h.end is not None and not h.which)
    return ends == [0, 1] and any(h.noun == "member" for h in heads) and not any(h.noun in RESULT_NOUNS for h in heads)


def _which_or_case(role: Role, cells: list[str], names: Names) -> Role:
    """A head such as "end" or "case" is held to its cells."""
    if role.name == "which" and _share(cells, which_of) < 0.5:
        return Role("case") if cells and _share(cells, names.case) == 1.0 else Role()
    return role


# -- kind

RESTRAINTS = frozenset(
    {
        "fixed",
        "fix",
        "free",
        "held",
        "restrained",
        "yes",
        "no",
        "true",
        "false",
        "pinned",
        "roller",
        "encastre",
        "rigid",
        "released",
    }
)


def _restrains(grid: Grid, roles: list[Role], heading: str, names: Names) -> bool:
    """Does the table say which directions of joints are held, by words or by ones and zeros?"""
    if not any(r.name == "joint" for r in roles):
        return False
    cells = [c.lower() for k, r in enumerate(roles) if not r.name for c in column(grid, k)]
    told = re.search(r"support|restrain|fixit", heading, re.IGNORECASE) is not None or "1" in cells and all(
        names.joint(c) in names.frame.supports for k, r in enumerate(roles) if r.name == "joint" for c in column(grid, k)
    )
    words = [c for c in cells if c in RESTRAINTS]
    return bool(cells) and len(words) + (sum(c in ("0", "1") for c in cells) if told else 0) == len(cells)


def _kind(heads: list[Head], roles: list[Role], table: RawTable) -> tuple[str, str]:
    heading = table.heading.lower()
    nouns = {h.noun for h in heads}
    names_of = {r.name for r in roles}
    forces = nouns & {"N", "V", "M", "F"}
    if echo := _echo_kind(heads, names_of, heading, nouns):
        return echo, ""
    of_member = "member" in names_of or {"start joint", "end joint"} <= names_of or any(table.blocks)
    axes = [h.axis for h in heads if h.noun == "x"]
    along = axes == ["x"] and bool(forces) and (of_member or "joint" not in names_of)
    station = "station" in names_of or (along and not re.search("react|displ", heading))
    if "joint" in names_of and not of_member and _pulls_too(heads):
        return "reaction", ""
    if _moves(heads, nouns, heading) and not (of_member and station):
        return ("displacement", "") if "joint" in names_of else ("", "displacements of what is not said")
    if station and (of_member or nouns & {"N", "V"} or "M" in nouns):
        return ("span", "") if of_member else ("", "values along a member whose name is not said")
    if of_member and (forces or "R" in nouns):
        of_ends = {"joint", "end"} & names_of or any(h.end is not None and h.noun in RESULT_NOUNS for h in heads)
        if ("which" in names_of or any(h.which for h in heads)) and not of_ends:
            return "extreme", ""
        return "end", ""
    if "joint" in names_of and (forces or "R" in nouns or "x" in nouns):
        return "reaction", ""
    return "", "it is not said what the values belong to"


def _moves(heads: list[Head], nouns: set[str], heading: str) -> bool:
    """Do the columns hold displacements?"""
    if any(h.unit and h.unit.dimension == FORCE for h in heads):
        return False
    if nouns & {"D", "T"} and not nouns & {"F", "N"}:
        return True
    told = re.search(r"displ|deflect|rotation|movement|translation", heading) is not None
    lengths = any(h.unit and h.unit.dimension in (LENGTH, ANGLE) for h in heads)
    return bool(nouns & {"R", "x", "w"}) and (told or lengths) and not nouns & {"F", "N"}


def _echo_kind(heads: list[Head], names_of: set[str], heading: str, nouns: set[str]) -> str:
    """Kind of a table of the other model's own input, "" where it is none."""
    results = nouns & {"N", "V", "M", "F", "R", "D", "T", "w"}
    placed = {"joint", "member", "station"} & names_of or {"start joint", "end joint"} <= names_of
    if "case" in names_of and not placed and results <= {"F", "M", "R"} and (results or "x" in nouns):
        return "echo totals"
    if {"I", "A"} & nouns or "E" in nouns and not results:
        return "echo sections" if not results else ""
    if results and "coordinate" not in heading:
        return ""
    axes = [h.axis for h in heads if h.noun == "x"]
    if "joint" in names_of and len(axes) >= 2 and not re.search(r"displ|react|deflect", heading):
        return "echo joints"
    if {"start joint", "end joint"} <= names_of:
        return "echo members"
    if "support" in nouns or re.search(r"\bsupports?\b|restrain|fixity", heading) and "joint" in names_of and not axes:
        return "echo supports"
    return "echo other" if nouns & {"section", "length"} and not results else ""


# -- columns of values

_TARGETS = {
    "end": {"axial": "N Nx Fx F", "shear": "V Vy Vz Fy Fz", "moment": "M Mz My Mx"},
    "span": {"axial": "N Nx Fx F", "shear": "V Vy Vz Fy Fz", "moment": "M Mz My Mx", "across": "w D Dy Dz wy wz"},
    "extreme": {"axial": "N Nx Fx F", "shear": "V Vy Vz Fy Fz", "moment": "M Mz My Mx", "across": "w D Dy Dz wy wz"},
    "reaction": {"fx": "Fx Rx xx Vx", "fy": "Fy Fz Ry Rz xy xz V Vy Vz", "moment": "M Mz My Mx"},
    "displacement": {"dx": "Dx xx", "dy": "Dy Dz xy xz w V wy wz", "rotation": "T Tz Ty Tx Rz Ry Rx"},
}
_DIMENSIONS = {
    "axial": FORCE, "shear": FORCE, "fx": FORCE, "fy": FORCE, "moment": MOMENT, "dx": LENGTH, "dy": LENGTH,
    "across": LENGTH, "rotation": ANGLE,
}  # fmt: skip


def dimension_of(quantity: str) -> object:
    """The dimension of a quantity's values."""
    return _DIMENSIONS[quantity]


def _values(kind: str, heads: list[Head], roles: list[Role], grid: Grid) -> tuple[list[Role], str]:
    roles = list(roles)
    heads = _sided(kind, heads)
    if kind in ("end", "span", "extreme"):
        # "u" and "w" alone: not said whether from the chord, along the member or in all; never compared.
        heads = [Head(h.text) if h.noun in ("w", "D") and not h.axis and _LETTER.match(h.text) else h for h in heads]
    if kind == "reaction" and any(h.noun == "D" for h in heads):
        return _with_displacements(heads, roles, grid)
    if kind == "span" and not any(r.name == "station" for r in roles):
        k = next(k for k, h in enumerate(heads) if h.noun == "x")
        roles[k] = Role("station", unit=heads[k].unit, share=heads[k].share)
    groups = sorted({(h.end, h.which) for h in heads if h.noun in "NVMFRDTwx"}, key=str)
    why = ""
    left = {
        k for k, h in enumerate(heads)
        if not roles[k].name and (h.noun in RESULT_NOUNS or h.which and not h.noun and _any_number(column(grid, k)))
    }  # fmt: skip
    for end, which in groups:
        mine = [k for k, h in enumerate(heads) if (h.end, h.which) == (end, which) and not roles[k].name]
        for quantity, wanted in _TARGETS[kind].items():
            found = _columns_for(wanted.split(), mine, heads, quantity)
            chosen, doubt = _in_plane(found, quantity, heads, grid, roles)
            why = why or doubt
            if chosen is not None:
                axes = "open" if heads[chosen].noun == "F" and heads[chosen].axis else ""
                roles[chosen] = Role("value", quantity, end, which, heads[chosen].unit, axes=axes)
                left -= set(found)
    idle = [heads[k].text for k in sorted(left) if not roles[k].name and _any_number(column(grid, k))]
    if idle and not why:
        one = len(idle) == 1
        why = f"it is not clear what the column{'' if one else 's'} {', '.join(idle)} hold{'s' if one else ''}"
    return roles, why


_LETTER = re.compile(r"[uvw](?:tot)?(?:max|min)?\b")


def _with_displacements(heads: list[Head], roles: list[Role], grid: Grid) -> tuple[list[Role], str]:
    """A table of joints that holds displacements beside reactions."""
    moving = [h.noun in ("D", "T") for h in heads]
    pulls, why = _values("reaction", [Head("") if m else h for h, m in zip(heads, moving, strict=True)], roles, grid)
    moves, other = _values("displacement", [h if m else Head("") for h, m in zip(heads, moving, strict=True)], roles, grid)
    moves = [replace(r, kind="displacement") if r.name == "value" else r for r in moves]
    return [b if m else a for a, b, m in zip(pulls, moves, moving, strict=True)], why or other


def _open_moments(roles: list[Role], grid: Grid, table: RawTable) -> list[Role]:
    """Moments alone, at joints, may be reactions or the moments of the members there, unless reactions are spoken of."""
    told = any(re.search("react|rxn|rct", t, re.IGNORECASE) for t in (table.heading, *(h.text for h in grid.heads)))
    if told or {r.quantity for r in roles if r.name == "value"} != {"moment"}:
        return roles
    return [replace(r, axes="open") if r.name == "value" else r for r in roles]


def _turning_told(heads: list[Head]) -> list[Head]:
    """ "ux uy rz Rx Ry Mz": the r that follows displacements and stands apart from the reactions turns."""
    pulls = [k for k, h in enumerate(heads) if h.noun in ("R", "F")]
    after = [k for k in pulls if k and heads[k - 1].noun == "D" and heads[k].noun == "R" and heads[k].axis in ("y", "z")]
    if len(after) != 1 or len(pulls) < 3 or not _pulls_too(heads):
        return heads
    return [replace(h, noun="T") if k == after[0] else h for k, h in enumerate(heads)]


def _pulls_too(heads: list[Head]) -> bool:
    """Do reactions stand beside displacements?"""
    axes = {h.axis for h in heads if h.noun in ("R", "F")}
    return {"D", "M"} <= {h.noun for h in heads} and "x" in axes and len(axes) > 1


def _sided(kind: str, heads: list[Head]) -> list[Head]:
    """Symbols that the kind of table turns: u, v and w of displacements; H and V of reactions."""
    if kind != "displacement":
        return heads
    plain_moves = [k for k, h in enumerate(heads) if h.noun == "D" and not h.axis]
    if plain_moves and not any(h.noun == "D" and h.axis == "x" for h in heads):
        heads = list(heads)
        for k, axis in zip(plain_moves, "xy", strict=False):
            heads[k] = replace(heads[k], axis=axis)
    return heads


def _columns_for(wanted: list[str], mine: list[int], heads: list[Head], quantity: str) -> list[int]:
    keys = {k: heads[k].noun + heads[k].axis for k in mine}
    found = [k for want in wanted for k in mine if keys[k] == want]
    fits = [k for k in found if not _misfit(heads[k].unit, quantity)]
    return list(dict.fromkeys(fits))


def _misfit(unit: Size | None, quantity: str) -> bool:
    if unit is None or quantity == "rotation" and unit.dimension == type(unit.dimension)():
        return False
    return unit.dimension != _DIMENSIONS[quantity]


def _in_plane(found: list[int], quantity: str, heads: list[Head], grid: Grid, roles: list[Role]) -> tuple[int | None, str]:
    """Of the columns that may hold a quantity (y and z of a spatial table) the one that is not all zero."""
    free = [k for k in found if not roles[k].name and any(is_number(c) for c in column(grid, k))]
    if len(free) <= 1:
        return (free[0] if free else None), ""
    busy = [k for k in free if not _all_zero(column(grid, k))]
    if len(busy) > 1:
        names = ", ".join(heads[k].text for k in busy)
        return None, f"more than one column may hold {quantity} ({names}); say which with --columns"
    return (busy or free)[0], ""


def _all_zero(cells: list[str]) -> bool:
    for cell in cells:
        number = parse_number(cell) or parse_number(cell, decimal_comma=True)
        if number is None or number.value != 0:
            return False
    return True


def _any_number(cells: list[str]) -> bool:
    """Does a column hold numbers that are not all zero?"""
    return any(is_number(c) for c in cells) and not _all_zero(cells)
