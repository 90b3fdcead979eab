"""Puts one altered function into the running process: its code is exchanged, so that whoever imported it has it too."""

from __future__ import annotations

import functools
import importlib
import types
from pathlib import Path
from typing import Any

from tests.mutation.alter import Mutant, altered


def install(mutant: Mutant, root: Path) -> None:
    """Exchange the code of the mutant's function. Raises LookupError where it cannot be found."""
    code = compile(altered(root / mutant.file, mutant), str(root / mutant.file), "exec")
    module = importlib.import_module(".".join(Path(mutant.file).with_suffix("").parts).removesuffix(".__init__"))
    names = mutant.function.split(".")
    target, inner = _function(module, code, names)
    target.__code__ = inner
    _forget()


def _function(module: types.ModuleType, code: types.CodeType, names: list[str]) -> tuple[Any, types.CodeType]:
    """The outermost function on the way, and its altered code; what is nested in it is part of that code."""
    holder: Any = module
    for name in names:
        found = [c for c in code.co_consts if isinstance(c, types.CodeType) and c.co_name == name]
        if not found:
            raise LookupError(f"no code for {name}")
        code = found[-1]
        holder = holder.__dict__[name] if isinstance(holder, type) else getattr(holder, name)
        function = _plain(holder)
        if function is not None:
            return function, code
    raise LookupError(f"{'.'.join(names)} is no function")


def _plain(value: Any) -> types.FunctionType | None:
    """The plain function inside properties, caches and other wrappings; None for a class."""
    if isinstance(value, type):
        return None
    for name in ("fget", "func", "__func__", "__wrapped__"):
        value = getattr(value, name, value) if not isinstance(value, types.FunctionType) or name == "__wrapped__" else value
    return value if isinstance(value, types.FunctionType) else None


def _forget() -> None:
    """Empty every cache of the package: what was worked out before the change does not count."""
    for cache in caches():
        cache.cache_clear()


@functools.cache
def caches() -> tuple[Any, ...]:
    """The caches of the package's functions, looked for once: in the parent, so that it is quick in each child."""
    import gc

    kind = functools._lru_cache_wrapper
    return tuple(c for c in gc.get_objects() if isinstance(c, kind) and str(c.__module__).startswith("crosscheck"))
