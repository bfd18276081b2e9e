"""Temme's uniform expansion of the incomplete gamma functions for large shapes."""

from fractions import Fraction

import numpy as np
from scipy.special import erfcx

from service.core.arrays import Numbers
from service.core.distributions.kernels.logarithms import log_complement

ORDERS = 9
TERMS = 34


def _coefficients() -> Numbers:
    """Coefficients of eta^n / a^k (DLMF 8.12.7 to 8.12.12) in exact fractions, as a matrix [n, k].

    mu - log(1 + mu) = eta^2/2 with mu = sum of alpha_n eta^n; the first column is 1/mu - 1/eta, each next one follows.
    """
    length = TERMS + 2 * ORDERS + 3
    alpha = [Fraction(0), Fraction(1)]
    for n in range(2, length):
        rest = sum((alpha[j] * (n + 1 - j) * alpha[n + 1 - j] for j in range(2, n)), Fraction(0))
        alpha.append((alpha[n - 1] - rest) / (n + 1))
    first = [(n + 2) * alpha[n + 2] - (n == 0) for n in range(length - 3)]
    columns = [first]
    odd = 1
    for k in range(1, ORDERS):
        odd *= 2 * k + 1
        gamma = (-1) ** k * odd * alpha[2 * k + 1]
        previous = columns[-1]
        columns.append([gamma * first[n] + (n + 2) * previous[n + 2] for n in range(len(previous) - 2)])
    return np.array([[float(column[n]) for column in columns] for n in range(TERMS)])


COEFFICIENTS = _coefficients()


def log_gamma_tails_uniform(a: Numbers, x: Numbers, square: Numbers) -> tuple[Numbers, Numbers]:
    """Logarithms of P(a, x) and Q(a, x) for flat a >= 100 and `square` = eta^2 = 2 (mu - log(1 + mu)) < 1.

    mu = (x - a)/a. Both tails share exp(-a eta^2/2); the smaller one is erfcx and the expansion of the remainder
    (Temme 1979). Error 1e-15, and eps |log| in a tail.
    """
    above = x > a
    eta = np.where(above, 1, -1) * np.sqrt(square)
    by_order = COEFFICIENTS @ np.power(1 / a, np.arange(ORDERS)[:, None])
    remainder = np.zeros_like(a)
    for row in by_order[::-1]:
        remainder = remainder * eta + row
    remainder = remainder / np.sqrt(2 * np.pi * a)
    share = 0.5 * erfcx(np.sqrt(a * square / 2)) + np.where(above, remainder, -remainder)
    small = np.log(share) - a * square / 2
    large = log_complement(small)
    return np.where(above, large, small), np.where(above, small, large)
