"""What is left at the end of a run."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, Any

from roaddisp.model.hours import HourlyBlock, LinkStrengths
from roaddisp.model.inputs import Scenario, Study
from roaddisp.model.types import FloatArray, IntArray

if TYPE_CHECKING:
    import pandas as pd
    import xarray as xr


@dataclass(frozen=True)
class Statistics:
    """Statistics of every receptor; by year first, then over the years.

    Attributes
    ----------
    years : (Y,) int
    nox_road_mean_ugm3, no2_mean_ppb, no2_road_mean_ppb, nox_mean_ppb : (Y, R)
        Means over the hours that have a value; ``nox_mean_ppb`` is total NOx,
        NaN where the background gives no NO.
    no2_1h_max_ppb, no2_1h_p98_ppb, no2_1h_19th_ppb : (Y, R)
        Highest hour; 98th percentile of daily maxima by the rank table; 19th
        highest hour, NaN where there are fewer.
    no2_1h_p98_truncated_ppb : (Y, R)
        The same percentile of hours truncated to 0.1 ppb.
    raised_in_p98, raised_in_19th : (Y, R)
        How many of the hours down to that percentile and that rank had their wind
        raised by a floor.
    """

    years: IntArray
    nox_road_mean_ugm3: FloatArray
    no2_mean_ppb: FloatArray
    no2_road_mean_ppb: FloatArray
    nox_mean_ppb: FloatArray
    no2_1h_max_ppb: FloatArray
    no2_1h_p98_ppb: FloatArray
    no2_1h_p98_truncated_ppb: FloatArray
    no2_1h_19th_ppb: FloatArray
    raised_in_p98: FloatArray
    raised_in_19th: FloatArray


@dataclass(frozen=True)
class Verdicts:
    """One standard, judged at every receptor.

    Attributes
    ----------
    standard : str
    value : (R,) in the standard's own unit and rounding; regulatory
    limit : float
    decimals : int
        With which value and limit are written.
    unit : str
    met : tuple of str (R,)
        ``yes``, ``no``, ``undetermined``, or empty where the standard does not judge.
    reason : tuple of str (R,)
        Why undetermined; empty otherwise.
    provisional : str
        Why a result counts as provisional (too few years); empty otherwise.
    """

    standard: str
    value: FloatArray
    limit: float
    decimals: int
    unit: str
    met: tuple[str, ...]
    reason: tuple[str, ...]
    provisional: str


@dataclass(frozen=True)
class Result:
    """One scenario's outcome: statistics, verdicts and the hours asked for.

    Attributes
    ----------
    study : Study
    scenario : Scenario
    strengths : LinkStrengths
    statistics : Statistics
        Regulatory: calm hours left out.
    worst : Statistics or None
        Calm hours run in the worst direction.
    verdicts : tuple of Verdicts
    kept : tuple of int
        Receptors whose hours were asked for.
    hours : HourlyBlock
        Their hours (its ``receptors`` counts among ``kept``).
    record : mapping
        Counts, warnings, versions and timings of the run.
    """

    study: Study
    scenario: Scenario
    strengths: LinkStrengths
    statistics: Statistics
    worst: Statistics | None
    verdicts: tuple[Verdicts, ...]
    kept: tuple[int, ...]
    hours: HourlyBlock
    record: Mapping[str, Any] = field(repr=False)

    @cached_property
    def summary(self) -> pd.DataFrame:
        """One row a receptor: the columns of ``receptors.csv``.

        ``summary.attrs["columns"]`` maps each column to its meaning and unit.
        """
        from roaddisp.outputs.tables import receptor_table

        return receptor_table(self)

    @cached_property
    def hourly(self) -> xr.Dataset:
        """Hours of the receptors asked for, dimensions ``(receptor, time)``.

        Variables ``nox_road_ugm3, nox_road_ppb, no2_primary_road_ppb, no2_ppb,
        no_ppb, o3_ppb``; time is local standard, hour-beginning.
        """
        from roaddisp.outputs.tables import hourly_dataset

        return hourly_dataset(self)

    def write(self, out: str | Path) -> tuple[Path, ...]:
        """Write every file of the run into the folder ``out``, all or none.

        Parameters
        ----------
        out : str or Path
            Made where it is missing. Files of an earlier run there are replaced.

        Returns
        -------
        tuple of Path
            The files written.

        Raises
        ------
        OutputError
            Where the folder cannot be written, or holds files of the same names
            that no run of roaddisp left.
        """
        from roaddisp.outputs.folder import write_result

        return write_result(self, Path(out))
