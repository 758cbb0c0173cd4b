"""Make the data of the example study `larch_field`. Every number in it is invented.

The place, its roads, traffic, vehicles, weather and air do not exist. What is
plausible about them (rush hours, calm nights, ozone that peaks in the
afternoon) was put there by the formulas below, which are rough on purpose and
no source for anything.

    python examples/make_larch_field.py [FOLDER]

writes the same bytes each time (for one version of GDAL, where GeoPackages
are concerned): chance comes only from `random.Random(SEED).random`, whose
sequence Python promises to keep, and files carry a fixed date.
"""

from __future__ import annotations

import csv
import math
import random
import sys
from collections.abc import Iterable, Iterator, Sequence
from datetime import datetime, timedelta
from pathlib import Path

import geopandas as gpd
import pyogrio
from shapely import LineString, Point, Polygon

SEED = 20_270
YEAR = 2027
HOURS = 8_760
CRS = "EPSG:32613"
EAST, NORTH = 620_000.0, 4_440_000.0
LATITUDE = 40.1
FILE_DATE = "2026-01-01T00:00:00Z"

Place = tuple[float, float]


# --- roads and places ---------------------------------------------------------


def freeway_axis(along: float) -> Place:
    """Point of the freeway's median, `along` metres north of its middle: a gentle curve."""
    return 0.11 * along + 6.0e-5 * along**2, along


def beside_freeway(along: float, offset: float) -> Place:
    """Point `offset` metres to the right of the median, looking north."""
    slope = 0.11 + 1.2e-4 * along
    length = math.hypot(1.0, slope)
    x, y = freeway_axis(along)
    return x + offset / length, y - offset * slope / length


def line(places: Iterable[Place]) -> LineString:
    return LineString([(round(EAST + x, 2), round(NORTH + y, 2)) for x, y in places])


def polygon(places: Iterable[Place]) -> Polygon:
    return Polygon([(EAST + x, NORTH + y) for x, y in places])


def roads(*, build: bool) -> gpd.GeoDataFrame:
    """The links of one scenario; the build widens the arterial, and traffic follows."""
    stations = range(-1_100, 1_101, 100)
    arterial_aadt = 35_000 if build else 23_500
    ramp_aadt = 11_500 if build else 7_800
    arterial_width = 79 if build else 55
    ramp = [
        (112, -352),
        (106, -300),
        (94, -230),
        (76, -150),
        (58, -60),
        beside_freeway(40, 24),
        beside_freeway(160, 17),
    ]
    rows = [
        # link, name, AADT, mph, truck share in %, width in ft, profile, geometry
        ("F-north", "Larch Freeway", 38_500, "65", 11.0, 36, "to-town",
         line(beside_freeway(s, 10.0) for s in stations)),
        ("F-south", "Larch Freeway", 37_500, "65", 11.0, 36, "from-town",
         line(beside_freeway(s, -10.0) for s in reversed(stations))),
        ("R-on", "Mill Road on-ramp", ramp_aadt, "35", 9.0, 16, "to-town", line(ramp)),
        ("A-west", "Mill Road", arterial_aadt - 4_000, "40", 5.0, arterial_width, "street",
         line([(-700, -330), (-420, -338), (-160, -348), (112, -352)])),
        ("A-east", "Mill Road", arterial_aadt, "40", 5.0, arterial_width, "street",
         line([(112, -352), (330, -354), (560, -346), (800, -330)])),
    ]  # fmt: skip
    names = ["link", "NAME", "AADT", "SPD_LIM", "TRUCKS", "WID_FT", "PROFILE", "geometry"]
    table = {name: [row[i] for row in rows] for i, name in enumerate(names)}
    table["SPD_LIM"] = [float(speed) for speed in table["SPD_LIM"]]
    table["WID_FT"] = [float(width) for width in table["WID_FT"]]
    return gpd.GeoDataFrame(table, crs=CRS)


def points() -> gpd.GeoDataFrame:
    rows = [
        ("classroom-west", "Larch Field School", "classroom", (236, -232)),
        ("classroom-east", "Larch Field School", "classroom", (304, -232)),
        ("air-intake", "Larch Field School", "intake", (270, -205)),
        ("playground", "Larch Field School", "playground", (196, -250)),
        ("ball-field", "Larch Field School", "playground", (178, -160)),
        ("home-ramp", "", "home", (150, -60)),
        ("home-mill-road", "", "home", (250, -400)),
        ("home-west", "", "home", (-190, -120)),
        ("freeway-edge", "", "roadside", beside_freeway(-180, 15.5 + 5.0)),
        ("freeway-edge-west", "", "roadside", beside_freeway(-180, -15.5 - 5.0)),
        ("trail", "", "roadside", beside_freeway(-180, 15.5 + 40.0)),
        ("mill-road-kerb", "", "roadside", (300, -336)),
    ]
    return gpd.GeoDataFrame(
        {
            "receptor": [row[0] for row in rows],
            "site": [row[1] or None for row in rows],
            "kind": [row[2] for row in rows],
            "geometry": [Point(round(EAST + x, 1), round(NORTH + y, 1)) for *_, (x, y) in rows],
        },
        crs=CRS,
    )


def sites() -> gpd.GeoDataFrame:
    parcel = polygon([(158, -322), (352, -324), (356, -132), (128, -126), (140, -210)])
    return gpd.GeoDataFrame(
        {"site": ["Larch Field School"], "kind": ["playground"], "geometry": [parcel]}, crs=CRS
    )


def write_layer(frame: gpd.GeoDataFrame, path: Path, layer: str) -> None:
    path.unlink(missing_ok=True)
    pyogrio.set_gdal_config_options({"OGR_CURRENT_DATE": FILE_DATE})
    try:
        pyogrio.write_dataframe(
            frame,
            path,
            layer=layer,
            driver="GPKG",
            dataset_options={"VERSION": "1.2"},
            layer_options={"DESCRIPTION": "Invented data of the example study Larch Field"},
        )
    finally:
        pyogrio.set_gdal_config_options({"OGR_CURRENT_DATE": None})


# --- traffic and vehicles -------------------------------------------------------


def bump(hour: float, centre: float, width: float) -> float:
    return math.exp(-0.5 * ((hour - centre) / width) ** 2)


def weights(profile: str, day_type: str) -> list[float]:
    """Relative traffic of the 24 hours."""
    morning, evening = {"to-town": (1.5, 0.9), "from-town": (0.8, 1.6), "street": (1.1, 1.3)}[
        profile
    ]
    result = []
    for hour in range(24):
        midday = 0.95 * bump(hour, 13.5, 4.2)
        night = 0.09
        if day_type == "weekday":
            rush = morning * bump(hour, 7.3, 1.2) + evening * bump(hour, 16.7, 1.5)
            school = 0.35 * bump(hour, 14.8, 0.7) if profile == "street" else 0.0
            result.append(night + midday + rush + school + 0.35 * bump(hour, 19.5, 1.8))
        else:
            result.append(night + 1.35 * midday + 0.55 * bump(hour, 18.5, 2.6))
    return result


def shares(values: Sequence[float]) -> list[float]:
    """Shares to five decimals that sum to 1; the largest takes what rounding left."""
    total = sum(values)
    rounded = [round(value / total, 5) for value in values]
    largest = rounded.index(max(rounded))
    rounded[largest] = round(rounded[largest] + 1.0 - sum(rounded), 5)
    return rounded


DAY_FACTOR = {"weekday": 1.06, "saturday": 0.93, "sunday": 0.7688}
"""Traffic of a day over AADT: (261 x 1.06 + 52 x 0.93 + 52 x 0.7688) / 365 = 1.0000 in 2027."""


def profile_rows() -> Iterator[tuple[object, ...]]:
    for profile in ("to-town", "from-town", "street"):
        for day_type, factor in DAY_FACTOR.items():
            for hour, share in enumerate(shares(weights(profile, day_type))):
                yield profile, day_type, hour, f"{share:.5f}", f"{factor:g}"


MIX = {
    "car": 0.715,
    "van": 0.190,
    "motorcycle": 0.005,
    "bus": 0.006,
    "rigid_truck": 0.028,
    "articulated_truck": 0.056,
}

VEHICLES = {
    # class: NOx in g/mi at its best speed, primary NO2 as a fraction
    "car": (0.23, 0.13),
    "van": (0.41, 0.22),
    "motorcycle": (0.55, 0.05),
    "bus": (4.4, 0.14),
    "rigid_truck": (3.2, 0.14),
    "articulated_truck": (4.6, 0.14),
}


def factor_rows() -> Iterator[tuple[object, ...]]:
    for vehicle_class, (best, fraction) in VEHICLES.items():
        for mph in range(10, 80, 5):
            slow = 0.9 * (10 / mph) ** 1.2
            fast = 0.35 * (max(mph - 45, 0) / 30) ** 2
            yield vehicle_class, mph, f"{best * (1 + slow + fast):.3f}", f"{fraction:.2f}", YEAR


# --- weather and air ------------------------------------------------------------


class Chance:
    """Normal deviates (Box and Muller 1958) and slowly wandering series of them."""

    def __init__(self, seed: int) -> None:
        self._random = random.Random(seed)
        self._state: dict[str, float] = {}

    def uniform(self) -> float:
        return self._random.random()

    def normal(self) -> float:
        radius = math.sqrt(-2.0 * math.log(1.0 - self.uniform()))
        return radius * math.cos(2.0 * math.pi * self.uniform())

    def wander(self, name: str, hours: float) -> float:
        """Next hour of a series of unit variance that forgets itself in about `hours`."""
        keep = math.exp(-1.0 / hours)
        last = self._state.get(name)
        value = self.normal()
        if last is not None:
            value = keep * last + math.sqrt(1.0 - keep * keep) * value
        self._state[name] = value
        return value


def sine_of_sun(day: int, hour: float) -> float:
    """Sine of the sun's elevation, good to a degree or so."""
    declination = math.radians(23.44) * math.sin(2 * math.pi * (day - 80) / 365)
    latitude = math.radians(LATITUDE)
    turn = math.radians(15 * (hour - 12))
    return math.sin(latitude) * math.sin(declination) + math.cos(latitude) * math.cos(
        declination
    ) * math.cos(turn)


def wind(chance: Chance, sun: float, hour: int) -> tuple[int | None, int]:
    """Direction [deg, whole tens] and speed [whole knots]; up to 2 kn is reported calm."""
    strength = chance.wander("synoptic wind", 36)
    gust = chance.wander("local wind", 3)
    mixing = max(sun, 0.0)
    speed = (6.3 + 4.4 * mixing) * math.exp(0.42 * strength + 0.30 * gust)
    # light winds drain from the hills by night and blow up the valley by day
    local = 235.0 if sun < 0.1 else 115.0 if hour < 16 else 160.0
    turn = 55.0 * chance.wander("direction", 10) + 22.0 * chance.wander("local direction", 1.5)
    share = 1.0 / (1.0 + math.exp(-2.2 * (strength - 0.2)))
    # the shorter way round from the local wind to the prevailing north-westerly
    way = (300.0 - local + 180.0) % 360.0 - 180.0
    direction = (local + share * way + turn) % 360.0
    knots = round(speed)
    if knots <= 2:
        return None, 0
    return (round(direction / 10.0) * 10 - 1) % 360 + 1, knots


def sky(chance: Chance, sun: float) -> tuple[int, int | None]:
    """Cloud [tenths] and ceiling [ft]; below six tenths there is no ceiling."""
    state = chance.wander("cloud", 22) + 0.35 * chance.wander("patches", 2)
    cumulus = 0.5 * max(sun, 0.0)
    tenths = min(max(round(4.4 + 4.3 * (state + cumulus - 0.25)), 0), 10)
    level = chance.wander("cloud base", 14) - 0.7 * state
    if tenths < 6:
        return tenths, None
    base = 7_500.0 * math.exp(0.75 * level)
    step = 100 if base < 5_000 else 500 if base < 10_000 else 1_000
    return tenths, int(min(max(round(base / step) * step, 200), 25_000))


def hours() -> Iterator[tuple[list[object], list[object]]]:
    """One row of weather and one of air for each hour of local standard time."""
    chance = Chance(SEED)
    start = datetime(YEAR, 1, 1)  # noqa: DTZ001 - local standard time, no zone in the file
    for count in range(HOURS):
        time = start + timedelta(hours=count)
        day, hour = count // 24 + 1, time.hour
        sun = sine_of_sun(day, hour + 0.5)
        sun_before = sine_of_sun(day, hour - 2.0)
        wind_from, knots = wind(chance, sun, hour)
        tenths, ceiling = sky(chance, sun)
        summer = math.sin(2 * math.pi * (day - 110) / 365)
        clear = 1.0 - tenths / 10.0
        temperature = (
            9.0
            + 13.0 * summer
            + (3.0 + 4.5 * clear) * math.cos(2 * math.pi * (hour - 15.0) / 24)
            + 3.5 * chance.wander("air mass", 60)
        )
        o3, no2 = air(chance, time, sun, sun_before, knots, clear, summer)
        no_wind = chance.uniform() < 0.006
        no_sky = chance.uniform() < 0.004
        weather = [
            "" if no_wind or wind_from is None else wind_from,
            "" if no_wind else knots,
            f"{temperature:.1f}",
            "" if no_sky else tenths,
            "" if no_sky or ceiling is None else ceiling,
        ]
        stamp = time.isoformat()
        off = chance.uniform() < 0.008
        yield (
            [stamp, *weather],
            [stamp, *(("", "") if off else (f"{o3:.1f}", f"{no2:.1f}"))],
        )


def air(
    chance: Chance,
    time: datetime,
    sun: float,
    sun_before: float,
    knots: int,
    clear: float,
    summer: float,
) -> tuple[float, float]:
    """Ozone and NO2 [ppb] of a town's air away from its roads."""
    hour = time.hour
    working = 1.0 if time.weekday() < 5 else 0.62
    emission = 0.25 + working * (1.25 * bump(hour, 7.5, 1.4) + 0.9 * bump(hour, 18.0, 2.4))
    depth = 0.55 + 2.6 * max(sun_before, 0.0) + 0.09 * knots
    no2 = 10.5 * emission**0.6 / depth * (1.35 - 0.45 * summer)
    no2 *= math.exp(0.28 * chance.wander("no2", 8))
    photochemistry = 21.0 * max(sun_before, 0.0) * (0.35 + 0.65 * clear) * (1.0 + 0.45 * summer)
    oxidant = 37.0 + 4.0 * summer + photochemistry + 4.5 * chance.wander("oxidant", 40)
    loss = 11.0 * math.exp(-knots / 5.0) * (1.0 if sun < 0.1 else 0.2)
    return max(oxidant - no2 - loss, 0.6), min(max(no2, 0.8), 48.0)


# --- files ----------------------------------------------------------------------


def write_table(path: Path, header: str, rows: Iterable[Iterable[object]]) -> None:
    with path.open("w", encoding="utf-8", newline="") as file:
        file.write(header + "\n")
        csv.writer(file, lineterminator="\n").writerows(rows)


def main(folder: Path) -> None:
    """Write every data file of the study into `folder`."""
    folder.mkdir(parents=True, exist_ok=True)
    write_layer(roads(build=False), folder / "roads.gpkg", "roads")
    write_layer(roads(build=True), folder / "roads_build.gpkg", "roads")
    write_layer(points(), folder / "points.gpkg", "points")
    write_layer(sites(), folder / "sites.gpkg", "sites")
    write_table(folder / "profiles.csv", "profile,day_type,hour,share,day_factor", profile_rows())
    write_table(
        folder / "mix.csv",
        "fleet,vehicle_class,share",
        (("all", name, share) for name, share in MIX.items()),
    )
    write_table(
        folder / "factors.csv",
        "vehicle_class,speed [mph],nox [g/mi],no2_fraction,year",
        factor_rows(),
    )
    year = list(hours())
    write_table(
        folder / "weather.csv",
        "time,wind_from [deg],wind_speed [kn],temperature [degC],cloud [tenths],ceiling [ft]",
        (weather for weather, _ in year),
    )
    write_table(folder / "air.csv", "time,o3 [ppb],no2 [ppb]", (row for _, row in year))


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent / "larch_field")
