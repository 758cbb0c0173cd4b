"""Blocks of hours folded into statistics; the hours asked for are kept."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from roaddisp.engine.hours import Conversion, completed
from roaddisp.model import (
    Background,
    CalmRule,
    Clock,
    HourlyBlock,
    Statistics,
    WeatherHours,
)
from roaddisp.standards.statistics import block_statistics, join_statistics

CARRIED = ("nox_road_ugm3", "no2_primary_road_ppb", "no2_ppb")
"""What an `HourlyBlock` holds of each receptor and hour."""


@dataclass(frozen=True)
class Folded:
    """Statistics of all receptors, and hours of those kept.

    ``worst`` has the calm hours run in the worst direction; None where the study
    does not ask for both results.
    """

    statistics: Statistics
    worst: Statistics | None
    hours: HourlyBlock


def fold(
    blocks: Iterable[HourlyBlock],
    *,
    clock: Clock,
    background: Background,
    weather: WeatherHours,
    conversion: Conversion,
    calms: CalmRule,
    kept: Sequence[int],
) -> Folded:
    """Fold blocks into statistics, one at a time, so that memory does not grow with them.

    Parameters
    ----------
    blocks : iterable of HourlyBlock
        In the order of the receptors.
    clock, background, weather
        Of the blocks' hours.
    conversion : Conversion
    calms : "both", "leave-out" or "worst-direction"
        Which calm hours the statistics take.
    kept : sequence of int, ascending
        Receptors whose hours are kept.

    Returns
    -------
    Folded
    """

    def reduced(block: HourlyBlock) -> Statistics:
        return block_statistics(
            block.nox_road_ugm3,
            block.no2_ppb,
            clock=clock,
            background=background,
            calm=weather.calm,
            raised=weather.raised,
            ugm3_per_ppb=conversion.ugm3_per_ppb,
        )

    statistics: list[Statistics] = []
    worst: list[Statistics] = []
    hours: list[HourlyBlock] = []
    for block in blocks:
        filled = with_calms(block)
        plain = filled if calms == "worst-direction" else block
        statistics.append(reduced(plain))
        if calms == "both":
            worst.append(statistics[-1] if filled is block else reduced(filled))
        hours.append(_rows(plain, kept))
    return Folded(
        statistics=join_statistics(statistics),
        worst=join_statistics(worst) if worst else None,
        hours=completed(_joined(hours), background, conversion),
    )


def with_calms(block: HourlyBlock) -> HourlyBlock:
    """Put the calm hours of the worst direction in their places, where they were run."""
    worst = block.worst
    if worst is None:
        return block
    whole = {}
    for name in CARRIED:
        values = getattr(block, name).copy()
        values[:, worst.hours] = getattr(worst, name)
        whole[name] = values
    return replace(block, worst=None, **whole)


def _rows(block: HourlyBlock, kept: Sequence[int]) -> HourlyBlock:
    """Keep the rows of a block whose hours were asked for."""
    first, stop = block.receptors.start, block.receptors.stop
    rows = [index - first for index in kept if first <= index < stop]
    return replace(block, worst=None, **{name: getattr(block, name)[rows] for name in CARRIED})


def _joined(blocks: Sequence[HourlyBlock]) -> HourlyBlock:
    arrays: dict[str, Any] = {
        name: np.concatenate([getattr(block, name) for block in blocks]) for name in CARRIED
    }
    count = len(arrays["no2_ppb"])
    return HourlyBlock(receptors=slice(0, count), hours=blocks[0].hours, **arrays)
