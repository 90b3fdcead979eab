"""Is everything connected, once, and where it should be? Can it stand up?"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from crosscheck.frame.model import FREE
from crosscheck.review.finding import Finding, Subject, listed

NEAR = 0.05
"""Metres: joints closer than this without being one place, or joints this near a member that they do not belong to."""
HAND = 0.12
"""Metres, a hand's breadth: a coordinate this near a line or level that others keep was probably meant to be on it."""


def mechanisms(subject: Subject) -> Iterator[Finding]:
    """Can the frame move without resistance? It has no answer then; look at the supports and hinges of what moves."""
    for motion in subject.motions:
        size = np.hypot(motion.joints[:, 0], motion.joints[:, 1]) + np.abs(motion.joints[:, 2])
        names = [name for name, s in zip(subject.frame.joints, size, strict=True) if s > 1e-6 * size.max()]
        yield Finding("serious", tuple(names), f"{motion.says}; it has no answer until something stops this")


def loose_joints(subject: Subject) -> Iterator[Finding]:
    """Does any joint belong to no member? It takes no part; look for a member that should end there."""
    for joint, members in subject.members_at.items():
        if not members:
            says = f"joint {joint} belongs to no member; is a member missing, or the joint left over?"
            yield Finding("check", (joint,), says)


def near_joints(subject: Subject) -> Iterator[Finding]:
    """Do two joints lie nearly at one place without a member between them? Probably one joint was meant, and what ends
    at the two is not connected."""
    frame = subject.frame
    names, xy = list(frame.joints), frame.xy
    linked = {frozenset((m.joint_from, m.joint_to)) for m in frame.members.values()}
    for i, j in close_pairs(xy, NEAR * subject.metre):
        if frozenset((names[i], names[j])) not in linked:
            gap = float(np.hypot(*(xy[i] - xy[j]))) / subject.metre
            yield Finding(
                "check", (names[i], names[j]),
                f"joints {names[i]} and {names[j]} lie {1000 * gap:.3g} mm apart and nothing connects them; were they "
                "meant to be one joint?",
            )  # fmt: skip


def close_pairs(xy: np.ndarray, reach: float) -> list[tuple[int, int]]:
    """Index pairs of points nearer than reach."""
    from scipy.spatial import cKDTree

    return sorted(cKDTree(xy).query_pairs(reach)) if len(xy) > 1 else []


def touching(subject: Subject) -> Iterator[Finding]:
    """Does a joint lie on a member that does not end there? What meets at the joint is not connected to the member;
    divide the member at it, or say that it passes by."""
    frame, t = subject.frame, subject.frame.member_table
    joints = list(frame.joints)
    for k, name in enumerate(frame.members):
        start = frame.xy[t.ends[k, 0]]
        run = frame.xy - start
        along = run[:, 0] * t.cos[k] + run[:, 1] * t.sin[k]
        off = np.abs(run[:, 1] * t.cos[k] - run[:, 0] * t.sin[k])
        margin = NEAR * subject.metre
        on = (off < margin) & (along > margin) & (along < t.length[k] - margin)
        for j in np.flatnonzero(on):
            if subject.members_at[joints[j]]:
                yield Finding(
                    "serious", (joints[j], name),
                    f"joint {joints[j]} lies on member {name}, which does not end there: what meets at {joints[j]} is not "
                    f"connected to {name}; divide {name} at it if it should be",
                )  # fmt: skip


def crossing(subject: Subject) -> Iterator[Finding]:
    """Do members cross without a joint? They pass by each other in this model; crossed bracing usually does, beams and
    columns usually don't."""
    frame, t = subject.frame, subject.frame.member_table
    names = list(frame.members)
    if len(names) > 2000:
        return
    start, run = frame.xy[t.ends[:, 0]], np.column_stack([t.cos, t.sin]) * t.length[:, None]
    for i in range(len(names)):
        others = np.arange(i + 1, len(names))
        cross = run[i, 0] * run[others, 1] - run[i, 1] * run[others, 0]
        gap = start[others] - start[i]
        with np.errstate(divide="ignore", invalid="ignore"):
            a = (gap[:, 0] * run[others, 1] - gap[:, 1] * run[others, 0]) / cross
            b = (gap[:, 0] * run[i, 1] - gap[:, 1] * run[i, 0]) / cross
        inside = (a > 0.01) & (a < 0.99) & (b > 0.01) & (b < 0.99)
        for j in others[inside]:
            pinned = all((t.turn[k] == FREE).all() for k in (i, j))
            yield Finding(
                "note" if pinned else "check", (names[i], names[j]),
                f"members {names[i]} and {names[j]} cross without a joint and pass by each other in this model",
            )  # fmt: skip


def doubled(subject: Subject) -> Iterator[Finding]:
    """Do two members join the same two joints? Their stiffness adds; probably one was entered twice."""
    seen: dict[frozenset[str], list[str]] = {}
    for m in subject.frame.members.values():
        seen.setdefault(frozenset((m.joint_from, m.joint_to)), []).append(m.name)
    for pair, names in seen.items():
        if len(names) > 1:
            ends = " and ".join(sorted(pair))
            yield Finding("check", tuple(names), f"members {listed(names)} all join {ends}: their stiffness adds up")


def idle_supports(subject: Subject) -> Iterator[Finding]:
    """Does a support hold nothing? One with every direction free, at a joint without members, or without reaction."""
    frame = subject.frame
    for name, support in frame.supports.items():
        if support.x == support.y == support.rotation == FREE:
            yield Finding("check", (name,), f"the support at {name} is free in every direction and holds nothing")
        elif not subject.members_at[name]:
            yield Finding("check", (name,), f"the support at {name} holds a joint that belongs to no member")
        elif subject.answer is not None and frame.cases:
            pulls = [subject.answer.cases[c].reactions[frame.joint_index[name]] for c in subject.answer.cases]
            largest = max(float(np.nanmax(np.abs(a.reactions), initial=0.0)) for a in subject.answer.cases.values())
            if pulls and np.nanmax(np.abs(pulls), initial=0.0) <= 1e-9 * largest:
                yield Finding("note", (name,), f"the support at {name} has no reaction in any case")


def off_line(subject: Subject) -> Iterator[Finding]:
    """Is a joint a hand's breadth off a line or level that others keep? Probably a slip in one coordinate; a real jog is
    drawn as one."""
    frame = subject.frame
    names = list(frame.joints)
    for axis, word in ((0, "line x"), (1, "level y")):
        values = np.round(frame.xy[:, axis] / subject.metre, 9)
        distinct, counts = np.unique(values, return_counts=True)
        kept = distinct[counts >= 3]
        for value in distinct[counts == 1]:
            gap = np.abs(kept - value)
            near = (gap > 1e-6) & (gap <= HAND)
            if near.any():
                line = kept[near][np.argmin(gap[near])]
                joint = names[int(np.flatnonzero(values == value)[0])]
                yield Finding(
                    "check", (joint,),
                    f"joint {joint} is {1000 * abs(value - line):.3g} mm off {word} = {line:.6g} m, which "
                    f"{int(counts[distinct == line][0])} other joints keep",
                )  # fmt: skip


def symmetry(subject: Subject) -> Iterator[Finding]:
    """Is the frame symmetrical but for a little? Loads, supports or sections that just miss it are often slips."""
    pairs = mirrored(subject)
    if pairs is None:
        return
    frame = subject.frame
    for a, b in pairs["members"]:
        sections = frame.members[a].section, frame.members[b].section
        if sections[0] != sections[1]:
            says = f"the frame is symmetrical, but {a} has section {sections[0]} and {b} {sections[1]}"
            yield Finding("check", (a, b), says)
    for a, b in pairs["joints"]:
        one, two = frame.supports.get(a), frame.supports.get(b)
        if (one is None) != (two is None) or (one and two and (one.y, one.rotation) != (two.y, two.rotation)):
            yield Finding("note", (a, b), f"the frame is symmetrical, but the supports at {a} and {b} differ")
    yield from _loads_that_miss(subject, pairs["members"])


def _loads_that_miss(subject: Subject, members: list[tuple[str, str]]) -> Iterator[Finding]:
    frame = subject.frame
    for case, table in subject.tables.items():
        weight = np.zeros(len(frame.members))
        span = table.line_end - table.line_start
        np.add.at(weight, table.line_member, np.abs(table.line_across.mean(axis=1)) * span)
        for a, b in members:
            one, two = weight[frame.member_index[a]], weight[frame.member_index[b]]
            if one and two and 1e-6 < abs(one - two) / max(one, two) <= 0.12:
                yield Finding(
                    "check", (a, b),
                    f"the frame is symmetrical, but in case {case} {a} and {b} carry loads that differ by "
                    f"{100 * abs(one - two) / max(one, two):.2g}%",
                )  # fmt: skip


def mirrored(subject: Subject) -> dict[str, list[tuple[str, str]]] | None:
    """Pairs of joints and members that mirror each other about the frame's vertical middle line; None where the
    geometry is not symmetrical."""
    frame = subject.frame
    xy = frame.xy
    middle = (xy[:, 0].min() + xy[:, 0].max()) / 2
    place = {(round(x / subject.metre, 6), round(y / subject.metre, 6)): name
             for name, (x, y) in zip(frame.joints, xy.tolist(), strict=True)}  # fmt: skip
    twin = {}
    for name, (x, y) in zip(frame.joints, xy.tolist(), strict=True):
        other = place.get((round((2 * middle - x) / subject.metre, 6), round(y / subject.metre, 6)))
        if other is None:
            return None
        twin[name] = other
    ends = {frozenset((m.joint_from, m.joint_to)): m.name for m in frame.members.values()}
    members = []
    for m in frame.members.values():
        other = ends.get(frozenset((twin[m.joint_from], twin[m.joint_to])))
        if other is None:
            return None
        if m.name < other:
            members.append((m.name, other))
    return {"joints": [(a, b) for a, b in twin.items() if a < b], "members": members}


