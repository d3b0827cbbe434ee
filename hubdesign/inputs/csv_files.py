"""CSV files -> raw tables: encodings, separators, quotes, the count of fields.

The csv module is used rather than a data frame: 10,000 rows are read in some 10 ms, nothing is guessed, and
every row keeps its number.
"""

from __future__ import annotations

import csv
import io
import re
import stat
from collections import Counter
from collections.abc import Collection
from pathlib import Path

from hubdesign.checks.findings import Findings
from hubdesign.inputs.raw import Cell, RawTable, Row, is_blank, is_note, shown

_SEPARATOR_NAMES = {",": "commas", ";": "semicolons", "\t": "tabs"}
_DIRECTIVE = re.compile(r"sep=([,;\t])\r?\n", re.IGNORECASE)
_ARCHIVES = (b"PK\x03\x04", b"\x1f\x8b", bytes.fromhex("D0CF11E0A1B11AE1"))
_MOST_BYTES = 512 * 1024 * 1024


def read_bytes(path: Path, label: str, findings: Findings) -> bytes | None:
    """Return what a regular file holds; None, with the fault noted, where that cannot be."""
    try:
        status = path.stat()
        if stat.S_ISDIR(status.st_mode):
            findings.fault(label, "is a folder, not a file", "put the table's own file there", "not a file")
            return None
        if not stat.S_ISREG(status.st_mode):
            findings.fault(label, "is not a regular file", "put a plain file there", "not a file")
            return None
        if status.st_size > _MOST_BYTES:
            findings.fault(
                label, f"holds {status.st_size:,} bytes", f"at most {_MOST_BYTES:,} are read", "too big"
            )
            return None
        return path.read_bytes()
    except OSError as error:
        findings.fault(label, f"cannot be read ({error.strerror})", "check the file's rights", "unreadable")
        return None


def decode(data: bytes, label: str, findings: Findings) -> str | None:
    """Return the text of UTF-8 (with or without a byte-order mark) or, with a warning, cp1252."""
    if data.startswith(_ARCHIVES):
        what = "is not text but a workbook or an archive"
        findings.fault(label, what, "save the table as CSV text", "encoding")
        return None
    if data[:2] in (b"\xff\xfe", b"\xfe\xff"):
        findings.fault(label, "is UTF-16 text", 'save it as "CSV UTF-8"', "encoding")
        return None
    if b"\0" in data:
        place = data.count(b"\n", 0, data.index(b"\0")) + 1
        findings.fault(
            f"{label} line {place}", "holds a NUL byte", "save it again as CSV UTF-8 text", "encoding"
        )
        return None
    if data.startswith(b"\xef\xbb\xbf"):
        findings.note_format("a byte-order mark was skipped", label)
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError:
        pass
    try:
        text = data.decode("cp1252")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        findings.fault(
            f"{label} line {line}", "is neither UTF-8 nor cp1252 text", "save it as UTF-8", "encoding"
        )
        return None
    findings.note_format("not UTF-8: read as cp1252 (Western European)", label)
    return text


def read_table(
    name: str, label: str, data: bytes, known: Collection[str], findings: Findings
) -> RawTable | None:
    """Return the raw table of a CSV file, None where nothing can be read from it.

    Parameters
    ----------
    name, label
        Of the table; see :class:`RawTable`.
    data
        Bytes of the file.
    known
        Column names of the schema: they tell the separator. Empty for a matrix.
    findings
        Takes the faults and warnings.
    """
    text = decode(data, label, findings)
    if text is None:
        return None
    separator = _separator(text, known)
    if match := _DIRECTIVE.match(text):  # a spreadsheet's own "sep=;" line, which it does not count
        separator, text = match.group(1), text[match.end() :]
    records, whole = _records(text, separator, label, findings)
    if not records:
        if whole:
            findings.fault(label, "is empty", "write a header and a row for each entry", "empty table")
        return None
    if separator != ",":
        findings.note_format(f"separated by {_SEPARATOR_NAMES[separator]}", label)
    table = RawTable(name, label, [], [], separator != ",", separator, whole=whole)
    fit_to_header(table, records, findings, check_count=True)
    return table


def _separator(text: str, known: Collection[str]) -> str:
    """Return the separator whose cut of the first line gives most known columns, then most columns."""
    lines = text.lstrip("\r\n").splitlines()
    first = lines[0][:100_000] if lines else ""

    def merit(separator: str) -> tuple[int, int]:
        names = [part.strip(' "') for part in first.split(separator)]
        return sum(part in known for part in names), len(names)

    return max((",", ";", "\t"), key=merit)


def _records(
    text: str, separator: str, label: str, findings: Findings
) -> tuple[list[tuple[int, list[Cell]]], bool]:
    """Return the records that hold anything, numbered from 1, and whether all could be read."""
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=separator, strict=True)
    records: list[tuple[int, list[Cell]]] = []
    number = 0
    while True:
        number += 1
        try:
            record = next(reader)
        except StopIteration:
            return records, True
        except csv.Error as error:
            what, cure = _csv_words(str(error))
            findings.fault(f"{label} row {number}", what, cure, "csv syntax")
            return records, False
        if any(field.strip(" ") for field in record):
            records.append((number, list(record)))


def _csv_words(error: str) -> tuple[str, str]:
    if "field larger" in error:
        return "has a cell of more than 131,072 characters", "shorten it (or look for a quote never closed)"
    if "unexpected end" in error:
        return "opens a quote that is never closed", 'close the quote, or write a quote inside text as ""'
    if "expected after" in error:
        return "has text after a closing quote", 'put the whole cell in quotes; a quote inside is written ""'
    return f"cannot be read ({error})", "save the table again as CSV"


def fit_to_header(
    table: RawTable, records: list[tuple[int, list[Cell]]], findings: Findings, *, check_count: bool
) -> None:
    """Fill `table` from numbered records, the first being the header.

    Faults: a doubled column, a column with cells but no name and, with `check_count`, rows with more or
    fewer fields than the header (a field too many would shift the columns).
    """
    header_number, first = records[0]
    header = [cell.strip(" ") if isinstance(cell, str) else shown(cell) for cell in first]
    width = len(header)
    while header and not header[-1]:
        header.pop()
    table.header = header
    where = f"{table.label} row {header_number}"
    for column, times in Counter(column for column in header if column).items():
        if times > 1:
            what = f"the column {shown(column)} stands {times} times"
            findings.fault(where, what, "keep one", "doubled column")
    for number, cells in records[1:]:
        if check_count and len(cells) != width:
            _count_fault(table, number, cells, width, findings)
            table.stray.update(str(cell).strip() for cell in cells)
            continue
        beyond = [cell for cell in cells[len(header) :] if not is_blank(cell)]
        if beyond:
            what = f"{shown(beyond[0])} stands beyond the last named column"
            findings.fault(
                f"{table.label} row {number}", what, "name the column (note...) or clear it", "no header"
            )
        row = cells[: len(header)] + [""] * (len(header) - len(cells))
        if any(not is_blank(cell) for cell in row):
            table.rows.append(Row(number, row))
    _unnamed_columns(table, where, findings)


def _count_fault(table: RawTable, number: int, cells: list[Cell], width: int, findings: Findings) -> None:
    count, cure = len(cells), "fill up the row"
    others = [mark for mark in _SEPARATOR_NAMES if mark != table.separator and mark in str(cells[0])]
    if count == 1 and others:
        separated = _SEPARATOR_NAMES[table.separator]
        cure = f"separate it by {separated} like the header, not by {_SEPARATOR_NAMES[others[0]]}"
    if count > width:
        cure = "put a text or number that holds a separator in quotes, without thousands separators"
    fields = "field" if count == 1 else "fields"
    what = f"has {count} {fields} where the header has {width}"
    findings.fault(f"{table.label} row {number}", what, cure, f"{table.name} field count")


def _unnamed_columns(table: RawTable, where: str, findings: Findings) -> None:
    for place, column in enumerate(table.header):
        if column or table.name == "demand_matrix":
            continue
        if any(not is_blank(row.cells[place]) for row in table.rows):
            what = f"column {place + 1} holds cells but has no name"
            findings.fault(where, what, "name it; a name that begins with note is your own", "no header")


def named_columns(table: RawTable) -> dict[str, int]:
    """Return column -> position; the planner's own, unnamed and doubled ones are left out."""
    times = Counter(table.header)
    return {
        column: place
        for place, column in enumerate(table.header)
        if column and not is_note(column) and times[column] == 1
    }
