"""Asking for shortfalls and rankings in tests, with plain numbers."""

from collections.abc import Sequence
from typing import Any

from service.core.portfolio import Floor, Portfolios, Ranking, RankingQuestion, Shortfall, rank, shortfall
from service.core.returns import Returns
from tests.core.returns.build import as_numbers, returns


def floor(threshold: Any = 0.02, horizon_years: float = 1.0, basis: str = "per_year") -> Floor:
    """A floor of 2 % a year over one year, unless told otherwise."""
    return Floor(as_numbers(threshold), basis, horizon_years)


def normal(mean: float, deviation: float, **more: Any) -> Returns:
    """Normal returns."""
    return returns("normal", expected_return=mean, volatility=deviation, **more)


def figures(of: Returns, threshold: Any = 0.02, horizon_years: float = 1.0, **more: Any) -> Shortfall:
    """Every figure of these returns against a floor."""
    return shortfall(of, floor(threshold, horizon_years), **more)


def ranking(of: Sequence[Returns] | Returns, names: Sequence[str | None] = (), **question: Any) -> Ranking:
    """Rank against a floor of 2 %, unless the question says otherwise."""
    asked = {"floor": floor()} | question
    return rank(Portfolios(of, names), RankingQuestion(**asked))
