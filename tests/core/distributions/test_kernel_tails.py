"""Incomplete gamma and beta functions and Student's t against mpmath, wherever another method takes over."""

from typing import Any

import numpy as np
import pytest
from mpmath import log, loggamma, mp, mpf

from service.core.arrays import number
from service.core.distributions.kernels.incomplete_beta import (
    beta_offset,
    log_a_beta,
    log_beta_tails,
)
from service.core.distributions.kernels.incomplete_gamma import log_gamma_tails
from service.core.distributions.kernels.student_t import log_t_tail, t_central
from tests.data.reference_continuous import student_t
from tests.data.reference_functions import beta_both, gamma_both


@pytest.fixture(autouse=True)
def _quiet() -> Any:
    with np.errstate(all="ignore"):
        yield


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
