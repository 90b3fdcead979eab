"""The command line itself: help, options, layout in a pipe, working, suspects by number, printing of numbers."""

from __future__ import annotations

import io
import os
import re
import shlex
import subprocess
import sys
import time
from collections import Counter
from pathlib import Path

import pytest

from crosscheck import __version__
from crosscheck.cli import _parser, main
from crosscheck.report import terminal
from crosscheck.suite.beside import frames_below
from crosscheck.waiting import WIDTH, waiting
from tests.calls import CASES, ONE_CASE, PORTAL, Call, call, claim_of, of_case, put

COMMANDS = ("opinions", "verify", "inspect", "record", "regress", "draft")
CLAIMS = sorted(path.name for path in CASES.glob("*.claim.*"))
FRAMES = list(frames_below([CASES]))


def frame_beside(claim: str) -> Path:
    return CASES / f"{claim.split('.')[0]}.toml"


def wrong_claim(frame: Path) -> str:
    """The portal's claim from a model in which D was pinned."""
    pinned = put(frame.parent, ONE_CASE.replace('D = "fixed"', 'D = "pinned"'), "pinned.toml")
    document = call("opinions", pinned, "--json", "-").document
    return claim_of(of_case(document, "dead"))


# --- asking for help


def test_help_and_version(capsys: pytest.CaptureFixture[str]) -> None:
    for argv in ([], ["--help"]):
        done = call(*argv)
        assert done.status == (0 if argv else 2)
        assert all(re.search(rf"^ +{command} ", done.out, re.MULTILINE) for command in COMMANDS)
        assert "examples:" in done.out
    done = call("--version")
    assert (done.status, done.out.strip()) == (0, f"crosscheck {__version__}")


@pytest.mark.parametrize("command", COMMANDS)
def test_every_command_explains_itself(command: str) -> None:
    done = call(command, "--help")
    assert done.status == 0 and "--json" in done.out
    assert max(map(len, done.out.splitlines())) <= 80


def test_every_option_is_in_the_readme() -> None:
    readme = (CASES.parent / "README.md").read_text(encoding="utf-8")
    for command in COMMANDS:
        for option in set(re.findall(r"--[a-z][a-z-]+", call(command, "--help").out)) - {"--help"}:
            assert option in readme, (command, option)


@pytest.mark.parametrize(
    "argv",
    [["opinions"], ["verify"], ["nonsense"], ["opinions", "a.toml", "--order", "3"],
     ["opinions", "a.toml", "--axial", "stiff"], ["verify", "a.toml"],
     ["record", "a.toml"], ["opinions", "a.toml", "--no-such-option"]],
)  # fmt: skip
def test_arguments_that_cannot_be_used(argv: list[str]) -> None:
    done = call(*argv)
    assert (done.status, done.out) == (2, "") and done.err


def test_a_suspect_by_number(tmp_path: Path) -> None:
    frame = put(tmp_path, ONE_CASE)
    wrong = wrong_claim(frame).encode()
    document = call("verify", frame, "-", "--json", "-", stdin=wrong).document
    assert (document["suspects"][0]["kind"], document["suspects"][0]["where"]) == ("support", ["D"])
    supposed = call("verify", frame, "-", "--suspect", "1", "--quiet", stdin=wrong)
    assert supposed.status == 0 and "not what was stated" in supposed.out and "D was analysed as pinned" in supposed.out
    for number in ("0", "99", "-1"):
        done = call("verify", frame, "-", f"--suspect={number}", stdin=wrong)
        assert done.status == 2 and "--suspect" in done.err


def test_quiet_prints_the_verdict_alone(tmp_path: Path) -> None:
    frame = put(tmp_path, ONE_CASE)
    for argv in (("opinions", frame), ("verify", frame, put(tmp_path, wrong_claim(frame), "c.csv")), ("inspect", frame)):
        loud, quiet = call(*argv, width=200), call(*argv, "--quiet", width=200)
        assert (quiet.status, quiet.err) == (loud.status, loud.err)
        assert quiet.out.splitlines() == loud.out.splitlines()[:1]
    assert call("opinions", frame, "--quiet", "--json", "-").document["verdict"] == "agree"


class Terminal(io.StringIO):
    def isatty(self) -> bool:
        return True


def test_what_takes_long_says_so_on_a_terminal_and_wipes_it() -> None:
    terminal, pipe = Terminal(), io.StringIO()
    for stream in (terminal, pipe):
        with waiting("asking the opinions", stream, patience=0.01):
            time.sleep(0.1)
    assert "asking the opinions ... 0 s" in terminal.getvalue()
    assert terminal.getvalue().split("\r")[-2:] == [" " * WIDTH, ""]
    assert pipe.getvalue() == ""
    soon = Terminal()
    with waiting("asking the opinions", soon):
        pass
    assert soon.getvalue() == ""


def test_help_teaches_by_example(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Every example is one that its command understands."""
    monkeypatch.chdir(tmp_path)
    for command in COMMANDS:
        shown = re.findall(rf"^  (crosscheck {command} .*?)(?:   *[a-z].*)?$", call(command, "--help").out, re.MULTILINE)
        assert len(shown) >= 2, command
        for line in shown:
            given = shlex.split(re.split(r" [<>&]", line)[0])[1:]
            assert vars(_parser().parse_args(given))["command"] == command, line


def test_show_reading_compares_nothing(tmp_path: Path) -> None:
    frame = put(tmp_path, ONE_CASE)
    done = call("verify", frame, "-", "--show-reading", stdin=wrong_claim(frame).encode())
    assert done.status == 0 and "member ends" in done.out and "AGREE" not in done.out


def test_a_value_in_words(tmp_path: Path) -> None:
    frame = put(tmp_path, ONE_CASE)
    assert call("verify", frame, "--value", "B-C max 400 kNm").status == 1
    assert call("verify", frame, "--value", "gibberish").status == 2
    assert call("verify", frame).status == 2


# --- layout


def lines_of(done: Call) -> list[str]:
    return done.out.splitlines()


@pytest.mark.parametrize("width", [80, 120])
@pytest.mark.parametrize("claim", CLAIMS)
def test_verify_fits_its_width_without_colour_or_blanks_at_ends(claim: str, width: int) -> None:
    done = call("verify", frame_beside(claim), CASES / claim, width=width)
    assert max(map(len, lines_of(done))) <= width
    assert not any(line != line.rstrip() for line in lines_of(done))
    assert "\x1b" not in done.out and "\N{HORIZONTAL ELLIPSIS}" not in done.out
    assert done.out.lstrip().startswith(("AGREE", "DISAGREE"))  # the verdict first
    assert "Cautions" in done.out


@pytest.mark.parametrize("frame", FRAMES, ids=lambda path: path.stem)
def test_opinions_and_inspect_fit_their_width(frame: Path) -> None:
    for command in ("opinions", "inspect"):
        done = call(command, frame)
        assert max(map(len, lines_of(done))) <= 80, command
        assert not any(line != line.rstrip() for line in lines_of(done))
        assert "\x1b" not in done.out and "\N{HORIZONTAL ELLIPSIS}" not in done.out


def test_one_line_a_sign_with_how_many_values_fit(tmp_path: Path) -> None:
    frame = put(tmp_path, ONE_CASE)
    claim = claim_of(of_case(call("opinions", frame, "--json", "-").document, "dead"), ("member_ends",))
    out = call("verify", frame, "-", stdin=claim.encode()).out
    for quantity in ("axial", "shear", "moment"):
        assert len(re.findall(rf"{quantity}: .*; 6 of 6 fit$", out, re.MULTILINE)) == 1
    assert "telling values" not in out


def test_noise_is_printed_as_zero() -> None:
    """The kiosk is axially rigid: its joints cannot move up or down, whatever rounding says."""
    out = call("opinions", CASES / "kiosk.toml").out
    assert not re.search(r"\de-(1[5-9]|2\d)", out)


# --- what is printed of a frame


@pytest.fixture
def portal_report(tmp_path: Path) -> str:
    return call("opinions", put(tmp_path, PORTAL)).out


def test_the_tension_face_stands_beside_each_moment(portal_report: str) -> None:
    """Gravity on a portal: posts are stretched outside at the top and inside at the foot, the beam on top at its ends."""
    dead = portal_report.partition("dead: results")[2].partition("\n\n")[0]
    found = {tuple(row[:2]): row[-1] for line in dead.splitlines() if len(row := line.split()) == 6}
    assert found == {
        ("A-B", "A"): "right", ("A-B", "B"): "left", ("B-C", "B"): "top", ("B-C", "C"): "top",
        ("C-D", "C"): "right", ("C-D", "D"): "left",
    }  # fmt: skip


def test_terms_are_stated_before_results(portal_report: str) -> None:
    for words in ("Portal", "sha256", "axially elastic, shear rigid, first order", "1e-06", "slope-deflection", "library"):
        assert words in portal_report
    assert portal_report.index("How it was compared") < portal_report.index("dead: results")


def test_working_prints_equations_and_distribution(tmp_path: Path) -> None:
    frame = put(tmp_path, PORTAL)
    plain, worked = call("opinions", frame).out, call("opinions", frame, "--working").out
    assert "Working of" not in plain
    for words in ("Working of slope-deflection, dead", "Working of moment-distribution, wind"):
        assert words in " ".join(worked.split())
    lower = worked.lower()
    for words in ("fixed-end moment", "distribution", "carr", "equation", "sway"):
        assert words in lower, words
    assert max(map(len, worked.splitlines())) <= 80


# --- the process


def test_no_colour_asked_for_and_a_reader_that_goes_away(tmp_path: Path) -> None:
    frame = put(tmp_path, PORTAL)
    environment = {**os.environ, "FORCE_COLOR": "", "NO_COLOR": "1"}
    process = subprocess.Popen(
        [sys.executable, "-m", "crosscheck", "opinions", str(frame), "--json", "-"],
        stdout=subprocess.PIPE, stderr=subprocess.PIPE, env=environment,
    )  # fmt: skip
    assert process.stdout is not None and process.stderr is not None
    process.stdout.close()
    said = process.stderr.read()
    process.stderr.close()
    process.wait(timeout=120)
    assert b"Traceback" not in said


def test_output_is_utf8_whatever_the_system_says(tmp_path: Path) -> None:
    frame = put(tmp_path, PORTAL.replace('"Portal"', '"Portál Ω"'))
    environment = {**os.environ, "PYTHONIOENCODING": "ascii", "PYTHONUTF8": "0", "LC_ALL": "C"}
    done = subprocess.run(
        [sys.executable, "-m", "crosscheck", "opinions", str(frame)], capture_output=True, env=environment, check=False
    )
    assert done.returncode == 0 and "Portál Ω" in done.stdout.decode("utf-8")


def test_main_returns_the_status(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["opinions", str(put(tmp_path, PORTAL))]) == 0
    assert main(["opinions", str(tmp_path / "absent.toml")]) == 2
    assert "absent.toml" in capsys.readouterr().err


@pytest.mark.parametrize("claim", ["-3.65e+07 right", "1.100"])
def test_nothing_of_a_table_is_cut_off_at_80_columns(claim: str) -> None:
    heads = [("place", "left"), ("quantity", "left"), ("claim", "right"), ("opinions", "right"), ("differ\nby", "right"),
             ("allowed", "right"), ("claim\nis", "left"), ("line", "right")]  # fmt: skip
    row = ("A-B at B", "moment", claim, "-5.362e+07 right", "1.71e+07", "5.36e+05", "low", "1234")
    out = terminal.plain_text(terminal.table(heads, [row]), 80)
    assert max(len(line) for line in out.splitlines()) <= 80
    assert Counter(out.split()) == Counter(" ".join((*(head for head, _ in heads), *row)).split())


def test_a_claim_before_its_frame_is_told_so(tmp_path: Path) -> None:
    frame, claim = put(tmp_path, PORTAL), put(tmp_path, "Member,End,M\nAB,A,1\n", "frame.claim.csv")
    said = call("verify", claim, frame)
    assert said.status == 2 and "the frame stands first, the claim second" in said.err


def test_two_values_alone_stand_against_no_others(tmp_path: Path) -> None:
    """A claim of one member's values has no others that would tell them for a slip."""
    frame = put(tmp_path, ONE_CASE)
    said = call("verify", frame, "--value", "M_AB = -12.4", "--value", "M_BA = 3.1")
    assert said.status == 1 and "against all the others" not in said.out


def test_a_greatest_value_is_looked_for_with_a_member_missing_too() -> None:
    """A claim of one extreme value, which no slip of its own explains: every member is taken out in turn."""
    said = call("verify", CASES / "hall.toml", "--case", "dead", "--value", "B1-C1 max 50 kNm")
    assert said.status == 1 and "Suspects" in said.out and not said.err
