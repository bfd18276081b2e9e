"""Reference laws with a density, apart from the relatives of the normal law."""

from mpmath import euler, exp, expm1, gamma, inf, log, log1p, loggamma, mp, mpf, pi, sqrt, zeta

from tests.data.reference_functions import Law, Real, beta_both, from_raw_moments, gamma_both

FourMoments = tuple[Real, Real, Real, Real]


def uniform(lower: Real, upper: Real) -> Law:
    w = upper - lower
    return Law(
        lambda _: 1 / w,
        lambda x: ((x - lower) / w, (upper - x) / w),
        (lower, upper),
        lambda: ((lower + upper) / 2, w * w / 12, mpf(0), mpf(-6) / 5),
        invert=lambda p, q: lower + p * w if q is None else upper - q * w,
    )


def triangular(lower: Real, mode: Real, upper: Real) -> Law:
    a, c, b = lower, mode, upper
    w, at_mode = b - a, (c - a) / (b - a)

    def density(x: Real) -> Real:
        if x == c:
            return 2 / w
        return 2 * (x - a) / (w * (c - a)) if x < c else 2 * (b - x) / (w * (b - c))

    def both(x: Real) -> tuple[Real, Real]:
        if x <= c and c > a:
            p = (x - a) ** 2 / (w * (c - a))
            return p, 1 - p
        q = (b - x) ** 2 / (w * (b - c))
        return 1 - q, q

    def invert(p: Real, q: Real) -> Real:
        p, q = (p, 1 - p) if q is None else (1 - q, q)
        return a + sqrt(p * w * (c - a)) if p <= at_mode else b - sqrt(q * w * (b - c))

    s = a * a + b * b + c * c - a * b - a * c - b * c
    third = sqrt(2) * (a + b - 2 * c) * (2 * a - b - c) * (a - 2 * b + c)
    return Law(
        density,
        both,
        (a, b),
        lambda: ((a + b + c) / 3, s / 18, third / (5 * s ** mpf(1.5)), mpf(-3) / 5),
        invert=invert,
    )


def student_t(degrees_of_freedom: Real, location: Real, scale: Real) -> Law:
    v = degrees_of_freedom

    def both(x: Real) -> tuple[Real, Real]:
        t = (x - location) / scale
        up = beta_both(v / 2, mpf(1) / 2, v / (v + t * t), t * t / (v + t * t))[0] / 2
        return (up, 1 - up) if t < 0 else (1 - up, up)

    def density(x: Real) -> Real:
        t = (x - location) / scale
        front = exp(loggamma((v + 1) / 2) - loggamma(v / 2)) / sqrt(v * pi) / scale
        return front * exp(-(v + 1) / 2 * log1p(t * t / v))

    def moments() -> FourMoments:
        return (
            location if v > 1 else None,
            scale**2 * v / (v - 2) if v > 2 else (inf if v > 1 else None),
            mpf(0) if v > 3 else None,
            6 / (v - 4) if v > 4 else (inf if v > 2 else None),
        )

    return Law(density, both, (-inf, inf), moments)


def chi_square(degrees_of_freedom: Real) -> Law:
    return gamma_law(degrees_of_freedom / 2, mpf(2))


def f(numerator_degrees_of_freedom: Real, denominator_degrees_of_freedom: Real) -> Law:
    m, n = numerator_degrees_of_freedom, denominator_degrees_of_freedom

    def density(x: Real) -> Real:
        front = loggamma((m + n) / 2) - loggamma(m / 2) - loggamma(n / 2) + m / 2 * log(m / n)
        return exp(front + (m / 2 - 1) * log(x) - (m + n) / 2 * log1p(m * x / n))

    def moments() -> FourMoments:
        s = m + n - 2
        variance = inf if n > 2 else None
        skewness = excess = inf if n > 4 else None
        if n > 4:
            variance = 2 * n**2 * s / (m * (n - 2) ** 2 * (n - 4))
        if n > 6:
            skewness = (2 * m + n - 2) * sqrt(8 * (n - 4)) / ((n - 6) * sqrt(m * s))
        if n > 8:
            excess = 12 * (m * (5 * n - 22) * s + (n - 4) * (n - 2) ** 2) / (m * (n - 6) * (n - 8) * s)
        return n / (n - 2) if n > 2 else inf, variance, skewness, excess

    return Law(density, lambda x: beta_both(m / 2, n / 2, m * x / (m * x + n), n / (m * x + n)), (mpf(0), inf), moments)


def exponential(rate: Real) -> Law:
    return Law(
        lambda x: rate * exp(-rate * x),
        lambda x: (-expm1(-rate * x), exp(-rate * x)),
        (mpf(0), inf),
        lambda: (1 / rate, 1 / rate**2, mpf(2), mpf(6)),
        invert=lambda p, q: -(log1p(-p) if q is None else log(q)) / rate,
    )


def gamma_law(shape: Real, scale: Real) -> Law:
    k, s = shape, scale
    return Law(
        lambda x: exp((k - 1) * log(x / s) - x / s - loggamma(k)) / s,
        lambda x: gamma_both(k, x / s),
        (mpf(0), inf),
        lambda: (k * s, k * s * s, 2 / sqrt(k), 6 / k),
    )


def beta(alpha: Real, beta: Real) -> Law:
    a, b = alpha, beta
    n = a + b
    front = loggamma(n) - loggamma(a) - loggamma(b)
    return Law(
        lambda x: exp((a - 1) * log(x) + (b - 1) * log1p(-x) + front),
        lambda x: beta_both(a, b, x, 1 - x),
        (mpf(0), mpf(1)),
        lambda: (
            a / n,
            a * b / (n * n * (n + 1)),
            2 * (b - a) * sqrt(n + 1) / ((n + 2) * sqrt(a * b)),
            6 * ((a - b) ** 2 * (n + 1) - a * b * (n + 2)) / (a * b * (n + 2) * (n + 3)),
        ),
    )


def weibull(shape: Real, scale: Real) -> Law:
    k, s = shape, scale
    return Law(
        lambda x: k / s * (x / s) ** (k - 1) * exp(-((x / s) ** k)),
        lambda x: (-expm1(-((x / s) ** k)), exp(-((x / s) ** k))),
        (mpf(0), inf),
        lambda: from_raw_moments(*(s**j * gamma(1 + j / k) for j in (1, 2, 3, 4))),
        invert=lambda p, q: s * (-(log1p(-p) if q is None else log(q))) ** (1 / k),
    )


def logistic(location: Real, scale: Real) -> Law:
    m, s = location, scale
    return Law(
        lambda x: mp.sech((x - m) / (2 * s)) ** 2 / (4 * s),
        lambda x: (1 / (1 + exp((m - x) / s)), 1 / (1 + exp((x - m) / s))),
        (-inf, inf),
        lambda: (m, pi**2 * s * s / 3, mpf(0), mpf(6) / 5),
        invert=lambda p, q: m + s * (log(p) - log1p(-p) if q is None else log1p(-q) - log(q)),
    )


def laplace(location: Real, scale: Real) -> Law:
    m, s = location, scale

    def both(x: Real) -> tuple[Real, Real]:
        t = exp(-abs(x - m) / s) / 2
        return (t, 1 - t) if x < m else (1 - t, t)

    def invert(p: Real, q: Real) -> Real:
        given = p if q is None else q
        below = (given < 0.5) == (q is None)
        return m + s * log(2 * min(given, 1 - given)) * (1 if below else -1)

    return Law(
        lambda x: exp(-abs(x - m) / s) / (2 * s),
        both,
        (-inf, inf),
        lambda: (m, 2 * s * s, mpf(0), mpf(3)),
        invert=invert,
    )


def gumbel(location: Real, scale: Real) -> Law:
    return generalized_extreme_value(location, scale, mpf(0))


def generalized_extreme_value(location: Real, scale: Real, shape: Real) -> Law:
    m, s, c = location, scale, shape

    def y(x: Real) -> Real:
        z = (x - m) / s
        return exp(-z) if c == 0 else exp(-log1p(c * z) / c)

    def invert(p: Real, q: Real) -> Real:
        t = -(log(p) if q is None else log1p(-q))
        return m - s * log(t) if c == 0 else m + s * expm1(-c * log(t)) / c

    support = (-inf if c <= 0 else m - s / c, inf if c >= 0 else m - s / c)
    return Law(
        lambda x: y(x) ** (1 + c) * exp(-y(x)) / s,
        lambda x: (exp(-y(x)), -expm1(-y(x))),
        support,
        lambda: extreme_moments(m, s, c),
        invert=invert,
    )


def extreme_moments(m: Real, s: Real, c: Real) -> FourMoments:
    if c == 0:
        return m + s * euler, s * s * pi**2 / 6, 12 * sqrt(6) * zeta(3) / pi**3, mpf(12) / 5
    g = [gamma(1 - j * c) if j * c < 1 else inf for j in (1, 2, 3, 4)]
    variance = s * s * (g[1] - g[0] ** 2) / c**2 if 2 * c < 1 else (inf if c < 1 else None)
    skewness = excess = inf if 2 * c < 1 else None
    if 3 * c < 1:
        sign = 1 if c > 0 else -1
        skewness = sign * (g[2] - 3 * g[0] * g[1] + 2 * g[0] ** 3) / (g[1] - g[0] ** 2) ** mpf(1.5)
    if 4 * c < 1:
        excess = from_raw_moments(*g)[3]
    return m + s * (g[0] - 1) / c if c < 1 else inf, variance, skewness, excess


def generalized_pareto(location: Real, scale: Real, shape: Real) -> Law:
    m, s, c = location, scale, shape

    def log_above(x: Real) -> Real:
        z = (x - m) / s
        return -z if c == 0 else -log1p(c * z) / c

    def invert(p: Real, q: Real) -> Real:
        t = -(log1p(-p) if q is None else log(q))
        return m + s * (t if c == 0 else expm1(c * t) / c)

    def moments() -> FourMoments:
        variance = inf if c < 1 else None
        skewness = excess = inf if 2 * c < 1 else None
        if 2 * c < 1:
            variance = s * s / ((1 - c) ** 2 * (1 - 2 * c))
        if 3 * c < 1:
            skewness = 2 * (1 + c) * sqrt(1 - 2 * c) / (1 - 3 * c)
        if 4 * c < 1:
            excess = 3 * (1 - 2 * c) * (2 * c * c + c + 3) / ((1 - 3 * c) * (1 - 4 * c)) - 3
        return m + s / (1 - c) if c < 1 else inf, variance, skewness, excess

    return Law(
        lambda x: exp((1 + c) * log_above(x)) / s,
        lambda x: (-expm1(log_above(x)), exp(log_above(x))),
        (m, inf if c >= 0 else m - s / c),
        moments,
        invert=invert,
    )


def pareto(minimum: Real, shape: Real) -> Law:
    return generalized_pareto(minimum, minimum / shape, 1 / shape)
