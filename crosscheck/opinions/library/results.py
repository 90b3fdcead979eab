"""From the library's vectors to what an opinion says: end actions, reactions, values along members.

Axes, signs and sums of reactions only, and the axially rigid frame as the limit of three elastic ones.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from crosscheck.answer import CaseAnswer, Undetermined
from crosscheck.frame.loads import SNAP, LoadTable
from crosscheck.frame.model import FREE, Floats, Frame, Ints
from crosscheck.opinions.library.mesh import Laid, Mesh, divide, lay
from crosscheck.opinions.library.model import Unfit, Vectors, solve, to_global

STIFFNESS_RATIOS = (3e4, 1e6, 3e7)
"""EA / L as a multiple of the stiffest member's EI / L^3, from which the limit of axial rigidity is taken: a further
one where the one before does not do. A higher one costs digits, a lower one leaves more of the series."""
LIMIT_SURE, LIMIT_TRUSTED = 1e-7, 1e-6
"""Estimated error of that limit with which a ratio does, and above which no word is given."""
TRACE = 1e-4
"""Share of the largest force times L^3 / EI below which displacements count as none: the joints of many an axially
rigid frame stay still, and rounding has no size of its own."""


@dataclass(frozen=True, slots=True)
class Solved:
    """One case on one mesh.

    ends: (m, 2, 3) end actions. cuts: (places, 2, 3) axial, shear, moment just before and after a place; NaN where a
    restated load hides them. joints: (j, 3). across: (places,) displacement along the member's y.
    """

    mesh: Mesh
    ends: Floats
    cuts: Floats
    joints: Floats
    across: Floats


def solve_case(frame: Frame, table: LoadTable) -> Solved:
    """Divide at the loads, lay them, solve and read, in the frame's idealisation.

    Raises model.Unfit where the library does not do what it was qualified for.
    """
    mesh = divide(frame, table)
    laid = lay(frame, mesh, table)
    return _read(frame, mesh, laid, _vectors(frame, mesh, laid))


def solve_once(frame: Frame, table: LoadTable, stations: tuple[Ints, Floats]) -> Solved:
    """The same of an axially elastic frame, divided at `stations` (member indices, distances) too, without refinement.

    Raises model.Unfit as solve_case does.
    """
    mesh = divide(frame, table, stations)
    laid = lay(frame, mesh, table)
    t = frame.member_table
    return _read(frame, mesh, laid, solve(frame, mesh, _node_forces(frame, mesh, laid), laid.line, t.E * t.I, t.E * t.A))


def _vectors(frame: Frame, mesh: Mesh, laid: Laid) -> Vectors:
    t = frame.member_table
    if frame.analysis.axial == "elastic":
        return _refined(frame, mesh, laid, t.E * t.A)
    # One stiffness EA / L for all members: a slender one must not stretch under what a stout neighbour brings to it.
    stiffest = float((t.E * t.I / t.length**3).max())
    supple = float(np.median(t.length**3 / (t.E * t.I)))
    tried = []
    for ratio in STIFFNESS_RATIOS:
        three = [_refined(frame, mesh, laid, c * ratio * stiffest * t.length) for c in (1.0, 2.0, 4.0)]
        tried.append(_rigid_limit(three, float(t.length.max()), supple))
        if tried[-1][1] <= LIMIT_SURE:
            break
    vectors, error = min(tried, key=lambda limit: limit[1])
    if error > LIMIT_TRUSTED:
        raise Unfit("the limit of axial rigidity is not reached surely enough")
    return vectors


def _refined(frame: Frame, mesh: Mesh, laid: Laid, EA: Floats) -> Vectors:
    """Its answer, and its answer to what that leaves out of balance at the nodes by rounding, added (J. H. Wilkinson,
    Rounding Errors in Algebraic Processes, 1963): flexible frames of stiff members need those digits."""
    EI = frame.member_table.E * frame.member_table.I
    force = _node_forces(frame, mesh, laid)
    first = solve(frame, mesh, force, laid.line, EI, EA)
    more = solve(frame, mesh, force - first.taken, np.zeros_like(laid.line), EI, EA)
    return Vectors(first.pieces + more.pieces, first.nodes + more.nodes, first.taken + more.taken)


def _node_forces(frame: Frame, mesh: Mesh, laid: Laid) -> Floats:
    """(nodes, 3) global fx, fy, clockwise couple: joint loads and what is laid at the members' places."""
    t = frame.member_table
    force = np.zeros((mesh.nodes, 3))
    force[: len(laid.joint)] = laid.joint
    np.add.at(force, mesh.node, to_global(laid.force, t.cos[mesh.member], t.sin[mesh.member]))
    return force


def _rigid_limit(at: Sequence[Vectors], length: float, supple: float) -> tuple[Vectors, float]:
    """The limit of c -> infinity from c, 2c, 4c, a series in 1/c of which two terms are removed, and its error.

    After L. F. Richardson, Phil. Trans. R. Soc. A 226 (1927), 299-361. The error is estimated by the change that the
    second removal makes, as a share of the largest force or displacement; `length` makes couples and rotations such,
    `supple` (displacement per force) displacements of the largest force.
    """
    pieces, change, force = _limit([v.pieces for v in at], 1.0 / length)
    nodes, shift, moved = _limit([v.nodes for v in at], length)
    if force == 0.0:
        return Vectors(pieces, nodes, at[-1].taken), 0.0
    return Vectors(pieces, nodes, at[-1].taken), max(change / force, shift / max(moved, TRACE * supple * force))


def _limit(at: Sequence[Floats], third: float) -> tuple[Floats, float, float]:
    """The limit, the change and the size; `third` brings the last axis's third value to the kind of the first two."""
    one, two, four = at
    limit = (8.0 * four - 6.0 * two + one) / 3.0
    change = limit - (2.0 * four - two)
    kinds = [1.0, 1.0, third]
    return limit, float(np.abs(change * kinds).max()), float(np.abs(limit * kinds).max())


def _read(frame: Frame, mesh: Mesh, laid: Laid, vectors: Vectors) -> Solved:
    first, last = mesh.first[:-1], mesh.first[1:] - 1
    ends = np.stack([vectors.pieces[first, 0], vectors.pieces[last - 1, 1]], axis=1)
    # What a member's own loads put on its joints acts between the joint and the member: the end action includes it.
    ends -= np.stack([laid.force[first], laid.force[last]], axis=1)
    ends[:, 0, 0] *= -1.0
    cuts = _cuts(mesh, laid, vectors.pieces, ends)
    t = frame.member_table
    dx, dy, _ = vectors.nodes[mesh.node].T
    across = np.where(laid.clear_across, dy * t.cos[mesh.member] - dx * t.sin[mesh.member], np.nan)
    return Solved(mesh, ends, cuts, vectors.nodes[: len(frame.joints)], across)


def _cuts(mesh: Mesh, laid: Laid, pieces: Floats, ends: Floats) -> Floats:
    """Axial, shear, moment on either side of each place; a cut's far face is reversed, so the signs differ by side."""
    cuts = np.full((len(mesh.x), 2, 3), np.nan)
    starts = mesh.pieces
    cuts[starts, 1] = pieces[starts, 0] * [-1.0, 1.0, 1.0]
    cuts[starts + 1, 0] = pieces[starts, 1] * [1.0, -1.0, -1.0]
    cuts[mesh.first[:-1], 0] = ends[:, 0]
    cuts[mesh.first[1:] - 1, 1] = ends[:, 1] * [1.0, -1.0, -1.0]
    cuts[~laid.clear] = np.nan
    return cuts


def case_answer(frame: Frame, table: LoadTable, solved: Solved, undetermined: Undetermined) -> CaseAnswer:
    """The case as an opinion gives it: NaN for what is undetermined."""
    joints = np.where(undetermined.joints, np.nan, solved.joints)
    at_supports = np.where(undetermined.reactions, np.nan, reactions(frame, table, solved.ends))
    return CaseAnswer(solved.ends, joints, at_supports)


def reactions(frame: Frame, table: LoadTable, ends: Floats) -> Floats:
    """(j, 3) what the members' ends take from each joint less the load on it, in its support's directions."""
    t, s = frame.member_table, frame.support_table
    needed = -table.joint
    for side, outward in ((0, -1.0), (1, 1.0)):
        along, across = outward * ends[:, side, 0], ends[:, side, 1]
        fx, fy = along * t.cos - across * t.sin, along * t.sin + across * t.cos
        np.add.at(needed, t.ends[:, side], np.column_stack([fx, fy, ends[:, side, 2]]))
    # Through the support's own axes, so that a free direction is nothing and not rounding.
    fx, fy, couple = needed.T
    own = np.column_stack([fx * s.cos + fy * s.sin, fy * s.cos - fx * s.sin, couple])
    own[s.stiffness == FREE] = 0.0
    x, y, couple = own.T
    return np.column_stack([x * s.cos - y * s.sin, x * s.sin + y * s.cos, couple])


def along(frame: Frame, solved: Solved, member: Ints, x: Floats, side: Ints) -> Floats:
    """(n, 4) axial, shear, moment, across at those of the asked places that are places of the mesh; NaN elsewhere."""
    mesh, length = solved.mesh, frame.member_table.length
    # Two apart, members cannot meet at a joint: one ascending key serves all of them.
    key = 2.0 * mesh.member + mesh.x / length[mesh.member]
    wanted = 2.0 * member + x / length[member]
    right = np.clip(np.searchsorted(key, wanted), 1, len(key) - 1)
    place = np.where(wanted - key[right - 1] <= key[right] - wanted, right - 1, right)
    found = (mesh.member[place] == member) & (np.abs(mesh.x[place] - x) <= SNAP * length[member])
    out = np.column_stack([solved.cuts[place, (side > 0).astype(np.int64)], solved.across[place]])
    out[~found] = np.nan
    return out
