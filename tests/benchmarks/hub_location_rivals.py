"""Textbook models of hub location, handed as they stand to HiGHS and to SCIP with default settings.

Multiple allocation: the four-index itinerary model with all strong rows (Skorin-Kapov, Skorin-Kapov and
O'Kelly 1996, EJOR 94:582-593). Single allocation, with capacities where there are any: the three-index flow
model (Ernst and Krishnamoorthy 1996, Location Science 4:139-154; 1999, Annals of OR 86:141-159).
"""

from __future__ import annotations

import tempfile
import time
from pathlib import Path
from typing import Any

import highspy
import numpy as np
import scipy.sparse as sp
from pyscipopt import Model

from hubdesign.inputs import read_case
from hubdesign.network import build_network
from hubdesign.solve.highs import new_highs
from hubdesign.solve.hub_location.adapter import to_instance
from hubdesign.solve.hub_location.instance import Floats, HubInstance
from tests.benchmarks.convert import convert_ap, convert_cab


class Rows:
    """A mixed-integer program put together row by row."""

    def __init__(self) -> None:
        self.cost: list[float] = []
        self.integer: list[bool] = []
        self.low: list[float] = []
        self.high: list[float] = []
        self._entries: list[tuple[int, np.ndarray, np.ndarray]] = []

    def columns(self, cost: Floats, *, integer: bool) -> np.ndarray:
        """Add columns in [0, 1] (integer) or [0, inf) and return their indices."""
        first = len(self.cost)
        self.cost += cost.tolist()
        self.integer += [integer] * len(cost)
        return np.arange(first, len(self.cost))

    def row(self, index: np.ndarray, value: np.ndarray, low: float, high: float) -> None:
        """Add a row."""
        self._entries.append((len(self.low), index, value))
        self.low.append(low)
        self.high.append(high)

    def lp(self) -> Any:
        """Return the program as HiGHS takes it."""
        row = np.concatenate([np.full(len(index), number) for number, index, _ in self._entries])
        matrix = sp.csr_matrix(
            (
                np.concatenate([value for _, _, value in self._entries]),
                (row, np.concatenate([index for _, index, _ in self._entries])),
            ),
            shape=(len(self.low), len(self.cost)),
        )
        lp = highspy.HighsLp()
        lp.num_col_, lp.num_row_ = len(self.cost), len(self.low)
        lp.col_cost_ = np.array(self.cost)
        lp.col_lower_ = np.zeros(len(self.cost))
        lp.col_upper_ = np.where(self.integer, 1.0, np.inf)
        lp.row_lower_, lp.row_upper_ = np.array(self.low), np.array(self.high)
        lp.a_matrix_.format_ = highspy.MatrixFormat.kRowwise
        lp.a_matrix_.start_ = matrix.indptr
        lp.a_matrix_.index_ = matrix.indices
        lp.a_matrix_.value_ = matrix.data
        lp.integrality_ = [
            highspy.HighsVarType.kInteger if integer else highspy.HighsVarType.kContinuous
            for integer in self.integer
        ]
        return lp


def four_index(instance: HubInstance) -> Rows:
    """Return the itinerary model with all strong rows."""
    n = instance.station_count
    rows = Rows()
    z = rows.columns(instance.fixed_cost, integer=True)
    rows.row(z, np.ones(n), instance.hubs_min, instance.hubs_max)
    for i in range(n):
        for j in range(n):
            if instance.volume[i, j] == 0.0:
                continue
            unit = instance.collect[i][:, None] + instance.transfer + instance.distribute[:, j]
            x = rows.columns((instance.volume[i, j] * unit).ravel(), integer=False).reshape(n, n)
            rows.row(x.ravel(), np.ones(n * n), 1.0, 1.0)
            for k in range(n):
                for used in (x[k], x[:, k]):
                    rows.row(np.append(used, z[k]), np.append(np.ones(n), -1.0), -np.inf, 0.0)
    return rows


def three_index(instance: HubInstance) -> Rows:
    """Return the flow model of single allocation."""
    n = instance.station_count
    volume = instance.volume
    sent, received = volume.sum(axis=1), volume.sum(axis=0)
    rows = Rows()
    ends = sent[:, None] * instance.collect + received[:, None] * instance.distribute.T
    x = rows.columns((ends + np.diag(instance.fixed_cost)).ravel(), integer=True).reshape(n, n)
    rows.row(np.diag(x), np.ones(n), instance.hubs_min, instance.hubs_max)
    for i in range(n):
        rows.row(x[i], np.ones(n), 1.0, 1.0)
        flow = rows.columns(instance.transfer.ravel(), integer=False).reshape(n, n)
        for k in range(n):
            if k != i:
                rows.row(np.array([x[i, k], x[k, k]]), np.array([1.0, -1.0]), -np.inf, 0.0)
            others = np.arange(n) != k
            index = np.concatenate((flow[k, others], flow[others, k], x[:, k]))
            weight = volume[i].copy()
            weight[i] -= sent[i]
            rows.row(index, np.concatenate((np.ones(n - 1), -np.ones(n - 1), weight)), 0.0, 0.0)
    for k in np.flatnonzero(np.isfinite(instance.collection_capacity)):
        load = sent.copy()
        load[k] -= instance.collection_capacity[k]
        rows.row(x[:, k], load, -np.inf, 0.0)
    return rows


def run_highs(rows: Rows, limit_s: float) -> tuple[float, float, float]:
    """Return (CPU seconds, best value, bound) of HiGHS."""
    solver = new_highs()
    solver.setOptionValue("time_limit", limit_s)
    solver.setOptionValue("mip_rel_gap", 0.0)
    solver.passModel(rows.lp())
    begin = time.process_time()
    solver.run()
    info = solver.getInfo()
    return time.process_time() - begin, info.objective_function_value, info.mip_dual_bound


def run_scip(rows: Rows, limit_s: float) -> tuple[float, float, float]:
    """Return (CPU seconds, best value, bound) of SCIP."""
    writer = new_highs()
    writer.passModel(rows.lp())
    with tempfile.TemporaryDirectory() as folder:
        path = str(Path(folder) / "model.mps")
        writer.writeModel(path)
        model = Model()
        model.hideOutput()
        model.readProblem(path)
    model.setParam("limits/time", limit_s)
    begin = time.process_time()
    model.optimizeNogil()
    taken = time.process_time() - begin
    best = model.getObjVal() if model.getNSols() else float("inf")
    return taken, best, model.getDualbound()


def rival_table(bench: Path, limit_s: float) -> str:
    """Return the table of the textbook models on one instance a row."""
    lines = [
        "| instance | model | HiGHS s | value / bound | SCIP s | value / bound |",
        "|---|---|---|---|---|---|",
    ]
    with tempfile.TemporaryDirectory() as folder:
        out = Path(folder)
        cab, ap = bench / "cab" / "CAB25.txt", bench / "ap"
        single = {"allocation": "single"}
        cases = [
            ("CAB25 p=3 alpha=0.6 multiple", convert_cab(cab, out / "a", 25, p=3, alpha=0.6)),
            ("AP25 p=3 multiple", convert_ap(ap / "25.3", out / "b", p=3)),
            ("CAB25 p=3 alpha=0.6 single", convert_cab(cab, out / "c", 25, p=3, alpha=0.6, **single)),  # type: ignore[arg-type]
            ("AP25 p=3 single", convert_ap(ap / "25.3", out / "d", p=3, **single)),  # type: ignore[arg-type]
            (
                "AP20 TT capacitated single",
                convert_ap(
                    ap / "20.3",
                    out / "e",
                    hub_costs=ap / "FcostT.20",
                    capacities=ap / "CapT.20",
                    allocation="single",
                ),
            ),
        ]
        for name, case in cases:
            instance = to_instance(build_network(read_case(case)))
            multiple = name.endswith("multiple")
            rows = four_index(instance) if multiple else three_index(instance)
            cells = [f"| {name} | {'four-index' if multiple else 'three-index'} "]
            for run in (run_highs, run_scip):
                taken, best, bound = run(rows, limit_s)
                cells.append(f"| {taken:.1f} | {best:.2f} / {bound:.2f} ")
            lines.append("".join(cells) + "|")
            print(lines[-1], flush=True)
    return "\n".join(lines) + "\n"
