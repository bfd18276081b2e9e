"""Student t log returns over several periods: two periods by brute force, and how the law behaves at its ends."""

import mpmath as mp
import numpy as np
import pytest

from service.core.arrays import Numbers, number
from service.core.errors import DoesNotFit
from service.core.returns.compounding.bessel_law import BesselLaw
from service.core.returns.compounding.student_t_transform import t_transform
from service.core.returns.laws.exponential_t import ExponentialTLaw
from service.core.returns.laws.student_t import scale_of_t, t_at_most
from tests.core.returns import exact
from tests.core.returns.build import law

NODES, WEIGHTS = np.polynomial.legendre.leggauss(20)


def heavy(freedom: float, periods: int, deviation: float = 0.2, mean: float = 0.05) -> BesselLaw:
    found = law(
        "student_t",
        compounding="continuous",
        expected_return=mean,
        volatility=deviation,
        degrees_of_freedom=freedom,
        horizon_years=periods,
    )
    assert isinstance(found, BesselLaw)
    return found


def two_periods(freedom: float, deviation: float, mean: float, log_growth: float) -> Numbers:
    """g_j for two periods: the law of one below k - x, integrated over the other's x, dense about both centres."""
    scale = float(scale_of_t(number(freedom), number(deviation)))
    reach = 1e13 ** min(1, 8 / freedom)
    at = (log_growth - 2 * mean) / scale
    ends = np.concatenate(
        [np.linspace(-np.arcsinh(reach), np.arcsinh(reach), 400), np.arcsinh(at + np.linspace(-30, 30, 241))]
    )
    edges = np.unique(ends)
    half = np.diff(edges)[:, np.newaxis] / 2
    bent, width = (edges[:-1, np.newaxis] + half * (NODES + 1)).ravel(), (half * WEIGHTS).ravel()
    t = np.sinh(bent)
    constant = float(mp.gamma((freedom + 1) / 2) / mp.gamma(freedom / 2) / mp.sqrt(freedom * mp.pi))
    weights = width * np.cosh(bent) * constant * np.exp(-(freedom + 1) / 2 * np.log1p(t * t / freedom))
    one = ExponentialTLaw(number(freedom), number(mean), number(scale))
    left = log_growth - mean - scale * t
    below = t_at_most(number(freedom), (left - mean) / scale)
    gaps = one.gaps(np.expm1(np.clip(left, -300, 300)))
    growth = np.exp(np.clip(left, -300, 300))
    return np.array([weights @ below, weights @ (gaps.order_1 / growth), weights @ (gaps.order_2 / growth**2)])


@pytest.mark.parametrize("freedom", [2.2, 2.5, 3, 5, 12, 60])
@pytest.mark.parametrize("deviation", [0.02, 0.2])
def test_two_periods_by_brute_force(freedom: float, deviation: float) -> None:
    found = heavy(freedom, 2, deviation)
    spread = deviation * np.sqrt(2)
    for k in (0.1 - 12 * spread, 0.1 - 2 * spread, 0.1, 0.1 + 1.5 * spread, 0.1 + 8 * spread):
        expected = two_periods(freedom, deviation, 0.05, k)
        at = number(np.expm1(k))
        figures = np.array([found.probability_below(at), *found.gaps(at)]) / np.exp(k) ** np.arange(3)
        assert np.abs(figures - expected).max() <= found.numerical_error + 2e-13


@pytest.mark.parametrize("freedom", [2.1, 3, 7.5, 29.9, 30, 100, 1e6, 1e15])
def test_the_characteristic_function_against_mpmath(freedom: float) -> None:
    mp.mp.dps = 30
    for u in (0.01, 0.5, 2.0, 6.0):
        v = mp.mpf(freedom)
        if freedom > 1e5:
            expected = mp.exp(-(mp.mpf(u) ** 2) / 2 - mp.mpf(u) ** 4 / (4 * v))  # the next term is of order 1/v
        else:
            y = u * mp.sqrt(v)
            expected = 2 ** (1 - v / 2) / mp.gamma(v / 2) * y ** (v / 2) * mp.besselk(v / 2, y)
        found = float(t_transform(number(freedom), np.array([u]))[0])
        assert found == pytest.approx(
            float(expected), abs=1.5e-14 if freedom < 1e5 else 1e-6 if freedom < 1e7 else 1e-13
        )


@pytest.mark.parametrize("freedom", [2.1, 3.0, 8.0])
def test_far_tails_fall_like_those_of_one_period(freedom: float) -> None:
    """Thousands of deviations out, three periods are as likely to be so bad as one of them is to do it all."""
    mp.mp.dps = 20
    found = heavy(freedom, 3)
    scale = float(scale_of_t(number(freedom), number(0.2)))
    for distance in (150.0, 300.0, 2000.0):
        one = float(exact.t_at_most(freedom, -distance * np.sqrt(3) * 0.2 / scale))
        below, above = found._grid.relative_gaps(np.array([-1, 1]) * distance * np.sqrt(3) * 0.2)[0]
        assert below == pytest.approx(3 * one, rel=5e-3, abs=found.numerical_error)
        assert 1 - above == pytest.approx(3 * one, rel=5e-3, abs=found.numerical_error)
    assert found.probability_below(number(1e300)) <= 1
    assert float(found.probability_below(number(np.expm1(600.0)))) == pytest.approx(1, abs=1e-3)


def test_quantiles_far_out() -> None:
    found = heavy(2.5, 5, deviation=0.01)
    levels = np.array([1e-9, 1e-6, 0.01, 0.5, 0.99, 1 - 1e-6])
    quantiles = found.quantile(levels)
    assert (np.diff(quantiles) > 0).all()
    np.testing.assert_allclose(found.probability_below(quantiles), levels, rtol=1e-3, atol=1e-12)
    assert found.certain(np.array([-1.0, -0.5])).tolist() == [True, False]


def test_many_degrees_of_freedom_are_lognormal_growth() -> None:
    plain = law("normal", compounding="continuous", expected_return=0.05, volatility=0.2, horizon_years=4)
    found = heavy(1e9, 4)
    for threshold in (-0.5, 0.02, 1.0):
        at = number(threshold)
        assert float(found.probability_below(at)) == pytest.approx(float(plain.probability_below(at)), abs=1e-8)
        assert float(found.gaps(at).order_2) == pytest.approx(float(plain.gaps(at).order_2), abs=1e-8)


def test_too_many_thresholds_and_too_many_periods_are_refused() -> None:
    with pytest.raises(DoesNotFit) as raised:
        heavy(3, 2, deviation=1e-3).probability_below(np.zeros(100_000))
    assert raised.value.refusals[0].path == ("threshold",)
    with pytest.raises(DoesNotFit) as raised:
        heavy(3, 1_000_000)
    assert raised.value.refusals[0].path == ("horizon_years",)
