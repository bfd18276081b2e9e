"""What holds for every model over any number of periods."""

from typing import Any

import numpy as np
import pytest

from service.core.arrays import number
from service.core.returns import HorizonLaw
from tests.core.returns.build import law

CALM = {"weight": 0.9, "expected_return": 0.08, "volatility": 0.12}
STORM = {"weight": 0.1, "expected_return": -0.1, "volatility": 0.35}
FIXED = {"weight": 0.1, "expected_return": 0.03, "volatility": 0}
BENT: dict[str, Any] = {"expected_return": 0.07, "volatility": 0.2, "skewness": -0.5, "excess_kurtosis": 2}
HEAVY: dict[str, Any] = {"expected_return": 0.07, "volatility": 0.2, "degrees_of_freedom": 4}
SEEN = [-0.31, -0.12, -0.04, 0.01, 0.03, 0.05, 0.08, 0.11, 0.19, 0.24]
MANY_SEEN = [*np.random.default_rng(3).normal(0.01, 0.04, 40)]
MODELS: dict[str, dict[str, Any]] = {
    "normal": {"model": "normal", "expected_return": 0.07, "volatility": 0.2},
    "normal far below": {"model": "normal", "expected_return": -1.2, "volatility": 0.6},
    "student_t": {"model": "student_t", **HEAVY},
    "student_t near a loss": {"model": "student_t", **HEAVY, "expected_return": -0.99},
    "student_t continuous": {"model": "student_t", "compounding": "continuous", **HEAVY},
    "cornish_fisher": {"model": "cornish_fisher", **BENT},
    "cornish_fisher continuous": {"model": "cornish_fisher", "compounding": "continuous", **BENT},
    "normal_mixture": {"model": "normal_mixture", "components": [CALM, STORM]},
    "normal_mixture with a point": {"model": "normal_mixture", "components": [{**CALM, "weight": 0.9}, FIXED]},
    "normal_mixture continuous": {"model": "normal_mixture", "compounding": "continuous", "components": [CALM, STORM]},
    "lognormal_mixture": {"model": "lognormal_mixture", "components": [CALM, STORM]},
    "lognormal_mixture with a point": {"model": "lognormal_mixture", "components": [CALM, FIXED]},
    "up_down": {"model": "up_down", "up_return": 0.2, "down_return": -0.15, "up_probability": 0.55, "moves": 3},
    "empirical": {"model": "empirical", "observations": SEEN},
    "empirical with a loss of all": {"model": "empirical", "observations": [-1, *SEEN]},
    "empirical of many": {"model": "empirical", "observations": MANY_SEEN},
}
INFINITE_MEAN = ("student_t continuous", "cornish_fisher continuous")
LEVELS = np.array([0.01, 0.05, 0.3, 0.5, 0.9, 0.99])


@pytest.fixture(params=[(name, n) for name in MODELS for n in (1, 2, 5, 12)], ids=lambda p: f"{p[0]}-{p[1]}")
def named(request: pytest.FixtureRequest) -> tuple[str, int, HorizonLaw]:
    name, periods = request.param
    return name, periods, law(**MODELS[name], horizon_years=periods)


Named = tuple[str, int, HorizonLaw]


def test_probabilities_rise_and_quantiles_invert_them(named: Named) -> None:
    _, _, found = named
    quantiles = found.quantile(LEVELS)
    assert (np.diff(quantiles) >= 0).all()
    below, at_most = found.probability_below(quantiles), found.probability_at_most(quantiles)
    slack = 1e-11 + 20 * found.numerical_error
    assert (below <= LEVELS + slack).all()
    assert (at_most >= LEVELS - slack).all()
    upper = found.upper_quantile(LEVELS)
    assert (upper >= quantiles - 1e-9 * (1 + np.abs(quantiles))).all()
    assert (found.probability_below(upper) <= LEVELS + slack).all()


def test_gaps_are_integrals_of_the_probability(named: Named) -> None:
    _, _, found = named
    low, high = float(found.quantile(number(0.2))), float(found.quantile(number(0.8)))
    edges = np.linspace(low, high + 0.01, 400)
    middle = edges[:-1] + np.diff(edges) / 2
    first = (np.diff(edges) * found.probability_below(middle)).sum()
    gaps = found.gaps(np.array([edges[0], edges[-1]]))
    tolerance = 3e-4 if not found.discrete else 0.02
    assert float(np.diff(gaps.order_1)[0]) == pytest.approx(float(first), rel=tolerance, abs=1e-9)
    second = (np.diff(edges) * 2 * found.gaps(middle).order_1).sum()
    assert float(np.diff(gaps.order_2)[0]) == pytest.approx(float(second), rel=tolerance, abs=1e-9)


def test_expected_shortfall_is_the_mean_of_the_worst_outcomes(named: Named) -> None:
    name, _, found = named
    losses = found.expected_shortfall(np.array([0.05, 0.5]))
    if name in INFINITE_MEAN:
        assert np.isnan(losses).all()
        return
    count = 800
    for level, loss in zip((0.05, 0.5), losses, strict=True):
        levels = level * (np.arange(count) + 0.5) / count
        assert float(loss) == pytest.approx(float(-found.quantile(levels).mean()), rel=0.02, abs=0.004)


def test_the_mean_is_the_gap_above_less_the_gap_below(named: Named) -> None:
    name, _, found = named
    if name in INFINITE_MEAN:
        assert found.mean() == np.inf
        assert found.standard_deviation() == np.inf
        return
    far = number(float(found.mean()) + 300 * float(found.standard_deviation()) + 5)
    gaps = found.gaps(far)
    assert float(far - gaps.order_1) == pytest.approx(float(found.mean()), rel=1e-9, abs=1e-9 * float(far))
    variance = gaps.order_2 - gaps.order_1**2
    assert float(variance) == pytest.approx(float(found.standard_deviation()) ** 2, rel=3e-3, abs=1e-8 * float(far**2))


def test_nothing_is_lost_beyond_everything(named: Named) -> None:
    name, periods, found = named
    below = np.array([-3.0, -1.0])
    if periods > 1:
        assert found.probability_below(below).tolist() == [0, 0]
        assert found.certain(below).all()
        assert found.gaps(below).order_1.tolist() == [0, 0]
        lost = float(found.total_loss_probability())
        assert float(found.probability_at_most(number(-1))) == pytest.approx(lost, abs=1e-14)
        assert found.probability_at_most(number(-3)) == 0
    growth = found.log_growth()
    ruin = name.startswith(("normal", "student_t", "cornish")) and not name.endswith("continuous")
    assert np.isnan(growth.mean) == np.isnan(growth.standard_deviation) == (ruin or "loss of all" in name)
    assert ("growth_below_zero" in found.cautions) == (periods > 1 and bool(found.total_loss_probability() > 1e-12))


def test_arrays_of_any_shape_are_answered_entry_by_entry(named: Named) -> None:
    _, _, found = named
    thresholds = np.array([[-0.5, -0.1, 0.02], [0.3, 1.0, 4.0]])
    for figure in (found.probability_below, found.probability_at_most, lambda t: found.gaps(t).order_2):
        together = figure(thresholds)
        assert together.shape == thresholds.shape
        alone = [[float(figure(number(t))) for t in row] for row in thresholds]
        np.testing.assert_allclose(together, alone, atol=1e-14)
    quantiles = found.quantile(LEVELS[:, np.newaxis])
    assert quantiles.shape == (6, 1)
    np.testing.assert_allclose(quantiles[:, 0], [float(found.quantile(number(a))) for a in LEVELS], rtol=1e-9)


@pytest.mark.parametrize("name", [name for name in MODELS if name not in INFINITE_MEAN])
def test_mean_and_deviation_against_simulated_paths(name: str) -> None:
    """A rough look from outside: 20,000 paths of 5 periods by inverting the law of one."""
    random, periods, count = np.random.default_rng(11), 5, 20_000
    one = law(**MODELS[name])
    drawn = np.maximum(1 + one.quantile(random.random(periods * count)), 0).reshape(periods, count).prod(axis=0) - 1
    found = law(**MODELS[name], horizon_years=periods)
    assert float(found.mean()) == pytest.approx(drawn.mean(), abs=5 * drawn.std() / np.sqrt(count))
    for threshold in (-0.3, 0.021, 0.5):
        expected = float(found.probability_below(number(threshold)))
        assert (drawn < threshold).mean() == pytest.approx(expected, abs=5 * np.sqrt(0.25 / count))
