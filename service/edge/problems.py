"""Any failure to problem details (RFC 9457): the only writer of errors."""

from collections.abc import Iterable
from dataclasses import dataclass
from http import HTTPStatus
from typing import Any

from flask import Flask, Request, Response, request
from marshmallow import ValidationError
from werkzeug.exceptions import HTTPException

from service.edge.query import FlatQuery
from service.edge.request_body import BodyTooLarge
from service.edge.respond import NO_STORE, Headers, Responder, dump, new_request_id
from service.edge.strict_json import Unreadable
from service.schemas.faults import Fault, walk

MEDIA_TYPE = "application/problem+json"
MOST_LISTED = 100
KEPT_HEADERS = ("Allow", "Retry-After")


@dataclass(frozen=True, slots=True)
class ProblemKind:
    """A kind of problem that has a page of its own."""

    title: str
    status: int
    meaning: str
    remedy: str


KINDS = {
    "unreadable": ProblemKind(
        "The request cannot be read",
        400,
        "The body is not one JSON object in UTF-8, or the query is broken.",
        "Send one JSON object, each key once, numbers that a double can hold; percent-encode the query.",
    ),
    "too-large": ProblemKind(
        "The body is too large",
        413,
        "The body is longer than the service reads.",
        "Ask fewer questions at once, or shorter arrays; the operator can raise SERVICE_MAX_BODY_BYTES.",
    ),
    "url-too-long": ProblemKind(
        "The address is too long",
        414,
        "The address is longer than the service reads.",
        "Send the same question by POST.",
    ),
    "headers-too-large": ProblemKind(
        "The headers are too large",
        431,
        "The request headers are longer or more than the service reads.",
        "Send fewer or shorter headers; cookies are not needed here.",
    ),
    "does-not-fit": ProblemKind(
        "The request does not fit",
        422,
        "The request can be read, but at least one value does not fit.",
        "Mend every fault listed under errors; each has a pointer or a parameter, a code and words.",
    ),
}


def problem_body(
    status: int, detail: str, request_id: str, kind: str | None = None, errors: list[dict[str, Any]] | None = None
) -> dict[str, Any]:
    """Make the members of a problem; a bare HTTP condition has no kind."""
    body = {
        "type": f"/problems/{kind}" if kind else "about:blank",
        "title": KINDS[kind].title if kind else HTTPStatus(status).phrase,
        "status": status,
        "detail": detail,
        "instance": f"/problems/occurrences/{request_id}",
        "request_id": request_id,
    }
    if errors is not None:
        body |= {"errors": errors[:MOST_LISTED], "errors_total": len(errors)}
    return body


class Problems:
    """Answers with problems."""

    def __init__(self, responder: Responder) -> None:
        self.responder = responder

    def answer(
        self,
        asked: Request,
        status: int,
        detail: str,
        kind: str | None = None,
        errors: list[dict[str, Any]] | None = None,
        headers: Iterable[tuple[str, str]] = (),
    ) -> Response:
        """Answer with one problem."""
        request_id = new_request_id()
        body = dump(problem_body(status, detail, request_id, kind, errors))
        kept: Headers = [*headers, NO_STORE]
        return self.responder.respond(asked, body, status, kept, MEDIA_TYPE, request_id)

    def does_not_fit(self, asked: Request, error: ValidationError, query: FlatQuery | None) -> Response:
        """422: every fault with its place, in the body or (`query`) in the query."""
        errors = [
            {**({"pointer": pointer} if query is None else query.place(pointer)), **fault_body(fault)}
            for pointer, fault in walk(error.messages)
        ]
        where = "body" if query is None else "query"
        count = "1 fault" if len(errors) == 1 else f"{len(errors)} faults"
        listed = "it is" if len(errors) == 1 else "each is"
        return self.answer(asked, 422, f"{count} in the {where}; {listed} listed under errors.", "does-not-fit", errors)

    def unreadable(self, asked: Request, error: Unreadable) -> Response:
        """400: the request cannot be read."""
        fault = {"pointer": ""} | fault_body(Fault(error.code, error.detail, error.params))
        return self.answer(asked, 400, error.detail, "unreadable", [fault])

    def too_large(self, asked: Request, error: BodyTooLarge) -> Response:
        """413."""
        fault = {"pointer": ""} | fault_body(Fault("body_too_large", str(error), {"limit": error.limit}))
        return self.answer(asked, 413, str(error), "too-large", [fault], [("Connection", "close")])

    def bare(self, asked: Request, error: HTTPException) -> Response:
        """Answer a plain HTTP condition, such as 404 or 405."""
        headers = [
            (name, ", ".join(sorted(value.split(", "))) if name == "Allow" else value)
            for name, value in error.get_headers()
            if name in KEPT_HEADERS
        ]
        status = error.code or 500
        return self.answer(asked, status, DETAILS.get(status) or error.description or error.name, headers=headers)


DETAILS = {
    404: "There is nothing at this address; /openapi.json lists what there is.",
    405: "This address does not take this method; Allow lists those that it takes.",
    406: "The answer is offered as application/json alone.",
    500: "The service failed; this is its fault, not yours.",
}


def fault_body(fault: Fault) -> dict[str, Any]:
    """Give a fault without its place."""
    return {"code": fault.code, "detail": fault.detail, "params": dict(fault.params)}


def register(app: Flask, problems: Problems) -> None:
    """Let every exception that leaves a view become a problem."""

    def current() -> Request:
        return request._get_current_object()  # type: ignore[attr-defined, no-any-return]  # noqa: SLF001 - flask's way to the object itself

    app.register_error_handler(Unreadable, lambda error: problems.unreadable(current(), error))
    app.register_error_handler(BodyTooLarge, lambda error: problems.too_large(current(), error))
    app.register_error_handler(HTTPException, lambda error: problems.bare(current(), error))

    @app.errorhandler(Exception)
    def failed(error: Exception) -> Response:
        app.logger.error("request failed", exc_info=error)
        return problems.answer(current(), 500, DETAILS[500])
