"""The check record: what stands on the page, that nothing in it acts, and the log that cannot be tuned in silence."""

from __future__ import annotations

import html
import json
import re
import shutil
import subprocess
import sys
from collections.abc import Iterator
from html.parser import HTMLParser
from itertools import pairwise
from pathlib import Path

import pytest

from crosscheck import cli, log
from crosscheck.problems import UnusableInput
from crosscheck.report import words
from crosscheck.report.about import ABOUT, read_about
from crosscheck.report.closing import SHARED
from crosscheck.report.sketch import GREY, INK

ROOT = Path(__file__).parent.parent
FRAME = """\
title = "Lean-to, <i>line</i> 4"
units = "kN m"
[materials.steel]
E = "210 GPa"
[sections.post]
I = "8360 cm^4"
A = "53.8 cm^2"
[joints]
A = [0, 0]
B = [0, 4]
C = [6, 4]
D = [6, 0]
[members]
"A-B" = { section = "post", material = "steel" }
"B-C" = { section = "post", material = "steel", hinge = "to" }
"D-C" = { section = "post", material = "steel", spring_to = "900 kN m/rad", rigid_from = 0.2 }
[supports]
A = "fixed"
D = "pinned"
[loads.dead]
apply = [
  { member = "B-C", uniform = 8.5, direction = "down" },
  { joint = "B", force = 12.0, direction = "right" },
  { joint = "B", couple = 3.0 },
]
"""


class Page(HTMLParser):
    """What a page is made of: tags with their attributes, and the text outside style."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.text = ""
        self.inside: list[str] = []
        self.feed(text)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, dict(attrs)))
        self.inside.append(tag)

    def handle_endtag(self, tag: str) -> None:
        if tag in self.inside:
            while self.inside.pop() != tag:
                pass

    def handle_data(self, data: str) -> None:
        if "style" not in self.inside:
            self.text += data


@pytest.fixture(scope="module")
def claim(tmp_path_factory: pytest.TempPathFactory) -> str:
    """A claim that is right, from the opinions themselves."""
    folder = tmp_path_factory.mktemp("right")
    folder.joinpath("f.toml").write_text(FRAME, encoding="utf-8")
    assert cli.main(["opinions", str(folder / "f.toml"), "--json", str(folder / "f.json")]) == 0
    given = json.loads(folder.joinpath("f.json").read_text(encoding="utf-8"))["opinions"][0]["results"]["dead"]
    rows = [f"{r['member']},{r['joint']},{r['axial']:.3f},{r['shear']:.3f},{r['moment']:.3f}" for r in given["member_ends"]]
    return "member,joint,axial kN,shear kN,moment kNm\n" + "\n".join(rows) + "\n"


@pytest.fixture
def folder(tmp_path: Path, claim: str) -> Path:
    tmp_path.joinpath("f.toml").write_text(FRAME, encoding="utf-8")
    tmp_path.joinpath("good.csv").write_text(claim, encoding="utf-8")
    lines = claim.splitlines()
    cells = lines[2].split(",")
    cells[4] = f"{float(cells[4]) * 1.4:.3f}"
    tmp_path.joinpath("bad.csv").write_text("\n".join([*lines[:2], ",".join(cells), *lines[3:]]) + "\n", encoding="utf-8")
    return tmp_path


def verified(folder: Path, claim: str, *options: str, page: str = "p.html") -> tuple[int, str]:
    path = folder / page
    path.unlink(missing_ok=True)
    status = cli.main(["verify", str(folder / "f.toml"), str(folder / claim), "--report", str(path), *options])
    return status, path.read_text(encoding="utf-8") if path.exists() else ""


def test_a_page_holds_what_a_reviewer_asks_for_in_order(folder: Path) -> None:
    status, text = verified(folder, "bad.csv", "--about", "job=Quay 4", "--about", "program_version=12.1")
    page = Page(text)
    assert status == 1
    titles = [re.sub(r"^\d+", "", t) for t in re.findall(r"<h2><span class=\"no\">\d+</span>(.*?)</h2>", text)]
    order = [
        "What was checked", "The frame", "Suspects", "Differences between the claim and the opinions",
        "Audit of the claim", "Pictures: dead", "Results: dead", "Not compared", "Independence", "Review of the model",
        "Log of checks", "Cautions", "Sign-off", "Frame and claim, verbatim",
    ]  # fmt: skip
    assert [t for t in titles if t in order] == [t for t in order if t in titles]
    assert set(order) - set(titles) <= {"Review of the model"}
    for said in ("Quay 4", "12.1", "disposition, initials", "Checker", "Reviewer", *words.CAUTIONS, *FRAME.splitlines()):
        assert said in page.text, said
    assert text.count("<svg") == 6  # frame, loads, moment, shear, axial, deflected shape
    assert "broken line" in page.text


def test_headings_go_down_one_step_at_a_time(folder: Path) -> None:
    levels = [int(tag[1]) for tag, _ in Page(verified(folder, "bad.csv")[1]).tags if re.fullmatch(r"h[1-6]", tag)]
    assert levels[0] == 1
    assert levels.count(1) == 1
    assert all(after - before <= 1 for before, after in pairwise(levels))


def test_nothing_in_a_page_acts_or_asks_elsewhere(folder: Path) -> None:
    page = Page(verified(folder, "bad.csv")[1])
    assert not {tag for tag, _ in page.tags} & {"script", "iframe", "object", "embed", "link", "img", "form", "base"}
    for tag, given in page.tags:
        for key, value in given.items():
            assert not key.startswith("on"), (tag, key)
            if key in ("href", "xlink:href", "src", "action"):
                assert (value or "").startswith("#"), (tag, value)
    policy = next(given["content"] for tag, given in page.tags if given.get("http-equiv") == "Content-Security-Policy")
    assert policy == "default-src 'none'; style-src 'unsafe-inline'"


def test_text_has_contrast() -> None:
    """Every colour that text is set in stands at 4.5 to 1 or more on white (WCAG 2.2, 1.4.3)."""
    template = ROOT.joinpath("crosscheck/report/page.html.j2").read_text(encoding="utf-8")
    colours = [*re.findall(r"--(?:ink|soft): (#\w+)", template), INK, GREY]
    assert len(colours) == 4
    assert all(_contrast(c) >= 4.5 for c in colours)
    assert _contrast("#9a9a9a") < 4.5


def _contrast(colour: str) -> float:
    digits = colour[1:] if len(colour) == 7 else "".join(2 * c for c in colour[1:])
    parts = [int(digits[k : k + 2], 16) / 255 for k in (0, 2, 4)]
    linear = [p / 12.92 if p <= 0.04045 else ((p + 0.055) / 1.055) ** 2.4 for p in parts]
    return 1.05 / (0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2] + 0.05)


def test_not_for_acceptance_stands_across_what_is_open(folder: Path) -> None:
    assert "NOT FOR ACCEPTANCE" in verified(folder, "bad.csv")[1]
    status, text = verified(folder, "good.csv")
    assert status == 0
    assert "NOT FOR ACCEPTANCE" not in text
    assert re.search(r'class="verdict agree".*?<strong>agree</strong>', text)


def test_an_undecided_record_is_open_and_takes_no_comfort_from_silence(folder: Path) -> None:
    frame = FRAME + '[loads.wind]\napply = [{ joint = "B", force = 2, direction = "right" }]\n'
    folder.joinpath("f.toml").write_text(frame, encoding="utf-8")
    folder.joinpath("few.csv").write_text("member,joint,moment kNm\nA-B,A,1.234\n", encoding="utf-8")
    status, text = verified(folder, "few.csv")
    page = Page(text)
    assert status == 3
    assert "the verdict is undecided" in page.text and "NOT FOR ACCEPTANCE" in page.text
    assert "Nothing could be compared." in page.text
    assert "None in the 18 values compared." in Page(verified(folder, "good.csv", "--case", "dead")[1]).text


HOSTILE = "<script>alert(1)</script><img src=x onerror=alert(2)>{{7*7}}&lt;\u202egnp.exe\u200b" + "x" * 400


def test_a_hostile_paste_shows_as_text(folder: Path) -> None:
    with folder.joinpath("bad.csv").open("a", encoding="utf-8") as out:
        out.write(f"\n{HOSTILE},A,1,2,3\n")
    frame = FRAME.replace("Lean-to, <i>line</i> 4", HOSTILE.replace("\\", "")).replace("dead", '"</style><b>dead"')
    folder.joinpath("f.toml").write_text(frame, encoding="utf-8")
    _, text = verified(folder, "bad.csv", "--about", f"remarks={HOSTILE}")
    page = Page(text)
    assert not {tag for tag, _ in page.tags} & {"script", "img", "b "}
    assert "<script>alert(1)</script>" in page.text
    assert "{{7*7}}" in page.text
    assert "[U+202E]gnp.exe[U+200B]" in page.text
    assert not set("\u202e\u200b") & set(text)
    assert "</style><b>dead" in page.text


def test_dollars_and_backslashes_in_names_are_no_formulas(folder: Path) -> None:
    frame = FRAME.replace('"A-B" =', '"$x^{$" = { from = "A", to = "B", section = "post", material = "steel" } #')
    folder.joinpath("f.toml").write_text(frame, encoding="utf-8")
    assert cli.main(["opinions", str(folder / "f.toml"), "--report", str(folder / "o.html")]) == 0
    assert "$x^{$" in Page(folder.joinpath("o.html").read_text(encoding="utf-8")).text


def test_the_checksum_is_of_all_that_is_said(folder: Path) -> None:
    first = _checksum(verified(folder, "bad.csv", "--about", "job=1")[1])
    assert len(first) == 64
    assert first != _checksum(verified(folder, "bad.csv", "--about", "job=2")[1])


def _checksum(text: str) -> str:
    found = re.search(r"Record checksum.*?([0-9a-f]{64})", text)
    assert found
    assert f'content: "crosscheck record {found[1][:32]}"' in text
    return found[1]


def test_a_pdf_is_written_where_the_path_says_so(folder: Path) -> None:
    path = folder / "p.pdf"
    assert cli.main(["verify", str(folder / "f.toml"), str(folder / "bad.csv"), "--report", str(path)]) == 1
    data = path.read_bytes()
    assert data.startswith(b"%PDF-")
    assert len(re.findall(rb"/Type /Page\b", data)) > 6


def test_letters_of_any_script_are_written_on_paper(folder: Path) -> None:
    """What the plain letters of every reader lack stands in letters of its own, and what those lack costs no page."""
    with folder.joinpath("bad.csv").open("a", encoding="utf-8") as out:
        out.write(f"\n\u039a\u03cc\u03bc\u03b2\u03bf\u03c2 \u6f22\u5b57 {HOSTILE},A,1,2,3\n")
    path = folder / "p.pdf"
    cli.main(["verify", str(folder / "f.toml"), str(folder / "bad.csv"), "--report", str(path)])
    fonts = set(re.findall(rb"/BaseFont /([A-Za-z-]+\+)?([A-Za-z-]+)", path.read_bytes()))
    assert {name for _, name in fonts} >= {b"Courier", b"DejaVuSansMono", b"DejaVuSerif"}


def test_inspect_and_regress_have_records_too(folder: Path) -> None:
    assert cli.main(["inspect", str(folder / "f.toml"), "--report", str(folder / "i.html")]) == 0
    page = Page(folder.joinpath("i.html").read_text(encoding="utf-8"))
    assert "What each load case adds up to." in page.text
    assert cli.main(["regress", str(folder), "--report", str(folder / "r.html")]) == 1
    overview = Page(folder.joinpath("r.html").read_text(encoding="utf-8"))
    linked = {given["href"] for tag, given in overview.tags if tag == "a" and not str(given["href"]).startswith("#")}
    assert len(linked) == 1
    assert "never on record" in folder.joinpath(str(linked.pop())).read_text(encoding="utf-8")
    assert "NOT FOR ACCEPTANCE" in overview.text


def test_regress_writes_pdf_too_and_leads_to_a_record_for_each_frame(folder: Path) -> None:
    assert cli.main(["regress", str(folder), "--report", str(folder / "r.pdf")]) == 1
    leads = re.findall(rb"/URI \((r\.frames/[^)]*\.pdf)\)", folder.joinpath("r.pdf").read_bytes())
    assert len(set(leads)) == 1
    assert folder.joinpath(leads[0].decode()).read_bytes().startswith(b"%PDF-")


def test_a_mechanism_has_a_record_of_inspection(folder: Path) -> None:
    folder.joinpath("f.toml").write_text(FRAME.replace('A = "fixed"', 'A = "roller"').replace('"pinned"', '"roller"'),
                                         encoding="utf-8")  # fmt: skip
    assert cli.main(["inspect", str(folder / "f.toml"), "--report", str(folder / "i.html")]) == 1
    assert "NOT FOR ACCEPTANCE" in folder.joinpath("i.html").read_text(encoding="utf-8")


def test_what_must_not_be_missed_stands_below_the_verdict(folder: Path) -> None:
    frame = FRAME + '[loads.wind]\napply = [{ joint = "B", force = 2, direction = "right" }]\n'
    folder.joinpath("f.toml").write_text(frame, encoding="utf-8")
    text = verified(folder, "bad.csv", "--case", "dead", "--tolerance", "2")[1]
    gist = Page(text[text.index('class="facts gist"') : text.index("NOT FOR ACCEPTANCE</b>")]).text
    for said in ("First difference", "A-B at B, moment in dead: claim", "First suspect", "transcription", "fail",
                 "2%, NOT the usual 1%", "Not spoken of", "wind: this record says nothing of them"):  # fmt: skip
        assert said in gist, said


def test_the_record_of_a_suspect_is_for_no_acceptance_and_the_log_keeps_what_was_stated(folder: Path) -> None:
    text = verified(folder, "bad.csv", "--suspect", "1")[1]
    page = Page(text)
    assert "Check record, as a suspect supposes" in page.text
    assert "all below is of the frame and claim so changed" in page.text
    assert "it supposes a mistake that nobody has confirmed" in page.text
    assert "NOT FOR ACCEPTANCE" in page.text
    assert [e.verdict for e in log.read_log(folder / "f.log.jsonl")] == ["disagree"]


def test_two_printouts_have_a_record(folder: Path) -> None:
    status, text = verified(folder, "good.csv", "--against", str(folder / "bad.csv"))
    page = Page(text)
    assert status == 1
    assert re.search(r"<strong>moved</strong>", text)
    for said in ("MOVED: 1 of the", "Furthest beyond the printed rounding first", "bad.csv", "A-B at B", "Against: "):
        assert said in page.text, said
    assert "NOT FOR ACCEPTANCE" in page.text
    same = verified(folder, "good.csv", "--against", str(folder / "good.csv"))[1]
    assert "NOT FOR ACCEPTANCE" not in same and "NOTHING MOVED" in same


def test_a_serious_finding_stands_in_the_way_of_a_claim_that_agrees(folder: Path) -> None:
    frame = FRAME.replace("[loads.dead]", '[loads.dead]\nexpected = { down = "900 kN" }')
    folder.joinpath("f.toml").write_text(frame, encoding="utf-8")
    status, text = verified(folder, "good.csv")
    assert status == 0
    assert "NOT FOR ACCEPTANCE" in text
    assert "1 serious finding in the model" in Page(text).text


def test_printed_input_that_differs_stands_before_the_suspects(folder: Path) -> None:
    told = "Joint\tX [m]\tY [m]\nA\t0\t0\nB\t0\t4\nC\t6\t4.5\nD\t6\t0\n\nLoad case: dead\n"
    path = folder / "good.csv"
    path.write_text(told + path.read_text(encoding="utf-8").replace(",", "\t"), encoding="utf-8")
    text = verified(folder, "good.csv")[1]
    page = Page(text)
    assert "Printed input that differs from the frame" in page.text
    assert "geometry" in page.text[page.text.index("Facts, not hypotheses.") :]
    assert "NOT FOR ACCEPTANCE" in page.text


def test_all_that_the_week_adds_is_drawn(folder: Path) -> None:
    deep = '[sections.deep]\nI = "20000 cm^4"\nA = "80 cm^2"\ndepth = "400 mm"\n'
    cable = 'cable = { from = "A", to = "C", section = "post", material = "steel", hinge = "both", only = "tension" }\n'
    tie = '[ties]\neaves = { joints = ["B", "C"], direction = "x" }\n'
    taper = 'taper = ["post", "deep"], material = "steel", hinge'
    frame = FRAME.replace('section = "post", material = "steel", hinge', taper)
    frame = frame.replace('A = "53.8 cm^2"', 'A = "53.8 cm^2"\ndepth = "300 mm"')
    frame = frame.replace("[joints]", f"{deep}[joints]").replace("[supports]", f"{cable}{tie}[supports]")
    folder.joinpath("f.toml").write_text(frame, encoding="utf-8")
    assert cli.main(["inspect", str(folder / "f.toml"), "--report", str(folder / "i.html")]) in (0, 1)
    page = Page(folder.joinpath("i.html").read_text(encoding="utf-8"))
    for said in ("stepped or tapered", "works in tension only", "tied along it", "tie eaves"):
        assert said in page.text, said


# --- the log


def test_a_frame_changed_after_a_claim_was_seen_needs_a_reason(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert verified(folder, "bad.csv")[0] == 1
    folder.joinpath("f.toml").write_text(FRAME.replace("8360", "9000"), encoding="utf-8")
    capsys.readouterr()
    status, text = verified(folder, "bad.csv")
    assert (status, text) == (2, "")
    assert "--reason: the frame has changed since it was checked against" in capsys.readouterr().err
    status, text = verified(folder, "bad.csv", "--reason", "drawing S-04 revision C")
    assert status == 1
    assert "drawing S-04 revision C" in Page(text).text
    entries = log.read_log(folder / "f.log.jsonl")
    assert [e.reason for e in entries] == ["", "drawing S-04 revision C"]
    assert entries[0].frame_sha256 != entries[1].frame_sha256
    assert verified(folder, "bad.csv")[0] == 1  # unchanged since: nothing to explain


def test_a_frame_without_claim_may_change(folder: Path) -> None:
    assert cli.main(["opinions", str(folder / "f.toml"), "--report", str(folder / "o.html")]) == 0
    assert not folder.joinpath("f.log.jsonl").exists()


def test_a_damaged_log_is_not_written_over(folder: Path) -> None:
    path = folder / "f.log.jsonl"
    path.write_text('{"when": "once"}\n', encoding="utf-8")
    assert verified(folder, "bad.csv") == (2, "")
    assert path.read_text(encoding="utf-8") == '{"when": "once"}\n'


@pytest.mark.parametrize(
    "options",
    [
        ("--report", "page.txt"),
        ("--report", "nowhere/page.html"),
        ("--report", "p.html", "--suspect", "7"),
        ("--report", "p.html", "--show-reading"),
        ("--report", "p.html", "--about", "jobb=1"),
    ],
)
def test_what_cannot_be_filed_is_refused(folder: Path, options: tuple[str, ...], monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(folder)
    assert cli.main(["verify", "f.toml", "bad.csv", *options]) == 2
    assert not folder.joinpath("f.log.jsonl").exists()


def test_about_a_record_from_a_file(tmp_path: Path) -> None:
    path = tmp_path / "about.toml"
    path.write_text('job = "Quay"\nrevision = "B"\n', encoding="utf-8")
    assert read_about([str(path), "revision=C"]) == {"job": "Quay", "revision": "C"}
    path.write_text('jobs = "Quay"\n', encoding="utf-8")
    with pytest.raises(UnusableInput, match='did you mean "job"'):
        read_about([str(path)])
    assert set(ABOUT) >= {"job", "calculation", "revision", "originator", "drawings", "program", "program_version"}


def test_what_pairs_share_is_what_the_readme_says() -> None:
    readme = ROOT.joinpath("README.md").read_text(encoding="utf-8")
    rows = re.findall(r"^\| ((?:slope|moment)[a-z -]+, [a-z ]+) \| (the .*?) \|$", readme, re.MULTILINE)
    stated: dict[tuple[str, ...], str] = {}
    for pair, shares in rows:
        said = list(stated.values())[-1] if shares == "the same" else re.sub(r" \(`[^)]*\)", "", shares)
        stated[tuple(pair.replace("moment d", "moment-d").split(", "))] = said
    assert stated == SHARED


def test_a_check_without_a_record_loads_no_drawing_and_no_template_engine() -> None:
    """anastruct's own import of matplotlib waits until it draws, and then works (opinions/library/deferred.py)."""
    code = (
        "import sys\n"
        "from crosscheck import cli\n"
        f"assert cli.main(['opinions', {str(ROOT / 'cases' / 'shed.toml')!r}]) == 0\n"
        "assert 'anastruct' in sys.modules\n"
        "assert not {'matplotlib', 'jinja2', 'PIL'} & set(sys.modules)\n"
        "from anastruct.fem.plotter import mpl\n"
        "import matplotlib.pyplot\n"
        "assert mpl.plt.figure is matplotlib.pyplot.figure\n"
        "assert mpl.matplotlib.colors.is_color_like('k')\n"
    )
    done = subprocess.run([sys.executable, "-W", "error", "-c", code], capture_output=True, text=True, timeout=120)
    assert done.returncode == 0, done.stderr


def test_visible_names_what_hides() -> None:
    assert words.visible("plain é 漢") == "plain é 漢"
    assert words.visible("a\u202eb\x00") == "a[U+202E]b[U+0000]"
    assert words.visible("x" * 50, 9) == "xxxx…xxxx"


# --- as a browser shows it

CHROMIUM = shutil.which("chromium") or shutil.which("chromium-browser") or shutil.which("google-chrome")
FLAGS = [
    "--headless", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--hide-scrollbars",
    "--disable-background-networking", "--disable-component-update", "--disable-sync", "--no-pdf-header-footer",
    "--enable-logging=stderr", "--host-resolver-rules=MAP * ~NOTFOUND",
]  # fmt: skip


@pytest.fixture
def browser(tmp_path: Path) -> Iterator[str]:
    if CHROMIUM is None:
        pytest.skip("chromium is not installed (.ci/run installs it)")
    yield CHROMIUM


@pytest.mark.parametrize("width", [390, 1280, 794])  # phone, laptop, A4 at 96 dots an inch
def test_a_browser_finds_nothing_to_complain_of(folder: Path, browser: str, width: int) -> None:
    """No error on the console, where a request that leaves the page would be one too, and nothing wider than the page."""
    verified(folder, "bad.csv")
    probe = folder / "probe.html"
    text = folder.joinpath("p.html").read_text(encoding="utf-8")
    # Whoever tests may run a script: it writes down how wide the page came out.
    text = re.sub(r"<meta http-equiv[^>]*>", "", text)
    measure = "<script>document.title = document.documentElement.scrollWidth + '/' + innerWidth</script>"
    probe.write_text(text.replace("</body>", measure + "</body>"), encoding="utf-8")
    shown = _chromium(browser, folder, f"--window-size={width},900", f"--screenshot={folder / 's.png'}", page="p.html")
    assert "CONSOLE" not in shown.stderr
    assert folder.joinpath("s.png").stat().st_size > 5000
    dumped = _chromium(browser, folder, f"--window-size={width},900", "--dump-dom", page="probe.html").stdout
    wide, window = re.search(r"<title>(\d+)/(\d+)</title>", dumped).groups()  # type: ignore[union-attr]
    assert int(wide) <= int(window)


@pytest.mark.parametrize("millimetres", [177, 183])  # between the margins of A4 and of Letter
def test_no_table_is_cut_in_print(folder: Path, browser: str, millimetres: int) -> None:
    """At the width of the paper no table and no text is wider than its place, a table's head comes again on every page, and
    no row is parted over two."""
    verified(folder, "bad.csv")
    text = folder.joinpath("p.html").read_text(encoding="utf-8")
    text = re.sub(r"<meta http-equiv[^>]*>", "", text).replace("@media print", "@media all")
    measure = (
        "<script>const cut = [...document.querySelectorAll('.table, figure, pre, header, dl')].filter(e => e.scrollWidth > "
        "e.clientWidth + 1).map(e => e.tagName + e.className);"
        "const is = (q, k, v) => [...document.querySelectorAll(q)].every(e => getComputedStyle(e)[k] == v);"
        "const kept = is('thead', 'display', 'table-header-group') && is('tr', 'breakInside', 'avoid') && is('figure', "
        "'breakInside', 'avoid') && is('h2', 'breakAfter', 'avoid');"
        "document.title = JSON.stringify([cut, kept, document.querySelectorAll('tr').length])</script>"
    )
    found = []
    for width in (millimetres, 40):  # nothing fits 40 mm: the measure can fail
        wide = f"<style>body {{ width: {width}mm; }}</style>"
        folder.joinpath("probe.html").write_text(text.replace("</body>", wide + measure + "</body>"), encoding="utf-8")
        dumped = _chromium(browser, folder, "--window-size=1200,900", "--dump-dom", page="probe.html").stdout
        found.append(json.loads(html.unescape(re.search(r"<title>(.*?)</title>", dumped)[1])))  # type: ignore[index]
    (cut, kept, rows), (narrow, _, _) = found
    assert cut == []
    assert narrow
    assert kept and rows > 20


def test_a_browser_prints_it(folder: Path, browser: str) -> None:
    verified(folder, "bad.csv")
    _chromium(browser, folder, f"--print-to-pdf={folder / 'printed.pdf'}", page="p.html")
    data = folder.joinpath("printed.pdf").read_bytes()
    assert data.startswith(b"%PDF-")
    assert len(re.findall(rb"/Type\s*/Page\b", data)) >= 4


def _chromium(browser: str, folder: Path, *options: str, page: str) -> subprocess.CompletedProcess[str]:
    profile = folder / "profile"
    done = subprocess.run(
        [browser, *FLAGS, f"--user-data-dir={profile}", *options, folder.joinpath(page).as_uri()],
        capture_output=True, text=True, encoding="utf-8", errors="replace", timeout=120, check=True,
    )  # fmt: skip
    shutil.rmtree(profile, ignore_errors=True)
    return done
