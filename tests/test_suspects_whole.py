"""Suspects of no one place: effect of sway alone, end zones, units throughout; and frames of second order."""

from __future__ import annotations

from dataclasses import replace
from random import Random

import numpy as np
import pytest

from crosscheck import check
from crosscheck.answer import CaseAnswer
from crosscheck.claims import FrameNames, read_claim_text
from crosscheck.compare.claimed import ClosedClaim
from crosscheck.frame.model import FREE, Frame, Spread
from crosscheck.opinions import slope_deflection
from crosscheck.opinions.slope_deflection.prepared import prepared
from crosscheck.suspects import Suspect, pasted, search
from tests.benchmarks.bench_suspects import grid
from tests.corpus import CLAIM, _sway_alone, _with_zones, case_values, closed_claim, judged, opinions_on, solved, times
from tests.make_cases import CASES
from tests.transforms import printed


def heavy(order: int = 1) -> Frame:
    """Three storeys whose loads are brought to a quarter of the critical."""
    frame = grid(2, 3)
    f = slope_deflection.critical_factors(frame, ("all",))["all"] / 4.0
    loads = tuple(times(q, f) if isinstance(q, Spread) else q for q in frame.cases["all"].loads)
    frame = replace(frame, cases={"all": replace(frame.cases["all"], loads=loads)})
    return replace(frame, analysis=replace(frame.analysis, order=order))


def named_for(frame: Frame, closed: ClosedClaim) -> tuple[tuple[Suspect, ...], check.Opinions]:
    opinions = opinions_on(frame)
    return search(frame, opinions, closed, judged(frame, opinions, closed), CLAIM).suspects, opinions


def results(frame: Frame, only: str = "all") -> ClosedClaim:
    answer = solved(frame, ("all",))
    assert answer is not None
    return closed_claim(case_values(frame, answer.cases["all"], "all", 4, True, only))


# --- second-order effect of sway ---


def test_the_effect_of_sway_balances_on_turned_chords_and_lies_below_the_whole_effect() -> None:
    """A chord in balance: M1 + M2 + N d = V L, with N and V along the undisplaced axis. Sway at a quarter of the critical
    load grows by less than 1 / (1 - 1/4), the growth of the buckling shape; without the members' own effect by less."""
    frame = heavy()
    first, sway = prepared(frame).answer(["all"]), prepared(frame).sway_answer(["all"])
    assert sway is not None
    ends, moved = sway.cases["all"].ends, sway.cases["all"].joints
    t = frame.member_table
    apart = moved[t.ends[:, 1]] - moved[t.ends[:, 0]]
    across = t.cos * apart[:, 1] - t.sin * apart[:, 0]
    columns = np.abs(t.sin) > 0.5  # nothing acts on them between their ends
    gap = ends[:, :, 2].sum(axis=1) + ends[:, 0, 0] * across - ends[:, 1, 1] * t.length
    assert np.abs(gap[columns]).max() < 1e-9 * np.abs(ends[:, :, 2]).max()
    top = frame.joint_index["A3"]
    whole = slope_deflection.opine(heavy(2), check.study(heavy(2)))
    drift = [a.cases["all"].joints[top, 0] for a in (first, sway, whole)]  # type: ignore[union-attr]
    assert 1.1 < drift[1] / drift[0] < drift[2] / drift[0] < 4 / 3


def test_the_effect_of_sway_agrees_with_fictitious_forces_by_moment_distribution() -> None:
    frame = heavy()
    answer = solved(frame, ("all",))
    sway = prepared(frame).sway_answer(["all"])
    assert answer is not None and sway is not None
    other = _sway_alone(frame, answer, "all")
    assert other is not None
    for field in ("ends", "reactions", "joints"):
        one, two = getattr(sway.cases["all"], field), getattr(other, field)
        assert np.abs(one - two).max() < 1e-6 * np.abs(one).max()


def test_past_its_critical_load_there_is_no_effect_of_sway() -> None:
    frame = heavy()
    loads = tuple(times(q, 5.0) for q in frame.cases["all"].loads)
    assert prepared(replace(frame, cases={"all": replace(frame.cases["all"], loads=loads)})).sway_answer(["all"]) is None


@pytest.mark.parametrize(("order", "words"), [(1, "effect of sway was counted"), (2, "effect of sway alone was counted")])
def test_sway_without_the_members_own_effect_is_named_and_explains_everything(order: int, words: str) -> None:
    frame = heavy(order)
    answer = solved(heavy(), ("all",))
    assert answer is not None
    case = _sway_alone(heavy(), answer, "all")
    assert case is not None
    closed = closed_claim(case_values(frame, case, "all", 5, True))
    suspects, _ = named_for(frame, closed)
    first = suspects[0]
    assert first.kind == "idealisation" and words in first.says
    assert first.fits and first.explains > 0.999
    changed, claim = first.change.apply(frame, closed)
    assert [c.verdict for c in judged(changed, opinions_on(changed), claim)] == ["agree"]


# --- end zones ---


def test_zones_that_were_counted_are_named_with_their_length() -> None:
    frame = grid(2, 3)
    zoned = {n: replace(m, rigid_from=0.3, rigid_to=0.3) if m.section == "beam" else m for n, m in frame.members.items()}
    suspects, _ = named_for(frame, results(replace(frame, members=zoned)))
    assert suspects[0].kind == "idealisation"
    assert suspects[0].says == "rigid end zones of 0.3 were counted at the ends of beams"
    assert suspects[0].fits


def test_zones_by_the_depth_of_the_columns_are_named_without_a_number() -> None:
    frame = grid(2, 3)
    deep = {n: replace(s, depth=0.5 if n == "column" else 0.6) for n, s in frame.sections.items()}
    frame = replace(frame, sections=deep)
    zoned = {n: replace(m, rigid_from=0.25, rigid_to=0.25) if m.section == "beam" else m for n, m in frame.members.items()}
    suspects, _ = named_for(frame, results(replace(frame, members=zoned)))
    assert suspects[0].says == "rigid end zones were counted, the depth of what beams meet"
    assert suspects[0].fits


def test_zones_of_another_length_and_of_one_member() -> None:
    frame = grid(1, 2)
    zoned = replace(frame, members=_with_zones(frame, Random(1)))
    longer = {n: replace(m, rigid_from=1.5 * m.rigid_from, rigid_to=1.5 * m.rigid_to) for n, m in zoned.members.items()}
    suspects, _ = named_for(zoned, results(replace(frame, members=longer)))
    assert suspects[0].says == "rigid end zones were 1.5 times as long"
    one = {**frame.members, "A1-B1": replace(frame.members["A1-B1"], rigid_to=0.4)}
    suspects, _ = named_for(frame, results(replace(frame, members=one)))
    assert any(s.where == ("A1-B1",) and s.kind == "idealisation" and "0.4" in s.says and s.fits for s in suspects)


# --- units throughout ---


def in_units(closed: ClosedClaim, force: float, length: float) -> ClosedClaim:
    power = {"moment": force * length, "dx": length, "dy": length, "rotation": 1.0}
    factor = [power.get(v.quantity, force) for v in closed.values]
    return replace(closed, values=tuple(
        replace(v, value=v.value * f, half_digit=v.half_digit * f) for v, f in zip(closed.values, factor, strict=True)
    ))  # fmt: skip


@pytest.mark.parametrize(("force", "length", "words"), [
    (1e3, 1e3, ("N taken for kN", "; mm taken for m")), (1e3, 1.0, ("N taken for kN",)), (1.0, 1e3, ("mm taken for m",)),
    (1e-3, 1.0, ("kN taken for N",)), (1 / 4.4482216152605, 1 / 0.3048, ("kip taken for kN", "; ft taken for m")),
])  # fmt: skip
def test_units_wrong_throughout_are_named(force: float, length: float, words: tuple[str, ...]) -> None:
    """For instance N and mm where kN and m are stated."""
    frame = grid(1, 2)
    suspects, _ = named_for(frame, in_units(results(frame), force, length))
    assert suspects[0].kind == "units" and suspects[0].fits
    assert all(w in suspects[0].says for w in words)
    assert suspects[0].explains > 0.999
    alone, _ = named_for(frame, in_units(results(frame, "moments"), force, length))
    assert alone[0].kind == "units" and alone[0].fits


# --- frames of second order ---


@pytest.mark.parametrize("what", ["hinge", "moved"])
def test_mistakes_in_a_frame_of_second_order_are_named(what: str) -> None:
    frame = heavy(2)
    other, kind, where = {
        "hinge": (replace(frame, members={**frame.members, "A1-B1": replace(frame.members["A1-B1"], turn_from=FREE)}),
                  "end release", "A1-B1"),
        "moved": (replace(frame, joints={**frame.joints, "B1": replace(frame.joints["B1"], x=6.4)}), "geometry", "B1"),
    }[what]  # fmt: skip
    if what == "moved":  # loads reach to the members' new ends
        at = {n: float(t) for n, t in zip(other.members, other.member_table.length, strict=True)}
        loads = tuple(replace(q, end=at[q.member]) if isinstance(q, Spread) else q for q in other.cases["all"].loads)
        other = replace(other, cases={"all": replace(other.cases["all"], loads=loads)})
    suspects, _ = named_for(frame, results(other))
    assert suspects[0].kind == kind and where in suspects[0].where
    assert suspects[0].explains > 0.99


@pytest.mark.parametrize("name", ["hall", "depot"])
def test_results_of_another_case_are_named_whatever_signs_the_paste_has(name: str) -> None:
    """Under the wrong case's name the signs cannot be told: compression positive, moments that sag positive."""
    frame = check.read(CASES / f"{name}.toml")
    answer = check.ask(frame).answers["slope-deflection"]
    names = [n for n in frame.names if len(frame.meant(n)) == 1][-3:]
    for stated in names:
        for other in (n for n in names if n != stated):
            case = answer.cases[other]
            ends = case.ends * np.array([[-1.0, 1.0, 1.0], [-1.0, -1.0, -1.0]])
            text = printed(frame, {stated: CaseAnswer(ends, case.joints, case.reactions)})
            found = check.verify(frame, read_claim_text(text, FrameNames.of(frame)), every_case=False)
            if found.verdict != "disagree":  # the two cases may be alike
                assert np.allclose(ends, answer.cases[stated].ends, rtol=0.02, atol=0.02 * np.abs(ends).max())
                continue
            says = f"the results of {other} stand under {stated}"
            # Of arrangements of one pattern, the other arrangement says the same.
            number = [s.says for s in found.suspects if s.fits].index(says) + 1
            assert number <= (1 if name == "hall" else 3), (stated, other)
            assert check.as_suspected(found, number).verdict == "agree"


@pytest.mark.parametrize("name", ["hall", "workshop"])
def test_two_columns_under_each_other_s_heads_are_named(name: str) -> None:
    """Axial force and shear exchanged: no sign convention makes either of the other."""
    frame = check.read(CASES / f"{name}.toml")
    case_name = frame.names[0]
    case = check.ask(frame, [case_name]).answers["slope-deflection"].cases[case_name]
    text = printed(frame, {case_name: CaseAnswer(case.ends[..., [1, 0, 2]], case.joints, case.reactions)})
    found = check.verify(frame, read_claim_text(text, FrameNames.of(frame)), every_case=False)
    assert found.verdict == "disagree"
    assert found.suspects[0].says == "the columns of axial force and shear are exchanged"
    assert check.as_suspected(found, 1).verdict == "agree"


def test_a_second_reading_that_fails_inside_does_not_cost_the_verdict(monkeypatch: pytest.MonkeyPatch) -> None:
    frame = check.read(CASES / "hall.toml")
    name = frame.names[0]
    case = check.ask(frame, [name]).answers["slope-deflection"].cases[name]
    text = printed(frame, {name: CaseAnswer(case.ends[..., [1, 0, 2]], case.joints, case.reactions)})

    def fails(*_: object) -> None:
        raise ZeroDivisionError

    monkeypatch.setattr(pasted, "close", fails)
    found = check.verify(frame, read_claim_text(text, FrameNames.of(frame)), every_case=False)
    assert found.verdict == "disagree" and "failed inside (ZeroDivisionError" in found.no_suspects
