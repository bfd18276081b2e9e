"""The return of one period: a model, its parameters, what a period is; for one portfolio or in columns."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np
from marshmallow import ValidationError

from service.core.declared import Declared, Parameterisation
from service.core.errors import DoesNotFit, Refusal
from service.core.parameters import Parameter
from service.core.returns import PERIODS_PER_YEAR, RETURN_MODELS, Returns
from service.schemas.declared import DeclaredField
from service.schemas.faults import refuse
from service.schemas.fields import ChoiceField, NumberField, StrictField, TextField

LONGEST_NAME = 200
NAME = TextField("a name of the caller's choice, echoed unchanged; it need not be unique", LONGEST_NAME)
PERIODS_A_YEAR = Parameter(
    "periods in a year, in place of the period's usual number", at_least=0.01, at_most=100_000, example=252
)
SAMPLE_SIZE = Parameter("periods behind the estimates", at_least=2, whole=True, example=120)
WORDS: dict[str, StrictField] = {
    "period": ChoiceField("the period whose return is modelled; year is the default", tuple(PERIODS_PER_YEAR)),
    "compounding": ChoiceField(
        "simple (the default): the growth factor is 1 + return; continuous: it is exp(return)",
        ("simple", "continuous"),
    ),
    "periods_per_year": NumberField(PERIODS_A_YEAR, arrays=False),
}


class ReturnsField(DeclaredField):
    """The return of one period: a model, its parameters, and what a period is."""

    tag = "model"
    kinds = RETURN_MODELS
    unknown_code = "unknown_model"
    component = "Returns"
    extras: ClassVar[Mapping[str, StrictField]] = WORDS | {"sample_size": NumberField(SAMPLE_SIZE, arrays=False)}
    arrays = False

    def build(self, kind: type[Declared], way: Parameterisation, numbers: Mapping[str, Any], extras: Any) -> Returns:
        return Returns(kind.make(way, numbers), **extras)  # type: ignore[arg-type]  # the registry holds return models


def check_count(given: int, most: int) -> None:
    """Refuse no entry and too many."""
    if not given:
        raise refuse("empty", "A list needs an entry.")
    if given > most:
        raise refuse("too_many", f"At most {most} entries; these are {given}.", given=given, limit=most)


@dataclass(frozen=True, slots=True)
class Columns:
    """Many portfolios of one model: its parameters are arrays."""

    names: tuple[str | None, ...]
    returns: Returns

    @property
    def count(self) -> int:
        """How many portfolios there are."""
        return int(np.broadcast(*vars(self.returns.model).values()).size)


class NamesField(StrictField):
    """Names of the portfolios in columns; null where one has none."""

    def read(self, value: Any) -> tuple[str | None, ...]:
        if type(value) is not list:
            raise refuse("not_an_array", "A JSON array of names is needed.")
        check_count(len(value), self.limits.portfolios)
        faults = {}
        for index, entry in enumerate(value):
            if type(entry) is not str or len(entry) > LONGEST_NAME:
                try:
                    None if entry is None else NAME.read(entry)
                except ValidationError as error:
                    faults[index] = error.messages
        if faults:
            raise ValidationError(faults)
        return tuple(value)

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:  # noqa: ARG002
        one = {"type": ["string", "null"], "maxLength": LONGEST_NAME}
        return {
            "type": "array",
            "items": one,
            "minItems": 1,
            "maxItems": self.limits.portfolios,
            "description": self.meaning,
        }


class ColumnsField(DeclaredField):
    """Many portfolios of one model, each parameter an array (a single number stretches)."""

    tag = "model"
    kinds: ClassVar[Mapping[str, type[Declared]]] = {n: kind for n, kind in RETURN_MODELS.items() if kind.stacks}
    unknown_code = "unknown_model"
    component = "Columns"
    extras: ClassVar[Mapping[str, StrictField]] = WORDS | {
        "sample_size": NumberField(SAMPLE_SIZE),
        "name": NamesField("names, one for each portfolio"),
    }

    def build(self, kind: type[Declared], way: Parameterisation, numbers: Mapping[str, Any], extras: Any) -> Columns:
        names = extras.get("name", ())
        others = {name: value for name, value in extras.items() if name != "name"}
        columns = Columns(names, Returns(kind.make(way, numbers), **others))  # type: ignore[arg-type]
        if names and len(names) != columns.count:
            words = f"There are {len(names)} names for {columns.count} portfolios."
            raise DoesNotFit(
                [Refusal(("name",), "lengths_differ", words, {"given": len(names), "expected": columns.count})]
            )
        return columns
