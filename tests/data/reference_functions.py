"""Special functions with many digits, tails always computed directly: never as 1 - p where that would lose digits."""

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Any

from mpmath import atan, erfc, exp, inf, log, loggamma, mp, mpf, pi, quad, sqrt

Real = Any
"""An mpmath number."""

mp.dps = 80


@dataclass
class Law:
    """Density or mass, both tails, support, moments (None: no value); `invert(p, q)` where there is a closed form."""

    density: Callable[[Real], Real]
    both: Callable[[Real], tuple[Real, Real]]
    support: tuple[Real, Real]
    moments: Callable[[], tuple[Real, Real, Real, Real]]
    discrete: bool = False
    invert: Callable[[Real, Real], Real] | None = None


def continued_fraction(terms: Iterator[tuple[Real, Real]]) -> Real:
    """a1/(b1 + a2/(b2 + ...)) by Lentz's method; `terms` yields (a, b)."""
    tiny = mpf(10) ** -300
    value = c = tiny
    d = mpf(0)
    change = mpf(2)
    while abs(change - 1) >= 4 * mp.eps:
        a, b = next(terms)
        d = 1 / (b + a * d or tiny)
        c = b + a / c or tiny
        change = c * d
        value *= change
    return value


def beta_tail(a: Real, b: Real, x: Real, y: Real) -> Real:
    """Regularised incomplete beta I_x(a, b) for x below the mean; y = 1 - x."""
    if x <= 0:
        return mpf(0)

    def terms() -> Iterator[tuple[Real, Real]]:
        yield mpf(1), mpf(1)
        m = 0
        while True:
            yield -(a + m) * (a + b + m) * x / ((a + 2 * m) * (a + 2 * m + 1)), mpf(1)
            m += 1
            yield m * (b - m) * x / ((a + 2 * m - 1) * (a + 2 * m)), mpf(1)

    front = exp(a * log(x) + b * log(y) + loggamma(a + b) - loggamma(a) - loggamma(b))
    return front / a * continued_fraction(terms())


def beta_both(a: Real, b: Real, x: Real, y: Real) -> tuple[Real, Real]:
    """I_x(a, b) and its complement, the smaller one computed directly; y = 1 - x."""
    if x > (a + 1) / (a + b + 2):
        up = beta_tail(b, a, y, x)
        return 1 - up, up
    low = beta_tail(a, b, x, y)
    return low, 1 - low


def gamma_both(a: Real, x: Real) -> tuple[Real, Real]:
    """Regularised incomplete gamma functions P(a, x) and Q(a, x)."""
    if x <= 0:
        return mpf(0), mpf(1)
    front = exp(a * log(x) - x - loggamma(a))
    if x <= a + 1:
        total = term = 1 / a
        n = a
        while term > total * mp.eps:
            n += 1
            term *= x / n
            total += term
        return front * total, 1 - front * total

    def terms() -> Iterator[tuple[Real, Real]]:
        yield mpf(1), x + 1 - a
        n = 0
        while True:
            n += 1
            yield -n * (n - a), x + 2 * n + 1 - a

    q = front * continued_fraction(terms())
    return 1 - q, q


def normal_density(z: Real) -> Real:
    return exp(-z * z / 2) / sqrt(2 * pi)


def normal_both(z: Real) -> tuple[Real, Real]:
    return erfc(-z / sqrt(2)) / 2, erfc(z / sqrt(2)) / 2


def owen(h: Real, low: Real, high: Real) -> Real:
    """1/(2 pi) times the integral of exp(-h^2 (1 + t^2)/2)/(1 + t^2) over t from low to high."""
    if high == low:
        return mpf(0)
    if h == 0:
        return (atan(high) - atan(low)) / (2 * pi)
    width = min(mpf(1), 1 / abs(h), 1 / (h * h * low) if low > 0 else inf)
    end = min(high, sqrt(low * low + 2 * (mp.dps + 5) * log(10) / h**2))
    cuts = [low]
    while cuts[-1] < end:
        cuts.append(min(end, cuts[-1] + 2 * width))
        width *= mpf(3) / 2
    # quad stops at an absolute error, so the integrand is scaled to 1 at its largest
    part = quad(lambda t: exp(-h * h * (t * t - low * low) / 2) / (1 + t * t), cuts)
    return part * exp(-h * h * (1 + low * low) / 2) / (2 * pi)


def from_raw_moments(m1: Real, m2: Real, m3: Real, m4: Real) -> tuple[Real, Real, Real, Real]:
    v = m2 - m1**2
    skewness = (m3 - 3 * m1 * m2 + 2 * m1**3) / v ** mpf(1.5)
    return m1, v, skewness, (m4 - 4 * m1 * m3 + 6 * m1**2 * m2 - 3 * m1**4) / v**2 - 3
