"""python -m tests.mutation ROOM [COUNT [SEED]], or `all`. Exit 1 where a mutant survives that is not in known.toml."""

from __future__ import annotations

import os
import sys


def main(arguments: list[str]) -> int:
    if not hasattr(os, "fork"):
        print("this system cannot fork: run it on Linux or macOS")
        return 2
    os.environ["OPENBLAS_NUM_THREADS"] = os.environ["OMP_NUM_THREADS"] = "1"
    os.nice(int(os.environ.get("NICE", "10")))
    from tests.mutation.rooms import ROOMS, ROOT
    from tests.mutation.run import examine

    os.chdir(ROOT)
    chosen = arguments[0] if arguments else ""
    if chosen != "all" and chosen not in ROOMS:
        print(f"python -m tests.mutation ROOM [COUNT [SEED]]; rooms: all, {', '.join(ROOMS)}")
        return 2
    survivors = []
    for name in ROOMS if chosen == "all" else [chosen]:
        count, seed = (int(a) for a in [*arguments[1:3], *([ROOMS[name].count, ROOMS[name].seed][len(arguments[1:3]) :])])
        survivors += examine(name, count, seed)
    return 1 if survivors else 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
