"""The best mix: against closed forms, a general optimiser, and the conditions of optimality."""

from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import minimize

from service.core.arrays import Numbers
from service.core.errors import DoesNotFit
from service.core.portfolio.allocation import OBJECTIVES, Allocation, allocate
from service.core.portfolio.allocation import search as search_module
from service.core.portfolio.allocation.frontier import Frontier, Piece, filled
from service.core.portfolio.allocation.objectives import BestQuantile, Line, real_roots
from service.core.portfolio.allocation.search import Search

FLOORS = {"safety_first_ratio": 0.01, "quantile_return": 0.01, "expected_return": -0.2}
Z = 1.6448536269514722
minimise: Any = minimize


def best(objective: str, means: Any, covariance: Any, floor: float, **limits: Any) -> Allocation:
    count = len(means)
    least = np.array(limits.get("least", [0.0] * count), np.float64)
    most = np.array(limits.get("most", [1.0] * count), np.float64)
    return allocate(objective, np.array(means, np.float64), np.array(covariance, np.float64), floor, Z, least, most)


def covariance_of(volatilities: Any, correlations: Any) -> Numbers:
    spread = np.array(volatilities, np.float64)
    return np.asarray(spread[:, None] * np.array(correlations, np.float64) * spread, np.float64)


def problem(count: int, seed: int) -> tuple[Numbers, Numbers]:
    draw = np.random.default_rng(seed)
    factors = draw.normal(size=(count, max(count // 3, 2))) * 0.1
    covariance = factors @ factors.T / count + np.diag(draw.uniform(0.01, 0.04, count))
    return draw.normal(0.05, 0.03, count), covariance


def value(objective: str, mix: Numbers, means: Numbers, covariance: Numbers, floor: float) -> float:
    mean, deviation = float(means @ mix), float(np.sqrt(mix @ covariance @ mix))
    ratio = {"safety_first_ratio": (mean - floor) / deviation, "quantile_return": mean - Z * deviation}
    return ratio.get(objective, mean)


def test_uncorrelated_assets_share_by_reward_over_variance() -> None:
    # closed form: 0.03/0.01 : 0.06/0.04 = 2 : 1, and nothing of the asset below the floor
    found = best("safety_first_ratio", [0.05, 0.08, 0.01], np.diag([0.01, 0.04, 0.0225]), 0.02)
    assert found.weights == pytest.approx([2 / 3, 1 / 3, 0], abs=1e-10)


def test_perfectly_correlated_copies_share_the_weight_of_one() -> None:
    # closed form of the problem of two assets, 1/3 : 2/3
    correlations = [[1, 1, 1, 0.3], [1, 1, 1, 0.3], [1, 1, 1, 0.3], [0.3, 0.3, 0.3, 1]]
    covariance = covariance_of([0.2, 0.2, 0.2, 0.1], correlations)
    found = best("safety_first_ratio", [0.08, 0.08, 0.08, 0.05], covariance, 0.02)
    assert found.weights == pytest.approx([1 / 9, 1 / 9, 1 / 9, 2 / 3], abs=1e-6)


def test_equal_ratios_give_the_limit_of_a_vanishing_ridge() -> None:
    # 0.04/0.1 = 0.08/0.2: every mix is best; the ridge minimises the sum of squares over the squared reward
    found = best("safety_first_ratio", [0.06, 0.1], covariance_of([0.1, 0.2], [[1, 1], [1, 1]]), 0.02)
    assert found.weights == pytest.approx([1 / 3, 2 / 3], abs=1e-5)
    assert (found.mean - 0.02) / found.standard_deviation == pytest.approx(0.4, abs=1e-9)


@pytest.mark.parametrize("objective", OBJECTIVES)
@pytest.mark.parametrize("seed", range(12))
def test_no_general_optimiser_finds_a_better_mix(objective: str, seed: int) -> None:
    # scipy.optimize.minimize, method SLSQP, from the found mix and from equal weights
    means, covariance = problem(5, seed)
    floor = FLOORS[objective]
    found = best(objective, means, covariance, floor)
    constraints: list[dict[str, Any]] = [{"type": "eq", "fun": lambda w: w.sum() - 1}]
    if objective == "expected_return":
        constraints.append({"type": "ineq", "fun": lambda w: means @ w - Z * np.sqrt(w @ covariance @ w) - floor})
    ours = value(objective, found.weights, means, covariance, floor)
    for start in (found.weights, np.full(5, 0.2)):
        other = minimise(
            lambda w: -value(objective, w, means, covariance, floor),
            start,
            method="SLSQP",
            bounds=[(0, 1)] * 5,
            constraints=constraints,
            options={"ftol": 1e-15, "maxiter": 500},
        )
        kept = np.clip(other.x, 0, 1) / np.clip(other.x, 0, 1).sum()
        admissible = objective != "expected_return" or constraints[1]["fun"](kept) >= 0
        assert not admissible or value(objective, kept, means, covariance, floor) <= ours + 1e-9


@pytest.mark.parametrize("objective", OBJECTIVES)
@pytest.mark.parametrize("count", [1, 2, 10, 60])
def test_the_conditions_of_optimality_hold(objective: str, count: int) -> None:
    means, covariance = problem(count, 3)
    means = means + 0.05
    found = best(objective, means, covariance, FLOORS[objective] - 0.9)
    assert found.kkt_violation < 1e-13
    assert found.weights.sum() == pytest.approx(1, abs=1e-12)
    assert (found.weights >= 0).all()
    assert found.mean == pytest.approx(means @ found.weights)


@pytest.mark.parametrize("objective", OBJECTIVES)
def test_limits_of_weights_are_kept(objective: str) -> None:
    means, covariance = problem(6, 1)
    limits = {"least": [0.1, 0, 0, 0.05, 0, 0], "most": [0.2, 0.3, 0.3, 0.3, 0.0, 0.3]}
    found = best(objective, means, covariance, FLOORS[objective], **limits)
    assert (found.weights >= np.array(limits["least"])).all()
    assert (found.weights <= np.array(limits["most"])).all()
    assert found.kkt_violation < 1e-13


def test_the_last_digit_of_an_input_does_not_swap_the_mix() -> None:
    for seed in range(10):
        means, covariance = problem(8, seed)
        nudged = means * (1 + 4e-16)
        for objective in OBJECTIVES:
            first, second = (best(objective, m, covariance, FLOORS[objective]).weights for m in (means, nudged))
            assert first == pytest.approx(second, abs=1e-10)


def test_two_hundred_assets() -> None:
    means, covariance = problem(200, 0)
    assert best("safety_first_ratio", means, covariance, 0.01).kkt_violation < 1e-12


def test_a_covariance_of_low_rank() -> None:
    draw = np.random.default_rng(5)
    loads = draw.normal(size=(40, 3)) * 0.1
    found = best("safety_first_ratio", draw.normal(0.05, 0.02, 40), loads @ loads.T, 0.08)
    assert found.kkt_violation < 1e-6


@pytest.mark.parametrize("objective", OBJECTIVES)
def test_equal_assets_share_equally(objective: str) -> None:
    found = best(objective, [0.05] * 4, np.eye(4) * 0.01, FLOORS[objective])
    assert found.weights == pytest.approx([0.25] * 4, abs=1e-9)


def test_equal_means_take_the_least_variance() -> None:
    found = best("expected_return", [0.05, 0.05], np.diag([0.01, 0.04]), -0.2)
    assert found.mean == pytest.approx(0.05)
    assert found.kkt_violation < 1e-12


def test_a_slack_limit_takes_the_greatest_mean() -> None:
    found = best("expected_return", [0.05, 0.08, 0.06], np.diag([0.01, 0.02, 0.03]), -5.0)
    assert found.weights == pytest.approx([0, 1, 0], abs=1e-9)
    assert found.kkt_violation < 1e-12


def test_fixed_weights_leave_nothing_to_choose() -> None:
    fixed = [0.3, 0.7]
    for objective in OBJECTIVES:
        found = best(objective, [0.05, 0.08], np.diag([0.01, 0.02]), FLOORS[objective], least=fixed, most=fixed)
        assert found.weights == pytest.approx(fixed)


def test_a_riskless_asset_leaves_the_tangent_mix_to_roy() -> None:
    # closed form 5/7, 2/7: w ~ covariance^-1 (m - floor), with the riskless asset below the floor
    covariance = np.zeros((3, 3))
    covariance[:2, :2] = covariance_of([0.08, 0.2], [[1, 0.2], [0.2, 1]])
    found = best("safety_first_ratio", [0.05, 0.08, 0.02], covariance, 0.03)
    assert found.weights == pytest.approx([5 / 7, 2 / 7, 0], abs=1e-10)


def test_the_best_quantile_may_be_riskless() -> None:
    covariance = np.diag([0.04, 0.09, 0.0])
    found = best("quantile_return", [0.03, 0.04, 0.02], covariance, 0.0)
    assert found.weights == pytest.approx([0, 0, 1], abs=1e-4)
    assert found.standard_deviation < 1e-4
    assert found.kkt_violation < 1e-6


def test_a_reward_beyond_the_quantile_leaves_the_kink() -> None:
    covariance = np.diag([0.0004, 0.0])
    found = best("quantile_return", [0.2, 0.02], covariance, 0.0)
    assert found.weights[0] > 0.99


@pytest.mark.parametrize(
    ("objective", "means", "covariance", "floor", "limits", "code"),
    [
        ("safety_first_ratio", [0.01, 0.02], np.diag([0.01, 0.02]), 0.02, {}, "no_mix_above_threshold"),
        ("safety_first_ratio", [0.05, 0.03], np.diag([0.01, 0.0]), 0.02, {}, "threshold_without_risk"),
        ("safety_first_ratio", [0.05, 0.03], np.zeros((2, 2)), 0.02, {}, "threshold_without_risk"),
        ("expected_return", [0.05, 0.03], np.diag([0.04, 0.03]), 0.02, {}, "no_admissible_mix"),
        ("quantile_return", [0.05, 0.03], np.diag([0.04, 0.03]), 0, {"most": [0.3, 0.3]}, "weight_limits_infeasible"),
        ("quantile_return", [0.05, 0.03], np.diag([0.04, 0.03]), 0, {"least": [0.6, 0.6]}, "weight_limits_infeasible"),
        (
            "quantile_return",
            [0.05, 0.03],
            np.diag([0.04, 0.03]),
            0,
            {"least": [0.6, 0], "most": [0.5, 1]},
            "weight_limits_infeasible",
        ),
    ],
)
def test_what_has_no_answer_is_refused_with_the_reason(
    objective: str, means: Any, covariance: Any, floor: float, limits: dict[str, Any], code: str
) -> None:
    with pytest.raises(DoesNotFit) as raised:
        best(objective, means, covariance, floor, **limits)
    assert [refusal.code for refusal in raised.value.refusals] == [code]


@settings(max_examples=60, deadline=None)
@given(
    st.integers(2, 7),
    st.integers(0, 10**6),
    st.sampled_from(sorted(OBJECTIVES)),
    st.sampled_from([0.0, 0.05, 0.2]),
    st.sampled_from([1.0, 0.6, 0.35]),
    st.booleans(),
)
def test_any_problem_ends_at_its_optimum(
    count: int, seed: int, objective: str, least: float, most: float, coarse: bool
) -> None:
    means, covariance = problem(count, seed)
    if coarse:  # ties in means and variances, copies
        means, covariance = np.round(means, 2), np.round(covariance, 2) + 0.01 * np.eye(count)
    limits = {"least": [min(least, 0.9 / count)] * count, "most": [max(most, 1.1 / count)] * count}
    found = best(objective, means, covariance, FLOORS[objective] - 0.5, **limits)
    assert found.kkt_violation < 1e-10


def test_the_frontier_says_when_it_does_not_settle(monkeypatch: pytest.MonkeyPatch) -> None:
    means, covariance = problem(4, 0)
    monkeypatch.setattr("service.core.portfolio.allocation.frontier.MOST_TURNS", 1)
    monkeypatch.setattr("service.core.portfolio.allocation.frontier.TURNS_FOR_EACH", 0)
    with pytest.raises(RuntimeError, match="settle"):
        best("safety_first_ratio", means, covariance, 0.01)


def test_the_search_says_when_it_finds_no_bracket(monkeypatch: pytest.MonkeyPatch) -> None:
    means, covariance = problem(12, 0)
    monkeypatch.setattr(search_module, "MOST_PIECES", 1)
    with pytest.raises(RuntimeError, match="bracketed"):
        best("safety_first_ratio", means, covariance, 0.01)


def test_roots_do_not_cancel() -> None:
    assert sorted(real_roots(1, -1e8, 1)) == pytest.approx([1e-8, 1e8], rel=1e-15)
    assert real_roots(1, 0, 1) == []
    assert real_roots(0, 0, 0) == []
    assert real_roots(0, 2, -4) == [2]
    # a double root that rounding has pushed below 0 is one all the same
    assert real_roots(1, 2, 1 + 1e-13) == pytest.approx([-1, -1], abs=1e-6)


def test_a_mix_is_filled_by_order() -> None:
    least, most = np.array([0.1, 0, 0]), np.array([0.5, 0.6, 1])
    assert filled(least, most, np.array([2.0, 1.0, 3.0])).tolist() == pytest.approx([0.4, 0.6, 0])


def test_a_search_halves_where_rounding_leaves_no_root(monkeypatch: pytest.MonkeyPatch) -> None:
    means, covariance = problem(5, 2)
    frontier = Frontier(means, covariance, np.zeros(5), np.ones(5))
    objective = OBJECTIVES["quantile_return"](0.0, Z)
    exact, _ = Search(frontier, objective).optimum(0.0, 0.05)
    monkeypatch.setattr(OBJECTIVES["quantile_return"], "roots", lambda *_: [])
    halved, _ = Search(Frontier(means, covariance, np.zeros(5), np.ones(5)), objective).optimum(0.0, 0.05)
    assert halved == pytest.approx(exact, rel=1e-12)


def test_little_risk_is_no_kink() -> None:
    found = best("quantile_return", [0.05, 0.0], np.diag([1e-8, 0.04]), 0.0)
    assert found.weights == pytest.approx([1, 0], abs=1e-5)
    assert found.kkt_violation < 1e-12


def test_patience_with_ties_ends_at_the_same_mix(monkeypatch: pytest.MonkeyPatch) -> None:
    means, covariance = problem(4, 0)
    expected = best("safety_first_ratio", means, covariance, 0.01).weights
    monkeypatch.setattr("service.core.portfolio.allocation.frontier.PATIENCE", 2 - 6 * 4)
    assert best("safety_first_ratio", means, covariance, 0.01).weights == pytest.approx(expected, abs=1e-8)


def test_limits_that_add_up_to_one_but_for_rounding_are_filled() -> None:
    assert filled(np.zeros(2), np.array([0.5, 0.5 - 4e-13]), np.arange(2.0)).sum() == pytest.approx(1)


class TwoPieces:
    """A frontier of two pieces with a gap of rounding between them, over which the criterion jumps."""

    means = np.array([1.0])
    risk = np.array([[1.0]])
    weights = np.array([1.0])

    def solve(self, lam: float) -> Piece:
        first = lam <= 1
        return Piece(
            0.0 if first else 1 + 4e-15, 1.0 if first else np.inf, np.array([0.0]), np.array([1.0 if first else 2.0])
        )


def test_a_jump_between_pieces_is_the_optimum() -> None:
    # standard deviation lam, then 2 lam: lam z - s is negative on the first piece and positive on the second
    class Jump(BestQuantile):
        def criterion(self, lam: float, line: Line) -> float:  # noqa: ARG002 - the objective's own signature
            return 1.0 if lam > 1 else -1.0

    lam, _ = Search(TwoPieces(), Jump(0.0, Z)).optimum(0.0, 0.5)  # type: ignore[arg-type]
    assert lam == pytest.approx(1)


def test_a_polish_that_leaves_the_limits_is_left_out(monkeypatch: pytest.MonkeyPatch) -> None:
    means, covariance = problem(2, 0)
    plain = best("quantile_return", means, covariance, 0.0)
    monkeypatch.setattr(Frontier, "recentred", lambda _: Piece(0.0, np.inf, np.array([2.0, -1.0]), np.zeros(2)))
    assert best("quantile_return", means, covariance, 0.0).weights == pytest.approx(plain.weights, abs=1e-6)
