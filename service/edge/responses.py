"""Responses as the document describes them: successes, held answers, problems."""

from collections.abc import Iterable, Mapping
from typing import Any

from service.edge.problems import KINDS, MEDIA_TYPE
from service.edge.respond import JSON
from service.schemas.json_schema import reference

BARE = {
    404: "There is nothing at this address.",
    405: "The address does not take this method.",
    406: "The answer is not offered in the accepted format.",
    415: "The body is not JSON in UTF-8.",
}
FAILED = {
    500: "The service failed; nothing a client sends should lead here.",
    503: "The service is stopping, full or out of time; try again after Retry-After.",
}
ALWAYS = (404, 405, 406, 414, 431, 500, 503)

HELD = {"304": {"description": "The client holds this answer already."}}


def answered(schema: Mapping[str, Any], *, cached: bool, media: str = JSON) -> dict[str, Any]:
    """Describe a success."""
    headers = {"Request-Id": TEXT_HEADER} | ({"ETag": TEXT_HEADER, "Cache-Control": TEXT_HEADER} if cached else {})
    return {"description": "The answer.", "headers": headers, "content": {media: {"schema": dict(schema)}}}


TEXT_HEADER = {"schema": {"type": "string"}}
MEANINGS = BARE | FAILED | {kind.status: kind.meaning for kind in KINDS.values()}


def failures(statuses: Iterable[int]) -> dict[str, Any]:
    """Refer to the problems that a request may meet."""
    return {str(status): {"$ref": f"#/components/responses/Problem{status}"} for status in sorted(statuses)}


def problem_responses() -> dict[str, Any]:
    """Describe every problem once."""
    problem = {"content": {MEDIA_TYPE: {"schema": reference("Problem")}}, "headers": {"Request-Id": TEXT_HEADER}}
    return {f"Problem{status}": {"description": MEANINGS[status], **problem} for status in sorted(MEANINGS)}
