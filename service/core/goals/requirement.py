"""What a plan needs to succeed with a wanted probability."""

from dataclasses import dataclass
from typing import NamedTuple

from service.core.goals.outlook import Caution, Outlook
from service.core.goals.plan import Plan

SOLVE_FOR = ("contribution", "initial_value", "target", "horizon_years", "withdrawal")
OF = ("success", "solvency")
WHICH = ("first", "last")


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
    is reached at every later step too.
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


def requirement(plan: Plan, solve_for: str, wanted: float, of: str = "success", which: str = "first") -> Requirement:
    """Solve for what the plan leaves open, so that it succeeds with probability `wanted`, in [1e-6, 1 - 1e-6].

    The unknown is None in the plan (`targets` empty): for "contribution" and "withdrawal" the amount of exactly one
    flow. `of` "solvency" asks that every withdrawal is paid, whatever is left. `which`, for horizon_years: the first
    step at which the probability is reached, or the last up to which it holds at every step. Raises DoesNotFit.
    """
    raise NotImplementedError
