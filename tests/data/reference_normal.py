"""Reference laws around the normal one."""

from typing import Any

from mpmath import chop, exp, expm1, inf, log, mp, mpf, pi, quad, sqrt

from tests.data.reference_functions import Law, Real, from_raw_moments, normal_both, normal_density, owen


def normal(mean: Real, standard_deviation: Real) -> Law:
    m, s = mean, standard_deviation
    return Law(
        lambda x: normal_density((x - m) / s) / s,
        lambda x: normal_both((x - m) / s),
        (-inf, inf),
        lambda: (m, s * s, mpf(0), mpf(0)),
    )


def lognormal(log_mean: Real, log_standard_deviation: Real) -> Law:
    m, s = log_mean, log_standard_deviation
    w = exp(s * s)
    return Law(
        lambda x: normal_density((log(x) - m) / s) / (s * x),
        lambda x: normal_both((log(x) - m) / s),
        (mpf(0), inf),
        lambda: (
            exp(m + s * s / 2),
            expm1(s * s) * exp(2 * m + s * s),
            (w + 2) * sqrt(w - 1),
            w**4 + 2 * w**3 + 3 * w**2 - 6,
        ),
    )


def skew_normal(location: Real, scale: Real, shape: Real) -> Law:
    m, s, a = location, scale, shape

    def standard(z: Real, a: Real) -> tuple[Real, Real]:
        if z < 0:
            low = 2 * owen(-z, a, inf)
            return low, 1 - low
        up = normal_both(z)[1] + 2 * owen(z, mpf(0), a)
        return 1 - up, up

    def both(x: Real) -> tuple[Real, Real]:
        z = (x - m) / s
        return standard(z, a) if a >= 0 else standard(-z, -a)[::-1]

    u = a / sqrt(1 + a * a) * sqrt(2 / pi)
    v = 1 - u * u
    return Law(
        lambda x: 2 * normal_density((x - m) / s) * normal_both(a * (x - m) / s)[0] / s,
        both,
        (-inf, inf),
        lambda: (m + s * u, s * s * v, (4 - pi) / 2 * u**3 / v ** mpf(1.5), 2 * (pi - 3) * u**4 / v**2),
    )


def normal_mixture(components: list[dict[str, Any]]) -> Law:
    total = mp.fsum(c["weight"] for c in components)
    parts = [(c["weight"] / total, c["mean"], c["standard_deviation"]) for c in components]

    def both(x: Real) -> tuple[Real, Real]:
        pairs = [(w, normal_both((x - m) / s)) for w, m, s in parts]
        return mp.fsum(w * b[0] for w, b in pairs), mp.fsum(w * b[1] for w, b in pairs)

    def moments() -> tuple[Real, Real, Real, Real]:
        mean = mp.fsum(w * m for w, m, _ in parts)
        c = [(w, m - mean, s) for w, m, s in parts]
        v = mp.fsum(w * (d * d + s * s) for w, d, s in c)
        third = mp.fsum(w * (d**3 + 3 * d * s * s) for w, d, s in c)
        fourth = mp.fsum(w * (d**4 + 6 * d * d * s * s + 3 * s**4) for w, d, s in c)
        return mean, v, third / v ** mpf(1.5), fourth / v**2 - 3

    return Law(lambda x: mp.fsum(w * normal_density((x - m) / s) / s for w, m, s in parts), both, (-inf, inf), moments)


def truncated_normal(mean: Real, standard_deviation: Real, lower: Real, upper: Real) -> Law:
    m, s = mean, standard_deviation
    a, b = (lower - m) / s, (upper - m) / s

    def between(u: Real, v: Real) -> Real:
        with mp.workdps(420):  # differences of close tails
            (lu, hu), (lv, hv) = normal_both(u), normal_both(v)
            return hu - hv if u > 0 else lv - lu

    mass = between(a, b)

    def moments() -> tuple[Real, Real, Real, Real]:
        peak = min(max(mpf(0), a), b)
        step = min(b - a, 1 / max(1, abs(peak)))
        near = {peak + step * k * side for k in (1, 3, 7, 15, 31, 63) for side in (-1, 1)}
        cuts = sorted({a, b, peak} | {c for c in near if a < c < b})
        # scaled to 1 at the peak
        raw = [quad(lambda z, j=j: (z - peak) ** j * exp((peak - z) * (peak + z) / 2), cuts) for j in range(5)]
        z1, v, skewness, excess = from_raw_moments(*(r / raw[0] for r in raw[1:]))
        return m + s * (peak + z1), s * s * v, skewness, excess

    return Law(
        lambda x: normal_density((x - m) / s) / (s * mass),
        lambda x: (between(a, (x - m) / s) / mass, between((x - m) / s, b) / mass),
        (lower, upper),
        moments,
    )


def cornish_fisher(mean: Real, standard_deviation: Real, skewness: Real, excess_kurtosis: Real) -> Law:
    m, v, s, k = mean, standard_deviation, skewness, excess_kurtosis
    cubic = [k / 24 - s * s / 18, s / 6, 1 - k / 8 + 5 * s * s / 36, -s / 6]

    def w(z: Real) -> Real:
        return ((cubic[0] * z + cubic[1]) * z + cubic[2]) * z + cubic[3]

    def slope(z: Real) -> Real:
        return 3 * cubic[0] * z * z + 2 * cubic[1] * z + cubic[2]

    def score(x: Real) -> Real:
        """The one root of w(z) = (x - m)/v: halving, then Newton's steps."""
        y = (x - m) / v
        low, high = mpf(-1), mpf(1)
        while w(low) > y:
            low *= 2
        while w(high) < y:
            high *= 2
        for _ in range(40):
            z = (low + high) / 2
            low, high = (z, high) if w(z) < y else (low, z)
        for _ in range(8):
            z -= (w(z) - y) / slope(z)
        return z

    def moments() -> tuple[Real, Real, Real, Real]:
        raw = [quad(lambda z, j=j: w(z) ** j * normal_density(z), [-30, -10, 0, 10, 30]) for j in (1, 2, 3, 4)]
        _, variance, third, fourth = from_raw_moments(*raw)
        return m, v * v * variance, chop(third, mpf(10) ** -60), chop(fourth, mpf(10) ** -60)

    return Law(
        lambda x: normal_density(score(x)) / (v * slope(score(x))),
        lambda x: normal_both(score(x)),
        (-inf, inf),
        moments,
    )
