"""tables.xlsx: the tables of a result as a workbook for spreadsheets.

Numbers are numbers, with their unit under the name of their column; text is always text (no formula and no
link is ever made from it); the same run gives the same bytes, so the file holds no time of day and no
seconds.
"""

from __future__ import annotations

import datetime
import io
import re
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

from hubdesign.comparison import Comparison
from hubdesign.exports.summary import cost_name, investment_name
from hubdesign.problem import Settings
from hubdesign.results import (
    COST_COLUMNS,
    INVESTMENT_COLUMNS,
    TOTAL_COLUMNS,
    Cell,
    Column,
    Results,
    Table,
    build_table,
    settings_in_force,
)
from hubdesign.results.table import Kind
from hubdesign.run import Result
from hubdesign.schema import MODE_SETTINGS, SETTINGS

_FIXED_DATE = datetime.datetime(2000, 1, 1)
_LONGEST_TEXT = 32_767  # what a cell can hold (ECMA-376 and every spreadsheet)
_WIDEST = 40
_NARROWEST = 9

#: Number format by unit; the first whose words are found counts.
_FORMATS = (
    ("degrees", "0.000000"),
    ("share", "0.00%"),
    ("ratio", "0.000"),
    ("money per volume-km", "#,##0.0000"),
    ("kg per volume-km", "0.0000"),
    ("money", "#,##0.00"),
    ("goal", "#,##0.00"),
    ("kg", "#,##0"),
    ("km", "#,##0.0"),
    ("hours", "#,##0.00"),
    ("minutes", "0.0"),
    ("tonnes", "#,##0.000"),
    ("volume", "#,##0.00"),
)


class _Exact(float):
    """A float that is written with all its digits; the writer's own ``.16G`` may lose the last one."""

    def __format__(self, spec: str) -> str:
        return repr(float(self))


@dataclass(frozen=True, slots=True)
class _Book:
    """A workbook being written and the words its units stand for."""

    book: Any
    formats: dict[str, Any]
    settings: Settings

    def format(self, code: str, **extra: Any) -> Any:
        """Return a cell format, made once."""
        key = f"{code}{sorted(extra.items())}"
        if key not in self.formats:
            self.formats[key] = self.book.add_format({"num_format": code, "valign": "top", **extra})
        return self.formats[key]

    def unit(self, unit: str) -> str:
        """Return a unit in the planner's own words."""
        words = {
            "money": self.settings.currency,
            "volume": self.settings.volume_unit,
            "period": self.settings.period,
            "goal": self.settings.volume_unit
            if self.settings.goal == "most-volume"
            else self.settings.currency,
        }
        return re.sub(r"\b(money|volume|period|goal)\b", lambda found: words[found[0]], unit)


def write_design_workbook(path: Path, result: Result, results: Results) -> None:
    """Write the workbook of one design."""
    settings = result.problem.settings
    with _opened(path, settings) as book:
        _write_summary(book, results)
        for table in (
            results.links,
            results.stations,
            results.vehicles,
            results.itineraries,
            results.unserved,
        ):
            _write_sheet(book, table)
        _write_sheet(book, _settings_table(settings))


def write_comparison_workbook(
    path: Path, comparison: Comparison, table: Table, results: dict[str, Results]
) -> None:
    """Write the workbook of a comparison: structures side by side, then their tables one below the other."""
    settings = comparison.problem.settings
    with _opened(path, settings) as book:
        _write_comparison(book, table)
        _write_sheet(book, _differences_table(comparison))
        for name in ("links", "stations", "vehicles", "itineraries", "unserved"):
            _write_sheet(book, _stacked(name, results))
        _write_sheet(book, _settings_table(settings))


@contextmanager
def _opened(path: Path, settings: Settings) -> Iterator[_Book]:
    import xlsxwriter

    options = {
        "in_memory": True,
        "strings_to_formulas": False,
        "strings_to_urls": False,
        "strings_to_numbers": False,
    }
    content = io.BytesIO()
    with xlsxwriter.Workbook(content, options) as book:
        book.set_properties({"title": settings.title, "created": _FIXED_DATE})
        yield _Book(book, {}, settings)
    # Written by ourselves, so that a full disk is an OSError like any other.
    path.write_bytes(content.getvalue())


def _write_sheet(book: _Book, table: Table) -> None:
    """Write a table: a frozen header with units, a filter, a format for each column."""
    sheet = book.book.add_worksheet(table.name)
    for place, column in enumerate(table.columns):
        _write_header(book, sheet, place, column)
        style = book.format(_number_format(column))
        cells = [row[place] for row in table.rows]
        for number, cell in enumerate(cells, start=1):
            _write_cell(sheet, number, place, cell, style)
        sheet.set_column(place, place, _width(column, cells))
    texts = [column.kind == "text" for column in table.columns]
    leading = min(2, texts.index(False) if False in texts else 1)
    sheet.freeze_panes(1, leading)
    sheet.autofilter(0, 0, len(table.rows), len(table.columns) - 1)


def _write_header(book: _Book, sheet: Any, place: int, column: Column) -> None:
    unit = book.unit(column.unit)
    bold = book.format("@", bold=True, text_wrap=True, bottom=1)
    sheet.write_string(0, place, f"{column.name}\n{unit}" if unit else column.name, bold)
    if column.meaning:
        # A note on the header says what the column means.
        sheet.write_comment(0, place, column.meaning, {"author": "", "x_scale": 1.5, "y_scale": 0.6})


def _write_cell(sheet: Any, row: int, place: int, cell: Cell, style: Any) -> None:
    if cell is None or cell == "":
        return
    if isinstance(cell, str):
        sheet.write_string(row, place, cell[:_LONGEST_TEXT], style)
    else:
        sheet.write_number(row, place, _Exact(cell) if isinstance(cell, float) else cell, style)


def _number_format(column: Column) -> str:
    if column.kind == "text":
        return "@"
    if column.kind == "integer":
        return "#,##0"
    for word, code in _FORMATS:
        if re.search(rf"\b{word}\b", column.unit):
            return code
    return "General"


def _width(column: Column, cells: Sequence[Cell]) -> float:
    """Return a column width that shows most of what it holds."""
    longest = max((len(cell) for cell in cells if isinstance(cell, str)), default=0)
    return float(min(_WIDEST, max(_NARROWEST, longest + 1, len(column.name) + 3)))


def _write_figures(
    book: _Book, name: str, heads: Sequence[str], figures: Sequence[tuple[Column, Sequence[Cell]]]
) -> None:
    """Write a sheet with a figure a row: its name, unit, a value under each of `heads`, and its meaning."""
    sheet = book.book.add_worksheet(name)
    for place, head in enumerate(("figure", "unit", *heads, "meaning")):
        _write_header(book, sheet, place, Column(head, "text", "", ""))
    text, last = book.format("@"), 2 + len(heads)
    for row, (column, cells) in enumerate(figures, start=1):
        sheet.write_string(row, 0, column.name, text)
        sheet.write_string(row, 1, book.unit(column.unit), text)
        style = book.format(_number_format(column), text_wrap=column.kind == "text", align="right")
        for place, cell in enumerate(cells, start=2):
            _write_cell(sheet, row, place, cell, style)
        sheet.write_string(row, last, column.meaning, text)
    sheet.set_column(0, 1, 27)
    sheet.set_column(2, last - 1, 20)
    sheet.set_column(last, last, 60)
    sheet.freeze_panes(1, 2)
    sheet.autofilter(0, 0, len(figures), last)


def _write_comparison(book: _Book, table: Table) -> None:
    """Write comparison.csv on its side: a figure a row, a structure a column, as a manager reads it."""
    heads = [str(cell) for cell in table.values("structure")]
    _write_figures(book, "comparison", heads, [(c, table.values(c.name)) for c in table.columns[1:]])


def _write_summary(book: _Book, results: Results) -> None:
    """Write answer, cost split, one-off money and totals."""
    figures: list[tuple[Column, Sequence[Cell]]] = []
    for name, value in results.answer.items():
        inner = value.items() if isinstance(value, dict) else [("", value)]
        for part, figure in inner:
            label = f"{name}_{part}" if part else name
            kind: Kind = "number" if isinstance(figure, float) else "text"
            figures.append((Column(label, kind, _answer_unit(part or name), ""), [figure]))
    figures += [(replace(c, name=cost_name(c.name)), [results.costs[c.name]]) for c in COST_COLUMNS]
    figures += [
        (replace(c, name=investment_name(c.name)), [results.investment[c.name]]) for c in INVESTMENT_COLUMNS
    ]
    figures += [(column, [results.totals[column.name]]) for column in TOTAL_COLUMNS]
    _write_figures(book, "summary", ["value"], figures)


def _answer_unit(name: str) -> str:
    if name in ("objective", "bound", "difference"):
        return "goal"
    return "share" if name in ("gap", "gap_asked", "difference_share") else ""


def _settings_table(settings: Settings) -> Table:
    """Return every setting in force with unit and meaning."""
    known = {(row.section, row.name): row for row in SETTINGS}
    rows: list[tuple[str, str, Any, str, str]] = []
    for section, values in settings_in_force(settings).items():
        for name, value in values.items():
            row = known.get((section, name), MODE_SETTINGS[0])
            told = ("yes" if value else "no") if isinstance(value, bool) else value
            rows.append((section, name, told, row.unit, row.meaning))
    header = ("section", "setting", "value", "unit", "meaning")
    return Table("settings", tuple(Column(name, "text", "", "") for name in header), tuple(rows))


def _differences_table(comparison: Comparison) -> Table:
    columns = (
        Column("first", "text", "", "structure"),
        Column("second", "text", "", "structure"),
        Column("low", "number", "goal", "the optimum of first minus that of second is at least this"),
        Column("high", "number", "goal", "and at most this"),
        Column("better", "text", "", "the structure proven better, or not decided at this gap"),
    )
    rows = comparison.differences
    better = [row.better(comparison.maximise) or "not decided at this gap" for row in rows]
    values = [[row.first for row in rows], [row.second for row in rows]]
    return build_table(
        "differences", columns, [*values, [r.low for r in rows], [r.high for r in rows], better]
    )


def _stacked(name: str, results: dict[str, Results]) -> Table:
    """Return one table of all structures, told apart by a first column.

    The vehicle types are the same in every structure except today's network, which may lack some.
    """
    tables = {structure: getattr(part, name) for structure, part in results.items()}
    columns: dict[str, Column] = {}
    for table in tables.values():
        columns |= {column.name: column for column in table.columns}
    rows = [
        (structure, *(record.get(column) for column in columns))
        for structure, table in tables.items()
        for record in table.records()
    ]
    first = Column("structure", "text", "", "which structure the row belongs to")
    return Table(name, (first, *columns.values()), tuple(rows))
