"""Pieces of JSON Schema that questions and answers are printed with."""

from collections.abc import Iterable, Mapping
from typing import Any

NULL_OR_ABSENT = {"type": "null"}
"""How a field that belongs to another branch of a union is printed: null is the same as left out."""


def closed_object(
    members: Mapping[str, Any], *, optional: Iterable[str] = (), never: Iterable[str] = (), **more: Any
) -> dict[str, Any]:
    """Print an object of exactly these members; those of the union's other branches may only be null."""
    others = {name: NULL_OR_ABSENT for name in never if name not in members}
    left_out = set(optional)
    return {
        "type": "object",
        "properties": {**members, **others},
        "required": [name for name in members if name not in left_out],
        "additionalProperties": False,
        **more,
    }


def reference(name: str) -> dict[str, str]:
    """Refer to a component."""
    return {"$ref": f"#/components/schemas/{name}"}


def class_name(name: str) -> str:
    """Turn a name of the contract into that of a component: student_t, StudentT."""
    return "".join(word.title() for word in name.split("_"))
