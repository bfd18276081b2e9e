"""Moments of extreme values: of c^-1 (Y^-c - 1) for an exponential Y, where differences of gamma functions cancel."""

import numpy as np
from scipy.special import gammaln, zeta

from service.core.arrays import Numbers, flat
from service.core.distributions.family import Moments
from service.core.distributions.kernels.elementary import expm1_minus_x

EULER_GAMMA = 0.57721566490153286061
APERY = 1.2020569031595942854
SERIES_BELOW = 0.22
TERMS = 340
BLOCK = 4096


def extreme_moments(c: Numbers) -> Moments:
    """Moments of the generalized extreme value law of location 0, scale 1 and shape c.

    With g_k = Gamma(1 - k c), the logarithms of g_2/g_1^2, g_3/g_1^3, g_4/g_1^4 and their binomial combinations come
    from the zeta series of log Gamma(1 - x) (Abramowitz & Stegun 6.1.33), term by term, for |c| < 0.22; beyond, from
    log Gamma. Error 1e-14, the excess kurtosis 4e-13. Infinite from c = 1/k for the k-th moment; a higher one has no
    value where the variance is infinite.
    """
    shape, (flat_c,) = flat(c)
    series = np.abs(flat_c) < SERIES_BELOW
    logs = np.where(series, _by_series(np.where(series, flat_c, 0.0)), _by_gammaln(flat_c))
    first, second, third, fourth, third_rest, fourth_rest = logs
    safe = np.where(flat_c == 0, 1.0, flat_c)
    spread_square = np.expm1(second)
    mean = np.expm1(first) / safe
    spread = np.exp(first) * np.sqrt(spread_square) / np.abs(safe)
    skewness = np.sign(flat_c) * (third_rest + expm1_minus_x(third) - 3 * expm1_minus_x(second)) / spread_square**1.5
    remainders = expm1_minus_x(fourth) - 4 * expm1_minus_x(third) + 6 * expm1_minus_x(second)
    excess = (fourth_rest + remainders) / spread_square**2 - 3
    skew_of_gumbel = 12 * np.sqrt(6) * APERY / np.pi**3
    at_0 = (EULER_GAMMA, np.pi / np.sqrt(6), skew_of_gumbel, 2.4)
    figures = [np.where(flat_c == 0, limit, f) for limit, f in zip(at_0, (mean, spread, skewness, excess), strict=True)]
    beyond = [
        np.full_like(flat_c, np.inf),
        np.where(flat_c < 1, np.inf, np.nan),
        np.where(2 * flat_c < 1, np.inf, np.nan),
        np.where(2 * flat_c < 1, np.inf, np.nan),
    ]
    return Moments(
        *(
            np.where(k * flat_c < 1, figure, rest).reshape(shape)[()]
            for k, (figure, rest) in enumerate(zip(figures, beyond, strict=True), start=1)
        )
    )


def _coefficients() -> Numbers:
    """Rows: log g_1 (less its first term), log(g_k/g_1^k) for k = 2, 3, 4, and their combinations without low powers.

    zeta(n)/n times 1, 2^n - 2, 3^n - 3, 4^n - 4, 3^n - 3 2^n + 3, 4^n - 4 3^n + 6 2^n - 4; n = 2, 3, ...; in whole
    numbers, which do not cancel.
    """
    rows = [
        (1, 2**n - 2, 3**n - 3, 4**n - 4, 3**n - 3 * 2**n + 3, 4**n - 4 * 3**n + 6 * 2**n - 4) for n in range(2, TERMS)
    ]
    powers = np.arange(2.0, TERMS)
    table: Numbers = np.array(rows, dtype=np.float64).T * (zeta(powers) / powers)
    return table


COEFFICIENTS = _coefficients()


def _by_series(c: Numbers) -> Numbers:
    """Log g_1, log(g_k/g_1^k) for k = 2, 3, 4, and those of k = 3, 4 less 3 and (4, -6) times the lower ones."""
    powers = np.arange(2.0, TERMS)[:, None]
    blocks = [COEFFICIENTS @ c[i : i + BLOCK] ** powers for i in range(0, c.size, BLOCK)]
    logs: Numbers = np.concatenate(blocks, axis=1)
    logs[0] += EULER_GAMMA * c
    return logs


def _by_gammaln(c: Numbers) -> Numbers:
    first = gammaln(1 - c)
    second, third, fourth = (gammaln(1 - k * c) - k * first for k in (2, 3, 4))
    return np.array([first, second, third, fourth, third - 3 * second, fourth - 4 * third + 6 * second])
