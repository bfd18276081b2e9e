"""The best long-only mix by one of three objectives, with a certificate of how exactly it is best."""

import math
from dataclasses import dataclass

import numpy as np

from service.core.arrays import Numbers
from service.core.errors import DoesNotFit, Refusal
from service.core.portfolio.allocation.frontier import RIDGE, Frontier, filled
from service.core.portfolio.allocation.objectives import OBJECTIVES, misdirection
from service.core.portfolio.allocation.search import END, Search

__all__ = ["OBJECTIVES", "Allocation", "allocate"]

SUM_TOLERANCE = 1e-12
POLISHINGS = 2
NO_RISK = 1e-6
"""A mix with so small a share of the largest standard deviation has none."""
KINK = 1e-3
PENALTY = 1e4


@dataclass(frozen=True, slots=True)
class Allocation:
    """The mix, its mean and standard deviation of one period, and its distance from being best.

    `kkt_violation` is the largest of: stationarity residual / (1 + |gradient|), infeasibility, violated limit and
    complementarity (Karush 1939; Kuhn & Tucker 1951).
    """

    weights: Numbers
    mean: float
    standard_deviation: float
    kkt_violation: float


def allocate(
    objective: str, means: Numbers, covariance: Numbers, floor: float, z: float, least: Numbers, most: Numbers
) -> Allocation:
    """Give the best mix: weights add to 1, each from `least` to `most` (within 0 and 1).

    `means` (n), `covariance` (n, n, positive semidefinite) and `floor` are of one period; `z` > 0 is how many standard
    deviations below the mean the quantile of the objective lies (not used by safety_first_ratio). Raises DoesNotFit.
    Against a general optimiser: never worse by more than 1e-14; kkt_violation about 1e-15, 1e-10 for a covariance of
    low rank. About ten pieces of the frontier are looked at.
    """
    most = checked_limits(least, most)
    top = float(means @ filled(least, most, -means))
    frontier = Frontier(means, covariance, least.copy(), most)
    _refuse_without_solution(objective, top, floor, frontier)
    found = Search(frontier, OBJECTIVES[objective](floor, z))
    typical = math.sqrt(frontier.scale)
    ended = False
    if objective == "safety_first_ratio":
        lam, _ = found.optimum(0.0, frontier.scale / (top - floor) / 2)
    elif objective == "quantile_return":
        lam, _ = found.optimum(0.0, typical / z * 0.7)
    else:
        lam, ended = _most_return(found, top, typical)
    frontier.solve(lam)
    mix, lam = _finished(found, lam, ended)
    deviation = _deviation(mix, covariance)
    if objective == "quantile_return" and deviation <= KINK * typical:
        without_risk = _at_the_kink(means, covariance, z, least, most)
        if without_risk is not None:
            return without_risk
    if objective == "safety_first_ratio" and deviation <= NO_RISK * typical:
        raise without_risk_refusal("A mix without risk lies above the floor: no ratio is the greatest.")
    return Allocation(mix, float(means @ mix), deviation, violation(found, mix, ended, lam))


def checked_limits(least: Numbers, most: Numbers) -> Numbers:
    """Refuse limits that no mix can keep, and give the upper ones that can be reached."""
    if (least > most).any() or least.sum() > 1 + SUM_TOLERANCE or most.sum() < 1 - SUM_TOLERANCE:
        words = f"Weights from {least.sum():.6g} to {most.sum():.6g} in all cannot add up to 1 within their limits."
        params = {"least": float(least.sum()), "most": float(most.sum())}
        raise DoesNotFit([Refusal(("weight_limits",), "weight_limits_infeasible", words, params)])
    reachable: Numbers = np.minimum(most, 1 - (least.sum() - least))
    return reachable


def without_risk_refusal(words: str) -> DoesNotFit:
    """Refuse a question that a mix without risk answers by an infinite ratio."""
    return DoesNotFit([Refusal(("threshold",), "threshold_without_risk", words)])


def _refuse_without_solution(objective: str, top: float, floor: float, frontier: Frontier) -> None:
    if objective == "safety_first_ratio" and top <= floor + 1e-15 * (1 + abs(floor)):
        words = f"No mix has an expected return above the floor; the greatest is {top:.6g} a period."
        raise DoesNotFit([Refusal(("threshold",), "no_mix_above_threshold", words, {"greatest_expected_return": top})])
    if float(np.diag(frontier.covariance).max()) <= 0:
        raise without_risk_refusal("No asset has any risk: there is nothing to weigh.")


def _most_return(found: Search, top: float, typical: float) -> tuple[float, bool]:
    """Telser: beyond the safest quantile, to where the quantile falls to the floor or the frontier ends."""
    frontier, z, floor = found.frontier, found.objective.z, found.objective.floor
    safest = Search(frontier, OBJECTIVES["quantile_return"](floor, z))
    lam, _ = safest.optimum(0.0, typical / z * 0.7)
    frontier.solve(lam)
    mean = float(frontier.means @ frontier.weights)
    best = mean - z * _deviation(frontier.weights, frontier.risk)
    if best < floor - 1e-13:
        words = f"No mix keeps the limit: the best quantile of any is {best:.6g} a period, below the floor."
        raise DoesNotFit(
            [Refusal(("limits", "shortfall_probability"), "no_admissible_mix", words, {"best_quantile": best})]
        )
    lam, at = found.optimum(lam, lam * 1.5, top)
    return (at, True) if lam == END else (lam, False)


def _finished(found: Search, lam: float, ended: bool) -> tuple[Numbers, float]:
    """Polish the mix as long as that brings it nearer to being best."""
    frontier = found.frontier
    mix = frontier.weights.copy()
    for _ in range(POLISHINGS):
        better = found.polished(lam, ended)
        if better is None or violation(found, better[0], ended, better[1]) > violation(found, mix, ended, lam):
            break
        mix, lam = better
        frontier.weights = mix.copy()
    return mix, lam


def violation(found: Search, mix: Numbers, ended: bool, lam: float) -> float:
    """Give the largest violation of the conditions of optimality (see Allocation)."""
    frontier, objective = found.frontier, found.objective
    mean, deviation = float(frontier.means @ mix), _deviation(mix, frontier.covariance)
    beyond = np.maximum(frontier.least - mix, mix - frontier.most)
    infeasible = max(abs(float(mix.sum()) - 1), float(beyond.max()))
    if objective.name == "expected_return":
        slack = mean - objective.z * deviation - objective.floor
        infeasible = max(infeasible, -slack, 0.0 if ended else abs(slack))
    pull = frontier.covariance @ mix
    gradient = objective.gradient(frontier.means, pull, mean, deviation, np.inf if ended else lam)
    residual = misdirection(gradient, mix, frontier.least, frontier.most)
    return max(residual / (1 + float(np.abs(gradient).max())), infeasible)


def _deviation(mix: Numbers, risk: Numbers) -> float:
    return math.sqrt(max(float(mix @ risk @ mix), 0.0))


def _at_the_kink(means: Numbers, covariance: Numbers, z: float, least: Numbers, most: Numbers) -> Allocation | None:
    """Kataoka's optimum where the mix has no risk and m - z s a kink: the greatest mean with risk penalised far beyond.

    The certificate: big Sw/lam is a subgradient of z s while its length, big s/lam, is at most z.
    """
    frontier = Frontier(means, covariance * PENALTY, least.copy(), most)
    frontier.ridge = RIDGE * frontier.scale / PENALTY
    frontier.risk = covariance * PENALTY + frontier.ridge * np.eye(means.size)
    lam = frontier.scale / PENALTY * 1e-3 / max(float(np.ptp(means)), 1e-12)
    frontier.solve(lam)
    mix = frontier.weights.copy()
    deviation = _deviation(mix, covariance)
    typical = math.sqrt(frontier.scale / PENALTY)
    if deviation > NO_RISK * typical or PENALTY * deviation / lam > z * (1 + 1e-6):
        return None
    gradient = means - frontier.risk @ mix / lam
    residual = misdirection(gradient, mix, least, most) / (1 + float(np.abs(gradient).max()))
    return Allocation(mix, float(means @ mix), deviation, residual)
