"""Mistakes in the paste: units of a column, signs, rows swapped or shifted, digits transposed, decimals slipped.

Here the claim changes and the frame stands. Nothing is replaced by what the model says, but for the last resorts, a value
or row that stands against everything else, which say so and rank behind all others.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator
from functools import partial
from itertools import combinations

import numpy as np

from crosscheck.compare.claimed import ClaimedValue
from crosscheck.frame.model import Floats, Ints
from crosscheck.suspects.changes import Change, with_values
from crosscheck.suspects.observation import Observation
from crosscheck.suspects.suspect import Option, named

FORCE = {
    "kip taken for lbf": 1e3, "kN taken for N": 1e3, "kip taken for kN": 4.4482216152605, "tonnes taken for kN": 9.80665,
    "MN taken for N": 1e6, "lbf taken for N": 4.4482216152605,
}  # fmt: skip
LENGTH = {
    "m taken for mm": 1e3, "m taken for cm": 1e2, "cm taken for mm": 10.0, "ft taken for in": 12.0,
    "m taken for ft": 1 / 0.3048,
    "in taken for cm": 2.54, "m taken for in": 1 / 0.0254, "in taken for mm": 25.4,
}  # fmt: skip
ANGLE = {"rad taken for degrees": 180 / math.pi, "rad taken for mrad": 1e3}
MOMENT = {"kN m taken for N mm": 1e6, "kip ft taken for kN m": 1.3558179483314, "kip ft taken for lbf in": 12e3}
"""What a value must be multiplied by where one unit was taken for another; the other way round, divided by."""
POWERS = {"moment": (1, 1), "dx": (0, 1), "dy": (0, 1), "across": (0, 1), "rotation": (0, 0)}
"""Powers of force and of length in a quantity's unit; (1, 0) in all others."""
UNIT, SIGN, MEMBER_SIGN, ONE_SIGN, SWAP, DIGITS, SLIP, LONE, LONE_ROW = 0.3, 0.3, 0.4, 0.7, 0.6, 0.5, 0.4, 2.2, 2.6
FEW_ROWS, FEW_VALUES = 14, 4


def paste_options(seen: Observation) -> Iterator[Option]:
    """Every mistake of the paste that could explain the difference."""
    yield from _units(seen)
    yield from _signs(seen)
    yield from _rows(seen)
    yield from _values(seen)


def _replaced(seen: Observation, rows: Ints, new: Floats, kind: str, where: Iterable[str], says: str, cost: float,
              half: Floats | None = None) -> Option:  # fmt: skip
    claimed = seen.value.copy()
    claimed[rows] = new
    halves = None
    if half is not None:
        halves = seen.half.copy()
        halves[rows] = half
    values = {seen.values[k]: float(v) for k, v in zip(rows.tolist(), np.atleast_1d(new).tolist(), strict=True)}
    return Option(
        kind, tuple(where), says, Change(claim=partial(with_values, new=values)), cost, claimed=claimed, half=halves
    )


def _places(seen: Observation, rows: Ints) -> tuple[str, ...]:
    """Members (or joints) of some values, for `where`; empty where there are many."""
    found = dict.fromkeys(_label(seen, seen.values[k]) for k in rows.tolist())
    names = tuple(n for n in found if n)
    return names if len(names) <= 4 else ()


def _label(seen: Observation, v: ClaimedValue) -> str:
    if v.member is not None:
        return named(seen.frame, "member", v.member)
    return named(seen.frame, "joint", v.joint) if v.joint is not None else ""


def _bad(seen: Observation) -> Ints:
    return np.flatnonzero(seen.off)


def _groups(seen: Observation, *keys: str) -> Iterator[tuple[tuple[object, ...], Ints]]:
    found: dict[tuple[object, ...], list[int]] = {}
    for k, v in enumerate(seen.values):
        found.setdefault(tuple(getattr(v, key) for key in keys), []).append(k)
    for key, rows in found.items():
        yield key, np.array(rows)


# --- units ---


def _units(seen: Observation) -> Iterator[Option]:
    for keys in (("quantity",), ("kind", "quantity"), ("quantity", "case"), ("member", "quantity")):
        for key, rows in _groups(seen, *keys):
            if keys[0] == "member" and (key[0] is None or len(rows) < 2) or not seen.off[rows].any():
                continue
            yield from _unit(seen, rows, str(seen.values[rows[0]].quantity))
    forces = np.array([k for k, v in enumerate(seen.values) if v.quantity not in ("dx", "dy", "across", "rotation")])
    if len(forces):
        yield from _unit(seen, forces, "all forces and moments", FORCE)
    moves = np.array([k for k, v in enumerate(seen.values) if v.quantity in ("dx", "dy", "across")])
    if len(moves):
        yield from _unit(seen, moves, "all displacements", LENGTH)
    yield from _systems(seen)


def _systems(seen: Observation) -> Iterator[Option]:
    """One unit of length, or one of force and one of length, taken for others throughout."""
    power = np.array([POWERS.get(v.quantity, (1, 0)) for v in seen.values])
    force, length = (_log_ratio(seen, power, column) for column in (0, 1))
    if length is None:
        return
    forces = {1.0: "", **_near(np.exp(force), FORCE)} if force is not None else {1.0: ""}
    for f, force_words in forces.items():
        for g, length_words in _near(np.exp(length), LENGTH).items():
            factor = f ** power[:, 0] * g ** power[:, 1]
            words = "; ".join(w for w in (force_words, length_words) if w)
            every = np.arange(len(seen.value))
            yield _replaced(seen, every, seen.value * factor, "units", (), f"all values stand in other units: {words}",
                            UNIT, seen.half * factor)  # fmt: skip


def _log_ratio(seen: Observation, power: Ints, column: int) -> float | None:
    """Logarithm of what one unit of force (column 0) or length (1) must be multiplied by, from the larger values; None
    where the claim does not tell."""
    size = np.abs(seen.said)
    logs: dict[tuple[int, int], float] = {}
    for f, g in ((1, 0), (1, 1), (0, 1)):
        rows = np.flatnonzero((power == (f, g)).all(axis=1))
        rows = rows[(size[rows] > 0.01 * size[rows].max(initial=0.0)) & (seen.value[rows] != 0)]
        if len(rows) >= 2:
            logs[f, g] = float(np.median(np.log(np.abs(seen.said[rows] / seen.value[rows]))))
    if column == 0:
        return logs.get((1, 0), logs[1, 1] - logs[0, 1] if (1, 1) in logs and (0, 1) in logs else None)
    return logs.get((0, 1), logs[1, 1] - logs[1, 0] if (1, 1) in logs and (1, 0) in logs else None)


def _unit(seen: Observation, rows: Ints, what: str, table: dict[str, float] | None = None) -> Iterator[Option]:
    """Unit ratios near the one that the values show."""
    size = np.abs(seen.said[rows])
    large = rows[(size > 0.01 * size.max()) & (seen.value[rows] != 0)]
    # One value alone is no column.
    if len(large) < min(2, len(seen.value)):
        return
    ratio = float(np.median(seen.said[large] / seen.value[large]))
    where = _places(seen, rows)
    for factor, words in _near(ratio, table or _ratios(what)).items():
        says = f"{what} stands in another unit: {words}"
        yield _replaced(seen, rows, seen.value[rows] * factor, "units", where if len(where) < 2 else (), says,
                        UNIT, seen.half[rows] * factor)  # fmt: skip


def _near(ratio: float, table: dict[str, float]) -> dict[float, str]:
    """Unit factors within a twentieth of the ratio, with what each may come from."""
    found: dict[float, str] = {}
    for words, size in table.items():
        one, other = words.split(" taken for ")
        for factor, text in ((size, words), (1 / size, f"{other} taken for {one}")):
            if abs(ratio / factor - 1) < 0.05:
                key = float(f"{factor:.9g}")
                found[key] = f"{found[key]}, or {text}" if key in found else text
    return found


def _ratios(quantity: str) -> dict[str, float]:
    if quantity == "rotation":
        return ANGLE
    if quantity in ("dx", "dy", "across"):
        return LENGTH
    return {**FORCE, **LENGTH, **MOMENT} if quantity == "moment" else FORCE


# --- signs ---


def _signs(seen: Observation) -> Iterator[Option]:
    for keys, cost in (
        (("kind", "quantity"), SIGN), (("quantity",), SIGN), (("kind",), SIGN + 0.1), (("case",), SIGN + 0.4),
        (("member", "quantity"), MEMBER_SIGN), (("member",), MEMBER_SIGN + 0.1),
        (("kind", "joint", "quantity"), MEMBER_SIGN + 0.2), (("kind", "joint"), MEMBER_SIGN + 0.1),
    ):  # fmt: skip
        for key, rows in _groups(seen, *keys):
            if keys[0] == "member" and key[0] is None:
                continue
            if "joint" in keys and seen.values[rows[0]].kind not in ("reaction", "displacement"):
                continue
            # A sign is no evidence where nothing large changes by it.
            if len(rows) < len(seen.values) and seen.off[rows].any():
                yield _replaced(
                    seen,
                    rows,
                    -seen.value[rows],
                    "signs",
                    _sign_where(seen, keys, rows),
                    _sign_words(seen, keys, rows),
                    cost,
                )


def _sign_where(seen: Observation, keys: tuple[str, ...], rows: Ints) -> tuple[str, ...]:
    return _places(seen, rows[:1]) if "member" in keys or "joint" in keys else ()


def _sign_words(seen: Observation, keys: tuple[str, ...], rows: Ints) -> str:
    v = seen.values[rows[0]]
    what = f"the {v.quantity}" if "quantity" in keys else "every value"
    of = {"end": "member ends", "reaction": "reactions", "displacement": "displacements", "span": "values along members",
          "extreme": "extremes"}[v.kind]  # fmt: skip
    if "member" in keys or "joint" in keys:
        return f"{what} of {_label(seen, v)} has the other sign"
    if keys == ("case",):
        return f"every value of {v.case} has the other sign"
    return f"{what} of {of} has the other sign" if "kind" in keys else f"{what} has the other sign throughout"


# --- rows ---


def _row_table(seen: Observation) -> dict[tuple[object, ...], dict[str, int]]:
    """Rows of the paste: (case, kind, member, joint, at) to the values by quantity."""
    table: dict[tuple[object, ...], dict[str, int]] = {}
    for k, v in enumerate(seen.values):
        if v.kind == "extreme":
            continue
        table.setdefault((v.case, v.kind, v.member, v.joint, v.at), {})[v.quantity] = k
    return table


def _rows(seen: Observation) -> Iterator[Option]:
    """Two rows swapped, a block of rows shifted by one, two columns swapped, a row that belongs to another."""
    bad = set(_bad(seen).tolist())
    table = _row_table(seen)
    wrong = [key for key, row in table.items() if bad & set(row.values())]
    yield from _columns_swapped(seen)
    if not 2 <= len(wrong) <= FEW_ROWS:
        if len(wrong) == 1:
            yield from _lone_row(seen, table, wrong[0])
        return
    for a, b in combinations(wrong, 2):
        if a[1] == b[1] and table[a].keys() == table[b].keys():
            yield _swapped(seen, table, a, b)
    members = {key[2] for key in wrong}
    for one, two in combinations(sorted(str(m) for m in members if m is not None), 2):
        option = _members_swapped(seen, table, one, two)
        if option is not None:
            yield option
    yield from _shifted(seen, table, wrong)
    if len(members) == 1 and None not in members:
        rows = np.array([k for key in wrong for k in table[key].values()])
        where = _places(seen, rows[:1])
        says = f"only the values of {where[0]} stand against all the others"
        if _outnumbered(seen, rows):
            yield _replaced(seen, rows, seen.said[rows], "transcription", where, says, LONE_ROW)


def _outnumbered(seen: Observation, rows: Ints) -> bool:
    """Whether there are as many other values: against none, or few, these stand for what they are."""
    return 2 * len(rows) <= len(seen.values)


def _swapped(
    seen: Observation, table: dict[tuple[object, ...], dict[str, int]], a: tuple[object, ...], b: tuple[object, ...]
) -> Option:
    one, two = np.array([table[a][q] for q in table[a]]), np.array([table[b][q] for q in table[a]])
    rows = np.concatenate([one, two])
    new = np.concatenate([seen.value[two], seen.value[one]])
    says = f"the rows of {_row_words(seen, int(one[0]))} and {_row_words(seen, int(two[0]))} were swapped"
    return _replaced(
        seen, rows, new, "transcription", _places(seen, rows), says, SWAP, np.concatenate([seen.half[two], seen.half[one]])
    )


def _members_swapped(seen: Observation, table: dict[tuple[object, ...], dict[str, int]], a: str, b: str) -> Option | None:
    """All rows of two members exchanged, in their order."""
    of = {m: [k for key in table if key[2] == m for k in table[key].values()] for m in (a, b)}
    same = [seen.values[k].quantity for k in of[a]] == [seen.values[k].quantity for k in of[b]]
    if not same:
        return None
    one, two = np.array(of[a]), np.array(of[b])
    rows, new = np.concatenate([one, two]), np.concatenate([seen.value[two], seen.value[one]])
    says = f"the values of {_label(seen, seen.values[one[0]])} and {_label(seen, seen.values[two[0]])} were swapped"
    return _replaced(seen, rows, new, "transcription", _places(seen, rows), says, SWAP + 0.1,
                     np.concatenate([seen.half[two], seen.half[one]]))  # fmt: skip


def _row_words(seen: Observation, k: int) -> str:
    v = seen.values[k]
    if v.kind == "end":
        return f"{_label(seen, v)} at {v.joint}"
    return f"{_label(seen, v)} at {v.at:.4g}" if v.kind == "span" and v.at is not None else _label(seen, v)


def _shifted(
    seen: Observation, table: dict[tuple[object, ...], dict[str, int]], wrong: list[tuple[object, ...]]
) -> Iterator[Option]:
    """The rows that disagree, read one row up or down and round."""
    for kind in {key[1] for key in wrong}:
        block = [key for key in wrong if key[1] == kind]
        if len(block) < 3 or len({tuple(table[key]) for key in block}) > 1:
            continue
        index = np.array([list(table[key].values()) for key in block])
        for by in (1, -1):
            new = np.roll(seen.value[index], by, axis=0)
            half = np.roll(seen.half[index], by, axis=0)
            says = f"{len(block)} rows slipped by one"
            yield _replaced(seen, index.ravel(), new.ravel(), "transcription", (), says, SWAP + 0.2, half.ravel())


def _columns_swapped(seen: Observation) -> Iterator[Option]:
    """Two columns of a table exchanged."""
    table = _row_table(seen)
    for kind in {key[1] for key in table}:
        rows = [row for key, row in table.items() if key[1] == kind]
        for one, two in combinations(sorted({q for row in rows for q in row}), 2):
            if "moment" in (one, two) or "rotation" in (one, two):
                continue
            both = [(row[one], row[two]) for row in rows if one in row and two in row]
            if len(both) < 2:
                continue
            a, b = np.array(both).T
            new = np.concatenate([seen.value[b], seen.value[a]])
            half = np.concatenate([seen.half[b], seen.half[a]])
            says = f"columns {one} and {two} were swapped"
            yield _replaced(seen, np.concatenate([a, b]), new, "transcription", (), says, SWAP, half)


def _lone_row(
    seen: Observation, table: dict[tuple[object, ...], dict[str, int]], key: tuple[object, ...]
) -> Iterator[Option]:
    """The one row that disagrees: another's row in its place, or against everything else."""
    own = table[key]
    rows = np.array(list(own.values()))
    if len(rows) < 2:
        return
    for other, row in table.items():
        if other == key or other[1] != key[1] or row.keys() != own.keys():
            continue
        theirs = np.array([row[q] for q in own])
        if np.all(np.abs(seen.value[rows] - seen.value[theirs]) <= seen.meets[theirs]):
            says = f"the row of {_row_words(seen, int(rows[0]))} holds the values of {_row_words(seen, int(theirs[0]))}"
            yield _replaced(seen, rows, seen.said[rows], "transcription", _places(seen, rows), says, SWAP)
    if not _outnumbered(seen, rows):
        return
    says = f"only the row of {_row_words(seen, int(rows[0]))} stands against all the others"
    yield _replaced(seen, rows, seen.said[rows], "transcription", _places(seen, rows), says, LONE_ROW)


# --- single values ---


def _values(seen: Observation) -> Iterator[Option]:
    """A single value with digits transposed, a decimal slipped, or its sign lost."""
    bad = _bad(seen)
    if not 1 <= len(bad) <= FEW_VALUES:
        return
    for k in bad.tolist():
        v, row = seen.values[k], np.array([k])
        where, what = _places(seen, row), f"{v.quantity} of {_row_words(seen, k)}"
        for new in _transposed(v, float(seen.value[k])):
            yield _replaced(
                seen, row, np.array([new]), "transcription", where, f"digits of the {what} were transposed", DIGITS
            )
        for power in (-3, -2, -1, 1, 2, 3):
            factor = 10.0**power
            says = f"the decimal point of the {what} slipped by {abs(power)}"
            yield _replaced(
                seen, row, seen.value[row] * factor, "transcription", where, says, SLIP, seen.half[row] * factor
            )
        yield _replaced(seen, row, -seen.value[row], "signs", where, f"the {what} has the other sign", ONE_SIGN)
    if len(bad) == 1 and _outnumbered(seen, bad):
        k = int(bad[0])
        says = f"only the {seen.values[k].quantity} of {_row_words(seen, k)} stands against all the others"
        yield _replaced(seen, bad, seen.said[bad], "transcription", _places(seen, bad), says, LONE)
    for a, b in combinations(bad.tolist(), 2):
        rows = np.array([a, b])
        says = f"the values of {_row_words(seen, a)} and {_row_words(seen, b)} were swapped"
        yield _replaced(seen, rows, seen.value[[b, a]], "transcription", _places(seen, rows), says, SWAP, seen.half[[b, a]])


def _transposed(v: ClaimedValue, value: float) -> Iterator[float]:
    """The value with each pair of neighbouring digits exchanged, at the printed precision."""
    half = v.half_digit if v.half_digit > 0 else abs(value) * 5e-7
    if half <= 0 or not math.isfinite(value):
        return
    unit = 2 * half
    digits = list(str(round(abs(value) / unit)))
    for n in range(len(digits) - 1):
        if digits[n] != digits[n + 1]:
            swapped = [*digits[:n], digits[n + 1], digits[n], *digits[n + 2 :]]
            yield math.copysign(int("".join(swapped)) * unit, value)
