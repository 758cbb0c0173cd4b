"""What each table of a study may hold: columns, meaning, units, ranges.

Readers check by these lists and ``roaddisp inputs`` prints them, so that the
one cannot say what the other does not do.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

DAY_TYPES: Final = ("weekday", "saturday", "sunday")
KINDS: Final = (
    "classroom", "playground", "home", "facade", "intake", "roadside", "vegetation", "grid",
)  # fmt: skip
LIGHT_CLASSES: Final = ("car", "van", "motorcycle")
HEAVY_CLASSES: Final = ("bus", "rigid_truck", "articulated_truck")
CLASSES: Final = (*LIGHT_CLASSES, *HEAVY_CLASSES)


@dataclass(frozen=True)
class Column:
    """One column of a table.

    Attributes
    ----------
    quantity : str
        A quantity of `roaddisp.quantities`, or ``id``, ``text``, ``time``,
        ``number``, ``integer``.
    low, high : float, in the unit kept inside
    choices : tuple of str
        The words allowed, for a text; empty for any.
    empty : str
        What an empty cell (or a column left out) means; without it an empty
        cell is an error.
    later : bool
        A column of the contract that this version refuses where it is not zero.
    """

    name: str
    meaning: str
    quantity: str
    required: bool = False
    low: float | None = None
    high: float | None = None
    choices: tuple[str, ...] = ()
    empty: str = ""
    later: bool = False


@dataclass(frozen=True)
class Table:
    """One kind of file: its columns, and whether it is a CSV or a vector layer."""

    name: str
    meaning: str
    forms: str
    columns: tuple[Column, ...]
    geometry: str = ""

    def column(self, name: str) -> Column:
        """Find a column by our name."""
        return next(column for column in self.columns if column.name == name)

    @property
    def names(self) -> tuple[str, ...]:
        """Our names of its columns."""
        return tuple(column.name for column in self.columns)


_LAYER: Final = "GeoPackage, GeoJSON, Shapefile or FlatGeobuf"

ROADS: Final = Table(
    "roads", "road centrelines, one feature a link, in any CRS", _LAYER,
    (
        Column("link", "id of the link, unique", "id", required=True),
        Column("aadt", "vehicles a day, both directions of what the line stands for, seven-day "
               "annual average", "number", low=0, high=1_000_000,
               empty="only with hourly counts, which then stand instead"),
        Column("speed", "mean speed of the traffic", "speed", required=True, low=0.1, high=70.0),
        Column("heavy_share", "share of heavy vehicles (bus, rigid_truck, articulated_truck)",
               "fraction", low=0, high=1, empty="the mix decides"),
        Column("name", "name of the road", "text", empty="the link's id"),
        Column("width", "width of the travelled way", "length", low=0.05, high=200.0,
               empty="3.6 m a lane, or 7.2 m without lanes"),
        Column("lanes", "number of lanes, both directions of what the line stands for", "number",
               low=1, high=40, empty="not given"),
        Column("profile", "name of a profile", "text", empty="the only profile there is"),
        Column("fleet", "name of a fleet of the mix", "text", empty="the only fleet there is"),
        Column("grade", "slope along the link", "fraction", empty="0", later=True),
        Column("height", "of the road surface above its surroundings, negative in a cut", "length",
               empty="0", later=True),
        Column("edge_slope", "slope of the sides of an embankment or a cut", "number", empty="0",
               later=True),
        Column("capacity", "vehicles an hour", "number", empty="none", later=True),
        Column("barrier_height", "height of a barrier beside the road", "length", empty="none",
               later=True),
        Column("barrier_offset", "distance of the barrier from the edge", "length", empty="none",
               later=True),
    ),
    "LineString or MultiLineString",
)  # fmt: skip

PROFILES: Final = Table(
    "profiles", "shares of the day's traffic by hour of the civil clock", "CSV",
    (
        Column("profile", "name of the profile", "id", required=True),
        Column("day_type", "days it stands for; a named type comes before 'all'", "text",
               required=True, choices=("all", *DAY_TYPES)),
        Column("hour", "hour of the civil clock that begins then", "integer", required=True,
               low=0, high=23),
        Column("share", "share of the day's vehicles in the hour; the 24 shares sum to 1 within "
               "0.001 and are taken as they stand", "fraction", required=True, low=0, high=1),
        Column("month", "month it stands for; a named month comes before none", "integer",
               low=1, high=12, empty="every month"),
        Column("day_factor", "the day's total over AADT, the same in all hours of a day; its mean "
               "over the calendar year is 1 within 1 %", "number", low=0, high=20, empty="1"),
    ),
)  # fmt: skip

COUNTS: Final = Table(
    "counts", "hourly counts, one row a link and hour (and class)", "CSV",
    (
        Column("link", "id of a link of the roads", "id", required=True),
        Column("time", "beginning of the hour (end, with hour_ending)", "time", required=True),
        Column("vehicles", "vehicles in the hour", "number", required=True, low=0, high=100_000,
               empty="not counted: a missing hour"),
        Column("vehicle_class", "class of the vehicles, one that the factors have; a class that "
               "has no row on a link does not run there", "text", empty="all vehicles"),
        Column("speed", "mean speed in the hour, of all classes", "speed", low=0.1, high=70.0,
               empty="the link's speed"),
    ),
)  # fmt: skip

MIX: Final = Table(
    "mix", "shares of vehicle classes in each fleet", "CSV",
    (
        Column("fleet", "name of the fleet", "id", required=True),
        Column("vehicle_class", f"{', '.join(CLASSES)}, or one that the factors add", "id",
               required=True),
        Column("share", "share of the vehicles; the shares of a fleet sum to 1 within 0.001 and "
               "are taken as they stand", "fraction", required=True, low=0, high=1),
    ),
)  # fmt: skip

FACTORS: Final = Table(
    "factors", "emission factors by vehicle class and speed", "CSV",
    (
        Column("vehicle_class", f"{', '.join(CLASSES)}, or one of your own", "id", required=True),
        Column("speed", "mean speed the factor stands for", "speed", required=True, low=0,
               high=70.0),
        Column("nox", "NOx as NO2-equivalent mass", "emission factor", required=True, low=0,
               high=200.0),
        Column("no2_fraction", "share of NO2 in the NOx emitted", "fraction", required=True, low=0,
               high=1),
        Column("year", "year of the fleet; the nearest to the study's is taken", "integer",
               low=1950, high=2100, empty="every year"),
        Column("group", "light or heavy, for a class of your own", "text",
               choices=("light", "heavy"), empty="as the class name says"),
        Column("grade", "slope the factor stands for", "fraction", empty="0", later=True),
    ),
)  # fmt: skip

WEATHER: Final = Table(
    "weather", "hours of a station, in the order of time; gaps are missing hours", "CSV",
    (
        Column("time", "beginning of the hour (end, with hour_ending)", "time", required=True),
        Column("wind_from", "direction the wind comes from, clockwise from north", "angle",
               required=True, low=0, high=360,
               empty="missing; calm where the speed is below 1 m/s"),
        Column("wind_speed", "at anemometer_height", "speed", required=True, low=0, high=75,
               empty="a missing hour"),
        Column("temperature", "of the air", "temperature", required=True, low=180, high=340,
               empty="missing"),
        Column("stability", "class by Pasquill; this, or cloud", "text", choices=tuple("ABCDEF"),
               empty="a missing hour"),
        Column("cloud", "amount of cloud, opaque where reported; for Turner's classes", "cloud",
               low=0, high=10, empty="a missing hour"),
        Column("ceiling", "height of the cloud base above ground, beside cloud", "length", low=0,
               high=30_000, empty="no ceiling"),
        Column("mixing_height", "height of the lid above ground", "length", low=1, high=20_000,
               empty="no lid"),
        Column("pressure", "at the station", "pressure", low=50_000, high=110_000,
               empty="missing"),
        Column("solar", "global radiation; for classes by radiation", "radiation", low=0,
               high=1500, empty="missing", later=True),
        Column("temperature_difference", "between two heights", "temperature", empty="missing",
               later=True),
        Column("sigma_theta", "standard deviation of wind direction", "angle", empty="missing",
               later=True),
    ),
)  # fmt: skip

AIR: Final = Table(
    "air", "hours of a monitor away from the roads of the study", "CSV",
    (
        Column("time", "beginning of the hour (end, with hour_ending)", "time", required=True),
        Column("o3", "ozone", "concentration", required=True, low=-5, high=1000,
               empty="a missing hour"),
        Column("no2", "nitrogen dioxide", "concentration", required=True, low=-5, high=2000,
               empty="a missing hour"),
        Column("no", "nitric oxide", "concentration", low=-5, high=5000, empty="missing"),
        Column("nox", "nitrogen oxides (in ug/m3: as NO2); NO is then nox less no2",
               "concentration", low=-5, high=5000, empty="missing"),
    ),
)  # fmt: skip

_RECEPTOR_COLUMNS: Final = (
    Column("receptor", "id of the receptor, unique", "id", required=True),
    Column("site", "site it belongs to", "text", empty="none"),
    Column("kind", "what it stands for; it decides which standards judge it", "text",
           choices=KINDS, empty="none: every health standard judges it"),
    Column("height", "above ground", "length", low=0, high=500, empty="[receptors] height"),
)  # fmt: skip

POINTS: Final = Table(
    "points", "receptors, one a row or feature", f"{_LAYER}, or CSV",
    (
        *_RECEPTOR_COLUMNS,
        Column("x", "easting in the study CRS (in a CSV)", "length", empty="only beside longitude"),
        Column("y", "northing in the study CRS (in a CSV)", "length", empty="only beside latitude"),
        Column("longitude", "WGS 84, decimal degrees (in a CSV)", "number", low=-180, high=180,
               empty="only beside x"),
        Column("latitude", "WGS 84, decimal degrees (in a CSV)", "number", low=-90, high=90,
               empty="only beside y"),
    ),
    "Point",
)  # fmt: skip

SITES: Final = Table(
    "sites", "polygons that receive receptors on their outline and inside", _LAYER,
    (
        Column("site", "name of the site, unique; receptors are named <site>-<n>", "id",
               required=True),
        Column("kind", "kind of its receptors", "text", choices=KINDS,
               empty="none: every health standard judges them"),
    ),
    "Polygon or MultiPolygon",
)  # fmt: skip

TABLES: Final = {
    "roads": {"file": ROADS},
    "traffic": {"profiles": PROFILES, "counts": COUNTS},
    "fleet": {"mix": MIX, "factors": FACTORS},
    "weather": {"file": WEATHER},
    "air": {"file": AIR},
    "receptors": {"points": POINTS, "sites": SITES},
}
"""By section of study.toml and the key that names the file."""
