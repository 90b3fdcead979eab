"""Could the numbers of materials and sections be what somebody meant?"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from crosscheck.frame.model import Section
from crosscheck.review.finding import Finding, Subject

GIGA = 1e9
MATERIALS = {
    "steel": (190.0, 220.0), "concrete": (8.0, 50.0), "timber": (3.0, 20.0), "wood": (3.0, 20.0), "glulam": (7.0, 17.0),
    "spruce": (5.0, 17.0), "oak": (5.0, 20.0), "aluminium": (60.0, 80.0), "aluminum": (60.0, 80.0),
    "masonry": (0.5, 30.0), "brick": (0.5, 30.0), "glass": (60.0, 80.0), "iron": (90.0, 215.0),
}  # fmt: skip
"""Usual moduli in GPa by words in a material's name: common practice (handbook ranges, from memory)."""
ANY = (0.5, 250.0)
"""GPa: no building material lies outside."""
WEIGHTS = (1.0, 120.0)
"""kN/m3 of building materials, from light timber or insulating concrete to lead."""
ALPHAS = (2e-6, 60e-6)
"""Per degree: from timber along the grain and granite to plastics."""
SHAPE = (0.004, 400.0)
"""Of I / A2: 0.02 for a plate four times as wide as deep, 0.08 for a square, 1 to 5 for rolled I-sections, 200 for the
two chords of a deep girder."""
SLENDER = (1.2, 300.0)
"""Of length over the depth of a square with the same I."""


def moduli(subject: Subject) -> Iterator[Finding]:
    """Is E what a material of that name has?

    Why: stiffness and movements are wrong by the same factor; forces too where materials are mixed.
    Look at: the unit of E; a slip is usually a factor of 1000.
    Example: E = "210 MPa" for steel.
    Source: common practice (handbook ranges, from memory).
    """
    pascal = subject.newton / subject.metre**2
    for name in _used(subject, "material"):
        gpa = subject.frame.materials[name].E / pascal / GIGA
        word = next((w for w in MATERIALS if w in name.lower()), None)
        low, high = MATERIALS[word] if word else ANY
        if not low <= gpa <= high:
            kind = word or "a building material"
            says = f"E of {name} is {gpa:.3g} GPa; {kind} usually has {low:g} to {high:g} GPa: a slip of units?"
            yield Finding("check" if ANY[0] <= gpa <= ANY[1] else "serious", (name,), says)


def weights(subject: Subject) -> Iterator[Finding]:
    """Are density and thermal expansion those of a building material?

    Why: self weight, or forces from temperature, are wrong by the same factor.
    Look at: the unit of density, and the exponent of alpha.
    Example: alpha = 12e-5; density = "7850 kN/m^3" in place of kg.
    Source: common practice (handbook ranges, from memory).
    """
    per_volume = 1000 * subject.newton / subject.metre**3
    for name in _used(subject, "material"):
        material = subject.frame.materials[name]
        if material.weight is not None and not WEIGHTS[0] <= material.weight / per_volume <= WEIGHTS[1]:
            weight = f"{material.weight / per_volume:.3g} kN/m3; building materials have 1 to 120"
            says = f"{name} weighs {weight}: a slip of units?"
            yield Finding("check", (name,), says)
        if material.alpha is not None and not ALPHAS[0] <= material.alpha <= ALPHAS[1]:
            says = f"alpha of {name} is {material.alpha:.3g} per degree; building materials have 2e-6 to 60e-6"
            yield Finding("check", (name,), says)


def sections(subject: Subject) -> Iterator[Finding]:
    """Can I, A and depth belong to one section?

    Why: one of them has probably slipped by a unit: I by 10^4 or more, A by 100, depth by 10.
    Look at: the units of all three. The radius of gyration sqrt(I/A) cannot exceed half the depth; it is 0.29 of it for
      a rectangle and 0.40 to 0.45 for an I-section about its strong axis.
    Example: I = "8360 mm^4" for a 300 mm deep beam.
    Source: geometry; the ranges without a depth are common practice.
    """
    for name in _used(subject, "section"):
        s = subject.frame.sections[name]
        if s.A is None:
            continue
        radius = float(np.sqrt(s.I / s.A))
        if s.depth is not None and radius > 0.5 * s.depth * 1.001:
            ratio = f"{radius / s.depth:.3g} of its depth; more than half is impossible"
            says = f"I and A of {name} give a radius of gyration of {ratio}: a slip of units in I, A or depth?"
            yield Finding("serious", (name,), says)
        elif s.depth is not None and radius < 0.1 * s.depth:
            ratio = f"only {radius / s.depth:.2g} of its depth"
            says = f"I and A of {name} give a radius of gyration of {ratio}: a slip of units?"
            yield Finding("check", (name,), says)
        elif not 0.003 <= radius / subject.metre <= 1.5 or not SHAPE[0] <= s.I / s.A**2 <= SHAPE[1]:
            size = f"{1000 * radius / subject.metre:.3g} mm (I/A2 = {s.I / s.A**2:.2g})"
            says = f"I and A of {name} give a radius of gyration of {size}, which no usual section has: a slip of units?"
            yield Finding("check", (name,), says)


def slenderness(subject: Subject) -> Iterator[Finding]:
    """Is the I of a section what members of their length could have?

    Why: where neither area nor depth is given, the length alone can tell a slip in I.
    Look at: the unit of I.
    Example: I = "8360 m^4" over 6 m.
    Source: common practice (length over the depth of a square of the same I from 1.2 to 300).
    """
    t = subject.frame.member_table
    for name in _used(subject, "section"):
        s = subject.frame.sections[name]
        own = [k for k, m in enumerate(subject.frame.members.values()) if m.section == name]
        if not own:  # of parts of stepped and tapered members only
            continue
        ratio = float(t.length[own].max()) / (12 * s.I) ** 0.25
        if not SLENDER[0] <= ratio <= SLENDER[1]:
            word = "stocky" if ratio < SLENDER[0] else "slender"
            says = f"members of section {name} are very {word}: {ratio:.3g} times as long as a square of that I is deep"
            yield Finding("check", (name,), says)


def weak_axis(subject: Subject) -> Iterator[Finding]:
    """Is a section bent about its weak axis?

    Why: its I is then several times too small, or the axes were swapped.
    Look at: which I of the section table was taken.
    Example: I = "604 cm^4" for an IPE 300, whose I about the strong axis is 8360 cm^4.
    Source: geometry (radius of gyration under 0.22 of the depth; 0.29 for a rectangle); without depth, a quarter of the
      I of a section of the same area.
    """
    used = [subject.frame.sections[n] for n in _used(subject, "section")]
    for s in used:
        if s.A is None:
            continue
        ratio = float(np.sqrt(s.I / s.A)) / s.depth if s.depth is not None else 0.0
        if s.depth is not None and 0.1 <= ratio < 0.22:
            says = (
                f"I of {s.name} is that of a section bent about its weak axis (radius of gyration {ratio:.2g} of the "
                "depth; 0.29 for a rectangle): were the axes swapped?"
            )
            yield Finding("check", (s.name,), says)
        elif s.depth is None and (twin := _stronger(s, used)) is not None:
            says = f"{s.name} has the area of {twin.name} and {twin.I / s.I:.3g} times less I: I about the weak axis?"
            yield Finding("check", (s.name,), says)


def _stronger(s: Section, used: list[Section]) -> Section | None:
    """Another section of the same area with more than four times the I."""
    twins = [o for o in used if s.A and o.A and o is not s and abs(o.A - s.A) <= 0.02 * s.A and o.I > 4 * s.I]
    return max(twins, key=lambda o: o.I, default=None)


def shear_areas(subject: Subject) -> Iterator[Finding]:
    """Is the shear area less than the area?

    Why: it always is; a part of the section carries the shear.
    Look at: whether the two were swapped, and their units.
    Example: A = "25 cm^2", shear_area = "53.8 cm^2".
    Source: geometry; less than a hundredth of A is common practice.
    """
    for name in _used(subject, "section"):
        s = subject.frame.sections[name]
        if s.A is None or s.shear_area is None:
            continue
        if s.shear_area > s.A * 1.0001:
            says = f"shear_area of {name} is more than its area A: a slip of units, or the two swapped?"
            yield Finding("serious", (name,), says)
        elif s.shear_area < s.A / 100:
            says = f"shear_area of {name} is {s.A / s.shear_area:,.0f} times less than its area A: a slip of units?"
            yield Finding("check", (name,), says)


def _used(subject: Subject, what: str) -> list[str]:
    """Names of the sections or materials in use, in the file's order."""
    members = subject.frame.members.values()
    pieces = [s for m in members for p in m.pieces for s in (p.first, p.last)] if what == "section" else []
    return list(dict.fromkeys([*(getattr(m, what) for m in members), *pieces]))
