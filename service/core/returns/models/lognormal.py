"""Returns whose growth factor is lognormal."""

import numpy as np

from service.core.arrays import Numbers
from service.core.distributions.family import Moments
from service.core.parameters import Parameter
from service.core.returns.law import HorizonLaw
from service.core.returns.laws.exponential_t import predictive_log_growth
from service.core.returns.laws.lognormal import LognormalLaw, growth_moments
from service.core.returns.lognormal_growth import growth_return_moments, log_parameters
from service.core.returns.model import LARGEST, ReturnModel


class Lognormal(ReturnModel):
    """Growth that multiplies up over any horizon and never loses everything.

    log(1 + Y) is normal with log variance s^2 = log(1 + volatility^2/(1 + expected_return)^2) and log mean
    log(1 + expected_return) - s^2/2; both grow with the number of periods (Aitchison & Brown 1957).
    """

    name = "lognormal"
    compoundings = ("simple",)
    divides = ("simple",)
    predictive = ("simple",)
    expected_return = Parameter("mean return of one period", above=-1, at_most=LARGEST, example=0.06)
    volatility = Parameter("standard deviation of the return of one period", at_least=0, at_most=LARGEST, example=0.1)

    def moments(self) -> Moments:
        return growth_return_moments(self.expected_return, self.volatility)

    def horizon_law(self, periods: Numbers, compounding: str) -> HorizonLaw:  # noqa: ARG002 - simple alone
        log_mean, variance = log_parameters(self.expected_return, self.volatility)
        moments = self.expected_return, self.volatility
        if periods != 1:
            moments = growth_moments(periods * np.log1p(self.expected_return), periods * variance)
        return LognormalLaw(periods * log_mean, np.sqrt(periods * variance), moments)

    def predictive_law(self, periods: Numbers, compounding: str, sample_size: Numbers) -> HorizonLaw:  # noqa: ARG002
        log_mean, variance = log_parameters(self.expected_return, self.volatility)
        return predictive_log_growth(log_mean, np.sqrt(variance), periods, sample_size)
