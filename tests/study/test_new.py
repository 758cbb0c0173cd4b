"""A new study runs as it is, and the reference describes every key and column."""

from __future__ import annotations

from pathlib import Path

import pytest

from roaddisp.errors import OutputError
from roaddisp.study.document import document_inputs
from roaddisp.study.new import new_study
from roaddisp.study.read import read_study
from roaddisp.study.schema import SECTIONS
from roaddisp.study.tables import TABLES


def test_new_study_is_fit_to_run(tmp_path: Path) -> None:
    written = new_study(tmp_path / "mine")
    assert written[0].name == "study.toml"
    study = read_study(tmp_path / "mine")
    assert [problem.message for problem in study.cautions] == [
        "receptors: grid cells on the road: they keep their value, flagged"
    ]
    assert len(study.scenarios["base"].clock.standard) == 14 * 24


def test_every_new_file_says_that_it_is_invented(tmp_path: Path) -> None:
    for path in new_study(tmp_path / "mine"):
        assert "All data in this file are invented" in path.read_text(), path.name


def test_same_bytes_every_time(tmp_path: Path) -> None:
    first, second = (new_study(tmp_path / name) for name in ("a", "b"))
    assert [path.read_bytes() for path in first] == [path.read_bytes() for path in second]


def test_scenario_suggested_in_the_new_study_works(tmp_path: Path) -> None:
    settings = new_study(tmp_path)[0]
    text = settings.read_text().replace("# [scenario", "[scenario").replace("# roads.", "roads.")
    settings.write_text(text)
    study = read_study(tmp_path)
    assert list(study.scenarios) == ["base", "fewer-trucks"]
    assert study.scenarios["fewer-trucks"].network.heavy_share.tolist() == [0.04, 0.04]


def test_folder_that_holds_something_is_left_alone(tmp_path: Path) -> None:
    (tmp_path / "notes.txt").write_text("mine")
    with pytest.raises(OutputError, match="holds something already"):
        new_study(tmp_path)
    assert [path.name for path in tmp_path.iterdir()] == ["notes.txt"]


def test_reference_describes_every_key_and_column() -> None:
    text = document_inputs()
    for name, section in SECTIONS.items():
        assert f"## `[{name}]` in study.toml" in text
        for key, field in section.model_fields.items():
            assert f"- `{key}` (" in text
            assert field.description
    for tables in TABLES.values():
        for table in tables.values():
            start = text.index(f"## Table `{table.name}`")
            part = text[start : text.find("\n## ", start + 5)]
            for column in table.columns:
                assert f"- `{column.name}`" in part


def test_reference_lists_the_contract_s_columns() -> None:
    """Columns by the contract, written out here by hand."""
    contract = {
        "roads": "link aadt speed heavy_share name width lanes grade height edge_slope capacity "
        "profile fleet barrier_height barrier_offset",
        "profiles": "profile day_type hour share month day_factor",
        "counts": "link time vehicles vehicle_class speed",
        "mix": "fleet vehicle_class share",
        "factors": "vehicle_class speed nox no2_fraction year grade",
        "weather": "time wind_from wind_speed temperature stability cloud ceiling solar "
        "mixing_height pressure temperature_difference sigma_theta",
        "air": "time o3 no2 no nox",
        "points": "receptor site kind height",
        "sites": "site kind",
    }
    tables = {table.name: table for each in TABLES.values() for table in each.values()}
    for name, columns in contract.items():
        assert set(columns.split()) <= set(tables[name].names), name
