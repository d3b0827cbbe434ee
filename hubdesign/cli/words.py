"""Figures as people read them."""

from __future__ import annotations


def amount(value: float | None, digits: int = 4) -> str:
    """Return a figure with thousands separators: whole above 1000, else `digits` significant digits."""
    if value is None:
        return "-"
    if abs(value) >= 1000.0:
        return f"{value:,.0f}"
    text = f"{value:.{digits}g}"
    return "0" if text == "-0" else text


def percent(share: float | None) -> str:
    """Return a share as a percentage with at most three digits that count."""
    if share is None:
        return "-"
    value = 100.0 * share
    if value == 0.0:
        return "0 %"
    if value < 0.01:
        return "< 0.01 %"
    return f"{value:.3g} %" if value < 100 else f"{value:,.0f} %"
