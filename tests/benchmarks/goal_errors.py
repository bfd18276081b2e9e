"""Is the stated error of goals ever below the true one? Random plans of every law, beside runs with twice the points.

    python -m tests.benchmarks.goal_errors [plans of each law, 300 unless told]

Prints for each law the largest true error, the largest stated one, and the worst of their ratios; status 1 above 1.
"""

import sys
from dataclasses import dataclass
from typing import Any

import numpy as np

from service.core.arrays import number
from service.core.goals import CashFlow, Leg, Plan
from service.core.goals.course import RATIO
from service.core.goals.evaluation import Runs, evaluate
from service.core.goals.timeline import timeline
from service.core.goals.work import Work
from service.core.returns import RETURN_MODELS, Returns

PLANS = 300
LAWS = (
    ("lognormal", "simple"),
    ("normal", "continuous"),
    ("lognormal_mixture", "simple"),
    ("normal", "simple"),
    ("normal_mixture", "simple"),
    ("normal_mixture", "continuous"),
    ("student_t", "simple"),
    ("student_t", "continuous"),
    ("cornish_fisher", "simple"),
    ("empirical", "simple"),
    ("up_down", "simple"),
)


def random_parameters(model: str, draw: np.random.Generator) -> dict[str, Any]:
    """Draw yearly returns of an ordinary size."""
    mean, deviation = draw.uniform(-0.02, 0.1), 10 ** draw.uniform(-1.3, -0.4)
    common = {"expected_return": mean, "volatility": deviation}
    calm, stormy = [0.8, mean + 0.02, deviation / 2], [0.2, mean - 0.05, 2 * deviation]
    laws: dict[str, dict[str, Any]] = {
        "lognormal": common,
        "normal": common,
        "student_t": common | {"degrees_of_freedom": draw.uniform(2.5, 12)},
        "cornish_fisher": common | {"skewness": draw.uniform(-0.5, 0.2), "excess_kurtosis": draw.uniform(0.5, 1.5)},
        "normal_mixture": {"components": np.array([calm, stormy])},
        "lognormal_mixture": {"components": np.array([calm, stormy])},
        "empirical": {"observations": mean + deviation * draw.standard_normal(30).clip(-2, 2)},
        "up_down": {"moves": 5, "up_return": deviation / 2, "down_return": -deviation / 2.2, "up_probability": 0.55},
    }
    return laws[model]


def random_plan(model: str, compounding: str, draw: np.random.Generator) -> Plan:
    """Draw a plan of saving, spending, or both."""
    given = random_parameters(model, draw)
    values = {name: v if isinstance(v, np.ndarray) else number(v) for name, v in given.items()}
    growth = Returns(RETURN_MODELS[model](**values), compounding=compounding)
    years, size = int(draw.integers(2, 31)), float(10 ** draw.uniform(0, 4))
    turn = float(draw.integers(1, years))
    flows = (
        (CashFlow(size, "year"),),
        (CashFlow(-size, "year"),),
        (CashFlow(size, "year", 0, turn), CashFlow(-size, "year", turn)),
        (CashFlow(-size, "year", 0, turn), CashFlow(2 * size, "once", turn)),
    )[draw.integers(4)]
    target = float(draw.choice([0.0, 10 ** draw.uniform(3, 6)]))
    return Plan(float(10 ** draw.uniform(3, 5)), flows, float(years), (target,), (Leg(None, growth),))


@dataclass(frozen=True)
class Errors:
    """True and stated error of one plan."""

    true: float
    stated: float


def errors_of(plan: Plan) -> Errors:
    """Compare every probability of a plan with a run of twice the points; paths that are listed are exact."""
    dates = timeline(plan)
    finer = Runs(plan, dates, Work())
    last = frozenset([dates.dates.size - 1])
    with np.errstate(all="ignore"):
        stated = evaluate(plan, Work())
        course = finer.listed(last) or finer.one(last, 2 * RATIO, averages=False)
    true = np.abs(finer.chances(course) - finer.chances(stated.course)).max()
    return Errors(float(true), stated.numerical_error)


def main() -> int:
    """Print a row for each law."""
    plans = int(sys.argv[1]) if len(sys.argv) > 1 else PLANS
    worst = 0.0
    print(f"{plans} plans of each law\n{'':34}{'true':>10}{'stated':>10}{'ratio':>8}")
    for model, compounding in LAWS:
        draw = np.random.default_rng(6)
        found = [errors_of(random_plan(model, compounding, draw)) for _ in range(plans)]
        ratio = max(each.true / each.stated for each in found)
        worst = max(worst, ratio)
        true, stated = max(each.true for each in found), max(each.stated for each in found)
        print(f"{model + ', ' + compounding:34}{true:10.0e}{stated:10.0e}{ratio:8.2f}", flush=True)
    return 0 if worst <= 1 else 1


if __name__ == "__main__":
    sys.exit(main())
