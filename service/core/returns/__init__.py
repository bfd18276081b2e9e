"""Return models of a portfolio, and the law of its return over a horizon."""

from service.core.returns import models
from service.core.returns.horizon import PERIODS_PER_YEAR, Returns, law_of_horizon
from service.core.returns.law import HorizonLaw
from service.core.returns.model import RETURN_MODELS, ReturnModel

__all__ = ["PERIODS_PER_YEAR", "RETURN_MODELS", "HorizonLaw", "ReturnModel", "Returns", "law_of_horizon", "models"]
