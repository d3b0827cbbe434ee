"""Live progress on a terminal, plain lines on stderr otherwise."""

from __future__ import annotations

import sys
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from typing import Any

from hubdesign.answer import Progress
from hubdesign.cli.words import amount, percent

#: Plain lines come at most this often, s; a first plan is told at once.
_EVERY_S = 1.0

_BARS = "▁▂▃▄▅▆▇█"


class Display:
    """Shows best plan, bound, gap and seconds of one or several solves.

    Parameters
    ----------
    unit
        Unit of the objective.
    stream
        Where to write; stderr by default.
    """

    def __init__(self, unit: str, stream: Any = None) -> None:
        self.unit = unit
        self.stream = sys.stderr if stream is None else stream
        self.live: Any = None
        self._latest: dict[str, list[Progress]] = {}
        self._told: dict[str, float] = {}
        self._lock = threading.Lock()

    def hear(self, name: str, progress: Progress) -> None:
        """Take a progress line of the solve `name` (blank for the only one)."""
        with self._lock:
            lines = self._latest.setdefault(name, [])
            lines.append(progress)
            if self.live is not None:
                return  # the live picture redraws by itself
            first_plan = progress.best is not None and all(p.best is None for p in lines[:-1])
            if first_plan or progress.seconds - self._told.get(name, -_EVERY_S) >= _EVERY_S:
                self._told[name] = progress.seconds
                self.say(self._line(name, progress))

    def say(self, text: str) -> None:
        """Write a line of its own."""
        if self.live is not None:
            self.live.console.print(text, highlight=False, markup=False)
        else:
            print(text, file=self.stream, flush=True)

    def _line(self, name: str, progress: Progress) -> str:
        best = "none yet" if progress.best is None else f"{amount(progress.best)} {self.unit}"
        bound = "none yet" if progress.bound is None else f"{amount(progress.bound)} {self.unit}"
        head = f"{name}: " if name else ""
        return (
            f"{head}{progress.seconds:7.1f} s  best plan {best}  bound {bound}  gap {percent(progress.gap)}"
        )

    def _picture(self) -> Any:
        from rich.console import Group
        from rich.text import Text

        with self._lock:
            rows = []
            for name, lines in self._latest.items():
                rows.append(Text(self._line(name, lines[-1]), overflow="ellipsis", no_wrap=True))
                rows.append(Text(f"          gap over time {gap_line(lines)}", style="dim"))
        return Group(*rows)

    @contextmanager
    def shown(self) -> Iterator[Display]:
        """Show a live picture meanwhile on a terminal; on a pipe the last state is told at the end."""
        if self.stream.isatty():
            from rich.console import Console
            from rich.live import Live

            console = Console(file=self.stream, highlight=False)
            with Live(
                console=console, get_renderable=self._picture, refresh_per_second=4, transient=True
            ) as live:
                self.live = live
                try:
                    yield self
                finally:
                    self.live = None
            return
        yield self
        for name, lines in self._latest.items():
            if self._told[name] != lines[-1].seconds:
                self.say(self._line(name, lines[-1]))


def gap_line(lines: list[Progress], width: int = 30) -> str:
    """Return a small line of the gap over time: high bars for a wide gap (100 % and more is the top)."""
    points = [(p.seconds, p.gap) for p in lines if p.gap is not None]
    if not points:
        return ""
    start, end = points[0][0], max(points[-1][0], points[0][0] + 1e-9)
    cells = []
    place = 0
    for step in range(width):
        when = start + (end - start) * (step + 1) / width
        while place + 1 < len(points) and points[place + 1][0] <= when:
            place += 1
        gap = points[place][1] or 0.0
        # The square root keeps small gaps visible.
        cells.append(_BARS[min(len(_BARS) - 1, int((min(gap, 1.0) ** 0.5) * len(_BARS)))])
    return "".join(cells) + f"  {percent(points[0][1])} -> {percent(points[-1][1])}"
