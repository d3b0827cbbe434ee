"""The O-D matrix gives the same demand as the list."""

from __future__ import annotations

from pathlib import Path

from hubdesign.inputs import check, read_case
from hubdesign.problem import Demand
from tests.inputs.broken import write_folder

STATIONS = "station,lat,lon,may_be_hub\n007,50,8,yes\nBRO,51,9,no\nNA,52,10,no\n"


def _matrix_case(place: Path, matrix: str, settings: str = "") -> Path:
    folder = write_folder(place, stations_csv=STATIONS, settings_toml=settings)
    (folder / "demand.csv").unlink()
    (folder / "demand_matrix.csv").write_text(matrix)
    return folder


def test_cells_become_rows_and_blanks_and_zeros_none(tmp_path: Path) -> None:
    folder = _matrix_case(tmp_path, "origin,NA,007,note\nBRO,5,0,x\n007,2.5,,\n")
    assert read_case(folder).demands == (Demand("BRO", "NA", 5.0), Demand("007", "NA", 2.5))


def test_a_matrix_may_have_semicolons_and_decimal_commas(tmp_path: Path) -> None:
    folder = _matrix_case(tmp_path, ";NA;007\nBRO;5,25;1\n")
    assert [row.volume for row in read_case(folder).demands] == [5.25, 1.0]


def test_revenue_comes_from_the_settings(tmp_path: Path) -> None:
    folder = _matrix_case(
        tmp_path, "origin,NA\nBRO,5\n", "[cost]\nrevenue_per_unit = 30\n[goal]\ngoal='most-profit'\n"
    )
    (demand,) = read_case(folder).demands
    assert demand.revenue is None


def test_a_diagonal_is_local_volume(tmp_path: Path) -> None:
    folder = _matrix_case(tmp_path, "origin,NA\nNA,5\n", '[network]\nlocal_volume = "via-hub"\n')
    assert read_case(folder).demands == (Demand("NA", "NA", 5.0),)


def test_warnings_name_the_cell_of_a_matrix(tmp_path: Path) -> None:
    (fault,) = check(_matrix_case(tmp_path, "origin,NA,BRO\nBRO,5,\n007,-2,\n")).faults
    assert (
        str(fault)
        == "demand_matrix.csv row 3, column NA: -2 is negative; it must be at least 0; check the sign"
    )
