"""What a member does with its joints held: rotational stiffness, carry-over, fixed-end moments and forces.

By flexibility and moment-area: the flexible part is set free at both faces as a simple beam, its end rotations under
unit end moments and under its loads are integrated by Gauss's rule, and the end moments that undo them follow (Mohr's
theorems; H. Cross, "Analysis of Continuous Frames by Distributing Fixed-End Moments", Trans. ASCE 96, 1932).

A rigid zone turns with its joint, so the rotations of the faces against the chord between them are E (theta - psi),
theta the rotations of the joints, psi the chord rotation from joint to joint, all clockwise, and by virtual work the
moments at the joints are E' times those at the faces.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import FREE, HELD, Bools, Floats, Frame, Ints, MemberTable
from crosscheck.opinions.moment_distribution.pieces import NODES, WEIGHTS, Pieces, cut, summed
from crosscheck.opinions.moment_distribution.varying import (
    FINE_NODES,
    FINE_WEIGHTS,
    Flexibility,
    Varying,
    by_rule,
    middles,
    varying,
)


@dataclass(frozen=True, slots=True)
class Members:
    """All members, (m,) or (m, 2, 2) with the `from` end first.

    bend, slide, stretch: flexibilities 1/EI, 1/(G shear_area), 1/EA of the flexible part; zero where rigid. Those of
    stepped and tapered members are in `varying`, and here means. face: clockwise face moments per face rotation against
    the chord. lever: E. joint: E' face E, the moments at the joints per rotation of the joints against the chord.
    held: axial force per lengthening with both ends held, EA/clear; zero where axially rigid. axial: the same, but zero
    in slack members, whose ends move without it.
    """

    table: MemberTable
    bend: Floats
    slide: Floats
    stretch: Floats
    face: Floats
    lever: Floats
    joint: Floats
    held: Floats
    axial: Floats
    varying: Varying | None

    @property
    def rigid(self) -> Bools:
        """(m,) axially rigid."""
        return self.table.rigid

    def flexibility(self, pieces: Pieces, piece: Ints, s: Floats) -> Flexibility:
        """At distances s (n, g) from the start of pieces (n,): (n, g), or (n, 1) where it does not change."""
        k = pieces.member[piece]
        if self.varying is None or not self.varying.where[k].any():
            return Flexibility(self.bend[k, None], self.slide[k, None], self.stretch[k, None], np.ones((1, 1)))
        bend, slide, stretch = (np.repeat(v[k, None], s.shape[1], 1) for v in (self.bend, self.slide, self.stretch))
        found = Flexibility(bend, slide, stretch, np.ones(s.shape))
        at = np.flatnonzero(self.varying.where[k])
        x = pieces.start[piece[at], None] + s[at]
        for whole, part in zip(found, self.varying.at(k[at], middles(pieces, piece[at]), x), strict=True):
            whole[at] = part
        return found


@dataclass(frozen=True, slots=True)
class FixedEnds:
    """One case, all joints held: clockwise moments (m, 2) on the ends at the joints, and the rest of the member's
    statics.

    shear: (m, 2) the end shears of the simple beam from joint to joint, to which the end moments' own come.
    along: (m,) sum of the loads along local x. by_loads: (m,) how much longer these would make the member if its `from`
    end carried no axial force. free: (m,) how much longer temperature and misfit make it.
    """

    moment: Floats
    shear: Floats
    along: Floats
    by_loads: Floats
    free: Floats

    @property
    def lengthening(self) -> Floats:
        """(m,) how much longer the member would become if its `from` end carried no axial force."""
        return self.by_loads + self.free


def members(frame: Frame) -> Members:
    """Stiffness of every member of the frame under its idealisation."""
    t = frame.member_table
    bend = 1 / (t.E * t.I)
    slide = 1 / (t.G * t.shear_area) if frame.analysis.shear == "elastic" else np.zeros_like(bend)
    stretch = np.where(t.rigid, 0.0, 1 / (t.E * t.A))
    some = varying(frame, t.rigid)
    free, slip, give = _released_rotations(t.clear, bend), slide / t.clear, stretch * t.clear
    if some is not None:
        _varying_rotations(some, t, free, slip, give)
    face = _face_stiffness(free, slip, t.turn)
    reach = t.zone / t.clear[:, None]
    lever = np.eye(2) + np.stack([reach, reach], axis=1)
    joint = np.swapaxes(lever, 1, 2) @ face @ lever
    held = np.where(t.rigid, 0.0, 1 / np.where(t.rigid, 1.0, give))
    return Members(t, bend, slide, stretch, face, lever, joint, held, np.where(t.slack, 0.0, held), some)


def cut_up(m: Members, loads: LoadTable, further: tuple[Ints, Floats] | None = None) -> Pieces:
    """The members cut at every place of change of a case's loads and of their own sections, and at `further` ones."""
    t = m.table
    if m.varying is None:
        return cut(t, loads, further)
    every = np.arange(len(t.length))
    owner = [every, every, every, every, loads.point_member, loads.line_member, loads.line_member]
    x = [0.0 * t.length, t.zone[:, 0], t.length - t.zone[:, 1], t.length, loads.point_at, loads.line_start, loads.line_end]
    if further is not None:
        owner.append(further[0])
        x.append(further[1])
    marks, at = m.varying.marks_beside(np.concatenate(owner), np.concatenate(x))
    if further is not None:
        marks, at = np.concatenate([marks, further[0]]), np.concatenate([at, further[1]])
    return cut(t, loads, (marks, at))


def _released_rotations(clear: Floats, bend: Floats) -> Floats:
    """(m, 2, 2) clockwise end rotations of the simple beam under unit clockwise end moments, bending alone.

    Unit moment at the `from` end gives the bending moment 1 - x/L, at the `to` end -x/L; rotation by virtual work is
    the integral of their product over EI.
    """
    unit = np.stack([1 - NODES, -NODES])
    return (bend * clear)[:, None, None] * ((unit * WEIGHTS) @ unit.T)


def _varying_rotations(some: Varying, t: MemberTable, free: Floats, slip: Floats, give: Floats) -> None:
    """Put in those of stepped and tapered members: the same integrals length by length, with the integrals of
    1/(G shear_area)/L^2, and of 1/EA, the lengthening per axial force."""
    count = len(t.length)
    k, start, size = some.lengths(t.zone)
    x = start[:, None] + size[:, None] * FINE_NODES
    here = some.at(k, start + size / 2, x)
    share = (x - t.zone[k, :1]) / t.clear[k, None]
    unit, weight = (1 - share, -share), size[:, None] * FINE_WEIGHTS
    at = some.where
    for a, b in ((0, 0), (0, 1), (1, 0), (1, 1)):
        free[at, a, b] = summed(k, (weight * here.bend * unit[a] * unit[b]).sum(axis=1), count)[at]
    slip[at] = (summed(k, (weight * here.slide).sum(axis=1), count) / t.clear**2)[at]
    give[at] = summed(k, (weight * here.stretch).sum(axis=1), count)[at]


def _face_stiffness(free: Floats, slip: Floats, turn: Floats) -> Floats:
    """(m, 2, 2) inverse of the rotations of the simple beam: bending `free`, shear `slip` in all four, end
    connections.

    slip: (m,) the mean of 1/(G shear_area L): a unit end moment makes the shear -1/L all along. turn: (m, 2) connection
    stiffness. The determinant is written as a sum without cancellation, so that great shear or soft connections cost
    no digits.
    """
    hinge = turn == FREE
    soft = np.zeros_like(turn)
    sprung = ~hinge & (turn != HELD)
    soft[sprung] = 1 / turn[sprung]
    aa, bb, ab = free[:, 0, 0], free[:, 1, 1], free[:, 0, 1]
    own_a, own_b = aa + soft[:, 0] + slip, bb + soft[:, 1] + slip
    determinant = (
        (aa * bb - ab * ab) + soft[:, 0] * bb + soft[:, 1] * aa + soft[:, 0] * soft[:, 1]
        + slip * (aa + bb - 2 * ab + soft[:, 0] + soft[:, 1])
    )  # fmt: skip
    k = np.empty_like(free)
    k[:, 0, 0], k[:, 1, 1] = own_b / determinant, own_a / determinant
    k[:, 0, 1] = k[:, 1, 0] = -(ab + slip) / determinant
    # A hinge leaves the far end alone to resist, as a beam pinned here.
    for end, far, alone in ((0, 1, 1 / own_b), (1, 0, 1 / own_a)):
        gone = hinge[:, end]
        k[gone, far, far] = alone[gone]
        k[gone, end, :] = k[gone, :, end] = 0.0
    k[hinge.all(axis=1)] = 0.0
    return k


def fixed_ends(m: Members, loads: LoadTable, pieces: Pieces) -> FixedEnds:
    """Fixed-end moments and forces of one case by moment-area on the flexible part."""
    t = m.table
    total_moment, total_shear = pieces.moment[pieces.last], pieces.shear[pieces.last]
    before, behind = pieces.face[:, 0], pieces.face[:, 1]
    # Sagging moments just outside the two faces, in the beam that is free at its `from` end ...
    at_faces = np.column_stack([pieces.moment_at(before, pieces.size[before]), pieces.moment[behind]])
    rotation = _loaded_rotations(m, loads, pieces, at_faces)
    held = -np.einsum("mij,mj->mi", m.face, rotation)
    # ... and in the beam simply supported at its joints, as clockwise moments on the faces.
    where = np.column_stack([t.zone[:, 0], t.length - t.zone[:, 1]]) / t.length[:, None]
    simple = (at_faces - total_moment[:, None] * where) * [1.0, -1.0]
    moment = np.einsum("mji,mj->mi", m.lever, held - simple)
    support = -total_moment / t.length
    shear = np.column_stack([support, -total_shear - support])
    warm = loads.mean != 0
    free = np.where(warm, t.alpha, 0.0) * loads.mean * t.clear + loads.misfit
    return FixedEnds(moment, shear, pieces.along[pieces.last], _longer_by_loads(m, pieces), free)


def _loaded_rotations(m: Members, loads: LoadTable, pieces: Pieces, at_faces: Floats) -> Floats:
    """(m, 2) clockwise rotations of the faces of the flexible part, simply supported, from loads and temperature."""
    t, count = m.table, len(m.table.length)
    thermal = thermal_curvature(t, loads)
    slope = (at_faces[:, 1] - at_faces[:, 0]) / t.clear
    inner = np.flatnonzero(pieces.inner)
    found = np.zeros((count, 2))
    for which, nodes, weights in by_rule(m.varying, pieces.member[inner]):
        p = inner[which]
        k = pieces.member[p]
        s = pieces.size[p, None] * nodes
        here = m.flexibility(pieces, p, s)
        share = (pieces.start[p, None] + s - t.zone[k, :1]) / t.clear[k, None]
        chord = at_faces[k, :1] * (1 - share) + at_faces[k, 1:] * share
        moment = pieces.moment_at(p[:, None], s) - chord
        shear = pieces.shear_at(p[:, None], s) - slope[k, None]
        curvature = moment * here.bend + thermal[k, None] * here.curl
        # The virtual shear of a unit moment at either end is -1/L.
        slip = -shear * here.slide / t.clear[k, None]
        weight = weights * pieces.size[p, None]
        near = ((curvature * (1 - share) + slip) * weight).sum(axis=1)
        far = ((-curvature * share + slip) * weight).sum(axis=1)
        found += np.column_stack([summed(k, near, count), summed(k, far, count)])
    return found


def thermal_curvature(t: MemberTable, loads: LoadTable) -> Floats:
    """(m,) sagging curvature alpha difference / depth: the warmer -y face is the longer one. A varying depth counts
    with its mean, of which `Flexibility.curl` is then the correction."""
    some = loads.difference != 0
    return np.where(some, np.where(some, t.alpha, 0.0) * loads.difference / np.where(some, t.depth, 1.0), 0.0)


def _longer_by_loads(m: Members, pieces: Pieces) -> Floats:
    """(m,) lengthening by the loads along the member, without axial force at its `from` end."""
    inner, count = np.flatnonzero(pieces.inner), len(m.table.length)
    found = np.zeros(count)
    for which, nodes, weights in by_rule(m.varying, pieces.member[inner]):
        p = inner[which]
        s = pieces.size[p, None] * nodes
        strain = -pieces.along_at(p[:, None], s) * m.flexibility(pieces, p, s).stretch
        found += summed(pieces.member[p], (strain * weights).sum(axis=1) * pieces.size[p], count)
    return found
