"""The qualification: before the library's word counts, it sits closed-form cases on the version installed here.

Each feature is a fact of the trade with a closed form; only those that a frame uses are tried, once in a process. They
go the same way as a user's frame does, restatements included, so that a library that has changed inside, and no longer
does what a restatement counts on, makes the opinion abstain.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from functools import cache
from typing import Literal

import numpy as np

from crosscheck.frame.loads import LoadTable, load_table
from crosscheck.frame.model import (
    FREE,
    HELD,
    Analysis,
    Bools,
    Frame,
    Joint,
    JointCouple,
    JointForce,
    Load,
    LoadCase,
    Material,
    Member,
    PointCouple,
    PointForce,
    Section,
    Spread,
    Support,
    Units,
)
from crosscheck.opinions.library.model import Unfit
from crosscheck.opinions.library.results import reactions, solve_case

QUALIFIED = 1e-8
"""Largest error of a trial, whose values are all of order one."""
E, I, A, L, SLOPE = 2.0, 3.0, 5.0, 4.0, 35.0  # noqa: E741 - the trade's name
"""One beam of unit-free numbers, at a slope and far from the origin, serves every trial but the portal."""
EI, EA = E * I, E * A
COS, SIN = math.cos(math.radians(SLOPE)), math.sin(math.radians(SLOPE))

FAILS = "the version installed fails its qualification in"

Expected = tuple[str, tuple[int, ...], float]
"""Array ("ends", "joints" or "reactions"), index in it, value."""


@dataclass(frozen=True, slots=True)
class Trial:
    """A frame with one case, and what it gives; source: where the closed form is found."""

    frame: Frame
    expected: tuple[Expected, ...]
    source: str


@dataclass(frozen=True, slots=True)
class Feature:
    """What a frame may use, how to see that it does, and the trials that must succeed then."""

    name: str
    used: Callable[[Frame, Sequence[LoadTable]], bool]
    trials: Callable[[], Iterable[Trial]]


def failure(frame: Frame, tables: Iterable[LoadTable]) -> str:
    """Why the installed library may not speak for this frame, or ""."""
    tables = list(tables)
    return next((why for f in FEATURES if f.used(frame, tables) and (why := outcome(f))), "")


@cache
def outcome(feature: Feature) -> str:
    """What went wrong in the feature's trials, or ""."""
    for trial in feature.trials():
        try:
            error = _error(trial)
        except Unfit as unfit:
            return f"{FAILS} {feature.name}: {unfit}"
        if not error <= QUALIFIED:
            return f"{FAILS} {feature.name}: off by {error:.1e} from {trial.source}"
    return ""


def _error(trial: Trial) -> float:
    table = load_table(trial.frame, "c")
    solved = solve_case(trial.frame, table)
    arrays = {"ends": solved.ends, "joints": solved.joints, "reactions": reactions(trial.frame, table, solved.ends)}
    return max(abs(float(arrays[name][index]) - value) for name, index, value in trial.expected)


# --- frames to try -------------------------------------------------------------------------------------------------


def _frame(
    joints: Sequence[Joint],
    members: Sequence[Member],
    supports: Sequence[Support],
    loads: Sequence[Load],
    axial: Literal["elastic", "rigid"] = "elastic",
) -> Frame:
    return Frame(
        title="", units=Units("kN", "m", 1e3, 1.0),
        materials={"m": Material("m", E)}, sections={"s": Section("s", I, A)},
        joints={j.name: j for j in joints}, members={m.name: m for m in members},
        supports={s.joint: s for s in supports}, cases={"c": LoadCase("c", tuple(loads))},
        analysis=Analysis(axial=axial),
    )  # fmt: skip


def _beam(*loads: Load, at_b: Support | None = None, turn: tuple[float, float] = (HELD, HELD)) -> Frame:
    """From A, fixed, to B: free, or supported as `at_b` says."""
    x, y = 1000.1, -200.3
    return _frame(
        [Joint("A", x, y), Joint("B", x + L * COS, y + L * SIN)],
        [Member("AB", "A", "B", "s", "m", *turn)],
        [Support("A", HELD, HELD, HELD), *([at_b] if at_b else [])],
        loads,
    )


FIXED_B = Support("B", HELD, HELD, HELD)
PINNED_B = Support("B", HELD, HELD, FREE)


def _ends(*moments: float) -> tuple[Expected, ...]:
    """End moments of member 0, clockwise."""
    return tuple(("ends", (0, end, 2), value) for end, value in enumerate(moments))


def _moved(x: float, y: float, joint: int = 1) -> tuple[Expected, ...]:
    return ("joints", (joint, 0), x), ("joints", (joint, 1), y)


# --- closed forms --------------------------------------------------------------------------------------------------

TABLES = "tables of beam deflections and fixed-end moments"


def _bending() -> Iterable[Trial]:
    along, across, couple = 2.0, 0.3, 0.7
    u, v = along * L / EA, across * L**3 / (3 * EI) - couple * L**2 / (2 * EI)
    yield Trial(
        _beam(JointForce(0, "B", along, SLOPE), JointForce(0, "B", across, SLOPE + 90), JointCouple(0, "B", couple)),
        (*_moved(u * COS - v * SIN, u * SIN + v * COS), *_ends(across * L - couple, couple), ("ends", (0, 0, 0), along),
         ("joints", (1, 2), couple * L / EI - across * L**2 / (2 * EI)), ("reactions", (0, 2), across * L - couple)),
        TABLES,
    )  # fmt: skip


def _line_loads() -> Iterable[Trial]:
    (p, r), (q, w) = (0.8, -0.3), (1.1, 0.4)
    moments = L**2 * (3 * q + 2 * w) / 60, -(L**2) * (2 * q + 3 * w) / 60
    yield Trial(
        _beam(Spread(0, "AB", p, r, "along", 0, L), Spread(0, "AB", q, w, "across", 0, L), at_b=FIXED_B),
        (*_ends(*moments), ("ends", (0, 0, 1), -L * (7 * q + 3 * w) / 20),
         ("ends", (0, 0, 0), L * (2 * p + r) / 6), ("ends", (0, 1, 0), -L * (p + 2 * r) / 6)),
        TABLES,
    )  # fmt: skip


def _within() -> Iterable[Trial]:
    yield _point_loads(1.3)


def _point_loads(a: float) -> Trial:
    """A force and a couple at a: Pab^2/L^2 and Pa^2b/L^2, Cb(2a - b)/L^2 and Ca(2b - a)/L^2."""
    b, force, couple = L - a, 0.9, 0.6
    return Trial(
        _beam(PointForce(0, "AB", force, "across", a), PointCouple(0, "AB", couple, a), at_b=FIXED_B),
        _ends(
            force * a * b**2 / L**2 + couple * b * (2 * a - b) / L**2,
            -force * a**2 * b / L**2 + couple * a * (2 * b - a) / L**2,
        ),
        TABLES,
    )


def _between_places() -> Iterable[Trial]:
    """Loads too near an end, or too short, to divide a member for: they are restated."""
    yield _point_loads(0.004 * L)
    s, e, q = 0.3 * L, 0.31 * L, 30.0
    moment = [q * (L**2 * x**2 / 2 - 2 * L * x**3 / 3 + x**4 / 4) / L**2 for x in (s, e)]
    far = [q * (L * x**3 / 3 - x**4 / 4) / L**2 for x in (s, e)]
    yield Trial(
        _beam(Spread(0, "AB", q, q, "across", s, e), at_b=FIXED_B),
        _ends(moment[1] - moment[0], far[0] - far[1]),
        TABLES + ": the point force integrated",
    )


def _hinges() -> Iterable[Trial]:
    load = Spread(0, "AB", 1.2, 1.2, "across", 0, L)
    yield Trial(_beam(load, at_b=FIXED_B, turn=(HELD, FREE)), _ends(1.2 * L**2 / 8, 0.0), TABLES)
    shear: Expected = ("ends", (0, 0, 1), -0.6 * L)
    yield Trial(_beam(load, at_b=FIXED_B, turn=(FREE, FREE)), (*_ends(0.0, 0.0), shear), "statics")
    # Moment distribution at B: 3EI/L towards the far hinge, 4EI/L towards the far fixed end, carry-over a half.
    yield Trial(
        _frame(
            [Joint("A", -L, 0), Joint("B", 0, 0), Joint("C", L, 0)],
            [Member("AB", "A", "B", "s", "m", turn_from=FREE), Member("BC", "B", "C", "s", "m")],
            [Support("A", HELD, HELD, HELD), PINNED_B, Support("C", HELD, HELD, HELD)],
            [JointCouple(0, "B", 0.7)],
        ),
        (*_ends(0.0, 0.3), ("ends", (1, 0, 2), 0.4), ("ends", (1, 1, 2), 0.2)),
        "H. Cross, Trans. ASCE 96 (1932), 1-10: stiffness and carry-over factors",
    )


def _couple_inside_hinge() -> Iterable[Trial]:
    load = PointCouple(0, "AB", 0.8, L)
    yield Trial(
        _beam(load, at_b=FIXED_B, turn=(HELD, FREE)),
        (*_ends(0.4, 0.0), ("ends", (0, 0, 1), -1.5 * 0.8 / L)),
        "H. Cross, Trans. ASCE 96 (1932), 1-10: carry-over factor",
    )


def _semi_rigid() -> Iterable[Trial]:
    k, q = 1.7, 1.2
    r, full = EI / (k * L), q * L**2 / 12
    load, source = Spread(0, "AB", q, q, "across", 0, L), TABLES + " with the connection's rotation added"
    yield Trial(_beam(load, at_b=FIXED_B, turn=(k, k)), _ends(full / (1 + 2 * r), -full / (1 + 2 * r)), source)
    yield Trial(
        _beam(load, at_b=FIXED_B, turn=(HELD, k)), _ends(full * (1 + 6 * r) / (1 + 4 * r), -full / (1 + 4 * r)), source
    )


def _springs() -> Iterable[Trial]:
    k, force = 0.4, 0.9
    v = force / (3 * EI / L**3 + k)
    yield Trial(
        _beam(JointForce(0, "B", force, SLOPE + 90), at_b=Support("B", FREE, k, FREE, SLOPE)),
        (*_moved(-v * SIN, v * COS), ("reactions", (1, 0), k * v * SIN), ("reactions", (1, 1), -k * v * COS)),
        "stiffnesses side by side add",
    )
    turned = force / (4 * EI / L + k)
    yield Trial(
        _beam(JointCouple(0, "B", force), at_b=Support("B", HELD, HELD, k)),
        (("joints", (1, 2), turned), ("reactions", (1, 2), -k * turned)),
        "stiffnesses side by side add",
    )


def _turned_rollers() -> Iterable[Trial]:
    """B slides along a line 20 degrees off the member's axis, turning freely or not."""
    force, off, push = 1.3, math.radians(20), math.radians(50)
    for rotation, bending in ((FREE, 3.0), (HELD, 12.0)):
        slide = force * math.cos(push - off) / (EA / L * math.cos(off) ** 2 + bending * EI / L**3 * math.sin(off) ** 2)
        line = math.radians(SLOPE) + off
        yield Trial(
            _beam(JointForce(0, "B", force, SLOPE + 50), at_b=Support("B", FREE, HELD, rotation, SLOPE + 20)),
            _moved(slide * math.cos(line), slide * math.sin(line)),
            "one freedom: force over stiffness along it",
        )


def _axially_rigid() -> Iterable[Trial]:
    h, H = 3.0, 0.5
    yield Trial(
        _frame(
            [Joint("A", 0, 0), Joint("B", 0, h), Joint("C", L, h), Joint("D", L, 0)],
            [Member("AB", "A", "B", "s", "m"), Member("BC", "B", "C", "s", "m"), Member("CD", "C", "D", "s", "m")],
            [Support("A", HELD, HELD, FREE), Support("D", HELD, HELD, FREE)],
            [JointForce(0, "B", H, 0.0)],
            "rigid",
        ),
        (*_moved(H * h**3 / (6 * EI) + H * h**2 * L / (12 * EI), 0.0), *_ends(0.0, -H * h / 2),
         ("ends", (1, 0, 0), -H / 2)),
        "A. Kleinlogel, Rahmenformeln: two-hinged portal with a force at the top",
    )  # fmt: skip


# --- which of them a frame uses ------------------------------------------------------------------------------------


def _finite(stiffness: np.ndarray) -> Bools:
    return np.asarray((stiffness != FREE) & (stiffness != HELD))


def _has_turned_roller(frame: Frame) -> bool:
    s = frame.support_table
    one_held = (s.stiffness[:, :2] == HELD).sum(axis=1) == 1
    return bool((one_held & (s.sin != 0.0) & (s.cos != 0.0)).any())


def _has_points(tables: Sequence[LoadTable]) -> bool:
    return any(len(t.point_member) for t in tables)


def _has_lines(tables: Sequence[LoadTable]) -> bool:
    return any(len(t.line_member) for t in tables)


def _has_couples(tables: Sequence[LoadTable]) -> bool:
    return any(t.point_couple.any() for t in tables)


FEATURES = (
    Feature("bending and stretching", lambda f, t: True, _bending),
    Feature("line loads", lambda f, t: _has_lines(t), _line_loads),
    Feature("loads within a member", lambda f, t: _has_points(t), _within),
    Feature("loads between places", lambda f, t: _has_points(t) or _has_lines(t), _between_places),
    Feature("hinges", lambda f, t: bool((f.member_table.turn == FREE).any()), _hinges),
    Feature(
        "couples inside a connection",
        lambda f, t: _has_couples(t) and bool((f.member_table.turn != HELD).any()),
        _couple_inside_hinge,
    ),
    Feature("semi-rigid ends", lambda f, t: bool(_finite(f.member_table.turn).any()), _semi_rigid),
    Feature("sprung supports", lambda f, t: bool(_finite(f.support_table.stiffness).any()), _springs),
    Feature("turned rollers", lambda f, t: _has_turned_roller(f), _turned_rollers),
    Feature("axially rigid members", lambda f, t: f.analysis.axial == "rigid", _axially_rigid),
)
