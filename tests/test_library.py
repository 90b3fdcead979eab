"""The library's opinion: held to an independent solution on random frames, to closed forms, and to its abstentions."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import replace
from functools import cache
from typing import Any

import numpy as np
import pytest

from crosscheck.answer import Answer, CaseAnswer, Silent
from crosscheck.frame.kinematics import study
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import (
    FREE,
    HELD,
    Analysis,
    Combination,
    Direction,
    Floats,
    Frame,
    Joint,
    JointCouple,
    JointForce,
    Load,
    LoadCase,
    Material,
    Member,
    Misfit,
    PointCouple,
    PointForce,
    Section,
    SelfWeight,
    Settlement,
    Spread,
    Support,
    Temperature,
    Units,
)
from crosscheck.frame.stations import stations
from crosscheck.opinions.library import opine, qualification
from crosscheck.problems import UnusableInput
from tests.truth import CannotFollow, Mechanism, Truth

# --- random frames of the class it must speak for ------------------------------------------------------------------


class Dice:
    """A skewed frame of one to three bays and storeys with every feature the library speaks for, each by chance."""

    def __init__(self, seed: int) -> None:
        self.rng = np.random.default_rng(seed)

    def chance(self, p: float) -> bool:
        return bool(self.rng.random() < p)

    def size(self, low: float, high: float) -> float:
        return float(np.exp(self.rng.uniform(np.log(low), np.log(high))))

    def force(self) -> float:
        return float(self.rng.normal()) * 10.0

    def angle(self) -> float:
        return float(self.rng.choice([0.0, 90.0, -90.0, 180.0, self.rng.uniform(-180, 180)]))

    def direction(self) -> Direction:
        return ("across", "along", self.angle(), self.angle())[int(self.rng.integers(4))]

    def frame(self) -> Frame:
        bays, storeys = int(self.rng.integers(1, 4)), int(self.rng.integers(1, 4))
        self.joints = {
            f"{i}{k}": Joint(f"{i}{k}", *(np.array([6.0 * i, 4.0 * k]) + self.rng.normal(size=2) * self.skew()))
            for k in range(storeys + 1) for i in range(bays + 1)
        }  # fmt: skip
        pairs = [(f"{i}{k}", f"{i}{k + 1}") for k in range(storeys) for i in range(bays + 1)]
        pairs += [(f"{i}{k}", f"{i + 1}{k}") for k in range(1, storeys + 1) for i in range(bays)]
        rigid = self.chance(0.4)
        if not rigid and self.chance(0.3):
            pairs.append(("00", "11"))
        self.members = {f"{a}-{b}": self.member(f"{a}-{b}", a, b) for a, b in pairs}
        supports = {f"{i}0": self.support(f"{i}0") for i in range(bays + 1)}
        if self.chance(0.2):
            far = f"{bays}{storeys}"
            x, y, rotation = self.rng.permutation([self.size(10, 1e5), FREE, FREE]).tolist()
            supports[far] = Support(far, x, y, rotation, self.angle())
        sections = {s: Section(s, I=self.size(1e-5, 1e-3), A=0.0) for s in ("s", "t")}
        # EA L^2 / EI up to 1e6.
        sections = {s: replace(q, A=q.I * self.size(20, 1e6) / 16.0) for s, q in sections.items()}
        cases = {name: LoadCase(name, tuple(self.loads())) for name in ("a", "b")}
        return Frame(
            title="", units=Units("kN", "m", 1e3, 1.0), materials={"m": Material("m", E=2e8, weight=77.0)},
            sections=sections, joints=self.joints, members=self.members, supports=supports, cases=cases,
            combinations={"ab": Combination("ab", {"a": 1.35, "b": -0.7})},
            analysis=Analysis(axial="rigid" if rigid else "elastic", axial_stated=True),
        )  # fmt: skip

    def skew(self) -> float:
        return float(self.rng.choice([0.0, 0.4]))

    def member(self, name: str, a: str, b: str) -> Member:
        if self.chance(0.3):
            a, b = b, a
        turn = [float(self.rng.choice([HELD, FREE, self.size(1e2, 1e6)], p=[0.6, 0.2, 0.2])) for _ in range(2)]
        return Member(name, a, b, "st"[self.chance(0.5)], "m", turn[0], turn[1])

    def support(self, joint: str) -> Support:
        if self.chance(0.5):
            return Support(joint, HELD, HELD, float(self.rng.choice([HELD, FREE])))
        kinds = [HELD, FREE, self.size(1e2, 1e6)]
        x, y, rotation = self.rng.choice(kinds, size=3, p=[0.4, 0.25, 0.35]).tolist()
        return Support(joint, x, y, rotation, self.angle())

    def loads(self) -> list[Load]:
        out: list[Load] = [SelfWeight(0, 1.0)] if self.chance(0.3) else []
        for joint in self.joints:
            if self.chance(0.2):
                out.append(JointForce(0, joint, self.force(), self.angle()))
            if self.chance(0.1):
                out.append(JointCouple(0, joint, self.force()))
        for member in self.members.values():
            a, b = self.joints[member.joint_from], self.joints[member.joint_to]
            for _ in range(int(self.rng.integers(0, 4))):
                out.append(self.member_load(member.name, math.hypot(a.x - b.x, a.y - b.y)))
        return out or [JointForce(0, "01", 1.0, 0.0)]

    def place(self, length: float) -> float:
        return length * float(self.rng.choice([0.0, 1.0, 0.5, self.rng.random(), 1e-3 * self.rng.random()]))

    def member_load(self, member: str, length: float) -> Load:
        kind = self.rng.random()
        if kind < 0.3:
            return PointForce(0, member, self.force(), self.direction(), self.place(length))
        if kind < 0.5:
            return PointCouple(0, member, self.force(), self.place(length))
        start, end = (0.0, length) if self.chance(0.4) else sorted((self.place(length), self.place(length)))
        if end <= start:
            start, end = 0.0, length
        first = self.force()
        last = first if self.chance(0.5) else self.force()
        direction = self.direction()
        projection = isinstance(direction, float) and self.chance(0.5)
        return Spread(0, member, first, last, direction, start, end, projection)


@cache
def solved(seed: int) -> tuple[Frame, Truth, Answer] | None:
    """The seed's frame, its truth and the library's word; None for a mechanism, an unusable frame or one outside the
    class it must speak for."""
    frame = Dice(seed).frame()
    try:
        geometry = study(frame)
        truth = Truth(frame)
    except (UnusableInput, Mechanism, CannotFollow):
        return None
    if geometry.undetermined.axial.any():
        return None
    answer = opine(frame, geometry)
    assert isinstance(answer, Answer), answer
    return frame, truth, answer


def gap(got: Floats, true: Floats, sizes: Floats) -> float:
    """Largest difference as a share of `sizes` (last axis); what is undetermined must be so in both."""
    assert (np.isnan(got) == np.isnan(true)).all()
    return float(np.nanmax(np.abs(got - true) / sizes, initial=0.0))


def worst(frame: Frame, got: CaseAnswer, true: CaseAnswer) -> float:
    """Largest difference in a case as a share of its largest value of that kind."""
    longest = float(frame.member_table.length.max())
    force = max(float(np.nanmax(np.abs(f[..., :2]))) for f in (true.ends, true.reactions))
    moment = max(float(np.nanmax(np.abs(true.ends[..., 2]))), force * longest)
    turned = float(np.nanmax(np.abs(true.joints[:, 2]), initial=0.0))
    moved = max(float(np.nanmax(np.abs(true.joints[:, :2]))), turned * longest)
    forces = np.array([force, force, moment])
    return max(
        gap(got.ends, true.ends, forces),
        gap(got.reactions, true.reactions, forces),
        gap(got.joints, true.joints, np.array([moved, moved, moved / longest])),
    )


SEEDS = range(120)


def test_the_dice_throw_enough_frames_and_every_feature() -> None:
    frames = [found[0] for seed in SEEDS if (found := solved(seed))]
    assert len(frames) >= 90
    tables = [[load_table(frame, name) for name in frame.names] for frame in frames]
    for feature in qualification.FEATURES:
        assert sum(feature.used(f, t) for f, t in zip(frames, tables, strict=True)) >= 10, feature.name


@pytest.mark.parametrize("seed", SEEDS)
def test_it_agrees_with_an_independent_solution(seed: int) -> None:
    found = solved(seed)
    if found is None:
        return
    frame, truth, answer = found
    assert not answer.silent
    assert set(answer.cases) == set(frame.names)
    for name, case in answer.cases.items():
        assert worst(frame, case, truth.cases[name]) < 1e-7, name


@pytest.mark.parametrize("seed", range(0, 120, 8))
def test_values_along_members_are_right_where_given_and_given_at_most_stations(seed: int) -> None:
    found = solved(seed)
    if found is None:
        return
    frame, truth, answer = found
    places = stations(frame)
    for name in answer.cases:
        got = answer.spans.along(name, places.member, places.x, places.side)
        true = truth.along(name, places.member, places.x, places.side)
        given = ~np.isnan(got)
        assert given.mean() > 0.6
        sizes = np.maximum(np.nanmax(np.abs(true), axis=0), 1e-12)
        assert np.max((np.abs(got - true) / sizes)[given]) < 1e-7


def test_this_comparison_can_fail() -> None:
    found = next(f for seed in SEEDS if (f := solved(seed)))
    frame, truth, answer = found
    name = frame.names[0]
    wrong = replace(answer.cases[name], ends=answer.cases[name].ends * (1 + 1e-5))
    assert worst(frame, wrong, truth.cases[name]) > 1e-7


# --- beams -----------------------------------------------------------------------------------------------------------


def beam(*loads: Load, analysis: Analysis | None = None, **member: float) -> Frame:
    """A-B fixed at A, pinned at B, 4 long, with the loads in case "c", and a couple at B in case "d"."""
    return Frame(
        title="", units=Units("kN", "m", 1e3, 1.0), materials={"m": Material("m", 2e8, G=8e7, alpha=1e-5)},
        sections={"s": Section("s", 1e-4, 1e-2, 5e-3, 0.3)}, joints={"A": Joint("A", 0, 0), "B": Joint("B", 4, 0)},
        members={"AB": Member("AB", "A", "B", "s", "m", **member)},
        supports={"A": Support("A", HELD, HELD, HELD), "B": Support("B", HELD, HELD, FREE)},
        cases={"c": LoadCase("c", loads), "d": LoadCase("d", (JointCouple(0, "B", 1.0),))},
        analysis=analysis or Analysis(),
    )  # fmt: skip


def speak(frame: Frame) -> Answer | Silent:
    return opine(frame, study(frame))


def test_the_installed_version_qualifies_in_every_feature() -> None:
    assert {f.name: qualification.outcome(f) for f in qualification.FEATURES if qualification.outcome(f)} == {}


def test_qualification_is_data_with_sources() -> None:
    for feature in qualification.FEATURES:
        trials = list(feature.trials())
        assert trials
        assert all(trial.expected and trial.source for trial in trials), feature.name


def test_a_propped_cantilever_by_the_book() -> None:
    answer = speak(beam(Spread(0, "AB", 6.0, 6.0, -90.0, 0.0, 4.0)))
    assert isinstance(answer, Answer)
    case = answer.cases["c"]
    assert case.ends[0, :, 2] == pytest.approx([-12.0, 0.0], abs=1e-9)
    assert case.reactions[:, 1] == pytest.approx([15.0, 9.0])
    there = answer.spans.along("c", np.array([0]), np.array([2.0]), np.array([1]))
    assert there[0, :3] == pytest.approx([0.0, 3.0, 6.0], abs=1e-9)


def test_either_side_of_a_jump() -> None:
    answer = speak(beam(PointForce(0, "AB", 16.0, -90.0, 2.0)))
    assert isinstance(answer, Answer)
    both = answer.spans.along("c", np.array([0, 0]), np.array([2.0, 2.0]), np.array([-1, 1]))
    assert both[:, 1] == pytest.approx([11.0, -5.0])
    assert both[:, 2] == pytest.approx([10.0, 10.0])


def test_what_lies_between_the_forces_of_a_restated_load_is_not_given() -> None:
    answer = speak(beam(PointForce(0, "AB", 16.0, -90.0, 0.01)))
    assert isinstance(answer, Answer)
    tenths = np.linspace(0.0, 4.0, 11)
    got = answer.spans.along("c", np.zeros(11, dtype=np.int64), tenths, np.array([-1, *[1] * 9, -1]))
    assert list(np.flatnonzero(np.isnan(got[:, 2]))) == [1, 2]


def test_a_joint_that_nothing_joins_hands_its_load_to_its_support() -> None:
    frame = beam(JointForce(0, "C", 3.0, -90.0))
    frame = replace(
        frame, joints={**frame.joints, "C": Joint("C", 9, 9)},
        supports={**frame.supports, "C": Support("C", HELD, HELD, FREE)},
    )  # fmt: skip
    answer = speak(frame)
    assert isinstance(answer, Answer)
    assert answer.cases["c"].reactions[2] == pytest.approx([0.0, 3.0, 0.0])
    assert np.isnan(answer.cases["c"].joints[2, 2])


@pytest.mark.parametrize("load", [Settlement(0, "B", y=-0.01), Temperature(0, "AB", mean=20.0), Misfit(0, "AB", 0.01)])
def test_it_abstains_from_a_case_it_cannot_follow_and_speaks_for_the_others(load: Load) -> None:
    answer = speak(beam(load))
    assert isinstance(answer, Answer)
    assert set(answer.cases) == {"d"}
    assert {Settlement: "settlement", Temperature: "temperature", Misfit: "misfit"}[type(load)] in answer.silent["c"]


def test_it_abstains_where_no_case_is_left() -> None:
    frame = beam(Misfit(0, "AB", 0.01))
    answer = opine(frame, study(frame), ["c"])
    assert answer == Silent("library", "it knows no misfit")


@pytest.mark.parametrize(
    ("frame", "reason"),
    [
        (beam(analysis=Analysis(shear="elastic")), "shear deformation"),
        (beam(analysis=Analysis(order=2)), "second-order"),
        (beam(rigid_from=0.2), "rigid end zones"),
        (beam(analysis=Analysis(axial="rigid")), "undetermined"),
    ],
)
def test_it_abstains_from_a_frame_it_cannot_follow(frame: Frame, reason: str) -> None:
    answer = speak(frame)
    assert isinstance(answer, Silent)
    assert reason in answer.why


def test_it_abstains_above_a_size_and_says_so() -> None:
    answer = opine(beam(), study(beam()), size_limit=0)
    assert isinstance(answer, Silent)
    assert "1 members are more than the 0" in answer.why
    assert isinstance(opine(beam(), study(beam()), size_limit=None), Answer)


def rigid(joints: dict[str, tuple[float, float]], members: list[Member], supports: list[Support], *loads: Load) -> Frame:
    return Frame(
        title="", units=Units("kN", "m", 1e3, 1.0), materials={"m": Material("m", 2e8)},
        sections={"s": Section("s", 1e-4), "t": Section("t", 2.5e-3)},
        joints={n: Joint(n, *xy) for n, xy in joints.items()},
        members={m.name: m for m in members}, supports={s.joint: s for s in supports},
        cases={"c": LoadCase("c", loads)}, analysis=Analysis(axial="rigid"),
    )  # fmt: skip


STILL = rigid(
    {"A": (0, 0), "B": (4, 0), "C": (2, 3)},
    [Member("AB", "A", "B", "s", "m"), Member("BC", "B", "C", "s", "m"), Member("CA", "C", "A", "s", "m")],
    [Support("A", HELD, HELD, FREE), Support("B", FREE, HELD, FREE)],
    JointForce(0, "C", 8.0, -70.0),
)
"""Its joints do not move at all, so displacements are rounding and nothing else."""
NEARLY_LOOSE = rigid(
    {"A": (0, 0), "B": (-13.6, 186.5), "C": (246, 186.8), "D": (235.6, -28.4)},
    [
        Member("AB", "A", "B", "t", "m"),
        Member("BC", "B", "C", "s", "m"),
        Member("CD", "C", "D", "s", "m"),
        Member("CA", "C", "A", "s", "m", FREE, FREE),
    ],
    [Support("A", HELD, HELD, FREE), Support("D", FREE, HELD, FREE), Support("B", FREE, HELD, FREE)],
    PointForce(0, "BC", 11.0, "across", 22.0),
    PointForce(0, "CD", 13.0, 0.0, 47.0),
)
"""AB alone keeps it from swaying, by its slight slope: its axial force is a multiple of the loads."""


@pytest.mark.parametrize("frame", [STILL, NEARLY_LOOSE], ids=["still", "nearly loose"])
def test_axially_rigid_frames_that_barely_move(frame: Frame) -> None:
    answer = speak(frame)
    assert isinstance(answer, Answer)
    true = Truth(frame).cases["c"]
    force = np.abs(true.ends[..., :2]).max()
    assert np.abs(answer.cases["c"].ends - true.ends).max() < 1e-8 * force * frame.member_table.length.max()
    supple = force * frame.member_table.length.max() ** 3 / (2e8 * 1e-4)
    assert np.abs(answer.cases["c"].joints - true.joints).max() < 1e-8 * supple


# --- a library that has changed inside -----------------------------------------------------------------------------


@pytest.fixture
def fresh_qualification() -> Iterator[None]:
    qualification.outcome.cache_clear()
    yield
    qualification.outcome.cache_clear()


def broken_stiffness(monkeypatch: pytest.MonkeyPatch) -> None:
    from anastruct.fem import elements

    right = elements.constitutive_matrix
    monkeypatch.setattr(elements, "constitutive_matrix", lambda *given: 1.001 * right(*given))


def broken_line_loads(monkeypatch: pytest.MonkeyPatch) -> None:
    from anastruct.fem.system_components import assembly

    right = assembly.det_moment  # type: ignore[attr-defined]  # imported there by the library
    monkeypatch.setattr(assembly, "det_moment", lambda *given: 1.001 * right(*given))


def missing_numbers(monkeypatch: pytest.MonkeyPatch) -> None:
    from anastruct.fem.system import SystemElements

    right = SystemElements.solve

    def solve(self: Any, **given: bool) -> None:
        right(self, **given)
        self.system_displacement_vector *= np.nan

    monkeypatch.setattr(SystemElements, "solve", solve)


def broken_interface(monkeypatch: pytest.MonkeyPatch) -> None:
    from anastruct.fem.system import SystemElements

    monkeypatch.delattr(SystemElements, "moment_load")


@pytest.mark.usefixtures("fresh_qualification")
@pytest.mark.parametrize(
    ("break_it", "feature"),
    [
        (broken_stiffness, "bending and stretching"),
        (broken_line_loads, "line loads"),
        (broken_interface, "bending and stretching"),
        (missing_numbers, "bending and stretching"),
    ],
)
def test_a_library_that_gives_other_values_makes_it_abstain(
    monkeypatch: pytest.MonkeyPatch, break_it: Callable[[pytest.MonkeyPatch], None], feature: str
) -> None:
    frame = beam(Spread(0, "AB", 6.0, 6.0, -90.0, 0.0, 4.0))
    break_it(monkeypatch)
    answer = speak(frame)
    assert isinstance(answer, Silent)
    assert f"fails its qualification in {feature}" in answer.why


@pytest.mark.usefixtures("fresh_qualification")
def test_only_features_in_use_are_tried(monkeypatch: pytest.MonkeyPatch) -> None:
    broken_line_loads(monkeypatch)
    assert isinstance(speak(beam(PointForce(0, "AB", 1.0, "along", 1.0))), Answer)
    assert isinstance(speak(beam(Spread(0, "AB", 1.0, 1.0, "along", 0.0, 4.0))), Silent)
