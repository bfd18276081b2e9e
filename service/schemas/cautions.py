"""The sentences that stand beside figures which can hurt a client."""

from collections.abc import Sequence
from typing import Any

from service.core.codes import CAUTIONS
from service.core.portfolio.assets import Assets
from service.schemas.answers import Caution
from service.schemas.portfolio import Portfolio


def sentence(code: str, pointer: str | None = None, **params: Any) -> Caution:
    """Give a caution in its standing words."""
    return Caution(code, CAUTIONS[code], pointer, params)


def about_mixes(portfolios: Sequence[Portfolio], assets: Assets | None) -> list[Caution]:
    """Give what belongs beside mixes of lognormal assets."""
    mixed = any(portfolio.weights is not None for portfolio in portfolios)
    return (
        [sentence("law_is_approximation", "/assets/model")] if mixed and assets and assets.model == "lognormal" else []
    )


def beside_shortfalls(horizon_years: float, *, losses: bool) -> list[Caution]:
    """Give what belongs beside the figures of portfolios against a floor."""
    codes = ["model_not_forecast", "chance_not_size", "gap_over_all_outcomes", "loss_from_today_only"]
    if horizon_years > 1:
        codes.append("longer_is_not_safer")
    if losses:
        codes.append("not_the_most_you_can_lose")
    return [sentence(code) for code in codes]
