"""Student t returns and log returns against mpmath, and the predictive laws that are of this kind."""

import mpmath as mp
import numpy as np
import pytest

from service.core.arrays import number
from service.core.returns.laws.exponential_t import ExponentialTLaw, relative_t_gaps
from service.core.returns.laws.student_t import StudentTLaw, t_at
from service.core.returns.t_gaps import lower_t_gaps
from tests.core.returns import exact
from tests.core.returns.build import law

FREEDOMS = [2.001, 2.5, 3, 5, 9.99, 10, 30, 1000]


@pytest.fixture(autouse=True)
def _digits() -> None:
    mp.mp.dps = 60


@pytest.mark.parametrize("freedom", FREEDOMS)
@pytest.mark.parametrize("score", [-1e4, -30, -5, -0.51, -0.5, -0.1, 0])
def test_gaps_of_the_standard_law_below_its_centre(freedom: float, score: float) -> None:
    found = lower_t_gaps(number(freedom), number(score))
    expected = exact.t_gaps(freedom, score)
    smallest = 1e-300  # below it a double has fewer digits
    assert expected[0] < smallest or exact.relative_difference(found[0], expected[0]) < 5e-13
    assert expected[1] < smallest or exact.relative_difference(found[1], expected[1]) < 5e-13


def test_many_degrees_of_freedom_are_the_normal_law() -> None:
    for score in (-4.0, -1.0, -0.2):  # further out the laws themselves differ by z^4/(4 v)
        found = lower_t_gaps(number(1e15), number(score))
        expected = exact.normal_gaps(0, 1, score)
        assert exact.relative_difference(found[0], expected[0]) < 3e-13
        assert exact.relative_difference(found[1], expected[1]) < 3e-13


@pytest.mark.parametrize("freedom", FREEDOMS)
@pytest.mark.parametrize("threshold", [-0.5, 0.02, 0.06, 0.3, 2.0])
def test_figures_of_a_scaled_law(freedom: float, threshold: float) -> None:
    mean, deviation = 0.06, 0.15
    found = law("student_t", expected_return=mean, volatility=deviation, degrees_of_freedom=freedom)
    v, t = mp.mpf(freedom), mp.mpf(threshold)
    scale = mp.mpf(deviation) * mp.sqrt((v - 2) / v)
    z = (t - mean) / scale
    gaps = exact.t_gaps(v, z)
    assert exact.relative_difference(found.probability_below(number(threshold)), exact.t_at_most(v, z)) < 1e-13
    assert exact.relative_difference(found.gaps(number(threshold)).order_1, scale * gaps[0]) < 3e-13
    assert exact.relative_difference(found.gaps(number(threshold)).order_2, scale**2 * gaps[1]) < 3e-13
    assert found.mean() == mean
    assert found.standard_deviation() == deviation


@pytest.mark.parametrize("freedom", FREEDOMS)
@pytest.mark.parametrize("probability", [1e-100, 1e-6, 0.05, 0.4, 0.5, 0.7])
def test_expected_shortfall_agrees_with_the_quantile_found_for_it(freedom: float, probability: float) -> None:
    found = law("student_t", expected_return=0.06, volatility=0.15, degrees_of_freedom=freedom)
    v = mp.mpf(freedom)
    z = float(t_at(number(freedom), number(probability)))
    assert exact.relative_difference(exact.t_at_most(v, z), mp.mpf(probability)) < 1e-12
    scale = mp.mpf(0.15) * mp.sqrt((v - 2) / v)
    mean_loss = scale * exact.t_density(v, z) * (v + mp.mpf(z) ** 2) / (v - 1) / mp.mpf(probability) - mp.mpf(0.06)
    assert exact.relative_difference(found.expected_shortfall(number(probability)), mean_loss) < 1e-12
    assert exact.relative_difference(found.quantile(number(probability)), mp.mpf(0.06) + scale * z) < 1e-13


def test_equal_degrees_of_freedom_are_inverted_once_and_put_back_in_place() -> None:
    freedoms = np.array([5.0, 3.0, 5.0, 30.0])
    probabilities = np.array([[0.05], [0.95]])
    together = t_at(freedoms, probabilities)
    alone = [[float(t_at(number(v), number(p[0]))) for v in freedoms] for p in probabilities]
    assert together.tolist() == alone


@pytest.mark.parametrize(
    ("freedom", "scale", "score"),
    [
        (2.5, 0.1, -5),
        (2.5, 0.1, 0.5),
        (2.5, 0.1, 6),
        (2.5, 1, 20),
        (4, 0.01, -1),
        (4, 0.2, -30),
        (4, 0.2, -0.3),
        (4, 0.2, 2),
        (4, 3, 100),
        (30, 0.2, -5),
        (30, 0.2, 1),
        (1e6, 0.2, -2),
        (1e6, 0.2, 1),
    ],
)
def test_gaps_of_log_returns_with_student_t(freedom: float, scale: float, score: float) -> None:
    mp.mp.dps = 20
    found = relative_t_gaps(number(freedom), number(scale * score), number(scale), number(score))
    expected = exact.exponential_t_gaps(freedom, scale, score)
    assert exact.relative_difference(found[0], expected[0]) < 5e-14
    assert exact.relative_difference(found[1], expected[1]) < 5e-14


@pytest.mark.parametrize("freedom", [10, 30, 100, 1e6])
@pytest.mark.parametrize("score", [-30, -10, -2])
def test_small_log_returns_have_the_gaps_of_returns(freedom: float, score: float) -> None:
    tiny = 1e-13
    found = relative_t_gaps(number(freedom), number(tiny * score), number(tiny), number(score))
    plain = lower_t_gaps(number(freedom), number(score))
    assert float(found[0] / tiny) == pytest.approx(float(plain[0]), rel=5e-12)
    assert float(found[1] / tiny**2) == pytest.approx(float(plain[1]), rel=1e-11)


def test_log_returns_with_many_degrees_of_freedom_are_nearly_lognormal() -> None:
    heavy = law("student_t", compounding="continuous", expected_return=0.05, volatility=0.2, degrees_of_freedom=1e9)
    plain = law("normal", compounding="continuous", expected_return=0.05, volatility=0.2)
    for threshold in (-0.4, 0.02, 0.5):
        at = number(threshold)
        assert float(heavy.gaps(at).order_1) == pytest.approx(float(plain.gaps(at).order_1), rel=1e-7)
        assert float(heavy.gaps(at).order_2) == pytest.approx(float(plain.gaps(at).order_2), rel=1e-7)
        assert float(heavy.probability_below(at)) == pytest.approx(float(plain.probability_below(at)), rel=1e-7)
    assert float(heavy.quantile(number(0.05))) == pytest.approx(float(plain.quantile(number(0.05))), rel=1e-7)


def test_log_returns_with_student_t_have_no_finite_mean() -> None:
    found = law("student_t", compounding="continuous", expected_return=0.05, volatility=0.2, degrees_of_freedom=5)
    assert found.mean() == np.inf
    assert found.standard_deviation() == np.inf
    assert np.isnan(found.expected_shortfall(number(0.05)))
    assert found.log_growth().mean == 0.05
    assert found.log_growth().standard_deviation == 0.2
    assert found.total_loss_probability() == 0
    assert found.certain(np.array([-1.5, 0.02])).tolist() == [True, False]
    assert found.gaps(number(-1.5)).order_1 == 0


def test_a_tail_beyond_the_reach_of_squares_is_answered() -> None:
    found = StudentTLaw(number(3), number(0.05), number(1e-290))
    gaps = found.gaps(np.array([0.02, 0.08]))
    assert gaps.order_1.tolist() == pytest.approx([0, 0.03], abs=1e-16)
    assert gaps.order_2.tolist() == pytest.approx([0, 0.0009], abs=1e-17)


def test_predictive_simple_returns_are_student_t_with_one_degree_less() -> None:
    found = law("normal", expected_return=0.05, volatility=0.2, sample_size=10, uncertainty="predictive")
    scale = mp.mpf(0.2) * mp.sqrt(1 + mp.mpf(1) / 10)
    for threshold in (-0.4, 0.02, 0.3):
        expected = exact.t_at_most(9, (mp.mpf(threshold) - mp.mpf(0.05)) / scale)
        assert exact.relative_difference(found.probability_below(number(threshold)), expected) < 1e-13
    assert found.mean() == 0.05
    assert exact.relative_difference(found.standard_deviation(), scale * mp.sqrt(mp.mpf(9) / 7)) < 1e-15


@pytest.mark.parametrize(
    ("model", "compounding", "log_mean", "log_deviation"),
    [
        ("normal", "continuous", mp.mpf(0.05), mp.mpf(0.2)),
        (
            "lognormal",
            "simple",
            mp.log1p(mp.mpf(0.05)) - mp.log1p((mp.mpf(0.2) / (1 + mp.mpf(0.05))) ** 2) / 2,
            mp.sqrt(mp.log1p((mp.mpf(0.2) / (1 + mp.mpf(0.05))) ** 2)),
        ),
    ],
)
def test_predictive_log_growth_shares_the_unknown_mean_among_all_periods(
    model: str, compounding: str, log_mean: mp.mpf, log_deviation: mp.mpf
) -> None:
    found = law(
        model,
        compounding=compounding,
        expected_return=0.05,
        volatility=0.2,
        sample_size=10,
        horizon_years=12,
        uncertainty="predictive",
    )
    scale = log_deviation * mp.sqrt(12 + mp.mpf(144) / 10)
    for threshold in (-0.6, 0.5, 3.0):
        expected = exact.t_at_most(9, (mp.log1p(mp.mpf(threshold)) - 12 * log_mean) / scale)
        assert exact.relative_difference(found.probability_below(number(threshold)), expected) < 1e-12
    assert found.mean() == np.inf


@pytest.mark.parametrize("periods", [1, 12])
def test_predictive_quantiles_cover_what_comes(periods: int) -> None:
    """In 5 of 100 samples of ten periods the next periods fall below the predictive 5 % quantile (simulated)."""
    random = np.random.default_rng(2024)
    drawn = 0.05 + 0.2 * random.standard_normal((40_000, 10))
    mean, deviation = drawn.mean(axis=1), drawn.std(axis=1, ddof=1)
    future = periods * 0.05 + 0.2 * np.sqrt(periods) * random.standard_normal(40_000)
    law_of_growth = ExponentialTLaw(number(9), periods * mean, deviation * np.sqrt(periods + periods * periods / 10))
    covered = (np.expm1(future) < law_of_growth.quantile(number(0.05))).mean()
    assert covered == pytest.approx(0.05, abs=4 * np.sqrt(0.05 * 0.95 / 40_000))
