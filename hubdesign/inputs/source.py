"""A folder of CSV and TOML files, or one workbook: what is there, and its tables read."""

from __future__ import annotations

import stat
from collections.abc import Callable, Collection
from dataclasses import dataclass, field
from pathlib import Path

from hubdesign.checks.findings import Findings, nearest
from hubdesign.inputs.csv_files import read_bytes, read_table
from hubdesign.inputs.matrix import read_matrix
from hubdesign.inputs.raw import RawTable, shown
from hubdesign.inputs.settings import ReadSettings, read_sheet, read_toml
from hubdesign.inputs.tables import ReadTable, read_columns
from hubdesign.schema import TABLES

SETTINGS_FILE = "settings.toml"
MATRIX = "demand_matrix"
WORKBOOK_SUFFIX = ".xlsx"
SHEETS = (*TABLES, MATRIX, "settings")


@dataclass
class Gathered:
    """What was read: tables by name, the settings and the files they came from."""

    tables: dict[str, ReadTable] = field(default_factory=dict)
    settings: ReadSettings = field(default_factory=lambda: ReadSettings("settings"))
    files: list[Path] = field(default_factory=list)


def input_files(path: str | Path) -> list[Path]:
    """Return the files that reading `path` reads: the workbook itself, or the folder's known files."""
    path = Path(path)
    if not path.is_dir():
        return [path]
    names = [SETTINGS_FILE, *(f"{name}.csv" for name in (*TABLES, MATRIX))]
    return [path / name for name in names if (path / name).is_file()]


def gather(path: Path, findings: Findings) -> Gathered:
    """Return the tables at `path`; everything wrong with the files themselves goes to `findings`."""
    try:
        mode = path.stat().st_mode
    except (OSError, ValueError) as error:
        words = getattr(error, "strerror", None) or str(error)
        cure = "give a folder of tables or an .xlsx workbook; `hubdesign new FOLDER` makes one"
        findings.fault(shown(str(path)).strip("'"), f"cannot be read ({words})", cure, "no such inputs")
        return Gathered()
    if stat.S_ISDIR(mode):
        return _gather_folder(path, findings)
    if path.suffix.lower() == WORKBOOK_SUFFIX:
        return _gather_workbook(path, findings)
    cure = "give the folder it lies in" if path.suffix.lower() in (".csv", ".toml") else "save it as .xlsx"
    findings.fault(path.name, "is neither a folder of tables nor an .xlsx workbook", cure, "no such inputs")
    return Gathered()


def _gather_folder(folder: Path, findings: Findings) -> Gathered:
    result = Gathered(settings=ReadSettings(SETTINGS_FILE))
    try:
        names = sorted(entry.name for entry in folder.iterdir())
    except OSError as error:
        findings.fault(folder.name, f"cannot be read ({error.strerror})", "check its rights", "unreadable")
        return result
    misspelt = _check_names(names, findings)
    raw: dict[str, RawTable] = {}
    for name in (*TABLES, MATRIX):
        label = f"{name}.csv"
        if label not in names:
            continue
        result.files.append(folder / label)
        data = read_bytes(folder / label, label, findings)
        known = {column.name for column in TABLES[name].columns} if name in TABLES else ()
        table = None if data is None else read_table(name, label, data, known, findings)
        raw[name] = table or RawTable(name, label, [], [], whole=False)
    if SETTINGS_FILE in names:
        result.files.append(folder / SETTINGS_FILE)
        data = read_bytes(folder / SETTINGS_FILE, SETTINGS_FILE, findings)
        if data is not None:
            result.settings = read_toml(SETTINGS_FILE, data, findings)
    elif SETTINGS_FILE not in misspelt:
        findings.warn(SETTINGS_FILE, "is missing: every setting has its default", "", "no settings")
    _require(raw, names, lambda name: f"{name}.csv", findings, misspelt)
    _read_all(raw, result, findings)
    return result


def _check_names(names: list[str], findings: Findings) -> set[str]:
    """Say which files are not read; return the names that were misspelt: they do not count as absent."""
    misspelt: set[str] = set()
    wanted = [f"{name}.csv" for name in (*TABLES, MATRIX)] + [SETTINGS_FILE]
    for name in names:
        if name in wanted or not name.lower().endswith((".csv", ".toml", ".tsv", ".txt", ".xlsx", ".xls")):
            continue
        if name.startswith((".", "~$")) or name.lower().startswith("note"):
            continue
        absent = [entry for entry in wanted if entry not in names]
        cure = nearest(name, absent)
        if cure and name.lower().endswith((".csv", ".toml")):
            findings.fault(name, "is not an input table", cure, "unknown table")
            misspelt.add(cure.removeprefix("did you mean ").rstrip("?"))
        else:
            findings.warn(name, "is not an input table and was not read", "", "unread file")
    return misspelt


def _gather_workbook(path: Path, findings: Findings) -> Gathered:
    from hubdesign.inputs.workbook import read_workbook

    result = Gathered(settings=ReadSettings("sheet settings"), files=[path])
    data = read_bytes(path, path.name, findings)
    if data is None:
        return result
    before = len(findings.faults)
    raw = read_workbook(path.name, data, SHEETS, findings)
    if not raw and len(findings.faults) > before:
        return result
    settings = raw.pop("settings", None)
    if settings is not None:
        result.settings = read_sheet(settings, findings)
    else:
        findings.warn("sheet settings", "is missing: every setting has its default", "", "no settings")
    _require(raw, list(raw), lambda name: f"sheet {name}", findings)
    _read_all(raw, result, findings)
    return result


def _require(
    raw: dict[str, RawTable],
    names: list[str],
    label: Callable[[str], str],
    findings: Findings,
    misspelt: Collection[str] = (),
) -> None:
    """Ask for stations and for demand, one way or the other."""
    if "stations" not in raw and label("stations") not in misspelt:
        cure = _hint(names) or "it holds a row for each station"
        findings.fault(label("stations"), "is missing", cure, "missing table")
    if "demand" in raw and MATRIX in raw:
        what = f"stands beside {label('demand')}"
        findings.fault(label(MATRIX), what, "keep one of them", "missing table")
    if not {"demand", MATRIX} & set(raw) and not {label("demand"), label(MATRIX)} & set(misspelt):
        cure = _hint(names) or f"it holds a row for each origin and destination (or write {label(MATRIX)})"
        findings.fault(label("demand"), "is missing", cure, "missing table")


def _hint(names: list[str]) -> str:
    books = [name for name in names if name.lower().endswith(WORKBOOK_SUFFIX) and not name.startswith("~$")]
    return f"or give the workbook {books[0]} itself" if len(books) == 1 else ""


def _read_all(raw: dict[str, RawTable], result: Gathered, findings: Findings) -> None:
    """Read every table that is there; an unreadable one is left empty and marked."""
    for name, table in raw.items():
        if name == MATRIX:
            if "demand" not in raw:
                result.tables["demand"] = read_matrix(table, findings) if table.header else _unread(table)
        elif table.header:
            result.tables[name] = read_columns(table, TABLES[name], findings)
        else:
            result.tables[name] = _unread(table)


def _unread(table: RawTable) -> ReadTable:
    return ReadTable(table.name, table.label, whole=False)
