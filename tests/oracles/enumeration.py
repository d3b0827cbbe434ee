"""Brute force over hub sets, link sets, frequencies and allocations; flows by a plain LP.

Written from the words of the model, sharing nothing with the package but the Problem itself: its own paths,
costs, limits and capacities. Every link must list its distance. Meant for three or four stations.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, field
from itertools import combinations, product

import numpy as np
from scipy.optimize import linprog

from hubdesign.problem import Demand, ListedLink, Problem, Vehicle

MOST_DEPARTURES = 2


@dataclass(frozen=True)
class Best:
    """The optimum: objective in the goal's unit, and for most-volume the cost with the volume held."""

    objective: float
    cost_with_volume: float | None = None


@dataclass(frozen=True)
class Path:
    """An itinerary as stations and (link, forward) legs."""

    stations: tuple[str, ...]
    legs: tuple[tuple[int, bool], ...]


@dataclass
class Choice:
    """One setting of everything whole: hubs, open links, departures (link, vehicle) -> n, allocation."""

    hubs: frozenset[str]
    links: frozenset[int]
    departures: dict[tuple[int, str], int]
    own: dict[str, str] = field(default_factory=dict)


class BruteForce:
    """All plans of one problem."""

    def __init__(self, problem: Problem) -> None:
        self.p = problem
        self.s = problem.settings
        self.stations = {row.station: row for row in problem.stations}
        self.types = {row.vehicle: row for row in problem.vehicles}
        self.links = [row for row in problem.links if row.decision != "never" and self.can_be_served(row)]

    def can_be_served(self, link: ListedLink) -> bool:
        return not self.types or bool(self.types_on(link))

    def types_on(self, link: ListedLink) -> list[Vehicle]:
        assert link.distance_km is not None
        return [
            v
            for v in self.types.values()
            if v.mode == link.mode
            and (v.range_km is None or link.distance_km <= v.range_km)
            and (link.vehicles is None or v.vehicle in link.vehicles)
        ]

    def best(self) -> Best | None:
        """Return the optimum, None where nothing is feasible."""
        goal = self.s.goal
        values = [v for choice in self.choices() if (v := self.value(choice)) is not None]
        if not values:
            return None
        if goal == "least-cost":
            return Best(min(v[0] for v in values))
        if goal == "most-profit":
            return Best(max(v[0] for v in values))
        volume = max(v[0] for v in values)
        costs = [v[1] for v in values if v[0] >= volume - 1e-7 * max(1.0, volume)]
        return Best(volume, min(costs))

    # What can be chosen ------------------------------------------------------------------------------

    def choices(self) -> Iterator[Choice]:
        for hubs in self.hub_sets():
            for links, departures in self.operations():
                if not self.links_fit(hubs, links):
                    continue
                for own in self.allocations(hubs, links):
                    yield Choice(hubs, links, departures, own)

    def hub_sets(self) -> Iterator[frozenset[str]]:
        if self.s.structure == "point-to-point":
            yield frozenset()
            return
        may = [c for c, row in self.stations.items() if row.may_be_hub or row.must_be_hub]
        must = {c for c, row in self.stations.items() if row.must_be_hub}
        low = self.s.hubs if self.s.hubs is not None else (self.s.hubs_min or 0)
        high = self.s.hubs if self.s.hubs is not None else self.s.hubs_max
        for size in range(len(may) + 1):
            if size < low or (high is not None and size > high):
                continue
            for chosen in combinations(may, size):
                if must <= set(chosen):
                    yield frozenset(chosen)

    def operations(self) -> Iterator[tuple[frozenset[int], dict[tuple[int, str], int]]]:
        must = frozenset(e for e, row in enumerate(self.links) if row.decision == "must")
        if not self.types:
            free = [e for e in range(len(self.links)) if e not in must]
            for size in range(len(free) + 1):
                for extra in combinations(free, size):
                    yield must | set(extra), {}
            return
        services = [(e, v.vehicle) for e, row in enumerate(self.links) for v in self.types_on(row)]
        for counts in product(range(MOST_DEPARTURES + 1), repeat=len(services)):
            departures = {key: n for key, n in zip(services, counts) if n}
            links = must | {e for e, _ in departures}
            if self.departures_fit(links, departures):
                yield links, departures

    def departures_fit(
        self, links: frozenset[int] | set[int], departures: dict[tuple[int, str], int]
    ) -> bool:
        for e in links:
            row = self.links[e]
            total = sum(n for (link, _), n in departures.items() if link == e)
            standard = 1 if self.s.min_frequency is None else self.s.min_frequency
            least = standard if row.min_frequency is None else row.min_frequency
            most = self.s.max_frequency if row.max_frequency is None else row.max_frequency
            if total < least or (most is not None and total > most):
                return False
        leaving = dict.fromkeys(self.stations, 0)
        surplus: dict[tuple[str, str], int] = {}
        for (e, vehicle), n in departures.items():
            row = self.links[e]
            leaving[row.from_] += n
            if row.direction == "both":
                leaving[row.to] += n
            else:
                surplus[vehicle, row.from_] = surplus.get((vehicle, row.from_), 0) - n
                surplus[vehicle, row.to] = surplus.get((vehicle, row.to), 0) + n
        if any(surplus.values()):
            return False
        for code, count in leaving.items():
            row = self.stations[code]
            if row.min_departures is not None and count < row.min_departures:
                return False
            if row.max_departures is not None and count > row.max_departures:
                return False
        used = self.vehicles(departures)
        return all(v.available is None or used[v.vehicle] <= v.available for v in self.types.values())

    def links_fit(self, hubs: frozenset[str], links: frozenset[int]) -> bool:
        count = dict.fromkeys(self.stations, 0)
        for e in links:
            row = self.links[e]
            count[row.from_] += 1
            count[row.to] += 1
            if self.s.structure == "hub-and-spoke" and not {row.from_, row.to} & hubs:
                return False
        most = {c: row.max_links for c, row in self.stations.items()}
        return all(most[c] is None or n <= most[c] for c, n in count.items())  # type: ignore[operator]

    def allocations(self, hubs: frozenset[str], links: frozenset[int]) -> Iterator[dict[str, str]]:
        if self.s.allocation != "single" or self.s.structure == "point-to-point":
            yield {}
            return
        joined = {frozenset((self.links[e].from_, self.links[e].to)) for e in links}
        spokes = [c for c in self.stations if c not in hubs]
        options = [[h for h in sorted(hubs) if frozenset((c, h)) in joined] for c in spokes]
        for chosen in product(*options):
            yield {**{h: h for h in hubs}, **dict(zip(spokes, chosen))}

    # What it costs -----------------------------------------------------------------------------------

    def vehicles(self, departures: dict[tuple[int, str], int]) -> dict[str, int]:
        hours = dict.fromkeys(self.types, 0.0)
        for (e, vehicle), n in departures.items():
            ways = 2 if self.links[e].direction == "both" else 1
            row = self.types[vehicle]
            hours[vehicle] += n * ways * (self.block(e, row) + row.turn_minutes / 60)
        return {
            v: 0 if row.hours_per_vehicle is None else math.ceil(hours[v] / row.hours_per_vehicle - 1e-9)
            for v, row in self.types.items()
        }

    def block(self, e: int, vehicle: Vehicle) -> float:
        distance = self.links[e].distance_km
        assert distance is not None
        return vehicle.fixed_minutes / 60 + distance / vehicle.speed_kmh

    def fixed_money(self, choice: Choice) -> tuple[float, float, float]:
        """Return (cost, investment, CO2 kg) of everything whole."""
        cost = sum(self.stations[h].hub_fixed_cost for h in choice.hubs)
        once = sum(self.stations[h].hub_setup_cost for h in choice.hubs if not self.stations[h].current_hub)
        for e in choice.links:
            row = self.links[e]
            assert row.distance_km is not None
            standard = self.s.link_fixed_cost + self.s.link_fixed_cost_per_km * row.distance_km
            cost += standard if row.fixed_cost is None else row.fixed_cost
            once += row.setup_cost
        kg = 0.0
        for (e, vehicle), n in choice.departures.items():
            row, v = self.links[e], self.types[vehicle]
            assert row.distance_km is not None
            both = row.direction == "both"
            trips = n * (2 if both else 1)
            trip = v.cost_per_departure + v.cost_per_hour * self.block(e, v) + v.cost_per_km * row.distance_km
            cost += trips * trip + n * self.stations[row.from_].departure_fee
            cost += n * self.stations[row.to].departure_fee if both else 0.0
            factor = (
                v.co2_per_fuel_kg if v.co2_per_fuel_kg is not None else (3.16 if v.mode == "air" else 0.0)
            )
            kg += trips * (v.fuel_kg_per_departure + v.fuel_kg_per_km * row.distance_km) * factor
        for vehicle, used in self.vehicles(choice.departures).items():
            v = self.types[vehicle]
            cost += used * v.cost_per_vehicle
            once += max(0, used - v.owned) * v.purchase_cost
        return cost + kg / 1000 * self.s.co2_price_per_tonne, once, kg

    def value(self, choice: Choice) -> tuple[float, float] | None:
        """Return (objective, cost) of the best flows of a choice, None where there are none."""
        cost, once, kg = self.fixed_money(choice)
        if self.s.investment_limit is not None and once > self.s.investment_limit + 1e-9:
            return None
        if self.s.co2_limit_tonnes is not None and kg / 1000 > self.s.co2_limit_tonnes + 1e-12:
            return None
        columns = [(k, path) for k in range(len(self.p.demands)) for path in self.paths(choice, k)]
        money = [self.path_money(choice, k, path) for k, path in columns]
        spent = np.array([m[0] for m in money] + [self.unserved_cost(d) for d in self.p.demands])
        earned = np.array([m[1] for m in money] + [0.0] * len(self.p.demands))
        lost = np.array([0.0] * len(columns) + [d.volume for d in self.p.demands])
        rows, limits = self.limits(choice, columns)
        if self.s.cost_limit is not None:
            rows.append(spent)
            limits.append(self.s.cost_limit - cost)
        if self.s.goal == "least-cost":
            found = self.solve(spent, columns, rows, limits)
            return None if found is None else (cost + found, cost + found)
        if self.s.goal == "most-profit":
            found = self.solve(spent - earned, columns, rows, limits)
            return None if found is None else (-cost - found, 0.0)
        left = self.solve(lost, columns, rows, limits)
        if left is None:
            return None
        total = sum(d.volume for d in self.p.demands)
        held = [*rows, lost], [*limits, left + 1e-9 * max(1.0, total)]
        least = self.solve(spent, columns, *held)
        assert least is not None
        return total - left, cost + least

    def solve(
        self,
        objective: np.ndarray,
        columns: list[tuple[int, Path]],
        rows: list[np.ndarray],
        limits: list[float],
    ) -> float | None:
        count = len(self.p.demands)
        served = np.zeros((count, len(columns) + count))
        for place, (k, _) in enumerate(columns):
            served[k, place] = 1.0
        served[:, len(columns) :] = np.eye(count)
        allowed = self.s.unserved == "allowed" or (self.s.unserved is None and self.s.goal != "least-cost")
        bounds = [(0.0, 1.0)] * len(columns)
        bounds += [
            (0.0, 1.0 if d.volume == 0 else (1 - d.min_share if allowed else 0.0)) for d in self.p.demands
        ]
        answer = linprog(
            objective,
            A_ub=np.array(rows) if rows else None,
            b_ub=np.array(limits) if rows else None,
            A_eq=served,
            b_eq=np.ones(count),
            bounds=bounds,
            method="highs",
        )
        return float(answer.fun) if answer.status == 0 else None

    def unserved_cost(self, demand: Demand) -> float:
        each = self.s.unserved_cost if demand.unserved_cost is None else demand.unserved_cost
        return each * demand.volume

    # How volume may travel ---------------------------------------------------------------------------

    def paths(self, choice: Choice, k: int) -> list[Path]:
        demand = self.p.demands[k]
        legs: dict[str, list[tuple[str, int, bool]]] = {}
        for e in choice.links:
            row = self.links[e]
            legs.setdefault(row.from_, []).append((row.to, e, True))
            if row.direction == "both":
                legs.setdefault(row.to, []).append((row.from_, e, False))
        if demand.origin == demand.destination:
            return self.local_paths(choice, demand.origin, legs)
        found: list[Path] = []
        stack = [Path((demand.origin,), ())]
        while stack:
            path = stack.pop()
            for there, e, forward in legs.get(path.stations[-1], []):
                if there in path.stations:
                    continue
                longer = Path((*path.stations, there), (*path.legs, (e, forward)))
                if there == demand.destination:
                    found.append(longer)
                elif there in choice.hubs:
                    stack.append(longer)
        return [path for path in found if self.allowed(choice, demand, path)]

    def local_paths(
        self, choice: Choice, code: str, legs: dict[str, list[tuple[str, int, bool]]]
    ) -> list[Path]:
        if code in choice.hubs:
            return [Path((code,), ())]
        out = [
            Path((code, hub, code), ((e, forward), (f, back)))
            for hub, e, forward in legs.get(code, [])
            if hub in choice.hubs and (not choice.own or choice.own[code] == hub)
            for there, f, back in legs.get(hub, [])
            if there == code
        ]
        demand = Demand(code, code, 1.0)
        return [path for path in out if self.most_transfers() >= 1 and self.in_time(demand, path)]

    def most_transfers(self) -> int:
        if self.s.structure == "point-to-point":
            return 0
        if self.s.max_transfers is not None:
            return 99 if self.s.max_transfers < 0 else self.s.max_transfers
        return 2 if self.s.structure == "hub-and-spoke" or self.s.allocation == "single" else 1

    def allowed(self, choice: Choice, demand: Demand, path: Path) -> bool:
        if len(path.stations) - 2 > self.most_transfers() or not self.in_time(demand, path):
            return False
        length = sum(self.links[e].distance_km or 0.0 for e, _ in path.legs)
        apart = self.od_km(demand.origin, demand.destination)
        if (
            self.s.max_circuity is not None
            and apart is not None
            and length > self.s.max_circuity * apart + 1e-9
        ):
            return False
        if not choice.own:
            return True
        o, d = demand.origin, demand.destination
        if len(path.stations) == 2 and o not in choice.hubs and d not in choice.hubs:
            return self.s.structure == "mixed"
        asked = [o]
        for station in (choice.own[o], choice.own[d], d):
            if station != asked[-1]:
                asked.append(station)
        return list(path.stations) == asked

    def in_time(self, demand: Demand, path: Path) -> bool:
        most = self.s.max_hours if demand.max_hours is None else demand.max_hours
        if most is None:
            return True
        hours = sum(max(self.block(e, v) for v in self.types_on(self.links[e])) for e, _ in path.legs)
        for code in path.stations[1:-1]:
            minutes = self.stations[code].transfer_minutes
            hours += (self.s.transfer_minutes if minutes is None else minutes) / 60
        return hours <= most + 1e-9

    def od_km(self, origin: str, destination: str) -> float | None:
        own = [r.distance_km for r in self.p.links if (r.from_, r.to) == (origin, destination)]
        own += [
            r.distance_km
            for r in self.p.links
            if (r.to, r.from_) == (origin, destination) and r.direction == "both"
        ]
        back = [r.distance_km for r in self.p.links if (r.to, r.from_) == (origin, destination)]
        known = [km for km in (own or back) if km is not None]
        return min(known) if known else None

    def path_money(self, choice: Choice, k: int, path: Path) -> tuple[float, float]:
        """Return (cost, revenue) of the whole demand on a path."""
        demand, s = self.p.demands[k], self.s
        if not path.legs:
            return 0.0, self.revenue(demand) * demand.volume
        acts = [code in choice.hubs for code in path.stations]
        acts[1:-1] = [True] * (len(acts) - 2)
        each = 0.0
        for place, (e, _) in enumerate(path.legs):
            row = self.links[e]
            assert row.distance_km is not None
            unit = s.unit_cost_per_km * row.distance_km if row.unit_cost is None else row.unit_cost
            factor = {
                (True, True): s.transfer_factor,
                (False, True): s.collection_factor,
                (True, False): s.distribution_factor,
                (False, False): 1.0,
            }[acts[place], acts[place + 1]]
            each += factor * unit
        stops = path.stations[1:-1]
        each += sum(self.stations[code].transfer_cost for code in stops)
        each += self.stations[path.stations[0]].volume_fee + self.stations[path.stations[-1]].volume_fee
        kept = s.revenue_kept_per_transfer
        kept = kept if demand.revenue_kept_per_transfer is None else demand.revenue_kept_per_transfer
        return each * demand.volume, self.revenue(demand) * kept ** len(stops) * demand.volume

    def revenue(self, demand: Demand) -> float:
        if demand.revenue is not None:
            return demand.revenue
        apart = 0.0 if demand.origin == demand.destination else self.od_km(demand.origin, demand.destination)
        return self.s.revenue_per_unit + self.s.revenue_per_km * (apart or 0.0)

    def limits(self, choice: Choice, columns: list[tuple[int, Path]]) -> tuple[list[np.ndarray], list[float]]:
        """Return rows ``row @ columns <= limit`` of leg, hub and collection capacities."""
        width = len(columns) + len(self.p.demands)
        rows: list[np.ndarray] = []
        limits: list[float] = []

        def add(limit: float | None, touches: list[bool]) -> None:
            if limit is None:
                return
            row = np.zeros(width)
            for place, (touch, (k, _)) in enumerate(zip(touches, columns)):
                row[place] = self.p.demands[k].volume if touch else 0.0
            rows.append(row)
            limits.append(limit)

        for e in choice.links:
            link = self.links[e]
            offered: float | None = link.capacity
            if self.types:
                offered = self.s.max_load_factor * sum(
                    n * self.types[v].capacity for (other, v), n in choice.departures.items() if other == e
                )
            for forward in (True, False):
                add(offered, [(e, forward) in path.legs for _, path in columns])
        for code in choice.hubs:
            row = self.stations[code]
            add(row.hub_capacity, [code in path.stations[1:-1] for _, path in columns])
            add(row.collection_capacity, [self.first_hub(choice, path) == code for _, path in columns])
        return rows, limits

    @staticmethod
    def first_hub(choice: Choice, path: Path) -> str | None:
        return next((code for code in path.stations if code in choice.hubs), None)
