"""Small workbooks for tests, written by openpyxl (another library than the one that reads them)."""

from __future__ import annotations

import datetime
from pathlib import Path
from typing import Any

import openpyxl

STATIONS: list[list[Any]] = [
    ["station", "name", "lat", "lon", "may_be_hub"],
    ["AAL", "Aalbek", 50.1, 8.2, "yes"],
    ["BRO", "Brodorf", 51.4, 9.9, "no"],
    ["CEL", "Cellau", 49.2, 11.3, True],
]
DEMAND: list[list[Any]] = [
    ["origin", "destination", "volume", "revenue"],
    ["AAL", "BRO", 120, 90],
    ["BRO", "CEL", 80.5, 110],
    ["CEL", "AAL", 60, 140],
]
FLEET: list[list[Any]] = [
    ["vehicle", "capacity", "range_km", "speed_kmh", "cost_per_hour"],
    ["gull-50", 50, 1200, 500, 1500],
]
SETTINGS: list[list[Any]] = [["section", "setting", "value"], ["goal", "goal", "most-profit"]]

DATE = datetime.datetime(2024, 5, 1)


def sheets(**changes: list[list[Any]] | None) -> dict[str, list[list[Any]]]:
    """Return the sheets of a sound case, with `changes`; None leaves a sheet out."""
    base: dict[str, list[list[Any]] | None] = {
        "stations": STATIONS,
        "demand": DEMAND,
        "fleet": FLEET,
        "settings": SETTINGS,
    }
    return {name: rows for name, rows in {**base, **changes}.items() if rows is not None}


def changed(rows: list[list[Any]], row: int, column: int, value: Any) -> list[list[Any]]:
    """Return `rows` with one cell changed; the header is row 1, the first column is 1."""
    copy = [list(cells) for cells in rows]
    copy[row - 1][column - 1] = value
    return copy


def save(path: Path, tables: dict[str, list[list[Any]]], merged: str = "") -> Path:
    """Write a workbook; `merged` is a range of the first sheet."""
    book = openpyxl.Workbook()
    book.remove(book.active)
    for name, rows in tables.items():
        sheet = book.create_sheet(name)
        for row in rows:
            sheet.append(row)
    if merged:
        book.worksheets[0].merge_cells(merged)
    book.save(path)
    return path
