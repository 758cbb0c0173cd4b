"""A small study to start from: an invented place with invented data that run as they are."""

from __future__ import annotations

import json
import math
from datetime import datetime, timedelta
from pathlib import Path
from typing import Final

from roaddisp.errors import OutputError

_NOTE: Final = "All data in this file are invented; the place does not exist. Replace them."
_DAYS: Final = 14
_WEST, _SOUTH = -104.62, 40.91

_SETTINGS: Final = f"""\
# {_NOTE}
# `roaddisp inputs` describes every key and every column.

[study]
title = "A first study (all data invented)"
timezone = "America/Denver"
terrain = "open"
reference = "25 C"

[roads]
file = "roads.geojson"
columns = {{ speed = "speed_limit [mph]", width = "width [ft]", heavy_share = "trucks [%]" }}

[traffic]
profiles = "profiles.csv"

[fleet]
factors = "factors.csv"

[weather]
file = "weather.csv"
clock = "standard"
anemometer_height = "10 m"
calms = "both"

[air]
file = "air.csv"
clock = "standard"

[receptors]
points = "receptors.csv"
grid = {{ spacing = "50 m", within = "200 m" }}
height = "1.5 m"

[conversion]
method = "ozone-limited"

[dispersion]
curves = "briggs"

[standards]
use = ["us-naaqs-1h", "us-naaqs-annual"]

[outputs]
hourly = ["classroom"]

# A scenario overrides any key above; take the # away to try it.
# [scenario.fewer-trucks]
# roads.columns = {{ speed = "speed_limit [mph]", width = "width [ft]", heavy_share = "fewer [%]" }}
"""

_FACTORS: Final = """\
vehicle_class,speed [km/h],nox [g/km],no2_fraction
car,20,0.42,0.20
car,50,0.30,0.20
car,90,0.26,0.20
car,120,0.34,0.20
articulated_truck,20,4.6,0.10
articulated_truck,50,2.9,0.10
articulated_truck,90,2.1,0.10
articulated_truck,120,2.2,0.10
"""

_RECEPTORS: Final = (
    ("classroom", "school", "classroom", 0.0122, 0.0090),
    ("playground", "school", "playground", 0.0119, 0.0083),
    ("home", "", "home", 0.0060, 0.0095),
    ("bus-stop", "", "roadside", 0.0151, 0.0104),
)


def new_study(folder: str | Path) -> tuple[Path, ...]:
    """Write a small study that runs as it is.

    Parameters
    ----------
    folder : str or Path
        New, or empty.

    Returns
    -------
    tuple of Path
        The files written, ``study.toml`` first.

    Raises
    ------
    OutputError
        Where the folder holds something, or cannot be written.

    Examples
    --------
    >>> import tempfile
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     print(new_study(folder)[0].name)
    study.toml
    """
    path = Path(folder)
    files = {
        "study.toml": _SETTINGS,
        "roads.geojson": _roads(),
        "profiles.csv": _noted(_profiles()),
        "factors.csv": _noted(_FACTORS),
        "weather.csv": _noted(_weather()),
        "air.csv": _noted(_air()),
        "receptors.csv": _noted(_receptors()),
    }
    try:
        if path.exists() and (not path.is_dir() or any(path.iterdir())):
            raise OutputError(f"{path} holds something already; name a new or an empty folder")
        path.mkdir(parents=True, exist_ok=True)
        for name, text in files.items():
            (path / name).write_text(text, encoding="utf-8", newline="\n")
    except OSError as error:
        if isinstance(error, OutputError):
            raise
        raise OutputError(f"{path} cannot be written ({error.strerror})") from error
    return tuple(path / name for name in files)


def _noted(text: str) -> str:
    return f"# {_NOTE}\n{text}"


def _roads() -> str:
    def feature(link: str, line: list[tuple[float, float]], **columns: object) -> dict[str, object]:
        places = [[round(_WEST + x, 6), round(_SOUTH + y, 6)] for x, y in line]
        return {
            "type": "Feature",
            "properties": {"link": link, **columns},
            "geometry": {"type": "LineString", "coordinates": places},
        }

    parkway = [(0.0, 0.0080), (0.0100, 0.0074), (0.0240, 0.0072)]
    avenue = [(0.0150, 0.0073), (0.0153, 0.0110), (0.0150, 0.0160)]
    layer = {
        "type": "FeatureCollection",
        "note": _NOTE,
        "features": [
            feature(
                "parkway",
                parkway,
                name="Sorrel Parkway",
                aadt=42000,
                speed_limit=50,
                width=72,
                trucks=8,
                fewer=4,
            ),
            feature(
                "avenue",
                avenue,
                name="Teasel Avenue",
                aadt=11000,
                speed_limit=30,
                width=40,
                trucks=4,
                fewer=4,
            ),
        ],
    }
    return json.dumps(layer, indent=1) + "\n"


def _profiles() -> str:
    rows = ["profile,day_type,hour,share,day_factor"]
    for day, factor, peaks in (
        ("weekday", 1.06, ((8, 1.0), (17, 1.2))),
        ("saturday", 0.92, ((13, 1.0),)),
        ("sunday", 0.78, ((14, 1.0),)),
    ):
        raw = [
            0.12
            + 0.8 * math.exp(-(((hour - 13.0) / 5.0) ** 2))
            + sum(size * math.exp(-(((hour - at) / 1.4) ** 2)) for at, size in peaks)
            for hour in range(24)
        ]
        shares = [round(value / sum(raw), 5) for value in raw]
        shares[3] = round(shares[3] + 1.0 - sum(shares), 5)
        rows += [f"town,{day},{hour},{share:.5f},{factor}" for hour, share in enumerate(shares)]
    return "\n".join(rows) + "\n"


def _hours() -> list[tuple[str, int, float]]:
    start = datetime(2024, 3, 4)  # noqa: DTZ001
    return [
        ((start + timedelta(hours=n)).isoformat(timespec="minutes"), n % 24, n / 24.0)
        for n in range(24 * _DAYS)
    ]


def _weather() -> str:
    rows = [
        "time,wind_from [deg],wind_speed [m/s],temperature [degC],cloud [tenths],ceiling [ft],"
        "pressure [hPa]"
    ]
    for time, hour, day in _hours():
        sun = math.sin(math.pi * (hour - 6) / 12.0)
        swing = 60.0 * math.sin(2 * math.pi * day / 4.3) + 25.0 * math.sin(2.4 * hour + day)
        wind_from = round((190.0 + swing) % 360.0 / 10.0) * 10 % 360
        speed = 2.6 + 1.7 * max(sun, 0.0) + 1.5 * math.sin(2 * math.pi * day / 5.1)
        speed = max(round(speed + 0.8 * math.sin(3.7 * hour + 2.1 * day), 1), 0.0)
        cloud = round(5.0 + 5.0 * math.sin(2 * math.pi * day / 3.2))
        ceiling = f"{3000 + 400 * (hour % 12)}" if cloud >= 5 else ""
        temperature = round(6.0 + 7.0 * sun + 4.0 * math.sin(2 * math.pi * day / 9.0), 1)
        pressure = round(842.0 + 5.0 * math.sin(2 * math.pi * day / 6.0), 1)
        rows.append(f"{time},{wind_from},{speed},{temperature},{cloud},{ceiling},{pressure}")
    return "\n".join(rows) + "\n"


def _air() -> str:
    rows = ["time,o3 [ppb],no2 [ppb]"]
    for time, hour, day in _hours():
        slow = math.sin(2 * math.pi * day / 5.1)
        ozone = 31.0 - 14.0 * math.cos(2 * math.pi * (hour - 3.5) / 24.0) + 5.0 * slow
        no2 = 10.0 + 5.0 * math.cos(2 * math.pi * (hour - 7.0) / 12.0) - 3.0 * slow
        rows.append(f"{time},{ozone:.1f},{no2:.1f}")
    return "\n".join(rows) + "\n"


def _receptors() -> str:
    rows = ["receptor,site,kind,longitude,latitude"]
    for name, site, kind, x, y in _RECEPTORS:
        rows.append(f"{name},{site},{kind},{_WEST + x:.6f},{_SOUTH + y:.6f}")
    return "\n".join(rows) + "\n"
