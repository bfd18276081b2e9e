"""POST and GET /v1/probabilities."""

from service.core.arrays import NO_VALUE
from service.core.distributions.events import chances
from service.endpoints.declaration import endpoint
from service.schemas.answers import AnswerShape, Result
from service.schemas.distribution import DistributionField
from service.schemas.event import EventField
from service.schemas.question import Asked, Question
from service.schemas.shapes import Figure, Group
from service.schemas.slips import spread_in_percent


class ProbabilityQuestion(Question):
    """How likely is an event under a distribution?"""

    distribution = DistributionField("the law", required=True)
    event = EventField("what may happen", required=True)


ANSWER = AnswerShape(
    "Probability",
    {
        "probability": Figure("chance of the event"),
        "complement": Figure("chance of its opposite, not computed as one minus the other"),
        "log_probability": Figure("natural logarithm, right where the probability itself underflows"),
        "log_complement": Figure("natural logarithm of the complement"),
        "standard_scores": Group(
            {
                "lower": Figure("(lower bound - mean) / standard deviation"),
                "upper": Figure("(upper bound - mean) / standard deviation"),
            }
        ),
    },
)
EXAMPLES = {
    "one number": {
        "distribution": {"family": "normal", "mean": 10, "standard_deviation": 2},
        "event": {"at_least": 8, "below": 12},
    },
    "a list": {
        "distribution": {"family": "normal", "mean": 0.06, "standard_deviation": [0.1, 0.16, 12]},
        "event": {"below": [0, 0, -1000]},
    },
}


@endpoint(
    "/v1/probabilities",
    name="Probability",
    question=ProbabilityQuestion,
    answers=(ANSWER,),
    examples=EXAMPLES,
    get=True,
    work=lambda asked: (asked.length or 1) * asked["distribution"].cost.event,
)
def probabilities(asked: Asked) -> Result:
    """How likely is an event?"""
    law = asked["distribution"]
    found = chances(law, asked["event"])
    figures = {
        "probability": found.probability,
        "complement": found.complement,
        "log_probability": found.log_probability,
        "log_complement": found.log_complement,
        "standard_scores": {
            "lower": NO_VALUE if found.lower_score is None else found.lower_score,
            "upper": NO_VALUE if found.upper_score is None else found.upper_score,
        },
    }
    slips = spread_in_percent(asked.given["distribution"], "mean", "standard_deviation", "/distribution")
    return Result(figures, law.method, law.numerical_error, cautions=tuple(slips))
