"""A thousand standard frames in one run on two cores, against starting the program for each; and its memory.

Run by `python -m tests.benchmarks.bench_suite [FRAMES]`. The frames are generated: portals of every span and height, with
values on record. Starting the program for each (`crosscheck regress FRAME`, one after the other) is timed on a sample,
before and after the run so that both see the same machine, and extrapolated; the limit is a ratio of 20. Memory is the
largest resident set of one process that checks frames one after the other, a fifth of them and all. On a machine that is
busy with other things the clock says little; processor time, printed beside it, says what two idle cores would do.
"""

from __future__ import annotations

import statistics
import sys
import tempfile
from pathlib import Path

from tests.benchmarks.timing import HEAD, Row, Spent, show, spent

FRAMES, SAMPLE = 1000, 10
LIMIT, FLAT = 20.0, 1.1

FRAME = """\
title = "Portal {n}"
units = "kN m"

[materials.steel]
E = "210 GPa"

[sections.post]
I = "8360 cm^4"
A = "53.8 cm^2"

[joints]
A = [0, 0]
B = [0, {height}]
C = [{span}, {height}]
D = [{span}, 0]

[members]
"A-B" = {{ section = "post", material = "steel" }}
"B-C" = {{ section = "post", material = "steel" }}
"C-D" = {{ section = "post", material = "steel" }}

[supports]
A = "fixed"
D = "pinned"

[loads.dead]
apply = [
  {{ member = "B-C", uniform = {load}, direction = "down" }},
  {{ joint = "B", force = 5, direction = "right" }},
]
"""


def write_frames(folder: Path, count: int) -> None:
    for n in range(count):
        text = FRAME.format(n=n, span=4 + n % 17 * 0.5, height=3 + n % 13 * 0.25, load=2 + n % 19)
        (folder / f"portal{n:04d}.toml").write_text(text, encoding="utf-8")


MEMORY = """\
import sys
from pathlib import Path
from crosscheck.suite.regress import chosen, run
frames = chosen([Path(sys.argv[1])])[: int(sys.argv[2])]
assert run(frames, [], workers=1).exit_status == 0
"""


def one_process(folder: Path, count: int) -> Spent:
    """What one process took that checked the first `count` frames."""
    return spent(["-c", MEMORY, str(folder), str(count)])


def started_each(folder: Path, numbers: range) -> list[Spent]:
    return [spent(["-m", "crosscheck", "regress", str(folder / f"portal{n:04d}.toml")]) for n in numbers]


def rows(count: int = FRAMES) -> list[Row]:
    """Ratios by the clock on all cores and by processor time, and memory of a fifth of the frames and of all."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        write_frames(folder, count)
        spent(["-m", "crosscheck", "record", str(folder), "--reason", "first issue"])
        single = started_each(folder, range(SAMPLE // 2))
        whole = spent(["-m", "crosscheck", "regress", str(folder)])
        single += started_each(folder, range(SAMPLE // 2, SAMPLE))
        few, many = one_process(folder, count // 5), one_process(folder, count)
    clock = statistics.median(s.clock for s in single) * count
    processor = statistics.median(s.processor for s in single) * count
    return [
        Row(f"   {count:,} frames, the program started for each / one run, by the clock", clock, whole.clock, LIMIT, True),
        Row("   the same by processor time, one process", processor, many.processor, LIMIT / 2, True),
        Row("   the same by processor time, what two idle cores would do", 2 * processor, many.processor, LIMIT, True),
        Row(f"   memory for {count:,} frames / for {count // 5:,}", many.megabytes, few.megabytes, FLAT, unit="MB"),
    ]


def main() -> int:
    print(HEAD)
    return show(rows(int(sys.argv[1]) if len(sys.argv) > 1 else FRAMES))


if __name__ == "__main__":
    raise SystemExit(main())
