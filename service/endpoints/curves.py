"""POST and GET /v1/curves."""

from service.core.distributions.curves import CURVES, bounds, curve
from service.core.distributions.events import chances
from service.core.parameters import Parameter
from service.endpoints.declaration import endpoint
from service.schemas.answers import AnswerShape, Listed, Result, write_plain
from service.schemas.distribution import DistributionField
from service.schemas.event import EventField
from service.schemas.fields import ChoiceField, NumberField
from service.schemas.question import Asked, Question
from service.schemas.shapes import ONE, Figure, Fixed, Group

DEFAULT_POINTS = 200
TRIAL_POINTS = 3_000


class CurveQuestion(Question):
    """Which points draw a curve of a distribution? No arrays: one law, one curve."""

    arrays = False
    distribution = DistributionField("the law; its parameters are single numbers here", required=True)
    curve = ChoiceField(
        "density (of a discrete family: the probability of each value); cumulative: P(X <= x); exceedance: P(X > x); "
        "quantile: the value by its probability",
        CURVES,
        required=True,
    )
    points = NumberField(
        Parameter("at most so many points (default 200)", at_least=10, at_most=2000, whole=True, example=200),
        arrays=False,
    )
    shade = EventField("an event whose bounds are points of the curve and whose probability is given")


COORDINATES = {"type": "array", "items": ONE}
ANSWER = AnswerShape(
    "Curve",
    {
        "x": Fixed(COORDINATES | {"description": "rising; two equal values are a jump"}),
        "y": Fixed(COORDINATES | {"description": "null where the curve grows without bound"}),
        "discrete": Fixed({"type": "boolean", "description": "single masses or steps, not to be joined by slopes"}),
        "shaded": Group(
            {
                "probability": Figure("chance of the shaded event"),
                "lower": Figure("where it begins; null: it has no bound there"),
                "upper": Figure("where it ends; null: it has no bound there"),
            },
            "the shaded event",
            nullable=True,
        ),
    },
    forms=("",),
)
EXAMPLES = {
    "a shaded tail": {
        "distribution": {"family": "normal", "mean": 0.06, "standard_deviation": 0.1},
        "curve": "density",
        "points": 20,
        "shade": {"below": 0},
    },
}


@endpoint(
    "/v1/curves",
    name="Curve",
    question=CurveQuestion,
    answers=(ANSWER,),
    examples=EXAMPLES,
    get=True,
    batch=False,
    work=lambda asked: TRIAL_POINTS * (asked["distribution"].cost.event + asked["distribution"].cost.quantile),
    write=write_plain,
)
def curves(asked: Asked) -> Result:
    """Which points draw this curve?"""
    law, shade = asked["distribution"], asked.get("shade")
    drawn = curve(law, asked["curve"], int(asked.get("points", DEFAULT_POINTS)), shade)
    shaded = None
    if shade is not None:
        lower, upper = bounds(law, shade)
        shaded = {"probability": chances(law, shade).probability, "lower": lower, "upper": upper}
    figures = {"x": Listed(drawn.x), "y": Listed(drawn.y), "discrete": drawn.discrete, "shaded": shaded}
    method = law.quantile_method if asked["curve"] == "quantile" else law.method
    return Result(figures, method, law.numerical_error, reasons={"/shaded": "needs_shade"})
