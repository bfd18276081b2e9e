"""The largest error of each family against mpmath, in the body and in the tails, as README's table.

python -m tests.benchmarks.accuracy
"""

from typing import Any

from service.core.distributions import FAMILIES
from tests.core.distributions.test_reference import answers, relative_error, rows_of

TAIL = 1e-3
"""A probability below this, or above one minus this, lies in a tail."""
HEADINGS = (
    "family",
    "probability, body",
    "probability, tails",
    "quantile, body",
    "quantile, tails",
    "density",
    "moments",
)


def column(row: dict[str, Any]) -> int:
    """Give the column of the table that a reference row counts in."""
    if row["question"] == "moments":
        return 6
    if row["question"] == "density":
        return 5
    by_quantile = row["question"].startswith("quantile")
    probability = float(row["at"] if by_quantile else row["expected"])
    return 1 + 2 * int(by_quantile) + int(probability < TAIL)


def errors(family: str) -> list[float]:
    """Give the largest relative error of each column."""
    worst = [0.0] * len(HEADINGS)
    for row in rows_of(family):
        at = column(row)
        worst[at] = max(worst[at], *(relative_error(given, expected) for given, expected in answers(row, family)))
    return worst[1:]


def table() -> str:
    """Write the table in Markdown."""
    lines = ["| " + " | ".join(HEADINGS) + " |", "|---" * len(HEADINGS) + "|"]
    lines += [
        f"| `{family}` | " + " | ".join(f"{error:.0e}" if error else "0" for error in errors(family)) + " |"
        for family in sorted(FAMILIES)
    ]
    return "\n".join(lines)


if __name__ == "__main__":
    print(table())
