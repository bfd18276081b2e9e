"""The tagged union of all distribution families, derived from the registry."""

from collections.abc import Iterable, Iterator, Mapping
from typing import Any, ClassVar

from marshmallow import ValidationError

from service.core.declared import Declared, Parameterisation
from service.core.distributions import FAMILIES
from service.schemas.faults import Fault, closest_to, required, shown, unknown
from service.schemas.fields import Given, StrictField, class_name, closed_object, read_object, reference
from service.schemas.limits import Limits
from service.schemas.numbers import number_list, parameter_schema, read_parameter


class DeclaredField(StrictField):
    """An object whose tag names a declared class and whose other members are that class's parameters."""

    tag: ClassVar[str]
    kinds: ClassVar[Mapping[str, type[Declared]]]
    unknown_code: ClassVar[str]
    component: ClassVar[str]

    def read(self, value: Any) -> Given:
        given = read_object(value)
        kind = self._kind(given.pop(self.tag, None))
        way = choose_way(kind, given)
        numbers = read_parameters(kind, way, given, self.limits)
        return Given(numbers, lambda: kind.make(way, numbers), way.lists)

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

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:
        if self.component not in components:
            components[self.component] = {
                "oneOf": [
                    reference(name) for kind in self.kinds.values() for name in self._print_kind(kind, components)
                ]
            }
        return reference(self.component)

    def kind_schema(self, name: str) -> dict[str, Any]:
        """Print one kind on its own."""
        components: dict[str, Any] = {}
        self._print_kind(self.kinds[name], components)
        shapes = list(components.values())
        return shapes[0] if len(shapes) == 1 else {"oneOf": shapes}

    def _print_kind(self, kind: type[Declared], components: dict[str, Any]) -> list[str]:
        every = [name for way in kind.parameterisations for name in way.parameters]
        names = []
        for position, way in enumerate(kind.parameterisations):
            name = class_name(kind.name) + self.component + (f"By{way_name(way)}" if position else "")
            shape = {self.tag: {"type": "string", "const": kind.name}}
            shape |= {n: parameter_schema(p, self.limits) for n, p in way.parameters.items()}
            components[name] = closed_object(
                shape,
                optional=[n for n, p in way.parameters.items() if not p.required],
                never=every,
                description=describe_kind(kind, way),
            )
            names.append(name)
        return names


class DistributionField(DeclaredField):
    """A distribution: a family and its parameters."""

    tag = "family"
    kinds = FAMILIES
    unknown_code = "unknown_family"
    component = "Distribution"

    @property
    def members(self) -> Iterable[str]:
        return {
            self.tag,
            *(n for kind in self.kinds.values() for way in kind.parameterisations for n in way.parameters),
        }

    @property
    def lists(self) -> frozenset[str]:
        return frozenset(n for kind in self.kinds.values() for way in kind.parameterisations for n in way.lists)

    def flat(self, name: str) -> Iterator[tuple[str, str, dict[str, Any]]]:  # noqa: ARG002
        yield self.tag, "which distribution family", {"type": "string", "enum": list(self.kinds)}
        meanings: dict[str, list[str]] = {}
        for kind in self.kinds.values():
            for way in kind.parameterisations:
                for parameter in way.parameters.values():
                    meanings.setdefault(parameter.name, []).append(f"{kind.name}: {parameter.meaning}")
        for parameter_name, words in meanings.items():
            yield parameter_name, "; ".join(words), number_list(self.limits)


def way_name(way: Parameterisation) -> str:
    """Name another way to give the parameters by those that it is about."""
    return "And".join(class_name(name) for name in way.parameters)


def first_sentence(kind: type[Declared]) -> str:
    """What the class is used for, as its docstring opens."""
    return (kind.__doc__ or "").strip().split("\n\n")[0].replace("\n", " ").replace("    ", "")


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
    kind: type[Declared], way: Parameterisation, given: Mapping[str, Any], limits: Limits, arrays: bool = True
) -> dict[str, Any]:
    """Read every parameter, or raise ValidationError with all faults."""
    numbers: dict[str, Any] = {}
    faults: dict[str, Any] = {}
    parameters = way.parameters
    for name, value in given.items():
        if name in parameters:
            try:
                numbers[name] = read_parameter(parameters[name], value, limits, arrays)
            except ValidationError as error:
                faults[name] = error.messages
        else:
            faults[name] = [_stranger(kind, way, name, given)]
    for name, parameter in parameters.items():
        if name not in given and parameter.required:
            faults[name] = [required(name, kind.name)]
    if faults:
        raise ValidationError(faults)
    return numbers


def _stranger(kind: type[Declared], way: Parameterisation, name: str, given: Mapping[str, Any]) -> Fault:
    """Refuse a member that is no parameter of the chosen way: of another way, or of none."""
    if any(name in other.parameters for other in kind.parameterisations):
        wanted = ", ".join(way.parameters)
        return Fault(
            "does_not_go_together",
            f"{name} belongs to another way of giving {kind.name} than {wanted}.",
            {"beside": list(way.parameters)},
        )
    missing = [n for n in way.parameters if n not in given]
    return unknown(name, way.parameters, missing)
