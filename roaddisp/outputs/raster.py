"""A mapped statistic as a cloud-optimised GeoTIFF."""

from __future__ import annotations

import os
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Final

import numpy as np

from roaddisp.model import Float32Array, FloatArray, Receptors, Result
from roaddisp.outputs.cautions import cautions
from roaddisp.outputs.tables import columns

MAPPED: Final = ("no2_mean_ugm3",)
"""Statistics mapped where a study asks for a grid: columns of ``receptors.csv``."""


@contextmanager
def own_proj_data() -> Iterator[None]:
    """Hide the PROJ data folder of another GIS install while rasterio works.

    `PROJ_DATA` and `PROJ_LIB` of an older install point rasterio's own PROJ at a
    database it cannot read, and every CRS then fails. They come back afterwards.
    """
    hidden = {
        name: os.environ.pop(name) for name in ("PROJ_DATA", "PROJ_LIB") if name in os.environ
    }
    try:
        yield
    finally:
        os.environ.update(hidden)


def on_grid(receptors: Receptors, values: FloatArray) -> Float32Array:
    """Lay values of receptors out on the grid, north up.

    Parameters
    ----------
    receptors : Receptors
        With a grid.
    values : (R,)

    Returns
    -------
    (rows, columns) float32
        NaN where no receptor stands.

    Raises
    ------
    ValueError
        Where the receptors have no grid.
    """
    if receptors.grid is None:
        raise ValueError("the receptors have no grid: ask for one with [receptors] grid")
    cells = np.full((receptors.grid.rows, receptors.grid.columns), np.nan, dtype=np.float32)
    member = receptors.cell[:, 0] >= 0
    row, column = receptors.cell[member].T
    cells[row, column] = values[member]
    return cells


def write_geotiff(result: Result, statistic: str, path: Path) -> None:
    """Write one statistic of the grid: float32, NaN where there is no value.

    Parameters
    ----------
    result : Result
        Of a study with a grid.
    statistic : str
        A column of ``receptors.csv``.
    path : Path

    Raises
    ------
    ValueError
        Where the study has no grid.
    """
    cells = on_grid(result.scenario.receptors, result.summary[statistic].to_numpy(dtype=float))
    grid = result.scenario.receptors.grid
    assert grid is not None  # noqa: S101 - on_grid has refused it
    described = columns(result)[statistic]
    with own_proj_data():
        import rasterio
        from rasterio import Affine

        half = grid.spacing / 2
        with rasterio.open(
            path,
            "w",
            driver="COG",
            dtype="float32",
            count=1,
            height=grid.rows,
            width=grid.columns,
            crs=result.study.crs,
            transform=Affine(
                grid.spacing, 0.0, grid.west - half, 0.0, -grid.spacing, grid.north + half
            ),
            nodata=np.nan,
            # blocks of 128 so that a grid of a few hundred cells has overviews too
            blocksize=128,
            compress="deflate",
            predictor="yes",
            overview_resampling="average",
        ) as raster:
            raster.write(cells, 1)
            raster.set_band_description(1, statistic)
            raster.set_band_unit(1, described.unit)
            raster.update_tags(
                TITLE=result.study.title,
                SCENARIO=result.scenario.name,
                STATISTIC=statistic,
                DESCRIPTION=described.meaning,
                UNITS=described.unit,
                CAUTIONS=" ".join(cautions(result)),
            )
