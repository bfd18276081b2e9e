"""The stated error is never below the true one: 50 random plans of every law here, 300 by the benchmark's command."""

import numpy as np
import pytest

from service.core.goals import CashFlow, outlook
from tests.benchmarks.goal_errors import LAWS, errors_of, random_plan
from tests.core.goals.build import plan, returns


@pytest.mark.parametrize(("model", "compounding"), LAWS)
def test_the_stated_error_is_not_below_the_true_one(model: str, compounding: str) -> None:
    draw = np.random.default_rng(16)
    found = [errors_of(random_plan(model, compounding, draw)) for _ in range(50)]
    assert [each for each in found if each.true > each.stated] == []
    assert np.median([each.stated for each in found]) < 1e-6


def test_certain_depletion_leaves_nothing_on_a_wrong_side() -> None:
    growth = returns("empirical", observations=[-0.1, -0.05, 0.0, 0.02, 0.03, 0.05, 0.06, 0.08])
    found = outlook(plan(100, [CashFlow(-12, "year")], 40, 50, growth))
    assert found.depletion_probability == pytest.approx(1, abs=1e-10)
    assert found.success_probability == 0
