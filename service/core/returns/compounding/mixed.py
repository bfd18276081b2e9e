"""Growth by one of several lognormal laws in each period: a mixture again, over how often each rules."""

import numpy as np

from service.core.arrays import Numbers, number
from service.core.returns.compounding.compositions import compositions, count_of_compositions
from service.core.returns.compounding.compound import compounded, refuse_periods
from service.core.returns.compounding.growth import Growth
from service.core.returns.compounding.nodes_normal import NormalPart
from service.core.returns.compounding.step import Part, Step
from service.core.returns.compounding.values import law_of_values
from service.core.returns.law import HorizonLaw, LogGrowth
from service.core.returns.laws.lognormal import LognormalLaw, growth_moments
from service.core.returns.laws.mixture import MixtureLaw

MOST_COMPOSITIONS = 20_000
MOST_TERMS = 1_000
"""Terms of a sum that are kept; beyond, many thresholds would take long, and Fourier inversion is as exact."""
NEGLIGIBLE = 1e-20


def mixed_growth(weights: Numbers, log_means: Numbers, log_deviations: Numbers, periods: int) -> HorizonLaw:
    """Give the law of the growth over n periods, log G ~ N(log_means[i], log_deviations[i]^2) with weights[i].

    Over n periods in which component i rules c_i times, the log growth is normal with mean and variance summed; the
    multinomial sum over all c is exact (terms below 1e-20 are left out). Fourier inversion where it is too long.
    """
    refuse_periods(periods)
    if not log_deviations.any():
        return law_of_values(log_means, weights, periods)
    if count_of_compositions(periods, weights.size) <= MOST_COMPOSITIONS:
        masses, (means, variances) = compositions(periods, weights, [log_means, log_deviations**2])
        kept = masses > NEGLIGIBLE
        if kept.sum() <= MOST_TERMS:
            return MixtureLaw(masses[kept] / masses[kept].sum(), LognormalLaw(means[kept], np.sqrt(variances[kept])))
    return compounded(_step(weights, log_means, log_deviations), periods)


def _step(weights: Numbers, log_means: Numbers, log_deviations: Numbers) -> Step:
    means, deviations = growth_moments(log_means + log_deviations**2 / 2, log_deviations**2)
    log_growth = LogGrowth(*_mean_and_deviation(weights, log_means, log_deviations))
    growth = mixed(weights, means, deviations, number(0), log_growth)
    spread = log_deviations > 0
    parts: list[Part] = [
        NormalPart(m, s, weight=float(w), simple=False)
        for w, m, s in zip(weights[spread], log_means[spread], log_deviations[spread], strict=True)
    ]
    return Step(tuple(parts), growth, log_means[~spread], weights[~spread])


def mixed(
    weights: Numbers, means: Numbers, deviations: Numbers, zero_probability: Numbers, log_growth: LogGrowth
) -> Growth:
    """Give the growth of a factor that has mean 1 + means[i] and these deviations with probability weights[i]."""
    mean, deviation = _mean_and_deviation(weights, means, deviations)
    return Growth(np.log1p(mean), np.square(deviation / (1 + mean)), zero_probability, log_growth)


def _mean_and_deviation(weights: Numbers, means: Numbers, deviations: Numbers) -> tuple[Numbers, Numbers]:
    mean = weights @ means
    return mean, np.sqrt(weights @ (deviations**2 + (means - mean) ** 2))
