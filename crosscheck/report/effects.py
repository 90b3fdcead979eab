"""Beside a verdict: how near the frame is to buckling, and how much of a difference the idealisation makes."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

from rich.console import Group, RenderableType
from rich.text import Text

from crosscheck.check import FAR
from crosscheck.frame.model import Frame
from crosscheck.idealisations import KeyValue, Variant
from crosscheck.report import words
from crosscheck.report.terminal import heading, table

USUAL = 10.0
"""Critical load factor below which first order is usually no longer taken: common for elastic analysis."""


def critical_line(frame: Frame, critical: Mapping[str, float]) -> str:
    """One sentence on the least critical load factor; "" where none was worked out."""
    if not critical:
        return ""
    case, least = min(critical.items(), key=lambda item: item[1])
    if math.isinf(least):
        return f"Critical load factor: {FAR:g} or more in every case."
    others = sorted((f, c) for c, f in critical.items() if c != case and f < USUAL)
    more = "".join(f", {c} {f:.3g}" for f, c in others[:3])
    line = f"Critical load factor: {case} {least:.3g}{more}"
    of_first_order = [factor for case, factor in critical.items() if frame.under(case).analysis.order == 1]
    least = min(of_first_order, default=math.inf)
    if least >= USUAL:
        return f"{line}."
    if least <= 1.0:
        return f"{line}: past its critical load; first-order results mean nothing there."
    return f"{line}: below {USUAL:g}, so second-order effects exceed what first order may leave out (order = 2 has them)."


def idealisations_table(frame: Frame, found: Sequence[Variant], rows: Sequence[KeyValue]) -> RenderableType:
    """Key values under every idealisation, with what each changes."""
    shown = [k for k, v in enumerate(found) if v.cases]
    columns = [("case", "left"), ("value", "left"), *[(found[k].title.replace(" ", "\n", 1), "right") for k in shown],
               ("largest change\nof its kind", "right")]  # fmt: skip
    cells = []
    for row in rows:
        unit = words.unit_of(frame, "moment" if row.quantity == "end moment" else row.quantity)
        values = [_cell(row, k) for k in shown]
        most = max((row.most[k] for k in shown if not math.isnan(row.most[k])), default=0.0)
        cells.append((row.case, f"{row.quantity}, {row.place}, {unit}", *values, f"{100 * most:.1f}%"))
    stated = f"As stated: {words.idealisation(frame)}; each other column changes one thing. By slope-deflection."
    missing = [Text(f"  {v.title}: {v.why_not}") for v in found if v.why_not]
    return Group(heading("Idealisations side by side"), Text(f"  {stated}"), table(columns, cells), *missing)


def _cell(row: KeyValue, k: int) -> str:
    value, stated = row.values[k], row.values[0]
    text = words.number(value, stated)
    if k == 0 or math.isnan(value) or stated == 0.0:
        return text
    return f"{text} ({100 * (value - stated) / stated + 0.0:+.1f}%)"
