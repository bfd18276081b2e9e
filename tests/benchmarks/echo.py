"""The least that a JSON service in Flask can do: give back what it was sent."""

from flask import Flask, Response, jsonify, request

app = Flask(__name__)


@app.post("/echo")
def echo() -> Response:
    """Answer with the question."""
    return jsonify(request.get_json())
