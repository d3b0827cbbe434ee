"""`hubdesign new`: a working, documented case, blank templates, or a workbook that explains its columns."""

from __future__ import annotations

import csv
import errno
import os
import shutil
import tempfile
from importlib import resources
from pathlib import Path

from hubdesign.errors import OutputError
from hubdesign.inputs.reference import default_words, reference_markdown
from hubdesign.inputs.source import SETTINGS_FILE, WORKBOOK_SUFFIX
from hubdesign.schema import MODE_SETTINGS, SETTINGS, TABLES, Setting, Value

#: The settings that the example writes out; everything else stands there as a comment.
EXAMPLE_SETTINGS: dict[str, Value] = {
    "title": "A small regional carrier (invented)",
    "currency": "EUR",
    "volume_unit": "passengers",
    "period": "week",
    "structure": "mixed",
    "hubs_max": 2,
    "max_transfers": 2,
    "max_circuity": 1.8,
    "min_frequency": 3.0,
    "max_load_factor": 0.85,
    "link_fixed_cost": 900.0,
    "revenue_kept_per_transfer": 0.93,
    "co2_price_per_tonne": 60.0,
    "goal": "most-profit",
    "time_limit_s": 30.0,
}

README = "README.md"
_EXAMPLE = """# A small regional carrier

Eight invented towns, two invented vehicle types, a week of passengers. Edit the tables, then

    hubdesign check {name}
    hubdesign design {name} -o RESULT

"""
_BLANK = """# Empty templates

Fill stations.csv and demand.csv, and the other tables where you need them (remove those you do not), then

    hubdesign check {name}

"""
_HABITS = """One row per entry; units stand with the columns below. Columns that begin with `note` are yours.
Semicolons instead of commas are read too, and then a decimal comma; thousands separators are not. Yes/no
columns hold `yes` or `no`. A blank cell takes the default.

"""


def new_case(folder: str | Path, blank: bool = False, workbook: bool = False) -> list[Path]:
    """Write a case to start from; nothing that exists is touched.

    Parameters
    ----------
    folder
        Folder to make (it may exist if it is empty), or the workbook's path.
    blank
        Headers only, and every setting as a comment, instead of the working example.
    workbook
        One workbook instead of a folder; ``.xlsx`` is added where the path has no suffix.

    Returns
    -------
    list of Path
        What was written; for a workbook that one file.

    Raises
    ------
    OutputError
        Something is there already, or it cannot be written.
    """
    target = Path(folder)
    try:
        return [_new_workbook(target, blank)] if workbook else _new_folder(target, blank)
    except FileExistsError as error:
        raise OutputError(f"{error.filename or target} exists already; nothing was written") from error
    except OSError as error:
        if isinstance(error, OutputError):
            raise
        raise OutputError(f"{target} cannot be written ({error.strerror or error})") from error


def _new_folder(target: Path, blank: bool) -> list[Path]:
    if target.is_symlink() or (target.exists() and (not target.is_dir() or any(target.iterdir()))):
        raise FileExistsError(errno.EEXIST, "exists", str(target))
    parent = target.absolute().parent
    parent.mkdir(parents=True, exist_ok=True)
    made = Path(tempfile.mkdtemp(prefix=f".{target.name}-", dir=parent))
    try:
        made.chmod(0o777 & ~_umask())
        for name, text in _texts(target.name, blank).items():
            (made / name).write_text(text, encoding="utf-8", newline="")
        if target.exists():
            target.rmdir()
        os.rename(made, target)  # whole or not at all
    except BaseException:
        shutil.rmtree(made, ignore_errors=True)
        raise
    return sorted(target.iterdir())


def _umask() -> int:
    mask = os.umask(0)
    os.umask(mask)
    return mask


def _texts(name: str, blank: bool) -> dict[str, str]:
    """Return file name -> text of a new folder."""
    texts = {f"{table}.csv": _header_only(table) if blank else example_table(table) for table in TABLES}
    texts[SETTINGS_FILE] = settings_toml({} if blank else EXAMPLE_SETTINGS)
    opening = (_BLANK if blank else _EXAMPLE).format(name=name)
    texts[README] = f"{opening}## The inputs\n\n{_HABITS}{reference_markdown()}"
    return texts


def example_table(table: str) -> str:
    """Return the example's CSV text of a table."""
    place = resources.files("hubdesign.inputs") / "templates" / f"{table}.csv"
    return place.read_text(encoding="utf-8")


def _header_only(table: str) -> str:
    return ",".join(column.name for column in TABLES[table].columns) + "\n"


def settings_toml(values: dict[str, Value]) -> str:
    """Return a settings.toml with every setting and its meaning; those not in `values` as comments."""
    lines = ["# Every setting; those behind a # have the default that is said beside them.", ""]
    section = ""
    for setting in SETTINGS:
        if setting.section != section:
            lines += ["", f"[{setting.section}]"] if section else [f"[{setting.section}]"]
            section = setting.section
        lines.append(_setting_line(setting, values))
    lines += ["", "# A section for each mode whose links are longer than the straight line:", "# [mode.road]"]
    lines += [f"# {setting.name} = 1.25  # {setting.meaning}" for setting in MODE_SETTINGS]
    return "\n".join(lines) + "\n"


def _setting_line(setting: Setting, values: dict[str, Value]) -> str:
    unit = f" ({setting.unit})" if setting.unit and setting.unit not in setting.meaning else ""
    comment = f"# {setting.meaning}{unit}; default {default_words(setting)}"
    if setting.name in values:
        return f"{setting.name} = {_toml(values[setting.name])}  {comment}"
    shown = _toml(setting.default) if setting.default is not None else "..."
    return f"# {setting.name} = {shown}  {comment}"


def _toml(value: Value) -> str:
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        return f'"{value}"'
    return f"{value:g}" if isinstance(value, float) else str(value)


def _new_workbook(target: Path, blank: bool) -> Path:
    from hubdesign.inputs.new_workbook import workbook_bytes

    if not target.suffix:
        target = target.with_name(target.name + WORKBOOK_SUFFIX)
    if target.suffix.lower() != WORKBOOK_SUFFIX:
        raise OutputError(f"{target}: a workbook's name ends in {WORKBOOK_SUFFIX}; nothing was written")
    if target.exists() or target.is_symlink():
        raise FileExistsError(errno.EEXIST, "exists", str(target))
    tables = {table: _example_rows(table) if not blank else [] for table in TABLES}
    data = workbook_bytes(tables, {} if blank else EXAMPLE_SETTINGS)
    target.absolute().parent.mkdir(parents=True, exist_ok=True)
    with target.open("xb") as file:
        file.write(data)
    return target


def _example_rows(table: str) -> list[dict[str, str]]:
    return list(csv.DictReader(example_table(table).splitlines()))
