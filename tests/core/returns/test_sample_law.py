"""Observed returns against plain counting, ties, total losses and levels that binary fractions miss."""

from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.core.arrays import number
from service.core.returns.laws.sample import SampleLaw, sample_moments
from tests.core.returns.build import law

samples = st.lists(st.integers(-100, 300).map(lambda n: n / 100), min_size=1, max_size=40)


def sample_law(values: list[float]) -> SampleLaw:
    return SampleLaw(np.array(values))


@given(samples, st.integers(-120, 320).map(lambda n: n / 100))
def test_probabilities_and_gaps_are_counts_and_averages(values: list[float], threshold: float) -> None:
    found = sample_law(values)
    count = len(values)
    assert found.probability_below(number(threshold)) == sum(v < threshold for v in values) / count
    assert found.probability_at_most(number(threshold)) == sum(v <= threshold for v in values) / count
    gaps = found.gaps(number(threshold))
    assert float(gaps.order_1) == pytest.approx(sum(max(threshold - v, 0) for v in values) / count, abs=1e-14)
    assert float(gaps.order_2) == pytest.approx(sum(max(threshold - v, 0) ** 2 for v in values) / count, abs=1e-13)


@given(samples, st.integers(1, 19))
def test_quantiles_follow_the_exact_cumulative_shares(values: list[float], twentieths: int) -> None:
    found, level, ordered = sample_law(values), Fraction(twentieths, 20), sorted(values)
    shares = [Fraction(k, len(values)) for k in range(1, len(values) + 1)]
    lower = next(v for v, share in zip(ordered, shares, strict=True) if share >= level)
    upper = next(v for v, share in zip(ordered, shares, strict=True) if share > level)
    assert found.quantile(number(float(level))) == lower
    assert found.upper_quantile(number(float(level))) == upper


@given(samples, st.integers(1, 19))
def test_expected_shortfall_averages_the_worst_share_and_splits_atoms(values: list[float], twentieths: int) -> None:
    level = Fraction(twentieths, 20)
    left, total = level, Fraction(0)
    for value in sorted(values):
        taken = min(left, Fraction(1, len(values)))
        total += taken * Fraction(value)
        left -= taken
    found = sample_law(values).expected_shortfall(number(float(level)))
    assert float(found) == pytest.approx(float(-total / level), abs=1e-13)


def test_one_minus_nine_tenths_is_a_tenth() -> None:
    found = sample_law([float(n) for n in range(10)])
    level = 1 - number(0.9)  # 0.09999999999999998 in binary
    assert found.upper_quantile(level) == 1
    assert found.quantile(level) == 0


def test_a_return_equal_to_the_floor_is_acceptable_also_when_it_went_through_a_logarithm() -> None:
    observed = [float(np.log1p(r)) for r in (0.01, 0.02, 0.03)]
    found = law("empirical", compounding="continuous", observations=observed)
    assert found.probability_below(number(0.02)) == pytest.approx(1 / 3)
    assert found.probability_at_most(number(0.02)) == pytest.approx(2 / 3)


def test_a_total_loss_counts_and_leaves_log_growth_without_a_value() -> None:
    found = law("empirical", observations=[-1, 0.1, 0.2, 0.3])
    assert found.total_loss_probability() == 0.25
    assert np.isnan(found.log_growth().mean)
    assert np.isnan(found.log_growth().standard_deviation)


def test_log_growth_of_a_sample_without_total_loss() -> None:
    growth = law("empirical", observations=[-0.1, 0.1, 0.2]).log_growth()
    logs = np.log1p([-0.1, 0.1, 0.2])
    assert float(growth.mean) == pytest.approx(logs.mean(), rel=1e-14)
    assert float(growth.standard_deviation) == pytest.approx(logs.std(), rel=1e-14)


def test_thresholds_in_an_array_are_answered_side_by_side() -> None:
    found = sample_law([-0.1, 0.0, 0.2])
    thresholds = np.array([-0.1, 0.05, 0.3])
    assert found.probability_below(thresholds).tolist() == pytest.approx([0, 2 / 3, 1])
    assert found.certain(thresholds).tolist() == [True, False, True]
    assert found.gaps(thresholds).order_1.tolist() == pytest.approx([0, (0.15 + 0.05) / 3, (0.4 + 0.3 + 0.1) / 3])


def test_moments_have_the_divisor_of_a_law_not_of_an_estimate() -> None:
    values = np.array([-0.12, 0.03, 0.05, 0.05, 0.11, 0.21])
    found = sample_moments(values)
    centred = values - values.mean()
    deviation = np.sqrt((centred**2).mean())
    assert float(found.mean) == pytest.approx(values.mean(), rel=1e-14)
    assert float(found.standard_deviation) == pytest.approx(deviation, rel=1e-14)
    assert float(found.skewness) == pytest.approx((centred**3).mean() / deviation**3, rel=1e-13)
    assert float(found.excess_kurtosis) == pytest.approx((centred**4).mean() / deviation**4 - 3, rel=1e-13)


def test_equal_observations_are_a_certainty() -> None:
    found = sample_moments(np.full(7, 0.1))
    assert (float(found.mean), float(found.standard_deviation)) == (0.1, 0)
    assert np.isnan(found.skewness)
    assert np.isnan(found.excess_kurtosis)
