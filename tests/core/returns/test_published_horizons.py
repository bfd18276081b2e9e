"""Laws of many periods against values computed by other means; each row of the file says how it is known."""

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from service.core.arrays import Numbers, number
from service.core.returns import HorizonLaw
from tests.core.returns.build import law

CASES = json.loads((Path(__file__).parents[2] / "data/returns/compounding_cases.json").read_text())
QUESTION = ("periods", "horizon_years", "period", "tail", "threshold_over_horizon", "threshold_per_year")


def allowed(case: dict[str, Any], figure: str, expected: float) -> float:
    """The tolerance of the row."""
    words = case["tolerance"]
    size = float(words.split()[0])
    if "relative" in words and "quantile" not in words:
        return size * abs(expected) + 1e-16
    return 1e-9 * abs(expected) if figure.startswith("quantile") and "quantile" in words else size


def figure(found: HorizonLaw, name: str, threshold: float, tail: float) -> float:
    """A figure of the law by the name it has in the file."""
    at, a = number(threshold), number(tail)
    figures: dict[str, Any] = {
        "shortfall_probability": lambda: found.probability_below(at),
        "order_0": lambda: found.probability_below(at),
        "order_1": lambda: found.gaps(at).order_1,
        "expected_gap": lambda: found.gaps(at).order_1,
        "order_2": lambda: found.gaps(at).order_2,
        "expected_return": found.mean,
        "volatility": found.standard_deviation,
        "total_loss_probability": found.total_loss_probability,
        "quantile_005": lambda: found.quantile(number(0.05)),
        "threshold_at_probability_005": lambda: found.upper_quantile(number(0.05)),
        "upper_quantile": lambda: found.upper_quantile(a),
        "expected_shortfall": lambda: found.expected_shortfall(a),
        "expected_shortfall_095": lambda: found.expected_shortfall(number(0.05)),
        "safety_first_ratio": lambda: (found.mean() - at) / found.standard_deviation(),
        "log_safety_first_ratio": lambda: (
            (found.log_growth().mean - np.log1p(threshold)) / found.log_growth().standard_deviation
        ),
        "atoms": lambda: number_of_values(found),
    }
    return float(figures[name]())


def number_of_values(found: HorizonLaw) -> Numbers:
    """How many values the law lists."""
    atoms = found.atoms()
    assert atoms is not None
    return number(atoms.values.size)


@pytest.mark.parametrize("case", CASES, ids=[case["id"] for case in CASES])
def test_every_figure_of_a_published_case(case: dict[str, Any]) -> None:
    given = case["inputs"]
    years = given.get("horizon_years", given.get("periods"))
    threshold = given.get("threshold_over_horizon")
    if threshold is None:
        threshold = (1 + given["threshold_per_year"]) ** years - 1
    model = {name: value for name, value in given.items() if name not in QUESTION}
    found = law(**model, horizon_years=years)
    for name, text in case["expected"].items():
        if text is None:
            assert not abs(float(found.mean())) < float("inf")
            continue
        value = figure(found, name, threshold, given.get("tail", 0.05))
        expected = float(text)
        assert value == pytest.approx(expected, abs=allowed(case, name, expected), rel=0), name
