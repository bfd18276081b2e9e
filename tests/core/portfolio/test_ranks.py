"""Ranks with ties, and agreement between rankings, against plain loops."""

from itertools import combinations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.core.portfolio.ranking import disagreeing_pairs
from service.core.portfolio.ranks import kendall_tau_b, ranked

SMALL_RANKS = st.lists(st.tuples(st.integers(0, 4), st.integers(0, 4)), min_size=1, max_size=12)


def test_best_first_ties_share_the_smallest_rank_and_stand_in_the_order_given() -> None:
    order, ranks = ranked(np.array([0.2, 0.5, 0.2, 0.1]), higher_is_better=True, numerical_error=0)
    assert order.tolist() == [1, 0, 2, 3]
    assert ranks.tolist() == [2, 1, 2, 4]
    order, ranks = ranked(np.array([0.2, 0.5, 0.2, 0.1]), higher_is_better=False, numerical_error=0)
    assert order.tolist() == [3, 0, 2, 1]
    assert ranks.tolist() == [2, 4, 2, 1]


def test_infinite_values_rank_at_the_ends_and_missing_ones_last_without_a_rank() -> None:
    order, ranks = ranked(np.array([np.nan, -np.inf, 1.0, np.inf, np.inf]), True, 0)
    assert order.tolist() == [3, 4, 2, 1, 0]
    assert ranks.tolist() == [0, 4, 3, 1, 1]


def test_values_within_rounding_or_the_numerical_error_are_tied_and_ties_chain() -> None:
    step = 0.9e-12
    _, ranks = ranked(np.array([1.0, 1.0 + step, 1.0 + 2 * step, 1.1]), False, 0)
    assert ranks.tolist() == [1, 1, 1, 4]
    _, ranks = ranked(np.array([1e-20, 1e-30, 0.5]), False, 1e-15)
    assert ranks.tolist() == [1, 1, 3]
    # listed as given, not by what is below the noise
    order, _ = ranked(np.array([1.0 + step, 1.0]), False, 0)
    assert order.tolist() == [0, 1]


def test_one_value_has_rank_one() -> None:
    order, ranks = ranked(np.array([0.3]), True, 0)
    assert (order.tolist(), ranks.tolist()) == ([0], [1])


def plain_tau(first: list[int], second: list[int]) -> float:
    """Kendall 1945, pair by pair."""
    known = [(a, b) for a, b in zip(first, second, strict=True) if a and b]
    score, ties_first, ties_second, pairs = 0, 0, 0, 0
    for (a, b), (c, d) in combinations(known, 2):
        pairs += 1
        score += int(np.sign(a - c) * np.sign(b - d))
        ties_first += a == c
        ties_second += b == d
    scale = np.sqrt((pairs - ties_first) * (pairs - ties_second))
    return float(score / scale) if scale else np.nan


@given(SMALL_RANKS)
def test_kendall_tau_b_is_the_one_of_the_pairs(pairs: list[tuple[int, int]]) -> None:
    first, second = ([pair[i] for pair in pairs] for i in range(2))
    matrix = kendall_tau_b([np.array(first), np.array(second)])
    assert matrix[0, 1] == pytest.approx(plain_tau(first, second), nan_ok=True)
    assert matrix[0, 1] == pytest.approx(matrix[1, 0], nan_ok=True)


@given(SMALL_RANKS)
def test_disagreeing_pairs_are_those_ordered_differently(pairs: list[tuple[int, int]]) -> None:
    first, second = ([pair[i] for pair in pairs] for i in range(2))
    ranked_twice = np.array(first), np.array(second)
    expected = [
        [i, j]
        for i, j in combinations(range(len(pairs)), 2)
        if all((first[i], first[j], second[i], second[j])) and (first[i] - first[j]) * (second[i] - second[j]) < 0
    ]
    assert disagreeing_pairs(*ranked_twice, all_pairs=True).tolist() == expected
    neighbours = disagreeing_pairs(*ranked_twice, all_pairs=False).tolist()
    assert all(pair in expected for pair in neighbours)
    assert bool(neighbours) == bool(expected)
