"""Settings shared by all tests."""

from __future__ import annotations

from pathlib import Path

import matplotlib as mpl
import pytest
from hypothesis import HealthCheck, settings

mpl.use("Agg")

settings.register_profile(
    "steady",
    derandomize=True,
    deadline=None,
    suppress_health_check=[HealthCheck.too_slow],
)
settings.load_profile("steady")

REPOSITORY = Path(__file__).parents[1]


@pytest.fixture(scope="session")
def worked_days() -> Path:
    """Two days worked by an independent calculation, where they are at hand."""
    folder = REPOSITORY.parent / "shared" / "worked"
    if not folder.is_dir():
        pytest.skip("the folder of worked days is not beside this checkout")
    return folder
