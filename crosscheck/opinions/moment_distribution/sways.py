"""The independent sways: how the joints can move when every joint keeps its rotation, found from geometry.

Elastic members let every joint move freely, and each free translation is a sway of its own. Axially rigid members tie
the translations of their joints together. They are taken one after another, as bars are added to a pin-jointed
structure: a bar that ties a translation not tied before joins the *skeleton*, the others are redundant. What is
left untied are the sways (the classical degrees of freedom of sway). The skeleton is statically and kinematically
determinate, so that one factorisation of it gives three things: the shape of each sway, the movements that imposed
lengths make, and the axial forces that balance the joints.

Translations are along each joint's own axes: those of its support, global where it has none.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from scipy import sparse
from scipy.sparse.linalg import splu

from crosscheck.frame.model import HELD, Bools, Floats, Frame, Ints

ROUNDING = 1e-12
"""Coefficients of unit direction vectors below this are rounding."""
TIED = 1e-8
"""A bar whose hold on the translations not yet tied is below this adds nothing: it is redundant."""
BLOCK = 256
"""Sways worked out at a time, to bound memory."""


@dataclass(frozen=True)
class Sways:
    """stretch, turn: (m, 2j) sparse: elongation and clockwise chord rotation of each member per translation of a
    joint.

    free, held: which of the 2j translations (2 * joint + axis); loose joints are in neither. ground: (2j,) stiffness
    of support springs. bars: the axially rigid members. basic: those in the skeleton; tied: positions in `free` that
    they tie. shape: (f, q) sparse: the free translations in each unit sway.
    """

    cos: Floats
    sin: Floats
    stretch: Any
    turn: Any
    free: Ints
    held: Ints
    ground: Floats
    bars: Ints
    basic: Ints
    tied: Ints

    @cached_property
    def skeleton(self) -> Any:
        """Factorised (r, r) elongations of the skeleton's bars per tied translation; None without bars."""
        return splu(self._skeleton) if len(self.basic) else None

    @cached_property
    def _skeleton(self) -> Any:
        return sparse.csc_array(self.stretch[self.basic][:, self.free[self.tied]])

    @cached_property
    def own(self) -> Ints:
        """(q,) position in `free` of the translation that is one in each unit sway and nothing in the others."""
        return np.setdiff1d(np.arange(len(self.free)), self.tied)

    @cached_property
    def shape(self) -> Any:
        count, loose = len(self.free), self.own
        if not len(self.basic):
            return sparse.eye_array(count, format="csr")
        followed = sparse.csc_array(self.stretch[self.basic][:, self.free[loose]])
        rows, columns, values = [loose], [np.arange(len(loose))], [np.ones(len(loose))]
        for start in range(0, len(loose), BLOCK):
            block = self.tie(-followed[:, start : start + BLOCK].toarray())
            r, c = np.nonzero(np.abs(block) > ROUNDING)
            rows.append(self.tied[r])
            columns.append(c + start)
            values.append(block[r, c])
        where = (np.concatenate(rows), np.concatenate(columns))
        return sparse.csr_array((np.concatenate(values), where), shape=(count, len(loose)))

    def tie(self, lengths: Floats) -> Floats:
        """(r, n) tied translations that give the skeleton's bars these elongations, no sway moving."""
        return _refined(self.skeleton, self._skeleton, lengths, "N")

    def balance(self, forces: Floats) -> Floats:
        """(r, n) tensions in the skeleton's bars that take these forces (f, n) on the free translations."""
        return _refined(self.skeleton, self._skeleton.T, forces[self.tied], "T")

    def own_axes(self, xy: Floats) -> Floats:
        """Global (j, 2, n) vectors as (2j, n) in the joints' own axes."""
        c, s = self.cos[:, None], self.sin[:, None]
        turned = np.stack([c * xy[:, 0] + s * xy[:, 1], c * xy[:, 1] - s * xy[:, 0]], axis=1)
        return turned.reshape(-1, xy.shape[2])

    def global_axes(self, own: Floats) -> Floats:
        """(2j, n) in the joints' own axes as global (j, 2, n)."""
        v = own.reshape(len(self.cos), 2, -1)
        c, s = self.cos[:, None], self.sin[:, None]
        return np.stack([c * v[:, 0] - s * v[:, 1], s * v[:, 0] + c * v[:, 1]], axis=1)


def sways(frame: Frame, rigid: Bools) -> Sways:
    """The frame's translations and sways; `rigid` (m,) says which members are axially rigid."""
    t, support = frame.member_table, frame.support_table
    joints = len(frame.joints)
    across = np.column_stack([-t.sin, t.cos]) / t.length[:, None]
    stretch = _per_translation(frame, np.column_stack([t.cos, t.sin]), joints)
    turn = _per_translation(frame, -across, joints)
    stiffness = support.stiffness[:, :2].ravel()
    joined = np.zeros(joints, dtype=bool)
    joined[t.ends.ravel()] = True
    held = stiffness == HELD
    free = np.flatnonzero(~held & (np.repeat(joined, 2) | (stiffness > 0)))
    bars = np.flatnonzero(rigid)
    chosen, tied = _skeleton_of(stretch[bars][:, free])
    return Sways(
        cos=support.cos, sin=support.sin, stretch=stretch, turn=turn, free=free, held=np.flatnonzero(held),
        ground=np.where(held, 0.0, stiffness), bars=bars, basic=bars[chosen], tied=tied,
    )  # fmt: skip


def _per_translation(frame: Frame, direction: Floats, joints: int) -> Any:
    """(m, 2j) sparse: direction . (movement of the `to` joint - that of the `from` joint), in the joints' own
    axes."""
    ends, support = frame.member_table.ends, frame.support_table
    rows, columns, values = [], [], []
    for end, sign in ((0, -1.0), (1, 1.0)):
        joint = ends[:, end]
        c, s = support.cos[joint], support.sin[joint]
        for axis, part in enumerate(
            (direction[:, 0] * c + direction[:, 1] * s, direction[:, 1] * c - direction[:, 0] * s)
        ):
            rows.append(np.arange(len(ends)))
            columns.append(2 * joint + axis)
            values.append(sign * part)
    where = (np.concatenate(rows), np.concatenate(columns))
    matrix = sparse.csr_array((np.concatenate(values), where), shape=(len(ends), 2 * joints))
    matrix.eliminate_zeros()
    return matrix


def _skeleton_of(bars: Any) -> tuple[Ints, Ints]:
    """Rows of (b, f) `bars` that tie something new, and the translation that each of them ties.

    Each translation already tied is kept written in those still loose, so that a new bar is seen at once to tie one
    of them or none. Of those that it holds about equally well it ties the one that the fewest others depend on.
    """
    written: dict[int, dict[int, float]] = {}
    users: dict[int, set[int]] = {}
    rows, tied = [], []
    bounds, columns, values = bars.indptr.tolist(), bars.indices.tolist(), bars.data.tolist()
    for row in range(bars.shape[0]):
        hold: dict[int, float] = {}
        for k in range(bounds[row], bounds[row + 1]):
            for v, share in written.get(columns[k], {columns[k]: 1.0}).items():
                hold[v] = hold.get(v, 0.0) + values[k] * share
        best = max((abs(c) for c in hold.values()), default=0.0)
        if best < TIED:
            continue
        new = min((v for v, c in hold.items() if abs(c) >= 0.3 * best), key=lambda v: len(users.get(v, ())))
        own = hold.pop(new)
        rows.append(row)
        tied.append(new)
        written[new] = {v: -c / own for v, c in hold.items() if abs(c) > ROUNDING}
        for v in written[new]:
            users.setdefault(v, set()).add(new)
        for other in users.pop(new, set()):
            _rewrite(other, new, written, users)
    return np.array(rows, dtype=np.int64), np.array(tied, dtype=np.int64)


def _rewrite(other: int, new: int, written: dict[int, dict[int, float]], users: dict[int, set[int]]) -> None:
    """Write the translation `other`, which depends on `new`, in what `new` now depends on."""
    terms = written[other]
    share = terms.pop(new)
    for v, c in written[new].items():
        value = terms.get(v, 0.0) + share * c
        if abs(value) > ROUNDING:
            terms[v] = value
            users[v].add(other)
        else:
            terms.pop(v, None)
            users[v].discard(other)


def _refined(factor: Any, matrix: Any, right: Floats, side: str) -> Floats:
    """Solve by the factors and improve once by what is left over."""
    found = factor.solve(np.ascontiguousarray(right), trans=side)
    return np.asarray(found + factor.solve(np.ascontiguousarray(right - matrix @ found), trans=side))
