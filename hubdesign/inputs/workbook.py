"""One .xlsx workbook -> raw tables, sheet by sheet.

Cells are read by python-calamine. An uncalculated formula or an error cell reaches us as a blank, so the
sheets' own XML is searched for them.
"""

from __future__ import annotations

import io
import re
import zipfile
from collections.abc import Collection
from typing import Any
from xml.etree import ElementTree

from hubdesign.checks.findings import Findings, nearest
from hubdesign.inputs.csv_files import fit_to_header
from hubdesign.inputs.raw import Cell, RawTable, is_blank, is_note, shown

_OLE = bytes.fromhex("D0CF11E0A1B11AE1")
_MOST_CELLS = 20_000_000
_MOST_BYTES = 2 * 1024**3
_CELL = re.compile(rb"<c\b([^>]*?)(?:/>|>(.*?)</c>)", re.DOTALL)
_REFERENCE = re.compile(rb'\br="([A-Z]+)([0-9]+)"')
_FORMULA = re.compile(rb"<f\b")
_VALUE = re.compile(rb"<v\b[^>]*>[^<]")
_RELATION = "{http://schemas.openxmlformats.org/officeDocument/2006/relationships}id"


def read_workbook(label: str, data: bytes, names: Collection[str], findings: Findings) -> dict[str, RawTable]:
    """Return the sheets called `names` as raw tables.

    Sheets that begin with `note` are the planner's own; others are faults. A workbook that cannot be opened
    is a fault and gives no table.
    """
    problem = _unreadable(data)
    if problem:
        findings.fault(label, *problem, "workbook")
        return {}
    try:
        return _read_sheets(data, names, findings)
    except BaseException as error:
        # A damaged archive raises whatever its readers trip over; a panic of the reader is no Exception.
        if not isinstance(error, Exception) and type(error).__name__ != "PanicException":
            raise
        what = f"cannot be read as a workbook ({shown(str(error) or type(error).__name__)}); it is damaged"
        findings.fault(label, what, "open and save it again as .xlsx", "workbook")
        return {}


def _read_sheets(data: bytes, names: Collection[str], findings: Findings) -> dict[str, RawTable]:
    from python_calamine import load_workbook

    tables: dict[str, RawTable] = {}
    book = load_workbook(io.BytesIO(data))
    sheets = list(book.sheet_names)
    blanks = _silent_blanks(data)
    for sheet in sheets:
        if sheet in names:
            table = _sheet(book, sheet, blanks.get(sheet, {}), findings)
            tables[sheet] = table or RawTable(sheet, f"sheet {sheet}", [], [], whole=False)
        elif not is_note(sheet):
            own = "a sheet whose name begins with note is your own"
            cure = nearest(sheet, set(names) - set(sheets)) or own
            findings.fault(f"sheet {shown(sheet)[1:-1]}", "is not an input table", cure, "unknown table")
    return tables


def _unreadable(data: bytes) -> tuple[str, str] | None:
    """Return why these bytes are no workbook that can be read, and a cure."""
    if not data:
        return "is an empty file", "save the workbook again"
    if data.startswith(_OLE):
        return "is encrypted, or an old .xls workbook", "save it as .xlsx without a password"
    if not data.startswith(b"PK"):
        return "is not an .xlsx workbook", "save it as .xlsx, or give a folder of CSV tables"
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as archive:
            members = archive.infolist()
    except Exception:  # whatever the damage makes it raise
        return "is a damaged .xlsx workbook (cut short, perhaps)", "save or copy it again"
    if any(member.flag_bits & 1 for member in members):
        return "is encrypted", "save it without a password"
    if sum(member.file_size for member in members) > _MOST_BYTES:
        return "unpacks to more than 2 GB", "remove what is not needed"
    if "xl/workbook.xml" not in {member.filename for member in members}:
        return "is not an .xlsx workbook", "save it as .xlsx (Excel workbook)"
    return None


def _sheet(book: Any, name: str, blanks: dict[tuple[int, int], str], findings: Findings) -> RawTable | None:
    label = f"sheet {name}"
    sheet = book.get_sheet_by_name(name)
    if sheet.total_height * sheet.total_width > _MOST_CELLS:
        what = f"reaches over {sheet.total_height:,} rows and {sheet.total_width:,} columns"
        findings.fault(label, what, "delete the empty rows and columns beyond the table", "too big")
        return None
    merged = sheet.merged_cell_ranges or []
    if merged:
        first = f"{_letters(merged[0][0][1])}{merged[0][0][0] + 1}"
        findings.fault(label, f"has merged cells (at {first})", "unmerge them and fill each", "merged cells")
        return None
    grid: list[list[Cell]] = sheet.to_python(skip_empty_area=False)
    records = [(number, row) for number, row in enumerate(grid, 1) if any(not is_blank(cell) for cell in row)]
    if not records:
        findings.fault(label, "is empty", "write a header and a row for each entry", "empty table")
        return None
    _say_blanks(label, blanks, findings)
    table = RawTable(name, label, [], [])
    fit_to_header(table, records, findings, check_count=False)
    return table


def _say_blanks(label: str, blanks: dict[tuple[int, int], str], findings: Findings) -> None:
    for (row, column), what in sorted(blanks.items()):
        where = f"{label} row {row}, column {_letters(column)}"
        cure = "open the workbook in a spreadsheet and save it" if "formula" in what else "repair its formula"
        findings.fault(where, what, cure, "cell without value")


def _letters(column: int) -> str:
    """Return a column's letters, 0 -> A."""
    text, column = "", column + 1
    while column:
        column, rest = divmod(column - 1, 26)
        text = chr(ord("A") + rest) + text
    return text


def _silent_blanks(data: bytes) -> dict[str, dict[tuple[int, int], str]]:
    """Return, by sheet, the (row, column) of formulas without a value and of error cells."""
    result: dict[str, dict[tuple[int, int], str]] = {}
    with zipfile.ZipFile(io.BytesIO(data)) as archive:
        for name, part in _sheet_parts(archive).items():
            xml = archive.read(part)
            if b"<f" not in xml and b't="e"' not in xml:
                continue
            found = result.setdefault(name, {})
            for match in _CELL.finditer(xml):
                attributes, content = match.group(1), match.group(2) or b""
                what = _silent(attributes, content)
                reference = _REFERENCE.search(attributes)
                if what and reference:
                    found[int(reference.group(2)), _position(reference.group(1).decode())] = what
    return result


def _silent(attributes: bytes, content: bytes) -> str:
    if b't="e"' in attributes:
        value = re.search(rb"<v>([^<]*)</v>", content)
        return f"holds the error {shown(value.group(1).decode())}" if value else "holds an error value"
    # A formula that gives the empty text (t="str") is a blank that was meant.
    if _FORMULA.search(content) and not _VALUE.search(content) and b't="str"' not in attributes:
        return "holds a formula that was never calculated"
    return ""


def _position(letters: str) -> int:
    value = 0
    for letter in letters:
        value = value * 26 + ord(letter) - ord("A") + 1
    return value - 1


def _sheet_parts(archive: zipfile.ZipFile) -> dict[str, str]:
    """Return sheet name -> its part of the archive."""
    relations = ElementTree.fromstring(archive.read("xl/_rels/workbook.xml.rels"))
    targets = {entry.get("Id"): entry.get("Target", "") for entry in relations}
    book = ElementTree.fromstring(archive.read("xl/workbook.xml"))
    parts: dict[str, str] = {}
    for entry in book.iter("{http://schemas.openxmlformats.org/spreadsheetml/2006/main}sheet"):
        target = targets.get(entry.get(_RELATION), "")
        part = target.lstrip("/") if target.startswith("/") else f"xl/{target}"
        if part in archive.namelist():
            parts[entry.get("name", "")] = part
    return parts
