"""The moment-distribution opinion: closed forms, the independent solution on random frames, its process and its tables.

Closed forms are from memory of common tables (fixed-end moments, stiffness and carry-over), as said at each.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from crosscheck.answer import ACROSS, Answer
from crosscheck.compare.tolerance import Scales, case_scales
from crosscheck.frame.kinematics import study
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import Frame
from crosscheck.frame.reader import read_frame_text
from crosscheck.frame.stations import stations
from crosscheck.opinions.moment_distribution import holding, opine, working
from crosscheck.opinions.moment_distribution.distribution import Distribution, conjugate
from crosscheck.opinions.moment_distribution.members import members
from crosscheck.opinions.moment_distribution.process import distribute
from crosscheck.opinions.moment_distribution.spans import _unit_roots
from crosscheck.opinions.moment_distribution.sways import sways
from crosscheck.problems import UnusableInput
from tests.random_frames import random_frame
from tests.truth import Truth

L, EI, GAS, EA = 6.0, 12_000.0, 3_000.0, 500_000.0
"""Of the single beam below, in kN and m."""


def frame_of(body: str, axial: str = "rigid", shear: str = "rigid") -> Frame:
    return read_frame_text(
        f"""
        units = "kN m"
        [materials.m]
        E = 2e8
        G = 1e8
        alpha = 1e-5
        density = "78.5 kN/m^3"
        [sections.s]
        I = {EI / 2e8}
        A = {EA / 2e8}
        shear_area = {GAS / 1e8}
        depth = 0.5
        [analysis]
        axial = "{axial}"
        shear = "{shear}"
        {body}
        """.replace("\n        ", "\n")
    )


def beam(load: str, ends: tuple[str, str] = ("fixed", "fixed"), extra: str = "", **how: str) -> Frame:
    return frame_of(
        f"""
        [joints]
        A = [0, 0]
        B = [{L}, 0]
        [members]
        "A-B" = {{ section = "s", material = "m"{extra} }}
        [supports]
        A = "{ends[0]}"
        B = "{ends[1]}"
        [loads.case]
        apply = [{load}]
        """,
        **how,
    )


def answer(frame: Frame) -> Answer:
    given = opine(frame, study(frame))
    assert isinstance(given, Answer) and not given.silent
    return given


def end_moments(frame: Frame) -> list[float]:
    (case,) = answer(frame).cases.values()
    return [float(v) for v in case.ends[0, :, 2]]


# --- fixed-end moments, clockwise on the member; common tables, from memory --------------------------------------

A, B = 1.5, L - 1.5
FIXED = [
    ('{ member = "A-B", uniform = 10, direction = "down" }', -10 * L**2 / 12, 10 * L**2 / 12),
    ('{ member = "A-B", force = 10, at = 1.5, direction = "down" }', -10 * A * B**2 / L**2, 10 * A**2 * B / L**2),
    ('{ member = "A-B", varying = [0, 10], direction = "down" }', -10 * L**2 / 30, 10 * L**2 / 20),
    ('{ member = "A-B", couple = 10, at = 1.5 }', 10 * B * (2 * A - B) / L**2, 10 * A * (2 * B - A) / L**2),
    ('{ joint = "B", settlement = { down = 0.01 } }', -6 * EI * 0.01 / L**2, -6 * EI * 0.01 / L**2),
    ('{ joint = "A", settlement = { rotation = 0.01 } }', 4 * EI * 0.01 / L, 2 * EI * 0.01 / L),
    ('{ member = "A-B", difference = 20 }', -EI * 1e-5 * 20 / 0.5, EI * 1e-5 * 20 / 0.5),
]


@pytest.mark.parametrize(("load", "at_a", "at_b"), FIXED)
def test_fixed_end_moments(load: str, at_a: float, at_b: float) -> None:
    got = end_moments(beam(load))
    assert got == pytest.approx([at_a, at_b], rel=1e-13)


def test_propped_cantilever_and_prop_reaction() -> None:
    """w L^2 / 8 at the fixed end, 3 w L / 8 on the prop (any table, from memory)."""
    (case,) = answer(
        beam('{ member = "A-B", uniform = 10, direction = "down" }', ("fixed", "roller"))
    ).cases.values()
    assert case.ends[0, :, 2] == pytest.approx([-10 * L**2 / 8, 0], abs=1e-12)
    assert case.reactions[1] == pytest.approx([0, 3 * 10 * L / 8, 0], rel=1e-13)


def test_stiffness_and_carry_over() -> None:
    """4EI/L and 1/2; 3EI/L beside a hinge; with shear (4 + f)/(1 + f) EI/L and (2 - f)/(4 + f), f = 12EI/(G As L^2)."""
    load = '{ joint = "A", settlement = { rotation = 0.01 } }'
    plain = members(beam(load)).joint[0]
    assert plain == pytest.approx(np.array([[4, 2], [2, 4]]) * EI / L, rel=1e-14)
    hinged = members(beam(load, extra=', hinge = "to"')).joint[0]
    assert hinged == pytest.approx(np.array([[3, 0], [0, 0]]) * EI / L, rel=1e-14)
    sheared = members(beam(load, shear="elastic")).joint[0]
    f = 12 * EI / (GAS * L**2)
    assert sheared[0, 0] == pytest.approx((4 + f) / (1 + f) * EI / L, rel=1e-14)
    assert sheared[0, 1] / sheared[0, 0] == pytest.approx((2 - f) / (4 + f), rel=1e-13)


def test_rigid_zones_stiffen_and_carry_more() -> None:
    """Zones of half the clear length: its 4 and 2 EI/l carried to the joints by statics, worked out by hand."""
    m = members(beam("", extra=f", rigid_from = {L / 4}, rigid_to = {L / 4}")).joint[0]
    clear = L / 2
    # E = [[1.5, 0.5], [0.5, 1.5]]; E' [[4, 2], [2, 4]] E = [[13, 11], [11, 13]].
    assert m == pytest.approx(np.array([[13, 11], [11, 13]]) * EI / clear, rel=1e-14)


def test_semi_rigid_end() -> None:
    """A spring c = EI/L at one end, by flexibility: rotation = M (L/3EI + 1/c) - M'L/6EI."""
    m = members(beam("", extra=f', spring_from = "{EI / L} kN m/rad"')).joint[0]
    flexibility = np.array([[1 / 3 + 1, -1 / 6], [-1 / 6, 1 / 3]]) * L / EI
    assert m @ flexibility == pytest.approx(np.eye(2), abs=1e-14)


# --- against the independent solution ---------------------------------------------------------------------------

EXACT = 1e-9
KINDS = ("forces", "forces", "moments")


def scales_of(frame: Frame, truth: Truth, name: str) -> Scales:
    s = stations(frame)
    along = truth.along(name, s.member.tolist(), s.x.tolist(), s.side.tolist())
    scales = case_scales(frame, load_table(frame, name), [truth.cases[name]], [along[:, ACROSS]])
    # Where nothing is there but rounding (a warmed beam on rollers) the scale is what a strain of 1e-9 makes.
    t = frame.member_table
    length, force = float(t.length.max()), 1e-9 * float((t.E * t.I / t.length**2).max())
    return Scales(
        max(scales.forces, force), max(scales.moments, force * length),
        max(scales.displacements, 1e-9 * length), max(scales.rotations, 1e-9),
    )  # fmt: skip


def differences(frame: Frame, given: Answer, truth: Truth) -> dict[str, float]:
    """Largest difference of every kind of value, as a share of its scale; NaN must stand in the same places."""
    s, worst = stations(frame), dict.fromkeys(("forces", "moments", "displacements", "rotations"), 0.0)

    def note(kind: str, got: np.ndarray, want: np.ndarray, scale: Scales) -> None:
        assert np.array_equal(np.isnan(got), np.isnan(want)), f"{kind}: undetermined in different places"
        worst[kind] = max(worst[kind], float(np.nanmax(np.abs(got - want), initial=0.0)) / getattr(scale, kind))

    for name in frame.names:
        mine, true, scale = given.cases[name], truth.cases[name], scales_of(frame, truth, name)
        for column, kind in enumerate(KINDS):
            note(kind, mine.ends[:, :, column], true.ends[:, :, column], scale)
            note(kind, mine.reactions[:, column], true.reactions[:, column], scale)
        note("displacements", mine.joints[:, :2], true.joints[:, :2], scale)
        note("rotations", mine.joints[:, 2], true.joints[:, 2], scale)
        got = given.spans.along(name, s.member, s.x, s.side)
        want = truth.along(name, s.member.tolist(), s.x.tolist(), s.side.tolist())
        for column, kind in enumerate((*KINDS, "displacements")):
            note(kind, got[:, column], want[:, column], scale)
    return worst


def agrees(frame: Frame) -> None:
    worst = differences(frame, answer(frame), Truth(frame))
    assert max(worst.values()) < EXACT, worst


@pytest.mark.parametrize("seed", range(3000, 3040))
def test_random_frames(seed: int) -> None:
    agrees(random_frame(seed))


def test_the_comparison_can_fail(monkeypatch: pytest.MonkeyPatch) -> None:
    """A carry-over that is wrong by a millionth is seen."""
    frame = random_frame(3001)
    given, truth = answer(frame), Truth(frame)
    real = members

    def wrong(of: Frame) -> object:
        made = real(of)
        made.joint[:, 0, 1] *= 1 + 1e-6
        made.joint[:, 1, 0] *= 1 + 1e-6
        return made

    assert max(differences(frame, given, truth).values()) < EXACT
    monkeypatch.setattr(holding, "members", wrong)
    assert max(differences(frame, answer(frame), truth).values()) > EXACT


ARCH = "\n".join([
    "[joints]",
    *(f"J{k} = [{6 - 6 * math.cos(k * math.pi / 18)}, {5 * math.sin(k * math.pi / 18)}]" for k in range(19)),
    "[members]",
    *(f'"J{k}-J{k + 1}" = {{ section = "s", material = "m" }}' for k in range(18)),
    "[supports]",
    'J0 = "pinned"',
    'J18 = { x = "held", y = "held", angle = 30 }',
    "[loads.case]",
    'apply = [ { members = ["J3-J4", "J4-J5"], uniform = 5, direction = "down", per = "projection" } ]',
])  # fmt: skip

DIRECTED = {
    "every end hinged at a joint": """
        [joints]
        A = [0, 0]
        B = [3, 4]
        C = [6, 0]
        [members]
        "A-B" = { section = "s", material = "m", hinge = "both" }
        "C-B" = { section = "s", material = "m", hinge = "both" }
        [supports]
        A = "pinned"
        C = "pinned"
        [loads.case]
        apply = [
          { joint = "B", force = 9, direction = 20 }, { member = "A-B", uniform = 4, direction = "down" },
          { member = "C-B", couple = 5, at = "100%" },
        ]
    """,
    "arch of inclined members, with many sways": ARCH,
    "braced twice over, axial forces undetermined when rigid": """
        [joints]
        A = [0, 0]
        B = [0, 4]
        C = [5, 4]
        D = [5, 0]
        E = [8, 4]
        [members]
        "A-B" = { section = "s", material = "m" }
        "B-C" = { section = "s", material = "m", rigid_from = 0.3, rigid_to = 0.2 }
        "D-C" = { section = "s", material = "m" }
        "A-C" = { section = "s", material = "m", hinge = "both" }
        "B-D" = { section = "s", material = "m", hinge = "both" }
        "C-E" = { section = "s", material = "m" }
        "C-E again" = { from = "C", to = "E", section = "s", material = "m", spring_to = "900 kN m/rad" }
        [supports]
        A = "fixed"
        D = "pinned"
        [loads.case]
        apply = [
          { joint = "E", force = 9, direction = "down" }, { member = "B-C", uniform = 4, direction = "across" },
          { member = "B-C", force = 7, at = 0.1, direction = 40 }, { member = "B-C", couple = 3, at = 0.3 },
        ]
    """,
    "long zones and great shear": """
        [joints]
        A = [0, 0]
        B = [0, 3]
        C = [3, 3]
        D = [3, 0]
        E = [6, 3]
        F = [6, 0]
        [members]
        "A-B" = { section = "s", material = "m", rigid_to = 1.4 }
        "B-C" = { section = "s", material = "m", rigid_from = 1.45, rigid_to = 1.45 }
        "C-E" = { section = "s", material = "m", rigid_from = 1.4, rigid_to = 1.5 }
        "D-C" = { section = "s", material = "m", rigid_from = 1.2, rigid_to = 1.7 }
        "E-F" = { section = "s", material = "m" }
        [supports]
        A = "fixed"
        D = { y = "held", rotation = "500 kN m/rad" }
        F = "pinned"
        [loads.case]
        apply = [
          { joint = "B", force = 9, direction = "right" }, { member = "C-E", varying = [4, 9], direction = "down" },
        ]
    """,
    "springs whose ground moves": """
        [joints]
        A = [0, 0]
        B = [5, 0]
        C = [11, 1]
        [members]
        "A-B" = { section = "s", material = "m" }
        "B-C" = { section = "s", material = "m" }
        [supports]
        A = { x = "held", y = "900 kN/m", rotation = "4000 kN m/rad" }
        B = { y = "7000 kN/m", angle = 25 }
        C = { y = "held" }
        [loads.case]
        apply = [
          { joint = "A", settlement = { y = -0.02, rotation = 0.003 } }, { joint = "B", settlement = { y = -0.01 } },
          { joint = "C", settlement = { down = 0.005 } },
        ]
    """,
}  # fmt: skip


@pytest.mark.parametrize("shear", ["rigid", "elastic"])
@pytest.mark.parametrize("axial", ["rigid", "elastic"])
@pytest.mark.parametrize("what", DIRECTED)
def test_directed_frames(what: str, axial: str, shear: str) -> None:
    agrees(frame_of(DIRECTED[what], axial, shear))


LOOSE = """
        lone = [9, 9]
        held = [12, 0]
        sprung = [14, 0]
"""


def test_loose_joints_change_nothing() -> None:
    """A joint that nothing joins is undetermined where nothing holds it, and the rest is as without it."""
    text = DIRECTED["springs whose ground moves"]
    more = text.replace("C = [11, 1]\n", "C = [11, 1]\n" + LOOSE.lstrip("\n")).replace(
        "[supports]\n", '[supports]\nheld = "fixed"\nsprung = { x = "5 kN/m", y = "5 kN/m", rotation = "5 kN m/rad" }\n'
    )
    for axial in ("rigid", "elastic"):
        plain, with_loose = answer(frame_of(text, axial)), answer(frame_of(more, axial))
        one, other = plain.cases["case"], with_loose.cases["case"]
        assert other.ends == pytest.approx(one.ends, rel=1e-12, abs=1e-9)
        assert other.joints[:3] == pytest.approx(one.joints, rel=1e-12, abs=1e-15)
        assert np.isnan(other.joints[3]).all()
        assert other.joints[4:] == pytest.approx(0.0) and other.reactions[3:] == pytest.approx(0.0)


def tower(storeys: int, axial: str, area: float = 1.0) -> Frame:
    """A bay of 6 m with storeys of 3.5 m, fixed at its feet, loaded sideways and down."""
    lines = ["[joints]"] + [f'"{s}{k}" = [{6 * (s == "b")}, {3.5 * k}]' for s in "ab" for k in range(storeys + 1)]
    lines.append("[members]")
    for k in range(1, storeys + 1):
        lines += [f'"{s}{k}" = {{ from = "{s}{k - 1}", to = "{s}{k}", section = "s", material = "m" }}' for s in "ab"]
        lines.append(f'"g{k}" = {{ from = "a{k}", to = "b{k}", section = "s", material = "m" }}')
    lines += ["[supports]", 'a0 = "fixed"', 'b0 = "fixed"', "[loads.case]", "apply = ["]
    lines += [f'{{ joint = "a{k}", force = 5, direction = "right" }},' for k in range(1, storeys + 1)]
    lines += [f'{{ member = "g{k}", uniform = 20, direction = "down" }},' for k in range(1, storeys + 1)]
    text = "\n".join([*lines, "]"])
    frame = frame_of(text, axial)
    section = frame.sections["s"]
    return frame if area == 1.0 else read_frame_text(_source(text, axial, section.I, area))


def _source(text: str, axial: str, inertia: float, area: float) -> str:
    return (
        f'units = "kN m"\n[materials.m]\nE = 2e8\n[sections.s]\nI = {inertia}\nA = {area}\n'
        f'[analysis]\naxial = "{axial}"\n{text}'
    )


@pytest.mark.parametrize(("axial", "stiff"), [("rigid", 0.0), ("elastic", 1e4), ("elastic", 1e6)])
def test_tower(axial: str, stiff: float) -> None:
    """Sixteen storeys, EA L^2 / EI up to 1e6 for the girders: still right to 1e-9, and balanced nearly to rounding."""
    frame = tower(16, axial, stiff * EI / 2e8 / 36 if stiff else 1.0)
    agrees(frame)
    process = distribute(frame, frame.names)
    assert process.left.max() < 1e-14


# --- the process ------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("storeys", [1, 3, 16])
def test_a_tower_has_a_sway_a_storey(storeys: int) -> None:
    frame = tower(storeys, "rigid")
    assert sways(frame, np.ones(len(frame.members), dtype=bool)).shape.shape[1] == storeys
    assert sways(frame, np.zeros(len(frame.members), dtype=bool)).shape.shape[1] == 4 * storeys


def test_sways_lengthen_no_rigid_member() -> None:
    frame = frame_of(ARCH)
    s = sways(frame, np.ones(len(frame.members), dtype=bool))
    assert s.shape.shape[1] == 2 * 17 - 18
    assert np.abs((s.stretch[:, s.free] @ s.shape).toarray()).max() < 1e-13


def test_sways_of_pitched_bays_stay_local() -> None:
    """Thirty pitched bays: each eaves sways on its own and takes its two ridges along, nothing further."""
    bays = 30
    lines = ["[joints]", *(f"c{k} = [{8 * k}, 0]\ne{k} = [{8 * k}, 5]" for k in range(bays + 1))]
    lines += [*(f"r{k} = [{8 * k + 4}, 6.5]" for k in range(bays)), "[members]"]
    pairs = [(f"c{k}", f"e{k}") for k in range(bays + 1)]
    pairs += [pair for k in range(bays) for pair in ((f"e{k}", f"r{k}"), (f"r{k}", f"e{k + 1}"))]
    lines += [f'"{a}-{b}" = {{ section = "s", material = "m" }}' for a, b in pairs]
    lines += ["[supports]", *(f'c{k} = "fixed"' for k in range(bays + 1))]
    lines += ["[loads.case]", 'apply = [{ joint = "e3", force = 9, direction = "right" }]']
    frame = frame_of("\n".join(lines))
    shape = sways(frame, np.ones(len(frame.members), dtype=bool)).shape
    assert shape.shape[1] == bays + 1
    assert np.diff(shape.tocsc().indptr).max() <= 5
    agrees(frame)


def test_one_rigid_member_among_elastic_ones() -> None:
    """The girder's two ends move as one; the sways are one fewer."""
    frame = tower(2, "elastic")
    rigid = np.array([name == "g2" for name in frame.members])
    s = sways(frame, rigid)
    assert s.shape.shape[1] == 7
    shape = np.zeros((2 * len(frame.joints), 7))
    shape[s.free] = s.shape.toarray()
    a, b = (frame.joint_index[name] for name in ("a2", "b2"))
    assert shape[2 * a] == pytest.approx(shape[2 * b])


def test_many_sways_and_few_give_the_same(monkeypatch: pytest.MonkeyPatch) -> None:
    """Sways imposed one by one, and corrected together, are two roads to one answer."""
    frame = tower(4, "elastic")
    monkeypatch.setattr(holding, "FEW", 0)
    together = answer(frame).cases["case"]
    assert max(p.corrections for p in distribute(frame, ("case",)).trace) < 40
    monkeypatch.setattr(holding, "FEW", 16)
    one_by_one = answer(frame).cases["case"]
    assert together.ends == pytest.approx(one_by_one.ends, rel=1e-11, abs=1e-9)


def test_slow_carry_over_is_finished_by_conjugate_rounds() -> None:
    """A ring of joints that pass on 0.999 of what they get: plain rounds would take tens of thousands."""
    count = 9
    ring = np.zeros((count, count))
    for k in range(count):
        ring[k, (k + 1) % count] = ring[(k + 1) % count, k] = 0.4995
    process = Distribution(np.ones(count), ring)
    unbalanced = np.zeros((count, 2))
    unbalanced[0], unbalanced[:, 1] = 1.0, 1.0
    turned, rounds = process.distribute(unbalanced, 1e-12)
    assert np.abs(process.resisting(turned) - unbalanced).max() < 1e-11
    assert rounds < 100


def test_conjugate_corrections_leave_alone_what_nothing_resists() -> None:
    apply = np.diag([1.0, 2.0, 0.0])
    x, _ = conjugate(lambda v: apply @ v, lambda v: v, np.array([[1.0], [1.0], [1e-17]]), np.array([1e-15]), 50)
    assert x[:, 0] == pytest.approx([1.0, 0.5, 0.0], abs=1e-12)


def test_imposed_length_that_a_rigid_frame_cannot_follow_is_refused() -> None:
    """The study refuses it first; the opinion does too, naming the member."""
    frame = beam('{ member = "A-B", misfit = 0.01 }')
    with pytest.raises(UnusableInput, match="A-B"):
        study(frame)
    with pytest.raises(UnusableInput, match="A-B"):
        opine(frame, study(beam("")))


def test_only_the_cases_asked_for() -> None:
    frame = next(f for f in map(random_frame, range(3000, 3100)) if len(f.cases) > 1 and f.combinations)
    name = frame.names[-1]
    given = opine(frame, study(frame), [name])
    assert isinstance(given, Answer) and list(given.cases) == [name]
    every = answer(frame).cases[name].ends
    assert np.allclose(given.cases[name].ends, every, rtol=1e-9, atol=1e-11 * np.nanmax(np.abs(every)), equal_nan=True)


# --- along the members ------------------------------------------------------------------------------------------


def test_extremes_of_a_simple_beam() -> None:
    """w L^2 / 8 and 5 w L^4 / 384 EI in the middle."""
    given = answer(beam('{ member = "A-B", uniform = 10, direction = "down" }', ("pinned", "roller")))
    member, x = given.spans.turning_points("case")
    assert np.allclose(x, L / 2, rtol=1e-12) and len(x) >= 1
    along = given.spans.along("case", member, x, np.ones(len(x), dtype=np.int64))
    assert along[0, 2] == pytest.approx(10 * L**2 / 8, rel=1e-13)
    assert along[0, 3] == pytest.approx(-5 * 10 * L**4 / (384 * EI), rel=1e-13)


def test_cantilever_deflection_with_shear_and_temperature() -> None:
    """P L^3 / 3EI + P L / (G As), and alpha difference L^2 / 2 depth: the warmer -y face is the longer one."""
    load = '{ joint = "B", force = 10, direction = "down" }'
    frame = frame_of(_free_end(load), shear="elastic")
    tip = answer(frame).cases["case"].joints[1]
    assert tip[1] == pytest.approx(-10 * L**3 / (3 * EI) - 10 * L / GAS, rel=1e-13)
    warm = answer(frame_of(_free_end('{ member = "A-B", difference = 30 }')))
    assert warm.cases["case"].joints[1, 1] == pytest.approx(1e-5 * 30 / 0.5 * L**2 / 2, rel=1e-12)
    middle = warm.spans.along("case", np.array([0]), np.array([L / 2]), np.array([1]))
    assert middle[0, 3] == pytest.approx(1e-5 * 30 / 0.5 * L**2 / 8, rel=1e-12)


def _free_end(load: str) -> str:
    return f"""
        [joints]
        A = [0, 0]
        B = [{L}, 0]
        [members]
        "A-B" = {{ section = "s", material = "m" }}
        [supports]
        A = "fixed"
        [loads.case]
        apply = [{load}]
    """


@pytest.mark.parametrize("seed", range(3100, 3110))
def test_turning_points_hold_the_extremes(seed: int) -> None:
    """No place of a fine sweep goes beyond the extremes at stations and turning points."""
    frame = random_frame(seed)
    given, s = answer(frame), stations(frame)
    count = len(frame.members)
    fine = np.linspace(0, 1, 401)
    for name in frame.names:
        member, x = given.spans.turning_points(name)
        assert np.all((x > 0) & (x < frame.member_table.length[member]))
        some = np.concatenate([
            given.spans.along(name, s.member, s.x, s.side),
            given.spans.along(name, member, x, np.ones(len(x), dtype=np.int64)),
        ])  # fmt: skip
        owner = np.concatenate([s.member, member])
        sweep = given.spans.along(
            name, np.repeat(np.arange(count), 401), np.outer(frame.member_table.length, fine).ravel(),
            np.ones(401 * count, dtype=np.int64),
        )  # fmt: skip
        for column in (1, 2, 3):
            values = sweep[:, column].reshape(count, 401)
            room = 1e-9 * max(np.nanmax(np.abs(values), initial=0.0), 1e-9)
            for m in range(count):
                mine = some[owner == m, column]
                if not np.isnan(mine).any():
                    assert values[m].max() <= mine.max() + room
                    assert values[m].min() >= mine.min() - room


def test_roots_of_polynomials() -> None:
    """(x - 0.2)(x - 0.5)(x - 0.9)(x + 1) has three roots inside; a constant has none."""
    terms = np.polynomial.polynomial.polyfromroots([0.2, 0.5, 0.9, -1.0])
    found = _unit_roots(np.stack([terms, [1.0, 0, 0, 0, 0]]))
    assert np.sort(found[0][~np.isnan(found[0])]) == pytest.approx([0.2, 0.5, 0.9], abs=1e-14)
    assert np.isnan(found[1]).all()


# --- working ----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("seed", range(3000, 3040))
def test_working_adds_up(seed: int) -> None:
    """Shares sum to one, columns sum to their totals, and the final end moments are the answer's."""
    frame = random_frame(seed)
    name = frame.names[0]
    tables = {t.heading: t for t in working(frame, study(frame), name)}
    factors = tables["Distribution and carry-over factors"]
    shares: dict[object, float] = {}
    for joint, _, _, share, _ in factors.rows:
        shares[joint] = shares.get(joint, 0.0) + float(share or 0.0)
    assert all(total == pytest.approx(1, abs=1e-12) or total == 0 for total in shares.values())
    case = answer(frame).cases[name]
    size = np.abs(case.ends[:, :, 2]).max() + 1.0
    for heading in ("Distribution, joints held against sway", "End moments", "Fixed-end moments, every joint held"):
        for row in tables[heading].rows:
            *parts, total = (float(v or 0.0) for v in row[2:])
            assert "-0.0" not in map(str, row[2:])
            assert sum(parts) == pytest.approx(total, abs=1e-6 * size)
    for joint, member, *_, final in tables["End moments"].rows:
        m = frame.member_index[str(member)]
        end = frame.member_table.ends[m].tolist().index(frame.joint_index[str(joint)])
        assert final == pytest.approx(case.ends[m, end, 2], abs=1e-9 * size)


def test_working_of_a_spring_whose_ground_turns() -> None:
    """Ground turned by t under a spring k: the joint turns by k t / (k + 4 EI / L), the moments there are 4 EI / L times
    that, and half of it beyond (slope-deflection)."""
    frame = frame_of("""
        [joints]
        A = [0, 0]
        B = [6, 0]
        [members]
        "A-B" = { section = "s", material = "m" }
        [supports]
        A = "fixed"
        B = { y = "held", rotation = 5000 }
        [loads.case]
        apply = [{ joint = "B", settlement = { rotation = 0.003 } }]
    """)
    t = frame.member_table
    stiff = float(4 * t.E[0] * t.I[0] / 6)
    table = next(t for t in working(frame, study(frame), "case") if t.heading == "End moments")
    final = [row[-1] for row in table.rows]
    held = [row[2] for row in table.rows]  # nothing pushes sideways: what is there before the sway is all
    moment = stiff * 5000 * 0.003 / (5000 + stiff)
    assert np.abs(np.array(final, dtype=float)) == pytest.approx([moment / 2, moment], rel=1e-9)
    assert held == pytest.approx(final, rel=1e-9)
    assert np.abs(answer(frame).cases["case"].ends[0, :, 2]) == pytest.approx([moment / 2, moment], rel=1e-9)


def test_distribution_by_hand() -> None:
    """Two spans of 6 m, the first with w = 10, far ends fixed: 30 released as -15 each side, -7.5 carried (by hand)."""
    text = """
        [joints]
        A = [0, 0]
        B = [6, 0]
        C = [12, 0]
        [members]
        "A-B" = { section = "s", material = "m" }
        "B-C" = { section = "s", material = "m" }
        [supports]
        A = "fixed"
        B = "roller"
        C = "fixed"
        [loads.case]
        apply = [{ member = "A-B", uniform = 10, direction = "down" }]
    """
    frame = frame_of(text)
    table = next(t for t in working(frame, study(frame), "case") if t.heading.startswith("Distribution, "))
    values = {(row[0], row[1]): [float(v or 0.0) for v in row[2:]] for row in table.rows}
    assert values["A", "A-B"] == pytest.approx([-30, 0, -7.5, 0, 0, 0, -37.5])
    assert values["B", "A-B"] == pytest.approx([30, -15, 0, 0, 0, 0, 15])
    assert values["B", "B-C"] == pytest.approx([0, -15, 0, 0, 0, 0, -15])
    assert values["C", "B-C"] == pytest.approx([0, 0, -7.5, 0, 0, 0, -7.5])
