"""All files of a run into one folder, whole or not at all."""

from __future__ import annotations

import shutil
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Final

from roaddisp.errors import OutputError
from roaddisp.model import Result
from roaddisp.outputs.figures import write_map
from roaddisp.outputs.gis import source_date, write_geopackage
from roaddisp.outputs.netcdf import write_netcdf
from roaddisp.outputs.raster import MAPPED, write_geotiff
from roaddisp.outputs.record import is_ours, listed, write_record
from roaddisp.outputs.tables import write_csv, write_parquet

RECORD: Final = "record.json"

NAMES: Final = (
    "receptors.csv",
    "receptors.parquet",
    "study.gpkg",
    *(f"{statistic}.tif" for statistic in MAPPED),
    "hourly.nc",
    "map.png",
    RECORD,
)
"""Files a run may leave, in the order they are written."""


def write_result(result: Result, out: Path) -> tuple[Path, ...]:
    """Write every file of a run into the folder ``out``, or leave it as it was.

    Everything is written into a hidden folder first. A new ``out`` then appears by one
    rename; in an existing one, files of an earlier run are replaced or, where this run
    has none of that name, removed. A failure or an interrupt puts back what was there.

    Parameters
    ----------
    result : Result
    out : Path

    Returns
    -------
    tuple of Path
        The files written, ``record.json`` last.

    Raises
    ------
    OutputError
        Where the folder cannot be written, or holds files of the same names that no
        run of roaddisp left.
    """
    source_date()
    stale = _stale(out)
    try:
        if out.is_dir():
            with _hidden(out) as work:
                names = _write_all(result, work)
                _exchange(work, out, names, stale)
        else:
            out.parent.mkdir(parents=True, exist_ok=True)
            with _hidden(out.parent) as work:
                fresh = work / "out"
                fresh.mkdir()
                names = _write_all(result, fresh)
                fresh.rename(out)
    except OutputError:
        raise
    except OSError as error:
        raise OutputError(
            f"{out}: the results cannot be written ({error}). "
            "Mend: name a folder that can be written, with room on its disk."
        ) from error
    return tuple(out / name for name in names)


def _stale(out: Path) -> tuple[str, ...]:
    """Files of an earlier run in ``out``; refuses a folder whose files are not ours."""
    if out.exists() and not out.is_dir():
        raise OutputError(f"{out}: is a file, not a folder. Mend: name another folder.")
    present = tuple(name for name in NAMES if (out / name).exists())
    record = out / RECORD
    if present and not is_ours(record):
        raise OutputError(
            f"{out}: holds {', '.join(present)}, but no {RECORD} of roaddisp beside it, so they "
            "may be someone's work. Nothing was written. Mend: name another folder, or move "
            "them away."
        )
    more = [name for name in listed(record) if name not in NAMES and (out / name).is_file()]
    return (*present, *more)


@contextmanager
def _hidden(parent: Path) -> Iterator[Path]:
    work = Path(tempfile.mkdtemp(prefix=".roaddisp-", dir=parent))
    try:
        yield work
    finally:
        shutil.rmtree(work, ignore_errors=True)


def _write_all(result: Result, folder: Path) -> tuple[str, ...]:
    write_csv(result, folder / "receptors.csv")
    write_parquet(result, folder / "receptors.parquet")
    write_geopackage(result, folder / "study.gpkg")
    if result.scenario.receptors.grid is not None:
        for statistic in MAPPED:
            write_geotiff(result, statistic, folder / f"{statistic}.tif")
    if result.kept:
        write_netcdf(result, folder / "hourly.nc")
    write_map(result, folder / "map.png")
    written = [name for name in NAMES if (folder / name).exists()]
    write_record(result, [folder / name for name in written], folder / RECORD)
    return (*written, RECORD)


def _exchange(work: Path, out: Path, names: tuple[str, ...], stale: tuple[str, ...]) -> None:
    """Move new files in and old ones out; whatever stops it half-way is undone."""
    old = work / "old"
    old.mkdir()
    try:
        for name in stale:
            (out / name).replace(old / name)
        for name in names:
            (work / name).replace(out / name)
    except BaseException:
        for name in names:
            if not (work / name).exists():
                (out / name).unlink(missing_ok=True)
        for name in stale:
            if (old / name).exists():
                (old / name).replace(out / name)
        raise
