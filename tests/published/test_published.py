"""Published values, each with its source and status, against every opinion that speaks.

A case is a table in one of the files beside this one:

    id, title, source        what it is and where it stands; the group is the first letter of the id
    status                   confirmed: the wording or number of the source was seen. memory: source recalled, value
                             verified numerically. derived: worked out by two routes. common-practice: rule of thumb
    inputs                   what the formulas mean by their letters (a text defines a letter by those before it)
    frames                   frame files in our own grammar, axially and shear rigid, one load case called load
    check                    one published value each:
        quantity             the source's name for it
        of                   our value: { member, end }, { member, at }, { member, extreme = "max" or "min" } (along
                             it; with `place` its distance from the `from` end), { reaction } or { joint }; and `value`.
                             Or { critical }: the critical load factor; with `effective_length_under` that load the
                             effective length of a column of EI = 1 under it
        over                 a second value of ours by which the first is divided
        factor, plus         turn ours into the source's sign and unit: factor * ours + plus
        formula              the published formula in Python's writing, held to `value` here
        value                the published number, or the number of the published formula
        published, decimals  the digits as printed: the value must round to them
        tolerance            accepted instead, and only where a misprint or rounding in print is explained by `note`
        scale                size against which a zero is judged

Formulas are held to 1e-9, printed values to half a unit of the last digit. Signs: ours are the README's (clockwise
end moments, sagging positive), the sources' as each case's assumptions say.

Left out, for a later issue: the haunch constants F03 to F07 (members of varying depth) and groups D02, D03, D05, D06
(approximate methods and tables that no first-order analysis reproduces) and I. Of D04 three values that are ratios
of printed numbers or belong to another beam.
"""

from __future__ import annotations

import math
import tomllib
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from crosscheck.answer import Answer
from crosscheck.frame.kinematics import study
from crosscheck.frame.model import Frame
from crosscheck.frame.reader import read_frame_text
from crosscheck.frame.stations import stations
from crosscheck.frame.units import parse_unit
from crosscheck.opinions import library, moment_distribution, slope_deflection
from crosscheck.opinions.moment_distribution.second_order import critical_load_factor
from tests.truth import Truth

HERE = Path(__file__).parent
EXACT = 1e-9
LIBRARY = 1e-5
CRITICAL_AS_SAID = 5e-4
"""An opinion says a critical load factor to four digits."""
CASE = "load"
FUNCTIONS = {name: getattr(math, name) for name in ("sqrt", "sin", "cos", "tan", "sinh", "cosh", "pi")}
OPINIONS = {
    "slope-deflection": slope_deflection.opine,
    "moment-distribution": moment_distribution.opine,
    "library": library.opine,
}
END_COLUMNS = ("axial", "shear", "moment")
SPAN_COLUMNS = ("axial", "shear", "moment", "across")
REACTION_COLUMNS = ("fx", "fy", "moment")
JOINT_COLUMNS = ("dx", "dy", "rotation")

Table = dict[str, Any]


def cases() -> list[Table]:
    """Every case of every file beside this one."""
    tables = [tomllib.loads(path.read_text(encoding="utf-8")) for path in sorted(HERE.glob("*.toml"))]
    return [case for table in tables for case in table["case"]]


def checks(with_frames: bool) -> list[Any]:
    """One parameter a check: its case and itself."""
    return [
        pytest.param(case, check, id=f"{case['id']}-{n}")
        for case in cases()
        if ("frames" in case) == with_frames
        for n, check in enumerate(case["check"])
    ]


def letters(case: Table) -> dict[str, float]:
    """The inputs as numbers."""
    known: dict[str, float] = {}
    for name, value in case.get("inputs", {}).items():
        known[name] = evaluate(value, known) if isinstance(value, str) else float(value)
    return known


def evaluate(formula: str, known: dict[str, float]) -> float:
    """The value of a formula of our own files."""
    return float(eval(formula, {"__builtins__": {}, **FUNCTIONS}, known))


def room(check: Table, relative: float) -> float:
    """How far from the published value a result may lie. relative: of formulas; added to print only beyond EXACT."""
    if "tolerance" in check:
        return float(check["tolerance"])
    size = max(abs(check["value"]), check.get("scale", 0.0))
    half = 0.5 * 10.0 ** -check["decimals"] if "decimals" in check else 0.0
    return half + relative * float(size)


@cache
def opinion(name: str, text: str) -> tuple[Frame, Any]:
    """What the named opinion (or the truth solver of the tests) says of a frame."""
    frame = read_frame_text(text)
    if name == "truth":
        return frame, Truth(frame) if frame.analysis.order == 1 else None
    return frame, OPINIONS[name](frame, study(frame))


def ours(case: Table, check: Table, name: str) -> float | None:
    """Our value in the source's sign and unit; None where the library abstains, or has no value because it
    names no turning points and gives values along members only where it has a joint of its own; and none of the tests'
    own solver in second order."""
    texts = case["frames"]
    text = texts[check["frame"]] if "frame" in check else next(iter(texts.values()))
    frame, answer = opinion(name, text)
    if answer is None or (name == "library" and not isinstance(answer, Answer)):
        return None
    assert isinstance(answer, (Answer, Truth)), f"{name}: {answer}"
    value = pick(frame, answer, check["of"])
    if name == "library" and ("extreme" in check["of"] or ("at" in check["of"] and math.isnan(value))):
        return None
    if "over" in check:
        value /= pick(frame, answer, check["over"])
    return float(check.get("factor", 1)) * value + float(check.get("plus", 0))


def pick(frame: Frame, answer: Answer | Truth, of: Table) -> float:
    """The value of ours that a check speaks of."""
    if "critical" in of:
        factor = critical(frame, answer)
        return math.pi / math.sqrt(of["effective_length_under"] * factor) if "effective_length_under" in of else factor
    given = answer.cases[CASE]
    if "reaction" in of:
        return float(given.reactions[frame.joint_index[of["reaction"]], REACTION_COLUMNS.index(of["value"])])
    if "joint" in of:
        return float(given.joints[frame.joint_index[of["joint"]], JOINT_COLUMNS.index(of["value"])])
    member = frame.member_index[of["member"]]
    if "end" in of:
        return float(given.ends[member, ("from", "to").index(of["end"]), END_COLUMNS.index(of["value"])])
    column = SPAN_COLUMNS.index(of["value"])
    if "at" in of:
        return float(along(answer, member, [of["at"]])[0, column])
    places = candidates(frame, answer, member)
    values = along(answer, member, places)[:, column]
    chosen = int(np.argmax(values) if of["extreme"] == "max" else np.argmin(values))
    return float(places[chosen] if of.get("place") else values[chosen])


def critical(frame: Frame, answer: Answer | Truth) -> float:
    """The critical load factor, as moment distribution finds it or as slope-deflection says it."""
    assert isinstance(answer, Answer)
    said = answer.silent[CASE].rpartition("the critical load factor is ")[2]
    if answer.opinion != moment_distribution.NAME:
        return float(said)
    exact = critical_load_factor(frame, CASE)
    assert float(said) == pytest.approx(exact, rel=CRITICAL_AS_SAID)
    return exact


def along(answer: Answer | Truth, member: int, x: list[float]) -> Any:
    places = answer.along if isinstance(answer, Truth) else answer.spans.along
    return places(CASE, np.full(len(x), member), np.asarray(x, dtype=float), np.full(len(x), -1))


def candidates(frame: Frame, answer: Answer | Truth, member: int) -> list[float]:
    """Distances where a member may have its extreme: its stations and the opinion's own turning points."""
    if isinstance(answer, Truth):
        return answer.turning_places(CASE, member)
    which, x = answer.spans.turning_points(CASE)
    at = stations(frame)
    return [*at.x[at.of(member)].tolist(), *x[which == member].tolist()]


@pytest.mark.parametrize("name", ["truth", *OPINIONS])
@pytest.mark.parametrize(("case", "check"), checks(with_frames=True))
def test_published_value(case: Table, check: Table, name: str) -> None:
    value = ours(case, check, name)
    if value is None:
        return  # The library abstained; test_the_library_speaks counts where it must not.
    relative = LIBRARY if name == "library" else EXACT
    if "critical" in check["of"] and name != "moment-distribution":
        relative = CRITICAL_AS_SAID
    assert value == pytest.approx(check["value"], rel=0.0, abs=room(check, relative))


@pytest.mark.parametrize(("case", "check"), [p for p in checks(with_frames=True) if "formula" in p.values[1]])
def test_formula_gives_the_published_number(case: Table, check: Table) -> None:
    """The formula as copied gives the number that stands beside it."""
    value = evaluate(check["formula"], letters(case))
    assert value == pytest.approx(check["value"], rel=0.0, abs=room(check, 1e-12))


@pytest.mark.parametrize(("case", "check"), checks(with_frames=False))
def test_unit_conversion(case: Table, check: Table) -> None:
    """Conversion factors, to the digits printed and to the exact rational where one is given."""
    source, target = (parse_unit(text) for text in check["convert"])
    assert source.dimension == target.dimension
    factor = source.factor / target.factor
    assert abs(float(factor) - check["value"]) <= room(check, 0.0) + 1e-15
    if "formula" in check:
        over, under = (int(part) for part in [*check["formula"].split("/"), "1"][:2])
        assert factor.numerator * under == factor.denominator * over


def test_every_value_has_a_source_and_a_status() -> None:
    statuses = {"confirmed", "memory", "derived", "common-practice"}
    assert all(case["status"] in statuses and case["source"]["author"] for case in cases())
    assert all("note" in check or "note" in case for case in cases() for check in case["check"] if "tolerance" in check)


def test_no_case_is_lost() -> None:
    """Counts by group: a file that stops being read, or a check that vanishes, is noticed."""
    found: dict[str, list[int]] = {}
    for case in cases():
        tally = found.setdefault(case["id"][0], [0, 0])
        tally[0] += 1
        tally[1] += len(case["check"])
    assert found == {
        "A": [23, 44], "B": [16, 49], "C": [14, 68], "D": [2, 23], "E": [9, 70], "F": [2, 8], "G": [2, 8], "H": [1, 14],
    }  # fmt: skip


def test_the_library_speaks() -> None:
    """The library must speak for every published frame of first order without temperature, settlement or open axial
    force."""
    texts = {text for case in cases() for text in case.get("frames", {}).values()}
    silent = []
    for text in sorted(texts):
        frame, answer = opinion("library", text)
        strained = frame.analysis.order == 2 or any(w in text for w in ("temperature", "difference", "settlement"))
        if not strained and not study(frame).undetermined.axial.any() and not isinstance(answer, Answer):
            silent.append((frame.title, answer.why))
    assert silent == []
