"""What further result would tell two suspects apart: the value in which their two frames differ most."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from crosscheck.answer import CaseAnswer
from crosscheck.compare.opinions import END_QUANTITIES, JOINT_QUANTITIES, REACTION_QUANTITIES
from crosscheck.compare.tolerance import case_scales
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import Frame

if TYPE_CHECKING:
    from crosscheck.suspects.sweep import Sweep, Weighed

TELLS = 0.02
"""Share of its scale by which a value must differ to tell two suspects apart."""


def further_result(sweep: Sweep, one: Weighed, other: Weighed) -> str:
    """ "; the moment of B-C at B (12.3 against 4.1) would tell", or what is known where nothing would."""
    name = sweep.seen.names[0]
    frame = sweep.frame
    a, b = (_results(sweep, w, name) for w in (one, other))
    if a is None or b is None:
        return ""
    scales = case_scales(frame, load_table(frame, name), [a, b])
    best = (TELLS, "")
    for of, quantities in (("ends", END_QUANTITIES), ("reactions", REACTION_QUANTITIES), ("joints", JOINT_QUANTITIES)):
        x, y = getattr(a, of), getattr(b, of)
        if x.shape != y.shape:
            return "; whether the member is there would tell"
        size = np.array([scales.of(q) for q in quantities])
        apart = np.abs(x - y) / np.where(size > 0, size, np.inf)
        if not apart.size:
            continue
        index = np.unravel_index(int(np.nanargmax(apart)), apart.shape)
        if apart[index] > best[0]:
            where = _place(frame, of, tuple(int(i) for i in index))
            best = (float(apart[index]), f"{quantities[index[-1]]} {where} ({x[index]:.4g} against {y[index]:.4g})")
    return f"; {best[1]} would tell" if best[1] else "; no result of this case would tell"


def _place(frame: Frame, of: str, index: tuple[int, ...]) -> str:
    if of == "ends":
        member = list(frame.members.values())[index[0]]
        return f"of {member.name} at {(member.joint_from, member.joint_to)[index[1]]}"
    joint = list(frame.joints)[index[0]]
    return f"of the reaction at {joint}" if of == "reactions" else f"of joint {joint}"


def _results(sweep: Sweep, w: Weighed, name: str) -> CaseAnswer | None:
    if id(w) not in sweep.results:
        sweep.results[id(w)] = _solved(sweep, w, name)
    return sweep.results[id(w)]


def _solved(sweep: Sweep, w: Weighed, name: str) -> CaseAnswer | None:
    change = w.option.change
    if w.option.answer is not None:
        return w.option.answer.cases[name]
    if change.frame is None:
        return sweep.answer.cases[name]
    source = sweep.answer_to(change.frame(sweep.frame), (name,), change.loads_only)
    return source.cases[name] if source is not None else None
