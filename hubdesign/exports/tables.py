"""Tables as CSV files: UTF-8, commas, floats that round-trip, text that stays text."""

from __future__ import annotations

import re
from pathlib import Path

from hubdesign.cells import guard_text
from hubdesign.results import Cell, Table

_QUOTED = re.compile(r'[,"\r\n]')


def write_csv(path: Path, table: Table) -> None:
    """Write `table` to `path`."""
    path.write_bytes(csv_text(table).encode("utf-8"))


def csv_text(table: Table) -> str:
    """Return `table` as CSV (RFC 4180, but lines end with a line feed alone)."""
    lines = [",".join(_field(name) for name in table.header)]
    lines += [",".join(_field(cell) for cell in row) for row in table.rows]
    return "\n".join(lines) + "\n"


def _field(cell: Cell) -> str:
    if cell is None:
        return ""
    if not isinstance(cell, str):
        # repr gives the shortest text that reads back as the same float.
        return repr(cell)
    text = guard_text(cell)
    # csv.writer would leave a lone return unquoted, and readers take it for the end of the line.
    return '"' + text.replace('"', '""') + '"' if _QUOTED.search(text) else text
