"""Measure fixed-charge design: python -m tests.benchmarks.fixed_charge [--names ...] [--rivals] [--out FILE].

Proof rows: one thread, gap 0, CPU seconds of the solve, the median of three. Budget rows: two threads, wall
limit, gap 0. Every instance is written as an input folder and solved through the library's front door.
`--rivals` runs the textbook models on the proof rows in the same run. Writes a markdown table.
"""

from __future__ import annotations

import argparse
import csv
import platform
import statistics
import tempfile
from importlib.metadata import version
from pathlib import Path

from hubdesign.inputs import read_case
from hubdesign.run import design
from tests.benchmarks.convert import bench_folder, convert_canad
from tests.benchmarks.fixed_charge_rivals import rival_lines

#: Rows whose answer is a gap within the budget; all others are to be proven.
BUDGET = ("c37", "c38", "c50", "c57")

#: Up to this CPU time a case is solved three times and the median taken, s.
REPEAT_BELOW_S = 60.0


def published(bench: Path) -> dict[str, float]:
    """Return the published value of each canad file that is here."""
    with (bench / "values.csv").open(newline="") as stream:
        rows = [row for row in csv.DictReader(stream) if row["family"] == "CANAD"]
    values = {row["instance"]: float(row["value"]) for row in rows}
    return {name: values[name] for name in sorted(values) if (bench / "canad" / f"{name}.dow").is_file()}


def prove(folder: Path) -> tuple[str, float, float, float, float]:
    """Return status, objective, bound, median CPU s and wall s on one thread."""
    problem = read_case(folder)
    results = [design(problem)]
    while results[0].cpu_s < REPEAT_BELOW_S and len(results) < 3:
        results.append(design(problem))
    first = results[0].design
    cpu = statistics.median(result.cpu_s for result in results)
    wall = first.progress[-1].seconds if first.progress else 0.0
    return first.status.value, first.objective or 0.0, first.bound or 0.0, cpu, wall


def budget(folder: Path, limit_s: float) -> tuple[str, float, float, float, float]:
    """Return status, objective, bound, CPU s and wall s on two threads within the limit."""
    problem = read_case(folder).with_settings(threads=2, time_limit_s=limit_s, gap=0.0)
    result = design(problem)
    answer = result.design
    wall = answer.progress[-1].seconds if answer.progress else 0.0
    return answer.status.value, answer.objective or 0.0, answer.bound or 0.0, result.cpu_s, wall


def line(name: str, way: str, best: float, got: tuple[str, float, float, float, float]) -> str:
    """Return a row of the table."""
    status, value, bound, cpu, wall = got
    gap = 100.0 * (value - bound) / abs(value) if value else float("nan")
    above = 100.0 * (value / best - 1.0)
    return f"| {name} | {way} | {status} | {value:.1f} | {above:.3f} | {gap:.3f} | {cpu:.2f} | {wall:.1f} |"


def main() -> None:
    """Run the benchmark."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--names", nargs="*", default=[], help="only these instances")
    parser.add_argument("--rivals", action="store_true", help="the textbook models too, on the proof rows")
    parser.add_argument("--rival-limit", type=float, default=120.0, help="wall time of a rival, s")
    parser.add_argument("--budget", type=float, default=300.0, help="wall time of a budget row, s")
    parser.add_argument("--out", type=Path, default=None, help="also write the table here")
    options = parser.parse_args()
    bench = bench_folder()
    if bench is None:
        raise SystemExit("the published instances are not here: set HUBDESIGN_BENCH")
    lines = [
        f"machine: {platform.processor() or platform.machine()}, {platform.system()} {platform.release()}; "
        f"Python {platform.python_version()}, numpy {version('numpy')}, highspy {version('highspy')}, "
        f"pyscipopt {version('pyscipopt')}; seed 1",
        "",
        "| instance | way | status | objective | % above best known | gap % | CPU s | wall s to the end |",
        "|---|---|---|---|---|---|---|---|",
    ]
    print("\n".join(lines), flush=True)
    with tempfile.TemporaryDirectory() as folder:
        for name, best in published(bench).items():
            if options.names and name not in options.names:
                continue
            case = convert_canad(bench / "canad" / f"{name}.dow", Path(folder) / name)
            hard = name in BUDGET
            got = budget(case, options.budget) if hard else prove(case)
            new = [line(name, "engine, 2 threads" if hard else "engine", best, got)]
            if options.rivals and not hard:
                for way, status, value, bound, cpu in rival_lines(case, options.rival_limit):
                    new.append(line(name, way, best, (status, value, bound, cpu, float("nan"))))
            print("\n".join(new), flush=True)
            lines += new
    if options.out is not None:
        options.out.write_text("\n".join(lines) + "\n")


if __name__ == "__main__":
    main()
