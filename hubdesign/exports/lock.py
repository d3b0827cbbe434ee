"""A lock per target that a killed run cannot leave behind."""

from __future__ import annotations

import os
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from hubdesign.errors import OutputError

try:
    import fcntl
except ImportError:  # no POSIX system
    fcntl = None  # type: ignore[assignment]


@contextmanager
def hold_lock(path: Path) -> Iterator[None]:
    """Hold the lock file `path`; the system gives it up when the process ends, however it ends.

    Raises
    ------
    OutputError
        Where another run holds it.
    OSError
        Where the file cannot be made.
    """
    handle = _take(path)
    try:
        yield
    finally:
        # Removed while still held, so that nobody can be waiting on a file without a name.
        if fcntl is not None:
            path.unlink(missing_ok=True)
        os.close(handle)
        if fcntl is None:
            path.unlink(missing_ok=True)


def _take(path: Path) -> int:
    busy = f"another run is writing there ({path.name} is locked); wait for it or choose another folder"
    if fcntl is None:
        # O_TEMPORARY (Windows) removes the file with its last handle.
        try:
            return os.open(path, os.O_CREAT | os.O_EXCL | os.O_RDWR | getattr(os, "O_TEMPORARY", 0))
        except FileExistsError as error:
            raise OutputError(busy) from error
    while True:
        handle = os.open(path, os.O_CREAT | os.O_RDWR, 0o666)
        try:
            fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
            if _is_named(handle, path):
                return handle
        except BlockingIOError as error:
            os.close(handle)
            raise OutputError(busy) from error
        except BaseException:
            os.close(handle)
            raise
        # Its last holder removed the name between our opening and our locking it.
        os.close(handle)


def _is_named(handle: int, path: Path) -> bool:
    try:
        return os.path.samestat(os.fstat(handle), os.stat(path))
    except FileNotFoundError:
        return False
