"""The figures once more, with mpmath at 40 digits, straight from their definitions."""

from collections.abc import Callable
from typing import Any

import mpmath as mp

DIGITS = 40


def at_most(z: Any) -> Any:
    """Phi(z)."""
    return mp.erfc(-mp.mpf(z) / mp.sqrt(2)) / 2


def quantile(probability: Any) -> Any:
    """The standard normal quantile."""
    p = mp.mpf(probability)
    if p > mp.mpf(1) / 2:
        return -quantile(1 - p)
    start = -mp.sqrt(-2 * mp.log(p)) if p < mp.mpf("0.1") else mp.mpf(0)
    return mp.findroot(lambda z: mp.log(at_most(z)) - mp.log(p), start)


def density(z: Any) -> Any:
    """phi(z)."""
    return mp.exp(-(mp.mpf(z) ** 2) / 2) / mp.sqrt(2 * mp.pi)


def normal_gaps(mean: Any, deviation: Any, threshold: Any) -> tuple[Any, Any]:
    """Lower partial moments of orders 1 and 2 of a normal return."""
    m, v, t = mp.mpf(mean), mp.mpf(deviation), mp.mpf(threshold)
    z = (t - m) / v
    return v * (z * at_most(z) + density(z)), v * v * ((1 + z * z) * at_most(z) + z * density(z))


def lognormal_gaps(log_mean: Any, log_deviation: Any, threshold: Any) -> tuple[Any, Any]:
    """The same for growth exp(N(log_mean, log_deviation^2))."""
    mu, s, k = mp.mpf(log_mean), mp.mpf(log_deviation), 1 + mp.mpf(threshold)
    d = (mp.log(k) - mu) / s
    parts = [mp.exp(j * mu + j * j * s * s / 2) * at_most(d - j * s) for j in range(3)]
    return k * parts[0] - parts[1], k * k * parts[0] - 2 * k * parts[1] + parts[2]


def t_density(degrees_of_freedom: Any, t: Any) -> Any:
    """Density of Student's t."""
    v = mp.mpf(degrees_of_freedom)
    scale = mp.exp(mp.loggamma((v + 1) / 2) - mp.loggamma(v / 2)) / mp.sqrt(v * mp.pi)
    return scale * mp.exp(-(v + 1) / 2 * mp.log1p(mp.mpf(t) ** 2 / v))


def t_at_most(degrees_of_freedom: Any, t: Any) -> Any:
    """Distribution function of Student's t."""
    v, t = mp.mpf(degrees_of_freedom), mp.mpf(t)
    tail = mp.betainc(v / 2, mp.mpf(1) / 2, 0, v / (v + t * t), regularized=True) / 2
    return tail if t < 0 else 1 - tail


def t_gaps(degrees_of_freedom: Any, z: Any) -> tuple[Any, Any]:
    """Lower partial moments of a standard Student t below z."""
    v, z = mp.mpf(degrees_of_freedom), mp.mpf(z)
    below, weighted = t_at_most(v, z), t_density(v, z) * (v + z * z) / (v - 1)
    second = (z * z + v / (v - 2)) * below + z * weighted * (v - 3) / (v - 2)
    return z * below + weighted, second


def exponential_t_gaps(degrees_of_freedom: Any, scale: Any, z: Any) -> tuple[Any, Any]:
    """E[max(1 - G/K, 0)^j] for log(G/K) = scale (T - z): integrals over the log of the distance below z."""
    v, c, z = (mp.mpf(x) for x in (degrees_of_freedom, scale, z))
    near = [mp.mpf(10) ** k for k in range(-6, 12)]
    # around the centre of the law, and on the scale on which it falls where z lies far below that
    around = [z - d for d in (-8, -4, -2, -1, 0, 1, 2, 4, 8) if z - d > 0]
    falling = [k * (v + z * z) / (v + 1) / (1 + abs(z)) for k in (0.25, 1, 3, 9, 27)]
    places = [mp.mpf(-60), *sorted({mp.log(p) for p in near + around + falling}), mp.mpf(60)]

    def gap(order: int) -> Callable[[Any], Any]:
        return lambda w: (-mp.expm1(-c * mp.exp(w))) ** order * t_density(v, z - mp.exp(w)) * mp.exp(w)

    return mp.quad(gap(1), places), mp.quad(gap(2), places)


def relative_difference(value: Any, exact: Any) -> float:
    """|value/exact - 1|."""
    return float(abs(mp.mpf(float(value)) / exact - 1))
