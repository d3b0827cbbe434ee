"""Figures as people read them."""

from __future__ import annotations


def amount(value: float | None) -> str:
    """Return a figure with thousands separators: whole from 10,000 on, two decimals from 1, else 4 digits."""
    if value is None:
        return "-"
    if abs(value) >= 10_000.0 or value == int(value):
        return f"{value:,.0f}"
    if abs(value) >= 1.0:
        return f"{value:,.2f}".rstrip("0").rstrip(".")
    return f"{value:.4g}"


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
