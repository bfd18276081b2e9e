"""Portfolios: a name, and returns or weights over shared assets."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from marshmallow import ValidationError

from service.core.errors import DoesNotFit, Refusal
from service.core.parameters import Parameter
from service.core.portfolio.assets import Assets
from service.core.returns import Returns
from service.schemas.faults import Fault, inside, refuse, required, shown
from service.schemas.fields import Given, NumberField, StrictField, TextField
from service.schemas.json_schema import closed_object, reference
from service.schemas.members import read_members, read_object, read_rows
from service.schemas.returns import LONGEST_NAME, NAME, ReturnsField, check_count


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
            "maxItems": self.limits.rows,
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
