"""The Cornish-Fisher parameters whose law has a given skewness and excess kurtosis."""

from functools import cache

import numpy as np

from service.core.arrays import Numbers, flat
from service.core.distributions.kernels.cornish_fisher import Expansion, shape_moments
from service.core.errors import DoesNotFit, Refusal

MOST_SKEWNESS = 6 * (np.sqrt(2) - 1)
MOST_STEPS = 60
CLOSE = 1e-12
ACCEPTED = 1e-9


def least_and_most_excess(skewness: Numbers) -> tuple[Numbers, Numbers]:
    """Excess kurtosis parameters between which the expansion is monotone (Maillard 2012)."""
    square = skewness * skewness
    root = np.sqrt(np.maximum(1 - square / 6 + square * square / 1296, 0))
    return 4 * (1 + 11 * square / 36 - root), 4 * (1 + 11 * square / 36 + root)


def matching_parameters(skewness: Numbers, excess_kurtosis: Numbers) -> tuple[Numbers, Numbers]:
    """Skewness and excess kurtosis parameters of the monotone expansion whose law has these moments.

    Within the region of monotone expansions the map from parameters to moments has a Jacobian determinant of at least
    1, so that there is at most one solution: Newton's method from the nearest point of a net, error 1e-12. Raises
    DoesNotFit, naming the first moment that no monotone expansion reaches.
    """
    shape, (wanted_skewness, wanted_excess) = flat(skewness, excess_kurtosis)
    net = _net()
    nearest = [np.argmin(_distance(net[2], net[3], g, k)) for g, k in zip(wanted_skewness, wanted_excess, strict=True)]
    s, k = net[0][nearest], net[1][nearest]
    for _ in range(MOST_STEPS):
        off_skewness, off_excess, slopes = _residuals(s, k, wanted_skewness, wanted_excess)
        if (np.maximum(np.abs(off_skewness), np.abs(off_excess)) <= CLOSE).all():
            break
        (a, b), (c, d) = slopes
        determinant = a * d - b * c
        s, k = _inside(
            s - (d * off_skewness - b * off_excess) / determinant, k - (a * off_excess - c * off_skewness) / determinant
        )
    off_skewness, off_excess, _ = _residuals(s, k, wanted_skewness, wanted_excess)
    missed = np.maximum(np.abs(off_skewness), np.abs(off_excess)) > ACCEPTED
    if missed.any():
        raise DoesNotFit([_refusal(np.asarray(skewness), np.asarray(excess_kurtosis), shape, int(np.argmax(missed)))])
    return s.reshape(shape)[()], k.reshape(shape)[()]


def _distance(skewness: Numbers, excess: Numbers, wanted_skewness: Numbers, wanted_excess: Numbers) -> Numbers:
    return np.abs(skewness - wanted_skewness) + np.abs(excess - wanted_excess) / 5


@cache
def _net() -> tuple[Numbers, Numbers, Numbers, Numbers]:
    """Parameters all over the region, its edge among them, and the moments there."""
    skewness = MOST_SKEWNESS * np.sin(np.linspace(-np.pi / 2, np.pi / 2, 61))[:, np.newaxis]
    least, most = least_and_most_excess(skewness)
    excess = least + (most - least) * np.linspace(0, 1, 41)
    s, k = (value.ravel() for value in np.broadcast_arrays(skewness, excess))
    _, found_skewness, found_excess = shape_moments(Expansion.of(s, k))
    return s, k, found_skewness, found_excess


def _inside(s: Numbers, k: Numbers) -> tuple[Numbers, Numbers]:
    s = np.clip(s, -MOST_SKEWNESS, MOST_SKEWNESS)
    least, most = least_and_most_excess(s)
    return s, np.clip(k, least, most)


def _residuals(s: Numbers, k: Numbers, skewness: Numbers, excess: Numbers) -> tuple[Numbers, Numbers, Numbers]:
    """Moments at the parameters less the wanted ones, and their slopes by central differences."""
    small = 1e-5
    _, here_skewness, here_excess = shape_moments(Expansion.of(s, k))
    slopes = np.empty((2, 2, s.size))
    for column, (ds, dk) in enumerate(((small, 0.0), (0.0, small))):
        above = shape_moments(Expansion.of(s + ds, k + dk))
        below = shape_moments(Expansion.of(s - ds, k - dk))
        slopes[:, column] = [(up - down) / (2 * small) for up, down in zip(above[1:], below[1:], strict=True)]
    return here_skewness - skewness, here_excess - excess, slopes


@cache
def _edge() -> tuple[Numbers, Numbers]:
    """Moments along the edge of the region, once around."""
    s = MOST_SKEWNESS * np.sin(np.linspace(-np.pi / 2, np.pi / 2, 4001))
    least, most = least_and_most_excess(s)
    around = np.concatenate([s, s[::-1]]), np.concatenate([least, most[::-1]])
    return shape_moments(Expansion.of(*around))[1:]


def reachable_excess(skewness: float) -> tuple[float, float] | None:
    """Least and greatest excess kurtosis of the laws with this skewness, to six digits; None where there is none."""
    edge_skewness, edge_excess = _edge()
    above = edge_skewness >= skewness
    crossing = np.flatnonzero(above[1:] != above[:-1])
    if not crossing.size:
        return None
    share = (skewness - edge_skewness[crossing]) / (edge_skewness[crossing + 1] - edge_skewness[crossing])
    excess = edge_excess[crossing] + share * (edge_excess[crossing + 1] - edge_excess[crossing])
    return float(excess.min()), float(excess.max())


def _refusal(skewness: Numbers, excess_kurtosis: Numbers, shape: tuple[int, ...], place: int) -> Refusal:
    given = float(np.broadcast_to(skewness, shape).ravel()[place])
    limits = reachable_excess(given)
    if limits is None:
        most = float(_edge()[0].max())
        return _out_of_reach("skewness", skewness, place, given, (-most, most), "")
    excess = float(np.broadcast_to(excess_kurtosis, shape).ravel()[place])
    beside = f" with a skewness of {given:.15g}"
    return _out_of_reach("excess_kurtosis", excess_kurtosis, place, excess, limits, beside)


def _out_of_reach(
    name: str, values: Numbers, place: int, given: float, limits: tuple[float, float], beside: str
) -> Refusal:
    least, most = limits
    detail = (
        f"No monotone expansion has these moments: {name} must lie from {least:.6g} to {most:.6g}{beside}; "
        f"it is {given:.15g}."
    )
    path = (name, place) if values.ndim else (name,)
    return Refusal(path, "expansion_not_monotone", detail, {"at_least": least, "at_most": most, "given": given})
