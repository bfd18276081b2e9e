"""One thread for each process in the numerical libraries: workers are the parallelism."""

from collections.abc import MutableMapping

VARIABLES = ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS", "BLIS_NUM_THREADS", "VECLIB_MAXIMUM_THREADS")


def limit_threads(environment: MutableMapping[str, str]) -> None:
    """Ask for one thread; takes effect only before numpy is imported. What the operator has set stays."""
    for name in VARIABLES:
        environment.setdefault(name, "1")
