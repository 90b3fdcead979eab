"""The independent sways: how the joints can move when every joint keeps its rotation, found from geometry.

Elastic members let every joint move freely, and each free translation is a sway of its own. Axially rigid members tie
the translations of their joints together. They are taken one after another, as bars are added to a pin-jointed
structure: a bar that ties a translation not tied before joins the *skeleton*, the others are redundant. Joints stated to
move together along a direction are such bars between them, bars without a place of their own. What is left untied are
the sways (the classical degrees of freedom of sway). The skeleton is statically and kinematically determinate, so that
one factorisation of it gives three things: the shape of each sway, the movements that imposed lengths make, and the
axial forces that balance the joints.

Translations are along each joint's own axes: those of its support, global where it has none.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

import numpy as np
from scipy import sparse
from scipy.sparse.linalg import splu

from crosscheck.frame.loads import direction_cosines
from crosscheck.frame.model import HELD, Bools, Floats, Frame, Ints

ROUNDING = 1e-14
"""Coefficients of unit direction vectors below this are rounding."""
TIED = 1e-8
"""A bar whose hold on the translations not yet tied is below this adds nothing: it is redundant."""
PIVOT = 0.3
"""A bar may tie a translation that it holds at least this well against the one it holds best."""


@dataclass(frozen=True)
class Sways:
    """stretch, turn: (m, 2j) sparse: elongation and clockwise chord rotation of each member per translation of a
    joint. together: (t, 2j) sparse: how much further than the first joint of a tie another of its joints moves.

    free, held: which of the 2j translations (2 * joint + axis); loose joints are in neither. ground: (2j,) stiffness
    of support springs. rigid: (k,) the axially rigid members; the bars are these and then the ties. basic: bars in the
    skeleton; tied: positions in `free` that they tie. shape: (f, q) sparse: the free translations in each unit sway.
    """

    cos: Floats
    sin: Floats
    stretch: Any
    turn: Any
    together: Any
    free: Ints
    held: Ints
    ground: Floats
    rigid: Ints
    basic: Ints
    tied: Ints
    shape: Any

    @cached_property
    def own(self) -> Ints:
        """(q,) position in `free` of the translation that is one in each unit sway and nothing in the others."""
        return np.setdiff1d(np.arange(len(self.free)), self.tied)

    @cached_property
    def bars(self) -> Any:
        """(b, 2j) sparse: elongation of each bar per translation of a joint."""
        return _bars(self.stretch, self.rigid, self.together)

    @cached_property
    def skeleton(self) -> Any:
        """Factorised (r, r) elongations of the skeleton's bars per tied translation; None without bars."""
        return splu(self._skeleton) if len(self.basic) else None

    @cached_property
    def _skeleton(self) -> Any:
        return sparse.csc_array(self.bars[self.basic][:, self.free[self.tied]])

    def tie(self, lengths: Floats) -> Floats:
        """(r, n) tied translations that give the skeleton's bars these elongations, no sway moving."""
        return _refined(self.skeleton, self._skeleton, lengths, "N")

    def balance(self, forces: Floats) -> Floats:
        """(r, n) tensions in the skeleton's bars that take these forces (f, n) on the free translations."""
        return _refined(self.skeleton, self._skeleton.T, forces[self.tied], "T")

    def tensions(self, forces: Floats) -> tuple[Floats, Floats]:
        """(k, n) axial forces of the rigid members and (t, n) forces of the ties that take these forces (f, n) on the free
        translations; redundant ones are left at zero."""
        every = np.zeros((self.bars.shape[0], forces.shape[1]))
        if len(self.basic):
            every[self.basic] = self.balance(forces)
        return every[: len(self.rigid)], every[len(self.rigid) :]

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
    together = _together(frame)
    stiffness = support.stiffness[:, :2].ravel()
    joined = np.zeros(joints, dtype=bool)
    joined[t.ends.ravel()] = True
    held = stiffness == HELD
    free = np.flatnonzero(~held & (np.repeat(joined, 2) | (stiffness > 0)))
    bars = np.flatnonzero(rigid)
    meeting = np.bincount(t.ends[bars].ravel(), minlength=joints)[free // 2]
    basic, tied, shape = _skeleton_of(sparse.csr_array(_bars(stretch, bars, together)[:, free]), meeting)
    return Sways(
        cos=support.cos, sin=support.sin, stretch=stretch, turn=turn, together=together, free=free,
        held=np.flatnonzero(held), ground=np.where(held, 0.0, stiffness), rigid=bars, basic=basic, tied=tied, shape=shape,
    )  # fmt: skip


def _bars(stretch: Any, rigid: Ints, together: Any) -> Any:
    return sparse.csr_array(sparse.vstack([stretch[rigid], together])) if together.shape[0] else stretch[rigid]


def _together(frame: Frame) -> Any:
    """(t, 2j) sparse, see Sways: a row for each joint of a tie after its first, in the joints' own axes."""
    support = frame.support_table
    rows: list[tuple[int, int, float]] = []
    number = 0
    for tie in frame.ties.values():
        dx, dy = direction_cosines(tie.direction)
        first, *others = (frame.joint_index[name] for name in tie.joints)
        for other in others:
            for joint, sign in ((first, -1.0), (other, 1.0)):
                c, s = float(support.cos[joint]), float(support.sin[joint])
                rows.append((number, 2 * joint, sign * (dx * c + dy * s)))
                rows.append((number, 2 * joint + 1, sign * (dy * c - dx * s)))
            number += 1
    row, column, value = np.array(rows, dtype=float).reshape(-1, 3).T
    where = (row.astype(np.int64), column.astype(np.int64))
    matrix = sparse.csr_array((np.where(np.abs(value) > ROUNDING, value, 0.0), where), shape=(number, 2 * len(support.cos)))
    matrix.eliminate_zeros()
    return matrix


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


@dataclass
class _Tying:
    """Bars taken one after another. `written`: each tied translation in others, at first in those loose at that time.

    pending: how many bars still to come hold each translation. A translation that no bar to come holds is not looked
    up again, so what it is written in is left as it stands until the end; the others are kept in loose ones (`users`:
    who is written in whom).
    """

    meeting: list[int]
    pending: list[int]
    written: dict[int, dict[int, float]] = field(default_factory=dict)
    users: dict[int, set[int]] = field(default_factory=dict)

    def take(self, bar: dict[int, float]) -> int | None:
        """The translation that a bar (coefficient by translation) ties, or None where it ties nothing new.

        Of those it holds about equally well it ties one of the joint where the fewest bars meet: the sways are then of
        the joints where many meet, and stay local (the ridge of a pitched bay follows its eaves, not the other way
        round). Among equals it ties the one that the fewest others are written in.
        """
        hold: dict[int, float] = {}
        for k, value in bar.items():
            self.pending[k] -= 1
            for v, share in self.written.get(k, {k: 1.0}).items():
                hold[v] = hold.get(v, 0.0) + value * share
        best = max((abs(c) for c in hold.values()), default=0.0)
        if best < TIED:
            return None
        able = [v for v, c in hold.items() if abs(c) >= PIVOT * best]
        new = min(able, key=lambda v: (self.meeting[v], len(self.users.get(v, ()))))
        own = hold.pop(new)
        self.written[new] = {v: -c / own for v, c in hold.items() if abs(c) > ROUNDING}
        self._note(new)
        for other in self.users.pop(new, set()):
            if self.pending[other] and new in self.written[other]:
                self._rewrite(other, new)
        return new

    def _note(self, tied: int) -> None:
        if self.pending[tied]:
            for v in self.written[tied]:
                self.users.setdefault(v, set()).add(tied)

    def _rewrite(self, other: int, new: int) -> None:
        """Write the translation `other` in what `new`, which it was written in, now depends on."""
        self.written[other] = _put_in(self.written[other], new, self.written[new])
        self._note(other)

    def in_loose_ones(self, order: list[int]) -> dict[int, dict[int, float]]:
        """Every tied translation in loose ones alone; `order` is that in which they were tied."""
        for tied in reversed(order):
            for v in [v for v in self.written[tied] if v in self.written]:
                self.written[tied] = _put_in(self.written[tied], v, self.written[v])
        return self.written


def _put_in(terms: dict[int, float], gone: int, instead: dict[int, float]) -> dict[int, float]:
    """A sum of translations with one of them written in others."""
    new = dict(terms)
    share = new.pop(gone)
    for v, c in instead.items():
        new[v] = new.get(v, 0.0) + share * c
    return {v: c for v, c in new.items() if abs(c) > ROUNDING}


def _skeleton_of(bars: Any, meeting: Ints) -> tuple[Ints, Ints, Any]:
    """Rows of (b, f) `bars` that tie something new, what translation each ties, and the (f, q) shape of the sways.

    meeting: (f,) how many bars meet at the joint of each translation.
    """
    bounds, columns, values = bars.indptr.tolist(), bars.indices.tolist(), bars.data.tolist()
    tying = _Tying(meeting.tolist(), np.bincount(bars.indices, minlength=bars.shape[1]).tolist())
    rows, tied = [], []
    for row in range(bars.shape[0]):
        span = slice(bounds[row], bounds[row + 1])
        new = tying.take(dict(zip(columns[span], values[span], strict=True)))
        if new is not None:
            rows.append(row)
            tied.append(new)
    loose = np.setdiff1d(np.arange(bars.shape[1]), tied)
    column = {v: k for k, v in enumerate(loose.tolist())}
    entries = [(v, k, 1.0) for v, k in column.items()]
    for t, terms in tying.in_loose_ones(tied).items():
        entries += [(t, column[v], c) for v, c in terms.items()]
    table = np.array(entries, dtype=float).reshape(-1, 3)
    where = (table[:, 0].astype(np.int64), table[:, 1].astype(np.int64))
    shape = sparse.csr_array((table[:, 2], where), shape=(bars.shape[1], len(loose)))
    return np.array(rows, dtype=np.int64), np.array(tied, dtype=np.int64), shape


def _refined(factor: Any, matrix: Any, right: Floats, side: str) -> Floats:
    """Solve by the factors and improve once by what is left over."""
    found = factor.solve(np.ascontiguousarray(right), trans=side)
    return np.asarray(found + factor.solve(np.ascontiguousarray(right - matrix @ found), trans=side))
