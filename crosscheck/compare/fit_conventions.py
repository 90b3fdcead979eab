"""The conventions of sign and direction in which results are printed, and what an opinion's values would read in each.

Every convention is one rule for all members of a table. `place` is the paste's own start (0) or end (1) of a member,
`end` the
frame's. With T the tension, V the shear along local +y and M the clockwise moment on the member's end:
    axial    tension: T             action along the paste's x: -T at its start, T at its end
    shear    action along y: r V    internal: r V at the start, -r V at the end     (r = 1, or -1 where the paste's
    runs back)
    moment   clockwise: M           internal, sagging: M at the start, -M at the end
and each of them reversed. Values along a member: T, V, r M (sagging) and r times the displacement across, or reversed.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from crosscheck.compare.fit_stations import at_jumps
from crosscheck.compare.fit_values import COLUMN, EnvelopeReference, Reference, joint_column
from crosscheck.frame.model import Bools, Floats, Frame, Ints

RULES = ("frame", "rows", "reversed", "rightward", "leftward", "downward")
"""How members run of which the paste does not say: as in the frame, the first row first, all the other way, towards
growing x
(upright ones upward), towards falling x, and towards growing x with upright ones downward."""
RULE_WORDS = {
    "frame": "", "rows": "members run from the row that stands first", "reversed": "members run the other way",
    "rightward": "members run to the right and upward", "leftward": "members run to the left and downward",
    "downward": "members run to the right and downward",
}  # fmt: skip
_FORMS = {
    ("end", "axial"): ("internal", "action"), ("end", "shear"): ("action", "internal"),
    ("end", "moment"): ("action", "internal"),
}  # fmt: skip
WORDS = {
    ("end", "axial", "internal"): ("tension positive", "compression positive"),
    ("end", "axial", "action"): ("end force along the member", "end force against the member"),
    ("end", "shear", "action"): ("end force along local y", "end force against local y"),
    ("end", "shear", "internal"): ("internal shear, up on the left", "internal shear, down on the left"),
    ("end", "moment", "action"): ("clockwise on the member", "anticlockwise on the member"),
    ("end", "moment", "internal"): ("internal, sagging positive", "internal, hogging positive"),
    ("along", "axial", "internal"): ("tension positive", "compression positive"),
    ("along", "shear", "internal"): ("internal shear, up on the left", "internal shear, down on the left"),
    ("along", "moment", "internal"): ("internal, sagging positive", "internal, hogging positive"),
    ("along", "across", "internal"): ("along local y", "against local y"),
    ("reaction", "fx", ""): ("on the frame, right", "reversed"),
    ("reaction", "fy", ""): ("on the frame, up", "reversed"),
    ("reaction", "moment", ""): ("on the frame, clockwise", "reversed"),
    ("displacement", "dx", ""): ("right", "left"),
    ("displacement", "dy", ""): ("up", "down"),
    ("displacement", "rotation", ""): ("clockwise", "anticlockwise"),
}  # fmt: skip


@dataclass(frozen=True, slots=True)
class Convention:
    """One way to print a quantity. sign: 1 or -1. `words` for reports."""

    form: str
    sign: int
    rule: str
    words: str


@dataclass(slots=True)
class Batch:
    """All values of one kind and quantity of a claim, as arrays (n,).

    member, joint: indices, -1 for none. end, place: 0, 1 or -1 (not said). run: +1, -1 or 0. at: distance from the paste's
    start in the frame's length, or a share of the member's length where at_share; at_half: half its last printed digit.
    extreme: 1 max, -1 min, 0 size (of values of one place: none, or size where unsigned).
    cut: where inside its member a part of it ends; origin: where a part begins (NaN for whole members); both from the
      frame's `from` joint. governs: index of the case that an envelope's value is said to come from, -1 for none.
    unsigned: sizes only. said: the sign is stated in words. case: index into `cases`. value,
      half: as printed. factor: to the frame's units, NaN where no unit is stated.
    """

    kind: str
    quantity: str
    cases: tuple[str, ...]
    case: Ints
    member: Ints
    joint: Ints
    end: Ints
    place: Ints
    run: Ints
    at: Floats
    at_half: Floats
    at_share: Bools
    extreme: Ints
    cut: Floats
    origin: Floats
    governs: Ints
    unsigned: Bools
    said: bool
    value: Floats
    half: Floats
    factor: Floats
    entry: Ints


def conventions(batch: Batch) -> list[Convention]:
    """Every convention the batch may be printed in, the plainest first."""
    family = "along" if batch.kind in ("span", "extreme") else batch.kind
    forms = _FORMS.get((batch.kind, batch.quantity), ("internal",) if family == "along" else ("",))
    if batch.said:
        return [Convention(forms[0], 1, "frame", WORDS[family, batch.quantity, forms[0]][0])]
    out = []
    for form in forms:
        for rule in _rules(batch, form):
            for k, sign in enumerate((1, -1)):
                words = WORDS.get((family, batch.quantity, form), ("as printed", "reversed"))[k]
                out.append(Convention(form, sign, rule, ", ".join(w for w in (words, RULE_WORDS[rule]) if w)))
    return out


def _rules(batch: Batch, form: str) -> tuple[str, ...]:
    """Rules of direction that can matter: none where the paste says which way its members run."""
    if batch.kind in ("reaction", "displacement") or not np.any(batch.run == 0):
        return ("frame",)
    plain = {("moment", "action"), ("axial", "internal")}
    known = batch.kind == "end" and np.all(batch.end[batch.run == 0] >= 0)
    if known and (batch.quantity, form) in plain:
        return ("frame",)
    if batch.kind == "extreme" and batch.quantity in ("axial", "shear"):
        return ("frame",)
    has_rows = batch.kind == "end" and np.any((batch.place >= 0) & (batch.end >= 0) & (batch.run == 0))
    return RULES if has_rows else tuple(r for r in RULES if r != "rows")


def member_runs(frame: Frame, rule: str) -> Ints:
    """(m,) +1 where a member of the frame runs as the rule says, else -1."""
    cos, sin = frame.member_table.cos, frame.member_table.sin
    upright = np.abs(cos) < 1e-9
    if rule in ("rightward", "leftward"):
        runs = np.where(upright, np.sign(sin), np.sign(cos))
        return (runs if rule == "rightward" else -runs).astype(np.int64)
    if rule == "downward":
        return np.where(upright, -np.sign(sin), np.sign(cos)).astype(np.int64)
    return np.full(len(cos), -1 if rule == "reversed" else 1, dtype=np.int64)


def placed(batch: Batch, frame: Frame, rule: str) -> tuple[Ints, Ints, Ints]:
    """(end, place, r) of member values under a rule of direction; end and place mean nothing for values along a member."""
    ruled = member_runs(frame, rule)[batch.member]
    r = np.where(batch.run != 0, batch.run, ruled)
    if rule == "rows":
        both = (batch.run == 0) & (batch.end >= 0) & (batch.place >= 0)
        r = np.where(both, np.where(batch.end == batch.place, 1, -1), r)
    swap = r < 0
    end = np.where(batch.end >= 0, batch.end, np.where(swap, 1 - batch.place, batch.place))
    place = np.where(swap, 1 - end, end)
    return end, place, r


def distance(batch: Batch, frame: Frame, r: Ints) -> Floats:
    """Distances from the frame's `from` joint, in the frame's length."""
    length = frame.member_table.length[batch.member]
    unit = np.where(batch.at_share, length, 1.0)
    at = batch.at * unit
    whole = np.where(r < 0, length - at, at)
    x = np.where(np.isnan(batch.origin), whole, batch.origin + r * at)
    return at_jumps(frame, batch.member, x, batch.at_half * unit)


def expected(batch: Batch, references: list[Reference | EnvelopeReference], convention: Convention) -> Floats:
    """(n, k) what the opinion's value reads in this convention, in the frame's units; k = 2 where a value along a
    member may
    stand on either side of a jump, else 1."""
    out = np.full((len(batch.value), 2 if batch.kind == "span" else 1), np.nan)
    for k, reference in enumerate(references):
        mine = np.flatnonzero(batch.case == k)
        if len(mine):
            some = _part(batch, mine)
            out[mine] = _over_cases(some.extreme, [_expected_in(some, r, convention) for r in reference.parts])
    return out


def of_governing(batch: Batch, references: list[Reference | EnvelopeReference], convention: Convention) -> Floats:
    """(n, k) as expected(), of the case alone that an envelope's value is said to come from; NaN where none is named."""
    out = np.full((len(batch.value), 2 if batch.kind == "span" else 1), np.nan)
    for k, reference in enumerate(references):
        for part in reference.parts:
            mine = np.flatnonzero((batch.case == k) & (batch.governs == reference.frame.names.index(part.case)))
            if len(mine):
                out[mine] = _expected_in(_part(batch, mine), part, convention)
    return out


def _over_cases(which: Ints, said: list[Floats]) -> Floats:
    """(n, k) of what several cases say, as printed: the greatest (1), the least (-1) or the largest in size."""
    if len(said) == 1:
        return said[0]
    greatest, least = np.fmax.reduce(said), np.fmin.reduce(said)
    largest = np.where(np.abs(greatest) >= np.abs(least), greatest, least)
    out: Floats = np.where(which[:, None] > 0, greatest, np.where(which[:, None] < 0, least, largest))
    return out


_PLAIN_FIELDS = ("kind", "quantity", "cases", "said")


def _part(batch: Batch, mine: Ints) -> Batch:
    arrays = {n: getattr(batch, n)[mine] for n in Batch.__dataclass_fields__ if n not in _PLAIN_FIELDS}
    return Batch(kind=batch.kind, quantity=batch.quantity, cases=batch.cases, said=batch.said, **arrays)


def _expected_in(batch: Batch, reference: Reference, convention: Convention) -> Floats:
    s = convention.sign
    if batch.kind in ("reaction", "displacement"):
        values = reference.result.reactions if batch.kind == "reaction" else reference.result.joints
        out: Floats = s * values[batch.joint, joint_column(batch.quantity)][:, None]
        return out
    end, place, r = placed(batch, reference.frame, convention.rule)
    column = COLUMN.get(batch.quantity, 0)
    turned = r if batch.quantity in ("moment", "across") else np.ones_like(r)
    if batch.kind == "span":
        x = distance(batch, reference.frame, r)
        sides = [reference.along(batch.member, x, side)[:, column] for side in (-1, 1)]
        return np.asarray(s * turned[:, None] * np.column_stack(sides), dtype=float)
    if batch.kind == "extreme":
        most = reference.extremes_of(batch.quantity, batch.member, batch.joint)
        return _extreme(batch.extreme, most, s * turned)[:, None]
    acting = _acting(batch, reference, end, column)
    if batch.quantity == "shear":
        acting = acting * r
    flips = convention.form == ("action" if batch.quantity == "axial" else "internal")
    if flips:
        at_start = -1 if batch.quantity == "axial" else 1
        acting = acting * np.where(place == 0, at_start, -at_start)
    return np.asarray(s * acting, dtype=float)[:, None]


def _acting(batch: Batch, reference: Reference, end: Ints, column: int) -> Floats:
    """(n,) end actions; of a part that ends inside its member those on its face there."""
    acting: Floats = reference.result.ends[batch.member, end, column]
    inside = np.flatnonzero(~np.isnan(batch.cut))
    for side in (0, 1):
        mine = inside[end[inside] == side]
        if len(mine):
            values = reference.along(batch.member[mine], batch.cut[mine], 1 if side == 0 else -1)[:, column]
            acting[mine] = values if side == 0 or column == COLUMN["axial"] else -values
    return acting


def _extreme(which: Ints, most: Floats, sign: Ints) -> Floats:
    """Largest (1), smallest (-1) or, without its sign, largest magnitude (0) of values that are turned by `sign`."""
    low, high = most[:, 0] * sign, most[:, 1] * sign
    largest, smallest = np.fmax(high, low), np.fmin(high, low)
    size = np.where(np.abs(largest) >= np.abs(smallest), largest, smallest)
    out: Floats = np.where(which > 0, largest, np.where(which < 0, smallest, np.abs(size)))
    return out
