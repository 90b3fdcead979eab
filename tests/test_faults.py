"""What goes wrong around the program: full disks, unreadable files, other places and languages, many cases, long names.

Right or refused with one message, and nothing lost. Killed while writing and two at once on a record: test_suite.py.
"""

from __future__ import annotations

import errno
import json
import os
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pytest

from crosscheck.check import ask
from crosscheck.frame.kinematics import study
from crosscheck.frame.reader import read_frame_text
from crosscheck.log import read_log
from crosscheck.opinions import slope_deflection
from tests.calls import CASES, ONE_CASE, PORTAL, call, claim_of, of_case, put

SECONDS = 120.0
"""Of processor time, for the largest of what follows: several times what it takes."""
FULL = os.environ.get("CROSSCHECK_FAULTS") == "full"
LOAD_CASES, ROWS = (100, 33_334) if FULL else (20, 10_000)
"""Load cases, and rows on each of three members: by default fewer, so that the suite stays quick."""


def right_claim(folder: Path, text: str = ONE_CASE) -> tuple[Path, Path]:
    frame = put(folder, text)
    found = call("opinions", frame, "--json", "-").document
    return frame, put(folder, claim_of(of_case(found, "dead")), "frame.claim.txt")


# --- disk full


@pytest.fixture
def full_disk(monkeypatch: pytest.MonkeyPatch) -> None:
    """Nothing reaches the disk any more."""

    def no_space(handle: int) -> None:
        raise OSError(errno.ENOSPC, "No space left on device")

    monkeypatch.setattr("crosscheck.files.os.fsync", no_space)


def test_a_full_disk_leaves_the_record_as_it_was(tmp_path: Path, request: pytest.FixtureRequest) -> None:
    frame = put(tmp_path, PORTAL)
    assert call("record", frame, "--reason", "first").status == 0
    before = {p.name: p.read_bytes() for p in tmp_path.iterdir()}
    request.getfixturevalue("full_disk")
    put(tmp_path, PORTAL.replace("uniform = 12", "uniform = 13"))
    again = call("record", frame, "--reason", "second")
    assert again.status == 2 and "cannot be written (No space left on device)" in again.err
    assert {p.name: p.read_bytes() for p in tmp_path.iterdir() if p != frame} == {
        name: data for name, data in before.items() if name != frame.name
    }


@pytest.mark.usefixtures("full_disk")
@pytest.mark.parametrize("option", ["--json", "--report"])
def test_a_full_disk_leaves_no_half_file(tmp_path: Path, option: str) -> None:
    frame = put(tmp_path, PORTAL)
    target = tmp_path / ("out.json" if option == "--json" else "out.html")
    target.write_text("old", encoding="utf-8")
    got = call("opinions", frame, option, target)
    assert got.status == 2 and "No space left on device" in got.err
    assert target.read_text(encoding="utf-8") == "old"
    assert not list(tmp_path.glob(".*"))


def test_a_full_disk_leaves_no_half_draft(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    whole = Path.open

    class Full:
        def __init__(self, path: Path) -> None:
            self.out = whole(path, "x", encoding="utf-8")

        def __enter__(self) -> Full:
            return self

        def __exit__(self, *_: object) -> None:
            self.out.close()

        def write(self, text: str) -> None:
            self.out.write(text[:10])
            raise OSError(errno.ENOSPC, "No space left on device")

    monkeypatch.setattr(Path, "open", lambda path, *a, **k: Full(path) if a == ("x",) else whole(path, *a, **k))
    got = call("draft", "--output", tmp_path / "new.toml")
    assert got.status == 2 and "No space left on device" in got.err
    assert list(tmp_path.iterdir()) == []


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="this system has no full device")
@pytest.mark.parametrize("options", [(), ("--json", "-"), ("--json", "/dev/full"), ("-q",)])
def test_standard_output_on_a_full_disk(tmp_path: Path, options: tuple[str, ...]) -> None:
    """Exit 2 and not 1, which would say that the opinions disagree; a device is written to and not replaced."""
    frame = put(tmp_path, PORTAL)
    with Path("/dev/full").open("wb") as full:
        command = [sys.executable, "-m", "crosscheck", "opinions", str(frame), *options]
        got = subprocess.run(command, stdout=full, stderr=subprocess.PIPE, check=False, timeout=SECONDS)
    told = got.stderr.decode()
    assert got.returncode == 2 and told.count("\n") == 1 and "No space left on device" in told
    assert Path("/dev/full").is_char_device()


# --- unreadable


@pytest.mark.parametrize("which", ["frame.toml", "frame.claim.txt", "frame.record.toml", "frame.log.jsonl"])
def test_an_unreadable_file_is_named(tmp_path: Path, which: str, monkeypatch: pytest.MonkeyPatch) -> None:
    frame, claim = right_claim(tmp_path)
    assert call("record", frame, "--reason", "first").status == 0
    if which.endswith("jsonl"):
        put(tmp_path, "", which)
    whole = Path.open

    def refused(path: Path, *rest: object, **options: object) -> object:
        if path.name == which:
            raise PermissionError(errno.EACCES, "Permission denied", str(path))
        return whole(path, *rest, **options)  # type: ignore[call-overload]

    monkeypatch.setattr(Path, "open", refused)
    argv: tuple[str | Path, ...] = ("verify", frame, claim)
    if which.endswith("jsonl"):
        argv = (*argv, "--report", tmp_path / "page.html")
    elif which.endswith("record.toml"):
        argv = ("regress", frame)
    got = call(*argv)
    said = "".join((got.out + got.err).split())  # a table in a report breaks long paths
    assert got.status == 2, said
    assert "".join(which.split(".")[1:]) in said.replace(".", "") and "permissiondenied" in said.lower()
    assert "Traceback" not in said


# --- another place, another language


def printed(command: list[str], settings: dict[str, str]) -> list[tuple[int, bytes, bytes]]:
    """Status and both outputs, as text and as JSON, with these settings and no others of place and language."""
    plain = {k: v for k, v in os.environ.items() if k not in ("TZ", "LANG", "LC_ALL", "PYTHONIOENCODING")}
    runs = [
        subprocess.run([*command, *more], env=plain | settings, capture_output=True, check=False, timeout=SECONDS)
        for more in ((), ("--json", "-"))
    ]
    return [(r.returncode, r.stdout, r.stderr) for r in runs]


@pytest.fixture(scope="module")
def elsewhere(tmp_path_factory: pytest.TempPathFactory) -> tuple[list[str], list[tuple[int, bytes, bytes]]]:
    """A command, and what it prints with nothing set."""
    folder = tmp_path_factory.mktemp("elsewhere")
    frame, claim = right_claim(folder, PORTAL.partition("[loads.wind]")[0].replace("Portal", "Königsträger Ω ı"))
    command = [sys.executable, "-m", "crosscheck", "verify", str(frame), str(claim)]
    return command, printed(command, {})


@pytest.mark.parametrize(
    "settings",
    [{"TZ": "Pacific/Kiritimati"}, {"TZ": "America/Anchorage"}, {"LC_ALL": "C"}, {"LC_ALL": "tr_TR.UTF-8"},
     {"LC_ALL": "de_DE.UTF-8", "LANG": "de_DE.UTF-8"}, {"PYTHONIOENCODING": "ascii", "PYTHONUTF8": "0", "LC_ALL": "C"}],
    ids=["far east", "far west", "C", "Turkish", "German", "ascii"],
)  # fmt: skip
def test_place_and_language_change_nothing(
    settings: dict[str, str], elsewhere: tuple[list[str], list[tuple[int, bytes, bytes]]]
) -> None:
    command, before = elsewhere
    assert [status for status, _, _ in before] == [0, 0]
    assert printed(command, settings) == before


# --- two at once


def test_two_checks_at_once_both_stand_in_the_log(tmp_path: Path) -> None:
    frame, claim = right_claim(tmp_path)
    command = [sys.executable, "-m", "crosscheck", "verify", str(frame), str(claim), "--report"]
    running = [
        subprocess.Popen([*command, str(tmp_path / f"page{k}.html")], stdout=subprocess.DEVNULL) for k in range(3)
    ]
    assert [p.wait(timeout=SECONDS) for p in running] == [0, 0, 0]
    assert len(read_log(tmp_path / "frame.log.jsonl")) == 3
    assert not list(tmp_path.glob(".*"))


# --- much of it


def test_many_load_cases(tmp_path: Path) -> None:
    """One factorisation serves them all; a claim of every case agrees, and one wrong value in the last is found."""
    cases = "".join(
        f'[loads.c{k}]\napply = [{{ member = "B-C", uniform = {k + 1}, direction = "down" }}, '
        f'{{ joint = "B", force = {100 - k}, direction = "right" }}]\n'
        for k in range(LOAD_CASES)
    )
    frame = put(tmp_path, ONE_CASE.partition("[loads.dead]")[0] + cases)
    started = time.process_time()
    found = call("opinions", frame, "--json", "-")
    assert found.status == 0
    results = found.document["opinions"][0]["results"]
    assert len(results) == LOAD_CASES
    text = "\n\n".join(claim_of(results[f"c{k}"], heading=f"Load case c{k}", digits=6) for k in range(LOAD_CASES))
    right = call("verify", frame, put(tmp_path, text, "frame.claim.txt"))
    assert right.status == 0, right.out[:500]
    last_case = f"c{LOAD_CASES - 1}"
    shown = f"{results[last_case]['member_ends'][1]['moment']:.6f}"
    before, title, last = text.partition(f"Load case {last_case}")
    changed = before + title + last.replace(shown, f"{float(shown) * 1.5:.6f}", 1)
    wrong = call("verify", frame, put(tmp_path, changed, "frame.claim.txt"))
    assert wrong.status == 1 and last_case in wrong.out
    assert time.process_time() - started < SECONDS


def test_very_long_names(tmp_path: Path) -> None:
    """Ten thousand letters, in joints, members and cases: still right, and every line of the report can be read."""
    long = "N" * 10_000
    text = ONE_CASE.replace('"B-C"', f'"{long}"').replace(f'"{long}" = {{', f'"{long}" = {{ from = "B", to = "C",')
    text = text.replace("loads.dead", f'loads."{"case " * 2000}end"').replace("Portal", "T" * 10_000)
    frame = put(tmp_path, text)
    found = call("opinions", frame, "--json", "-")
    assert found.status == 0
    results = next(iter(found.document["opinions"][0]["results"].values()))
    assert any(row["member"] == long for row in results["member_ends"])
    claim = put(tmp_path, claim_of(results), "frame.claim.txt")
    assert call("verify", frame, claim).status == 0
    assert call("verify", frame, claim, "--report", tmp_path / "page.html").status == 0


def test_a_claim_of_very_many_rows(tmp_path: Path) -> None:
    """Moments along three members, every 0.1 mm or so in full: one wrong row is found, and it alone."""
    frame = read_frame_text(ONE_CASE)
    answer = slope_deflection.opine(frame, study(frame))
    count, rows = ROWS, ["Load case: dead", "Member\tx [m]\tM [kNm]"]
    for k, name in enumerate(frame.members):
        length = float(frame.member_table.length[k])
        x = np.round(np.linspace(0.0, length, count), 6)
        side = np.where(np.arange(count) == count - 1, -1, 1)
        moments = answer.spans.along("dead", np.full(count, k), x, side)[:, 2]  # type: ignore[union-attr]
        rows += [f"{name}\t{at:.6f}\t{m:.4f}" for at, m in zip(x.tolist(), moments.tolist(), strict=True)]
    path = put(tmp_path, ONE_CASE)
    started = time.process_time()
    wrong_row = 2 * ROWS + ROWS // 10
    name, at, moment = rows[wrong_row].split("\t")
    rows[wrong_row] = f"{name}\t{at}\t{float(moment) + 40.0:.4f}"
    wrong = call("verify", path, put(tmp_path, "\n".join(rows) + "\n", "frame.claim.txt"))
    assert wrong.status == 1 and f"1 of {3 * ROWS:,}" in " ".join(wrong.out.split())
    assert time.process_time() - started < SECONDS


def test_a_file_that_changes_while_it_is_checked_is_read_once(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """What is judged is what was read: checksum, text and results belong together."""
    path = put(tmp_path, PORTAL)
    reads = []
    whole = Path.open

    def counted(self: Path, *rest: object, **options: object) -> object:
        reads.append(self.name)
        return whole(self, *rest, **options)  # type: ignore[call-overload]

    monkeypatch.setattr(Path, "open", counted)
    document = json.loads(call("opinions", path, "--json", "-").out)
    assert reads.count("frame.toml") == 1 and document["verdict"] == "agree"


def test_the_demonstration_frames_are_left_as_they_are() -> None:
    """Reading and checking writes nothing beside a frame."""
    before = sorted(p.name for p in CASES.iterdir())
    ask(read_frame_text((CASES / "gantry.toml").read_text(encoding="utf-8"), folder=CASES))
    assert call("verify", CASES / "gantry.toml", CASES / "gantry.claim.txt").status == 0
    assert sorted(p.name for p in CASES.iterdir()) == before
