"""How long a plan takes to succeed: every step in one run."""

from dataclasses import replace
from typing import NamedTuple

import numpy as np

from service.core.goals.evaluation import Runs
from service.core.goals.lifetime import TableLife
from service.core.goals.plan import Plan
from service.core.goals.timeline import timeline
from service.core.goals.work import Work

LONGEST = 100.0
"""Years that are searched."""
MOST_STEPS = 6_000
TIE = 1e-12


class Horizon(NamedTuple):
    """A horizon in years, and the probability there; where there is none, nan and the best probability."""

    years: float
    probability: float
    found: bool
    holds_after: bool | None


def horizon_search(plan: Plan, wanted: float, solvency: bool, last: bool, work: Work) -> Horizon:
    """Find the first step at which the wanted probability is reached, or the last up to which it holds at every step.

    Steps of the shortest period, up to 100 years, the end of the glide path or of the table of lives. A plan that ends
    at a step has the flows before it, and those at the end of a period that come at it.
    """
    steps_a_year = max(plan.steps_a_year(), 1.0)
    steps = np.arange(1, int(np.floor(_longest(plan, steps_a_year) * steps_a_year + 1e-9)) + 1)
    whole = replace(plan, horizon_years=float(steps[-1] / steps_a_year))
    dates = timeline(whole, steps / steps_a_year)
    positions = np.array([dates.position(year) for year in steps / steps_a_year])
    # what comes at the end of the last step counts, but as every step is judged, it is judged here
    opened = replace(dates, flows=np.append(dates.flows[:-1], 0.0))
    reported = frozenset(int(position) for position in positions)
    course, _ = Runs(whole, opened, work).blend(reported, averages=False)
    target = 0.0 if solvency else plan.targets[0]
    reached = np.array([course.wealth[p].paying(float(dates.closing[p])).solvent_at_least(target) for p in positions])
    enough = reached >= wanted - TIE
    if not (enough[0] if last else enough.any()):
        return Horizon(np.nan, float(reached.max()), found=False, holds_after=None)
    at = int(np.argmin(np.append(enough, False))) - 1 if last else int(np.argmax(enough))
    return Horizon(float(dates.dates[positions[at]]), float(reached[at]), True, bool(enough[at:].all()))


def _longest(plan: Plan, steps_a_year: float) -> float:
    ends = [leg.until_year for leg in plan.legs[-1:] if leg.until_year is not None]
    lives = plan.lifetime.lives if plan.lifetime else ()
    tables = [float(len(life.yearly_survival)) for life in lives if isinstance(life, TableLife)]
    return min([LONGEST, MOST_STEPS / steps_a_year, *ends, *tables])
