"""settings.toml, or the sheet `settings` -> the values of Settings."""

from __future__ import annotations

import datetime
import tomllib
from dataclasses import dataclass, field
from typing import Any

from hubdesign.checks.findings import Findings, nearest
from hubdesign.inputs.convert import BadCell, Decimals, check_code, convert
from hubdesign.inputs.csv_files import decode, named_columns
from hubdesign.inputs.raw import Cell, RawTable, is_blank, shown
from hubdesign.problem import UNLIMITED
from hubdesign.schema import MODE_SETTINGS, SETTINGS, Setting

_BY_NAME = {setting.name: setting for setting in SETTINGS}
_SECTIONS = tuple(dict.fromkeys(setting.section for setting in SETTINGS))
_MODE_NAMES = {setting.name: setting for setting in MODE_SETTINGS}


@dataclass
class ReadSettings:
    """Values by setting name; `bad` are names at fault, `modes` the [mode.NAME] factors."""

    label: str
    values: dict[str, Any] = field(default_factory=dict)
    modes: dict[str, float] = field(default_factory=dict)
    bad: set[str] = field(default_factory=set)


@dataclass(frozen=True, slots=True)
class _Entry:
    """A setting as written, `typed` where TOML gave its type, a cell otherwise."""

    where: str
    section: str
    name: str
    value: Any
    typed: bool


def read_toml(label: str, data: bytes, findings: Findings) -> ReadSettings:
    """Return the settings of a TOML file."""
    result = ReadSettings(label)
    text = decode(data, label, findings)
    if text is None:
        return result
    try:
        tree = tomllib.loads(text)
    except (ValueError, RecursionError) as error:
        words = str(error) if isinstance(error, tomllib.TOMLDecodeError) else "too deep or too long a value"
        findings.fault(label, f"is not TOML: {words}", 'write name = value, texts in "quotes"', "toml syntax")
        return result
    for section, content in tree.items():
        if section == "mode" and isinstance(content, dict):
            for mode, entries in content.items():
                _toml_section(result, f"mode.{mode}", entries, findings)
        else:
            _toml_section(result, section, content, findings)
    return result


def _toml_section(result: ReadSettings, section: str, content: Any, findings: Findings) -> None:
    if not isinstance(content, dict):
        setting = _BY_NAME.get(section)
        cure = f"put it under [{setting.section}]" if setting else nearest(section, _BY_NAME)
        what = "stands outside any section" if section != "mode" else "is not a section: write [mode.NAME]"
        findings.fault(f"{result.label} {_name(section)}", what, cure, "unknown setting")
        return
    if not _known_section(section):
        cure = nearest(section, _SECTIONS) or f"sections are {', '.join(_SECTIONS)} and mode.NAME"
        findings.fault(
            f"{result.label} [{section[:40]}]", "this section is not known", cure, "unknown setting"
        )
        return
    for name, value in content.items():
        where = f"{result.label} [{section}] {name}"
        _take(result, _Entry(where, section, name, value, True), findings)


def read_sheet(raw: RawTable, findings: Findings) -> ReadSettings:
    """Return the settings of a sheet with the columns section, setting, value."""
    result = ReadSettings(raw.label)
    places = named_columns(raw)
    absent = [name for name in ("section", "setting", "value") if name not in places]
    for name in absent:
        findings.fault(f"{raw.label} header", f"the column {name} is missing", "add it", "missing column")
    for name in places:
        if name not in ("section", "setting", "value"):
            cure = nearest(name, absent) or "a column whose name begins with note is your own"
            findings.fault(
                f"{raw.label} header", f"the column {shown(name)} is not known", cure, "unknown column"
            )
    if absent:
        return result
    seen: dict[tuple[str, str], int] = {}
    for row in raw.rows:
        section, name = (_word(row.cells[places[column]]) for column in ("section", "setting"))
        value = row.cells[places["value"]]
        where = f"{raw.label} row {row.number}, [{section[:40]}] {name[:40]}"
        if is_blank(value):
            continue
        if (section, name) in seen:
            findings.fault(where, f"repeats row {seen[section, name]}", "keep one", "repeat")
        elif not _known_section(section):
            cure = nearest(section, _SECTIONS) or f"sections are {', '.join(_SECTIONS)} and mode.NAME"
            findings.fault(where, f"the section {shown(section)} is not known", cure, "unknown setting")
        else:
            _take(result, _Entry(where, section, name, value, False), findings)
        seen[section, name] = row.number
    return result


def _name(text: str) -> str:
    return shown(text)[1:-1]


def _word(cell: Cell) -> str:
    return cell.strip(" ") if isinstance(cell, str) else str(cell)


def _known_section(section: str) -> bool:
    return section in _SECTIONS or (section.startswith("mode.") and len(section) > len("mode."))


def _take(result: ReadSettings, entry: _Entry, findings: Findings) -> None:
    """Put a setting's value into `result`, or its fault into `findings`."""
    mode = entry.section.removeprefix("mode.") if entry.section.startswith("mode.") else ""
    setting = _MODE_NAMES.get(entry.name) if mode else _BY_NAME.get(entry.name)
    if setting is None or (not mode and setting.section != entry.section):
        if setting is not None:
            what, cure = "stands in the wrong section", f"put it under [{setting.section}]"
        else:
            known = _MODE_NAMES if mode else _BY_NAME
            what, cure = "this setting is not known", nearest(entry.name, known)
            if cure and not mode:
                section = _BY_NAME[cure.removeprefix("did you mean ").rstrip("?")].section
                cure = cure if section == entry.section else f"{cure.rstrip('?')} in [{section}]?"
        findings.fault(entry.where, what, cure, "unknown setting")
        return
    try:
        value = _typed(entry.value, setting) if entry.typed else _of_cell(entry.value, setting)
        if mode:
            result.modes[check_code(mode)] = float(value)
        else:
            result.values[setting.name] = value
    except BadCell as bad:
        findings.fault(entry.where, bad.what, bad.cure, "setting value")
        if not mode:
            result.bad.add(setting.name)


def _typed(value: Any, setting: Setting) -> Any:
    """Return a TOML value where its type is the setting's; a text in quotes is not a number."""
    if isinstance(value, str) and value in setting.alternatives:
        return UNLIMITED
    wanted = {"number": (int, float), "integer": (int,), "yesno": (bool,)}.get(setting.kind, (str,))
    if not isinstance(value, wanted) or (isinstance(value, bool) and setting.kind != "yesno"):
        if isinstance(value, float):
            raise BadCell(f"{value!r} is not written as a whole number", "write it without a decimal point")
        raise BadCell(f"{_shown_toml(value)} is {_type_words(value)}", f"write {_wanted_words(setting)}")
    if isinstance(value, int) and abs(value) > 10**300:
        raise BadCell("the number is too large to be data (at most 1e15 is read)", "check it")
    if setting.kind == "number" or (setting.kind == "integer" and not isinstance(value, bool)):
        return convert(float(value), setting, Decimals())
    return convert(value, setting, Decimals())


def _of_cell(cell: Cell, setting: Setting) -> Any:
    if isinstance(cell, str) and cell.strip(" ") in setting.alternatives:
        return UNLIMITED
    try:
        return convert(cell, setting, Decimals())
    except BadCell as bad:
        if setting.alternatives and "whole" not in bad.what:
            raise BadCell(bad.what, f"write {_wanted_words(setting)}") from None
        raise


def _shown_toml(value: Any) -> str:
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, dict | list):
        return "{...}" if isinstance(value, dict) else "[...]"
    if isinstance(value, int) and abs(value) > 10**300:
        return "the number"
    return shown(value)


def _type_words(value: Any) -> str:
    if isinstance(value, bool):
        return "true/false"
    if isinstance(value, str):
        return "a text"
    if isinstance(value, datetime.date | datetime.time):
        return "a date or time"
    return {dict: "a section", list: "a list", int: "a whole number", float: "a number"}.get(
        type(value), "unusable"
    )


def _wanted_words(setting: Setting) -> str:
    if setting.kind == "yesno":
        return "true or false"
    if setting.kind == "choice":
        return " or ".join(f'"{choice}"' for choice in setting.choices)
    words = {"number": "a number, without quotes", "integer": "a whole number, without quotes"}.get(
        setting.kind, 'a text in "quotes"'
    )
    return words + "".join(f', or "{word}"' for word in setting.alternatives)
