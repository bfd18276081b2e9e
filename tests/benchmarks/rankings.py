"""10,000 portfolios of one model from columns, and 1,000 as objects: the service beside the least that they cost."""

import statistics
import time
from collections.abc import Callable

import numpy as np
import orjson
from scipy.special import log_ndtr, ndtr, ndtri

from service.edge.app import create_app

COLUMNS, OBJECTS = 10_000, 1_000
FLOOR, LEVELS = 0.02, (0.95, 0.99)
MOST_OF_LIMIT = 5.0
MOST_SECONDS = 0.5
ROUNDS = 9
CLIENT = create_app().test_client()


def bodies() -> tuple[bytes, bytes]:
    """Both requests."""
    draw = np.random.default_rng(1)
    means, spreads = draw.uniform(0, 0.1, COLUMNS).tolist(), draw.uniform(0.05, 0.2, COLUMNS).tolist()
    names = [f"Portfolio {i}" for i in range(COLUMNS)]
    columns = {"model": "normal", "name": names, "expected_return": means, "volatility": spreads}
    rows = [
        {"name": name, "returns": {"model": "normal", "expected_return": mean, "volatility": spread}}
        for name, mean, spread in zip(names[:OBJECTS], means, spreads, strict=False)
    ]
    return tuple(
        orjson.dumps(part | {"threshold": FLOOR}) for part in ({"portfolio_columns": columns}, {"portfolios": rows})
    )  # type: ignore[return-value]


def ask_service(body: bytes) -> None:
    """Rank through the whole application, in process."""
    assert CLIENT.post("/v1/rankings", data=body, content_type="application/json").status_code == 200


def pay_least(body: bytes) -> None:
    """Parse, write the formulas down for arrays, sort by each criterion, print the same figures."""
    given = orjson.loads(body)["portfolio_columns"]
    m, s = np.array(given["expected_return"]), np.array(given["volatility"])
    z = (FLOOR - m) / s
    p, density = ndtr(z), np.exp(-z * z / 2) / 2.5066282746310002
    gap = s * (z * p + density)
    square = s * s * ((1 + z * z) * p + z * density)
    quantile = m + s * ndtri(0.05)
    losses = [
        {
            "value_at_risk": -(m + s * ndtri(1 - level)),
            "expected_shortfall": -m + s * np.exp(-(ndtri(1 - level) ** 2) / 2) / 2.5066282746310002 / (1 - level),
        }
        for level in LEVELS
    ]
    figures = {
        "p": p,
        "log": log_ndtr(z),
        "ratio": -z,
        "bound": 1 / (1 + z * z),
        "mean": m,
        "sd": s,
        "gap": gap,
        "mean_in": FLOOR - gap / p,
        "mean_gap": gap / p,
        "order_0": p,
        "order_1": gap,
        "order_2": square,
        "quantile": quantile,
        "per_year": quantile,
        "total": ndtr((-1 - m) / s),
        "moments": [m, s, m * 0, m * 0],
    }
    ranks = {
        name: np.argsort(values) for name, values in (("p", p), ("ratio", z), ("gap", gap), ("q", -quantile), ("m", -m))
    }
    order = ranks["ratio"]
    sorted_figures = {
        name: [v[order] for v in values] if isinstance(values, list) else values[order]
        for name, values in figures.items()
    }
    names = [given["name"][i] for i in order.tolist()]
    counts = np.rint(p[order] * 100).astype(np.int64)
    orjson.dumps(
        {
            "figures": sorted_figures,
            "losses": losses,
            "ranks": ranks,
            "names": names,
            "index": order,
            "rank": np.arange(1, COLUMNS + 1),
            "admissible": np.ones(COLUMNS, bool),
            "counts": counts,
            "words": ["about"] * COLUMNS,
        },
        option=orjson.OPT_SERIALIZE_NUMPY,
    )


def seconds(work: Callable[[bytes], None], body: bytes) -> float:
    """Time one call."""
    start = time.perf_counter()
    work(body)
    return time.perf_counter() - start


def measure() -> bool:
    """Print the rows; tell whether both promises are kept."""
    columns, objects = bodies()
    pairs = [(seconds(ask_service, columns), seconds(pay_least, columns)) for _ in range(ROUNDS + 2)][2:]
    ratio = statistics.median(ours / least for ours, least in pairs)
    rows = statistics.median(seconds(ask_service, objects) for _ in range(3))
    print(f"\n{COLUMNS:,} portfolios ranked from columns, in process")
    print(f"{'service':28}{statistics.median(a for a, _ in pairs) * 1e3:10.1f} ms")
    print(f"{'parse, formulas, sort, print':28}{statistics.median(b for _, b in pairs) * 1e3:10.1f} ms")
    print(
        f"{ratio:.2f} times the least (at most {MOST_OF_LIMIT}); {OBJECTS:,} as objects {rows * 1e3:.0f} ms "
        f"(at most {MOST_SECONDS * 1e3:.0f})"
    )
    return ratio <= MOST_OF_LIMIT and rows <= MOST_SECONDS
