"""tables.xlsx, read back by openpyxl: the figures of the CSV files, typed, inert, the same bytes."""

from __future__ import annotations

import re
import zipfile
from pathlib import Path
from typing import Any

import openpyxl
import pytest

from hubdesign.exports.summary import tabulate_comparison
from hubdesign.exports.workbook import write_comparison_workbook, write_design_workbook
from hubdesign.results import Table
from tests.exports.cases import HOSTILE, comparison_of, hand_result, hostile_result, results_of, solved_result


def opened(path: Path, make: Any) -> Any:
    result = make()
    write_design_workbook(path, result, results_of(result))
    return openpyxl.load_workbook(path)


def names_of(sheet: Any) -> list[str]:
    return [cell.value.split("\n")[0] for cell in sheet[1]]


def rows_of(sheet: Any) -> list[tuple[Any, ...]]:
    return [tuple(cell.value for cell in row) for row in sheet.iter_rows(min_row=2)]


def shown(table: Table) -> list[tuple[Any, ...]]:
    # A blank text and no figure are both an empty cell.
    return [tuple(None if cell == "" else cell for cell in row) for row in table.rows]


@pytest.mark.parametrize("make", [hand_result, solved_result, hostile_result])
def test_every_sheet_holds_exactly_the_figures_of_its_table(tmp_path: Path, make: Any) -> None:
    book = opened(tmp_path / "t.xlsx", make)
    results = results_of(make())
    for table in (results.links, results.stations, results.vehicles, results.itineraries, results.unserved):
        sheet = book[table.name]
        assert names_of(sheet) == list(table.header)
        assert rows_of(sheet) == shown(table)
        for place, column in enumerate(table.columns, start=1):
            kinds = {
                cell.data_type
                for row in sheet.iter_rows(min_row=2, min_col=place, max_col=place)
                for cell in row
            }
            assert kinds <= ({"s", "n"} if column.kind == "text" else {"n"})


def test_the_sheets_come_in_the_order_people_read_them(tmp_path: Path) -> None:
    assert opened(tmp_path / "t.xlsx", hand_result).sheetnames == [
        "summary",
        "links",
        "stations",
        "vehicles",
        "itineraries",
        "unserved",
        "settings",
    ]


def test_the_summary_holds_answer_costs_and_totals_with_their_units(tmp_path: Path) -> None:
    sheet = opened(tmp_path / "t.xlsx", hand_result)["summary"]
    rows = {row[0]: row for row in rows_of(sheet)}
    results = results_of(hand_result())
    assert rows["objective"][2] == results.answer["objective"]
    assert rows["objective"][1] == "crowns"
    assert rows["total_cost"][1:3] == ("crowns per day", results.costs["total"])
    assert rows["volume_carried"][1:3] == ("seats per day", 80.0)
    assert rows["load_factor"][2] == results.totals["load_factor"]
    formats = {row[0].value: row[2].number_format for row in sheet.iter_rows(min_row=2)}
    assert formats["load_factor"] == "0.00%"
    assert formats["total_cost"] == "#,##0.00"
    assert formats["departures"] == "#,##0"


def test_headers_carry_units_are_frozen_and_filter(tmp_path: Path) -> None:
    book = opened(tmp_path / "t.xlsx", hand_result)
    heads = {cell.value for cell in book["links"][1]}
    assert {"distance_km\nkm", "cost\ncrowns per day", "volume_out\nseats per day", "from"} <= heads
    for sheet in book:
        assert sheet.freeze_panes is not None
        assert sheet.auto_filter.ref.startswith("A1:")
    assert book["links"].freeze_panes == "C2"
    formats = {
        cell.value.split("\n")[0]: book["links"].cell(2, cell.column).number_format
        for cell in book["links"][1]
    }
    assert (formats["load_factor_out"], formats["distance_km"], formats["from"]) == ("0.00%", "#,##0.0", "@")


def test_the_settings_in_force_are_listed_with_their_meaning(tmp_path: Path) -> None:
    rows = {(row[0], row[1]): row for row in rows_of(opened(tmp_path / "t.xlsx", hand_result)["settings"])}
    assert rows["cost", "transfer_factor"][2] == 0.5
    assert rows["case", "fill_coordinates"][2] == "no"
    assert rows["network", "max_transfers"][2] == 1
    assert rows["network", "hubs"][2] is None
    assert "alpha" in rows["cost", "transfer_factor"][4]


@pytest.mark.parametrize("first", [0, 5])
def test_hostile_text_is_text_and_nothing_else(tmp_path: Path, first: int) -> None:
    result = hostile_result(first)
    book = opened(tmp_path / "t.xlsx", lambda: result)
    names = [row[1] for row in rows_of(book["stations"])]
    assert names == [*HOSTILE[first:], *HOSTILE[:first]][: len(names)]
    for sheet in book:
        for row in sheet.iter_rows():
            assert all(cell.data_type in ("s", "n") and cell.hyperlink is None for cell in row)
    with zipfile.ZipFile(tmp_path / "t.xlsx") as package:
        for name in package.namelist():
            content = package.read(name).decode("utf-8")
            assert "<f>" not in content
            assert "<f " not in content
            assert not re.search("hyperlink", content.replace("hyperlinksChanged", ""))
            assert "<script" not in content


def test_the_same_run_gives_the_same_bytes_and_no_date_of_today(tmp_path: Path) -> None:
    for name in ("a.xlsx", "b.xlsx"):
        opened(tmp_path / name, solved_result)
    assert (tmp_path / "a.xlsx").read_bytes() == (tmp_path / "b.xlsx").read_bytes()
    with zipfile.ZipFile(tmp_path / "a.xlsx") as package:
        assert "2000-01-01T00:00:00Z" in package.read("docProps/core.xml").decode()
        assert {info.date_time[0] for info in package.infolist()} == {1980}


def test_a_comparison_stands_side_by_side_and_its_tables_one_below_the_other(tmp_path: Path) -> None:
    comparison = comparison_of()
    results = {entry.structure: results_of(entry.result) for entry in comparison.entries if entry.result}
    table = tabulate_comparison(comparison, results)
    write_comparison_workbook(tmp_path / "t.xlsx", comparison, table, results)
    book = openpyxl.load_workbook(tmp_path / "t.xlsx")
    sheet = book["comparison"]
    assert [cell.value for cell in sheet[1]] == [
        "figure",
        "unit",
        "current",
        "point-to-point",
        "hub-and-spoke",
        "mixed",
        "meaning",
    ]
    told = {row[0]: row[2:-1] for row in rows_of(sheet)}
    for column in table.columns[1:]:
        assert told[column.name] == tuple(None if cell == "" else cell for cell in table.values(column.name))
    assert len(rows_of(book["differences"])) == 3
    links = rows_of(book["links"])
    assert [row[1:] for row in links if row[0] == "mixed"] == shown(results["mixed"].links)
    assert {row[0] for row in links} == {"point-to-point", "hub-and-spoke", "mixed"}
