"""The shape of an answer, declared once: printed into the document as a number, a list, or rows of objects."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, TypeAlias

from service.schemas.json_schema import reference

ONE: dict[str, Any] = {"type": ["number", "null"], "format": "double"}
MANY: dict[str, Any] = {"type": ["array", "null"], "items": ONE}
TEXT: dict[str, Any] = {"type": "string"}
COUNT: dict[str, Any] = {"type": "integer"}


@dataclass(frozen=True, slots=True)
class Figure:
    """A number: an array of them in a list answer; null where a reason is given."""

    meaning: str


@dataclass(frozen=True, slots=True)
class Fixed:
    """A member that is the same in number and list answers: its JSON Schema."""

    schema: Mapping[str, Any]
    optional: bool = False


@dataclass(frozen=True, slots=True)
class Group:
    """An object of figures that keeps its keys in every form."""

    members: Mapping[str, "Shape"]
    meaning: str = ""
    nullable: bool = False


@dataclass(frozen=True, slots=True)
class Each:
    """A list of objects of one shape."""

    members: Mapping[str, "Shape"]
    meaning: str = ""
    nullable: bool = False


Shape: TypeAlias = Figure | Fixed | Group | Each


def printed(shape: Shape, many: bool) -> dict[str, Any]:
    """Print a shape as JSON Schema; `many`: its figures are arrays."""
    if isinstance(shape, Fixed):
        return dict(shape.schema)
    if isinstance(shape, Figure):
        return (MANY if many else ONE) | {"description": shape.meaning}
    inner = object_of(shape.members, many)
    if isinstance(shape, Each):
        inner = {"type": "array", "items": inner}
    if shape.nullable:
        inner["type"] = [inner["type"], "null"]
    return inner | ({"description": shape.meaning} if shape.meaning else {})


def object_of(members: Mapping[str, Shape], many: bool) -> dict[str, Any]:
    """Print an object of shapes."""
    out = open_object({name: printed(member, many) for name, member in members.items()})
    out["required"] = [n for n, member in members.items() if not (isinstance(member, Fixed) and member.optional)]
    return out


def open_object(properties: Mapping[str, Any], **more: Any) -> dict[str, Any]:
    """Print an object that answers may extend."""
    return {"type": "object", "properties": dict(properties), "required": list(properties), **more}


def constant(value: str) -> dict[str, str]:
    """Print a tag."""
    return {"type": "string", "const": value}


TAIL: dict[str, dict[str, Any]] = {
    "null_reasons": {"type": "array", "items": reference("NullReason")},
    "basis": reference("Basis"),
    "cautions": {"type": "array", "items": reference("Caution")},
}
"""What every computed answer ends with."""

NULLABLE_TEXT = {"type": ["string", "null"]}
PARAMS = {"type": "object", "additionalProperties": True}
COMPONENTS: dict[str, dict[str, Any]] = {
    "NullReason": open_object(
        {
            "pointer": TEXT | {"description": "from the top of the answer; may name a whole list or object"},
            "reason": TEXT | {"description": "open list, see /v1/codes"},
        },
        description="Why a figure is null.",
    ),
    "Basis": open_object(
        {
            "service_version": TEXT,
            "method": TEXT | {"description": "open list, see /v1/codes"},
            "numerical_error": ONE | {"description": "absolute for figures up to 1 in size, relative beyond"},
            "numerical_error_kind": {"type": ["string", "null"], "enum": ["bound", "estimate", None]},
            "request_fingerprint": NULLABLE_TEXT
            | {"description": "sha256 of path, newline and body as sent; of path?query for GET; null inside a batch"},
        },
        description="What the figures rest on, so that they can be reproduced.",
    ),
    "Caution": open_object(
        {
            "code": TEXT | {"description": "open list, see /v1/codes"},
            "detail": TEXT,
            "pointer": NULLABLE_TEXT | {"description": "into the request, as a body"},
            "params": PARAMS,
        },
        description="An assumption that matters here, or an input that looks like a slip.",
    ),
    "Fault": {
        "type": "object",
        "required": ["code", "detail", "params"],
        "properties": {
            "pointer": TEXT | {"description": "JSON Pointer into the body"},
            "parameter": TEXT | {"description": "name in the query"},
            "index": COUNT | {"description": "entry of a list in the query, from 0"},
            "code": TEXT | {"description": "open list, see /v1/codes"},
            "detail": TEXT,
            "params": PARAMS,
        },
        "description": "One fault of the request.",
    },
    "Problem": {
        "type": "object",
        "required": ["type", "title", "status", "detail", "instance", "request_id"],
        "properties": {
            "type": TEXT,
            "title": TEXT,
            "status": COUNT,
            "detail": TEXT,
            "instance": TEXT,
            "request_id": TEXT,
            "errors": {"type": "array", "items": reference("Fault"), "maxItems": 100},
            "errors_total": COUNT,
        },
        "description": "Problem details (RFC 9457).",
    },
}
