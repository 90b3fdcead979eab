"""Units: reading them as people write them, exact conversion, and their names for reports.

Factors are exact rationals (Thompson and Taylor, NIST Special Publication 811, 2008 edition, appendix B.8: the pound is
0.45359237 kg, the inch 25.4 mm, standard gravity 9.80665 m/s^2), so that "8360 cm^4" becomes the very number that
8360e-8 is. Angles count as a dimension here, because a degree must not pass for a length; whoever compares rotational
stiffness accepts it per radian and without.

>>> parse_unit("kNm").dimension == parse_unit("kip-ft").dimension == parse_unit("N·mm").dimension
True
>>> quantity("8360 cm^4")
Quantity(value=8360.0, unit=Unit(text='cm^4', dimension=Dimension(force=0, length=4, mass=0, angle=0, temperature=0), \
factor=Fraction(1, 100000000)))
"""

from __future__ import annotations

import math
import re
import unicodedata
from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache
from typing import NamedTuple

from crosscheck.frame.model import Units

GRAVITY = Fraction("9.80665")
"""Standard acceleration of gravity, m/s^2 (NIST SP 811, table B.8)."""

LONGEST = 60
"""Characters that a unit may have: more is noise, not a unit."""


class UnitError(ValueError):
    """Text that is not a unit or not a number with a unit; the message says what was not understood."""


class Dimension(NamedTuple):
    """Exponents of a unit. Mass stands beside force because densities are stated either way."""

    force: int = 0
    length: int = 0
    mass: int = 0
    angle: int = 0
    temperature: int = 0

    def times(self, other: Dimension, power: int = 1) -> Dimension:
        return Dimension(*(a + power * b for a, b in zip(self, other, strict=True)))


@dataclass(frozen=True, slots=True)
class Unit:
    """`factor`: size in N, m, kg, rad and K to the powers of `dimension`. `text` is the writing that was read."""

    text: str
    dimension: Dimension
    factor: Fraction


class Quantity(NamedTuple):
    """A number as written, and its unit (None where none was written)."""

    value: float
    unit: Unit | None


FORCE = Dimension(force=1)
LENGTH = Dimension(length=1)
MOMENT = Dimension(force=1, length=1)
STRESS = Dimension(force=1, length=-2)
LINE_LOAD = Dimension(force=1, length=-1)
ANGLE = Dimension(angle=1)
PLAIN = Dimension()
_MASS, _WARMTH = Dimension(mass=1), Dimension(temperature=1)
_WEIGHT_DENSITY = Dimension(force=1, length=-3)

_NAMES = {
    FORCE: "a force", LENGTH: "a length", MOMENT: "a moment", STRESS: "a stress", LINE_LOAD: "a force per length",
    ANGLE: "an angle", PLAIN: "a plain number", _MASS: "a mass", _WARMTH: "a temperature",
    _WEIGHT_DENSITY: "a weight per volume", Dimension(length=2): "an area", Dimension(length=3): "a volume",
    Dimension(length=4): "a length to the fourth power", Dimension(mass=1, length=-3): "a mass per volume",
    Dimension(temperature=-1): "a share per degree", Dimension(1, 1, 0, -1, 0): "a moment per angle",
}  # fmt: skip

_POUND, _INCH = Fraction("0.45359237"), Fraction("0.0254")
_LBF, _FOOT = _POUND * GRAVITY, 12 * _INCH

# One row a unit: its dimension, its size, and every writing of it; the first is the one used in reports.
_ROWS: tuple[tuple[Dimension, Fraction | int, str], ...] = (
    (FORCE, 1, "N"), (FORCE, 10, "daN"), (FORCE, 10**3, "kN"), (FORCE, 10**6, "MN"), (FORCE, 10**9, "GN"),
    (FORCE, GRAVITY, "kgf kp"), (FORCE, 1000 * GRAVITY, "tf"),
    (FORCE, _LBF, "lbf lb lbs"), (FORCE, 1000 * _LBF, "kip kips k"),
    (LENGTH, Fraction(1, 10**6), "um μm"), (LENGTH, Fraction(1, 1000), "mm"), (LENGTH, Fraction(1, 100), "cm"),
    (LENGTH, Fraction(1, 10), "dm"), (LENGTH, 1, "m"), (LENGTH, 1000, "km"),
    (LENGTH, _INCH, "in inch inches"), (LENGTH, _FOOT, "ft foot feet"), (LENGTH, 3 * _FOOT, "yd"),
    (STRESS, 1, "Pa"), (STRESS, 100, "hPa"), (STRESS, 10**3, "kPa"), (STRESS, 10**6, "MPa"), (STRESS, 10**9, "GPa"),
    (STRESS, 10**5, "bar"), (STRESS, _LBF / _INCH**2, "psi"), (STRESS, 1000 * _LBF / _INCH**2, "ksi"),
    (STRESS, _LBF / _FOOT**2, "psf"), (STRESS, 1000 * _LBF / _FOOT**2, "ksf"),
    (LINE_LOAD, _LBF / _FOOT, "plf"), (LINE_LOAD, 1000 * _LBF / _FOOT, "klf"),
    (_WEIGHT_DENSITY, _LBF / _FOOT**3, "pcf"), (_WEIGHT_DENSITY, 1000 * _LBF / _FOOT**3, "kcf"),
    (_MASS, Fraction(1, 1000), "g"), (_MASS, 1, "kg"), (_MASS, 1000, "t Mg"), (_MASS, _POUND, "lbm"),
    (_MASS, _LBF / _FOOT, "slug"),
    (ANGLE, 1, "rad radian radians"), (ANGLE, Fraction(1, 1000), "mrad"),
    (ANGLE, Fraction(math.pi) / 180, "deg degree degrees °"),
    (_WARMTH, 1, "K C °C degC"), (_WARMTH, Fraction(5, 9), "F °F degF"),
)  # fmt: skip

_SYMBOLS: dict[str, Unit] = {
    writing: Unit(writings.split()[0], dimension, Fraction(factor))
    for dimension, factor, writings in _ROWS
    for writing in writings.split()
}
_CAPITALS: dict[str, str] = {writing.lower(): writing for writing in reversed(_SYMBOLS)}

_TOKEN = re.compile(r"\s*(?:([A-Za-zμ°]+)(?:\^?(-?[0-9]))?|([*/().-])|(1)(?![0-9.]))\s*")
_NUMBER = re.compile(r"\s*([+-]?(?:[0-9][0-9_]*(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?)")
_TIDY = str.maketrans({"−": "-", "–": "-", "·": "*", "⋅": "*", "∙": "*", "•": "*", "×": "*"})


@lru_cache(maxsize=1024)
def parse_unit(text: str) -> Unit:
    """The unit written in `text`: "kN m", "kNm", "kN-m", "kN·m/rad", "N/mm²", "kip/ft", "cm4", "1/K", "per K".

    Each "/" divides by the one factor after it. Capitals are forgiven ("KN", "MM") where nothing else can be meant; a
    small m is never taken for mega. Raises UnitError.
    """
    if len(text) > LONGEST:
        raise UnitError(f"{len(text)} characters are too many for a unit")
    tidy = unicodedata.normalize("NFKC", text).translate(_TIDY).replace("**", "^").strip()
    tidy = re.sub(r"\bper\s", "/", tidy)
    tidy = re.sub(r"(?:\bdeg\.?|°)\s+([CF])\b", r"°\1", tidy)
    if not tidy:
        raise UnitError("no unit stands here")
    dimension, factor = _evaluate(_tokens(tidy, text), text)
    return Unit(text.strip(), dimension, factor)


def _tokens(tidy: str, text: str) -> list[str | tuple[str, int]]:
    """Operators as text, symbols with their power; "1" (as in 1/K) has no symbol."""
    tokens: list[str | tuple[str, int]] = []
    at = 0
    while at < len(tidy):
        found = _TOKEN.match(tidy, at)
        if not found:
            raise UnitError(f'"{text}" is not a unit')
        symbol, power, operator, _ = found.groups()
        tokens.append(operator or (symbol or "", int(power or 1)))
        at = found.end()
    return tokens


def _evaluate(tokens: list[str | tuple[str, int]], text: str) -> tuple[Dimension, Fraction]:
    """Product of the factors; a stack entry is the running product and sign of the power that its bracket takes."""
    stack: list[tuple[Dimension, Fraction, int]] = []
    dimension, factor, sign, wanted = PLAIN, Fraction(1), 1, True
    for k, token in enumerate(tokens):
        if token == "(":
            stack.append((dimension, factor, sign))
            dimension, factor, sign, wanted = PLAIN, Fraction(1), 1, True
        elif token == ")" and stack and not wanted:
            inner, size = dimension, factor
            dimension, factor, sign = stack.pop()
            dimension, factor, sign = dimension.times(inner, sign), factor * size**sign, 1
        elif isinstance(token, tuple):
            for unit, power in _factors(token[0], token[1], text):
                dimension = dimension.times(unit.dimension, sign * power)
                factor *= unit.factor ** (sign * power)
            sign, wanted = 1, False
        elif token in ("*", ".", "-", "/") and (not wanted or (token == "/" and k == 0)):
            sign, wanted = (-1 if token == "/" else 1), True
        else:
            raise UnitError(f'"{text}" is not a unit')
    if stack or wanted:
        raise UnitError(f'"{text}" is not a unit')
    return dimension, factor


def _factors(symbol: str, power: int, text: str) -> list[tuple[Unit, int]]:
    """A symbol as one unit, or as a force and a length run together ("kNm"); the power belongs to the last."""
    if not symbol:
        return []
    unit = _symbol(symbol)
    if unit:
        return [(unit, power)]
    for k in range(len(symbol) - 1, 0, -1):
        force, length = _symbol(symbol[:k]), _symbol(symbol[k:])
        if force and length and force.dimension == FORCE and length.dimension == LENGTH:
            return [(force, 1), (length, power)]
    raise UnitError(f'"{symbol}" is not a unit' if symbol == text else f'"{symbol}" in "{text}" is not a unit')


def _symbol(symbol: str) -> Unit | None:
    unit = _SYMBOLS.get(symbol)
    if unit or symbol.lower() not in _CAPITALS:
        return unit
    writing = _CAPITALS[symbol.lower()]
    return None if symbol[0] == "m" and writing[0] == "M" else _SYMBOLS[writing]


@lru_cache(maxsize=8192)
def quantity(text: str) -> Quantity:
    """A number with its unit, or a bare number, from text such as "210 GPa", "-3.5kN/m", "12e-6 /K", "40".

    Raises UnitError.
    """
    tidy = text.replace("−", "-")
    found = _NUMBER.match(tidy)
    if not found:
        raise UnitError(f'"{_short(text)}" does not begin with a number')
    rest = tidy[found.end() :].strip()
    if re.match(r",[0-9]", rest):
        raise UnitError(f'"{_short(text)}" has a comma in its number; write a decimal point')
    if rest and (rest[0].isdigit() or rest[0] == "."):
        raise UnitError(f'"{_short(text)}" is not one number with its unit')
    return Quantity(float(found.group(1)), parse_unit(rest) if rest else None)


def _short(text: str) -> str:
    return text if len(text) <= LONGEST else text[: LONGEST - 3] + "..."


def convert(value: float, unit: Unit, target: Unit) -> float:
    """`value` of `unit` in `target`; their dimensions must be equal.

    >>> convert(30.0, parse_unit("deg"), parse_unit("deg"))
    30.0
    """
    assert unit.dimension == target.dimension
    return scaled(value, unit.factor / target.factor)


def scaled(value: float, factor: Fraction) -> float:
    """value times factor, the value taken as the decimal that it was written as, rounded once.

    >>> scaled(53.8, Fraction(1, 10**4))
    0.00538
    """
    if not math.isfinite(value):
        return value
    try:
        return float(Fraction(repr(value)) * factor)
    except OverflowError:
        return math.copysign(math.inf, value)


def frame_units(text: str) -> Units:
    """A frame's units of force and length from text such as "kN m" or "kip, ft". Raises UnitError."""
    parts = [_frame_unit(part) for part in re.split(r"[\s,;]+", text.strip()) if part]
    by_dimension = {unit.dimension: unit for unit in parts}
    if len(parts) != 2 or set(by_dimension) != {FORCE, LENGTH}:
        raise UnitError(f'"{_short(text)}" does not name one unit of force and one of length')
    force, length = by_dimension[FORCE], by_dimension[LENGTH]
    return Units(force.text, length.text, float(force.factor), float(length.factor))


def _frame_unit(text: str) -> Unit:
    unit = _symbol(text)
    if unit is None:
        raise UnitError(f'"{_short(text)}" is not a unit of force or length')
    return unit


class Scale:
    """Conversion to one frame's units: force and length as the frame has them, radians, degrees Celsius.

    A mass counts as its weight: density is the only place where a mass is read.
    """

    def __init__(self, units: Units) -> None:
        self.units = units
        self._force = _SYMBOLS[units.force].factor
        self._length = _SYMBOLS[units.length].factor
        self._known: dict[Unit, Fraction] = {}

    def to_frame(self, value: float, unit: Unit) -> float:
        """`value` of `unit` in the frame's units."""
        factor = self._known.get(unit)
        if factor is None:
            d = unit.dimension
            factor = self._known[unit] = (
                unit.factor * GRAVITY**d.mass / self._force ** (d.force + d.mass) / self._length**d.length
            )
        return scaled(value, factor)


def dimension_name(dimension: Dimension) -> str:
    """Plain words for a dimension: "a force", "an area"; exponents where there are no words.

    >>> dimension_name(Dimension(force=1, length=2))
    'force length^2'
    """
    return _NAMES.get(dimension) or " ".join(
        name if power == 1 else f"{name}^{power}" for name, power in dimension._asdict().items() if power
    )


def unit_name(units: Units, dimension: Dimension) -> str:
    """The frame's own unit of a dimension, for reports: "kN m", "kN/m^2", "kN m/rad", "m^4", "1/K".

    >>> unit_name(Units("kN", "m", 1000.0, 1.0), MOMENT)
    'kN m'
    """
    powers = zip((units.force, units.length, "kg", "rad", "K"), dimension, strict=True)
    over = [(s, p) for s, p in powers if p]
    above = " ".join(_power(s, p) for s, p in over if p > 0)
    below = "".join("/" + _power(s, -p) for s, p in over if p < 0)
    return (above or ("1" if below else "")) + below


def _power(symbol: str, power: int) -> str:
    return symbol if power == 1 else f"{symbol}^{power}"
