"""POST and GET /v1/quantiles."""

from collections.abc import Mapping
from typing import ClassVar

from service.core.distributions.quantiles import central_interval, quantile
from service.core.parameters import Parameter
from service.endpoints.declaration import endpoint
from service.schemas.answers import AnswerShape, Result
from service.schemas.distribution import DistributionField
from service.schemas.fields import ChoiceField, NumberField
from service.schemas.question import Asked, Question
from service.schemas.shapes import Figure, Fixed, constant
from service.schemas.slips import spread_in_percent


class QuantileQuestion(Question):
    """Which value has a given probability, or which interval a given coverage?"""

    one_of = (("probability", "coverage"),)
    belongs_to: ClassVar[Mapping[str, str]] = {"tail": "probability"}
    distribution = DistributionField("the law", required=True)
    probability = NumberField(
        Parameter("probability of the tail that the value cuts off", at_least=0, at_most=1, example=0.95)
    )
    tail = ChoiceField(
        "lower (the default): the smallest value whose cumulative probability reaches the probability; "
        "upper: the smallest value with no more than the probability above it",
        ("lower", "upper"),
    )
    coverage = NumberField(
        Parameter("probability inside the interval, with equal tails outside", at_least=0, at_most=1, example=0.95)
    )


QUANTILE = AnswerShape(
    "Quantile",
    {
        "kind": Fixed(constant("quantile")),
        "value": Figure("the quantile"),
        "probability_at_value": Figure(
            "probability of the asked tail cut off at the value: P(X <= value) of the lower, P(X > value) of the upper"
        ),
    },
)
INTERVAL = AnswerShape(
    "Interval",
    {
        "kind": Fixed(constant("interval")),
        "coverage": Figure("the asked coverage"),
        "lower": Figure("lower end"),
        "upper": Figure("upper end"),
    },
)
EXAMPLES = {
    "one number": {
        "distribution": {"family": "binomial", "trials": 20, "success_probability": 0.5},
        "probability": 0.95,
    },
    "coverage": {"distribution": {"family": "normal", "mean": 0.06, "standard_deviation": 0.1}, "coverage": 0.95},
    "a list with an infinite figure": {
        "distribution": {"family": "exponential", "rate": 2},
        "probability": [0.5, 0, 1],
    },
}


@endpoint(
    "/v1/quantiles",
    name="Quantile",
    question=QuantileQuestion,
    answers=(QUANTILE, INTERVAL),
    examples=EXAMPLES,
    get=True,
    work=lambda asked: (asked.length or 1) * asked["distribution"].cost.quantile,
)
def quantiles(asked: Asked) -> Result:
    """Which value has this probability?"""
    law = asked["distribution"]
    coverage = asked.get("coverage")
    figures: dict[str, object]
    if coverage is not None:
        ends = central_interval(law, coverage)
        figures = {"kind": "interval", "coverage": coverage, "lower": ends.lower, "upper": ends.upper}
    else:
        found = quantile(law, asked["probability"], upper=asked.get("tail") == "upper")
        figures = {"kind": "quantile", "value": found.value, "probability_at_value": found.probability_at_value}
    slips = spread_in_percent(asked.given["distribution"], "mean", "standard_deviation", "/distribution")
    return Result(figures, law.quantile_method, law.numerical_error, cautions=tuple(slips))
