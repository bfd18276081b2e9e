"""Normally distributed returns, or log returns."""

from functools import partial

import numpy as np

from service.core.arrays import NO_VALUE, Numbers, number
from service.core.distributions.family import Moments
from service.core.parameters import Parameter
from service.core.returns.compounding.compound import compounded
from service.core.returns.compounding.growth import floored
from service.core.returns.compounding.listed import certain
from service.core.returns.compounding.nodes_normal import NormalPart
from service.core.returns.compounding.step import Step
from service.core.returns.distinct import law_of_each
from service.core.returns.law import HorizonLaw
from service.core.returns.laws.exponential_t import predictive_log_growth
from service.core.returns.laws.lognormal import LognormalLaw
from service.core.returns.laws.normal import NormalLaw
from service.core.returns.laws.student_t import StudentTLaw
from service.core.returns.model import LARGEST, ReturnModel


class Normal(ReturnModel):
    """The usual first model of a yearly return; says little about rare, large losses.

    Y ~ N(expected_return, volatility^2) (Roy 1952). With continuous compounding Y is the log return: its mean and
    variance grow with the number of periods.
    """

    name = "normal"
    divides = ("continuous",)
    predictive = ("simple", "continuous")
    normally_distributed = True
    expected_return = Parameter("mean return of one period", at_least=-LARGEST, at_most=LARGEST, example=0.06)
    volatility = Parameter("standard deviation of the return of one period", at_least=0, at_most=LARGEST, example=0.1)

    def moments(self) -> Moments:
        mean, deviation = np.broadcast_arrays(self.expected_return, self.volatility)
        symmetric = np.where(deviation > 0, 0.0, NO_VALUE)
        return Moments(mean, deviation, symmetric, symmetric)

    def horizon_law(self, periods: Numbers, compounding: str) -> HorizonLaw:
        if compounding == "continuous":
            return LognormalLaw(periods * self.expected_return, np.sqrt(periods) * self.volatility)
        if periods == 1:
            return NormalLaw(self.expected_return, self.volatility)
        return law_of_each(self, partial(_compounded, periods=int(periods)))

    def predictive_law(self, periods: Numbers, compounding: str, sample_size: Numbers) -> HorizonLaw:
        if compounding == "continuous":
            return predictive_log_growth(self.expected_return, self.volatility, periods, sample_size)
        scale = self.volatility * np.sqrt(1 + 1 / sample_size)
        return StudentTLaw(sample_size - 1, self.expected_return, scale)


def _compounded(one: Normal, periods: int) -> HorizonLaw:
    mean, deviation = one.expected_return, one.volatility
    if deviation == 0:
        return certain(np.log1p(mean), number(periods))
    part = NormalPart(mean, deviation)
    return compounded(Step((part,), floored(NormalLaw(mean, deviation), NormalLaw(-mean, deviation))), periods)
