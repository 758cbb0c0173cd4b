"""The run as layers for a GIS: roads, receptors and sites in one GeoPackage."""

from __future__ import annotations

import json
import os
from collections.abc import Iterator
from contextlib import contextmanager
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from roaddisp.constants import HOUR
from roaddisp.errors import OutputError
from roaddisp.model import FloatArray, Result
from roaddisp.outputs.cautions import cautions
from roaddisp.outputs.styles import Style, receptor_style, road_style, site_style

if TYPE_CHECKING:
    import geopandas as gpd
    import pandas as pd

STYLED: Final = "no2_mean_ugm3"
"""The column that colours the receptors when a GIS opens them."""

HOURS_OF_YEAR: Final = 8_760

ROAD_COLUMNS: Final = {
    "link": "name of the link, unique",
    "name": "name of the road",
    "width_m": "width of the travelled way [m]",
    "length_m": "length of the link [m]",
    "aadt": "annual average daily traffic [vehicles/day]; empty where hours were counted",
    "speed_kmh": "speed [km/h]",
    "heavy_share": "share of heavy vehicles, 0 to 1; empty where the mix decides",
    "nox_mean_ugms": "mean NOx strength, as NO2 [ug/m/s]",
    "nox_mean_gkmh": "mean NOx strength, as NO2 [g/km/h]",
    "nox_kg_year": "NOx of the link, as NO2, in 8,760 h at the mean strength [kg]",
    "no2_fraction": "primary NO2 in that NOx, 0 to 1",
}


def source_date() -> datetime | None:
    """Date that files are to carry, from ``SOURCE_DATE_EPOCH``; None where it is unset.

    Raises
    ------
    OutputError
        Where the variable is not a whole number of seconds.
    """
    text = os.environ.get("SOURCE_DATE_EPOCH")
    if text is None:
        return None
    try:
        return datetime.fromtimestamp(int(text), UTC)
    except (ValueError, OverflowError, OSError) as error:
        raise OutputError(
            f"SOURCE_DATE_EPOCH is {text!r}. Allowed: seconds since 1970-01-01 UTC, a whole "
            "number. Mend: set it so, or unset it."
        ) from error


@contextmanager
def _dated() -> Iterator[None]:
    import pyogrio

    date = source_date()
    if date is None:
        yield
        return
    before = pyogrio.get_gdal_config_option("OGR_CURRENT_DATE")
    pyogrio.set_gdal_config_options({"OGR_CURRENT_DATE": date.strftime("%Y-%m-%dT%H:%M:%SZ")})
    try:
        yield
    finally:
        pyogrio.set_gdal_config_options({"OGR_CURRENT_DATE": before})


# --- layers ----------------------------------------------------------------------


def road_layer(result: Result) -> gpd.GeoDataFrame:
    """Links with what they carry and emit: the columns of `ROAD_COLUMNS`.

    Parameters
    ----------
    result : Result

    Returns
    -------
    geopandas.GeoDataFrame
        L rows of multi-part lines in the study CRS.
    """
    import geopandas as gpd
    from shapely import MultiLineString

    network = result.scenario.network
    lines = [MultiLineString(list(link)) for link in network.lines]
    length = np.array([line.length for line in lines])
    nox, no2 = mean_strength(result)
    known = np.where(nox > 0, nox, np.nan)
    columns = {
        "link": list(network.link),
        "name": _texts(network.name),
        "width_m": network.width,
        "length_m": length,
        "aadt": network.aadt,
        "speed_kmh": network.speed * 3.6,
        "heavy_share": network.heavy_share,
        "nox_mean_ugms": nox * 1e6,
        "nox_mean_gkmh": nox * 1e3 * HOUR,
        "nox_kg_year": nox * length * HOUR * HOURS_OF_YEAR / 1e3,
        "no2_fraction": no2 / known,
    }
    return gpd.GeoDataFrame(columns, geometry=lines, crs=result.study.crs)


def mean_strength(result: Result) -> FloatArray:
    """(K, L) [g/m/s]: mean strength of each link over the hours that have one."""
    strengths = result.strengths
    known = np.isfinite(strengths.shape)
    hours = np.maximum(known.sum(axis=2), 1)
    mean = np.where(known, strengths.shape, 0.0).sum(axis=2) / hours
    per_link: FloatArray = strengths.amplitude * mean[:, strengths.group]
    return per_link


def receptor_layer(result: Result) -> gpd.GeoDataFrame:
    """Receptors as points in the study CRS, with all columns of ``receptors.csv``."""
    import geopandas as gpd
    from shapely import points

    table = result.summary.copy()
    table.attrs = {}
    for name in table.columns:
        if table[name].dtype.kind not in "bf":
            table[name] = _texts(table[name])
    geometry = points(table["x_m"].to_numpy(), table["y_m"].to_numpy())
    return gpd.GeoDataFrame(table, geometry=geometry, crs=result.study.crs)


def site_layer(result: Result) -> gpd.GeoDataFrame:
    """Sites as polygons, with the worst and mean value of their receptors off the road.

    Each standard gives its worst value at the receptors it judges, and a verdict for
    the site: ``no`` where one receptor says no, else ``undetermined`` where one says
    so, else ``yes``; empty where it judges none of them.
    """
    import geopandas as gpd
    from shapely import MultiPolygon, Polygon

    sites = result.scenario.sites
    geometry = [
        MultiPolygon([Polygon(rings[0], rings[1:]) for rings in site.polygons]) for site in sites
    ]
    places = gpd.GeoDataFrame(
        {"site": [site.site for site in sites], "kind": _texts(site.kind for site in sites)},
        geometry=geometry,
        crs=result.study.crs,
    )
    joined = places.merge(_by_site(result), on="site", how="left")
    joined["receptors"] = joined["receptors"].fillna(0).astype("int64")
    return gpd.GeoDataFrame(joined, geometry="geometry", crs=result.study.crs)


_SITE_STATISTICS = {
    "no2_mean_ugm3": ("max", "mean"),
    "nox_road_mean_ugm3": ("max", "mean"),
    "no2_1h_p98_ppb": ("max",),
    "no2_1h_max_ppb": ("max",),
}

_RANK = {"no": 3, "undetermined": 2, "yes": 1, "": 0}


def _by_site(result: Result) -> pd.DataFrame:
    import pandas as pd

    summary = result.summary
    members = summary[(summary["site"] != "") & ~summary["on_road"]]
    groups = members.groupby("site", sort=True)
    found: dict[str, Any] = {"receptors": groups.size()}
    for column, kinds in _SITE_STATISTICS.items():
        for kind in kinds:
            found[f"{column}_{kind}"] = groups[column].agg(kind)
    words = {rank: word or None for word, rank in _RANK.items()}
    for verdict in result.verdicts:
        name = verdict.standard
        judged = members[members[f"{name}_met"] != ""]
        worst = judged.groupby("site")[f"{name}_value"].max()
        found[f"{name}_value_max"] = worst.reindex(groups.size().index)
        ranks = members[f"{name}_met"].map(_RANK).groupby(members["site"]).max()
        found[f"{name}_met"] = ranks.map(words)
    return pd.DataFrame(found).rename_axis("site").reset_index()


def _texts(values: Any) -> np.ndarray[tuple[int], np.dtype[np.object_]]:
    return np.array([value or None for value in values], dtype=object)


# --- file -----------------------------------------------------------------------


def write_geopackage(result: Result, path: Path) -> None:
    """Write ``study.gpkg``, version 1.2 so that older GIS open it without a murmur.

    Layers ``roads``, ``receptors`` and, where the study has them, ``sites``; a style
    for each in ``layer_styles``; title, cautions and the meaning of every column in
    the file's metadata.

    Parameters
    ----------
    result : Result
    path : Path
        Must not exist.

    Raises
    ------
    OutputError
        Where it cannot be written.
    """
    from pyogrio.errors import DataLayerError, DataSourceError, GeometryError

    summary = result.summary
    meanings = {
        name: f"{column['meaning']} [{column['unit']}]" if column["unit"] else column["meaning"]
        for name, column in summary.attrs["columns"].items()
    }
    layers = [
        ("roads", road_layer(result), road_style(), ROAD_COLUMNS),
        ("receptors", receptor_layer(result), _receptor_style(result), meanings),
    ]
    if result.scenario.sites:
        layers.append(("sites", site_layer(result), site_style(), {}))
    try:
        with _dated():
            for number, (name, frame, _, described) in enumerate(layers):
                _write_layer(result, path, name, frame, described, first=number == 0)
            _write_styles([style for _, _, style, _ in layers], path)
    except (DataSourceError, DataLayerError, GeometryError) as error:
        raise OutputError(f"{path}: the GeoPackage could not be written: {error}") from error


def _receptor_style(result: Result) -> Style:
    off_road = result.summary[~result.summary["on_road"]]
    unit = result.summary.attrs["columns"][STYLED]["unit"]
    return receptor_style(STYLED, unit, off_road[STYLED].to_numpy(dtype=float))


def _write_layer(
    result: Result,
    path: Path,
    name: str,
    frame: gpd.GeoDataFrame,
    described: dict[str, str],
    *,
    first: bool,
) -> None:
    import pyogrio

    about = {"TITLE": result.study.title, "SCENARIO": result.scenario.name}
    creation: dict[str, Any] = {}
    if first:
        creation = {
            "dataset_options": {"VERSION": "1.2"},
            "dataset_metadata": about | {"CAUTIONS": " ".join(cautions(result))},
        }
    pyogrio.write_dataframe(
        frame,
        path,
        layer=name,
        driver="GPKG",
        append=not first,
        layer_options={"DESCRIPTION": f"{result.study.title}; scenario {result.scenario.name}"},
        layer_metadata={"COLUMNS": json.dumps(described, ensure_ascii=False)}
        if described
        else None,
        **creation,
    )


def _write_styles(styles: list[Style], path: Path) -> None:
    import pandas as pd
    import pyogrio

    date = source_date() or datetime.now(UTC)
    table = pd.DataFrame(
        {
            "f_table_catalog": "",
            "f_table_schema": "",
            "f_table_name": [style.layer for style in styles],
            "f_geometry_column": "geom",
            "styleName": [style.layer for style in styles],
            "styleQML": [style.qml for style in styles],
            "styleSLD": [style.sld for style in styles],
            "useAsDefault": True,
            "description": [style.description for style in styles],
            "owner": "",
            "ui": "",
            "update_time": pd.Timestamp(date.replace(tzinfo=None)).floor("s").as_unit("ms"),
        }
    )
    pyogrio.write_dataframe(
        table,
        path,
        layer="layer_styles",
        driver="GPKG",
        append=True,
        layer_options={"FID": "id"},
    )
