"""Tables of the page: the same cells as the CSV tables, rounded by column, written compactly."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass, field

from markupsafe import Markup, escape

from hubdesign.exports.report.words import Format, format_for, heading, unit_words
from hubdesign.problem import Settings
from hubdesign.results import Cell, Column, Table

#: Text that is long and the same in many rows is shortened; a note above the table says it in full.
SHORT = {
    "no itinerary under the rules": "no itinerary",
    "left by the plan (no room, or not worth it)": "left by plan",
}


@dataclass(frozen=True, slots=True)
class Head:
    """A column of a table of the page.

    Attributes
    ----------
    key
        Name of the column in the CSV table (or of the figure, where several tables are put together).
    title, unit, meaning
        As people read them.
    text
        Whether its cells are text.
    group
        The structure it belongs to; blank where it belongs to all.
    """

    key: str
    title: str
    unit: str
    meaning: str
    text: bool
    group: str = ""


@dataclass(frozen=True, slots=True)
class PageTable:
    """A table ready for the template.

    Attributes
    ----------
    name
        Used for its element's id.
    heads, body, count
        Columns, rows as HTML, number of rows.
    left_out
        Titles of columns that are blank or zero throughout.
    printed
        Columns (from 1) that stand on paper; empty for all.
    """

    name: str
    heads: tuple[Head, ...]
    body: Markup
    count: int
    left_out: tuple[str, ...] = ()
    printed: tuple[int, ...] = ()
    caption: str = ""
    formats: tuple[Format, ...] = field(default=(), compare=False)

    @property
    def text_columns(self) -> list[int]:
        """Columns (from 1) whose cells are text."""
        return [place for place, head in enumerate(self.heads, start=1) if head.text]

    @property
    def unprinted(self) -> list[int]:
        """Columns (from 1) that do not stand on paper."""
        return [n for n in range(1, len(self.heads) + 1) if self.printed and n not in self.printed]


def show_table(
    table: Table,
    settings: Settings,
    caption: str,
    *,
    always: Collection[str] = (),
    never: Collection[str] = (),
    printed: Collection[str] = (),
) -> PageTable:
    """Return a CSV table for the page.

    Parameters
    ----------
    table, settings
        The table, and the words of its units.
    caption
        What it holds, in a few words.
    always, never
        Columns shown even where blank or zero throughout; columns not shown at all.
    printed
        Columns that stand on paper; all where empty.
    """
    kept: list[int] = []
    left_out: list[str] = []
    for place, column in enumerate(table.columns):
        if column.name in never:
            continue
        if column.name in always or any(row[place] not in (None, "", 0) for row in table.rows):
            kept.append(place)
        else:
            left_out.append(heading(column.name))
    columns = [table.columns[place] for place in kept]
    cells = [[row[place] for row in table.rows] for place in kept]
    heads = tuple(head_of(column, settings) for column in columns)
    numbers = tuple(n for n, head in enumerate(heads, start=1) if head.key in printed)
    shown, formats = columns_html(columns, cells)
    return PageTable(
        table.name,
        heads,
        body_html(shown, len(table.rows)),
        len(table.rows),
        tuple(left_out),
        numbers,
        caption,
        formats,
    )


def head_of(column: Column, settings: Settings, group: str = "") -> Head:
    """Return a column's head in the planner's own words."""
    text = column.kind == "text"
    return Head(
        column.name,
        heading(column.name, column.unit),
        unit_words(column.unit, settings),
        unit_words(column.meaning, settings) if text else column.meaning,
        text,
        group,
    )


def columns_html(
    columns: Sequence[Column], cells: Sequence[Sequence[Cell]]
) -> tuple[list[list[str]], tuple[Format, ...]]:
    """Return each column's cells as escaped HTML, and the formats of its figures."""
    shown: list[list[str]] = []
    formats: list[Format] = []
    for column, values in zip(columns, cells):
        style = format_for(column, values)
        formats.append(style)
        known: dict[Cell, str] = {}
        shown.append([known[v] if v in known else known.setdefault(v, _cell(v, style)) for v in values])
    return shown, tuple(formats)


def body_html(shown: Sequence[Sequence[str]], count: int) -> Markup:
    """Return rows of HTML from columns of escaped cells; end tags that HTML does not ask for are left out."""
    # The line break stands where it is no part of a cell.
    rows = ("<tr>\n<td>" + "<td>".join(column[row] for column in shown) for row in range(count))
    return Markup("".join(rows))


def _cell(value: Cell, style: Format) -> str:
    if value is None:
        return ""
    if isinstance(value, str):
        text = str(escape(SHORT.get(value, value)))
        # A name may turn the direction of writing; <bdi> keeps that to itself.
        return text if value.isascii() else f"<bdi>{text}</bdi>"
    return style(value)
