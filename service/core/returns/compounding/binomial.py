"""Moves of two sizes: the binomial law of how many are up."""

import numpy as np

from service.core.arrays import Numbers
from service.core.distributions.family import Moments
from service.core.distributions.kernels.saddle_point import log_binomial_mass
from service.core.returns.compounding.growth import Growth, growth_of_values
from service.core.returns.compounding.listed import MOST_LISTED, listed_law
from service.core.returns.law import HorizonLaw
from service.core.returns.mixed_moments import mixed_moments
from service.core.returns.work import too_much_work


def binomial_law(
    up: Numbers, down: Numbers, up_probability: Numbers, moves: Numbers, periods: Numbers, compounding: str
) -> HorizonLaw:
    """Give the law of the return after so many moves: moves + 1 outcomes, masses in Loader's saddle-point form."""
    if moves > MOST_LISTED:
        detail = f"There are {float(moves):.15g} moves over the horizon; at most {MOST_LISTED} can be listed."
        raise too_much_work(("horizon_years",), detail, float(moves), MOST_LISTED)
    log_growth, masses = _outcomes(up, down, up_probability, moves, compounding)
    ways = _logs(up, down, compounding)
    one = growth_of_values(np.array(ways), np.array([up_probability, 1 - up_probability]))
    of_period = Growth(
        moves / periods * one.log_mean,
        np.expm1(moves / periods * np.log1p(one.relative_variance)),
        one.total_loss(moves / periods),
        one.log_moments(moves / periods),
    )
    finite = np.abs(log_growth[np.isfinite(log_growth)])
    return listed_law(log_growth, masses, of_period, periods, float(finite.max(initial=0.0)))


def binomial_moments(up: Numbers, down: Numbers, up_probability: Numbers, moves: Numbers, compounding: str) -> Moments:
    """Moments of the return of one period as it is modelled: simple, or the log return."""
    log_growth, masses = _outcomes(up, down, up_probability, moves, compounding)
    values = log_growth if compounding == "continuous" else np.expm1(log_growth)
    none = np.zeros_like(values)
    return mixed_moments(masses, Moments(values, none, none, none))


def _logs(up: Numbers, down: Numbers, compounding: str) -> tuple[Numbers, Numbers]:
    return (up, down) if compounding == "continuous" else (np.log1p(up), np.log1p(down))


def _outcomes(
    up: Numbers, down: Numbers, up_probability: Numbers, moves: Numbers, compounding: str
) -> tuple[Numbers, Numbers]:
    """Log growth and probability of every number of moves up; impossible ones are left out."""
    log_up, log_down = _logs(up, down, compounding)
    hits = np.arange(float(moves) + 1)
    masses = np.exp(log_binomial_mass(hits, moves, up_probability, 1 - up_probability))
    growth = hits * log_up + np.where(hits < moves, (moves - hits) * log_down, 0.0)
    possible = masses > 0
    masses = masses[possible]
    return growth[possible], masses / masses.sum()
