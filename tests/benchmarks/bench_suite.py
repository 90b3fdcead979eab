"""A thousand standard frames in one run on two cores, against starting the program for each; and its memory.

Run by `python -m tests.benchmarks.bench_suite [FRAMES]`. The frames are generated: portals of every span and height, with
values on record. Starting the program for each (`crosscheck regress FRAME`, one after the other) is timed on a sample,
before and after the run so that both see the same machine, and extrapolated; the limit is a ratio of 20. Memory is the
largest resident set of one process that checks frames one after the other, a fifth of them and all. On a machine that is
busy with other things the clock says little; processor time, printed beside it, says what two idle cores would do.
"""

from __future__ import annotations

import os
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

FRAMES, SAMPLE = 1000, 10
LIMIT = 20.0

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


def run(*words: str) -> tuple[float, float]:
    """Seconds by the clock, and of processor time, of one `crosscheck` command, which must succeed. Processor time is
    that of the command's own process: a single frame is checked in it."""
    import resource  # not on Windows, where the frames of this module serve in tests all the same

    start, spent = time.perf_counter(), resource.getrusage(resource.RUSAGE_CHILDREN).ru_utime
    subprocess.run([sys.executable, "-m", "crosscheck", *words], stdout=subprocess.DEVNULL, check=True)
    return time.perf_counter() - start, resource.getrusage(resource.RUSAGE_CHILDREN).ru_utime - spent


MEMORY = """\
import resource, sys
from pathlib import Path
from crosscheck.suite.regress import chosen, run
frames = chosen([Path(sys.argv[1])])[: int(sys.argv[2])]
assert run(frames, [], workers=1).exit_status == 0
used = resource.getrusage(resource.RUSAGE_SELF)
print(used.ru_maxrss / 1024, used.ru_utime)
"""


def one_process(folder: Path, count: int) -> tuple[float, float]:
    """MB at most, and seconds of processor time, of one process for the first `count` frames."""
    words = [sys.executable, "-c", MEMORY, str(folder), str(count)]
    megabytes, seconds = subprocess.run(words, capture_output=True, text=True, check=True).stdout.split()
    return float(megabytes), float(seconds)


def started_each(folder: Path, numbers: range) -> list[tuple[float, float]]:
    return [run("regress", str(folder / f"portal{n:04d}.toml")) for n in numbers]


def main() -> None:
    count = int(sys.argv[1]) if len(sys.argv) > 1 else FRAMES
    os.environ["OPENBLAS_NUM_THREADS"] = "1"
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        write_frames(folder, count)
        recording, _ = run("record", str(folder), "--reason", "first issue")
        print(f"record {count} frames: {recording:.1f} s, {1000 * recording / count:.1f} ms a frame")
        single = started_each(folder, range(SAMPLE // 2))
        whole, _ = run("regress", str(folder))
        single += started_each(folder, range(SAMPLE // 2, SAMPLE))
        each, spent = (statistics.median(times) for times in zip(*single, strict=True))
        print(f"regress {count} frames on {os.cpu_count()} cores: {whole:.1f} s, {1000 * whole / count:.1f} ms a frame")
        print(f"starting the program for each: {each:.2f} s a frame (median of {len(single)})")
        print(f"ratio {each * count / whole:.1f} (limit {LIMIT:g})")
        (few, _), (many, together) = one_process(folder, count // 5), one_process(folder, count)
        print(f"processor time: {spent:.2f} s a frame started for each, {1000 * together / count:.0f} ms in one run; "
              f"ratio on two idle cores {2 * spent * count / together:.1f} (limit {LIMIT:g})")  # fmt: skip
        print(f"memory: {few:.0f} MB for {count // 5} frames, {many:.0f} MB for {count}")


if __name__ == "__main__":
    main()
