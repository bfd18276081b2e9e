"""Settings from the environment, and the cores that a container may use."""

import os
from pathlib import Path

import pytest

from service.edge import settings as settings_module
from service.edge.settings import BadSetting, Settings, cores, read_settings, setting_names


def test_nothing_set_gives_the_defaults() -> None:
    assert read_settings({"PATH": "/bin", "OTHER": "1"}) == (Settings(), [])


def test_every_setting_is_read() -> None:
    given = {
        "SERVICE_BIND": "0.0.0.0:9000",
        "SERVICE_WORKERS": "3",
        "SERVICE_TIMEOUT_SECONDS": "5",
        "SERVICE_GRACEFUL_TIMEOUT_SECONDS": "6",
        "SERVICE_ACCESS_LOG": "off",
        "SERVICE_MAX_BODY_BYTES": "2048",
        "SERVICE_MAX_ENTRIES": "10",
        "SERVICE_MAX_QUESTIONS": "11",
        "SERVICE_MAX_PORTFOLIOS": "12",
        "SERVICE_WORK_BUDGET": "5000",
        "SERVICE_MAX_AGE_SECONDS": "13",
        "SERVICE_ALLOWED_ORIGINS": "https://app.example, http://localhost:5173",
    }
    assert set(given) == set(setting_names())
    found, strangers = read_settings(given)
    assert found == Settings(
        "0.0.0.0:9000", 3, 5, 6, False, 2048, 10, 11, 12, 5000, 13, ("https://app.example", "http://localhost:5173")
    )
    assert strangers == []
    assert (found.limits.entries, found.limits.questions, found.limits.portfolios) == (10, 11, 12)


@pytest.mark.parametrize("text", ["[::1]:8000", "localhost:80"])
def test_addresses_that_can_be_bound(text: str) -> None:
    assert read_settings({"SERVICE_BIND": text})[0].bind == text


@pytest.mark.parametrize(
    ("name", "text"),
    [("SERVICE_WORKERS", "two"), ("SERVICE_WORKERS", "1.5"), ("SERVICE_WORKERS", "1025"), ("SERVICE_BIND", ":8000")],
)
def test_a_bad_setting_is_named_with_its_value(name: str, text: str) -> None:
    with pytest.raises(BadSetting, match=f"{name}='{text}'"):
        read_settings({name: text})


def test_an_unknown_setting_is_told_and_not_fatal() -> None:
    assert read_settings({"SERVICE_XYZ": "1"}) == (Settings(), ["SERVICE_XYZ is not a setting of this service"])


@pytest.mark.parametrize(
    ("files", "quota"),
    [
        ({}, None),
        ({"cpu.max": "150000 100000"}, 2),
        ({"cpu.max": "max 100000"}, None),
        ({"cpu.max": "20000 100000"}, 1),
        ({"cpu/cpu.cfs_quota_us": "300000", "cpu/cpu.cfs_period_us": "100000"}, 3),
        ({"cpu/cpu.cfs_quota_us": "-1", "cpu/cpu.cfs_period_us": "100000"}, None),
    ],
)
def test_a_containers_quota_bounds_the_cores(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, files: dict[str, str], quota: int | None
) -> None:
    for name, text in files.items():
        (tmp_path / name).parent.mkdir(exist_ok=True)
        (tmp_path / name).write_text(text)
    monkeypatch.setattr(settings_module, "CONTROL_GROUPS", tmp_path)
    monkeypatch.setattr(os, "sched_getaffinity", lambda _: set(range(8)))
    assert cores() == (8 if quota is None else quota)
