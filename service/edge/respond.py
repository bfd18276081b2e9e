"""The one place that makes responses: request id, caching, cross-origin headers, entity tags."""

import hashlib
import secrets
from typing import Any

import orjson
from flask import Request, Response

from service import __version__

JSON = "application/json"
NO_STORE = ("Cache-Control", "no-store")
EXPOSED = "ETag, Retry-After, Request-Id"
PREFLIGHT_SECONDS = "86400"
Headers = list[tuple[str, str]]


class Responder:
    """Makes every response of the service."""

    def __init__(self, allowed_origins: tuple[str, ...], max_age_seconds: int) -> None:
        self.origins = frozenset(allowed_origins)
        self.cached = ("Cache-Control", f"public, max-age={max_age_seconds}")
        self.any_origin = "*" in self.origins

    def respond(
        self,
        asked: Request,
        body: bytes,
        status: int = 200,
        headers: Headers | None = None,
        content_type: str = JSON,
        request_id: str | None = None,
    ) -> Response:
        """Make a response; without headers of its own it must not be stored."""
        full = [*(headers or [NO_STORE]), ("Request-Id", request_id or new_request_id())]
        if self.origins:
            full += self._cross_origin(asked)
        return Response(body, status, full, content_type=content_type)

    def _cross_origin(self, asked: Request) -> Headers:
        origin = asked.environ.get("HTTP_ORIGIN")
        if origin is None or not (self.any_origin or origin in self.origins):
            return []
        return [
            ("Access-Control-Allow-Origin", "*" if self.any_origin else origin),
            ("Access-Control-Expose-Headers", EXPOSED),
        ]

    def options(self, asked: Request, allow: str) -> Response:
        """Answer OPTIONS: which methods there are, and a browser's question whether a page may call."""
        headers = [("Allow", allow), NO_STORE]
        if self.origins:
            headers.append(("Vary", "Origin"))
            if self._cross_origin(asked) and "HTTP_ACCESS_CONTROL_REQUEST_METHOD" in asked.environ:
                headers += [
                    ("Access-Control-Allow-Methods", allow),
                    ("Access-Control-Max-Age", PREFLIGHT_SECONDS),
                    ("Access-Control-Allow-Headers", "Content-Type, Accept, If-None-Match"),
                ]
        return self.respond(asked, b"", 204, headers)

    def tagged(self, tag: str) -> Headers:
        """Headers of an answer that caches may keep."""
        return [("ETag", tag), self.cached, ("Vary", "Accept, Origin" if self.origins else "Accept")]


def new_request_id() -> str:
    """Make a name for one request, so that a client's report finds its log line."""
    return secrets.token_hex(16)


def entity_tag(representation: str, path: str, query: bytes = b"") -> str:
    """Tag an answer that follows from version, address and representation alone, without computing it."""
    name = f"{__version__} {representation} {path}?".encode() + query
    return f'"{hashlib.sha256(name).hexdigest()[:32]}"'


def not_modified(asked: Request, tag: str) -> bool:
    """Tell whether the client holds this very answer (weakly compared: a gateway's compression weakens tags)."""
    given = asked.environ.get("HTTP_IF_NONE_MATCH")
    return given is not None and (given.strip() == "*" or asked.if_none_match.contains_weak(tag[1:-1]))


def fingerprint(path: str, separator: bytes, rest: bytes) -> str:
    """Name a request by what was sent: path, a newline and the body, or path?query."""
    return "sha256:" + hashlib.sha256(path.encode() + separator + rest).hexdigest()


def dump(value: Any) -> bytes:
    """Print JSON: shortest digits that read back as the same double."""
    return orjson.dumps(value, option=orjson.OPT_SERIALIZE_NUMPY)
