"""The kinds of field a question has. Each reads itself strictly and prints itself as JSON Schema."""

from collections.abc import Callable, Iterable, Iterator, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from marshmallow import ValidationError
from marshmallow.fields import Field

from service.core.arrays import Numbers
from service.core.errors import DoesNotFit
from service.core.parameters import Parameter
from service.schemas.faults import as_messages, closest_to, refuse
from service.schemas.limits import DEFAULT_LIMITS, Limits
from service.schemas.numbers import number_list, number_schema, parameter_schema, read_array, read_parameter


@dataclass(frozen=True, slots=True)
class Given:
    """What one field of a question was given: its numbers, and the core object that they make.

    `make` is called when the lengths of all arrays of the question are known to agree; it raises DoesNotFit.
    """

    numbers: Mapping[str, float | Numbers]
    make: Callable[[], Any]
    lists: frozenset[str] = frozenset()
    """Names of lists that belong together and so do not set the length of the question."""


MISSING = "missing"
"""Stands in marshmallow's messages until the question names the field."""
MESSAGES: dict[str, str | list[Any] | dict[Any, Any]] = {"required": MISSING, "null": MISSING}


class StrictField(Field[Any]):
    """A field where null is the same as left out, and that prints its own schema."""

    default_error_messages = MESSAGES
    limits: Limits = DEFAULT_LIMITS

    def __init__(self, meaning: str = "", *, required: bool = False) -> None:
        super().__init__(required=required, allow_none=not required)
        self.meaning = meaning

    @property
    def members(self) -> Iterable[str] | None:
        """Names that stand in a flat query in place of this field's object; None: the field is not an object."""
        return None

    @property
    def lists(self) -> frozenset[str]:
        """Names in a flat query that are lists even with one entry."""
        return frozenset()

    @property
    def only_in_post(self) -> frozenset[str]:
        """Members that a flat query cannot hold."""
        return frozenset()

    def read(self, value: Any) -> Any:
        """Turn a JSON value into what the core takes. Raises ValidationError."""
        raise NotImplementedError

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:
        """Give the JSON Schema of the field, adding what it refers to to `components`."""
        raise NotImplementedError

    def flat(self, name: str) -> Iterator[tuple[str, str, dict[str, Any]]]:
        """Give the names that stand for this field in a flat query, each with its meaning and schema."""
        yield name, self.meaning, self.printed({})

    def _deserialize(self, value: Any, attr: str | None, data: Any, **kwargs: Any) -> Any:  # noqa: ARG002
        return self.read(value)


class NumberField(StrictField):
    """A number within declared limits, or an array of them."""

    def __init__(self, parameter: Parameter, *, required: bool = False, arrays: bool = True) -> None:
        super().__init__(parameter.meaning, required=required)
        self.parameter = parameter
        self.arrays = arrays

    def read(self, value: Any) -> float | Numbers:
        self.parameter.name = self.name or ""
        return read_parameter(self.parameter, value, self.limits, self.arrays)

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:  # noqa: ARG002
        return parameter_schema(self.parameter, self.limits, self.arrays)

    def flat(self, name: str) -> Iterator[tuple[str, str, dict[str, Any]]]:
        yield name, self.meaning, number_list(self.limits)


class LevelsField(StrictField):
    """A short list of numbers within declared limits, which does not set the length of the question."""

    def __init__(self, parameter: Parameter, most: int) -> None:
        super().__init__(parameter.meaning)
        self.parameter = parameter
        self.most = most

    def read(self, value: Any) -> tuple[float, ...]:
        if type(value) is not list:
            raise refuse("not_an_array", "A JSON array of numbers is needed.")
        read = read_array(value, self.most)
        self.parameter.name = self.name or ""
        refusals = self.parameter.refusals(read)
        if refusals:
            raise ValidationError(as_messages(DoesNotFit(refusals))[self.parameter.name])
        return tuple(read.tolist())

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:  # noqa: ARG002
        one = number_schema(self.parameter)
        return {"type": "array", "items": one, "minItems": 1, "maxItems": self.most, "description": self.meaning}


class ChoiceField(StrictField):
    """One of several words."""

    def __init__(self, meaning: str, allowed: tuple[str, ...], *, required: bool = False) -> None:
        super().__init__(meaning, required=required)
        self.allowed = allowed

    def read(self, value: Any) -> str:
        if type(value) is not str:
            raise refuse("not_text", f"One of {', '.join(self.allowed)} is needed.", allowed=list(self.allowed))
        if value not in self.allowed:
            raise refuse(
                "unknown_choice",
                f"One of {', '.join(self.allowed)} is needed.",
                allowed=list(self.allowed),
                closest=closest_to(value, self.allowed),
            )
        return value

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:  # noqa: ARG002
        return {"type": "string", "enum": list(self.allowed), "description": self.meaning}


class TruthField(StrictField):
    """true or false."""

    def read(self, value: Any) -> bool:
        if type(value) is not bool:
            raise refuse("not_true_or_false", "true or false is needed.")
        return value

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:  # noqa: ARG002
        return {"type": "boolean", "description": self.meaning}


class TextField(StrictField):
    """Text that is echoed unchanged."""

    def __init__(self, meaning: str, most: int) -> None:
        super().__init__(meaning)
        self.most = most

    def read(self, value: Any) -> str:
        if type(value) is not str:
            raise refuse("not_text", "A JSON string is needed.")
        if len(value) > self.most:
            raise refuse(
                "too_long",
                f"At most {self.most} characters; these are {len(value)}.",
                given=len(value),
                limit=self.most,
            )
        return value

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:  # noqa: ARG002
        return {"type": "string", "maxLength": self.most, "description": self.meaning}


class SeriesField(StrictField):
    """An observed series, which does not set the length of the question."""

    def read(self, value: Any) -> Given:
        if type(value) is not list:
            raise refuse("not_an_array", "A JSON array of numbers is needed.")
        series = read_array(value, self.limits.entries)
        return Given({}, lambda: series)

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:  # noqa: ARG002
        return number_list(self.limits) | {"description": self.meaning}


class MatrixField(StrictField):
    """A square matrix of numbers, row by row."""

    most = 1000

    def read(self, value: Any) -> Numbers:
        if type(value) is not list or not all(type(row) is list for row in value):
            raise refuse("not_an_array", "A JSON array of rows is needed, each an array of numbers.")
        if not value:
            raise refuse("empty", "A matrix needs a row.")
        if len(value) > self.most:
            raise refuse("too_many", f"At most {self.most} rows.", given=len(value), limit=self.most)
        rows, faults = [], {}
        for index, row in enumerate(value):
            try:
                rows.append(read_array(row, self.most))
                if len(row) != len(value):
                    raise refuse(
                        "lengths_differ",
                        f"A square matrix of {len(value)} rows needs as many columns.",
                        given=len(row),
                        expected=len(value),
                    )
            except ValidationError as error:
                faults[index] = error.messages
        if faults:
            raise ValidationError(faults)
        return np.stack(rows)

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:  # noqa: ARG002
        row = {"type": "array", "items": {"type": "number", "format": "double"}, "minItems": 1, "maxItems": self.most}
        return {"type": "array", "items": row, "minItems": 1, "maxItems": self.most, "description": self.meaning}
