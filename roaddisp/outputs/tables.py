"""A result as tables: one row a receptor, and the hours of those asked for."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from roaddisp.model import FloatArray, Result, Verdicts
from roaddisp.outputs.cautions import cautions
from roaddisp.standards.statistics import over_years

if TYPE_CHECKING:
    import pandas as pd
    import xarray as xr


class Column(NamedTuple):
    """What a column holds, and in which unit (empty for text, flags and fractions)."""

    meaning: str
    unit: str


_PLACE = {
    "receptor": Column("name of the receptor", ""),
    "site": Column("site the receptor belongs to", ""),
    "kind": Column("kind of place, which decides the standards that judge it", ""),
    "x_m": Column("easting in the study CRS", "m"),
    "y_m": Column("northing in the study CRS", "m"),
    "longitude": Column("longitude east of Greenwich, WGS 84", "deg"),
    "latitude": Column("latitude north of the equator, WGS 84", "deg"),
    "z_m": Column("height above ground", "m"),
    "on_road": Column("within the travelled way of a link; then no standard judges it", ""),
}

_WORST_YEAR = "over several years, that of the worst year"


def columns(result: Result) -> dict[str, Column]:
    """Meaning and unit of each column of ``receptors.csv``, in the file's order.

    Parameters
    ----------
    result : Result

    Returns
    -------
    dict of str to Column
    """
    options = result.scenario.options
    mass = f"{options.ugm3_per_ppb:g} ug/m3 per ppb of NO2, {options.reference}"
    described = _PLACE | {
        "nox_road_mean_ugm3": Column(
            f"mean NOx from the roads, as NO2-equivalent mass; {_WORST_YEAR}", "ug/m3"
        ),
        "no2_mean_ugm3": Column(f"mean NO2, {mass}; {_WORST_YEAR}", "ug/m3"),
        "no2_mean_ppb": Column(f"mean NO2; {_WORST_YEAR}", "ppb"),
        "no2_road_mean_ugm3": Column(
            f"mean NO2 less the background of the same hours, {mass}; {_WORST_YEAR}", "ug/m3"
        ),
        "no2_1h_max_ppb": Column("highest hour of NO2 in all years", "ppb"),
        "no2_1h_p98_ppb": Column(
            "98th percentile of daily highest hours of NO2, by the rank table of 40 CFR 50 "
            "Appendix S; over several years, the mean of the annual values",
            "ppb",
        ),
        "no2_1h_19th_ugm3": Column(f"19th highest hour of NO2, {mass}; {_WORST_YEAR}", "ug/m3"),
    }
    for verdict in result.verdicts:
        name = verdict.standard
        provisional = f"; provisional: {verdict.provisional}" if verdict.provisional else ""
        described |= {
            f"{name}_value": Column(
                f"NO2 or NOx in the form of {name}, with that rule's own conversion factor, "
                "percentile and rounding, so it may differ from the columns before",
                verdict.unit,
            ),
            f"{name}_limit": Column(f"limit of {name}", verdict.unit),
            f"{name}_met": Column(
                f"whether {name} is met: yes, no or undetermined; empty where it does not "
                f"judge this kind of receptor{provisional}",
                "",
            ),
        }
    return described


def receptor_table(result: Result) -> pd.DataFrame:
    """One row a receptor: the columns of ``receptors.csv``.

    Parameters
    ----------
    result : Result

    Returns
    -------
    pandas.DataFrame
        R rows in the order of the run. ``attrs["columns"]`` maps each column to a
        mapping with its ``meaning`` and ``unit``. Missing numbers are NaN, missing
        texts empty.
    """
    import pandas as pd

    place = result.scenario.receptors
    annual = result.statistics
    factor = result.scenario.options.ugm3_per_ppb
    no2_mean = over_years(annual, "no2_mean_ppb")
    values: dict[str, object] = {
        "receptor": list(place.receptor),
        "site": list(place.site),
        "kind": list(place.kind),
        "x_m": place.x,
        "y_m": place.y,
        "longitude": place.longitude,
        "latitude": place.latitude,
        "z_m": place.z,
        "on_road": place.on_road,
        "nox_road_mean_ugm3": over_years(annual, "nox_road_mean_ugm3"),
        "no2_mean_ugm3": no2_mean * factor,
        "no2_mean_ppb": no2_mean,
        "no2_road_mean_ugm3": over_years(annual, "no2_road_mean_ppb") * factor,
        "no2_1h_max_ppb": over_years(annual, "no2_1h_max_ppb"),
        "no2_1h_p98_ppb": over_years(annual, "no2_1h_p98_ppb"),
        "no2_1h_19th_ugm3": over_years(annual, "no2_1h_19th_ppb") * factor,
    }
    for verdict in result.verdicts:
        values[f"{verdict.standard}_value"] = verdict.value
        values[f"{verdict.standard}_limit"] = np.full(len(place), verdict.limit)
        values[f"{verdict.standard}_met"] = list(verdict.met)
    described = columns(result)
    table = pd.DataFrame({name: values[name] for name in described})
    table.attrs["columns"] = {name: column._asdict() for name, column in described.items()}
    return table


# --- files ------------------------------------------------------------------------


def write_csv(result: Result, path: Path) -> None:
    """Write ``receptors.csv``: UTF-8, empty where there is no value.

    Numbers have ten significant digits; ``_value`` and ``_limit`` the decimals of
    their rule.

    Parameters
    ----------
    result : Result
    path : Path
    """
    import pandas as pd

    decimals = _decimals(result.verdicts)
    texts: dict[str, object] = {}
    for name, column in result.summary.items():
        if column.dtype.kind == "b":
            texts[str(name)] = np.where(column, "true", "false")
        elif column.dtype.kind == "f":
            form = f"%.{decimals[str(name)]}f" if name in decimals else "%.10g"
            texts[str(name)] = _written(column.to_numpy(), form)
        else:
            texts[str(name)] = column
    pd.DataFrame(texts).to_csv(path, index=False, encoding="utf-8", lineterminator="\n")


def _decimals(verdicts: tuple[Verdicts, ...]) -> dict[str, int]:
    return {
        f"{verdict.standard}_{part}": verdict.decimals
        for verdict in verdicts
        for part in ("value", "limit")
    }


def _written(values: FloatArray, form: str) -> np.ndarray[tuple[int], np.dtype[np.str_]]:
    # adding zero turns -0.0 into 0.0
    text = np.char.mod(form, np.asarray(values, dtype=np.float64) + 0.0)
    return np.where(np.isfinite(values), text, "")


def write_parquet(result: Result, path: Path) -> None:
    """Write ``receptors.parquet``: the same columns at full precision.

    Each field's metadata carries its ``description`` and ``unit``; the schema's
    metadata the study's title, the scenario and the cautions.

    Parameters
    ----------
    result : Result
    path : Path
    """
    import pyarrow as pa
    import pyarrow.parquet as pq

    table = result.summary
    described = columns(result)
    fields, arrays = [], []
    for name, column in described.items():
        series = table[name]
        if series.dtype.kind not in "bf":
            series = series.astype(object).where(series != "", None)
        kind = {"b": pa.bool_(), "f": pa.float64()}.get(table[name].dtype.kind, pa.string())
        arrays.append(pa.array(series, type=kind, from_pandas=True))
        notes = {"description": column.meaning, "unit": column.unit}
        fields.append(pa.field(name, kind, metadata=notes))
    about = {
        "title": result.study.title,
        "scenario": result.scenario.name,
        "crs": result.study.crs,
        "cautions": " ".join(cautions(result)),
    }
    pq.write_table(pa.Table.from_arrays(arrays, schema=pa.schema(fields, metadata=about)), path)


# --- hours ------------------------------------------------------------------------

_HOURLY = {
    "nox_road_ugm3": ("NOx from the roads, as NO2-equivalent mass", "ug m-3", None),
    "nox_road_ppb": ("NOx from the roads", "1e-9", None),
    "no2_primary_road_ppb": ("NO2 from the roads as it left the exhausts", "1e-9", None),
    "no2_ppb": ("NO2 in total", "1e-9", "mole_fraction_of_nitrogen_dioxide_in_air"),
    "no_ppb": ("NO in total", "1e-9", "mole_fraction_of_nitrogen_monoxide_in_air"),
    "o3_ppb": ("ozone left at the receptor", "1e-9", "mole_fraction_of_ozone_in_air"),
}


def hourly_dataset(result: Result) -> xr.Dataset:
    """Hours of the receptors asked for, with the attributes of the CF conventions.

    Parameters
    ----------
    result : Result

    Returns
    -------
    xarray.Dataset
        Dimensions ``(receptor, time)``; variables ``nox_road_ugm3, nox_road_ppb,
        no2_primary_road_ppb, no2_ppb, no_ppb, o3_ppb``; ``time`` is the beginning of
        each hour in local standard time. NaN in calm and in missing hours.
    """
    import xarray as xr

    block, clock = result.hours, result.scenario.clock
    kept = np.asarray(result.kept, dtype=np.int64)
    values = {
        "nox_road_ugm3": block.nox_road_ugm3,
        "nox_road_ppb": block.nox_road_ugm3 / result.scenario.options.ugm3_per_ppb,
        "no2_primary_road_ppb": block.no2_primary_road_ppb,
        "no2_ppb": block.no2_ppb,
        "no_ppb": block.no_ppb,
        "o3_ppb": block.o3_ppb,
    }
    data = {
        name: (("receptor", "time"), values[name], _hourly_notes(result, name)) for name in _HOURLY
    }
    time_notes = {
        "standard_name": "time",
        "long_name": "beginning of the hour, local standard time",
        "utc_offset_hours": clock.utc_offset,
        "timezone": clock.timezone,
        "comment": (
            f"Local standard time all year ({clock.utc_offset:+g} h from UTC); "
            "each value is the mean of the hour that begins then."
        ),
    }
    coordinates = {
        "time": ("time", clock.standard[block.hours].astype("datetime64[ns]"), time_notes),
        **_receptor_coordinates(result, kept),
    }
    about = {
        "title": f"{result.study.title}: hourly concentrations, scenario {result.scenario.name}",
        "comment": " ".join(cautions(result)),
    }
    return xr.Dataset(data, coords=coordinates, attrs=about)


def _hourly_notes(result: Result, name: str) -> dict[str, str]:
    long_name, units, standard_name = _HOURLY[name]
    if name == "no_ppb" and result.scenario.background.no is None:
        long_name = "NO from the roads alone (the background gives none)"
    notes = {
        "long_name": long_name + (" [ppb]" if name.endswith("_ppb") else ""),
        "units": units,
        "cell_methods": "time: mean",
        "comment": "empty in calm hours and in hours whose input is missing",
    }
    return notes | ({"standard_name": standard_name} if standard_name else {})


def _receptor_coordinates(
    result: Result, kept: np.ndarray[tuple[int], np.dtype[np.int64]]
) -> dict[str, tuple[str, object, dict[str, str]]]:
    place = result.scenario.receptors

    def text(names: tuple[str, ...]) -> object:
        return np.array([names[index] for index in kept], dtype=object)

    return {
        "receptor": ("receptor", text(place.receptor), {"long_name": "name of the receptor"}),
        "site": ("receptor", text(place.site), {"long_name": "site of the receptor"}),
        "kind": ("receptor", text(place.kind), {"long_name": "kind of place"}),
        "x_m": (
            "receptor",
            place.x[kept],
            {
                "standard_name": "projection_x_coordinate",
                "long_name": "easting in the study CRS",
                "units": "m",
            },
        ),
        "y_m": (
            "receptor",
            place.y[kept],
            {
                "standard_name": "projection_y_coordinate",
                "long_name": "northing in the study CRS",
                "units": "m",
            },
        ),
        "z_m": (
            "receptor",
            place.z[kept],
            {
                "standard_name": "height",
                "long_name": "height above ground",
                "units": "m",
                "positive": "up",
            },
        ),
        "longitude": (
            "receptor",
            place.longitude[kept],
            {"standard_name": "longitude", "long_name": "WGS 84", "units": "degrees_east"},
        ),
        "latitude": (
            "receptor",
            place.latitude[kept],
            {"standard_name": "latitude", "long_name": "WGS 84", "units": "degrees_north"},
        ),
    }
