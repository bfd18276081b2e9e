"""Returns bent to a skewness and an excess kurtosis."""

from functools import partial

import numpy as np

from service.core.arrays import INFINITY, NO_VALUE, Numbers, number
from service.core.declared import alternative
from service.core.distributions import FAMILIES
from service.core.distributions.family import Moments
from service.core.distributions.kernels.cornish_fisher import Expansion, shape_moments
from service.core.parameters import Parameter
from service.core.returns.compounding.compound import compounded
from service.core.returns.compounding.growth import Growth, floored
from service.core.returns.compounding.listed import certain
from service.core.returns.compounding.nodes_normal import NormalPart
from service.core.returns.compounding.step import Step
from service.core.returns.distinct import law_of_each
from service.core.returns.law import HorizonLaw, LogGrowth
from service.core.returns.laws.cornish_fisher import CornishFisherLaw, ExponentialCornishFisherLaw
from service.core.returns.laws.lognormal import LognormalLaw
from service.core.returns.matched_moments import matching_parameters
from service.core.returns.model import LARGEST, Option, ReturnModel


def expected() -> Parameter:
    """Declare the mean, which both readings of the parameters share."""
    return Parameter("mean return of one period", at_least=-LARGEST, at_most=LARGEST, example=0.06)


def from_moments(
    expected_return: Numbers, volatility: Numbers, skewness: Numbers, excess_kurtosis: Numbers
) -> dict[str, Numbers]:
    """Give the parameters whose law has these moments."""
    s, k = matching_parameters(skewness, excess_kurtosis)
    spread, _, _ = shape_moments(Expansion.of(s, k))
    return {
        "expected_return": expected_return,
        "volatility": volatility / spread,
        "skewness": s,
        "excess_kurtosis": k,
    }


class CornishFisher(ReturnModel):
    """Returns known by four moments: lopsided, and with more extreme periods than the normal model.

    Y = expected_return + volatility w(Z), w the third-order expansion of Cornish & Fisher (1937), where it is monotone
    (Maillard 2012). Skewness and excess kurtosis are its parameters, not the moments that the law then has, unless the
    moments are to be matched. With continuous compounding Y is the log return.
    """

    name = "cornish_fisher"
    expected_return = expected()
    volatility = Parameter("the scale of the expansion", at_least=0, at_most=LARGEST, example=0.1)
    skewness = Parameter("the skewness put into the expansion", at_least=-3, at_most=3, example=-0.5)
    excess_kurtosis = Parameter("the excess kurtosis put into the expansion", at_least=-1, at_most=20, example=2)
    rules = FAMILIES["cornish_fisher"].rules
    option = Option(
        "moments",
        "parameters (the default): volatility, skewness and excess_kurtosis are put into the expansion; matched: they "
        "are the moments that the law shall have",
        {
            "parameters": None,
            "matched": alternative(
                from_moments,
                expected_return=expected(),
                volatility=Parameter(
                    "standard deviation of the return of one period", at_least=0, at_most=LARGEST, example=0.1
                ),
                skewness=Parameter("skewness of the return", at_least=-5, at_most=5, example=-0.5),
                excess_kurtosis=Parameter("excess kurtosis of the return", at_least=-1, at_most=50, example=2),
            ),
        },
    )

    @property
    def _expansion(self) -> Expansion:
        return Expansion.of(self.skewness, self.excess_kurtosis)

    def moments(self) -> Moments:
        shape = shape_moments(self._expansion)
        mean, deviation, skewness, excess = np.broadcast_arrays(
            self.expected_return, self.volatility * shape[0], *shape[1:]
        )
        spread = deviation > 0
        return Moments(mean, deviation, np.where(spread, skewness, NO_VALUE), np.where(spread, excess, NO_VALUE))

    def horizon_law(self, periods: Numbers, compounding: str) -> HorizonLaw:
        if periods != 1:
            return law_of_each(self, partial(_compounded, periods=int(periods), compounding=compounding))
        law = ExponentialCornishFisherLaw if compounding == "continuous" else CornishFisherLaw
        return law(self.expected_return, self.volatility, self._expansion)


def _compounded(one: CornishFisher, periods: int, compounding: str) -> HorizonLaw:
    mean, scale, expansion = one.expected_return, one.volatility, Expansion.of(one.skewness, one.excess_kurtosis)
    simple = compounding == "simple"
    if scale == 0:
        return certain(np.log1p(mean) if simple else mean, number(periods))
    if not simple and expansion.c3 == 0:
        return LognormalLaw(periods * mean, np.sqrt(number(periods)) * scale)
    part = NormalPart(mean, scale, expansion, simple=simple)
    if simple:
        mirrored = CornishFisherLaw(-mean, scale, Expansion.of(-one.skewness, one.excess_kurtosis))
        growth = floored(CornishFisherLaw(mean, scale, expansion), mirrored)
    else:
        log_growth = LogGrowth(mean, scale * shape_moments(expansion)[0])
        growth = Growth(INFINITY, INFINITY, number(0), log_growth)
    return compounded(Step((part,), growth), periods)
