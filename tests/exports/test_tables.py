"""CSV files give back the same figures and the same text."""

from __future__ import annotations

import csv
import io
import math

from hypothesis import example, given
from hypothesis import strategies as st

from hubdesign.cells import plain_text
from hubdesign.exports.tables import csv_text
from hubdesign.results.table import Column, Table
from tests.exports.cases import HOSTILE, hostile_result, results_of


def table_of(cells: list[object], kind: str) -> Table:
    return Table(
        "t", (Column("a", kind, "", ""), Column("b", "text", "", "")), tuple((cell, "x") for cell in cells)
    )  # type: ignore[arg-type, misc]


def cells_of(text: str) -> list[str]:
    return [row[0] for row in csv.reader(io.StringIO(text, newline=""))][1:]


@given(st.lists(st.floats(allow_nan=False, allow_infinity=False)))
@example([0.1 + 0.2, 1e-320, 1.7976931348623157e308, 2 / 3])
def test_floats_read_back_as_they_were(values: list[float]) -> None:
    read = [float(cell) for cell in cells_of(csv_text(table_of(list(values), "number")))]
    assert all(
        a == b and math.copysign(1.0, a) == math.copysign(1.0, b) for a, b in zip(read, values, strict=True)
    )


@given(st.lists(st.text(alphabet=st.characters(exclude_categories=["Cs"], exclude_characters="\0"))))
@example(list(HOSTILE))
def test_text_reads_back_as_it_was_and_starts_no_formula(values: list[str]) -> None:
    cells = cells_of(csv_text(table_of(list(values), "text")))
    assert [plain_text(cell) for cell in cells] == values
    assert not any(cell.startswith(("=", "+", "-", "@", "\t", "\r")) for cell in cells)


def test_blanks_whole_numbers_and_headers_are_plain() -> None:
    table = Table(
        "t", (Column("frequency_-9", "integer", "", ""), Column("=b", "number", "", "")), ((3, None),)
    )
    assert csv_text(table) == "frequency_-9,'=b\n3,\n"


def test_hostile_names_stand_in_the_stations_table_and_in_no_formula() -> None:
    text = csv_text(results_of(hostile_result()).stations)
    rows = list(csv.DictReader(io.StringIO(text, newline="")))
    assert [plain_text(row["name"]) for row in rows] == list(HOSTILE[: len(rows)])
    assert [plain_text(row["station"]) for row in rows][:2] == ["=1+1", "<b>&"]
    assert not any(cell.startswith(("=", "+", "@")) for row in rows for cell in row.values())
