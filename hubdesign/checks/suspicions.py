"""What is allowed but suspicious: one suspect_* per rule, each giving its warnings in sentences."""

from __future__ import annotations

import dataclasses
import unicodedata
from collections.abc import Callable, Iterator

import numpy as np

from hubdesign.checks import doubtful, unbound, unused
from hubdesign.checks.findings import some
from hubdesign.checks.places import Case, who_is
from hubdesign.checks.reach import demands_without_itinerary
from hubdesign.checks.rules import rule_name
from hubdesign.distances import Floats, great_circle_km
from hubdesign.errors import Fault
from hubdesign.network import Network, build_network

#: Stations closer than this are probably one, km.
NEAR_KM = 1.0

#: A swap is suspected where it would bring a station this much closer to the others (median distance) ...
SWAP_RATIO = 0.35
#: ... and it now lies this far off, km.
SWAP_KM = 1500.0
_SWAP_STATIONS = 4

#: A listed length under this share of the great circle, or over this multiple of it, is suspected.
SHORT_SHARE, LONG_MULTIPLE = 0.97, 5.0


def find_suspicions(case: Case, clean: bool) -> list[Fault]:
    """Return every warning; those that need arrays only where the case is free of faults."""
    found = [_named(suspect, fault) for suspect in PLAIN for fault in suspect(case)]
    if clean:
        network = build_network(case.problem)
        found += [_named(ask, fault) for ask in WITH_NETWORK for fault in ask(case, network)]
    return found


def _named(suspect: Callable[..., object], fault: Fault) -> Fault:
    return fault if fault.rule else dataclasses.replace(fault, rule=rule_name(suspect))


def _coordinates(case: Case) -> tuple[Floats, Floats]:
    rows = case.problem.stations
    lat = np.array([np.nan if row.lat is None else row.lat for row in rows], dtype=np.float64)
    lon = np.array([np.nan if row.lon is None else row.lon for row in rows], dtype=np.float64)
    return lat, lon


def suspect_swapped_coordinates(case: Case) -> Iterator[Fault]:
    """lat and lon swapped inside the ranges: a swap would bring the station to the others."""
    lat, lon = _coordinates(case)
    known = np.flatnonzero(~(np.isnan(lat) | np.isnan(lon)))
    if len(known) < _SWAP_STATIONS:
        return
    for i in known.tolist():
        if abs(lon[i]) > 90:
            continue
        others = known[known != i]
        now, swapped = (
            float(
                np.median(
                    great_circle_km(
                        np.full(len(others), a), np.full(len(others), b), lat[others], lon[others]
                    )
                )
            )
            for a, b in ((lat[i], lon[i]), (lon[i], lat[i]))
        )
        if now > SWAP_KM and swapped < SWAP_RATIO * now:
            what = f"{lat[i]:g}, {lon[i]:g} lies {now:,.0f} km from the others, swapped {swapped:,.0f} km"
            yield from case.row("stations", i, "lat lon", what, "are lat and lon swapped?")


def suspect_zero_coordinates(case: Case) -> Iterator[Fault]:
    """0/0 is a blank that became a number, in the Gulf of Guinea."""
    for i, row in enumerate(case.problem.stations):
        if row.lat == 0 and row.lon == 0:
            yield from case.row("stations", i, "lat lon", "0/0 lies in the sea off Africa", "is it a blank?")


def suspect_near_stations(case: Case) -> Iterator[Fault]:
    """Two stations within 1 km are probably one."""
    lat, lon = _coordinates(case)
    rows = case.problem.stations
    for i in range(1, len(rows)):
        away = great_circle_km(np.full(i, lat[i]), np.full(i, lon[i]), lat[:i], lon[:i])
        for j in np.flatnonzero(away < NEAR_KM).tolist():
            if rows[i].station != rows[j].station:
                what = f"{away[j] * 1000:,.0f} m from station {rows[j].station} ({case.where('stations', j)})"
                yield from case.row("stations", i, "lat lon", what, "are they one station?")


def suspect_alike_codes(case: Case) -> Iterator[Fault]:
    """Codes that differ in case, or in how a letter is coded, are easily mixed up."""
    for table, column in (
        ("stations", "station"),
        ("fleet", "vehicle"),
        ("fleet", "mode"),
        ("links", "mode"),
    ):
        first: dict[str, tuple[str, int]] = {}
        for i, row in enumerate(case.records(table)):
            code: str = getattr(row, column)
            other, j = first.setdefault(unicodedata.normalize("NFKC", code).casefold(), (code, i))
            if other != code:
                what = f"{code} differs from {other} ({case.where(table, j)}) in case or coding only"
                yield from case.row(table, i, column, what, "are they one?")


def suspect_blank_coordinates(case: Case) -> Iterator[Fault]:
    """Stations without coordinates are not on the map."""
    rows = case.problem.stations
    blank = [i for i, row in enumerate(rows) if row.lat is None and row.lon is None]
    if len(blank) == 1:
        what = "blank: it has no place on the map (null geometry)"
        yield from case.row("stations", blank[0], "lat lon", what)
    elif blank:
        names = some((f"{rows[i].station} ({case.where('stations', i)})" for i in blank), 3)
        what = f"{len(blank):,} stations have no coordinates and no place on the map (null geometry): {names}"
        yield from case.table("stations", what)


def suspect_listed_lengths(case: Case) -> Iterator[Fault]:
    """A listed length should be near the distance on the Earth; miles pass for km easily."""
    lat, lon = _coordinates(case)
    index = {row.station: i for i, row in enumerate(case.problem.stations)}
    rows = [(i, row) for i, row in enumerate(case.problem.links) if row.distance_km is not None]
    rows = [(i, row) for i, row in rows if row.from_ in index and row.to in index]
    if not rows:
        return
    tail, head = ([index[getattr(row, end)] for _, row in rows] for end in ("from_", "to"))
    straight = great_circle_km(lat[tail], lon[tail], lat[head], lon[head])
    for (i, row), km in zip(rows, straight.tolist()):
        given = row.distance_km or 0.0
        if given < SHORT_SHARE * km or (km > 20 and given > LONG_MULTIPLE * km):
            word = "under" if given < km else "far above"
            what = f"{given:,.0f} km is {word} the {km:,.0f} km between the stations"
            yield from case.row("links", i, "distance_km", what, "check the unit (km) and the coordinates")


def suspect_unreached_stations(case: Case, network: Network) -> Iterator[Fault]:
    """A station with demand that no link can serve."""
    busy = set(network.demand.origin[network.demand.volume > 0].tolist())
    busy |= set(network.demand.destination[network.demand.volume > 0].tolist())
    served = set(network.link.tail.tolist()) | set(network.link.head.tolist())
    for i in sorted(busy - served):
        why = "no vehicle reaches it" if case.problem.has_fleet else "no link leads to it"
        cure = "check its modes, the ranges and the links table"
        yield from case.row("stations", i, "station", f"{why}, so that its demand cannot be carried", cure)


def suspect_no_itinerary(case: Case, network: Network) -> Iterator[Fault]:
    """Demand that no itinerary under the rules can carry."""
    lost = demands_without_itinerary(network)
    if not lost:
        return
    rows = case.problem.demands
    volume, total = sum(rows[k].volume for k in lost), sum(row.volume for row in rows)
    names = some((f"{who_is(rows[k])} ({case.where('demand', k)})" for k in lost), 3)
    what = f"{len(lost):,} O-D rows ({volume:,.10g} of {total:,.10g} volume) have no itinerary: {names}"
    cure = "under the rules they stay unserved"
    if not case.problem.settings.unserved_allowed or any(rows[k].min_share > 0 for k in lost):
        cure = "no design can serve them, so none is feasible"
    yield from case.table(
        "demand", what, f"{cure}; look at ranges, max_transfers, max_circuity, max_hours, hubs"
    )


def suspect_beyond_capacity(case: Case, network: Network) -> Iterator[Fault]:
    """Demand beyond any capacity, station by station and for the fleet as a whole."""
    data = network.demand
    away = data.origin != data.destination
    for ends, word, tail in ((data.origin, "leave", True), (data.destination, "arrive", False)):
        volume = np.bincount(ends[away], data.volume[away], network.station_count)
        room = _room(network, tail)
        for i in np.flatnonzero(volume > room * (1 + 1e-9)).tolist():
            if room[i] > 0:
                what = f"{volume[i]:,.10g} {word} here, but no more than {room[i]:,.10g} can"
                cure = "raise max_departures, max_frequency or capacities, or expect unserved volume"
                yield from case.row("stations", i, "station", what, cure)
    yield from _fleet_room(case, network, float(data.volume[away].sum()))
    yield from _collection_room(case, network, float(data.volume.sum()))


def _room(network: Network, departing: bool) -> Floats:
    """Return the most volume that can leave (or reach) each station, shape (n,); inf where open."""
    settings, leg, link = network.problem.settings, network.leg, network.link
    fleet = network.problem.has_fleet
    largest = np.zeros(network.link_count)
    if fleet:
        np.maximum.at(largest, network.service.link, network.service.capacity)
    per_link = np.floor(link.max_frequency) * largest * settings.max_load_factor if fleet else link.capacity
    ends = leg.tail if departing else leg.head
    result = np.zeros(network.station_count)
    np.add.at(result, ends, per_link[leg.link])
    if fleet and departing:
        biggest = np.zeros(network.station_count)
        np.maximum.at(biggest, ends, largest[leg.link])
        limited = (biggest > 0) & np.isfinite(network.station.max_departures)
        by_limit = network.station.max_departures[limited] * biggest[limited] * settings.max_load_factor
        result[limited] = np.minimum(result[limited], by_limit)
    return result


def _collection_room(case: Case, network: Network, volume: float) -> Iterator[Fault]:
    """In hub-and-spoke all volume is collected by a hub: the largest hubs allowed bound what is carried."""
    if case.problem.settings.structure != "hub-and-spoke":
        return
    most = case.problem.settings.hub_count[1]
    rooms = np.sort(network.station.collection_capacity[network.station.may_be_hub])[::-1][:most]
    if volume > float(rooms.sum()) * (1 + 1e-9):
        which = "all stations that may be hubs" if most is None else f"the {most} largest hub(s)"
        what = (
            f"{which} collect {rooms.sum():,.10g} at most (collection_capacity); the demand is {volume:,.10g}"
        )
        yield from case.table("stations", what, "raise collection_capacity, or expect unserved volume")


def _fleet_room(case: Case, network: Network, volume: float) -> Iterator[Fault]:
    """Every unit boards once at least: the departures the fleet has hours for bound what is carried."""
    vehicles = case.problem.vehicles
    if not vehicles or any(row.available is None or row.hours_per_vehicle is None for row in vehicles):
        return
    room = 0.0
    for v, row in enumerate(vehicles):
        hours = network.service.vehicle_h[network.service.vehicle == v]
        if not len(hours) or hours.min() <= 0:
            if len(hours):
                return
            continue
        trips = (row.available or 0) * (row.hours_per_vehicle or 0.0) / float(hours.min())
        room += trips * row.capacity * case.problem.settings.max_load_factor
    if volume > room * (1 + 1e-9):
        what = (
            f"all vehicles on their shortest links carry {room:,.10g} at most; the demand is {volume:,.10g}"
        )
        yield from case.table(
            "fleet", what, "raise available or hours_per_vehicle, or expect unserved volume"
        )


PLAIN: tuple[Callable[[Case], Iterator[Fault]], ...] = (
    suspect_swapped_coordinates,
    suspect_zero_coordinates,
    suspect_near_stations,
    suspect_alike_codes,
    suspect_blank_coordinates,
    suspect_listed_lengths,
)
WITH_NETWORK: tuple[Callable[[Case, Network], Iterator[Fault]], ...] = (
    suspect_unreached_stations,
    suspect_no_itinerary,
    suspect_beyond_capacity,
    *doubtful.SUSPICIONS,
    *unused.SUSPICIONS,
    *unbound.SUSPICIONS,
)
