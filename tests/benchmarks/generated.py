"""Write complete study folders to measure whole runs with. All in them is invented.

python tests/benchmarks/generated.py lines FOLDER [--receptors N] [--step DEGREES]
python tests/benchmarks/generated.py network FOLDER
"""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pandas as pd
from shapely.geometry import LineString

from roaddisp.model import FloatArray

INVENTED = "All data in this file are invented; the place does not exist."
CRS = "EPSG:32613"
WEST, SOUTH = 520_000.0, 4_430_000.0
EXTENT = 5000.0
YEAR = 2025
CLASSES = np.array(list("ABCDEF"))
STANDARDS = (
    "us-naaqs-1h",
    "us-naaqs-annual",
    "eu-2008-1h",
    "eu-2008-annual",
    "eu-2008-nox-vegetation",
)

_SETTINGS = """\
# {note}

[study]
title = "{title} (invented)"
timezone = "America/Denver"
terrain = "open"
crs = "{crs}"

[roads]
file = "roads.gpkg"
columns = {{ speed = "speed [km/h]", width = "width [m]" }}

[traffic]
profiles = "profiles.csv"
{counts}
[fleet]
factors = "factors.csv"

[weather]
file = "weather.csv"
clock = "standard"
calms = "both"

[air]
file = "air.csv"
clock = "standard"

[receptors]
points = "points.csv"
{grid}
[standards]
use = [{standards}]
"""

_FACTORS = """\
vehicle_class,speed [km/h],nox [g/km],no2_fraction
car,10,0.52,0.21
car,40,0.33,0.20
car,80,0.25,0.20
car,130,0.37,0.20
articulated_truck,10,5.6,0.11
articulated_truck,40,3.2,0.10
articulated_truck,80,2.1,0.10
articulated_truck,130,2.3,0.10
"""


def write_lines(
    folder: Path,
    *,
    receptors: int = 10_000,
    links: int = 500,
    step: int = 10,
    hours: int = 8760,
    lids: bool = False,
) -> Path:
    """Write a study of single straight lines 0.1 m wide on five profiles, and points.

    Winds are reported to ``step`` degrees in every class, and no hour is calm. Speed
    and share of trucks follow the profile, so that links form five groups. With ``lids``
    every hour has a mixing height of its own, from 80 m at night to 1,500 m.
    """
    rng = np.random.default_rng(500)
    profile = np.arange(links) % 5
    centre = rng.uniform(0.0, EXTENT, (links, 2))
    angle = rng.uniform(0.0, np.pi, links)
    half = 0.5 * rng.uniform(100.0, 1000.0, links)
    along = half[:, None] * np.column_stack([np.cos(angle), np.sin(angle)])
    names = [f"profile-{number + 1}" for number in range(5)]
    roads = pd.DataFrame(
        {
            "link": [f"line-{number + 1}" for number in range(links)],
            "aadt": rng.integers(2_000, 60_000, links),
            "speed [km/h]": np.array([45.0, 60.0, 75.0, 90.0, 110.0])[profile],
            "heavy_share": np.array([0.03, 0.05, 0.07, 0.10, 0.14])[profile],
            "width [m]": 0.1,
            "profile": [names[number] for number in profile],
        }
    )
    lines = np.stack([centre - along, centre + along], axis=1)
    _write_common(folder, f"{links} single lines, {receptors} points")
    _write_roads(folder, roads, list(lines))
    _write_table(folder / "profiles.csv", _profiles(names, rng))
    _write_points(folder, rng.uniform(0.0, EXTENT, (receptors, 2)))
    _write_weather(folder, rng, step=step, hours=hours, calm_share=0.0, lids=lids)
    return folder


def write_network(
    folder: Path,
    *,
    links: int = 150,
    counted: int = 120,
    points: int = 400,
    spacing: int = 50,
    hours: int = 8760,
) -> Path:
    """Write a study of curved links 24 m wide, points beside them and a grid.

    ``counted`` links have hourly counts with an hourly speed; each of the others has a
    profile of its own. Two hours in a hundred are calm.
    """
    rng = np.random.default_rng(150)
    curves = [_curve(rng) for _ in range(links)]
    names = [f"link-{number + 1}" for number in range(links)]
    profiles = [f"profile-{number + 1}" for number in range(counted, links)] or ["profile-1"]
    roads = pd.DataFrame(
        {
            "link": names,
            "aadt": rng.integers(5_000, 70_000, links),
            "speed [km/h]": rng.integers(40, 110, links).astype(np.float64),
            "heavy_share": rng.uniform(0.02, 0.15, links).round(3),
            "width [m]": 24.0,
            "profile": [*[profiles[0]] * counted, *profiles][:links],
        }
    )
    _write_common(
        folder,
        f"{links} curved links 24 m wide",
        counts="counts.csv" if counted else None,
        grid=f'grid = {{ spacing = "{spacing} m", within = "150 m" }}',
    )
    _write_roads(folder, roads, curves)
    _write_table(folder / "profiles.csv", _profiles(profiles, rng))
    if counted:
        _write_table(folder / "counts.csv", _counts(roads[:counted], rng, hours))
    beside = [_beside(curves[rng.integers(links)], rng) for _ in range(points)]
    _write_points(folder, np.array(beside))
    _write_weather(folder, rng, step=10, hours=hours, calm_share=0.02)
    return folder


def _curve(rng: np.random.Generator, pieces: int = 12) -> FloatArray:
    """Draw a link of 12 chords, 300 m to 1.5 km long, that bends up to 90 degrees."""
    length, heading = rng.uniform(300.0, 1500.0), rng.uniform(0.0, 2.0 * np.pi)
    turn = np.linspace(0.0, rng.uniform(-0.5, 0.5) * np.pi, pieces)
    steps = (length / pieces) * np.column_stack([np.cos(heading + turn), np.sin(heading + turn)])
    start = rng.uniform(0.0, EXTENT, 2)
    return np.vstack([start, start + np.cumsum(steps, axis=0)])


def _beside(curve: FloatArray, rng: np.random.Generator) -> FloatArray:
    """Draw a place 5 to 100 m from the edge of a road."""
    piece = rng.integers(len(curve) - 1)
    start, end = curve[piece], curve[piece + 1]
    along = (end - start) / np.hypot(*(end - start))
    away = rng.choice([-1.0, 1.0]) * (12.0 + rng.uniform(5.0, 100.0))
    place: FloatArray = 0.5 * (start + end) + away * np.array([-along[1], along[0]])
    return place


def _write_common(folder: Path, title: str, *, counts: str | None = None, grid: str = "") -> None:
    folder.mkdir(parents=True, exist_ok=True)
    settings = _SETTINGS.format(
        note=INVENTED,
        title=title,
        crs=CRS,
        counts=f'counts = "{counts}"\n' if counts else "",
        grid=f"{grid}\n",
        standards=", ".join(f'"{name}"' for name in STANDARDS),
    )
    (folder / "study.toml").write_text(settings, encoding="utf-8")
    (folder / "README.md").write_text(f"{INVENTED} Written to measure with.\n", encoding="utf-8")
    (folder / "factors.csv").write_text(f"# {INVENTED}\n{_FACTORS}", encoding="utf-8")


def _write_table(path: Path, table: pd.DataFrame) -> None:
    with path.open("w", encoding="utf-8", newline="\n") as file:
        file.write(f"# {INVENTED}\n")
        table.to_csv(file, index=False)


def _write_roads(folder: Path, roads: pd.DataFrame, lines: Sequence[FloatArray]) -> None:
    shapes = [LineString(line + np.array([WEST, SOUTH])) for line in lines]
    frame = gpd.GeoDataFrame(roads, geometry=shapes, crs=CRS)
    frame.to_file(folder / "roads.gpkg", layer="roads", engine="pyogrio")


def _write_points(folder: Path, places: FloatArray) -> None:
    table = pd.DataFrame(
        {
            "receptor": [f"P{number + 1}" for number in range(len(places))],
            "kind": "home",
            "x [m]": (WEST + places[:, 0]).round(2),
            "y [m]": (SOUTH + places[:, 1]).round(2),
        }
    )
    _write_table(folder / "points.csv", table)


def _profiles(names: Sequence[str], rng: np.random.Generator) -> pd.DataFrame:
    """Two rush hours a weekday, one broad hump at the weekend, each profile its own."""
    hour = np.arange(24)
    rows = []
    for name in names:
        morning, evening = rng.uniform(6.5, 9.0), rng.uniform(16.0, 18.5)
        weight = rng.uniform(0.5, 2.0)
        rush = 0.15 + np.exp(-0.3 * (hour - morning) ** 2)
        rush += weight * np.exp(-0.15 * (hour - evening) ** 2)
        hump = 0.15 + np.exp(-0.03 * (hour - rng.uniform(12.0, 15.0)) ** 2)
        for day_type, shape in (("weekday", rush), ("saturday", hump), ("sunday", hump)):
            share = (shape / shape.sum()).round(6)
            rows.append(
                pd.DataFrame({"profile": name, "day_type": day_type, "hour": hour, "share": share})
            )
    return pd.concat(rows, ignore_index=True)


def _times(hours: int) -> pd.DatetimeIndex:
    return pd.date_range(f"{YEAR}-01-01", periods=hours, freq="h")


def _stamps(times: pd.DatetimeIndex) -> Any:
    return times.strftime("%Y-%m-%dT%H:%M:%S")


def _counts(roads: pd.DataFrame, rng: np.random.Generator, hours: int) -> pd.DataFrame:
    """Hourly vehicles and speed of each link, slower where it is full.

    By UTC, so that no hour of the civil clock is skipped.
    """
    times = pd.date_range(f"{YEAR}-01-01T07:00:00", periods=hours, freq="h")
    hour = (np.arange(hours) % 24)[None, :]
    peak = rng.uniform(15.0, 18.0, (len(roads), 1))
    shape = 0.2 + np.exp(-0.25 * (hour - 7.5) ** 2) + np.exp(-0.15 * (hour - peak) ** 2)
    share = shape / shape[:, :24].sum(axis=1, keepdims=True)
    share = share * rng.uniform(0.85, 1.15, share.shape)
    vehicles = roads["aadt"].to_numpy()[:, None] * share
    speed = roads["speed [km/h]"].to_numpy()[:, None] * (1.05 - 3.0 * share)
    return pd.DataFrame(
        {
            "link": np.repeat(roads["link"].to_numpy(), hours),
            "time": np.tile((_stamps(times) + "Z").to_numpy(), len(roads)),
            "vehicles": vehicles.round().astype(np.int64).ravel(),
            "speed [km/h]": np.clip(speed, 12.0, 128.0).round(1).ravel(),
        }
    )


def _write_weather(
    folder: Path,
    rng: np.random.Generator,
    *,
    step: int,
    hours: int,
    calm_share: float,
    lids: bool = False,
) -> None:
    times = _times(hours)
    direction = rng.integers(0, 360 // step, hours) * float(step)
    calm = rng.uniform(size=hours) < calm_share
    speed = np.maximum(1.1, rng.weibull(2.0, hours) * 4.0)
    weather = pd.DataFrame(
        {
            "time": _stamps(times),
            "wind_from [deg]": direction,
            "wind_speed [m/s]": np.where(calm, 0.2, speed).round(1),
            "temperature [degC]": (10.0 + 12.0 * np.sin(np.arange(hours) / 1394.0)).round(1),
            "stability": CLASSES[rng.integers(0, 6, hours)],
        }
    )
    if lids:
        night = np.searchsorted(CLASSES, weather["stability"]) >= 4
        height = np.where(night, rng.uniform(80.0, 300.0, hours), rng.uniform(300.0, 1500.0, hours))
        weather["mixing_height [m]"] = height.round(0)
    _write_table(folder / "weather.csv", weather)
    air = pd.DataFrame(
        {
            "time": _stamps(times),
            "o3 [ppb]": rng.uniform(5.0, 60.0, hours).round(1),
            "no2 [ppb]": rng.uniform(3.0, 25.0, hours).round(1),
            "no [ppb]": rng.uniform(0.0, 8.0, hours).round(1),
        }
    )
    _write_table(folder / "air.csv", air)


def main() -> None:
    parser = argparse.ArgumentParser(description=(__doc__ or "").splitlines()[0])
    parser.add_argument("study", choices=("lines", "network"))
    parser.add_argument("folder", type=Path)
    parser.add_argument("--receptors", type=int, default=10_000, help="points of 'lines'")
    parser.add_argument("--step", type=int, default=10, help="degrees of wind of 'lines'")
    parser.add_argument("--points", type=int, default=400, help="beside the roads of 'network'")
    parser.add_argument("--spacing", type=int, default=50, help="metres of the grid of 'network'")
    asked = parser.parse_args()
    if asked.study == "lines":
        write_lines(asked.folder, receptors=asked.receptors, step=asked.step)
    else:
        write_network(asked.folder, points=asked.points, spacing=asked.spacing)


if __name__ == "__main__":
    main()
