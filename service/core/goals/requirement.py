"""What a plan needs to succeed with a wanted probability."""

from collections.abc import Iterator
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from service.core.errors import DoesNotFit, Refusal
from service.core.goals.boundary import FARTHEST, Boundary, greatest_reaching, least_reaching
from service.core.goals.evaluation import chance, final_wealth
from service.core.goals.horizon_search import horizon_search
from service.core.goals.outlook import Caution, Outlook, outlook
from service.core.goals.plan import Plan
from service.core.goals.unknown import FLOWS, Unknown, unknown_of
from service.core.goals.work import Work

OF = ("success", "solvency")
WHICH = ("first", "last")
LEAST_WANTED = 1e-6
ROUNDED_TO = (1.0, 10.0, 100.0)
JUMP = 1e-10
"""A probability that misses the wanted one by more does so because it jumps."""
TIE = 1e-12
"""A probability that falls short by less reaches the wanted one."""
LARGEST_ROUNDED = 1e15


class Rounded(NamedTuple):
    """The value rounded to the safe side, to a multiple of `to`, and the probability it gives."""

    to: float
    value: float
    success_probability: float


@dataclass(frozen=True)
class Requirement:
    """`outcome` "found" or "unattainable"; then `value` is nan, `rounded` empty and `outlook` None.

    `value` is in the unknown field's own sign, `value_path` leads to that field. `attainable_success_probability` is
    the best chance there is, None where found. `holds_after`, for horizon_years alone: whether the wanted probability
    is reached at every later step too. `rounded` is empty for horizon_years. With `of` "solvency" the probabilities
    here are those of paying every withdrawal.
    """

    solve_for: str
    outcome: str
    value: float
    value_path: tuple[str | int, ...]
    rounded: tuple[Rounded, ...]
    attainable_success_probability: float | None
    holds_after: bool | None
    outlook: Outlook | None
    method: str
    numerical_error: float
    numerical_error_kind: str
    cautions: tuple[Caution, ...]


class _Answer(NamedTuple):
    """A size of the unknown and the probability there (the best one, where no size will do)."""

    size: float
    probability: float
    found: bool = True
    holds_after: bool | None = None


def requirement(plan: Plan, solve_for: str, wanted: float, of: str = "success", which: str = "first") -> Requirement:
    """Solve for what the plan leaves open, so that it succeeds with probability `wanted`, in [1e-6, 1 - 1e-6].

    The unknown is None in the plan (`targets` empty): for "contribution" and "withdrawal" the amount of exactly one
    flow. Least value of what helps, greatest size of what hurts. `of` "solvency" asks that every withdrawal is paid,
    whatever is left. `which`, for horizon_years: the first step at which the probability is reached, or the last up to
    which it holds at every step. |P - wanted| <= 1e-10 unless P jumps there (a caution says so). Raises DoesNotFit.
    """
    refusals = list(_misfits(solve_for, wanted, of, which))
    if refusals:
        raise DoesNotFit(refusals)
    unknown, work = unknown_of(plan, solve_for), Work()
    with np.errstate(all="ignore"):
        if solve_for == "horizon_years":
            answer = _Answer(*horizon_search(plan, wanted, of == "solvency", which == "last", work))
        elif solve_for == "target":
            answer = _greatest_target(plan, wanted, work)
        else:
            answer = _root(plan, unknown, wanted, of == "solvency", work)
        rounded = tuple(_rounded(plan, unknown, answer, wanted, of == "solvency", work))
    return _told(plan, unknown, answer, wanted, rounded)


def _told(plan: Plan, unknown: Unknown, answer: _Answer, wanted: float, rounded: tuple[Rounded, ...]) -> Requirement:
    found = outlook(unknown.filled(plan, answer.size)) if answer.found else None
    searched = unknown.solve_for not in {"target", "horizon_years"}
    jumps = answer.found and searched and abs(answer.probability - wanted) > JUMP and answer.size > 0
    return Requirement(
        solve_for=unknown.solve_for,
        outcome="found" if answer.found else "unattainable",
        value=unknown.sign * answer.size if answer.found else np.nan,
        value_path=unknown.path,
        rounded=rounded,
        attainable_success_probability=None if answer.found else answer.probability,
        holds_after=answer.holds_after,
        outlook=found,
        method="bracketed_root_of_outlook" if searched or found is None else found.method,
        numerical_error=found.numerical_error if found else 1e-11,
        numerical_error_kind="estimate",
        cautions=(Caution("success_jumps"),) if jumps else (),
    )


def _misfits(solve_for: str, wanted: float, of: str, which: str) -> Iterator[Refusal]:
    for name, value, allowed in (("of", of, OF), ("which", which, WHICH)):
        if value not in allowed:
            detail = f"{name} is one of {', '.join(allowed)}; it is {value}."
            yield Refusal((name,), "unknown_choice", detail, {"allowed": list(allowed), "given": value})
    if solve_for == "target" and of == "solvency":
        detail = "Whether every withdrawal is paid does not depend on the target."
        yield Refusal(("of",), "does_not_go_together", detail, {"with": "solve_for"})
    if not LEAST_WANTED <= wanted <= 1 - LEAST_WANTED:
        code = "must_be_at_least" if wanted < LEAST_WANTED else "must_be_at_most"
        detail = f"wanted_success_probability lies from 1e-6 to 1 - 1e-6; it is {wanted:.15g}."
        yield Refusal(("wanted_success_probability",), code, detail, {"given": wanted})


def _root(plan: Plan, unknown: Unknown, wanted: float, solvency: bool, work: Work) -> _Answer:
    """Search for the size of a flow or of the initial value."""

    def probability(size: float) -> float:
        return chance(unknown.filled(plan, size), solvency, work)

    none, scale = Boundary(0.0, probability(0.0)), _scale(plan, unknown)
    reached = none.probability >= wanted - TIE
    if unknown.falls:
        found = greatest_reaching(probability, wanted, none, scale) if reached else None
        best = none.probability
    else:
        found = none if reached else least_reaching(probability, wanted, none, scale)
        best = 0.0 if found else probability(FARTHEST * scale)
    return _Answer(np.nan, best, found=False) if found is None else _Answer(found.value, found.probability)


def _scale(plan: Plan, unknown: Unknown) -> float:
    """Give a size of the unknown that is of the order of the plan's money."""
    horizon = plan.horizon_years or 0.0
    flows = [abs(flow.amount or 0.0) * float(flow.growth(horizon).sum()) for flow in plan.cash_flows]
    total = (plan.initial_value or 0.0) + max(plan.targets, default=0.0) + sum(flows)
    if unknown.solve_for in FLOWS:
        total /= max(float(plan.cash_flows[unknown.flow].growth(horizon).sum()), 1.0)
    return total if 0 < total < np.inf else 1.0


def _greatest_target(plan: Plan, wanted: float, work: Work) -> _Answer:
    """One run, and the quantile of what is there at the horizon."""
    wealth = final_wealth(plan, work)
    solvent = wealth.solvent_at_least(0.0)
    if solvent < wanted - TIE:
        return _Answer(np.nan, solvent, found=False)
    target = wealth.greatest_reached(wanted)
    return _Answer(target, wealth.solvent_at_least(target))


def _rounded(
    plan: Plan, unknown: Unknown, answer: _Answer, wanted: float, solvency: bool, work: Work
) -> Iterator[Rounded]:
    """Round to the safe side, and one step further where that does not reach the wanted probability."""
    if not answer.found or unknown.solve_for == "horizon_years" or answer.size > LARGEST_ROUNDED:
        return
    for to in ROUNDED_TO:
        steps = answer.size / to
        nearest = np.rint(steps)
        whole = nearest if abs(steps - nearest) < 1e-9 else np.floor(steps) if unknown.falls else np.ceil(steps)
        size = float(whole * to)
        reached = chance(unknown.filled(plan, size), solvency, work)
        if reached < wanted - TIE:
            size = max(size - to, 0.0) if unknown.falls else size + to
            reached = chance(unknown.filled(plan, size), solvency, work)
        yield Rounded(to, unknown.sign * size, reached)
