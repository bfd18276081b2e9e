"""GET /v1/codes."""

from typing import Any

from service.core.codes import CAUTIONS, FAULTS, METHODS, NULL_REASONS
from service.endpoints.declaration import catalogue
from service.schemas.shapes import TEXT, open_object

KINDS = {"fault": FAULTS, "caution": CAUTIONS, "null_reason": NULL_REASONS, "method": METHODS}


@catalogue(
    "/v1/codes",
    name="Codes",
    schema=open_object(
        {"codes": {"type": "array", "items": open_object({"kind": TEXT, "code": TEXT, "meaning": TEXT})}}
    ),
)
def codes() -> dict[str, Any]:
    """Every code of faults, cautions, null reasons and methods, with its meaning."""
    return {
        "codes": [
            {"kind": kind, "code": code, "meaning": meaning}
            for kind, listed in KINDS.items()
            for code, meaning in listed.items()
        ]
    }
