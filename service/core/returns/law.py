"""What every law of a return over a horizon answers."""

from typing import NamedTuple

import numpy as np

from service.core.arrays import INFINITY, MINUS_INFINITY, NO_VALUE, Numbers, Truths

COINCIDENCE = 1e-14
"""Outcomes this close, as a share of the growth factor, are one: a floor of 2 % met by log(1.02) is met."""


class Gaps(NamedTuple):
    """E[max(threshold - R, 0)] and the mean of its square."""

    order_1: Numbers
    order_2: Numbers


class LogGrowth(NamedTuple):
    """Mean and standard deviation of log(1 + R); nan where R <= -1 is possible."""

    mean: Numbers
    standard_deviation: Numbers


class Ordering(NamedTuple):
    """What decides stochastic dominance exactly among laws of one `kind` and one `shape`.

    First order: equal scales and the greater location. Second order: a level no lower and a scale no greater, one of
    them strictly. `level` is the location or the mean, or nan where the second order never holds.
    """

    kind: str
    shape: Numbers
    location: Numbers
    scale: Numbers
    level: Numbers


class Atoms(NamedTuple):
    """The possible values in rising order, and P(R <= each)."""

    values: Numbers
    cumulative: Numbers


class HorizonLaw:
    """The law of R, the simple return over the whole horizon, for one portfolio or an array of them.

    Thresholds are returns over the horizon and levels lie strictly between 0 and 1; both broadcast with the law's own
    arrays. Infinite figures are inf, figures without a value nan. A law whose spread is 0 is a point mass, and a
    threshold on that point counts as reached. Callers silence numpy's floating-point warnings.
    """

    method: str = "closed_form"
    numerical_error_kind: str = "bound"
    numerical_error: float
    """Bound on the error of every figure: absolute for figures up to 1 in size, relative beyond."""
    discrete: bool = False
    """Whether single outcomes have probabilities and the quantiles jump, listed by `atoms` or too many for it."""
    cautions: tuple[str, ...] = ()
    """Codes of what a reader of any figure has to know."""
    work: float = 0.0
    """Multiplications that making the law took, where they are many."""

    def mean(self) -> Numbers:
        """E[R]."""
        raise NotImplementedError

    def standard_deviation(self) -> Numbers:
        """sd[R]."""
        raise NotImplementedError

    def probability_below(self, threshold: Numbers) -> Numbers:
        """P(R < threshold): a return equal to the threshold is acceptable."""
        raise NotImplementedError

    def probability_at_most(self, threshold: Numbers) -> Numbers:
        """P(R <= threshold)."""
        raise NotImplementedError

    def certain(self, threshold: Numbers) -> Truths:
        """Whether P(R < threshold) is 0 or 1 by the law itself, not merely closer to it than a double can tell."""
        raise NotImplementedError

    def gaps(self, threshold: Numbers) -> Gaps:
        """Lower partial moments of orders 1 and 2."""
        raise NotImplementedError

    def quantile(self, probability: Numbers) -> Numbers:
        """Give the smallest x with P(R <= x) >= probability."""
        raise NotImplementedError

    def upper_quantile(self, probability: Numbers) -> Numbers:
        """inf{x: P(R <= x) > probability}; the same as `quantile` for a law without atoms."""
        return self.quantile(probability)

    def expected_shortfall(self, probability: Numbers) -> Numbers:
        """Mean loss in the worst `probability` of outcomes, atoms split (Acerbi & Tasche 2002, definition 2.6)."""
        raise NotImplementedError

    def log_growth(self) -> LogGrowth:
        """Mean and standard deviation of log(1 + R)."""
        raise NotImplementedError

    def total_loss_probability(self) -> Numbers:
        """P(R <= -1)."""
        raise NotImplementedError

    def ordering(self) -> Ordering | None:
        """What decides dominance exactly within the law's kind; None where only the values can tell."""
        return None

    def atoms(self) -> Atoms | None:
        """Give the possible values, where they can be listed."""
        return None


def score(distance: Numbers, spread: Numbers, closeness: Numbers) -> Numbers:
    """Give distance / spread, and for a point mass +inf where the distance exceeds `closeness`, else -inf."""
    beyond = np.where(distance > closeness, INFINITY, MINUS_INFINITY)
    return np.where(spread > 0, distance / spread, beyond)


def log_growth_factor(threshold: Numbers) -> Numbers:
    """log(1 + threshold), minus infinity at and below a total loss."""
    return np.where(threshold > -1, np.log1p(np.maximum(threshold, -1.0)), MINUS_INFINITY)


def log_growth_of_point(location: Numbers, scale: Numbers) -> LogGrowth:
    """Log growth of a law that reaches below a total loss unless its scale is 0: nan, or that of the point."""
    certain = (scale == 0) & (location > -1)
    return LogGrowth(
        np.where(certain, np.log1p(np.where(certain, location, 0.0)), NO_VALUE), np.where(certain, 0.0, NO_VALUE)
    )
