"""Real units that a paste which states none may be printed in. The frame's own come first; no other factor is tried."""

from __future__ import annotations

from dataclasses import dataclass

from crosscheck.frame.model import Units
from crosscheck.frame.units import parse_unit

FORCES = ("kN", "N", "MN", "kgf", "tf", "lbf", "kip")
ARMS = ("m", "mm", "cm", "ft", "in")
LENGTHS = ("m", "mm", "cm", "in", "ft")
ANGLES = ("rad", "mrad", "deg")


@dataclass(frozen=True, slots=True)
class UnitChoice:
    """A unit, and what one of it is in the frame's units. `own` where it is the frame's own."""

    text: str
    factor: float
    own: bool


def _choices(names: tuple[str, ...], own: str, size: float) -> list[UnitChoice]:
    out = [UnitChoice(own, 1.0, True)]
    for name in names:
        factor = float(parse_unit(name).factor) / size
        if abs(factor - 1.0) > 1e-9:
            out.append(UnitChoice(name, factor, False))
    return out


def force_choices(units: Units) -> list[UnitChoice]:
    """Units of force, the frame's own first."""
    return _choices(FORCES, units.force, units.newton)


def arm_choices(units: Units) -> list[UnitChoice]:
    """Units of length that a moment may be printed with."""
    return _choices(ARMS, units.length, units.metre)


def length_choices(units: Units) -> list[UnitChoice]:
    """Units of displacement."""
    return _choices(LENGTHS, units.length, units.metre)


def angle_choices() -> list[UnitChoice]:
    """Units of rotation."""
    return _choices(ANGLES, "rad", 1.0)
