"""Raw tables -> values by column, as the schema describes them; each bad cell is a fault of its own."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

from hubdesign.checks.findings import LISTED_PER_RULE, Findings, nearest, some
from hubdesign.checks.places import Place
from hubdesign.inputs.convert import BadCell, Decimals, convert, is_numeric_code
from hubdesign.inputs.csv_files import named_columns
from hubdesign.inputs.raw import RawTable, Row, is_blank, shown
from hubdesign.schema import Column, Table

#: What tells the rows of a table apart, for people.
_KEYS: dict[str, tuple[str, tuple[str, ...]]] = {
    "stations": ("station", ("station",)),
    "demand": ("", ("origin", "destination")),
    "fleet": ("vehicle", ("vehicle",)),
    "links": ("", ("from", "to")),
    "current": ("", ("from", "to")),
}

#: Stands for a required figure that is at fault, so that the other rules can still be looked at.
_STAND_IN = 1.0


@dataclass
class ReadTable:
    """The values of a table.

    Attributes
    ----------
    records
        Column -> value of each usable row; blanks hold the schema's default.
    places
        Row number of each record.
    bad
        (index, column) of cells at fault.
    blank
        Columns that hold no value at all, whether named in the header or not.
    """

    name: str
    label: str
    records: list[dict[str, Any]] = field(default_factory=list)
    places: list[Place] = field(default_factory=list)
    bad: set[tuple[int, str]] = field(default_factory=set)
    stray: set[str] = field(default_factory=set)
    whole: bool = True
    separator: str = ""


def read_columns(raw: RawTable, table: Table, findings: Findings) -> ReadTable:
    """Return the values of `raw`; faults and warnings go to `findings`."""
    result = ReadTable(raw.name, raw.label, stray=set(raw.stray), whole=raw.whole, separator=raw.separator)
    places = named_columns(raw)
    if not any(column.name in raw.header for column in table.columns):
        _say_no_header(raw, table, findings)
        result.whole = False
        return result
    misspelt = _check_header(raw, table, places, findings)
    if not raw.rows and not raw.stray and raw.whole:
        _say_empty(raw, table, findings)
    columns = [(column, places[column.name]) for column in table.columns if column.name in places]
    absent = [column for column in table.columns if column.name not in places]
    missing = {column.name: _STAND_IN if column.required else column.default for column in absent}
    missing_bad = {
        column.name for column in absent if column.required or column.name in raw.header
    } | misspelt
    _, keys = _KEYS[table.name]
    present_keys = [key for key in keys if key in places]
    decimals = Decimals(raw.comma_allowed)
    numeric_codes: list[str] = []
    for row in raw.rows:
        record = dict(missing)
        faulty = _read_row(raw, row, columns, record, decimals, numeric_codes, findings)
        if len(present_keys) < len(keys) or any(key in faulty for key in keys):
            result.stray.update(str(row.cells[places[key]]).strip() for key in present_keys)
            continue
        result.bad.update((len(result.records), column) for column in faulty | missing_bad)
        result.records.append(record)
        result.places.append((row.number, ""))
    if not all(key in places for key in keys):
        result.whole = False
    say_numeric_codes(numeric_codes, raw.label, findings)
    check_decimals(decimals, raw.label, findings)
    return result


def _say_no_header(raw: RawTable, table: Table, findings: Findings) -> None:
    """The first row names no column at all: one fault instead of one for each."""
    what = f"no column of {table.name} stands in the first row ({some(map(shown, raw.header), 3)})"
    names = [column.name for column in table.columns]
    cure = f"the first row names the columns: {', '.join(names[:4])}, ..."
    if any(name.lower() in names for name in raw.header):
        cure = "write the names of columns in small letters"
    findings.fault(f"{raw.label} header", what, cure, "no header")


def _say_empty(raw: RawTable, table: Table, findings: Findings) -> None:
    """An empty table is a fault where its rows decide what is asked: links and current may be empty."""
    what = "has a header but no rows"
    if table.name in ("links", "current"):
        findings.warn(raw.label, what, "", "empty table")
    else:
        cure = "write a row for each entry" if table.required else "write rows, or remove the table"
        findings.fault(raw.label, what, cure, "empty table")


def _check_header(raw: RawTable, table: Table, places: dict[str, int], findings: Findings) -> set[str]:
    """Say what is unknown or missing; return the known columns that seem to be misspelt."""
    where = f"{raw.label} header"
    known = {column.name for column in table.columns}
    unknown = [name for name in places if name not in known]
    misspelt: set[str] = set()
    for count, name in enumerate(unknown):
        likely = nearest(name, known - set(raw.header)) if count < LISTED_PER_RULE else ""
        misspelt |= {column for column in known if likely == f"did you mean {column}?"}
        cure = likely or "a column whose name begins with note is your own"
        findings.fault(where, f"the column {shown(name)} is not known", cure, "unknown column")
    for column in table.columns:
        if column.required and column.name not in raw.header and column.name not in misspelt:
            cure = f"add it ({column.meaning})"
            findings.fault(where, f"the column {column.name} is missing", cure, "missing column")
    return misspelt


def _read_row(
    raw: RawTable,
    row: Row,
    columns: list[tuple[Column, int]],
    record: dict[str, Any],
    decimals: Decimals,
    numeric_codes: list[str],
    findings: Findings,
) -> set[str]:
    """Fill `record` from a row; return the columns at fault."""
    faulty: set[str] = set()
    for column, place in columns:
        cell = row.cells[place]
        decimals.where = f"row {row.number}, {column.name}"
        try:
            if is_blank(cell):
                if column.required:
                    raise BadCell("is blank", f"it is required: {column.meaning}")
                record[column.name] = column.default
                continue
            if is_numeric_code(cell, column):
                numeric_codes.append(f"row {row.number}, {column.name}: {shown(cell)}")
            record[column.name] = convert(cell, column, decimals)
        except BadCell as bad:
            faulty.add(column.name)
            record[column.name] = _STAND_IN if column.required else column.default
            where = f"{raw.label} row {row.number}, {column.name}{_who(raw, row, columns, column)}"
            findings.fault(where, bad.what, bad.cure, f"{raw.name} {column.name}")
    return faulty


def _who(raw: RawTable, row: Row, columns: list[tuple[Column, int]], bad: Column) -> str:
    """Return `` (station KLO)``, "" where the code itself is at fault."""
    word, keys = _KEYS[raw.name]
    place = {column.name: place for column, place in columns}
    if bad.name in keys or not all(key in place and not is_blank(row.cells[place[key]]) for key in keys):
        return ""
    texts = [shown(row.cells[place[key]]).strip("'") for key in keys]
    return f" ({word + ' ' if word else ''}{'-'.join(texts)})"


def say_numeric_codes(cells: list[str], label: str, findings: Findings) -> None:
    """Warn of number cells read as codes: leading zeros would be lost."""
    if cells:
        what = f"number cells stand where codes belong and were read as their integers ({some(cells, 3)})"
        findings.warn(
            label, what, "format the columns as text if codes have leading zeros", "numeric code cells"
        )


def check_decimals(decimals: Decimals, label: str, findings: Findings) -> None:
    """Refuse a file that mixes decimal points and commas; say what was read, warn where it is in doubt."""
    if decimals.point and decimals.comma:
        what = f"decimal points and decimal commas are mixed ({decimals.point}; {decimals.comma})"
        findings.fault(
            label, what, "write one of them throughout, without thousands separators", "mixed decimals"
        )
    elif decimals.comma:
        findings.note_format("numbers read with a decimal comma", label)
    if decimals.like_thousands and not decimals.other:
        what = (
            f"every number with a separator has three digits behind it ({decimals.example}); read as decimals"
        )
        findings.warn(label, what, "where it parts thousands, leave it out", "like thousands")
