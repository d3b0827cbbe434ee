"""Tables as they lie in the files: cells, row numbers, labels; nothing is interpreted yet."""

from __future__ import annotations

import datetime
from dataclasses import dataclass, field

#: A CSV cell is text; a workbook's may be any of these. Blank is "".
Cell = str | float | int | bool | datetime.date | datetime.time | datetime.timedelta

_SHOWN_LENGTH = 40


@dataclass(frozen=True, slots=True)
class Row:
    """A row: its number as a spreadsheet counts (the header is 1) and one cell per header column."""

    number: int
    cells: list[Cell]


@dataclass
class RawTable:
    """A table before its cells are read.

    Attributes
    ----------
    name
        Name of the table in the schema (``stations``), or ``demand_matrix`` or ``settings``.
    label
        How people find it: ``stations.csv`` or ``sheet stations``.
    header
        Column names, outer blanks removed.
    rows
        The rows that hold anything.
    comma_allowed
        Whether a decimal comma is read (semicolon and tab files).
    separator
        The separator of a CSV file, "" for a sheet.
    stray
        Texts of rows that could not be used, so that references to them are not reported again.
    whole
        False where reading stopped early: references into this table are then not judged.
    """

    name: str
    label: str
    header: list[str]
    rows: list[Row]
    comma_allowed: bool = False
    separator: str = ""
    stray: set[str] = field(default_factory=set)
    whole: bool = True


def shown(value: Cell) -> str:
    """Return a value as it is quoted in a fault: short, on one line, control characters escaped."""
    if isinstance(value, bool):
        return "TRUE" if value else "FALSE"
    if isinstance(value, float):
        return f"{value:.15g}"
    text = str(value)
    cut = text[:_SHOWN_LENGTH]
    cut = "".join(
        char if char.isprintable() else char.encode("unicode_escape", "backslashreplace").decode()
        for char in cut
    )
    if len(text) > _SHOWN_LENGTH:
        cut += f"... ({len(text):,} characters)"
    return f"'{cut}'" if isinstance(value, str) else cut


def is_blank(cell: Cell) -> bool:
    """Return whether a cell holds nothing but blanks."""
    return isinstance(cell, str) and not cell.strip(" ")


def is_note(name: str) -> bool:
    """Return whether a column or sheet is the planner's own."""
    return name.lower().startswith("note")
