"""Textbook rivals of fixed-charge design: arc flows with and without strong rows, in SCIP and in HiGHS.

Each model is handed over as it stands, default settings, one thread, gap 0, a wall limit.
"""

from __future__ import annotations

import time
from pathlib import Path

import numpy as np
from scipy import sparse

from hubdesign.inputs import read_case
from hubdesign.network import build_network
from hubdesign.solve.fixed_charge.adapter import to_instance
from hubdesign.solve.fixed_charge.instance import FixedChargeInstance
from hubdesign.solve.highs import new_highs


class ArcModel:
    """Shares x_ka, openings y_e; conservation, capacity, x_ka <= min(1, capacity / volume) y_e if strong."""

    def __init__(self, inst: FixedChargeInstance, strong: bool) -> None:
        k_count, a_count, n = inst.commodities, inst.arcs, inst.nodes
        flows = k_count * a_count
        k, a = np.repeat(np.arange(k_count), a_count), np.tile(np.arange(a_count), k_count)
        column = np.arange(flows)
        capacity = np.minimum(inst.capacity, inst.volume.sum())
        self.cost = np.concatenate((inst.volume[k] * inst.unit_cost[a], inst.fixed_cost))
        self.whole = np.concatenate((np.zeros(flows, dtype=bool), np.ones(inst.links, dtype=bool)))
        blocks = [
            (k * n + inst.tail[a], column, np.ones(flows)),
            (k * n + inst.head[a], column, -np.ones(flows)),
            (k_count * n + a, column, inst.volume[k]),
            (k_count * n + np.arange(a_count), flows + inst.link, -capacity),
        ]
        rows = k_count * n + a_count
        if strong:
            blocks.append((rows + column, column, np.ones(flows)))
            part = -np.minimum(1.0, capacity[a] / inst.volume[k])
            blocks.append((rows + column, flows + inst.link[a], part))
            rows += flows
        where_row, where_column, value = (np.concatenate(part) for part in zip(*blocks))
        self.matrix = sparse.csr_array((value, (where_row, where_column)), shape=(rows, len(self.cost)))
        self.lower, self.upper = np.full(rows, -np.inf), np.zeros(rows)
        self.lower[: k_count * n] = 0.0
        for sign, node in ((1.0, inst.origin), (-1.0, inst.destination)):
            place = np.arange(k_count) * n + node
            self.lower[place] = self.upper[place] = sign


def solve_with_highs(model: ArcModel, limit_s: float) -> tuple[str, float, float]:
    """Return status, objective and bound of HiGHS."""
    import highspy

    highs = new_highs()
    lp = highspy.HighsLp()
    lp.num_row_, lp.num_col_ = model.matrix.shape
    lp.col_cost_ = model.cost
    lp.col_lower_, lp.col_upper_ = np.zeros(len(model.cost)), np.ones(len(model.cost))
    lp.row_lower_, lp.row_upper_ = model.lower, model.upper
    lp.a_matrix_.format_ = highspy.MatrixFormat.kRowwise
    lp.a_matrix_.start_, lp.a_matrix_.index_ = model.matrix.indptr, model.matrix.indices
    lp.a_matrix_.value_ = model.matrix.data
    kinds = highspy.HighsVarType
    lp.integrality_ = [kinds.kInteger if whole else kinds.kContinuous for whole in model.whole]
    highs.passModel(lp)
    highs.setOptionValue("time_limit", limit_s)
    highs.setOptionValue("mip_rel_gap", 0.0)
    highs.run()
    info = highs.getInfo()
    done = highs.getModelStatus() == highspy.HighsModelStatus.kOptimal
    return ("proven" if done else "limit"), float(info.objective_function_value), float(info.mip_dual_bound)


def solve_with_scip(model: ArcModel, limit_s: float) -> tuple[str, float, float]:
    """Return status, objective and bound of SCIP."""
    import pyscipopt
    from pyscipopt.scip import Expr, ExprCons, Term

    scip = pyscipopt.Model()
    scip.hideOutput()
    variables = [
        scip.addVar(f"v{j}", vtype="B" if whole else "C", lb=0.0, ub=1.0, obj=cost)
        for j, (cost, whole) in enumerate(zip(model.cost.tolist(), model.whole.tolist()))
    ]
    terms = [Term(variable) for variable in variables]
    starts, columns, values = (
        part.tolist() for part in (model.matrix.indptr, model.matrix.indices, model.matrix.data)
    )
    for row, (low, high) in enumerate(zip(model.lower.tolist(), model.upper.tolist())):
        entries = {terms[columns[p]]: values[p] for p in range(starts[row], starts[row + 1])}
        scip.addCons(ExprCons(Expr(entries), None if low == -np.inf else low, high))
    scip.setParam("limits/time", limit_s)
    scip.optimizeNogil()
    status = "proven" if scip.getStatus() == "optimal" else "limit"
    value = scip.getPrimalbound()
    return status, float(value), float(scip.getDualbound())


def rival_lines(folder: Path, limit_s: float) -> list[tuple[str, str, float, float, float]]:
    """Return (name, status, objective, bound, CPU s) of each rival on an input folder."""
    inst = to_instance(build_network(read_case(folder)))
    lines = []
    for strong in (False, True):
        for name, solver in (("SCIP", solve_with_scip), ("HiGHS", solve_with_highs)):
            start = time.process_time()
            status, value, bound = solver(ArcModel(inst, strong), limit_s)
            cpu = time.process_time() - start
            lines.append((f"{name} {'strong' if strong else 'weak'}", status, value, bound, cpu))
    return lines
