"""What a ranking is asked, and what it answers."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any, NamedTuple

from service.core.arrays import Numbers, Truths
from service.core.portfolio.floor import Floor
from service.core.portfolio.shortfall import Shortfall
from service.core.returns.laws.collected import Positions


@dataclass(frozen=True)
class RankingQuestion:
    """How to rank. `floor` holds one threshold; `limit` is the greatest acceptable shortfall probability (Telser).

    `correlations`: of the portfolios' returns, a square matrix in their order, for the confidence in the leader.
    """

    floor: Floor
    criterion: str = "safety_first_ratio"
    limit: float | None = None
    quantile_probability: float = 0.05
    confidence_levels: Sequence[float] = ()
    outcomes_count: int | None = None
    correlations: Numbers | None = None
    parameter_uncertainty: str = "ignored"


class Agreement(NamedTuple):
    """Kendall's tau-b of the rankings by two criteria; nan where it has no value."""

    criteria: tuple[str, str]
    kendall_tau_b: float


@dataclass(frozen=True, slots=True)
class Dominated:
    """A portfolio that the one at `by_index` dominates, at first or second order; basis "exact" or "numerical"."""

    index: int
    by_index: int
    order: int
    basis: str


class Confidence(NamedTuple):
    """How probable it is that the leader truly leads; `probability` is nan where only the bounds are known."""

    probability: float
    at_least: float
    at_most: float


@dataclass(frozen=True, slots=True)
class Pairwise:
    """How probable it is that the leader is truly no worse than the portfolio at `index`."""

    index: int
    probability: float


class Caution(NamedTuple):
    """A caution of the answer: its code, and the figures that its sentence needs."""

    code: str
    params: Mapping[str, Any]


@dataclass(frozen=True)
class Ranking:
    """The answer. `order` lists positions best first; everything else stands in the order of the question.

    `ranks` and `ranks_by_criterion`: 0 where there is none. `agreement`, `dominated` and `pairwise_confidence` are None
    beyond 1,000 portfolios; the two confidences are None too where `confidence_reason` says why.
    """

    criterion: str
    order: Positions
    ranks: Positions
    admissible: Truths
    shortfall: Shortfall
    ranks_by_criterion: Mapping[str, Positions]
    agreement: tuple[Agreement, ...] | None
    dominated: tuple[Dominated, ...] | None
    confidence_in_leader: Confidence | None
    pairwise_confidence: tuple[Pairwise, ...] | None
    confidence_reason: str | None
    cautions: tuple[Caution, ...]
    summary: str
