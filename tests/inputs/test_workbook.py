"""Workbooks: the same case as a folder gives, and what cells of other kinds become."""

from __future__ import annotations

import zipfile
from itertools import pairwise
from pathlib import Path
from typing import Any

import openpyxl
import pytest
import xlsxwriter

from hubdesign.inputs import check, input_files, read_case
from hubdesign.problem import UNLIMITED
from tests.inputs.workbooks import DEMAND, SETTINGS, STATIONS, save, sheets


@pytest.fixture(scope="module")
def workbook(tmp_path_factory: pytest.TempPathFactory) -> bytes:
    """Return the bytes of a sound workbook."""
    return save(tmp_path_factory.mktemp("book") / "case.xlsx", sheets()).read_bytes()


def test_a_workbook_gives_the_same_case_as_a_folder(tmp_path: Path) -> None:
    book = save(tmp_path / "case.xlsx", sheets())
    folder = tmp_path / "case"
    folder.mkdir()
    for name, rows in sheets().items():
        if name == "settings":
            (folder / "settings.toml").write_text('[goal]\ngoal = "most-profit"\n')
            continue
        words = {True: "yes", False: "no"}
        lines = [
            ",".join(str(words.get(cell, cell) if isinstance(cell, bool) else cell) for cell in row)
            for row in rows
        ]
        (folder / f"{name}.csv").write_text("\n".join(lines) + "\n")
    assert read_case(book) == read_case(folder)
    assert input_files(book) == [book]


def test_codes_survive_in_text_cells(tmp_path: Path) -> None:
    codes = ["NA", "007", "TRUE", "1E5", "=B2"]
    stations = [STATIONS[0], *([code, "", 45 + i, 5 + i, "no"] for i, code in enumerate(codes))]
    demand = [DEMAND[0], *([a, b, 5, 9] for a, b in pairwise(codes))]
    path = tmp_path / "case.xlsx"
    with xlsxwriter.Workbook(path, {"strings_to_formulas": False}) as book:
        for name, rows in {"stations": stations, "demand": demand}.items():
            sheet = book.add_worksheet(name)
            for place, row in enumerate(rows):
                sheet.write_row(place, 0, row)
    assert [row.station for row in read_case(path).stations] == codes


def test_a_number_cell_as_a_code_is_read_as_its_integer_with_a_warning(tmp_path: Path) -> None:
    stations = [*STATIONS, [7, "Seven", 52.3, 12.1, "no"]]
    demand = [*DEMAND, [7, "AAL", 5, 90], ["AAL", 7.0, 5, 90]]
    report = check(save(tmp_path / "case.xlsx", sheets(stations=stations, demand=demand)))
    assert report.problem is not None
    assert report.problem.stations[-1].station == "7"
    assert [(row.origin, row.destination) for row in report.problem.demands[-2:]] == [
        ("7", "AAL"),
        ("AAL", "7"),
    ]
    told = [str(warning) for warning in report.warnings]
    assert any(line.startswith("sheet stations: number cells stand where codes belong") for line in told)
    assert any("row 5, origin: 7, row 6, destination: 7" in line for line in told)


def test_a_calculated_formula_counts_as_its_value(tmp_path: Path) -> None:
    path = tmp_path / "case.xlsx"
    with xlsxwriter.Workbook(path, {"strings_to_formulas": False}) as book:
        for name, rows in {"stations": STATIONS, "demand": DEMAND}.items():
            sheet = book.add_worksheet(name)
            for place, row in enumerate(rows):
                sheet.write_row(place, 0, row)
            if name == "demand":
                sheet.write_formula(1, 2, "=100+23", None, 123)
                sheet.write_formula(2, 3, '=""', None, "")
    with zipfile.ZipFile(path) as archive:
        parts = {name: archive.read(name) for name in archive.namelist()}
    part = "xl/worksheets/sheet2.xml"  # a spreadsheet marks a formula that gives the empty text so
    assert b'<c r="D3"><f>' in parts[part]
    parts[part] = parts[part].replace(b'<c r="D3"><f>', b'<c r="D3" t="str"><f>')
    with zipfile.ZipFile(path, "w") as archive:
        for name, data in parts.items():
            archive.writestr(name, data)
    report = check(path)
    assert report.problem is not None
    assert report.problem.demands[0].volume == 123.0
    assert report.problem.demands[1].revenue is None


def test_rows_are_numbered_as_the_sheet_shows_them(tmp_path: Path) -> None:
    demand: list[list[Any]] = [[], DEMAND[0], DEMAND[1], [], ["BRO", "CEL", -1, 5]]
    path = tmp_path / "case.xlsx"
    save(path, sheets(demand=demand))
    assert [fault.where for fault in check(path).faults] == ["sheet demand row 5, volume (BRO-CEL)"]


def test_settings_of_a_sheet_are_read_by_section(tmp_path: Path) -> None:
    settings = [
        *SETTINGS,
        ["case", "fill_coordinates", True],
        ["network", "hubs_max", 2],
        ["network", "max_transfers", "unlimited"],
        ["network", "max_hours", None],
        ["mode.air", "distance_factor", 1.1],
        ["case", "title", 2024],
    ]
    problem = read_case(save(tmp_path / "case.xlsx", sheets(settings=settings)))
    chosen = problem.settings
    assert (chosen.goal, chosen.fill_coordinates, chosen.hubs_max) == ("most-profit", True, 2)
    assert (chosen.max_transfers, chosen.max_hours, chosen.title) == (UNLIMITED, None, "2024")
    assert chosen.mode_distance_factor == (("air", 1.1),)


def test_a_matrix_sheet_is_read(tmp_path: Path) -> None:
    matrix = [["origin", "AAL", "BRO", "note"], ["AAL", None, 5.5, "x"], ["CEL", 7, 0, None]]
    problem = read_case(save(tmp_path / "case.xlsx", sheets(demand=None, demand_matrix=matrix)))
    assert [(d.origin, d.destination, d.volume) for d in problem.demands] == [
        ("AAL", "BRO", 5.5),
        ("CEL", "AAL", 7.0),
    ]


def test_note_sheets_are_the_planners_own(tmp_path: Path) -> None:
    report = check(save(tmp_path / "case.xlsx", sheets(notes=[["anything"]], note2=[[1]])))
    assert not report.faults


def test_every_cut_of_a_workbook_is_refused_in_words(tmp_path: Path) -> None:
    path = save(tmp_path / "case.xlsx", sheets())
    data = path.read_bytes()
    for length in range(1, len(data), max(1, len(data) // 25)):
        path.write_bytes(data[:length])
        assert check(path).faults


@pytest.mark.parametrize("seed", range(40))
def test_flipped_bytes_in_a_workbook_never_end_in_a_traceback(
    seed: int, workbook: bytes, tmp_path: Path
) -> None:
    import random

    path = tmp_path / "case.xlsx"
    data, rng = bytearray(workbook), random.Random(seed)
    for _ in range(rng.randint(1, 30)):
        data[rng.randrange(len(data))] = rng.randrange(256)
    path.write_bytes(data)
    check(path)  # faults or none, but no exception


def test_openpyxl_itself_reads_our_template(tmp_path: Path) -> None:
    from hubdesign.inputs import new_case

    (path,) = new_case(tmp_path / "case", workbook=True)
    book = openpyxl.load_workbook(path)
    header = book["stations"]["C1"]
    assert header.value == "lat"
    assert header.comment is not None
    assert "unit: degrees" in header.comment.text
    assert book["stations"]["A2"].number_format == "@"


def test_settings_that_clash_are_named_by_their_row(tmp_path: Path) -> None:
    settings = [*SETTINGS, ["network", "hubs", 1], ["network", "hubs_max", 2]]
    (fault,) = check(save(tmp_path / "case.xlsx", sheets(settings=settings))).faults
    assert fault.where == "sheet settings row 3, [network] hubs"
