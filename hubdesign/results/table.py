"""A table of results: typed columns with unit and meaning, and rows of plain values."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np

#: What a cell holds; None is a blank.
Cell = str | int | float | None
Kind = Literal["text", "integer", "number"]


@dataclass(frozen=True, slots=True)
class Column:
    """A column of results.

    Attributes
    ----------
    name
        As written in the header; physical units are its suffix (_km, _hours, _kg).
    kind
        What its cells hold.
    unit
        Unit in words; ``money``, ``volume`` and ``period`` stand for what the settings name. Blank for text.
    meaning
        What it says.
    """

    name: str
    kind: Kind
    unit: str
    meaning: str


@dataclass(frozen=True, slots=True)
class Table:
    """A table; each row has a cell for each column."""

    name: str
    columns: tuple[Column, ...]
    rows: tuple[tuple[Cell, ...], ...]

    @property
    def header(self) -> tuple[str, ...]:
        """Names of the columns."""
        return tuple(column.name for column in self.columns)

    def values(self, name: str) -> list[Cell]:
        """Return the cells of the column called `name`; ValueError where there is none."""
        place = self.header.index(name)
        return [row[place] for row in self.rows]

    def records(self) -> list[dict[str, Cell]]:
        """Return the rows as dictionaries by column name."""
        return [dict(zip(self.header, row)) for row in self.rows]


def build_table(name: str, columns: Sequence[Column], values: Sequence[Any]) -> Table:
    """Return a table from one sequence of values per column.

    numpy scalars become plain ones; NaN and infinity (no figure, no limit) become blanks.
    """
    plain = [[_plain(value, column.kind) for value in cells] for column, cells in zip(columns, values)]
    return Table(name, tuple(columns), tuple(zip(*plain)) if plain else ())


def _plain(value: object, kind: Kind) -> Cell:
    if value is None:
        return None
    if kind == "text":
        return str(value)
    number = float(value)  # type: ignore[arg-type]
    if not np.isfinite(number):
        return None
    # A minus zero would be written as -0.0.
    return int(number) if kind == "integer" else number + 0.0
