"""GIS exports, read back by the system's GDAL (another build than the one that writes) and by sqlite3."""

from __future__ import annotations

import json
import shutil
import sqlite3
import subprocess
import sys
import xml.dom.minidom
from contextlib import closing
from itertools import chain, pairwise
from pathlib import Path
from typing import Any

import pytest

from hubdesign.errors import ExtraMissingError, OutputError
from hubdesign.exports.folder import changed_files, read_manifest
from hubdesign.exports.gis import FORMATS, export_gis, short_names
from hubdesign.exports.styles import volume_classes
from hubdesign.exports.write import write_comparison, write_design
from tests.exports.cases import (
    HOSTILE,
    INPUTS,
    comparison_of,
    hand_result,
    hostile_result,
    placeless_result,
    solved_result,
)

pytest.importorskip("pyogrio", reason="pyogrio is not installed (the gis extra)")
needs_gdal = pytest.mark.skipif(
    shutil.which("ogr2ogr") is None, reason="no ogr2ogr command: gdal-bin is not installed"
)
FILES = {"gpkg": "network.gpkg", "fgb": "{}.fgb", "kml": "{}.kml", "shp": "{}.shp", "geojson": "{}.geojson"}


@pytest.fixture(scope="module")
def home(tmp_path_factory: pytest.TempPathFactory) -> Path:
    place = tmp_path_factory.mktemp("gis")
    write_design(solved_result(), place / "design", INPUTS)
    write_design(hostile_result(4), place / "hostile", INPUTS)
    write_design(hand_result(), place / "hand", INPUTS)
    write_comparison(comparison_of(), place / "comparison", INPUTS)
    return place


def by_gdal(path: Path, layer: str) -> list[dict[str, Any]]:
    """Return the features of a layer as GDAL's own command reads them."""
    done = subprocess.run(
        ["ogr2ogr", "-f", "GeoJSON", "-lco", "COORDINATE_PRECISION=9", "/vsistdout/", str(path), layer],
        capture_output=True,
        check=True,
    )
    return json.loads(done.stdout)["features"]  # type: ignore[no-any-return]


def written(folder: Path, name: str) -> list[dict[str, Any]]:
    return json.loads((folder / f"{name}.geojson").read_text("utf-8"))["features"]  # type: ignore[no-any-return]


def in_order(features: list[dict[str, Any]], like: list[dict[str, Any]], *keys: str) -> list[dict[str, Any]]:
    """Return `features` in the order of `like`: FlatGeobuf sorts them along its spatial index."""
    found = {tuple(feature["properties"][key] for key in keys): feature for feature in features}
    assert len(found) == len(features) == len(like)
    return [found[tuple(feature["properties"][key] for key in keys)] for feature in like]


def parts_of(geometry: dict[str, Any]) -> list[list[list[float]]]:
    coordinates = geometry["coordinates"]
    return coordinates if geometry["type"] == "MultiLineString" else [coordinates]


@needs_gdal
@pytest.mark.parametrize("to", FORMATS)
def test_every_format_reads_back_with_its_counts_figures_and_ends(
    home: Path, tmp_path: Path, to: str
) -> None:
    export_gis(home / "design", to, tmp_path / to)
    places = {
        f["properties"]["station"]: f["geometry"]["coordinates"] for f in written(home / "design", "stations")
    }
    wanted = written(home / "design", "links")
    links = in_order(by_gdal(tmp_path / to / FILES[to].format("links"), "links"), wanted, "from", "to")
    assert len(wanted) > 5
    short = short_names([*wanted[0]["properties"], "volume"]) if to == "shp" else {}
    crossing = 0
    for link, original in zip(links, wanted, strict=True):
        for name, value in original["properties"].items():
            read = link["properties"][short.get(name, name)]
            if isinstance(value, str) or value is None:
                assert read == value
            else:
                assert float(read) == pytest.approx(value, rel=1e-12, abs=1e-9)
        parts = parts_of(link["geometry"])
        crossing += len(parts) > 1
        drawn = parts_of(original["geometry"])
        assert [len(part) for part in parts] == [len(part) for part in drawn]
        for read, meant in zip(chain(*parts), chain(*drawn)):
            assert read[:2] == pytest.approx(meant, abs=1e-9)
        assert parts[0][0][:2] == pytest.approx(places[original["properties"]["from"]], abs=1e-9)
        assert parts[-1][-1][:2] == pytest.approx(places[original["properties"]["to"]], abs=1e-9)
        assert all(abs(b[0] - a[0]) < 180.0 for part in parts for a, b in pairwise(part))
    assert crossing > 0
    stations = by_gdal(tmp_path / to / FILES[to].format("stations"), "stations")
    name = short.get("name", "Name" if to == "kml" else "name")
    assert sorted(f["properties"]["station"] for f in stations) == sorted(places)
    assert all(f["properties"][name] for f in stations)


@pytest.mark.parametrize("to", FORMATS)
@pytest.mark.parametrize("case", ["design", "comparison"])
def test_the_same_result_exports_to_the_same_bytes(home: Path, tmp_path: Path, to: str, case: str) -> None:
    names = [export_gis(home / case, to, tmp_path / place) for place in ("a", "b")]
    assert names[0] == names[1]
    for name in names[0]:
        assert (tmp_path / "a" / name).read_bytes() == (tmp_path / "b" / name).read_bytes(), name
    assert changed_files(tmp_path / "a") == []
    assert read_manifest(tmp_path / "a").kind == "export"


@needs_gdal
@pytest.mark.parametrize("to", FORMATS)
def test_hostile_names_read_back_as_they_were(home: Path, tmp_path: Path, to: str) -> None:
    export_gis(home / "hostile", to, tmp_path / to)
    stations = by_gdal(tmp_path / to / FILES[to].format("stations"), "stations")
    stations = in_order(stations, written(home / "hostile", "stations"), "station")
    names = [f["properties"]["Name" if to == "kml" else "name"] for f in stations]
    wanted = [*HOSTILE[4:], *HOSTILE[:4]][: len(names)]
    if to == "shp":
        wanted = [name.encode()[:254].decode("utf-8", "ignore") for name in wanted]  # what dBASE can hold
    assert names == wanted
    assert [f["properties"]["station"] for f in stations][:2] == ["=1+1", "<b>&"]
    for sheet in (tmp_path / to).glob("*.sld"):
        xml.dom.minidom.parse(str(sheet))


def test_a_geopackage_is_version_1_3_and_holds_its_own_styles(home: Path, tmp_path: Path) -> None:
    export_gis(home / "design", "gpkg", tmp_path / "out")
    with closing(sqlite3.connect(tmp_path / "out" / "network.gpkg")) as package:
        assert package.execute("PRAGMA user_version").fetchone() == (10300,)
        assert package.execute("PRAGMA integrity_check").fetchone() == ("ok",)
        contents = package.execute(
            "SELECT table_name, data_type, srs_id, last_change FROM gpkg_contents"
        ).fetchall()
        assert [row[:2] for row in contents] == [
            ("links", "features"),
            ("stations", "features"),
            ("layer_styles", "attributes"),
        ]
        assert {row[2] for row in contents[:2]} == {4326}
        assert {row[3] for row in contents} == {"2000-01-01T00:00:00.000Z"}
        styles = package.execute(
            "SELECT f_table_name, f_geometry_column, styleQML, styleSLD, useAsDefault FROM layer_styles"
        ).fetchall()
    assert [row[0] for row in styles] == ["links", "stations"]
    for layer, column, qml, sld, default in styles:
        assert column == "geom"
        assert default == 1
        assert sld == (tmp_path / "out" / f"{layer}.sld").read_text("utf-8")
        for text in (qml, sld):
            xml.dom.minidom.parseString(text.encode())
    assert "scale_linear" in styles[0][2]
    assert "hub-spoke" in styles[0][3]


@needs_gdal
def test_every_link_falls_in_exactly_one_rule_of_its_style(home: Path, tmp_path: Path) -> None:
    export_gis(home / "design", "gpkg", tmp_path / "out")
    links = by_gdal(tmp_path / "out" / "network.gpkg", "links")
    text = (tmp_path / "out" / "links.sld").read_text("utf-8")
    rules = xml.dom.minidom.parseString(text.encode()).getElementsByTagName("Rule")
    limits = []
    for rule in rules:
        literals = {
            node.parentNode.tagName: node.firstChild.nodeValue
            for node in rule.getElementsByTagName("ogc:Literal")
        }
        limits.append(
            (
                literals["ogc:PropertyIsEqualTo"],
                float(literals["ogc:PropertyIsGreaterThanOrEqualTo"]),
                float(literals.get("ogc:PropertyIsLessThan", "inf")),
            )
        )
    assert len(limits) == 15
    for link in links:
        told = link["properties"]
        assert sum(told["role"] == role and low <= told["volume"] < high for role, low, high in limits) == 1


@needs_gdal
@pytest.mark.parametrize("to", FORMATS)
def test_what_has_no_place_keeps_its_row(home: Path, tmp_path: Path, to: str) -> None:
    write_design(placeless_result(), tmp_path / "design", INPUTS)
    export_gis(tmp_path / "design", to, tmp_path / to)
    for layer, count in (("stations", 2), ("links", 1)):
        features = by_gdal(tmp_path / to / FILES[to].format(layer), layer)
        assert [feature["geometry"] for feature in features] == [None] * count


def test_classes_of_volume_leave_no_gap() -> None:
    classes = volume_classes(100.0)
    assert classes[0][0] == 0.0
    assert classes[-1][1] == float("inf")
    assert all(a[1] == b[0] for a, b in pairwise(classes))


@needs_gdal
def test_a_comparison_has_a_layer_for_each_structure_and_one_of_differences(
    home: Path, tmp_path: Path
) -> None:
    export_gis(home / "comparison", "gpkg", tmp_path / "out")
    package = tmp_path / "out" / "network.gpkg"
    volumes: dict[str, dict[str, float]] = {}
    for structure in ("point-to-point", "hub-and-spoke", "mixed"):
        layer = f"links_{structure.replace('-', '_')}"
        assert len(by_gdal(package, f"stations_{structure.replace('-', '_')}")) == 6
        for link in by_gdal(package, layer):
            told = link["properties"]
            volumes.setdefault(f"{told['from']} {told['to']}", {})[structure] = told["volume"]
    differences = by_gdal(package, "differences")
    assert len(differences) == len(volumes)
    for link in differences:
        told = link["properties"]
        own = volumes[f"{told['from']} {told['to']}"]
        assert told["operated_in"].split() == list(own)
        assert told["role"] == {1: "one", 2: "some", 3: "all"}[len(own)]
        for structure in ("point-to-point", "hub-and-spoke", "mixed"):
            assert told[f"volume_{structure.replace('-', '_')}"] == pytest.approx(own.get(structure))
    assert len({link["properties"]["role"] for link in differences}) > 1


def test_shapefile_fields_are_told_in_a_table(home: Path, tmp_path: Path) -> None:
    export_gis(home / "design", "shp", tmp_path / "out")
    lines = (tmp_path / "out" / "fields.csv").read_text("utf-8").splitlines()
    assert "links,load_fact,load_factor_out" in lines
    assert lines[0] == "layer,field,stands_for"


def test_short_names_are_short_and_differ_whatever_their_case() -> None:
    names = [f"frequency_vehicle{i}" for i in range(30)] + [
        "Volume",
        "volume",
        "load_factor_out",
        "load_factor_back",
    ]
    short = short_names(names)
    assert all(0 < len(name) <= 10 and name.isascii() for name in short.values())
    assert len({name.lower() for name in short.values()}) == len(names)


def test_an_export_replaces_only_an_export_and_never_goes_into_the_result(home: Path, tmp_path: Path) -> None:
    export_gis(home / "hand", "fgb", tmp_path / "out")
    export_gis(home / "hand", "kml", tmp_path / "out")
    assert not list((tmp_path / "out").glob("*.fgb"))
    with pytest.raises(OutputError, match="lies inside the inputs"):
        export_gis(home / "hand", "kml", home / "hand" / "maps")
    with pytest.raises(OutputError, match="is an export itself"):
        export_gis(tmp_path / "out", "kml", tmp_path / "again")
    with pytest.raises(OutputError, match="not a result"):
        export_gis(tmp_path, "kml", tmp_path.parent / "elsewhere")
    with pytest.raises(ValueError, match="not a format"):
        export_gis(home / "hand", "dxf", tmp_path / "again")


def test_without_pyogrio_the_extra_is_named_and_geojson_still_works(
    home: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setitem(sys.modules, "pyogrio", None)
    with pytest.raises(ExtraMissingError, match=r"pip install 'hubdesign\[gis\]'"):
        export_gis(home / "hand", "gpkg", tmp_path / "out")
    assert not (tmp_path / "out").exists()
    assert "links.geojson" in export_gis(home / "hand", "geojson", tmp_path / "out")


def test_a_fault_of_gdal_is_said_and_leaves_the_old_export(
    home: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    pyogrio = pytest.importorskip("pyogrio")
    export_gis(home / "hand", "gpkg", tmp_path / "out")

    def fail(*_args: Any, **_kwargs: Any) -> None:
        raise pyogrio.errors.DataSourceError("disk I/O error")

    monkeypatch.setattr(pyogrio.raw, "write", fail)
    with pytest.raises(OutputError, match=r"out: cannot be written as gpkg: disk I/O error"):
        export_gis(home / "hand", "gpkg", tmp_path / "out")
    assert changed_files(tmp_path / "out") == []
