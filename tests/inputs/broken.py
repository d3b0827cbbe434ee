"""Every broken case, with the faults it must be refused with: for the library's tests and the commands'.

The folders of tests/broken_cases are files, one rule broken in each; expected.toml holds their faults. What
is awkward to keep as a file (workbooks, 3 MB in a cell) is made by the test.
"""

from __future__ import annotations

import shutil
import tomllib
import zipfile
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest

from tests.inputs.workbooks import DATE, DEMAND, FLEET, SETTINGS, STATIONS, changed, save, sheets

FOLDER = Path(__file__).parents[1] / "broken_cases"
SOUND = {
    "stations.csv": "station,name,lat,lon\nAAL,Aalbek,50.1,8.2\nBRO,Brodorf,51.4,9.9\n",
    "demand.csv": "origin,destination,volume\nAAL,BRO,120\n",
    "settings.toml": '[network]\nstructure = "point-to-point"\n[cost]\nunit_cost_per_km = 0.1\n',
}


@dataclass(frozen=True)
class Broken:
    """A broken case: `make` puts it into a folder and returns what to read."""

    name: str
    make: Callable[[Path], Path]
    faults: tuple[str, ...]


def _kept(name: str) -> Callable[[Path], Path]:
    def make(place: Path) -> Path:
        return Path(shutil.copytree(FOLDER / name, place / name))

    return make


def write_folder(place: Path, **files: str | bytes) -> Path:
    """Write a sound little case with `files` changed (``stations_csv="..."``); return its folder."""
    folder = place / "case"
    folder.mkdir()
    texts = {
        **SOUND,
        **{name.replace("_csv", ".csv").replace("_toml", ".toml"): t for name, t in files.items()},
    }
    for name, text in texts.items():
        (folder / name).write_bytes(text if isinstance(text, bytes) else text.encode())
    return folder


def _book(merged: str = "", **changes: list[list[object]] | None) -> Callable[[Path], Path]:
    return lambda place: save(place / "case.xlsx", sheets(**changes), merged)


def _bytes(name: str, data: bytes) -> Callable[[Path], Path]:
    def make(place: Path) -> Path:
        (place / name).write_bytes(data)
        return place / name

    return make


def _cut_short(place: Path) -> Path:
    path = save(place / "case.xlsx", sheets())
    path.write_bytes(path.read_bytes()[:3000])
    return path


def _damaged_inside(place: Path) -> Path:
    path = save(place / "case.xlsx", sheets())
    with zipfile.ZipFile(path) as archive:
        parts = {name: archive.read(name) for name in archive.namelist()}
    parts["xl/worksheets/sheet1.xml"] = parts["xl/worksheets/sheet1.xml"][:200]
    with zipfile.ZipFile(path, "w") as archive:
        for name, data in parts.items():
            archive.writestr(name, data)
    return path


def _encrypted_zip(place: Path) -> Path:
    path = save(place / "case.xlsx", sheets())
    data = bytearray(path.read_bytes())
    for mark, offset in ((b"PK\x03\x04", 6), (b"PK\x01\x02", 8)):
        start = data.find(mark)
        while start >= 0:
            data[start + offset] |= 1
            start = data.find(mark, start + 4)
    path.write_bytes(data)
    return path


def _document(place: Path) -> Path:
    path = place / "case.xlsx"
    with zipfile.ZipFile(path, "w") as archive:
        archive.writestr("word/document.xml", "<document/>")
    return path


_NO_VALUE = "holds a formula that was never calculated; open the workbook in a spreadsheet and save it"

MADE: tuple[Broken, ...] = (
    Broken(
        "path_missing",
        lambda place: place / "absent",
        ("cannot be read (No such file or directory); give a folder of tables or an .xlsx workbook",),
    ),
    Broken(
        "path_of_a_table",
        lambda place: write_folder(place) / "stations.csv",
        ("stations.csv: is neither a folder of tables nor an .xlsx workbook; give the folder it lies in",),
    ),
    Broken(
        "three_megabytes_in_a_cell",
        lambda place: write_folder(
            place, stations_csv="station,name,lat,lon\nAAL," + "x" * 3_000_000 + ",50,8\nBRO,,51,9\n"
        ),
        ("stations.csv row 2: has a cell of more than 131,072 characters; shorten it",),
    ),
    Broken("workbook_without_demand", _book(demand=None), ("sheet demand: is missing;",)),
    Broken("workbook_without_stations", _book(stations=None), ("sheet stations: is missing;",)),
    Broken(
        "workbook_with_an_unknown_sheet",
        _book(links=None, linsk=[["from", "to"], ["AAL", "BRO"]]),
        ("sheet linsk: is not an input table; did you mean links?",),
    ),
    Broken(
        "formula_without_a_value",
        _book(demand=changed(DEMAND, 3, 4, "=100+10")),
        (f"sheet demand row 3, column D: {_NO_VALUE}",),
    ),
    Broken(
        "error_cell",
        _book(demand=changed(DEMAND, 3, 4, "#DIV/0!")),
        ("sheet demand row 3, column D: holds the error '#DIV/0!'; repair its formula",),
    ),
    Broken(
        "date_as_a_code",
        _book(stations=[*STATIONS, [DATE, "Dorstadt", 52.3, 12.1, "no"]]),
        ("sheet stations row 5, station: 2024-05-01 is a date, not a code; format the column as text",),
    ),
    Broken(
        "yes_no_cell_as_a_code",
        _book(stations=[*STATIONS, [True, "Dorstadt", 52.3, 12.1, "no"]]),
        ("sheet stations row 5, station: TRUE is a yes/no cell, not a code; format the column as text",),
    ),
    Broken(
        "fraction_as_a_code",
        _book(stations=[*STATIONS, [7.5, "Dorstadt", 52.3, 12.1, "no"]]),
        ("sheet stations row 5, station: the number 7.5 is not a code; format the column as text",),
    ),
    Broken(
        "date_in_a_number_cell",
        _book(demand=changed(DEMAND, 2, 3, DATE)),
        ("sheet demand row 2, volume (AAL-BRO): 2024-05-01 is a date or time, not a number;",),
    ),
    Broken(
        "yes_no_in_a_number_cell",
        _book(demand=changed(DEMAND, 2, 3, True)),
        ("sheet demand row 2, volume (AAL-BRO): TRUE is yes/no, not a number; write a number",),
    ),
    Broken(
        "decimal_comma_in_a_text_cell",
        _book(demand=changed(DEMAND, 2, 3, "120,5")),
        ("sheet demand row 2, volume (AAL-BRO): '120,5' is not a number: a decimal comma is read only",),
    ),
    Broken(
        "merged_cells",
        _book("A2:A3"),
        ("sheet stations: has merged cells (at A2); unmerge them and fill each",),
    ),
    Broken(
        "cell_beyond_the_table",
        _book(demand=[*DEMAND, ["BRO", "AAL", 5, 90, "?"]]),
        ("sheet demand row 5: '?' stands beyond the last named column;",),
    ),
    Broken(
        "setting_repeated_in_a_sheet",
        _book(settings=[*SETTINGS, ["goal", "goal", "least-cost"]]),
        ("sheet settings row 3, [goal] goal: repeats row 2; keep one",),
    ),
    Broken(
        "setting_of_the_wrong_kind_in_a_sheet",
        _book(settings=[*SETTINGS, ["network", "max_transfers", "many"]]),
        ("sheet settings row 3, [network] max_transfers: 'many' is not a number; write a whole number",),
    ),
    Broken(
        "setting_misspelt_in_a_sheet",
        _book(settings=[*SETTINGS, ["network", "max_transfer", 1]]),
        ("sheet settings row 3, [network] max_transfer: this setting is not known; did you mean max_tr",),
    ),
    Broken(
        "settings_sheet_without_values",
        _book(settings=[["section", "setting"], ["goal", "goal"]]),
        ("sheet settings header: the column value is missing; add it",),
    ),
    Broken(
        "range_0_in_a_cell",
        _book(fleet=changed(FLEET, 2, 3, 0)),
        ("range_km (vehicle gull-50): 0 is not above 0",),
    ),
    Broken(
        "workbook_cut_short", _cut_short, ("case.xlsx: is a damaged .xlsx workbook (cut short, perhaps);",)
    ),
    Broken("workbook_damaged_inside", _damaged_inside, ("case.xlsx: cannot be read as a workbook",)),
    Broken(
        "workbook_encrypted",
        _bytes("case.xlsx", bytes.fromhex("D0CF11E0A1B11AE1") + bytes(1016)),
        ("case.xlsx: is encrypted, or an old .xls workbook; save it as .xlsx without a password",),
    ),
    Broken("workbook_with_encrypted_parts", _encrypted_zip, ("case.xlsx: is encrypted; save it without",)),
    Broken("workbook_of_another_kind", _document, ("case.xlsx: is not an .xlsx workbook; save it as .xlsx",)),
    Broken("workbook_empty", _bytes("case.xlsx", b""), ("case.xlsx: is an empty file;",)),
    Broken(
        "workbook_of_text", _bytes("case.xlsx", b"station,lat\n"), ("case.xlsx: is not an .xlsx workbook;",)
    ),
    Broken(
        "workbook_of_another_suffix",
        _bytes("case.ods", b"PK"),
        ("case.ods: is neither a folder of tables nor an .xlsx workbook; save it as .xlsx",),
    ),
)


def _kept_cases() -> tuple[Broken, ...]:
    expected = tomllib.loads((FOLDER / "expected.toml").read_text(encoding="utf-8"))
    return tuple(Broken(name, _kept(name), tuple(entry["faults"])) for name, entry in expected.items())


KEPT: tuple[Broken, ...] = _kept_cases()
BROKEN = [pytest.param(case, id=case.name) for case in (*KEPT, *MADE)]
