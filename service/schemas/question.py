"""A question: a closed object of fields, alone or in a batch."""

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np
from marshmallow import RAISE, Schema, ValidationError

from service.core.errors import DoesNotFit
from service.schemas.faults import Fault, as_messages, refuse, required, unknown
from service.schemas.fields import MISSING, Given
from service.schemas.limits import Limits

STRANGER = "stranger"
"""Stands in marshmallow's messages until the question says what was perhaps meant."""


@dataclass(frozen=True, slots=True)
class Asked:
    """A question that fits: core objects and numbers by field, and the length of its arrays (None: none)."""

    values: Mapping[str, Any]
    given: Mapping[str, Any]
    """What each field was given, as numbers: what cautions look at."""
    length: int | None

    def __getitem__(self, name: str) -> Any:
        return self.values[name]

    def get(self, name: str, default: Any = None) -> Any:
        """Give a field that may have been left out."""
        return self.values.get(name, default)


class Question(Schema):
    """Base of every question.

    `shapes` lists the sets of fields that go together, each with the fields that it needs; the first shape whose
    needed fields are all given is the one that is meant.
    """

    class Meta:
        """Refuse unknown fields."""

        unknown = RAISE

    shapes: ClassVar[tuple[tuple[str, ...], ...]] = ()
    """Ways to ask: the fields of each, the first of which tells it apart. Empty: one way, all fields."""
    error_messages: ClassVar[dict[str, str]] = {"unknown": STRANGER}  # type: ignore[misc]  # as in marshmallow

    def __init__(self, limits: Limits) -> None:
        self.limits = limits
        super().__init__()
        self._alternatives = {shape[0] for shape in self.shapes}

    def on_bind_field(self, field_name: str, field_obj: Any) -> None:  # noqa: ARG002
        """Tell each field the limits of this service."""
        field_obj.limits = self.limits

    def handle_error(self, error: ValidationError, data: Any, **kwargs: Any) -> None:  # noqa: ARG002
        """Name what marshmallow found itself: unknown fields, missing ones."""
        messages: Any = error.messages
        for name, found in messages.items():
            if found == [MISSING]:
                messages[name] = [required(name)]
            elif found == [STRANGER]:
                messages[name] = [self._stranger(name, data)]

    def _stranger(self, name: str, data: Mapping[str, Any]) -> Fault:
        missing = [n for n, f in self.fields.items() if f.required and data.get(n) is None]
        return unknown(name, [*self.fields, "questions"], missing)

    def ask(self, data: Any) -> Asked:
        """Read one question. Raises ValidationError with every fault."""
        if type(data) is not dict:
            raise refuse("not_an_object", "A JSON object is needed.")
        loaded = {name: value for name, value in self.load(data).items() if value is not None}
        if self.shapes:
            self._check_shape(loaded)
        length = common_length(loaded)
        return Asked(self._make(loaded), {n: v.numbers if type(v) is Given else v for n, v in loaded.items()}, length)

    def _check_shape(self, loaded: Mapping[str, Any]) -> None:
        told = [name for name in loaded if name in self._alternatives]
        if not told:
            raise refuse(
                "required",
                "One of " + " and ".join(sorted(self._alternatives)) + " is needed.",
                one_of=sorted(self._alternatives),
            )
        shape = next(shape for shape in self.shapes if shape[0] == told[0])
        strangers = [name for name in loaded if name not in shape]
        if strangers:
            raise ValidationError(
                {
                    name: [
                        Fault(
                            "does_not_go_together",
                            f"{name} does not go together with {told[0]}.",
                            {"beside": [told[0]]},
                        )
                    ]
                    for name in strangers
                }
            )

    @staticmethod
    def _make(loaded: Mapping[str, Any]) -> dict[str, Any]:
        made, faults = {}, {}
        for name, value in loaded.items():
            try:
                made[name] = value.make() if type(value) is Given else value
            except DoesNotFit as error:
                faults[name] = as_messages(error)
        if faults:
            raise ValidationError(faults)
        return made


def common_length(loaded: Mapping[str, Any]) -> int | None:
    """Give the one length of all arrays of a question, or None where there are none. Raises ValidationError."""
    first: int | None = None
    faults: dict[str, Any] = {}
    for path, array in arrays_of(loaded):
        if first is None:
            first = array.size
        elif array.size != first:
            place = faults
            for step in path[:-1]:
                place = place.setdefault(step, {})
            place[path[-1]] = [
                Fault(
                    "lengths_differ",
                    f"All arrays of one question have one length: the first has "
                    f"{first} entries, {path[-1]} has {array.size}.",
                    {"given": array.size, "expected": first},
                )
            ]
    if faults:
        raise ValidationError(faults)
    return first


def arrays_of(loaded: Mapping[str, Any]) -> Iterator[tuple[tuple[str, ...], Any]]:
    """Give every array of a question that sets its length, with the way to it."""
    for name, value in loaded.items():
        if type(value) is np.ndarray:
            yield (name,), value
        elif type(value) is Given:
            for inner, number in value.numbers.items():
                if type(number) is np.ndarray and inner not in value.lists:
                    yield (name, inner), number


def ask_batch(question: Question, data: Mapping[str, Any]) -> list[Asked]:
    """Read `{"questions": [...]}`; one that does not fit refuses the whole, naming every fault by its pointer."""
    faults: dict[Any, Any] = {
        name: [
            Fault("does_not_go_together", f"{name} stands inside each of the questions.", {"beside": ["questions"]})
            if name in question.fields
            else unknown(name, ["questions"])
        ]
        for name, value in data.items()
        if name != "questions" and not (value is None and name in question.fields)
    }
    asked, inner = _ask_each(question, data["questions"])
    if inner:
        faults["questions"] = inner
    if faults:
        raise ValidationError(faults)
    return asked


def _ask_each(question: Question, questions: Any) -> tuple[list[Asked], Any]:
    most = question.limits.questions
    if type(questions) is not list:
        return [], [Fault("not_an_array", "A JSON array of questions is needed.")]
    if not questions:
        return [], [Fault("empty", "A batch needs a question.")]
    if len(questions) > most:
        return [], [
            Fault(
                "too_many",
                f"At most {most} questions; these are {len(questions)}.",
                {"given": len(questions), "limit": most},
            )
        ]
    asked, faults = [], {}
    for index, one in enumerate(questions):
        try:
            asked.append(question.ask(one))
        except ValidationError as error:
            faults[index] = error.messages
    return asked, faults
