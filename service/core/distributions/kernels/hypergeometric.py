"""Masses and tails of the hypergeometric law."""

import numpy as np

from service.core.arrays import Numbers, Truths, flat
from service.core.distributions.kernels.elementary import LOG_2PI, two_product
from service.core.distributions.kernels.logarithms import log_complement
from service.core.distributions.kernels.quadrature import MEDIUM
from service.core.distributions.kernels.saddle_point import deviance, stirling_error

SMOOTH_FROM = 2000.0
SMALLEST_SHARE = 1e-18
TINY = 1e-280
FIRST_BLOCK, LARGEST_BLOCK = 64, 16384
ENTRIES = 1 << 20


def log_hypergeometric_mass(k: Numbers, population: Numbers, marked: Numbers, draws: Numbers) -> Numbers:
    """Logarithm of C(marked, k) C(population - marked, draws - k)/C(population, draws), within the support.

    The binomial masses of the drawn among the marked and among the others, over that of the draws among all, at the
    probability draws/population; offsets from their means by exact products. k need not be whole. Error
    eps (3 + |value|), population to 1e12.
    """
    others = population - marked
    drawn = _log_part(k, marked, draws, population) + _log_part(draws - k, others, draws, population)
    value = drawn - _log_binomial_top(population, draws)
    sure = (draws == 0) | (draws == population) | (marked == 0) | (others == 0)
    return np.where(sure, 0, value)[()]


def _log_part(j: Numbers, size: Numbers, draws: Numbers, population: Numbers) -> Numbers:
    """Logarithm of the binomial mass of j of `size` at the probability draws/population."""
    left = size - j
    high, low = two_product(j, population)
    mean_high, mean_low = two_product(size, draws)
    excess = ((high - mean_high) + (low - mean_low)) / population
    safe, rest = np.maximum(j, 0.5), np.maximum(left, 0.5)
    value = (
        stirling_error(np.maximum(size, 0.5))
        - stirling_error(safe)
        - stirling_error(rest)
        - deviance(j, -excess, size * (draws / population))
        - deviance(left, excess, size * ((population - draws) / population))
        + 0.5 * (np.log(np.maximum(size, 0.5)) - np.log(safe) - np.log(rest) - LOG_2PI)
    )
    none = np.where(size > 0, size * np.log1p(-draws / population), 0)
    every = np.where(size > 0, size * np.log(draws / population), 0)
    return np.where(j == 0, none, np.where(left == 0, every, value))


def _log_binomial_top(population: Numbers, draws: Numbers) -> Numbers:
    rest = population - draws
    errors = stirling_error(population) - stirling_error(np.maximum(draws, 0.5)) - stirling_error(np.maximum(rest, 0.5))
    return errors + 0.5 * (np.log(population) - np.log(draws) - np.log(rest) - LOG_2PI)


def log_hypergeometric_tails(
    k: Numbers, population: Numbers, marked: Numbers, draws: Numbers
) -> tuple[Numbers, Numbers]:
    """Logarithms of P(X <= k) and P(X > k) for whole k.

    The tail on the outer side of the mean is computed: the mass next to k times the sum of the ratios outwards, until
    what is left is below 1e-18 of it; from a standard deviation of 2,000 the Euler-Maclaurin integral. Error 2e-13.
    """
    shape, (k, n, m, d) = flat(k, population, marked, draws)
    least, greatest = np.maximum(0, d + m - n), np.minimum(d, m)
    mean = d * (m / n)
    variance = mean * ((n - m) / n) * ((n - d) / np.maximum(n - 1, 1))
    inner = (k >= least) & (k < greatest)
    lower = k < mean
    small = np.full(k.shape, -np.inf)
    smooth = variance >= SMOOTH_FROM**2
    i = np.flatnonzero(inner & ~smooth)
    if i.size:
        small[i] = _log_sum(k[i], n[i], m[i], d[i], lower[i])
    i = np.flatnonzero(inner & smooth)
    if i.size:
        small[i] = _log_integral(k[i], n[i], m[i], d[i], lower[i])
    large = log_complement(small)
    at_most = np.where(k < least, -np.inf, np.where(k >= greatest, 0, np.where(lower, small, large)))
    above = np.where(k < least, 0, np.where(k >= greatest, -np.inf, np.where(lower, large, small)))
    return at_most.reshape(shape)[()], above.reshape(shape)[()]


def _log_sum(k: Numbers, n: Numbers, m: Numbers, d: Numbers, lower: Truths) -> Numbers:
    """Equal questions of a batch share one run outwards: all tails of a law follow from its farthest one."""
    if k.size == 1:
        return _outwards(k, n, m, d, lower)
    value = np.empty_like(k)
    laws, place = np.unique(np.stack([n, m, d, lower]), axis=1, return_inverse=True)
    place = place.ravel()
    if laws.shape[1] == 1:
        return _one_law(k, n[0], m[0], d[0], bool(lower[0]))
    order = np.argsort(place, kind="stable")
    cuts = np.searchsorted(place[order], np.arange(laws.shape[1] + 1))
    counts = np.diff(cuts)
    for law in np.flatnonzero(counts > 1):
        i = order[cuts[law] : cuts[law + 1]]
        value[i] = _one_law(k[i], n[i[0]], m[i[0]], d[i[0]], bool(lower[i[0]]))
    i = order[cuts[:-1][counts == 1]]
    if i.size:
        value[i] = _outwards(k[i], n[i], m[i], d[i], lower[i])
    return value


def _one_law(k: Numbers, n: Numbers, m: Numbers, d: Numbers, lower: bool) -> Numbers:
    """Tails at many values of one law: the outermost by ratios, the others by adding masses inwards."""
    values, place = np.unique(k if lower else -k, return_inverse=True)
    values = values if lower else -values
    step = 1 if lower else -1
    span = np.arange(values[0], values[-1] + step, step)
    tails = np.full(values.shape, -np.inf)
    if span.size <= ENTRIES:
        first = _outwards(values[:1], n, m, d, np.array([lower]))[0]
        logs = log_hypergeometric_mass(span[1:] if lower else span[:-1], n, m, d)
        top = np.max(logs, initial=first)
        sums = np.cumsum(np.exp(np.concatenate([[first], logs]) - top))
        at = np.abs(values - values[0]).astype(np.intp)
        tails = np.where(sums[at] > TINY, top + np.log(sums[at]), -np.inf)
    # far below the largest of these tails, and where they lie too far apart: each by itself
    alone = np.flatnonzero(np.isneginf(tails))
    if alone.size:
        tails[alone] = _outwards(values[alone], n, m, d, np.full(alone.shape, lower))
    return tails[place.ravel()]


def _outwards(k: Numbers, n: Numbers, m: Numbers, d: Numbers, lower: Truths) -> Numbers:
    """The mass next to k times the sum of the products of the ratios outwards, which fall."""
    # downwards in the marked is upwards in the others
    kind, drawn = np.where(lower, n - m, m), np.where(lower, d - k, k + 1)
    n, d, drawn, kind = np.broadcast_arrays(n, d, drawn, kind)
    total, term = np.ones(drawn.shape), np.ones(drawn.shape)
    active = np.arange(drawn.size)
    start, size = 0.0, FIRST_BLOCK
    while active.size:
        j = drawn[active] + start + np.arange(float(size))[:, None]
        a, b, c = kind[active], d[active], n[active]
        ratio = np.maximum(a - j, 0) * np.maximum(b - j, 0) / ((j + 1) * (c - a - b + j + 1))
        products = term[active] * np.cumprod(ratio, axis=0)
        total[active] += products.sum(axis=0)
        term[active], last = products[-1], ratio[-1]
        left = np.where(last < 1, term[active] * last / (1 - last), np.inf)
        active = active[left > SMALLEST_SHARE * total[active]]
        start, size = start + size, min(size * 4, LARGEST_BLOCK)
    next_value = np.where(lower, k, k + 1)
    value: Numbers = log_hypergeometric_mass(next_value, n, np.where(lower, n - kind, kind), d) + np.log(total)
    return value


def _log_integral(k: Numbers, n: Numbers, m: Numbers, d: Numbers, lower: Truths) -> Numbers:
    """Euler & Maclaurin at the half-integer beyond k: integral of f, f'/24 and 7 f'''/5760, f the mass at a real place.

    f is log-concave; 36 points up to where it has fallen by exp(-40), on a grid of exact doubles.
    """
    outwards = np.where(lower, -1.0, 1.0)
    edge = k + 0.5
    mean = d * (m / n)
    variance = mean * ((n - m) / n) * ((n - d) / (n - 1))
    log_edge = log_hypergeometric_mass(edge, n, m, d)
    gain, loss = (m - k) * (d - k), (k + 1) * (n - m - d + k + 1)
    fall = -outwards * np.log1p((gain - loss) / loss)
    grid = 2.0 ** np.floor(51 - np.log2(n))
    room = np.where(lower, edge - np.maximum(0, d + m - n), np.minimum(d, m) - edge)
    root = np.sqrt(fall * fall + 80 / variance)
    end = np.minimum(np.where(fall < 0, (root - fall) * variance, 80 / (fall + root)), room)
    t = MEDIUM.over(end)
    on_grid = np.round(t * grid) / grid
    drop = log_edge - log_hypergeometric_mass(edge + outwards * on_grid, n, m, d)
    drop = drop + (fall + on_grid / variance) * (t - on_grid)
    integral = end * MEDIUM.mean(np.exp(-drop))
    third = -(fall**3) + 3 * fall / variance
    value: Numbers = log_edge + np.log(integral - fall / 24 - 7 * third / 5760)
    return value
