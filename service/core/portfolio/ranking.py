"""Portfolios best first by a criterion, with what else a reader has to know about the order."""

from dataclasses import dataclass, replace
from itertools import combinations

import numpy as np

from service.core.arrays import NO_VALUE, Truths
from service.core.portfolio.collection import Collection, Portfolios, collected
from service.core.portfolio.confidence import confidence_in_leader, pairwise_confidence
from service.core.portfolio.correlations import checked_correlations
from service.core.portfolio.criteria import CRITERIA, HIGHER
from service.core.portfolio.dominance import dominated
from service.core.portfolio.estimates import estimates_of
from service.core.portfolio.question import Agreement, Caution, Confidence, Pairwise, Ranking, RankingQuestion
from service.core.portfolio.ranks import NO_RANK, kendall_tau_b, ranked
from service.core.portfolio.shortfall import Shortfall, figures
from service.core.portfolio.summary import Outcome, summary
from service.core.returns.laws.collected import Positions

MOST_COMPARED = 1_000
"""Beyond so many portfolios nothing is compared pair by pair."""
LIMIT_TOLERANCE = 1e-12
PAIRS_LISTED = 100


def rank(portfolios: Portfolios, question: RankingQuestion) -> Ranking:
    """Rank the portfolios (1 or more). Raises DoesNotFit; paths lead from the question."""
    if question.correlations is not None:
        checked = checked_correlations(question.correlations, portfolios.count, ("correlations",))
        question = replace(question, correlations=checked)
    collection = collected(portfolios, question.floor.horizon_years, question.parameter_uncertainty)
    with np.errstate(all="ignore"):
        return _ranking(portfolios, question, collection)


def _ranking(portfolios: Portfolios, question: RankingQuestion, collection: Collection) -> Ranking:
    found = figures(
        collection.law,
        collection.moments,
        question.floor,
        question.confidence_levels,
        question.quantile_probability,
        question.outcomes_count,
    )
    limit = np.inf if question.limit is None else question.limit
    admissible = np.asarray(found.shortfall_probability <= limit + LIMIT_TOLERANCE)
    order, ranks = _order(question.criterion, found, admissible)
    ranks_by_criterion = {
        name: ranked(criterion.value(found), criterion.better == HIGHER, found.numerical_error)[1]
        for name, criterion in CRITERIA.items()
    }
    few = collection.law.count <= MOST_COMPARED
    confidence = _confidence(collection, question, order, admissible)
    cautions = _cautions(ranks_by_criterion, admissible, few)
    return Ranking(
        criterion=question.criterion,
        order=order,
        ranks=ranks,
        admissible=admissible,
        shortfall=found,
        ranks_by_criterion=ranks_by_criterion,
        agreement=_agreement(ranks_by_criterion) if few else None,
        dominated=dominated(collection.law, order) if few else None,
        confidence_in_leader=confidence.joint,
        pairwise_confidence=confidence.pairs if few else None,
        confidence_reason=confidence.reason,
        cautions=(*cautions, *(Caution(code, {}) for code in found.cautions), *confidence.cautions),
        summary=summary(
            Outcome(
                question,
                order,
                ranks,
                ranks_by_criterion["shortfall_probability"],
                admissible,
                found.frequencies,
                portfolios.name,
            )
        ),
    )


def _order(criterion_name: str, found: Shortfall, admissible: Truths) -> tuple[Positions, Positions]:
    """Admissible ones by the criterion, those without a value after them, then the others by shortfall probability."""
    criterion = CRITERIA[criterion_name]
    values = np.where(admissible, criterion.value(found), NO_VALUE)
    order, ranks = ranked(values, criterion.better == HIGHER, found.numerical_error)
    by_probability, _ = ranked(found.shortfall_probability, False, found.numerical_error)
    return np.concatenate([order[admissible[order]], by_probability[~admissible[by_probability]]]), ranks


def _agreement(ranks_by_criterion: dict[str, Positions]) -> tuple[Agreement, ...]:
    matrix = kendall_tau_b(list(ranks_by_criterion.values()))
    places = {name: i for i, name in enumerate(ranks_by_criterion)}
    return tuple(Agreement((a, b), float(matrix[places[a], places[b]])) for a, b in combinations(ranks_by_criterion, 2))


@dataclass(frozen=True)
class _InLeader:
    """The confidence in the leader, or the reason why there is none."""

    joint: Confidence | None
    pairs: tuple[Pairwise, ...] | None
    reason: str | None
    cautions: tuple[Caution, ...]


def _confidence(collection: Collection, question: RankingQuestion, order: Positions, admissible: Truths) -> _InLeader:
    """Compare the leader with every other admissible portfolio, in the order of the ranking."""
    if not admissible.any():
        return _InLeader(None, None, "none_admissible", ())
    estimates = estimates_of(collection, question, admissible)
    if isinstance(estimates, str):
        return _InLeader(None, None, estimates, ())
    leader, others = int(order[0]), order[1:][admissible[order[1:]]]
    joint = confidence_in_leader(estimates, leader, others)
    chances = pairwise_confidence(estimates, leader, others)
    pairs = tuple(Pairwise(int(j), float(chance)) for j, chance in zip(others, chances, strict=True))
    cautions = [Caution("leader_by_luck", {})]
    if question.correlations is None and others.size:
        cautions.append(Caution("independence_assumed", {}))
    return _InLeader(joint, pairs, None, tuple(cautions))


def _cautions(ranks_by_criterion: dict[str, Positions], admissible: Truths, few: bool) -> tuple[Caution, ...]:
    cautions = [Caution("first_is_not_safe" if admissible.any() else "none_admissible", {})]
    pairs = disagreeing_pairs(
        ranks_by_criterion["safety_first_ratio"], ranks_by_criterion["shortfall_probability"], few
    )
    if len(pairs):
        listed = {"pairs": pairs[:PAIRS_LISTED].tolist(), "pairs_total": len(pairs) if few else None}
        cautions.append(Caution("ratio_and_probability_disagree", listed))
    return tuple(cautions)


def disagreeing_pairs(first: Positions, second: Positions, all_pairs: bool) -> Positions:
    """Pairs of positions that two rankings order differently, as rows; portfolios without a rank are left out.

    Not `all_pairs`: only neighbours in the first ranking (ties by the second), of which there is one exactly where
    there is any pair at all.
    """
    known = np.flatnonzero((first != NO_RANK) & (second != NO_RANK))
    if not all_pairs:
        sequence = known[np.lexsort((second[known], first[known]))]
        at = np.flatnonzero(np.diff(second[sequence]) < 0)
        return np.sort(np.stack([sequence[at], sequence[at + 1]], axis=1), axis=1)
    opposite = np.sign(np.subtract.outer(first[known], first[known])) * np.sign(
        np.subtract.outer(second[known], second[known])
    )
    return known[np.argwhere(np.triu(opposite < 0))]
