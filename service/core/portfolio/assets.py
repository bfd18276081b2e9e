"""Assets that portfolios share, and the law of a mix of them."""

from dataclasses import dataclass

import numpy as np

from service.core.arrays import Numbers, number
from service.core.errors import DoesNotFit, Refusal
from service.core.parameters import Limit
from service.core.portfolio.correlations import checked_correlations
from service.core.returns import RETURN_MODELS, Returns

MODELS = ("normal", "student_t", "lognormal")
SUM_TOLERANCE = 1e-9


@dataclass(frozen=True)
class Assets:
    """Simple returns of n assets in one period: means (n), volatilities (n), correlations (n, n), and a joint law.

    "normal" and "student_t" (one number of degrees of freedom for all) are exact for every mix; "lognormal" fits a
    lognormal law to the mix's mean and volatility (Fenton 1960). Raises DoesNotFit, paths leading from this object.
    """

    names: tuple[str, ...]
    expected_returns: Numbers
    volatilities: Numbers
    correlations: Numbers
    model: str = "normal"
    degrees_of_freedom: float | None = None
    period: str = "year"
    periods_per_year: float | None = None
    sample_size: Numbers | None = None

    def __post_init__(self) -> None:
        count = len(self.names)
        refusals = [
            Refusal(
                (name,),
                "lengths_differ",
                f"{name} must have {count} numbers, one for each asset.",
                {"given": int(getattr(self, name).size), "expected": count},
            )
            for name in ("expected_returns", "volatilities")
            if getattr(self, name).size != count
        ]
        negative = Limit("at_least", 0).refusal("volatilities", self.volatilities)
        refusals += [negative] if negative else []
        refusals += [
            Refusal(("names", at), "given_twice", f"The asset {name[:60]} stands twice.")
            for at, name in enumerate(self.names)
            if name in self.names[:at]
        ]
        if self.model == "student_t" and self.degrees_of_freedom is None:
            refusals.append(
                Refusal(
                    ("degrees_of_freedom",),
                    "required",
                    "degrees_of_freedom is needed by student_t.",
                    {"by": "student_t"},
                )
            )
        if self.model != "student_t" and self.degrees_of_freedom is not None:
            refusals.append(
                Refusal(
                    ("degrees_of_freedom",),
                    "does_not_go_together",
                    f"degrees_of_freedom does not go together with the model {self.model}.",
                    {"beside": ["model"]},
                )
            )
        if refusals:
            raise DoesNotFit(refusals)
        checked = checked_correlations(self.correlations, count, ("correlations",))
        object.__setattr__(self, "correlations", checked)

    @property
    def covariance(self) -> Numbers:
        """Covariances of the assets' returns, (n, n)."""
        return np.asarray(self.volatilities[:, None] * self.correlations * self.volatilities, np.float64)

    def aligned(self, weights: dict[str, float]) -> Numbers:
        """Give weights by name as (n,), 0 for assets not named. Raises DoesNotFit, paths leading from the weights."""
        places = {name: at for at, name in enumerate(self.names)}
        strangers = [
            Refusal((at, "asset"), "unknown_asset", f"There is no asset {name[:60]} under assets.")
            for at, name in enumerate(weights)
            if name not in places
        ]
        if strangers:
            raise DoesNotFit(strangers)
        total = sum(weights.values())
        if abs(total - 1) > SUM_TOLERANCE:
            words = f"The weights must add up to 1; they add up to {total:.15g}. What is missing is not taken as cash."
            raise DoesNotFit([Refusal((), "must_add_up_to_one", words, {"sum": total, "tolerance": SUM_TOLERANCE})])
        out = np.zeros(len(self.names))
        out[[places[name] for name in weights]] = list(weights.values())
        return out

    def mix(self, weights: Numbers) -> Returns:
        """Give the returns of a mix (n,), rebalanced every period."""
        mean = number(float(weights @ self.expected_returns))
        variance = float(weights @ self.covariance @ weights)
        values = {"expected_return": mean, "volatility": number(np.sqrt(max(variance, 0.0)))}
        if self.degrees_of_freedom is not None:
            values["degrees_of_freedom"] = number(self.degrees_of_freedom)
        kind = RETURN_MODELS[self.model]
        way = kind.parameterisations[0]
        refusals = [refusal for name, value in values.items() for refusal in way.parameters[name].refusals(value)]
        if refusals:
            raise DoesNotFit(refusals)
        return Returns(kind.make(way, values), self.period, self.periods_per_year, sample_size=self.sample_size)

    def correlation_of_mixes(self, weights: Numbers) -> Numbers:
        """Correlations of k mixes (k, n); 0 beside one without risk."""
        covariance = weights @ self.covariance @ weights.T
        deviations = np.sqrt(np.maximum(np.diag(covariance), 0))
        with np.errstate(all="ignore"):
            out = np.where(np.outer(deviations, deviations) > 0, covariance / np.outer(deviations, deviations), 0.0)
        out = np.clip(out, -1.0, 1.0)
        np.fill_diagonal(out, 1.0)
        return np.asarray(out, np.float64)
