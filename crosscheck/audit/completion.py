"""Completing a partial set of results by statics, as far as statics goes, and keeping account of the rounding.

Members first (moments give shears), then joint by joint (shears give axial forces and reactions), then whatever
several joints settle together. Each completed value is a known combination of given ones, so that the rounding of
the given ones is carried through exactly, as an interval (R. E. Moore, Interval Analysis, 1966): the half width of
`combination @ given` is `|combination| @ half`.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from scipy import sparse

from crosscheck.audit.equilibrium import FREE_SUPPORT, HINGE, Equations, Sparse
from crosscheck.frame.model import Bools, Floats, Ints

TOGETHER = 1200
"""Most values that are sought together in one dense solve; beyond it they count as not judged."""
BY_RULE, TOGETHER_BLOCK = -3, -2
RANK = 1e-9
"""A direction whose share is below this is null: the scaled equations have entries of the order of one."""
LOOSE = 1e-7
"""An unknown that a free movement of the others changes by less than this is settled."""


@dataclass(frozen=True, slots=True)
class Stack:
    """Small dense matrices side by side, padded with zeros: what pseudo-inverses are taken of, all at once.

    dense: (b, r, c); rows: (b, r) and columns: (b, c) which they are, -1 where padded; block: (b,).
    """

    dense: Floats
    rows: Ints
    columns: Ints
    block: Ints


@dataclass(frozen=True, slots=True)
class Entries:
    """Entries of a sparse matrix as columns, with the block of each row."""

    row: Ints
    column: Ints
    entry: Floats
    block: Ints

    @staticmethod
    def of(matrix: Sparse, block: Ints) -> Entries:
        """Every entry that is not nil."""
        table = matrix.tocoo()
        row, column = table.coords
        there = table.data != 0
        row, column = row[there].astype(np.int64), column[there].astype(np.int64)
        return Entries(row, column, table.data[there], block[row])

    def where(self, columns: Bools) -> Entries:
        """Entries of the marked columns."""
        return self.only(columns[self.column])

    def only(self, which: Bools) -> Entries:
        return Entries(self.row[which], self.column[which], self.entry[which], self.block[which])

    def stack(self) -> Stack:
        """Each block as a dense matrix of the rows and columns that it has entries in."""
        names, block = np.unique(self.block, return_inverse=True)
        row, rows = _places(block, self.row, len(names))
        column, columns = _places(block, self.column, len(names))
        dense = np.zeros((len(names), rows.shape[1], columns.shape[1]))
        dense[block, row, column] = self.entry
        return Stack(dense, rows, columns, names)


def _places(block: Ints, index: Ints, blocks: int) -> tuple[Ints, Ints]:
    """Place of each index among the distinct ones of its block, and those distinct ones (b, most), -1 where padded."""
    pairs, which = np.unique(np.column_stack([block, index]), axis=0, return_inverse=True)
    count = np.bincount(pairs[:, 0], minlength=blocks)
    start = np.cumsum(count) - count
    place = np.arange(len(pairs)) - start[pairs[:, 0]]
    table = np.full((blocks, int(count.max(initial=0))), -1, dtype=np.int64)
    table[pairs[:, 0], place] = pairs[:, 1]
    return place[which.ravel()], table


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
        column_scale = np.where(system.value_couples, length, 1.0)
        self.row_scale = np.where(system.couples, 1 / length, 1.0)
        self.column_scale = column_scale
        self.scaled: Sparse = (
            sparse.diags_array(self.row_scale) @ system.matrix @ sparse.diags_array(column_scale)
        ).tocsr()
        self.entries = Entries.of(self.scaled, system.block)
        # A block is looked at again only when one of its values has become known since.
        self.stale = np.ones(int(system.block.max()) + 1, dtype=bool)

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
        unknown = self.entries.only(self.stale[self.entries.block] & ~self.known[self.entries.column])
        member = unknown.block < self.system.members
        for chosen in (unknown.only(member), unknown.only(~member)):
            self.stale[chosen.block] = False
            if self._round(chosen):
                return True
        return False

    def _round(self, unknown: Entries) -> bool:
        """Take from every block what it settles by itself; a value that two blocks settle is taken from the first."""
        if not len(unknown.row):
            return False
        stack = unknown.stack()
        inverse = np.asarray(np.linalg.pinv(stack.dense, rcond=RANK), dtype=np.float64)
        spread = np.eye(stack.dense.shape[2]) - inverse @ stack.dense
        settled = (np.abs(spread).max(axis=2) < LOOSE) & (stack.columns >= 0)
        block, local = np.nonzero(settled)
        value, first = np.unique(stack.columns[block, local], return_index=True)
        block, local = block[first], local[first]
        rows = stack.rows[block]
        weights = -inverse[block, local] * self.column_scale[value, None]
        there = rows >= 0
        target = np.repeat(value, there.sum(axis=1))
        flat: Floats = weights[there] * self.row_scale[rows[there]]
        self._enter(value, target, rows[there], flat, stack.block[block])
        return len(value) > 0

    def _enter(self, value: Ints, target: Ints, rows: Ints, weights: Floats, by: Ints) -> None:
        """Set `value`: entry k adds weights[k] times equation rows[k], as known before, to value target[k]."""
        shape = (len(self.given), len(self.system.constant))
        gather: Sparse = sparse.coo_array((weights, (target, rows)), shape=shape).tocsr()
        self.constant = self.constant + gather @ (self.system.matrix @ self.constant + self.system.constant)
        used: Sparse = gather @ self.system.matrix
        self.combination = (self.combination + used @ self.combination).tocsr()
        self.known[value] = True
        self.by[value] = by
        fresh = np.zeros(len(self.known), dtype=bool)
        fresh[value] = True
        self.stale[self.entries.where(fresh).block] = True

    def _together(self) -> None:
        """What no single joint settles may still be settled by several at once."""
        unknown = self.entries.where(~self.known)
        if not 0 < len(np.unique(unknown.column)) <= TOGETHER:
            return
        one = replace(unknown, block=np.full(len(unknown.row), TOGETHER_BLOCK))
        self._round(one)
