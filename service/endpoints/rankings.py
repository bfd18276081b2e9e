"""POST /v1/rankings."""

from collections.abc import Mapping, Sequence
from typing import ClassVar

import numpy as np

from service.core.arrays import Numbers
from service.core.parameters import Parameter
from service.core.portfolio.assets import Assets
from service.core.portfolio.collection import Portfolios
from service.core.portfolio.criteria import CRITERIA
from service.core.portfolio.question import RankingQuestion as CoreQuestion
from service.core.portfolio.ranking import rank
from service.endpoints.declaration import endpoint
from service.schemas.answers import Result
from service.schemas.assets import AssetsField
from service.schemas.cautions import about_mixes, beside_shortfalls, sentence
from service.schemas.fields import ChoiceField, MatrixField, NumberField
from service.schemas.floor_question import FloorQuestion, floor_of, settings_of, slips_in, work_of
from service.schemas.members import GroupField
from service.schemas.portfolio import Portfolio, PortfolioListField, resolved
from service.schemas.question import Asked
from service.schemas.ranking import COLUMNS, ROWS, ranking_cautions, ranking_values, write_ranking
from service.schemas.returns import ColumnsField


class RankingQuestion(FloorQuestion):
    """Which portfolio is the safest for a floor?"""

    one_of = (("portfolios", "portfolio_columns"),)
    belongs_to: ClassVar[Mapping[str, str]] = {"assets": "portfolios"}
    portfolios = PortfolioListField("the portfolios to compare")
    assets = AssetsField("the assets that portfolios by weights are made of")
    portfolio_columns = ColumnsField("the portfolios to compare, the parameters of one model in columns")
    threshold = NumberField(Parameter("the least acceptable return", example=0.02), required=True, arrays=False)
    criterion = ChoiceField("what to rank by; safety_first_ratio is the default", tuple(CRITERIA))
    limits = GroupField(
        "what makes a portfolio inadmissible",
        {
            "shortfall_probability": NumberField(
                Parameter("greatest chance of missing the floor", at_least=0, at_most=1, example=0.1),
                arrays=False,
            )
        },
    )
    correlations = MatrixField("correlations of the portfolios' returns, in their order")


HOUSEHOLD = [
    {"name": name, "returns": {"model": "normal", "expected_return": mean, "volatility": volatility}}
    for name, mean, volatility in (("Cautious", 0.04, 0.06), ("Balanced", 0.06, 0.1), ("Growth", 0.08, 0.16))
]
EXAMPLES = {
    "objects": {
        "portfolios": HOUSEHOLD,
        "threshold": 0.02,
        "criterion": "safety_first_ratio",
        "confidence_levels": [0.95, 0.99],
    },
    "columns": {
        "portfolio_columns": {
            "model": "normal",
            "name": ["Cautious", "Balanced", "Growth"],
            "expected_return": [0.04, 0.06, 0.08],
            "volatility": [0.06, 0.1, 0.16],
        },
        "threshold": 0.02,
        "criterion": "safety_first_ratio",
        "confidence_levels": [0.95, 0.99],
    },
}


def work(asked: Asked) -> float:
    """Count the laws of the horizon; those of mixes follow from the assets and are few."""
    columns, horizon = asked.get("portfolio_columns"), asked.get("horizon_years", 1.0)
    rows = [columns] if columns is not None else asked["portfolios"]
    return work_of([row.returns for row in rows if row.returns is not None], horizon)


@endpoint(
    "/v1/rankings",
    name="Ranking",
    question=RankingQuestion,
    answers=(ROWS, COLUMNS),
    examples=EXAMPLES,
    batch=False,
    write=write_ranking,
    work=work,
)
def rankings(asked: Asked) -> Result:
    """Which portfolio is the safest for this floor?"""
    columns, assets, correlations = (asked.get(name) for name in ("portfolio_columns", "assets", "correlations"))
    rows: list[Portfolio] = asked.get("portfolios", [])
    if columns is not None:
        names, portfolios = columns.names, Portfolios(columns.returns, columns.names)
        models = {"/portfolio_columns": columns.returns.model}
    else:
        names = tuple(row.name for row in rows)
        returns = [resolved(row, assets, "portfolios", i) for i, row in enumerate(rows)]
        portfolios = Portfolios(returns, names)
        models = {f"/portfolios/{i}/returns": each.model for i, each in enumerate(returns)}
        correlations = known_correlations(rows, assets) if correlations is None else correlations
    floor = floor_of(asked)
    limits = asked.get("limits", {})
    found = rank(
        portfolios,
        CoreQuestion(
            floor,
            asked.get("criterion", "safety_first_ratio"),
            limits.get("shortfall_probability"),
            correlations=correlations,
            **settings_of(asked),
        ),
    )
    cautions = beside_shortfalls(floor.horizon_years, losses=bool(found.shortfall.tail_losses))
    cautions += [
        sentence("estimates_taken_as_true"),
        *ranking_cautions(found),
        *about_mixes(rows, assets),
        *slips_in(asked, models),
    ]
    reason = found.confidence_reason or "not_computed"
    return Result(
        ranking_values(found, names, columns=columns is not None),
        found.shortfall.method,
        found.shortfall.numerical_error,
        found.shortfall.numerical_error_kind,
        tuple(cautions),
        {
            "/confidence_in_leader": reason,
            "/pairwise_confidence": reason,
            "/agreement": "not_computed",
            "/dominated": "not_computed",
        },
    )


def known_correlations(rows: Sequence[Portfolio], assets: Assets | None) -> Numbers | None:
    """Give the correlations of portfolios that are all mixes of the same assets; they follow from these."""
    if assets is None or any(row.weights is None for row in rows):
        return None
    return assets.correlation_of_mixes(np.stack([assets.aligned(dict(row.weights or {})) for row in rows]))
