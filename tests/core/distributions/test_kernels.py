"""Kernels of every family against mpmath: elementary functions, quadrature, saddle points, searches."""

from typing import Any

import numpy as np
import pytest
from mpmath import expm1, log, log1p, loggamma, mp, mpf, pi

from service.core.arrays import number
from service.core.distributions.kernels.elementary import expm1_minus_x, log1p_minus_x, two_product
from service.core.distributions.kernels.lattice import lattice_quantile
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


@pytest.mark.parametrize("a", [1e-6, 1e-3, 0.3, 5, 11.9, 12.5, 1e4, 1e12])
def test_errors_of_digamma_and_log_gamma(a: float) -> None:
    with mp.workdps(60):
        exact = log(mpf(a)) - 1 / (2 * mpf(a)) - mp.digamma(mpf(a))
    assert digamma_error(number(a)) == pytest.approx(float(exact), rel=1e-15, abs=1e-15)
    assert log_gamma_1p(number(a)) == pytest.approx(float(loggamma(1 + mpf(a))), rel=2e-15, abs=0)


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
