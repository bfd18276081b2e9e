"""Examples of the document: the declared questions, and what this very service answers to them."""

from typing import Any

import orjson
from marshmallow import ValidationError

from service.edge.mount import MountedEndpoint
from service.edge.respond import dump

DIGITS = 10
"""Figures of examples are rounded, so that the last bit of another machine does not change the document."""


def examples(mounted: MountedEndpoint) -> tuple[dict[str, Any], dict[str, Any]]:
    """Give questions and answers by name; a question beyond the running limits is left out."""
    asked, answered = {}, {}
    for title, question in mounted.declared.examples.items():
        try:
            answer = mounted.reply(dump(question))
        except ValidationError:
            continue
        name = title.replace(" ", "_")
        asked[name] = {"summary": title, "value": question}
        answered[name] = {"summary": title, "value": rounded(as_plain(answer))}
    return asked, answered


def as_plain(answer: dict[str, Any]) -> Any:
    """Give an answer as a client reads it."""
    return orjson.loads(dump(answer))


def rounded(value: Any) -> Any:
    """Round every figure to ten significant digits."""
    if isinstance(value, dict):
        return {name: rounded(inner) for name, inner in value.items()}
    if isinstance(value, list):
        return [rounded(inner) for inner in value]
    return float(f"{value:.{DIGITS}g}") if isinstance(value, float) else value
