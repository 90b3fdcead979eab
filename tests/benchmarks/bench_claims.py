"""Time and memory of reading noise, 1 to 10 MB, and of a large right claim: `python -m tests.benchmarks.bench_claims`."""

from __future__ import annotations

import contextlib
import time
import tracemalloc

from crosscheck.claims import FrameNames, read_claim_text
from crosscheck.problems import UnusableInput
from tests.claim_frame import bent
from tests.test_claims_fuzz import _noise


def main() -> None:
    names = FrameNames.of(bent().frame)
    for kind in ("prose", "rows", "one line", "junk"):
        for megabytes in (1, 2, 5, 10):
            text = _noise(kind, megabytes * 1_000_000)
            start = time.process_time()
            with contextlib.suppress(UnusableInput):
                read_claim_text(text, names)
            print(f"{kind:<10} {megabytes:>3} MB {time.process_time() - start:8.1f} s", flush=True)
    text = _noise("prose", 1_000_000)
    tracemalloc.start()
    with contextlib.suppress(UnusableInput):
        read_claim_text(text, names)
    print(f"memory at most {tracemalloc.get_traced_memory()[1] / len(text):.0f} bytes a byte of prose")


if __name__ == "__main__":
    main()
