"""Returns as observed."""

from collections.abc import Iterator

import numpy as np

from service.core.arrays import Numbers
from service.core.distributions.family import Moments
from service.core.errors import Refusal
from service.core.parameters import Limit, Sample
from service.core.returns.compounding.compound import refuse_periods
from service.core.returns.compounding.values import law_of_values
from service.core.returns.law import HorizonLaw
from service.core.returns.laws.sample import SampleLaw, sample_moments
from service.core.returns.model import LARGEST, ReturnModel

LIMITS = {
    "simple": (Limit("at_least", -1), Limit("at_most", LARGEST)),
    "continuous": (Limit("at_least", -LARGEST), Limit("at_most", 300)),
}
"""A total loss is the least simple return; beyond the others a square would leave the doubles."""


class Empirical(ReturnModel):
    """The past as it was, no shape assumed; it holds nothing worse than the worst observation.

    Y takes each observation with the same probability; with simple compounding none lies below -1, and -1 is a total
    loss.
    """

    name = "empirical"
    observations = Sample("observed returns of one period", example=[-0.12, 0.03, 0.05, 0.05, 0.11, 0.21])

    def refusals(self, compounding: str) -> Iterator[Refusal]:
        yield from super().refusals(compounding)
        found = (limit.refusal("observations", self.observations) for limit in LIMITS.get(compounding, ()))
        yield from (refusal for refusal in found if refusal)

    def moments(self) -> Moments:
        return sample_moments(self.observations)

    def horizon_law(self, periods: Numbers, compounding: str) -> HorizonLaw:
        seen = self.observations
        if periods == 1:
            return SampleLaw(np.expm1(seen) if compounding == "continuous" else seen)
        refuse_periods(int(periods))
        logs = seen if compounding == "continuous" else np.log1p(seen)
        return law_of_values(logs, np.full(logs.size, 1 / logs.size), int(periods))
