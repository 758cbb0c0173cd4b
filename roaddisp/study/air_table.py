"""Background air: our own table, or a constant."""

from __future__ import annotations

from typing import Any, Final, cast

import numpy as np

from roaddisp.air.background import Gas, ppb_from_ugm3
from roaddisp.model import Background, Clock, FloatArray
from roaddisp.quantities import FromMass, QuantityError, parse_quantity
from roaddisp.study.columns import TableView
from roaddisp.study.hours import (
    TimeRules,
    caution_missing,
    check_order,
    lines_up,
    places_on,
    read_times,
)
from roaddisp.study.problems import Problems
from roaddisp.study.tables import AIR
from roaddisp.study.times import minutes_of

GASES: Final = ("o3", "no2", "no", "nox")
_LEAST_OZONE: Final = 0.5
"""ppb; ozone that never reaches it makes sense only in another unit."""


def _from_mass(gas: str, reference: str) -> FromMass:
    def convert(values: FloatArray) -> FloatArray:
        return np.asarray(ppb_from_ugm3(values, cast("Gas", gas), reference), dtype=float)

    return convert


def read_air(
    view: TableView, rules: TimeRules, clock: Clock | None, offset: int | None, reference: str
) -> Background | None:
    """Lay a table of background air on the run's hours.

    None where a row was refused, or where there is no clock: then the table is
    checked for itself.
    """
    gases = {
        gas: view.numbers(gas, from_mass=_from_mass(gas, reference))
        for gas in GASES
        if view.has(gas)
    }
    for gas, values in gases.items():
        _check_unit(view, gas, values)
    instants = read_times(view, rules, offset=offset)
    if not instants.faults:
        check_order(view, instants.utc, strict=True)
    if clock is None:
        return None
    lines_up(view, instants.utc, int(minutes_of(clock)[0]))
    if not (view.complete and view.clean):
        return None
    hour = places_on(clock, instants.utc, view, "air")
    if hour is None:
        return None
    of_run = hour >= 0
    laid: dict[str, FloatArray] = {}
    for gas, values in gases.items():
        _clip(view, gas, values)
        on_axis = np.full(clock.standard.size, np.nan)
        on_axis[hour[of_run]] = np.maximum(values[of_run], 0.0)
        caution_missing(view, clock, np.isnan(on_axis), gas, gas)
        laid[gas] = on_axis
    return Background(laid["o3"], laid["no2"], _nitric_oxide(laid))


def _check_unit(view: TableView, gas: str, values: FloatArray) -> None:
    """Refuse values that only make sense in another unit."""
    most = float(np.nanmax(values)) if np.isfinite(values).any() else 0.0
    if gas == "o3" and 0.0 < most < _LEAST_OZONE:
        row = int(np.nanargmax(values))
        view.error(
            "ozone in the wrong unit: no value of the column reaches half a ppb",
            gas,
            row,
            value=f"highest {most:.3g} ppb",
            allowed="ozone of 1 to 500 ppb at its highest",
            mend='look whether the values are in ppm: then write "o3 [ppm]"',
        )


def _clip(view: TableView, gas: str, values: FloatArray) -> None:
    below = np.flatnonzero(values < 0)
    if below.size:
        row = int(below[0])
        view.caution(
            f"{gas} below zero, within the noise of an instrument, is taken as 0",
            gas,
            row,
            value=f"{values[row]:.3g} ppb",
            allowed="-5 ppb and more",
            count=below.size,
        )


def _nitric_oxide(gases: dict[str, FloatArray]) -> FloatArray | None:
    if "no" in gases:
        return gases["no"]
    if "nox" in gases:
        return np.maximum(gases["nox"] - gases["no2"], 0.0)
    return None


def constant_air(
    constant: Any, clock: Clock, reference: str, problems: Problems, *, file: str, place: Any
) -> Background | None:
    """Make a background that is the same in every hour; None where a value was refused.

    Parameters
    ----------
    constant : ConstantAir
    clock : Clock
    reference : str
    problems : Problems
    file : str
    place : callable
        Where the key of a gas stands.
    """
    values: dict[str, FloatArray] = {}
    before = problems.errors
    for gas in GASES:
        text = getattr(constant, gas)
        if text is None:
            continue
        column = AIR.column(gas)
        try:
            value = parse_quantity(text, "concentration", from_mass=_from_mass(gas, reference))
        except QuantityError as error:
            problems.error(
                str(error),
                file=file,
                place=place(gas),
                value=text,
                allowed=error.allowed,
                mend=error.mend,
            )
            continue
        high = column.high or np.inf
        wrong_unit = gas == "o3" and 0.0 < value < _LEAST_OZONE
        if not 0.0 <= value <= high or wrong_unit:
            problems.error(
                f"air.constant.{gas}: out of range" + (" (the wrong unit?)" if value > 0 else ""),
                file=file,
                place=place(gas),
                value=f"{text}, which is {value:.4g} ppb",
                allowed=f"0 to {high:g} ppb",
                mend="look whether the unit is ppb or ppm",
            )
        values[gas] = np.full(clock.standard.size, value)
    if problems.errors > before:
        return None
    return Background(values["o3"], values["no2"], _nitric_oxide(values))
