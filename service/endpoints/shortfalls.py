"""POST /v1/shortfalls."""

from service.core.parameters import Parameter
from service.core.portfolio.shortfall import shortfall
from service.endpoints.declaration import endpoint
from service.schemas.answers import AnswerShape, Plain, Result
from service.schemas.assets import AssetsField
from service.schemas.cautions import about_mixes, beside_shortfalls
from service.schemas.fields import NumberField
from service.schemas.floor_question import OF_AN_INVERSION, FloorQuestion, floor_of, settings_of, slips_in, work_of
from service.schemas.portfolio import PortfolioField, resolved
from service.schemas.question import Asked
from service.schemas.shortfall import outcomes_shape, shortfall_shape, shortfall_values


class ShortfallQuestion(FloorQuestion):
    """How likely does a portfolio miss a floor, and by how much?"""

    portfolio = PortfolioField("the portfolio", required=True)
    assets = AssetsField("the assets that a portfolio by weights is made of")
    threshold = NumberField(
        Parameter("the least acceptable return, a number or a list of them", example=0.02), required=True
    )


ANSWERS = (
    AnswerShape("Shortfall", shortfall_shape(many=False) | outcomes_shape(many=False), ("number",)),
    AnswerShape("Shortfall", shortfall_shape(many=True) | outcomes_shape(many=False), ("list",)),
)
EXAMPLES = {
    "one floor": {
        "portfolio": {"name": "Balanced", "returns": {"model": "normal", "expected_return": 0.06, "volatility": 0.1}},
        "threshold": 0.02,
        "confidence_levels": [0.95, 0.99],
    },
    "a slider": {
        "portfolio": {"returns": {"model": "lognormal", "expected_return": 0.05, "volatility": 0.12}},
        "threshold": [0, 0.01, 0.02],
        "horizon_years": 10,
    },
}


def work(asked: Asked) -> float:
    """Count the law of the horizon; that of a mix as one that has to be compounded."""
    returns = asked["portfolio"].returns
    return OF_AN_INVERSION if returns is None else work_of([returns], asked.get("horizon_years", 1.0))


@endpoint("/v1/shortfalls", name="Shortfall", question=ShortfallQuestion, answers=ANSWERS, examples=EXAMPLES, work=work)
def shortfalls(asked: Asked) -> Result:
    """How likely does a portfolio miss a floor, and by how much?"""
    portfolio, assets = asked["portfolio"], asked.get("assets")
    returns = resolved(portfolio, assets, "portfolio")
    floor = floor_of(asked)
    found = shortfall(returns, floor, **settings_of(asked))
    cautions = beside_shortfalls(floor.horizon_years, losses=bool(found.tail_losses))
    cautions += about_mixes([portfolio], assets)
    cautions += slips_in(asked, {"/portfolio/returns": returns.model})
    values = shortfall_values(found)
    if asked.length is not None and found.outcomes is not None:
        values["outcomes"] = Plain((found.outcomes[:, 0] + 0.0).tolist())  # the same for every floor
    return Result(values, found.method, found.numerical_error, found.numerical_error_kind, tuple(cautions))
