"""What README shows is what the service does."""

import json
import re
from pathlib import Path
from typing import Any

import pytest

from service.core.distributions import FAMILIES
from service.edge.settings import Settings, setting_names
from tests.benchmarks.accuracy import errors
from tests.conftest import Asker

README = (Path(__file__).parent.parent.parent / "README.md").read_text()
CALLS = re.findall(
    r"curl -s '?http://127\.0\.0\.1:8000([^\s']+)'?(?: -H 'Content-Type: application/json' -d '(.*?)')?\n```",
    README,
    re.DOTALL,
)


def assert_shown(found: Any, shown: Any) -> None:
    """README shows part of an answer: of objects some members, of cautions some, of figures six digits."""
    if isinstance(shown, dict):
        for name, inner in shown.items():
            if name == "cautions":
                assert [c for c in inner if not any(c.items() <= each.items() for each in found[name])] == []
            else:
                assert_shown(found[name], inner)
    elif isinstance(shown, list):
        assert len(found) == len(shown)
        for one, inner in zip(found, shown, strict=True):
            assert_shown(one, inner)
    elif isinstance(shown, float):
        assert found == pytest.approx(shown, rel=1e-5)
    else:
        assert found == shown


def test_there_are_calls_to_check() -> None:
    assert len(CALLS) >= 2


@pytest.mark.parametrize(("address", "body"), CALLS)
def test_every_call_answers(ask: Asker, address: str, body: str) -> None:
    if body:
        ask.answer(address, json.loads(body))
    else:
        assert ask.get(address).status_code == 200


def test_the_first_answer_is_as_shown(ask: Asker) -> None:
    address, body = CALLS[0]
    shown = json.loads(re.findall(r"```json\n(.*?)\n```", README, re.DOTALL)[0])
    assert_shown(ask.answer(address, json.loads(body)), shown)


def test_every_summary_is_quoted(ask: Asker) -> None:
    words = " ".join(README.split())
    for address, body in CALLS:
        if address == "/v1/rankings":
            assert ask.answer(address, json.loads(body))["summary"] in words


def test_the_mix_is_as_told(ask: Asker) -> None:
    body = next(body for address, body in CALLS if address == "/v1/allocations")
    weights = [round(100 * row["weight"]) for row in ask.answer("/v1/allocations", json.loads(body))["weights"]]
    assert "About {} % bonds, {} % shares, {} % property.".format(*weights) in README


def test_the_goal_is_as_told(ask: Asker) -> None:
    bodies = {address: json.loads(body) for address, body in CALLS if body}
    outlook = ask.answer("/v1/goal-outlooks", bodies["/v1/goal-outlooks"])
    needed = ask.answer("/v1/goal-requirements", bodies["/v1/goal-requirements"])
    words = " ".join(README.split())
    success, gap = outlook["success_probability"], outlook["expected_gap"]
    assert f"`success_probability` is {success:.4f}, `expected_gap` {gap:,.0f}," in words
    count = outlook["frequencies"]["success_probability"]["count"]
    missed = outlook["mean_gap_if_missed"]
    assert f"About {count} of them have the 70,000 after 15 years, about {100 - count} do not; those" in words
    assert f"lack {missed:,.0f} on average" in words
    offered = [f"{row['value']:.0f}" for row in needed["rounded"]]
    assert f"{needed['value']:.2f} a month; `rounded` offers {{}}, {{}} and {{}}".format(*offered) in words
    chance = 100 * needed["rounded"][1]["success_probability"]
    assert f"With {offered[1]} a month it is about {chance:.0f} of 100" in words


def test_the_problem_is_as_shown(ask: Asker) -> None:
    shown = json.loads(re.findall(r"```json\n(.*?)\n```", README, re.DOTALL)[1])
    returns = {"model": "normal", "expected_retrun": 0.05, "volatility": -0.08}
    found = ask.client.post("/v1/shortfalls", json={"portfolio": {"returns": returns}, "threshold": 0.02}).get_json()
    own = {"instance": None, "request_id": None}
    assert found | own == shown | own


def test_the_fingerprint_call_names_the_request(ask: Asker) -> None:
    path, body = re.search(r"printf '(/v1/\w+)\\n(.*?)' \| sha256sum", README).groups()  # type: ignore[union-attr]
    response = ask.client.post(path, data=body, content_type="application/json")
    assert response.status_code == 200


def test_every_setting_is_described_with_its_default() -> None:
    rows = dict(re.findall(r"\| `(SERVICE_\w+)` \| `?([^|`]+)`? \|", README))
    assert list(rows) == setting_names()
    defaults = Settings()
    for name, shown in rows.items():
        value = getattr(defaults, name.removeprefix("SERVICE_").lower())
        written = "on" if value is True else "none" if value == () else str(value)
        assert shown.strip() == written


def test_the_table_of_errors_is_measured() -> None:
    shown = {
        row[0]: row[1:] for row in re.findall(r"^\| `(\w+)`" + r" \| ([\d.e-]+)" * 6 + r" \|$", README, re.MULTILINE)
    }
    assert shown.keys() == FAMILIES.keys()
    for family, row in shown.items():
        for measured, printed in zip(errors(family), row, strict=True):
            assert measured <= 3 * max(float(printed), 1e-16), (
                family
            )  # another processor may round the last bit otherwise
