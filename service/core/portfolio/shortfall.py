"""Every figure of a portfolio against a floor."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from service.core.arrays import NO_VALUE, Numbers, number
from service.core.distributions.family import Moments
from service.core.errors import DoesNotFit
from service.core.portfolio.floor import Floor, per_year
from service.core.portfolio.frequencies import RESOLVED, Frequencies, frequencies
from service.core.returns import HorizonLaw, Returns, law_of_horizon
from service.core.returns.horizon import placed
from service.core.returns.law import COINCIDENCE, log_growth_factor


class LowerPartialMoments(NamedTuple):
    """E[max(threshold - R, 0)^j] (Bawa 1975)."""

    order_0: Numbers
    order_1: Numbers
    order_2: Numbers


class ThresholdAtProbability(NamedTuple):
    """The return that is missed with `probability` (Kataoka 1963): over the horizon, and the same per year."""

    probability: float
    threshold: Numbers
    threshold_per_year: Numbers


class TailLoss(NamedTuple):
    """Losses positive, as a share of the value at the start (Acerbi & Tasche 2002)."""

    confidence_level: float
    value_at_risk: Numbers
    expected_shortfall: Numbers


@dataclass(frozen=True)
class Shortfall:
    """The figures, each of the shape of portfolios and thresholds broadcast; over the horizon, unit share of the start.

    A figure without a value is nan, an infinite one +-inf. `outcomes` has the n outcomes, worst first, along a new
    first axis. `actual_moments` are those of the modelled return of one period.
    """

    shortfall_probability: Numbers
    frequencies: Frequencies
    expected_return: Numbers
    volatility: Numbers
    safety_first_ratio: Numbers
    log_safety_first_ratio: Numbers
    distribution_free_bound: Numbers
    expected_gap: Numbers
    mean_return_in_shortfall: Numbers
    mean_gap_in_shortfall: Numbers
    lower_partial_moments: LowerPartialMoments
    threshold_at_probability: ThresholdAtProbability
    tail_losses: tuple[TailLoss, ...]
    total_loss_probability: Numbers
    actual_moments: Moments
    outcomes: Numbers | None
    method: str
    numerical_error: float
    numerical_error_kind: str
    cautions: tuple[str, ...]
    """Codes of what holds for the law of one portfolio at least."""


def shortfall(
    returns: Returns,
    floor: Floor,
    confidence_levels: Sequence[float] = (),
    quantile_probability: float = 0.05,
    outcomes_count: int | None = None,
    parameter_uncertainty: str = "ignored",
) -> Shortfall:
    """Give every figure of `returns` against `floor`. Levels and probabilities lie strictly between 0 and 1.

    Raises DoesNotFit: `horizon_years` and `parameter_uncertainty` of the question, `sample_size` of the returns.
    """
    try:
        law = law_of_horizon(returns, floor.horizon_years, parameter_uncertainty)
    except DoesNotFit as unfit:
        raise DoesNotFit(placed(refusal, ("portfolio", "returns")) for refusal in unfit.refusals) from None
    with np.errstate(all="ignore"):
        return figures(law, returns.moments(), floor, confidence_levels, quantile_probability, outcomes_count)


def figures(
    law: HorizonLaw,
    moments: Moments,
    floor: Floor,
    confidence_levels: Sequence[float],
    quantile_probability: float,
    outcomes_count: int | None,
) -> Shortfall:
    """Give every figure of a law against a floor. Callers silence numpy's warnings."""
    tau = np.asarray(floor.over_horizon())
    probability, certain = law.probability_below(tau), law.certain(tau)
    shape = np.shape(probability)
    mean, deviation = law.mean(), law.standard_deviation()
    gap, square_gap = law.gaps(tau)
    # below ten numerical errors the quotient would be noise
    resolved = np.asarray((probability > 0) & (certain | (probability >= RESOLVED * law.numerical_error)))
    mean_gap = np.where(resolved, gap / probability, NO_VALUE)
    quantile, tail_losses = _quantiles(law, quantile_probability, confidence_levels, shape)
    growth = law.log_growth()

    def fit(figure: Numbers) -> Numbers:
        return np.broadcast_to(figure, shape)[()]

    return Shortfall(
        shortfall_probability=fit(probability),
        frequencies=frequencies(fit(probability), certain, law.numerical_error),
        expected_return=fit(mean),
        volatility=fit(deviation),
        safety_first_ratio=fit(ratio(mean, tau, deviation, COINCIDENCE * (1 + np.abs(tau)))),
        log_safety_first_ratio=fit(
            ratio(growth.mean, _log_threshold(tau), growth.standard_deviation, number(COINCIDENCE))
        ),
        distribution_free_bound=fit(distribution_free_bound(mean, tau, deviation)),
        expected_gap=fit(gap),
        mean_return_in_shortfall=fit(tau - mean_gap),
        mean_gap_in_shortfall=fit(mean_gap),
        lower_partial_moments=LowerPartialMoments(fit(probability), fit(gap), fit(square_gap)),
        threshold_at_probability=ThresholdAtProbability(
            quantile_probability, fit(quantile), fit(per_year(quantile, floor.horizon_years))
        ),
        tail_losses=tail_losses,
        total_loss_probability=fit(law.total_loss_probability()),
        actual_moments=Moments(*(fit(moment) for moment in moments)),
        outcomes=None if outcomes_count is None else _outcomes(law, outcomes_count, shape),
        method=law.method,
        numerical_error=law.numerical_error,
        numerical_error_kind=law.numerical_error_kind,
        cautions=law.cautions,
    )


def ratio(mean: Numbers, threshold: Numbers, deviation: Numbers, closeness: Numbers) -> Numbers:
    """(mean - threshold)/deviation (Roy 1952).

    Without deviation +-inf by the sign of the distance, nan where that is within `closeness`; nan too where mean or
    deviation is infinite.
    """
    distance = mean - threshold
    known = np.isfinite(mean) & np.isfinite(deviation)
    sure = np.where(np.abs(distance) > closeness, np.copysign(np.inf, distance), NO_VALUE)
    return np.where(known, np.where(deviation > 0, distance / deviation, sure), NO_VALUE)


def distribution_free_bound(mean: Numbers, threshold: Numbers, deviation: Numbers) -> Numbers:
    """Cantelli's bound on P(R <= threshold) for any law with these moments: 1 unless the mean lies above."""
    # 1/(1 + ratio^2): the squares themselves could overflow
    distance = np.maximum(mean - threshold, 0.0)
    bound = np.where(distance > 0, 1 / (1 + (distance / deviation) ** 2), 1.0)
    return np.where(np.isfinite(mean) & np.isfinite(deviation), bound, NO_VALUE)


def _log_threshold(threshold: Numbers) -> Numbers:
    """log(1 + threshold): minus infinity at a total loss, and nan below it."""
    return np.where(threshold >= -1, log_growth_factor(threshold), NO_VALUE)


def _quantiles(
    law: HorizonLaw, probability: float, confidence_levels: Sequence[float], shape: tuple[int, ...]
) -> tuple[Numbers, tuple[TailLoss, ...]]:
    """Give the quantile at the probability, and the losses at each level; all levels at once."""
    levels = _along_new_axis(np.array([1 - probability, *confidence_levels]), shape)
    tails = 1 - levels
    tails[0] = probability  # not by way of 1 - (1 - p)
    quantiles = np.broadcast_to(law.upper_quantile(tails), (len(tails), *shape))
    mean_losses = np.broadcast_to(law.expected_shortfall(tails[1:]), (len(tails) - 1, *shape))
    losses = zip(confidence_levels, -quantiles[1:], mean_losses, strict=True)
    return quantiles[0], tuple(TailLoss(level, loss[()], mean[()]) for level, loss, mean in losses)


def _along_new_axis(values: Numbers, shape: tuple[int, ...]) -> Numbers:
    """Put values along a new first axis before `shape`."""
    return values.reshape((-1,) + (1,) * len(shape))


def _outcomes(law: HorizonLaw, count: int, shape: tuple[int, ...]) -> Numbers:
    """Lower quantiles at (k - 1/2)/count for k = 1 ... count."""
    probabilities = _along_new_axis((np.arange(count) + 0.5) / count, shape)
    return np.broadcast_to(law.quantile(probabilities), (count, *shape))
