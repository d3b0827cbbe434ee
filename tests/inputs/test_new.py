"""`new` writes a sound case, empty templates or a workbook, and never over anything."""

from __future__ import annotations

from pathlib import Path

import pytest

from hubdesign.errors import OutputError
from hubdesign.inputs import check, new_case, read_case
from hubdesign.inputs.new import EXAMPLE_SETTINGS
from hubdesign.schema import SETTINGS, TABLES


def test_the_example_has_neither_fault_nor_warning(tmp_path: Path) -> None:
    written = new_case(tmp_path / "case")
    report = check(tmp_path / "case")
    assert (report.faults, report.warnings) == ((), ())
    assert set(written) == set((tmp_path / "case").iterdir())
    assert {path.name for path in written} >= {"settings.toml", *(f"{name}.csv" for name in TABLES)}


def test_the_workbook_reads_back_as_the_folder(tmp_path: Path) -> None:
    new_case(tmp_path / "case")
    (book,) = new_case(tmp_path / "case", workbook=True)
    assert book == tmp_path / "case.xlsx"
    assert read_case(book) == read_case(tmp_path / "case")
    assert check(book).warnings == ()


def test_the_workbook_is_the_same_bytes_every_time(tmp_path: Path) -> None:
    (first,) = new_case(tmp_path / "a.xlsx", workbook=True)
    (second,) = new_case(tmp_path / "b.xlsx", workbook=True)
    assert first.read_bytes() == second.read_bytes()


@pytest.mark.parametrize("workbook", [False, True])
def test_blank_templates_lack_rows_only(workbook: bool, tmp_path: Path) -> None:
    new_case(tmp_path / "case.xlsx", blank=True, workbook=workbook)
    faults = check(tmp_path / "case.xlsx").faults
    assert {fault.rule for fault in faults} == {"empty table"}
    label = "sheet {}" if workbook else "{}.csv"
    assert [fault.where for fault in faults] == [
        label.format(name) for name in ("stations", "demand", "fleet")
    ]


def test_settings_of_the_folder_hold_every_setting_with_its_meaning(tmp_path: Path) -> None:
    new_case(tmp_path / "case")
    lines = (tmp_path / "case" / "settings.toml").read_text().splitlines()
    for setting in SETTINGS:
        (line,) = [line for line in lines if line.lstrip("# ").startswith(f"{setting.name} = ")]
        assert setting.meaning in line
        assert line.startswith("#") == (setting.name not in EXAMPLE_SETTINGS)


def test_uncommenting_the_blank_settings_changes_nothing(tmp_path: Path) -> None:
    new_case(tmp_path / "case")
    path = tmp_path / "case" / "settings.toml"
    before = read_case(tmp_path / "case").settings
    lines = path.read_text().split("# A section for each mode")[0].splitlines()
    path.write_text(
        "\n".join(
            line.removeprefix("# ")
            if line.startswith("# ") and " = " in line and "= ..." not in line
            else line
            for line in lines
        )
    )
    assert read_case(tmp_path / "case").settings == before


@pytest.mark.parametrize("workbook", [False, True])
def test_nothing_that_exists_is_touched(workbook: bool, tmp_path: Path) -> None:
    target = tmp_path / "case.xlsx"
    if workbook:
        target.write_text("mine")
    else:
        target.mkdir()
        (target / "mine.txt").write_text("mine")
    before = {path: path.read_bytes() for path in tmp_path.rglob("*") if path.is_file()}
    with pytest.raises(OutputError, match="exists already; nothing was written"):
        new_case(target, workbook=workbook)
    assert {path: path.read_bytes() for path in tmp_path.rglob("*") if path.is_file()} == before


def test_an_empty_folder_is_filled(tmp_path: Path) -> None:
    (tmp_path / "case").mkdir()
    new_case(tmp_path / "case")
    assert not check(tmp_path / "case").faults
    assert [path.name for path in tmp_path.iterdir()] == ["case"]


def test_a_place_that_cannot_be_written_is_said(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("")
    for workbook in (False, True):
        with pytest.raises(OutputError):
            new_case(tmp_path / "file" / "case.xlsx", workbook=workbook)


def test_a_workbook_of_another_suffix_is_refused(tmp_path: Path) -> None:
    with pytest.raises(OutputError, match="a workbook's name ends in"):
        new_case(tmp_path / "case.ods", workbook=True)
    assert not list(tmp_path.iterdir())
