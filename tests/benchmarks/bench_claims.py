"""Time and memory of reading noise, 1 to 10 MB: `python -m tests.benchmarks.bench_claims`.

Processor time, and how many times the time of 1 MB it is: no more than the megabytes where time is linear."""

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
        first = 0.0
        for megabytes in (1, 2, 5, 10):
            text = _noise(kind, megabytes * 1_000_000)
            start = time.process_time()
            with contextlib.suppress(UnusableInput):
                read_claim_text(text, names)
            spent = time.process_time() - start
            first = first or spent
            print(f"{kind:<10} {megabytes:>3} MB {spent:8.2f} s, {spent / first:5.1f} times 1 MB", flush=True)
    for kind in ("prose", "rows", "junk"):
        text = _noise(kind, 1_000_000)
        tracemalloc.start()
        with contextlib.suppress(UnusableInput):
            read_claim_text(text, names)
        print(f"{kind:<10} memory at most {tracemalloc.get_traced_memory()[1] / len(text):.0f} bytes a byte", flush=True)
        tracemalloc.stop()


if __name__ == "__main__":
    main()
