"""demand_matrix.csv: origins down, destinations across; a blank cell is no demand."""

from __future__ import annotations

from hubdesign.checks.findings import Findings
from hubdesign.inputs.convert import BadCell, Decimals, check_code, code_text, convert
from hubdesign.inputs.raw import Cell, RawTable, is_blank, is_note, shown
from hubdesign.inputs.tables import ReadTable, check_decimals, say_numeric_codes
from hubdesign.schema import DEMAND

_CORNER = ("", "origin")


def read_matrix(raw: RawTable, findings: Findings) -> ReadTable:
    """Return the matrix as rows of demand; zeros and blanks are left out."""
    result = ReadTable("demand", raw.label, whole=raw.whole)
    if raw.header and raw.header[0] not in _CORNER:
        what = f"the first column is headed {shown(raw.header[0])}"
        cure = "the first column holds the origins: head it origin, or leave it blank"
        findings.fault(f"{raw.label} header", what, cure, "matrix corner")
        result.whole = False
        return result
    if not raw.rows and raw.whole:
        findings.fault(raw.label, "has a header but no rows", "write a row for each origin", "empty table")
    columns = _destinations(raw, findings)
    decimals, numeric = Decimals(raw.comma_allowed), list[str]()
    defaults = {column.name: column.default for column in DEMAND.columns}
    seen: dict[str, int] = {}
    for row in raw.rows:
        origin = _code(row.cells[0], f"{raw.label} row {row.number}, origin", findings)
        if origin is None:
            continue
        if not isinstance(row.cells[0], str):
            numeric.append(f"row {row.number}, origin: {shown(row.cells[0])}")
        if origin in seen:
            findings.fault(
                f"{raw.label} row {row.number}, origin",
                f"{origin} repeats row {seen[origin]}",
                "keep one",
                "repeat",
            )
            continue
        seen[origin] = row.number
        for place, destination in columns.items():
            decimals.where = f"row {row.number}, column {destination}"
            volume = _volume(row.cells[place], f"{raw.label} {decimals.where}", decimals, findings)
            if volume:
                record = {**defaults, "origin": origin, "destination": destination, "volume": volume}
                result.records.append(record)
                result.places.append((row.number, destination))
    say_numeric_codes(numeric, raw.label, findings)
    check_decimals(decimals, raw.label, findings)
    return result


def _destinations(raw: RawTable, findings: Findings) -> dict[int, str]:
    result: dict[int, str] = {}
    seen: set[str] = set()
    for place, name in enumerate(raw.header[1:], 1):
        if not name:
            if any(not is_blank(row.cells[place]) for row in raw.rows):
                what = f"column {place + 1} holds volumes but has no destination"
                findings.fault(f"{raw.label} header", what, "write the station's code above it", "no header")
        elif not is_note(name):
            code = _code(name, f"{raw.label} header, column {place + 1}", findings)
            if code is not None and code not in seen:  # doubled ones are a fault already
                result[place] = code
                seen.add(code)
    return result


def _code(cell: Cell, where: str, findings: Findings) -> str | None:
    try:
        text = code_text(cell)
        if not text:
            raise BadCell("is blank", "write the station's code")
        return check_code(text)
    except BadCell as bad:
        findings.fault(where, bad.what, bad.cure, "demand_matrix codes")
        return None


def _volume(cell: Cell, where: str, decimals: Decimals, findings: Findings) -> float:
    if is_blank(cell):
        return 0.0
    try:
        value = convert(cell, DEMAND.column("volume"), decimals)
    except BadCell as bad:
        findings.fault(where, bad.what, bad.cure, "demand_matrix volumes")
        return 0.0
    return value if isinstance(value, float) else 0.0
