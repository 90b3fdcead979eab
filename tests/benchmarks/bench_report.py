"""The record of a check beside the check itself: 399 members, an HTML page and a PDF, a claim that is right.

Run by `python -m tests.benchmarks.bench_report`. Processor time of whole commands, in turn, the best of several. A right
claim is the harder case: a wrong one costs the check more and the record no more. Exits 1 where a limit is passed.
"""

from __future__ import annotations

import json
import os
import subprocess
import sys
import tempfile
from pathlib import Path

from tests.benchmarks.timing import HEAD, Row, least_spent, show

ROUNDS = 3
LIMIT, MEGABYTES = 5.0, 3.0
BAYS, STOREYS = 9, 21
"""9 * 21 beams and 10 * 21 columns: 399 members."""


def rows() -> list[Row]:
    with tempfile.TemporaryDirectory() as folder:
        frame, claim = _written(Path(folder))
        verify = ["-m", "crosscheck", "verify", str(frame), str(claim), "--case", "dead"]
        page, pdf = Path(folder) / "page.html", Path(folder) / "page.pdf"
        commands = {
            "check": verify, "html": [*verify, "--report", str(page)], "pdf": [*verify, "--report", str(pdf)],
        }  # fmt: skip
        took = {name: s.processor for name, s in least_spent(commands, ROUNDS, environment=_environment()).items()}
        size = page.stat().st_size / 1e6
    return [
        Row("8  verify with its record as HTML / without, 399 members", took["html"], took["check"], LIMIT),
        Row("8  verify with its record as PDF / without, 399 members", took["pdf"], took["check"], LIMIT),
        Row("8  the page", size, 1.0, MEGABYTES, unit="MB"),
    ]


def _environment() -> dict[str, str]:
    return os.environ | {"OPENBLAS_NUM_THREADS": "1"}


def _command(*words: str) -> str:
    return subprocess.run([sys.executable, "-m", "crosscheck", *words], env=_environment(), capture_output=True,
                          text=True, encoding="utf-8", check=True).stdout  # fmt: skip


def _written(folder: Path) -> tuple[Path, Path]:
    """The frame, and its end actions of the dead load as a claim."""
    frame, claim = folder / "frame.toml", folder / "claim.csv"
    frame.write_text(_command("draft", "--bays", f"{BAYS} x 6", "--storeys", f"{STOREYS} x 3.5"), encoding="utf-8")
    document = json.loads(_command("opinions", str(frame), "--case", "dead", "--json", "-"))
    ends = document["opinions"][0]["results"]["dead"]["member_ends"]
    lines = [f"{r['member']},{r['joint']},{r['axial']:.3f},{r['shear']:.3f},{r['moment']:.3f}" for r in ends]
    claim.write_text("member,joint,axial kN,shear kN,moment kNm\n" + "\n".join(lines) + "\n", encoding="utf-8")
    return frame, claim


def main() -> int:
    print(HEAD)
    return show(rows())


if __name__ == "__main__":
    raise SystemExit(main())
