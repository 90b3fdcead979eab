"""Frames from CSV tables beside the file, and families of frames from one file: what is read, and every fault's place."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from crosscheck.cli import main
from crosscheck.frame.arithmetic import Amount, ArithmeticFault, evaluate
from crosscheck.frame.model import FREE, Frame, JointForce, Settlement, Spread
from crosscheck.frame.reader import read_frame, read_frame_text, sources, variants
from crosscheck.problems import UnusableInput
from crosscheck.suite.beside import Standard, standards
from tests.sheds import claim_text

PLAIN = """\
title = "Portal"
units = "kN m"

[materials.steel]
E = "210 GPa"

[sections.post]
I = "8360 cm^4"
A = "53.8 cm^2"

[joints]
A = [0, 0]
B = [0, 4.2]
C = [6, 4.2]
D = [6, 0]

[members]
"A-B" = { section = "post", material = "steel" }
"B-C" = { section = "post", material = "steel", hinge = "to", rigid_from = 0.2 }
right = { from = "C", to = "D", section = "post", material = "steel", spring_from = 4500.5 }

[supports]
A = "fixed"
D = { x = "held", y = "held", rotation = 1200.0 }

[loads.dead]
apply = [
  { member = "B-C", varying = [2.0, 3.5], direction = "down", start = "10%" },
  { joint = "D", settlement = { y = -0.01 } },
]

[loads.wind]
apply = [{ joint = "B", force = 1.2, direction = "right" }]
"""
HEAD = PLAIN[: PLAIN.index("[joints]")]
TABLED = HEAD + """
[tables]
joints = "tables/joints.csv"
members = ["members.csv", "more.csv"]
supports = "supports.csv"
loads = "loads.csv"
"""
FILES = {
    "tables/joints.csv": "\ufeffname,x (mm),y (m)\r\n# ground\r\nA,0,0\r\nB,0,4.2\r\n\r\nC,6000,4.2\r\nD,6 m,0\r\n",
    "members.csv": "name;from;to;section;material;hinge;rigid_from (mm)\n;A;B;post;steel;;\n;B;C;post;steel;to;200,0\n",
    "more.csv": "name\tfrom\tto\tsection\tmaterial\tspring_from (kN m/rad)\nright\tC\tD\tpost\tsteel\t4500.5\n",
    "supports.csv": "joint,support,x,y,rotation (kN m/rad)\nA,fixed,,,\nD,,held,held,1200\n",
    "loads.csv": "case,member,joint,varying.start (N/mm),varying.end (kN/m),direction,start (%),settlement.y (mm),"
                 "force (N)\n"
                 "dead,B-C,,2,3.5,down,10,,\ndead,,D,,,,,-10,\nwind,,B,,,right,,,1200\n",
}  # fmt: skip


def write(folder: Path, text: str = TABLED, **changed: str) -> Path:
    for name, content in {**FILES, **changed}.items():
        path = folder / name
        path.parent.mkdir(exist_ok=True)
        path.write_text(content, encoding="utf-8", newline="")
    frame = folder / "portal.toml"
    frame.write_text(text, encoding="utf-8")
    return frame


def same(a: Frame, b: Frame) -> bool:
    return all(getattr(a, key) == getattr(b, key) for key in ("joints", "members", "supports", "cases", "analysis"))


def faults(path: Path, variant: str = "") -> list[str]:
    with pytest.raises(UnusableInput) as caught:
        read_frame(path, variant)
    assert all(p.line or p.key == "" for p in caught.value.problems)
    return [f"{Path(p.file).name}:{p.line}: {p.key}: {p.says}" for p in caught.value.problems]


# --- tables


def test_tables_give_the_frame_that_could_have_been_written_out(tmp_path: Path) -> None:
    tabled, plain = read_frame(write(tmp_path)), read_frame_text(PLAIN)
    assert same(tabled, plain)
    # The comparison can fail: a load of each sort is there.
    assert [type(load) for case in tabled.cases.values() for load in case.loads] == [Spread, Settlement, JointForce]
    assert tabled.members["B-C"].turn_to == FREE


def test_tables_add_to_what_the_file_states(tmp_path: Path) -> None:
    extra = '\n[loads.dead]\napply = [{ joint = "B", couple = 3.0 }]\n\n[joints]\nE = [9, 9]\n'
    frame = read_frame(write(tmp_path, TABLED + extra))
    assert [load.entry for load in frame.cases["dead"].loads] == [0, 1, 2]
    assert list(frame.joints) == ["E", "A", "B", "C", "D"]


@pytest.mark.parametrize(
    ("name", "old", "new", "fault"),
    [
        ("tables/joints.csv", "y (m)", "y (furlong)", "joints.csv:1: tables.joints: the head"),
        ("tables/joints.csv", "y (m)", "z (m)", "joints.csv:1: tables.joints: there is no use for a column"),
        ("tables/joints.csv", ",y (m)", "", 'joints.csv:1: tables.joints: the column "y" is missing'),
        ("tables/joints.csv", "name,x (mm)", "name,y (mm)", 'joints.csv:1: tables.joints: two columns "y"'),
        ("tables/joints.csv", "B,0,4.2", "B,0,4.2,7", "joints.csv:4: tables.joints: 4 cells below 3 heads"),
        ("tables/joints.csv", "B,0,4.2", "A,0,4.2", 'joints.csv:4: joints.A: "A" stands in'),
        ("tables/joints.csv", "C,6000", "C,6 kN", 'joints.csv:6: joints.C: "6 kN" is a force'),
        ("tables/joints.csv", "C,6000", "C,", 'joints.csv:6: joints.C: "" does not begin with a number'),
        ("tables/joints.csv", "D,6 m", '"D,6 m', "joints.csv:7: tables.joints: not a CSV row"),
        ("members.csv", "A;B;post", "A;B;pots", 'members.csv:2: members.A-B.section: there is no section "pots"'),
        ("more.csv", "C\tD", "C\tQ", 'more.csv:2: members.right.to: there is no joint "Q"'),
        ("loads.csv", "down", "dwon", "loads.csv:2: loads.dead.apply[0].direction"),
        ("loads.csv", "1200", "", "loads.csv:4: loads.wind.apply[0]: the entry holds no load"),
        ("supports.csv", "fixed", "fxed", 'supports.csv:2: supports.A: "fxed" is none of'),
    ],
)
def test_a_fault_is_named_at_its_file_and_line(tmp_path: Path, name: str, old: str, new: str, fault: str) -> None:
    assert old in FILES[name]
    found = faults(write(tmp_path, **{name: FILES[name].replace(old, new, 1)}))
    assert any(line.startswith(fault) for line in found), found


OUTSIDE = ["../joints.csv", "/etc/passwd", "C:/joints.csv", "tables\\\\joints.csv", "a/../../x.csv", ""]


@pytest.mark.parametrize("name", OUTSIDE)
def test_tables_stay_in_the_folder(tmp_path: Path, name: str) -> None:
    folder = tmp_path / "set"
    folder.mkdir()
    (tmp_path / "joints.csv").write_text(FILES["tables/joints.csv"], encoding="utf-8")
    (found,) = [f for f in faults(write(folder, TABLED.replace("tables/joints.csv", name))) if "tables.joints" in f]
    assert "is not in the frame's folder" in found


def test_a_link_out_of_the_folder_is_not_followed(tmp_path: Path) -> None:
    folder = tmp_path / "set"
    folder.mkdir()
    path = write(folder)
    outside = tmp_path / "joints.csv"
    outside.write_text(FILES["tables/joints.csv"], encoding="utf-8")
    (folder / "tables" / "joints.csv").unlink()
    try:
        (folder / "tables" / "joints.csv").symlink_to(outside)
    except OSError:
        pytest.skip("this system makes no links here")
    assert any("is not in the frame's folder" in f for f in faults(path))


def test_missing_and_undecodable_tables(tmp_path: Path) -> None:
    path = write(tmp_path)
    (tmp_path / "more.csv").unlink()
    (tmp_path / "loads.csv").write_bytes(b"case,joint\n\xff\xfe,B\n")
    (tmp_path / "supports.csv").write_text("\n", encoding="utf-8")
    found = faults(path)
    assert [any(words in f for f in found) for words in ("cannot be read", "is not UTF-8", "is empty")] == [True] * 3
    with pytest.raises(UnusableInput, match="no folder for tables"):
        read_frame_text(TABLED)


def test_the_checksum_covers_tables_and_is_blind_to_line_ends(tmp_path: Path) -> None:
    path = write(tmp_path)
    first = read_frame(path)
    path.write_bytes(path.read_bytes().replace(b"\n", b"\r\n"))
    write_again = read_frame(path)
    assert write_again.content == first.content
    assert write_again.sha256 != first.sha256
    table = tmp_path / "loads.csv"
    table.write_text(FILES["loads.csv"].replace("1200", "1201"), encoding="utf-8")
    assert read_frame(path).content != first.content
    assert {p.name for p in sources(path)} == {"portal.toml", "joints.csv", *(k for k in FILES if "/" not in k)}


# --- families

FAMILY = PLAIN.replace('units = "kN m"', """units = "kN m"

[family]
span = "6 to 12 m by 2"
pitch = [10, 15]
rise = "{span / 2 * tan(pitch)}"
load = "8.5 kN/m"
""").replace("[6, 4.2]", '["{span}", "{rise + span / 2 * 0}"]').replace("[6, 0]", '["{span}", 0]').replace(
    "[2.0, 3.5]", '["{load}", "{load / 2}"]')  # fmt: skip


def write_family(folder: Path, text: str = FAMILY) -> Path:
    path = folder / "portal.toml"
    path.write_text(text, encoding="utf-8")
    return path


def test_a_family_is_every_combination_of_its_parameters(tmp_path: Path) -> None:
    path = write_family(tmp_path)
    names = variants(path)
    assert names == tuple(f"span-{s}m-pitch-{p}" for s in (6, 8, 10, 12) for p in (10, 15))
    frame = read_frame(path, "span-8m-pitch-15")
    assert frame.title == "Portal (span-8m-pitch-15)"
    assert (frame.joints["C"].x, frame.joints["D"].x) == (8.0, 8.0)
    assert frame.joints["C"].y == pytest.approx(4.0 * 0.2679491924311227, rel=1e-12)
    spread = frame.cases["dead"].loads[0]
    assert isinstance(spread, Spread)
    assert (spread.first, spread.last) == (8.5, 4.25)


def test_a_name_may_be_stated(tmp_path: Path) -> None:
    text = FAMILY.replace("pitch = [10, 15]", 'pitch = [10, 15]\nname = "Span {span}, pitch {pitch}"')
    path = write_family(tmp_path, text.replace('load = "8.5', 'eaves = "4.2 m"\nridge = "{eaves + rise}"\nload = "8.5'))
    assert variants(path)[0] == "Span-6m-pitch-10"


def test_rows_of_a_table_make_a_family(tmp_path: Path) -> None:
    text = FAMILY.replace('span = "6 to 12 m by 2"\npitch = [10, 15]', 'rows = "sizes.csv"')
    path = write_family(tmp_path, text)
    (tmp_path / "sizes.csv").write_text("name,span (m),pitch\nsmall,6,10\nwide,12.5,5\n", encoding="utf-8")
    assert variants(path) == ("small", "wide")
    assert read_frame(path, "wide").joints["D"].x == 12.5
    assert {p.name for p in sources(path)} == {"portal.toml", "sizes.csv"}


def test_placeholders_in_tables_take_the_unit_of_their_column(tmp_path: Path) -> None:
    family = '\n[family]\nspan = ["6 m", "8 m"]\nheight = 4200\n'
    joints = FILES["tables/joints.csv"].replace("C,6000,4.2", "C,{span},4.2").replace("B,0,4.2", "B,{height - 200},4.2")
    frame = read_frame(write(tmp_path, TABLED + family, **{"tables/joints.csv": joints}), "span-8m")
    assert (frame.joints["C"].x, frame.joints["B"].x) == (8.0, 4.0)


@pytest.mark.parametrize(
    ("old", "new", "fault"),
    [
        ("by 2", "by 0", "family.span: "), ("by 2", "by 20 mm", "mixes m and mm"), ("12 m", "12 q", '"q" is not a unit'),
        ("by 2", "by 0.001", "makes 12,002 frames"), ("[10, 15]", "[10, 10]", "names more than one frame"),
        ("[10, 15]", "[]", "makes 0 frames"), ("pitch =", "tan =", '"tan" is no name for a parameter'),
        ("{span / 2 *", "{spam / 2 *", "no parameter spam"), ("{span / 2 *", "{span / 0 *", "divides by zero"),
        ("{load / 2}", "{load / 2", "a single brace"), ("{load / 2}", "{load + span}", "m beside kN/m"),
        ("{load / 2}", "{load / span}", "kN/m divided by m"), ("{load / 2}", "{load.unit}", "only + - * /"),
        ("{load / 2}", "{9 ** 9 ** 9}", "too large"), ("{load / 2}", "{(-8) ** 0.5}", "no real value"),
        ("{load / 2}", "{__import__('os')}", "only + - * /"), ("{load / 2}", "{span} m", '"6 m m" is'),
    ],
)  # fmt: skip
def test_faults_of_a_family(tmp_path: Path, old: str, new: str, fault: str) -> None:
    assert old in FAMILY
    found = faults(write_family(tmp_path, FAMILY.replace(old, new)), "span-6m-pitch-10")
    assert any(fault in line for line in found), found


def test_arithmetic_carries_units_and_runs_nothing() -> None:
    known: dict[str, Amount | str] = {"span": Amount(6.0, "m"), "n": Amount(3.0), "kind": "deep"}
    assert evaluate("max(span, 2 * span / n) - span / 4", known) == Amount(4.5, "m")
    assert evaluate("-sqrt(n * 3) + abs(-n) ** 2 + span / span", known) == Amount(7.0)
    assert evaluate("sin(30) + cos(60)", known) == Amount(1.0)
    assert evaluate("kind", known) == "deep"
    for text in ("kind + 1", "lambda: 1", "[1]", "True", "span ** 2", "'a'", "n if n else 1", "sin(1, 2)", "1" * 300, "()"):
        with pytest.raises(ArithmeticFault):
            evaluate(text, known)


def test_commands_on_a_family(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = write_family(tmp_path, FAMILY.replace("6 to 12 m by 2", "6 to 8 m by 2"))
    assert main(["opinions", str(path)]) == 2
    assert "choose one with --variant: span-6m-pitch-10" in capsys.readouterr().err
    assert main(["opinions", str(path), "--variant", "span-6m-pitch-1"]) == 2
    assert 'did you mean "span-6m-pitch-1' in capsys.readouterr().err
    assert main(["opinions", str(path), "--variant", "span-8m-pitch-10"]) == 0
    capsys.readouterr()
    assert main(["record", str(tmp_path), "--reason", "first issue"]) == 0
    assert len(list(tmp_path.glob("portal.span-*.record.toml"))) == 4
    claim = tmp_path / "portal.span-6m-pitch-15.claim.txt"
    claim.write_text(claim_text(path, variant="span-6m-pitch-15"), encoding="utf-8")
    capsys.readouterr()
    assert main(["regress", str(tmp_path), "--json", "-"]) == 0
    frames = json.loads(capsys.readouterr().out)["frames"]
    assert [(Path(f["file"]).name, f["variant"], len(f["claims"])) for f in frames] == [
        ("portal.toml", f"span-{s}m-pitch-{p}", int((s, p) == (6, 15))) for s in (6, 8) for p in (10, 15)
    ]
    # Another span more leaves the others' records as they are; the new one is not on record yet.
    path.write_text(path.read_text(encoding="utf-8").replace("6 to 8 m", "6 to 10 m"), encoding="utf-8")
    assert main(["regress", str(tmp_path), "--json", "-"]) == 1
    verdicts = [f["verdict"] for f in json.loads(capsys.readouterr().out)["frames"]]
    assert verdicts == ["held"] * 4 + ["never on record"] * 2
    assert main(["regress", str(tmp_path), "--only", "span-8m"]) == 0


def test_claims_belong_to_the_variant_with_the_longest_name(tmp_path: Path) -> None:
    path = write_family(tmp_path, FAMILY.replace('"6 to 12 m by 2"', '["6", "6.5"]').replace("[10, 15]", "10").replace(
        'rise = "{span / 2 * tan(pitch)}"', 'rise = 1'))  # fmt: skip
    (tmp_path / "portal.span-6.5.claim.txt").write_text("", encoding="utf-8")
    (tmp_path / "portal.span-6.other.claim.csv").write_text("", encoding="utf-8")
    claims = {s.variant: [c.name for c in s.claims()] for s in standards(path)}
    assert claims == {"span-6": ["portal.span-6.other.claim.csv"], "span-6.5": ["portal.span-6.5.claim.txt"]}
    assert Standard(path, "span-6").claim_name(Path("portal.span-6.other.claim.csv")) == "other"
