"""A load that costs little itself: raw sockets, so many requests, one connection each as sync workers serve."""

import os
import socket
import threading
import time
from dataclasses import dataclass
from pathlib import Path

from tests.benchmarks.http_peers import Peer

TICKS = os.sysconf("SC_CLK_TCK")


@dataclass(frozen=True)
class Round:
    """What one round took."""

    requests: int
    seconds: float
    cpu_seconds: float
    p99_seconds: float

    @property
    def rate(self) -> float:
        """Requests a second."""
        return self.requests / self.seconds


def run_round(peer: Peer, body: bytes, requests: int, connections: int) -> Round:
    """Send `requests` questions over `connections` threads and check that each is answered 200."""
    head = (
        f"POST {peer.path} HTTP/1.1\r\nHost: localhost\r\nContent-Type: application/json\r\n"
        f"Content-Length: {len(body)}\r\n\r\n"
    ).encode()
    times: list[float] = []
    share = requests // connections
    threads = [threading.Thread(target=_ask, args=(peer.port, head + body, share, times)) for _ in range(connections)]
    before, start = _cpu(peer.workers), time.perf_counter()
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    seconds = time.perf_counter() - start
    if len(times) != share * connections:
        raise RuntimeError(f"{peer.path}: {share * connections - len(times)} requests failed")
    return Round(len(times), seconds, _cpu(peer.workers) - before, sorted(times)[int(0.99 * len(times))])


def _ask(port: int, message: bytes, count: int, times: list[float]) -> None:
    for _ in range(count):
        start = time.perf_counter()
        with socket.create_connection(("127.0.0.1", port)) as connection:
            connection.sendall(message)
            answer = b""
            while chunk := connection.recv(65536):
                answer += chunk
        if not answer.startswith(b"HTTP/1.1 200 "):
            return
        times.append(time.perf_counter() - start)


def _cpu(workers: tuple[int, ...]) -> float:
    """User and system seconds of the workers so far."""
    total = 0
    for pid in workers:
        fields = Path(f"/proc/{pid}/stat").read_text().rsplit(")", 1)[1].split()
        total += int(fields[11]) + int(fields[12])
    return total / TICKS
