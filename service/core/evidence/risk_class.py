"""Market risk classes of two European standards, from observed series."""

from dataclasses import dataclass

import numpy as np

from service.core.arrays import Numbers
from service.core.evidence.series import SampleMoments, sample_moments

EU = "eu_2017_653"
CESR = "cesr_10_673"
PERIODS_PER_YEAR = {EU: {"day": 256.0, "week": 52.0, "month": 12.0}, CESR: {"week": 52.0, "month": 12.0}}
BOUNDS = {EU: (0.005, 0.05, 0.12, 0.20, 0.30, 0.80), CESR: (0.005, 0.02, 0.05, 0.10, 0.15, 0.25)}
"""Where the classes 2 to 7 begin."""
LEAST_YEARS = {EU: {"day": 2, "week": 4, "month": 5}, CESR: {"week": 5, "month": 5}}
"""Years of data that the standard asks for."""
NEARLY = 0.98
"""Holidays make years a little shorter."""


@dataclass(frozen=True, slots=True)
class RiskClass:
    """The class and every figure on the way; nan where the standard has no such figure."""

    market_risk_class: int
    class_lower_bound: float
    class_upper_bound: float
    distance_to_lower: float
    distance_to_upper: float
    observations: int
    periods_in_holding_period: float
    moments: SampleMoments
    value_at_risk_return_space: float
    var_equivalent_volatility: float
    annualised_volatility: float
    cautions: tuple[str, ...]


def risk_class(
    returns: Numbers, standard: str, periods_per_year: float, holding_years: float, period: str
) -> RiskClass:
    """Give the class of log returns (n) of one period, by the published formula as understood here.

    eu_2017_653: Commission Delegated Regulation (EU) 2017/653 as amended, Annex II part 1, points 9 to 13; bounds of
    classes closed below, nothing rounded before. cesr_10_673: CESR guidelines 10-673 on the risk indicator, from simple
    returns.
    """
    moments, periods = sample_moments(returns), holding_years * periods_per_year
    at_risk = volatility = annualised = np.nan
    if standard == EU:
        at_risk = value_at_risk(moments, periods)
        volatility = decisive = equivalent_volatility(at_risk, holding_years)
    else:
        annualised = decisive = float(np.sqrt(periods_per_year * np.var(np.expm1(returns), ddof=1)))
    cautions = [] if returns.size >= LEAST_YEARS[standard][period] * periods_per_year * NEARLY else ["short_history"]
    if not decisive >= 0:
        cautions.append("formula_outside_its_range")
    known = decisive if decisive >= 0 else 0.0
    place = int(np.searchsorted(BOUNDS[standard], known, side="right"))
    ends = (0.0, *BOUNDS[standard], np.inf)
    lower, upper = ends[place], ends[place + 1]
    return RiskClass(
        place + 1,
        lower,
        upper,
        decisive - lower,
        upper - decisive,
        returns.size,
        periods,
        moments,
        at_risk,
        volatility,
        annualised,
        tuple(cautions),
    )


def value_at_risk(moments: SampleMoments, periods: float) -> float:
    """Value at risk in return space over so many periods, by the expansion of Cornish & Fisher (point 12).

    Its constants are those of z = -1.96 as the regulation prints them: (z^2 - 1)/6 = 0.474, (z^3 - 3z)/24 = -0.0687,
    -(2z^3 - 5z)/36 = 0.146. A series without spread has no skewness: its terms are 0.
    """
    spread = moments.standard_deviation
    skewness, excess = (value if spread > 0 else 0.0 for value in (moments.skewness, moments.excess_kurtosis))
    score = -1.96 + 0.474 * skewness / np.sqrt(periods) - 0.0687 * excess / periods + 0.146 * skewness**2 / periods
    return float(spread * np.sqrt(periods) * score - spread**2 * periods / 2)


def equivalent_volatility(at_risk: float, holding_years: float) -> float:
    """Volatility a year that gives the same value at risk under normal returns (point 13); nan without a solution."""
    inner = 3.842 - 2 * at_risk
    return float((np.sqrt(inner) - 1.96) / np.sqrt(holding_years)) if inner >= 0 else float("nan")
