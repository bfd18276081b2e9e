"""A flat query: the body that it stands for, and faults by parameter."""

import math
import re
from collections.abc import Mapping
from typing import Any
from urllib.parse import unquote_to_bytes

from marshmallow import ValidationError

from service.edge.strict_json import Unreadable
from service.schemas.faults import Fault, shown, unknown
from service.schemas.question import Asked, Question

BROKEN_PERCENT = re.compile(rb"%(?![0-9A-Fa-f]{2})")
NUMBER = re.compile(r"-?(0|[1-9][0-9]*)(\.[0-9]+)?([eE][+-]?[0-9]+)?")
OF_QUERY = "?"
"""Marks faults of the query itself: a parameter may have the name of a field of the body."""


class FlatQuery:
    """How the fields of one question stand side by side in a query."""

    def __init__(self, question: Question) -> None:
        self.question = question
        self.homes: dict[str, str | None] = {}
        self.lists: set[str] = set()
        self.only_in_post: set[str] = {"questions"} if question.batch else set()
        for name, field in question.fields.items():
            members = getattr(field, "members", None)
            self.homes.update({name: None} if members is None else dict.fromkeys(members, name))
            self.lists |= getattr(field, "lists", frozenset())
            self.only_in_post |= getattr(field, "only_in_post", frozenset())

    def ask(self, raw: bytes) -> Asked:
        """Read a query's bytes as sent. Raises Unreadable or ValidationError."""
        body, faults = self._body(raw)
        optional = [name for name, field in self.question.fields.items() if not field.required]
        body = {name: value for name, value in body.items() if value != {} or name not in optional}
        try:
            asked = self.question.ask(body)
        except ValidationError as error:
            raise ValidationError({**_as_dict(error.messages), **faults}) from None
        if faults:
            raise ValidationError(faults)
        return asked

    def _body(self, raw: bytes) -> tuple[dict[str, Any], dict[str, Any]]:
        if BROKEN_PERCENT.search(raw):
            raise Unreadable("broken_percent", "The percent-encoding of the query is broken.")
        body: dict[str, Any] = {home: {} for home in self.homes.values() if home}
        faults: dict[str, Any] = {}
        seen = set()
        for part in filter(None, raw.split(b"&")):
            name, value = _pair(part)
            if name in seen:
                faults[OF_QUERY + name] = [Fault("given_twice", f"{shown(name)} stands twice; a list has commas.")]
            elif name in self.only_in_post:
                faults[OF_QUERY + name] = [Fault("only_in_post", f"{name} can be sent by POST alone.")]
            elif name not in self.homes:
                faults[OF_QUERY + name] = [unknown(name, self.homes)]
            else:
                home = self.homes[name]
                read = self._value(name, value)
                (body if home is None else body[home])[name] = read
                if _too_large(read):
                    faults[OF_QUERY + name] = [Fault("number_out_of_range", f"{name} is too large for a double.")]
            seen.add(name)
        return body, faults

    def _value(self, name: str, text: str) -> Any:
        if "," in text or name in self.lists:
            return [number_or_text(entry) for entry in text.split(",")]
        return number_or_text(text)

    def place(self, pointer: str) -> dict[str, Any]:
        """Give the parameter that a pointer into the body stands for: /distribution/mean/3 is mean, entry 3."""
        if pointer.startswith(f"/{OF_QUERY}"):
            return {"parameter": pointer.removeprefix(f"/{OF_QUERY}").replace("~1", "/").replace("~0", "~")}
        steps = pointer.split("/")[1:]
        if (
            steps
            and steps[0] in self.question.fields
            and self.homes.get(steps[0]) is None
            and steps[0] not in self.homes
        ):
            steps = steps[1:]
        found: dict[str, Any] = {"parameter": steps[0] if steps else ""}
        return found | ({"index": int(steps[1])} if len(steps) > 1 and steps[1].isdigit() else {})


def _pair(part: bytes) -> tuple[str, str]:
    name, _, value = part.partition(b"=")
    try:
        return tuple(unquote_to_bytes(text.replace(b"+", b" ")).decode() for text in (name, value))  # type: ignore[return-value]
    except UnicodeDecodeError:
        raise Unreadable("not_utf8", "The query is not UTF-8.") from None


def _as_dict(messages: Any) -> Mapping[str, Any]:
    return messages if isinstance(messages, dict) else {"_schema": messages}


def number_or_text(text: str) -> Any:
    """Read a number as JSON would; what is none stays text and is refused by its field."""
    if not NUMBER.fullmatch(text):
        return text
    if not set(text) & set(".eE"):
        return int(text) if len(text) < 400 else text
    return float(text)


def _too_large(value: Any) -> bool:
    entries = value if type(value) is list else [value]
    return any(type(entry) is float and math.isinf(entry) for entry in entries)
