"""The grid as a GeoTIFF: values in their place, cloud-optimised, open anywhere."""

from __future__ import annotations

import json
import shutil
import subprocess
from pathlib import Path

import numpy as np
import pytest

from roaddisp.model import Result
from roaddisp.outputs.raster import on_grid, own_proj_data, write_geotiff


@pytest.fixture
def raster(result: Result, tmp_path: Path) -> Path:
    path = tmp_path / "no2_mean_ugm3.tif"
    write_geotiff(result, "no2_mean_ugm3", path)
    return path


def test_each_receptor_is_found_at_its_coordinates(result: Result, raster: Path) -> None:
    """Sampled by coordinate, so a swapped axis or a half-cell shift would show."""
    import rasterio

    receptors = result.scenario.receptors
    table = result.summary[receptors.cell[:, 0] >= 0]
    with own_proj_data(), rasterio.open(raster) as image:
        places = zip(table["x_m"], table["y_m"], strict=True)
        sampled = np.array([value[0] for value in image.sample(places)])
        assert image.crs.to_epsg() == 32613
        assert image.res == (20.0, 20.0)
        assert image.bounds.left == 620_000.0 - 310.0
        assert image.bounds.top == 4_440_000.0 + 310.0
    assert sampled == pytest.approx(table["no2_mean_ugm3"].to_numpy(), rel=1e-6)
    assert table["on_road"].any()


def test_cells_without_a_receptor_are_empty(result: Result, raster: Path) -> None:
    import rasterio

    with own_proj_data(), rasterio.open(raster) as image:
        cells = image.read(1)
        assert np.isnan(image.nodata)
        assert image.dtypes == ("float32",)
    cell = result.scenario.receptors.cell
    assert np.isnan(cells[0, 0])
    assert np.isfinite(cells).sum() == (cell[:, 0] >= 0).sum()


def test_tags_name_unit_meaning_and_cautions(raster: Path) -> None:
    import rasterio

    with own_proj_data(), rasterio.open(raster) as image:
        tags = image.tags()
        assert image.units == ("ug/m3",)
        assert image.descriptions == ("no2_mean_ugm3",)
    assert tags["UNITS"] == "ug/m3"
    assert "mean NO2" in tags["DESCRIPTION"]
    assert "licensed practitioner" in tags["CAUTIONS"]
    assert "invented" in tags["TITLE"]


@pytest.mark.skipif(shutil.which("gdalinfo") is None, reason="gdal-bin is not installed")
def test_an_outside_reader_finds_the_cloud_optimised_layout(raster: Path) -> None:
    """GDAL's own gdalinfo reports LAYOUT=COG."""
    told = subprocess.run(
        ["gdalinfo", "-json", str(raster)], capture_output=True, text=True, check=True
    )
    about = json.loads(told.stdout)
    assert about["metadata"]["IMAGE_STRUCTURE"]["LAYOUT"] == "COG"
    assert about["geoTransform"] == [619_690.0, 20.0, 0.0, 4_440_310.0, 0.0, -20.0]
    assert about["bands"][0]["type"] == "Float32"


def test_a_larger_grid_has_overviews(make_wide, tmp_path: Path) -> None:
    import rasterio

    path = tmp_path / "wide.tif"
    write_geotiff(make_wide(), "no2_mean_ugm3", path)
    with own_proj_data(), rasterio.open(path) as image:
        assert image.overviews(1)
        assert image.block_shapes == [(128, 128)]


@pytest.fixture
def make_wide(make_result):
    from dataclasses import replace

    from roaddisp.model import Grid

    def wide() -> Result:
        result = make_result()
        receptors = replace(
            result.scenario.receptors, grid=Grid(619_700.0, 4_440_300.0, 20.0, 300, 260)
        )
        return replace(result, scenario=replace(result.scenario, receptors=receptors))

    return wide


def test_a_foreign_proj_folder_does_no_harm(
    result: Result, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    import os

    import rasterio

    stranger = tmp_path / "proj"
    stranger.mkdir()
    (stranger / "proj.db").write_bytes(b"not a database")
    monkeypatch.setenv("PROJ_DATA", str(stranger))
    monkeypatch.setenv("PROJ_LIB", str(stranger))
    path = tmp_path / "no2_mean_ugm3.tif"
    write_geotiff(result, "no2_mean_ugm3", path)
    assert os.environ["PROJ_DATA"] == str(stranger)
    with own_proj_data(), rasterio.open(path) as image:
        assert image.crs.to_epsg() == 32613


def test_without_a_grid_there_is_nothing_to_map(make_result) -> None:
    result = make_result(grid=False)
    with pytest.raises(ValueError, match="no grid"):
        on_grid(result.scenario.receptors, np.zeros(len(result.scenario.receptors)))
