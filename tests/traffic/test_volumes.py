"""Hourly traffic from AADT and profile."""

from __future__ import annotations

from datetime import datetime

import numpy as np
import pytest

from roaddisp.model import Profiles
from roaddisp.traffic.volumes import day_type, profile_shape


def hours(start: str, count: int) -> np.ndarray:
    return np.datetime64(start, "m") + np.arange(count) * np.timedelta64(60, "m")


@pytest.fixture
def two_profiles() -> Profiles:
    """Shares and factors that differ in every month, day type and hour."""
    rng = np.random.default_rng(11)
    share = rng.uniform(0.5, 2.0, (2, 12, 3, 24))
    return Profiles(
        names=("town", "bypass"),
        share=share / share.sum(axis=-1, keepdims=True),
        day_factor=rng.uniform(0.7, 1.2, (2, 12, 3)),
    )


def test_day_types_follow_the_calendar() -> None:
    """Against the standard library's weekday, over nine years with two leap days and 1969."""
    days = hours("1968-12-25T13:00", 24 * 365 * 9)[::24]
    expected = [max(day.astype(datetime).weekday() - 4, 0) for day in days]
    assert day_type(days).tolist() == expected


def test_shape_is_day_factor_times_share_of_the_civil_hour(two_profiles: Profiles) -> None:
    # Saturday 5 October 2024, 17:00; Monday 1 January 2024, 00:00
    civil = np.array(["2024-10-05T17:00", "2024-01-01T00:00"], dtype="datetime64[m]")
    shape = profile_shape(two_profiles, civil)
    for p in range(2):
        assert shape[p, 0] == pytest.approx(
            two_profiles.day_factor[p, 9, 1] * two_profiles.share[p, 9, 1, 17]
        )
        assert shape[p, 1] == pytest.approx(
            two_profiles.day_factor[p, 0, 0] * two_profiles.share[p, 0, 0, 0]
        )


def test_a_day_carries_its_factor(two_profiles: Profiles) -> None:
    """Conservation: the 24 hours of Sunday 21 July 2024 add up to day_factor x AADT."""
    shape = profile_shape(two_profiles, hours("2024-07-21T00:00", 24))
    assert shape.sum(axis=1) == pytest.approx(two_profiles.day_factor[:, 6, 2], rel=1e-12)


def test_days_of_23_and_25_hours_are_not_renormalised(two_profiles: Profiles) -> None:
    """Clocks change on Sunday 31 March (02:00 left out) and 27 October 2024 (02:00 twice)."""
    day = hours("2024-03-31T00:00", 24)
    spring = np.delete(day, 2)
    lost = two_profiles.day_factor[:, 2, 2] * (1 - two_profiles.share[:, 2, 2, 2])
    assert profile_shape(two_profiles, spring).sum(axis=1) == pytest.approx(lost)

    day = hours("2024-10-27T00:00", 24)
    autumn = np.insert(day, 2, day[2])
    gained = two_profiles.day_factor[:, 9, 2] * (1 + two_profiles.share[:, 9, 2, 2])
    assert profile_shape(two_profiles, autumn).sum(axis=1) == pytest.approx(gained)
