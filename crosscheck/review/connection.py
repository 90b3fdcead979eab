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
MOST_CROSSED = 2000
"""Most members among which crossings are looked for: every pair is looked at."""


def mechanisms(subject: Subject) -> Iterator[Finding]:
    """Can the frame, or a part of it, move without resistance?

    Why: it has no answer then; a program that gives one gives numerical noise.
    Look at: supports and hinges of the joints named, and whether a member or a bracing is missing.
    Example: a portal with pinned feet and a hinge at each end of its beam sways freely.
    Source: statics; kinematic matrix of rigid bodies (Pellegrino and Calladine 1986).
    """
    for motion in subject.motions:
        size = np.hypot(motion.joints[:, 0], motion.joints[:, 1]) + np.abs(motion.joints[:, 2])
        names = [name for name, s in zip(subject.frame.joints, size, strict=True) if s > 1e-6 * size.max()]
        yield Finding("serious", tuple(names), f"{motion.says}; it has no answer until something stops this")


def unusable(subject: Subject) -> Iterator[Finding]:
    """Is there a load or an imposed movement that the frame cannot answer?

    Why: nothing resists it, or axially rigid members cannot follow it; no analysis of this model exists.
    Look at: what the message names; axial = "elastic" is often the remedy for temperatures and settlements.
    Example: a beam between two held supports, axially rigid, and heated.
    Source: kinematics.
    """
    for problem in subject.refused:
        yield Finding("serious", (problem.key,) if problem.key else (), str(problem))


def loose_joints(subject: Subject) -> Iterator[Finding]:
    """Does any joint belong to no member?

    Why: it takes no part in the frame, and neither does a load or a support on it.
    Look at: a member that should end there, and has another joint's name.
    Example: joints B and D defined, the beam drawn from B to C, D forgotten.
    Source: common practice.
    """
    for joint, members in subject.members_at.items():
        if not members:
            says = f"joint {joint} belongs to no member; is a member missing, or the joint left over?"
            yield Finding("check", (joint,), says)


def near_joints(subject: Subject) -> Iterator[Finding]:
    """Do two joints lie nearly at one place with nothing between them?

    Why: what ends at the two is not connected, although it looks so on every drawing.
    Look at: the coordinates of both; members that should end at one of them.
    Example: a beam from B2 = (0, 3.500) and a column top at B1 = (0, 3.501).
    Source: common practice (50 mm).
    """
    frame = subject.frame
    names, xy = list(frame.joints), frame.xy
    linked = {frozenset((m.joint_from, m.joint_to)) for m in frame.members.values()}
    for i, j in close_pairs(xy, NEAR * subject.metre):
        pair = names[i], names[j]
        if frozenset(pair) in linked or not all(subject.members_at[n] for n in pair):
            continue
        gap = 1000 * float(np.hypot(*(xy[i] - xy[j]))) / subject.metre
        where = f"lie {gap:.3g} mm apart" if gap > 1e-6 else "lie at one place"
        yield Finding("check", pair, f"joints {pair[0]} and {pair[1]} {where} and nothing connects them: one joint?")


def close_pairs(xy: np.ndarray, reach: float) -> list[tuple[int, int]]:
    """Index pairs of points nearer than reach."""
    from scipy.spatial import cKDTree

    return sorted(cKDTree(xy).query_pairs(reach)) if len(xy) > 1 else []


def touching(subject: Subject) -> Iterator[Finding]:
    """Does a joint with members of its own lie on a member that does not end there?

    Why: what meets at the joint is not connected to the member that it touches.
    Look at: the member; divide it at the joint, unless the two pass by each other.
    Example: a beam drawn in one from A to C over a column whose top is B.
    Source: common practice (50 mm).
    """
    frame, t = subject.frame, subject.frame.member_table
    joints = list(frame.joints)
    margin = NEAR * subject.metre
    for k, name in enumerate(frame.members):
        run = frame.xy - frame.xy[t.ends[k, 0]]
        along = run[:, 0] * t.cos[k] + run[:, 1] * t.sin[k]
        off = np.abs(run[:, 1] * t.cos[k] - run[:, 0] * t.sin[k])
        on = (off < margin) & (along > margin) & (along < t.length[k] - margin)
        touched = [joints[j] for j in np.flatnonzero(on) if subject.members_at[joints[j]]]
        if touched:
            lie = f"joint {touched[0]} lies" if len(touched) == 1 else f"joints {listed(touched)} lie"
            says = f"{lie} on member {name}, which does not end there: nothing connects them; divide {name} there"
            yield Finding("serious", (*touched, name), says)


def crossing(subject: Subject) -> Iterator[Finding]:
    """Do members cross without a joint?

    Why: they pass by each other in this model.
    Look at: whether they meet in the structure. Crossed bracing usually does not, beams and columns usually do.
    Example: a column drawn in one from foot to roof through a floor beam.
    Source: common practice; a note where both are hinged at both ends, as bracing is.
    """
    frame, t = subject.frame, subject.frame.member_table
    names = list(frame.members)
    if len(names) > MOST_CROSSED:
        return
    start, run = frame.xy[t.ends[:, 0]], np.column_stack([t.cos, t.sin]) * t.length[:, None]
    hinged = (t.turn == FREE).all(axis=1)
    for i in range(len(names)):
        others = np.arange(i + 1, len(names))
        cross = run[i, 0] * run[others, 1] - run[i, 1] * run[others, 0]
        gap = start[others] - start[i]
        with np.errstate(divide="ignore", invalid="ignore"):
            a = (gap[:, 0] * run[others, 1] - gap[:, 1] * run[others, 0]) / cross
            b = (gap[:, 0] * run[i, 1] - gap[:, 1] * run[i, 0]) / cross
        for j in others[(a > 0.01) & (a < 0.99) & (b > 0.01) & (b < 0.99)]:
            yield Finding(
                "note" if hinged[i] and hinged[j] else "check", (names[i], names[j]),
                f"members {names[i]} and {names[j]} cross without a joint and pass by each other in this model",
            )  # fmt: skip


def doubled(subject: Subject) -> Iterator[Finding]:
    """Do two members join the same two joints?

    Why: their stiffness adds up, and so does their weight.
    Look at: the list of members; one was probably entered twice.
    Example: "A-B" and, a page later, "B-A".
    Source: common practice.
    """
    seen: dict[frozenset[str], list[str]] = {}
    for m in subject.frame.members.values():
        seen.setdefault(frozenset((m.joint_from, m.joint_to)), []).append(m.name)
    for pair, names in seen.items():
        if len(names) > 1:
            ends = " and ".join(sorted(pair))
            yield Finding("check", tuple(names), f"members {listed(names)} all join {ends}: their stiffness adds up")


def idle_supports(subject: Subject) -> Iterator[Finding]:
    """Does a support hold nothing?

    Why: it was meant to; the frame is softer, or the load goes elsewhere, than somebody thinks.
    Look at: its directions, and the joint it stands at.
    Example: a support at joint D, while the column ends at joint D2 in the same place.
    Source: common practice.
    """
    frame = subject.frame
    for name, support in frame.supports.items():
        if support.x == support.y == support.rotation == FREE:
            yield Finding("check", (name,), f"the support at {name} is free in every direction and holds nothing")
        elif not subject.members_at[name]:
            yield Finding("check", (name,), f"the support at {name} holds a joint that belongs to no member")
        elif subject.solved:
            pulls = [case.reactions[frame.joint_index[name]] for case in subject.solved.values()]
            largest = max(float(np.nanmax(np.abs(a.reactions), initial=0.0)) for a in subject.solved.values())
            if not np.isnan(pulls).any() and np.abs(pulls).max() <= 1e-9 * largest:
                yield Finding("note", (name,), f"the support at {name} has no reaction in any case")


def off_line(subject: Subject) -> Iterator[Finding]:
    """Is a joint a hand's breadth off a line or a level that others keep?

    Why: one coordinate has probably slipped; a real jog is drawn as one.
    Look at: the joint's coordinates beside those of the line.
    Example: four column tops at 3.60, 3.60, 3.06, 3.60 are told by the level; at 3.60, 3.60, 3.56, 3.60 by this.
    Source: common practice (120 mm, and three joints that keep the line).
    """
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
