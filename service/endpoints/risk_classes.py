"""POST /v1/risk-classes."""

from collections.abc import Mapping

import numpy as np

from service.core.errors import DoesNotFit, Refusal
from service.core.evidence.risk_class import CESR, EU, PERIODS_PER_YEAR, risk_class
from service.core.evidence.series import log_returns
from service.core.parameters import Parameter
from service.endpoints.declaration import endpoint
from service.schemas.answers import AnswerShape, Caution, Result, write_plain
from service.schemas.cautions import sentence
from service.schemas.fields import ChoiceField, NumberField, SeriesField
from service.schemas.question import Asked, Question
from service.schemas.returns import PERIODS_A_YEAR
from service.schemas.shapes import COUNT, TEXT, Figure, Fixed, Group


class RiskClassQuestion(Question):
    """Which market risk class does an observed series have?"""

    one_of = (("observed_returns", "observed_prices"),)
    observed_returns = SeriesField("simple returns, oldest first")
    observed_prices = SeriesField("prices with distributions reinvested, oldest first")
    period = ChoiceField("the period between two observations", ("day", "week", "month"), required=True)
    periods_per_year = NumberField(PERIODS_A_YEAR, arrays=False)
    holding_period_years = NumberField(
        Parameter("recommended holding period", above=0, at_most=100, example=5), required=True, arrays=False
    )
    standard = ChoiceField(
        "eu_2017_653: Delegated Regulation (EU) 2017/653, Annex II; cesr_10_673: CESR guidelines "
        "10-673 (weekly or monthly)",
        (EU, CESR),
        required=True,
    )


ANSWER = AnswerShape(
    "RiskClass",
    {
        "standard": Fixed(TEXT),
        "market_risk_class": Fixed(COUNT | {"minimum": 1, "maximum": 7}),
        "class_lower_bound": Figure("volatility from which the class reaches"),
        "class_upper_bound": Figure("volatility at which the next class begins; null for the highest"),
        "distance_to_bounds": Group(
            {"lower": Figure("volatility above the lower bound"), "upper": Figure("what is missing to the upper bound")}
        ),
        "observations": Fixed(COUNT),
        "periods_in_holding_period": Figure("periods"),
        "holding_period_years": Figure("years"),
        "log_returns": Group(
            {
                "mean": Figure("of one period"),
                "standard_deviation": Figure("divisor n"),
                "skewness": Figure("null without spread"),
                "excess_kurtosis": Figure("null without spread"),
            }
        ),
        "value_at_risk_return_space": Figure(
            "of the EU standard: log return over the holding period, usually negative"
        ),
        "var_equivalent_volatility": Figure("of the EU standard: the figure that is classed"),
        "annualised_volatility": Figure("of the CESR standard: the figure that is classed"),
    },
    forms=("",),
)
EXAMPLES = {
    "monthly returns": {
        "observed_returns": [0.012, -0.021, 0.034, 0.008, -0.015, 0.027, 0.019, -0.042, 0.031, 0.006, 0.022, -0.009],
        "period": "month",
        "holding_period_years": 5,
        "standard": "eu_2017_653",
    }
}
WORDS: Mapping[str, str] = {
    "short_history": "The standard asks for a longer history of prices than this.",
    "formula_outside_its_range": "The formula gives no volatility of 0 or more for these moments; do not rely on it.",
}


@endpoint(
    "/v1/risk-classes",
    name="RiskClass",
    question=RiskClassQuestion,
    answers=(ANSWER,),
    examples=EXAMPLES,
    batch=False,
    write=write_plain,
)
def risk_classes(asked: Asked) -> Result:
    """Which market risk class does this series have?"""
    standard, period = asked["standard"], asked["period"]
    if period not in PERIODS_PER_YEAR[standard]:
        words = f"{standard} takes weekly or monthly returns."
        raise DoesNotFit([Refusal(("period",), "unknown_choice", words, {"allowed": list(PERIODS_PER_YEAR[standard])})])
    returns = log_returns(asked.get("observed_returns"), asked.get("observed_prices"))
    per_year = asked.get("periods_per_year", PERIODS_PER_YEAR[standard][period])
    with np.errstate(all="ignore"):
        found = risk_class(returns, standard, per_year, asked["holding_period_years"], period)
    figures = {
        "standard": standard,
        "market_risk_class": found.market_risk_class,
        "class_lower_bound": found.class_lower_bound,
        "class_upper_bound": found.class_upper_bound,
        "distance_to_bounds": {"lower": found.distance_to_lower, "upper": found.distance_to_upper},
        "observations": found.observations,
        "periods_in_holding_period": found.periods_in_holding_period,
        "holding_period_years": asked["holding_period_years"],
        "log_returns": {
            name: getattr(found.moments, name) for name in ("mean", "standard_deviation", "skewness", "excess_kurtosis")
        },
        "value_at_risk_return_space": found.value_at_risk_return_space,
        "var_equivalent_volatility": found.var_equivalent_volatility,
        "annualised_volatility": found.annualised_volatility,
    }
    other = (
        ["value_at_risk_return_space", "var_equivalent_volatility"] if standard == CESR else ["annualised_volatility"]
    )
    pointer = "/observed_returns" if "observed_returns" in asked.values else "/observed_prices"
    cautions = [sentence("model_not_forecast"), sentence("class_is_not_a_limit"), sentence("as_understood_here")]
    cautions += [Caution(code, WORDS[code], pointer, {"observations": found.observations}) for code in found.cautions]
    return Result(
        figures, "regulation_formula", None, None, tuple(cautions), {f"/{n}": "other_standard" for n in other}
    )
