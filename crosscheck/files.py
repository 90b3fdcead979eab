"""Writing files so that nothing is lost or half-written, on every system."""

from __future__ import annotations

import contextlib
import glob
import os
import sys
import tempfile
import time
from collections.abc import Iterator
from pathlib import Path

from crosscheck.problems import Problem, UnusableInput

PART = ".part"
"""Ending of a file not written to its end yet."""
PATIENCE = 60.0
"""Seconds to wait for another process that writes the same file."""
REPLACE_TRIES = 50 if os.name == "nt" else 0


def replace_text(path: str | Path, text: str) -> None:
    """Write UTF-8 text with plain line ends; the old file stays whole until the new one is complete.

    Raises UnusableInput where the folder cannot be written to.
    """
    replace_bytes(path, text.encode("utf-8"))


def replace_bytes(path: str | Path, data: bytes) -> None:
    """The same for bytes as they stand. A device or a pipe is written to as it is: there is nothing to keep whole."""
    target = Path(path)
    if target.exists() and not target.is_file() and not target.is_dir():
        _write_to(target, data)
        return
    try:
        handle, name = tempfile.mkstemp(dir=target.parent, prefix=f".{target.name}.", suffix=PART)
    except OSError as error:
        raise _cannot(target, error) from None
    try:
        with os.fdopen(handle, "wb") as out:
            out.write(data)
            out.flush()
            os.fsync(out.fileno())
        _usual_mode(name)
        _replace(Path(name), target)
    except OSError as error:
        raise _cannot(target, error) from None
    finally:
        Path(name).unlink(missing_ok=True)


def _write_to(device: Path, data: bytes) -> None:
    try:
        with device.open("wb") as out:
            out.write(data)
    except OSError as error:
        raise _cannot(device, error) from None


def _replace(new: Path, target: Path) -> None:
    """Windows refuses while anybody reads the old file, which is over in a moment."""
    for _ in range(REPLACE_TRIES):
        try:
            new.replace(target)
            return
        except PermissionError:
            time.sleep(0.02)
    new.replace(target)


@contextlib.contextmanager
def alone(target: Path) -> Iterator[None]:
    """Keeps other processes that ask for the same target waiting, so that reading and replacing it lose nothing.

    The lock is the operating system's, on a file beside the target, and ends with the process that holds it, however that
    ends; what a killed one left half-written beside the target is cleared away. Raises UnusableInput.
    """
    lock = target.with_name(f".{target.name}.lock")
    deadline = time.monotonic() + PATIENCE
    while (held := _try_lock(lock, target)) is None:
        if time.monotonic() > deadline:
            advice = "wait for it, or end it"
            raise UnusableInput([Problem(str(target), None, "", "another process is writing it", advice)])
        time.sleep(0.02)
    try:
        for left in target.parent.glob(f".{glob.escape(target.name)}.*{PART}"):
            left.unlink(missing_ok=True)
        yield
    finally:
        _let_go(held, lock)


def _try_lock(lock: Path, target: Path) -> int | None:
    """The locked file's handle; None where somebody else holds it, or took the file away in the meantime."""
    try:
        handle = os.open(lock, os.O_CREAT | os.O_RDWR)
    except PermissionError:
        if os.name == "nt":  # being deleted by the one who held it
            return None
        raise _cannot(target, PermissionError(13, "Permission denied")) from None
    except OSError as error:
        raise _cannot(target, error) from None
    if _system_lock(handle) and _same_file(handle, lock):
        return handle
    os.close(handle)
    return None


def _system_lock(handle: int) -> bool:
    try:
        if sys.platform == "win32":
            import msvcrt

            msvcrt.locking(handle, msvcrt.LK_NBLCK, 1)
        else:
            import fcntl

            fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except OSError:
        return False
    return True


def _same_file(handle: int, lock: Path) -> bool:
    try:
        return os.path.samestat(os.fstat(handle), lock.stat())
    except OSError:
        return False


def _let_go(handle: int, lock: Path) -> None:
    """Elsewhere the file goes before the lock does; Windows deletes no open file, and none that another has opened."""
    if os.name == "nt":
        os.close(handle)
    with contextlib.suppress(OSError):
        lock.unlink(missing_ok=True)
    if os.name != "nt":
        os.close(handle)


def write_new(path: str | Path, text: str) -> None:
    """Write a file that must not exist yet. Raises UnusableInput where it does or cannot be written."""
    target = Path(path)
    begun = False
    try:
        with target.open("x", encoding="utf-8", newline="\n") as out:
            begun = True
            out.write(text)
    except FileExistsError:
        raise UnusableInput(
            [Problem(str(target), None, "", "exists already and is not overwritten", "choose another name")]
        ) from None
    except OSError as error:
        if begun:  # a full disk: half a file is worse than none
            target.unlink(missing_ok=True)
        raise _cannot(target, error) from None


def _usual_mode(name: str) -> None:
    """A temporary file is private; the file it becomes should be as readable as any other."""
    mask = os.umask(0)
    os.umask(mask)
    Path(name).chmod(0o666 & ~mask)


def _cannot(path: Path, error: OSError) -> UnusableInput:
    return UnusableInput([Problem(str(path), None, "", f"cannot be written ({error.strerror or error})")])
