"""Values along members: each member by itself, simply supported, under its loads and its own end actions.

The library is asked once more, member by member: a beam on a pin and a roller, divided where values are asked for, with
the loads of the case and the end moments and end force that the library itself gave for the frame. Its supports do not
move, so the straight line between the displaced joints, which the library gave too, is where its deflection starts.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import ClassVar

import numpy as np

from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import FREE, HELD, Analysis, Floats, Frame, Ints, Joint, Material, Member, Section, Support
from crosscheck.opinions.library.model import Unfit
from crosscheck.opinions.library.results import Solved, along, solve_once

SPAN_LIMIT = 60
"""Members up to which they are solved one by one; above, values are given where loads divide the members anyway."""


@dataclass(frozen=True, slots=True)
class LibrarySpans:
    """Values along members (answer.Spans) of one frame's solved cases."""

    sampled: ClassVar[bool] = True
    frame: Frame
    tables: Mapping[str, LoadTable]
    solved: Mapping[str, Solved]

    def along(self, name: str, member: Ints, x: Floats, side: Ints) -> Floats:
        """(n, 4); NaN where two places, or a place and a load, are too near for the library to be asked."""
        whole = self.solved[name]
        out = along(self.frame, whole, member, x, side)
        if len(self.frame.members) > SPAN_LIMIT:
            return out
        for m in np.unique(member).tolist():
            asked = member == m
            try:
                out[asked] = self._member(self.tables[name], whole, m, x[asked], side[asked])
            except Unfit:
                continue
        return out

    def turning_points(self, name: str) -> tuple[Ints, Floats]:
        """None of its own: it is asked at places alone."""
        return np.empty(0, dtype=np.int64), np.empty(0)

    def _member(self, table: LoadTable, whole: Solved, m: int, x: Floats, side: Ints) -> Floats:
        beam, loads = alone(self.frame, table, whole.ends[m], m)
        nought = np.zeros(len(x), dtype=np.int64)
        values = along(beam, solve_once(beam, loads, (nought, x)), nought, x, side)
        t = self.frame.member_table
        dx, dy, _ = whole.joints[t.ends[m]].T
        start, end = dy * t.cos[m] - dx * t.sin[m]
        values[:, 3] += start + (end - start) * x / t.length[m]
        return values


def alone(frame: Frame, table: LoadTable, ends: Floats, m: int) -> tuple[Frame, LoadTable]:
    """Member m on a pin and a roller with its loads, its end moments and the force at its far end. ends: (2, 3)."""
    t = frame.member_table
    member = next(name for k, name in enumerate(frame.members) if k == m)
    length, source = float(t.length[m]), frame.members[member]
    # Statics alone settles its forces, so its area has no effect but on how well conditioned it is.
    section = Section(source.section, I=float(t.I[m]), A=1e3 * float(t.I[m]) / length**2)
    beam = replace(
        frame, sections={source.section: section}, combinations={}, analysis=Analysis(axial="elastic"),
        materials={source.material: Material(source.material, float(t.E[m]))}, states={}, state="", ties={},
        joints={"from": Joint("from", 0.0, 0.0), "to": Joint("to", length, 0.0)},
        members={member: Member(member, "from", "to", source.section, source.material)},
        supports={"from": Support("from", HELD, HELD, FREE), "to": Support("to", FREE, HELD, FREE)},
    )  # fmt: skip
    return beam, _own_loads(table, ends, m)


def _own_loads(table: LoadTable, ends: Floats, m: int) -> LoadTable:
    point, line = table.point_member == m, table.line_member == m
    return replace(
        table,
        joint=np.array([[0.0, 0.0, ends[0, 2]], [ends[1, 0], 0.0, ends[1, 2]]]),
        point_member=np.zeros(int(point.sum()), dtype=np.int64), point_at=table.point_at[point],
        point_along=table.point_along[point], point_across=table.point_across[point],
        point_couple=table.point_couple[point],
        line_member=np.zeros(int(line.sum()), dtype=np.int64), line_start=table.line_start[line],
        line_end=table.line_end[line], line_along=table.line_along[line], line_across=table.line_across[line],
    )  # fmt: skip
