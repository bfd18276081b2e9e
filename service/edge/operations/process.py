"""Addresses about the process itself: health, the document, the pages of the problems."""

from collections.abc import Callable
from html import escape
from typing import Any

import yaml
from flask import Response
from werkzeug.exceptions import NotFound

from service.edge.mount import check_accept, current_request
from service.edge.problems import KINDS, ProblemKind
from service.edge.respond import JSON, Responder, dump, entity_tag, not_modified

YAML = "application/yaml"
HTML = "text/html; charset=utf-8"
PAGE_POLICY = ("Content-Security-Policy", "default-src 'none'; frame-ancestors 'none'")


class Operations:
    """Views of the process."""

    allow = "GET, HEAD, OPTIONS"

    def __init__(
        self, responder: Responder, running: Callable[[], dict[str, Any]], defaults: Callable[[], dict[str, Any]]
    ) -> None:
        self.responder = responder
        self.documents = {"openapi.json": (running, dump, JSON), "openapi.yaml": (defaults, print_yaml, YAML)}
        self.printed: dict[str, bytes] = {}

    def health(self, probe: str) -> Response:
        """Tell that the process answers (live) and takes requests (ready)."""
        asked = current_request()
        if asked.method == "OPTIONS":
            return self.responder.options(asked, self.allow)
        if probe not in ("live", "ready"):
            raise NotFound
        return self.responder.respond(asked, dump({"status": probe}))

    def document(self, name: str) -> Response:
        """Give the OpenAPI document: with the running limits as JSON, with the defaults as YAML."""
        asked = current_request()
        if asked.method == "OPTIONS":
            return self.responder.options(asked, self.allow)
        make, printer, media = self.documents[name]
        check_accept(asked, (media, "text/yaml", "text/plain") if media == YAML else (media,))
        if name not in self.printed:
            self.printed[name] = printer(make())
        tag = entity_tag(media, f"/{name}", self.printed[name])
        headers = self.responder.tagged(tag)
        if not_modified(asked, tag):
            return self.responder.respond(asked, b"", 304, headers)
        return self.responder.respond(asked, self.printed[name], headers=headers, content_type=media)

    def problem(self, name: str) -> Response:
        """Explain one kind of problem, as a page or as JSON."""
        asked = current_request()
        if asked.method == "OPTIONS":
            return self.responder.options(asked, self.allow)
        kind = KINDS.get(name)
        if kind is None:
            raise NotFound
        media = check_accept(asked, (JSON, "text/html"))
        tag = entity_tag(media, f"/problems/{name}")
        headers = self.responder.tagged(tag)
        if not_modified(asked, tag):
            return self.responder.respond(asked, b"", 304, headers)
        if media == JSON:
            return self.responder.respond(asked, dump(describe(name, kind)), headers=headers)
        return self.responder.respond(
            asked, problem_page(name, kind), headers=[*headers, PAGE_POLICY], content_type=HTML
        )


def describe(name: str, kind: ProblemKind) -> dict[str, Any]:
    """Give a kind of problem as plain values."""
    return {
        "type": f"/problems/{name}",
        "title": kind.title,
        "status": kind.status,
        "meaning": kind.meaning,
        "remedy": kind.remedy,
    }


def problem_page(name: str, kind: ProblemKind) -> bytes:
    """Write the page of one kind of problem."""
    title, meaning, remedy = escape(kind.title), escape(kind.meaning), escape(kind.remedy)
    return (
        f'<!doctype html><html lang="en"><meta charset="utf-8"><title>{title}</title>'
        f"<h1>{title}</h1><p>Status {kind.status}, type <code>/problems/{escape(name)}</code>.</p>"
        f"<p>{meaning}</p><h2>What to do</h2><p>{remedy}</p>"
        f'<p>Codes of single faults: <a href="../v1/codes">/v1/codes</a>.</p></html>'
    ).encode()


def print_yaml(document: dict[str, Any]) -> bytes:
    """Print a document as YAML, in its own order and without anchors."""
    text: str = yaml.dump(document, Dumper=_PlainDumper, sort_keys=False, allow_unicode=True, width=120)
    return text.encode()


class _PlainDumper(yaml.SafeDumper):
    """Repeats a value rather than pointing at its twin: readers find anchors hard to follow."""

    def ignore_aliases(self, data: Any) -> bool:  # noqa: ARG002 - the base class's signature
        return True
