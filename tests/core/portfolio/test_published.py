"""Published figures and formulas: each row of tests/data/portfolio/published.json names its source."""

import json
from collections.abc import Iterator
from fractions import Fraction
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from scipy.special import ndtri

from service.core.arrays import number
from service.core.portfolio.confidence import Estimates, pairwise_confidence, ratio_covariance, ratio_variance
from service.core.returns.laws.sample import SampleLaw
from tests.core.portfolio.build import figures, normal, ranking
from tests.core.portfolio.build import floor as floor_at

DATA = Path(__file__).parents[2] / "data" / "portfolio" / "published.json"
ROWS: list[dict[str, Any]] = json.loads(DATA.read_text())["rows"]


def rows(*beginnings: str) -> pytest.MarkDecorator:
    """The rows whose name begins so; there must be some."""
    chosen = [row for row in ROWS if row["id"].startswith(beginnings)]
    assert chosen
    return pytest.mark.parametrize("row", chosen, ids=[row["id"] for row in chosen])


def expected(row: dict[str, Any], value: str) -> Any:
    """The row's value with its tolerance."""
    (kind, size), *_ = row["tolerance"].items()
    return pytest.approx(float(value), **{"abs" if kind == "absolute" else "rel": size})


def test_no_row_comes_without_source_and_provenance() -> None:
    assert all(row["source"] and row["how_known"] for row in ROWS)


def each(row: dict[str, Any]) -> Iterator[tuple[Any, Any]]:
    """The returns of each portfolio, and what the row says about it."""
    for name, (mean, deviation) in row["inputs"]["portfolios"].items():
        yield normal(mean, deviation), row["expected"][name]


@rows("roy-ratio")
def test_safety_first_ratio(row: dict[str, Any]) -> None:
    for of, value in each(row):
        assert float(figures(of, row["inputs"]["level"]).safety_first_ratio) == expected(row, value)
    order = ranking([of for of, _ in each(row)], floor=floor_at(row["inputs"]["level"])).order
    assert order.tolist() == sorted(range(3), key=lambda i: -float(list(row["expected"].values())[i]))


@rows("roy-probability")
def test_probability_below_the_level(row: dict[str, Any]) -> None:
    for of, value in each(row):
        assert float(figures(of, row["inputs"]["level"]).shortfall_probability) == expected(row, value)


@rows("cantelli-bound")
def test_distribution_free_bound(row: dict[str, Any]) -> None:
    for of, value in each(row):
        assert float(figures(of, row["inputs"]["level"]).distribution_free_bound) == expected(row, value)


@rows("kataoka-quantile")
def test_level_missed_with_a_probability(row: dict[str, Any]) -> None:
    for of, value in each(row):
        found = figures(of, quantile_probability=row["inputs"]["probability"]).threshold_at_probability
        assert float(found.threshold) == expected(row, value)


@rows("telser-")
def test_greatest_mean_within_the_limit(row: dict[str, Any]) -> None:
    given, names = row["inputs"], list(row["inputs"]["portfolios"])
    found = ranking(
        [normal(*pair) for pair in given["portfolios"].values()],
        floor=floor_at(given["level"]),
        criterion="expected_return",
        limit=given["alpha"],
    )
    assert [name for name, fits in zip(names, found.admissible, strict=True) if fits] == row["expected"]["admissible"]
    assert names[found.order[0]] == row["expected"]["best"]
    for value, name in zip(found.shortfall.shortfall_probability, names, strict=True):
        assert float(value) == expected(row, row["expected"]["probabilities"][name])


@rows("rockafellar-uryasev")
def test_loss_quantile_and_expected_shortfall_of_a_published_portfolio(row: dict[str, Any]) -> None:
    of = normal(row["inputs"]["mean"], float(np.sqrt(float(row["inputs"]["variance"]))))
    (loss,) = figures(of, confidence_levels=[row["inputs"]["level"]]).tail_losses
    assert float(loss.value_at_risk) == expected(row, row["expected"]["loss_quantile"])
    assert float(loss.expected_shortfall) == expected(row, row["expected"]["expected_shortfall"])


@rows("es-normal")
def test_expected_shortfall_of_the_standard_normal_law(row: dict[str, Any]) -> None:
    (loss,) = figures(normal(0, 1), confidence_levels=[row["inputs"]["level"]]).tail_losses
    assert float(loss.expected_shortfall) == expected(row, row["expected"])


@rows("acerbi-tasche")
def test_expected_shortfall_of_a_law_with_atoms(row: dict[str, Any]) -> None:
    given = row["inputs"]
    counts = [int(20 * Fraction(share)) for share in given["probabilities"]]
    law = SampleLaw(np.repeat(np.array(given["values"], np.float64), counts))
    assert float(law.expected_shortfall(number(float(Fraction(given["level"]))))) == expected(row, row["expected"])


@rows("lpm-normal")
def test_lower_partial_moments(row: dict[str, Any]) -> None:
    given = row["inputs"]
    moments = figures(normal(given["mean"], given["standard_deviation"]), given["threshold"]).lower_partial_moments
    for order, value in enumerate(moments):
        assert float(value) == expected(row, row["expected"][f"lpm_{order}"])


@rows("lo-")
def test_standard_error_of_a_ratio(row: dict[str, Any]) -> None:
    ratio, count = number(row["inputs"]["sharpe"]), row["inputs"]["observations"]
    found = float(np.sqrt(ratio_covariance(ratio, ratio, number(1)) / count))
    assert found == expected(row, row["expected"])
    assert found == pytest.approx(float(row["expected_in_full"]), rel=1e-14)


@rows("mertens-")
def test_standard_error_of_a_ratio_of_skewed_returns(row: dict[str, Any]) -> None:
    given = row["inputs"]
    variance = ratio_variance(*(number(given[name]) for name in ("sharpe", "skewness", "kurtosis")))
    assert float(np.sqrt(variance / given["observations"])) == expected(row, row["expected"])


@rows("memmel-")
def test_difference_of_two_ratios(row: dict[str, Any]) -> None:
    given = row["inputs"]
    ratios = np.array([given[f"mean_{i}"] / given[f"sd_{i}"] for i in (1, 2)])
    correlations = np.array([[1, given["correlation"]], [given["correlation"], 1]])
    estimates = Estimates(ratios, ratios, ratio_covariance, number(given["observations"]), correlations)
    both = np.arange(2)
    variance = estimates.variances(both).sum() - 2 * estimates.covariances(0, both[1:])[0]
    assert float(variance) == expected(row, row["expected"]["variance"])
    (chance,) = pairwise_confidence(estimates, 0, both[1:])
    assert float(ndtri(chance)) == pytest.approx(float(row["expected"]["z"]), abs=1e-12)


def test_the_greater_ratio_has_the_smaller_chance_of_missing_the_floor_under_the_normal_law() -> None:
    """Common practice, no source: the portfolio with the higher (return - threshold)/risk is the safer."""
    random = np.random.default_rng(7)
    means, deviations = random.normal(0.05, 0.03, 50), random.uniform(0.01, 0.3, 50)
    found = ranking([normal(m, v) for m, v in zip(means, deviations, strict=True)], criterion="safety_first_ratio")
    probabilities = found.shortfall.shortfall_probability[found.order]
    assert (np.diff(probabilities) >= 0).all()
