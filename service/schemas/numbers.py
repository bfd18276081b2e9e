"""Numbers as JSON has them, read strictly: one number, or an array in a single numpy conversion."""

from typing import Any

import numpy as np
from marshmallow import ValidationError

from service.core.arrays import Numbers
from service.core.errors import DoesNotFit
from service.core.parameters import Components, Declaration, Parameter, Sample
from service.schemas.faults import as_messages, refuse, required, unknown
from service.schemas.limits import Limits

LARGEST_EXACT = 2**53
MOST_FAULTS = 100
KINDS = {str: "text", bool: "true or false", list: "a list", dict: "an object", type(None): "null"}


def read_number(value: Any, whole: bool = False) -> float:
    """Read one JSON number. Raises ValidationError."""
    kind = type(value)
    if kind is int:
        if not -LARGEST_EXACT <= value <= LARGEST_EXACT:
            raise refuse("integer_too_large", "A whole number beyond 2^53 is not exact.", limit=LARGEST_EXACT)
        return float(value)
    if kind is not float:
        raise refuse("not_a_number", f"A JSON number is needed; this is {KINDS.get(kind, 'something else')}.")
    if whole and value != int(value):
        raise refuse("must_be_whole", f"A whole number is needed; this is {value:.15g}.", given=value)
    return value  # type: ignore[no-any-return]


def read_array(values: list[Any], most: int, whole: bool = False) -> Numbers:
    """Read an array of JSON numbers by one conversion; only an unfit one is walked, to name its faults."""
    if not values:
        raise refuse("empty", "A list needs an entry.")
    if len(values) > most:
        raise refuse("too_many", f"At most {most} entries; these are {len(values)}.", given=len(values), limit=most)
    kinds = set(map(type, values))  # numpy alone would read true as 1 and "1" as 1
    if kinds <= {int, float}:
        array = np.array(values, dtype=np.float64)
        exact = int not in kinds or np.abs(array).max() < LARGEST_EXACT  # at 2^53 it may have been rounded
        if exact and not (whole and (array != np.rint(array)).any()):
            return array
    faults = _faults_by_index(values, whole)
    if faults:
        raise ValidationError(faults)
    return array


def _faults_by_index(values: list[Any], whole: bool) -> dict[int, Any]:
    faults: dict[int, Any] = {}
    for index, value in enumerate(values):
        try:
            read_number(value, whole)
        except ValidationError as error:
            faults[index] = error.messages
            if len(faults) == MOST_FAULTS:
                break
    return faults


def read_parameter(parameter: Declaration, value: Any, limits: Limits, arrays: bool = True) -> float | Numbers:
    """Read what a declared parameter was given, within its limits: a float or a float64 array.

    Raises ValidationError with the faults of this place.
    """
    if isinstance(parameter, Sample):
        if type(value) is not list:
            raise refuse("not_an_array", "A JSON array of numbers is needed.")
        read: float | Numbers = read_array(value, limits.entries)
    elif isinstance(parameter, Components):
        read = _read_components(parameter, value, limits)
    else:
        whole = isinstance(parameter, Parameter) and parameter.whole
        if type(value) is not list:
            read = read_number(value, whole)
        elif arrays:
            read = read_array(value, limits.entries, whole)
        else:
            raise refuse("no_arrays", "One number is needed here, not a list.")
    refusals = parameter.refusals(read)
    if refusals:
        raise ValidationError(as_messages(DoesNotFit(refusals))[parameter.name])
    return read


def _read_components(parameter: Components, value: Any, limits: Limits) -> Numbers:
    """Read a list of parts, each an object of numbers."""
    if type(value) is not list:
        raise refuse("not_an_array", "A JSON array of objects is needed.")
    if not value:
        raise refuse("empty", "A list needs an entry.")
    if len(value) > limits.components:
        raise refuse(
            "too_many",
            f"At most {limits.components} entries; these are {len(value)}.",
            given=len(value),
            limit=limits.components,
        )
    rows, faults = [], {}
    for index, entry in enumerate(value):
        try:
            rows.append(_read_part(parameter, entry))
        except ValidationError as error:
            faults[index] = error.messages
    if faults:
        raise ValidationError(faults)
    return parameter.as_numbers(rows)


def _read_part(parameter: Components, entry: Any) -> dict[str, float]:
    if type(entry) is not dict:
        raise refuse("not_an_object", "A JSON object is needed.")
    row: dict[str, float] = {}
    faults: dict[str, Any] = {}
    for name in entry:
        if name not in parameter.parts:
            faults[name] = [unknown(name, parameter.parts, [n for n in parameter.parts if entry.get(n) is None])]
    for name in parameter.parts:
        if entry.get(name) is None:
            faults[name] = [required(name)]
            continue
        try:
            row[name] = read_number(entry[name])
        except ValidationError as error:
            faults[name] = error.messages
    if faults:
        raise ValidationError(faults)
    return row


def parameter_schema(parameter: Declaration, limits: Limits, arrays: bool = True) -> dict[str, Any]:
    """Print a declared parameter as JSON Schema, its limits as assertions and its default in words."""
    words = parameter.meaning
    if not parameter.required:
        words += f" (default {parameter.default:.15g})"
    if isinstance(parameter, Sample):
        return number_list(limits, least=parameter.least_count) | {"description": words}
    if isinstance(parameter, Components):
        parts = {name: number_schema(part) | {"description": part.meaning} for name, part in parameter.parts.items()}
        row = {"type": "object", "properties": parts, "required": list(parts), "additionalProperties": False}
        return {"type": "array", "items": row, "minItems": 1, "maxItems": limits.components, "description": words}
    assert isinstance(parameter, Parameter)  # noqa: S101 - the kinds there are
    one = number_schema(parameter)
    if not arrays:
        return one | {"description": words}
    return {"anyOf": [one, number_list(limits, one)], "description": words}


KEYWORDS = {"above": "exclusiveMinimum", "at_least": "minimum", "below": "exclusiveMaximum", "at_most": "maximum"}


def number_schema(parameter: Parameter) -> dict[str, Any]:
    """Print one number with its limits as assertions."""
    one: dict[str, Any] = {"type": "integer"} if parameter.whole else {"type": "number", "format": "double"}
    return one | {KEYWORDS[limit.relation]: limit.bound for limit in parameter.limits}


def number_list(limits: Limits, one: dict[str, Any] | None = None, least: int = 1) -> dict[str, Any]:
    """Print an array of numbers."""
    items = one or {"type": "number", "format": "double"}
    return {"type": "array", "items": items, "minItems": least, "maxItems": limits.entries}
