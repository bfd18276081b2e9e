"""gunicorn, configured: sync workers over one preloaded application, errors of the server itself as problems."""

import gc
from pathlib import Path
from typing import Any

from gunicorn.app.base import BaseApplication
from gunicorn.http import errors
from gunicorn.util import write_nonblock
from gunicorn.workers.sync import SyncWorker

from service.edge.app import create_app
from service.edge.problems import MEDIA_TYPE, fault_body, problem_body
from service.edge.respond import dump, new_request_id
from service.edge.settings import Settings, cores
from service.schemas.faults import Fault

WORKERS_PER_CORE = 2
LONGEST_LINE = 8190
REASONS = {
    400: "Bad Request",
    414: "URI Too Long",
    417: "Expectation Failed",
    431: "Request Header Fields Too Large",
    500: "Internal Server Error",
    501: "Not Implemented",
}
KNOWN: tuple[tuple[type[Exception], int, str | None, str, str], ...] = (
    (errors.LimitRequestLine, 414, "url-too-long", "url_too_long", "The address is longer than the service reads."),
    (
        errors.LimitRequestHeaders,
        431,
        "headers-too-large",
        "headers_too_large",
        "The headers are longer or more than the service reads.",
    ),
    (errors.UnsupportedTransferCoding, 501, None, "", "The body is sent in a transfer coding that is not known here."),
    (errors.ParseException, 400, "unreadable", "broken_request", "The request line or a header cannot be read."),
)


class ProblemWorker(SyncWorker):  # type: ignore[misc]  # gunicorn is untyped
    """A sync worker that answers what never reaches the application with problem details too."""

    def handle_error(self, req: Any, client: Any, addr: Any, exc: BaseException) -> None:  # noqa: ARG002
        """Answer a request that gunicorn could not hand on."""
        status, body = describe_error(exc)
        if status == 500:
            self.log.error("request failed before it reached the application", exc_info=exc)
        try:
            write_nonblock(client, as_response(status, body))
        except OSError:
            self.log.debug("the client was gone before its problem could be sent")


def describe_error(exc: BaseException) -> tuple[int, dict[str, Any]]:
    """Give status and problem of what gunicorn could not read."""
    for kind_of_error, status, kind, code, detail in KNOWN:
        if isinstance(exc, kind_of_error):
            listed = [{"pointer": ""} | fault_body(Fault(code, detail))] if kind else None
            return status, problem_body(status, detail, new_request_id(), kind, listed)
    return 500, problem_body(500, "The service failed; this is its fault, not yours.", new_request_id())


def as_response(status: int, problem: dict[str, Any]) -> bytes:
    """Write a whole HTTP response by hand."""
    body = dump(problem)
    head = (
        f"HTTP/1.1 {status} {REASONS[status]}\r\nContent-Type: {MEDIA_TYPE}\r\nContent-Length: {len(body)}\r\n"
        f"Cache-Control: no-store\r\nRequest-Id: {problem['request_id']}\r\nConnection: close\r\n\r\n"
    )
    return head.encode("latin-1") + body


class Server(BaseApplication):  # type: ignore[misc]  # gunicorn is untyped
    """The service under gunicorn."""

    def __init__(self, settings: Settings) -> None:
        self.settings = settings
        super().__init__()

    def load_config(self) -> None:
        """Hand our settings to gunicorn."""
        for name, value in configuration(self.settings).items():
            if name in self.cfg.settings:  # control_socket_disable is younger than the oldest gunicorn we take
                self.cfg.set(name, value)

    def load(self) -> Any:
        """Make the application, once, before the workers are forked."""
        app = create_app(self.settings)
        gc.freeze()  # keeps the pages of what was made here shared between the workers
        return app


def configuration(settings: Settings) -> dict[str, Any]:
    """Give gunicorn's settings."""
    shared_memory = Path("/dev/shm")  # noqa: S108 - heartbeat files belong on a file system in memory
    return {
        "bind": settings.bind,
        "workers": settings.workers or WORKERS_PER_CORE * cores(),
        "worker_class": ProblemWorker,
        "preload_app": True,
        "timeout": settings.timeout_seconds,
        "graceful_timeout": settings.graceful_timeout_seconds,
        "limit_request_line": LONGEST_LINE,
        "limit_request_field_size": LONGEST_LINE,
        "accesslog": "-" if settings.access_log else None,
        "access_log_format": '%(h)s "%(r)s" %(s)s %(B)s %(D)sus %({request-id}o)s',
        "worker_tmp_dir": str(shared_memory) if shared_memory.is_dir() else None,
        "control_socket_disable": True,
        "proc_name": "chance-service",
    }
