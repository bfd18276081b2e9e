"""Where a rising function reaches a level, for many levels at once."""

from collections.abc import Callable

import numpy as np

from service.core.arrays import Numbers

MOST_STEPS = 120
TOLERANCE = 4e-16


def first_reaching(function: Callable[[Numbers], Numbers], low: Numbers, high: Numbers) -> Numbers:
    """Give the least x in [low, high] at which each entry of a rising function is 0 or more, within 4e-16.

    `function` takes and gives a flat array, an entry for each question. The function may jump; the value is on the
    upper side. Chandrupatla's method (1997): inverse quadratic interpolation where it can be trusted, else halving.
    """
    near, far = high.copy(), low.copy()
    at_near, at_far = function(near), function(far)
    share = np.full(low.shape, 0.5)
    for _ in range(MOST_STEPS):
        x = near + share * (far - near)
        value = function(x)
        same = (value >= 0) == (at_near >= 0)
        older, at_older = np.where(same, near, far), np.where(same, at_near, at_far)
        far, at_far = np.where(same, far, near), np.where(same, at_far, at_near)
        near, at_near = x, value
        margin = TOLERANCE * (1 + np.abs(near))
        width = np.abs(far - near)
        if (width <= 2 * margin).all():
            break
        share = _next_share((near, far, older), (at_near, at_far, at_older))
        least = np.minimum(0.5, margin / np.maximum(width, 1e-300))
        share = np.clip(share, least, 1 - least)
    return np.where(at_near >= 0, near, far)


def _next_share(places: tuple[Numbers, ...], values: tuple[Numbers, ...]) -> Numbers:
    """Share of the way from the last place to the other end of the bracket at which to look next."""
    (a, b, c), (f_a, f_b, f_c) = places, values
    xi, phi = (a - b) / (c - b), (f_a - f_b) / (f_c - f_b)
    trusted = (phi * phi < xi) & ((1 - phi) ** 2 < 1 - xi)
    inverse = f_a / (f_b - f_a) * f_c / (f_b - f_c) + (c - a) / (b - a) * f_a / (f_c - f_a) * f_b / (f_c - f_b)
    return np.where(trusted & np.isfinite(inverse), inverse, 0.5)
