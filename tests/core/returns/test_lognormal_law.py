"""Lognormal growth: every figure against mpmath, over one period, many, and parts of one."""

import mpmath as mp
import numpy as np
import pytest

from service.core.arrays import number
from service.core.returns.laws.lognormal import LognormalLaw, relative_gaps
from tests.core.returns import exact
from tests.core.returns.build import law

SPREADS = [1e-8, 1e-4, 0.01, 0.1, 0.2, 0.5, 1, 1.5, 2.2, 3, 10]
SCORES = [-35, -20, -10, -3, -1, -0.1, -1e-3, 0, 1e-3, 0.1, 1, 3, 8.9, 9.1, 30, 100]


@pytest.fixture(autouse=True)
def _digits() -> None:
    mp.mp.dps = 60


@pytest.mark.parametrize("spread", SPREADS)
@pytest.mark.parametrize("score", SCORES)
def test_gaps_keep_their_digits_for_every_spread_and_distance(spread: float, score: float) -> None:
    distance = spread * score
    found = relative_gaps(number(distance), number(spread), number(score))
    # far above the centre the distance itself counts, the score beside it is rounded
    z = mp.mpf(score) if score < 9 else mp.mpf(distance) / mp.mpf(spread)
    parts = [
        mp.exp(j * mp.mpf(spread) * (j * mp.mpf(spread) / 2 - z)) * exact.at_most(z - j * spread) for j in range(3)
    ]
    allowed = 1e-14 + 2e-16 * min(score, 0) ** 2
    assert exact.relative_difference(found[0], parts[0] - parts[1]) < allowed
    assert exact.relative_difference(found[1], parts[0] - 2 * parts[1] + parts[2]) < allowed


@pytest.mark.parametrize("threshold", [-0.9, -0.3, 0.0, 0.02, 0.5, 3.0])
def test_gaps_in_money_terms(threshold: float) -> None:
    found = LognormalLaw(number(0.05), number(0.2)).gaps(number(threshold))
    expected = exact.lognormal_gaps(0.05, 0.2, threshold)
    assert exact.relative_difference(found.order_1, expected[0]) < 5e-14
    assert exact.relative_difference(found.order_2, expected[1]) < 5e-14


@pytest.mark.parametrize("years", [1, 0.5, 1 / 12, 30, 7.25])
def test_log_moments_grow_with_the_horizon(years: float) -> None:
    found = law("lognormal", expected_return=0.06, volatility=0.12, horizon_years=years)
    variance = mp.log1p((mp.mpf(0.12) / (1 + mp.mpf(0.06))) ** 2)
    mean, deviation = years * (mp.log1p(mp.mpf(0.06)) - variance / 2), mp.sqrt(years * variance)
    growth = found.log_growth()
    assert exact.relative_difference(growth.mean, mean) < 1e-14
    assert exact.relative_difference(growth.standard_deviation, deviation) < 1e-15
    assert exact.relative_difference(found.mean(), mp.expm1(mean + deviation**2 / 2)) < 1e-14
    spread = mp.exp(mean + deviation**2 / 2) * mp.sqrt(mp.expm1(deviation**2))
    assert exact.relative_difference(found.standard_deviation(), spread) < 1e-14


def test_one_period_has_exactly_the_moments_that_were_given() -> None:
    found = law("lognormal", expected_return=0.07, volatility=0.13)
    assert found.mean() == 0.07
    assert found.standard_deviation() == 0.13


def test_continuous_normal_returns_make_lognormal_growth() -> None:
    found = law("normal", compounding="continuous", expected_return=0.05, volatility=0.2, horizon_years=4)
    assert exact.relative_difference(found.mean(), mp.expm1(4 * mp.mpf(0.05) + 2 * mp.mpf(0.2) ** 2)) < 1e-14
    threshold = 0.1
    expected = exact.at_most((mp.log1p(mp.mpf(threshold)) - 4 * mp.mpf(0.05)) / (2 * mp.mpf(0.2)))
    assert exact.relative_difference(found.probability_below(number(threshold)), expected) < 1e-14


@pytest.mark.parametrize("spread", [1e-6, 0.01, 0.05, 0.2, 1.0, 3.0])
@pytest.mark.parametrize("probability", [1e-100, 1e-9, 0.01, 0.05, 0.5, 0.9])
def test_quantile_and_expected_shortfall(spread: float, probability: float) -> None:
    found = LognormalLaw(number(0.03), number(spread))
    z, s = exact.quantile(probability), mp.mpf(spread)
    assert exact.relative_difference(found.quantile(number(probability)), mp.expm1(mp.mpf(0.03) + s * z)) < 3e-14
    mean_of_tail = mp.exp(mp.mpf(0.03) + s * s / 2) * exact.at_most(z - s) / mp.mpf(probability) - 1
    shortfall = found.expected_shortfall(number(probability))
    assert abs(float(shortfall + mean_of_tail)) < 1e-14


def test_expected_shortfall_of_many_spreads_at_once() -> None:
    spreads = np.array([0.001, 0.2, 0.01, 1.0])
    together = LognormalLaw(np.zeros(4), spreads).expected_shortfall(number(0.05))
    alone = [float(LognormalLaw(number(0), s).expected_shortfall(number(0.05))) for s in spreads]
    assert together.tolist() == pytest.approx(alone, rel=1e-15)


def test_nothing_below_a_total_loss() -> None:
    found = law("lognormal", expected_return=0.06, volatility=0.5)
    thresholds = np.array([-2.0, -1.0, -0.999])
    assert found.probability_below(thresholds).tolist()[:2] == [0, 0]
    assert found.certain(thresholds).tolist() == [True, True, False]
    assert found.gaps(thresholds).order_1.tolist()[:2] == [0, 0]
    assert found.gaps(thresholds).order_2.tolist()[:2] == [0, 0]
    assert found.total_loss_probability() == 0
