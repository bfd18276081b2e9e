"""GET /v1/return-models."""

from typing import Any

from service.core.returns import RETURN_MODELS
from service.endpoints.declaration import catalogue
from service.schemas.catalogue import KIND, describe_ways
from service.schemas.shapes import TEXT, open_object

ENTRY = KIND | {
    "compounding": {"type": "array", "items": TEXT},
    "any_horizon": {
        "type": "array",
        "items": TEXT | {"description": "compounding under which any horizon has a closed form"},
    },
}


@catalogue(
    "/v1/return-models",
    name="ReturnModels",
    schema=open_object({"return_models": {"type": "array", "items": open_object(ENTRY)}}),
)
def return_models() -> dict[str, Any]:
    """Every model of the return of one period."""
    return {
        "return_models": [
            describe_ways(kind) | {"compounding": list(kind.compoundings), "any_horizon": list(kind.divides)}
            for _, kind in sorted(RETURN_MODELS.items())
        ]
    }
