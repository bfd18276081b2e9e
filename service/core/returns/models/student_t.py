"""Returns with Student's t, or log returns with it."""

import numpy as np

from service.core.arrays import INFINITY, NO_VALUE, Numbers
from service.core.distributions.family import Moments
from service.core.parameters import Parameter
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

    def horizon_law(self, periods: Numbers, compounding: str) -> HorizonLaw:  # noqa: ARG002 - one period alone
        v = self.degrees_of_freedom
        law = ExponentialTLaw if compounding == "continuous" else StudentTLaw
        return law(v, self.expected_return, scale_of_t(v, self.volatility), self.volatility)
