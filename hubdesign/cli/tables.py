"""What commands print: result tables that fit 80 columns, and the same as JSON."""

from __future__ import annotations

import json
from pathlib import Path
from typing import TYPE_CHECKING, Any

from hubdesign.cli.words import amount, percent

if TYPE_CHECKING:
    from hubdesign.comparison import Comparison, Entry
    from hubdesign.inputs import CheckReport
    from hubdesign.results import Results
    from hubdesign.run import Result
    from hubdesign.verify_files import FolderReport

#: Everything fits a plain terminal.
WIDTH = 80

CAUTION = (
    "A planning estimate, not an operational approval: range, block time, slots, traffic rights and crew duty"
    " are for the operator's licensed staff and local rules to settle."
)

_LARGEST = 10


def print_design(result: Result, target: Path, written: tuple[str, ...]) -> None:
    """Print a design: the answer in a sentence, the figures, the links that carry most."""
    from hubdesign.results import build_results

    results = build_results(result.network, result.design, result.bill)
    console = _console()
    settings = result.problem.settings
    console.print(_plain(settings.title or "Design"), style="bold")
    console.print(_plain(answer_sentence(result)))
    console.print(_plain(f"{result.design.method}; {result.solve_s:.1f} s."))
    console.print()
    console.print(_figures_table(result, results))
    console.print(_links_table(result, results))
    console.print(
        _plain(f"Written to {target}: {len(written)} files, summary.json and links.geojson among them.")
    )
    console.print(_plain(CAUTION), style="dim")


def answer_sentence(result: Result) -> str:
    """Return what is designed and how far it is proven, as one sentence."""
    settings, design, bill = result.problem.settings, result.design, result.bill
    hubs = [result.problem.stations[hub].station for hub in design.hubs]
    where = f"{_counted(len(hubs), 'hub')} ({', '.join(hubs)})" if hubs else "no hub"
    money = f"{settings.currency} per {settings.period}"
    volume = f"{amount(bill.volume_carried)} {settings.volume_unit}"
    earns = {
        "least-cost": f"costs {amount(bill.total_cost)} {money}",
        "most-profit": f"earns {amount(bill.profit)} {money}",
        "most-volume": f"carries {volume} per {settings.period} for {amount(bill.total_cost)} {money}",
    }[settings.goal]
    links = _counted(len(design.links), "link")
    return f"{settings.structure}: {links}, {where}; {earns}, {proof_words(result)}."


def proof_words(result: Result) -> str:
    """Return how far the answer is proven, in words."""
    design, settings = result.design, result.problem.settings
    if result.gap is None:
        return "with no gap to tell (the objective is 0)"
    if result.gap == 0.0:
        return "proven: no plan is better"
    within = f"within {percent(result.gap)}"
    return (
        f"proven {within}"
        if design.status.value == "proven"
        else (f"proven {within} only (asked: {percent(settings.gap)})")
    )


def _counted(number: int, word: str) -> str:
    return f"{number} {word}{'' if number == 1 else 's'}"


def figure_rows(results: Results, settings: Any) -> list[tuple[str, Any, str]]:
    """Return (what, figure, unit) of what people look at first; figures that are blank are left out."""
    totals, costs = results.totals, results.costs
    money, period = f"{settings.currency} per {settings.period}", f"per {settings.period}"
    share = {"load_factor", "nonstop_share"}
    rows: list[tuple[str, Any, str]] = [
        ("objective", results.answer["objective"], results.answer["objective_unit"]),
        ("bound", results.answer["bound"], results.answer["objective_unit"]),
        ("total cost", costs["total"], money),
    ]
    if costs["revenue"]:
        rows += [("revenue", costs["revenue"], money), ("profit", costs["profit"], money)]
    if results.investment["total"]:
        rows.append(("investment", results.investment["total"], f"{settings.currency} once"))
    for name, unit in (
        ("links", ""),
        ("hubs", ""),
        ("volume_carried", f"{settings.volume_unit} {period}"),
        ("volume_unserved", f"{settings.volume_unit} {period}"),
        ("departures", period),
        ("block_hours", f"h {period}"),
        ("vehicles", ""),
        ("load_factor", ""),
        ("stage_length_km", "km"),
        ("nonstop_share", ""),
        ("circuity", ""),
        ("co2_tonnes", f"t {period}"),
    ):
        value = totals[name]
        if value is not None:
            label = name.removesuffix("_km").removesuffix("_tonnes").replace("_", " ").replace("co2", "CO2")
            rows.append((label, percent(value) if name in share else value, unit))
    return rows


def _figures_table(result: Result, results: Results) -> Any:
    table = _table("figure", "value", "unit", title=None)
    for what, value, unit in figure_rows(results, result.problem.settings):
        table.add_row(what, _cell(value), _plain(unit))
    return table


def _links_table(result: Result, results: Results) -> Any:
    """Return the links that carry most, both directions together."""
    links: list[dict[str, Any]] = results.links.records()
    fleet = result.problem.has_fleet
    order = sorted(links, key=lambda row: -_both_ways(row))
    heads = ["from", "to", "mode", "km", "volume", *(["departures", "load"] if fleet else [])]
    table = _table(*heads, title=f"Links that carry most ({min(_LARGEST, len(order))} of {len(order)})")
    for row in order[:_LARGEST]:
        cells = [row["from"], row["to"], row["mode"], row["distance_km"], _both_ways(row)]
        if fleet:
            cells += [row["frequency"], percent(row["load_factor_out"])]
        table.add_row(*(_cell(cell) for cell in cells))
    return table


def _both_ways(row: dict[str, Any]) -> float:
    return float(row["volume_out"] or 0.0) + float(row["volume_back"] or 0.0)


def print_comparison(comparison: Comparison, target: Path) -> None:
    """Print structures side by side, then what the differences prove."""
    from hubdesign.results import build_results

    console = _console()
    settings = comparison.problem.settings
    console.print(_plain(settings.title or "Comparison"), style="bold")
    console.print(_plain(f"Goal: {settings.goal}; at most {_transfers(settings)} in every structure."))
    table = _table("figure", *(entry.structure for entry in comparison.entries), title=None)
    built: dict[str, Results] = {
        entry.structure: build_results(entry.result.network, entry.result.design, entry.result.bill)
        for entry in comparison.entries
        if entry.result is not None
    }
    table.add_row("status", *(_plain(entry.status.value) for entry in comparison.entries))
    table.add_row("gap", *(_gap(entry) for entry in comparison.entries))
    for name, values in comparison_rows(comparison, built):
        table.add_row(name, *(_cell(value) for value in values))
    console.print(table)
    for entry in comparison.entries:
        if entry.note:
            console.print(_plain(f"{entry.structure}: {entry.note}"))
    for line in difference_lines(comparison):
        console.print(_plain(line))
    console.print(
        _plain(f"Written to {target}: a folder for each structure, comparison.csv, comparison.json.")
    )
    console.print(_plain(CAUTION), style="dim")


def _transfers(settings: Any) -> str:
    number = settings.transfers_at_most
    return "any number of transfers" if number < 0 else _counted(number, "transfer")


def _gap(entry: Entry) -> Any:
    if entry.result is None or not entry.comparable:
        return _plain("-")
    return _plain(percent(entry.result.gap))


def comparison_rows(comparison: Comparison, built: dict[str, Results]) -> list[tuple[str, list[Any]]]:
    """Return (figure, value per entry); figures that no entry has are left out."""
    rows: list[tuple[str, list[Any]]] = []
    entries = [built.get(entry.structure) for entry in comparison.entries]
    for label, part, name in (
        ("total cost", "costs", "total"),
        ("revenue", "costs", "revenue"),
        ("profit", "costs", "profit"),
        ("operating", "costs", "operating"),
        ("volume cost", "costs", "volume"),
        ("hubs cost", "costs", "hub_fixed"),
        ("links cost", "costs", "link_fixed"),
        ("vehicles cost", "costs", "vehicle"),
        ("fees", "costs", "departure_fees"),
        ("investment", "investment", "total"),
        ("links", "totals", "links"),
        ("hubs", "totals", "hubs"),
        ("carried", "totals", "volume_carried"),
        ("unserved", "totals", "volume_unserved"),
        ("departures", "totals", "departures"),
        ("block hours", "totals", "block_hours"),
        ("vehicles", "totals", "vehicles"),
        ("load factor", "totals", "load_factor"),
        ("stage km", "totals", "stage_length_km"),
        ("nonstop", "totals", "nonstop_share"),
        ("circuity", "totals", "circuity"),
        ("CO2 t", "totals", "co2_tonnes"),
    ):
        values = [None if results is None else getattr(results, part)[name] for results in entries]
        if name == "profit" and not any(results.costs["revenue"] for results in entries if results):
            continue
        if any(values):
            shares = name in ("load_factor", "nonstop_share")
            rows.append((label, [percent(v) if shares and v is not None else v for v in values]))
    return rows


def difference_lines(comparison: Comparison) -> list[str]:
    """Return a sentence for each pair: the proven interval of the difference and what it decides."""
    from hubdesign.results import objective_unit

    settings = comparison.problem.settings
    unit, lines = objective_unit(settings), []
    for row in comparison.differences:
        better = row.better(comparison.maximise)
        verdict = f"{better} is better" if better else "not decided at this gap"
        span = f"between {amount(row.low)} and {amount(row.high)} {unit}"
        lines.append(f"{row.first} less {row.second}: {span}; {verdict}.")
    return lines


def design_json(result: Result, target: Path) -> str:
    """Return summary.json as written."""
    return (target / "summary.json").read_text("utf-8").rstrip()


def comparison_json(comparison: Comparison, target: Path) -> str:
    """Return comparison.json as written."""
    return (target / "comparison.json").read_text("utf-8").rstrip()


def check_text(report: CheckReport) -> str:
    """Return faults and warnings as lines under a heading."""
    from hubdesign.inputs import listed_faults, listed_warnings

    lines = []
    if report.faults:
        lines.append(f"{report.path}: {_counted(len(report.faults), 'fault')}")
        lines += [f"  {line}" for line in listed_faults(report.faults)]
    if report.warnings:
        lines.append(f"{report.path}: {_counted(len(report.warnings), 'warning')}")
        lines += [f"  {line}" for line in listed_warnings(report.warnings)]
    if not report.faults:
        told = ", ".join(f"{amount(count)} {what}" for what, count in report.counts.items() if count)
        lines.append(f"{report.path}: no faults ({told})")
    return "\n".join(lines)


def check_json(report: CheckReport) -> str:
    """Return a check as JSON: status, counts, faults and warnings with their parts."""

    def parts(fault: Any) -> dict[str, str]:
        return {"where": fault.where, "what": fault.what, "cure": fault.cure, "rule": fault.rule}

    return json.dumps(
        {
            "status": "bad input" if report.faults else "ok",
            "counts": report.counts,
            "faults": [parts(fault) for fault in report.faults],
            "warnings": [parts(fault) for fault in report.warnings],
        },
        ensure_ascii=False,
        indent=1,
    )


def verification_text(report: FolderReport) -> str:
    """Return what a recomputation found, in lines."""
    lines = [f"warning: {warning}" for warning in report.warnings]
    if report.breaches:
        lines.append(f"{report.path}: {_counted(len(report.breaches), 'figure')} or rules do not come out")
        lines += [f"  {breach}" for breach in report.breaches]
    else:
        lines.append(
            f"{report.path}: sound; every rule and {report.figures:,} figures recomputed from the files alone"
        )
    lines.append("The bound itself is not rechecked: that would take the solve again.")
    return "\n".join(lines)


def verification_json(report: FolderReport) -> str:
    """Return what a recomputation found, as JSON."""
    return json.dumps(
        {
            "status": "unsound" if report.breaches else "sound",
            "kind": report.kind,
            "figures": report.figures,
            "breaches": report.breaches,
            "warnings": report.warnings,
            "bound_rechecked": False,
        },
        ensure_ascii=False,
        indent=1,
    )


def _console() -> Any:
    """Return a console of at most 80 columns that honours NO_COLOR and stays plain on a pipe."""
    from rich.console import Console

    console = Console(highlight=False, soft_wrap=False)
    console.width = min(console.width, WIDTH) if console.is_terminal else WIDTH
    return console


def _plain(text: str) -> Any:
    """Return text that no markup in a name can touch."""
    from rich.text import Text

    return Text(text)


def _table(*heads: str, title: str | None) -> Any:
    from rich import box
    from rich.table import Table

    table = Table(box=box.SIMPLE_HEAD, title=title, title_justify="left", pad_edge=False, padding=(0, 1))
    for place, head in enumerate(heads):
        right = place > 0 and head not in ("to", "mode", "unit")
        table.add_column(head, justify="right" if right else "left", overflow="fold")
    return table


def _cell(value: Any) -> Any:
    if value is None:
        return "-"
    return _plain(value if isinstance(value, str) else amount(value))
