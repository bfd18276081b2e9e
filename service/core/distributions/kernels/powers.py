"""The power transformation log(1 + c z)/c and its inverse, with their limit at c = 0 (Box & Cox 1964)."""

import numpy as np

from service.core.arrays import Numbers

NEAR_0 = 1e-17


def log_box_cox(z: Numbers, c: Numbers) -> Numbers:
    """log(1 + c z)/c, which is z for c = 0. Where 1 + c z <= 0: -inf for c > 0, inf for c < 0. Error 2 eps."""
    product = c * z
    value = np.log1p(np.maximum(product, -1)) / c
    return np.where(np.abs(product) < NEAR_0, z, value)[()]


def box_cox_root(t: Numbers, c: Numbers) -> Numbers:
    """Z with log(1 + c z)/c = t: (exp(c t) - 1)/c, which is t for c = 0. Error 2 eps."""
    product = c * t
    return np.where(np.abs(product) < NEAR_0, t, np.expm1(product) / c)[()]
