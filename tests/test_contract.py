"""The contract other programs rely on: names, signatures, columns, files, exit codes.

Source of what is expected: the product's design, sections 4.2 to 4.5, written
out here by hand.
"""

from __future__ import annotations

import inspect
import json
import os
import subprocess
import sys
from pathlib import Path

import pandas as pd
import pytest

import roaddisp as rd
from roaddisp.study.new import new_study

SIGNATURES = {
    "read_study": ["path"],
    "run": ["study", "*scenario=None", "*progress=None"],
    "unit_concentration": [
        "receptors", "segments", "*wind_from", "*wind_speed", "*stability", "*terrain='open'",
        "*height=1.3", "*sigma_z0=1.2", "*sigma_y0=0.0", "*mixing_height=inf",
    ],
    "response_table": [
        "receptors", "segments", "*wind_from", "*stability", "*strength", "*group",
        "*terrain='open'", "*height=1.3", "*sigma_z0=1.2", "*sigma_y0=0.0", "*mixing_height=inf",
    ],
    "ozone_limited_no2": ["nox", "o3", "no2_background", "primary_fraction"],
    "reaction_limited_no2": [
        "nox", "o3", "no2_background", "primary_fraction", "*travel_time", "*temperature",
        "*photolysis", "*no_background=0", "*pressure=101325.0",
    ],
    "line_strength": ["vehicles_per_hour", "grams_per_kilometre"],
    "turner_class": [
        "wind_speed", "cloud_tenths", "ceiling_m", "solar_elevation_deg", "*night=None",
    ],
}  # fmt: skip

COLUMNS = [
    "receptor", "site", "kind", "x_m", "y_m", "longitude", "latitude", "z_m", "on_road",
    "nox_road_mean_ugm3", "no2_mean_ugm3", "no2_mean_ppb", "no2_road_mean_ugm3",
    "no2_1h_max_ppb", "no2_1h_p98_ppb", "no2_1h_19th_ugm3",
]  # fmt: skip

HOURLY = {
    "nox_road_ugm3", "nox_road_ppb", "no2_primary_road_ppb", "no2_ppb", "no_ppb", "o3_ppb",
}  # fmt: skip


def spelled(function: object) -> list[str]:
    """Spell a signature out: keyword-only arguments with a star, defaults as written."""
    words = []
    for name, parameter in inspect.signature(function).parameters.items():  # type: ignore[arg-type]
        star = "*" if parameter.kind is inspect.Parameter.KEYWORD_ONLY else ""
        default = parameter.default
        tail = "" if default is inspect.Parameter.empty else f"={default!r}"
        words.append(f"{star}{name}{tail}")
    return words


@pytest.mark.parametrize("name", SIGNATURES)
def test_signatures_are_those_of_the_contract(name: str) -> None:
    """Further keyword arguments may follow, with defaults that leave these calls as they are."""
    wanted = SIGNATURES[name]
    found = spelled(getattr(rd, name))
    assert found[: len(wanted)] == wanted or set(wanted) <= set(found)
    assert all("=" in word and word.startswith("*") for word in found if word not in wanted)


def test_public_names_are_those_promised() -> None:
    assert set(SIGNATURES) | {"run_all", "StudyError"} <= set(rd.__all__)
    for name in rd.__all__:
        assert getattr(rd, name) is not None
    with pytest.raises(AttributeError, match="no_such_name"):
        rd.no_such_name  # noqa: B018


def command(*words: str | Path, **env: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-c", "from roaddisp.app.command import main; main()", *map(str, words)],
        capture_output=True,
        text=True,
        check=False,
        env={**os.environ, **env},
    )


@pytest.fixture(scope="module")
def small_run(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, rd.Result]:
    folder = tmp_path_factory.mktemp("small")
    new_study(folder)
    result = rd.run(rd.read_study(folder / "study.toml"))
    result.write(folder / "out")
    return folder, result


def test_receptor_table_has_the_columns_of_the_contract(
    small_run: tuple[Path, rd.Result],
) -> None:
    folder, result = small_run
    wanted = COLUMNS + [
        f"{name}_{part}"
        for name in result.scenario.options.standards
        for part in ("value", "limit", "met")
    ]
    assert list(result.summary.columns) == wanted
    table = pd.read_csv(folder / "out" / "receptors.csv")
    assert list(table.columns) == wanted
    assert list(pd.read_parquet(folder / "out" / "receptors.parquet").columns) == wanted
    assert set(result.summary.attrs["columns"]) == set(wanted)


def test_hourly_dataset_has_the_variables_of_the_contract(
    small_run: tuple[Path, rd.Result],
) -> None:
    _, result = small_run
    assert set(result.hourly.data_vars) >= HOURLY
    assert result.hourly["no2_ppb"].dims == ("receptor", "time")


def test_run_all_begins_with_the_study_as_it_stands(tmp_path: Path) -> None:
    new_study(tmp_path)
    with (tmp_path / "study.toml").open("a", encoding="utf-8") as file:
        file.write('\n[scenario.quieter]\nstudy.terrain = "urban"\n')
    results = rd.run_all(rd.read_study(tmp_path))
    assert list(results) == ["base", "quieter"]
    base, urban = (results[name].summary["nox_road_mean_ugm3"].mean() for name in results)
    assert urban < base, "urban spread dilutes more"


def test_the_command_ends_with_the_codes_of_the_contract(tmp_path: Path) -> None:
    folder = tmp_path / "study"
    assert command("new", folder).returncode == 0
    assert command("check", folder).returncode == 0
    done = command("run", folder, "--json")
    assert done.returncode == 0, done.stderr
    assert set(json.loads(done.stdout)["standards"]) == {"us-naaqs-1h", "us-naaqs-annual"}
    left = {path.name for path in (folder / "out").iterdir()}
    assert {"receptors.csv", "receptors.parquet", "study.gpkg", "map.png", "record.json"} <= left

    study = (folder / "study.toml").read_text(encoding="utf-8")
    (folder / "study.toml").write_text(study.replace("[roads]", "[roadz]"), encoding="utf-8")
    for words in (("check", folder), ("run", folder)):
        refused = command(*words)
        assert refused.returncode == 2
        assert "roadz" in refused.stderr
        assert "Traceback" not in refused.stderr
    assert command("run", tmp_path / "absent").returncode == 2


def test_a_command_of_a_later_version_is_refused_with_the_reason(tmp_path: Path) -> None:
    for name in ("setback", "compare", "explain", "report", "shortlist", "region"):
        refused = command(name, tmp_path, "A", "B", "--anything", "1")
        assert refused.returncode == 2
        assert "not in this version" in refused.stderr


def test_help_is_light_and_shows_an_example() -> None:
    for name in ("new", "check", "run", "standards", "inputs"):
        shown = command(name, "--help")
        assert shown.returncode == 0
        assert f"roaddisp {name}" in shown.stdout
    probe = (
        "import sys; from roaddisp.app import command; "
        "print([m for m in ('numpy', 'pandas', 'numba', 'geopandas') if m in sys.modules])"
    )
    loaded = subprocess.run(
        [sys.executable, "-c", probe], capture_output=True, text=True, check=True
    )
    assert loaded.stdout.strip() == "[]"
