"""GET /v1/return-models."""

from typing import Any

from service.core.returns import RETURN_MODELS, ReturnModel
from service.endpoints.declaration import catalogue
from service.schemas.catalogue import KIND, describe_ways
from service.schemas.shapes import TEXT, open_object

WORDS = {"type": "array", "items": TEXT}
OPTION = {
    "type": ["object", "null"],
    "properties": {"name": TEXT, "meaning": TEXT, "values": WORDS},
    "required": ["name", "meaning", "values"],
    "description": "a word beside the parameters, if there is one",
}
ENTRY = KIND | {
    "option": OPTION,
    "compounding": WORDS,
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
            describe_ways(kind)
            | {
                "option": describe_option(kind),
                "compounding": list(kind.compoundings),
                "any_horizon": list(kind.divides),
            }
            for _, kind in sorted(RETURN_MODELS.items())
        ]
    }


def describe_option(kind: type[ReturnModel]) -> dict[str, Any] | None:
    """Give the word beside the parameters that says how they are to be read."""
    option = kind.option
    return None if option is None else {"name": option.name, "meaning": option.meaning, "values": list(option.ways)}
