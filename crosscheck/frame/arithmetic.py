"""Plain arithmetic on the parameters of a family: "span / 2 * tan(pitch)". Parsed and walked, never run as code.

A parameter is a number, a number with a unit, or a text. Units are carried along as written: "6 m" / 2 is "3 m", and what
would need one unit turned into another is refused, because a reader must see at once what a placeholder means.

>>> evaluate("span / 2 + 1 * reach", {"span": Amount(6.0, "m"), "reach": Amount(0.5, "m")})
Amount(value=3.5, unit='m')
"""

from __future__ import annotations

import ast
import math
from collections.abc import Callable, Mapping
from typing import NamedTuple

LONGEST = 200
"""Characters of an expression: a frame's dimensions need no more, and nesting stays within what can be walked."""


class ArithmeticFault(ValueError):
    """An expression that cannot be worked out; the message says why."""


class Amount(NamedTuple):
    """A number and its unit as written, "" for a plain number."""

    value: float
    unit: str = ""

    def __str__(self) -> str:
        return f"{self.value:.15g} {self.unit}".rstrip()


Value = Amount | str


def evaluate(expression: str, known: Mapping[str, Value]) -> Value:
    """The value of an expression of + - * / **, brackets, the functions of FUNCTIONS and the parameters known.

    A text stands for itself and takes part in no arithmetic. Raises ArithmeticFault.
    """
    if len(expression) > LONGEST:
        raise ArithmeticFault(f"longer than {LONGEST} characters")
    try:
        tree = ast.parse(expression.strip(), mode="eval").body
        found = _value(tree, known)
    except SyntaxError:
        raise ArithmeticFault("not plain arithmetic") from None
    except ZeroDivisionError:
        raise ArithmeticFault("divides by zero") from None
    except (OverflowError, RecursionError, MemoryError):
        raise ArithmeticFault("too large to work out") from None
    if isinstance(found, Amount) and not math.isfinite(found.value):
        raise ArithmeticFault("too large to work out")
    return found


def _value(node: ast.expr, known: Mapping[str, Value]) -> Value:
    match node:
        case ast.Name(id=name):
            if name not in known:
                raise ArithmeticFault(f"no parameter {name}; there are {', '.join(known) or 'none'}")
            return known[name]
        case ast.Constant(value=bool()):
            raise ArithmeticFault("not plain arithmetic")
        case ast.Constant(value=int() | float() as number):
            return Amount(float(number))
        case ast.UnaryOp(op=ast.USub(), operand=operand):
            one = _amount(operand, known)
            return Amount(-one.value, one.unit)
        case ast.UnaryOp(op=ast.UAdd(), operand=operand):
            return _amount(operand, known)
        case ast.BinOp(left=left, op=op, right=right) if type(op) in _OPERATORS:
            return _OPERATORS[type(op)](_amount(left, known), _amount(right, known))
        case ast.Call(func=ast.Name(id=name), args=arguments, keywords=[]) if name in FUNCTIONS and arguments:
            return FUNCTIONS[name]([_amount(a, known) for a in arguments])
    raise ArithmeticFault(f"only + - * / ** ( ) and {', '.join(FUNCTIONS)} are understood")


def _amount(node: ast.expr, known: Mapping[str, Value]) -> Amount:
    found = _value(node, known)
    if isinstance(found, str):
        raise ArithmeticFault(f'"{found}" is a text and cannot be reckoned with')
    return found


def _same(amounts: list[Amount]) -> str:
    """The unit that all share."""
    units = {a.unit for a in amounts}
    if len(units) > 1:
        a, b = sorted(units)[:2]
        raise ArithmeticFault(f"{b} beside {a or 'a plain number'}; state both in one unit")
    return units.pop()


def _plus(a: Amount, b: Amount) -> Amount:
    return Amount(a.value + b.value, _same([a, b]))


def _minus(a: Amount, b: Amount) -> Amount:
    return Amount(a.value - b.value, _same([a, b]))


def _times(a: Amount, b: Amount) -> Amount:
    if a.unit and b.unit:
        raise ArithmeticFault(f"{a.unit} times {b.unit}; only one factor may have a unit")
    return Amount(a.value * b.value, a.unit or b.unit)


def _over(a: Amount, b: Amount) -> Amount:
    if b.unit and a.unit != b.unit:
        raise ArithmeticFault(f"{a.unit or 'a plain number'} divided by {b.unit}")
    return Amount(a.value / b.value, "" if b.unit else a.unit)


def _power(a: Amount, b: Amount) -> Amount:
    if a.unit or b.unit:
        raise ArithmeticFault("powers are of plain numbers only")
    return Amount(_real(math.pow, a.value, b.value))


def _real(function: Callable[..., float], *arguments: float) -> float:
    try:
        return function(*arguments)
    except ValueError:
        raise ArithmeticFault("has no real value") from None


def _of_angle(function: Callable[[float], float]) -> Callable[[list[Amount]], Amount]:
    """A function of one angle in degrees; whole degrees that should be zero or one are."""

    def work(arguments: list[Amount]) -> Amount:
        (angle,) = _exactly(1, arguments)
        if angle.unit not in ("", "deg"):
            raise ArithmeticFault(f"an angle in degrees is wanted, not {angle.unit}")
        return Amount(round(function(math.radians(angle.value)), 15))

    return work


def _root(arguments: list[Amount]) -> Amount:
    (one,) = _exactly(1, arguments)
    if one.unit:
        raise ArithmeticFault("roots are of plain numbers only")
    return Amount(_real(math.sqrt, one.value))


def _size(arguments: list[Amount]) -> Amount:
    (one,) = _exactly(1, arguments)
    return Amount(abs(one.value), one.unit)


def _exactly(count: int, arguments: list[Amount]) -> list[Amount]:
    if len(arguments) != count:
        raise ArithmeticFault(f"a function of {count} value, not {len(arguments)}")
    return arguments


FUNCTIONS: dict[str, Callable[[list[Amount]], Amount]] = {
    "sin": _of_angle(math.sin), "cos": _of_angle(math.cos), "tan": _of_angle(math.tan),
    "sqrt": _root, "abs": _size,
    "min": lambda a: Amount(min(x.value for x in a), _same(a)),
    "max": lambda a: Amount(max(x.value for x in a), _same(a)),
}  # fmt: skip
"""Angles are in degrees."""

_OPERATORS: dict[type[ast.operator], Callable[[Amount, Amount], Amount]] = {
    ast.Add: _plus, ast.Sub: _minus, ast.Mult: _times, ast.Div: _over, ast.Pow: _power,
}  # fmt: skip
