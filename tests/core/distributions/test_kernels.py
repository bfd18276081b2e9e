"""Kernels against mpmath in every region where another method takes over."""

from typing import Any

import numpy as np
import pytest
from mpmath import exp, expm1, log, log1p, loggamma, mp, mpf, pi, quad

from service.core.arrays import number
from service.core.distributions.kernels.elementary import expm1_minus_x, log1p_minus_x, two_product
from service.core.distributions.kernels.incomplete_beta import (
    beta_entropy,
    beta_offset,
    log_a_beta,
    log_beta_tails,
    odds_entropy,
)
from service.core.distributions.kernels.incomplete_gamma import gamma_entropy, log_gamma_tails
from service.core.distributions.kernels.lattice import lattice_entropy, lattice_quantile, long_lattice_entropy
from service.core.distributions.kernels.logarithms import log_complement, smaller_tail
from service.core.distributions.kernels.newton import newton_on_log_tail
from service.core.distributions.kernels.quadrature import FINE, MEDIUM, Rule
from service.core.distributions.kernels.saddle_point import (
    digamma_error,
    log_binomial_mass,
    log_gamma_1p,
    log_poisson_mass,
    stirling_error,
)
from service.core.distributions.kernels.student_t import log_t_tail, t_central, t_entropy
from tests.core.distributions.laws import law
from tests.data.make_reference import make_law, tails
from tests.data.reference_continuous import student_t
from tests.data.reference_discrete import hypergeometric
from tests.data.reference_functions import beta_both, gamma_both

POINTS = [-0.999, -0.5, -0.3, -1e-3, -1e-9, 1e-300, 1e-12, 0.02, 0.7, 0.99, 1.5, 30]


@pytest.fixture(autouse=True)
def _quiet() -> Any:
    with np.errstate(all="ignore"):
        yield


def test_remainders_of_log_and_exp_keep_their_digits() -> None:
    for x in POINTS:
        # digits enough for x^2 of the smallest x
        with mp.workdps(700):
            logarithm, exponential = log1p(mpf(x)) - mpf(x), expm1(mpf(x)) - mpf(x)
        assert log1p_minus_x(number(x)) == pytest.approx(float(logarithm), rel=1e-15, abs=0)
        assert expm1_minus_x(number(x)) == pytest.approx(float(exponential), rel=1e-15, abs=0)


def test_a_product_in_two_parts_is_exact() -> None:
    high, low = two_product(number(0.1), number(3e15 + 1))
    assert mpf(float(high)) + mpf(float(low)) == mpf(0.1) * mpf(3e15 + 1)


def test_complement_of_a_logarithm() -> None:
    for value in (-1e-300, -1e-9, -0.5, -0.7, -3, -40, -800):
        with mp.workdps(700):
            exact = log(-expm1(mpf(value)))
        assert log_complement(number(value)) == pytest.approx(float(exact), rel=1e-15, abs=0)


def test_the_smaller_tail_is_exact() -> None:
    probability, lower = smaller_tail(np.array([0.25, 0.75]), upper=True)
    assert probability.tolist() == [0.25, 0.25]
    assert lower.tolist() == [False, True]


@pytest.mark.parametrize("rule", [MEDIUM, FINE])
def test_quadrature_is_exact_for_polynomials_and_steep_falls(rule: Rule) -> None:
    width = np.array([0.5, 2.0])
    places = rule.over(width)
    assert rule.mean(places**30) == pytest.approx(width**30 / 31, rel=1e-14, abs=0)
    assert rule.mean(np.exp(-40 * rule.over(number(1.0)))) == pytest.approx(1 / 40, rel=1e-14, abs=0)


def test_stirling_errors() -> None:
    for z in (1e-6, 0.3, 1, 5.5, 11.9, 12, 40, 1e6):
        exact = loggamma(mpf(z)) - ((mpf(z) - 0.5) * log(mpf(z)) - mpf(z) + log(2 * pi) / 2)
        assert stirling_error(number(z)) == pytest.approx(float(exact), rel=1e-15, abs=4e-15)


GAMMA_POINTS = [
    (0.05, 1e-3), (0.5, 30), (3, 700), (3, 1e-100), (60, 1e-4), (60, 900), (99.9, 2), (100, 99), (100, 104),
    (100, 150), (150, 10), (150, 900), (1e4, 9e3), (1e4, 1.2e4), (1e4, 3e4), (1e4, 2e3), (1e6, 1e6), (1e6, 1.03e6),
]  # fmt: skip


@pytest.mark.parametrize(("a", "x"), GAMMA_POINTS)
def test_incomplete_gamma(a: float, x: float) -> None:
    exact = gamma_both(mpf(a), mpf(x))
    for given, wanted in zip(log_gamma_tails(number(a), number(x)), exact, strict=True):
        with mp.workdps(80):
            wanted_log = log(wanted) if wanted > mpf("1e-60") else log_of_small(mpf(a), mpf(x))
        assert given == pytest.approx(float(wanted_log), rel=1e-13 if wanted > 0.9 else 2e-15, abs=2e-14)


def log_of_small(a: Any, x: Any) -> Any:
    """Logarithm of the smaller tail, directly."""
    return log(min(value for value in gamma_both(a, x) if value > 0))


def test_incomplete_gamma_at_the_ends() -> None:
    lower, upper = log_gamma_tails(np.array([2.0, 2.0, 200.0, 200.0]), np.array([0, np.inf, 0, np.inf]))
    assert lower.tolist() == [-np.inf, 0, -np.inf, 0]
    assert upper.tolist() == [0, -np.inf, 0, -np.inf]


BETA_POINTS = [
    (2, 3, 0.3), (0.5, 0.5, 1e-9), (0.5, 0.5, 0.9), (0.1, 5, 0.4), (5, 2, 1e-70), (200, 50, 0.7), (200, 50, 0.02),
    (3, 1e4, 1e-4), (12, 1e4, 2e-3), (1500, 20, 0.99), (1500, 20, 0.9), (2000, 1500, 0.5), (2000, 1500, 0.62),
    (2000, 3, 0.998), (3e5, 2, 0.99998), (2, 3e5, 1e-6), (2, 3e5, 4e-5), (3, 3e5, 1e-90), (0.2, 3e5, 1e-7),
    (1e6, 1e6, 0.501), (30, 3e5, 1e-4),
]  # fmt: skip


@pytest.mark.parametrize(("a", "b", "x"), BETA_POINTS)
def test_incomplete_beta(a: float, b: float, x: float) -> None:
    u = number(x)
    given = log_beta_tails(number(a), number(b), u, 1 - u, beta_offset(number(a), number(b), u, 1 - u))
    exact = beta_both(mpf(a), mpf(b), mpf(x), 1 - mpf(x))
    # y = 1 - x was rounded: an error that the question itself has
    rounding = abs(float(exact[0] * 0)) + 1e-16 * max(a, b)
    for value, wanted in zip(given, exact, strict=True):
        assert value == pytest.approx(float(log(wanted)), rel=2e-15, abs=3e-14 + rounding * (x > 0.5))


def test_incomplete_beta_at_the_ends() -> None:
    ends = np.array([0.0, 1.0])
    offset = beta_offset(number(2.0), number(3.0), ends, 1 - ends)
    lower, upper = log_beta_tails(number(2.0), number(3.0), ends, 1 - ends, offset)
    assert lower.tolist() == [-np.inf, 0]
    assert upper.tolist() == [0, -np.inf]


def test_a_times_beta() -> None:
    for a, b in ((0.001, 1e5), (0.5, 3), (10, 1e7), (3, 4)):
        exact = log(a) + loggamma(mpf(a)) + loggamma(mpf(b)) - loggamma(mpf(a) + mpf(b))
        assert log_a_beta(number(a), number(b)) == pytest.approx(float(exact), rel=4e-15, abs=1e-15)


@pytest.mark.parametrize(
    ("v", "t"), [(1e-3, 1e200), (0.7, 1e-3), (4, 1e160), (8, 1e40), (30, 1e12), (600, 40), (600, 2)]
)
def test_student_t_tail(v: float, t: float) -> None:
    with mp.workdps(400):
        exact = log(student_t(mpf(v), mpf(0), mpf(1)).both(mpf(t))[1])
    assert log_t_tail(number(v), number(t)) == pytest.approx(float(exact), rel=1e-14, abs=1e-14)


@pytest.mark.parametrize(("v", "t"), [(3, 1e-8), (3, 1), (3, 9), (1e15, 1e-3), (1e15, 2), (0.01, 1e3)])
def test_student_t_central_probability(v: float, t: float) -> None:
    low, up = student_t(mpf(v), mpf(0), mpf(1)).both(mpf(t))
    assert t_central(number(v), number(t)) == pytest.approx(float(low - up), rel=1e-13, abs=0)


@pytest.mark.parametrize("v", [0.5, 3, 39.9, 40, 1e4, 1e15])
def test_student_t_entropy(v: float) -> None:
    a = mpf(v) / 2
    front = loggamma(a + 0.5) - loggamma(a) - log(mpf(v) * pi) / 2
    exact = (mpf(v) + 1) / 2 * (mp.digamma(a + mpf(1) / 2) - mp.digamma(a)) - front
    assert t_entropy(number(v)) == pytest.approx(float(exact), rel=1e-13, abs=0)


def test_masses_at_the_edges() -> None:
    k = np.array([0.0, 1, 9, 10])
    exact = [mp.binomial(10, int(j)) * mpf(0.3) ** int(j) * (1 - mpf(0.3)) ** (10 - int(j)) for j in k]
    given = np.exp(log_binomial_mass(k, number(10.0), number(0.3), number(0.7)))
    assert given == pytest.approx([float(value) for value in exact], rel=1e-14, abs=0)
    mirrored = np.exp(log_binomial_mass(10 - k, number(10.0), number(0.7), number(0.3)))
    assert mirrored == pytest.approx(given, rel=1e-14, abs=0)
    assert log_binomial_mass(number(0.0), number(0.0), number(0.3), number(0.7)) == 0
    assert log_poisson_mass(number(0.0), number(2.5)) == -2.5


def test_newton_halves_where_a_step_leaves_the_bracket() -> None:
    # a slope of nearly 0 throws every step out of the bracket, which then halves
    def gentle(u: Any) -> Any:
        return np.full_like(u, -800.0)

    for low, high in ((-50.0, 50.0), (-50.0, np.inf), (-np.inf, 50.0)):
        root = newton_on_log_tail(
            lambda u: np.tanh(u / 10), gentle, np.array([0.5]), np.array([3.0]), rising=True, low=low, high=high
        )
        assert root == pytest.approx(10 * np.arctanh(0.5), rel=1e-9, abs=0)


def test_lattice_quantile_from_a_bad_start() -> None:
    """Masses 2^-k on k = 1, 2, ...: the start is a million off, the bracket has no upper end."""

    def log_tails(k: Any) -> Any:
        above = -np.log(2) * np.maximum(k, 0)
        return log_complement(above), above

    for mean in (1e6, 1.0):
        k = lattice_quantile(
            log_tails,
            np.array([0.5, 1e-200, 0.999]),
            upper=True,
            moments=(number(mean), number(1.0), number(0.0)),
            ends=(number(1.0), number(np.inf)),
        )
        assert k.tolist() == [1, 665, 1]


def test_entropy_of_a_smooth_lattice_law_is_the_integral() -> None:
    for rate in (50.0, 70.0, 1e6):
        given = lattice_entropy(
            log_poisson_mass,
            number(rate),
            moments=(number(rate), number(rate**0.5)),
            ends=(number(0.0), number(np.inf)),
        )
        if rate < 100:
            masses = [exp(k * log(mpf(rate)) - rate - loggamma(mpf(k + 1))) for k in range(300)]
            exact = -mp.fsum(m * log(m) for m in masses)
        else:
            exact = log(2 * pi * mp.e * rate) / 2 - 1 / (12 * mpf(rate)) - 1 / (24 * mpf(rate) ** 2)
        assert given == pytest.approx(float(exact), rel=1e-14, abs=0)


def test_entropy_of_a_long_lattice_law() -> None:
    """Poisson as in `lattice_entropy`; a geometric law on 0, 1, ... with mean 1e6, whose entropy has a closed form."""
    rate = number(400.0)
    moments = (rate, np.sqrt(rate))
    near_normal = long_lattice_entropy(log_poisson_mass, rate, moments=moments, far=number(700.0))
    assert near_normal == lattice_entropy(log_poisson_mass, rate, moments=moments, ends=(number(0.0), number(np.inf)))
    p = number(1e-6)
    long = long_lattice_entropy(
        lambda k, p: np.log(p) + k * np.log1p(-p), p, moments=(1 / p, 1 / p), far=-60 / np.log1p(-p)
    )
    assert long == pytest.approx(float(-(p * np.log(p) + (1 - p) * np.log1p(-p)) / p), rel=1e-12, abs=0)


@pytest.mark.parametrize(
    ("population", "marked", "draws", "values"),
    [
        (50, 5, 10, [0, 1, 4, 5]),
        (1000, 400, 300, [0, 60, 119, 120, 121, 200, 299]),
        (10**9, 5 * 10**8, 10**8, [49_950_000, 50_080_000]),
    ],
)
def test_hypergeometric_tails(population: int, marked: int, draws: int, values: list[int]) -> None:
    asked = law("hypergeometric", population=population, marked=marked, draws=draws)
    exact = hypergeometric(mpf(population), mpf(marked), mpf(draws))
    with mp.workdps(40):
        wanted = [[float(log(tail)) if tail > 0 else -np.inf for tail in tails(exact, mpf(k))] for k in values]
    together = np.array(asked.log_tails(np.array(values, dtype=np.float64))).T
    assert together == pytest.approx(np.array(wanted), rel=3e-13, abs=3e-14)
    alone = np.array([asked.log_tails(number(k)) for k in values])
    assert alone == pytest.approx(together, rel=3e-14, abs=3e-15)


def test_hypergeometric_tails_of_many_laws() -> None:
    population = np.array([50.0, 1e6, 50.0, 50.0, 1e6, 1e10])
    marked = np.array([5.0, 1e3, 5.0, 20.0, 1e3, 1e5])
    k = np.array([1.0, 3.0, 2.0, 9.0, 900.0, 99.0])
    together = law("hypergeometric", population=population, marked=marked, draws=10_000 * population / 1e6 + 9)
    for i, at in enumerate(k):
        alone = law("hypergeometric", population=population[i], marked=marked[i], draws=population[i] / 100 + 9)
        for side in (0, 1):
            assert together.log_tails(k)[side][i] == pytest.approx(
                float(alone.log_tails(number(at))[side]), rel=1e-13, abs=1e-15
            )


def test_hypergeometric_tails_far_apart() -> None:
    asked = law("hypergeometric", population=1e12, marked=1e7, draws=1e7)
    far = asked.log_tails(np.array([100.0, 150.0, 5e6]))
    assert far.above[:2] == pytest.approx([float(asked.log_tails(number(k)).above) for k in (100.0, 150.0)], rel=1e-14)
    assert far.above[2] < -1e6
    wide = law("hypergeometric", population=1e6, marked=5e5, draws=5e5).log_tails(np.array([1e3, 1e5, 2.49e5]))
    assert wide.at_most[1] == pytest.approx(
        float(law("hypergeometric", population=1e6, marked=5e5, draws=5e5).log_tails(number(1e5)).at_most), rel=1e-14
    )


@pytest.mark.parametrize("a", [1e-6, 1e-3, 0.3, 5, 11.9, 12.5, 1e4, 1e12])
def test_errors_of_digamma_and_log_gamma(a: float) -> None:
    with mp.workdps(60):
        exact = log(mpf(a)) - 1 / (2 * mpf(a)) - mp.digamma(mpf(a))
    assert digamma_error(number(a)) == pytest.approx(float(exact), rel=1e-15, abs=1e-15)
    assert log_gamma_1p(number(a)) == pytest.approx(float(loggamma(1 + mpf(a))), rel=2e-15, abs=0)


@pytest.mark.parametrize("a", [1e-3, 0.5, 2, 200, 1e6, 1e12])
def test_gamma_and_beta_entropies(a: float) -> None:
    with mp.workdps(60):
        x = mpf(a)
        exact = x + loggamma(x) + (1 - x) * mp.digamma(x)
    assert gamma_entropy(number(a)) == pytest.approx(float(exact), rel=4e-15, abs=4e-15)
    for b in (1e-3, 3, 1e7):
        with mp.workdps(60):
            y, n = mpf(b), mpf(a) + mpf(b)
            log_beta = loggamma(x) + loggamma(y) - loggamma(n)
            psi = {z: mp.digamma(z) for z in (x, y, n)}
            beta = log_beta - (x - 1) * psi[x] - (y - 1) * psi[y] + (n - 2) * psi[n]
            noise = 2e-14 + 2e-16 / min(a, b)
            odds = log_beta - (x - 1) * (psi[x] - psi[y]) + n * (psi[n] - psi[y])
        assert beta_entropy(number(a), number(b)) == pytest.approx(float(beta), rel=4e-15, abs=noise)
        assert odds_entropy(number(a), number(b)) == pytest.approx(float(odds), rel=4e-15, abs=noise)


def entropy_by_integration(density: Any, cuts: list[float]) -> float:
    def share(x: Any) -> Any:
        f = density(x)
        return -f * log(f) if f > 0 else mpf(0)

    with mp.workdps(30):
        return float(quad(share, cuts))


@pytest.mark.parametrize(
    ("family", "parameters", "cuts"),
    [
        ("skew_normal", {"location": 0, "scale": 1, "shape": 4}, [-6, -1, -0.3, 0, 0.3, 1, 3, 12]),
        ("skew_normal", {"location": 0, "scale": 1, "shape": 200}, [-0.1, -0.02, 0, 0.004, 0.02, 0.1, 1, 3, 12]),
        ("truncated_normal", {"mean": 0, "standard_deviation": 1, "lower": -1, "upper": 2}, [-1, 0, 2]),
        ("truncated_normal", {"mean": 0, "standard_deviation": 1, "lower": 8, "upper": 10}, [8, 8.2, 8.6, 10]),
        ("cornish_fisher", {"mean": 0, "standard_deviation": 1, "skewness": 1.5, "excess_kurtosis": 5},
         [-300, -60, -20, -9, -3, -1.5, -1, -0.5, 0, 1, 3, 9, 40, 150, 600]),
        ("normal_mixture", {"components": [{"weight": 0.5, "mean": -2, "standard_deviation": 1},
                                           {"weight": 0.5, "mean": 2, "standard_deviation": 0.5}]},
         [-13, -4, -2, 0, 1, 2, 3, 6, 13]),
    ],
)  # fmt: skip
def test_entropies_without_a_closed_form(family: str, parameters: dict[str, Any], cuts: list[float]) -> None:
    exact = entropy_by_integration(make_law(family, parameters).density, cuts)
    assert law(family, **parameters).entropy() == pytest.approx(exact, rel=1e-11, abs=0)
