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
from crosscheck.frame.model import FREE, HELD, Bools, Floats, Frame, MemberTable
from crosscheck.opinions.moment_distribution.pieces import NODES, WEIGHTS, Pieces, summed


@dataclass(frozen=True, slots=True)
class Members:
    """All members, (m,) or (m, 2, 2) with the `from` end first.

    bend, slide, stretch: flexibilities 1/EI, 1/(G shear_area), 1/EA of the flexible part; zero where rigid.
    rigid: axially rigid. face: clockwise face moments per face rotation against the chord. lever: E. joint: E' face
    E, the moments at the joints per rotation of the joints against the chord. axial: EA/clear, zero where rigid.
    """

    table: MemberTable
    bend: Floats
    slide: Floats
    stretch: Floats
    rigid: Bools
    face: Floats
    lever: Floats
    joint: Floats
    axial: Floats


@dataclass(frozen=True, slots=True)
class FixedEnds:
    """One case, all joints held: clockwise moments (m, 2) on the ends at the joints, and the rest of the member's
    statics.

    shear: (m, 2) the end shears of the simple beam from joint to joint, to which the end moments' own come.
    along: (m,) sum of the loads along local x. lengthening: (m,) how much longer the member would become if its
    `from` end carried no axial force.
    """

    moment: Floats
    shear: Floats
    along: Floats
    lengthening: Floats


def members(frame: Frame) -> Members:
    """Stiffness of every member of the frame under its idealisation."""
    t, analysis = frame.member_table, frame.analysis
    bend = 1 / (t.E * t.I)
    slide = 1 / (t.G * t.shear_area) if analysis.shear == "elastic" else np.zeros_like(bend)
    rigid = np.full(len(bend), analysis.axial == "rigid")
    stretch = np.where(rigid, 0.0, 1 / (t.E * t.A))
    face = _face_stiffness(_released_rotations(t.clear, bend), slide / t.clear, t.turn)
    reach = t.zone / t.clear[:, None]
    lever = np.eye(2) + np.stack([reach, reach], axis=1)
    joint = np.swapaxes(lever, 1, 2) @ face @ lever
    axial = np.where(rigid, 0.0, 1 / np.where(rigid, 1.0, stretch * t.clear))
    return Members(t, bend, slide, stretch, rigid, face, lever, joint, axial)


def _released_rotations(clear: Floats, bend: Floats) -> Floats:
    """(m, 2, 2) clockwise end rotations of the simple beam under unit clockwise end moments, bending alone.

    Unit moment at the `from` end gives the bending moment 1 - x/L, at the `to` end -x/L; rotation by virtual work is
    the integral of their product over EI.
    """
    unit = np.stack([1 - NODES, -NODES])
    return (bend * clear)[:, None, None] * ((unit * WEIGHTS) @ unit.T)


def _face_stiffness(free: Floats, slip: Floats, turn: Floats) -> Floats:
    """(m, 2, 2) inverse of the rotations of the simple beam: bending `free`, shear `slip` in all four, end
    connections.

    slip: (m,) 1/(G shear_area L): a unit end moment makes the shear -1/L all along. turn: (m, 2) connection
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
    return FixedEnds(moment, shear, pieces.along[pieces.last], _lengthening(m, loads, pieces))


def _loaded_rotations(m: Members, loads: LoadTable, pieces: Pieces, at_faces: Floats) -> Floats:
    """(m, 2) clockwise rotations of the faces of the flexible part, simply supported, from loads and temperature."""
    t = m.table
    p = np.flatnonzero(pieces.inner)
    k = pieces.member[p]
    s = pieces.size[p, None] * NODES
    x = pieces.start[p, None] + s
    share = (x - t.zone[k, :1]) / t.clear[k, None]
    chord = at_faces[k, :1] * (1 - share) + at_faces[k, 1:] * share
    slope = ((at_faces[:, 1] - at_faces[:, 0]) / t.clear)[k, None]
    moment = pieces.moment_at(p[:, None], s) - chord
    shear = pieces.shear_at(p[:, None], s) - slope
    curvature = moment * m.bend[k, None] + thermal_curvature(t, loads)[k, None]
    # The virtual shear of a unit moment at either end is -1/L.
    slip = -shear * m.slide[k, None] / t.clear[k, None]
    weight = WEIGHTS * pieces.size[p, None]
    near = ((curvature * (1 - share) + slip) * weight).sum(axis=1)
    far = ((-curvature * share + slip) * weight).sum(axis=1)
    count = len(t.length)
    return np.column_stack([summed(k, near, count), summed(k, far, count)])


def thermal_curvature(t: MemberTable, loads: LoadTable) -> Floats:
    """(m,) sagging curvature alpha difference / depth: the warmer -y face is the longer one."""
    some = loads.difference != 0
    return np.where(some, np.where(some, t.alpha, 0.0) * loads.difference / np.where(some, t.depth, 1.0), 0.0)


def _lengthening(m: Members, loads: LoadTable, pieces: Pieces) -> Floats:
    """(m,) lengthening without axial force at the `from` end: loads along the member, temperature, misfit."""
    t = m.table
    p = np.flatnonzero(pieces.inner)
    k = pieces.member[p]
    strain = -pieces.along_at(p[:, None], pieces.size[p, None] * NODES) * m.stretch[k, None]
    by_loads = summed(k, (strain * WEIGHTS).sum(axis=1) * pieces.size[p], len(t.length))
    warm = loads.mean != 0
    return by_loads + np.where(warm, t.alpha, 0.0) * loads.mean * t.clear + loads.misfit
