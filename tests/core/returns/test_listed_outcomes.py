"""Growth with finitely many outcomes against every path, in rational numbers."""

from fractions import Fraction
from itertools import product
from math import comb
from typing import Any

import numpy as np
import pytest

from service.core.arrays import number
from service.core.errors import DoesNotFit
from service.core.returns import HorizonLaw
from service.core.returns.compounding import values
from service.core.returns.compounding.compositions import compositions
from service.core.returns.compounding.halves import HalvesLaw
from service.core.returns.compounding.values import ValuesLaw, log_collisions
from service.core.returns.laws.atoms import AtomsLaw
from tests.core.returns.build import law

Outcomes = dict[Fraction, Fraction]
SEEN = [Fraction(n, 100) for n in (-25, 10, 10, 25, 0, -20)]
"""With ties, and 1.25 x 0.8 = 1."""


def paths(returns: list[Fraction], periods: int) -> Outcomes:
    """Every path: the return over the horizon, and its probability."""
    found: Outcomes = {}
    for path in product(returns, repeat=periods):
        growth = Fraction(1)
        for one in path:
            growth *= 1 + one
        found[growth - 1] = found.get(growth - 1, Fraction(0)) + Fraction(1, len(returns)) ** periods
    return found


def check(found: HorizonLaw, outcomes: Outcomes, thresholds: list[Fraction], levels: list[Fraction]) -> None:
    """Every figure against the list of outcomes."""
    for threshold in thresholds:
        at = number(float(threshold))
        below = [(r, p) for r, p in outcomes.items() if r < threshold]
        assert float(found.probability_below(at)) == pytest.approx(float(sum(p for _, p in below)), abs=1e-13)
        at_most = sum(p for r, p in outcomes.items() if r <= threshold)
        assert float(found.probability_at_most(at)) == pytest.approx(float(at_most), abs=1e-13)
        gaps = found.gaps(at)
        assert float(gaps.order_1) == pytest.approx(float(sum(p * (threshold - r) for r, p in below)), abs=1e-13)
        assert float(gaps.order_2) == pytest.approx(float(sum(p * (threshold - r) ** 2 for r, p in below)), abs=1e-13)
    ordered = sorted(outcomes)
    for level in levels:
        a = number(float(level))
        lower = next(r for r in ordered if sum(outcomes[x] for x in ordered if x <= r) >= level)
        upper = next(r for r in ordered if sum(outcomes[x] for x in ordered if x <= r) > level)
        assert float(found.quantile(a)) == pytest.approx(float(lower), abs=1e-12)
        assert float(found.upper_quantile(a)) == pytest.approx(float(upper), abs=1e-12)
        loss = sum(outcomes[r] * (upper - r) for r in ordered if r < upper) / level - upper
        assert float(found.expected_shortfall(a)) == pytest.approx(float(loss), abs=1e-11)
    mean = sum(p * r for r, p in outcomes.items())
    variance = sum(p * (r - mean) ** 2 for r, p in outcomes.items())
    assert float(found.mean()) == pytest.approx(float(mean), abs=1e-13)
    assert float(found.standard_deviation()) == pytest.approx(float(variance) ** 0.5, abs=1e-13)
    assert float(found.total_loss_probability()) == pytest.approx(float(outcomes.get(Fraction(-1), 0)), abs=1e-14)


THRESHOLDS = [Fraction(-2), Fraction(-1), Fraction(-1, 4), Fraction(0), Fraction(21, 100), Fraction(3)]
LEVELS = [Fraction(1, 10), Fraction(1, 36), Fraction(1, 2), Fraction(9, 10)]


@pytest.mark.parametrize("periods", [1, 2, 3, 4, 5])
@pytest.mark.parametrize("lost", [False, True])
def test_observed_returns(periods: int, lost: bool) -> None:
    seen = [*SEEN, Fraction(-1)] if lost else SEEN
    found = law("empirical", observations=[float(r) for r in seen], horizon_years=periods)
    check(found, paths(seen, periods), THRESHOLDS, LEVELS)


@pytest.fixture
def _halves(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(values, "MOST_LISTED", 0)


@pytest.mark.usefixtures("_halves")
@pytest.mark.parametrize("periods", [2, 3, 4, 5])
@pytest.mark.parametrize("lost", [False, True])
def test_observed_returns_by_two_halves(periods: int, lost: bool) -> None:
    seen = [*SEEN, Fraction(-1)] if lost else SEEN
    found = law("empirical", observations=[float(r) for r in seen], horizon_years=periods)
    assert isinstance(found, HalvesLaw)
    assert found.method == "two_halves"
    check(found, paths(seen, periods), THRESHOLDS, LEVELS)
    worst, best = min(paths(seen, periods)), max(paths(seen, periods))
    assert found.certain(np.array([-1.5, float(worst) - 1e-9, float(best) + 1e-9])).tolist() == [True, True, True]
    assert not found.certain(number(0.01))


@pytest.mark.usefixtures("_halves")
def test_many_quantiles_of_two_halves_come_from_the_smooth_law() -> None:
    found = law("empirical", observations=list(np.random.default_rng(5).normal(0.01, 0.05, 30)), horizon_years=6)
    assert isinstance(found, HalvesLaw)
    levels = np.linspace(0.02, 0.98, 49)
    many = found.quantile(levels)
    few = np.array([float(found.quantile(number(a))) for a in levels])
    np.testing.assert_allclose(many, few, atol=2e-5)
    assert (np.diff(found.upper_quantile(levels)) > 0).all()


def test_thresholds_beyond_what_two_halves_can_count_are_refused() -> None:
    observations = list(np.random.default_rng(5).normal(0.01, 0.05, 55))
    found = law("empirical", observations=observations, horizon_years=6)
    assert isinstance(found, HalvesLaw)
    with pytest.raises(DoesNotFit) as raised:
        found.probability_below(np.linspace(-0.1, 0.1, 5000))
    assert raised.value.refusals[0].code == "too_much_work"
    assert found.probability_below(np.linspace(-0.1, 0.1, 70)).shape == (70,)


@pytest.mark.parametrize(("up", "down", "moves"), [("1/5", "-3/20", 3), ("1/4", "-1/5", 2), ("1/10", "-1", 2)])
@pytest.mark.parametrize("periods", [1, 2, 4])
def test_moves_up_and_down(up: str, down: str, moves: int, periods: int) -> None:
    u, d, p = Fraction(up), Fraction(down), Fraction(11, 20)
    outcomes: Outcomes = {}
    n = moves * periods
    for j in range(n + 1):
        growth = (1 + u) ** j * (1 + d) ** (n - j) - 1
        outcomes[growth] = outcomes.get(growth, Fraction(0)) + comb(n, j) * p**j * (1 - p) ** (n - j)
    given: dict[str, Any] = {"up_return": float(u), "down_return": float(d), "up_probability": 0.55, "moves": moves}
    found = law("up_down", **given, horizon_years=periods)
    check(found, outcomes, THRESHOLDS, LEVELS)


def test_a_floor_on_an_outcome_counts_as_reached_after_hundreds_of_moves() -> None:
    """1.25 and 0.8 cancel exactly: half of 1,000 moves up give back what was paid in."""
    given: dict[str, Any] = {"up_return": 0.25, "down_return": -0.2, "up_probability": 0.5, "moves": 100}
    found = law("up_down", **given, horizon_years=10)
    middle = comb(1000, 500) / 2**1000
    assert float(found.probability_at_most(number(0)) - found.probability_below(number(0))) == pytest.approx(middle)
    assert float(found.probability_below(number(0))) == pytest.approx((1 - middle) / 2, abs=1e-13)


def test_moves_that_are_certain_and_moves_of_log_returns() -> None:
    given: dict[str, Any] = {"up_return": 0.1, "down_return": -0.1, "moves": 2}
    sure = law("up_down", **given, up_probability=1, horizon_years=3)
    assert float(sure.mean()) == pytest.approx(1.1**6 - 1)
    assert sure.standard_deviation() == 0
    logs = law("up_down", **given, up_probability=0.5, horizon_years=3, compounding="continuous")
    atoms = logs.atoms()
    assert atoms is not None
    np.testing.assert_allclose(np.log1p(atoms.values), np.linspace(-0.6, 0.6, 7), atol=1e-14)
    assert float(logs.log_growth().mean) == pytest.approx(0, abs=1e-15)
    assert float(logs.log_growth().standard_deviation) == pytest.approx(0.1 * np.sqrt(6))


def test_too_many_moves_are_refused() -> None:
    with pytest.raises(DoesNotFit) as raised:
        law("up_down", up_return=0.1, down_return=-0.1, up_probability=0.5, moves=10_000, horizon_years=40)
    assert raised.value.refusals[0].code == "too_much_work"
    assert raised.value.refusals[0].path == ("horizon_years",)


@pytest.mark.parametrize(("periods", "kinds"), [(1, 4), (2, 4), (3, 4), (7, 3), (40, 2), (5, 1), (3, 60)])
def test_compositions_add_up(periods: int, kinds: int) -> None:
    shares = np.random.default_rng(kinds).dirichlet(np.ones(kinds))
    masses, (ones, weighted) = compositions(periods, shares, [np.ones(kinds), np.arange(float(kinds))])
    assert masses.size == comb(periods + kinds - 1, periods)
    assert masses.sum() == pytest.approx(1, abs=1e-13)
    assert (ones == periods).all()
    assert float(masses @ weighted) == pytest.approx(periods * float(shares @ np.arange(kinds)), rel=1e-13)


def sample(count: int) -> list[float]:
    return list(np.random.default_rng(count).normal(0.01, 0.05, count))


def listed(count: int, periods: int) -> HorizonLaw:
    found = law("empirical", observations=sample(count), horizon_years=periods)
    assert isinstance(found, AtomsLaw)
    return found


@pytest.mark.parametrize(("count", "periods"), [(10, 10), (5, 30), (30, 4), (60, 3), (200, 2)])
def test_the_stated_error_of_the_smooth_law_holds(count: int, periods: int, monkeypatch: pytest.MonkeyPatch) -> None:
    exact = listed(count, periods)
    monkeypatch.setattr(values, "MOST_LISTED", 0)
    monkeypatch.setattr(values, "MOST_IN_HALF", 0)
    smooth = law("empirical", observations=sample(count), horizon_years=periods)
    assert isinstance(smooth, ValuesLaw)
    middle, spread = float(exact.mean()), float(exact.standard_deviation())
    thresholds = middle + spread * np.linspace(-3, 3, 1001)
    difference = np.abs(smooth.probability_below(thresholds) - exact.probability_below(thresholds)).max()
    assert difference <= smooth.numerical_error
    gaps = np.abs(smooth.gaps(thresholds).order_1 - exact.gaps(thresholds).order_1)
    assert (gaps <= smooth.numerical_error * (2 + thresholds)).all()
    assert smooth.discrete
    assert smooth.cautions == ("discrete_law_approximated",)
    assert smooth.numerical_error_kind == "estimate"


def test_many_values_over_many_periods_are_as_good_as_smooth() -> None:
    found = law("empirical", observations=sample(60), horizon_years=120)
    assert found.numerical_error < 1e-11
    assert found.cautions == ()


def test_collisions_of_two_sums() -> None:
    """Two sums of n values are equal in general position when they use the same values: counted for small cases."""
    for kinds, periods in ((3, 2), (4, 3), (6, 2)):
        counts: dict[tuple[int, ...], int] = {}
        for path in product(range(kinds), repeat=periods):
            key = tuple(sorted(path))
            counts[key] = counts.get(key, 0) + 1
        exact = sum(count**2 for count in counts.values()) / kinds ** (2 * periods)
        assert np.exp(log_collisions(kinds, periods)) == pytest.approx(exact, rel=1e-10)
    assert log_collisions(50, 400) < log_collisions(50, 100) < 0


def test_a_certain_sample_and_one_of_nothing_but_losses() -> None:
    sure = law("empirical", observations=[0.1, 0.1], horizon_years=3)
    assert float(sure.quantile(number(0.5))) == pytest.approx(0.331)
    ruin = law("empirical", observations=[-1, -1], horizon_years=3)
    assert ruin.total_loss_probability() == 1
    assert ruin.quantile(number(0.5)) == -1
    assert ruin.mean() == -1
    assert ruin.standard_deviation() == 0
    assert np.isnan(ruin.log_growth().mean)
