"""Claims: what is read from a paste, how its open choices are closed, and what is refused or left undecided."""

from __future__ import annotations

from pathlib import Path

import pytest

from crosscheck.claims import FrameNames, ReadingOptions, read_claim, show_reading
from crosscheck.claims.decode import decode
from crosscheck.claims.names import Names
from crosscheck.claims.numbers import commas_are_decimal, parse_number
from crosscheck.claims.words import head_of
from crosscheck.problems import UnusableInput
from tests.claim_frame import Known, bent

# --- numbers


@pytest.mark.parametrize(
    ("text", "comma", "value", "half"),
    [
        ("12.30", False, 12.3, 0.005), ("-4", False, -4, 0.5), ("\u22124,5", True, -4.5, 0.05), ("(12.3)", False,
        -12.3, 0.05),
        ("1,234.5", False, 1234.5, 0.05), ("1.234,5", True, 1234.5, 0.05), ("12.3-", False, -12.3, 0.05),
        ("1'234.5", False, 1234.5, 0.05), ("1\u202f234.5", False, 1234.5, 0.05), ("1.25E+03", False, 1250, 5),
        ("1.2\u00d710^3", False, 1200, 50), ("+0.5", False, 0.5, 0.05), ("7.5 kN", False, 7.5, 0.05), ("2d-3", False,
        0.002, 5e-4),
    ],
)  # fmt: skip
def test_numbers(text: str, comma: bool, value: float, half: float) -> None:
    read = parse_number(text, comma)
    assert read is not None
    assert read.value == pytest.approx(value)
    assert read.half == pytest.approx(half)


@pytest.mark.parametrize("text", ["", "-", "A", "1.2.3", "12,34,5.6", "2024-05-01", "1,2,3", "--5", "1e999", "nan", "inf"])
def test_not_numbers(text: str) -> None:
    assert parse_number(text) is None


@pytest.mark.parametrize(
    ("texts", "decimal"),
    [(["12,3"], True), (["1,234.5"], False), (["1.234,5"], True), (["0,125"], True), (["1,234,567"], False),
     (["12,345", "7"], False), (["12,345", "6,789"], None), (["5"], False)],
)  # fmt: skip
def test_what_a_comma_means(texts: list[str], decimal: bool | None) -> None:
    assert commas_are_decimal([texts]) is decimal


def test_whole_numbers_tell_of_their_own_column_alone() -> None:
    """Moments without decimals beside forces with three: the forces' comma is not that of thousands."""
    assert commas_are_decimal([["5,468", "-5,837"], ["275", "1018"]]) is None
    assert commas_are_decimal([["5,468", "-5,837"], ["0,275"]]) is True
    k = bent()
    text = "Load case: dead\n" + k.reactions("dead").replace(".", ",")
    rows = [";".join([*r.split("\t")[:3], str(round(float(r.split("\t")[3].replace(",",
    ".")) * 100))]) if r[:2] in ("A\t", "D\t", "F\t")
            else r.replace("\t", ";").replace("kNm", "kN cm") for r in text.splitlines()]  # fmt: skip
    verdict, closed, cases = k.judge("\n".join(rows))
    assert (verdict, cases[0].compared) == ("agree", 9), closed


# --- heads and names


@pytest.mark.parametrize(
    ("text", "noun", "axis", "end", "which", "unit"),
    [
        ("Axial force N (kN)", "N", "", None, "", "kN"), ("Moment, kNm", "M", "", None, "", "kNm"), ("M_i", "M", "",
        0, "", None),
        ("max M [kN m]", "M", "", None, "max", "kN m"), ("\u03b8z", "T", "z", None, "", None), ("Start node", "joint",
        "", 0, "", None),
        ("Load case", "case", "", None, "", None), ("L/C", "case", "", None, "", None), ("Fx kN", "F", "x", None, "", "kN"),
        ("Shear force end", "V", "", 1, "", None), ("Dist. (mm)", "station", "", None, "", "mm"), ("Colour", "", "",
        None, "", None),
        ("phi_z (mrad)", "T", "z", None, "", "mrad"), ("Horizontal", "x", "x", None, "", None), ("Nmin", "N", "",
        None, "min", None),
    ],
)  # fmt: skip
def test_heads(text: str, noun: str, axis: str, end: int | None, which: str, unit: str | None) -> None:
    head = head_of(text)
    assert (head.noun, head.axis, head.end, head.which, head.unit.text if head.unit else None) == (
        noun,
        axis,
        end,
        which,
        unit,
    )


@pytest.mark.parametrize(
    ("text", "name", "run"),
    [("A-B", "A-B", 1), ("a - b", "A-B", 1), ("B-A", "A-B", -1), ("Member A-B", "A-B", 1), ("B\u2013C", "rafter", 1),
    ("AB", "A-B", 1),
     ("C to B", "rafter", -1), ("RAFTER", "rafter", 0), ("Beam: rafter", "rafter", 0), ("A-C", None, 0), ("nonsense",
     None, 0)],
)  # fmt: skip
def test_member_names(text: str, name: str | None, run: int) -> None:
    hit = Names(FrameNames.of(bent().frame)).member(text)
    assert (hit.name if hit else None, hit.run if hit else 0) == (name, run)


def test_numbers_are_never_run_together() -> None:
    """Between "1-2" and "12" no forgiveness may stand."""
    names = FrameNames(members={"1": ("1", "2"), "12": ("4", "5")}, xy=dict.fromkeys("1245", (0, 0)), cases=("dead",))
    assert Names(names).member("1 - 2") is not None
    assert Names(names).member("1 - 2").name == "1"  # type: ignore[union-attr]
    assert Names(names).member("Member 12").name == "12"  # type: ignore[union-attr]


# --- right claims in many dresses


def whole(k: Known, case: str = "dead", sep: str = "\t", **turned: float) -> str:
    return f"Load case: {case}\n" + k.ends(case, sep=sep, **turned) + "\n" + k.reactions(case,
    sep=sep) + "\n" + k.displacements(case, sep=sep)  # fmt: skip


@pytest.mark.parametrize("sep", ["\t", ";", ",", "   ", " | "])
def test_separators(sep: str) -> None:
    k = bent()
    verdict, closed, cases = k.judge(whole(k, sep=sep))
    assert (verdict, cases[0].compared) == ("agree", 6 * 5 + 3 * 3 + 3 * 6), closed.undecided


@pytest.mark.parametrize(
    ("turned", "quantity", "words"),
    [({"moment": -1.0}, "moment", "anticlockwise"), ({"axial": -1.0}, "axial", "compression"), ({"shear": -1.0},
    "shear", "against")],
)  # fmt: skip
def test_one_quantity_reversed_is_a_convention(turned: dict[str, float], quantity: str, words: str) -> None:
    k = bent()
    verdict, closed, _ = k.judge(f"Load case: dead\n{k.ends('dead', **turned)}")
    assert verdict == "agree"
    assert words in closed.signs[quantity]


def test_everything_reversed_is_a_reversed_load() -> None:
    k = bent()
    text = "Load case: dead\n" + k.ends("dead", moment=-1, axial=-1, shear=-1)
    text += "\n" + k.reactions("dead", sign=-1) + "\n" + k.displacements("dead", sign=-1)
    verdict, closed, cases = k.judge(text)
    assert verdict == "disagree"
    assert closed.reversed_load
    assert cases[0].differences, "the values are shown as they stand, not turned to fit"


def test_everything_reversed_with_the_signs_stated_is_no_reversed_load() -> None:
    k = bent()
    signs = {"moment": "anticlockwise", "axial": "compression", "shear": "reversed action", "reactions": "on the support",
             "fx": "right", "fy": "up", "dx": "left", "dy": "down", "rotation": "anticlockwise"}  # fmt: skip
    text = "Load case: dead\n" + k.ends("dead", moment=-1, axial=-1, shear=-1)
    text += "\n" + k.reactions("dead", sign=-1) + "\n" + k.displacements("dead", sign=-1)
    verdict, closed, _ = k.judge(text, signs=signs)
    assert (verdict, closed.reversed_load) == ("agree", False), closed.undecided


def test_one_member_with_another_sign_is_a_finding() -> None:
    k = bent()
    rows = k.ends("dead").splitlines()
    turned = [r.replace(r.split("\t")[-1], str(-float(r.split("\t")[-1]))) if r.startswith("rafter") else r for r in rows]
    verdict, _, cases = k.judge("Load case: dead\n" + "\n".join(turned))
    assert verdict == "disagree"
    assert {d.place.member for d in cases[0].differences} == {"rafter"}
    assert {d.place.quantity for d in cases[0].differences} == {"moment"}


def test_a_stated_sign_is_not_fitted_away() -> None:
    k = bent()
    verdict, _, _ = k.judge("Load case: dead\nMoments: clockwise positive\n" + k.ends("dead", moment=-1))
    assert verdict == "disagree"


def test_a_stated_unit_is_not_fitted_away() -> None:
    k = bent()
    verdict, _, _ = k.judge("Load case: dead\n" + k.ends("dead", heads="Member,End,N [kN],V [kN],M [kN mm]"))
    assert verdict == "disagree"


def test_units_by_option_and_by_fit() -> None:
    k = bent()
    bare = "Load case: dead\n" + k.ends("dead", moment=1000, heads="Member,End,N,V,M")
    verdict, closed, _ = k.judge(bare)
    assert (verdict, closed.units["moment"]) == ("agree", "kN mm (by fit)")
    assert k.judge(bare, units="force kN, moment kN mm")[0] == "agree"
    assert k.judge(bare, units="kN m")[0] == "disagree"


def test_a_claim_of_two_values_without_signs_is_undecided() -> None:
    k = bent()
    m = k.answer.cases["dead"].ends[0, :, 2]
    text = f"Load case: dead\nMember\tEnd\tM [kNm]\nA-B\tA\t{-m[0]:.3f}\nA-B\tB\t{-m[1]:.3f}\n"
    verdict, closed, _ = k.judge(text)
    assert verdict == "undecided"
    assert any("state it" in why for why in closed.undecided)
    assert k.judge(text, signs={"moment": "anticlockwise"})[0] == "agree"


# --- cases


def test_a_case_that_is_not_named() -> None:
    k = bent()
    verdict, closed, _ = k.judge(k.ends("wind"))
    assert (verdict, closed.cases) == ("agree", ("wind",))
    assert any('"wind" is the only one' in note for note in closed.notes)
    assert k.judge(k.ends("wind"), case="dead")[0] == "disagree"
    wrong = k.ends("wind", moment=1.5)
    verdict, closed, _ = k.judge(wrong)
    assert verdict == "undecided"
    assert "--case" in closed.undecided[0]


def test_several_cases_by_column() -> None:
    k = bent()
    rows = ["Case\tMember\tEnd\tN\tV\tM"]
    for case in ("dead", "wind"):
        rows += [f"{case}\t{r}" for r in k.ends(case).splitlines()[1:]]
    verdict, closed, cases = k.judge("\n".join(rows))
    assert (verdict, closed.cases, [c.compared for c in cases]) == ("agree", ("dead", "wind"), [30, 30])


def test_an_unknown_case_is_undecided_with_the_choice() -> None:
    k = bent()
    verdict, closed, _ = k.judge("Load case: snow\n" + k.ends("dead"))
    assert verdict == "undecided"
    assert any('"snow"' in why and "--case" in why for why in closed.undecided)


# --- what cannot be read surely enough, or not at all

UNDECIDED = {
    "no ends": "Load case: dead\nMember\tN\tV\tM\nA-B\t1\t2\t3\nrafter\t4\t5\t6\nD-C\t1\t2\t3\n",
    "no heads": "Load case: dead\nA-B\t1.2\t3.4\t5.6\trather\t7.8\nrafter\t1.2\t3.4\t5.6\trather\t7.8\n",
    "heads without meaning": "Load case: dead\nAlpha\tBeta\tM\nA-B\t1\t2\nrafter\t3\t4\n",
    "results of nothing": "Load case: dead\nN\tV\tM\n1\t2\t3\n4\t5\t6\n",
    "unknown members": "Load case: dead\nMember\tEnd\tM\nX-Y\tX\t3.0\nX-Y\tY\t4.0\n",
    "unknown joints": "Load case: dead\nJoint\tFx\tFy\nX\t3.0\t4\nY\t4.0\t4\n",
    "two shears": "Load case: dead\nMember\tEnd\tVy\tVz\nA-B\tA\t2\t3\nA-B\tB\t2\t3\n",
    "joint that is no end": "Load case: dead\nMember\tEnd\tM\nA-B\tF\t3.0\nrafter\tF\t4.0\n",
    "a quantity without its unit's kind": "Load case: dead\nMember\tEnd\tM [mm]\nA-B\tA\t3\nA-B\tB\t4\n",
    "nothing but dashes": "Load case: dead\nMember\tEnd\tM [kNm]\nX\tA\t3\nA-B\tA\t-\nA-B\tB\t-\n",
}  # fmt: skip


@pytest.mark.parametrize("name", UNDECIDED)
def test_not_understood_is_undecided_and_says_why(name: str) -> None:
    verdict, closed, _ = bent().judge(UNDECIDED[name])
    assert verdict == "undecided"
    assert closed.undecided or closed.foreign or closed.not_understood


REFUSED = {
    "empty": (b"", "no results"),
    "blank lines": (b"\n\n  \n", "no results"),
    "prose": (b"Please find the results attached.\nRegards\n", "no results"),
    "binary": (b"\x7fELF\x02\x01\x01\x00\x00\x00\x00\x00\x00\x00\x00\x00\x03\x00>\x00\x01\x00", "not text"),
    "broken UTF-16": ("Member".encode("utf-16") + b"\x00", "breaks off"),
    "heads alone": (b"Member\tEnd\tN\tV\tM\n", "no results"),
    "not a spreadsheet": (b"PK\x03\x04rubbish", "spreadsheet cannot be read"),
}  # fmt: skip


@pytest.mark.parametrize("name", REFUSED)
def test_refused(name: str, tmp_path: Path) -> None:
    data, words = REFUSED[name]
    path = tmp_path / ("claim.xlsx" if "spreadsheet" in name else "claim.txt")
    path.write_bytes(data)
    with pytest.raises(UnusableInput) as caught:
        read_claim(path, FrameNames.of(bent().frame), ReadingOptions())
    assert words in str(caught.value)
    assert str(path) in str(caught.value)


def test_missing_file_and_folder(tmp_path: Path) -> None:
    for path in (tmp_path / "none.txt", tmp_path):
        with pytest.raises(UnusableInput, match="cannot be opened"):
            read_claim(path, FrameNames.of(bent().frame), ReadingOptions())


# --- encodings and spreadsheets


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "utf-16-le", "utf-16-be", "latin-1", "cp1252"])
def test_encodings(encoding: str) -> None:
    text = "Läge: dead\r\n10,5 °\r\n" if "16" not in encoding else "Member\tEnd\tN\r\nA-B\tA\t10,5\r\n"
    assert decode(text.encode(encoding)) == text


def test_spreadsheet(tmp_path: Path) -> None:
    import pandas as pd

    k = bent()
    rows = [line.split("\t") for line in k.ends("dead", digits=6).splitlines()]
    table = [rows[0], *[[m, j, float(a), float(b), float(c)] for m, j, a, b, c in rows[1:]]]
    path = tmp_path / "results.xlsx"
    pd.DataFrame(table).to_excel(path, header=False, index=False, sheet_name="dead")
    reading = read_claim(path, FrameNames.of(k.frame), ReadingOptions())
    assert len(reading.entries) == 30
    assert {e.case for e in reading.entries} == {"dead"}
    with pytest.raises(UnusableInput, match="no sheet"):
        read_claim(path, FrameNames.of(k.frame), ReadingOptions(sheet="live"))


# --- rows, trace, values in words


def test_foreign_rows_prevent_agreement() -> None:
    k = bent()
    verdict, closed, _ = k.judge("Load case: dead\n" + k.ends("dead") + "G-H\tG\t1.0\t2.0\t3.0\n")
    assert verdict == "undecided"
    assert closed.foreign[0][0] == 13


def test_a_value_that_is_no_number_is_noted() -> None:
    k = bent()
    rows = k.ends("dead").splitlines()
    rows[3] = "\t".join([*rows[3].split("\t")[:4], "see note"])
    _, closed, cases = k.judge("Load case: dead\n" + "\n".join(rows))
    assert cases[0].compared == 29
    assert closed.not_understood[0][0] == 5
    assert "not a number" in closed.not_understood[0][2]


def test_half_digits_are_carried_through_the_unit_change() -> None:
    k = bent()
    closed = k.close("Load case: dead\n" + k.ends("dead", digits=1, moment=100, heads="Member,End,N [kN],V [kN],M [kN cm]"))
    halves = {v.quantity: v.half_digit for v in closed.values}
    assert halves == {"axial": pytest.approx(0.05), "shear": pytest.approx(0.05), "moment": pytest.approx(0.0005)}


@pytest.mark.parametrize(
    ("text", "verdict"),
    [("rafter max {m:.1f} kNm, sway {s:.2f} mm", "agree"), ("rafter max {wrong:.1f} kNm", "disagree"),
     ("The peak moment in the rafter is {m:.1f} kNm and the frame sways {s:.2f} mm", "agree"),
     ("reaction at A {up:.1f} kN up", "agree"), ("reaction at A {up:.1f} kN down", "disagree")],
)  # fmt: skip
def test_values_in_words(text: str, verdict: str) -> None:
    k = bent()
    c = k.answer.cases["dead"]
    largest = max(abs(v.value) for v in [*k.close(f"Load case: dead\n{k.ends('dead')}").values]
                  if v.member == "rafter" and v.quantity == "moment")  # fmt: skip
    sway = max(abs(c.joints[:, 0])) * 1e3
    said = text.format(m=largest, wrong=1.3 * largest, s=sway, up=c.reactions[0, 1])
    found, closed, cases = k.judge(f"{said}\n", case="dead")
    assert found == verdict, closed
    assert cases[0].of > cases[0].compared


def test_a_value_that_is_not_understood_is_refused() -> None:
    with pytest.raises(UnusableInput, match="not understood"):
        bent().read("", values=("lovely weather",))


def test_show_reading_names_every_column_and_line() -> None:
    k = bent()
    shown = "\n".join(show_reading(k.read("Load case: dead\n" + k.ends("dead"))))
    assert "member ends, case dead, 10 rows" in shown
    assert "M [kNm]: moment in kNm" in shown
    assert "2  head" in shown


# --- the reading file


def test_a_reading_file_states_what_the_paste_does_not(tmp_path: Path) -> None:
    k = bent()
    path = tmp_path / "office.toml"
    path.write_text('[members]\n"1" = "A-B"\n"2" = "rafter"\n"3" = "D-C"\n"4" = "C-E"\n"5" = "E-F"\n'
                    '[cases]\n"LC7" = "dead"\n'
                    '[signs]\nmoment = "anticlockwise"\n', encoding="utf-8")  # fmt: skip
    text = "LC7\n" + k.ends("dead", moment=-1)
    for number, name in enumerate(("A-B", "rafter", "D-C", "C-E", "E-F"), 1):
        text = text.replace(f"\n{name}\t", f"\n{number}\t")
    assert k.judge(text, file=path)[0] == "agree"


@pytest.mark.parametrize(
    ("text", "words"),
    [("units = 3", "units are text"), ("[signs]\nmoment = 'upwards'", "is no convention"), ("colums = []", "no such key"),
     ("[members]\n'1' = 'Q-R'", 'no member "Q-R"'), ("= 3", "not TOML"), ("face = 1", "true or false"),
     ("columns = ['member', 'tea']", "no column of results"), ("units = 'stone'", "neither a unit"),
     ("[signs]\ntorsion = 'left'", "no such quantity"), ("[joints]\n'1' = 7", "a name is text")],
)  # fmt: skip
def test_a_wrong_reading_file_is_refused(text: str, words: str, tmp_path: Path) -> None:
    path = tmp_path / "office.toml"
    path.write_text(text, encoding="utf-8")
    with pytest.raises(UnusableInput) as caught:
        bent().read("Member\tEnd\tM\nA-B\tA\t3\n", file=path)
    assert words in str(caught.value)


def test_columns_stated() -> None:
    k = bent()
    bare = "\n".join(k.ends("dead").splitlines()[1:])
    verdict, closed, _ = k.judge(f"Load case: dead\n{bare}\n", columns=("member", "joint", "N", "V", "M"), units="kN m")
    assert verdict == "agree", closed.undecided
