"""What an idealisation and the loads need of sections and materials, and the idealisation itself, stated or not."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import replace
from typing import Literal, TypeVar

from crosscheck.frame.locate import Path, dotted
from crosscheck.frame.model import Analysis, Frame, Material, Member, Section, SelfWeight, Temperature
from crosscheck.frame.pieces import unfit
from crosscheck.problems import Problem, UnusableInput, nearest

Named = TypeVar("Named", bound=str)
Fault = tuple[Path, str, str]
"""Where, what is wrong, what would be right."""

ORDERS = (1, 2)
"""Orders of theory that are read."""

AXIAL: tuple[Literal["elastic", "rigid"], ...] = ("elastic", "rigid")
SHEAR: tuple[Literal["rigid", "elastic"], ...] = ("rigid", "elastic")


def used_sections(frame: Frame, members: Iterable[Member] | None = None) -> list[Section]:
    """Sections that a member (or one of `members`) has, in the file's order."""
    used: set[str] = set()
    for member in frame.members.values() if members is None else members:
        used |= {member.section, *(name for p in member.pieces for name in (p.first, p.last))}
    return [section for section in frame.sections.values() if section.name in used]


def used_materials(frame: Frame) -> list[Material]:
    """Materials that a member has, in the file's order."""
    used = {member.material for member in frame.members.values()}
    return [material for material in frame.materials.values() if material.name in used]


def order_fault(order: object) -> str:
    """Why an `order` cannot be used, or ""."""
    return "" if type(order) is int and order in ORDERS else "order is 1 or 2"


def default_axial(frame: Frame) -> tuple[Literal["elastic", "rigid"], str]:
    """Elastic when every section used has A; else rigid, with the warning that says so."""
    without = [f'"{section.name}"' for section in used_sections(frame, _stretching(frame)) if section.A is None]
    if not without:
        return "elastic", ""
    sections = f"section {without[0]} has" if len(without) == 1 else f"sections {', '.join(without[:12])} have"
    return "rigid", (
        f'AXIALLY RIGID because {sections} no A: members are taken to keep their length. '
        'Give A everywhere, or say axial = "rigid" in [analysis] to show that it is meant'
    )  # fmt: skip


def _stretching(frame: Frame) -> list[Member]:
    """Members that are not rigid by their own word."""
    return [member for member in frame.members.values() if not member.axial]


def unmet(frame: Frame) -> Iterator[Fault]:
    """Everything that the frame's idealisation and loads need and its sections and materials do not state."""
    yield from _idealisation(frame)
    yield from _one_way(frame)
    yield from _tapers(frame)
    yield from _self_weight(frame)
    yield from _temperatures(frame)


def _idealisation(frame: Frame) -> Iterator[Fault]:
    analysis = frame.analysis
    for section in used_sections(frame, _stretching(frame)):
        if analysis.axial == "elastic" and section.A is None:
            yield _section(section, 'has no A, which axial = "elastic" needs', 'give A, or set axial = "rigid"')
    for section in used_sections(frame):
        if analysis.shear == "elastic" and section.shear_area is None:
            says = 'has no shear_area, which shear = "elastic" needs'
            yield _section(section, says, 'give shear_area, or set shear = "rigid"')
    for material in used_materials(frame):
        if analysis.shear == "elastic" and material.G is None:
            says = 'has neither G nor nu, and shear = "elastic" needs one'
            yield _material(material, says, 'give nu = 0.3, say, or set shear = "rigid"')


def _one_way(frame: Frame) -> Iterator[Fault]:
    """A rigid member cannot be said to work by its stretch."""
    for member in frame.members.values():
        if member.only and (member.axial or frame.analysis.axial == "rigid"):
            instead = "leave its axial out" if member.axial else 'give A everywhere and set axial = "elastic"'
            yield ("members", member.name), f'works in {member.only} only, and an axially rigid member cannot', instead


def _tapers(frame: Frame) -> Iterator[Fault]:
    for member in frame.members.values():
        for piece in member.pieces:
            says, instead = unfit(piece, frame.sections)
            if says:
                yield ("members", member.name), says, instead


def _self_weight(frame: Frame) -> Iterator[Fault]:
    if not any(isinstance(load, SelfWeight) for case in frame.cases.values() for load in case.loads):
        return
    for section in used_sections(frame):
        if section.A is None:
            yield _section(section, "has no A, which self weight needs", 'give A, such as A = "53.8 cm^2"')
    for material in used_materials(frame):
        if material.weight is None:
            says = "has no density, which self weight needs"
            yield _material(material, says, 'give density, such as density = "7850 kg/m^3"')


def _temperatures(frame: Frame) -> Iterator[Fault]:
    """One fault a load entry and section or material: an entry may stand for many members."""
    seen: set[tuple[str, int, str]] = set()
    for case in frame.cases.values():
        for load in case.loads:
            if not isinstance(load, Temperature) or load.member not in frame.members:
                continue
            for says, instead in _temperature(frame, load):
                if (case.name, load.entry, says) not in seen:
                    seen.add((case.name, load.entry, says))
                    yield ("loads", case.name, "apply", load.entry), says, instead


def _temperature(frame: Frame, load: Temperature) -> Iterator[tuple[str, str]]:
    member = frame.members[load.member]
    material = frame.materials.get(member.material)
    if material and material.alpha is None:
        yield f'material "{material.name}" has no alpha, which a temperature needs', 'give alpha = "12e-6 /K", say'
    for section in used_sections(frame, [member]) if load.difference else []:
        if section.depth is None:
            yield f'section "{section.name}" has no depth, which a temperature difference needs', "give depth"


def _section(section: Section, says: str, instead: str) -> Fault:
    return ("sections", section.name), says, instead


def _material(material: Material, says: str, instead: str) -> Fault:
    return ("materials", material.name), says, instead


def with_analysis(
    frame: Frame,
    axial: str | None = None,
    shear: str | None = None,
    order: int | None = None,
    tolerance: float | None = None,
) -> Frame:
    """The same frame under another idealisation or tolerance (a fraction); None leaves what the frame says.

    Raises UnusableInput for an unknown word, or where sections and materials do not state what it needs.
    """
    faults: list[Fault] = []
    axial_word = _one_of("axial", axial or frame.analysis.axial, AXIAL, faults)
    shear_word = _one_of("shear", shear or frame.analysis.shear, SHEAR, faults)
    order = frame.analysis.order if order is None else order
    if order_fault(order):
        faults.append((("analysis", "order"), order_fault(order), "use order = 1"))
    if tolerance is not None and not 0 < tolerance < 1:
        says = f"a tolerance of {100 * tolerance:g}% is not between 0 and 100 per cent"
        faults.append((("analysis", "tolerance"), says, "give 1, for 1%, say"))
    if faults:
        raise UnusableInput(_problems(frame, faults))
    analysis = Analysis(
        axial=axial_word,
        axial_stated=frame.analysis.axial_stated or axial is not None,
        shear=shear_word,
        order=1 if order == 1 else 2,
        tolerance=frame.analysis.tolerance if tolerance is None else tolerance,
    )
    silenced = {default_axial(frame)[1]} if axial is not None else set()
    changed = replace(frame, analysis=analysis, warnings=tuple(w for w in frame.warnings if w not in silenced))
    faults = list(unmet(changed))
    if faults:
        raise UnusableInput(_problems(frame, faults))
    return changed


def _one_of(key: str, value: str, words: tuple[Named, ...], faults: list[Fault]) -> Named:
    for word in words:
        if word == value:
            return word
    listed = " or ".join(f'"{word}"' for word in words)
    faults.append((("analysis", key), f'"{value}" is not {listed}', nearest(value, words)))
    return words[0]


def _problems(frame: Frame, faults: list[Fault]) -> list[Problem]:
    return [Problem(frame.file, frame.lines.get(dotted(path)), dotted(path), *words) for path, *words in faults]
