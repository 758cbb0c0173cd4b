"""Line and column of every key of a TOML text; the values are tomllib's."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import Any

KeyPath = tuple[str | int, ...]


@dataclass
class TomlPlaces:
    """Where each key of a TOML text stands.

    Attributes
    ----------
    at : mapping of key path to (line, column), both from 1
    inline : set of key paths whose value is an inline table
    """

    at: dict[KeyPath, tuple[int, int]] = field(default_factory=dict)
    inline: set[KeyPath] = field(default_factory=set)

    def place(self, path: KeyPath) -> str:
        """Say where a key stands, or the nearest table above it."""
        for end in range(len(path), 0, -1):
            if path[:end] in self.at:
                line, column = self.at[path[:end]]
                return f"line {line}, column {column}"
        return ""

    def __contains__(self, path: KeyPath) -> bool:
        return path in self.at


def find_places(text: str) -> TomlPlaces:
    r"""Find where each key of a TOML text stands.

    Parameters
    ----------
    text : str
        TOML that `tomllib` has accepted.

    Returns
    -------
    TomlPlaces

    Examples
    --------
    >>> find_places('[roads]\nfile = "a.gpkg"').place(("roads", "file"))
    'line 2, column 1'
    """
    import tree_sitter
    import tree_sitter_toml

    parser = tree_sitter.Parser(tree_sitter.Language(tree_sitter_toml.language()))
    source = text.encode()
    places = TomlPlaces()
    lines = source.split(b"\n")

    def here(node: Any) -> tuple[int, int]:
        row, byte = node.start_point[0], node.start_point[1]
        return row + 1, len(lines[row][:byte].decode(errors="replace")) + 1

    def mark_keys(base: KeyPath, key: Any) -> KeyPath:
        for part in _key_parts(key):
            base = (*base, _key_text(part))
            places.at.setdefault(base, here(part))
        return base

    def walk_value(path: KeyPath, value: Any) -> None:
        stack = [(path, value)]
        while stack:
            base, node = stack.pop()
            if node.type == "inline_table":
                places.inline.add(base)
                stack.extend(
                    (mark_keys(base, pair.named_children[0]), pair.named_children[-1])
                    for pair in _named(node, "pair")
                )
            elif node.type == "array":
                items = [child for child in node.named_children if child.type != "comment"]
                for number, child in enumerate(items):
                    places.at.setdefault((*base, number), here(child))
                    stack.append(((*base, number), child))

    def walk_pairs(base: KeyPath, node: Any) -> None:
        for pair in _named(node, "pair"):
            path = mark_keys(base, pair.named_children[0])
            walk_value(path, pair.named_children[-1])

    root = parser.parse(source).root_node
    walk_pairs((), root)
    for table in root.named_children:
        if table.type not in {"table", "table_array_element"}:
            continue
        header = next(child for child in table.named_children if child.type.endswith("key"))
        walk_pairs(mark_keys((), header), table)
    return places


def _named(node: Any, kind: str) -> Iterator[Any]:
    return (child for child in node.named_children if child.type == kind)


def _key_parts(key: Any) -> Iterator[Any]:
    """Walk the parts of a dotted key, which the grammar nests to the left."""
    if key.type != "dotted_key":
        yield key
        return
    parts: list[Any] = []
    node = key
    while node.type == "dotted_key":
        children = [child for child in node.named_children if child.type != "comment"]
        parts.extend(reversed(children[1:]))
        node = children[0]
    parts.append(node)
    yield from reversed(parts)


def _key_text(node: Any) -> str:
    text: str = node.text.decode()
    if node.type == "bare_key":
        return text
    import tomllib

    return str(next(iter(tomllib.loads(f"{text} = 0"))))
