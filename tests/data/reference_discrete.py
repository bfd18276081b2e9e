"""Reference laws on the whole numbers, and of a sample."""

from typing import Any

from mpmath import exp, expm1, inf, log, log1p, loggamma, mp, mpf, sqrt

from tests.data.reference_functions import Law, Real, beta_both, gamma_both


def discrete_uniform(lowest: Real, highest: Real) -> Law:
    n = highest - lowest + 1
    return Law(
        lambda _: 1 / n,
        lambda k: ((k - lowest + 1) / n, (highest - k) / n),
        (lowest, highest),
        lambda: ((lowest + highest) / 2, (n * n - 1) / 12, mpf(0), -6 * (n * n + 1) / (5 * (n * n - 1))),
        discrete=True,
    )


def bernoulli(success_probability: Real) -> Law:
    return binomial(mpf(1), success_probability)


def binomial(trials: Real, success_probability: Real) -> Law:
    n, p, q = trials, success_probability, 1 - success_probability

    def both(k: Real) -> tuple[Real, Real]:
        up, low = beta_both(k + 1, n - k, p, q) if k < n else (mpf(0), mpf(1))
        return low, up

    def mass(k: Real) -> Real:
        ways = loggamma(n + 1) - loggamma(k + 1) - loggamma(n - k + 1)
        return exp(ways + k * log(p) + (n - k) * log(q))

    v = n * p * q
    return Law(mass, both, (mpf(0), n), lambda: (n * p, v, (q - p) / sqrt(v), (1 - 6 * p * q) / v), discrete=True)


def negative_binomial(successes: Real, success_probability: Real) -> Law:
    r, p, q = successes, success_probability, 1 - success_probability
    return Law(
        lambda k: exp(loggamma(k + r) - loggamma(k + 1) - loggamma(r) + r * log(p) + k * log(q)),
        lambda k: beta_both(r, k + 1, p, q),
        (mpf(0), inf),
        lambda: (r * q / p, r * q / p**2, (1 + q) / sqrt(r * q), 6 / r + p * p / (r * q)),
        discrete=True,
    )


def geometric(success_probability: Real) -> Law:
    p, q = success_probability, 1 - success_probability
    return Law(
        lambda k: p * exp((k - 1) * log1p(-p)),
        lambda k: (-expm1(k * log1p(-p)), exp(k * log1p(-p))),
        (mpf(1), inf),
        lambda: (1 / p, q / p**2, (1 + q) / sqrt(q), 6 + p * p / q),
        discrete=True,
    )


def hypergeometric(population: Real, marked: Real, draws: Real) -> Law:
    total, hits, n = int(population), int(marked), int(draws)
    low, high = max(0, n - (total - hits)), min(n, hits)
    mean = mpf(n) * hits / total

    def log_ways(size: int, some: int) -> Real:
        return loggamma(mpf(size + 1)) - loggamma(mpf(some + 1)) - loggamma(mpf(size - some + 1))

    def mass(k: Real) -> Real:
        return exp(log_ways(hits, int(k)) + log_ways(total - hits, n - int(k)) - log_ways(total, n))

    def ratio(k: int) -> Real:
        """mass(k + 1)/mass(k)."""
        return mpf((hits - k) * (n - k)) / ((k + 1) * (total - hits - n + k + 1))

    def outwards(k: int, step: int) -> Real:
        """Sum of the masses from k on, upwards or downwards."""
        sum_ = term = mass(k)
        while low <= k + step <= high and term > sum_ * mp.eps:
            term = term * ratio(k) if step > 0 else term / ratio(k - 1)
            sum_ += term
            k += step
        return sum_

    def both(k: Real) -> tuple[Real, Real]:
        if k < mean:
            small = outwards(int(k), -1)
            return small, 1 - small
        small = outwards(int(k) + 1, 1)
        return 1 - small, small

    def moments() -> tuple[Real, Real, Real, Real]:
        masses = [mass(k) for k in range(low, high + 1)]
        v, third, fourth = (mp.fsum(m * (low + i - mean) ** j for i, m in enumerate(masses)) for j in (2, 3, 4))
        symmetric = 2 * hits == total or 2 * n == total
        return mean, v, mpf(0) if symmetric else third / v ** mpf(1.5), fourth / v**2 - 3

    return Law(mass, both, (mpf(low), mpf(high)), moments, discrete=True)


def poisson(rate: Real) -> Law:
    def both(k: Real) -> tuple[Real, Real]:
        p, q = gamma_both(k + 1, rate)
        return q, p

    return Law(
        lambda k: exp(k * log(rate) - rate - loggamma(k + 1)),
        both,
        (mpf(0), inf),
        lambda: (rate, rate, 1 / sqrt(rate), 1 / rate),
        discrete=True,
    )


def empirical(observations: list[Any]) -> Law:
    values, n = sorted(observations), mpf(len(observations))

    def both(x: Real) -> tuple[Real, Real]:
        below = sum(value <= x for value in values)
        return below / n, (n - below) / n

    def moments() -> tuple[Real, Real, Real, Real]:
        mean = mp.fsum(values) / n
        v, third, fourth = (mp.fsum((x - mean) ** j for x in values) / n for j in (2, 3, 4))
        return mean, v, third / v ** mpf(1.5), fourth / v**2 - 3

    def invert(p: Real, q: Real) -> Real:
        return next(x for x in values if (both(x)[0] >= p if q is None else both(x)[1] <= q))

    return Law(lambda x: values.count(x) / n, both, (values[0], values[-1]), moments, invert=invert)
