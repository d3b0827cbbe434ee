"""A result as GIS files: GeoPackage, FlatGeobuf, KML, Shapefile or GeoJSON, by GDAL through pyogrio.

The layers are made from the result folder's own links.geojson and stations.geojson, so every format says the
same. Each design gives a layer of links and one of stations; a comparison gives those of each structure and a
layer of differences.
"""

from __future__ import annotations

import csv
import json
import re
import sqlite3
from collections.abc import Callable, Iterator
from contextlib import closing, contextmanager
from dataclasses import dataclass
from pathlib import Path
from types import ModuleType
from typing import Any

import numpy as np

from hubdesign.errors import ExtraMissingError, OutputError
from hubdesign.exports.folder import claim_target, read_manifest, repair
from hubdesign.exports.geojson import write_geojson
from hubdesign.exports.styles import Style, difference_style, link_style, station_style

#: Formats by the word a planner gives.
FORMATS = ("gpkg", "fgb", "kml", "shp", "geojson")
PACKAGE_NAME = "network.gpkg"

_FIXED_TIME = "2000-01-01T00:00:00.000Z"
_SHORT_NAME = 10  # what a dBASE field name can hold
_SHORT_TEXT = 254


@dataclass(frozen=True, slots=True)
class Layer:
    """A layer to write: GeoJSON features of one kind, and how they look."""

    name: str
    geometry: str
    features: list[dict[str, Any]]
    style: Style

    @property
    def fields(self) -> list[str]:
        """Names of the properties, in order."""
        return list(dict.fromkeys(name for feature in self.features for name in feature["properties"]))


def export_gis(outputs: str | Path, to: str, target: str | Path) -> tuple[str, ...]:
    """Write the maps of a result folder in the format `to` into a folder of their own.

    Parameters
    ----------
    outputs
        A result folder of a design or a comparison.
    to
        One of `FORMATS`.
    target
        Not there yet, empty, or an earlier export, which is replaced; not inside `outputs`.

    Returns
    -------
    tuple of str
        Names of the files written.

    Raises
    ------
    ExtraMissingError
        Where pyogrio is not installed.
    OutputError
        Where `outputs` is no result of ours, or the target cannot or must not be written.
    ValueError
        Where `to` is not a format.
    """
    if to not in FORMATS:
        raise ValueError(f"{to}: not a format; choose one of {', '.join(FORMATS)}")
    pyogrio = _import_pyogrio() if to != "geojson" else None
    repair(outputs)
    layers = read_layers(Path(outputs))
    with claim_target(target, outputs) as claim, claim.new_result("export") as folder:
        if pyogrio is None:
            for layer in layers:
                write_geojson(folder / f"{layer.name}.geojson", layer.features)
        else:
            try:
                with _fixed_time(pyogrio):
                    _WRITERS[to](pyogrio, folder, layers)
            except _write_errors(pyogrio) as error:
                raise OutputError(f"cannot be written as {to}: {error}") from error
        for layer in layers:
            (folder / f"{layer.name}.sld").write_text(layer.style.sld, encoding="utf-8", newline="\n")
    return tuple(read_manifest(claim.target).files)


def read_layers(outputs: Path) -> list[Layer]:
    """Return the layers of a result folder, stations above links."""
    kind = read_manifest(outputs).kind
    if kind == "design":
        return _design_layers(outputs, "")
    if kind != "comparison":
        raise OutputError(f"{outputs}: is an export itself; give the result folder it was made from")
    structures = [
        entry["structure"] for entry in _json(outputs / "comparison.json")["entries"] if entry["folder"]
    ]
    layers = [layer for name in structures for layer in _design_layers(outputs / name, f"_{_snake(name)}")]
    return [*layers, _difference_layer(structures, layers)]


def _design_layers(folder: Path, suffix: str) -> list[Layer]:
    links = _features(folder / "links.geojson")
    for feature in links:
        out, back = (feature["properties"].get(name) for name in ("volume_out", "volume_back"))
        feature["properties"]["volume"] = (out or 0.0) + (back or 0.0)
    most = max((feature["properties"]["volume"] for feature in links), default=0.0)
    names = f"links{suffix}", f"stations{suffix}"
    return [
        Layer(names[0], "MultiLineString", links, link_style(names[0], most)),
        Layer(names[1], "Point", _features(folder / "stations.geojson"), station_style(names[1])),
    ]


def _difference_layer(structures: list[str], layers: list[Layer]) -> Layer:
    """Return every link that any structure operates: in which, with what frequency and volume."""
    drawn: dict[str, dict[str, Any]] = {}
    told: dict[str, dict[str, dict[str, Any]]] = {}  # link -> structure -> figures
    for structure, layer in zip(structures, (x for x in layers if x.name.startswith("links"))):
        for feature in layer.features:
            drawn.setdefault(str(feature["id"]), feature)
            told.setdefault(str(feature["id"]), {})[structure] = feature["properties"]
    features = []
    for name, feature in drawn.items():
        row = {key: feature["properties"][key] for key in ("from", "to", "mode", "distance_km")}
        for structure in structures:
            own = told[name].get(structure, {})
            row[f"frequency_{_snake(structure)}"] = own.get("frequency")
            row[f"volume_{_snake(structure)}"] = own.get("volume")
        count = len(told[name])
        row["operated_in"] = " ".join(told[name])
        row["role"] = "all" if count == len(structures) else "one" if count == 1 else "some"
        row["volume"] = max(own["volume"] for own in told[name].values())
        features.append({**feature, "properties": row})
    most = max((feature["properties"]["volume"] for feature in features), default=0.0)
    return Layer("differences", "MultiLineString", features, difference_style("differences", most))


def _write_package(pyogrio: ModuleType, folder: Path, layers: list[Layer]) -> None:
    path = folder / PACKAGE_NAME
    for place, layer in enumerate(layers):
        # GDAL takes the layer's version option for the file when the file is made.
        options = {"dataset_options": {"VERSION": "1.3"}} if place == 0 else {"append": True}
        _write_layer(pyogrio, path, layer, "GPKG", layer.name, **options)
    _add_styles(path, layers)


def _write_flatgeobuf(pyogrio: ModuleType, folder: Path, layers: list[Layer]) -> None:
    for layer in layers:
        # The format's index takes no feature without a place.
        placed = all(feature["geometry"] is not None for feature in layer.features)
        options = {} if placed else {"layer_options": {"SPATIAL_INDEX": "NO"}}
        _write_layer(pyogrio, folder / f"{layer.name}.fgb", layer, "FlatGeobuf", layer.name, **options)


def _write_kml(pyogrio: ModuleType, folder: Path, layers: list[Layer]) -> None:
    for layer in layers:
        named = [_named_feature(layer, feature) for feature in layer.features]
        shown = Layer(layer.name, layer.geometry, named, layer.style)
        _write_layer(pyogrio, folder / f"{layer.name}.kml", shown, "KML", layer.name)


def _named_feature(layer: Layer, feature: dict[str, Any]) -> dict[str, Any]:
    """Return `feature` with a Name for the balloon of KML viewers."""
    told = feature["properties"]
    name = told["name"] if layer.geometry == "Point" else f"{told['from']} - {told['to']}"
    return {**feature, "properties": {"Name": name, **{k: v for k, v in told.items() if k != "name"}}}


def _write_shapefile(pyogrio: ModuleType, folder: Path, layers: list[Layer]) -> None:
    """Write shapefiles; dBASE names hold ten characters, so fields.csv tells what each stands for."""
    with open(folder / "fields.csv", "w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(["layer", "field", "stands_for"])
        for layer in layers:
            short = short_names(layer.fields)
            writer.writerows([layer.name, short[name], name] for name in layer.fields)
            features = [
                {**f, "properties": {short[k]: _short_text(v) for k, v in f["properties"].items()}}
                for f in layer.features
            ]
            shown = Layer(layer.name, layer.geometry, features, layer.style)
            options = {"layer_options": {"DBF_DATE_LAST_UPDATE": _FIXED_TIME[:10]}}
            _write_layer(
                pyogrio, folder / f"{layer.name}.shp", shown, "ESRI Shapefile", layer.name, **options
            )


_WRITERS: dict[str, Callable[[ModuleType, Path, list[Layer]], None]] = {
    "gpkg": _write_package,
    "fgb": _write_flatgeobuf,
    "kml": _write_kml,
    "shp": _write_shapefile,
}


def short_names(names: list[str]) -> dict[str, str]:
    """Return a name of at most ten characters for each of `names`, all different whatever their case."""
    taken: set[str] = set()
    result = {}
    for name in names:
        plain = re.sub(r"[^A-Za-z0-9_]", "_", name)
        parts = plain.split("_")
        short = (
            plain
            if len(plain) <= _SHORT_NAME
            else "_".join(part[:4] for part in parts)[:_SHORT_NAME].rstrip("_")
        )
        number = 1
        while short.lower() in taken:
            number += 1
            short = short[: _SHORT_NAME - len(str(number))].rstrip("_0123456789") + str(number)
        taken.add(short.lower())
        result[name] = short
    return result


def _short_text(value: Any) -> Any:
    if not isinstance(value, str):
        return value
    # Whole characters only: a dBASE field counts bytes.
    return value.encode("utf-8")[:_SHORT_TEXT].decode("utf-8", "ignore")


def _write_layer(
    pyogrio: ModuleType, path: Path, layer: Layer, driver: str, name: str, **options: Any
) -> None:
    import shapely
    from shapely.geometry import shape

    shapes = [None if f["geometry"] is None else shape(f["geometry"]) for f in layer.features]
    columns = [_column([f["properties"].get(field) for f in layer.features]) for field in layer.fields]
    pyogrio.raw.write(
        str(path),
        shapely.to_wkb(np.array(shapes, dtype=object)),
        [values for values, _ in columns],
        layer.fields,
        field_mask=[mask for _, mask in columns],
        layer=name,
        driver=driver,
        geometry_type=layer.geometry,
        promote_to_multi=layer.geometry.startswith("Multi"),
        crs="EPSG:4326",
        encoding="UTF-8",
        **options,
    )


def _column(cells: list[Any]) -> tuple[Any, Any]:
    """Return values and the mask of blanks; text where any cell is text, else whole or real numbers."""
    mask = np.array([cell is None for cell in cells], dtype=bool)
    known = [cell for cell in cells if cell is not None]
    if any(isinstance(cell, str) for cell in known) or not known:
        return np.array([None if cell is None else str(cell) for cell in cells], dtype=object), mask
    kind = np.int64 if all(isinstance(cell, int) for cell in known) else np.float64
    return np.array([0 if cell is None else cell for cell in cells], dtype=kind), mask


def _add_styles(path: Path, layers: list[Layer]) -> None:
    """Add the table of styles that a desktop GIS applies when it opens the package."""
    with closing(sqlite3.connect(path)) as connection, connection:
        connection.execute(
            "CREATE TABLE layer_styles (id INTEGER PRIMARY KEY AUTOINCREMENT NOT NULL,"
            " f_table_catalog TEXT(256), f_table_schema TEXT(256), f_table_name TEXT(256),"
            " f_geometry_column TEXT(256), styleName TEXT(30), styleQML TEXT, styleSLD TEXT,"
            " useAsDefault BOOLEAN, description TEXT, owner TEXT(30), ui TEXT(30),"
            " update_time DATETIME DEFAULT (strftime('%Y-%m-%dT%H:%M:%fZ','now')))"
        )
        connection.execute(
            "INSERT INTO gpkg_contents (table_name, data_type, identifier, description, last_change)"
            " VALUES ('layer_styles', 'attributes', 'layer_styles', 'styles of the layers', ?)",
            (_FIXED_TIME,),
        )
        for layer in layers:
            (column,) = connection.execute(
                "SELECT column_name FROM gpkg_geometry_columns WHERE table_name = ?", (layer.name,)
            ).fetchone()
            connection.execute(
                "INSERT INTO layer_styles (f_table_catalog, f_table_schema, f_table_name, f_geometry_column,"
                " styleName, styleQML, styleSLD, useAsDefault, description, owner, update_time)"
                " VALUES ('', '', ?, ?, ?, ?, ?, 1, ?, '', ?)",
                (
                    layer.name,
                    column,
                    layer.style.name,
                    layer.style.qml,
                    layer.style.sld,
                    layer.style.name,
                    _FIXED_TIME,
                ),
            )


@contextmanager
def _fixed_time(pyogrio: ModuleType) -> Iterator[None]:
    """Have GDAL write one date for "now", so that the same result gives the same bytes."""
    before = pyogrio.get_gdal_config_option("OGR_CURRENT_DATE")
    pyogrio.set_gdal_config_options({"OGR_CURRENT_DATE": _FIXED_TIME})
    try:
        yield
    finally:
        pyogrio.set_gdal_config_options({"OGR_CURRENT_DATE": before})


def _import_pyogrio() -> ModuleType:
    try:
        import pyogrio
        import pyogrio.errors
        import pyogrio.raw
    except ImportError as error:
        raise ExtraMissingError(
            "GIS formats other than geojson need pyogrio: install hubdesign with its gis extra,"
            " pip install 'hubdesign[gis]'"
        ) from error
    module: ModuleType = pyogrio
    return module


def _write_errors(pyogrio: ModuleType) -> tuple[type[Exception], ...]:
    """Return what GDAL and SQLite raise where a file cannot be written; none of it is an OSError."""
    names = ("DataSourceError", "DataLayerError", "FeatureError", "FieldError", "GeometryError")
    return (sqlite3.Error, *(getattr(pyogrio.errors, name) for name in names))


def _features(path: Path) -> list[dict[str, Any]]:
    features: list[dict[str, Any]] = _json(path)["features"]
    return features


def _json(path: Path) -> dict[str, Any]:
    try:
        told: dict[str, Any] = json.loads(path.read_bytes())
    except (OSError, ValueError) as error:
        raise OutputError(f"{path}: is missing or cannot be read") from error
    return told


def _snake(name: str) -> str:
    return name.replace("-", "_")
