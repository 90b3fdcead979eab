"""The JSON Schemas of frame files and result documents, held to what the reader takes and the commands write."""

from __future__ import annotations

import json
import tomllib
from importlib.resources import files
from pathlib import Path
from typing import Any

import pytest
from jsonschema import Draft202012Validator

from crosscheck import check
from crosscheck.claims import ReadingOptions, read_claim
from crosscheck.claims.reading import FrameNames
from crosscheck.frame.apply import CASE_KEYS, COMPASS, ENTRY_KEYS
from crosscheck.frame.combining import ARRANGEMENTS, EXTRA_KEYS
from crosscheck.frame.grid import GRID_KEYS
from crosscheck.frame.parts import MATERIAL_KEYS, MEMBER_KEYS, SECTION_KEYS, SUPPORT_KEYS
from crosscheck.frame.reader import ANALYSIS_KEYS, FILE_KEYS, read_frame_text
from crosscheck.frame.states import KEYS as FACTORS
from crosscheck.frame.tables import COLUMNS
from crosscheck.problems import UnusableInput
from crosscheck.report.document import dumps, opinions_document, verification_document
from crosscheck.report.review import review_document
from crosscheck.review.inspect import inspect, subject_of
from crosscheck.suite.beside import frames_below
from tests.random_frames import random_frame_text

CASES = Path(__file__).parent.parent / "cases"


def schema(name: str) -> Draft202012Validator:
    data = json.loads(files("crosscheck.report").joinpath("schemas", f"{name}.schema.json").read_text(encoding="utf-8"))
    Draft202012Validator.check_schema(data)
    return Draft202012Validator(data)


FRAME = schema("frame")
RESULT = schema("result")


def faults(validator: Draft202012Validator, data: Any) -> list[str]:
    return [f"{'/'.join(map(str, e.absolute_path))}: {e.message}" for e in validator.iter_errors(data)]


@pytest.mark.parametrize("path", list(frames_below([CASES])), ids=lambda p: p.stem)
def test_every_demonstration_frame_keeps_the_schema(path: Path) -> None:
    assert faults(FRAME, tomllib.loads(path.read_text(encoding="utf-8"))) == []


@pytest.mark.parametrize("seed", range(40))
def test_random_frames_keep_the_schema(seed: int) -> None:
    assert faults(FRAME, tomllib.loads(random_frame_text(seed))) == []


def test_the_schema_knows_exactly_the_readers_keys() -> None:
    """A key that the reader learns must be learned by the schema."""
    top = FRAME.schema["properties"]

    def keys(*path: str) -> set[str]:
        node: Any = top
        for step in path:
            node = node[step]
        return set(node["properties"])

    each = "additionalProperties"
    assert set(top) == set(FILE_KEYS)
    assert keys("materials", each) == set(MATERIAL_KEYS)
    assert keys("sections", each) == set(SECTION_KEYS)
    assert keys("members", each) == set(MEMBER_KEYS)
    assert set(top["supports"][each]["anyOf"][1]["properties"]) == set(SUPPORT_KEYS)
    assert keys("grid") == set(GRID_KEYS)
    assert keys("loads", each) == set(CASE_KEYS)
    assert set(top["loads"][each]["properties"]["apply"]["items"]["properties"]) == set(ENTRY_KEYS)
    assert set(top["loads"][each]["properties"]["expected"]["properties"]) == set(COMPASS)
    assert keys("analysis") == set(ANALYSIS_KEYS)
    assert keys("tables") == set(COLUMNS)
    factors = {key for of_kind in FACTORS.values() for key in of_kind}
    assert set(top["stiffness"][each][each]["properties"]) == factors
    assert set(top["combinations"][each]["properties"]) == set(EXTRA_KEYS)
    assert set(top["patterns"][each]["properties"]["arrangements"]["items"]["enum"]) == set(ARRANGEMENTS)


SOUND = CASES.joinpath("kiosk.toml").read_text(encoding="utf-8")


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("units =", "unit ="),
        ("[supports]", "[support]"),
        ("direction =", "directed ="),
        ("apply = [", "apply = [ { uniform = 3.0, direction = 'down' },"),
        ("[materials.", "[analysis]\norder = 3\n[materials."),
    ],
)
def test_what_the_reader_refuses_the_schema_refuses_too(old: str, new: str) -> None:
    assert old in SOUND
    text = SOUND.replace(old, new, 1)
    with pytest.raises(UnusableInput):
        read_frame_text(text)
    assert faults(FRAME, tomllib.loads(text)) != []


@pytest.mark.parametrize(("frame", "claim"), [("kiosk", "kiosk.units.claim.csv"), ("stair", "stair.claim.csv")])
def test_documents_keep_the_schema(frame: str, claim: str) -> None:
    read = check.read(CASES / f"{frame}.toml")
    reading = read_claim(str(CASES / claim), FrameNames.of(read), ReadingOptions())
    result = check.verify(read, reading)
    subject = subject_of(read)
    for document in (verification_document(result), opinions_document(result.opinions),
                     review_document(subject, inspect(subject))):  # fmt: skip
        assert faults(RESULT, json.loads(dumps(document))) == []


def test_a_document_with_a_slip_does_not_keep_it() -> None:
    text = dumps(opinions_document(check.ask(check.read(CASES / "kiosk.toml"))))
    lacking, wrong = json.loads(text), json.loads(text)
    next(iter(lacking["opinions"][0]["results"].values()))["member_ends"][0].pop("moment")
    wrong["verdict"] = "right"
    assert faults(RESULT, lacking) != []
    assert faults(RESULT, wrong) != []
