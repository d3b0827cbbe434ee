"""The Problem as arrays: candidate links, legs, services, with every default resolved.

Model, verification and tables all stand on this one view, so that a distance, a cost or a limit is worked
out once. Indices are positions in `Problem.stations`, `.demands`, `.vehicles` and in the arrays below.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from hubdesign import costs
from hubdesign.distances import distances_km
from hubdesign.problem import CurrentLink, ListedLink, Problem
from hubdesign.units import CO2_PER_JET_FUEL_KG, MINUTES_PER_HOUR

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class StationArrays:
    """Per station, shape (n,); limits are inf where there is none, coordinates NaN where blank."""

    lat: Floats
    lon: Floats
    may_be_hub: Bools
    must_be_hub: Bools
    hub_fixed_cost: Floats
    hub_setup_cost: Floats  # 0 for today's hubs
    hub_capacity: Floats
    collection_capacity: Floats
    transfer_cost: Floats
    transfer_h: Floats
    departure_fee: Floats
    volume_fee: Floats
    min_departures: Floats
    max_departures: Floats
    max_links: Floats


@dataclass(frozen=True, slots=True)
class DemandArrays:
    """Per O-D row, shape (K,). `revenue`, `unserved_cost` are money per unit; `od_km` NaN if unknown."""

    origin: Ints
    destination: Ints
    volume: Floats
    revenue: Floats
    kept: Floats
    unserved_cost: Floats
    min_share: Floats
    max_hours: Floats
    od_km: Floats


@dataclass(frozen=True, slots=True)
class LinkArrays:
    """Per candidate link, shape (E,). `both` links have two legs, one-way links one (tail to head)."""

    tail: Ints
    head: Ints
    mode: Ints  # position in Network.modes
    both: Bools
    distance_km: Floats
    fixed_cost: Floats
    setup_cost: Floats  # 0 for links in current.csv
    unit_cost: Floats
    capacity: Floats  # per direction, only without a fleet
    must: Bools
    min_frequency: Floats
    max_frequency: Floats


@dataclass(frozen=True, slots=True)
class LegArrays:
    """Per leg (a direction of a link), shape (L,). `hours` is the slowest allowed type's block time."""

    link: Ints
    tail: Ints
    head: Ints
    hours: Floats


@dataclass(frozen=True, slots=True)
class ServiceArrays:
    """Per service (a vehicle type allowed on a link), shape (S,), in order of link; per departure."""

    link: Ints
    vehicle: Ints
    capacity: Floats
    block_h: Floats
    vehicle_h: Floats  # block and turn
    trip_cost: Floats  # without fees and CO2
    co2_kg: Floats


@dataclass(frozen=True)
class Network:
    """The arrays of one Problem; see :func:`build_network`."""

    problem: Problem
    modes: tuple[str, ...]
    station: StationArrays
    demand: DemandArrays
    link: LinkArrays
    leg: LegArrays
    service: ServiceArrays

    @property
    def station_count(self) -> int:
        """Number of stations."""
        return len(self.problem.stations)

    @property
    def link_count(self) -> int:
        """Number of candidate links."""
        return len(self.link.tail)

    @cached_property
    def index(self) -> dict[str, int]:
        """Station code -> position."""
        return {station.station: i for i, station in enumerate(self.problem.stations)}

    @cached_property
    def forward_leg(self) -> Ints:
        """Leg of each link from tail to head, shape (E,)."""
        ways = np.where(self.link.both, 2, 1)
        return (
            np.concatenate(([0], np.cumsum(ways)[:-1])).astype(np.int64)
            if len(ways)
            else ways.astype(np.int64)
        )

    @cached_property
    def backward_leg(self) -> Ints:
        """Leg of each link from head to tail, shape (E,); -1 for a one-way link."""
        return np.where(self.link.both, self.forward_leg + 1, -1)

    @cached_property
    def ways(self) -> Ints:
        """Directions of each link, shape (E,): a both-way frequency counts twice."""
        return np.where(self.link.both, 2, 1).astype(np.int64)

    @cached_property
    def legs_from(self) -> tuple[tuple[int, ...], ...]:
        """Legs leaving each station."""
        result: list[list[int]] = [[] for _ in range(self.station_count)]
        for leg, tail in enumerate(self.leg.tail.tolist()):
            result[tail].append(leg)
        return tuple(tuple(legs) for legs in result)

    @cached_property
    def services_of(self) -> tuple[tuple[int, ...], ...]:
        """Services of each link."""
        result: list[list[int]] = [[] for _ in range(self.link_count)]
        for service, link in enumerate(self.service.link.tolist()):
            result[link].append(service)
        return tuple(tuple(services) for services in result)

    @cached_property
    def departures_today(self) -> Ints:
        """Departures each way of each service in current.csv, shape (S,); rows of one service add up."""
        result = np.zeros(len(self.service.link), dtype=np.int64)
        place: dict[tuple[int, int, int], int] = {}
        for service, (link, vehicle) in enumerate(
            zip(self.service.link.tolist(), self.service.vehicle.tolist())
        ):
            tail, head = int(self.link.tail[link]), int(self.link.head[link])
            place[tail, head, vehicle] = service
            if self.link.both[link]:
                place[head, tail, vehicle] = service
        vehicles = {row.vehicle: v for v, row in enumerate(self.problem.vehicles)}
        for today in self.problem.current:
            if today.vehicle is not None:
                key = (self.index[today.from_], self.index[today.to], vehicles[today.vehicle])
                if key in place:
                    result[place[key]] += today.frequency or 0
        return result

    def leg_unit_cost(self, leg: int, tail_is_hub: bool, head_is_hub: bool) -> float:
        """Return the cost of a unit of volume on `leg`, money, by what its ends act as."""
        settings = self.problem.settings
        factor = costs.leg_factor(
            tail_is_hub,
            head_is_hub,
            settings.collection_factor,
            settings.transfer_factor,
            settings.distribution_factor,
        )
        return factor * float(self.link.unit_cost[self.leg.link[leg]])


def build_network(problem: Problem) -> Network:
    """Return the arrays of `problem`; the inputs are taken to be free of faults.

    Candidate links are, per mode, the pairs that both stations allow and some vehicle can serve, with the
    rows of links.csv in place of the computed ones; must/never, range and modes are applied here, so what
    cannot operate never becomes a variable. For the structure ``current`` the candidates are today's links
    and types, whatever the range, and today's hubs are the hubs.
    """
    modes = modes_in_force(problem)
    station = _station_arrays(problem)
    drafts = (
        _current_drafts(problem, modes)
        if problem.settings.structure == "current"
        else _drafts(problem, modes)
    )
    lengths = _lengths_km(problem, modes, station, drafts)
    link, service = _links_and_services(problem, modes, drafts, lengths)
    leg = _leg_arrays(link, service)
    return Network(problem, modes, station, _demand_arrays(problem, station), link, leg, service)


@dataclass(frozen=True, slots=True)
class _Draft:
    """A candidate before its figures: ends, mode, direction, its row of links.csv, allowed types."""

    tail: int
    head: int
    mode: int
    both: bool
    row: ListedLink | None
    vehicles: tuple[int, ...] | None  # None: every type of the mode that has the range


def modes_in_force(problem: Problem) -> tuple[str, ...]:
    """Return the modes in force: the fleet's, else those named anywhere, else air."""
    if problem.vehicles:
        return tuple(dict.fromkeys(vehicle.mode for vehicle in problem.vehicles))
    named = [mode for station in problem.stations for mode in station.modes or ()]
    named += [row.mode for row in problem.links]
    named += [mode for mode, _ in problem.settings.mode_distance_factor]
    return tuple(dict.fromkeys(named)) or ("air",)


def _station_arrays(problem: Problem) -> StationArrays:
    settings, rows = problem.settings, problem.stations
    if settings.structure == "point-to-point":
        may = must = np.zeros(len(rows), dtype=bool)
    elif settings.structure == "current":
        may = must = np.array([row.current_hub for row in rows], dtype=bool)
    else:
        must = np.array([row.must_be_hub for row in rows], dtype=bool)
        may = np.array([row.may_be_hub for row in rows], dtype=bool) | must
    transfer_minutes = [
        settings.transfer_minutes if row.transfer_minutes is None else row.transfer_minutes for row in rows
    ]
    return StationArrays(
        lat=_floats([row.lat for row in rows], np.nan),
        lon=_floats([row.lon for row in rows], np.nan),
        may_be_hub=may,
        must_be_hub=must,
        hub_fixed_cost=_floats([row.hub_fixed_cost for row in rows]),
        hub_setup_cost=_floats([0.0 if row.current_hub else row.hub_setup_cost for row in rows]),
        hub_capacity=_floats([row.hub_capacity for row in rows], np.inf),
        collection_capacity=_floats([row.collection_capacity for row in rows], np.inf),
        transfer_cost=_floats([row.transfer_cost for row in rows]),
        transfer_h=_floats(transfer_minutes) / MINUTES_PER_HOUR,
        departure_fee=_floats([row.departure_fee for row in rows]),
        volume_fee=_floats([row.volume_fee for row in rows]),
        min_departures=_floats([row.min_departures for row in rows], 0.0),
        max_departures=_floats([row.max_departures for row in rows], np.inf),
        max_links=_floats([row.max_links for row in rows], np.inf),
    )


def _demand_arrays(problem: Problem, station: StationArrays) -> DemandArrays:
    settings, rows = problem.settings, problem.demands
    index = {row.station: i for i, row in enumerate(problem.stations)}
    origin = np.array([index[row.origin] for row in rows], dtype=np.int64)
    destination = np.array([index[row.destination] for row in rows], dtype=np.int64)
    od_km = _od_km(problem, station, origin, destination)
    by_distance = settings.revenue_per_unit + settings.revenue_per_km * np.nan_to_num(od_km)
    given = _floats([row.revenue for row in rows], np.nan)
    return DemandArrays(
        origin=origin,
        destination=destination,
        volume=_floats([row.volume for row in rows]),
        revenue=np.where(np.isnan(given), by_distance, given),
        kept=_floats([row.revenue_kept_per_transfer for row in rows], settings.revenue_kept_per_transfer),
        unserved_cost=_floats([row.unserved_cost for row in rows], settings.unserved_cost),
        min_share=_floats([row.min_share for row in rows]),
        max_hours=_floats(
            [row.max_hours for row in rows], np.inf if settings.max_hours is None else settings.max_hours
        ),
        od_km=od_km,
    )


def _od_km(problem: Problem, station: StationArrays, origin: Ints, destination: Ints) -> Floats:
    """Return O-D distances, km: the listed one (its own direction first), else computed with uplift."""
    listed: dict[tuple[int, int], float] = {}
    reverse: dict[tuple[int, int], float] = {}
    index = {row.station: i for i, row in enumerate(problem.stations)}
    for row in problem.links:
        if row.distance_km is None:
            continue
        tail, head = index[row.from_], index[row.to]
        for table, pair in (
            (listed, (tail, head)),
            (listed if row.direction == "both" else reverse, (head, tail)),
        ):
            table[pair] = min(table.get(pair, np.inf), row.distance_km)
    listed = {**reverse, **listed}
    settings = problem.settings
    result = distances_km(
        settings.method,
        station.lat[origin],
        station.lon[origin],
        station.lat[destination],
        station.lon[destination],
    ) * (1.0 + settings.uplift_percent / 100.0)
    if listed:
        pairs = zip(origin.tolist(), destination.tolist())
        own = _floats([listed.get(pair) for pair in pairs], np.nan)
        result = np.where(np.isnan(own), result, own)
    return np.where(origin == destination, 0.0, result)


def _drafts(problem: Problem, modes: tuple[str, ...]) -> list[_Draft]:
    """Return the candidates in order of their ends and mode."""
    index = {row.station: i for i, row in enumerate(problem.stations)}
    position = {mode: m for m, mode in enumerate(modes)}
    vehicle_index = {row.vehicle: v for v, row in enumerate(problem.vehicles)}
    allowed = [[row.modes is None or mode in row.modes for row in problem.stations] for mode in modes]
    drafts: list[_Draft] = []
    listed: set[tuple[int, int, int]] = set()
    for row in problem.links:
        if row.mode not in position:
            continue
        tail, head, mode = index[row.from_], index[row.to], position[row.mode]
        listed.add((min(tail, head), max(tail, head), mode))
        if row.decision == "never" or not (allowed[mode][tail] and allowed[mode][head]):
            continue
        vehicles = None if row.vehicles is None else tuple(vehicle_index[name] for name in row.vehicles)
        drafts.append(_Draft(tail, head, mode, row.direction == "both", row, vehicles))
    if problem.settings.links == "all" or not problem.links:
        for mode in range(len(modes)):
            served = [i for i, ok in enumerate(allowed[mode]) if ok]
            for place, tail in enumerate(served):
                drafts.extend(
                    _Draft(tail, head, mode, True, None, None)
                    for head in served[place + 1 :]
                    if (tail, head, mode) not in listed
                )
    drafts.sort(key=lambda d: (min(d.tail, d.head), max(d.tail, d.head), d.mode, d.tail))
    return drafts


def current_mode(problem: Problem, row: CurrentLink) -> str:
    """Return the mode of a row of current.csv: its vehicle's, else that of the pair's first listed link."""
    for vehicle in problem.vehicles:
        if vehicle.vehicle == row.vehicle:
            return vehicle.mode
    pair = {row.from_, row.to}
    for listed in problem.links:
        if {listed.from_, listed.to} == pair:
            return listed.mode
    return modes_in_force(problem)[0]


def _current_drafts(problem: Problem, modes: tuple[str, ...]) -> list[_Draft]:
    """Return today's links with the types they are operated with."""
    index = {row.station: i for i, row in enumerate(problem.stations)}
    vehicle_index = {row.vehicle: v for v, row in enumerate(problem.vehicles)}
    found: dict[tuple[int, int, int], tuple[bool, ListedLink | None, list[int]]] = {}
    for today in problem.current:
        mode = current_mode(problem, today)
        listed = listed_row(problem, today.from_, today.to, mode)
        both = listed is None or listed.direction == "both"
        tail, head = index[today.from_], index[today.to]
        if both and listed is not None:
            tail, head = index[listed.from_], index[listed.to]
        elif both:
            tail, head = min(tail, head), max(tail, head)
        entry = found.setdefault((tail, head, modes.index(mode)), (both, listed, []))
        if today.vehicle is not None:
            entry[2].append(vehicle_index[today.vehicle])
    drafts = [
        _Draft(tail, head, mode, both, row, tuple(sorted(set(vehicles))))
        for (tail, head, mode), (both, row, vehicles) in found.items()
    ]
    drafts.sort(key=lambda d: (min(d.tail, d.head), max(d.tail, d.head), d.mode, d.tail))
    return drafts


def listed_row(problem: Problem, from_: str, to: str, mode: str) -> ListedLink | None:
    """Return the row of links.csv that describes travel from `from_` to `to` by `mode`, None without one."""
    for row in problem.links:
        if row.mode != mode:
            continue
        if (row.from_, row.to) == (from_, to) or (
            row.direction == "both" and (row.to, row.from_) == (from_, to)
        ):
            return row
    return None


def _lengths_km(
    problem: Problem, modes: tuple[str, ...], station: StationArrays, drafts: list[_Draft]
) -> Floats:
    """Return the length of each draft, km: listed, else computed with uplift and the mode's factor."""
    settings = problem.settings
    factors = dict(settings.mode_distance_factor)
    own = _floats([None if d.row is None else d.row.distance_km for d in drafts], np.nan)
    tail, head = _ints([d.tail for d in drafts]), _ints([d.head for d in drafts])
    factor = _floats([factors.get(modes[d.mode], 1.0) for d in drafts]) * (
        1.0 + settings.uplift_percent / 100.0
    )
    blank = np.isnan(own)
    pairs = dict.fromkeys(zip(tail[blank].tolist(), head[blank].tolist()))
    if pairs:
        a, b = _ints([pair[0] for pair in pairs]), _ints([pair[1] for pair in pairs])
        lengths = distances_km(
            settings.method, station.lat[a], station.lon[a], station.lat[b], station.lon[b]
        )
        computed = dict(zip(pairs, lengths.tolist()))
        own[blank] = [computed[pair] for pair in zip(tail[blank].tolist(), head[blank].tolist())]
        own[blank] *= factor[blank]
    return own


def _links_and_services(
    problem: Problem, modes: tuple[str, ...], drafts: list[_Draft], lengths: Floats
) -> tuple[LinkArrays, ServiceArrays]:
    """Return links and services; with a fleet a link that no allowed type can serve is left out."""
    settings = problem.settings
    today = settings.structure == "current"
    kept: list[int] = []
    service_rows: list[tuple[int, int]] = []
    for place, draft in enumerate(drafts):
        if np.isnan(lengths[place]):
            continue  # the checks demand a distance wherever one is needed
        types = _allowed_types(problem, modes, draft, float(lengths[place]), today)
        if problem.vehicles and not types:
            continue
        service_rows += [(len(kept), v) for v in types]
        kept.append(place)
    chosen = [drafts[place] for place in kept]
    distance_km = lengths[_ints(kept)] if kept else np.zeros(0)
    link = _link_arrays(problem, chosen, distance_km)
    return link, _service_arrays(problem, service_rows, distance_km)


def _allowed_types(
    problem: Problem, modes: tuple[str, ...], draft: _Draft, length_km: float, today: bool
) -> list[int]:
    types = range(len(problem.vehicles)) if draft.vehicles is None else draft.vehicles
    return [
        v
        for v in types
        if today
        or (
            problem.vehicles[v].mode == modes[draft.mode]
            and length_km <= (np.inf if (reach := problem.vehicles[v].range_km) is None else reach)
        )
    ]


def _link_arrays(problem: Problem, drafts: list[_Draft], distance_km: Floats) -> LinkArrays:
    settings = problem.settings
    rows = [draft.row for draft in drafts]
    today = settings.structure == "current"
    fleet_minimum = 1.0 if problem.vehicles and not today else 0.0
    minimum = fleet_minimum if settings.min_frequency is None or today else settings.min_frequency
    maximum = np.inf if settings.max_frequency is None or today else settings.max_frequency
    standard = settings.link_fixed_cost + settings.link_fixed_cost_per_km * distance_km
    per_unit = settings.unit_cost_per_km * distance_km
    operated = _operated_today(problem)
    codes = [row.station for row in problem.stations]
    keys = [(frozenset((codes[d.tail], codes[d.head])), d.mode) for d in drafts]

    def listed(name: str) -> Floats:
        return _floats([None if row is None else getattr(row, name) for row in rows], np.nan)

    def either(given: Floats, otherwise: Floats | float) -> Floats:
        return np.where(np.isnan(given), otherwise, given)

    setup = [0.0 if row is None or key in operated else row.setup_cost for row, key in zip(rows, keys)]
    return LinkArrays(
        tail=_ints([d.tail for d in drafts]),
        head=_ints([d.head for d in drafts]),
        mode=_ints([d.mode for d in drafts]),
        both=np.array([d.both for d in drafts], dtype=bool),
        distance_km=distance_km,
        fixed_cost=either(listed("fixed_cost"), standard),
        setup_cost=_floats(setup),
        unit_cost=either(listed("unit_cost"), per_unit),
        capacity=either(listed("capacity"), np.inf),
        must=np.array([today or (row is not None and row.decision == "must") for row in rows], dtype=bool),
        min_frequency=np.zeros(len(rows)) if today else either(listed("min_frequency"), minimum),
        max_frequency=np.full(len(rows), np.inf) if today else either(listed("max_frequency"), maximum),
    )


def _operated_today(problem: Problem) -> set[tuple[frozenset[str], int]]:
    """Return the (ends, mode) of today's links: they cost no setup."""
    modes = modes_in_force(problem)
    return {
        (frozenset((row.from_, row.to)), modes.index(current_mode(problem, row))) for row in problem.current
    }


def _service_arrays(problem: Problem, rows: list[tuple[int, int]], distance_km: Floats) -> ServiceArrays:
    link, vehicle = _ints([row[0] for row in rows]), _ints([row[1] for row in rows])
    length = distance_km[link] if rows else np.zeros(0)

    def of(name: str) -> Floats:
        return _floats([getattr(row, name) for row in problem.vehicles])[vehicle] if rows else np.zeros(0)

    block_h = costs.block_hours(length, of("speed_kmh"), of("fixed_minutes"))
    emission = _floats([co2_factor(row.mode, row.co2_per_fuel_kg) for row in problem.vehicles])
    fuel = costs.fuel_kg(length, of("fuel_kg_per_km"), of("fuel_kg_per_departure"))
    return ServiceArrays(
        link=link,
        vehicle=vehicle,
        capacity=of("capacity"),
        block_h=block_h,
        vehicle_h=costs.vehicle_hours(block_h, of("turn_minutes")),
        trip_cost=costs.trip_cost(
            block_h, length, of("cost_per_hour"), of("cost_per_departure"), of("cost_per_km")
        ),
        co2_kg=fuel * emission[vehicle] if rows else np.zeros(0),
    )


def co2_factor(mode: str, given: float | None) -> float:
    """Return kg CO2 per kg of fuel: the given one, else ICAO's for jet fuel for air, else 0."""
    if given is not None:
        return given
    return CO2_PER_JET_FUEL_KG if mode == "air" else 0.0


def _leg_arrays(link: LinkArrays, service: ServiceArrays) -> LegArrays:
    count = len(link.tail)
    slowest = np.zeros(count)
    np.maximum.at(slowest, service.link, service.block_h)
    of_link = np.repeat(np.arange(count, dtype=np.int64), np.where(link.both, 2, 1))
    backward = np.zeros(len(of_link), dtype=bool)
    backward[1:] = of_link[1:] == of_link[:-1]
    return LegArrays(
        link=of_link,
        tail=np.where(backward, link.head[of_link], link.tail[of_link]),
        head=np.where(backward, link.tail[of_link], link.head[of_link]),
        hours=slowest[of_link],
    )


def _floats(values: list[float] | list[float | None] | list[int | None], blank: float = np.nan) -> Floats:
    return np.array([blank if value is None else value for value in values], dtype=np.float64)


def _ints(values: list[int]) -> Ints:
    return np.array(values, dtype=np.int64)
