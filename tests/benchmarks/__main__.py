"""What the service costs beside its limits and beside what a first draft costs, in one run on one machine.

    python -m tests.benchmarks

Prints a table. Ratios are medians of paired rounds; absolute figures are for orientation.
"""

import statistics
import sys

from tests.benchmarks.arrays import measure as measure_arrays
from tests.benchmarks.goals import measure as measure_goals
from tests.benchmarks.http_peers import Peer, echo_peer, service_peer
from tests.benchmarks.load import Round, run_round
from tests.benchmarks.rankings import measure as measure_rankings

ROUNDS = 11
REQUESTS = 3000
CONNECTIONS = 8
LEAST_RATIO = 0.72
QUESTION = b'{"distribution":{"family":"normal","mean":10,"standard_deviation":2},"event":{"below":11}}'


def measure(service: Peer, echo: Peer) -> tuple[list[Round], list[Round]]:
    """Send the same question to both in turn; the first, unpaired round warms them up."""
    ours, theirs = [], []
    for number in range(ROUNDS + 1):
        pair = [run_round(peer, QUESTION, REQUESTS, CONNECTIONS) for peer in (service, echo)]
        if number:
            ours.append(pair[0])
            theirs.append(pair[1])
    return ours, theirs


def main() -> int:
    """Print the tables; status 1 where a promise is missed."""
    with service_peer() as service, echo_peer() as echo:
        ours, theirs = measure(service, echo)
    by_rate = statistics.median(a.rate / b.rate for a, b in zip(ours, theirs, strict=True))
    by_cpu = statistics.median(b.cpu_seconds / a.cpu_seconds for a, b in zip(ours, theirs, strict=True))
    tails = statistics.median(a.p99_seconds / b.p99_seconds for a, b in zip(ours, theirs, strict=True))
    rows = [("one question, service", ours), ("bare Flask echo", theirs)]
    print(f"{'':28}{'requests/s':>12}{'cpu µs':>10}{'p99 ms':>10}")
    for name, rounds in rows:
        print(
            f"{name:28}{statistics.median(r.rate for r in rounds):12.0f}"
            f"{statistics.median(r.cpu_seconds / r.requests for r in rounds) * 1e6:10.0f}"
            f"{statistics.median(r.p99_seconds for r in rounds) * 1e3:10.2f}"
        )
    print(
        f"of the echo: {by_rate:.3f} by rate (at least {LEAST_RATIO}), {by_cpu:.3f} by the worker's CPU time, "
        f"p99 {tails:.2f} times; {ROUNDS} paired rounds of {REQUESTS} requests on {CONNECTIONS} connections"
    )
    kept = [by_rate >= LEAST_RATIO, measure_arrays(), measure_rankings(), measure_goals()]
    return 0 if all(kept) else 1


if __name__ == "__main__":
    sys.exit(main())
