"""Putting a finished folder in the place of another, so that there is always a whole one.

Linux exchanges two names in one step (renameat2 with RENAME_EXCHANGE, Linux man-pages 6, rename(2)). Where
that is missing two plain renames do it, with a record of what is under way written first, which
:func:`finish_swap` reads after a crash.
"""

from __future__ import annotations

import ctypes
import errno
import json
import os
import re
import secrets
import shutil
from pathlib import Path

_AT_FDCWD = -100
_RENAME_EXCHANGE = 2


def swap_in(new: Path, target: Path) -> None:
    """Put the folder `new` in the place of `target` and remove what was there.

    Parameters
    ----------
    new
        A finished folder, already on the disk, with a name from :func:`free_name`.
    target
        A folder, or nothing yet.

    Raises
    ------
    OSError
        Where the file system refuses; `target` is then as it was.
    """
    if not target.exists():
        os.rename(new, target)
        sync_folder(target.parent)
    elif exchange(new, target):
        sync_folder(target.parent)
        shutil.rmtree(new, ignore_errors=True)
    else:
        _rename_twice(new, target)


def _rename_twice(new: Path, target: Path) -> None:
    old = free_name(target, "old")
    write_synced(record_of(target), json.dumps({"new": new.name, "old": old.name}).encode())
    sync_folder(target.parent)
    try:
        os.rename(target, old)
        os.rename(new, target)
    except OSError:
        if not target.exists():
            os.rename(old, target)
        record_of(target).unlink()
        raise
    finish_swap(target)


def finish_swap(target: Path) -> None:
    """Finish the swap that was under way when a run was killed; nothing where there was none."""
    record = record_of(target)
    try:
        told = json.loads(record.read_bytes())
        names = [str(told["new"]), str(told["old"])]
    except FileNotFoundError:
        return
    except (ValueError, TypeError, KeyError):
        names = []  # killed while the record was being written: no name was changed yet
    folders = [target.parent / name for name in names if is_leftover(target, name)]
    if not target.exists():
        # The new folder is complete: the record is written after it.
        for folder in folders:
            if folder.exists():
                os.rename(folder, target)
                break
    sync_folder(target.parent)
    for folder in folders:
        shutil.rmtree(folder, ignore_errors=True)
    record.unlink()
    sync_folder(target.parent)


def free_name(target: Path, word: str) -> Path:
    """Return an unused name beside `target` for its "new" or "old" folder."""
    return beside(target, f"{word}-{secrets.token_hex(4)}")


def is_leftover(target: Path, name: str) -> bool:
    """Whether `name` is one that :func:`free_name` gives for `target`."""
    return re.fullmatch(re.escape(beside(target, "").name) + "(new|old)-[0-9a-f]{8}", name) is not None


def record_of(target: Path) -> Path:
    """Return where the record of a swap by two renames is kept."""
    return beside(target, "swap.json")


def beside(target: Path, word: str) -> Path:
    """Return a hidden name beside `target`."""
    return target.with_name(f".{target.name}.hubdesign-{word}")


def exchange(first: Path, second: Path) -> bool:
    """Exchange two names in one step; False where the system or the file system cannot."""
    renameat2 = getattr(ctypes.CDLL(None, use_errno=True), "renameat2", None) if os.name == "posix" else None
    if renameat2 is None:
        return False
    done = renameat2(_AT_FDCWD, os.fsencode(first), _AT_FDCWD, os.fsencode(second), _RENAME_EXCHANGE)
    if done == 0:
        return True
    code = ctypes.get_errno()
    if code in (errno.ENOSYS, errno.EINVAL, errno.ENOTSUP):
        return False
    raise OSError(code, os.strerror(code), str(second))


def write_synced(path: Path, content: bytes) -> None:
    """Write a file and see it onto the disk."""
    with open(path, "wb") as file:
        file.write(content)
        file.flush()
        os.fsync(file.fileno())


def sync_folder(folder: Path) -> None:
    """See the names in `folder` onto the disk (POSIX; elsewhere a folder cannot be opened)."""
    if os.name == "posix":
        _sync(folder)


def sync_tree(folder: Path) -> None:
    """See every file and folder below `folder` onto the disk."""
    for place, _, files in os.walk(folder, topdown=False):
        for name in files:
            _sync(Path(place) / name)
        sync_folder(Path(place))


def _sync(path: Path) -> None:
    handle = os.open(path, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)
