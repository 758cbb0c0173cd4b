"""Ranks of the US and EU rules."""

from __future__ import annotations

import numpy as np
import pytest

from roaddisp.model import Background, Clock, Statistics
from roaddisp.standards.statistics import annual_98th_rank, block_statistics

# 40 CFR 50 Appendix S, Table 1 (from memory): days with valid data, nth highest.
TABLE_1 = [
    (1, 50, 1),
    (51, 100, 2),
    (101, 150, 3),
    (151, 200, 4),
    (201, 250, 5),
    (251, 300, 6),
    (301, 350, 7),
    (351, 366, 8),
]


def _statistics(no2: np.ndarray, start: str, calm: np.ndarray | None = None) -> Statistics:
    hours = np.datetime64(start, "m") + np.arange(no2.size) * np.timedelta64(60, "m")
    return block_statistics(
        no2[None, :],
        no2[None, :],
        clock=Clock(hours, hours, utc_offset=0.0, timezone="UTC"),
        background=Background(np.full(no2.size, 30.0), np.zeros(no2.size), None),
        calm=np.zeros(no2.size, dtype=bool) if calm is None else calm,
        raised=np.zeros(no2.size, dtype=bool),
        ugm3_per_ppb=1.8804,
    )


def test_table_covers_every_count_of_days() -> None:
    assert [low for low, _, _ in TABLE_1][1:] == [high + 1 for _, high, _ in TABLE_1][:-1]


@pytest.mark.parametrize(("low", "high", "rank"), TABLE_1)
def test_rank_table(low: int, high: int, rank: int) -> None:
    assert {annual_98th_rank(days) for days in range(low, high + 1)} == {rank}


@pytest.mark.parametrize("days", range(1, 367))
def test_statistic_takes_the_rank_of_the_table(days: int) -> None:
    """Daily maxima 1, 2, ... ppb in shuffled order: the nth highest is days + 1 - n."""
    rank = next(rank for low, high, rank in TABLE_1 if low <= days <= high)
    maxima = np.random.default_rng(days).permutation(days) + 1.0
    no2 = np.full((days, 24), 0.5)
    no2[np.arange(days), np.arange(days) % 24] = maxima
    result = _statistics(no2.ravel(), "2024-01-01T00:00")
    assert result.no2_1h_p98_ppb[0, 0] == days + 1 - rank


def test_eighteen_hours_above_are_permitted() -> None:
    """2008/50/EC: 200 ug/m3 not more than 18 times a year, so the 19th highest hour rules."""
    year = np.full(8760, 20.0)
    year[np.arange(18) * 400] = 300.0
    assert _statistics(year, "2023-01-01T00:00").no2_1h_19th_ppb[0, 0] == 20.0
    year[8000] = 250.0
    assert _statistics(year, "2023-01-01T00:00").no2_1h_19th_ppb[0, 0] == 250.0


def test_nineteenth_of_the_year_is_its_99_79th_percentile() -> None:
    """(8760 - 18.5) / 8760 = 99.79 %; numpy's percentile by Hazen's plotting position."""
    year = np.random.default_rng(3).gamma(2.0, 12.0, 8760)
    ours = _statistics(year, "2023-01-01T00:00").no2_1h_19th_ppb[0, 0]
    assert ours == pytest.approx(
        np.percentile(year, 100 * (8760 - 18.5) / 8760, method="hazen"), rel=1e-12
    )


def test_days_need_eighteen_hours_and_calms_count() -> None:
    """App. S (from memory): a day counts with 18 hours of 24."""
    no2 = np.tile(np.arange(24.0), (3, 1)) + np.array([[100.0], [200.0], [300.0]])
    no2[2, :7] = np.nan  # 17 hours: the day does not count
    no2[1, :6] = np.nan  # 18 hours: it does
    flat = no2.ravel()
    assert _statistics(flat, "2023-03-01T00:00").no2_1h_p98_ppb[0, 0] == 223.0
    calm = np.isnan(flat)
    assert _statistics(flat, "2023-03-01T00:00", calm).no2_1h_p98_ppb[0, 0] == 323.0
