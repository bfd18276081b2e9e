"""A class whose parameters stand in its body: distribution families and return models are such classes."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import ClassVar, Self

import numpy as np

from service.core.arrays import Numbers, number
from service.core.errors import DoesNotFit, Refusal
from service.core.parameters import Declaration, Parameter, Rule

Convert = Callable[..., dict[str, Numbers]]


@dataclass(frozen=True)
class Parameterisation:
    """One way to give the parameters; `convert` turns it into the first way (None: it is the first)."""

    parameters: Mapping[str, Declaration]
    rules: tuple[Rule, ...] = ()
    convert: Convert | None = None

    @cached_property
    def lists(self) -> frozenset[str]:
        """Names of the parameters that are lists and so do not stretch to the question's length."""
        return frozenset(name for name, parameter in self.parameters.items() if not isinstance(parameter, Parameter))


def alternative(convert: Convert, rules: tuple[Rule, ...] = (), **parameters: Declaration) -> Parameterisation:
    """Declare another way to give the parameters of a class: `convert` takes them by name."""
    for name, parameter in parameters.items():
        parameter.name = name
    return Parameterisation(parameters, rules, convert)


class Declared:
    """Base of classes with declared parameters; instances hold float64 values that broadcast.

    The declaration is checked when the class is made: a docstring, a name, and examples within their limits.
    """

    name: ClassVar[str] = ""
    rules: ClassVar[tuple[Rule, ...]] = ()
    alternatives: ClassVar[tuple[Parameterisation, ...]] = ()
    parameterisations: ClassVar[tuple[Parameterisation, ...]] = ()

    def __init__(self, **values: Numbers) -> None:
        vars(self).update(values)

    @classmethod
    def declare(cls) -> None:
        """Collect the parameters of a new class and refuse a declaration that is not whole."""
        if not cls.__doc__ or not cls.name:
            raise TypeError(f"{cls.__name__}: a docstring and a name are needed")
        own = {k: v for k, v in vars(cls).items() if isinstance(v, Declaration)}
        cls.parameterisations = (Parameterisation(own, cls.rules), *cls.alternatives)
        for way in cls.parameterisations:
            for name, parameter in way.parameters.items():
                if not parameter.meaning or parameter.refusals(parameter.as_numbers(parameter.example)):
                    raise TypeError(f"{cls.name}.{name}: a meaning, and an example within its limits, are needed")
            cls.make(way, {n: p.as_numbers(p.example) for n, p in way.parameters.items() if p.required})

    @classmethod
    def make(cls, way: Parameterisation, values: Mapping[str, float | Numbers]) -> Self:
        """Make an instance from values that each fit their own limits (floats, or float64 arrays that broadcast).

        Defaults are filled in, rules between parameters checked, another way converted. Raises DoesNotFit.
        """
        full = {n: number(p.default) for n, p in way.parameters.items() if not p.required and n not in values}
        full.update({n: number(v) if isinstance(v, float) else v for n, v in values.items()})
        refusals = [refusal for rule in way.rules for refusal in rule.refusals(full)]
        if refusals:
            raise DoesNotFit(refusals)
        if way.convert is None:
            return cls(**full)
        with np.errstate(all="ignore"):
            converted = way.convert(**full)
        cls._check_converted(converted)
        return cls(**converted)

    @classmethod
    def _check_converted(cls, values: Mapping[str, Numbers]) -> None:
        """Refuse a conversion that left the doubles: a spread lost to rounding, an overflow."""
        first = cls.parameterisations[0].parameters
        for name, value in values.items():
            parameter = first[name]
            fits = np.isfinite(value).all() and not parameter.refusals(value)
            if isinstance(parameter, Parameter) and not fits:
                raise DoesNotFit(
                    [
                        Refusal(
                            (),
                            "not_representable",
                            f"These parameters give a {name} that a double cannot hold; choose less extreme ones.",
                            {"field": name},
                        )
                    ]
                )
