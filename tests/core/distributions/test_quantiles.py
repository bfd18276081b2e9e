"""Quantiles of both tails, their ends, and central intervals."""

import numpy as np
import pytest

from service.core.arrays import number
from service.core.distributions import central_interval, quantile
from tests.core.distributions.laws import law, plain


def test_gives_the_probability_at_the_value() -> None:
    lower = quantile(law("normal", mean=0, standard_deviation=1), number(0.975), upper=False)
    assert lower.value == pytest.approx(1.959963984540054, rel=1e-15, abs=0)
    assert lower.probability_at_value == pytest.approx(0.975, rel=1e-15, abs=0)
    upper = quantile(law("normal", mean=0, standard_deviation=1), number(1e-200), upper=True)
    assert upper.value == pytest.approx(30.205594179570, rel=1e-12, abs=0)
    assert upper.probability_at_value == pytest.approx(1e-200, rel=1e-12, abs=0)


def test_of_a_discrete_law_is_the_smallest_value_that_reaches_it() -> None:
    die = law("discrete_uniform", lowest=1, highest=6)
    reached = quantile(die, number(0.5), upper=False)
    assert plain(reached.value, reached.probability_at_value) == (3, 0.5)
    beyond = quantile(die, number(0.51), upper=False)
    assert plain(beyond.value, beyond.probability_at_value) == (4, 4 / 6)
    upper = quantile(die, number(0.5), upper=True)
    assert plain(upper.value, upper.probability_at_value) == (3, 0.5)
    small = quantile(die, number(0.1), upper=True)
    assert plain(small.value, small.probability_at_value) == (6, 0)


def test_probabilities_nought_and_one_are_the_ends_of_the_support() -> None:
    ends = np.array([0.0, 1.0])
    wait = law("exponential", rate=2)
    lower, upper = quantile(wait, ends, upper=False), quantile(wait, ends, upper=True)
    assert lower.value.tolist() == [0, np.inf]
    assert lower.probability_at_value.tolist() == [0, 1]
    assert upper.value.tolist() == [np.inf, 0]
    assert upper.probability_at_value.tolist() == [0, 1]
    plain = law("normal", mean=0, standard_deviation=1)
    assert quantile(plain, ends, upper=False).value.tolist() == [-np.inf, np.inf]
    assert quantile(plain, ends, upper=False).probability_at_value.tolist() == [0, 1]
    assert quantile(plain, ends, upper=True).probability_at_value.tolist() == [0, 1]
    assert quantile(plain, number(0), upper=False).value == -np.inf


def test_beyond_the_doubles_is_infinite() -> None:
    heavy = law("student_t", degrees_of_freedom=1e-3, location=0, scale=1)
    answer = quantile(heavy, number(1e-10), upper=True)
    assert plain(answer.value, answer.probability_at_value) == (np.inf, 0)


def test_ends_and_inner_probabilities_mix() -> None:
    answer = quantile(law("uniform", lower=[0, 10], upper=[1, 20]), np.array([0.0, 0.25]), upper=False)
    assert answer.value.tolist() == [0, 12.5]


def test_central_interval_leaves_equal_tails() -> None:
    interval = central_interval(law("normal", mean=10, standard_deviation=2), number(0.95))
    assert interval.lower == pytest.approx(10 - 2 * 1.959963984540054, rel=1e-15, abs=0)
    assert interval.upper == pytest.approx(10 + 2 * 1.959963984540054, rel=1e-15, abs=0)
    everything = central_interval(law("exponential", rate=1), number(1.0))
    assert plain(everything.lower, everything.upper) == (0, np.inf)
    nothing = central_interval(law("normal", mean=3, standard_deviation=2), number(0.0))
    assert nothing.lower == nothing.upper == 3


def test_central_interval_keeps_the_digits_of_a_tiny_rest() -> None:
    rest = 2.0**-50
    interval = central_interval(law("exponential", rate=1), number(1 - rest))
    assert interval.upper == pytest.approx(51 * np.log(2), rel=1e-15, abs=0)


def test_central_intervals_of_arrays() -> None:
    coverage = np.array([0.5, 0.9, 1.0])
    interval = central_interval(law("uniform", lower=0, upper=1), coverage)
    assert interval.lower == pytest.approx([0.25, 0.05, 0], abs=1e-16)
    assert interval.upper == pytest.approx([0.75, 0.95, 1], abs=1e-16)
