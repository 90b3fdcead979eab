"""What an opinion says at each place that a claim speaks of, as arrays, and how far a claimed value may lie from it."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from crosscheck.answer import ACROSS, AXIAL, MOMENT, SHEAR, Answer, CaseAnswer
from crosscheck.compare.tolerance import Scales, case_scales
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import Floats, Frame, Ints

COLUMN = {"axial": AXIAL, "shear": SHEAR, "moment": MOMENT, "across": ACROSS, "fx": 0, "fy": 1, "dx": 0, "dy": 1}
"""Column of a quantity in its array; a joint's moment and rotation stand third as well."""
LEAST_SHARE = 0.1


def joint_column(quantity: str) -> int:
    """Column of a joint's quantity in reactions and displacements."""
    return 2 if quantity in ("moment", "rotation") else COLUMN[quantity]


@dataclass(slots=True)
class Reference:
    """One opinion's answer to one case, with scales; values along the members are worked out once, when asked for."""

    frame: Frame
    answer: Answer
    case: str
    scales: Scales = field(init=False)
    result: CaseAnswer = field(init=False)
    _tenths: Floats | None = None
    _extremes: Floats | None = None

    def __post_init__(self) -> None:
        self.result = self.answer.cases[self.case]
        self.scales = case_scales(self.frame, load_table(self.frame, self.case), [self.result])

    def along(self, member: Ints, x: Floats, side: int) -> Floats:
        """(n, 4) values at distances x of members, just before or after them."""
        if not len(member):
            return np.zeros((0, 4))
        return self.answer.spans.along(self.case, member, x, np.full(len(member), side, dtype=np.int64))

    def extremes(self) -> Floats:
        """(m, 2, 4) largest and smallest value along each member."""
        if self._extremes is None:
            table = self.frame.member_table
            count = len(table.length)
            member = np.repeat(np.arange(count), 41)
            x = (table.length[:, None] * np.linspace(0.0, 1.0, 41)).ravel()
            turning, places = self.answer.spans.turning_points(self.case)
            member, x = np.concatenate([member, turning]), np.concatenate([x, places])
            out = np.empty((count, 2, 4))
            out[:, 0], out[:, 1] = -np.inf, np.inf
            for side in (-1, 1):
                values = self.along(member, x, side)
                np.fmax.at(out[:, 0], member, values)
                np.fmin.at(out[:, 1], member, values)
            self._extremes = np.where(np.isfinite(out), out, np.nan)
        return self._extremes

    def member_scale(self, quantity: str) -> Floats:
        """(m,) the scale of a claim by member: its own largest value, but no less than a tenth of the case's."""
        if self._tenths is None:
            table = self.frame.member_table
            count = len(table.length)
            member = np.repeat(np.arange(count), 11)
            x = (table.length[:, None] * np.linspace(0.0, 1.0, 11)).ravel()
            values = np.abs(np.nan_to_num(self.along(member, x, 1))).reshape(count, 11, 4).max(axis=1)
            ends = np.abs(np.nan_to_num(self.result.ends)).max(axis=1)
            values[:, :3] = np.maximum(values[:, :3], ends)
            self._tenths = values
        return np.maximum(self._tenths[:, COLUMN[quantity]], LEAST_SHARE * self.scales.of(quantity))

    def joint_scale(self, quantity: str, kind: str) -> Floats:
        """(j,) the scale of a claim by joint."""
        values = self.result.reactions if kind == "reaction" else self.result.joints
        own = np.abs(np.nan_to_num(values))
        # A joint's own largest value of that quantity's kind: its two forces, or its two displacements, share one.
        size = own[:, 2] if joint_column(quantity) == 2 else own[:, :2].max(axis=1)
        return np.maximum(size, LEAST_SHARE * self.scales.of(quantity))
