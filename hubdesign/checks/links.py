"""Rules of the links table and of today's network."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from hubdesign.checks.findings import nearest, some
from hubdesign.checks.lengths import link_km
from hubdesign.checks.places import Case
from hubdesign.checks.references import unknown_code
from hubdesign.checks.settings import whole_number_between
from hubdesign.errors import Fault
from hubdesign.problem import CurrentLink, ListedLink


def check_link_stations(case: Case) -> Iterator[Fault]:
    """The ends of a link are two stations."""
    for table in ("links", "current"):
        rows: Sequence[ListedLink | CurrentLink] = (
            case.problem.links if table == "links" else case.problem.current
        )
        for i, row in enumerate(rows):
            for column, code in (("from", row.from_), ("to", row.to)):
                yield from unknown_code(case, table, i, column, code, "stations")
            if row.from_ == row.to:
                what = f"from and to are both {row.from_}"
                yield from case.row(table, i, "to from", what, "a link joins two stations; remove the row")


def check_link_repeats(case: Case) -> Iterator[Fault]:
    """A pair and mode stands once, or as two opposite one-way rows."""
    seen: dict[tuple[frozenset[str], str], list[int]] = {}
    for i, row in enumerate(case.problem.links):
        if row.from_ == row.to:
            continue
        rows = seen.setdefault((frozenset((row.from_, row.to)), row.mode), [])
        for earlier in rows:
            other = case.problem.links[earlier]
            if row.direction == other.direction == "one-way" and row.from_ != other.from_:
                continue
            place = case.where("links", earlier)
            if row.direction != other.direction:
                what = f"stands beside {place}: {other.direction} and {row.direction} of one pair and mode"
                cure = "keep the both-way row, or write two one-way rows"
            else:
                what, cure = f"repeats {place} (the pair {row.from_}-{row.to}, {row.mode})", "keep one"
            yield from case.row("links", i, "from to mode direction", what, cure)
            break
        rows.append(i)


def check_link_vehicles(case: Case) -> Iterator[Fault]:
    """The vehicles of a link are types of its mode."""
    types = {row.vehicle: row for row in case.problem.vehicles}
    for i, row in enumerate(case.problem.links):
        if row.vehicles and case.no_fleet:
            what = "names vehicle types, and there is no fleet table"
            yield from case.row("links", i, "vehicles", what, "add the fleet table, or clear the cell")
            continue
        for name in row.vehicles or ():
            yield from unknown_code(case, "links", i, "vehicles", name, "fleet")
            if name in types and types[name].mode != row.mode and case.sure("fleet", "mode"):
                what = f"{name} is a type of mode {types[name].mode}, the link's mode is {row.mode}"
                yield from case.row("links", i, "vehicles mode", what, "name types of the link's mode")


def check_link_capacity(case: Case) -> Iterator[Fault]:
    """Capacities of links are for cases without a fleet, frequencies for cases with one."""
    for i, row in enumerate(case.problem.links):
        if row.capacity is not None and not case.no_fleet:
            what = f"{row.capacity:g} stands where there is a fleet: the vehicles give the capacity"
            yield from case.row("links", i, "capacity", what, "clear it, or limit max_frequency")
        for name in ("min_frequency", "max_frequency"):
            if getattr(row, name) is not None and case.no_fleet:
                what = f"{getattr(row, name):g} needs a fleet, and there is no fleet table"
                yield from case.row("links", i, name, what, "add the fleet table, or clear the cell")


def check_link_frequencies(case: Case) -> Iterator[Fault]:
    """A whole number of departures lies between a link's least and most."""
    if case.no_fleet:
        return
    settings = case.problem.settings
    standard = 1.0 if settings.min_frequency is None else settings.min_frequency
    for i, row in enumerate(case.problem.links):
        if row.min_frequency is None and row.max_frequency is None:
            continue
        least = standard if row.min_frequency is None else row.min_frequency
        most = settings.max_frequency if row.max_frequency is None else row.max_frequency
        if most is not None and row.decision != "never" and not whole_number_between(least, most):
            column = "min_frequency" if row.max_frequency is None else "max_frequency"
            other = (
                ""
                if row.min_frequency is not None and row.max_frequency is not None
                else ", one from the settings"
            )
            what = (
                f"no whole number lies between min_frequency = {least:g} and max_frequency = {most:g}{other}"
            )
            cure = 'write a range that can be flown, or decision = "never"'
            yield from case.row("links", i, f"{column} min_frequency max_frequency", what, cure)


def check_must_links_served(case: Case) -> Iterator[Fault]:
    """A link that must be operated can be: stations, mode, range and types allow it."""
    for i, row in enumerate(case.problem.links):
        if row.decision != "must" or {row.from_, row.to} - case.station_codes or row.from_ == row.to:
            continue
        why = _why_not_served(case, row)
        if why:
            cure = 'change that, or write decision = "may"'
            columns = "decision from to mode vehicles distance_km"
            yield from case.row("links", i, columns, f"must be operated, but {why}", cure)


def _why_not_served(case: Case, row: ListedLink) -> str:
    """Return why no vehicle can serve a link, "" where one can (or where the fleet is at fault)."""
    problem = case.problem
    for station in problem.stations:
        if (
            station.station in (row.from_, row.to)
            and station.modes is not None
            and row.mode not in station.modes
        ):
            return f"{station.station} is not served by {row.mode} (its modes: {' '.join(station.modes)})"
    if case.no_fleet or not case.sure("fleet", "mode range_km available"):
        return ""
    if not case.sure("stations", "lat lon") and row.distance_km is None:
        return ""
    types = [v for v in problem.vehicles if v.mode == row.mode]
    if not types:
        return f"no vehicle type has the mode {row.mode}"
    if row.vehicles is not None:
        types = [v for v in types if v.vehicle in row.vehicles]
    types = [v for v in types if v.available != 0]
    length = link_km(problem, row)
    if not types or length is None:
        return "" if types else "of the types allowed none is available"
    longest = max(float("inf") if v.range_km is None else v.range_km for v in types)
    if length <= longest:
        return ""
    return f"no vehicle allowed can serve it: {length:,.0f} km long, longest range {longest:,.0f} km"


def check_must_links_touch_hub(case: Case) -> Iterator[Fault]:
    """In hub-and-spoke a link that must be operated touches a station that may be a hub."""
    problem = case.problem
    if problem.settings.structure != "hub-and-spoke" or not case.sure("stations", "may_be_hub must_be_hub"):
        return
    candidates = {row.station for row in problem.stations if row.may_be_hub or row.must_be_hub}
    for i, row in enumerate(problem.links):
        if row.decision == "must" and not {row.from_, row.to} & candidates and candidates:
            what = (
                "must be operated, but neither end may be a hub, and in hub-and-spoke every link touches one"
            )
            yield from case.row(
                "links", i, "decision from to", what, "let an end be a hub, or change the decision"
            )


def check_current_vehicles(case: Case) -> Iterator[Fault]:
    """Today's links name a type and a frequency where there is a fleet, and neither without one."""
    for i, row in enumerate(case.problem.current):
        if case.no_fleet:
            for name in ("vehicle", "frequency"):
                if getattr(row, name) is not None:
                    what = f"{getattr(row, name)} needs a fleet, and there is no fleet table"
                    yield from case.row("current", i, name, what, "add the fleet table, or clear the cell")
            continue
        if row.vehicle is None:
            yield from case.row("current", i, "vehicle", "is blank", "name the type that serves it")
        else:
            yield from unknown_code(case, "current", i, "vehicle", row.vehicle, "fleet")
        if row.frequency is None:
            yield from case.row("current", i, "frequency", "is blank", "give its departures each way")


def check_current_repeats(case: Case) -> Iterator[Fault]:
    """A link of today stands once a type; the way back is a row of its own on one-way links only."""
    one_way = {(row.from_, row.to) for row in case.problem.links if row.direction == "one-way"}
    seen: dict[tuple[str, str, str | None], int] = {}
    for i, row in enumerate(case.problem.current):
        ends = (row.from_, row.to)
        if not {ends, ends[::-1]} & one_way:
            ends = (min(ends), max(ends))
        earlier = seen.setdefault((*ends, row.vehicle), i)
        if earlier != i:
            place = case.where("current", earlier)
            back = case.problem.current[earlier].from_ != row.from_
            what = f"repeats {place}" + (", whose frequency counts each way" if back else "")
            yield from case.row("current", i, "from to vehicle", what, "keep one row a link and type")


def check_current_modes(case: Case) -> Iterator[Fault]:
    """Without a fleet the mode of today's links must be plain: that of the pair's row in links.csv."""
    modes = {row.mode for row in case.problem.links}
    listed = {frozenset((row.from_, row.to)) for row in case.problem.links}
    if not case.no_fleet or len(modes) < 2:
        return
    for i, row in enumerate(case.problem.current):
        if frozenset((row.from_, row.to)) not in listed and row.from_ != row.to:
            label = case.places.label("links")
            what = f"has no row in {label}, so that its mode ({some(sorted(modes))}) is open"
            yield from case.row("current", i, "from to", what, "list the link")


def check_modes_known(case: Case) -> Iterator[Fault]:
    """A [mode.NAME] section names a mode that is used somewhere."""
    problem = case.problem
    used = {row.mode for row in problem.vehicles} | {row.mode for row in problem.links}
    used |= {mode for row in problem.stations for mode in row.modes or ()}
    if not all(case.sure(table, "mode modes") for table in ("stations", "fleet", "links")):
        return
    for mode, _ in problem.settings.mode_distance_factor:
        if mode not in used and not case.no_fleet:
            where = f"{case.places.label('settings')} [mode.{mode}]"
            cure = nearest(mode, used) or "remove it"
            yield Fault(where, f"no vehicle type, link or station has the mode {mode}", cure)


CHECKS = (
    check_link_stations,
    check_link_repeats,
    check_link_vehicles,
    check_link_capacity,
    check_link_frequencies,
    check_must_links_served,
    check_must_links_touch_hub,
    check_current_vehicles,
    check_current_repeats,
    check_current_modes,
    check_modes_known,
)
