"""Hours of the receptors asked for, in memory and as CF NetCDF."""

from __future__ import annotations

from pathlib import Path

import h5py
import numpy as np
import pytest
import xarray as xr

from roaddisp.model import Result
from roaddisp.outputs.netcdf import write_netcdf
from roaddisp.outputs.tables import hourly_dataset

VARIABLES = ["nox_road_ugm3", "nox_road_ppb", "no2_primary_road_ppb", "no2_ppb", "no_ppb", "o3_ppb"]


@pytest.fixture
def reopened(result: Result, tmp_path: Path) -> xr.Dataset:
    write_netcdf(result, tmp_path / "hourly.nc")
    with xr.open_dataset(tmp_path / "hourly.nc", engine="h5netcdf") as data:
        return data.load()


def test_variables_and_dimensions_are_the_contracts(result: Result) -> None:
    hourly = hourly_dataset(result)
    assert list(hourly.data_vars) == VARIABLES
    assert all(hourly[name].dims == ("receptor", "time") for name in VARIABLES)
    assert hourly["receptor"].to_numpy().tolist() == ["yard", "edge"]


def test_ppb_of_road_nox_follows_from_its_mass(result: Result) -> None:
    """188.04 ug/m3 are 100 ppb at 25 C (40 CFR 50.3)."""
    hourly = hourly_dataset(result)
    ratio = hourly["nox_road_ugm3"] / hourly["nox_road_ppb"]
    assert np.nanmin(ratio) == pytest.approx(1.8804)
    assert np.nanmax(ratio) == pytest.approx(1.8804)


def test_time_is_local_standard_and_names_the_beginning(result: Result) -> None:
    time = hourly_dataset(result)["time"]
    assert time.to_numpy()[0] == np.datetime64("2027-01-01T00:00")
    assert time.to_numpy()[47] == np.datetime64("2027-01-02T23:00")
    assert "beginning" in time.attrs["long_name"]
    assert "-7 h from UTC" in time.attrs["comment"]


def test_file_gives_back_what_the_dataset_holds(result: Result, reopened: xr.Dataset) -> None:
    """float32 keeps seven digits."""
    hourly = hourly_dataset(result)
    for name in VARIABLES:
        np.testing.assert_allclose(reopened[name], hourly[name], rtol=1e-7, equal_nan=True)
    assert np.isnan(reopened["nox_road_ugm3"].to_numpy()[:, 7]).all()
    assert (reopened["time"] == hourly["time"]).all()
    assert reopened["receptor"].to_numpy().tolist() == ["yard", "edge"]
    assert reopened["x_m"].to_numpy()[1] == pytest.approx(620_018.0)


def test_file_says_what_the_conventions_ask(result: Result, tmp_path: Path) -> None:
    """CF conventions 1.8: sections 2.6, 3.1, 4.4, 5.6, 7.1, 7.3 and 9 (from memory)."""
    write_netcdf(result, tmp_path / "hourly.nc")
    with xr.open_dataset(tmp_path / "hourly.nc", engine="h5netcdf", decode_cf=False) as raw:
        assert raw.attrs["Conventions"] == "CF-1.8"
        assert raw.attrs["featureType"] == "timeSeries"
        assert raw["receptor"].attrs["cf_role"] == "timeseries_id"
        assert raw["time"].attrs["units"] == "hours since 2027-01-01"
        assert raw["time"].attrs["bounds"] == "time_bounds"
        assert raw["time_bounds"].to_numpy()[:2].tolist() == [[0, 1], [1, 2]]
        no2 = raw["no2_ppb"].attrs
        assert no2["standard_name"] == "mole_fraction_of_nitrogen_dioxide_in_air"
        assert no2["units"] == "1e-9"
        assert no2["cell_methods"] == "time: mean"
        assert raw[no2["grid_mapping"]].attrs["grid_mapping_name"] == "transverse_mercator"
        assert {"longitude", "latitude"} <= set(no2["coordinates"].split())
        assert "licensed practitioner" in raw.attrs["comment"]


def test_no_says_when_it_is_the_roads_alone(result: Result) -> None:
    assert "roads alone" in hourly_dataset(result)["no_ppb"].attrs["long_name"]


def test_any_hdf5_library_reads_it(result: Result, tmp_path: Path) -> None:
    write_netcdf(result, tmp_path / "hourly.nc")
    with h5py.File(tmp_path / "hourly.nc") as file:
        assert file["no2_ppb"].dtype == np.float32
        assert file["no2_ppb"].compression == "gzip"


def test_writing_leaves_the_dataset_as_it_was(result: Result, tmp_path: Path) -> None:
    before = result.hourly.copy(deep=True)
    write_netcdf(result, tmp_path / "hourly.nc")
    assert before.identical(result.hourly)


def test_no_receptors_make_an_empty_dataset(make_result) -> None:
    hourly = hourly_dataset(make_result(kept=()))
    assert hourly.sizes == {"receptor": 0, "time": 48}
