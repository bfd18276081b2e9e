"""From the return of one period to the law of the return over a horizon."""

from dataclasses import dataclass, replace

import numpy as np

from service.core.arrays import Numbers, number
from service.core.distributions.family import Moments
from service.core.errors import DoesNotFit, Refusal
from service.core.parameters import Limit
from service.core.returns.law import HorizonLaw
from service.core.returns.model import ReturnModel

PERIODS_PER_YEAR = {"year": 1.0, "quarter": 4.0, "month": 12.0, "week": 52.0, "day": 252.0}
WHOLE = 1e-9
"""A number of periods this close to a whole one is whole."""
LEAST_SAMPLE = 4
"""With fewer observations the predictive law has no standard deviation."""


@dataclass(frozen=True)
class Returns:
    """How the return of one period is modelled, for one portfolio or, with arrays as parameters, for many.

    `periods_per_year`: the period's own number where None. `sample_size`: periods behind the estimates, a number or
    one per portfolio. Raises DoesNotFit, paths leading from this object.
    """

    model: ReturnModel
    period: str = "year"
    periods_per_year: float | None = None
    compounding: str = "simple"
    sample_size: Numbers | float | None = None

    def __post_init__(self) -> None:
        refusals = list(self.model.refusals(self.compounding))
        if self.periods_per_year is not None:
            found = Limit("above", 0).refusal("periods_per_year", self.periods_per_year)
            refusals += [found] if found else []
        if refusals:
            raise DoesNotFit(refusals)

    @property
    def periods_in_year(self) -> float:
        """Periods a year: the given number, or the period's own."""
        return PERIODS_PER_YEAR[self.period] if self.periods_per_year is None else self.periods_per_year

    def moments(self) -> Moments:
        """Give the moments of the modelled return of one period."""
        with np.errstate(all="ignore"):
            return self.model.moments_under(self.compounding)

    def periods(self, horizon_years: float) -> Numbers:
        """Give the number of periods in the horizon, the whole number where it is one within 1e-9."""
        exact = horizon_years * self.periods_in_year
        whole = round(exact)
        return number(whole if whole > 0 and abs(exact - whole) <= WHOLE else exact)


def law_of_horizon(returns: Returns, horizon_years: float, parameter_uncertainty: str = "ignored") -> HorizonLaw:
    """Give the law of the simple return over `horizon_years` (above 0) of independent periods.

    parameter_uncertainty "predictive" widens it by the sampling error of the estimates (Zellner & Chetty 1965; Klein &
    Bawa 1976). Raises DoesNotFit, paths leading from the question that holds `horizon_years`.
    """
    periods = returns.periods(horizon_years)
    with np.errstate(all="ignore"):
        if parameter_uncertainty == "predictive":
            sample_size = _sample_size(returns, periods)
            return returns.model.predictive_law(periods, returns.compounding, sample_size)
        if returns.compounding not in returns.model.divides:
            _refuse_part(returns, horizon_years, periods)
        return returns.model.horizon_law(periods, returns.compounding)


def _refuse_part(returns: Returns, horizon_years: float, periods: Numbers) -> None:
    """Refuse part of a period, for a law that does not divide."""
    if periods > 0 and periods == np.rint(periods):
        return
    params = {"model": returns.model.name, "periods": float(periods), "period": returns.period}
    detail = (
        f"horizon_years {horizon_years:.15g} is {float(periods):.15g} periods, and the law of {returns.model.name} "
        "returns does not divide. Give a horizon of whole periods, a shorter period with returns estimated for it, "
        "or a law that divides: lognormal, or normal with continuous compounding."
    )
    raise DoesNotFit([Refusal(("horizon_years",), "horizon_not_divisible", detail, params)])


def _sample_size(returns: Returns, periods: Numbers) -> Numbers:
    """Give the sample size for a predictive law, or refuse."""
    model = returns.model
    if returns.compounding not in model.predictive or (returns.compounding not in model.divides and periods != 1):
        detail = (
            "The uncertainty of the estimates can be included for the models normal (over several periods with "
            "continuous compounding) and lognormal alone."
        )
        params = {"model": model.name, "compounding": returns.compounding, "periods": float(periods)}
        raise DoesNotFit([Refusal(("parameter_uncertainty",), "predictive_not_available", detail, params)])
    if returns.sample_size is None:
        detail = "sample_size, the number of periods behind the estimates, is needed to include their uncertainty."
        raise DoesNotFit([Refusal(("returns", "sample_size"), "required", detail, {"by": "parameter_uncertainty"})])
    found = Limit("at_least", LEAST_SAMPLE).refusal("sample_size", returns.sample_size)
    if found:
        raise DoesNotFit([replace(found, path=("returns", *found.path))])
    size: Numbers = np.asarray(returns.sample_size, np.float64)[()]
    return size


def placed(refusal: Refusal, returns_at: tuple[str | int, ...]) -> Refusal:
    """Lead the path of a refusal about the returns to where they stand in the question."""
    if refusal.path[0] != "returns":
        return refusal
    return replace(refusal, path=(*returns_at, *refusal.path[1:]))
