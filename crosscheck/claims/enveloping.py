"""Tables of envelopes: which cells name the combination that governs, and what a pair of rows says once.

A place (a member's end, a station, a support) has a greatest and a least value of each quantity over several combinations.
They stand beside each other ("M max", "M min") or below each other (rows "max" and "min", or "max M" with the values of
the other quantities in the same combination beside it), and the governing combination behind the value or at the row's end.
"""

from __future__ import annotations

from dataclasses import replace

from crosscheck.claims.grid import Grid
from crosscheck.claims.meaning import Meaning, Role, column
from crosscheck.claims.names import Names

GOVERNING = ("govern", "determin", "decisive", "critical")
LOOKED_AT = 200
"""Cells of a column that tell what it is."""


def with_governing(meaning: Meaning, grid: Grid, names: Names) -> Meaning:
    """The meaning, with columns that name governing combinations told from those that name the case of the row.

    A column of cases in a table of greatest and least values says what governs: always where the values are those of one
    place; among values along whole members where its head says so, where it stands behind a value, or where it changes
    while no member comes twice.
    """
    roles = meaning.roles
    cases = [k for k, r in enumerate(roles) if r.name == "case" or not r.name and _says_governs(grid, k)]
    if not cases or not any(r.name == "which" or r.which for r in roles):
        return meaning
    out = list(roles)
    for k in cases:
        if _governs(meaning.kind, k, cases, roles, grid, names):
            out[k] = Role("governs", of=_left_of(k, roles, len(cases) > 1))
    return replace(meaning, roles=tuple(out))


def _says_governs(grid: Grid, k: int) -> bool:
    return any(word in grid.heads[k].text.lower() for word in GOVERNING)


def _governs(kind: str, k: int, cases: list[int], roles: tuple[Role, ...], grid: Grid, names: Names) -> bool:
    if _says_governs(grid, k):
        return True
    cells = column(grid, k)[:LOOKED_AT]
    of_envelopes = sum(names.case(c) in names.frame.envelopes for c in cells)
    if 2 * of_envelopes > len(cells) and not any(r.name == "value" for r in roles[:k]):
        return False  # the column names the envelope
    if kind != "extreme" or len(cases) > 1 or any(r.name == "value" for r in roles[:k]):
        return True
    where = [j for j, r in enumerate(roles) if r.name in ("member", "which")]
    rows = [tuple(row[j] for j in where) for row in grid.rows]
    return len(set(column(grid, k))) > 1 and len(set(rows)) == len(rows)


def _left_of(k: int, roles: tuple[Role, ...], several: bool) -> int:
    """The column of values that a governing combination stands right behind; -1 where it is that of the whole row.

    several: the table has more than one column of them.
    """
    behind = several or any(r.name == "value" for r in roles[k + 1 :])
    return k - 1 if k and roles[k - 1].name == "value" and (behind or roles[k - 1].which) else -1


def governing(row: list[str], roles: tuple[Role, ...], k: int, alone: bool) -> str:
    """What the row says governs its value in column k, "" where it says nothing. alone: it has the row's only value, or
    the one that the row's "max M" is of."""
    found = [row[j] for j, r in enumerate(roles) if r.name == "governs" and (r.of == k or r.of < 0 and alone)]
    return found[0] if found else ""


def once(cells: dict[str, str], kept: dict[str, str], member: str) -> dict[str, str]:
    """The row's cells, with those that stand once for the pair of rows "max" and "min": the joint, the end, the station.

    kept: what the rows above said, of the member named last; it is brought up to date.
    """
    if "which" not in cells:
        return cells
    if member and member != kept.get("member"):
        kept.clear()
        kept["member"] = member
    for key in ("joint", "end", "station"):
        if cells.get(key, "").strip():
            kept[key] = cells[key]
    return {**cells, **{key: kept[key] for key in ("joint", "end", "station") if key in cells and key in kept}}
