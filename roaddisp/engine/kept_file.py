"""Kept responses in a file, and back.

The file is HDF5. Its root bears the attributes ``format`` ("roaddisp responses"),
``version`` (1) and ``fingerprint.<part>``, and the datasets ``receptors`` (R,),
``group`` (L,), ``basis`` (K, L), ``release_height`` and ``sigma_z0`` (L,). The group
``states`` has the arrays of `WeatherStates` and ``states/lids`` those of `LidStates`;
``blocks/<n>`` has ``lid_row``, ``first``, ``group`` and ``values`` of each `KeptBlock`, with
``start``, ``stop`` and ``calms`` as attributes.
"""

from __future__ import annotations

import tempfile
from pathlib import Path
from typing import Any, Final

import numpy as np

from roaddisp.engine.kept import KeptBlock, KeptResponses
from roaddisp.errors import OutputError, Problem, StudyError
from roaddisp.model import LidStates, WeatherStates

FORMAT: Final = "roaddisp responses"
VERSION: Final = 1

_STATES: Final = (
    "wind_from",
    "stability",
    "of_hour",
    "calm_hours",
    "calm_first",
)
_LIDS: Final = ("wind_from", "stability", "mixing_height", "of_hour", "calm_first")


def write_responses(kept: KeptResponses, path: Path) -> None:
    """Write kept responses into a file, whole or not at all.

    Raises
    ------
    OutputError
        Where the file cannot be written.
    """
    import h5py

    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryDirectory(dir=path.parent, prefix=".roaddisp-") as work:
            made = Path(work) / path.name
            with h5py.File(made, "w") as file:
                _fill(kept, file)
            made.replace(path)
    except OSError as error:
        raise OutputError(
            f"{path}: the responses cannot be kept there ({error}). "
            "Mend: name a file in a folder that can be written, with room on its disk."
        ) from error


def _fill(kept: KeptResponses, file: Any) -> None:
    file.attrs["format"], file.attrs["version"] = FORMAT, VERSION
    for part, value in kept.fingerprint.items():
        file.attrs[f"fingerprint.{part}"] = value
    file["receptors"] = np.array(kept.receptors, dtype=np.int64)
    for name in ("group", "basis", "release_height", "sigma_z0"):
        file[name] = getattr(kept, name)
    states = file.create_group("states")
    states.attrs["directions"] = kept.states.directions
    for name in _STATES:
        states[name] = getattr(kept.states, name)
    for name in _LIDS:
        states[f"lids/{name}"] = getattr(kept.states.lids, name)
    for number, block in enumerate(kept.blocks):
        place = file.create_group(f"blocks/{number}")
        place.attrs["start"], place.attrs["stop"] = block.receptors.start, block.receptors.stop
        place.attrs["calms"] = block.calms
        for name in ("lid_row", "first", "group"):
            place[name] = getattr(block, name)
        # the fastest filter: the many zeros of a row are worth it, the digits are not
        place.create_dataset(
            "values", data=block.values, compression="lzf" if block.values.size else None
        )


def read_responses(path: Path) -> KeptResponses:
    """Read kept responses from a file.

    Raises
    ------
    StudyError
        Where the file is missing, is none of ours, or is of another version.
    """
    import h5py

    try:
        with h5py.File(path, "r") as file:
            if file.attrs.get("format") != FORMAT or file.attrs.get("version") != VERSION:
                raise _refusal(
                    path,
                    "holds no responses that this version can read",
                    f"{file.attrs.get('format', 'no format')}, "
                    f"version {file.attrs.get('version', 'none')}",
                )
            return _taken(file)
    except (OSError, KeyError, ValueError) as error:
        if isinstance(error, StudyError):
            raise
        raise _refusal(path, "cannot be read as kept responses", str(error)) from error


def _taken(file: Any) -> KeptResponses:
    states = file["states"]
    blocks = [file[f"blocks/{number}"] for number in range(len(file["blocks"]))]
    return KeptResponses(
        receptors=tuple(file["receptors"][:].tolist()),
        group=file["group"][:],
        basis=file["basis"][:],
        release_height=file["release_height"][:],
        sigma_z0=file["sigma_z0"][:],
        states=WeatherStates(
            **{name: states[name][:] for name in _STATES},
            directions=int(states.attrs["directions"]),
            lids=LidStates(**{name: states[f"lids/{name}"][:] for name in _LIDS}),
        ),
        blocks=tuple(
            KeptBlock(
                receptors=slice(int(block.attrs["start"]), int(block.attrs["stop"])),
                calms=bool(block.attrs["calms"]),
                lid_row=block["lid_row"][:],
                first=block["first"][:],
                group=block["group"][:],
                values=block["values"][:],
            )
            for block in blocks
        ),
        fingerprint={
            name.removeprefix("fingerprint."): str(value)
            for name, value in file.attrs.items()
            if name.startswith("fingerprint.")
        },
    )


def _refusal(path: Path, message: str, found: str) -> StudyError:
    return StudyError(
        [
            Problem(
                severity="error",
                file=str(path),
                place="",
                value=found,
                allowed=f"a file of {FORMAT}, version {VERSION}",
                mend="compute the responses again into a new file",
                message=message,
            )
        ]
    )
