"""Returns in moves of two sizes."""

from functools import partial

import numpy as np

from service.core.arrays import Numbers
from service.core.distributions.family import Moments
from service.core.parameters import Order, Parameter
from service.core.returns.compounding.binomial import binomial_law, binomial_moments
from service.core.returns.distinct import law_of_each, split
from service.core.returns.law import HorizonLaw
from service.core.returns.model import ReturnModel


class UpDown(ReturnModel):
    """A market that moves up or down by fixed steps, as in a tree of prices.

    One period has `moves` independent moves: up_return with up_probability, else down_return (Cox, Ross & Rubinstein
    1979). With continuous compounding the two are log returns.
    """

    name = "up_down"
    up_return = Parameter("return of a move up", above=-1, at_most=100, example=0.1)
    down_return = Parameter("return of a move down", at_least=-1, at_most=100, example=-0.08)
    up_probability = Parameter("the probability of a move up", at_least=0, at_most=1, example=0.55)
    moves = Parameter("moves in one period", whole=True, at_least=1, at_most=10_000, example=12)
    rules = (Order("down_return", "up_return"),)

    def moments(self) -> Moments:
        return self.moments_under("simple")

    def moments_under(self, compounding: str) -> Moments:
        single = split(self)
        if single is None:
            return binomial_moments(self.up_return, self.down_return, self.up_probability, self.moves, compounding)
        models, places = single
        found = np.array([one.moments_under(compounding) for one in models])
        return Moments(*found.T[:, places])

    def horizon_law(self, periods: Numbers, compounding: str) -> HorizonLaw:
        return law_of_each(self, partial(_law, periods=periods, compounding=compounding))


def _law(one: UpDown, periods: Numbers, compounding: str) -> HorizonLaw:
    return binomial_law(one.up_return, one.down_return, one.up_probability, periods * one.moves, periods, compounding)
