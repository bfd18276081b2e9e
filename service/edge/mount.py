"""Declared endpoints and catalogues become routes: accept, body, read, ask, answer, respond."""

from collections.abc import Callable, Iterable
from typing import Any

from flask import Flask, Request, Response, request
from marshmallow import ValidationError
from werkzeug.exceptions import NotAcceptable, NotFound

from service.core.errors import DoesNotFit
from service.edge.problems import Problems
from service.edge.query import FlatQuery
from service.edge.request_body import read_body
from service.edge.respond import JSON, Responder, dump, entity_tag, fingerprint, not_modified
from service.edge.settings import Settings
from service.edge.strict_json import read
from service.endpoints.declaration import Catalogue, Endpoint
from service.schemas.answers import write_batch
from service.schemas.faults import Fault, as_messages
from service.schemas.question import Asked, ask_batch


def current_request() -> Request:
    """Give the request itself: every use of flask's proxy costs half a microsecond."""
    return request._get_current_object()  # type: ignore[attr-defined, no-any-return]  # noqa: SLF001 - flask's own way


def check_accept(asked: Request, offered: tuple[str, ...] = (JSON,)) -> str:
    """Give the media type to answer in. Raises NotAcceptable."""
    accept = asked.environ.get("HTTP_ACCEPT")
    if accept in (None, "*/*", offered[0]):
        return offered[0]
    best = asked.accept_mimetypes.best_match(offered)
    if best is None:
        raise NotAcceptable(f"The answer is offered as {' or '.join(offered)}.")
    return best


class MountedEndpoint:
    """One question over HTTP: POST, and GET where it is declared."""

    def __init__(self, declared: Endpoint, settings: Settings, responder: Responder, problems: Problems) -> None:
        self.declared = declared
        self.path = declared.path
        self.question = declared.question(settings.limits, declared.batch)  # once, not once a request
        self.query = FlatQuery(self.question) if declared.get else None
        self.max_body_bytes = settings.max_body_bytes
        self.work_budget = settings.work_budget
        self.responder = responder
        self.problems = problems
        self.methods = ["OPTIONS", "POST", *(["GET", "HEAD"] if declared.get else [])]
        self.allow = ", ".join(sorted(self.methods))

    def view(self) -> Response:
        """Answer a request."""
        asked = current_request()
        if asked.method == "OPTIONS":
            return self.responder.options(asked, self.allow)
        check_accept(asked)
        if asked.method == "POST":
            return self._post(asked)
        return self._get(asked)

    def _post(self, asked: Request) -> Response:
        if asked.environ.get("QUERY_STRING"):
            return unknown_parameters(asked, self.problems)
        try:
            out = self.reply(read_body(asked, self.max_body_bytes))
        except ValidationError as error:
            return self.problems.does_not_fit(asked, error, None)
        return self.responder.respond(asked, dump(out))

    def reply(self, body: bytes) -> dict[str, Any]:
        """Answer the body of a POST. Raises Unreadable or ValidationError."""
        data = read(body)
        mark = fingerprint(self.path, b"\n", body)
        if self.declared.batch and type(data) is dict and "questions" in data:
            if data["questions"] is not None:
                questions = ask_batch(self.question, data)
                self._check_work(questions, {"questions"})
                return write_batch(self._answer_each(questions), mark)
            del data["questions"]
        return self._answer_one(self.question.ask(data), mark)

    def _answer_one(self, question: Asked, mark: str | None) -> dict[str, Any]:
        self._check_work([question], ())
        return self._answer(question, mark)

    def _check_work(self, questions: list[Asked], place: Iterable[str]) -> None:
        """Refuse more work than the budget allows, before any is done."""
        work = sum(map(self.declared.work, questions))
        if work > self.work_budget:
            words = f"This asks for {work / self.work_budget:.3g} times the work that one request may; ask for less."
            fault = Fault("too_much_work", words, {"work": work, "limit": self.work_budget})
            raise ValidationError({name: [fault] for name in place} or [fault])

    def _get(self, asked: Request) -> Response:
        assert self.query is not None  # noqa: S101 - GET is routed only where it is declared
        raw = asked.query_string
        tag = entity_tag("json", self.path, raw)
        if not_modified(asked, tag):
            return self.responder.respond(asked, b"", 304, self.responder.tagged(tag))
        try:
            out = self._answer_one(self.query.ask(raw), fingerprint(self.path, b"?", raw))
        except ValidationError as error:
            return self.problems.does_not_fit(asked, error, self.query)
        return self.responder.respond(asked, dump(out), headers=self.responder.tagged(tag))

    def _answer(self, question: Asked, mark: str | None) -> dict[str, Any]:
        try:
            result = self.declared.compute(question)
        except DoesNotFit as error:  # what only the computation can tell
            raise ValidationError(as_messages(error)) from None
        return self.declared.write(result, question.length, mark)

    def _answer_each(self, questions: list[Asked]) -> list[dict[str, Any]]:
        answers, faults = [], {}
        for index, question in enumerate(questions):
            try:
                answers.append(self._answer(question, None))
            except ValidationError as error:
                faults[index] = error.messages
        if faults:
            raise ValidationError({"questions": faults})
        return answers


class MountedCatalogue:
    """One fixed list over HTTP: GET and HEAD, printed once."""

    allow = "GET, HEAD, OPTIONS"

    def __init__(self, declared: Catalogue, responder: Responder, problems: Problems) -> None:
        self.declared = declared
        self.responder = responder
        self.problems = problems
        self.printed: dict[str, bytes] = {}

    def view(self, **names: str) -> Response:
        """Answer a request."""
        asked = current_request()
        if asked.method == "OPTIONS":
            return self.responder.options(asked, self.allow)
        check_accept(asked)
        if asked.query_string:
            return unknown_parameters(asked, self.problems)
        path = self.declared.path.format(**names)
        if path not in self.printed:
            found = self.declared.read(**names)
            if found is None:
                raise NotFound
            self.printed[path] = dump(found)
        tag = entity_tag("json", path)
        headers = self.responder.tagged(tag)
        if not_modified(asked, tag):
            return self.responder.respond(asked, b"", 304, headers)
        return self.responder.respond(asked, self.printed[path], headers=headers)


def unknown_parameters(asked: Request, problems: Problems) -> Response:
    """422: an address that takes no query was given one."""
    errors = [
        {
            "parameter": name[:60],
            "code": "unknown_field",
            "detail": f"There is no parameter {name[:60]} here.",
            "params": {},
        }
        for name in asked.args
    ]
    return problems.answer(asked, 422, "This address takes no query.", "does-not-fit", errors)


def mount(app: Flask, path: str, name: str, view: Callable[..., Response], methods: list[str]) -> None:
    """Add one route; names in braces stand for a part of the path."""
    rule = path.replace("{", "<").replace("}", ">")
    app.add_url_rule(rule, name, view, methods=methods, provide_automatic_options=False)
