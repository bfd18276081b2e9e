"""The real process: how it starts, what it loads, how large it is, how it ends."""

import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from tests.conftest import ROOT, await_ready, free_port, start_service, stop_service

LARGEST_WORKER_KIB = 80 * 1024
LONGEST_START_SECONDS = 1.0
PROBE = """
import json, os, sys
from service.edge.threads import limit_threads
limit_threads(os.environ)
from service.edge.app import create_app
client = create_app().test_client()
document = client.get("/openapi.json").get_json()
for path, verbs in document["paths"].items():
    for example in verbs.get("post", {}).get("requestBody", {}).get("content", {}).get(
            "application/json", {}).get("examples", {}).values():
        assert client.post(path, json=example["value"]).status_code == 200
print(json.dumps(sorted(sys.modules)))
"""


def test_scipy_stats_is_never_imported_in_serving() -> None:
    # it costs more than the rest of the service together: a second to start and 100 MB
    found = subprocess.run([sys.executable, "-c", PROBE], cwd=ROOT, capture_output=True, text=True, check=True)
    modules = json.loads(found.stdout)
    assert "scipy.special" in modules
    assert [name for name in modules if name.startswith(("scipy.stats", "pandas", "mpmath"))] == []


def children(pid: int) -> list[int]:
    return [int(child) for child in Path(f"/proc/{pid}/task/{pid}/children").read_text().split()]


def test_the_service_is_ready_in_a_second_small_and_single_threaded() -> None:
    # the limits are the project's own promise, so they are tested as limits, at the best of a few starts
    seconds = []
    for _ in range(3):
        port = free_port()
        process = start_service(port)
        try:
            seconds.append(await_ready(port))
            workers = children(process.pid)
            assert len(workers) == 1
            status = Path(f"/proc/{workers[0]}/status").read_text()
            fields = dict(line.split(":\t", 1) for line in status.splitlines() if ":\t" in line)
            assert int(fields["VmRSS"].split()[0]) < LARGEST_WORKER_KIB
            assert int(fields["Threads"]) == 1
        finally:
            stop_service(process)
    assert min(seconds) < LONGEST_START_SECONDS


def test_the_number_of_workers_is_a_setting() -> None:
    port = free_port()
    process = start_service(port, SERVICE_WORKERS="3")
    try:
        await_ready(port)
        until = time.monotonic() + 10
        while len(children(process.pid)) < 3:  # they are forked one after another
            assert time.monotonic() < until
            time.sleep(0.02)
        time.sleep(0.2)
        assert len(children(process.pid)) == 3
    finally:
        stop_service(process)


def test_term_ends_the_service_with_status_0() -> None:
    port = free_port()
    process = start_service(port)
    await_ready(port)
    stop_service(process)
    assert process.returncode == 0


def test_a_killed_worker_is_replaced() -> None:
    port = free_port()
    process = start_service(port)
    try:
        await_ready(port)
        killed = children(process.pid)
        os.kill(killed[0], signal.SIGKILL)
        until = time.monotonic() + 10
        while (found := children(process.pid)) == killed or not found:
            assert time.monotonic() < until
            time.sleep(0.05)
        await_ready(port)
    finally:
        stop_service(process)


@pytest.mark.parametrize(
    ("name", "value"),
    [
        ("SERVICE_BIND", "here"),
        ("SERVICE_BIND", "127.0.0.1:99999"),
        ("SERVICE_WORKERS", "-1"),
        ("SERVICE_MAX_BODY_BYTES", "8MiB"),
        ("SERVICE_MAX_ENTRIES", "0"),
        ("SERVICE_ALLOWED_ORIGINS", "app.example"),
        ("SERVICE_ACCESS_LOG", "maybe"),
    ],
)
def test_a_bad_setting_stops_the_start_with_one_line_that_names_it(name: str, value: str) -> None:
    process = start_service(free_port(), **{name: value})
    printed, _ = process.communicate(timeout=20)
    assert process.returncode == 2
    assert printed.count("\n") == 1
    assert f"{name}={value!r}" in printed


def test_a_misspelt_setting_is_told() -> None:
    port = free_port()
    process = start_service(port, SERVICE_WORKER="2")
    await_ready(port)
    assert "SERVICE_WORKER is not a setting of this service; was SERVICE_WORKERS meant?" in stop_service(process)


def test_the_access_log_names_the_request() -> None:
    port = free_port()
    process = start_service(port)
    await_ready(port)
    printed = stop_service(process)
    line = next(line for line in printed.splitlines() if "GET /health/ready" in line)
    assert line.split('"')[2].split()[0] == "200"
    assert len(line.split()[-1]) == 32


def test_any_wsgi_server_can_run_the_application() -> None:
    code = (
        "import os; os.environ['SERVICE_MAX_QUESTIONS'] = '5'; from service.wsgi import app; "
        "print(app.test_client().get('/health/live').status_code, os.environ['OPENBLAS_NUM_THREADS'])"
    )
    environment = {name: value for name, value in os.environ.items() if name != "OPENBLAS_NUM_THREADS"}
    found = subprocess.run(
        [sys.executable, "-c", code], cwd=ROOT, env=environment, capture_output=True, text=True, check=True
    )
    assert found.stdout.split() == ["200", "1"]
