"""A workbook to fill: headers that carry unit and meaning, code columns as text, lists to pick from."""

from __future__ import annotations

import datetime
import io
from typing import Any

from hubdesign.inputs.raw import is_note
from hubdesign.inputs.reference import allowed_words, default_words
from hubdesign.problem import UNLIMITED
from hubdesign.schema import SETTINGS, TABLES, Column, Table, Value

#: Rows that are formatted and checked below the header.
_ROWS = 2000
_WIDTH = 14

#: A fixed date makes the same file every time.
_CREATED = datetime.datetime(2000, 1, 1)


def workbook_bytes(tables: dict[str, list[dict[str, str]]], settings: dict[str, Value]) -> bytes:
    """Return an .xlsx workbook with a sheet for each table, the settings and notes.

    Parameters
    ----------
    tables
        Table -> rows as text by column; blank rows give an empty template.
    settings
        Values of the settings that are written out.
    """
    import xlsxwriter

    buffer = io.BytesIO()
    options = {"in_memory": True, "strings_to_formulas": False, "strings_to_urls": False}
    book = xlsxwriter.Workbook(buffer, options)
    book.set_properties({"created": _CREATED})
    formats = {
        "required": book.add_format({"bold": True, "bottom": 1, "bg_color": "#DCE9F5"}),
        "optional": book.add_format({"bottom": 1, "bg_color": "#EEEEEE"}),
        "text": book.add_format({"num_format": "@"}),
        "wrap": book.add_format({"text_wrap": True, "valign": "top"}),
    }
    for name, table in TABLES.items():
        _write_table(book.add_worksheet(name), table, tables.get(name, []), formats)
    _write_settings(book.add_worksheet("settings"), settings, formats)
    _write_notes(book.add_worksheet("notes"), formats)
    book.close()
    return buffer.getvalue()


def _write_table(sheet: Any, table: Table, rows: list[dict[str, str]], formats: dict[str, Any]) -> None:
    own = [name for name in (rows[0] if rows else {}) if is_note(name)] or ["note"]
    for place, column in enumerate(table.columns):
        kind = "required" if column.required else "optional"
        is_text = column.kind in ("code", "codes", "text", "choice", "yesno")
        sheet.set_column(
            place, place, max(_WIDTH, len(column.name) + 2), formats["text"] if is_text else None
        )
        sheet.write_string(0, place, column.name, formats[kind])
        sheet.write_comment(0, place, _note(column), {"x_scale": 2.2, "y_scale": 1.3})
        choices = ["yes", "no"] if column.kind == "yesno" else list(column.choices)
        if choices:
            sheet.data_validation(1, place, _ROWS, place, {"validate": "list", "source": choices})
        for number, row in enumerate(rows, 1):
            _write_cell(sheet, number, place, row.get(column.name, ""), is_text)
    for place, name in enumerate(own, len(table.columns)):
        sheet.set_column(place, place, 3 * _WIDTH)
        sheet.write_string(0, place, name, formats["optional"])
        for number, row in enumerate(rows, 1):
            _write_cell(sheet, number, place, row.get(name, ""), True)
    sheet.freeze_panes(1, 1)


def _write_cell(sheet: Any, row: int, place: int, text: str, is_text: bool) -> None:
    if text and is_text:
        sheet.write_string(row, place, text)
    elif text:
        sheet.write_number(row, place, float(text))


def _note(column: Column) -> str:
    """Return what a header's note says: meaning, unit, what is allowed, default."""
    allowed = allowed_words(column)
    lines = [column.meaning]
    lines += [f"unit: {column.unit}"] if column.unit else []
    lines += [f"allowed: {allowed}"] if allowed else []
    lines.append("required" if column.required else f"default: {default_words(column)}")
    return "\n".join(lines)


def _write_settings(sheet: Any, settings: dict[str, Value], formats: dict[str, Any]) -> None:
    headers = (("section", 12), ("setting", 28), ("value", 24), ("note_default", 30), ("note_unit", 26))
    for place, (name, width) in enumerate((*headers, ("note_meaning", 90))):
        sheet.set_column(place, place, width)
        sheet.write_string(0, place, name, formats["required" if place < 3 else "optional"])
    for number, setting in enumerate(SETTINGS, 1):
        sheet.write_string(number, 0, setting.section)
        sheet.write_string(number, 1, setting.name)
        _write_value(sheet, number, settings.get(setting.name))
        sheet.write_string(number, 3, default_words(setting).replace("true", "yes").replace("false", "no"))
        sheet.write_string(number, 4, setting.unit)
        sheet.write_string(number, 5, setting.meaning)
        choices = ["yes", "no"] if setting.kind == "yesno" else list(setting.choices)
        if choices:
            sheet.data_validation(number, 2, number, 2, {"validate": "list", "source": choices})
    sheet.freeze_panes(1, 0)


def _write_value(sheet: Any, row: int, value: Value) -> None:
    if value is None:
        return
    if isinstance(value, bool):
        sheet.write_string(row, 2, "yes" if value else "no")
    elif isinstance(value, str):
        sheet.write_string(row, 2, value)
    elif value == UNLIMITED:
        sheet.write_string(row, 2, "unlimited")
    else:
        sheet.write_number(row, 2, value)


def _write_notes(sheet: Any, formats: dict[str, Any]) -> None:
    """Write every column's meaning once more, to be read and printed; the sheet is not read back."""
    headers = (("sheet", 12), ("column", 26), ("meaning", 80), ("unit", 34), ("allowed", 24), ("default", 34))
    for place, (name, width) in enumerate(headers):
        sheet.set_column(place, place, width, formats["wrap"])
        sheet.write_string(0, place, name, formats["required"])
    number = 0
    for table in TABLES.values():
        for column in table.columns:
            number += 1
            cells = (table.name, column.name, column.meaning, column.unit, allowed_words(column))
            for place, text in enumerate((*cells, default_words(column))):
                sheet.write_string(number, place, text)
    sheet.freeze_panes(1, 0)
