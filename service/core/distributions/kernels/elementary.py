"""Elementary functions that lose digits when written plainly, and exact products."""

from math import factorial

import numpy as np

from service.core.arrays import Numbers

HALF_LOG_2PI = 0.9189385332046727418
SQRT_2PI = 2.5066282746310005024
LOG_2PI = 1.8378770664093454836
LOG_PI = 1.1447298858494001741


def two_product(a: Numbers, b: Numbers) -> tuple[Numbers, Numbers]:
    """Give a b as a sum of two doubles, exactly (Dekker 1971). Range: |a|, |b| below 1e150."""
    high = a * b
    a_high = _upper_half(a)
    b_high = _upper_half(b)
    a_low, b_low = a - a_high, b - b_high
    low = ((a_high * b_high - high) + a_high * b_low + a_low * b_high) + a_low * b_low
    return high, low


def _upper_half(a: Numbers) -> Numbers:
    shifted = 134217729.0 * a
    return shifted - (shifted - a)


def log1p_minus_x(x: Numbers) -> Numbers:
    """log(1 + x) - x for x > -1.

    With r = x/(2 + x): -x r + 2 r^3 (1/3 + r^2/5 + ...), 18 terms for -1/2 < x < 1; plainly beyond. Error 2 eps.
    """
    small = (x > -0.5) & (x < 1)
    inner = np.where(small, x, 0.0)
    r = inner / (2 + inner)
    square = r * r
    total = square * 0 + 1 / 37
    for k in range(35, 1, -2):
        total = total * square + 1 / k
    return np.where(small, -inner * r + 2 * r * square * total, np.log1p(x) - x)[()]


def expm1_minus_x(x: Numbers) -> Numbers:
    """exp(x) - 1 - x: 17 terms of Taylor's series for |x| < 1, plainly beyond. Error 3 eps."""
    small = np.abs(x) < 1
    inner = np.where(small, x, 0.0)
    total = inner * 0 + 1 / factorial(18)
    for k in range(17, 1, -1):
        total = total * inner + 1 / factorial(k)
    return np.where(small, total * inner * inner, np.expm1(x) - x)[()]
