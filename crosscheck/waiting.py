"""A line on standard error while something takes longer than a second, where that is a terminal; nothing otherwise."""

from __future__ import annotations

import contextlib
import sys
import threading
import time
from collections.abc import Iterator
from typing import TextIO

PATIENCE = 1.0
"""Seconds before anything is said."""
STEP = 0.5
WIDTH = 60


@contextlib.contextmanager
def waiting(doing: str, stream: TextIO | None = None, patience: float = PATIENCE) -> Iterator[None]:
    """While the block runs, say what is being done and for how long; the line is wiped when the block ends."""
    out = stream if stream is not None else sys.stderr
    if not out.isatty():
        yield
        return
    done = threading.Event()
    speaker = threading.Thread(target=_speak, args=(doing, out, patience, done), daemon=True)
    speaker.start()
    try:
        yield
    finally:
        done.set()
        speaker.join()


def _speak(doing: str, out: TextIO, patience: float, done: threading.Event) -> None:
    began = time.monotonic()
    if done.wait(patience):
        return
    while True:
        _write(out, f"{doing} ... {time.monotonic() - began:.0f} s"[:WIDTH])
        if done.wait(STEP):
            _write(out, "")
            return


def _write(out: TextIO, text: str) -> None:
    """Over what stands on the line. A terminal that went away is nobody's to tell."""
    with contextlib.suppress(OSError, ValueError):
        out.write(f"\r{text:<{WIDTH}}\r{text}")
        out.flush()
