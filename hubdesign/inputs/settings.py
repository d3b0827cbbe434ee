"""settings.toml, or the sheet `settings` -> the values of Settings."""

from __future__ import annotations

import datetime
import re
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
    """Values by setting name.

    `modes` are the [mode.NAME] factors, `bad` the names at fault, `lines` where each stands (``line 5``).
    """

    label: str
    values: dict[str, Any] = field(default_factory=dict)
    modes: dict[str, float] = field(default_factory=dict)
    bad: set[str] = field(default_factory=set)
    lines: dict[str, str] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class _Entry:
    """A setting as written, `typed` where TOML gave its type, a cell otherwise."""

    where: str
    section: str
    name: str
    value: Any
    typed: bool
    line: str


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
    lines = _find_lines(text)
    for section, content in tree.items():
        if section == "mode" and isinstance(content, dict):
            for mode, entries in content.items():
                _toml_section(result, f"mode.{mode}", entries, lines, findings)
        else:
            _toml_section(result, section, content, lines, findings)
    return result


_HEADING = re.compile(r"\s*\[\s*([A-Za-z0-9_.\s\"'-]+?)\s*\]\s*(?:#.*)?")
_KEY = re.compile(r"""\s*["']?([A-Za-z0-9_-]+)["']?\s*=""")


def _find_lines(text: str) -> dict[tuple[str, str], int]:
    """Return (section, name) -> line; the parser does not say, and a miss only leaves the line out."""
    found: dict[tuple[str, str], int] = {}
    section = ""
    for number, line in enumerate(text.split("\n"), 1):
        heading = _HEADING.fullmatch(line.rstrip("\r"))
        if heading:
            section = heading.group(1)
        elif key := _KEY.match(line):
            found.setdefault((section, key.group(1)), number)
    return found


def _place(label: str, line: int | None, section: str, name: str) -> str:
    """Return ``settings.toml line 5, [network] hubs``, without the line where it is not known."""
    start = f"{label} line {line}," if line else label
    return f"{start} [{_name(section)}] {_name(name)}"


def _toml_section(
    result: ReadSettings, section: str, content: Any, lines: dict[tuple[str, str], int], findings: Findings
) -> None:
    if isinstance(content, list) and _known_section(section):
        what = "is a list of sections"
        findings.fault(f"{result.label} {section}", what, f"write [{section}], once", "unknown setting")
        return
    if not isinstance(content, dict):
        setting = _BY_NAME.get(section)
        cure = f"put it under [{setting.section}]" if setting else nearest(section, _BY_NAME)
        what = "stands outside any section"
        if section.split(".")[0] == "mode":
            what, cure = "needs the name of a mode", "write it under [mode.NAME], such as [mode.road]"
        findings.fault(f"{result.label} {_name(section)}", what, cure, "unknown setting")
        return
    if not _known_section(section):
        cure = nearest(section, _SECTIONS) or f"sections are {', '.join(_SECTIONS)} and mode.NAME"
        findings.fault(
            f"{result.label} [{_name(section)}]", "this section is not known", cure, "unknown setting"
        )
        return
    for name, value in content.items():
        line = lines.get((section, name))
        where = _place(result.label, line, section, name)
        entry = _Entry(where, section, name, value, True, f"line {line}," if line else "")
        _take(result, entry, findings)


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
        where = f"{raw.label} row {row.number}, [{_name(section)}] {_name(name)}"
        if is_blank(value):
            continue
        if (section, name) in seen:
            findings.fault(where, f"repeats row {seen[section, name]}", "keep one", "repeat")
        elif not _known_section(section):
            cure = nearest(section, _SECTIONS) or f"sections are {', '.join(_SECTIONS)} and mode.NAME"
            findings.fault(where, f"the section {shown(section)} is not known", cure, "unknown setting")
        else:
            _take(result, _Entry(where, section, name, value, False, f"row {row.number},"), findings)
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
            result.bad.add(setting.name)
        else:
            known = _MODE_NAMES if mode else _BY_NAME
            what, cure = "this setting is not known", nearest(entry.name, known)
            result.bad |= {name for name in known if cure == f"did you mean {name}?"}
            if cure and not mode:
                section = _BY_NAME[cure.removeprefix("did you mean ").rstrip("?")].section
                cure = cure if section == entry.section else f"{cure.rstrip('?')} in [{section}]?"
        findings.fault(entry.where, what, cure, "unknown setting")
        return
    if not mode:
        result.lines[setting.name] = entry.line
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
