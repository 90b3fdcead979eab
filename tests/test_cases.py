"""The demonstration frames in cases/ and the claims beside them: all agree or disagree as they say of themselves."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Iterator
from functools import cache
from pathlib import Path
from typing import Any

import pytest

from crosscheck import check
from crosscheck.claims import FrameNames, read_claim, read_claim_text
from crosscheck.claims.reading import Reading
from crosscheck.cli import main
from crosscheck.suite.beside import frames_below
from tests.make_cases import CASES, CLAIMS

FRAMES = sorted(path.stem for path in frames_below([CASES]))
FILES = sorted(path.name for path in CASES.glob("*.claim.*"))


@cache
def opinions(name: str) -> check.Opinions:
    return check.ask(check.read(CASES / f"{name}.toml"))


def reading(file: str) -> Reading:
    return read_claim(CASES / file, FrameNames.of(opinions(frame_of(file)).frame))


@cache
def verification(file: str) -> check.Verification:
    asked = opinions(frame_of(file))
    return check.verify(asked.frame, reading(file), opinions=asked)


def frame_of(file: str) -> str:
    return file.split(".")[0]


def lines_of(file: str) -> list[str]:
    return (CASES / file).read_text(encoding="utf-8").splitlines()


def expected(file: str) -> tuple[str, str, str]:
    """(verdict, kind, place) from a claim's first line; a right one has none."""
    first = lines_of(file)[0]
    if not first.startswith("# expect:"):
        return "agree", "", ""
    verdict, _, suspect = first.removeprefix("# expect:").strip().partition(", ")
    kinds = ("end release", "load case")  # kinds of two words
    kind = next((k for k in kinds if suspect.startswith(k)), suspect.partition(" ")[0])
    return verdict, kind, suspect.removeprefix(kind).strip()


def values_printed(file: str) -> int:
    """How many results a claim holds: rows times heads with a unit, distances along members left out."""
    count = width = 0
    for line in lines_of(file):
        units = re.findall(r"[(\[](?:k?N|kip|kNm|kip ft|mm|in|mrad)[)\]]", line)
        if units:
            width = len(units)
        elif not re.search(r"[0-9][.,][0-9]|\d$", line) or line.startswith("#"):
            width = 0 if "---" not in line else width
        else:
            count += width - len(re.findall(r",(?=,|$)", line))  # nothing is printed for what is undetermined
    return count


# --- frames


def test_there_are_enough_frames_and_each_says_what_it_shows() -> None:
    assert len(FRAMES) >= 12
    for name in FRAMES:
        text = (CASES / f"{name}.toml").read_text(encoding="utf-8")
        assert re.match(r"# .+\n# Shows: ", text), name


@pytest.mark.parametrize("name", FRAMES)
def test_opinions_agree(name: str) -> None:
    asked = opinions(name)
    assert asked.verdict == "agree", {n: j.differences[:3] for n, j in asked.judgements.items() if j.differences}
    assert set(asked.names) == {*asked.frame.cases, *asked.frame.combinations}
    assert all(judged.compared > 0 for judged in asked.judgements.values())


def test_the_library_speaks_wherever_its_scope_lets_it() -> None:
    silent = {name for name in FRAMES if "library" in opinions(name).silent}
    # Shear deformation and rigid zones; undetermined axial forces; stepped and tapered members; one-way parts and ties.
    assert silent == {"anchorage", "culvert", "kiosk", "workshop", "causeway", "rack"}


def test_totals_are_what_the_take_down_says() -> None:
    compared = 0
    for name in FRAMES:
        asked = opinions(name)
        for case in asked.frame.cases.values():
            pulls = asked.answers["slope-deflection"].cases[case.name].reactions[:, :2].sum(axis=0)
            sums = {"right": -pulls[0], "left": pulls[0], "up": -pulls[1], "down": pulls[1]}
            for direction, total in case.expected.items():
                assert sums[direction] == pytest.approx(total, rel=2e-3), (name, case.name)
                compared += 1
    assert compared >= 8


def leaves(value: Any, path: tuple[str, ...] = ()) -> Iterator[tuple[tuple[str, ...], Any]]:
    """Every value of a frame file with its path; lists of a table's entries share one path."""
    if isinstance(value, dict):
        yield path, value
        for key, inner in value.items():
            yield from leaves(inner, (*path, key))
    elif isinstance(value, list) and any(isinstance(v, dict) for v in value):
        for inner in value:
            yield from leaves(inner, path)
    else:
        yield path, value


GRAMMAR = frozenset(re.findall(
    r"\S+",
    "E G nu alpha density I A shear_area depth section material from to hinge spring_from spring_to rigid_from "
    "rigid_to x y rotation angle joint joints member members force direction couple settlement at uniform "
    "start end per varying temperature difference misfit self_weight apply expected bays storeys columns beams "
    "feet lines omit origin levels axial shear order tolerance title units hinge=from hinge=to hinge=both "
    "fixed pinned roller held free right left up down across along projection axial=rigid axial=elastic "
    "shear=rigid shear=elastic profile taper stiffness patterns spans exclusive envelopes ties include lean only=tension "
    "y=push order "
))  # fmt: skip


def test_together_the_frames_use_every_row_of_the_grammar() -> None:
    found: set[str] = set()
    axial_by_default = 0
    for name in FRAMES:
        data = tomllib.loads((CASES / f"{name}.toml").read_text(encoding="utf-8"))
        for path, value in leaves(data):
            found |= {path[-1], *(value if isinstance(value, dict) else ())} if path else set()
            if isinstance(value, str) and path:
                found |= {value, f"{path[-1]}={value}"}
        found |= set(data)
        axial_by_default += "axial" not in data.get("analysis", {})
    assert not GRAMMAR - found
    assert 0 < axial_by_default < len(FRAMES)
    assert {opinions(n).frame.units.force for n in FRAMES} >= {"kN", "N", "kip"}
    assert {opinions(n).frame.units.length for n in FRAMES} >= {"m", "mm", "ft"}


def test_kinds_of_values_that_no_key_shows() -> None:
    text = "\n".join((CASES / f"{name}.toml").read_text(encoding="utf-8") for name in FRAMES)
    for pattern in (
        r'at = "\d+%"', r"at = \d", r'end = "\d+%"', r"direction = -?\d", r'direction = "-?\d+ deg"',
        r'y = "\d+ kip/in"', r'rotation = "\d+ kN m/rad"', r"= -1\.5", r"settlement = \{ down", r"settlement = \{ x",
        r'members = "beams', r"members = \[",
    ):  # fmt: skip
        assert re.search(pattern, text), pattern


# --- claims


def test_claims_are_those_of_the_script() -> None:
    assert sorted(claim.file for claim in CLAIMS) == FILES
    assert {frame_of(file) for file in FILES} == set(FRAMES)
    for claim in CLAIMS:
        assert f"# {claim.shows}" in lines_of(claim.file)[:2]
        assert bool(claim.expect) == claim.shows.startswith("Wrong"), claim.file


@pytest.mark.parametrize("file", FILES)
def test_claim_has_the_verdict_it_expects(file: str) -> None:
    found, (verdict, kind, place) = verification(file), expected(file)
    assert found.verdict == verdict, found.grounds
    assert bool(found.suspects) == (verdict == "disagree")
    if found.suspects:
        first = found.suspects[0]
        assert (first.kind, place in first.where or not place) == (kind, True), first.says


@pytest.mark.parametrize("file", FILES)
def test_every_value_of_a_claim_is_read(file: str) -> None:
    """A table lost in the reading would leave the verdict standing on what is left."""
    found = verification(file)
    judged = sum(case.compared + len(case.not_compared) for case in found.cases)
    assert judged == values_printed(file) > 0
    assert not found.undecided


@pytest.mark.parametrize("file", FILES)
def test_lines_that_begin_with_a_hash_are_notes(file: str) -> None:
    """Read without them, a claim says the same."""
    without = "\n".join("" if line.startswith("#") else line for line in lines_of(file))
    bare = read_claim_text(without, FrameNames.of(opinions(frame_of(file)).frame))
    assert bare.entries == reading(file).entries
    assert bare.undecided == reading(file).undecided


@pytest.mark.parametrize(
    ("file", "status"), [("kiosk.claim.txt", 0), ("stair.digits.claim.csv", 1), ("footbridge.case.claim.csv", 1)]
)
def test_exit_status_on_the_command_line(file: str, status: int, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["verify", str(CASES / f"{frame_of(file)}.toml"), str(Path(CASES, file))]) == status
    report = capsys.readouterr().out
    assert report.lstrip().startswith({0: "AGREE", 1: "DISAGREE"}[status])
