"""How exported layers look in a desktop GIS: one drawing, told as SLD (OGC 02-070, version 1.0.0) and as QML.

Links are coloured by role (dark between hubs, mid to a hub, warm for a nonstop) and as wide as their volume;
stations are large and dark as hubs, small and light as spokes, grey where not served. The three line colours
also differ in lightness, so the map survives a black-and-white print.
"""

from __future__ import annotations

from dataclasses import dataclass
from xml.sax.saxutils import escape, quoteattr

#: value of the field -> (label, colour)
LINK_ROLES = {
    "hub-hub": ("between hubs", "#12394f"),
    "hub-spoke": ("to or from a hub", "#3f88a3"),
    "nonstop": ("between stations that are no hubs", "#d98032"),
}
STATION_ROLES = {
    "hub": ("hub", "#12394f", 5.0),
    "spoke": ("spoke", "#ffffff", 2.8),
    "not served": ("not served", "#a5a5a5", 1.8),
}
DIFFERENCE_ROLES = {
    "all": ("operated in every structure", "#8d9499"),
    "some": ("operated in some structures", "#3f88a3"),
    "one": ("operated in one structure only", "#d98032"),
}
_OUTLINE = "#12394f"
_WIDTHS_MM = (0.3, 0.6, 1.0, 1.6, 2.4)
_PIXELS_PER_MM = 3.78  # 96 dots per inch


@dataclass(frozen=True, slots=True)
class Style:
    """A style of one layer in both languages, and its name."""

    name: str
    sld: str
    qml: str


def link_style(layer: str, most_volume: float) -> Style:
    """Return the style of links: colour by `role`, width by `volume` up to `most_volume`."""
    return Style(
        "links by volume and role",
        _line_sld(layer, LINK_ROLES, most_volume),
        _line_qml(LINK_ROLES, most_volume),
    )


def difference_style(layer: str, most_volume: float) -> Style:
    """Return the style of the differences: colour by how many structures operate the link."""
    roles = DIFFERENCE_ROLES
    return Style("links by structures", _line_sld(layer, roles, most_volume), _line_qml(roles, most_volume))


def station_style(layer: str) -> Style:
    """Return the style of stations by `role`, labelled with their code."""
    return Style("stations by role", _point_sld(layer), _point_qml())


def volume_classes(most_volume: float) -> list[tuple[float, float, float]]:
    """Return (least volume, volume below, width in mm) of each class of equal steps; the last has no end."""
    step = most_volume / len(_WIDTHS_MM)
    edges = [step * place for place in range(len(_WIDTHS_MM))] + [float("inf")]
    return list(zip(edges, edges[1:], _WIDTHS_MM))


def _line_sld(layer: str, roles: dict[str, tuple[str, str]], most_volume: float) -> str:
    rules = []
    for value, (label, colour) in roles.items():
        for low, high, width in (
            volume_classes(most_volume) if most_volume > 0 else [(0.0, float("inf"), 0.6)]
        ):
            bounds = f"{low:,.0f} and more" if high == float("inf") else f"{low:,.0f} to {high:,.0f}"
            limits = _compared("PropertyIsGreaterThanOrEqualTo", "volume", repr(low))
            if high != float("inf"):
                limits += _compared("PropertyIsLessThan", "volume", repr(high))
            condition = f"<ogc:And>{_compared('PropertyIsEqualTo', 'role', value)}{limits}</ogc:And>"
            line = (
                "<LineSymbolizer><Stroke>"
                f"{_css('stroke', colour)}{_css('stroke-width', f'{width * _PIXELS_PER_MM:.2f}')}"
                f"{_css('stroke-opacity', '0.85')}{_css('stroke-linecap', 'round')}"
                "</Stroke></LineSymbolizer>"
            )
            rules.append(_rule(f"{label}, volume {bounds}", condition, line))
    return _sld(layer, rules)


def _point_sld(layer: str) -> str:
    rules = []
    for value, (label, colour, size) in STATION_ROLES.items():
        mark = (
            "<PointSymbolizer><Graphic><Mark><WellKnownName>circle</WellKnownName>"
            f"<Fill>{_css('fill', colour)}</Fill>"
            f"<Stroke>{_css('stroke', _OUTLINE)}{_css('stroke-width', '1')}</Stroke>"
            f"</Mark><Size>{size * _PIXELS_PER_MM:.1f}</Size></Graphic></PointSymbolizer>"
        )
        text = (
            "<TextSymbolizer><Label><ogc:PropertyName>station</ogc:PropertyName></Label>"
            f"<Font>{_css('font-size', '11')}</Font>"
            "<LabelPlacement><PointPlacement><Displacement><DisplacementX>7</DisplacementX>"
            "<DisplacementY>5</DisplacementY></Displacement></PointPlacement></LabelPlacement>"
            f"<Halo><Radius>1</Radius><Fill>{_css('fill', '#ffffff')}</Fill></Halo>"
            f"<Fill>{_css('fill', '#222222')}</Fill></TextSymbolizer>"
        )
        rules.append(_rule(label, _compared("PropertyIsEqualTo", "role", value), mark + text))
    return _sld(layer, rules)


def _sld(layer: str, rules: list[str]) -> str:
    body = "\n".join(rules)
    return (
        '<?xml version="1.0" encoding="UTF-8"?>\n'
        '<StyledLayerDescriptor version="1.0.0" xmlns="http://www.opengis.net/sld"'
        ' xmlns:ogc="http://www.opengis.net/ogc">\n'
        f"<NamedLayer><Name>{escape(layer)}</Name><UserStyle><FeatureTypeStyle>\n"
        f"{body}\n</FeatureTypeStyle></UserStyle></NamedLayer>\n</StyledLayerDescriptor>\n"
    )


def _rule(title: str, condition: str, symbols: str) -> str:
    return (
        f"<Rule><Name>{escape(title)}</Name><Title>{escape(title)}</Title>"
        f"<ogc:Filter>{condition}</ogc:Filter>{symbols}</Rule>"
    )


def _compared(how: str, field: str, value: str) -> str:
    return (
        f"<ogc:{how}><ogc:PropertyName>{field}</ogc:PropertyName>"
        f"<ogc:Literal>{escape(value)}</ogc:Literal></ogc:{how}>"
    )


def _css(name: str, value: str) -> str:
    return f'<CssParameter name="{name}">{value}</CssParameter>'


def _line_qml(roles: dict[str, tuple[str, str]], most_volume: float) -> str:
    width = "0.6"
    if most_volume > 0:
        width = f'scale_linear("volume", 0, {most_volume!r}, {_WIDTHS_MM[0]}, {_WIDTHS_MM[-1]})'
    symbols = []
    for place, (_, colour) in enumerate(roles.values()):
        options = {
            "line_color": _rgba(colour),
            "line_width": "0.6",
            "line_width_unit": "MM",
            "capstyle": "round",
        }
        by_volume = _data_defined("outlineWidth", width)
        symbols.append(_symbol("line", place, "SimpleLine", options, by_volume, 0.85))
    return _qml({value: label for value, (label, _) in roles.items()}, symbols, "")


def _point_qml() -> str:
    symbols = []
    for place, (_, colour, size) in enumerate(STATION_ROLES.values()):
        options = {
            "name": "circle",
            "color": _rgba(colour),
            "outline_color": _rgba(_OUTLINE),
            "outline_width": "0.3",
            "size": repr(size),
            "size_unit": "MM",
        }
        symbols.append(_symbol("marker", place, "SimpleMarker", options, "", 1.0))
    labels = (
        '<labeling type="simple"><settings calloutType="simple"><text-style fieldName="station"'
        ' isExpression="0" fontSize="8" fontSizeUnit="Point" textColor="34,34,34,255">'
        '<text-buffer bufferDraw="1" bufferSize="0.6" bufferSizeUnits="MM" bufferColor="255,255,255,255"/>'
        '</text-style><placement placement="6" dist="1.8" distUnits="MM"/></settings></labeling>'
    )
    return _qml({value: label for value, (label, _, _) in STATION_ROLES.items()}, symbols, labels)


def _qml(labels: dict[str, str], symbols: list[str], labelling: str) -> str:
    categories = "\n".join(
        f'<category value={quoteattr(value)} label={quoteattr(label)} symbol="{place}" render="true"/>'
        for place, (value, label) in enumerate(labels.items())
    )
    body = "\n".join(symbols)
    return (
        "<!DOCTYPE qgis PUBLIC 'http://mrcc.com/qgis.dtd' 'SYSTEM'>\n"
        '<qgis version="3.22.0" styleCategories="Symbology|Labeling"'
        f' labelsEnabled="{1 if labelling else 0}">\n'
        '<renderer-v2 type="categorizedSymbol" attr="role" symbollevels="0" enableorderby="0"'
        ' forceraster="0">\n'
        f"<categories>\n{categories}\n</categories>\n<symbols>\n{body}\n</symbols>\n</renderer-v2>\n"
        f"{labelling}</qgis>\n"
    )


def _symbol(
    kind: str, place: int, drawn_as: str, options: dict[str, str], data_defined: str, opacity: float
) -> str:
    told = "".join(
        f'<Option type="QString" name="{name}" value="{value}"/>' for name, value in options.items()
    )
    # Older readers know <prop> only.
    props = "".join(f'<prop k="{name}" v="{value}"/>' for name, value in options.items())
    return (
        f'<symbol type="{kind}" name="{place}" alpha="{opacity}" clip_to_extent="1" force_rhr="0">'
        f'<layer class="{drawn_as}" enabled="1" pass="0" locked="0"><Option type="Map">{told}</Option>{props}'
        f"{data_defined}</layer></symbol>"
    )


def _data_defined(name: str, expression: str) -> str:
    return (
        '<data_defined_properties><Option type="Map"><Option type="QString" name="name" value=""/>'
        f'<Option type="Map" name="properties"><Option type="Map" name="{name}">'
        '<Option type="bool" name="active" value="true"/>'
        f'<Option type="QString" name="expression" value={quoteattr(expression)}/>'
        '<Option type="int" name="type" value="3"/></Option></Option>'
        '<Option type="QString" name="type" value="collection"/></Option></data_defined_properties>'
    )


def _rgba(colour: str) -> str:
    parts = [int(colour[place : place + 2], 16) for place in (1, 3, 5)]
    return ",".join(map(str, [*parts, 255]))
