"""An event, written by its bounds."""

from collections.abc import Iterable, Iterator
from typing import Any

from marshmallow import ValidationError

from service.core.distributions.events import Event
from service.core.parameters import Parameter
from service.schemas.faults import Fault, unknown
from service.schemas.fields import Given, StrictField
from service.schemas.json_schema import closed_object, reference
from service.schemas.members import read_object
from service.schemas.numbers import number_list, parameter_schema, read_parameter

BOUNDS = {
    "above": Parameter("the event lies above this value, without the value itself", example=1),
    "at_least": Parameter("the event lies above this value, with the value itself", example=1),
    "below": Parameter("the event lies below this value, without the value itself", example=1),
    "at_most": Parameter("the event lies below this value, with the value itself", example=1),
    "exactly": Parameter("the event is this one value", example=1),
    "within_standard_deviations": Parameter(
        "the event reaches so many standard deviations to both sides of the mean, ends included", at_least=0, example=1
    ),
}
for _name, _bound in BOUNDS.items():
    _bound.name = _name
LOWER, UPPER = ("above", "at_least"), ("below", "at_most")
SHAPES = (
    *((b,) for b in (*LOWER, *UPPER)),
    *((low, up) for low in LOWER for up in UPPER),
    ("exactly",),
    ("within_standard_deviations",),
)
ALLOWED = frozenset(frozenset(shape) for shape in SHAPES)


class EventField(StrictField):
    """What may happen: a bound, two bounds, one value, or a distance from the mean."""

    @property
    def members(self) -> Iterable[str]:
        return BOUNDS

    def read(self, value: Any) -> Given:
        given = read_object(value)
        numbers: dict[str, Any] = {}
        faults: dict[str, Any] = {}
        for name, entry in given.items():
            if name not in BOUNDS:
                faults[name] = [unknown(name, BOUNDS)]
                continue
            try:
                numbers[name] = read_parameter(BOUNDS[name], entry, self.limits)
            except ValidationError as error:
                faults[name] = error.messages
        if not faults and frozenset(given) not in ALLOWED:
            faults = {"_schema": [together(given)]}
        if faults:
            raise ValidationError(faults)
        return Given(numbers, lambda: Event.of(numbers))

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:
        if "Event" not in components:
            components["Event"] = {
                "oneOf": [
                    closed_object({n: parameter_schema(BOUNDS[n], self.limits) for n in shape}, never=BOUNDS)
                    for shape in SHAPES
                ]
            }
        return reference("Event")

    def flat(self, name: str) -> Iterator[tuple[str, str, dict[str, Any]]]:  # noqa: ARG002
        for bound, parameter in BOUNDS.items():
            yield bound, parameter.meaning, number_list(self.limits)


def together(given: Iterable[str]) -> Fault:
    """Refuse no bound at all, or bounds that cannot describe one event."""
    names = list(given)
    if not names:
        return Fault("no_event", "An event needs a bound: one of " + ", ".join(BOUNDS) + ".")
    return Fault("bounds_do_not_go_together", f"{' and '.join(names)} cannot describe one event.", {"given": names})
