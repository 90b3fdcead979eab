"""Laws that every right answer obeys whatever the frame: for each opinion, and for the whole of `verify`.

Superposition, reciprocity, mirror image, turning, renaming and reordering, change of units, splitting a member, scaling.
Frames are the random ones of tests/random_frames.py; the laws are those of linear elasticity (Maxwell 1864; Betti 1872).
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import replace
from functools import lru_cache

import numpy as np
import pytest
from hypothesis import HealthCheck, assume, given, settings
from hypothesis import strategies as st

from crosscheck import check
from crosscheck.answer import ACROSS, Answer, CaseAnswer, Silent
from crosscheck.claims import FrameNames, read_claim_text
from crosscheck.compare.tolerance import KIND, case_scales
from crosscheck.frame.kinematics import study
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import (
    Combination,
    Frame,
    JointForce,
    Load,
    LoadCase,
    PointForce,
    Units,
)
from crosscheck.opinions import library, moment_distribution, slope_deflection
from tests.agreement import COLUMNS
from tests.random_frames import random_frame
from tests.transforms import Changed, imposed, in_units, mirrored, printed, renamed, scaled, split, turned

OPINIONS = {"slope-deflection": slope_deflection, "moment-distribution": moment_distribution, "library": library}
EXAMPLES = {"slope-deflection": 30, "moment-distribution": 30, "library": 6}
VERIFIED = 5
OWN, OF_LIBRARY = 1e-9, 1e-6
"""Share of scale: the random frames are held to 1e-9 (test_agreement.py), the library to its restatements' precision."""
SEEDS = st.integers(0, 79)
UNITS = [
    Units("N", "mm", 1.0, 1e-3), Units("kip", "ft", 4448.2216152605, 0.3048), Units("lbf", "in", 4.4482216152605, 0.0254),
]  # fmt: skip

Law = Callable[[Frame, np.random.Generator], Changed | None]


def some(examples: int) -> settings:
    """The same examples in every run."""
    checks = [HealthCheck.too_slow, HealthCheck.filter_too_much, HealthCheck.data_too_large]
    return settings(max_examples=examples, derandomize=True, deadline=None, database=None, suppress_health_check=checks)


@lru_cache(maxsize=200)
def drawn(seed: int) -> Frame:
    """A random frame without what it is told to add up to, which a change of the frame would make wrong."""
    frame = random_frame(seed)
    return replace(frame, cases={n: LoadCase(n, c.loads) for n, c in frame.cases.items()})


def heard(opinion: str, frame: Frame) -> Answer | None:
    said = OPINIONS[opinion].opine(frame, study(frame))
    if isinstance(said, Silent):
        assert opinion == "library", said.why
        return None
    return said


def apart(frame: Frame, name: str, one: CaseAnswer, other: CaseAnswer) -> float:
    """Largest difference as a share of the case's scale of each quantity; what either leaves open is passed over."""
    scales = case_scales(frame, load_table(frame, name), [one, other])
    worst = 0.0
    for kind in ("ends", "joints", "reactions"):
        scale = np.array([getattr(scales, KIND[c]) for c in COLUMNS[kind]])
        off = np.abs(getattr(one, kind) - getattr(other, kind)) / np.where(scale > 0, scale, 1.0)
        worst = max(worst, float(np.nanmax(off, initial=0.0)) if not np.isnan(off).all() else 0.0)
    return worst


# --- changes of the frame: what each law does to it


def _turned(frame: Frame, dice: np.random.Generator) -> Changed:
    return turned(frame, float(dice.choice([90.0, 180.0, -90.0, 37.0, 123.4])))


def _mirrored(frame: Frame, dice: np.random.Generator) -> Changed:
    return mirrored(frame)


def _units(frame: Frame, dice: np.random.Generator) -> Changed:
    return in_units(frame, UNITS[int(dice.integers(len(UNITS)))])


def _split(frame: Frame, dice: np.random.Generator) -> Changed | None:
    name = list(frame.members)[int(dice.integers(len(frame.members)))]
    return split(frame, name, float(dice.choice([0.25, 0.5, 0.61])))


def _scaled(frame: Frame, dice: np.random.Generator) -> Changed:
    return scaled(frame, float(dice.choice([-1.0, 0.01, 250.0])), 1.0 if imposed(frame) else float(dice.choice([0.1, 7.0])))


LAWS: dict[str, Law] = {
    "turning": _turned, "mirror image": _mirrored, "renaming and reordering": renamed, "change of units": _units,
    "splitting a member": _split, "scaling": _scaled,
}  # fmt: skip


@pytest.mark.parametrize("opinion", OPINIONS)
@pytest.mark.parametrize("law", LAWS)
def test_law_of_an_opinion(law: str, opinion: str) -> None:
    """The changed frame's answer, taken back, is the frame's own."""
    kept = 0

    @some(EXAMPLES[opinion])
    @given(SEEDS, st.integers(0, 2**32 - 1))
    def holds(seed: int, dice: int) -> None:
        nonlocal kept
        frame = drawn(seed)
        changed = LAWS[law](frame, np.random.default_rng(dice))
        assert changed is not None
        one, other = heard(opinion, frame), heard(opinion, changed.frame)
        assume(one is not None and other is not None)
        assert one is not None and other is not None
        for name in set(one.cases) & set(other.cases):
            share = apart(frame, name, one.cases[name], changed.back(other.cases[name]))
            assert share <= (OF_LIBRARY if opinion == "library" else OWN), (seed, name, share)
            kept += 1

    holds()
    assert kept >= EXAMPLES[opinion] // 3


@pytest.mark.parametrize("opinion", OPINIONS)
def test_superposition(opinion: str) -> None:
    """A combination is the sum of its cases times their factors, along the members too."""
    kept = 0

    @some(EXAMPLES[opinion])
    @given(SEEDS, st.floats(-3, 3), st.floats(-3, 3))
    def holds(seed: int, first: float, second: float) -> None:
        nonlocal kept
        frame = drawn(seed)
        names = list(frame.cases)
        assume(len(names) >= 2)
        a, b = names[:2]
        frame = replace(frame, combinations={"sum": Combination("sum", {a: first, b: second})})
        said = heard(opinion, frame)
        assume(said is not None and {a, b, "sum"} <= set(said.cases))
        assert said is not None
        one, two = said.cases[a], said.cases[b]
        total = CaseAnswer(*(
            first * getattr(one, kind) + second * getattr(two, kind) for kind in ("ends", "joints", "reactions")
        ))  # fmt: skip
        share = max(apart(frame, of, said.cases["sum"], total) for of in (a, b))
        assert share <= (OF_LIBRARY if opinion == "library" else OWN) * (1 + abs(first) + abs(second)), (seed, share)
        kept += 1

    holds()
    assert kept >= 1


@pytest.mark.parametrize("opinion", OPINIONS)
def test_reciprocity(opinion: str) -> None:
    """The work of one load in the displacements of another is the same the other way round: joints and spans."""
    kept = 0

    @some(EXAMPLES[opinion])
    @given(SEEDS, st.integers(0, 2**32 - 1))
    def holds(seed: int, dice: int) -> None:
        nonlocal kept
        frame = drawn(seed)
        throw = np.random.default_rng(dice)
        joined = {j for m in frame.members.values() for j in (m.joint_from, m.joint_to)}
        joint = sorted(joined)[int(throw.integers(len(joined)))]
        member, angle = list(frame.members)[int(throw.integers(len(frame.members)))], float(throw.uniform(0, 360))
        at = float(throw.uniform(0.1, 0.9) * frame.member_table.length[frame.member_index[member]])
        loads: dict[str, Load] = {
            "joint": JointForce(0, joint, 1.0, angle), "span": PointForce(0, member, 1.0, "across", at),
        }  # fmt: skip
        loaded = replace(frame, cases={n: LoadCase(n, (one,)) for n, one in loads.items()}, combinations={})
        said = heard(opinion, loaded)
        assume(said is not None and len(said.cases) == 2)
        assert said is not None
        dx, dy = said.cases["span"].joints[frame.joint_index[joint], :2]
        one = dx * math.cos(math.radians(angle)) + dy * math.sin(math.radians(angle))
        index = np.array([frame.member_index[member]])
        other = float(said.spans.along("joint", index, np.array([at]), np.array([1]))[0, ACROSS])
        assume(math.isfinite(one) and math.isfinite(other))
        sizes = [case_scales(loaded, load_table(loaded, n), [said.cases[n]]).displacements for n in loads]
        assert abs(one - other) <= (OF_LIBRARY if opinion == "library" else OWN) * max(sizes), (seed, one, other)
        kept += 1

    holds()
    assert kept >= EXAMPLES[opinion] // 3 or opinion == "library"


def _verdict(frame: Frame, text: str) -> str:
    reading = read_claim_text(text, FrameNames.of(frame))
    return check.verify(frame, reading, suspects=False).verdict


def _answers(frame: Frame, slip: bool, of: tuple[str, ...]) -> dict[str, CaseAnswer]:
    """Slope-deflection's results for the cases `of`; with `slip` the largest end moment of the first is 30% too small."""
    said = slope_deflection.opine(frame, study(frame))
    assert isinstance(said, Answer)
    cases = {name: said.cases[name] for name in of}
    if slip:
        moments = cases[of[0]].ends[:, :, 2]
        moments[np.unravel_index(int(np.argmax(np.abs(moments))), moments.shape)] *= 0.7
    return cases


@pytest.mark.parametrize("slip", [False, True], ids=["right", "wrong"])
@pytest.mark.parametrize("law", LAWS)
def test_law_of_verify(law: str, slip: bool) -> None:
    """A claim printed from the changed frame has the verdict of the one printed from the frame itself."""
    kept = 0

    @some(VERIFIED)
    @given(st.integers(0, 39), st.integers(0, 2**32 - 1))
    def holds(seed: int, dice: int) -> None:
        nonlocal kept
        frame = drawn(seed)
        frame = replace(frame, combinations={}, cases=dict(list(frame.cases.items())[:1]))
        assume(next(iter(frame.cases.values())).loads)
        changed = LAWS[law](frame, np.random.default_rng(dice))
        assert changed is not None
        of = tuple(frame.cases)
        verdicts = [_verdict(f, printed(f, _answers(f, slip, of))) for f in (frame, changed.frame)]
        assert verdicts == ["disagree" if slip else "agree"] * 2, seed
        kept += 1

    holds()
    assert kept >= 3


@pytest.mark.parametrize("slip", [False, True], ids=["right", "wrong"])
def test_superposition_in_verify(slip: bool) -> None:
    """Cases printed by one of the opinions, added up by hand, are the combination's results to `verify`."""
    kept = 0

    @some(VERIFIED)
    @given(st.integers(0, 39), st.sampled_from([1.35, -0.6, 0.9]), st.sampled_from([1.5, 1.05, -1.0]))
    def holds(seed: int, first: float, second: float) -> None:
        nonlocal kept
        frame = drawn(seed)
        a, b = list(frame.cases)[:2] if len(frame.cases) > 1 else ("", "")
        assume(a and frame.cases[a].loads and frame.cases[b].loads)
        frame = replace(frame, cases={n: frame.cases[n] for n in (a, b)})
        parts = _answers(frame, slip, (a, b))
        added = CaseAnswer(*(
            first * getattr(parts[a], kind) + second * getattr(parts[b], kind) for kind in ("ends", "joints", "reactions")
        ))  # fmt: skip
        combined = replace(frame, combinations={"sum": Combination("sum", {a: first, b: second})})
        assert _verdict(combined, printed(combined, {"sum": added})) == ("disagree" if slip else "agree"), seed
        kept += 1

    holds()
    assert kept >= 2


@pytest.mark.parametrize("slip", [False, True], ids=["right", "wrong"])
def test_reciprocity_in_verify(slip: bool) -> None:
    """The movement of one joint under a load on another, claimed for that of the other under the first load (Maxwell)."""
    kept = 0

    @some(VERIFIED)
    @given(st.integers(0, 39), st.integers(0, 2**32 - 1))
    def holds(seed: int, dice: int) -> None:
        nonlocal kept
        frame, throw = drawn(seed), np.random.default_rng(dice)
        joints = sorted({j for m in frame.members.values() for j in (m.joint_from, m.joint_to)})
        here, there = (joints[int(throw.integers(len(joints)))] for _ in range(2))
        loads = {"along": JointForce(0, here, 1.0, 0.0), "up": JointForce(0, there, 1.0, 90.0)}
        loaded = replace(frame, cases={n: LoadCase(n, (one,)) for n, one in loads.items()}, combinations={})
        said = heard("slope-deflection", loaded)
        assert said is not None
        dx = float(said.cases["up"].joints[loaded.joint_index[here], 0])
        case = said.cases["along"]
        assume(math.isfinite(dx))
        assume(abs(dx) > 0.05 * case_scales(loaded, load_table(loaded, "along"), [case]).displacements)
        case.joints[loaded.joint_index[there], 1] = dx * (1.3 if slip else 1.0)
        assert _verdict(loaded, printed(loaded, {"along": case})) == ("disagree" if slip else "agree"), seed
        kept += 1

    holds()
    assert kept >= 3


def test_the_measure_can_fail() -> None:
    """A mirror that forgets to turn the couples round is seen."""
    frame = drawn(1)
    changed = mirrored(frame)
    said = heard("slope-deflection", changed.frame)
    own = heard("slope-deflection", frame)
    assert said is not None and own is not None
    name = frame.names[0]
    wrong = changed.back(said.cases[name])
    wrong.ends[:, :, 2] *= -1
    assert apart(frame, name, own.cases[name], wrong) > 1e-3
