"""Completing a partial set of results by statics, as far as statics goes, and keeping account of the rounding.

Members first (moments give shears), then joint by joint (shears give axial forces and reactions), then whatever
several joints settle together. Each completed value is a known combination of given ones, so that the rounding of
the given ones is carried through exactly, as an interval (R. E. Moore, Interval Analysis, 1966): the half width of
`combination @ given` is `|combination| @ half`.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import sparse

from crosscheck.audit.equilibrium import FREE_SUPPORT, HINGE, Equations, Sparse, blocks_of_rows, couple_values
from crosscheck.frame.model import Bools, Floats, Ints

TOGETHER = 1200
"""Most values that are sought together in one dense solve; beyond it they count as not judged."""
BY_RULE, TOGETHER_BLOCK = -3, -2
RANK = 1e-9
"""A direction whose share is below this is null: the scaled equations have entries of the order of one."""


@dataclass(frozen=True, slots=True)
class Completed:
    """All values that statics gives.

    given: (v,) as claimed, zero where nothing is said; half: (v,) rounding of each.
    combination, constant: value = combination @ given + constant, (v, v) and (v,).
    value: (v,) NaN where statics does not reach; completed: (v,) True where not given but found;
    by: (v,) block whose equations gave a completed value, -1 where none did, BY_RULE where it is nil by definition (a
      direction that is not supported, a hinge at the joint) and TOGETHER_BLOCK where several blocks gave it at once.
    """

    given: Floats
    half: Floats
    combination: Sparse
    constant: Floats
    value: Floats
    completed: Bools
    by: Ints

    @property
    def half_width(self) -> Floats:
        """(v,) how far rounding can have moved each value; zero where the value is missing."""
        return np.asarray(abs(self.combination) @ self.half)

    @property
    def missing(self) -> Bools:
        return np.isnan(self.value)


def complete(system: Equations, values: Floats, half: Floats, length: float) -> Completed:
    """Fill in what is missing (NaN) of `values` (v,); half (v,) their rounding; `length` scales couples to forces."""
    return _Completer(system, values, half, length).run()


class _Completer:
    def __init__(self, system: Equations, values: Floats, half: Floats, length: float) -> None:
        self.system = system
        self.known = ~np.isnan(values)
        self.given = np.where(self.known, values, 0.0)
        self.half = np.where(self.known & ~np.isnan(half), half, 0.0)
        self.by = np.full(len(values), -1, dtype=np.int64)
        self.constant = np.zeros(len(values))
        self.combination: Sparse = sparse.diags_array(self.known.astype(float)).tocsr()
        # Couples are measured in forces at a length of the frame, so that ranks do not hang on units.
        column_scale = np.where(couple_values(system.members, system.joints), length, 1.0)
        self.row_scale = np.where(system.couples, 1 / length, 1.0)
        self.column_scale = column_scale
        self.scaled: Sparse = (
            sparse.diags_array(self.row_scale) @ system.matrix @ sparse.diags_array(column_scale)
        ).tocsr()
        self.rows_of = blocks_of_rows(system)
        self.block_of_value = self._blocks_of_values()

    def _blocks_of_values(self) -> Sparse:
        """(v, blocks) pattern: which blocks speak of a value."""
        s = self.system
        blocks = sparse.coo_array(
            (np.ones(len(s.block)), (np.arange(len(s.block)), s.block)), shape=(len(s.block), len(self.rows_of))
        )
        return (abs(s.matrix).T @ blocks).tocsr()

    def run(self) -> Completed:
        self._by_rule()
        while self._members_then_joints():
            pass
        self._together()
        value = np.asarray(self.combination @ self.given) + self.constant
        value[~self.known] = np.nan
        return Completed(
            self.given, self.half, self.combination, self.constant, value, self.known & (self.by != -1), self.by
        )

    def _by_rule(self) -> None:
        """Rows of a hinge or a free direction that speak of one value only: it is what the row says, come what may."""
        rule = np.array([kind in (HINGE, FREE_SUPPORT) for kind in self.system.kind])
        counts = np.diff(self.scaled.indptr)
        single = np.flatnonzero(rule & (counts == 1))
        value = self.scaled.indices[self.scaled.indptr[single]]
        fresh = ~self.known[value]
        rows, value = single[fresh], value[fresh]
        entry = self.scaled.data[self.scaled.indptr[rows]]
        weight = -self.row_scale[rows] * self.column_scale[value] / entry
        self._enter(value, value, rows, weight, np.full(len(value), BY_RULE))

    def _members_then_joints(self) -> bool:
        """One round; True while something was found. Members come first: what they give needs no other result."""
        unknown = np.flatnonzero(~self.known)
        if not len(unknown):
            return False
        blocks = np.unique(self.block_of_value[unknown].indices)
        is_member = blocks < self.system.members
        return self._round(blocks[is_member]) or self._round(blocks[~is_member])

    def _round(self, blocks: Ints) -> bool:
        found: dict[int, tuple[Ints, Floats, int]] = {}
        for block in blocks.tolist():
            rows = self.rows_of[block]
            for value, weights in self._settled(rows):
                found.setdefault(value, (rows, weights, block))
        return self._take(found)

    def _settled(self, rows: Ints) -> list[tuple[int, Floats]]:
        """Unknown values that these rows settle, each with the weights of the rows that give it."""
        part = self.scaled[rows]
        columns = np.unique(part.indices[part.data != 0])
        columns = columns[~self.known[columns]]
        if not len(columns):
            return []
        dense = part[:, columns].toarray()
        inverse = np.linalg.pinv(dense, rcond=RANK)
        loose = np.abs(np.eye(len(columns)) - inverse @ dense).max(axis=1)
        return [
            (int(columns[k]), -inverse[k] * self.row_scale[rows] * self.column_scale[columns[k]])
            for k in np.flatnonzero(loose < 1e-7)
        ]

    def _take(self, found: dict[int, tuple[Ints, Floats, int]]) -> bool:
        """Enter the found values: each is `weights @ (equations with what was known before)`."""
        if not found:
            return False
        target = np.concatenate([np.full(len(rows), v) for v, (rows, _, _) in found.items()])
        rows = np.concatenate([r for r, _, _ in found.values()])
        weights = np.concatenate([w for _, w, _ in found.values()])
        self._enter(np.array(list(found)), target, rows, weights, np.array([b for _, _, b in found.values()]))
        return True

    def _enter(self, value: Ints, target: Ints, rows: Ints, weights: Floats, by: Ints) -> None:
        """Set `value`: entry k adds weights[k] times equation rows[k] to value target[k]."""
        shape = (len(self.given), len(self.system.constant))
        gather: Sparse = sparse.coo_array((weights, (target, rows)), shape=shape).tocsr()
        self.constant = self.constant + gather @ (self.system.matrix @ self.constant + self.system.constant)
        self.combination = (self.combination + gather @ (self.system.matrix @ self.combination)).tocsr()
        self.known[value] = True
        self.by[value] = by

    def _together(self) -> None:
        """What no single joint settles may still be settled by several at once."""
        unknown = np.flatnonzero(~self.known)
        if not 0 < len(unknown) <= TOGETHER:
            return
        rows = np.unique(self.scaled[:, unknown].tocoo().coords[0])
        self._take({v: (rows, w, TOGETHER_BLOCK) for v, w in self._settled(rows)})
