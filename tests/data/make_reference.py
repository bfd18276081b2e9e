"""Recompute the reference values of the distribution families with many digits.

    python -m tests.data.make_reference FILE.json ...          check every `expected` in the files
    python -m tests.data.make_reference --write FILE.json ...  recompute and rewrite them

Needs mpmath alone. Numbers in `parameters` and `at` are taken as the exact doubles that a JSON reader yields, so that
a perfect service could answer float(expected). Tails are computed directly with 80 working digits; 20 are printed.
Caveat: the lognormal quantile is wrong for a log standard deviation near 1e-8 (no row asks for it).
"""

import json
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

from mpmath import exp, inf, log, mp, mpf, nstr

from tests.data import reference_continuous, reference_discrete, reference_normal
from tests.data.reference_functions import Law, Real

DIGITS = 20
NEAR_ENDS = {"uniform", "triangular", "truncated_normal"}
"""Families with finite ends need more digits close to them: 1e-150 + 1 - 1."""


def make_law(family: str, parameters: Any) -> Law:
    name = "gamma_law" if family == "gamma" else family
    for module in (reference_discrete, reference_continuous, reference_normal):
        if name in vars(module):
            law: Law = vars(module)[name](**exact(parameters))
            return law
    raise KeyError(family)


def exact(value: Any) -> Any:
    """JSON value with its numbers as exact mpf."""
    if isinstance(value, dict):
        return {k: exact(v) for k, v in value.items()}
    return [exact(v) for v in value] if isinstance(value, list) else mpf(value)


def tails(law: Law, x: Real) -> tuple[Real, Real]:
    low, high = law.support
    x = mp.floor(x) if law.discrete else x
    if x < low:
        return mpf(0), mpf(1)
    return (mpf(1), mpf(0)) if x >= high else law.both(x)


def quantile(law: Law, p: Real = None, q: Real = None) -> Real:
    """Smallest x with P(X <= x) >= p, or with P(X > x) <= q."""
    if law.invert:
        return law.invert(p, q)

    def high_enough(x: Real) -> bool:
        return bool(tails(law, x)[0] >= p if q is None else tails(law, x)[1] <= q)

    if law.discrete:
        return whole_quantile(law.support, high_enough)

    def gap(x: Real) -> Real:
        low, up = tails(law, x)
        small = low if q is None else up
        return None if small == 0 else (log(low / p) if q is None else log(q / up))

    return real_quantile(law.support, high_enough, gap)


def whole_quantile(support: tuple[Real, Real], high_enough: Callable[[Real], bool]) -> Real:
    low, high = support[0] - 1, support[1]
    step = mpf(1)
    while high == inf or high - low > 1:
        middle = low + step if high == inf else mp.floor((low + high) / 2)
        if high_enough(middle):
            high = middle
        else:
            low, step = middle, 2 * step
    return high


def real_quantile(support: tuple[Real, Real], high_enough: Callable[[Real], bool], gap: Callable[[Real], Real]) -> Real:
    """Bracket on a scale fit for the support, halve, then a secant."""
    low, high = support

    def back(u: Real) -> Real:
        if support == (0, inf):
            return exp(u)
        return mp.sinh(u) if low == -inf else low + (high - low) / (1 + exp(-u))

    left, right = mpf(-1), mpf(1)
    while high_enough(back(left)):
        left *= 2
    while not high_enough(back(right)):
        right *= 2
    while right - left > mpf(10) ** -6 * max(1, abs(left)):
        middle = (left + right) / 2
        left, right = (left, middle) if high_enough(back(middle)) else (middle, right)
    a, b = left, right
    gap_a, gap_b = gap(back(a)), gap(back(b))
    if gap_a is None or gap_b is None:
        return back(b)  # equal to the end of the support at 80 digits
    while abs(b - a) > mpf(10) ** (-45) * max(1, abs(b)) and gap_b != gap_a:
        a, gap_a, b = b, gap_b, b - gap_b * (b - a) / (gap_b - gap_a)
        gap_b = gap(back(b))
    return back(b)


def text(value: Real, law: Law | None = None) -> str:
    if value is None:
        return "undefined"
    if value == inf:
        return "infinite"
    if law is not None and law.discrete:
        return str(int(value))
    return "0.0" if abs(value) < mpf(10) ** -320 else str(nstr(value, DIGITS, strip_zeros=True))


def answer(family: str, parameters: Any, question: str, at: Any) -> Any:
    if question == "moments":
        names = ("mean", "variance", "skewness", "excess_kurtosis")
        return dict(zip(names, map(text, make_law(family, parameters).moments()), strict=True))
    with mp.workdps(420 if family in NEAR_ENDS else mp.dps):
        return point_answer(make_law(family, parameters), question, mpf(at))


def point_answer(law: Law, question: str, at: Real) -> str:
    if question in {"at_most", "above"}:
        return text(tails(law, at)[question == "above"])
    if question == "density":
        low, high = law.support
        inside = low <= at <= high and (not law.discrete or at == mp.floor(at))
        return text(law.density(at)) if inside else "0.0"
    return text(quantile(law, p=at) if question == "quantile" else quantile(law, q=at), law)


def recompute(path: Path, write: bool) -> int:
    document = json.loads(path.read_text())
    changed = 0
    for row in document["rows"]:
        new = answer(document["family"], row["parameters"], row["question"], row["at"])
        if row.get("expected") != new:
            changed += 1
            sys.stdout.write(f"{row['id']} {row.get('expected')} -> {new}\n")
            row["expected"] = new
    sys.stdout.write(f"{path.name}: {len(document['rows'])} rows, {changed} different\n")
    if write:
        path.write_text(printed(document))
    return changed


def printed(document: dict[str, Any]) -> str:
    """One line a row, so that a change shows as one."""
    head = {name: value for name, value in document.items() if name != "rows"}
    rows = ",\n  ".join(json.dumps(row) for row in document["rows"])
    return json.dumps(head, indent=1)[:-2] + ',\n "rows": [\n  ' + rows + "\n ]\n}\n"


if __name__ == "__main__":
    paths = [Path(argument) for argument in sys.argv[1:] if argument != "--write"]
    differences = sum(recompute(path, "--write" in sys.argv) for path in paths)
    sys.exit(bool(differences) and "--write" not in sys.argv)
