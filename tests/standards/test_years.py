"""Days, years and completeness."""

from __future__ import annotations

import numpy as np
import pytest

from roaddisp.model import Clock
from roaddisp.standards.rules import standard
from roaddisp.standards.years import completeness, judged_hours, judged_years


def hours(start: str, stop: str) -> np.ndarray:
    return np.arange(np.datetime64(start, "h"), np.datetime64(stop, "h")).astype("datetime64[m]")


def clock(times: np.ndarray) -> Clock:
    return Clock(times, times, utc_offset=0.0, timezone="UTC")


@pytest.mark.parametrize(
    ("start", "stop", "years"),
    [
        ("2023-01-01T00", "2024-01-01T00", [2023]),
        ("2022-12-31T17", "2023-12-31T17", [2023]),  # a UTC year on a clock 7 h behind
        ("2023-01-01T09", "2024-01-01T09", [2023]),  # and on one 9 h ahead
        ("2022-12-31T01", "2024-01-01T23", [2023]),  # 23 h at either end
        ("2022-12-31T00", "2024-01-02T00", [2022, 2023, 2024]),  # 24 h are a year of their own
        ("2021-06-01T00", "2023-03-01T00", [2021, 2022, 2023]),
        ("2023-12-31T20", "2024-01-01T12", [2024]),
        ("2023-12-31T20", "2024-01-01T01", [2024]),
        ("2023-05-01T00", "2023-05-01T05", [2023]),
    ],
)
def test_fringes_join_their_neighbour(start: str, stop: str, years: list[int]) -> None:
    times = hours(start, stop)
    year, found = judged_years(times)
    assert found.tolist() == years
    assert set(year) == set(years)
    assert len(year) == len(times)


def test_no_hours_are_refused() -> None:
    with pytest.raises(ValueError, match="no hours to judge"):
        judged_years(np.array([], dtype="datetime64[m]"))


def test_days_are_calendar_days_and_a_fringe_keeps_its_own() -> None:
    cut = judged_hours(hours("2022-12-31T17", "2023-01-03T00"))
    assert cut.dates.astype(str).tolist() == ["2022-12-31", "2023-01-01", "2023-01-02"]
    assert cut.day_hour.tolist() == [0, 7, 31, 55]
    assert cut.year_day.tolist() == [0, 3]


def test_a_whole_leap_year_is_complete() -> None:
    times = hours("2024-01-01T00", "2025-01-01T00")
    found = completeness(np.ones(8784, dtype=bool), clock(times))
    assert found.hours.tolist() == [1.0]
    assert found.quarters.tolist() == [[1.0, 1.0, 1.0, 1.0]]
    for name in ("us-naaqs-1h", "us-naaqs-annual", "eu-2008-1h"):
        assert found.lack(standard(name)) == ""


def test_annual_shares_at_the_limit() -> None:
    """8760 x 0.9 = 7884 and x 0.75 = 6570 hours: with them complete, with one less not."""
    times = hours("2023-01-01T00", "2024-01-01T00")
    for name, least in (("eu-2008-annual", 7884), ("eu-2008-1h", 7884), ("us-naaqs-annual", 6570)):
        present = np.arange(8760) < least
        assert completeness(present, clock(times)).lack(standard(name)) == ""
        present[least - 1] = False
        lack = completeness(present, clock(times)).lack(standard(name))
        assert lack.startswith("incomplete data: 2023 has ")
        assert ("89.9 %" if least == 7884 else "74.9 %") in lack


def test_quarters_of_the_us_hourly_rule() -> None:
    """Quarter 2 has 91 days: 0.75 x 91 = 68.25, so 69 days make it and 68 do not.

    A day makes it with 18 hours, not with 17.
    """
    times = hours("2023-01-01T00", "2024-01-01T00")
    second = np.flatnonzero(
        (times >= np.datetime64("2023-04-01")) & (times < np.datetime64("2023-07-01"))
    )
    present = np.ones((365, 24), dtype=bool).ravel()
    days = second.reshape(91, 24)
    present[days[69:]] = False
    present[days[:69, 18:]] = False
    assert completeness(present, clock(times)).lack(standard("us-naaqs-1h")) == ""
    present[days[10, 17]] = False
    lack = completeness(present, clock(times)).lack(standard("us-naaqs-1h"))
    assert lack == (
        "incomplete data: quarter 2 of 2023 has 74.7 % of its days; "
        "the rule asks each quarter 75 % of its days with 18 hours or more"
    )


def test_a_run_of_two_days_says_every_quarter_it_lacks() -> None:
    times = hours("2023-03-25T00", "2023-03-27T00")
    found = completeness(np.ones(48, dtype=bool), clock(times))
    assert found.hours[0] == pytest.approx(48 / 8760)
    assert found.quarters[0].tolist() == [2 / 90, 0, 0, 0]
    assert found.lack(standard("us-naaqs-1h")).count("quarter ") == 5  # 4, and "each quarter"
    assert "2023 has 0.5 % of its hours" in found.lack(standard("eu-2008-annual"))


def test_a_fringe_adds_nothing_to_the_share() -> None:
    times = hours("2022-12-31T17", "2023-12-31T17")
    found = completeness(np.ones(8760, dtype=bool), clock(times))
    assert found.hours[0] == pytest.approx(8753 / 8760)
    assert found.quarters[0] == pytest.approx([1, 1, 1, 91 / 92])
