"""Cornish-Fisher returns of one period against mpmath, and parameters that match moments."""

from typing import Any

import mpmath as mp
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.core.arrays import number
from service.core.distributions.kernels.cornish_fisher import Expansion, shape_moments
from service.core.errors import DoesNotFit, Refusal
from service.core.returns.laws.cornish_fisher import CornishFisherLaw, ExponentialCornishFisherLaw
from service.core.returns.matched_moments import least_and_most_excess, matching_parameters, reachable_excess
from service.core.returns.models.cornish_fisher import CornishFisher
from tests.core.returns import exact
from tests.core.returns.build import law, returns

MEAN, SCALE, SKEWNESS, EXCESS = 0.06, 0.15, -0.5, 2.0
BENT = Expansion.of(number(SKEWNESS), number(EXCESS))
SCORES = [-30, -8, -3, -1, 0, 0.5, 2, 8.5, 12]


@pytest.fixture(autouse=True)
def _digits() -> None:
    mp.mp.dps = 40


def bent(z: Any) -> Any:
    """The expansion with mpmath, from the same coefficients."""
    c1, c2, c3 = (mp.mpf(float(c)) for c in BENT)
    return c1 * z + c2 * (z * z - 1) + c3 * (z**3 - 3 * z)


def below(function: Any, z: Any) -> Any:
    """E[function(Z); Z < z]."""
    z = mp.mpf(z)
    scale = 1 / (1 + max(-z, 0))
    places = [z - scale * d for d in (0, 0.1, 0.5, 1, 2, 4, 8, 16, 40)]
    if z > 0:
        places = sorted({*places, *(mp.mpf(x) for x in (-40, -12, -6, -3, 0, 3, 6) if x < z)}, reverse=True)
    return mp.quad(lambda x: function(x) * exact.density(x), places[::-1])


def polynomial_below(coefficients: list[Any], z: Any) -> Any:
    """E[polynomial(Z); Z < z] by the recursion of truncated moments."""
    moments = [exact.at_most(z), -exact.density(z)]
    for power in range(2, len(coefficients)):
        moments.append(-(z ** (power - 1)) * exact.density(z) + (power - 1) * moments[power - 2])
    return sum(c * moment for c, moment in zip(coefficients, moments, strict=False))


@pytest.mark.parametrize("score", SCORES)
def test_gaps_keep_their_digits_at_every_distance(score: float) -> None:
    mp.mp.dps = 60
    threshold = MEAN + SCALE * float(bent(mp.mpf(score)))
    z = mp.findroot(lambda x: MEAN + SCALE * bent(x) - mp.mpf(threshold), mp.mpf(score))
    c1, c2, c3 = (mp.mpf(float(c)) for c in BENT)
    gap = [bent(z) + c2, -(c1 - 3 * c3), -c2, -c3]
    square = [sum(gap[i] * gap[n - i] for i in range(4) if 0 <= n - i < 4) for n in range(7)]
    found = CornishFisherLaw(number(MEAN), number(SCALE), BENT).gaps(number(threshold))
    allowed = 3e-14 + 1e-15 * score**2
    assert exact.relative_difference(found.order_1, SCALE * polynomial_below(gap, z)) < allowed
    assert exact.relative_difference(found.order_2, mp.mpf(SCALE) ** 2 * polynomial_below(square, z)) < allowed


@pytest.mark.parametrize("score", [-6, -3, -1, 0, 0.5, 2, 8.5])
@pytest.mark.parametrize("order", [1, 2])
def test_gaps_of_bent_log_returns(score: float, order: int) -> None:
    growth = ExponentialCornishFisherLaw(number(MEAN), number(SCALE), BENT)
    threshold = float(mp.expm1(MEAN + SCALE * bent(mp.mpf(score))))
    z = mp.findroot(lambda x: MEAN + SCALE * bent(x) - mp.log1p(mp.mpf(threshold)), mp.mpf(score))
    relative = below(lambda x: (-mp.expm1(SCALE * (bent(x) - bent(z)))) ** order, z)
    found = growth.gaps(number(threshold))[order - 1]
    assert exact.relative_difference(found, relative * (1 + mp.mpf(threshold)) ** order) < 1e-10


@pytest.mark.parametrize("probability", [1e-12, 0.01, 0.05, 0.5, 0.9])
def test_quantile_and_expected_shortfall(probability: float) -> None:
    found = law("cornish_fisher", expected_return=MEAN, volatility=SCALE, skewness=SKEWNESS, excess_kurtosis=EXCESS)
    z = exact.quantile(probability)
    assert exact.relative_difference(found.quantile(number(probability)), MEAN + SCALE * bent(z)) < 1e-13
    mean_loss = -(MEAN + SCALE * below(bent, z) / mp.mpf(probability))
    assert float(found.expected_shortfall(number(probability))) == pytest.approx(float(mean_loss), rel=1e-12)


def test_the_straight_expansion_is_the_normal_law() -> None:
    shape: dict[str, Any] = {"skewness": 0, "excess_kurtosis": 0}
    base: dict[str, Any] = {"expected_return": 0.06, "volatility": 0.15}
    at = np.array([-0.4, 0.02, 0.5])
    for compounding in ("simple", "continuous"):
        for periods in (1, 3):
            found = law("cornish_fisher", **base, **shape, compounding=compounding, horizon_years=periods)
            plain = law("normal", **base, compounding=compounding, horizon_years=periods)
            np.testing.assert_allclose(found.probability_below(at), plain.probability_below(at), atol=1e-11)
            np.testing.assert_allclose(found.gaps(at).order_2, plain.gaps(at).order_2, atol=1e-11)
            assert float(found.mean()) == pytest.approx(float(plain.mean()), rel=1e-13)
            assert float(found.standard_deviation()) == pytest.approx(float(plain.standard_deviation()), rel=1e-12)
            assert float(found.expected_shortfall(number(0.05))) == pytest.approx(
                float(plain.expected_shortfall(number(0.05))), abs=1e-9
            )


def test_bent_log_returns_never_lose_everything() -> None:
    found = ExponentialCornishFisherLaw(number(MEAN), number(SCALE), BENT)
    assert found.total_loss_probability() == 0
    assert found.certain(np.array([-1.0, -0.5])).tolist() == [True, False]
    assert found.mean() == np.inf


def test_certain_and_uncertain_portfolios_side_by_side() -> None:
    shape: dict[str, Any] = {"skewness": [SKEWNESS] * 2, "excess_kurtosis": [EXCESS] * 2}
    for compounding, point in (("simple", 0.03), ("continuous", float(np.expm1(0.03)))):
        for periods in (1, 2):
            found = law(
                "cornish_fisher",
                expected_return=[0.03, 0.03],
                volatility=[0, 0.1],
                **shape,
                compounding=compounding,
                horizon_years=periods,
            )
            reached = number((1 + point) ** periods - 1)
            assert found.probability_below(reached)[0] == 0
            assert found.probability_at_most(reached)[0] == 1
            assert 0 < found.probability_below(reached)[1] < 1
            gap = found.gaps(reached + 0.05)
            assert float(gap.order_1[0]) == pytest.approx(0.05, abs=1e-15)
            assert float(gap.order_2[0]) == pytest.approx(0.0025, abs=1e-15)
            assert found.standard_deviation()[0] == 0
            assert found.certain(reached)[0]
            assert found.log_growth().standard_deviation[0] == 0


@pytest.mark.parametrize(
    ("skewness", "excess", "path", "limits"),
    [
        (0.0, -0.5, ("excess_kurtosis",), (0, 8)),
        (2.0, 12.0, ("excess_kurtosis",), (6.53711, 11.2407)),
        (2.6, 10.0, ("skewness",), (-2.48528, 2.48528)),
    ],
)
def test_parameters_without_a_law_are_refused_with_those_that_have_one(
    skewness: float, excess: float, path: tuple[str, ...], limits: tuple[float, float]
) -> None:
    values = {"expected_return": 0.06, "volatility": 0.1, "skewness": skewness, "excess_kurtosis": excess}
    with pytest.raises(DoesNotFit) as raised:
        CornishFisher.make(CornishFisher.way(), values)
    (found,) = raised.value.refusals
    assert (found.path, found.code) == (path, "expansion_not_monotone")
    assert (found.params["at_least"], found.params["at_most"]) == pytest.approx(limits, rel=1e-5)


def test_moments_are_those_of_the_law_not_the_parameters() -> None:
    """Maillard (2012): for skewness -0.5 and excess kurtosis 2 the law has -0.7166 and a variance of 1.02898."""
    model = returns("cornish_fisher", expected_return=MEAN, volatility=SCALE, skewness=-0.5, excess_kurtosis=2).model
    moments = model.moments()
    assert float(moments.standard_deviation) == pytest.approx(SCALE * np.sqrt(1.02898341049382716), rel=1e-14)
    assert float(moments.skewness) == pytest.approx(-0.71661889394352864, rel=1e-13)


MATCHED = CornishFisher.way("matched")


@given(st.floats(-1, 1), st.floats(0, 1))
def test_matched_moments_are_the_moments_of_the_law(across: float, along: float) -> None:
    s = 2.48528 * across
    least, most = least_and_most_excess(number(s))
    k = least + (most - least) * along
    _, skewness, excess = shape_moments(Expansion.of(number(s), k))
    values = {"expected_return": 0.06, "volatility": 0.1, "skewness": float(skewness), "excess_kurtosis": float(excess)}
    moments = CornishFisher.make(MATCHED, values).moments()
    assert float(moments.mean) == 0.06
    assert float(moments.standard_deviation) == pytest.approx(0.1, rel=1e-12)
    assert float(moments.skewness) == pytest.approx(float(skewness), abs=2e-9)
    assert float(moments.excess_kurtosis) == pytest.approx(float(excess), abs=2e-9)


def refused(skewness: Any, excess: Any) -> Refusal:
    values = {"expected_return": number(0), "volatility": number(1), "skewness": skewness, "excess_kurtosis": excess}
    with pytest.raises(DoesNotFit) as raised:
        CornishFisher.make(MATCHED, values)
    (one,) = raised.value.refusals
    assert one.code == "expansion_not_monotone"
    return one


def test_moments_that_no_monotone_expansion_has_are_refused_with_those_that_one_has() -> None:
    flat = refused(number(1.0), number(0.2))
    assert flat.path == ("excess_kurtosis",)
    assert flat.params["at_least"] == pytest.approx(reachable_excess(1.0)[0])  # type: ignore[index]  # within reach
    assert "with a skewness of 1" in flat.detail
    far = refused(number(4.5), number(20.0))
    assert far.path == ("skewness",)
    assert far.params["at_most"] == pytest.approx(4.3633, abs=1e-4)
    in_array = refused(np.array([0.0, 0.0, 1.0]), np.array([1.0, 2.0, 0.2]))
    assert in_array.path == ("excess_kurtosis", 2)


def test_matching_takes_arrays() -> None:
    s, k = matching_parameters(np.array([0.0, -0.7]), np.array([0.0, 4.0]))
    _, skewness, excess = shape_moments(Expansion.of(s, k))
    np.testing.assert_allclose(skewness, [0, -0.7], atol=1e-11)
    np.testing.assert_allclose(excess, [0, 4], atol=1e-11)
    assert reachable_excess(5.0) is None


def test_the_option_says_which_way_to_read_the_parameters() -> None:
    option = CornishFisher.option
    assert option is not None
    assert option.name == "moments"
    assert list(option.ways) == ["parameters", "matched"]
    assert CornishFisher.way() is CornishFisher.way("parameters") is CornishFisher.parameterisations[0]
    assert MATCHED is not CornishFisher.way()
    assert returns("normal", expected_return=0, volatility=0.1).model.option is None
