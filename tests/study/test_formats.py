"""Every vector format, in any CRS, gives the same network."""

from __future__ import annotations

import warnings
from typing import Any

import geopandas as gpd
import numpy as np
import pyproj
import pytest
import shapely

from roaddisp.model import Network


def frame(study: Any, **more: object) -> gpd.GeoDataFrame:
    """Put the roads of the good study into a frame."""
    rows = [{"link": name, **columns, **more} for name, _, columns in study.links]
    lines = [shapely.LineString(line) for _, line, _ in study.links]
    return gpd.GeoDataFrame(rows, geometry=lines, crs="EPSG:25833")


def read(study: Any, name: str, roads: gpd.GeoDataFrame) -> Network:
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        roads.to_file(study.path / name, engine="pyogrio")
    study.edit("study.toml", '"roads.geojson"', f'"{name}"')
    network: Network = study.base().network
    return network


@pytest.mark.parametrize("name", ["roads.gpkg", "roads.shp", "roads.fgb", "roads.geojson"])
def test_format_round_trip(study: Any, name: str) -> None:
    expected = study.base().network
    network = read(study, name, frame(study))
    order = [network.link.index(link) for link in expected.link]  # FlatGeobuf sorts in space
    for here, there in zip(expected.lines, order, strict=True):
        assert np.allclose(here[0], network.lines[there][0], atol=1e-6)
    assert network.aadt[order].tolist() == expected.aadt.tolist()
    assert network.width[order] == pytest.approx(expected.width)


@pytest.mark.parametrize("crs", ["EPSG:4326", "EPSG:3857", "EPSG:3035", "EPSG:32632"])
def test_layers_come_in_any_crs(study: Any, crs: str) -> None:
    """The independent check is geopandas' own reprojection."""
    expected = study.base().network
    network = read(study, "other.gpkg", frame(study).to_crs(crs))
    for here, there in zip(expected.lines, network.lines, strict=True):
        assert np.allclose(here[0], there[0], atol=1e-3)


def test_layer_in_us_survey_feet(study: Any) -> None:
    """Colorado North, US survey foot: lengths come out in metres (1 ft = 1200/3937 m)."""
    feet = pyproj.CRS("EPSG:2231")
    line = shapely.LineString([(3_100_000, 1_300_000), (3_103_937, 1_300_000)])
    roads = gpd.GeoDataFrame(
        [{"link": "a", "aadt": 100, "SPD": 50, "WID": 10, "HGV": 1}], geometry=[line], crs=feet
    )
    study.edit("study.toml", 'crs = "EPSG:25833"\n', "")
    study.write("points.csv", "receptor,longitude,latitude\np,-104.86,39.99\n")
    study.edit("study.toml", '["yard"]', '["p"]')
    network = read(study, "feet.gpkg", roads)
    length = np.hypot(*np.diff(network.lines[0][0], axis=0)[0])
    assert length == pytest.approx(1200.0, rel=1e-3)  # within the scale of two projections


def test_multilines_z_and_repeated_vertices(study: Any) -> None:
    """Parts stay parts, heights are dropped, a vertex that repeats goes."""
    line = [(389300, 5819900, 7), (389300, 5819900, 7), (390000, 5820000, 9)]
    parts = shapely.MultiLineString([line, [(390100, 5820020, 1), (390800, 5820140, 1)]])
    roads = frame(study)
    roads.loc[0, "geometry"] = parts
    network = read(study, "multi.gpkg", roads)
    assert [part.shape for part in network.lines[0]] == [(2, 2), (2, 2)]


def test_shapefile_names_are_mapped(study: Any) -> None:
    """A Shapefile cuts names to ten characters; `columns` maps what is left."""
    roads = frame(study).rename(columns={"HGV": "heavy_vehicles_share"})
    study.edit("study.toml", '"HGV [%]"', '"heavy_vehi [%]"')
    assert read(study, "cut.shp", roads).heavy_share == pytest.approx([0.10, 0.04])


def test_shapefile_without_prj_has_no_crs(study: Any) -> None:
    read(study, "lost.shp", frame(study))
    (study.path / "lost.prj").unlink()
    (problem,) = study.errors()
    assert problem.message == "the layer states no coordinate system (CRS)"
    assert problem.place == "layer 'lost'"


def test_shapefile_without_its_table_is_refused(study: Any) -> None:
    read(study, "half.shp", frame(study))
    (study.path / "half.dbf").unlink()
    (problem,) = study.errors()
    assert problem.message == "the files of a Shapefile belong together"


def test_shapefile_is_recorded_whole(study: Any) -> None:
    read(study, "whole.shp", frame(study))
    names = [each.name for each in study.base().files if each.role == "roads"]
    assert {"whole.shp", "whole.dbf", "whole.shx", "whole.prj"} <= set(names)


def test_units_may_stand_in_every_value(study: Any) -> None:
    roads = frame(study).rename(columns={"SPD": "speed"})
    roads["speed"] = ["50 mph", "50 km/h"]
    study.edit("study.toml", 'speed = "SPD [km/h]", ', "")
    assert read(study, "text.gpkg", roads).speed == pytest.approx([22.352, 50 / 3.6])


def test_units_may_stand_in_the_header_of_a_layer(study: Any) -> None:
    roads = frame(study).rename(columns={"SPD": "speed [mph]"})
    roads["speed [mph]"] = [50, 30]
    study.edit("study.toml", 'speed = "SPD [km/h]", ', "")
    assert read(study, "head.gpkg", roads).speed == pytest.approx([22.352, 13.4112])


def test_file_of_several_layers_needs_a_name(study: Any) -> None:
    frame(study).to_file(study.path / "many.gpkg", layer="old")
    frame(study).to_file(study.path / "many.gpkg", layer="new")
    study.edit("study.toml", 'file = "roads.geojson"', 'file = "many.gpkg"')
    (problem,) = study.errors()
    assert problem.message == "the file has several layers"
    assert problem.value == "old, new"
    study.edit("study.toml", '"many.gpkg"', '"many.gpkg"\nlayer = "new"')
    assert study.errors() == []


def test_points_of_a_layer(study: Any) -> None:
    places = [shapely.Point(390000, 5820060), shapely.Point(390080, 5820095)]
    points = gpd.GeoDataFrame(
        {"ID": [7, 9], "kind": ["home", None], "height": ["5 ft", None]}, geometry=places,
        crs="EPSG:25833",
    ).to_crs("EPSG:4326")  # fmt: skip
    points.to_file(study.path / "points.gpkg")
    study.edit("study.toml", '"points.csv"', '"points.gpkg"\ncolumns = { receptor = "ID" }')
    study.edit("study.toml", '["yard"]', '["7"]')
    receptors = study.base().receptors
    assert receptors.receptor == ("7", "9")
    assert receptors.kind == ("home", "")
    assert receptors.z == pytest.approx([1.524, 1.5])
    assert receptors.x == pytest.approx([390000, 390080], abs=1e-4)
