"""Layer styles that a GIS finds in the ``layer_styles`` table and opens ready.

Each style is written twice: as QML, and as a Styled Layer Descriptor (OGC SLD
1.0.0) for software that reads the open standard.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from xml.etree import ElementTree as ET

from roaddisp.model import FloatArray
from roaddisp.outputs import palette

_SLD = "http://www.opengis.net/sld"
_OGC = "http://www.opengis.net/ogc"


@dataclass(frozen=True)
class Style:
    """The look of one layer, as the table stores it."""

    layer: str
    qml: str
    sld: str
    description: str


def _element(
    parent: ET.Element | None, tag: str, text: str | None = None, **attributes: str
) -> ET.Element:
    made = ET.Element(tag, attributes) if parent is None else ET.SubElement(parent, tag, attributes)
    made.text = text
    return made


# --- QML ------------------------------------------------------------------------


def _qml(renderer: ET.Element) -> str:
    root = _element(None, "qgis", version="3.28.0", styleCategories="Symbology")
    root.append(renderer)
    ET.indent(root, " ")
    doctype = "<!DOCTYPE qgis PUBLIC 'http://mrcc.com/qgis.dtd' 'SYSTEM'>\n"
    return doctype + ET.tostring(root, encoding="unicode") + "\n"


def _qml_symbol(
    parent: ET.Element, name: str, kind: str, layer_class: str, options: Mapping[str, str]
) -> None:
    symbol = _element(
        parent, "symbol", name=name, type=kind, alpha="1", clip_to_extent="1", force_rhr="0"
    )
    layer = _element(
        symbol, "layer", **{"class": layer_class, "enabled": "1", "locked": "0", "pass": "0"}
    )
    mapping = _element(layer, "Option", type="Map")
    for key, value in options.items():
        _element(mapping, "Option", name=key, type="QString", value=value)


def _rgba(code: str, alpha: int = 255) -> str:
    return ",".join(str(int(code[i : i + 2], 16)) for i in (1, 3, 5)) + f",{alpha}"


def _qml_single(kind: str, layer_class: str, options: Mapping[str, str]) -> str:
    renderer = _element(
        None, "renderer-v2", type="singleSymbol", symbollevels="0", enableorderby="0"
    )
    _qml_symbol(_element(renderer, "symbols"), "0", kind, layer_class, options)
    return _qml(renderer)


def _qml_graduated(column: str, limits: FloatArray, colours: Sequence[str]) -> str:
    renderer = _element(
        None,
        "renderer-v2",
        type="graduatedSymbol",
        attr=column,
        graduatedMethod="GraduatedColor",
        symbollevels="0",
        enableorderby="0",
    )
    ranges = _element(renderer, "ranges")
    symbols = _element(renderer, "symbols")
    for number, colour in enumerate(colours):
        low, high = _bounds(limits, number)
        _element(
            ranges,
            "range",
            symbol=str(number),
            lower=f"{low:.15f}",
            upper=f"{high:.15f}",
            label=_label(limits, number),
            render="true",
        )
        options = {
            "name": "circle",
            "color": _rgba(colour),
            "outline_color": _rgba(palette.INK, 140),
            "outline_style": "solid",
            "outline_width": "0.1",
            "outline_width_unit": "MM",
            "size": "2",
            "size_unit": "MM",
        }
        _qml_symbol(symbols, str(number), "marker", "SimpleMarker", options)
    return _qml(renderer)


def _bounds(limits: FloatArray, number: int) -> tuple[float, float]:
    """Limits of a class; the outermost classes take whatever lies beyond."""
    low = -1e9 if number == 0 else float(limits[number])
    high = 1e9 if number == len(limits) - 2 else float(limits[number + 1])
    return low, high


def _label(limits: FloatArray, number: int) -> str:
    low, high = limits[number], limits[number + 1]
    if len(limits) > 2 and number == 0:
        return f"up to {high:g}"
    if len(limits) > 2 and number == len(limits) - 2:
        return f"above {low:g}"
    return f"{low:g} to {high:g}"


# --- SLD ------------------------------------------------------------------------


def _sld_root(layer: str) -> tuple[ET.Element, ET.Element]:
    ET.register_namespace("sld", _SLD)
    ET.register_namespace("ogc", _OGC)
    root = _element(None, f"{{{_SLD}}}StyledLayerDescriptor", version="1.0.0")
    named = _element(root, f"{{{_SLD}}}NamedLayer")
    _element(named, f"{{{_SLD}}}Name", layer)
    user = _element(named, f"{{{_SLD}}}UserStyle")
    return root, _element(user, f"{{{_SLD}}}FeatureTypeStyle")


def _sld_text(root: ET.Element) -> str:
    ET.indent(root, " ")
    return ET.tostring(root, encoding="unicode") + "\n"


def _parameters(parent: ET.Element, tag: str, values: Mapping[str, str]) -> None:
    holder = _element(parent, f"{{{_SLD}}}{tag}")
    for name, value in values.items():
        _element(holder, f"{{{_SLD}}}CssParameter", value, name=name)


def _sld_shape(
    layer: str, symbolizer: str, fill: Mapping[str, str], stroke: Mapping[str, str]
) -> str:
    root, style = _sld_root(layer)
    rule = _element(style, f"{{{_SLD}}}Rule")
    shape = _element(rule, f"{{{_SLD}}}{symbolizer}")
    if fill:
        _parameters(shape, "Fill", fill)
    _parameters(shape, "Stroke", stroke)
    return _sld_text(root)


def _sld_graduated(layer: str, column: str, limits: FloatArray, colours: Sequence[str]) -> str:
    root, style = _sld_root(layer)
    for number, colour in enumerate(colours):
        low, high = _bounds(limits, number)
        rule = _element(style, f"{{{_SLD}}}Rule")
        _element(rule, f"{{{_SLD}}}Name", _label(limits, number))
        both = _element(_element(rule, f"{{{_OGC}}}Filter"), f"{{{_OGC}}}And")
        for test, limit in (
            ("PropertyIsGreaterThanOrEqualTo", low),
            ("PropertyIsLessThan", high),
        ):
            comparison = _element(both, f"{{{_OGC}}}{test}")
            _element(comparison, f"{{{_OGC}}}PropertyName", column)
            _element(comparison, f"{{{_OGC}}}Literal", f"{limit:.10g}")
        graphic = _element(_element(rule, f"{{{_SLD}}}PointSymbolizer"), f"{{{_SLD}}}Graphic")
        mark = _element(graphic, f"{{{_SLD}}}Mark")
        _element(mark, f"{{{_SLD}}}WellKnownName", "circle")
        _parameters(mark, "Fill", {"fill": colour})
        _parameters(mark, "Stroke", {"stroke": palette.INK, "stroke-width": "0.4"})
        _element(graphic, f"{{{_SLD}}}Size", "8")
    return _sld_text(root)


# --- the three layers -------------------------------------------------------------


def road_style() -> Style:
    """Roads as lines of one colour."""
    qml = _qml_single(
        "line",
        "SimpleLine",
        {
            "line_color": _rgba(palette.INK),
            "line_style": "solid",
            "line_width": "0.9",
            "line_width_unit": "MM",
            "capstyle": "flat",
            "joinstyle": "round",
        },
    )
    stroke = {"stroke": palette.INK, "stroke-width": "2.5"}
    return Style("roads", qml, _sld_shape("roads", "LineSymbolizer", {}, stroke), "Links")


def site_style() -> Style:
    """Sites as outlines with a light fill."""
    qml = _qml_single(
        "fill",
        "SimpleFill",
        {
            "color": _rgba(palette.SITE, 30),
            "style": "solid",
            "outline_color": _rgba(palette.SITE),
            "outline_style": "solid",
            "outline_width": "0.7",
            "outline_width_unit": "MM",
        },
    )
    fill = {"fill": palette.SITE, "fill-opacity": "0.12"}
    stroke = {"stroke": palette.SITE, "stroke-width": "2"}
    return Style("sites", qml, _sld_shape("sites", "PolygonSymbolizer", fill, stroke), "Sites")


def receptor_style(column: str, unit: str, values: FloatArray) -> Style:
    """Receptors coloured by a column, in round classes.

    Parameters
    ----------
    column, unit : str
    values : (R,)
        What the classes are to cover.
    """
    limits = palette.levels(values, 7)
    last = max(len(limits) - 2, 1)
    colours = [palette.shade(number / last) for number in range(len(limits) - 1)]
    return Style(
        "receptors",
        _qml_graduated(column, limits, colours),
        _sld_graduated("receptors", column, limits, colours),
        f"{column} [{unit}]",
    )
