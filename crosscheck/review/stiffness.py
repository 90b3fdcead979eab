"""Could the numbers of materials, sections, members and springs be what somebody meant?"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from crosscheck.frame.model import FREE, HELD
from crosscheck.review.finding import Finding, Subject

GIGA = 1e9
MATERIALS = {
    "steel": (190.0, 220.0), "concrete": (10.0, 50.0), "timber": (3.0, 20.0), "wood": (3.0, 20.0), "glulam": (8.0, 17.0),
    "aluminium": (60.0, 75.0), "aluminum": (60.0, 75.0), "masonry": (1.0, 20.0),
}  # fmt: skip
"""Usual moduli in GPa by words in a material's name: common practice (handbook ranges, from memory)."""
ANY = (0.5, 250.0)
"""GPa: no building material lies outside."""
NEIGHBOURS = 1000.0
"""Ratio of bending stiffness EI/L to the neighbours' beyond which one of them is probably a slip."""


def moduli(subject: Subject) -> Iterator[Finding]:
    """Is E what a material of that name has? A slip of units is usually a factor of 1000."""
    pascal = subject.newton / subject.metre**2
    used = {m.material for m in subject.frame.members.values()}
    for name in used:
        gpa = subject.frame.materials[name].E / pascal / GIGA
        word = next((w for w in MATERIALS if w in name.lower()), None)
        low, high = MATERIALS[word] if word else ANY
        if not low <= gpa <= high:
            kind = word or "a building material"
            says = f"E of {name} is {gpa:.3g} GPa; {kind} usually has {low:g} to {high:g} GPa: a slip of units?"
            yield Finding("check" if ANY[0] <= gpa <= ANY[1] else "serious", (name,), says)


def sections(subject: Subject) -> Iterator[Finding]:
    """Can I, A and depth belong to one section? The radius of gyration sqrt(I/A) cannot exceed half the depth, is 0.29
    of it for a rectangle and 0.40 to 0.45 for an I-section about its strong axis, and less about its weak one."""
    used = {m.section for m in subject.frame.members.values()}
    for name in used:
        s = subject.frame.sections[name]
        if s.A is None:
            continue
        radius = float(np.sqrt(s.I / s.A))
        if s.depth is not None and radius > 0.5 * s.depth * 1.001:
            says = (
                f"I and A of {name} give a radius of gyration of {radius / s.depth:.3g} of its depth; more than half is "
                "impossible: a slip of units in I, A or depth?"
            )
            yield Finding("serious", (name,), says)
        elif s.depth is not None and radius < 0.1 * s.depth:
            says = (
                f"I and A of {name} give a radius of gyration of only {radius / s.depth:.2g} of its depth: a slip of "
                "units, or I about the weak axis?"
            )
            yield Finding("check", (name,), says)
        elif s.depth is None and not 0.003 <= radius / subject.metre <= 1.5:
            size = f"{1000 * radius / subject.metre:.3g} mm"
            says = f"I and A of {name} give a radius of gyration of {size}: a slip of units?"
            yield Finding("check", (name,), says)


def weak_axis(subject: Subject) -> Iterator[Finding]:
    """Is a section turned? Its I is far below that of another section of the same area and depth, or below what its depth
    gives about the strong axis (radius of gyration under 0.22 of the depth)."""
    used = [subject.frame.sections[n] for n in {m.section for m in subject.frame.members.values()}]
    for s in used:
        if s.A is None or s.depth is None:
            continue
        ratio = float(np.sqrt(s.I / s.A)) / s.depth
        if 0.1 <= ratio < 0.22:
            says = (
                f"I of {s.name} is that of a section bent about its weak axis (radius of gyration {ratio:.2g} of the "
                "depth; 0.29 for a rectangle): were the axes swapped?"
            )
            yield Finding("check", (s.name,), says)
    for s in used:
        twins = [o for o in used if o is not s and s.A and o.A and abs(o.A - s.A) <= 0.02 * s.A]
        for o in twins:
            if s.depth is None and o.I > 4 * s.I:
                says = f"{s.name} has the area of {o.name} and {o.I / s.I:.3g} times less I: I about the weak axis?"
                yield Finding("check", (s.name,), says)


def shear_areas(subject: Subject) -> Iterator[Finding]:
    """Is the shear area less than the area? It always is."""
    for name in {m.section for m in subject.frame.members.values()}:
        s = subject.frame.sections[name]
        if s.A is not None and s.shear_area is not None and s.shear_area > s.A * 1.0001:
            says = f"shear_area of {name} is more than its area A: a slip of units, or the two swapped?"
            yield Finding("serious", (name,), says)


def members(subject: Subject) -> Iterator[Finding]:
    """Is a member very short, very stiff or very soft against its neighbours? Then a length, a section or a unit may have
    slipped, and the equations lose digits."""
    frame, t = subject.frame, subject.frame.member_table
    stiffness = t.E * t.I / t.length
    index = frame.member_index
    for k, (name, m) in enumerate(frame.members.items()):
        near = {n for joint in (m.joint_from, m.joint_to) for n in subject.members_at[joint]} - {name}
        others = np.array([index[n] for n in near], dtype=int)
        if len(others) == 0:
            continue
        ratio = stiffness[k] / np.median(stiffness[others])
        if t.length[k] < np.median(t.length[others]) / 25:
            times = f"{np.median(t.length[others]) / t.length[k]:.0f} times"
            says = f"member {name} is {t.length[k] / subject.metre:.3g} m long, {times} shorter than its neighbours"
            yield Finding("check", (name,), says)
        if (ratio > NEIGHBOURS and (ratio > stiffness[k] / stiffness[others]).any()) or ratio < 1 / NEIGHBOURS:
            word = "stiffer" if ratio > 1 else "softer"
            factor = ratio if ratio > 1 else 1 / ratio
            says = f"member {name} is {factor:,.0f} times {word} in bending (EI/L) than its neighbours: a slip of units?"
            yield Finding("check", (name,), says)


def springs(subject: Subject) -> Iterator[Finding]:
    """Does a spring do anything between free and held? Below a hundredth of the members' stiffness it is as good as free,
    above a thousand times it as good as held; by a factor of 1000 a unit may have slipped."""
    frame, t = subject.frame, subject.frame.member_table
    for name, support in frame.supports.items():
        near = [frame.member_index[m] for m in subject.members_at[name]]
        if not near:
            continue
        bend = float(np.sum(4 * t.E[near] * t.I[near] / t.length[near]))
        push = float(np.nansum(np.where(np.isnan(t.A[near]), 12 * t.E[near] * t.I[near] / t.length[near] ** 3,
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
    """How many digits do the stiffness ratios cost? About the logarithm of the largest ratio of stiffness met at the
    joints; six are ordinary, with more than nine results should not be trusted to the last printed digit."""
    t = subject.frame.member_table
    bend = 12 * t.E * t.I / t.clear**3
    stretch = t.E * t.A / t.clear if subject.frame.analysis.axial == "elastic" else bend
    values = np.concatenate([bend, stretch])
    values = values[np.isfinite(values) & (values > 0)]
    if len(values) == 0:
        return
    digits = float(np.log10(values.max() / values.min()))
    if digits > 9:
        says = f"stiffnesses differ by 10^{digits:.0f}: about {digits:.0f} of 16 digits are lost in solving"
        yield Finding("check", (), says)


def fixed_feet(subject: Subject) -> Iterator[Finding]:
    """Are columns fully fixed at the foot? Few footings are; say what justifies it, or give the rotation a spring."""
    columns = set(subject.columns)
    feet = [
        name for name, s in subject.frame.supports.items()
        if s.rotation == HELD and columns & set(subject.members_at[name])
    ]  # fmt: skip
    if feet:
        says = "fully fixed column feet: what do footing and base plate give? A spring would say it"
        yield Finding("note", tuple(feet), says)
