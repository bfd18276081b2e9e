"""How a declared class is described to a reader."""

from typing import Any

from service.core.declared import Declared, Parameterisation
from service.core.parameters import Components, Declaration, Parameter
from service.schemas.declared import first_sentence
from service.schemas.shapes import TEXT, open_object

LIMIT = {"type": ["number", "null"], "format": "double"}
RELATIONS = ("above", "at_least", "below", "at_most")
LIMITS = open_object(dict.fromkeys(RELATIONS, LIMIT), description="null where there is none")
PART = open_object({"name": TEXT, "meaning": TEXT, "limits": LIMITS})
PARAMETER = open_object(
    {
        "name": TEXT,
        "meaning": TEXT,
        "required": {"type": "boolean"},
        "list": {"type": "boolean"},
        "whole": {"type": "boolean"},
        "default": LIMIT,
        "limits": LIMITS,
        "parts": {"type": "array", "items": PART, "description": "members of each entry, of a list of objects"},
        "example": {},
    }
)
WAY = open_object({"parameters": {"type": "array", "items": PARAMETER}, "rules": {"type": "array", "items": TEXT}})


def describe_parameter(parameter: Declaration) -> dict[str, Any]:
    """Meaning, limits (null: none) and example of one parameter."""
    parts = parameter.parts.values() if isinstance(parameter, Components) else ()
    return {
        "name": parameter.name,
        "meaning": parameter.meaning,
        "required": parameter.required,
        "list": not isinstance(parameter, Parameter),
        "whole": getattr(parameter, "whole", False),
        "default": parameter.default,
        "limits": describe_limits(parameter),
        "parts": [{"name": part.name, "meaning": part.meaning, "limits": describe_limits(part)} for part in parts],
        "example": parameter.example,
    }


def describe_limits(parameter: Declaration) -> dict[str, float | None]:
    """Give every limit by its relation, null where there is none."""
    limits = {limit.relation: limit.bound for limit in getattr(parameter, "limits", ())}
    return {relation: limits.get(relation) for relation in RELATIONS}


def describe_way(way: Parameterisation) -> dict[str, Any]:
    """One way to give the parameters."""
    return {
        "parameters": [describe_parameter(p) for p in way.parameters.values()],
        "rules": [rule.words for rule in way.rules],
    }


def describe_ways(kind: type[Declared]) -> dict[str, Any]:
    """Name, use and every way to give the parameters."""
    return {
        "name": kind.name,
        "used_for": first_sentence(kind),
        "parameterisations": [describe_way(way) for way in kind.parameterisations],
    }


KIND = {"name": TEXT, "used_for": TEXT, "parameterisations": {"type": "array", "items": WAY}}
