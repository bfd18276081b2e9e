"""Ends far out: a law cut where nothing is left is the normal law itself, to the last digits and in both tails."""

import numpy as np
import pytest

from service.core.arrays import number
from service.core.distributions import FAMILIES, Family, quantile
from tests.core.distributions.laws import law

NORMAL = law("normal", mean=0.06, standard_deviation=0.1)
FAR = [law("truncated_normal", mean=0.06, standard_deviation=0.1, lower=-end, upper=end) for end in (1e4, 1e12, 1e150)]


@pytest.mark.parametrize("cut", FAR)
@pytest.mark.parametrize("x", [-7.0, -1.0, 0.05, 0.3, 3.0, 7.5])
def test_distant_ends_change_no_tail(cut: Family, x: float) -> None:
    with np.errstate(all="ignore"):
        given, expected = cut.log_tails(number(x)), NORMAL.log_tails(number(x))
    assert given.at_most == pytest.approx(expected.at_most, rel=1e-13)
    assert given.above == pytest.approx(expected.above, rel=1e-13)


@pytest.mark.parametrize("upper", [False, True])
@pytest.mark.parametrize("cut", FAR)
def test_distant_ends_change_no_quantile(cut: Family, upper: bool) -> None:
    probabilities = np.array([1e-300, 1e-20, 5e-4, 0.3, 0.9995])
    given, expected = (quantile(each, probabilities, upper) for each in (cut, NORMAL))
    assert given.value == pytest.approx(expected.value, rel=1e-12)
    assert given.probability_at_value == pytest.approx(probabilities, rel=1e-10)


def test_one_distant_end_beside_a_near_one() -> None:
    # cut at its mean, a normal law is half of itself, doubled
    half = FAMILIES["truncated_normal"].make(
        FAMILIES["truncated_normal"].parameterisations[0],
        {"mean": 0.06, "standard_deviation": 0.1, "lower": 0.06, "upper": 1e150},
    )
    with np.errstate(all="ignore"):
        given, expected = half.tails(number(0.3)).above, 2 * NORMAL.tails(number(0.3)).above
    assert given == pytest.approx(expected, rel=1e-14)
