"""The result folder: written beside the target, swapped in whole, never over anything that is not ours.

A run claims its target first (:func:`claim_target`), which refuses what must not be replaced before any long
work begins, holds a lock against a second run and clears up after killed ones. The result is then written
into a new folder beside the target; only when it is complete, listed in its manifest and on the disk, is it
swapped in (:mod:`hubdesign.exports.swap`).
"""

from __future__ import annotations

import errno
import hashlib
import json
import os
import shutil
from collections.abc import Iterator
from contextlib import ExitStack, contextmanager, suppress
from dataclasses import dataclass
from pathlib import Path

import hubdesign
from hubdesign.errors import OutputError
from hubdesign.exports.lock import hold_lock
from hubdesign.exports.swap import beside, finish_swap, free_name, is_leftover, record_of, swap_in, sync_tree

MANIFEST = "manifest.json"
_TOOL = "hubdesign"
_NAMES_SHOWN = 3


@dataclass(frozen=True, slots=True)
class Manifest:
    """What a result folder holds.

    Attributes
    ----------
    version
        Of the tool that wrote it.
    kind
        "design" or "comparison".
    files
        Path below the folder, with slashes -> SHA-256 of the file, hexadecimal; the manifest itself excepted.
    """

    version: str
    kind: str
    files: dict[str, str]


class Claim:
    """A target that this run alone may write; see :func:`claim_target`."""

    def __init__(self, target: Path, inputs: Path | None) -> None:
        self.target = target
        self._inputs = inputs

    @contextmanager
    def new_result(self, kind: str) -> Iterator[Path]:
        """Give a new folder to fill; at the end of the block it takes the place of the target.

        Nothing is changed where the block raises.

        Raises
        ------
        OutputError
            Where the folder cannot be written: a full disk, missing rights; the old result is kept.
        """
        new = free_name(self.target, "new")
        with _said_of(self.target):
            try:
                new.mkdir()
                yield new
                write_manifest(new, kind)
                sync_tree(new)
                check_target(self.target, self._inputs)  # somebody may have put a file there meanwhile
                swap_in(new, self.target)
            finally:
                shutil.rmtree(new, ignore_errors=True)


@contextmanager
def claim_target(target: str | Path, inputs: str | Path | None = None) -> Iterator[Claim]:
    """Claim `target` for the length of the block: refuse what must not be replaced, lock, clear up.

    Missing folders above the target are made, and removed again where nothing was written.

    Parameters
    ----------
    target
        The result folder: not there yet, empty, or a result of ours.
    inputs
        The folder or workbook that the result is made from.

    Raises
    ------
    OutputError
        Where :func:`check_target` refuses it, another run holds it, or it cannot be written.
    """
    check_target(target, inputs)
    place = _real(target)
    above = [folder for folder in place.parents if not folder.exists()]
    try:
        with ExitStack() as held:
            with _said_of(place):
                place.parent.mkdir(parents=True, exist_ok=True)
                held.enter_context(hold_lock(beside(place, "lock")))
                _clear_up(place)
                check_target(place, inputs)
            yield Claim(place, None if inputs is None else Path(inputs))
    finally:
        for folder in above:
            with suppress(OSError):
                folder.rmdir()


def check_target(target: str | Path, inputs: str | Path | None = None) -> None:
    """Refuse a target that must not be written.

    Raises
    ------
    OutputError
        Where it is a file, is or holds or lies in the inputs, is or holds the working folder, or is a folder
        with anything in it that is not listed in its own manifest.
    """
    place = _real(target)
    if inputs is not None:
        _check_apart(place, _real(inputs))
    nearest = next(folder for folder in (place, *place.parents) if os.path.lexists(folder))
    if not nearest.is_dir():
        raise OutputError(f"{nearest}: is a file; the result needs a folder")
    if nearest is place:
        here = Path.cwd()
        if place in (here, *here.parents):
            raise OutputError(
                f"{place}: is the folder you are in; choose another one, or start from elsewhere"
            )
        foreign = _foreign_entries(place)
        if foreign:
            raise OutputError(
                f"{place}: holds what is not a result of {_TOOL} ({_some(foreign)}); nothing was written:"
                " choose another folder, or empty this one"
            )


def repair(target: str | Path) -> None:
    """Finish the swap of a run that was killed in the middle of it; readers of a result call this first.

    Raises
    ------
    OutputError
        Where a living run is writing there and there is no result to read meanwhile, or where the file
        system refuses.
    """
    place = _real(target)
    if not record_of(place).exists():
        return
    try:
        with _said_of(place), hold_lock(beside(place, "lock")):
            _clear_up(place)
    except OutputError:
        if not place.is_dir():
            raise


def read_manifest(folder: str | Path) -> Manifest:
    """Return the manifest of a result folder.

    Raises
    ------
    OutputError
        Where `folder` is not a result of ours.
    """
    path = Path(folder) / MANIFEST
    refusal = f"{folder}: is not a result of {_TOOL}"
    try:
        told = json.loads(path.read_bytes())
    except (OSError, ValueError) as error:
        raise OutputError(f"{refusal}: {MANIFEST} is missing or cannot be read") from error
    if not isinstance(told, dict) or told.get("tool") != _TOOL or not isinstance(told.get("files"), dict):
        raise OutputError(f"{refusal}: {MANIFEST} is not ours")
    files = {str(name): str(digest) for name, digest in told["files"].items()}
    return Manifest(str(told.get("version", "")), str(told.get("kind", "")), files)


def changed_files(folder: str | Path) -> list[str]:
    """Return the files of a result that are missing or no longer what the manifest says, by name."""
    place = Path(folder)
    return [
        name
        for name, digest in sorted(read_manifest(place).files.items())
        if not (place / name).is_file() or _sha256(place / name) != digest
    ]


def write_manifest(folder: Path, kind: str) -> None:
    """Write the manifest of a complete result folder: a hash of every file below it."""
    paths = [Path(place) / name for place, _, names in os.walk(folder) for name in names]
    files = {path.relative_to(folder).as_posix(): _sha256(path) for path in paths}
    told = {
        "tool": _TOOL,
        "version": hubdesign.__version__,
        "kind": kind,
        "files": dict(sorted(files.items())),
    }
    (folder / MANIFEST).write_text(json.dumps(told, indent=1) + "\n", encoding="utf-8", newline="\n")


def _sha256(path: Path) -> str:
    with open(path, "rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()


def _foreign_entries(folder: Path) -> list[str]:
    """Return what is in `folder` and not ours; empty for an empty folder and for a result of ours."""
    try:
        own = {MANIFEST, *read_manifest(folder).files}
    except OutputError:
        own = set()
    own_folders = {parent.as_posix() for name in own for parent in Path(name).parents}
    foreign = []
    for place, folders, files in os.walk(folder):
        inside = Path(place).relative_to(folder)
        for name in sorted(folders):
            path = (inside / name).as_posix()
            if path not in own_folders or (folder / path).is_symlink():
                foreign.append(f"{path}/")
                folders.remove(name)  # what is not ours is not searched
        paths = [(inside / name).as_posix() for name in sorted(files)]
        foreign += [path for path in paths if path not in own]
    return foreign


def _check_apart(place: Path, inputs: Path) -> None:
    def lies_in(inner: Path, outer: Path) -> bool:
        return any(_same(folder, outer) for folder in (inner, *inner.parents))

    if _same(place, inputs):
        raise OutputError(f"{place}: is the inputs themselves; choose another folder for the result")
    if lies_in(place, inputs):
        raise OutputError(f"{place}: lies inside the inputs ({inputs}); choose another folder for the result")
    if lies_in(inputs, place):
        raise OutputError(f"{place}: holds the inputs ({inputs}); choose another folder for the result")


def _same(first: Path, second: Path) -> bool:
    try:
        return first == second or os.path.samefile(first, second)
    except OSError:
        return False


def _clear_up(place: Path) -> None:
    """Finish a broken swap and remove the folders of dead runs; the lock is held, so none is alive."""
    finish_swap(place)
    for entry in sorted(place.parent.iterdir()):
        if is_leftover(place, entry.name) and entry.is_dir() and not entry.is_symlink():
            shutil.rmtree(entry)


@contextmanager
def _said_of(place: Path) -> Iterator[None]:
    """Turn what the system says into a sentence about the result folder."""
    try:
        yield
    except OutputError as error:
        if str(error).startswith(str(place)):
            raise
        raise OutputError(f"{place}: {error}") from error
    except OSError as error:
        if error.errno in (errno.ENOSPC, errno.EDQUOT):
            what = "the disk is full; make room or choose another disk"
        elif error.errno in (errno.EACCES, errno.EPERM, errno.EROFS):
            what = f"may not be written ({error.strerror}: {error.filename}); choose another folder"
        else:
            what = f"cannot be written ({error})"
        kept = "; the old result is kept" if (place / MANIFEST).exists() else "; nothing was written"
        raise OutputError(f"{place}: {what}{kept}") from error


def _real(path: str | Path) -> Path:
    return Path(os.path.realpath(path))


def _some(names: list[str]) -> str:
    more = len(names) - _NAMES_SHOWN
    return ", ".join(names[:_NAMES_SHOWN]) + (f" and {more} more" if more > 0 else "")
