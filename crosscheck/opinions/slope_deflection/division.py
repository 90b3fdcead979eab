"""Second order inside a member: pieces, each with its own slope-deflection equation, and stretches inside the pieces.

On a stretch the loads are polynomials. With x from its start, v along local +y, b the counter-clockwise rotation of
the section, N the axial force (tension positive, varying with the along loads) and V the shear along the undisplaced
axis:

    M' = V + N v'      V' = w      b' = M/EI + k      (1 + N/(G As)) v' = b - V/(G As)

(Engesser 1891 for the last: shear strain = (V + N v')/(G As)). On stretches of stepped and tapered members 1/EI, 1/(G As)
and k are power series themselves (varying.py), and the EI by which values are scaled is a constant of the member. The
solution is a power series in x over the stretch's length. Stretches follow one another by transfer, which a very short one
cannot spoil; pieces are joined by stiffness, which a large axial force cannot spoil. Pieces are short enough that thirty
terms leave nothing and that none can buckle between clamped ends, so that the signs of the pivots of the whole matrix count
every critical load (W. H. Wittrick and F. W. Williams, "A general algorithm for computing natural frequencies of elastic
structures", Q. J. Mech. Appl. Math. 24 (1971), 263-284).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from crosscheck.frame.loads import SNAP, LoadTable
from crosscheck.frame.model import Floats, Frame, Ints
from crosscheck.opinions.slope_deflection.members import thermal_curvature
from crosscheck.opinions.slope_deflection.parting import LoadRuns, SplitLoads, split_loads
from crosscheck.opinions.slope_deflection.varying import property_cuts, property_series, softest

TERMS = 34
LONGEST = 1.5
"""Most that l sqrt(|N|/EI) may be on a piece: clamped ends buckle at 2 pi."""


@dataclass(frozen=True, slots=True)
class Division:
    """Nodes, pieces and stretches of every member's flexible part, for one case and one set of axial forces.

    Nodes (k,): member and distance from its `from` joint, sorted; first, last: (m,) the faces' nodes; force, couple: (k,)
      across forces and clockwise couples that act exactly there.
    Pieces (p,): `left` node (the right one is left + 1), member, length.
    Stretches (s,), sorted by member and start: their piece, member, start, length and rank in the piece; axial (s, 3) and
      load (s, 2) coefficients of N and w in powers of xi = x/length; jump (s, 2): force and couple at the start.
    """

    node_member: Ints
    node_x: Floats
    first: Ints
    last: Ints
    force: Floats
    couple: Floats
    left: Ints
    piece_member: Ints
    piece_length: Floats
    piece: Ints
    member: Ints
    start: Floats
    length: Floats
    rank: Ints
    axial: Floats
    load: Floats
    jump: Floats


def divide(frame: Frame, table: LoadTable, pulls: Floats) -> Division:
    """Divide every member for the axial force `pulls` (m,) at its `from` joint."""
    loads, runs = split_loads(frame, table), LoadRuns(frame, table)
    node_member, node_x = _nodes(frame, runs, loads, pulls)
    count = len(frame.members)
    first = np.searchsorted(node_member, np.arange(count))
    last = np.searchsorted(node_member, np.arange(count), side="right") - 1
    left = np.flatnonzero(node_member[1:] == node_member[:-1])
    member, start, end, on_node = _stretches(frame, loads, node_member, node_x)
    begins = np.searchsorted(_key(frame, node_member[left], node_x[left]), _key(frame, member, start), side="right") - 1
    rank = np.arange(len(member)) - np.searchsorted(begins, begins)
    axial, load = _polynomials(runs, pulls, member, start, end)
    at_nodes, jump = _point_loads(frame, loads, node_member, node_x, member, start, on_node)
    return Division(
        node_member, node_x, first, last, at_nodes[:, 0], at_nodes[:, 1], left, node_member[left],
        node_x[left + 1] - node_x[left], begins, member, start, end - start, rank, axial, load, jump,
    )  # fmt: skip


def _key(frame: Frame, member: Ints, x: Floats) -> Floats:
    """A number that sorts places by member and then by distance, the same for the same place."""
    return np.asarray(member + 0.5 * x / frame.member_table.length[member])


def _nodes(frame: Frame, runs: LoadRuns, loads: SplitLoads, pulls: Floats) -> tuple[Ints, Floats]:
    """The faces of every member, and equal divisions between them as the axial force asks for."""
    t = frame.member_table
    member, x = _breaks(frame, loads)
    left = np.flatnonzero(member[1:] == member[:-1])
    m, a, b = member[left], x[left], x[left + 1]
    on_stretch = np.abs([pulls[m] + axial for axial, _, _ in _three(runs, m, a, b)]).max(axis=0)
    largest = np.zeros(len(t.length))
    np.maximum.at(largest, m, on_stretch)
    bend, soft = 1.0 / (t.E * t.I), 1.0 / (t.G * t.shear_area)
    if t.varying.any():
        bend, soft = (np.where(t.varying, own, of) for own, of in zip(softest(frame), (bend, soft), strict=True))
    # With shear flexibility a piece behaves as if its bending stiffness were smaller.
    more = 10 * soft if frame.analysis.shear == "elastic" else 0.0
    parts = np.ceil(np.sqrt(largest * (t.clear**2 * bend + more)) / LONGEST).clip(1).astype(np.int64)
    owner = np.repeat(np.arange(len(parts)), parts + 1)
    step = np.arange(len(owner)) - np.repeat(np.cumsum(parts + 1) - (parts + 1), parts + 1)
    x = t.zone[owner, 0] + t.clear[owner] * step / parts[owner]
    x = np.where(step == parts[owner], (t.length - t.zone[:, 1])[owner], x)
    return owner, x


def _breaks(frame: Frame, loads: SplitLoads) -> tuple[Ints, Floats]:
    """Faces, point loads, ends of line loads and cuts of varying members on the flexible parts, sorted, each once."""
    t = frame.member_table
    every = np.arange(len(t.length))
    points, lines = loads.point_place == 1, loads.line_place == 1
    cut_member, cuts = property_cuts(frame) if t.varying.any() else (every[:0], t.length[:0])
    member = np.concatenate([every, every, loads.point_member[points], *[loads.line_member[lines]] * 2, cut_member])
    x = np.concatenate([
        t.zone[:, 0], t.length - t.zone[:, 1], loads.point_at[points], loads.line_start[lines], loads.line_end[lines], cuts,
    ])  # fmt: skip
    order = np.lexsort((x, member))
    member, x = member[order], x[order]
    fresh = np.ones(len(x), dtype=bool)
    fresh[1:] = (member[1:] != member[:-1]) | (x[1:] > x[:-1])
    return member[fresh], x[fresh]


def _stretches(
    frame: Frame, loads: SplitLoads, node_member: Ints, node_x: Floats
) -> tuple[Ints, Floats, Floats, np.ndarray]:
    """Member, start and end of every stretch between breaks and nodes; and whether it starts at a node. A break that
    misses a node by rounding alone is the node."""
    t = frame.member_table
    member, x = _breaks(frame, loads)
    member = np.concatenate([node_member, member])
    x = np.concatenate([node_x, x])
    is_node = np.arange(len(x)) < len(node_x)
    order = np.lexsort((~is_node, x, member))
    member, x, is_node = member[order], x[order], is_node[order]
    near = np.diff(x) <= SNAP * t.length[member[1:]]
    same = (member[1:] == member[:-1]) & near
    drop = np.zeros(len(x), dtype=bool)
    drop[1:] |= same & ~is_node[1:]
    drop[:-1] |= same & ~is_node[:-1] & is_node[1:]
    member, x, is_node = member[~drop], x[~drop], is_node[~drop]
    inner = np.flatnonzero(member[1:] == member[:-1])
    return member[inner], x[inner], x[inner + 1], is_node[inner]


def _point_loads(
    frame: Frame, loads: SplitLoads, node_member: Ints, node_x: Floats, member: Ints, start: Floats, on_node: np.ndarray
) -> tuple[Floats, Floats]:
    """(k, 2) force and couple on nodes, and (s, 2) those at the start of a stretch that starts between nodes."""
    points = np.flatnonzero(loads.point_place == 1)
    m, at = loads.point_member[points], loads.point_at[points]
    rows = np.stack([loads.point_force[points, 1], loads.point_couple[points]], axis=1)
    nodes, jump = np.zeros((len(node_x), 2)), np.zeros((len(start), 2))
    node = _nearest(frame, node_member, node_x, m, at)
    there = np.abs(node_x[node] - at) <= SNAP * frame.member_table.length[m]
    np.add.at(nodes, node[there], rows[there])
    between = np.flatnonzero(~on_node)
    if (~there).any():
        stretch = between[_nearest(frame, member[between], start[between], m[~there], at[~there])]
        np.add.at(jump, stretch, rows[~there])
    return nodes, jump


def _nearest(frame: Frame, member: Ints, x: Floats, m: Ints, at: Floats) -> Ints:
    """Index of the place of the same member that is nearest to each point."""
    key, wanted = _key(frame, member, x), _key(frame, m, at)
    right = np.searchsorted(key, wanted).clip(0, len(key) - 1)
    left = (right - 1).clip(0)
    return np.where(np.abs(key[left] - wanted) < np.abs(key[right] - wanted), left, right)


def _polynomials(runs: LoadRuns, pulls: Floats, m: Ints, a: Floats, b: Floats) -> tuple[Floats, Floats]:
    """Coefficients of N and w in powers of xi: parabola and line, from values at start, middle and end."""
    three = _three(runs, m, a, b)
    n0, n1, n2 = (pulls[m] + axial for axial, _, _ in three)
    v0, v1, v2 = (shear for _, shear, _ in three)
    axial = np.stack([n0, -3 * n0 + 4 * n1 - n2, 2 * (n0 - 2 * n1 + n2)], axis=1)
    load = np.stack([-3 * v0 + 4 * v1 - v2, 4 * (v0 - 2 * v1 + v2)], axis=1) / (b - a)[:, None]
    return axial, load


def _three(runs: LoadRuns, m: Ints, a: Floats, b: Floats) -> list[tuple[Floats, Floats, Floats]]:
    """Load sums just after the start, in the middle and just before the end of stretches without jumps inside."""
    after, before = np.ones(len(m), dtype=np.int64), np.full(len(m), -1)
    return [runs.sums(m, a, after), runs.sums(m, (a + b) / 2, after), runs.sums(m, b, before)]


@dataclass(frozen=True, slots=True)
class Pieces:
    """Slope-deflection of every piece: end forces = stiffness @ (v1, th1, v2, th2) + fixed.

    stiffness: (p, 4, 4), fixed: (p, 4); forces are V1, M1, V2, M2 on the piece, along local +y and clockwise; th
    clockwise. series: (s, TERMS, 4, 5) coefficients in xi of v/l, b, M l/EI, v' of every stretch for unit start values of
    (v/l, b, M l/EI, V l2/EI) and, last, for the loads and the free curvature alone; l is the stretch's length.
    lead: (s, 4, 5) the stretch's start values from those of its piece, likewise. bend: (p,) EI.
    """

    stiffness: Floats
    fixed: Floats
    series: Floats
    lead: Floats
    bend: Floats


def pieces(frame: Frame, table: LoadTable, division: Division) -> Pieces:
    """Solve the equations of every stretch by power series, join them by transfer and turn that into a stiffness."""
    t, m, length = frame.member_table, division.member, division.length
    bend = (t.E * t.I)[m]
    soft = bend / ((t.G * t.shear_area)[m] * length**2) if frame.analysis.shear == "elastic" else np.zeros(len(m))
    axial = division.axial * (length**2 / bend)[:, None]
    load = division.load * (length**3 / bend)[:, None]
    curve = thermal_curvature(frame, table)[m] * length
    series, end_shear = _series(axial, load, curve, soft)
    own = np.flatnonzero(t.varying[m])
    if len(own):
        series[own], end_shear[own] = _varying_series(frame, table, division, own, axial[own], load[own])
    through = series.sum(axis=1)
    through[:, 3] = end_shear
    lead, whole = _joined(division, through, bend)
    piece_bend = (t.E * t.I)[division.piece_member]
    stiffness, fixed = _stiffness(whole, piece_bend, division.piece_length)
    return Pieces(stiffness, fixed, series, lead, piece_bend)


GAUSS_POINTS, GAUSS_WEIGHTS = (0.5 * (a + b) for a, b in zip(np.polynomial.legendre.leggauss(10), (1.0, 0.0), strict=True))


def start_rows(division: Division, pieces: Pieces) -> Floats:
    """(p, 5, 5): a piece's start values v/l, b, M l/EI, V l2/EI and 1 from its end displacements v1, th1, v2, th2 and 1."""
    length, bend = division.piece_length, pieces.bend
    rows = np.zeros((len(length), 5, 5))
    rows[:, 0, 0], rows[:, 1, 1], rows[:, 4, 4] = 1.0 / length, -1.0, 1.0
    ends = np.concatenate([pieces.stiffness, pieces.fixed[:, :, None]], axis=2)
    rows[:, 2] = ends[:, 1] * (length / bend)[:, None]
    rows[:, 3] = ends[:, 0] * (length**2 / bend)[:, None]
    return rows


def softening(division: Division, pieces: Pieces, nodes: Floats, more: Floats) -> Floats:
    """(p, 4) change of the end forces V1, M1, V2, M2 of every piece, its ends where they are, as its axial force grows.

    more: (s, c) coefficients in powers of xi of what the axial force grows by on every stretch. The virtual work of the
    axial force on the slope gives the integral of more * v' * v_i', v_i for a unit displacement of the end alone: the
    change of the curve itself does no work (stationary potential).
    """
    d = division
    y = np.concatenate([nodes[d.left], nodes[d.left + 1], np.ones((len(d.left), 1))], axis=1)
    own = pieces.lead @ start_rows(d, pieces)[d.piece]
    powers = GAUSS_POINTS[:, None] ** np.arange(TERMS)
    by_start = np.einsum("gk,skc->sgc", powers, pieces.series[:, :, 3])
    slopes = by_start[:, :, :4] @ own
    slopes[:, :, 4] += by_start[:, :, 4]
    whole = np.einsum("sgc,sc->sg", slopes, y[d.piece])
    grown = more @ powers[:, : more.shape[1]].T
    rows = np.einsum("sg,sgi->si", whole * grown * GAUSS_WEIGHTS * d.length[:, None], slopes[:, :, :4])
    out = np.zeros((len(d.left), 4))
    np.add.at(out, d.piece, rows)
    return out


def _joined(division: Division, through: Floats, bend: Floats) -> tuple[Floats, Floats]:
    """Start values of every stretch and end values of every piece from the piece's start values, (s, 4, 5), (p, 4, 5).

    Stretches are scaled by their own length, pieces by theirs: v/l, b, M l/EI, V l2/EI.
    """
    d = division
    share = d.length / d.piece_length[d.piece]
    into = np.stack([1 / share, np.ones_like(share), share, share**2], axis=1)
    jump = np.zeros((len(share), 4))
    jump[:, 2] = d.jump[:, 1] * d.length / bend
    jump[:, 3] = d.jump[:, 0] * d.length**2 / bend
    state = np.zeros((len(d.piece_length), 4, 5))
    state[:, :, :4] = np.eye(4)
    lead = np.empty((len(share), 4, 5))
    for rank in range(int(d.rank.max(initial=-1)) + 1):
        now = np.flatnonzero(d.rank == rank)
        start = state[d.piece[now]] * into[now][:, :, None]
        start[:, :, 4] += jump[now]
        lead[now] = start
        end = through[now][:, :, :4] @ start
        end[:, :, 4] += through[now][:, :, 4]
        state[d.piece[now]] = end / into[now][:, :, None]
    return lead, state


def _series(axial: Floats, load: Floats, curve: Floats, soft: Floats) -> tuple[Floats, Floats]:
    """Power series in xi of v/l, b, M l/EI and v' for five solutions at once, and the shear V l2/EI at the end, (p, 5)."""
    p = len(curve)
    series = np.zeros((p, TERMS, 4, 5))
    shear = np.zeros((p, TERMS, 5))
    for k in range(3):
        series[:, 0, k, k] = 1.0
    shear[:, 0, 3] = 1.0
    shear[:, 1, 4], shear[:, 2, 4] = load[:, 0], load[:, 1] / 2
    give = 1.0 + soft * axial[:, 0]
    for k in range(TERMS):
        slope = series[:, k, 1] - soft[:, None] * shear[:, k]
        for j in (1, 2):
            if k >= j:
                slope -= (soft * axial[:, j])[:, None] * series[:, k - j, 3]
        series[:, k, 3] = slope / give[:, None]
        if k + 1 == TERMS:
            break
        pull = sum(axial[:, j, None] * series[:, k - j, 3] for j in range(3) if k >= j)
        series[:, k + 1, 0] = series[:, k, 3] / (k + 1)
        series[:, k + 1, 1] = series[:, k, 2] / (k + 1)
        series[:, k + 1, 2] = (shear[:, k] + pull) / (k + 1)
        if k == 0:
            series[:, 1, 1, 4] += curve
    return series, shear.sum(axis=1)


def _varying_series(
    frame: Frame, table: LoadTable, division: Division, rows: Ints, axial: Floats, load: Floats
) -> tuple[Floats, Floats]:
    """The same as `_series` on the stretches `rows` of varying members, for scaled axial forces and loads."""
    t, m, length = frame.member_table, division.member[rows], division.length[rows]
    scale = (t.E * t.I)[m]
    bend, shear, _, curve = property_series(frame, m, division.start[rows], length)
    give = bend * scale[:, None]
    hot = np.where(table.difference[m] != 0.0, table.difference[m] * length, 0.0)
    curve = np.where(hot[:, None] != 0.0, curve * hot[:, None], 0.0)
    soft = shear * (scale / length**2)[:, None] if frame.analysis.shear == "elastic" else np.zeros_like(give)
    lost = _product(soft, axial)
    force = np.zeros((len(rows), TERMS, 5))
    force[:, 0, 3] = 1.0
    force[:, 1, 4], force[:, 2, 4] = load[:, 0], load[:, 1] / 2
    series = np.zeros((len(rows), TERMS, 4, 5))
    for k in range(3):
        series[:, 0, k, k] = 1.0
    for k in range(TERMS):
        slope = series[:, k, 1] - _term(soft, force, k) - _term(lost[:, 1:], series[:, :, 3], k - 1)
        series[:, k, 3] = slope / (1.0 + lost[:, :1])
        if k + 1 == TERMS:
            break
        series[:, k + 1, 0] = series[:, k, 3] / (k + 1)
        series[:, k + 1, 1] = _term(give, series[:, :, 2], k) / (k + 1)
        series[:, k + 1, 1, 4] += curve[:, k] / (k + 1)
        series[:, k + 1, 2] = (force[:, k] + _term(axial, series[:, :, 3], k)) / (k + 1)
    return series, force.sum(axis=1)


def _product(one: Floats, other: Floats) -> Floats:
    """(s, TERMS) coefficients of a series times a polynomial."""
    out = np.zeros_like(one)
    for k, column in enumerate(other.T):
        out[:, k:] += one[:, : one.shape[1] - k] * column[:, None]
    return out


def _term(factor: Floats, series: Floats, k: int) -> Floats:
    """(s, 5): the coefficient of xi**k in the product of (s, n) and (s, TERMS, 5)."""
    last = min(k + 1, factor.shape[1])
    if last <= 0:
        return np.zeros((len(factor), series.shape[2]))
    return np.asarray(np.einsum("sj,sjc->sc", factor[:, :last], series[:, k - last + 1 : k + 1][:, ::-1]))


def _stiffness(end: Floats, bend: Floats, length: Floats) -> tuple[Floats, Floats]:
    """From the transfer (end values by start values) to end forces by end displacements.

    end: (p, 4, 5) v/l, b, M l/EI, V l2/EI at the end. Start values M and V follow from the end displacements.
    """
    p = len(bend)
    # Displacements (v1/l, b1, v2/l, b2) as five columns: four of them and the loads.
    given = np.zeros((p, 2, 5))
    given[:, :, 2:4] = np.eye(2)
    given[:, :, 0:2] -= end[:, 0:2, 0:2]
    given[:, :, 4] -= end[:, 0:2, 4]
    start = np.linalg.solve(end[:, 0:2, 2:4], given)
    far = end[:, 2:4, 2:4] @ start
    far[:, :, 0:2] += end[:, 2:4, 0:2]
    far[:, :, 4] += end[:, 2:4, 4]
    rows = np.stack([start[:, 1], start[:, 0], -far[:, 1], -far[:, 0]], axis=1)
    # b is counter-clockwise, th clockwise; forces and lengths get their units back.
    rows[:, :, (1, 3)] *= -1.0
    unit = np.stack([bend / length**2, bend / length, bend / length**2, bend / length], axis=1)
    rows = rows * unit[:, :, None]
    stiffness = rows[:, :, :4].copy()
    stiffness[:, :, (0, 2)] /= length[:, None, None]
    return (stiffness + stiffness.transpose(0, 2, 1)) / 2, rows[:, :, 4]
