"""One ranking of three portfolios, every figure of it, from rows and from columns."""

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from service.core.portfolio import Ranking
from tests.core.portfolio.build import floor, normal, ranking
from tests.core.returns.build import returns

DATA = json.loads((Path(__file__).parents[2] / "data" / "portfolio" / "ranking_in_full.json").read_text())
QUESTION, ANSWER = DATA["question"], DATA["answer"]
GIVEN = [(entry["returns"]["expected_return"], entry["returns"]["volatility"]) for entry in QUESTION["portfolios"]]
NAMES = [entry["name"] for entry in QUESTION["portfolios"]]
ASKED: dict[str, Any] = {
    "floor": floor(QUESTION["threshold"]),
    "criterion": QUESTION["criterion"],
    "confidence_levels": QUESTION["confidence_levels"],
}
PLAIN = (
    "shortfall_probability",
    "safety_first_ratio",
    "log_safety_first_ratio",
    "distribution_free_bound",
    "expected_return",
    "volatility",
    "expected_gap",
    "mean_return_in_shortfall",
    "mean_gap_in_shortfall",
    "total_loss_probability",
)
NESTED = ("lower_partial_moments", "actual_moments")


def from_rows() -> Ranking:
    return ranking([normal(*pair) for pair in GIVEN], NAMES, **ASKED)


def from_columns() -> Ranking:
    means, deviations = (list(column) for column in zip(*GIVEN, strict=True))
    return ranking(returns("normal", expected_return=means, volatility=deviations), NAMES, **ASKED)


def near(value: float | None) -> Any:
    """Ten digits; null stands for a figure without a value."""
    return pytest.approx(np.nan if value is None else value, rel=1e-10, abs=1e-300, nan_ok=True)


@pytest.mark.parametrize("found", [from_rows(), from_columns()], ids=["rows", "columns"])
def test_every_figure(found: Ranking) -> None:
    for place, (index, row) in enumerate(zip(found.order, ANSWER["ranking"], strict=True)):
        assert (index, found.ranks[index], found.admissible[index]) == (row["index"], place + 1, True)
        for name in PLAIN:
            assert float(getattr(found.shortfall, name)[index]) == near(row[name]), name
        for name in NESTED:
            values = getattr(found.shortfall, name)._asdict()
            assert {n: float(v[index]) for n, v in values.items()} == {n: near(v) for n, v in row[name].items()}
        at = found.shortfall.threshold_at_probability
        assert at.probability == row["threshold_at_probability"]["probability"]
        assert float(at.threshold[index]) == near(row["threshold_at_probability"]["threshold"])
        assert float(at.threshold_per_year[index]) == near(row["threshold_at_probability"]["threshold_per_year"])
        for loss, printed in zip(found.shortfall.tail_losses, row["tail_losses"], strict=True):
            assert loss.confidence_level == printed["confidence_level"]
            assert float(loss.value_at_risk[index]) == near(printed["value_at_risk"])
            assert float(loss.expected_shortfall[index]) == near(printed["expected_shortfall"])
        often = row["frequencies"]["shortfall_probability"]
        frequencies = found.shortfall.frequencies
        assert (frequencies.count[index], frequencies.out_of[index], frequencies.bound[index]) == tuple(often.values())


@pytest.mark.parametrize("found", [from_rows(), from_columns()], ids=["rows", "columns"])
def test_the_comparison(found: Ranking) -> None:
    assert {name: ranks.tolist() for name, ranks in found.ranks_by_criterion.items()} == ANSWER["ranks_by_criterion"]
    assert found.agreement is not None
    for pair, printed in zip(found.agreement, ANSWER["agreement"], strict=True):
        assert list(pair.criteria) == printed["criteria"]
        assert pair.kendall_tau_b == near(printed["kendall_tau_b"])
    assert found.dominated == ()
    assert found.confidence_in_leader is None
    assert found.pairwise_confidence is None
    assert found.confidence_reason == "needs_sample_size"
    assert found.summary == ANSWER["summary"]
    assert found.shortfall.method == "closed_form"
    assert found.shortfall.numerical_error == 1e-15
    assert found.shortfall.numerical_error_kind == "bound"
