"""Returns as observed."""

from collections.abc import Iterator

import numpy as np

from service.core.arrays import Numbers
from service.core.distributions.family import Moments
from service.core.errors import Refusal
from service.core.parameters import Limit, Sample
from service.core.returns.law import HorizonLaw
from service.core.returns.laws.sample import SampleLaw, sample_moments
from service.core.returns.model import ReturnModel

TOTAL_LOSS = Limit("at_least", -1)


class Empirical(ReturnModel):
    """The past as it was, no shape assumed; it holds nothing worse than the worst observation.

    Y takes each observation with the same probability; with simple compounding none lies below -1, and -1 is a total
    loss.
    """

    name = "empirical"
    observations = Sample("observed returns of one period", example=[-0.12, 0.03, 0.05, 0.05, 0.11, 0.21])

    def refusals(self, compounding: str) -> Iterator[Refusal]:
        yield from super().refusals(compounding)
        if compounding == "simple":
            found = TOTAL_LOSS.refusal("observations", self.observations)
            if found:
                yield found
        elif not np.isfinite(self._growth(compounding)).all():
            at = int(np.argmax(self.observations))
            detail = f"exp({self.observations[at]:.15g}) does not fit into double precision."
            yield Refusal(("observations", at), "not_representable", detail, {"field": "observations"})

    def _growth(self, compounding: str) -> Numbers:
        with np.errstate(over="ignore"):
            return np.expm1(self.observations) if compounding == "continuous" else self.observations

    def moments(self) -> Moments:
        return sample_moments(self.observations)

    def horizon_law(self, periods: Numbers, compounding: str) -> HorizonLaw:  # noqa: ARG002 - one period alone
        return SampleLaw(self._growth(compounding))
