"""Do members, springs and feet fit each other in stiffness, and what do the differences cost?"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from crosscheck.frame.model import FREE, HELD, Floats
from crosscheck.review.finding import Finding, Subject
from crosscheck.review.spread import member_spread

NEIGHBOURS = 1000.0
"""Ratio of stiffness to the neighbours' beyond which one of them is probably a slip."""
SHORT = 25.0
"""Times shorter than its neighbours."""


def short_members(subject: Subject) -> Iterator[Finding]:
    """Is a member very short against its neighbours?

    Why: two joints were probably meant to be one; its stiffness swamps the others' and costs digits.
    Look at: its two joints.
    Example: a member of 12 mm between the column's top and the beam's end.
    Source: common practice (25 times).
    """
    t = subject.frame.member_table
    for k, name, others in neighbours(subject):
        ratio = float(np.median(t.length[others])) / float(t.length[k])
        if ratio > SHORT:
            length = f"{t.length[k] / subject.metre:.3g} m"
            says = f"member {name} is {length} long, {ratio:.0f} times shorter than its neighbours"
            yield Finding("check", (name,), says)


def members(subject: Subject) -> Iterator[Finding]:
    """Is a member very stiff or very soft against its neighbours?

    Why: a section or a unit may have slipped; it then takes all the moment, or none.
    Look at: its section, material and length.
    Example: one beam with I in m^4 among others in cm^4.
    Source: common practice (1000 times in EI/L; bars hinged at both ends are left out, since they do not bend; or in
      EA/L).
    """
    t = subject.frame.member_table
    bars = (t.turn == FREE).all(axis=1)
    bend = np.where(bars, np.nan, t.E * t.I / t.length)
    told: set[str] = set()
    for stiffness, word in ((bend, "bending (EI/L)"), (t.E * t.A / t.length, "length (EA/L)")):
        for k, name, others in neighbours(subject):
            ratio = _against(stiffness, k, others)
            if ratio is None or name in told or 1 / NEIGHBOURS <= ratio <= NEIGHBOURS:
                continue
            told.add(name)
            factor, way = (ratio, "stiffer") if ratio > 1 else (1 / ratio, "softer")
            says = f"member {name} is {factor:,.0f} times {way} in {word} than its neighbours: a slip of units?"
            yield Finding("check", (name,), says)


def neighbours(subject: Subject) -> Iterator[tuple[int, str, list[int]]]:
    """Every member that has any: index, name, indices of the members that meet it."""
    index = subject.frame.member_index
    for k, (name, m) in enumerate(subject.frame.members.items()):
        others = {index[n] for joint in (m.joint_from, m.joint_to) for n in subject.members_at[joint]} - {k}
        if others:
            yield k, name, sorted(others)


def _against(stiffness: Floats, k: int, others: list[int]) -> float | None:
    """Ratio to the neighbours' median, None where the neighbours are further from what is usual in the frame."""
    near = stiffness[others]
    near = near[np.isfinite(near)]
    if not np.isfinite(stiffness[k]) or not len(near):
        return None
    usual, beside = float(np.nanmedian(stiffness)), float(np.median(near))
    if abs(np.log(stiffness[k] / usual)) < abs(np.log(beside / usual)):
        return None
    return float(stiffness[k]) / beside


def springs(subject: Subject) -> Iterator[Finding]:
    """Does a spring do anything between free and held?

    Why: one that is as good as free or as held was probably meant to be neither; a unit may have slipped.
    Look at: its stiffness beside 4EI/L (rotation) or EA/L and 3EI/L3 (translation) of what it holds.
    Example: rotation = "4500 N m/rad" under a column that has 40000 kN m/rad.
    Source: common practice (a hundredth of the members' stiffness, and a thousand times it).
    """
    frame, t = subject.frame, subject.frame.member_table
    for name, support in frame.supports.items():
        near = [frame.member_index[m] for m in subject.members_at[name]]
        if not near:
            continue
        bend = float(np.sum(4 * t.E[near] * t.I[near] / t.length[near]))
        push = float(np.sum(np.where(np.isnan(t.A[near]), 12 * t.E[near] * t.I[near] / t.length[near] ** 3,
                                     t.E[near] * t.A[near] / t.length[near])))  # fmt: skip
        soft = float(np.sum(3 * t.E[near] * t.I[near] / t.length[near] ** 3))
        for word, k, low, high in (
            ("rotation", support.rotation, bend, bend), ("x", support.x, soft, push), ("y", support.y, soft, push),
        ):  # fmt: skip
            yield from _spring(name, f"the {word} spring at {name}", k, low, high)
    for k, m in enumerate(frame.members.values()):
        own = float(4 * t.E[k] * t.I[k] / t.length[k])
        for end, stiffness in (("from", m.turn_from), ("to", m.turn_to)):
            yield from _spring(m.name, f"the spring at the {end} end of {m.name}", stiffness, own, own)


def _spring(name: str, what: str, k: float, low: float, high: float) -> Iterator[Finding]:
    if k in (FREE, HELD):
        return
    if k < low / 100:
        yield Finding("check", (name,), f"{what} is so soft that it is as good as free: a slip of units?")
    elif k > high * 1000:
        yield Finding("check", (name,), f"{what} is so stiff that it is as good as held: a slip of units?")


def conditioning(subject: Subject) -> Iterator[Finding]:
    """How many digits do the stiffness ratios cost?

    Why: stiff and soft members meet in one set of equations; of 16 digits about the logarithm of the largest ratio is lost.
    Look at: the stiffest and the softest member named; results should not be trusted to the last printed digit.
    Example: a stub of 5 mm beside beams of 12 m costs 10 digits.
    Source: numerical analysis (the ratio of extreme stiffnesses bounds the condition number from below); six are
      ordinary, more than nine are said.
    """
    found = member_spread(subject.frame)
    if found is not None and found.digits > 9:
        cost = f"about {found.digits:.0f} of 16 digits are lost in solving"
        says = f"stiffnesses from {found.soft} to {found.stiff} differ by 10^{found.digits:.0f}: {cost}"
        yield Finding("check", (found.stiff, found.soft), says)


def fixed_feet(subject: Subject) -> Iterator[Finding]:
    """Are columns fully fixed at the foot?

    Why: few footings and base plates hold all rotation; moments move up and sway grows where they give.
    Look at: footing and base plate; a rotation spring would say what they hold.
    Example: A = "fixed" on a pad footing on clay.
    Source: common practice.
    """
    columns = set(subject.columns)
    feet = [
        name for name, s in subject.frame.supports.items()
        if s.rotation == HELD and columns & set(subject.members_at[name])
    ]  # fmt: skip
    if feet:
        says = "fully fixed column feet: what do footing and base plate give? A rotation spring would say it"
        yield Finding("note", tuple(feet), says)
