"""Settings that cannot go together, or not with these tables."""

from __future__ import annotations

from collections.abc import Iterator

from hubdesign.checks.places import Case
from hubdesign.errors import Fault
from hubdesign.problem import UNLIMITED


def check_hubs_beside_range(case: Case) -> Iterator[Fault]:
    """`hubs` (exactly) cannot stand beside hubs_min or hubs_max."""
    settings = case.problem.settings
    others = [name for name in ("hubs_min", "hubs_max") if getattr(settings, name) is not None]
    if settings.hubs is not None and others:
        what = f"hubs = {settings.hubs} stands beside {' and '.join(others)}"
        yield from case.setting("hubs hubs_min hubs_max", what, "keep hubs (exactly), or the range")


def check_hubs_range(case: Case) -> Iterator[Fault]:
    """hubs_min is at most hubs_max."""
    settings = case.problem.settings
    if (
        settings.hubs_min is not None
        and settings.hubs_max is not None
        and settings.hubs_min > settings.hubs_max
    ):
        what = f"{settings.hubs_min} is above hubs_max = {settings.hubs_max}"
        yield from case.setting("hubs_min hubs_max", what, "lower hubs_min or raise hubs_max")


def _hubs_in_force(case: Case) -> bool:
    """Return whether hub counts and candidates apply and the candidates are surely known."""
    known = case.sure("stations", "may_be_hub must_be_hub")
    return case.problem.settings.structure in ("hub-and-spoke", "mixed") and known


def check_enough_candidates(case: Case) -> Iterator[Fault]:
    """No more hubs are asked for than stations may be hubs."""
    settings = case.problem.settings
    name = "hubs" if settings.hubs is not None else "hubs_min"
    asked = getattr(settings, name)
    candidates = sum(row.may_be_hub or row.must_be_hub for row in case.problem.stations)
    if asked and asked > candidates and _hubs_in_force(case):
        cure = f"lower {name}, or let more stations be hubs (may_be_hub = yes)"
        yield from case.setting(name, f"{asked} hubs are asked for, {candidates} stations may be hubs", cure)


def check_must_hubs_fit(case: Case) -> Iterator[Fault]:
    """No more stations must be hubs than the count allows."""
    settings = case.problem.settings
    name = "hubs" if settings.hubs is not None else "hubs_max"
    most = getattr(settings, name)
    must = [row.station for row in case.problem.stations if row.must_be_hub]
    if most is not None and len(must) > most and _hubs_in_force(case):
        what = f"at most {most}, but {len(must)} stations must be hubs ({', '.join(must[:5])})"
        yield from case.setting(name, what, f"raise {name}, or set must_be_hub = no for some")


def check_hub_and_spoke_has_candidate(case: Case) -> Iterator[Fault]:
    """hub-and-spoke needs a station that may be a hub."""
    settings = case.problem.settings
    if settings.structure != "hub-and-spoke" or not _hubs_in_force(case):
        return
    if not any(row.may_be_hub or row.must_be_hub for row in case.problem.stations):
        what = "hub-and-spoke, but no station may be a hub"
        yield from case.setting(
            "structure", what, "set may_be_hub = yes for the candidates in the stations table"
        )
    elif settings.hub_count[1] == 0:
        name = "hubs" if settings.hubs is not None else "hubs_max"
        yield from case.setting(
            f"{name} structure", "hub-and-spoke with 0 hubs can open no link", f"raise {name}"
        )


def check_unlimited_transfers(case: Case) -> Iterator[Fault]:
    """Unlimited transfers cannot be held to a circuity or to hours."""
    settings = case.problem.settings
    if settings.max_transfers != UNLIMITED:
        return
    for name in ("max_circuity", "max_hours"):
        if getattr(settings, name) is not None:
            what = f'"unlimited" cannot be held to {name} = {getattr(settings, name):g}'
            yield from case.setting(f"max_transfers {name}", what, f"write 0, 1 or 2, or remove {name}")
    limited = [i for i, row in enumerate(case.problem.demands) if row.max_hours is not None]
    if limited:
        what = f'"unlimited" cannot be held to max_hours, which {case.places.label("demand")} gives in '
        what += f"{case.where('demand', limited[0])}" + (
            f" and {len(limited) - 1} more" if limited[1:] else ""
        )
        yield from case.setting("max_transfers", what, "write 0, 1 or 2, or clear max_hours there")


def check_unlimited_revenue(case: Case) -> Iterator[Fault]:
    """A share of revenue kept per transfer needs a count of transfers, which "unlimited" ones lack."""
    settings = case.problem.settings
    if settings.max_transfers != UNLIMITED or settings.goal != "most-profit" or settings.single_allocation:
        return
    kept = [row.revenue_kept_per_transfer for row in case.problem.demands if row.volume > 0]
    if any((settings.revenue_kept_per_transfer if share is None else share) < 1.0 for share in kept):
        what = '"unlimited" under most-profit cannot count what each transfer takes from the revenue'
        cure = "write 0, 1 or 2, or keep revenue_kept_per_transfer at 1"
        yield from case.setting("max_transfers revenue_kept_per_transfer", what, cure)


def check_single_allocation_transfers(case: Case) -> Iterator[Fault]:
    """Single allocation travels o, a(o), a(d), d: two transfers where two hubs may open."""
    settings = case.problem.settings
    most = settings.hub_count[1]
    candidates = sum(row.may_be_hub or row.must_be_hub for row in case.problem.stations)
    if settings.allocation != "single" or settings.max_transfers not in (0, 1) or not _hubs_in_force(case):
        return
    if candidates >= 2 and (most is None or most >= 2):
        what = f"{settings.max_transfers} under single allocation, where two hubs may open"
        cure = "write 2 (or leave it out), allow one hub only, or use multiple allocation"
        yield from case.setting("max_transfers allocation", what, cure)


def check_fleet_settings(case: Case) -> Iterator[Fault]:
    """Frequencies and CO2 need a fleet."""
    if not case.no_fleet:
        return
    settings = case.problem.settings
    for name in ("min_frequency", "max_frequency", "co2_limit_tonnes"):
        if getattr(settings, name) is not None:
            what = f"{getattr(settings, name):g} needs a fleet, and there is no fleet table"
            yield from case.setting(name, what, "add the fleet table, or remove the setting")
    if settings.co2_price_per_tonne:
        what = f"{settings.co2_price_per_tonne:g} needs a fleet, and there is no fleet table"
        yield from case.setting("co2_price_per_tonne", what, "add the fleet table, or remove the setting")
    if settings.max_hours is not None:
        what = f"{settings.max_hours:g} h needs a fleet: without vehicle types there are no speeds"
        yield from case.setting("max_hours", what, "add the fleet table, or remove the setting")


def check_frequency_range(case: Case) -> Iterator[Fault]:
    """A whole number of departures lies between min_frequency (1 by default) and max_frequency."""
    settings = case.problem.settings
    if case.no_fleet or settings.max_frequency is None:
        return
    least = 1.0 if settings.min_frequency is None else settings.min_frequency
    if not whole_number_between(least, settings.max_frequency):
        default = " (the default)" if settings.min_frequency is None else ""
        what = (
            f"no whole number lies between min_frequency = {least:g}{default} and {settings.max_frequency:g}"
        )
        yield from case.setting("max_frequency min_frequency", what, "raise max_frequency")


def whole_number_between(low: float, high: float) -> bool:
    """Return whether a whole number lies in [low, high]."""
    return int(high // 1) >= low


def check_most_volume(case: Case) -> Iterator[Fault]:
    """most-volume has nothing to decide where all must be served."""
    settings = case.problem.settings
    if settings.goal == "most-volume" and settings.unserved == "forbidden":
        what = "most-volume with unserved = forbidden has nothing to decide"
        yield from case.setting("goal unserved", what, 'write unserved = "allowed", or another goal')


def check_least_cost_serves(case: Case) -> Iterator[Fault]:
    """least-cost with unserved allowed needs a cost of leaving volume, else nothing is carried."""
    settings = case.problem.settings
    if settings.goal != "least-cost" or settings.unserved != "allowed":
        return
    rows = [(i, row) for i, row in enumerate(case.problem.demands) if row.volume > 0 and row.min_share < 1]
    blank = [i for i, row in rows if row.unserved_cost is None]
    if settings.unserved_cost == 0 and blank:
        what = (
            f"0: least-cost with unserved = allowed would leave {len(blank):,} O-D rows unserved for nothing"
        )
        yield from case.setting(
            "unserved_cost goal unserved", what, 'set unserved_cost, or unserved = "forbidden"'
        )
    for i, row in rows:
        if row.unserved_cost == 0:
            what = "0: least-cost with unserved = allowed would leave it unserved for nothing"
            yield from case.row("demand", i, "unserved_cost volume", what, "give a cost, or leave it blank")


def check_listed_links_exist(case: Case) -> Iterator[Fault]:
    """links = "listed" needs links.csv."""
    empty = not case.problem.links and case.sure("links")
    if case.problem.settings.links == "listed" and empty:
        what = '"listed", but no links are listed, so that none could be operated'
        yield from case.setting("links", what, 'list links in the links table, or write links = "all"')


def check_local_volume_has_hub(case: Case) -> Iterator[Fault]:
    """Local volume via a hub needs a station that may be a hub."""
    if case.problem.settings.local_volume != "via-hub" or not _hubs_in_force(case):
        return
    if not any(row.may_be_hub or row.must_be_hub for row in case.problem.stations):
        what = "via-hub, but no station may be a hub"
        yield from case.setting(
            "local_volume", what, "set may_be_hub = yes for the candidates in the stations table"
        )


CHECKS = (
    check_hubs_beside_range,
    check_hubs_range,
    check_enough_candidates,
    check_must_hubs_fit,
    check_hub_and_spoke_has_candidate,
    check_unlimited_transfers,
    check_unlimited_revenue,
    check_single_allocation_transfers,
    check_fleet_settings,
    check_frequency_range,
    check_most_volume,
    check_least_cost_serves,
    check_listed_links_exist,
    check_local_volume_has_hub,
)
