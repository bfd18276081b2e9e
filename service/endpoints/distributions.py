"""GET /v1/distributions and /v1/distributions/{family}."""

from typing import Any

from service.core.distributions import FAMILIES
from service.endpoints.declaration import catalogue
from service.schemas.catalogue import KIND, describe_ways
from service.schemas.distribution import DistributionField
from service.schemas.limits import DEFAULT_LIMITS
from service.schemas.shapes import TEXT, open_object

ENTRY = {"family": TEXT, "used_for": TEXT, "discrete": {"type": "boolean"}, "support": TEXT}
WHOLE = ENTRY | {
    "parameterisations": KIND["parameterisations"],
    "method": TEXT,
    "quantile_method": TEXT,
    "numerical_error": {"type": "number"},
    "example": {"type": "object", "additionalProperties": True},
    "json_schema": {"type": "object", "additionalProperties": True},
}


def _entry(name: str) -> dict[str, Any]:
    family = FAMILIES[name]
    return {
        "family": name,
        "used_for": describe_ways(family)["used_for"],
        "discrete": family.discrete,
        "support": family.support_words,
    }


@catalogue(
    "/v1/distributions",
    name="Distributions",
    schema=open_object({"distributions": {"type": "array", "items": open_object(ENTRY)}}),
)
def distributions() -> dict[str, Any]:
    """Every distribution family."""
    return {"distributions": [_entry(name) for name in sorted(FAMILIES)]}


@catalogue(
    "/v1/distributions/{family}",
    name="DistributionFamily",
    schema=open_object(WHOLE),
    parameters={"family": sorted(FAMILIES)},
)
def distribution(family: str) -> dict[str, Any] | None:
    """One distribution family: its use, parameters, support, accuracy and JSON Schema."""
    kind = FAMILIES.get(family)
    if kind is None:
        return None
    first = kind.parameterisations[0].parameters
    field = DistributionField()
    field.limits = DEFAULT_LIMITS
    return _entry(family) | {
        "parameterisations": describe_ways(kind)["parameterisations"],
        "method": kind.method,
        "quantile_method": kind.quantile_method,
        "numerical_error": kind.numerical_error,
        "example": {"family": family} | {n: p.example for n, p in first.items() if p.required},
        "json_schema": {"$schema": "https://json-schema.org/draft/2020-12/schema", **field.kind_schema(family)},
    }
