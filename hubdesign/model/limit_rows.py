"""Rows 5 and 6 of the formulation: frequency, balance, departures, vehicles, cost, investment, CO2."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from hubdesign.itineraries import LIMIT_TOLERANCE
from hubdesign.model.layout import Model, keyed

Floats = NDArray[np.float64]


def add_frequency_rows(model: Model) -> None:
    """min_frequency y_e <= sum_s n_s <= max_frequency y_e, at most what demand can need."""
    network = model.network
    if not network.problem.vehicles:
        return
    link, service = network.link, network.service
    count = network.link_count
    frequency, opened = model.family("frequency"), model.family("link")
    most = np.zeros(count)
    np.add.at(most, service.link, model.program.upper[frequency.members])
    most = np.minimum(most, np.floor(link.max_frequency + LIMIT_TOLERANCE))
    least = np.ceil(link.min_frequency - LIMIT_TOLERANCE)
    rows = np.concatenate((service.link, np.arange(count)))
    columns = np.concatenate((frequency.indices, opened.indices))
    ones = np.ones(len(service.link))
    none, zero = np.full(count, -np.inf), np.zeros(count)
    scale = np.maximum(most, 1.0)
    model.program.rows.add(
        "max_frequency",
        rows,
        columns,
        np.concatenate((ones / scale[service.link], -most / scale)),
        none,
        zero,
        model.link_label,
    )
    model.program.rows.add(
        "min_frequency", rows, columns, np.concatenate((-ones, least)), none, zero, model.link_label
    )


def add_frequency_balance_rows(model: Model) -> None:
    """Per type and station departures = arrivals; links operated both ways balance by themselves."""
    network = model.network
    if network.problem.settings.structure == "current" or not network.problem.vehicles:
        return
    link, service, n = network.link, network.service, network.station_count
    one_way = np.flatnonzero(~link.both[service.link])
    tail, head, vehicle = link.tail[service.link], link.head[service.link], service.vehicle
    keys, row = np.unique(
        np.concatenate((vehicle[one_way] * n + tail[one_way], vehicle[one_way] * n + head[one_way])),
        return_inverse=True,
    )

    def label(member: int) -> str:
        key = int(keys[member])
        return f"{network.problem.vehicles[key // n].vehicle}:{model.station_label(key % n)}"

    model.program.rows.add(
        "balance",
        row,
        np.tile(one_way, 2) + model.family("frequency").first,
        np.concatenate((np.ones(len(one_way)), -np.ones(len(one_way)))),
        np.zeros(len(keys)),
        np.zeros(len(keys)),
        label,
    )


def add_departure_rows(model: Model) -> None:
    """min_departures_i <= departures from station i <= max_departures_i."""
    network = model.network
    if network.problem.settings.structure == "current" or not network.problem.vehicles:
        return
    service, link, station = network.service, network.link, network.station
    both = np.flatnonzero(link.both[service.link])
    number = np.concatenate((np.arange(len(service.link)), both))
    start = np.concatenate((link.tail[service.link], link.head[service.link[both]]))
    limited = np.flatnonzero((station.min_departures > 0) | np.isfinite(station.max_departures))
    place = np.full(network.station_count, -1)
    place[limited] = np.arange(len(limited))
    chosen = place[start] >= 0
    model.program.rows.add(
        "departures",
        place[start[chosen]],
        number[chosen] + model.family("frequency").first,
        np.ones(int(chosen.sum())),
        station.min_departures[limited],
        station.max_departures[limited],
        keyed(model.station_label, limited),
    )


def add_vehicle_rows(model: Model) -> None:
    """Block and turn hours <= hours_per_vehicle m_v; b_v >= m_v - owned_v."""
    network = model.network
    vehicles = network.problem.vehicles
    if not vehicles or network.problem.settings.structure == "current":
        return
    service = network.service
    per_vehicle = np.array([np.inf if v.hours_per_vehicle is None else v.hours_per_vehicle for v in vehicles])
    counted = np.flatnonzero(np.isfinite(per_vehicle))
    place = np.full(len(vehicles), -1)
    place[counted] = np.arange(len(counted))
    chosen = np.flatnonzero(place[service.vehicle] >= 0)
    vehicle = service.vehicle[chosen]
    hours_h = service.vehicle_h[chosen] * network.ways[service.link[chosen]]
    used, bought = model.family("vehicles"), model.family("purchases")

    def label(member: int) -> str:
        return vehicles[int(counted[member])].vehicle

    none = np.full(len(counted), -np.inf)
    model.program.rows.add(
        "vehicle_hours",
        np.concatenate((place[vehicle], np.arange(len(counted)))),
        np.concatenate((chosen + model.family("frequency").first, counted + used.first)),
        np.concatenate((hours_h / per_vehicle[vehicle], -np.ones(len(counted)))),
        none,
        np.zeros(len(counted)),
        label,
    )
    owned = np.array([float(vehicles[v].owned) for v in counted.tolist()])
    number = np.arange(len(counted))
    model.program.rows.add(
        "purchases",
        np.tile(number, 2),
        np.concatenate((counted + used.first, counted + bought.first)),
        np.concatenate((np.ones(len(counted)), -np.ones(len(counted)))),
        none,
        owned,
        label,
    )


def add_money_limit_rows(model: Model) -> None:
    """Total cost, one-off money and CO2 within their limits, each divided by its limit."""
    settings = model.network.problem.settings
    if settings.structure == "current":
        return
    _add_limit_row(model, "cost_limit", "cost", settings.cost_limit)
    _add_limit_row(model, "investment_limit", "investment", settings.investment_limit)
    tonnes = settings.co2_limit_tonnes
    _add_limit_row(model, "co2_limit", "co2", None if tonnes is None else tonnes * 1000.0)


def _add_limit_row(model: Model, family: str, expression: str, limit: float | None) -> None:
    if limit is None:
        return
    values = model.program.expressions[expression]
    columns = np.flatnonzero(values)
    scale = limit if limit > 0.0 else 1.0
    model.program.rows.add(
        family,
        np.zeros(len(columns), dtype=np.int64),
        columns,
        values[columns] / scale,
        np.array([-np.inf]),
        np.array([limit / scale]),
        lambda member: "all",
    )
