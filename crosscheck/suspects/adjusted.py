"""Results that were adjusted after the analysis: values at the faces of rigid zones, support moments redistributed.

Redistribution takes a common share off the end moments at a joint; statics follows (shears, reactions, span moments),
compatibility does not. Values at the face stand where the rigid zone meets the flexible part of the member.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import replace
from functools import partial
from typing import TYPE_CHECKING

import numpy as np

from crosscheck.answer import CaseAnswer
from crosscheck.compare.claimed import ClaimedValue, ClosedClaim
from crosscheck.frame.loads import LoadTable, load_table
from crosscheck.frame.model import Floats, Frame, Ints
from crosscheck.opinions.slope_deflection.prepared import END, REACTION, SPAN, ForceSpans
from crosscheck.suspects.changes import Change, with_values
from crosscheck.suspects.observation import EXTREME, Observation
from crosscheck.suspects.suspect import Option, named

if TYPE_CHECKING:
    from crosscheck.suspects.sweep import Sweep, Weighed

FACE, REDISTRIBUTED = 0.4, 0.6
SHARES = (0.02, 0.6)
"""Shares of a moment that anyone would redistribute."""
COLUMNS = ("axial", "shear", "moment")


def adjusted(sweep: Sweep) -> Iterator[Weighed]:
    """Both kinds of adjustment, weighed."""
    yield from _at_faces(sweep)
    yield from _redistributed(sweep)


# --- values at the face ---


def _at_faces(sweep: Sweep) -> Iterator[Weighed]:
    """End values that stand at the faces: all three quantities, or the moment alone."""
    seen, frame = sweep.seen, sweep.frame
    t = frame.member_table
    p = seen.places
    rows = np.flatnonzero(p.kind == END)
    zoned = rows[t.zone[p.member[rows], p.end[rows]] > 0]
    for only in ("moment", "shear and moment"):
        mine = zoned if only != "moment" else zoned[p.column[zoned] == 2]
        if not len(mine):
            return
        said = seen.said.copy()
        for k, name in enumerate(seen.names):
            part = mine[seen.case[mine] == k]
            m, end = p.member[part], p.end[part]
            x = np.where(end == 0, t.zone[m, 0], t.length[m] - t.zone[m, 1])
            side = np.where(end == 0, -1, 1)
            values = sweep.answer.spans.along(name, m, x, side)[np.arange(len(part)), p.column[part]]
            # Shear and moment act on the member at its far end the other way round from what stands along it.
            said[part] = np.where((end == 1) & (p.column[part] > 0), -values, values)
        says = f"{only} at member ends stand at the faces of the rigid zones"
        change = Change(claim=partial(_moved_to_faces, frame=frame, quantities=tuple(only.split(" and "))))
        yield sweep.weigh(Option("idealisation", (), says, change, FACE), said)


def _moved_to_faces(closed: ClosedClaim, frame: Frame, quantities: tuple[str, ...]) -> ClosedClaim:
    """The claim with its end values said of the faces: values within the span."""
    return replace(closed, values=tuple(
        _at_face(v, frame) if v.kind == "end" and v.quantity in quantities else v for v in closed.values
    ))  # fmt: skip


def _at_face(v: ClaimedValue, frame: Frame) -> ClaimedValue:
    member = frame.members[str(v.member)]
    length = float(frame.member_table.length[frame.member_index[member.name]])
    start = v.joint == member.joint_from
    zone = member.rigid_from if start else member.rigid_to
    if not zone:
        return v
    return replace(v, kind="span", joint=None, at=zone if start else length - zone, value=v.value if start else -v.value)


# --- redistribution ---


def _redistributed(sweep: Sweep) -> Iterator[Weighed]:
    """A share taken off the moments at one joint; and one common share off those of every joint between spans."""
    seen, frame = sweep.seen, sweep.frame
    ends = frame.member_table.ends
    inner = [j for j in range(len(frame.joints)) if (ends == j).sum() >= 2]
    names = list(frame.joints)
    tables = {name: load_table(frame, name) for name in seen.names}
    effects = {j: _effect(sweep, j, tables) for j in inner}
    for j in inner:
        label = named(frame, "joint", names[j])
        yield from _share(sweep, effects[j], f"the moments at {label} were redistributed by", (label,))
    if len(inner) > 1:
        whole = sum(effects.values(), np.zeros(len(seen.said)))
        yield from _share(sweep, np.asarray(whole), "the moments at every inner joint were redistributed by", ())


def _effect(sweep: Sweep, joint: int, tables: Mapping[str, LoadTable]) -> Floats:
    """(n,) what taking all of the moments off at a joint adds to the values, joint displacements left alone."""
    seen, frame = sweep.seen, sweep.frame
    cases = {n: _taken_off(frame, sweep.answer.cases[n], joint) for n in seen.names}
    # In second order statics alone gives no values along the members: they are left as they are.
    spans = sweep.answer.spans if sweep.slow else ForceSpans(frame, tables, cases, sweep.answer.undetermined)
    rows = _touched(seen, joint)
    out = np.zeros(len(seen.said))
    out[rows] = seen.read(replace(sweep.answer, cases=cases, spans=spans), rows=rows)[rows] - seen.said[rows]
    return out


def _touched(seen: Observation, joint: int) -> Ints:
    """Values on the members at a joint, reactions at their ends, and whatever is an extreme."""
    p, ends = seen.places, seen.frame.member_table.ends
    around = (ends == joint).any(axis=1)
    at = np.zeros(len(seen.frame.joints), dtype=bool)
    at[ends[around]] = True
    on = around[p.member] & ((p.kind == END) | (p.kind == SPAN)) & (p.member >= 0)
    return np.flatnonzero(on | (at[p.joint] & (p.kind == REACTION) & (p.joint >= 0)) | (p.kind == EXTREME))


def _taken_off(frame: Frame, case: CaseAnswer, joint: int) -> CaseAnswer:
    t = frame.member_table
    less = np.where(t.ends == joint, -np.nan_to_num(case.ends[:, :, 2]), 0.0)
    ends, reactions = case.ends.copy(), case.reactions.copy()
    shear = -less.sum(axis=1) / t.length
    ends[:, :, 2] += less
    ends[:, 0, 1] += shear
    ends[:, 1, 1] -= shear
    pull = np.zeros_like(reactions)
    for end, sign in ((0, 1.0), (1, -1.0)):
        across = sign * shear
        np.add.at(pull, t.ends[:, end], np.column_stack([-across * t.sin, across * t.cos, less[:, end]]))
    # What a support does not hold has nothing to take up; the frame's own joints there are left out of balance.
    reactions += np.where(np.abs(case.reactions) > 0, pull, 0.0)
    return CaseAnswer(ends, case.joints, reactions)


def _share(sweep: Sweep, effect: Floats, says: str, where: tuple[str, ...]) -> Iterator[Weighed]:
    seen = sweep.seen
    w = 1 / seen.noise
    size = float((w * effect) @ (w * effect))
    if not size > 0:
        return
    share = float((w * effect) @ (w * seen.residual)) / size
    tidy = round(share, 2)
    share = tidy if abs(tidy - share) < 2e-3 else share
    if not SHARES[0] <= share <= SHARES[1]:
        return
    new = {v: float(a) for v, a in zip(seen.values, seen.value - share * effect, strict=True)}
    option = Option("idealisation", where, f"{says} {100 * share:.3g}%", Change(claim=partial(with_values, new=new)),
                    REDISTRIBUTED, fitted=1)  # fmt: skip
    yield sweep.weigh(option, seen.said + share * effect)
