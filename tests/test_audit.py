"""The audit against a dense truth of its own: right results pass, planted errors are found where they were planted."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from crosscheck.answer import CaseAnswer
from crosscheck.audit.bound import ForceBound, hypercircle
from crosscheck.audit.compatibility import CompatibilityFindings, compatibility
from crosscheck.audit.equilibrium import pieces, resultants
from crosscheck.audit.fit import abs_springs
from crosscheck.audit.signatures import local_findings, signatures
from crosscheck.audit.statics import StaticCheck, balance, statics, storeys
from crosscheck.frame.loads import load_table
from crosscheck.frame.model import (
    FREE,
    HELD,
    Analysis,
    Frame,
    Joint,
    JointForce,
    Load,
    LoadCase,
    Material,
    Member,
    PointCouple,
    PointForce,
    Section,
    SelfWeight,
    Spread,
    Support,
    Units,
)
from tests.audit_truth import (
    Truth,
    Unsolvable,
    random_frame,
    rounded,
    solve,
    with_member,
    with_section,
    with_support,
)

SEEDS = range(40)
AXIAL, SHEAR, MOMENT = range(3)


def drawn(seed: int) -> tuple[np.random.Generator, Frame, Truth]:
    rng = np.random.default_rng(seed)
    frame = random_frame(rng)
    return rng, frame, solve(frame, "p")


def copy(values: CaseAnswer) -> CaseAnswer:
    return CaseAnswer(values.ends.copy(), values.joints.copy(), values.reactions.copy())


def frame_with(frame: Frame, load: Load) -> Frame:
    """The frame under this one load."""
    return replace(frame, cases={"p": LoadCase("p", (load,))})


def failing(checks: list[StaticCheck]) -> set[tuple[str, str]]:
    return {(c.check, c.where) for c in checks if c.ok is False}


def portal(axial: str = "elastic", bays: int = 2, floors: int = 3) -> Frame:
    """A square frame with fixed feet, loaded on its beams and from the left."""
    joints = {f"{i}.{k}": Joint(f"{i}.{k}", 6.0 * i, 3.5 * k) for i in range(bays + 1) for k in range(floors + 1)}
    pairs = [(f"{i}.{k}", f"{i}.{k + 1}") for i in range(bays + 1) for k in range(floors)]
    beams = [(f"{i}.{k}", f"{i + 1}.{k}") for k in range(1, floors + 1) for i in range(bays)]
    members = {f"{a}-{b}": Member(f"{a}-{b}", a, b, "s", "m") for a, b in pairs + beams}
    loads = [Spread(0, f"{a}-{b}", -20.0, -20.0, "across", 0.0, 6.0) for a, b in beams]
    pushes = [JointForce(1, f"0.{k}", 10.0, 0.0) for k in range(1, floors + 1)]
    return Frame(
        title="square", units=Units("kN", "m", 1e3, 1.0), materials={"m": Material("m", 2.1e8)},
        sections={"s": Section("s", 2e-4, 1e-2)}, joints=joints, members=members,
        supports={f"{i}.0": Support(f"{i}.0", HELD, HELD, HELD) for i in range(bays + 1)},
        cases={"p": LoadCase("p", (*loads, *pushes))},
        analysis=Analysis(axial=axial, axial_stated=True),  # type: ignore[arg-type]
    )  # fmt: skip


# -------------------------------------------------------------------------------------------------- the truth


@pytest.mark.parametrize("seed", SEEDS)
def test_the_truth_passes_every_check_to_round_off(seed: int) -> None:
    _, frame, truth = drawn(seed)
    found = compatibility(frame, "p", truth.values, undetermined=truth.undetermined)
    judged = [c for c in found.balance.checks if c.ok is not None]
    assert judged
    assert not failing(list(found.balance.checks))
    # Allowed is a 1e-9th of the case's scale: what is left over is far below it.
    assert max(abs(c.residual) / c.allowed for c in judged) < 1e-3
    assert [c for c in found.checks if not c.ok] == []
    assert found.solution, found.not_judged


def test_the_truth_covers_every_feature() -> None:
    seen = {"hinge": 0, "semi-rigid": 0, "zone": 0, "turned": 0, "spring": 0, "settled": 0, "warm": 0, "misfit": 0}
    seen |= {"rigid axial": 0, "elastic shear": 0}
    for seed in SEEDS:
        _, frame, _ = drawn(seed)
        t, s = frame.member_table, frame.support_table
        kinds = {type(load).__name__ for load in frame.cases["p"].loads}
        seen["hinge"] += bool((t.turn == FREE).any())
        seen["semi-rigid"] += bool(((t.turn != FREE) & (t.turn != HELD)).any())
        seen["zone"] += bool(t.zone.any())
        seen["turned"] += bool((s.sin != 0).any())
        seen["spring"] += bool(((s.stiffness != FREE) & (s.stiffness != HELD)).any())
        seen["settled"] += "Settlement" in kinds
        seen["warm"] += "Temperature" in kinds
        seen["misfit"] += "Misfit" in kinds
        seen["rigid axial"] += frame.analysis.axial == "rigid"
        seen["elastic shear"] += frame.analysis.shear == "elastic"
    assert min(seen.values()) >= 3, seen


@pytest.mark.parametrize("digits", [3, 4, 6])
@pytest.mark.parametrize("seed", range(12))
def test_rounded_truth_is_the_solution_to_its_printed_precision(seed: int, digits: int) -> None:
    _, frame, truth = drawn(seed)
    values, half = rounded(truth.values, digits)
    assert compatibility(frame, "p", values, half, truth.undetermined).solution


@pytest.mark.parametrize("seed", range(12))
def test_partial_claims_are_completed_within_the_carried_rounding(seed: int) -> None:
    rng, frame, truth = drawn(seed)
    values, half = rounded(truth.values, 4)
    true = np.concatenate([truth.values.ends.ravel(), truth.values.reactions.ravel()])
    moments = np.full_like(values.ends, np.nan)
    moments[..., MOMENT] = values.ends[..., MOMENT]
    some = np.where(rng.random(values.ends.shape) < 0.3, np.nan, values.ends)
    none = np.full_like(values.reactions, np.nan)
    for ends in (moments, some):
        done = balance(frame, "p", CaseAnswer(ends, values.joints, none), half)
        assert done.completed.completed.any()
        known = ~done.completed.missing & ~np.isnan(true)
        off = np.abs(done.completed.value - true)[known]
        assert (off <= done.completed.half_width[known] + 1e-9 * done.scales.moment).all()
        assert not failing(list(done.checks))
        found = compatibility(frame, "p", CaseAnswer(ends, values.joints, none), half, truth.undetermined)
        assert found.holds is not False
        assert found.dimension <= found.indeterminacy


def test_dimension_is_the_degree_of_static_indeterminacy() -> None:
    frame = portal(bays=2, floors=3)
    found = compatibility(frame, "p", solve(frame, "p").values)
    assert found.dimension == 3 * len(frame.members) - 3 * 9
    hinged = with_member(frame, "0.0-0.1", turn_to=FREE)
    assert compatibility(hinged, "p", solve(hinged, "p").values).dimension == found.dimension - 1
    sprung = with_support(frame, "1.0", x=1e4)
    assert compatibility(sprung, "p", solve(sprung, "p").values).dimension == found.dimension


def test_statically_determinate_results_are_the_solution_by_statics_alone() -> None:
    frame = portal(bays=1, floors=1)
    frame = replace(frame, supports={"0.0": frame.supports["0.0"]})
    values = solve(frame, "p").values
    found = compatibility(frame, "p", values)
    assert (found.dimension, found.indeterminacy, found.solution) == (0, 0, True)
    values.ends[0, 0, MOMENT] += 1.0
    assert not compatibility(frame, "p", values).solution


# --------------------------------------------------------------------------------------------- statics, planted


@pytest.mark.parametrize("seed", range(10))
def test_a_changed_moment_is_found_at_its_member_and_joint(seed: int) -> None:
    rng, frame, truth = drawn(seed)
    values, half = rounded(truth.values, 4)
    member, end = int(rng.integers(len(frame.members))), int(rng.integers(2))
    peak = np.abs(values.ends[..., MOMENT]).max()
    values.ends[member, end, MOMENT] += 0.03 * peak
    found = failing(statics(frame, "p", values, half))
    name = list(frame.members)[member]
    joint = list(frame.joints)[int(frame.member_table.ends[member, end])]
    assert ("member balance", name) in found
    assert ("joint balance", joint) in found
    assert {where for _, where in found} <= {name, joint}


@pytest.mark.parametrize("bays", [1, 2])
def test_a_storey_out_of_balance_is_named_and_the_whole_frame_with_it(bays: int) -> None:
    frame = portal(bays=bays)
    truth = solve(frame, "p")
    lighter = replace(frame, cases={"p": LoadCase("p", frame.cases["p"].loads[:-1])})
    found = failing(statics(lighter, "p", truth.values))
    levels = {where for check, where in found if check == "storey balance"}
    assert len(storeys(frame)) == 3
    assert levels == {where for where, _ in storeys(frame)}
    assert ("whole frame", "") in found
    assert ("joint balance", "0.3") in found


def test_moments_alone_test_every_storey() -> None:
    frame = portal()
    truth = solve(frame, "p")
    ends = np.full_like(truth.values.ends, np.nan)
    ends[..., MOMENT] = truth.values.ends[..., MOMENT]
    none = np.full_like(truth.values.reactions, np.nan)
    checks = statics(frame, "p", CaseAnswer(ends, truth.values.joints, none))
    stories = [c for c in checks if c.check == "storey balance"]
    assert [c.ok for c in stories] == [True] * 3
    ends[0, 0, MOMENT] *= 1.1
    found = failing(statics(frame, "p", CaseAnswer(ends, truth.values.joints, none)))
    assert ("storey balance", storeys(frame)[0][0]) in found


def test_a_missing_member_load_is_found_at_the_member() -> None:
    for seed in range(20):
        _, frame, truth = drawn(seed)
        for k, load in enumerate(frame.cases["p"].loads):
            if not isinstance(load, PointForce | PointCouple | Spread):
                continue
            loads = frame.cases["p"].loads
            if np.abs(resultants(pieces(load_table(frame_with(frame, load), "p")), len(frame.members))).max() < 1e-9:
                continue  # spread over a projection that is nil
            without = replace(frame, cases={"p": LoadCase("p", loads[:k] + loads[k + 1 :])})
            found = failing(statics(without, "p", truth.values))
            assert {where for check, where in found if check == "member balance"} == {load.member}


def test_a_moment_at_a_hinge_and_a_reaction_without_support_are_found_there() -> None:
    frame = portal()
    stiff = solve(frame, "p").values
    hinged = with_member(frame, "0.1-0.2", turn_to=FREE)
    assert failing(statics(hinged, "p", stiff)) == {("end release", "0.1-0.2")}
    check = next(c for c in statics(hinged, "p", stiff) if c.ok is False)
    assert (check.joint, check.residual) == ("0.2", pytest.approx(-stiff.ends[1, 1, MOMENT]))
    pinned = with_support(frame, "1.0", rotation=FREE)
    assert failing(statics(pinned, "p", stiff)) == {("free support", "1.0")}
    wrong = copy(stiff)
    wrong.reactions[list(frame.joints).index("0.2"), 1] = 1.0
    assert ("free support", "0.2") in failing(statics(frame, "p", wrong))


def test_nothing_claimed_is_nothing_judged() -> None:
    frame = portal()
    nothing = CaseAnswer(*(np.full(shape, np.nan) for shape in ((15, 2, 3), (12, 3), (12, 3))))
    found = compatibility(frame, "p", nothing)
    assert found.holds is None
    assert not found.solution
    assert not found.balance.holds or all(c.ok is None for c in found.balance.checks if c.check != "joint balance")
    assert found.dimension == 0
    assert found.not_judged


def test_second_order_leaves_couples_and_compatibility_unjudged() -> None:
    frame = portal()
    frame = replace(frame, analysis=Analysis(axial="elastic", axial_stated=True, order=2))
    found = compatibility(frame, "p", solve(portal(), "p").values)
    assert found.holds is None
    couples = [c for c in found.balance.checks if c.component == "moment" and c.check == "member balance"]
    assert couples
    assert all(c.ok is None and "order = 2" in c.why for c in couples)


# --------------------------------------------------------------------------------------- compatibility, planted


def mistake(rng: np.random.Generator, frame: Frame) -> tuple[Frame, tuple[str, str, str], float] | None:
    """A frame with one softer support or end, or one stiffness changed; what it is; what should be fitted."""
    kind = str(rng.choice(["support", "end", "EI member", "EA member", "EI section"]))
    name = str(rng.choice(list(frame.members)))
    member = frame.members[name]
    section = frame.sections[member.section]
    if kind == "support":
        support = frame.supports[str(rng.choice(list(frame.supports)))]
        axis = str(rng.choice(["x", "y", "rotation"]))
        left = FREE if rng.random() < 0.6 else 800.0
        if getattr(support, axis) == FREE:
            return None
        return with_support(frame, support.joint, **{axis: left}), ("support", support.joint, axis), left
    if kind == "end":
        end = str(rng.choice(["from", "to"]))
        left = FREE if rng.random() < 0.6 else 800.0
        if getattr(member, "turn_" + end) == FREE:
            return None
        joint = getattr(member, "joint_" + end)
        return with_member(frame, name, **{"turn_" + end: left}), ("end", name, joint), left
    if kind == "EI section":
        return with_section(frame, "a", I=frame.sections["a"].I * 1.7), ("EI", "a", ""), 1.7
    if kind == "EA member" and (
        frame.analysis.axial == "rigid" or any(isinstance(load, SelfWeight) for load in frame.cases["p"].loads)
    ):
        return None  # another area would change the self weight too
    changed = {"I": section.I * 0.5} if kind == "EI member" else {"A": (section.A or 0.0) * 0.5}
    other = replace(frame, sections={**frame.sections, "z": replace(section, name="z", **changed)})
    return with_member(other, name, section="z"), (kind[:2], name, ""), 0.5


def planted(seed: int) -> tuple[Frame, Truth, Truth, tuple[str, str, str], float] | None:
    """A random frame, its truth, the truth of a mistaken one that differs visibly, and what the mistake is."""
    rng, frame, truth = drawn(seed + 1000)
    made = mistake(rng, frame)
    if made is None:
        return None
    other, what, left = made
    try:
        claim = solve(other, "p")
    except Unsolvable:
        return None
    change = np.abs(claim.values.ends - truth.values.ends)[..., MOMENT].max()
    if change < 0.03 * np.abs(truth.values.ends[..., MOMENT]).max():
        return None
    return frame, truth, claim, what, left


def place_of(found: CompatibilityFindings, what: tuple[str, str, str]) -> tuple[int, bool]:
    """Rank of the true mistake among the signatures, and whether only those that cannot be told apart come before."""
    table = signatures(found)
    kind, where, rest = what
    index = next(
        k for k, s in enumerate(table.entries)
        if (s.kind, s.where) == (kind, where) and rest in (s.joint, s.direction)
    )  # fmt: skip
    ties = table.ties(index)
    return index, all(k in ties for k in range(index))


@pytest.mark.parametrize("chunk", range(10))
def test_single_mistakes_towards_softer_are_explained_wholly_by_their_own_signature(chunk: int) -> None:
    tried = 0
    for seed in range(chunk * 12, chunk * 12 + 12):
        made = planted(seed)
        if made is None:
            continue
        tried += 1
        frame, truth, claim, what, left = made
        found = compatibility(frame, "p", claim.values, undetermined=truth.undetermined)
        assert found.balance.holds, (seed, what)
        assert found.holds is False, (seed, what)
        rank, first = place_of(found, what)
        entry = signatures(found).entries[rank]
        assert first, (seed, what, rank)
        assert entry.share > 1 - 1e-9, (seed, what)
        assert entry.fitted == pytest.approx(left, rel=1e-4, abs=1e-6), (seed, what)
        assert entry.significant
        assert entry.possible
        values, half = rounded(claim.values, 4)
        coarse = compatibility(frame, "p", values, half, truth.undetermined)
        assert coarse.balance.holds
        assert coarse.holds is False, (seed, what)
        assert place_of(coarse, what)[1], (seed, what)
        if what[0] in ("support", "end"):
            assert local_findings(coarse)
    assert tried >= 3


def test_local_findings_are_empty_for_right_claims() -> None:
    for seed in range(8):
        _, frame, truth = drawn(seed)
        values, half = rounded(truth.values, 3)
        assert local_findings(compatibility(frame, "p", values, half, truth.undetermined)) == []


def test_a_freed_support_and_a_hinge_at_the_only_member_there_are_told_as_alike() -> None:
    frame = portal()
    claim = solve(with_support(frame, "0.0", rotation=FREE), "p").values
    table = signatures(compatibility(frame, "p", claim))
    best = {(table.entries[k].kind, table.entries[k].where) for k in [0, *table.ties(0)]}
    assert best == {("support", "0.0"), ("end", "0.0-0.1")}


def test_claimed_displacements_show_a_mistake_of_stiffness_at_its_very_member() -> None:
    tried = 0
    for seed in range(60):
        made = planted(seed)
        if made is None or made[3][0] == "support":
            continue
        tried += 1
        frame, truth, claim, what, _ = made
        softer = {m.name for m in frame.members.values() if m.section == what[1]} or {what[1]}
        right = compatibility(frame, "p", *rounded(truth.values, 4), undetermined=truth.undetermined)
        assert right.displaced
        assert all(c.ok for c in right.displaced), seed
        wrong = compatibility(frame, "p", claim.values, undetermined=truth.undetermined)
        found = {c.member for c in wrong.displaced if not c.ok}
        assert found, (seed, what)
        assert found <= softer, (seed, what)
    assert tried >= 20


def test_a_support_that_moves_in_the_claimed_displacements_is_named() -> None:
    frame = portal()
    claim = solve(with_support(frame, "1.0", y=3e3), "p").values
    moved = [c for c in compatibility(frame, "p", claim).displaced if not c.ok]
    assert [(c.kind, c.where, c.direction) for c in moved] == [("support", "1.0", "y")]
    assert moved[0].rotation == pytest.approx(claim.joints[list(frame.joints).index("1.0"), 1])


def test_results_printed_too_coarsely_prove_nothing() -> None:
    frame = portal()
    values = solve(frame, "p").values
    half = CaseAnswer(np.full((15, 2, 3), 5.0), values.joints * 0, np.full((12, 3), 5.0))
    found = compatibility(frame, "p", values, half)
    assert found.holds
    assert not found.solution
    assert any("coarsely" in said for said in found.not_judged)


def continuous_beam() -> Frame:
    """Two spans with both ends held along: axially rigid, so that the axial force is anybody's guess."""
    base = portal("rigid")
    joints = {k: Joint(k, x, 0.0) for k, x in (("A", 0.0), ("B", 5.0), ("C", 9.0))}
    members = {f"{a}-{b}": Member(f"{a}-{b}", a, b, "s", "m") for a, b in (("A", "B"), ("B", "C"))}
    supports = {
        "A": Support("A", HELD, HELD, HELD), "B": Support("B", FREE, HELD, FREE), "C": Support("C", HELD, HELD, FREE),
    }  # fmt: skip
    load = LoadCase("p", (Spread(0, "A-B", -10.0, -10.0, "across", 0.0, 5.0),))
    return replace(base, joints=joints, members=members, supports=supports, cases={"p": load})


def test_undetermined_axial_forces_are_no_want_of_the_claim() -> None:
    frame = continuous_beam()
    truth = solve(frame, "p")
    assert truth.undetermined.axial.all()
    assert not compatibility(frame, "p", truth.values).complete
    found = compatibility(frame, "p", truth.values, undetermined=truth.undetermined)
    assert (found.dimension, found.solution) == (2, True)
    free = solve(with_support(frame, "A", rotation=FREE), "p").values
    table = signatures(compatibility(frame, "p", free, undetermined=truth.undetermined))
    assert (table.entries[0].kind, table.entries[0].where, table.entries[0].direction) == ("support", "A", "rotation")
    assert table.entries[0].share == pytest.approx(1, abs=1e-12)
    # A support freed along the rigid beam moves nothing, for the other end holds it too.
    assert not [s for s in table.entries if s.direction == "x"]


def test_an_unloaded_case_and_a_joint_that_nothing_joins_are_judged() -> None:
    frame = portal()
    frame = replace(frame, joints={**frame.joints, "lone": Joint("lone", 50.0, 50.0)}, cases={"p": LoadCase("p", ())})
    nil = CaseAnswer(np.zeros((15, 2, 3)), np.zeros((13, 3)), np.zeros((13, 3)))
    assert compatibility(frame, "p", nil).solution
    nil.ends[0, 0, MOMENT] = 1.0
    assert not compatibility(frame, "p", nil).solution


def test_two_mistakes_are_explained_by_two_signatures_together() -> None:
    frame = portal()
    other = with_member(with_support(frame, "0.0", rotation=FREE), "1.2-2.2", turn_from=FREE)
    table = signatures(compatibility(frame, "p", solve(other, "p").values))
    keys = [(s.kind, s.where, s.direction or s.joint) for s in table.entries]
    pair = [keys.index(("support", "0.0", "rotation")), keys.index(("end", "1.2-2.2", "1.2"))]
    assert table.share_of(pair) == pytest.approx(1, abs=1e-9)
    assert max(s.share for s in table.entries if s.possible) < 0.999


def in_other_units(frame: Frame) -> Frame:
    """The same frame in N and mm."""
    f, d = 1e3, 1e3
    materials = {k: replace(m, E=m.E * f / d**2) for k, m in frame.materials.items()}
    sections = {k: replace(s, I=s.I * d**4, A=(s.A or 0) * d**2) for k, s in frame.sections.items()}
    joints = {k: replace(j, x=j.x * d, y=j.y * d) for k, j in frame.joints.items()}
    loads = tuple(
        replace(x, first=x.first * f / d, last=x.last * f / d, end=x.end * d) if isinstance(x, Spread)
        else replace(x, force=x.force * f)  # type: ignore[type-var,union-attr]
        for x in frame.cases["p"].loads
    )  # fmt: skip
    return replace(
        frame, units=Units("N", "mm", 1.0, 1e-3), materials=materials, sections=sections, joints=joints,
        cases={"p": LoadCase("p", loads)},
    )  # fmt: skip


@pytest.mark.parametrize("axial", ["elastic", "rigid"])
def test_units_change_no_ranking_and_no_verdict(axial: str) -> None:
    frame = portal(axial)
    small = in_other_units(frame)
    change = {"turn_from": FREE}
    tables = []
    for one in (frame, small):
        claim = solve(with_member(one, "0.2-1.2", **change), "p").values
        scale = np.array([1.0, 1.0, 1.0]) if one is frame else np.array([1e3, 1e3, 1e6])
        step = 0.1 * scale
        values = CaseAnswer(np.round(claim.ends / step) * step, claim.joints, np.round(claim.reactions / step) * step)
        half = CaseAnswer(
            np.broadcast_to(step / 2, claim.ends.shape), claim.joints * 0,
            np.broadcast_to(step / 2, claim.reactions.shape),
        )  # fmt: skip
        tables.append(signatures(compatibility(one, "p", values, half)).entries)
    shares = [{(s.kind, s.where, s.joint, s.direction): s.share for s in t if s.kind != "length"} for t in tables]
    assert shares[0].keys() == shares[1].keys()
    assert max(abs(shares[0][k] - shares[1][k]) for k in shares[0]) < 1e-6


# ------------------------------------------------------------------------------------------- the hypercircle bound


def distance(frame: Frame, found: CompatibilityFindings, claim: CaseAnswer, true: CaseAnswer) -> float:
    """Root of s'F s of the difference, with the audit's flexibility."""
    assert found.fit is not None
    off = claim.ends - true.ends
    turn = np.nan_to_num(claim.reactions - true.reactions)
    s = frame.support_table
    x, y, couple = turn.T
    own = np.column_stack([s.cos * x + s.sin * y, s.cos * y - s.sin * x, couple])
    forces = np.column_stack([off[:, 0, MOMENT], off[:, 1, MOMENT], off[:, 0, AXIAL]])
    both = np.nan_to_num(np.concatenate([forces.ravel(), own.ravel()]))
    return float(np.sqrt(both @ (abs_springs(found.fit.raw_flexibility, 3 * len(frame.members)) @ both)))


@pytest.mark.parametrize("digits", [None, 4])
@pytest.mark.parametrize("seed", range(20))
def test_the_bound_holds_and_is_attained(seed: int, digits: int | None) -> None:
    rng, frame, truth = drawn(seed + 3000)
    support = next(iter(frame.supports.values()))
    other = with_section(frame, "a", I=frame.sections["a"].I * 1.7)
    if rng.random() < 0.5 and support.rotation != FREE:
        other = with_support(other, support.joint, rotation=2e3)
    claim = solve(other, "p").values
    for one in (claim, truth.values):
        values, half = (one, None) if digits is None else rounded(one, digits)
        found = compatibility(frame, "p", values, half, truth.undetermined)
        bound = hypercircle(frame, found, values)
        assert isinstance(bound, ForceBound)
        off = distance(frame, found, values, truth.values)
        assert off <= bound.energy
        if digits is None and one is claim:
            assert off >= 0.999 * bound.energy - 1e-9 * bound.size
        assert (np.abs(values.ends - truth.values.ends)[..., MOMENT] <= bound.moment).all()
        if frame.analysis.axial == "elastic":
            assert (np.abs(values.ends - truth.values.ends)[:, 0, AXIAL] <= bound.axial).all()
            assert bound.solver_free is not None
            assert bound.solver_free >= off
        if one is truth.values and digits is None:
            assert bound.energy < 1e-6 * bound.size + 1e-12


def test_no_bound_where_statics_fails_or_moments_are_missing() -> None:
    frame = portal()
    truth = solve(frame, "p").values
    wrong = copy(truth)
    wrong.ends[3, 0, MOMENT] *= 1.2
    said = hypercircle(frame, compatibility(frame, "p", wrong))
    assert isinstance(said, str)
    assert "statics" in said
    partial = copy(truth)
    partial.ends[..., 1:] = np.nan
    partial.reactions[:] = np.nan
    said = hypercircle(frame, compatibility(frame, "p", partial))
    assert isinstance(said, str)
    assert "does not give" in said
