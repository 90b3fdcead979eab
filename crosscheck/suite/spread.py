"""Work on many frames spread over the cores: one process's death costs one frame, and none outlives its parent."""

from __future__ import annotations

import multiprocessing
import os
import threading
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import FIRST_COMPLETED, Future, ProcessPoolExecutor, wait
from concurrent.futures.process import BrokenProcessPool
from multiprocessing.context import BaseContext
from multiprocessing.process import BaseProcess
from typing import TypeVar

Item = TypeVar("Item")
Result = TypeVar("Result")

FEW = 4
"""Fewer items than this are not worth starting processes for."""
AHEAD = 4
"""Items handed out in advance for each worker, so that the waiting list does not grow with the set."""
PRELOAD = [
    "crosscheck.suite.regress", "crosscheck.frame.reader", "crosscheck.claims", "crosscheck.compare.closing",
    "crosscheck.opinions.slope_deflection", "crosscheck.opinions.moment_distribution", "crosscheck.opinions.library",
    "anastruct.fem.system",
]  # fmt: skip
"""Imported once, by the process that the workers are forked from."""


def spread(
    work: Callable[[Item], Result], items: Sequence[Item], lost: Callable[[Item], Result], workers: int | None = None
) -> Iterator[Result]:
    """Results of `work` in the order in which they are done; `lost` makes the result of an item whose process died.

    work and items must be such as can be sent to another process. workers: by default one a core.
    """
    workers = min(workers or os.cpu_count() or 1, len(items))
    if workers <= 1 or len(items) < FEW:
        yield from map(work, items)
        return
    done: set[int] = set()
    try:
        for k, result in _together(work, items, workers):
            done.add(k)
            yield result
    except BrokenProcessPool:
        # A worker died and took the pool along: what is not yet done is tried one a process, to find the one.
        for k, item in enumerate(items):
            if k not in done:
                yield _alone(work, item, lost)


def _together(
    work: Callable[[Item], Result], items: Sequence[Item], workers: int
) -> Iterator[tuple[int, Result]]:
    with ProcessPoolExecutor(workers, _context(), _end_with_parent) as pool:
        waiting: dict[Future[Result], int] = {}
        left = iter(enumerate(items))
        try:
            while True:
                for k, item in left:
                    waiting[pool.submit(work, item)] = k
                    if len(waiting) >= AHEAD * workers:
                        break
                if not waiting:
                    return
                for future in wait(waiting, return_when=FIRST_COMPLETED).done:
                    yield waiting.pop(future), future.result()
        finally:
            for future in waiting:
                future.cancel()


def _alone(work: Callable[[Item], Result], item: Item, lost: Callable[[Item], Result]) -> Result:
    try:
        with ProcessPoolExecutor(1, _context(), _end_with_parent) as pool:
            return pool.submit(work, item).result()
    except BrokenProcessPool:
        return lost(item)


def _context() -> BaseContext:
    """Never a plain fork: the parent has threads (a progress bar, a linear algebra library), and a fork would copy their
    locks."""
    if "forkserver" not in multiprocessing.get_all_start_methods():
        return multiprocessing.get_context("spawn")
    context = multiprocessing.get_context("forkserver")
    context.set_forkserver_preload(PRELOAD)
    return context


def _end_with_parent() -> None:
    """A worker that waits for work would wait for ever once its parent has been killed."""
    parent = multiprocessing.parent_process()
    if parent is not None:
        threading.Thread(target=_watch, args=(parent,), daemon=True).start()


def _watch(parent: BaseProcess) -> None:
    parent.join()
    os._exit(1)
