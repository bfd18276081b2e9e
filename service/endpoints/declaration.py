"""How an endpoint declares itself. The edge turns each declaration into routes and a part of the document."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Any, TypeAlias

from service.schemas.answers import AnswerShape, Result, write_answer
from service.schemas.question import Asked, Question

Write: TypeAlias = Callable[[Result, int | None, str | None], dict[str, Any]]
Work: TypeAlias = Callable[[Asked], float]


def hardly_any(asked: Asked) -> float:  # noqa: ARG001
    """Count a question whose cost lies in reading and writing it."""
    return 0.0


@dataclass(frozen=True)
class Endpoint:
    """A question that is computed: one URL."""

    path: str
    name: str
    """Stem of its component names and operation ids, as in Probability."""
    question: type[Question]
    answers: tuple[AnswerShape, ...]
    compute: Callable[[Asked], Result]
    get: bool
    batch: bool
    examples: Mapping[str, Any]
    """Requests by title, that tests send."""
    write: Write
    """Puts the figures into the form of the answer."""
    work: Work
    """Counts the microseconds that a question asks for, before anything is computed."""


@dataclass(frozen=True)
class Catalogue:
    """A fixed list that is read: one URL, perhaps with a name in it."""

    path: str
    name: str
    read: Callable[..., dict[str, Any] | None]
    schema: Mapping[str, Any]
    parameters: Mapping[str, list[str]] = field(default_factory=dict)
    """Names in the path with the values that they can take."""


ENDPOINTS: list[Endpoint] = []
CATALOGUES: list[Catalogue] = []


def endpoint(
    path: str,
    *,
    name: str,
    question: type[Question],
    answers: tuple[AnswerShape, ...],
    examples: Mapping[str, Any],
    get: bool = False,
    batch: bool = True,
    write: Write = write_answer,
    work: Work = hardly_any,
) -> Callable[[Callable[[Asked], Result]], Callable[[Asked], Result]]:
    """Declare the function below as the answer to a question; its docstring is the operation's summary."""

    def add(compute: Callable[[Asked], Result]) -> Callable[[Asked], Result]:
        ENDPOINTS.append(Endpoint(path, name, question, answers, compute, get, batch, examples, write, work))
        return compute

    return add


def catalogue(
    path: str, *, name: str, schema: Mapping[str, Any], parameters: Mapping[str, list[str]] | None = None
) -> Callable[[Callable[..., dict[str, Any] | None]], Callable[..., dict[str, Any] | None]]:
    """Declare the function below as a catalogue; it gives None for a name that it does not have."""

    def add(read: Callable[..., dict[str, Any] | None]) -> Callable[..., dict[str, Any] | None]:
        CATALOGUES.append(Catalogue(path, name, read, schema, parameters or {}))
        return read

    return add
