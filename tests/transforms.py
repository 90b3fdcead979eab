"""Changes of a frame under which its results are known to change in a known way, and that way: for property tests.

Each returns a Changed: the new frame, and `back`, which takes a case's answer to the new frame to what the old frame's
answer must be. Everything is done on the dataclasses; nothing here solves anything. First order alone.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from crosscheck.answer import CaseAnswer
from crosscheck.frame.model import (
    FREE,
    HELD,
    Floats,
    Frame,
    Joint,
    JointCouple,
    JointForce,
    Load,
    LoadCase,
    Member,
    Misfit,
    PointCouple,
    PointForce,
    SelfWeight,
    Settlement,
    Spread,
    Support,
    Temperature,
    Units,
)


@dataclass(frozen=True)
class Changed:
    """A changed frame, the way of its answers back, and the way of its names (old to new)."""

    frame: Frame
    back: Callable[[CaseAnswer], CaseAnswer]


def with_loads(frame: Frame, change: Callable[[Load], list[Load]]) -> dict[str, LoadCase]:
    """Every case with each load replaced by what `change` makes of it."""
    return {
        name: LoadCase(name, tuple(new for load in case.loads for new in change(load)))
        for name, case in frame.cases.items()
    }


def explicit(frame: Frame) -> Frame:
    """Self weight written as a spread load on every member: the frame may then be turned without its weight turning."""

    def spelled(load: Load) -> list[Load]:
        if not isinstance(load, SelfWeight):
            return [load]
        t = frame.member_table
        return [
            Spread(load.entry, m, w, w, 270.0, 0.0, length)
            for m, w, length in zip(
                frame.members, (load.factor * t.weight * t.A).tolist(), t.length.tolist(), strict=True
            )
        ]

    return replace(frame, cases=with_loads(frame, spelled))


def turned(frame: Frame, degrees: float) -> Changed:
    """The whole frame, its supports and its loads turned counter-clockwise about the origin."""
    c, s = math.cos(math.radians(degrees)), math.sin(math.radians(degrees))

    def load(one: Load) -> list[Load]:
        direction = getattr(one, "direction", "across")
        return [one if isinstance(direction, str) else replace(one, direction=direction + degrees)]  # type: ignore[call-arg]

    joints = {n: Joint(n, c * j.x - s * j.y, s * j.x + c * j.y) for n, j in frame.joints.items()}
    supports = {n: replace(p, angle=p.angle + degrees) for n, p in frame.supports.items()}
    turn = np.array([[c, -s, 0.0], [s, c, 0.0], [0.0, 0.0, 1.0]])  # of row vectors, back

    def back(a: CaseAnswer) -> CaseAnswer:
        return CaseAnswer(a.ends, a.joints @ turn, a.reactions @ turn)

    frame = explicit(frame)
    return Changed(replace(frame, joints=joints, supports=supports, cases=with_loads(frame, load)), back)


def mirrored(frame: Frame) -> Changed:
    """Left and right exchanged: couples, rotations, shears and what acts across change sense, what lies along keeps it."""

    def load(one: Load) -> list[Load]:
        match one:
            case JointCouple() | PointCouple():
                return [replace(one, couple=-one.couple)]
            case Temperature():
                return [replace(one, difference=-one.difference)]
            case Settlement():
                return [replace(one, x=-one.x, rotation=-one.rotation)]
            case JointForce():
                return [replace(one, direction=180.0 - one.direction)]
            case PointForce():
                if one.direction == "across":
                    return [replace(one, force=-one.force)]
                return [one if one.direction == "along" else replace(one, direction=180.0 - one.direction)]
            case Spread():
                if one.direction == "across":
                    return [replace(one, first=-one.first, last=-one.last)]
                return [one if one.direction == "along" else replace(one, direction=180.0 - one.direction)]
        return [one]

    joints = {n: Joint(n, -j.x, j.y) for n, j in frame.joints.items()}
    supports = {n: replace(p, angle=-p.angle) for n, p in frame.supports.items()}
    ends, joint, reaction = np.array([1.0, -1.0, -1.0]), np.array([-1.0, 1.0, -1.0]), np.array([-1.0, 1.0, -1.0])

    def back(a: CaseAnswer) -> CaseAnswer:
        return CaseAnswer(a.ends * ends, a.joints * joint, a.reactions * reaction)

    return Changed(replace(frame, joints=joints, supports=supports, cases=with_loads(frame, load)), back)


def renamed(frame: Frame, order: np.random.Generator) -> Changed:
    """Everything gets another name and another place in the file."""
    joint_order, member_order = order.permutation(len(frame.joints)), order.permutation(len(frame.members))
    old_joints, old_members = list(frame.joints), list(frame.members)
    joint = {name: f"P{int(k) * 7 + 3}" for name, k in zip(old_joints, np.argsort(joint_order), strict=True)}
    member = {name: f"bar {int(k) * 3 + 100}" for name, k in zip(old_members, np.argsort(member_order), strict=True)}
    section = {name: f"S-{k}" for k, name in enumerate(reversed(list(frame.sections)))}
    material = {name: f"M-{k}" for k, name in enumerate(reversed(list(frame.materials)))}

    def load(one: Load) -> list[Load]:
        if isinstance(one, JointForce | JointCouple | Settlement):
            return [replace(one, joint=joint[one.joint])]
        return [one if isinstance(one, SelfWeight) else replace(one, member=member[one.member])]  # type: ignore[union-attr, call-arg]

    def moved(m: Member) -> Member:
        return replace(
            m, name=member[m.name], joint_from=joint[m.joint_from], joint_to=joint[m.joint_to], section=section[m.section],
            material=material[m.material],
        )  # fmt: skip

    new = replace(
        frame,
        joints={joint[old_joints[k]]: replace(frame.joints[old_joints[k]], name=joint[old_joints[k]]) for k in joint_order},
        members={member[old_members[k]]: moved(frame.members[old_members[k]]) for k in member_order},
        sections={section[n]: replace(s, name=section[n]) for n, s in reversed(frame.sections.items())},
        materials={material[n]: replace(t, name=material[n]) for n, t in reversed(frame.materials.items())},
        supports={joint[n]: replace(p, joint=joint[n]) for n, p in reversed(frame.supports.items())},
        cases=dict(reversed(with_loads(frame, load).items())),
    )
    joint_back, member_back = np.argsort(joint_order), np.argsort(member_order)

    def back(a: CaseAnswer) -> CaseAnswer:
        return CaseAnswer(a.ends[member_back], a.joints[joint_back], a.reactions[joint_back])

    return Changed(new, back)


POWERS: Mapping[str, tuple[int, int]] = {
    "E": (1, -2), "G": (1, -2), "weight": (1, -3), "I": (0, 4), "A": (0, 2), "shear_area": (0, 2), "depth": (0, 1),
    "turn_from": (1, 1), "turn_to": (1, 1), "rigid_from": (0, 1), "rigid_to": (0, 1), "force": (1, 0), "couple": (1, 1),
    "at": (0, 1), "start": (0, 1), "end": (0, 1), "first": (1, -1), "last": (1, -1), "too_long": (0, 1),
}  # fmt: skip
"""Powers of force and length of a field; support stiffness, settlements and coordinates apart."""


def in_units(frame: Frame, units: Units) -> Changed:
    """The same frame stated in other units of force and length."""
    f, l = frame.units.newton / units.newton, frame.units.metre / units.metre  # noqa: E741

    def stated(thing: Any) -> Any:
        fields = {n: getattr(thing, n) for n in POWERS if getattr(thing, n, None) is not None}
        return replace(thing, **{n: v * f ** POWERS[n][0] * l ** POWERS[n][1] for n, v in fields.items()})

    def load(one: Load) -> list[Load]:
        if isinstance(one, SelfWeight | Temperature):
            return [one]
        return [replace(one, x=one.x * l, y=one.y * l) if isinstance(one, Settlement) else stated(one)]

    def support(p: Support) -> Support:
        return replace(p, x=p.x * f / l, y=p.y * f / l, rotation=p.rotation * f * l)

    new = replace(
        frame,
        units=units,
        materials={n: stated(t) for n, t in frame.materials.items()},
        sections={n: stated(s) for n, s in frame.sections.items()},
        joints={n: Joint(n, j.x * l, j.y * l) for n, j in frame.joints.items()},
        members={n: stated(m) for n, m in frame.members.items()},
        supports={n: support(p) for n, p in frame.supports.items()},
        cases=with_loads(frame, load),
    )  # fmt: skip
    actions, moves = np.array([f, f, f * l]), np.array([l, l, 1.0])

    def back(a: CaseAnswer) -> CaseAnswer:
        return CaseAnswer(a.ends / actions, a.joints / moves, a.reactions / actions)

    return Changed(new, back)


def scaled(frame: Frame, loads: float, stiffness: float) -> Changed:
    """All that acts times `loads`, all that resists times `stiffness`.

    Actions go with the loads where they are forces and with both where they are imposed movements, so `frame` must have
    the one kind only if stiffness is not 1: forces() and imposed() say which.
    """

    def load(one: Load) -> list[Load]:
        names = ("force", "couple", "first", "last", "mean", "difference", "too_long", "factor", "x", "y", "rotation")
        fields = {n: getattr(one, n) * loads for n in names if hasattr(one, n)}
        return [replace(one, **fields)]

    def spring(k: float) -> float:
        return k if k in (FREE, HELD) else k * stiffness

    def member(m: Member) -> Member:
        return replace(m, turn_from=spring(m.turn_from), turn_to=spring(m.turn_to))

    new = replace(
        frame,
        materials={
            n: replace(t, E=t.E * stiffness, G=None if t.G is None else t.G * stiffness) for n, t in frame.materials.items()
        },
        members={n: member(m) for n, m in frame.members.items()},
        supports={
            n: replace(p, x=spring(p.x), y=spring(p.y), rotation=spring(p.rotation)) for n, p in frame.supports.items()
        },
        cases=with_loads(frame, load),
    )

    def back(a: CaseAnswer) -> CaseAnswer:
        return CaseAnswer(a.ends / loads, a.joints / loads * stiffness, a.reactions / loads)

    return Changed(new, back)


def imposed(frame: Frame) -> bool:
    """Whether something is imposed that is no force: movements and lengths."""
    kinds = (Settlement, Temperature, Misfit)
    return any(isinstance(load, kinds) for case in frame.cases.values() for load in case.loads)


def split(frame: Frame, name: str, share: float) -> Changed:
    """A joint put into a member, `share` of the way along its flexible part; what lies on the member is divided there."""
    m, k = frame.members[name], frame.member_index[name]
    t = frame.member_table
    length, cos, sin = float(t.length[k]), float(t.cos[k]), float(t.sin[k])
    at = m.rigid_from + share * (length - m.rigid_from - m.rigid_to)
    first, last = "split first", "split last"
    start = frame.joints[m.joint_from]

    def load(one: Load) -> list[Load]:
        if getattr(one, "member", None) != name:
            return [one]
        match one:
            case PointForce() | PointCouple():
                near = one.at < at or (one.at == at and share > 0.5)
                return [replace(one, member=first) if near else replace(one, member=last, at=one.at - at)]
            case Spread():
                return _divided(one, at, first, last)
            case Misfit():
                return [replace(one, member=first)]
        return [replace(one, member=part) for part in (first, last)]  # type: ignore[call-arg]

    members: dict[str, Member] = {}
    for n, one in frame.members.items():
        if n != name:
            members[n] = one
            continue
        members[first] = replace(one, name=first, joint_to="new joint", turn_to=HELD, rigid_to=0.0)
        members[last] = replace(one, name=last, joint_from="new joint", turn_from=HELD, rigid_from=0.0)
    new = replace(
        frame,
        joints={**frame.joints, "new joint": Joint("new joint", start.x + at * cos, start.y + at * sin)},
        members=members,
        cases=with_loads(frame, load),
    )

    def back(a: CaseAnswer) -> CaseAnswer:
        ends = np.delete(a.ends, k + 1, axis=0)
        ends[k, 1] = a.ends[k + 1, 1]
        return CaseAnswer(ends, a.joints[:-1], a.reactions[:-1])

    return Changed(new, back)


def _divided(one: Spread, at: float, first: str, last: str) -> list[Load]:
    middle = one.first + (one.last - one.first) * (at - one.start) / (one.end - one.start)
    if one.end <= at:
        return [replace(one, member=first)]
    if one.start >= at:
        return [replace(one, member=last, start=one.start - at, end=one.end - at)]
    return [
        replace(one, member=first, last=middle, end=at),
        replace(one, member=last, first=middle, start=0.0, end=one.end - at),
    ]


def printed(frame: Frame, answers: Mapping[str, CaseAnswer], digits: int = 6) -> str:
    """A claim that gives everything of every case, in the frame's own units and the README's signs."""
    force, length = frame.units.force, frame.units.length
    moment = f"{force} {length}"
    lines: list[str] = []

    def row(names: list[str], values: Floats) -> str:
        return "\t".join([*names, *("" if math.isnan(v) else f"{v:.{digits - 1}e}" for v in values)])

    for name, a in answers.items():
        lines += [f"Load case: {name}", "\t".join(["Member", "End", f"N [{force}]", f"V [{force}]", f"M [{moment}]"])]
        for k, m in enumerate(frame.members.values()):
            lines += [row([m.name, joint], a.ends[k, e]) for e, joint in enumerate((m.joint_from, m.joint_to))]
        lines += ["", "\t".join(["Joint", f"Fx [{force}]", f"Fy [{force}]", f"Mz [{moment}]"])]
        lines += [row([j], a.reactions[frame.joint_index[j]]) for j in frame.supports]
        lines += ["", "\t".join(["Joint", f"dx [{length}]", f"dy [{length}]", "rotation [rad]"])]
        lines += [*(row([j], a.joints[frame.joint_index[j]]) for j in frame.joints), ""]
    return "\n".join(lines) + "\n"
