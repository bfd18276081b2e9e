"""Many portfolios of many periods at once: equal ones computed once, too many refused."""

from typing import Any

import numpy as np
import pytest

from service.core.arrays import number
from service.core.errors import DoesNotFit, Refusal
from service.core.returns import Returns
from service.core.returns.distinct import law_of_each
from service.core.returns.law import HorizonLaw
from service.core.returns.laws.collected import CollectedLaw
from service.core.returns.models.normal import Normal
from service.core.returns.work import MOST_WORK, refuse_work
from tests.core.returns.build import law, returns


def refusal(**given: Any) -> Refusal:
    with pytest.raises(DoesNotFit) as raised:
        law(**given)
    (one,) = raised.value.refusals
    return one


def test_columns_answer_as_each_of_them_alone() -> None:
    columns: dict[str, Any] = {"expected_return": [0.05, 0.07, 0.05, 0.1], "volatility": [0.1, 0.2, 0.1, 0]}
    found = law("normal", **columns, horizon_years=3)
    assert isinstance(found, CollectedLaw)
    assert len(found.parts) == 3
    thresholds = np.array([[-0.2], [0.1]])
    for column in range(4):
        one = {name: values[column] for name, values in columns.items()}
        alone = law("normal", **one, horizon_years=3)
        np.testing.assert_array_equal(
            found.probability_below(thresholds)[:, column], alone.probability_below(thresholds)[:, 0]
        )
        assert found.quantile(number(0.05))[column] == alone.quantile(number(0.05))
    assert found.numerical_error_kind == "estimate"
    assert found.work > 0


def test_single_numbers_stretch_beside_arrays() -> None:
    found = law("student_t", expected_return=0.05, volatility=[0.1, 0.2], degrees_of_freedom=5, horizon_years=2)
    assert found.probability_below(number(0)).shape == (2,)


def test_moves_in_columns_have_their_own_moments() -> None:
    given: dict[str, Any] = {"up_return": [0.1, 0.2], "down_return": [-0.1, -0.2], "up_probability": 0.6, "moves": 2}
    both = returns("up_down", **given)
    found = both.moments()
    one = returns("up_down", up_return=0.2, down_return=-0.2, up_probability=0.6, moves=2).moments()
    assert [float(figure[1]) for figure in found] == [float(figure) for figure in one]
    assert float(one.mean) == pytest.approx(1.04**2 - 1)
    logs = returns("up_down", up_return=0.2, down_return=-0.2, up_probability=0.6, moves=2, compounding="continuous")
    assert float(logs.moments().mean) == pytest.approx(0.08)
    assert logs.model.moments() == one
    assert law("up_down", **given).probability_below(number(0)).shape == (2,)


class Costly(HorizonLaw):
    """Takes a hundredth of what one question may."""

    work = MOST_WORK / 100
    numerical_error = 0.0


def test_a_question_of_too_much_work_is_refused_early() -> None:
    made: list[Normal] = []

    def make(one: Normal) -> HorizonLaw:
        made.append(one)
        return Costly()

    many = Normal(expected_return=np.linspace(0, 0.1, 500), volatility=number(0.1))
    with pytest.raises(DoesNotFit) as raised:
        law_of_each(many, make)
    assert raised.value.refusals[0].code == "too_much_work"
    assert len(made) == 20
    few = Normal(expected_return=np.linspace(0, 0.1, 90), volatility=number(0.1))
    assert isinstance(law_of_each(few, make), CollectedLaw)
    refuse_work(MOST_WORK)


def test_more_than_a_thousand_different_laws_are_refused() -> None:
    found = refusal(model="normal", expected_return=list(np.linspace(0, 0.1, 1001)), volatility=0.1, horizon_years=2)
    assert (found.path, found.code) == (("horizon_years",), "too_much_work")
    assert found.params == {"work": 1001, "limit": 1000}
    equal = law("normal", expected_return=[0.05] * 5000, volatility=0.1, horizon_years=2)
    assert equal.probability_below(number(0)).shape == (5000,)


@pytest.mark.parametrize(
    "given",
    [
        {"model": "normal", "expected_return": 0.001, "volatility": 0.01},
        {"model": "empirical", "observations": [0.1, -0.05]},
        {"model": "lognormal_mixture", "components": [{"weight": 1, "expected_return": 0.01, "volatility": 0.1}]},
    ],
)
def test_more_than_a_hundred_thousand_periods_are_refused(given: dict[str, Any]) -> None:
    found = refusal(**given, horizon_years=200_000)
    assert (found.path, found.code) == (("horizon_years",), "too_much_work")


def test_more_thresholds_than_a_law_can_answer_are_refused() -> None:
    found = law("student_t", expected_return=0.001, volatility=0.01, degrees_of_freedom=3, horizon_years=2)
    with pytest.raises(DoesNotFit) as raised:
        found.probability_below(np.zeros(100_000))
    assert raised.value.refusals[0].path == ("threshold",)


def test_a_thousand_floors_are_one_pass() -> None:
    found = law("normal", expected_return=0.005, volatility=0.05, horizon_years=12)
    floors = np.linspace(-0.5, 1, 1000)
    below = found.probability_below(floors)
    assert (np.diff(below) >= -1e-13).all()
    assert float(below[500]) == pytest.approx(float(found.probability_below(number(floors[500]))), abs=1e-14)


def test_a_law_too_concentrated_for_its_tails_is_refused() -> None:
    given: dict[str, Any] = {"expected_return": 0, "volatility": 1e-4, "degrees_of_freedom": 2.02}
    found = refusal(model="student_t", **given, horizon_years=2)
    assert (found.path, found.code) == (("horizon_years",), "not_accurate_enough")
    assert found.params["numerical_error"] > found.params["limit"] == 0.01
    many = law("student_t", **given, horizon_years=100_000)
    assert many.numerical_error < 1e-2


def test_at_the_edge_of_its_domain_a_bent_law_states_its_error() -> None:
    edge: dict[str, Any] = {"expected_return": 0.06, "volatility": 0.2, "skewness": 0, "excess_kurtosis": 8}
    few, many = (law("cornish_fisher", **edge, horizon_years=n) for n in (6, 120))
    assert 1e-6 < few.numerical_error < 1e-3
    assert many.numerical_error < 1e-10
    assert refusal(model="cornish_fisher", **edge, horizon_years=2).code == "not_accurate_enough"


def test_nearly_nothing_but_a_total_loss() -> None:
    found = law("normal", expected_return=-3, volatility=0.2, horizon_years=2)
    assert found.quantile(number(0.5)) == -1
    assert float(found.total_loss_probability()) == 1
    assert found.numerical_error == 1e-11
    assert isinstance(returns("normal", expected_return=-3, volatility=0.2), Returns)


def test_certain_returns_over_several_periods() -> None:
    extras: dict[str, dict[str, Any]] = {"normal": {}, "student_t": {"degrees_of_freedom": 4}}
    for model, extra in extras.items():
        sure = law(model, expected_return=0.1, volatility=0, horizon_years=3, **extra)
        assert float(sure.quantile(number(0.3))) == pytest.approx(0.331, rel=1e-14)
        lost = law(model, expected_return=-2, volatility=0, horizon_years=3, **extra)
        assert lost.total_loss_probability() == 1
        assert lost.mean() == -1
    logs = law(
        "student_t",
        compounding="continuous",
        expected_return=0.1,
        volatility=0,
        degrees_of_freedom=4,
        horizon_years=3,
    )
    assert float(logs.mean()) == pytest.approx(np.expm1(0.3))


def test_quantiles_of_a_law_with_tens_of_thousands_of_frequencies() -> None:
    found = law("student_t", expected_return=0.0003, volatility=0.01, degrees_of_freedom=2.05, horizon_years=2)
    assert found.numerical_error < 1e-11
    levels = np.array([0.01, 0.5, 0.99])
    quantiles = found.quantile(levels)
    np.testing.assert_allclose(found.probability_below(quantiles), levels, atol=1e-11)


def test_a_density_that_peaks_below_a_total_loss_does_no_harm() -> None:
    edge: dict[str, Any] = {"expected_return": -1.5, "volatility": 0.4, "skewness": 0, "excess_kurtosis": 8}
    found = law("cornish_fisher", **edge, horizon_years=2)
    assert float(found.total_loss_probability()) > 0.9
    assert found.numerical_error < 1e-2
