"""How nearly claimed deformations fit together: the least-squares fit of a frame's displacements to them.

A member has three deformations d (end rotations from its chord, elongation); displacements u of the joints give B u. In
results that belong to this frame d = B u, so the misfit r = d - B u of the best u is nil; it has as many independent
components as the frame is statically indeterminate. "Best" is measured by the deformations that the rounding of
the printed values can cause, covariance S = F H F' with F the member's flexibility and H the squared roundings: a
change of units then changes nothing. With L = S^-1 (1 - projection on B), r = S L d, and L d is a state of self-stress.

The augmented matrix [[S, B], [B', 0]] gives u and L d at once without squaring the condition of B, and an axially
rigid member is simply a nil in S: its elongation must be what is imposed (A. Bjorck, Numerical Methods for Least
Squares Problems, SIAM 1996, section 2.5). So is a tie: how far its joints part must be nil. A one-way member that is
taken out has no row at all: its length is free. A single slip a is tested by W. Baarda, A Testing Procedure for Use in
Geodetic Networks, Delft 1968: its size is a'Ld / a'La, and it explains (a'Ld)^2 / (a'La d'Ld) of the squared misfit.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from scipy import linalg, sparse
from scipy.sparse.linalg import splu

from crosscheck.audit.equilibrium import Sparse, couple_values, end_index, reaction_index
from crosscheck.audit.flexibility import STRETCH, Flexibility, flexibility
from crosscheck.audit.statics import ROUND_OFF, Balance
from crosscheck.frame.kinematics import tied
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import FREE, HELD, Bools, Floats, Frame, Ints

DENSE_ROWS = 3000
"""Up to this many conditions the rounding is carried through value by value; beyond it by a norm, which is coarser."""
DEPENDENT = 1e-11
"""A pivot of the scaled geometry below this belongs to a column that the ones before it make up."""
NUDGE = 1e-14
DENSE_SEARCH = 400
"""Up to so many columns, dependent ones are found by a dense decomposition."""
PARALLEL = 1e-9
"""Of unit columns: what is left of one, less its parts along the others, when it is made up of them (as
kinematics.SINGULAR)."""
BATCH = 400
ARITHMETIC = 1e-3
"""Of a row's rounding, round-off of values included: what solving may add."""


@dataclass(frozen=True, slots=True)
class Geometry:
    """What joint displacements do to raw deformations, whatever is claimed.

    matrix: (q, 3 j) over displacements in the supports' own axes: three rows a member, then the displacements themselves
      (for support springs), then how far the joints of ties part; q = 3 m + 3 j + ties.
    held: (3 j,) directions that cannot move. stiffness: (3 j,).
    to_global: (3 j, 3 j) turns displacements in support axes into global ones.
    """

    matrix: Sparse
    held: Bools
    stiffness: Floats
    to_global: Sparse


def geometry(frame: Frame) -> Geometry:
    """Rows (end rotation from the chord at `from` and `to`, elongation) of each member, and the supports' own axes."""
    t, s = frame.member_table, frame.support_table
    m, j = len(t.length), len(frame.joints)
    every = np.arange(m)
    triplets: list[tuple[Ints, Ints, Floats]] = []
    row: Any
    for end, sign in ((0, -1.0), (1, 1.0)):
        column = 3 * t.ends[:, end]
        # The chord turns clockwise by (v_from - v_to) / L, with v across the member.
        for row in (0, 1):
            triplets += [
                (3 * every + row, column, -sign * t.sin / t.length),
                (3 * every + row, column + 1, sign * t.cos / t.length),
            ]
        triplets += [
            (3 * every + end, column + 2, np.ones(m)),
            (3 * every + 2, column, sign * t.cos), (3 * every + 2, column + 1, sign * t.sin),
        ]  # fmt: skip
    row, column, entry = (np.concatenate([x[k] for x in triplets]) for k in range(3))
    members: Sparse = sparse.coo_array((entry, (row, column)), shape=(3 * m, 3 * j)).tocsr()
    joint = 3 * np.arange(j)
    axes: Sparse = sparse.coo_array(
        (
            np.concatenate([s.cos, -s.sin, s.sin, s.cos, np.ones(j)]),
            (
                np.concatenate([joint, joint, joint + 1, joint + 1, joint + 2]),
                np.concatenate([joint, joint + 1, joint, joint + 1, joint + 2]),
            ),
        ),
        shape=(3 * j, 3 * j),
    ).tocsr()
    stiffness = s.stiffness.ravel()
    matrix = sparse.vstack([members @ axes, sparse.eye_array(3 * j), tied(frame) @ axes]).tocsr()
    return Geometry(matrix, stiffness == HELD, stiffness, axes)


@dataclass(frozen=True, eq=False)
class Fit:
    """The fit of one case. n conditions (rows), c displacements (columns), v values.

    keep: (n, q) reduces raw deformations to those that can be judged: hinges and missing values projected out.
    weight: (n, n) covariance S of rounding; rigid: (n,) True where a row is the elongation of a rigid member, or a tie.
    base: (n, c) B of the independent free displacements; columns: (c,) which of the 3 j they are.
    raw_flexibility: (q, q). forces, rounding: (q,) forces that go with the raw deformations
      (reactions along the supports' own axes, forces in ties), nil where missing, and the rounding of each.
    source: (n, v) deformations from given values; d: (n,) deformations less those of settled supports.
    lost_rows: rigid elongations that repeat others; settlement: (3 j,) of held directions.
    reduced: missing values cost conditions.
    unit: (n,) a typical size of each row's rounding, for scaling. half: (v,) rounding and round-off.
    """

    frame: Frame
    geometry: Geometry
    flexibility: Flexibility
    forces: Floats
    rounding: Floats
    keep: Sparse
    raw_flexibility: Sparse
    weight: Sparse
    rigid: Bools
    base: Sparse
    columns: Ints
    source: Sparse
    d: Floats
    unit: Floats
    half: Floats
    lost_rows: Sparse
    settlement: Floats
    reduced: bool

    @property
    def dimension(self) -> int:
        """Independent conditions that the claim can be tested by."""
        return len(self.d) - len(self.columns)

    @cached_property
    def _scaled(self) -> tuple[Any, Floats, Floats]:
        """Factors of the augmented matrix, scaled so that rounding is one in every row, and the scales."""
        row: Floats = 1 / self.unit
        base = (sparse.diags_array(row) @ self.base).tocsc()
        size = np.sqrt(np.asarray(base.multiply(base).sum(axis=0)).ravel())
        column = 1 / np.where(size > 0, size, 1.0)
        base = base @ sparse.diags_array(column)
        weight = sparse.diags_array(row) @ self.weight @ sparse.diags_array(row)
        matrix = sparse.block_array([[weight, base], [base.T, None]]).tocsc()
        return (splu(matrix), matrix), row, column

    def solve(self, d: Floats) -> tuple[Floats, Floats]:
        """(L d, u) for deformations d (n,) or several at once (n, k)."""
        if not len(self.d):
            return np.zeros_like(d), np.zeros((0, *d.shape[1:]))
        (factors, matrix), row, column = self._scaled
        right = np.zeros((matrix.shape[0], *d.shape[1:]))
        right[: len(row)] = (d.T * row).T
        found = factors.solve(right)
        found += factors.solve(right - matrix @ found)
        return (found[: len(row)].T * row).T, (found[len(row) :].T * column).T

    def carry(self, outside: Floats) -> Floats:
        """(n,) the forces x with B'x = outside (c,) that are least in the measure x'S x."""
        if not len(self.d):
            return np.zeros(0)
        (factors, matrix), row, column = self._scaled
        right = np.concatenate([np.zeros(len(row)), outside * column])
        found = factors.solve(right)
        found += factors.solve(right - matrix @ found)
        return np.asarray(found[: len(row)] * row)

    @cached_property
    def solved(self) -> tuple[Floats, Floats]:
        """(L d, u) of the claim itself."""
        return self.solve(self.d)

    @cached_property
    def residual(self) -> Floats:
        """(n,) r = S L d; nil for rigid members, whose elongation is imposed."""
        return np.asarray(self.weight @ self.solved[0])

    @cached_property
    def squared(self) -> float:
        """The misfit r'S^-1 r in units of the printed rounding, as (Ld)'S(Ld): d'Ld would lose digits to cancellation."""
        return float(self.solved[0] @ self.residual)

    @cached_property
    def inverse(self) -> Floats:
        """(n, n) L, dense; only for frames small enough. One pass: it serves intervals and sizes, not the misfit."""
        return np.concatenate([np.zeros((len(self.d), 0)), *map(self._columns, self._parts())], axis=1)

    def _parts(self) -> list[slice]:
        return [slice(k, min(k + BATCH, len(self.d))) for k in range(0, len(self.d), BATCH)]

    def _columns(self, part: slice) -> Floats:
        """(n, k) columns of L."""
        (factors, matrix), row, _ = self._scaled
        right = np.zeros((matrix.shape[0], part.stop - part.start))
        right[np.arange(part.start, part.stop), np.arange(part.stop - part.start)] = row[part]
        return np.asarray(factors.solve(right)[: len(row)] * row[:, None])

    @property
    def small(self) -> bool:
        """Small enough to carry the rounding of every value to every condition."""
        return len(self.d) <= DENSE_ROWS

    def own(self, columns: Sparse) -> Floats:
        """(k,) a'La of each column (n, k); where small as (La)'S(La), which loses no digits to cancellation."""
        across = columns.T.tocsr()
        if self.small:
            spread = across @ self.inverse
            return np.asarray(((spread @ self.weight) * spread).sum(axis=1))
        total = np.zeros(columns.shape[1])
        for part in self._parts():
            total += np.asarray(across[:, part].multiply(across @ self._columns(part)).sum(axis=1)).ravel()
        return total

    def carried(self, rows: Sparse, own: Floats) -> Floats:
        """(k,) how far rounding can move rows @ L d, rows (k, n): an exact interval, for all is linear.

        own: (k,) a'La of each row. Beyond DENSE_ROWS conditions |a'L e| <= sqrt(a'La) sqrt(e'S^-1 e) bounds it, and the
        last is at most the root of the number of rounded values.
        """
        if not self.small:
            return np.asarray(np.sqrt(np.maximum(own, 0.0) * np.count_nonzero(self.half)))
        source = (self.source @ sparse.diags_array(self.half)).tocsc()
        source = source[:, np.flatnonzero(np.diff(source.indptr))]
        total = np.zeros(rows.shape[0])
        for first in range(0, rows.shape[0], BATCH):
            part = slice(first, first + BATCH)
            total[part] = np.abs((rows[part] @ self.inverse) @ source).sum(axis=1)
        return total

    @cached_property
    def allowed(self) -> Floats:
        """(n,) how far rounding can move each component of r."""
        if not self.small:
            return np.asarray(np.sqrt(self.weight.diagonal() * np.count_nonzero(self.half)))
        return self.carried(self.weight, np.zeros(0)) + ARITHMETIC * self.unit

    @cached_property
    def shares(self) -> Floats:
        """(n,) how much of a change in one deformation alone shows in its own misfit: nil where nothing tests it."""
        if not self.small:
            return np.ones(len(self.d))
        return np.asarray(self.weight.multiply(self.inverse.T).sum(axis=1)).ravel()

    @cached_property
    def displacements(self) -> Floats:
        """(3 j,) best-fitting displacements in the supports' axes; settlements where held, nil where not reached."""
        full = self.settlement.copy()
        full[self.columns] = self.solved[1]
        return full


def fit(frame: Frame, balance: Balance, energy: bool = False) -> Fit:
    """Set up the fit for a case from its completed values (statics.balance).

    energy: measure by strain energy instead of by rounding, S = F (then L is stiffness less its projection).
    """
    loads = load_table(frame, balance.case)
    g, soft = geometry(frame), flexibility(frame, loads)
    m, j = len(frame.members), len(frame.joints)
    done, scales = balance.completed, balance.scales
    ties = g.matrix.shape[0] - 3 * m - 3 * j
    couples = couple_values(m, j, ties)
    floor = ROUND_OFF * np.where(couples, scales.moment, scales.force)
    floor = np.where(floor > 0, floor, 1.0)
    # An unloaded case has no scale of its own; any will do, for all its values are nil.
    pick = _picker(frame, ties)
    forces = pick @ np.nan_to_num(done.value)
    missing = (abs(pick) @ done.missing.astype(float)) > 0
    rounding = abs(pick) @ (done.half_width + floor)
    raw_flex = _raw_flexibility(g, soft)
    settlement = loads.settlement.ravel()
    imposed = np.concatenate([soft.total_load.ravel(), settlement, np.zeros(ties)])
    raw = raw_flex @ forces + imposed - g.matrix @ np.where(g.held, settlement, 0.0)
    keep, rigid = _keep(frame, g, soft, missing)
    loose = raw_flex @ sparse.diags_array(rounding)
    raw_weight = abs_springs(raw_flex, 3 * m) if energy else loose @ loose.T
    weight = keep @ raw_weight @ keep.T
    base = (keep @ g.matrix[:, ~g.held]).tocsc()
    scale = np.where(np.arange(3 * j) % 3 == 2, 1.0, scales.length)[~g.held]
    unit = _units(frame, keep, rigid, weight)
    length = np.concatenate([
        np.tile([1.0, 1.0, scales.length], m), np.tile([scales.length, scales.length, 1.0], j),
        np.full(ties, scales.length),
    ])  # fmt: skip
    plain = 1 / (abs(keep) @ length) * (abs(keep) @ np.ones(len(length)))
    shape = (sparse.diags_array(plain) @ base @ sparse.diags_array(scale)).tocsc()
    reduced = _reduced(g, soft, missing) or bool(frame.out_members or frame.out_supports)
    good = _independent(shape, reduced)
    fine = np.ones(len(rigid), dtype=bool)
    fine[rigid] = _independent(shape[np.flatnonzero(rigid)][:, np.flatnonzero(good)].T.tocsc(), True)
    rows = np.flatnonzero(fine)
    values = (raw_flex @ pick @ done.combination).tocsr()
    columns = np.flatnonzero(~g.held)[good]
    half = done.half + np.where(done.half_width + floor > 0, floor, 0.0)
    return Fit(
        frame=frame, geometry=g, flexibility=soft, forces=forces, rounding=rounding, keep=keep[rows].tocsr(),
        raw_flexibility=raw_flex,
        weight=weight.tocsr()[rows][:, rows].tocsr(), rigid=rigid[rows],
        base=base[:, np.flatnonzero(good)].tocsr()[rows].tocsc(), columns=columns,
        source=(keep[rows] @ values).tocsr(), d=np.asarray(keep[rows] @ raw), unit=unit[rows], half=half,
        lost_rows=keep[np.flatnonzero(~fine)].tocsr(), settlement=np.where(g.held, settlement, 0.0),
        reduced=reduced,
    )  # fmt: skip


def _picker(frame: Frame, ties: int) -> Sparse:
    """(q, v): moments and axial force at `from` of every member, reactions in the supports' own axes, forces in ties."""
    s = frame.support_table
    m, j = len(frame.members), len(frame.joints)
    every, joint = np.arange(m), np.arange(j)
    at = 3 * m + 3 * joint
    triplets = [
        (3 * every, end_index(every, 0, 2), np.ones(m)),
        (3 * every + 1, end_index(every, 1, 2), np.ones(m)),
        (3 * every + 2, end_index(every, 0, 0), np.ones(m)),
        (at, reaction_index(m, joint, 0), s.cos), (at, reaction_index(m, joint, 1), s.sin),
        (at + 1, reaction_index(m, joint, 0), -s.sin), (at + 1, reaction_index(m, joint, 1), s.cos),
        (at + 2, reaction_index(m, joint, 2), np.ones(j)),
    ]  # fmt: skip
    row, column, entry = (np.concatenate([x[k] for x in triplets]) for k in range(3))
    matrix = sparse.coo_array((entry, (row, column)), shape=(3 * m + 3 * j, 6 * m + 3 * j)).tocsr()
    matrix.eliminate_zeros()
    return sparse.block_diag([matrix, sparse.eye_array(ties)]).tocsr()


def abs_springs(raw: Sparse, first: int) -> Sparse:
    """Raw flexibility with support springs (rows from `first` on) positive: the energy of a reaction has no sign."""
    sign = np.where(np.arange(raw.shape[0]) < first, 1.0, -1.0)
    return (sparse.diags_array(sign) @ raw).tocsr()


def _sprung(g: Geometry) -> Bools:
    return np.asarray((g.stiffness != FREE) & (g.stiffness != HELD))


def _raw_flexibility(g: Geometry, soft: Flexibility) -> Sparse:
    """(q, q): member flexibilities; a support spring moves by settlement - reaction / k; a tie gives nothing."""
    blocks = soft.total
    m = len(blocks)
    row = (3 * np.arange(m)[:, None, None] + np.arange(3)[None, :, None] + np.zeros((1, 1, 3), dtype=int)).ravel()
    column = (3 * np.arange(m)[:, None, None] + np.zeros((1, 3, 1), dtype=int) + np.arange(3)[None, None, :]).ravel()
    members = sparse.coo_array((blocks.ravel(), (row, column)), shape=(3 * m, 3 * m))
    sprung = _sprung(g)
    springs = np.where(sprung, -1 / np.where(sprung, g.stiffness, 1.0), 0.0)
    ties = g.matrix.shape[0] - 3 * m - len(springs)
    return sparse.block_diag([members, sparse.diags_array(springs), sparse.csr_array((ties, ties))]).tocsr()


def _keep(frame: Frame, g: Geometry, soft: Flexibility, missing: Bools) -> tuple[Sparse, Bools]:
    """Rows that reduce the raw deformations to what can be judged, and which are elongations of rigid members or ties.

    A hinge turns by any amount, and a missing moment bends by any amount: what is left of the two end rotations is
    what neither can change. A missing axial force leaves nothing of the elongation, but for a rigid member; nor does a
    one-way member that is taken out.
    """
    t = frame.member_table
    m = len(t.length)
    hinged = t.turn == FREE
    plain = ~hinged.any(axis=1) & ~missing[: 3 * m].reshape(m, 3)[:, :2].any(axis=1)
    both = np.flatnonzero(plain)
    row_of = [3 * both, 3 * both + 1]
    rows: list[tuple[Ints, Floats]] = [(np.concatenate(row_of), np.ones(2 * len(both)))]
    triples: list[tuple[int, int, float]] = []
    count = 2 * len(both)
    for k in np.flatnonzero(~plain).tolist():
        spans = [soft.connection[k, end, :2] for end in range(2) if hinged[k, end]]
        spans += [soft.total[k, :2, q] for q in range(2) if missing[3 * k + q]]
        left = _left_null(np.array(spans))
        if left is not None:
            triples += [(count, 3 * k, left[0]), (count, 3 * k + 1, left[1])]
            count += 1
    rigid = soft.matrix[STRETCH, :, 2, 2] == 0
    stretch = np.flatnonzero((rigid | ~missing[2 : 3 * m : 3]) & ~t.slack)
    joints = len(g.stiffness)
    springs = np.flatnonzero(_sprung(g) & ~missing[3 * m : 3 * m + joints])
    ties = np.arange(3 * m + joints, len(missing))
    tail = np.concatenate([3 * stretch + 2, 3 * m + springs, ties])
    extra = np.array(triples).reshape(-1, 3)
    row = np.concatenate([np.arange(2 * len(both)), extra[:, 0], count + np.arange(len(tail))]).astype(int)
    column = np.concatenate([rows[0][0], extra[:, 1], tail]).astype(int)
    entry = np.concatenate([rows[0][1], extra[:, 2], np.ones(len(tail))])
    total = count + len(tail)
    keep = sparse.coo_array((entry, (row, column)), shape=(total, len(missing))).tocsr()
    flags = np.zeros(total, dtype=bool)
    flags[count : count + len(stretch)] = rigid[stretch]
    flags[total - len(ties) :] = True
    return keep, flags


def _reduced(g: Geometry, soft: Flexibility, missing: Bools) -> bool:
    """Whether a value is missing that deforms something: then the rest may leave displacements open."""
    m = len(soft.load[0])
    deforms = np.column_stack([np.ones((m, 2), dtype=bool), soft.matrix[STRETCH, :, 2, 2] > 0]).ravel()
    springs = missing[3 * m : 3 * m + len(g.stiffness)] & _sprung(g)
    return bool((missing[: 3 * m] & deforms).any() or springs.any())


def _left_null(spans: Floats) -> Floats | None:
    """What of two end rotations no vector of `spans` (k, 2) can change, as a row of unit size; None if nothing."""
    size = np.linalg.norm(spans, axis=1)
    spans = spans[size > 0] / size[size > 0, None]
    _, values, right = np.linalg.svd(spans)
    if len(values) > 1 and values[1] > 1e-9 * values[0]:
        return None
    return np.asarray(right[1])


def _units(frame: Frame, keep: Sparse, rigid: Bools, weight: Sparse) -> Floats:
    """(n,) the rounding of each row; for a rigid elongation that of its member's ends at the member's length, for a tie
    at that of the longest member."""
    unit = np.sqrt(weight.diagonal())
    typical = float(np.median(unit[unit > 0])) if (unit > 0).any() else 1.0
    length = frame.member_table.length
    owner = keep[np.flatnonzero(rigid)].indices // 3
    tie = owner >= len(length)
    unit[rigid] = typical * np.where(tie, length.max(initial=0.0), length[np.where(tie, 0, owner)])
    unit[unit == 0] = typical
    return np.asarray(unit)


def _independent(matrix: Sparse, search: bool) -> Bools:
    """(c,) columns of `matrix` (n, c) that the others of them do not make up; without `search` only nil ones fall.

    Orthogonal decomposition with pivoting where that is quick. Otherwise Gauss elimination of M'M with a nudge on the
    diagonal: a pivot that vanishes marks a dependent column (one that is all but parallel to another may slip through).
    """
    size = np.sqrt(np.asarray(matrix.multiply(matrix).sum(axis=0)).ravel())
    good = np.asarray(size > 1e-12 * size.max(initial=0.0))
    if not search or not good.any():
        return good
    unit = matrix[:, np.flatnonzero(good)] @ sparse.diags_array(1 / size[good])
    if unit.shape[1] <= DENSE_SEARCH:
        upper, order = linalg.qr(unit.toarray(), mode="r", pivoting=True)
        own = np.abs(np.diagonal(upper))
        kept = np.zeros(unit.shape[1], dtype=bool)
        kept[order[: int((own > PARALLEL * own[0]).sum())]] = True
        good[good] = kept
        return good
    square = (unit.T @ unit + NUDGE * sparse.eye_array(int(good.sum()))).tocsc()
    factors = splu(square, permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0, options={"SymmetricMode": True})
    pivots = np.abs(factors.U.diagonal())[factors.perm_c]
    good[good] = pivots > DEPENDENT
    return good
