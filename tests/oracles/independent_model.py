"""Another formulation of carrier networks, in another solver: leg flows by position, HiGHS as the MIP solver.

Written from the words of the model: f[k, leg, place] is the share of demand k on a leg as its first, second
or third leg. It knows no itineraries, no roles (factors must be 1) and shares nothing with the package but
the Problem. Every link is two-way and lists its distance.
"""

from __future__ import annotations

import highspy
import numpy as np

from hubdesign.problem import Problem


def best_profit(problem: Problem, time_limit_s: float = 60.0) -> tuple[float, float]:
    """Return (profit of the best plan, proven bound on it)."""
    return _Model(problem).solve(time_limit_s)


class _Model:
    def __init__(self, problem: Problem) -> None:
        self.p, self.s = problem, problem.settings
        self.highs = highspy.Highs()
        self.highs.setOptionValue("output_flag", False)
        self.highs.setOptionValue("mip_rel_gap", 0.0)
        self.stations = [row.station for row in problem.stations]
        self.legs = [
            (e, a, b) for e, r in enumerate(problem.links) for a, b in ((r.from_, r.to), (r.to, r.from_))
        ]
        self.h = {
            row.station: self.column(-row.hub_fixed_cost, 1.0 if row.may_be_hub else 0.0, whole=True)
            for row in problem.stations
        }
        self.y = [self.column(-self.link_cost(e), 1.0, whole=True) for e in range(len(problem.links))]
        self.n: dict[tuple[int, int], int] = {}
        self.m = [self.column(-v.cost_per_vehicle, 50.0, whole=True) for v in problem.vehicles]
        self.add_departures()
        for k in range(len(problem.demands)):
            self.add_demand(k)

    def column(self, gain: float, upper: float, *, whole: bool = False) -> int:
        self.highs.addCol(-gain, 0.0, upper, 0, np.array([], dtype=np.int32), np.array([], dtype=float))
        index = int(self.highs.getNumCol()) - 1
        if whole:
            self.highs.changeColIntegrality(index, highspy.HighsVarType.kInteger)
        return index

    def row(self, low: float, high: float, entries: dict[int, float]) -> None:
        columns = np.array(list(entries), dtype=np.int32)
        self.highs.addRow(low, high, len(columns), columns, np.array(list(entries.values()), dtype=float))

    def km(self, e: int) -> float:
        distance = self.p.links[e].distance_km
        assert distance is not None
        return distance

    def link_cost(self, e: int) -> float:
        return self.s.link_fixed_cost + self.s.link_fixed_cost_per_km * self.km(e)

    def add_departures(self) -> None:
        """Departures cost both ways, work vehicles, need an open link."""
        inf = highspy.kHighsInf
        fee = {row.station: row.departure_fee for row in self.p.stations}
        self.load: dict[tuple[int, str], dict[int, float]] = {}
        for e, link in enumerate(self.p.links):
            total: dict[int, float] = {}
            for v, row in enumerate(self.p.vehicles):
                hours = row.fixed_minutes / 60 + self.km(e) / row.speed_kmh
                trip = row.cost_per_departure + row.cost_per_hour * hours + row.cost_per_km * self.km(e)
                column = self.column(-(2 * trip + fee[link.from_] + fee[link.to]), 30.0, whole=True)
                self.n[e, v] = column
                total[column] = 1.0
            self.row(0.0, inf, {**total, self.y[e]: -1.0})
            self.row(-inf, 0.0, {**total, self.y[e]: -60.0})
            for start in (link.from_, link.to):
                self.load[e, start] = {
                    self.n[e, v]: -self.s.max_load_factor * row.capacity
                    for v, row in enumerate(self.p.vehicles)
                }
        for v, row in enumerate(self.p.vehicles):
            assert row.hours_per_vehicle is not None
            work = {
                self.n[e, v]: 2
                * (row.fixed_minutes / 60 + self.km(e) / row.speed_kmh + row.turn_minutes / 60)
                / row.hours_per_vehicle
                for e in range(len(self.p.links))
            }
            self.row(-inf, 0.0, {**work, self.m[v]: -1.0})

    def add_demand(self, k: int) -> None:
        """Share k out over legs by position; inner stations are open hubs; what arrives earns."""
        inf, demand = highspy.kHighsInf, self.p.demands[k]
        most = self.s.max_transfers or 0
        stop_cost = {row.station: row.transfer_cost for row in self.p.stations}
        assert demand.revenue is not None
        flow: dict[tuple[int, int], int] = {}
        for place in range(most + 1):
            for number, (e, a, b) in enumerate(self.legs):
                if (place == 0) != (a == demand.origin) or b == demand.origin or a == demand.destination:
                    continue
                ends = b == demand.destination
                if place == most and not ends:
                    continue
                unit = self.s.unit_cost_per_km * self.km(e)
                gain = (demand.revenue if ends else -stop_cost[b]) - unit
                column = self.column(gain * demand.volume, 1.0)
                flow[number, place] = column
                self.load[e, a][column] = demand.volume
        starts = {c: 1.0 for (number, place), c in flow.items() if place == 0}
        self.row(-inf, 1.0, starts)
        for station in self.stations:
            if station in (demand.origin, demand.destination):
                continue
            arriving = {c: 1.0 for (number, _), c in flow.items() if self.legs[number][2] == station}
            if arriving:
                self.row(-inf, 0.0, {**arriving, self.h[station]: -1.0})
            for place in range(most + 1):
                entries = {
                    c: 1.0
                    for (number, p), c in flow.items()
                    if p == place and self.legs[number][2] == station
                }
                entries |= {
                    c: -1.0
                    for (number, p), c in flow.items()
                    if p == place + 1 and self.legs[number][1] == station
                }
                if entries:
                    self.row(0.0, 0.0, entries)

    def solve(self, time_limit_s: float) -> tuple[float, float]:
        for entries in self.load.values():
            self.row(-highspy.kHighsInf, 0.0, entries)
        self.highs.setOptionValue("time_limit", time_limit_s)
        self.highs.run()
        info = self.highs.getInfo()
        return -float(info.objective_function_value), -float(info.mip_dual_bound)
