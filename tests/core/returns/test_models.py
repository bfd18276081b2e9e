"""A return model is one class: its declaration is checked when it is made, its parameters when they are given."""

from typing import Any

import numpy as np
import pytest

from service.core.arrays import Numbers, number
from service.core.distributions.family import Moments
from service.core.errors import DoesNotFit
from service.core.parameters import Parameter, Sample
from service.core.returns import RETURN_MODELS, HorizonLaw, Returns
from service.core.returns.law import Ordering
from service.core.returns.model import ReturnModel
from tests.core.returns.build import law, returns


def body(**changes: Any) -> dict[str, Any]:
    """The body of a complete model class."""

    def moments(self: ReturnModel) -> Moments:
        return Moments(*[number(0)] * 4)

    def horizon_law(self: ReturnModel, periods: Numbers, compounding: str) -> HorizonLaw:
        return HorizonLaw()

    whole = {
        "__doc__": "Something for tests.",
        "name": "for_tests",
        "drift": Parameter("the drift", example=0.1),
        "moments": moments,
        "horizon_law": horizon_law,
    }
    return {name: value for name, value in (whole | changes).items() if value is not None}


@pytest.fixture
def _registry(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("service.core.returns.model.RETURN_MODELS", dict(RETURN_MODELS))


def faults(**given: Any) -> list[tuple[tuple[str | int, ...], str]]:
    """Path and code of every refusal."""
    with pytest.raises(DoesNotFit) as raised:
        returns(**given)
    return [(refusal.path, refusal.code) for refusal in raised.value.refusals]


def test_the_models_are_registered_by_name() -> None:
    assert set(RETURN_MODELS) >= {"normal", "lognormal", "student_t", "empirical"}
    assert all(model.name == name for name, model in RETURN_MODELS.items())


@pytest.mark.usefixtures("_registry")
def test_a_class_with_a_docstring_a_name_and_its_forms_is_a_model() -> None:
    made = type("ForTests", (ReturnModel,), body())
    assert made.stacks  # type: ignore[attr-defined]  # declared by the base
    sample = type("Other", (ReturnModel,), body(name="other", seen=Sample("seen", example=[0.1])))
    assert not sample.stacks  # type: ignore[attr-defined]  # as above


@pytest.mark.usefixtures("_registry")
@pytest.mark.parametrize("missing", ["moments", "horizon_law", "__doc__", "name"])
def test_a_model_that_is_not_whole_is_refused(missing: str) -> None:
    with pytest.raises(TypeError):
        type("ForTests", (ReturnModel,), body(**{missing: None}))


@pytest.mark.usefixtures("_registry")
def test_a_name_is_given_once() -> None:
    with pytest.raises(TypeError, match="twice"):
        type("Second", (ReturnModel,), body(name="normal"))


def test_lognormal_growth_has_no_continuous_compounding() -> None:
    given: dict[str, Any] = {"model": "lognormal", "expected_return": 0.05, "volatility": 0.1}
    assert faults(**given, compounding="continuous") == [(("compounding",), "compounding_not_available")]
    with pytest.raises(DoesNotFit, match="takes compounding simple; it is continuous"):
        returns(**given, compounding="continuous")


def test_an_unknown_compounding_is_refused() -> None:
    assert faults(model="empirical", observations=[0.1], compounding="hourly") == [
        (("compounding",), "compounding_not_available")
    ]


def test_an_observation_below_a_total_loss_is_named() -> None:
    assert faults(model="empirical", observations=[0.1, -1, -1.2]) == [(("observations", 2), "must_be_at_least")]


def test_log_returns_may_be_below_minus_one_but_not_beyond_the_doubles() -> None:
    found = law("empirical", compounding="continuous", observations=[-3, 0.1])
    assert float(found.quantile(number(0.1))) == pytest.approx(np.expm1(-3), rel=1e-15)
    assert faults(model="empirical", observations=[0.1, 400], compounding="continuous") == [
        (("observations", 1), "must_be_at_most")
    ]


def test_periods_per_year_must_be_positive() -> None:
    assert faults(model="normal", expected_return=0, volatility=0.1, periods_per_year=0.0) == [
        (("periods_per_year",), "must_be_positive")
    ]


@pytest.mark.parametrize("name", ["normal", "student_t", "lognormal"])
def test_limits_of_the_declared_parameters(name: str) -> None:
    declared = RETURN_MODELS[name].parameterisations[0].parameters
    assert declared["volatility"].refusals(number(-0.1))[0].code == "must_not_be_negative"
    assert not declared["volatility"].refusals(number(0))
    if name == "lognormal":
        assert declared["expected_return"].refusals(number(-1))[0].code == "must_be_above"
    if name == "student_t":
        assert declared["degrees_of_freedom"].refusals(number(2))[0].code == "must_be_above"


def test_moments_of_one_period() -> None:
    plain = returns("normal", expected_return=[0.05, 0.05], volatility=[0.1, 0]).model.moments()
    assert plain.skewness.tolist() == pytest.approx([0, np.nan], nan_ok=True)
    assert plain.excess_kurtosis.tolist() == pytest.approx([0, np.nan], nan_ok=True)
    growth = returns("lognormal", expected_return=0.05, volatility=0.12).model.moments()
    w = 1 + (0.12 / 1.05) ** 2
    assert float(growth.skewness) == pytest.approx((w + 2) * np.sqrt(w - 1), rel=1e-13)
    assert float(growth.excess_kurtosis) == pytest.approx(w**4 + 2 * w**3 + 3 * w**2 - 6, rel=1e-10)
    freedoms = [2.5, 3.5, 5]
    heavy = returns("student_t", expected_return=0.05, volatility=0.1, degrees_of_freedom=freedoms).model.moments()
    assert heavy.skewness.tolist() == pytest.approx([np.nan, 0, 0], nan_ok=True)
    assert heavy.excess_kurtosis.tolist() == [np.inf, np.inf, 6]
    assert float(returns("empirical", observations=[0, 0.2]).model.moments().mean) == pytest.approx(0.1)


def test_returns_hold_what_they_were_given() -> None:
    given = returns("normal", expected_return=0.05, volatility=0.1, period="month")
    assert isinstance(given, Returns)
    assert given.periods_in_year == 12
    assert returns("normal", expected_return=0, volatility=0, periods_per_year=250.0).periods_in_year == 250


def test_a_law_has_atoms_or_an_ordering_or_neither() -> None:
    plain = HorizonLaw()
    assert plain.atoms() is None
    assert plain.ordering() is None
    ordering = law("normal", expected_return=0.05, volatility=0.1).ordering()
    assert isinstance(ordering, Ordering)
    assert ordering.kind == "normal"


@pytest.mark.usefixtures("_registry")
def test_moments_do_not_depend_on_compounding_unless_a_model_says_so() -> None:
    model = returns("normal", expected_return=0.05, volatility=0.1).model
    assert model.moments_under("continuous") == model.moments()
