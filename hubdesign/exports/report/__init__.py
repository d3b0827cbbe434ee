"""report.html: one page, offline, with the answer, maps, charts and tables of a result."""

from __future__ import annotations

import webbrowser
from collections.abc import Mapping, Sequence
from pathlib import Path

from hubdesign.comparison import Comparison
from hubdesign.errors import OutputError
from hubdesign.results import Results, Table
from hubdesign.run import Result

PAGE = "report.html"


def render_design_report(
    result: Result, results: Results, inputs: Mapping[str, bytes], notes: Sequence[str] = ()
) -> str:
    """Return report.html of a design: self-contained HTML, to be written as UTF-8.

    Parameters
    ----------
    result, results
        A verified design and its tables; the page shows the figures of these tables and no other.
    inputs
        File name -> bytes of the inputs, for their hashes.
    notes
        What a planner must know besides the result's own warnings.
    """
    from hubdesign.exports.report.pages import design_page

    return design_page(result, results, inputs, notes)


def render_comparison_report(
    comparison: Comparison, table: Table, results: Mapping[str, Results], inputs: Mapping[str, bytes]
) -> str:
    """Return report.html of a comparison.

    Parameters
    ----------
    comparison, table
        All entries, and the table of comparison.csv.
    results
        Structure -> tables of its design; structures without a design are missing.
    inputs
        File name -> bytes of the inputs, for their hashes.
    """
    from hubdesign.exports.report.structures import comparison_page

    return comparison_page(comparison, table, dict(results), inputs)


def page_of(folder: str | Path) -> Path:
    """Return the page of a result folder, absolute.

    Raises
    ------
    OutputError
        Where there is none.
    """
    page = Path(folder).resolve() / PAGE
    if not page.is_file():
        raise OutputError(f"{folder}: holds no {PAGE}; is it a result of hubdesign design or compare?")
    return page


def open_page(page: Path) -> bool:
    """Open `page` in a browser; False where there is none to open it in."""
    try:
        return webbrowser.open(page.as_uri())
    except webbrowser.Error:
        return False
