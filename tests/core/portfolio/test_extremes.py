"""The ends of every parameter: no warning, no figure that silently has no value."""

from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from service.core.portfolio import Shortfall
from tests.core.portfolio.build import figures, floor, normal, ranking
from tests.core.returns.build import returns

DEVIATIONS = [0, 1e-300, 1e-20, 1e-9, 1e-3, 0.2, 3, 1e6]
MEANS = [-1e6, -2, -1, -0.999999, 0, 1e-9, 0.06, 5, 1e6]
THRESHOLDS = [-1 + 1e-12, -0.9, 0, 0.02, 1e3, 1e12, 1e200, 1e308]
LEVELS = [0.95, 1 - 1e-12, 1e-9]
MODELS: list[dict[str, Any]] = [
    {"model": "normal"},
    {"model": "normal", "compounding": "continuous"},
    {"model": "lognormal"},
    *(
        {"model": "student_t", "compounding": compounding, "degrees_of_freedom": freedom}
        for compounding in ("simple", "continuous")
        for freedom in (2.0000001, 4, 1e15)
    ),
]


def expect_values(found: Shortfall) -> None:
    always = (
        found.shortfall_probability,
        found.expected_gap,
        found.lower_partial_moments.order_2,
        found.expected_return,
        found.volatility,
        found.total_loss_probability,
        *(loss.value_at_risk for loss in found.tail_losses),
    )
    for figure in always:
        assert not np.isnan(figure).any()
    assert (found.expected_gap >= 0).all()
    for loss in found.tail_losses:
        if np.isfinite(found.expected_return).all():
            assert not np.isnan(loss.expected_shortfall).any()
        slack = 1e-9 * np.abs(loss.value_at_risk)
        assert not (loss.expected_shortfall < loss.value_at_risk - slack).any()


@pytest.mark.parametrize("given_model", MODELS, ids=["-".join(map(str, model.values())) for model in MODELS])
@pytest.mark.parametrize("deviation", DEVIATIONS)
def test_extreme_parameters_and_floors(given_model: dict[str, Any], deviation: float) -> None:
    divides = given_model in MODELS[1:3]
    for mean in MEANS:
        if given_model["model"] == "lognormal" and mean <= -1:
            continue
        of = returns(**given_model, expected_return=mean, volatility=deviation)
        for years in (1, 1e-3, 100) if divides else (1,):
            expect_values(figures(of, THRESHOLDS, years, confidence_levels=LEVELS))


@settings(max_examples=150, deadline=None)
@given(
    st.lists(st.sampled_from([-1.0, -0.5, 0.0, 1e-300, 0.02, 1e6]), min_size=1, max_size=8),
    st.sampled_from(["simple", "continuous"]),
)
def test_extreme_observations(observations: list[float], compounding: str) -> None:
    scale = 300 / 1e6 if compounding == "continuous" else 1
    of = returns("empirical", observations=[x * scale if x > 1 else x for x in observations], compounding=compounding)
    expect_values(figures(of, THRESHOLDS, confidence_levels=LEVELS))


def test_extreme_portfolios_rank_beside_ordinary_ones() -> None:
    extreme = [normal(m, v) for m in MEANS for v in DEVIATIONS]
    heavy = [returns(**MODELS[-1], expected_return=m, volatility=v) for m in MEANS for v in DEVIATIONS]
    found = ranking([normal(0.06, 0.1), *extreme, *heavy], floor=floor(0.02))
    assert sorted(found.order.tolist()) == list(range(1 + len(extreme) + len(heavy)))
    assert found.summary


def test_a_lognormal_deviation_that_neither_factor_can_hold() -> None:
    """Over 100 years mean growth exp(-1382), relative deviation exp(1382): the factors leave the doubles."""
    of = returns("lognormal", expected_return=-0.999999, volatility=1)
    assert float(figures(of, horizon_years=100).volatility) == pytest.approx((1 + 1e-12) ** 50, rel=1e-11)
