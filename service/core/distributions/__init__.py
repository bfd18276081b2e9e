"""Distribution families and the questions that every one of them answers."""

from service.core.distributions import families
from service.core.distributions.family import FAMILIES, Family

__all__ = ["FAMILIES", "Family", "families"]
