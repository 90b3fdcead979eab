"""Slope-deflection for stepped and tapered members, ties, single rigid members and one-way parts.

Haunch constants are held to print and to their exact integrals; a tapered member to its division into prismatic pieces,
whose error must fall with the square of their number; ties and single rigid members to stiff bars in their place; one-way
frames to every state they could be in.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterator
from dataclasses import replace
from functools import cache

import numpy as np
import pytest

from crosscheck.answer import Answer
from crosscheck.frame.kinematics import mechanisms, study
from crosscheck.frame.model import Floats, Frame, Joint, Member, Piece, Section
from crosscheck.frame.reader import read_frame_text
from crosscheck.opinions import slope_deflection

# --- haunch constants -------------------------------------------------------------------------------

BEAM = """
units = "kN m"
[materials.m]
E = 1
[sections.c]
I = 1
depth = 1
[joints]
A = [0, 0]
B = [1, 0]
[members]
AB = {{ from = "A", to = "B", material = "m", {profile} }}
[supports]
A = "fixed"
B = "fixed"
[loads.turn_A]
apply = [{{ joint = "A", settlement = {{ rotation = 1 }} }}]
[loads.turn_B]
apply = [{{ joint = "B", settlement = {{ rotation = 1 }} }}]
[loads.uniform]
apply = [{{ member = "AB", uniform = 1, direction = "down" }}]
{points}
[analysis]
axial = "rigid"
"""
SHARES = ("0.1", "0.3", "0.5", "0.7", "0.9")
POINTS = "\n".join(
    f'[loads.point_{b[2]}]\napply = [{{ member = "AB", force = 1, at = {b}, direction = "down" }}]' for b in SHARES
)

# Portland Cement Association, Handbook of Frame Constants (1958), as reproduced by R. C. Hibbeler, Structural Analysis,
# 8th ed., Table 13-2: parabolic haunches, constant width, a_A = a_B = 0.2, r_A = 1.0. By r_B: C_AB, C_BA, k_AB, k_BA
# (in EI_c/L), fixed-end moments A and B of a uniform load (in w L2), and of a point load at 0.1, 0.3, 0.5, 0.7, 0.9 L (in
# P L). A few printed last digits miss the exact integral by one or two units.
PRINTED = {
    0.4: "0.558 0.627 6.08 5.40 0.1022 0.0841 "
         "0.0938 0.0033 0.1891 0.0502 0.1572 0.1261 0.0715 0.1618 0.0073 0.0877",
    0.6: "0.582 0.624 6.21 5.80 0.0995 0.0887 "
         "0.0936 0.0036 0.1872 0.0535 0.1527 0.1339 0.0663 0.1708 0.0058 0.0902",
    1.0: "0.619 0.619 6.41 6.41 0.0956 0.0956 "
         "0.0935 0.0038 0.1844 0.0584 0.1459 0.1459 0.0584 0.1844 0.0038 0.0935",
    1.5: "0.649 0.614 6.59 6.97 0.0921 0.1015 "
         "0.0933 0.0041 0.1819 0.0628 0.1399 0.1563 0.0518 0.1962 0.0025 0.0958",
}  # fmt: skip
# The same by exact integration (symbolic, done once for this table; first six values).
EXACT = {
    0.4: (0.5575412278732219, 0.6274763808343402, 6.08209168265779, 5.404214355092667,
          0.10216684600372565, 0.08412522613811986),
    0.6: (0.5822411661615707, 0.6239330722726001, 6.212894598307971, 5.797742028615035,
          0.09949787599164016, 0.08869666025691832),
    1.0: (0.6186168331347517, 0.6186168331347517, 6.412335021541551, 6.412335021541551,
          0.09554713945744116, 0.0955471394574413),
    1.5: (0.6494164761210248, 0.6139545547273685, 6.587290238748407, 6.967771117740218,
          0.09220928051837313, 0.10142419453924016),
}  # fmt: skip


def haunched(r_A: float, r_B: float, parts: int, a: float = 0.2) -> Frame:
    """Parabolic haunches as `parts` straight tapers each: depth 1 + r (1 - x/a)^2, I its cube."""
    frame = read_frame_text(BEAM.format(profile='section = "c"', points=POINTS))
    near = [(a * k / parts, 1 + r_A * (1 - k / parts) ** 2) for k in range(parts + 1)]
    far = [(1 - x, 1 + r_B * (1 - x / a) ** 2) for x, _ in near][::-1]
    nodes = [*near, *far]
    sections = {f"s{k}": Section(f"s{k}", depth**3, depth=depth) for k, (_, depth) in enumerate(nodes)}
    pieces = tuple(Piece(f"s{k - 1}", f"s{k}", nodes[k][0]) for k in range(1, len(nodes)))
    pieces = (*pieces[:-1], replace(pieces[-1], until=1.0))
    member = replace(frame.members["AB"], pieces=pieces)
    return replace(frame, sections={**frame.sections, **sections}, members={"AB": member})


def constants(frame: Frame) -> Floats:
    """Carry-over both ways, stiffness at both ends, fixed-end moments' sizes of the uniform and the point loads."""
    cases = opinion(frame).cases
    turn_A, turn_B = cases["turn_A"].ends[0, :, 2], cases["turn_B"].ends[0, :, 2]
    loads = [np.abs(cases[name].ends[0, :, 2]) for name in cases if name not in ("turn_A", "turn_B")]
    return np.array([turn_A[1] / turn_A[0], turn_B[0] / turn_B[1], turn_A[0], turn_B[1], *np.concatenate(loads)])


def opinion(frame: Frame) -> Answer:
    given = slope_deflection.opine(frame, study(frame))
    assert isinstance(given, Answer)
    return given


@pytest.mark.parametrize("r_B", PRINTED)
def test_parabolic_haunches_as_printed(r_B: float) -> None:
    """To two units of the last digit printed, which is how far the handbook itself goes; exact integrals to 1e-9."""
    fine, finer = (constants(haunched(1.0, r_B, parts)) for parts in (100, 200))
    limit = (4 * finer - fine) / 3
    for value, text in zip(limit, PRINTED[r_B].split(), strict=True):
        assert abs(value - float(text)) <= 2.05 * 10.0 ** -len(text.split(".")[1]), text
    np.testing.assert_allclose(limit[:6], EXACT[r_B], rtol=1e-9)
    exact = np.array(EXACT[r_B])
    ratio = np.abs(fine[:6] - exact) / np.abs(finer[:6] - exact)
    np.testing.assert_allclose(ratio, 4.0, rtol=1e-2)


def test_linear_taper_by_exact_integration() -> None:
    """Depth 1 to 1.5, constant width: stiffness 5.4596 and 10.0341 EI0/L, carry-over 0.6758 and 0.3677 (exact integration,
    symbolic)."""
    text = BEAM.replace("[joints]", "[sections.e]\nI = 3.375\ndepth = 1.5\n[joints]")
    frame = read_frame_text(text.format(profile='taper = ["c", "e"]', points=""))
    expected = 0.6757607636774412, 0.36768484519181355, 5.459579939529795, 10.034054863942039
    np.testing.assert_allclose(constants(frame)[:4], expected, rtol=1e-13)


def test_a_taper_ten_times_as_deep() -> None:
    """Depth 1 to 10, I its cube. With t = 1 + 9 x the flexibilities are integrals of powers of t: f11 = (31.5 + ln 10)/729,
    f12 = -(4.95 - ln 10)/729, f22 = (ln 10 - 1.305)/729."""
    text = BEAM.replace("[joints]", "[sections.e]\nI = 1000\ndepth = 10\n[joints]")
    frame = read_frame_text(text.format(profile='taper = ["c", "e"]', points=""))
    log = np.log(10.0)
    f11, f12, f22 = (31.5 + log) / 729, -(4.95 - log) / 729, (log - 1.305) / 729
    determinant = f11 * f22 - f12 * f12
    expected = -f12 / f22, -f12 / f11, f22 / determinant, f11 / determinant
    np.testing.assert_allclose(constants(frame)[:4], expected, rtol=1e-12)


def test_one_step_by_hand() -> None:
    """A cantilever of 2 EI over its first half, tip load P: deflection P L3/EI (1/24 + 7/48) = 9/48 P L3/EI."""
    text = BEAM.format(profile='profile = [["d", "50%"], ["c", "100%"]]', points="").split("[loads.turn_A]")[0]
    text = text.replace("[joints]", "[sections.d]\nI = 2\n[joints]").replace('B = "fixed"', "")
    text += '[loads.tip]\napply = [{ joint = "B", force = 1, direction = "up" }]\n[analysis]\naxial = "rigid"\n'
    tip = opinion(read_frame_text(text)).cases["tip"].joints[1]
    np.testing.assert_allclose(tip[1:], (9 / 48, -(3 / 16 + 1 / 8)), rtol=1e-13)

# --- division into prismatic pieces -------------------------------------------------------------------

BENT = """
units = "kN m"
[materials.m]
E = "30 GPa"
nu = 0.2
alpha = 1e-5
density = "25 kN/m^3"
[sections.thin]
I = 0.0016
A = 0.12
shear_area = 0.1
depth = 0.4
[sections.deep]
I = 0.0128
A = 0.24
shear_area = 0.2
depth = 0.8
[joints]
A = [0, 0]
B = [0.5, 5]
C = [7, 6.5]
D = [7, 0]
[members]
AB = { from = "A", to = "B", material = "m", spring_from = 90000, rigid_to = 0.4, profile = [
  [["thin", "deep"], "90%"], ["deep", "100%"]] }
BC = { from = "B", to = "C", material = "m", rigid_from = 0.3, profile = [
  ["deep", "5%"], [["deep", "thin"], "30%"], ["thin", "100%"]] }
CD = { from = "C", to = "D", material = "m", section = "thin", hinge = "from" }
[supports]
A = "fixed"
D = "fixed"
[loads.spread]
apply = [
  { member = "AB", uniform = 9, direction = "right" },
  { member = "BC", uniform = 12, direction = "down" },
  { self_weight = 1 },
]
[loads.warm]
apply = [{ members = ["AB", "BC"], temperature = 20, difference = 15 }]
[loads.push]
apply = [{ joint = "B", force = 30, direction = "right" }, { joint = "C", couple = 11 }]
[analysis]
axial = "elastic"
shear = "elastic"
"""


@cache
def bent() -> Frame:
    return read_frame_text(BENT)


def divided(frame: Frame, parts: int) -> Frame:
    """Every varying member's flexible part as prismatic members, `parts` for each piece of it, with the properties at
    their middles. Joint names of the divisions: member and number."""
    joints, sections, members = dict(frame.joints), dict(frame.sections), {}
    cases = {name: replace(case, loads=()) for name, case in frame.cases.items()}
    names: dict[str, list[str]] = {}
    for k, member in enumerate(frame.members.values()):
        if not member.pieces:
            members[member.name] = member
            names[member.name] = [member.name]
            continue
        names[member.name] = []
        for bar, section, joint in bars(frame, k, member, parts):
            members[bar.name], sections[section.name] = bar, section
            names[member.name].append(bar.name)
            joints.setdefault(joint.name, joint)
    for name, case in frame.cases.items():
        loads = []
        for load in case.loads:
            whose = getattr(load, "member", None)
            for own in names.get(str(whose), [whose]):
                if whose is None:
                    loads.append(load)
                    continue
                moved = replace(load, member=own)
                if hasattr(load, "start"):
                    a, b = (joints[members[own].joint_from], joints[members[own].joint_to])
                    moved = replace(moved, start=0.0, end=float(np.hypot(b.x - a.x, b.y - a.y)))
                loads.append(moved)
        cases[name] = replace(case, loads=tuple(loads))
    return replace(frame, joints=joints, sections=sections, members=members, cases=cases)


def bars(frame: Frame, k: int, member: Member, parts: int) -> Iterator[tuple[Member, Section, Joint]]:
    """Prismatic members in order, each with its section and the joint at its far end."""
    t, v = frame.member_table, frame.variation
    length, near, far = t.length[k], t.zone[k, 0], t.length[k] - t.zone[k, 1]
    a, run = frame.xy[t.ends[k, 0]], np.array([t.cos[k], t.sin[k]])
    cuts = []
    for row in np.flatnonzero(v.member == k):
        low, high = max(v.start[row], near), min(v.end[row], far)
        if high > low:
            edges = np.linspace(low, high, parts + 1)
            cuts += [(row, x, y) for x, y in itertools.pairwise(edges)]
    before = member.joint_from
    for n, (row, x, y) in enumerate(cuts):
        last = n == len(cuts) - 1
        here = a + run * (length if last else y)
        joint = frame.joints[member.joint_to] if last else Joint(f"{member.name}{n}", *here)
        values = [float(q[0]) for q in v.at(np.array([row]), np.array([(x + y) / 2]))]
        section = Section(f"{member.name}{n}", *values)
        yield replace(
            member, name=f"{member.name}{n}", section=section.name, pieces=(), joint_from=before, joint_to=joint.name,
            turn_from=member.turn_from if n == 0 else np.inf, turn_to=member.turn_to if last else np.inf,
            rigid_from=member.rigid_from if n == 0 else 0.0, rigid_to=member.rigid_to if last else 0.0,
        ), section, joint  # fmt: skip
        before = joint.name


def at_joints(frame: Frame, name: str, of: Frame | None = None) -> Floats:
    """Displacements and reactions of the joints of `of`, in one row."""
    case, count = opinion(frame).cases[name], len((of or frame).joints)
    return np.concatenate([case.joints[:count].ravel(), case.reactions[:count].ravel()])


@pytest.mark.parametrize("name", ["spread", "warm", "push"])
def test_prismatic_pieces_come_closer_with_their_number_squared(name: str) -> None:
    frame = bent()
    exact = at_joints(frame, name)
    pieces = [at_joints(divided(frame, parts), name, frame) for parts in (50, 100, 200)]
    scale = np.where(np.arange(len(exact)) < len(exact) // 2, np.abs(exact[:12]).max(), np.abs(exact[12:]).max())
    errors = [np.abs((p - exact) / scale).max() for p in pieces]
    assert errors[2] < 1e-5
    assert errors[0] / errors[1] == pytest.approx(4.0, rel=0.05)
    assert errors[1] / errors[2] == pytest.approx(4.0, rel=0.05)
    # What is left after the squares are taken out.
    assert np.abs(((4 * pieces[2] - pieces[1]) / 3 - exact) / scale).max() < 1e-9


def test_values_along_a_taper() -> None:
    """Moment, shear and deflection along the beam against those of 200 prismatic pieces, at their joints."""
    frame, fine = bent(), divided(bent(), 100)
    given, pieces = opinion(frame), opinion(fine)
    beam = frame.member_index["BC"]
    own = [k for k, name in enumerate(fine.members) if name.startswith("BC")]
    table = fine.member_table
    # Places where the pieces begin, as distances along the beam.
    starts = table.ends[own, 0]
    x = np.hypot(*(fine.xy[starts] - frame.xy[frame.joint_index["B"]]).T)
    for name in frame.cases:
        values = given.spans.along(name, np.full(len(own) - 1, beam), x[1:], np.ones(len(own) - 1, dtype=np.int64))
        ends = pieces.cases[name].ends[own[1:], 0]
        moves = pieces.cases[name].joints[starts[1:]]
        across = moves[:, 1] * table.cos[own[0]] - moves[:, 0] * table.sin[own[0]]
        force = np.abs(pieces.cases[name].ends[..., :2]).max()
        np.testing.assert_allclose(values[:, 0], ends[:, 0], atol=1e-4 * force)
        np.testing.assert_allclose(values[:, 1], ends[:, 1], atol=1e-4 * force)
        np.testing.assert_allclose(values[:, 2], ends[:, 2], atol=1e-4 * force)
        np.testing.assert_allclose(values[:, 3], across, atol=1e-4 * np.abs(across).max())


def test_deflection_turns_where_its_slope_is_zero() -> None:
    """Every turning point of `across` inside a varying member is one: higher or lower than both sides of it."""
    frame = bent()
    given = opinion(frame)
    beam = frame.member_index["BC"]
    for name in ("spread", "warm"):
        member, x = given.spans.turning_points(name)
        x = x[member == beam]
        dense = np.linspace(0.31, frame.member_table.length[beam], 4001)
        values = given.spans.along(name, np.full(4001, beam), dense, np.ones(4001, dtype=np.int64))[:, 3]
        slope = np.sign(np.diff(values))
        crossings = dense[1:-1][slope[1:] != slope[:-1]]
        assert all(np.abs(x - place).min() < 2e-3 for place in crossings)
        assert len(crossings)

# --- ties and single rigid members ---------------------------------------------------------------------

SHED = """
units = "kN m"
[materials.m]
E = "210 GPa"
alpha = 12e-6
[sections.s]
I = "8000 cm^4"
A = "60 cm^2"
[sections.stiff]
I = 1e-4
A = {area}
[joints]
A = [0, 0]
B = [0, 4]
C = [6, 4]
D = [6, 0]
E = [12, 4]
F = [12, 0]
G = [3, 5.5]
[members]
AB = {{ from = "A", to = "B", material = "m", section = "s", hinge = "from" }}
BG = {{ from = "B", to = "G", material = "m", section = "s" }}
GC = {{ from = "G", to = "C", material = "m", section = "s"{own} }}
DC = {{ from = "D", to = "C", material = "m", section = "s" }}
CE = {{ from = "C", to = "E", material = "m", section = "s", hinge = "both" }}
FE = {{ from = "F", to = "E", material = "m", section = "s", spring_from = 3000 }}
{bars}
[supports]
A = "fixed"
D = "fixed"
F = {{ x = "held", y = 40000, rotation = "held" }}
{more}
[loads.roof]
apply = [{{ members = ["BG", "GC"], uniform = 11, direction = "down" }},
  {{ member = "GC", force = 4, at = 1, direction = "along" }}]
[loads.wind]
apply = [{{ member = "AB", uniform = 5, direction = "right" }}, {{ joint = "E", force = 3, direction = 200 }}]
[loads.warm]
apply = [{{ member = "BG", temperature = 30 }}, {{ joint = "D", settlement = {{ x = 0.002, y = -0.004 }} }}]
[analysis]
axial = "elastic"
"""


def shed(area: float = 1.0, bars: str = "", more: str = "", own: str = "") -> Frame:
    return read_frame_text(SHED.format(area=area, bars=bars, more=more, own=own))


def everything(frame: Frame, name: str, of: Frame) -> tuple[Floats, Floats, Floats]:
    """End actions, displacements and reactions of the members and joints of `of`."""
    case = opinion(frame).cases[name]
    return case.ends[: len(of.members)], case.joints[: len(of.joints)], case.reactions[: len(of.joints)]


def close(one: tuple[Floats, ...], other: tuple[Floats, ...], share: float) -> None:
    for a, b in zip(one, other, strict=True):
        np.testing.assert_allclose(a, b, rtol=0, atol=share * np.nanmax(np.abs(b)))


def of_no_give(build: dict[float, Frame], name: str, of: Frame) -> tuple[Floats, ...]:
    """What bars of ever larger area tend to: from two areas, what goes with 1/area taken out."""
    (small, soft), (large, hard) = build.items()
    one, other = everything(soft, name, of), everything(hard, name, of)
    return tuple(b + (b - a) / (large / small - 1.0) for a, b in zip(one, other, strict=True))


@pytest.mark.parametrize("name", ["roof", "wind", "warm"])
def test_a_tie_is_a_bar_that_does_not_give(name: str) -> None:
    """Hinged bars of 1e3 and 1e4 times the columns' area, extrapolated; a bar between B and C takes the tie's force."""
    bars = 'T1 = { from = "B", to = "C", material = "m", section = "stiff", hinge = "both" }'
    tied = shed(more='[ties]\nroof = { joints = ["B", "C"], direction = "x" }')
    expected = of_no_give({area: shed(area, bars) for area in (6.0, 60.0)}, name, tied)
    close(everything(tied, name, tied), expected, 1e-8)
    moves = opinion(tied).cases[name].joints
    np.testing.assert_allclose(moves[1, 0], moves[2, 0], rtol=0, atol=1e-15 * np.abs(moves[:, :2]).max() * 10)


def test_a_tie_at_an_angle_to_a_support() -> None:
    """G tied to the held foot D along the line between them: a bar from D to G that does not give; D's reaction lacks what
    the tie brings to it."""
    angle = float(np.degrees(np.arctan2(5.5, -3.0)))
    tied = shed(more=f'[ties]\nprop = {{ joints = ["D", "G"], direction = {angle!r} }}')
    bars = 'T1 = { from = "D", to = "G", material = "m", section = "stiff", hinge = "both" }'
    for name in tied.cases:
        expected = of_no_give({area: shed(area, bars) for area in (6.0, 60.0)}, name, tied)
        close(everything(tied, name, tied), expected, 1e-8)


@pytest.mark.parametrize("name", ["roof", "wind", "warm"])
def test_one_member_axially_rigid(name: str) -> None:
    """Against the same member of 1e3 and 1e4 times the area, extrapolated. Loads along it are among the loads."""
    rigid = shed(own=', axial = "rigid"')
    given = everything(rigid, name, rigid)
    built = {area: shed(area) for area in (6.0, 60.0)}
    stiff = {}
    for area, frame in built.items():
        section = replace(frame.sections["s"], name="stiff", A=area)
        members = {**frame.members, "GC": replace(frame.members["GC"], section="stiff")}
        stiff[area] = replace(frame, sections={**frame.sections, "stiff": section}, members=members)
    close(given, of_no_give(stiff, name, rigid), 1e-8)
    t, moves = rigid.member_table, opinion(rigid).cases[name].joints
    k = rigid.member_index["GC"]
    apart = moves[t.ends[k, 1], :2] - moves[t.ends[k, 0], :2]
    longer = apart @ [t.cos[k], t.sin[k]]
    assert abs(longer) <= 1e-14 * np.abs(moves[:, :2]).max()


def test_ties_of_an_axially_rigid_frame() -> None:
    """Two rigid portals side by side, tied at their beams: both sway alike, the storey shear is shared by stiffness."""
    text = """
units = "kN m"
[materials.m]
E = "30 GPa"
[sections.s]
I = 0.001
[joints]
A = [0, 0]
B = [0, 3]
C = [5, 3]
D = [5, 0]
E = [8, 0]
F = [8, 4]
[members]
AB = { from = "A", to = "B", material = "m", section = "s" }
BC = { from = "B", to = "C", material = "m", section = "s" }
CD = { from = "C", to = "D", material = "m", section = "s" }
EF = { from = "E", to = "F", material = "m", section = "s" }
[supports]
A = "fixed"
D = "fixed"
E = "fixed"
[ties]
roof = { joints = ["B", "C", "F"], direction = "x" }
[loads.wind]
apply = [{ joint = "F", force = 10, direction = "right" }]
[analysis]
axial = "rigid"
"""
    frame = read_frame_text(text)
    given = opinion(frame)
    moves, reactions = given.cases["wind"].joints, given.cases["wind"].reactions
    np.testing.assert_allclose(moves[[1, 2, 5], 0], moves[1, 0], rtol=1e-13)
    # A free-standing post takes 3 EI/h3 per unit sway.
    post = 3 * 30e6 * 0.001 / 4**3 * moves[5, 0]
    assert reactions[4, 0] == pytest.approx(-post, rel=1e-12)
    assert np.nansum(reactions[:, 0]) == pytest.approx(-10, rel=1e-12)
    # B and C are tied and joined by a rigid beam: what goes through which is nobody's knowledge.
    assert given.undetermined.axial.tolist() == [False, True, False, False]

# --- one-way members and supports -----------------------------------------------------------------------

RACK = """
units = "kN m"
[materials.m]
E = "210 GPa"
alpha = 12e-6
[sections.s]
I = "8000 cm^4"
A = "60 cm^2"
[sections.rod]
I = "40 cm^4"
A = "8 cm^2"
[joints]
A = [0, 0]
B = [0, 3.5]
C = [0.2, 7]
D = [6, 0]
E = [6, 3.6]
F = [6, 7.2]
G = [3, 0.1]
[members]
AB = { from = "A", to = "B", section = "s", material = "m", hinge = "from" }
BC = { from = "B", to = "C", section = "s", material = "m" }
DE = { from = "D", to = "E", section = "s", material = "m" }
EF = { from = "E", to = "F", section = "s", material = "m" }
BE = { from = "B", to = "E", section = "s", material = "m", hinge = "both" }
CF = { from = "C", to = "F", section = "s", material = "m" }
GD = { from = "G", to = "D", section = "s", material = "m" }
AE = { from = "A", to = "E", section = "rod", material = "m", hinge = "both", only = "tension" }
DB = { from = "D", to = "B", section = "rod", material = "m", hinge = "both", only = "tension" }
BF = { from = "B", to = "F", section = "rod", material = "m", hinge = "from", only = "tension" }
EC = { from = "E", to = "C", section = "rod", material = "m", hinge = "both", only = "compression" }
[supports]
A = "pinned"
D = { x = "held", y = "push", angle = 5 }
G = { y = "push" }
[loads.wind]
apply = [{ member = "AB", uniform = 6, direction = "right" }, { joint = "C", force = 20, direction = "right" }]
[loads.back]
apply = [{ joint = "C", force = 45, direction = "left" }, { joint = "F", force = 60, direction = "down" }]
[loads.heavy]
apply = [{ members = ["BE", "CF"], uniform = 12, direction = "down" },
  { member = "GD", force = 9, at = 1, direction = "up" }]
[loads.cold]
apply = [{ member = "AE", temperature = -25 }, { member = "DB", temperature = 20 },
  { joint = "D", settlement = { y = -0.003 } }]
[loads.up]
apply = [{ joint = "F", force = 400, direction = "up" }]
[loads.nothing]
apply = []
[combinations]
both = { wind = 1.5, heavy = 1.35 }
other = { back = 1.5, heavy = 0.9, cold = 1 }
[analysis]
axial = "elastic"
"""
RODS = ("AE", "DB", "BF", "EC")
PUSHES = (("D", 5.0), ("G", 0.0))


@cache
def rack() -> Frame:
    return read_frame_text(RACK)


def states(frame: Frame) -> Iterator[tuple[tuple[bool, ...], Frame]]:
    """Every state of the rack that can stand, as a plain two-way frame without the parts that are out."""
    for out in itertools.product((False, True), repeat=len(RODS) + len(PUSHES)):
        members = {name: replace(m, only="") for name, m in frame.members.items()}
        supports = {name: replace(s, y_only="") for name, s in frame.supports.items()}
        for name, gone in zip(RODS, out, strict=False):
            if gone:
                # Next to no area; of BF, stiff at one end, the bending stiffness stays.
                members[name] = replace(members[name], section="rod_out")
        for (name, _), gone in zip(PUSHES, out[len(RODS) :], strict=True):
            if gone:
                supports[name] = replace(supports[name], y=0.0)
        sections = {**frame.sections, "rod_out": replace(frame.sections["rod"], name="rod_out", A=1e-18)}
        plain = replace(frame, members=members, supports=supports, sections=sections)
        if not mechanisms(replace(plain, out_members=frozenset(n for n, g in zip(RODS, out, strict=False) if g))):
            yield out, plain


def settled(frame: Frame, plain: Frame, out: tuple[bool, ...], case: str, given: Answer) -> bool:
    """Whether every part in place works the right way and every part out lets go, from results alone: axial force,
    reaction along the support's axis, elongation, displacement along the axis less the settlement."""
    result, t = given.cases[case], frame.member_table
    factors = frame.combinations[case].factors if case in frame.combinations else {case: 1.0}
    warm = {"AE": -25.0 * factors.get("cold", 0.0), "DB": 20.0 * factors.get("cold", 0.0)}
    sunk = {"D": -0.003 * factors.get("cold", 0.0)}
    force, moved = np.abs(result.ends[:, :, :2]).max(), np.nanmax(np.abs(result.joints[:, :2]))
    for name, gone in zip(RODS, out, strict=False):
        k, sense = frame.member_index[name], -1.0 if name == "EC" else 1.0
        apart = result.joints[t.ends[k, 1], :2] - result.joints[t.ends[k, 0], :2]
        longer = apart @ [t.cos[k], t.sin[k]] - 12e-6 * warm.get(name, 0.0) * t.length[k]
        if gone and sense * longer > 1e-9 * moved or not gone and sense * result.ends[k, 0, 0] < -1e-9 * force:
            return False
    for (name, angle), gone in zip(PUSHES, out[len(RODS) :], strict=True):
        k = frame.joint_index[name]
        up = np.array([-np.sin(np.radians(angle)), np.cos(np.radians(angle))])
        if gone and up @ result.joints[k, :2] - sunk.get(name, 0.0) < -1e-9 * moved:
            return False
        if not gone and up @ result.reactions[k, :2] < -1e-9 * force:
            return False
    return True


def test_one_way_parts_against_every_state() -> None:
    """Each case's answer is the only one of 64 states that is settled."""
    frame = rack()
    given = opinion(frame)
    found: dict[str, list[tuple[tuple[bool, ...], Answer]]] = {name: [] for name in frame.names}
    for out, plain in states(frame):
        other = opinion(plain)
        for name in frame.names:
            if name in other.cases and settled(frame, plain, out, name, other):
                found[name].append((out, other))
    for name, right in found.items():
        mine = given.cases[name]
        assert len(right) == 1 or name == "nothing"
        for _, other in right:
            theirs = other.cases[name]
            force = max(np.abs(theirs.ends[:, :, :2]).max(), 1e-300)
            np.testing.assert_allclose(mine.ends, theirs.ends, rtol=0, atol=1e-10 * force)
            np.testing.assert_allclose(mine.reactions, theirs.reactions, rtol=0, atol=1e-10 * force)
            np.testing.assert_allclose(mine.joints, theirs.joints, rtol=0, atol=1e-10 * np.nanmax(np.abs(theirs.joints)))
    assert not given.silent
    # Different cases settle in different states, and none of them with everything in place.
    used = {right[0][0] for name, right in found.items() if right and name != "nothing"}
    assert len(used) >= 4
    assert not any(sum(out) == 0 for out in used)


PLANK = """
units = "kN m"
[materials.m]
E = "11 GPa"
[sections.s]
I = 1e-5
[joints]
A = [0, 0]
B = [4, 0]
C = [10, 0]
[members]
AB = { from = "A", to = "B", section = "s", material = "m" }
BC = { from = "B", to = "C", section = "s", material = "m" }
[supports]
A = { x = "held", y = "push" }
B = { y = "push" }
C = { y = "push" }
[loads.far]
apply = [{ member = "BC", uniform = 2, direction = "down" }]
[loads.all]
apply = [{ members = ["AB", "BC"], uniform = 2, direction = "down" }]
[loads.lifted]
apply = [{ joint = "C", force = 1, direction = "up" }]
[combinations]
sum = { far = 1, all = 1 }
held = { lifted = 1, all = 0.2 }
[analysis]
axial = "rigid"
"""


def test_a_plank_that_lifts_off() -> None:
    """Load on the far span alone lifts A: the far span is a simple beam, reactions 6 and 6, slope at B w L3/24EI. On both
    spans A stays down: M_B = -w (4^3 + 6^3)/(8 (4 + 6)) (three moments). What lifts it altogether settles nowhere."""
    given = opinion(read_frame_text(PLANK))
    far, whole = given.cases["far"], given.cases["all"]
    np.testing.assert_allclose(far.reactions[:, 1], (0, 6, 6), atol=1e-12)
    slope = 2 * 6**3 / (24 * 11e6 * 1e-5)
    np.testing.assert_allclose(far.joints[:2, 2], slope, rtol=1e-12)
    assert far.joints[0, 1] == pytest.approx(4 * slope, rel=1e-12)
    moment = 2 * (4**3 + 6**3) / (8 * 10)
    assert whole.ends[1, 0, 2] == pytest.approx(-moment, rel=1e-12)
    assert given.cases["sum"].reactions[0, 1] > 0.0
    assert set(given.silent) == {"lifted"}
    assert given.silent["lifted"].startswith("no settled state of the one-way members and supports was found: support A")
    # C alone lifts: M_B = -(0.4 6^2/2 - 1 * 6) = -1.2, A takes 0.4 * 4/2 - 1.2/4.
    np.testing.assert_allclose(given.cases["held"].reactions[:, 1], (0.5, 2.5, 0), atol=1e-12)
    assert given.cases["held"].joints[2, 1] > 0.0


def test_no_superposition() -> None:
    """A combination is a case of its own: the plank's sum is not the sum of its cases."""
    cases = opinion(read_frame_text(PLANK)).cases
    added = cases["far"].reactions + cases["all"].reactions
    assert np.abs(cases["sum"].reactions - added).max() > 0.1


def test_loads_along_a_slack_member_are_carried_as_between_held_ends() -> None:
    """A hinged rod under a load P along it at 0.4 of its length: the held ends take 0.6 P and 0.4 P when it is slack, and
    its own tension comes on top when it works."""
    along = '{ member = "AE", force = 3, at = "40%", direction = "along" }'
    head, tail = RACK.split("[loads.wind]")[0], '[analysis]\naxial = "elastic"\n'
    ends = {}
    for sense in ("left", "right"):
        apply = f'[{{ joint = "E", force = 50, direction = "{sense}" }}, {along}]'
        frame = read_frame_text(f"{head}[loads.rod]\napply = {apply}\n{tail}")
        ends[sense] = opinion(frame).cases["rod"].ends[frame.member_index["AE"], :, 0]
    np.testing.assert_allclose(ends["left"], (3 * 0.6, -3 * 0.4), rtol=1e-12)
    assert ends["right"].min() > 10.0


# --- working ---------------------------------------------------------------------------------------------


def test_working_shows_carry_over_and_parts_out() -> None:
    """The taper's printed constants again; the rods and supports that are out under wind."""
    text = BEAM.replace("[joints]", "[sections.e]\nI = 3.375\ndepth = 1.5\n[joints]")
    frame = read_frame_text(text.format(profile='taper = ["c", "e"]', points=""))
    tables = {t.heading: t for t in slope_deflection.working(frame, study(frame), "uniform")}
    row = tables["Stepped and tapered members"].rows[0]
    printed = 5.45957994, 0.67576076, 10.03405486, 0.36768485
    np.testing.assert_allclose(np.array(row[4:], dtype=float), printed, rtol=0, atol=0.51e-8)
    parts = slope_deflection.working(rack(), study(rack()), "wind")[0]
    assert parts.rows == (
        ("AE", "works"), ("DB", "out"), ("BF", "works"), ("EC", "works"), ("support D in y", "works"),
        ("support G in y", "out"),
    )  # fmt: skip


# --- second order ----------------------------------------------------------------------------------------

LEANING = """
units = "kN m"
[materials.m]
E = "200 GPa"
[sections.s]
I = 1e-5
A = 1e-3
[joints]
A = [0, 0]
B = [0, 3]
C = [5, 0]
D = [5, 3]
[members]
AB = { from = "A", to = "B", section = "s", material = "m" }
CD = { from = "C", to = "D", section = "s", material = "m", hinge = "both" }
[supports]
A = "fixed"
C = "pinned"
[ties]
top = { joints = ["B", "D"], direction = "x" }
[loads.push]
apply = [
  { joint = "B", force = 100, direction = "down" }, { joint = "D", force = 150, direction = "down" },
  { joint = "D", force = 4, direction = "right" },
]
[analysis]
order = 2
axial = "AXIAL"
"""


@pytest.mark.parametrize("axial", ["rigid", "elastic"])
def test_a_leaning_column_tied_to_a_cantilever(axial: str) -> None:
    """Cantilever with P at its top, which a hinged column under Q leans against through the tie: with u2 = P h2/EI and
    g = tan u/u - 1 the top moves by H h g/P / (1 - g Q/P), and the frame buckles where g = P/Q (from the differential
    equation of the column; S. P. Timoshenko and J. M. Gere 1961 for the cantilever)."""
    frame = read_frame_text(LEANING.replace("AXIAL", axial))
    P, Q, H, h, EI = 100.0, 150.0, 4.0, 3.0, 2000.0

    def g(factor: float) -> float:
        u = np.sqrt(factor * P * h * h / EI)
        return float(np.tan(u) / u - 1.0)

    case = opinion(frame).cases["push"]
    top = H * h * g(1.0) / P / (1.0 - g(1.0) * Q / P)
    np.testing.assert_allclose(case.joints[[1, 3], 0], top, rtol=1e-10)
    np.testing.assert_allclose(case.reactions[[0, 2], 0], (-(H + Q * top / h), Q * top / h), rtol=1e-10)
    assert case.reactions[0, 2] == pytest.approx(-(P * top + (H + Q * top / h) * h), rel=1e-10)
    low, high = 0.1, 0.999 * (np.pi / 2) ** 2 * EI / (P * h * h)
    for _ in range(60):
        middle = (low + high) / 2
        low, high = (middle, high) if g(middle) < P / Q else (low, middle)
    assert slope_deflection.critical_factors(frame)["push"] == pytest.approx(low, rel=1e-9)


MAST = """
units = "kN m"
[materials.m]
E = 1000
[sections.top]
I = 2
depth = 1
[sections.foot]
I = 8
depth = 2
[joints]
A = [0, 0]
B = [0, 3]
[members]
AB = { from = "A", to = "B", material = "m", taper = ["foot", "top"] }
[supports]
A = "fixed"
[loads.load]
apply = [{ joint = "B", force = 300, direction = "down" }, { joint = "B", force = 7, direction = "right" }]
[analysis]
order = 2
axial = "rigid"
"""


def test_a_mast_whose_stiffness_falls_with_the_square_of_the_depth() -> None:
    """EI = EI1 (x/a)^2, x from where the taper would end, a = 3 at the top and b = 6 at the foot: y is sqrt(x/a) sin(k ln
    x/a) less H (x - a)/P with k2 = P a2/EI1 - 1/4; buckling at tan(k ln b/a) = -2 k (Timoshenko and Gere 1961, columns
    with varying section; worked out here)."""
    frame = read_frame_text(MAST)
    a, b, EI, P, H = 3.0, 6.0, 2000.0, 300.0, 7.0
    k = np.sqrt(P * a * a / EI - 0.25)
    end = k * np.log(b / a)
    f = np.sqrt(b / a) * np.sin(end)
    slope = (0.5 * np.sin(end) + k * np.cos(end)) / np.sqrt(a * b)
    top = H / P * (f / slope - (b - a))
    case = opinion(frame).cases["load"]
    assert case.joints[1, 0] == pytest.approx(top, rel=1e-11)
    assert case.reactions[0, 2] == pytest.approx(-(H * 3 + P * top), rel=1e-11)
    low, high = np.pi / 2 / np.log(2), np.pi / np.log(2)
    for _ in range(60):
        middle = (low + high) / 2
        low, high = (middle, high) if np.tan(middle * np.log(2)) < -2 * middle else (low, middle)
    factor = (low**2 + 0.25) * EI / a**2 / P
    assert slope_deflection.critical_factors(frame)["load"] == pytest.approx(factor, rel=1e-9)


HEAVY = """[loads.heavy]
apply = [
  { joint = "B", force = 6000, direction = "down" }, { joint = "C", force = 4500, direction = "down" },
  { joint = "B", force = 50, direction = "right" }, { member = "AB", uniform = 9, direction = "right" },
  { self_weight = 1 },
]
[analysis]
order = 2
"""


def test_second_order_of_tapers_against_their_division() -> None:
    """Semi-rigid foot, rigid zones, shear by Engesser, axial force that varies: three divisions, what goes with the square
    and the fourth power of the pieces' number taken out; values along the beam by the same."""
    frame = read_frame_text(BENT.replace("[analysis]\n", HEAVY))
    exact = at_joints(frame, "heavy")
    one, two, three = (at_joints(divided(frame, parts), "heavy", frame) for parts in (8, 16, 32))
    half = len(exact) // 2
    scale = np.where(np.arange(len(exact)) < half, np.abs(exact[:half]).max(), np.abs(exact[half:]).max())
    errors = [np.abs((p - exact) / scale).max() for p in (one, two, three)]
    assert errors[1] / errors[2] == pytest.approx(4.0, rel=0.03)
    assert np.abs(((4 * three - two) / 3 - exact) / scale).max() < 1e-5
    assert np.abs(((64 * three - 20 * two + one) / 45 - exact) / scale).max() < 1e-7
    first = replace(frame, analysis=replace(frame.analysis, order=1))
    assert np.abs((at_joints(first, "heavy") - exact) / scale).max() > 0.1


def test_values_along_a_taper_in_second_order_balance() -> None:
    """On the displaced taper the moment's gradient is the shear and axial force times slope; ends meet the end actions."""
    frame = read_frame_text(BENT.replace("[analysis]\n", HEAVY))
    given = opinion(frame)
    case, k = given.cases["heavy"], frame.member_index["AB"]
    length = frame.member_table.length[k]
    x = np.linspace(0.0, length, 2001)
    side = np.ones(len(x), dtype=np.int64)
    side[-1] = -1
    axial, shear, moment, across = given.spans.along("heavy", np.full(len(x), k), x, side).T
    assert moment[0] == pytest.approx(case.ends[k, 0, 2], rel=1e-10)
    assert -moment[-1] == pytest.approx(case.ends[k, 1, 2], rel=1e-10)
    load = np.concatenate([[0.0], np.cumsum((shear[1:] + shear[:-1]) / 2 * np.diff(x))])
    pull = np.concatenate([[0.0], np.cumsum((axial[1:] + axial[:-1]) / 2 * np.diff(across))])
    np.testing.assert_allclose(moment - moment[0], load + pull, atol=2e-6 * np.abs(moment).max())


def test_one_way_parts_in_second_order() -> None:
    """The state found is settled by its own results, and its results are those of the plain frame without what is out."""
    frame = read_frame_text(RACK + "order = 2\n")
    given = slope_deflection.opine(frame, study(frame), ["wind", "back", "other", "both"])
    assert isinstance(given, Answer)
    checked = 0
    for out, plain in states(frame):
        if out not in ((False, True, False, False, False, True), (True, False, True, True, False, True)):
            continue
        other = slope_deflection.opine(plain, study(plain), ["wind", "back", "other"])
        assert isinstance(other, Answer)
        for name in ("wind", "back", "other"):
            if name in other.cases and settled(frame, plain, out, name, other):
                checked += 1
                force = np.abs(other.cases[name].ends[:, :, :2]).max()
                np.testing.assert_allclose(given.cases[name].ends, other.cases[name].ends, rtol=0, atol=1e-10 * force)
    assert checked == 3
    assert set(given.silent) == {"both"}
    assert given.silent["both"].startswith("past its critical load: the critical load factor is 0.84")


def test_one_member_axially_rigid_in_second_order() -> None:
    """Against the same member of 1e3 and 1e4 times the area, extrapolated."""
    rigid = shed(own=', axial = "rigid"')
    second = replace(rigid.analysis, order=2)
    rigid = replace(rigid, analysis=second)
    stiff = {}
    for area in (6.0, 60.0):
        frame = shed(area)
        section = replace(frame.sections["s"], name="stiff", A=area)
        members = {**frame.members, "GC": replace(frame.members["GC"], section="stiff")}
        stiff[area] = replace(frame, sections={**frame.sections, "stiff": section}, members=members, analysis=second)
    for name in rigid.cases:
        close(everything(rigid, name, rigid), of_no_give(stiff, name, rigid), 1e-8)


STEPPED_BAR = """
units = "kN m"
[materials.m]
E = 1
[sections]
thick = {{ I = 1, A = 2, depth = 1 }}
thin = {{ I = 1, A = 1, depth = 1 }}
[joints]
A = [0, 0]
B = [{length!r}, 0]
[members]
AB = {{ from = "A", to = "B", material = "m", profile = [["thick", "25.6%"], ["thin", "84.3%"], ["thick", "100%"]] }}
[supports]
A = "fixed"
[loads.p]
apply = [{{ member = "AB", force = 1, at = {at!r}, direction = "along" }}]
"""


def test_a_load_counts_once_wherever_rounding_puts_it() -> None:
    """A bar pulled at any place of its thin part lengthens by 0.256 L/2 + (a - 0.256 L): the places where stretches end
    are the loads' own, to the last bit (start plus length may pass one)."""
    for k in range(200):
        length = 5180.695698553057 + k / 7.0
        at = length * (0.3 + 0.5 * k / 199.0)
        frame = read_frame_text(STEPPED_BAR.format(length=length, at=at))
        moved = float(opinion(frame).cases["p"].joints[1, 0])
        assert moved == pytest.approx(at - 0.128 * length, rel=1e-12), (k, at)
