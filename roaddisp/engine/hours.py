"""From responses to hours: road NOx, primary NO2 and, with the background, NO2."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np

from roaddisp.chemistry.ozone_limiting import ozone_limited
from roaddisp.chemistry.ozone_loop import limited_no2
from roaddisp.constants import CALM_PLUME_WIND
from roaddisp.dispersion.compiling import ONE_AT_A_TIME
from roaddisp.engine.gather import gather_hours, gather_worst
from roaddisp.model import (
    Background,
    Float32Array,
    FloatArray,
    HourlyBlock,
    IntArray,
    LinkStrengths,
    Responses,
    WeatherHours,
)

RECEPTORS_AT_ONCE = 64
"""Receptors whose hours are held at once: about 15 MB for a year, near the processor."""

UGM3_PER_GM3 = 1e6


@dataclass(frozen=True)
class Conversion:
    """How road NOx becomes NO2, and the ug/m3 of NO2 in one ppb that it goes by."""

    method: Literal["ozone-limited"]
    ugm3_per_ppb: float

    @property
    def units(self) -> FloatArray:
        """(K,): from g/m3 to ug/m3 of NOx and ppb of primary NO2."""
        return np.array([UGM3_PER_GM3, UGM3_PER_GM3 / self.ugm3_per_ppb])


def hours(
    responses: Iterable[Responses],
    strengths: LinkStrengths,
    weather: WeatherHours,
    background: Background,
    conversion: Conversion,
) -> Iterator[HourlyBlock]:
    """All hours at every receptor, a block of receptors at a time.

    Parameters
    ----------
    responses : iterable of Responses
        Response tables at 1 m/s.
    strengths : LinkStrengths
        Its shapes scale the tables hour by hour.
    weather : WeatherHours
        (G, T) wind at the plume.
    background : Background
        (T,) [ppb].
    conversion : Conversion
        How road NOx becomes NO2.

    Yields
    ------
    HourlyBlock
        Calm hours are NaN in the block itself and, unless left out, stand in
        its ``worst`` in the direction that gives each receptor most NO2, with
        ``CALM_PLUME_WIND`` at the plume.
    """
    weight = _by_hour(strengths.shape / weather.wind_speed)
    every = np.arange(weather.calm.size)
    for response in _parts(responses):
        states = response.states
        by_receptor = np.ascontiguousarray(response.table.transpose(3, 0, 1, 2))
        table = by_receptor.reshape(*by_receptor.shape[:2], -1)
        with ONE_AT_A_TIME:
            road = gather_hours(
                table, weight, states.of_hour, response.lid_of_hour(), conversion.units
            )
        worst = None
        if states.calm_hours.size:
            worst = _worst_direction(response, table, strengths, background, conversion)
        yield _block(response.receptors, every, road, background, conversion, worst)


def _by_hour(weight: FloatArray) -> FloatArray:
    """Bring weights (K, G, T) into rows of an hour (T, K G), as the loops read them."""
    hours = weight.shape[-1]
    return np.ascontiguousarray(weight.reshape(-1, hours).T)


def _parts(responses: Iterable[Responses]) -> Iterator[Responses]:
    """Cut tables into parts whose hours are few enough to hold."""
    for response in responses:
        first, stop = response.receptors.start, response.receptors.stop
        for start in range(first, stop, RECEPTORS_AT_ONCE):
            end = min(start + RECEPTORS_AT_ONCE, stop)
            yield replace(
                response,
                receptors=slice(start, end),
                table=response.table[..., start - first : end - first],
            )


def _worst_direction(
    response: Responses,
    table: Float32Array,
    strengths: LinkStrengths,
    background: Background,
    conversion: Conversion,
) -> HourlyBlock:
    calm = response.states.calm_hours
    weight = _by_hour(strengths.shape[:, :, calm] / CALM_PLUME_WIND)
    with ONE_AT_A_TIME:
        road = gather_worst(
            table,
            weight,
            response.states.calm_first,
            response.lid_of_calm(),
            response.states.directions,
            background.o3[calm],
            conversion.units,
        )
    return _block(response.receptors, calm, road, background, conversion, None)


def _block(
    receptors: slice,
    hours: IntArray,
    road: FloatArray,
    background: Background,
    conversion: Conversion,
    worst: HourlyBlock | None,
) -> HourlyBlock:
    """Make a block of road NOx [ug/m3] and primary NO2 [ppb] (K, R, T) of the named hours."""
    nox, primary = road
    with ONE_AT_A_TIME:
        no2 = limited_no2(
            nox,
            primary,
            background.o3[hours],
            background.no2[hours],
            conversion.ugm3_per_ppb,
        )
    return HourlyBlock(
        receptors=receptors,
        hours=hours,
        nox_road_ugm3=nox,
        no2_primary_road_ppb=primary,
        no2_ppb=no2,
        worst=worst,
    )


def completed(block: HourlyBlock, background: Background, conversion: Conversion) -> HourlyBlock:
    """Add the NO and the ozone left to a block, which statistics do without.

    Parameters
    ----------
    block : HourlyBlock
    background : Background
        Of all hours of the run.
    conversion : Conversion

    Returns
    -------
    HourlyBlock
    """
    hours = block.hours
    _, no, o3 = ozone_limited(
        block.nox_road_ugm3 / conversion.ugm3_per_ppb,
        block.no2_primary_road_ppb,
        o3=background.o3[hours],
        no2_background=background.no2[hours],
        no_background=None if background.no is None else background.no[hours],
    )
    return replace(block, no_ppb=no, o3_ppb=o3)
