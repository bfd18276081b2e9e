"""Tails of the hypergeometric law: one value, many of one law, many laws, far apart, very many."""

from typing import Any

import numpy as np
import pytest
from mpmath import log, mp, mpf

from service.core.arrays import number
from tests.core.distributions.laws import law
from tests.data.make_reference import tails
from tests.data.reference_discrete import hypergeometric


@pytest.fixture(autouse=True)
def _quiet() -> Any:
    with np.errstate(all="ignore"):
        yield


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
