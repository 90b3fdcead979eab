"""The whole sweep of single mistakes against solving again for each, and verify against opinions.

    OPENBLAS_NUM_THREADS=1 python -m tests.benchmarks.bench_suspects [12 100 400]

Frames are regular grids with every beam loaded and two mistakes in turn: a foot pinned, and a beam's load left out.
"Solving again" is measured on an even sample of the same changes and scaled up.
"""

from __future__ import annotations

import sys
import time
from dataclasses import replace

import numpy as np

from crosscheck import check
from crosscheck.frame.kinematics import study
from crosscheck.frame.model import (
    FREE,
    HELD,
    Frame,
    Joint,
    JointForce,
    LoadCase,
    Material,
    Member,
    Section,
    Spread,
    Support,
    Units,
)
from crosscheck.opinions import slope_deflection
from crosscheck.opinions.slope_deflection.prepared import prepared
from crosscheck.suspects import search
from crosscheck.suspects.loads import every_load_option
from crosscheck.suspects.members import every_member_option
from crosscheck.suspects.supports import every_support_option
from tests.corpus import CLAIM, claim_values, closed_claim, judged, opinions_on

SIZES = {12: (2, 2), 100: (4, 11), 400: (7, 27)}
"""Bays and storeys of a grid with about so many members."""


def grid(bays: int, storeys: int) -> Frame:
    """A regular frame: every beam under a spread load, every floor pushed."""
    name = lambda i, k: f"{chr(65 + i)}{k}"  # noqa: E731
    joints = {name(i, k): Joint(name(i, k), 6.0 * i, 3.5 * k) for k in range(storeys + 1) for i in range(bays + 1)}
    members: dict[str, Member] = {}
    for k in range(storeys):
        for i in range(bays + 1):
            key = f"{name(i, k)}-{name(i, k + 1)}"
            members[key] = Member(key, name(i, k), name(i, k + 1), "column", "steel")
        for i in range(bays):
            key = f"{name(i, k + 1)}-{name(i + 1, k + 1)}"
            members[key] = Member(key, name(i, k + 1), name(i + 1, k + 1), "beam", "steel")
    beams = [m for m in members.values() if m.section == "beam"]
    loads = [Spread(k, m.name, 20.0 + k % 3, 20.0 + k % 3, 270.0, 0.0, 6.0) for k, m in enumerate(beams)]
    pushes = [JointForce(len(beams) + k, name(0, k), 10.0, 0.0) for k in range(1, storeys + 1)]
    return Frame(
        title=f"{bays} by {storeys}", units=Units("kN", "m", 1000.0, 1.0), materials={"steel": Material("steel", 210e6)},
        sections={"column": Section("column", 2e-4, 1e-2), "beam": Section("beam", 3e-4, 9e-3)},
        joints=joints, members=members,
        supports={name(i, 0): Support(name(i, 0), HELD, HELD, HELD) for i in range(bays + 1)},
        cases={"all": LoadCase("all", (*loads, *pushes))},
    )  # fmt: skip


def clock(do, least: float = 0.0) -> float:  # type: ignore[no-untyped-def]
    start = time.process_time()
    do()
    return time.process_time() - start


def one(size: int) -> None:
    frame = grid(*SIZES[size])
    foot = next(iter(frame.supports))
    pinned = replace(frame, supports={**frame.supports, foot: Support(foot, HELD, HELD, FREE)})
    answer = slope_deflection.opine(pinned, study(pinned))
    closed = closed_claim(claim_values(pinned, answer, "all", "all", 4, True))
    opinions = opinions_on(frame)
    claims = judged(frame, opinions, closed)
    start = time.process_time()
    found = search(frame, opinions, closed, claims, CLAIM)
    sweep = time.process_time() - start
    said = found.suspects[0].says if found.suspects else found.why
    count, again = changes(frame, opinions, closed)
    print(f"{len(frame.members):4d} members: {count} single mistakes; sweep {sweep:.2f} s ({found.solved} solved again); "
          f"solving each {again:.1f} s: {again / sweep:.0f} times; first: {said}")  # fmt: skip


def changes(frame: Frame, opinions: check.Opinions, closed) -> tuple[int, float]:  # type: ignore[no-untyped-def]
    """How many single mistakes the sweep weighs, and how long solving again for each would take."""
    every = [*every_support_option(frame), *every_member_option(frame), *every_load_option(frame)]
    sample = every[:: max(1, len(every) // 40)]

    def solve() -> None:
        for change in sample:
            try:
                prepared(change.frame(frame)).answer(["all"])
            except (ArithmeticError, np.linalg.LinAlgError):
                continue

    return len(every), clock(solve) * len(every) / len(sample)


def verify_against_opinions(size: int = 100) -> None:
    """How long all of a verification takes beside the opinions alone: asking, judging the claim, auditing, suspects.

    The opinions are asked as a command would: for the first time, the library's qualification included.
    """
    frame = grid(*SIZES[size])
    foot = next(iter(frame.supports))
    pinned = replace(frame, supports={**frame.supports, foot: Support(foot, HELD, HELD, FREE)})
    closed = closed_claim(claim_values(pinned, slope_deflection.opine(pinned, study(pinned)), "all", "all", 4, True))
    start = time.process_time()
    opinions = check.ask(frame)
    asked = time.process_time() - start
    start = time.process_time()
    claims = judged(frame, opinions, closed)
    check._audit(frame, opinions, closed, "all")
    search(frame, opinions, closed, claims, CLAIM)
    rest = time.process_time() - start
    whole = asked + rest
    print(f"{len(frame.members)} members: opinions {asked:.2f} s, verify {whole:.2f} s: {whole / asked:.1f} times")


if __name__ == "__main__":
    for wanted in [int(a) for a in sys.argv[1:]] or list(SIZES):
        one(wanted)
    verify_against_opinions()
