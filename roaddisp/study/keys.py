"""What the schema says of a key of ``study.toml``."""

from __future__ import annotations

from typing import Any

from pydantic import BaseModel
from pydantic.fields import FieldInfo


def allowed_text(field: FieldInfo) -> str:
    """Say what a key may be."""
    extra = field.json_schema_extra
    if isinstance(extra, dict) and "allowed" in extra:
        return str(extra["allowed"])
    for part in _metadata(field):
        allowed = getattr(getattr(part, "func", None), "allowed", None)
        if allowed is not None:
            return str(allowed)
    if field.annotation is bool:
        return "true, false"
    if field.annotation is str:
        return "a text"
    return ""


def _metadata(field: FieldInfo) -> list[Any]:
    found = list(field.metadata)
    for inner in getattr(field.annotation, "__args__", ()):
        found.extend(getattr(inner, "__metadata__", ()))
    return found


def submodel(annotation: Any) -> type[BaseModel] | None:
    """Find the section model an annotation holds, bare or beside None."""
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    for inner in getattr(annotation, "__args__", ()):
        found = submodel(inner)
        if found is not None:
            return found
    return None
