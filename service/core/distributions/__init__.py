"""Distribution families and the questions that every one of them answers."""

from service.core.distributions import families
from service.core.distributions.description import Description, describe
from service.core.distributions.events import Chances, Event, chances
from service.core.distributions.family import FAMILIES, Family
from service.core.distributions.quantiles import Interval, Quantile, central_interval, quantile

__all__ = [
    "FAMILIES",
    "Chances",
    "Description",
    "Event",
    "Family",
    "Interval",
    "Quantile",
    "central_interval",
    "chances",
    "describe",
    "families",
    "quantile",
]
