"""Charts of the page, as figures ready to draw."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from hubdesign.comparison import Comparison
from hubdesign.exports.report.words import heading, say_number, say_share
from hubdesign.pricing import Bill
from hubdesign.results import Results

PLOT_WIDTH, PLOT_HEIGHT = 460.0, 260.0
_LEFT, _RIGHT, _TOP, _BOTTOM = 64.0, 14.0, 24.0, 42.0


@dataclass(frozen=True, slots=True)
class Bar:
    """A bar: what it is, its figure in words, its share of the longest (0..1) and of the whole (text)."""

    label: str
    figure: str
    length: float
    share: str = ""


@dataclass(frozen=True, slots=True)
class Axis:
    """Ticks as (place in px, text)."""

    title: str
    ticks: tuple[tuple[float, str], ...]


@dataclass(frozen=True, slots=True)
class Scatter:
    """Load factor against stage length: (x, y, role class, row, says) a direction of a link."""

    x: Axis
    y: Axis
    points: tuple[tuple[float, float, str, int, str], ...]
    says: str


@dataclass(frozen=True, slots=True)
class Curves:
    """Bound and best plan over time, as step lines in SVG path data."""

    x: Axis
    y: Axis
    best: str
    bound: str
    says: str


@dataclass(frozen=True, slots=True)
class Span:
    """A proven interval on a common axis, shares of the width."""

    label: str
    left: float
    width: float
    mark: float
    low: str
    high: str
    known: bool


def cost_bars(costs: dict[str, float]) -> list[Bar]:
    """Return the parts of the total cost that are not zero."""
    parts = [(name, costs[name]) for name in Bill.PARTS if costs[name]]
    longest = max((abs(value) for _, value in parts), default=0.0)
    total = costs["total"]
    return [
        Bar(
            heading(name),
            say_number(value),
            abs(value) / longest,
            say_share(value / total) if total > 0.0 else "",
        )
        for name, value in parts
    ]


def transfer_bars(results: Results) -> list[Bar]:
    """Return the volume carried by number of transfers."""
    sums: dict[int, float] = {}
    for count, volume in zip(results.itineraries.values("transfers"), results.itineraries.values("volume")):
        sums[int(count or 0)] = sums.get(int(count or 0), 0.0) + float(volume or 0.0)
    longest, whole = max(sums.values(), default=0.0), sum(sums.values())
    names = {0: "nonstop", 1: "1 transfer"}
    return [
        Bar(
            names.get(count, f"{count} transfers"),
            say_number(sums[count]),
            sums[count] / longest if longest else 0.0,
            say_share(sums[count] / whole) if whole else "",
        )
        for count in sorted(sums)
    ]


def load_scatter(results: Results, role_class: dict[str, str]) -> Scatter | None:
    """Return load factor against stage length; None where no link has a load factor."""
    points: list[tuple[float, float, str, int, str]] = []
    for row, record in enumerate(results.links.records()):
        ends = (record["from"], record["to"])
        for name, (a, b) in (("load_factor_out", ends), ("load_factor_back", ends[::-1])):
            if record[name] is not None:
                says = f"{a} → {b}: {say_share(float(record[name] or 0.0))}"
                points.append(
                    (
                        float(record["distance_km"] or 0.0),
                        float(record[name] or 0.0),
                        role_class[str(record["role"])],
                        row,
                        says,
                    )
                )
    if not points:
        return None
    km = nice_ticks(0.0, max(point[0] for point in points) or 1.0)
    load = nice_ticks(0.0, max(1.0, max(point[1] for point in points)))
    drawn = tuple(
        (_across(x, km[0], km[-1]), _up(y, load[0], load[-1]), role, row, says)
        for x, y, role, row, says in points
    )
    mean = sum(point[1] for point in points) / len(points)
    return Scatter(
        Axis("stage length, km", _ticks_across(km)),
        Axis("load factor, %", tuple((_up(t, load[0], load[-1]), f"{100.0 * t:g}") for t in load)),
        drawn,
        f"{len(points)} directions of {len(results.links.rows)} links; mean load factor {say_share(mean)},"
        f" longest stage {say_number(max(point[0] for point in points))} km.",
    )


def progress_curves(results: Results, unit: str) -> Curves | None:
    """Return bound and best plan over time; None where nothing was recorded."""
    rows = results.progress.records()
    best = [(float(r["seconds"] or 0), float(r["best_plan"])) for r in rows if r["best_plan"] is not None]
    bound = [(float(r["seconds"] or 0), float(r["bound"])) for r in rows if r["bound"] is not None]
    values = [value for _, value in best + bound]
    if not best or not bound or max(values) - min(values) <= 1e-6 * max(map(abs, values)):
        return None
    end = max(float(r["seconds"] or 0) for r in rows)
    low, high = _telling_range([v for _, v in best], [v for _, v in bound])
    x, y = nice_ticks(0.0, end or 1.0), nice_ticks(low, high)
    return Curves(
        Axis("seconds", _ticks_across(x)),
        Axis(unit, tuple((_up(t, y[0], y[-1]), short_number(t)) for t in y)),
        _steps(best, end, x, y),
        _steps(bound, end, x, y),
        f"After {end:.1f} s the best plan stands at {say_number(best[-1][1])} and the bound"
        f" at {say_number(bound[-1][1])} {unit}.",
    )


def _telling_range(best: list[float], bound: list[float]) -> tuple[float, float]:
    """Return the range to draw: the end of both curves and what came within a few times its width.

    A first plan may be many times worse than the last; drawn whole it would flatten everything else.
    """
    last = [best[-1], bound[-1]]
    width = max(abs(last[0] - last[1]), 0.02 * max(map(abs, last)), 1e-12)
    everything = best + bound
    low = max(min(everything), min(last) - 8.0 * width)
    high = min(max(everything), max(last) + 8.0 * width)
    return (low, high) if high > low else (low - width, high + width)


def interval_spans(
    comparison: Comparison, names: dict[str, str]
) -> tuple[list[Span], list[tuple[float, str]]]:
    """Return each structure's proven interval of its optimum on one axis, and the axis' ticks."""
    known = [entry.interval for entry in comparison.entries if entry.interval is not None]
    if not known:
        return [], []
    ticks = nice_ticks(min(low for low, _ in known), max(high for _, high in known))
    width = (ticks[-1] - ticks[0]) or 1.0
    spans = []
    for entry in comparison.entries:
        if entry.interval is None or entry.result is None or entry.result.design.objective is None:
            spans.append(Span(names[entry.structure], 0.0, 0.0, 0.0, "", "", False))
            continue
        low, high = entry.interval
        spans.append(
            Span(
                names[entry.structure],
                (low - ticks[0]) / width,
                (high - low) / width,
                (entry.result.design.objective - ticks[0]) / width,
                say_number(low),
                say_number(high),
                True,
            )
        )
    return spans, [((tick - ticks[0]) / width, short_number(tick)) for tick in ticks]


def nice_ticks(low: float, high: float, count: int = 5) -> list[float]:
    """Return round figures from at most `low` to at least `high`."""
    if high <= low:
        high = low + (abs(low) or 1.0)
    raw = (high - low) / count
    power = 10.0 ** math.floor(math.log10(raw))
    step = next(s * power for s in (1.0, 2.0, 2.5, 5.0, 10.0) if s * power >= raw * 0.999)
    first, last = math.floor(low / step + 1e-9), math.ceil(high / step - 1e-9)
    return [round(k * step, 12 - math.floor(math.log10(step))) for k in range(first, last + 1)]


def short_number(value: float) -> str:
    """Return a tick's figure: 1,200,000 is "1.2 M"."""
    for size, letter in ((1e9, " G"), (1e6, " M"), (1e4, " k")):
        if abs(value) >= size:
            divisor = 1e3 if letter == " k" else size
            return f"{value / divisor:g}{letter}".replace("-", "−")
    return f"{value:g}".replace("-", "−")


def _across(value: float, low: float, high: float) -> float:
    return round(_LEFT + (value - low) / (high - low) * (PLOT_WIDTH - _LEFT - _RIGHT), 1)


def _up(value: float, low: float, high: float) -> float:
    share = min(1.0, max(0.0, (value - low) / (high - low)))
    return round(PLOT_HEIGHT - _BOTTOM - share * (PLOT_HEIGHT - _TOP - _BOTTOM), 1)


def _ticks_across(ticks: Sequence[float]) -> tuple[tuple[float, str], ...]:
    return tuple((_across(tick, ticks[0], ticks[-1]), short_number(tick)) for tick in ticks)


def _steps(points: list[tuple[float, float]], end: float, x: list[float], y: list[float]) -> str:
    """Return a step line to the end of the record."""
    text, last = "", None
    for seconds, value in points:
        px, py = _across(seconds, x[0], x[-1]), _up(value, y[0], y[-1])
        if last is None:
            text = f"M{px} {py}"
        elif py != last:
            text += f"H{px}V{py}"
        last = py
    return f"{text}H{_across(end, x[0], x[-1])}"
