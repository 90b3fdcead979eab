"""Supports of another kind, missing, extra, sprung, turned otherwise, or with a stiffness out by a unit."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from functools import partial

import numpy as np

from crosscheck.frame.model import FREE, HELD, Floats, Frame, Support
from crosscheck.opinions.slope_deflection.prepared import REACTION
from crosscheck.suspects.changes import Change, kind_of, with_support
from crosscheck.suspects.observation import Observation
from crosscheck.suspects.screen import Screen
from crosscheck.suspects.suspect import Option, named

KINDS = (
    ((HELD, HELD, HELD), 0.0), ((HELD, HELD, FREE), 0.0), ((FREE, HELD, FREE), 0.2), ((HELD, FREE, FREE), 0.6),
    ((FREE, HELD, HELD), 0.6), ((HELD, FREE, HELD), 0.6), ((FREE, FREE, HELD), 1.0), ((FREE, FREE, FREE), 0.3),
)  # fmt: skip
"""Kinds of support and how rare each is as a mistake."""
AXES = ("x", "y", "rotation")
UNIT_SLIPS = (1e3, 1e-3, 1e6, 1e-6, 10.0, 0.1, 100.0, 0.01)
EXTRA = 1.0
SPRUNG = 0.9


def support_options(screen: Screen) -> Iterator[Option]:
    """Every support change whose actions follow from the factorised matrix."""
    frame = screen.frame
    joints, stiffness, texts, costs = [], [], [], []
    for j, joint in enumerate(frame.joints):
        for new, says, cost in _kinds(frame, joint):
            joints.append(j)
            stiffness.append(new)
            texts.append(says)
            costs.append(cost)
    block, wanted = np.array(joints, dtype=np.int64), np.array(stiffness, dtype=float).reshape(-1, 3)
    actual = wanted * _state_factors(frame)[block]
    actions = [screen.base.support_actions(name, block, actual) for name in screen.seen.names]
    good = np.all([np.isfinite(a).all(axis=1) for a in actions], axis=0)
    left = screen.left_by(screen.support_grams, block, [np.nan_to_num(a) for a in actions])
    names = list(frame.joints)
    for k in np.flatnonzero(~good).tolist():
        if names[joints[k]] in frame.supports:
            yield _option(frame, names[joints[k]], wanted[k], texts[k], costs[k], None)
    for k in np.argsort(np.where(good, left, np.inf))[:60].tolist():
        if good[k]:
            delta = screen.delta_of(screen.effects.reaction, joints[k], [a[k] for a in actions])
            yield _option(frame, names[joints[k]], wanted[k], texts[k], costs[k], delta)


def kinds_by_reactions(seen: Observation) -> Iterator[Option]:
    """Supports of that kind which gives nothing where the claim prints nothing and something where it prints something.

    No forecast is needed for these, so that none can miss them: in second order one of first order may. Reactions are along
    the frame's axes, hence none at turned supports.
    """
    nil = np.abs(seen.value) <= seen.noise
    ours_nil = np.abs(seen.said) <= seen.allowed
    for joint in seen.frame.supports:
        own = _current(seen.frame, joint)
        at = (seen.places.kind == REACTION) & (seen.places.joint == seen.frame.joint_index[joint])
        loose: dict[int, bool] = {}
        for axis, name in enumerate(AXES if own.angle == 0.0 else ()):
            rows = np.flatnonzero(at & (seen.places.column == axis))
            if len(rows) and (getattr(own, name) == FREE or not ours_nil[rows].all()):
                loose[axis] = bool(nil[rows].all())
        if any(loose[axis] != (getattr(own, AXES[axis]) == FREE) for axis in loose):
            for kind, says, cost in _kinds(seen.frame, joint):
                if all((kind[axis] == FREE) == free for axis, free in loose.items()):
                    yield _option(seen.frame, joint, np.array(kind), says, cost, None)


def _state_factors(frame: Frame) -> Floats:
    """(j, 3) factors on support stiffness of the state that the frame's tables are of."""
    of = frame.states[frame.state].supports if frame.state else {}
    return np.array([[of.get(joint, {}).get(axis, 1.0) for axis in AXES] for joint in frame.joints])


def _current(frame: Frame, joint: str) -> Support:
    return frame.supports.get(joint, Support(joint, FREE, FREE, FREE))


def _kinds(frame: Frame, joint: str) -> Iterator[tuple[tuple[float, float, float], str, float]]:
    """Other stiffnesses of one joint's support, in words, with how rare they are."""
    now = _current(frame, joint)
    own = (now.x, now.y, now.rotation)
    new_there = 0.0 if joint in frame.supports else EXTRA
    label = named(frame, "joint", joint)
    for kind, cost in KINDS:
        if kind != own:
            says = f"the support at {label} was left out" if not any(kind) else (
                f"{label} was analysed as {kind_of(Support(joint, *kind))}"
            )  # fmt: skip
            yield kind, says, cost + new_there
    for axis in range(3):
        if own[axis] in (FREE, HELD):
            continue
        word = f"the {AXES[axis]} spring at {label}"
        for value, text in ((HELD, "was taken as rigid"), (FREE, "was left out")):
            yield _with(own, axis, value), f"{word} {text}", 0.2
        for factor in UNIT_SLIPS:
            yield _with(own, axis, own[axis] * factor), f"{word} was {factor:g} times as stiff (a slip of unit?)", 0.5


def _with(own: tuple[float, float, float], axis: int, value: float) -> tuple[float, float, float]:
    new = list(own)
    new[axis] = value
    return new[0], new[1], new[2]


def _option(
    frame: Frame, joint: str, stiffness: Floats, says: str, cost: float, delta: Floats | None, fitted: int = 0
) -> Option:
    change = Change(partial(_applied, joint=joint, stiffness=tuple(stiffness.tolist())))
    return Option("support", (named(frame, "joint", joint),), says, change, cost, delta, fitted=fitted)


def _applied(frame: Frame, joint: str, stiffness: tuple[float, float, float]) -> Frame:
    if not any(stiffness):
        return with_support(frame, joint, None)
    x, y, rotation = stiffness
    return with_support(frame, joint, replace(_current(frame, joint), x=x, y=y, rotation=rotation))


def support_fits(screen: Screen) -> Iterator[Option]:
    """A direction that gave way by a spring whose stiffness fits best: of those held, and of those sprung."""
    frame = screen.frame
    for joint, support in frame.supports.items():
        j = frame.joint_index[joint]
        own = (support.x, support.y, support.rotation)
        stiff = screen.base.support_stiffness[j]
        for axis in range(3):
            if own[axis] == FREE:
                continue
            fitted = _fit_spring(screen, j, own, axis, float(stiff[axis]))
            if fitted is None:
                continue
            k, delta = fitted
            at = partial(_sprung, frame, joint, own, axis)
            yield replace(at(k), delta=delta, again=(at, k))


def _sprung(frame: Frame, joint: str, own: tuple[float, float, float], axis: int, k: float) -> Option:
    label = named(frame, "joint", joint)
    says = f"{label} {f'gave way along {AXES[axis]}' if axis < 2 else 'turned'} like a spring of {k:.4g}"
    if own[axis] != HELD:
        says = f"the {AXES[axis]} spring at {label} had a stiffness of {k:.4g} ({k / own[axis]:.4g} times)"
    return _option(frame, joint, np.array(_with(own, axis, k)), says, SPRUNG, None, 1)


def _fit_spring(
    screen: Screen, j: int, own: tuple[float, float, float], axis: int, scale: float
) -> tuple[float, Floats] | None:
    """The stiffness that leaves least over, and its effect; None where it improves little."""

    factors = _state_factors(screen.frame)[j]

    def actions(stiffness: Floats) -> list[Floats]:
        wanted = np.array([_with(own, axis, float(k)) for k in stiffness]) * factors
        return [screen.base.support_actions(n, np.full(len(wanted), j), wanted) for n in screen.seen.names]

    def delta(k: float) -> Floats:
        return screen.delta_of(screen.effects.reaction, j, [a[0] for a in actions(np.array([k]))])

    grid = np.logspace(-5, 5, 41) * scale
    left = screen.left_by(screen.support_grams, np.full(len(grid), j), [np.nan_to_num(a) for a in actions(grid)])
    start = float(grid[int(np.argmin(left))])
    if not np.isfinite(left).any():
        return None
    k = screen.fitted(delta, start)
    found = delta(k)
    return (k, found) if screen.left(found[:, None])[0] <= 0.5 * screen.total else None


def every_support_option(frame: Frame) -> Iterator[Change]:
    """Each fixed support change that is weighed, for those who would try them one by one."""
    for joint in frame.joints:
        for stiffness, _, _ in _kinds(frame, joint):
            yield Change(partial(_applied, joint=joint, stiffness=stiffness))
