"""Envelopes in a check record: the greatest and least end actions and reactions, each with what governs it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from crosscheck.check import Opinions
from crosscheck.compare.envelopes import NOBODY, EnvelopeAnswer, Extremes, envelope
from crosscheck.compare.tolerance import Scales
from crosscheck.frame.model import Frame
from crosscheck.report import words
from crosscheck.report.content import Block, Grid, Says, Section

MOST_ROWS = 2000
"""Places in one table; the JSON document has them all."""


def envelope_sections(opinions: Opinions, names: Sequence[str]) -> list[Section]:
    """One section an envelope, of the first opinion that speaks for it."""
    found = [next((e for a in opinions.answers.values() if (e := envelope(opinions.frame, a, n))), None) for n in names]
    return [Section(f"Results: envelope {e.name}", tuple(_blocks(opinions, e))) for e in found if e]


def _blocks(opinions: Opinions, e: EnvelopeAnswer) -> list[Block]:
    frame, scales = opinions.frame, [opinions.judgements[n].scales for n in e.names]
    ends, reactions = _quiet(e.ends, scales, words.ENDS), _quiet(e.reactions, scales, words.REACTIONS)
    numbered = "; ".join(f"{k + 1} {name}" for k, name in enumerate(e.names))
    says = [f"Over {words.counted(len(e.names), 'case')}. Governing, by number: {numbered}."]
    if e.lacking:
        says.append(f"Not among them, because nobody speaks for it: {words.some(list(e.lacking))}.")
    says.append("An envelope is no state of balance: its values come from different cases.")
    places = [(m.name, j) for m in frame.members.values() for j in (m.joint_from, m.joint_to)][:MOST_ROWS]
    blocks: list[Block] = [Says(tuple(says))]
    for c, quantity in enumerate(("axial", "shear", "moment")):
        rows = tuple((*where, *_cells(ends, (k // 2, k % 2, c))) for k, where in enumerate(places))
        caption = f"Greatest and least {quantity} at member ends, signs as in other results."
        blocks.append(Grid(caption, (("member", "left"), ("at", "left"), *_heads(frame, quantity)), rows))
    supports = [(j, frame.joint_index[j]) for j in frame.supports]
    rows = tuple((j, q, *_cells(reactions, (k, c))) for j, k in supports for c, q in enumerate(("fx", "fy", "moment")))
    unit = f"{words.unit_of(frame, 'fx')}, {words.unit_of(frame, 'moment')}"
    heads = (("support", "left"), ("of", "left"), *_heads(frame, "", unit))
    return [*blocks, Grid("Greatest and least reactions on the frame.", heads, rows)]


def _heads(frame: Frame, quantity: str, unit: str = "") -> tuple[tuple[str, str], ...]:
    unit = unit or words.unit_of(frame, quantity)
    return (f"greatest, {unit}", "right"), ("governs", "right"), (f"least, {unit}", "right"), ("governs", "right")


def _quiet(of: Extremes, scales: Sequence[Scales], quantities: Sequence[str]) -> Extremes:
    greatest, least = (words.quiet(v, scales, quantities) for v in (of.greatest, of.least))
    return replace(of, greatest=greatest, least=least)


def _cells(of: Extremes, index: tuple[int, ...]) -> tuple[str, ...]:
    sizes = [np.abs(v[..., index[-1]]) for v in (of.greatest, of.least)]
    scale = max(float(s[np.isfinite(s)].max(initial=0.0)) for s in sizes)
    both = ((of.greatest[index], of.greatest_by[index]), (of.least[index], of.least_by[index]))
    return tuple(c for v, by in both for c in (words.number(float(v), scale), str(int(by) + 1) if by != NOBODY else ""))
