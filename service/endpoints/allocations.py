"""POST /v1/allocations."""

from service.core.parameters import Parameter
from service.core.portfolio.floor import Floor
from service.core.portfolio.mix import OBJECTIVES, MixQuestion, best_mix, one_period
from service.core.portfolio.shortfall import shortfall
from service.endpoints.declaration import endpoint
from service.schemas.answers import AnswerShape, Plain, Result, Single, write_plain
from service.schemas.assets import AssetsField, WeightLimitsField
from service.schemas.cautions import beside_shortfalls, sentence
from service.schemas.fields import ChoiceField, LevelsField, NumberField
from service.schemas.floor_question import DEFAULT_LEVELS, DEFAULT_QUANTILE_PROBABILITY, MOST_LEVELS
from service.schemas.members import GroupField
from service.schemas.question import Asked, Question
from service.schemas.shapes import ONE, TEXT, Each, Figure, Fixed
from service.schemas.shortfall import shortfall_shape, shortfall_values
from service.schemas.slips import threshold_in_percent


class AllocationQuestion(Question):
    """Which mix of these assets is the best against a floor?"""

    arrays = False
    assets = AssetsField("what may be mixed; the law of one period, normal or student_t", required=True)
    threshold = NumberField(Parameter("the least acceptable return", example=0.02), required=True, arrays=False)
    threshold_basis = ChoiceField(
        "per_year (the default): the threshold is a return per year; over_horizon: of one period of the assets",
        ("per_year", "over_horizon"),
    )
    objective = ChoiceField(
        "; ".join(f"{name}: {kind.meaning}" for name, kind in OBJECTIVES.items()), tuple(OBJECTIVES), required=True
    )
    limits = GroupField(
        "what makes a mix inadmissible; needed by expected_return",
        {
            "shortfall_probability": NumberField(
                Parameter("greatest chance of missing the floor", above=0, at_most=1, example=0.1), arrays=False
            )
        },
    )
    quantile_probability = NumberField(
        Parameter("probability of the quantile (default 0.05)", above=0, below=1, example=0.05), arrays=False
    )
    confidence_levels = LevelsField(
        Parameter("levels of the tail losses (default 0.95 and 0.99)", above=0, below=1, example=0.95), MOST_LEVELS
    )
    weight_limits = WeightLimitsField("limits of single weights where 0 and 1 are too wide")
    risk_free_rate = NumberField(
        Parameter(
            "return per year of an asset without risk, called risk_free, that may be mixed in",
            above=-1,
            at_most=10,
            example=0.01,
        ),
        arrays=False,
    )


ANSWER = AnswerShape(
    "Allocation",
    {
        "objective": Fixed(TEXT),
        "weights": Each({"asset": Fixed(TEXT), "weight": Fixed(ONE)}, "in the order of the assets; they add up to 1"),
        "kkt_violation": Figure(
            "how far the weights are from the conditions of optimality: the largest of stationarity "
            "residual / (1 + |gradient|), infeasibility and violated limits"
        ),
        **shortfall_shape(many=False),
    },
    forms=("",),
)
EXAMPLES = {
    "three assets": {
        "assets": {
            "names": ["Bonds", "Shares", "Property"],
            "expected_returns": [0.02, 0.07, 0.05],
            "volatilities": [0.05, 0.18, 0.12],
            "correlations": [[1, 0.1, 0.2], [0.1, 1, 0.6], [0.2, 0.6, 1]],
        },
        "threshold": 0,
        "objective": "safety_first_ratio",
    }
}


@endpoint(
    "/v1/allocations",
    name="Allocation",
    question=AllocationQuestion,
    answers=(ANSWER,),
    examples=EXAMPLES,
    batch=False,
    write=write_plain,
)
def allocations(asked: Asked) -> Result:
    """Which mix of these assets is the best against this floor?"""
    assets, basis = asked["assets"], asked.get("threshold_basis", "per_year")
    probability = asked.get("quantile_probability", DEFAULT_QUANTILE_PROBABILITY)
    found = best_mix(
        assets,
        MixQuestion(
            asked["objective"],
            asked["threshold"],
            basis,
            asked.get("limits", {}).get("shortfall_probability"),
            probability,
            asked.get("weight_limits", ()),
            asked.get("risk_free_rate"),
        ),
    )
    horizon = one_period(assets)
    figures = shortfall(
        found.returns,
        Floor(asked["threshold"], basis, horizon),
        asked.get("confidence_levels", DEFAULT_LEVELS),
        probability,
    )
    weights = [
        {"asset": Plain(name), "weight": Single(weight)}
        for name, weight in zip(found.names, found.weights.tolist(), strict=True)
    ]
    cautions = [
        *beside_shortfalls(horizon, losses=bool(figures.tail_losses)),
        sentence("optimum_is_optimistic"),
        *threshold_in_percent(asked["threshold"]),
    ]
    values = {"objective": asked["objective"], "weights": weights, "kkt_violation": Single(found.kkt_violation)}
    return Result(
        values | shortfall_values(figures),
        "active_set_on_frontier",
        figures.numerical_error,
        figures.numerical_error_kind,
        tuple(cautions),
    )
