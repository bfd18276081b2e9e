"""Shared assets, mixes of them, and the best mix as it is asked."""

from typing import Any

import numpy as np
import pytest
from scipy.special import stdtrit

from service.core.errors import DoesNotFit
from service.core.portfolio.assets import Assets
from service.core.portfolio.correlations import checked_correlations, nearest_correlations
from service.core.portfolio.mix import MixQuestion, best_mix, one_period, standard_deviations

NAMES = ("Bonds", "Shares", "Property")
CORRELATIONS = [[1, 0.1, 0.2], [0.1, 1, 0.6], [0.2, 0.6, 1]]


def assets(**given: Any) -> Assets:
    values: dict[str, Any] = {
        "names": NAMES,
        "expected_returns": [0.02, 0.07, 0.05],
        "volatilities": [0.05, 0.18, 0.12],
        "correlations": CORRELATIONS,
    } | given
    for name in ("expected_returns", "volatilities", "correlations"):
        values[name] = np.array(values[name], np.float64)
    return Assets(**values)


def codes(error: DoesNotFit) -> list[tuple[tuple[str | int, ...], str]]:
    return [(refusal.path, refusal.code) for refusal in error.refusals]


def test_the_moments_of_a_mix() -> None:
    pool = assets()
    weights = pool.aligned({"Shares": 0.6, "Bonds": 0.4})
    mixed = pool.mix(weights)
    assert mixed.model.name == "normal"
    values = vars(mixed.model)
    assert values["expected_return"] == pytest.approx(0.4 * 0.02 + 0.6 * 0.07)
    variance = (0.4 * 0.05) ** 2 + (0.6 * 0.18) ** 2 + 2 * 0.1 * 0.4 * 0.05 * 0.6 * 0.18
    assert values["volatility"] == pytest.approx(np.sqrt(variance))


def test_a_mix_keeps_the_law_and_the_period_of_its_assets() -> None:
    pool = assets(model="student_t", degrees_of_freedom=5.0, period="month", sample_size=np.float64(60))
    mixed = pool.mix(pool.aligned({"Bonds": 1.0}))
    assert (mixed.model.name, mixed.period, mixed.sample_size) == ("student_t", "month", 60)
    assert one_period(pool) == pytest.approx(1 / 12)
    assert one_period(assets(period="day", periods_per_year=250.0)) == 1 / 250


def test_a_mix_without_risk_is_a_point() -> None:
    pool = assets(volatilities=[0, 0.18, 0.12])
    assert vars(pool.mix(pool.aligned({"Bonds": 1.0})).model)["volatility"] == 0


def test_correlations_of_mixes_follow_from_the_assets() -> None:
    pool = assets(volatilities=[0, 0.18, 0.12])
    found = pool.correlation_of_mixes(np.array([[0, 1, 0], [0, 0, 1], [0, 0.5, 0.5], [1, 0, 0]], np.float64))
    assert found[0, 1] == pytest.approx(0.6)
    assert found[0, 2] == pytest.approx((0.18 + 0.6 * 0.12) / np.sqrt(0.18**2 + 0.12**2 + 2 * 0.6 * 0.18 * 0.12))
    assert found[3].tolist() == [0, 0, 0, 1]


@pytest.mark.parametrize(
    ("given", "expected"),
    [
        ({"expected_returns": [0.1]}, [(("expected_returns",), "lengths_differ")]),
        ({"volatilities": [0.1]}, [(("volatilities",), "lengths_differ")]),
        ({"volatilities": [0.1, -0.1, 0.1]}, [(("volatilities", 1), "must_not_be_negative")]),
        ({"names": ("A", "B", "A")}, [(("names", 2), "given_twice")]),
        ({"model": "student_t"}, [(("degrees_of_freedom",), "required")]),
        ({"degrees_of_freedom": 5.0}, [(("degrees_of_freedom",), "does_not_go_together")]),
        ({"correlations": [[1, 0], [0, 1]]}, [(("correlations",), "lengths_differ")]),
        ({"correlations": [[1, 0.1, 0], [0.2, 1, 0], [0, 0, 1]]}, [(("correlations",), "not_a_correlation_matrix")]),
        ({"correlations": np.diag([1, 1, 2])}, [(("correlations",), "not_a_correlation_matrix")]),
    ],
)
def test_assets_that_do_not_fit(given: Any, expected: Any) -> None:
    with pytest.raises(DoesNotFit) as raised:
        assets(**given)
    assert codes(raised.value) == expected


@pytest.mark.parametrize(
    ("weights", "expected"),
    [({"Bonds": 0.5, "Gold": 0.5}, [((1, "asset"), "unknown_asset")]), ({"Bonds": 0.9}, [((), "must_add_up_to_one")])],
)
def test_weights_that_do_not_fit(weights: dict[str, float], expected: Any) -> None:
    with pytest.raises(DoesNotFit) as raised:
        assets().aligned(weights)
    assert codes(raised.value) == expected


def test_a_mix_beyond_the_limits_of_its_model_is_refused() -> None:
    pool = assets(expected_returns=[-0.5, 0.9, 0.1], model="lognormal")
    with pytest.raises(DoesNotFit) as raised:
        pool.mix(pool.aligned({"Bonds": 2.0, "Shares": -1.0}))
    assert codes(raised.value) == [(("expected_return",), "must_be_above")]


class TestCorrelations:
    impossible = np.array([[1, 0.9, -0.9], [0.9, 1, 0.9], [-0.9, 0.9, 1]])

    def test_impossible_ones_are_refused_with_the_nearest_that_are_not(self) -> None:
        with pytest.raises(DoesNotFit) as raised:
            checked_correlations(self.impossible, 3, ("correlations",))
        params = raised.value.refusals[0].params
        assert params["smallest_eigenvalue"] == pytest.approx(np.linalg.eigvalsh(self.impossible)[0])
        nearest = np.array(params["nearest"])
        assert checked_correlations(nearest, 3, ("correlations",)) == pytest.approx(nearest)

    def test_the_nearest_is_that_of_higham(self) -> None:
        # Higham 2002, Computing the nearest correlation matrix, IMA J. Numer. Anal. 22, example of section 5 (from
        # memory): tridiagonal 2, -1 scaled to unit diagonal has the nearest matrix with -0.8084 and 0.1916, 0.1068
        matrix = np.array([[2, -1, 0, 0], [-1, 2, -1, 0], [0, -1, 2, -1], [0, 0, -1, 2]], np.float64)
        found = nearest_correlations(matrix)
        assert found[0] == pytest.approx([1, -0.8084, 0.1916, 0.1068], abs=1e-4)
        assert found[1, 2] == pytest.approx(-0.6562, abs=1e-4)

    def test_no_random_correlation_matrix_is_nearer(self) -> None:
        found = nearest_correlations(self.impossible)
        own = np.linalg.norm(found - self.impossible)
        draw = np.random.default_rng(0)
        for _ in range(2000):
            loads = draw.normal(size=(3, 3))
            loads /= np.linalg.norm(loads, axis=1, keepdims=True)
            mixed = 0.9 * found + 0.1 * loads @ loads.T
            assert np.linalg.norm(mixed - self.impossible) >= own - 1e-4

    def test_ending_early_still_gives_correlations(self, monkeypatch: pytest.MonkeyPatch) -> None:
        monkeypatch.setattr("service.core.portfolio.correlations.MOST_ROUNDS", 1)
        assert np.linalg.eigvalsh(nearest_correlations(self.impossible))[0] >= 0

    def test_rounding_is_mended(self) -> None:
        line = np.ones((2, 2))
        line[0, 1] = line[1, 0] = 1 + 5e-10
        found = checked_correlations(line, 2, ("correlations",))
        assert np.linalg.eigvalsh(found)[0] >= -1e-15

    def test_the_nearest_of_a_large_matrix_is_not_listed(self) -> None:
        large = np.full((60, 60), -0.5)
        np.fill_diagonal(large, 1)
        with pytest.raises(DoesNotFit) as raised:
            checked_correlations(large, 60, ("correlations",))
        assert set(raised.value.refusals[0].params) == {"smallest_eigenvalue"}


def question(objective: str = "safety_first_ratio", **given: Any) -> MixQuestion:
    return MixQuestion(objective, **({"threshold": 0.0} | given))


def test_the_best_mix_of_three_assets() -> None:
    found = best_mix(assets(), question())
    assert found.names == NAMES
    assert found.weights.sum() == pytest.approx(1)
    values = vars(found.returns.model)
    ratio = values["expected_return"] / values["volatility"]
    for other in np.eye(3):
        alone = vars(assets().mix(other).model)
        assert ratio >= alone["expected_return"] / alone["volatility"]


def test_a_heavier_tail_keeps_roy_and_moves_kataoka() -> None:
    normal, heavy = assets(), assets(model="student_t", degrees_of_freedom=3.0)
    ratio = [best_mix(pool, question()).weights for pool in (normal, heavy)]
    assert ratio[0] == pytest.approx(ratio[1])
    tails = {"quantile_probability": 0.01}
    quantile = [best_mix(pool, question("quantile_return", **tails)).weights for pool in (normal, heavy)]
    assert quantile[1][0] > quantile[0][0]
    assert standard_deviations(heavy, 0.01) == pytest.approx(-float(stdtrit(3, 0.01)) / np.sqrt(3))


def test_telser_keeps_the_limit_exactly() -> None:
    found = best_mix(assets(), question("expected_return", limit=0.3))
    values = vars(found.returns.model)
    assert values["expected_return"] / values["volatility"] == pytest.approx(0.5244005127080407, rel=1e-9)


def test_a_riskless_asset_may_be_mixed_in() -> None:
    # closed form 5/7, 2/7: the tangent mix of excess returns over the floor
    pool = Assets(("A", "B"), np.array([0.05, 0.08]), np.array([0.08, 0.2]), np.array([[1, 0.2], [0.2, 1]]))
    found = best_mix(pool, question(threshold=0.03, risk_free_rate=0.02))
    assert found.names == ("A", "B", "risk_free")
    assert found.weights == pytest.approx([5 / 7, 2 / 7, 0], abs=1e-10)
    cash = best_mix(pool, question("quantile_return", threshold=0.03, risk_free_rate=0.02))
    assert cash.weights[2] > 0.5


def test_limits_by_name() -> None:
    rows = [{"asset": "Shares", "most": 0.1}, {"asset": "Bonds", "least": 0.2}]
    found = best_mix(assets(), question(weight_limits=rows))
    assert found.weights[1] <= 0.1
    assert found.weights[0] >= 0.2


def test_the_floor_is_that_of_one_period() -> None:
    monthly = assets(expected_returns=[0.002, 0.006, 0.004], volatilities=[0.015, 0.05, 0.035], period="month")
    by_year = best_mix(monthly, question(threshold=1.001**12 - 1)).weights
    by_month = best_mix(monthly, question(threshold=0.001, basis="over_horizon")).weights
    assert by_year == pytest.approx(by_month, abs=1e-9)


@pytest.mark.parametrize(
    ("pool", "asked", "expected"),
    [
        ({"model": "lognormal"}, {}, (("assets", "model"), "model_not_available")),
        ({}, {"objective": "expected_return"}, (("limits",), "required")),
        (
            {},
            {"objective": "expected_return", "limit": 0.5},
            (("limits", "shortfall_probability"), "probability_not_below_half"),
        ),
        (
            {},
            {"objective": "quantile_return", "quantile_probability": 0.6},
            (("quantile_probability",), "probability_not_below_half"),
        ),
        ({}, {"threshold": 0.5}, (("threshold",), "no_mix_above_threshold")),
        ({}, {"risk_free_rate": 0.02}, (("threshold",), "threshold_without_risk")),
        ({"names": ("A", "B", "risk_free")}, {"risk_free_rate": -0.02}, (("assets", "names", 2), "given_twice")),
        ({}, {"weight_limits": [{"asset": "Gold"}]}, (("weight_limits", 0, "asset"), "unknown_asset")),
        (
            {},
            {"weight_limits": [{"asset": "Bonds"}, {"asset": "Bonds"}]},
            (("weight_limits", 1, "asset"), "given_twice"),
        ),
        (
            {},
            {"weight_limits": [{"asset": "Bonds", "least": 0.5, "most": 0.4}]},
            (("weight_limits", 0, "most"), "out_of_order"),
        ),
    ],
)
def test_questions_that_do_not_fit(pool: Any, asked: Any, expected: Any) -> None:
    with pytest.raises(DoesNotFit) as raised:
        best_mix(assets(**pool), question(**asked))
    assert codes(raised.value) == [expected]


def test_a_covariance_is_symmetric_and_of_the_volatilities() -> None:
    covariance = assets().covariance
    assert np.sqrt(np.diag(covariance)) == pytest.approx([0.05, 0.18, 0.12])
