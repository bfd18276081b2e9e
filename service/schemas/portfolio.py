"""Portfolios: how the returns of one are modelled, or the parameters of many in columns."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np
from marshmallow import ValidationError

from service.core.declared import Declared, Parameterisation
from service.core.errors import DoesNotFit, Refusal
from service.core.parameters import Parameter
from service.core.portfolio.assets import Assets
from service.core.returns import PERIODS_PER_YEAR, RETURN_MODELS, Returns
from service.schemas.declared import DeclaredField
from service.schemas.faults import Fault, inside, refuse, required, shown
from service.schemas.fields import (
    ChoiceField,
    Given,
    NumberField,
    StrictField,
    TextField,
    closed_object,
    read_members,
    read_object,
    read_rows,
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
    """A model of returns under a name, or weights over the shared assets."""

    name: str | None
    returns: Returns | None
    weights: Mapping[str, float] | None = None


def resolved(portfolio: Portfolio, assets: Assets | None, *steps: str | int) -> Returns:
    """Give the returns of a portfolio; those of a mix follow from the assets. Raises DoesNotFit; `steps` lead to it."""
    if portfolio.returns is not None:
        return portfolio.returns
    if assets is None:
        raise DoesNotFit([Refusal(("assets",), "required", "assets is needed by weights.", {"by": "weights"})])
    try:
        return assets.mix(assets.aligned(dict(portfolio.weights or {})))
    except DoesNotFit as error:
        raise inside(error, *steps, "weights") from None


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


WEIGHT = Parameter("share of the portfolio", above=-100, below=100, example=0.4)
NAMED_WEIGHTS = {
    "asset": TextField("one of the names under assets", LONGEST_NAME),
    "weight": NumberField(WEIGHT, arrays=False),
}


class WeightsField(StrictField):
    """Weights over the shared assets; they add up to 1."""

    def read(self, value: Any) -> dict[str, float]:
        rows = read_rows(value, NAMED_WEIGHTS, ("asset", "weight"), self.limits)
        weights: dict[str, float] = {}
        faults: dict[int, Any] = {}
        for index, row in enumerate(rows):
            if row["asset"] in weights:
                faults[index] = {"asset": [Fault("given_twice", f"The asset {shown(row['asset'])} stands twice.")]}
            weights[row["asset"]] = row["weight"]
        if faults:
            raise ValidationError(faults)
        return weights

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:
        members = {name: field.printed(components) for name, field in NAMED_WEIGHTS.items()}
        return {
            "type": "array",
            "items": closed_object(members),
            "minItems": 1,
            "maxItems": self.limits.assets,
            "description": "weights over the shared assets, adding up to 1",
        }


class PortfolioField(StrictField):
    """A portfolio: a name if it has one, and its returns or its weights over the shared assets."""

    def __init__(self, meaning: str = "", *, required: bool = False) -> None:
        super().__init__(meaning, required=required)
        self.inner: dict[str, StrictField] = {
            "name": NAME,
            "returns": ReturnsField("the return of one period"),
            "weights": WeightsField(),
        }

    def read(self, value: Any) -> Given:
        given = read_object(value)
        found, faults = read_members(given, self.inner, self.limits)
        if "returns" not in given and "weights" not in given:
            faults["returns"] = [required("returns")]
        if "returns" in given and "weights" in given:
            faults["weights"] = [
                Fault("does_not_go_together", "weights do not go together with returns.", {"beside": ["returns"]})
            ]
        if faults:
            raise ValidationError(faults)
        name, returns = found.get("name"), found.get("returns")
        if returns is None:
            return Given({}, lambda: Portfolio(name, None, found["weights"]))
        return Given(returns.numbers, lambda: self._make(name, returns), returns.lists)

    @staticmethod
    def _make(name: str | None, returns: Given) -> Portfolio:
        try:
            return Portfolio(name, returns.make())
        except DoesNotFit as error:
            raise inside(error, "returns") from None

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:
        if "Portfolio" not in components:
            for field in self.inner.values():
                field.limits = self.limits
            members = {name: field.printed(components) for name, field in self.inner.items()}
            ways = {"PortfolioByReturns": ("name", "returns"), "PortfolioByWeights": ("name", "weights")}
            for component, own in ways.items():
                components[component] = closed_object(
                    {name: members[name] for name in own}, optional=("name",), never=members
                )
            components["Portfolio"] = {"oneOf": [reference(component) for component in ways]}
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
