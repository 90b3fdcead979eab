"""Standard frames: values on record, what moved, what is told apart; two processes at once; the pytest plugin."""

from __future__ import annotations

import datetime
import json
import os
import re
import signal
import subprocess
import sys
import tempfile
import time
import xml.etree.ElementTree as ET
from functools import cache
from pathlib import Path

import pytest

from crosscheck import check, files
from crosscheck.cli import main
from crosscheck.suite.beside import Standard, expectation
from crosscheck.suite.record import Refused, put_on_record, read_record
from crosscheck.suite.regress import FrameOutcome, check_frame, chosen, run
from crosscheck.suite.spread import spread
from tests.benchmarks.bench_suite import write_frames
from tests.make_cases import CASES
from tests.sheds import SHED, claim_text, write_shed

pytest_plugins = ["pytester"]


@cache
def made_once() -> dict[str, str]:
    """The shed, a right claim and its record, by the ending of the file."""
    with tempfile.TemporaryDirectory() as name:
        path = write_shed(Path(name))
        assert main(["record", str(path), "--reason", "first issue"]) == 0
        endings = ("toml", "claim.txt", "record.toml")
        return {ending: path.with_name(f"shed.{ending}").read_text(encoding="utf-8") for ending in endings}


def fresh(folder: Path, name: str = "shed") -> Path:
    """The shed and its claim, never put on record."""
    for ending in ("toml", "claim.txt"):
        (folder / f"{name}.{ending}").write_text(made_once()[ending], encoding="utf-8")
    return folder / f"{name}.toml"


def recorded(folder: Path, name: str = "shed") -> Path:
    """The same with its values on record."""
    path = fresh(folder, name)
    record = made_once()["record.toml"].replace("shed.", f"{name}.")
    path.with_name(f"{name}.record.toml").write_text(record, encoding="utf-8")
    return path


def alter(path: Path, row: str, factor: float) -> None:
    """Multiply the first number of a row of values on record."""
    text = path.read_text(encoding="utf-8")
    found = re.search(rf'^"{row}" = \[([^,]+),', text, re.MULTILINE)
    assert found
    changed = repr(float(found.group(1)) * factor)
    path.write_text(text[: found.start(1)] + changed + text[found.end(1) :], encoding="utf-8")


def test_recorded_frame_holds(tmp_path: Path) -> None:
    path = recorded(tmp_path)
    outcome = check_frame(Standard(path))
    assert outcome.state == "held"
    assert outcome.compared == 3 * (6 * 3 + 4 * 3 + 2 * 3)  # cases and combination, each end, joint and support value


@pytest.mark.parametrize(("factor", "state"), [(1 + 1e-5, "moved"), (1 - 1e-5, "moved"), (1 + 1e-9, "held")])
def test_drift_of_a_recorded_value(tmp_path: Path, factor: float, state: str) -> None:
    path = recorded(tmp_path)
    alter(tmp_path / "shed.record.toml", "A-B at A", factor)
    outcome = check_frame(Standard(path))
    assert outcome.state == state
    if state == "moved":
        (moved,) = outcome.differences
        assert (moved.place.member, moved.place.joint, moved.place.quantity) == ("A-B", "A", "axial")


def test_states_are_told_apart(tmp_path: Path) -> None:
    recorded(tmp_path, "held")
    changed = recorded(tmp_path, "changed")
    changed.write_text(SHED.replace("8.5", "8.6"), encoding="utf-8")
    (tmp_path / "changed.claim.txt").unlink()
    recorded(tmp_path, "gone")
    (tmp_path / "gone.claim.txt").unlink()
    fresh(tmp_path, "fresh")
    (tmp_path / "broken.toml").write_text("title = ", encoding="utf-8")
    recorded(tmp_path, "wrong")
    claim = tmp_path / "wrong.claim.txt"
    claim.write_text(made_once()["claim.txt"].replace("A-B,A,-", "A-B,A,-1"), encoding="utf-8")
    frames = sorted(p for p in tmp_path.glob("*.toml") if ".record." not in p.name)
    states = {f.standard.stem: f.state for f in run([Standard(p) for p in frames], [tmp_path]).frames}
    assert states == {
        "held": "held", "changed": "record older than the frame", "gone": "claim deleted", "fresh": "never on record",
        "broken": "unreadable", "wrong": "disagree",
    }  # fmt: skip


def test_a_claim_that_a_change_of_the_frame_put_out_is_told_with_the_change(tmp_path: Path) -> None:
    frame = recorded(tmp_path)
    assert check_frame(Standard(frame)).says.endswith("values hold")
    frame.write_text(SHED.replace('A = "fixed"', 'A = "pinned"'), encoding="utf-8")
    outcome = check_frame(Standard(frame))
    assert outcome.state == "disagree"
    assert outcome.says.endswith("expected to agree; the frame file has changed since its values went on record")


def test_exit_statuses(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    empty = tmp_path / "empty"
    empty.mkdir()
    assert main(["regress", str(empty)]) == 2
    assert "No frame file found" in capsys.readouterr().out
    assert main(["regress", str(tmp_path / "missing")]) == 2
    broken = tmp_path / "broken"
    broken.mkdir()
    (broken / "x.toml").write_text("members = 3", encoding="utf-8")
    assert main(["regress", str(broken)]) == 2
    good = tmp_path / "good"
    good.mkdir()
    recorded(good)
    assert main(["regress", str(good)]) == 0
    fresh(good, "fresh")
    assert main(["regress", str(good)]) == 1
    assert main(["regress", str(good), "--only", "shed"]) == 0


def test_json_and_junit(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    recorded(tmp_path)
    fresh(tmp_path, "fresh")
    capsys.readouterr()
    junit = tmp_path / "out.xml"
    assert main(["regress", str(tmp_path), "--json", "-", "--junit", str(junit)]) == 1
    document = json.loads(capsys.readouterr().out)
    assert document["format"] == "crosscheck/1"
    assert [f["verdict"] for f in document["frames"]] == ["never on record", "held"]
    suite = ET.parse(junit).getroot()
    assert suite.attrib["tests"] == "2"
    assert suite.attrib["failures"] == "1"
    assert [c.find("failure") is None for c in suite] == [False, True]


def test_history_is_kept_and_readable(tmp_path: Path) -> None:
    path = recorded(tmp_path)
    before = read_record(tmp_path / "shed.record.toml").now
    path.write_text(SHED.replace("8.5", "9.5"), encoding="utf-8")
    assert main(["record", str(path), "--reason", "heavier roof"]) == 0
    record = read_record(tmp_path / "shed.record.toml")
    assert record.now.facts["reason"] == "heavier roof"
    assert record.now.values != before.values
    assert record.before == (before,)


ENVELOPED = SHED + """gust = { wind = 1.5 }

[envelopes]
"at its most" = ["strength", "gust"]
"""


@pytest.fixture
def enveloped(tmp_path: Path) -> Path:
    """The shed with an envelope over two combinations, on record."""
    path = tmp_path / "shed.toml"
    path.write_text(ENVELOPED, encoding="utf-8")
    assert main(["record", str(path), "--reason", "first issue"]) == 0
    return path


def test_envelopes_go_on_record_by_what_they_are_over(enveloped: Path) -> None:
    record = read_record(enveloped.with_name("shed.record.toml"))
    assert record.now.envelopes == {"at its most": ("strength", "gust")}
    assert check_frame(Standard(enveloped)).state == "held"
    assert main(["record", str(enveloped), "--reason", "again"]) == 0
    assert read_record(enveloped.with_name("shed.record.toml")).before == (record.now,)


def _record_replaced(frame: Path, old: str, new: str) -> FrameOutcome:
    path = frame.with_name("shed.record.toml")
    text = path.read_text(encoding="utf-8")
    assert text.count(old) == 1
    path.write_text(text.replace(old, new), encoding="utf-8")
    return check_frame(Standard(frame))


def test_an_envelope_over_other_names_has_moved_though_no_case_has(enveloped: Path) -> None:
    """The greatest and least values that moved are told, with what governs."""
    outcome = _record_replaced(enveloped, '["strength", "gust"]', '["strength", "dead"]')
    assert outcome.state == "moved"
    assert "envelope at its most: over gust now only, over dead on record only" in outcome.says
    cases = check.ask(check.read(enveloped)).answers["slope-deflection"].cases
    strength, gust, dead = (cases[n].ends[0, 0, 2] for n in ("strength", "gust", "dead"))
    told = [d for d in outcome.differences if (d.place.member, d.place.joint, d.place.quantity) == ("A-B", "A", "moment")]
    assert strength < dead < gust < 0
    (greatest,) = told
    assert greatest.place.case == "at its most" and greatest.place.extreme == "max"
    assert greatest.values == pytest.approx({"now": gust, "on record": dead}, rel=1e-9)
    assert greatest.note == "gust governs now, dead on record"
    assert all(d.place.case == "at its most" for d in outcome.differences)


def test_an_envelope_over_the_same_names_in_another_order_holds(enveloped: Path) -> None:
    assert _record_replaced(enveloped, '["strength", "gust"]', '["gust", "strength"]').state == "held"


def test_an_envelope_that_the_record_does_not_speak_of_is_said(enveloped: Path) -> None:
    """A record from before envelopes were on record still holds."""
    outcome = _record_replaced(enveloped, '[now.envelopes]\n"at its most" = ["strength", "gust"]\n', "")
    assert outcome.state == "held"
    assert outcome.says.endswith("values hold; envelope at its most is not on record")


def test_an_envelope_that_the_frame_has_no_longer_is_said(enveloped: Path) -> None:
    enveloped.write_text(ENVELOPED[: ENVELOPED.index("[envelopes]")], encoding="utf-8")
    outcome = check_frame(Standard(enveloped))
    assert outcome.state == "record older than the frame"
    assert outcome.says.endswith("values hold; envelope at its most: over strength, gust on record only")


def test_two_sets_whose_envelopes_are_over_other_names_have_moved(enveloped: Path, tmp_path: Path) -> None:
    there = tmp_path / "there"
    there.mkdir()
    text = enveloped.with_name("shed.record.toml").read_text(encoding="utf-8")
    (there / "shed.toml").write_text(ENVELOPED, encoding="utf-8")
    (there / "shed.record.toml").write_text(text, encoding="utf-8")
    assert main(["regress", str(enveloped), "--against", str(there)]) == 0
    (there / "shed.record.toml").write_text(text.replace('"strength", "gust"', '"strength"'), encoding="utf-8")
    assert main(["regress", str(enveloped), "--against", str(there)]) == 1


def test_an_included_file_is_on_record_by_its_whole_name(tmp_path: Path) -> None:
    """A name with dots, blanks and slashes is one key of TOML, quoted."""
    (tmp_path / "office files").mkdir()
    sections = SHED[SHED.index("[sections.post]") : SHED.index("[joints]")]
    (tmp_path / "office files" / "sections.of.2026.toml").write_text(sections, encoding="utf-8")
    path = tmp_path / "shed.toml"
    include = 'include = ["office files/sections.of.2026.toml"]\n'
    path.write_text(include + SHED.replace(sections, ""), encoding="utf-8")
    assert main(["record", str(path), "--reason", "first issue"]) == 0
    includes = read_record(tmp_path / "shed.record.toml").now.facts["includes"]
    assert list(includes) == ["office files/sections.of.2026.toml"]
    assert re.fullmatch("[0-9a-f]{64}", *includes.values())
    assert check_frame(Standard(path)).state == "held"


def test_refused_when_opinions_disagree(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    import dataclasses

    from crosscheck.opinions import moment_distribution

    path = write_shed(tmp_path)
    honest = moment_distribution.opine

    def wrong(*args: object) -> object:
        answer = honest(*args)  # type: ignore[arg-type]
        case = answer.cases["dead"]  # type: ignore[union-attr]
        cases = {**answer.cases, "dead": dataclasses.replace(case, ends=case.ends * 1.001)}  # type: ignore[union-attr]
        return dataclasses.replace(answer, cases=cases)  # type: ignore[type-var]

    monkeypatch.setattr(moment_distribution, "opine", wrong)
    with pytest.raises(Refused, match="disagree"):
        put_on_record(Standard(path), check.ask(check.read(path)), "no")
    assert main(["record", str(path), "--reason", "no"]) == 1
    assert not (tmp_path / "shed.record.toml").exists()


def test_two_processes_at_once_lose_nothing(tmp_path: Path) -> None:
    path = write_shed(tmp_path, claim=False)
    commands = [[sys.executable, "-m", "crosscheck", "record", str(path), "--reason", f"run {k}"] for k in range(3)]
    running = [subprocess.Popen(c, stdout=subprocess.DEVNULL) for c in commands]
    assert [p.wait(timeout=120) for p in running] == [0, 0, 0]
    record = read_record(tmp_path / "shed.record.toml")
    assert {e.facts["reason"] for e in (record.now, *record.before)} == {"run 0", "run 1", "run 2"}
    assert [p.name for p in tmp_path.iterdir() if p.name.startswith(".")] == []


ACCEPTED = """\
[[accepted]]
case = "dead"
quantity = "moment"
member = "A-B"
joint = "A"
difference = {size}
why = "their base plate is modelled"
initials = "KW"
until = {until}
"""


@pytest.mark.parametrize(
    ("size", "until", "state"),
    [(60.0, "2099-01-01", "held"), (1.0, "2099-01-01", "disagree"), (60.0, "2020-01-01", "disagree")],
)
def test_accepted_differences(tmp_path: Path, size: float, until: str, state: str) -> None:
    path = recorded(tmp_path)
    claim = tmp_path / "shed.claim.txt"
    text = made_once()["claim.txt"]
    row = next(line for line in text.splitlines() if line.startswith("A-B,A,"))
    value = row.rsplit(",", 1)[1]
    claim.write_text(text.replace(row, row.replace(value, f"{float(value) * 1.1:.5g}")), encoding="utf-8")
    assert check_frame(Standard(path)).state == "disagree"
    (tmp_path / "shed.accepted.toml").write_text(ACCEPTED.format(size=size, until=until), encoding="utf-8")
    outcome = check_frame(Standard(path))
    assert outcome.state == state
    assert len(outcome.accepted) == (1 if state == "held" else 0)


def test_bad_accepted_file_is_said(tmp_path: Path) -> None:
    path = recorded(tmp_path)
    (tmp_path / "shed.accepted.toml").write_text("[[accepted]]\ncase = 'dead'\nquantty = 'x'\n", encoding="utf-8")
    outcome = check_frame(Standard(path), datetime.date(2026, 12, 1))
    assert outcome.state == "unreadable"
    assert "until" in outcome.says or "quantity" in outcome.says


def test_against_another_set(tmp_path: Path) -> None:
    here, there = tmp_path / "here", tmp_path / "there"
    here.mkdir()
    there.mkdir()
    recorded(here)
    recorded(there)
    assert main(["regress", str(here), "--against", str(there)]) == 0
    alter(there / "shed.record.toml", "B", 1.001)
    assert main(["regress", str(here), "--against", str(there)]) == 1


def test_changed_since(tmp_path: Path) -> None:
    recorded(tmp_path, "old")
    recorded(tmp_path, "new")
    git = ["git", "-C", str(tmp_path), "-c", "user.name=t", "-c", "user.email=t@t"]
    for words in (["init", "-q"], ["add", "."], ["commit", "-qm", "set"]):
        subprocess.run([*git, *words], check=True)
    assert main(["regress", str(tmp_path), "--changed-since", "HEAD"]) == 2
    (tmp_path / "new.claim.txt").write_text(claim_text(tmp_path / "new.toml", digits=4), encoding="utf-8")
    assert [s.path.name for s in chosen([tmp_path], since="HEAD")] == ["new.toml"]
    assert main(["regress", str(tmp_path), "--changed-since", "no-such-revision"]) == 2


def test_claims_beside_and_expectations(tmp_path: Path) -> None:
    path = write_shed(tmp_path)
    write_shed(tmp_path, "shed.long")
    (tmp_path / "shed.two.claim.csv").write_text("# expect: disagree, end release rafter\n", encoding="utf-8")
    (tmp_path / "shed.three.claim.txt").write_text("# expect: disagree\n", encoding="utf-8")
    names = [c.name for c in Standard(path).claims()]
    assert names == ["shed.claim.txt", "shed.three.claim.txt", "shed.two.claim.csv"]
    wanted = expectation(tmp_path / "shed.two.claim.csv")
    assert wanted is not None
    assert (wanted.kind, wanted.where) == ("end release", "rafter")
    assert expectation(tmp_path / "shed.claim.txt") is None


def test_crash_costs_that_frame_only(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = recorded(tmp_path)
    recorded(tmp_path, "bad")
    honest = check.read

    def crashing(path: Path, variant: str) -> object:
        if "bad" in str(path):
            raise ZeroDivisionError("planted")
        return honest(path, variant)

    monkeypatch.setattr(check, "read", crashing)
    states = {f.standard.stem: f.state for f in run([Standard(tmp_path / "bad.toml"), Standard(path)], [tmp_path]).frames}
    assert states == {"bad": "crashed", "shed": "held"}


def test_a_process_that_dies_costs_its_frame_only(tmp_path: Path) -> None:
    frames = [Standard(fresh(tmp_path, f"f{k}")) for k in range(5)]
    outcomes = {o.standard.stem: o.state for o in spread(_die_on_f2, frames, _lost, workers=2)}
    assert outcomes == {f"f{k}": "crashed" if k == 2 else "held" for k in range(5)}


def _die_on_f2(standard: Standard) -> FrameOutcome:
    if standard.stem == "f2":
        os._exit(1)
    return FrameOutcome(standard, "held")


def _lost(standard: Standard) -> FrameOutcome:
    return FrameOutcome(standard, "crashed")


def test_a_lock_ends_with_its_process_and_half_written_files_are_cleared(tmp_path: Path) -> None:
    target = tmp_path / "shed.record.toml"
    hold = "import sys, time; from pathlib import Path; from crosscheck.files import alone\n"
    hold += "with alone(Path(sys.argv[1])): print('held', flush=True); time.sleep(60)"
    holder = subprocess.Popen([sys.executable, "-c", hold, str(target)], stdout=subprocess.PIPE, text=True)
    assert holder.stdout is not None
    with holder, holder.stdout:
        assert holder.stdout.readline() == "held\n"
        assert files._try_lock(tmp_path / ".shed.record.toml.lock", target) is None
        (tmp_path / ".shed.record.toml.abc.part").write_text("[now", encoding="utf-8")
        holder.kill()
    with files.alone(target):
        assert not list(tmp_path.glob(".*.part"))
    assert list(tmp_path.iterdir()) == []


@pytest.mark.skipif(os.name == "nt", reason="processes are killed by signal")
def test_killed_in_the_middle_and_run_again(tmp_path: Path) -> None:
    write_frames(tmp_path, 24)
    command = [sys.executable, "-m", "crosscheck", "record", str(tmp_path), "--reason", "first issue"]
    with subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL) as running:
        deadline = time.monotonic() + 100
        while len(list(tmp_path.glob("*.record.toml"))) < 3 and time.monotonic() < deadline:
            time.sleep(0.01)
        running.send_signal(signal.SIGKILL)
    done = list(tmp_path.glob("*.record.toml"))
    assert 3 <= len(done) < 24
    # What is there is whole, and holds; the rest is told apart; running again completes it.
    states = {o.standard.stem: o.state for o in run(chosen([tmp_path]), [tmp_path]).frames}
    assert {stem for stem, state in states.items() if state == "held"} >= {p.name.split(".")[0] for p in done}
    assert set(states.values()) <= {"held", "never on record"}
    assert subprocess.run(command, stdout=subprocess.DEVNULL, check=False).returncode == 0
    assert run(chosen([tmp_path]), [tmp_path]).counts == {"held": 24}
    assert not list(tmp_path.glob(".*"))


def test_generated_frames_go_on_record(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Number 46 has a deflection that turns close to its fixed foot, where one opinion once saw nothing."""
    write_frames(tmp_path, 50)
    status = main(["record", str(tmp_path), "--only", "portal004[4-9]", "--reason", "first issue"])
    assert status == 0, capsys.readouterr().err
    assert len(list(tmp_path.glob("*.record.toml"))) == 6


def test_demonstration_frames_hold(capsys: pytest.CaptureFixture[str]) -> None:
    """All of cases/ holds: opinions, values on record, and every claim as it says of itself."""
    assert main(["regress", str(CASES), "--json", "-"]) == 0
    document = json.loads(capsys.readouterr().out)
    assert len(document["frames"]) >= 12
    assert {f["verdict"] for f in document["frames"]} == {"held"}
    assert sum(len(f["claims"]) for f in document["frames"]) >= 30


# --- two printouts of one frame


def printouts(folder: Path, old: str, new: str) -> tuple[str, str, str]:
    """The shed, its claim, and the claim as another version prints it."""
    path = fresh(folder)
    text = made_once()["claim.txt"]
    assert old in text
    other = folder / "other.txt"
    other.write_text(text.replace(old, new), encoding="utf-8")
    return str(path), str(folder / "shed.claim.txt"), str(other)


def test_nothing_moved_between_two_printouts(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    frame, claim, _ = printouts(tmp_path, "A-B,A", "A-B,A")
    coarse = tmp_path / "coarse.txt"
    coarse.write_text(claim_text(Path(frame), digits=3), encoding="utf-8")
    assert main(["verify", frame, claim, "--against", claim]) == 0
    assert "NOTHING MOVED in the 24 values" in capsys.readouterr().out
    # Five digits against three of the same numbers: only the rounding differs.
    assert main(["verify", frame, claim, "--against", str(coarse)]) == 0


def test_what_moved_between_two_printouts(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    row = next(line for line in made_once()["claim.txt"].splitlines() if line.startswith("rafter,B,"))
    value = row.rsplit(",", 1)[1]
    frame, claim, other = printouts(tmp_path, row, row.replace(value, f"{float(value) * 1.0005:.5g}"))
    # Half a per mille: every opinion agrees with both, and yet the program moved.
    assert main(["verify", frame, other]) == 0
    capsys.readouterr()
    assert main(["verify", frame, claim, "--against", other, "--json", "-"]) == 1
    document = json.loads(capsys.readouterr().out)
    (moved,) = document["disagreements"]
    assert (moved["member"], moved["joint"], moved["quantity"]) == ("rafter", "B", "moment")
    assert moved["values"]["claim"] == pytest.approx(float(value))
    assert moved["difference"] > moved["allowed"] > 0
    assert (document["verdict"], document["compared"]) == ("disagree", 24)
    assert [document[side]["beside_opinions"] for side in ("claim", "against")] == ["agree", "agree"]


def test_rows_that_one_printout_lacks_are_said(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    row = next(line for line in made_once()["claim.txt"].splitlines() if line.startswith("D-C,C,"))
    frame, claim, other = printouts(tmp_path, row + "\n", "")
    assert main(["verify", frame, claim, "--against", other, "--json", "-"]) == 0
    document = json.loads(capsys.readouterr().out)
    assert [p["quantity"] for p in document["claim"]["alone"]] == ["axial", "shear", "moment"]
    assert document["against"]["alone"] == []
    assert main(["verify", frame, "-", "--against", "-"]) == 2
    nothing = tmp_path / "nothing.txt"
    nothing.write_text(claim_text(Path(frame), case="wind"), encoding="utf-8")
    assert main(["verify", frame, claim, "--against", str(nothing)]) == 3


def test_plugin_with_workers_and_junit(pytester: pytest.Pytester) -> None:
    recorded(pytester.path)
    fresh(pytester.path, "fresh")
    wrong = pytester.path / "shed.other.claim.txt"
    wrong.write_text(made_once()["claim.txt"].replace("A-B,A,-", "A-B,A,-1"), encoding="utf-8")
    result = pytester.runpytest_subprocess("-n", "2", "--junitxml=out.xml", "-p", "no:cacheprovider", "-o", "addopts=")
    result.assert_outcomes(passed=3, failed=2)
    suite = ET.parse(pytester.path / "out.xml").getroot()[0]
    failed = {f"{c.attrib['classname']}::{c.attrib['name']}" for c in suite if c.find("failure") is not None}
    assert failed == {"fresh.toml::record", "shed.toml::shed.other.claim.txt"} or len(failed) == 2
    assert "no values on record" in (pytester.path / "out.xml").read_text(encoding="utf-8")
