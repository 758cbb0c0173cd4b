"""Hours of the receptors asked for, as CF NetCDF."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from roaddisp.model import Result


def write_netcdf(result: Result, path: Path) -> None:
    """Write ``hourly.nc`` by the CF conventions 1.8, as time series at points.

    Numbers are float32, compressed. Time carries no offset, so that a reader finds
    local standard time; its attributes say so.

    Parameters
    ----------
    result : Result
    path : Path
    """
    import xarray as xr
    from pyproj import CRS

    hourly = result.hourly.copy()
    begin = hourly["time"].to_numpy()
    bounds = np.column_stack([begin, begin + np.timedelta64(1, "h")])
    hourly = hourly.assign_coords(time_bounds=(("time", "bound"), bounds))
    hourly["time"].attrs["bounds"] = "time_bounds"
    hourly["receptor"].attrs["cf_role"] = "timeseries_id"
    hourly["crs"] = xr.DataArray(np.int32(0), attrs=CRS.from_user_input(result.study.crs).to_cf())
    hourly.attrs = {"Conventions": "CF-1.8", "featureType": "timeSeries", **hourly.attrs}
    units = f"hours since {np.datetime_as_string(begin[0], unit='D')}"
    clock = {"units": units, "calendar": "standard", "dtype": "int32"}
    encoding: dict[str, dict[str, object]] = {
        "time": {**clock, "_FillValue": None},
        "time_bounds": {**clock, "_FillValue": None},
    }
    for name in hourly.data_vars:
        if name != "crs":
            hourly[name].attrs["grid_mapping"] = "crs"
            encoding[str(name)] = {
                "dtype": "float32",
                "_FillValue": np.float32(np.nan),
                "zlib": True,
                "complevel": 4,
                "shuffle": True,
            }
    hourly.to_netcdf(path, engine="h5netcdf", encoding=encoding)
