"""A plan as it is asked: money, flows, growth, lives, and what it shall reach."""

from collections.abc import Mapping
from typing import Any

from marshmallow import ValidationError

from service.core.errors import DoesNotFit, Refusal
from service.core.goals.cash_flow import CashFlow
from service.core.goals.lifetime import GompertzLife, Life, Lifetime, TableLife
from service.core.goals.plan import Leg, Plan, Shock
from service.core.parameters import Parameter
from service.schemas.faults import inside, refuse, required
from service.schemas.fields import ChoiceField, Given, LevelsField, NumberField, StrictField
from service.schemas.json_schema import closed_object, reference
from service.schemas.members import read_members, read_object, read_rows
from service.schemas.question import Asked, Question
from service.schemas.returns import ReturnsField

LARGEST = 1e15
SAVING: dict[str, Any] = {
    "initial_value": 10000,
    "cash_flows": [{"amount": 300, "every": "month", "from_year": 0, "to_year": 5}],
    "horizon_years": 5,
    "target": 32000,
    "returns": {"model": "lognormal", "expected_return": 0.05, "volatility": 0.12},
}
"""An invented plan, for examples."""


def one_number(meaning: str, **limits: Any) -> NumberField:
    """Declare a single number."""
    return NumberField(Parameter(meaning, **limits), arrays=False)


FLOW: dict[str, StrictField] = {
    "amount": one_number(
        "money that comes in, or below zero goes out, each time", at_least=-LARGEST, at_most=LARGEST, example=300
    ),
    "every": ChoiceField("how often", ("month", "quarter", "year", "once")),
    "from_year": one_number("when the first comes (default 0)", at_least=0, at_most=200, example=0),
    "to_year": one_number("no later than this (default: the horizon)", above=0, at_most=200, example=5),
    "yearly_growth": one_number(
        "growth of the amount each year; with inflation, beyond it", above=-1, at_most=1, example=0.02
    ),
    "timing": ChoiceField("start (the default) or end of the period", ("start", "end")),
}


class CashFlowsField(StrictField):
    """Money that comes in and goes out."""

    def read(self, value: Any) -> tuple[CashFlow, ...]:
        rows = read_rows(value, FLOW, ("every",), self.limits, least=0)
        return tuple(CashFlow(**({"amount": None} | row)) for row in rows)

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:
        members = {name: field.printed(components) for name, field in FLOW.items()}
        row = closed_object(members, optional=[name for name in FLOW if name != "every"])
        return {"type": "array", "items": row, "maxItems": self.limits.rows, "description": self.meaning}


class GlidePathField(StrictField):
    """How the money grows, changing over the years."""

    def __init__(self, meaning: str) -> None:
        super().__init__(meaning)
        self.inner: dict[str, StrictField] = {
            "until_year": one_number("the years before this grow so", above=0, at_most=200, example=10),
            "returns": ReturnsField("the return of one period"),
        }

    def read(self, value: Any) -> Given:
        rows = read_rows(value, self.inner, tuple(self.inner), self.limits)
        return Given({}, lambda: tuple(self._leg(index, row) for index, row in enumerate(rows)))

    @staticmethod
    def _leg(index: int, row: Mapping[str, Any]) -> Leg:
        try:
            return Leg(row["until_year"], row["returns"].make())
        except DoesNotFit as error:
            raise inside(error, index, "returns") from None

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:
        for field in self.inner.values():
            field.limits = self.limits
        row = closed_object({name: field.printed(components) for name, field in self.inner.items()})
        return {"type": "array", "items": row, "minItems": 1, "maxItems": self.limits.rows, "description": self.meaning}


GOMPERTZ = {
    "age": one_number("age now", at_least=0, at_most=150, example=65),
    "modal_age": one_number("age at which most die", above=0, at_most=150, example=88),
    "dispersion": one_number("spread of the ages of death, in years", above=0, at_most=100, example=9.5),
}
TABLE = {
    "yearly_survival": LevelsField(
        Parameter("chance to be alive a year later, for each year from now", at_least=0, at_most=1, example=0.99), 200
    )
}
LIFE_MODELS: dict[str, tuple[type[Life], Mapping[str, StrictField]]] = {
    "gompertz": (GompertzLife, GOMPERTZ),
    "table": (TableLife, TABLE),
}


class LifeField(StrictField):
    """How long one person lives."""

    def read(self, value: Any) -> Life:
        given = read_object(value)
        model = given.pop("model", None)
        if model is None:
            raise ValidationError({"model": [required("model")]})
        try:
            kind, inner = LIFE_MODELS[ChoiceField("", tuple(LIFE_MODELS)).read(model)]
        except ValidationError as error:
            raise ValidationError({"model": error.messages}) from None
        found, faults = read_members(given, inner, self.limits)
        faults |= {name: [required(name, model)] for name in inner if name not in given}
        if faults:
            raise ValidationError(faults)
        return kind(**found)

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:
        if "Life" not in components:
            every = ["model", *GOMPERTZ, *TABLE]
            components["Life"] = {
                "oneOf": [
                    closed_object(
                        {
                            "model": {"type": "string", "const": model},
                            **{name: field.printed(components) for name, field in inner.items()},
                        },
                        never=every,
                    )
                    for model, (_, inner) in LIFE_MODELS.items()
                ]
            }
        return reference("Life")


class LivesField(StrictField):
    """Two lives, of which the last survivor counts."""

    def read(self, value: Any) -> tuple[Life, ...]:
        if type(value) is not list:
            raise refuse("not_an_array", "A JSON array of two lives is needed.")
        if len(value) != 2:
            code = "too_few" if len(value) < 2 else "too_many"
            raise refuse(code, f"Two lives are needed; these are {len(value)}.", given=len(value), limit=2)
        lives, faults = [], {}
        for index, entry in enumerate(value):
            try:
                lives.append(LifeField().read(entry))
            except ValidationError as error:
                faults[index] = error.messages
        if faults:
            raise ValidationError(faults)
        return tuple(lives)

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:
        return {
            "type": "array",
            "items": LifeField().printed(components),
            "minItems": 2,
            "maxItems": 2,
            "description": self.meaning,
        }


SHOCK: dict[str, StrictField] = {
    "at_year": one_number("when", at_least=0, at_most=200, example=10),
    "return": one_number(
        "what is lost or gained at once, beside the usual growth", at_least=-1, at_most=10, example=-0.3
    ),
}


class ShockField(StrictField):
    """A single blow to the money."""

    def read(self, value: Any) -> Shock:
        given = read_object(value)
        found, faults = read_members(given, SHOCK, self.limits)
        faults |= {name: [required(name)] for name in SHOCK if name not in given}
        if faults:
            raise ValidationError(faults)
        return Shock(found["at_year"], found["return"])

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:
        return closed_object(
            {name: field.printed(components) for name, field in SHOCK.items()}, description=self.meaning
        )


class GoalQuestion(Question):
    """Base of the questions about a plan."""

    arrays = False
    initial_value = one_number("money at the start", at_least=0, at_most=LARGEST, example=10000)
    cash_flows = CashFlowsField("money that comes in and goes out")
    horizon_years = one_number("length of the plan in years", above=0, at_most=200, example=20)
    target = one_number("money to be reached at the horizon", at_least=0, at_most=LARGEST, example=50000)
    returns = ReturnsField("how the money grows, throughout")
    glide_path = GlidePathField("how the money grows, changing over the years; until_year rises to the horizon")
    inflation_rate = one_number(
        "yearly rise of prices; then all money, in and out, is in today's money", above=-1, at_most=10, example=0.02
    )
    yearly_fee = one_number("share of the value taken each year", at_least=0, below=1, example=0.005)
    lifetime = LifeField("how long the person lives")
    lives = LivesField("in place of lifetime: how long two people live; the last survivor counts")
    shock = ShockField("a blow to the money at one time")
    parameter_uncertainty = ChoiceField(
        "ignored (the default): estimates are taken as true; predictive: the mean return is known only from "
        "sample_size periods",
        ("ignored", "predictive"),
    )


def plan_of(asked: Asked, targets: tuple[float, ...]) -> Plan:
    """Make the plan. Raises DoesNotFit."""
    life, lives = asked.get("lifetime"), asked.get("lives")
    if life is not None and lives is not None:
        words = "lives do not go together with lifetime."
        raise DoesNotFit([Refusal(("lives",), "does_not_go_together", words, {"beside": ["lifetime"]})])
    lifetime = Lifetime(lives or (life,)) if life is not None or lives is not None else None
    return Plan(
        asked.get("initial_value"),
        asked.get("cash_flows", ()),
        asked.get("horizon_years"),
        targets,
        asked.get("glide_path") or (Leg(None, asked["returns"]),),
        asked.get("inflation_rate", 0.0),
        asked.get("yearly_fee", 0.0),
        lifetime,
        asked.get("shock"),
        asked.get("parameter_uncertainty", "ignored"),
    )


STEPS_A_YEAR = {"month": 12, "quarter": 4, "year": 1, "once": 1}
OF_A_STEP, OF_A_GENERAL_STEP = 120.0, 600.0
"""Microseconds for one step of a plan with its yearly bands and its second run."""


def work_of(asked: Asked, longest: float) -> float:
    """Count the steps of a plan; `longest`: the horizon where it is not given."""
    legs = asked.get("glide_path") or (Leg(None, asked["returns"]),)
    flows = [STEPS_A_YEAR[flow.every] for flow in asked.get("cash_flows", ())]
    steps = max([*(leg.returns.periods_in_year for leg in legs), *flows]) * asked.get("horizon_years", longest)
    plain = all(leg.returns.compounding in leg.returns.model.divides for leg in legs)
    return float(steps) * (OF_A_STEP if plain else OF_A_GENERAL_STEP)
