"""A miss is called a miss, and a trial is no verdict."""

from __future__ import annotations

from typing import Any

import pytest
from report import markdown

MACHINE = {
    "date": "2026-01-01 00:00 UTC",
    "processor": "one",
    "processors": 2,
    "threads": 2,
    "load_before": 0.0,
    "system": "none",
    "python": "3.11",
    "versions": {"numpy": "2"},
    "compiler": "gcc",
}


def told(seconds: float, *, numpy_loaded: bool = False, quick: bool = False) -> dict[str, Any]:
    return {
        "quick": quick,
        "machine": MACHINE,
        "help": {"least_s": seconds, "numpy_loaded": numpy_loaded},
    }


@pytest.mark.parametrize(("seconds", "loaded"), [(0.7, False), (0.3, True)])
def test_a_miss_is_called_a_miss(seconds: float, loaded: bool) -> None:
    assert "**missed**" in markdown(told(seconds, numpy_loaded=loaded))


def test_what_is_within_the_target_is_met() -> None:
    assert "| met |" in markdown(told(0.3))


def test_a_quick_trial_gives_no_verdict() -> None:
    text = markdown(told(0.7, quick=True))
    assert "missed" not in text
    assert "scaled down" in text
