"""The studies that whole runs are measured on: complete, seeded, and owned up to as invented."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from generated import INVENTED, write_lines, write_network

import roaddisp as rd

SMALL_LINES = {"receptors": 40, "links": 15, "hours": 24 * 30}
SMALL_NETWORK = {"links": 6, "counted": 4, "points": 10, "spacing": 200, "hours": 24 * 14}


@pytest.fixture(scope="module")
def lines(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return write_lines(tmp_path_factory.mktemp("lines"), **SMALL_LINES)


@pytest.fixture(scope="module")
def network(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return write_network(tmp_path_factory.mktemp("network"), **SMALL_NETWORK)


def test_single_lines_form_five_groups_and_need_one_line_each(lines: Path) -> None:
    counts = rd.run(rd.read_study(lines)).record["counts"]
    assert counts["links"] == counts["segments"] == 15
    assert counts["groups_of_links"] == 5
    assert counts["receptors"] == 40
    assert counts["weather"]["calm"] == 0
    assert counts["weather_states"] <= 216


def test_every_link_of_the_network_changes_in_its_own_way(network: Path) -> None:
    """Distinct hourly speeds: no two links can be summed early. 24 m asks for many lines."""
    result = rd.run(rd.read_study(network))
    counts = result.record["counts"]
    assert counts["groups_of_links"] == counts["links"] == 6
    assert counts["segments"] > 12 * 6
    assert counts["weather"]["calm"] > 0
    assert counts["hours_without_traffic"] == 0
    assert "grid" in result.summary["kind"].to_numpy()
    assert np.isfinite(result.statistics.no2_mean_ppb).all()


@pytest.mark.parametrize("study", ["lines", "network"])
def test_every_text_file_says_that_it_is_invented(
    study: str, request: pytest.FixtureRequest
) -> None:
    folder: Path = request.getfixturevalue(study)
    texts = [path for path in folder.iterdir() if path.suffix in {".csv", ".toml", ".md"}]
    assert len(texts) >= 6
    assert all(INVENTED in path.read_text(encoding="utf-8") for path in texts)


def test_the_same_study_is_written_again(lines: Path, tmp_path: Path) -> None:
    again = write_lines(tmp_path, **SMALL_LINES)
    for path in lines.glob("*.csv"):
        assert path.read_bytes() == (again / path.name).read_bytes()
