"""The whole way under each choice a study may make; what must hold whatever the numbers."""

from __future__ import annotations

import csv
import signal
import subprocess
import sys
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import numpy as np
import pytest
from typer.testing import CliRunner

import roaddisp as rd
from roaddisp.app.command import app
from roaddisp.study.new import new_study

Edit = Callable[[Path], None]


def replaced(old: str, new: str) -> Edit:
    def edit(folder: Path) -> None:
        study = folder / "study.toml"
        text = study.read_text(encoding="utf-8")
        assert old in text, old
        study.write_text(text.replace(old, new), encoding="utf-8")

    return edit


def made(folder: Path, *edits: Edit) -> rd.Result:
    folder.mkdir(exist_ok=True)
    new_study(folder)
    for edit in (replaced('hourly = ["classroom"]', 'hourly = "all"'), *edits):
        edit(folder)
    return rd.run(rd.read_study(folder))


@pytest.fixture(scope="module")
def plain(tmp_path_factory: pytest.TempPathFactory) -> rd.Result:
    return made(tmp_path_factory.mktemp("plain") / "study", without_grid)


def without_grid(folder: Path) -> None:
    study = folder / "study.toml"
    lines = study.read_text(encoding="utf-8").splitlines()
    study.write_text(
        "\n".join(line for line in lines if not line.startswith("grid")), encoding="utf-8"
    )


def calm_hours(result: rd.Result) -> np.ndarray:
    station = result.scenario.station
    still = station.wind_speed < result.scenario.options.calm_threshold
    return still | (np.isnan(station.wind_from) & (station.wind_speed < 1.0))


def test_calm_hours_are_empty_or_run_as_the_study_asks(tmp_path: Path, plain: rd.Result) -> None:
    """Dropped from road and background alike, or run at 1 m/s in the worst direction."""
    calm = calm_hours(plain)
    assert calm.any()
    assert np.isnan(plain.hourly["no2_ppb"].to_numpy()[:, calm]).all()
    run = made(
        tmp_path / "s", without_grid, replaced('calms = "both"', 'calms = "worst-direction"')
    )
    filled = run.hourly["no2_ppb"].to_numpy()
    assert np.isfinite(filled[:, calm]).all()
    np.testing.assert_array_equal(filled[:, ~calm], plain.hourly["no2_ppb"].to_numpy()[:, ~calm])
    assert run.worst is None
    assert plain.worst is not None
    np.testing.assert_allclose(run.statistics.no2_1h_max_ppb, plain.worst.no2_1h_max_ppb)
    assert (plain.worst.no2_1h_max_ppb >= plain.statistics.no2_1h_max_ppb).all()


def test_leaving_calms_out_changes_no_regulatory_number(tmp_path: Path, plain: rd.Result) -> None:
    run = made(tmp_path / "s", without_grid, replaced('calms = "both"', 'calms = "leave-out"'))
    assert run.worst is None
    for column in ("no2_mean_ppb", "no2_1h_p98_ppb", "nox_road_mean_ugm3"):
        np.testing.assert_array_equal(run.summary[column], plain.summary[column])


def test_the_grid_does_not_change_the_points(tmp_path: Path, plain: rd.Result) -> None:
    """A receptor's value never depends on which others are in the run."""
    with_grid = made(tmp_path / "s").summary.set_index("receptor")
    alone = plain.summary.set_index("receptor")
    for column in ("no2_mean_ppb", "no2_1h_max_ppb", "nox_road_mean_ugm3"):
        np.testing.assert_allclose(
            with_grid.loc[alone.index, column], alone[column], rtol=1e-6, err_msg=column
        )


def test_wind_at_the_station_is_never_lighter(tmp_path: Path, plain: rd.Result) -> None:
    """The power law takes wind away below the anemometer, so roads add less at the station's."""
    run = made(
        tmp_path / "s",
        without_grid,
        replaced(
            'anemometer_height = "10 m"', 'anemometer_height = "10 m"\nwind_height = "station"'
        ),
    )
    assert (run.summary["nox_road_mean_ugm3"] < plain.summary["nox_road_mean_ugm3"]).all()


def test_a_constant_background_is_there_every_hour(tmp_path: Path) -> None:
    run = made(
        tmp_path / "s",
        without_grid,
        replaced(
            'file = "air.csv"\nclock = "standard"',
            'constant = { o3 = "0 ppb", no2 = "11 ppb", no = "3 ppb" }',
        ),
    )
    hours = run.hourly.dropna("time")
    np.testing.assert_allclose(
        hours["no2_ppb"], hours["no2_primary_road_ppb"] + 11.0, rtol=1e-6, err_msg="no ozone"
    )
    np.testing.assert_allclose(
        hours["no_ppb"] + hours["no2_ppb"], hours["nox_road_ppb"] + 14.0, rtol=1e-6
    )


def test_counts_that_repeat_the_profile_give_its_numbers(tmp_path: Path, plain: rd.Result) -> None:
    """Hourly counts written out from AADT and shares by hand are the same traffic."""

    def with_counts(folder: Path) -> None:
        with (folder / "profiles.csv").open(encoding="utf-8") as file:
            rows = list(csv.DictReader(line for line in file if not line.startswith("#")))
        network = plain.scenario.network
        civil = plain.scenario.clock.civil
        lines = ["link,time,vehicles"]
        weekend = {5: "saturday", 6: "sunday"}
        for stamp, when in zip(plain.scenario.clock.standard, civil, strict=True):
            day = int(when.astype("M8[D]").astype(int) + 3) % 7
            hour = int(when.astype("M8[h]").astype(int) % 24)
            kind = weekend.get(day, "weekday")
            (row,) = [r for r in rows if r["day_type"] in (kind, "all") and int(r["hour"]) == hour]
            share = float(row["share"]) * float(row.get("day_factor") or 1.0)
            utc = f"{stamp.astype('M8[s]')}-07:00"
            lines += [
                f"{link},{utc},{aadt * share!r}"
                for link, aadt in zip(network.link, network.aadt.tolist(), strict=True)
            ]
        (folder / "counts.csv").write_text("\n".join(lines) + "\n", encoding="utf-8")

    run = made(
        tmp_path / "s",
        without_grid,
        with_counts,
        replaced('profiles = "profiles.csv"', 'counts = "counts.csv"'),
    )
    np.testing.assert_allclose(
        run.hourly["no2_ppb"].to_numpy(), plain.hourly["no2_ppb"].to_numpy(), rtol=1e-5
    )


def test_a_wake_margin_widens_the_source(tmp_path: Path, plain: rd.Result) -> None:
    """Emission moves outwards, off the road, so what stands beside it sees other numbers."""
    run = made(
        tmp_path / "s",
        without_grid,
        replaced('curves = "briggs"', 'curves = "briggs"\nwake_margin = "3 m"'),
    )
    ratio = run.summary["nox_road_mean_ugm3"] / plain.summary["nox_road_mean_ugm3"]
    assert ((ratio - 1).abs() > 1e-4).any()
    assert ((ratio - 1).abs() < 0.5).all()


def test_built_in_factors_are_marked_wherever_they_show(tmp_path: Path) -> None:
    run = made(
        tmp_path / "s", without_grid, replaced('factors = "factors.csv"', 'factors = "built-in"')
    )
    assert any("built-in" in str(caution) for caution in run.study.cautions)
    run.write(tmp_path / "out")
    record = (tmp_path / "out" / "record.json").read_text(encoding="utf-8")
    assert "from memory" in record
    assert any("built-in" in text for text in [run.hourly.attrs["comment"]])


def test_spread_directions_are_drawn_once_and_recorded(tmp_path: Path, plain: rd.Result) -> None:
    """The same seed gives the same hours; the record tells step and seed."""
    edit = replaced(
        'anemometer_height = "10 m"', 'anemometer_height = "10 m"\ndirection_step = "10 deg"'
    )
    first, second = (made(tmp_path / name, without_grid, edit) for name in "ab")
    np.testing.assert_array_equal(first.hourly["no2_ppb"], second.hourly["no2_ppb"])
    assert first.record["settings"]["weather"]["direction_step"] == "10 deg"
    assert first.record["settings"]["weather"]["direction_seed"] == 1
    assert first.record["counts"]["weather_states"] > plain.record["counts"]["weather_states"]


def test_an_unknown_scenario_is_refused(plain: rd.Result) -> None:
    with pytest.raises(rd.StudyError, match="no scenario of this name") as caught:
        rd.run(plain.study, scenario="bild")
    assert caught.value.problems[0].allowed == "base"


def test_progress_is_told(plain: rd.Result) -> None:
    told: list[tuple[str, int, int]] = []
    rd.run(plain.study, progress=lambda *step: told.append(step))
    assert told[0][1] == 0
    assert told[-1][1] == told[-1][2] == len(plain.scenario.receptors)


def test_threads_change_no_bit(plain: rd.Result) -> None:
    for threads in (1, 2):
        run = rd.run(plain.study, threads=threads)
        for name in ("no2_ppb", "nox_road_ugm3"):
            np.testing.assert_array_equal(run.hourly[name], plain.hourly[name])
        assert run.summary.equals(plain.summary)
    with pytest.raises(ValueError, match="threads: 0; allowed: 1 and more"):
        rd.run(plain.study, threads=0)


def test_runs_at_the_same_time_are_safe(plain: rd.Result) -> None:
    """The threading layers of compiled code do not bear concurrent calls of themselves."""
    with ThreadPoolExecutor(4) as pool:
        runs = list(pool.map(lambda _: rd.run(plain.study), range(4)))
    for run in runs:
        assert run.summary.equals(plain.summary)


def test_stopping_a_run_leaves_nothing(tmp_path: Path) -> None:
    """Ctrl-C while receptors are worked on: a message, code 130, and no file."""
    folder = tmp_path / "study"
    new_study(folder)
    replaced('spacing = "50 m"', 'spacing = "2 m"')(folder)
    told = (
        "import sys, roaddisp.pipeline as p\n"
        "from roaddisp.app.command import main\n"
        "told = p._told\n"
        "def speaking(*a):\n"
        "    for block in told(*a):\n"
        "        print('at work', flush=True)\n"
        "        yield block\n"
        "p._told = speaking\n"
        "main()\n"
    )
    with subprocess.Popen(
        [sys.executable, "-c", told, "run", str(folder)],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    ) as process:
        assert process.stdout is not None
        assert process.stdout.readline() == "at work\n"
        process.send_signal(signal.SIGINT)
        _, err = process.communicate(timeout=60)
    assert process.returncode == 130, err
    assert "nothing was written" in err
    assert not (folder / "out").exists()
    assert not [path for path in folder.iterdir() if path.name.startswith(".")]


def test_the_command_keeps_responses_in_a_file(tmp_path: Path, plain: rd.Result) -> None:
    folder, file = tmp_path / "study", tmp_path / "kept.h5"
    new_study(folder)
    without_grid(folder)
    for _ in range(2):
        words = ["run", str(folder), "--responses", str(file), "--threads", "1"]
        assert CliRunner().invoke(app, words).exit_code == 0
        assert file.exists()
        with (folder / "out" / "receptors.csv").open(encoding="utf-8") as table:
            rows = list(csv.DictReader(table))
        np.testing.assert_allclose(
            [float(row["no2_mean_ppb"]) for row in rows],
            plain.summary["no2_mean_ppb"],
            rtol=1e-5,
        )


def test_the_record_counts_what_the_wind_went_through(plain: rd.Result) -> None:
    counts = plain.record["counts"]
    station = plain.scenario.station
    assert counts["hours"] == station.wind_speed.size
    assert counts["weather"]["calm"] == int(calm_hours(plain).sum())
    below = (station.wind_speed < 1.0) & ~calm_hours(plain)
    assert counts["weather"]["below_1_m_s"] == int(below.sum())
    told = counts["hours_that_make_a_statistic"]["no2_1h_p98_ppb"]
    assert all(0 <= year["wind_raised_by_a_floor"] <= 8 for year in told.values())
