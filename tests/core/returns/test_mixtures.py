"""Mixtures: their moments, many components, and components without volatility."""

from typing import Any

import numpy as np
import pytest

from service.core.arrays import number
from service.core.errors import DoesNotFit
from service.core.returns.compounding import mixed
from service.core.returns.compounding.fourier_law import FourierLaw
from service.core.returns.laws.atoms import AtomsLaw
from service.core.returns.laws.mixture import MixtureLaw
from tests.core.returns.build import law, returns

CALM = {"weight": 0.6, "expected_return": 0.01, "volatility": 0.03}
STORM = {"weight": 0.3, "expected_return": -0.02, "volatility": 0.08}
FIXED = {"weight": 0.1, "expected_return": 0.002, "volatility": 0}
AT = np.array([-0.4, -0.1, 0.0, 0.05, 0.3])


@pytest.mark.parametrize("model", ["normal_mixture", "lognormal_mixture"])
def test_moments_of_one_period(model: str) -> None:
    """Against the plain sums of the components' raw moments."""
    parts = [CALM, STORM, FIXED]
    found = returns(model, components=parts).model.moments()
    raw = np.zeros(5)
    for part in parts:
        m, v = part["expected_return"], part["volatility"]
        own = [1, m, m * m + v * v, m**3 + 3 * m * v * v, m**4 + 6 * m * m * v * v + 3 * v**4]
        if model == "lognormal_mixture":
            w = 1 + (v / (1 + m)) ** 2
            growth = [(1 + m) ** k * w ** (k * (k - 1) / 2) for k in range(5)]
            own = [
                1,
                m,
                growth[2] - 2 * growth[1] + 1,
                growth[3] - 3 * growth[2] + 3 * growth[1] - 1,
                growth[4] - 4 * growth[3] + 6 * growth[2] - 4 * growth[1] + 1,
            ]
        raw += part["weight"] * np.array(own)
    mean, variance = raw[1], raw[2] - raw[1] ** 2
    third = raw[3] - 3 * mean * raw[2] + 2 * mean**3
    fourth = raw[4] - 4 * mean * raw[3] + 6 * mean**2 * raw[2] - 3 * mean**4
    assert float(found.mean) == pytest.approx(mean, rel=1e-13)
    assert float(found.standard_deviation) == pytest.approx(variance**0.5, rel=1e-12)
    assert float(found.skewness) == pytest.approx(third / variance**1.5, rel=1e-8)
    assert float(found.excess_kurtosis) == pytest.approx(fourth / variance**2 - 3, rel=1e-8)


def test_a_constant_has_no_skewness() -> None:
    found = returns("normal_mixture", components=[{**FIXED, "weight": 1}]).model.moments()
    assert found.standard_deviation == 0
    assert np.isnan(found.skewness)


@pytest.mark.parametrize("periods", [2, 12, 120])
def test_the_exact_sum_and_the_inversion_agree(periods: int, monkeypatch: pytest.MonkeyPatch) -> None:
    given: dict[str, Any] = {"model": "lognormal_mixture", "components": [CALM, STORM, FIXED], "horizon_years": periods}
    by_inversion_already = periods == 120
    exact = law(**given)
    assert isinstance(exact, FourierLaw if by_inversion_already else MixtureLaw)
    if by_inversion_already:
        monkeypatch.setattr(mixed, "MOST_TERMS", 20_000)
    else:
        monkeypatch.setattr(mixed, "MOST_COMPOSITIONS", 0)
    other = law(**given)
    np.testing.assert_allclose(exact.probability_below(AT), other.probability_below(AT), atol=5e-12)
    np.testing.assert_allclose(exact.gaps(AT).order_2, other.gaps(AT).order_2, atol=5e-12)
    levels = np.array([0.01, 0.3, 0.9])
    np.testing.assert_allclose(exact.quantile(levels), other.quantile(levels), atol=1e-10)
    np.testing.assert_allclose(exact.expected_shortfall(levels), other.expected_shortfall(levels), atol=1e-9)
    assert float(exact.mean()) == pytest.approx(float(other.mean()), rel=1e-12)
    assert float(exact.standard_deviation()) == pytest.approx(float(other.standard_deviation()), rel=1e-12)
    assert float(exact.log_growth().mean) == pytest.approx(float(other.log_growth().mean), rel=1e-12)
    assert float(exact.log_growth().standard_deviation) == pytest.approx(
        float(other.log_growth().standard_deviation), rel=1e-12
    )


def test_a_value_with_a_probability_of_its_own_counts_as_reached() -> None:
    for model in ("normal_mixture", "lognormal_mixture"):
        found = law(model, components=[{**CALM, "weight": 0.9}, FIXED], horizon_years=3)
        point = number(1.002**3 - 1)
        jump = float(found.probability_at_most(point) - found.probability_below(point))
        assert jump == pytest.approx(0.001, abs=1e-11)
        level = number(float(found.probability_below(point)) + 0.0005)
        assert float(found.quantile(level)) == pytest.approx(float(point), abs=1e-12)
        assert float(found.upper_quantile(level)) == pytest.approx(float(point), abs=1e-12)


def test_components_that_are_all_certain_are_listed() -> None:
    points = [{"weight": 0.5, "expected_return": m, "volatility": 0} for m in (-0.1, 0.2)]
    for model in ("normal_mixture", "lognormal_mixture"):
        found = law(model, components=points, horizon_years=4)
        assert isinstance(found, AtomsLaw)
        assert float(found.probability_below(number(0))) == pytest.approx(5 / 16)


def test_a_component_of_total_loss() -> None:
    ruin = {"weight": 0.1, "expected_return": -1.5, "volatility": 0}
    found = law("normal_mixture", components=[{**CALM, "weight": 0.9}, ruin], horizon_years=2)
    assert float(found.total_loss_probability()) == pytest.approx(0.19)
    assert found.cautions == ("growth_below_zero",)
    assert found.quantile(number(0.1)) == -1


def test_too_many_certain_components_beside_uncertain_ones_are_refused() -> None:
    points = [{"weight": 0.01, "expected_return": m / 1000, "volatility": 0} for m in range(20)]
    with pytest.raises(DoesNotFit) as raised:
        law("normal_mixture", components=[{**CALM, "weight": 0.8}, *points], horizon_years=40)
    assert raised.value.refusals[0].code == "too_much_work"


def test_components_of_very_different_width() -> None:
    narrow = {"weight": 0.9, "expected_return": 0.001, "volatility": 0.002}
    wide = {"weight": 0.1, "expected_return": -0.02, "volatility": 0.3}
    found = law("normal_mixture", components=[narrow, wide], horizon_years=2)
    assert found.numerical_error < 1e-11


def test_narrow_components_cancel_at_some_frequencies_and_not_beyond() -> None:
    """Four narrow peaks over 40 periods: what the transform does between its returns must not end the sum early."""
    parts = [
        {"weight": w, "expected_return": m, "volatility": 3e-5}
        for w, m in ((0.6, 2.8e-4), (0.2, -1.3e-4), (0.12, 9e-4), (0.08, -6e-4))
    ]
    inverted = law("lognormal_mixture", components=parts, horizon_years=40)
    assert isinstance(inverted, FourierLaw)
    random = np.random.default_rng(4)
    counts = random.multinomial(40, [part["weight"] for part in parts], size=40_000)
    logs = counts @ [np.log1p(part["expected_return"]) for part in parts] + np.sqrt(40) * 3e-5 * random.normal(
        size=40_000
    )
    for level in (0.1, 0.5, 0.9):
        reached = np.quantile(np.expm1(logs), level)
        assert float(inverted.probability_below(number(reached))) == pytest.approx(level, abs=0.012)


def test_an_infinite_deviation_is_said() -> None:
    vast = [{"weight": 1, "expected_return": 0.1, "volatility": 1e6}]
    assert law("lognormal_mixture", components=vast, horizon_years=60).standard_deviation() == np.inf
