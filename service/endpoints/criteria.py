"""GET /v1/criteria."""

from typing import Any

from service.core.portfolio.criteria import CRITERIA
from service.endpoints.declaration import catalogue
from service.schemas.shapes import TEXT, open_object

ENTRY = dict.fromkeys(("name", "meaning", "better", "source"), TEXT)


@catalogue(
    "/v1/criteria", name="Criteria", schema=open_object({"criteria": {"type": "array", "items": open_object(ENTRY)}})
)
def criteria() -> dict[str, Any]:
    """Every criterion by which portfolios are ranked."""
    return {"criteria": [{name: getattr(criterion, name) for name in ENTRY} for criterion in CRITERIA.values()]}
