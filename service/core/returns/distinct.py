"""Laws that are made one by one, for a model that holds many portfolios."""

from collections.abc import Callable
from typing import TypeVar

import numpy as np

from service.core.returns.law import HorizonLaw
from service.core.returns.laws.collected import CollectedLaw, Positions
from service.core.returns.model import ReturnModel
from service.core.returns.work import MOST_LAWS, refuse_beyond, refuse_work

SAMPLED = 20
"""After so many laws the work for all of them is foreseen."""

M = TypeVar("M", bound=ReturnModel)


def law_of_each(model: M, make: Callable[[M], HorizonLaw]) -> HorizonLaw:
    """Give make(model), or where its parameters are arrays the laws side by side, each distinct one made once."""
    single = split(model)
    if single is None:
        return make(model)
    models, places = single
    refuse_beyond(len(models), MOST_LAWS)
    parts: list[tuple[HorizonLaw, Positions]] = []
    work = 0.0
    for index, one in enumerate(models):
        law = make(one)
        work += law.work
        if index + 1 == SAMPLED:
            refuse_work(work * len(models) / SAMPLED)
        refuse_work(work)
        parts.append((law, np.flatnonzero(places == index)))
    return CollectedLaw(parts, places.size)


def split(model: M) -> tuple[list[M], Positions] | None:
    """Give the distinct portfolios of a model, and for each portfolio which of them it is; None if it holds but one."""
    columns = np.broadcast_arrays(*vars(model).values())
    if not columns[0].ndim:
        return None
    rows, places = np.unique(np.stack(columns, axis=-1), axis=0, return_inverse=True)
    names = list(vars(model))
    return [type(model)(**dict(zip(names, row, strict=True))) for row in rows], places.ravel()
