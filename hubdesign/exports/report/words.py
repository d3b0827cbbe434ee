"""Figures and units as people read them; the tables hold all digits, the page rounds them by column."""

from __future__ import annotations

import math
import re
from collections.abc import Iterable
from dataclasses import dataclass

from hubdesign.problem import Settings
from hubdesign.results import Cell, Column

MINUS = "−"
_LARGEST = 1e15
_SMALLEST = 1e-9


@dataclass(frozen=True, slots=True)
class Format:
    """How the figures of a column are written: times `factor`, with so many decimals; None: 4 digits."""

    decimals: int | None
    factor: float = 1.0

    def __call__(self, value: float | int) -> str:
        """Return `value` as the page shows it."""
        value = value * self.factor
        text = f"{value:.4g}" if self.decimals is None else f"{value:,.{self.decimals}f}"
        if text.startswith("-"):
            text = text[1:] if not re.search("[1-9]", text) else MINUS + text[1:]
        return text


def format_for(column: Column, values: Iterable[Cell]) -> Format:
    """Return the format of a column: shares in per cent, else about four digits of its largest figure."""
    values = list(values)
    whole = all(float(value).is_integer() for value in values if isinstance(value, (int, float)))
    if column.kind == "integer" or (whole and column.unit != "share"):
        return Format(0)
    sizes = [abs(value) for value in values if isinstance(value, (int, float)) and value]
    if column.unit == "share":
        return Format(1, 100.0)
    if column.unit == "degrees":
        return Format(4)
    largest = max(sizes, default=0.0)
    if largest and not _SMALLEST < largest < _LARGEST:
        return Format(None)
    return Format(decimals_of(largest))


def decimals_of(size: float) -> int:
    """Return the decimals that show about four digits of `size`: none from 1,000, one from 100, and so on."""
    return 0 if size <= 0.0 else max(0, 3 - math.floor(math.log10(size)))


def say_number(value: float) -> str:
    """Return one figure by its own size."""
    size = abs(value)
    if size and not _SMALLEST < size < _LARGEST:
        return Format(None)(value)
    return Format(min(decimals_of(size), 0 if float(value).is_integer() else 12))(value)


def say_share(value: float) -> str:
    """Return a share in per cent: 0.0206 is "2.06 %"."""
    percent = 100.0 * value
    decimals = 0 if percent == 0.0 else min(6, max(1 if percent < 100.0 else 0, 2 - _magnitude(percent)))
    return f"{Format(decimals)(percent)} %"


def _magnitude(value: float) -> int:
    return math.floor(math.log10(abs(value)))


def say_count(number: int, word: str, plural: str | None = None) -> str:
    """Return "1 link", "20 links"."""
    return f"{number:,} {word if number == 1 else plural or word + 's'}"


def unit_words(unit: str, settings: Settings) -> str:
    """Return a column's unit in the planner's own words; a share is shown in per cent."""
    words = {
        "money": settings.currency,
        "volume": settings.volume_unit,
        "period": settings.period,
        "goal": goal_unit(settings),
        "share": "%",
    }
    return re.sub(r"\b(money|volume|period|goal|share)\b", lambda found: words[found[0]], unit)


def goal_unit(settings: Settings) -> str:
    """Return the unit of the objective."""
    return settings.volume_unit if settings.goal == "most-volume" else settings.currency


def heading(name: str, unit: str = "") -> str:
    """Return a column's name as a heading: ``volume_out`` is "volume out".

    A unit that stands beside it is not said twice: ``distance_km``, in km, is "distance".
    """
    if unit == "km":
        name = name.removesuffix("_km")
    if name in ("co2_kg", "co2_tonnes"):
        name = "co2"
    return name.replace("_", " ").replace("co2", "CO2")
