"""Laws side by side answer as each of them alone."""

from typing import Any

import numpy as np
import pytest

from service.core.arrays import number
from service.core.returns.laws.collected import CollectedLaw
from tests.core.returns.build import law

THRESHOLD, PROBABILITY = number(0.02), number(0.05)
QUESTIONS: dict[str, tuple[Any, ...]] = {
    "mean": (),
    "standard_deviation": (),
    "probability_below": (THRESHOLD,),
    "probability_at_most": (THRESHOLD,),
    "certain": (THRESHOLD,),
    "gaps": (THRESHOLD,),
    "quantile": (PROBABILITY,),
    "upper_quantile": (PROBABILITY,),
    "expected_shortfall": (PROBABILITY,),
    "log_growth": (),
    "total_loss_probability": (),
}
NORMALS = law("normal", expected_return=[0.04, 0.06], volatility=[0.1, 0.2])
HEAVY = law("student_t", expected_return=0.05, volatility=0.1, degrees_of_freedom=4)
SAMPLE = law("empirical", observations=[-0.1, 0.02, 0.3])
TOGETHER = CollectedLaw([(NORMALS, np.array([0, 3])), (HEAVY, np.array([2])), (SAMPLE, np.array([1]))], 4)


@pytest.mark.parametrize("question", QUESTIONS)
def test_every_figure_stands_at_its_position(question: str) -> None:
    arguments = QUESTIONS[question]
    together = np.asarray(getattr(TOGETHER, question)(*arguments))
    normals, heavy, sample = (np.asarray(getattr(one, question)(*arguments)) for one in (NORMALS, HEAVY, SAMPLE))
    assert together.shape[-1] == 4
    np.testing.assert_array_equal(together[..., [0, 3]], normals)
    np.testing.assert_array_equal(together[..., 2], heavy)
    np.testing.assert_array_equal(together[..., 1], sample)


def test_several_probabilities_at_once() -> None:
    quantiles = TOGETHER.quantile(np.array([[0.05], [0.5], [0.95]]))
    assert quantiles.shape == (3, 4)
    assert (np.diff(quantiles, axis=0) > 0).all()


def test_the_largest_error_and_the_weakest_kind_of_it_stand_for_all() -> None:
    assert TOGETHER.numerical_error == 1e-13
    assert TOGETHER.numerical_error_kind == "bound"
    assert TOGETHER.method == "several_methods"
    assert CollectedLaw([(NORMALS, np.arange(2))], 2).method == "closed_form"
