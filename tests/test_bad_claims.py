"""Malformed and hopeless claims, through the command line: each with its exit status and what is said of it.

2: nothing of it can be used (not opened, not decoded, no results). 3: read, but not surely enough to judge. 1: judged
and wrong. 0: odd, but read rightly in spite of it. Whatever it holds, a value that was not understood never agrees.
"""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tests.calls import ONE_CASE, PORTAL, call, put

MOMENTS = "Member,Joint,M [kNm]\nA-B,A,17.475\nA-B,B,37.814\nB-C,B,-37.814\nB-C,C,36.066\nC-D,C,-36.066\nC-D,D,-19.223\n"
ALL = """\
Member,Joint,N [kN],V [kN],M [kNm]
A-B,A,-49.62,-13.82,17.48
A-B,B,-49.62,13.82,37.81
B-C,B,-13.82,49.62,-37.81
B-C,C,-13.82,42.38,36.07
C-D,C,-42.38,13.82,-36.07
C-D,D,-42.38,-13.82,-19.22
"""


@dataclass(frozen=True, slots=True)
class Bad:
    """words: what the report (statuses 0, 1, 3) or the message (2) says, blanks and line ends apart."""

    what: str
    claim: str | bytes
    status: int
    words: tuple[str, ...] = ()
    options: tuple[str, ...] = ()
    frame: str = ONE_CASE


BAD = [
    # --- nothing to use
    Bad("empty", "", 2, ("holds no results",)),
    Bad("blanks alone", "  \n\t\n \n", 2, ("holds no results",)),
    Bad("a byte order mark alone", b"\xef\xbb\xbf", 2, ("holds no results",)),
    Bad("binary", bytes(range(256)) * 4, 2, ("not text",)),
    Bad("a picture", b"\x89PNG\r\n\x1a\n\x00\x00\x00\rIHDR\x00\x00\x01", 2, ("not text",)),
    Bad("UTF-16 broken off", b"\xff\xfe" + MOMENTS.encode("utf-16-le")[:-1], 2, ("breaks off",)),
    Bad("UTF-8 with a mark and a broken letter", b"\xef\xbb\xbfMember \xff\xfe\n", 2, ("breaks off", "UTF-8")),
    Bad("prose", "The frame was analysed and everything was found to be in order.\n", 2, ("holds no results",)),
    Bad("a head without rows", "Member,Joint,M [kNm]\n", 2, ("holds no results",)),
    Bad("names without numbers", "Member,Joint,M [kNm]\nA-B,A,ok\nB-C,B,ok\n", 2, ("no",)),
    Bad("numbers without names or heads", "1.0 2.0 3.0\n4.0 5.0 6.0\n7.0 8.0 9.0\n", 3, ("--columns",)),
    Bad("a program", "import numpy as np\nprint(np.zeros(3))\n", 2),
    Bad("a web page", "<html><body><h1>Not found</h1></body></html>\n", 2),
    Bad("blank cells alone", "Member,Joint,M [kNm]\nA-B,A,\nA-B,B,-\n", 2),
    # --- numbers that are none, in rows of known members
    Bad("NaN", MOMENTS.replace("37.814", "NaN", 1), 0, ("5 values",)),
    Bad("infinity", MOMENTS.replace("37.814", "inf", 1), 3, ("inf",)),
    Bad("asterisks for an overflow", MOMENTS.replace("37.814", "*****", 1), 3, ("*****",)),
    Bad("a spreadsheet's error", MOMENTS.replace("37.814", "#DIV/0!", 1), 3, ("#DIV/0!",)),
    Bad("two decimal points", MOMENTS.replace("37.814", "3.7.814", 1), 3, ("3.7.814",)),
    Bad("a letter for a digit", MOMENTS.replace("37.814", "37.8l4", 1), 3, ("37.8l4",)),
    Bad("a question mark", MOMENTS.replace("37.814", "37.8?", 1), 3, ("37.8?",)),
    Bad("beyond any number", MOMENTS.replace("37.814", "1e999", 1), 3, ("1e999",)),
    Bad("an enormous number", MOMENTS.replace("37.814", "3.7814e19", 1), 1),
    # --- rows
    Bad("unknown members alone", MOMENTS.replace("A-B", "X1").replace("B-C", "X2").replace("C-D", "X3"), 3, ("lacks",)),
    Bad("one unknown member", MOMENTS + "D-E,D,19.223\n", 3, ("lacks", "D-E")),
    Bad("an unknown joint of a known member", MOMENTS.replace("A-B,A", "A-B,Z"), 3, ("A-B,Z",)),
    Bad("an unknown support", "Support,Fx [kN],Fy [kN]\nA,13.82,49.62\nD,-13.82,42.38\nQ,0.0,0.0\n", 3, ("lacks", "Q")),
    Bad("a row twice, alike", MOMENTS + "A-B,A,17.475\n", 0),
    Bad("a row twice, contradicting itself", MOMENTS + "A-B,A,71.475\n", 1),
    Bad("a row cut off", MOMENTS + "C-D,\n", 0),
    Bad("a row too long", MOMENTS.replace("37.814", "37.814,99", 1), 3, ("4 cells under 3 heads",)),
    Bad("rows slipped by one", MOMENTS.replace("17.475", "x1").replace(",37.814", ",17.475").replace("x1", "37.814"), 1),
    Bad("half a table", "\n".join(ALL.splitlines()[:4]) + "\nB-C,C,-13.82,42\n", 0, ("11 values it gives, of 36",)),
    # --- columns and heads
    Bad("no heads", "\n".join(MOMENTS.splitlines()[1:]) + "\n", 2, ("--columns",)),
    Bad("no heads but columns stated", MOMENTS.partition("\n")[2], 0, (), ("--columns", "member, joint, M")),
    Bad("no column of members", "Joint,M [kNm]\nA,17.475\nB,37.814\nC,36.066\n", 3, ("name the member",)),
    Bad("no column of ends", "Member,M [kNm]\nA-B,37.814\nB-C,-37.814\nC-D,-36.066\n", 3),
    Bad("two columns alike", "Member,Joint,M [kNm],M [kNm]\nA-B,A,17.475,37.814\nA-B,B,37.814,17.475\n", 3,
        ("more than one column",)),
    Bad("heads of nothing known", MOMENTS.replace("Member,Joint,M [kNm]", "foo,bar,baz"), 2, ("--columns",)),
    Bad("columns swapped under their heads", ALL.replace("N [kN],V [kN]", "V [kN],N [kN]"), 1),
    # --- units
    Bad("a unit that is none", MOMENTS.replace("kNm", "furlongs"), 0),
    Bad("a unit of something else", MOMENTS.replace("kNm", "mm"), 3),
    Bad("the wrong unit stated", MOMENTS.replace("kNm", "kip ft"), 1),
    Bad("moments in units of force", MOMENTS.replace("kNm", "kN"), 3),
    Bad("units that no system has", MOMENTS.replace(" [kNm]", "").replace("37.814", "278.5").replace("17.475", "128.7"), 1),
    # --- cases
    Bad("no case named where several fit or none does", ALL.replace("37.81", "31.0"), 3, ("--case",), (), PORTAL),
    Bad("a case that the frame lacks", "Load case: earthquake\n" + ALL, 3, ("earthquake",), (), PORTAL),
    Bad("asked for another case than it names", "Load case: dead\n" + ALL, 3, (), ("--case", "wind"), PORTAL),
    Bad("asked for an unknown case", ALL, 2, ('did you mean "wind"?',), ("--case", "wnd"), PORTAL),
    # --- too little to judge
    Bad("one value", "Member,Joint,M [kNm]\nA-B,A,17.475\n", 3, ("too few values",)),
    Bad("zeros alone", "Member,Joint,M [kNm]\nA-B,A,0.000\nA-B,B,0.000\nB-C,B,0.000\n", 1),
    Bad("everything too coarse", "Member,Joint,M [MNm]\nA-B,A,0.0\nA-B,B,0.0\nB-C,B,-0.0\nB-C,C,0.0\n", 3, ("coarse",)),
    # --- signs
    Bad("signs at random", MOMENTS.replace("A-B,A,17", "A-B,A,-17").replace("C-D,C,-36", "C-D,C,36"), 1),
]  # fmt: skip


@pytest.mark.parametrize("bad", BAD, ids=[b.what for b in BAD])
def test_each_has_its_status_and_its_words(bad: Bad, tmp_path: Path) -> None:
    data = bad.claim if isinstance(bad.claim, bytes) else bad.claim.encode("utf-8")
    done = call("verify", put(tmp_path, bad.frame), "-", *bad.options, stdin=data)
    said = " ".join((done.out + done.err).split())
    assert done.status == bad.status, said[:1500]
    assert "Traceback" not in said
    if bad.status == 2:
        assert done.out == "" and all(line.startswith("crosscheck: ") for line in done.err.splitlines())
    for word in bad.words:
        assert word in said, said[:1500]
    # The same as JSON: the same status, and a document if and only if there is something to say.
    again = call("verify", put(tmp_path, bad.frame), "-", *bad.options, "--json", "-", stdin=data)
    assert again.status == bad.status
    assert (again.out == "") == (bad.status == 2)


def test_there_are_enough_of_them_and_the_good_ones_are_good(tmp_path: Path) -> None:
    assert len(BAD) >= 40
    for good in (MOMENTS, ALL):
        assert call("verify", put(tmp_path, ONE_CASE), "-", stdin=good.encode()).status == 0


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "utf-16-le", "utf-16-be", "latin-1", "cp1252"])
def test_encodings_that_printouts_come_in(tmp_path: Path, encoding: str) -> None:
    claim = "Résultats du portique\n" + ALL
    assert call("verify", put(tmp_path, ONE_CASE), "-", stdin=claim.encode(encoding)).status == 0


@pytest.mark.parametrize("name", ["absent.txt", "", "folder", "claim.xlsx"])
def test_files_that_cannot_be_opened(tmp_path: Path, name: str) -> None:
    (tmp_path / "folder").mkdir()
    put(tmp_path, "this is no spreadsheet", "claim.xlsx")
    done = call("verify", put(tmp_path, ONE_CASE), tmp_path / name)
    assert (done.status, done.out) == (2, "") and done.err.startswith("crosscheck: ")


def test_problems_of_the_frame_come_before_the_claim_is_read(tmp_path: Path) -> None:
    done = call("verify", put(tmp_path, "nonsense"), tmp_path / "absent.txt")
    assert done.status == 2 and "frame.toml" in done.err


LETTERS = ["", "x", ",", "\n", "-", " ", "9", "e", "\x00", "é", "\t", ";", "."]


@settings(max_examples=40, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(at=st.integers(0, len(ALL) - 1), put_there=st.sampled_from(LETTERS))
def test_one_letter_changed_anywhere_never_ends_in_a_traceback(tmp_path: Path, at: int, put_there: str) -> None:
    claim = ALL[:at] + put_there + ALL[at + 1 :]
    done = call("verify", put(tmp_path, ONE_CASE), "-", stdin=claim.encode())
    assert done.status in (0, 1, 2, 3) and "Traceback" not in done.err
