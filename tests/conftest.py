"""Fixtures for all tests: the application in process, and the real service on a port of this machine."""

import os
import socket
import subprocess
import sys
import time
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest
from flask.testing import FlaskClient
from werkzeug.test import TestResponse

from service.edge.app import create_app

ROOT = Path(__file__).parent.parent
START_SECONDS = 20


@pytest.fixture(scope="session")
def client() -> FlaskClient:
    """Call the application in process, with default settings."""
    return create_app().test_client()


@dataclass(frozen=True)
class Asker:
    """Sends questions and looks at what comes back."""

    client: FlaskClient

    def answer(self, path: str, question: Any) -> Any:
        """POST a question that fits."""
        response = self.client.post(path, json=question)
        assert response.status_code == 200, response.get_data(as_text=True)
        return response.get_json()

    def faults(self, path: str, question: Any) -> dict[str, str]:
        """POST a question that does not fit: fault codes by pointer."""
        response = self.client.post(path, json=question)
        assert response.status_code == 422, response.get_data(as_text=True)
        return {fault["pointer"]: fault["code"] for fault in response.get_json()["errors"]}

    def get(self, address: str, **headers: str) -> TestResponse:
        """GET an address."""
        return self.client.get(address, headers={name.replace("_", "-"): value for name, value in headers.items()})


@pytest.fixture(scope="session")
def ask(client: FlaskClient) -> Asker:
    """Ask in process."""
    return Asker(client)


@dataclass(frozen=True)
class RunningService:
    """The real service: its address and process."""

    port: int
    process: "subprocess.Popen[str]"

    def send(self, message: bytes, *, half_close: bool = False) -> "RawAnswer":
        """Send bytes as they are over a socket and read until the service closes."""
        with socket.create_connection(("127.0.0.1", self.port), timeout=10) as connection:
            connection.sendall(message)
            if half_close:
                connection.shutdown(socket.SHUT_WR)
            received = b""
            while chunk := connection.recv(65536):
                received += chunk
        return RawAnswer.read(received)

    def post(self, path: str, body: bytes, headers: Mapping[str, str] | None = None) -> "RawAnswer":
        """POST a body of known length."""
        full = {"Content-Type": "application/json", "Content-Length": str(len(body))} | dict(headers or {})
        lines = "".join(f"{name}: {value}\r\n" for name, value in full.items() if value)
        return self.send(f"POST {path} HTTP/1.1\r\nHost: localhost\r\n{lines}\r\n".encode("latin-1") + body)


@dataclass(frozen=True)
class RawAnswer:
    """One HTTP response as it came."""

    status: int
    headers: Mapping[str, str]
    body: bytes

    @classmethod
    def read(cls, received: bytes) -> "RawAnswer":
        """Take a response apart; interim ones are passed over."""
        head, _, body = received.partition(b"\r\n\r\n")
        first, *lines = head.decode("latin-1").split("\r\n")
        status = int(first.split(" ")[1])
        if status == 100:
            return cls.read(body)
        pairs = (line.split(": ", 1) for line in lines)
        return cls(status, {name.lower(): value for name, value in pairs}, body)


def start_service(port: int, **variables: str) -> "subprocess.Popen[str]":
    """Start `python -m service` on a port of this machine, its settings as variables."""
    environment = {name: value for name, value in os.environ.items() if not name.startswith("SERVICE_")}
    environment |= {"SERVICE_BIND": f"127.0.0.1:{port}", "SERVICE_WORKERS": "1"} | variables
    return subprocess.Popen(
        [sys.executable, "-m", "service"],
        cwd=ROOT,
        env=environment,
        text=True,
        stdout=subprocess.PIPE,
        stderr=subprocess.STDOUT,
    )


def free_port() -> int:
    """Find a port that nothing listens on."""
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        port: int = probe.getsockname()[1]
        return port


def await_ready(port: int) -> float:
    """Wait until the service answers that it is ready; give the seconds that took."""
    start = time.perf_counter()
    while time.perf_counter() - start < START_SECONDS:
        try:
            with socket.create_connection(("127.0.0.1", port), timeout=1) as connection:
                connection.sendall(b"GET /health/ready HTTP/1.1\r\nHost: localhost\r\n\r\n")
                if connection.recv(12) == b"HTTP/1.1 200":
                    return time.perf_counter() - start
        except OSError:
            time.sleep(0.01)
    raise AssertionError("the service was not ready in time")


def stop_service(process: "subprocess.Popen[str]") -> str:
    """End the service and give what it printed."""
    process.terminate()
    printed, _ = process.communicate(timeout=30)
    return printed


@pytest.fixture(scope="session")
def running() -> Iterator[RunningService]:
    """The real service, for tests that need a socket; a small body limit makes large bodies cheap to send."""
    port = free_port()
    process = start_service(port, SERVICE_MAX_BODY_BYTES="65536", SERVICE_ACCESS_LOG="off")
    try:
        await_ready(port)
        yield RunningService(port, process)
    finally:
        stop_service(process)
