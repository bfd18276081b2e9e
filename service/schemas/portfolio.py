"""Portfolios: how the returns of one are modelled, or the parameters of many in columns."""

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
from service.schemas.faults import inside, refuse, required, unknown
from service.schemas.fields import (
    ChoiceField,
    Given,
    NumberField,
    StrictField,
    TextField,
    closed_object,
    read_object,
    reference,
)

LONGEST_NAME = 200
NAME = TextField("a name of the caller's choice, echoed unchanged; it need not be unique", LONGEST_NAME)
PERIODS_A_YEAR = Parameter("periods in a year, in place of the period's usual number", above=0, example=252)
SAMPLE_SIZE = Parameter("periods behind the estimates", at_least=2, whole=True, example=120)
WORDS: dict[str, StrictField] = {
    "period": ChoiceField("the period whose return is modelled; year is the default", tuple(PERIODS_PER_YEAR)),
    "compounding": ChoiceField(
        "simple (the default): the growth factor is 1 + return; continuous: it is exp(return)",
        ("simple", "continuous"),
    ),
    "periods_per_year": NumberField(PERIODS_A_YEAR, arrays=False),
}


@dataclass(frozen=True, slots=True)
class Portfolio:
    """A model of returns under a name."""

    name: str | None
    returns: Returns


@dataclass(frozen=True, slots=True)
class Columns:
    """Many portfolios of one model: its parameters are arrays."""

    names: tuple[str | None, ...]
    returns: Returns

    @property
    def count(self) -> int:
        """How many portfolios there are."""
        return int(np.broadcast(*vars(self.returns.model).values()).size)


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


class PortfolioField(StrictField):
    """A portfolio: its returns, and a name if it has one."""

    def __init__(self, meaning: str = "", *, required: bool = False) -> None:
        super().__init__(meaning, required=required)
        self.returns = ReturnsField("the return of one period")

    def read(self, value: Any) -> Given:
        given = read_object(value)
        self.returns.limits = self.limits
        faults: dict[str, Any] = {
            name: [unknown(name, ("name", "returns"), [n for n in ("returns",) if n not in given])]
            for name in given
            if name not in ("name", "returns")
        }
        found: dict[str, Any] = {}
        for name, field in (("name", NAME), ("returns", self.returns)):
            try:
                if name in given:
                    found[name] = field.read(given[name])
            except ValidationError as error:
                faults[name] = error.messages
        if "returns" not in given:
            faults["returns"] = [required("returns")]
        if faults:
            raise ValidationError(faults)
        returns: Given = found["returns"]
        return Given(returns.numbers, lambda: self._make(found.get("name"), returns), returns.lists)

    @staticmethod
    def _make(name: str | None, returns: Given) -> Portfolio:
        try:
            return Portfolio(name, returns.make())
        except DoesNotFit as error:
            raise inside(error, "returns") from None

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:
        if "Portfolio" not in components:
            self.returns.limits = self.limits
            members = {"name": NAME.printed(components), "returns": self.returns.printed(components)}
            components["Portfolio"] = closed_object(members, optional=("name",))
        return reference("Portfolio")


class PortfolioListField(StrictField):
    """Portfolios to compare."""

    def __init__(self, meaning: str = "") -> None:
        super().__init__(meaning)
        self.one = PortfolioField()

    def read(self, value: Any) -> Given:
        if type(value) is not list:
            raise refuse("not_an_array", "A JSON array of portfolios is needed.")
        check_count(len(value), self.limits.portfolios)
        self.one.limits = self.limits
        read, faults = [], {}
        for index, entry in enumerate(value):
            try:
                read.append(self.one.read(entry))
            except ValidationError as error:
                faults[index] = error.messages
        if faults:
            raise ValidationError(faults)
        return Given({}, lambda: make_each(read))

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:
        self.one.limits = self.limits
        return {
            "type": "array",
            "items": self.one.printed(components),
            "minItems": 1,
            "maxItems": self.limits.portfolios,
            "description": self.meaning,
        }


def make_each(read: list[Given]) -> list[Any]:
    """Make every object of a list, or raise DoesNotFit with all refusals."""
    made: list[Any] = []
    refusals: list[Refusal] = []
    for index, given in enumerate(read):
        try:
            made.append(given.make())
        except DoesNotFit as error:
            refusals += inside(error, index).refusals
    if refusals:
        raise DoesNotFit(refusals)
    return made


def check_count(given: int, most: int) -> None:
    """Refuse no entry and too many."""
    if not given:
        raise refuse("empty", "A list needs an entry.")
    if given > most:
        raise refuse("too_many", f"At most {most} entries; these are {given}.", given=given, limit=most)


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
