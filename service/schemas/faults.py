"""What does not fit, in the form that a client gets: pointer, code, words, figures."""

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, field, replace
from difflib import get_close_matches
from typing import Any

from marshmallow import ValidationError

from service.core.codes import require_listed
from service.core.errors import DoesNotFit

WHOLE = "_schema"
"""Where marshmallow keeps what concerns an object as a whole."""


@dataclass(frozen=True, slots=True)
class Fault:
    """One fault at one place; the place is where it stands in the nested messages."""

    code: str
    detail: str
    params: Mapping[str, Any] = field(default_factory=dict)

    def __post_init__(self) -> None:
        require_listed(self.code)


def refuse(code: str, detail: str, **params: Any) -> ValidationError:
    """Make the error of one fault at the place of the field that raises it."""
    return ValidationError([Fault(code, detail, params)])


def required(name: str, by: str | None = None) -> Fault:
    """Name a field that is missing, and by what it is needed."""
    needed = f"{name} is needed by {by}." if by else f"{name} is needed."
    return Fault("required", needed, {"by": by} if by else {})


def unknown(name: str, known: Iterable[str], missing: Iterable[str] = ()) -> Fault:
    """Refuse a field that does not exist, naming the one that was perhaps meant: a missing one first."""
    closest = closest_to(name, missing) or closest_to(name, known)
    if closest is None:
        return Fault("unknown_field", f"There is no field {shown(name)} here.")
    meant = f"{closest} is missing" if closest in missing else f"the closest is {closest}"
    return Fault("unknown_field", f"There is no field {shown(name)} here; {meant}.", {"closest": closest})


def closest_to(name: str, known: Iterable[str]) -> str | None:
    """Give the known name that is spelt most like this one, if any comes near."""
    return next(iter(get_close_matches(name[:100], known, 1)), None)


def shown(text: str) -> str:
    """Shorten a client's text for a message."""
    return text if len(text) <= 60 else text[:57] + "..."


def inside(error: DoesNotFit, *steps: str | int) -> DoesNotFit:
    """Lead the refusals of an inner object from the object that holds it."""
    return DoesNotFit(replace(refusal, path=(*steps, *refusal.path)) for refusal in error.refusals)


def as_messages(error: DoesNotFit) -> dict[str | int, Any]:
    """Nest the core's refusals as marshmallow nests its messages."""
    messages: dict[str | int, Any] = {}
    for refusal in error.refusals:
        place = messages
        for step in refusal.path[:-1]:
            place = place.setdefault(step, {})
        last = refusal.path[-1] if refusal.path else WHOLE
        place.setdefault(last, []).append(Fault(refusal.code, refusal.detail, refusal.params))
    return messages


def walk(messages: Any, pointer: str = "") -> Iterator[tuple[str, Fault]]:
    """Give every fault of nested messages with its JSON Pointer (RFC 6901)."""
    if isinstance(messages, dict):
        for key, inner in messages.items():
            escaped = str(key).replace("~", "~0").replace("/", "~1")
            yield from walk(inner, pointer if key == WHOLE else f"{pointer}/{escaped}")
    else:
        for fault in messages:
            yield pointer, fault
