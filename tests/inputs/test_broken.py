"""Every broken case is refused with its own words, all at once, and leaves nothing behind."""

from __future__ import annotations

from pathlib import Path

import pytest

from hubdesign.checks.rules import CHECKS, rule_name
from hubdesign.errors import EXIT_BAD_INPUT, InputError
from hubdesign.inputs import check, listed_faults, read_case
from tests.inputs.broken import BROKEN, FOLDER, KEPT, Broken


def _everything_in(place: Path) -> dict[str, bytes | None]:
    return {
        str(path.relative_to(place)): path.read_bytes() if path.is_file() else None
        for path in place.rglob("*")
    }


@pytest.mark.parametrize("case", BROKEN)
def test_a_broken_case_is_refused_by_file_row_and_column(case: Broken, tmp_path: Path) -> None:
    path = case.make(tmp_path)
    before = _everything_in(tmp_path)
    report = check(path)
    told = [str(fault) for fault in report.faults]
    assert len(told) == len(case.faults), told
    for expected, sentence in zip(case.faults, told):
        assert expected in sentence
    assert report.problem is None
    with pytest.raises(InputError) as caught:
        read_case(path)
    assert [str(fault) for fault in caught.value.faults] == told
    assert caught.value.exit_code == EXIT_BAD_INPUT
    assert _everything_in(tmp_path) == before


@pytest.mark.parametrize("case", BROKEN)
def test_every_fault_names_its_rule_and_stays_on_a_line(case: Broken, tmp_path: Path) -> None:
    for fault in check(case.make(tmp_path)).faults:
        assert fault.rule
        assert str(fault).isprintable()
        assert len(str(fault)) < 400


def test_the_kept_cases_hold_one_fault_each_word_for_word() -> None:
    assert {path.name for path in FOLDER.iterdir() if path.is_dir()} == {case.name for case in KEPT}
    for case in KEPT:
        assert [str(fault) for fault in check(FOLDER / case.name).faults] == list(case.faults)
        assert len(case.faults) == 1


def test_twenty_faults_of_a_rule_are_listed_and_the_rest_counted(tmp_path: Path) -> None:
    rows = "".join(f"AAL,X{i},5\n" for i in range(57))
    folder = tmp_path / "case"
    folder.mkdir()
    (folder / "stations.csv").write_text("station,lat,lon\nAAL,50,8\nBRO,51,9\n")
    (folder / "demand.csv").write_text("origin,destination,volume\n" + rows + "AAL,BRO,-1\n")
    report = check(folder)
    assert len(report.faults) == 58
    lines = listed_faults(report.faults)
    assert len(lines) == 1 + 20 + 1
    assert "... and 37 more like these (demand stations)" in lines


def test_faults_of_every_table_come_together(tmp_path: Path) -> None:
    folder = tmp_path / "case"
    folder.mkdir()
    (folder / "stations.csv").write_text("station,lat,lon\nAAL,91,8\nBRO,51,9\nBRO,52,9\n")
    (folder / "demand.csv").write_text("origin,destination,volume\nAAL,XYZ,many\nBRO,BRO,3\n")
    (folder / "fleet.csv").write_text("vehicle,capacity,speed_kmh\ngull,0,500\n")
    (folder / "links.csv").write_text("from,to,decision\nAAL,QQQ,perhaps\n")
    (folder / "settings.toml").write_text("[network]\nhubs = 2\nhubs_max = 1\nstructur = 'mixed'\n")
    told = "\n".join(str(fault) for fault in check(folder).faults)
    for words in (
        "91 is outside",
        "XYZ",
        "many",
        "both BRO",
        "0 is not above 0",
        "QQQ",
        "perhaps",
        "structur",
        "hubs",
    ):
        assert words in told
    assert "BRO repeats row 3" in told


def test_a_fault_in_a_cell_is_not_followed_by_faults_of_its_stand_in(tmp_path: Path) -> None:
    folder = tmp_path / "case"
    folder.mkdir()
    (folder / "stations.csv").write_text("station,lat,lon,may_be_hub\nA/B,50,8,yes\nBRO,51,x,perhaps\n")
    (folder / "demand.csv").write_text("origin,destination,volume\nBRO,CEL,x\n")
    (folder / "fleet.csv").write_text(
        "vehicle,capacity,speed_kmh,available,hours_per_vehicle\ngull,x,500,3,many\n"
    )
    (folder / "settings.toml").write_text('[network]\nstructure = "hub-and-spoke"\nhubs = "two"\n')
    told = [str(fault) for fault in check(folder).faults]
    assert sorted(line.split(":")[0] for line in told) == [
        "demand.csv row 2, destination (BRO-CEL)",
        "demand.csv row 2, volume (BRO-CEL)",
        "fleet.csv row 2, capacity (vehicle gull)",
        "fleet.csv row 2, hours_per_vehicle (vehicle gull)",
        "settings.toml line 3, [network] hubs",
        "stations.csv row 2, station",
        "stations.csv row 3, lon (station BRO)",
        "stations.csv row 3, may_be_hub (station BRO)",
    ]


def test_every_rule_has_a_broken_case() -> None:
    broken = {fault.rule for case in KEPT for fault in check(FOLDER / case.name).faults}
    assert {rule_name(rule) for rule in CHECKS} <= broken
