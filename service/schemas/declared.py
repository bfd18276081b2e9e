"""A tagged union of declared classes: the field that reads and prints it, derived from their registry."""

from collections.abc import Iterable, Iterator, Mapping
from typing import Any, ClassVar

from marshmallow import ValidationError

from service.core.declared import Declared, Parameterisation
from service.core.returns.model import Option
from service.schemas.faults import Fault, closest_to, required, shown, unknown
from service.schemas.fields import ChoiceField, Given, StrictField
from service.schemas.json_schema import class_name, closed_object, reference
from service.schemas.members import read_object
from service.schemas.numbers import parameter_schema, read_parameter


class DeclaredField(StrictField):
    """An object whose tag names a declared class and whose other members are that class's parameters.

    `extras` are fields that every kind takes besides; `arrays`: whether a parameter may be an array.
    """

    tag: ClassVar[str]
    kinds: ClassVar[Mapping[str, type[Declared]]]
    unknown_code: ClassVar[str]
    component: ClassVar[str]
    extras: ClassVar[Mapping[str, StrictField]] = {}
    arrays: ClassVar[bool] = True

    def build(self, kind: type[Declared], way: Parameterisation, numbers: Mapping[str, Any], extras: Any) -> Any:  # noqa: ARG002
        """Make the core object of what was read. Raises DoesNotFit."""
        return kind.make(way, numbers)

    def read(self, value: Any) -> Given:
        given = read_object(value)
        kind = self._kind(given.pop(self.tag, None))
        own = {name: given.pop(name) for name in self.extras if name in given} if self.extras else {}
        faults: dict[str, Any] = {}
        way = self._way(kind, given, faults)
        numbers = read_parameters(kind, way, given, self, faults)
        extras = {}
        for name, entry in own.items():
            try:
                extras[name] = self._extra(name).read(entry)
            except ValidationError as error:
                faults[name] = error.messages
        if faults:
            raise ValidationError(faults)
        return Given(numbers | extras if extras else numbers, lambda: self.build(kind, way, numbers, extras), way.lists)

    def _kind(self, name: Any) -> type[Declared]:
        if name is None:
            raise ValidationError({self.tag: [required(self.tag)]})
        kind = self.kinds.get(name) if type(name) is str else None
        if kind is None:
            closest = closest_to(name, self.kinds) if type(name) is str else None
            words = f"There is no {self.tag} {shown(str(name))}" + (f"; the closest is {closest}." if closest else ".")
            raise ValidationError(
                {self.tag: [Fault(self.unknown_code, words, {"closest": closest} if closest else {})]}
            )
        return kind

    def _way(self, kind: type[Declared], given: dict[str, Any], faults: dict[str, Any]) -> Parameterisation:
        """Give the way that the parameters are given in: named by the kind's option, else the one that fits best."""
        option = self.option_of(kind)
        if option is None or option.name not in given:
            return choose_way(kind, given)
        try:
            word = ChoiceField(option.meaning, tuple(option.ways)).read(given.pop(option.name))
        except ValidationError as error:
            faults[option.name] = error.messages
            return kind.parameterisations[0]
        return option.ways[word] or kind.parameterisations[0]

    def option_of(self, kind: type[Declared]) -> Option | None:
        """Give a word beside the parameters that says how they are to be read, if the kind has one."""
        return getattr(kind, "option", None)

    def _extra(self, name: str) -> StrictField:
        field = self.extras[name]
        field.limits = self.limits
        return field

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:
        if self.component not in components:
            names = [name for kind in self.kinds.values() for name in self._print_kind(kind, components)]
            components[self.component] = {"oneOf": [reference(name) for name in names]}
        return reference(self.component)

    def kind_schema(self, name: str) -> dict[str, Any]:
        """Print one kind on its own."""
        components: dict[str, Any] = {}
        self._print_kind(self.kinds[name], components)
        shapes = list(components.values())
        return shapes[0] if len(shapes) == 1 else {"oneOf": shapes}

    def _print_kind(self, kind: type[Declared], components: dict[str, Any]) -> list[str]:
        every = [name for way in kind.parameterisations for name in way.parameters]
        stem = class_name(kind.name) + self.component
        names = []
        for name, way, word, may_be_left_out in self._branches(kind):
            shape: dict[str, Any] = {self.tag: {"type": "string", "const": kind.name}} | word
            shape |= {n: parameter_schema(p, self.limits, self.arrays) for n, p in way.parameters.items()}
            shape |= {n: self._extra(n).printed(components) for n in self.extras}
            optional = [*may_be_left_out, *(n for n, p in way.parameters.items() if not p.required), *self.extras]
            components[stem + name] = closed_object(
                shape, optional=optional, never=every, description=describe_kind(kind, way)
            )
            names.append(stem + name)
        return names

    def _branches(self, kind: type[Declared]) -> Iterator[tuple[str, Parameterisation, dict[str, Any], list[str]]]:
        """Give each way to give the parameters: end of its name, the way, the option's word, what may be left out."""
        option = self.option_of(kind)
        if option is None:
            for position, way in enumerate(kind.parameterisations):
                yield f"By{way_name(way)}" if position else "", way, {}, []
            return
        for position, (word, named) in enumerate(option.ways.items()):
            schema = {option.name: {"type": "string", "const": word, "description": option.meaning}}
            yield (
                (class_name(word) if position else ""),
                named or kind.parameterisations[0],
                schema,
                ([] if position else [option.name]),
            )


def way_name(way: Parameterisation) -> str:
    """Name another way to give the parameters by those that it is about."""
    return "And".join(class_name(name) for name in way.parameters)


def first_sentence(kind: type[Declared]) -> str:
    """What the class is used for, as its docstring opens."""
    return " ".join((kind.__doc__ or "").strip().split("\n\n")[0].split())


def describe_kind(kind: type[Declared], way: Parameterisation) -> str:
    """What the class is used for, and the rules between its parameters."""
    rules = "; ".join(rule.words for rule in way.rules)
    return first_sentence(kind) + (f" Rules: {rules}." if rules else "")


def choose_way(kind: type[Declared], given: Mapping[str, Any]) -> Parameterisation:
    """Of the ways to give the parameters, the one that most of the given ones belong to; the first at a tie."""
    if len(kind.parameterisations) == 1:
        return kind.parameterisations[0]
    return max(kind.parameterisations, key=lambda way: sum(name in given for name in way.parameters))


def read_parameters(
    kind: type[Declared], way: Parameterisation, given: Mapping[str, Any], field: DeclaredField, faults: dict[str, Any]
) -> dict[str, Any]:
    """Read every parameter; what does not fit is added to `faults`."""
    numbers: dict[str, Any] = {}
    parameters = way.parameters
    for name, value in given.items():
        if name in parameters:
            try:
                numbers[name] = read_parameter(parameters[name], value, field.limits, field.arrays)
            except ValidationError as error:
                faults[name] = error.messages
        else:
            faults[name] = [stranger(kind, way, name, given, field.extras)]
    for name, parameter in parameters.items():
        if name not in given and parameter.required:
            faults[name] = [required(name, kind.name)]
    return numbers


def stranger(
    kind: type[Declared], way: Parameterisation, name: str, given: Mapping[str, Any], extras: Iterable[str]
) -> Fault:
    """Refuse a member that is no parameter of the chosen way: of another way, or of none."""
    if any(name in other.parameters for other in kind.parameterisations):
        wanted = ", ".join(way.parameters)
        return Fault(
            "does_not_go_together",
            f"{name} belongs to another way of giving {kind.name} than {wanted}.",
            {"beside": list(way.parameters)},
        )
    missing = [n for n in way.parameters if n not in given]
    return unknown(name, [*way.parameters, *extras], missing)
