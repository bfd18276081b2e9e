"""How sure the leader is: closed forms against simulation and mpmath, and when there is no figure."""

from typing import Any

import mpmath as mp
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.core.arrays import Numbers, Truths, number
from service.core.errors import DoesNotFit
from service.core.portfolio.confidence import (
    Estimates,
    bivariate_at_most,
    confidence_in_leader,
    mean_covariance,
    pairwise_confidence,
    quantile_covariance,
    ratio_covariance,
)
from service.core.portfolio.question import Confidence
from tests.core.portfolio.build import floor, normal, ranking
from tests.core.returns.build import returns

MEANS, DEVIATIONS, THRESHOLD = np.array([0.02, 0.015, 0.01]), np.array([0.05, 0.04, 0.03]), 0.002
CORRELATIONS = np.array([[1, 0.6, 0.2], [0.6, 1, -0.3], [0.2, -0.3, 1]])
RATIOS = (MEANS - THRESHOLD) / DEVIATIONS
SAMPLE_SIZE = number(60)


def rows(count: int = 3, **more: Any) -> list[Any]:
    given = {"sample_size": 60} | more
    return [normal(float(m), float(v), **given) for m, v in zip(MEANS[:count], DEVIATIONS[:count], strict=True)]


def estimates(correlations: Numbers | None) -> Estimates:
    return Estimates(RATIOS, RATIOS, ratio_covariance, SAMPLE_SIZE, correlations)


def drawn(correlations: Numbers, count: int) -> Numbers:
    """True ratios under a flat prior, around the estimates."""
    covariance = ratio_covariance(RATIOS[:, None], RATIOS[None, :], correlations) / 60
    return np.random.default_rng(11).multivariate_normal(RATIOS, covariance, count)


def within_noise(found: float, simulated: Truths) -> bool:
    return bool(abs(found - simulated.mean()) < 4 * 0.5 / np.sqrt(simulated.size))


@pytest.mark.parametrize("correlations", [np.eye(3), CORRELATIONS], ids=["independent", "correlated"])
def test_three_portfolios_by_integral_and_by_bivariate_law_against_draws(correlations: Numbers) -> None:
    truths = drawn(correlations, 400_000)
    joint = confidence_in_leader(estimates(correlations), 0, np.array([1, 2]))
    assert joint.at_least == joint.probability == joint.at_most
    assert within_noise(joint.probability, truths.argmax(axis=1) == 0)
    for chance, other in zip(pairwise_confidence(estimates(correlations), 0, np.array([1, 2])), (1, 2), strict=True):
        assert within_noise(float(chance), truths[:, 0] >= truths[:, other])


def test_the_integral_and_the_bivariate_law_agree_for_independent_estimates() -> None:
    nearly = np.eye(3)
    nearly[0, 1] = nearly[1, 0] = 1e-300
    by_integral = confidence_in_leader(estimates(np.eye(3)), 0, np.array([1, 2]))
    by_law = confidence_in_leader(estimates(nearly), 0, np.array([1, 2]))
    assert by_integral.probability == pytest.approx(by_law.probability, abs=1e-13)


def test_sampling_errors_of_ratios_and_quantiles_against_simulated_samples() -> None:
    """Covariances are those of large samples; at 240 periods they hold within three per cent or so."""
    periods, samples = 240, 4_000
    random = np.random.default_rng(2024)
    root = np.linalg.cholesky(np.outer(DEVIATIONS, DEVIATIONS) * CORRELATIONS)
    observed = MEANS + random.standard_normal((samples, periods, 3)) @ root.T
    mean, deviation = observed.mean(axis=1), observed.std(axis=1, ddof=1)
    score = number(-1.6448536269514722)
    spread = DEVIATIONS[:, None], DEVIATIONS[None, :]
    for estimated, formula in (
        ((mean - THRESHOLD) / deviation, ratio_covariance(RATIOS[:, None], RATIOS[None, :], CORRELATIONS)),
        (mean + score * deviation, quantile_covariance(score)(*spread, CORRELATIONS)),
        (mean, mean_covariance(*spread, CORRELATIONS)),
    ):
        simulated = periods * np.cov(estimated.T)
        scale = np.sqrt(np.outer(np.diag(formula), np.diag(formula)))
        assert np.abs(simulated - formula).max() < 0.08 * scale.max()
        assert (np.abs(simulated - formula) < 0.08 * scale).all()


@pytest.mark.parametrize("h", [-3.0, -0.5, 0.0, 0.7, 2.0])
@pytest.mark.parametrize("k", [-1.0, 0.0, 1.5])
@pytest.mark.parametrize("correlation", [-1.0, -0.9, -0.3, 0.0, 0.5, 0.99, 1.0])
def test_bivariate_normal_law_against_quadrature(h: float, k: float, correlation: float) -> None:
    mp.mp.dps = 20
    found = float(bivariate_at_most(number(h), number(k), number(correlation)))

    def phi(z: Any) -> Any:
        return mp.erfc(-z / mp.sqrt(2)) / 2

    if abs(correlation) == 1:
        expected = min(phi(h), phi(k)) if correlation > 0 else max(phi(h) + phi(k) - 1, 0)
    else:
        r = mp.mpf(correlation)

        def slice_at(x: Any) -> Any:
            return mp.exp(-x * x / 2) / mp.sqrt(2 * mp.pi) * phi((k - r * x) / mp.sqrt(1 - r * r))

        bend = k / correlation if correlation else 0.0
        expected = mp.quad(slice_at, sorted({place for place in (-12.0, -4.0, -1.0, bend, h) if place <= h}))
    assert found == pytest.approx(float(expected), abs=2e-15)


@given(st.lists(st.floats(-0.5, 0.5), min_size=2, max_size=6), st.floats(0, 0.8))
def test_joint_confidence_lies_within_the_bounds_of_the_pairs(ratios: list[float], correlation: float) -> None:
    values = np.sort(np.array(ratios))[::-1].copy()
    matrix = np.full((values.size, values.size), correlation)
    np.fill_diagonal(matrix, 1)
    others = np.arange(1, values.size)
    asked = Estimates(values, values, ratio_covariance, SAMPLE_SIZE, matrix)
    joint = confidence_in_leader(asked, 0, others)
    pairs = pairwise_confidence(asked, 0, others)
    assert 0 <= joint.at_least <= joint.at_most <= 1
    assert joint.at_most <= pairs.min() + 1e-12
    assert joint.at_least >= 1 - (1 - pairs).sum() - 1e-12


def test_copies_share_the_lead_for_certain() -> None:
    twins = np.ones((3, 3))
    equal = Estimates(np.array([0.3, 0.3, 0.2]), np.array([0.3, 0.3, 0.3]), mean_covariance, SAMPLE_SIZE, twins)
    assert pairwise_confidence(equal, 0, np.array([1, 2])).tolist() == [1, 1]
    assert confidence_in_leader(equal, 0, np.array([1, 2])).probability == 1
    assert pairwise_confidence(equal, 2, np.array([0])).tolist() == [0]


def test_one_or_two_portfolios() -> None:
    assert confidence_in_leader(estimates(None), 0, np.array([], np.int64)) == Confidence(1, 1, 1)
    (chance,) = pairwise_confidence(estimates(CORRELATIONS), 0, np.array([1]))
    assert confidence_in_leader(estimates(CORRELATIONS), 0, np.array([1])).probability == chance


def test_where_a_factor_is_too_sharp_only_the_bounds_are_known() -> None:
    spreads = np.array([0.1, 1e-9, 0.1])
    sharp = Estimates(np.array([0.06, 0.05, 0.04]), spreads, mean_covariance, SAMPLE_SIZE, None)
    joint = confidence_in_leader(sharp, 0, np.array([1, 2]))
    assert np.isnan(joint.probability)
    assert 0 < joint.at_least < joint.at_most < 1


def test_of_four_correlated_portfolios_only_the_bounds_are_known() -> None:
    matrix = np.full((4, 4), 0.5) + np.eye(4) / 2
    found = ranking([*rows(), normal(0.005, 0.02, sample_size=60)], floor=floor(THRESHOLD), correlations=matrix)
    assert found.confidence_in_leader is not None
    assert np.isnan(found.confidence_in_leader.probability)
    assert found.confidence_in_leader.at_least < found.confidence_in_leader.at_most


def test_a_ranking_tells_how_sure_its_leader_is() -> None:
    found = ranking(rows(), floor=floor(THRESHOLD), correlations=CORRELATIONS)
    leader, others = int(found.order[0]), found.order[1:]
    expected = confidence_in_leader(estimates(CORRELATIONS), leader, others)
    assert found.confidence_in_leader == pytest.approx(expected, rel=1e-12)
    assert found.pairwise_confidence is not None
    assert [one.index for one in found.pairwise_confidence] == others.tolist()
    assert found.confidence_reason is None
    assert [caution.code for caution in found.cautions] == ["first_is_not_safe", "leader_by_luck"]


def test_without_correlations_independence_is_assumed_and_said() -> None:
    codes = [caution.code for caution in ranking(rows()).cautions]
    assert codes == ["first_is_not_safe", "leader_by_luck", "independence_assumed"]
    assert "independence_assumed" not in [caution.code for caution in ranking(rows(1)).cautions]


def test_confidence_in_the_leader_by_a_quantile_or_the_mean() -> None:
    by_quantile = ranking(rows(), criterion="quantile_return").confidence_in_leader
    by_mean = ranking(rows(), criterion="expected_return").confidence_in_leader
    score = number(-1.6448536269514722)
    values = MEANS + score * DEVIATIONS
    leader = int(values.argmax())
    others = np.array([i for i in np.argsort(-values) if i != leader])
    asked = Estimates(values, DEVIATIONS, quantile_covariance(score), SAMPLE_SIZE, None)
    assert by_quantile == pytest.approx(confidence_in_leader(asked, leader, others), rel=1e-9)
    asked = Estimates(MEANS, DEVIATIONS, mean_covariance, SAMPLE_SIZE, None)
    assert by_mean == pytest.approx(confidence_in_leader(asked, 0, np.array([1, 2])), rel=1e-9)


def test_log_returns_compare_with_the_floor_as_a_log_return_per_period() -> None:
    monthly = [
        normal(float(m), float(v), compounding="continuous", period="month", sample_size=60)
        for m, v in zip(MEANS, DEVIATIONS, strict=True)
    ]
    found = ranking(monthly, floor=floor(0.02, 2), criterion="shortfall_probability").confidence_in_leader
    ratios = (MEANS - np.log1p(0.02) / 12) / DEVIATIONS
    leader = int(ratios.argmax())
    others = np.array([i for i in np.argsort(-ratios) if i != leader])
    asked = Estimates(ratios, ratios, ratio_covariance, SAMPLE_SIZE, None)
    assert found == pytest.approx(confidence_in_leader(asked, leader, others), rel=1e-9)


def test_an_inadmissible_portfolio_without_a_figure_does_not_matter() -> None:
    found = ranking([*rows(2), normal(0.0, 0.0, sample_size=60)], floor=floor(THRESHOLD), limit=0.9)
    assert found.admissible.tolist() == [True, True, False]
    assert found.confidence_in_leader is not None


def test_many_independent_portfolios() -> None:
    """Copies of one figure, each known alike: every one of them leads with the same chance."""
    count = 1_200
    alike = Estimates(np.zeros(count), np.full(count, 0.1), mean_covariance, SAMPLE_SIZE, None)
    joint = confidence_in_leader(alike, 0, np.arange(1, count))
    assert joint.probability == pytest.approx(1 / count, rel=1e-12)


def test_only_the_admissible_are_compared() -> None:
    found = ranking(rows(), criterion="expected_return", limit=0.36, floor=floor(THRESHOLD))
    assert found.admissible.tolist() == [True, False, False] or found.pairwise_confidence is not None
    assert found.pairwise_confidence is not None
    assert len(found.pairwise_confidence) == found.admissible.sum() - 1


@pytest.mark.parametrize(
    ("portfolios", "question", "reason"),
    [
        (rows(sample_size=None), {}, "needs_sample_size"),
        ([*rows(2), normal(0.01, 0.03)], {}, "needs_sample_size"),
        ([*rows(2), normal(0.01, 0.03, sample_size=61)], {}, "not_computed"),
        ([*rows(2), normal(0.01, 0.03, sample_size=60, compounding="continuous")], {}, "not_computed"),
        ([returns("lognormal", expected_return=0.05, volatility=0.1, sample_size=60)], {}, "not_computed"),
        (rows(), {"criterion": "expected_gap"}, "not_computed"),
        (rows(compounding="continuous"), {"criterion": "expected_return"}, "not_computed"),
        ([*rows(2), normal(0.05, 0, sample_size=60)], {}, "no_value"),
    ],
)
def test_where_there_is_no_confidence_the_reason_is_given(
    portfolios: list[Any], question: dict[str, Any], reason: str
) -> None:
    found = ranking(portfolios, **question)
    assert (found.confidence_in_leader, found.pairwise_confidence) == (None, None)
    assert found.confidence_reason == reason


@pytest.mark.parametrize(
    ("correlations", "code"),
    [
        (np.eye(2), "lengths_differ"),
        (np.array([[1, 0.5, 0], [0.4, 1, 0], [0, 0, 1]]), "not_a_correlation_matrix"),
        (np.diag([1.0, 1.1, 1.0]), "not_a_correlation_matrix"),
        (np.array([[1, 0.9, -0.9], [0.9, 1, 0.9], [-0.9, 0.9, 1]]), "not_a_correlation_matrix"),
    ],
)
def test_what_cannot_be_correlations_is_refused(correlations: Numbers, code: str) -> None:
    with pytest.raises(DoesNotFit) as raised:
        ranking(rows(), correlations=correlations)
    assert [(r.path, r.code) for r in raised.value.refusals] == [(("correlations",), code)]
