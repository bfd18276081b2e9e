"""Points of curves: true to the curve between them, few enough, with jumps, poles and masses in their places."""

from typing import Any

import numpy as np
import pytest

from service.core.distributions import FAMILIES, Family
from service.core.distributions.curves import CURVES, Curve, curve, thinned
from service.core.distributions.events import Event
from tests.core.distributions.laws import example_of

POINTS = 200
ACCURACY = 0.002


def law_of(name: str, **parameters: Any) -> Family:
    family = FAMILIES[name]
    way = family.parameterisations[0]
    values = {n: np.asarray(v, np.float64)[()] for n, v in parameters.items()}
    return family.make(way, values)


def example(name: str) -> Family:
    return example_of(FAMILIES[name])


def true_height(law: Family, kind: str, x: Any) -> Any:
    with np.errstate(all="ignore"):
        if kind == "density":
            return law.density(x)
        tails = law.tails(x)
        return tails.at_most if kind == "cumulative" else tails.above


def worst_error(law: Family, kind: str, drawn: Curve) -> float:
    """Largest distance between the straight lines and the curve, as a share of the curve's range."""
    known = np.isfinite(drawn.y)
    x, y = drawn.x[known], drawn.y[known]
    between = (x[:-1, None] + np.diff(x)[:, None] * np.linspace(0.05, 0.95, 19)).ravel()
    lines = (y[:-1, None] + np.diff(y)[:, None] * np.linspace(0.05, 0.95, 19)).ravel()
    apart = np.repeat(np.diff(x) > 0, 19)  # between the two points of a jump there is no curve
    heights = true_height(law, kind, between[apart])
    return float(np.abs(lines[apart] - heights).max() / np.ptp(y))


CONTINUOUS = [name for name, family in FAMILIES.items() if not family.discrete]
HARSH: dict[str, dict[str, float]] = {
    "weibull": {"shape": 1.2, "scale": 3},
    "lognormal": {"log_mean": 0, "log_standard_deviation": 2},
    "student_t": {"degrees_of_freedom": 1},
    "gamma": {"shape": 1e6, "scale": 1},
    "beta": {"alpha": 0.5, "beta": 0.5},
    "chi_square": {"degrees_of_freedom": 1},
}


@pytest.mark.parametrize("kind", ["density", "cumulative", "exceedance"])
@pytest.mark.parametrize("name", CONTINUOUS)
def test_straight_lines_are_true_to_the_curve(name: str, kind: str) -> None:
    laws = [example(name)] + ([law_of(name, **HARSH[name])] if name in HARSH else [])
    for law in laws:
        drawn = curve(law, kind, POINTS)
        assert drawn.x.size <= POINTS
        assert (np.diff(drawn.x) >= 0).all()
        assert not drawn.discrete
        assert worst_error(law, kind, drawn) <= ACCURACY


@pytest.mark.parametrize("kind", CURVES)
@pytest.mark.parametrize("name", FAMILIES)
def test_few_points_are_kept_to(name: str, kind: str) -> None:
    drawn = curve(example(name), kind, 10)
    assert 1 <= drawn.x.size <= 10
    assert drawn.x.shape == drawn.y.shape


@pytest.mark.parametrize("name", FAMILIES)
def test_the_quantile_curve_rises_with_the_probability(name: str) -> None:
    drawn = curve(example(name), "quantile", POINTS)
    assert (np.diff(drawn.x) > 0).all()
    assert (np.diff(drawn.y) >= 0).all()
    assert drawn.x[0] >= 0
    assert drawn.x[-1] <= 1


def test_jumps_at_the_ends_are_two_points_of_one_value() -> None:
    drawn = curve(law_of("uniform", lower=10, upper=20), "density", 50)
    assert drawn.x[:2].tolist() == [10, 10]
    assert drawn.y[:2].tolist() == [0, 0.1]
    assert drawn.x[-2:].tolist() == [20, 20]
    assert drawn.y[-2:].tolist() == [0.1, 0]
    rising = curve(law_of("exponential", rate=2), "density", 50)
    assert rising.y[:2].tolist() == [0, 2]


def test_a_pole_is_one_infinite_point_and_the_rest_can_be_seen() -> None:
    drawn = curve(law_of("beta", alpha=0.5, beta=0.5), "density", 50)
    assert np.isinf(drawn.y[[0, -1]]).all()
    assert np.isfinite(drawn.y[1:-1]).all()
    assert drawn.y[1:-1].max() < 20 * np.median(drawn.y[1:-1])


def test_a_kink_is_a_point() -> None:
    assert 0.3 in curve(law_of("laplace", location=0.3, scale=1), "density", 30).x


def test_the_bounds_of_the_shade_are_points() -> None:
    law = law_of("normal", mean=0, standard_deviation=1)
    x = curve(law, "density", 30, Event.of({"above": -0.123, "below": 0.456})).x
    assert {-0.123, 0.456} <= set(x.tolist())
    x = curve(law, "density", 30, Event.of({"within_standard_deviations": 1.5})).x
    assert {-1.5, 1.5} <= set(x.tolist())
    # a bound outside the curve is not drawn
    assert curve(law, "density", 30, Event.of({"below": 99})).x.max() < 5


def test_heavy_tails_leave_the_body_to_be_seen() -> None:
    drawn = curve(law_of("student_t", degrees_of_freedom=1), "density", POINTS)
    assert drawn.x.max() < 50


def test_a_distant_end_of_the_support_is_not_drawn() -> None:
    assert curve(law_of("gamma", shape=1e6, scale=1), "cumulative", POINTS).x.min() > 9e5


def test_masses_stand_at_the_possible_values() -> None:
    drawn = curve(law_of("binomial", trials=10, success_probability=0.6), "density", POINTS)
    assert drawn.discrete
    assert drawn.x.tolist() == list(range(11))
    assert drawn.y.sum() == pytest.approx(1)
    seen = curve(law_of("empirical", observations=[3, 1, 3]), "cumulative", POINTS)
    assert (seen.x.tolist(), seen.y.tolist()) == ([1, 3], [pytest.approx(1 / 3), 1])


def test_of_very_many_values_some_are_drawn() -> None:
    wide = curve(law_of("binomial", trials=1e12, success_probability=0.3), "density", 100)
    assert wide.discrete
    assert wide.x.size <= 100
    assert (wide.x == np.rint(wide.x)).all()
    many = law_of("empirical", observations=np.random.default_rng(1).normal(size=50_000))
    assert curve(many, "cumulative", 100).x.size <= 100


def test_few_trial_points_are_all_kept() -> None:
    x = np.array([0.0, 1.0, 3.0])
    assert thinned(x, x * x, x[[0, -1]], 5).tolist() == x.tolist()


def test_a_straight_curve_gets_points_all_along() -> None:
    x = np.linspace(0, 1, 101)
    kept = thinned(x, x, x[[0, -1]], 11)
    assert np.diff(kept).max() < 0.15
