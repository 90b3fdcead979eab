"""Calling the command line from tests, small frames to call it on, and claims printed from what it answered."""

from __future__ import annotations

import contextlib
import io
import json
from collections.abc import Callable, Iterable
from dataclasses import dataclass
from pathlib import Path
from typing import Any
from unittest import mock

from crosscheck.cli import main

CASES = Path(__file__).parents[1] / "cases"


@dataclass(frozen=True, slots=True)
class Call:
    """Exit status and what went to standard output and standard error."""

    status: int
    out: str
    err: str

    @property
    def document(self) -> dict[str, Any]:
        """Standard output as JSON; fails where anything else stands there."""
        document: dict[str, Any] = json.loads(self.out)
        return document


def call(*argv: str | Path, stdin: bytes = b"", width: int = 80) -> Call:
    """Run the command in this process, as in a pipe `width` columns wide."""
    out, err = io.StringIO(), io.StringIO()
    settings = {"COLUMNS": str(width)}
    source = io.TextIOWrapper(io.BytesIO(stdin), encoding="utf-8")
    with (
        contextlib.redirect_stdout(out), contextlib.redirect_stderr(err),
        mock.patch("sys.stdin", source), mock.patch.dict("os.environ", settings),
    ):  # fmt: skip
        try:
            status = main([str(a) for a in argv])
        except SystemExit as left:  # what the parser of the arguments does
            status = int(left.code or 0)
    return Call(status, out.getvalue(), err.getvalue())


def put(folder: Path, text: str, name: str = "frame.toml") -> Path:
    """A file of this text, with the line ends as they are in it."""
    path = folder / name
    path.write_text(text, encoding="utf-8", newline="")
    return path


STEEL = 'materials.steel = { E = "210 GPa", alpha = 12e-6, nu = 0.3 }\n'
POST = 'sections.post = { I = "8360 cm^4", A = "53.8 cm^2", depth = "300 mm", shear_area = "25 cm^2" }\n'
THIN = 'sections.post = { I = "8360 cm^4" }\n'

PORTAL = f"""\
title = "Portal"
units = "kN m"
{STEEL}{POST}
[joints]
A = [0, 0]
B = [0, 4]
C = [6, 4]
D = [6, 0]
[members]
"A-B" = {{ section = "post", material = "steel" }}
"B-C" = {{ section = "post", material = "steel" }}
"C-D" = {{ section = "post", material = "steel" }}
[supports]
A = "fixed"
D = "fixed"
[loads.dead]
apply = [
  {{ member = "B-C", uniform = 12, direction = "down" }},
  {{ member = "B-C", force = 20, at = 2, direction = "down" }},
]
[loads.wind]
apply = [{{ joint = "B", force = 15, direction = "right" }}, {{ member = "A-B", uniform = 3, direction = "right" }}]
[combinations]
both = {{ dead = 1.35, wind = 1.5 }}
"""
ONE_CASE = PORTAL.partition("[loads.wind]")[0]


def of_case(document: dict[str, Any], case: str, opinion: int = 0) -> dict[str, Any]:
    """One opinion's results of a case."""
    results: dict[str, Any] = document["opinions"][opinion]["results"][case]
    return results


def _never(_: dict[str, Any], quantity: str, value: float) -> float:
    return value


def claim_of(
    results: dict[str, Any], tables: Iterable[str] = ("member_ends", "reactions", "joints"), digits: int = 4,
    change: Callable[[dict[str, Any], str, float], float] = _never, heading: str = "",
) -> str:  # fmt: skip
    """A claim printed from an opinion's results in kN and m, every value first passed through `change` (row, quantity,
    value). Displacements are printed in mm and mrad, so that a few decimals are digits enough."""
    heads = {
        "member_ends": ("Member", "Joint", "N [kN]", "V [kN]", "M [kNm]"),
        "reactions": ("Support", "Fx [kN]", "Fy [kN]", "M [kNm]"),
        "joints": ("Joint", "dx [mm]", "dy [mm]", "rotation [mrad]"),
    }
    factor = 1000.0
    lines = [heading] if heading else []
    for table in tables:
        lines += ["", ",".join(heads[table])]
        for row in results[table]:
            names = [str(v) for v in row.values() if isinstance(v, str)]
            values = [(k, v) for k, v in row.items() if not isinstance(v, str)]
            shown = [
                "" if v is None else f"{change(row, k, v) * (factor if table == 'joints' else 1.0):.{digits}f}"
                for k, v in values
            ]
            lines.append(",".join(names + shown))
    return "\n".join(lines) + "\n"
