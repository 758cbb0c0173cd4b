"""Statistics of a block against pandas' resampling and numpy's sorting."""

from __future__ import annotations

from dataclasses import fields, replace
from decimal import ROUND_DOWN, Decimal

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from roaddisp.model import Background, Clock, Statistics
from roaddisp.standards.statistics import (
    annual_98th_rank,
    block_statistics,
    join_statistics,
    over_years,
    truncated,
)

FACTOR = 1.9125


def clock(start: str, count: int) -> Clock:
    times = np.datetime64(start, "m") + np.arange(count) * np.timedelta64(60, "m")
    return Clock(times, times, utc_offset=0.0, timezone="UTC")


@pytest.fixture(scope="module")
def two_years() -> dict[str, object]:
    """Three receptors, 2023 and 2024, with calms, missing hours and a missing background."""
    rng = np.random.default_rng(5)
    count = 8760 + 8784
    calm = rng.random(count) < 0.04
    calm[1000:1060] = True  # two whole days calm
    gone = rng.random(count) < 0.02
    gone[5000:5040] = True
    background = Background(
        o3=rng.uniform(10, 40, count), no2=rng.gamma(3, 3, count), no=rng.gamma(2, 2, count)
    )
    background.no[200:300] = np.nan
    background.no2[7000:7100] = np.nan
    nox = rng.gamma(1.0, [[20.0], [50.0], [5.0]], (3, count))
    no2 = background.no2 + 0.3 * nox / FACTOR
    nox[:, calm | gone] = np.nan
    no2[:, calm | gone] = np.nan
    return {
        "nox": nox,
        "no2": no2,
        "calm": calm,
        "raised": rng.random(count) < 0.3,
        "background": background,
        "count": count,
    }


@pytest.fixture(scope="module")
def made(two_years: dict[str, object]) -> Statistics:
    return block_statistics(
        two_years["nox"],  # type: ignore[arg-type]
        two_years["no2"],  # type: ignore[arg-type]
        clock=clock("2023-01-01T00:00", 8760 + 8784),
        background=two_years["background"],  # type: ignore[arg-type]
        calm=two_years["calm"],  # type: ignore[arg-type]
        raised=two_years["raised"],  # type: ignore[arg-type]
        ugm3_per_ppb=FACTOR,
    )


def test_against_pandas_and_numpy(two_years: dict[str, object], made: Statistics) -> None:
    nox, no2, calm = two_years["nox"], two_years["no2"], two_years["calm"]
    air = two_years["background"]
    times = pd.DatetimeIndex(clock("2023-01-01T00:00", two_years["count"]).standard)
    for y, year in enumerate((2023, 2024)):
        here = np.flatnonzero(times.year == year)
        for r in range(3):
            road, total = nox[r, here], no2[r, here]
            hourly = pd.Series(total, index=times[here])
            entering = pd.Series(~np.isnan(total) | calm[here], index=times[here]).resample("D")
            daily = hourly.resample("D").max()[entering.sum() >= 18].dropna()
            rank = annual_98th_rank(len(daily))
            valued = np.sort(total[~np.isnan(total)])
            whole = road / FACTOR + air.no2[here] + air.no[here]
            raised = pd.Series(two_years["raised"][here], index=times[here])
            when = hourly[np.isin(hourly.index.normalize(), daily.nlargest(rank).index)]
            top_days = when.groupby(when.index.normalize()).idxmax()
            expected = {
                "nox_road_mean_ugm3": np.nanmean(road),
                "no2_mean_ppb": valued.mean(),
                "no2_road_mean_ppb": np.nanmean(total - air.no2[here]),
                "nox_mean_ppb": np.nanmean(whole),
                "no2_1h_max_ppb": valued[-1],
                "no2_1h_p98_ppb": daily.nlargest(rank).iloc[-1],
                "no2_1h_19th_ppb": valued[-19],
                "raised_in_p98": raised[top_days].sum(),
                "raised_in_19th": raised[hourly.nlargest(19).index].sum(),
            }
            for column, value in expected.items():
                assert getattr(made, column)[y, r] == pytest.approx(value, rel=1e-12), column
    assert made.years.tolist() == [2023, 2024]


def test_truncated_percentile_is_the_rank_of_truncated_hours(
    two_years: dict[str, object], made: Statistics
) -> None:
    """40 CFR 50 App. S cuts hours before ranking; the order of both steps is the same."""
    cut = truncated(two_years["no2"])  # type: ignore[arg-type]
    again = block_statistics(
        two_years["nox"],  # type: ignore[arg-type]
        cut,
        clock=clock("2023-01-01T00:00", two_years["count"]),  # type: ignore[arg-type]
        background=two_years["background"],  # type: ignore[arg-type]
        calm=two_years["calm"],  # type: ignore[arg-type]
        raised=two_years["raised"],  # type: ignore[arg-type]
        ugm3_per_ppb=FACTOR,
    )
    assert again.no2_1h_p98_ppb.tolist() == made.no2_1h_p98_truncated_ppb.tolist()


def test_blocks_join_to_the_whole(two_years: dict[str, object], made: Statistics) -> None:
    parts = [
        block_statistics(
            two_years["nox"][rows],  # type: ignore[index]
            two_years["no2"][rows],  # type: ignore[index]
            clock=clock("2023-01-01T00:00", two_years["count"]),  # type: ignore[arg-type]
            background=two_years["background"],  # type: ignore[arg-type]
            calm=two_years["calm"],  # type: ignore[arg-type]
            raised=two_years["raised"],  # type: ignore[arg-type]
            ugm3_per_ppb=FACTOR,
        )
        for rows in (slice(0, 1), slice(1, 3))
    ]
    joined = join_statistics(parts)
    for field in fields(Statistics):
        assert np.array_equal(getattr(joined, field.name), getattr(made, field.name))
    with pytest.raises(ValueError, match="different years"):
        join_statistics([parts[0], replace(parts[1], years=np.array([1999, 2000]))])
    with pytest.raises(ValueError, match="no statistics to join"):
        join_statistics([])


def small(no2: np.ndarray, **changes: object) -> Statistics:
    arguments = {
        "clock": clock("2023-01-01T00:00", no2.shape[1]),
        "background": Background(np.full(no2.shape[1], 30.0), np.zeros(no2.shape[1]), None),
        "calm": np.zeros(no2.shape[1], dtype=bool),
        "raised": np.zeros(no2.shape[1], dtype=bool),
        "ugm3_per_ppb": FACTOR,
    } | changes
    return block_statistics(no2 * FACTOR, no2, **arguments)  # type: ignore[arg-type]


def test_without_any_value_everything_is_missing() -> None:
    made = small(np.full((2, 48), np.nan))
    for field in fields(Statistics):
        if field.name != "years":
            assert np.isnan(getattr(made, field.name)).all(), field.name


def test_without_background_no_total_nox_is_not_known() -> None:
    assert np.isnan(small(np.ones((1, 24))).nox_mean_ppb).all()


def test_fewer_than_nineteen_hours_have_no_nineteenth() -> None:
    no2 = np.full((2, 24), np.nan)
    no2[0, :18], no2[1, :19] = np.arange(18.0), np.arange(19.0)
    made = small(no2)
    assert np.isnan(made.no2_1h_19th_ppb[0, 0])
    assert made.no2_1h_19th_ppb[0, 1] == 0.0
    assert made.no2_1h_max_ppb[0].tolist() == [17.0, 18.0]


def test_equal_hours_each_take_a_rank() -> None:
    no2 = np.array([[7.0] * 20 + [3.0] * 4])
    assert small(no2).no2_1h_19th_ppb[0, 0] == 7.0


def test_a_day_all_calm_counts_as_present_and_is_not_ranked() -> None:
    """51 days of maxima 1 to 51: the 2nd highest rules; with one all calm 50 are left: the 1st."""
    no2 = np.repeat(np.arange(1.0, 52.0), 24)[None, :]
    calm = np.zeros(51 * 24, dtype=bool)
    assert small(no2).no2_1h_p98_ppb[0, 0] == 50.0
    calm[:24] = True
    no2 = np.where(calm, np.nan, no2)
    assert small(no2, calm=calm).no2_1h_p98_ppb[0, 0] == 51.0


def test_shapes_are_checked() -> None:
    with pytest.raises(ValueError, match=r"allowed: \(R, 48\) both"):
        small(np.ones((2, 24)), clock=clock("2023-01-01T00:00", 48))


@given(
    st.one_of(st.integers(0, 400_000), st.integers(0, 4_000).map(lambda tenths: 100 * tenths)),
    st.sampled_from([-1e-13, 0.0, 1e-13]),
)
def test_truncation_is_decimal(thousandths: int, noise: float) -> None:
    """Against the standard library's decimals, with binary noise in the last digits."""
    exact = Decimal(thousandths).scaleb(-3).quantize(Decimal("0.1"), rounding=ROUND_DOWN)
    held = thousandths / 1000 * (1 + noise)
    assert float(truncated(np.array(held))) == pytest.approx(float(exact), abs=1e-9)


def test_percentiles_average_over_years_and_the_rest_take_the_worst() -> None:
    two = np.array([[10.0, 4.0, np.nan], [13.0, 2.0, np.nan]])
    made = Statistics(np.array([2022, 2023]), *(two for _ in range(10)))
    for column in ("no2_1h_p98_ppb", "no2_1h_p98_truncated_ppb"):
        assert over_years(made, column)[:2].tolist() == [11.5, 3.0]
    for column in ("no2_mean_ppb", "nox_road_mean_ugm3", "no2_1h_19th_ppb", "no2_1h_max_ppb"):
        assert over_years(made, column)[:2].tolist() == [13.0, 4.0]
    assert np.isnan(over_years(made, "no2_mean_ppb")[2])
