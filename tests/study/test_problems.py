"""Problems come all at once, each once, with a count where there are many."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

from roaddisp.errors import StudyError
from roaddisp.study.read import read_study


def test_good_study_has_no_problem(study: Any) -> None:
    assert study.problems() == ()


def test_all_problems_are_reported_at_once(study: Any) -> None:
    """Faults in the settings and in every file come in one list."""
    study.toml('"10 m"', "10")
    study.toml('"SPD [km/h]"', '"SPD"')
    study.roads("side", link="main")
    study.cells("profiles.csv", slice(3, 4), 3, "0.05")
    study.edit("mix.csv", "0.85", "0.75")
    study.edit("factors.csv", "nox [g/km]", "nox [lb/mi]")
    study.cells("weather.csv", slice(4, 5), 1, "370")
    study.cells("weather.csv", slice(6, 7), 0, "2023-03-01T06:30")
    study.cells("air.csv", slice(2, 3), 2, "-9.9")
    study.edit("points.csv", "gate,", "yard,")
    study.edit("points.csv", "playground", "Playground")
    found = [(problem.file, problem.message) for problem in study.errors()]
    assert found == [
        ("study.toml", "weather.anemometer_height: a number without a unit, where a length is "
         "needed"),
        ("roads.geojson", "numbers without a unit, where a speed is needed"),
        ("roads.geojson", "an id that stands twice"),
        ("profiles.csv", "profile 'town', all: the shares do not sum to 1"),
        ("factors.csv", "'lb/mi' is not a unit of emission factor that is read here"),
        ("mix.csv", "fleet 'town': the shares do not sum to 1"),
        ("weather.csv", "a value out of range"),
        ("weather.csv", "a time that is not on the whole hour"),
        ("air.csv", "a value out of range"),
        ("points.csv", "unknown kind"),
        ("points.csv", "an id that stands twice"),
    ]  # fmt: skip


def test_shared_file_is_reported_once(study: Any) -> None:
    """A fault of the base is not repeated for scenarios that share the file."""
    study.cells("weather.csv", slice(4, 5), 1, "370")
    study.add('[scenario.one]\nweather.calms = "leave-out"\n[scenario.two]\nair.clock = "utc"\n')
    assert len(study.errors()) == 1


def test_many_bad_cells_make_one_problem(study: Any) -> None:
    """Four thousand bad cells are one line with a count, not four thousand."""
    times = study.hours(4000)
    study.write("weather.csv", study.weather(times))
    study.write("air.csv", study.air(times))
    study.cells("weather.csv", slice(0, None), 2, "calm")
    (problem,) = study.errors()
    assert problem.count == 4000
    assert "(and 3999 more like it)" in str(problem)


def test_error_carries_every_problem_and_says_it(study: Any) -> None:
    """The exception is a ValueError whose text lists the errors."""
    study.cells("weather.csv", slice(4, 5), 1, "370")
    with pytest.raises(StudyError, match="row 5, line 6, column 'wind_from") as caught:
        study.read()
    assert isinstance(caught.value, ValueError)
    assert len(caught.value.problems) == 1


def test_no_study_here(tmp_path: Path) -> None:
    with pytest.raises(StudyError, match="there is no study here"):
        read_study(tmp_path)
