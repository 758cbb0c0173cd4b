"""The GeoPackage: layers, numbers worked by hand, styles, and readers other than ours."""

from __future__ import annotations

import json
import shutil
import sqlite3
import subprocess
from collections.abc import Iterator
from contextlib import closing
from itertools import pairwise
from pathlib import Path
from xml.etree import ElementTree as ET

import geopandas as gpd
import numpy as np
import pyogrio
import pytest

from roaddisp.errors import OutputError
from roaddisp.model import Result
from roaddisp.outputs.gis import site_layer, source_date, write_geopackage
from roaddisp.outputs.styles import receptor_style

SLD = "{http://www.opengis.net/sld}"


@pytest.fixture
def package(result: Result, tmp_path: Path) -> Path:
    path = tmp_path / "study.gpkg"
    write_geopackage(result, path)
    return path


@pytest.fixture
def database(package: Path) -> Iterator[sqlite3.Connection]:
    with closing(sqlite3.connect(package)) as connection:
        yield connection


def test_it_is_a_geopackage_of_version_1_2(database: sqlite3.Connection) -> None:
    """OGC 12-128r14 (1.2), requirement 2: application id "GPKG", user version 10200."""
    (application,) = database.execute("PRAGMA application_id").fetchone()
    (version,) = database.execute("PRAGMA user_version").fetchone()
    assert application.to_bytes(4, "big") == b"GPKG"
    assert version == 10200


def test_layers_stand_in_the_study_crs(package: Path) -> None:
    layers = {name for name, kind in pyogrio.list_layers(package) if kind}
    assert layers == {"roads", "receptors", "sites"}
    for name in layers:
        assert gpd.read_file(package, layer=name).crs.to_epsg() == 32613


def test_road_numbers_worked_by_hand(package: Path) -> None:
    """Link S: 4e-4 and 1e-4 g/m/s at full strength, half in even hours, hour 5 unknown.

    Of the 47 known hours 24 are at half and 23 at full strength: mean 35/47 = 0.7446809.
    Its lines are sqrt(1100^2 + 10^2) + 130 = 1230.04545 m long.
    1e-4 g/m/s x 0.7446809 = 74.46809 ug/m/s; x 3600 x 1000 = 268.0851 g/km/h;
    x 1230.04545 m x 3600 s x 8760 h = 2888.65 kg.
    """
    roads = gpd.read_file(package, layer="roads").set_index("link")
    street = roads.loc["S"]
    assert street["length_m"] == pytest.approx(1230.04545, abs=1e-4)
    assert street["nox_mean_ugms"] == pytest.approx(74.46809, rel=1e-6)
    assert street["nox_mean_gkmh"] == pytest.approx(268.0851, rel=1e-6)
    assert street["nox_kg_year"] == pytest.approx(2888.65, rel=1e-5)
    assert street["no2_fraction"] == pytest.approx(0.2)
    assert roads.loc["F", "no2_fraction"] == pytest.approx(0.15)
    assert roads.loc["F", "speed_kmh"] == pytest.approx(104.4)
    assert np.isnan(street["aadt"])
    assert street["name"] is None or street["name"] != street["name"]
    assert len(street.geometry.geoms) == 2


def test_receptors_carry_every_column_of_the_table(package: Path, result: Result) -> None:
    layer = gpd.read_file(package, layer="receptors")
    assert list(layer.columns) == [*result.summary.columns, "geometry"]
    np.testing.assert_array_equal(layer["no2_mean_ugm3"], result.summary["no2_mean_ugm3"])
    np.testing.assert_array_equal(layer.geometry.x, result.summary["x_m"])
    np.testing.assert_array_equal(layer.geometry.y, result.summary["y_m"])


def test_sites_sum_up_their_receptors(package: Path, result: Result) -> None:
    sites = gpd.read_file(package, layer="sites").set_index("site")
    school = sites.loc["School"]
    members = result.summary[result.summary["site"] == "School"]
    assert school["receptors"] == 3
    assert school["no2_mean_ugm3_max"] == members["no2_mean_ugm3"].max()
    assert school["no2_mean_ugm3_mean"] == pytest.approx(members["no2_mean_ugm3"].mean())
    assert school["us-naaqs-1h_met"] == "yes"
    assert school["us-naaqs-1h_value_max"] == members["us-naaqs-1h_value"].max()
    # 180 m by 140 m, less a court of 20 m by 20 m
    assert school.geometry.area == pytest.approx(180 * 140 - 400)
    assert sites.loc["Annex", "receptors"] == 0


@pytest.mark.parametrize(
    ("words", "verdict"),
    [
        (("yes", "undetermined", "yes"), "undetermined"),
        (("yes", "undetermined", "no"), "no"),
        (("", "yes", ""), "yes"),
        (("", "", ""), None),
    ],
)
def test_one_bad_receptor_decides_for_its_site(
    result: Result, words: tuple[str, ...], verdict: str | None
) -> None:
    from dataclasses import replace

    first = result.verdicts[0]
    changed = replace(first, met=(*words, *first.met[3:]))
    layer = site_layer(replace(result, verdicts=(changed, *result.verdicts[1:])))
    found = layer.set_index("site").loc["School", "us-naaqs-1h_met"]
    assert found == verdict or (verdict is None and found != "yes")


def test_every_layer_has_a_style_that_parses(database: sqlite3.Connection) -> None:
    rows = database.execute(
        "SELECT f_table_name, f_geometry_column, styleQML, styleSLD, useAsDefault FROM layer_styles"
    ).fetchall()
    geometry = dict(
        database.execute("SELECT table_name, column_name FROM gpkg_geometry_columns").fetchall()
    )
    assert {row[0] for row in rows} == set(geometry)
    for table, column, qml, sld, default in rows:
        assert column == geometry[table]
        assert default == 1
        assert ET.fromstring(qml).find("renderer-v2") is not None  # noqa: S314
        named = ET.fromstring(sld).find(f"{SLD}NamedLayer/{SLD}Name")  # noqa: S314
        assert named is not None
        assert named.text == table


def test_classes_of_the_style_leave_no_value_out() -> None:
    style = receptor_style("no2_mean_ugm3", "ug/m3", np.linspace(11.0, 48.0, 100))
    ranges = ET.fromstring(style.qml).findall(".//range")  # noqa: S314
    limits = [(float(r.attrib["lower"]), float(r.attrib["upper"])) for r in ranges]
    assert limits[0][0] < -1e6
    assert limits[-1][1] > 1e6
    assert all(a[1] == b[0] for a, b in pairwise(limits))
    assert len(ET.fromstring(style.sld).findall(f".//{SLD}Rule")) == len(ranges)  # noqa: S314


def test_file_explains_itself(package: Path) -> None:
    about = pyogrio.read_info(package, layer="receptors")
    assert "licensed practitioner" in about["dataset_metadata"]["CAUTIONS"]
    columns = json.loads(about["layer_metadata"]["COLUMNS"])
    assert columns["no2_1h_p98_ppb"].endswith("[ppb]")


@pytest.mark.skipif(shutil.which("ogrinfo") is None, reason="gdal-bin is not installed")
def test_an_older_reader_opens_it_without_a_murmur(package: Path) -> None:
    told = subprocess.run(
        ["ogrinfo", "-ro", "-al", "-so", str(package)], capture_output=True, text=True, check=True
    )
    assert "arning" not in told.stderr + told.stdout
    for layer in ("roads", "receptors", "sites", "layer_styles"):
        assert f"Layer name: {layer}" in told.stdout


def test_dates_come_from_source_date_epoch(
    result: Result, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """1,700,000,000 s after 1970-01-01 is 2023-11-14 22:13:20 UTC."""
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "1700000000")
    write_geopackage(result, tmp_path / "study.gpkg")
    with closing(sqlite3.connect(tmp_path / "study.gpkg")) as connection:
        changes = connection.execute("SELECT last_change FROM gpkg_contents").fetchall()
        styles = connection.execute("SELECT update_time FROM layer_styles").fetchall()
        notes = connection.execute("SELECT timestamp FROM gpkg_metadata_reference").fetchall()
    assert {text[:19] for (text,) in (*changes, *styles, *notes)} == {"2023-11-14T22:13:20"}
    assert pyogrio.get_gdal_config_option("OGR_CURRENT_DATE") is None


def test_a_date_that_is_none_is_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "yesterday")
    with pytest.raises(OutputError, match=r"'yesterday'.*whole number"):
        source_date()


def test_a_study_without_sites_has_no_site_layer(make_result, tmp_path: Path) -> None:
    write_geopackage(make_result(sites=False), tmp_path / "study.gpkg")
    layers = {name for name, kind in pyogrio.list_layers(tmp_path / "study.gpkg") if kind}
    assert layers == {"roads", "receptors"}


def test_a_place_that_cannot_be_written_is_named(result: Result, tmp_path: Path) -> None:
    with pytest.raises(OutputError, match="nowhere"):
        write_geopackage(result, tmp_path / "nowhere" / "study.gpkg")
