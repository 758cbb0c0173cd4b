"""Run one study from its files to its files, and print what it took as JSON.

    python tests/benchmarks/whole_run.py STUDY [--out DIR]

A process of its own, so that its peak memory is that of the run alone.
"""

from __future__ import annotations

import argparse
import importlib
import json
import resource
import sys
import tempfile
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

PARTS = (
    ("roaddisp.engine.responses", "windowed_table", "line integrals"),
    ("roaddisp.engine.hours", "gather_hours", "hours from responses"),
    ("roaddisp.engine.hours", "gather_worst", "calm hours, worst direction"),
    ("roaddisp.engine.hours", "limited_no2", "NO2"),
    ("roaddisp.engine.fold", "block_statistics", "statistics"),
)
"""Functions of the engine that are timed inside a run, where it has them."""

MB = 2**20


class Clock:
    """Wall and processor seconds, and peak memory, of each step."""

    def __init__(self) -> None:
        self.wall: dict[str, float] = {}
        self.processor: dict[str, float] = {}
        self.peak_mb: dict[str, float] = {}

    @contextmanager
    def step(self, name: str) -> Iterator[None]:
        _forget_peak()
        wall, processor = time.perf_counter(), time.process_time()
        yield
        self.wall[name] = time.perf_counter() - wall
        self.processor[name] = time.process_time() - processor
        self.peak_mb[name] = _peak() / MB


def whole_run(study: Path, out: Path) -> dict[str, Any]:
    clock = Clock()
    with clock.step("imports"):
        from roaddisp.pipeline import run
        from roaddisp.study.read import read_study
    parts = {label: 0.0 for *_, label in PARTS}
    found = [_timed(module, name, label, parts) for module, name, label in PARTS]
    with clock.step("reading"):
        checked = read_study(study)
    with clock.step("run"):
        result = run(checked)
    with clock.step("writing"):
        result.write(out)
    record = result.record
    return {
        "wall_s": clock.wall,
        "processor_s": clock.processor,
        "peak_mb": clock.peak_mb,
        "stages_s": dict(record["timings_s"]),
        "inside_s": {label: parts[label] for label in found if label},
        "counts": {name: value for name, value in record["counts"].items() if _plain(value)},
        "calm_hours": record["counts"]["weather"]["calm"],
        "highest_no2_1h_max_ppb": float(result.statistics.no2_1h_max_ppb.max()),
    }


def _timed(module: str, name: str, label: str, parts: dict[str, float]) -> str | None:
    """Put a clock around a function; its label, or None where there is no such function."""
    try:
        room = importlib.import_module(module)
    except ModuleNotFoundError:
        return None
    function: Callable[..., Any] | None = getattr(room, name, None)
    if function is None:
        return None

    def clocked(*arguments: Any, **options: Any) -> Any:
        start = time.perf_counter()
        answer = function(*arguments, **options)
        parts[label] += time.perf_counter() - start
        return answer

    setattr(room, name, clocked)
    return label


def _plain(value: object) -> bool:
    return isinstance(value, int)


def _forget_peak() -> None:
    """Let the peak begin anew, where the system lets us (Linux)."""
    forget = Path("/proc/self/clear_refs")
    if forget.exists():
        forget.write_text("5")


def _peak() -> int:
    """Peak resident memory since `_forget_peak` [bytes]."""
    status = Path("/proc/self/status")
    if status.exists():
        for line in status.read_text().splitlines():
            if line.startswith("VmHWM:"):
                return int(line.split()[1]) * 1024
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    return peak if sys.platform == "darwin" else peak * 1024


def main() -> None:
    parser = argparse.ArgumentParser(description=(__doc__ or "").splitlines()[0])
    parser.add_argument("study", type=Path)
    parser.add_argument("--out", type=Path, help="default: a folder that is thrown away")
    asked = parser.parse_args()
    with tempfile.TemporaryDirectory(prefix="run-") as folder:
        told = whole_run(asked.study, asked.out or Path(folder) / "out")
    sys.stdout.write(json.dumps(told, indent=1) + "\n")


if __name__ == "__main__":
    main()
