"""What the portfolios' estimates say about the criterion of a ranking, for the confidence in its leader."""

import numpy as np
from scipy.special import ndtri

from service.core.arrays import Numbers, Truths, number
from service.core.portfolio.collection import Collection
from service.core.portfolio.confidence import (
    Covariance,
    Estimates,
    mean_covariance,
    quantile_covariance,
    ratio_covariance,
)
from service.core.portfolio.floor import Floor, per_year
from service.core.portfolio.question import RankingQuestion
from service.core.returns import Returns

NEEDS_SAMPLE_SIZE = "needs_sample_size"
NOT_COMPUTED = "not_computed"
NO_VALUE_REASON = "no_value"
RATIO_CRITERIA = ("safety_first_ratio", "shortfall_probability")


def estimates_of(collection: Collection, question: RankingQuestion, compared: Truths) -> Estimates | str:
    """Give the estimates behind the criterion, per period, or the reason why there are none.

    `compared`: which portfolios the leader is compared with. Available for normal returns of one period, compounding
    and sample size: ratio and shortfall probability by (mean - threshold)/deviation, quantile_return, and
    expected_return with simple compounding.
    """
    groups = [returns for returns, _ in collection.groups]
    sizes = [returns.sample_size for returns in groups]
    known_sizes = [size for size in sizes if size is not None]
    if len(known_sizes) < len(sizes):
        return NEEDS_SAMPLE_SIZE
    distinct_sizes = np.unique(np.concatenate([np.ravel(size) for size in known_sizes]))
    alike = {(returns.compounding, returns.periods_in_year) for returns in groups}
    if len(alike) > 1 or distinct_sizes.size > 1 or not all(r.model.normally_distributed for r in groups):
        return NOT_COMPUTED
    figures = _figures(collection, question, groups[0])
    if figures is None:
        return NOT_COMPUTED
    values, arguments, covariance = figures
    if not np.isfinite((values + arguments)[compared]).all():
        return NO_VALUE_REASON
    return Estimates(values, arguments, covariance, distinct_sizes[0], question.correlations)


def _figures(
    collection: Collection, question: RankingQuestion, returns: Returns
) -> tuple[Numbers, Numbers, Covariance] | None:
    """Values, the arguments of their covariances, and these; None where the criterion has no such theory here."""
    mean, deviation = collection.moments.mean, collection.moments.standard_deviation
    periods = returns.periods(question.floor.horizon_years)
    if question.criterion in RATIO_CRITERIA:
        ratio = (mean - _threshold_per_period(question.floor, periods, returns.compounding)) / deviation
        return ratio, ratio, ratio_covariance
    if question.criterion == "quantile_return":
        score = ndtri(number(question.quantile_probability)) / np.sqrt(periods)
        return mean + score * deviation, deviation, quantile_covariance(score)
    if question.criterion == "expected_return" and returns.compounding == "simple":
        return mean, deviation, mean_covariance
    return None


def _threshold_per_period(floor: Floor, periods: Numbers, compounding: str) -> Numbers:
    """On the scale of the modelled return: simple or logarithmic."""
    threshold = floor.over_horizon()
    if compounding == "simple":
        return per_year(threshold, float(periods))
    return np.log1p(threshold) / periods
