"""The example's data: made by the script beside them, whole, plausible, and marked invented."""

from __future__ import annotations

import importlib.util
import tomllib
from collections.abc import Iterator
from pathlib import Path
from types import ModuleType

import numpy as np
import pandas as pd
import pyogrio
import pytest

EXAMPLES = Path(__file__).parents[2] / "examples"
FOLDER = EXAMPLES / "larch_field"
TABLES = ("profiles.csv", "mix.csv", "factors.csv", "weather.csv", "air.csv")
LAYERS = ("roads.gpkg", "roads_build.gpkg", "points.gpkg", "sites.gpkg")


@pytest.fixture(scope="module")
def maker() -> ModuleType:
    spec = importlib.util.spec_from_file_location(
        "make_larch_field", EXAMPLES / "make_larch_field.py"
    )
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


@pytest.fixture(scope="module")
def made(maker: ModuleType, tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("larch_field")
    maker.main(folder)
    return folder


@pytest.fixture(scope="module")
def weather() -> pd.DataFrame:
    return pd.read_csv(FOLDER / "weather.csv", parse_dates=["time"])


@pytest.fixture(scope="module")
def air() -> pd.DataFrame:
    return pd.read_csv(FOLDER / "air.csv", parse_dates=["time"])


@pytest.mark.parametrize("name", TABLES)
def test_script_makes_the_tables_again_byte_for_byte(made: Path, name: str) -> None:
    assert (made / name).read_bytes() == (FOLDER / name).read_bytes()


@pytest.mark.parametrize("name", LAYERS)
def test_script_makes_the_layers_again(made: Path, name: str) -> None:
    """Values only: the bytes of a GeoPackage depend on the SQLite that wrote it."""
    again, kept = (pyogrio.read_dataframe(folder / name) for folder in (made, FOLDER))
    pd.testing.assert_frame_equal(again.drop(columns="geometry"), kept.drop(columns="geometry"))
    assert again.geometry.geom_equals_exact(kept.geometry, 0.0).all()
    assert again.crs == kept.crs


@pytest.mark.parametrize("name", LAYERS)
def test_layers_come_out_the_same_twice(
    made: Path, maker: ModuleType, tmp_path: Path, name: str
) -> None:
    maker.main(tmp_path)
    assert (tmp_path / name).read_bytes() == (made / name).read_bytes()


def test_every_door_to_the_data_says_that_they_are_invented() -> None:
    study = (FOLDER / "study.toml").read_text(encoding="utf-8")
    assert "invented" in tomllib.loads(study)["study"]["title"]
    assert "invented" in study.splitlines()[0] + study.splitlines()[1]
    for text in (FOLDER / "README.md", EXAMPLES / "make_larch_field.py"):
        assert "invented" in text.read_text(encoding="utf-8").lower()
    for name in LAYERS:
        metadata = pyogrio.read_info(FOLDER / name)["layer_metadata"]
        assert "Invented" in metadata["DESCRIPTION"]


def test_committed_data_are_small() -> None:
    assert sum(file.stat().st_size for file in FOLDER.iterdir() if file.is_file()) < 2_000_000


def test_year_is_whole(weather: pd.DataFrame, air: pd.DataFrame) -> None:
    """2027 is no leap year: 365 days of 24 hours."""
    hours = pd.date_range("2027-01-01", "2027-12-31T23:00", freq="h")
    assert len(hours) == 8760
    assert (weather["time"] == hours).all()
    assert (air["time"] == hours).all()


def test_some_hours_are_calm_and_some_missing(weather: pd.DataFrame, air: pd.DataFrame) -> None:
    """Completeness of every standard still holds: far fewer than 10 % are missing."""
    calm = weather["wind_speed [kn]"] == 0
    assert 0.02 < calm.mean() < 0.10
    assert weather.loc[calm, "wind_from [deg]"].isna().all()
    missing = weather["wind_speed [kn]"].isna() | weather["cloud [tenths]"].isna()
    assert 0.003 < missing.mean() < 0.03
    assert 0.003 < air["o3 [ppb]"].isna().mean() < 0.03


def test_wind_is_reported_in_tens_of_degrees(weather: pd.DataFrame) -> None:
    """Common practice, no source: 10 to 360 in tens, 360 for north, calms without one."""
    wind_from = weather["wind_from [deg]"].dropna()
    assert sorted(wind_from.unique()) == list(range(10, 361, 10))


def test_ozone_peaks_in_the_afternoon_and_in_summer(air: pd.DataFrame) -> None:
    """Common practice, no source."""
    by_hour = air["o3 [ppb]"].groupby(air["time"].dt.hour).mean()
    by_month = air["o3 [ppb]"].groupby(air["time"].dt.month).mean()
    assert 12 <= by_hour.idxmax() <= 16
    assert by_month.idxmax() in (6, 7, 8)


def test_no2_peaks_in_the_morning_and_in_winter(air: pd.DataFrame) -> None:
    """Common practice, no source."""
    by_hour = air["no2 [ppb]"].groupby(air["time"].dt.hour).mean()
    by_month = air["no2 [ppb]"].groupby(air["time"].dt.month).mean()
    assert 6 <= by_hour.idxmax() <= 9
    assert by_month.idxmax() in (12, 1, 2)


def test_profiles_are_whole() -> None:
    """Shares of a day sum to 1; day factors mean 1 over the 261 weekdays of 2027."""
    profiles = pd.read_csv(FOLDER / "profiles.csv")
    sums = profiles.groupby(["profile", "day_type"])["share"].sum()
    assert sums.to_numpy() == pytest.approx(1.0, abs=1e-9)
    days = pd.date_range("2027-01-01", "2027-12-31").day_of_week
    count = {
        "weekday": (days < 5).sum(),
        "saturday": (days == 5).sum(),
        "sunday": (days == 6).sum(),
    }
    factor = profiles.groupby("day_type")["day_factor"].first()
    mean = sum(count[day] * factor[day] for day in count) / 365
    assert mean == pytest.approx(1.0, abs=1e-4)


def test_factors_cover_the_classes_and_speeds_of_the_roads() -> None:
    factors = pd.read_csv(FOLDER / "factors.csv")
    mix = pd.read_csv(FOLDER / "mix.csv")
    assert set(factors["vehicle_class"]) == set(mix["vehicle_class"])
    assert mix["share"].sum() == pytest.approx(1.0, abs=1e-12)
    for name in ("roads.gpkg", "roads_build.gpkg"):
        speeds = pyogrio.read_dataframe(FOLDER / name)["SPD_LIM"]
        assert factors["speed [mph]"].min() <= speeds.min()
        assert speeds.max() <= factors["speed [mph]"].max()


def test_build_widens_the_arterial_and_leaves_the_freeway() -> None:
    base, build = (
        pyogrio.read_dataframe(FOLDER / name).set_index("link")
        for name in ("roads.gpkg", "roads_build.gpkg")
    )
    freeway = ["F-north", "F-south"]
    assert (build.loc[freeway, "AADT"] == base.loc[freeway, "AADT"]).all()
    arterial = ["A-west", "A-east"]
    assert (build.loc[arterial, "AADT"] > base.loc[arterial, "AADT"]).all()
    assert (build.loc[arterial, "WID_FT"] > base.loc[arterial, "WID_FT"]).all()
    assert np.all([len(line.coords) > 10 for line in base.loc[freeway].geometry])


@pytest.fixture(scope="module", autouse=True)
def _no_files_left_open() -> Iterator[None]:
    yield
    assert not list(FOLDER.glob("*.gpkg-*"))
