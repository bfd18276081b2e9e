"""Returns with Student's t, or log returns with it."""

from functools import partial

import numpy as np

from service.core.arrays import INFINITY, NO_VALUE, Numbers, number
from service.core.distributions.family import Moments
from service.core.parameters import Parameter
from service.core.returns.compounding.bessel_law import BesselLaw
from service.core.returns.compounding.compound import compounded
from service.core.returns.compounding.growth import floored
from service.core.returns.compounding.listed import certain
from service.core.returns.compounding.nodes_student_t import StudentTPart
from service.core.returns.compounding.step import Step
from service.core.returns.distinct import law_of_each
from service.core.returns.law import HorizonLaw
from service.core.returns.laws.exponential_t import ExponentialTLaw
from service.core.returns.laws.student_t import StudentTLaw, scale_of_t
from service.core.returns.model import LARGEST, ReturnModel


class StudentT(ReturnModel):
    """Bell-shaped returns with more very bad and very good periods than the normal model.

    Y = expected_return + volatility sqrt((v - 2)/v) t_v, v = degrees_of_freedom (Blattberg & Gonedes 1974). With
    continuous compounding Y is the log return; the mean of the return itself is then infinite.
    """

    name = "student_t"
    expected_return = Parameter("mean return of one period", at_least=-LARGEST, at_most=LARGEST, example=0.06)
    volatility = Parameter("standard deviation of the return of one period", at_least=0, at_most=LARGEST, example=0.1)
    degrees_of_freedom = Parameter("the fewer, the heavier the tails", above=2, at_most=1e15, example=5)

    def moments(self) -> Moments:
        mean, deviation, v = np.broadcast_arrays(self.expected_return, self.volatility, self.degrees_of_freedom)
        spread = deviation > 0
        skewness = np.where(spread & (v > 3), 0.0, NO_VALUE)
        heavy = np.where(v > 4, 6 / np.where(v > 4, v - 4, 1), INFINITY)
        return Moments(mean, deviation, skewness, np.where(spread, heavy, NO_VALUE))

    def horizon_law(self, periods: Numbers, compounding: str) -> HorizonLaw:
        if periods != 1:
            return law_of_each(self, partial(_compounded, periods=int(periods), compounding=compounding))
        v = self.degrees_of_freedom
        law = ExponentialTLaw if compounding == "continuous" else StudentTLaw
        return law(v, self.expected_return, scale_of_t(v, self.volatility), self.volatility)


def _compounded(one: StudentT, periods: int, compounding: str) -> HorizonLaw:
    mean, deviation, v = one.expected_return, one.volatility, one.degrees_of_freedom
    scale = scale_of_t(v, deviation)
    if compounding == "continuous":
        return certain(mean, number(periods)) if scale == 0 else BesselLaw(v, mean, scale, deviation, periods)
    if scale == 0:
        return certain(np.log1p(mean), number(periods))
    part = StudentTPart(v, mean, scale)
    laws = (StudentTLaw(v, centre, scale, deviation) for centre in (mean, -mean))
    return compounded(Step((part,), floored(*laws)), periods)
