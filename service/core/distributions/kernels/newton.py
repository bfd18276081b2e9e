"""Newton's method on the logarithm of a tail."""

from collections.abc import Callable

import numpy as np

from service.core.arrays import Numbers, flat

MOST_STEPS = 80

OfPlace = Callable[..., Numbers]
"""A function of the place u and of further parameters, all one-dimensional and of one length."""


def newton_on_log_tail(
    log_tail: OfPlace,
    log_density: OfPlace,
    target: Numbers,
    start: Numbers,
    *parameters: Numbers,
    rising: bool,
    low: Numbers | float = -np.inf,
    high: Numbers | float = np.inf,
) -> Numbers:
    """Solve log_tail(u, *parameters) = target within [low, high], which may be infinite; everything is flat.

    `log_density` is the logarithm of the density in u; `rising`: the tail grows with u.
    For a log-concave density the log tail is concave, so that the iteration is monotone after one step from any
    start; a bracket and bisection guard the rest. Error: that of the tail over its slope, and 2 eps of u.
    """
    _, (u, low, high) = flat(start, low, high)
    side = 1 if rising else -1
    active = np.arange(u.size)
    step = 0
    while active.size and step < MOST_STEPS:
        step += 1
        here = [p[active] for p in parameters]
        v = u[active]
        log_value = log_tail(v, *here)
        gap = (log_value - target[active]) * side
        beyond = gap > 0
        high[active] = np.where(beyond, np.minimum(high[active], v), high[active])
        low[active] = np.where(beyond, low[active], np.maximum(low[active], v))
        move = -gap / np.exp(np.minimum(log_density(v, *here) - log_value, 700.0))
        new = v + move
        strays = ~np.isfinite(new) | (new < low[active]) | (new > high[active])
        u[active] = np.where(strays, _between(low[active], high[active]), new)
        close = (np.abs(move) <= 1e-9 * np.maximum(1e-300, np.abs(new))) & (np.abs(gap) < 1e-7)
        settled = (np.abs(move) <= 2e-16 * np.abs(new)) | close
        done = (np.abs(gap) <= 3e-16) | (settled & ~strays)
        active = active[~done]
    return u


def _between(low: Numbers, high: Numbers) -> Numbers:
    """Middle of a bracket; where an end is infinite, a point well beyond the other end."""
    outward = np.where(np.isfinite(low), low + 2 * np.maximum(1, np.abs(low)), high - 2 * np.maximum(1, np.abs(high)))
    return np.where(np.isfinite(low) & np.isfinite(high), 0.5 * (low + high), outward)
