"""Settings from the environment, checked at the start."""

import math
import os
import re
from collections.abc import Callable, Mapping
from dataclasses import dataclass, fields
from difflib import get_close_matches
from pathlib import Path
from typing import Any

from service.schemas.limits import DEFAULT_LIMITS, Limits

PREFIX = "SERVICE_"
CONTROL_GROUPS = Path("/sys/fs/cgroup")


class BadSetting(ValueError):
    """A setting cannot be used; the message names it."""


@dataclass(frozen=True)
class Settings:
    """How the service runs. Each field is the environment variable SERVICE_ and its name in capitals."""

    bind: str = "127.0.0.1:8000"
    """address:port to listen on"""
    workers: int = 0
    """worker processes; 0: two for each core that the container may use"""
    timeout_seconds: int = 30
    """a worker that is silent for so long is replaced"""
    graceful_timeout_seconds: int = 25
    """time for requests in flight when the service stops"""
    access_log: bool = True
    """one line on standard output for each request: on or off"""
    max_body_bytes: int = 8 * 2**20
    """longest body that is read"""
    max_entries: int = DEFAULT_LIMITS.entries
    """numbers in one array"""
    max_questions: int = DEFAULT_LIMITS.questions
    """questions in one batch"""
    max_portfolios: int = DEFAULT_LIMITS.portfolios
    """portfolios in one ranking"""
    work_budget: int = 2_500_000
    """microseconds of computation that one request may ask for"""
    max_age_seconds: int = 3600
    """how long answers of GET may be kept by caches"""
    allowed_origins: tuple[str, ...] = ()
    """comma-separated origins of browser pages that may call; * for all"""

    @property
    def limits(self) -> Limits:
        """Bounds of one request."""
        return Limits(entries=self.max_entries, questions=self.max_questions, portfolios=self.max_portfolios)


def _bind(text: str) -> str:
    if not re.fullmatch(r"(\[[0-9a-fA-F:.]+\]|[A-Za-z0-9.-]+):[0-9]{1,5}", text) or int(text.rsplit(":", 1)[1]) > 65535:
        raise ValueError("address:port is needed, as in 127.0.0.1:8000")
    return text


def _whole(least: int, most: int) -> Callable[[str], int]:
    def read(text: str) -> int:
        if not re.fullmatch(r"[0-9]{1,12}", text) or not least <= int(text) <= most:
            raise ValueError(f"a whole number from {least} to {most} is needed")
        return int(text)

    return read


def _on_or_off(text: str) -> bool:
    if text.lower() not in ("on", "off"):
        raise ValueError("on or off is needed")
    return text.lower() == "on"


def _origins(text: str) -> tuple[str, ...]:
    origins = tuple(part.strip() for part in text.split(",") if part.strip())
    for origin in origins:
        if origin != "*" and not re.fullmatch(r"https?://[A-Za-z0-9.-]+(:[0-9]{1,5})?", origin):
            raise ValueError("origins such as https://app.example are needed, or *")
    return origins


READERS: dict[str, Callable[[str], Any]] = {
    "bind": _bind,
    "workers": _whole(0, 1024),
    "timeout_seconds": _whole(1, 3600),
    "graceful_timeout_seconds": _whole(1, 3600),
    "access_log": _on_or_off,
    "max_body_bytes": _whole(1024, 2**30),
    "max_entries": _whole(1, 10**7),
    "max_questions": _whole(1, 10**5),
    "max_portfolios": _whole(1, 10**6),
    "work_budget": _whole(1000, 10**10),
    "max_age_seconds": _whole(0, 365 * 86400),
    "allowed_origins": _origins,
}


def read_settings(environment: Mapping[str, str]) -> tuple[Settings, list[str]]:
    """Read the settings, and name variables with our prefix that are none. Raises BadSetting."""
    values, strangers = {}, []
    for name, text in environment.items():
        if not name.startswith(PREFIX):
            continue
        key = name.removeprefix(PREFIX).lower()
        if key not in READERS:
            near = get_close_matches(key, READERS, 1)
            meant = f"; was {PREFIX}{near[0].upper()} meant?" if near else ""
            strangers.append(f"{name} is not a setting of this service{meant}")
            continue
        try:
            values[key] = READERS[key](text)
        except ValueError as error:
            raise BadSetting(f"{name}={text!r}: {error}") from None
    return Settings(**values), strangers


def cores() -> int:
    """Cores that this process may use: its affinity, and the quota of its container (cgroup v2, then v1)."""
    allowed = len(os.sched_getaffinity(0))
    for quota in (_quota_v2(CONTROL_GROUPS / "cpu.max"), _quota_v1(CONTROL_GROUPS / "cpu")):
        if quota is not None:
            return max(1, min(allowed, math.ceil(quota)))
    return allowed


def _quota_v2(file: Path) -> float | None:
    try:
        most, period = file.read_text().split()
        return float(most) / float(period)
    except (OSError, ValueError):
        return None


def _quota_v1(folder: Path) -> float | None:
    try:
        most = float((folder / "cpu.cfs_quota_us").read_text())
        return most / float((folder / "cpu.cfs_period_us").read_text()) if most > 0 else None
    except (OSError, ValueError):
        return None


def setting_names() -> list[str]:
    """Every environment variable that is read."""
    return [PREFIX + field.name.upper() for field in fields(Settings)]
