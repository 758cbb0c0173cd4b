"""What each table of a study may hold: columns, meaning, units, ranges.

Readers check by these lists and ``roaddisp inputs`` prints them, so that the
one cannot say what the other does not do.
"""

from __future__ import annotations

from typing import Final

from roaddisp.standards.rules import KINDS
from roaddisp.study.table_types import LAYER, Column, Table
from roaddisp.study.traffic_columns import COUNTS, FACTORS, MIX, PROFILES, ROADS

WEATHER: Final = Table(
    "weather",
    "hours of a station, in the order of time; gaps are missing hours",
    "CSV",
    (
        Column("time", "beginning of the hour (end, with hour_ending)", "time", required=True),
        Column(
            "wind_from",
            "direction the wind comes from, clockwise from north",
            "angle",
            required=True,
            low=0,
            high=360,
            empty="missing; calm where the speed is below 1 m/s",
        ),
        Column(
            "wind_speed",
            "at anemometer_height",
            "speed",
            required=True,
            low=0,
            high=75,
            empty="a missing hour",
        ),
        Column(
            "temperature",
            "of the air",
            "temperature",
            required=True,
            low=180,
            high=340,
            empty="missing",
        ),
        Column(
            "stability",
            "class by Pasquill; this, or cloud",
            "text",
            choices=tuple("ABCDEF"),
            empty="a missing hour",
        ),
        Column(
            "cloud",
            "amount of cloud, opaque where reported; for Turner's classes",
            "cloud",
            low=0,
            high=10,
            empty="a missing hour",
        ),
        Column(
            "ceiling",
            "height of the cloud base above ground, beside cloud",
            "length",
            low=0,
            high=30_000,
            empty="no ceiling",
        ),
        Column(
            "mixing_height",
            "height of the lid above ground",
            "length",
            low=1,
            high=20_000,
            empty="no lid",
        ),
        Column("pressure", "at the station", "pressure", low=50_000, high=110_000, empty="missing"),
        Column(
            "solar",
            "global radiation; for classes by radiation",
            "radiation",
            low=0,
            high=1500,
            empty="missing",
            later=True,
        ),
        Column(
            "temperature_difference",
            "between two heights",
            "temperature",
            empty="missing",
            later=True,
        ),
        Column(
            "sigma_theta",
            "standard deviation of wind direction",
            "angle",
            empty="missing",
            later=True,
        ),
    ),
)

AIR: Final = Table(
    "air",
    "hours of a monitor away from the roads of the study",
    "CSV",
    (
        Column("time", "beginning of the hour (end, with hour_ending)", "time", required=True),
        Column(
            "o3", "ozone", "concentration", required=True, low=-5, high=1000, empty="a missing hour"
        ),
        Column(
            "no2",
            "nitrogen dioxide",
            "concentration",
            required=True,
            low=-5,
            high=2000,
            empty="a missing hour",
        ),
        Column("no", "nitric oxide", "concentration", low=-5, high=5000, empty="missing"),
        Column(
            "nox",
            "nitrogen oxides (in ug/m3: as NO2); NO is then nox less no2",
            "concentration",
            low=-5,
            high=5000,
            empty="missing",
        ),
    ),
)

_RECEPTOR_COLUMNS: Final = (
    Column("receptor", "id of the receptor, unique", "id", required=True),
    Column("site", "site it belongs to", "text", empty="none"),
    Column(
        "kind",
        "what it stands for; it decides which standards judge it",
        "text",
        choices=KINDS,
        empty="none: every health standard judges it",
    ),
    Column("height", "above ground", "length", low=0, high=500, empty="[receptors] height"),
)

POINTS: Final = Table(
    "points",
    "receptors, one a row or feature",
    f"{LAYER}, or CSV",
    (
        *_RECEPTOR_COLUMNS,
        Column("x", "easting in the study CRS (in a CSV)", "length", empty="only beside longitude"),
        Column("y", "northing in the study CRS (in a CSV)", "length", empty="only beside latitude"),
        Column(
            "longitude",
            "WGS 84, decimal degrees (in a CSV)",
            "number",
            low=-180,
            high=180,
            empty="only beside x",
        ),
        Column(
            "latitude",
            "WGS 84, decimal degrees (in a CSV)",
            "number",
            low=-90,
            high=90,
            empty="only beside y",
        ),
    ),
    "Point",
)

SITES: Final = Table(
    "sites",
    "polygons that receive receptors on their outline and inside",
    LAYER,
    (
        Column(
            "site", "name of the site, unique; receptors are named <site>-<n>", "id", required=True
        ),
        Column(
            "kind",
            "kind of its receptors",
            "text",
            choices=KINDS,
            empty="none: every health standard judges them",
        ),
    ),
    "Polygon or MultiPolygon",
)

TABLES: Final = {
    "roads": {"file": ROADS},
    "traffic": {"profiles": PROFILES, "counts": COUNTS},
    "fleet": {"mix": MIX, "factors": FACTORS},
    "weather": {"file": WEATHER},
    "air": {"file": AIR},
    "receptors": {"points": POINTS, "sites": SITES},
}
"""By section of study.toml and the key that names the file."""
