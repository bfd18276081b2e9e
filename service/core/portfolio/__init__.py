"""Figures of portfolios against a floor: shortfalls, rankings, dominance, confidence."""

from service.core.portfolio.collection import Portfolios
from service.core.portfolio.criteria import CRITERIA, Criterion
from service.core.portfolio.floor import Floor
from service.core.portfolio.question import Ranking, RankingQuestion
from service.core.portfolio.ranking import rank
from service.core.portfolio.shortfall import Shortfall, shortfall

__all__ = [
    "CRITERIA",
    "Criterion",
    "Floor",
    "Portfolios",
    "Ranking",
    "RankingQuestion",
    "Shortfall",
    "rank",
    "shortfall",
]
