"""The growth over several periods, for a law of one that has no simpler way."""

from service.core.arrays import MINUS_INFINITY, number
from service.core.returns.compounding.fourier_law import FourierLaw
from service.core.returns.compounding.listed import point
from service.core.returns.compounding.step import Step
from service.core.returns.law import HorizonLaw
from service.core.returns.work import too_much_work

MOST_PERIODS = 100_000
NEVER_ALIVE = 1e-11
"""Below it the window, which leaves out some 1e-12, would be empty."""


def compounded(step: Step, periods: int) -> HorizonLaw:
    """Give the law of the return over n periods by Fourier inversion; a total loss if nearly nothing else happens."""
    refuse_periods(periods)
    if (1 - step.growth.zero_probability) ** periods < NEVER_ALIVE:
        law = point(MINUS_INFINITY, step.growth, number(periods))
        law.numerical_error = NEVER_ALIVE
        return law
    return FourierLaw(step, periods)


def refuse_periods(periods: int) -> None:
    """Refuse more periods than the error is known for."""
    if periods > MOST_PERIODS:
        detail = f"The horizon has {periods} periods; at most {MOST_PERIODS} are compounded. Use a longer period."
        raise too_much_work(("horizon_years",), detail, periods, MOST_PERIODS)
