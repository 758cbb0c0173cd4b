"""Real open data, carried by registry packages, turned into a study folder.

Nothing here imports roaddisp: what the tests expect is worked out from the raw
files in plain Python, numpy and pvlib. What each file is, and what had to be
invented beside it:

- Street lines and school points: the geodanet example in libpysal's wheel, a
  square mile or so of Arizona, NAD83 State Plane Arizona Central in US survey
  feet. It has no traffic, speeds or widths: `STREET_KINDS` is invented.
- Weather: the TMY3 file of Greensboro, North Carolina, in pvlib's wheel. A
  typical year is put together from months of different years, so it is given
  one calendar year here (`YEAR`), and it is another town's: the sun is that of
  the streets, the sky and wind are Greensboro's. Columns by the TMY3 manual
  (Wilcox & Marion 2008, NREL/TP-581-43156; from memory): local standard time,
  hours named by their end up to 24:00, direction 360 for north and 0 for
  undefined, ceiling 77777 for unlimited and 88888 for thin high cloud (cirroform), both
  taken as no ceiling; opaque cloud rather than total.
- Traffic by the hour: the volumes of interstate 94 (westbound, Minnesota) in
  autots' wheel, 1 October 2016 to 30 September 2018, of which the whole
  calendar year `YEAR` is taken. Only the shape of the day is used.
- Emission factors and background air: none in these files; invented.
"""

from __future__ import annotations

import csv
import importlib.util
import io
import itertools
import math
import shutil
import zipfile
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import date, datetime, timedelta
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import numpy.typing as npt
import pytest

FloatArray = npt.NDArray[np.float64]

YEAR = 2017
HOURS = 8_760
SURVEY_FOOT = 1200 / 3937
"""m in a US survey foot, by its definition (US Coast and Geodetic Survey 1893)."""

STATE_PLANE_METRES = "EPSG:26949"
"""NAD83 / Arizona Central in metres: the streets' own projection but for the unit."""

UTC_OFFSET = -7
"""Hours; Arizona keeps mountain standard time all year."""

DAY_TYPES = ("weekday", "saturday", "sunday")
BACKGROUND_O3_PPB = 30.0
BACKGROUND_NO2_PPB = 8.0


@dataclass(frozen=True)
class StreetKind:
    """Invented traffic of a kind of street."""

    aadt: float
    speed_mph: int
    heavy_percent: float
    width_ft: float


STREET_KINDS = {
    "edge": StreetKind(aadt=28_400, speed_mph=45, heavy_percent=6.5, width_ft=62),
    "inner": StreetKind(aadt=2_700, speed_mph=25, heavy_percent=2.25, width_ft=34),
}
"""By place: streets on the outer edge of the network, and those within."""

FACTORS = {
    # vehicle class: {mph: (NOx g/mi, NO2 fraction)}
    "car": {15: (0.61, 0.17), 25: (0.47, 0.17), 45: (0.34, 0.17), 60: (0.39, 0.17)},
    "articulated_truck": {15: (9.2, 0.08), 25: (7.4, 0.08), 45: (4.9, 0.08), 60: (5.3, 0.08)},
}
"""Invented. Speeds of the streets are among the table's, so nothing is interpolated."""

METRES_PER_MILE = 1609.344


def shipped(package: str, *parts: str) -> Path:
    """Path of a file in an installed package, found without importing it; skips without it."""
    spec = importlib.util.find_spec(package)
    if spec is None or not spec.submodule_search_locations:
        pytest.skip(f"{package}, which carries the data, is not installed (see tests/run.sh)")
    path = Path(next(iter(spec.submodule_search_locations))).joinpath(*parts)
    assert path.is_file(), f"{package} no longer carries {'/'.join(parts)}"
    return path


# --- streets and schools ----------------------------------------------------------


def raw_streets() -> gpd.GeoDataFrame:
    return gpd.read_file(shipped("libpysal", "examples", "geodanet", "streets.shp"))


def raw_schools() -> gpd.GeoDataFrame:
    return gpd.read_file(shipped("libpysal", "examples", "geodanet", "schools.shp"))


def street_kinds(streets: gpd.GeoDataFrame) -> list[str]:
    """`edge` where a street's middle is within 200 ft of the rectangle round them all."""
    west, south, east, north = streets.total_bounds
    middles = streets.geometry.interpolate(0.5, normalized=True)
    return [
        "edge" if min(m.x - west, east - m.x, m.y - south, north - m.y) < 200.0 else "inner"
        for m in middles
    ]


def vertices_in_metres(streets: gpd.GeoDataFrame) -> list[FloatArray]:
    """(N, 2) [m] a street: survey feet by their definition, nothing reprojected."""
    return [np.asarray(line.coords)[:, :2] * SURVEY_FOOT for line in streets.geometry]


def length_m(line: FloatArray) -> float:
    return math.fsum(math.dist(a, b) for a, b in itertools.pairwise(line))


def grams_per_metre(kind: StreetKind) -> tuple[float, float]:
    """NOx and primary NO2 [g/m] of one average vehicle of a kind of street."""
    heavy = kind.heavy_percent / 100
    nox = no2 = 0.0
    for vehicle_class, share in (("car", 1 - heavy), ("articulated_truck", heavy)):
        grams_per_mile, fraction = FACTORS[vehicle_class][kind.speed_mph]
        nox += share * grams_per_mile / METRES_PER_MILE
        no2 += share * grams_per_mile / METRES_PER_MILE * fraction
    return nox, no2


# --- weather ----------------------------------------------------------------------


@dataclass(frozen=True)
class Station:
    """A year of hours, (T,) each, as the file has them; `start` is each hour's beginning."""

    start: list[datetime]
    wind_from: list[int]
    wind_speed: list[float]
    temperature_c: list[float]
    pressure_mbar: list[int]
    opaque_tenths: list[int]
    ceiling_m: list[float]


def station_year() -> Station:
    """The TMY3 year, its ceiling infinite where the file has a code for none."""
    path = shipped("pvlib", "data", "723170TYA.CSV")
    with path.open(newline="", encoding="ascii") as file:
        next(file)
        rows = list(csv.DictReader(file))
    assert len(rows) == HOURS
    starts = []
    for row in rows:
        month, day, _ = row["Date (MM/DD/YYYY)"].split("/")
        hour, minute = row["Time (HH:MM)"].split(":")
        assert minute == "00"
        end = datetime(YEAR, int(month), int(day)) + timedelta(hours=int(hour))  # noqa: DTZ001
        starts.append(end - timedelta(hours=1))
    ceilings = [int(row["CeilHgt (m)"]) for row in rows]
    return Station(
        start=starts,
        wind_from=[int(row["Wdir (degrees)"]) for row in rows],
        wind_speed=[float(row["Wspd (m/s)"]) for row in rows],
        temperature_c=[float(row["Dry-bulb (C)"]) for row in rows],
        pressure_mbar=[int(row["Pressure (mbar)"]) for row in rows],
        opaque_tenths=[int(row["OpqCld (tenths)"]) for row in rows],
        ceiling_m=[math.inf if value in {77777, 88888} else float(value) for value in ceilings],
    )


def calm_and_missing(station: Station, threshold: float = 0.5) -> tuple[list[bool], list[bool]]:
    """Calm: below the threshold, or no direction below 1 m/s; missing: none from 1 m/s on."""
    calm, missing = [], []
    for wind_from, speed in zip(station.wind_from, station.wind_speed, strict=True):
        undefined = wind_from == 0
        calm.append(speed < threshold or (undefined and speed < 1.0))
        missing.append(undefined and speed >= 1.0)
    return calm, missing


# --- traffic by the hour -------------------------------------------------------------


def interstate_volumes() -> list[tuple[datetime, float]]:
    """Hour and vehicles of `YEAR`, without the hours the counter missed."""
    path = shipped("autots", "datasets", "data", "traffic_hourly.zip")
    with zipfile.ZipFile(path) as archive:
        text = archive.read(archive.namelist()[0]).decode("ascii")
    rows = csv.DictReader(io.StringIO(text))
    times = ((datetime.fromisoformat(row["datetime"]), row["traffic_volume"]) for row in rows)
    return [(time, float(value)) for time, value in times if time.year == YEAR and value]


def day_type(day: date) -> str:
    return {5: "saturday", 6: "sunday"}.get(day.weekday(), "weekday")


@dataclass(frozen=True)
class Profile:
    """Shares by hour and the day's total over the calendar mean, by day type."""

    share: dict[str, list[float]]
    day_factor: dict[str, float]


def interstate_profile() -> Profile:
    """Means by day type and hour (so that missed hours do not weigh), made a share of the day.

    The factor of a day type is its day over the mean day of the calendar year,
    so that the year's mean factor is 1 exactly. Holidays stay weekdays.
    """
    sums: dict[tuple[str, int], list[float]] = {}
    for time, vehicles in interstate_volumes():
        sums.setdefault((day_type(time.date()), time.hour), []).append(vehicles)
    mean = {key: math.fsum(values) / len(values) for key, values in sums.items()}
    total = {kind: math.fsum(mean[kind, hour] for hour in range(24)) for kind in DAY_TYPES}
    days = [day_type(date(YEAR, 1, 1) + timedelta(days=n)) for n in range(365)]
    average = math.fsum(total[kind] for kind in days) / len(days)
    return Profile(
        share={k: [mean[k, hour] / total[k] for hour in range(24)] for k in DAY_TYPES},
        day_factor={kind: total[kind] / average for kind in DAY_TYPES},
    )


def traffic_shape(profile: Profile, starts: Sequence[datetime]) -> FloatArray:
    """(T,) vehicles in each hour over AADT; Arizona's clocks never change."""
    return np.array(
        [
            profile.share[day_type(s.date())][s.hour] * profile.day_factor[day_type(s.date())]
            for s in starts
        ]
    )


# --- the study folder ----------------------------------------------------------------


STUDY = f"""
[study]
title = "Real streets, schools, weather and traffic profile; volumes and factors invented"
timezone = "America/Phoenix"
terrain = "open"
crs = "{STATE_PLANE_METRES}"
reference = "25 C"

[roads]
file = "streets.shp"
columns = {{ link = "ID", aadt = "ADT", speed = "SPEED [mph]", heavy_share = "HGV [%]", \
width = "WIDTH [ft]" }}

[traffic]
profiles = "profiles.csv"

[fleet]
factors = "factors.csv"
year = {YEAR}

[weather]
file = "weather.csv"
clock = "standard"
hour_ending = true
anemometer_height = "10 m"

[air]
constant = {{ o3 = "{BACKGROUND_O3_PPB} ppb", no2 = "{BACKGROUND_NO2_PPB} ppb" }}

[receptors]
points = "schools.shp"
columns = {{ receptor = "POLYID" }}
height = "1.5 m"

[standards]
use = ["us-naaqs-1h", "us-naaqs-annual"]

[outputs]
hourly = "all"
"""


def write_csv(path: Path, header: Sequence[str], rows: Iterable[Sequence[Any]]) -> None:
    with path.open("w", newline="", encoding="utf-8") as file:
        writer = csv.writer(file)
        writer.writerow(header)
        writer.writerows(rows)


def write_study(folder: Path) -> Path:
    """Write the whole study: the schools' shapefile as it is, the rest in our tables."""
    streets = raw_streets()
    kinds = [STREET_KINDS[kind] for kind in street_kinds(streets)]
    streets = streets[["ID", "geometry"]].assign(
        ID=[f"{int(number)}" for number in streets["ID"]],
        ADT=[kind.aadt for kind in kinds],
        SPEED=[float(kind.speed_mph) for kind in kinds],
        HGV=[kind.heavy_percent for kind in kinds],
        WIDTH=[kind.width_ft for kind in kinds],
    )
    streets.to_file(folder / "streets.shp")
    for suffix in (".shp", ".shx", ".dbf", ".prj"):
        shutil.copy(shipped("libpysal", "examples", "geodanet", f"schools{suffix}"), folder)
    write_csv(
        folder / "factors.csv",
        ["vehicle_class", "speed [mph]", "nox [g/mi]", "no2_fraction"],
        [
            (name, speed, *values)
            for name, table in FACTORS.items()
            for speed, values in table.items()
        ],
    )
    write_profile(folder, interstate_profile())
    write_weather(folder, station_year())
    study = folder / "study.toml"
    study.write_text(STUDY, encoding="utf-8")
    return study


def write_profile(folder: Path, profile: Profile) -> None:
    write_csv(
        folder / "profiles.csv",
        ["profile", "day_type", "hour", "share", "day_factor"],
        [
            ("interstate", kind, hour, repr(share), repr(profile.day_factor[kind]))
            for kind in DAY_TYPES
            for hour, share in enumerate(profile.share[kind])
        ],
    )


def write_weather(folder: Path, station: Station) -> None:
    """Our CSV; hours are named by their end, undefined directions and no ceiling left empty."""
    rows = zip(
        [(start + timedelta(hours=1)).isoformat() for start in station.start],
        [value or "" for value in station.wind_from],
        station.wind_speed,
        station.temperature_c,
        station.pressure_mbar,
        station.opaque_tenths,
        ["" if math.isinf(value) else value for value in station.ceiling_m],
        strict=True,
    )
    header = [
        "time",
        "wind_from [deg]",
        "wind_speed [m/s]",
        "temperature [degC]",
        "pressure [hPa]",
        "cloud [tenths]",
        "ceiling [m]",
    ]
    write_csv(folder / "weather.csv", header, rows)
