"""Writing a result: every file of a design or a comparison into its folder, whole or not at all."""

from __future__ import annotations

import time
from contextlib import AbstractContextManager, nullcontext
from dataclasses import dataclass
from pathlib import Path

from hubdesign.comparison import Comparison
from hubdesign.errors import OutputError
from hubdesign.exports.folder import Claim, check_target, claim_target, read_manifest, write_manifest
from hubdesign.exports.geojson import write_maps
from hubdesign.exports.report import PAGE, render_comparison_report, render_design_report
from hubdesign.exports.summary import (
    Seconds,
    comparison_seconds,
    comparison_summary,
    design_summary,
    tabulate_comparison,
    write_json,
)
from hubdesign.exports.tables import write_csv
from hubdesign.exports.workbook import write_comparison_workbook, write_design_workbook
from hubdesign.inputs import input_files
from hubdesign.results import Results, build_results
from hubdesign.run import Result

__all__ = [
    "InputFiles",
    "check_target",
    "claim_target",
    "input_copy",
    "read_inputs",
    "write",
    "write_comparison",
    "write_design",
]

INPUT_COPY = "inputs"


@dataclass(frozen=True, slots=True)
class InputFiles:
    """The inputs as bytes: what a result keeps a copy of.

    Attributes
    ----------
    path
        Where they were read.
    files
        File name -> bytes.
    """

    path: Path
    files: dict[str, bytes]


def read_inputs(path: str | Path) -> InputFiles:
    """Return the bytes of a case: its settings and tables, or its workbook.

    Read before a long solve, they are what was solved, whatever happens to the files meanwhile.
    """
    return InputFiles(Path(path), {file.name: file.read_bytes() for file in input_files(path)})


def input_copy(folder: str | Path) -> Path:
    """Return the copy of the inputs in a result folder: a folder of tables, or the workbook in it."""
    place = Path(folder) / INPUT_COPY
    books = sorted(place.glob("*.xls*"))
    return books[0] if len(books) == 1 and not (place / "stations.csv").exists() else place


def write_design(
    result: Result,
    target: str | Path,
    inputs: str | Path | InputFiles,
    read_s: float = 0.0,
    *,
    claim: Claim | None = None,
) -> tuple[str, ...]:
    """Write a design into the folder `target`, whole or not at all.

    Parameters
    ----------
    result
        A verified design.
    target
        Not there yet, empty, or a result of ours, which is replaced.
    inputs
        Where the inputs lie, or their bytes (:func:`read_inputs`); a copy goes into the result.
    read_s
        Seconds that reading the inputs took.
    claim
        Of the target, where the caller holds one (:func:`claim_target`).

    Returns
    -------
    tuple of str
        Paths of the files written, below the target.

    Raises
    ------
    OutputError
        Where the target cannot or must not be written; the old result is kept.
    """
    start = time.perf_counter()
    copied = inputs if isinstance(inputs, InputFiles) else read_inputs(inputs)
    with _claimed(claim, target, copied) as held, held.new_result("design") as folder:
        tables = build_results(result.network, result.design, result.bill)
        _fill_design(folder, result, tables, copied, start, read_s)
    return tuple(read_manifest(held.target).files)


def write(
    outcome: Result | Comparison, target: str | Path, inputs: str | Path | InputFiles
) -> tuple[str, ...]:
    """Write a design or a comparison into the folder `target`, whole or not at all.

    Parameters
    ----------
    outcome
        What :func:`hubdesign.design` or :func:`hubdesign.compare` returned.
    target, inputs
        As for :func:`write_design`; settings changed since reading stand in summary.json.

    Raises
    ------
    OutputError
        Where the target cannot or must not be written; the old result is kept.
    """
    if isinstance(outcome, Comparison):
        return write_comparison(outcome, target, inputs)
    return write_design(outcome, target, inputs)


def write_comparison(
    comparison: Comparison,
    target: str | Path,
    inputs: str | Path | InputFiles,
    read_s: float = 0.0,
    *,
    claim: Claim | None = None,
) -> tuple[str, ...]:
    """Write a comparison: a complete result folder for each structure, comparison.csv and comparison.json.

    Parameters, returns and raises as :func:`write_design`.
    """
    start = time.perf_counter()
    copied = inputs if isinstance(inputs, InputFiles) else read_inputs(inputs)
    results: dict[str, Results] = {}
    if not comparison.any_design:
        raise OutputError(f"{target}: no structure has a design; there is nothing to write")
    with _claimed(claim, target, copied) as held, held.new_result("comparison") as folder:
        for entry in comparison.entries:
            if entry.result is None:
                continue
            begun = time.perf_counter()
            result = entry.result
            tables = results[entry.structure] = build_results(result.network, result.design, result.bill)
            part = folder / entry.structure
            part.mkdir()
            notes = (entry.note,) if entry.note else ()
            _fill_design(part, result, tables, copied, begun, read_s, notes)
            write_manifest(part, "design")
        table = tabulate_comparison(comparison, results)
        write_csv(folder / "comparison.csv", table)
        write_comparison_workbook(folder / "tables.xlsx", comparison, table, results)
        page = render_comparison_report(comparison, table, results, copied.files)
        (folder / PAGE).write_bytes(page.encode("utf-8"))
        _copy_inputs(folder, copied)
        seconds = comparison_seconds(comparison, read_s, time.perf_counter() - start)
        write_json(folder / "comparison.json", comparison_summary(comparison, results, seconds))
    return tuple(read_manifest(held.target).files)


def _fill_design(
    folder: Path,
    result: Result,
    results: Results,
    inputs: InputFiles,
    start: float,
    read_s: float,
    notes: tuple[str, ...] = (),
) -> None:
    """Write the files of one design; the summary comes last, for it tells how long the others took."""
    for table in results.tables:
        write_csv(folder / f"{table.name}.csv", table)
    write_maps(folder, result.network, results)
    write_design_workbook(folder / "tables.xlsx", result, results)
    page = render_design_report(result, results, inputs.files, notes)
    (folder / PAGE).write_bytes(page.encode("utf-8"))
    _copy_inputs(folder, inputs)
    seconds = Seconds(read_s, result.solve_s, result.cpu_s, time.perf_counter() - start)
    write_json(folder / "summary.json", design_summary(result, results, seconds, notes))


def _copy_inputs(folder: Path, inputs: InputFiles) -> None:
    place = folder / INPUT_COPY
    place.mkdir()
    for name, content in inputs.files.items():
        (place / name).write_bytes(content)


def _claimed(claim: Claim | None, target: str | Path, inputs: InputFiles) -> AbstractContextManager[Claim]:
    return claim_target(target, inputs.path) if claim is None else nullcontext(claim)
