"""Plans with cash flows: their chances, and what they need."""

from service.core.goals.cash_flow import CashFlow
from service.core.goals.lifetime import GompertzLife, Lifetime, TableLife
from service.core.goals.outlook import Outlook, outlook
from service.core.goals.plan import Leg, Plan, Shock
from service.core.goals.requirement import Requirement, requirement

__all__ = [
    "CashFlow",
    "GompertzLife",
    "Leg",
    "Lifetime",
    "Outlook",
    "Plan",
    "Requirement",
    "Shock",
    "TableLife",
    "outlook",
    "requirement",
]
