"""The service, and the bare echo that it is measured against, each under gunicorn with one sync worker."""

import os
import socket
import subprocess
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

START_SECONDS = 20


@dataclass(frozen=True)
class Peer:
    """A running server: where it listens, what to ask, whose CPU time counts."""

    port: int
    path: str
    workers: tuple[int, ...]


@contextmanager
def service_peer() -> Iterator[Peer]:
    """Run the service."""
    with _running("service.wsgi:app", "/v1/probabilities") as peer:
        yield peer


@contextmanager
def echo_peer() -> Iterator[Peer]:
    """Run the echo."""
    with _running("tests.benchmarks.echo:app", "/echo") as peer:
        yield peer


@contextmanager
def _running(app: str, path: str) -> Iterator[Peer]:
    port = _free_port()
    command = [
        sys.executable,
        "-m",
        "gunicorn",
        "--bind",
        f"127.0.0.1:{port}",
        "--workers",
        "1",
        "--preload",
        "--worker-tmp-dir",
        "/dev/shm",  # noqa: S108 - a file system in memory
        "--log-level",
        "error",
        app,
    ]
    process = subprocess.Popen(command, env=os.environ | {"OPENBLAS_NUM_THREADS": "1"})
    try:
        _await(port)
        yield Peer(port, path, _children(process.pid))
    finally:
        process.terminate()
        process.wait(10)


def _free_port() -> int:
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        port: int = probe.getsockname()[1]
        return port


def _await(port: int) -> None:
    until = time.monotonic() + START_SECONDS
    while time.monotonic() < until:
        try:
            with socket.create_connection(("127.0.0.1", port), timeout=1) as connection:
                connection.sendall(b"GET /nothing HTTP/1.1\r\nHost: localhost\r\n\r\n")
                if connection.recv(16).startswith(b"HTTP/1.1"):
                    return
        except OSError:
            time.sleep(0.05)
    raise RuntimeError("the server did not answer in time")


def _children(pid: int) -> tuple[int, ...]:
    return tuple(int(child) for child in Path(f"/proc/{pid}/task/{pid}/children").read_text().split())
