"""100,000 values to a normal law: the service, the least that arithmetic and formats cost, and a naive draft."""

import statistics
import time
from collections.abc import Callable

import numpy as np
import orjson
from flask import Flask, Response, jsonify, request
from marshmallow import Schema, fields
from scipy.special import log_ndtr, ndtr
from scipy.stats import norm  # noqa: TID251 - what a first draft would use is measured here, not served

from service.edge.app import create_app

COUNT = 100_000
MOST_OF_LIMIT = 1.4
LEAST_OF_DRAFT = 20.0
ROUNDS = 9
MEAN, SPREAD = 10.0, 2.0
CLIENT = create_app().test_client()


class DraftQuestion(Schema):
    """The question as a first draft reads it: value by value."""

    mean = fields.Float(required=True)
    standard_deviation = fields.Float(required=True)
    below = fields.List(fields.Float(), required=True)


class DraftAnswer(Schema):
    """The answer as a first draft writes it: value by value."""

    probability = fields.List(fields.Float())
    complement = fields.List(fields.Float())
    log_probability = fields.List(fields.Float())
    log_complement = fields.List(fields.Float())
    upper_scores = fields.List(fields.Float())


def question() -> bytes:
    """A body with as many bounds."""
    bounds = np.random.default_rng(1).normal(MEAN, SPREAD, COUNT).tolist()
    law = {"family": "normal", "mean": MEAN, "standard_deviation": SPREAD}
    return orjson.dumps({"distribution": law, "event": {"below": bounds}})


def ask_service(body: bytes) -> int:
    """Answer through the whole application, in process."""
    response = CLIENT.post("/v1/probabilities", data=body, content_type="application/json")
    assert response.status_code == 200
    return len(response.get_data())


def pay_least(body: bytes) -> int:
    """Parse, convert once, call the functions, print the same figures."""
    bounds = np.array(orjson.loads(body)["event"]["below"])
    z = (bounds - MEAN) / SPREAD
    figures = {
        "probability": ndtr(z),
        "complement": ndtr(-z),
        "log_probability": log_ndtr(z),
        "log_complement": log_ndtr(-z),
        "standard_scores": {"lower": [None] * COUNT, "upper": z},
    }
    return len(orjson.dumps(figures, option=orjson.OPT_SERIALIZE_NUMPY))


draft = Flask("draft")


@draft.post("/probabilities")
def answer() -> Response:
    """Answer as a first draft does: schemas made per request and read value by value, a frozen object, jsonify."""
    asked = DraftQuestion().load(request.get_json())
    law, below = norm(asked["mean"], asked["standard_deviation"]), asked["below"]
    figures = {
        "probability": law.cdf(below),
        "complement": law.sf(below),
        "log_probability": law.logcdf(below),
        "log_complement": law.logsf(below),
        "upper_scores": [(x - MEAN) / SPREAD for x in below],
    }
    return jsonify(DraftAnswer().dump(figures))


DRAFT_CLIENT = draft.test_client()


def ask_draft(body: bytes) -> int:
    """Answer the same question by the draft, whole application in process too."""
    given = orjson.loads(body)
    flat = orjson.dumps({"mean": MEAN, "standard_deviation": SPREAD, "below": given["event"]["below"]})
    response = DRAFT_CLIENT.post("/probabilities", data=flat, content_type="application/json")
    assert response.status_code == 200
    return len(response.get_data())


def seconds(work: Callable[[bytes], int], body: bytes) -> float:
    """Time one call."""
    start = time.perf_counter()
    work(body)
    return time.perf_counter() - start


def measure() -> bool:
    """Print the rows; tell whether both promises are kept."""
    body = question()
    pairs = [(seconds(ask_service, body), seconds(pay_least, body)) for _ in range(ROUNDS + 2)][2:]
    ratio = statistics.median(ours / least for ours, least in pairs)
    ours = statistics.median(ours for ours, _ in pairs)
    naive = statistics.median(seconds(ask_draft, body) for _ in range(3))
    print(f"\n{COUNT:,} values to a normal law, in process")
    print(f"{'service':28}{ours * 1e3:10.1f} ms")
    print(f"{'parse, functions, print':28}{statistics.median(b for _, b in pairs) * 1e3:10.1f} ms")
    print(f"{'naive draft':28}{naive * 1e3:10.0f} ms")
    print(
        f"{ratio:.2f} times the least (at most {MOST_OF_LIMIT}); {naive / ours:.0f} times as fast as the draft "
        f"(at least {LEAST_OF_DRAFT:.0f})"
    )
    return ratio <= MOST_OF_LIMIT and naive / ours >= LEAST_OF_DRAFT
