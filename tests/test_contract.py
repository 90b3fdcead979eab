"""What the README promises of frame files, claims, exit statuses and the JSON document, line by line, at first order."""

from __future__ import annotations

import json
import math
import os
import re
import subprocess
import sys
from collections.abc import Callable
from functools import cache
from pathlib import Path
from typing import Any

import jsonschema
import numpy as np
import pytest

from crosscheck import check
from crosscheck.answer import Answer, Silent
from tests.calls import CASES, ONE_CASE, PORTAL, POST, STEEL, THIN, call, claim_of, of_case, put

# --- the JSON document, as a schema

NUMBER = {"type": ["number", "null"]}
TEXT = {"type": "string"}
MAYBE_TEXT = {"type": ["string", "null"]}


def rows(**keys: Any) -> dict[str, Any]:
    """A list of objects that have all these keys."""
    return {"type": "array", "items": {"type": "object", "properties": keys, "required": list(keys)}}


def table(**keys: Any) -> dict[str, Any]:
    return {"type": "object", "properties": keys, "required": list(keys)}


NUMBERS = {"type": "array", "items": NUMBER}
RESULTS = table(
    member_ends=rows(member=TEXT, joint=TEXT, axial=NUMBER, shear=NUMBER, moment=NUMBER),
    joints=rows(joint=TEXT, dx=NUMBER, dy=NUMBER, rotation=NUMBER),
    reactions=rows(joint=TEXT, fx=NUMBER, fy=NUMBER, moment=NUMBER),
    spans=rows(member=TEXT, x={"type": "array", "items": {"type": "number"}}, axial=NUMBERS, shear=NUMBERS,
               moment=NUMBERS, across=NUMBERS),
)  # fmt: skip
GIVEN = table(name=TEXT, status={"const": "given"}, why=MAYBE_TEXT,
              results={"type": "object", "additionalProperties": RESULTS})  # fmt: skip
ABSTAINED = table(name=TEXT, status={"const": "abstained"}, why=TEXT)
FRAME_PART = table(title=TEXT, file=TEXT, sha256={"type": "string", "pattern": "^[0-9a-f]{64}$"},
                   units=table(force=TEXT, length=TEXT))  # fmt: skip
OPINIONS = table(
    format={"const": "crosscheck/1"},
    frame=FRAME_PART,
    idealisation=table(axial={"enum": ["elastic", "rigid"]}, shear={"enum": ["elastic", "rigid"]}, order={"enum": [1, 2]}),
    opinions={"type": "array", "items": {"oneOf": [GIVEN, ABSTAINED]}, "minItems": 3, "maxItems": 3},
    disagreements=rows(case=TEXT, quantity=TEXT, member=MAYBE_TEXT, joint=MAYBE_TEXT, at=NUMBER,
                       values={"type": "object", "additionalProperties": NUMBER}, difference=NUMBER, allowed=NUMBER),
    verdict={"enum": ["agree", "disagree", "undecided"]},
)  # fmt: skip
KINDS = ["units", "signs", "transcription", "load case", "load", "support", "end release", "stiffness", "geometry",
         "idealisation"]  # fmt: skip
VERIFY = table(
    **OPINIONS["properties"],
    claim=table(
        file=TEXT, sha256={"type": "string", "pattern": "^[0-9a-f]{64}$"}, rows={"type": "integer"},
        case={"type": ["string", "array"], "items": TEXT}, units={"type": "object", "additionalProperties": TEXT},
        signs={"type": "object", "additionalProperties": TEXT}, not_understood={"type": "array"},
        coverage=table(compared={"type": "integer"}, of={"type": "integer"}),
    ),
    statics=rows(case=TEXT, check=TEXT, where=TEXT, residual=NUMBER, allowed=NUMBER, ok={"type": "boolean"}),
    compatibility=rows(case=TEXT, where=TEXT, member=MAYBE_TEXT, rotation=NUMBER, expected=NUMBER, ok={"type": "boolean"}),
    suspects=rows(kind={"enum": KINDS}, where={"type": "array", "items": TEXT}, says=TEXT, explains={"type": "number"},
                  tied_with={"type": "array", "items": TEXT}),
)  # fmt: skip
INSPECT = table(
    format={"const": "crosscheck/1"}, frame=FRAME_PART,
    findings=rows(grade={"enum": ["serious", "check", "note"]}, where={"type": "array", "items": TEXT}, says=TEXT),
    load_totals={"type": "object", "additionalProperties": table(fx=NUMBER, fy=NUMBER)},
)  # fmt: skip
REGRESS = table(
    format={"const": "crosscheck/1"}, verdict=TEXT,
    frames=rows(file=TEXT, verdict=TEXT, disagreements={"type": "array"}),
)  # fmt: skip


# --- frames and claims to call the commands on


@pytest.fixture
def portal(tmp_path: Path) -> Path:
    return put(tmp_path, PORTAL, "portal.toml")


@pytest.fixture
def one_case(tmp_path: Path) -> Path:
    return put(tmp_path, ONE_CASE, "one.toml")


@cache
def answered(text: str) -> dict[str, Any]:
    """What `opinions --json -` gives for a frame of this text."""
    import tempfile

    with tempfile.TemporaryDirectory() as folder:
        return call("opinions", put(Path(folder), text), "--json", "-").document


def dead(**options: Any) -> str:
    """A full claim of the portal's only case, as printed by another analysis."""
    return claim_of(of_case(answered(ONE_CASE), "dead"), **options)


def verified(frame: Path, claim: str, *options: str) -> tuple[int, dict[str, Any]]:
    """Exit status and document of `verify`, from standard input."""
    done = call("verify", frame, "-", "--json", "-", *options, stdin=claim.encode())
    return done.status, done.document


def only(case: str, text: str = PORTAL, **options: Any) -> str:
    return claim_of(of_case(answered(text), case), **options)


# --- exit statuses and the documents of the commands

STATUS = {"agree": 0, "disagree": 1, "undecided": 3}


def test_opinions_agree(portal: Path) -> None:
    done = call("opinions", portal, "--json", "-")
    jsonschema.validate(done.document, OPINIONS)
    assert (done.status, done.document["verdict"]) == (0, "agree")
    assert [o["name"] for o in done.document["opinions"]] == ["slope-deflection", "moment-distribution", "library"]
    assert all(list(o["results"]) == ["dead", "wind", "both"] for o in done.document["opinions"])
    assert done.document["idealisation"] == {"axial": "elastic", "shear": "rigid", "order": 1}
    assert done.document["frame"]["units"] == {"force": "kN", "length": "m"}


def test_one_case_by_name(portal: Path) -> None:
    for name in ("wind", "both"):
        document = call("opinions", portal, "--case", name, "--json", "-").document
        assert all(list(o["results"]) == [name] for o in document["opinions"])


def test_idealisation_by_option(portal: Path) -> None:
    document = call("opinions", portal, "--axial", "rigid", "--shear", "elastic", "--json", "-").document
    assert document["idealisation"] == {"axial": "rigid", "shear": "elastic", "order": 1}
    assert of_case(document, "dead")["member_ends"] != of_case(answered(PORTAL), "dead")["member_ends"]
    assert document["opinions"][2]["status"] == "abstained"  # with a reason: the schema asks for it
    jsonschema.validate(document, OPINIONS)


@pytest.mark.parametrize(
    ("change", "verdict"),
    [
        (lambda row, key, value: value, "agree"),
        (lambda row, key, value: 1.5 * value if row.get("member") == "B-C" and key == "moment" else value, "disagree"),
    ],
)
def test_verify_agrees_and_disagrees(one_case: Path, change: Callable[..., float], verdict: str) -> None:
    status, document = verified(one_case, dead(change=change))
    jsonschema.validate(document, VERIFY)
    assert (status, document["verdict"]) == (STATUS[verdict], verdict)
    assert document["claim"]["case"] == "dead"
    assert document["claim"]["coverage"] == {"compared": 36, "of": 36}
    assert bool(document["disagreements"]) == bool(document["suspects"]) == (verdict == "disagree")
    assert document["claim"]["not_understood"] == []


def test_the_document_of_a_claim_with_nothing_to_say_holds_every_key(one_case: Path) -> None:
    """claim, statics, compatibility and suspects are empty rather than left out."""
    status, document = verified(one_case, "Joint,dx [mm]\nB,0.4\n")
    jsonschema.validate(document, VERIFY)
    assert document["suspects"] == []
    assert status == STATUS[document["verdict"]]


def test_inspect(portal: Path, tmp_path: Path) -> None:
    done = call("inspect", portal, "--json", "-")
    jsonschema.validate(done.document, INSPECT)
    assert done.status == 0
    assert done.document["load_totals"]["dead"] == pytest.approx({"fx": 0.0, "fy": -92.0})
    assert done.document["load_totals"]["wind"] == pytest.approx({"fx": 27.0, "fy": 0.0})
    swaying = put(tmp_path, PORTAL.replace('"fixed"', '"roller"'), "swaying.toml")
    done = call("inspect", swaying, "--json", "-")
    jsonschema.validate(done.document, INSPECT)
    assert done.status == 1
    assert any(f["grade"] == "serious" and {"B", "C"} <= set(f["where"]) for f in done.document["findings"])
    assert call("inspect", put(tmp_path, "not a frame", "bad.toml")).status == 2


def test_regress_and_record(portal: Path, tmp_path: Path) -> None:
    assert call("regress", tmp_path).status == 1  # nothing is on record yet
    recorded = call("record", portal, "--reason", "first values")
    assert recorded.status == 0 and "portal.record.toml" in recorded.out
    assert (tmp_path / "portal.record.toml").exists()
    done = call("regress", tmp_path, "--json", "-")
    jsonschema.validate(done.document, REGRESS)
    assert done.status == 0 and len(done.document["frames"]) == 1
    put(tmp_path, "# expect: agree\n" + dead(), "portal.claim.txt")  # agrees with `dead` alone, and names no case
    assert call("regress", tmp_path).status == 0
    put(tmp_path, dead(change=lambda row, key, value: 2 * value if key == "moment" else value), "portal.second.claim.txt")
    assert call("regress", tmp_path).status == 1
    assert call("record", tmp_path / "nobody.toml", "--reason", "x").status == 2
    empty = tmp_path / "empty"
    empty.mkdir()
    assert call("regress", empty).status == 2
    put(empty, "nonsense", "only.toml")
    assert call("regress", empty).status == 2


def test_record_refuses_what_is_not_agreed(portal: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    silence(monkeypatch, "moment-distribution", "library")
    assert call("record", portal, "--reason", "one voice").status == 1


@pytest.mark.parametrize("options", [(), ("--bays", "6, 7.5", "--storeys", "4, 3.5"),
                                     ("--bays", "20 ft", "--storeys", "12 ft", "--units", "kip ft", "--feet", "pinned"),
                                     ("--bays", "6", "--storeys", "2 x 3.5 m", "--hinged-beams")])  # fmt: skip
def test_what_draft_writes_reads_and_checks_at_once(tmp_path: Path, options: tuple[str, ...]) -> None:
    written = call("draft", *options)
    assert written.status == 0
    drafted = put(tmp_path, written.out, "drafted.toml")
    assert call("opinions", drafted).status == 0
    assert call("inspect", drafted).status == 0
    assert call("draft", *options, "--json", "-").document["text"] == written.out


@pytest.mark.parametrize("options", [("--bays", "6"), ("--bays", "six", "--storeys", "3"), ("--units", "stone furlong")])
def test_a_draft_that_cannot_be(options: tuple[str, ...]) -> None:
    done = call("draft", *options)
    assert (done.status, done.out) == (2, "") and done.err.startswith("crosscheck: ")


# --- values


def test_values_are_in_the_frames_units_at_full_precision(tmp_path: Path) -> None:
    """A cantilever by hand, in units that are not SI: dy = P L^3 / 3EI, exact to the last digits and not to print."""
    text = """\
title = "cantilever"
units = "kip in"
[materials.m]
E = 29000
[sections.s]
I = 300
A = 10
[joints]
a = [0, 0]
b = [120, 0]
[members]
"a-b" = { section = "s", material = "m" }
[supports]
a = "fixed"
[loads.tip]
apply = [{ joint = "b", force = 7, direction = "down" }]
"""
    document = call("opinions", put(tmp_path, text), "--json", "-").document
    assert document["frame"]["units"] == {"force": "kip", "length": "in"}
    for k in range(3):
        found = of_case(document, "tip", k)
        tip = next(j for j in found["joints"] if j["joint"] == "b")
        assert tip["dy"] == pytest.approx(-7 * 120**3 / (3 * 29000 * 300), rel=1e-9 if k < 2 else 1e-6)
        assert tip["rotation"] == pytest.approx(7 * 120**2 / (2 * 29000 * 300), rel=1e-9 if k < 2 else 1e-6)
        reaction = found["reactions"][0]
        assert reaction == pytest.approx({"joint": "a", "fx": 0.0, "fy": 7.0, "moment": -840.0}, abs=1e-4)
        ends = {e["joint"]: e for e in found["member_ends"]}
        assert ends["a"]["shear"] == pytest.approx(7.0, rel=1e-6)
        assert ends["a"]["moment"] == pytest.approx(-840.0, rel=1e-6)


def test_signs_of_every_table(tmp_path: Path) -> None:
    """Couples clockwise, tension positive, sagging within the span, reactions in global axes at a turned support."""
    text = f"""\
units = "kN m"
{STEEL}{POST}
[joints]
a = [0, 0]
b = [8, 0]
[members]
"a-b" = {{ section = "post", material = "steel" }}
[supports]
a = "pinned"
b = {{ x = "free", y = "held", angle = 30 }}
[loads.mid]
apply = [{{ member = "a-b", force = 10, at = "50%", direction = "down" }}]
[loads.turn]
apply = [{{ joint = "a", couple = 16 }}]
"""
    document = call("opinions", put(tmp_path, text), "--json", "-").document
    for k in range(2):
        mid, turn = of_case(document, "mid", k), of_case(document, "turn", k)
        push = 5 * math.tan(math.radians(30))  # the support's y leans left, so it pushes left as it lifts
        b = mid["reactions"][1]
        assert b == pytest.approx({"joint": "b", "fx": -push, "fy": 5.0, "moment": 0.0}, abs=1e-9)
        assert mid["member_ends"][0]["axial"] == pytest.approx(-push)
        assert max(mid["spans"][0]["moment"]) == pytest.approx(20.0)
        assert min(mid["spans"][0]["across"]) < 0
        assert mid["joints"][0]["rotation"] > 0 > mid["joints"][1]["rotation"]
        ends = turn["member_ends"]
        assert [ends[0]["moment"], ends[1]["moment"]] == pytest.approx([16.0, 0.0], abs=1e-9)
        assert [ends[0]["shear"], ends[1]["shear"]] == pytest.approx([-2.0, 2.0])
        assert turn["spans"][0]["moment"][0] == pytest.approx(16.0)  # a clockwise couple at the left end sags the beam


def test_spans_have_extremes_and_both_sides_of_a_jump(one_case: Path) -> None:
    document = call("opinions", one_case, "--json", "-").document
    for k in range(2):
        span = next(s for s in of_case(document, "dead", k)["spans"] if s["member"] == "B-C")
        x, shear, moment = np.array(span["x"]), np.array(span["shear"]), np.array(span["moment"])
        assert x[0] == 0.0 and x[-1] == 6.0 and (np.diff(x) >= 0).all()
        at = np.flatnonzero(x == 2.0)
        assert len(at) == 2 and shear[at[0]] - shear[at[1]] == pytest.approx(20.0)
        left, hog = shear[0], moment[0]
        # With V at the left the moment turns where the shear passes zero: here beyond the point load or at it.
        turn = (left - 20) / 12 if left - 24 > 20 else 2.0
        assert moment.max() == pytest.approx(hog + left * turn - 6 * turn**2 - 20 * max(0.0, turn - 2), rel=1e-9)
        assert len({len(span[q]) for q in ("x", "axial", "shear", "moment", "across")}) == 1


def test_spans_hold_the_largest_moment_between_stations(tmp_path: Path) -> None:
    """A load over a part: the largest moment stands at no tenth of the span."""
    text = ONE_CASE.replace("uniform = 12,", "uniform = 12, end = 3.3,").replace("force = 20", "force = 0.001")
    document = call("opinions", put(tmp_path, text), "--json", "-").document
    span = next(s for s in of_case(document, "dead")["spans"] if s["member"] == "B-C")
    k = int(np.argmax(span["moment"]))
    assert abs(span["shear"][k]) < 1e-6 * 12 and span["x"][k] % 0.6 > 1e-3


# --- undetermined values are null in every case

X_BRACED = f"""\
units = "kN m"
{STEEL}{THIN}
[joints]
A = [0, 0]
B = [0, 4]
C = [4, 4]
D = [4, 0]
[members]
"A-B" = {{ section = "post", material = "steel" }}
"B-C" = {{ section = "post", material = "steel" }}
"D-C" = {{ section = "post", material = "steel" }}
"A-C" = {{ section = "post", material = "steel" }}
"B-D" = {{ section = "post", material = "steel" }}
[supports]
A = "fixed"
D = "fixed"
[loads.push]
apply = [{{ joint = "B", force = 10, direction = "right" }}, {{ member = "B-C", uniform = 4, direction = "down" }}]
[loads.idle]
apply = []
"""
ALL_HINGED = f"""\
units = "kN m"
{STEEL}{POST}
[joints]
A = [0, 0]
B = [3, 4]
C = [6, 0]
[members]
"A-B" = {{ section = "post", material = "steel", hinge = "to" }}
"B-C" = {{ section = "post", material = "steel", hinge = "from" }}
[supports]
A = "pinned"
C = "pinned"
[loads.down]
apply = [{{ joint = "B", force = 10, direction = "down" }}, {{ member = "A-B", uniform = 2, direction = "down" }}]
[loads.idle]
apply = []
"""


def test_axial_forces_of_a_rigid_x_braced_frame_are_null_in_every_case(tmp_path: Path) -> None:
    done = call("opinions", put(tmp_path, X_BRACED), "--json", "-")
    assert done.status == 0
    for k in range(2):
        for case in ("push", "idle"):
            found = of_case(done.document, case, k)
            null = {e["member"] for e in found["member_ends"] if e["axial"] is None}
            assert null == {"A-B", "B-C", "D-C", "A-C", "B-D"}
            assert all(e["moment"] is not None and e["shear"] is not None for e in found["member_ends"])
            assert all(None not in s["moment"] and set(s["axial"]) == {None} for s in found["spans"])
    assert done.document["opinions"][2]["status"] == "abstained"


def test_rotation_of_a_joint_where_every_end_is_hinged_is_null_in_every_case(tmp_path: Path) -> None:
    done = call("opinions", put(tmp_path, ALL_HINGED), "--json", "-")
    assert done.status == 0
    for opinion in (o for o in done.document["opinions"] if o["status"] == "given"):
        for case in opinion["results"].values():
            assert [j["rotation"] is None for j in case["joints"]] == [False, True, False], opinion["name"]


def test_an_axially_rigid_idealisation_from_a_missing_area_is_said_loudly(tmp_path: Path) -> None:
    frame = put(tmp_path, X_BRACED)
    assert call("opinions", frame, "--json", "-").document["idealisation"]["axial"] == "rigid"
    said = call("opinions", frame).out
    assert "AXIALLY RIGID" in said and '"post" has no A' in said.replace("\n", " ")
    stated = put(tmp_path, X_BRACED + '[analysis]\naxial = "rigid"\n', "stated.toml")
    assert "AXIALLY RIGID" not in call("opinions", stated).out
    assert "Undetermined" in call("opinions", stated).out


# --- unusable input: exit 2, one message a problem, never a traceback


def with_load(load: str, text: str = X_BRACED) -> str:
    return text + f"[loads.extra]\napply = [{load}]\n"


UNUSABLE = {
    "a mechanism": (PORTAL.replace('"fixed"', '"roller"'), ("moves right together",)),
    "a temperature that a rigid frame cannot follow": (
        with_load('{ member = "A-C", temperature = 20 }'), ("A-C", 'axial = "elastic"')),
    "a misfit that it cannot follow": (with_load('{ member = "B-D", misfit = "2 mm" }'), ("B-D", 'axial = "elastic"')),
    "a settlement that it cannot follow": (
        with_load('{ joint = "D", settlement = { x = 0.01 } }'), ('axial = "elastic"',)),
    "a couple where nothing resists it": (
        with_load('{ joint = "B", couple = 3 }', ALL_HINGED), ("B", "couple")),
    "files": ('include = ["office.toml"]\n' + PORTAL, ("include",)),
    "no such section": (PORTAL.replace('section = "post"', 'section = "pots"', 1), ("pots", '"post"')),
    "not TOML": ("units = ", ()),
}  # fmt: skip


@pytest.mark.parametrize("what", UNUSABLE)
def test_unusable_frames(tmp_path: Path, what: str) -> None:
    text, words = UNUSABLE[what]
    frame = put(tmp_path, text)
    for argv in (("opinions", frame), ("verify", frame, "-")):
        done = call(*argv, stdin=dead().encode())
        assert done.status == 2 and done.out == ""
        lines = done.err.splitlines()
        assert lines and all(line.startswith("crosscheck: ") for line in lines), done.err
        assert all(word in done.err for word in words), done.err
    # Nothing but JSON on standard output also means nothing at all where there is no document.
    assert call("opinions", frame, "--json", "-").out == ""


def test_a_mechanism_names_the_joints_that_move_and_how(tmp_path: Path) -> None:
    beam = '"B-C" = { section = "post", material = "steel"'
    hinged = PORTAL.replace('"fixed"', '"pinned"').replace(beam, beam + ', hinge = "both"')
    err = call("opinions", put(tmp_path, hinged)).err
    assert re.search(r"\bB\b.*\bC\b.*right|right.*\bB\b.*\bC\b", err) and "Traceback" not in err


def test_problems_are_one_message_each_with_file_and_line(tmp_path: Path) -> None:
    text = PORTAL.replace('"fixed"', '"fixt"', 1).replace('member = "B-C", force', 'member = "B-X", force')
    frame = put(tmp_path, text)
    err = call("opinions", frame).err.splitlines()
    assert len(err) == 2
    for line, word in zip(sorted(err), ("B-X", "fixt"), strict=False):
        assert re.search(rf"{re.escape(frame.name)}:\d+: ", line), line
        del word
    assert any("fixt" in line for line in err) and any("B-X" in line for line in err)


@pytest.mark.parametrize("command", ["opinions", "verify"])
def test_an_unknown_case_is_unusable(portal: Path, command: str) -> None:
    claim = ("-",) if command == "verify" else ()
    done = call(command, portal, *claim, "--case", "winds", stdin=dead().encode())
    assert (done.status, done.out) == (2, "")
    assert 'did you mean "wind"?' in done.err


def test_a_bom_and_line_ends_of_two_characters_are_accepted(tmp_path: Path) -> None:
    plain = put(tmp_path, PORTAL, "plain.toml")
    marked = put(tmp_path, "\ufeff" + PORTAL.replace("\n", "\r\n"), "marked.toml")
    one, other = (call("opinions", f, "--json", "-") for f in (plain, marked))
    assert (one.status, other.status) == (0, 0)
    assert one.document["opinions"] == other.document["opinions"]
    claim = "\ufeff" + only("dead").replace("\n", "\r\n")
    assert call("verify", marked, "-", "--case", "dead", stdin=claim.encode()).status == 0


def test_what_is_only_implausible_is_accepted_with_a_warning(tmp_path: Path) -> None:
    text = PORTAL.replace("[members]", "Z = [9, 9]\n[members]") + "[loads.idle]\napply = []\n"
    text = text.replace("[combinations]\nboth = { dead = 1.35, wind = 1.5 }\n", "")
    done = call("opinions", put(tmp_path, text))
    assert done.status == 0
    assert "Z" in done.out and "idle" in done.out and "Note:" in done.out


# --- opinions that fall silent, or differ


def silence(monkeypatch: pytest.MonkeyPatch, *names: str) -> None:
    """Make these opinions abstain."""
    real = check._ask_one

    def ask(name: str, *rest: Any) -> Answer | Silent:
        return Silent(name, "told to be silent") if name in names else real(name, *rest)

    monkeypatch.setattr(check, "_ask_one", ask)


def mislead(monkeypatch: pytest.MonkeyPatch, name: str) -> None:
    """Make this opinion wrong in one end moment of every case."""
    real = check._ask_one

    def ask(asked: str, *rest: Any) -> Answer | Silent:
        said = real(asked, *rest)
        if asked == name and isinstance(said, Answer):
            for case in said.cases.values():
                case.ends[0, 1, 2] *= 1.001
        return said

    monkeypatch.setattr(check, "_ask_one", ask)


def test_opinions_that_differ_disagree_and_the_lone_dissenter_is_named(
    portal: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    mislead(monkeypatch, "moment-distribution")
    done = call("opinions", portal, "--json", "-")
    jsonschema.validate(done.document, OPINIONS)
    assert (done.status, done.document["verdict"]) == (1, "disagree")
    first = done.document["disagreements"][0]
    assert (first["member"], first["joint"], first["quantity"]) == ("A-B", "B", "moment")
    assert first["difference"] > first["allowed"] > 0
    assert "moment-distribution stands alone" in " ".join(call("opinions", portal).out.split())


def test_verify_is_undecided_when_the_opinions_do_not_agree(one_case: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    mislead(monkeypatch, "moment-distribution")
    status, document = verified(one_case, dead())
    assert (status, document["verdict"]) == (3, "undecided")


def test_fewer_than_two_opinions_are_undecided(portal: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    silence(monkeypatch, "moment-distribution", "library")
    done = call("opinions", portal, "--json", "-")
    jsonschema.validate(done.document, OPINIONS)
    assert (done.status, done.document["verdict"]) == (3, "undecided")
    assert [o["status"] for o in done.document["opinions"]] == ["given", "abstained", "abstained"]


def test_one_opinion_and_a_complete_claim_agree_on_stated_ground(one_case: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    silence(monkeypatch, "moment-distribution", "library")
    claim = dead()
    done = call("verify", one_case, "-", stdin=claim.encode())
    assert done.status == 0 and done.out.lstrip().startswith("AGREE")
    assert "one opinion alone" in done.out and "statics and compatibility" in done.out
    # A claim that leaves out what cannot be completed proves nothing; nor does one that is wrong.
    assert verified(one_case, claim_of(of_case(answered(ONE_CASE), "dead"), ("reactions",)))[0] == 3
    wrong = dead(change=lambda row, key, value: 1.2 * value if key == "moment" else value)
    assert verified(one_case, wrong)[0] == 1


def test_a_library_that_abstains_is_named_with_why() -> None:
    done = call("opinions", CASES / "kiosk.toml", "--json", "-")
    library = done.document["opinions"][2]
    assert (library["name"], library["status"]) == ("library", "abstained") and len(library["why"]) > 20
    assert "results" not in library
    text = call("verify", CASES / "kiosk.toml", CASES / "kiosk.claim.txt").out
    assert re.search(r"library +abstains: \w", text)


def test_an_opinion_that_fails_inside_silences_itself_alone(portal: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    import crosscheck.opinions.library as library

    def fails(*_: Any) -> Answer:
        raise ZeroDivisionError("by nothing")

    monkeypatch.setattr(library, "opine", fails)
    done = call("opinions", portal, "--json", "-")
    assert done.status == 0
    assert "ZeroDivisionError" in done.document["opinions"][2]["why"] and "Traceback" not in done.err


# --- how verify judges


def test_a_partial_claim_is_judged_on_what_it_holds_with_its_coverage(one_case: Path) -> None:
    claim = "Member,Joint,M [kNm]\nA-B,A,17.475\nA-B,B,37.814\nB-C,B,-37.814\nB-C,C,36.066\n"
    status, document = verified(one_case, claim)
    assert status == 0
    assert document["claim"]["coverage"] == {"compared": 4, "of": 36} and document["claim"]["rows"] == 4
    said = " ".join(call("verify", one_case, "-", stdin=claim.encode()).out.split())
    assert "agrees in the 4 values it gives, of 36" in said


@pytest.mark.parametrize("row", ["B-X,B,37.814", "Q-R,Q,1.000"])
def test_a_row_for_a_member_that_the_frame_lacks_prevents_agree(one_case: Path, row: str) -> None:
    claim = f"Member,Joint,M [kNm]\nA-B,A,17.475\nA-B,B,37.814\nB-C,B,-37.814\nB-C,C,36.066\n{row}\n"
    status, document = verified(one_case, claim)
    assert status != 0 and document["verdict"] != "agree"


@pytest.mark.parametrize(
    ("row", "status"),
    [("B,0.00,0.00,0.00", 0), ("B,0.00,-0.00,0.00", 0), ("B,0.00,3.00,0.00", 1), ("B,0.03,0.00,0.00", 1)],
)
def test_rows_for_joints_without_support_are_held_to_zero_within_rounding(one_case: Path, row: str, status: int) -> None:
    claim = f"Support,Fx [kN],Fy [kN],M [kNm]\nA,13.82,49.62,17.48\n{row}\nD,-13.82,42.38,-19.22\n"
    assert verified(one_case, claim)[0] == status


def test_values_printed_too_coarsely_are_not_compared(one_case: Path) -> None:
    """Half a digit over 5% of the value's scale: rotations of 0.002 rad printed as 0.00."""
    claim = "Joint,dx [mm],dy [mm],rotation [rad]\nB,0.435,-0.176,0.00\nC,0.362,-0.150,0.00\n"
    status, document = verified(one_case, claim)
    assert (status, document["claim"]["coverage"]["compared"]) == (0, 4)
    assert "printed too coarsely" in " ".join(call("verify", one_case, "-", stdin=claim.encode()).out.split())
    status, document = verified(one_case, "Joint,rotation [rad]\nB,0.00\nC,0.00\n")
    assert (status, document["claim"]["coverage"]["compared"]) == (3, 0)  # nothing compared is never agreement


def reversed_where(*quantities: tuple[str, str]) -> Callable[[dict[str, Any], str, float], float]:
    """Reverse (table, quantity) pairs; tables told by the keys of their rows."""
    kinds = {"member": "end", "fx": "reaction", "dx": "joint"}

    def change(row: dict[str, Any], key: str, value: float) -> float:
        table = next(kinds[k] for k in kinds if k in row)
        return -value if (table, key) in quantities else value

    return change


@pytest.mark.parametrize("reverse", [
    (("end", "moment"),), (("end", "axial"),), (("end", "shear"),), (("reaction", "fy"),), (("joint", "rotation"),),
    (("reaction", "fx"), ("reaction", "fy"), ("reaction", "moment")), (("joint", "dy"),),
])  # fmt: skip
def test_a_quantity_reversed_throughout_is_a_convention(tmp_path: Path, reverse: tuple[tuple[str, str], ...]) -> None:
    """In the storey frame every quantity has three values or more that fix its sign."""
    frame = put(tmp_path, TALL)
    claim = claim_of(of_case(answered(TALL), "all"), change=reversed_where(*reverse), digits=5)
    status, document = verified(frame, claim)
    assert status == 0, document["disagreements"][:2]
    plain = verified(frame, claim_of(of_case(answered(TALL), "all"), digits=5))[1]["claim"]["signs"]
    assert document["claim"]["signs"] != plain


TALL = f"""\
units = "kN m"
{STEEL}{POST}
[grid]
bays = [5, 6, 4]
storeys = [4, 3.5]
columns = [{{ section = "post", material = "steel" }}]
beams = [{{ section = "post", material = "steel" }}]
feet = "fixed"
[loads.all]
apply = [{{ members = "beams", uniform = 12, direction = "down" }}, {{ joint = "A1", force = 30, direction = "right" }}]
"""


def test_everything_reversed_is_a_reversed_load(tmp_path: Path) -> None:
    frame = put(tmp_path, TALL)
    claim = claim_of(of_case(answered(TALL), "all"), change=lambda row, key, value: -value, digits=5)
    status, document = verified(frame, claim)
    assert (status, document["verdict"]) == (1, "disagree")
    assert document["suspects"][0]["kind"] == "load"


def test_one_member_with_another_sign_is_no_convention(tmp_path: Path) -> None:
    frame = put(tmp_path, TALL)
    member = of_case(answered(TALL), "all")["member_ends"][0]["member"]
    claim = claim_of(
        of_case(answered(TALL), "all"), digits=5,
        change=lambda row, key, value: -value if row.get("member") == member and key == "moment" else value,
    )  # fmt: skip
    assert verified(frame, claim)[0] == 1


def test_a_claim_that_names_no_case_is_undecided_unless_exactly_one_fits(portal: Path, tmp_path: Path) -> None:
    status, document = verified(portal, only("wind"))
    assert status == 0 and document["claim"]["case"] == "wind"
    text = call("verify", portal, "-", stdin=only("wind").encode()).out
    assert "names no case" in text
    wrong = only("wind", change=lambda row, key, value: 3 * value + 1)
    done = call("verify", portal, "-", "--json", "-", stdin=wrong.encode())
    assert done.status == 3
    assert "--case" in call("verify", portal, "-", stdin=wrong.encode()).out
    assert verified(portal, wrong, "--case", "wind")[0] == 1
    twice = put(tmp_path, PORTAL + "same = { wind = 1.0 }\n", "twice.toml")
    assert verified(twice, only("wind"))[0] == 3
    assert verified(twice, only("wind"), "--case", "same")[0] == 0


def test_a_claim_that_names_its_case_is_compared_with_that_one(portal: Path) -> None:
    assert verified(portal, only("wind", heading="Load case: wind"))[0] == 0
    assert verified(portal, only("wind", heading="Load case: dead"))[0] == 1


def in_two_cases(second: Callable[[dict[str, Any], str, float], float]) -> str:
    return "\n".join([
        only("dead", heading="Load case: dead"), only("wind", heading="Load case: wind", change=second),
    ])  # fmt: skip


def test_several_cases_have_the_worst_verdict(portal: Path) -> None:
    status, document = verified(portal, in_two_cases(lambda row, key, value: value))
    assert status == 0 and document["claim"]["case"] == ["dead", "wind"]
    status, document = verified(
        portal, in_two_cases(lambda row, key, value: 1.3 * value if row.get("member") == "A-B" else value)
    )
    assert status == 1 and {d["case"] for d in document["disagreements"]} == {"wind"}


def test_a_case_that_the_frame_lacks_is_undecided(portal: Path) -> None:
    status, document = verified(portal, only("dead", heading="Load case: earthquake"))
    assert (status, document["verdict"]) == (3, "undecided")
    assert "earthquake" in call("verify", portal, "-", stdin=only("dead", heading="Load case: earthquake").encode()).out


def test_the_unsafe_side_comes_first(one_case: Path) -> None:
    """The claim is too large by far in one place and a little too small in another: the small one is listed first."""
    factors = {"A-B": 3.0, "C-D": 0.9}
    claim = dead(change=lambda row, key, value: factors.get(row.get("member", ""), 1.0) * value)
    _, document = verified(one_case, claim)
    found = [(abs(d["values"]["claim"]), abs(d["values"]["slope-deflection"])) for d in document["disagreements"]]
    lower = [claimed < ours for claimed, ours in found]
    assert lower == sorted(lower, reverse=True) and 0 < sum(lower) < len(lower)
    text = call("verify", one_case, "-", stdin=claim.encode()).out
    sides = re.findall(r"\b(low|high)\b", text.partition("Differences in")[2].partition("\n\n")[0])
    assert "unsafe side" in text and sides == sorted(sides, reverse=True) and set(sides) == {"low", "high"}


def test_tolerance_by_option_and_in_the_frame(one_case: Path, tmp_path: Path) -> None:
    off = dead(change=lambda row, key, value: 1.03 * value)
    assert verified(one_case, off)[0] == 1
    assert verified(one_case, off, "--tolerance", "5")[0] == 0
    assert verified(one_case, off, "--tolerance", "5%")[0] == 0
    loose = put(tmp_path, ONE_CASE + '[analysis]\ntolerance = "4%"\n', "loose.toml")
    assert verified(loose, off)[0] == 0
    assert verified(loose, off, "--tolerance", "1")[0] == 1
    assert "NOT the usual 1%" in " ".join(call("verify", loose, "-", stdin=off.encode()).out.split())
    assert "NOT the usual" not in call("verify", one_case, "-", stdin=off.encode()).out


@pytest.mark.parametrize("percent", ["0", "-1", "x", "nan", "inf", "100", ""])
def test_a_tolerance_that_is_none(one_case: Path, percent: str) -> None:
    done = call("verify", one_case, "-", f"--tolerance={percent}", stdin=dead().encode())
    assert done.status == 2 and "--tolerance" in done.err


def test_the_audit_does_not_change_the_verdict(one_case: Path) -> None:
    """A claim within tolerance whose digits do not balance still agrees, and the statics say so."""
    claim = dead(change=lambda row, key, value: 1.004 * value if row.get("member") == "A-B" else value)
    status, document = verified(one_case, claim)
    assert status == 0
    assert any(not s["ok"] for s in document["statics"])


def test_units_by_fit_and_by_option(tmp_path: Path) -> None:
    frame = put(tmp_path, TALL)
    results = of_case(answered(TALL), "all")
    large = claim_of(results, ("member_ends",), change=lambda row, key, value: 1000 * value, digits=1)
    bare = re.sub(r" \[[^\]]*\]", "", large)
    status, document = verified(frame, bare)
    assert status == 0 and document["claim"]["units"]["axial"].startswith("N")
    assert verified(frame, bare, "--units", "kN m")[0] == 1
    assert verified(frame, bare, "--units", "N m")[0] == 0


@pytest.mark.parametrize(
    ("claim", "status"), [("shear = 3\n", 2), ("", 2), ("   \n\n", 2), ("nothing to see here\n", 2)]
)
def test_a_claim_without_results_is_unusable(one_case: Path, claim: str, status: int) -> None:
    done = call("verify", one_case, "-", stdin=claim.encode())
    assert (done.status, done.out) == (status, "") and done.err.startswith("crosscheck: ")


def test_a_claim_file_that_is_not_there(one_case: Path, tmp_path: Path) -> None:
    for name in ("absent.txt", "."):
        done = call("verify", one_case, tmp_path / name)
        assert done.status == 2 and done.err.startswith("crosscheck: ")


# --- true zeros: cases whose answer is nothing at all

STILL = {
    "determinate under temperature": f"""\
units = "kN m"
{STEEL}{POST}
[joints]
a = [0, 0]
b = [5, 0]
c = [9, 3]
[members]
"a-b" = {{ section = "post", material = "steel" }}
"b-c" = {{ section = "post", material = "steel" }}
[supports]
a = "pinned"
c = "roller"
[loads.nothing]
apply = [{{ members = ["a-b", "b-c"], temperature = 30, difference = 12 }}]
""",
    "determinate under settlement": f"""\
units = "kN m"
{STEEL}{POST}
[joints]
a = [0, 0]
b = [5, 4]
c = [9, 3]
[members]
"a-b" = {{ section = "post", material = "steel" }}
"b-c" = {{ section = "post", material = "steel", hinge = "from" }}
[supports]
a = "pinned"
c = "pinned"
[loads.nothing]
apply = [{{ joint = "c", settlement = {{ down = 0.02 }} }}]
""",
    "joints that do not move": f"""\
units = "kN m"
{STEEL}{THIN}
[joints]
a = [0, 0]
b = [5, 0]
c = [10, 0]
[members]
"a-b" = {{ section = "post", material = "steel" }}
"b-c" = {{ section = "post", material = "steel" }}
[supports]
a = "fixed"
b = {{ x = "free", y = "held" }}
c = {{ x = "free", y = "held", rotation = "held" }}
[loads.nothing]
apply = [{{ members = ["a-b", "b-c"], uniform = 7, direction = "down" }}]
""",
    "load straight into a support": PORTAL.partition("[loads.dead]")[0] + """\
[loads.nothing]
apply = [{ joint = "A", force = 40, direction = "down" }]
""",
}  # fmt: skip


@pytest.mark.parametrize("what", STILL)
def test_frames_where_some_kinds_of_values_are_all_zero(tmp_path: Path, what: str) -> None:
    frame = put(tmp_path, STILL[what])
    done = call("opinions", frame, "--json", "-")
    assert done.status == 0, done.document["disagreements"][:3]
    assert sum(o["status"] == "given" for o in done.document["opinions"]) >= 2
    claim = claim_of(of_case(done.document, "nothing"), digits=3)
    status, document = verified(frame, claim)
    if what == "load straight into a support":
        # A single value is no three that fix a sign: undecided, and not for anything else.
        assert status == 3 and not document["disagreements"]
        text = put(tmp_path, "[signs]\nreactions = \"on the frame\"\n", "reading.toml")
        status, document = verified(frame, claim, "--reading", str(text))
    assert status == 0, (document["disagreements"][:3], call("verify", frame, "-", stdin=claim.encode()).out)


# --- what is printed where


def test_with_json_to_standard_output_nothing_else_is_printed_there(portal: Path, tmp_path: Path) -> None:
    claim = put(tmp_path, only("dead"), "claim.csv")
    commands = ("opinions", portal), ("verify", portal, claim, "--case", "dead"), ("inspect", portal), ("regress", tmp_path)
    for argv in commands:
        assert call(*argv, "--json", "-").document["format"] == "crosscheck/1"


def test_json_to_a_file_leaves_the_report(portal: Path, tmp_path: Path) -> None:
    path = tmp_path / "out.json"
    done = call("opinions", portal, "--json", path)
    assert done.out.lstrip().startswith("AGREE")
    document = json.loads(path.read_text(encoding="utf-8"))
    jsonschema.validate(document, OPINIONS)
    assert document == call("opinions", portal, "--json", "-").document
    assert call("opinions", portal, "--json", tmp_path / "no" / "such" / "folder.json").status == 2


def test_the_process_itself(portal: Path, tmp_path: Path) -> None:
    """Through the interpreter: status, streams, no colour and no escape codes in a pipe."""
    environment = {**os.environ, "NO_COLOR": "1", "OPENBLAS_NUM_THREADS": "1"}
    wrong = put(tmp_path, only("dead", change=lambda row, key, value: 2 * value), "wrong.csv")
    for argv, status in (
        (["verify", str(portal), str(wrong), "--case", "dead"], 1),
        (["opinions", str(tmp_path / "absent.toml")], 2),
        ([], 2),
    ):
        done = subprocess.run(
            [sys.executable, "-m", "crosscheck", *argv], capture_output=True, env=environment, check=False, cwd=tmp_path
        )
        assert done.returncode == status
        assert b"\x1b" not in done.stdout + done.stderr and b"Traceback" not in done.stderr


def test_a_search_for_suspects_that_fails_inside_costs_no_verdict(
    portal: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def fails(*_: Any, **__: Any) -> Any:
        raise ZeroDivisionError("planted")

    monkeypatch.setattr("crosscheck.suspects.search", fails)
    wrong = dead().replace("1", "7", 40)
    done = call("verify", portal, "-", "--case", "dead", stdin=wrong.encode())
    assert done.status == 1 and "Traceback" not in done.err
    assert "the search for suspects failed inside (ZeroDivisionError: planted)" in " ".join(done.out.split())


def test_a_sheet_of_a_text_is_refused(portal: Path, tmp_path: Path) -> None:
    claim = put(tmp_path, dead(), "claim.txt")
    done = call("verify", portal, claim, "--sheet", "Results")
    assert done.status == 2 and "--sheet goes with a spreadsheet file" in done.err
