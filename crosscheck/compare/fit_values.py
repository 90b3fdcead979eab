"""What an opinion says at each place that a claim speaks of, as arrays, and how far a claimed value may lie from it.

The same measure as crosscheck.compare.claim uses on single values, over arrays: fitting asks for it many times.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from crosscheck.answer import ACROSS, AXIAL, MOMENT, SHEAR, Answer, CaseAnswer
from crosscheck.compare.opinions import extremes
from crosscheck.compare.tolerance import LEAST_SHARE, Scales, case_scales
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import Floats, Frame, Ints
from crosscheck.frame.stations import stations

COLUMN = {"axial": AXIAL, "shear": SHEAR, "moment": MOMENT, "across": ACROSS, "fx": 0, "fy": 1, "dx": 0, "dy": 1}
"""Column of a quantity in its array; a joint's moment and rotation stand third as well."""


def joint_column(quantity: str) -> int:
    """Column of a joint's quantity in reactions and displacements."""
    return 2 if quantity in ("moment", "rotation") else COLUMN[quantity]


class Reference:
    """One opinion's answer to one case, with scales; values along the members are worked out once, when asked for."""

    def __init__(self, frame: Frame, answers: Mapping[str, Answer], case: str) -> None:
        self.frame, self.case = frame, case
        given = [a for a in answers.values() if case in a.cases]
        self.answer = next((a for a in given if not a.spans.sampled), given[0])
        self.result: CaseAnswer = self.answer.cases[case]
        self.scales: Scales = case_scales(frame, load_table(frame, case), [a.cases[case] for a in given])

    @property
    def parts(self) -> tuple[Reference, ...]:
        """References of single cases: itself alone."""
        return (self,)

    def along(self, member: Ints, x: Floats, side: int) -> Floats:
        """(n, 4) values at distances x of members, just before or after them; NaN off the member."""
        if not len(member):
            return np.zeros((0, 4))
        length = self.frame.member_table.length[member]
        off = (x < -1e-3 * length) | (x > 1.001 * length) | ~np.isfinite(x)
        inside = np.clip(np.where(off, 0.0, x), 0.0, length)
        values = self.answer.spans.along(self.case, member, inside, np.full(len(member), side, dtype=np.int64))
        return np.where(off[:, None], np.nan, values)

    @cached_property
    def extremes(self) -> Floats:
        """(m, 2, 4) smallest and largest value along each member."""
        return extremes(self.answer, self.case, stations(self.frame))

    def extremes_of(self, quantity: str, member: Ints, joint: Ints) -> Floats:
        """(n, 2) smallest and largest value along a member, at a joint, or (both -1) of all there are."""
        at_joints = quantity in ("dx", "dy", "rotation", "fx", "fy")
        table = self.result.reactions if quantity in ("fx", "fy", "moment") else self.result.joints
        values = table[:, joint_column(quantity)] if at_joints or quantity == "moment" else np.zeros(0)
        along = values[:, None].repeat(2, axis=1) if at_joints else self.extremes[:, :, COLUMN[quantity]]
        whole = np.array([np.nanmin(along[:, 0], initial=np.inf), np.nanmax(along[:, 1], initial=-np.inf)])
        out = np.tile(np.where(np.isfinite(whole), whole, np.nan), (len(member), 1))
        if not at_joints:
            out[member >= 0] = along[member[member >= 0]]
        if len(values):
            out[joint >= 0] = values[joint[joint >= 0], None]
        return out

    @cached_property
    def _largest(self) -> Floats:
        """(m, 4) largest magnitude along each member and at its ends."""
        along: Floats = np.abs(np.nan_to_num(self.extremes)).max(axis=1, initial=0.0)
        along[:, :3] = np.maximum(along[:, :3], np.abs(np.nan_to_num(self.result.ends)).max(axis=1, initial=0.0))
        return along

    def member_scale(self, quantity: str) -> Floats:
        """(m,) the scale of a claim by member: its own largest value, but no less than a tenth of the case's."""
        return np.maximum(self._largest[:, COLUMN[quantity]], LEAST_SHARE * self.scales.of(quantity))

    def joint_scale(self, quantity: str, kind: str) -> Floats:
        """(j,) the scale of a claim by joint: its own largest force (displacement), or its moment (rotation)."""
        own = np.abs(np.nan_to_num(self.result.reactions if kind == "reaction" else self.result.joints))
        size = own[:, 2] if joint_column(quantity) == 2 else own[:, :2].max(axis=1, initial=0.0)
        return np.maximum(size, LEAST_SHARE * self.scales.of(quantity))


class EnvelopeReference:
    """References of the cases and combinations of an envelope; its scales are the greatest of theirs."""

    def __init__(self, parts: tuple[Reference, ...]) -> None:
        self.parts, self.frame = parts, parts[0].frame

    @property
    def scales(self) -> EnvelopeScales:
        return EnvelopeScales(tuple(p.scales for p in self.parts))

    def extremes_of(self, quantity: str, member: Ints, joint: Ints) -> Floats:
        """(n, 2) as a Reference's, over all parts."""
        found = np.stack([p.extremes_of(quantity, member, joint) for p in self.parts])
        out: Floats = np.stack([np.fmin.reduce(found[:, :, 0]), np.fmax.reduce(found[:, :, 1])], axis=1)
        return out

    def member_scale(self, quantity: str) -> Floats:
        """(m,) the greatest of its parts' scales."""
        out: Floats = np.max([p.member_scale(quantity) for p in self.parts], axis=0)
        return out

    def joint_scale(self, quantity: str, kind: str) -> Floats:
        """(j,) the greatest of its parts' scales."""
        out: Floats = np.max([p.joint_scale(quantity, kind) for p in self.parts], axis=0)
        return out


@dataclass(frozen=True, slots=True)
class EnvelopeScales:
    """The greatest of several cases' scales."""

    parts: tuple[Scales, ...]

    def of(self, quantity: str) -> float:
        return max(p.of(quantity) for p in self.parts)
