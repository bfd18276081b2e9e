"""Rankings: the shape of both forms of the answer, and the values in that shape."""

from collections.abc import Mapping
from typing import Any

import numpy as np

from service.core.portfolio.criteria import CRITERIA
from service.core.portfolio.question import Ranking
from service.schemas.answers import AnswerShape, Caution, Plain, Ranks, Result, Single, write_plain
from service.schemas.cautions import sentence
from service.schemas.shapes import COUNT, ONE, TEXT, Each, Fixed, Group, Shape, open_object
from service.schemas.shortfall import outcomes_shape, rows_of, shortfall_shape, shortfall_values

RANK = {"type": ["integer", "null"], "description": "1 is best; ties share a rank; null for inadmissible ones"}
NAME = {"type": ["string", "null"]}
TRUTH = {"type": "boolean"}


def _list_of(schema: Mapping[str, Any]) -> dict[str, Any]:
    return {"type": "array", "items": schema}


def _entry(many: bool) -> dict[str, Shape]:
    head: dict[str, dict[str, Any]] = {
        "rank": RANK,
        "index": COUNT | {"description": "place in the request, from 0"},
        "name": NAME,
        "admissible": TRUTH,
    }
    members: dict[str, Shape] = {n: Fixed(_list_of(s) if many else s) for n, s in head.items()}
    return members | shortfall_shape(many) | outcomes_shape(many)


PAIR = {"type": "array", "items": TEXT, "minItems": 2, "maxItems": 2}
DOMINATED = open_object(
    {
        "index": COUNT,
        "name": NAME,
        "by_index": COUNT,
        "by_name": NAME,
        "order": COUNT | {"enum": [1, 2]},
        "basis": TEXT | {"description": "exact or numerical"},
    }
)
COMMON: dict[str, Shape] = {
    "ranks_by_criterion": Fixed(open_object(dict.fromkeys(CRITERIA, _list_of(RANK)))),
    "agreement": Fixed({"type": ["array", "null"], "items": open_object({"criteria": PAIR, "kendall_tau_b": ONE})}),
    "dominated": Fixed({"type": ["array", "null"], "items": DOMINATED}),
    "confidence_in_leader": Group(
        dict.fromkeys(("probability", "at_least", "at_most"), Fixed(ONE)),
        "how probable it is that the leader truly leads, given sample_size",
        nullable=True,
    ),
    "pairwise_confidence": Fixed(
        {"type": ["array", "null"], "items": open_object({"index": COUNT, "name": NAME, "probability": ONE})}
    ),
    "summary": Fixed(TEXT | {"description": "one or two sentences made from the figures"}),
}
HEAD: dict[str, Shape] = {"criterion": Fixed(TEXT)}
ROWS = AnswerShape("RankingRows", HEAD | {"ranking": Each(_entry(many=False), "best first")} | COMMON, ("rows",))
COLUMNS = AnswerShape(
    "RankingColumns", HEAD | {"ranking_columns": Group(_entry(many=True), "best first")} | COMMON, ("columns",)
)


def ranking_values(found: Ranking, names: tuple[str | None, ...], *, columns: bool) -> dict[str, Any]:
    """Put a ranking under the names of the contract, as rows or as columns."""
    count = found.order.size
    head = {"rank": found.ranks[found.order], "index": found.order, "admissible": found.admissible[found.order]}
    figures = _ordered(shortfall_values(found.shortfall), found.order)
    ordered_names = [names[i] if names else None for i in found.order.tolist()]
    values: dict[str, Any] = {"form": "columns" if columns else "rows"}
    if columns:
        values |= {
            "length": count,
            "criterion": found.criterion,
            "ranking_columns": {
                "rank": Ranks(head["rank"]),
                "index": head["index"],
                "name": Plain(ordered_names),
                "admissible": head["admissible"],
                **figures,
            },
        }
    else:
        rows = rows_of(head | figures, count)
        values |= {
            "criterion": found.criterion,
            "ranking": [
                {
                    "rank": Ranks(row["rank"]),
                    "index": row["index"],
                    "name": Plain(name),
                    **{n: v for n, v in row.items() if n not in ("rank", "index")},
                }
                for row, name in zip(rows, ordered_names, strict=True)
            ],
        }
    return values | _comparisons(found, names)


def _ordered(values: Any, order: Any) -> Any:
    """Bring figures from the order of the request into that of the ranking."""
    if isinstance(values, dict):
        return {name: _ordered(inner, order) for name, inner in values.items()}
    if isinstance(values, list):
        return [_ordered(inner, order) for inner in values]
    if isinstance(values, (Plain, int)):
        return values
    return np.broadcast_to(values, order.shape)[order]


def _comparisons(found: Ranking, names: tuple[str | None, ...]) -> dict[str, Any]:
    """Give what is said about the portfolios among each other."""

    def name(index: int) -> str | None:
        return names[index] if names else None

    agreement = (
        None
        if found.agreement is None
        else [
            {"criteria": Plain(list(pair.criteria)), "kendall_tau_b": Single(pair.kendall_tau_b)}
            for pair in found.agreement
        ]
    )
    dominated = (
        None
        if found.dominated is None
        else Plain(
            [
                {
                    "index": d.index,
                    "name": name(d.index),
                    "by_index": d.by_index,
                    "by_name": name(d.by_index),
                    "order": d.order,
                    "basis": d.basis,
                }
                for d in found.dominated
            ]
        )
    )
    confidence = found.confidence_in_leader
    pairwise = (
        None
        if found.pairwise_confidence is None
        else Plain(
            [{"index": p.index, "name": name(p.index), "probability": p.probability} for p in found.pairwise_confidence]
        )
    )
    return {
        "ranks_by_criterion": {n: Ranks(ranks) for n, ranks in found.ranks_by_criterion.items()},
        "agreement": agreement,
        "dominated": dominated,
        "confidence_in_leader": None if confidence is None else {n: Single(v) for n, v in confidence._asdict().items()},
        "pairwise_confidence": pairwise,
        "summary": found.summary,
    }


def ranking_cautions(found: Ranking) -> list[Caution]:
    """Give the cautions that the ranking itself raises."""
    return [sentence(caution.code, None, **caution.params) for caution in found.cautions]


def write_ranking(result: Result, length: int | None, fingerprint: str | None) -> dict[str, Any]:  # noqa: ARG001
    """Write an answer whose figures are arrays where it has a length of its own: in columns, also of one portfolio."""
    return write_plain(result, result.figures.get("length"), fingerprint)
