"""The body of a POST, as bytes: its declared type, its coding, its length."""

import time

from flask import Request
from gunicorn.http.errors import ParseException
from werkzeug.exceptions import UnsupportedMediaType

from service.edge.respond import JSON
from service.edge.strict_json import Unreadable

PLAIN = frozenset(
    {
        JSON,
        "application/json; charset=utf-8",
        "application/json;charset=utf-8",
        "application/json; charset=UTF-8",
        "application/json;charset=UTF-8",
    }
)
DRAIN_BYTES = 32 * 2**20
DRAIN_SECONDS = 2.0


class BodyTooLarge(ValueError):
    """The body is longer than the service reads."""

    def __init__(self, limit: int) -> None:
        super().__init__(f"The body is longer than {limit} bytes.")
        self.limit = limit


def read_body(asked: Request, most: int) -> bytes:
    """Give the body's bytes. Raises UnsupportedMediaType or BodyTooLarge; never a body that was cut."""
    environ = asked.environ
    kind = environ.get("CONTENT_TYPE", "")
    if kind not in PLAIN:
        charset = asked.mimetype_params.get("charset", "utf-8").strip('"').lower()
        if asked.mimetype != JSON or charset not in ("utf-8", "utf8"):
            raise UnsupportedMediaType("The body has to be sent as application/json in UTF-8.")
    if environ.get("HTTP_CONTENT_ENCODING", "identity").lower() != "identity":
        raise UnsupportedMediaType("A compressed body is not read.")
    if (asked.content_length or 0) > most:
        _drain(asked)
        raise BodyTooLarge(most)
    if not environ.get("wsgi.input_terminated"):  # a server that leaves the end of the body to us
        return asked.get_data(cache=False)
    try:
        body: bytes = environ["wsgi.input"].read(most + 1)  # one byte more tells a longer chunked body
    except (ParseException, OSError):
        raise Unreadable("broken_body", "The body ends early, or its chunks are broken.") from None
    if len(body) > most:
        _drain(asked)
        raise BodyTooLarge(most)
    return body


def _drain(asked: Request) -> None:
    """Read on for a while: a client that is still sending would lose the answer if the connection closed now."""
    stream = asked.environ["wsgi.input"]
    left, until = DRAIN_BYTES, time.monotonic() + DRAIN_SECONDS
    if not asked.environ.get("wsgi.input_terminated"):
        left = min(left, asked.content_length or 0)
    while left > 0 and time.monotonic() < until:
        chunk = stream.read(min(65536, left))
        if not chunk:
            return
        left -= len(chunk)
