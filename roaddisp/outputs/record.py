"""The record of a run: what went in, what was chosen, what came out."""

from __future__ import annotations

import hashlib
import json
import math
from collections import Counter
from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import Any, Final

import numpy as np

from roaddisp.model import Result, Verdicts
from roaddisp.outputs.cautions import cautions

WRITER: Final = "roaddisp"
"""Value of ``written_by``, by which a folder of ours is known again."""


def write_record(result: Result, files: Iterable[Path], path: Path) -> None:
    """Write ``record.json``: UTF-8, only finite numbers, keys in the order of reading.

    First who wrote it and for which study, then the run's own record as the pipeline
    gave it, then ``verdicts``, ``cautions`` and ``outputs``, the files left behind with
    their sha256 (but for this one). A number that is not finite becomes null.

    Parameters
    ----------
    result : Result
    files : iterable of Path
        The other files of the run.
    path : Path
    """
    from roaddisp import __version__

    record: dict[str, Any] = {
        "written_by": WRITER,
        "version": __version__,
        "title": result.study.title,
        "scenario": result.scenario.name,
        **result.record,
    }
    record.setdefault("verdicts", [_verdict(result, verdict) for verdict in result.verdicts])
    record["cautions"] = list(cautions(result))
    record["outputs"] = [fingerprint(file) for file in files]
    text = json.dumps(plain(record), ensure_ascii=False, allow_nan=False, indent=2)
    path.write_text(text + "\n", encoding="utf-8", newline="\n")


def fingerprint(path: Path) -> dict[str, Any]:
    """Name, size [bytes] and sha256 of a file."""
    with path.open("rb") as file:
        digest = hashlib.file_digest(file, "sha256")
    return {"name": path.name, "sha256": digest.hexdigest(), "size": path.stat().st_size}


def _verdict(result: Result, verdict: Verdicts) -> dict[str, Any]:
    judged = np.array([bool(met) for met in verdict.met])
    values = np.where(judged, verdict.value, np.nan)
    known = np.isfinite(values).any()
    worst = int(np.nanargmax(values)) if known else None
    counts = Counter(met for met in verdict.met if met)
    return {
        "standard": verdict.standard,
        "limit": verdict.limit,
        "unit": verdict.unit,
        "receptors": {word: counts[word] for word in ("yes", "no", "undetermined")},
        "worst_value": None if worst is None else float(values[worst]),
        "worst_receptor": None if worst is None else result.scenario.receptors.receptor[worst],
        "undetermined_because": dict(Counter(reason for reason in verdict.reason if reason)),
        "provisional": verdict.provisional,
    }


def plain(value: Any) -> Any:
    """Turn a value into what JSON can hold: numpy and paths undone, NaN and inf to null.

    Raises
    ------
    TypeError
        Where a value has no plain form.

    Examples
    --------
    >>> plain({"hours": np.int64(3), "mean": float("nan"), "file": Path("a/b")})
    {'hours': 3, 'mean': None, 'file': 'a/b'}
    """
    if value is None or isinstance(value, str | bool | int):
        return value
    if isinstance(value, float):
        return float(value) if math.isfinite(value) else None
    if isinstance(value, Path):
        return value.as_posix()
    if isinstance(value, np.datetime64):
        return str(value)
    if isinstance(value, np.generic | np.ndarray):
        return plain(value.tolist())
    if isinstance(value, Mapping):
        return {str(key): plain(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [plain(item) for item in value]
    raise TypeError(f"record: no plain form for {value!r} of type {type(value).__name__}")


def is_ours(path: Path) -> bool:
    """Whether a file is the record of a run of roaddisp."""
    return bool(_read(path))


def listed(path: Path) -> tuple[str, ...]:
    """Plain names of the files that a record says its run left."""
    names = [entry.get("name") for entry in _read(path).get("outputs", []) if entry]
    return tuple(name for name in names if isinstance(name, str) and Path(name).name == name)


def _read(path: Path) -> dict[str, Any]:
    try:
        record = json.loads(path.read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return {}
    return record if isinstance(record, dict) and record.get("written_by") == WRITER else {}
