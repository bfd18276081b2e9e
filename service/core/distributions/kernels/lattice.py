"""Laws on the whole numbers: quantiles on the exact tail, entropy by bounded sums."""

from collections.abc import Callable

import numpy as np
from scipy.special import ndtri_exp

from service.core.arrays import Numbers, Truths, flat
from service.core.distributions.kernels.logarithms import smaller_tail
from service.core.distributions.kernels.quadrature import MEDIUM

MOST_STEPS = 120
TIE = 4e-15
BLOCK = 4096
SMOOTH_FROM = 8.0

LogTails = Callable[..., tuple[Numbers, Numbers]]
"""From whole numbers and parameters to the logarithms of P(X <= k) and P(X > k)."""


def lattice_quantile(
    log_tails: LogTails,
    probability: Numbers,
    *parameters: Numbers,
    upper: bool,
    moments: tuple[Numbers, Numbers, Numbers],
    ends: tuple[Numbers, Numbers],
) -> Numbers:
    """Give the smallest whole k whose tail reaches the probability, by a secant on the log tail within a bracket.

    `moments` (mean, standard deviation, skewness) make the first guess (Cornish & Fisher 1937). Every second of the
    later steps halves the bracket, so that the number of steps grows with the logarithm of its width alone. A tie is
    granted within 4e-15 (1 + |log p|): there p equals the attained probability to working accuracy.
    """
    tail, lower = smaller_tail(probability, upper)
    shape, (p, is_lower, mean, spread, skewness, bottom, high, *rest) = flat(tail, lower, *moments, *ends, *parameters)
    target = np.log(p)
    side = np.where(is_lower > 0, 1.0, -1.0)
    low = bottom - 1
    z = side * ndtri_exp(target)
    guess = mean + spread * (z + np.clip(np.nan_to_num(skewness), -5, 5) * (z * z - 1) / 6)
    k = np.clip(np.floor(np.where(np.isfinite(guess), guess, mean)), bottom, high)
    active = np.flatnonzero(high - low > 1)
    step = 0
    while active.size and step < MOST_STEPS:
        here = [v[active] for v in rest]
        at, aim, sign = k[active], target[active], side[active]
        first, second = (_pick(log_tails(j, *here), sign) for j in (at, at + 1))
        gap = (first - aim) * sign
        reached = gap >= -TIE * (1 + np.abs(aim))
        high[active] = np.where(reached, at, high[active])
        low[active] = np.where(reached, low[active], at)
        secant = at - gap / ((second - first) * sign)
        bracket = low[active], high[active]
        k[active] = _next_place(at, secant, reached, bracket, halve=step >= 8 and step % 2 == 0)
        active = active[high[active] - low[active] > 1]
        step += 1
    return high.reshape(shape)[()]


def _pick(both: tuple[Numbers, Numbers], sign: Numbers) -> Numbers:
    return np.where(sign > 0, *both)


def _next_place(
    at: Numbers, secant: Numbers, reached: Truths, bracket: tuple[Numbers, Numbers], halve: bool
) -> Numbers:
    """Round the secant's place so that it can close the bracket, and keep it inside."""
    low, high = bracket
    middle = np.where(np.isfinite(high), np.floor((low + high) / 2), 2 * np.abs(at) + 1)
    place = np.where(reached, np.floor(secant + 1e-9), np.ceil(secant - 1e-9))
    place = np.where(np.isfinite(place) & ~(halve & np.isfinite(high)), place, middle)
    farthest = np.where(np.isfinite(high), high - 1, at + 1 + 4 * (np.abs(at) + 1))
    return np.clip(place, low + 1, farthest)


def lattice_entropy(
    log_mass: Callable[..., Numbers],
    *parameters: Numbers,
    moments: tuple[Numbers, Numbers],
    ends: tuple[Numbers, Numbers],
) -> Numbers:
    """-sum of m log m over a law on the whole numbers with tails no heavier than Poisson's.

    All masses within 13 standard deviations and 30 more, where the standard deviation is below 8. Beyond, the sum is
    replaced by the trapezoidal rule in steps of half a standard deviation for the mass as a function of a real k,
    which for such smooth functions errs by exp(-8 pi^2). Work: at most 270 masses. Error 1e-14 of max(1, entropy).
    """
    shape, (centre, sd, bottom, top, *rest) = flat(*moments, *ends, *parameters)
    total = np.zeros(centre.size)
    for smooth in (False, True):
        chosen = np.flatnonzero((sd >= SMOOTH_FROM) == smooth)
        for first in range(0, chosen.size, BLOCK):
            i = chosen[first : first + BLOCK]
            step = sd[i] / 2 if smooth else np.ones(i.size)
            reach = np.ceil(13 * sd[i].max()) + 30 if not smooth else 28.0
            places = np.round(centre[i]) + step * np.arange(-reach, reach + 1)[:, None]
            inside = (places >= bottom[i]) & (places <= top[i])
            logs = log_mass(np.where(inside, places, np.round(centre[i])), *(v[i] for v in rest))
            masses = np.where(inside, np.exp(logs), 0)
            total[i] = -step * np.where(masses > 0, masses * logs, 0).sum(axis=0)
    return total.reshape(shape)[()]


def smallest_mode(turning_point: Numbers) -> Numbers:
    """Mode of a law whose masses rise up to `turning_point`: k with mass(k - 1) <= mass(k) as long as k is below it.

    At a whole turning point two masses are equal and the smaller place is given; within 2 eps counts as whole.
    """
    mode: Numbers = np.maximum(np.ceil(turning_point * (1 - 4e-16)) - 1, 0)
    return mode


FIRST = 512
PANELS = 40


def long_lattice_entropy(
    log_mass: Callable[..., Numbers], *parameters: Numbers, moments: tuple[Numbers, Numbers], far: Numbers
) -> Numbers:
    """-sum of m log m over the whole numbers from 0, for a law that may have a long tail; `far` ends it.

    Near the normal law (mean 13 standard deviations from 0) as in `lattice_entropy`. Else up to 512 masses one by one;
    the rest is the integral from 511.5 with the first term of the midpoint rule's error (Euler & Maclaurin), on 40
    panels of 36 points: of equal width over a bump (standard deviation below half the mean), else of equal ratio.
    Work: at most 2,000 masses. Error 1e-14 of max(1, entropy).
    """
    shape, (mean, spread, end, *rest) = flat(*moments, far, *parameters)
    total = np.zeros(mean.size)
    normal_like = (mean >= 13 * spread) & (spread >= SMOOTH_FROM)
    i = np.flatnonzero(normal_like)
    if i.size:
        some = [v[i] for v in rest]
        ends = (np.zeros(i.size), np.full(i.size, np.inf))
        total[i] = lattice_entropy(log_mass, *some, moments=(mean[i], spread[i]), ends=ends)
    chosen = np.flatnonzero(~normal_like)
    chosen = chosen[np.argsort(end[chosen])]
    for first in range(0, chosen.size, BLOCK // 8):
        i = chosen[first : first + BLOCK // 8]
        total[i] = _long_sum(log_mass, [v[i] for v in rest], mean[i], spread[i], end[i])
    return total.reshape(shape)[()]


def _long_sum(
    log_mass: Callable[..., Numbers], parameters: list[Numbers], mean: Numbers, spread: Numbers, end: Numbers
) -> Numbers:
    def share(k: Numbers) -> Numbers:
        logs = log_mass(k, *parameters)
        return np.where(np.isfinite(logs), -np.exp(logs) * logs, 0)

    total: Numbers = share(np.arange(min(float(FIRST), end.max() + 1))[:, None]).sum(axis=0)
    start = FIRST - 0.5
    if end.max() > start:
        far = np.maximum(end, start)
        steps = np.arange(PANELS + 1)[:, None] / PANELS
        near = np.clip(mean - 14 * spread, start, far)
        edges = np.where(2 * spread < mean, near + (far - near) * steps, start * (far / start) ** steps)
        width = np.diff(edges, axis=0)
        places = edges[:-1] + MEDIUM.over(width)
        values = share(places.reshape(-1, end.size)).reshape(places.shape)
        bend = (share(np.full(end.shape, start + 0.5)) - share(np.full(end.shape, start - 0.5))) / 24
        total += np.where(end > start, (width * MEDIUM.mean(values)).sum(axis=0) + bend, 0)
    return total
