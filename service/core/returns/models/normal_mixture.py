"""Returns, or log returns, of calm and of stormy periods."""

import numpy as np

from service.core.arrays import Numbers
from service.core.distributions.family import Moments
from service.core.parameters import Components, Parameter
from service.core.returns.compounding.compound import compounded
from service.core.returns.compounding.growth import UNKNOWN, floored
from service.core.returns.compounding.mixed import mixed, mixed_growth
from service.core.returns.compounding.nodes_normal import NormalPart
from service.core.returns.compounding.step import Step
from service.core.returns.compounding.values import law_of_values
from service.core.returns.law import HorizonLaw
from service.core.returns.laws.lognormal import LognormalLaw
from service.core.returns.laws.mixture import MixtureLaw
from service.core.returns.laws.normal import NormalLaw
from service.core.returns.mixed_moments import mixed_moments
from service.core.returns.model import LARGEST, ReturnModel


class NormalMixture(ReturnModel):
    """Calm and stormy periods in one law: in each, one of several normal laws rules by chance.

    Y ~ N(expected_return, volatility^2) of the component that rules, drawn with the probability of its weight, anew in
    each period (Pearson 1894). With continuous compounding Y is the log return.
    """

    name = "normal_mixture"
    components = Components(
        "the normal laws of one period",
        share="weight",
        example=[
            {"weight": 0.85, "expected_return": 0.08, "volatility": 0.12},
            {"weight": 0.15, "expected_return": -0.1, "volatility": 0.3},
        ],
        weight=Parameter("the probability of the component", above=0, at_most=1, example=0.85),
        expected_return=Parameter("the component's mean return", at_least=-LARGEST, at_most=LARGEST, example=0.08),
        volatility=Parameter("the component's standard deviation", at_least=0, at_most=LARGEST, example=0.12),
    )

    def _parts(self) -> tuple[Numbers, Numbers, Numbers]:
        """Weights that add up to 1, means, standard deviations."""
        weights, means, deviations = self.components.T
        return weights / weights.sum(), means, deviations

    def moments(self) -> Moments:
        weights, means, deviations = self._parts()
        none = np.zeros_like(means)
        return mixed_moments(weights, Moments(means, deviations, none, none))

    def horizon_law(self, periods: Numbers, compounding: str) -> HorizonLaw:
        weights, means, deviations = self._parts()
        if compounding == "continuous":
            if periods == 1:
                return MixtureLaw(weights, LognormalLaw(means, deviations))
            return mixed_growth(weights, means, deviations, int(periods))
        if periods == 1:
            return MixtureLaw(weights, NormalLaw(means, deviations))
        return _compounded(weights, means, deviations, int(periods))


def _compounded(weights: Numbers, means: Numbers, deviations: Numbers, periods: int) -> HorizonLaw:
    spread = deviations > 0
    if not spread.any():
        return law_of_values(np.log1p(np.maximum(means, -1)), weights, periods)
    parts = [NormalPart(m, s, weight=float(w)) for w, m, s in zip(weights, means, deviations, strict=True) if s > 0]
    growths = [
        floored(NormalLaw(m, s), NormalLaw(-m, s)) for m, s in zip(means[spread], deviations[spread], strict=True)
    ]
    growth_means, growth_deviations = np.maximum(means, -1), np.zeros_like(means)
    growth_means[spread] = [np.expm1(growth.log_mean) for growth in growths]
    growth_deviations[spread] = [np.exp(g.log_mean) * np.sqrt(g.relative_variance) for g in growths]
    alive = ~spread & (means > -1)
    lost = np.where(~spread & (means <= -1), weights, 0.0)
    lost[spread] = [part.zero_probability for part in parts]
    growth = mixed(weights, growth_means, growth_deviations, lost.sum(), UNKNOWN)
    return compounded(Step(tuple(parts), growth, np.log1p(means[alive]), weights[alive]), periods)
