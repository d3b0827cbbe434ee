"""Published instances as input folders, so that they run through the same commands as any case.

One function a family. The files themselves are not part of the project (see :func:`bench_folder`).
"""

from __future__ import annotations

import csv
import math
import os
import random
from collections.abc import Iterable, Sequence
from pathlib import Path

Matrix = Sequence[Sequence[float]]


def bench_folder() -> Path | None:
    """Return the folder of published instances: HUBDESIGN_BENCH, else ../shared/bench; None if absent."""
    given = os.environ.get("HUBDESIGN_BENCH")
    folder = Path(given) if given else Path(__file__).resolve().parents[2].parent / "shared" / "bench"
    return folder if folder.is_dir() else None


def convert_cab(
    source: Path,
    out: Path,
    n: int,
    *,
    p: int | None = None,
    hub_cost: float | None = None,
    alpha: float = 1.0,
    allocation: str = "multiple",
) -> Path:
    """Write the first `n` cities of a CAB file as an input folder and return it.

    O'Kelly 1987 (EJOR 32:393-404): flows are shares of their sum, cost = share x (d_ik + alpha d_km + d_mj)
    + `hub_cost` a hub. Give `p` or `hub_cost`. Distances are miles; the column says km.
    """
    numbers = [float(word) for word in source.read_text().split()]
    size = int(numbers[0])
    flows, lengths = ([numbers[1 + block + i * size :][:n] for i in range(n)] for block in (0, size * size))
    total = math.fsum(map(math.fsum, flows))
    volumes = [[value / total for value in row] for row in flows]
    cost = [hub_cost or 0.0] * n
    return _write_hub_case(out, lengths, volumes, cost, None, p, (1.0, alpha, 1.0), allocation)


def convert_ap(
    source: Path,
    out: Path,
    *,
    p: int | None = None,
    hub_costs: Path | None = None,
    capacities: Path | None = None,
    allocation: str = "multiple",
) -> Path:
    """Write an AP file as an input folder and return it.

    Ernst and Krishnamoorthy 1996 (Location Science 4:139-154), 1999 (Annals of OR 86:141-159) for
    capacities: cost = flow x (3 d_ik + 0.75 d_km + 2 d_mj) / 1000 with the file's own three factors, flows
    from a station to itself included; `hub_costs` in units of that cost, `capacities` on volume collected.
    """
    numbers = [float(word) for word in source.read_text().split()]
    n = int(numbers[0])
    xy = [(numbers[1 + 2 * i], numbers[2 + 2 * i]) for i in range(n)]
    lengths = [[math.dist(a, b) / 1000.0 for b in xy] for a in xy]
    volumes = [numbers[1 + 2 * n + i * n :][:n] for i in range(n)]
    collection, transfer, distribution = numbers[2 + 2 * n + n * n :][:3]
    cost = [float(word) for word in hub_costs.read_text().split()] if hub_costs else [0.0] * n
    limit = [float(word) for word in capacities.read_text().split()] if capacities else None
    factors = (collection, transfer, distribution)
    return _write_hub_case(out, lengths, volumes, cost, limit, p, factors, allocation)


def make_ap_kind(out: Path, n: int, seed: int, hubs: int | str, allocation: str = "multiple") -> Path:
    """Write an invented instance of the AP kind and return its folder.

    Clustered points in a square of 60 units, gravity flows that are not symmetric and have a diagonal, the
    three AP factors; `hubs` is their number, or "loose" / "tight" for hub costs (tight ones grow with the
    station's volume, as FcostT do).
    """
    rng = random.Random(seed)
    centres = [(rng.uniform(0, 60), rng.uniform(0, 60)) for _ in range(max(3, n // 12))]
    xy = []
    for _ in range(n):
        x, y = rng.choice(centres)
        xy.append((x + rng.gauss(0, 4), y + rng.gauss(0, 4)))
    lengths = [[math.dist(a, b) for b in xy] for a in xy]
    sent = [rng.lognormvariate(0, 1) for _ in range(n)]
    drawn = [size * rng.lognormvariate(0, 0.4) for size in sent]
    pull = [[sent[i] * drawn[j] / math.sqrt(lengths[i][j] + 3.0) for j in range(n)] for i in range(n)]
    total = math.fsum(map(math.fsum, pull))
    volumes = [[10_000.0 * value / total for value in row] for row in pull]
    load = [math.fsum(row) for row in volumes]
    cost = [0.0] * n
    if isinstance(hubs, str):
        cost = [rng.uniform(80_000.0, 140_000.0) for _ in range(n)]
        if hubs == "tight":
            cost = [value * (1.0 + 2.0 * size / max(load)) for value, size in zip(cost, load)]
    p = hubs if isinstance(hubs, int) else None
    return _write_hub_case(out, lengths, volumes, cost, None, p, (3.0, 0.75, 2.0), allocation)


def convert_canad(source: Path, out: Path) -> Path:
    """Write a canad file (.dow) as an input folder and return it.

    Crainic, Frangioni and Gendron 2001 (Discrete Applied Mathematics 112:73-99): a title; nodes, arcs,
    commodities; an arc a line (from, to, unit cost, capacity, fixed cost, two unused figures); a commodity a
    line (origin, destination, demand). Arcs are one-way (a repeated pair becomes a mode of its own), volume
    may pass through every node; commodities of one pair are added up, since they may be split anyway.
    """
    words = source.read_text().split("\n", 1)[1].split()
    nodes, arcs, commodities = (int(word) for word in words[:3])
    arc = [words[3 + 7 * i :][:7] for i in range(arcs)]
    rest = words[3 + 7 * arcs :]
    demand = [rest[3 * i :][:3] for i in range(commodities)]
    volumes: dict[tuple[str, str], float] = {}
    for origin, destination, volume in demand:
        volumes[origin, destination] = volumes.get((origin, destination), 0.0) + float(volume)
    ways: dict[tuple[str, str], int] = {}
    mode = []
    for row in arc:
        ways[row[0], row[1]] = ways.get((row[0], row[1]), 0) + 1
        mode.append(f"way{ways[row[0], row[1]]}")
    out.mkdir(parents=True, exist_ok=True)
    _write(out / "stations.csv", ["station", "may_be_hub"], ([f"N{i + 1}", "yes"] for i in range(nodes)))
    _write(
        out / "links.csv",
        ["from", "to", "mode", "direction", "distance_km", "unit_cost", "capacity", "fixed_cost"],
        ([f"N{a[0]}", f"N{a[1]}", way, "one-way", 1, a[2], a[3], a[4]] for a, way in zip(arc, mode)),
    )
    _write(
        out / "demand.csv",
        ["origin", "destination", "volume"],
        ([f"N{o}", f"N{d}", volume] for (o, d), volume in volumes.items()),
    )
    settings = [
        "[network]",
        'structure = "mixed"',
        'max_transfers = "unlimited"',
        'links = "listed"',
        "[goal]",
        'goal = "least-cost"',
        "[solve]",
        "gap = 0.0",
        "threads = 1",
    ]
    (out / "settings.toml").write_text("\n".join(settings) + "\n")
    return out


def _write_hub_case(
    out: Path,
    lengths: Matrix,
    volumes: Matrix,
    hub_cost: Sequence[float],
    capacity: Sequence[float] | None,
    p: int | None,
    factors: tuple[float, float, float],
    allocation: str,
) -> Path:
    out.mkdir(parents=True, exist_ok=True)
    n = len(lengths)
    names = [f"S{i + 1:03d}" for i in range(n)]
    limits: Iterable[object] = [""] * n if capacity is None else capacity
    _write(
        out / "stations.csv",
        ["station", "may_be_hub", "hub_fixed_cost", "collection_capacity"],
        ([name, "yes", cost, limit] for name, cost, limit in zip(names, hub_cost, limits)),
    )
    _write(
        out / "links.csv",
        ["from", "to", "distance_km"],
        ([names[i], names[j], lengths[i][j]] for i in range(n) for j in range(i + 1, n)),
    )
    _write(
        out / "demand.csv",
        ["origin", "destination", "volume"],
        ([names[i], names[j], volumes[i][j]] for i in range(n) for j in range(n) if volumes[i][j] > 0),
    )
    local = any(volumes[i][i] > 0 for i in range(n))
    settings = [
        "[network]",
        'structure = "hub-and-spoke"',
        f'allocation = "{allocation}"',
        'links = "listed"',
        f'local_volume = "{"via-hub" if local else "refuse"}"',
        *([] if p is None else [f"hubs = {p}"]),
        "[cost]",
        "unit_cost_per_km = 1.0",
        *(
            f"{name}_factor = {value!r}"
            for name, value in zip(("collection", "transfer", "distribution"), factors)
        ),
        "[goal]",
        'goal = "least-cost"',
        "[solve]",
        "gap = 0.0",
        "threads = 1",
    ]
    (out / "settings.toml").write_text("\n".join(settings) + "\n")
    return out


def _write(path: Path, header: list[str], rows: Iterable[list[object]]) -> None:
    with path.open("w", newline="") as stream:
        writer = csv.writer(stream)
        writer.writerow(header)
        writer.writerows(rows)
