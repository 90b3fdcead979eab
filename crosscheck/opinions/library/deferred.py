"""matplotlib imported when the library draws, which it is never asked to, instead of whenever it is imported.

anastruct imports matplotlib's pyplot at its own import, which costs more time than all else it does here. Its references
are made to load the real modules at first use; nothing is replaced, and everybody else's `import matplotlib` is untouched.
"""

from __future__ import annotations

import contextlib
import importlib
import importlib.util
import sys
from collections.abc import Iterator
from types import ModuleType
from typing import Any

NAMES = ("matplotlib", "matplotlib.colors", "matplotlib.patches", "matplotlib.pyplot")
"""What anastruct imports."""


class _Deferred(ModuleType):
    """Stands where a module was imported, and asks the module itself for whatever is wanted of it."""

    def __getattr__(self, name: str) -> Any:
        return getattr(importlib.import_module(self.__name__), name)


@contextlib.contextmanager
def drawing_deferred() -> Iterator[None]:
    """Within this, imports of NAMES wait for their first use; none where matplotlib is absent or imported already."""
    if "matplotlib" in sys.modules or importlib.util.find_spec("matplotlib") is None:
        yield
        return
    waiting = {name: _Deferred(name) for name in NAMES}
    for name in NAMES[1:]:  # a package knows its modules as attributes
        setattr(waiting[NAMES[0]], name.rpartition(".")[2], waiting[name])
    sys.modules.update(waiting)
    try:
        yield
    finally:
        for name in NAMES:
            if isinstance(sys.modules.get(name), _Deferred):
                del sys.modules[name]
