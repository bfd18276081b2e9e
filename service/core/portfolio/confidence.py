"""How far the leader of a ranking owes its place to chance in the data behind the estimates."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy.special import ndtr, owens_t

from service.core.arrays import NO_VALUE, Numbers, number
from service.core.portfolio.question import Confidence
from service.core.returns.laws.collected import Positions
from service.core.returns.mills import SQRT_2PI

Covariance = Callable[[Numbers, Numbers, Numbers], Numbers]
SPREAD_OF_NODES = 9.5
STEP = 0.2
MOST_FACTORS = 10_000_000
BLOCK = 500
NEGLIGIBLE = 1e-15


def ratio_variance(ratio: Numbers, skewness: Numbers, kurtosis: Numbers) -> Numbers:
    """N times the variance of an estimated ratio (mean - threshold)/deviation of independent returns (Mertens 2002).

    With skewness 0 and kurtosis 3, those of the normal law, 1 + ratio^2/2 (Lo 2002).
    """
    return 1 - skewness * ratio + (kurtosis - 1) * ratio * ratio / 4


def ratio_covariance(one: Numbers, other: Numbers, correlation: Numbers) -> Numbers:
    """N times the covariance of two estimated ratios, normal returns (Jobson & Korkie 1981; Memmel 2003)."""
    return correlation + one * other * correlation * correlation / 2


def quantile_covariance(score: Numbers) -> Covariance:
    """N times the covariance of two estimated quantiles mean + score deviation, from the two deviations."""
    return lambda one, other, correlation: one * other * (correlation + score * score * correlation * correlation / 2)


def mean_covariance(one: Numbers, other: Numbers, correlation: Numbers) -> Numbers:
    """N times the covariance of two estimated means, from the two deviations."""
    return one * other * correlation


@dataclass(frozen=True)
class Estimates:
    """Estimated figures, the greater the better, and what their sampling errors depend on; flat arrays.

    N times the covariance of two estimates is `covariance(argument_i, argument_j, correlation)`.
    """

    values: Numbers
    arguments: Numbers
    covariance: Covariance
    sample_size: Numbers
    correlations: Numbers | None
    """None: taken as independent."""

    def covariances(self, i: int, others: Positions) -> Numbers:
        """Covariance of estimate i with each of the others."""
        correlation = np.where(others == i, 1.0, 0.0) if self.correlations is None else self.correlations[i, others]
        return self.covariance(self.arguments[i], self.arguments[others], correlation) / self.sample_size

    def variances(self, of: Positions) -> Numbers:
        """Give the variance of each estimate."""
        return self.covariance(self.arguments[of], self.arguments[of], number(1)) / self.sample_size

    @property
    def independent(self) -> bool:
        """Whether no two of them are correlated."""
        return self.correlations is None or not np.triu(self.correlations, 1).any()


def pairwise_confidence(estimates: Estimates, leader: int, others: Positions) -> Numbers:
    """P(the leader's true figure is at least the other's), for each of the others, under a flat prior.

    Where the difference has no variance, as between copies: 1 or 0 by its sign.
    """
    lead = estimates.values[leader] - estimates.values[others]
    total = estimates.variances(np.array([leader])) + estimates.variances(others)
    variance = np.maximum(total - 2 * estimates.covariances(leader, others), 0.0)
    certain = variance <= NEGLIGIBLE * total
    chance: Numbers = ndtr(lead / np.sqrt(np.where(certain, 1.0, variance)))
    return np.where(certain, np.where(lead >= 0, 1.0, 0.0), chance)


def confidence_in_leader(estimates: Estimates, leader: int, others: Positions) -> Confidence:
    """P(the leader's true figure is at least everyone else's), under a flat prior.

    Exact for independent estimates (one integral) and for at most three; else the bounds that the pairs give.
    """
    pairs = pairwise_confidence(estimates, leader, others)
    if others.size <= 1:
        return _known(pairs.prod())
    joint: Numbers | None = None
    if estimates.independent:
        joint = _independent(estimates, leader, others)
    elif others.size == 2:
        joint = _of_three(estimates, leader, others, pairs)
    if joint is not None:
        return _known(joint)
    return Confidence(float(NO_VALUE), float(np.maximum(0, 1 - (1 - pairs).sum())), float(pairs.min()))


def _known(probability: Numbers) -> Confidence:
    value = float(np.clip(probability, 0, 1))
    return Confidence(value, value, value)


def _independent(estimates: Estimates, leader: int, others: Positions) -> Numbers | None:
    """Integrate the product of the others' distribution functions over the leader's density.

    Trapezoidal rule, whose step follows the sharpest factor and the number of factors: the error is below 1e-12. None
    where a factor is so sharp, or the others so many, that the work would be out of proportion.
    """
    own, theirs = (np.sqrt(estimates.variances(of)) for of in (np.array([leader]), others))
    step = STEP * np.minimum(1.0, (theirs / own).min()) / np.sqrt(1 + np.log(others.size) / 3)
    if not step * MOST_FACTORS > 2 * SPREAD_OF_NODES * others.size:
        return None
    x = np.arange(-SPREAD_OF_NODES, SPREAD_OF_NODES + step, step)
    leads = (estimates.values[leader] - estimates.values[others]) / theirs
    product = np.ones_like(x)
    for start in range(0, others.size, BLOCK):
        block = slice(start, start + BLOCK)
        product *= ndtr(leads[block] + np.multiply.outer(x, own / theirs[block])).prod(axis=1)
    integral: Numbers = step * (np.exp(-x * x / 2) @ product) / SQRT_2PI
    return integral


def _of_three(estimates: Estimates, leader: int, others: Positions, pairs: Numbers) -> Numbers:
    """Both differences at once, a bivariate normal law; where one has no variance, the other decides."""
    first, second = (int(other) for other in others)
    own = estimates.variances(np.array([leader]))[0]
    with_leader = estimates.covariances(leader, others)
    between = estimates.covariances(first, np.array([second]))[0]
    variances = own + estimates.variances(others) - 2 * with_leader
    if (variances <= NEGLIGIBLE * own).any():
        return number(pairs.min())
    correlation = (own - with_leader.sum() + between) / np.sqrt(variances.prod())
    scores = (estimates.values[leader] - estimates.values[others]) / np.sqrt(variances)
    return bivariate_at_most(scores[0], scores[1], correlation)


def bivariate_at_most(h: Numbers, k: Numbers, correlation: Numbers) -> Numbers:
    """P(X <= h, Y <= k) for standard normals with this correlation, by Owen's T (Owen 1956). Error 1e-15."""
    if correlation >= 1 - NEGLIGIBLE:
        return np.minimum(ndtr(h), ndtr(k))
    if correlation <= NEGLIGIBLE - 1:
        return np.maximum(ndtr(h) + ndtr(k) - 1, 0.0)
    if h == 0 and k == 0:
        return 0.25 + np.arcsin(correlation) / (2 * np.pi)
    across = np.sqrt((1 - correlation) * (1 + correlation))

    def owen(a: Numbers, b: Numbers) -> Numbers:
        return np.copysign(0.25, b) if a == 0 else owens_t(a, (b / a - correlation) / across)

    apart = h * k < 0 or (h * k == 0 and h + k < 0)
    both: Numbers = (ndtr(h) + ndtr(k)) / 2 - owen(h, k) - owen(k, h) - (0.5 if apart else 0.0)
    return both
