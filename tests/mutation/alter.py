"""The terms of arithmetic in a module, and what each is altered to."""

from __future__ import annotations

import ast
import copy
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

SWAPS: dict[type[ast.operator], type[ast.operator]] = {
    ast.Add: ast.Sub, ast.Sub: ast.Add, ast.Mult: ast.Div, ast.Div: ast.Mult,
}  # fmt: skip
ENDS = {
    "turn_from": "turn_to", "rigid_from": "rigid_to", "joint_from": "joint_to", "start": "end", "first": "last",
    "cos": "sin",
}  # fmt: skip
ENDS |= {other: one for one, other in ENDS.items()}
"""Attributes and names of which one is mistaken for the other."""


@dataclass(frozen=True)
class Mutant:
    """One alteration. path: from the module's tree to the node; kind: sign, factor, index or ends."""

    file: str
    line: int
    function: str
    kind: str
    was: str
    now: str
    path: tuple[tuple[str, int | None], ...]
    variant: int

    @property
    def other(self) -> str:
        """The name taken for another's (an attribute with its point), "" where it is none: one that the module knows."""
        if self.kind != "ends" or "[" in self.now[-4:]:
            return ""
        return f".{self.now.rpartition('.')[2]}" if "." in self.now else self.now

    @property
    def key(self) -> str:
        """What a list of known mutants names it by: independent of line numbers."""
        return f"{Path(self.file).name}:{self.function}: {self.was} -> {self.now}"


def mutants(path: Path, root: Path) -> list[Mutant]:
    """Every mutant of a module, in the order of its text."""
    tree = ast.parse(path.read_text(encoding="utf-8"))
    named = {n.id for n in ast.walk(tree) if isinstance(n, ast.Name)}
    named |= {f".{n.attr}" for n in ast.walk(tree) if isinstance(n, ast.Attribute)}
    return [m for m in _walk(tree, str(path.relative_to(root)), (), "") if not m.other or m.other in named]


def altered(path: Path, mutant: Mutant) -> ast.Module:
    """The module's tree with one mutant in it."""
    tree = ast.parse(path.read_text(encoding="utf-8"))
    parent: ast.AST = tree
    for name, index in mutant.path[:-1]:
        parent = _child(parent, name, index)
    name, index = mutant.path[-1]
    new = list(_versions(_child(parent, name, index), name))[mutant.variant][1]
    if index is None:
        setattr(parent, name, new)
    else:
        getattr(parent, name)[index] = new
    return ast.fix_missing_locations(tree)


def _child(node: ast.AST, name: str, index: int | None) -> ast.AST:
    value = getattr(node, name)
    child: ast.AST = value if index is None else value[index]
    return child


def _walk(node: ast.AST, file: str, path: tuple[tuple[str, int | None], ...], function: str) -> Iterator[Mutant]:
    for name, value in ast.iter_fields(node):
        if name in ("annotation", "returns", "decorator_list", "bases", "type_params"):
            continue
        for index, child in enumerate(value) if isinstance(value, list) else ((None, value),):
            if not isinstance(child, ast.AST) or isinstance(child, ast.JoinedStr | ast.Raise | ast.Assert):
                continue
            inner = function
            if isinstance(child, ast.FunctionDef | ast.ClassDef):
                inner = f"{function}.{child.name}".lstrip(".")
            place = (*path, (name, index))
            if inner and not isinstance(node, ast.ClassDef):
                for variant, (kind, new) in enumerate(_versions(child, name)):
                    line = getattr(child, "lineno", 0)
                    yield Mutant(file, line, inner, kind, ast.unparse(child), ast.unparse(new), place, variant)
            yield from _walk(child, file, place, inner)


def _versions(node: ast.AST, field: str) -> Iterator[tuple[str, ast.expr]]:
    if isinstance(node, ast.BinOp) and type(node.op) in SWAPS and not _textual(node):
        yield "sign" if isinstance(node.op, ast.Add | ast.Sub) else "factor", _with(node, op=SWAPS[type(node.op)]())
        for side in ("left", "right"):
            number = getattr(node, side)
            if _is_number(number):
                yield "factor", _with(node, **{side: ast.Constant(number.value + 1)})
        if isinstance(node.op, ast.Sub):
            yield "sign", _with(node, left=node.right, right=node.left)
    elif isinstance(node, ast.BinOp) and isinstance(node.op, ast.Pow) and _is_number(node.right):
        yield "factor", _with(node, right=ast.Constant(node.right.value + 1))  # type: ignore[attr-defined]
    elif isinstance(node, ast.UnaryOp) and isinstance(node.op, ast.USub) and not _is_number(node.operand):
        yield "sign", copy.deepcopy(node.operand)
    elif isinstance(node, ast.Subscript):
        yield from _other_index(node)
    elif isinstance(node, ast.Attribute) and node.attr in ENDS and isinstance(node.ctx, ast.Load):
        yield "ends", _with(node, attr=ENDS[node.attr])
    elif isinstance(node, ast.Name) and node.id in ENDS and isinstance(node.ctx, ast.Load) and field != "func":
        yield "ends", _with(node, id=ENDS[node.id])


def _other_index(node: ast.Subscript) -> Iterator[tuple[str, ast.expr]]:
    parts = node.slice.elts if isinstance(node.slice, ast.Tuple) else [node.slice]
    for k, part in enumerate(parts):
        if isinstance(part, ast.Constant) and type(part.value) is int:
            new = copy.deepcopy(node)
            of = new.slice.elts if isinstance(new.slice, ast.Tuple) else [new.slice]
            other = {0: 1, 1: 0}.get(part.value, part.value - 1)
            of[k] = ast.Constant(other)
            if not isinstance(new.slice, ast.Tuple):
                new.slice = of[0]
            yield "ends" if part.value in (0, 1) else "index", new


def _with(node: ast.expr, **fields: object) -> ast.expr:
    new = copy.deepcopy(node)
    for name, value in fields.items():
        setattr(new, name, value)
    return new


def _is_number(node: ast.AST) -> bool:
    return isinstance(node, ast.Constant) and type(node.value) in (int, float)


def _textual(node: ast.BinOp) -> bool:
    """Texts and lists joined are no arithmetic."""
    kinds = ast.JoinedStr | ast.List | ast.ListComp | ast.Tuple | ast.Set
    return any(
        isinstance(side, kinds) or (isinstance(side, ast.Constant) and isinstance(side.value, str))
        for side in (node.left, node.right)
    )
