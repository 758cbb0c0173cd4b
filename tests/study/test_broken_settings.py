"""Broken settings: keys, units, choices, scenarios, and what later versions deliver."""

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
add = partial(methodcaller, "add")
roads = partial(methodcaller, "roads")
cells = partial(methodcaller, "cells")
bytes_of = partial(methodcaller, "bytes_of")

BROKEN = {
    "a key misspelt": Broken(
        toml("anemometer_height", "anemometer_hight"), "study.toml",
        "weather.anemometer_hight: an unknown key", "line 23, column 1", "10 m",
        "anemometer_height", "did you mean 'anemometer_height'?",
    ),
    "a table misspelt": Broken(
        toml("[outputs]", "[output]"), "study.toml", "an unknown table", "line 36, column 2",
        "output", "outputs", "did you mean 'outputs'?",
    ),
    "a number without unit": Broken(
        toml('"10 m"', "10"), "study.toml", "weather.anemometer_height: a number without a unit",
        "line 23, column 1", "10", "m, ft, mi, km", '"12 m"',
    ),
    "a unit of another quantity": Broken(
        toml('"10 m"', '"10 m/s"'), "study.toml", "'m/s' is not a unit of length", "line 23",
        "10 m/s", "m, ft, mi, km", "is a unit of speed",
    ),
    "a unit in the wrong case": Broken(
        toml('"10 m"', '"10 M"'), "study.toml", "'M' is not a unit of length", "line 23", "10 M",
        "m, ft, mi, km", "write 'm'",
    ),
    "a table missing": Broken(
        toml('[air]\nfile = "air.csv"\nclock = "standard"\n', ""), "study.toml",
        "the table [air] is missing", allowed="[air]", mend="roaddisp inputs",
    ),
    "no TOML": Broken(
        toml('crs = "EPSG:25833"', "crs = EPSG:25833"), "study.toml", "not TOML: invalid value",
        "line 5, column 7",
    ),
    "a key twice": Broken(
        toml('terrain = "urban"', 'terrain = "urban"\nterrain = "open"'), "study.toml",
        "not TOML: cannot overwrite a value", "line 5, column 17",
    ),
    "an unknown terrain": Broken(
        toml('"urban"', '"Urban"'), "study.toml", "study.terrain: an unknown choice",
        "line 4, column 1", "Urban", "open, urban", "did you mean 'urban'?",
    ),
    "an unknown zone": Broken(
        toml("Europe/Berlin", "Europe/Berlyn"), "study.toml", "no time zone has this name",
        "line 3, column 1", "Europe/Berlyn", "IANA", "did you mean 'Europe/Berlin'?",
    ),
    "a geographic CRS": Broken(
        toml("EPSG:25833", "EPSG:4326"), "study.toml", "a geographic CRS where metres are needed",
        "line 5, column 1", "EPSG:4326", "projected CRS in metres", "UTM zone",
    ),
    "a CRS in feet": Broken(
        toml("EPSG:25833", "EPSG:2231"), "study.toml",
        "a CRS in US survey foot where metres are needed", "line 5", "EPSG:2231",
        "projected CRS in metres", "layers may stay in feet",
    ),
    "a CRS of elsewhere": Broken(
        toml("EPSG:25833", "EPSG:3857"), "study.toml", "a metre of this CRS is 0.6", "line 5",
        "EPSG:3857", "within 1 %", "UTM zone",
    ),
    "a CRS that is none": Broken(
        toml("EPSG:25833", "EPSG:999999"), "study.toml", "no coordinate system has this code",
        "line 5", "EPSG:999999",
    ),
    "an unknown standard": Broken(
        toml("us-naaqs-annual", "us-naaqs-anual"), "study.toml", "an unknown standard",
        "line 34, column 22", "us-naaqs-anual", "us-naaqs-annual",
        "did you mean 'us-naaqs-annual'?",
    ),
    "an unknown receptor in the outputs": Broken(
        toml('["yard"]', '["yard", "Gate"]'), "study.toml", "no receptor has this id",
        "line 37, column 19", "Gate", "yard, gate", "did you mean 'gate'?",
    ),
    "a scenario called base": Broken(
        add('[scenario.base]\nroads.file = "x.gpkg"\n'), "study.toml",
        "the name of this scenario is taken", "line 38, column 11", "base", "any other name",
        "rename",
    ),
    "a CRS of a scenario's own": Broken(
        add('[scenario.other]\nstudy.crs = "EPSG:25832"\n'), "study.toml",
        "study.crs: the same in every scenario", "line 39", "EPSG:25832",
    ),
    "an override misspelt": Broken(
        add('[scenario.build]\nroads.fiel = "roads.geojson"\n'), "study.toml",
        "roads.fiel: an unknown key", "line 39, column 7", mend="did you mean 'file'?",
    ),
    "a scenario's file that is missing": Broken(
        add('[scenario.build]\nroads.file = "roads_build.geojson"\n'), "study.toml",
        "the file is not there", "line 39, column 7", "roads_build.geojson",
        mend="did you mean 'roads.geojson'?",
    ),
    "an air of neither kind": Broken(
        toml('file = "air.csv"\n', ""), "study.toml", "neither of 'file' and 'constant' given",
        "line 25, column 2", allowed="'file' or 'constant'",
    ),
    "an air of both kinds": Broken(
        toml('file = "air.csv"',
             'file = "air.csv"\nconstant = { o3 = "3 ppb", no2 = "1 ppb" }'),
        "study.toml", "both of 'file' and 'constant' given", "line 27", mend="keep one",
    ),
    "ozone of a constant in the wrong unit": Broken(
        toml('file = "air.csv"\n', 'constant = { o3 = "30 ppm", no2 = "12 ppb" }\n'),
        "study.toml", "air.constant.o3: out of range (the wrong unit?)", "line 26, column 14",
        "30 ppm, which is 3e+04 ppb", "0 to 1000 ppb",
    ),
    "no receptors": Broken(
        toml('points = "points.csv"\n', ""), "study.toml", "none of 'points', 'sites', 'grid'",
        "line 29",
    ),
    "a grid of too many cells": Broken(
        toml('height = "1.5 m"', 'grid = { spacing = "0.5 m", within = "3 km" }'), "study.toml",
        "receptors.grid: too many cells", "line 31", "of 0.5 m within 3000 m", "3000000",
        "widen the spacing",
    ),
    "counts of a later version": Broken(
        toml('"profiles.csv"', '"profiles.csv"\ncounts_format = "tmg-volume"'),
        "study.toml", "traffic.counts_format: not in this version: 'tmg-volume'", "line 14",
        allowed="table",
    ),
    "weather of a later version": Broken(
        toml('file = "weather.csv"', 'file = "weather.csv"\nformat = "isd-lite"'), "study.toml",
        "weather.format: not in this version: 'isd-lite'", "line 22", allowed="table",
    ),
    "air of a later version": Broken(
        toml('file = "air.csv"', 'file = "air.csv"\nformat = "eea"'), "study.toml",
        "air.format: not in this version: 'eea'", "line 27", allowed="table",
    ),
    "a conversion of a later version": Broken(
        add('[conversion]\nmethod = "full"\n'), "study.toml",
        "conversion.method: not in this version: 'full'", "line 39", allowed="ozone-limited",
    ),
    "curves of a later version": Broken(
        add('[dispersion]\ncurves = "surface-layer"\n'), "study.toml",
        "dispersion.curves: not in this version: 'surface-layer'", "line 39", allowed="briggs",
    ),
    "roughness": Broken(
        add('[dispersion]\nroughness = "0.03 m"\n'), "study.toml",
        "dispersion.roughness: not in this version", "line 39", "0.03 m",
    ),
    "a standard of a later version": Broken(
        toml("us-naaqs-annual", "who-2021-annual"), "study.toml",
        "not in this version: the standard 'who-2021-annual'", "line 34",
    ),
    "a road in a cut": Broken(
        both(roads("side", rise=-3), toml("columns = { ", 'columns = { height = "rise [m]", ')),
        "roads.geojson", "not in this version: the column 'height'",
        "layer 'roads', feature 2, column 'rise'", "-3", "empty or zero", "leave the column out",
    ),
    "factors by grade": Broken(
        both(edit("factors.csv", "no2_fraction\n", "no2_fraction,grade [%]\n"),
             bytes_of("factors.csv", lambda b: b.replace(b"0.15\n", b"0.15,2\n")
                      .replace(b"0.20\n", b"0.20,0\n").replace(b"0.10\n", b"0.10,\n"))),
        "factors.csv", "not in this version: the column 'grade'",
        "row 1, line 2, column 'grade [%]'", "2", "empty or zero", count=2,
    ),
    "stability by radiation": Broken(
        both(bytes_of("weather.csv", lambda b: b.replace(b"stability", b"solar [W/m2]")),
             cells("weather.csv", slice(0, None), 4, "300")),
        "weather.csv", "not in this version: the column 'solar'", "row 1", "300", count=48,
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", BROKEN)
def test_broken_study_gives_its_message(study: Any, name: str) -> None:
    """The fault is named with file, place, value, what is allowed and the mend."""
    broken = BROKEN[name]
    broken.how(study)
    study.must_say(**broken._asdict())
