"""Whatever the bytes, reading ends in a Problem or in faults, never in another exception."""

from __future__ import annotations

import tempfile
from pathlib import Path

from hypothesis import given, settings
from hypothesis import strategies as st

from hubdesign.inputs import check
from tests.inputs.broken import SOUND

_CELLS = st.one_of(
    st.sampled_from(
        ["", "AAL", "BRO", "yes", "no", "-1", "0", "1e400", "nan", '"', "1,5", "both", "air", "must", "A/B"]
    ),
    st.text(max_size=6),
    st.floats().map(str),
)
_HEADERS = {
    "stations.csv": "station,lat,lon,may_be_hub,must_be_hub,hub_capacity,modes,max_links,max_departures",
    "demand.csv": "origin,destination,volume,revenue,min_share,max_hours,unserved_cost",
    "fleet.csv": "vehicle,mode,capacity,range_km,speed_kmh,available,owned,hours_per_vehicle,fuel_kg_per_km",
    "links.csv": "from,to,mode,direction,distance_km,decision,min_frequency,max_frequency,vehicles,capacity",
    "current.csv": "from,to,vehicle,frequency",
    "demand_matrix.csv": "origin,AAL,BRO",
}


def _check(files: dict[str, bytes]) -> None:
    with tempfile.TemporaryDirectory() as place:
        for name, data in files.items():
            (Path(place) / name).write_bytes(data)
        report = check(place)
        assert (report.problem is None) == bool(report.faults)
        assert all(fault.where and fault.what and fault.rule for fault in report.faults)


@settings(max_examples=60, deadline=None)
@given(st.sampled_from([*SOUND, "fleet.csv", "links.csv"]), st.binary(max_size=200))
def test_random_bytes_in_a_file_are_read_or_refused(name: str, data: bytes) -> None:
    _check({**{file: text.encode() for file, text in SOUND.items()}, name: data})


@settings(max_examples=150, deadline=None)
@given(st.sampled_from(list(_HEADERS)), st.lists(st.lists(_CELLS, min_size=9, max_size=9), max_size=4))
def test_random_cells_in_a_table_are_read_or_refused(name: str, rows: list[list[str]]) -> None:
    width = _HEADERS[name].count(",") + 1
    text = "\n".join([_HEADERS[name], *(",".join(row[:width]) for row in rows)])
    _check({**{file: sound.encode() for file, sound in SOUND.items()}, name: text.encode(errors="replace")})


@settings(max_examples=80, deadline=None)
@given(
    st.dictionaries(
        st.sampled_from(["hubs", "hubs_max", "max_transfers", "max_hours", "links", "title", "structure"]),
        st.one_of(
            st.integers(),
            st.floats(),
            st.booleans(),
            st.sampled_from(['"unlimited"', '"mixed"', '"listed"', "[1]", "1979-05-27", "1e400"]),
        ),
        max_size=4,
    )
)
def test_random_settings_are_read_or_refused(values: dict[str, object]) -> None:
    words = {True: "true", False: "false"}
    lines = [
        f"{name} = {words[value] if isinstance(value, bool) else value}" for name, value in values.items()
    ]
    _check(
        {
            **{file: text.encode() for file, text in SOUND.items()},
            "settings.toml": "\n".join(["[network]", *lines]).encode(),
        }
    )
