"""Many portfolios as one law: those of one model become arrays, the others answer one by one."""

from collections.abc import Hashable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from service.core.distributions.family import Moments
from service.core.errors import DoesNotFit, Refusal
from service.core.returns import HorizonLaw, Returns, law_of_horizon
from service.core.returns.horizon import placed
from service.core.returns.laws.collected import CollectedLaw, Part, Positions, side_by_side, stacked
from service.core.returns.work import refuse_work


@dataclass(frozen=True)
class Portfolios:
    """The portfolios to compare: one Returns each, or one whose parameters are arrays (columns)."""

    returns: Sequence[Returns] | Returns
    names: Sequence[str | None] = ()

    @property
    def count(self) -> int:
        """How many there are."""
        if isinstance(self.returns, Returns):
            model = self.returns.model
            return int(np.broadcast(*vars(model).values()).size) if model.stacks else 1
        return len(self.returns)

    def name(self, index: int, opening: bool = False) -> str:
        """Give the name of a portfolio, or its place in the list; `opening` a sentence or not."""
        given = self.names[index] if index < len(self.names) else None
        if given is not None:
            return given
        return f"{'Portfolio' if opening else 'portfolio'} {index + 1}"


@dataclass(frozen=True)
class Collection:
    """The law of all portfolios side by side, the moments of their one-period returns, and the groups behind it."""

    law: CollectedLaw
    moments: Moments
    groups: tuple[tuple[Returns, Positions], ...]


def collected(portfolios: Portfolios, horizon_years: float, parameter_uncertainty: str) -> Collection:
    """Group the portfolios and give their laws as one. Raises DoesNotFit; paths lead from the question."""
    asked = portfolios.returns
    columns = isinstance(asked, Returns)
    groups = [(asked, np.arange(portfolios.count))] if isinstance(asked, Returns) else _grouped(asked)
    parts: list[Part] = []
    refusals: list[Refusal] = []
    work = 0.0
    for returns, positions in groups:
        try:
            law = law_of_horizon(returns, horizon_years, parameter_uncertainty)
            work += law.work
            refuse_work(work)
            parts += _parts(law, positions)
        except DoesNotFit as unfit:
            refusals += [
                placed(refusal, ("portfolio_columns",)) if columns else _placed_in_rows(refusal, positions)
                for refusal in unfit.refusals
            ]
    if refusals:
        raise DoesNotFit(refusals)
    moments = [stacked(returns.moments()) for returns, _ in groups]
    joined = side_by_side(moments, [positions for _, positions in groups], portfolios.count)
    return Collection(CollectedLaw(parts, portfolios.count), Moments(*joined), tuple(groups))


def _parts(law: HorizonLaw, positions: Positions) -> list[Part]:
    """Give a law as a part of the whole, or the parts that it is made of itself."""
    if isinstance(law, CollectedLaw):
        return [(part, positions[at]) for part, at in law.parts]
    return [(law, positions)]


def _placed_in_rows(refusal: Refusal, positions: Positions) -> Refusal:
    """Lead a refusal about a group to the row it is about: an entry of a stacked array is a row."""
    *path, last = refusal.path
    if isinstance(last, int):
        return placed(replace(refusal, path=tuple(path)), ("portfolios", int(positions[last]), "returns"))
    return placed(refusal, ("portfolios", int(positions[0]), "returns"))


def _grouped(rows: Sequence[Returns]) -> list[tuple[Returns, Positions]]:
    """Gather the rows that can be stacked into arrays, and of the others, those that are equal."""
    places: dict[Hashable, list[int]] = {}
    for index, row in enumerate(rows):
        alike = (type(row.model), row.period, row.periods_per_year, row.compounding, row.sample_size is None)
        same = () if row.model.stacks else tuple(value.tobytes() for value in vars(row.model).values())
        places.setdefault((alike, same), []).append(index)
    return [(_stacked([rows[i] for i in indices]), np.array(indices)) for indices in places.values()]


def _stacked(rows: Sequence[Returns]) -> Returns:
    """Give one Returns that holds the rows' parameters as arrays, or as they are where all rows have the same."""
    first = rows[0]
    if len(rows) == 1 or not first.model.stacks:
        return first
    columns = {name: np.array([getattr(row.model, name) for row in rows]) for name in vars(first.model)}
    sizes = None if first.sample_size is None else np.array([row.sample_size for row in rows], np.float64)
    return replace(first, model=type(first.model)(**columns), sample_size=sizes)
