"""From the library's vectors to what an opinion says: end actions, reactions, values along members.

Axes, signs and sums of reactions only, and the axially rigid frame as the limit of three elastic ones.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from crosscheck.answer import CaseAnswer, Undetermined
from crosscheck.frame.loads import SNAP, LoadTable
from crosscheck.frame.model import FREE, Floats, Frame, Ints
from crosscheck.opinions.library.mesh import Laid, Mesh, divide, lay
from crosscheck.opinions.library.model import Unfit, Vectors, solve

STIFFNESS_RATIO = 1e5
"""EA L^2 / EI from which an axially rigid frame's limit is taken."""
LIMIT_TRUSTED = 1e-6
"""Largest estimated error of that limit, as a share of the largest value of its kind."""


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


def solve_case(frame: Frame, table: LoadTable, stations: tuple[Ints, Floats] | None = None) -> Solved:
    """Divide, lay, solve and read. Raises model.Unfit where the library does not do what it was qualified for."""
    mesh = divide(frame, table, stations)
    laid = lay(frame, mesh, table)
    return _read(frame, table, mesh, laid, _vectors(frame, mesh, laid))


def _vectors(frame: Frame, mesh: Mesh, laid: Laid) -> Vectors:
    t = frame.member_table
    EI = t.E * t.I
    if frame.analysis.axial == "elastic":
        return solve(frame, mesh, laid, EI, t.E * t.A)
    ratios = (STIFFNESS_RATIO, 2.0 * STIFFNESS_RATIO, 4.0 * STIFFNESS_RATIO)
    return _rigid_limit([solve(frame, mesh, laid, EI, c * EI / t.length**2) for c in ratios])


def _rigid_limit(at: list[Vectors]) -> Vectors:
    """The limit of c -> infinity from c, 2c, 4c: a series in 1/c, of which two terms are removed.

    After L. F. Richardson, Phil. Trans. R. Soc. A 226 (1927), 299-361. The change that the second removal makes
    estimates what is left; raises Unfit where it is large.
    """
    out = []
    for parts in ([v.pieces for v in at], [v.nodes for v in at]):
        once = 2.0 * parts[2] - parts[1]
        twice = (8.0 * parts[2] - 6.0 * parts[1] + parts[0]) / 3.0
        change, size = np.abs(twice - once), np.abs(twice)
        axes = tuple(range(size.ndim - 1))
        if (change.max(axis=axes) > LIMIT_TRUSTED * size.max()).any():
            raise Unfit("the limit of axial rigidity is not reached surely enough")
        out.append(twice)
    return Vectors(*out)


def _read(frame: Frame, table: LoadTable, mesh: Mesh, laid: Laid, vectors: Vectors) -> Solved:
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
