"""Writing files so that nothing is lost or half-written, on every system."""

from __future__ import annotations

import os
import tempfile
from pathlib import Path

from crosscheck.problems import Problem, UnusableInput


def replace_text(path: str | Path, text: str) -> None:
    """Write UTF-8 text with plain line ends; the old file stays whole until the new one is complete.

    Raises UnusableInput where the folder cannot be written to.
    """
    target = Path(path)
    try:
        handle, name = tempfile.mkstemp(dir=target.parent, prefix=f".{target.name}.", suffix=".part")
    except OSError as error:
        raise _cannot(target, error) from None
    try:
        with os.fdopen(handle, "w", encoding="utf-8", newline="\n") as out:
            out.write(text)
            out.flush()
            os.fsync(out.fileno())
        _usual_mode(name)
        Path(name).replace(target)
    except OSError as error:
        raise _cannot(target, error) from None
    finally:
        Path(name).unlink(missing_ok=True)


def write_new(path: str | Path, text: str) -> None:
    """Write a file that must not exist yet. Raises UnusableInput where it does or cannot be written."""
    target = Path(path)
    try:
        with target.open("x", encoding="utf-8", newline="\n") as out:
            out.write(text)
    except FileExistsError:
        raise UnusableInput(
            [Problem(str(target), None, "", "exists already and is not overwritten", "choose another name")]
        ) from None
    except OSError as error:
        raise _cannot(target, error) from None


def _usual_mode(name: str) -> None:
    """A temporary file is private; the file it becomes should be as readable as any other."""
    mask = os.umask(0)
    os.umask(mask)
    Path(name).chmod(0o666 & ~mask)


def _cannot(path: Path, error: OSError) -> UnusableInput:
    return UnusableInput([Problem(str(path), None, "", f"cannot be written ({error.strerror or error})")])
