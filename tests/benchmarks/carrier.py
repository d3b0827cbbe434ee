"""Measure carrier networks: python -m tests.benchmarks.carrier [--cases 20 50 ...] [--rivals] [--out FILE].

Cases are made by the bench folder's carrier.py (HUBDESIGN_BENCH, else ../shared/bench): weekly, low
frequency (scale 0.25) and serving all, each solved in a process of its own. `--rivals` hands the model
without pool rows and cuts (links open by frequency, x <= h summed) to SCIP and HiGHS with their defaults.
`--growth` measures n = 10, 20, 40, 80, 160. Writes a markdown table.
"""

from __future__ import annotations

import argparse
import json
import platform
import resource
import statistics
import subprocess
import sys
import tempfile
import time
from importlib.metadata import version
from pathlib import Path
from typing import Any

from tests.benchmarks.convert import bench_folder

#: Kind of case -> options of the case maker.
KINDS = {"weekly": (), "low": ("--scale", "0.25"), "serve-all": ("--goal", "least-cost")}

#: Wall time a case gets, s, by stations.
LIMIT_S = {20: 60.0, 50: 300.0, 100: 300.0, 200: 900.0}


def make_case(out: Path, n: int, kind: str, seed: int) -> Path:
    """Write a case and return its folder."""
    bench = bench_folder()
    if bench is None:
        raise SystemExit("the bench folder is absent: set HUBDESIGN_BENCH")
    folder = out / f"{kind}-{n}-{seed}"
    command = [sys.executable, str(bench / "carrier.py"), str(folder), "--n", str(n), "--seed", str(seed)]
    subprocess.run([*command, *KINDS[kind]], check=True, capture_output=True)
    return folder


def measure(folder: Path, limit_s: float, threads: int, engine: str) -> dict[str, Any]:
    """Solve a case in a process of its own and return its figures."""
    command = [sys.executable, "-m", "tests.benchmarks.carrier", "--one", str(folder), engine]
    command += ["--limit", str(limit_s), "--threads", str(threads)]
    done = subprocess.run(command, check=False, capture_output=True, text=True)
    if done.returncode != 0:
        return {"status": f"failed: {done.stderr.strip().splitlines()[-1:]}"}
    figures: dict[str, Any] = json.loads(done.stdout.splitlines()[-1])
    return figures


def solve_one(folder: Path, engine: str, limit_s: float, threads: int) -> dict[str, Any]:
    """Solve here and return figures: objective, bound, gap, seconds, CPU, memory, first plan."""
    from hubdesign.inputs import read_case
    from hubdesign.network import build_network
    from hubdesign.solve import carrier
    from hubdesign.solve.control import Control

    problem = read_case(folder)
    network = build_network(problem)
    wall, cpu = time.perf_counter(), time.process_time()
    if engine == "ours":
        control = Control(limit_s, 1e-4, threads, maximise=problem.settings.goal != "least-cost")
        design = carrier.solve(problem, network, control)
        objective, bound = design.objective, design.bound
        first = next((line.seconds for line in design.progress if line.best is not None), None)
        status = design.status.value
    else:
        objective, bound, status = textbook(network, engine, limit_s)
        first = None
    gap = None if not objective or bound is None else abs(bound - objective) / abs(objective)
    return {
        "status": status,
        "objective": objective,
        "bound": bound,
        "gap": gap,
        "wall_s": time.perf_counter() - wall,
        "cpu_s": time.process_time() - cpu,
        "first_plan_s": first,
        "peak_mb": resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024.0,
    }


def textbook(network: Any, engine: str, limit_s: float) -> tuple[float | None, float | None, str]:
    """Hand the model without pool rows and cuts to SCIP or HiGHS with their defaults."""
    from hubdesign.model.build import build_model
    from hubdesign.model.objective import build_objective, goal_phases
    from hubdesign.solve.control import Control
    from hubdesign.solve.relaxation import Relaxation
    from hubdesign.solve.scip import ScipModel

    model = build_model(network)
    objective = build_objective(model, goal_phases(model)[0])
    if engine == "scip":
        end = ScipModel(model.program, objective.coefficients).run(Control(limit_s, 1e-4), gap=1e-4)
        value = None if end.values is None else objective.value_of(end.objective)
        return value, objective.value_of(end.bound), end.status.value
    import highspy
    import numpy as np

    lp = Relaxation(model.program, objective.coefficients)
    kinds = [
        highspy.HighsVarType.kInteger if whole else highspy.HighsVarType.kContinuous
        for whole in model.program.integer.tolist()
    ]
    lp.highs.changeColsIntegrality(len(kinds), np.arange(len(kinds), dtype=np.int32), kinds)
    lp.highs.setOptionValue("time_limit", limit_s)
    lp.highs.setOptionValue("mip_rel_gap", 1e-4)
    lp.highs.run()
    info = lp.highs.getInfo()
    found = info.primal_solution_status == 2
    value = objective.value_of(info.objective_function_value) if found else None
    return value, objective.value_of(info.mip_dual_bound), str(lp.highs.getModelStatus())


def row_of(name: str, engine: str, figures: dict[str, Any]) -> str:
    """Return a line of the table."""

    def text(key: str, form: str) -> str:
        value = figures.get(key)
        return "-" if value is None else format(value, form)

    cells = [name, engine, str(figures["status"]), text("objective", ".0f"), text("bound", ".0f")]
    cells += [text("gap", ".3%"), text("wall_s", ".1f"), text("cpu_s", ".1f"), text("first_plan_s", ".1f")]
    return "| " + " | ".join([*cells, text("peak_mb", ".0f")]) + " |"


HEAD = (
    "| case | engine | status | objective | bound | gap | wall s | CPU s | first plan s | peak MB |\n"
    "|---|---|---|---|---|---|---|---|---|---|"
)


def main() -> None:
    """Run what is asked and print the table."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--cases", type=int, nargs="*", default=[20, 50])
    parser.add_argument("--kinds", nargs="*", default=list(KINDS), choices=list(KINDS))
    parser.add_argument("--seeds", type=int, nargs="*", default=[1, 2, 3])
    parser.add_argument("--limit", type=float)
    parser.add_argument("--threads", type=int, default=2)
    parser.add_argument("--rivals", action="store_true")
    parser.add_argument("--growth", action="store_true")
    parser.add_argument("--out", type=Path)
    parser.add_argument("--one", nargs=2, metavar=("FOLDER", "ENGINE"), help=argparse.SUPPRESS)
    given = parser.parse_args()
    if given.one:
        print(json.dumps(solve_one(Path(given.one[0]), given.one[1], given.limit, given.threads)))
        return
    lines = [_machine(), "", HEAD]
    sizes = [10, 20, 40, 80, 160] if given.growth else given.cases
    engines = ["ours", "scip", "highs"] if given.rivals else ["ours"]
    with tempfile.TemporaryDirectory() as folder:
        for n in sizes:
            for kind in ["weekly"] if given.growth else given.kinds:
                limit = given.limit or LIMIT_S.get(n, 120.0)
                for engine in engines:
                    gaps = []
                    for seed in given.seeds:
                        case = make_case(Path(folder), n, kind, seed)
                        figures = measure(case, limit, given.threads, engine)
                        gaps.append(figures.get("gap"))
                        lines.append(row_of(f"{kind} {n}, seed {seed}", engine, figures))
                        print(lines[-1], flush=True)
                    known = [gap for gap in gaps if gap is not None]
                    if len(known) == len(gaps) and known:
                        lines.append(
                            f"| {kind} {n}, median | {engine} | | | | {statistics.median(known):.3%} |"
                            + " |" * 4
                        )
    text = "\n".join(lines) + "\n"
    print(text)
    if given.out:
        given.out.write_text(text)


def _machine() -> str:
    names = ("pyscipopt", "highspy", "numpy", "scipy")
    return f"{platform.platform()}, Python {platform.python_version()}, " + ", ".join(
        f"{name} {version(name)}" for name in names
    )


if __name__ == "__main__":
    main()
