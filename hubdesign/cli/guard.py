"""What stands around every command: errors in words, exit codes, interruption."""

from __future__ import annotations

import json
import os
import signal
import sys
import threading
import traceback
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from types import FrameType
from typing import Any, TypeVar

import click

from hubdesign import errors

T = TypeVar("T")

#: Set to anything to see the traceback of a fault of our own.
DEBUG_VARIABLE = "HUBDESIGN_DEBUG"

_STATUS_WORDS = {
    errors.EXIT_BAD_INPUT: "bad input",
    errors.EXIT_USAGE: "usage",
    errors.EXIT_INFEASIBLE: "infeasible",
    errors.EXIT_LIMIT_WITHOUT_DESIGN: "unknown",
    errors.EXIT_INTERNAL: "internal fault",
}


@contextmanager
def told_in_words(as_json: bool) -> Iterator[None]:
    """Turn every exception into a message on stderr (and JSON on stdout) and its exit code."""
    try:
        yield
    except errors.HubdesignError as error:
        _leave(error, error.exit_code, as_json)
    except (click.ClickException, click.exceptions.Exit, click.Abort):
        raise
    except MemoryError as error:
        _leave(errors.InternalError(f"out of memory: {error}"), errors.EXIT_INTERNAL, as_json)
    except Exception as error:
        if os.environ.get(DEBUG_VARIABLE):
            traceback.print_exc()
        text = f"{type(error).__name__}: {error} (set {DEBUG_VARIABLE}=1 for the details)"
        _leave(errors.InternalError(text), errors.EXIT_INTERNAL, as_json)


def _leave(error: errors.HubdesignError, code: int, as_json: bool) -> None:
    lines = _lines(error)
    heading = _heading(error, len(lines))
    click.echo("\n".join([heading, *(f"  {line}" for line in lines)]), err=True)
    if as_json:
        click.echo(
            json.dumps({"status": _STATUS_WORDS.get(code, "error"), "exit_code": code, "reasons": lines})
        )
    sys.exit(code)


def _lines(error: errors.HubdesignError) -> list[str]:
    if isinstance(error, errors.InputError):
        from hubdesign.inputs import listed_faults

        return listed_faults(error.faults)
    if isinstance(error, errors.UnsolvedError):
        return list(error.reasons)
    if isinstance(error, errors.VerificationError):
        return list(error.breaches)
    return [str(error)]


def _heading(error: errors.HubdesignError, count: int) -> str:
    if isinstance(error, errors.InputError):
        total = len(error.faults)
        return f"The inputs hold {total} fault{'s' if total != 1 else ''}; nothing was written:"
    if isinstance(error, errors.InfeasibleError):
        return "No design obeys every rule; nothing was written:"
    if isinstance(error, errors.NoPlanError):
        return "No design yet; nothing was written:"
    if isinstance(error, errors.InternalError):
        return "A fault of hubdesign itself; nothing was written. Please report it with these lines:"
    return "Error; nothing was written:"


def run_interruptibly(work: Callable[[], T], cancel: Callable[[], None], notice: Callable[[str], None]) -> T:
    """Run `work` in a thread; Ctrl-C and SIGTERM call `cancel` and let it end with what it has.

    A second signal ends the process at once, with nothing written.
    """
    outcome: dict[str, Any] = {}

    def target() -> None:
        try:
            outcome["value"] = work()
        except BaseException as error:
            outcome["error"] = error

    asked = threading.Event()

    def stop(signum: int, frame: FrameType | None) -> None:
        if asked.is_set():
            os._exit(errors.EXIT_LIMIT_WITHOUT_DESIGN)
        asked.set()
        notice("stopping: keeping the best plan so far (once more to stop at once, writing nothing)")
        cancel()

    before = {number: signal.signal(number, stop) for number in (signal.SIGINT, signal.SIGTERM)}
    thread = threading.Thread(target=target, daemon=True)
    try:
        thread.start()
        while thread.is_alive():
            thread.join(0.05)
    finally:
        for number, handler in before.items():
            signal.signal(number, handler)
    if "error" in outcome:
        raise outcome["error"]
    value: T = outcome["value"]
    return value
