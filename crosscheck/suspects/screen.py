"""Every change in one place weighed without solving again: effects of unit actions times how large the actions are.

The remaining misfit of a change that acts through k actions is |r|^2 - 2 x'Q'r + x'Q'Q x with Q the (weighted) effects:
products of size k once Q'Q and Q'r are at hand for each place. The least that any change in a place can leave over is
r'r - r'Q (Q'Q)^-1 Q'r, so places that cannot explain the difference fall out before anything is tried there.
"""

from __future__ import annotations

import copy
from collections.abc import Callable, Sequence
from functools import cached_property

import numpy as np

from crosscheck.answer import Answer
from crosscheck.frame.loads import case_factors
from crosscheck.frame.model import Floats, Ints, Load
from crosscheck.opinions.slope_deflection.prepared import DISPLACEMENT, END, REACTION, SPAN, Effects, Places, Prepared
from crosscheck.suspects.observation import EXTREME, Observation

MOST_ROWS = 4000
"""Values used to weigh changes; of a larger claim the worst and an even sample of the rest."""


SAMPLED = 400
"""Values that tell which of very many changes are worth weighing on all: the worst, and an even sample of the rest."""
NUDGE = 1e-4
"""Relative step for slopes of what is fitted."""


class Screen:
    """The linear values of an observation, weighted, with the effects of unit actions on them."""

    def __init__(self, seen: Observation, base: Prepared) -> None:
        self.seen, self.base, self.frame = seen, base, seen.frame
        self.rows, self.places, said, value = self._linear_rows()
        self.residual = value - said
        self._of_rows()

    def _of_rows(self) -> None:
        self.weight = 1 / self.seen.noise[self.rows]
        self.case = self.seen.case[self.rows]
        self.parts = [np.flatnonzero(self.case == k) for k in range(len(self.seen.names))]

    @cached_property
    def sample(self) -> Screen | None:
        """The same over a few of the values; None where there are not many more."""
        if len(self.rows) < 2 * SAMPLED:
            return None
        worst = np.argsort(-np.abs(self.residual) * self.weight)[: SAMPLED // 2]
        pick = np.union1d(worst, np.arange(0, len(self.rows), 2 * len(self.rows) // SAMPLED))
        few = copy.copy(self)
        few.__dict__.pop("factors", None)
        few.rows, few.places = self.rows[pick], self.places.part(pick)
        few.residual = self.residual[pick]
        few.effects = self.effects.part(pick)
        few._of_rows()
        return few

    def _linear_rows(self) -> tuple[Ints, Places, Floats, Floats]:
        seen = self.seen
        usable = seen.linear.copy()
        rows = np.flatnonzero(usable)
        if len(rows) > MOST_ROWS:
            off = np.abs(seen.residual[rows]) / seen.noise[rows]
            worst = rows[np.argsort(-off)[: MOST_ROWS // 2]]
            even = rows[:: max(1, 2 * len(rows) // MOST_ROWS)]
            rows = np.unique(np.concatenate([worst, even]))
        places, said, value = seen.part(rows), seen.said[rows], seen.value[rows]
        extra = [e for k in np.flatnonzero(seen.places.kind == EXTREME) if (e := self._fixed_place(int(k))) is not None]
        if not extra:
            return rows, places, said, value
        place = [np.concatenate([getattr(places, f), [x[f] for _, x, _, _ in extra]]) for f in Places.__dataclass_fields__]
        return (
            np.concatenate([rows, [k for k, _, _, _ in extra]]), Places(*place),
            np.concatenate([said, [s for _, _, s, _ in extra]]), np.concatenate([value, [v for _, _, _, v in extra]]),
        )  # fmt: skip

    def _fixed_place(self, k: int) -> tuple[int, dict[str, float], float, float] | None:
        """An extreme taken as the value where the model has it: how it changes to first order."""
        from crosscheck.compare.opinions import with_turning_points

        seen = self.seen
        v, sign = seen.values[k], 1.0
        if v.member is None or v.quantity not in ("axial", "shear", "moment"):
            return None
        name = seen.names[int(seen.case[k])]
        answer = self._answer
        member, x, side = with_turning_points(answer, name, seen.at)
        mine = np.flatnonzero(member == seen.places.member[k])
        along = answer.spans.along(name, member[mine], x[mine], side[mine])[:, seen.places.column[k]]
        if not np.isfinite(along).any():
            return None
        best = int(np.nanargmax(np.abs(along) if seen.extreme[k] == 2 else seen.extreme[k] * along))
        if seen.extreme[k] == 2 and along[best] < 0:
            sign = -1.0
        place = {
            "kind": SPAN, "column": seen.places.column[k], "member": seen.places.member[k], "end": -1, "joint": -1,
            "x": x[mine[best]], "side": side[mine[best]],
        }  # fmt: skip
        return k, place, sign * seen.said[k], sign * seen.value[k]

    @property
    def partial(self) -> bool:
        """Whether some values have no forecast."""
        return int(self.seen.linear[self.rows].sum()) < len(self.seen.value)

    @cached_property
    def _answer(self) -> Answer:
        return self.base.answer(self.seen.names)

    @cached_property
    def effects(self) -> Effects:
        return self.base.effects(self.places)

    @cached_property
    def stretches(self) -> Floats:
        return self.base.stretch_effects(self.places)

    @cached_property
    def total(self) -> float:
        return float(((self.weight * self.residual) ** 2).sum())

    def left(self, delta: Floats) -> Floats:
        """(k,) squared misfit, in units of noise, that changes of the values (n, k) leave over."""
        return np.asarray((self.weight[:, None] ** 2 * (self.residual[:, None] - delta) ** 2).sum(axis=0))

    # --- actions in blocks of three ---

    def _grams(self, effects: Floats) -> list[tuple[Floats, Floats, float]]:
        """By case: (b, 3, 3) Q'Q, (b, 3) Q'r and r'r of blocks of three columns."""
        out = []
        for part in self.parts:
            q = (effects[part] * self.weight[part, None]).reshape(len(part), -1, 3)
            r = self.weight[part] * self.residual[part]
            out.append((np.einsum("nbi,nbj->bij", q, q, optimize=True), np.einsum("nbi,n->bi", q, r), float(r @ r)))
        return out

    @cached_property
    def member_grams(self) -> list[tuple[Floats, Floats, float]]:
        return self._grams(self.effects.member)

    @cached_property
    def support_grams(self) -> list[tuple[Floats, Floats, float]]:
        return self._grams(self.effects.reaction)

    @staticmethod
    def left_by(grams: list[tuple[Floats, Floats, float]], block: Ints, actions: list[Floats]) -> Floats:
        """(k,) squared misfit left by actions (k, 3) a case in blocks (k,); infinite where an action is NaN."""
        out = np.zeros(len(block))
        for (square, cross, whole), x in zip(grams, actions, strict=True):
            got = whole - 2 * (x * cross[block]).sum(axis=1) + np.einsum("ki,kij,kj->k", x, square[block], x)
            out += got
        return np.where(np.isfinite(out), np.maximum(out, 0.0), np.inf)

    @staticmethod
    def least(grams: list[tuple[Floats, Floats, float]]) -> Floats:
        """(b,) the least squared misfit that any action in a block can leave over."""
        out = 0.0
        for square, cross, whole in grams:
            out = out + whole - np.einsum("bi,bij,bj->b", cross, np.linalg.pinv(square, rcond=1e-10, hermitian=True), cross)
        return np.asarray(np.maximum(out, 0.0))

    def delta_of(self, effects: Floats, block: int, actions: Sequence[Floats]) -> Floats:
        """(n,) change of the values by actions (3,) a case in one block."""
        out = np.zeros(len(self.residual))
        for part, x in zip(self.parts, actions, strict=True):
            out[part] = effects[part, 3 * block : 3 * block + 3] @ x
        return out

    def fitted(self, delta_at: Callable[[float], Floats], p: float) -> float:
        """The positive number near p whose change of the values fits best, rounded where a round one does as well.

        Fitted once in units of noise and once of the printed rounding alone; the second holds if it meets every value.
        """
        p = self._refined(delta_at, p, self.weight)
        sharp = self._refined(delta_at, p, 1 / self.seen.meets[self.rows])
        p = sharp if self.meets(delta_at(sharp)) else p
        best = self.left(delta_at(p)[:, None])[0]
        for digits in (2, 3, 4):
            tidy = float(f"{p:.{digits}g}")
            delta = delta_at(tidy)
            if self.meets(delta) or self.left(delta[:, None])[0] <= 1.1 * best:
                return tidy
        return p

    def meets(self, delta: Floats) -> bool:
        """Whether a change of the values leaves every one within its printed rounding."""
        return bool((np.abs(self.residual - delta) <= self.seen.meets[self.rows]).all())

    def _refined(self, delta_at: Callable[[float], Floats], p: float, weight: Floats) -> float:
        """Gauss-Newton steps on the number's logarithm."""
        best, least = p, np.inf
        for _ in range(8):
            delta = delta_at(p)
            left = float(((weight * (self.residual - delta)) ** 2).sum())
            if not left < least:
                return best
            best, least = p, left
            slope = weight * (delta_at(p * (1 + NUDGE)) - delta) / NUDGE
            size = float(slope @ slope)
            if not size > 0 or not np.isfinite(size):
                return best
            step = float(np.clip(slope @ (weight * (self.residual - delta)) / size, -0.5, 0.5))
            p = p * float(np.exp(step))
            if abs(step) < 1e-9:
                return p
        return best

    # --- loads ---

    def load_deltas(self, loads: Sequence[Load]) -> Floats:
        """(n, k) effect of each load with factor one."""
        return self.base.load_effects(loads, self.places, self.effects)

    @cached_property
    def factors(self) -> dict[str, Floats]:
        """By load case: (n,) the factor with which it enters each value."""
        out = {}
        by_name = [case_factors(self.frame, name) for name in self.seen.names]
        for case in self.frame.cases:
            out[case] = np.array([f.get(case, 0.0) for f in by_name])[self.case]
        return out

    # --- whole places ---

    def place_left(self, joints: Sequence[int], members: Sequence[int]) -> float:
        """The least squared misfit that anything at these joints and members can leave over, their own values let go."""
        p = self.places
        drop = np.isin(p.member, members) & ((p.kind == END) | (p.kind == SPAN))
        ends = self.frame.member_table.ends[list(members)].ravel() if len(members) else np.zeros(0, dtype=int)
        touched = np.union1d(np.asarray(joints, dtype=int), ends)
        drop |= (p.kind == REACTION) & np.isin(p.joint, touched)
        drop |= (p.kind == DISPLACEMENT) & np.isin(p.joint, joints)
        columns = (3 * touched[:, None] + np.arange(3)).ravel().astype(int)
        left = 0.0
        for part in self.parts:
            keep = part[~drop[part]]
            q = np.hstack([self.effects.force[np.ix_(keep, columns)], self.stretches[np.ix_(keep, list(members))]])
            q *= self.weight[keep, None]
            r = self.weight[keep] * self.residual[keep]
            if len(keep):
                size = np.abs(q).max(axis=0, initial=0.0)
                q = q[:, size > 0] / size[size > 0]
                if q.shape[1]:
                    r = r - q @ np.linalg.lstsq(q, r, rcond=1e-10)[0]
            left += float(r @ r)
        return left
