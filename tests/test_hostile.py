"""Files made to harm: they run no code, read no other file, and exhaust neither memory nor time.

Every child process here is held to two gigabytes and to some seconds of processor time by the system, so that a file
that does exhaust them fails the test and not the machine.
"""

from __future__ import annotations

import json
import os
import subprocess
import sys
import time
import zipfile
from pathlib import Path

import pytest

from crosscheck.claims import sizes
from crosscheck.problems import UnusableInput
from tests.calls import ONE_CASE, call, put

SECONDS, BYTES = 60, 2 << 30

GUARD = """
import json, os, resource, sys
resource.setrlimit(resource.RLIMIT_CPU, ({seconds}, {seconds} + 5))
resource.setrlimit(resource.RLIMIT_AS, ({bytes}, {bytes}))
def watch(event, args):
    if event in ("os.system", "subprocess.Popen", "socket.connect", "os.exec", "os.posix_spawn", "urllib.Request"):
        print("FORBIDDEN", event, file=sys.stderr); os._exit(99)
    if event == "open" and isinstance(args[0], str) and {secret!r} in args[0]:
        print("FORBIDDEN open", args[0], file=sys.stderr); os._exit(99)
from crosscheck.cli import main
import pandas, openpyxl
sys.addaudithook(watch)
for argv in json.loads(sys.stdin.read()):
    sys.stderr.write("\\x1e%d\\x1e" % main(argv))
    sys.stdout.flush(), sys.stderr.flush()
"""


def guarded_each(argvs: list[list[str | Path]], secret: str = "secret") -> list[tuple[int, str]]:
    """Exit status and all that was printed of each command, in a process that may neither start others nor open the
    secret file."""
    code = GUARD.format(seconds=SECONDS, bytes=BYTES, secret=secret)
    got = subprocess.run(
        [sys.executable, "-c", code], input=json.dumps([list(map(str, a)) for a in argvs]).encode(), check=False,
        stdout=subprocess.PIPE, stderr=subprocess.STDOUT, timeout=10 * SECONDS,
        env=os.environ | {"OPENBLAS_NUM_THREADS": "1", "PYTHONUNBUFFERED": "1"},
    )  # fmt: skip
    said = got.stdout.decode(errors="replace")
    assert got.returncode == 0 and "Traceback" not in said and "FORBIDDEN" not in said, said[-2000:]
    parts = said.split("\x1e")
    assert len(parts) == 2 * len(argvs) + 1, said[-2000:]
    return [(int(status), text) for text, status in zip(parts[:-1:2], parts[1::2], strict=True)]


def guarded(*argv: str | Path, secret: str = "secret") -> tuple[int, str]:
    """The same of one command."""
    return guarded_each([list(argv)], secret)[0]


pytestmark = pytest.mark.skipif(os.name == "nt", reason="limits are set by the resource module")

FRAMES = {
    "lists nested deeply": 'title = "x"\nunits = "kN m"\nx = ' + "[" * 100_000 + "]" * 100_000,
    "tables nested deeply": 'units = "kN m"\n[' + ".".join("a" * 20_000) + "]\nx = 1\n",
    "inline tables nested deeply": "x = " + "{a = " * 20_000 + "1" + "}" * 20_000,
    "a number of a million digits": ONE_CASE.replace("uniform = 12", "uniform = " + "9" * 1_000_000),
    "a decimal of a million digits": ONE_CASE.replace("uniform = 12", "uniform = 0." + "3" * 1_000_000),
    "an exponent beyond any number": ONE_CASE.replace("uniform = 12", "uniform = 1e99999999999"),
    "a text of ten million letters": ONE_CASE.replace('"Portal"', '"' + "x" * 10_000_000 + '"'),
    "a unit of a million letters": ONE_CASE.replace('"210 GPa"', '"210 ' + "GPa " * 250_000 + '"'),
    "a number of many signs": ONE_CASE.replace('"210 GPa"', '"' + "-" * 200_000 + '210 GPa"'),
    "a power tower as a unit": ONE_CASE.replace('"210 GPa"', '"210 N/m^99999999999"'),
    "a formula": ONE_CASE.replace('"210 GPa"', '"=2**2**2**2**2**2 GPa"'),
    "arithmetic without end": ONE_CASE.replace('"210 GPa"', '"' + "(" * 50_000 + "1" + ")" * 50_000 + ' GPa"'),
    "a power beyond memory": ONE_CASE.replace('"210 GPa"', '"9**9**9**9 GPa"'),
    "code for a number": ONE_CASE.replace('"210 GPa"', "\"__import__('os').system('touch /tmp/secret')\""),
    "code for a name": ONE_CASE.replace('"B-C"', "\"{0.__class__.__mro__} ${HOME} `id` %s\""),
    "a grid of a billion bays": 'title = "x"\nunits = "kN m"\n[grid]\nbays = "1000000000 x 6"\nstoreys = "3"\n',
    "a grid of a billion storeys": 'title = "x"\nunits = "kN m"\n[grid]\nbays = "6"\nstoreys = "100000 x 3"\n',
    "a hundred load cases without load": ONE_CASE + "".join(f"[loads.l{k}]\n" for k in range(100)),
    "a factor beyond any number": ONE_CASE + "[combinations]\n" + "c = { dead = 1e308 }\n",
}
"""What a hostile frame file may hold: each is refused, or read and checked, within the limits."""


@pytest.mark.parametrize("name", FRAMES)
def test_a_hostile_frame_file_is_refused_or_read(name: str, tmp_path: Path) -> None:
    path = put(tmp_path, FRAMES[name])
    status, said = guarded("opinions", path, "-q")
    assert status in (0, 1, 2, 3), said[-2000:]
    assert len(said) < 100_000


ROW = "A-B\tA\t1.0\n"
CLAIMS = {
    "a line of ten million letters": "Member\tJoint\tM [kNm]\n" + "x" * 10_000_000 + "\n",
    "a line of ten million blanks": "Member\tJoint\tM [kNm]\nA-B" + " " * 10_000_000 + "A 1.0\n",
    "a line of a million numbers": "Member\tJoint\tM [kNm]\nA-B\tA\t" + "1.0 " * 1_000_000 + "\n",
    "a million columns": "\t".join(["Member", "Joint", *["M [kNm]"] * 1_000_000]) + "\n" + ROW,
    "a number of a million digits": f"Member\tJoint\tM [kNm]\nA-B\tA\t{'9' * 1_000_000}\n",
    "a million short lines": "Member\tJoint\tM [kNm]\n" + "-\n" * 1_000_000,
    "a million heads": "Member\tJoint\tM [kNm]\n" * 100_000,
    "a formula": "Member\tJoint\tM [kNm]\nA-B\tA\t=cmd|' /C calc'!A0\n" * 3,
    "an endless unit": "Member\tJoint\tM [" + "kN" * 500_000 + "]\n" + ROW,
    "nested brackets": "Member\tJoint\tM " + "(" * 300_000 + ")" * 300_000 + "\n" + ROW,
    "quotes without end": 'Member,Joint,M [kNm]\n"A-B,' + '"' * 999_999 + "\n",
    "sentences without end": "The moment at A is " + "about " * 500_000 + "12 kNm.\n",
    "digits and dashes": ("1-" * 500_000) + "\n" + "Member\tJoint\tM [kNm]\n" + ROW,
    "an include": "#include /etc/passwd\n!include secret\n@secret\nMember\tJoint\tM [kNm]\n" + ROW,
}


@pytest.mark.parametrize("name", CLAIMS)
def test_a_hostile_claim_is_refused_or_read(name: str, tmp_path: Path) -> None:
    frame = put(tmp_path, ONE_CASE)
    status, said = guarded("verify", frame, put(tmp_path, CLAIMS[name], "frame.claim.txt"), "-q")
    assert status in (1, 2, 3), said[-2000:]
    assert len(said) < 100_000


# --- spreadsheets

SHEET = '<?xml version="1.0"?>{dtd}<worksheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main">{head}<sheetData>{rows}</sheetData></worksheet>'  # noqa: E501
TYPES = """<?xml version="1.0"?><Types xmlns="http://schemas.openxmlformats.org/package/2006/content-types">
<Default Extension="rels" ContentType="application/vnd.openxmlformats-package.relationships+xml"/>
<Default Extension="xml" ContentType="application/xml"/>
<Override PartName="/xl/workbook.xml"
 ContentType="application/vnd.openxmlformats-officedocument.spreadsheetml.sheet.main+xml"/>
<Override PartName="/xl/worksheets/sheet1.xml"
 ContentType="application/vnd.openxmlformats-officedocument.spreadsheetml.worksheet+xml"/></Types>"""
ROOT = """<?xml version="1.0"?><Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships">
<Relationship Id="r1" Type="http://schemas.openxmlformats.org/officeDocument/2006/relationships/officeDocument"
 Target="xl/workbook.xml"/></Relationships>"""
BOOK = """<?xml version="1.0"?><workbook xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"
 xmlns:r="http://schemas.openxmlformats.org/officeDocument/2006/relationships"><sheets>
<sheet name="s" sheetId="1" r:id="r1"/></sheets></workbook>"""
BOOK_PARTS = """<?xml version="1.0"?><Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships">
<Relationship Id="r1" Type="http://schemas.openxmlformats.org/officeDocument/2006/relationships/worksheet"
 Target="worksheets/sheet1.xml"/></Relationships>"""
LAUGHS = "<!DOCTYPE z [<!ENTITY a \"aaaaaaaaaa\">" + "".join(
    f"<!ENTITY {chr(98 + k)} \"{f'&{chr(97 + k)};' * 10}\">" for k in range(9)
) + "]>"  # fmt: skip


def cell(place: str, text: str) -> str:
    return f'<c r="{place}" t="inlineStr"><is><t>{text}</t></is></c>'


def workbook(path: Path, rows: str, dtd: str = "", head: str = "") -> Path:
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as out:
        out.writestr("[Content_Types].xml", TYPES)
        out.writestr("_rels/.rels", ROOT)
        out.writestr("xl/workbook.xml", BOOK)
        out.writestr("xl/_rels/workbook.xml.rels", BOOK_PARTS)
        out.writestr("xl/worksheets/sheet1.xml", SHEET.format(dtd=dtd, head=head, rows=rows))
    return path


def test_a_plain_workbook_of_this_making_is_read(tmp_path: Path) -> None:
    """The bombs below differ from this one in their bombs alone."""
    heads = cell("A1", "Member") + cell("B1", "Joint") + cell("C1", "M [kNm]")
    rows = f'<row r="1">{heads}</row>'
    for k, (member, joint, moment) in enumerate([("A-B", "A", 17.475), ("A-B", "B", 37.814), ("B-C", "B", -37.814)], 2):
        rows += f'<row r="{k}">{cell(f"A{k}", member)}{cell(f"B{k}", joint)}<c r="C{k}"><v>{moment}</v></c></row>'
    status, said = guarded("verify", put(tmp_path, ONE_CASE), workbook(tmp_path / "frame.claim.xlsx", rows), "-q")
    assert status == 0, said


@pytest.mark.parametrize("what", ["one cell far out", "entities", "a file for an entity", "a stated size beyond any"])
def test_hostile_workbooks(what: str, tmp_path: Path) -> None:
    path, frame = tmp_path / "frame.claim.xlsx", put(tmp_path, ONE_CASE)
    secret = put(tmp_path, "A-B A 17.475", "secret.txt")
    first = f'<row r="1">{cell("A1", "Member")}</row>'
    if what == "one cell far out":
        workbook(path, first + f'<row r="1048576">{cell("XFD1048576", "x")}</row>')
    elif what == "entities":
        workbook(path, f'<row r="1">{cell("A1", "&j;")}</row>', dtd=LAUGHS)
    elif what == "a file for an entity":
        dtd = f'<!DOCTYPE z [<!ENTITY a SYSTEM "file://{secret}">]>'
        workbook(path, f'<row r="1">{cell("A1", "&a;")}</row>', dtd=dtd)
    else:
        workbook(path, first, head='<dimension ref="A1:XFD1048576"/>')
    status, said = guarded("verify", frame, path)
    assert status == 2 and "17.475" not in said, said


def test_a_packed_bomb_is_refused_before_it_is_unpacked(tmp_path: Path) -> None:
    path = tmp_path / "frame.claim.xlsx"
    with (
        zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED, compresslevel=1) as out,
        out.open("xl/worksheets/sheet1.xml", "w", force_zip64=True) as part,
    ):
        for _ in range(600):
            part.write(b" " * 1_000_000)
    assert path.stat().st_size < 5_000_000
    status, said = guarded("verify", put(tmp_path, ONE_CASE), path)
    assert status == 2 and "unpacked" in said


def test_a_sheet_of_repeated_rows(tmp_path: Path) -> None:
    """An open-document sheet may say that a row with values stands a billion times."""
    path = tmp_path / "frame.claim.ods"
    content = (
        '<table:table-row table:number-rows-repeated="1000000000"><table:table-cell><text:p>A-B</text:p>'
        "</table:table-cell></table:table-row>"
    )
    with zipfile.ZipFile(path, "w") as out:
        out.writestr("content.xml", content)
    status, said = guarded("verify", put(tmp_path, ONE_CASE), path)
    assert status == 2 and "repeated 1000000000 times" in said


def test_a_damaged_archive_is_no_traceback(tmp_path: Path) -> None:
    path = workbook(tmp_path / "frame.claim.xlsx", f'<row r="1">{cell("A1", "Member")}</row>')
    data = path.read_bytes()
    for cut in (10, len(data) // 2, len(data) - 30):
        path.write_bytes(data[:cut])
        got = call("verify", put(tmp_path, ONE_CASE), path)
        assert got.status == 2 and "cannot be read" in got.err


@pytest.mark.skipif(not Path("/dev/zero").exists(), reason="this system has no endless device")
def test_an_endless_device_is_no_claim_and_no_frame(tmp_path: Path) -> None:
    frame = put(tmp_path, ONE_CASE)
    started = time.process_time()
    assert guarded("verify", frame, "/dev/zero")[0] == 2
    assert guarded("opinions", "/dev/zero")[0] == 2
    assert time.process_time() - started < SECONDS


def test_claims_have_a_greatest_size(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    monkeypatch.setattr(sizes, "MOST_BYTES", 1000)
    frame = put(tmp_path, ONE_CASE)
    claim = put(tmp_path, "Member\tJoint\tM [kNm]\n" + "A-B\tA\t17.475\n" * 200, "frame.claim.txt")
    got = call("verify", frame, claim)
    assert got.status == 2 and "larger than" in got.err
    assert call("verify", frame, "-", stdin=claim.read_bytes()).status == 2


# --- no other file

TABLED = ONE_CASE.replace("[joints]\n", '[tables]\njoints = "{name}"\n[joints]\n')


NAMES = (
    "../secret.csv", "/etc/passwd", "..\\\\secret.csv", "C:/secret.csv", "sub/../../secret.csv", "//server/secret.csv",
    "~/secret.csv", "$HOME/secret.csv", "file:///etc/passwd", "secret.csv\\u0000.csv", "http://localhost/secret.csv",
)  # fmt: skip


@pytest.mark.parametrize("key", ["tables", "include"])
def test_named_files_are_plain_names(key: str, tmp_path: Path) -> None:
    """A table lies in the frame's folder or below it. An include may lie above, but is named .toml, from the folder."""
    folder = tmp_path / "set"
    folder.mkdir()
    put(tmp_path, "name,x,y\nX,1,1\n", "secret.csv")
    argvs: list[list[str | Path]] = []
    for k, name in enumerate(NAMES):
        text = TABLED.replace("{name}", name) if key == "tables" else f'include = ["{name}"]\n' + ONE_CASE
        argvs.append(["opinions", put(folder, text, f"frame{k}.toml"), "-q"])
    for name, (status, said) in zip(NAMES, guarded_each(argvs, secret=str(tmp_path / "secret.csv")), strict=True):
        assert status == 2 and said.count("crosscheck:") >= 1, (name, said)


@pytest.mark.parametrize("kind", ["tables", "include"])
def test_a_link_to_a_secret_shows_none_of_it(kind: str, tmp_path: Path) -> None:
    """A link beside the frame: a table's is not followed; an included file that is none of TOML shows nothing of itself."""
    folder = tmp_path / "set"
    folder.mkdir()
    inside = put(tmp_path, "hunter2 = is the password\n", "passwords.txt")
    name = "joints.csv" if kind == "tables" else "office.toml"
    (folder / name).symlink_to(inside)
    text = TABLED.replace("{name}", name) if kind == "tables" else f'include = ["{name}"]\n' + ONE_CASE
    got = call("opinions", put(folder, text))
    assert got.status == 2 and "hunter2" not in got.out + got.err and "password\n" not in got.err


def test_a_record_of_a_record_is_not_a_way_out(tmp_path: Path) -> None:
    """A link where the record will be is replaced, and what it leads to stays as it was."""
    outside = put(tmp_path, "precious\n", "outside.txt")
    folder = tmp_path / "set"
    folder.mkdir()
    frame = put(folder, ONE_CASE)
    (folder / "frame.record.toml").symlink_to(outside)
    call("record", frame, "--reason", "first")
    assert outside.read_text(encoding="utf-8") == "precious\n"


def test_reading_raises_nothing_but_unusable_input(tmp_path: Path) -> None:
    from crosscheck.frame.reader import read_frame_text

    for name in ("lists nested deeply", "code for a number", "an exponent beyond any number"):
        with pytest.raises(UnusableInput):
            read_frame_text(FRAMES[name])
