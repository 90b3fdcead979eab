"""Words and numbers for people: units, places, tension faces, cautions. Shared by every renderer; none computes."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from crosscheck.compare.differences import Difference, Place
from crosscheck.compare.tolerance import Scales
from crosscheck.frame.model import Floats, Frame

CAUTIONS = (
    "This supports and does not replace a licensed engineer's judgement; local codes govern.",
    "Agreement between analyses does not make a design safe: it is agreement with this stated model, and an error that "
    "the frame file shares with the other analysis remains.",
    "Not covered: capacity, lateral buckling, connections, foundations, out-of-plane effects, dynamics, plasticity.",
)
NOISE = 1e-9
"""Of the largest value of its kind: below this a value is rounding, shown as zero and without a tension face."""
ENDS, JOINTS, REACTIONS = ("axial", "shear", "moment"), ("dx", "dy", "rotation"), ("fx", "fy", "moment")
"""Quantities in the order of an answer's columns."""


def unit_of(frame: Frame, quantity: str) -> str:
    """The frame's unit for a quantity by its contract name."""
    force, length = frame.units.force, frame.units.length
    if quantity in ("axial", "shear", "fx", "fy"):
        return force
    if quantity == "moment":
        return f"{force} {length}"
    return "rad" if quantity == "rotation" else length


def quiet(values: Floats, scales: Sequence[Scales], quantities: Sequence[str]) -> Floats:
    """Values (..., quantities) with rounding noise, by the largest scale of the cases they come from, as plain zero.

    Where no member end has a moment, the largest of them is noise too."""
    noise = NOISE * np.array([max(s.of(q) for s in scales) for q in quantities])
    out: Floats = np.where(np.abs(values) <= noise, 0.0, values)
    return out


def number(value: float | None, scale: float | None = None) -> str:
    """A number for a table: four or more significant digits of `scale` (the largest it stands beside), no exponent for
    ordinary sizes; a dash for nothing."""
    if value is None or math.isnan(value):
        return "-"
    size = max(abs(value), abs(scale or 0.0))
    if abs(value) <= NOISE * size:
        return "0"
    if not 1e-4 <= size < 1e7:
        return f"{value:.4g}"
    decimals = max(0, 3 - math.floor(math.log10(size)))
    return f"{value:.{decimals}f}"


def short(value: float) -> str:
    """A difference or an allowance: three significant digits."""
    return "no number" if math.isinf(value) or math.isnan(value) else f"{value:.3g}"


def place(p: Place) -> str:
    """Where a value stands, in words, and whether it is the greatest or least there."""
    return _where(p) + {"max": ", greatest", "min": ", least"}.get(p.extreme, "")


def _where(p: Place) -> str:
    if p.member and p.joint:
        return f"{p.member} at {p.joint}"
    if p.member and p.at is not None:
        return f"{p.member} at x = {p.at:.4g}"
    if p.member:
        return f"{p.member}, along it"
    if p.joint:
        return f"joint {p.joint}" if p.of == "joints" else f"support {p.joint}" if p.of == "reactions" else str(p.joint)
    return "whole frame"


def both_say(d: Difference) -> str:
    """What each side says at a place, and a note to it."""
    return "; ".join([*(f"{name} {said(d, name)}" for name in d.values), *([d.note] if d.note else [])])


def said(d: Difference, name: str) -> str:
    """What one side says at a difference's place; rounding noise beside the others is zero."""
    value = d.values.get(name)
    largest = max((abs(v) for v in d.values.values() if v is not None and not math.isnan(v)), default=0.0)
    return "0" if value is not None and abs(value) <= NOISE * max(largest, d.allowed) else number(value)


def tension_face(frame: Frame, member: str, span_moment: float | None, scale: float = 0.0) -> str:
    """Which face of the member a moment stretches: "bottom", "top", "left", "right"; none for noise of `scale`.

    span_moment: sagging positive, that is tension on the local -y face.
    """
    if span_moment is None or math.isnan(span_moment) or abs(span_moment) <= NOISE * scale:
        return ""
    t, m = frame.member_table, frame.member_index[member]
    sign = 1.0 if span_moment > 0 else -1.0
    x, y = sign * float(t.sin[m]), -sign * float(t.cos[m])
    if abs(y) >= abs(x) - 1e-9:
        return "top" if y > 0 else "bottom"
    return "right" if x > 0 else "left"


def end_face(frame: Frame, member: str, joint: str, moment: float | None, scale: float = 0.0) -> str:
    """The tension face at a member's end, from its clockwise end moment."""
    if moment is None:
        return ""
    sagging = moment if frame.members[member].joint_from == joint else -moment
    return tension_face(frame, member, sagging, scale)


def face_of(frame: Frame, p: Place, value: float | None) -> str:
    """The tension face for a moment of a member, "" for anything else."""
    if p.quantity != "moment" or p.member is None:
        return ""
    if p.joint is not None:
        return end_face(frame, p.member, p.joint, value)
    return tension_face(frame, p.member, value)


def idealisation(frame: Frame) -> str:
    """One line: what the analysis neglects."""
    a = frame.analysis
    axial = "axially elastic" if a.axial == "elastic" else "axially rigid (no member changes its length)"
    return f"{axial}, shear {a.shear}, {'first' if a.order == 1 else 'second'} order"


def by_combination(frame: Frame) -> list[tuple[str, str]]:
    """Which combinations have an order of theory, a state of stiffness or a lean of their own."""
    groups: dict[str, dict[str, None]] = {}
    for one in frame.combinations.values():
        if one.order and one.order != frame.analysis.order:
            groups.setdefault("first order" if one.order == 1 else "second order", {})[one.stated or one.name] = None
        if one.stiffness:
            groups.setdefault(f"stiffness {one.stiffness}", {})[one.stated or one.name] = None
        if one.lean:
            groups.setdefault(f"lean of {100 * one.lean:g}%", {})[one.stated or one.name] = None
    said = "; ".join(f"{what}: {some(list(names))}" for what, names in groups.items())
    return [("of combinations", said)] if said else []


def opinions_value(d: Difference) -> float | None:
    """The opinions' value beside a claim's: the first that gives one."""
    return next((v for o, v in d.values.items() if o != "claim" and v is not None), None)


def some(names: Sequence[str], most: int = 4) -> str:
    """Names in a sentence, the first few of many."""
    names = list(names)
    return ", ".join(names) if len(names) <= most else f"{', '.join(names[:most])} and {len(names) - most} more"


def counted(n: int, one: str, many: str = "") -> str:
    return f"{n:,} {one if n == 1 else many or one + 's'}"


_DIRECTING = {
    *range(0x200B, 0x2010), *range(0x202A, 0x202F), *range(0x2060, 0x2070), 0x061C, 0xFEFF, 0x00AD,
}  # fmt: skip
"""Characters that show nothing and turn or hide what stands beside them."""


def visible(text: str, most: int = 0) -> str:
    """Text of a file or a paste as it may stand in a report: what would turn or hide its neighbours is named instead,
    and what is longer than `most` (0: any length) is cut in the middle, its ends being what tells names apart."""
    if not text.isprintable() or any(ord(c) in _DIRECTING for c in text):
        text = "".join(_shown(c) for c in text)
    if most and len(text) > most:
        head = (most - 1) // 2
        text = f"{text[:head]}…{text[len(text) - (most - 1 - head):]}"
    return text


def _shown(c: str) -> str:
    code = ord(c)
    if c in "\n\t":
        return c
    hidden = code < 32 or 127 <= code < 160 or code in _DIRECTING or 0xD800 <= code < 0xE000
    return f"[U+{code:04X}]" if hidden else c
