"""How long one or two people live."""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from service.core.arrays import Numbers
from service.core.errors import Refusal
from service.core.goals.fitting import WHOLE, placed_under, refusals_of_limits
from service.core.parameters import Limit


class Life:
    """One life."""

    def survival(self, years: Numbers) -> Numbers:
        """P(alive after so many years)."""
        raise NotImplementedError

    def refusals(self, horizon_years: float | None) -> Iterator[Refusal]:
        """Give what does not fit, paths leading from the life."""
        raise NotImplementedError


@dataclass(frozen=True, slots=True)
class GompertzLife(Life):
    """Mortality that rises by a constant share each year of age (Gompertz 1825); all three in years.

    S(t) = exp(e^((age - modal_age)/b) (1 - e^(t/b))), b the dispersion.
    """

    age: float
    modal_age: float
    dispersion: float

    def survival(self, years: Numbers) -> Numbers:
        """P(alive after so many years)."""
        with np.errstate(over="ignore", under="ignore", invalid="ignore"):
            hazard = np.exp(np.float64(self.age - self.modal_age) / self.dispersion)
            cumulative = hazard * np.expm1(years / self.dispersion)
            # no hazard at all beats an infinite growth of it
            alive: Numbers = np.exp(-np.where((hazard > 0) & (years > 0), cumulative, 0.0))
            return alive

    def refusals(self, horizon_years: float | None) -> Iterator[Refusal]:  # noqa: ARG002 - for any horizon
        """Give what does not fit, paths leading from the life."""
        yield from refusals_of_limits(
            ("age", self.age, Limit("at_least", 0)),
            ("modal_age", self.modal_age, Limit("above", 0)),
            ("dispersion", self.dispersion, Limit("above", 0)),
        )


@dataclass(frozen=True, slots=True)
class TableLife(Life):
    """yearly_survival[k] = P(alive at k + 1 given alive at k), with a constant force of mortality within each year."""

    yearly_survival: tuple[float, ...]

    def survival(self, years: Numbers) -> Numbers:
        """P(alive after so many years), at most as many as the table has."""
        yearly = np.array(self.yearly_survival)
        whole = np.minimum(np.floor(years + WHOLE), yearly.size - 1).astype(np.int64)
        alive: Numbers = np.concatenate([[1.0], np.cumprod(yearly)])
        since: Numbers = yearly[whole] ** np.maximum(years - whole, 0.0)
        return alive[whole] * since

    def refusals(self, horizon_years: float | None) -> Iterator[Refusal]:
        """Give what does not fit, paths leading from the life."""
        table = np.array(self.yearly_survival, np.float64)
        for limit in (Limit("at_least", 0), Limit("at_most", 1)):
            found = limit.refusal("yearly_survival", table)
            if found:
                yield found
        if horizon_years is not None and table.size < horizon_years - WHOLE:
            detail = f"The table has {table.size} years; the horizon of {horizon_years:.15g} years needs as many."
            yield Refusal(("yearly_survival",), "too_few", detail, {"at_least": horizon_years, "given": table.size})


@dataclass(frozen=True, slots=True)
class Lifetime:
    """One life ("lifetime" in a request), or two ("lives") of which the last survivor counts; independent."""

    lives: tuple[Life, ...]

    def survival(self, years: Numbers) -> Numbers:
        """P(somebody alive after so many years): 1 - product of the lives' 1 - S."""
        dead = np.ones_like(years)
        for life in self.lives:
            dead = dead * (1 - life.survival(years))
        return self.lives[0].survival(years) if len(self.lives) == 1 else 1 - dead

    def refusals(self, horizon_years: float | None) -> Iterator[Refusal]:
        """Give what does not fit, paths leading from the request."""
        for index, life in enumerate(self.lives):
            path = ("lifetime",) if len(self.lives) == 1 else ("lives", index)
            yield from placed_under(path, life.refusals(horizon_years))
