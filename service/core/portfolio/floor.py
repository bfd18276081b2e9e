"""The least acceptable return, per year or over the whole horizon."""

from dataclasses import dataclass

import numpy as np

from service.core.arrays import NO_VALUE, Numbers
from service.core.errors import DoesNotFit
from service.core.parameters import Limit


@dataclass(frozen=True)
class Floor:
    """The least acceptable simple return: a number or an array of them, as a share of the value at the start.

    basis "per_year": above -1, compounded over the horizon; "over_horizon": any number. Raises DoesNotFit, paths
    leading from the question that holds `threshold` and `horizon_years`.
    """

    threshold: Numbers
    basis: str = "per_year"
    horizon_years: float = 1.0

    def __post_init__(self) -> None:
        refusals = [Limit("above", 0).refusal("horizon_years", self.horizon_years)]
        if self.basis == "per_year":
            refusals.append(Limit("above", -1).refusal("threshold", np.asarray(self.threshold)))
        if any(refusals):
            raise DoesNotFit(refusal for refusal in refusals if refusal)

    def over_horizon(self) -> Numbers:
        """(1 + threshold)^horizon_years - 1, or the threshold itself where it is meant so."""
        if self.basis == "over_horizon" or self.horizon_years == 1:
            return self.threshold
        return np.expm1(self.horizon_years * np.log1p(self.threshold))


def per_year(over_horizon: Numbers, horizon_years: float) -> Numbers:
    """(1 + R)^(1/horizon_years) - 1; nan below a total loss, where no yearly return leads to R.

    Callers silence numpy's warnings.
    """
    if horizon_years == 1:
        return over_horizon
    possible = over_horizon >= -1
    yearly = np.expm1(np.log1p(np.where(possible, over_horizon, 0.0)) / horizon_years)
    return np.where(possible, yearly, NO_VALUE)
