"""CSV habits that are read right and said, and cells that survive."""

from __future__ import annotations

from pathlib import Path

import pytest

from hubdesign.inputs import check, input_files, read_case
from hubdesign.inputs.convert import BadCell, Decimals, convert
from hubdesign.schema import STATIONS, Column
from tests.inputs.broken import SOUND, write_folder

NUMBER = Column("x", "number", "a number")
SEMICOLONS = "station;lat;lon;hub_fixed_cost\nAAL;50,1;8,2;1000\nBRO;51,45;9;\n"


def _warned(path: Path) -> list[str]:
    report = check(path)
    assert not report.faults
    return [str(warning) for warning in report.warnings]


def test_semicolons_and_decimal_commas_are_read_and_said(tmp_path: Path) -> None:
    folder = write_folder(tmp_path, stations_csv=SEMICOLONS)
    first, second = read_case(folder).stations
    assert (first.lat, first.lon, first.hub_fixed_cost) == (50.1, 8.2, 1000.0)
    assert (second.lat, second.lon) == (51.45, 9.0)
    assert "stations.csv: separated by semicolons" in _warned(folder)
    assert "stations.csv: numbers read with a decimal comma" in _warned(folder)


def test_tabs_with_decimal_points_are_read_and_said(tmp_path: Path) -> None:
    folder = write_folder(tmp_path, stations_csv=SEMICOLONS.replace(",", ".").replace(";", "\t"))
    assert read_case(folder).stations[0].lat == 50.1
    assert _warned(folder) == ["stations.csv: separated by tabs"]


def test_a_byte_order_mark_is_skipped_and_said(tmp_path: Path) -> None:
    folder = write_folder(
        tmp_path,
        stations_csv=b"\xef\xbb\xbfstation,lat,lon\nAAL,50,8\nBRO,51,9\n",
        settings_toml=b"\xef\xbb\xbf" + SOUND["settings.toml"].encode(),
    )
    assert read_case(folder).stations[0].station == "AAL"
    assert _warned(folder) == ["stations.csv, settings.toml: a byte-order mark was skipped"]


def test_cp1252_is_read_and_said(tmp_path: Path) -> None:
    text = "station,name,lat,lon\nAAL,Ærøskøbing,50,8\nBRO,Køge,51,9\n"
    folder = write_folder(tmp_path, stations_csv=text.encode("cp1252"))
    assert [row.name for row in read_case(folder).stations] == ["Ærøskøbing", "Køge"]
    assert _warned(folder) == ["stations.csv: not UTF-8: read as cp1252 (Western European)"]


def test_numbers_that_may_be_thousands_are_warned_of(tmp_path: Path) -> None:
    folder = write_folder(tmp_path, demand_csv="origin;destination;volume\nAAL;BRO;1.250\nBRO;AAL;2.500\n")
    assert [row.volume for row in read_case(folder).demands] == [1.25, 2.5]
    assert any("every number with a separator has three digits" in line for line in _warned(folder))


@pytest.mark.parametrize(
    "code", ["NA", "007", "TRUE", "1E5", "nan", "null", "Ålborg", "<b>", "=A1", "-", "x" * 32]
)
def test_codes_survive_as_text(code: str, tmp_path: Path) -> None:
    folder = write_folder(
        tmp_path,
        stations_csv=f"station,lat,lon\n{code},50,8\nBRO,51,9\n",
        demand_csv=f"origin,destination,volume\n{code},BRO,3\n",
    )
    problem = read_case(folder)
    assert problem.stations[0].station == code
    assert problem.demands[0].origin == code


def test_a_name_with_html_quotes_and_commas_is_kept(tmp_path: Path) -> None:
    name = '<script>alert("1")</script>, & more'
    quoted = name.replace('"', '""')
    folder = write_folder(tmp_path, stations_csv=f'station,name,lat,lon\nAAL,"{quoted}",50,8\nBRO,,51,9\n')
    stations = read_case(folder).stations
    assert stations[0].name == name
    assert stations[1].name == "BRO"  # the code stands in for a blank name


def test_rows_are_numbered_as_a_spreadsheet_does(tmp_path: Path) -> None:
    text = 'station,note,lat,lon\nAAL,"two\nlines",50,8\n\n,,,\nBRO,,99,9\n'
    (fault,) = check(write_folder(tmp_path, stations_csv=text)).faults
    assert fault.where == "stations.csv row 5, lat (station BRO)"


def test_windows_line_ends_and_outer_blanks_do_no_harm(tmp_path: Path) -> None:
    text = "station, lat ,lon\r\n AAL , 50 ,8\r\nBRO,51, 9\r\n"
    assert read_case(write_folder(tmp_path, stations_csv=text)).stations[0].lat == 50.0


def test_note_columns_are_the_planners_own(tmp_path: Path) -> None:
    text = 'station,lat,lon,note,notes of May,Note\nAAL,50,8,a,"b\nc",nan\nBRO,51,9,,,\n'
    assert len(read_case(write_folder(tmp_path, stations_csv=text)).stations) == 2


def test_a_file_that_is_no_table_is_said_not_to_be_read(tmp_path: Path) -> None:
    folder = write_folder(tmp_path)
    (folder / "prices.csv").write_text("a,b\n")
    (folder / "README.md").write_text("x")
    (folder / "notes.txt").write_text("x")
    assert _warned(folder) == ["prices.csv: is not an input table and was not read"]
    assert [path.name for path in input_files(folder)] == ["settings.toml", "stations.csv", "demand.csv"]
    assert {path.name for path in check(folder).files} == {path.name for path in input_files(folder)}


def test_a_folder_without_settings_has_every_default(tmp_path: Path) -> None:
    folder = write_folder(tmp_path)
    (folder / "settings.toml").unlink()
    assert "settings.toml: is missing: every setting has its default" in _warned(folder)


def test_a_workbook_beside_missing_tables_is_hinted_at(tmp_path: Path) -> None:
    (tmp_path / "case.xlsx").write_bytes(b"PK")
    told = [str(fault) for fault in check(tmp_path).faults]
    assert "stations.csv: is missing; or give the workbook case.xlsx itself" in told


def test_must_be_hub_implies_may_be_hub(tmp_path: Path) -> None:
    text = "station,lat,lon,must_be_hub\nAAL,50,8,yes\nBRO,51,9,NO\n"
    assert [row.may_be_hub for row in read_case(write_folder(tmp_path, stations_csv=text)).stations] == [
        True,
        False,
    ]


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("0", 0.0),
        ("-3", -3.0),
        ("+2.50", 2.5),
        (".5", 0.5),
        ("7.", 7.0),
        ("1e3", 1000.0),
        ("2.5E-2", 0.025),
        ("0e99", 0.0),
    ],
)
def test_plain_numbers_are_read(text: str, value: float) -> None:
    assert convert(text, NUMBER, Decimals()) == value


@pytest.mark.parametrize(
    "text",
    [
        "1_000",
        "Infinity",
        "-inf",
        "nan",
        "1e400",
        "١٢٣",
        "１２",
        "0x10",
        "1,5",
        "1.2.3",
        "--",
        "+",
        ".",
        "e5",
        "1e",
        "1e+",
        "12a",
        "1,000.5",
        "yes",
        "TRUE",
        "#N/A",
        "$5",
        "5%",
        "1/2",
        "−5",
    ]
    + ["1 000", "1\u00a0000", "1'000", "5 km", "1e99999", "9" * 400],
)
def test_what_is_not_plainly_a_number_is_refused(text: str) -> None:
    with pytest.raises(BadCell):
        convert(text, NUMBER, Decimals())


@pytest.mark.parametrize(
    "text",
    [
        "A B",
        "A/B",
        "A\\B",
        "A,B",
        "A;B",
        "A|B",
        "A\tB",
        "A\nB",
        'A"B',
        "A'B",
        "A`B",
        "A\u2019B",
        "A\u00a0B",
        "A\u200bB",
    ]
    + ["A\x00B", "A\x7fB", "\ufeffA", "A\u202eB", "x" * 33],
)
def test_what_is_not_a_code_is_refused(text: str) -> None:
    with pytest.raises(BadCell):
        convert(text, STATIONS.column("station"), Decimals())


def test_a_fifo_in_place_of_a_table_does_not_hang(tmp_path: Path) -> None:
    import os

    if not hasattr(os, "mkfifo"):
        pytest.skip("this system has no named pipes")
    folder = write_folder(tmp_path)
    (folder / "fleet.csv").unlink(missing_ok=True)
    os.mkfifo(folder / "fleet.csv")
    (fault,) = check(folder).faults
    assert str(fault) == "fleet.csv: is not a regular file; put a plain file there"


def test_the_separator_line_of_a_spreadsheet_is_obeyed_and_not_counted(tmp_path: Path) -> None:
    folder = write_folder(tmp_path, stations_csv="sep=;\r\nstation;lat;lon\r\nAAL;50,1;8\r\nBRO;91;9\r\n")
    (fault,) = check(folder).faults
    assert fault.where == "stations.csv row 3, lat (station BRO)"


@pytest.mark.parametrize("text", ["48°12'", "48.2N", "N48.2", "48:12:30"])
def test_degrees_and_minutes_are_asked_for_as_decimals(text: str, tmp_path: Path) -> None:
    (fault,) = check(write_folder(tmp_path, stations_csv=f"station,lat,lon\nAAL,{text},8\nBRO,51,9\n")).faults
    assert fault.cure == "write decimal degrees, south and west with a minus sign"


def test_a_name_in_place_of_a_code_is_told_its_code(tmp_path: Path) -> None:
    (fault,) = check(write_folder(tmp_path, demand_csv="origin,destination,volume\nAAL,Brodorf,5\n")).faults
    assert str(fault).endswith("Brodorf is not in stations.csv; write its code BRO")


def test_hostile_sizes_are_refused_quickly(tmp_path: Path) -> None:
    import time

    header = "station,lat,lon," + ",".join(f"x{i}" for i in range(20_000))
    rows = "".join(f"{code},50,8{',' * 20_000}\n" for code in ("AAL", "BRO"))
    demand = "origin,destination,volume\n" + "".join(f"Q{i},R{i},{',' * 100}\n" for i in range(200))
    demand += "".join(f"Q{i},R{i},5\n" for i in range(20_000)) + "AAL,BRO," + '"' + "," * 100_000 + '"\n'
    folder = write_folder(tmp_path, stations_csv=header + "\n" + rows, demand_csv=demand)
    start = time.process_time()
    assert len(check(folder).faults) > 40_000
    assert time.process_time() - start < 30  # a hang, not a benchmark: it takes about 1 s


@pytest.mark.parametrize(
    ("table", "words"),
    [
        ("Origin,Destination,Volume\nAAL,BRO,5\n", "write the names of columns in small letters"),
        ("AAL,BRO,5\n", "no column of demand stands in the first row ('AAL', 'BRO', '5')"),
        ("<html><body>gone</body></html>", "no column of demand stands in the first row"),
        (b"PK\x03\x04\x14\x00", "is not text but a workbook or an archive"),
        (
            "origin;destination;volume\nAAL,BRO,5\n",
            "separate it by semicolons like the header, not by commas",
        ),
    ],
)
def test_a_table_that_is_none_is_one_fault(table: str | bytes, words: str, tmp_path: Path) -> None:
    (fault,) = check(write_folder(tmp_path, demand_csv=table)).faults
    assert words in str(fault)


def test_a_misspelt_column_or_setting_is_not_followed_by_what_its_absence_breaks(tmp_path: Path) -> None:
    folder = write_folder(
        tmp_path,
        stations_csv="station,lat,lon,may_be_hubs\nAAL,50,8,yes\nBRO,51,9,no\n",
        demand_csv="origin,destinaton,volume\nAAL,BRO,5\n",
        settings_toml='[goal]\nunservd = "forbidden"\n[network]\nstructure = "hub-and-spoke"\n',
    )
    told = [str(fault) for fault in check(folder).faults]
    assert len(told) == 3, told
    assert all("did you mean" in line for line in told)
