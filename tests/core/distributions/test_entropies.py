"""Entropies against mpmath: by formula where there is one, else by integration."""

from typing import Any

import numpy as np
import pytest
from mpmath import exp, log, loggamma, mp, mpf, pi, quad

from service.core.arrays import number
from service.core.distributions.kernels.incomplete_beta import (
    beta_entropy,
    odds_entropy,
)
from service.core.distributions.kernels.incomplete_gamma import gamma_entropy
from service.core.distributions.kernels.lattice import lattice_entropy, long_lattice_entropy
from service.core.distributions.kernels.saddle_point import (
    log_poisson_mass,
)
from service.core.distributions.kernels.student_t import t_entropy
from tests.core.distributions.laws import law
from tests.data.make_reference import make_law


@pytest.fixture(autouse=True)
def _quiet() -> Any:
    with np.errstate(all="ignore"):
        yield


@pytest.mark.parametrize("v", [0.5, 3, 39.9, 40, 1e4, 1e15])
def test_student_t_entropy(v: float) -> None:
    a = mpf(v) / 2
    front = loggamma(a + 0.5) - loggamma(a) - log(mpf(v) * pi) / 2
    exact = (mpf(v) + 1) / 2 * (mp.digamma(a + mpf(1) / 2) - mp.digamma(a)) - front
    assert t_entropy(number(v)) == pytest.approx(float(exact), rel=1e-13, abs=0)


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
