"""The normal law against mpmath in both tails; scores so far out that plain formulas keep no digit."""

import mpmath as mp
import numpy as np
import pytest

from service.core.arrays import number
from service.core.returns.mills import mills_ratio, normal_gaps
from tests.core.returns import exact
from tests.core.returns.build import law

MEAN, DEVIATION = 0.06, 0.11
SCORES = [-37, -30, -12, -6, -3, -1.51, -1.5, -1.49, -1, -0.3, 0, 0.3, 1, 3, 8, 40]


@pytest.fixture(autouse=True)
def _digits() -> None:
    mp.mp.dps = exact.DIGITS


@pytest.mark.parametrize("score", SCORES)
def test_gaps_keep_their_digits_at_every_distance(score: float) -> None:
    threshold = MEAN + score * DEVIATION
    gaps = law("normal", expected_return=MEAN, volatility=DEVIATION).gaps(number(threshold))
    expected = exact.normal_gaps(MEAN, DEVIATION, threshold)
    # the score's last digit moves exp(-z^2/2) by eps z^2, and the density's exponent rounds alike
    allowed = 3e-15 + 4e-16 * score**2
    assert exact.relative_difference(gaps.order_1, expected[0]) < allowed
    assert exact.relative_difference(gaps.order_2, expected[1]) < allowed


def test_partial_moments_of_the_standard_law_lose_nothing_but_the_exponent() -> None:
    z = -np.geomspace(1e-6, 37, 300)
    first, second = normal_gaps(z)
    for place, one, two in zip(z, first, second, strict=True):
        expected = exact.normal_gaps(0, 1, place)
        allowed = 5e-15 + 2.3e-16 * place**2
        assert exact.relative_difference(one, expected[0]) < allowed
        assert exact.relative_difference(two, expected[1]) < allowed


@pytest.mark.parametrize("score", SCORES)
def test_probability_below_a_threshold(score: float) -> None:
    threshold = MEAN + score * DEVIATION
    found = law("normal", expected_return=MEAN, volatility=DEVIATION).probability_below(number(threshold))
    expected = exact.at_most((mp.mpf(threshold) - MEAN) / DEVIATION)
    assert exact.relative_difference(found, expected) < 3e-15 + 6e-16 * score**2


@pytest.mark.parametrize("probability", [1e-300, 1e-30, 1e-6, 0.01, 0.05, 0.3, 0.5, 0.9, 0.999])
def test_quantile_and_expected_shortfall(probability: float) -> None:
    found = law("normal", expected_return=MEAN, volatility=DEVIATION)
    z = exact.quantile(probability)
    assert exact.relative_difference(found.quantile(number(probability)), MEAN + DEVIATION * z) < 1e-14
    assert found.upper_quantile(number(probability)) == found.quantile(number(probability))
    mean_loss = DEVIATION * exact.density(z) / mp.mpf(probability) - MEAN
    assert exact.relative_difference(found.expected_shortfall(number(probability)), mean_loss) < 2e-14


def test_mills_ratio_is_the_tail_over_the_density() -> None:
    for x in (-5.0, 0.0, 3.0, 300.0):
        tail = exact.at_most(-x) / exact.density(x)
        assert exact.relative_difference(mills_ratio(number(x)), tail) < 5e-15


def test_total_loss_is_the_chance_of_a_return_of_minus_one_or_less() -> None:
    found = law("normal", expected_return=0.06, volatility=0.1).total_loss_probability()
    assert exact.relative_difference(found, exact.at_most(mp.mpf("-10.6"))) < 1e-13


def test_a_normal_return_can_fall_below_minus_one_so_its_log_growth_has_no_value() -> None:
    growth = law("normal", expected_return=0.06, volatility=0.1).log_growth()
    assert np.isnan(growth.mean)
    assert np.isnan(growth.standard_deviation)
