"""crosscheck: a second and third opinion on plane-frame results, and where and why they differ.

From a notebook or a script: `crosscheck.read`, `ask`, `verify`, `inspect`, `record`, `table`, `printed` (notebook.py), and
`UnusableInput`, which says what is wrong with what they were given.

Importing the package imports none of the numerical libraries; each room is imported when it is needed.
"""

from importlib import import_module as _import_module
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from crosscheck.notebook import ask, inspect, printed, read, record, table, verify
    from crosscheck.problems import UnusableInput

__version__ = "0.1.0"
__all__ = ["UnusableInput", "__version__", "ask", "inspect", "printed", "read", "record", "table", "verify"]


def __getattr__(name: str) -> object:
    """What a notebook uses, imported when it is first asked for: `crosscheck --help` waits for none of it."""
    if name not in __all__:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    room = "crosscheck.problems" if name == "UnusableInput" else "crosscheck.notebook"
    return getattr(_import_module(room), name)


def __dir__() -> list[str]:
    return sorted({*globals(), *__all__})
