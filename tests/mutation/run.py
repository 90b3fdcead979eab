"""One forked process a mutant: noticed by the comparison on cases/, by the tests, or by nobody."""

from __future__ import annotations

import io
import os
import random
import resource
import signal
import sys
import time
import warnings
from collections import Counter
from collections.abc import Callable, Sequence
from contextlib import redirect_stderr, redirect_stdout
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path

import pytest

from crosscheck.answer import Answer, Silent, joined
from crosscheck.check import OPINIONS, Opinions, _ask_one, ask, situations
from crosscheck.compare.opinions import Comparison
from crosscheck.frame.kinematics import Study, study
from crosscheck.frame.model import Frame
from crosscheck.frame.needs import with_analysis
from crosscheck.frame.reader import read_frame
from crosscheck.problems import UnusableInput
from tests.mutation.alter import Mutant, mutants
from tests.mutation.patch import caches, install
from tests.mutation.rooms import ROOMS, ROOT, Room, known

SECONDS = 150
"""CPU seconds after which a mutant counts as noticed: it makes somebody wait."""
BECAME = {
    1: "by comparison", 2: "by comparison, another idealisation", 3: "fell silent, aloud", 5: "not installed",
}  # fmt: skip
PLAIN = ("--assert=plain", "-W", "ignore::pytest.PytestAssertRewriteWarning")
"""The package is imported before pytest sees it, which it warns of."""
MOST = 16
"""Members of the largest demonstration frame asked; two have more, and take as long as all others together."""
OTHERWISE = 3
"""Frames of cases/ asked under each other idealisation."""
SURVIVED, DISAGREES, DISAGREES_OTHERWISE, SILENT, FAILED, NOT_INSTALLED = range(6)


@dataclass(frozen=True)
class Heard:
    """A demonstration frame in one idealisation, as everybody saw it before anything was altered."""

    title: str
    found: Opinions
    otherwise: bool = False

    @cached_property
    def asked(self) -> list[tuple[Frame, Study, tuple[str, ...]]]:
        """The frame in each state and order that it is asked in, with what all opinions are told of it."""
        return [(plain, study(plain), group) for plain, group in situations(self.found.frame, self.found.names)]

    def said_by(self, opinion: str) -> Answer | Silent:
        """What an opinion says now, as `check.ask` hears it."""
        return joined([(group, _ask_one(opinion, plain, told, group, False)) for plain, told, group in self.asked])


def demonstrations() -> list[Heard]:
    """Frames of cases/ as stated, smallest first; then some with another idealisation that they can stand."""
    recorded = sorted((ROOT / "cases").glob("*.record.toml"))
    frames = [read_frame(p.with_name(p.name.removesuffix(".record.toml") + ".toml")) for p in recorded]
    frames = sorted((f for f in frames if len(f.members) <= MOST), key=lambda f: len(f.members) * len(f.names))
    heard = [Heard(f.title, ask(f)) for f in frames]
    for kind in ("order", "axial", "shear"):
        changed = [f for f in (_otherwise(frame, kind) for frame in frames) if f is not None]
        found = [_asked(frame) for frame in changed[:OTHERWISE]]
        heard += [Heard(f"{f.frame.title}, {kind}", f, True) for f in found if f is not None and f.verdict == "agree"]
    return heard


def _asked(frame: Frame) -> Opinions | None:
    try:
        return ask(frame)
    except UnusableInput:
        return None


def _otherwise(frame: Frame, kind: str) -> Frame | None:
    a = frame.analysis
    other = {
        "order": 2, "axial": "rigid" if a.axial == "elastic" else "elastic",
        "shear": "elastic" if a.shear == "rigid" else "rigid",
    }  # fmt: skip
    try:
        return with_analysis(frame, **{kind: other[kind]})  # type: ignore[arg-type]
    except UnusableInput:
        return None


def within_reach(room: Room, heard: list[Heard], module: str) -> list[Heard]:
    """The demonstrations in which a module has any part."""
    if module in room.unheard:
        return []
    order = 2 if module in room.second_order else 1
    return [h for h in heard if any(plain.analysis.order == order for plain, _, _ in h.asked)]


def compared(room: Room, heard: list[Heard]) -> int:
    """What `crosscheck opinions` makes of the altered opinion: all others as they were."""
    warnings.simplefilter("ignore")
    for one in heard:
        before = one.found
        if room.opinion not in before.answers:
            continue
        try:
            said = one.said_by(room.opinion)
        except UnusableInput:
            return SILENT
        if not isinstance(said, Answer) or dict(said.silent) != dict(before.answers[room.opinion].silent):
            return SILENT
        # The others agree with each other as before: one of them is enough, ours rather than the library.
        other = next(o for o in OPINIONS if o in before.answers and o != room.opinion)
        comparison = Comparison(before.frame, {other: before.answers[other], room.opinion: said})
        try:
            disagree = any(comparison.judge(name).verdict == "disagree" for name in said.cases)
        except Exception:  # noqa: BLE001
            return SILENT
        if disagree:
            return DISAGREES_OTHERWISE if one.otherwise else DISAGREES
    return SURVIVED


def tested(tests: Sequence[str]) -> int:
    with redirect_stdout(io.StringIO()), redirect_stderr(io.StringIO()):
        for test in tests:
            status = pytest.main([*test.split(), "-x", "-q", "-p", "no:cacheprovider", "--tb=no", *PLAIN])
            if status != 0:
                return FAILED
    return SURVIVED


def in_a_fork(work: Callable[[], int]) -> int:
    """Exit status of some work done in a child of this process; FAILED where it runs too long or dies."""
    child = os.fork()
    if child == 0:
        status = FAILED
        try:
            resource.setrlimit(resource.RLIMIT_CPU, (SECONDS, SECONDS + 1))
            resource.setrlimit(resource.RLIMIT_AS, (8 << 30, 8 << 30))
            status = work()
        except BaseException:  # noqa: BLE001 - the child must end here
            status = FAILED
        finally:
            os._exit(status)
    try:
        _, ended = os.waitpid(child, 0)
    except KeyboardInterrupt:
        os.kill(child, signal.SIGKILL)
        raise
    return os.waitstatus_to_exitcode(ended) if os.WIFEXITED(ended) else FAILED


def drawn(room: Room, count: int, seed: int) -> list[Mutant]:
    """The fixed sample: as many of all mutants of the room as asked for, or all."""
    every = [m for path in room.modules for m in mutants(path, ROOT)]
    return random.Random(seed).sample(every, min(count, len(every)))


def warm(room: Room) -> None:
    """Import and collect everything once, so that each child finds it done."""
    with redirect_stdout(io.StringIO()), redirect_stderr(io.StringIO()):
        files = {test.split()[0] for test in room.every_test}
        pytest.main([*files, "--collect-only", "-q", "-p", "no:cacheprovider", *PLAIN])
    exact = sys.modules.get("tests.test_exact")
    for title in exact.FRAMES if exact else ():
        exact.solved(title)  # type: ignore[union-attr]
    caches()


def examine(name: str, count: int, seed: int) -> list[Mutant]:
    """Run a room's sample and print what became of it; the survivors that are not known to change nothing."""
    room, started = ROOMS[name], time.monotonic()
    chosen = drawn(room, count, seed)
    heard = demonstrations() if room.opinion else []
    if room.opinion and in_a_fork(lambda: compared(room, heard)) != SURVIVED:
        raise SystemExit(f"{name}: the unaltered opinion does not pass the comparison")
    warm(room)
    for test in room.every_test:
        if in_a_fork(lambda test=test: tested([test])) != SURVIVED:  # type: ignore[misc]
            raise SystemExit(f"{name}: {test} fails unaltered, or takes too long")
    tally, survivors, excused = Counter[str](), [], known()
    for k, mutant in enumerate(chosen):
        became = _became(room, heard, mutant)
        if became == "survived" and mutant.key in excused:
            became = "equivalent"
        tally[became] += 1
        if became == "survived":
            survivors.append(mutant)
            print(f"  survived: {mutant.file}:{mutant.line} [{mutant.kind}] {mutant.key}", flush=True)
        if (k + 1) % 20 == 0:
            print(f"  {k + 1}/{len(chosen)}: {dict(tally)} {time.monotonic() - started:.0f} s", file=sys.stderr, flush=True)
    _report(name, seed, chosen, tally, time.monotonic() - started)
    return survivors


def _became(room: Room, heard: list[Heard], mutant: Mutant) -> str:
    module = Path(mutant.file).stem

    def first() -> int:
        try:
            install(mutant, ROOT)
        except LookupError:
            return NOT_INSTALLED
        return compared(room, within_reach(room, heard, module)) if room.opinion else SURVIVED

    def second() -> int:
        install(mutant, ROOT)
        return tested(room.who_notices(module))

    status = in_a_fork(first)
    if status == SURVIVED:
        return "by the tests" if in_a_fork(second) == FAILED else "survived"
    return BECAME.get(status, "crashed")


def _report(name: str, seed: int, chosen: list[Mutant], tally: Counter[str], seconds: float) -> None:
    real = len(chosen) - tally["equivalent"] - tally["not installed"]
    caught = real - tally["survived"]
    kinds = ", ".join(f"{n} {kind}" for kind, n in sorted(Counter(m.kind for m in chosen).items()))
    print(f"{name}: {len(chosen)} mutants (seed {seed}; {kinds}); {caught} of {real} noticed ({caught / max(real, 1):.1%})")
    print(f"  {', '.join(f'{n} {what}' for what, n in tally.most_common())}; {seconds:.0f} s")
    if OPINIONS.keys() & {ROOMS[name].opinion}:
        stated = tally["by comparison"]
        every = stated + tally["by comparison, another idealisation"]
        alone = f"{stated / max(real, 1):.1%} as stated, {every / max(real, 1):.1%} with the other idealisations"
        print(f"  by the comparison on cases/ alone: {alone}")
