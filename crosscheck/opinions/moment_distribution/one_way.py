"""Members and supports that work one way only: which of them work in a case.

Whether a part works is tried: from all in place on, the part that works the wrong way worst is taken out, or the one that
was taken out and would work again worst is put back, one at a time, until each does what it may; all that are wrong are
changed at once where that leaves fewer wrong. States seen before are not gone back to. Where that leads round in a circle
the first of the parts that are wrong, in a fixed order, is changed instead, which comes to an end in every frame that
stands with all of them out (K. G. Murty, "Note on a Bard-type scheme for solving the complementarity problem", Opsearch
11 (1974), 123-130, from memory); and a few parts are tried in every way there is.

A frame with parts taken out may be able to move freely. It is then let go against hardly any resistance, and what this
closes is put back.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from itertools import combinations
from typing import Generic, TypeVar

import numpy as np
from scipy import sparse
from scipy.sparse.linalg import splu

from crosscheck.frame.model import Floats, Frame, Ints
from crosscheck.opinions.moment_distribution.holding import Given, Held, hold, start, unbalanced
from crosscheck.opinions.moment_distribution.process import GIVEN_UP, Process, distribute, given_of, own_reactions

NOISE = 1e-9
"""Share of the case's largest force or movement that counts as none."""
LOOSE = 1e-9
"""Share of a movement by which nothing that resists is deformed, where it is a free one."""
HARDLY = 1e-12
"""Resistance that keeps free movements finite, as a share of each joint's and sway's own."""
LEAST = 1e-12
"""A joint's or sway's own resistance below this share of the largest is none."""
STIFF = 1e300
"""Force per movement of a support that holds."""
MOST = 400
"""States tried by either rule."""
FEW = 8
"""Up to so many parts are tried in every way."""

Found = TypeVar("Found")
"""What is found of a state that stands: all that makes its answer."""
Out = frozenset[int]
"""The parts that are taken out, by number."""


@dataclass(frozen=True)
class Parts:
    """The one-way parts, members before supports. member: (a,) index; place: (b,) 2 * joint + axis of the supports;
    sense: (a + b,) sign of the force that may be there: axial of members, on the frame along its axis of supports."""

    frame: Frame
    member: Ints
    place: Ints
    sense: Floats
    names: tuple[str, ...]

    def state(self, out: Out) -> Frame:
        """The frame with these parts taken out."""
        members, joints = list(self.frame.members), list(self.frame.joints)
        count = len(self.member)
        places = [int(self.place[k - count]) for k in out if k >= count]
        return replace(
            self.frame,
            out_members=frozenset(members[self.member[k]] for k in out if k < count),
            out_supports=frozenset((joints[p // 2], "xy"[p % 2]) for p in places),
        )

    def unsettled(self, wrong: tuple[int, ...]) -> str:
        """Why a case has no answer in which these parts remain wrong, in words."""
        which = f"; {', '.join(self.names[k] for k in sorted(wrong))} would not settle" if wrong else ""
        return f"no settled state of the one-way members and supports was found{which}"

    def out_of(self, state: Frame) -> Out:
        """What is taken out of a state of the frame."""
        members = [state.member_index[name] for name in state.out_members]
        places = [2 * state.joint_index[joint] + "xy".index(axis) for joint, axis in state.out_supports]
        outside = np.concatenate([np.isin(self.member, members), np.isin(self.place, places)])
        return frozenset(np.flatnonzero(outside).tolist())


def one_way_parts(frame: Frame) -> Parts:
    """The frame's one-way members and support directions."""
    member, place, names = [], [], []
    sense: list[float] = []
    for k, m in enumerate(frame.members.values()):
        if m.only:
            member.append(k)
            sense.append(1.0 if m.only == "tension" else -1.0)
            names.append(m.name)
    for support in frame.supports.values():
        for axis, only in enumerate((support.x_only, support.y_only)):
            if only:
                place.append(2 * frame.joint_index[support.joint] + axis)
                sense.append(1.0 if only == "push" else -1.0)
                names.append(f"support {support.joint}")
    return Parts(frame, np.array(member, dtype=np.int64), np.array(place, dtype=np.int64), np.array(sense), tuple(names))


@dataclass(frozen=True)
class Judged(Generic[Found]):
    """A state tried: what is wrong in it, worst first, and what was found where it stands."""

    wrong: tuple[int, ...]
    found: Found | None

    @property
    def settled(self) -> bool:
        return self.found is not None and not self.wrong


Tried = Callable[[Out], Judged[Found]]


def search(parts: Parts, judge: Tried[Found], start: Out, few: int = FEW) -> Judged[Found]:
    """A settled state, or the one with the least parts that are wrong of those that stand; up to `few` parts are tried in
    every way."""
    seen: dict[Out, Judged[Found]] = {}

    def tried(out: Out) -> Judged[Found]:
        if out not in seen:
            seen[out] = judge(out)
        return seen[out]

    found = _worst_first(start, tried, seen) or _in_order(start, tried)
    if found is None and len(parts.names) <= few:
        found = _every_way(len(parts.names), tried)
    return found or min(seen.values(), key=lambda judged: (judged.found is None, len(judged.wrong)))


def _worst_first(out: Out, tried: Tried[Found], seen: dict[Out, Judged[Found]]) -> Judged[Found] | None:
    for _ in range(MOST):
        judged = tried(out)
        if judged.settled:
            return judged
        many = out ^ frozenset(judged.wrong)
        if judged.found is not None and many not in seen and _gains(judged, tried(many)):
            out = many
            continue
        fresh = [out ^ {part} for part in judged.wrong if out ^ {part} not in seen]
        if not fresh:
            return None
        out = fresh[0]
    return None


def _gains(before: Judged[Found], after: Judged[Found]) -> bool:
    """Whether a state that stands has less that is wrong than another."""
    return after.found is not None and len(after.wrong) < len(before.wrong)


def _in_order(out: Out, tried: Tried[Found]) -> Judged[Found] | None:
    for _ in range(MOST):
        judged = tried(out)
        if judged.settled:
            return judged
        if not judged.wrong:
            return None
        out = out ^ {min(judged.wrong)}
    return None


def _every_way(parts: int, tried: Tried[Found]) -> Judged[Found] | None:
    for count in range(parts + 1):
        for out in combinations(range(parts), count):
            judged = tried(frozenset(out))
            if judged.settled:
                return judged
    return None


def what_is_wrong(out: Out, force: Floats, closing: Floats, sizes: tuple[float, float], held: Floats) -> tuple[int, ...]:
    """Parts that work the wrong way, worst first.

    force: (p,) of each part, positive the way it may work; closing: (p,) how far each has moved the way that would make
    it work; sizes: the case's largest force and movement; held: (p,) force per movement of each part.
    """
    largest, farthest = (size or 1.0 for size in sizes)
    outside = np.isin(np.arange(len(force)), list(out))
    worst = np.where(outside, closing / farthest, -force / largest)
    # What closes must also be worth a force.
    worst = np.where(outside & (closing * held <= NOISE * largest), 0.0, worst)
    return tuple(int(k) for k in np.argsort(-worst, kind="stable") if worst[k] > NOISE)


class FirstOrder:
    """Judges the states of a frame in first order; what does not depend on the case is kept."""

    def __init__(self, frame: Frame) -> None:
        self.parts = one_way_parts(frame)
        self.ready: dict[Out, tuple[Held, Floats | None]] = {}

    def at(self, out: Out) -> tuple[Held, Floats | None]:
        """The frame of a state made ready, and (3j,) a free movement of its joints, None where it has none."""
        if out not in self.ready:
            held = hold(self.parts.state(out))
            self.ready[out] = held, free_movement(held)
        return self.ready[out]

    def settled(self, name: str) -> Judged[Process]:
        """The case in its settled state, or in one where least is wrong."""
        return search(self.parts, lambda out: self.judge(out, name), self.parts.out_of(self.parts.frame))

    def judge(self, out: Out, name: str) -> Judged[Process]:
        held, loose = self.at(out)
        if loose is not None:
            return Judged(self.put_back(out, held, loose, name), None)
        process = distribute(held.frame, (name,), held)
        if process.left[0] > GIVEN_UP:
            return Judged(tuple(sorted(out)), None)
        return Judged(self.wrong(out, process), process)

    def wrong(self, out: Out, process: Process) -> tuple[int, ...]:
        """The parts that work the wrong way in a state that stands, worst first."""
        held, state, end = process.held, process.state, process.ends[0]
        reaction = own_reactions(process, 0)
        stretched = state.axial[:, 0] + held.members.held * end.by_loads
        force = self.parts.sense * np.concatenate([stretched[self.parts.member], reaction[self.parts.place]])
        sizes = force_size(process), movement_size(process.given, state.move[:, 0])
        closing = self.closing(held, process.given, state.move[:, 0], end.free)
        stiff = np.concatenate([held.members.held[self.parts.member], np.full(len(self.parts.place), STIFF)])
        return what_is_wrong(out, force, closing, sizes, stiff)

    def closing(self, held: Held, given: Given, move: Floats, free: Floats) -> Floats:
        """(p,) how far each part has moved the way that would make it work."""
        longer = held.sways.stretch @ move - free
        ground = given.ground[:, 0].reshape(-1, 3)[:, :2].ravel()
        apart = np.concatenate([longer[self.parts.member], (ground - move)[self.parts.place]])
        return np.asarray(self.parts.sense * apart)

    def put_back(self, out: Out, held: Held, loose: Floats, name: str) -> tuple[int, ...]:
        """What the frame closes when it moves as its loads make it, worst first; then what its free movement moves."""
        given, end = given_of(held, (name,))
        first = start(held, given)
        moment, force = unbalanced(held, given, first, np.array([0]))[:2]
        drift = moved_by(held, hardly_held(held)(np.concatenate([moment[:, 0], force[:, 0]])))[1]
        closing = self.closing(held, given, first.move[:, 0] + drift, end[0].free)
        least = NOISE * float(np.abs(drift).max(initial=0.0))
        by_loads = [k for k in np.argsort(-closing, kind="stable") if k in out and closing[k] > least]
        nothing = np.zeros_like(end[0].free)
        still = replace(given, ground=np.zeros_like(given.ground))
        apart = np.abs(self.closing(held, still, loose, nothing))
        others = [k for k in np.argsort(-apart, kind="stable") if k in out and k not in by_loads and apart[k] > LOOSE]
        return tuple(int(k) for k in (*by_loads, *others))


def settled_process(frame: Frame, name: str) -> Process | str:
    """The case distributed, one-way members and supports in their settled state; why not, in words, where none settles."""
    if not frame.one_way:
        return distribute(frame, (name,))
    states = FirstOrder(frame)
    judged = states.settled(name)
    if judged.settled and judged.found is not None:
        return judged.found
    return states.parts.unsettled(judged.wrong)


def force_size(process: Process) -> float:
    """The case's largest force."""
    state, given = process.state, process.given
    shear = np.abs(state.moment[:, :, 0]).sum(axis=1) / process.held.members.table.length
    parts = (state.axial, state.push, given.force, own_reactions(process, 0), shear)
    return max(float(np.abs(part).max(initial=0.0)) for part in parts)


def movement_size(given: Given, move: Floats) -> float:
    """The case's largest movement, imposed ones among them."""
    ground = given.ground[:, 0].reshape(-1, 3)[:, :2]
    return max(float(np.abs(part).max(initial=0.0)) for part in (move, ground))


# --- free movements ---------------------------------------------------------------------------------


def moved_by(held: Held, corrections: Floats) -> tuple[Floats, Floats]:
    """(j,) rotations and (2j,) movements of the joints by corrections (r + q,)."""
    turning, s = held.turning, held.sways
    rotation, move = np.zeros(len(held.frame.joints)), np.zeros(2 * len(held.frame.joints))
    rotation[turning] = corrections[: len(turning)]
    move[s.free] = s.shape @ corrections[len(turning) :]
    return rotation, move


def hardly_held(held: Held) -> Callable[[Floats], Floats]:
    """Corrections (r + q,) by moments and forces (r + q,), every joint and sway resisting a little more than it does."""
    own = held.released.diagonal()
    count = len(held.turning)
    for kind in (own[:count], own[count:]):
        kind[:] = np.maximum(kind, LEAST * kind.max(initial=0.0))
    scale = 1 / np.sqrt(np.where(own > 0, own, 1.0))
    scaled = sparse.diags_array(scale) @ held.released @ sparse.diags_array(scale)
    if not len(own):
        return lambda right: right
    factor = splu(sparse.csc_array(scaled + HARDLY * sparse.eye_array(len(own))))
    return lambda right: np.asarray(scale * factor.solve(scale * right))


def free_movement(held: Held) -> Floats | None:
    """(2j,) movement of the joints along their own axes, largest 1, that nothing resists; None where there is none."""
    solve, own = hardly_held(held), held.released.diagonal()
    if not len(own):
        return None
    way = np.random.default_rng(3).standard_normal(len(own))
    for _ in range(6):
        way = solve(way * np.where(own > 0, own, 1.0))
        way /= np.abs(way).max()
    rotation, move = moved_by(held, way)
    arm = float(held.members.table.length.mean())
    most = max(float(np.abs(move).max(initial=0.0)), arm * float(np.abs(rotation).max(initial=0.0)))
    if not most or _deformed(held, rotation, move) > LOOSE * most:
        return None
    return np.asarray(move / (np.abs(move).max() or 1.0))


def _deformed(held: Held, rotation: Floats, move: Floats) -> float:
    """The largest movement that something resists: of springs, of members in length and bending."""
    m, s = held.members, held.sways
    face = np.einsum("mij,mj->mi", m.lever, rotation[held.ends] - (s.turn @ move)[:, None])
    bent = np.where(np.einsum("mii->mi", m.face) > 0, face, 0.0) * m.table.clear[:, None]
    arm = float(m.table.length.mean())
    parts = (
        bent, np.where(m.axial > 0, s.stretch @ move, 0.0), np.where(s.ground > 0, move, 0.0),
        np.where(held.rotation_spring > 0, arm * rotation, 0.0),
    )  # fmt: skip
    return max(float(np.abs(part).max(initial=0.0)) for part in parts)
