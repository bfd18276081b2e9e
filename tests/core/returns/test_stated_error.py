"""The stated error against a grid much wider and higher, for parameters at random over up to 2,000 periods."""

from typing import Any

import numpy as np
import pytest

from service.core.arrays import number
from service.core.errors import DoesNotFit
from service.core.returns.compounding import fourier_law
from service.core.returns.compounding.fourier_law import FourierLaw
from service.core.returns.compounding.grid import Band, Grid, band_of
from service.core.returns.compounding.step import Step
from service.core.returns.compounding.window import Window, window_of
from service.core.returns.matched_moments import least_and_most_excess
from tests.core.returns.build import law


def random_case(seed: int) -> dict[str, Any]:
    """Volatilities from 0.02 % to 200 %, shapes up to the edge of what is possible."""
    random = np.random.default_rng(seed)
    kind = ("normal", "student_t", "cornish_fisher", "normal_mixture", "lognormal_mixture")[seed % 5]
    deviation = float(10 ** random.uniform(-3.7, 0.3))
    mean = float(random.uniform(-0.5, 1) * min(2 * deviation, 1))
    given: dict[str, Any] = {"model": kind, "horizon_years": int(random.choice([2, 3, 5, 12, 40, 120, 480, 2000]))}
    if kind.endswith("mixture"):
        count = 4 if kind == "lognormal_mixture" else int(random.integers(2, 4))
        given["horizon_years"] = 40 if kind == "lognormal_mixture" else given["horizon_years"]
        given["components"] = [
            {
                "weight": weight,
                "expected_return": float(random.uniform(-0.5, 0.5) * min(1, 3 * deviation)),
                "volatility": float(deviation * 10 ** random.uniform(-1.2, 0.3)) if i else 0.5 * deviation,
            }
            for i, weight in enumerate(random.dirichlet(np.ones(count)))
        ]
        return given
    given |= {"expected_return": mean, "volatility": deviation}
    if kind == "student_t":
        given["degrees_of_freedom"] = float(2 + 10 ** random.uniform(-1, 3))
    if kind == "cornish_fisher":
        skewness = float(random.uniform(-2.4, 2.4))
        least, most = least_and_most_excess(number(skewness))
        share = random.choice([random.uniform(0.02, 0.98), 0.001])
        given |= {"skewness": skewness, "excess_kurtosis": float(least + (most - least) * share)}
        given["compounding"] = str(random.choice(["simple", "continuous"]))
    return given


@pytest.mark.parametrize("seed", range(60))
def test_the_stated_error_is_never_below_the_true_one(seed: int, monkeypatch: pytest.MonkeyPatch) -> None:
    seen: list[tuple[Step, int]] = []

    def noted(step: Step, periods: int) -> Window:
        seen.append((step, periods))
        return window_of(step, periods)

    monkeypatch.setattr(fourier_law, "window_of", noted)
    try:
        found = law(**random_case(seed))
    except DoesNotFit:
        return  # a law that would be too far off is refused, which has a test of its own
    if not isinstance(found, FourierLaw):
        return
    step, periods = seen[0]
    window = window_of(step, periods)
    band = band_of(step, periods, window)
    spread = window.deviation * np.sqrt(periods)
    wide = Window(
        window.centre,
        window.deviation,
        1.7 * window.low - 0.3 * spread,
        1.7 * window.high + 0.3 * spread,
        window.exponent,
    )
    high = Band(1.6 * band.highest, tuple(1.6 * reach for reach in band.reaches), band.resolved, band.lattice)
    reference = Grid(step, periods, wide, high, 1.0, smooth=not band.resolved)
    places = np.concatenate([np.linspace(window.low, window.high, 101), spread * np.linspace(-5, 5, 201)])
    difference = np.abs(found._grid.relative_gaps(places) - reference.relative_gaps(places)).max()
    assert difference <= found.numerical_error
