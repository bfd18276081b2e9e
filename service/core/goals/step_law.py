"""The growth of one period under any return model, as the lattice needs it."""

from dataclasses import dataclass

import numpy as np

from service.core.arrays import INFINITY, Numbers, number
from service.core.returns import HorizonLaw, Returns, law_of_horizon

LOWEST = -36.0
"""Growth to less than e^-36 is told from a total loss by no double, and is as good as one."""


@dataclass(frozen=True)
class StepLaw:
    """G = max(1 + R, 0) for a return R of one period; R is that of `law` plus `surprise`."""

    law: HorizonLaw
    deviation: float
    surprise: float = 0.0

    @property
    def survival(self) -> float:
        """P(G > 0)."""
        return 1 - float(self.law.probability_at_most(number(-1 - self.surprise)))

    @property
    def log_factor(self) -> float:
        """Logarithm of E[G], inf where the mean is infinite."""
        mean = float(self.law.mean()) + self.surprise
        if not np.isfinite(mean):
            return np.inf
        return float(np.log1p(mean + self.law.gaps(number(-1 - self.surprise)).order_1))

    @property
    def certain(self) -> bool:
        """Whether R is a single value."""
        return self.deviation == 0

    def log_quantiles(self, probabilities: Numbers) -> Numbers:
        """Give quantiles of log G, given G > 0, at least -36."""
        lost = 1 - self.survival
        found = self.law.quantile(lost + (1 - lost) * probabilities) + self.surprise
        return np.log1p(np.maximum(found, np.expm1(LOWEST)))

    def at_most(self, logs: Numbers) -> Numbers:
        """P(0 < G <= e^x)."""
        below = self.law.probability_at_most(np.expm1(np.minimum(logs, 700.0)) - self.surprise)
        return np.maximum(below - (1 - self.survival), 0.0)

    def atoms(self) -> tuple[Numbers, Numbers] | None:
        """Give the possible values of log G > -inf and their probabilities, where they can be listed."""
        atoms = self.law.atoms()
        if atoms is None:
            return None
        masses = np.diff(atoms.cumulative, prepend=0.0)
        alive = atoms.values > -1
        return np.log1p(atoms.values[alive]), masses[alive]


def step_law(returns: Returns, years: float = 0.0, standard_errors: float = 0.0) -> StepLaw:
    """Give the law of one period, or of so many years where it divides.

    Its mean is raised by so many standard errors of the estimate (0: none).
    """
    law = law_of_horizon(returns, years or 1 / returns.periods_in_year)
    deviation = float(returns.moments().standard_deviation)
    surprise = standard_errors * deviation / np.sqrt(float(returns.sample_size or INFINITY))
    return StepLaw(law, deviation, float(surprise))
