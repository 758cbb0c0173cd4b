"""The files that the sections of ``study.toml`` name, each read once."""

from __future__ import annotations

from collections.abc import Callable, Hashable
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, TypeVar

from roaddisp.model import InputFile
from roaddisp.study.columns import ColumnMap, TableView
from roaddisp.study.files import LARGEST_LAYER, LARGEST_TABLE, Folder
from roaddisp.study.layers import companions, is_vector, read_layer
from roaddisp.study.problems import Problems, listed, nearest
from roaddisp.study.raw import RawTable, read_csv
from roaddisp.study.scenarios import Settings
from roaddisp.study.tables import TABLES

Made = TypeVar("Made")
BUILT_IN = "built-in"


@dataclass
class Sources:
    """Everything read of a study folder, by what asked for it.

    Attributes
    ----------
    folder : Folder
    settings_path : Path
        The ``study.toml``.
    problems : Problems
    """

    folder: Folder
    settings_path: Path
    problems: Problems
    _made: dict[Hashable, Any] = field(default_factory=dict)

    def once(self, key: Hashable, make: Callable[[], Made]) -> Made:
        """Make a thing once for all scenarios that need the same."""
        if key not in self._made:
            self._made[key] = make()
        made: Made = self._made[key]
        return made

    def view(self, settings: Settings, section: str, key: str = "file") -> TableView | None:
        """Read the table that a key names, seen through its list of columns.

        Returns
        -------
        TableView or None
            None where the key is not given, or the file cannot be read.
        """
        model = settings.section(section)
        name = getattr(model, key, None) if model is not None else None
        if name is None or (section, key, name) == ("fleet", "factors", BUILT_IN):
            return None
        signature = ("view", key, settings.signature(section))
        return self.once(signature, lambda: self._view(settings, section, key, name))

    def _view(self, settings: Settings, section: str, key: str, name: str) -> TableView | None:
        mapping = self._mapping(settings, section, key)
        layer = _of_key(settings.section(section).layer, key)
        form = getattr(settings.section(section), "format", "")
        vector = section == "roads" or key == "sites"
        if key == "points":
            vector = form == "vector" or (form != "table" and is_vector(name))
        path = self._path(settings, section, key, vector)
        if path is None:
            return None
        table = self.once(
            ("table", path, layer, vector), lambda: self._table(path, name, layer, vector)
        )
        if table is None:
            return None
        return TableView(table, TABLES[section][key], mapping, self.problems)

    def _table(self, path: Path, name: str, layer: str | None, vector: bool) -> RawTable | None:
        if vector:
            return read_layer(path, name, layer, self.problems)
        if is_vector(name):
            self.problems.error(
                "a vector layer where a CSV is read",
                file=name,
                allowed="a CSV",
                mend="export its table as CSV, with commas, in UTF-8",
            )
            return None
        return read_csv(path, name, self.problems)

    def _path(self, settings: Settings, section: str, key: str, vector: bool) -> Path | None:
        return self.folder.find(
            getattr(settings.section(section), key),
            asked_at=settings.place(section, key),
            asked_in=settings.file,
            largest=LARGEST_LAYER if vector else LARGEST_TABLE,
        )

    # --- columns ----------------------------------------------------------------

    def _given(self, settings: Settings, section: str) -> list[str]:
        """List the keys of a section that name a table."""
        model = settings.section(section)
        return [key for key in TABLES[section] if getattr(model, key, None) not in {None, BUILT_IN}]

    def _mapping(self, settings: Settings, section: str, key: str) -> ColumnMap:
        columns = settings.section(section).columns
        given = self._given(settings, section)
        self._check_mapping(settings, section, given)
        own = columns.get(key)
        flat = {ours: theirs for ours, theirs in columns.items() if isinstance(theirs, str)}
        names = TABLES[section][key].names
        ours = {name: theirs for name, theirs in flat.items() if name in names}
        if isinstance(own, dict):
            ours |= {name: theirs for name, theirs in own.items() if name in names}

        def place(name: str) -> str:
            path = (key, name) if isinstance(own, dict) and name in own else (name,)
            return settings.place(section, "columns", *path)

        shared = set(ours) - set(own if isinstance(own, dict) else ())
        lenient = frozenset(shared) if len(given) > 1 else frozenset()
        used = self.once(("used", settings.signature(section)), set[str])
        return ColumnMap(ours, settings.file, place, lenient, used)

    def _check_mapping(self, settings: Settings, section: str, given: list[str]) -> None:
        for ours, theirs in settings.section(section).columns.items():
            if isinstance(theirs, dict):
                if ours not in TABLES[section]:
                    self._unknown_column(settings, section, (ours,), list(TABLES[section]))
                    continue
                names = TABLES[section][ours].names
                for inner in theirs:
                    if inner not in names:
                        self._unknown_column(settings, section, (ours, inner), list(names))
                continue
            every = [name for key in given for name in TABLES[section][key].names]
            if ours not in every:
                self._unknown_column(settings, section, (ours,), list(dict.fromkeys(every)))

    def _unknown_column(
        self, settings: Settings, section: str, path: tuple[str, ...], names: list[str]
    ) -> None:
        near = nearest(path[-1], names)
        self.problems.error(
            f"{section}.columns: {path[-1]!r} is not one of our columns",
            file=settings.file,
            place=settings.place(section, "columns", *path),
            value=path[-1],
            allowed=listed(names, 20),
            mend=f"did you mean {near!r}?" if near else 'write our_name = "YOUR HEADER [unit]"',
        )

    def check_unused(self, settings: Settings, section: str) -> None:
        """Note headers that `columns` names for several files and none of them has."""
        model = settings.section(section)
        given = self._given(settings, section) if model is not None else []
        views = [self.view(settings, section, key) for key in given]
        if len(given) < 2 or None in views:
            return
        used: set[str] = self.once(("used", settings.signature(section)), set[str])
        for ours, theirs in model.columns.items():
            known = any(ours in TABLES[section][key].names for key in given)
            if isinstance(theirs, str) and known and ours not in used:
                self.problems.error(
                    f"{section}.columns: no file of the section has this column",
                    file=settings.file,
                    place=settings.place(section, "columns", ours),
                    value=theirs,
                    allowed="a header of one of the files",
                    mend="correct it, or take it out",
                )

    # --- the record ---------------------------------------------------------------

    def files(self, settings: Settings) -> tuple[InputFile, ...]:
        """Fingerprint every file of a scenario, the settings first."""
        found = [self.folder.fingerprint("settings", self.settings_path)]
        for section, tables in TABLES.items():
            for key in self._given(settings, section):
                vector = is_vector(getattr(settings.section(section), key))
                path = self._path(settings, section, key, vector)
                if path is not None:
                    role = tables[key].name
                    found += [self.folder.fingerprint(role, each) for each in companions(path)]
        return tuple(found)


def _of_key(value: Any, key: str) -> Any:
    return value.get(key) if isinstance(value, dict) else value
