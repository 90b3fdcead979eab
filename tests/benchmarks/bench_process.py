"""Whole processes: `crosscheck verify` on the largest demonstration frame, and `crosscheck --help`.

Run by `python tests/benchmarks/bench_process.py`. Each is timed in turn with the process that only imports what it
stands on, the best of several; compiled modules are kept, as after any installation by pip, and the first round (which
compiles) does not count. Exits 1 where a limit is passed.
"""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
import time
from pathlib import Path

ROUNDS = 9
CASES = Path(__file__).parents[2] / "cases"
IMPORTS = "import numpy, scipy.sparse.linalg, pandas, rich, anastruct"
HELP_IMPORTS = "import argparse, rich.console"
VERIFY_LIMIT, HELP_LIMIT = 1.6, 1.3


def largest_frame() -> str:
    """The demonstration frame with the most values on record, which is the one with the most members and cases."""
    sizes = {path: len(path.read_bytes()) for path in CASES.glob("*.record.toml")}
    return max(sizes, key=sizes.__getitem__).name.removesuffix(".record.toml")


def right_claim(name: str) -> Path:
    """The claim beside it that is there to be right."""
    return next(path for path in sorted(CASES.glob(f"{name}.claim.*")))


def seconds(arguments: list[str], environment: dict[str, str]) -> float:
    start = time.perf_counter()
    done = subprocess.run([sys.executable, *arguments], env=environment, capture_output=True, check=False)
    took = time.perf_counter() - start
    assert done.returncode == 0, done.stderr.decode("utf-8", "replace")
    return took


def compare(one: list[str], other: list[str], environment: dict[str, str]) -> tuple[float, float]:
    """Best time of each, both run in turn so that neighbours on the machine slow both alike."""
    times = [(seconds(one, environment), seconds(other, environment)) for _ in range(ROUNDS + 1)][1:]
    return min(t[0] for t in times), min(t[1] for t in times)


def main() -> int:
    name = largest_frame()
    with tempfile.TemporaryDirectory() as kept:
        environment = {k: v for k, v in os.environ.items() if k != "PYTHONDONTWRITEBYTECODE"}
        environment |= {"PYTHONPYCACHEPREFIX": kept, "OPENBLAS_NUM_THREADS": "1"}
        verify = ["-m", "crosscheck", "verify", str(CASES / f"{name}.toml"), str(right_claim(name))]
        rows = [
            (f"verify {name}", compare(verify, ["-c", IMPORTS], environment), VERIFY_LIMIT),
            ("--help", compare(["-m", "crosscheck", "--help"], ["-c", HELP_IMPORTS], environment), HELP_LIMIT),
        ]
    for title, (mine, imports), limit in rows:
        print(f"{title:<16}{mine:7.3f} s   imports alone {imports:7.3f} s   ratio {mine / imports:5.2f} (limit {limit:g})")
    return int(any(mine > limit * imports for _, (mine, imports), limit in rows))


if __name__ == "__main__":
    raise SystemExit(main())
