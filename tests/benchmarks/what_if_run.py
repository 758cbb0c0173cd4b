"""Time what-if on kept responses of one study, and print it as JSON.

    python tests/benchmarks/what_if_run.py STUDY [--receptors 10000]

The study is one of `generated.write_lines`. The change: every profile's traffic by a
factor of its own (links in groups), every link's by its own (links apart).
"""

from __future__ import annotations

import argparse
import json
import sys
import time
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np

import roaddisp as rd
from roaddisp.model import FloatArray, Scenario, Study

TIMES = 7
FEW = 200


def what_if(study: Study, *, receptors: int, apart: bool, times: int) -> dict[str, Any]:
    """Keep responses of the first receptors; then change the traffic, several times."""
    base = study.scenarios["base"]
    names = base.receptors.receptor[:receptors]
    profile = base.network.profile
    groups = {
        link: f"group-{number}" for link, number in zip(base.network.link, profile, strict=True)
    }
    start = time.perf_counter()
    kept = rd.keep_responses(study, receptors=names, groups=None if apart else groups)
    keeping = time.perf_counter() - start
    rng = np.random.default_rng(5)
    wall, processor, engine = [], [], []
    for _ in range(times + 1):
        own = rng.uniform(0.5, 2.0, len(profile) if apart else int(profile.max()) + 1)
        changed = _with_traffic(study, base, base.network.aadt * (own if apart else own[profile]))
        start, busy = time.perf_counter(), time.process_time()
        result = rd.run(changed, responses=kept)
        wall.append(time.perf_counter() - start)
        processor.append(time.process_time() - busy)
        engine.append(result.record["timings_s"]["hours and statistics"])
    # the first pays for loading compiled code
    return {
        "receptors": len(names),
        "apart": apart,
        "keeping_s": keeping,
        "kept_mb": kept.size / 2**20,
        "first_s": wall[0],
        "wall_s": float(np.median(wall[1:])),
        "least_wall_s": min(wall[1:]),
        "processor_s": float(np.median(processor[1:])),
        "engine_s": float(np.median(engine[1:])),
    }


def _with_traffic(study: Study, base: Scenario, aadt: FloatArray) -> Study:
    return replace(
        study, scenarios={"base": replace(base, network=replace(base.network, aadt=aadt))}
    )


def main() -> None:
    parser = argparse.ArgumentParser(description=(__doc__ or "").splitlines()[0])
    parser.add_argument("study", type=Path)
    parser.add_argument("--receptors", type=int, default=10_000, help="of the largest case")
    asked = parser.parse_args()
    study = rd.read_study(asked.study)
    told = [
        what_if(study, receptors=FEW, apart=False, times=TIMES),
        what_if(study, receptors=FEW, apart=True, times=TIMES),
        what_if(study, receptors=asked.receptors, apart=False, times=2),
    ]
    sys.stdout.write(json.dumps(told, indent=1) + "\n")


if __name__ == "__main__":
    main()
