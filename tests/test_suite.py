"""Standard frames: values on record, what moved, what is told apart; two processes at once; the pytest plugin."""

from __future__ import annotations

import datetime
import json
import re
import subprocess
import sys
import xml.etree.ElementTree as ET
from pathlib import Path

import pytest

from crosscheck import check
from crosscheck.cli import main
from crosscheck.suite.beside import Standard, expectation
from crosscheck.suite.record import Refused, put_on_record, read_record
from crosscheck.suite.regress import check_frame, run
from tests.sheds import SHED, claim_text, write_shed

pytest_plugins = ["pytester"]


def recorded(folder: Path, name: str = "shed", text: str = SHED, claim: bool = True) -> Path:
    path = write_shed(folder, name, text, claim)
    assert main(["record", str(path), "--reason", "first issue"]) == 0
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
    write_shed(tmp_path, "fresh")
    (tmp_path / "broken.toml").write_text("title = ", encoding="utf-8")
    wrong = recorded(tmp_path, "wrong")
    claim = tmp_path / "wrong.claim.txt"
    claim.write_text(claim_text(wrong).replace("A-B,A,-", "A-B,A,-1"), encoding="utf-8")
    frames = sorted(p for p in tmp_path.glob("*.toml") if ".record." not in p.name)
    states = {f.standard.stem: f.state for f in run([Standard(p) for p in frames], [tmp_path]).frames}
    assert states == {
        "held": "held", "changed": "record older than the frame", "gone": "claim deleted", "fresh": "never on record",
        "broken": "unreadable", "wrong": "disagree",
    }  # fmt: skip


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
    write_shed(good, "fresh")
    assert main(["regress", str(good)]) == 1
    assert main(["regress", str(good), "--only", "shed"]) == 0


def test_json_and_junit(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    recorded(tmp_path)
    write_shed(tmp_path, "fresh")
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
    text = claim_text(path)
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
    from crosscheck.suite.regress import chosen

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


def test_plugin_with_workers_and_junit(pytester: pytest.Pytester) -> None:
    recorded(pytester.path)
    write_shed(pytester.path, "fresh")
    wrong = pytester.path / "shed.other.claim.txt"
    wrong.write_text(claim_text(pytester.path / "shed.toml").replace("A-B,A,-", "A-B,A,-1"), encoding="utf-8")
    result = pytester.runpytest_subprocess("-n", "2", "--junitxml=out.xml", "-p", "no:cacheprovider", "-o", "addopts=")
    result.assert_outcomes(passed=3, failed=2)
    suite = ET.parse(pytester.path / "out.xml").getroot()[0]
    failed = {f"{c.attrib['classname']}::{c.attrib['name']}" for c in suite if c.find("failure") is not None}
    assert failed == {"fresh.toml::record", "shed.toml::shed.other.claim.txt"} or len(failed) == 2
    assert "no values on record" in (pytester.path / "out.xml").read_text(encoding="utf-8")
