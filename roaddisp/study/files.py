"""The files of a study folder: found, kept inside it, fingerprinted, decoded."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass, field
from pathlib import Path, PurePosixPath, PureWindowsPath
from typing import Final

from roaddisp.model import InputFile
from roaddisp.study.problems import Problems, nearest

LARGEST_TABLE: Final = 1 << 30
"""bytes; a text table beyond it is refused."""

LARGEST_LAYER: Final = 4 << 30
"""bytes; a vector layer beyond it is refused."""

LARGEST_SETTINGS: Final = 1 << 20
"""bytes; a study.toml beyond it is refused."""


@dataclass
class Folder:
    """A study folder, and what has been read of it."""

    path: Path
    problems: Problems
    _known: dict[tuple[str, str], Path | None] = field(default_factory=dict)
    _prints: dict[str, tuple[str, int]] = field(default_factory=dict)

    def find(self, name: str, *, asked_at: str, largest: int, asked_in: str) -> Path | None:
        """Find a file the study names; note what is wrong and return None where it cannot be.

        Parameters
        ----------
        name : str
            As the study names it, relative to the folder.
        asked_at, asked_in : str
            Place and file where the study names it, for the message.
        largest : int [bytes]
        """
        key = (name, asked_at)
        if key not in self._known:
            self._known[key] = self._find(name, asked_at, largest, asked_in)
        return self._known[key]

    def _find(self, name: str, asked_at: str, largest: int, asked_in: str) -> Path | None:
        def refuse(message: str, allowed: str, mend: str) -> None:
            self.problems.error(
                message, file=asked_in, place=asked_at, value=name, allowed=allowed, mend=mend
            )

        outside = "a path inside the study folder, relative to it"
        if _leaves(name):
            refuse("the path leaves the study folder", outside, "copy the file into the folder")
            return None
        try:
            path = (self.path / name).resolve()
            inside = path.is_relative_to(self.path.resolve())
            there, is_file = path.exists(), path.is_file()
            size = path.stat().st_size if is_file else 0
        except (OSError, ValueError, RuntimeError) as error:
            refuse(f"the file cannot be reached ({error})", outside, "look at the name")
            return None
        if not inside:
            refuse(
                "the path leads out of the study folder (by a link)",
                outside,
                "copy the file into the folder",
            )
        elif not there:
            near = nearest(path.name, self._siblings(path))
            refuse(
                "the file is not there",
                "a file of the study folder",
                f"did you mean {near!r}?" if near else "put the file there, or correct its name",
            )
        elif not is_file:
            refuse("not a file", "a file of the study folder", "name the file itself")
        elif size > largest:
            refuse(
                f"the file is too large ({size} bytes)",
                f"at most {largest} bytes",
                "cut it to what the study needs",
            )
        elif size == 0:
            refuse("the file is empty", "a file with content", "look whether it was copied whole")
        else:
            return path
        return None

    def _siblings(self, path: Path) -> list[str]:
        if not path.parent.is_dir():
            return []
        return sorted(entry.name for entry in path.parent.iterdir())[:2000]

    def fingerprint(self, role: str, path: Path) -> InputFile:
        """Take the SHA-256 of a file, once."""
        name = path.relative_to(self.path.resolve()).as_posix()
        if name not in self._prints:
            digest = hashlib.sha256()
            with path.open("rb") as stream:
                while block := stream.read(1 << 20):
                    digest.update(block)
            self._prints[name] = (digest.hexdigest(), path.stat().st_size)
        sha256, size = self._prints[name]
        return InputFile(role, name, sha256, size)


def _leaves(name: str) -> bool:
    """Whether a path is absolute, of another machine, or climbs out of its folder."""
    if "\x00" in name or "://" in name or name.startswith(("/vsi", "\\\\", "~")):
        return True
    depth = 0
    for part in PurePosixPath(name.replace("\\", "/")).parts:
        depth += -1 if part == ".." else 1
        if depth < 0:
            return True
    windows = PureWindowsPath(name)
    return PurePosixPath(name).is_absolute() or bool(windows.drive) or windows.is_absolute()


def decode(content: bytes, problems: Problems, file: str) -> str | None:
    """Decode UTF-8 text (with or without a byte order mark); note what is wrong.

    Returns
    -------
    str or None
        None where the text is in another encoding or holds a NUL byte.
    """
    if content[:2] in (b"\xff\xfe", b"\xfe\xff") or content[:4] == b"\x00\x00\xfe\xff":
        problems.error(
            "the text is in UTF-16 or UTF-32",
            file=file,
            place="line 1",
            allowed="UTF-8",
            mend="save it as UTF-8 (a spreadsheet calls it 'CSV UTF-8')",
        )
        return None
    nul = content.find(b"\x00")
    if nul >= 0:
        problems.error(
            "a NUL byte in a text file",
            file=file,
            place=_byte_place(content, nul),
            value="0x00",
            allowed="UTF-8 text",
            mend="look whether the file is damaged, or is no text file at all",
        )
        return None
    try:
        return content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        at = error.start + (3 if content.startswith(b"\xef\xbb\xbf") else 0)
        problems.error(
            "the text is not UTF-8",
            file=file,
            place=_byte_place(content, at),
            value=f"0x{content[at]:02x}",
            allowed="UTF-8",
            mend="save it as UTF-8 (a spreadsheet calls it 'CSV UTF-8')",
        )
        return None


def _byte_place(content: bytes, at: int) -> str:
    line = content.count(b"\n", 0, at) + 1
    row = f"row {line - 1}, " if line > 1 else ""
    byte = at - (content.rfind(b"\n", 0, at) + 1) + 1
    return f"{row}line {line}, byte {byte}"
