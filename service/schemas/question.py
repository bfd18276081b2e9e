"""A question: a closed object of fields, alone or in a batch."""

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from itertools import product
from typing import Any, ClassVar

import numpy as np
from marshmallow import RAISE, Schema, ValidationError

from service.core.arrays import number
from service.core.errors import DoesNotFit
from service.schemas.faults import WHOLE, Fault, as_messages, refuse, required, unknown
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
    """Base of every question."""

    class Meta:
        """Refuse unknown fields."""

        unknown = RAISE

    one_of: ClassVar[tuple[tuple[str, ...], ...]] = ()
    """Groups of fields of each of which exactly one is given, and tells which way of asking is meant."""
    belongs_to: ClassVar[Mapping[str, str]] = {}
    """Other fields that go together with one way of asking alone."""
    arrays: ClassVar[bool] = True
    """Whether numbers may be arrays, each entry a question of its own."""
    error_messages: ClassVar[dict[str, str]] = {"unknown": STRANGER}  # type: ignore[misc]  # as in marshmallow

    def __init__(self, limits: Limits, batch: bool) -> None:
        self.service_limits = limits
        self.batch = batch
        super().__init__()

    def on_bind_field(self, field_name: str, field_obj: Any) -> None:  # noqa: ARG002
        """Tell each field the limits of this service."""
        field_obj.limits = self.service_limits

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
        return unknown(name, [*self.fields, *(["questions"] if self.batch else [])], missing)

    def ask(self, data: Any) -> Asked:
        """Read one question. Raises ValidationError with every fault."""
        if type(data) is not dict:
            raise refuse("not_an_object", "A JSON object is needed.")
        loaded = {name: value for name, value in self.load(data).items() if value is not None}
        if self.one_of:
            self._check_way(loaded)
        if not self.arrays:
            refuse_arrays(loaded)
        length = common_length(loaded)
        return Asked(self._make(loaded), {n: v.numbers if type(v) is Given else v for n, v in loaded.items()}, length)

    def _check_way(self, loaded: Mapping[str, Any]) -> None:
        faults: dict[str, Any] = {}
        for group in self.one_of:
            told = [name for name in group if name in loaded]
            if not told:
                words = f"One of {' and '.join(group)} is needed."
                faults.setdefault(WHOLE, []).append(Fault("required", words, {"one_of": list(group)}))
                continue
            strangers = [n for n, home in self.belongs_to.items() if n in loaded and home in group and home != told[0]]
            for name in (*told[1:], *strangers):
                words = f"{name} does not go together with {told[0]}."
                faults[name] = [Fault("does_not_go_together", words, {"beside": [told[0]]})]
        if faults:
            raise ValidationError(faults)

    def ways(self) -> dict[tuple[str, ...], list[str]]:
        """Give the fields of each way of asking, by the fields that tell it."""
        telling = {name for group in self.one_of for name in group}
        return {
            told: [
                n for n in self.fields if n in told or (n not in telling and self.belongs_to.get(n, n) in (n, *told))
            ]
            for told in product(*self.one_of)
        }

    @staticmethod
    def _make(loaded: Mapping[str, Any]) -> dict[str, Any]:
        made, faults = {}, {}
        for name, value in loaded.items():
            try:
                made[name] = value.make() if type(value) is Given else number(value) if type(value) is float else value
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


def refuse_arrays(loaded: Mapping[str, Any]) -> None:
    """Refuse every array of a question that is about one law. Raises ValidationError."""
    faults: dict[str, Any] = {}
    for path, _ in arrays_of(loaded):
        place = faults
        for step in path[:-1]:
            place = place.setdefault(step, {})
        place[path[-1]] = [Fault("no_arrays", "One number is needed here, not a list.")]
    if faults:
        raise ValidationError(faults)


def arrays_of(loaded: Mapping[str, Any]) -> Iterator[tuple[tuple[str, ...], Any]]:
    """Give every array of a question that sets its length, with the way to it."""
    for name, value in loaded.items():
        if type(value) is np.ndarray and value.ndim == 1:  # a matrix is no list of questions
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
    most = question.service_limits.questions
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
