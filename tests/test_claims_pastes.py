"""Right pastes in every dress are read right; planted errors are never absorbed (tests/pastes.py).

A sample by default; CROSSCHECK_PASTES=4000 runs the first 4000 seeds (about 2,400 of them fixed by three values).
"""

from __future__ import annotations

import os

import pytest

from tests.claim_frame import BENT, Known, bent
from tests.pastes import Tally, known, make, number
from tests.pastes_undecided import RECIPES, pastes, verdict

SAMPLE = 45


def test_pastes() -> None:
    count = int(os.environ.get("CROSSCHECK_PASTES", SAMPLE))
    tally = Tally()
    for seed in range(count):
        tally.add(seed, plant=seed % 3 == 0)
    drawn = sum(tally.drawn[k] for k in tally.drawn if k.startswith("layout"))
    right = sum(tally.right[k] for k in tally.right if k.startswith("layout"))
    assert drawn >= 0.4 * count
    assert right >= 0.98 * drawn, tally.failures
    # What is not read right is undecided, never wrong: no right paste disagrees, and none agrees on half of its values.
    wrong = {k: n for k, n in tally.verdicts.items() if "(not right)" in k and "undecided" not in k}
    assert not wrong, tally.failures
    assert tally.planted["agree"] == 0, tally.failures
    assert sum(tally.planted.values()) >= 0.2 * count


def test_the_generator_plants_what_it_says() -> None:
    right, wrong = make(4), make(4, "more")
    assert right.data != wrong.data
    assert right.values == wrong.values
    assert "->" in wrong.planted


def test_thirty_frames_whose_opinions_agree() -> None:
    for k in range(0, 30, 7):
        assert all(j.verdict == "agree" for j in known(k).judgements.values()), known(k).frame.title


@pytest.mark.parametrize(
    ("writing", "text"),
    [("fixed", "-1234.50"), ("thousands", "-1,234.50"), ("brackets", "(1234.50)"), ("trailing minus", "1234.50-"),
     ("decimal comma", "-1234,50"), ("unicode minus", "\u22121234.50"), ("exponent", "-1.2345E+03")],
)  # fmt: skip
def test_number_writings(writing: str, text: str) -> None:
    assert number(-1234.5, 2, writing) == text


# --- pastes that must be undecided: fewer than three values fix a choice that is not the README's


@pytest.mark.parametrize("quantity", ["M", "N", "V"])
@pytest.mark.parametrize("count", [1, 2])
def test_too_few_values_for_a_reversed_sign(quantity: str, count: int) -> None:
    k = bent()
    column = "NVM".index(quantity)
    rows = [
        f"{m.name}\t{j}\t{-k.answer.cases['dead'].ends[n, e, column]:.3f}"
        for n, m in enumerate(k.frame.members.values()) for e, j in enumerate((m.joint_from, m.joint_to))
    ]  # fmt: skip
    unit = "kNm" if quantity == "M" else "kN"
    verdict, closed, _ = k.judge(f"Load case: dead\nMember\tEnd\t{quantity} [{unit}]\n" + "\n".join(rows[2 : 2 + count]))
    assert verdict == "undecided"
    assert closed.undecided


@pytest.mark.parametrize("count", [1, 2])
def test_too_few_values_for_another_unit(count: int) -> None:
    k = bent()
    rows = [f"{j}\t{k.answer.cases['dead'].joints[k.frame.joint_index[j], 0] * 1000:.4f}" for j in ("B", "C", "E")][:count]
    verdict, closed, _ = k.judge("Load case: dead\nDisplacements\nJoint\tdx\n" + "\n".join(rows))
    assert verdict == "undecided"
    assert any("--units" in why for why in closed.undecided)


@pytest.mark.parametrize("name", sorted(RECIPES))
def test_pastes_that_leave_a_choice_open_are_undecided(name: str) -> None:
    """Every recipe on five of the thirty frames, or on all of them with CROSSCHECK_PASTES."""
    frames = range(30) if "CROSSCHECK_PASTES" in os.environ else range(2, 30, 6 if name != "two cases fit" else 5)
    made = [(k, text) for k, text in pastes(name, frames)]
    assert made
    for k, text in made:
        found, why = verdict(known(k), text)
        assert found == "undecided", (k, why)


# --- the sign of few values beside signs that others fix


def _signed(moment: float, fy: float = 1.0) -> str:
    """Reactions on the supports, rotations anticlockwise, and the only reaction moment turned by `moment`."""
    k = one_foot()
    c = k.answer.cases["dead"]
    rows = ["Load case: dead", "Support reactions", "Joint\tFx [kN]\tFy [kN]\tMz [kNm]"]
    for j in k.frame.supports:
        x, y, m = c.reactions[k.frame.joint_index[j]]
        rows.append(f"{j}\t{-x:.3f}\t{-fy * y:.3f}\t{moment * m:.3f}")
    rows += ["Joint displacements", "Joint\tdx [mm]\tdy [mm]\trotation [mrad]"]
    for j in k.frame.joints:
        x, y, t = 1000 * c.joints[k.frame.joint_index[j]]
        rows.append(f"{j}\t{x:.4f}\t{y:.4f}\t{-t:.4f}")
    return "\n".join(rows)


def one_foot() -> Known:
    return Known(BENT.replace('D = "fixed"', 'D = "pinned"').replace('F = "fixed"', 'F = "pinned"'))


def test_the_sign_of_one_reaction_moment_follows_from_the_other_signs() -> None:
    """Reversed by acting on the support and again by being anticlockwise."""
    verdict, closed, _ = one_foot().judge(_signed(moment=1.0))
    assert verdict == "agree", closed.undecided
    assert closed.signs["moment"] == "on the support, anticlockwise positive"


def test_a_reversed_reaction_moment_is_no_convention_of_its_own() -> None:
    verdict, closed, _ = one_foot().judge(_signed(moment=-1.0))
    assert verdict == "undecided"
    assert "sign of reaction moment" in closed.undecided[0]
