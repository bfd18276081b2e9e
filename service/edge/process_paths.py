"""The addresses about the process itself, as the document describes them."""

from collections.abc import Mapping
from typing import Any

from service.edge.problems import KINDS
from service.edge.respond import JSON
from service.edge.responses import ALWAYS, HELD, answered, failures
from service.schemas.shapes import COUNT, TEXT, open_object


def process_operation(
    name: str,
    summary: str,
    schema: Mapping[str, Any],
    media: str = JSON,
    *,
    cached: bool = True,
    parameters: Mapping[str, list[str]] | None = None,
) -> dict[str, Any]:
    """Describe an address about the process itself."""
    operation: dict[str, Any] = {
        "operationId": name,
        "summary": summary,
        "responses": {"200": answered(schema, cached=cached, media=media)},
    }
    if cached:
        operation["responses"] |= HELD
    if parameters:
        operation["parameters"] = [
            {"name": n, "in": "path", "required": True, "schema": {"type": "string", "enum": v}}
            for n, v in parameters.items()
        ]
    operation["responses"] |= failures([s for s in ALWAYS if s != 404 or parameters])
    return {"get": operation}


ANY_OBJECT = {"type": "object", "additionalProperties": True}
STATUS = open_object({"status": TEXT})
PROCESS_PATHS = {
    "/health/live": process_operation("get_health_live", "Does the process answer?", STATUS, cached=False),
    "/health/ready": process_operation("get_health_ready", "Does the process take requests?", STATUS, cached=False),
    "/openapi.json": process_operation("get_openapi_json", "This document, with the running limits.", ANY_OBJECT),
    "/openapi.yaml": process_operation(
        "get_openapi_yaml", "This document, with the default limits.", ANY_OBJECT, "application/yaml"
    ),
    "/problems/{name}": process_operation(
        "get_problem",
        "What a kind of problem means and how to mend it.",
        open_object(
            {
                "type": TEXT,
                "title": TEXT,
                "status": COUNT,
                "meaning": TEXT,
                "remedy": TEXT,
            }
        ),
        parameters={"name": sorted(KINDS)},
    ),
}
