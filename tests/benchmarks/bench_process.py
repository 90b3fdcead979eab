"""Whole processes: `crosscheck verify` on the largest demonstration frame, and `crosscheck --help`.

Run by `python -m tests.benchmarks.bench_process`. Processor time of each, in turn with the process that only imports what
it stands on, the best of several; compiled modules are kept, as after any installation by pip, and the first round
(which compiles) does not count. Exits 1 where a limit is passed.
"""

from __future__ import annotations

import os
import tempfile
from pathlib import Path

from tests.benchmarks.timing import HEAD, Row, least_spent, show, spent

ROUNDS = 9
CASES = Path(__file__).parents[2] / "cases"
IMPORTS = "import numpy, scipy.sparse.linalg, pandas, rich, anastruct"
HELP_IMPORTS = "import argparse, rich.console"
VERIFY_LIMIT, HELP_LIMIT = 1.6, 1.3


def largest_frame() -> str:
    """The demonstration frame with the most members, each counted for every case and combination."""
    from crosscheck import check

    frames = {name: check.read(CASES / f"{name}.toml") for name in recorded()}
    return max(frames, key=lambda name: len(frames[name].members) * len(frames[name].names))


def recorded() -> list[str]:
    return sorted(path.name.removesuffix(".record.toml") for path in CASES.glob("*.record.toml"))


def right_claim(name: str) -> Path:
    """The claim beside it that is there to be right."""
    return next(path for path in sorted(CASES.glob(f"{name}.claim.*")))


def rows() -> list[Row]:
    name = largest_frame()
    with tempfile.TemporaryDirectory() as kept:
        environment = {k: v for k, v in os.environ.items() if k != "PYTHONDONTWRITEBYTECODE"}
        environment |= {"PYTHONPYCACHEPREFIX": kept, "OPENBLAS_NUM_THREADS": "1"}
        verify = ["-m", "crosscheck", "verify", str(CASES / f"{name}.toml"), str(right_claim(name))]
        commands = {
            "verify": verify, "imports": ["-c", IMPORTS], "help": ["-m", "crosscheck", "--help"],
            "help imports": ["-c", HELP_IMPORTS],
        }  # fmt: skip
        for words in commands.values():  # compiles
            spent(words, environment=environment)
        took = {name: s.processor for name, s in least_spent(commands, ROUNDS, environment=environment).items()}
    return [
        Row(f"4  crosscheck verify {name} / bare imports", took["verify"], took["imports"], VERIFY_LIMIT),
        Row("4  crosscheck --help / its imports", took["help"], took["help imports"], HELP_LIMIT),
    ]


def main() -> int:
    print(HEAD)
    return show(rows())


if __name__ == "__main__":
    raise SystemExit(main())
