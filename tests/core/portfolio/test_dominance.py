"""Stochastic dominance against its definition, by cumulative sums and by what it implies."""

from fractions import Fraction
from typing import Any

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from scipy.special import ndtri

from service.core.portfolio.question import Dominated
from service.core.returns import Returns
from service.core.returns.law import Atoms
from tests.core.portfolio.build import floor, normal, ranking
from tests.core.portfolio.strategies import any_returns
from tests.core.returns.build import law, returns

CENTS = st.lists(st.integers(-10, 10).map(lambda n: n / 10), min_size=1, max_size=6)


def lognormal(mean: float, deviation: float) -> Returns:
    return returns("lognormal", expected_return=mean, volatility=deviation)


def student(mean: float, deviation: float, freedom: float = 5, **more: Any) -> Returns:
    return returns("student_t", expected_return=mean, volatility=deviation, degrees_of_freedom=freedom, **more)


def sample(*observations: float) -> Returns:
    return returns("empirical", observations=list(observations))


def pair(better: Returns, worse: Returns) -> tuple[int, str] | None:
    """Order and basis with which the first dominates the second; None where it does not."""
    found = ranking([better, worse], criterion="expected_return").dominated
    assert found is not None
    for one in found:
        if one.index == 1:
            return one.order, one.basis
    return None


@pytest.mark.parametrize("kind", [normal, lognormal, student], ids=["normal", "lognormal", "student_t"])
def test_laws_of_one_kind_are_compared_by_their_parameters(kind: Any) -> None:
    assert pair(kind(0.07, 0.1), kind(0.06, 0.1 if kind is not lognormal else 0.1 * 1.06 / 1.07)) == (1, "exact")
    assert pair(kind(0.07, 0.1), kind(0.06, 0.2)) == (2, "exact")
    assert pair(kind(0.06, 0.1), kind(0.06, 0.2)) == (2, "exact")
    assert pair(kind(0.07, 0.2), kind(0.06, 0.1)) is None
    assert pair(kind(0.06, 0.1), kind(0.06, 0.1)) is None
    assert pair(kind(0.06, 0.0), kind(0.06, 0.1)) == (2, "exact")


def test_log_returns_without_a_mean_are_ordered_at_the_first_order_alone() -> None:
    def heavy(mean: float, deviation: float) -> Returns:
        return student(mean, deviation, compounding="continuous")

    assert ranking([heavy(0.07, 0.1), heavy(0.06, 0.1)], criterion="expected_gap").dominated == (
        Dominated(1, 0, 1, "exact"),
    )
    assert ranking([heavy(0.07, 0.1), heavy(0.06, 0.2)], criterion="expected_gap").dominated == ()


def test_different_laws_are_compared_on_a_grid_and_said_to_be() -> None:
    assert pair(lognormal(0.07, 0.09), normal(0.06, 0.1)) == (2, "numerical")
    assert pair(student(0.07, 0.1, 5), student(0.06, 0.2, 4)) == (2, "numerical")
    assert pair(normal(0.9, 0.1), sample(-0.1, 0.1)) == (1, "numerical")
    assert pair(normal(0.08, 0.2), student(0.07, 0.1, 4)) is None


def test_a_jump_between_two_probabilities_of_the_grid_is_not_passed_over() -> None:
    """Just above its jump at 1/2 the sample is ahead of the normal law; the grid's next point is beyond that."""
    middle = 0.05 + 0.1 * float(ndtri(0.503))
    assert pair(normal(0.05, 0.1), sample(-0.9, middle)) == (2, "numerical")
    assert pair(normal(0.05, 0.1), sample(-0.9, 0.03)) == (1, "numerical")


def test_a_law_without_a_mean_is_dominated_at_the_first_order_alone() -> None:
    heavy = student(0.05, 0.1, 4, compounding="continuous")
    found = ranking([normal(0.05, 0.0), heavy], criterion="shortfall_probability").dominated
    assert found == ()


def test_a_law_without_a_mean_does_not_take_over_what_the_one_it_dominates_dominates() -> None:
    """It is ahead of the certain return, which is ahead of the uncertain one at second order; it itself is not."""
    certain, uncertain = normal(0.0, 0.0), student(0.0, 0.001, 2.1)
    without_mean = student(0.02, 0.001, 5, compounding="continuous")
    found = ranking([certain, uncertain, without_mean], criterion="expected_gap").dominated
    assert found == (Dominated(0, 2, 1, "numerical"), Dominated(1, 0, 2, "numerical"))


def plain_dominance(better: list[float], worse: list[float]) -> int:
    """By the definition, in rationals, at every observation."""
    a, b = ([Fraction(v).limit_denominator(1000) for v in values] for values in (better, worse))

    def below(values: list[Fraction], x: Fraction) -> Fraction:
        return Fraction(sum(v <= x for v in values), len(values))

    def gap(values: list[Fraction], x: Fraction) -> Fraction:
        return sum((max(x - v, Fraction(0)) for v in values), Fraction(0)) / len(values)

    places = sorted({*a, *b, Fraction(100)})
    for order, measure in ((1, below), (2, gap)):
        pairs = [(measure(a, x), measure(b, x)) for x in places]
        if all(p <= q for p, q in pairs) and any(p < q for p, q in pairs):
            return order
    return 0


@settings(max_examples=300, deadline=None)
@given(CENTS, CENTS)
def test_samples_are_compared_by_cumulative_sums(better: list[float], worse: list[float]) -> None:
    expected = plain_dominance(better, worse)
    found = pair(sample(*better), sample(*worse))
    assert found == ((expected, "exact") if expected else None)


@settings(max_examples=60, deadline=None)
@given(st.lists(any_returns(), min_size=2, max_size=6), st.sampled_from([-0.5, -0.1, 0.0, 0.05, 0.3]))
def test_the_dominated_have_the_larger_gap_below_every_floor(rows: list[Returns], threshold: float) -> None:
    found = ranking(rows, floor=floor(threshold))
    assert found.dominated is not None
    gap, chance = found.shortfall.expected_gap, found.shortfall.shortfall_probability
    for one in found.dominated:
        assert gap[one.by_index] <= gap[one.index] + 1e-6
        if one.order == 1:  # tested from a probability of one in a million on
            assert chance[one.by_index] <= chance[one.index] + 1e-6


def test_each_is_named_once_by_the_best_ranked_that_dominates_it() -> None:
    rows = [normal(0.05, 0.1), normal(0.07, 0.1), normal(0.06, 0.1), normal(0.055, 0.1), normal(0.02, 0.01)]
    found = ranking(rows, criterion="expected_return").dominated
    assert found == tuple(Dominated(index, 1, 1, "exact") for index in (0, 2, 3))


@settings(max_examples=60, deadline=None)
@given(st.lists(any_returns(), min_size=2, max_size=6))
def test_whoever_is_not_listed_is_dominated_by_no_other(rows: list[Returns]) -> None:
    """Each pair alone gives the same verdict as all together."""
    found = ranking(rows, criterion="expected_gap").dominated
    assert found is not None
    listed = {one.index for one in found}
    for i, row in enumerate(rows):
        alone = [ranking([other, row], criterion="expected_gap").dominated for other in rows if other is not row]
        verdicts = [any(one.index == 1 for one in pair_found) for pair_found in alone if pair_found is not None]
        assume(len({id(r) for r in rows}) == len(rows))
        assert (i in listed) == any(verdicts)


def test_atoms_are_the_values_and_their_cumulative_shares() -> None:
    atoms = law("empirical", observations=[0.2, -0.1]).atoms()
    assert isinstance(atoms, Atoms)
    assert atoms.values.tolist() == [-0.1, 0.2]
    assert atoms.cumulative.tolist() == [0.5, 1.0]


def test_a_thousand_mixed_portfolios_are_compared_within_a_second() -> None:
    random = np.random.default_rng(5)
    rows = []
    for i in range(300):
        mean, deviation = float(random.normal(0.06, 0.02)), float(random.uniform(0.05, 0.2))
        drawn = np.clip(random.normal(mean, deviation, 60), -1, None)
        rows.append((normal, lognormal, student)[i % 3](mean, deviation) if i % 4 else sample(*drawn))
    found = ranking(rows).dominated
    assert found is not None
    assert len(found) > 250
