"""The stated error is never below the true one: 50 random plans of every law here, 300 by the benchmark's command."""

import numpy as np
import pytest

from tests.benchmarks.goal_errors import LAWS, errors_of, random_plan


@pytest.mark.parametrize(("model", "compounding"), LAWS)
def test_the_stated_error_is_not_below_the_true_one(model: str, compounding: str) -> None:
    draw = np.random.default_rng(16)
    found = [errors_of(random_plan(model, compounding, draw)) for _ in range(50)]
    assert [each for each in found if each.true > each.stated] == []
    assert np.median([each.stated for each in found]) < 1e-6
