"""Verdicts worked by hand."""

from __future__ import annotations

from dataclasses import replace
from decimal import ROUND_HALF_UP, Decimal

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from roaddisp.model import Statistics, Verdicts
from roaddisp.standards.rules import standard
from roaddisp.standards.verdicts import judge, rounded_half_up
from roaddisp.standards.years import Completeness


def statistics(years: int = 1, receptors: int = 1, **columns: object) -> Statistics:
    blank = np.full((years, receptors), 1.0)
    made = Statistics(np.arange(2023 - years + 1, 2024), *(blank for _ in range(10)))
    return replace(made, **{name: np.array(values) for name, values in columns.items()})


def complete(years: int = 1) -> Completeness:
    return Completeness(np.arange(2023 - years + 1, 2024), np.ones(years), np.ones((years, 4)))


def verdict(
    name: str, regulatory: Statistics, worst: Statistics | None = None, **changes: object
) -> Verdicts:
    years, receptors = regulatory.no2_mean_ppb.shape
    arguments = {
        "kinds": ("",) * receptors,
        "on_road": np.zeros(receptors, dtype=bool),
        "completeness": complete(years),
    } | changes
    return judge(standard(name), regulatory, worst, **arguments)  # type: ignore[arg-type]


def test_us_hourly_by_hand() -> None:
    """Three years of 98th percentiles; the rule rounds their mean to 1 ppb, halves up.

    (99.9 + 100.4 + 100.9) / 3 = 100.4 -> 100, met; (100.2 + 100.4 + 100.9) / 3 = 100.5 ->
    101, not met; (94 + 120 + 80) / 3 = 98, met although one year is above.
    """
    made = verdict(
        "us-naaqs-1h",
        statistics(
            3,
            3,
            no2_1h_p98_truncated_ppb=[
                [99.9, 100.2, 94.0],
                [100.4, 100.4, 120.0],
                [100.9, 100.9, 80.0],
            ],
        ),
    )
    assert made.value.tolist() == [100.0, 101.0, 98.0]
    assert made.met == ("yes", "no", "yes")
    assert (made.limit, made.unit, made.decimals, made.provisional) == (100.0, "ppb", 0, "")


def test_us_hourly_from_fewer_than_three_years_is_provisional() -> None:
    made = verdict("us-naaqs-1h", statistics(1, 1, no2_1h_p98_truncated_ppb=[[87.3]]))
    assert made.met == ("yes",)
    assert made.provisional == "1 of the 3 years that guidance asks"


def test_us_annual_by_hand() -> None:
    """Worst year, to 1 ppb: 53.4 -> 53, met; 53.5 -> 54, not met."""
    made = verdict("us-naaqs-annual", statistics(2, 2, no2_mean_ppb=[[53.4, 20.0], [51.0, 53.5]]))
    assert made.value.tolist() == [53.0, 54.0]
    assert made.met == ("yes", "no")
    assert made.provisional == ""


def test_eu_by_hand() -> None:
    """At 1.9130 ug/m3 per ppb: 20 ppb = 38.26 -> 38; 21.1 = 40.36 -> 40; 21.2 = 40.56 -> 41.

    Hours: 104.5 ppb = 199.9 -> 200, met; 104.9 = 200.67 -> 201, not met.
    """
    annual = verdict("eu-2008-annual", statistics(1, 3, no2_mean_ppb=[[20.0, 21.1, 21.2]]))
    assert annual.value.tolist() == [38.0, 40.0, 41.0]
    assert annual.met == ("yes", "yes", "no")
    hourly = verdict("eu-2008-1h", statistics(2, 2, no2_1h_19th_ppb=[[104.5, 90.0], [60.0, 104.9]]))
    assert hourly.value.tolist() == [200.0, 201.0]
    assert hourly.met == ("yes", "no")
    assert hourly.unit == "ug/m3"


def test_vegetation_by_total_nox() -> None:
    """15.9 ppb x 1.9130 = 30.4 -> 30, met; 16 ppb = 30.6 -> 31, not met; no NO, not known."""
    made = verdict(
        "eu-2008-nox-vegetation",
        statistics(1, 4, nox_mean_ppb=[[15.9, 16.0, np.nan, 15.9]]),
        kinds=("vegetation", "vegetation", "vegetation", "home"),
    )
    assert made.met == ("yes", "no", "undetermined", "")
    assert made.reason[2] == "total NOx is not known, for the background gives no NO"


def test_calms_that_change_the_answer_leave_it_undetermined() -> None:
    """98 left out and 103 with calms in the worst direction; 90 and 99 agree, so do 105 and 140."""
    made = verdict(
        "us-naaqs-1h",
        statistics(1, 3, no2_1h_p98_truncated_ppb=[[98.0, 90.0, 105.0]]),
        statistics(1, 3, no2_1h_p98_truncated_ppb=[[103.0, 99.0, 140.0]]),
    )
    assert made.met == ("undetermined", "yes", "no")
    assert made.value.tolist() == [98.0, 90.0, 105.0]
    assert made.reason == (
        "calm hours in the worst direction would make it 103 ppb, left out it is 98",
        "",
        "",
    )


def test_incomplete_data_leave_it_undetermined_and_say_why() -> None:
    thin = Completeness(np.array([2023]), np.array([0.8]), np.array([[1.0, 1.0, 0.5, 1.0]]))
    european = verdict("eu-2008-1h", statistics(), completeness=thin)
    assert european.met == ("undetermined",)
    assert "2023 has 80.0 % of its hours" in european.reason[0]
    hourly = verdict("us-naaqs-1h", statistics(), completeness=thin)
    assert "quarter 3 of 2023 has 50.0 % of its days" in hourly.reason[0]
    assert verdict("us-naaqs-annual", statistics(), completeness=thin).met == ("yes",)


def test_a_year_without_a_value_leaves_it_undetermined() -> None:
    made = verdict(
        "eu-2008-1h", statistics(2, 2, no2_1h_19th_ppb=[[np.nan, np.nan], [50.0, np.nan]])
    )
    assert made.met == ("undetermined", "undetermined")
    assert made.value[0] == 96.0
    assert np.isnan(made.value[1])
    assert all("too few hours" in reason for reason in made.reason)


def test_what_is_not_judged_keeps_its_value() -> None:
    """On the road, on a grid and, for a mean, at a roadside there is no verdict."""
    made = verdict(
        "eu-2008-annual",
        statistics(1, 4, no2_mean_ppb=[[30.0, 30.0, 30.0, 30.0]]),
        kinds=("", "grid", "roadside", "home"),
        on_road=np.array([True, False, False, False]),
    )
    assert made.met == ("", "", "", "no")
    assert made.reason == ("", "", "", "")
    assert made.value.tolist() == [57.0] * 4


@given(
    st.one_of(st.integers(0, 400_000), st.integers(0, 800).map(lambda halves: 500 * halves)),
    st.integers(0, 2),
    st.sampled_from([-1e-14, 0.0, 1e-14]),
)
def test_rounding_is_decimal_half_up(thousandths: int, decimals: int, noise: float) -> None:
    """Against the standard library's decimals, with binary noise in the last digits."""
    quantum = Decimal(1).scaleb(-decimals)
    exact = Decimal(thousandths).scaleb(-3).quantize(quantum, rounding=ROUND_HALF_UP)
    held = thousandths / 1000 * (1 + noise)
    assert float(rounded_half_up(held, decimals)) == pytest.approx(float(exact), abs=1e-9)
