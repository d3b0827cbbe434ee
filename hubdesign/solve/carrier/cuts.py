"""Cuts of carrier models: rounding on links and at stations, separated over whole arrays.

Notation: a_s the usable capacity of a departure of service s (load factor included), n_s departures, d_k
volume, f_kl the share of demand k that travels leg l (at most the share served, and at most y_e by row 3a).

Mixed-integer rounding (Nemhauser and Wolsey 1990, Mathematical Programming 46:379-390). From
``sum_s a_s n_s + z >= Q`` with integer n >= 0 and continuous z >= 0 follows, for any C > 0 with
r = frac(Q / C) > 0 and G(a) = floor(a) + min(1, frac(a) / r),

    sum_s G(a_s / C) n_s + z / (C r) >= ceil(Q / C).

*Link cuts.* For a leg l of link e and a set S of demands, capacity (row 2) and f_kl <= y_e give
``sum_s a_s n_s + sum_S d_k (y_e - f_kl) >= Q_S y_e``. At y_e = 1 rounding applies as above; at y_e = 0 all
of n, f and y are 0. So ``sum_s G n_s + sum_S d_k (y_e - f_kl) / (C r) >= ceil(Q_S / C) y_e`` holds for
y_e in {0, 1} (residual capacity: Magnanti, Mirchandani and Vachani 1993, Mathematical Programming 60:233-250;
scaled by the design variable: Frangioni and Gendron 2009, Discrete Applied Mathematics 157:1229-1241).

*Station cuts.* For legs A all into (all out of) one station and demands S, a simple path uses at most one leg
of A, so f_k(A) = sum_A f_kl <= 1 and ``sum_A a_s n_s + sum_S d_k (1 - f_k(A)) >= Q_S``; rounding gives a
flow-cutset cut (Bienstock and Gunluk 1996, INFORMS Journal on Computing 8:213-230; Atamturk 2002,
Mathematical Programming 92:425-437; Raack, Koster, Orlowski and Wessaly 2011, Networks 57:141-156).
Local volume that leaves and comes back enters and leaves its station once each, so it obeys the same.

None of the families uses a bound that a branching changed, so every cut holds in the whole tree.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from hubdesign.model.layout import Model
from hubdesign.solve.carrier.linear import CutRows

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

#: Quotients this close to a whole number are not rounded: 1 / r must stay moderate.
_REST_FLOOR = 0.02

#: Turns of choosing demands and legs for each other.
_TURNS = 3

#: Sizes rounded by at the most (many types would make many).
_MOST_SIZES = 16

#: Cuts with less violation (in departures) are left out.
LEAST_VIOLATION = 0.01


@dataclass(frozen=True, slots=True)
class Cut:
    """``sum G n + y_weight y + sum_pairs pair_weight f >= side`` before it becomes a row."""

    services: Ints
    weights: Floats
    link: int  # -1: no link variable
    link_weight: float
    pairs: Ints
    pair_weights: Floats
    side: float
    violation: float


class CutMaker:
    """Separates the cuts of one model."""

    def __init__(self, model: Model) -> None:
        network, flows = model.network, model.flows
        self.model = model
        count = len(network.demand.volume)
        keys = flows.on_leg.item * count + flows.demand[flows.on_leg.column]
        # A pair is a (leg, demand) that some column uses; pairs stand in order of leg.
        unique, self.pair_of_entry = np.unique(keys, return_inverse=True)
        self.leg, self.demand = unique // count, unique % count
        self.column_of_entry = flows.on_leg.column + model.family("flow").first
        order = np.argsort(self.pair_of_entry, kind="stable")
        self._entries = self.column_of_entry[order]
        self._entry_start = np.searchsorted(self.pair_of_entry[order], np.arange(len(unique) + 1))
        self.volume = network.demand.volume
        load = network.problem.settings.max_load_factor
        self.usable = load * network.service.capacity
        self.sizes = rounding_sizes(self.usable)
        self.capacities, of = np.unique(self.usable, return_inverse=True)
        self.capacity_of = np.append(of, len(self.capacities))  # of the padding: a column nobody reads
        self._service_table()
        self._station_groups()

    def _service_table(self) -> None:
        """Per link its services, shape (E, W), padded with the service count."""
        services_of = self.model.network.services_of
        width = max((len(s) for s in services_of), default=0)
        count = len(self.usable)
        self.services = np.full((len(services_of), width), count, dtype=np.int64)
        for link, services in enumerate(services_of):
            self.services[link, : len(services)] = services
        self.usable_padded = np.append(self.usable, 0.0)

    def _station_groups(self) -> None:
        """Pairs of the demands that end (start) at a station, by station and direction."""
        network = self.model.network
        tail, head = network.leg.tail[self.leg], network.leg.head[self.leg]
        origin, destination = network.demand.origin[self.demand], network.demand.destination[self.demand]
        self.groups: list[Ints] = []
        for station in range(network.station_count):
            for chosen in (
                (head == station) & (destination == station),
                (tail == station) & (origin == station),
            ):
                pairs = np.flatnonzero(chosen)
                if len(pairs):
                    self.groups.append(pairs)

    def flows(self, values: Floats) -> Floats:
        """Return the share f of each pair."""
        share = np.bincount(self.pair_of_entry, weights=values[self.column_of_entry], minlength=len(self.leg))
        return share.astype(np.float64)

    # -- links -----------------------------------------------------------------------------------------

    def link_cuts(self, values: Floats) -> list[Cut]:
        """Return the most violated link cut of each leg and size."""
        network = self.model.network
        share = self.flows(values)
        opened = values[self.model.family("link").members][network.leg.link[self.leg]]
        found = np.flatnonzero((share > 1e-6) & (opened > 1e-6))
        if not len(found):
            return []
        ratio = share[found] / opened[found]
        order = np.lexsort((-ratio, self.leg[found]))
        pairs = found[order]
        leg = self.leg[pairs]
        starts = np.flatnonzero(np.concatenate(([True], leg[1:] != leg[:-1])))
        run = np.repeat(np.arange(len(starts)), np.diff(np.append(starts, len(leg))))
        volume = self.volume[self.demand[pairs]]
        total = _running(volume, starts, run)
        slack = _running(volume * (opened[pairs] - share[pairs]), starts, run)
        departures = np.append(values[self.model.family("frequency").members], 0.0)
        services = self.services[network.leg.link[leg]]
        cuts: list[Cut] = []
        for size in self.sizes.tolist():
            quotient = total / size
            rest = quotient - np.floor(quotient)
            usable = (rest > _REST_FLOOR) & (rest < 1.0 - 1e-6)
            safe = np.where(usable, rest, 1.0)
            weights = _rounded(self.usable_padded[services] / size, safe[:, None])
            left = (weights * departures[services]).sum(axis=1) + slack / (size * safe)
            violation = np.where(usable, np.ceil(quotient) * opened[pairs] - left, -1.0)
            cuts += self._best_link_cuts(pairs, starts, run, violation, total, rest, size)
        return cuts

    def _best_link_cuts(
        self,
        pairs: Ints,
        starts: Ints,
        run: Ints,
        violation: Floats,
        total: Floats,
        rest: Floats,
        size: float,
    ) -> list[Cut]:
        best = np.maximum.reduceat(violation, starts)
        network = self.model.network
        cuts = []
        for group in np.flatnonzero(best > LEAST_VIOLATION).tolist():
            end = starts[group + 1] if group + 1 < len(starts) else len(pairs)
            at = int(starts[group]) + int(np.argmax(violation[starts[group] : end]))
            members = pairs[starts[group] : at + 1]
            link = int(network.leg.link[self.leg[pairs[at]]])
            services = np.array(network.services_of[link], dtype=np.int64)
            r = float(rest[at])
            cuts.append(
                Cut(
                    services,
                    _rounded(self.usable[services] / size, np.array(r)),
                    link,
                    float(total[at] / (size * r) - np.ceil(total[at] / size)),
                    members,
                    -self.volume[self.demand[members]] / (size * r),
                    0.0,
                    float(best[group]),
                )
            )
        return cuts

    # -- stations --------------------------------------------------------------------------------------

    def station_cuts(self, values: Floats) -> list[Cut]:
        """Return violated station cuts, a few for each station, direction and size."""
        share = self.flows(values)
        departures = np.append(values[self.model.family("frequency").members], 0.0)
        cuts: list[Cut] = []
        for group in self.groups:
            cuts += self._cuts_at(group[share[group] > 1e-9], share, departures)
        return cuts

    def _cuts_at(self, pairs: Ints, share: Floats, departures: Floats) -> list[Cut]:
        """Return the best cut of each start and size, after a few turns of choosing legs and demands."""
        if not len(pairs):
            return []
        legs, leg_row = np.unique(self.leg[pairs], return_inverse=True)
        demands, demand_row = np.unique(self.demand[pairs], return_inverse=True)
        flow = np.zeros((len(demands), len(legs)))
        flow[demand_row, leg_row] = share[pairs]
        services = self.services[self.model.network.leg.link[legs]]
        # Departures by leg and capacity, shape (legs, capacities).
        counts = np.zeros((len(legs), len(self.capacities) + 1))
        leg_of = np.repeat(np.arange(len(legs)), services.shape[1])
        np.add.at(counts, (leg_of, self.capacity_of[services.ravel()]), departures[services.ravel()])
        found = self._turns(flow, self.volume[demands], counts[:, :-1], self._starts(flow))
        return [
            self._station_cut(legs[inside], demands[chosen], float(self.sizes[size]), violation)
            for size, inside, chosen, violation in found
        ]

    def _starts(self, flow: Floats) -> list[NDArray[np.bool_]]:
        """Return sets of legs to start from: all, those many demands share, and these with one other."""
        every = np.ones(flow.shape[1], dtype=bool)
        shared = (flow > 1e-6).sum(axis=0) > 1
        result = [every]
        if shared.any() and not shared.all():
            result.append(shared)
            split = ((flow > 0.01) & (flow < 0.99)).any(axis=0) & ~shared
            for leg in np.flatnonzero(split).tolist():
                one = shared.copy()
                one[leg] = True
                result.append(one)
        if shared.sum() > 1:
            for leg in np.flatnonzero(shared).tolist():
                one = np.zeros_like(shared)
                one[leg] = True
                result.append(one)
        return result

    def _turns(
        self, flow: Floats, volume: Floats, counts: Floats, starts: list[NDArray[np.bool_]]
    ) -> list[tuple[int, Ints, Ints, float]]:
        """Alternate between the best demands for the legs and the best legs for the demands.

        A row is a start and a size; returned are (size, legs, demands, violation) of the cuts found.
        """
        inside = np.repeat(np.array(starts), len(self.sizes), axis=0)  # (rows, legs)
        size_of = np.tile(np.arange(len(self.sizes)), len(starts))
        size = self.sizes[size_of]
        sized = self.capacities[None, :] / size[:, None]  # (rows, capacities)
        rows = np.arange(len(size))
        best: dict[tuple[int, bytes, bytes], tuple[int, Ints, Ints, float]] = {}
        top = np.full(len(size), LEAST_VIOLATION)
        for _ in range(_TURNS):
            carried = inside.astype(np.float64) @ flow.T  # (rows, demands)
            order = np.argsort(-carried, axis=1, kind="stable")
            sorted_volume = volume[order]
            quotient = np.cumsum(sorted_volume, axis=1) / size[:, None]
            slack = np.cumsum(sorted_volume * (1.0 - np.take_along_axis(carried, order, axis=1)), axis=1)
            rest = quotient - np.floor(quotient)
            usable = (rest > _REST_FLOOR) & (rest < 1.0 - 1e-6)
            safe = np.where(usable, rest, 1.0)
            weights = _rounded(sized[:, None, :], safe[:, :, None])  # (rows, prefixes, capacities)
            offered = inside.astype(np.float64) @ counts  # (rows, capacities)
            left = np.einsum("rpc,rc->rp", weights, offered) + slack / (size[:, None] * safe)
            violation = np.where(usable, np.ceil(quotient) - left, -np.inf)
            at = np.argmax(violation, axis=1)
            found = violation[rows, at]
            for row in np.flatnonzero(found > top).tolist():
                chosen = np.sort(order[row, : at[row] + 1])
                key = (int(size_of[row]), inside[row].tobytes(), chosen.tobytes())
                best[key] = (int(size_of[row]), np.flatnonzero(inside[row]), chosen, float(found[row]))
            top = np.maximum(top, found)
            price = weights[rows, at] @ counts.T  # (rows, legs)
            member = np.zeros(carried.shape)
            np.put_along_axis(member, order, (np.arange(len(volume)) <= at[:, None]).astype(float), axis=1)
            onward = (member * volume) @ flow / (size * safe[rows, at])[:, None]
            again = onward > price
            if bool((again == inside).all()):
                break
            inside = again
        return list(best.values())

    def _station_cut(self, legs: Ints, demands: Ints, size: float, violation: float) -> Cut:
        network = self.model.network
        # All pairs of these demands on these legs, used at present or not.
        member = np.zeros(len(self.volume), dtype=bool)
        member[demands] = True
        on = np.zeros(len(network.leg.link), dtype=bool)
        on[legs] = True
        pairs = np.flatnonzero(on[self.leg] & member[self.demand])
        services = np.array([s for leg in legs.tolist() for s in network.services_of[network.leg.link[leg]]])
        total = float(np.cumsum(self.volume[demands])[-1])
        r = total / size - np.floor(total / size)
        return Cut(
            services,
            _rounded(self.usable[services] / size, np.array(r)),
            -1,
            0.0,
            pairs,
            -self.volume[self.demand[pairs]] / (size * r),
            float(np.ceil(total / size) - total / (size * r)),
            violation,
        )

    # -- rows ------------------------------------------------------------------------------------------

    def rows(self, cuts: list[Cut], most: int) -> CutRows:
        """Return the `most` most violated cuts as rows, each divided by its largest entry."""
        cuts = sorted(cuts, key=lambda cut: -cut.violation)[:most]
        first_n, first_y = self.model.family("frequency").first, self.model.family("link").first
        columns: list[Ints] = []
        values: list[Floats] = []
        sides = np.zeros(len(cuts))
        for number, cut in enumerate(cuts):
            entry, pair = self._entries_of(cut.pairs)
            column = [cut.services + first_n, entry]
            value = [cut.weights, cut.pair_weights[pair]]
            if cut.link >= 0:
                column.append(np.array([cut.link + first_y]))
                value.append(np.array([cut.link_weight]))
            row, weights = np.concatenate(column), np.concatenate(value)
            size = float(np.abs(weights).max())
            columns.append(row)
            values.append(weights / size)
            sides[number] = cut.side / size
        starts = np.concatenate(([0], np.cumsum([len(c) for c in columns]))).astype(np.int64)
        matrix = sparse.csr_array(
            (
                np.concatenate(values) if values else np.zeros(0),
                np.concatenate(columns) if columns else np.zeros(0, dtype=np.int64),
                starts,
            ),
            shape=(len(cuts), self.model.program.column_count),
        )
        # A path on two legs of a set (local volume) or a service met twice adds up.
        matrix.sum_duplicates()
        return CutRows(matrix, sides)

    def _entries_of(self, pairs: Ints) -> tuple[Ints, Ints]:
        """Return the columns of `pairs` and, for each, the position of its pair in `pairs`."""
        starts = self._entry_start[pairs]
        sizes = self._entry_start[pairs + 1] - starts
        owner = np.repeat(np.arange(len(pairs)), sizes)
        offset = np.arange(int(sizes.sum())) - np.repeat(np.cumsum(sizes) - sizes, sizes)
        return self._entries[starts[owner] + offset], owner


def rounding_sizes(usable: Floats) -> Floats:
    """Return the sizes C that are rounded by: capacities, their halves, their differences."""
    own = np.unique(usable[usable > 0.0])
    pairs = np.abs(own[:, None] - own[None, :]).ravel()
    every = np.concatenate((own, own / 2.0, pairs[pairs > 0.05 * own.min(initial=np.inf)]))
    return np.unique(np.round(every, 9))[:_MOST_SIZES]


def _rounded(quotient: Floats, rest: Floats) -> Floats:
    """Return G(a) = floor(a) + min(1, frac(a) / rest)."""
    whole = np.floor(quotient + 1e-12)
    part = np.maximum(0.0, quotient - whole)
    return np.asarray(whole + np.minimum(1.0, part / rest))


def _running(values: Floats, starts: Ints, run: Ints) -> Floats:
    """Return the running sum of `values` within each run."""
    total = np.cumsum(values)
    before = np.concatenate(([0.0], total))[starts]
    return np.asarray(total - before[run])
