"""Objects of fields inside a question, and lists of such objects."""

from collections.abc import Iterable, Mapping
from typing import Any

from marshmallow import ValidationError

from service.schemas.faults import Fault, refuse, required, unknown
from service.schemas.fields import StrictField
from service.schemas.json_schema import closed_object
from service.schemas.limits import Limits


def read_object(value: Any) -> dict[str, Any]:
    """Refuse what is no JSON object; null members are the same as left out."""
    if type(value) is not dict:
        raise refuse("not_an_object", "A JSON object is needed.")
    return {name: entry for name, entry in value.items() if entry is not None}


def read_members(
    given: Mapping[str, Any], inner: Mapping[str, StrictField], limits: Limits
) -> tuple[dict[str, Any], dict[str, Any]]:
    """Read the members of an object; give what was found, and the faults."""
    found: dict[str, Any] = {}
    faults: dict[str, Any] = {}
    for name, entry in given.items():
        field = inner.get(name)
        if field is None:
            missing = [n for n, f in inner.items() if f.required and n not in given]
            faults[name] = [unknown(name, inner, missing)]
            continue
        field.name, field.limits = name, limits
        try:
            found[name] = field.read(entry)
        except ValidationError as error:
            faults[name] = error.messages
    return found, faults


def read_rows(
    value: Any, inner: Mapping[str, StrictField], needed: Iterable[str], limits: Limits, *, least: int = 1
) -> list[dict[str, Any]]:
    """Read a list of objects that each need some of their members. Raises ValidationError."""
    if type(value) is not list:
        raise refuse("not_an_array", "A JSON array of objects is needed.")
    if len(value) < least:
        raise refuse("empty", "A list needs an entry.")
    if len(value) > limits.rows:
        raise refuse(
            "too_many",
            f"At most {limits.rows} entries; these are {len(value)}.",
            given=len(value),
            limit=limits.rows,
        )
    rows: list[dict[str, Any]] = []
    faults: dict[int, Any] = {}
    for index, entry in enumerate(value):
        if type(entry) is not dict:
            faults[index] = [Fault("not_an_object", "A JSON object is needed.")]
            continue
        row = read_object(entry)
        found, wrong = read_members(row, inner, limits)
        wrong |= {name: [required(name)] for name in needed if name not in row}
        rows.append(found)
        if wrong:
            faults[index] = wrong
    if faults:
        raise ValidationError(faults)
    return rows


class GroupField(StrictField):
    """An object of fields that may each be left out."""

    def __init__(self, meaning: str, inner: Mapping[str, StrictField]) -> None:
        super().__init__(meaning)
        self.inner = inner

    def read(self, value: Any) -> dict[str, Any]:
        found, faults = read_members(read_object(value), self.inner, self.limits)
        if faults:
            raise ValidationError(faults)
        return found

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:
        for field in self.inner.values():
            field.limits = self.limits
        members = {name: field.printed(components) for name, field in self.inner.items()}
        return closed_object(members, optional=members, description=self.meaning)
