"""Receptor table: the contract's columns, units and forms, as CSV and Parquet."""

from __future__ import annotations

import csv
from dataclasses import replace
from pathlib import Path

import numpy as np
import pandas as pd
import pyarrow.parquet as pq
import pytest

from roaddisp.model import Result
from roaddisp.outputs.tables import receptor_table, write_csv, write_parquet

COLUMNS = [  # the contract's, word for word
    *("receptor", "site", "kind", "x_m", "y_m", "longitude", "latitude", "z_m", "on_road"),
    *("nox_road_mean_ugm3", "no2_mean_ugm3", "no2_mean_ppb", "no2_road_mean_ugm3"),
    *("no2_1h_max_ppb", "no2_1h_p98_ppb", "no2_1h_19th_ugm3"),
    *("us-naaqs-1h_value", "us-naaqs-1h_limit", "us-naaqs-1h_met"),
    *("california-annual_value", "california-annual_limit", "california-annual_met"),
]


def read(path: Path) -> tuple[list[str], list[dict[str, str]]]:
    with path.open(encoding="utf-8", newline="") as file:
        reader = csv.DictReader(file)
        return list(reader.fieldnames or ()), list(reader)


def two_years(result: Result, with_values, first: float, second: float, name: str) -> Result:
    count = len(result.scenario.receptors)
    values = np.vstack([np.full(count, first), np.full(count, second)])
    return with_values(result, **{name: values})


def test_columns_are_the_contracts_in_order(result: Result, tmp_path: Path) -> None:
    assert list(receptor_table(result).columns) == COLUMNS
    write_csv(result, tmp_path / "receptors.csv")
    write_parquet(result, tmp_path / "receptors.parquet")
    assert read(tmp_path / "receptors.csv")[0] == COLUMNS
    assert pq.read_schema(tmp_path / "receptors.parquet").names == COLUMNS


def test_every_column_has_a_meaning_and_a_number_its_unit(result: Result) -> None:
    described = result.summary.attrs["columns"]
    assert list(described) == COLUMNS
    assert all(column["meaning"] for column in described.values())
    for name, unit in (("_ugm3", "ug/m3"), ("_ppb", "ppb"), ("_m", "m")):
        assert {c["unit"] for n, c in described.items() if n.endswith(name)} == {unit}
    assert described["california-annual_value"]["unit"] == "ppm"
    assert "1.8804" in described["no2_mean_ugm3"]["meaning"]
    assert "provisional: 1 year of 3" in described["us-naaqs-1h_met"]["meaning"]


def test_mass_is_ppb_times_the_factor_of_the_study(result: Result, with_values) -> None:
    """100 ppb of NO2 at 25 C is 188.04 ug/m3 (40 CFR 50.3; 75 FR 6474 prints 188)."""
    count = len(result.scenario.receptors)
    filled = with_values(
        result,
        no2_mean_ppb=np.full((1, count), 100.0),
        no2_1h_19th_ppb=np.full((1, count), 53.0),
        nox_road_mean_ugm3=np.full((1, count), 77.0),
    )
    table = receptor_table(filled)
    assert table["no2_mean_ugm3"].to_numpy() == pytest.approx(188.04)
    assert table["no2_1h_19th_ugm3"].to_numpy() == pytest.approx(99.66, abs=5e-3)
    assert table["nox_road_mean_ugm3"].to_numpy() == pytest.approx(77.0)


@pytest.mark.parametrize(
    ("statistic", "column", "expected"),
    [
        ("no2_1h_p98_ppb", "no2_1h_p98_ppb", 85.0),  # the mean of 80 and 90
        ("no2_1h_max_ppb", "no2_1h_max_ppb", 90.0),  # the highest hour
        ("no2_mean_ppb", "no2_mean_ppb", 90.0),  # the worst year
        ("no2_1h_19th_ppb", "no2_1h_19th_ugm3", 169.236),  # the worst year, x 1.8804
        ("nox_road_mean_ugm3", "nox_road_mean_ugm3", 90.0),
        ("no2_road_mean_ppb", "no2_road_mean_ugm3", 169.236),
    ],
)
def test_years_are_joined_as_the_contract_says(
    make_result,
    with_values,
    statistic: str,
    column: str,
    expected: float,
) -> None:
    result = two_years(make_result(years=2), with_values, 80.0, 90.0, statistic)
    assert receptor_table(result)[column].to_numpy() == pytest.approx(expected)


def test_a_year_without_a_value_leaves_the_other_and_none_leaves_it_empty(
    make_result,
    with_values,
    tmp_path: Path,
) -> None:
    result = make_result(years=2)
    one = two_years(result, with_values, np.nan, 90.0, "no2_1h_p98_ppb")
    assert receptor_table(one)["no2_1h_p98_ppb"].iloc[0] == 90.0
    none = two_years(result, with_values, np.nan, np.nan, "no2_1h_p98_ppb")
    none = two_years(none, with_values, np.nan, np.nan, "no2_1h_19th_ppb")
    write_csv(none, tmp_path / "receptors.csv")
    row = read(tmp_path / "receptors.csv")[1][0]
    assert row["no2_1h_p98_ppb"] == ""
    assert row["no2_1h_19th_ugm3"] == ""


def test_rules_keep_their_decimals_and_others_their_digits(result: Result, tmp_path: Path) -> None:
    write_csv(result, tmp_path / "receptors.csv")
    rows = {row["receptor"]: row for row in read(tmp_path / "receptors.csv")[1]}
    assert rows["room"]["us-naaqs-1h_limit"] == "100"
    assert rows["room"]["california-annual_limit"] == "0.030"
    assert rows["room"]["california-annual_value"] == "0.010"
    assert "." not in rows["edge"]["us-naaqs-1h_value"]
    exact = receptor_table(result)
    for name in COLUMNS[9:16]:
        written = np.array([float(row[name]) for row in rows.values()])
        assert written == pytest.approx(exact[name].to_numpy(), rel=1e-9)
    assert float(rows["room"]["y_m"]) == pytest.approx(exact["y_m"].iloc[0], abs=1e-3)


def test_flags_and_verdicts_are_words(result: Result, tmp_path: Path) -> None:
    write_csv(result, tmp_path / "receptors.csv")
    rows = {row["receptor"]: row for row in read(tmp_path / "receptors.csv")[1]}
    assert rows["median"]["on_road"] == "true"
    assert rows["median"]["us-naaqs-1h_met"] == ""
    assert rows["room"]["on_road"] == "false"
    assert rows["room"]["us-naaqs-1h_met"] == "yes"
    assert rows["edge"]["us-naaqs-1h_met"] == "no"
    assert rows["edge"]["site"] == ""
    assert rows["attic"]["us-naaqs-1h_met"] == "undetermined"


def test_names_with_commas_quotes_and_accents_survive(result: Result, tmp_path: Path) -> None:
    receptors = result.scenario.receptors
    odd = ('Salle "B", école', *receptors.receptor[1:])
    scenario = replace(result.scenario, receptors=replace(receptors, receptor=odd))
    write_csv(replace(result, scenario=scenario), tmp_path / "receptors.csv")
    assert read(tmp_path / "receptors.csv")[1][0]["receptor"] == odd[0]


def test_parquet_carries_full_precision_units_and_cautions(result: Result, tmp_path: Path) -> None:
    path = tmp_path / "receptors.parquet"
    write_parquet(result, path)
    back = pd.read_parquet(path)
    exact = receptor_table(result)
    assert (back["no2_mean_ugm3"].to_numpy() == exact["no2_mean_ugm3"].to_numpy()).all()
    assert back["on_road"].dtype == bool
    assert back["us-naaqs-1h_met"].isna().sum() == (exact["us-naaqs-1h_met"] == "").sum()
    schema = pq.read_schema(path)
    field = schema.field("no2_1h_p98_ppb")
    assert field.metadata[b"unit"] == b"ppb"
    assert b"98th percentile" in field.metadata[b"description"]
    assert b"licensed practitioner" in schema.metadata[b"cautions"]


def test_built_in_factors_are_marked(make_result, tmp_path: Path) -> None:
    write_parquet(make_result(built_in=True), tmp_path / "with.parquet")
    write_parquet(make_result(built_in=False), tmp_path / "without.parquet")
    with_factors = pq.read_schema(tmp_path / "with.parquet").metadata[b"cautions"]
    without = pq.read_schema(tmp_path / "without.parquet").metadata[b"cautions"]
    assert b"built-in" in with_factors
    assert b"built-in" not in without
