"""The package from a notebook: the README's own block runs and gives what it says, tables hold what the objects hold."""

from __future__ import annotations

import ast
import io
import re
import shutil
import subprocess
import sys
import tokenize
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest

import crosscheck
from crosscheck.notebook import Contents
from crosscheck.suite.record import Refused
from tests.calls import CASES, ONE_CASE, call, put

README = (CASES.parent / "README.md").read_text(encoding="utf-8")
PIECES: tuple[Contents, ...] = ("member_ends", "joints", "reactions", "spans")


def block() -> str:
    found = re.search(r"<!-- notebook -->\n```python\n(.*?)```\n<!-- end -->", README, re.DOTALL)
    assert found
    return found[1]


def promised(source: str) -> dict[int, Any]:
    """By line: what its remark promises, where that is a value."""
    tokens = tokenize.generate_tokens(io.StringIO(source).readline)
    found: dict[int, Any] = {}
    for token in tokens:
        if token.type == tokenize.COMMENT and re.fullmatch(r"# ('.*'|\[\])", token.string):
            found[token.start[0]] = ast.literal_eval(token.string[2:])
    return found


def run(source: str) -> Iterator[tuple[int, Any]]:
    """Each statement in turn, as cells; (line, value) of those that are expressions."""
    names: dict[str, Any] = {}
    for statement in ast.parse(source).body:
        if isinstance(statement, ast.Expr):
            yield statement.lineno, eval(compile(ast.Expression(statement.value), "README", "eval"), names)
        else:
            exec(compile(ast.Module([statement], []), "README", "exec"), names)


def test_the_readmes_block(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    shutil.copytree(CASES, tmp_path / "cases")
    monkeypatch.chdir(tmp_path)
    expected = promised(block())
    values = dict(run(block()))
    assert len(expected) == 6 and {line: values[line] for line in expected} == expected
    out = capsys.readouterr().out
    assert "DISAGREE" in out and "cases/hull.toml: there is no such file; did you mean" in out
    assert "checked in the notebook" in (tmp_path / "cases" / "hall.record.toml").read_text(encoding="utf-8")


def test_importing_the_package_imports_no_numbers() -> None:
    asks = "import sys, crosscheck; print(sorted({'numpy', 'pandas', 'rich', 'crosscheck.check'} & set(sys.modules)))"
    done = subprocess.run([sys.executable, "-c", asks], capture_output=True, text=True, encoding="utf-8", check=True)
    assert done.stdout.strip() == "[]"


def test_every_public_name_is_there_and_explained() -> None:
    assert set(crosscheck.__all__) <= set(dir(crosscheck))
    for name in set(crosscheck.__all__) - {"__version__"}:
        assert getattr(crosscheck, name).__doc__, name
        assert name == "UnusableInput" or f"`{name}(" in README, name
    with pytest.raises(AttributeError, match="no attribute 'verfy'"):
        _ = crosscheck.verfy  # type: ignore[attr-defined]


def test_tables_hold_what_the_document_holds(tmp_path: Path) -> None:
    path = put(tmp_path, ONE_CASE)
    said = crosscheck.ask(crosscheck.read(path))
    results = call("opinions", path, "--json", "-").document["opinions"]
    for of in PIECES:
        made = crosscheck.table(said, of)
        for opinion in results:
            ours = made.xs(opinion["name"], level="opinion").reset_index()
            theirs = flat(opinion["results"]["dead"][of])
            for head in theirs.columns:
                if theirs[head].dtype == float:
                    np.testing.assert_allclose(ours[head], theirs[head], rtol=1e-12, atol=1e-12)
                else:
                    assert list(ours[head]) == list(theirs[head])


def flat(rows: list[dict[str, Any]]) -> pd.DataFrame:
    """Rows of the JSON document as a table; those of spans hold lists."""
    made = pd.DataFrame(rows)
    lists = [head for head in made.columns if isinstance(made[head].iloc[0], list)]
    made = made.explode(lists, ignore_index=True) if lists else made
    return made.astype(dict.fromkeys(lists, float))


def test_a_claim_as_tables(tmp_path: Path) -> None:
    frame = crosscheck.read(ONE_CASE + "\n")
    right = crosscheck.table(crosscheck.ask(frame), "member_ends").xs("slope-deflection", level="opinion").reset_index()
    text = right[["member", "joint", "moment"]].rename(columns={"moment": "M (kNm)"}).to_csv(index=False)
    assert crosscheck.verify(frame, text).verdict == "agree"
    path = put(tmp_path, text, "moments.csv")
    assert crosscheck.verify(frame, path).verdict == crosscheck.verify(frame, str(path)).verdict == "agree"
    right.loc[0, "moment"] *= 1.5
    wrong = right[["member", "joint", "moment"]].rename(columns={"moment": "M (kNm)"}).to_csv(index=False)
    result = crosscheck.verify(frame, wrong)
    assert result.verdict == "disagree"
    differences = crosscheck.table(result, "disagreements")
    row = differences.iloc[0]
    assert list(row[["member", "joint", "quantity", "line"]]) == [*right.loc[0, ["member", "joint"]], "moment", 2]
    assert row["claim"] == pytest.approx(1.5 * row["library"], rel=1e-9)
    assert list(crosscheck.table(result, "suspects")["kind"]) == [s.kind for s in result.suspects]
    assert list(crosscheck.table(result, "statics")["ok"]) == [s.ok for a in result.audits for s in a.statics]
    assert "check" in crosscheck.table(result, "compatibility").columns
    assert crosscheck.verify(frame, wrong, tolerance=60).verdict == "agree"
    assert "NOT the usual 1%" in crosscheck.printed(crosscheck.verify(frame, wrong, tolerance=60))


def test_what_cannot_be_used_says_so(tmp_path: Path) -> None:
    path = put(tmp_path, ONE_CASE)
    frame = crosscheck.read(path)
    said = crosscheck.ask(frame)
    for act, says in (
        (lambda: crosscheck.ask(frame, "daed"), 'did you mean "dead"'),
        (lambda: crosscheck.verify(frame, "absent.txt"), "cannot be opened"),
        (lambda: crosscheck.verify(frame, "a\nb\n"), "holds no results"),
        (lambda: crosscheck.verify(frame, "a\nb\n", tolerance=0), "no percentage"),
        (lambda: crosscheck.table(said, "suspects"), "this result has none"),
        (lambda: crosscheck.table(said, "suspect"), "one of member_ends"),  # type: ignore[arg-type]
        (lambda: crosscheck.record(path, " "), "say why"),
    ):
        with pytest.raises(crosscheck.UnusableInput, match=re.escape(says)):
            act()


def test_what_the_opinions_do_not_agree_on_is_not_recorded(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    from crosscheck.check import Opinions

    monkeypatch.setattr(Opinions, "verdict", "undecided")
    with pytest.raises(Refused, match="do not agree"):
        crosscheck.record(put(tmp_path, ONE_CASE), "first issue")
    assert not list(tmp_path.glob("*.record.toml"))
