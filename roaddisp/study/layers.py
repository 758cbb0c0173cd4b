"""Vector layers: four formats, opened only where the content is what the name says."""

from __future__ import annotations

import warnings
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any, Final

import numpy as np

from roaddisp.study.problems import Problems, listed, nearest
from roaddisp.study.raw import RawTable

FORMATS: Final = {
    ".gpkg": (b"SQLite format 3\x00", "GeoPackage", "GPKG"),
    ".geojson": (b"{", "GeoJSON", "GeoJSON"),
    ".json": (b"{", "GeoJSON", "GeoJSON"),
    ".shp": (b"\x00\x00\x27\x0a", "Shapefile", "ESRI Shapefile"),
    ".fgb": (b"fgb\x03", "FlatGeobuf", "FlatGeobuf"),
}
"""By file ending: the first bytes, the name people use, the name of the driver."""

FORMAT_NAMES: Final = "GeoPackage (.gpkg), GeoJSON (.geojson), Shapefile (.shp), FlatGeobuf (.fgb)"


def is_vector(name: str) -> bool:
    """Whether a file name ends as one of the vector formats."""
    return Path(name).suffix.lower() in FORMATS


def companions(path: Path) -> list[Path]:
    """List the files that make up a layer: a Shapefile has several."""
    if path.suffix.lower() != ".shp":
        return [path]
    wanted = {".shx", ".dbf", ".prj", ".cpg"}
    beside = [
        other
        for other in path.parent.iterdir()
        if other.stem == path.stem and other.suffix.lower() in wanted
    ]
    return [path, *sorted(beside)]


def read_layer(path: Path, name: str, layer: str | None, problems: Problems) -> RawTable | None:
    """Read a vector layer; note what is wrong and return None where it cannot be read.

    Parameters
    ----------
    path : Path
    name : str
        The file as the study names it.
    layer : str or None
        None for the only layer there is.
    """
    if not _content_fits(path, name, problems):
        return None
    try:
        with _quiet(problems, name):
            return _read(path, name, layer, problems)
    except _errors() as error:
        problems.error(
            f"the file cannot be read ({_first_line(error)})",
            file=name,
            allowed=FORMAT_NAMES,
            mend="look whether it was copied whole, and opens in a GIS",
        )
        return None


def _errors() -> tuple[type[Exception], ...]:
    import pyogrio.errors
    import shapely.errors

    return (
        pyogrio.errors.DataSourceError,
        pyogrio.errors.DataLayerError,
        pyogrio.errors.CRSError,
        pyogrio.errors.FeatureError,
        pyogrio.errors.FieldError,
        pyogrio.errors.GeometryError,
        shapely.errors.ShapelyError,
        OSError,
        RuntimeError,
        ValueError,
        OverflowError,
        MemoryError,
    )


def _first_line(error: Exception) -> str:
    return (str(error).strip().splitlines() or [type(error).__name__])[0]


@contextmanager
def _quiet(problems: Problems, name: str) -> Iterator[None]:
    """Turn warnings of the reading library into cautions."""
    with warnings.catch_warnings(record=True) as said:
        warnings.simplefilter("always")
        yield
    for warning in said:
        problems.caution(
            f"the reading library says: {_first_line(Exception(warning.message))}",
            file=name,
            mend="look whether the file is sound",
        )


def _content_fits(path: Path, name: str, problems: Problems) -> bool:
    suffix = path.suffix.lower()
    if suffix not in FORMATS:
        problems.error(
            "not a vector format that is read",
            file=name,
            value=suffix or "no ending",
            allowed=FORMAT_NAMES,
            mend="export the layer to one of them",
        )
        return False
    start, called, _ = FORMATS[suffix]
    with path.open("rb") as stream:
        head = stream.read(4096)
    plain = head.removeprefix(b"\xef\xbb\xbf").lstrip() if start == b"{" else head
    if not plain.startswith(start):
        problems.error(
            f"the content is not that of a {called} file",
            file=name,
            value=repr(head[:16]),
            allowed=FORMAT_NAMES,
            mend="look whether the file is damaged, or has another format than its name says",
        )
        return False
    if suffix == ".shp":
        have = {each.suffix.lower() for each in companions(path)}
        inside = path.parent.resolve()
        away = [each for each in companions(path) if not each.resolve().is_relative_to(inside)]
        lacking = sorted({".dbf", ".shx"} - have)
        if lacking or away:
            problems.error(
                "the files of a Shapefile belong together",
                file=name,
                value=f"missing {', '.join(lacking)}" if lacking else "a link out of the folder",
                allowed=".shp, .shx, .dbf and .prj side by side",
                mend="copy all of them",
            )
            return False
    return True


def _read(path: Path, name: str, layer: str | None, problems: Problems) -> RawTable | None:
    import pyogrio
    import pyogrio.raw

    layers = [str(each) for each in pyogrio.list_layers(path)[:, 0]]
    if not layers:
        problems.error("the file has no layer", file=name, allowed="a file with a layer")
        return None
    if layer is None and len(layers) > 1:
        problems.error(
            "the file has several layers",
            file=name,
            value=listed(layers),
            allowed="one, named by the key `layer`",
            mend=f'write layer = "{layers[0]}", or another of them, in study.toml',
        )
        return None
    if layer is not None and layer not in layers:
        near = nearest(layer, layers)
        problems.error(
            "the file has no such layer",
            file=name,
            value=layer,
            allowed=listed(layers),
            mend=f"did you mean {near!r}?" if near else "name one of them",
        )
        return None
    layer = layers[0] if layer is None else layer
    driver = str(pyogrio.read_info(path, layer=layer)["driver"])
    if driver != FORMATS[path.suffix.lower()][2]:
        problems.error(
            "the content is of another format",
            file=name,
            value=driver,
            allowed=FORMAT_NAMES,
            mend="export the layer to one of them",
        )
        return None
    meta, _, geometry, fields = pyogrio.raw.read(path, layer=layer, force_2d=True)
    if geometry is None:
        problems.error(
            "the layer has no geometry",
            file=name,
            place=f"layer {layer!r}",
            allowed="a layer of features",
            mend="name a layer of features by the key `layer`",
        )
        return None
    if len(geometry) == 0:
        problems.error(
            "the layer has no features",
            file=name,
            place=f"layer {layer!r}",
            allowed="at least one feature",
        )
        return None
    names = tuple(str(field) for field in meta["fields"])
    cells = tuple(_cells(values) for values in fields)
    return RawTable(name, layer, names, cells, (), geometry=geometry, crs=meta["crs"])


def _cells(values: Any) -> list[Any]:
    """Take a field as plain values; None where a feature has none."""
    if np.issubdtype(values.dtype, np.datetime64):
        return [None if np.isnat(value) else str(value) for value in values]
    plain: list[Any] = values.tolist()
    return [None if isinstance(value, float) and np.isnan(value) else value for value in plain]


def geometries(table: RawTable, kinds: tuple[str, ...], problems: Problems) -> list[Any]:
    """Take the features of a layer as shapely geometries; None where one was refused.

    Parameters
    ----------
    table : RawTable
        Of a layer.
    kinds : tuple of str
        Geometry types that may be there, as ``("LineString", "MultiLineString")``.

    Returns
    -------
    list of geometry or None
    """
    import shapely

    read = shapely.from_wkb(table.geometry, on_invalid="ignore")
    wrong: dict[tuple[str, str], list[int]] = {}
    taken: list[Any] = []
    for row, (wkb, shape) in enumerate(zip(table.geometry, read, strict=True)):
        fault = _fault(wkb, shape, kinds)
        if fault is not None:
            wrong.setdefault(fault, []).append(row)
        taken.append(shape if fault is None else None)
    for (message, found), rows in wrong.items():
        problems.error(
            message,
            file=table.file,
            place=table.place(rows[0]),
            value=found,
            allowed=" or ".join(kinds),
            mend="mend or delete the feature in a GIS",
            count=len(rows),
        )
    return taken


def _fault(wkb: Any, shape: Any, kinds: tuple[str, ...]) -> tuple[str, str] | None:
    import shapely

    if wkb is None:
        return "a feature without geometry", "NULL"
    if shape is None:
        return "a geometry that cannot be read", "unreadable"
    if shape.geom_type not in kinds:
        return "a geometry of another type", shape.geom_type
    if shape.is_empty or any(part.is_empty for part in shapely.get_parts(shape)):
        return "an empty geometry", f"{shape.geom_type} EMPTY"
    if not np.isfinite(shapely.get_coordinates(shape)).all():
        return "a coordinate that is not finite", shape.geom_type
    if "Line" in kinds[0] and any(part.length == 0 for part in shapely.get_parts(shape)):
        return "a line of no length", shape.geom_type
    if "Polygon" in kinds[0] and not shape.is_valid:
        return f"an invalid polygon ({shapely.is_valid_reason(shape)})", shape.geom_type
    return None
