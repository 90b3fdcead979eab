"""How the frame can move, from geometry alone: mechanisms by name, and what an idealisation leaves undetermined.

No stiffness enters. Elongations and end rotations are formed from joint displacements; a movement that needs none of
them is a mechanism, and a set of axial forces that loads no joint (a self-stress) is undetermined when members are
axially rigid. Joints that are rigidly connected move as one body, so the matrices here are as small
as the frame's hinges allow: one body for a rigid-jointed frame, however large.

Published: rigid bodies and their freedoms after S. Pellegrino and C. R. Calladine, "Matrix analysis of statically and
kinematically indeterminate frameworks", Int. J. Solids Structures 22 (1986), 409-428 (from memory).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.sparse as sp

from crosscheck.answer import Undetermined
from crosscheck.frame.loads import LoadTable, direction_cosines, load_table
from crosscheck.frame.model import HELD, Bools, Floats, Frame, Ints
from crosscheck.problems import MechanismFound, Problem, UnusableInput

SINGULAR = 1e-9
"""Singular values below this share of the largest are movements without resistance. Stable frames, flexible ones and
tall towers included, stay above 1e-5; true mechanisms fall to rounding, below 1e-13."""
FOLLOWS = 1e-9
"""Share of an imposed change of length that an axially rigid frame may fail to follow by rounding alone."""
ADVICE = "give it a support, a stiff joint or a member that stops this"
DENSE = 500
"""Up to this many unknowns a dense decomposition is quick; above it sparse inverse iteration is used."""
FEW_BARS = 60
"""Up to so many axially rigid members or free displacements, self-stresses are found densely at once; up to DENSE where
the sparse way does not settle."""
SHIFT = 1e-12
"""What is added to the normal matrix of elongations, as a share of its diagonal, so that it can be factorised."""
PASSES = 8
"""Most passes of a projection with that factor; two or three are usual."""
STILL = 1e-10
"""Share of the lengths below which a pass that changes them no further has settled; rounding stays below."""

Sparse = Any  # scipy.sparse matrices: their types differ between scipy releases


@dataclass(frozen=True, slots=True)
class Study:
    """What the geometry says of a frame that is no mechanism; undetermined values whatever the load."""

    undetermined: Undetermined


@dataclass(frozen=True, slots=True)
class Motion:
    """One movement without resistance: (j, 3) dx, dy, clockwise rotation by joint, largest translation 1; in words."""

    joints: Floats
    says: str


def study(frame: Frame) -> Study:
    """Study the frame for all its cases.

    Raises MechanismFound where it can move freely, and UnusableInput where a load meets no resistance, an axially
    rigid frame cannot follow an imposed change of length, or second order needs an axial force that it leaves open.
    """
    found = mechanisms(frame)
    if found:
        raise MechanismFound(Problem(frame.file, None, "", motion.says, ADVICE) for motion in found)
    turning, loose = free_rotations(frame), loose_freedoms(frame)
    redundancy = AxialRedundancy(frame)
    axial, reactions = redundancy.members(), redundancy.reactions()
    problems = _one_way_unknown(frame, reactions)
    for name in frame.cases:
        table = load_table(frame, name)
        problems += _unresisted(frame, name, table, turning, loose)
        problems += redundancy.unfollowed(name, table)
    problems += _open_in_second_order(frame, redundancy, axial)
    if problems:
        raise UnusableInput(problems)
    joints = loose.copy()
    joints[turning, 2] = True
    return Study(Undetermined(axial=axial, joints=joints, reactions=reactions))


# --- bodies and mechanisms -------------------------------------------------------------------------


def connected(frame: Frame) -> Bools:
    """(m, 2): True where the member's end is fixed or sprung to its joint's rotation, False where it is hinged."""
    return np.asarray(frame.member_table.turn > 0.0)


def free_rotations(frame: Frame) -> Bools:
    """(j,): joints that have members, every one of them hinged there without a rigid zone, and no support against
    turning: their own rotation is undetermined and moves nothing."""
    t, joints = frame.member_table, len(frame.joints)
    grips = connected(frame) | (t.zone > 0.0)
    held = np.zeros(joints, dtype=bool)
    held[t.ends[grips]] = True
    joined = np.zeros(joints, dtype=bool)
    joined[t.ends.ravel()] = True
    return np.asarray(joined & ~held & (frame.support_table.stiffness[:, 2] == 0.0))


def loose_freedoms(frame: Frame) -> Bools:
    """(j, 3): displacements of joints that nothing joins, where no support determines them (global axes)."""
    joints = len(frame.joints)
    loose = np.ones(joints, dtype=bool)
    loose[frame.member_table.ends.ravel()] = False
    s = frame.support_table
    free = (s.stiffness == 0.0) & loose[:, None]
    x = (free[:, 0] & (s.cos != 0.0)) | (free[:, 1] & (s.sin != 0.0))
    y = (free[:, 0] & (s.sin != 0.0)) | (free[:, 1] & (s.cos != 0.0))
    return np.column_stack([x, y, free[:, 2]])


def bodies(frame: Frame) -> Ints:
    """(j,): number of the rigid body that each joint belongs to; joints linked by ends that transmit moment are one."""
    t, joints = frame.member_table, len(frame.joints)
    i, j = t.ends[_one_body(frame)].T
    graph = sp.coo_matrix((np.ones(len(i)), (i, j)), shape=(joints, joints))
    return np.asarray(sp.csgraph.connected_components(graph, directed=False)[1], dtype=np.int64)


def _one_body(frame: Frame) -> Bools:
    """(m,): members that make one rigid body of their joints: stiff at both ends, and not free to change length."""
    return np.asarray(connected(frame).all(axis=1) & ~frame.member_table.slack)


def mechanisms(frame: Frame) -> list[Motion]:
    """Every independent movement without resistance, named; at most a handful for large frames. Loose joints and the
    free rotations of all-hinged joints are not mechanisms."""
    body = bodies(frame)
    scale = float(np.median(frame.member_table.length)) if frame.members else 1.0
    spread = _body_motion(frame, body, scale)
    constraints = (_constraints(frame, scale) @ spread).tocsc()
    used = _body_unknowns(frame, body)
    null = _null_space(constraints[:, used])
    if null.shape[1] == 0:
        return []
    moves = (spread[:, used] @ _localised(null)).T.reshape(-1, len(frame.joints), 3)
    moves[:, :, 2] /= scale
    return [_named(frame, move) for move in moves]


def _body_motion(frame: Frame, body: Ints, scale: float) -> Sparse:
    """(3j, 3 bodies): joint displacements (dx, dy, rotation times scale) from body displacements about each body's
    first joint."""
    joints, count = len(frame.joints), int(body.max()) + 1
    first = np.full(count, joints)
    np.minimum.at(first, body, np.arange(joints))
    arm = (frame.xy - frame.xy[first[body]]) / scale
    k = np.arange(joints)
    rows = np.concatenate([3 * k, 3 * k + 1, 3 * k + 2, 3 * k, 3 * k + 1])
    cols = np.concatenate([3 * body, 3 * body + 1, 3 * body + 2, 3 * body + 2, 3 * body + 2])
    data = np.concatenate([np.ones(3 * joints), arm[:, 1], -arm[:, 0]])
    return sp.csc_matrix((data, (rows, cols)), shape=(3 * joints, 3 * count))


def _body_unknowns(frame: Frame, body: Ints) -> Ints:
    """Body displacements that mean anything: not those of loose joints, nor an all-hinged joint's own rotation."""
    keep = np.ones((int(body.max()) + 1, 3), dtype=bool)
    keep[body[free_rotations(frame)], 2] = False
    loose = np.ones(len(frame.joints), dtype=bool)
    loose[frame.member_table.ends.ravel()] = False
    keep[body[loose]] = False
    return np.flatnonzero(keep.ravel())


def _constraints(frame: Frame, scale: float) -> Sparse:
    """(rows, 3j): what no mechanism may do: stretch a member, turn one against a stiff end, move a support."""
    joints = len(frame.joints)
    between = ~_one_body(frame)
    stretch = elongations(frame)[np.flatnonzero(between & ~frame.member_table.slack)]
    member, end = np.nonzero(connected(frame) & between[:, None])
    turn = _end_rotations(frame, member, end, scale)
    lengths = _rotation_scaled(sp.vstack([stretch, tied(frame)]), scale, joints)
    return sp.vstack([lengths, turn, _support_rows(frame)]).tocsr()


def _rotation_scaled(matrix: Sparse, scale: float, joints: int) -> Sparse:
    """The same rows for rotations measured times `scale`."""
    return matrix @ sp.diags(np.tile([1.0, 1.0, 1.0 / scale], joints))


def elongations(frame: Frame) -> Sparse:
    """(m, 3j) elongation of each member from joint displacements dx, dy, rotation (which never enters: the rigid zones
    lie along the member)."""
    t = frame.member_table
    m = np.arange(len(t.length))
    i, j = 3 * t.ends[:, 0], 3 * t.ends[:, 1]
    rows = np.tile(m, 4)
    cols = np.concatenate([i, i + 1, j, j + 1])
    data = np.concatenate([-t.cos, -t.sin, t.cos, t.sin])
    return sp.csr_matrix((data, (rows, cols)), shape=(len(m), 3 * len(frame.joints)))


def tied(frame: Frame) -> Sparse:
    """(t, 3j): how much further than its first joint each further joint of every tie moves along the tie's direction,
    from joint displacements dx, dy, rotation; zero in every possible movement."""
    rows: list[tuple[int, int, float]] = []
    count = 0
    for tie in frame.ties.values():
        first, *others = (3 * frame.joint_index[joint] for joint in tie.joints)
        for axis, part in enumerate(direction_cosines(tie.direction)):
            for k, other in enumerate(others):
                rows += [(count + k, first + axis, -part), (count + k, other + axis, part)]
        count += len(others)
    row, column, data = np.array(rows, dtype=float).reshape(-1, 3).T
    shape = (count, 3 * len(frame.joints))
    return sp.csr_matrix((data, (row.astype(np.int64), column.astype(np.int64))), shape=shape)


def _end_rotations(frame: Frame, members: Ints, end: Ints, scale: float) -> Sparse:
    """(n, 3j): clear length times the rotation of the given end of each member against its chord.

    Chord rotation (clockwise) is -(w2 - w1)/clear, with w1 = local-y displacement of the face of the `from` zone,
    which the joint's own rotation lowers by zone times rotation (and raises at the other end).
    """
    t = frame.member_table
    c, s, z = t.cos[members], t.sin[members], t.zone[members]
    i, j = 3 * t.ends[members, 0], 3 * t.ends[members, 1]
    own = np.where(end == 0, i, j) + 2
    n = np.arange(len(members))
    rows = np.tile(n, 7)
    cols = np.concatenate([i, i + 1, i + 2, j, j + 1, j + 2, own])
    data = np.concatenate([s, -c, z[:, 0] / scale, -s, c, z[:, 1] / scale, t.clear[members] / scale])
    return sp.csr_matrix((data, (rows, cols)), shape=(len(members), 3 * len(frame.joints)))


def _support_rows(frame: Frame) -> Sparse:
    """(3j, 3j) rows of the support axes, zero where free: a spring resists as surely as a held direction."""
    turned = support_axes(frame)
    return sp.diags((frame.support_table.stiffness.ravel() > 0.0).astype(float)) @ turned


def support_axes(frame: Frame) -> Sparse:
    """(3j, 3j): displacements along each joint's support axes from global ones."""
    s = frame.support_table
    k = 3 * np.arange(len(frame.joints))
    rows = np.concatenate([k, k, k + 1, k + 1, k + 2])
    cols = np.concatenate([k, k + 1, k, k + 1, k + 2])
    data = np.concatenate([s.cos, s.sin, -s.sin, s.cos, np.ones(len(k))])
    return sp.csr_matrix((data, (rows, cols)), shape=(3 * len(k), 3 * len(k)))


# --- null spaces -----------------------------------------------------------------------------------


def _null_space(matrix: Sparse) -> Floats:
    """(n, k) orthonormal basis of the movements that the rows do not resist."""
    n = matrix.shape[1]
    if n == 0:
        return np.zeros((0, 0))
    if n <= DENSE:
        return _dense_null_space(matrix.toarray())
    return _sparse_null_space(matrix)


def _dense_null_space(matrix: Floats) -> Floats:
    n = matrix.shape[1]
    square = matrix if matrix.shape[0] >= n else np.vstack([matrix, np.zeros((n - matrix.shape[0], n))])
    _, values, vectors = np.linalg.svd(square, full_matrices=False)
    return np.asarray(vectors[values <= SINGULAR * max(values[0], 1e-300)].T)


def _sparse_null_space(matrix: Sparse, block: int = 6) -> Floats:
    """Inverse iteration on the shifted normal matrix finds the weakest movements; the rows themselves, not their
    squares, then say which of those meet no resistance."""
    from scipy.sparse.linalg import splu

    normal = (matrix.T @ matrix).tocsc()
    size = float(normal.diagonal().max())
    factor = splu((normal + sp.identity(normal.shape[0], format="csc") * (1e-13 * size)).tocsc())
    basis = np.linalg.qr(np.random.default_rng(0).standard_normal((normal.shape[0], block)))[0]
    for _ in range(6):
        basis = np.linalg.qr(factor.solve(basis))[0]
    _, values, vectors = np.linalg.svd(matrix @ basis, full_matrices=False)
    weak = values <= SINGULAR * np.sqrt(size)
    return np.asarray(basis @ vectors[weak].T)


def _localised(null: Floats) -> Floats:
    """The same movements, each as much on its own as can be: identity at well-chosen unknowns."""
    from scipy.linalg import qr

    if null.shape[1] == 1:
        return null
    pivots = qr(null.T, mode="economic", pivoting=True)[2][: null.shape[1]]
    return np.asarray(np.linalg.solve(null[pivots].T, null.T).T)


# --- words -----------------------------------------------------------------------------------------

COMPASS = ("right", "up and right", "up", "up and left", "left", "down and left", "down", "down and right")


def _named(frame: Frame, move: Floats) -> Motion:
    """The movement scaled to its largest translation, turned to the usual sense (right, else down), in words."""
    names = list(frame.joints)
    shift = np.hypot(move[:, 0], move[:, 1])
    span = float(np.max(np.ptp(frame.xy, axis=0))) or 1.0
    if shift.max() <= 1e-6 * np.abs(move[:, 2]).max() * span:
        turning = [names[k] for k in np.flatnonzero(np.abs(move[:, 2]) > 1e-6 * np.abs(move[:, 2]).max())]
        return Motion(move, f"the frame can move: {_listed(turning)} can turn freely")
    move = move / shift.max()
    lead = move[int(np.argmax(shift))]
    if (lead[0] if abs(lead[0]) > 1e-6 else -lead[1]) < 0:
        move = -move
    moving = np.flatnonzero(shift > 1e-6 * shift.max())
    return Motion(move, _sentence(frame, names, move, moving))


def _sentence(frame: Frame, names: list[str], move: Floats, moving: Ints) -> str:
    words = [COMPASS[round(np.degrees(np.arctan2(move[k, 1], move[k, 0])) / 45.0) % 8] for k in moving]
    groups: dict[str, list[str]] = {}
    for k, word in zip(moving, words, strict=True):
        groups.setdefault(word, []).append(names[k])
    joined = np.unique(frame.member_table.ends)
    subject = "the frame can sway" if set(groups) <= {"right", "left"} else "the frame can move"
    if len(groups) == 1 and len(moving) == len(joined):
        word = next(iter(groups))
        return f"nothing holds the frame: every joint ({_listed(groups[word])}) moves {word} together"
    return f"{subject}: " + ", ".join(
        f"{_listed(group)} {'moves' if len(group) == 1 else 'move'} {word}{' together' if len(group) > 1 else ''}"
        for word, group in groups.items()
    )


def _listed(names: list[str], most: int = 6) -> str:
    if len(names) > most:
        return f"{', '.join(names[:most])} and {len(names) - most} more"
    return names[0] if len(names) == 1 else f"{', '.join(names[:-1])} and {names[-1]}"


# --- what axially rigid members leave undetermined -------------------------------------------------


class AxialRedundancy:
    """The self-stress of the axially rigid members and the ties: forces in them that load no joint (left null space of
    what they forbid). Rows are those of the rigid members, and then of the ties.

    Small frames use a dense decomposition; larger ones project random vectors with a sparse factor, and fall back on the
    dense one where that does not settle. Either way it depends on geometry and supports alone, never on a load case.
    """

    def __init__(self, frame: Frame) -> None:
        self.frame = frame
        self.rigid = frame.member_table.rigid
        self.rows = np.flatnonzero(self.rigid)
        self.any = bool(self.rigid.any() or frame.ties)
        if self.any:
            self._prepare()

    def _prepare(self) -> None:
        frame = self.frame
        kept = sp.vstack([elongations(frame)[self.rows], tied(frame)])
        self.turned = (kept @ support_axes(frame).T).tocsr()
        self.held = frame.support_table.stiffness.ravel() == HELD
        self.free = self.turned[:, np.flatnonzero(~self.held)].tocsc()
        self._null: Floats | None = None
        self._factor: Any = None
        if min(self.free.shape) <= FEW_BARS:
            self._null = self._dense_null()
        else:
            from scipy.sparse.linalg import splu

            normal = (self.free.T @ self.free).tocsc()
            self._shift = SHIFT * float(normal.diagonal().max())
            shifted = (normal + sp.identity(normal.shape[0], format="csc") * self._shift).tocsc()
            options = {"SymmetricMode": True}
            self._factor = splu(shifted, permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0, options=options)

    def _dense_null(self) -> Floats:
        """(rows, k) orthonormal self-stresses."""
        left, values, _ = np.linalg.svd(self.free.toarray(), full_matrices=True)
        rank = int(np.sum(values > SINGULAR * max(float(values.max(initial=0.0)), 1e-300)))
        return np.asarray(left[:, rank:])

    def project(self, lengths: Floats) -> Floats:
        """The part of the rows' elongations (rows, k) that no displacement of the joints can produce."""
        if self._null is None:
            rest, settled = self._projected(lengths)
            if settled or min(self.free.shape) > DENSE:
                return rest
            self._null = self._dense_null()
        return np.asarray(self._null @ (self._null.T @ lengths))

    def _projected(self, lengths: Floats) -> tuple[Floats, bool]:
        """The same by the sparse factor, and whether it settled. Each pass leaves the unreachable part alone and shrinks
        the reachable one by shift / (value**2 + shift), value being a singular value: weak ones are slow."""
        rest = lengths
        size = float(np.abs(lengths).max(initial=0.0))
        for _ in range(PASSES):
            step = self.free @ self._factor.solve(self.free.T @ rest)
            rest = rest - step
            if np.abs(step).max(initial=0.0) <= STILL * size:
                return np.asarray(rest), True
        return np.asarray(rest), False

    def _samples(self) -> Floats:
        """(rows, k) self-stresses that together load every row that any self-stress loads."""
        if self._null is not None:
            return self._null
        return self.project(np.random.default_rng(1).standard_normal((self.free.shape[0], 3)))

    def sway_samples(self) -> Floats:
        """(3j, k) joint displacements in global axes, of size one, that change no rigid member's length and move every
        joint that can move so."""
        moves = np.random.default_rng(2).standard_normal((self.free.shape[1], 3))
        if self._null is not None:
            _, values, right = np.linalg.svd(self.free.toarray(), full_matrices=True)
            rank = int(np.sum(values > SINGULAR * max(float(values.max(initial=0.0)), 1e-300)))
            moves = right[rank:].T
        else:
            # As in `project`: what changes a length shrinks with each pass, the rest stays.
            for _ in range(4):
                moves = self._shift * self._factor.solve(moves)
        whole = np.zeros((len(self.held), moves.shape[1]))
        whole[~self.held] = moves
        return np.asarray(support_axes(self.frame).T @ whole)

    def members(self) -> Bools:
        """(m,): True where the axial force is undetermined."""
        found = np.zeros(len(self.rigid), dtype=bool)
        if self.any:
            loaded = np.abs(self._samples()).max(axis=1, initial=0.0) > 1e-7
            found[self.rows] = loaded[: len(self.rows)]
        return found

    def reactions(self) -> Bools:
        """(j, 3): True where a reaction (global axes) is undetermined."""
        joints = len(self.frame.joints)
        if not self.any:
            return np.zeros((joints, 3), dtype=bool)
        along = self.turned.T @ self._samples()
        along[~self.held] = 0.0
        globally = support_axes(self.frame).T @ along
        return np.asarray((np.abs(globally).max(axis=1, initial=0.0) > 1e-7).reshape(joints, 3))

    def unfollowed(self, name: str, table: LoadTable) -> list[Problem]:
        """Problems of a case whose temperatures, misfits or settlements the axially rigid members or ties cannot
        follow."""
        if not self.any:
            return []
        t = self.frame.member_table
        heat = np.where(table.mean != 0.0, table.mean * t.alpha * t.clear, 0.0)
        moved = np.where(self.held, table.settlement.ravel(), 0.0)
        imposed = -(self.turned @ moved)
        imposed[: len(self.rows)] += (heat + table.misfit)[self.rows]
        size = float(np.abs(imposed).max(initial=0.0))
        if size == 0.0:
            return []
        rest = np.abs(self.project(imposed[:, None])[:, 0])
        stuck = np.flatnonzero(rest > FOLLOWS * size)
        if len(stuck) == 0:
            return []
        members, rigid = list(self.frame.members), len(self.rows)
        names = [members[self.rows[k]] for k in stuck[stuck < rigid]]
        line = self.frame.lines.get(f"loads.{name}")
        place = self.frame.file, line, f"loads.{name}"
        if not names:
            says = f"the ties cannot follow the settlement of case {name}: it would part joints that move together"
            return [Problem(*place, says, "leave the tie or the settlement out")]
        whose = "axially rigid members" if self.frame.analysis.axial == "elastic" else "an axially rigid frame"
        says = (
            f"{whose} cannot follow the temperature, misfit or settlement of case {name}: "
            f"it would change the length of {_listed(names)}"
        )
        return [Problem(*place, says, 'use axial = "elastic"')]


# --- axial forces that second order needs ------------------------------------------------------------


def _open_in_second_order(frame: Frame, redundancy: AxialRedundancy, axial: Bools) -> list[Problem]:
    """A problem where members that bend or turn have an undetermined axial force: its moment would be anybody's guess."""
    if frame.analysis.order != 2 or not axial.any():
        return []
    open_ones = np.flatnonzero(axial & ~_straight_and_still(frame, redundancy))
    if len(open_ones) == 0:
        return []
    names = list(frame.members)
    says = (
        f"in second order the axial force of {_listed([names[k] for k in open_ones])} matters, and an axially rigid frame "
        "leaves it undetermined"
    )
    line = frame.lines.get("analysis.order")
    return [Problem(frame.file, line, "analysis.order", says, 'use axial = "elastic"')]


def _straight_and_still(frame: Frame, redundancy: AxialRedundancy) -> Bools:
    """(m,): members whose chord no sway or settlement turns, whose ends no joint turns and which no load bends."""
    t, support = frame.member_table, frame.support_table
    gripped = connected(frame) | (t.zone > 0.0)
    turns = (gripped & (support.stiffness[t.ends, 2] != HELD)).any(axis=1)
    sways = np.abs(_chord_turns(frame, redundancy.sway_samples())).max(axis=1, initial=0.0) > 1e-7
    moved = turns | sways
    for name in frame.cases:
        table = load_table(frame, name)
        moved |= table.difference != 0.0
        moved[table.point_member[(table.point_across != 0.0) | (table.point_couple != 0.0)]] = True
        moved[table.line_member[(table.line_across != 0.0).any(axis=1)]] = True
        moved |= (table.settlement[t.ends] != 0.0).any(axis=(1, 2))
    return np.asarray(~moved)


def _chord_turns(frame: Frame, moves: Floats) -> Floats:
    """(m, k) clockwise chord rotation times length of every member under joint displacements (3j, k), global axes."""
    t = frame.member_table
    by_joint = moves.reshape(len(frame.joints), 3, -1)
    apart = by_joint[t.ends[:, 1]] - by_joint[t.ends[:, 0]]
    return np.asarray(t.sin[:, None] * apart[:, 0] - t.cos[:, None] * apart[:, 1])


# --- one-way supports whose reaction nobody knows ----------------------------------------------------


def _one_way_unknown(frame: Frame, reactions: Bools) -> list[Problem]:
    """A problem for each one-way support whose reaction is undetermined: nobody can say whether it works."""
    problems = []
    for support in frame.supports.values():
        one_way = support.x_only or support.y_only
        if one_way and reactions[frame.joint_index[support.joint], :2].any():
            says = f"the axially rigid frame leaves the reaction of the one-way support at {support.joint} undetermined"
            place = f"supports.{support.joint}"
            problems.append(Problem(frame.file, frame.lines.get(place), place, says, 'use axial = "elastic"'))
    return problems


# --- loads that nothing resists --------------------------------------------------------------------


def _unresisted(frame: Frame, name: str, table: LoadTable, turning: Bools, loose: Bools) -> list[Problem]:
    problems = []
    names = list(frame.joints)
    line = frame.lines.get(f"loads.{name}")
    for k in np.flatnonzero((table.joint[:, 2] != 0.0) & turning):
        says = f"a couple acts on joint {names[k]}, where every end is hinged and nothing resists rotation"
        problems.append(Problem(frame.file, line, f"loads.{name}", says, "put the couple on a member, or remove it"))
    for k in np.flatnonzero(loose.any(axis=1)):
        if _meets_freedom(frame, table.joint[k], int(k)):
            says = f"a load acts on joint {names[k]}, which nothing joins or holds in that direction"
            problems.append(Problem(frame.file, line, f"loads.{name}", says, "join a member to it, or remove the load"))
    return problems


def _meets_freedom(frame: Frame, load: Floats, k: int) -> bool:
    s = frame.support_table
    along = np.array([
        s.cos[k] * load[0] + s.sin[k] * load[1], -s.sin[k] * load[0] + s.cos[k] * load[1], load[2],
    ])  # fmt: skip
    free = s.stiffness[k] == 0.0
    return bool(np.any(np.abs(along[free]) > 1e-12 * max(float(np.abs(load).max()), 1e-300)))
