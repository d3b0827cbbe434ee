"""Settings of a TOML file."""

from __future__ import annotations

from pathlib import Path

import pytest

from hubdesign.inputs import check, read_case
from hubdesign.problem import UNLIMITED, Settings
from hubdesign.schema import SETTINGS
from tests.inputs.broken import write_folder


def _settings(place: Path, text: str) -> Settings:
    return read_case(write_folder(place, settings_toml=text)).settings


def test_an_empty_file_gives_every_default(tmp_path: Path) -> None:
    assert _settings(tmp_path, "") == Settings()


def test_whole_numbers_stand_for_numbers(tmp_path: Path) -> None:
    settings = _settings(tmp_path, "[network]\nmax_circuity = 2\nhubs_max = 1\n")
    assert (settings.max_circuity, settings.hubs_max) == (2.0, 1)
    assert isinstance(settings.max_circuity, float)


def test_unlimited_is_a_word(tmp_path: Path) -> None:
    assert _settings(tmp_path, '[network]\nmax_transfers = "unlimited"\n').max_transfers == UNLIMITED


def test_modes_have_sections_of_their_own(tmp_path: Path) -> None:
    settings = _settings(tmp_path, "[mode.road]\ndistance_factor = 1.3\n[mode.air]\ndistance_factor = 1\n")
    assert settings.mode_distance_factor == (("road", 1.3), ("air", 1.0))


@pytest.mark.parametrize(
    "setting", [setting for setting in SETTINGS if setting.kind in ("number", "integer")]
)
def test_every_figure_keeps_its_range(setting: object, tmp_path: Path) -> None:
    from hubdesign.schema import Setting

    assert isinstance(setting, Setting)
    assert setting.low is not None
    under = int(setting.low) if setting.low_open else int(setting.low) - 1
    folder = write_folder(tmp_path, settings_toml=f"[{setting.section}]\n{setting.name} = {under}\n")
    told = [fault.where for fault in check(folder).faults]
    assert f"settings.toml line 2, [{setting.section}] {setting.name}" in told


@pytest.mark.parametrize(
    "text", ["a = " + "[" * 5000, "x = " + "9" * 5000, "[network]\nhubs = " + "9" * 400, "\x00", "[a]\n[a]\n"]
)
def test_hostile_toml_is_refused_in_words(text: str, tmp_path: Path) -> None:
    assert check(write_folder(tmp_path, settings_toml=text)).faults


def test_a_toml_fault_is_said_by_line(tmp_path: Path) -> None:
    (fault,) = check(write_folder(tmp_path, settings_toml="[goal]\ngoal = least-cost\n")).faults
    assert "line 2" in fault.what


def test_faults_name_the_line_of_their_setting(tmp_path: Path) -> None:
    text = "# a remark\n\n[network]  # another\nhubs = 2\r\n'hubs_max' = 1\n"
    text += "\n[ mode.road ]\nfactor = 2\n[solve]\ngoal = 5\n"
    told = [fault.where for fault in check(write_folder(tmp_path, settings_toml=text)).faults]
    assert "settings.toml line 4, [network] hubs" in told
    assert "settings.toml line 8, [mode.road] factor" in told
    assert "settings.toml line 10, [solve] goal" in told


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("[[network]]\nhubs = 1\n", "settings.toml network: is a list of sections; write [network], once"),
        ("[mode]\ndistance_factor = 1.2\n", "needs the name of a mode; write it under [mode.NAME]"),
        ("mode = 'road'\n", "needs the name of a mode; write it under [mode.NAME]"),
        (
            "[network.hubs]\ncount = 1\n",
            "settings.toml [network] hubs: {...} is a section; write a whole number",
        ),
        ("['a\u200bb']\nx = 1\n", "this section is not known"),
    ],
)
def test_sections_in_a_wrong_shape_are_explained(text: str, words: str, tmp_path: Path) -> None:
    (fault,) = check(write_folder(tmp_path, settings_toml=text)).faults
    assert words in str(fault)
    assert str(fault).isprintable()
