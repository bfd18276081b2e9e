"""Descriptions of laws, and the figures that everyone in the trade knows."""

from typing import Any

import numpy as np
import pytest

from service.core.arrays import number
from service.core.distributions import FAMILIES, Event, chances, describe
from tests.core.distributions.laws import example_of, law, plain


def test_describes_a_normal() -> None:
    figures = describe(law("normal", mean=10, standard_deviation=2))
    assert figures.mean == figures.median == figures.mode == 10
    assert plain(figures.variance, figures.standard_deviation) == (4, 2)
    assert plain(figures.skewness, figures.kurtosis, figures.excess_kurtosis) == (0, 3, 0)
    assert figures.entropy == pytest.approx(np.log(2 * np.sqrt(2 * np.pi * np.e)), rel=1e-15, abs=0)
    assert plain(figures.support_lower, figures.support_upper) == (-np.inf, np.inf)


def test_figures_of_arrays_have_one_shape() -> None:
    for kind in FAMILIES.values():
        shape = np.shape(describe(example_of(kind)).mean)
        assert all(np.shape(figure) == shape for figure in describe(example_of(kind)))
    figures = describe(law("student_t", degrees_of_freedom=[1, 2, 3, 4, 5], location=0, scale=1))
    assert all(np.shape(figure) == (5,) for figure in figures)


def test_moments_that_diverge_and_moments_that_have_no_value() -> None:
    figures = describe(law("student_t", degrees_of_freedom=[1, 2, 3, 4, 5], location=0, scale=1))
    expected = {
        "mean": [np.nan, 0, 0, 0, 0],
        "variance": [np.nan, np.inf, 3, 2, 5 / 3],
        "skewness": [np.nan, np.nan, np.nan, 0, 0],
        "kurtosis": [np.nan, np.nan, np.inf, np.inf, 9],
    }
    for name, values in expected.items():
        assert getattr(figures, name) == pytest.approx(values, rel=1e-15, nan_ok=True)


@pytest.mark.parametrize(
    ("family", "parameters", "mode"),
    [
        ("uniform", {"lower": 0, "upper": 1}, np.nan),
        ("discrete_uniform", {"lowest": 1, "highest": 6}, np.nan),
        ("discrete_uniform", {"lowest": 4, "highest": 4}, 4),
        ("empirical", {"observations": [3, 1, 2]}, np.nan),
        ("empirical", {"observations": [3, 1, 3, 2, 1]}, 1),
        ("empirical", {"observations": [7]}, 7),
        ("bernoulli", {"success_probability": 0.5}, 0),
        ("bernoulli", {"success_probability": 0.6}, 1),
        ("binomial", {"trials": 10, "success_probability": 0.6}, 6),
        ("binomial", {"trials": 9, "success_probability": 0.5}, 4),
        ("binomial", {"trials": 9, "success_probability": 1}, 9),
        ("binomial", {"trials": 9, "success_probability": 0}, 0),
        ("poisson", {"rate": 3}, 2),
        ("poisson", {"rate": 3.5}, 3),
        ("poisson", {"rate": 0.2}, 0),
        ("lognormal", {"log_mean": 1, "log_standard_deviation": 0.5}, np.exp(0.75)),
    ],
)
def test_mode_is_the_smallest_most_likely_value(family: str, parameters: dict[str, Any], mode: float) -> None:
    assert describe(law(family, **parameters)).mode == pytest.approx(mode, rel=1e-15, nan_ok=True)


@pytest.mark.parametrize(
    ("family", "parameters"),
    [
        ("bernoulli", {"success_probability": 0}),
        ("bernoulli", {"success_probability": 1}),
        ("binomial", {"trials": 5, "success_probability": 1}),
        ("binomial", {"trials": 0, "success_probability": 0.3}),
        ("discrete_uniform", {"lowest": 2, "highest": 2}),
        ("empirical", {"observations": [2.5]}),
    ],
)
def test_a_sure_value_has_no_skewness(family: str, parameters: dict[str, Any]) -> None:
    figures = describe(law(family, **parameters))
    assert figures.variance == figures.entropy == 0
    assert np.isnan(figures.skewness)
    assert np.isnan(figures.kurtosis)
    assert figures.mean == figures.median == figures.mode == figures.support_lower == figures.support_upper
    assert figures.within_one == 1


# Common practice, no source: figures that everyone in the trade has met.


def test_a_fair_die() -> None:
    die = law("discrete_uniform", lowest=1, highest=6)
    at_most = [plain(die.tails(number(x)).at_most)[0] for x in (1.0, 4.0, 100.0)]
    assert at_most == [1 / 6, 4 / 6, 1]


def test_ten_moves_that_go_up_six_times_in_ten() -> None:
    figures = describe(law("binomial", trials=10, success_probability=0.6))
    assert figures.mean == 6
    assert figures.variance == pytest.approx(2.4, rel=1e-15, abs=0)


def test_unit_slices_of_a_uniform_law() -> None:
    range_of_ten = law("uniform", lower=10, upper=20)
    for start in range(10, 20):
        slice_ = chances(range_of_ten, Event.of({"at_least": float(start), "below": start + 1.0}))
        assert slice_.probability == pytest.approx(0.1, rel=1e-14, abs=0)
    assert range_of_ten.tails(number(21.0)).at_most == 1


def test_a_normal_holds_most_within_three_standard_deviations() -> None:
    figures = describe(law("normal", mean=10, standard_deviation=2))
    assert plain(figures.skewness, figures.kurtosis) == (0, 3)
    shares = (figures.within_one, figures.within_two, figures.within_three)
    assert [round(float(share), 3) for share in shares] == [0.683, 0.954, 0.997]


def test_half_a_standard_deviation_above_the_mean() -> None:
    below = chances(law("normal", mean=10, standard_deviation=2), Event.of({"below": 11.0}))
    assert round(float(below.probability), 4) == 0.6915
    assert below.upper_score == 0.5
