"""Reading and checking a frame file of 10,000 members against `tomllib.loads` of the same text.

Run by `python tests/benchmarks/bench_reader.py`. Both are timed in turn in one process, the best of several; the limit
is a ratio of 6. The second row reads the same file with three faults in it, located by line.
"""

from __future__ import annotations

import time
import tomllib
from collections.abc import Callable

from crosscheck.frame.reader import read_frame_text
from crosscheck.problems import UnusableInput

COLUMNS, STOREYS = 50, 103
ROUNDS = 7
LIMIT = 6.0


def frame_text(columns: int = COLUMNS, storeys: int = STOREYS) -> str:
    """A regular frame written out member by member, with loads on every beam; 10,000 members or a little over."""
    lines = ['title = "large"', 'units = "kN m"', "[materials.steel]", 'E = "210 GPa"', 'density = "7850 kg/m^3"']
    lines += ["[sections.post]", 'I = "8360 cm^4"', 'A = "53.8 cm^2"', "[joints]"]
    lines += [f"C{i}L{k} = [{6.0 * i}, {3.5 * k}]" for i in range(columns) for k in range(storeys)]
    lines += ["[members]"]
    columns_up = [(f"C{i}L{k}", f"C{i}L{k + 1}") for i in range(columns) for k in range(storeys - 1)]
    beams = [(f"C{i}L{k}", f"C{i + 1}L{k}") for i in range(columns - 1) for k in range(1, storeys)]
    like = 'section = "post", material = "steel"'
    lines += [f'"{a}-{b}" = {{ {like} }}' for a, b in columns_up]
    lines += [f'"{a}-{b}" = {{ {like}, spring_from = "4500 kN m/rad" }}' for a, b in beams]
    lines += ["[supports]", *(f'C{i}L0 = "fixed"' for i in range(columns))]
    lines += ["[loads.dead]", "apply = [", "  { self_weight = 1.0 },"]
    lines += [f'  {{ member = "{a}-{b}", uniform = 8.5, direction = "down", end = "40%" }},' for a, b in beams]
    return "\n".join([*lines, "]", "[combinations]", "strength = { dead = 1.35 }", ""])


def faulty(text: str) -> str:
    """The same with three faults, one in the last load."""
    text = text.replace('"C3L7-C3L8" = { section = "post"', '"C3L7-C3L8" = { section = "pots"')
    text = text.replace("C5L9 = [30.0, 31.5]", "C5L9 = [30.0, true]")
    last = text.rindex('"down"')
    return text[:last] + '"dwon"' + text[last + 6 :]


def read_faulty(text: str) -> None:
    try:
        read_frame_text(text)
    except UnusableInput as error:
        assert len(error.problems) == 3 and all(p.line for p in error.problems), error
        return
    raise AssertionError("three faults were not found")


def timed(act: Callable[[], object]) -> float:
    start = time.perf_counter()
    act()
    return time.perf_counter() - start


def main() -> None:
    text = frame_text()
    bad = faulty(text)
    acts: dict[str, Callable[[], object]] = {
        "tomllib.loads": lambda: tomllib.loads(text),
        "read and checked": lambda: read_frame_text(text),
        "with three faults, by line": lambda: read_faulty(bad),
    }
    best = dict.fromkeys(acts, float("inf"))
    for _ in range(ROUNDS):
        for name, act in acts.items():
            best[name] = min(best[name], timed(act))
    print(f"{len(tomllib.loads(text)['members'])} members, {len(text) / 1e6:.2f} MB, best of {ROUNDS}")
    for name, seconds in best.items():
        print(f"{name:<28}{1000 * seconds:8.0f} ms   ratio {seconds / best['tomllib.loads']:5.2f} (limit {LIMIT:g})")


if __name__ == "__main__":
    main()
