"""Daily index returns as a package ships them (arch 8.0.0): figures against plain sorting and averaging."""

import numpy as np
import pytest

from service.core.arrays import Numbers
from tests.core.portfolio.build import figures, floor, ranking
from tests.core.returns.build import returns

data = pytest.importorskip("arch.data")
DAY = 1 / 252


def log_returns(name: str) -> Numbers:
    """Log returns of the adjusted closes, 1999 to 2018."""
    module = __import__(f"arch.data.{name}", fromlist=["load"])
    prices: Numbers = module.load()["Adj Close"].to_numpy(np.float64)
    return np.diff(np.log(prices))


@pytest.fixture(scope="module")
def observed() -> dict[str, Numbers]:
    return {name: log_returns(name) for name in ("sp500", "nasdaq")}


def test_the_series_are_those_that_were_measured(observed: dict[str, Numbers]) -> None:
    assert observed["sp500"].size == observed["nasdaq"].size == 5030
    assert observed["sp500"].mean() == pytest.approx(0.0001418605932, rel=1e-9)
    assert observed["nasdaq"].std(ddof=1) == pytest.approx(0.01593155958, rel=1e-9)


@pytest.mark.parametrize("name", ["sp500", "nasdaq"])
def test_a_day_by_plain_sorting(observed: dict[str, Numbers], name: str) -> None:
    of = returns("empirical", compounding="continuous", period="day", observations=observed[name].tolist())
    found = figures(of, 0.0, DAY, confidence_levels=[0.95, 0.99])
    simple = np.sort(np.expm1(observed[name]))
    missed = simple[simple < 0]
    assert float(found.shortfall_probability) == pytest.approx(missed.size / simple.size, rel=1e-15)
    assert float(found.expected_gap) == pytest.approx(-missed.sum() / simple.size, rel=1e-12)
    assert float(found.lower_partial_moments.order_2) == pytest.approx((missed**2).sum() / simple.size, rel=1e-12)
    assert float(found.mean_return_in_shortfall) == pytest.approx(missed.mean(), rel=1e-12)
    assert float(found.volatility) == pytest.approx(simple.std(), rel=1e-12)
    for loss in found.tail_losses:
        share = (1 - loss.confidence_level) * simple.size
        whole = int(share + 1e-9)
        worst = simple[:whole].sum() + (share - whole) * simple[whole]
        assert float(loss.value_at_risk) == -simple[whole]
        assert float(loss.expected_shortfall) == pytest.approx(-worst / share, rel=1e-12)


def test_two_indices_side_by_side(observed: dict[str, Numbers]) -> None:
    rows = [
        returns("empirical", compounding="continuous", period="day", observations=series.tolist())
        for series in observed.values()
    ]
    found = ranking(rows, ["wide", "technology"], floor=floor(-0.02, DAY, "over_horizon"))
    assert found.order.tolist() == [0, 1]
    assert found.ranks_by_criterion["expected_gap"].tolist() == [1, 2]
    assert found.summary == (
        "Of these 2, wide misses a floor of -2 % over the whole period least often: in about 4 of 100 such days."
    )
    # neither is better for every taste: the riskier one has the higher mean
    assert found.dominated == ()
