"""POST and GET /v1/moments."""

from service.core.distributions.description import describe
from service.endpoints.declaration import endpoint
from service.schemas.answers import AnswerShape, Result
from service.schemas.distribution import DistributionField
from service.schemas.question import Asked, Question
from service.schemas.shapes import Figure, Group
from service.schemas.slips import spread_in_percent


class MomentsQuestion(Question):
    """Which figures describe a distribution?"""

    distribution = DistributionField("the law", required=True)


ANSWER = AnswerShape(
    "Moments",
    {
        "mean": Figure("expected value"),
        "variance": Figure("square of the standard deviation"),
        "standard_deviation": Figure("spread around the mean"),
        "skewness": Figure("third standardised moment; 0 for symmetric laws"),
        "kurtosis": Figure("fourth standardised moment; 3 for the normal law"),
        "excess_kurtosis": Figure("kurtosis - 3"),
        "median": Figure("half of all outcomes lie at or below it"),
        "mode": Figure("smallest most likely value; null where none stands out"),
        "entropy": Figure("in nats; differential entropy of a continuous law"),
        "support": Group({"lower": Figure("least possible value"), "upper": Figure("greatest possible value")}),
        "within_standard_deviations": Group(
            {
                "one": Figure("chance of a value within one standard deviation of the mean, ends included"),
                "two": Figure("within two"),
                "three": Figure("within three"),
            }
        ),
    },
)
EXAMPLES = {
    "one law": {"distribution": {"family": "normal", "mean": 0.06, "standard_deviation": 0.1}},
    "a fair die": {"distribution": {"family": "discrete_uniform", "lowest": 1, "highest": 6}},
}


@endpoint(
    "/v1/moments",
    name="Moments",
    question=MomentsQuestion,
    answers=(ANSWER,),
    examples=EXAMPLES,
    get=True,
    work=lambda asked: (asked.length or 1) * asked["distribution"].cost.description,
)
def moments(asked: Asked) -> Result:
    """Which figures describe this distribution?"""
    law = asked["distribution"]
    found = describe(law)._asdict()
    figures = {name: found[name] for name in ANSWER.members if name in found}
    figures["support"] = {"lower": found["support_lower"], "upper": found["support_upper"]}
    figures["within_standard_deviations"] = {n: found[f"within_{n}"] for n in ("one", "two", "three")}
    slips = spread_in_percent(asked.given["distribution"], "mean", "standard_deviation", "/distribution")
    return Result(figures, law.quantile_method, law.numerical_error, cautions=tuple(slips))
