"""Whatever is pasted, the reader answers with a Reading or its own refusal: no other error, no hang, no flood of memory."""

from __future__ import annotations

import contextlib
import random
import string
import time
import tracemalloc

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from crosscheck.claims import FrameNames, Reading, read_claim_text, show_reading
from crosscheck.claims.decode import decode
from crosscheck.compare.closing import close
from crosscheck.compare.tolerance import CLAIM
from crosscheck.problems import UnusableInput
from tests.claim_frame import bent

FEW = settings(max_examples=60, deadline=None, suppress_health_check=list(HealthCheck))
WORDS = st.sampled_from(
    ["Member", "Joint", "End", "N", "V", "M", "[kN]", "(kNm)", "max", "x", "A-B", "B", "rafter", "1.5", "-2,5",
    "1,234.5", "3-",
     "(4)", "1e3", "kN", "mm", "Load case:", "dead", "total", "|", ";", "\t", ",", "  ", "\n", "\n\n", "---",
     "Reactions", "Fx",
     "dx", "node", "i", "j", "None", "nan", "12 kNm", "sway", "page 3", "(0, 0)", "%", "x/L", "=", ":", '"', "\u2212",
     "\ufeff"]
)  # fmt: skip


def answered(text: str) -> Reading | None:
    """The reading, closed and shown as well, or None where it is refused."""
    k = bent()
    try:
        reading = read_claim_text(text, FrameNames.of(k.frame))
    except UnusableInput:
        return None
    close(reading, k.frame, k.answers, None, CLAIM)
    show_reading(reading)
    return reading


@FEW
@given(st.text(max_size=400))
def test_any_text(text: str) -> None:
    answered(text)


@FEW
@given(st.lists(WORDS, max_size=80))
def test_words_of_the_trade_in_any_order(words: list[str]) -> None:
    answered(" ".join(words))


@FEW
@given(st.binary(max_size=300))
def test_any_bytes(data: bytes) -> None:
    try:
        text = decode(data)
    except UnusableInput:
        return
    answered(text)


@FEW
@given(st.integers(0, 2000), st.integers(0, 40), st.text(max_size=6))
def test_a_right_claim_with_text_cut_out_and_put_in(at: int, cut: int, put: str) -> None:
    text = "Load case: dead\n" + bent().ends("dead") + bent().reactions("dead")
    answered(text[: at % len(text)] + put + text[at % len(text) + cut :])


def _noise(kind: str, size: int) -> str:
    r = random.Random(size)
    if kind == "prose":
        words = ["".join(r.choices(string.ascii_lowercase, k=r.randint(1, 9))) for _ in range(300)] + [
            "12.3",
            "A",
            "kN",
            "-4,5",
        ]
        return "\n".join(" ".join(r.choices(words, k=9)) for _ in range(size // 50))
    if kind == "rows":
        return "Member\tEnd\tN\tV\tM\n" + "A-B\tA\t1.0\t2.0\t3.0\n" * (size // 20)
    if kind == "one line":
        return "1,2;3\t4|" * (size // 8)
    return "".join(r.choices(string.printable, k=size))


@pytest.mark.parametrize("kind", ["prose", "rows", "one line", "junk"])
def test_time_grows_no_faster_than_the_text(kind: str) -> None:
    """Four times the text takes at most seven times as long (timings of short runs scatter)."""
    names = FrameNames.of(bent().frame)

    def spent(size: int) -> float:
        text = _noise(kind, size)
        best = float("inf")
        for _ in range(2):
            start = time.process_time()
            with contextlib.suppress(UnusableInput):
                read_claim_text(text, names)
            best = min(best, time.process_time() - start)
        return best

    assert spent(80_000) <= 7 * spent(20_000) + 0.05


def test_memory_stays_a_small_multiple_of_the_text() -> None:
    text = _noise("prose", 300_000)
    names = FrameNames.of(bent().frame)
    tracemalloc.start()
    with contextlib.suppress(UnusableInput):
        read_claim_text(text, names)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert peak < 60 * len(text)
