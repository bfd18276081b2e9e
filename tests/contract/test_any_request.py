"""Whatever a client sends, the answer is one that the document describes: never a 500, never a shape of its own."""

from typing import Any

import schemathesis
from hypothesis import HealthCheck, settings
from schemathesis.checks import not_a_server_error
from schemathesis.specs.openapi.checks import (
    content_type_conformance,
    response_headers_conformance,
    response_schema_conformance,
    status_code_conformance,
    unsupported_method,
)

from service.edge.app import create_app
from service.edge.settings import Settings

# small limits, so that the arrays made here are small too
schema = schemathesis.openapi.from_wsgi(
    "/openapi.json", create_app(Settings(max_entries=5, max_questions=3, max_portfolios=4))
)
CHECKS = [
    not_a_server_error,
    status_code_conformance,
    content_type_conformance,
    response_headers_conformance,
    response_schema_conformance,
    unsupported_method,
]


@schema.parametrize()
@settings(max_examples=60, deadline=None, suppress_health_check=list(HealthCheck), derandomize=True)
def test_every_operation_answers_as_described(case: Any) -> None:
    # what fits the schema may still not fit (lengths that differ), so no check asks for success
    case.call_and_validate(checks=CHECKS)
