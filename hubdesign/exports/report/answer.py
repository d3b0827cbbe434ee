"""The answer in plain sentences: what to operate, what it costs or earns, how far that is proven."""

from __future__ import annotations

import math
from collections.abc import Sequence

from markupsafe import Markup, escape

from hubdesign.comparison import Comparison, Difference, Entry
from hubdesign.exports.report.words import (
    Format,
    decimals_of,
    goal_unit,
    say_count,
    say_number,
    say_share,
)
from hubdesign.problem import Problem, Settings
from hubdesign.results import Results
from hubdesign.run import Result

_HUBS_NAMED = 8

STRUCTURES = {
    "point-to-point": "point-to-point",
    "hub-and-spoke": "hub-and-spoke",
    "mixed": "mixed",
    "current": "today's network",
}


def say_isolated(text: str) -> Markup:
    """Return text from the inputs, escaped, its direction of writing kept to itself."""
    return escape(text) if text.isascii() else Markup("<bdi>{}</bdi>").format(text)


def join_words(words: Sequence[Markup | str]) -> Markup:
    """Return "a, b and c"."""
    parts = [escape(word) for word in words]
    if len(parts) < 2:
        return Markup("").join(parts)
    return Markup(", ").join(parts[:-1]) + Markup(" and ") + parts[-1]


def money_per_period(settings: Settings) -> Markup:
    """Return "USD per week"."""
    return Markup("{} per {}").format(say_isolated(settings.currency), say_isolated(settings.period))


def volume_per_period(settings: Settings) -> Markup:
    """Return "passengers per week"."""
    return Markup("{} per {}").format(say_isolated(settings.volume_unit), say_isolated(settings.period))


def headline(result: Result, results: Results) -> Markup:
    """Return the answer of a design in one sentence."""
    verb = "Today's network runs" if result.problem.settings.structure == "current" else "Operate"
    return Markup("{} {} with {}: the plan {}{}.").format(
        verb,
        say_count(len(results.links.rows), "link"),
        _say_hubs(results),
        goal_words(result, results),
        _within(result, results),
    )


def _within(result: Result, results: Results) -> str:
    """Return how far that is proven, in a few words; blank for today's network."""
    gap = results.answer["gap"]
    if gap is None or result.problem.settings.structure == "current":
        return ""
    return ", and no plan is better" if gap == 0.0 else f", proven within {say_share(gap)} of the best"


def goal_words(result: Result, results: Results) -> Markup:
    """Return what the plan earns, costs or carries."""
    settings, costs = result.problem.settings, results.costs
    money = money_per_period(settings)
    if settings.goal == "most-profit":
        profit = costs["profit"]
        verb = "earns" if profit >= 0.0 else "loses"
        return Markup("{} {} {}").format(verb, say_number(abs(profit)), money)
    if settings.goal == "most-volume":
        carried = say_number(float(results.totals["volume_carried"] or 0.0))
        return Markup("carries {} {} at a cost of {} {}").format(
            carried, volume_per_period(settings), say_number(costs["total"]), money
        )
    return Markup("costs {} {}").format(say_number(costs["total"]), money)


def answer_points(result: Result, results: Results) -> list[tuple[str, Markup]]:
    """Return (topic, sentences) under the headline of a design."""
    points = [("Operate", _say_operation(results))]
    points.append(("Money", _say_money(result, results)))
    points.append(("Volume", _say_volume(result.problem.settings, results)))
    points.append(("Proof", say_proof(result, results)))
    return points


def _say_hubs(results: Results) -> Markup:
    hubs = [row for row in results.stations.records() if row["role"] == "hub"]
    if not hubs:
        return Markup("no hub")
    names = [
        say_isolated(str(row["station"]))
        if row["name"] == row["station"]
        else Markup("{} ({})").format(say_isolated(_cut(str(row["name"]))), say_isolated(str(row["station"])))
        for row in hubs[:_HUBS_NAMED]
    ]
    if len(hubs) > _HUBS_NAMED:
        names.append(Markup("{} more").format(len(hubs) - _HUBS_NAMED))
    word = "one hub," if len(hubs) == 1 else f"{len(hubs)} hubs,"
    return Markup("{} {}").format(word, join_words(names))


def _cut(name: str, longest: int = 40) -> str:
    return name if len(name) <= longest else name[: longest - 1] + "…"


def _say_operation(results: Results) -> Markup:
    totals = results.totals
    served = sum(row["role"] != "not served" for row in results.stations.records())
    links, stations = len(results.links.rows), len(results.stations.rows)
    text = Markup("{} {} {} of {}.").format(
        say_count(links, "open link"),
        "reaches" if links == 1 else "reach",
        served,
        say_count(stations, "station"),
    )
    if totals["departures"] is not None:
        types = [
            Markup("{} {}").format(int(row["used"] or 0), say_isolated(str(row["vehicle"])))
            for row in results.vehicles.records()
            if row["used"]
        ]
        departures = Markup(" {} in all, {} block hours").format(
            say_count(int(totals["departures"]), "departure"), say_number(float(totals["block_hours"] or 0.0))
        )
        fleet = Markup(", flown or driven by {}").format(join_words(types)) if types else Markup("")
        text += departures + fleet + Markup(".")
    return text


def _say_money(result: Result, results: Results) -> Markup:
    settings, costs = result.problem.settings, results.costs
    money = money_per_period(settings)
    text = Markup("Total cost {} {}").format(say_number(costs["total"]), money)
    if costs["revenue"]:
        kind = "a profit" if costs["profit"] >= 0.0 else "a loss"
        text += Markup("; revenue kept {}; {} of {}").format(
            say_number(costs["revenue"]), kind, say_number(abs(costs["profit"]))
        )
    text += Markup(".")
    if results.investment["total"]:
        text += Markup(" One-off investment {} {}.").format(
            say_number(results.investment["total"]), say_isolated(settings.currency)
        )
    return text


def _say_volume(settings: Settings, results: Results) -> Markup:
    totals = results.totals
    carried, demanded = float(totals["volume_carried"] or 0.0), float(totals["volume_demanded"] or 0.0)
    unserved = float(totals["volume_unserved"] or 0.0)
    text = Markup("Carries {} of {} {}").format(
        say_number(carried), say_number(demanded), volume_per_period(settings)
    )
    if totals["share_served"] is not None:
        text += Markup(" ({})").format(say_share(float(totals["share_served"])))
    text += Markup("; {} unserved.").format(f"{say_number(unserved)} left" if unserved else "nothing is left")
    if totals["nonstop_share"] is not None:
        text += Markup(" {} of it travels nonstop.").format(say_share(float(totals["nonstop_share"])))
    return text


def say_proof(result: Result, results: Results) -> Markup:
    """Return how far the plan is proven, in money (or volume) and as shares."""
    settings, answer = result.problem.settings, results.answer
    if settings.structure == "current" and result.gap == 0.0:
        return Markup("What is operated today, with the best itineraries on it; nothing is redesigned.")
    bound, gap = answer["bound"], answer["gap"]
    if bound is None:
        return Markup("No bound is known: how much better another plan could be is not proven.")
    unit = Markup("{} per {}").format(say_isolated(goal_unit(settings)), say_isolated(settings.period))
    verb = {
        "least-cost": "costs less than",
        "most-profit": "earns more than",
        "most-volume": "carries more than",
    }
    limit = Markup("No plan that obeys these rules {} {} {}").format(
        verb[settings.goal], say_bound(bound, settings.goal != "least-cost"), unit
    )
    if gap == 0.0:
        return limit + Markup(": no plan is better (gap 0 %).")
    text = limit + Markup(": at most {} better than this one").format(say_number(answer["difference"]))
    shares = [Markup("gap {}").format(say_share(gap))] if gap is not None else []
    if answer["difference_share"] is not None and settings.goal == "most-profit":
        shares.append(
            Markup("{} of {}").format(say_share(answer["difference_share"]), answer["difference_share_of"])
        )
    text += Markup(" ({}). ").format(Markup("; ").join(shares)) if shares else Markup(". ")
    asked = say_share(settings.gap)
    if answer["status"] == "proven":
        return text + Markup("Proven within the {} asked.").format(asked)
    return text + Markup("The {} asked was not reached: a better plan may exist, within that bound.").format(
        asked
    )


def say_bound(value: float, maximise: bool) -> str:
    """Return a bound rounded outward, so that what is written is still proven."""
    decimals = decimals_of(abs(value))
    if abs(value) and not 1e-9 < abs(value) < 1e15:
        return say_number(value)
    factor = 10.0**decimals
    rounded = (math.ceil if maximise else math.floor)(round(value * factor, 6)) / factor
    return Format(0 if float(rounded).is_integer() else decimals)(rounded)


def comparison_headline(comparison: Comparison, results: dict[str, Results]) -> Markup:
    """Return in one sentence which structure is best on these inputs and whether that is decided."""
    ranked = ranked_entries(comparison)
    if not ranked:
        return Markup("No structure answers the question asked of all; see what each of them can do below.")
    best = ranked[0]
    assert best.result is not None
    told = Markup("{} with {} and {}: it {}").format(
        _capital(STRUCTURES[best.structure]),
        say_count(len(results[best.structure].links.rows), "link"),
        _say_hubs(results[best.structure]),
        goal_words(best.result, results[best.structure]),
    )
    if len(ranked) == 1:
        return told + Markup(". It is the only one that answers the question.")
    beaten = [row for row in ranked[1:] if _proven_better(comparison, best, row)]
    if len(beaten) == len(ranked) - 1:
        return told + Markup(", proven better than every other structure.")
    open_ = [Markup(STRUCTURES[row.structure]) for row in ranked[1:] if row not in beaten]
    return told + Markup(", the best plan found; against {} that is not decided at this gap.").format(
        join_words(open_)
    )


def ranked_entries(comparison: Comparison) -> list[Entry]:
    """Return the comparable entries, best plan first."""
    told = [entry for entry in comparison.entries if entry.interval is not None]
    sign = -1.0 if comparison.maximise else 1.0

    def objective(entry: Entry) -> float:
        assert entry.result is not None
        assert entry.result.design.objective is not None
        return sign * entry.result.design.objective

    return sorted(told, key=objective)


def _proven_better(comparison: Comparison, best: Entry, other: Entry) -> bool:
    for row in comparison.differences:
        if {row.first, row.second} == {best.structure, other.structure}:
            return row.better(comparison.maximise) == best.structure
    return False


def say_difference(difference: Difference, comparison: Comparison) -> Markup:
    """Return what the proven interval of a difference says."""
    settings = comparison.problem.settings
    unit = Markup("{} per {}").format(say_isolated(goal_unit(settings)), say_isolated(settings.period))
    better = difference.better(comparison.maximise)
    if better is None:
        return Markup(
            "{} against {}: not decided at this gap; the difference lies between {} and {} {}."
        ).format(
            _capital(STRUCTURES[difference.first]),
            STRUCTURES[difference.second],
            say_number(difference.low),
            say_number(difference.high),
            unit,
        )
    worse = difference.second if better == difference.first else difference.first
    low, high = sorted((abs(difference.low), abs(difference.high)))
    verb = {"least-cost": "saves", "most-profit": "earns", "most-volume": "carries"}[settings.goal]
    than = "against" if settings.goal == "least-cost" else "more than"
    return Markup("{} {} between {} and {} {} {} {}: decided.").format(
        _capital(STRUCTURES[better]), verb, say_number(low), say_number(high), unit, than, STRUCTURES[worse]
    )


def say_entry(entry: Entry, results: Results | None) -> Markup:
    """Return one structure's answer in a sentence or two."""
    if results is None or entry.result is None:
        return Markup("No design: {}.").format(say_isolated(entry.note or entry.status.value))
    text = Markup("{}, {}: it {}. ").format(
        say_count(len(results.links.rows), "link"), _say_hubs(results), goal_words(entry.result, results)
    )
    if not entry.comparable:
        return text + say_isolated(entry.note[:1].upper() + entry.note[1:] + ".")
    return text + say_proof(entry.result, results)


def _capital(text: str) -> str:
    return text[:1].upper() + text[1:]


def missing_places(problem: Problem) -> Markup:
    """Return a sentence on stations that no map can show; blank where there is none."""
    missing = [row.station for row in problem.stations if row.lat is None or row.lon is None]
    if not missing:
        return Markup("")
    shown = [say_isolated(code) for code in missing[:12]]
    if len(missing) > 12:
        shown.append(Markup("{} more").format(len(missing) - 12))
    return Markup("Without coordinates, so not on the map: {}.").format(join_words(shown))
