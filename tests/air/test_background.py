"""Mass to mixing ratio. (The factors themselves: tests/outside.)"""

from __future__ import annotations

import numpy as np
import pytest

from roaddisp.air.background import ppb_from_ugm3


def test_worked_values() -> None:
    """EU annual limit 40 ug/m3 at 20 C: 40 / 1.9125 = 20.915 ppb; ozone 120: 60.141 ppb."""
    assert ppb_from_ugm3(40.0, "no2", "20 C") == pytest.approx(20.915, abs=5e-4)
    assert ppb_from_ugm3(120.0, "o3", "20 C") == pytest.approx(60.141, abs=5e-4)


def test_shapes_and_missing_values() -> None:
    assert isinstance(ppb_from_ugm3(40.0, "no2", "25 C"), float)
    made = ppb_from_ugm3([np.nan, 18.804], "nox", "25 C")
    assert np.isnan(made[0])
    assert made[1] == pytest.approx(10.0)


@pytest.mark.parametrize(
    ("gas", "reference", "message"),
    [("so2", "25 C", "allowed: no2, nox, no, o3"), ("no2", "0 C", "allowed: 25 C, 20 C")],
)
def test_other_gases_and_states_are_refused(gas: str, reference: str, message: str) -> None:
    with pytest.raises(ValueError, match=message):
        ppb_from_ugm3(1.0, gas, reference)  # type: ignore[arg-type]
