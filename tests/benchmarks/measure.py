"""Measure the table of speed and memory in one run, against committed yardsticks.

    python tests/benchmarks/measure.py [--quick] [--json FILE] [--only PART ...]

Prints Markdown. Whole runs, what-if and the numpy yardstick each have a process of
their own. ``--quick`` scales everything down (some two minutes); its figures show that
the measurement works, not how fast roaddisp is.
"""

from __future__ import annotations

import argparse
import json
import os
import platform
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from datetime import UTC, datetime
from importlib.metadata import version
from pathlib import Path
from typing import Any

import generated
import kernel_c
from report import markdown

Figures = dict[str, Any]
HERE = Path(__file__).parent


def machine() -> Figures:
    """What the figures hold for."""
    import numba

    return {
        "date": datetime.now(UTC).strftime("%Y-%m-%d %H:%M UTC"),
        "processor": _processor_name(),
        "processors": os.cpu_count(),
        "threads": numba.config.NUMBA_NUM_THREADS,
        "load_before": round(os.getloadavg()[0], 2),
        "system": f"{platform.system()} {platform.release()}",
        "python": platform.python_version(),
        "versions": {name: version(name) for name in ("numpy", "numba", "llvmlite", "pandas")},
        "compiler": kernel_c.compiler() if kernel_c.why_not() is None else kernel_c.why_not(),
    }


def _processor_name() -> str:
    told = Path("/proc/cpuinfo")
    if told.exists():
        for line in told.read_text().splitlines():
            if line.startswith("model name"):
                return line.split(":", 1)[1].strip()
    return platform.processor() or platform.machine()


def help_text(_: Path, quick: bool) -> Figures:
    """Seconds until the command has told what it can do, and whether numpy was loaded."""
    code = (
        "import sys; sys.argv = ['roaddisp', '--help']\n"
        "from roaddisp.app.command import main\n"
        "try:\n    main()\n"
        "except SystemExit:\n    print('numpy loaded:', 'numpy' in sys.modules)\n"
    )
    seconds = []
    told = ""
    for _turn in range(3 if quick else 7):
        start = time.perf_counter()
        answer = subprocess.run(
            [sys.executable, "-c", code], capture_output=True, text=True, check=True
        )
        seconds.append(time.perf_counter() - start)
        told = answer.stdout
    return {"least_s": min(seconds), "numpy_loaded": "numpy loaded: True" in told}


def kernels(_: Path, quick: bool) -> Figures:
    return _program("kernels.py", *(["--quick"] if quick else []))


def lines(folder: Path, quick: bool) -> Figures:
    size = {"receptors": 1000, "links": 100} if quick else {}
    return _program("whole_run.py", generated.write_lines(folder / "lines", **size))


def fine_winds(folder: Path, quick: bool) -> Figures:
    size = {"receptors": 1000, "links": 100} if quick else {}
    return _program("whole_run.py", generated.write_lines(folder / "fine", step=1, **size))


def hourly_lids(folder: Path, quick: bool) -> Figures:
    size = {"receptors": 500, "links": 50} if quick else {"receptors": 500, "links": 100}
    study = generated.write_lines(folder / "lids", lids=True, **size)
    without = generated.write_lines(folder / "no-lids", **size)
    return _program("whole_run.py", study) | {"without": _program("whole_run.py", without)}


def many_receptors(folder: Path, quick: bool) -> Figures:
    size = {"receptors": 5000, "links": 50} if quick else {"receptors": 100_000}
    return _program("whole_run.py", generated.write_lines(folder / "many", **size))


def network(folder: Path, quick: bool) -> Figures:
    size = {"links": 12, "counted": 8, "points": 50, "spacing": 100} if quick else {}
    return _program("whole_run.py", generated.write_network(folder / "network", **size))


def what_if(folder: Path, quick: bool) -> Figures:
    size = {"receptors": 1000, "links": 100} if quick else {}
    study = generated.write_lines(folder / "what-if", **size)
    return {"cases": _program("what_if_run.py", study)}


PARTS: dict[str, Callable[[Path, bool], Figures]] = {
    "help": help_text,
    "kernels": kernels,
    "lines": lines,
    "fine winds": fine_winds,
    "hourly lids": hourly_lids,
    "many receptors": many_receptors,
    "what-if": what_if,
    "network": network,
}


def _program(name: str, *arguments: object) -> Any:
    """Run a program beside this one and read what it prints."""
    told = subprocess.run(
        [sys.executable, str(HERE / name), *map(str, arguments)],
        stdout=subprocess.PIPE, text=True, check=False,
    )  # fmt: skip
    if told.returncode:
        raise SystemExit(f"{name} ended with {told.returncode}; nothing was measured")
    return json.loads(told.stdout)


def main() -> None:
    parser = argparse.ArgumentParser(description=(__doc__ or "").splitlines()[0])
    parser.add_argument("--quick", action="store_true", help="everything smaller: a trial")
    parser.add_argument("--json", type=Path, help="also write all figures to this file")
    parser.add_argument("--only", nargs="+", choices=PARTS, metavar="PART", default=list(PARTS))
    asked = parser.parse_args()
    told: Figures = {"quick": asked.quick, "machine": machine()}
    with tempfile.TemporaryDirectory(prefix="measure-") as temporary:
        folder = Path(temporary)
        # compile first, so that no run is timed with the compiler in it
        _program(
            "whole_run.py",
            generated.write_network(
                folder / "warm", links=2, counted=1, points=5, spacing=200, hours=48
            ),
        )
        for name in asked.only:
            sys.stderr.write(f"measuring: {name}\n")
            told[name] = PARTS[name](folder, asked.quick)
            told[name]["load"] = round(os.getloadavg()[0], 2)
            if asked.json:
                asked.json.write_text(json.dumps(told, indent=1) + "\n", encoding="utf-8")
    sys.stdout.write(markdown(told) + "\n")


if __name__ == "__main__":
    main()
