"""Joints elsewhere, members missing or joined elsewhere: each solved again, and only in places that may explain it."""

from __future__ import annotations

from collections.abc import Iterator
from functools import partial

import numpy as np

from crosscheck.frame.model import Frame
from crosscheck.suspects.changes import Change, with_ends, with_joint, without_member
from crosscheck.suspects.suspect import Family, Option, Placed, named

MISSING, JOINED, MOVED, SWAPPED = 0.5, 0.8, 1.0, 0.8
NEAR = 6


def geometry_options(frame: Frame) -> Iterator[Placed]:
    """Members missing or joined elsewhere, joints with coordinates swapped or mirrored."""
    table = frame.member_table
    for m, name in enumerate(frame.members):
        label = named(frame, "member", name)
        change = Change(partial(without_member, name=name))
        yield Option("geometry", (label,), f"{label} was missing", change, MISSING), (), (m,)
        for end in (0, 1):
            for joint in _near(frame, int(table.ends[m, end]), int(table.ends[m, 1 - end])):
                yield _joined(frame, m, end, joint)


def _near(frame: Frame, joint: int, other: int) -> list[int]:
    away = np.hypot(*(frame.xy - frame.xy[joint]).T)
    return [k for k in np.argsort(away).tolist() if k not in (joint, other)][:NEAR]


def _joined(frame: Frame, m: int, end: int, joint: int) -> Placed:
    name = list(frame.members)[m]
    member = frame.members[name]
    new = list(frame.joints)[joint]
    ends = (new, member.joint_to) if end == 0 else (member.joint_from, new)
    old = (member.joint_from, member.joint_to)[end]
    label = named(frame, "member", name)
    says = f"{label} was joined to {new} in place of {old}"
    change = Change(partial(with_ends, name=name, joint_from=ends[0], joint_to=ends[1]))
    return Option("geometry", (label,), says, change, JOINED), (joint,), (m,)


def geometry_families(frame: Frame) -> Iterator[Family]:
    """Each joint moved along x or y by a length that is fitted."""
    ends, length = frame.member_table.ends, frame.member_table.length
    for j, name in enumerate(frame.joints):
        around = np.flatnonzero((ends == j).any(axis=1))
        if not len(around):
            continue
        step = 0.03 * float(length[around].min())
        for axis in ("x", "y"):
            at = partial(_moved, frame, name, axis)
            yield Family(at, (step, -step), False, (j,), tuple(around.tolist()))


def _moved(frame: Frame, name: str, axis: str, by: float) -> Option:
    joint = frame.joints[name]
    x, y = joint.x + (by if axis == "x" else 0.0), joint.y + (by if axis == "y" else 0.0)
    label = named(frame, "joint", name)
    says = f"{label} was at {axis} = {x if axis == 'x' else y:.4g} in place of {joint.x if axis == 'x' else joint.y:.4g}"
    return Option("geometry", (label,), says, Change(partial(with_joint, name=name, x=x, y=y)), MOVED, fitted=1)
