"""Growth of calm and of stormy periods that never loses everything."""

import numpy as np

from service.core.arrays import Numbers
from service.core.distributions.family import Moments
from service.core.parameters import Components, Parameter
from service.core.returns.compounding.mixed import mixed_growth
from service.core.returns.law import HorizonLaw
from service.core.returns.laws.lognormal import LognormalLaw
from service.core.returns.laws.mixture import MixtureLaw
from service.core.returns.lognormal_growth import growth_return_moments, log_parameters
from service.core.returns.mixed_moments import mixed_moments
from service.core.returns.model import LARGEST, ReturnModel


class LognormalMixture(ReturnModel):
    """Calm and stormy periods whose growth never loses everything: in each, one of several lognormal laws rules.

    log(1 + Y) is normal with the log parameters of the component that rules (see lognormal), drawn with the
    probability of its weight, anew in each period.
    """

    name = "lognormal_mixture"
    compoundings = ("simple",)
    components = Components(
        "the lognormal laws of one period",
        share="weight",
        example=[
            {"weight": 0.85, "expected_return": 0.08, "volatility": 0.12},
            {"weight": 0.15, "expected_return": -0.1, "volatility": 0.3},
        ],
        weight=Parameter("the probability of the component", above=0, at_most=1, example=0.85),
        expected_return=Parameter("the component's mean return", above=-1, at_most=LARGEST, example=0.08),
        volatility=Parameter("the component's standard deviation", at_least=0, at_most=LARGEST, example=0.12),
    )

    def _parts(self) -> tuple[Numbers, Numbers, Numbers]:
        """Weights that add up to 1, mean returns, standard deviations."""
        weights, means, deviations = self.components.T
        return weights / weights.sum(), means, deviations

    def moments(self) -> Moments:
        weights, means, deviations = self._parts()
        return mixed_moments(weights, growth_return_moments(means, deviations))

    def horizon_law(self, periods: Numbers, compounding: str) -> HorizonLaw:  # noqa: ARG002 - simple alone
        weights, means, deviations = self._parts()
        log_means, variances = log_parameters(means, deviations)
        if periods != 1:
            return mixed_growth(weights, log_means, np.sqrt(variances), int(periods))
        return MixtureLaw(weights, LognormalLaw(log_means, np.sqrt(variances), (means, deviations)))
