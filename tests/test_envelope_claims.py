"""Claims that are envelopes: what is printed as max and min of a place against the extremes over several cases.

Expected values are made here from each case's own results (numpy's max and min over them), or follow from the frame.
"""

from __future__ import annotations

import json
import os
import shutil
import subprocess
import sys
from functools import cache
from pathlib import Path

import numpy as np
import pytest

from crosscheck import check
from crosscheck.answer import Answer
from crosscheck.check import Opinions, Verification
from crosscheck.claims.read import read_claim_text
from crosscheck.claims.reading import FrameNames, ReadingOptions
from crosscheck.frame.model import Frame
from crosscheck.frame.reader import read_frame_text
from crosscheck.suite.beside import Standard
from crosscheck.suite.regress import check_frame
from tests.paste_envelopes import PLANTS, is_right, judge, make

CASES = Path(__file__).parents[1] / "cases"

BEAM = """
title = "Three spans"
units = "kN m"
[materials.s]
E = "210 GPa"
[sections.s]
I = "12000 cm^4"
[joints]
A = [0, 0]
B = [6, 0]
C = [14, 0]
D = [20, 0]
[members]
"A-B" = { section = "s", material = "s" }
"B-C" = { section = "s", material = "s" }
"C-D" = { section = "s", material = "s" }
[supports]
A = "pinned"
B = "roller"
C = "roller"
D = "roller"
[loads.dead]
apply = [{ members = ["A-B", "B-C", "C-D"], uniform = 10, direction = "down" }]
[loads.crowd]
apply = [{ members = ["A-B", "B-C", "C-D"], uniform = 15, direction = "down" }]
[patterns.crowd]
spans = [["A-B"], ["B-C"], ["C-D"]]
[combinations]
ult = { dead = 1.35, crowd = 1.5 }
use = { dead = 1.0, crowd = 1.0 }
[envelopes]
uls = ["ult*"]
"""
TWO = BEAM + 'sls = ["use*"]\n'


@cache
def asked(text: str) -> tuple[Frame, Opinions]:
    frame = read_frame_text(text)
    return frame, check.ask(frame)


def judged(text: str, frame_text: str = BEAM, case: str | None = None, suspects: bool = False) -> Verification:
    frame, opinions = asked(frame_text)
    reading = read_claim_text(text, FrameNames.of(frame))
    return check.verify(frame, reading, case, opinions=opinions, suspects=suspects)


def said(text: str, case: str, frame_text: str = BEAM) -> Verification:
    """A value in words."""
    frame, opinions = asked(frame_text)
    reading = read_claim_text("", FrameNames.of(frame), ReadingOptions(values=(text,)))
    return check.verify(frame, reading, case or None, opinions=opinions, suspects=False)


def answer(frame_text: str = BEAM) -> Answer:
    return asked(frame_text)[1].answers["slope-deflection"]


def moments(name: str = "uls", frame_text: str = BEAM) -> np.ndarray:
    """(cases, members, 2) end moments."""
    frame, _ = asked(frame_text)
    return np.stack([answer(frame_text).cases[n].ends[:, :, 2] for n in frame.meant(name)])


def ends() -> list[tuple[str, str, int, int]]:
    frame, _ = asked(BEAM)
    members = enumerate(frame.members.values())
    return [(m.name, j, k, e) for k, m in members for e, j in enumerate((m.joint_from, m.joint_to))]


def pairs(heading: str = "Envelope uls", governing: bool = False) -> list[str]:
    """Rows max and min by member end, tab-separated."""
    frame, _ = asked(BEAM)
    stack, names = moments(), frame.meant("uls")
    rows = [*([heading] if heading else []), "Member\tEnd\tMax/min\tM [kNm]" + ("\tLC" if governing else "")]
    for m, j, k, e in ends():
        for word, by in (("max", stack[:, k, e].argmax()), ("min", stack[:, k, e].argmin())):
            rows.append(f"{m}\t{j}\t{word}\t{stack[by, k, e]:.3f}" + (f"\t{names[by]}" if governing else ""))
    return rows


# --- reading and comparing


def test_the_generator_reads_right() -> None:
    """The whole of it is `python -m tests.paste_envelopes 340`, or CROSSCHECK_PASTES."""
    count = 340 if "CROSSCHECK_PASTES" in os.environ else 28
    fixed = [make(seed) for seed in range(count) if make(seed).fixed]
    assert len(fixed) > 0.4 * count
    outcomes = [(paste, judge(paste)) for paste in fixed]
    wrong = [(p.spec.seed, o) for p, o in outcomes if not is_right(p, o)]
    assert len(wrong) <= 0.02 * len(fixed), wrong
    assert all(o.verdict in ("undecided", "refused") for _, o in wrong)


@pytest.mark.parametrize("kind", PLANTS)
def test_no_planted_error_is_absorbed(kind: str) -> None:
    pastes = [make(seed, kind) for seed in range(500, 512)]
    planted = [p for p in pastes if p.planted]
    assert planted
    assert all(judge(p).verdict != "agree" for p in planted)


def test_max_and_min_are_those_over_the_cases() -> None:
    result = judged("\n".join(pairs()))
    assert result.verdict == "agree"
    assert result.closed.cases == ("uls",)
    assert result.cases[0].compared == 12


def test_one_cases_values_are_not_the_envelope() -> None:
    """The moments of one combination alone: what it does not govern differs."""
    frame, _ = asked(BEAM)
    one = answer().cases["ult"].ends[:, :, 2]
    rows = ["Envelope uls", "Member\tEnd\tMax/min\tM [kNm]"]
    rows += [f"{m}\t{j}\t{word}\t{one[k, e]:.3f}" for m, j, k, e in ends() for word in ("max", "min")]
    result = judged("\n".join(rows))
    stack = moments()
    off = sum(
        abs(limit(stack[:, k, e]) - one[k, e]) > 0.01 * abs(limit(stack[:, k, e]))
        for _, _, k, e in ends() for limit in (np.max, np.min) if abs(one[k, e]) > 1.0
    )  # fmt: skip
    assert result.verdict == "disagree"
    assert len(result.cases[0].differences) == off > 3
    assert frame.envelopes


@pytest.mark.parametrize("heading", ["Envelope uls", "ULS envelope", "Envelope: ULS", "Envelope of uls", "Results for uls"])
def test_headings_that_name_an_envelope(heading: str) -> None:
    assert judged("\n".join(pairs(heading)), TWO).closed.cases == ("uls",)


def test_the_envelope_that_fits_alone_is_taken_and_said() -> None:
    result = judged("\n".join(pairs("")), TWO)
    assert result.verdict == "agree"
    assert any('"uls" is the only one' in note for note in result.closed.notes)


def test_an_envelope_asked_for() -> None:
    assert judged("\n".join(pairs("")), TWO, case="uls").verdict == "agree"
    assert judged("\n".join(pairs("")), TWO, case="sls").verdict == "disagree"


def test_an_envelope_of_an_unknown_name_is_not_guessed() -> None:
    result = judged("\n".join(pairs("Envelope fatigue")), TWO)
    assert result.verdict == "undecided"
    assert any('"fatigue" is not one' in why for why in result.undecided)


def test_greatest_and_least_values_where_the_frame_has_no_envelope() -> None:
    bare = BEAM.split("[patterns.crowd]")[0] + "[combinations]\nult = { dead = 1.35, crowd = 1.5 }\n"
    result = judged("\n".join(pairs("")), bare)
    assert result.verdict == "undecided"
    assert any("no envelope" in why for why in result.undecided)


def test_plain_values_below_the_name_of_an_envelope_are_undecided() -> None:
    one = answer().cases["ult"].ends[:, :, 2]
    rows = ["Envelope uls", "Member\tEnd\tM [kNm]", *(f"{m}\t{j}\t{one[k, e]:.3f}" for m, j, k, e in ends())]
    result = judged("\n".join(rows))
    assert result.verdict == "undecided"
    assert any("write max or min" in why for why in result.undecided)


def test_signs_that_are_turned_turn_max_and_min() -> None:
    """Moments anticlockwise positive: the printed greatest is the least of ours."""
    stack = -moments()
    rows = ["Envelope uls", "Member\tEnd\tM max [kNm]\tM min [kNm]"]
    rows += [f"{m}\t{j}\t{stack[:, k, e].max():.3f}\t{stack[:, k, e].min():.3f}" for m, j, k, e in ends()]
    result = judged("\n".join(rows))
    assert result.verdict == "agree"
    assert result.closed.signs["moment"].startswith("anticlockwise")


PARTED = BEAM.replace(
    "[combinations]", "[loads.storm]\napply = [{ member = \"A-B\", force = 20, at = 3, direction = \"up\" }]\n"
    "[loads.calm]\napply = [{ member = \"A-B\", force = 5, at = 3, direction = \"down\" }]\n[combinations]\n"
    "windy = { dead = 1.0, storm = 1.5, calm = 1.5 }",
).replace("[materials.s]", 'exclusive = [["storm", "calm"]]\n[materials.s]', 1)  # fmt: skip


def test_a_combination_that_became_several_is_one_of_them_or_all() -> None:
    frame, _ = asked(PARTED)
    names = frame.meant("windy")
    assert len(names) == 2
    one = answer(PARTED).cases[names[0]].ends[:, :, 2]
    rows = ["Load case: windy", "Member\tEnd\tM [kNm]", *(f"{m}\t{j}\t{one[k, e]:.3f}" for m, j, k, e in ends())]
    plain = judged("\n".join(rows), PARTED)
    assert (plain.verdict, plain.closed.cases) == ("agree", (names[0],))
    assert "windy became 2 combinations" in plain.closed.notes
    stack = moments("windy", PARTED)
    rows = ["Member\tEnd\tM max [kNm]\tM min [kNm]"]
    rows += [f"{m}\t{j}\t{stack[:, k, e].max():.3f}\t{stack[:, k, e].min():.3f}" for m, j, k, e in ends()]
    assert judged("\n".join(rows), PARTED, case="windy").verdict == "agree"


# --- what governs


def test_governing_combinations_are_compared() -> None:
    assert judged("\n".join(pairs(governing=True))).verdict == "agree"


def test_a_combination_that_does_not_govern_is_a_finding() -> None:
    rows = pairs(governing=True)
    at = next(k for k, r in enumerate(rows) if r.startswith("B-C\tB\tmin"))
    named = rows[at].split("\t")[-1]
    other = "ult (crowd odd spans)"
    assert named != other
    rows[at] = rows[at].replace(named, other)
    result = judged("\n".join(rows))
    assert result.verdict == "disagree"
    (difference,) = result.cases[0].differences
    assert difference.note == f"governs by the claim: {other}; by us: {named}"
    assert difference.place.member == "B-C"


def test_a_combination_of_another_envelope_is_a_finding() -> None:
    rows = pairs(governing=True)
    at = next(k for k, r in enumerate(rows) if r.startswith("B-C\tB\tmin"))
    rows[at] = "\t".join([*rows[at].split("\t")[:-1], "use"])
    result = judged("\n".join(rows), TWO)
    assert result.verdict == "disagree"
    assert "which is not in uls" in result.cases[0].differences[0].note


def test_equal_extremes_of_several_combinations_are_no_difference() -> None:
    """Moments at the outer ends are zero in all: whichever is named there governs."""
    rows = pairs(governing=True)
    rows = ["\t".join([*r.split("\t")[:-1], "ult"]) if r.startswith("A-B\tA") else r for r in rows]
    assert judged("\n".join(rows)).verdict == "agree"


def test_numbers_of_combinations_that_nothing_explains_are_said_and_left_out() -> None:
    rows = [r.rpartition("\t")[0] + f"\t{100 + k}" if k > 1 else r for k, r in enumerate(pairs(governing=True))]
    result = judged("\n".join(rows))
    assert result.verdict == "agree"
    assert any("12 governing combinations not compared" in note for note in result.closed.notes)


# --- values that go with an extreme


def along(mixed: bool = False, named: bool = True) -> str:
    """Rows "max M", "min M" at each end, with the shear of the same combination (or, mixed, the greatest shear)."""
    frame, _ = asked(BEAM)
    names, stack = frame.meant("uls"), moments()
    shear = np.stack([answer().cases[n].ends[:, :, 1] for n in names])
    rows = ["Envelope uls", "Member\tEnd\tExtreme\tV [kN]\tM [kNm]" + ("\tCombination" if named else "")]
    for m, j, k, e in ends()[1:5]:
        for word, by in (("max M", stack[:, k, e].argmax()), ("min M", stack[:, k, e].argmin())):
            v = shear[:, k, e].max() if mixed else shear[by, k, e]
            rows.append(f"{m}\t{j}\t{word}\t{v:.3f}\t{stack[by, k, e]:.3f}" + (f"\t{names[by]}" if named else ""))
    return "\n".join(rows)


def test_values_that_go_with_an_extreme_are_of_its_combination() -> None:
    result = judged(along())
    assert result.verdict == "agree"
    assert result.cases[0].compared == 16


def test_without_its_combination_such_a_value_is_left_out_and_that_is_said() -> None:
    result = judged(along(named=False))
    assert result.verdict == "agree"
    assert result.cases[0].compared == 8
    assert any("8 values that go with an extreme" in note for note in result.closed.notes)


def test_mixed_values_are_found_and_suspected() -> None:
    result = judged(along(mixed=True), suspects=True)
    assert result.verdict == "disagree"
    first = result.suspects[0]
    assert (first.kind, first.says) == (
        "load case", "shear beside the extremes of the envelope are of other combinations than these",
    )  # fmt: skip
    assert set(first.where) <= {"A-B", "B-C", "C-D"}
    assert first.where


# --- words


def test_extremes_in_words_against_the_envelope_asked_for() -> None:
    """The greatest moment in size along B-C over all combinations, by dense stations of each case."""
    frame, _ = asked(BEAM)
    x = np.linspace(0, 8, 401)
    along_it = [answer().spans.along(n, np.full(401, 1), x, np.ones(401, dtype=int))[:, 2] for n in frame.meant("uls")]
    most = max(np.abs(values).max() for values in along_it)
    assert said(f"B-C max {most:.1f} kNm", "uls").verdict == "agree"
    assert said(f"B-C max {1.05 * most:.1f} kNm", "uls").verdict == "disagree"
    assert said(f"B-C max {most:.1f} kNm", "dead").verdict == "disagree"


def test_a_reaction_with_a_direction_is_the_greatest_in_it() -> None:
    frame, _ = asked(BEAM)
    most = max(answer().cases[n].reactions[1, 1] for n in frame.meant("uls"))
    least = min(answer().cases[n].reactions[1, 1] for n in frame.meant("uls"))
    assert said(f"reaction at B {most:.1f} kN up", "uls").verdict == "agree"
    assert said(f"reaction at B {least:.1f} kN up", "uls").verdict == "disagree"


# --- the verdict around it


def test_an_envelope_is_not_audited_and_that_is_said() -> None:
    result = judged("\n".join(pairs()))
    assert result.audits == ()
    assert any("no state of balance" in note for note in result.closed.notes)


def test_a_case_for_which_nobody_speaks_leaves_the_envelope_undecided() -> None:
    frame, opinions = asked(BEAM)
    lost = frame.meant("uls")[1]
    answers = {o: Answer(**{n: getattr(a, n) for n in a.__dataclass_fields__ if n != "cases"},
                         cases={n: c for n, c in a.cases.items() if n != lost})
               for o, a in opinions.answers.items()}  # fmt: skip
    silent = Opinions(frame, opinions.study, opinions.names, answers, {}, opinions.judgements)
    reading = read_claim_text("\n".join(pairs()), FrameNames.of(frame))
    result = check.verify(frame, reading, opinions=silent, suspects=False)
    assert result.verdict == "undecided"
    assert any(f"no opinion speaks for {lost} of uls" in why for why in result.undecided)


# --- suspects


def test_a_combination_left_out_is_suspected_and_can_be_tried() -> None:
    frame, opinions = asked(BEAM)
    names = [n for n in frame.meant("uls") if n != "ult (crowd spans 1+2)"]
    stack = np.stack([answer().cases[n].ends[:, :, 2] for n in names])
    rows = ["Envelope uls", "Member\tEnd\tM max [kNm]\tM min [kNm]"]
    rows += [f"{m}\t{j}\t{stack[:, k, e].max():.3f}\t{stack[:, k, e].min():.3f}" for m, j, k, e in ends()]
    result = judged("\n".join(rows), suspects=True)
    assert result.verdict == "disagree"
    assert "crowd (spans 1+2)" in result.suspects[0].says
    assert check.as_suspected(result, 1).verdict == "agree"
    assert opinions


@pytest.mark.parametrize(
    ("change", "kind", "where"),
    [
        (('{ dead = 1.35, imposed = 1.5, stiffness = "cracked"', "{ dead = 1.35, imposed = 1.5"), "stiffness", ()),
        (('{ members = "beams", uniform = 26.0', '{ members = "beams", uniform = 31.0'), "load", ("dead[1]",)),
    ],
)
def test_other_mistakes_are_sought_in_the_combinations_that_govern(
    change: tuple[str, str], kind: str, where: tuple[str, ...]
) -> None:
    from tests.make_cases import Printing, Results, envelope_ends

    text = (CASES / "depot.toml").read_text(encoding="utf-8")
    assert text.count(change[0]) == 1
    table = envelope_ends(Results.of(text.replace(*change), Printing()), ("uls",))[0]
    frame = check.read(CASES / "depot.toml")
    rows = [*table.above, *("\t".join(r) for r in [table.heads, *table.rows])]
    result = check.verify(frame, read_claim_text("\n".join(rows), FrameNames.of(frame)))
    assert result.verdict == "disagree"
    assert result.suspects
    assert result.suspects[0].kind == kind, result.suspects[:3]
    assert not where or result.suspects[0].where == where


# --- around the frame


@pytest.mark.parametrize("name", ["depot", "causeway"])
def test_claims_beside_the_demonstrations_do_what_they_are_there_for(name: str) -> None:
    outcome = check_frame(Standard(CASES / f"{name}.toml"))
    assert len(outcome.claims) >= 2
    assert all(claim.held for claim in outcome.claims), outcome.claims


def test_the_command_gives_verdict_json_and_record(tmp_path: Path) -> None:
    page, document = tmp_path / "check.html", tmp_path / "check.json"
    for file in ("causeway.toml", "causeway.adjacent.claim.txt", "office-sections.toml"):  # a report keeps a log beside
        shutil.copy(CASES / file, tmp_path)
    done = subprocess.run(
        [sys.executable, "-m", "crosscheck", "verify", str(tmp_path / "causeway.toml"),
         str(tmp_path / "causeway.adjacent.claim.txt"), "--case", "uls", "--report", str(page), "--json", str(document)],
        capture_output=True, text=True, encoding="utf-8", check=False,
    )  # fmt: skip
    assert done.returncode == 1, done.stderr
    said = json.loads(document.read_text(encoding="utf-8"))
    assert said["verdict"] == "disagree"
    assert said["claim"]["case"] == "uls"
    assert {d["case"] for d in said["disagreements"]} == {"uls"}
    assert said["statics"] == said["compatibility"] == []
    text = page.read_text(encoding="utf-8")
    assert "envelope uls" in text
    assert ", least" in text
    assert "no state of balance" in text
