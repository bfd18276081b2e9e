"""Returns at random, of every model that answers one year."""

from typing import Any

from hypothesis import strategies as st

from service.core.returns import Returns
from tests.core.returns.build import returns

MEANS = st.integers(-200, 300).map(lambda n: n / 1000)
DEVIATIONS = st.integers(0, 500).map(lambda n: n / 1000)
FREEDOMS = st.sampled_from([2.1, 3.0, 5.0, 12.0, 60.0])
OBSERVATIONS = st.lists(st.integers(-100, 100).map(lambda n: n / 100), min_size=1, max_size=30)
COMPOUNDINGS = st.sampled_from(["simple", "continuous"])


@st.composite
def any_returns(draw: st.DrawFn) -> Returns:
    """One portfolio's returns."""
    model = draw(st.sampled_from(["normal", "lognormal", "student_t", "empirical"]))
    given: dict[str, Any] = {"compounding": "simple" if model == "lognormal" else draw(COMPOUNDINGS)}
    if model == "empirical":
        return returns(model, observations=draw(OBSERVATIONS), **given)
    if model == "student_t":
        given["degrees_of_freedom"] = draw(FREEDOMS)
    return returns(model, expected_return=draw(MEANS), volatility=draw(DEVIATIONS), **given)
