"""Slope-deflection coefficients and fixed-end actions of single members, in closed form.

The flexible part of a member lies between the faces of its rigid zones; `clear` is its length l, x runs from the
`from` face. Forces P act along local +y, couples C clockwise, line loads w along local +y. Formulas here stand on
purpose a second and third time in the other opinion and in the audit, each by another road.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from crosscheck.frame.loads import LoadTable
from crosscheck.frame.model import Floats, Frame, Ints
from crosscheck.opinions.slope_deflection.parting import SplitLoads, load_moments, split_loads
from crosscheck.opinions.slope_deflection.varying import flexibility, simple_beam


@dataclass(frozen=True, slots=True)
class Coefficients:
    """The generalised slope-deflection equation M = stiffness @ phi + FEM of every member.

    stiffness: (m, 2, 2) end moments (at the faces) from end rotations against the chord, force*length per radian.
    axial: (m,) axial force per elongation, force/length; NaN where the member is axially rigid, 0 where it is slack.
    """

    stiffness: Floats
    axial: Floats


def coefficients(frame: Frame) -> Coefficients:
    """Slope-deflection coefficients from the flexibility of the member as a simple beam.

    A simple beam under clockwise end moments turns by
        phi_1 = (l/3EI + 1/(G As l)) M_1 + (-l/6EI + 1/(G As l)) M_2
    (a stepped or tapered one as in varying.py) and a connection of stiffness k adds M/k. With g = k/(k + s), s = EI/l,
    which is 1 for a rigid end and 0 for a hinge, the inverse is G (F G + (1 - G)/s)^-1: hinges need no separate formula,
    and any other s gives the same. Plain ends give 4s and 2s, a far hinge 3s.
    """
    t = frame.member_table
    s = t.E * t.I / t.clear
    shear = s / (t.G * t.shear_area * t.clear) if frame.analysis.shear == "elastic" else np.zeros_like(s)
    grip = np.where(np.isinf(t.turn), 1.0, t.turn / (np.where(np.isinf(t.turn), 0.0, t.turn) + s[:, None]))
    near, cross, far, axial = 1.0 / 3.0 + shear, -1.0 / 6.0 + shear, 1.0 / 3.0 + shear, t.E * t.A / t.clear
    if t.varying.any():
        v = flexibility(frame)
        for whole, own in ((near, v.near), (cross, v.cross), (far, v.far)):
            whole[v.member] = own * s[v.member]
        axial[v.member] = 1.0 / v.pull
    g1, g2 = grip[:, 0], grip[:, 1]
    a11, a12 = near * g1 + 1.0 - g1, cross * g2
    a21, a22 = cross * g1, far * g2 + 1.0 - g2
    scale = s / (a11 * a22 - a12 * a21)
    stiffness = np.empty((len(s), 2, 2))
    stiffness[:, 0, 0] = g1 * a22 * scale
    stiffness[:, 1, 1] = g2 * a11 * scale
    stiffness[:, 0, 1] = stiffness[:, 1, 0] = -g1 * a12 * scale
    return Coefficients(stiffness, np.where(t.rigid, np.nan, np.where(t.slack, 0.0, axial)))


@dataclass(frozen=True, slots=True)
class FixedEnds:
    """Actions on the members of one case with every joint held, and the free elongation.

    moments: (m, 2) clockwise at the faces. axial: (m,) at the `from` face, without the effect of `stretch`.
    stretch: (m,) elongation that temperature and misfit would give a free member.
    between: (m, 3) on the flexible part: sum of along forces, sum of across forces, clockwise moment of across
      forces and couples about the `to` face.
    zones: (m, 2, 3) on each rigid zone: along, across, clockwise moment about its joint.
    """

    moments: Floats
    axial: Floats
    stretch: Floats
    between: Floats
    zones: Floats


def fixed_ends(frame: Frame, table: LoadTable, stiffness: Floats) -> FixedEnds:
    """Fixed-end actions from the end rotations of the loaded simple beam: FEM = -stiffness @ phi_0.

    phi_0 of a force P at a (b = l - a): -P a b (l + b)/(6 EI l) and +P a b (l + a)/(6 EI l); of a couple C:
    C (3b^2 - l^2)/(6 EI l) + C/(G As l) and C (3a^2 - l^2)/(6 EI l) + C/(G As l); of a free curvature k (sagging):
    +k l/2 and -k l/2; line loads by integrating the first. Forces cause no end rotation by shear.
    """
    loads = split_loads(frame, table)
    between, axial = _flexible_totals(frame, loads)
    turn = _rotations(frame, table, loads)
    t = frame.member_table
    if t.varying.any():
        turns, held = simple_beam(frame, table, between[:, 2])
        turn, axial = np.where(t.varying[:, None], turns, turn), np.where(t.varying, held, axial)
    heat = np.where(table.mean != 0.0, table.mean * t.alpha * t.clear, 0.0)
    return FixedEnds(
        moments=-np.einsum("mij,mj->mi", stiffness, turn),
        axial=axial,
        stretch=heat + table.misfit,
        between=between,
        zones=_zone_totals(frame, loads),
    )


def simple_beam_rotations(frame: Frame, table: LoadTable) -> Floats:
    """(m, 2) clockwise end rotations phi_0 of the members' flexible parts as simple beams under their loads."""
    loads = split_loads(frame, table)
    turn = _rotations(frame, table, loads)
    varying = frame.member_table.varying
    if not varying.any():
        return turn
    turns, _ = simple_beam(frame, table, _flexible_totals(frame, loads)[0][:, 2])
    return np.where(varying[:, None], turns, turn)


def _rotations(frame: Frame, table: LoadTable, loads: SplitLoads) -> Floats:
    """Those of prismatic members, in closed form; rows of stepped and tapered ones mean nothing."""
    return _point_rotations(frame, loads) + _line_rotations(frame, loads) + _thermal_rotations(frame, table)


def _point_rotations(frame: Frame, loads: SplitLoads) -> Floats:
    t = frame.member_table
    keep = loads.point_place == 1
    m, force, couple = loads.point_member[keep], loads.point_force[keep, 1], loads.point_couple[keep]
    length = t.clear[m]
    a = loads.point_at[keep] - t.zone[m, 0]
    b = length - a
    bend = 6 * t.E[m] * t.I[m] * length
    shear = couple / (t.G[m] * t.shear_area[m] * length) if frame.analysis.shear == "elastic" else 0.0
    first = (-force * a * b * (length + b) + couple * (3 * b * b - length**2)) / bend + shear
    second = (force * a * b * (length + a) + couple * (3 * a * a - length**2)) / bend + shear
    return _summed(len(t.length), m, np.column_stack([first, second]))


def _line_rotations(frame: Frame, loads: SplitLoads) -> Floats:
    t = frame.member_table
    keep = loads.line_place == 1
    m = loads.line_member[keep]
    length, start, end = t.clear[m], loads.line_start[keep] - t.zone[m, 0], loads.line_end[keep] - t.zone[m, 0]
    mean, slope = loads.line_mean[keep, 1], loads.line_slope[keep, 1]
    _, one, two, three = load_moments(mean, slope, (start + end) / 2, (end - start) / 2)
    bend = 6 * t.E[m] * t.I[m] * length
    first = -(2 * length**2 * one - 3 * length * two + three) / bend
    second = (length**2 * one - three) / bend
    return _summed(len(t.length), m, np.column_stack([first, second]))


def _thermal_rotations(frame: Frame, table: LoadTable) -> Floats:
    half = thermal_curvature(frame, table) * frame.member_table.clear / 2
    return np.column_stack([half, -half])


def thermal_curvature(frame: Frame, table: LoadTable) -> Floats:
    """(m,) free curvature, sagging positive (a warmer -y face lengthens), 1/length; means nothing for a varying member."""
    t = frame.member_table
    return np.asarray(np.where(table.difference != 0.0, t.alpha * table.difference / t.depth, 0.0))


def _flexible_totals(frame: Frame, loads: SplitLoads) -> tuple[Floats, Floats]:
    """`between` and the axial force at the `from` face with both ends held: sum of F (l - a)/l."""
    t = frame.member_table
    points, lines = loads.point_place == 1, loads.line_place == 1
    m, q = loads.point_member[points], loads.line_member[lines]
    to_face = (t.length - t.zone[:, 1])[m] - loads.point_at[points]
    force, couple = loads.point_force[points], loads.point_couple[points]
    rows = np.column_stack([force, force[:, 1] * to_face + couple, force[:, 0] * to_face / t.clear[m]])
    totals = _summed(len(t.length), m, rows)
    face = (t.length - t.zone[:, 1])[q]
    middle, half = (loads.line_start + loads.line_end)[lines] / 2, (loads.line_end - loads.line_start)[lines] / 2
    zeroth, first, _, _ = load_moments(
        loads.line_mean[lines].T, -loads.line_slope[lines].T, face - middle, half
    )
    totals += _summed(len(t.length), q, np.column_stack([zeroth[0], zeroth[1], first[1], first[0] / t.clear[q]]))
    return totals[:, :3], totals[:, 3]


def _zone_totals(frame: Frame, loads: SplitLoads) -> Floats:
    """(m, 2, 3): along, across and clockwise moment about the joint of what acts on each rigid zone."""
    t = frame.member_table
    zones = np.zeros((len(t.length), 2, 3))
    for side, place in ((0, 0), (1, 2)):
        points, lines = loads.point_place == place, loads.line_place == place
        m, q = loads.point_member[points], loads.line_member[lines]
        # An upward force right of the joint turns it counter-clockwise, left of the joint clockwise.
        joint = np.zeros(len(t.length)) if side == 0 else t.length
        arm = joint[m] - loads.point_at[points]
        force, couple = loads.point_force[points], loads.point_couple[points]
        zones[:, side] += _summed(len(t.length), m, np.column_stack([force, force[:, 1] * arm + couple]))
        middle, half = (loads.line_start + loads.line_end)[lines] / 2, (loads.line_end - loads.line_start)[lines] / 2
        zeroth, first, _, _ = load_moments(
            loads.line_mean[lines].T, -loads.line_slope[lines].T, joint[q] - middle, half
        )
        zones[:, side] += _summed(len(t.length), q, np.column_stack([zeroth[0], zeroth[1], first[1]]))
    return zones


def _summed(count: int, member: Ints, rows: Floats) -> Floats:
    """(count, columns): rows added up by member."""
    out = np.zeros((count, rows.shape[1]))
    np.add.at(out, member, rows)
    return out


def end_actions(frame: Frame, moments: Floats, axial: Floats, fixed: FixedEnds) -> Floats:
    """(m, 2, 3) axial, shear, moment at the joints, from the moments at the faces and the axial force at the `from`
    face, by statics of the flexible part and then of each rigid zone."""
    t = frame.member_table
    along, across, turning = fixed.between.T
    shear_1 = -(moments.sum(axis=1) + turning) / t.clear
    shear_2 = -shear_1 - across
    zone_1, zone_2 = fixed.zones[:, 0], fixed.zones[:, 1]
    ends = np.empty((len(t.length), 2, 3))
    ends[:, 0, 0] = axial + zone_1[:, 0]
    ends[:, 1, 0] = axial - along - zone_2[:, 0]
    ends[:, 0, 1] = shear_1 - zone_1[:, 1]
    ends[:, 1, 1] = shear_2 - zone_2[:, 1]
    ends[:, 0, 2] = moments[:, 0] - shear_1 * t.zone[:, 0] - zone_1[:, 2]
    ends[:, 1, 2] = moments[:, 1] + shear_2 * t.zone[:, 1] - zone_2[:, 2]
    return ends
