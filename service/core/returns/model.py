"""What a return model declares, and what follows from the declaration."""

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import ClassVar

from service.core.arrays import Numbers
from service.core.declared import Declared, Parameterisation
from service.core.distributions.family import Moments
from service.core.errors import Refusal
from service.core.parameters import Parameter
from service.core.returns.law import HorizonLaw

LARGEST = 1e6
"""No return of one period is larger: powers of it stay within the doubles."""
RETURN_MODELS: dict[str, type["ReturnModel"]] = {}
"""Every return model by its name, in the order of the files."""


@dataclass(frozen=True, slots=True)
class Option:
    """A word beside the parameters that says how they are to be read.

    `ways`: by each word the way to give the parameters, None for the parameters as the model declares them; the first
    word is the default.
    """

    name: str
    meaning: str
    ways: Mapping[str, Parameterisation | None]


class ReturnModel(Declared):
    """Base of every model of the return of one period.

    A model gives `moments` of its one-period return, and the law of the return over any whole number of periods, or
    over parts of them where its law divides. Its docstring opens with one sentence on what the model is used for, then
    names law and source.
    """

    compoundings: ClassVar[tuple[str, ...]] = ("simple", "continuous")
    """How the modelled return makes the growth factor: "simple" 1 + Y, "continuous" exp(Y)."""
    divides: ClassVar[tuple[str, ...]] = ()
    """The compoundings under which the law of any number of periods, also a fraction, is known in closed form."""
    predictive: ClassVar[tuple[str, ...]] = ()
    """The compoundings under which the uncertainty of the estimates can be included."""
    normally_distributed: ClassVar[bool] = False
    """Whether the sampling errors of normal observations apply to the parameters."""
    option: ClassVar[Option | None] = None
    """A choice between several readings of the parameters, if the model has one."""

    stacks: ClassVar[bool] = True
    """Whether the parameters of several portfolios go side by side into arrays."""

    def __init_subclass__(cls) -> None:
        cls.declare()
        cls.stacks = all(isinstance(p, Parameter) for p in cls.parameterisations[0].parameters.values())
        if cls.name in RETURN_MODELS:
            raise TypeError(f"the return model {cls.name} is declared twice")
        missing = {"moments", "horizon_law"} - set(vars(cls))
        if missing:
            raise TypeError(f"{cls.name}: {sorted(missing)} are needed")
        RETURN_MODELS[cls.name] = cls

    @classmethod
    def way(cls, chosen: str | None = None) -> Parameterisation:
        """Give the way to give the parameters under a choice of the model's option; None is the default."""
        way = cls.option.ways[chosen] if cls.option and chosen else None
        return way or cls.parameterisations[0]

    def refusals(self, compounding: str) -> Iterator[Refusal]:
        """Give what does not fit in these parameters under this compounding; paths lead from the returns."""
        if compounding not in self.compoundings:
            params = {"model": self.name, "available": list(self.compoundings), "given": compounding}
            detail = f"The model {self.name} takes compounding {' or '.join(self.compoundings)}; it is {compounding}."
            yield Refusal(("compounding",), "compounding_not_available", detail, params)

    def moments(self) -> Moments:
        """Moments of the return of one period as modelled; skewness and kurtosis of a point mass are nan."""
        raise NotImplementedError

    def moments_under(self, compounding: str) -> Moments:  # noqa: ARG002 - most models are of the return itself
        """Give the moments of the return of one period, where they depend on how it compounds."""
        return self.moments()

    def horizon_law(self, periods: Numbers, compounding: str) -> HorizonLaw:
        """Give the law of the simple return over so many independent periods: whole, or any where the law divides.

        Over several periods each growth factor is max(G, 0), so that a total loss is final.
        """
        raise NotImplementedError

    def predictive_law(self, periods: Numbers, compounding: str, sample_size: Numbers) -> HorizonLaw:
        """Give the same with the parameters known only from `sample_size` periods; for compoundings in `predictive`."""
        raise NotImplementedError
