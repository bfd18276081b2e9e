"""Bytes to plain values: no NaN, no overflow, no duplicate key, no half character, no deep nesting.

orjson refuses NaN, Infinity, overflow and lone surrogates, but keeps the last of two equal keys and reads a very long
integer as a float. Every kept key has one colon of its own, so a body with just as many colons as kept keys lost none;
otherwise the slower reader of the standard library decides.
"""

import json
import re
from collections.abc import Mapping
from typing import Any

import orjson

DEEPEST = 32
SHAPES = bytes(
    ord("0") if chr(code) in "0123456789" else ord(",") if chr(code) in "[,:- \t\r\n" else code for code in range(256)
)
"""Maps every digit to 0 and whatever may stand before a number to a comma: fractions are told from integers."""
LONG = b"," + b"0" * 20
LONG_INTEGER = re.compile(rb'"(?:[^"\\]|\\.)*"|(?<![0-9.eE+-])-?[0-9]{20,}(?![0-9.eE])')


class Unreadable(ValueError):
    """The request cannot be read: a code, words, figures."""

    def __init__(self, code: str, detail: str, params: Mapping[str, Any] | None = None) -> None:
        super().__init__(detail)
        self.code = code
        self.detail = detail
        self.params = params or {}


def read(body: bytes) -> Any:
    """Read a body. Raises Unreadable."""
    if not body or body.isspace():
        raise Unreadable("no_body", "The body is empty; a JSON object is needed.")
    try:
        value = orjson.loads(body)
    except orjson.JSONDecodeError as error:
        raise _explain(body, error) from None
    if type(value) is dict or type(value) is list:
        if body.count(b":") != _count_keys(value, 1):
            json.loads(body, object_pairs_hook=_refuse_duplicates)
        if LONG in body.translate(SHAPES):
            _refuse_long_integers(body)
    return value


def _count_keys(value: Any, depth: int) -> int:
    """Count the keys of every object, refusing deep nesting on the way."""
    if depth > DEEPEST:
        raise _too_deep()
    if type(value) is dict:
        return len(value) + sum(_count_keys(v, depth + 1) for v in value.values() if type(v) is dict or type(v) is list)
    if value and (type(value[0]) is dict or type(value[0]) is list):  # a list of numbers is not walked
        return sum(_count_keys(v, depth + 1) for v in value if type(v) is dict or type(v) is list)
    return 0


def _too_deep() -> Unreadable:
    return Unreadable("too_deep", f"Objects and lists are nested deeper than {DEEPEST}.", {"limit": DEEPEST})


def _refuse_duplicates(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    kept = dict(pairs)
    if len(kept) < len(pairs):
        names = [name for name, _ in pairs]
        twice = next(name for position, name in enumerate(names) if name in names[:position])
        raise Unreadable("duplicate_key", f"The key {twice[:60]!r} stands twice in one object.", {"key": twice[:200]})
    return kept


def _refuse_long_integers(body: bytes) -> None:
    for token in LONG_INTEGER.finditer(body):
        if not token.group().startswith(b'"'):
            raise Unreadable(
                "number_out_of_range",
                "An integer has more digits than a double can hold.",
                {"digits": len(token.group().lstrip(b"-"))},
            )


def _explain(body: bytes, error: orjson.JSONDecodeError) -> Unreadable:
    """Say in words of our own why a body cannot be read, and where."""
    try:
        body.decode("utf-8")
    except UnicodeDecodeError as broken:
        return Unreadable("not_utf8", f"The body is not UTF-8 at byte {broken.start}.", {"byte": broken.start})
    place = {"line": error.lineno, "column": error.colno}
    where = f"at line {error.lineno}, column {error.colno}"
    if "surrogate" in error.msg:
        return Unreadable("not_utf8", f"An escape stands for half a character {where}.", place)
    if re.search("depth limit|recursion", error.msg, re.IGNORECASE):  # orjson's own limit lies beyond ours
        return _too_deep()
    if "infinity" in error.msg:
        return Unreadable("number_out_of_range", f"A number is too large for a double {where}.", place)
    return Unreadable("not_json", f"The body is not JSON {where}.", place)
