"""Limits, cancelling and the progress record, shared by every engine of one solve."""

from __future__ import annotations

import threading
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager

from hubdesign.answer import Progress


class Control:
    """What an engine may use and when it must stop.

    Parameters
    ----------
    time_limit_s
        Wall time from now, s.
    gap
        Relative gap asked for; an engine may stop once it is proven.
    threads
        Cores an engine may keep busy; 1 makes a finished solve repeatable to the byte.
    seed
        Seed of everything random.
    maximise
        Whether a larger objective is better; the record keeps best and bound monotone accordingly.
    listener
        Called with each new :class:`Progress`, from whichever thread reports.
    announcer
        Called with the one line in which an engine says what it does.
    """

    def __init__(
        self,
        time_limit_s: float = 300.0,
        gap: float = 0.01,
        threads: int = 1,
        seed: int = 1,
        maximise: bool = False,
        listener: Callable[[Progress], None] | None = None,
        announcer: Callable[[str], None] | None = None,
    ) -> None:
        self.time_limit_s = time_limit_s
        self.gap = gap
        self.threads = threads
        self.seed = seed
        self.maximise = maximise
        self._listener = listener
        self._announcer = announcer
        self._start = time.monotonic()
        self._cancelled = threading.Event()
        self._interrupters: list[Callable[[], None]] = []
        self._lock = threading.Lock()
        self._best: float | None = None
        self._bound: float | None = None
        self._record: list[Progress] = []

    def announce(self, text: str) -> None:
        """Say in one line what kind of problem this is and how it is solved."""
        if self._announcer is not None:
            self._announcer(text)

    def elapsed_s(self) -> float:
        """Wall time since the solve began, s."""
        return time.monotonic() - self._start

    def remaining_s(self) -> float:
        """Wall time left, s; 0 once the limit is reached or the solve was cancelled."""
        return 0.0 if self._cancelled.is_set() else max(0.0, self.time_limit_s - self.elapsed_s())

    def cancel(self) -> None:
        """Ask every engine to stop with what it has; may be called from any thread."""
        self._cancelled.set()
        for interrupt in list(self._interrupters):
            interrupt()

    @contextmanager
    def interrupting(self, interrupt: Callable[[], None]) -> Iterator[None]:
        """Have `cancel` call `interrupt` (a solver's own stop, safe from another thread) meanwhile."""
        self._interrupters.append(interrupt)
        try:
            if self.cancelled:
                interrupt()
            yield
        finally:
            self._interrupters.remove(interrupt)

    def end(self) -> None:
        """Let this step end now; a part ends alone, the solve it belongs to goes on."""
        self.time_limit_s = 0.0

    def part(
        self,
        time_limit_s: float,
        *,
        maximise: bool | None = None,
        listener: Callable[[Progress], None] | None = None,
    ) -> Control:
        """Return a Control with its own record for a step of this solve; cancelled together with it."""
        step = Control(
            min(time_limit_s, self.remaining_s()),
            self.gap,
            self.threads,
            self.seed,
            self.maximise if maximise is None else maximise,
            listener,
        )
        step._cancelled = self._cancelled
        step._interrupters = self._interrupters
        return step

    @property
    def cancelled(self) -> bool:
        """Whether somebody asked to stop."""
        return self._cancelled.is_set()

    def stop_requested(self) -> bool:
        """Whether the limit is reached or somebody asked to stop."""
        return self._cancelled.is_set() or self.elapsed_s() >= self.time_limit_s

    def report(self, best: float | None = None, bound: float | None = None) -> None:
        """Record a better plan or a better bound; what is no better than the record is dropped."""
        with self._lock:
            best_moved = best is not None and self._is_better(best, self._best)
            bound_moved = bound is not None and self._is_better(self._bound, bound)
            if not (best_moved or bound_moved):
                return
            if best_moved:
                self._best = best
            if bound_moved:
                self._bound = bound
            entry = Progress(self.elapsed_s(), self._best, self._bound)
            self._record.append(entry)
        if self._listener is not None:
            self._listener(entry)

    def _is_better(self, new: float | None, old: float | None) -> bool:
        """Whether `new` is the better plan value; None is the worst plan and the weakest bound."""
        if old is None:
            return True
        if new is None:
            return True
        return new > old if self.maximise else new < old

    @property
    def best(self) -> float | None:
        """Objective of the best plan reported."""
        return self._best

    @property
    def bound(self) -> float | None:
        """The tightest bound reported."""
        return self._bound

    @property
    def record(self) -> tuple[Progress, ...]:
        """Every line so far, in order of time."""
        with self._lock:
            return tuple(self._record)

    def gap_reached(self) -> bool:
        """Whether best and bound are within the gap asked for."""
        with self._lock:
            if self._best is None or self._bound is None:
                return False
            return abs(self._bound - self._best) <= self.gap * abs(self._best)
