"""One link, one receptor, one day, against a calculation apart from the package.

Source of the expected hours: ``make_worked_day.py`` beside this file, which
imports nothing from roaddisp; its values are stored in ``data/worked_day.csv``.
"""

from __future__ import annotations

import csv
import importlib.util
from pathlib import Path
from types import ModuleType

import geopandas as gpd
import numpy as np
import pytest
from shapely.geometry import LineString, Point

import roaddisp as rd

HERE = Path(__file__).parent


def load_day() -> ModuleType:
    spec = importlib.util.spec_from_file_location("make_worked_day", HERE / "make_worked_day.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


DAY = load_day()

STUDY = """
[study]
title = "One worked day (all data invented)"
timezone = "America/Denver"
terrain = "open"
crs = "EPSG:32613"
reference = "25 C"
[roads]
file = "roads.gpkg"
columns = { speed = "speed [km/h]", width = "width [m]", heavy_share = "heavy_share [%]" }
[traffic]
profiles = "profiles.csv"
[fleet]
factors = "factors.csv"
year = 2025
[weather]
file = "weather.csv"
clock = "standard"
anemometer_height = "10 m"
[air]
file = "air.csv"
clock = "standard"
[receptors]
points = "points.gpkg"
height = "1.5 m"
[standards]
use = ["us-naaqs-1h"]
[outputs]
hourly = ["home"]
"""


def write_csv(path: Path, header: str, rows: list[str]) -> None:
    path.write_text("\n".join([header, *rows]) + "\n", encoding="utf-8")


def write_study(folder: Path, width: float) -> None:
    (folder / "study.toml").write_text(STUDY, encoding="utf-8")
    roads = {
        "link": ["worked"],
        "aadt": [DAY.AADT],
        "speed": [DAY.SPEED_KMH],
        "width": [width],
        "heavy_share": [100 * DAY.HEAVY_SHARE],
    }
    gpd.GeoDataFrame(roads, geometry=[LineString(DAY.LINK)], crs="EPSG:32613").to_file(
        folder / "roads.gpkg"
    )
    gpd.GeoDataFrame(
        {"receptor": ["home"], "kind": ["home"]}, geometry=[Point(DAY.RECEPTOR)], crs="EPSG:32613"
    ).to_file(folder / "points.gpkg")
    write_csv(
        folder / "profiles.csv",
        "profile,day_type,hour,share",
        [f"town,all,{hour},{share}" for hour, share in enumerate(DAY.SHARES)],
    )
    write_csv(
        folder / "factors.csv",
        "vehicle_class,speed [km/h],nox [g/km],no2_fraction",
        [f"{name},{v},{n},{f}" for name, rows in DAY.FACTORS.items() for v, n, f in rows],
    )
    stamps = [f"{DAY.DATE}T{hour:02d}:00:00" for hour in range(24)]
    columns = (stamps, DAY.WIND_FROM, DAY.WIND_SPEED, DAY.STABILITY)
    write_csv(
        folder / "weather.csv",
        "time,wind_from [deg],wind_speed [m/s],temperature [degC],stability",
        [f"{t},{d},{u},4,{s}" for t, d, u, s in zip(*columns, strict=True)],
    )
    write_csv(
        folder / "air.csv",
        "time,o3 [ppb],no2 [ppb]",
        [f"{t},{o},{n}" for t, o, n in zip(stamps, DAY.OZONE, DAY.NO2_BACKGROUND, strict=True)],
    )


def expected(width: float) -> dict[str, np.ndarray]:
    with (HERE / "data" / "worked_day.csv").open(encoding="utf-8") as file:
        rows = [row for row in csv.DictReader(file) if float(row["width_m"]) == width]
    names = ("nox_road_ugm3", "no2_primary_road_ppb", "no2_ppb")
    return {name: np.array([float(row[name]) for row in rows]) for name in names}


@pytest.mark.parametrize(("width", "tolerance"), [(0.1, 1e-3), (24.0, 1e-2)])
def test_a_day_from_counts_to_ppb(tmp_path: Path, width: float, tolerance: float) -> None:
    """A thin road is the line itself; a wide one a strip that lines stand for within 1 %."""
    write_study(tmp_path, width)
    hours = rd.run(rd.read_study(tmp_path)).hourly.sel(receptor="home")
    for name, values in expected(width).items():
        seen = hours[name].to_numpy()
        matter = values > 0.01 * values.max()
        np.testing.assert_allclose(seen[matter], values[matter], rtol=tolerance, err_msg=name)
        np.testing.assert_allclose(seen, values, atol=tolerance * values.max(), err_msg=name)


def test_the_stored_hours_are_what_the_script_gives() -> None:
    """Guards the stored values against a script changed without running it again."""
    again = DAY.work(0.1, 1)
    np.testing.assert_allclose(
        [row["no2_ppb"] for row in again], expected(0.1)["no2_ppb"], rtol=1e-7
    )


def test_two_worked_days(worked_days: Path) -> None:
    """Two days by adaptive quadrature with each road over 24 strips, from beside the checkout."""
    hourly = rd.run(rd.read_study(worked_days)).hourly
    with (worked_days / "expected.csv").open(encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    names = sorted({row["receptor"] for row in rows})
    for name in names:
        hours = hourly.sel(receptor=name)
        at = {str(t)[:19]: i for i, t in enumerate(hours["time"].to_numpy().astype("M8[s]"))}
        own = [row for row in rows if row["receptor"] == name]
        for column in ("nox_road_ugm3", "no2_primary_road_ppb", "no2_ppb"):
            seen = np.array([hours[column].to_numpy()[at[row["time"]]] for row in own])
            worked = np.array([float(row[column]) if row[column] else np.nan for row in own])
            assert (np.isnan(seen) == np.isnan(worked)).all(), "the calm hour is empty"
            matter = worked > 0.01 * np.nanmax(worked)
            np.testing.assert_allclose(seen[matter], worked[matter], rtol=1e-2)
            if column == "no2_ppb":
                np.testing.assert_allclose(seen, worked, atol=0.2)
