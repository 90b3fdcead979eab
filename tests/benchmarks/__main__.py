"""Every benchmark of speed and memory with a limit, as one table of ratios: `python -m tests.benchmarks [PART ...]`.

Parts: sizes, distribution, cases, library, process, commands, suite, report; all of them where none is named (a few
minutes). All times are processor time, pairs run in turn, the best of several; a ratio by the clock says so. Exits 1
where a limit is not held.
"""

from __future__ import annotations

import os
import sys

os.environ["OPENBLAS_NUM_THREADS"] = "1"  # before numpy is imported: threads would count twice as processor time

from tests.benchmarks import bench_commands, bench_process, bench_report, bench_size, bench_suite
from tests.benchmarks.timing import HEAD, show

PARTS = {
    "sizes": bench_size.sizes,
    "distribution": bench_size.distribution,
    "cases": bench_size.many_cases,
    "library": bench_size.library,
    "process": bench_process.rows,
    "commands": bench_commands.rows,
    "suite": bench_suite.rows,
    "report": bench_report.rows,
}


def main(names: list[str]) -> int:
    unknown = set(names) - set(PARTS)
    if unknown:
        print(f"no such part: {', '.join(sorted(unknown))}; known: {', '.join(PARTS)}", file=sys.stderr)
        return 2
    print(HEAD)
    return max(show(PARTS[name]()) for name in names or PARTS)


if __name__ == "__main__":
    raise SystemExit(main(sys.argv[1:]))
