"""What a plan leaves open, and the plan with it filled in."""

from collections.abc import Iterator
from dataclasses import dataclass, replace

from service.core.errors import DoesNotFit, Refusal
from service.core.goals.plan import Plan

SOLVE_FOR = ("contribution", "initial_value", "target", "horizon_years", "withdrawal")
FLOWS = ("contribution", "withdrawal")


@dataclass(frozen=True)
class Unknown:
    """The place that is open. For a flow: its index, and `sign`, what a size of 1 stands for in its amount."""

    solve_for: str
    path: tuple[str | int, ...]
    flow: int = 0
    sign: float = 1.0

    @property
    def falls(self) -> bool:
        """Whether the chance falls as the size grows."""
        return self.solve_for in {"withdrawal", "target"}

    def filled(self, plan: Plan, size: float) -> Plan:
        """Give the plan with this size of the unknown."""
        if self.solve_for == "initial_value":
            return replace(plan, initial_value=size)
        if self.solve_for == "horizon_years":
            shock = plan.shock if plan.shock and plan.shock.at_year < size else None
            return replace(plan, horizon_years=size, shock=shock)
        if self.solve_for == "target":
            return replace(plan, targets=(size,))
        flow = replace(plan.cash_flows[self.flow], amount=self.sign * size)
        return replace(plan, cash_flows=(*plan.cash_flows[: self.flow], flow, *plan.cash_flows[self.flow + 1 :]))


def unknown_of(plan: Plan, solve_for: str) -> Unknown:
    """Find what is left open, or refuse a plan that leaves open something else. Raises DoesNotFit."""
    refusals = list(_misfits(plan, solve_for))
    if refusals:
        raise DoesNotFit(refusals)
    if solve_for not in FLOWS:
        return Unknown(solve_for, (solve_for,))
    (index,) = (i for i, flow in enumerate(plan.cash_flows) if flow.amount is None)
    if plan.horizon_years is not None and not plan.cash_flows[index].times(plan.horizon_years).size:
        detail = "The flow that is sought never comes before the horizon."
        raise DoesNotFit(
            [Refusal(("cash_flows", index), "no_such_flow", detail, {"horizon_years": plan.horizon_years})]
        )
    sign = 1.0 if solve_for == "contribution" else -1.0
    return Unknown(solve_for, ("cash_flows", index, "amount"), index, sign)


def _misfits(plan: Plan, solve_for: str) -> Iterator[Refusal]:
    if solve_for not in SOLVE_FOR:
        detail = f"solve_for is one of {', '.join(SOLVE_FOR)}; it is {solve_for}."
        yield Refusal(("solve_for",), "unknown_choice", detail, {"allowed": list(SOLVE_FOR), "given": solve_for})
        return
    given = {
        "initial_value": plan.initial_value is not None,
        "horizon_years": plan.horizon_years is not None,
        "target": bool(plan.targets),
    }
    for name, is_given in given.items():
        if name == solve_for and is_given:
            detail = f"{name} is solved for; leave it out."
            yield Refusal((name,), "does_not_go_together", detail, {"with": "solve_for"})
        if name != solve_for and not is_given:
            yield Refusal((name,), "required", f"{name} is needed.", {"by": "solve_for"})
    open_flows = [index for index, flow in enumerate(plan.cash_flows) if flow.amount is None]
    wanted = 1 if solve_for in FLOWS else 0
    for index in open_flows[wanted:]:
        yield Refusal(("cash_flows", index, "amount"), "required", "The amount of this flow is needed.", {})
    if len(open_flows) < wanted:
        detail = f"solve_for {solve_for}: leave out the amount of one cash flow."
        yield Refusal(("cash_flows",), "required", detail, {"by": "solve_for"})
