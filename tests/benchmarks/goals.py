"""30 years of monthly saving: the outlook beside 10,000 sampled paths, and what else is promised of goals."""

import statistics
import time
from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np
import orjson

from service.core.arrays import number
from service.core.goals import CashFlow, Leg, Plan, outlook, requirement
from service.core.goals.evaluation import evaluate
from service.core.goals.work import Work
from service.core.returns import RETURN_MODELS, Returns
from service.edge.app import create_app

PATHS, MONTHS, TARGET = 10_000, 360, 600_000
MEAN, SPREAD = 0.05, 0.14
ROUNDS = 9
CLIENT = create_app().test_client()


def body(years: float = MONTHS / 12) -> dict[str, Any]:
    """Give the plan as it is asked."""
    return {
        "initial_value": 20000,
        "cash_flows": [{"amount": 500, "every": "month"}],
        "horizon_years": years,
        "target": TARGET,
        "returns": {"model": "lognormal", "expected_return": MEAN, "volatility": SPREAD},
    }


def plan(years: float = MONTHS / 12) -> Plan:
    """Give the plan as the core takes it."""
    growth = Returns(RETURN_MODELS["lognormal"](expected_return=number(MEAN), volatility=number(SPREAD)))
    return Plan(20000.0, (CashFlow(500.0, "month"),), years, (float(TARGET),), (Leg(None, growth),))


def sample() -> None:
    """Follow 10,000 paths, vectorised over them, and count those that reach the target."""
    log_variance = np.log1p((SPREAD / (1 + MEAN)) ** 2)
    draw = np.random.default_rng(1)
    growth = np.exp(
        (np.log1p(MEAN) - log_variance / 2) / 12 + np.sqrt(log_variance / 12) * draw.standard_normal((MONTHS, PATHS))
    )
    wealth = np.full(PATHS, 20000.0)
    for month in range(MONTHS):
        wealth = (wealth + 500) * growth[month]
    (wealth >= TARGET).mean()


def without_bands() -> None:
    """Ask the core for the chance alone, its error included."""
    course = evaluate(plan(), Work()).course
    course.wealth[max(course.wealth)].solvent_at_least(TARGET)


def over_http() -> None:
    """Ask the whole application, yearly bands included, in process."""
    answer = CLIENT.post("/v1/goal-outlooks", data=orjson.dumps(body()), content_type="application/json")
    assert answer.status_code == 200


def whole(years: float) -> Callable[[], None]:
    """Every figure of the plan, from the core."""
    return lambda: (outlook(plan(years)), None)[1]


def solve() -> None:
    """Find the contribution."""
    given = plan()
    flow = replace(given.cash_flows[0], amount=None)
    requirement(replace(given, cash_flows=(flow,)), "contribution", 0.85)


def seconds(work: Callable[[], None]) -> float:
    """Time one call."""
    start = time.perf_counter()
    work()
    return time.perf_counter() - start


COMPARED = (
    ("chance of 30 years monthly", without_bands, "10,000 sampled paths", sample, 0.5),
    ("with yearly bands, over HTTP", over_http, "10,000 sampled paths", sample, 1.0),
    ("contribution for 85 %", solve, "one outlook", whole(30), 8.0),
    ("600 months", whole(50), "360 months", whole(30), 2.5),
)


def measure() -> bool:
    """Print the rows; tell whether all promises are kept."""
    kept = True
    print("\ngoals")
    for name, work, other, peer, most in COMPARED:
        pairs = [(seconds(work), seconds(peer)) for _ in range(ROUNDS + 2)][2:]
        ratio = statistics.median(ours / theirs for ours, theirs in pairs)
        ours, theirs = (statistics.median(column) * 1e3 for column in zip(*pairs, strict=True))
        print(f"{name:30}{ours:8.1f} ms; {other} {theirs:.1f} ms; {ratio:.2f} times (at most {most})")
        kept = kept and ratio <= most
    return kept
