"""The decision model, built from a Network: the table of contents.

Formulation (numbered as in the README)
---------------------------------------
Variables: link open y_e, hub open h_i, allocation a_ih (binary); frequency n_s of a service s (a type on a
link), vehicles m_v, purchases b_v (integer); share x_p of demand k = k(p) on way p, unserved share s_k.

1. demand          sum_p x_p + s_k = 1,  0 <= s_k <= 1 - min_share_k,  s_k = 0 where unserved is forbidden
2. capacity        sum_p d_k x_p <= max_load_factor * sum_s capacity_s n_s (each direction; capacity_e y_e
                   without a fleet)
3. strong linking  a) sum_{p of k on e} x_p <= y_e; on a leg too <= capacity_e / d_k y_e without a fleet
                   b) sum_{p of k, hub at i} x_p <= h_i
                   c) sum_{p of k, spoke at i} x_p <= 1 - h_i
4. hubs            hub and collection capacities, hub counts, max_links, y_ij <= h_i + h_j (hub-and-spoke);
                   single allocation: a_hh = h_h, sum_h a_ih = 1, a_ih <= h_h, a_ih <= y_ih, way follows a
5. frequency       min_frequency y_e <= sum_s n_s <= max_frequency y_e; departures = arrivals per type and
                   station where one-way links exist
6. limits          departures at a station, vehicle hours, vehicles, cost, investment, CO2

Rows 3 are pooled (one per demand and link or station) and stand in the model summed over demands, which is
weaker but enough for integer plans. Sources: multicommodity fixed-charge design with strong linking rows,
Magnanti and Wong 1984 (Transportation Science 18:1-55), Gendron, Crainic and Frangioni 1999; hub location by
itineraries, Campbell 1994 (EJOR 72:387-405), Skorin-Kapov et al. 1996 (EJOR 94:582-593); frequencies on
links, Magnanti, Mirchandani and Vachani 1995 (Operations Research 43:142-157).
"""

from __future__ import annotations

from hubdesign.itineraries import Itineraries, enumerate_itineraries
from hubdesign.model.flows import FlowColumns, build_leg_columns, build_path_columns
from hubdesign.model.hub_rows import (
    add_allocated_volume_rows,
    add_allocation_rows,
    add_collection_capacity_rows,
    add_hub_capacity_rows,
    add_hub_count_row,
    add_link_count_rows,
    add_spoke_link_rows,
)
from hubdesign.model.layout import Model, start_model
from hubdesign.model.limit_rows import (
    add_departure_rows,
    add_frequency_balance_rows,
    add_frequency_rows,
    add_money_limit_rows,
    add_vehicle_rows,
)
from hubdesign.model.link_rows import (
    add_capacity_rows,
    add_demand_rows,
    add_hub_linking_rows,
    add_link_linking_rows,
)
from hubdesign.model.variables import (
    add_allocation_variables,
    add_flow_variables,
    add_frequency_variables,
    add_hub_variables,
    add_link_variables,
    add_unserved_variables,
    add_vehicle_variables,
)
from hubdesign.network import Network
from hubdesign.problem import UNLIMITED


def build_model(network: Network, flows: FlowColumns | None = None) -> Model:
    """Return the whole model of `network`; `flows` may be handed over where it is known already."""
    model = start_model(network, build_flow_columns(network) if flows is None else flows)

    add_hub_variables(model)
    add_link_variables(model)
    add_allocation_variables(model)
    add_frequency_variables(model)
    add_vehicle_variables(model)
    add_unserved_variables(model)
    add_flow_variables(model)

    add_demand_rows(model)
    add_capacity_rows(model)
    add_link_linking_rows(model)
    add_hub_linking_rows(model)
    add_hub_capacity_rows(model)
    add_collection_capacity_rows(model)
    add_hub_count_row(model)
    add_link_count_rows(model)
    add_spoke_link_rows(model)
    add_allocation_rows(model)
    add_allocated_volume_rows(model)
    add_frequency_rows(model)
    add_frequency_balance_rows(model)
    add_departure_rows(model)
    add_vehicle_rows(model)
    add_money_limit_rows(model)
    return model


def build_flow_columns(network: Network) -> FlowColumns:
    """Return the flow columns: legs for "unlimited" transfers, else paths (single allocation always)."""
    settings = network.problem.settings
    if settings.transfers_at_most == UNLIMITED and not settings.single_allocation:
        return build_leg_columns(network, _local_itineraries(network))
    return build_path_columns(network, enumerate_itineraries(network))


def _local_itineraries(network: Network) -> Itineraries:
    every = enumerate_itineraries(network, 1)
    return every.of(network.demand.origin[every.demand] == network.demand.destination[every.demand])
