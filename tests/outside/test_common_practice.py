"""What anyone knows who has stood beside a road with an analyser: common practice, no source.

Once over the real files (``real_files.py`` beside this file says what is real
and what had to be invented), once in the example study.
"""

from __future__ import annotations

import importlib.util
import re
import shutil
import sys
from pathlib import Path
from types import ModuleType

import numpy as np
import numpy.typing as npt
import pytest

import roaddisp as rd

HERE = Path(__file__).parent
EXAMPLE = HERE.parents[1] / "examples" / "larch_field"

FloatArray = npt.NDArray[np.float64]

RUSH = {6, 7, 8}
"""Hours (by their beginning) of the morning rush."""


def load(name: str) -> ModuleType:
    """A module beside this file, whatever else is called `tests` on the path."""
    spec = importlib.util.spec_from_file_location(name, HERE / f"{name}.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    sys.modules[name] = module  # where dataclasses look for it
    spec.loader.exec_module(module)
    return module


REAL = load("real_files")


# --- real streets, weather and traffic profile --------------------------------------------

STREETS = (34, 112, 158, 85)
"""On the west, east, south and north of the network; the background air is constant."""


@pytest.fixture(scope="module")
def roadside(tmp_path_factory: pytest.TempPathFactory) -> rd.Result:
    """Points 10 m off both edges of four of the busier streets, one on each side of the network."""
    folder = tmp_path_factory.mktemp("roadside")
    study = REAL.write_study(folder)
    streets = REAL.raw_streets()
    half_width = REAL.STREET_KINDS["edge"].width_ft / 2 * 0.3048
    rows = []
    for number in STREETS:
        line = np.asarray(streets.geometry[number - 1].coords)[:, :2] * REAL.SURVEY_FOOT
        middle = (line[0] + line[-1]) / 2
        along = (line[-1] - line[0]) / np.hypot(*(line[-1] - line[0]))
        for side in (1, -1):
            x, y = middle + side * (half_width + 10.0) * np.array([along[1], -along[0]])
            rows.append((f"{number}-{side}", "roadside", repr(float(x)), repr(float(y))))
    REAL.write_csv(folder / "roadside.csv", ["receptor", "kind", "x [m]", "y [m]"], rows)
    text = study.read_text(encoding="utf-8")
    schools = 'points = "schools.shp"\ncolumns = { receptor = "POLYID" }\n'
    assert schools in text
    study.write_text(text.replace(schools, 'points = "roadside.csv"\n'), encoding="utf-8")
    return rd.run(rd.read_study(study))


def by_hour(values: FloatArray, chosen: npt.NDArray[np.bool_]) -> FloatArray:
    """(24,) means of all points by hour of the chosen days, calm hours left out.

    Of both sides of streets that run both ways, so that the hour of a peak is not
    that of the wind which blows from one of them to one side.
    """
    days = values.reshape(len(values), -1, 24)[:, chosen, :]
    return np.nanmean(days, axis=(0, 1))


def clear_weekdays() -> npt.NDArray[np.bool_]:
    """Weekdays with three tenths of opaque cloud or less, on the mean of the day."""
    station = REAL.station_year()
    cloud = np.array(station.opaque_tenths).reshape(365, 24).mean(axis=1)
    weekday = np.array([start.weekday() < 5 for start in station.start[::24]])
    return (cloud <= 3.0) & weekday


def test_roadside_no_peaks_with_the_morning_rush(roadside):
    """All cars are back before the air mixes; by noon the wind takes the same traffic away.

    The evening has a second, lower peak, though the counter has its busiest hour there.
    """
    chosen = clear_weekdays()
    assert chosen.sum() > 80
    no = by_hour(roadside.hourly["no_ppb"].to_numpy(), chosen)
    assert int(np.argmax(no)) in RUSH
    assert no.max() > 1.2 * no[15:21].max() > 0
    assert no.max() > 5 * no[10:15].max()
    share = REAL.interstate_profile().share["weekday"]
    assert share.index(max(share)) == 16


def test_no2_share_is_lowest_when_no_peaks(roadside):
    """The ozone there is turns only so much NO into NO2."""
    chosen = clear_weekdays()
    no = by_hour(roadside.hourly["no_ppb"].to_numpy(), chosen)
    no2 = by_hour(roadside.hourly["no2_ppb"].to_numpy(), chosen)
    share = no2 / (no2 + no)
    assert int(np.argmin(share)) == int(np.argmax(no))
    assert share.min() < 0.8 < 0.95 < share[10:15].min()


# --- the example -------------------------------------------------------------------------


@pytest.fixture(scope="module")
def example(tmp_path_factory: pytest.TempPathFactory) -> rd.Result:
    """The example as it stands, but for its grid and site, which these tests do not look at."""
    folder = tmp_path_factory.mktemp("example") / "larch_field"
    shutil.copytree(EXAMPLE, folder, ignore=shutil.ignore_patterns("out"))
    study = folder / "study.toml"
    text, dropped = re.subn(r"(?m)^(grid|sites) = .*\n", "", study.read_text(encoding="utf-8"))
    text, kept = re.subn(r"(?m)^hourly = .*$", 'hourly = "all"', text)
    assert (dropped, kept) == (2, 1)
    study.write_text(text, encoding="utf-8")
    return rd.run(rd.read_study(study))


def test_ozone_left_at_the_roadside(example):
    """Lowest in the morning rush, highest in the afternoon: weekdays, both sides of the freeway."""
    hours = example.hourly.sel(receptor=["freeway-edge", "freeway-edge-west"])
    times = hours["time"].to_numpy().astype("datetime64[h]").astype(np.int64)
    hour = times % 24
    weekdays = (times // 24 + 3) % 7 < 5  # 1 January 1970 was a Thursday
    ozone = hours["o3_ppb"].to_numpy().mean(axis=0)
    mean = np.array([np.nanmean(ozone[weekdays & (hour == h)]) for h in range(24)])
    assert int(np.argmin(mean)) in RUSH
    assert 12 <= int(np.argmax(mean)) <= 17
    assert mean.max() > 2 * mean.min()
