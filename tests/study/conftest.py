"""A small good study in an invented place (all data invented), to be broken in one place."""

from __future__ import annotations

import json
from collections.abc import Callable
from datetime import datetime, timedelta
from pathlib import Path

import pytest

from roaddisp.errors import Problem, StudyError
from roaddisp.model import Scenario, Study
from roaddisp.study.read import read_study

SETTINGS = """\
[study]
title = "A small study (invented)"
timezone = "Europe/Berlin"
terrain = "urban"
crs = "EPSG:25833"
reference = "20 C"

[roads]
file = "roads.geojson"
columns = { speed = "SPD [km/h]", width = "WID [m]", heavy_share = "HGV [%]" }

[traffic]
profiles = "profiles.csv"

[fleet]
mix = "mix.csv"
factors = "factors.csv"
year = 2023

[weather]
file = "weather.csv"
clock = "standard"
anemometer_height = "10 m"

[air]
file = "air.csv"
clock = "standard"

[receptors]
points = "points.csv"
height = "1.5 m"

[standards]
use = ["eu-2008-1h", "us-naaqs-annual"]

[outputs]
hourly = ["yard"]
"""

MIX = """\
fleet,vehicle_class,share
town,car,0.85
town,van,0.10
town,rigid_truck,0.05
"""

FACTORS = """\
vehicle_class,speed [km/h],nox [g/km],no2_fraction
car,30,0.40,0.15
car,100,0.30,0.15
van,30,0.90,0.20
van,100,0.80,0.20
rigid_truck,30,3.50,0.10
rigid_truck,100,2.50,0.10
"""

POINTS = """\
receptor,kind,x [m],y [m]
yard,playground,390000,5820060
gate,roadside,390080,5820095
"""

MAIN = {"aadt": 38000, "SPD": 80, "WID": 14.4, "HGV": 10}
SIDE = {"aadt": 9000, "SPD": 50, "WID": 7.2, "HGV": 4}
ROADS = [
    ("main", [(389300, 5819900), (390800, 5820140)], MAIN),
    ("side", [(390100, 5820030), (390040, 5820500)], SIDE),
]

EPSG_25833 = {"type": "name", "properties": {"name": "urn:ogc:def:crs:EPSG::25833"}}


def geojson(features: list[tuple[str, object, dict[str, object]]], key: str = "link") -> str:
    """Write features (id, coordinates or a whole geometry, properties) as GeoJSON."""
    made = []
    for name, place, columns in features:
        shape = place
        if isinstance(place, list):
            shape = {"type": "LineString", "coordinates": place}
        made.append({"type": "Feature", "properties": {key: name, **columns}, "geometry": shape})
    return json.dumps({"type": "FeatureCollection", "crs": EPSG_25833, "features": made})


def hours(count: int, start: str = "2023-03-01T00:00") -> list[str]:
    """List times an hour apart."""
    first = datetime.fromisoformat(start)
    return [(first + timedelta(hours=n)).isoformat(timespec="minutes") for n in range(count)]


def profiles() -> str:
    """Write a profile of 24 equal shares."""
    rows = [f"town,all,{hour},{1 / 24:.6f}" for hour in range(24)]
    return "\n".join(["profile,day_type,hour,share", *rows]) + "\n"


def weather(times: list[str]) -> str:
    """Write weather with a different value in every hour."""
    rows = [
        f"{time},{(10 * n) % 360},{1 + 0.1 * (n % 40):.1f},{5 + n % 7},D"
        for n, time in enumerate(times)
    ]
    head = "time,wind_from [deg],wind_speed [m/s],temperature [degC],stability"
    return "\n".join([head, *rows]) + "\n"


def air(times: list[str]) -> str:
    """Write background air with a different value in every hour."""
    rows = [f"{time},{20 + n % 11}.5,{8 + n % 5}.25" for n, time in enumerate(times)]
    return "\n".join(["time,o3 [ppb],no2 [ppb]", *rows]) + "\n"


class Folder:
    """A study folder that tests write, change and read."""

    def __init__(self, path: Path) -> None:
        self.path = path
        self.write("study.toml", SETTINGS)
        self.write("roads.geojson", geojson(ROADS))
        self.write("profiles.csv", profiles())
        self.write("mix.csv", MIX)
        self.write("factors.csv", FACTORS)
        self.write("weather.csv", weather(hours(48)))
        self.write("air.csv", air(hours(48)))
        self.write("points.csv", POINTS)

    geojson = staticmethod(geojson)
    hours = staticmethod(hours)
    weather = staticmethod(weather)
    air = staticmethod(air)
    links = ROADS

    def write(self, name: str, content: str | bytes) -> None:
        """Write a file of the study."""
        if isinstance(content, str):
            content = content.encode()
        (self.path / name).write_bytes(content)

    def text(self, name: str) -> str:
        """Take the text of a file."""
        return (self.path / name).read_text(encoding="utf-8")

    def edit(self, name: str, old: str, new: str) -> None:
        """Replace what stands once in a file."""
        text = self.text(name)
        assert text.count(old) == 1, (name, old, text.count(old))
        self.write(name, text.replace(old, new))

    def toml(self, old: str, new: str) -> None:
        """Replace what stands once in the settings."""
        self.edit("study.toml", old, new)

    def roads(self, which: str, /, **columns: object) -> None:
        """Change columns of one link."""
        changed = [
            (name, line, {**given, **columns} if name == which else given)
            for name, line, given in self.links
        ]
        self.write("roads.geojson", geojson(changed))

    def geometry(self, shape: object) -> None:
        """Change the geometry of the second link."""
        first, second = self.links
        self.write("roads.geojson", geojson([first, (second[0], shape, second[2])]))

    def crs(self, name: str) -> None:
        """Change the CRS that the road layer states."""
        layer = json.loads(self.text("roads.geojson"))
        layer["crs"]["properties"]["name"] = name
        self.write("roads.geojson", json.dumps(layer))

    def cells(self, name: str, rows: slice, column: int, value: str) -> None:
        """Write a value into a column of some rows of a CSV."""
        head, *body = self.text(name).splitlines()
        for number in range(*rows.indices(len(body))):
            parts = body[number].split(",")
            parts[column] = value
            body[number] = ",".join(parts)
        self.write(name, "\n".join([head, *body]) + "\n")

    def swap_rows(self, name: str, line: int) -> None:
        """Exchange a line (the header is 0) with the next."""
        lines = self.text(name).splitlines()
        lines[line], lines[line + 1] = lines[line + 1], lines[line]
        self.write(name, "\n".join(lines) + "\n")

    def bytes_of(self, name: str, change: Callable[[bytes], bytes]) -> None:
        """Change the bytes of a file."""
        self.write(name, change((self.path / name).read_bytes()))

    def must_say(
        self,
        *,
        file: str,
        message: str,
        place: str,
        value: str,
        allowed: str,
        mend: str,
        count: int,
        how: object = None,
    ) -> None:
        """Assert that exactly one error has these parts."""
        errors = self.errors()
        fits = [
            problem
            for problem in errors
            if problem.file == file
            and message in problem.message
            and place in problem.place
            and value in problem.value
            and allowed in problem.allowed
            and mend in problem.mend
            and problem.count == count
        ]
        assert len(fits) == 1, "\n".join([repr(how), *map(repr, errors)])

    def add(self, text: str) -> None:
        """Add to the settings."""
        self.write("study.toml", self.text("study.toml") + text)

    def read(self) -> Study:
        """Read the study."""
        return read_study(self.path)

    def base(self) -> Scenario:
        """Read the base scenario."""
        return self.read().scenarios["base"]

    def problems(self) -> tuple[Problem, ...]:
        """Take every problem, of a study that is refused or of one that is not."""
        try:
            return self.read().cautions
        except StudyError as error:
            return error.problems

    def errors(self) -> list[Problem]:
        """Take the errors."""
        return [problem for problem in self.problems() if problem.severity == "error"]


@pytest.fixture
def study(tmp_path: Path) -> Folder:
    """Write the good study."""
    return Folder(tmp_path)
