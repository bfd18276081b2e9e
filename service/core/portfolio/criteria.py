"""The criteria by which portfolios are ranked, each declared once."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from service.core.arrays import NO_VALUE, Numbers
from service.core.portfolio.shortfall import Shortfall

HIGHER = "higher"
LOWER = "lower"


@dataclass(frozen=True)
class Criterion:
    """What is compared, which direction is better, and who proposed it."""

    name: str
    meaning: str
    noun: str
    """As in "has no ..."."""
    superlative: str
    """As in "has the ..."; {floor} and {horizon} stand for the question's own."""
    better: str
    source: str
    value: Callable[[Shortfall], Numbers]
    """The figure compared; nan ranks last and without a rank."""


CRITERIA = {
    criterion.name: criterion
    for criterion in (
        Criterion(
            "safety_first_ratio",
            "how many standard deviations the expected return lies above the floor",
            "safety-first ratio",
            "highest safety-first ratio for {floor}",
            HIGHER,
            "Roy 1952",
            lambda figures: figures.safety_first_ratio,
        ),
        Criterion(
            "shortfall_probability",
            "the chance that the return stays below the floor",
            "chance of missing the floor",
            "smallest chance of missing {floor}",
            LOWER,
            "Roy 1952",
            lambda figures: figures.shortfall_probability,
        ),
        Criterion(
            "expected_gap",
            "by how much the return misses the floor on average, outcomes above it counting as zero",
            "average gap",
            "smallest average gap below {floor}",
            LOWER,
            "Fishburn 1977",
            lambda figures: figures.expected_gap,
        ),
        Criterion(
            "quantile_return",
            "the return that is missed only with the given probability",
            "return at that probability",
            "highest return that is missed in {probability} of {horizon}",
            HIGHER,
            "Kataoka 1963",
            lambda figures: figures.threshold_at_probability.threshold,
        ),
        Criterion(
            "expected_return",
            "the expected return, among the portfolios whose chance of missing the floor is within the limit",
            "finite expected return",
            "highest expected return",
            HIGHER,
            "Telser 1955",
            lambda figures: np.where(np.isfinite(figures.expected_return), figures.expected_return, NO_VALUE),
        ),
    )
}
"""Every criterion by its name."""
