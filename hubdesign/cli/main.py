"""The commands."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from hubdesign import __version__, errors
from hubdesign.cli.guard import run_interruptibly, told_in_words

if TYPE_CHECKING:
    from hubdesign.solve.control import Control

_CONTEXT = {"help_option_names": ["-h", "--help"], "max_content_width": 100}

_INPUTS = click.argument("inputs", type=click.Path(path_type=Path))
_OUTPUTS = click.argument("outputs", type=click.Path(path_type=Path))
_TARGET = click.option(
    "-o",
    "--output",
    "target",
    type=click.Path(path_type=Path),
    required=True,
    help="Folder to write the result to.",
)
_JSON = click.option(
    "--json", "as_json", is_flag=True, help="Result (or status and reasons) as JSON on stdout."
)


@click.group(context_settings=_CONTEXT)
@click.version_option(__version__, prog_name="hubdesign")
def main() -> None:
    """Decide which links a carrier operates and which stations act as hubs, with a proven bound.

    Start with `hubdesign new FOLDER`, edit the tables, then `check`, `design` and `compare`.

    \b
    Exit codes: 0 proven within the gap asked; 1 bad input (or a target that cannot be written);
    2 usage; 3 infeasible; 4 limit reached with a design; 5 limit reached without one;
    70 a fault of hubdesign itself. 1, 2, 3, 5 and 70 write nothing.
    """


@main.command()
@click.argument("folder", type=click.Path(path_type=Path))
@click.option("--blank", is_flag=True, help="Empty templates with headers only.")
@click.option("--workbook", is_flag=True, help="One workbook (.xlsx) instead of a folder of tables.")
def new(folder: Path, blank: bool, workbook: bool) -> None:
    """Write a working, documented case to start from.

    \b
    Example:
      hubdesign new my-network
      hubdesign new my-network.xlsx --workbook
    """
    with told_in_words(False):
        from hubdesign.inputs import new_case

        written = new_case(folder, blank=blank, workbook=workbook)
        click.echo("\n".join(f"wrote {path}" for path in written))
        if not blank:
            click.echo(f"next: hubdesign design {written[0] if workbook else folder} -o RESULT")


@main.command()
@_INPUTS
@_JSON
def check(inputs: Path, as_json: bool) -> None:
    """List every fault of the inputs at once, and what looks suspicious; solves nothing.

    \b
    Example:
      hubdesign check inputs/islands
    """
    with told_in_words(as_json):
        from hubdesign.cli.tables import check_json, check_text
        from hubdesign.inputs import check as check_inputs

        report = check_inputs(inputs)
        if as_json:
            click.echo(check_json(report))
        else:
            click.echo(check_text(report), err=bool(report.faults))
        if report.faults:
            sys.exit(errors.EXIT_BAD_INPUT)


@main.command()
@_INPUTS
@_TARGET
@_JSON
def design(inputs: Path, target: Path, as_json: bool) -> None:
    """Design one network and write it to a folder.

    Progress goes to stderr, the result to stdout. Ctrl-C keeps the best plan so far.

    \b
    Example:
      hubdesign design inputs/islands -o outputs/islands
    """
    with told_in_words(as_json):
        from hubdesign import run
        from hubdesign.cli.progress import Display
        from hubdesign.cli.tables import design_json, print_design
        from hubdesign.exports.write import claim_target, read_inputs, write_design
        from hubdesign.results import objective_unit

        with claim_target(target, inputs) as claim:
            problem, read_s = _read(inputs)
            copied = read_inputs(inputs)
            display = Display(objective_unit(problem.settings))
            control = run.make_control(problem.settings, lambda p: display.hear("", p), display.say)
            with display.shown():
                result = run_interruptibly(
                    lambda: run.design(problem, control=control), control.cancel, display.say
                )
            written = write_design(result, target, copied, read_s, claim=claim)
        for warning in result.warnings:
            click.echo(f"warning: {warning}", err=True)
        if as_json:
            click.echo(design_json(result, target))
        else:
            print_design(result, target, written)
        sys.exit(_exit_code(result))


@main.command()
@_INPUTS
@_TARGET
@_JSON
def compare(inputs: Path, target: Path, as_json: bool) -> None:
    """Set point-to-point, hub-and-spoke, mixed and today's network side by side on the same inputs.

    \b
    Example:
      hubdesign compare inputs/islands -o outputs/islands-compared
    """
    with told_in_words(as_json):
        from hubdesign import comparison
        from hubdesign.cli.progress import Display
        from hubdesign.cli.tables import comparison_json, print_comparison
        from hubdesign.exports.write import claim_target, read_inputs, write_comparison
        from hubdesign.results import objective_unit

        controls: list[Control] = []
        stopped: list[bool] = []

        def register(control: Control) -> None:
            controls.append(control)
            if stopped:
                control.cancel()

        def cancel() -> None:
            stopped.append(True)
            for control in controls:
                control.cancel()

        with claim_target(target, inputs) as claim:
            problem, read_s = _read(inputs)
            copied = read_inputs(inputs)
            display = Display(objective_unit(problem.settings))
            with display.shown():
                outcome = run_interruptibly(
                    lambda: comparison.compare(problem, listener=display.hear, on_control=register),
                    cancel,
                    display.say,
                )
            if not outcome.any_design:
                raise comparison.nothing_feasible(outcome)
            write_comparison(outcome, target, copied, read_s, claim=claim)
        click.echo(comparison_json(outcome, target)) if as_json else print_comparison(outcome, target)
        sys.exit(errors.EXIT_PROVEN if outcome.all_proven else errors.EXIT_LIMIT_WITH_DESIGN)


@main.command()
@_OUTPUTS
@_JSON
def verify(outputs: Path, as_json: bool) -> None:
    """Recompute every cost and rule of a written result from its files alone, without a solver.

    The bound itself is not rechecked: that would take the solve again.

    \b
    Example:
      hubdesign verify outputs/islands
    """
    with told_in_words(as_json):
        from hubdesign.cli.tables import verification_json, verification_text
        from hubdesign.verify_files import verify_folder

        report = verify_folder(outputs)
        click.echo(verification_json(report) if as_json else verification_text(report))
        if report.breaches:
            sys.exit(errors.EXIT_BAD_INPUT)


@main.command()
@_OUTPUTS
def view(outputs: Path) -> None:
    """Open the page of a result; print its path where there is no browser.

    \b
    Example:
      hubdesign view outputs/islands
    """
    with told_in_words(False):
        from hubdesign.exports.report import open_page, page_of

        page = page_of(outputs)
        opened = open_page(page)
        click.echo(f"opened {page}" if opened else f"{page} (no browser here to open it in)")


@main.command()
@_OUTPUTS
@click.option(
    "--to",
    "to",
    required=True,
    type=click.Choice(["gpkg", "fgb", "kml", "shp", "geojson"]),
    help="GeoPackage (styled), FlatGeobuf, KML, Shapefile or GeoJSON.",
)
@click.option(
    "-o",
    "--output",
    "target",
    type=click.Path(path_type=Path),
    help="Folder to write to; OUTPUTS-<format> without it.",
)
def export(outputs: Path, to: str, target: Path | None) -> None:
    """Hand the maps of a result to GIS software.

    \b
    Example:
      hubdesign export outputs/islands --to gpkg
    """
    with told_in_words(False):
        from hubdesign.exports.gis import export_gis

        place = outputs.with_name(f"{outputs.resolve().name}-{to}") if target is None else target
        for name in export_gis(outputs, to, place):
            click.echo(f"wrote {place / name}")


def _read(inputs: Path) -> tuple[Any, float]:
    """Return the problem and the seconds it took to read; warnings go to stderr."""
    import time

    from hubdesign.inputs import check as check_inputs
    from hubdesign.inputs import listed_warnings

    start = time.perf_counter()
    report = check_inputs(inputs)
    if report.faults:
        raise errors.InputError(report.faults)
    for line in listed_warnings(report.warnings):
        click.echo(f"warning: {line}", err=True)
    return report.problem, time.perf_counter() - start


def _exit_code(result: Any) -> int:
    from hubdesign.answer import Status

    return errors.EXIT_PROVEN if result.design.status is Status.PROVEN else errors.EXIT_LIMIT_WITH_DESIGN
