"""What the benchmarks share: pairs timed in turn by processor time, and rows of ratios with their limits.

The clock on the wall says little on a machine that does other things as well; processor time of this process, or of a
finished child process, leaves waiting out. What is compared is always run in turn, round by round, and the best round
of each counts.
"""

from __future__ import annotations

import gc
import os
import subprocess
import sys
import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Row:
    """One line of the table. mine, other: what is divided, in `unit`; other is 1 where the limit is of mine itself.

    least: the ratio must be at least the limit instead of at most. limit: None where the row only informs.
    """

    what: str
    mine: float
    other: float
    limit: float | None = None
    least: bool = False
    unit: str = "s"

    @property
    def ratio(self) -> float:
        return self.mine / self.other

    @property
    def held(self) -> bool:
        if self.limit is None:
            return True
        return self.ratio >= self.limit if self.least else self.ratio <= self.limit

    def __str__(self) -> str:
        limit = "" if self.limit is None else f"{'>=' if self.least else '<='} {self.limit:.4g}"
        verdict = "" if self.limit is None else "held" if self.held else "NOT HELD"
        return f"{self.what:<76}{self.mine:>10.4g}{self.other:>10.4g} {self.unit:<3}{self.ratio:>9.2f}  {limit:<9}{verdict}"


HEAD = f"{'':<76}{'one':>10}{'other':>10}    {'ratio':>9}  limit"


def show(rows: Sequence[Row]) -> int:
    """Print rows as they stand; 1 where a limit is passed, else 0."""
    for row in rows:
        print(row, flush=True)
    return int(not all(row.held for row in rows))


def in_turn(acts: dict[str, Callable[[], object]], rounds: int) -> dict[str, float]:
    """Least seconds of processor time of each act, all run in turn `rounds` times."""
    best = dict.fromkeys(acts, float("inf"))
    for _ in range(rounds):
        for name, act in acts.items():
            gc.collect()
            start = time.process_time()
            act()
            best[name] = min(best[name], time.process_time() - start)
    return best


@dataclass(frozen=True, slots=True)
class Spent:
    """A finished command: processor and wall-clock seconds, and megabytes at most."""

    processor: float
    clock: float
    megabytes: float


def spent(words: Sequence[str], status: Sequence[int] = (0,), environment: dict[str, str] | None = None) -> Spent:
    """Run `python WORDS`, which must end with one of these statuses, and say what it took (not on Windows)."""
    import resource  # not on Windows

    # A process of its own between, because the most memory of children is kept over all of them.
    code = (
        "import json, resource, subprocess, sys, time\n"
        "start = time.perf_counter()\n"
        "done = subprocess.run(sys.argv[1:], stdout=subprocess.DEVNULL, stderr=subprocess.PIPE)\n"
        "used = resource.getrusage(resource.RUSAGE_CHILDREN)\n"
        "sys.stderr.buffer.write(done.stderr)\n"
        "print(json.dumps([done.returncode, used.ru_utime + used.ru_stime, time.perf_counter() - start, used.ru_maxrss]))\n"
    )
    assert resource
    given = {**os.environ, "OPENBLAS_NUM_THREADS": "1"} if environment is None else environment
    run = subprocess.run(
        [sys.executable, "-c", code, sys.executable, *words], env=given, capture_output=True, text=True, check=True
    )
    returned, processor, clock, kilobytes = (float(part) for part in run.stdout.strip("[] \n").split(","))
    assert returned in status, f"{words}: status {returned:g}\n{run.stderr}"
    return Spent(processor, clock, kilobytes / 1024 if sys.platform == "linux" else kilobytes / 1024**2)


def least_spent(commands: dict[str, Sequence[str]], rounds: int, status: Sequence[int] = (0,),
                environment: dict[str, str] | None = None) -> dict[str, Spent]:  # fmt: skip
    """For each command the round with the least processor time, all run in turn."""
    rows = [{name: spent(words, status, environment) for name, words in commands.items()} for _ in range(rounds)]
    return {name: min((row[name] for row in rows), key=lambda s: s.processor) for name in commands}
