"""The bracketed search on rising functions, with and without jumps."""

import numpy as np

from service.core.arrays import Numbers
from service.core.returns.search import first_reaching


def test_smooth_flat_and_jumping_functions() -> None:
    levels = np.array([0.1, 0.5, 0.9])

    def jumping(x: Numbers) -> Numbers:
        steps: Numbers = np.where(x < 0.25, 0.2, 0.6) + np.where(x < 0.75, 0.0, 0.4) - levels
        return steps

    found = first_reaching(jumping, np.full(3, -1.0), np.full(3, 2.0))
    np.testing.assert_allclose(found, [-1, 0.25, 0.75], atol=1e-14)
    cubed = first_reaching(lambda x: x**3 - levels, np.zeros(3), np.ones(3))
    np.testing.assert_allclose(cubed, np.cbrt(levels), rtol=1e-15)


def test_a_function_that_always_changes_its_mind_ends_the_search() -> None:
    """Infinitely steep at an end of a bracket as wide as the doubles: 120 steps are the most."""
    found = first_reaching(lambda x: np.where(x > 0, 1.0, -1.0), np.array([-1e300]), np.array([1e300]))
    assert abs(found[0]) < 1e300
