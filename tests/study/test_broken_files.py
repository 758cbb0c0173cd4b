"""Broken files and road layers: each must give the message that says what is wrong."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from operator import methodcaller
from typing import Any, NamedTuple

import pytest


class Broken(NamedTuple):
    """How a good study is broken, and parts of the problem it must give."""

    how: Callable[[Any], None]
    file: str
    message: str
    place: str = ""
    value: str = ""
    allowed: str = ""
    mend: str = ""
    count: int = 1


def both(*ways: Callable[[Any], None]) -> Callable[[Any], None]:
    def how(study: Any) -> None:
        for way in ways:
            way(study)

    return how


toml = partial(methodcaller, "toml")
edit = partial(methodcaller, "edit")
write = partial(methodcaller, "write")
roads = partial(methodcaller, "roads")
geometry = partial(methodcaller, "geometry")
crs = partial(methodcaller, "crs")
bytes_of = partial(methodcaller, "bytes_of")

BROKEN = {
    "a path out of the folder": Broken(
        toml('"air.csv"', '"../air.csv"'), "study.toml", "the path leaves the study folder",
        "line 26, column 1", "../air.csv", "inside the study folder", "copy the file",
    ),
    "an absolute path": Broken(
        toml('"air.csv"', '"/etc/passwd"'), "study.toml", "the path leaves the study folder",
        "line 26", "/etc/passwd",
    ),
    "a path of another kind of system": Broken(
        toml('"roads.geojson"', '"/vsicurl/http://example.org/roads.geojson"'), "study.toml",
        "the path leaves the study folder", "line 9",
    ),
    "a file that is missing": Broken(
        toml('"air.csv"', '"Air.csv"'), "study.toml", "the file is not there", "line 26",
        "Air.csv", mend="did you mean 'air.csv'?",
    ),
    "an empty file": Broken(
        write("air.csv", ""), "study.toml", "the file is empty", "line 26",
        "air.csv",
    ),
    "a text in another encoding": Broken(
        bytes_of("points.csv", lambda b: b.replace(b"gate,", "Straße,".encode("latin-1"))),
        "points.csv", "the text is not UTF-8", "row 2, line 3, byte 5", "0xdf", "UTF-8",
        "save it as UTF-8",
    ),
    "a CSV parted by semicolons": Broken(
        bytes_of("mix.csv", lambda b: b.replace(b",", b";")), "mix.csv",
        "the cells are parted by semicolons", "header, line 1", allowed="commas",
    ),
    "a header twice": Broken(
        edit("mix.csv", "fleet,vehicle_class,share", "fleet,share,share"), "mix.csv",
        "a header stands twice", "header, line 1", "share",
    ),
    "a ragged row": Broken(
        edit("mix.csv", "town,van,0.10", "town,van,0,10"), "mix.csv",
        "a row has not as many cells as the header", "row 2, line 3", "4 cells", "3 cells",
        "decimal comma",
    ),
    "a CSV cut short": Broken(
        bytes_of("weather.csv", lambda b: b[:-20]), "weather.csv",
        "a row has not as many cells as the header", "row 48, line 49", mend="cut short",
    ),
    "a quotation that is not closed": Broken(
        edit("mix.csv", "town,van,0.10", 'town,"van,0.10'), "mix.csv",
        "the rows cannot be parted into cells", "line 4", mend="quotation mark",
    ),
    "a NUL byte": Broken(
        bytes_of("air.csv", lambda b: b.replace(b"20.5", b"20.\x00", 1)), "air.csv",
        "a NUL byte in a text file", "row 1, line 2, byte 21", "0x00",
    ),
    "UTF-16": Broken(
        bytes_of("air.csv", lambda b: b.decode().encode("utf-16")), "air.csv",
        "the text is in UTF-16 or UTF-32", "line 1", allowed="UTF-8",
    ),
    "a table without rows": Broken(
        write("mix.csv", "fleet,vehicle_class,share\n"), "mix.csv",
        "the table has a header and no rows", allowed="at least one row",
    ),
    "a GeoPackage that is a text": Broken(
        both(toml('"roads.geojson"', '"roads.gpkg"'),
             write("roads.gpkg", "no database")),
        "roads.gpkg", "the content is not that of a GeoPackage file", value="no database",
    ),
    "a GeoPackage cut short": Broken(
        both(toml('"roads.geojson"', '"roads.gpkg"'),
             write("roads.gpkg", b"SQLite format 3\x00" + bytes(300))),
        "roads.gpkg", "the file cannot be read", mend="copied whole",
    ),
    "a format that is not read": Broken(
        both(toml('"roads.geojson"', '"roads.kml"'),
             write("roads.kml", "<kml/>")),
        "roads.kml", "not a vector format that is read", value=".kml", allowed="GeoPackage",
    ),
    "GeoJSON cut short": Broken(
        bytes_of("roads.geojson", lambda b: b[: len(b) // 2]), "roads.geojson",
        "the file cannot be read",
    ),
    "a layer that is not there": Broken(
        toml('file = "roads.geojson"', 'file = "roads.geojson"\nlayer = "road"'),
        "roads.geojson", "the file has no such layer", value="road", allowed="roads",
        mend="did you mean 'roads'?",
    ),
    "a column mapped to nothing": Broken(
        toml('"SPD [km/h]"', '"SPEED [km/h]"'), "study.toml",
        "roads.geojson has no column 'SPEED'", "line 10, column 13", "SPEED [km/h]", "SPD, WID",
    ),
    "a column of ours misspelt": Broken(
        toml("heavy_share =", "heavy_shares ="), "study.toml",
        "roads.columns: 'heavy_shares' is not one of our columns", "line 10",
        mend="did you mean 'heavy_share'?",
    ),
    "speeds without a unit": Broken(
        toml('"SPD [km/h]"', '"SPD"'), "roads.geojson",
        "numbers without a unit, where a speed is needed",
        "layer 'roads', feature 1, column 'SPD'", "80", "km/h, mph, m/s, kn", "SPD [km/h]",
    ),
    "one speed without a unit": Broken(
        both(toml('"SPD [km/h]"', '"SPD"'), roads("main", SPD="80 km/h")),
        "roads.geojson", "a number without a unit, where a speed is needed",
        "feature 2, column 'SPD'", "50", mend='"12 km/h"',
    ),
    "coordinates of another CRS than the layer says": Broken(
        crs("urn:ogc:def:crs:EPSG::4326"), "roads.geojson",
        "coordinates that cannot be brought into the study's CRS", "layer 'roads', feature 1",
        "EPSG:4326", "a place that EPSG:25833 covers", "the layer's CRS", 2,
    ),
    "an id twice": Broken(
        roads("side", link="main"), "roads.geojson", "an id that stands twice",
        "layer 'roads', feature 2, column 'link'", "main", "unique", "feature 1 has it too",
    ),
    "a point among the lines": Broken(
        geometry({"type": "Point", "coordinates": [390000, 5820000]}), "roads.geojson",
        "a geometry of another type", "layer 'roads', feature 2", "Point",
        "LineString or MultiLineString",
    ),
    "no geometry": Broken(
        geometry(None), "roads.geojson", "a feature without geometry", "feature 2", "NULL",
    ),
    "an empty geometry": Broken(
        geometry({"type": "LineString", "coordinates": []}), "roads.geojson",
        "an empty geometry", "feature 2", "EMPTY",
    ),
    "a line of no length": Broken(
        geometry([(390000, 5820000), (390000, 5820000)]), "roads.geojson", "a line of no length",
        "feature 2",
    ),
    "a negative volume": Broken(
        roads("main", aadt=-5), "roads.geojson", "a value out of range",
        "layer 'roads', feature 1, column 'aadt'", "-5", "0 to 1000000",
    ),
    "a volume that is missing": Broken(
        roads("main", aadt=None), "roads.geojson", "a link with neither AADT nor counts",
        "feature 1", "main",
    ),
    "a share of more than everything": Broken(
        roads("main", HGV=130), "roads.geojson", "a value out of range",
        "feature 1, column 'HGV'", "130", "0 to 1",
    ),
    "a speed beyond the factors": Broken(
        roads("main", SPD=110), "roads.geojson", "a speed beyond the factors of 'car'",
        "layer 'roads', feature 1, column 'SPD'", "110 km/h", "30 to 100 km/h",
        "add factors at that speed",
    ),
    "an unknown profile": Broken(
        roads("main", profile="twon"), "roads.geojson", "an unknown profile", "feature 1",
        "twon", "town", "did you mean 'town'?",
    ),
    "an unknown fleet": Broken(
        roads("main", fleet="port"), "roads.geojson", "an unknown fleet", "feature 1", "port",
        "town",
    ),
    "a fleet without heavy vehicles": Broken(
        edit("mix.csv", "town,rigid_truck,0.05", "town,motorcycle,0.05"), "mix.csv",
        "a class that the factors lack", "row 3, line 4, column 'vehicle_class'", "motorcycle",
        "car, van, rigid_truck", "add factors",
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", BROKEN)
def test_broken_study_gives_its_message(study: Any, name: str) -> None:
    """The fault is named with file, place, value, what is allowed and the mend."""
    broken = BROKEN[name]
    broken.how(study)
    study.must_say(**broken._asdict())
